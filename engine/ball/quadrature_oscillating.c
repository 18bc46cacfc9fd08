/* Oscillating integrands: taken apart into waves Q exp(L), each wave's range cut at the stationary points of its phase,
 * each interval turned into the complex plane along a proved path. What comes out is a list of legs, integrals in a
 * real variable, for quadrature.c to add up; no leg is integrated here.
 *
 * The one idea: where the phase grows the wave decays above the real axis, where it falls, below. Cosines and sines
 * of a real integrand need one of their two exponentials only, and the real part. An even integrand is taken over
 * the whole line, where nothing is left at the end 0 that would have to cancel. */
#include "engine/ball/quadrature_oscillating.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/sign.h"

enum { PIVOT_LIMIT = 64, SAMPLE_LIMIT = 1200, FEW_RADIANS = 60, MANY_RADIANS = 1000, SIGNIFICANT_BITS = 64 };

void quad_legs_add(quad_legs *legs, quad_leg leg)
{
    if (legs->count == legs->room) {
        legs->room = legs->room ? 2 * legs->room : 16;
        legs->list = base_resize(legs->list, legs->room * sizeof *legs->list);
    }
    legs->list[legs->count++] = leg;
}

void quad_legs_free(quad_legs *legs)
{
    free(legs->list);
    *legs = (quad_legs){0};
}

/* ---- a wave in numbers ---- */

static void wave_clear(quad_wave *w)
{
    tape_free(w->values_Q);
    tape_free(w->values_L);
    tape_free(w->values_slope);
}

/* The term about base: x = base + z. */
static bool wave_init(quad_wave *w, const wave_range *r, const quad_term *t, expr *base)
{
    tw_engine *e = r->e;
    *w = (quad_wave){.e = e, .z = expr_fresh(e, "z")};
    expr *place = expr_add(e, base, w->z), *phase = expr_mul(e, quad_imaginary(e, -1, 1), t->L);
    w->pure = quad_is_real(r, phase ? expr_expand(e, phase) : NULL);
    w->Q = expr_substitute(e, t->Q, r->x, place);
    w->L = expr_substitute(e, t->L, r->x, place);
    w->L = w->L ? expr_expand(e, w->L) : NULL;
    w->slope = w->L ? expr_derivative(e, w->L, w->z) : NULL;
    w->values_Q = w->Q ? tape_new(e, w->Q, &w->z, 1) : NULL;
    w->values_L = w->L ? tape_new(e, w->L, &w->z, 1) : NULL;
    w->values_slope = w->slope ? tape_new(e, w->slope, &w->z, 1) : NULL;
    return w->values_Q && w->values_L && w->values_slope;
}

static void set_point(acb_t z, double x, double y)
{
    arb_set_d(acb_realref(z), x);
    arb_set_d(acb_imagref(z), y);
}

double quad_wave_height(const quad_wave *w, double x, double y)
{
    acb_t z, v;
    mag_t m;
    acb_init(z);
    acb_init(v);
    mag_init(m);
    set_point(z, x, y);
    tape_eval(v, w->values_L, z, false, 64);
    double out = acb_is_finite(v) ? arf_get_d(arb_midref(acb_realref(v)), ARF_RND_NEAR) * 1.4426950408889634 : NAN;
    tape_eval(v, w->values_Q, z, false, 64);
    acb_get_mag(m, v);
    out = !acb_is_finite(v) ? NAN : mag_is_zero(m) ? -1e300 : out + mag_get_d_log2_approx(m);
    acb_clear(z);
    acb_clear(v);
    mag_clear(m);
    return out;
}

static bool value_at(const quad_wave *w, tape *values, double x, double y, double *re, double *im)
{
    (void)w;
    acb_t z, v;
    acb_init(z);
    acb_init(v);
    set_point(z, x, y);
    tape_eval(v, values, z, false, 64);
    bool ok = acb_is_finite(v);
    *re = arf_get_d(arb_midref(acb_realref(v)), ARF_RND_NEAR);
    *im = arf_get_d(arb_midref(acb_imagref(v)), ARF_RND_NEAR);
    acb_clear(z);
    acb_clear(v);
    return ok;
}

bool quad_wave_slope(const quad_wave *w, double x, double y, double *re, double *im)
{
    return value_at(w, w->values_slope, x, y, re, im);
}

/* ---- samples of the phase along the range ---- */

typedef struct axis {
    double at[SAMPLE_LIMIT];
    size_t count;
} axis;

static void axis_add(axis *s, double x)
{
    if (s->count < SAMPLE_LIMIT)
        s->at[s->count++] = x;
}

static int by_place(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

/* Points inside (a, b), in growing order. */
static void axis_fill(axis *s, double a, double b)
{
    s->count = 0;
    if (isfinite(a) && isfinite(b)) {
        for (int k = 1; k < 256; k++)
            axis_add(s, a + (b - a) * k / 256);
        for (int j = 9; j < 48; j++) {
            axis_add(s, a + (b - a) * exp2(-j));
            axis_add(s, b - (b - a) * exp2(-j));
        }
    } else {
        for (int side = -1; side <= 1; side += 2) {
            if ((side < 0 && isfinite(a)) || (side > 0 && isfinite(b)))
                continue;
            double origin = side > 0 && isfinite(a) ? a : side < 0 && isfinite(b) ? b : 0;
            for (int j = -80; j <= 80; j++)
                axis_add(s, origin + side * exp2(0.5 * j));
            for (int k = 1; k < 128; k++)
                axis_add(s, origin + side * k * 0.109375);
        }
    }
    qsort(s->at, s->count, sizeof *s->at, by_place);
}

/* Radians that the phase turns through where the wave has not died away; infinite where it never does. */
static double radians(const quad_wave *w, const axis *s, bool low, bool high)
{
    double best = -INFINITY, total = 0, re, im, last = NAN;
    double *height = base_alloc((s->count + 1) * sizeof *height);
    for (size_t k = 0; k < s->count; k++) {
        height[k] = quad_wave_height(w, s->at[k], 0) + log2(fabs(s->at[k]) + 1e-30);
        if (height[k] > best)
            best = height[k];
    }
    for (size_t k = 0; k < s->count; k++) {
        if (height[k] < best - SIGNIFICANT_BITS || isnan(height[k]) ||
                !value_at(w, w->values_L, s->at[k], 0, &re, &im)) {
            last = NAN;
            continue;
        }
        if (!isnan(last))
            total += fabs(im - last);
        last = im;
        if ((k == 0 && !low) || (k + 1 == s->count && !high))
            total = INFINITY;
    }
    free(height);
    return total;
}

static double bisect(const quad_wave *w, double a, double b)
{
    double re, at_a, im;
    quad_wave_slope(w, a, 0, &re, &at_a);
    for (int k = 0; k < 80; k++) {
        double m = 0.5 * (a + b);
        if (m <= fmin(a, b) || m >= fmax(a, b) || !quad_wave_slope(w, m, 0, &re, &im))
            break;
        if (im == 0)
            return m;
        if ((im > 0) == (at_a > 0))
            a = m;
        else
            b = m;
    }
    double m = 0.5 * (a + b);
    for (int k = 0; k <= 12; k++) { /* a simple number nearby is meant */
        double near = ldexp(rint(ldexp(m, k)), -k);
        if (fabs(near - m) < 1e-12 * (1 + fabs(m)))
            return near;
    }
    return m;
}

/* The places inside where the phase turns round; *first: the sign of its slope before the first. false: too many. */
static bool find_pivots(const quad_wave *w, const axis *s, double *pivots, size_t *count, int *first)
{
    double re, im, last_at = 0;
    int last = 0;
    *count = 0;
    *first = 0;
    for (size_t k = 0; k < s->count; k++) {
        if (!quad_wave_slope(w, s->at[k], 0, &re, &im) || im == 0)
            continue;
        int sign = im > 0 ? 1 : -1;
        if (!last)
            *first = sign;
        if (last && sign != last) {
            if (*count == PIVOT_LIMIT)
                return false;
            pivots[(*count)++] = bisect(w, last_at, s->at[k]);
        }
        last = sign;
        last_at = s->at[k];
    }
    return *first != 0;
}

/* ---- from paths to legs ---- */

static expr *exact(tw_engine *e, double x)
{
    arf_t a;
    fmpq_t q;
    arf_init(a);
    fmpq_init(q);
    arf_set_d(a, x);
    arf_get_fmpq(q, a);
    expr *out = expr_fmpq(e, q);
    arf_clear(a);
    fmpq_clear(q);
    return out;
}

static expr *complex_number(tw_engine *e, double re, double im)
{
    return expr_add(e, exact(e, re), expr_mul(e, exact(e, im), expr_constant_of(e, CONSTANT_I)));
}

/* The wave along place + direction y. */
static bool add_leg(quad_legs *legs, const quad_wave *w, expr *place, expr *direction, expr *length, bool endless,
                    slong factor, bool real)
{
    tw_engine *e = w->e;
    if (!place || !direction || (!length && !endless))
        return false;
    expr *y = expr_fresh(e, "y"), *z = expr_add(e, place, expr_mul(e, direction, y));
    expr *Q = expr_substitute(e, w->Q, w->z, z), *L = expr_substitute(e, w->L, w->z, z);
    L = L ? expr_expand(e, L) : NULL;
    expr *factors[] = {direction, Q, expr_call1(e, FUNCTION_EXP, L)};
    quad_leg leg = {.f = expr_product(e, factors, 3), .y = y, .length = endless ? NULL : length, .factor = factor,
                    .real = real};
    if (!leg.f)
        return false;
    quad_legs_add(legs, leg);
    return true;
}

static bool add_loop(quad_legs *legs, const quad_wave *w, const quad_loop *b, slong factor, bool real)
{
    tw_engine *e = w->e;
    expr *width = expr_sub(e, exact(e, b->right), exact(e, b->left));
    expr *height = expr_sub(e, exact(e, b->high), exact(e, b->low));
    return add_leg(legs, w, complex_number(e, b->left, b->low), expr_int(e, 1), width, false, factor, real) &&
           add_leg(legs, w, complex_number(e, b->right, b->low), quad_imaginary(e, 1, 1), height, false, factor,
                   real) &&
           add_leg(legs, w, complex_number(e, b->right, b->high), expr_int(e, -1), width, false, factor, real) &&
           add_leg(legs, w, complex_number(e, b->left, b->high), quad_imaginary(e, -1, 1), height, false, factor, real);
}

static bool add_path(quad_legs *legs, const quad_wave *w, const quad_path *p, const quad_loops *loops, slong factor,
                     bool real)
{
    tw_engine *e = w->e;
    bool low = isfinite(p->a), high = isfinite(p->b), ok;
    double up = p->flat ? 0 : p->side, left = p->flat ? 1 : p->slope_a, right = p->flat ? 1 : p->slope_b;
    expr *to_left = complex_number(e, -(low || high ? p->slope_b : left), up);
    expr *to_right = complex_number(e, low || high ? p->slope_a : right, up);
    if (low && high) {
        expr *height = exact(e, p->height), *start = expr_add(e, p->A, expr_expand(e, expr_mul(e, to_right, height)));
        expr *inset = expr_mul(e, height, expr_add(e, exact(e, p->slope_a), exact(e, p->slope_b)));
        expr *across = expr_sub(e, expr_sub(e, p->B, p->A), inset);
        ok = add_leg(legs, w, p->A, to_right, height, false, factor, real) &&
             add_leg(legs, w, start, expr_int(e, 1), across, false, factor, real) &&
             add_leg(legs, w, p->B, to_left, height, false, -factor, real);
    } else if (low) {
        ok = add_leg(legs, w, p->A, to_right, NULL, true, factor, real);
    } else if (high) {
        ok = add_leg(legs, w, p->B, to_left, NULL, true, -factor, real);
    } else {
        expr *apex = complex_number(e, p->apex, p->side * p->height);
        ok = add_leg(legs, w, apex, to_left, NULL, true, -factor, real) &&
             add_leg(legs, w, apex, to_right, NULL, true, factor, real);
    }
    for (size_t k = 0; ok && k < loops->count; k++)
        ok = add_loop(legs, w, &loops->list[k], -factor * loops->list[k].winding, real);
    return ok;
}

/* ---- one wave over the range ---- */

typedef struct turning {
    quad_legs *legs;
    bool real;
    quad_verdict verdict;
} turning;

static bool turn_intervals(turning *t, const quad_wave *w, expr *A, expr *B, double a, double b, const double *pivots,
                           size_t count, int sign)
{
    quad_loops *loops = base_alloc(sizeof *loops);
    bool ok = true;
    for (size_t k = 0; ok && k <= count && budget_ok(w->e); k++, sign = -sign) {
        quad_path p = {.a = k ? pivots[k - 1] : a, .b = k < count ? pivots[k] : b, .side = sign};
        p.A = k ? exact(w->e, p.a) : A;
        p.B = k < count ? exact(w->e, p.b) : B;
        t->verdict = quad_path_find(w, &p, loops);
        ok = t->verdict == QUAD_PROVED && add_path(t->legs, w, &p, loops, 1, t->real);
    }
    free(loops);
    return ok;
}

static double real_value(tw_engine *e, expr *f)
{
    acb_t v;
    acb_init(v);
    double out = ball_value(e, v, f, 64) == TW_OK ? arf_get_d(arb_midref(acb_realref(v)), ARF_RND_NEAR) : NAN;
    acb_clear(v);
    return out;
}

static expr *base_of(const wave_range *r)
{
    return r->low ? r->from : r->high ? r->to : expr_int(r->e, 0);
}

static void double_range(const wave_range *r, double *a, double *b)
{
    *a = r->low ? 0 : -INFINITY;
    *b = !r->high ? INFINITY : r->low ? real_value(r->e, expr_sub(r->e, r->to, r->from)) : 0;
}

static bool turn_wave(turning *t, const wave_range *r, const quad_term *part)
{
    quad_wave w;
    axis *s = base_alloc(sizeof *s);
    double pivots[PIVOT_LIMIT], a, b;
    size_t count = 0;
    int first = 0;
    double_range(r, &a, &b);
    t->verdict = QUAD_SINGULAR;
    bool ok = wave_init(&w, r, part, base_of(r)) && b > a;
    if (ok) {
        axis_fill(s, a, b);
        ok = find_pivots(&w, s, pivots, &count, &first);
    }
    if (ok) {
        expr *zero = expr_int(r->e, 0);
        expr *A = r->low ? zero : NULL, *B = !r->high ? NULL : r->low ? expr_sub(r->e, r->to, r->from) : zero;
        ok = turn_intervals(t, &w, A, B, a, b, pivots, count, first);
    }
    wave_clear(&w);
    free(s);
    return ok;
}

/* ---- the whole integrand ---- */

static bool turn_terms(turning *t, const wave_range *r, const quad_terms *list)
{
    for (size_t k = 0; k < list->count && !r->e->error.kind; k++) {
        if (list->list[k].L) {
            if (!turn_wave(t, r, &list->list[k]))
                return false;
        } else if (!expr_is_zero(list->list[k].Q)) {
            quad_legs_add(t->legs, (quad_leg){.f = list->list[k].Q, .y = r->x, .from = r->from, .to = r->to,
                                              .factor = 1, .real = t->real});
        }
    }
    return !r->e->error.kind;
}

/* The greatest of the waves' radians, and the steepest slope of a phase near the finite end to be split off. */
static double most_radians(const wave_range *r, const quad_terms *list)
{
    double most = 0, a, b;
    double_range(r, &a, &b);
    axis *s = base_alloc(sizeof *s);
    axis_fill(s, a, b);
    for (size_t k = 0; k < list->count; k++) {
        quad_wave w;
        if (!list->list[k].L)
            continue;
        if (wave_init(&w, r, &list->list[k], base_of(r)))
            most = fmax(most, radians(&w, s, r->low, r->high));
        wave_clear(&w);
    }
    free(s);
    return most;
}

/* How many radians the waves of f turn through on the range. */
static double radians_of(const wave_range *r, expr *f)
{
    bool fold = false;
    quad_terms *list = base_alloc(sizeof *list);
    list->count = 0;
    double out = quad_collect(list, r, f, &fold) ? most_radians(r, list) : 0;
    free(list);
    return out;
}

/* A distance from the end over which the waves turn through some radians. */
static double split_distance(const wave_range *r, const quad_terms *list, bool low)
{
    double a, b, best = r->low && r->high ? INFINITY : 1, re, im;
    double_range(r, &a, &b);
    if (isfinite(b - a))
        best = (b - a) / 4;
    for (size_t k = 0; k < list->count; k++) {
        quad_wave w;
        if (!list->list[k].L)
            continue;
        if (wave_init(&w, r, &list->list[k], base_of(r))) {
            double origin = low ? a : b;
            for (int tries = 0; tries < 200; tries++) {
                if (quad_wave_slope(&w, origin + (low ? best : -best), 0, &re, &im) && hypot(re, im) * best < 16)
                    break;
                best /= 2;
            }
        }
        wave_clear(&w);
    }
    return exp2(floor(log2(best)));
}

static const char *words_of(quad_verdict v)
{
    switch (v) {
    case QUAD_LOW:
    case QUAD_HIGH: return "one of its waves alone is not integrable at an end";
    case QUAD_INFINITY:
        return "no direction was found in which it dies away so fast that the arc at infinity vanishes";
    default: return "singularities stand on every path that was tried";
    }
}

/* Turns f; where a wave alone is not integrable at a finite end, a short range there is left on the real line. */
static bool turn_range(turning *t, wave_range r, const quad_terms *list, expr *f)
{
    size_t start = t->legs->count, before = start;
    for (int split = 0; split < 3; split++) {
        if (turn_terms(t, &r, list))
            return true;
        t->legs->count = before;
        bool low = t->verdict == QUAD_LOW;
        if (r.e->error.kind || (!low && t->verdict != QUAD_HIGH))
            break;
        expr *d = exact(r.e, split_distance(&r, list, low));
        expr *cut = low ? expr_add(r.e, r.from, d) : expr_sub(r.e, r.to, d);
        wave_range near = {r.e, r.x, low ? r.from : cut, low ? cut : r.to, true, true};
        quad_leg leg = {.f = f, .y = r.x, .from = near.from, .to = near.to, .factor = 1, .real = t->real};
        if (!(radians_of(&near, f) < MANY_RADIANS))
            break;
        quad_legs_add(t->legs, leg);
        before = t->legs->count;
        if (low)
            r.from = cut;
        else
            r.to = cut;
    }
    t->legs->count = start;
    return false;
}

/* An even integrand on (0, inf): half of the line. */
static bool turn_even(turning *t, const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    wave_range line = *r;
    line.from = expr_neg(e, r->to);
    line.low = false;
    quad_terms *list = base_alloc(sizeof *list);
    list->count = 0;
    t->real = t->real && sign_is_real(e, f);
    bool fold = t->real && quad_all_real(&line, f);
    size_t before = t->legs->count;
    expr *half = expr_mul(e, expr_frac(e, 1, 2), f);
    bool ok = half && quad_collect(list, &line, half, &fold);
    for (size_t k = 0; ok && k < list->count; k++) /* what does not oscillate would not gain */
        ok = list->list[k].L != NULL;
    ok = ok && turn_terms(t, &line, list);
    if (!ok)
        t->legs->count = before;
    free(list);
    return ok;
}

/* ---- other variables ---- */

/* f in the variable t, x = place(t), with dx = |slope| dt: a form for t > 0 where `positive`. */
static expr *changed(const wave_range *r, expr *f, expr *t, expr *place, bool positive)
{
    tw_engine *e = r->e;
    expr *slope = expr_derivative(e, place, t), *g = expr_mul(e, expr_substitute(e, f, r->x, place), slope);
    return g ? quad_tidy(e, expr_normal(e, g, &t, positive ? 1 : 0), t) : NULL;
}

static bool turn_exponential(turning *t, const wave_range *r, expr *f);

/* Half of the line in the variable e^x: an even integrand made of hyperbolic functions. */
static bool turn_even_exponential(turning *t, const wave_range *r, expr *f)
{
    wave_range line = *r;
    line.from = expr_neg(r->e, r->to);
    line.low = false;
    return turn_exponential(t, &line, expr_mul(r->e, expr_frac(r->e, 1, 2), f));
}

static bool turn_plain(turning *t, const wave_range *r, expr *f, bool even_only)
{
    tw_engine *e = r->e;
    if (!f || !quad_holds_wave(f, r->x) || !quad_is_analytic(f))
        return false;
    bool real = t->real = quad_is_real(r, f), done = false;
    bool half = r->low && expr_is_zero(r->from) && !r->high;
    expr *mirrored = half ? expr_substitute(e, f, r->x, expr_neg(e, r->x)) : NULL;
    if (mirrored && quad_tidy(e, mirrored, r->x) == f)
        done = turn_even(t, r, f) || turn_even_exponential(t, r, f);
    t->real = real;
    if (done || even_only)
        return done;
    quad_terms *list = base_alloc(sizeof *list);
    list->count = 0;
    bool fold = real && quad_all_real(r, f);
    done = quad_collect(list, r, f, &fold) && turn_range(t, *r, list, f);
    free(list);
    return done;
}

/* x = from + t^2 where that makes the integrand even in t. */
static bool turn_squared(turning *t, const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    if (!r->low || r->high)
        return false;
    wave_range s = {e, expr_fresh(e, "t"), expr_int(e, 0), r->to, true, false};
    expr *place = expr_add(e, r->from, expr_pow(e, s.x, expr_int(e, 2)));
    return turn_plain(t, &s, changed(r, f, s.x, place, true), true);
}

/* x = from + e^u: for phases in the logarithm of the distance from the end. */
static bool turn_logarithmic(turning *t, const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    if (!r->low || r->high)
        return false;
    wave_range s = {e, expr_fresh(e, "u"), expr_neg(e, r->to), r->to, false, false};
    expr *place = expr_add(e, r->from, expr_call1(e, FUNCTION_EXP, s.x));
    return turn_plain(t, &s, changed(r, f, s.x, place, false), false);
}

/* x = log(t): for phases made of exponentials. */
static bool turn_exponential(turning *t, const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    if (!r->low && r->high)
        return false;
    wave_range s = {e, expr_fresh(e, "t"), r->low ? expr_call1(e, FUNCTION_EXP, r->from) : expr_int(e, 0), r->to,
                    true, r->high};
    if (r->high)
        s.to = expr_call1(e, FUNCTION_EXP, r->to);
    expr *place = expr_call1(e, FUNCTION_LOG, s.x), *g = quad_without_hyperbolic(e, f, r->x);
    return g && g != f && turn_plain(t, &s, changed(r, g, s.x, place, true), false);
}

/* x = from + 1/t or to - 1/t: for a phase that has no end at an end of the range. */
static bool turn_inverted(turning *t, const wave_range *r, expr *f, bool at_low)
{
    tw_engine *e = r->e;
    if (!r->low || !r->high)
        return false;
    expr *inf = expr_constant_of(e, CONSTANT_INF), *one = expr_int(e, 1);
    expr *start = expr_div(e, one, expr_sub(e, r->to, r->from));
    wave_range s = {e, expr_fresh(e, "t"), start, inf, true, false};
    expr *step = expr_div(e, one, s.x), *place = at_low ? expr_add(e, r->from, step) : expr_sub(e, r->to, step);
    expr *g = changed(r, f, s.x, place, true); /* 1/t falls where from + 1/t does */
    return turn_plain(t, &s, at_low ? expr_neg(e, g) : g, false);
}

/* The same on a half-line: near its end, and the rest as it stands. */
static bool turn_broken(turning *t, const wave_range *r, expr *f)
{
    tw_engine *e = r->e;
    if (r->low == r->high)
        return false;
    size_t before = t->legs->count;
    wave_range near = *r, rest = *r;
    expr *middle = r->low ? expr_add(e, r->from, expr_int(e, 1)) : expr_sub(e, r->to, expr_int(e, 1));
    if (r->low)
        near.to = rest.from = middle;
    else
        near.from = rest.to = middle;
    near.low = near.high = true;
    if (turn_inverted(t, &near, f, r->low) && turn_plain(t, &rest, f, false))
        return true;
    t->legs->count = before;
    return false;
}

tw_status quad_turn(tw_engine *e, quad_legs *legs, expr *f, expr *x, expr *from, expr *to, quad_turned *turned,
                    char *why, size_t room)
{
    wave_range r = {e, x, from, to, !expr_is_minus_inf(from), !expr_is_inf(to)};
    *turned = QUAD_NO_NEED;
    why[0] = 0;
    f = quad_tidy(e, f, x);
    if (!f || !quad_holds_wave(f, x) || !quad_is_analytic(f))
        return e->error.kind ? TW_ERROR : TW_OK;
    turning t = {.legs = legs, .verdict = QUAD_SINGULAR};
    double turns = radians_of(&r, f);
    if (turns > FEW_RADIANS) {
        bool done = turn_squared(&t, &r, f) || turn_plain(&t, &r, f, false);
        quad_verdict first = t.verdict;
        done = done || turn_logarithmic(&t, &r, f) || turn_exponential(&t, &r, f) ||
               turn_inverted(&t, &r, f, true) || turn_inverted(&t, &r, f, false) ||
               turn_broken(&t, &r, f);
        *turned = done ? QUAD_TURNED : isinf(turns) ? QUAD_ENDLESS : QUAD_NOT_TURNED;
        if (!done)
            snprintf(why, room, "%s", words_of(first));
    }
    forgive_trouble(e);
    return e->error.kind ? TW_ERROR : TW_OK;
}
