/* Values of an expansion's terms at a point. Private to engine/numeric. */
#ifndef TW_NUMERIC_TERMS_H
#define TW_NUMERIC_TERMS_H

#include "engine/numeric/bound.h"

/* One contribution's terms in order of size, prefactor included; real. */
typedef struct term_values {
    size_t contribution;
    slong count;
    term *order;
    arb_ptr value;
} term_values;

typedef struct term_table {
    size_t count;
    term_values *list;
} term_table;

/* Up to `count` terms of each dominant contribution (of each, when `all`) at the point; ERROR_NAME names a parameter without a
 * value, ERROR_UNAVAILABLE says that the value is complex. */
tw_status terms_at(tw_engine *e, term_table *out, expansion *a, const env *at, slong count, bool all, slong bits);
void terms_clear(term_table *t);

/* Every symbol of the expansion has a value; else ERROR_NAME with the name of the one that has not. */
tw_status point_complete(tw_engine *e, const expansion *a, const env *at);

/* The values of at put into f. */
expr *put_values(tw_engine *e, expr *f, const env *at);

/* A real value; ERROR_UNAVAILABLE when it is complex. */
tw_status real_ball(tw_engine *e, arb_t out, expr *f, slong bits);

/* Contributions that are summed: the dominant ones. */
bool contribution_counts(const expansion *a, size_t k, bool all);

#endif
