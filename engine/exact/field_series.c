/* Power series over a number field, for long ones: a series is one integer polynomial (theta and v packed, v as a high power) over
 * one common denominator, so that a product is one multiplication of integer polynomials and a reduction block by block. Knows
 * nothing of what the series mean. */
#include "engine/exact/field_series.h"

void number_field_init(number_field *k, const fmpz_poly_t modulus, bool pair)
{
    k->degree = fmpz_poly_degree(modulus);
    k->pair = pair;
    fmpz_poly_init(k->modulus);
    fmpz_poly_set(k->modulus, modulus);
}

void number_field_clear(number_field *k)
{
    fmpz_poly_clear(k->modulus);
}

static slong block_of(const number_field *k)
{
    return 2 * k->degree - 1;
}

void field_series_init(field_series *a)
{
    fmpz_poly_init(a->re);
    fmpz_poly_init(a->im);
    fmpz_init_set_ui(a->den, 1);
}

void field_series_clear(field_series *a)
{
    fmpz_poly_clear(a->re);
    fmpz_poly_clear(a->im);
    fmpz_clear(a->den);
}

void field_series_set(field_series *a, const field_series *b)
{
    fmpz_poly_set(a->re, b->re);
    fmpz_poly_set(a->im, b->im);
    fmpz_set(a->den, b->den);
}

void field_series_swap(field_series *a, field_series *b)
{
    fmpz_poly_swap(a->re, b->re);
    fmpz_poly_swap(a->im, b->im);
    fmpz_swap(a->den, b->den);
}

bool field_series_is_zero(const field_series *a)
{
    return fmpz_poly_is_zero(a->re) && fmpz_poly_is_zero(a->im);
}

static void lowest_terms(field_series *a)
{
    fmpz_t g, h;
    if (fmpz_is_one(a->den))
        return;
    fmpz_init(g);
    fmpz_init(h);
    fmpz_poly_content(g, a->re);
    fmpz_poly_content(h, a->im);
    fmpz_gcd(g, g, h);
    fmpz_gcd(g, g, a->den);
    if (!fmpz_is_one(g) && !fmpz_is_zero(g)) {
        fmpz_poly_scalar_divexact_fmpz(a->re, a->re, g);
        fmpz_poly_scalar_divexact_fmpz(a->im, a->im, g);
        fmpz_divexact(a->den, a->den, g);
    }
    fmpz_clear(g);
    fmpz_clear(h);
}

/* ---- linear operations ---- */

static void combine(field_series *out, const field_series *a, const field_series *b, bool minus)
{
    field_series x, y;
    fmpz_t l, f;
    field_series_init(&x);
    field_series_init(&y);
    fmpz_init(l);
    fmpz_init(f);
    fmpz_lcm(l, a->den, b->den);
    fmpz_divexact(f, l, a->den);
    fmpz_poly_scalar_mul_fmpz(x.re, a->re, f);
    fmpz_poly_scalar_mul_fmpz(x.im, a->im, f);
    fmpz_divexact(f, l, b->den);
    if (minus)
        fmpz_neg(f, f);
    fmpz_poly_scalar_mul_fmpz(y.re, b->re, f);
    fmpz_poly_scalar_mul_fmpz(y.im, b->im, f);
    fmpz_poly_add(x.re, x.re, y.re);
    fmpz_poly_add(x.im, x.im, y.im);
    fmpz_set(x.den, l);
    lowest_terms(&x);
    field_series_swap(out, &x);
    fmpz_clear(l);
    fmpz_clear(f);
    field_series_clear(&x);
    field_series_clear(&y);
}

void field_series_add(field_series *out, const field_series *a, const field_series *b)
{
    combine(out, a, b, false);
}

void field_series_sub(field_series *out, const field_series *a, const field_series *b)
{
    combine(out, a, b, true);
}

void field_series_scale(field_series *a, const fmpq_t c)
{
    fmpz_poly_scalar_mul_fmpz(a->re, a->re, fmpq_numref(c));
    fmpz_poly_scalar_mul_fmpz(a->im, a->im, fmpq_numref(c));
    fmpz_mul(a->den, a->den, fmpq_denref(c));
    lowest_terms(a);
}

void field_series_shift(field_series *a, const number_field *k, slong n)
{
    fmpz_poly_shift_left(a->re, a->re, n * block_of(k));
    fmpz_poly_shift_left(a->im, a->im, n * block_of(k));
}

void field_series_truncate(field_series *a, const number_field *k, slong length)
{
    fmpz_poly_truncate(a->re, length * block_of(k));
    fmpz_poly_truncate(a->im, length * block_of(k));
    lowest_terms(a);
}

void field_series_add_term(field_series *a, const number_field *k, slong n, const fmpq_poly_t re, const fmpq_poly_t im)
{
    field_series t;
    fmpq_poly_t x;
    field_series_init(&t);
    fmpq_poly_init(x);
    fmpz_set(t.den, fmpq_poly_denref(re));
    if (im)
        fmpz_lcm(t.den, t.den, fmpq_poly_denref(im));
    fmpq_poly_scalar_mul_fmpz(x, re, t.den);
    fmpq_poly_get_numerator(t.re, x);
    if (im) {
        fmpq_poly_scalar_mul_fmpz(x, im, t.den);
        fmpq_poly_get_numerator(t.im, x);
    }
    field_series_shift(&t, k, n);
    field_series_add(a, a, &t);
    fmpq_poly_clear(x);
    field_series_clear(&t);
}

void field_series_get(fmpq_poly_t re, fmpq_poly_t im, const field_series *a, const number_field *k, slong n)
{
    fmpz_poly_t t;
    fmpz_poly_init(t);
    for (int part = 0; part < 2; part++) {
        fmpz_poly_zero(t);
        for (slong j = 0; j < k->degree; j++) {
            fmpz *c = fmpz_poly_get_coeff_ptr(part ? a->im : a->re, n * block_of(k) + j);
            if (c)
                fmpz_poly_set_coeff_fmpz(t, j, c);
        }
        fmpq_poly_set_fmpz_poly(part ? im : re, t);
        fmpq_poly_scalar_div_fmpz(part ? im : re, part ? im : re, a->den);
    }
    fmpz_poly_clear(t);
}

/* n -> weight*n or weight/n on the coefficients of v^n, then moved by one. */
void field_series_derivative(field_series *a, const number_field *k)
{
    slong block = block_of(k);
    for (int part = 0; part < 2; part++) {
        fmpz_poly_struct *p = part ? a->im : a->re;
        for (slong j = 0; j < fmpz_poly_length(p); j++)
            fmpz_mul_si(p->coeffs + j, p->coeffs + j, j / block);
        _fmpz_poly_normalise(p);
        fmpz_poly_shift_right(p, p, block);
    }
    lowest_terms(a);
}

void field_series_integral(field_series *a, const number_field *k)
{
    slong block = block_of(k), length = FLINT_MAX(fmpz_poly_length(a->re), fmpz_poly_length(a->im));
    fmpz_t l, f;
    fmpz_init_set_ui(l, 1);
    fmpz_init(f);
    for (slong n = 0; n * block < length; n++) {
        fmpz_set_si(f, n + 1);
        fmpz_lcm(l, l, f);
    }
    for (int part = 0; part < 2; part++) {
        fmpz_poly_struct *p = part ? a->im : a->re;
        for (slong j = 0; j < fmpz_poly_length(p); j++) {
            fmpz_divexact_si(f, l, j / block + 1);
            fmpz_mul(p->coeffs + j, p->coeffs + j, f);
        }
        fmpz_poly_shift_left(p, p, block);
    }
    fmpz_mul(a->den, a->den, l);
    lowest_terms(a);
    fmpz_clear(l);
    fmpz_clear(f);
}

/* ---- products ---- */

/* Every block modulo the modulus. */
static void reduce_blocks(fmpz_poly_t p, const number_field *k)
{
    slong block = block_of(k), d = k->degree, length = fmpz_poly_length(p);
    if (d == 1) /* a block has one coefficient: nothing to do */
        return;
    for (slong from = 0; from < length; from += block)
        for (slong j = FLINT_MIN(block, length - from) - 1; j >= d; j--) {
            fmpz *top = p->coeffs + from + j;
            if (fmpz_is_zero(top))
                continue;
            for (slong n = 0; n < d; n++)
                fmpz_submul(p->coeffs + from + j - d + n, top, k->modulus->coeffs + n);
            fmpz_zero(top);
        }
    _fmpz_poly_normalise(p);
}

void field_series_mul(field_series *out, const number_field *k, const field_series *a, const field_series *b, slong length)
{
    slong n = length * block_of(k);
    field_series t;
    field_series_init(&t);
    if (!k->pair || (fmpz_poly_is_zero(a->im) && fmpz_poly_is_zero(b->im))) {
        fmpz_poly_mullow(t.re, a->re, b->re, n);
    } else { /* three products: (a + ib)(c + id) */
        fmpz_poly_t u, v, w;
        fmpz_poly_init(u);
        fmpz_poly_init(v);
        fmpz_poly_init(w);
        fmpz_poly_mullow(u, a->re, b->re, n);
        fmpz_poly_mullow(v, a->im, b->im, n);
        fmpz_poly_add(t.re, a->re, a->im);
        fmpz_poly_add(t.im, b->re, b->im);
        fmpz_poly_mullow(w, t.re, t.im, n);
        fmpz_poly_sub(t.re, u, v);
        fmpz_poly_sub(w, w, u);
        fmpz_poly_sub(t.im, w, v);
        fmpz_poly_clear(u);
        fmpz_poly_clear(v);
        fmpz_poly_clear(w);
    }
    reduce_blocks(t.re, k);
    reduce_blocks(t.im, k);
    fmpz_mul(t.den, a->den, b->den);
    lowest_terms(&t);
    field_series_swap(out, &t);
    field_series_clear(&t);
}

/* ---- inverses ---- */

/* 1/(x + i y) in K(i), or 1/x in K, for elements as rational polynomials. */
static bool element_inverse(fmpq_poly_t re, fmpq_poly_t im, const number_field *k, const fmpq_poly_t x, const fmpq_poly_t y)
{
    fmpq_poly_t f, norm, g, s, t;
    fmpq_poly_init(f), fmpq_poly_init(norm), fmpq_poly_init(g), fmpq_poly_init(s), fmpq_poly_init(t);
    fmpq_poly_set_fmpz_poly(f, k->modulus);
    fmpq_poly_mul(norm, x, x);
    fmpq_poly_mul(g, y, y);
    fmpq_poly_add(norm, norm, g);
    fmpq_poly_rem(norm, norm, f);
    bool single = fmpq_poly_is_zero(y);
    if (single)
        fmpq_poly_set(norm, x);
    bool fine = !fmpq_poly_is_zero(norm);
    if (fine) {
        fmpq_poly_xgcd(g, s, t, norm, f);
        fine = fmpq_poly_degree(g) == 0;
    }
    if (fine) {
        fmpq_t c;
        fmpq_init(c);
        fmpq_poly_get_coeff_fmpq(c, g, 0);
        fmpq_poly_scalar_div_fmpq(s, s, c);
        fmpq_clear(c);
        fmpq_poly_zero(im);
        if (single) {
            fmpq_poly_set(re, s);
        } else {
            fmpq_poly_mul(im, y, s);
            fmpq_poly_neg(im, im);
            fmpq_poly_rem(im, im, f);
            fmpq_poly_mul(re, x, s);
        }
        fmpq_poly_rem(re, re, f);
    }
    fmpq_poly_clear(f), fmpq_poly_clear(norm), fmpq_poly_clear(g), fmpq_poly_clear(s), fmpq_poly_clear(t);
    return fine;
}

bool field_series_inverse(field_series *out, tw_engine *e, const number_field *k, const field_series *a, slong length)
{
    field_series y, t;
    fmpq_poly_t re, im, x, z;
    fmpq_poly_init(re), fmpq_poly_init(im), fmpq_poly_init(x), fmpq_poly_init(z);
    field_series_init(&y);
    field_series_init(&t);
    field_series_get(x, z, a, k, 0);
    bool fine = element_inverse(re, im, k, x, z);
    if (fine)
        field_series_add_term(&y, k, 0, re, im);
    for (slong n = 1; fine && n < length && budget_ok(e);) { /* y (2 - a y) */
        n = FLINT_MIN(2 * n, length);
        field_series_set(&t, a);
        field_series_truncate(&t, k, n);
        field_series_mul(&t, k, &t, &y, n);
        field_series_mul(&t, k, &t, &y, n);
        field_series_sub(&t, &y, &t);
        field_series_add(&y, &y, &t);
    }
    field_series_swap(out, &y);
    field_series_clear(&y);
    field_series_clear(&t);
    fmpq_poly_clear(re), fmpq_poly_clear(im), fmpq_poly_clear(x), fmpq_poly_clear(z);
    return fine && e->error.kind == ERROR_NONE;
}

/* log is the integral of a'/a. */
bool field_series_exp(field_series *out, tw_engine *e, const number_field *k, const field_series *a, slong length)
{
    field_series y, t, u;
    fmpq_poly_t one;
    fmpq_poly_init(one);
    fmpq_poly_one(one);
    field_series_init(&y);
    field_series_init(&t);
    field_series_init(&u);
    field_series_add_term(&y, k, 0, one, NULL);
    bool fine = true;
    for (slong n = 1; fine && n < length && budget_ok(e);) { /* y (1 + a - log y) */
        n = FLINT_MIN(2 * n, length);
        fine = field_series_inverse(&t, e, k, &y, n);
        field_series_set(&u, &y);
        field_series_derivative(&u, k);
        field_series_mul(&t, k, &t, &u, n);
        field_series_integral(&t, k);
        field_series_truncate(&t, k, n);
        field_series_set(&u, a);
        field_series_truncate(&u, k, n);
        field_series_sub(&u, &u, &t);
        field_series_mul(&u, k, &u, &y, n);
        field_series_add(&y, &y, &u);
    }
    field_series_swap(out, &y);
    fmpq_poly_clear(one);
    field_series_clear(&y);
    field_series_clear(&t);
    field_series_clear(&u);
    return fine && e->error.kind == ERROR_NONE;
}
