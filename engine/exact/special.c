/* Special functions of a generalised series: error functions and exponential integrals, incomplete and complete
 * Gamma. Each has its power series where the argument goes: at an ordinary point from its derivative or
 * differential equation, at its singular point from the published expansion named beside it. */
#include "engine/exact/compose.h"

#include <stdlib.h>

#include "engine/exact/values.h"

/* ---- helpers ---- */

tw_status push_outer(work *w, pieces *out, const argument *a, expr *value, const tail *outer)
{
    tail c;
    tail_init(&c);
    tail_compose(&w->f, &c, outer, &a->u, w->terms);
    tw_status s = pieces_from_argument(w, out, a, value, &c);
    tail_clear(&w->f, &c);
    return s;
}

slong outer_length(const work *w) { return w->terms + 1; }

tw_status outer_from_exprs(work *w, tail *outer, coefficient_maker make, const void *host)
{
    slong n = outer_length(w);
    element c;
    tail term;
    element_init(&w->f, &c);
    tail_init(&term);
    tw_status s = TW_OK;
    for (slong k = 0; k < n && s == TW_OK; k++) {
        expr *a = budget_ok(w->e) ? make(w->e, host, k) : NULL;
        s = a == NULL ? TW_ERROR : field_from_expr(&w->f, &c, a);
        if (s != TW_OK)
            break;
        tail_set_element(&w->f, &term, &c);
        tail_demote(&w->f, &term);
        tail_shift(&w->f, &term, k);
        tail_add(&w->f, outer, outer, &term, 1);
    }
    outer->known = n;
    outer->gap = 1;
    element_clear(&w->f, &c);
    tail_clear(&w->f, &term);
    return s;
}

tw_status add_value(work *w, pieces *out, expr *value)
{
    pieces constant;
    pieces_init(&constant);
    tw_status s = value == NULL ? TW_ERROR : pieces_from_value(w, &constant, value);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &constant, 1);
    pieces_clear(w, &constant);
    return s;
}

/* ---- error functions, exponential integrals ---- */

static tw_status compose_entire(work *w, pieces *out, expr *call, const pieces *g)
{
    argument a;
    argument_init(&a);
    tw_status s = argument_split(w, &a, g);
    if (s == TW_OK) {
        expr *z = expr_fresh(w->e, "z");
        function_id id = call->is.function;
        s = compose_by_derivative(w, out, expr_call1(w->e, id, z), z, g, expr_call1(w->e, id, a.value));
    }
    argument_clear(w, &a);
    return s;
}

/* E1(z) = -gamma - log z - sum (-z)^k/(k k!) (DLMF 6.6.2), Ei(x) = gamma + log|x| + sum x^k/(k k!) (DLMF 6.6.1). */
static tw_status exponential_integral_at_zero(work *w, pieces *out, bool ei, const argument *a, const pieces *g)
{
    tw_engine *e = w->e;
    int sign = 1, outer_sign = ei ? 1 : -1;
    tail outer;
    pieces l, size;
    tail_init(&outer), pieces_init(&l), pieces_init(&size);
    fmpq_t c;
    fmpq_init(c);
    fmpz_t factorial;
    fmpz_init_set_ui(factorial, 1);
    for (slong k = 1; k < outer_length(w); k++) {
        fmpz_mul_si(factorial, factorial, k);
        fmpz_one(fmpq_numref(c));
        fmpz_mul_si(fmpq_denref(c), factorial, k);
        if (!ei && (k & 1) == 0)
            fmpq_neg(c, c);
        fmpq_poly_set_coeff_fmpq(outer.q, k, c); /* E1: -(-1)^k/(k k!) */
    }
    outer.known = outer_length(w);
    outer.gap = 1;
    tw_status s = pieces_sign(w, &sign, g);
    if (s == TW_OK && sign <= 0 && !ei)
        s = work_refuse(w, "lies on its branch cut for small values of the variable");
    if (s == TW_OK && sign == 0)
        s = work_refuse(w, "is singular");
    if (s == TW_OK) {
        pieces_set(w, &size, g);
        s = pieces_scale(w, &size, expr_int(e, sign));
    }
    if (s == TW_OK)
        s = compose_log(w, &l, &size);
    if (s == TW_OK)
        s = push_outer(w, out, a, expr_int(e, 1), &outer);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &l, outer_sign);
    if (s == TW_OK)
        s = add_value(w, out, expr_mul(e, expr_int(e, outer_sign), expr_constant_of(e, CONSTANT_EULER)));
    fmpz_clear(factorial);
    fmpq_clear(c);
    tail_clear(&w->f, &outer), pieces_clear(w, &l), pieces_clear(w, &size);
    return s;
}

static tw_status compose_exponential_integral(work *w, pieces *out, expr *call, const pieces *g)
{
    argument a;
    argument_init(&a);
    bool ei = call->is.function == FUNCTION_EI;
    tw_status s = argument_split(w, &a, g);
    if (s == TW_OK && expr_is_zero(a.value))
        s = exponential_integral_at_zero(w, out, ei, &a, g);
    else if (s == TW_OK) {
        int sign = value_is_real(w->e, a.value) ? value_sign(w->e, a.value) : 2;
        if (!(sign == 1 || (ei && sign == -1 && g->real)))
            s = work_refuse(w, "has an argument that is not known to be positive");
        expr *z = expr_fresh(w->e, "z");
        if (s == TW_OK)
            s = compose_by_derivative(w, out, expr_call1(w->e, call->is.function, z), z, g,
                                      expr_call1(w->e, call->is.function, a.value));
    }
    argument_clear(w, &a);
    return s;
}

/* (-1)^k/(k! (a + k)); the term k = -a of a nonpositive integer a left out. */
static expr *incomplete_coefficient(tw_engine *e, const void *host, slong k)
{
    expr *a = host, *shifted = expr_add(e, a, expr_int(e, k));
    fmpz_t factorial;
    if (shifted == NULL || expr_is_zero(shifted))
        return expr_int(e, 0);
    fmpz_init(factorial);
    fmpz_fac_ui(factorial, (ulong)k);
    expr *out = expr_div(e, expr_int(e, k & 1 ? -1 : 1), expr_mul(e, expr_fmpz(e, factorial), shifted));
    fmpz_clear(factorial);
    return out;
}

/* Gamma(a, z) = Gamma(a) - z^a sum (-z)^k/(k!(a + k)) (DLMF 8.7.3); for a = -n the constant is (-1)^n/n! (psi(n +
 * 1) - log z) and the term k = n is missing (DLMF 8.4.15). */
static tw_status incomplete_gamma_at_zero(work *w, pieces *out, expr *a, const argument *z, const pieces *g)
{
    tw_engine *e = w->e;
    bool integer = expr_is_number(a) && fmpz_is_one(fmpq_denref(expr_number(a)));
    bool pole = integer && fmpq_sgn(expr_number(a)) <= 0;
    if (pole && fmpz_cmp_si(fmpq_numref(expr_number(a)), -200) < 0)
        return work_refuse(w, "has too large an order");
    tail outer;
    pieces power, l;
    tail_init(&outer), pieces_init(&power), pieces_init(&l);
    tw_status s = TW_OK;
    if (!expr_is_number(a) && value_sign(e, a) != 1)
        s = work_need(w, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), a));
    if (s == TW_OK)
        s = outer_from_exprs(w, &outer, incomplete_coefficient, a);
    if (s == TW_OK)
        s = push_outer(w, out, z, expr_int(e, -1), &outer);
    if (s == TW_OK)
        s = pieces_pow(w, &power, g, a);
    if (s == TW_OK)
        s = pieces_mul(w, out, out, &power);
    if (s == TW_OK && !pole)
        s = add_value(w, out, expr_call1(e, FUNCTION_GAMMA, a));
    if (s == TW_OK && pole) {
        slong n = -fmpz_get_si(fmpq_numref(expr_number(a)));
        expr *front = expr_div(e, expr_int(e, n & 1 ? -1 : 1), expr_call1(e, FUNCTION_GAMMA, expr_int(e, n + 1)));
        fmpq_t harmonic;
        fmpq_init(harmonic);
        fmpq_harmonic_ui(harmonic, (ulong)n);
        expr *psi = expr_sub(e, expr_fmpq(e, harmonic), expr_constant_of(e, CONSTANT_EULER));
        fmpq_clear(harmonic);
        s = compose_log(w, &l, g);
        if (s == TW_OK)
            s = pieces_scale(w, &l, expr_neg(e, front));
        if (s == TW_OK)
            s = pieces_add(w, out, out, &l, 1);
        if (s == TW_OK)
            s = add_value(w, out, expr_expand(e, expr_mul(e, front, psi)));
    }
    tail_clear(&w->f, &outer), pieces_clear(w, &power), pieces_clear(w, &l);
    return s;
}

static tw_status compose_gamma_upper(work *w, pieces *out, expr *call, const pieces *args)
{
    tw_engine *e = w->e;
    expr *a = call->args[0];
    if (expr_has(a, w->x))
        return work_refuse(w, "has an order that depends on the variable");
    argument z;
    argument_init(&z);
    tw_status s = argument_split(w, &z, args + 1);
    if (s == TW_OK && expr_is_zero(z.value))
        s = incomplete_gamma_at_zero(w, out, a, &z, args + 1);
    else if (s == TW_OK && !value_off_cut(e, z.value))
        s = work_refuse(w, "has an argument that is not known to be off its branch cut");
    else if (s == TW_OK) {
        expr *v = expr_fresh(e, "z"), *at_v[2] = {a, v}, *at_value[2] = {a, z.value};
        s = compose_by_derivative(w, out, expr_call(e, FUNCTION_GAMMA_UPPER, at_v, 2), v, args + 1,
                                  expr_call(e, FUNCTION_GAMMA_UPPER, at_value, 2));
    }
    argument_clear(w, &z);
    return s;
}

/* ---- Gamma, its logarithm and derivatives ---- */

/* zeta(n), n >= 2: even ones by Bernoulli numbers (DLMF 25.6.2). */
static expr *zeta_value(tw_engine *e, slong n)
{
    if (n & 1)
        return expr_call1(e, FUNCTION_ZETA, expr_int(e, n));
    fmpq_t c;
    fmpz_t t;
    fmpq_init(c);
    fmpz_init(t);
    bernoulli_fmpq_ui(c, (ulong)n);
    fmpz_fac_ui(t, (ulong)n);
    fmpq_div_fmpz(c, c, t);
    fmpz_one_2exp(t, n - 1);
    fmpq_mul_fmpz(c, c, t);
    fmpq_abs(c, c);
    expr *out = expr_mul(e, expr_fmpq(e, c), expr_pow(e, expr_constant_of(e, CONSTANT_PI), expr_int(e, n)));
    fmpq_clear(c);
    fmpz_clear(t);
    return out;
}

/* psi and its derivatives at 1 and 1/2 (DLMF 5.4.12, 5.4.13, 5.15.2, 5.15.3). */
static expr *polygamma_base(tw_engine *e, slong k, bool half)
{
    expr *gamma = expr_neg(e, expr_constant_of(e, CONSTANT_EULER));
    if (k == 0)
        return half ? expr_sub(e, gamma, expr_mul(e, expr_int(e, 2), expr_call1(e, FUNCTION_LOG, expr_int(e, 2))))
                    : gamma;
    fmpz_t c, t;
    fmpz_init(c), fmpz_init(t);
    fmpz_fac_ui(c, (ulong)k);
    if (half) {
        fmpz_one_2exp(t, k + 1);
        fmpz_sub_ui(t, t, 1);
        fmpz_mul(c, c, t);
    }
    if ((k & 1) == 0)
        fmpz_neg(c, c);
    expr *out = expr_mul(e, expr_fmpz(e, c), zeta_value(e, k + 1));
    fmpz_clear(c), fmpz_clear(t);
    return out;
}

enum { SHIFT_LIMIT = 200 };

/* The k-th derivative of psi at c, c no nonpositive integer; integers and half-integers are brought to 1 and 1/2 by
 * psi^(k)(z + 1) = psi^(k)(z) + (-1)^k k! z^(-k-1) (DLMF 5.15.5). */
static expr *polygamma_value(tw_engine *e, slong k, expr *c)
{
    bool shifts = expr_is_number(c) && fmpz_cmp_si(fmpq_denref(expr_number(c)), 2) <= 0 &&
                  fmpz_cmp_si(fmpq_numref(expr_number(c)), 2 * SHIFT_LIMIT) < 0 &&
                  fmpz_cmp_si(fmpq_numref(expr_number(c)), -2 * SHIFT_LIMIT) > 0;
    if (!shifts) {
        expr *args[2] = {expr_int(e, k), c};
        return k == 0 ? expr_call1(e, FUNCTION_PSI, c) : expr_call(e, FUNCTION_POLYGAMMA, args, 2);
    }
    bool half = !fmpz_is_one(fmpq_denref(expr_number(c)));
    fmpq_t z, sum, t;
    fmpz_t factorial;
    fmpq_init(z), fmpq_init(sum), fmpq_init(t);
    fmpz_init(factorial);
    fmpq_set_si(z, 1, half ? 2 : 1);
    for (; fmpq_cmp(z, expr_number(c)) < 0; fmpq_add_si(z, z, 1)) {
        fmpq_pow_si(t, z, -k - 1);
        fmpq_add(sum, sum, t);
    }
    for (; fmpq_cmp(z, expr_number(c)) > 0;) {
        fmpq_sub_si(z, z, 1);
        fmpq_pow_si(t, z, -k - 1);
        fmpq_sub(sum, sum, t);
    }
    fmpz_fac_ui(factorial, (ulong)k);
    if (k & 1)
        fmpz_neg(factorial, factorial);
    fmpq_mul_fmpz(sum, sum, factorial);
    expr *out = expr_add(e, expr_fmpq(e, sum), polygamma_base(e, k, half));
    fmpq_clear(z), fmpq_clear(sum), fmpq_clear(t);
    fmpz_clear(factorial);
    return out;
}

typedef struct taylor_point {
    expr *c;
    slong order; /* -1: log Gamma without its value; n: the n-th derivative of psi */
} taylor_point;

static expr *polygamma_coefficient(tw_engine *e, const void *host, slong k)
{
    const taylor_point *p = host;
    if (p->order + k < 0)
        return expr_int(e, 0);
    fmpz_t factorial;
    fmpz_init(factorial);
    fmpz_fac_ui(factorial, (ulong)k);
    expr *out = expr_div(e, polygamma_value(e, p->order + k, p->c), expr_fmpz(e, factorial));
    fmpz_clear(factorial);
    return out == NULL ? NULL : expr_expand(e, out);
}

/* Is c known not to be 0, -1, -2, ...? *pole: it is -(*pole); else -1. */
static tw_status gamma_place(work *w, expr *c, slong *pole)
{
    tw_engine *e = w->e;
    *pole = -1;
    if (expr_is_number(c)) {
        const fmpq *q = expr_number(c);
        if (!fmpz_is_one(fmpq_denref(q)) || fmpq_sgn(q) > 0)
            return TW_OK;
        if (fmpz_cmp_si(fmpq_numref(q), -SHIFT_LIMIT) < 0)
            return work_refuse(w, "has too large an argument");
        *pole = -fmpz_get_si(fmpq_numref(q));
        return TW_OK;
    }
    if (value_is_real(e, c) && value_sign(e, c) == 1)
        return TW_OK;
    if (!expr_is_closed_value(c))
        return work_need(w, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), c));
    expr *sine = expr_call1(e, FUNCTION_SIN, expr_mul(e, expr_constant_of(e, CONSTANT_PI), c));
    if (sine == NULL)
        return TW_ERROR;
    if (value_is_zero(e, sine) != ANSWER_NO)
        return engine_fail(e, ERROR_UNDECIDED, "whether an argument of Gamma is a pole could not be decided");
    return TW_OK;
}

/* u - j as pieces, in a's variable. */
static tw_status shifted_small_part(work *w, pieces *out, const argument *a, slong j)
{
    tw_status s = pieces_from_tail(w, out, expr_int(w->e, 1), expr_int(w->e, 0), &a->u, a->den, a->real);
    return s == TW_OK ? add_value(w, out, expr_int(w->e, -j)) : s;
}

/* Gamma(c + u) = Gamma(c) exp(sum psi^(k-1)(c) u^k/k!); at c = -m, Gamma(u - m) = Gamma(1 + u)/(u (u - 1) ... (u -
 * m)). */
static tw_status compose_gamma(work *w, pieces *out, const argument *a, slong pole)
{
    tw_engine *e = w->e;
    taylor_point p = {pole >= 0 ? expr_int(e, 1) : a->value, -1};
    tail outer, c;
    tail_init(&outer), tail_init(&c);
    tw_status s = outer_from_exprs(w, &outer, polygamma_coefficient, &p);
    if (s == TW_OK) {
        tail_compose(&w->f, &c, &outer, &a->u, w->terms);
        tail_exp(&w->f, &c, &c, w->terms);
        s = pieces_from_argument(w, out, a, expr_call1(e, FUNCTION_GAMMA, p.c), &c);
    }
    for (slong j = 0; j <= pole && s == TW_OK; j++) {
        pieces divisor;
        pieces_init(&divisor);
        s = shifted_small_part(w, &divisor, a, j);
        if (s == TW_OK)
            s = pieces_div(w, out, out, &divisor, 1);
        pieces_clear(w, &divisor);
    }
    tail_clear(&w->f, &outer), tail_clear(&w->f, &c);
    return s;
}

/* lnGamma(c + u), c > 0, or c = 0 and u > 0: lnGamma(1 + u) - log u. */
static tw_status compose_lngamma(work *w, pieces *out, const argument *a, slong pole, const pieces *g)
{
    tw_engine *e = w->e;
    int sign = 1;
    taylor_point p = {pole == 0 ? expr_int(e, 1) : a->value, -1};
    tail outer;
    pieces l;
    tail_init(&outer), pieces_init(&l);
    tw_status s = pieces_sign(w, &sign, g);
    if (s == TW_OK && sign <= 0)
        s = work_refuse(w, "has an argument that is not known to be positive");
    if (s == TW_OK)
        s = outer_from_exprs(w, &outer, polygamma_coefficient, &p);
    if (s == TW_OK)
        s = push_outer(w, out, a, expr_int(e, 1), &outer);
    if (s == TW_OK && pole != 0)
        s = add_value(w, out, expr_call1(e, FUNCTION_LNGAMMA, a->value));
    if (s == TW_OK && pole == 0) {
        s = compose_log(w, &l, g);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &l, -1);
    }
    tail_clear(&w->f, &outer), pieces_clear(w, &l);
    return s;
}

/* The n-th derivative of psi at c + u; at c = -m from 1 + u by DLMF 5.15.5. */
static tw_status compose_polygamma(work *w, pieces *out, const argument *a, slong pole, slong n)
{
    tw_engine *e = w->e;
    taylor_point p = {pole >= 0 ? expr_int(e, 1) : a->value, n};
    tail outer;
    pieces divisor, term;
    tail_init(&outer), pieces_init(&divisor), pieces_init(&term);
    fmpz_t factorial;
    fmpz_init(factorial);
    fmpz_fac_ui(factorial, (ulong)n);
    if (n & 1)
        fmpz_neg(factorial, factorial);
    tw_status s = outer_from_exprs(w, &outer, polygamma_coefficient, &p);
    if (s == TW_OK)
        s = push_outer(w, out, a, expr_int(e, 1), &outer);
    for (slong j = 0; j <= pole && s == TW_OK; j++) {
        s = shifted_small_part(w, &divisor, a, j);
        if (s == TW_OK)
            s = pieces_from_value(w, &term, expr_fmpz(e, factorial));
        if (s == TW_OK)
            s = pieces_div(w, &term, &term, &divisor, n + 1);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &term, -1);
    }
    fmpz_clear(factorial);
    tail_clear(&w->f, &outer), pieces_clear(w, &divisor), pieces_clear(w, &term);
    return s;
}

static tw_status compose_gamma_family(work *w, pieces *out, expr *call, const pieces *args)
{
    const pieces *g = args + call->count - 1;
    argument a;
    slong pole;
    argument_init(&a);
    tw_status s = argument_split(w, &a, g);
    if (s == TW_OK)
        s = gamma_place(w, a.value, &pole);
    if (s == TW_OK && call->is.function == FUNCTION_GAMMA)
        s = compose_gamma(w, out, &a, pole);
    else if (s == TW_OK && call->is.function == FUNCTION_LNGAMMA)
        s = compose_lngamma(w, out, &a, pole, g);
    else if (s == TW_OK && call->is.function == FUNCTION_PSI)
        s = compose_polygamma(w, out, &a, pole, 0);
    else if (s == TW_OK) {
        expr *n = call->args[0];
        if (!expr_is_number(n) || !fmpz_is_one(fmpq_denref(expr_number(n))) || fmpq_sgn(expr_number(n)) < 0 ||
            fmpz_cmp_si(fmpq_numref(expr_number(n)), 1000) > 0)
            s = work_refuse(w, "has an order that is not a small natural number");
        else
            s = compose_polygamma(w, out, &a, pole, fmpz_get_si(fmpq_numref(expr_number(n))));
    }
    argument_clear(w, &a);
    return s;
}

/* Beta(a, b) = Gamma(a) Gamma(b) / Gamma(a + b) (DLMF 5.12.1). */
static tw_status compose_beta(work *w, pieces *out, expr *call)
{
    tw_engine *e = w->e;
    expr *a = call->args[0], *b = call->args[1];
    expr *f = expr_div(e, expr_mul(e, expr_call1(e, FUNCTION_GAMMA, a), expr_call1(e, FUNCTION_GAMMA, b)),
                       expr_call1(e, FUNCTION_GAMMA, expr_add(e, a, b)));
    return f == NULL ? TW_ERROR : evaluate_pieces(w, out, f);
}

tw_status compose_special(work *w, pieces *out, expr *call, const pieces *args)
{
    switch (call->is.function) {
    case FUNCTION_ERF:
    case FUNCTION_ERFC: return compose_entire(w, out, call, args);
    case FUNCTION_E1:
    case FUNCTION_EI: return compose_exponential_integral(w, out, call, args);
    case FUNCTION_GAMMA_UPPER: return compose_gamma_upper(w, out, call, args);
    case FUNCTION_GAMMA:
    case FUNCTION_LNGAMMA:
    case FUNCTION_PSI:
    case FUNCTION_POLYGAMMA: return compose_gamma_family(w, out, call, args);
    case FUNCTION_BETA: return compose_beta(w, out, call);
    case FUNCTION_AI:
    case FUNCTION_BI:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return compose_cylinder(w, out, call, args);
    default: return work_refuse(w, "has no known power series");
    }
}
