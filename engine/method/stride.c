/* Zeros of structure: an amplitude that depends on x^g only, apart from powers in front, has coefficients at every g-th
 * place. They are left out of the lanes, so that c[n] counts what is there (1/sqrt(1 + x^2): s^-1, s^-3, s^-5 ...).
 * Decided from the form of the integrand, never from the coefficients computed so far: what is left out is 0 for all n.
 */
#include <stdlib.h>

#include "engine/method/lanes.h"

static slong gcd(slong a, slong b)
{
    while (b) {
        slong r = a % b;
        a = b;
        b = r;
    }
    return a;
}

/* The greatest g such that f is made of x^g alone; 0 when x does not occur, 1 when nothing is known. */
static slong inner_stride(expr *f, expr *x)
{
    if (f == x) return 1;
    if (!expr_has(f, x)) return 0;
    if (f->kind == EXPR_POWER && f->args[0] == x) {
        if (!expr_is_number(f->args[1]) || !fmpz_is_one(fmpq_denref(expr_number(f->args[1])))) return 1;
        const fmpz *n = fmpq_numref(expr_number(f->args[1]));
        return fmpz_cmp_si(n, -1000000) > 0 && fmpz_cmp_si(n, 1000000) < 0 ? labs(fmpz_get_si(n)) : 1;
    }
    slong g = 0;
    for (uint32_t k = 0; k < f->count && g != 1; k++) g = gcd(g, inner_stride(f->args[k], x));
    return g;
}

/* +1 even, -1 odd, 0 neither, by the canonical form of f(-x). */
static int parity(tw_engine *e, expr *f, expr *x)
{
    expr *mirrored = expr_substitute(e, f, x, expr_neg(e, x));
    if (!mirrored) {
        engine_forgive(e);
        return 0;
    }
    return mirrored == f ? 1 : mirrored == expr_neg(e, f) ? -1 : 0;
}

/* A factor that only shifts exponents or brings a power of log(x). */
static bool is_shift(expr *factor, expr *x)
{
    expr *base = factor->kind == EXPR_POWER && !expr_has(factor->args[1], x) ? factor->args[0] : factor;
    return base == x || (expr_is_call(base, FUNCTION_LOG) && base->args[0] == x);
}

static slong amplitude_stride(tw_engine *e, expr *q, expr *x)
{
    expr *const *factors;
    size_t count = expr_factors(&q, &factors);
    expr *rest = expr_int(e, 1);
    slong g = 0;
    for (size_t k = 0; k < count; k++) {
        if (is_shift(factors[k], x)) continue;
        g = gcd(g, inner_stride(factors[k], x));
        rest = expr_mul(e, rest, factors[k]);
    }
    if (!rest) {
        engine_forgive(e);
        return 1;
    }
    return g % 2 && parity(e, rest, x) != 0 ? 2 * g : g;
}

slong local_stride(tw_engine *e, const branch *b, bool pure, const fmpq_t mu)
{
    if (!b->q) return 1;
    if (!pure) return parity(e, b->p, b->x) == -1 && parity(e, b->q, b->x) != 0 ? 2 : 1;
    slong g = amplitude_stride(e, b->q, b->x);
    if (g == 0 || !fmpz_fits_si(fmpq_numref(mu))) return 1;
    return g / gcd(g, fmpz_get_si(fmpq_numref(mu)));
}

void lane_thin(tw_engine *e, lane *l, slong stride)
{
    coefficients *c = &l->c;
    slong first = 0, count = 0;
    while (first < c->count && coefficient_is_zero(c, first)) first++;
    if (stride < 2) return;
    for (slong n = 0; n < c->count; n++)
        if ((n - first) % stride != 0 && !coefficient_is_zero(c, n)) return;
    if (first == c->count) return;
    first %= stride;
    count = (c->count - first + stride - 1) / stride;
    if (c->q) {
        fmpq *q = _fmpq_vec_init(count);
        for (slong n = 0; n < count; n++) fmpq_swap(&q[n], &c->q[first + n * stride]);
        _fmpq_vec_clear(c->q, c->count);
        c->q = q;
    } else {
        for (slong n = 0; n < count; n++) c->x[n] = c->x[first + n * stride];
    }
    c->count = count;
    fmpq_t shift;
    fmpq_init(shift);
    fmpq_mul_si(shift, l->step, first);
    l->first_exponent = expr_add(e, l->first_exponent, expr_fmpq(e, shift));
    fmpq_clear(shift);
    fmpq_mul_si(l->step, l->step, stride);
}
