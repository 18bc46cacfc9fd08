/* Steepest curves by chains of discs in which p is proved univalent. Knows nothing of paths of integration.
 *
 * The one idea: with the zeros and poles of p' known, |p'(z)/p'(c) - 1| on |z - c| <= r is at most the product
 * kappa = prod (1 + r/|c - sigma|)^order prod (1 - r/|c - e|)^-order - 1. Below 1 it makes p univalent there, the image covering the
 * disc of radius (1 - kappa) |p'(c)| r about p(c); so a straight piece of the ray in the p plane has one preimage in the disc. At the
 * saddle itself the same product without its own factor does it for the root (p - p0)^(1/m). */
#include "engine/method/thimble.h"

#include <math.h>
#include <stdlib.h>

enum { CHAIN_LIMIT = 4000, RADII = 10 };

void chain_init(chain *c)
{
    *c = (chain){0};
}

void chain_clear(chain *c)
{
    if (c->at)
        _acb_vec_clear(c->at, c->room);
    *c = (chain){0};
}

static acb_ptr chain_add(chain *c)
{
    if (c->count == c->room) {
        slong room = c->room ? 2 * c->room : 64;
        acb_ptr at = _acb_vec_init(room);
        for (slong k = 0; k < c->count; k++)
            acb_swap(at + k, c->at + k);
        if (c->at)
            _acb_vec_clear(c->at, c->room);
        c->at = at;
        c->room = room;
    }
    return c->at + c->count++;
}

/* ---- the bound ---- */

/* Lower bound of |c - z|. */
static void distance_below(arf_t out, const acb_t c, const acb_t z)
{
    acb_t d;
    arb_t a;
    acb_init(d);
    arb_init(a);
    acb_sub(d, c, z, 128);
    acb_abs(a, d, 64);
    arb_get_lbound_arf(out, a, 64);
    if (arf_sgn(out) < 0)
        arf_zero(out);
    acb_clear(d);
    arb_clear(a);
}

/* Upper bound of kappa on |z - c| <= r; own: the spot whose factor is left out. Infinite where r reaches a pole. */
static void kappa_bound(arb_t kappa, const landscape *l, const arf_struct *distance, const arb_t r, const spot *own)
{
    enum { BITS = 64 };
    arb_t f, d;
    arb_init(f);
    arb_init(d);
    arb_one(kappa);
    for (size_t k = 0; k < l->count; k++) {
        const spot *s = l->spots + k;
        if (s == own)
            continue;
        arb_set_arf(d, distance + k);
        arb_div(f, r, d, BITS);
        if (s->order < 0)
            arb_neg(f, f);
        arb_add_ui(f, f, 1, BITS);
        if (!arb_is_positive(f)) {
            arb_pos_inf(kappa);
            break;
        }
        arb_pow_ui(f, f, (ulong)FLINT_ABS(s->order), BITS);
        if (s->order < 0)
            arb_div(kappa, kappa, f, BITS);
        else
            arb_mul(kappa, kappa, f, BITS);
    }
    arb_sub_ui(kappa, kappa, 1, BITS);
    if (arb_is_finite(kappa)) {
        arb_get_ubound_arf(arb_midref(kappa), kappa, BITS);
        mag_zero(arb_radref(kappa));
    }
    arb_clear(f);
    arb_clear(d);
}

/* (1 + kappa) (1 - kappa)^(-(m-1)/m) - 1: the same for (p - p0)^(1/m). */
static void kappa_of_root(arb_t kappa, slong m)
{
    enum { BITS = 64 };
    arb_t f;
    arb_init(f);
    if (arb_is_finite(kappa)) {
        arb_sub_ui(f, kappa, 1, BITS);
        arb_neg(f, f);
        if (arb_is_positive(f)) {
            fmpq_t q;
            fmpq_init(q);
            fmpq_set_si(q, -(m - 1), (ulong)m);
            arb_pow_fmpq(f, f, q, BITS);
            fmpq_clear(q);
            arb_add_ui(kappa, kappa, 1, BITS);
            arb_mul(kappa, kappa, f, BITS);
            arb_sub_ui(kappa, kappa, 1, BITS);
            arb_get_ubound_arf(arb_midref(kappa), kappa, BITS);
            mag_zero(arb_radref(kappa));
        } else {
            arb_pos_inf(kappa);
        }
    }
    arb_clear(f);
}

/* The radius with the greatest (1 - kappa) r; `reach` is that value, `kappa` belongs to it. False: none. */
static bool choose_radius(arb_t r, arb_t kappa, arb_t reach, const landscape *l, const acb_t c, const spot *own, acb_srcptr avoid,
                          size_t avoid_count, const mag_t most)
{
    static const double parts[RADII] = {0.75, 0.6, 0.5, 0.42, 0.35, 0.28, 0.22, 0.16, 0.1, 0.05};
    arf_struct *distance = base_alloc((l->count + 1) * sizeof *distance);
    arf_t nearest, d;
    arb_t one, k, value;
    arf_init(nearest);
    arf_init(d);
    arb_init(one);
    arb_init(k);
    arb_init(value);
    arf_pos_inf(nearest);
    for (size_t n = 0; n < l->count; n++) {
        arf_init(distance + n);
        distance_below(distance + n, c, l->spots[n].z);
        if (l->spots + n != own && arf_cmp(distance + n, nearest) < 0)
            arf_set(nearest, distance + n);
    }
    if (arf_is_pos_inf(nearest)) {
        arf_set_ui(nearest, 1); /* nothing near: p is a power of its argument */
        arb_get_ubound_arf(d, acb_realref(c), 32);
        arf_abs(d, d);
        arf_add(nearest, nearest, d, 32, ARF_RND_DOWN);
    }
    arb_zero(reach);
    bool found = false;
    for (int j = 0; j < RADII; j++) {
        arf_set_d(d, parts[j]);
        arf_mul(d, d, nearest, 30, ARF_RND_DOWN);
        arb_set_arf(one, d);
        for (size_t n = 0; n < avoid_count; n++) {
            distance_below(d, c, avoid + n);
            arf_mul_2exp_si(d, d, -1);
            if (arf_sgn(d) > 0 && arf_cmp(arb_midref(one), d) > 0)
                arb_set_arf(one, d);
        }
        if (most) {
            arf_set_mag(d, most);
            if (arf_cmp(arb_midref(one), d) > 0)
                arb_set_arf(one, d);
        }
        kappa_bound(k, l, distance, one, own);
        if (own)
            kappa_of_root(k, own->order + 1);
        arb_sub_ui(value, k, 1, 64);
        arb_neg(value, value);
        arb_mul(value, value, one, 64);
        if (arb_is_finite(value) && arb_is_positive(value) && arf_cmp(arb_midref(value), arb_midref(reach)) > 0) {
            arb_set(reach, value);
            arb_set(r, one);
            arb_set(kappa, k);
            found = true;
        }
    }
    arb_get_lbound_arf(arb_midref(reach), reach, 64);
    mag_zero(arb_radref(reach));
    for (size_t n = 0; n < l->count; n++)
        arf_clear(distance + n);
    free(distance);
    arf_clear(nearest);
    arf_clear(d);
    arb_clear(one);
    arb_clear(k);
    arb_clear(value);
    return found;
}

bool univalent_disc(arb_t r, arb_t kappa, arb_t reach, const landscape *l, const acb_t c, const spot *own)
{
    return choose_radius(r, kappa, reach, l, c, own, NULL, 0, NULL);
}

/* ---- steps ---- */

/* Newton's iteration for p(z) = y from z; the result is exact. */
static void newton(acb_t z, const landscape *l, const acb_t y, slong bits)
{
    acb_t f, d;
    acb_init(f);
    acb_init(d);
    for (int k = 0; k < 12; k++) {
        landscape_value(f, l, z, bits);
        acb_sub(f, f, y, bits);
        landscape_slope(d, l, z, bits);
        acb_div(f, f, d, bits);
        acb_get_mid(f, f);
        acb_sub(z, z, f, bits);
        acb_get_mid(z, z);
        mag_t a, b;
        mag_init(a);
        mag_init(b);
        acb_get_mag(a, f);
        acb_get_mag(b, z);
        mag_mul_2exp_si(b, b, -bits / 2);
        bool small = mag_cmp(a, b) < 0 || !acb_is_finite(z);
        mag_clear(a);
        mag_clear(b);
        if (small && k > 0)
            break;
    }
    acb_clear(f);
    acb_clear(d);
}

/* Does the curve's point lie within `slack` of the exact c, as the univalence at c with (r, kappa) proves? slack is set to
 * |p(c) - y| / ((1 - kappa) |p'(c)|), at most r. */
static bool settle(arb_t slack, arb_t slope, const landscape *l, const acb_t c, const acb_t y, const arb_t r, const arb_t kappa,
                   slong bits)
{
    acb_t f;
    arb_t t;
    acb_init(f);
    arb_init(t);
    landscape_slope(f, l, c, bits);
    acb_abs(slope, f, bits);
    landscape_value(f, l, c, bits);
    acb_sub(f, f, y, bits);
    acb_abs(slack, f, bits);
    arb_sub_ui(t, kappa, 1, 64);
    arb_neg(t, t);
    arb_mul(t, t, slope, 64);
    arb_div(slack, slack, t, 64);
    bool fine = arb_is_finite(slack) && arb_is_positive(t) && arb_lt(slack, r);
    acb_clear(f);
    arb_clear(t);
    return fine;
}

typedef struct walk {
    chain *c;
    landscape *l;
    const spot *s;
    acb_t away; /* sign * turn: p = p(s) + t away */
    arb_t t;    /* where the last point lies */
    slong bits;
    acb_srcptr avoid;
    size_t avoid_count;
} walk;

static void ray_point(acb_t y, const walk *w, const arb_t t)
{
    acb_mul_arb(y, w->away, t, w->bits);
    acb_add(y, y, w->s->height, w->bits);
}

/* The first point, in the half branch. */
static bool first_step(walk *w, const acb_t direction, const mag_t first)
{
    slong m = w->s->order + 1, bits = w->bits;
    arb_t r, kappa, reach, slack, slope, size;
    acb_t c, y, d;
    arb_init(r), arb_init(kappa), arb_init(reach), arb_init(slack), arb_init(slope), arb_init(size);
    acb_init(c), acb_init(y), acb_init(d);
    acb_ptr start = chain_add(w->c);
    acb_get_mid(start, w->s->z);
    /* m = 1: the spot itself is regular, and the same bound serves */
    bool fine = choose_radius(r, kappa, reach, w->l, w->s->z, w->s->order > 0 ? w->s : NULL, w->avoid, w->avoid_count, first);
    if (fine) { /* |t| up to |lead| (0.8 reach)^m */
        arb_set_d(size, 0.8);
        arb_mul(reach, reach, size, 64);
        arb_pow_ui(reach, reach, (ulong)m, 64);
        acb_abs(size, w->s->lead, 64);
        arb_mul(w->t, reach, size, 64);
        acb_abs(size, w->away, 64);
        arb_div(w->t, w->t, size, 64);
        arb_get_lbound_arf(arb_midref(w->t), w->t, 40);
        mag_zero(arb_radref(w->t));
        ray_point(y, w, w->t);
        acb_abs(size, w->s->lead, 64); /* |w| about (t |away| / |lead|)^(1/m) */
        arb_div(size, w->t, size, 64);
        acb_abs(slope, w->away, 64);
        arb_mul(size, size, slope, 64);
        arb_root_ui(size, size, (ulong)m, 64);
        acb_mul_arb(c, direction, size, bits);
        acb_add(c, c, w->s->z, bits);
        acb_get_mid(c, c);
        newton(c, w->l, y, bits);
        /* the curve's own point lies within `slack` of c; with it inside the disc, and in the half branch's own sector */
        arb_t r2, kappa2, reach2;
        mag_t error;
        mag_init(error);
        arb_init(r2), arb_init(kappa2), arb_init(reach2);
        fine = acb_is_finite(c) && choose_radius(r2, kappa2, reach2, w->l, c, NULL, w->avoid, w->avoid_count, NULL) &&
               settle(slack, slope, w->l, c, y, r2, kappa2, bits);
        arb_clear(r2), arb_clear(kappa2), arb_clear(reach2);
        arb_get_mag(error, slack);
        acb_sub(d, c, w->s->z, bits);
        acb_add_error_mag(d, error);
        mag_clear(error);
        acb_abs(size, d, 64);
        acb_div(d, d, direction, bits);
        fine = fine && acb_is_finite(d) && arb_lt(size, r) && arb_is_positive(acb_realref(d));
    }
    if (fine) {
        acb_arg(size, d, 64);
        arb_abs(size, size);
        arb_mul_si(size, size, 2 * m, 64);
        arb_const_pi(slope, 64);
        fine = arb_lt(size, slope);
    }
    if (fine)
        acb_set(chain_add(w->c), c);
    arb_clear(r), arb_clear(kappa), arb_clear(reach), arb_clear(slack), arb_clear(slope), arb_clear(size);
    acb_clear(c), acb_clear(y), acb_clear(d);
    return fine;
}

/* From the last point one disc on. False when the chain is stuck. */
static bool next_step(walk *w)
{
    slong bits = w->bits;
    arb_t r, kappa, reach, slack, slope, step, size;
    acb_t c, y, d;
    arb_init(r), arb_init(kappa), arb_init(reach), arb_init(slack), arb_init(slope), arb_init(step), arb_init(size);
    acb_init(c), acb_init(y), acb_init(d);
    acb_set(c, w->c->at + w->c->count - 1);
    ray_point(y, w, w->t);
    bool fine = choose_radius(r, kappa, reach, w->l, c, NULL, w->avoid, w->avoid_count, NULL) &&
                settle(slack, slope, w->l, c, y, r, kappa, bits);
    if (fine) { /* the image covers (1 - kappa) |p'| r about p(c); go 0.85 of the way */
        arb_mul(step, reach, slope, 64);
        arb_set_d(size, 0.85);
        arb_mul(step, step, size, 64);
        acb_abs(size, w->away, 64);
        arb_div(step, step, size, 64);
        arb_add(w->t, w->t, step, bits);
        arb_get_mid_arb(w->t, w->t);
        ray_point(y, w, w->t);
        landscape_value(d, w->l, c, bits);
        acb_sub(d, y, d, bits);
        acb_abs(size, d, 64);
        arb_mul(step, reach, slope, 64);
        fine = arb_lt(size, step);
        landscape_slope(y, w->l, c, bits);
        acb_div(d, d, y, bits);
        acb_add(d, d, c, bits);
        acb_get_mid(d, d);
        ray_point(y, w, w->t);
        newton(d, w->l, y, bits);
        acb_sub(y, d, c, bits); /* the new point, with its slack, inside the disc */
        acb_abs(size, y, 64);
        fine = fine && acb_is_finite(d) && arb_lt(size, r);
    }
    if (fine) {
        arb_t r2, kappa2, reach2;
        arb_init(r2), arb_init(kappa2), arb_init(reach2);
        ray_point(y, w, w->t);
        fine = choose_radius(r2, kappa2, reach2, w->l, d, NULL, w->avoid, w->avoid_count, NULL) &&
               settle(slack, slope, w->l, d, y, r2, kappa2, bits);
        arb_add(size, size, slack, 64);
        fine = fine && arb_lt(size, r);
        arb_clear(r2), arb_clear(kappa2), arb_clear(reach2);
    }
    if (fine)
        acb_set(chain_add(w->c), d);
    arb_clear(r), arb_clear(kappa), arb_clear(reach), arb_clear(slack), arb_clear(slope), arb_clear(step), arb_clear(size);
    acb_clear(c), acb_clear(y), acb_clear(d);
    return fine;
}

bool chain_follow(chain *c, landscape *l, const spot *s, int sign, const acb_t turn, const acb_t direction, const arb_t span,
                  acb_srcptr avoid, size_t avoid_count, const mag_t first)
{
    walk w = {.c = c, .l = l, .s = s, .bits = l->bits, .avoid = avoid, .avoid_count = avoid_count};
    acb_init(w.away);
    arb_init(w.t);
    acb_mul_si(w.away, turn, sign, l->bits);
    bool fine = first_step(&w, direction, first);
    while (fine && !arb_gt(w.t, span) && c->count < CHAIN_LIMIT && budget_ok(l->e))
        fine = next_step(&w);
    fine = fine && arb_gt(w.t, span);
    acb_clear(w.away);
    arb_clear(w.t);
    return fine;
}
