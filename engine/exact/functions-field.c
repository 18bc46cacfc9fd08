/* Rational functions of parameters and constants, on Calcium's fmpz_mpoly_q: the field in which a coefficient
 * lives when it is not rational. An expression enters by field_from_expr, which sees through sums, products and
 * powers and makes what is left a generator. The one idea: arithmetic is in a free field, lowest terms by
 * multivariate gcd, and the few algebraic relations are monic polynomials that powers are reduced by. Knows
 * nothing of series. */
#include "engine/exact/field.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/tape.h"
#include "engine/exact/algebraic.h"
#include "engine/exact/values.h"

static slong variable_of(const field *f, slong k) { return f->room - 1 - k; } /* of generator k */

void field_init(field *f, tw_engine *e, slong room)
{
    memset(f, 0, sizeof *f);
    f->e = e;
    f->room = room;
    f->generators = base_alloc((size_t)room * sizeof *f->generators);
    fmpz_mpoly_ctx_init(f->ctx, room, ORD_LEX);
}

void field_clear(field *f)
{
    for (slong k = 0; k < f->count; k++) {
        fmpz_mpoly_clear(f->generators[k].relation, f->ctx);
        acb_clear(f->generators[k].value);
    }
    free(f->generators);
    fmpz_mpoly_ctx_clear(f->ctx);
}

void element_init(field *f, element *a) { fmpz_mpoly_q_init(a, f->ctx); }
void element_clear(field *f, element *a) { fmpz_mpoly_q_clear(a, f->ctx); }

element *elements_new(field *f, slong n)
{
    element *a = base_alloc((size_t)FLINT_MAX(n, 1) * sizeof *a);
    for (slong k = 0; k < n; k++)
        element_init(f, a + k);
    return a;
}

void elements_free(field *f, element *a, slong n)
{
    for (slong k = 0; k < n; k++)
        element_clear(f, a + k);
    free(a);
}

/* ---- reduction by the relations ---- */

static bool reduce_polynomial(field *f, fmpz_mpoly_t p)
{
    bool changed = false;
    for (slong k = f->count - 1; k >= 0; k--) {
        generator *g = f->generators + k;
        if (g->degree == 0 || fmpz_mpoly_degree_si(p, variable_of(f, k), f->ctx) < g->degree)
            continue;
        fmpz_mpoly_t q;
        fmpz_mpoly_init(q, f->ctx);
        fmpz_mpoly_divrem(q, p, p, g->relation, f->ctx);
        fmpz_mpoly_clear(q, f->ctx);
        changed = true;
    }
    return changed;
}

/* den as a polynomial in generator k alone, with integers for coefficients; false when others occur. */
static bool alone_in(field *f, fmpq_poly_t out, const fmpz_mpoly_t den, slong k)
{
    slong n = fmpz_mpoly_length(den, f->ctx), variable = variable_of(f, k);
    ulong *exponents = base_alloc((size_t)f->room * sizeof *exponents);
    fmpz_t c;
    fmpz_init(c);
    bool alone = true;
    fmpq_poly_zero(out);
    for (slong t = 0; t < n && alone; t++) {
        fmpz_mpoly_get_term_exp_ui(exponents, den, t, f->ctx);
        for (slong v = 0; v < f->room && alone; v++)
            alone = v == variable || exponents[v] == 0;
        fmpz_mpoly_get_term_coeff_fmpz(c, den, t, f->ctx);
        if (alone)
            fmpq_poly_set_coeff_fmpz(out, (slong)exponents[variable], c);
    }
    fmpz_clear(c);
    free(exponents);
    return alone;
}

static void set_in_generator(field *f, fmpz_mpoly_t out, const fmpq_poly_t a, slong k)
{
    fmpz_mpoly_t g, term;
    fmpz_t c;
    fmpz_init(c);
    fmpz_mpoly_init(g, f->ctx), fmpz_mpoly_init(term, f->ctx);
    fmpz_mpoly_zero(out, f->ctx);
    for (slong j = fmpq_poly_degree(a); j >= 0; j--) {
        fmpz_mpoly_gen(g, variable_of(f, k), f->ctx);
        fmpz_mpoly_pow_ui(term, g, (ulong)j, f->ctx);
        fmpz_set(c, fmpq_poly_numref(a) + j);
        fmpz_mpoly_scalar_mul_fmpz(term, term, c, f->ctx);
        fmpz_mpoly_add(out, out, term, f->ctx);
    }
    fmpz_mpoly_clear(g, f->ctx), fmpz_mpoly_clear(term, f->ctx);
    fmpz_clear(c);
}

/* The inverse in the number field of generator k, times an integer. */
static bool inverse_in_number_field(field *f, fmpz_mpoly_t adjoint, const fmpz_mpoly_t den, slong k)
{
    fmpq_poly_t d, m, g, s, t;
    fmpq_poly_init(d), fmpq_poly_init(m), fmpq_poly_init(g), fmpq_poly_init(s), fmpq_poly_init(t);
    bool fits = alone_in(f, d, den, k) && alone_in(f, m, f->generators[k].relation, k);
    if (fits) {
        fmpq_poly_xgcd(g, s, t, d, m);
        fits = fmpq_poly_degree(g) == 0;
    }
    if (fits) {
        fmpq_poly_scalar_mul_fmpz(s, s, fmpq_poly_denref(s));
        set_in_generator(f, adjoint, s, k);
    }
    fmpq_poly_clear(d), fmpq_poly_clear(m), fmpq_poly_clear(g), fmpq_poly_clear(s), fmpq_poly_clear(t);
    return fits;
}

/* g^degree = a polynomial in earlier generators, or one with lower powers of g too? */
static bool relation_is_binomial(field *f, slong k)
{
    const generator *g = f->generators + k;
    fmpz_mpoly_t part;
    slong variable = variable_of(f, k);
    bool binomial = true;
    fmpz_mpoly_init(part, f->ctx);
    for (ulong j = 1; j < (ulong)g->degree && binomial; j++) {
        fmpz_mpoly_get_coeff_vars_ui(part, g->relation, &variable, &j, 1, f->ctx);
        binomial = fmpz_mpoly_is_zero(part, f->ctx);
    }
    fmpz_mpoly_clear(part, f->ctx);
    return binomial;
}

/* adjoint = the product of den's other conjugates over g, g^degree = c, so that den * adjoint is free of g: for A
 * + B g the element A - B g, for A + B g + C g^2 (degree 3) the element A^2 - B C c + (C^2 c - A B) g + (B^2 - A
 * C) g^2, for a monomial in g of any degree the missing power. False when none of these fits. */
static bool adjoint_of(field *f, fmpz_mpoly_t adjoint, const fmpz_mpoly_t den, slong k)
{
    fmpz_mpoly_struct part[3], power, c, t;
    slong variable = variable_of(f, k), degree = f->generators[k].degree;
    bool fits = true, monomial = true;
    if (!relation_is_binomial(f, k))
        return inverse_in_number_field(f, adjoint, den, k);
    fmpz_mpoly_init(&power, f->ctx), fmpz_mpoly_init(&c, f->ctx), fmpz_mpoly_init(&t, f->ctx);
    for (int j = 0; j < 3; j++)
        fmpz_mpoly_init(part + j, f->ctx);
    fmpz_mpoly_gen(&power, variable, f->ctx);
    ulong top = (ulong)fmpz_mpoly_degree_si(den, variable, f->ctx);
    for (ulong j = 0; j < top && monomial; j++) {
        fmpz_mpoly_get_coeff_vars_ui(&t, den, &variable, &j, 1, f->ctx);
        monomial = fmpz_mpoly_is_zero(&t, f->ctx);
    }
    for (ulong j = 0; j < 3; j++)
        fmpz_mpoly_get_coeff_vars_ui(part + j, den, &variable, &j, 1, f->ctx);
    if (monomial)
        fmpz_mpoly_pow_ui(adjoint, &power, (ulong)degree - top, f->ctx);
    else if (degree == 2) {
        fmpz_mpoly_scalar_mul_si(adjoint, part, 2, f->ctx);
        fmpz_mpoly_sub(adjoint, adjoint, den, f->ctx);
    } else if (degree == 3) {
        fmpz_mpoly_pow_ui(&c, &power, 3, f->ctx);
        fmpz_mpoly_sub(&c, &c, f->generators[k].relation, f->ctx);
        fmpz_mpoly_mul(&t, part + 1, part + 2, f->ctx), fmpz_mpoly_mul(&t, &t, &c, f->ctx);
        fmpz_mpoly_mul(adjoint, part, part, f->ctx), fmpz_mpoly_sub(adjoint, adjoint, &t, f->ctx);
        fmpz_mpoly_mul(&t, part + 2, part + 2, f->ctx), fmpz_mpoly_mul(&t, &t, &c, f->ctx);
        fmpz_mpoly_mul(&c, part, part + 1, f->ctx), fmpz_mpoly_sub(&t, &t, &c, f->ctx);
        fmpz_mpoly_mul(&t, &t, &power, f->ctx), fmpz_mpoly_add(adjoint, adjoint, &t, f->ctx);
        fmpz_mpoly_mul(&t, part + 1, part + 1, f->ctx), fmpz_mpoly_mul(&c, part, part + 2, f->ctx);
        fmpz_mpoly_sub(&t, &t, &c, f->ctx), fmpz_mpoly_mul(&t, &t, &power, f->ctx);
        fmpz_mpoly_mul(&t, &t, &power, f->ctx), fmpz_mpoly_add(adjoint, adjoint, &t, f->ctx);
    } else
        fits = false;
    for (int j = 0; j < 3; j++)
        fmpz_mpoly_clear(part + j, f->ctx);
    fmpz_mpoly_clear(&power, f->ctx), fmpz_mpoly_clear(&c, f->ctx), fmpz_mpoly_clear(&t, f->ctx);
    return fits;
}

enum { SAMPLE_BITS = 128 };

static acb_srcptr generator_value(field *f, slong k)
{
    generator *g = f->generators + k;
    if (!g->valued) {
        expr *at = value_sample(f->e, g->atom, 0);
        if (at == NULL || ball_value(f->e, g->value, at, SAMPLE_BITS) != TW_OK) {
            engine_forgive(f->e);
            acb_indeterminate(g->value);
        }
        g->valued = true;
    }
    return g->value;
}

/* Is p proved nonzero, by its ball at a sample? Relations that the field does not know could make a polynomial
 * vanish. */
static bool polynomial_is_nonzero(field *f, const fmpz_mpoly_t p)
{
    acb_ptr values = _acb_vec_init(f->room);
    acb_t ball;
    acb_init(ball);
    int *used = base_alloc((size_t)f->room * sizeof *used);
    element whole;
    element_init(f, &whole);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&whole), p, f->ctx);
    fmpz_mpoly_q_used_vars(used, &whole, f->ctx);
    for (slong k = 0; k < f->count; k++)
        if (used[variable_of(f, k)])
            acb_set(values + variable_of(f, k), generator_value(f, k));
    fmpz_mpoly_q_evaluate_acb(ball, &whole, values, SAMPLE_BITS, f->ctx);
    bool nonzero = acb_is_finite(ball) && !acb_contains_zero(ball);
    element_clear(f, &whole);
    free(used);
    acb_clear(ball);
    _acb_vec_clear(values, f->room);
    return nonzero;
}

/* Frees denominators of algebraic generators: else common factors that a relation hides pile up (measured: degree
 * 119 in log(2) in the fourth coefficient of tanh(log(x - 2)^(-2/3)), 2 with it). */
static void rationalise(field *f, element *a)
{
    fmpz_mpoly_t adjoint, den;
    fmpz_mpoly_init(adjoint, f->ctx), fmpz_mpoly_init(den, f->ctx);
    for (slong k = f->count - 1; k >= 0; k--) {
        if (f->generators[k].degree == 0 ||
            fmpz_mpoly_degree_si(fmpz_mpoly_q_denref(a), variable_of(f, k), f->ctx) == 0 ||
            !adjoint_of(f, adjoint, fmpz_mpoly_q_denref(a), k) || !polynomial_is_nonzero(f, adjoint))
            continue;
        fmpz_mpoly_mul(den, fmpz_mpoly_q_denref(a), adjoint, f->ctx);
        reduce_polynomial(f, den);
        if (fmpz_mpoly_is_zero(den, f->ctx)) /* relations that are not independent: left as it is */
            continue;
        fmpz_mpoly_mul(fmpz_mpoly_q_numref(a), fmpz_mpoly_q_numref(a), adjoint, f->ctx);
        reduce_polynomial(f, fmpz_mpoly_q_numref(a));
        fmpz_mpoly_swap(fmpz_mpoly_q_denref(a), den, f->ctx);
        fmpz_mpoly_q_canonicalise(a, f->ctx);
    }
    fmpz_mpoly_clear(adjoint, f->ctx), fmpz_mpoly_clear(den, f->ctx);
}

static void reduce(field *f, element *a)
{
    bool algebraic = false, changed;
    for (slong k = 0; k < f->count && !algebraic; k++)
        algebraic = f->generators[k].degree > 0;
    if (!algebraic)
        return;
    changed = reduce_polynomial(f, fmpz_mpoly_q_numref(a));
    changed |= reduce_polynomial(f, fmpz_mpoly_q_denref(a));
    if (changed)
        fmpz_mpoly_q_canonicalise(a, f->ctx);
    rationalise(f, a);
}

void field_mul(field *f, element *out, const element *a, const element *b)
{
    fmpz_mpoly_q_mul(out, a, b, f->ctx);
    reduce(f, out);
}

void field_div(field *f, element *out, const element *a, const element *b)
{
    fmpz_mpoly_q_div(out, a, b, f->ctx);
    reduce(f, out);
}

void field_addmul(field *f, element *out, const element *a, const element *b)
{
    element t;
    if (fmpz_mpoly_q_is_zero(a, f->ctx) || fmpz_mpoly_q_is_zero(b, f->ctx))
        return;
    element_init(f, &t);
    field_mul(f, &t, a, b);
    fmpz_mpoly_q_add(out, out, &t, f->ctx);
    element_clear(f, &t);
}

void field_submul(field *f, element *out, const element *a, const element *b)
{
    element t;
    if (fmpz_mpoly_q_is_zero(a, f->ctx) || fmpz_mpoly_q_is_zero(b, f->ctx))
        return;
    element_init(f, &t);
    field_mul(f, &t, a, b);
    fmpz_mpoly_q_sub(out, out, &t, f->ctx);
    element_clear(f, &t);
}

tw_status field_pow(field *f, element *out, const element *a, slong n)
{
    element power, base;
    if (n < 0 && fmpz_mpoly_q_is_zero(a, f->ctx))
        return engine_fail(f->e, ERROR_VALUE, "division by zero in a coefficient");
    element_init(f, &power), element_init(f, &base);
    fmpz_mpoly_q_one(&power, f->ctx);
    fmpz_mpoly_q_set(&base, a, f->ctx);
    if (n < 0)
        fmpz_mpoly_q_inv(&base, &base, f->ctx);
    for (ulong m = n < 0 ? -(ulong)n : (ulong)n; m > 0; m >>= 1) {
        if (m & 1)
            field_mul(f, &power, &power, &base);
        if (m > 1)
            field_mul(f, &base, &base, &base);
    }
    fmpz_mpoly_q_swap(out, &power, f->ctx);
    element_clear(f, &power), element_clear(f, &base);
    return TW_OK;
}

bool field_is_rational(const element *a, field *f, fmpq_t value)
{
    if (!fmpz_mpoly_q_is_fmpq(a, f->ctx))
        return false;
    fmpz_mpoly_get_fmpz(fmpq_numref(value), fmpz_mpoly_q_numref(a), f->ctx);
    fmpz_mpoly_get_fmpz(fmpq_denref(value), fmpz_mpoly_q_denref(a), f->ctx);
    fmpq_canonicalise(value);
    return true;
}

/* ---- from expressions ---- */

/* The generator of an atom, made when new; `relation` (may be NULL): atom^degree as a polynomial. */
static tw_status generator_find(field *f, element *out, expr *atom, slong degree, const fmpz_mpoly_t value)
{
    if (atom == NULL)
        return TW_ERROR;
    slong k = 0;
    while (k < f->count && f->generators[k].atom != atom)
        k++;
    if (k == f->count) {
        if (f->count == f->room) {
            f->full = true;
            return TW_ERROR;
        }
        generator *g = f->generators + f->count++;
        g->atom = atom;
        g->parameter = atom->kind == EXPR_SYMBOL;
        g->closed = expr_is_closed_value(atom);
        g->degree = degree;
        g->valued = false;
        acb_init(g->value);
        fmpz_mpoly_init(g->relation, f->ctx);
        if (degree > 0) {
            fmpz_mpoly_gen(g->relation, variable_of(f, k), f->ctx);
            fmpz_mpoly_pow_ui(g->relation, g->relation, (ulong)degree, f->ctx);
            fmpz_mpoly_sub(g->relation, g->relation, value, f->ctx);
        }
    }
    if (out != NULL)
        fmpz_mpoly_q_gen(out, variable_of(f, k), f->ctx);
    return TW_OK;
}

static tw_status atom_plain(field *f, element *out, expr *atom) { return generator_find(f, out, atom, 0, NULL); }

static tw_status atom_with_integer(field *f, element *out, expr *atom, slong degree, const fmpz_t value)
{
    fmpz_mpoly_t v;
    fmpz_mpoly_init(v, f->ctx);
    fmpz_mpoly_set_fmpz(v, value, f->ctx);
    tw_status s = generator_find(f, out, atom, degree, v);
    fmpz_mpoly_clear(v, f->ctx);
    return s;
}

/* out = n^(1/q) for a positive integer: a product over its primes when it can be factored at once. */
static tw_status root_of_integer(field *f, element *out, const fmpz_t n, slong q)
{
    if (fmpz_sgn(n) > 0 && fmpz_abs_fits_ui(n)) {
        n_factor_t primes;
        n_factor_init(&primes);
        n_factor(&primes, fmpz_get_ui(n), 1);
        element g;
        element_init(f, &g);
        fmpz_mpoly_q_one(out, f->ctx);
        tw_status s = TW_OK;
        for (int k = 0; k < primes.num && s == TW_OK; k++) {
            fmpz_t p;
            fmpz_init_set_ui(p, primes.p[k]);
            s = atom_with_integer(f, &g, expr_pow(f->e, expr_fmpz(f->e, p), expr_frac(f->e, 1, q)), q, p);
            if (s == TW_OK)
                s = field_pow(f, &g, &g, primes.exp[k]);
            if (s == TW_OK)
                field_mul(f, out, out, &g);
            fmpz_clear(p);
        }
        element_clear(f, &g);
        return s;
    }
    return atom_with_integer(f, out, expr_pow(f->e, expr_fmpz(f->e, n), expr_frac(f->e, 1, q)), q, n);
}

/* out = base^(1/q), q > 1. */
static tw_status root_of(field *f, element *out, expr *base, slong q)
{
    if (expr_is_number(base) && fmpq_sgn(expr_number(base)) > 0) {
        element den;
        element_init(f, &den);
        tw_status s = root_of_integer(f, out, fmpq_numref(expr_number(base)), q);
        if (s == TW_OK)
            s = root_of_integer(f, &den, fmpq_denref(expr_number(base)), q);
        if (s == TW_OK)
            field_div(f, out, out, &den);
        element_clear(f, &den);
        return s;
    }
    expr *atom = expr_pow(f->e, base, expr_frac(f->e, 1, q));
    if (atom == NULL)
        return TW_ERROR;
    if (atom->kind != EXPR_POWER || atom->args[0] != base) /* the constructor saw more: 8^(1/3), (2*a)^(1/2) */
        return field_from_expr(f, out, atom);
    element b;
    element_init(f, &b);
    tw_status s = field_from_expr(f, &b, base);
    if (s == TW_OK)
        s = generator_find(f, out, atom, fmpz_mpoly_is_one(fmpz_mpoly_q_denref(&b), f->ctx) ? q : 0,
                           fmpz_mpoly_q_numref(&b));
    element_clear(f, &b);
    return s;
}

/* exp(term), or base^term when base is not NULL, with term = c/d * rest: the atom is taken at rest/d and raised to
 * c, so that exp(1), exp(2), exp(-3) share one generator. z^(c w) = (z^w)^c for integers c. */
static tw_status exponential_term(field *f, element *out, expr *base, expr *term)
{
    tw_engine *e = f->e;
    fmpq_t c;
    fmpq_init(c);
    expr *rest;
    expr_as_coefficient(e, term, c, &rest);
    tw_status s = TW_OK;
    if (fmpz_bits(fmpq_numref(c)) > 20 || fmpz_bits(fmpq_denref(c)) > 20)
        s = atom_plain(f, out, base == NULL ? expr_call1(e, FUNCTION_EXP, term) : expr_pow(e, base, term));
    else {
        slong times = fmpz_get_si(fmpq_numref(c)), d = fmpz_get_si(fmpq_denref(c));
        if (base != NULL && expr_is_one(rest))
            s = d == 1 ? field_from_expr(f, out, base) : root_of(f, out, base, d);
        else {
            expr *part = expr_mul(e, rest, expr_frac(e, 1, d));
            s = atom_plain(f, out, base == NULL ? expr_call1(e, FUNCTION_EXP, part) : expr_pow(e, base, part));
        }
        if (s == TW_OK)
            s = field_pow(f, out, out, times);
    }
    fmpq_clear(c);
    return s;
}

static tw_status from_exponential(field *f, element *out, expr *base, expr *exponent)
{
    expr *spread = expr_expand(f->e, exponent);
    if (spread == NULL)
        return TW_ERROR;
    expr *const *terms;
    size_t n = expr_terms(&spread, &terms);
    element t;
    element_init(f, &t);
    fmpz_mpoly_q_one(out, f->ctx);
    tw_status s = TW_OK;
    for (size_t k = 0; k < n && s == TW_OK; k++) {
        s = exponential_term(f, &t, base, terms[k]);
        if (s == TW_OK)
            field_mul(f, out, out, &t);
    }
    element_clear(f, &t);
    return s;
}

/* log of a positive rational: over the primes, so that log(6) = log(2) + log(3) is known. */
static tw_status from_log(field *f, element *out, expr *a)
{
    tw_engine *e = f->e;
    if (!expr_is_number(a->args[0]) || fmpq_sgn(expr_number(a->args[0])) <= 0)
        return atom_plain(f, out, a);
    const fmpq *q = expr_number(a->args[0]);
    if (!fmpz_abs_fits_ui(fmpq_numref(q)) || !fmpz_abs_fits_ui(fmpq_denref(q)))
        return atom_plain(f, out, a);
    element g;
    element_init(f, &g);
    fmpz_mpoly_q_zero(out, f->ctx);
    tw_status s = TW_OK;
    for (int side = 0; side < 2; side++) {
        n_factor_t primes;
        n_factor_init(&primes);
        n_factor(&primes, fmpz_get_ui(side == 0 ? fmpq_numref(q) : fmpq_denref(q)), 1);
        for (int k = 0; k < primes.num && s == TW_OK; k++) {
            s = atom_plain(f, &g, expr_call1(e, FUNCTION_LOG, expr_int(e, (slong)primes.p[k])));
            if (s != TW_OK)
                break;
            fmpz_mpoly_q_mul_si(&g, &g, side == 0 ? primes.exp[k] : -(slong)primes.exp[k], f->ctx);
            fmpz_mpoly_q_add(out, out, &g, f->ctx);
        }
    }
    element_clear(f, &g);
    return s;
}

/* cos(c) and cosh(c) are reduced over sin(c) and sinh(c): DLMF 4.21.12, 4.35.11. */
static tw_status from_even(field *f, element *out, expr *a, function_id odd, int sign)
{
    element s;
    fmpz_mpoly_t square;
    element_init(f, &s);
    fmpz_mpoly_init(square, f->ctx);
    expr *other = expr_call1(f->e, odd, a->args[0]);
    tw_status status = other == NULL ? TW_ERROR : atom_plain(f, &s, other);
    if (status == TW_OK) {
        fmpz_mpoly_mul(square, fmpz_mpoly_q_numref(&s), fmpz_mpoly_q_numref(&s), f->ctx);
        if (sign < 0)
            fmpz_mpoly_neg(square, square, f->ctx);
        fmpz_mpoly_add_si(square, square, 1, f->ctx);
        status = generator_find(f, out, a, 2, square);
    }
    fmpz_mpoly_clear(square, f->ctx);
    element_clear(f, &s);
    return status;
}

static tw_status from_call(field *f, element *out, expr *a)
{
    switch (a->is.function) {
    case FUNCTION_EXP: return from_exponential(f, out, NULL, a->args[0]);
    case FUNCTION_LOG: return from_log(f, out, a);
    case FUNCTION_COS: return from_even(f, out, a, FUNCTION_SIN, -1);
    case FUNCTION_COSH: return from_even(f, out, a, FUNCTION_SINH, 1);
    default: return atom_plain(f, out, a);
    }
}

static tw_status from_power(field *f, element *out, expr *a)
{
    expr *base = a->args[0], *exponent = a->args[1];
    if (expr_is_number(exponent) && fmpz_is_one(fmpq_denref(expr_number(exponent))) &&
        fmpz_bits(fmpq_numref(expr_number(exponent))) <= 20) {
        tw_status s = field_from_expr(f, out, base);
        return s == TW_OK ? field_pow(f, out, out, fmpz_get_si(fmpq_numref(expr_number(exponent)))) : s;
    }
    return from_exponential(f, out, base, exponent);
}

static tw_status from_parts(field *f, element *out, expr *a)
{
    bool sum = a->kind == EXPR_SUM;
    element t;
    element_init(f, &t);
    if (sum)
        fmpz_mpoly_q_zero(out, f->ctx);
    else
        fmpz_mpoly_q_one(out, f->ctx);
    tw_status s = TW_OK;
    for (uint32_t k = 0; k < a->count && s == TW_OK; k++) {
        s = field_from_expr(f, &t, a->args[k]);
        if (s != TW_OK)
            break;
        if (sum)
            fmpz_mpoly_q_add(out, out, &t, f->ctx);
        else
            field_mul(f, out, out, &t);
    }
    element_clear(f, &t);
    return s;
}

/* An algebraic number r: the generator is g = lc*r, whose polynomial is monic: lc^(d-1) m(g/lc). */
static tw_status from_root(field *f, element *out, expr *a)
{
    tw_engine *e = f->e;
    fmpz_poly_t m;
    fmpz_poly_init(m);
    if (!algebraic_polynomial(e, m, a)) {
        fmpz_poly_clear(m);
        return e->error.kind == ERROR_NONE ? atom_plain(f, out, a) : TW_ERROR;
    }
    slong d = fmpz_poly_degree(m);
    fmpz_t lc, power, c;
    fmpz_init(lc), fmpz_init(power), fmpz_init(c);
    fmpz_set(lc, m->coeffs + d);
    expr *atom = expr_mul(e, expr_fmpz(e, lc), a);
    tw_status s = generator_find(f, out, atom, 0, NULL);
    slong k = 0;
    while (s == TW_OK && f->generators[k].atom != atom)
        k++;
    if (s == TW_OK && f->generators[k].degree == 0) {
        generator *g = f->generators + k;
        fmpz_mpoly_t term;
        fmpz_mpoly_init(term, f->ctx);
        g->degree = d;
        fmpz_mpoly_gen(g->relation, variable_of(f, k), f->ctx);
        fmpz_mpoly_pow_ui(g->relation, g->relation, (ulong)d, f->ctx);
        fmpz_one(power);
        for (slong j = d - 1; j >= 0; j--) { /* m_j lc^(d-1-j) g^j */
            fmpz_mpoly_gen(term, variable_of(f, k), f->ctx);
            fmpz_mpoly_pow_ui(term, term, (ulong)j, f->ctx);
            fmpz_mul(c, m->coeffs + j, power);
            fmpz_mpoly_scalar_mul_fmpz(term, term, c, f->ctx);
            fmpz_mpoly_add(g->relation, g->relation, term, f->ctx);
            fmpz_mul(power, power, lc);
        }
        fmpz_mpoly_clear(term, f->ctx);
    }
    if (s == TW_OK && !fmpz_is_one(lc))
        fmpz_mpoly_q_div_fmpz(out, out, lc, f->ctx);
    fmpz_clear(lc), fmpz_clear(power), fmpz_clear(c);
    fmpz_poly_clear(m);
    return s;
}

tw_status field_from_expr(field *f, element *out, expr *a)
{
    if (a == NULL || !budget_ok(f->e))
        return TW_ERROR;
    switch (a->kind) {
    case EXPR_NUMBER:
        fmpz_mpoly_q_set_fmpq(out, expr_number(a), f->ctx);
        return TW_OK;
    case EXPR_CONSTANT:
        if (a->is.constant == CONSTANT_I) {
            fmpz_t minus_one;
            fmpz_init_set_si(minus_one, -1);
            tw_status s = atom_with_integer(f, out, a, 2, minus_one);
            fmpz_clear(minus_one);
            return s;
        }
        return atom_plain(f, out, a);
    case EXPR_SUM:
    case EXPR_PRODUCT: return from_parts(f, out, a);
    case EXPR_POWER: return from_power(f, out, a);
    case EXPR_CALL: return from_call(f, out, a);
    case EXPR_ROOT: return from_root(f, out, a);
    default: return atom_plain(f, out, a);
    }
}

/* ---- back to expressions ---- */

static expr *polynomial_expr(field *f, const fmpz_mpoly_t p, const fmpz_t divisor)
{
    tw_engine *e = f->e;
    slong n = fmpz_mpoly_length(p, f->ctx);
    expr **terms = base_alloc((size_t)FLINT_MAX(n, 1) * sizeof *terms);
    expr **factors = base_alloc(((size_t)f->count + 1) * sizeof *factors);
    fmpq_t c;
    fmpq_init(c);
    for (slong t = 0; t < n; t++) {
        fmpz_mpoly_get_term_coeff_fmpz(fmpq_numref(c), p, t, f->ctx);
        fmpz_set(fmpq_denref(c), divisor);
        fmpq_canonicalise(c);
        size_t m = 0;
        factors[m++] = expr_fmpq(e, c);
        for (slong k = 0; k < f->count; k++) {
            slong power = fmpz_mpoly_get_term_var_exp_si(p, t, variable_of(f, k), f->ctx);
            if (power != 0)
                factors[m++] = expr_pow(e, f->generators[k].atom, expr_int(e, power));
        }
        terms[t] = expr_product(e, factors, m);
    }
    expr *sum = expr_sum(e, terms, (size_t)n);
    fmpq_clear(c);
    free(terms);
    free(factors);
    return sum;
}

expr *field_to_expr(field *f, const element *a)
{
    fmpz_t one;
    if (fmpz_mpoly_is_fmpz(fmpz_mpoly_q_denref(a), f->ctx)) {
        fmpz_t d;
        fmpz_init(d);
        fmpz_mpoly_get_fmpz(d, fmpz_mpoly_q_denref(a), f->ctx);
        expr *out = polynomial_expr(f, fmpz_mpoly_q_numref(a), d);
        fmpz_clear(d);
        return out;
    }
    fmpz_init_set_ui(one, 1);
    expr *num = polynomial_expr(f, fmpz_mpoly_q_numref(a), one);
    expr *den = polynomial_expr(f, fmpz_mpoly_q_denref(a), one);
    fmpz_clear(one);
    return expr_div(f->e, num, den);
}

/* ---- is it zero? ---- */

static void used_generators(const field *f, const element *a, bool *parameters, bool *constants, bool *others)
{
    int *used = base_alloc((size_t)f->room * sizeof *used);
    fmpz_mpoly_q_used_vars(used, a, f->ctx);
    *parameters = *constants = *others = false;
    for (slong k = 0; k < f->count; k++) {
        if (!used[variable_of(f, k)])
            continue;
        const generator *g = f->generators + k;
        *(g->parameter ? parameters : g->closed ? constants : others) = true;
    }
    free(used);
}

domain_kind field_domain(field *f, const element *a)
{
    bool parameters, constants, others;
    used_generators(f, a, &parameters, &constants, &others);
    if (others || (parameters && constants))
        return DOMAIN_MIXED;
    return constants ? DOMAIN_CONSTANTS : parameters ? DOMAIN_FUNCTIONS : DOMAIN_RATIONAL;
}

answer field_is_zero(field *f, const element *a)
{
    bool parameters, constants, others;
    if (fmpz_mpoly_q_is_zero(a, f->ctx))
        return ANSWER_YES;
    used_generators(f, a, &parameters, &constants, &others);
    if (!constants &&
        !others) /* parameters are independent: a polynomial in them that is not zero is nonzero somewhere */
        return ANSWER_NO;
    fmpz_t one;
    fmpz_init_set_ui(one, 1);
    expr *num = polynomial_expr(f, fmpz_mpoly_q_numref(a), one);
    fmpz_clear(one);
    return num == NULL ? ANSWER_UNKNOWN : value_is_zero(f->e, num);
}

tw_status field_numerator_factors(field *f, const element *a, expr ***factors, size_t *count)
{
    fmpz_mpoly_factor_t parts;
    fmpz_t one;
    *count = 0;
    fmpz_init_set_ui(one, 1);
    fmpz_mpoly_factor_init(parts, f->ctx);
    tw_status s = TW_OK;
    if (!fmpz_mpoly_factor(parts, fmpz_mpoly_q_numref(a), f->ctx))
        s = engine_fail(f->e, ERROR_UNDECIDED, "a coefficient could not be factored");
    *factors = base_alloc((size_t)FLINT_MAX(parts->num, 1) * sizeof **factors);
    for (slong k = 0; k < parts->num && s == TW_OK; k++) {
        (*factors)[*count] = polynomial_expr(f, parts->poly + k, one);
        s = (*factors)[*count] == NULL ? TW_ERROR : TW_OK;
        *count += 1;
    }
    if (s != TW_OK) {
        free(*factors);
        *factors = NULL;
        *count = 0;
    }
    fmpz_mpoly_factor_clear(parts, f->ctx);
    fmpz_clear(one);
    return s;
}
