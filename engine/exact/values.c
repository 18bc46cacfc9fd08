/* Questions about values free of x: zero, real, sign. Balls prove that something is not zero; only exact
 * arithmetic proves that it is (rational numbers here, algebraic and elementary constants by Calcium). A value
 * with parameters is "nonzero" when it is at one admissible sample. Knows nothing of series. */
#include "engine/exact/values.h"

#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/ball/tape.h"
#include "engine/exact/algebraic.h"

/* ---- exact zero by Calcium ---- */

enum { EXACT_SIZE_LIMIT = 200 }; /* nodes: Calcium's work grows fast with the number of extension elements */

static bool to_exact(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx);

static bool exact_parts(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx)
{
    ca_t t;
    ca_init(t, ctx);
    bool ok = true, sum = a->kind == EXPR_SUM;
    if (sum)
        ca_zero(out, ctx);
    else
        ca_one(out, ctx);
    for (uint32_t k = 0; k < a->count && ok; k++) {
        ok = to_exact(e, t, a->args[k], ctx);
        if (ok && sum)
            ca_add(out, out, t, ctx);
        else if (ok)
            ca_mul(out, out, t, ctx);
    }
    ca_clear(t, ctx);
    return ok;
}

static bool exact_power(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx)
{
    ca_t base, exponent;
    ca_init(base, ctx), ca_init(exponent, ctx);
    bool ok = to_exact(e, base, a->args[0], ctx);
    if (ok && expr_is_number(a->args[1])) {
        ok = fmpz_bits(fmpq_numref(expr_number(a->args[1]))) <= 16 &&
             fmpz_bits(fmpq_denref(expr_number(a->args[1]))) <= 16;
        if (ok)
            ca_pow_fmpq(out, base, expr_number(a->args[1]), ctx);
    } else if (ok) {
        ok = to_exact(e, exponent, a->args[1], ctx);
        if (ok)
            ca_pow(out, base, exponent, ctx);
    }
    ca_clear(base, ctx), ca_clear(exponent, ctx);
    return ok;
}

static bool exact_call(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx)
{
    ca_t z, other;
    ca_init(z, ctx), ca_init(other, ctx);
    bool ok = a->count == 1 && to_exact(e, z, a->args[0], ctx);
    if (ok)
        switch (a->is.function) {
        case FUNCTION_EXP: ca_exp(out, z, ctx); break;
        case FUNCTION_LOG: ca_log(out, z, ctx); break;
        case FUNCTION_SIN: ca_sin_cos(out, other, z, ctx); break;
        case FUNCTION_COS: ca_sin_cos(other, out, z, ctx); break;
        case FUNCTION_ATAN: ca_atan(out, z, ctx); break;
        case FUNCTION_GAMMA: ca_gamma(out, z, ctx); break;
        case FUNCTION_ERF: ca_erf(out, z, ctx); break;
        default: ok = false;
        }
    ca_clear(z, ctx), ca_clear(other, ctx);
    return ok;
}

static bool exact_root(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx)
{
    qqbar_t r;
    qqbar_init(r);
    bool ok = algebraic_number(e, r, a);
    if (ok)
        ca_set_qqbar(out, r, ctx);
    qqbar_clear(r);
    return ok;
}

static bool to_exact(tw_engine *e, ca_t out, expr *a, ca_ctx_t ctx)
{
    switch (a->kind) {
    case EXPR_NUMBER: ca_set_fmpq(out, expr_number(a), ctx); return true;
    case EXPR_CONSTANT:
        if (a->is.constant == CONSTANT_PI)
            ca_pi(out, ctx);
        else if (a->is.constant == CONSTANT_I)
            ca_i(out, ctx);
        else if (a->is.constant == CONSTANT_EULER)
            ca_euler(out, ctx);
        else
            return false;
        return true;
    case EXPR_SUM:
    case EXPR_PRODUCT: return exact_parts(e, out, a, ctx);
    case EXPR_POWER: return exact_power(e, out, a, ctx);
    case EXPR_CALL: return exact_call(e, out, a, ctx);
    case EXPR_ROOT: return exact_root(e, out, a, ctx);
    default: return false;
    }
}

static answer exact_is_zero(tw_engine *e, expr *a)
{
    if (expr_size(a) > EXACT_SIZE_LIMIT)
        return ANSWER_UNKNOWN;
    ca_ctx_t ctx;
    ca_t value;
    answer result = ANSWER_UNKNOWN;
    ca_ctx_init(ctx);
    ca_init(value, ctx);
    if (to_exact(e, value, a, ctx)) {
        truth_t t = ca_check_is_zero(value, ctx);
        result = t == T_TRUE ? ANSWER_YES : t == T_FALSE ? ANSWER_NO : ANSWER_UNKNOWN;
    }
    ca_clear(value, ctx);
    ca_ctx_clear(ctx);
    return result;
}

/* ---- balls ---- */

/* The ball of a fixed value: 1 when it excludes zero at some precision up to `most` bits, 0 when it holds zero at
 * all of them, -1 when the value cannot be had (no engine error is left). */
static int ball_excludes_zero(tw_engine *e, acb_t out, expr *a, slong most)
{
    int result = -1;
    for (slong prec = 64; prec <= most; prec *= 4) {
        if (ball_value(e, out, a, prec) != TW_OK) {
            engine_forgive(e);
            return result;
        }
        if (!acb_is_finite(out))
            continue;
        if (!acb_contains_zero(out))
            return 1;
        result = 0;
    }
    return result;
}

/* A rational inside what the facts say of a symbol, the `trial`-th; the same for every expression that holds the
 * symbol. */
static expr *sample(tw_engine *e, expr *symbol, slong trial)
{
    slong index = (slong)(symbol->serial % 9973);
    fmpq_t low, high;
    fmpq_init(low), fmpq_init(high);
    int known = facts_interval(e, symbol, low, high);
    expr *shift = expr_frac(e, 7 + 4 * index + 10 * trial, 11 + 3 * index); /* positive, different for each symbol */
    expr *part = expr_frac(e, 2 + index + trial, 5 + 3 * index + 2 * trial); /* in (0, 1) */
    expr *value;
    if (facts_is_integer(e, symbol))
        shift = expr_int(e, 1 + index + trial);
    if ((known & 3) == 3 && !facts_is_integer(e, symbol))
        value = expr_add(e, expr_fmpq(e, low), expr_mul(e, part, expr_sub(e, expr_fmpq(e, high), expr_fmpq(e, low))));
    else if (known & 1)
        value = expr_add(e, expr_fmpq(e, low), shift);
    else if (known & 2)
        value = expr_sub(e, expr_fmpq(e, high), shift);
    else
        value = shift;
    fmpq_clear(low), fmpq_clear(high);
    return value;
}

expr *value_sample(tw_engine *e, expr *a, slong trial)
{
    expr **symbols;
    size_t n = expr_symbols(a, &symbols);
    expr **values = base_alloc((n + 1) * sizeof *values);
    for (size_t k = 0; k < n; k++)
        values[k] = sample(e, symbols[k], trial);
    expr *at = expr_substitute_all(e, a, symbols, values, n);
    free(values);
    free(symbols);
    return at;
}

static answer is_zero_by_samples(tw_engine *e, expr *a)
{
    acb_t ball;
    acb_init(ball);
    answer result = ANSWER_UNKNOWN;
    for (slong trial = 0; trial < 3 && result == ANSWER_UNKNOWN; trial++) {
        expr *at = value_sample(e, a, trial);
        if (at == NULL)
            engine_forgive(e);
        else if (ball_excludes_zero(e, ball, at, 256) == 1)
            result = ANSWER_NO;
    }
    acb_clear(ball);
    return result;
}

answer value_is_zero(tw_engine *e, expr *a)
{
    if (expr_is_number(a))
        return expr_is_zero(a) ? ANSWER_YES : ANSWER_NO;
    if (!expr_is_closed_value(a))
        return is_zero_by_samples(e, a);
    acb_t ball;
    acb_init(ball);
    int excludes = ball_excludes_zero(e, ball, a, 1024);
    answer result = excludes == 1 ? ANSWER_NO : ANSWER_UNKNOWN;
    if (excludes == 0 && exact_is_zero(e, a) == ANSWER_YES)
        result = ANSWER_YES;
    acb_clear(ball);
    return result;
}

int value_sign(tw_engine *e, expr *a)
{
    if (expr_is_number(a))
        return fmpq_sgn(expr_number(a));
    if (!expr_is_closed_value(a))
        return decide_sign(e, a);
    acb_t ball;
    acb_init(ball);
    int sign = 2, excludes = ball_excludes_zero(e, ball, a, 1024);
    if (excludes == 1 && arb_contains_zero(acb_imagref(ball)) && !arb_contains_zero(acb_realref(ball)))
        sign = arb_is_positive(acb_realref(ball)) ? 1 : -1;
    else if (excludes == 0 && exact_is_zero(e, a) == ANSWER_YES)
        sign = 0;
    acb_clear(ball);
    return sign;
}

bool value_is_singular(tw_engine *e, expr *a)
{
    acb_t ball;
    acb_init(ball);
    bool singular = expr_is_closed_value(a) && !expr_is_number(a) && ball_value(e, ball, a, 128) == TW_OK &&
                    !acb_is_finite(ball) && ball_value(e, ball, a, 1024) == TW_OK && !acb_is_finite(ball);
    if (!singular)
        engine_forgive(e);
    acb_clear(ball);
    return singular;
}

bool value_off_cut(tw_engine *e, expr *a)
{
    if (!expr_is_closed_value(a))
        return value_is_real(e, a) && value_sign(e, a) == 1;
    acb_t ball;
    acb_init(ball);
    bool off = ball_excludes_zero(e, ball, a, 1024) == 1 &&
               (!arb_contains_zero(acb_imagref(ball)) || arb_is_positive(acb_realref(ball)));
    acb_clear(ball);
    return off;
}

bool value_is_integer(tw_engine *e, expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: return fmpz_is_one(fmpq_denref(expr_number(a)));
    case EXPR_SYMBOL: return facts_is_integer(e, a);
    case EXPR_SUM:
    case EXPR_PRODUCT:
        for (uint32_t k = 0; k < a->count; k++)
            if (!value_is_integer(e, a->args[k]))
                return false;
        return true;
    default: return false;
    }
}

/* Functions that are real for real arguments, and those that are so for positive ones. */
static bool call_is_real(tw_engine *e, expr *a)
{
    for (uint32_t k = 0; k < a->count; k++)
        if (a->is.function != FUNCTION_ABS && a->is.function != FUNCTION_RE && a->is.function != FUNCTION_IM &&
            a->is.function != FUNCTION_ARG && !value_is_real(e, a->args[k]))
            return false;
    expr *last = a->args[a->count - 1];
    switch (a->is.function) {
    case FUNCTION_LOG:
    case FUNCTION_LNGAMMA:
    case FUNCTION_E1:
    case FUNCTION_GAMMA_UPPER:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return value_sign(e, last) == 1;
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ATANH: {
        expr *gap = expr_sub(e, expr_int(e, 1), expr_mul(e, last, last));
        return gap != NULL && (value_sign(e, gap) == 1 || value_sign(e, gap) == 0);
    }
    case FUNCTION_ACOSH: {
        expr *gap = expr_sub(e, last, expr_int(e, 1));
        return gap != NULL && (value_sign(e, gap) == 1 || value_sign(e, gap) == 0);
    }
    default: return true;
    }
}

/* The isolated root is given with an imaginary part that is exactly 0 when it is real. */
static bool root_is_real(tw_engine *e, expr *a)
{
    acb_t z;
    acb_init(z);
    bool real = ball_value(e, z, a, 128) == TW_OK && acb_is_finite(z) && arb_is_zero(acb_imagref(z));
    acb_clear(z);
    return real;
}

bool value_is_real(tw_engine *e, expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_CONSTANT: return a->is.constant != CONSTANT_I;
    case EXPR_SYMBOL: return !facts_is_complex(e, a);
    case EXPR_SUM:
    case EXPR_PRODUCT:
        for (uint32_t k = 0; k < a->count; k++)
            if (!value_is_real(e, a->args[k]))
                return false;
        return true;
    case EXPR_POWER:
        if (!value_is_real(e, a->args[0]) || !value_is_real(e, a->args[1]))
            return false;
        return value_is_integer(e, a->args[1]) || value_sign(e, a->args[0]) == 1;
    case EXPR_CALL: return call_is_real(e, a);
    case EXPR_ROOT: return root_is_real(e, a);
    default: return false;
    }
}
