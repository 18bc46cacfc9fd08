/* Reading an oscillating kernel: which factor holds the large parameter, its phase, and every point where the phase is
 * stationary. A point is found by its exact form; that there is no other is proved by branch and bound, interval by
 * interval. Knows no series. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/ball/growth.h"
#include "engine/method/phase.h"
#include "engine/method/scale.h"

void phase_reading_init(phase_reading *r)
{
    memset(r, 0, sizeof *r);
    fmpq_init(r->power);
    conditions_init(&r->conditions);
}

void phase_reading_clear(phase_reading *r)
{
    fmpq_clear(r->power);
    conditions_clear(&r->conditions);
}

static answer refuse(char **why, const char *words)
{
    free(*why);
    *why = base_copy(words);
    return ANSWER_NO;
}

static bool holds_i(expr *a)
{
    if (expr_is_constant(a, CONSTANT_I)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_i(a->args[k])) return true;
    return false;
}

/* ---- the kernel ---- */

static bool is_kernel(expr *f, expr *large, expr *x)
{
    if (f->kind != EXPR_CALL || !expr_has(f, large) || !expr_has(f, x)) return false;
    return f->is.function == FUNCTION_COS || f->is.function == FUNCTION_SIN ||
           (f->is.function == FUNCTION_EXP && holds_i(f->args[0]));
}

/* argument = large^power * p + rest, p and rest free of the large parameter. */
static bool split_argument(tw_engine *e, phase_reading *r, expr *argument, expr **rest)
{
    static const slong powers[][2] = {{1, 1}, {2, 1}, {1, 2}, {3, 1}, {3, 2}};
    expr *flat = expr_expand(e, argument), *moving = expr_int(e, 0);
    if (!flat) return false;
    *rest = expr_int(e, 0);
    expr *const *terms;
    size_t n = expr_terms(&flat, &terms);
    for (size_t k = 0; k < n; k++)
        if (expr_has(terms[k], r->large)) moving = expr_add(e, moving, terms[k]);
        else *rest = expr_add(e, *rest, terms[k]);
    for (size_t k = 0; k < sizeof powers / sizeof *powers; k++) {
        fmpq_set_si(r->power, r->small ? -powers[k][0] : powers[k][0], (ulong)powers[k][1]);
        expr *scale = expr_pow(e, r->large, expr_fmpq(e, r->power));
        r->p = normal_under_facts(e, expr_expand(e, expr_div(e, moving, scale)), &r->large, 1);
        if (r->p && !expr_has(r->p, r->large)) return expr_has(r->p, r->x);
    }
    return false;
}

static void add_part(phase_reading *r, phase_kernel kernel, expr *q)
{
    r->parts[r->part_count++] = (phase_part){kernel, q};
}

/* cos(scale p + rest) and its like: the rest goes into the amplitude. */
static void make_parts(tw_engine *e, phase_reading *r, function_id f, expr *rest, expr *q)
{
    expr *c = expr_call1(e, FUNCTION_COS, rest), *s = expr_call1(e, FUNCTION_SIN, rest);
    if (f == FUNCTION_EXP) {
        add_part(r, PHASE_EXP, expr_mul(e, q, expr_call1(e, FUNCTION_EXP, rest)));
    } else if (f == FUNCTION_COS) {
        add_part(r, PHASE_COS, expr_mul(e, q, c));
        if (!expr_is_zero(rest)) add_part(r, PHASE_SIN, expr_neg(e, expr_mul(e, q, s)));
    } else {
        add_part(r, PHASE_SIN, expr_mul(e, q, c));
        if (!expr_is_zero(rest)) add_part(r, PHASE_COS, expr_mul(e, q, s));
    }
}

static answer read_kernel(tw_engine *e, phase_reading *r, expr *body, char **why)
{
    expr *const *factors;
    size_t n = expr_factors(&body, &factors);
    expr *kernel = NULL, *q = expr_int(e, 1), *rest;
    for (size_t k = 0; k < n; k++) {
        if (is_kernel(factors[k], r->large, r->x)) {
            if (kernel)
                return refuse(why, "two factors oscillate with the large parameter: write their product as a sum");
            kernel = factors[k];
        } else if (!expr_has(factors[k], r->x)) {
            r->outside = expr_mul(e, r->outside, factors[k]);
        } else {
            q = expr_mul(e, q, factors[k]);
        }
    }
    if (!kernel) return ANSWER_NO;
    if (expr_has(q, r->large)) return refuse(why, "the amplitude holds the large parameter");
    expr *argument = kernel->args[0];
    if (kernel->is.function == FUNCTION_EXP)
        argument = expr_expand(e, expr_neg(e, expr_mul(e, expr_constant_of(e, CONSTANT_I), argument)));
    if (!argument || !split_argument(e, r, argument, &rest))
        return refuse(why, "the phase is no power of the large parameter times a function of the variable");
    if (holds_i(r->p)) return refuse(why, "the phase is not real on the path: that is a task for `descent`");
    if (kernel->is.function == FUNCTION_EXP) rest = expr_expand(e, expr_mul(e, expr_constant_of(e, CONSTANT_I), rest));
    make_parts(e, r, kernel->is.function, rest, q);
    for (size_t k = 0; k < r->part_count; k++)
        r->parts[k].q = normal_under_facts(e, r->parts[k].q, NULL, 0);
    return ANSWER_YES;
}

static answer open_integral(tw_engine *e, phase_reading *r, expr *integral, expr **body)
{
    expr *const *factors;
    size_t n = expr_factors(&integral, &factors);
    expr *binder = NULL;
    r->integral = integral;
    r->outside = expr_int(e, 1);
    large_kind kind = facts_large(e, &r->large);
    if (kind == LARGE_NONE) return ANSWER_NO;
    r->small = kind == LARGE_SMALL;
    for (size_t k = 0; k < n; k++) {
        if (factors[k]->kind != EXPR_INTEGRAL) r->outside = expr_mul(e, r->outside, factors[k]);
        else if (binder) return ANSWER_NO;
        else binder = factors[k];
    }
    if (!binder || !r->outside) return ANSWER_NO;
    r->x = expr_fresh(e, expr_binder_name(binder));
    r->variable = expr_symbol(e, expr_binder_name(binder));
    r->from = binder->args[0];
    r->to = binder->args[1];
    *body = expr_open(e, binder, r->x);
    return *body && !expr_has(r->from, r->large) && !expr_has(r->to, r->large) ? ANSWER_YES : ANSWER_NO;
}

/* ---- stationary points ---- */

static bool number_of(tw_engine *e, expr *f, arb_t out)
{
    acb_t v;
    acb_init(v);
    bool ok = f && ball_value(e, v, f, 128) == TW_OK && acb_is_finite(v) && arb_contains_zero(acb_imagref(v));
    arb_set(out, acb_realref(v));
    acb_clear(v);
    if (!ok) engine_forgive(e);
    return ok;
}

/* 1: f > from and f < to, known by balls. */
static bool lies_inside(tw_engine *e, const phase_reading *r, expr *f)
{
    arb_t x, a;
    arb_init(x);
    arb_init(a);
    bool ok = number_of(e, f, x);
    if (ok && !expr_is_minus_inf(r->from)) ok = number_of(e, r->from, a) && arb_gt(x, a);
    if (ok && !expr_is_inf(r->to)) ok = number_of(e, r->to, a) && arb_lt(x, a);
    arb_clear(x);
    arb_clear(a);
    return ok;
}

static bool add_point(tw_engine *e, phase_reading *r, expr *place)
{
    arb_t x, y;
    arb_init(x);
    arb_init(y);
    bool ok = r->point_count < PHASE_POINTS && number_of(e, place, x);
    size_t at = r->point_count;
    for (size_t k = 0; ok && k < r->point_count; k++) {
        if (r->points[k] == place) at = SIZE_MAX; /* there already */
        else if (at != SIZE_MAX && number_of(e, r->points[k], y) && arb_lt(x, y) && k < at) at = k;
    }
    if (ok && at != SIZE_MAX) {
        memmove(r->points + at + 1, r->points + at, (r->point_count - at) * sizeof *r->points);
        r->points[at] = place;
        r->point_count++;
    }
    arb_clear(x);
    arb_clear(y);
    return ok;
}

/* The real roots of an irreducible factor. */
static bool add_roots(tw_engine *e, phase_reading *r, const fmpz_poly_t f)
{
    slong degree = fmpz_poly_degree(f);
    fmpz_t a, b, c;
    fmpz_init(a);
    fmpz_init(b);
    fmpz_init(c);
    fmpz_poly_get_coeff_fmpz(c, f, 0);
    fmpz_poly_get_coeff_fmpz(b, f, 1);
    fmpz_poly_get_coeff_fmpz(a, f, 2);
    bool ok = true;
    if (degree == 1) {
        expr *root = expr_neg(e, expr_div(e, expr_fmpz(e, c), expr_fmpz(e, b)));
        if (lies_inside(e, r, root)) ok = add_point(e, r, root);
    } else if (degree == 2) {
        expr *A = expr_fmpz(e, a), *B = expr_fmpz(e, b), *C = expr_fmpz(e, c);
        expr *square = expr_sub(e, expr_mul(e, B, B), expr_product(e, (expr *[]){expr_int(e, 4), A, C}, 3));
        bool real = square && expr_is_number(square) && fmpq_sgn(expr_number(square)) > 0;
        for (int sign = -1; sign <= 1 && real; sign += 2) {
            expr *root = expr_add(e, expr_neg(e, B), expr_mul(e, expr_int(e, sign), expr_sqrt(e, square)));
            root = expr_expand(e, expr_div(e, root, expr_mul(e, expr_int(e, 2), A)));
            if (lies_inside(e, r, root)) ok = ok && add_point(e, r, root);
        }
    } else {
        acb_ptr roots = _acb_vec_init(degree);
        arb_fmpz_poly_complex_roots(roots, f, 0, 128);
        expr *v = expr_fresh(e, "r"), *poly = expr_int(e, 0);
        for (slong k = 0; k <= degree; k++) {
            fmpz_poly_get_coeff_fmpz(a, f, k);
            poly = expr_add(e, poly, expr_mul(e, expr_fmpz(e, a), expr_pow(e, v, expr_int(e, k))));
        }
        for (slong k = 0; k < degree && ok; k++) {
            if (!arb_is_zero(acb_imagref(roots + k))) continue;
            fmpq_t near;
            arf_t rounded;
            fmpq_init(near);
            arf_init(rounded);
            arf_set_round(rounded, arb_midref(acb_realref(roots + k)), 40, ARF_RND_NEAR);
            arf_get_fmpq(near, rounded);
            expr *root = expr_root(e, v, poly, expr_fmpq(e, near));
            if (lies_inside(e, r, root)) ok = add_point(e, r, root);
            fmpq_clear(near);
            arf_clear(rounded);
        }
        _acb_vec_clear(roots, degree);
    }
    fmpz_clear(a);
    fmpz_clear(b);
    fmpz_clear(c);
    return ok;
}

/* The slope as a polynomial with rational coefficients: all its roots in the range. */
static bool add_polynomial_roots(tw_engine *e, phase_reading *r, expr *slope, bool *is_polynomial)
{
    expr **x;
    slong degree;
    *is_polynomial = expr_polynomial(e, expr_expand(e, slope), r->x, 60, &x, &degree) == TW_OK;
    if (!*is_polynomial) return true;
    fmpq_poly_t p;
    fmpz_poly_t f;
    fmpz_poly_factor_t parts;
    fmpq_poly_init(p);
    fmpz_poly_init(f);
    fmpz_poly_factor_init(parts);
    bool ok = true;
    for (slong k = 0; k <= degree; k++) {
        *is_polynomial = *is_polynomial && expr_is_number(x[k]);
        if (*is_polynomial) fmpq_poly_set_coeff_fmpq(p, k, expr_number(x[k]));
    }
    free(x);
    if (*is_polynomial && degree > 0) {
        fmpq_poly_get_numerator(f, p);
        fmpz_poly_factor(parts, f);
        for (slong k = 0; k < parts->num && ok; k++) ok = add_roots(e, r, parts->p + k);
    }
    fmpq_poly_clear(p);
    fmpz_poly_clear(f);
    fmpz_poly_factor_clear(parts);
    return ok;
}

/* A simple exact form of a place near x at which f vanishes identically: rationals, multiples of pi. */
static expr *recognise(tw_engine *e, expr *f, expr *x, double at)
{
    for (int kind = 0; kind < 2; kind++)
        for (slong d = 1; d <= 24; d++) {
            double unit = kind ? M_PI / (double)d : 1 / (double)d, n = rint(at / unit);
            if (fabs(n * unit - at) > 1e-9 * (1 + fabs(at)) || fabs(n) > 1e6) continue;
            expr *place = expr_frac(e, (slong)n, d);
            if (kind) place = expr_mul(e, place, expr_constant_of(e, CONSTANT_PI));
            expr *value = expr_substitute(e, f, x, place);
            value = value ? expr_expand(e, value) : NULL;
            if (value && expr_is_zero(value)) return place;
            engine_forgive(e);
        }
    return NULL;
}

static double value_at(tape *values, double x)
{
    acb_t z, v;
    acb_init(z);
    acb_init(v);
    arb_set_d(acb_realref(z), x);
    tape_eval(v, values, z, false, 64);
    double out = acb_is_finite(v) ? arf_get_d(arb_midref(acb_realref(v)), ARF_RND_NEAR) : NAN;
    acb_clear(z);
    acb_clear(v);
    return out;
}

/* Sign changes of the slope among samples, each brought to an exact form. */
static answer add_sampled_points(tw_engine *e, phase_reading *r, expr *slope, char **why)
{
    enum { SAMPLES = 800 };
    arb_t x;
    arb_init(x);
    double a = -INFINITY, b = INFINITY, last = NAN, last_at = 0;
    if (!expr_is_minus_inf(r->from) && number_of(e, r->from, x)) a = arf_get_d(arb_midref(x), ARF_RND_NEAR);
    if (!expr_is_inf(r->to) && number_of(e, r->to, x)) b = arf_get_d(arb_midref(x), ARF_RND_NEAR);
    arb_clear(x);
    tape *values = tape_new(e, slope, &r->x, 1);
    answer out = values ? ANSWER_YES : ANSWER_NO;
    for (int k = 1; k < SAMPLES && out == ANSWER_YES; k++) {
        double t = (double)k / SAMPLES, u = tan(M_PI * (t - 0.5));
        double at = isfinite(a) && isfinite(b) ? a + (b - a) * t
                  : isfinite(a) ? a + t / (1 - t) : isfinite(b) ? b - (1 - t) / t : u;
        double v = value_at(values, at);
        if (isnan(v)) continue;
        if (v == 0 || (!isnan(last) && (v > 0) != (last > 0))) {
            double low = last_at, high = at, side = last;
            for (int j = 0; j < 100 && v != 0; j++) {
                double middle = 0.5 * (low + high), m = value_at(values, middle);
                if (m == 0) low = high = middle;
                else if ((m > 0) == (side > 0)) low = middle;
                else high = middle;
            }
            expr *place = recognise(e, slope, r->x, v == 0 ? at : 0.5 * (low + high));
            if (!place || !lies_inside(e, r, place) || !add_point(e, r, place))
                out = refuse(why, "no exact form was found for a stationary point of the phase");
            if (v == 0) v = NAN;
        }
        last = v;
        last_at = at;
    }
    tape_free(values);
    return out;
}

/* The sign of the slope on (a, b), proved: 1, -1; 0 not known. */
static int sign_between(tw_engine *e, expr *slope, expr *x, expr *a, expr *b)
{
    if (expr_is_minus_inf(a) && expr_is_inf(b)) { /* from the middle both ways */
        expr *zero = expr_int(e, 0), *value = expr_substitute(e, slope, x, zero);
        int here = value ? decide_sign(e, value) : 2, right = sign_between(e, slope, x, zero, b);
        int left = sign_between(e, slope, x, a, zero);
        return here == right && left == right ? right : 0;
    }
    if (expr_is_minus_inf(a)) {
        slope = expr_substitute(e, slope, x, expr_neg(e, x));
        a = expr_neg(e, b);
        b = expr_constant_of(e, CONSTANT_INF);
    }
    if (!slope) return 0;
    if (decide_positive_on(e, slope, x, a, b, false) == ANSWER_YES) return 1;
    if (decide_positive_on(e, expr_neg(e, slope), x, a, b, false) == ANSWER_YES) return -1;
    return 0;
}

static answer find_points(tw_engine *e, phase_reading *r, char **why)
{
    expr *slope = expr_derivative(e, r->p, r->x);
    bool polynomial = false;
    if (!slope) return ANSWER_NO;
    expr **symbols;
    size_t n = expr_symbols(r->p, &symbols);
    free(symbols);
    if (n != 1) return refuse(why, "the phase holds a parameter: give it a value");
    if (!add_polynomial_roots(e, r, slope, &polynomial)) return refuse(why, "too many stationary points");
    if (!polynomial && add_sampled_points(e, r, slope, why) != ANSWER_YES) return ANSWER_NO;
    for (size_t k = 0; k < r->point_count; k++) r->stationary[k] = true;
    bool low = !expr_is_minus_inf(r->from), high = !expr_is_inf(r->to);
    if (low) {
        memmove(r->points + 1, r->points, r->point_count * sizeof *r->points);
        memmove(r->stationary + 1, r->stationary, r->point_count * sizeof *r->stationary);
        r->points[0] = r->from;
        r->stationary[0] = false;
        r->point_count++;
    }
    if (high) {
        r->stationary[r->point_count] = false;
        r->points[r->point_count++] = r->to;
    }
    for (size_t k = 0; k <= r->point_count; k++) {
        if ((k == 0 && low) || (k == r->point_count && high)) continue;
        expr *a = k ? r->points[k - 1] : r->from, *b = k < r->point_count ? r->points[k] : r->to;
        r->signs[k] = sign_between(e, slope, r->x, a, b);
        engine_forgive(e);
        if (!r->signs[k])
            return refuse(why, "it could not be proved that the phase has no other stationary point on the path");
    }
    return ANSWER_YES;
}

/* ---- what lies between ---- */

/* Is f analytic on the box x +- r, by one ball? */
static bool is_good(tape *values, double from, double to)
{
    acb_t x, v;
    acb_init(x);
    acb_init(v);
    arb_set_d(acb_realref(x), 0.5 * (from + to));
    /* room for the rounding of the middle: neighbouring boxes leave no gap */
    mag_set_d(arb_radref(acb_realref(x)), 0.5 * (to - from) * (1 + 1e-12) + 0x1p-50 * fmax(fabs(from), fabs(to)));
    tape_eval(v, values, x, true, 64);
    bool good = acb_is_finite(v);
    acb_clear(x);
    acb_clear(v);
    return good;
}

/* f analytic all over [from, to]: halved where one ball does not see it. */
static bool is_smooth_on(tw_engine *e, tape *values, double from, double to, int depth, slong *work)
{
    if (is_good(values, from, to)) return true;
    if (depth == 40 || --*work < 0 || !budget_ok(e)) return false;
    double middle = 0.5 * (from + to);
    return is_smooth_on(e, values, from, middle, depth + 1, work) &&
           is_smooth_on(e, values, middle, to, depth + 1, work);
}

/* Analytic for all x >= 2^20, by a record. */
static bool is_smooth_far_out(tw_engine *e, expr *f, expr *x)
{
    growth_program *t = growth_compile(e, f, x);
    growth_bound g;
    acb_t one;
    arf_t X;
    growth_bound_init(&g);
    acb_init(one);
    arf_init(X);
    acb_one(one);
    arf_set_ui(X, 1 << 20);
    bool smooth = t != NULL;
    if (smooth) growth_turn(t, one);
    smooth = smooth && growth_run(t, &g, X);
    growth_free(t);
    growth_bound_clear(&g);
    acb_clear(one);
    arf_clear(X);
    return smooth;
}

/* f analytic inside (from, to), but for a little next to the finite ends, where its series speaks for it. */
static bool is_smooth(tw_engine *e, const phase_reading *r, expr *f)
{
    double a = -0x1p20, b = 0x1p20;
    arb_t v;
    arb_init(v);
    bool low = !expr_is_minus_inf(r->from), high = !expr_is_inf(r->to), smooth = true;
    if (low && (smooth = number_of(e, r->from, v))) a = arf_get_d(arb_midref(v), ARF_RND_NEAR);
    if (high && smooth && (smooth = number_of(e, r->to, v))) b = arf_get_d(arb_midref(v), ARF_RND_NEAR);
    arb_clear(v);
    tape *values = smooth ? tape_new(e, f, &r->x, 1) : NULL;
    slong work = 20000;
    double margin = 0x1p-20 * fmin(1, b - a);
    smooth = values && is_smooth_on(e, values, low ? a + margin : a, high ? b - margin : b, 0, &work);
    tape_free(values);
    if (smooth && !high) smooth = is_smooth_far_out(e, f, r->x);
    if (smooth && !low) smooth = is_smooth_far_out(e, expr_substitute(e, f, r->x, expr_neg(e, r->x)), r->x);
    if (e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE) engine_forgive(e);
    return smooth;
}

/* Amplitude and phase; other parameters than the variable must have no part in it. */
static answer check_smoothness(tw_engine *e, phase_reading *r, char **why)
{
    for (size_t k = 0; k <= r->part_count; k++) {
        expr *f = k < r->part_count ? r->parts[k].q : r->p;
        expr **symbols;
        size_t n = expr_symbols(f, &symbols);
        free(symbols);
        if (n > 1 || (n == 1 && !expr_has(f, r->x))) {
            conditions_add(&r->conditions, "the amplitude is analytic on the path", NULL, CONDITION_OPEN);
            continue;
        }
        if (n == 1 && !is_smooth(e, r, f))
            return refuse(why, "the amplitude or the phase is not seen to be analytic inside the path: split the "
                               "integral where it changes and expand the parts");
    }
    return ANSWER_YES;
}

/* ---- the whole ---- */

static answer find_direction(tw_engine *e, phase_reading *r, char **why)
{
    bool down = expr_is_inf(r->from) || expr_is_minus_inf(r->to);
    if (!down && !expr_is_minus_inf(r->from) && !expr_is_inf(r->to)) {
        arb_t a, b;
        arb_init(a);
        arb_init(b);
        bool known = number_of(e, r->from, a) && number_of(e, r->to, b);
        bool up = known && arb_lt(a, b);
        down = known && arb_gt(a, b);
        arb_clear(a);
        arb_clear(b);
        if (!up && !down) return refuse(why, "the ends of the path need values");
    }
    if (down) {
        expr *swap = r->from;
        r->from = r->to;
        r->to = swap;
        r->outside = expr_neg(e, r->outside);
    }
    return ANSWER_YES;
}

answer phase_read(tw_engine *e, phase_reading *r, expr *integral, char **why)
{
    expr *body;
    *why = NULL;
    answer a = open_integral(e, r, integral, &body);
    if (a == ANSWER_YES) a = read_kernel(e, r, body, why);
    if (a == ANSWER_YES) a = find_direction(e, r, why);
    if (a == ANSWER_YES) a = check_smoothness(e, r, why);
    if (a == ANSWER_YES) a = find_points(e, r, why);
    error_kind kind = e->error.kind;
    if (kind == ERROR_TIME || kind == ERROR_MEMORY || kind == ERROR_INTERRUPT) return ANSWER_NO;
    engine_forgive(e);
    return a;
}

bool phase_summary(tw_engine *e, text *out, expr *integral)
{
    phase_reading r;
    char *why = NULL;
    phase_reading_init(&r);
    bool yes = phase_read(e, &r, integral, &why) == ANSWER_YES;
    if (yes) text_add(out, "; the kernel oscillates; critical points: ");
    for (size_t k = 0; k < r.point_count && yes; k++) {
        text_addf(out, "%s%s%s = ", k ? ", " : "", r.stationary[k] ? "" : "the end ", r.variable->is.name);
        expr_print(e, out, r.points[k]);
        if (r.stationary[k]) text_add(out, " (stationary)");
    }
    if (!yes && why) text_addf(out, "; the kernel oscillates, but %s", why);
    yes = yes || why;
    free(why);
    phase_reading_clear(&r);
    return yes;
}
