/* Does int_0^end q exp(-S p) dx converge for large S, and is q free of poles and jumps on the way? The one idea: three
 * places are looked at by themselves: the end 0 and a finite far end through the exponents of the series there,
 * infinity through the behaviour of q against that of p, and the open path through the bases of powers, logarithms and
 * quotients in q, which must keep away from 0. What is not proved becomes an open condition; what is refuted is an
 * error with its reason. */
#include "engine/method/convergence.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/ball/growth.h"
#include "engine/method/scale.h"

/* ---- signs ---- */

static bool symbol_at_least_zero(tw_engine *e, expr *symbol, bool *strict)
{
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    int ends = facts_interval(e, symbol, low, high);
    bool good = (ends & 1) && fmpq_sgn(low) >= 0;
    *strict = good && (fmpq_sgn(low) > 0 || (ends & 4));
    fmpq_clear(low);
    fmpq_clear(high);
    return good;
}

static int plain_sign(tw_engine *e, expr *f, expr *x);

static bool is_real_symbolic(tw_engine *e, expr *a);

/* What a term with a number in front is at least, beyond what its sign says: 3*exp(u) > 3 for u > 0, -2*cos(u) >= -2
 * for real u. */
static bool term_bound(tw_engine *e, expr *part, expr *x, fmpq_t low, bool *strict)
{
    expr *rest;
    expr_as_coefficient(e, part, low, &rest);
    *strict = false;
    if (part->kind == EXPR_NUMBER) return true;
    if (!rest || rest->kind != EXPR_CALL) return false;
    function_id F = rest->is.function;
    if ((F == FUNCTION_SIN || F == FUNCTION_COS) && is_real_symbolic(e, rest->args[0])) {
        fmpq_abs(low, low);
        fmpq_neg(low, low);
        return true;
    }
    if (fmpq_sgn(low) < 0 && F == FUNCTION_EXP) /* -2*exp(-u) > -2 */
        *strict = plain_sign(e, expr_neg(e, rest->args[0]), x) == 1;
    else
        *strict =
            (F == FUNCTION_EXP || F == FUNCTION_COSH) && fmpq_sgn(low) > 0 && plain_sign(e, rest->args[0], x) == 1;
    return *strict;
}

/* 1: positive; 0: at least zero; -1: not seen. */
static int plain_sign_of_sum(tw_engine *e, expr *f, expr *x)
{
    int sign = 0;
    fmpq_t low, one;
    fmpq_init(low);
    fmpq_init(one);
    for (uint32_t k = 0; k < f->count && sign >= 0; k++) {
        bool strict;
        if (term_bound(e, f->args[k], x, one, &strict)) {
            fmpq_add(low, low, one);
            if (strict) sign = 1;
            continue;
        }
        int part = plain_sign(e, f->args[k], x);
        if (part != 0) sign = part;
    }
    if (sign >= 0 && fmpq_sgn(low) != 0) sign = fmpq_sgn(low);
    fmpq_clear(low);
    fmpq_clear(one);
    return sign;
}

static int plain_sign_of_product(tw_engine *e, expr *f, expr *x)
{
    int sign = 1;
    for (uint32_t k = 0; k < f->count; k++) {
        int part = plain_sign(e, f->args[k], x);
        if (part < 0) return -1;
        if (part < sign) sign = part;
    }
    return sign;
}

static bool is_real_symbolic(tw_engine *e, expr *a)
{
    if (a->kind == EXPR_SYMBOL) return a->fresh || !facts_is_complex(e, a);
    if (a->kind == EXPR_CONSTANT) return a->is.constant == CONSTANT_PI || a->is.constant == CONSTANT_EULER;
    if (a->kind == EXPR_NUMBER) return true;
    if (a->kind == EXPR_POWER)
        return is_real_symbolic(e, a->args[0]) && expr_is_number(a->args[1]) &&
               fmpz_is_one(fmpq_denref(expr_number(a->args[1])));
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT) return false;
    for (uint32_t k = 0; k < a->count; k++)
        if (!is_real_symbolic(e, a->args[k])) return false;
    return true;
}

static int plain_sign_of_power(tw_engine *e, expr *f, expr *x)
{
    expr *r = f->args[1];
    int base = plain_sign(e, f->args[0], x);
    if (base > 0) return is_real_symbolic(e, r) ? 1 : -1;
    if (!expr_is_number(r) || fmpq_sgn(expr_number(r)) < 0) return -1;
    bool even = fmpz_is_one(fmpq_denref(expr_number(r))) && fmpz_is_even(fmpq_numref(expr_number(r)));
    if (base == 0) return 0;
    return even && is_real_symbolic(e, f->args[0]) ? 0 : -1;
}

static int plain_sign(tw_engine *e, expr *f, expr *x)
{
    bool strict;
    switch (f->kind) {
    case EXPR_NUMBER: return fmpq_sgn(expr_number(f)) > 0 ? 1 : fmpq_is_zero(expr_number(f)) ? 0 : -1;
    case EXPR_CONSTANT: return f->is.constant == CONSTANT_PI || f->is.constant == CONSTANT_EULER ? 1 : -1;
    case EXPR_SYMBOL:
        if (f == x) return 1;
        return symbol_at_least_zero(e, f, &strict) ? strict : -1;
    case EXPR_SUM: return plain_sign_of_sum(e, f, x);
    case EXPR_PRODUCT: return plain_sign_of_product(e, f, x);
    case EXPR_POWER: return plain_sign_of_power(e, f, x);
    case EXPR_CALL:
        if (f->is.function == FUNCTION_EXP || f->is.function == FUNCTION_COSH)
            return is_real_symbolic(e, f->args[0]) ? 1 : -1;
        if (f->is.function == FUNCTION_SINH || f->is.function == FUNCTION_TANH || f->is.function == FUNCTION_ATAN ||
            f->is.function == FUNCTION_ASINH)
            return plain_sign(e, f->args[0], x);
        if (f->is.function == FUNCTION_LOG && f->args[0]->kind == EXPR_SUM)
            return plain_sign(e, expr_sub(e, f->args[0], expr_int(e, 1)), x);
        return -1;
    default: return -1;
    }
}

bool plainly_positive(tw_engine *e, expr *f, expr *x)
{
    return f && plain_sign(e, f, x) == 1;
}

/* a + b x on (0, end): at least 0 at both ends, and at one of them more. */
static bool positive_between_ends(tw_engine *e, expr *f, expr *x, expr *end)
{
    expr **a;
    slong degree;
    if (expr_polynomial(e, f, x, 1, &a, &degree) != TW_OK) return false;
    int left = decide_sign(e, a[0]),
        right = decide_sign(e, degree == 1 ? expr_add(e, a[0], expr_mul(e, a[1], end)) : a[0]);
    free(a);
    return (left == 0 || left == 1) && (right == 0 || right == 1) && left + right > 0;
}

/* All factors of a product, the base of a power. */
static bool positive_by_parts(tw_engine *e, expr *f, expr *x, expr *end)
{
    if (f->kind == EXPR_POWER)
        return is_real_symbolic(e, f->args[1]) && positive_on_branch(e, f->args[0], x, end) == ANSWER_YES;
    if (f->kind != EXPR_PRODUCT) return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (positive_on_branch(e, f->args[k], x, end) != ANSWER_YES) return false;
    return true;
}

answer positive_on_branch(tw_engine *e, expr *f, expr *x, expr *end)
{
    if (!f) return ANSWER_UNKNOWN;
    if (!expr_has(f, x)) return decide_sign(e, f) == 1 ? ANSWER_YES : ANSWER_UNKNOWN;
    if (plainly_positive(e, f, x) || (!expr_is_inf(end) && positive_between_ends(e, f, x, end)) ||
        positive_by_parts(e, f, x, end))
        return ANSWER_YES;
    expr *zero = expr_int(e, 0);
    return decide_positive_on(e, f, x, zero, end, false);
}

/* ---- samples ---- */

enum { SAMPLES = 40 };

static int sample_sign(tw_engine *e, expr *f, expr *x, expr *end, slong k)
{
    expr *at = expr_is_inf(end) ? expr_frac(e, k * k, SAMPLES) : expr_mul(e, end, expr_frac(e, k, SAMPLES));
    expr *there = expr_substitute(e, f, x, at);
    acb_t v;
    acb_init(v);
    int seen = 0;
    if (there && ball_value(e, v, there, 64) == TW_OK && acb_is_finite(v) && arb_contains_zero(acb_imagref(v)))
        seen = arb_is_positive(acb_realref(v))   ? SIGN_SEEN_POSITIVE
               : arb_is_negative(acb_realref(v)) ? SIGN_SEEN_NEGATIVE
                                                 : 0;
    acb_clear(v);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNDECIDED) engine_forgive(e);
    return seen ? seen : SIGN_SEEN_NONE;
}

int signs_seen(tw_engine *e, expr *f, expr *x, expr *end)
{
    expr *whole = expr_is_inf(end) ? f : expr_mul(e, f, end);
    expr **symbols;
    size_t count = whole ? expr_symbols(whole, &symbols) : 0;
    if (!whole) return SIGN_SEEN_NONE;
    free(symbols);
    if (count != 1) return SIGN_SEEN_NONE;
    int seen = 0;
    for (slong k = 1; k < SAMPLES && budget_ok(e); k++) seen |= sample_sign(e, f, x, end, k);
    return seen;
}

/* ---- the open path ---- */

typedef struct path {
    tw_engine *e;
    reading *r;
    const branch *b;
    bool unsure; /* an open condition was added */
} path;

/* The variable as the user knows it, at the branch's point `x`: for words only. */
static void add_open(path *p, const char *format, expr *u)
{
    char *words = expr_text(p->e, u);
    if (!words) return;
    text t;
    text_init(&t);
    text_addf(&t, format, words);
    conditions_add(&p->r->conditions, t.bytes, NULL, CONDITION_OPEN);
    text_clear(&t);
    free(words);
    p->unsure = true;
}

/* Functions that are analytic at every real argument. */
static bool is_entire_on_reals(function_id F)
{
    switch (F) {
    case FUNCTION_EXP:
    case FUNCTION_SIN:
    case FUNCTION_COS:
    case FUNCTION_SINH:
    case FUNCTION_COSH:
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ERF:
    case FUNCTION_ERFC:
    case FUNCTION_AI:
    case FUNCTION_BI:
    case FUNCTION_ABS:
    case FUNCTION_MIN:
    case FUNCTION_MAX:
    case FUNCTION_RE:
    case FUNCTION_IM:
    case FUNCTION_CONJ: return true;
    default: return false;
    }
}

/* Continuous at every real x for certain: sums, products, whole powers, functions that are entire on the reals. */
static bool is_continuous(expr *u, expr *x)
{
    if (!expr_has(u, x) || u == x) return true;
    bool power = u->kind == EXPR_POWER && expr_is_number(u->args[1]) &&
                 fmpz_is_one(fmpq_denref(expr_number(u->args[1]))) && fmpq_sgn(expr_number(u->args[1])) > 0;
    bool call = u->kind == EXPR_CALL && is_entire_on_reals(u->is.function);
    if (!power && !call && u->kind != EXPR_SUM && u->kind != EXPR_PRODUCT) return false;
    for (uint32_t k = 0; k < u->count; k++)
        if (!is_continuous(u->args[k], x)) return false;
    return true;
}

/* u takes both signs at samples where balls prove it, so it has a zero between. */
static bool has_zero(path *p, expr *u)
{
    const int both = SIGN_SEEN_POSITIVE | SIGN_SEEN_NEGATIVE;
    return is_continuous(u, p->b->x) && (signs_seen(p->e, u, p->b->x, p->b->end) & both) == both;
}

/* u must not vanish inside the path. */
static tw_status keep_from_zero(path *p, expr *u, bool is_pole)
{
    tw_engine *e = p->e;
    if (u == p->b->x) return TW_OK;
    answer positive = positive_on_branch(e, u, p->b->x, p->b->end);
    if (positive == ANSWER_YES) return TW_OK;
    answer negative = positive_on_branch(e, expr_neg(e, u), p->b->x, p->b->end);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (negative == ANSWER_YES) return TW_OK;
    if (is_pole && has_zero(p, u)) {
        char *words = expr_text(e, u);
        if (words)
            engine_fail(e, ERROR_DIVERGENT,
                        "the integrand has a pole on the path, where %s = 0: the integral does not converge "
                        "(a principal value is not read as an integral)",
                        words);
        free(words);
        return TW_ERROR;
    }
    add_open(p, "%s has no zero inside the path", u);
    return TW_OK;
}

static tw_status path_is_smooth(path *p, expr *f);

static tw_status power_is_smooth(path *p, expr *f)
{
    expr *r = f->args[1];
    if (expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r)))) {
        if (fmpq_sgn(expr_number(r)) > 0) return TW_OK;
        return keep_from_zero(p, f->args[0], true);
    }
    bool strong = expr_is_number(r) && fmpq_cmp_si(expr_number(r), -1) <= 0;
    return keep_from_zero(p, f->args[0], strong);
}

static tw_status call_is_smooth(path *p, expr *f)
{
    expr *last = f->args[f->count - 1];
    if (is_entire_on_reals(f->is.function)) return TW_OK;
    switch (f->is.function) {
    case FUNCTION_TAN: return keep_from_zero(p, expr_call1(p->e, FUNCTION_COS, last), true);
    case FUNCTION_LOG:
    case FUNCTION_LNGAMMA:
    case FUNCTION_GAMMA:
    case FUNCTION_PSI:
    case FUNCTION_E1:
    case FUNCTION_EI:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K:
    case FUNCTION_GAMMA_UPPER:
        if (last == p->b->x || positive_on_branch(p->e, last, p->b->x, p->b->end) == ANSWER_YES) return TW_OK;
        break;
    default: break;
    }
    if (p->e->error.kind != ERROR_NONE) return TW_ERROR;
    add_open(p, "%s is continuous inside the path", f);
    return TW_OK;
}

/* Every part of f that depends on x. */
static tw_status path_is_smooth(path *p, expr *f)
{
    if (!expr_has(f, p->b->x)) return TW_OK;
    for (uint32_t k = 0; k < f->count; k++)
        if (path_is_smooth(p, f->args[k]) != TW_OK) return TW_ERROR;
    switch (f->kind) {
    case EXPR_POWER: return power_is_smooth(p, f);
    case EXPR_CALL: return call_is_smooth(p, f);
    case EXPR_INTEGRAL:
    case EXPR_CONTOUR:
    case EXPR_SUMMATION:
    case EXPR_PIECEWISE:
    case EXPR_ROOT: add_open(p, "%s is continuous inside the path", f); return TW_OK;
    default: return TW_OK;
    }
}

/* ---- the ends ---- */

/* a > -1, said of the parameter itself where a = c*parameter + d: p < 1 rather than -p > -1. */
static tw_status require_above(tw_engine *e, condition_list *conditions, expr *a)
{
    expr *minus = expr_int(e, -1), *low = minus, *high = a;
    expr **symbols, **c;
    slong degree;
    size_t count = expr_symbols(a, &symbols);
    if (count == 1 && expr_polynomial(e, a, symbols[0], 1, &c, &degree) == TW_OK) {
        int sign = degree == 1 ? decide_sign(e, c[1]) : 2;
        expr *bound = sign == 1 || sign == -1 ? expr_div(e, expr_sub(e, minus, c[0]), c[1]) : NULL;
        if (bound) {
            low = sign > 0 ? bound : symbols[0];
            high = sign > 0 ? symbols[0] : bound;
        }
        free(c);
    }
    free(symbols);
    return conditions_require(e, conditions, expr_relation_of(e, RELATION_LESS, low, high));
}

/* a > -1 for the leading exponents of f at x = 0. words: which place, for the error. */
static tw_status end_converges(tw_engine *e, reading *r, expr *f, expr *x, expr *place, bool *sure)
{
    series s;
    series_init(&s);
    tw_status status = series_at_zero(e, &s, f, x, 1, NULL, NULL);
    if (status != TW_OK) {
        series_clear(&s);
        if (e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_UNDECIDED && e->error.kind != ERROR_VALUE)
            return TW_ERROR;
        engine_forgive(e);
        *sure = false;
        return TW_OK;
    }
    for (size_t k = 0; k < s.count && status == TW_OK; k++) {
        expr *a = s.strands[k].exponent;
        if (expr_is_number(a) && fmpq_cmp_si(expr_number(a), -1) > 0) continue;
        if (expr_is_number(a)) {
            char *words = expr_text(e, a), *where = expr_text(e, place);
            if (words && where)
                engine_fail(e, ERROR_DIVERGENT,
                            "the integrand behaves like a power %s at the end %s = %s: the integral does not "
                            "converge there",
                            words, r->original_variable->is.name, where);
            free(words);
            free(where);
            status = TW_ERROR;
        } else {
            status = require_above(e, &r->conditions, a);
        }
    }
    series_clear(&s);
    return status;
}

static tw_status far_end_converges(tw_engine *e, reading *r, const branch *b, expr *far_place)
{
    expr *y = expr_fresh(e, "y");
    expr *turned = normal_under_facts(e, expr_substitute(e, b->q, b->x, expr_sub(e, b->end, y)), &y, 1);
    if (!turned) return TW_ERROR;
    bool sure = true;
    if (end_converges(e, r, turned, y, far_place, &sure) != TW_OK) return TW_ERROR;
    if (!sure)
        conditions_add(&r->conditions, "the integrand can be integrated up to the far end", NULL, CONDITION_OPEN);
    return TW_OK;
}

/* ---- infinity ---- */

typedef enum verdict { CONVERGES, DIVERGES, CANNOT_SAY } verdict;

static int sign_of(tw_engine *e, expr *a)
{
    if (!a) return 2;
    return expr_is_number(a) ? fmpq_sgn(expr_number(a)) : decide_sign(e, a);
}

/* p is unbounded: |q| exp(-S p) against each other; *from: S must exceed it. */
static verdict weigh(tw_engine *e, const behaviour *q, const behaviour *p, expr **from)
{
    *from = expr_int(e, 0);
    if (!q->known || !p->known || !p->sharp) return CANNOT_SAY;
    if (!expr_is_zero(p->b)) return sign_of(e, p->b) == 1 ? CONVERGES : CANNOT_SAY;
    int growing = sign_of(e, q->b);
    if (growing == -1) return CONVERGES;
    if (expr_is_number(p->a) && fmpq_sgn(expr_number(p->a)) > 0) {
        if (growing == 0) return CONVERGES;
        int order = fmpq_cmp(q->c, expr_number(p->a));
        if (order < 0) return CONVERGES;
        if (order > 0) return q->sharp && growing == 1 ? DIVERGES : CANNOT_SAY;
        if (p->k > 0) return CONVERGES;
        *from = q->b;
        return p->k == 0 ? CONVERGES : CANNOT_SAY;
    }
    if (!expr_is_zero(p->a) || growing != 0)
        return growing == 1 && q->sharp && expr_is_zero(p->a) ? DIVERGES : CANNOT_SAY;
    if (p->k > 1) return CONVERGES;
    if (p->k < 1) return sign_of(e, expr_add(e, q->a, expr_int(e, 1))) == -1 ? CONVERGES : CANNOT_SAY;
    *from = expr_add(e, q->a, expr_int(e, 1));
    return *from ? CONVERGES : CANNOT_SAY;
}

/* The coefficient of x^a as x -> inf in f, whose series in 1/x has no larger power; NULL when it is not known. */
static expr *coefficient_at_infinity(tw_engine *e, expr *f, expr *x, expr *a)
{
    expr *y = expr_fresh(e, "y"), *found = NULL, *minus = expr_neg(e, a);
    expr *turned = normal_under_facts(e, expr_substitute(e, f, x, expr_pow(e, y, expr_int(e, -1))), &y, 1);
    series s;
    series_init(&s);
    if (turned && series_at_zero(e, &s, turned, y, 1, NULL, NULL) == TW_OK) {
        for (size_t k = 0; k < s.count; k++) {
            if (s.strands[k].exponent != minus || s.strands[k].log_power > 0) continue;
            expr *C = expr_mul(e, s.strands[k].constant, coefficient_expr(e, &s.strands[k].c, 0));
            found = found ? expr_add(e, found, C) : C;
        }
    }
    series_clear(&s);
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    return found;
}

/* C of p ~ C x^a, or of p ~ C log x by p' ~ C/x; NULL when it is not known. */
static expr *leading_constant(tw_engine *e, expr *p, expr *x, const behaviour *g)
{
    if (p == x) return expr_int(e, 1);
    if (g->k == 0) return coefficient_at_infinity(e, p, x, g->a);
    if (g->k == 1 && expr_is_zero(g->a))
        return coefficient_at_infinity(e, expr_derivative(e, p, x), x, expr_int(e, -1));
    return NULL;
}

/* By the certified record of growth: S is large enough when |q| exp(-S p), p >= c x^a, decays. Only for fixed
 * parameters. */
static verdict weigh_by_record(tw_engine *e, const branch *b, const behaviour *p, expr **from)
{
    static const env nowhere = {0, NULL, NULL};
    if (!p->known || !p->sharp || !expr_is_zero(p->b) || !expr_is_number(p->a)) return CANNOT_SAY;
    growth_bound g;
    growth_bound_init(&g);
    verdict said = CANNOT_SAY;
    if (growth_at_infinity(e, &g, b->q, b->x, &nowhere, 1.0) == TW_OK) {
        arb_t zero;
        arb_init(zero);
        int order = fmpq_cmp(g.c, expr_number(p->a));
        if (arb_is_nonnegative(g.b) || order < 0) {
            said = CONVERGES;
            *from = expr_int(e, 0);
        } else if (order == 0 && b->p == expr_pow(e, b->x, p->a)) {
            arf_t up;
            arf_init(up);
            arb_neg(zero, g.b);
            arb_get_ubound_arf(up, zero, 20);
            fmpq_t bound;
            fmpq_init(bound);
            arf_get_fmpq(bound, up);
            *from = expr_fmpq(e, bound);
            fmpq_clear(bound);
            arf_clear(up);
            said = *from ? CONVERGES : CANNOT_SAY;
        }
        arb_clear(zero);
    }
    growth_bound_clear(&g);
    if (e->error.kind != ERROR_TIME && e->error.kind != ERROR_INTERRUPT && e->error.kind != ERROR_MEMORY)
        engine_forgive(e);
    return said;
}

static tw_status infinity_converges(tw_engine *e, reading *r, const branch *b, expr **least, bool *proved)
{
    behaviour q, p;
    behaviour_init(&q);
    behaviour_init(&p);
    behaviour_at_infinity(e, &q, b->q, b->x);
    behaviour_at_infinity(e, &p, b->p, b->x);
    expr *from;
    verdict said = weigh(e, &q, &p, &from);
    if (said == CONVERGES && !expr_is_zero(from)) {
        expr *C = leading_constant(e, b->p, b->x, &p);
        from = C ? expr_div(e, from, C) : NULL;
        if (!from) said = CANNOT_SAY;
    }
    if (said == CANNOT_SAY) said = weigh_by_record(e, b, &p, &from);
    behaviour_clear(&q);
    behaviour_clear(&p);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (said == DIVERGES) {
        char *words = expr_text(e, b->q);
        engine_fail(e, ERROR_DIVERGENT,
                    "the amplitude %s grows faster than the kernel decays: the integral converges for no %s",
                    words ? words : "", r->large->is.name);
        free(words);
        return TW_ERROR;
    }
    if (said == CANNOT_SAY) {
        *proved = false;
        return TW_OK;
    }
    int larger = *least ? sign_of(e, expr_sub(e, from, *least)) : 1;
    if (larger == 1) *least = from;
    if (larger == 2) {
        expr *both[] = {from, *least};
        *least = expr_call(e, FUNCTION_MAX, both, 2);
    }
    return *least ? TW_OK : TW_ERROR;
}

tw_status branch_converges(tw_engine *e, reading *r, const critical_point *c, size_t k, expr **least, bool *proved)
{
    const branch *b = &c->local.branches[k];
    path p = {e, r, b, false};
    bool sure = true;
    if (end_converges(e, r, b->q, b->x, c->place, &sure) != TW_OK || path_is_smooth(&p, b->q) != TW_OK) return TW_ERROR;
    if (!sure)
        conditions_add(&r->conditions, "the integrand can be integrated up to the critical point", NULL,
                       CONDITION_OPEN);
    if (!expr_is_inf(b->end)) return c->far_places[k] ? far_end_converges(e, r, b, c->far_places[k]) : TW_OK;
    return infinity_converges(e, r, b, least, proved);
}

/* Does the phase grow without limit towards the finite end? */
static bool phase_is_infinite(tw_engine *e, const branch *b)
{
    expr *value = expr_substitute(e, b->p, b->x, b->end);
    acb_t ball;
    acb_init(ball);
    bool finite = value && !value->infinite &&
                  (!expr_is_closed_value(value) || (ball_value(e, ball, value, 64) == TW_OK && acb_is_finite(ball)));
    acb_clear(ball);
    if (e->error.kind == ERROR_VALUE) engine_forgive(e);
    return !finite;
}

tw_status rest_converges(tw_engine *e, reading *r, const branch *b, expr **least, bool *proved)
{
    path p = {e, r, b, false};
    if (path_is_smooth(&p, b->q) != TW_OK) return TW_ERROR;
    if (expr_is_inf(b->end)) return infinity_converges(e, r, b, least, proved);
    if (!phase_is_infinite(e, b)) {
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        return far_end_converges(e, r, b, r->original_variable);
    }
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    /* the kernel is bounded there, so an amplitude that can be integrated is enough */
    condition_list kept;
    conditions_init(&kept);
    conditions_append(&kept, &r->conditions);
    if (far_end_converges(e, r, b, r->original_variable) == TW_OK && r->conditions.count == kept.count) {
        conditions_clear(&kept);
        return TW_OK;
    }
    conditions_clear(&r->conditions);
    r->conditions = kept;
    if (e->error.kind != ERROR_NONE && e->error.kind != ERROR_DIVERGENT && e->error.kind != ERROR_UNSUITABLE) return TW_ERROR;
    engine_forgive(e);
    /* x = end - 1/w carries the end to infinity */
    expr *w = expr_fresh(e, "w"), *x = expr_sub(e, b->end, expr_pow(e, w, expr_int(e, -1)));
    branch far = {w, expr_constant_of(e, CONSTANT_INF), normal_under_facts(e, expr_substitute(e, b->p, b->x, x), &w, 1),
                  normal_under_facts(e, expr_mul(e, expr_substitute(e, b->q, b->x, x), expr_pow(e, w, expr_int(e, -2))), &w, 1)};
    return far.p && far.q ? infinity_converges(e, r, &far, least, proved) : TW_ERROR;
}
