/* The record of an expression's behaviour at infinity (and, by x = 1/y, at an end): methods.md section 10, quadrature.md.
 *
 *     f(z) = exp(z^c T) * z^a * (log z)^k * g(z)    for |z| >= X, arg z in a ball,   T, g(z) inside complex balls
 *
 * carried bottom-up over the tree, with a second record "exact rational limit + decaying rest". Sound or absent: where no
 * record is known the call says so. */
#ifndef TW_BALL_GROWTH_H
#define TW_BALL_GROWTH_H

#include "engine/ball/tape.h"

/* |f(x)| <= exp(log_C) * x^a * (log x)^k * exp(-b x^c)  for all real x >= X (b may be negative: growth; c > 0 or b = 0). */
typedef struct growth_bound {
    arf_t X;
    arb_t log_C; /* kept as a logarithm: C itself may leave every exponent range */
    fmpq_t a, c;
    slong k;
    arb_t b;
} growth_bound;

void growth_bound_init(growth_bound *g);
void growth_bound_clear(growth_bound *g);

/* A bound of f as x -> +inf along the real axis, all parameters in `at` substituted, valid from some X >= X_wanted on.
 * TW_ERROR with ERROR_UNDECIDED when no record can be made (the words say which part of f resists). */
tw_status growth_at_infinity(tw_engine *e, growth_bound *out, expr *f, expr *x, const env *at, double X_wanted);

/* Upper bound of int_X^inf of the bound; ERROR_DIVERGENT if it does not converge (bound not integrable). As log. */
tw_status growth_tail(tw_engine *e, arb_t log_tail, const growth_bound *g);

#endif
