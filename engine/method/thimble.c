/* The path as an integer combination of steepest curves: signed crossings with the ascending curves. Knows nothing of integrands
 * but where the amplitude has poles.
 *
 * The one idea: along an ascending curve Re p falls, so the curve is followed until it lies lower than the whole path, and every
 * crossing up to there is counted; that the curve and the polygon through its discs meet the path equally often needs only that no
 * end of the path lies in a disc. Where heights meet, p is turned a little both ways and the counts compared. A path in special
 * position (through a saddle, along a curve) is bent a little first: nothing but poles could forbid that. */
#include "engine/method/thimble.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { LEVEL_PIECES = 64, LEVEL_DEPTH = 12, BENDS = 8, WORK_BITS = 192, TURNS = 24 };

void route_init(route *r, size_t count)
{
    memset(r, 0, sizeof *r);
    r->count = count;
    r->at = _acb_vec_init((slong)count + 1);
    acb_init(r->toward[0]);
    acb_init(r->toward[1]);
}

void route_clear(route *r)
{
    if (r->at)
        _acb_vec_clear(r->at, (slong)r->count + 1);
    acb_clear(r->toward[0]);
    acb_clear(r->toward[1]);
    memset(r, 0, sizeof *r);
}

void shares_clear(shares *s)
{
    for (size_t k = 0; k < s->count; k++) {
        free(s->list[k].n);
        free(s->list[k].other);
        acb_clear(s->directions + k);
    }
    free(s->list);
    free(s->directions);
    memset(s, 0, sizeof *s);
}

/* ---- how low Re(p/g) gets on the path ---- */

typedef struct ground {
    landscape *l;
    const acb_struct *turn;
    arb_t level;
} ground;

static void note_level(ground *g, const arb_t value)
{
    arf_t low;
    arf_init(low);
    arb_get_lbound_arf(low, value, 64);
    if (arf_cmp(low, arb_midref(g->level)) < 0)
        arf_set(arb_midref(g->level), low);
    arf_clear(low);
}

/* p(P + d u) = top(u)/bottom(u) */
static void along(acb_poly_t top, acb_poly_t bottom, const landscape *l, const acb_t P, const acb_t d)
{
    acb_poly_t line;
    acb_poly_init(line);
    acb_poly_set_coeff_acb(line, 0, P);
    acb_poly_set_coeff_acb(line, 1, d);
    acb_poly_compose(top, l->top, line, WORK_BITS);
    acb_poly_compose(bottom, l->bottom, line, WORK_BITS);
    acb_poly_clear(line);
}

static bool value_on(arb_t out, const ground *g, const acb_poly_t top, const acb_poly_t bottom, const arb_t u)
{
    acb_t v, w;
    acb_init(v);
    acb_init(w);
    acb_set_arb(w, u);
    acb_poly_evaluate(v, top, w, WORK_BITS);
    acb_poly_evaluate(w, bottom, w, WORK_BITS);
    acb_div(v, v, w, WORK_BITS);
    acb_div(v, v, g->turn, WORK_BITS);
    arb_set(out, acb_realref(v));
    bool fine = acb_is_finite(v);
    acb_clear(v);
    acb_clear(w);
    return fine;
}

/* u in [a, b]. */
static bool level_between(ground *g, const acb_poly_t top, const acb_poly_t bottom, const arf_t a, const arf_t b, int depth)
{
    arb_t u, v;
    arf_t m;
    arb_init(u);
    arb_init(v);
    arf_init(m);
    arb_set_interval_arf(u, a, b, 64);
    bool fine = value_on(v, g, top, bottom, u);
    if (fine) {
        note_level(g, v);
    } else if (depth > 0) {
        arf_add(m, a, b, 64, ARF_RND_DOWN);
        arf_mul_2exp_si(m, m, -1);
        fine = level_between(g, top, bottom, a, m, depth - 1) && level_between(g, top, bottom, m, b, depth - 1);
    }
    arb_clear(u);
    arb_clear(v);
    arf_clear(m);
    return fine;
}

/* In pieces from 2^low to 1, or down to 0 when low is 0; then from 1 to 2^high. */
static bool level_pieces(ground *g, const acb_poly_t top, const acb_poly_t bottom, slong low, slong high)
{
    arf_t a, b;
    arf_init(a);
    arf_init(b);
    bool fine = true;
    for (slong octave = low ? low : -1; octave < high && fine; octave++)
        for (slong k = 0; k < LEVEL_PIECES && fine; k++) {
            arf_set_si(a, LEVEL_PIECES + k);
            arf_set_si(b, LEVEL_PIECES + k + 1);
            arf_mul_2exp_si(a, a, octave - 6);
            arf_mul_2exp_si(b, b, octave - 6);
            fine = level_between(g, top, bottom, a, b, LEVEL_DEPTH);
            if (!low && octave == -1 && fine) { /* [0, 1/2] */
                arf_set_si(a, k);
                arf_set_si(b, k + 1);
                arf_mul_2exp_si(a, a, -7);
                arf_mul_2exp_si(b, b, -7);
                fine = level_between(g, top, bottom, a, b, LEVEL_DEPTH);
            }
        }
    arf_clear(a);
    arf_clear(b);
    return fine;
}

/* v^(length - 1) f(1/v) */
static void reversed(acb_poly_t out, const acb_poly_t f, slong length)
{
    for (slong k = 0; k < length && k < acb_poly_length(f); k++)
        acb_poly_set_coeff_acb(out, length - 1 - k, acb_poly_get_coeff_ptr(f, k));
}

/* Re(p/g) > 0 for all u >= 2^shift (or all 0 < u <= 2^-shift next to a pole of order `pole`): the least such shift, or -1. */
static slong rising_from(const ground *g, const acb_poly_t top, const acb_poly_t bottom, slong pole)
{
    enum { SHIFT_LIMIT = 80 };
    acb_poly_t T, B;
    arb_t v, h;
    slong found = -1;
    acb_poly_init(T);
    acb_poly_init(B);
    arb_init(v);
    arb_init(h);
    if (pole > 0) {
        acb_poly_set(T, top);
        acb_poly_shift_right(B, bottom, pole);
    } else {
        reversed(T, top, acb_poly_length(g->l->top));
        reversed(B, bottom, acb_poly_length(g->l->bottom));
    }
    for (slong shift = 0; shift <= SHIFT_LIMIT && found < 0; shift++) {
        arf_t a, b;
        arf_init(a);
        arf_init(b);
        arf_one(b);
        arf_mul_2exp_si(b, b, -shift);
        arb_set_interval_arf(v, a, b, 64);
        if (value_on(h, g, T, B, v) && arb_is_positive(h))
            found = shift;
        arf_clear(a);
        arf_clear(b);
    }
    acb_poly_clear(T);
    acb_poly_clear(B);
    arb_clear(v);
    arb_clear(h);
    return found;
}

/* One leg from P along d: to u = 1, or on to infinity; pole: the order of p's pole at P, met from a valley. */
static bool level_leg(ground *g, const acb_t P, const acb_t d, bool infinite, slong pole)
{
    acb_poly_t top, bottom;
    slong low = 0, high = 0;
    bool fine = true;
    acb_poly_init(top);
    acb_poly_init(bottom);
    along(top, bottom, g->l, P, d);
    if (pole > 0) {
        low = -rising_from(g, top, bottom, pole);
        fine = low <= 0;
        if (low == 0)
            low = -1;
    }
    if (fine && infinite) {
        high = g->l->at_infinity > 0 ? rising_from(g, top, bottom, 0) : -1;
        fine = high >= 0;
    }
    if (fine)
        fine = level_pieces(g, top, bottom, low, high);
    if (infinite && fine && arf_sgn(arb_midref(g->level)) > 0)
        arf_zero(arb_midref(g->level)); /* beyond, Re > 0 is all that is known */
    if (pole > 0 && fine && arf_sgn(arb_midref(g->level)) > 0)
        arf_zero(arb_midref(g->level));
    acb_poly_clear(top);
    acb_poly_clear(bottom);
    return fine;
}

static slong pole_order(const landscape *l, const acb_t z)
{
    for (size_t k = 0; k < l->count; k++)
        if (l->spots[k].order < -1 && acb_overlaps(l->spots[k].z, z))
            return -l->spots[k].order - 1;
    return 0;
}

/* False: the path is not seen to stay above any level. */
static bool level_of(ground *g, const route *r)
{
    acb_t d;
    acb_init(d);
    arf_pos_inf(arb_midref(g->level));
    bool fine = true;
    for (int k = 0; k < 2 && fine; k++)
        if (r->infinite[k])
            fine = level_leg(g, r->at + (k ? r->count - 1 : 0), r->toward[k], true, 0);
    for (size_t k = 0; k + 1 < r->count && fine; k++) {
        bool first = k == 0 && r->valley[0], last = k + 2 == r->count && r->valley[1];
        acb_sub(d, r->at + k + 1, r->at + k, WORK_BITS);
        if (first && last) { /* both ends are poles: in halves */
            acb_t m;
            acb_init(m);
            acb_mul_2exp_si(d, d, -1);
            acb_add(m, r->at + k, d, WORK_BITS);
            fine = level_leg(g, r->at + k, d, false, pole_order(g->l, r->at + k));
            acb_neg(d, d);
            fine = fine && level_leg(g, r->at + k + 1, d, false, pole_order(g->l, r->at + k + 1));
            acb_clear(m);
        } else if (last) {
            acb_neg(d, d);
            fine = level_leg(g, r->at + k + 1, d, false, pole_order(g->l, r->at + k + 1));
        } else {
            fine = level_leg(g, r->at + k, d, false, first ? pole_order(g->l, r->at + k) : 0);
        }
    }
    for (size_t k = 0; k < r->count && r->count == 1 && fine; k++) {
        acb_t v;
        acb_init(v);
        landscape_value(v, g->l, r->at, WORK_BITS);
        acb_div(v, v, g->turn, WORK_BITS);
        if (acb_is_finite(v))
            note_level(g, acb_realref(v));
        acb_clear(v);
    }
    acb_clear(d);
    return fine;
}

/* ---- crossings ---- */

/* The side of c seen along a -> b: 1 left, -1 right, 0 not decided. */
static int side_of(const acb_t a, const acb_t b, const acb_t c)
{
    arb_t x, y, s, t;
    arb_init(x), arb_init(y), arb_init(s), arb_init(t);
    arb_sub(x, acb_realref(b), acb_realref(a), WORK_BITS);
    arb_sub(y, acb_imagref(b), acb_imagref(a), WORK_BITS);
    arb_sub(s, acb_realref(c), acb_realref(a), WORK_BITS);
    arb_sub(t, acb_imagref(c), acb_imagref(a), WORK_BITS);
    arb_mul(x, x, t, WORK_BITS);
    arb_submul(x, y, s, WORK_BITS);
    int sign = arb_is_positive(x) ? 1 : arb_is_negative(x) ? -1 : 0;
    arb_clear(x), arb_clear(y), arb_clear(s), arb_clear(t);
    return sign;
}

/* Boxes that surely do not meet. */
static bool apart(const acb_t a, const acb_t b, const acb_t c, const acb_t d)
{
    acb_t u, v;
    acb_init(u);
    acb_init(v);
    acb_union(u, a, b, 53);
    acb_union(v, c, d, 53);
    bool no = !acb_overlaps(u, v);
    acb_clear(u);
    acb_clear(v);
    return no;
}

/* +1: the path's piece c -> d crosses a -> b from right to left, -1: from left to right. False: not decided. */
static bool crossing(int *out, const acb_t a, const acb_t b, const acb_t c, const acb_t d)
{
    *out = 0;
    if (apart(a, b, c, d))
        return true;
    int p = side_of(a, b, c), q = side_of(a, b, d), s = side_of(c, d, a), t = side_of(c, d, b);
    if ((p && p == q) || (s && s == t))
        return true;
    if (!p || !q || !s || !t)
        return false;
    *out = q;
    return true;
}

/* The polygon of the path within a circle of radius R about 0; the first and last vertices are far out where it is infinite. */
static slong polygon(acb_ptr *out, const route *r, const arb_t R)
{
    slong n = 0;
    acb_ptr v = _acb_vec_init((slong)r->count + 3);
    arb_t far, a;
    arb_init(far);
    arb_init(a);
    if (r->infinite[0]) {
        acb_abs(a, r->at, 64);
        arb_add(far, R, a, 64);
        arb_mul_2exp_si(far, far, 1);
        acb_mul_arb(v + n, r->toward[0], far, WORK_BITS);
        acb_add(v + n, v + n, r->at, WORK_BITS);
        n++;
    }
    for (size_t k = 0; k < r->count; k++)
        acb_set(v + n++, r->at + k);
    if (r->infinite[1]) {
        acb_abs(a, r->at + r->count - 1, 64);
        arb_add(far, R, a, 64);
        arb_mul_2exp_si(far, far, 1);
        acb_mul_arb(v + n, r->toward[1], far, WORK_BITS);
        acb_add(v + n, v + n, r->at + r->count - 1, WORK_BITS);
        n++;
    }
    arb_clear(far);
    arb_clear(a);
    *out = v;
    return n;
}

/* The net number of crossings of the chain by the path; false: not decided. cut[k]: a point to start (end) from instead of the
 * path's own finite end, or NULL. */
static bool net_crossings(slong *out, const chain *c, const route *r, acb_srcptr const cut[2])
{
    arb_t R, a;
    arb_init(R);
    arb_init(a);
    for (slong k = 0; k < c->count; k++) {
        acb_abs(a, c->at + k, 64);
        arb_max(R, R, a, 64);
    }
    acb_ptr v;
    slong n = polygon(&v, r, R);
    if (cut[0])
        acb_set(v, cut[0]);
    if (cut[1])
        acb_set(v + n - 1, cut[1]);
    bool fine = true;
    *out = 0;
    for (slong j = 0; j + 1 < n && fine; j++)
        for (slong k = 0; k + 1 < c->count && fine; k++) {
            int sign;
            fine = crossing(&sign, c->at + k, c->at + k + 1, v + j, v + j + 1);
            *out += sign;
        }
    _acb_vec_clear(v, (slong)r->count + 3);
    arb_clear(R);
    arb_clear(a);
    return fine;
}

/* ---- bending ---- */

/* Is z farther than 2*delta from the piece a + u d, 0 <= u <= 1 (or u >= 0)? */
static bool keeps_off(const acb_t z, const acb_t a, const acb_t d, bool infinite, const arb_t delta)
{
    acb_t w;
    arb_t u, s, t;
    acb_init(w);
    arb_init(u), arb_init(s), arb_init(t);
    acb_sub(w, z, a, 64);
    acb_div(w, w, d, 64); /* in the piece's own frame */
    arb_set(u, acb_realref(w));
    if (!arb_is_positive(u))
        arb_zero(u);
    if (!infinite && !arb_is_negative(u)) {
        arb_one(s);
        arb_min(u, u, s, 64);
    }
    arb_sub(acb_realref(w), acb_realref(w), u, 64);
    acb_abs(s, w, 64);
    acb_abs(t, d, 64);
    arb_mul(s, s, t, 64);
    arb_mul_2exp_si(t, delta, 1);
    bool fine = arb_gt(s, t);
    acb_clear(w);
    arb_clear(u), arb_clear(s), arb_clear(t);
    return fine;
}

/* A number about 1 in modulus, different for each k, never in a special direction. */
static void odd_unit(acb_t out, slong k)
{
    arb_set_d(acb_realref(out), cos(0.7391 + 2.399963 * (double)k));
    arb_set_d(acb_imagref(out), sin(0.7391 + 2.399963 * (double)k));
}

/* Interior vertices moved and legs broken, by less than half the distance to any pole. Two ends at infinity stay parallel. */
static bool bend(route *out, const route *r, const landscape *l, const spot *poles, size_t pole_count, int attempt)
{
    bool open[2] = {r->infinite[0], r->infinite[1]};
    size_t legs = r->count - 1;
    route_init(out, r->count + legs);
    for (int k = 0; k < 2; k++) {
        out->infinite[k] = r->infinite[k];
        out->places[k] = r->places[k];
        out->valley[k] = r->valley[k];
        acb_set(out->toward[k], r->toward[k]);
    }
    arb_t delta, size;
    acb_t d;
    arb_init(delta), arb_init(size);
    acb_init(d);
    arb_one(delta);
    for (size_t k = 0; k < legs; k++) {
        acb_sub(d, r->at + k + 1, r->at + k, 64);
        acb_abs(size, d, 64);
        arb_min(delta, delta, size, 64);
    }
    arb_mul_2exp_si(delta, delta, -4 - attempt / 2);
    arb_get_mid_arb(delta, delta);
    bool fine = true, clear = false;
    for (int tries = 0; tries < 40 && !clear && fine; tries++) {
        clear = true;
        for (size_t s = 0; s < l->count + pole_count && clear; s++) {
            const spot *at = s < l->count ? l->spots + s : poles + (s - l->count);
            if (s < l->count && at->order > 0)
                continue;
            for (size_t k = 0; k < legs && clear; k++) {
                bool valley = (k == 0 && r->valley[0] && acb_overlaps(at->z, r->at)) ||
                              (k + 1 == legs && r->valley[1] && acb_overlaps(at->z, r->at + r->count - 1));
                acb_sub(d, r->at + k + 1, r->at + k, 64);
                clear = valley || keeps_off(at->z, r->at + k, d, false, delta);
            }
            for (int k = 0; k < 2 && clear; k++)
                if (open[k])
                    clear = keeps_off(at->z, r->at + (k ? r->count - 1 : 0), r->toward[k], true, delta);
        }
        if (!clear)
            arb_mul_2exp_si(delta, delta, -1);
    }
    size_t n = 0;
    for (size_t k = 0; k < r->count; k++) {
        bool fixed = (k == 0 && !open[0]) || (k + 1 == r->count && !open[1]);
        acb_set(out->at + n, r->at + k);
        if (!fixed) {
            odd_unit(d, 3 * attempt + (slong)k);
            acb_mul_arb(d, d, delta, 64);
            acb_mul_2exp_si(d, d, -1);
            acb_add(out->at + n, out->at + n, d, WORK_BITS);
        }
        n++;
        if (k < legs) {
            bool valley = (k == 0 && r->valley[0]) || (k + 1 == legs && r->valley[1]);
            acb_add(out->at + n, r->at + k, r->at + k + 1, WORK_BITS);
            acb_mul_2exp_si(out->at + n, out->at + n, -1);
            if (!valley) {
                odd_unit(d, 3 * attempt + (slong)k + 17);
                acb_mul_arb(d, d, delta, 64);
                acb_mul_2exp_si(d, d, -1);
                acb_add(out->at + n, out->at + n, d, WORK_BITS);
            }
            n++;
        }
    }
    for (size_t k = 0; k < out->count; k++)
        if ((k > 0 || open[0]) && (k + 1 < out->count || open[1]))
            acb_get_mid(out->at + k, out->at + k);
    arb_clear(delta), arb_clear(size);
    acb_clear(d);
    return fine && clear;
}

/* ---- one turn ---- */

typedef struct survey {
    tw_engine *e;
    landscape *l;
    const route *r;
    acb_struct turn;
    arb_t level;
    const spot *const *ends;
    acb_ptr avoid;
    size_t avoid_count;
    shares *out;
    slong discs;
} survey;

void half_root(acb_t out, const spot *s, slong m, slong bits)
{
    acb_t q;
    acb_init(q);
    bool turned = arf_sgn(arb_midref(acb_realref(s->lead))) < 0; /* away from the root's cut */
    if (turned)
        acb_neg(q, s->lead);
    else
        acb_set(q, s->lead);
    acb_inv(q, q, bits);
    acb_root_ui(q, q, (ulong)m, bits);
    if (turned) { /* times exp(-i pi/m) */
        acb_t w;
        fmpq_t t;
        acb_init(w);
        fmpq_init(t);
        fmpq_set_si(t, -1, (ulong)m);
        arb_sin_cos_pi_fmpq(acb_imagref(w), acb_realref(w), t, bits);
        acb_mul(q, q, w, bits);
        fmpq_clear(t);
        acb_clear(w);
    }
    acb_set(out, q);
    acb_clear(q);
}

static void first_direction(acb_t out, const spot *s, slong m)
{
    arb_t a;
    arb_init(a);
    half_root(out, s, m, WORK_BITS);
    acb_abs(a, out, WORK_BITS);
    acb_div_arb(out, out, a, WORK_BITS);
    arb_clear(a);
}

/* exp(2 pi i (k + half/2)/m) times D_0 times turn^(1/m), a unit: the direction of D_k, or A_k where half is 1. */
static void half_direction(acb_t out, const acb_t first, const acb_t turn, slong k, int half, slong m)
{
    fmpq_t t;
    acb_t w;
    arb_t a;
    fmpq_init(t);
    acb_init(w);
    arb_init(a);
    fmpq_set_si(t, 2 * k + half, (ulong)m);
    arb_sin_cos_pi_fmpq(acb_imagref(w), acb_realref(w), t, WORK_BITS);
    acb_mul(out, first, w, WORK_BITS);
    acb_root_ui(w, turn, (ulong)m, WORK_BITS);
    acb_mul(out, out, w, WORK_BITS);
    acb_abs(a, out, WORK_BITS);
    acb_div_arb(out, out, a, WORK_BITS);
    fmpq_clear(t);
    acb_clear(w);
    arb_clear(a);
}

/* How far below the spot the path's level lies; not positive: its ascending curves never meet the path. */
static void span_of(arb_t out, const survey *v, const spot *s)
{
    acb_t h;
    acb_init(h);
    acb_div(h, s->height, &v->turn, WORK_BITS);
    arb_sub(out, acb_realref(h), v->level, 64);
    arb_add_ui(out, out, 0, 64);
    arf_t top;
    arf_init(top);
    arb_get_ubound_arf(top, out, 64);
    arb_set_arf(out, top);
    arf_mul_2exp_si(top, top, -6);
    arb_add_arf(out, out, top, 64); /* a little lower than the level */
    arf_clear(top);
    acb_clear(h);
}

/* Distance scale at an end: well inside everything else. */
static void first_distance(mag_t out, const survey *v, const spot *s, size_t end)
{
    arf_t nearest, d;
    acb_t w;
    arb_t a;
    arf_init(nearest);
    arf_init(d);
    acb_init(w);
    arb_init(a);
    arf_pos_inf(nearest);
    for (size_t k = 0; k < v->l->count; k++) {
        acb_sub(w, v->l->spots[k].z, s->z, 64);
        acb_abs(a, w, 64);
        arb_get_lbound_arf(d, a, 64);
        if (arf_sgn(d) > 0 && arf_cmp(d, nearest) < 0)
            arf_set(nearest, d);
    }
    if (v->r->count > 1) {
        acb_sub(w, v->r->at + (end ? v->r->count - 2 : 1), s->z, 64);
        acb_abs(a, w, 64);
        arb_get_lbound_arf(d, a, 64);
        if (arf_cmp(d, nearest) < 0)
            arf_set(nearest, d);
    }
    if (arf_is_pos_inf(nearest))
        arf_one(nearest);
    arf_mul_2exp_si(nearest, nearest, -10);
    arf_get_mag_lower(out, nearest);
    arf_clear(nearest);
    arf_clear(d);
    acb_clear(w);
    arb_clear(a);
}

/* The leg's direction at a finite end, seen from the end. */
static void leaving(acb_t out, const route *r, int end)
{
    if (r->count == 1)
        acb_set(out, r->toward[1 - end]);
    else
        acb_sub(out, r->at + (end ? r->count - 2 : 1), r->at + (end ? r->count - 1 : 0), WORK_BITS);
}

/* Which D_k's sector the path leaves the end by; -1: too near to an ascending curve to say. */
static slong leaving_sector(const survey *v, const acb_t first, slong m, int end)
{
    acb_t d, w;
    arb_t a, margin, pi;
    acb_init(d), acb_init(w);
    arb_init(a), arb_init(margin), arb_init(pi);
    slong found = -1;
    leaving(d, v->r, end);
    arb_const_pi(pi, 64);
    arb_div_si(pi, pi, m, 64);
    arb_set_d(margin, 0.08);
    arb_sub(margin, pi, margin, 64);
    for (slong k = 0; k < m && found < 0; k++) {
        half_direction(w, first, &v->turn, k, 0, m);
        acb_div(w, d, w, 64);
        if (m == 1 && arb_is_positive(acb_realref(w))) { /* the one ascending curve lies opposite */
            found = 0;
        } else {
            acb_arg(a, w, 64);
            arb_abs(a, a);
            if (arb_lt(a, margin))
                found = k;
        }
    }
    acb_clear(d), acb_clear(w);
    arb_clear(a), arb_clear(margin), arb_clear(pi);
    return found;
}

/* The counts of one spot into n. False: undecided (the path or the turn is special). */
static bool count_spot(survey *v, size_t index, slong *n)
{
    const share *h = v->out->list + index;
    slong m = h->halves;
    int end = h->at == v->ends[0] ? 0 : h->at == v->ends[1] ? 1 : -1;
    bool both = v->ends[0] && v->ends[1] && h->at == v->ends[0] && acb_overlaps(v->ends[1]->z, v->ends[0]->z);
    arb_t span;
    mag_t first;
    acb_t direction, cut;
    arb_init(span);
    mag_init(first);
    acb_init(direction), acb_init(cut);
    acb_srcptr cuts[2] = {NULL, NULL};
    bool fine = !both;
    for (slong k = 0; k < m; k++)
        n[k] = 0;
    if (end >= 0) {
        slong sector = leaving_sector(v, v->out->directions + index, m, end);
        fine = fine && sector >= 0;
        if (fine)
            n[sector] += end == 0 ? 1 : -1;
        first_distance(first, v, h->at, (size_t)end);
        leaving(cut, v->r, end);
        arb_t a;
        arb_init(a);
        acb_abs(a, cut, 64);
        acb_div_arb(cut, cut, a, 64);
        arf_set_mag(arb_midref(a), first);
        mag_zero(arb_radref(a));
        arb_mul_2exp_si(a, a, -2);
        acb_mul_arb(cut, cut, a, 64);
        acb_add(cut, cut, h->at->z, WORK_BITS);
        acb_get_mid(cut, cut);
        arb_clear(a);
        cuts[end] = cut;
    }
    span_of(span, v, h->at);
    if (!arb_is_nonpositive(span))
        for (slong k = 0; k < m && fine; k++) {
            chain c;
            slong net = 0;
            chain_init(&c);
            half_direction(direction, v->out->directions + index, &v->turn, k, 1, m);
            fine = chain_follow(&c, v->l, h->at, -1, &v->turn, direction, span, v->avoid, v->avoid_count, end >= 0 ? first : NULL) &&
                   net_crossings(&net, &c, v->r, cuts);
            v->discs += c.count;
            if (h->residue) {
                n[0] += net; /* from right to left of the curve that leaves the pole: counterclockwise */
            } else {
                n[k] -= net;
                n[(k + 1) % m] += net;
            }
            chain_clear(&c);
        }
    arb_clear(span);
    mag_clear(first);
    acb_clear(direction), acb_clear(cut);
    return fine;
}

/* All counts for one turn, on one (perhaps bent) path. */
static bool count_all(survey *v, bool second)
{
    bool fine = true;
    for (size_t k = 0; k < v->out->count && fine; k++)
        fine = count_spot(v, k, second ? v->out->list[k].other : v->out->list[k].n);
    return fine;
}

/* With bends until nothing is in special position. *hill: the path does not stay above a level. */
static bool count_bent(survey *v, const route *r, const spot *poles, size_t pole_count, bool second, bool *hill)
{
    bool done = false;
    *hill = false;
    for (int attempt = 0; attempt < BENDS && !done && budget_ok(v->e); attempt++) {
        route bent;
        ground g = {v->l, &v->turn, {*v->level}};
        arb_init(g.level);
        bool fine = bend(&bent, r, v->l, poles, pole_count, attempt);
        if (fine) {
            fine = level_of(&g, &bent);
            *hill = !fine;
        }
        if (fine) {
            arb_set(v->level, g.level);
            v->r = &bent;
            done = count_all(v, second);
        }
        v->r = r;
        arb_clear(g.level);
        route_clear(&bent);
        if (*hill)
            break;
    }
    return done;
}

/* ---- turns ---- */

/* Do the heights of two spots that matter lie level (exactly, or not told apart)? *angle: the least angle between a difference of
 * heights and the real axis among the others. */
static bool heights_meet(const shares *s, const landscape *l, double *angle)
{
    bool meet = false;
    acb_t d;
    arb_t a;
    acb_init(d);
    arb_init(a);
    *angle = 0.5;
    for (size_t i = 0; i < s->count; i++)
        for (size_t j = 0; j < s->count; j++) {
            if (i == j || s->list[j].residue)
                continue;
            int im = heights_compare(l, s->list[i].at, s->list[j].at, 1);
            if (im == 0 || im == 2) {
                int re = heights_compare(l, s->list[i].at, s->list[j].at, 0);
                meet = meet || re == 1 || re == 2;
                continue;
            }
            acb_sub(d, s->list[i].at->height, s->list[j].at->height, 128);
            acb_arg(a, d, 64);
            double arg = fabs(arf_get_d(arb_midref(a), ARF_RND_NEAR));
            arg = fmin(arg, M_PI - arg);
            *angle = fmin(*angle, arg);
        }
    acb_clear(d);
    arb_clear(a);
    return meet;
}

static void set_turn(survey *v, double tau)
{
    acb_one(&v->turn);
    arb_set_d(acb_imagref(&v->turn), tau);
}

static char *words_of(const char *format, ...) __attribute__((format(printf, 1, 2)));

static char *words_of(const char *format, ...)
{
    char words[400];
    va_list list;
    va_start(list, format);
    vsnprintf(words, sizeof words, format, list);
    va_end(list);
    return base_copy(words);
}

static share *add_share(shares *s, const spot *at, slong halves, bool residue)
{
    share *h = s->list + s->count;
    *h = (share){.at = at, .halves = halves, .residue = residue};
    h->n = base_alloc((size_t)halves * sizeof *h->n);
    h->other = base_alloc((size_t)halves * sizeof *h->other);
    acb_init(s->directions + s->count);
    first_direction(s->directions + s->count, at, halves);
    s->count++;
    return h;
}

static void list_shares(shares *out, const landscape *l, const spot *const ends[2], const spot *poles, size_t pole_count)
{
    size_t most = l->count + pole_count + 2;
    memset(out, 0, sizeof *out);
    out->list = base_alloc(most * sizeof *out->list);
    out->directions = base_alloc(most * sizeof *out->directions);
    for (int k = 0; k < 2; k++)
        if (ends[k])
            add_share(out, ends[k], ends[k]->order + 1, false);
    for (size_t k = 0; k < l->count; k++) {
        bool is_end = false;
        for (int j = 0; j < 2; j++)
            is_end = is_end || (ends[j] && qqbar_equal(ends[j]->exact, l->spots[k].exact));
        if (l->spots[k].order > 0 && !is_end)
            add_share(out, l->spots + k, l->spots[k].order + 1, false);
    }
    for (size_t k = 0; k < pole_count; k++)
        add_share(out, poles + k, 1, true);
}

static void settle_shares(shares *s)
{
    for (size_t k = 0; k < s->count; k++) {
        share *h = s->list + k;
        if (!s->turned)
            memcpy(h->other, h->n, (size_t)h->halves * sizeof *h->n);
        h->stokes = memcmp(h->other, h->n, (size_t)h->halves * sizeof *h->n) != 0;
    }
}

tw_status thimbles_find(tw_engine *e, shares *out, landscape *l, const route *r, const spot *const ends[2], const spot *poles,
                        size_t pole_count, bool *found, char **why)
{
    survey v = {.e = e, .l = l, .r = r, .ends = ends, .out = out};
    bool hill = false, done = false;
    double angle;
    *found = false;
    *why = NULL;
    landscape_refine(l, WORK_BITS);
    list_shares(out, l, ends, poles, pole_count);
    out->turned = heights_meet(out, l, &angle);
    acb_init(&v.turn);
    arb_init(v.level);
    v.avoid = _acb_vec_init(2);
    for (int k = 0; k < 2; k++)
        if (ends[k])
            acb_set(v.avoid + v.avoid_count++, ends[k]->z);
    double tau = out->turned ? fmin(0.25 * angle, 0.02) : 0;
    for (int k = 0; k < TURNS && !done && budget_ok(e); k++, tau *= 0.25) {
        set_turn(&v, tau);
        done = count_bent(&v, r, poles, pole_count, false, &hill);
        if (done && out->turned) {
            set_turn(&v, -tau);
            done = count_bent(&v, r, poles, pole_count, true, &hill);
        }
        if (!out->turned || e->error.kind)
            break;
    }
    out->turn = tau;
    out->discs = v.discs;
    settle_shares(out);
    if (!done && e->error.kind == ERROR_NONE)
        *why = hill ? words_of("the path is not seen to stay out of the hills of the exponent: at an end or on the way the integrand "
                               "grows beyond every bound, or a pole lies on the path")
                    : words_of("the ascending curves from the saddles could not be followed past the path");
    _acb_vec_clear(v.avoid, 2);
    acb_clear(&v.turn);
    arb_clear(v.level);
    *found = done;
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
