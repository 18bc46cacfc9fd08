/* The enclosing theorem: int_0^inf x^(lambda-1) f(x^g) exp(-scale x^mu) dx with f completely monotone on [0, inf). Taylor's formula
 * with f^(n) of the sign (-1)^n shows that f minus its first N terms has the sign of the N-th and is smaller in modulus, at every
 * point of the path, hence also under the integral (Widder, The Laplace Transform, 1941, ch. IV, from memory; Olver 1974, ch. 3
 * section 2 for the integrals). The variable must be the one in whose powers the series goes: y = x^g, g whole, the path all of
 * (0, inf), a single branch. One sign alone, alternating coefficients, or a finite range prove nothing. */
#include "engine/ball/tape.h"
#include "engine/numeric/enclosing.h"

#include <stdlib.h>

#include "engine/numeric/monotone.h"

/* The step of the nonzero coefficients: all indices of them are multiples of g; 0 when fewer than two are known. */
static slong index_step(const coefficients *c)
{
    slong g = 0;
    for (slong n = 1; n < c->count; n++)
        if (!coefficient_is_zero(c, n))
            g = (slong)n_gcd((ulong)n, (ulong)g);
    return g;
}

static bool is_power(tw_engine *e, expr *p, expr *x)
{
    expr *base, *exponent;
    expr_as_power(e, p, &base, &exponent);
    return base == x && expr_is_number(exponent) && fmpq_sgn(expr_number(exponent)) > 0;
}

/* f(y) with q = x^exponent f(x^g), or NULL. */
static expr *amplitude_in(tw_engine *e, expr *q, expr *x, expr *exponent, slong g, expr *y)
{
    expr *positive_x[] = {x}, *positive_y[] = {y};
    expr *f = expr_normal(e, expr_mul(e, q, expr_pow(e, x, expr_neg(e, exponent))), positive_x, 1);
    return f ? expr_normal(e, expr_substitute(e, f, x, expr_pow(e, y, expr_frac(e, 1, g))), positive_y, 1) : NULL;
}

answer contribution_encloses(tw_engine *e, const local_form *l, expr *large, const env *at)
{
    enum { LENGTH = 12 };
    series s;
    answer result = ANSWER_UNKNOWN;
    expr *q, *p, *x;
    if (l->count != 1 || !expr_is_inf(l->branches[0].end))
        return ANSWER_UNKNOWN;
    x = l->branches[0].x;
    q = l->branches[0].q;
    p = l->branches[0].p;
    for (size_t k = 0; k < at->count; k++)
        if (at->symbols[k] != large) {
            q = expr_substitute(e, q, at->symbols[k], at->values[k]);
            p = expr_substitute(e, p, at->symbols[k], at->values[k]);
        }
    if (!q || !p || !is_power(e, p, x))
        return ANSWER_UNKNOWN;
    series_init(&s);
    if (series_at_zero(e, &s, q, x, LENGTH, NULL, NULL) == TW_OK && s.count == 1 && s.strands[0].log_power == 0 &&
        s.strands[0].den == 1) {
        slong g = index_step(&s.strands[0].c);
        expr *y = expr_fresh(e, "y");
        expr *f = g > 0 && y ? amplitude_in(e, q, x, s.strands[0].exponent, g, y) : NULL;
        if (f && (completely_monotone(e, f, y) == ANSWER_YES || completely_monotone(e, expr_neg(e, f), y) == ANSWER_YES))
            result = ANSWER_YES;
    }
    series_clear(&s);
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    return result;
}
