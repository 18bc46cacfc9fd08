/* Where the phase is least on the path. The one idea: a phase that is exactly a constant plus a multiple of a pure
 * power tells its least point itself; a phase whose slope has one sign on the whole path is least at an end. Everything
 * else is for wells.c. */
#include "engine/method/place.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/method/convergence.h"

enum { DEGREE_LIMIT = 64 };

void place_init(place *p)
{
    memset(p, 0, sizeof *p);
    fmpq_init(p->mu);
}

void place_clear(place *p)
{
    fmpq_clear(p->mu);
}

/* ---- pure powers ---- */

/* What kind of power: defined by symmetry about the center. */
typedef enum power_shape { SHAPE_NONE, SHAPE_LINEAR, SHAPE_EVEN, SHAPE_ODD, SHAPE_RIGHT, SHAPE_LEFT } power_shape;

/* a0 + a1 x + ... + ad x^d = level + ad (x - center)^d for all x? */
static power_shape shape_of_polynomial(tw_engine *e, place *out, expr *const *a, slong d, expr *x)
{
    if (d < 1 || expr_is_zero(a[d])) return SHAPE_NONE;
    out->c = a[d];
    fmpq_set_si(out->mu, d, 1);
    if (d == 1) {
        out->center = expr_int(e, 0);
        out->level = a[0];
        return SHAPE_LINEAR;
    }
    out->center = expr_div(e, a[d - 1], expr_mul(e, expr_int(e, -d), a[d]));
    expr *power = expr_expand(e, expr_pow(e, expr_sub(e, x, out->center), expr_int(e, d)));
    expr **b;
    slong degree;
    if (!power || expr_polynomial(e, power, x, DEGREE_LIMIT, &b, &degree) != TW_OK) return SHAPE_NONE;
    bool same = degree == d;
    for (slong k = 1; k < d && same; k++) {
        expr *away = expr_expand(e, expr_sub(e, a[k], expr_mul(e, a[d], b[k])));
        same = away && expr_is_zero(away);
    }
    if (same) out->level = expr_sub(e, a[0], expr_mul(e, a[d], b[0]));
    free(b);
    return !same || !out->level ? SHAPE_NONE : d % 2 ? SHAPE_ODD : SHAPE_EVEN;
}

/* base = slope*(x - center) */
static bool read_linear(tw_engine *e, expr *base, expr *x, expr **slope, expr **center)
{
    expr **a;
    slong degree;
    if (expr_polynomial(e, base, x, 1, &a, &degree) != TW_OK) return false;
    bool good = degree == 1;
    *slope = good ? a[1] : NULL;
    *center = good ? expr_neg(e, expr_div(e, a[0], a[1])) : NULL;
    free(a);
    return good && *center;
}

/* |slope (x - center)|^mu or (slope (x - center))^mu. */
static power_shape shape_of_factor(tw_engine *e, place *out, expr *f, expr *x)
{
    expr *base, *exponent, *slope;
    expr_as_power(e, f, &base, &exponent);
    bool even = expr_is_call(base, FUNCTION_ABS);
    if (even) base = base->args[0];
    if (!expr_is_number(exponent) || fmpq_sgn(expr_number(exponent)) <= 0) return SHAPE_NONE;
    if (!read_linear(e, base, x, &slope, &out->center)) return SHAPE_NONE;
    int sign = decide_sign(e, slope);
    if (sign != 1 && sign != -1) return SHAPE_NONE;
    if (sign < 0) slope = expr_neg(e, slope);
    fmpq_set(out->mu, expr_number(exponent));
    out->c = expr_mul(e, out->c, expr_pow(e, slope, exponent));
    return even ? SHAPE_EVEN : sign > 0 ? SHAPE_RIGHT : SHAPE_LEFT;
}

static power_shape shape_of_term(tw_engine *e, place *out, expr *t, expr *x)
{
    expr *const *factors;
    size_t count = expr_factors(&t, &factors);
    power_shape shape = SHAPE_NONE;
    out->c = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (!expr_has(factors[k], x)) {
            out->c = expr_mul(e, out->c, factors[k]);
            continue;
        }
        if (shape != SHAPE_NONE) return SHAPE_NONE;
        shape = shape_of_factor(e, out, factors[k], x);
        if (shape == SHAPE_NONE) return SHAPE_NONE;
    }
    return shape;
}

static power_shape read_shape(tw_engine *e, place *out, expr *phase, expr *x)
{
    expr **a;
    slong degree;
    if (expr_polynomial(e, phase, x, DEGREE_LIMIT, &a, &degree) == TW_OK) {
        power_shape shape = shape_of_polynomial(e, out, a, degree, x);
        free(a);
        return shape;
    }
    expr *level = expr_int(e, 0), *moving = expr_int(e, 0);
    expr *const *terms;
    size_t count = expr_terms(&phase, &terms);
    for (size_t k = 0; k < count; k++) {
        if (expr_has(terms[k], x)) moving = expr_add(e, moving, terms[k]);
        else level = expr_add(e, level, terms[k]);
    }
    out->level = level;
    return moving && level ? shape_of_term(e, out, moving, x) : SHAPE_NONE;
}

/* ---- where the center lies ---- */

static int sign_between(tw_engine *e, expr *low, expr *high)
{
    if (expr_is_minus_inf(low) || expr_is_inf(high)) return 1;
    return decide_sign(e, expr_sub(e, high, low));
}

static tw_status undecided_place(tw_engine *e, expr *center, expr *x)
{
    char *words = expr_text(e, center);
    engine_fail(e, ERROR_UNDECIDED, "the facts do not say where %s = %s lies on the path: declare it with `given`",
                x->is.name, words ? words : "");
    free(words);
    return TW_ERROR;
}

static tw_status growing_kernel(tw_engine *e, expr *large)
{
    const char *s = large->is.name;
    return engine_fail(e, ERROR_DIVERGENT,
                       "the kernel grows without limit along the path for large %s: the integral does not "
                       "converge (is a minus sign missing in the exponent?)",
                       s);
}

/* ---- general phases ---- */

static tw_status refuse_interior(tw_engine *e, expr *phase, bool known)
{
    char *words = expr_text(e, phase);
    engine_fail(e, known ? ERROR_UNSUITABLE : ERROR_UNDECIDED,
                "%s %s monotone on the path, and the place where it is least was not found",
                words ? words : "", known ? "is not" : "could not be shown to be");
    free(words);
    return TW_ERROR;
}

/* The slope's sign on the whole path: 1, -1, 2 (not one sign, or not known; *known tells which). *seen: from samples
 * only. */
static int slope_sign(tw_engine *e, expr *slope, expr *x, expr *from, expr *to, bool *known, bool *seen)
{
    expr *y = expr_fresh(e, "x");
    expr *moved = expr_substitute(e, slope, x, expr_add(e, from, y));
    expr *length = expr_is_inf(to) ? to : expr_sub(e, to, from);
    *known = *seen = false;
    if (!moved || !length) return 2;
    expr *zero = expr_int(e, 0), *minus = expr_neg(e, moved);
    answer up = positive_on_branch(e, moved, y, length), down = positive_on_branch(e, minus, y, length);
    if (up == ANSWER_YES || down == ANSWER_YES) return up == ANSWER_YES ? 1 : -1;
    answer weak_up = decide_positive_on(e, moved, y, zero, length, true);
    if (weak_up == ANSWER_YES) return 1;
    answer weak_down = decide_positive_on(e, minus, y, zero, length, true);
    if (weak_down == ANSWER_YES) return -1;
    int signs = signs_seen(e, moved, y, length);
    const int both = SIGN_SEEN_POSITIVE | SIGN_SEEN_NEGATIVE;
    *known = (signs & both) == both || (weak_up == ANSWER_NO && weak_down == ANSWER_NO);
    *seen = !*known && (signs == SIGN_SEEN_POSITIVE || signs == SIGN_SEEN_NEGATIVE);
    return !*seen ? 2 : signs == SIGN_SEEN_POSITIVE ? 1 : -1;
}

tw_status place_find_by_slope(tw_engine *e, place *out, expr *phase, expr *x, expr *from, expr *to, expr *large,
                                condition_list *conditions)
{
    if (expr_is_minus_inf(from)) return refuse_interior(e, phase, true);
    bool known, seen;
    int sign = slope_sign(e, expr_derivative(e, phase, x), x, from, to, &known, &seen);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (sign == 2) return refuse_interior(e, phase, known);
    if (sign < 0 && expr_is_inf(to)) return growing_kernel(e, large);
    if (seen) conditions_add(conditions, "the exponent has no other greatest point on the path", NULL, CONDITION_OPEN);
    out->kind = sign > 0 ? PLACE_FROM : PLACE_TO;
    out->pure = false;
    out->center = sign > 0 ? from : to;
    return TW_OK;
}

/* ---- pure ones ---- */

/* The conditions under which c > 0 (or < 0) are asked of the facts; the sign. */
static tw_status power_sign(tw_engine *e, expr *c, condition_list *conditions, int *sign)
{
    *sign = decide_sign(e, c);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (*sign == 1 || *sign == -1) {
        expr *zero = expr_int(e, 0);
        bool plain = expr_is_closed_value(c);
        expr *relation = expr_relation_of(e, RELATION_LESS, *sign > 0 ? zero : c, *sign > 0 ? c : zero);
        return plain ? TW_OK : conditions_require(e, conditions, relation);
    }
    char *words = expr_text(e, c);
    engine_fail(e, ERROR_UNDECIDED,
                "the sign of %s decides where the kernel is greatest, and the facts do not give it: declare it "
                "with `given`",
                words ? words : "");
    free(words);
    return TW_ERROR;
}

static tw_status place_linear(tw_engine *e, place *out, int sign, expr *from, expr *to, expr *large)
{
    out->kind = sign > 0 ? PLACE_FROM : PLACE_TO;
    expr *end = sign > 0 ? from : to;
    if (expr_is_inf(end) || expr_is_minus_inf(end)) return growing_kernel(e, large);
    out->level = expr_add(e, out->level, expr_mul(e, out->c, end));
    if (sign < 0) out->c = expr_neg(e, out->c);
    out->center = end;
    out->pure = true;
    return out->level && out->c ? TW_OK : TW_ERROR;
}

/* c |x - center|^mu about a center on the path or at its end; *found false when it lies outside. */
static tw_status place_power(tw_engine *e, place *out, power_shape shape, expr *x, expr *from, expr *to, bool *found)
{
    int left = sign_between(e, from, out->center), right = sign_between(e, out->center, to);
    *found = false;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (left == 2 || right == 2) return undecided_place(e, out->center, x);
    bool rightwards = shape == SHAPE_EVEN || shape == SHAPE_RIGHT || shape == SHAPE_ODD;
    bool leftwards = shape == SHAPE_EVEN || shape == SHAPE_LEFT;
    if (left == 0 && rightwards) out->kind = PLACE_FROM;
    else if (right == 0 && leftwards) out->kind = PLACE_TO;
    else if (left == 1 && right == 1 && shape == SHAPE_EVEN) out->kind = PLACE_INSIDE;
    else return TW_OK;
    *found = out->pure = true;
    return TW_OK;
}

tw_status place_find_pure(tw_engine *e, place *out, expr *phase, expr *x, expr *from, expr *to, expr *large,
                          condition_list *conditions, bool *found)
{
    *found = false;
    power_shape shape = read_shape(e, out, phase, x);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (shape == SHAPE_NONE) return TW_OK;
    int sign;
    if (power_sign(e, out->c, conditions, &sign) != TW_OK) return TW_ERROR;
    *found = shape == SHAPE_LINEAR;
    if (shape == SHAPE_LINEAR) return place_linear(e, out, sign, from, to, large);
    bool endless = expr_is_inf(to) || expr_is_minus_inf(from);
    if (sign < 0 && endless && shape == SHAPE_EVEN) return growing_kernel(e, large);
    return sign > 0 ? place_power(e, out, shape, x, from, to, found) : TW_OK;
}
