/* Is a value real for a reason of structure? Ball arithmetic off the real line leaves a small imaginary part in the quadrature of a
 * real integrand; where this calculus proves the value real, that part is 0. It only ever errs towards "not known". */
#include "engine/ball/decide.h"
#include "engine/ball/sign.h"

typedef struct real_range {
    tw_engine *e;
    expr *x, *from, *to; /* x NULL: no variable */
} real_range;

static bool real_on(const real_range *r, expr *f);

/* f >= 0 (or > 0) on the range, f known to be real. */
static bool nonnegative_on(const real_range *r, expr *f, bool strictly)
{
    if (!r->x || !expr_has(f, r->x)) {
        int signs = sign_of(r->e, f, NULL);
        return signs == SIGN_POSITIVE || (!strictly && !(signs & SIGN_NEGATIVE));
    }
    if (expr_is_minus_inf(r->from)) {
        expr *y = expr_fresh(r->e, "y"), *mirrored = expr_substitute(r->e, f, r->x, expr_neg(r->e, y));
        real_range right = {r->e, r->x, expr_int(r->e, 0), r->to};
        bool all = expr_is_inf(r->to);
        expr *start = all ? expr_int(r->e, 0) : expr_neg(r->e, r->to);
        if (decide_positive_on(r->e, mirrored, y, start, expr_constant_of(r->e, CONSTANT_INF), !strictly) != ANSWER_YES) return false;
        return !all || nonnegative_on(&right, f, strictly);
    }
    return decide_positive_on(r->e, f, r->x, r->from, r->to, !strictly) == ANSWER_YES;
}

static bool all_real(const real_range *r, expr *f)
{
    for (uint32_t k = 0; k < f->count; k++)
        if (f->args[k]->kind != EXPR_RELATION && !real_on(r, f->args[k])) return false;
    return true;
}

static bool real_call(const real_range *r, expr *f)
{
    switch (f->is.function) {
    case FUNCTION_ABS:
    case FUNCTION_RE:
    case FUNCTION_IM:
    case FUNCTION_ARG: return true;
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ATANH:
    case FUNCTION_ACOSH: return false;
    case FUNCTION_LOG: /* at an end where the argument is 0 the integrand has no value to be complex */
    case FUNCTION_LNGAMMA:
    case FUNCTION_E1: return real_on(r, f->args[0]) && nonnegative_on(r, f->args[0], false);
    case FUNCTION_GAMMA_UPPER:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return all_real(r, f) && nonnegative_on(r, f->args[1], false);
    default: return all_real(r, f); /* real on the real line */
    }
}

static bool real_integral(const real_range *r, expr *f)
{
    if (!real_on(r, f->args[0]) || !real_on(r, f->args[1])) return false;
    real_range inner = {r->e, expr_fresh(r->e, "x"), f->args[0], f->args[1]};
    if (expr_order(inner.from, inner.to) == 0) return true;
    expr *body = expr_open(r->e, f, inner.x);
    return body && real_on(&inner, body);
}

static bool real_on(const real_range *r, expr *f)
{
    switch ((expr_kind)f->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_CONSTANT: return f->is.constant != CONSTANT_I;
    case EXPR_SYMBOL: return f == r->x;
    case EXPR_SUM:
    case EXPR_PRODUCT:
    case EXPR_PIECEWISE: return all_real(r, f);
    case EXPR_POWER:
        if (!all_real(r, f)) return false;
        if (expr_is_number(f->args[1]) && fmpz_is_one(fmpq_denref(expr_number(f->args[1])))) return true;
        return nonnegative_on(r, f->args[0], false);
    case EXPR_CALL: return real_call(r, f);
    case EXPR_INTEGRAL: return real_integral(r, f);
    default: return false;
    }
}

bool decide_real_value(tw_engine *e, expr *f)
{
    real_range none = {e, NULL, NULL, NULL};
    bool real = real_on(&none, f);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED) engine_forgive(e);
    return real;
}
