/* Power series with rational coefficients modulo x^n, on FLINT's fmpq_poly: the routes that are faster than
 * FLINT's general ones when an operand is a short polynomial (linear recurrences on integers with a known
 * denominator: N coefficients cost N times the number of terms). Used by tail.c only. */
#ifndef TW_EXACT_RATIONAL_H
#define TW_EXACT_RATIONAL_H

#include "engine/base/flint.h"

/* out = a/b mod x^n; b(0) != 0. */
void rational_div(fmpq_poly_t out, const fmpq_poly_t a, const fmpq_poly_t b, slong n);
/* out = a^r mod x^n; a(0) = 1. */
void rational_pow(fmpq_poly_t out, const fmpq_poly_t a, const fmpq_t r, slong n);
/* out = log(a) mod x^n; a(0) = 1. */
void rational_log(fmpq_poly_t out, const fmpq_poly_t a, slong n);
/* out = exp(u) mod x^n; u(0) = 0. */
void rational_exp(fmpq_poly_t out, const fmpq_poly_t u, slong n);
/* Sine and cosine (sinh and cosh when hyperbolic) of u mod x^n; u(0) = 0. The outputs are two polynomials. */
void rational_sin_cos(fmpq_poly_t s, fmpq_poly_t c, const fmpq_poly_t u, slong n, int hyperbolic);
/* out = tan(u), or tanh(u) when hyperbolic; u(0) = 0. */
void rational_tan(fmpq_poly_t out, const fmpq_poly_t u, slong n, int hyperbolic);
/* out[0..n-1] = the coefficients of a in lowest terms; out is initialised. */
void rational_coefficients(fmpq *out, const fmpq_poly_t a, slong n);
/* out = outer(u) mod x^n; u(0) = 0. */
void rational_compose(fmpq_poly_t out, const fmpq_poly_t outer, const fmpq_poly_t u, slong n);

#endif
