/* Exact coefficients at a saddle. The one idea: everything is a power series over the field of the place itself, so the reversion
 * of the phase is one Newton iteration on u^m A(u) = v^m B(u) with fast products, and conjugate saddles differ only in which root
 * the generator stands for (DLMF 2.3.18 gives the same numbers one by one). */
#include "engine/method/saddle_series.h"

#include <stdlib.h>
#include <string.h>

/* ---- the amplitude ---- */

static void gauss_zero(gauss_poly *a)
{
    fmpq_poly_init(a->re);
    fmpq_poly_init(a->im);
}

static void gauss_free(gauss_poly *a)
{
    fmpq_poly_clear(a->re);
    fmpq_poly_clear(a->im);
}

void amplitude_clear(amplitude *a)
{
    gauss_free(&a->top);
    gauss_free(&a->bottom);
    gauss_free(&a->growth);
}

static void gauss_times(gauss_poly *out, const gauss_poly *b)
{
    gauss_poly t;
    fmpq_poly_t u;
    gauss_zero(&t);
    fmpq_poly_init(u);
    fmpq_poly_mul(t.re, out->re, b->re);
    fmpq_poly_mul(u, out->im, b->im);
    fmpq_poly_sub(t.re, t.re, u);
    fmpq_poly_mul(t.im, out->re, b->im);
    fmpq_poly_mul(u, out->im, b->re);
    fmpq_poly_add(t.im, t.im, u);
    fmpq_poly_swap(out->re, t.re);
    fmpq_poly_swap(out->im, t.im);
    gauss_free(&t);
    fmpq_poly_clear(u);
}

/* One factor of q. */
static bool take_factor(amplitude *a, tw_engine *e, expr *f, expr *z)
{
    gauss_poly top, bottom;
    if (!expr_has(f, z)) {
        a->factor = expr_mul(e, a->factor, f);
        return true;
    }
    if (gauss_fraction(e, f, z, &top, &bottom)) {
        gauss_times(&a->top, &top);
        gauss_times(&a->bottom, &bottom);
        gauss_free(&top);
        gauss_free(&bottom);
        return true;
    }
    if (!expr_is_call(f, FUNCTION_EXP) || !gauss_fraction(e, f->args[0], z, &top, &bottom))
        return false;
    bool fine = FLINT_MAX(fmpq_poly_degree(bottom.re), fmpq_poly_degree(bottom.im)) == 0 && fmpq_poly_is_zero(bottom.im);
    if (fine) {
        fmpq_t c, d;
        fmpq_init(c), fmpq_init(d);
        fmpq_poly_get_coeff_fmpq(c, bottom.re, 0);
        fmpq_poly_scalar_div_fmpq(top.re, top.re, c);
        fmpq_poly_scalar_div_fmpq(top.im, top.im, c);
        fmpq_poly_get_coeff_fmpq(c, top.re, 0);
        fmpq_poly_get_coeff_fmpq(d, top.im, 0);
        expr *constant = expr_add(e, expr_fmpq(e, c), expr_mul(e, expr_constant_of(e, CONSTANT_I), expr_fmpq(e, d)));
        a->factor = expr_mul(e, a->factor, expr_call1(e, FUNCTION_EXP, constant));
        fmpq_poly_set_coeff_si(top.re, 0, 0);
        fmpq_poly_set_coeff_si(top.im, 0, 0);
        fmpq_poly_add(a->growth.re, a->growth.re, top.re);
        fmpq_poly_add(a->growth.im, a->growth.im, top.im);
        fmpq_clear(c), fmpq_clear(d);
    }
    gauss_free(&top);
    gauss_free(&bottom);
    return fine;
}

void amplitude_read(amplitude *a, tw_engine *e, expr *q, expr *z)
{
    memset(a, 0, sizeof *a);
    a->whole = q;
    a->factor = expr_int(e, 1);
    gauss_zero(&a->top);
    gauss_zero(&a->bottom);
    gauss_zero(&a->growth);
    fmpq_poly_one(a->top.re);
    fmpq_poly_one(a->bottom.re);
    expr *const *factors;
    size_t count = expr_factors(&q, &factors);
    a->exact = true;
    for (size_t k = 0; k < count && a->exact; k++)
        a->exact = take_factor(a, e, factors[k], z);
}

/* ---- the field ---- */

bool saddle_field_init(saddle_field *f, tw_engine *e, const landscape *l, const spot *s)
{
    memset(f, 0, sizeof *f);
    f->e = e;
    f->l = l;
    f->s = s;
    fmpz_init(f->lead);
    fmpq_poly_init(f->i_value);
    fmpz_poly_t monic;
    fmpz_t power;
    fmpz_poly_init(monic);
    fmpz_init_set_ui(power, 1);
    const fmpz_poly_struct *m = QQBAR_POLY(s->exact);
    slong d = fmpz_poly_degree(m);
    fmpz_set(f->lead, m->coeffs + d);
    fmpz_poly_set_coeff_ui(monic, d, 1);
    for (slong k = d - 1; k >= 0; k--) { /* theta = lead*z: lead^(d-1) m(theta/lead) */
        fmpz_poly_set_coeff_fmpz(monic, k, m->coeffs + k);
        fmpz_mul(monic->coeffs + k, monic->coeffs + k, power);
        fmpz_mul(power, power, f->lead);
    }
    qqbar_t theta, i;
    qqbar_init(theta);
    qqbar_init(i);
    qqbar_i(i);
    qqbar_mul_fmpz(theta, s->exact, f->lead);
    f->i_inside = d % 2 == 0 && qqbar_express_in_field(f->i_value, theta, i, 512, 0, 512);
    qqbar_clear(theta);
    qqbar_clear(i);
    number_field_init(&f->k, monic, !f->i_inside);
    fmpz_poly_clear(monic);
    fmpz_clear(power);
    return e->error.kind == ERROR_NONE;
}

void saddle_field_clear(saddle_field *f)
{
    number_field_clear(&f->k);
    fmpz_clear(f->lead);
    fmpq_poly_clear(f->i_value);
}

/* z -> theta/lead in a rational polynomial, reduced. */
static void at_place(fmpq_poly_t out, const saddle_field *f, const fmpq_poly_t p)
{
    fmpq_poly_t m;
    fmpq_t c, power;
    fmpq_poly_init(m);
    fmpq_init(c);
    fmpq_init(power);
    fmpq_one(power);
    fmpq_poly_zero(out);
    for (slong k = 0; k <= fmpq_poly_degree(p); k++) {
        fmpq_poly_get_coeff_fmpq(c, p, k);
        fmpq_mul(c, c, power);
        fmpq_poly_set_coeff_fmpq(out, k, c);
        fmpq_div_fmpz(power, power, f->lead);
    }
    fmpq_poly_set_fmpz_poly(m, f->k.modulus);
    fmpq_poly_rem(out, out, m);
    fmpq_poly_clear(m);
    fmpq_clear(c);
    fmpq_clear(power);
}

/* re + i im with i inside the field folded in. */
static void fold(fmpq_poly_t re, fmpq_poly_t im, const saddle_field *f)
{
    if (!f->i_inside || fmpq_poly_is_zero(im))
        return;
    fmpq_poly_t m;
    fmpq_poly_init(m);
    fmpq_poly_set_fmpz_poly(m, f->k.modulus);
    fmpq_poly_mul(im, im, f->i_value);
    fmpq_poly_add(re, re, im);
    fmpq_poly_rem(re, re, m);
    fmpq_poly_zero(im);
    fmpq_poly_clear(m);
}

/* The Taylor coefficients of a at the place, as a series in u. */
static void shifted(field_series *out, const saddle_field *f, const gauss_poly *a)
{
    fmpq_poly_t re, im, x, y;
    fmpq_t c;
    fmpq_poly_init(re), fmpq_poly_init(im), fmpq_poly_init(x), fmpq_poly_init(y);
    fmpq_init(c);
    fmpq_poly_set(re, a->re);
    fmpq_poly_set(im, a->im);
    slong degree = FLINT_MAX(fmpq_poly_degree(re), fmpq_poly_degree(im));
    for (slong n = 0; n <= degree; n++) { /* a^(n)/n! */
        at_place(x, f, re);
        at_place(y, f, im);
        fold(x, y, f);
        field_series_add_term(out, &f->k, n, x, y);
        fmpq_poly_derivative(re, re);
        fmpq_poly_derivative(im, im);
        fmpq_set_si(c, 1, (ulong)(n + 1));
        fmpq_poly_scalar_mul_fmpq(re, re, c);
        fmpq_poly_scalar_mul_fmpq(im, im, c);
    }
    fmpq_poly_clear(re), fmpq_poly_clear(im), fmpq_poly_clear(x), fmpq_poly_clear(y);
    fmpq_clear(c);
}

/* ---- elements as expressions ---- */

static expr *element_expr(const saddle_field *f, const fmpq_poly_t re, const fmpq_poly_t im)
{
    tw_engine *e = f->e;
    expr *place = f->s->place, *whole = expr_int(e, 0), *i = expr_constant_of(e, CONSTANT_I);
    fmpq_t c, power;
    fmpq_init(c);
    fmpq_init(power);
    for (int part = 0; part < 2; part++) {
        fmpq_one(power);
        for (slong k = 0; k <= fmpq_poly_degree(part ? im : re); k++) {
            fmpq_poly_get_coeff_fmpq(c, part ? im : re, k);
            fmpq_mul(c, c, power);
            expr *t = expr_mul(e, expr_fmpq(e, c), expr_pow(e, place, expr_int(e, k)));
            whole = expr_add(e, whole, part ? expr_mul(e, i, t) : t);
            fmpq_mul_fmpz(power, power, f->lead);
        }
    }
    fmpq_clear(c);
    fmpq_clear(power);
    return place->kind == EXPR_ROOT ? whole : expr_expand(e, whole);
}

static expr *coefficient_of(const saddle_field *f, const field_series *a, slong n)
{
    fmpq_poly_t re, im;
    fmpq_poly_init(re);
    fmpq_poly_init(im);
    field_series_get(re, im, a, &f->k, n);
    expr *out = element_expr(f, re, im);
    fmpq_poly_clear(re);
    fmpq_poly_clear(im);
    return out;
}

/* ---- the phase ---- */

typedef struct local_phase {
    slong m;
    field_series height, lead, inverse_lead; /* of length 1 */
    field_series A, B;                       /* p - p0 = lead u^m A(u)/B(u), A(0) = B(0) = 1 */
} local_phase;

static void phase_init(local_phase *p)
{
    field_series_init(&p->height);
    field_series_init(&p->lead);
    field_series_init(&p->inverse_lead);
    field_series_init(&p->A);
    field_series_init(&p->B);
}

static void phase_clear(local_phase *p)
{
    field_series_clear(&p->height);
    field_series_clear(&p->lead);
    field_series_clear(&p->inverse_lead);
    field_series_clear(&p->A);
    field_series_clear(&p->B);
}

static void take_block(field_series *out, const saddle_field *f, const field_series *a, slong n)
{
    fmpq_poly_t re, im;
    fmpq_poly_init(re);
    fmpq_poly_init(im);
    field_series_get(re, im, a, &f->k, n);
    field_series_add_term(out, &f->k, 0, re, im);
    fmpq_poly_clear(re);
    fmpq_poly_clear(im);
}

static bool phase_read(local_phase *p, saddle_field *f)
{
    enum { LENGTH = 200 }; /* beyond the degrees */
    field_series top, bottom, t, u;
    field_series_init(&top), field_series_init(&bottom), field_series_init(&t), field_series_init(&u);
    p->m = f->s->order + 1;
    shifted(&top, f, &f->l->numerator);
    shifted(&bottom, f, &f->l->denominator);
    take_block(&t, f, &bottom, 0);
    bool fine = field_series_inverse(&u, f->e, &f->k, &t, 1); /* 1/B_0 */
    if (fine) {
        field_series first;
        field_series_init(&first);
        take_block(&first, f, &top, 0);
        field_series_mul(&p->height, &f->k, &first, &u, 1);
        field_series_clear(&first);
        field_series_mul(&t, &f->k, &bottom, &p->height, LENGTH);
        field_series_sub(&top, &top, &t);
        field_series_mul(&p->B, &f->k, &bottom, &u, LENGTH);
        /* the first m coefficients are zero: exactly, as the order is proved */
        slong block = 2 * f->k.degree - 1;
        fmpz_poly_shift_right(top.re, top.re, p->m * block);
        fmpz_poly_shift_right(top.im, top.im, p->m * block);
        field_series_set(&t, &top);
        field_series_truncate(&t, &f->k, 1);
        field_series_mul(&p->lead, &f->k, &t, &u, 1);
        fine = field_series_inverse(&u, f->e, &f->k, &t, 1) && field_series_inverse(&p->inverse_lead, f->e, &f->k, &p->lead, 1);
        field_series_mul(&p->A, &f->k, &top, &u, LENGTH);
    }
    field_series_clear(&top), field_series_clear(&bottom), field_series_clear(&t), field_series_clear(&u);
    return fine;
}

bool saddle_height(saddle_field *f, expr **height, expr **lead)
{
    local_phase p;
    phase_init(&p);
    bool fine = phase_read(&p, f);
    *height = fine ? coefficient_of(f, &p.height, 0) : NULL;
    *lead = fine ? coefficient_of(f, &p.lead, 0) : NULL;
    phase_clear(&p);
    return fine && *height && *lead;
}

/* ---- the reversion ---- */

/* P(x) for a polynomial P over the field (a series in u of finite length) and a series x. */
static void compose(field_series *out, const saddle_field *f, const field_series *P, const field_series *x, slong length)
{
    slong block = 2 * f->k.degree - 1, n = FLINT_MAX(fmpz_poly_length(P->re), fmpz_poly_length(P->im));
    field_series y, c;
    field_series_init(&y);
    for (slong k = (n + block - 1) / block - 1; k >= 0; k--) {
        field_series_init(&c);
        take_block(&c, f, P, k);
        field_series_mul(&y, &f->k, &y, x, length);
        field_series_add(&y, &y, &c);
        field_series_clear(&c);
    }
    field_series_swap(out, &y);
    field_series_clear(&y);
}

static void power(field_series *out, const saddle_field *f, const field_series *w, slong n, slong length)
{
    field_series y;
    fmpq_poly_t one;
    fmpq_poly_init(one);
    fmpq_poly_one(one);
    field_series_init(&y);
    field_series_add_term(&y, &f->k, 0, one, NULL);
    for (slong k = 0; k < n; k++)
        field_series_mul(&y, &f->k, &y, w, length);
    field_series_swap(out, &y);
    field_series_clear(&y);
    fmpq_poly_clear(one);
}

/* w^m A(v w) = B(v w), w(0) = 1, by Newton: the derivative in w is m w^(m-1) A + w^m v A' - v B'. */
static bool revert(field_series *w, saddle_field *f, const local_phase *p, slong length)
{
    field_series x, a, b, da, db, t, r, s;
    field_series *all[] = {&x, &a, &b, &da, &db, &t, &r, &s};
    fmpq_t m;
    fmpq_init(m);
    fmpq_set_si(m, p->m, 1);
    for (size_t k = 0; k < sizeof all / sizeof *all; k++)
        field_series_init(all[k]);
    power(w, f, w, 0, 1);
    bool fine = true;
    for (slong n = 1; fine && n < length && budget_ok(f->e);) {
        n = FLINT_MIN(2 * n, length);
        field_series_set(&x, w);
        field_series_shift(&x, &f->k, 1);
        field_series_set(&da, &p->A);
        field_series_set(&db, &p->B);
        field_series_derivative(&da, &f->k);
        field_series_derivative(&db, &f->k);
        compose(&a, f, &p->A, &x, n);
        compose(&b, f, &p->B, &x, n);
        compose(&da, f, &da, &x, n);
        compose(&db, f, &db, &x, n);
        power(&t, f, w, p->m - 1, n);
        field_series_mul(&r, &f->k, &t, &a, n); /* w^(m-1) A */
        field_series_mul(&s, &f->k, &t, w, n);  /* w^m */
        field_series_mul(&a, &f->k, &r, w, n);
        field_series_sub(&a, &a, &b); /* the residual */
        field_series_scale(&r, m);
        field_series_mul(&s, &f->k, &s, &da, n);
        field_series_sub(&s, &s, &db);
        field_series_shift(&s, &f->k, 1);
        field_series_add(&r, &r, &s);
        field_series_truncate(&r, &f->k, n);
        fine = field_series_inverse(&t, f->e, &f->k, &r, n);
        field_series_mul(&t, &f->k, &t, &a, n);
        field_series_sub(w, w, &t);
        field_series_truncate(w, &f->k, n);
    }
    for (size_t k = 0; k < sizeof all / sizeof *all; k++)
        field_series_clear(all[k]);
    fmpq_clear(m);
    return fine && f->e->error.kind == ERROR_NONE;
}

/* q(z0 + x) without its constant front, times x'. */
static bool density(field_series *out, saddle_field *f, const amplitude *q, const field_series *x, slong length, expr **front)
{
    field_series t, u;
    field_series_init(&t);
    field_series_init(&u);
    *front = q->factor;
    shifted(&t, f, &q->bottom);
    compose(&t, f, &t, x, length);
    bool fine = field_series_inverse(&u, f->e, &f->k, &t, length);
    if (fine) {
        fmpz_poly_zero(t.re), fmpz_poly_zero(t.im), fmpz_one(t.den);
        shifted(&t, f, &q->top);
        compose(&t, f, &t, x, length);
        field_series_mul(out, &f->k, &t, &u, length);
    }
    if (fine && (!fmpq_poly_is_zero(q->growth.re) || !fmpq_poly_is_zero(q->growth.im))) {
        fmpz_poly_zero(t.re), fmpz_poly_zero(t.im), fmpz_one(t.den);
        shifted(&t, f, &q->growth);
        expr *at = coefficient_of(f, &t, 0);
        *front = expr_mul(f->e, *front, expr_call1(f->e, FUNCTION_EXP, at));
        field_series_set(&u, &t);
        field_series_truncate(&u, &f->k, 1);
        field_series_sub(&t, &t, &u);
        compose(&t, f, &t, x, length);
        fine = *front && field_series_exp(&u, f->e, &f->k, &t, length);
        field_series_mul(out, &f->k, out, &u, length);
    }
    field_series_set(&t, x);
    field_series_derivative(&t, &f->k);
    field_series_mul(out, &f->k, out, &t, length);
    field_series_clear(&t);
    field_series_clear(&u);
    return fine;
}

tw_status saddle_coefficients(saddle_field *f, const amplitude *q, slong count, expr **c, expr **front)
{
    tw_engine *e = f->e;
    local_phase p;
    field_series w, g, lead, t;
    phase_init(&p);
    field_series_init(&w), field_series_init(&g), field_series_init(&lead), field_series_init(&t);
    bool fine = phase_read(&p, f) && revert(&w, f, &p, count + 1);
    field_series_shift(&w, &f->k, 1); /* u(v) = v w(v) */
    fine = fine && density(&g, f, q, &w, count, front);
    power(&lead, f, &w, 0, 1);
    fmpq_t rising, weight;
    fmpq_init(rising);
    fmpq_init(weight);
    fmpq_poly_t re, im;
    fmpq_poly_init(re);
    fmpq_poly_init(im);
    slong m = p.m;
    for (slong j = 0; fine && m * j < count && budget_ok(e); j++) {
        for (slong r = 1; r <= m && m * j + r <= count && fine; r++) {
            slong N = m * j + r;
            fmpq_one(rising);
            for (slong i = 0; i < j; i++) {
                fmpq_set_si(weight, r + m * i, (ulong)m);
                fmpq_mul(rising, rising, weight);
            }
            fmpq_div_fmpz(rising, rising, &(fmpz){m});
            field_series_get(re, im, &g, &f->k, N - 1);
            fmpz_poly_zero(t.re), fmpz_poly_zero(t.im), fmpz_one(t.den);
            field_series_add_term(&t, &f->k, 0, re, im);
            field_series_mul(&t, &f->k, &t, &lead, 1);
            field_series_scale(&t, rising);
            c[N - 1] = coefficient_of(f, &t, 0);
            fine = c[N - 1] != NULL;
        }
        field_series_mul(&lead, &f->k, &lead, &p.inverse_lead, 1);
    }
    fmpq_poly_clear(re);
    fmpq_poly_clear(im);
    fmpq_clear(rising);
    fmpq_clear(weight);
    phase_clear(&p);
    field_series_clear(&w), field_series_clear(&g), field_series_clear(&lead), field_series_clear(&t);
    if (fine && e->error.kind == ERROR_NONE)
        return TW_OK;
    return e->error.kind == ERROR_NONE ? engine_fail(e, ERROR_UNSUITABLE, "the integrand is singular at the saddle") : TW_ERROR;
}
