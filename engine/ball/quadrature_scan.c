/* Where the mass of a piece lies: a coarse scan of log |f| on a geometric grid (log |f| is broad however narrow f is),
 * then each local maximum refined and its width found. Everything here is a guess in plain doubles that steers the
 * certified work and enters no result. */
#include "engine/ball/quadrature_piece.h"

#include <math.h>
#include <stdlib.h>

enum { GRID_HALF = 40, GRID_LIMIT = 600, UNIFORM = 32, SCAN_PREC = 64, SCAN_PREC_LIMIT = 4096 };

void quad_scan_init(quad_scan *s)
{
    *s = (quad_scan){.prec = SCAN_PREC};
    for (size_t k = 0; k < QUAD_PEAK_LIMIT; k++)
        arf_init(s->peaks[k].y);
}

void quad_scan_clear(quad_scan *s)
{
    for (size_t k = 0; k < QUAD_PEAK_LIMIT; k++)
        arf_clear(s->peaks[k].y);
    for (size_t k = 0; k < s->count; k++)
        arf_clear(s->samples[k].y);
    free(s->samples);
}

static double log2_size(const acb_t v)
{
    if (!acb_is_finite(v))
        return NAN;
    mag_t m;
    mag_init(m);
    acb_get_mag(m, v);
    double out = mag_is_zero(m) ? -1e300 : mag_get_d_log2_approx(m);
    mag_clear(m);
    return out < -1e300 ? -1e300 : out > 1e300 ? 1e300 : out;
}

double quad_log2_value(tape *values, const arf_t y, slong prec)
{
    acb_t x, v;
    acb_init(x);
    acb_init(v);
    arb_set_arf(acb_realref(x), y);
    tape_eval(v, values, x, false, prec);
    double out = log2_size(v);
    acb_clear(x);
    acb_clear(v);
    return out;
}

static double log2_of(const arf_t y)
{
    mag_t m;
    mag_init(m);
    arf_get_mag(m, y);
    double out = mag_is_zero(m) ? -1e300 : mag_get_d_log2_approx(m);
    mag_clear(m);
    return out;
}

static void add_sample(quad_scan *s, tape *values, const arf_t y)
{
    if (s->count == s->room) {
        s->room = s->room ? 2 * s->room : 128;
        s->samples = base_resize(s->samples, s->room * sizeof *s->samples);
    }
    quad_sample *p = &s->samples[s->count++];
    arf_init(p->y);
    arf_set_round(p->y, y, 60, ARF_RND_DOWN);
    p->log2_y = log2_of(p->y);
    p->log2_f = quad_log2_value(values, p->y, s->prec);
}

static int by_y(const void *a, const void *b)
{
    return arf_cmp(((const quad_sample *)a)->y, ((const quad_sample *)b)->y);
}

/* The sample with the greatest y |f(y)|; SIZE_MAX: none finite. */
static size_t best_sample(const quad_scan *s)
{
    size_t best = SIZE_MAX;
    for (size_t k = 0; k < s->count; k++) {
        double h = s->samples[k].log2_f + s->samples[k].log2_y;
        if (!isnan(h) && h > -1e299 && (best == SIZE_MAX || h > s->samples[best].log2_f + s->samples[best].log2_y))
            best = k;
    }
    return best;
}

static void sample_grid(quad_scan *s, tape *values, const arb_struct *length, slong low, slong high)
{
    arf_t y, unit;
    arf_init(y);
    arf_init(unit);
    if (length)
        arf_set(unit, arb_midref(length));
    else
        arf_one(unit);
    for (slong j = low; j <= high; j++) {
        arf_mul_2exp_si(y, unit, j);
        add_sample(s, values, y);
    }
    arf_clear(y);
    arf_clear(unit);
}

static void sample_uniform(quad_scan *s, tape *values, const arb_struct *length)
{
    arf_t y;
    arf_init(y);
    for (ulong j = 1; j < UNIFORM; j++) {
        arf_mul_ui(y, arb_midref(length), j, 60, ARF_RND_DOWN);
        arf_mul_2exp_si(y, y, -5);
        add_sample(s, values, y);
    }
    for (slong j = 6; j < 20; j++) { /* towards the upper end */
        arf_mul_2exp_si(y, arb_midref(length), -j);
        arf_sub(y, arb_midref(length), y, 60, ARF_RND_DOWN);
        add_sample(s, values, y);
    }
    arf_clear(y);
}

/* Values at the best sample must be sharp, or the precision is raised and all samples taken again. */
static bool sharpen(quad_scan *s, tape *values, size_t best)
{
    acb_t x, v;
    acb_init(x);
    acb_init(v);
    arb_set_arf(acb_realref(x), s->samples[best].y);
    tape_eval(v, values, x, false, s->prec);
    slong bits = acb_rel_accuracy_bits(v);
    bool sharp = bits >= 20 || s->prec >= SCAN_PREC_LIMIT;
    s->lost = bits < 0 ? s->prec : s->prec - bits < 0 ? 0 : s->prec - bits;
    if (!sharp) {
        s->prec *= 2;
        for (size_t k = 0; k < s->count; k++)
            s->samples[k].log2_f = quad_log2_value(values, s->samples[k].y, s->prec);
    }
    acb_clear(x);
    acb_clear(v);
    return sharp;
}

/* Golden section for the greatest y |f(y)| between two samples. */
static void refine_peak(quad_scan *s, tape *values, quad_peak *peak, const arf_t from, const arf_t to)
{
    const double golden = 0.6180339887498949;
    arf_t a, b, x, y, d;
    arf_init(a);
    arf_init(b);
    arf_init(x);
    arf_init(y);
    arf_init(d);
    arf_set(a, from);
    arf_set(b, to);
    for (int tries = 0; tries < 60; tries++) {
        arf_sub(d, b, a, 60, ARF_RND_DOWN);
        arf_t g;
        arf_init(g);
        arf_set_d(g, golden);
        arf_mul(g, g, d, 60, ARF_RND_DOWN);
        arf_sub(x, b, g, 60, ARF_RND_DOWN);
        arf_add(y, a, g, 60, ARF_RND_DOWN);
        arf_clear(g);
        double u = quad_log2_value(values, x, s->prec), v = quad_log2_value(values, y, s->prec);
        if (isnan(u) || isnan(v) || u < -1e299 || v < -1e299)
            break;
        double hu = u + log2_of(x), hv = v + log2_of(y);
        if (hu >= hv)
            arf_set(b, y);
        else
            arf_set(a, x);
        double h = hu >= hv ? hu : hv;
        if (h > peak->log2_f + peak->log2_y) {
            arf_set(peak->y, hu >= hv ? x : y);
            peak->log2_y = log2_of(peak->y);
            peak->log2_f = hu >= hv ? u : v;
        }
        if (fabs(hu - hv) < 0.05)
            break; /* both within the peak's top */
    }
    arf_clear(a);
    arf_clear(b);
    arf_clear(x);
    arf_clear(y);
    arf_clear(d);
}

/* log2 of the distance at which |f| has fallen by about e on one side. */
static double fall_distance(const quad_scan *s, tape *values, const quad_peak *peak, int side)
{
    arf_t d, x;
    arf_init(d);
    arf_init(x);
    arf_mul_2exp_si(d, peak->y, -1);
    double found = log2_of(d);
    for (int j = 0; j < 60; j++) {
        if (side > 0)
            arf_add(x, peak->y, d, s->prec, ARF_RND_DOWN);
        else
            arf_sub(x, peak->y, d, s->prec, ARF_RND_DOWN);
        double v = quad_log2_value(values, x, s->prec), fall = peak->log2_f - v;
        if (!isnan(v) && fall < 1.4)
            break;
        found = log2_of(d);
        arf_mul_2exp_si(d, d, isnan(v) || fall > 24 ? -2 : -1);
    }
    arf_clear(d);
    arf_clear(x);
    return found;
}

static void find_peaks(quad_scan *s, tape *values, double least)
{
    for (size_t k = 0; k < s->count && s->peak_count < QUAD_PEAK_LIMIT; k++) {
        double h = s->samples[k].log2_f + s->samples[k].log2_y;
        if (isnan(h) || h < least)
            continue;
        double before = k ? s->samples[k - 1].log2_f + s->samples[k - 1].log2_y : -1e300;
        double after = k + 1 < s->count ? s->samples[k + 1].log2_f + s->samples[k + 1].log2_y : -1e300;
        if ((!isnan(before) && before > h) || (!isnan(after) && after >= h))
            continue;
        quad_peak *peak = &s->peaks[s->peak_count++];
        arf_set(peak->y, s->samples[k].y);
        peak->log2_y = s->samples[k].log2_y;
        peak->log2_f = s->samples[k].log2_f;
        if (k && k + 1 < s->count && (h - before > 3 || h - after > 3 || isnan(before) || isnan(after)))
            refine_peak(s, values, peak, s->samples[k - 1].y, s->samples[k + 1].y);
        peak->log2_below = fall_distance(s, values, peak, -1);
        peak->log2_above = k + 1 < s->count ? fall_distance(s, values, peak, 1) : peak->log2_below;
    }
}

bool quad_scan_run(quad_scan *s, tw_engine *e, tape *values, const arb_struct *length)
{
    slong low = -GRID_HALF, high = length ? 0 : GRID_HALF;
    sample_grid(s, values, length, low, high);
    if (length)
        sample_uniform(s, values, length);
    qsort(s->samples, s->count, sizeof *s->samples, by_y);
    size_t best = best_sample(s);
    while (best != SIZE_MAX && budget_ok(e)) {
        if (best < 4 && low > -GRID_LIMIT)
            sample_grid(s, values, length, low - GRID_HALF, low - 1), low -= GRID_HALF;
        else if (best + 4 >= s->count && !length && high < GRID_LIMIT)
            sample_grid(s, values, length, high + 1, high + GRID_HALF), high += GRID_HALF;
        else if (sharpen(s, values, best))
            break;
        qsort(s->samples, s->count, sizeof *s->samples, by_y);
        best = best_sample(s);
    }
    if (best == SIZE_MAX || e->error.kind)
        return false;
    s->log2_best = s->samples[best].log2_y;
    find_peaks(s, values, s->samples[best].log2_f + s->samples[best].log2_y - 400);
    s->log2_mass = -1e300;
    for (size_t k = 0; k < s->peak_count; k++) {
        const quad_peak *p = &s->peaks[k];
        double width = p->log2_below > p->log2_above ? p->log2_below : p->log2_above;
        if (p->log2_f + width > s->log2_mass) {
            s->log2_mass = p->log2_f + width;
            s->log2_best = p->log2_y;
        }
    }
    if (!s->peak_count)
        s->log2_mass = s->samples[best].log2_f + s->samples[best].log2_y;
    return true;
}
