/* What the form of an expression and the declarations of its names tell about its being real. Conservative: false is
 * "not known". Deciding signs and inequalities is engine/ball's. */
#include "engine/expr/facts.h"
#include "engine/expr/node.h"

static bool all_real(tw_engine *e, expr *a, bool bound_real)
{
    for (size_t k = 0; k < a->count; k++)
        if (!expr_is_real(e, a->args[k], bound_real))
            return false;
    return true;
}

/* x^2, exp(x), abs(x) + 1 and the like are positive or zero for real arguments. */
static bool is_nonnegative(tw_engine *e, expr *a, bool bound_real)
{
    switch (a->kind) {
    case EXPR_POWER:
        if (a->args[1]->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->args[1]->is.number)) &&
            fmpz_is_even(fmpq_numref(&a->args[1]->is.number)))
            return expr_is_real(e, a->args[0], bound_real);
        return is_nonnegative(e, a->args[0], bound_real) && expr_is_real(e, a->args[1], bound_real);
    case EXPR_SUM: case EXPR_PRODUCT:
        for (size_t k = 0; k < a->count; k++)
            if (!is_nonnegative(e, a->args[k], bound_real))
                return false;
        return true;
    case EXPR_CALL:
        if (a->is.function == FUNCTION_EXP || a->is.function == FUNCTION_COSH)
            return expr_is_real(e, a->args[0], bound_real);
        return a->is.function == FUNCTION_ABS || expr_is_positive_constant(a);
    case EXPR_SYMBOL: return facts_symbol_is_positive(e, a);
    default: return expr_is_zero(a) || expr_is_positive_constant(a);
    }
}

static bool is_real_call(tw_engine *e, expr *a, bool bound_real)
{
    switch (a->is.function) {
    case FUNCTION_RE: case FUNCTION_IM: case FUNCTION_ARG: case FUNCTION_ABS: return true;
    case FUNCTION_LOG: return is_nonnegative(e, a->args[0], bound_real);
    case FUNCTION_EXP: case FUNCTION_SIN: case FUNCTION_COS: case FUNCTION_TAN: case FUNCTION_SINH: case FUNCTION_COSH:
    case FUNCTION_TANH: case FUNCTION_ATAN: case FUNCTION_ASINH: case FUNCTION_SIGN: case FUNCTION_MIN:
    case FUNCTION_MAX:
    case FUNCTION_ERF: case FUNCTION_ERFC: case FUNCTION_GAMMA: case FUNCTION_PSI: case FUNCTION_ZETA: case FUNCTION_EI:
    case FUNCTION_AI: case FUNCTION_BI: case FUNCTION_CONJ:
        return all_real(e, a, bound_real);
    default: return false;
    }
}

bool expr_is_real(tw_engine *e, expr *a, bool bound_real)
{
    if (a->size > REAL_SIZE_LIMIT)
        return false;
    switch (a->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_CONSTANT: return a->is.constant != CONSTANT_I && a->is.constant != CONSTANT_INF;
    case EXPR_SYMBOL: return !facts_is_complex(e, a);
    case EXPR_BOUND: return bound_real;
    case EXPR_SUM: case EXPR_PRODUCT: return all_real(e, a, bound_real);
    case EXPR_POWER:
        if (!all_real(e, a, bound_real))
            return false;
        return is_nonnegative(e, a->args[0], bound_real) ||
               (a->args[1]->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->args[1]->is.number)));
    case EXPR_CALL: return is_real_call(e, a, bound_real);
    default: return false;
    }
}

static bool enclose_parts(expr *a, arb_t value, slong prec)
{
    arb_t part;
    arb_init(part);
    bool ok = true;
    arb_set_si(value, a->kind == EXPR_PRODUCT);
    for (size_t k = 0; ok && k < a->count; k++) {
        ok = expr_enclose_constant(a->args[k], part, prec);
        if (a->kind == EXPR_PRODUCT)
            arb_mul(value, value, part, prec);
        else
            arb_add(value, value, part, prec);
    }
    arb_clear(part);
    return ok;
}

static bool enclose_power(expr *a, arb_t value, slong prec)
{
    arb_t exponent;
    arb_init(exponent);
    bool ok = expr_enclose_constant(a->args[0], value, prec) && expr_enclose_constant(a->args[1], exponent, prec);
    const bool inverse = expr_is_int(a->args[1], -1);
    ok = ok && (arb_is_positive(value) || (inverse && !arb_contains_zero(value)));
    if (ok && inverse)
        arb_inv(value, value, prec);
    else if (ok)
        arb_pow(value, value, exponent, prec);
    arb_clear(exponent);
    return ok;
}

bool expr_enclose_constant(expr *a, arb_t value, slong prec)
{
    switch (a->kind) {
    case EXPR_NUMBER: arb_set_fmpq(value, &a->is.number, prec); return true;
    case EXPR_CONSTANT:
        if (a->is.constant == CONSTANT_PI)
            arb_const_pi(value, prec);
        else if (a->is.constant == CONSTANT_EULER)
            arb_const_euler(value, prec);
        return a->is.constant == CONSTANT_PI || a->is.constant == CONSTANT_EULER;
    case EXPR_SUM: case EXPR_PRODUCT: return enclose_parts(a, value, prec);
    case EXPR_POWER: return enclose_power(a, value, prec);
    case EXPR_CALL:
        if (!expr_is_call(a, FUNCTION_EXP) && !expr_is_call(a, FUNCTION_LOG))
            return false;
        if (!expr_enclose_constant(a->args[0], value, prec))
            return false;
        if (a->is.function == FUNCTION_LOG && !arb_is_positive(value))
            return false;
        if (a->is.function == FUNCTION_LOG)
            arb_log(value, value, prec);
        else
            arb_exp(value, value, prec);
        return true;
    default: return false;
    }
}
