/* The calculus of completely monotone (CM) and Bernstein (B) functions on (0, inf), over the tree. One idea: both classes are
 * closed under enough operations that what users type can often be read off; nothing is tried numerically.
 *
 * Source of the rules: R. L. Schilling, R. Song, Z. Vondracek, Bernstein Functions, 2nd ed. 2012 (numbers from memory):
 *   CM: sums, products, positive multiples (Corollary 1.6); CM after B is CM (Theorem 3.7), with y^-r, exp(-y) and 1/y CM;
 *       exp of a CM function is CM, as a series of products with positive coefficients;
 *       a power r < 0 of a polynomial with leading coefficient > 0 whose zeros are all real and <= 0: a product of (y + c)^r.
 *   B:  constants >= 0, y^r for 0 <= r <= 1, sums, positive multiples; B after B is B (Corollary 3.8), with y^r and log(1 + y) B;
 *       f(0) >= 0 and f' CM, so a sum of B functions less CM functions that is not negative at 0;
 *       y (y + c)^-r for c > 0, 0 <= r <= 1, a complete B function (Theorem 6.2). */
#include "engine/numeric/monotone.h"

#include <stdlib.h>

#include "engine/ball/decide.h"

static bool positive(tw_engine *e, expr *c)
{
    return c && decide_sign(e, c) == 1;
}

static bool not_negative(tw_engine *e, expr *c)
{
    int sign = c ? decide_sign(e, c) : 2;
    return sign == 1 || sign == 0;
}

static bool cm(tw_engine *e, expr *f, expr *y);
static bool bernstein_function(tw_engine *e, expr *f, expr *y);

/* A polynomial in y with rational coefficients, leading one > 0, all zeros real and <= 0? */
static bool zeros_on_left(tw_engine *e, expr *f, expr *y)
{
    expr **parts = NULL;
    slong degree = 0;
    fmpz_poly_t p, derivative, g;
    fmpq_poly_t q;
    bool fine;
    if (expr_polynomial(e, f, y, 40, &parts, &degree) != TW_OK)
        return false;
    fmpq_poly_init(q);
    fmpz_poly_init(p);
    fmpz_poly_init(derivative);
    fmpz_poly_init(g);
    fine = degree >= 1;
    for (slong k = 0; k <= degree && fine; k++) {
        fine = expr_is_number(parts[k]) && fmpq_sgn(expr_number(parts[k])) >= 0;
        if (fine)
            fmpq_poly_set_coeff_fmpq(q, k, expr_number(parts[k]));
    }
    if (fine) { /* coefficients >= 0: no zero > 0; all zeros real when the squarefree part has as many as its degree */
        fmpq_poly_get_numerator(p, q);
        fmpz_poly_derivative(derivative, p);
        fmpz_poly_gcd(g, p, derivative);
        fmpz_poly_div(p, p, g);
        fine = fmpz_poly_num_real_roots(p) == fmpz_poly_degree(p);
    }
    fmpz_poly_clear(g);
    fmpz_poly_clear(derivative);
    fmpz_poly_clear(p);
    fmpq_poly_clear(q);
    free(parts);
    return fine;
}

static bool cm_power(tw_engine *e, expr *f, expr *y)
{
    expr *base = f->args[0], *r = f->args[1];
    if (expr_has(r, y)) /* c^g with 0 < c <= 1 and g Bernstein is exp(-|log c| g); rare: left out */
        return false;
    if (decide_sign(e, r) == -1)
        return bernstein_function(e, base, y) || zeros_on_left(e, base, y);
    return expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r))) && fmpq_sgn(expr_number(r)) > 0 && cm(e, base, y);
}

static bool cm(tw_engine *e, expr *f, expr *y)
{
    if (!f || !budget_ok(e))
        return false;
    if (!expr_has(f, y))
        return not_negative(e, f);
    switch (f->kind) {
    case EXPR_SUM:
        for (uint32_t k = 0; k < f->count; k++)
            if (!cm(e, f->args[k], y))
                return false;
        return true;
    case EXPR_PRODUCT: {
        /* two negative constants may meet: take the constants together */
        expr *constant = expr_int(e, 1);
        for (uint32_t k = 0; k < f->count; k++)
            if (!expr_has(f->args[k], y))
                constant = expr_mul(e, constant, f->args[k]);
            else if (!cm(e, f->args[k], y))
                return false;
        return not_negative(e, constant);
    }
    case EXPR_POWER: return cm_power(e, f, y);
    case EXPR_CALL:
        if (f->is.function != FUNCTION_EXP)
            return false;
        return bernstein_function(e, expr_neg(e, f->args[0]), y) || cm(e, f->args[0], y);
    default: return false;
    }
}

/* y (y + c)^-r, times a constant >= 0. */
static bool complete_product(tw_engine *e, expr *f, expr *y)
{
    expr *constant = expr_int(e, 1);
    int powers = 0, plain = 0;
    for (uint32_t k = 0; k < f->count; k++) {
        expr *part = f->args[k];
        if (!expr_has(part, y)) {
            constant = expr_mul(e, constant, part);
        } else if (part == y) {
            plain++;
        } else if (part->kind == EXPR_POWER && expr_is_number(part->args[1])) {
            expr **parts = NULL;
            slong degree = 0;
            const fmpq *r = expr_number(part->args[1]);
            bool linear = fmpq_sgn(r) < 0 && fmpq_cmp_si((fmpq *)r, -1) >= 0 &&
                          expr_polynomial(e, part->args[0], y, 1, &parts, &degree) == TW_OK && degree == 1 &&
                          positive(e, parts[0]) && positive(e, parts[1]);
            free(parts);
            if (!linear)
                return false;
            powers++;
        } else {
            return false;
        }
    }
    return plain == 1 && powers == 1 && not_negative(e, constant);
}

/* Value at y = 0+, by substitution where that is allowed. */
static expr *at_zero(tw_engine *e, expr *f, expr *y)
{
    expr *value = expr_substitute(e, f, y, expr_int(e, 0));
    if (!value)
        engine_forgive(e);
    return value;
}

static bool bernstein_sum(tw_engine *e, expr *f, expr *y)
{
    bool decreasing = false;
    for (uint32_t k = 0; k < f->count; k++) {
        expr *part = f->args[k];
        if (!expr_has(part, y)) {
            decreasing = decreasing || !not_negative(e, part);
            continue;
        }
        if (bernstein_function(e, part, y))
            continue;
        if (!cm(e, expr_neg(e, part), y))
            return false;
        decreasing = true;
    }
    return !decreasing || not_negative(e, at_zero(e, f, y));
}

static bool bernstein_function(tw_engine *e, expr *f, expr *y)
{
    if (!f || !budget_ok(e))
        return false;
    if (!expr_has(f, y))
        return not_negative(e, f);
    if (f == y)
        return true;
    switch (f->kind) {
    case EXPR_SUM: return bernstein_sum(e, f, y);
    case EXPR_PRODUCT: {
        expr *constant = expr_int(e, 1), *moving = NULL;
        if (complete_product(e, f, y))
            return true;
        for (uint32_t k = 0; k < f->count; k++)
            if (!expr_has(f->args[k], y))
                constant = expr_mul(e, constant, f->args[k]);
            else if (moving)
                return false;
            else
                moving = f->args[k];
        return not_negative(e, constant) && bernstein_function(e, moving, y);
    }
    case EXPR_POWER: {
        expr *r = f->args[1];
        return !expr_has(r, y) && not_negative(e, r) && not_negative(e, expr_sub(e, expr_int(e, 1), r)) &&
               bernstein_function(e, f->args[0], y);
    }
    case EXPR_CALL:
        if (f->is.function != FUNCTION_LOG)
            return false;
        /* log(u) = log(1 + (u - 1)) */
        return bernstein_function(e, expr_sub(e, f->args[0], expr_int(e, 1)), y);
    default: return false;
    }
}

answer completely_monotone(tw_engine *e, expr *f, expr *y)
{
    return cm(e, f, y) ? ANSWER_YES : ANSWER_UNKNOWN;
}

answer bernstein(tw_engine *e, expr *f, expr *y)
{
    return bernstein_function(e, f, y) ? ANSWER_YES : ANSWER_UNKNOWN;
}
