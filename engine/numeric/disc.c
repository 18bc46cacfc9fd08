/* Analyticity on a disc by balls. One idea: cover the upper half of the disc by squares, each small enough that the ball
 * evaluation with the `analytic` flag stays finite; a function that is holomorphic on each square of a cover is holomorphic on
 * the disc, and the largest of the squares' bounds bounds it. Knows tapes, no integrals. */
#include "engine/numeric/analytic.h"

#include <math.h>

enum { DISC_BITS = 64, DISC_DEPTH = 7, DISC_CELLS = 1500 };

typedef struct cover {
    tw_engine *e;
    tape *f;
    const arf_struct *centre, *radius;
    mag_t bound, accept;
    slong cells;
} cover;

/* The value over the square with centre u + i v and half side s, in units of the radius. */
static bool cell_bound(mag_t out, cover *c, double u, double v, double s)
{
    acb_t at, value;
    arb_t x;
    bool fine;
    acb_init(at);
    acb_init(value);
    arb_init(x);
    arb_set_d(acb_realref(at), u);
    arb_set_d(acb_imagref(at), v);
    mag_set_d(arb_radref(acb_realref(at)), s);
    mag_set_d(arb_radref(acb_imagref(at)), s);
    arb_set_arf(x, c->radius);
    acb_mul_arb(at, at, x, DISC_BITS);
    arb_set_arf(x, c->centre);
    arb_add(acb_realref(at), acb_realref(at), x, DISC_BITS);
    tape_eval(value, c->f, at, true, DISC_BITS);
    fine = acb_is_finite(value);
    if (fine)
        acb_get_mag(out, value);
    arb_clear(x);
    acb_clear(value);
    acb_clear(at);
    return fine;
}

static bool cover_square(cover *c, double u, double v, double s, int depth)
{
    mag_t b;
    bool fine;
    double nearest_u = fmax(fabs(u) - s, 0), nearest_v = fmax(fabs(v) - s, 0);
    if (nearest_u * nearest_u + nearest_v * nearest_v > 1)
        return true;
    if (++c->cells > DISC_CELLS || !budget_ok(c->e))
        return false;
    mag_init(b);
    fine = cell_bound(b, c, u, v, s);
    if (fine && (depth >= 2 || mag_cmp(b, c->accept) <= 0)) {
        mag_max(c->bound, c->bound, b);
        mag_clear(b);
        return true;
    }
    mag_clear(b);
    if (depth == DISC_DEPTH)
        return false;
    s /= 2;
    return cover_square(c, u - s, v - s, s, depth + 1) && cover_square(c, u + s, v - s, s, depth + 1) &&
           cover_square(c, u - s, v + s, s, depth + 1) && cover_square(c, u + s, v + s, s, depth + 1);
}

bool disc_bound(tw_engine *e, mag_t bound, tape *f, const arf_t centre, const arf_t radius)
{
    cover c = {.e = e, .f = f, .centre = centre, .radius = radius};
    bool fine;
    mag_init(c.bound);
    mag_init(c.accept);
    /* A bound within 10^4 of the value at the centre costs the tail next to nothing. */
    if (cell_bound(c.accept, &c, 0, 0, 0x1p-20))
        mag_mul_ui(c.accept, c.accept, 10000);
    fine = cell_bound(c.bound, &c, 0, 0, 1) && mag_cmp(c.bound, c.accept) <= 0;
    if (!fine) {
        mag_zero(c.bound);
        fine = cover_square(&c, -0.5, 0.5, 0.5, 1) && cover_square(&c, 0.5, 0.5, 0.5, 1);
    }
    mag_set(bound, c.bound);
    mag_clear(c.bound);
    mag_clear(c.accept);
    return fine;
}
