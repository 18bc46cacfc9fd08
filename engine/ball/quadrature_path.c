/* The search for a path along which an oscillating integrand dies away: candidates are weighed by plain samples of
 * log2 |f|, the best are put before quadrature_region.c, the first that is proved is taken. Nothing here enters a
 * result but the path itself, whose points are exact.
 *
 * The one idea: on an interval without stationary points of the phase the wave decays on one side of the real axis, so
 * a trapezoid, a ray or a pair of rays is enough; what is left to choose is a height and slopes. */
#include "engine/ball/quadrature_oscillating.h"

#include <math.h>
#include <stdlib.h>

enum { HEIGHTS = 64, TRIES = 12, LINE_TRIES = 40 };

static const double leg_slopes[] = {0, 0.5, 1, 2, 4};
static const double ray_slopes[] = {0, 0.25, 0.5, 1, 2, 4, 8, 16};
enum { LEG_SLOPES = sizeof leg_slopes / sizeof *leg_slopes, RAY_SLOPES = sizeof ray_slopes / sizeof *ray_slopes };

/* log2 of the greatest |f| times distance on the way from (x, y) in the direction (dx, dy), at 2^low .. 2^high. */
static double way_mass(const quad_wave *w, double x, double y, double dx, double dy, double low, double high,
                       double step)
{
    double best = -INFINITY;
    for (double j = low; j <= high; j += step) {
        double d = exp2(j), v = quad_wave_height(w, x + dx * d, y + dy * d) + j;
        if (v > best)
            best = v;
    }
    return best;
}

/* ---- finite intervals ---- */

static double best_leg(const quad_wave *w, double x, int direction, int side, double height, double *slope)
{
    double best = INFINITY, top = log2(height);
    for (int k = 0; k < LEG_SLOPES; k++) {
        double m = way_mass(w, x, 0, direction * leg_slopes[k], side, top - 24, top, 1);
        if (m < best - 0.5) {
            best = m;
            *slope = leg_slopes[k];
        }
    }
    return best;
}

static double top_mass(const quad_wave *w, double from, double to, double y)
{
    double best = -INFINITY, length = to - from;
    for (int k = 0; k <= 24; k++)
        best = fmax(best, quad_wave_height(w, from + length * k / 24, y));
    return best + log2(length);
}

typedef struct candidate {
    double cost, height, slope_a, slope_b;
} candidate;

static int by_merit(const void *p, const void *q)
{
    const candidate *a = p, *b = q;
    return a->cost < b->cost ? -1 : a->cost > b->cost ? 1 : a->height > b->height ? -1 : a->height < b->height;
}

/* Costs within a bit of the least count as the least: then the greater height, which leaves less to integrate. */
static void sort_candidates(candidate *c, size_t n)
{
    double least = INFINITY;
    for (size_t k = 0; k < n; k++)
        least = fmin(least, c[k].cost);
    for (size_t k = 0; k < n; k++)
        if (c[k].cost < least + 1)
            c[k].cost = least;
    qsort(c, n, sizeof *c, by_merit);
}

static quad_verdict find_trapezoid(const quad_wave *w, quad_path *p, quad_loops *loops)
{
    candidate list[HEIGHTS];
    size_t n = 0;
    double length = p->b - p->a;
    for (int k = -2; k < 40 && n < HEIGHTS && budget_ok(w->e); k++) {
        candidate c = {.height = length * exp2(-k)};
        double a = best_leg(w, p->a, 1, p->side, c.height, &c.slope_a);
        double b = best_leg(w, p->b, -1, p->side, c.height, &c.slope_b);
        if ((c.slope_a + c.slope_b) * c.height > 0.75 * length)
            continue;
        double from = p->a + c.slope_a * c.height, to = p->b - c.slope_b * c.height;
        c.cost = fmax(fmax(a, b), top_mass(w, from, to, p->side * c.height));
        if (!isnan(c.cost))
            list[n++] = c;
    }
    sort_candidates(list, n);
    quad_verdict v = QUAD_SINGULAR;
    for (size_t k = 0; k < n && k < TRIES && v != QUAD_PROVED && budget_ok(w->e); k++) {
        p->height = list[k].height;
        p->slope_a = list[k].slope_a;
        p->slope_b = list[k].slope_b;
        v = quad_region_prove(w, p, loops);
    }
    return v;
}

/* ---- half-lines ---- */

static quad_verdict find_ray(const quad_wave *w, quad_path *p, quad_loops *loops)
{
    candidate list[RAY_SLOPES];
    bool right = isfinite(p->a);
    double x = right ? p->a : p->b;
    for (int k = 0; k < RAY_SLOPES; k++) {
        list[k] = (candidate){.slope_a = ray_slopes[k], .height = -k};
        list[k].cost = way_mass(w, x, 0, right ? ray_slopes[k] : -ray_slopes[k], p->side, -64, 40, 1);
    }
    sort_candidates(list, RAY_SLOPES);
    quad_verdict v = QUAD_SINGULAR, worst = QUAD_LOW;
    for (int k = 0; k < RAY_SLOPES && v != QUAD_PROVED && budget_ok(w->e); k++) {
        p->slope_a = p->slope_b = list[k].slope_a;
        v = quad_region_prove(w, p, loops);
        if (v != QUAD_PROVED && v > worst)
            worst = v;
    }
    return v == QUAD_PROVED ? v : worst;
}

/* ---- the whole line ---- */

static double line_mass(const quad_wave *w, const quad_path *p)
{
    double up = p->flat ? 0 : p->side, left = p->flat ? 1 : p->slope_a, right = p->flat ? 1 : p->slope_b;
    double y = p->side * p->height, scale = p->height > 0 ? log2(p->height) : 0;
    double low = fmin(-30, scale - 10), high = fmax(12, scale + 4);
    return fmax(way_mass(w, p->apex, y, -left, up, low, high, 1), way_mass(w, p->apex, y, right, up, low, high, 1));
}

static double loops_mass(const quad_wave *w, const quad_loops *loops)
{
    double best = -INFINITY;
    for (size_t k = 0; k < loops->count; k++) {
        const quad_loop *b = &loops->list[k];
        double size = log2(fmax(b->right - b->left, b->high - b->low));
        best = fmax(best, quad_wave_height(w, b->left, b->low) + size);
        best = fmax(best, quad_wave_height(w, b->right, b->high) + size);
    }
    return best;
}

/* Where |f| is greatest on the axis. */
static double axis_centre(const quad_wave *w)
{
    double best = quad_wave_height(w, 0, 0), at = 0;
    for (int side = -1; side <= 1; side += 2)
        for (double j = -20; j <= 20; j += 0.25) {
            double x = side * exp2(j), v = quad_wave_height(w, x, 0);
            if (v > best + 0.1 || (isnan(best) && !isnan(v))) {
                best = v;
                at = x;
            }
        }
    return ldexp(rint(ldexp(at, 8)), -8);
}

static quad_verdict try_line(const quad_wave *w, quad_path *p, quad_loops *loops)
{
    quad_verdict v = QUAD_INFINITY;
    static const double slopes[] = {2, 0.5, 8};
    if (p->flat)
        return quad_region_prove(w, p, loops);
    for (size_t k = 0; k < sizeof slopes / sizeof *slopes && v != QUAD_PROVED && budget_ok(w->e); k++) {
        p->slope_a = p->slope_b = slopes[k];
        v = quad_region_prove(w, p, loops);
    }
    return v;
}

/* A height with the least mass, where that is inside a range. */
static double lowest_height(const quad_wave *w, quad_path *p, double from, double to)
{
    const double golden = 0.6180339887498949;
    double a = log2(from), b = log2(to);
    for (int k = 0; k < 40 && b - a > 1e-9; k++) {
        double x = b - golden * (b - a), y = a + golden * (b - a), u, v;
        p->height = exp2(x);
        u = line_mass(w, p);
        p->height = exp2(y);
        v = line_mass(w, p);
        if (u <= v)
            b = y;
        else
            a = x;
    }
    return exp2(0.5 * (a + b));
}

typedef struct line_search {
    quad_path best;
    quad_loops loops;
    double mass; /* of the best */
    bool found;
    double failed; /* least height above the best one that failed; 0: none */
} line_search;

static bool consider(line_search *s, const quad_wave *w, quad_path *p, quad_verdict *v)
{
    quad_loops loops;
    double mass = line_mass(w, p);
    if (isnan(mass) || (s->found && mass > s->mass - 1))
        return true;
    *v = try_line(w, p, &loops);
    if (*v != QUAD_PROVED) {
        if (!s->failed || p->height < s->failed)
            s->failed = p->height;
        return false;
    }
    s->best = *p;
    s->loops = loops;
    s->mass = mass;
    s->found = true;
    s->failed = 0;
    return true;
}

/* Heights upwards while the path weighs less than what the loops bring and a singularity does not block the way. */
static quad_verdict find_line(const quad_wave *w, quad_path *p, quad_loops *loops)
{
    line_search s = {.found = false};
    quad_verdict v = QUAD_SINGULAR;
    p->apex = axis_centre(w);
    p->slope_a = p->slope_b = 2;
    double start = 0, top = 0, least = INFINITY;
    for (double k = -40; k <= 24; k++) { /* the interesting heights: from where the mass begins to fall to its least */
        p->height = exp2(k);
        double m = line_mass(w, p);
        if (!start && (isinf(least) || m < least - 2))
            start = isinf(least) ? 0 : p->height;
        if (m < least) {
            least = m;
            top = p->height;
        }
    }
    if (!start)
        start = top;
    int misses = 0, tries = 0;
    double stride = 16; /* in great strides up to the first obstacle, in small ones from there */
    for (double h = start; h <= top && misses < 4 && tries < LINE_TRIES && budget_ok(w->e); h *= stride, tries++) {
        p->height = h;
        bool fine = consider(&s, w, p, &v);
        if (stride > 2 && (!fine || h * stride > top || (s.found && s.loops.count))) {
            stride = 2;
            h = fine ? h : s.found ? s.best.height : h / 16;
            continue;
        }
        misses = fine ? 0 : misses + 1;
        if (s.found && s.loops.count && loops_mass(w, &s.loops) > s.mass + 64)
            break;
    }
    bool enough = s.found && s.loops.count && loops_mass(w, &s.loops) > s.mass + 64;
    if (!enough && budget_ok(w->e)) { /* a saddle point on the way, or the way under a branch point */
        p->height = lowest_height(w, p, top / 2, top * 2);
        quad_path saddle = *p;
        consider(&s, w, p, &v);
        saddle.flat = true;
        consider(&s, w, &saddle, &v);
        for (int k = 0; k < 24 && s.found && s.failed > s.best.height * (1 + 1e-6) && budget_ok(w->e); k++) {
            double before = s.mass;
            *p = s.best;
            p->height = k % 2 ? 0.5 * (s.best.height + s.failed) : s.best.height + 0.875 * (s.failed - s.best.height);
            double failed = s.failed;
            consider(&s, w, p, &v);
            if (s.found && s.mass < before && !s.failed)
                s.failed = failed;
            if (s.mass < before && before - s.mass < 24)
                break;
        }
    }
    if (!s.found)
        return v;
    *p = s.best;
    *loops = s.loops;
    return QUAD_PROVED;
}

quad_verdict quad_path_find(const quad_wave *w, quad_path *path, quad_loops *loops)
{
    if (isfinite(path->a) && isfinite(path->b))
        return find_trapezoid(w, path, loops);
    if (isfinite(path->a) || isfinite(path->b))
        return find_ray(w, path, loops);
    return find_line(w, path, loops);
}
