/* The saddles and poles of a rational phase over Q(i), exactly. Knows nothing of paths.
 *
 * The one idea: the norm of a polynomial over Q(i) has rational coefficients, so its roots are exact algebraic numbers; that a root
 * has multiplicity m in the polynomial itself is proved by counting: the first derivative that a ball shows not to vanish bounds
 * each multiplicity from above, and when these bounds add up to the degree each of them is met. */
#include "engine/method/landscape.h"

#include <stdlib.h>
#include <string.h>

enum { DEGREE_LIMIT = 60, FIRST_BITS = 256, LAST_BITS = 16384, UNKNOWN_BITS = 4096, NORM_LIMIT = 40 };

/* ---- polynomials over Q(i) ---- */

static void gauss_init(gauss_poly *a)
{
    fmpq_poly_init(a->re);
    fmpq_poly_init(a->im);
}

static void gauss_clear(gauss_poly *a)
{
    fmpq_poly_clear(a->re);
    fmpq_poly_clear(a->im);
}

static void gauss_swap(gauss_poly *a, gauss_poly *b)
{
    fmpq_poly_swap(a->re, b->re);
    fmpq_poly_swap(a->im, b->im);
}

static void gauss_set(gauss_poly *a, const gauss_poly *b)
{
    fmpq_poly_set(a->re, b->re);
    fmpq_poly_set(a->im, b->im);
}

static slong gauss_degree(const gauss_poly *a)
{
    return FLINT_MAX(fmpq_poly_degree(a->re), fmpq_poly_degree(a->im));
}

static bool gauss_is_zero(const gauss_poly *a)
{
    return fmpq_poly_is_zero(a->re) && fmpq_poly_is_zero(a->im);
}

static bool gauss_equal(const gauss_poly *a, const gauss_poly *b)
{
    return fmpq_poly_equal(a->re, b->re) && fmpq_poly_equal(a->im, b->im);
}

static void gauss_add(gauss_poly *out, const gauss_poly *a, const gauss_poly *b)
{
    fmpq_poly_add(out->re, a->re, b->re);
    fmpq_poly_add(out->im, a->im, b->im);
}

static void gauss_sub(gauss_poly *out, const gauss_poly *a, const gauss_poly *b)
{
    fmpq_poly_sub(out->re, a->re, b->re);
    fmpq_poly_sub(out->im, a->im, b->im);
}

static void gauss_mul(gauss_poly *out, const gauss_poly *a, const gauss_poly *b)
{
    gauss_poly t;
    fmpq_poly_t u;
    gauss_init(&t);
    fmpq_poly_init(u);
    fmpq_poly_mul(t.re, a->re, b->re);
    fmpq_poly_mul(u, a->im, b->im);
    fmpq_poly_sub(t.re, t.re, u);
    fmpq_poly_mul(t.im, a->re, b->im);
    fmpq_poly_mul(u, a->im, b->re);
    fmpq_poly_add(t.im, t.im, u);
    gauss_swap(out, &t);
    gauss_clear(&t);
    fmpq_poly_clear(u);
}

static void gauss_derivative(gauss_poly *out, const gauss_poly *a)
{
    fmpq_poly_derivative(out->re, a->re);
    fmpq_poly_derivative(out->im, a->im);
}

static void gauss_balls(acb_poly_t out, const gauss_poly *a, slong bits)
{
    acb_poly_set2_fmpq_poly(out, a->re, a->im, bits);
}

/* |a|^2 */
static void gauss_norm(fmpq_poly_t out, const gauss_poly *a)
{
    fmpq_poly_t t;
    fmpq_poly_init(t);
    fmpq_poly_mul(out, a->re, a->re);
    fmpq_poly_mul(t, a->im, a->im);
    fmpq_poly_add(out, out, t);
    fmpq_poly_clear(t);
}

/* The rational factor that numerator and denominator share is taken out. */
static void cancel_common(gauss_poly *a, gauss_poly *b)
{
    fmpq_poly_t g;
    fmpq_poly_init(g);
    fmpq_poly_gcd(g, a->re, a->im);
    fmpq_poly_gcd(g, g, b->re);
    fmpq_poly_gcd(g, g, b->im);
    if (fmpq_poly_degree(g) > 0) {
        fmpq_poly_div(a->re, a->re, g);
        fmpq_poly_div(a->im, a->im, g);
        fmpq_poly_div(b->re, b->re, g);
        fmpq_poly_div(b->im, b->im, g);
    }
    fmpq_poly_clear(g);
}

/* ---- reading ---- */

typedef struct fraction {
    gauss_poly top, bottom;
} fraction;

static void fraction_init(fraction *f)
{
    gauss_init(&f->top);
    gauss_init(&f->bottom);
    fmpq_poly_one(f->bottom.re);
}

static void fraction_clear(fraction *f)
{
    gauss_clear(&f->top);
    gauss_clear(&f->bottom);
}

static bool read_fraction(fraction *out, tw_engine *e, expr *a, expr *z);

static bool small_enough(const fraction *f)
{
    return gauss_degree(&f->top) <= DEGREE_LIMIT && gauss_degree(&f->bottom) <= DEGREE_LIMIT;
}

static void fraction_combine(fraction *sum, const fraction *next, bool product)
{
    if (product) {
        gauss_mul(&sum->top, &sum->top, &next->top);
        gauss_mul(&sum->bottom, &sum->bottom, &next->bottom);
    } else if (gauss_equal(&sum->bottom, &next->bottom)) {
        gauss_add(&sum->top, &sum->top, &next->top);
    } else {
        gauss_poly t;
        gauss_init(&t);
        gauss_mul(&t, &next->top, &sum->bottom);
        gauss_mul(&sum->top, &sum->top, &next->bottom);
        gauss_add(&sum->top, &sum->top, &t);
        gauss_mul(&sum->bottom, &sum->bottom, &next->bottom);
        gauss_clear(&t);
    }
    cancel_common(&sum->top, &sum->bottom);
}

static bool read_list(fraction *out, tw_engine *e, expr *a, expr *z)
{
    bool product = a->kind == EXPR_PRODUCT, fine = true;
    fraction next;
    if (product)
        fmpq_poly_one(out->top.re);
    for (uint32_t k = 0; k < a->count && fine; k++) {
        fraction_init(&next);
        fine = read_fraction(&next, e, a->args[k], z);
        if (fine)
            fraction_combine(out, &next, product);
        fine = fine && small_enough(out);
        fraction_clear(&next);
    }
    return fine;
}

static bool read_power(fraction *out, tw_engine *e, expr *a, expr *z)
{
    const fmpq *n = expr_is_number(a->args[1]) ? expr_number(a->args[1]) : NULL;
    if (!n || !fmpz_is_one(fmpq_denref(n)) || fmpz_cmpabs(fmpq_numref(n), &(fmpz){DEGREE_LIMIT}) > 0)
        return false;
    slong times = fmpz_get_si(fmpq_numref(n));
    fraction base;
    fraction_init(&base);
    bool fine = read_fraction(&base, e, a->args[0], z);
    fmpq_poly_one(out->top.re);
    for (slong k = 0; k < FLINT_ABS(times) && fine; k++) {
        fraction_combine(out, &base, true);
        fine = small_enough(out);
    }
    if (fine && times < 0) {
        fine = !gauss_is_zero(&out->top);
        gauss_swap(&out->top, &out->bottom);
    }
    fraction_clear(&base);
    return fine;
}

static bool read_fraction(fraction *out, tw_engine *e, expr *a, expr *z)
{
    if (!a || !budget_ok(e))
        return false;
    if (a == z) {
        fmpq_poly_set_coeff_ui(out->top.re, 1, 1);
        return true;
    }
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: fmpq_poly_set_fmpq(out->top.re, expr_number(a)); return true;
    case EXPR_CONSTANT:
        if (a->is.constant != CONSTANT_I)
            return false;
        fmpq_poly_one(out->top.im);
        return true;
    case EXPR_SUM: case EXPR_PRODUCT: return read_list(out, e, a, z);
    case EXPR_POWER: return read_power(out, e, a, z);
    default: return false;
    }
}

bool gauss_fraction(tw_engine *e, expr *a, expr *z, gauss_poly *top, gauss_poly *bottom)
{
    fraction f;
    fraction_init(&f);
    if (!read_fraction(&f, e, a, z)) {
        fraction_clear(&f);
        return false;
    }
    *top = f.top;
    *bottom = f.bottom;
    return true;
}

bool gauss_number(tw_engine *e, expr *a, fmpq_t re, fmpq_t im)
{
    fraction f;
    acb_t v;
    fraction_init(&f);
    acb_init(v);
    expr *none = expr_fresh(e, "z");
    bool fine = a && none && read_fraction(&f, e, a, none) && gauss_degree(&f.top) <= 0 && gauss_degree(&f.bottom) == 0;
    if (fine) {
        fmpq_t c, d, n, t;
        fmpq_init(c), fmpq_init(d), fmpq_init(n), fmpq_init(t);
        fmpq_poly_get_coeff_fmpq(re, f.top.re, 0);
        fmpq_poly_get_coeff_fmpq(im, f.top.im, 0);
        fmpq_poly_get_coeff_fmpq(c, f.bottom.re, 0);
        fmpq_poly_get_coeff_fmpq(d, f.bottom.im, 0);
        fmpq_mul(n, c, c);
        fmpq_addmul(n, d, d);
        fmpq_mul(t, im, c); /* (re + i im)(c - i d)/n */
        fmpq_submul(t, re, d);
        fmpq_mul(re, re, c);
        fmpq_addmul(re, im, d);
        fmpq_div(re, re, n);
        fmpq_div(im, t, n);
        fmpq_clear(c), fmpq_clear(d), fmpq_clear(n), fmpq_clear(t);
    }
    fraction_clear(&f);
    acb_clear(v);
    return fine;
}

/* ---- values ---- */

static void evaluate(acb_t out, const gauss_poly *a, const acb_t z, slong bits)
{
    acb_poly_t f;
    acb_poly_init(f);
    gauss_balls(f, a, bits);
    acb_poly_evaluate(out, f, z, bits);
    acb_poly_clear(f);
}

void landscape_value(acb_t out, const landscape *l, const acb_t z, slong bits)
{
    acb_t d;
    acb_init(d);
    acb_poly_evaluate(d, l->bottom, z, bits);
    acb_poly_evaluate(out, l->top, z, bits);
    acb_div(out, out, d, bits);
    acb_clear(d);
}

void landscape_slope(acb_t out, const landscape *l, const acb_t z, slong bits)
{
    acb_t d;
    acb_init(d);
    acb_poly_evaluate(d, l->bottom, z, bits);
    acb_poly_evaluate(out, l->rise, z, bits);
    acb_div(out, out, d, bits);
    acb_div(out, out, d, bits);
    acb_clear(d);
}

/* The order of vanishing of a at z as balls see it: at most the true one is never claimed, the first nonzero coefficient is. */
static slong seen_order(const gauss_poly *a, const acb_t z, slong bits)
{
    acb_poly_t f;
    acb_poly_init(f);
    gauss_balls(f, a, bits);
    acb_poly_taylor_shift(f, f, z, bits);
    slong k = 0, degree = gauss_degree(a);
    while (k <= degree && (k >= acb_poly_length(f) || acb_contains_zero(acb_poly_get_coeff_ptr(f, k))))
        k++;
    acb_poly_clear(f);
    return k;
}

static void taylor_coefficient(acb_t out, const gauss_poly *a, const acb_t z, slong k, slong bits)
{
    acb_poly_t f;
    acb_poly_init(f);
    gauss_balls(f, a, bits);
    acb_poly_taylor_shift(f, f, z, bits);
    acb_poly_get_coeff_acb(out, f, k);
    acb_poly_clear(f);
}

/* z, height, lead from the exact place; the order is known. */
static void spot_refine(const landscape *l, spot *s, slong bits)
{
    qqbar_get_acb(s->z, s->exact, bits);
    if (s->order < 0)
        return;
    acb_t d;
    acb_init(d);
    evaluate(d, &l->denominator, s->z, bits);
    evaluate(s->height, &l->numerator, s->z, bits);
    acb_div(s->height, s->height, d, bits);
    evaluate(d, &l->denominator, s->z, bits);
    taylor_coefficient(s->lead, &l->slope, s->z, s->order, bits);
    acb_div(s->lead, s->lead, d, bits);
    acb_div(s->lead, s->lead, d, bits);
    acb_div_si(s->lead, s->lead, s->order + 1, bits);
    acb_clear(d);
}

static void spot_init(spot *s)
{
    memset(s, 0, sizeof *s);
    qqbar_init(s->exact);
    acb_init(s->z);
    acb_init(s->height);
    acb_init(s->lead);
}

void spot_clear(spot *s)
{
    qqbar_clear(s->exact);
    acb_clear(s->z);
    acb_clear(s->height);
    acb_clear(s->lead);
}

/* ---- roots ---- */

typedef struct root_list {
    slong count;
    qqbar_ptr list;
    slong *top, *bottom; /* multiplicities in slope and denominator */
} root_list;

static void roots_clear(root_list *r)
{
    _qqbar_vec_clear(r->list, r->count);
    free(r->top);
    free(r->bottom);
}

/* All distinct roots of the norms of slope and denominator. */
static bool roots_find(root_list *r, const landscape *l)
{
    fmpq_poly_t norm, other;
    fmpz_poly_t whole;
    fmpz_poly_factor_t factors;
    fmpq_poly_init(norm);
    fmpq_poly_init(other);
    fmpz_poly_init(whole);
    fmpz_poly_factor_init(factors);
    bool real = fmpq_poly_is_zero(l->slope.im) && fmpq_poly_is_zero(l->denominator.im);
    if (real) {
        fmpq_poly_mul(norm, l->slope.re, l->denominator.re);
    } else {
        gauss_norm(norm, &l->slope);
        gauss_norm(other, &l->denominator);
        fmpq_poly_mul(norm, norm, other);
    }
    fmpq_poly_get_numerator(whole, norm);
    bool fine = fmpz_poly_degree(whole) <= 4 * DEGREE_LIMIT;
    if (fine)
        fmpz_poly_factor(factors, whole);
    slong total = 0;
    for (slong k = 0; k < factors->num && fine; k++) {
        total += fmpz_poly_degree(factors->p + k);
        fine = fmpz_poly_degree(factors->p + k) <= NORM_LIMIT;
    }
    if (fine) {
        r->list = _qqbar_vec_init(total);
        r->top = base_alloc((size_t)(total + 1) * sizeof *r->top);
        r->bottom = base_alloc((size_t)(total + 1) * sizeof *r->bottom);
        for (slong k = 0; k < factors->num; k++) {
            qqbar_roots_fmpz_poly(r->list + r->count, factors->p + k, QQBAR_ROOTS_IRREDUCIBLE);
            r->count += fmpz_poly_degree(factors->p + k);
        }
    }
    fmpz_poly_factor_clear(factors);
    fmpz_poly_clear(whole);
    fmpq_poly_clear(other);
    fmpq_poly_clear(norm);
    return fine;
}

/* Proves the multiplicities; see the head of the file. */
static bool roots_count(tw_engine *e, root_list *r, const landscape *l, slong *bits)
{
    acb_t z;
    acb_init(z);
    bool proved = false;
    for (*bits = FIRST_BITS; *bits <= LAST_BITS && !proved && budget_ok(e); *bits *= 2) {
        slong top = 0, bottom = 0;
        for (slong k = 0; k < r->count; k++) {
            qqbar_get_acb(z, r->list + k, *bits);
            top += r->top[k] = seen_order(&l->slope, z, *bits);
            bottom += r->bottom[k] = seen_order(&l->denominator, z, *bits);
        }
        proved = top == gauss_degree(&l->slope) && bottom == gauss_degree(&l->denominator);
        if (proved)
            break;
    }
    acb_clear(z);
    return proved;
}

static void set_constant(landscape *l, slong bits)
{
    acb_t d;
    acb_init(d);
    acb_poly_t f;
    acb_poly_init(f);
    gauss_balls(f, &l->slope, bits);
    acb_poly_get_coeff_acb(l->constant, f, gauss_degree(&l->slope));
    gauss_balls(f, &l->denominator, bits);
    acb_poly_get_coeff_acb(d, f, gauss_degree(&l->denominator));
    acb_div(l->constant, l->constant, d, bits);
    acb_div(l->constant, l->constant, d, bits);
    acb_poly_clear(f);
    acb_clear(d);
}

void landscape_refine(landscape *l, slong bits)
{
    if (bits <= l->bits)
        return;
    l->bits = bits;
    gauss_balls(l->top, &l->numerator, bits);
    gauss_balls(l->bottom, &l->denominator, bits);
    gauss_balls(l->rise, &l->slope, bits);
    for (size_t k = 0; k < l->count; k++)
        spot_refine(l, l->spots + k, bits);
    set_constant(l, bits);
}

static bool take_spots(landscape *l, const root_list *r)
{
    l->spots = base_alloc(((size_t)r->count + 1) * sizeof *l->spots);
    for (slong k = 0; k < r->count; k++) {
        slong order = r->top[k] - 2 * r->bottom[k];
        if (r->bottom[k] > 0 && order >= 0)
            return false; /* numerator and denominator share a factor over Q(i) only */
        if (order == 0)
            continue;
        spot *s = l->spots + l->count++;
        spot_init(s);
        qqbar_set(s->exact, r->list + k);
        s->order = order;
        s->place = expr_from_algebraic(l->e, s->exact);
        if (!s->place)
            return false;
    }
    return true;
}

bool landscape_read(landscape *l, tw_engine *e, expr *p, expr *z)
{
    memset(l, 0, sizeof *l);
    l->e = e;
    l->p = p;
    l->z = z;
    gauss_init(&l->numerator);
    gauss_init(&l->denominator);
    gauss_init(&l->slope);
    acb_init(l->constant);
    acb_poly_init(l->top);
    acb_poly_init(l->bottom);
    acb_poly_init(l->rise);
    fraction f;
    root_list r = {0};
    slong bits = 0;
    fraction_init(&f);
    bool fine = read_fraction(&f, e, p, z) && !gauss_is_zero(&f.top);
    if (fine) {
        gauss_poly t;
        gauss_init(&t);
        gauss_set(&l->numerator, &f.top);
        gauss_set(&l->denominator, &f.bottom);
        gauss_derivative(&l->slope, &f.top);
        gauss_mul(&l->slope, &l->slope, &f.bottom);
        gauss_derivative(&t, &f.bottom);
        gauss_mul(&t, &t, &f.top);
        gauss_sub(&l->slope, &l->slope, &t);
        gauss_clear(&t);
        l->at_infinity = gauss_degree(&l->numerator) - gauss_degree(&l->denominator);
        fine = !gauss_is_zero(&l->slope);
    }
    fraction_clear(&f);
    fine = fine && roots_find(&r, l) && roots_count(e, &r, l, &bits) && take_spots(l, &r);
    roots_clear(&r);
    if (fine) {
        landscape_refine(l, bits);
        return true;
    }
    landscape_clear(l);
    return false;
}

void landscape_clear(landscape *l)
{
    for (size_t k = 0; k < l->count; k++)
        spot_clear(l->spots + k);
    free(l->spots);
    gauss_clear(&l->numerator);
    gauss_clear(&l->denominator);
    gauss_clear(&l->slope);
    acb_clear(l->constant);
    acb_poly_clear(l->top);
    acb_poly_clear(l->bottom);
    acb_poly_clear(l->rise);
    l->count = 0;
    l->spots = NULL;
}

bool landscape_point(landscape *l, spot *out, expr *place)
{
    fmpq_t re, im;
    fmpq_init(re);
    fmpq_init(im);
    spot_init(out);
    bool fine = gauss_number(l->e, place, re, im);
    if (fine) {
        qqbar_t i;
        qqbar_init(i);
        qqbar_i(i);
        qqbar_mul_fmpq(i, i, im);
        qqbar_add_fmpq(out->exact, i, re);
        qqbar_clear(i);
        out->place = place;
        for (size_t k = 0; k < l->count; k++)
            if (qqbar_equal(out->exact, l->spots[k].exact))
                out->order = l->spots[k].order;
        fine = out->order >= 0;
        spot_refine(l, out, l->bits);
    }
    fmpq_clear(re);
    fmpq_clear(im);
    return fine;
}

bool landscape_spot(landscape *l, spot *out, const qqbar_t place, slong order)
{
    spot_init(out);
    qqbar_set(out->exact, place);
    out->order = order;
    out->place = expr_from_algebraic(l->e, place);
    spot_refine(l, out, l->bits);
    if (out->place && acb_is_finite(out->height))
        return true;
    spot_clear(out);
    return false;
}

/* ---- exact heights ---- */

/* p at an exact place. */
static bool exact_height(qqbar_t out, const landscape *l, const spot *s)
{
    qqbar_t t, i;
    if (!fmpq_poly_is_one(l->denominator.re) || !fmpq_poly_is_zero(l->denominator.im) || qqbar_degree(s->exact) > 12)
        return false;
    qqbar_init(t);
    qqbar_init(i);
    qqbar_evaluate_fmpq_poly(out, l->numerator.re, s->exact);
    bool fine = true;
    if (!fmpq_poly_is_zero(l->numerator.im)) {
        fine = qqbar_degree(s->exact) <= 4;
        if (fine) {
            qqbar_i(i);
            qqbar_evaluate_fmpq_poly(t, l->numerator.im, s->exact);
            qqbar_mul(t, t, i);
            qqbar_add(out, out, t);
        }
    }
    qqbar_clear(t);
    qqbar_clear(i);
    return fine;
}

static bool exact_rational_height(qqbar_t out, const landscape *l, const spot *s)
{
    qqbar_t t, d, i;
    if (qqbar_degree(s->exact) > 4)
        return false;
    qqbar_init(t), qqbar_init(d), qqbar_init(i);
    qqbar_i(i);
    qqbar_evaluate_fmpq_poly(out, l->numerator.re, s->exact);
    qqbar_evaluate_fmpq_poly(t, l->numerator.im, s->exact);
    qqbar_mul(t, t, i);
    qqbar_add(out, out, t);
    qqbar_evaluate_fmpq_poly(d, l->denominator.re, s->exact);
    qqbar_evaluate_fmpq_poly(t, l->denominator.im, s->exact);
    qqbar_mul(t, t, i);
    qqbar_add(d, d, t);
    bool fine = !qqbar_is_zero(d);
    if (fine)
        qqbar_div(out, out, d);
    qqbar_clear(t), qqbar_clear(d), qqbar_clear(i);
    return fine;
}

/* Is the given part of a - b exactly 0? *known false: the numbers are too large to say. */
static bool part_is_zero(const landscape *l, const spot *a, const spot *b, int part, bool *known)
{
    enum { PRODUCT_LIMIT = 40 };
    qqbar_t x, y;
    qqbar_init(x);
    qqbar_init(y);
    *known = (exact_height(x, l, a) || exact_rational_height(x, l, a)) && (exact_height(y, l, b) || exact_rational_height(y, l, b));
    bool zero = false;
    if (*known && qqbar_equal(x, y)) {
        zero = true;
    } else if (*known) {
        qqbar_t c;
        qqbar_init(c);
        qqbar_conj(c, y);
        if (part == 0 && qqbar_equal(x, c))
            zero = true;
        else if (part == 1 && qqbar_is_real(x) && qqbar_is_real(y))
            zero = true;
        else if (qqbar_degree(x) * qqbar_degree(y) <= PRODUCT_LIMIT) {
            qqbar_sub(x, x, y);
            qqbar_conj(c, x);
            if (part == 0)
                qqbar_neg(c, c);
            zero = qqbar_equal(x, c);
        } else {
            *known = false;
        }
        qqbar_clear(c);
    }
    qqbar_clear(x);
    qqbar_clear(y);
    return zero;
}

/* Does p(conj(z)) = conj(p(z)) (unit 1), or p(-conj(z)) = conj(p(z)) (unit -1), by the coefficients? */
static bool is_mirrored(const landscape *l, int unit)
{
    const gauss_poly *both[] = {&l->numerator, &l->denominator};
    fmpq_t c;
    fmpq_init(c);
    bool fine = true;
    for (int n = 0; n < 2; n++)
        for (slong k = 0; k <= gauss_degree(both[n]) && fine; k++) { /* c_k unit^k = conj(c_k) */
            bool odd = unit < 0 && k % 2;
            fmpq_poly_get_coeff_fmpq(c, odd ? both[n]->re : both[n]->im, k);
            fine = fmpq_is_zero(c);
        }
    fmpq_clear(c);
    return fine;
}

/* Heights that are conjugate because the places are mirror images: their real parts are equal. */
static bool mirror_images(const landscape *l, const spot *a, const spot *b, int part)
{
    qqbar_t c;
    bool same = false;
    if (part != 0)
        return false;
    qqbar_init(c);
    qqbar_conj(c, a->exact);
    same = qqbar_equal(c, b->exact) && is_mirrored(l, 1);
    qqbar_neg(c, c);
    same = same || (qqbar_equal(c, b->exact) && is_mirrored(l, -1));
    qqbar_clear(c);
    return same;
}

int heights_compare(const landscape *l, const spot *a, const spot *b, int part)
{
    acb_t d;
    acb_init(d);
    acb_sub(d, a->height, b->height, l->bits);
    arb_srcptr x = part ? acb_imagref(d) : acb_realref(d);
    int sign = arb_is_zero(x) ? 0 : arb_is_positive(x) ? 1 : arb_is_negative(x) ? -1 : 2;
    if (sign == 2) {
        bool known;
        slong most = LAST_BITS;
        if (mirror_images(l, a, b, part) || part_is_zero(l, a, b, part, &known))
            sign = 0;
        else { /* known: different, so more bits show it; else they may */
            if (!known)
                most = UNKNOWN_BITS;
            spot s, t;
            spot_init(&s), spot_init(&t);
            qqbar_set(s.exact, a->exact), qqbar_set(t.exact, b->exact);
            s.order = a->order, t.order = b->order;
            for (slong bits = 2 * l->bits; bits <= most && sign == 2; bits *= 2) {
                spot_refine(l, &s, bits), spot_refine(l, &t, bits);
                acb_sub(d, s.height, t.height, bits);
                sign = arb_is_positive(x) ? 1 : arb_is_negative(x) ? -1 : 2;
            }
            spot_clear(&s), spot_clear(&t);
        }
    }
    acb_clear(d);
    return sign;
}

/* ---- algebraic numbers as expressions ---- */

static expr *rational_part(tw_engine *e, const fmpz_t a, const fmpz_t b)
{
    fmpq_t q;
    fmpq_init(q);
    fmpq_set_fmpz_frac(q, a, b);
    expr *out = expr_fmpq(e, q);
    fmpq_clear(q);
    return out;
}

static bool holds(tw_engine *e, expr *a, const qqbar_t x)
{
    acb_t v, w;
    acb_init(v);
    acb_init(w);
    bool same = a && ball_value(e, v, a, 128) == TW_OK;
    qqbar_get_acb(w, x, 128);
    same = same && acb_overlaps(v, w);
    acb_clear(v);
    acb_clear(w);
    return same;
}

/* (-b +- sqrt(b^2 - 4 a c))/(2 a) */
static expr *quadratic(tw_engine *e, const qqbar_t x)
{
    const fmpz *c = QQBAR_COEFFS(x);
    fmpz_t d, t;
    fmpz_init(d);
    fmpz_init(t);
    fmpz_mul(d, c + 1, c + 1);
    fmpz_mul(t, c, c + 2);
    fmpz_submul_ui(d, t, 4);
    fmpz_neg(t, c + 1);
    expr *root = expr_sqrt(e, expr_fmpz(e, d)), *out = NULL;
    fmpz_t two;
    fmpz_init(two);
    fmpz_mul_ui(two, c + 2, 2);
    expr *centre = rational_part(e, t, two), *half = expr_div(e, root, expr_fmpz(e, two));
    for (int sign = 0; sign < 2 && !out; sign++) {
        expr *one = sign ? expr_sub(e, centre, half) : expr_add(e, centre, half);
        if (holds(e, one, x))
            out = one;
    }
    fmpz_clear(two);
    fmpz_clear(d);
    fmpz_clear(t);
    return out;
}

/* exp(i pi p/q), in square roots where the engine knows them. */
static expr *unit_at(tw_engine *e, slong p, slong q)
{
    expr *angle = expr_mul(e, expr_constant_of(e, CONSTANT_PI), expr_frac(e, p, q)), *i = expr_constant_of(e, CONSTANT_I);
    if (q == 1 || q == 2 || q == 3 || q == 4 || q == 6) {
        expr *c = expr_call1(e, FUNCTION_COS, angle), *s = expr_call1(e, FUNCTION_SIN, angle);
        if (c && s && c->kind != EXPR_CALL && s->kind != EXPR_CALL)
            return expr_add(e, c, expr_mul(e, i, s));
    }
    return expr_call1(e, FUNCTION_EXP, expr_mul(e, i, angle));
}

/* x^n = c for a rational c: |c|^(1/n) times a root of unity; for n = 3, 4, 6 in square roots. */
static expr *pure_root(tw_engine *e, const qqbar_t x)
{
    slong n = qqbar_degree(x);
    const fmpz *c = QQBAR_COEFFS(x);
    for (slong k = 1; k < n; k++)
        if (!fmpz_is_zero(c + k))
            return NULL;
    fmpz_t top;
    fmpz_init(top);
    fmpz_neg(top, c);
    expr *value = rational_part(e, top, c + n);
    bool negative = fmpz_sgn(top) < 0;
    fmpz_clear(top);
    if (negative)
        value = expr_neg(e, value);
    expr *modulus = expr_pow(e, value, expr_frac(e, 1, n));
    for (slong k = -(n / 2) - 1; k <= n / 2; k++) {
        expr *out = expr_mul(e, modulus, unit_at(e, 2 * k + (negative ? 1 : 0), n));
        if (holds(e, out, x))
            return out;
    }
    return NULL;
}

static expr *decimal(tw_engine *e, const arb_t x, slong digits)
{
    arf_t scaled;
    fmpz_t n, ten;
    fmpq_t q;
    arb_t t;
    arf_init(scaled);
    fmpz_init(n);
    fmpz_init(ten);
    fmpq_init(q);
    arb_init(t);
    fmpz_ui_pow_ui(ten, 10, (ulong)digits);
    arb_mul_fmpz(t, x, ten, 256);
    arf_get_fmpz(n, arb_midref(t), ARF_RND_NEAR);
    fmpq_set_fmpz_frac(q, n, ten);
    expr *out = expr_fmpq(e, q);
    arf_clear(scaled);
    fmpz_clear(n);
    fmpz_clear(ten);
    fmpq_clear(q);
    arb_clear(t);
    return out;
}

static expr *root_of(tw_engine *e, const qqbar_t x)
{
    acb_t v;
    acb_init(v);
    expr *r = expr_symbol(e, "r"), *polynomial = expr_int(e, 0), *out = NULL;
    for (slong k = 0; k <= qqbar_degree(x); k++)
        polynomial = expr_add(e, polynomial, expr_mul(e, expr_fmpz(e, QQBAR_COEFFS(x) + k), expr_pow(e, r, expr_int(e, k))));
    qqbar_get_acb(v, x, 256);
    for (slong digits = 4; digits <= 40 && !out; digits *= 2) { /* as few as tell it from the other roots */
        expr *near = expr_add(e, decimal(e, acb_realref(v), digits),
                              expr_mul(e, expr_constant_of(e, CONSTANT_I), decimal(e, acb_imagref(v), digits)));
        expr *one = expr_root(e, r, polynomial, near);
        if (holds(e, one, x))
            out = one;
        if (!one)
            break;
    }
    acb_clear(v);
    return out;
}

expr *expr_from_algebraic(tw_engine *e, const qqbar_t x)
{
    expr *out = NULL;
    if (qqbar_degree(x) == 1) {
        fmpz_t top;
        fmpz_init(top);
        fmpz_neg(top, QQBAR_COEFFS(x));
        out = rational_part(e, top, QQBAR_COEFFS(x) + 1);
        fmpz_clear(top);
        return out;
    }
    if (qqbar_degree(x) == 2)
        out = quadratic(e, x);
    else
        out = pure_root(e, x);
    return out ? out : root_of(e, x);
}
