/* Functions of one variable d, |d| <= half, as value + slope * d + rest. Private to engine/numeric. */
#ifndef TW_NUMERIC_AFFINE_H
#define TW_NUMERIC_AFFINE_H

#include <stdbool.h>

#include "engine/base/flint.h"

/* f(d) lies in v + b*d + [-r, r] for |d| <= half. */
typedef struct affine {
    arb_t v, b;
    mag_t r, half;
} affine;

void affine_init(affine *f);
void affine_clear(affine *f);
void affine_swap(affine *f, affine *g);
void affine_set(affine *f, const affine *g);
void affine_zero(affine *f, const mag_t half);
/* Sums and products of two functions of the same d; out may be one of them. */
void affine_add(affine *out, const affine *f, const affine *g, slong bits);
void affine_mul(affine *out, const affine *f, const affine *g, slong bits);
/* out += c * f */
void affine_addmul(affine *out, const affine *f, const arb_t c, slong bits);
/* All values. */
void affine_range(arb_t out, const affine *f, slong bits);

#endif
