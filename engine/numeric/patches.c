/* Patches of the path: storing them, reading h and t from them. One idea: once the kept terms have cancelled in exact Taylor
 * coefficients, a short polynomial in balls of 64 bits is all that a bound needs, and splitting a panel costs only evaluations. */
#include "engine/numeric/patches.h"

#include <string.h>

enum { PATCH_BITS = 64 };

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

/* The polynomial over centre +- half inside |z| <= 1: value and slope at the centre, and a bound of the second derivative. */
static void poly_range(arb_t out, arb_srcptr a, slong length, double centre, double half)
{
    arb_t c, slope, value;
    mag_t z, bend, part, h;
    arb_init(c);
    arb_init(slope);
    arb_init(value);
    mag_init(z);
    mag_init(bend);
    mag_init(part);
    mag_init(h);
    arb_set_d(c, centre);
    for (slong j = length - 1; j >= 0; j--) {
        if (j < length - 1)
            arb_mul(slope, slope, c, PATCH_BITS);
        arb_add(slope, slope, value, PATCH_BITS);
        arb_mul(value, value, c, PATCH_BITS);
        arb_add(value, value, a + j, PATCH_BITS);
    }
    mag_set_d(z, (centre < 0 ? -centre : centre) + half);
    for (slong j = length - 1; j >= 2; j--) {
        mag_mul(bend, bend, z);
        arb_get_mag(part, a + j);
        mag_mul_ui(part, part, (ulong)(j * (j - 1)));
        mag_add(bend, bend, part);
    }
    mag_set_d(h, half);
    mag_mul(bend, bend, h);
    mag_mul_2exp_si(bend, bend, -1);
    arb_get_mag(part, slope);
    mag_add(bend, bend, part);
    mag_mul(bend, bend, h);
    arb_set(out, value);
    mag_add(arb_radref(out), arb_radref(out), bend);
    mag_clear(h);
    mag_clear(part);
    mag_clear(bend);
    mag_clear(z);
    arb_clear(value);
    arb_clear(slope);
    arb_clear(c);
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
    arb_set_d(y, z);
    arb_mul_arf(y, y, s->width, ARF_PREC_EXACT);
    arb_add_arf(y, y, s->centre, ARF_PREC_EXACT);
    if (s->near)
        problem_power(t, p, y, 2 * PATCH_BITS);
    else
        problem_t(t, p, y, 2 * PATCH_BITS);
    arb_clear(y);
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

void patch_lane_bound(mag_t bound, const patch *s, slong k, double z0, double z1)
{
    arb_t part;
    arb_init(part);
    poly_range(part, s->poly + k * s->length, s->length, z0 / 2 + z1 / 2, z1 / 2 - z0 / 2 + SLACK);
    mag_add(arb_radref(part), arb_radref(part), s->error[k]);
    arb_get_mag(bound, part);
    arb_clear(part);
}

void patch_range(arb_t h, const problem *p, const patch *s, double z0, double z1)
{
    arb_t ell, part;
    double centre = z0 / 2 + z1 / 2, half = z1 / 2 - z0 / 2;
    arb_init(ell);
    arb_init(part);
    half += SLACK;
    if (s->lanes > 1)
        ell_range(ell, p, s, z0, z1);
    arb_zero(h);
    for (slong k = s->lanes - 1; k >= 0; k--) {
        if (k < s->lanes - 1)
            arb_mul(h, h, ell, PATCH_BITS);
        poly_range(part, s->poly + k * s->length, s->length, centre, half);
        mag_add(arb_radref(part), arb_radref(part), s->error[k]);
        arb_add(h, h, part, PATCH_BITS);
    }
    arb_clear(part);
    arb_clear(ell);
}
