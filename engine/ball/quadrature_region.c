/* The proof that a path may take the place of a real range: between the two the integrand is analytic but for clusters
 * of bad boxes, which loops go around; at ends where it is singular, and at infinity, the arcs between them vanish.
 * Knows no way to find paths.
 *
 * The one idea: everything is a set of boxes. A box is good (analytic, by one ball), outside (winding number 0), split,
 * or bad; around what stays bad a loop is integrated, whatever is inside. Plain doubles decide only where a box lies,
 * with a margin far above their rounding: a winding number does not change within it. */
#include "engine/ball/quadrature_oscillating.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/growth.h"
#include "engine/ball/sign.h"

enum { CORNERS = 2, POINTS = 8, BOX_LIMIT = 40000, BAD_LIMIT = 400, WEDGE_DEPTH = 4, WEDGES = 8, FAR_TRIES = 9 };

typedef struct box {
    double x, y, r;
} box;

typedef struct region {
    const quad_wave *w;
    const quad_path *path;
    double px[POINTS], py[POINTS]; /* new path forwards, old one backwards */
    size_t points;
    double corner_x[CORNERS], corner_r[CORNERS]; /* singular ends: discs in which the region is known to be good */
    size_t corners;
    double centre, far; /* beyond |z - centre| = far the region is known to be good; 0: bounded */
    double margin;
} region;

/* ---- values on boxes ---- */

static void set_square(acb_t z, double x, double y, double r)
{
    arb_set_d(acb_realref(z), x);
    arb_set_d(acb_imagref(z), y);
    mag_set_d(arb_radref(acb_realref(z)), r);
    mag_set_d(arb_radref(acb_imagref(z)), r);
}

bool quad_wave_analytic(const quad_wave *w, double x, double y, double r)
{
    acb_t z, v;
    acb_init(z);
    acb_init(v);
    set_square(z, x, y, r);
    tape_eval(v, w->values_L, z, true, 64);
    bool good = acb_is_finite(v);
    if (good) {
        tape_eval(v, w->values_Q, z, true, 64);
        good = acb_is_finite(v);
    }
    acb_clear(z);
    acb_clear(v);
    return good;
}

/* ---- sectors ---- */

typedef struct sector {
    const quad_wave *w;
    growth_program *whole, *amplitude, *exponent, *fall;
    growth_bound bound;
    bool inverted;
    slong shift;
} sector;

/* Records about the point `at` of the real axis, of f(at + turn v) (or, inverted, f(at + turn/v)). way: 1 when Re L has
 * to fall with the angle, -1 against it. */
static bool sector_open(sector *s, const quad_wave *w, expr *at, bool inverted, int way)
{
    tw_engine *e = w->e;
    expr *u = expr_fresh(e, "u"), *place = expr_add(e, at, u);
    expr *Q = expr_substitute(e, w->Q, w->z, place), *L = expr_substitute(e, w->L, w->z, place);
    expr *turned = expr_mul(e, expr_int(e, way), expr_mul(e, expr_constant_of(e, CONSTANT_I), u));
    expr *D = expr_mul(e, turned, expr_substitute(e, w->slope, w->z, place));
    *s = (sector){.w = w, .inverted = inverted};
    growth_bound_init(&s->bound);
    s->whole = growth_compile(e, expr_mul(e, Q, expr_call1(e, FUNCTION_EXP, L)), u);
    if (s->whole && w->pure) {
        s->amplitude = growth_compile(e, Q, u);
        s->exponent = s->amplitude ? growth_compile(e, L, u) : NULL;
        s->fall = s->exponent && D ? growth_compile(e, D, u) : NULL;
    }
    return s->whole != NULL;
}

static void sector_close(sector *s)
{
    growth_free(s->whole);
    growth_free(s->amplitude);
    growth_free(s->exponent);
    growth_free(s->fall);
    growth_bound_clear(&s->bound);
}

/* All directions e^(i phi), from <= phi <= to. */
static void directions(acb_t turn, double from, double to)
{
    arb_t phi;
    arb_init(phi);
    arb_set_d(phi, 0.5 * (from + to));
    mag_set_d(arb_radref(phi), 0.5 * (to - from) * (1 + 1e-12) + 1e-15);
    arb_sin_cos(acb_imagref(turn), acb_realref(turn), phi, 64);
    arb_clear(phi);
}

static bool run(growth_program *t, growth_bound *bound, const sector *s, const acb_t turn)
{
    arf_t X;
    arf_init(X);
    arf_set_ui(X, 64);
    growth_turn(t, turn);
    growth_scale(t, s->shift, s->inverted);
    bool ok = growth_run(t, bound, X);
    arf_clear(X);
    return ok;
}

/* The first wedge beside the real axis, where Re L = 0: |Q| <= C R^a and d Re L/d phi <= -m R^n give for the arc
 * C R^(a+1) int exp(-m R^n phi) d phi <= (C/m) R^(a+1-n), which vanishes when a < n - 1 (Jordan's lemma). At an end,
 * with R the reciprocal of the distance, the arc has the factor R^(a-1) instead; the records hold |dz/dR|, so that
 * their power is a - 2 there and the condition the same. */
static bool falls_off(sector *s, const acb_t turn)
{
    fmpq_t n;
    if (!s->fall || !run(s->exponent, &s->bound, s, turn) || !run(s->fall, &s->bound, s, turn))
        return false;
    fmpq_init(n);
    bool ok = growth_falls(s->fall, n);
    if (s->inverted)
        fmpq_add_si(n, n, 2);
    ok = ok && fmpq_sgn(n) > 0 && run(s->amplitude, &s->bound, s, turn);
    if (ok && !arb_is_positive(s->bound.b)) {
        fmpq_sub(n, n, s->bound.a);
        fmpz_sub(fmpq_numref(n), fmpq_numref(n), fmpq_denref(n));
        ok = fmpq_is_zero(s->bound.c) && fmpq_sgn(n) > 0;
    }
    fmpq_clear(n);
    return ok;
}

/* beside: the wedge begins at the real axis, at the angle `from`. */
static bool wedge_vanishes(sector *s, double from, double to, bool beside, int depth)
{
    acb_t turn;
    acb_init(turn);
    directions(turn, from < to ? from : to, from < to ? to : from);
    bool ok = (run(s->whole, &s->bound, s, turn) && growth_integrable(&s->bound)) || (beside && falls_off(s, turn));
    acb_clear(turn);
    if (ok || depth == WEDGE_DEPTH || !budget_ok(s->w->e))
        return ok;
    double middle = 0.5 * (from + to);
    return wedge_vanishes(s, from, middle, beside, depth + 1) && wedge_vanishes(s, middle, to, false, depth + 1);
}

static bool sector_vanishes(sector *s, double from, double to, slong shift)
{
    s->shift = shift;
    for (int k = 0; k < WEDGES; k++)
        if (!wedge_vanishes(s, from + (to - from) * k / WEDGES, from + (to - from) * (k + 1) / WEDGES, k == 0, 0))
            return false;
    return true;
}

/* ---- the polygon ---- */

static void point(region *g, double x, double y)
{
    g->px[g->points] = x;
    g->py[g->points++] = y;
}

static void lay_polygon(region *g)
{
    const quad_path *p = g->path;
    double far = 8 * g->far, h = p->height * p->side;
    g->points = 0;
    if (isfinite(p->a) && isfinite(p->b)) {
        point(g, p->a, 0);
        point(g, p->a + p->slope_a * p->height, h);
        point(g, p->b - p->slope_b * p->height, h);
        point(g, p->b, 0);
    } else if (isfinite(p->a)) {
        point(g, p->a, 0);
        point(g, p->a + p->slope_a * far, p->side * far);
        point(g, p->a + far, 0);
    } else if (isfinite(p->b)) {
        point(g, p->b - far, 0);
        point(g, p->b - p->slope_b * far, p->side * far);
        point(g, p->b, 0);
    } else {
        double left = p->flat ? 1 : p->slope_a, right = p->flat ? 1 : p->slope_b, up = p->flat ? 0 : p->side;
        point(g, p->apex - far, 0);
        point(g, p->apex - left * far, h + up * far);
        point(g, p->apex, h);
        point(g, p->apex + right * far, h + up * far);
        point(g, p->apex + far, 0);
    }
    g->margin = 0;
    for (size_t k = 0; k < g->points; k++)
        g->margin = fmax(g->margin, fmax(fabs(g->px[k]), fabs(g->py[k])));
    g->margin *= 1e-13;
}

/* Does the segment meet the rectangle? (Clipping by the four sides in turn.) */
static bool segment_meets(double x0, double y0, double x1, double y1, double left, double right, double low,
                          double high)
{
    double from = 0, to = 1, dx = x1 - x0, dy = y1 - y0;
    double p[4] = {-dx, dx, -dy, dy}, q[4] = {x0 - left, right - x0, y0 - low, high - y0};
    for (int k = 0; k < 4; k++) {
        if (p[k] == 0) {
            if (q[k] < 0)
                return false;
            continue;
        }
        double t = q[k] / p[k];
        if (p[k] < 0)
            from = fmax(from, t);
        else
            to = fmin(to, t);
    }
    return from <= to + 1e-12;
}

static bool meets_polygon(const region *g, double left, double right, double low, double high)
{
    for (size_t k = 0; k < g->points; k++) {
        size_t j = (k + 1) % g->points;
        if (segment_meets(g->px[k], g->py[k], g->px[j], g->py[j], left - g->margin, right + g->margin, low - g->margin,
                          high + g->margin))
            return true;
    }
    return false;
}

static slong winding(const region *g, double x, double y)
{
    slong n = 0;
    for (size_t k = 0; k < g->points; k++) {
        size_t j = (k + 1) % g->points;
        double x0 = g->px[k], y0 = g->py[k], x1 = g->px[j], y1 = g->py[j];
        double side = (x1 - x0) * (y - y0) - (x - x0) * (y1 - y0);
        if (y0 <= y && y1 > y && side > 0)
            n++;
        else if (y0 > y && y1 <= y && side < 0)
            n--;
    }
    return n;
}

static double distance(const region *g, double x, double y)
{
    double least = INFINITY;
    for (size_t k = 0; k < g->points; k++) {
        size_t j = (k + 1) % g->points;
        double dx = g->px[j] - g->px[k], dy = g->py[j] - g->py[k], n = dx * dx + dy * dy;
        double t = n > 0 ? ((x - g->px[k]) * dx + (y - g->py[k]) * dy) / n : 0;
        t = fmin(fmax(t, 0), 1);
        least = fmin(least, hypot(x - g->px[k] - t * dx, y - g->py[k] - t * dy));
    }
    return least;
}

/* ---- ends ---- */

/* The disc about a singular end in which the region is good and the arc vanishes. */
static bool corner_vanishes(region *g, expr *at, double x, double from, double to, double size, int way)
{
    sector s;
    bool ok = false;
    if (quad_wave_analytic(g->w, x, 0, size * 0x1p-30))
        return true;
    if (sector_open(&s, g->w, at, true, way)) {
        slong shift = (slong)ceil(-log2(size)) - 4;
        for (int tries = 0; tries < FAR_TRIES && !ok && budget_ok(g->w->e); tries++, shift += 3 + 2 * tries) {
            ok = sector_vanishes(&s, from, to, shift);
            if (ok) {
                g->corner_x[g->corners] = x;
                g->corner_r[g->corners++] = ldexp(1, (int)(-shift - 6));
            }
        }
    }
    sector_close(&s);
    forgive_trouble(g->w->e);
    return ok;
}

/* The arc at infinity between the real axis and the path: angle < 0 for the lower half plane. */
static bool far_vanishes(region *g, bool right, double angle)
{
    sector s;
    bool ok = false;
    tw_engine *e = g->w->e;
    acb_t c;
    acb_init(c);
    fmpq_t q;
    fmpq_init(q);
    arf_t centre;
    arf_init(centre);
    arf_set_d(centre, g->centre);
    arf_get_fmpq(q, centre);
    expr *at = g->path->A ? g->path->A : g->path->B ? g->path->B : expr_fmpq(e, q);
    int way = (right ? 1 : -1) * g->path->side;
    if (sector_open(&s, g->w, at, false, way)) {
        slong shift = (slong)ceil(log2(g->far)) - 6;
        for (int tries = 0; tries < FAR_TRIES && !ok && budget_ok(e); tries++, shift += 1 + tries) {
            ok = sector_vanishes(&s, right ? 0 : M_PI, right ? angle : M_PI - angle, shift);
            if (ok)
                g->far = ldexp(1, (int)(shift + 6));
        }
    }
    sector_close(&s);
    forgive_trouble(e);
    acb_clear(c);
    fmpq_clear(q);
    arf_clear(centre);
    return ok;
}

static quad_verdict ends_vanish(region *g)
{
    const quad_path *p = g->path;
    bool left = isfinite(p->a), right = isfinite(p->b);
    double size = left && right ? fmin(p->height, 0.25 * (p->b - p->a)) : 1;
    if (left && !corner_vanishes(g, p->A, p->a, 0, p->side * atan2(1, p->slope_a), size, p->side))
        return QUAD_LOW;
    if (right && !corner_vanishes(g, p->B, p->b, M_PI, M_PI - p->side * atan2(1, p->slope_b), size, -p->side))
        return QUAD_HIGH;
    if (left && right)
        return QUAD_PROVED;
    g->centre = left ? p->a : right ? p->b : p->apex;
    double angle_a = p->flat ? 0 : atan2(1, p->slope_a), angle_b = p->flat ? 0 : atan2(1, p->slope_b);
    double room = 0;
    g->far = 1;
    if (!left && !right) { /* seen from the axis below the apex, the rays lie a little higher */
        double least = fmin(angle_a, angle_b);
        room = p->flat ? 1. / 16 : least / 3;
        g->far = fmax(1, 4 * p->height / room);
    }
    if (!right && !far_vanishes(g, true, p->side * (angle_b + room)))
        return QUAD_INFINITY;
    if (!left && !far_vanishes(g, false, p->side * (angle_a + room)))
        return QUAD_INFINITY;
    return QUAD_PROVED;
}

/* ---- boxes ---- */

static bool is_exempt(const region *g, const box *b)
{
    for (size_t k = 0; k < g->corners; k++)
        if (hypot(fabs(b->x - g->corner_x[k]) + b->r, fabs(b->y) + b->r) < g->corner_r[k] * (1 - 1e-9) - g->margin)
            return true;
    if (g->far > 0) {
        double dx = fmax(fabs(b->x - g->centre) - b->r, 0), dy = fmax(fabs(b->y) - b->r, 0);
        return hypot(dx, dy) > g->far * (1 + 1e-9) + g->margin;
    }
    return false;
}

/* A box that covers the region. Its half width is a power of 2 and its centre a multiple of a quarter of that, so that
 * the boxes that it is split into have exact centres, and leave no gap between them. */
static box root_box(const region *g)
{
    double left, right, low, high;
    if (g->far > 0) {
        left = g->centre - g->far;
        right = g->centre + g->far;
        low = -g->far;
        high = g->far;
    } else {
        left = right = g->px[0];
        low = high = g->py[0];
        for (size_t k = 1; k < g->points; k++) {
            left = fmin(left, g->px[k]);
            right = fmax(right, g->px[k]);
            low = fmin(low, g->py[k]);
            high = fmax(high, g->py[k]);
        }
    }
    double half = 0.5 * fmax(right - left, high - low) * (1 + 1e-9);
    double r = exp2(ceil(log2(half)));
    if (r < 1.25 * half)
        r *= 2;
    return (box){rint(2 * (left + right) / r) * r / 4, rint(2 * (low + high) / r) * r / 4, r};
}

/* Half width at which a bad box inside is taken into a loop: on a greater one the wave would grow by more than a factor
 * of about e^3; and well away from the path. */
static double loop_size(const region *g, const box *b)
{
    double re, im, size = 0.25 * distance(g, b->x, b->y);
    if (quad_wave_slope(g->w, b->x, b->y, &re, &im) && hypot(re, im) * size > 1.5)
        size = 1.5 / hypot(re, im);
    return size;
}

/* The bad boxes inside; false where one stays bad on the path, or where there are too many. */
static bool sort_boxes(const region *g, box *bad, size_t *bad_count)
{
    box *stack = base_alloc((BOX_LIMIT + 8) * sizeof *stack);
    size_t count = 1, seen = 0;
    bool ok = true;
    stack[0] = root_box(g);
    double least = fmax(stack[0].r * 0x1p-44, (fabs(stack[0].x) + fabs(stack[0].y) + stack[0].r) * 0x1p-48);
    while (count && ok) {
        box b = stack[--count];
        bool touches = meets_polygon(g, b.x - b.r, b.x + b.r, b.y - b.r, b.y + b.r);
        if ((!touches && !winding(g, b.x, b.y)) || is_exempt(g, &b) || quad_wave_analytic(g->w, b.x, b.y, b.r))
            continue;
        if (touches || b.r > loop_size(g, &b)) {
            ok = b.r > least && ++seen < BOX_LIMIT / 4 && budget_ok(g->w->e);
            for (int k = 0; ok && k < 4; k++)
                stack[count++] = (box){b.x + (k & 1 ? 0.5 : -0.5) * b.r, b.y + (k & 2 ? 0.5 : -0.5) * b.r, 0.5 * b.r};
        } else {
            ok = *bad_count < BAD_LIMIT;
            if (ok)
                bad[(*bad_count)++] = b;
        }
    }
    free(stack);
    return ok;
}

static bool overlap(const quad_loop *a, const quad_loop *b)
{
    return a->left <= b->right && b->left <= a->right && a->low <= b->high && b->low <= a->high;
}

/* Rectangles around the bad boxes, disjoint, none of them on the path. */
static bool make_loops(const region *g, const box *bad, size_t n, quad_loops *loops)
{
    quad_loop *all = base_alloc((n + 1) * sizeof *all);
    size_t count = 0;
    for (size_t k = 0; k < n; k++) {
        quad_loop a = {bad[k].x - 1.5 * bad[k].r, bad[k].x + 1.5 * bad[k].r, bad[k].y - 1.5 * bad[k].r,
                       bad[k].y + 1.5 * bad[k].r, 0};
        for (size_t j = 0; j < count;) { /* a growing rectangle may meet earlier ones: start over each time */
            if (!overlap(&a, &all[j])) {
                j++;
                continue;
            }
            a.left = fmin(a.left, all[j].left);
            a.right = fmax(a.right, all[j].right);
            a.low = fmin(a.low, all[j].low);
            a.high = fmax(a.high, all[j].high);
            all[j] = all[--count];
            j = 0;
        }
        all[count++] = a;
    }
    bool ok = count <= QUAD_LOOP_LIMIT;
    for (size_t k = 0; ok && k < count; k++) {
        ok = !meets_polygon(g, all[k].left, all[k].right, all[k].low, all[k].high);
        all[k].winding = winding(g, 0.5 * (all[k].left + all[k].right), 0.5 * (all[k].low + all[k].high));
        if (ok && all[k].winding)
            loops->list[loops->count++] = all[k];
    }
    free(all);
    return ok;
}

quad_verdict quad_region_prove(const quad_wave *w, const quad_path *path, quad_loops *loops)
{
    region g = {.w = w, .path = path};
    loops->count = 0;
    quad_verdict v = ends_vanish(&g);
    if (v != QUAD_PROVED)
        return v;
    lay_polygon(&g);
    box *bad = base_alloc(BAD_LIMIT * sizeof *bad);
    size_t n = 0;
    if (!sort_boxes(&g, bad, &n) || !make_loops(&g, bad, n, loops))
        v = QUAD_SINGULAR;
    free(bad);
    return v;
}
