/* Where the phase is least on the path. Private to this room. */
#ifndef TW_METHOD_PLACE_H
#define TW_METHOD_PLACE_H

#include "engine/method/method.h"

typedef enum place_kind {
    PLACE_FROM,   /* least at `from`, larger everywhere else */
    PLACE_TO,     /* least at `to` */
    PLACE_INSIDE, /* c*|x - center|^mu with the center inside */
} place_kind;

/* P(x) = level + c * |x - center|^mu on the path (pure), or any function with its least value at an end. */
typedef struct place {
    place_kind kind;
    bool pure; /* the least point is the center of a pure power */
    expr *center, *c, *level;
    fmpq_t mu;
} place;

void place_init(place *p);
void place_clear(place *p);

/* x runs over (from, to), from may be -inf, to inf; large is for words. Conditions (sign of c) are added. *found false:
 * the phase is no pure power about a center on the path. UNSUITABLE, DIVERGENT, UNDECIDED with reasons. */
tw_status place_find_pure(tw_engine *e, place *out, expr *phase, expr *x, expr *from, expr *to, expr *large,
                          condition_list *conditions, bool *found);

/* A phase whose slope has one sign on the whole path. Where only samples say so, an open condition is added. */
tw_status place_find_by_slope(tw_engine *e, place *out, expr *phase, expr *x, expr *from, expr *to, expr *large,
                              condition_list *conditions);

#endif
