/* What the moves ask about functions at the ends of a range and inside it: limits, signs, convergence. The one
 * idea: each question is tried by rules that are sound for all values of the parameters (values in the extended reals, the
 * leading power of an exact series, the bound of growth at infinity), and "not seen" is an answer. Knows nothing of the
 * form or of moves. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/values.h"
#include "engine/manual/work.h"
#include "engine/method/convergence.h"
#include "engine/method/scale.h"

bool forgive(tw_engine *e)
{
    switch (e->error.kind) {
    case ERROR_NONE: return true;
    case ERROR_TIME:
    case ERROR_MEMORY:
    case ERROR_INTERRUPT:
    case ERROR_INTERNAL: return false;
    default: engine_forgive(e); return true;
    }
}

bool range_is_positive(tw_engine *e, expr *from)
{
    if (expr_is_zero(from)) return true;
    if (expr_is_inf(from) || expr_is_minus_inf(from)) return false;
    int sign = decide_sign(e, from);
    forgive(e);
    return sign == 1 || sign == 0;
}

/* ---- signs ---- */

static bool is_infinite_end(expr *a)
{
    return expr_is_inf(a) || expr_is_minus_inf(a);
}

/* f with x = origin + y or origin - y, and the length of y's range; y > 0. */
static expr *from_lower(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr *y, expr **length)
{
    if (expr_is_minus_inf(from)) {
        *length = expr_int(e, 0);
        if (expr_is_inf(to)) return NULL;
        *length = expr_constant_of(e, CONSTANT_INF);
        return expr_substitute(e, f, x, expr_sub(e, to, y));
    }
    *length = expr_is_inf(to) ? to : expr_sub(e, to, from);
    return expr_substitute(e, f, x, expr_add(e, from, y));
}

static answer positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    expr *y = expr_fresh(e, "y"), *length;
    if (!f || !y) return ANSWER_UNKNOWN;
    if (expr_is_minus_inf(from) && expr_is_inf(to)) {
        expr *zero = expr_int(e, 0);
        answer good = positive_on(e, f, x, zero, to);
        if (good == ANSWER_YES) good = positive_on(e, f, x, from, zero);
        expr *middle = expr_substitute(e, f, x, zero);
        if (good == ANSWER_YES && (!middle || decide_sign(e, middle) != 1)) good = ANSWER_UNKNOWN;
        return good;
    }
    expr *g = from_lower(e, f, x, from, to, y, &length);
    return g ? positive_on_branch(e, g, y, length) : ANSWER_UNKNOWN;
}

int sign_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    int sign = 0;
    if (!f) return 0;
    if (!expr_has(f, x)) {
        sign = decide_sign(e, f);
        return forgive(e) && (sign == 1 || sign == -1) ? sign : 0;
    }
    if (positive_on(e, f, x, from, to) == ANSWER_YES) sign = 1;
    else if (forgive(e) && positive_on(e, expr_neg(e, f), x, from, to) == ANSWER_YES) sign = -1;
    return forgive(e) ? sign : 0;
}

/* ---- values in the extended reals ---- */

typedef enum extended_kind { EXT_FINITE, EXT_PLUS, EXT_MINUS, EXT_UNKNOWN } extended_kind;

typedef struct extended {
    extended_kind kind;
    expr *value; /* FINITE */
} extended;

typedef struct approach {
    tw_engine *e;
    expr *x, *from, *to, *at;
} approach;

static const extended UNKNOWN = {EXT_UNKNOWN, NULL};

static extended known_value(expr *a)
{
    return a ? (extended){EXT_FINITE, a} : UNKNOWN;
}

static extended infinite(int sign)
{
    return (extended){sign > 0 ? EXT_PLUS : EXT_MINUS, NULL};
}

static int sign_of_value(const approach *p, expr *a)
{
    if (expr_is_zero(a)) return 0;
    int sign = decide_sign(p->e, a);
    forgive(p->e);
    return sign;
}

static extended value_of(const approach *p, expr *f);

static extended value_of_sum(const approach *p, expr *f)
{
    int infinity = 0;
    expr *sum = expr_int(p->e, 0);
    for (uint32_t k = 0; k < f->count; k++) {
        extended one = value_of(p, f->args[k]);
        if (one.kind == EXT_UNKNOWN) return UNKNOWN;
        if (one.kind == EXT_FINITE) {
            sum = expr_add(p->e, sum, one.value);
            continue;
        }
        int sign = one.kind == EXT_PLUS ? 1 : -1;
        if (infinity == -sign) return UNKNOWN;
        infinity = sign;
    }
    return infinity ? infinite(infinity) : known_value(sum);
}

static extended value_of_product(const approach *p, expr *f)
{
    bool infinity = false;
    int sign = 1;
    expr *product = expr_int(p->e, 1);
    for (uint32_t k = 0; k < f->count; k++) {
        extended one = value_of(p, f->args[k]);
        if (one.kind == EXT_UNKNOWN) return UNKNOWN;
        if (one.kind == EXT_FINITE) {
            product = expr_mul(p->e, product, one.value);
            continue;
        }
        infinity = true;
        if (one.kind == EXT_MINUS) sign = -sign;
    }
    if (!infinity) return known_value(product);
    int rest = product ? sign_of_value(p, product) : 2;
    return rest == 1 || rest == -1 ? infinite(sign * rest) : UNKNOWN;
}

static bool is_whole(expr *r, bool *even)
{
    bool whole = expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r)));
    *even = whole && fmpz_is_even(fmpq_numref(expr_number(r)));
    return whole;
}

static extended power_at_zero(const approach *p, expr *base, expr *r)
{
    bool even;
    int sign = sign_of_value(p, r), side;
    if (sign == 1) return known_value(expr_int(p->e, 0));
    if (sign != -1) return UNKNOWN;
    if (is_whole(r, &even) && even) return infinite(1);
    side = sign_on(p->e, base, p->x, p->from, p->to);
    if (side == 1) return infinite(1);
    return side == -1 && is_whole(r, &even) ? infinite(-1) : UNKNOWN;
}

static extended value_of_power(const approach *p, expr *f)
{
    bool even;
    extended base = value_of(p, f->args[0]), r = value_of(p, f->args[1]);
    if (base.kind == EXT_UNKNOWN || r.kind != EXT_FINITE) return UNKNOWN;
    bool whole = is_whole(r.value, &even);
    if (base.kind != EXT_FINITE) {
        int sign = sign_of_value(p, r.value);
        if (base.kind == EXT_MINUS && !whole) return UNKNOWN;
        if (sign == -1) return known_value(expr_int(p->e, 0));
        if (sign != 1) return UNKNOWN;
        return infinite(base.kind == EXT_PLUS || even ? 1 : -1);
    }
    int sign = sign_of_value(p, base.value);
    if (sign == 0) return power_at_zero(p, f->args[0], r.value);
    if (sign == 1 || (whole && sign == -1) || (whole && expr_is_closed_value(base.value) &&
                                              value_is_zero(p->e, base.value) == ANSWER_NO) ||
        (sign == 2 && value_off_cut(p->e, base.value)))
        return known_value(expr_pow(p->e, base.value, r.value));
    return UNKNOWN;
}

static extended call_at_infinity(const approach *p, function_id F, int sign)
{
    tw_engine *e = p->e;
    expr *half_pi = expr_mul(e, expr_frac(e, sign, 2), expr_constant_of(e, CONSTANT_PI));
    switch (F) {
    case FUNCTION_EXP: return sign > 0 ? infinite(1) : known_value(expr_int(e, 0));
    case FUNCTION_LOG:
    case FUNCTION_ACOSH: return sign > 0 ? infinite(1) : UNKNOWN;
    case FUNCTION_SINH:
    case FUNCTION_ASINH: return infinite(sign);
    case FUNCTION_COSH:
    case FUNCTION_ABS: return infinite(1);
    case FUNCTION_TANH:
    case FUNCTION_ERF: return known_value(expr_int(e, sign));
    case FUNCTION_ERFC: return known_value(expr_int(e, 1 - sign));
    case FUNCTION_ATAN: return known_value(half_pi);
    case FUNCTION_E1:
    case FUNCTION_AI: return sign > 0 ? known_value(expr_int(e, 0)) : UNKNOWN;
    default: return UNKNOWN;
    }
}

static extended call_at(const approach *p, function_id F, expr *v, expr *argument)
{
    int sign = 2;
    switch (F) {
    case FUNCTION_EXP:
    case FUNCTION_SIN:
    case FUNCTION_COS:
    case FUNCTION_SINH:
    case FUNCTION_COSH:
    case FUNCTION_ERF:
    case FUNCTION_ERFC:
    case FUNCTION_AI:
    case FUNCTION_BI: return known_value(expr_call1(p->e, F, v));
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ABS: return value_is_real(p->e, v) ? known_value(expr_call1(p->e, F, v)) : UNKNOWN;
    case FUNCTION_LOG:
        sign = sign_of_value(p, v);
        if (sign == 0) return sign_on(p->e, argument, p->x, p->from, p->to) == 1 ? infinite(-1) : UNKNOWN;
        return sign == 1 || (sign == 2 && value_off_cut(p->e, v)) ? known_value(expr_call1(p->e, F, v)) : UNKNOWN;
    case FUNCTION_ACOSH:
        sign = sign_of_value(p, expr_sub(p->e, v, expr_int(p->e, 1)));
        return sign == 1 || sign == 0 ? known_value(expr_call1(p->e, F, v)) : UNKNOWN;
    case FUNCTION_GAMMA:
    case FUNCTION_LNGAMMA:
    case FUNCTION_PSI:
    case FUNCTION_E1: return sign_of_value(p, v) == 1 ? known_value(expr_call1(p->e, F, v)) : UNKNOWN;
    case FUNCTION_ASIN:
    case FUNCTION_ACOS: {
        expr *below = expr_sub(p->e, expr_int(p->e, 1), expr_mul(p->e, v, v));
        sign = sign_of_value(p, below);
        return sign == 1 || sign == 0 ? known_value(expr_call1(p->e, F, v)) : UNKNOWN;
    }
    default: return UNKNOWN;
    }
}

static extended value_of_call(const approach *p, expr *f)
{
    if (f->count != 1) return UNKNOWN;
    extended u = value_of(p, f->args[0]);
    if (u.kind == EXT_UNKNOWN) return UNKNOWN;
    if (u.kind != EXT_FINITE) return call_at_infinity(p, f->is.function, u.kind == EXT_PLUS ? 1 : -1);
    return call_at(p, f->is.function, u.value, f->args[0]);
}

static extended value_of(const approach *p, expr *f)
{
    if (!f || !budget_ok(p->e)) return UNKNOWN;
    if (!expr_has(f, p->x)) return known_value(f);
    switch (f->kind) {
    case EXPR_SYMBOL: return expr_is_inf(p->at) ? infinite(1) : expr_is_minus_inf(p->at) ? infinite(-1) : known_value(p->at);
    case EXPR_SUM: return value_of_sum(p, f);
    case EXPR_PRODUCT: return value_of_product(p, f);
    case EXPR_POWER: return value_of_power(p, f);
    case EXPR_CALL: return value_of_call(p, f);
    default: return UNKNOWN;
    }
}

/* ---- growth ---- */

/* The terms of a sum that are real multiples of i leave the exponential's modulus alone. */
static expr *real_exponent(tw_engine *e, expr *u, expr *x)
{
    expr *wide = expr_expand(e, u);
    if (!wide) return NULL;
    expr *const *parts;
    size_t count = expr_terms(&wide, &parts);
    expr *sum = expr_int(e, 0), *i = expr_constant_of(e, CONSTANT_I);
    expr *none = expr_symbol(e, "i_unit");
    for (size_t k = 0; k < count; k++) {
        expr *over = expr_div(e, parts[k], i);
        if (!over) return NULL;
        expr *marked = expr_substitute(e, over, x, none);
        if (value_is_real(e, marked)) continue;
        sum = expr_add(e, sum, parts[k]);
    }
    return sum;
}

/* An upper bound of a real exponent for x > 0 without hyperbolic functions: c cosh(v) <= c (1 + v^2/2) and c exp(v) <=
 * c (1 + v + v^2/2), v > 0, for c < 0 (their series have positive terms only). */
static expr *plain_exponent(tw_engine *e, expr *u, expr *x)
{
    expr *const *parts, *sum = expr_int(e, 0), *half = expr_frac(e, 1, 2), *one = expr_int(e, 1);
    expr *zero = expr_int(e, 0), *inf = expr_constant_of(e, CONSTANT_INF);
    size_t count = expr_terms(&u, &parts);
    for (size_t k = 0; k < count; k++) {
        expr *const *factors, *c = one, *call = NULL, *made = parts[k];
        size_t n = expr_factors(&parts[k], &factors);
        for (size_t j = 0; j < n; j++)
            if (!call && (expr_is_call(factors[j], FUNCTION_COSH) || expr_is_call(factors[j], FUNCTION_EXP)) &&
                expr_has(factors[j], x))
                call = factors[j];
            else c = expr_mul(e, c, factors[j]);
        if (call && c && !expr_has(c, x) && decide_sign(e, c) == -1) {
            expr *v = call->args[0], *square = expr_mul(e, half, expr_mul(e, v, v));
            expr *marked = expr_substitute(e, v, x, expr_symbol(e, "x_real"));
            bool cosh = call->is.function == FUNCTION_COSH;
            if (marked && value_is_real(e, marked) && (cosh || sign_on(e, v, x, zero, inf) == 1))
                made = expr_mul(e, c, expr_add(e, one, cosh ? square : expr_add(e, v, square)));
        }
        sum = expr_add(e, sum, made);
    }
    return sum ? expr_expand(e, sum) : NULL;
}

/* A function with the modulus of f, or an upper bound of it, for a product f of exponentials and other factors. */
static expr *modulus_form(tw_engine *e, expr *f, expr *x)
{
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *made = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        expr *one = factors[k];
        if (expr_is_call(one, FUNCTION_EXP)) {
            expr *u = real_exponent(e, one->args[0], x);
            if (u) u = plain_exponent(e, u, x);
            one = u ? expr_call1(e, FUNCTION_EXP, u) : NULL;
        }
        if (one && expr_is_constant(one, CONSTANT_I)) continue;
        made = expr_mul(e, made, one);
    }
    return made;
}

/* log|f| <= b x^c + a log x + k log log x at infinity; what of it is decided: the sign of b, of a - `level`, and k.
 * YES: f = O(x^level') with level' < level, or exponentially small. */
static answer below_power(tw_engine *e, expr *f, expr *x, slong level)
{
    behaviour b;
    behaviour_init(&b);
    behaviour_at_infinity(e, &b, f, x);
    answer good = ANSWER_UNKNOWN;
    if (b.known && forgive(e)) {
        int sign = expr_is_zero(b.b) ? 0 : decide_sign(e, b.b);
        if (sign == -1) good = ANSWER_YES;
        if (sign == 0) {
            int over = decide_sign(e, expr_sub(e, b.a, expr_int(e, level)));
            if (over == -1 || (over == 0 && b.k < (level == 0 ? 0 : -1))) good = ANSWER_YES;
        }
    }
    behaviour_clear(&b);
    return forgive(e) ? good : ANSWER_UNKNOWN;
}

/* Each term of f below x^level at infinity (x -> +inf). */
static answer terms_below(tw_engine *e, expr *f, expr *x, slong level)
{
    expr *whole = modulus_form(e, f, x);
    if (whole && below_power(e, whole, x, level) == ANSWER_YES) return ANSWER_YES;
    if (!forgive(e)) return ANSWER_UNKNOWN;
    expr *wide = expr_expand(e, f);
    if (!wide) return forgive(e) ? ANSWER_UNKNOWN : ANSWER_UNKNOWN;
    expr *const *parts;
    size_t count = expr_terms(&wide, &parts);
    for (size_t k = 0; k < count; k++) {
        expr *one = modulus_form(e, parts[k], x);
        if (!one || !budget_ok(e) || below_power(e, one, x, level) != ANSWER_YES) {
            forgive(e);
            return ANSWER_UNKNOWN;
        }
    }
    return ANSWER_YES;
}

/* ---- limits ---- */

/* f as a function of y -> 0+ that runs to the end. */
static expr *towards_end(tw_engine *e, expr *f, expr *x, expr *at, bool upper, expr *y)
{
    expr *place;
    if (expr_is_inf(at)) place = expr_pow(e, y, expr_int(e, -1));
    else if (expr_is_minus_inf(at)) place = expr_neg(e, expr_pow(e, y, expr_int(e, -1)));
    else place = upper ? expr_sub(e, at, y) : expr_add(e, at, y);
    return expr_substitute(e, f, x, place);
}

/* By the leading power of the series. */
static bool limit_by_series(tw_engine *e, expr **out, expr *g, expr *y)
{
    series s;
    series_init(&s);
    bool good = g && series_at_zero(e, &s, g, y, 1, NULL, NULL) == TW_OK;
    expr *sum = expr_int(e, 0);
    int infinity = 0;
    for (size_t k = 0; k < s.count && good; k++) {
        const strand *t = &s.strands[k];
        int sign = expr_is_zero(t->exponent) ? 0 : decide_sign(e, t->exponent);
        if (sign == 1) continue;
        expr *c = expr_mul(e, t->constant, coefficient_expr(e, &t->c, 0));
        if (sign == 0 && t->log_power == 0) sum = expr_add(e, sum, c);
        else if (s.count == 1 && (sign == -1 || (sign == 0 && t->log_power > 0))) {
            infinity = c ? decide_sign(e, c) : 2;
            if (t->log_power & 1) infinity = -infinity;
            good = infinity == 1 || infinity == -1;
        } else good = false;
    }
    series_clear(&s);
    if (!forgive(e) || !good || !sum) return false;
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    *out = infinity > 0 ? inf : infinity < 0 ? expr_neg(e, inf) : sum;
    return true;
}

tw_status limit_at(tw_engine *e, expr **out, expr *f, expr *x, expr *from, expr *to, bool upper)
{
    expr *at = upper ? to : from;
    if (!f) return TW_ERROR;
    approach p = {e, x, from, to, at};
    extended v = value_of(&p, f);
    if (!forgive(e)) return TW_ERROR;
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    if (v.kind != EXT_UNKNOWN) {
        *out = v.kind == EXT_FINITE ? v.value : v.kind == EXT_PLUS ? inf : expr_neg(e, inf);
        return *out ? TW_OK : TW_ERROR;
    }
    expr *y = expr_fresh(e, "y"), *z = expr_fresh(e, "z");
    expr *g = y ? towards_end(e, f, x, at, upper, y) : NULL;
    if (g) g = tidy(e, g, y, true);
    if (g && limit_by_series(e, out, g, y)) return TW_OK;
    if (!forgive(e)) return TW_ERROR;
    expr *h = is_infinite_end(at) ? expr_substitute(e, f, x, expr_is_inf(at) ? z : expr_neg(e, z))
              : g                 ? expr_substitute(e, g, y, expr_pow(e, z, expr_int(e, -1)))
                                  : NULL;
    if (h) h = tidy(e, h, z, true);
    if (h && terms_below(e, h, z, 0) == ANSWER_YES) {
        *out = expr_int(e, 0);
        return TW_OK;
    }
    if (!forgive(e)) return TW_ERROR;
    char *words = expr_text(e, f), *place = expr_text(e, at);
    engine_fail(e, ERROR_UNSUITABLE, "the limit of %.200s as %s -> %s is not known", words ? words : "", x->is.name,
                place ? place : "");
    free(words);
    free(place);
    return TW_ERROR;
}

/* ---- convergence ---- */

typedef struct inside {
    tw_engine *e;
    expr *x, *from, *to;
} inside;

/* The part of u without factors i, for a u that is a sum of real terms and real multiples of i; NULL when not seen. */
static bool split_complex(tw_engine *e, expr *u, expr *x, expr **real, expr **imaginary)
{
    expr *wide = expr_expand(e, u);
    expr *i = expr_constant_of(e, CONSTANT_I), *mark = expr_symbol(e, "x_real");
    *real = *imaginary = expr_int(e, 0);
    if (!wide) return false;
    expr *const *parts;
    size_t count = expr_terms(&wide, &parts);
    for (size_t k = 0; k < count; k++) {
        expr *over = expr_div(e, parts[k], i);
        expr *marked = expr_substitute(e, parts[k], x, mark), *marked_over = over ? expr_substitute(e, over, x, mark) : NULL;
        if (marked && value_is_real(e, marked)) *real = expr_add(e, *real, parts[k]);
        else if (marked_over && value_is_real(e, marked_over)) *imaginary = expr_add(e, *imaginary, over);
        else return false;
    }
    return *real && *imaginary;
}

static bool keeps_from_zero(const inside *w, expr *u)
{
    if (u == w->x && range_is_positive(w->e, w->from)) return true;
    if (sign_on(w->e, u, w->x, w->from, w->to) != 0) return true;
    expr *real, *imaginary;
    if (!split_complex(w->e, u, w->x, &real, &imaginary)) return forgive(w->e) && false;
    return (!expr_is_zero(real) && sign_on(w->e, real, w->x, w->from, w->to) != 0) ||
           (!expr_is_zero(imaginary) && sign_on(w->e, imaginary, w->x, w->from, w->to) != 0);
}

/* Off the cut (-inf, 0]. */
static bool keeps_from_cut(const inside *w, expr *u)
{
    if (u == w->x && range_is_positive(w->e, w->from)) return true;
    if (sign_on(w->e, u, w->x, w->from, w->to) == 1) return true;
    expr *real, *imaginary;
    if (!split_complex(w->e, u, w->x, &real, &imaginary)) return forgive(w->e) && false;
    return (!expr_is_zero(real) && sign_on(w->e, real, w->x, w->from, w->to) == 1) ||
           (!expr_is_zero(imaginary) && sign_on(w->e, imaginary, w->x, w->from, w->to) != 0);
}

static bool is_smooth(const inside *w, expr *f);

static bool call_is_smooth(const inside *w, expr *f)
{
    expr *u = f->args[f->count - 1];
    switch (f->is.function) {
    case FUNCTION_EXP:
    case FUNCTION_SIN:
    case FUNCTION_COS:
    case FUNCTION_SINH:
    case FUNCTION_COSH:
    case FUNCTION_ERF:
    case FUNCTION_ERFC:
    case FUNCTION_AI:
    case FUNCTION_BI: return true;
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ABS: {
        expr *marked = expr_substitute(w->e, u, w->x, expr_symbol(w->e, "x_real"));
        return marked && value_is_real(w->e, marked);
    }
    case FUNCTION_LOG: return keeps_from_cut(w, u);
    case FUNCTION_ACOSH:
        return sign_on(w->e, expr_sub(w->e, u, expr_int(w->e, 1)), w->x, w->from, w->to) == 1;
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ATANH:
        return sign_on(w->e, expr_sub(w->e, expr_int(w->e, 1), expr_mul(w->e, u, u)), w->x, w->from, w->to) == 1;
    case FUNCTION_GAMMA:
    case FUNCTION_LNGAMMA:
    case FUNCTION_PSI:
    case FUNCTION_E1:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return sign_on(w->e, u, w->x, w->from, w->to) == 1;
    default: return false;
    }
}

/* Continuous in the open range, for certain. */
static bool is_smooth(const inside *w, expr *f)
{
    if (!expr_has(f, w->x) || f == w->x) return true;
    if (!budget_ok(w->e)) return false;
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER && f->kind != EXPR_CALL) return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (!is_smooth(w, f->args[k])) return false;
    if (f->kind == EXPR_CALL) return call_is_smooth(w, f);
    if (f->kind != EXPR_POWER) return true;
    bool even;
    if (is_whole(f->args[1], &even))
        return fmpq_sgn(expr_number(f->args[1])) > 0 || keeps_from_zero(w, f->args[0]);
    return keeps_from_cut(w, f->args[0]);
}

bool is_smooth_inside(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    inside w = {e, x, from, to};
    return f && is_smooth(&w, f) && forgive(e);
}

/* |f| integrable at a finite end: every leading exponent above -1. NO when the only one is proved to be at most -1. */
static answer end_integrable(tw_engine *e, expr *f, expr *x, expr *at, bool upper)
{
    expr *y = expr_fresh(e, "y"), *g = y ? towards_end(e, f, x, at, upper, y) : NULL;
    if (g) g = tidy(e, g, y, true);
    series s;
    series_init(&s);
    answer good = g && series_at_zero(e, &s, g, y, 1, NULL, NULL) == TW_OK ? ANSWER_YES : ANSWER_UNKNOWN;
    for (size_t k = 0; k < s.count && good == ANSWER_YES; k++) {
        int sign = decide_sign(e, expr_add(e, s.strands[k].exponent, expr_int(e, 1)));
        if (sign != 1) good = s.count == 1 && (sign == -1 || (sign == 0 && s.strands[k].log_power >= 0)) ? ANSWER_NO
                                                                                                        : ANSWER_UNKNOWN;
    }
    series_clear(&s);
    if (!forgive(e)) return ANSWER_UNKNOWN;
    if (good == ANSWER_UNKNOWN && g) { /* flat there, as exp(-1/y) */
        expr *z = expr_fresh(e, "z"), *minus = expr_int(e, -1);
        expr *h = z ? expr_substitute(e, g, y, expr_pow(e, z, minus)) : NULL;
        h = h ? tidy(e, expr_mul(e, h, expr_pow(e, z, expr_int(e, -2))), z, true) : NULL;
        if (h) good = terms_below(e, h, z, -1);
    }
    return forgive(e) ? good : ANSWER_UNKNOWN;
}

answer converges_absolutely(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    inside w = {e, x, from, to};
    expr *ends[] = {from, to};
    if (!f) return ANSWER_UNKNOWN;
    answer good = is_smooth(&w, f) ? ANSWER_YES : ANSWER_UNKNOWN;
    for (int k = 0; k < 2; k++) {
        answer here;
        if (is_infinite_end(ends[k])) {
            expr *z = expr_fresh(e, x->is.name);
            expr *g = z ? expr_substitute(e, f, x, expr_is_inf(ends[k]) ? z : expr_neg(e, z)) : NULL;
            g = g ? tidy(e, g, z, true) : NULL;
            here = g ? terms_below(e, g, z, -1) : ANSWER_UNKNOWN;
        } else {
            here = end_integrable(e, f, x, ends[k], k == 1);
        }
        if (here == ANSWER_NO) return ANSWER_NO;
        if (here != ANSWER_YES) good = ANSWER_UNKNOWN;
    }
    return forgive(e) ? good : ANSWER_UNKNOWN;
}
