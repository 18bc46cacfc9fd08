/* The one idea: three changes of variable that keep the point 0 cover the integrands whose logarithmic derivative is not
 * rational as they stand, but is after the change; each function is replaced by its value in the new variable, and the
 * caller sees whether it was enough. */
#include "engine/exact/rationalise.h"

#include <stdlib.h>

/* ---- what is there ---- */

/* The greatest rational u > 0 of which all rates (the c of exp(c x), cosh(c x)) are integer multiples; 0 when there are
 * none. */
typedef struct rates {
    tw_engine *e;
    expr *x;
    fmpq_t unit;
    bool circular; /* collect those of sin, cos, tan */
} rates;

static void add_rate(rates *r, const fmpq_t c)
{
    fmpq_t a;
    fmpq_init(a);
    fmpq_abs(a, c);
    if (fmpq_is_zero(r->unit)) fmpq_set(r->unit, a);
    else if (!fmpq_is_zero(a)) fmpq_gcd(r->unit, r->unit, a);
    fmpq_clear(a);
}

static bool is_hyperbolic(expr *f)
{
    return expr_is_call(f, FUNCTION_EXP) || expr_is_call(f, FUNCTION_COSH) || expr_is_call(f, FUNCTION_SINH) ||
           expr_is_call(f, FUNCTION_TANH);
}

static bool is_circular(expr *f)
{
    return expr_is_call(f, FUNCTION_SIN) || expr_is_call(f, FUNCTION_COS) || expr_is_call(f, FUNCTION_TAN);
}

/* u = rate*x + rest with a rate other than 0 that is free of x. */
static bool linear_rate(tw_engine *e, expr *u, expr *x, expr **rate, expr **rest)
{
    *rate = expr_derivative(e, u, x);
    if (!*rate) {
        if (e->error.kind == ERROR_VALUE) engine_forgive(e);
        return false;
    }
    if (expr_is_zero(*rate) || expr_has(*rate, x)) return false;
    *rest = expr_substitute(e, u, x, expr_int(e, 0));
    return *rest != NULL;
}

static void collect_rates(rates *r, expr *f)
{
    if (!expr_has(f, r->x)) return;
    expr *rate, *rest;
    if ((r->circular ? is_circular(f) : is_hyperbolic(f)) && linear_rate(r->e, f->args[0], r->x, &rate, &rest) &&
        expr_is_number(rate))
        add_rate(r, expr_number(rate));
    for (uint32_t k = 0; k < f->count; k++) collect_rates(r, f->args[k]);
}

/* The common denominator of the rational exponents of x. */
static void collect_roots(expr *f, expr *x, fmpz_t d)
{
    if (!expr_has(f, x)) return;
    if (f->kind == EXPR_POWER && f->args[0] == x && expr_is_number(f->args[1]))
        fmpz_lcm(d, d, fmpq_denref(expr_number(f->args[1])));
    for (uint32_t k = 0; k < f->count; k++) collect_roots(f->args[k], x, d);
}

/* ---- the new form ---- */

typedef struct change {
    tw_engine *e;
    expr *x, *y, *instead; /* x itself becomes `instead`; NULL: x may not occur alone */
    bool circular;
    fmpq_t unit;
} change;

static expr *change_in(const change *c, expr *f);

/* w^(rate/unit), w = (1 + y)/(1 - y). */
static expr *exponential_power(const change *c, expr *rate)
{
    tw_engine *e = c->e;
    expr *up = expr_add(e, expr_int(e, 1), c->y), *down = expr_sub(e, expr_int(e, 1), c->y);
    expr *power = expr_div(e, rate, expr_fmpq(e, c->unit));
    return expr_mul(e, expr_pow(e, up, power), expr_pow(e, down, expr_neg(e, power)));
}

/* exp, cosh, sinh, tanh of rate*x (+ rest, exp only). */
static expr *change_hyperbolic(const change *c, expr *f, expr *rate, expr *rest)
{
    tw_engine *e = c->e;
    expr *w = exponential_power(c, rate);
    if (expr_is_call(f, FUNCTION_EXP)) return expr_mul(e, expr_call1(e, FUNCTION_EXP, rest), w);
    if (!expr_is_zero(rest)) return NULL;
    expr *inverse = expr_pow(e, w, expr_int(e, -1)), *half = expr_frac(e, 1, 2);
    expr *plus = expr_add(e, w, inverse), *minus = expr_sub(e, w, inverse);
    if (expr_is_call(f, FUNCTION_COSH)) return expr_mul(e, half, plus);
    if (expr_is_call(f, FUNCTION_SINH)) return expr_mul(e, half, minus);
    return expr_div(e, minus, plus);
}

/* cos and sin of k*theta from those of theta, k >= 0: a step of the addition theorem each. */
static void multiple_angle(tw_engine *e, slong k, expr *cosine, expr *sine, expr **c, expr **s)
{
    *c = expr_int(e, 1);
    *s = expr_int(e, 0);
    for (slong n = 0; n < k; n++) {
        expr *next = expr_sub(e, expr_mul(e, *c, cosine), expr_mul(e, *s, sine));
        *s = expr_add(e, expr_mul(e, *s, cosine), expr_mul(e, *c, sine));
        *c = next;
    }
}

static expr *change_circular(const change *c, expr *f, expr *rate, expr *rest)
{
    enum { MULTIPLE_LIMIT = 12 };
    tw_engine *e = c->e;
    if (!expr_is_number(rate)) return NULL;
    fmpq_t k;
    fmpq_init(k);
    fmpq_div(k, expr_number(rate), c->unit);
    slong times = fmpz_fits_si(fmpq_numref(k)) ? fmpz_get_si(fmpq_numref(k)) : WORD_MAX;
    fmpq_clear(k);
    if (!expr_is_zero(rest) || labs(times) > MULTIPLE_LIMIT) return NULL;
    expr *one = expr_int(e, 1), *square = expr_pow(e, c->y, expr_int(e, 2));
    expr *down = expr_pow(e, expr_add(e, one, square), expr_int(e, -1));
    expr *cosine = expr_mul(e, expr_sub(e, one, square), down), *sine = expr_mul(e, expr_mul(e, expr_int(e, 2), c->y), down);
    expr *many_c, *many_s;
    multiple_angle(e, labs(times), cosine, sine, &many_c, &many_s);
    if (times < 0) many_s = expr_neg(e, many_s);
    if (expr_is_call(f, FUNCTION_COS)) return many_c;
    if (expr_is_call(f, FUNCTION_SIN)) return many_s;
    return expr_div(e, many_s, many_c);
}

static expr *change_call(const change *c, expr *f)
{
    tw_engine *e = c->e;
    bool mine = !fmpq_is_zero(c->unit) && (c->circular ? is_circular(f) : is_hyperbolic(f));
    expr *rate, *rest, *args[4];
    if (mine && linear_rate(e, f->args[0], c->x, &rate, &rest))
        return c->circular ? change_circular(c, f, rate, rest) : change_hyperbolic(c, f, rate, rest);
    if (f->count > 4) return NULL;
    for (uint32_t k = 0; k < f->count; k++)
        if (!(args[k] = change_in(c, f->args[k]))) return NULL;
    return expr_call(e, f->is.function, args, f->count);
}

static expr *change_in(const change *c, expr *f)
{
    tw_engine *e = c->e;
    if (!expr_has(f, c->x)) return f;
    if (f == c->x) return c->instead;
    if (f->kind == EXPR_CALL) return change_call(c, f);
    if (f->kind == EXPR_POWER) return expr_pow(e, change_in(c, f->args[0]), change_in(c, f->args[1]));
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT) return NULL;
    expr *made = expr_int(e, f->kind == EXPR_PRODUCT);
    for (uint32_t k = 0; k < f->count && made; k++) {
        expr *one = change_in(c, f->args[k]);
        made = f->kind == EXPR_SUM ? expr_add(e, made, one) : expr_mul(e, made, one);
    }
    return made;
}

/* dx/dy */
static expr *speed_of(const change *c, int which, expr *power)
{
    tw_engine *e = c->e;
    if (which == CHANGE_ROOT) return expr_mul(e, power, expr_pow(e, c->y, expr_sub(e, power, expr_int(e, 1))));
    expr *square = expr_pow(e, c->y, expr_int(e, 2));
    expr *below = which == CHANGE_CIRCULAR ? expr_add(e, expr_int(e, 1), square) : expr_sub(e, expr_int(e, 1), square);
    return expr_div(e, expr_div(e, expr_int(e, 2), expr_fmpq(e, c->unit)), below);
}

/* cosh, sinh, cos, sin as sums of exponentials, outside other functions and powers. */
static expr *spread_exponentials(tw_engine *e, expr *f, expr *x)
{
    if (!f || !expr_has(f, x)) return f;
    bool hyperbolic = expr_is_call(f, FUNCTION_COSH) || expr_is_call(f, FUNCTION_SINH);
    if (hyperbolic || expr_is_call(f, FUNCTION_COS) || expr_is_call(f, FUNCTION_SIN)) {
        expr *unit = hyperbolic ? expr_int(e, 1) : expr_constant_of(e, CONSTANT_I), *u = expr_mul(e, unit, f->args[0]);
        expr *up = expr_call1(e, FUNCTION_EXP, u), *down = expr_call1(e, FUNCTION_EXP, expr_neg(e, u));
        if (expr_is_call(f, FUNCTION_COSH) || expr_is_call(f, FUNCTION_COS))
            return expr_div(e, expr_add(e, up, down), expr_int(e, 2));
        return expr_div(e, expr_sub(e, up, down), expr_mul(e, expr_int(e, 2), unit));
    }
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT) return f;
    expr *made = expr_int(e, f->kind == EXPR_PRODUCT);
    for (uint32_t k = 0; k < f->count && made; k++) {
        expr *one = spread_exponentials(e, f->args[k], x);
        made = f->kind == EXPR_SUM ? expr_add(e, made, one) : expr_mul(e, made, one);
    }
    return made;
}

bool change_variable(tw_engine *e, changed *out, int which, expr *p, expr *q, expr *x)
{
    if (which == CHANGE_SPREAD) {
        *out = (changed){x, p, spread_exponentials(e, q, x)};
        return out->q && out->q != q;
    }
    change c = {.e = e, .x = x, .y = expr_fresh(e, "y"), .circular = which == CHANGE_CIRCULAR};
    rates r = {.e = e, .x = x, .circular = c.circular};
    fmpz_t d;
    fmpz_init(d);
    fmpz_one(d);
    fmpq_init(c.unit);
    fmpq_init(r.unit);
    expr *power = NULL;
    bool good = which != CHANGE_NONE && c.y;
    if (good && which == CHANGE_ROOT) {
        collect_roots(p, x, d), collect_roots(q, x, d);
        power = expr_fmpz(e, d);
        c.instead = power ? expr_pow(e, c.y, power) : NULL;
        good = !fmpz_is_one(d) && c.instead;
    } else if (good) {
        collect_rates(&r, p), collect_rates(&r, q);
        fmpq_set(c.unit, r.unit);
        good = !fmpq_is_zero(r.unit);
    }
    out->y = c.y;
    out->p = good ? change_in(&c, p) : NULL;
    out->q = good ? expr_mul(e, change_in(&c, q), speed_of(&c, which, power)) : NULL;
    if (out->p && which == CHANGE_ROOT) out->p = expr_normal(e, out->p, &c.y, 1);
    if (out->q && which == CHANGE_ROOT) out->q = expr_normal(e, out->q, &c.y, 1);
    if (which == CHANGE_NONE) {
        *out = (changed){x, p, q};
        good = true;
    }
    fmpz_clear(d);
    fmpq_clear(c.unit);
    fmpq_clear(r.unit);
    if (!out->p || !out->q) engine_forgive(e);
    return good && out->p && out->q;
}
