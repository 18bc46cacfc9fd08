/* An integrand taken apart into waves Q exp(L): by its form alone, exactly. Knows no paths and no numbers.
 *
 * The one idea: cos and sin are sums of two exponentials; an exponential gives the imaginary part of its exponent to L
 * and keeps the real part in Q. */
#include "engine/ball/quadrature_oscillating.h"

#include <stdlib.h>

#include "engine/ball/sign.h"

/* ---- a range, and what is real on it ---- */

/* Real for all x of the range: as it stands, or with x written as an end plus or minus something positive. */
bool quad_is_real(const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    if (!f || sign_is_real(e, f))
        return f != NULL;
    if (!expr_has(f, r->x))
        return sign_is_real(e, f);
    expr *v = expr_call1(e, FUNCTION_EXP, expr_fresh(e, "v")), *g = NULL;
    if (r->low)
        g = expr_substitute(e, f, r->x, expr_add(e, r->from, v));
    if (g && sign_is_real(e, g))
        return true;
    if (r->high)
        g = expr_substitute(e, f, r->x, expr_sub(e, r->to, v));
    if (r->low && r->high && (!g || !sign_is_real(e, g))) { /* from + (to - from) v/(1 + v) */
        expr *share = expr_div(e, v, expr_add(e, expr_int(e, 1), v));
        g = expr_substitute(e, f, r->x, expr_add(e, r->from, expr_mul(e, expr_sub(e, r->to, r->from), share)));
    }
    return g && sign_is_real(e, g);
}

/* ---- waves of an expression ---- */

static bool is_entire_wave(expr *f, expr *x)
{
    return expr_has(f, x) && (expr_is_call(f, FUNCTION_COS) || expr_is_call(f, FUNCTION_SIN));
}

bool quad_holds_wave(expr *f, expr *x)
{
    if (!expr_has(f, x))
        return false;
    if (is_entire_wave(f, x) || expr_is_call(f, FUNCTION_EXP))
        return true;
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER)
        return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (quad_holds_wave(f->args[k], x))
            return true;
    return false;
}

expr *quad_imaginary(tw_engine *e, slong p, slong q)
{
    return expr_mul(e, expr_frac(e, p, q), expr_constant_of(e, CONSTANT_I));
}

static expr *join_exponents(tw_engine *e, expr *a, expr *b)
{
    expr *sum = a && b ? expr_add(e, a, b) : a ? a : b;
    return sum && expr_is_zero(sum) ? NULL : sum;
}

static bool put(quad_terms *t, expr *Q, expr *L)
{
    if (t->count == QUAD_TERM_LIMIT || !Q)
        return false;
    t->list[t->count++] = (quad_term){Q, L};
    return true;
}

/* exp(u): its real terms stay in the amplitude. */
static bool put_exponential(quad_terms *t, const wave_range *r, expr *u)
{
    tw_engine *e = r->e;
    expr *flat = expr_expand(e, u), *real = expr_int(e, 0), *phase = NULL;
    if (!flat)
        return false;
    expr *const *parts;
    size_t n = expr_terms(&flat, &parts);
    for (size_t k = 0; k < n; k++) {
        if (!expr_has(parts[k], r->x) || quad_is_real(r, parts[k]))
            real = expr_add(e, real, parts[k]);
        else
            phase = join_exponents(e, phase, parts[k]);
    }
    return put(t, phase ? expr_call1(e, FUNCTION_EXP, real) : expr_call1(e, FUNCTION_EXP, u), phase);
}

static bool multiply(quad_terms *t, const wave_range *r, const quad_terms *a, const quad_terms *b)
{
    for (size_t k = 0; k < a->count; k++)
        for (size_t j = 0; j < b->count; j++)
            if (!put(t, expr_mul(r->e, a->list[k].Q, b->list[j].Q), join_exponents(r->e, a->list[k].L, b->list[j].L)))
                return false;
    return true;
}

/* A product of n parts; part k is parts[k], or parts[0] each time for a power. */
static bool collect_product(quad_terms *t, const wave_range *r, expr *const *parts, size_t n, bool power, bool *fold)
{
    quad_terms *work = base_alloc(3 * sizeof *work);
    quad_terms *sum = &work[0], *next = &work[1], *one = &work[2];
    bool never = false, ok = true;
    expr *rest = expr_int(r->e, 1);
    sum->count = 0;
    ok = put(sum, expr_int(r->e, 1), NULL);
    for (size_t k = 0; ok && k < n; k++) {
        expr *part = parts[power ? 0 : k];
        if (!quad_holds_wave(part, r->x)) {
            rest = expr_mul(r->e, rest, part);
            continue;
        }
        one->count = next->count = 0;
        ok = quad_collect(one, r, part, is_entire_wave(part, r->x) ? fold : &never) && multiply(next, r, sum, one);
        quad_terms *swap = sum;
        sum = next;
        next = swap;
    }
    for (size_t k = 0; ok && k < sum->count; k++)
        ok = put(t, expr_mul(r->e, sum->list[k].Q, rest), sum->list[k].L);
    free(work);
    return ok;
}

bool quad_all_real(const wave_range *r, expr *f)
{
    expr *const *parts;
    size_t n = expr_factors(&f, &parts);
    for (size_t k = 0; k < n; k++)
        if (!quad_is_real(r, parts[k]))
            return false;
    return true;
}

/* f as a sum of waves. *fold: only the real part is wanted; one cosine or sine may then stand as one exponential. */
bool quad_collect(quad_terms *t, const wave_range *r, expr *f, bool *fold)
{
    tw_engine *e = r->e;
    if (!quad_holds_wave(f, r->x))
        return put(t, f, NULL);
    if (f->kind == EXPR_SUM) {
        for (uint32_t k = 0; k < f->count; k++) {
            bool own = *fold && quad_all_real(r, f->args[k]);
            if (!quad_collect(t, r, f->args[k], &own))
                return false;
        }
        return true;
    }
    if (f->kind == EXPR_PRODUCT)
        return collect_product(t, r, f->args, f->count, false, fold);
    if (f->kind == EXPR_POWER && expr_is_number(f->args[1]) && fmpz_is_one(fmpq_denref(expr_number(f->args[1]))) &&
            fmpz_sgn(fmpq_numref(expr_number(f->args[1]))) > 0 &&
            fmpz_cmp_ui(fmpq_numref(expr_number(f->args[1])), 5) < 0)
        return collect_product(t, r, f->args, fmpz_get_ui(fmpq_numref(expr_number(f->args[1]))), true, fold);
    if (expr_is_call(f, FUNCTION_EXP))
        return put_exponential(t, r, f->args[0]);
    if (!is_entire_wave(f, r->x))
        return put(t, f, NULL);
    expr *up = expr_expand(e, expr_mul(e, expr_constant_of(e, CONSTANT_I), f->args[0]));
    bool sine = f->is.function == FUNCTION_SIN;
    if (*fold) {
        *fold = false;
        return put(t, sine ? quad_imaginary(e, -1, 1) : expr_int(e, 1), up);
    }
    return put(t, sine ? quad_imaginary(e, -1, 2) : expr_frac(e, 1, 2), up) &&
           put(t, sine ? quad_imaginary(e, 1, 2) : expr_frac(e, 1, 2), expr_neg(e, up));
}

/* Phases and exponents multiplied out, so that even integrands are seen to be even. */
expr *quad_tidy(tw_engine *e, expr *f, expr *x)
{
    if (!f || !quad_holds_wave(f, x))
        return f;
    if (f->kind == EXPR_CALL)
        return expr_call1(e, f->is.function, expr_expand(e, f->args[0]));
    expr **args = base_alloc(f->count * sizeof *args);
    for (uint32_t k = 0; k < f->count; k++)
        args[k] = quad_tidy(e, f->args[k], x);
    expr *out = expr_rebuild(e, f, args);
    free(args);
    return out;
}

/* Has f only functions that are analytic where they are defined? */
bool quad_is_analytic(expr *f)
{
    switch ((expr_kind)f->kind) {
    case EXPR_PIECEWISE:
    case EXPR_RELATION:
    case EXPR_INTEGRAL:
    case EXPR_CONTOUR:
    case EXPR_SUMMATION: return false;
    case EXPR_CALL:
        switch (f->is.function) {
        case FUNCTION_ABS:
        case FUNCTION_RE:
        case FUNCTION_IM:
        case FUNCTION_CONJ:
        case FUNCTION_ARG:
        case FUNCTION_SIGN:
        case FUNCTION_MIN:
        case FUNCTION_MAX: return false;
        default: break;
        }
        break;
    default: break;
    }
    for (uint32_t k = 0; k < f->count; k++)
        if (!quad_is_analytic(f->args[k]))
            return false;
    return true;
}

/* cosh and sinh of what holds x by exponentials. */
expr *quad_without_hyperbolic(tw_engine *e, expr *f, expr *x)
{
    if (!f || !expr_has(f, x) || (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER &&
                                  f->kind != EXPR_CALL))
        return f;
    expr **args = base_alloc(f->count * sizeof *args), *out = NULL;
    for (uint32_t k = 0; k < f->count; k++)
        args[k] = quad_without_hyperbolic(e, f->args[k], x);
    if (f->kind == EXPR_SUM) {
        out = expr_sum(e, args, f->count);
    } else if (f->kind == EXPR_PRODUCT) {
        out = expr_product(e, args, f->count);
    } else if (f->kind == EXPR_POWER) {
        out = expr_pow(e, args[0], args[1]);
    } else if (f->is.function == FUNCTION_COSH || f->is.function == FUNCTION_SINH) {
        expr *up = expr_call1(e, FUNCTION_EXP, args[0]), *down = expr_call1(e, FUNCTION_EXP, expr_neg(e, args[0]));
        out = f->is.function == FUNCTION_COSH ? expr_add(e, up, down) : expr_sub(e, up, down);
        out = expr_mul(e, expr_frac(e, 1, 2), out);
    } else {
        out = expr_call(e, f->is.function, args, f->count);
    }
    free(args);
    return out;
}
