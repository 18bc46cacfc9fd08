/* Arithmetic of functions known as a straight line and a bound of what bends (Taylor models of order 1; Makino and Berz 2003, from
 * memory). One idea: on a panel of width w the line's integral with the weight is exact and what bends is of order w^2, so halving
 * a panel costs a quarter of its loss, also where the lines cancel against each other. */
#include "engine/numeric/affine.h"

void affine_init(affine *f)
{
    arb_init(f->v);
    arb_init(f->b);
    mag_init(f->r);
    mag_init(f->half);
}

void affine_clear(affine *f)
{
    arb_clear(f->v);
    arb_clear(f->b);
    mag_clear(f->r);
    mag_clear(f->half);
}

void affine_swap(affine *f, affine *g)
{
    arb_swap(f->v, g->v);
    arb_swap(f->b, g->b);
    mag_swap(f->r, g->r);
    mag_swap(f->half, g->half);
}

void affine_set(affine *f, const affine *g)
{
    arb_set(f->v, g->v);
    arb_set(f->b, g->b);
    mag_set(f->r, g->r);
    mag_set(f->half, g->half);
}

void affine_zero(affine *f, const mag_t half)
{
    arb_zero(f->v);
    arb_zero(f->b);
    mag_zero(f->r);
    mag_set(f->half, half);
}

void affine_add(affine *out, const affine *f, const affine *g, slong bits)
{
    arb_add(out->v, f->v, g->v, bits);
    arb_add(out->b, f->b, g->b, bits);
    mag_add(out->r, f->r, g->r);
    mag_set(out->half, f->half);
}

/* |v| + |b| half + r, the rest left out when `line`. */
static void size(mag_t out, const affine *f, bool line)
{
    mag_t part;
    mag_init(part);
    arb_get_mag(out, f->b);
    mag_mul(out, out, f->half);
    arb_get_mag(part, f->v);
    mag_add(out, out, part);
    if (!line)
        mag_add(out, out, f->r);
    mag_clear(part);
}

void affine_mul(affine *out, const affine *f, const affine *g, slong bits)
{
    affine made;
    mag_t a, b;
    affine_init(&made);
    mag_init(a);
    mag_init(b);
    arb_mul(made.v, f->v, g->v, bits);
    arb_mul(made.b, f->v, g->b, bits);
    arb_addmul(made.b, f->b, g->v, bits);
    mag_set(made.half, f->half);
    /* slopes: |b1 b2| half^2; rests: r1 (line 2) + r2 (line 1 and rest 1) */
    arb_get_mag(a, f->b);
    arb_get_mag(b, g->b);
    mag_mul(a, a, b);
    mag_mul(a, a, f->half);
    mag_mul(made.r, a, f->half);
    size(a, g, true);
    mag_addmul(made.r, f->r, a);
    size(a, f, false);
    mag_addmul(made.r, g->r, a);
    affine_swap(out, &made);
    mag_clear(b);
    mag_clear(a);
    affine_clear(&made);
}

void affine_addmul(affine *out, const affine *f, const arb_t c, slong bits)
{
    mag_t m;
    mag_init(m);
    arb_get_mag(m, c);
    arb_addmul(out->v, f->v, c, bits);
    arb_addmul(out->b, f->b, c, bits);
    mag_addmul(out->r, f->r, m);
    mag_clear(m);
}

void affine_range(arb_t out, const affine *f, slong bits)
{
    mag_t m;
    mag_init(m);
    arb_get_mag(m, f->b);
    mag_mul(m, m, f->half);
    mag_add(m, m, f->r);
    arb_set_round(out, f->v, bits);
    mag_add(arb_radref(out), arb_radref(out), m);
    mag_clear(m);
}
