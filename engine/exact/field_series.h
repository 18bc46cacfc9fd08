/* Power series over a number field K = Q(theta) or K(i): blocks of integers over one denominator. For the exact coefficients at a
 * saddle, where theta is the saddle itself. */
#ifndef TW_EXACT_FIELD_SERIES_H
#define TW_EXACT_FIELD_SERIES_H

#include <stdbool.h>

#include "engine/base/engine.h"
#include "engine/base/flint.h"

/* theta is a root of `modulus`, monic over the integers, of degree `degree`; an element is a polynomial in theta, and with `pair`
 * x + i*y with two of them (i not in Q(theta)). */
typedef struct number_field {
    slong degree;
    fmpz_poly_t modulus;
    bool pair;
} number_field;

void number_field_init(number_field *k, const fmpz_poly_t modulus, bool pair);
void number_field_clear(number_field *k);

/* A truncated power series in v: the coefficient of v^n is (block n)/den, block n being the coefficients n*(2*degree - 1) .. of re
 * and im, reduced. */
typedef struct field_series {
    fmpz_poly_t re, im;
    fmpz_t den;
} field_series;

void field_series_init(field_series *a);
void field_series_clear(field_series *a);
void field_series_set(field_series *a, const field_series *b);
void field_series_swap(field_series *a, field_series *b);
bool field_series_is_zero(const field_series *a);

/* c0 at v^n += an element given by rational polynomials in theta of degree < degree (im may be NULL). */
void field_series_add_term(field_series *a, const number_field *k, slong n, const fmpq_poly_t re, const fmpq_poly_t im);
void field_series_add(field_series *out, const field_series *a, const field_series *b);
void field_series_sub(field_series *out, const field_series *a, const field_series *b);
void field_series_scale(field_series *a, const fmpq_t c);
void field_series_mul(field_series *out, const number_field *k, const field_series *a, const field_series *b, slong length);
void field_series_shift(field_series *a, const number_field *k, slong n); /* times v^n, n >= 0 */
void field_series_truncate(field_series *a, const number_field *k, slong length);
void field_series_derivative(field_series *a, const number_field *k);
void field_series_integral(field_series *a, const number_field *k); /* from 0 */
/* 1/a mod v^length; a(0) != 0. False where a(0) has no inverse (it is 0). */
bool field_series_inverse(field_series *out, tw_engine *e, const number_field *k, const field_series *a, slong length);
/* exp(a) mod v^length, a(0) = 0. */
bool field_series_exp(field_series *out, tw_engine *e, const number_field *k, const field_series *a, slong length);
/* The coefficient of v^n as rational polynomials in theta. */
void field_series_get(fmpq_poly_t re, fmpq_poly_t im, const field_series *a, const number_field *k, slong n);

#endif
