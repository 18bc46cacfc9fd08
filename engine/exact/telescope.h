/* Creative telescoping for hyperexponential terms (Almkvist and Zeilberger 1990; by reduction: Bostan, Chen, Chyzak, Li
 * and Xin 2013): polynomials c_j free of x and a rational function R with
 *
 *     sum_j c_j T^j F = d/dx (R F),       T a rational function, F'/F rational.
 *
 * With T = p^-h and F = q p^-(z + h n) it is a recurrence in n for the residues of F at a zero of p; with T = -p and F =
 * q exp(-s p) a differential equation in s for the integral. */
#ifndef TW_EXACT_TELESCOPE_H
#define TW_EXACT_TELESCOPE_H

#include "engine/exact/hyper.h"

typedef struct telescope {
    field *f;
    slong variable;         /* of x */
    slong order;            /* -1: none found */
    fmpz_mpoly_struct *c;   /* order + 1 of them, without a common factor, free of x */
    element certificate;    /* R */
    fmpz_mpoly_t content;   /* the factor of R's denominator that is free of x: where it vanishes the identity is void */
} telescope;

void telescope_init(telescope *t, field *f, slong variable);
void telescope_clear(telescope *t);

/* Finds the identity of least order and proves it (telescope_holds). F is h; T = a/b in lowest terms with b != 0.
 * ERROR_UNSUITABLE when the order could exceed `limit`; TW_ERROR on budget. */
tw_status telescope_find(telescope *out, const hyper *h, const element *ratio, slong limit);

/* Is the identity true? By cross-multiplication with F'/F as it was read, term by term. */
bool telescope_holds(const telescope *t, const hyper *h, const element *ratio);

#endif
