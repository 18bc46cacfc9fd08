/* Power series over the rationals or over the field: one set of operations for both. Rational ones go to
 * rational.c; in the field every operation is a recurrence that runs over the nonzero coefficients of the short
 * operand only. Precision is carried along: a result never claims more coefficients than its operands give. */
#include "engine/exact/tail.h"

#include <stdlib.h>
#include <string.h>

#include "engine/exact/rational.h"

static slong gcd_of(slong a, slong b) { return (slong)n_gcd((ulong)(a < 0 ? -a : a), (ulong)(b < 0 ? -b : b)); }

static void tail_place(tail *t, slong offset, slong gap)
{
    if (gap > 0)
        offset = (offset % gap + gap) % gap;
    t->offset = offset;
    t->gap = gap;
}

static bool tail_is_exact_zero(const tail *t) { return t->known == TAIL_EXACT && tail_length(t) == 0; }

bool tail_class_is_zero(const tail *t, slong r, slong h)
{
    return tail_is_exact_zero(t) || (r - t->offset) % gcd_of(h, t->gap) != 0;
}

void tail_init(tail *t)
{
    t->known = TAIL_EXACT;
    t->offset = t->gap = 0;
    t->rational = true;
    fmpq_poly_init(t->q);
    t->count = 0;
    t->m = NULL;
}

void tail_clear(field *f, tail *t)
{
    fmpq_poly_clear(t->q);
    if (t->m != NULL)
        elements_free(f, t->m, t->count);
    t->m = NULL;
}

void tail_swap(tail *a, tail *b)
{
    tail t = *a;
    *a = *b;
    *b = t;
}

/* Makes t a series of n zeros in the field. */
static void tail_reset(field *f, tail *t, slong n, slong known)
{
    if (t->m != NULL)
        elements_free(f, t->m, t->count);
    fmpq_poly_zero(t->q);
    t->rational = false;
    t->count = n;
    t->m = elements_new(f, n);
    t->known = known;
    t->offset = 0;
    t->gap = 1;
}

static void tail_reset_rational(field *f, tail *t, slong known)
{
    if (t->m != NULL)
        elements_free(f, t->m, t->count);
    t->m = NULL;
    t->count = 0;
    t->rational = true;
    t->known = known;
    t->offset = 0;
    t->gap = 1;
}

/* Drops zeros at the end. */
static void tail_trim(field *f, tail *t)
{
    while (!t->rational && t->count > 0 && fmpz_mpoly_q_is_zero(t->m + t->count - 1, f->ctx))
        element_clear(f, t->m + --t->count);
}

void tail_set(field *f, tail *out, const tail *a)
{
    if (out == a)
        return;
    if (a->rational) {
        tail_reset_rational(f, out, a->known);
        fmpq_poly_set(out->q, a->q);
        tail_place(out, a->offset, a->gap);
        return;
    }
    tail_reset(f, out, a->count, a->known);
    tail_place(out, a->offset, a->gap);
    for (slong k = 0; k < a->count; k++)
        fmpz_mpoly_q_set(out->m + k, a->m + k, f->ctx);
}

void tail_set_q(field *f, tail *out, const fmpq_t c)
{
    tail_reset_rational(f, out, TAIL_EXACT);
    fmpq_poly_set_fmpq(out->q, c);
    tail_place(out, 0, 0);
}

void tail_set_element(field *f, tail *out, const element *c)
{
    tail_reset(f, out, 1, TAIL_EXACT);
    fmpz_mpoly_q_set(out->m, c, f->ctx);
    tail_trim(f, out);
    tail_place(out, 0, 0);
}

slong tail_length(const tail *t) { return t->rational ? fmpq_poly_length(t->q) : t->count; }

bool tail_coefficient_is_zero(const tail *t, field *f, slong k)
{
    if (k >= tail_length(t))
        return true;
    return t->rational ? fmpz_is_zero(t->q->coeffs + k) : fmpz_mpoly_q_is_zero(t->m + k, f->ctx);
}

void tail_coefficient(field *f, element *out, const tail *t, slong k)
{
    if (k >= tail_length(t))
        fmpz_mpoly_q_zero(out, f->ctx);
    else if (t->rational) {
        fmpq_t c;
        fmpq_init(c);
        fmpq_poly_get_coeff_fmpq(c, t->q, k);
        fmpz_mpoly_q_set_fmpq(out, c, f->ctx);
        fmpq_clear(c);
    } else
        fmpz_mpoly_q_set(out, t->m + k, f->ctx);
}

bool tail_coefficient_q(field *f, fmpq_t out, const tail *t, slong k)
{
    if (k >= tail_length(t)) {
        fmpq_zero(out);
        return true;
    }
    if (t->rational) {
        fmpq_poly_get_coeff_fmpq(out, t->q, k);
        return true;
    }
    return field_is_rational(t->m + k, f, out);
}

expr *tail_coefficient_expr(field *f, const tail *t, slong k)
{
    fmpq_t c;
    fmpq_init(c);
    expr *out = tail_coefficient_q(f, c, t, k) ? expr_fmpq(f->e, c) : field_to_expr(f, t->m + k);
    fmpq_clear(c);
    return out;
}

void tail_promote(field *f, tail *t)
{
    if (!t->rational)
        return;
    slong n = fmpq_poly_length(t->q);
    element *m = elements_new(f, n);
    for (slong k = 0; k < n; k++)
        tail_coefficient(f, m + k, t, k);
    fmpq_poly_zero(t->q);
    t->rational = false;
    t->count = n;
    t->m = m;
}

void tail_demote(field *f, tail *t)
{
    if (t->rational)
        return;
    for (slong k = 0; k < t->count; k++)
        if (!fmpz_mpoly_q_is_fmpq(t->m + k, f->ctx))
            return;
    fmpq_poly_t q;
    fmpq_t c;
    fmpq_poly_init(q);
    fmpq_init(c);
    for (slong k = t->count - 1; k >= 0; k--) {
        field_is_rational(t->m + k, f, c);
        fmpq_poly_set_coeff_fmpq(q, k, c);
    }
    slong offset = t->offset, gap = t->gap;
    tail_reset_rational(f, t, t->known);
    tail_place(t, offset, gap);
    fmpq_poly_swap(t->q, q);
    fmpq_poly_clear(q);
    fmpq_clear(c);
}

void tail_truncate(field *f, tail *t, slong n)
{
    n = FLINT_MAX(n, 0);
    if (t->known <= n && t->known != TAIL_EXACT)
        return;
    if (t->known == TAIL_EXACT && tail_length(t) <= n && n > 0)
        return; /* a polynomial that short stays exact */
    t->known = n;
    if (t->rational)
        fmpq_poly_truncate(t->q, n);
    else
        while (t->count > n)
            element_clear(f, t->m + --t->count);
}

void tail_shift(field *f, tail *t, slong k)
{
    if (k == 0)
        return;
    tail_place(t, t->offset + k, t->gap);
    if (t->known != TAIL_EXACT)
        t->known = FLINT_MAX(t->known + k, 0);
    if (t->rational) {
        if (k > 0)
            fmpq_poly_shift_left(t->q, t->q, k);
        else
            fmpq_poly_shift_right(t->q, t->q, -k);
        return;
    }
    slong n = t->count == 0 ? 0 : FLINT_MAX(t->count + k, 0);
    element *m = elements_new(f, n);
    for (slong j = FLINT_MAX(0, -k); j < t->count; j++)
        fmpz_mpoly_q_swap(m + j + k, t->m + j, f->ctx);
    elements_free(f, t->m, t->count);
    t->m = m;
    t->count = n;
}

void tail_stretch(field *f, tail *t, slong g)
{
    if (g == 1)
        return;
    tail_place(t, t->offset * g, t->gap * g);
    if (t->known != TAIL_EXACT)
        t->known *= g;
    if (t->rational) {
        slong length = fmpq_poly_length(t->q);
        if (length > 1) {
            fmpq_poly_fit_length(t->q, (length - 1) * g + 1);
            _fmpz_vec_zero(t->q->coeffs + length, (length - 1) * (g - 1)); /* FLINT leaves what was cut off there */
            _fmpq_poly_set_length(t->q, (length - 1) * g + 1);
            for (slong k = length - 1; k > 0; k--)
                fmpz_swap(t->q->coeffs + k * g, t->q->coeffs + k);
        }
        return;
    }
    slong n = t->count == 0 ? 0 : (t->count - 1) * g + 1;
    element *m = elements_new(f, n);
    for (slong j = 0; j < t->count; j++)
        fmpz_mpoly_q_swap(m + j * g, t->m + j, f->ctx);
    elements_free(f, t->m, t->count);
    t->m = m;
    t->count = n;
}

/* ---- arithmetic ---- */

static slong known_least(slong a, slong b) { return FLINT_MIN(a, b); }

/* Operands of one kind: copies that live in the field when either does. */
typedef struct pair {
    tail a, b;
} pair;

static void pair_open(field *f, pair *p, const tail *a, const tail *b)
{
    tail_init(&p->a), tail_init(&p->b);
    tail_set(f, &p->a, a), tail_set(f, &p->b, b);
    tail_promote(f, &p->a), tail_promote(f, &p->b);
}

static void pair_close(field *f, pair *p) { tail_clear(f, &p->a), tail_clear(f, &p->b); }

void tail_add(field *f, tail *out, const tail *a, const tail *b, int sign)
{
    slong known = known_least(a->known, b->known);
    tail sum;
    tail_init(&sum);
    if (a->rational && b->rational) {
        if (sign > 0)
            fmpq_poly_add(sum.q, a->q, b->q);
        else
            fmpq_poly_sub(sum.q, a->q, b->q);
    } else {
        pair p;
        pair_open(f, &p, a, b);
        slong n = FLINT_MAX(p.a.count, p.b.count);
        tail_reset(f, &sum, n, TAIL_EXACT);
        for (slong k = 0; k < n; k++) {
            if (k < p.a.count)
                fmpz_mpoly_q_swap(sum.m + k, p.a.m + k, f->ctx);
            if (k < p.b.count && sign > 0)
                fmpz_mpoly_q_add(sum.m + k, sum.m + k, p.b.m + k, f->ctx);
            if (k < p.b.count && sign < 0)
                fmpz_mpoly_q_sub(sum.m + k, sum.m + k, p.b.m + k, f->ctx);
        }
        pair_close(f, &p);
        tail_trim(f, &sum);
    }
    if (known != TAIL_EXACT)
        tail_truncate(f, &sum, known), sum.known = known;
    if (tail_is_exact_zero(a))
        tail_place(&sum, b->offset, b->gap);
    else if (tail_is_exact_zero(b))
        tail_place(&sum, a->offset, a->gap);
    else
        tail_place(&sum, a->offset, gcd_of(gcd_of(a->gap, b->gap), a->offset - b->offset));
    tail_swap(out, &sum);
    tail_clear(f, &sum);
}

void tail_scale_q(field *f, tail *t, const fmpq_t c)
{
    if (t->rational) {
        fmpq_poly_scalar_mul_fmpq(t->q, t->q, c);
        return;
    }
    for (slong k = 0; k < t->count; k++)
        fmpz_mpoly_q_mul_fmpq(t->m + k, t->m + k, c, f->ctx);
    tail_trim(f, t);
}

void tail_scale(field *f, tail *t, const element *c)
{
    tail_promote(f, t);
    for (slong k = 0; k < t->count; k++)
        field_mul(f, t->m + k, t->m + k, c);
    tail_trim(f, t);
}

/* What a product or quotient of these operands can know, n wanted. */
static slong product_known(const tail *a, const tail *b, slong n)
{
    slong known = known_least(a->known, b->known);
    if (known == TAIL_EXACT && tail_length(a) + tail_length(b) <= FLINT_MAX(4 * n, 512))
        return TAIL_EXACT;
    return known_least(known, n);
}

void tail_mul(field *f, tail *out, const tail *a, const tail *b, slong n)
{
    tail product;
    slong known = product_known(a, b, n);
    slong length = FLINT_MIN(known, FLINT_MAX(tail_length(a) + tail_length(b) - 1, 0));
    tail_init(&product);
    if (a->rational && b->rational)
        fmpq_poly_mullow(product.q, a->q, b->q, length);
    else {
        pair p;
        pair_open(f, &p, a, b);
        tail_reset(f, &product, length, known);
        for (slong i = 0; i < FLINT_MIN(p.a.count, length) && budget_ok(f->e); i++)
            if (!fmpz_mpoly_q_is_zero(p.a.m + i, f->ctx))
                for (slong j = 0; j < FLINT_MIN(p.b.count, length - i); j++)
                    field_addmul(f, product.m + i + j, p.a.m + i, p.b.m + j);
        pair_close(f, &p);
        tail_trim(f, &product);
    }
    product.known = known;
    tail_place(&product, a->offset + b->offset, gcd_of(a->gap, b->gap));
    tail_swap(out, &product);
    tail_clear(f, &product);
}

/* The nonzero indices >= from of a field series, into a fresh array. */
static slong *nonzero_indices(field *f, const tail *t, slong from, slong *count)
{
    slong *at = base_alloc((size_t)FLINT_MAX(t->count, 1) * sizeof *at);
    *count = 0;
    for (slong k = from; k < t->count; k++)
        if (!fmpz_mpoly_q_is_zero(t->m + k, f->ctx))
            at[(*count)++] = k;
    return at;
}

static void div_field(field *f, tail *out, tail *a, tail *b, slong n)
{
    slong many;
    slong *at = nonzero_indices(f, b, 1, &many);
    tail_reset(f, out, n, n);
    for (slong k = 0; k < n && budget_ok(f->e); k++) {
        if (k < a->count)
            fmpz_mpoly_q_set(out->m + k, a->m + k, f->ctx);
        for (slong j = 0; j < many && at[j] <= k; j++)
            field_submul(f, out->m + k, b->m + at[j], out->m + k - at[j]);
        field_div(f, out->m + k, out->m + k, b->m);
    }
    free(at);
    tail_trim(f, out);
}

/* A polynomial over a polynomial that divides it. */
static bool divides(tail *out, const tail *a, const tail *b)
{
    if (!a->rational || !b->rational || a->known != TAIL_EXACT || b->known != TAIL_EXACT ||
        fmpq_poly_length(a->q) < fmpq_poly_length(b->q) || fmpq_poly_length(a->q) > 512)
        return false;
    fmpq_poly_t quotient, rest;
    fmpq_poly_init(quotient), fmpq_poly_init(rest);
    fmpq_poly_divrem(quotient, rest, a->q, b->q);
    bool exact = fmpq_poly_is_zero(rest);
    if (exact)
        fmpq_poly_swap(out->q, quotient);
    fmpq_poly_clear(quotient), fmpq_poly_clear(rest);
    return exact;
}

void tail_div(field *f, tail *out, const tail *a, const tail *b, slong n)
{
    tail quotient;
    tail_init(&quotient);
    slong known = known_least(known_least(a->known, b->known), n);
    if (b->known == TAIL_EXACT && tail_length(b) == 1)
        known = a->known == TAIL_EXACT ? TAIL_EXACT : a->known;
    slong length = known == TAIL_EXACT ? tail_length(a) : known;
    if (tail_length(a) == 0)
        quotient.known = a->known;
    else if (divides(&quotient, a, b))
        quotient.known = TAIL_EXACT;
    else if (a->rational && b->rational) {
        rational_div(quotient.q, a->q, b->q, length);
        quotient.known = known;
    } else {
        pair p;
        pair_open(f, &p, a, b);
        div_field(f, &quotient, &p.a, &p.b, length);
        quotient.known = known;
        pair_close(f, &p);
    }
    tail_place(&quotient, a->offset - b->offset, gcd_of(a->gap, b->gap));
    tail_swap(out, &quotient);
    tail_clear(f, &quotient);
}

/* ---- functions ---- */

/* n c_n = sum over k of ((r + 1) k - n) u_k c_(n-k): as pow_short in rational.c. */
static void pow_field(field *f, tail *out, const tail *a, const element *r, slong n)
{
    slong many;
    slong *at = nonzero_indices(f, a, 1, &many);
    element weight, one;
    element_init(f, &weight), element_init(f, &one);
    fmpz_mpoly_q_add_si(&one, r, 1, f->ctx);
    tail_reset(f, out, n, n);
    fmpz_mpoly_q_one(out->m, f->ctx);
    for (slong k = 1; k < n && budget_ok(f->e); k++) {
        for (slong j = 0; j < many && at[j] <= k; j++) {
            fmpz_mpoly_q_mul_si(&weight, &one, at[j], f->ctx);
            fmpz_mpoly_q_sub_si(&weight, &weight, k, f->ctx);
            field_mul(f, &weight, &weight, a->m + at[j]);
            field_addmul(f, out->m + k, &weight, out->m + k - at[j]);
        }
        fmpz_mpoly_q_div_si(out->m + k, out->m + k, k, f->ctx);
    }
    element_clear(f, &weight), element_clear(f, &one);
    free(at);
    tail_trim(f, out);
}

void tail_pow(field *f, tail *out, const tail *a, const element *r, slong n)
{
    fmpq_t q;
    fmpq_init(q);
    if (field_is_rational(r, f, q))
        tail_pow_q(f, out, a, q, n);
    else if (a->known == TAIL_EXACT && tail_length(a) == 1)
        tail_set(f, out, a);
    else {
        tail power, base;
        tail_init(&power), tail_init(&base);
        tail_set(f, &base, a);
        tail_promote(f, &base);
        slong known = known_least(a->known, n);
        if (known > 0)
            pow_field(f, &power, &base, r, known);
        power.known = known;
        tail_place(&power, 0, a->gap);
        tail_swap(out, &power);
        tail_clear(f, &power), tail_clear(f, &base);
    }
    fmpq_clear(q);
}

/* A natural power of a polynomial that is short enough to be kept whole. */
static bool pow_exact(field *f, tail *out, const tail *a, const fmpq_t r, slong n)
{
    if (a->known != TAIL_EXACT || !fmpz_is_one(fmpq_denref(r)) || fmpq_sgn(r) < 0 ||
        fmpz_cmp_si(fmpq_numref(r), 256) > 0)
        return false;
    slong m = fmpz_get_si(fmpq_numref(r));
    if ((tail_length(a) - 1) * m > FLINT_MAX(2 * n, 256))
        return false;
    tail power;
    tail_init(&power);
    if (a->rational)
        fmpq_poly_pow(power.q, a->q, (ulong)m);
    else {
        fmpq_poly_one(power.q);
        for (slong k = 0; k < m; k++)
            tail_mul(f, &power, &power, a, n);
    }
    tail_place(&power, 0, a->gap);
    tail_swap(out, &power);
    tail_clear(f, &power);
    return true;
}

void tail_pow_q(field *f, tail *out, const tail *a, const fmpq_t r, slong n)
{
    if (pow_exact(f, out, a, r, n))
        return;
    tail power;
    tail_init(&power);
    slong known = known_least(a->known, n);
    if (a->known == TAIL_EXACT && tail_length(a) == 1) {
        tail_set(f, &power, a);
        known = TAIL_EXACT;
    } else if (a->rational)
        rational_pow(power.q, a->q, r, known);
    else if (known > 0) {
        element e;
        element_init(f, &e);
        fmpz_mpoly_q_set_fmpq(&e, r, f->ctx);
        pow_field(f, &power, a, &e, known);
        element_clear(f, &e);
    }
    power.known = known;
    tail_place(&power, 0, a->gap);
    tail_swap(out, &power);
    tail_clear(f, &power);
}

void tail_log(field *f, tail *out, const tail *a, slong n)
{
    tail result;
    tail_init(&result);
    slong known = known_least(a->known, n);
    if (a->known == TAIL_EXACT && tail_length(a) == 1)
        known = TAIL_EXACT; /* log 1 */
    else if (a->rational)
        rational_log(result.q, a->q, known);
    else if (known > 0) {
        /* k l_k = k a_k - sum over j of j l_j a_(k-j), from l' a = a' */
        slong many;
        slong *at = nonzero_indices(f, a, 1, &many);
        tail_reset(f, &result, known, known);
        for (slong k = 1; k < known && budget_ok(f->e); k++) {
            element *l = result.m + k;
            if (k < a->count)
                fmpz_mpoly_q_mul_si(l, a->m + k, k, f->ctx);
            for (slong j = 0; j < many && at[j] < k; j++)
                field_submul(f, l, a->m + at[j], result.m + k - at[j]);
            /* entries hold k l_k until the end */
        }
        for (slong k = 1; k < known; k++)
            fmpz_mpoly_q_div_si(result.m + k, result.m + k, k, f->ctx);
        free(at);
        tail_trim(f, &result);
    }
    result.known = known;
    tail_place(&result, 0, a->gap);
    tail_swap(out, &result);
    tail_clear(f, &result);
}

void tail_exp(field *f, tail *out, const tail *u, slong n)
{
    tail result;
    tail_init(&result);
    slong known = known_least(u->known, n);
    if (u->known == TAIL_EXACT && tail_length(u) == 0) {
        fmpq_poly_one(result.q);
        known = TAIL_EXACT;
    } else if (u->rational)
        rational_exp(result.q, u->q, known);
    else if (known > 0) {
        slong many;
        slong *at = nonzero_indices(f, u, 1, &many);
        element t;
        element_init(f, &t);
        tail_reset(f, &result, known, known);
        fmpz_mpoly_q_one(result.m, f->ctx);
        for (slong k = 1; k < known && budget_ok(f->e); k++) {
            for (slong j = 0; j < many && at[j] <= k; j++) {
                fmpz_mpoly_q_mul_si(&t, u->m + at[j], at[j], f->ctx);
                field_addmul(f, result.m + k, &t, result.m + k - at[j]);
            }
            fmpz_mpoly_q_div_si(result.m + k, result.m + k, k, f->ctx);
        }
        element_clear(f, &t);
        free(at);
        tail_trim(f, &result);
    }
    result.known = known;
    tail_place(&result, 0, gcd_of(u->offset, u->gap));
    tail_swap(out, &result);
    tail_clear(f, &result);
}

/* s' = c u', c' = -s u' (plus for sinh, cosh). */
static void sin_cos_field(field *f, tail *s, tail *c, const tail *u, slong n, int hyperbolic)
{
    slong many;
    slong *at = nonzero_indices(f, u, 1, &many);
    element t;
    element_init(f, &t);
    tail_reset(f, s, n, n), tail_reset(f, c, n, n);
    fmpz_mpoly_q_one(c->m, f->ctx);
    for (slong k = 1; k < n && budget_ok(f->e); k++) {
        for (slong j = 0; j < many && at[j] <= k; j++) {
            fmpz_mpoly_q_mul_si(&t, u->m + at[j], at[j], f->ctx);
            field_addmul(f, s->m + k, &t, c->m + k - at[j]);
            if (hyperbolic)
                field_addmul(f, c->m + k, &t, s->m + k - at[j]);
            else
                field_submul(f, c->m + k, &t, s->m + k - at[j]);
        }
        fmpz_mpoly_q_div_si(s->m + k, s->m + k, k, f->ctx);
        fmpz_mpoly_q_div_si(c->m + k, c->m + k, k, f->ctx);
    }
    element_clear(f, &t);
    free(at);
    tail_trim(f, s), tail_trim(f, c);
}

void tail_sin_cos(field *f, tail *s, tail *c, const tail *u, slong n, int hyperbolic)
{
    tail sine, cosine;
    tail_init(&sine), tail_init(&cosine);
    slong known = known_least(u->known, n);
    if (u->known == TAIL_EXACT && tail_length(u) == 0) {
        fmpq_poly_one(cosine.q);
        known = TAIL_EXACT;
    } else if (u->rational)
        rational_sin_cos(sine.q, cosine.q, u->q, known, hyperbolic);
    else if (known > 0)
        sin_cos_field(f, &sine, &cosine, u, known, hyperbolic);
    sine.known = cosine.known = known;
    tail_place(&sine, u->offset, gcd_of(2 * u->offset, u->gap));
    tail_place(&cosine, 0, gcd_of(2 * u->offset, u->gap));
    tail_swap(s, &sine), tail_swap(c, &cosine);
    tail_clear(f, &sine), tail_clear(f, &cosine);
}

void tail_tan(field *f, tail *out, const tail *u, slong n, int hyperbolic)
{
    tail result;
    tail_init(&result);
    slong known = known_least(u->known, n);
    if (tail_is_exact_zero(u))
        known = TAIL_EXACT;
    else
        rational_tan(result.q, u->q, known, hyperbolic);
    result.known = known;
    tail_place(&result, u->offset, gcd_of(2 * u->offset, u->gap));
    tail_swap(out, &result);
    tail_clear(f, &result);
}

/* Horner's rule; a monomial u only scales and spreads. */
static void compose_field(field *f, tail *out, const tail *outer, const tail *u, slong n)
{
    slong many;
    slong *at = nonzero_indices(f, u, 1, &many);
    if (many == 1) {
        slong gap = at[0];
        element power;
        element_init(f, &power);
        fmpz_mpoly_q_one(&power, f->ctx);
        tail_reset(f, out, n, n);
        for (slong k = 0; k * gap < n && k < outer->count && budget_ok(f->e); k++) {
            field_mul(f, out->m + k * gap, outer->m + k, &power);
            field_mul(f, &power, &power, u->m + gap);
        }
        element_clear(f, &power);
        tail_trim(f, out);
    } else {
        slong gap = many > 0 ? at[0] : n;
        tail step;
        tail_init(&step);
        tail_reset(f, out, 0, n);
        for (slong k = FLINT_MIN(outer->count, (n - 1) / gap + 1) - 1; k >= 0 && budget_ok(f->e); k--) {
            tail_mul(f, out, out, u, n);
            tail_set_element(f, &step, outer->m + k);
            tail_add(f, out, out, &step, 1);
        }
        tail_clear(f, &step);
    }
    free(at);
}

void tail_compose(field *f, tail *out, const tail *outer, const tail *u, slong n)
{
    tail result;
    tail_init(&result);
    slong low = 1; /* u starts with y^low at least */
    while (low < tail_length(u) && tail_coefficient_is_zero(u, f, low))
        low++;
    slong known = known_least(u->known, n);
    if (outer->known != TAIL_EXACT)
        known = known_least(known, outer->known > WORD_MAX / low ? WORD_MAX : outer->known * low);
    if (u->known == TAIL_EXACT && tail_length(u) == 0) {
        tail_set(f, &result, outer);
        tail_truncate(f, &result, 1);
        known = TAIL_EXACT;
    } else if (outer->rational && u->rational)
        rational_compose(result.q, outer->q, u->q, known);
    else if (known > 0) {
        pair p;
        pair_open(f, &p, outer, u);
        compose_field(f, &result, &p.a, &p.b, known);
        pair_close(f, &p);
    }
    result.known = known;
    tail_place(&result, outer->offset * u->offset, gcd_of(outer->gap * u->offset, u->gap));
    tail_swap(out, &result);
    tail_clear(f, &result);
}

static void weigh_rational(tail *t, const fmpq_t lead, slong den, bool divide)
{
    slong n = fmpq_poly_length(t->q);
    fmpz *num = _fmpz_vec_init(n);
    fmpz_t common, part;
    fmpz_init_set_ui(common, 1);
    fmpz_init(part);
    if (divide) /* the least common multiple of the weights' numerators as denominator */
        for (slong j = 0; j < n; j++) {
            fmpz_mul_si(part, fmpq_numref(lead), den);
            fmpz_addmul_si(part, fmpq_denref(lead), j);
            if (!fmpz_is_zero(part) && !fmpz_is_zero(t->q->coeffs + j))
                fmpz_lcm(common, common, part);
        }
    for (slong j = 0; j < n; j++) {
        fmpz_mul_si(part, fmpq_numref(lead), den); /* weight = part / (den * denominator of lead) */
        fmpz_addmul_si(part, fmpq_denref(lead), j);
        if (!divide)
            fmpz_mul(num + j, t->q->coeffs + j, part);
        else if (!fmpz_is_zero(part) && !fmpz_is_zero(t->q->coeffs + j)) {
            fmpz_divexact(part, common, part);
            fmpz_mul(num + j, t->q->coeffs + j, part);
        }
    }
    fmpz_mul_si(part, fmpq_denref(lead), den);
    if (divide) {
        _fmpz_vec_scalar_mul_fmpz(num, num, n, part);
        fmpz_mul(common, common, t->q->den);
    } else
        fmpz_mul(common, part, t->q->den);
    for (slong j = 0; j < n; j++)
        fmpz_swap(t->q->coeffs + j, num + j);
    fmpz_set(t->q->den, common);
    _fmpq_poly_normalise(t->q);
    fmpq_poly_canonicalise(t->q);
    _fmpz_vec_clear(num, n);
    fmpz_clear(common), fmpz_clear(part);
}

void tail_weigh(field *f, tail *t, const element *alpha, const fmpq_t lead, slong den, bool divide)
{
    if (alpha == NULL && t->rational) {
        weigh_rational(t, lead, den, divide);
        return;
    }
    tail_promote(f, t);
    element w;
    fmpq_t step;
    element_init(f, &w);
    fmpq_init(step);
    for (slong k = 0; k < t->count; k++) {
        if (fmpz_mpoly_q_is_zero(t->m + k, f->ctx))
            continue;
        fmpq_set_si(step, k, (ulong)den);
        fmpq_add(step, step, lead);
        fmpz_mpoly_q_set_fmpq(&w, step, f->ctx);
        if (alpha != NULL)
            fmpz_mpoly_q_add(&w, &w, alpha, f->ctx);
        if (!divide)
            field_mul(f, t->m + k, t->m + k, &w);
        else if (!fmpz_mpoly_q_is_zero(&w, f->ctx))
            field_div(f, t->m + k, t->m + k, &w);
    }
    element_clear(f, &w);
    fmpq_clear(step);
    tail_trim(f, t);
}
