/* Inside the quadrature: the points of a range where the integrand is not analytic by its form. */
#ifndef TW_BALL_QUADRATURE_KINKS_H
#define TW_BALL_QUADRATURE_KINKS_H

#include "engine/ball/tape.h"

/* A point of the range: exact (low == high) or enclosed by rationals. */
typedef struct quad_point {
    expr *low, *high;
    arb_t place; /* holds the point */
} quad_point;

typedef struct quad_points {
    quad_point *list; /* by growing place; disjoint */
    size_t count, room;
    bool complete; /* every zero of the arguments was found */
} quad_points;

void quad_points_init(quad_points *p);
void quad_points_clear(quad_points *p);

/* Zeros inside (from, to) of the arguments of abs, sign, min, max, conditions, logarithms and fractional powers of f in
 * x. from, to: real balls; infinite ends by from_infinite, to_infinite. Errors: UNDECIDED where a zero could not be
 * isolated. */
tw_status quad_points_find(quad_points *p, tw_engine *e, expr *f, expr *x, const arb_t from, bool from_infinite,
        const arb_t to,
                           bool to_infinite, slong prec);

/* f with abs, sign, min, max and piecewise replaced by what they are near the point `inside`, an exact real number
 * between two neighbouring points. on_cut (only where the points are complete): logarithms and fractional powers of
 * negative numbers become forms that are analytic across their cut. NULL with the error set. */
expr *quad_resolve(tw_engine *e, expr *f, expr *x, const arf_t inside, bool on_cut);

#endif
