/* One piece: which variable serves which end, where an end is cut off and what the rest weighs, and the sum over panels
 * by acb_calc_integrate. Knows nothing of how the range was split.
 *
 * Ends: regular at 0: y itself. Else y = t^k if that makes the integrand analytic there; else y = e^t, cut off at a t
 * where the growth record of f(1/v)/v^2 bounds the rest. At infinity: exponential decay is cut off in the variable at
 * hand; an algebraic tail becomes a piece of its own in y = t^-k, or in e^t. */
#include "engine/ball/quadrature_piece.h"

#include <math.h>
#include <stdlib.h>

enum { CUT_TRIES = 90, RECORD_START = 64, BREAK_LIMIT = 512 };

/* ---- ends ---- */

bool quad_is_regular(tape *values, double log2_scale)
{
    static const slong shifts[] = {3, 7, 14, 30};
    acb_t x, v;
    mag_t r;
    acb_init(x);
    acb_init(v);
    mag_init(r);
    bool finite = false;
    for (size_t k = 0; k < sizeof shifts / sizeof *shifts && !finite; k++) {
        mag_set_ui_2exp_si(r, 1, (slong)floor(log2_scale) - shifts[k]);
        mag_set(arb_radref(acb_realref(x)), r);
        mag_set(arb_radref(acb_imagref(x)), r);
        tape_eval(v, values, x, true, 64);
        finite = acb_is_finite(v);
    }
    acb_clear(x);
    acb_clear(v);
    mag_clear(r);
    return finite;
}

static void part_clear(quad_part *a)
{
    tape_free(a->plain);
    tape_free(a->Q);
    tape_free(a->L);
    a->plain = a->Q = a->L = NULL;
}

/* The integrand in the variable of `map`. Where the map is POWER or INVERSE, false unless that is regular at t = 0. */
static bool part_try(quad_part *a, quad_piece *p, quad_map map)
{
    tw_engine *e = p->e;
    a->map = map;
    a->t = expr_fresh(e, "t");
    a->F = quad_map_integrand(e, p->f, p->y, a->t, map, &a->k);
    a->plain = a->F ? tape_new(e, a->F, &a->t, 1) : NULL;
    if (!a->plain)
        return false;
    double scale = p->scan.log2_best / (map == QUAD_POWER ? (double)a->k : map == QUAD_INVERSE ? -(double)a->k : 1);
    if ((map == QUAD_POWER || map == QUAD_INVERSE) && !quad_is_regular(a->plain, scale)) {
        part_clear(a);
        return false;
    }
    /* the normal form multiplies exponents out, which on wide balls is worse than the form as typed */
    expr *typed = map == QUAD_PLAIN ? expr_substitute(e, p->typed, p->y, a->t) : NULL;
    tape *better = typed && typed != a->F ? tape_new(e, typed, &a->t, 1) : NULL;
    if (better && quad_is_regular(better, scale)) {
        tape_free(a->plain);
        a->plain = better;
    } else {
        tape_free(better);
    }
    expr *Q, *L;
    quad_split(e, a->F, a->t, &Q, &L);
    if (L && Q) {
        a->Q = tape_new(e, Q, &a->t, 1);
        a->L = tape_new(e, L, &a->t, 1);
    }
    return true;
}

/* y^(1/k), log y, ... : where y lies in the part's variable. */
static void part_place(arb_t t, const quad_part *a, const arb_t y, slong prec)
{
    switch (a->map) {
    case QUAD_PLAIN:
        arb_set(t, y);
        break;
    case QUAD_POWER:
        arb_root_ui(t, y, a->k, prec);
        break;
    case QUAD_INVERSE:
        arb_inv(t, y, prec);
        arb_root_ui(t, t, a->k, prec);
        break;
    case QUAD_EXP:
        arb_log(t, y, prec);
        break;
    }
}

/* ---- tails ---- */

typedef struct tail {
    bool high;
    slong shift; /* high: y = 2^shift v; low: y = 1/(2^shift v) */
} tail;

/* The records of the end at infinity (high) or at 0, in a variable v scaled so that the cut lies at v >= 64. */
static bool tail_open(tail *a, quad_piece *p, bool high, double log2_cut)
{
    if (!p->records)
        p->records = growth_compile(p->e, p->f, p->y);
    if (!p->records)
        return false;
    double log2_v = high ? log2_cut : -log2_cut;
    a->high = high;
    a->shift = log2_v < 6 ? (slong)floor(log2_v) - 6 : 0;
    growth_scale(p->records, a->shift, !high);
    return true;
}

static void tail_point(arf_t v, const tail *a, const arf_t y)
{
    if (a->high) {
        arf_mul_2exp_si(v, y, -a->shift);
    } else {
        arf_ui_div(v, 1, y, 60, ARF_RND_FLOOR);
        arf_mul_2exp_si(v, v, -a->shift);
    }
}

static tw_status tail_fails(quad_piece *p, const tail *a, bool cutting)
{
    const char *where = a->high ? p->to : p->from;
    if (p->e->error.kind)
        return TW_ERROR;
    if (growth_diverges(p->records))
        return engine_fail(p->e, ERROR_DIVERGENT, "the integral diverges at %s", where);
    if (a->high && p->oscillates)
        return engine_fail(p->e, ERROR_UNSUITABLE, "the integrand oscillates towards %s without decaying enough for "
                           "quadrature along a straight line", where);
    if (cutting)
        return engine_fail(p->e, ERROR_UNDECIDED,
                "the %s %s is integrable, but dies away too slowly for a bound of its end",
                           a->high ? "tail at" : "integrand at", where);
    char *words = expr_text(p->e, growth_resists(p->records));
    engine_fail(p->e, ERROR_UNDECIDED, "no bound was found for the %s at %s (%s)", a->high ? "tail" : "integrand",
            where,
                words ? words : "the integrand");
    free(words);
    return TW_ERROR;
}

/* Is the end integrable, by a record somewhere far out? *exponential: with exponential decay. */
static tw_status tail_class(quad_piece *p, bool high, bool *exponential)
{
    tail a;
    growth_bound g;
    arf_t v;
    if (!tail_open(&a, p, high, p->scan.log2_best))
        return TW_ERROR;
    growth_bound_init(&g);
    arf_init(v);
    arf_set_ui(v, RECORD_START);
    bool found = false;
    for (int tries = 0; tries < 40 && !found && budget_ok(p->e); tries++) {
        found = growth_run(p->records, &g, v) && growth_integrable(&g);
        if (!found)
            arf_mul_2exp_si(v, v, tries < 8 ? 2 : tries < 20 ? 8 : 64);
        if (!found && growth_diverges(p->records))
            break;
    }
    *exponential = found && arb_is_positive(g.b);
    tw_status status = found ? TW_OK : tail_fails(p, &a, false);
    growth_bound_clear(&g);
    arf_clear(v);
    return status;
}

/* A first guess: where y |f(y)| has fallen below the tolerance, by the samples and then by going on outwards. */
static void guess_cut(arf_t cut, quad_piece *p, bool high, double log2_tolerance)
{
    const quad_scan *s = &p->scan;
    size_t k = high ? s->count : 0;
    double v;
    for (;;) { /* the outermost sample above the tolerance */
        if (high ? k == 0 : k == s->count)
            break;
        size_t j = high ? k - 1 : k;
        double h = s->samples[j].log2_f + s->samples[j].log2_y;
        if (!isnan(h) && h > log2_tolerance)
            break;
        k = high ? k - 1 : k + 1;
    }
    size_t last = high ? (k ? k - 1 : 0) : (k < s->count ? k : s->count - 1);
    arf_set(cut, s->samples[last].y);
    slong step = 1;
    arf_t next;
    arf_init(next);
    for (int tries = 0; tries < 40; tries++) {
        arf_mul_2exp_si(next, cut, high ? step : -step);
        v = quad_log2_value(p->values, next, s->prec);
        p->evaluations++;
        mag_t m;
        mag_init(m);
        arf_get_mag(m, next);
        v += mag_get_d_log2_approx(m);
        mag_clear(m);
        if (!isnan(v) && v < log2_tolerance) {
            if (step > 1) {
                step = 1;
                continue;
            }
            break;
        }
        arf_set(cut, next);
        if (step < 1024)
            step *= 2;
    }
    if (high) { /* within a factor of 9/8 */
        for (int j = 1; j <= 3; j++) {
            arf_mul_2exp_si(next, cut, -j);
            arf_add(next, next, cut, 60, ARF_RND_DOWN);
            v = quad_log2_value(p->values, next, s->prec) + p->scan.samples[last].log2_y;
            p->evaluations++;
            if (isnan(v) || v >= log2_tolerance)
                arf_set(cut, next);
        }
    }
    arf_clear(next);
}

static void rest_ball(acb_t rest, arb_t log_rest, bool real)
{
    arf_t top;
    arf_init(top);
    if (!arf_is_neg_inf(arb_midref(log_rest))) {
        arb_exp(log_rest, log_rest, 64);
        arb_get_ubound_arf(top, log_rest, 30);
    }
    acb_zero(rest);
    arb_add_error_arf(acb_realref(rest), top);
    if (!real)
        arb_add_error_arf(acb_imagref(rest), top);
    arf_clear(top);
}

/* Is the integral beyond v bounded by a record, with a logarithm below the limit? */
static bool cut_serves(quad_piece *p, growth_bound *g, const arf_t v, arb_t log_rest, const arb_t limit)
{
    bool serves = false;
    if (growth_run(p->records, g, v) && growth_integrable(g)) {
        serves = growth_tail(p->e, log_rest, g) == TW_OK && !arb_gt(log_rest, limit) &&
                 !arf_is_nan(arb_midref(log_rest));
        if (p->e->error.kind == ERROR_DIVERGENT || p->e->error.kind == ERROR_UNDECIDED)
            engine_forgive(p->e);
    }
    return serves;
}

/* A cut, and a ball around 0 that is proved to hold the integral beyond it, of radius at most 2^tolerance. */
static tw_status find_cut(arf_t cut, acb_t rest, quad_piece *p, bool high, slong tolerance)
{
    tail a;
    growth_bound g;
    arf_t v, factor;
    arb_t limit, log_rest;
    guess_cut(cut, p, high, (double)tolerance);
    mag_t m;
    mag_init(m);
    arf_get_mag(m, cut);
    double log2_cut = mag_get_d_log2_approx(m);
    mag_clear(m);
    if (!tail_open(&a, p, high, log2_cut))
        return TW_ERROR;
    growth_bound_init(&g);
    arf_init(v);
    arf_init(factor);
    arb_init(limit);
    arb_init(log_rest);
    arb_const_log2(limit, 64);
    arb_mul_si(limit, limit, tolerance, 64);
    tail_point(v, &a, cut);
    bool found = false;
    int tries = 0;
    for (; tries < CUT_TRIES && !found && budget_ok(p->e); tries++) {
        found = cut_serves(p, &g, v, log_rest, limit);
        if (found)
            break;
        arf_set_d(factor, tries < 4 ? 1.125 : tries < 8 ? 1.5 : tries < 40 ? 2 : 1048576);
        arf_mul(v, v, factor, 60, ARF_RND_CEIL);
    }
    for (slong back = 16; found && tries > 40 && back; back /= 2) { /* that was a great leap: most of it back again */
        arf_mul_2exp_si(factor, v, -back);
        if (cut_serves(p, &g, factor, log_rest, limit))
            arf_swap(v, factor);
    }
    found = found && cut_serves(p, &g, v, log_rest, limit);
    if (found)
        rest_ball(rest, log_rest, growth_is_real(p->records));
    if (found) { /* back to y: the cut may lie a little inside of what the bound covers, never outside */
        if (high) {
            arf_mul_2exp_si(cut, v, a.shift);
        } else {
            arf_mul_2exp_si(cut, v, a.shift);
            arf_ui_div(cut, 1, cut, 60, ARF_RND_FLOOR);
        }
    }
    tw_status status = found ? TW_OK : tail_fails(p, &a, true);
    growth_bound_clear(&g);
    arf_clear(v);
    arf_clear(factor);
    arb_clear(limit);
    arb_clear(log_rest);
    return status;
}

/* ---- preparation ---- */

static bool has_oscillation(expr *f, expr *y)
{
    if (!expr_has(f, y))
        return expr_is_constant(f, CONSTANT_I);
    if (f->kind == EXPR_CALL && (f->is.function == FUNCTION_SIN || f->is.function == FUNCTION_COS ||
                                 f->is.function == FUNCTION_BESSEL_J || f->is.function == FUNCTION_BESSEL_Y))
        return true;
    for (uint32_t k = 0; k < f->count; k++)
        if (f->args[k]->kind != EXPR_RELATION && has_oscillation(f->args[k], y))
            return true;
    return false;
}

static tw_status choose_low(quad_piece *p)
{
    bool exponential;
    if (quad_is_regular(p->values, p->scan.log2_best))
        return part_try(&p->parts[0], p, QUAD_PLAIN) ? TW_OK : TW_ERROR;
    if (part_try(&p->parts[0], p, QUAD_POWER))
        return TW_OK;
    if (p->e->error.kind || tail_class(p, false, &exponential) != TW_OK)
        return TW_ERROR;
    p->cut_low = true;
    return part_try(&p->parts[0], p, QUAD_EXP) ? TW_OK : TW_ERROR;
}

static tw_status choose_high(quad_piece *p)
{
    bool exponential;
    if (tail_class(p, true, &exponential) != TW_OK)
        return TW_ERROR;
    if (exponential) {
        p->cut_high = true;
        return TW_OK;
    }
    arf_one(p->join);
    arf_mul_2exp_si(p->join, p->join, (slong)floor(p->scan.log2_best + 0.5));
    p->part_count = 2;
    if (part_try(&p->parts[1], p, QUAD_INVERSE))
        return TW_OK;
    if (p->e->error.kind)
        return TW_ERROR;
    p->cut_high = true;
    if (p->parts[0].map == QUAD_EXP) { /* the same variable serves both ends */
        p->part_count = 1;
        return TW_OK;
    }
    return part_try(&p->parts[1], p, QUAD_EXP) ? TW_OK : TW_ERROR;
}

tw_status quad_piece_init(quad_piece *p, tw_engine *e, expr *f, expr *y, expr *length, const char *from, const char *to)
{
    *p = (quad_piece){.e = e, .typed = f, .y = y, .length = length, .from = from, .to = to, .part_count = 1};
    arb_init(p->extent);
    arf_init(p->join);
    quad_scan_init(&p->scan);
    p->f = expr_normal(e, f, &y, 1);
    p->values = p->f ? tape_new(e, p->f, &y, 1) : NULL;
    if (!p->values)
        return TW_ERROR;
    if (length) {
        acb_t v;
        acb_init(v);
        tw_status status = ball_value(e, v, length, 128);
        arb_set(p->extent, acb_realref(v));
        acb_clear(v);
        if (status != TW_OK)
            return status;
    }
    p->oscillates = has_oscillation(p->f, y);
    if (!quad_scan_run(&p->scan, e, p->values, length ? p->extent : NULL))
        return engine_fail(e, ERROR_UNDECIDED, "no finite value of the integrand was found between %s and %s", from,
                to);
    p->evaluations += (slong)p->scan.count;
    if (choose_low(p) != TW_OK || (!length && choose_high(p) != TW_OK)) {
        if (!e->error.kind)
            engine_fail(e, ERROR_INTERNAL, "the integrand has no form for quadrature");
        return TW_ERROR;
    }
    return TW_OK;
}

void quad_piece_clear(quad_piece *p)
{
    for (size_t k = 0; k < 2; k++)
        part_clear(&p->parts[k]);
    tape_free(p->values);
    growth_free(p->records);
    quad_scan_clear(&p->scan);
    arb_clear(p->extent);
    arf_clear(p->join);
}

/* ---- the integrand on balls ---- */

typedef struct run {
    quad_piece *piece;
    quad_part *part;
    double negligible; /* exp(L) below e^this needs no sharp bound */
} run;

/* exp(L) on a wide ball t: L(m) + L'(m) (t - m) + (t - m)^2 [L''/2 on t], which has no first-order dependency. */
static void second_order(acb_t L, quad_part *a, const acb_t t, slong prec)
{
    acb_struct jet[3], low[2];
    acb_t m, d;
    for (int k = 0; k < 3; k++)
        acb_init(jet + k);
    for (int k = 0; k < 2; k++)
        acb_init(low + k);
    acb_init(m);
    acb_init(d);
    acb_get_mid(m, t);
    acb_sub(d, t, m, prec);
    tape_jet(jet, a->L, t, 3, prec);
    tape_jet(low, a->L, m, 2, prec);
    acb_mul(L, jet + 2, d, prec);
    acb_add(L, L, low + 1, prec);
    acb_mul(L, L, d, prec);
    acb_add(L, L, low, prec);
    for (int k = 0; k < 3; k++)
        acb_clear(jet + k);
    for (int k = 0; k < 2; k++)
        acb_clear(low + k);
    acb_clear(m);
    acb_clear(d);
}

static bool is_wide(const acb_t t, slong prec)
{
    return acb_rel_accuracy_bits(t) < prec / 2;
}

static bool exponent_is_dull(const acb_t L, double negligible)
{
    if (!acb_is_finite(L))
        return true;
    if (mag_cmp_2exp_si(arb_radref(acb_realref(L)), -1) < 0)
        return true;
    arf_t top;
    arf_init(top);
    arb_get_ubound_arf(top, acb_realref(L), 53);
    bool dull = arf_get_d(top, ARF_RND_UP) < negligible;
    arf_clear(top);
    return dull;
}

/* Q exp(L), L in the better of its two forms where the ball is wide. */
static void exponential_form(acb_t out, run *r, const acb_t t, bool analytic, slong prec)
{
    quad_part *a = r->part;
    acb_t L, M;
    acb_init(L);
    acb_init(M);
    bool wide = is_wide(t, prec);
    slong bits = wide ? 64 : prec;
    tape_eval(L, a->L, t, analytic, bits);
    if (wide && !exponent_is_dull(L, r->negligible)) {
        second_order(M, a, t, bits);
        if (acb_is_finite(M) && mag_cmp(arb_radref(acb_realref(M)), arb_radref(acb_realref(L))) < 0)
            acb_swap(L, M);
    }
    acb_indeterminate(out);
    if (acb_is_finite(L)) {
        tape_eval(M, a->Q, t, analytic, bits);
        acb_exp(L, L, bits);
        acb_mul(out, L, M, bits);
    }
    acb_clear(L);
    acb_clear(M);
}

static int integrand(acb_ptr out, const acb_t t, void *param, slong order, slong prec)
{
    run *r = param;
    if (order > 1) {
        acb_indeterminate(out);
        return 0;
    }
    if (!budget_ok(r->piece->e)) { /* the sum is thrown away: what ends the subdivision soonest is a constant */
        acb_zero(out);
        return 0;
    }
    r->piece->evaluations++;
    if (r->part->L) {
        exponential_form(out, r, t, order == 1, prec);
        if (acb_is_finite(out))
            return 0;
    }
    tape_eval(out, r->part->plain, t, order == 1, prec);
    return 0;
}

/* ---- panels ---- */

static int by_size(const void *a, const void *b)
{
    return arf_cmp(a, b);
}

/* The points of the part's variable at which panels begin: peaks, and their surroundings by powers of 8. */
static size_t breakpoints(arf_struct *points, const quad_piece *p, const quad_part *a, const arb_t from, const arb_t to)
{
    size_t n = 0;
    slong prec = p->scan.prec + 32;
    arf_t d, y;
    arb_t t, Y;
    arf_init(d);
    arf_init(y);
    arb_init(t);
    arb_init(Y);
    for (size_t k = 0; k < p->scan.peak_count; k++) {
        const quad_peak *peak = &p->scan.peaks[k];
        for (int side = -1; side <= 1; side++) {
            double width = side < 0 ? peak->log2_below : peak->log2_above;
            double narrower = peak->log2_below < peak->log2_above ? peak->log2_below : peak->log2_above;
            if (narrower > peak->log2_y - 2.5)
                continue;
            for (int j = 0; j < (side ? 24 : 1) && width + 3 * j < peak->log2_y; j++) {
                arf_one(d);
                arf_mul_2exp_si(d, d, (slong)floor(width + 0.5) + 3 * j);
                if (side < 0)
                    arf_sub(y, peak->y, d, prec, ARF_RND_DOWN);
                else if (side > 0)
                    arf_add(y, peak->y, d, prec, ARF_RND_DOWN);
                else
                    arf_set(y, peak->y);
                if (arf_sgn(y) <= 0)
                    continue;
                arb_set_arf(Y, y);
                part_place(t, a, Y, prec);
                if (n < BREAK_LIMIT && arb_gt(t, from) && arb_lt(t, to)) {
                    arf_init(points + n);
                    arf_set(points + n++, arb_midref(t));
                }
            }
        }
    }
    qsort(points, n, sizeof *points, by_size);
    arf_clear(d);
    arf_clear(y);
    arb_clear(t);
    arb_clear(Y);
    return n;
}

static void panel(acb_t value, run *r, const acb_t from, const acb_t to, slong tolerance, slong goal, slong prec)
{
    acb_calc_integrate_opt_t options;
    acb_calc_integrate_opt_init(options);
    options->depth_limit = 20 * prec;
    options->eval_limit = 2000000;
    mag_t tol;
    mag_init(tol);
    mag_set_ui_2exp_si(tol, 1, tolerance);
    acb_calc_integrate(value, integrand, r, from, to, goal, tol, options, prec);
    mag_clear(tol);
}

static tw_status part_integrate(quad_piece *p, quad_part *a, acb_t value, const arb_t from, const arb_t to,
        slong tolerance,
                                slong goal, slong prec)
{
    run r = {p, a, (double)tolerance * 0.6931 - 40};
    arf_struct *points = base_alloc(BREAK_LIMIT * sizeof *points);
    size_t n = breakpoints(points, p, a, from, to);
    acb_t left, right, sum;
    acb_init(left);
    acb_init(right);
    acb_init(sum);
    slong share = tolerance - (slong)FLINT_BIT_COUNT(n + 1);
    acb_set_arb(left, from);
    for (size_t k = 0; k <= n && budget_ok(p->e); k++) {
        if (k < n)
            arb_set_arf(acb_realref(right), points + k);
        else
            arb_set(acb_realref(right), to);
        panel(sum, &r, left, right, share, goal, prec);
        acb_add(value, value, sum, prec);
        acb_swap(left, right);
    }
    for (size_t k = 0; k < n; k++)
        arf_clear(points + k);
    free(points);
    acb_clear(left);
    acb_clear(right);
    acb_clear(sum);
    return p->e->error.kind ? TW_ERROR : TW_OK;
}

/* The ends of a part in its own variable, from the piece's cuts, join and length. */
static void part_range(arb_t from, arb_t to, const quad_piece *p, size_t index, const arf_t low, const arf_t high,
                       const arb_t length, slong prec)
{
    const quad_part *a = &p->parts[index];
    arb_t y;
    arb_init(y);
    arb_zero(from);
    if (index == 0 && p->cut_low) {
        arb_set_arf(y, low);
        part_place(from, a, y, prec);
    } else if (index == 1 && a->map != QUAD_INVERSE) {
        arb_set_arf(y, p->join);
        part_place(from, a, y, prec);
    }
    if (p->length)
        arb_set(y, length);
    else if ((index == 0 && p->part_count == 2) || a->map == QUAD_INVERSE)
        arb_set_arf(y, p->join);
    else
        arb_set_arf(y, high);
    part_place(to, a, y, prec);
    arb_clear(y);
}

tw_status quad_piece_integrate(quad_piece *p, acb_t value, slong tolerance, slong goal, slong prec)
{
    arf_t low, high;
    arb_t from, to;
    acb_t length, low_rest, high_rest;
    arf_init(low);
    arf_init(high);
    acb_init(low_rest);
    acb_init(high_rest);
    arb_init(from);
    arb_init(to);
    acb_init(length);
    acb_zero(value);
    tw_status status = TW_OK;
    if (p->length)
        status = ball_value(p->e, length, p->length, prec + 20);
    if (status == TW_OK && p->cut_low)
        status = find_cut(low, low_rest, p, false, tolerance - 2);
    if (status == TW_OK && p->cut_high)
        status = find_cut(high, high_rest, p, true, tolerance - 2);
    for (size_t k = 0; status == TW_OK && k < p->part_count; k++) {
        part_range(from, to, p, k, low, high, acb_realref(length), prec + 20);
        if (!arb_gt(from, to))
            status = part_integrate(p, &p->parts[k], value, from, to, tolerance - 2, goal, prec);
    }
    if (status == TW_OK && p->cut_low)
        acb_add(value, value, low_rest, prec);
    if (status == TW_OK && p->cut_high)
        acb_add(value, value, high_rest, prec);
    arf_clear(low);
    arf_clear(high);
    acb_clear(low_rest);
    acb_clear(high_rest);
    arb_clear(from);
    arb_clear(to);
    acb_clear(length);
    return status;
}
