/* Reading an expression as a hyperexponential term. The one idea: the logarithm of such a term is a sum of powers times
 * logarithms of polynomials and one rational function, so products, powers and exponentials only ever add to that sum,
 * and equal factors meet because every base is split into irreducible ones. Knows nothing of integrals. */
#include "engine/exact/hyper.h"

#include <stdlib.h>
#include <string.h>

slong field_variable(const field *f, expr *atom)
{
    for (slong k = 0; k < f->count; k++)
        if (f->generators[k].atom == atom) return f->room - 1 - k;
    return -1;
}

tw_status hyper_init(hyper *h, field *f, expr *x)
{
    memset(h, 0, sizeof *h);
    h->f = f;
    h->x = x;
    element_init(f, &h->exponent);
    tw_status status = field_from_expr(f, &h->exponent, x);
    fmpz_mpoly_q_zero(&h->exponent, f->ctx);
    h->variable = field_variable(f, x);
    return status;
}

void hyper_clear(hyper *h)
{
    for (slong k = 0; k < h->count; k++) {
        fmpz_mpoly_clear(&h->factors[k].base, h->f->ctx);
        element_clear(h->f, &h->factors[k].power);
    }
    free(h->factors);
    element_clear(h->f, &h->exponent);
}

/* A refusal is no error of the engine: the caller says it in its own words. */
static tw_status refuse(hyper *h, expr *a)
{
    if (h->f->e->error.kind == ERROR_NONE && !h->f->full && !h->at_fault) h->at_fault = a;
    return TW_ERROR;
}

/* No generator in use but x itself holds x. */
static bool is_rational_in_x(const hyper *h, const element *a)
{
    const field *f = h->f;
    int *used = base_alloc((size_t)f->room * sizeof *used);
    fmpz_mpoly_q_used_vars(used, a, f->ctx);
    bool good = true;
    for (slong k = 0; k < f->count && good; k++)
        good = !used[f->room - 1 - k] || f->generators[k].atom == h->x || !expr_has(f->generators[k].atom, h->x);
    free(used);
    return good;
}

tw_status hyper_rational(hyper *h, element *out, expr *a)
{
    tw_engine *e = h->f->e;
    if (field_from_expr(h->f, out, a) != TW_OK) {
        if (e->error.kind == ERROR_VALUE) engine_forgive(e);
        return refuse(h, a);
    }
    return is_rational_in_x(h, out) ? TW_OK : refuse(h, a);
}

/* ---- collecting factors ---- */

/* h *= base^power */
static void push_factor(hyper *h, const fmpz_mpoly_t base, const element *power)
{
    const field *f = h->f;
    if (fmpz_mpoly_degree_si(base, h->variable, f->ctx) <= 0) return;
    for (slong k = 0; k < h->count; k++) {
        hyper_factor *old = &h->factors[k];
        if (!fmpz_mpoly_equal(&old->base, base, f->ctx)) continue;
        fmpz_mpoly_q_add(&old->power, &old->power, power, f->ctx);
        if (!fmpz_mpoly_q_is_zero(&old->power, f->ctx)) return;
        fmpz_mpoly_clear(&old->base, f->ctx);
        element_clear(h->f, &old->power);
        *old = h->factors[--h->count];
        return;
    }
    h->factors = base_resize(h->factors, ((size_t)h->count + 1) * sizeof *h->factors);
    hyper_factor *made = &h->factors[h->count++];
    fmpz_mpoly_init(&made->base, f->ctx);
    fmpz_mpoly_set(&made->base, base, f->ctx);
    element_init(h->f, &made->power);
    fmpz_mpoly_q_set(&made->power, power, f->ctx);
}

/* h *= a^(sign*weight) for a polynomial a. */
static tw_status multiply_polynomial(hyper *h, const fmpz_mpoly_t a, const element *weight, int sign)
{
    field *f = h->f;
    if (fmpz_mpoly_degree_si(a, h->variable, f->ctx) <= 0) return TW_OK;
    fmpz_mpoly_factor_t parts;
    fmpz_mpoly_factor_init(parts, f->ctx);
    tw_status status = TW_OK;
    if (!fmpz_mpoly_factor(parts, a, f->ctx))
        status = engine_fail(f->e, ERROR_UNDECIDED, "a polynomial of the integrand could not be factored");
    element power;
    element_init(f, &power);
    for (slong k = 0; k < parts->num && status == TW_OK; k++) {
        fmpz_mpoly_q_mul_fmpz(&power, weight, parts->exp + k, f->ctx);
        if (sign < 0) fmpz_mpoly_q_neg(&power, &power, f->ctx);
        push_factor(h, parts->poly + k, &power);
    }
    element_clear(f, &power);
    fmpz_mpoly_factor_clear(parts, f->ctx);
    return status;
}

tw_status hyper_multiply_rational(hyper *h, const element *a, const element *weight)
{
    if (multiply_polynomial(h, fmpz_mpoly_q_numref(a), weight, 1) != TW_OK) return TW_ERROR;
    return multiply_polynomial(h, fmpz_mpoly_q_denref(a), weight, -1);
}

/* h *= exp(weight*u) */
static tw_status multiply_exponential(hyper *h, expr *u, const element *weight)
{
    field *f = h->f;
    element value;
    element_init(f, &value);
    tw_status status = hyper_rational(h, &value, u);
    if (status == TW_OK) {
        fmpz_mpoly_q_mul(&value, &value, weight, f->ctx);
        fmpz_mpoly_q_add(&h->exponent, &h->exponent, &value, f->ctx);
    }
    element_clear(f, &value);
    return status;
}

/* Terms that differ by rational factors: the first one times a rational function. */
static tw_status multiply_similar_terms(hyper *h, expr *a, const element *weight)
{
    field *f = h->f;
    tw_engine *e = f->e;
    expr *ratio = expr_int(e, 1);
    for (uint32_t k = 1; k < a->count; k++)
        ratio = expr_add(e, ratio, expr_normal(e, expr_div(e, a->args[k], a->args[0]), &h->x, 1));
    if (!ratio) return refuse(h, a);
    element value;
    element_init(f, &value);
    expr *fault = h->at_fault;
    tw_status status = hyper_rational(h, &value, ratio);
    if (status != TW_OK) h->at_fault = fault;
    if (status == TW_OK && fmpz_mpoly_q_is_zero(&value, f->ctx)) status = TW_ERROR;
    if (status == TW_OK) status = hyper_multiply_rational(h, &value, weight);
    element_clear(f, &value);
    return status == TW_OK ? hyper_multiply(h, a->args[0], weight) : refuse(h, a);
}

static tw_status multiply_sum(hyper *h, expr *a, const element *weight)
{
    field *f = h->f;
    element value;
    element_init(f, &value);
    expr *fault = h->at_fault;
    tw_status status = hyper_rational(h, &value, a);
    bool rational = status == TW_OK;
    if (rational && fmpz_mpoly_q_is_zero(&value, f->ctx)) status = refuse(h, a);
    else if (rational) status = hyper_multiply_rational(h, &value, weight);
    element_clear(f, &value);
    if (rational || f->full || f->e->error.kind != ERROR_NONE || a->kind != EXPR_SUM) return status;
    h->at_fault = fault;
    return multiply_similar_terms(h, a, weight);
}

/* h *= base^(weight*exponent) */
static tw_status multiply_power(hyper *h, expr *a, const element *weight)
{
    field *f = h->f;
    expr *base = a->args[0], *exponent = a->args[1];
    if (!expr_has(base, h->x)) {
        expr *u = expr_mul(f->e, exponent, expr_call1(f->e, FUNCTION_LOG, base));
        return u ? multiply_exponential(h, u, weight) : refuse(h, a);
    }
    if (expr_has(exponent, h->x)) return refuse(h, a);
    element power;
    element_init(f, &power);
    tw_status status = field_from_expr(f, &power, exponent);
    if (status == TW_OK) fmpz_mpoly_q_mul(&power, &power, weight, f->ctx);
    if (status == TW_OK) status = hyper_multiply(h, base, &power);
    element_clear(f, &power);
    return status;
}

tw_status hyper_multiply(hyper *h, expr *a, const element *weight)
{
    if (!budget_ok(h->f->e)) return TW_ERROR;
    if (!a) return TW_ERROR;
    if (!expr_has(a, h->x) || fmpz_mpoly_q_is_zero(weight, h->f->ctx)) return TW_OK;
    if (a->kind == EXPR_PRODUCT) {
        for (uint32_t k = 0; k < a->count; k++)
            if (hyper_multiply(h, a->args[k], weight) != TW_OK) return TW_ERROR;
        return TW_OK;
    }
    if (a->kind == EXPR_POWER) return multiply_power(h, a, weight);
    if (expr_is_call(a, FUNCTION_EXP)) return multiply_exponential(h, a->args[0], weight);
    return multiply_sum(h, a, weight);
}

/* ---- derivatives ---- */

void element_derivative(field *f, element *out, const element *a, slong variable)
{
    fmpz_mpoly_t u, v;
    fmpz_mpoly_init(u, f->ctx), fmpz_mpoly_init(v, f->ctx);
    fmpz_mpoly_derivative(u, fmpz_mpoly_q_numref(a), variable, f->ctx);
    fmpz_mpoly_mul(u, u, fmpz_mpoly_q_denref(a), f->ctx);
    fmpz_mpoly_derivative(v, fmpz_mpoly_q_denref(a), variable, f->ctx);
    fmpz_mpoly_mul(v, v, fmpz_mpoly_q_numref(a), f->ctx);
    fmpz_mpoly_sub(u, u, v, f->ctx);
    fmpz_mpoly_mul(v, fmpz_mpoly_q_denref(a), fmpz_mpoly_q_denref(a), f->ctx);
    fmpz_mpoly_swap(fmpz_mpoly_q_numref(out), u, f->ctx);
    fmpz_mpoly_swap(fmpz_mpoly_q_denref(out), v, f->ctx);
    fmpz_mpoly_q_canonicalise(out, f->ctx);
    fmpz_mpoly_clear(u, f->ctx), fmpz_mpoly_clear(v, f->ctx);
}

void hyper_log_derivative(const hyper *h, element *out)
{
    field *f = h->f;
    element t;
    element_init(f, &t);
    element_derivative(f, out, &h->exponent, h->variable);
    for (slong k = 0; k < h->count; k++) {
        const hyper_factor *one = &h->factors[k];
        fmpz_mpoly_derivative(fmpz_mpoly_q_numref(&t), &one->base, h->variable, f->ctx);
        fmpz_mpoly_set(fmpz_mpoly_q_denref(&t), &one->base, f->ctx);
        fmpz_mpoly_q_canonicalise(&t, f->ctx);
        fmpz_mpoly_q_mul(&t, &t, &one->power, f->ctx);
        fmpz_mpoly_q_add(out, out, &t, f->ctx);
    }
    element_clear(f, &t);
}
