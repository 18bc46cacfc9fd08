/* All zeros of a function on a range. The one idea: written as a quotient over its generators (x, exp(x), sqrt(1 +
 * x^2),
 * ...) and factored, a function's zeros are those of the factors; a polynomial gives them exactly, a factor that holds
 * x only inside one function is solved by that function's inverse, and what is left is isolated by balls. */
#include "engine/method/zeros.h"

#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/ball/tape.h"
#include "engine/exact/algebraic.h"
#include "engine/exact/field.h"
#include "engine/exact/values.h"
#include "engine/method/points.h"
#include "engine/method/scale.h"

enum { DEGREE_MOST = 200, ROOT_BITS = 256, PERIODS_MOST = 400, NESTED_MOST = 4 };

void expr_list_add(expr ***list, size_t *count, expr *a)
{
    *list = base_resize(*list, (*count + 1) * sizeof **list);
    (*list)[(*count)++] = a;
}

static tw_status zeros_nested(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***list, size_t *count,
                              int level);

static bool no_zero(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    return decide_positive_on(e, f, x, from, to, false) == ANSWER_YES ||
           decide_positive_on(e, expr_neg(e, f), x, from, to, false) == ANSWER_YES;
}

static tw_status refuse_zeros(tw_engine *e, expr *f, expr *x)
{
    char *words = expr_text(e, f);
    engine_fail(e, ERROR_UNDECIDED, "the critical points of the exponent, where %s = 0, could not all be found in %s",
                words ? words : "", x->is.name);
    free(words);
    return TW_ERROR;
}

/* ---- polynomials ---- */

static bool integer_polynomial(fmpz_poly_t out, expr *const *c, slong degree)
{
    fmpq_poly_t p;
    fmpq_poly_init(p);
    bool rational = true;
    for (slong k = 0; k <= degree && rational; k++) {
        rational = expr_is_number(c[k]);
        if (rational) fmpq_poly_set_coeff_fmpq(p, k, expr_number(c[k]));
    }
    if (rational) fmpq_poly_get_numerator(out, p);
    fmpq_poly_clear(p);
    return rational;
}

/* Real roots of each irreducible factor. */
static tw_status rational_roots(tw_engine *e, const fmpz_poly_t p, expr ***list, size_t *count)
{
    fmpz_poly_factor_t parts;
    fmpz_poly_factor_init(parts);
    fmpz_poly_factor(parts, p);
    for (slong k = 0; k < parts->num && e->error.kind == ERROR_NONE; k++) {
        slong n = fmpz_poly_degree(parts->p + k);
        acb_ptr roots = _acb_vec_init(n);
        if (n > 0) arb_fmpz_poly_complex_roots(roots, parts->p + k, 0, ROOT_BITS);
        for (slong j = 0; j < n; j++)
            if (arb_is_zero(acb_imagref(roots + j)))
                expr_list_add(list, count, algebraic_expr(e, parts->p + k, acb_realref(roots + j)));
        _acb_vec_clear(roots, n);
    }
    fmpz_poly_factor_clear(parts);
    return e->error.kind == ERROR_NONE && budget_ok(e) ? TW_OK : TW_ERROR;
}

static tw_status ask_sign(tw_engine *e, expr *a, int *sign)
{
    *sign = expr_is_number(a)         ? fmpq_sgn(expr_number(a))
            : expr_is_closed_value(a) ? value_sign(e, a)
                                      : decide_sign(e, a);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (*sign != 2) return TW_OK;
    char *words = expr_text(e, a);
    engine_fail(e, ERROR_UNDECIDED, "the sign of %s decides where the critical points lie: declare it with `given`",
                words ? words : "");
    free(words);
    return TW_ERROR;
}

static tw_status add_simple(tw_engine *e, expr ***list, size_t *count, expr *z)
{
    z = normal_under_facts(e, z, NULL, 0);
    if (!z) return TW_ERROR;
    expr_list_add(list, count, z);
    return TW_OK;
}

static tw_status quadratic_zeros(tw_engine *e, expr *const *c, expr ***list, size_t *count)
{
    expr *d = expr_sub(e, expr_mul(e, c[1], c[1]), expr_mul(e, expr_int(e, 4), expr_mul(e, c[0], c[2])));
    int sign;
    d = value_canonical(e, d);
    if (!d || ask_sign(e, d, &sign) != TW_OK) return TW_ERROR;
    if (sign < 0) return TW_OK;
    expr *over = expr_pow(e, expr_mul(e, expr_int(e, 2), c[2]), expr_int(e, -1)), *root = expr_sqrt(e, d);
    for (int side = -1; side <= 1; side += 2) {
        expr *top = expr_add(e, expr_neg(e, c[1]), expr_mul(e, expr_int(e, side), root));
        if (add_simple(e, list, count, expr_expand(e, expr_mul(e, over, top))) != TW_OK) return TW_ERROR;
        if (sign == 0) break;
    }
    return TW_OK;
}

/* c[n] x^n + c[0] */
static tw_status binomial_zeros(tw_engine *e, expr *const *c, slong n, expr ***list, size_t *count)
{
    expr *k = value_canonical(e, expr_neg(e, expr_div(e, c[0], c[n])));
    int sign;
    if (!k || ask_sign(e, k, &sign) != TW_OK) return TW_ERROR;
    if (sign == 0) return add_simple(e, list, count, k);
    if (sign < 0 && n % 2 == 0) return TW_OK;
    expr *root = expr_pow(e, sign < 0 ? expr_neg(e, k) : k, expr_frac(e, 1, n));
    if (add_simple(e, list, count, sign < 0 ? expr_neg(e, root) : root) != TW_OK) return TW_ERROR;
    return n % 2 == 0 ? add_simple(e, list, count, expr_neg(e, root)) : TW_OK;
}

/* *solved false, without an error: degree and coefficients that are not for formulas. */
static tw_status polynomial_zeros(tw_engine *e, expr *const *c, slong degree, expr ***list, size_t *count, bool *solved)
{
    fmpz_poly_t p;
    fmpz_poly_init(p);
    *solved = true;
    tw_status status = TW_OK;
    bool binomial = true;
    for (slong k = 1; k < degree; k++) binomial = binomial && expr_is_zero(c[k]);
    if (integer_polynomial(p, c, degree))
        status = rational_roots(e, p, list, count);
    else if (degree == 1)
        status = add_simple(e, list, count, expr_neg(e, expr_div(e, c[0], c[1])));
    else if (binomial)
        status = binomial_zeros(e, c, degree, list, count);
    else if (degree == 2)
        status = quadratic_zeros(e, c, list, count);
    else
        *solved = false;
    fmpz_poly_clear(p);
    return status;
}

/* ---- one function of x ---- */

/* The one call or fractional power through which alone x enters f; NULL when there are several or none. */
static bool only_through(expr *f, expr *x, expr **g)
{
    if (!expr_has(f, x)) return true;
    bool atom =
        f->kind == EXPR_CALL || (f->kind == EXPR_POWER && (expr_has(f->args[1], x) || !expr_is_number(f->args[1]) ||
                                                           !fmpz_is_one(fmpq_denref(expr_number(f->args[1])))));
    if (atom) {
        if (*g && *g != f) return false;
        *g = f;
        return true;
    }
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER) return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (!only_through(f->args[k], x, g)) return false;
    return true;
}

/* u(x) = v: zeros of u - v. */
static tw_status solve_inner(tw_engine *e, expr *u, expr *v, expr *x, expr *from, expr *to, expr ***list, size_t *count,
                             int level)
{
    expr *f = expr_sub(e, u, v);
    return f ? zeros_nested(e, f, x, from, to, list, count, level + 1) : TW_ERROR;
}

/* u = base + n*period for all n that can lie on the path; u linear in x. */
static tw_status solve_periodic(tw_engine *e, expr *u, expr *base, expr *period, expr *x, expr *from, expr *to,
                                expr ***list, size_t *count, int level)
{
    acb_t a, b, c, d;
    arb_t low, high;
    if (expr_is_inf(to) || expr_is_minus_inf(from) || !expr_is_closed_value(from) || !expr_is_closed_value(to) ||
        !expr_is_closed_value(base))
        return refuse_zeros(e, u, x);
    expr **k;
    slong degree;
    if (expr_polynomial(e, u, x, 1, &k, &degree) != TW_OK) return refuse_zeros(e, u, x);
    free(k);
    acb_init(a), acb_init(b), acb_init(c), acb_init(d);
    arb_init(low), arb_init(high);
    tw_status status = ball_value(e, a, expr_substitute(e, u, x, from), 64);
    if (status == TW_OK) status = ball_value(e, b, expr_substitute(e, u, x, to), 64);
    if (status == TW_OK) status = ball_value(e, c, base, 64);
    if (status == TW_OK) status = ball_value(e, d, period, 64);
    if (status == TW_OK) {
        arb_min(low, acb_realref(a), acb_realref(b), 64);
        arb_max(high, acb_realref(a), acb_realref(b), 64);
        arb_sub(low, low, acb_realref(c), 64), arb_div(low, low, acb_realref(d), 64);
        arb_sub(high, high, acb_realref(c), 64), arb_div(high, high, acb_realref(d), 64);
        double first = arf_get_d(arb_midref(low), ARF_RND_FLOOR), last = arf_get_d(arb_midref(high), ARF_RND_CEIL);
        if (!(last - first < PERIODS_MOST) || !(first > -1e9) || !(last < 1e9)) status = refuse_zeros(e, u, x);
        for (slong n = (slong)first - 1; status == TW_OK && n <= (slong)last + 1; n++)
            status = solve_inner(e, u, expr_add(e, base, expr_mul(e, expr_int(e, n), period)), x, from, to, list, count,
                                 level);
    }
    arb_clear(low), arb_clear(high);
    acb_clear(a), acb_clear(b), acb_clear(c), acb_clear(d);
    return status;
}

/* g = k for the function g of x; *solved false, without an error: no inverse is known here. */
static tw_status solve_function(tw_engine *e, expr *g, expr *k, expr *x, expr *from, expr *to, expr ***list,
                                size_t *count, int level, bool *solved)
{
    expr *u = g->args[0], *one = expr_int(e, 1), *pi = expr_constant_of(e, CONSTANT_PI);
    expr *two_pi = expr_mul(e, expr_int(e, 2), pi), *v = NULL;
    int sign;
    if (g->kind == EXPR_POWER) {
        if (!expr_is_number(g->args[1])) {
            if (expr_has(g->args[1], x)) return *solved = false, TW_OK;
        }
        if (ask_sign(e, k, &sign) != TW_OK) return TW_ERROR;
        if (sign < 0) return TW_OK;
        v = sign == 0 ? k : expr_pow(e, k, expr_pow(e, g->args[1], expr_int(e, -1)));
        return solve_inner(e, u, v, x, from, to, list, count, level);
    }
    switch (g->is.function) {
    case FUNCTION_EXP:
        if (ask_sign(e, k, &sign) != TW_OK) return TW_ERROR;
        return sign > 0 ? solve_inner(e, u, expr_call1(e, FUNCTION_LOG, k), x, from, to, list, count, level) : TW_OK;
    case FUNCTION_LOG: return solve_inner(e, u, expr_call1(e, FUNCTION_EXP, k), x, from, to, list, count, level);
    case FUNCTION_SINH: return solve_inner(e, u, expr_call1(e, FUNCTION_ASINH, k), x, from, to, list, count, level);
    case FUNCTION_ASINH: return solve_inner(e, u, expr_call1(e, FUNCTION_SINH, k), x, from, to, list, count, level);
    case FUNCTION_TANH:
    case FUNCTION_COSH: {
        bool cosh = g->is.function == FUNCTION_COSH;
        expr *away = cosh ? expr_sub(e, k, one) : expr_sub(e, one, expr_mul(e, k, k));
        if (ask_sign(e, away, &sign) != TW_OK) return TW_ERROR;
        if (sign < 0 || (!cosh && sign == 0)) return TW_OK;
        v = expr_call1(e, cosh ? FUNCTION_ACOSH : FUNCTION_ATANH, k);
        if (solve_inner(e, u, v, x, from, to, list, count, level) != TW_OK) return TW_ERROR;
        return cosh && sign > 0 ? solve_inner(e, u, expr_neg(e, v), x, from, to, list, count, level) : TW_OK;
    }
    case FUNCTION_SIN:
    case FUNCTION_COS: {
        bool sine = g->is.function == FUNCTION_SIN;
        if (ask_sign(e, expr_sub(e, one, expr_mul(e, k, k)), &sign) != TW_OK) return TW_ERROR;
        if (sign < 0) return TW_OK;
        v = expr_call1(e, sine ? FUNCTION_ASIN : FUNCTION_ACOS, k);
        expr *other = sine ? expr_sub(e, pi, v) : expr_neg(e, v);
        if (solve_periodic(e, u, v, two_pi, x, from, to, list, count, level) != TW_OK) return TW_ERROR;
        return sign == 0 ? TW_OK : solve_periodic(e, u, other, two_pi, x, from, to, list, count, level);
    }
    case FUNCTION_TAN:
        return solve_periodic(e, u, expr_call1(e, FUNCTION_ATAN, k), pi, x, from, to, list, count, level);
    default: *solved = false; return TW_OK;
    }
}

/* f with the symbol G in place of g; x stands in sums, products and powers above g only. */
static expr *with_symbol(tw_engine *e, expr *f, expr *x, expr *g, expr *G)
{
    if (f == g) return G;
    if (!f || !expr_has(f, x)) return f;
    if (f->kind == EXPR_POWER) return expr_pow(e, with_symbol(e, f->args[0], x, g, G), f->args[1]);
    expr *made = expr_int(e, f->kind == EXPR_SUM ? 0 : 1);
    for (uint32_t k = 0; k < f->count; k++) {
        expr *part = with_symbol(e, f->args[k], x, g, G);
        made = f->kind == EXPR_SUM ? expr_add(e, made, part) : expr_mul(e, made, part);
    }
    return made;
}

/* f as a polynomial in one function of x. */
static tw_status zeros_through(tw_engine *e, expr *f, expr *g, expr *x, expr *from, expr *to, expr ***list,
                               size_t *count, int level, bool *solved)
{
    expr *G = expr_fresh(e, "g"), **c = NULL, **values = NULL;
    expr *in_g;
    slong degree;
    size_t value_count = 0;
    *solved = false;
    in_g = with_symbol(e, f, x, g, G); /* every place where x stands is inside g */
    if (!in_g || expr_has(in_g, x) || expr_polynomial(e, in_g, G, DEGREE_MOST, &c, &degree) != TW_OK)
        return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    tw_status status = degree > 0 ? polynomial_zeros(e, c, degree, &values, &value_count, solved) : TW_OK;
    free(c);
    for (size_t k = 0; k < value_count && status == TW_OK && *solved; k++)
        status = solve_function(e, g, values[k], x, from, to, list, count, level, solved);
    free(values);
    return status;
}

/* ---- factors ---- */

static tw_status factor_zeros(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***list, size_t *count,
                              int level)
{
    expr **c, *g = NULL;
    slong degree;
    bool solved = false;
    tw_status status = TW_OK;
    if (!expr_has(f, x) || expr_is_call(f, FUNCTION_EXP)) return TW_OK;
    size_t before = *count;
    if (expr_polynomial(e, f, x, DEGREE_MOST, &c, &degree) == TW_OK) {
        status = degree > 0 ? polynomial_zeros(e, c, degree, list, count, &solved) : TW_OK;
        free(c);
        if (status == TW_OK && solved) return TW_OK;
    }
    if (status != TW_OK || e->error.kind != ERROR_NONE) return TW_ERROR;
    if (no_zero(e, f, x, from, to)) return TW_OK;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (level < NESTED_MOST && only_through(f, x, &g) && g) {
        status = zeros_through(e, f, g, x, from, to, list, count, level, &solved);
        if (status == TW_OK && solved) return TW_OK;
        if (status != TW_OK && e->error.kind != ERROR_UNDECIDED) return TW_ERROR;
        engine_forgive(e);
        *count = before;
    }
    expr **symbols;
    size_t others = expr_symbols(f, &symbols);
    free(symbols);
    if (others > 1) return refuse_zeros(e, f, x);
    return zeros_by_balls(e, f, x, from, to, list, count);
}

/* The factors of numerator and denominator as expressions. */
static tw_status list_factors(tw_engine *e, expr *f, expr ***factors, size_t *count)
{
    for (slong room = 8; room <= 128; room *= 2) {
        field bed;
        element v;
        field_init(&bed, e, room);
        element_init(&bed, &v);
        tw_status s = field_from_expr(&bed, &v, f);
        bool wider = s != TW_OK && e->error.kind == ERROR_NONE && bed.full;
        for (int side = 0; side < 2 && s == TW_OK; side++) {
            expr **some = NULL;
            size_t n = 0;
            if (!fmpz_mpoly_q_is_zero(&v, bed.ctx)) s = field_numerator_factors(&bed, &v, &some, &n);
            for (size_t k = 0; k < n && s == TW_OK; k++) expr_list_add(factors, count, some[k]);
            free(some);
            if (side == 0 && s == TW_OK && !fmpz_mpoly_q_is_zero(&v, bed.ctx)) fmpz_mpoly_q_inv(&v, &v, bed.ctx);
        }
        element_clear(&bed, &v);
        field_clear(&bed);
        if (!wider) return s == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    }
    return engine_fail(e, ERROR_UNDECIDED, "the exponent's slope holds too many different functions");
}

/* Places where an argument of a logarithm or a fractional power vanishes: the function may be singular there. */
static void singular_parts(expr *f, expr *x, expr ***list, size_t *count)
{
    if (!expr_has(f, x)) return;
    bool fractional =
        f->kind == EXPR_POWER && (!expr_is_number(f->args[1]) || !fmpz_is_one(fmpq_denref(expr_number(f->args[1]))));
    if (fractional || expr_is_call(f, FUNCTION_LOG)) expr_list_add(list, count, f->args[0]);
    for (uint32_t k = 0; k < f->count; k++) singular_parts(f->args[k], x, list, count);
}

static tw_status zeros_nested(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***list, size_t *count,
                              int level)
{
    expr **factors = NULL, **parts = NULL;
    size_t n = 0, m = 0;
    tw_status status = list_factors(e, f, &factors, &n);
    for (size_t k = 0; k < n && status == TW_OK; k++)
        status = budget_ok(e) ? factor_zeros(e, factors[k], x, from, to, list, count, level) : TW_ERROR;
    free(factors);
    if (status == TW_OK) singular_parts(f, x, &parts, &m);
    for (size_t k = 0; k < m && status == TW_OK && level < NESTED_MOST; k++)
        status = zeros_nested(e, parts[k], x, from, to, list, count, NESTED_MOST);
    free(parts);
    return status;
}

tw_status zeros_between(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***zeros, size_t *count)
{
    expr **all = NULL;
    size_t n = 0;
    *zeros = NULL;
    *count = 0;
    tw_status status = zeros_nested(e, f, x, from, to, &all, &n, 0);
    for (size_t k = 0; k < n && status == TW_OK; k++) {
        if (!all[k]) {
            status = TW_ERROR;
            break;
        }
        int low = places_compare(e, from, all[k]), high = places_compare(e, all[k], to);
        if (e->error.kind != ERROR_NONE)
            status = TW_ERROR;
        else if (low >= 0 && low != 2)
            continue;
        else if (high >= 0 && high != 2)
            continue;
        else if (low == 2 || high == 2) {
            char *words = expr_text(e, all[k]);
            status = engine_fail(e, ERROR_UNDECIDED,
                                 "the facts do not say where %s = %s lies on the path: declare it with `given`",
                                 x->is.name, words ? words : "");
            free(words);
        } else {
            bool there = false;
            for (size_t j = 0; j < *count && !there; j++) there = places_compare(e, (*zeros)[j], all[k]) == 0;
            if (!there) expr_list_add(zeros, count, all[k]);
        }
    }
    free(all);
    if (status != TW_OK) {
        free(*zeros);
        *zeros = NULL;
        *count = 0;
    }
    return status;
}
