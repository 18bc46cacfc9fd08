/* Changes of variable that turn an integrand into rational functions, powers and exponentials of them. */
#ifndef TW_EXACT_RATIONALISE_H
#define TW_EXACT_RATIONALISE_H

#include "engine/expr/expr.h"

/* x = x(y): p and q in the new variable, q times dx/dy. */
typedef struct changed {
    expr *y, *p, *q;
} changed;

enum { CHANGE_NONE, CHANGE_ROOT, CHANGE_HYPERBOLIC, CHANGE_CIRCULAR, CHANGE_SPREAD, CHANGE_COUNT };

/* The change number `which`, when it does anything for these functions; false otherwise:
 *   ROOT        x = y^d, d the common denominator of the powers of x;
 *   HYPERBOLIC  x = (2/u) artanh(y): exp(u x) = (1 + y)/(1 - y), u the unit of the rates of exp, cosh, sinh, tanh;
 *   CIRCULAR    x = (2/u) arctan(y): the same for sin, cos, tan;
 *   SPREAD      x stays; the amplitude's cosh, sinh, cos, sin become sums of exponentials.
 * All fix x = 0 and are analytic there but for ROOT, which is a covering. */
bool change_variable(tw_engine *e, changed *out, int which, expr *p, expr *q, expr *x);

#endif
