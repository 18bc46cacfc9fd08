/* The form of c[n] for large n, from its recurrence:
 *
 *     c[n] ~ sum over parts of K Gamma(m n + b) / F^n   (m > 0),      K n^b / F^n   (m = 0).
 *
 * F and b are exact, from the characteristic polynomial (Birkhoff 1930; Wimp and Zeilberger 1985). K is exact where the
 * recurrence has order one; otherwise it is estimated from coefficients by Richardson's method. */
#ifndef TW_EXACT_LARGE_ORDER_H
#define TW_EXACT_LARGE_ORDER_H

#include "engine/exact/closed_form.h"

enum { LARGE_ORDER_PARTS = 8 };

typedef struct large_order_part {
    expr *f, *b;
    expr *k;       /* exact; NULL: estimated */
    acb_t value;   /* the estimate of K */
    double spread; /* by how much estimates differ */
} large_order_part;

typedef struct large_order {
    slong m;
    bool exact;    /* K exact as well */
    size_t count;  /* parts of the same |F|; those that share the greatest size */
    large_order_part parts[LARGE_ORDER_PARTS];
    expr *distance; /* |F| */
    bool rounded;   /* it is, to twelve digits or so */
} large_order;

void large_order_init(large_order *g);
void large_order_clear(large_order *g);

/* Coefficients 0 .. count - 1 (expressions) of the sequence; more are made by the recurrence. first: c[0]. ERROR_UNSUITABLE
 * with words where the form is another one or cannot be had. */
tw_status large_order_find(tw_engine *e, large_order *out, const recurrence *r, expr *const *c, slong count);

#endif
