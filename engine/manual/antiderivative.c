/* Antiderivatives in closed form, definite integrals of the usual kernels, and inverses of changes of variable. The one
 * idea: candidates are guessed by form and kept only when differentiating them proves them, so the guesses may be bold.
 * Knows nothing of the form or of moves. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/values.h"
#include "engine/manual/work.h"

typedef struct hunt {
    tw_engine *e;
    expr *x;
    bool positive;
    int depth;
} hunt;

enum { HUNT_DEPTH = 40 };

static expr *search(hunt *h, expr *f);

/* The constant that c, seen to be free of x by its derivative, is; NULL when it does depend on x. */
static expr *constant_value(hunt *h, expr *c)
{
    if (!c || !expr_has(c, h->x)) return c;
    c = tidy(h->e, c, h->x, h->positive);
    if (!c || !expr_has(c, h->x)) return c;
    expr *slope = expr_derivative(h->e, c, h->x);
    if (!slope || !is_identically_zero(h->e, slope, h->positive ? h->x : NULL)) return forgive(h->e) ? NULL : NULL;
    expr *there = expr_substitute(h->e, c, h->x, expr_int(h->e, 1));
    return there || !forgive(h->e) ? there : NULL;
}

/* ---- int H(g) dg for a factor H ---- */

static expr *integral_of_power(hunt *h, expr *g, expr *r)
{
    tw_engine *e = h->e;
    expr *next = expr_add(e, r, expr_int(e, 1));
    if (next && !expr_is_zero(next)) return expr_div(e, expr_pow(e, g, next), next);
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    expr *from = h->positive ? expr_int(e, 0) : expr_neg(e, inf);
    int sign = sign_on(e, g, h->x, from, inf);
    return expr_call1(e, FUNCTION_LOG, sign < 0 ? expr_neg(e, g) : g);
}

static expr *integral_of_call(hunt *h, function_id F, expr *g)
{
    tw_engine *e = h->e;
    expr *one = expr_int(e, 1), *gg = expr_mul(e, g, g);
    switch (F) {
    case FUNCTION_EXP: return expr_call1(e, F, g);
    case FUNCTION_SIN: return expr_neg(e, expr_call1(e, FUNCTION_COS, g));
    case FUNCTION_COS: return expr_call1(e, FUNCTION_SIN, g);
    case FUNCTION_SINH: return expr_call1(e, FUNCTION_COSH, g);
    case FUNCTION_COSH: return expr_call1(e, FUNCTION_SINH, g);
    case FUNCTION_TANH: return expr_call1(e, FUNCTION_LOG, expr_call1(e, FUNCTION_COSH, g));
    case FUNCTION_LOG: return expr_sub(e, expr_mul(e, g, expr_call1(e, FUNCTION_LOG, g)), g);
    case FUNCTION_ATAN:
        return expr_sub(e, expr_mul(e, g, expr_call1(e, F, g)),
                        expr_mul(e, expr_frac(e, 1, 2), expr_call1(e, FUNCTION_LOG, expr_add(e, one, gg))));
    case FUNCTION_ERFC:
        return expr_sub(e, expr_mul(e, g, expr_call1(e, F, g)),
                        expr_div(e, expr_call1(e, FUNCTION_EXP, expr_neg(e, gg)),
                                 expr_sqrt(e, expr_constant_of(e, CONSTANT_PI))));
    case FUNCTION_ERF:
        return expr_add(e, expr_mul(e, g, expr_call1(e, F, g)),
                        expr_div(e, expr_call1(e, FUNCTION_EXP, expr_neg(e, gg)),
                                 expr_sqrt(e, expr_constant_of(e, CONSTANT_PI))));
    default: return NULL;
    }
}

/* f = c * g' * H(g) with H(g) = factor: c * int H. */
static expr *by_inner(hunt *h, expr *f, expr *factor, expr *g, expr *integral)
{
    if (!integral || !g) return NULL;
    expr *slope = expr_derivative(h->e, g, h->x);
    if (!slope || expr_is_zero(slope)) return NULL;
    expr *c = constant_value(h, expr_div(h->e, f, expr_mul(h->e, factor, slope)));
    return c ? expr_mul(h->e, c, integral) : NULL;
}

static expr *by_one_factor(hunt *h, expr *f, expr *factor)
{
    if (!expr_has(factor, h->x)) return NULL;
    expr *base, *r;
    expr_as_power(h->e, factor, &base, &r);
    expr *found = NULL;
    if (!expr_has(r, h->x)) found = by_inner(h, f, factor, base, integral_of_power(h, base, r));
    if (!found && forgive(h->e) && factor->kind == EXPR_CALL && factor->count == 1)
        found = by_inner(h, f, factor, factor->args[0], integral_of_call(h, factor->is.function, factor->args[0]));
    if (!found) forgive(h->e);
    return found;
}

/* ---- special forms ---- */

/* u = a*x + b */
static bool is_linear(hunt *h, expr *u, expr **a, expr **b)
{
    expr **c;
    slong degree;
    if (expr_polynomial(h->e, u, h->x, 1, &c, &degree) != TW_OK) return forgive(h->e) && false;
    bool good = degree == 1;
    if (good) {
        *b = c[0];
        *a = c[1];
    }
    free(c);
    return good;
}

/* exp(u) cos(v) and exp(u) sin(v), u and v linear (DLMF 4.26.8, 4.26.9 in their exponential form). */
static expr *by_damped_wave(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *u = NULL, *wave = NULL, *rest = expr_int(e, 1), *a, *b, *c, *d;
    for (size_t k = 0; k < count; k++) {
        if (!u && expr_is_call(factors[k], FUNCTION_EXP)) u = factors[k];
        else if (!wave && (expr_is_call(factors[k], FUNCTION_SIN) || expr_is_call(factors[k], FUNCTION_COS)))
            wave = factors[k];
        else rest = expr_mul(e, rest, factors[k]);
    }
    if (!u || !wave || !rest || expr_has(rest, h->x) || !is_linear(h, u->args[0], &a, &b) ||
        !is_linear(h, wave->args[0], &c, &d))
        return NULL;
    expr *s = expr_call1(e, FUNCTION_SIN, wave->args[0]), *k = expr_call1(e, FUNCTION_COS, wave->args[0]);
    expr *sum = expr_is_call(wave, FUNCTION_COS) ? expr_add(e, expr_mul(e, a, k), expr_mul(e, c, s))
                                                 : expr_sub(e, expr_mul(e, a, s), expr_mul(e, c, k));
    return expr_div(e, expr_mul(e, rest, expr_mul(e, u, sum)), expr_add(e, expr_mul(e, a, a), expr_mul(e, c, c)));
}

/* exp(-a x^2 + b x + c) with a > 0 (DLMF 7.7.6). */
static expr *by_gauss(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *kernel = NULL, *rest = expr_int(e, 1), **c;
    slong degree;
    for (size_t k = 0; k < count; k++)
        if (!kernel && expr_is_call(factors[k], FUNCTION_EXP)) kernel = factors[k];
        else rest = expr_mul(e, rest, factors[k]);
    if (!kernel || !rest || expr_has(rest, h->x) ||
        expr_polynomial(e, kernel->args[0], h->x, 2, &c, &degree) != TW_OK)
        return NULL;
    expr *made = NULL;
    if (degree == 2 && decide_sign(e, c[2]) == -1) {
        expr *a = expr_neg(e, c[2]), *root = expr_sqrt(e, a), *half = expr_frac(e, 1, 2);
        expr *place = expr_sub(e, expr_mul(e, root, h->x), expr_div(e, expr_mul(e, half, c[1]), root));
        expr *level = expr_add(e, c[0], expr_div(e, expr_mul(e, c[1], c[1]), expr_mul(e, expr_int(e, 4), a)));
        made = expr_mul(e, expr_mul(e, rest, half), expr_div(e, expr_sqrt(e, expr_constant_of(e, CONSTANT_PI)), root));
        made = expr_mul(e, expr_mul(e, made, expr_call1(e, FUNCTION_EXP, level)), expr_call1(e, FUNCTION_ERF, place));
    }
    free(c);
    return made;
}

/* c/(a2 x^2 + a1 x + a0) and c/sqrt(...) by completing the square (DLMF 4.26.4 ff.). */
static expr *by_quadratic(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *base = NULL, *r = NULL, *rest = expr_int(e, 1), **c, *made = NULL;
    slong degree;
    for (size_t k = 0; k < count; k++)
        if (!base && expr_has(factors[k], h->x)) expr_as_power(e, factors[k], &base, &r);
        else rest = expr_mul(e, rest, factors[k]);
    if (!base || !rest || expr_has(rest, h->x) || expr_polynomial(e, base, h->x, 2, &c, &degree) != TW_OK) return NULL;
    expr *two = expr_int(e, 2);
    expr *slope = degree == 2 ? expr_add(e, expr_mul(e, expr_mul(e, two, c[2]), h->x), c[1]) : NULL;
    expr *disc = degree == 2 ? expr_sub(e, expr_mul(e, expr_mul(e, expr_int(e, 4), c[2]), c[0]), expr_mul(e, c[1], c[1]))
                             : NULL;
    int sign = disc ? decide_sign(e, disc) : 2, lead = disc ? decide_sign(e, c[2]) : 2;
    if (disc && expr_is_int(r, -1) && sign == 1) {
        expr *root = expr_sqrt(e, disc);
        made = expr_mul(e, expr_div(e, two, root), expr_call1(e, FUNCTION_ATAN, expr_div(e, slope, root)));
    } else if (disc && expr_is_number(r) && fmpq_cmp_si(expr_number(r), -1) > 0 &&
               expr_is_zero(expr_add(e, r, expr_frac(e, 1, 2)))) {
        if (lead == 1 && sign == 1)
            made = expr_div(e, expr_call1(e, FUNCTION_ASINH, expr_div(e, slope, expr_sqrt(e, disc))), expr_sqrt(e, c[2]));
        if (lead == -1 && sign == -1)
            made = expr_div(e, expr_call1(e, FUNCTION_ASIN, expr_div(e, expr_neg(e, slope), expr_sqrt(e, expr_neg(e, disc)))),
                            expr_sqrt(e, expr_neg(e, c[2])));
    }
    free(c);
    return made ? expr_mul(e, rest, made) : NULL;
}

/* 1/((x + a)(x + b)...) with linear bases: one step of partial fractions. */
static expr *by_fractions(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *one = NULL, *two = NULL, *a, *b, *c, *d;
    for (size_t k = 0; k < count; k++) {
        expr *base, *r;
        expr_as_power(e, factors[k], &base, &r);
        if (!expr_is_number(r) || fmpq_sgn(expr_number(r)) >= 0 || !fmpz_is_one(fmpq_denref(expr_number(r)))) continue;
        if (!one && is_linear(h, base, &a, &b)) one = base;
        else if (one && !two && is_linear(h, base, &c, &d)) two = base;
    }
    if (!one || !two) return NULL;
    expr *det = expr_sub(e, expr_mul(e, a, d), expr_mul(e, b, c));
    if (!det || expr_is_zero(det)) return NULL;
    /* 1 = (a*two - c*one)/det */
    expr *first = expr_mul(e, expr_div(e, a, det), expr_mul(e, f, two));
    expr *second = expr_mul(e, expr_div(e, expr_neg(e, c), det), expr_mul(e, f, one));
    expr *A = search(h, first), *B = A ? search(h, second) : NULL;
    return A && B ? expr_add(e, A, B) : NULL;
}

/* By parts: a power of x or of a logarithm is differentiated, the rest has an antiderivative. */
static expr *by_parts(hunt *h, expr *f, expr *factor, expr *lowered)
{
    tw_engine *e = h->e;
    expr *rest = tidy(e, expr_div(e, f, factor), h->x, h->positive);
    if (!rest) return NULL;
    expr *G = search(h, rest);
    if (!G) return NULL;
    expr *left = tidy(e, expr_mul(e, lowered, G), h->x, h->positive);
    expr *more = left ? search(h, left) : NULL;
    return more ? expr_sub(e, expr_mul(e, factor, G), more) : NULL;
}

static expr *by_lowering(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    for (int logs = 1; logs >= 0; logs--)
        for (size_t k = 0; k < count; k++) {
            expr *base, *r, *a, *b;
            if (!expr_has(factors[k], h->x)) continue;
            expr_as_power(e, factors[k], &base, &r);
            bool natural = expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r))) && fmpq_sgn(expr_number(r)) > 0 &&
                           fmpq_cmp_si(expr_number(r), 64) <= 0;
            bool is_log = expr_is_call(base, FUNCTION_LOG) || expr_is_call(base, FUNCTION_ATAN) ||
                          expr_is_call(base, FUNCTION_ASINH) || expr_is_call(base, FUNCTION_ERFC) ||
                          expr_is_call(base, FUNCTION_E1);
            if (!natural || (logs ? !is_log : !is_linear(h, base, &a, &b))) continue;
            expr *found = by_parts(h, f, factors[k], expr_derivative(e, factors[k], h->x));
            if (found) return found;
            if (!forgive(e)) return NULL;
        }
    return NULL;
}

static expr *search_term(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    if (!expr_has(f, h->x)) return expr_mul(e, f, h->x);
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    for (size_t k = 0; k < count; k++) {
        expr *found = by_one_factor(h, f, factors[k]);
        if (found) return found;
        if (!forgive(e)) return NULL;
    }
    expr *(*const forms[])(hunt *, expr *) = {by_damped_wave, by_gauss, by_quadratic, by_fractions, by_lowering};
    for (size_t k = 0; k < sizeof forms / sizeof *forms; k++) {
        expr *found = forms[k](h, f);
        if (found) return found;
        if (!forgive(e)) return NULL;
    }
    return NULL;
}

static expr *search(hunt *h, expr *f)
{
    tw_engine *e = h->e;
    if (!f || !budget_ok(e) || h->depth >= HUNT_DEPTH) return NULL;
    h->depth++;
    expr *found = search_term(h, f);
    if (!found && forgive(e)) {
        expr *wide = expr_expand(e, f);
        expr *const *parts;
        size_t count = wide ? expr_terms(&wide, &parts) : 0;
        if (wide && (wide != f || count > 1)) {
            found = expr_int(e, 0);
            for (size_t k = 0; k < count && found; k++) {
                expr *one = count == 1 ? search_term(h, parts[k]) : search(h, parts[k]);
                found = one ? expr_add(e, found, one) : NULL;
            }
        }
    }
    h->depth--;
    return found || forgive(e) ? found : NULL;
}

expr *antiderivative(tw_engine *e, expr *f, expr *x, bool positive)
{
    hunt h = {e, x, positive, 0};
    expr *g = f ? tidy(e, f, x, positive) : NULL;
    expr *F = g ? search(&h, g) : NULL;
    if (!F && g != f && forgive(e)) F = search(&h, f);
    if (!F) return NULL;
    expr *rest = expr_sub(e, expr_derivative(e, F, x), f);
    bool proved = rest && is_identically_zero(e, rest, positive ? x : NULL);
    return forgive(e) && proved ? F : NULL;
}

/* ---- kernels ---- */

/* f = c * x^a * log(x)^k * exp(-b x^p) */
typedef struct kernel_form {
    expr *c, *a, *b;
    fmpq_t p;
    slong logs;
} kernel_form;

static bool read_monomial(tw_engine *e, expr *u, expr *x, expr **c, fmpq_t p)
{
    expr *const *factors;
    size_t count = expr_factors(&u, &factors);
    bool found = false;
    *c = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (!expr_has(factors[k], x)) {
            *c = expr_mul(e, *c, factors[k]);
            continue;
        }
        expr *base, *r;
        expr_as_power(e, factors[k], &base, &r);
        if (found || base != x || !expr_is_number(r)) return false;
        fmpq_set(p, expr_number(r));
        found = true;
    }
    return found && *c;
}

static bool read_kernel(tw_engine *e, expr *f, expr *x, kernel_form *out)
{
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    out->c = expr_int(e, 1);
    out->a = expr_int(e, 0);
    out->b = NULL;
    out->logs = 0;
    for (size_t k = 0; k < count; k++) {
        expr *base, *r;
        if (!expr_has(factors[k], x)) {
            out->c = expr_mul(e, out->c, factors[k]);
            continue;
        }
        expr_as_power(e, factors[k], &base, &r);
        if (base == x && !expr_has(r, x)) out->a = expr_add(e, out->a, r);
        else if (expr_is_call(base, FUNCTION_LOG) && base->args[0] == x && expr_is_number(r) &&
                 fmpz_is_one(fmpq_denref(expr_number(r))) && fmpq_sgn(expr_number(r)) > 0 &&
                 fmpq_cmp_si(expr_number(r), 12) <= 0)
            out->logs += fmpz_get_si(fmpq_numref(expr_number(r)));
        else if (expr_is_call(factors[k], FUNCTION_EXP) && !out->b &&
                 read_monomial(e, factors[k]->args[0], x, &out->b, out->p))
            out->b = expr_neg(e, out->b);
        else return false;
    }
    return out->b && out->c && out->a;
}

/* int_0^inf x^a exp(-b x^p) dx = Gamma((a + 1)/p) / (p b^((a + 1)/p)) for p > 0, a > -1, re b > 0 (DLMF 5.9.1); with
 * logarithms its derivatives in a. */
static expr *gamma_integral(work *w, const kernel_form *k)
{
    tw_engine *e = w->e;
    if (fmpq_sgn(k->p) <= 0) return NULL;
    expr *a = expr_fresh(e, "a"), *p = expr_fmpq(e, k->p), *one = expr_int(e, 1);
    expr *z = expr_div(e, expr_add(e, a, one), p);
    expr *value = expr_div(e, expr_call1(e, FUNCTION_GAMMA, z), expr_mul(e, p, expr_pow(e, k->b, z)));
    for (slong n = 0; n < k->logs; n++) value = expr_derivative(e, value, a);
    value = value ? expr_substitute(e, value, a, k->a) : NULL;
    return value ? expr_mul(e, k->c, value) : NULL;
}

/* a > -1 and b > 0 are decided, and become conditions. */
static bool kernel_holds(work *w, const kernel_form *k)
{
    tw_engine *e = w->e;
    expr *zero = expr_int(e, 0), *minus = expr_int(e, -1);
    condition_list needs;
    conditions_init(&needs);
    expr *re = k->b;
    if (!value_is_real(e, k->b)) {
        expr *const *parts;
        expr *wide = expr_expand(e, k->b);
        size_t count = wide ? expr_terms(&wide, &parts) : 0;
        re = zero;
        for (size_t n = 0; n < count && re; n++) {
            expr *over = expr_div(e, parts[n], expr_constant_of(e, CONSTANT_I));
            if (value_is_real(e, parts[n])) re = expr_add(e, re, parts[n]);
            else if (!over || !value_is_real(e, over)) re = NULL;
        }
    }
    bool good = re && conditions_require(e, &needs, expr_relation_of(e, RELATION_LESS, zero, re)) == TW_OK;
    if (good && !expr_is_number(k->a))
        good = conditions_require(e, &needs, expr_relation_of(e, RELATION_LESS, minus, k->a)) == TW_OK;
    else if (good) good = fmpq_cmp_si(expr_number(k->a), -1) > 0;
    for (size_t n = 0; n < needs.count; n++)
        if (needs.list[n].label == CONDITION_OPEN && needs.list[n].relation && expr_is_closed_value(needs.list[n].relation))
            good = false;
    if (good) conditions_append(&w->needs, &needs);
    conditions_clear(&needs);
    return forgive(e) && good;
}

static expr *over_half_line(work *w, expr *f, expr *x)
{
    kernel_form k;
    fmpq_init(k.p);
    expr *g = tidy(w->e, f, x, true);
    expr *made = NULL;
    if (g && read_kernel(w->e, g, x, &k) && kernel_holds(w, &k)) made = gamma_integral(w, &k);
    fmpq_clear(k.p);
    return made || forgive(w->e) ? made : NULL;
}

/* f = c * x^a * (q0 + q1 x)^b */
typedef struct beta_form {
    expr *c, *a, *b, *q0, *q1;
} beta_form;

static bool read_beta(tw_engine *e, expr *f, expr *x, beta_form *out)
{
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    *out = (beta_form){expr_int(e, 1), expr_int(e, 0), NULL, NULL, NULL};
    for (size_t k = 0; k < count; k++) {
        expr *base, *r, **q;
        slong degree;
        if (!expr_has(factors[k], x)) {
            out->c = expr_mul(e, out->c, factors[k]);
            continue;
        }
        expr_as_power(e, factors[k], &base, &r);
        if (expr_has(r, x)) return false;
        if (base == x) {
            out->a = expr_add(e, out->a, r);
            continue;
        }
        if (out->b || expr_polynomial(e, base, x, 1, &q, &degree) != TW_OK) return false;
        out->b = r;
        out->q0 = q[0];
        out->q1 = degree == 1 ? q[1] : NULL;
        free(q);
        if (!out->q1) return false;
    }
    return out->b && out->a && out->c;
}

/* int_0^1 x^a (1 - x)^b dx = Beta(a + 1, b + 1) (DLMF 5.12.1); int_0^inf x^a (q0 + q1 x)^b dx =
 * q0^(a + b + 1) q1^(-a - 1) Beta(a + 1, -a - b - 1) (DLMF 5.12.3 by x = q0 t/q1). */
static expr *beta_integral(work *w, expr *f, expr *x, bool infinite)
{
    tw_engine *e = w->e;
    beta_form k;
    expr *g = tidy(e, f, x, true), *one = expr_int(e, 1);
    if (!g || !read_beta(e, g, x, &k) || decide_sign(e, k.q0) != 1) return NULL;
    expr *A = expr_add(e, k.a, one), *B, *scale;
    if (infinite) {
        if (decide_sign(e, k.q1) != 1) return NULL;
        B = expr_neg(e, expr_add(e, k.b, A));
        scale = expr_mul(e, expr_pow(e, k.q0, expr_add(e, k.b, A)), expr_pow(e, k.q1, expr_neg(e, A)));
    } else {
        expr *sum = expr_add(e, k.q0, k.q1);
        if (!sum || !expr_is_zero(sum)) return NULL;
        B = expr_add(e, k.b, one);
        scale = expr_pow(e, k.q0, k.b);
    }
    if (!scale || !A || !B || decide_sign(e, A) != 1 || decide_sign(e, B) != 1) return NULL;
    expr *both[] = {A, B};
    return expr_mul(e, k.c, expr_mul(e, scale, expr_call(e, FUNCTION_BETA, both, 2)));
}

static expr *by_antiderivative(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    expr *F = antiderivative(e, f, x, range_is_positive(e, from));
    expr *low, *high;
    if (!F || limit_at(e, &low, F, x, from, to, false) != TW_OK || limit_at(e, &high, F, x, from, to, true) != TW_OK)
        return forgive(e) ? NULL : NULL;
    if (low->infinite || high->infinite) return NULL;
    /* F may jump where it is continued through a branch: it is used only where it is smooth inside */
    return is_smooth_inside(e, F, x, from, to) ? expr_sub(e, high, low) : NULL;
}

expr *definite_integral(work *w, expr *f, expr *x, expr *from, expr *to)
{
    tw_engine *e = w->e;
    expr *made = NULL, *zero = expr_int(e, 0);
    if (expr_is_zero(from) && expr_is_inf(to)) {
        made = over_half_line(w, f, x);
        if (!made && forgive(e)) made = beta_integral(w, f, x, true);
    } else if (expr_is_minus_inf(from) && expr_is_inf(to)) {
        expr *right = definite_integral(w, f, x, zero, to);
        expr *left = right ? definite_integral(w, expr_substitute(e, f, x, expr_neg(e, x)), x, zero, to) : NULL;
        return right && left ? expr_add(e, left, right) : NULL;
    } else if (expr_is_zero(from) && expr_is_one(to)) {
        made = beta_integral(w, f, x, false);
    }
    if (!made && forgive(e)) made = by_antiderivative(e, f, x, from, to);
    return made || forgive(e) ? made : NULL;
}

expr *inner_integral(work *w, expr *f, expr *x, expr *from, expr *to, expr *other, expr *low, expr *high)
{
    tw_engine *e = w->e;
    condition_list kept = w->needs;
    struct facts *facts = facts_copy(e);
    conditions_init(&w->needs);
    if (!expr_is_minus_inf(low)) facts_add(e, expr_relation_of(e, RELATION_LESS, low, other), CONDITION_GIVEN);
    if (forgive(e) && !expr_is_inf(high)) facts_add(e, expr_relation_of(e, RELATION_LESS, other, high), CONDITION_GIVEN);
    expr *made = forgive(e) ? definite_integral(w, f, x, from, to) : NULL;
    if (made && !conditions_all_sure(&w->needs)) made = NULL;
    facts_restore(e, facts);
    conditions_clear(&w->needs);
    w->needs = kept;
    return forgive(e) ? made : NULL;
}

/* ---- inverses ---- */

/* Solves y = phi(t) by peeling off what stands around the only place where t is. */
static expr *peel(tw_engine *e, expr *phi, expr *t, expr *y, int depth)
{
    if (!phi || !y || depth > 40) return NULL;
    if (phi == t) return y;
    expr *const *parts, *own = NULL, *rest = NULL;
    size_t count = phi->kind == EXPR_SUM ? expr_terms(&phi, &parts) : expr_factors(&phi, &parts);
    if (phi->kind == EXPR_SUM || phi->kind == EXPR_PRODUCT) {
        bool sum = phi->kind == EXPR_SUM;
        rest = expr_int(e, sum ? 0 : 1);
        for (size_t k = 0; k < count; k++) {
            if (expr_has(parts[k], t)) {
                if (own) return NULL;
                own = parts[k];
            } else rest = sum ? expr_add(e, rest, parts[k]) : expr_mul(e, rest, parts[k]);
        }
        return peel(e, own, t, sum ? expr_sub(e, y, rest) : expr_div(e, y, rest), depth + 1);
    }
    if (phi->kind == EXPR_POWER && !expr_has(phi->args[1], t))
        return peel(e, phi->args[0], t, expr_pow(e, y, expr_pow(e, phi->args[1], expr_int(e, -1))), depth + 1);
    if (phi->kind != EXPR_CALL || phi->count != 1) return NULL;
    static const struct {
        function_id function, inverse;
    } pairs[] = {
        {FUNCTION_EXP, FUNCTION_LOG},    {FUNCTION_LOG, FUNCTION_EXP},   {FUNCTION_SINH, FUNCTION_ASINH},
        {FUNCTION_ASINH, FUNCTION_SINH}, {FUNCTION_COSH, FUNCTION_ACOSH}, {FUNCTION_ACOSH, FUNCTION_COSH},
        {FUNCTION_TANH, FUNCTION_ATANH}, {FUNCTION_ATANH, FUNCTION_TANH}, {FUNCTION_TAN, FUNCTION_ATAN},
        {FUNCTION_ATAN, FUNCTION_TAN},   {FUNCTION_SIN, FUNCTION_ASIN},   {FUNCTION_ASIN, FUNCTION_SIN},
        {FUNCTION_COS, FUNCTION_ACOS},   {FUNCTION_ACOS, FUNCTION_COS},
    };
    for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++)
        if (pairs[k].function == phi->is.function)
            return peel(e, phi->args[0], t, expr_call1(e, pairs[k].inverse, y), depth + 1);
    return NULL;
}

/* (a t + b)/(c t + d) = y, also with a + b/(c t + d): t = (d y - b)/(a - c y). */
static expr *solve_moebius(tw_engine *e, expr *phi, expr *t, expr *y)
{
    expr *wide = expr_expand(e, phi), *bottom = NULL, **p, **q;
    slong n, m;
    if (!wide) return NULL;
    for (int k = 0; k < 2 && !bottom; k++) { /* the base of a power -1 somewhere */
        expr *from = k ? wide : phi;
        expr *const *terms;
        size_t count = expr_terms(&from, &terms);
        for (size_t j = 0; j < count && !bottom; j++) {
            expr *const *factors;
            size_t fs = expr_factors(&terms[j], &factors);
            for (size_t i = 0; i < fs && !bottom; i++)
                if (factors[i]->kind == EXPR_POWER && expr_is_int(factors[i]->args[1], -1) && expr_has(factors[i], t))
                    bottom = factors[i]->args[0];
        }
    }
    if (!bottom || expr_polynomial(e, bottom, t, 1, &q, &m) != TW_OK) return NULL;
    expr *made = NULL, *top = NULL;
    if (m == 1) {
        expr *const *terms;
        size_t count = expr_terms(&wide, &terms);
        top = expr_int(e, 0);
        for (size_t j = 0; j < count; j++) top = expr_add(e, top, expr_expand(e, expr_mul(e, terms[j], bottom)));
    }
    if (top && expr_polynomial(e, top, t, 1, &p, &n) == TW_OK) {
        expr *a = n == 1 ? p[1] : expr_int(e, 0);
        made = expr_div(e, expr_sub(e, expr_mul(e, q[0], y), p[0]), expr_sub(e, a, expr_mul(e, q[1], y)));
        free(p);
    }
    free(q);
    return made;
}

expr *solve_inverse(tw_engine *e, expr *phi, expr *t, expr *x)
{
    expr *made = peel(e, phi, t, x, 0);
    if (!made && forgive(e)) made = solve_moebius(e, phi, t, x);
    return made || forgive(e) ? made : NULL;
}
