/* Canonical powers. Knows only rules that hold for all complex values on the principal branch, u^v = exp(v*log(u)):
 * an exponent goes into a product or a power when it is an integer, into a positive constant always, and into u^a when
 * -1 < a <= 1, since then log(u^a) = a*log(u). 0^0 and the like are formal: values are generic. */
#include "engine/expr/node.h"

static bool is_integer(expr *a)
{
    return a->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->is.number));
}

static expr *fail_division(tw_engine *e)
{
    engine_fail(e, ERROR_VALUE, "division by zero");
    return NULL;
}

static expr *power_of_number(tw_engine *e, expr *base, expr *exponent)
{
    const fmpq *b = &base->is.number;
    if (expr_is_one(base))
        return base;
    if (fmpq_is_zero(b)) {
        if (expr_is_positive_constant(exponent) || expr_is_inf(exponent))
            return base;
        if (expr_leads_negative(exponent) && expr_is_real_constant(exponent))
            return exponent->kind == EXPR_NUMBER ? fail_division(e) : node_power(e, base, exponent);
        return node_power(e, base, exponent);
    }
    if (exponent->kind == EXPR_NUMBER)
        return number_power(e, b, &exponent->is.number);
    if ((expr_is_inf(exponent) || expr_is_minus_inf(exponent)) && fmpq_sgn(b) > 0) {
        bool grows = (fmpq_cmp_si(b, 1) > 0) == expr_is_inf(exponent);
        return grows ? expr_constant_of(e, CONSTANT_INF) : expr_int(e, 0);
    }
    return number_power_symbolic(e, b, exponent);
}

static expr *power_of_constant(tw_engine *e, expr *base, expr *exponent)
{
    if (base->is.constant == CONSTANT_I)
        return expr_pow(e, expr_int(e, -1), expr_mul(e, expr_frac(e, 1, 2), exponent));
    if (base->is.constant == CONSTANT_INF && exponent->kind == EXPR_NUMBER)
        return fmpq_sgn(&exponent->is.number) > 0 ? base : expr_int(e, 0);
    return node_power(e, base, exponent);
}

/* (u^a)^b = u^(a*b) where that is true. */
static expr *power_of_power(tw_engine *e, expr *base, expr *exponent)
{
    expr *inner = base->args[1];
    bool narrow = inner->kind == EXPR_NUMBER && fmpq_cmp_si(&inner->is.number, -1) > 0 &&
                  fmpq_cmp_si(&inner->is.number, 1) <= 0;
    bool positive = expr_is_positive_constant(base->args[0]) && expr_is_real_constant(inner);
    if (is_integer(exponent) || narrow || positive)
        return expr_pow(e, base->args[0], expr_mul(e, inner, exponent));
    return node_power(e, base, exponent);
}

static expr *power_of_each(tw_engine *e, expr *product, expr *exponent)
{
    expr **factors = engine_scratch(e, product->count, sizeof *factors);
    for (size_t k = 0; k < product->count; k++) {
        factors[k] = expr_pow(e, product->args[k], exponent);
        if (!factors[k])
            return NULL;
    }
    return expr_product(e, factors, product->count);
}

/* Positive constants leave the product; of a negative number its modulus does. */
static expr *power_of_product(tw_engine *e, expr *base, expr *exponent)
{
    if (is_integer(exponent))
        return power_of_each(e, base, exponent);
    expr **outside = engine_scratch(e, base->count + 1, sizeof *outside);
    expr **inside = engine_scratch(e, base->count, sizeof *inside);
    size_t out = 0, in = 0;
    for (size_t k = 0; k < base->count; k++) {
        expr *factor = base->args[k];
        if (expr_is_positive_constant(factor)) {
            outside[out++] = expr_pow(e, factor, exponent);
        } else if (factor->kind == EXPR_NUMBER && !expr_is_int(factor, -1)) {
            outside[out++] = expr_pow(e, expr_neg(e, factor), exponent);
            inside[in++] = expr_int(e, -1);
        } else {
            inside[in++] = factor;
        }
    }
    if (out == 0)
        return node_power(e, base, exponent);
    outside[out++] = expr_pow(e, expr_product(e, inside, in), exponent);
    return expr_product(e, outside, out);
}

static expr *power_of_call(tw_engine *e, expr *base, expr *exponent)
{
    if (base->is.function == FUNCTION_EXP && (is_integer(exponent) || expr_is_real_constant(base->args[0])))
        return expr_call1(e, FUNCTION_EXP, expr_mul(e, exponent, base->args[0]));
    return node_power(e, base, exponent);
}

static expr *power_by_kind(tw_engine *e, expr *base, expr *exponent)
{
    switch (base->kind) {
    case EXPR_NUMBER: return power_of_number(e, base, exponent);
    case EXPR_CONSTANT: return power_of_constant(e, base, exponent);
    case EXPR_POWER: return power_of_power(e, base, exponent);
    case EXPR_PRODUCT: return power_of_product(e, base, exponent);
    case EXPR_CALL: return power_of_call(e, base, exponent);
    default: return node_power(e, base, exponent);
    }
}

expr *expr_pow(tw_engine *e, expr *base, expr *exponent)
{
    if (!base || !exponent)
        return NULL;
    if (expr_is_zero(exponent)) {
        if (!expr_is_inf(base) && !expr_is_minus_inf(base))
            return expr_int(e, 1);
        engine_fail(e, ERROR_VALUE, "inf^0 has no value");
        return NULL;
    }
    if (expr_is_one(exponent))
        return base;
    const arena_place mark = arena_mark(&e->scratch);
    expr *power = power_by_kind(e, base, exponent);
    arena_release(&e->scratch, mark);
    return power;
}

expr *expr_sqrt(tw_engine *e, expr *a)
{
    return a ? expr_pow(e, a, expr_frac(e, 1, 2)) : NULL;
}
