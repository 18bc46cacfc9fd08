/* Patches of the path: storing them, reading h and t from them. One idea: once the kept terms have cancelled in exact Taylor
 * coefficients, a short polynomial in balls of 64 bits is all that a bound needs, and splitting a panel costs only evaluations. */
#include "engine/numeric/patches.h"

#include <string.h>

enum { PATCH_BITS = 64, LINE_BITS = 128 };

/* Patches are laid side by side in doubles; each is read a little beyond its ends, so that no sliver is left between two. */
#define SLACK 1e-6

void patches_init(patches *s)
{
    memset(s, 0, sizeof *s);
}

void patches_clear(patches *s)
{
    for (slong k = 0; k < s->count; k++) {
        patch *q = s->list + k;
        arf_clear(q->centre);
        arf_clear(q->width);
        _arb_vec_clear(q->poly, q->lanes * q->length);
        for (slong j = 0; j < PROBLEM_LOGS; j++)
            mag_clear(q->error[j]);
        arb_clear(q->t_left);
        arb_clear(q->t_right);
    }
    flint_free(s->list);
    patches_init(s);
}

patch *patches_add(patches *s, slong lanes, slong length)
{
    patch *q;
    if (s->count == s->room) {
        s->room = 2 * s->room + 16;
        s->list = flint_realloc(s->list, s->room * sizeof(patch));
    }
    q = s->list + s->count++;
    memset(q, 0, sizeof *q);
    arf_init(q->centre);
    arf_init(q->width);
    q->lanes = lanes;
    q->length = length;
    q->poly = _arb_vec_init(lanes * length);
    for (slong j = 0; j < PROBLEM_LOGS; j++)
        mag_init(q->error[j]);
    arb_init(q->t_left);
    arb_init(q->t_right);
    return q;
}

bool patches_build(patches *s, problem *p, slong first, double y_far)
{
    double T_needed = y_far, T_near;
    s->first = first;
    if (!p->pure) {
        arb_t y, t;
        fmpq_t inverse;
        arb_init(y);
        arb_init(t);
        fmpq_init(inverse);
        arb_set_d(y, y_far);
        problem_t(t, p, y, PATCH_BITS);
        fmpq_inv(inverse, p->m);
        arb_pow_fmpq(t, t, inverse, PATCH_BITS);
        T_needed = arf_get_d(arb_midref(t), ARF_RND_UP);
        fmpq_clear(inverse);
        arb_clear(t);
        arb_clear(y);
    }
    return near_build(s, p, T_needed, &T_near) && discs_build(s, p, T_near, y_far);
}

void kept_taylor(arb_ptr out, slong length, arb_srcptr f, slong count, const arb_t c, slong bits)
{
    _arb_vec_zero(out, length);
    for (slong i = count - 1; i >= 0; i--) {
        slong top = FLINT_MIN(length - 1, count - 1 - i);
        for (slong j = top; j >= 1; j--) {
            arb_mul(out + j, out + j, c, bits);
            arb_add(out + j, out + j, out + j - 1, bits);
        }
        arb_mul(out, out, c, bits);
        arb_add(out, out, f + i, bits);
    }
}

/* The polynomial around centre inside |z| <= 1: value and slope there, and a bound of what bends up to out->half. */
static void poly_affine(affine *out, arb_srcptr a, slong length, double centre)
{
    arb_t c;
    mag_t z, bend, part;
    arb_init(c);
    mag_init(z);
    mag_init(bend);
    mag_init(part);
    arb_set_d(c, centre);
    arb_zero(out->v);
    arb_zero(out->b);
    for (slong j = length - 1; j >= 0; j--) {
        if (j < length - 1)
            arb_mul(out->b, out->b, c, PATCH_BITS);
        arb_add(out->b, out->b, out->v, PATCH_BITS);
        arb_mul(out->v, out->v, c, PATCH_BITS);
        arb_add(out->v, out->v, a + j, PATCH_BITS);
    }
    mag_set_d(z, centre < 0 ? -centre : centre);
    mag_add(z, z, out->half);
    for (slong j = length - 1; j >= 2; j--) {
        mag_mul(bend, bend, z);
        arb_get_mag(part, a + j);
        mag_mul_ui(part, part, (ulong)(j * (j - 1)));
        mag_add(bend, bend, part);
    }
    mag_mul(bend, bend, out->half);
    mag_mul(bend, bend, out->half);
    mag_mul_2exp_si(out->r, bend, -1);
    mag_clear(part);
    mag_clear(bend);
    mag_clear(z);
    arb_clear(c);
}

/* The coordinate at z, exactly. */
static void coordinate(arb_t y, const patch *s, double z)
{
    arb_set_d(y, z);
    arb_mul_arf(y, y, s->width, ARF_PREC_EXACT);
    arb_add_arf(y, y, s->centre, ARF_PREC_EXACT);
}

void patch_t(arb_t t, const problem *p, const patch *s, double z)
{
    arb_t y;
    if (z <= -1) {
        arb_set(t, s->t_left);
        return;
    }
    if (z >= 1) {
        arb_set(t, s->t_right);
        return;
    }
    arb_init(y);
    coordinate(y, s, z);
    if (s->near)
        problem_power(t, p, y, 2 * PATCH_BITS);
    else
        problem_t(t, p, y, 2 * PATCH_BITS);
    arb_clear(y);
}

void patch_lane_bound(mag_t bound, const patch *s, slong k, double z0, double z1)
{
    affine part;
    arb_t range;
    affine_init(&part);
    arb_init(range);
    mag_set_d(part.half, z1 / 2 - z0 / 2 + SLACK);
    poly_affine(&part, s->poly + k * s->length, s->length, z0 / 2 + z1 / 2);
    mag_add(part.r, part.r, s->error[k]);
    affine_range(range, &part, PATCH_BITS);
    arb_get_mag(bound, range);
    arb_clear(range);
    affine_clear(&part);
}

/* X^m for X = middle + step, |step| <= reach < middle: value, slope times `width`, and what bends. */
static bool power_affine(affine *t, const problem *p, const arb_t middle, const arb_t reach, const arb_t width)
{
    arb_t X, bend, m;
    bool fine = true;
    arb_init(X);
    arb_init(bend);
    arb_init(m);
    arb_set_fmpq(m, p->m, LINE_BITS);
    arb_pow(t->v, middle, m, LINE_BITS);
    arb_div(t->b, t->v, middle, LINE_BITS);
    arb_mul(t->b, t->b, m, LINE_BITS);
    arb_mul(t->b, t->b, width, LINE_BITS);
    mag_zero(t->r);
    if (!fmpq_is_one(p->m)) { /* m (m - 1) X^(m - 2) reach^2 / 2, greatest at one of the ends */
        arb_sub_ui(bend, m, 2, LINE_BITS);
        if (arb_is_negative(bend))
            arb_sub(X, middle, reach, LINE_BITS);
        else
            arb_add(X, middle, reach, LINE_BITS);
        fine = arb_is_positive(X);
        arb_pow(X, X, bend, LINE_BITS);
        arb_sub_ui(bend, m, 1, LINE_BITS);
        arb_mul(bend, bend, m, LINE_BITS);
        arb_mul(X, X, bend, LINE_BITS);
        arb_mul(X, X, reach, LINE_BITS);
        arb_mul(X, X, reach, LINE_BITS);
        arb_mul_2exp_si(X, X, -1);
        arb_get_mag(t->r, X);
    }
    arb_clear(m);
    arb_clear(bend);
    arb_clear(X);
    return fine && mag_is_finite(t->r);
}

/* ell = ell_factor * m * log(X), likewise. */
static bool log_affine(affine *ell, const problem *p, const arb_t middle, const arb_t reach, const arb_t width)
{
    arb_t x, front;
    bool fine;
    arb_init(x);
    arb_init(front);
    arb_set_fmpq(front, p->m, LINE_BITS);
    arb_mul(front, front, p->ell_factor, LINE_BITS);
    arb_log(ell->v, middle, LINE_BITS);
    arb_mul(ell->v, ell->v, front, LINE_BITS);
    arb_div(ell->b, front, middle, LINE_BITS);
    arb_mul(ell->b, ell->b, width, LINE_BITS);
    arb_sub(x, middle, reach, LINE_BITS);
    fine = arb_is_positive(x);
    arb_div(x, reach, x, LINE_BITS);
    arb_mul(x, x, x, LINE_BITS);
    arb_mul(x, x, front, LINE_BITS);
    arb_mul_2exp_si(x, x, -1);
    arb_get_mag(ell->r, x);
    arb_clear(front);
    arb_clear(x);
    return fine && mag_is_finite(ell->r);
}

/* p(middle + step), likewise, by jets. */
static bool phase_affine(affine *t, const problem *p, const arb_t middle, const arb_t reach, const arb_t width)
{
    acb_struct jet[3];
    acb_t at;
    mag_t away;
    bool fine = true;
    for (int k = 0; k < 3; k++)
        acb_init(jet + k);
    acb_init(at);
    mag_init(away);
    arb_set(acb_realref(at), middle);
    tape_jet(jet, p->phase, at, 2, LINE_BITS);
    fine = acb_is_finite(jet) && acb_is_finite(jet + 1);
    arb_set(t->v, acb_realref(jet));
    arb_mul(t->b, acb_realref(jet + 1), width, LINE_BITS);
    arb_get_mag(away, reach);
    mag_add(arb_radref(acb_realref(at)), arb_radref(acb_realref(at)), away);
    tape_jet(jet, p->phase, at, 3, PATCH_BITS);
    fine = fine && acb_is_finite(jet + 2);
    arb_get_mag(t->r, acb_realref(jet + 2));
    mag_mul(t->r, t->r, away);
    mag_mul(t->r, t->r, away);
    mag_clear(away);
    acb_clear(at);
    for (int k = 0; k < 3; k++)
        acb_clear(jet + k);
    return fine && mag_is_finite(t->r);
}

bool patch_affine(affine *h, affine *t, affine *ell, const problem *p, const patch *s, double z0, double z1)
{
    double centre = z0 / 2 + z1 / 2, half = z1 / 2 - z0 / 2;
    arb_t middle, reach, width;
    affine part;
    bool fine;
    arb_init(middle);
    arb_init(reach);
    arb_init(width);
    affine_init(&part);
    coordinate(middle, s, centre);
    arb_set_arf(width, s->width);
    /* patches near 0 lie exactly side by side; others have the slack that patch_range has */
    arb_set_d(reach, half + (s->near ? 0x1p-50 * half : SLACK));
    arb_mul(reach, reach, width, LINE_BITS);
    mag_set_d(h->half, half + SLACK);
    mag_set(t->half, h->half);
    mag_set(ell->half, h->half);
    mag_set(part.half, h->half);
    if (s->near || p->pure) {
        fine = power_affine(t, p, middle, reach, width);
    } else if (problem_is_beyond(p, arb_midref(middle))) { /* T = ratio*y there */
        arb_mul(middle, middle, p->ratio, LINE_BITS);
        arb_mul(reach, reach, p->ratio, LINE_BITS);
        arb_mul(width, width, p->ratio, LINE_BITS);
        fine = power_affine(t, p, middle, reach, width);
    } else {
        fine = phase_affine(t, p, middle, reach, width);
    }
    if (fine && p->lanes > 1)
        fine = log_affine(ell, p, middle, reach, width);
    affine_zero(h, part.half);
    for (slong k = s->lanes - 1; k >= 0 && fine; k--) {
        if (k < s->lanes - 1)
            affine_mul(h, h, ell, PATCH_BITS);
        poly_affine(&part, s->poly + k * s->length, s->length, centre);
        mag_add(part.r, part.r, s->error[k]);
        affine_add(h, h, &part, PATCH_BITS);
    }
    affine_clear(&part);
    arb_clear(width);
    arb_clear(reach);
    arb_clear(middle);
    return fine;
}

/* ell over the part of the path between z0 and z1; t > 0 there. */
static void ell_range(arb_t ell, const problem *p, const patch *s, double z0, double z1)
{
    arb_t other;
    arb_init(other);
    patch_t(ell, p, s, z0);
    patch_t(other, p, s, z1);
    arb_log(ell, ell, PATCH_BITS);
    arb_log(other, other, PATCH_BITS);
    arb_union(ell, ell, other, PATCH_BITS);
    arb_mul(ell, ell, p->ell_factor, PATCH_BITS);
    arb_clear(other);
}

void patch_range(arb_t h, const problem *p, const patch *s, double z0, double z1)
{
    arb_t ell, range;
    affine part;
    arb_init(ell);
    arb_init(range);
    affine_init(&part);
    mag_set_d(part.half, z1 / 2 - z0 / 2 + SLACK);
    if (s->lanes > 1)
        ell_range(ell, p, s, z0, z1);
    arb_zero(h);
    for (slong k = s->lanes - 1; k >= 0; k--) {
        if (k < s->lanes - 1)
            arb_mul(h, h, ell, PATCH_BITS);
        poly_affine(&part, s->poly + k * s->length, s->length, z0 / 2 + z1 / 2);
        mag_add(part.r, part.r, s->error[k]);
        affine_range(range, &part, PATCH_BITS);
        arb_add(h, h, range, PATCH_BITS);
    }
    affine_clear(&part);
    arb_clear(range);
    arb_clear(ell);
}
