/* Inside the quadrature: a path of straight legs in the complex plane as integrals over real variables. */
#ifndef TW_BALL_QUADRATURE_CONTOUR_H
#define TW_BALL_QUADRATURE_CONTOUR_H

#include "engine/ball/tape.h"

/* sign * int of g(u) du, u from `from` to `to`. On the real line u is the path's own variable and the ends are its ends (principal
 * values count there, as for an integral `from ... to`); elsewhere u runs from 0 to 1 or inf and g is analytic in between. */
typedef struct contour_leg {
    int sign;
    bool on_line;
    expr *u, *g, *from, *to;
    expr *near, *far; /* where u = from and u = to lie, for words; far may be inf(theta) */
} contour_leg;

typedef struct contour_path {
    contour_leg *list;
    size_t count;
    bool imaginary; /* proved: the whole integral is i times a real number */
} contour_path;

void contour_path_init(contour_path *p);
void contour_path_clear(contour_path *p);

/* The legs of an EXPR_CONTOUR without free symbols. Errors: UNSUITABLE (an end that is no number, a point at infinity inside the
 * path, an integrand that is not analytic by its form), DIVERGENT (a pole on the path), UNDECIDED (a branch cut on it, or nothing
 * known of the integrand there). */
tw_status contour_path_read(contour_path *p, tw_engine *e, expr *contour);

/* Is the value of outside * contour (or a contour alone; no free symbols) real (1) or i times a real number (-1) by the symmetry of
 * the path and the integrand? 0: not known. */
int contour_symmetry(tw_engine *e, expr *integral);

#endif
