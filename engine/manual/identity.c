/* When are two expressions the same function: the normal form of the form's texts, and the question whether an expression
 * vanishes identically. The one idea: only rewritings that hold for every value on the principal branches, then the exact
 * field of coefficients, so that "yes" is a proof. Knows nothing of the form or of moves. */
#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/exact/field.h"
#include "engine/exact/values.h"
#include "engine/manual/work.h"
#include "engine/method/scale.h"

/* f(g(u)) = u where it holds for every u: sinh(asinh(u)), cosh(acosh(u)), ...; acosh(cosh(u)) and asinh(sinh(u)) are left
 * alone, where it may not. */
static bool undoes(function_id outer, function_id inner)
{
    static const struct {
        function_id outer, inner;
    } pairs[] = {
        {FUNCTION_SINH, FUNCTION_ASINH}, {FUNCTION_COSH, FUNCTION_ACOSH}, {FUNCTION_TANH, FUNCTION_ATANH},
        {FUNCTION_SIN, FUNCTION_ASIN},   {FUNCTION_COS, FUNCTION_ACOS},   {FUNCTION_TAN, FUNCTION_ATAN},
    };
    for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++)
        if (pairs[k].outer == outer && pairs[k].inner == inner) return true;
    return false;
}

/* sinh(acosh(u)) = sqrt(u - 1) sqrt(u + 1), cosh(asinh(u)) = sqrt(1 + u^2), cos(asin(u)) = sin(acos(u)) = sqrt(1 - u^2),
 * everywhere on the principal branches (DLMF 4.16, 4.30 with 4.37). */
static expr *fold_pair(tw_engine *e, function_id outer, expr *inner)
{
    expr *u = inner->args[0], *one = expr_int(e, 1);
    if (undoes(outer, inner->is.function)) return u;
    if (outer == FUNCTION_SINH && inner->is.function == FUNCTION_ACOSH)
        return expr_mul(e, expr_sqrt(e, expr_sub(e, u, one)), expr_sqrt(e, expr_add(e, u, one)));
    if (outer == FUNCTION_COSH && inner->is.function == FUNCTION_ASINH)
        return expr_sqrt(e, expr_add(e, one, expr_mul(e, u, u)));
    if ((outer == FUNCTION_COS && inner->is.function == FUNCTION_ASIN) ||
        (outer == FUNCTION_SIN && inner->is.function == FUNCTION_ACOS))
        return expr_sqrt(e, expr_sub(e, one, expr_mul(e, u, u)));
    return NULL;
}

/* 1 + sinh(u)^2 = cosh(u)^2 with cosh(u) > 0 for a real u: cosh(u); else NULL. */
static expr *square_of_sum(tw_engine *e, expr *f)
{
    if (f->kind != EXPR_SUM || f->count != 2 || !expr_is_one(f->args[0])) return NULL;
    expr *base, *r;
    expr_as_power(e, f->args[1], &base, &r);
    if (!expr_is_int(r, 2) || !expr_is_call(base, FUNCTION_SINH)) return NULL;
    expr **symbols, *u = base->args[0];
    size_t count = expr_symbols(u, &symbols);
    for (size_t k = 0; k < count; k++) /* fresh symbols are variables over a real range */
        if (symbols[k]->fresh) u = expr_substitute(e, u, symbols[k], expr_symbol(e, "x_real"));
    free(symbols);
    return u && value_is_real(e, u) ? expr_call1(e, FUNCTION_COSH, base->args[0]) : NULL;
}

static expr *fold_inverses(tw_engine *e, expr *f)
{
    if (!f || f->count == 0 || f->kind == EXPR_INTEGRAL || f->kind == EXPR_CONTOUR || f->kind == EXPR_SUMMATION ||
        f->kind == EXPR_PIECEWISE || f->kind == EXPR_ROOT || !budget_ok(e))
        return f;
    expr **parts = base_alloc(f->count * sizeof *parts), *made = f;
    bool same = true;
    for (uint32_t k = 0; k < f->count; k++) {
        parts[k] = fold_inverses(e, f->args[k]);
        same = same && parts[k] == f->args[k];
    }
    expr *root;
    if (f->kind == EXPR_POWER && parts[0] && (root = square_of_sum(e, parts[0])) != NULL) {
        made = expr_pow(e, root, expr_mul(e, expr_int(e, 2), parts[1]));
    } else if (f->kind == EXPR_CALL && f->count == 1 && parts[0] && parts[0]->kind == EXPR_CALL && parts[0]->count == 1 &&
        (made = fold_pair(e, f->is.function, parts[0])) != NULL) {
    } else if (same) made = f;
    else if (f->kind == EXPR_SUM) made = expr_sum(e, parts, f->count);
    else if (f->kind == EXPR_PRODUCT) made = expr_product(e, parts, f->count);
    else if (f->kind == EXPR_POWER) made = expr_pow(e, parts[0], parts[1]);
    else if (f->kind == EXPR_CALL) made = expr_call(e, f->is.function, parts, f->count);
    else made = f;
    free(parts);
    return made;
}

expr *tidy(tw_engine *e, expr *f, expr *x, bool positive)
{
    if (!f) return NULL;
    f = fold_inverses(e, f);
    if (!f) return NULL;
    expr *list[] = {x};
    expr *made = normal_under_facts(e, f, list, x && positive ? 1 : 0);
    if (!made && forgive(e)) made = f;
    return made;
}

/* ---- identity ---- */

/* Gamma(u + n) as Gamma(u) and factors (DLMF 5.5.1), u with its rational part in (0, 1]: so that quotients of Gamma
 * functions are rational. */
static expr *gamma_reduced(tw_engine *e, expr *u)
{
    enum { SHIFT_MOST = 60 };
    fmpz_t n;
    fmpz_init(n);
    slong shift = 0;
    expr *lead = u->kind == EXPR_SUM ? u->args[0] : u;
    if (u->kind == EXPR_SUM && expr_is_number(lead)) {
        fmpz_cdiv_q(n, fmpq_numref(expr_number(lead)), fmpq_denref(expr_number(lead)));
        fmpz_sub_ui(n, n, 1);
        if (fmpz_cmp_si(n, SHIFT_MOST) <= 0 && fmpz_cmp_si(n, -SHIFT_MOST) >= 0) shift = fmpz_get_si(n);
    } else if (u->kind != EXPR_NUMBER && u->kind != EXPR_SUM) shift = -1; /* Gamma(u) = Gamma(u + 1)/u */
    fmpz_clear(n);
    expr *base = expr_sub(e, u, expr_int(e, shift)), *made = expr_call1(e, FUNCTION_GAMMA, base);
    for (slong k = 0; k < shift; k++) made = expr_mul(e, made, expr_add(e, base, expr_int(e, k)));
    for (slong k = shift; k < 0; k++) made = expr_div(e, made, expr_add(e, u, expr_int(e, k - shift)));
    return made;
}

static expr *reduce_gammas(tw_engine *e, expr *f)
{
    if (!f || f->count == 0 || !budget_ok(e)) return f;
    if (expr_is_call(f, FUNCTION_GAMMA)) return gamma_reduced(e, f->args[0]);
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER) return f;
    expr **parts = base_alloc(f->count * sizeof *parts), *made;
    for (uint32_t k = 0; k < f->count; k++) parts[k] = reduce_gammas(e, f->args[k]);
    if (f->kind == EXPR_POWER) made = expr_pow(e, parts[0], parts[1]);
    else made = f->kind == EXPR_SUM ? expr_sum(e, parts, f->count) : expr_product(e, parts, f->count);
    free(parts);
    return made;
}

static answer zero_in_field(tw_engine *e, expr *f)
{
    enum { ROOM_LEAST = 8, ROOM_MOST = 64, SIZE_MOST = 4000 };
    if (expr_size(f) > SIZE_MOST) return ANSWER_UNKNOWN;
    answer zero = ANSWER_UNKNOWN;
    bool again = true;
    for (slong room = ROOM_LEAST; again && room <= ROOM_MOST; room *= 2) {
        field F;
        field_init(&F, e, room);
        element a;
        element_init(&F, &a);
        again = false;
        if (field_from_expr(&F, &a, f) == TW_OK) zero = field_is_zero(&F, &a);
        else again = F.full;
        element_clear(&F, &a);
        field_clear(&F);
    }
    forgive(e);
    return zero;
}

bool is_identically_zero(tw_engine *e, expr *f, expr *x)
{
    if (!f) return false;
    if (expr_is_zero(f)) return true;
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT) return false;
    expr *g = tidy(e, f, x, x != NULL);
    if (g) g = expr_expand(e, g);
    if (!g) return forgive(e) && false;
    if (expr_is_zero(g)) return true;
    expr *h = reduce_gammas(e, g);
    if (h && h != g) {
        h = expr_expand(e, h);
        if (h && (expr_is_zero(h) || zero_in_field(e, h) == ANSWER_YES)) return true;
    }
    if (!forgive(e)) return false;
    return zero_in_field(e, g) == ANSWER_YES || (g != f && zero_in_field(e, f) == ANSWER_YES);
}
