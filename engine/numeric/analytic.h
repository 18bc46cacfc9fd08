/* Proofs by balls that a function is analytic on a disc or inside a contour, with the maximum of its modulus there. Private. */
#ifndef TW_NUMERIC_ANALYTIC_H
#define TW_NUMERIC_ANALYTIC_H

#include "engine/numeric/problem.h"

/* Upper bound of |f| on the closed disc around the exact real `centre`; false when analyticity is not proved. f is real on the
 * real axis, so that the upper half suffices. */
bool disc_bound(tw_engine *e, mag_t bound, tape *f, const arf_t centre, const arf_t radius);

/* A closed polygon around 0, symmetric about the real axis; the vertices of its upper half, from the positive real axis to the
 * negative one. */
typedef struct contour {
    slong count;
    double *re, *im;
} contour;
void contour_clear(contour *c);
/* The curve |T| = rho, traced in doubles (a circle when the problem is pure); false when the trace is lost. */
bool contour_trace(contour *out, const problem *p, double rho);

/* Proves on and inside the contour what the lemma at 0 needs: A y^-v analytic, p analytic with no zero but the one at 0. Then
 * |f[k][n]| <= constants[k] * rho^-n (DLMF 2.3.18 read as a bound). */
bool contour_prove(problem *p, const contour *c, mag_t *constants, arb_t rho);

/* Is f analytic in |y| <= radius once its powers of y are taken out, although its formula is singular at 0 (sin(y)/y)? Proved over
 * the tree; see removable.c. */
bool removable_at_zero(problem *p, expr *f, double radius);

#endif
