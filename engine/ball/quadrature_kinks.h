/* Inside the quadrature: the points of a range where the integrand is not analytic by its form. */
#ifndef TW_BALL_QUADRATURE_KINKS_H
#define TW_BALL_QUADRATURE_KINKS_H

#include "engine/ball/tape.h"

/* A point of the range: exact (low == high) or enclosed by rationals. */
typedef struct quad_point {
    expr *low, *high;
    arb_t place; /* holds the point */
} quad_point;

/* from < to with their balls a, b (of no account where infinite). */
typedef struct quad_range {
    expr *from, *to;
    const arb_struct *a, *b;
    bool from_infinite, to_infinite;
} quad_range;

typedef struct quad_points {
    quad_point *list; /* by growing place; disjoint */
    size_t count, room;
    bool complete; /* every zero of the arguments was found */
    /* per end: may a point lie between the end and what is known of it? Then near_end holds the end and all such points, and the
     * form of f chosen next to the end may be the wrong one on that sliver. */
    bool unsure[2];
    arb_t near_end[2];
} quad_points;

void quad_points_init(quad_points *p);
void quad_points_clear(quad_points *p);

/* Zeros inside the range of the arguments of abs, sign, min, max, conditions, logarithms and fractional powers of f in x.
 * Errors: UNDECIDED where a zero could not be isolated. */
tw_status quad_points_find(quad_points *p, tw_engine *e, expr *f, expr *x, const quad_range *range, slong prec);

/* f with abs, sign, min, max and piecewise replaced by what they are near the point `inside`, an exact real number
 * between two neighbouring points. on_cut (only where the points are complete): logarithms and fractional powers of
 * negative numbers become forms that are analytic across their cut. NULL with the error set. */
expr *quad_resolve(tw_engine *e, expr *f, expr *x, const arf_t inside, bool on_cut);

#endif
