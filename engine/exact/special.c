/* Special functions of a generalised series: error functions and exponential integrals, incomplete and complete Gamma,
 * Airy and Bessel functions. Each has its power series where the argument goes: at an ordinary point from its derivative
 * or differential equation, at its singular point from the published expansion named beside it. */
#include "engine/exact/compose.h"

#include <stdlib.h>

#include "engine/exact/values.h"

/* ---- helpers ---- */

static void fmpq_div_by(fmpq_t out, const fmpq_t a, slong n)
{
    fmpz_t t;
    fmpz_init_set_si(t, n);
    fmpq_div_fmpz(out, a, t);
    fmpz_clear(t);
}

/* out = value * x^exponent's pieces times outer(a's u). */
static tw_status push_outer(work *w, pieces *out, const argument *a, expr *value, const tail *outer)
{
    tail c;
    tail_init(&c);
    tail_compose(&w->f, &c, outer, &a->u, w->terms);
    tw_status s = pieces_from_argument(w, out, a, value, &c);
    tail_clear(&w->f, &c);
    return s;
}

/* How many coefficients of an outer series are wanted: its variable starts with y at least. */
static slong outer_length(const work *w) { return w->terms + 1; }

/* Elements given one by one as expressions: outer[k] = make(e, host, k). */
typedef expr *(*coefficient_maker)(tw_engine *e, const void *host, slong k);

static tw_status outer_from_exprs(work *w, tail *outer, coefficient_maker make, const void *host)
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

/* A rational outer series c_k = c_(k-1) * top(k)/bottom(k). */
static void outer_hypergeometric(work *w, tail *outer, const fmpq_t shift, bool alternating)
{
    /* sum (+-1)^k / (k! (shift + 1)_k) */
    slong n = outer_length(w);
    fmpq_t c, t;
    fmpq_init(c), fmpq_init(t);
    fmpq_one(c);
    for (slong k = 0; k < n; k++) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        fmpq_set_si(t, k + 1, 1);
        fmpq_add(t, t, shift);
        fmpq_mul_si(t, t, alternating ? -(k + 1) : k + 1);
        fmpq_div(c, c, t);
    }
    outer->known = n;
    outer->gap = 1;
    fmpq_clear(c), fmpq_clear(t);
}

static tw_status add_value(work *w, pieces *out, expr *value)
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

/* Gamma(a, z) = Gamma(a) - z^a sum (-z)^k/(k!(a + k)) (DLMF 8.7.3); for a = -n the constant is (-1)^n/n! (psi(n + 1) - log z)
 * and the term k = n is missing (DLMF 8.4.15). */
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
    arith_bernoulli_number(c, (ulong)n);
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
        return half ? expr_sub(e, gamma, expr_mul(e, expr_int(e, 2), expr_call1(e, FUNCTION_LOG, expr_int(e, 2)))) : gamma;
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

/* Gamma(c + u) = Gamma(c) exp(sum psi^(k-1)(c) u^k/k!); at c = -m, Gamma(u - m) = Gamma(1 + u)/(u (u - 1) ... (u - m)). */
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

/* A second-order linear equation at an ordinary point c: fills y[2..n-1] of the Taylor coefficients from y[0], y[1]. */
typedef void (*taylor_rule)(work *w, element *y, slong n, const element *c, const element *nu2, int sign);

/* out = y(c) * (solution 1, 0) + y'(c) * (solution 0, 1), each in powers of the argument's small part. nu may be NULL. */
static tw_status push_solutions(work *w, pieces *out, const argument *a, expr *y, expr *slope, expr *nu, taylor_rule rule,
                                int sign)
{
    field *f = &w->f;
    expr *initial[2] = {y, slope};
    element c, nu2;
    pieces part;
    element_init(f, &c), element_init(f, &nu2), pieces_init(&part);
    pieces_clear(w, out);
    tw_status s = field_from_expr(f, &c, a->value);
    if (s == TW_OK && nu != NULL)
        s = field_from_expr(f, &nu2, nu);
    if (s == TW_OK)
        field_mul(f, &nu2, &nu2, &nu2);
    for (int k = 0; k < 2 && s == TW_OK; k++) {
        tail outer;
        tail_init(&outer);
        tail_promote(f, &outer);
        elements_free(f, outer.m, outer.count);
        outer.count = outer.known = outer_length(w) + 1;
        outer.gap = 1;
        outer.m = elements_new(f, outer.count);
        fmpz_mpoly_q_one(outer.m + k, f->ctx);
        rule(w, outer.m, outer.count, &c, &nu2, sign);
        tail_demote(f, &outer);
        s = push_outer(w, &part, a, initial[k], &outer);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &part, 1);
        tail_clear(f, &outer);
    }
    element_clear(f, &c), element_clear(f, &nu2), pieces_clear(w, &part);
    return s;
}

/* The derivative in z of f(z), at a value. */
static expr *slope_at(tw_engine *e, expr *f, expr *z, expr *value)
{
    expr *slope = f == NULL ? NULL : expr_derivative(e, f, z);
    return slope == NULL ? NULL : expr_substitute(e, slope, z, value);
}

/* ---- Airy functions ---- */

/* The two power series of DLMF 9.4.1 and 9.4.3: f (start 0) and g (start 1). */
static void outer_airy(work *w, tail *outer, slong start)
{
    slong n = outer_length(w);
    fmpq_t c;
    fmpq_init(c);
    fmpq_one(c);
    for (slong k = start; k < n; k += 3) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        fmpq_div_by(c, c, (k + 3) * (k + 2)); /* y'' = z y */
    }
    outer->known = n;
    outer->offset = start;
    outer->gap = 3;
    fmpq_clear(c);
}

/* Ai(0) = 3^(-2/3)/Gamma(2/3), Ai'(0) = -3^(-1/3)/Gamma(1/3), Bi(0) = 3^(-1/6)/Gamma(2/3), Bi'(0) = 3^(1/6)/Gamma(1/3):
 * DLMF 9.2.3 to 9.2.6. */
static expr *airy_initial(tw_engine *e, bool bi, slong derivative)
{
    static const int power[2][2] = {{-4, -2}, {-1, 1}}; /* in sixths */
    expr *value = expr_div(e, expr_pow(e, expr_int(e, 3), expr_frac(e, power[bi][derivative], 6)),
                           expr_call1(e, FUNCTION_GAMMA, expr_frac(e, derivative ? 1 : 2, 3)));
    return !bi && derivative ? expr_neg(e, value) : value;
}

/* y'' = z y: y_(k+2) (k + 2)(k + 1) = c y_k + y_(k-1). */
static void airy_taylor(work *w, element *y, slong n, const element *c, const element *nu2, int sign)
{
    field *f = &w->f;
    (void)nu2, (void)sign;
    for (slong k = 0; k + 2 < n && budget_ok(w->e); k++) {
        field_mul(f, y + k + 2, c, y + k);
        if (k > 0)
            fmpz_mpoly_q_add(y + k + 2, y + k + 2, y + k - 1, f->ctx);
        fmpz_mpoly_q_div_si(y + k + 2, y + k + 2, (k + 2) * (k + 1), f->ctx);
    }
}

static tw_status airy_at_point(work *w, pieces *out, function_id id, const argument *a)
{
    tw_engine *e = w->e;
    expr *z = expr_fresh(e, "z");
    if (!value_is_real(e, a->value)) /* Ai' has a name along the real axis only */
        return work_refuse(w, "has an argument that is not known to be real");
    return push_solutions(w, out, a, expr_call1(e, id, a->value), slope_at(e, expr_call1(e, id, z), z, a->value), NULL,
                          airy_taylor, 0);
}

static tw_status compose_airy(work *w, pieces *out, expr *call, const pieces *g)
{
    argument a;
    tail f, h;
    pieces second;
    argument_init(&a), tail_init(&f), tail_init(&h), pieces_init(&second);
    bool bi = call->is.function == FUNCTION_BI;
    tw_status s = argument_split(w, &a, g);
    if (s == TW_OK && !expr_is_zero(a.value))
        s = airy_at_point(w, out, call->is.function, &a);
    else if (s == TW_OK) {
        outer_airy(w, &f, 0);
        outer_airy(w, &h, 1);
        s = push_outer(w, out, &a, airy_initial(w->e, bi, 0), &f);
        if (s == TW_OK)
            s = push_outer(w, &second, &a, airy_initial(w->e, bi, 1), &h);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &second, 1);
    }
    argument_clear(w, &a), tail_clear(&w->f, &f), tail_clear(&w->f, &h), pieces_clear(w, &second);
    return s;
}

/* ---- Bessel functions ---- */

static expr *bessel(tw_engine *e, function_id id, expr *nu, expr *z)
{
    expr *args[2] = {nu, z};
    return expr_call(e, id, args, 2);
}

/* 1/(k! (nu + 1)_k) */
static expr *bessel_coefficient(tw_engine *e, const void *host, slong k)
{
    expr *nu = host, *product = expr_int(e, 1);
    fmpz_t factorial;
    fmpz_init(factorial);
    fmpz_fac_ui(factorial, (ulong)k);
    for (slong j = 1; j <= k && product != NULL; j++)
        product = expr_mul(e, product, expr_add(e, nu, expr_int(e, j)));
    expr *out = expr_div(e, expr_int(e, 1), expr_mul(e, expr_fmpz(e, factorial), product));
    fmpz_clear(factorial);
    return out;
}

/* (z/2)^nu/Gamma(nu + 1) sum (-+ z^2/4)^k / (k! (nu + 1)_k): DLMF 10.2.2, 10.25.2; z -> 0, nu no negative integer. */
static tw_status bessel_at_zero(work *w, pieces *out, bool modified, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    argument a;
    tail outer;
    pieces half, square;
    argument_init(&a), tail_init(&outer), pieces_init(&half), pieces_init(&square);
    tw_status s = TW_OK;
    expr *order = expr_add(e, nu, expr_int(e, 1));
    if (!expr_is_number(nu) && order != NULL && value_sign(e, order) != 1)
        s = work_need(w, expr_relation_of(e, RELATION_LESS, expr_int(e, -1), nu));
    if (s == TW_OK && expr_is_number(nu))
        outer_hypergeometric(w, &outer, expr_number(nu), !modified);
    else if (s == TW_OK) {
        s = outer_from_exprs(w, &outer, bessel_coefficient, nu);
        for (slong k = 1; s == TW_OK && !modified && !outer.rational && k < outer.count; k += 2)
            fmpz_mpoly_q_neg(outer.m + k, outer.m + k, w->f.ctx);
    }
    pieces_set(w, &half, g);
    if (s == TW_OK)
        s = pieces_scale(w, &half, expr_frac(e, 1, 2));
    if (s == TW_OK)
        s = pieces_mul(w, &square, &half, &half);
    if (s == TW_OK)
        s = argument_split(w, &a, &square);
    if (s == TW_OK)
        s = push_outer(w, out, &a, expr_div(e, expr_int(e, 1), expr_call1(e, FUNCTION_GAMMA, order)), &outer);
    if (s == TW_OK && !expr_is_zero(nu)) {
        s = pieces_pow(w, &half, &half, nu);
        if (s == TW_OK)
            s = pieces_mul(w, out, out, &half);
    }
    argument_clear(w, &a), tail_clear(&w->f, &outer), pieces_clear(w, &half), pieces_clear(w, &square);
    return s;
}

/* sum over k < n of (n-k-1)!/k! (+-y)^k and sum of (H_k + H_(n+k))/(k! (n+k)!) (+-y)^k, y = z^2/4. */
static void outer_bessel_finite(tail *outer, slong n, bool alternating)
{
    fmpq_t c;
    fmpq_init(c);
    fmpz_fac_ui(fmpq_numref(c), (ulong)(n - 1));
    for (slong k = 0; k < n; k++) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        if (k + 1 < n)
            fmpq_div_by(c, c, (alternating ? -1 : 1) * (k + 1) * (n - k - 1));
    }
    fmpq_clear(c);
}

static void outer_bessel_harmonic(work *w, tail *outer, slong n, bool alternating)
{
    fmpq_t c, t, h;
    slong length = outer_length(w);
    fmpq_init(c), fmpq_init(t), fmpq_init(h);
    fmpq_harmonic_ui(h, (ulong)n); /* H_k + H_(n+k) */
    fmpz_fac_ui(fmpq_denref(c), (ulong)n);
    fmpz_one(fmpq_numref(c));
    for (slong k = 0; k < length; k++) {
        fmpq_mul(t, c, h);
        fmpq_poly_set_coeff_fmpq(outer->q, k, t);
        fmpq_div_by(c, c, (alternating ? -1 : 1) * (k + 1) * (n + k + 1));
        fmpq_set_si(t, 1, (ulong)(k + 1));
        fmpq_add(h, h, t);
        fmpq_set_si(t, 1, (ulong)(n + k + 1));
        fmpq_add(h, h, t);
    }
    outer->known = length;
    outer->gap = 1;
    fmpq_clear(c), fmpq_clear(t), fmpq_clear(h);
}

/* (z/2)^power times outer(z^2/4) times value, added to out. */
static tw_status add_bessel_part(work *w, pieces *out, const pieces *half, slong power, const tail *outer, expr *value)
{
    argument a;
    pieces square, part, front;
    argument_init(&a), pieces_init(&square), pieces_init(&part), pieces_init(&front);
    tw_status s = pieces_mul(w, &square, half, half);
    if (s == TW_OK)
        s = argument_split(w, &a, &square);
    if (s == TW_OK)
        s = push_outer(w, &part, &a, value, outer);
    if (s == TW_OK)
        s = pieces_pow(w, &front, half, expr_int(w->e, power));
    if (s == TW_OK)
        s = pieces_mul(w, &part, &part, &front);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &part, 1);
    argument_clear(w, &a), pieces_clear(w, &square), pieces_clear(w, &part), pieces_clear(w, &front);
    return s;
}

/* K_n: 1/2 (z/2)^-n S_1 + (-1)^(n+1) (log(z/2) + gamma) I_n + (-1)^n/2 (z/2)^n S_2   (DLMF 10.31.1)
 * Y_n: -1/pi (z/2)^-n S_1 + 2/pi (log(z/2) + gamma) J_n - 1/pi (z/2)^n S_2           (DLMF 10.8.1)
 * with the sums above; psi(k + 1) = H_k - gamma. */
static tw_status second_kind_integer(work *w, pieces *out, bool modified, slong n, const pieces *g)
{
    tw_engine *e = w->e;
    tail finite, harmonic;
    pieces half, l, first;
    tail_init(&finite), tail_init(&harmonic), pieces_init(&half), pieces_init(&l), pieces_init(&first);
    expr *over_pi = expr_pow(e, expr_constant_of(e, CONSTANT_PI), expr_int(e, -1));
    expr *one = modified ? expr_frac(e, 1, 2) : expr_neg(e, over_pi);
    expr *two = modified ? expr_int(e, n & 1 ? 1 : -1) : expr_mul(e, expr_int(e, 2), over_pi);
    expr *three = modified ? expr_frac(e, n & 1 ? -1 : 1, 2) : expr_neg(e, over_pi);
    pieces_set(w, &half, g);
    tw_status s = pieces_scale(w, &half, expr_frac(e, 1, 2));
    if (s == TW_OK)
        s = compose_log(w, &l, &half);
    if (s == TW_OK)
        s = add_value(w, &l, expr_constant_of(e, CONSTANT_EULER));
    if (s == TW_OK)
        s = bessel_at_zero(w, &first, modified, expr_int(e, n), g);
    if (s == TW_OK)
        s = pieces_mul(w, out, &l, &first);
    if (s == TW_OK)
        s = pieces_scale(w, out, two);
    if (s == TW_OK && n > 0) {
        outer_bessel_finite(&finite, n, modified);
        s = add_bessel_part(w, out, &half, -n, &finite, one);
    }
    if (s == TW_OK) {
        outer_bessel_harmonic(w, &harmonic, n, !modified);
        s = add_bessel_part(w, out, &half, n, &harmonic, three);
    }
    tail_clear(&w->f, &finite), tail_clear(&w->f, &harmonic);
    pieces_clear(w, &half), pieces_clear(w, &l), pieces_clear(w, &first);
    return s;
}

/* K = pi/2 (I_-nu - I_nu)/sin(nu pi) (DLMF 10.27.4), Y = (J_nu cos(nu pi) - J_-nu)/sin(nu pi) (DLMF 10.2.3). */
static tw_status second_kind_fractional(work *w, pieces *out, bool modified, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    pieces plus, minus;
    pieces_init(&plus), pieces_init(&minus);
    expr *angle = expr_mul(e, nu, expr_constant_of(e, CONSTANT_PI));
    expr *over = expr_pow(e, expr_call1(e, FUNCTION_SIN, angle), expr_int(e, -1));
    expr *front = modified ? expr_mul(e, expr_mul(e, expr_constant_of(e, CONSTANT_PI), expr_frac(e, 1, 2)), over) : over;
    tw_status s = bessel_at_zero(w, &plus, modified, nu, g);
    if (s == TW_OK)
        s = bessel_at_zero(w, &minus, modified, expr_neg(e, nu), g);
    if (s == TW_OK)
        s = pieces_scale(w, &plus, modified ? expr_neg(e, front) : expr_mul(e, front, expr_call1(e, FUNCTION_COS, angle)));
    if (s == TW_OK)
        s = pieces_scale(w, &minus, modified ? front : expr_neg(e, front));
    if (s == TW_OK)
        s = pieces_add(w, out, &plus, &minus, 1);
    pieces_clear(w, &plus), pieces_clear(w, &minus);
    return s;
}

static tw_status bessel_kind_at_zero(work *w, pieces *out, function_id id, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    bool modified = id == FUNCTION_BESSEL_I || id == FUNCTION_BESSEL_K;
    bool first = id == FUNCTION_BESSEL_I || id == FUNCTION_BESSEL_J;
    bool integer = expr_is_number(nu) && fmpz_is_one(fmpq_denref(expr_number(nu)));
    if (integer && fmpz_bits(fmpq_numref(expr_number(nu))) > 10)
        return work_refuse(w, "has too large an order");
    slong n = integer ? fmpz_get_si(fmpq_numref(expr_number(nu))) : 0;
    if (!first && !integer && !expr_is_number(nu)) {
        expr *above = expr_add(e, expr_int(e, 1), nu), *below = expr_sub(e, expr_int(e, 1), nu);
        if (above == NULL || below == NULL || value_sign(e, above) != 1 || value_sign(e, below) != 1 ||
            value_sign(e, nu) == 0 || value_sign(e, nu) == 2)
            return work_refuse(w, "has an order that is not known to lie between two integers next to 0");
    }
    if (!first && !integer)
        return second_kind_fractional(w, out, modified, nu, g);
    /* negative integers: I_-n = I_n, J_-n = (-1)^n J_n, and so for K and Y (DLMF 10.27.1, 10.4.1, 10.27.3) */
    tw_status s = first ? bessel_at_zero(w, out, modified, integer ? expr_int(e, n < 0 ? -n : n) : nu, g)
                        : second_kind_integer(w, out, modified, n < 0 ? -n : n, g);
    if (s == TW_OK && n < 0 && (n & 1) && !modified)
        s = pieces_scale(w, out, expr_int(e, -1));
    return s;
}

/* z^2 y'' + z y' + (sign z^2 - nu^2) y = 0 (DLMF 10.2.1, 10.25.1). */
static void bessel_taylor(work *w, element *y, slong n, const element *c, const element *nu2, int sign)
{
    field *f = &w->f;
    element t, c2, den;
    element_init(f, &t), element_init(f, &c2), element_init(f, &den);
    field_mul(f, &c2, c, c);
    for (slong k = 0; k + 2 < n && budget_ok(w->e); k++) {
        element *next = y + k + 2;
        fmpz_mpoly_q_mul_si(&t, c, -(k + 1) * (2 * k + 1), f->ctx); /* -(k + 1)(2 k + 1) c y_(k+1) */
        field_addmul(f, next, &t, y + k + 1);
        fmpz_mpoly_q_mul_si(&t, &c2, -sign, f->ctx); /* -(k^2 + sign c^2 - nu^2) y_k */
        fmpz_mpoly_q_add(&t, &t, nu2, f->ctx);
        fmpz_mpoly_q_sub_si(&t, &t, k * k, f->ctx);
        field_addmul(f, next, &t, y + k);
        if (k >= 1) { /* -2 sign c y_(k-1) */
            fmpz_mpoly_q_mul_si(&t, c, -2 * sign, f->ctx);
            field_addmul(f, next, &t, y + k - 1);
        }
        if (k >= 2) {
            fmpz_mpoly_q_mul_si(&t, y + k - 2, -sign, f->ctx);
            fmpz_mpoly_q_add(next, next, &t, f->ctx);
        }
        fmpz_mpoly_q_mul_si(&den, &c2, (k + 2) * (k + 1), f->ctx);
        field_div(f, next, next, &den);
    }
    element_clear(f, &t), element_clear(f, &c2), element_clear(f, &den);
}

static tw_status bessel_at_point(work *w, pieces *out, function_id id, expr *nu, const argument *a)
{
    tw_engine *e = w->e;
    int sign = id == FUNCTION_BESSEL_J || id == FUNCTION_BESSEL_Y ? 1 : -1;
    if (!value_off_cut(e, a->value))
        return work_refuse(w, "has an argument that is not known to be off its branch cut");
    expr *z = expr_fresh(e, "z");
    return push_solutions(w, out, a, bessel(e, id, nu, a->value), slope_at(e, bessel(e, id, nu, z), z, a->value), nu,
                          bessel_taylor, sign);
}

static tw_status compose_bessel(work *w, pieces *out, expr *call, const pieces *args)
{
    expr *nu = call->args[0];
    if (expr_has(nu, w->x))
        return work_refuse(w, "has an order that depends on the variable");
    argument a;
    argument_init(&a);
    /* the split also refuses what grows; at 0 the series in z^2 and the power are taken from g itself */
    bool small = true;
    for (size_t k = 0; k < args[1].count; k++)
        small = small && args[1].at[k].log_power == 0 && fmpq_sgn(args[1].at[k].lead) > 0 &&
                expr_is_zero(args[1].at[k].sigma);
    tw_status s = small ? TW_OK : argument_split(w, &a, args + 1);
    pieces_clear(w, out);
    if (s == TW_OK && (small || expr_is_zero(a.value)))
        s = bessel_kind_at_zero(w, out, call->is.function, nu, args + 1);
    else if (s == TW_OK)
        s = bessel_at_point(w, out, call->is.function, nu, &a);
    argument_clear(w, &a);
    return s;
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
    case FUNCTION_BI: return compose_airy(w, out, call, args);
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return compose_bessel(w, out, call, args);
    default: return work_refuse(w, "has no known power series");
    }
}
