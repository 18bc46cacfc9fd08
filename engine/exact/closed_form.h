/* Closed forms of sequences with a recurrence of order one, and what they say of large n. */
#ifndef TW_EXACT_CLOSED_FORM_H
#define TW_EXACT_CLOSED_FORM_H

#include "engine/exact/recurrence.h"

enum { CLOSED_FACTORS = 32 };

/* c[n] = first * ratio^n * prod Gamma(n + above_i)/Gamma(above_i) / prod Gamma(n + below_i)/Gamma(below_i) */
typedef struct closed_form {
    expr *first, *ratio;
    size_t above_count, below_count;
    expr *above[CLOSED_FACTORS], *below[CLOSED_FACTORS];
} closed_form;

/* True when the recurrence has order one, holds for all n >= 0, and its polynomials split into linear factors none of
 * whose roots is an integer n >= 0. first: c[0]. False without an engine error otherwise. */
bool closed_form_find(tw_engine *e, closed_form *out, const recurrence *r, expr *first);

/* The form as an expression in r->n. */
expr *closed_form_expr(tw_engine *e, const closed_form *c, expr *n);

/* For large n, m = above_count - below_count >= 0:
 *     c[n] ~ k Gamma(m n + b) / f^n   (m > 0),     c[n] ~ k n^b / f^n   (m = 0)
 * by Stirling's formula (DLMF 5.11.3). False when m < 0. */
bool closed_form_growth(tw_engine *e, const closed_form *c, slong *m, expr **f, expr **b, expr **k);

#endif
