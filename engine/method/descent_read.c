/* From a contour integral to the problem that steepest descent solves: kernel and amplitude apart, the path as a polygon, saddles and
 * poles, the integers. Makes no series.
 *
 * The one idea: nothing about the path is assumed: ends at infinity must lie in valleys (or are turned into one, with the vanishing
 * arc proved), ends at poles must be met from a valley, the amplitude must be analytic but for poles, and each that fails is said. */
#include "engine/method/descent.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "engine/exact/values.h"
#include "engine/method/scale.h"

enum { ROUTE_BITS = 256 };

void descent_problem_init(descent_problem *d, tw_engine *e)
{
    memset(d, 0, sizeof *d);
    d->e = e;
    derivation_init(&d->derivation);
    conditions_init(&d->conditions);
}

void descent_problem_clear(descent_problem *d)
{
    if (d->read_found)
        shares_clear(&d->found);
    if (d->read_l)
        landscape_clear(&d->l);
    if (d->read_r)
        route_clear(&d->r);
    if (d->read_q)
        amplitude_clear(&d->amplitude);
    for (int k = 0; k < 2; k++)
        if (d->has_end[k])
            spot_clear(&d->ends[k]);
    for (size_t k = 0; k < d->pole_count; k++)
        spot_clear(d->poles + k);
    free(d->poles);
    free(d->points);
    derivation_clear(&d->derivation);
    conditions_clear(&d->conditions);
}

static void record(descent_problem *d, const char *rule, const char *source, expr *after, const char *format, ...)
    __attribute__((format(printf, 5, 6)));

static void record(descent_problem *d, const char *rule, const char *source, expr *after, const char *format, ...)
{
    char words[600];
    va_list list;
    va_start(list, format);
    vsnprintf(words, sizeof words, format, list);
    va_end(list);
    step *s = derivation_add(&d->derivation, rule, source);
    s->detail = base_copy(words);
    s->after = after;
    if (!after)
        s->form = base_copy("unchanged");
}

/* ---- points ---- */

static expr *angle_of(tw_engine *e, expr *point)
{
    if (expr_is_inf(point))
        return expr_int(e, 0);
    if (expr_is_minus_inf(point))
        return expr_constant_of(e, CONSTANT_PI);
    return point->kind == EXPR_DIRECTION ? point->args[0] : NULL;
}

static bool holds_kind(expr *a, expr_kind kind)
{
    if (a->kind == kind)
        return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_kind(a->args[k], kind))
            return true;
    return false;
}

bool descent_applies(expr *integral)
{
    return holds_kind(integral, EXPR_CONTOUR);
}

typedef struct binder {
    expr *node, *outside, *x, *body;
} binder;

static tw_status find_binder(descent_problem *d, binder *b)
{
    tw_engine *e = d->e;
    expr *integral = d->integral;
    expr *const *factors;
    size_t count = expr_factors(&integral, &factors);
    *b = (binder){.outside = expr_int(e, 1)};
    for (size_t k = 0; k < count; k++) {
        bool is = factors[k]->kind == EXPR_CONTOUR || factors[k]->kind == EXPR_INTEGRAL;
        if (is && b->node)
            return engine_fail(e, ERROR_UNSUITABLE, "this is a product of integrals: expand each by itself");
        if (is)
            b->node = factors[k];
        else
            b->outside = expr_mul(e, b->outside, factors[k]);
    }
    if (!b->node)
        return engine_fail(e, ERROR_UNSUITABLE, "the integral stands inside a power or a function: expand the integral by itself");
    b->x = expr_fresh(e, expr_binder_name(b->node));
    d->variable = expr_symbol(e, expr_binder_name(b->node));
    b->body = expr_open(e, b->node, b->x);
    if (!b->body || !b->outside || !b->x)
        return TW_ERROR;
    if (holds_kind(b->body, EXPR_INTEGRAL) || holds_kind(b->body, EXPR_CONTOUR))
        return engine_fail(e, ERROR_UNSUITABLE, "this is an integral over an integral: the methods need one variable");
    return TW_OK;
}

static tw_status list_points(descent_problem *d, const binder *b)
{
    tw_engine *e = d->e;
    size_t n = b->node->count - 1;
    d->points = base_alloc((n + 2) * sizeof *d->points);
    for (size_t k = 0; k < n; k++) {
        expr *point = b->node->args[k];
        if (k > 0 && k + 1 < n && angle_of(e, point))
            return engine_fail(e, ERROR_UNSUITABLE, "only the first and the last point of a path may lie at infinity");
        d->points[d->point_count++] = point;
        if (n == 2 && k == 0 && angle_of(e, point) && angle_of(e, b->node->args[1]))
            d->points[d->point_count++] = expr_int(e, 0);
    }
    return TW_OK;
}

/* ---- the kernel ---- */

static tw_status separate(descent_problem *d, const binder *b)
{
    tw_engine *e = d->e;
    separation s;
    separation_init(&s);
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    tw_status status = body_separate(e, &s, b->body, b->x, expr_neg(e, inf), inf, d->large, d->small, false);
    if (status == TW_OK) {
        d->z = s.variable;
        d->p = s.phase;
        d->q = s.amplitude;
        d->factor = expr_mul(e, b->outside, s.factor);
        d->scale = expr_pow(e, d->large, expr_fmpq(e, s.power));
        d->stretch = expr_pow(e, d->large, expr_fmpq(e, s.stretch));
        for (size_t k = 0; k < d->point_count && status == TW_OK; k++) {
            if (angle_of(e, d->points[k]))
                continue;
            fmpq_t power;
            fmpq_init(power);
            expr *point = expr_div(e, d->points[k], d->stretch);
            expr *rest = draw_power(e, point, d->large, power);
            bool free_of = rest && (expr_is_zero(rest) || (fmpq_is_zero(power) && !expr_has(rest, d->large)));
            fmpq_clear(power);
            if (!free_of && e->error.kind == ERROR_NONE)
                status = engine_fail(e, ERROR_UNSUITABLE, "a point of the path moves with %s beside the kernel", d->large->is.name);
            d->points[k] = rest;
        }
    }
    separation_clear(&s);
    if (status != TW_OK)
        return TW_ERROR;
    return d->factor && d->scale && d->stretch && d->q && d->p ? TW_OK : TW_ERROR;
}

/* exp(i*(z^3/3 + s*z)): the amplitude outgrows the kernel, but z = s^a*t brings both to one scale. */
static tw_status balance(descent_problem *d, binder *b)
{
    tw_engine *e = d->e;
    amplitude q;
    expr **c;
    slong degree, outer;
    if (expr_polynomial(e, d->p, d->z, 60, &c, &degree) != TW_OK)
        return e->error.kind ? TW_ERROR : TW_OK;
    free(c);
    amplitude_read(&q, e, d->q, d->z);
    outer = q.exact ? FLINT_MAX(fmpq_poly_degree(q.growth.re), fmpq_poly_degree(q.growth.im)) : 0;
    amplitude_clear(&q);
    if (e->error.kind || outer <= degree || !expr_is_one(d->stretch))
        return e->error.kind ? TW_ERROR : TW_OK;
    expr *base, *power;
    expr_as_power(e, d->scale, &base, &power);
    expr *by = expr_pow(e, d->large, expr_mul(e, power, expr_frac(e, 1, outer - degree)));
    expr *t = expr_fresh(e, expr_binder_name(b->node));
    binder stretched = *b;
    stretched.body = expr_mul(e, by, expr_substitute(e, b->body, b->x, expr_mul(e, by, t)));
    stretched.x = t;
    for (size_t k = 0; k < d->point_count; k++)
        if (!angle_of(e, d->points[k]))
            d->points[k] = expr_div(e, d->points[k], by);
    if (separate(d, &stretched) != TW_OK)
        return TW_ERROR;
    d->stretch = expr_mul(e, d->stretch, by);
    char *words = expr_text(e, by);
    record(d, "stretch the variable", NULL, NULL, "%s = %s*t brings the whole exponent to one scale", d->variable->is.name, words ? words : "");
    free(words);
    return TW_OK;
}

/* ---- the landscape ---- */

static tw_status read_landscape(descent_problem *d)
{
    tw_engine *e = d->e;
    expr **symbols;
    size_t count = expr_symbols(d->p, &symbols);
    const char *parameter = NULL;
    for (size_t k = 0; k < count; k++)
        if (symbols[k] != d->z)
            parameter = symbols[k]->is.name;
    free(symbols);
    if (parameter)
        return engine_fail(e, ERROR_UNSUITABLE,
                           "which saddles count depends on the value of %s: steepest descent needs a number for it in the exponent",
                           parameter);
    d->read_l = landscape_read(&d->l, e, d->p, d->z);
    if (d->read_l)
        return TW_OK;
    if (e->error.kind == ERROR_NONE) {
        char *words = expr_text(e, d->p);
        engine_fail(e, ERROR_UNSUITABLE,
                    "steepest descent takes exponents that are rational in the variable with numbers a + b*i, a and b rational, as "
                    "coefficients; %s is not", words ? words : "this one");
        free(words);
    }
    return TW_ERROR;
}

/* Where the amplitude is no rational function times exp(polynomial): entire by its form? */
static bool entire(expr *f, expr *z, slong degree, bool inside)
{
    if (!expr_has(f, z))
        return true;
    if (f == z)
        return true;
    switch ((expr_kind)f->kind) {
    case EXPR_SUM: case EXPR_PRODUCT: break;
    case EXPR_POWER:
        if (!expr_is_number(f->args[1]) || !fmpz_is_one(fmpq_denref(expr_number(f->args[1]))) || fmpq_sgn(expr_number(f->args[1])) < 0)
            return false;
        break;
    case EXPR_CALL:
        switch (f->is.function) {
        case FUNCTION_EXP: case FUNCTION_SIN: case FUNCTION_COS: case FUNCTION_SINH: case FUNCTION_COSH: break;
        default: return false;
        }
        if (inside)
            return false; /* exp(exp(z)) outgrows every kernel */
        inside = true;
        break;
    default: return false;
    }
    for (uint32_t k = 0; k < f->count; k++)
        if (!entire(f->args[k], z, degree, inside))
            return false;
    return true;
}

/* The greatest degree of an argument of exp, sin, ...; -1: not a polynomial. */
static slong growth_degree(tw_engine *e, expr *f, expr *z)
{
    slong most = 0;
    if (!expr_has(f, z))
        return 0;
    if (f->kind == EXPR_CALL) {
        expr **c;
        slong degree;
        if (expr_polynomial(e, f->args[0], z, 60, &c, &degree) != TW_OK)
            return -1;
        free(c);
        return degree;
    }
    for (uint32_t k = 0; k < f->count; k++) {
        slong here = growth_degree(e, f->args[k], z);
        if (here < 0)
            return -1;
        most = FLINT_MAX(most, here);
    }
    return most;
}

static tw_status read_amplitude(descent_problem *d)
{
    tw_engine *e = d->e;
    amplitude_read(&d->amplitude, e, d->q, d->z);
    d->read_q = true;
    if (e->error.kind != ERROR_NONE)
        return TW_ERROR;
    if (!d->amplitude.exact && !entire(d->q, d->z, 0, false)) {
        char *words = expr_text(e, d->q);
        engine_fail(e, ERROR_UNSUITABLE,
                    "steepest descent takes amplitudes that are rational times exp of a polynomial, or entire by their form; %s is not, "
                    "and its singular points could stand in the path's way", words ? words : "this one");
        free(words);
        return TW_ERROR;
    }
    slong degree = d->amplitude.exact ? FLINT_MAX(0, FLINT_MAX(fmpq_poly_degree(d->amplitude.growth.re),
                                                               fmpq_poly_degree(d->amplitude.growth.im)))
                                      : growth_degree(e, d->q, d->z);
    if (degree < 0 || (degree > 0 && degree >= d->l.at_infinity))
        return engine_fail(e, ERROR_UNSUITABLE, "the amplitude grows or oscillates as fast as the kernel at infinity");
    return TW_OK;
}

/* Poles of q off the poles of p. */
static tw_status read_poles(descent_problem *d)
{
    tw_engine *e = d->e;
    if (!d->amplitude.exact || (fmpq_poly_degree(d->amplitude.bottom.re) <= 0 && fmpq_poly_degree(d->amplitude.bottom.im) <= 0))
        return TW_OK;
    landscape poles; /* the poles of 1/bottom are those of q */
    expr *inverse = expr_int(e, 0), *i = expr_constant_of(e, CONSTANT_I);
    fmpq_t c;
    fmpq_init(c);
    for (int part = 0; part < 2; part++) {
        const fmpq_poly_struct *b = part ? d->amplitude.bottom.im : d->amplitude.bottom.re;
        for (slong k = 0; k <= fmpq_poly_degree(b); k++) {
            fmpq_poly_get_coeff_fmpq(c, b, k);
            expr *t = expr_mul(e, expr_fmpq(e, c), expr_pow(e, d->z, expr_int(e, k)));
            inverse = expr_add(e, inverse, part ? expr_mul(e, i, t) : t);
        }
    }
    fmpq_clear(c);
    if (!landscape_read(&poles, e, expr_pow(e, inverse, expr_int(e, -1)), d->z))
        return e->error.kind ? TW_ERROR : engine_fail(e, ERROR_UNSUITABLE, "the poles of the amplitude could not be isolated");
    tw_status status = TW_OK;
    d->poles = base_alloc((poles.count + 1) * sizeof *d->poles);
    for (size_t k = 0; k < poles.count && status == TW_OK; k++) {
        if (poles.spots[k].order >= 0)
            continue;
        bool known = false;
        for (size_t j = 0; j < d->l.count; j++) {
            if (!qqbar_equal(poles.spots[k].exact, d->l.spots[j].exact))
                continue;
            known = true;
            if (d->l.spots[j].order > 0)
                status = engine_fail(e, ERROR_UNSUITABLE, "the amplitude has a pole at a saddle");
        }
        if (known || status != TW_OK)
            continue;
        spot *s = d->poles + d->pole_count;
        if (landscape_spot(&d->l, s, poles.spots[k].exact, 0))
            d->pole_count++;
        else
            status = engine_fail(e, ERROR_UNSUITABLE, "a pole of the amplitude could not be placed");
    }
    landscape_clear(&poles);
    return status;
}

/* ---- the route ---- */

static void unit_of(acb_t out, tw_engine *e, expr *theta)
{
    expr *u = expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_constant_of(e, CONSTANT_I), theta));
    if (!u || ball_value(e, out, u, ROUTE_BITS) != TW_OK)
        acb_indeterminate(out);
}

/* Re of the leading part of p along the direction: +1 valley, -1 hill, 0 neither as far as balls see. */
static int slope_at_infinity(descent_problem *d, expr *theta)
{
    acb_t u, c;
    acb_init(u);
    acb_init(c);
    unit_of(u, d->e, theta);
    acb_pow_si(u, u, d->l.at_infinity, ROUTE_BITS);
    acb_div(c, acb_poly_get_coeff_ptr(d->l.top, acb_poly_length(d->l.top) - 1),
            acb_poly_get_coeff_ptr(d->l.bottom, acb_poly_length(d->l.bottom) - 1), ROUTE_BITS);
    acb_mul(c, c, u, ROUTE_BITS);
    int sign = arb_is_positive(acb_realref(c)) ? 1 : arb_is_negative(acb_realref(c)) ? -1 : 0;
    acb_clear(u);
    acb_clear(c);
    return sign;
}

/* On the ray from `start` in the direction theta the leading part of p is imaginary. May the ray be turned into the valley beside
 * it? p a polynomial, Re p >= 0 on the ray far out up to a constant (its real part there has all coefficients 0 or the first
 * nonzero one positive), and q rational of degree < degree of p - 1, so that the arc between vanishes. */
static bool may_turn(descent_problem *d, expr *start, expr *theta)
{
    tw_engine *e = d->e;
    const amplitude *q = &d->amplitude;
    if (!fmpq_poly_is_one(d->l.denominator.re) || !fmpq_poly_is_zero(d->l.denominator.im) || !q->exact)
        return false;
    slong degree = FLINT_MAX(fmpq_poly_degree(q->top.re), fmpq_poly_degree(q->top.im)) -
                   FLINT_MAX(fmpq_poly_degree(q->bottom.re), fmpq_poly_degree(q->bottom.im));
    if (!fmpq_poly_is_zero(q->growth.re) || !fmpq_poly_is_zero(q->growth.im) || degree >= d->l.at_infinity - 1)
        return false;
    expr *u = expr_fresh(e, "u"), *unit = expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_constant_of(e, CONSTANT_I), theta));
    expr *along = expr_expand(e, expr_substitute(e, d->p, d->z, expr_add(e, start, expr_mul(e, unit, u))));
    expr **c;
    slong top;
    if (!along || expr_polynomial(e, along, u, 60, &c, &top) != TW_OK)
        return false;
    bool fine = true, decided = false;
    for (slong k = top; k > 0 && fine && !decided; k--) {
        acb_t v;
        acb_init(v);
        expr *real = expr_add(e, c[k], expr_call1(e, FUNCTION_CONJ, c[k]));
        fine = real && ball_value(e, v, c[k], ROUTE_BITS) == TW_OK;
        if (fine && arb_is_positive(acb_realref(v)))
            decided = true;
        else if (fine && !arb_is_zero(acb_realref(v)))
            fine = value_is_zero(e, real) == ANSWER_YES;
        acb_clear(v);
    }
    free(c);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNDECIDED)
        engine_forgive(e);
    return fine;
}

/* The direction for end k: the typed one, or one turned into the valley beside it. */
static tw_status choose_direction(descent_problem *d, int k, expr *start, expr **theta)
{
    tw_engine *e = d->e;
    char *words = expr_text(e, d->points[k ? d->point_count - 1 : 0]);
    tw_status status = TW_OK;
    int slope = d->l.at_infinity > 0 ? slope_at_infinity(d, *theta) : 0;
    if (d->l.at_infinity <= 0)
        status = engine_fail(e, ERROR_UNSUITABLE, "the exponent does not grow towards %s: the kernel does not narrow there", words);
    else if (slope < 0)
        status = engine_fail(e, ERROR_DIVERGENT, "the integral diverges at %s: the path enters a hill of the exponent there", words);
    else if (slope == 0 && !may_turn(d, start, *theta))
        status = engine_fail(e, ERROR_UNDECIDED,
                             "towards %s the path runs along the border of a valley of the exponent, and it could not be turned into it",
                             words);
    else if (slope == 0) {
        expr *pi = expr_constant_of(e, CONSTANT_PI), *by = expr_mul(e, pi, expr_frac(e, 1, 2 * d->l.at_infinity));
        expr *left = expr_add(e, *theta, by), *right = expr_sub(e, *theta, by);
        *theta = slope_at_infinity(d, left) > 0 ? left : right;
        d->turned[k] = *theta;
        char *to = expr_text(e, *theta);
        record(d, "turn an end into the valley", "Jordan's lemma", NULL,
               "towards %s the kernel only oscillates; the end is turned to inf(%s), and the arc between vanishes because the amplitude "
               "is small beside z^%ld", words, to ? to : "", (long)d->l.at_infinity - 1);
        free(to);
    }
    free(words);
    return status;
}

static tw_status read_end(descent_problem *d, int k, expr *point)
{
    tw_engine *e = d->e;
    d->r.places[k] = point;
    acb_srcptr at = d->r.at + (k ? d->r.count - 1 : 0);
    for (size_t j = 0; j < d->l.count; j++)
        if (d->l.spots[j].order < 0 && acb_overlaps(d->l.spots[j].z, at))
            d->r.valley[k] = true;
    for (size_t j = 0; j < d->pole_count; j++)
        if (acb_overlaps(d->poles[j].z, at))
            return engine_fail(e, ERROR_DIVERGENT, "the integral diverges at an end of the path, where the amplitude has a pole");
    if (d->r.valley[k] || d->closed)
        return TW_OK;
    d->has_end[k] = landscape_point(&d->l, &d->ends[k], point);
    if (d->has_end[k])
        return TW_OK;
    spot_clear(&d->ends[k]);
    char *words = expr_text(e, point);
    engine_fail(e, ERROR_UNSUITABLE, "steepest descent takes end points a + b*i with rational a and b; %s is not", words ? words : "");
    free(words);
    return TW_ERROR;
}

/* A closed path may begin anywhere: on its first leg, at no special place, so that no corner is an end. */
static tw_status start_elsewhere(descent_problem *d)
{
    route r;
    acb_t move;
    acb_init(move);
    route_init(&r, d->r.count + 1);
    acb_sub(move, d->r.at + 1, d->r.at, ROUTE_BITS);
    acb_mul_si(move, move, 443, ROUTE_BITS);
    acb_mul_2exp_si(move, move, -10);
    acb_add(r.at, d->r.at, move, ROUTE_BITS);
    acb_get_mid(r.at, r.at);
    for (size_t k = 1; k < d->r.count; k++)
        acb_set(r.at + k, d->r.at + k);
    acb_set(r.at + d->r.count, r.at);
    acb_clear(move);
    route_clear(&d->r);
    d->r = r;
    return TW_OK;
}

static tw_status read_route(descent_problem *d)
{
    tw_engine *e = d->e;
    size_t from = angle_of(e, d->points[0]) ? 1 : 0, to = d->point_count - (angle_of(e, d->points[d->point_count - 1]) ? 1 : 0);
    if (to <= from)
        return engine_fail(e, ERROR_UNSUITABLE, "the path has no finite point");
    route_init(&d->r, to - from);
    d->read_r = true;
    tw_status status = TW_OK;
    for (size_t k = from; k < to && status == TW_OK; k++)
        if (ball_value(e, d->r.at + (k - from), d->points[k], ROUTE_BITS) != TW_OK || !acb_is_finite(d->r.at + (k - from)))
            status = e->error.kind ? TW_ERROR : engine_fail(e, ERROR_VALUE, "a point of the path has no finite value");
    d->closed = from == 0 && to == d->point_count && to > 1 && d->points[0] == d->points[to - 1];
    if (d->closed && status == TW_OK)
        status = start_elsewhere(d);
    for (int k = 0; k < 2 && status == TW_OK; k++) {
        expr *point = d->points[k ? d->point_count - 1 : 0], *theta = angle_of(e, point);
        d->r.infinite[k] = theta != NULL;
        if (theta) {
            status = choose_direction(d, k, d->points[k ? to - 1 : from], &theta);
            if (status == TW_OK)
                unit_of(d->r.toward[k], e, theta);
        } else {
            status = read_end(d, k, point);
        }
    }
    return status;
}

/* ---- the whole ---- */

tw_status descent_read(descent_problem *d, expr *integral)
{
    tw_engine *e = d->e;
    binder b;
    d->integral = integral;
    large_kind kind = facts_large(e, &d->large);
    if (kind == LARGE_NONE)
        return engine_fail(e, ERROR_UNSUITABLE, "no parameter is declared large or small: say for example `large s` first");
    d->small = kind == LARGE_SMALL;
    if (find_binder(d, &b) != TW_OK || list_points(d, &b) != TW_OK)
        return TW_ERROR;
    if (!expr_has(b.body, d->large))
        return engine_fail(e, ERROR_UNSUITABLE, "%s does not occur in the integrand: there is nothing to expand in", d->large->is.name);
    record(d, "as typed", NULL, integral, "an integral along a path in the complex plane");
    if (separate(d, &b) != TW_OK || balance(d, &b) != TW_OK || read_landscape(d) != TW_OK || read_amplitude(d) != TW_OK || read_poles(d) != TW_OK ||
        read_route(d) != TW_OK)
        return TW_ERROR;
    const spot *ends[2] = {d->has_end[0] ? &d->ends[0] : NULL, d->has_end[1] ? &d->ends[1] : NULL};
    bool found;
    char *why = NULL;
    d->read_found = true;
    tw_status status = thimbles_find(e, &d->found, &d->l, &d->r, ends, d->poles, d->pole_count, &found, &why);
    if (status == TW_OK && !found)
        status = engine_fail(e, ERROR_UNSUITABLE, "%s", why ? why : "the path could not be written as steepest curves");
    free(why);
    return status;
}
