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

/* x runs over (from, to), from may be -inf, to inf; large and power are for words. Conditions (sign of c, no other
 * place) are added. UNSUITABLE, UNAVAILABLE, DIVERGENT, UNDECIDED with reasons. */
tw_status place_find(tw_engine *e, place *out, expr *phase, expr *x, expr *from, expr *to, expr *large,
                     condition_list *conditions);

#endif
