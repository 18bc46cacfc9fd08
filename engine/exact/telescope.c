/* Telescoping by reduction. The one idea: with G = F/(N0 B^r) and G'/G = u/v in lowest terms, every derivative
 * (y v G)' is phi(y) G with phi(y) = v y' + (v' + u) y, so the polynomials N_j = N0 A^j B^(r-j) (T = A/B, N0 the part of F
 * that is a polynomial by itself) are reduced modulo the image of phi to degree below delta = max(deg v - 1,
 * deg(v' + u)); the first linear dependence among what is left is the identity of least order. Everything is fraction-free
 * over the integers in the field's generators, and each row is kept primitive: without that the entries explode. */
#include "engine/exact/telescope.h"

#include <stdlib.h>
#include <string.h>

void telescope_init(telescope *t, field *f, slong variable)
{
    *t = (telescope){.f = f, .variable = variable, .order = -1};
    element_init(f, &t->certificate);
    fmpz_mpoly_init(t->content, f->ctx);
    fmpz_mpoly_one(t->content, f->ctx);
}

void telescope_clear(telescope *t)
{
    for (slong j = 0; j <= t->order; j++) fmpz_mpoly_clear(&t->c[j], t->f->ctx);
    free(t->c);
    element_clear(t->f, &t->certificate);
    fmpz_mpoly_clear(t->content, t->f->ctx);
}

/* ---- one search ---- */

/* A relation sum_j comb[j] N_j = rem + phi(y). */
typedef struct row {
    fmpz_mpoly_struct rem, y;
    fmpz_mpoly_struct *comb;
    slong pivot; /* degree of rem in x */
} row;

typedef struct search {
    tw_engine *e;
    field *f;
    slong x, order;     /* variable; the bound r of the order */
    fmpz_mpoly_t n0, a, b;
    fmpz_mpoly_t v, w;  /* w = v' + u */
    fmpz_mpoly_t lead_v, lead_w; /* coefficients of x^(delta + 1) in v and of x^delta in w */
    slong delta, special; /* special: the k whose phi(x^k) has a degree below k + delta; -1: none */
    slong count;
    row *rows;
} search;

static slong degree_in(const search *s, const fmpz_mpoly_t p)
{
    return fmpz_mpoly_degree_si(p, s->x, s->f->ctx);
}

static void coefficient_of(const search *s, fmpz_mpoly_t out, const fmpz_mpoly_t p, slong degree)
{
    ulong k = (ulong)degree;
    slong x = s->x;
    fmpz_mpoly_get_coeff_vars_ui(out, p, &x, &k, 1, s->f->ctx);
}

static void row_init(const search *s, row *r)
{
    fmpz_mpoly_init(&r->rem, s->f->ctx);
    fmpz_mpoly_init(&r->y, s->f->ctx);
    r->comb = base_alloc((size_t)(s->order + 1) * sizeof *r->comb);
    for (slong j = 0; j <= s->order; j++) fmpz_mpoly_init(&r->comb[j], s->f->ctx);
    r->pivot = -1;
}

static void row_clear(const search *s, row *r)
{
    fmpz_mpoly_clear(&r->rem, s->f->ctx);
    fmpz_mpoly_clear(&r->y, s->f->ctx);
    for (slong j = 0; j <= s->order; j++) fmpz_mpoly_clear(&r->comb[j], s->f->ctx);
    free(r->comb);
}

/* out = phi(y) */
static void phi(const search *s, fmpz_mpoly_t out, const fmpz_mpoly_t y)
{
    fmpz_mpoly_t t;
    fmpz_mpoly_init(t, s->f->ctx);
    fmpz_mpoly_derivative(t, y, s->x, s->f->ctx);
    fmpz_mpoly_mul(t, t, s->v, s->f->ctx);
    fmpz_mpoly_mul(out, s->w, y, s->f->ctx);
    fmpz_mpoly_add(out, out, t, s->f->ctx);
    fmpz_mpoly_clear(t, s->f->ctx);
}

/* p = m*p */
static void scale(const search *s, fmpz_mpoly_t p, const fmpz_mpoly_t m)
{
    if (!fmpz_mpoly_is_one(m, s->f->ctx)) fmpz_mpoly_mul(p, p, m, s->f->ctx);
}

static void row_scale(const search *s, row *r, const fmpz_mpoly_t m)
{
    if (fmpz_mpoly_is_one(m, s->f->ctx)) return;
    scale(s, &r->rem, m);
    scale(s, &r->y, m);
    for (slong j = 0; j <= s->order; j++) scale(s, &r->comb[j], m);
}

/* p -= m*q */
static void subtract(const search *s, fmpz_mpoly_t p, const fmpz_mpoly_t m, const fmpz_mpoly_t q)
{
    fmpz_mpoly_t t;
    if (fmpz_mpoly_is_zero(q, s->f->ctx)) return;
    fmpz_mpoly_init(t, s->f->ctx);
    fmpz_mpoly_mul(t, m, q, s->f->ctx);
    fmpz_mpoly_sub(p, p, t, s->f->ctx);
    fmpz_mpoly_clear(t, s->f->ctx);
}

/* common = gcd(common, the coefficients of p as a polynomial in x) */
static void take_content(const search *s, fmpz_mpoly_t common, const fmpz_mpoly_t p)
{
    if (fmpz_mpoly_is_one(common, s->f->ctx) || fmpz_mpoly_is_zero(p, s->f->ctx)) return;
    fmpz_mpoly_t t;
    slong x = s->x;
    fmpz_mpoly_init(t, s->f->ctx);
    if (!fmpz_mpoly_content_vars(t, p, &x, 1, s->f->ctx) || !fmpz_mpoly_gcd(common, common, t, s->f->ctx))
        fmpz_mpoly_one(common, s->f->ctx);
    fmpz_mpoly_clear(t, s->f->ctx);
}

static void divide(const search *s, fmpz_mpoly_t p, const fmpz_mpoly_t common)
{
    if (!fmpz_mpoly_is_zero(p, s->f->ctx)) fmpz_mpoly_divides(p, p, common, s->f->ctx);
}

static void row_make_primitive(const search *s, row *r)
{
    fmpz_mpoly_t common;
    fmpz_mpoly_init(common, s->f->ctx);
    for (slong j = 0; j <= s->order; j++) take_content(s, common, &r->comb[j]);
    take_content(s, common, &r->rem);
    take_content(s, common, &r->y);
    if (!fmpz_mpoly_is_one(common, s->f->ctx) && !fmpz_mpoly_is_zero(common, s->f->ctx)) {
        divide(s, &r->rem, common);
        divide(s, &r->y, common);
        for (slong j = 0; j <= s->order; j++) divide(s, &r->comb[j], common);
    }
    fmpz_mpoly_clear(common, s->f->ctx);
}

/* Removes x^(k + delta) from rem by phi(x^k). */
static void reduce_by_phi(const search *s, row *r, slong k)
{
    const fmpz_mpoly_ctx_struct *ctx = s->f->ctx;
    fmpz_mpoly_t lead, top, common, power, image;
    fmpz_mpoly_init(lead, ctx), fmpz_mpoly_init(top, ctx), fmpz_mpoly_init(common, ctx);
    fmpz_mpoly_init(power, ctx), fmpz_mpoly_init(image, ctx);
    coefficient_of(s, top, &r->rem, k + s->delta);
    fmpz_mpoly_scalar_mul_si(lead, s->lead_v, k, ctx);
    fmpz_mpoly_add(lead, lead, s->lead_w, ctx);
    if (!fmpz_mpoly_gcd(common, top, lead, ctx)) fmpz_mpoly_one(common, ctx);
    fmpz_mpoly_divides(top, top, common, ctx);
    fmpz_mpoly_divides(lead, lead, common, ctx);
    row_scale(s, r, lead);
    fmpz_mpoly_gen(power, s->x, ctx);
    fmpz_mpoly_pow_ui(power, power, (ulong)k, ctx);
    phi(s, image, power);
    subtract(s, &r->rem, top, image);
    fmpz_mpoly_mul(power, power, top, ctx);
    fmpz_mpoly_add(&r->y, &r->y, power, ctx);
    fmpz_mpoly_clear(lead, ctx), fmpz_mpoly_clear(top, ctx), fmpz_mpoly_clear(common, ctx);
    fmpz_mpoly_clear(power, ctx), fmpz_mpoly_clear(image, ctx);
}

/* The greatest degree of rem below `below` that phi can remove; -1: none. */
static slong next_degree(const search *s, const row *r, slong below)
{
    fmpz_mpoly_t c;
    fmpz_mpoly_init(c, s->f->ctx);
    slong d = FLINT_MIN(degree_in(s, &r->rem), below - 1), least = FLINT_MAX(s->delta, 0);
    for (; d >= least; d--) {
        if (s->special >= 0 && d == s->special + s->delta) continue;
        coefficient_of(s, c, &r->rem, d);
        if (!fmpz_mpoly_is_zero(c, s->f->ctx)) break;
    }
    fmpz_mpoly_clear(c, s->f->ctx);
    return d >= least ? d : -1;
}

static tw_status row_reduce(const search *s, row *r)
{
    slong below = WORD_MAX;
    for (slong d; (d = next_degree(s, r, below)) >= 0; below = d) {
        if (!budget_ok(s->e)) return TW_ERROR;
        reduce_by_phi(s, r, d - s->delta);
    }
    row_make_primitive(s, r);
    return TW_OK;
}

/* Removes the pivots of the earlier rows. */
static tw_status row_eliminate(const search *s, row *r)
{
    const fmpz_mpoly_ctx_struct *ctx = s->f->ctx;
    fmpz_mpoly_t top, lead, common;
    fmpz_mpoly_init(top, ctx), fmpz_mpoly_init(lead, ctx), fmpz_mpoly_init(common, ctx);
    for (slong k = 0; k < s->count && budget_ok(s->e); k++) {
        const row *other = &s->rows[k];
        coefficient_of(s, top, &r->rem, other->pivot);
        if (fmpz_mpoly_is_zero(top, ctx)) continue;
        coefficient_of(s, lead, &other->rem, other->pivot);
        if (!fmpz_mpoly_gcd(common, top, lead, ctx)) fmpz_mpoly_one(common, ctx);
        fmpz_mpoly_divides(top, top, common, ctx);
        fmpz_mpoly_divides(lead, lead, common, ctx);
        row_scale(s, r, lead);
        subtract(s, &r->rem, top, &other->rem);
        subtract(s, &r->y, top, &other->y);
        for (slong j = 0; j <= s->order; j++) subtract(s, &r->comb[j], top, &other->comb[j]);
        row_make_primitive(s, r);
    }
    fmpz_mpoly_clear(top, ctx), fmpz_mpoly_clear(lead, ctx), fmpz_mpoly_clear(common, ctx);
    r->pivot = degree_in(s, &r->rem);
    return s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* Rows stay sorted by falling pivots, so that eliminating one never brings back another's. */
static void push_row(search *s, row r)
{
    s->rows = base_resize(s->rows, ((size_t)s->count + 1) * sizeof *s->rows);
    slong k = s->count++;
    for (; k > 0 && s->rows[k - 1].pivot < r.pivot; k--) s->rows[k] = s->rows[k - 1];
    s->rows[k] = r;
}

/* ---- setting up ---- */

/* N0: the bases with a positive integer power. */
static void polynomial_part(const hyper *h, fmpz_mpoly_t n0)
{
    enum { POWER_LIMIT = 64 };
    field *f = h->f;
    fmpz_mpoly_t t;
    fmpq_t power;
    fmpz_mpoly_init(t, f->ctx);
    fmpq_init(power);
    fmpz_mpoly_one(n0, f->ctx);
    for (slong k = 0; k < h->count; k++) {
        if (!field_is_rational(&h->factors[k].power, f, power) || !fmpz_is_one(fmpq_denref(power))) continue;
        if (fmpq_sgn(power) <= 0 || fmpz_cmp_si(fmpq_numref(power), POWER_LIMIT) > 0) continue;
        fmpz_mpoly_pow_fmpz(t, &h->factors[k].base, fmpq_numref(power), f->ctx);
        fmpz_mpoly_mul(n0, n0, t, f->ctx);
    }
    fmpz_mpoly_clear(t, f->ctx);
    fmpq_clear(power);
}

/* v and w = v' + u from G'/G = F'/F - N0'/N0 - r B'/B. */
static void set_operator(search *s, const element *slope)
{
    field *f = s->f;
    element g, t;
    element_init(f, &g), element_init(f, &t);
    fmpz_mpoly_q_set(&g, slope, f->ctx);
    for (int part = 0; part < 2; part++) {
        const fmpz_mpoly_struct *base = part == 0 ? s->n0 : s->b;
        fmpz_mpoly_derivative(fmpz_mpoly_q_numref(&t), base, s->x, f->ctx);
        fmpz_mpoly_set(fmpz_mpoly_q_denref(&t), base, f->ctx);
        fmpz_mpoly_q_canonicalise(&t, f->ctx);
        if (part == 1) fmpz_mpoly_q_mul_si(&t, &t, s->order, f->ctx);
        fmpz_mpoly_q_sub(&g, &g, &t, f->ctx);
    }
    fmpz_mpoly_set(s->v, fmpz_mpoly_q_denref(&g), f->ctx);
    fmpz_mpoly_derivative(s->w, s->v, s->x, f->ctx);
    fmpz_mpoly_add(s->w, s->w, fmpz_mpoly_q_numref(&g), f->ctx);
    element_clear(f, &g), element_clear(f, &t);
    slong dv = degree_in(s, s->v), dw = degree_in(s, s->w);
    s->delta = FLINT_MAX(dv - 1, dw);
    fmpz_mpoly_zero(s->lead_v, f->ctx);
    fmpz_mpoly_zero(s->lead_w, f->ctx);
    if (dv == s->delta + 1) coefficient_of(s, s->lead_v, s->v, dv);
    if (dw == s->delta && dw >= 0) coefficient_of(s, s->lead_w, s->w, dw);
}

/* k >= 0 with k*lead_v + lead_w = 0: nothing exponential is left at infinity there. */
static void find_special(search *s)
{
    const fmpz_mpoly_ctx_struct *ctx = s->f->ctx;
    s->special = -1;
    if (fmpz_mpoly_is_zero(s->lead_v, ctx)) return;
    fmpz_mpoly_t t;
    fmpz_t k;
    fmpz_mpoly_init(t, ctx);
    fmpz_init(k);
    fmpz_mpoly_neg(t, s->lead_w, ctx);
    if (fmpz_mpoly_divides(t, t, s->lead_v, ctx) && fmpz_mpoly_is_fmpz(t, ctx)) {
        fmpz_mpoly_get_fmpz(k, t, ctx);
        if (fmpz_sgn(k) >= 0 && fmpz_cmp_si(k, 1000) < 0) s->special = fmpz_get_si(k);
    }
    fmpz_mpoly_clear(t, ctx);
    fmpz_clear(k);
}

static tw_status push_special(search *s)
{
    if (s->special < 0) return TW_OK;
    row r;
    row_init(s, &r);
    fmpz_mpoly_gen(&r.y, s->x, s->f->ctx);
    fmpz_mpoly_pow_ui(&r.y, &r.y, (ulong)s->special, s->f->ctx);
    phi(s, &r.rem, &r.y);
    fmpz_mpoly_neg(&r.y, &r.y, s->f->ctx);
    tw_status status = row_reduce(s, &r);
    r.pivot = degree_in(s, &r.rem);
    if (status == TW_OK && r.pivot >= 0) push_row(s, r);
    else row_clear(s, &r);
    return status;
}

static void search_init(search *s, const hyper *h, const element *ratio, slong order)
{
    field *f = h->f;
    memset(s, 0, sizeof *s);
    s->e = f->e;
    s->f = f;
    s->x = h->variable;
    s->order = order;
    fmpz_mpoly_init(s->n0, f->ctx), fmpz_mpoly_init(s->a, f->ctx), fmpz_mpoly_init(s->b, f->ctx);
    fmpz_mpoly_init(s->v, f->ctx), fmpz_mpoly_init(s->w, f->ctx);
    fmpz_mpoly_init(s->lead_v, f->ctx), fmpz_mpoly_init(s->lead_w, f->ctx);
    fmpz_mpoly_set(s->a, fmpz_mpoly_q_numref(ratio), f->ctx);
    fmpz_mpoly_set(s->b, fmpz_mpoly_q_denref(ratio), f->ctx);
    polynomial_part(h, s->n0);
    element slope;
    element_init(f, &slope);
    hyper_log_derivative(h, &slope);
    set_operator(s, &slope);
    find_special(s);
    element_clear(f, &slope);
}

static void search_clear(search *s)
{
    const fmpz_mpoly_ctx_struct *ctx = s->f->ctx;
    for (slong k = 0; k < s->count; k++) row_clear(s, &s->rows[k]);
    free(s->rows);
    fmpz_mpoly_clear(s->n0, ctx), fmpz_mpoly_clear(s->a, ctx), fmpz_mpoly_clear(s->b, ctx);
    fmpz_mpoly_clear(s->v, ctx), fmpz_mpoly_clear(s->w, ctx);
    fmpz_mpoly_clear(s->lead_v, ctx), fmpz_mpoly_clear(s->lead_w, ctx);
}

/* ---- the result ---- */

/* out = the content of p as a polynomial in x. */
static void content_in_x(const field *f, slong x, fmpz_mpoly_t out, const fmpz_mpoly_t p)
{
    if (!fmpz_mpoly_content_vars(out, p, &x, 1, f->ctx)) fmpz_mpoly_one(out, f->ctx);
}

static void take_result(telescope *out, const search *s, const row *r, slong order)
{
    field *f = s->f;
    fmpz_mpoly_t common;
    fmpz_mpoly_init(common, f->ctx);
    out->order = order;
    out->c = base_alloc((size_t)(order + 1) * sizeof *out->c);
    for (slong j = 0; j <= order; j++) {
        fmpz_mpoly_init(&out->c[j], f->ctx);
        fmpz_mpoly_set(&out->c[j], &r->comb[j], f->ctx);
        if (!fmpz_mpoly_is_zero(&r->comb[j], f->ctx) && !fmpz_mpoly_gcd(common, common, &r->comb[j], f->ctx))
            fmpz_mpoly_one(common, f->ctx);
    }
    for (slong j = 0; j <= order; j++) divide(s, &out->c[j], common);
    element *g = &out->certificate;
    fmpz_mpoly_mul(fmpz_mpoly_q_numref(g), &r->y, s->v, f->ctx);
    fmpz_mpoly_pow_ui(fmpz_mpoly_q_denref(g), s->b, (ulong)s->order, f->ctx);
    fmpz_mpoly_mul(fmpz_mpoly_q_denref(g), fmpz_mpoly_q_denref(g), s->n0, f->ctx);
    fmpz_mpoly_mul(fmpz_mpoly_q_denref(g), fmpz_mpoly_q_denref(g), common, f->ctx);
    fmpz_mpoly_q_canonicalise(g, f->ctx);
    content_in_x(f, s->x, out->content, fmpz_mpoly_q_denref(g));
    fmpz_mpoly_clear(common, f->ctx);
}

/* N_j = N0 A^j B^(order-j) */
static void set_target(const search *s, row *r, slong j)
{
    const fmpz_mpoly_ctx_struct *ctx = s->f->ctx;
    fmpz_mpoly_t t;
    fmpz_mpoly_init(t, ctx);
    fmpz_mpoly_pow_ui(t, s->a, (ulong)j, ctx);
    fmpz_mpoly_mul(&r->rem, s->n0, t, ctx);
    fmpz_mpoly_pow_ui(t, s->b, (ulong)(s->order - j), ctx);
    fmpz_mpoly_mul(&r->rem, &r->rem, t, ctx);
    fmpz_mpoly_one(&r->comb[j], ctx);
    fmpz_mpoly_clear(t, ctx);
}

/* Looks for a dependence of order <= s->order. */
static tw_status search_run(search *s, telescope *out)
{
    if (push_special(s) != TW_OK) return TW_ERROR;
    for (slong j = 0; j <= s->order && out->order < 0; j++) {
        row r;
        row_init(s, &r);
        set_target(s, &r, j);
        tw_status status = row_reduce(s, &r);
        if (status == TW_OK) status = row_eliminate(s, &r);
        bool done = status == TW_OK && fmpz_mpoly_is_zero(&r.rem, s->f->ctx);
        if (done) take_result(out, s, &r, j);
        if (status == TW_OK && !done) push_row(s, r);
        else row_clear(s, &r);
        if (status != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

tw_status telescope_find(telescope *out, const hyper *h, const element *ratio, slong limit)
{
    tw_engine *e = h->f->e;
    search s;
    search_init(&s, h, ratio, 0);
    slong bound = FLINT_MAX(s.delta, 0) + (s.special >= 0);
    search_clear(&s);
    if (bound > limit)
        return engine_fail(e, ERROR_UNSUITABLE, "its recurrence may have the order %ld, which is beyond what is tried (%ld)",
                           (long)bound, (long)limit);
    for (slong order = bound; out->order < 0; order++) {
        search_init(&s, h, ratio, order);
        tw_status status = search_run(&s, out);
        search_clear(&s);
        if (status != TW_OK) return TW_ERROR;
        if (out->order < 0 && order > bound + 1) break;
    }
    if (out->order < 0) return engine_fail(e, ERROR_UNSUITABLE, "no recurrence of order <= %ld was found", (long)bound + 2);
    if (!telescope_holds(out, h, ratio))
        return engine_fail(e, ERROR_INTERNAL, "the certificate of a recurrence does not hold");
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- proof ---- */

bool telescope_holds(const telescope *t, const hyper *h, const element *ratio)
{
    field *f = t->f;
    element left, right, u;
    element_init(f, &left), element_init(f, &right), element_init(f, &u);
    for (slong j = t->order; j >= 0; j--) {
        fmpz_mpoly_q_mul(&left, &left, ratio, f->ctx);
        fmpz_mpoly_set(fmpz_mpoly_q_numref(&u), &t->c[j], f->ctx);
        fmpz_mpoly_one(fmpz_mpoly_q_denref(&u), f->ctx);
        fmpz_mpoly_q_add(&left, &left, &u, f->ctx);
    }
    hyper_log_derivative(h, &u);
    fmpz_mpoly_q_mul(&u, &u, &t->certificate, f->ctx);
    element_derivative(f, &right, &t->certificate, t->variable);
    fmpz_mpoly_q_add(&right, &right, &u, f->ctx);
    bool same = fmpz_mpoly_q_equal(&left, &right, f->ctx);
    element_clear(f, &left), element_clear(f, &right), element_clear(f, &u);
    return same;
}
