/* The record of an expression's behaviour at infinity (and, by x = 1/y, at an end): methods.md section 10,
 * quadrature.md.
 *
 *     f(z) = exp(z^c T) * z^a * (log z)^k * g(z)    for |z| >= X, arg z in a ball,   T, g(z) inside complex balls
 *
 * carried bottom-up over the tree, with a second record "exact rational limit + decaying rest". Sound or absent: where
 * no record is known the call says so. */
#ifndef TW_BALL_GROWTH_H
#define TW_BALL_GROWTH_H

#include "engine/ball/tape.h"

/* |f(x)| <= exp(log_C) * x^a * (log x)^k * exp(-b x^c)  for all real x >= X (b may be negative: growth; c > 0 or b =
 * 0). */
typedef struct growth_bound {
    arf_t X;
    arb_t log_C; /* kept as a logarithm: C itself may leave every exponent range; a negative infinity: f is 0 */
    fmpq_t a, c;
    slong k;
    arb_t b;
} growth_bound;

void growth_bound_init(growth_bound *g);
void growth_bound_clear(growth_bound *g);

/* A bound of f as x -> +inf along the real axis, all parameters in `at` substituted, valid from some X >= X_wanted on
 * (X is at least 4, and greater where the bound would not be integrable otherwise, if that helps). TW_ERROR with
 * ERROR_UNDECIDED when no record can be made (the words say which part of f resists). */
tw_status growth_at_infinity(tw_engine *e, growth_bound *out, expr *f, expr *x, const env *at, double X_wanted);

/* Upper bound of int_X^inf of the bound; ERROR_DIVERGENT if it does not converge (bound not integrable). As log. */
tw_status growth_tail(tw_engine *e, arb_t log_tail, const growth_bound *g);

/* The same in two steps, for several X: f closed but for x. growth_run gives the record at X (an exact number > e);
 * false: none found there. After a successful run growth_diverges says whether f is proved not to be integrable at
 * infinity (in modulus and without: its values stay in a half-plane). growth_resists is the part of f that failed in
 * the last run. */
typedef struct growth_program growth_program;
growth_program *growth_compile(tw_engine *e, expr *f, expr *x);
bool growth_run(growth_program *t, growth_bound *out, const arf_t X);
/* From then on runs are about f(x) |dx/dv| as v -> inf, where x = 2^shift v, or x = 1/(2^shift v) when inverted (x ->
 * 0). */
void growth_scale(growth_program *t, slong shift, bool inverted);
/* From then on x = turn * 2^shift v (or turn/(2^shift v)), v real, turn any number of modulus 1 in the ball: runs are
 * about all these directions at once, and give a record only where f is seen to be analytic there. f must hold no
 * function that is nowhere analytic (abs, re, ...). */
void growth_turn(growth_program *t, const acb_t turn);
/* Is Re f(x) <= -m v^power for all v >= X and a positive m, by the last run? */
bool growth_falls(const growth_program *t, fmpq_t power);
/* Has f no zero for x >= X, by the last run? */
bool growth_is_nonzero(const growth_program *t);
/* Is f(x) real for all x >= X, by the last run? */
bool growth_is_real(const growth_program *t);
bool growth_diverges(const growth_program *t);
expr *growth_resists(const growth_program *t);
void growth_free(growth_program *t);
/* Can the bound be integrated to infinity? */
bool growth_integrable(const growth_bound *g);
/* A ball that holds f(x) for an x >= X of the last run, by the two-sided record. */
void growth_value(acb_t value, const growth_program *t, const arb_t x, slong prec);

#endif
