/* D-finite closure under sums (Stanley 1980; the operators form a Euclidean domain, Ore 1933). The one idea: modulo an
 * operator P of order r every power of the shift is a vector of r rational functions; the first linear dependence of the
 * vectors that belong to all the P together is their least common left multiple L, and L = Q P gives the certificate of L
 * for each term: sum_i Q_i(n) R(n + i) T^i. */
#include "engine/exact/closure.h"

#include <stdlib.h>
#include <string.h>

/* out = a with n + d for n. */
static void moved(field *f, element *out, const element *a, slong index, slong d)
{
    fmpz_mpoly_struct *images = base_alloc((size_t)f->room * sizeof *images);
    fmpz_mpoly_struct **list = base_alloc((size_t)f->room * sizeof *list);
    for (slong k = 0; k < f->room; k++) {
        fmpz_mpoly_init(&images[k], f->ctx);
        fmpz_mpoly_gen(&images[k], k, f->ctx);
        if (k == index) fmpz_mpoly_add_si(&images[k], &images[k], d, f->ctx);
        list[k] = &images[k];
    }
    element t;
    element_init(f, &t);
    (void)fmpz_mpoly_compose_fmpz_mpoly(fmpz_mpoly_q_numref(&t), fmpz_mpoly_q_numref(a), list, f->ctx, f->ctx);
    (void)fmpz_mpoly_compose_fmpz_mpoly(fmpz_mpoly_q_denref(&t), fmpz_mpoly_q_denref(a), list, f->ctx, f->ctx);
    fmpz_mpoly_q_canonicalise(&t, f->ctx);
    fmpz_mpoly_q_swap(out, &t, f->ctx);
    element_clear(f, &t);
    for (slong k = 0; k < f->room; k++) fmpz_mpoly_clear(&images[k], f->ctx);
    free(images);
    free(list);
}

static void set_polynomial(field *f, element *out, const fmpz_mpoly_t p)
{
    fmpz_mpoly_set(fmpz_mpoly_q_numref(out), p, f->ctx);
    fmpz_mpoly_one(fmpz_mpoly_q_denref(out), f->ctx);
}

/* v, the remainder of S^i modulo P, becomes that of S^(i+1). */
static void remainder_step(field *f, element *v, const telescope *p, slong index)
{
    slong r = p->order;
    element lead, top, t;
    if (r == 0) return;
    element_init(f, &lead), element_init(f, &top), element_init(f, &t);
    for (slong j = 0; j < r; j++) moved(f, &v[j], &v[j], index, 1);
    set_polynomial(f, &lead, &p->c[r]);
    fmpz_mpoly_q_div(&top, &v[r - 1], &lead, f->ctx);
    for (slong j = r - 1; j >= 0; j--) {
        if (j > 0) fmpz_mpoly_q_set(&v[j], &v[j - 1], f->ctx);
        else fmpz_mpoly_q_zero(&v[0], f->ctx);
        set_polynomial(f, &t, &p->c[j]);
        fmpz_mpoly_q_mul(&t, &t, &top, f->ctx);
        fmpz_mpoly_q_sub(&v[j], &v[j], &t, f->ctx);
    }
    element_clear(f, &lead), element_clear(f, &top), element_clear(f, &t);
}

/* ---- the first dependence ---- */

/* A row: the vector, and which combination of powers of S it is. */
typedef struct dependence {
    field *f;
    slong width, length; /* entries of the vector; room for combinations */
    slong count;
    element **rows; /* width + length entries each, the pivot scaled to 1 */
    slong *pivots;
} dependence;

/* Reduces the row by the earlier ones; the pivot, or -1 when the vector has become zero. */
static slong row_reduce(const dependence *d, element *row)
{
    field *f = d->f;
    element t, factor;
    element_init(f, &t), element_init(f, &factor);
    for (slong k = 0; k < d->count; k++) {
        slong pivot = d->pivots[k];
        if (fmpz_mpoly_q_is_zero(&row[pivot], f->ctx)) continue;
        fmpz_mpoly_q_set(&factor, &row[pivot], f->ctx);
        for (slong j = 0; j < d->width + d->length; j++) {
            if (fmpz_mpoly_q_is_zero(&d->rows[k][j], f->ctx)) continue;
            fmpz_mpoly_q_mul(&t, &factor, &d->rows[k][j], f->ctx);
            fmpz_mpoly_q_sub(&row[j], &row[j], &t, f->ctx);
        }
    }
    element_clear(f, &t), element_clear(f, &factor);
    for (slong j = 0; j < d->width; j++)
        if (!fmpz_mpoly_q_is_zero(&row[j], f->ctx)) return j;
    return -1;
}

static void keep_row(dependence *d, element *row, slong pivot)
{
    field *f = d->f;
    element lead;
    element_init(f, &lead);
    fmpz_mpoly_q_set(&lead, &row[pivot], f->ctx);
    for (slong j = 0; j < d->width + d->length; j++)
        if (!fmpz_mpoly_q_is_zero(&row[j], f->ctx)) fmpz_mpoly_q_div(&row[j], &row[j], &lead, f->ctx);
    element_clear(f, &lead);
    d->rows[d->count] = row;
    d->pivots[d->count++] = pivot;
}

/* c_j into polynomials without a common factor. */
static void take_multiple(field *f, fmpz_mpoly_struct *c, const element *row, slong order)
{
    fmpz_mpoly_t common, g;
    fmpz_mpoly_init(common, f->ctx), fmpz_mpoly_init(g, f->ctx);
    fmpz_mpoly_one(common, f->ctx);
    for (slong j = 0; j <= order; j++) {
        if (!fmpz_mpoly_gcd(g, common, fmpz_mpoly_q_denref(&row[j]), f->ctx)) fmpz_mpoly_one(g, f->ctx);
        fmpz_mpoly_divides(g, fmpz_mpoly_q_denref(&row[j]), g, f->ctx);
        fmpz_mpoly_mul(common, common, g, f->ctx);
    }
    for (slong j = 0; j <= order; j++) {
        fmpz_mpoly_divides(&c[j], common, fmpz_mpoly_q_denref(&row[j]), f->ctx);
        fmpz_mpoly_mul(&c[j], &c[j], fmpz_mpoly_q_numref(&row[j]), f->ctx);
    }
    fmpz_mpoly_zero(g, f->ctx);
    for (slong j = 0; j <= order; j++)
        if (!fmpz_mpoly_gcd(g, g, &c[j], f->ctx)) fmpz_mpoly_one(g, f->ctx);
    for (slong j = 0; j <= order; j++) fmpz_mpoly_divides(&c[j], &c[j], g, f->ctx);
    fmpz_mpoly_clear(common, f->ctx), fmpz_mpoly_clear(g, f->ctx);
}

/* The least common left multiple into fresh polynomials; its order, or -1 with the error set. */
static slong find_multiple(const telescope *list, size_t count, slong index, slong limit, fmpz_mpoly_struct **out)
{
    field *f = list[0].f;
    dependence d = {.f = f, .length = 1};
    for (size_t k = 0; k < count; k++) d.width += list[k].order;
    d.length = d.width + 1;
    d.rows = base_alloc((size_t)d.length * sizeof *d.rows);
    d.pivots = base_alloc((size_t)d.length * sizeof *d.pivots);
    element *power = elements_new(f, d.width);
    for (slong at = 0, k = 0; k < (slong)count; at += list[k].order, k++)
        if (list[k].order > 0) fmpz_mpoly_q_one(&power[at], f->ctx);
    slong found = -1;
    for (slong i = 0; i <= d.width && found < 0 && budget_ok(f->e); i++) {
        if (i > limit) {
            engine_fail(f->e, ERROR_UNSUITABLE, "the recurrence of the sum has an order above %ld", (long)limit);
            break;
        }
        element *row = elements_new(f, d.width + d.length);
        for (slong j = 0; j < d.width; j++) fmpz_mpoly_q_set(&row[j], &power[j], f->ctx);
        fmpz_mpoly_q_one(&row[d.width + i], f->ctx);
        slong pivot = row_reduce(&d, row);
        if (pivot >= 0) {
            keep_row(&d, row, pivot);
            for (slong at = 0, k = 0; k < (slong)count; at += list[k].order, k++) remainder_step(f, power + at, &list[k], index);
            continue;
        }
        found = i;
        *out = base_alloc((size_t)(i + 1) * sizeof **out);
        for (slong j = 0; j <= i; j++) fmpz_mpoly_init(&(*out)[j], f->ctx);
        take_multiple(f, *out, row + d.width, i);
        elements_free(f, row, d.width + d.length);
    }
    for (slong k = 0; k < d.count; k++) elements_free(f, d.rows[k], d.width + d.length);
    free(d.rows);
    free(d.pivots);
    elements_free(f, power, d.width);
    return found;
}

/* ---- certificates ---- */

/* The quotient Q of L = Q P into `order - P's order + 1` elements. */
static void divide(field *f, element *q, const fmpz_mpoly_struct *l, slong order, const telescope *p, slong index)
{
    element *rest = elements_new(f, order + 1);
    element t, c;
    element_init(f, &t), element_init(f, &c);
    for (slong j = 0; j <= order; j++) set_polynomial(f, &rest[j], &l[j]);
    for (slong i = order - p->order; i >= 0; i--) {
        set_polynomial(f, &c, &p->c[p->order]);
        moved(f, &c, &c, index, i);
        fmpz_mpoly_q_div(&q[i], &rest[i + p->order], &c, f->ctx);
        for (slong j = 0; j <= p->order; j++) {
            set_polynomial(f, &c, &p->c[j]);
            moved(f, &c, &c, index, i);
            fmpz_mpoly_q_mul(&t, &q[i], &c, f->ctx);
            fmpz_mpoly_q_sub(&rest[i + j], &rest[i + j], &t, f->ctx);
        }
    }
    element_clear(f, &t), element_clear(f, &c);
    elements_free(f, rest, order + 1);
}

/* R becomes sum_i q_i(n) R(n + i) T^i. */
static void move_certificate(field *f, element *certificate, const element *q, slong count, const element *ratio,
                             slong index)
{
    element sum, t, power;
    element_init(f, &sum), element_init(f, &t), element_init(f, &power);
    fmpz_mpoly_q_one(&power, f->ctx);
    for (slong i = 0; i < count; i++) {
        moved(f, &t, certificate, index, i);
        fmpz_mpoly_q_mul(&t, &t, &q[i], f->ctx);
        fmpz_mpoly_q_mul(&t, &t, &power, f->ctx);
        fmpz_mpoly_q_add(&sum, &sum, &t, f->ctx);
        fmpz_mpoly_q_mul(&power, &power, ratio, f->ctx);
    }
    fmpz_mpoly_q_swap(certificate, &sum, f->ctx);
    element_clear(f, &sum), element_clear(f, &t), element_clear(f, &power);
}

static void set_multiple(telescope *t, const fmpz_mpoly_struct *l, slong order, const element *ratio, slong index)
{
    field *f = t->f;
    slong variable = t->variable;
    element *q = elements_new(f, order - t->order + 1);
    divide(f, q, l, order, t, index);
    move_certificate(f, &t->certificate, q, order - t->order + 1, ratio, index);
    elements_free(f, q, order - t->order + 1);
    for (slong j = 0; j <= t->order; j++) fmpz_mpoly_clear(&t->c[j], f->ctx);
    t->c = base_resize(t->c, (size_t)(order + 1) * sizeof *t->c);
    for (slong j = 0; j <= order; j++) {
        fmpz_mpoly_init(&t->c[j], f->ctx);
        fmpz_mpoly_set(&t->c[j], &l[j], f->ctx);
    }
    t->order = order;
    if (!fmpz_mpoly_content_vars(t->content, fmpz_mpoly_q_denref(&t->certificate), &variable, 1, f->ctx))
        fmpz_mpoly_one(t->content, f->ctx);
}

tw_status telescopes_unite(telescope *list, const element *ratios, size_t count, slong index, slong limit)
{
    fmpz_mpoly_struct *l = NULL;
    field *f = list[0].f;
    slong order = find_multiple(list, count, index, limit, &l);
    if (order < 0) return f->e->error.kind == ERROR_NONE ? engine_fail(f->e, ERROR_UNSUITABLE, "the sum's recurrence was not found") : TW_ERROR;
    for (size_t k = 0; k < count; k++) set_multiple(&list[k], l, order, &ratios[k], index);
    for (slong j = 0; j <= order; j++) fmpz_mpoly_clear(&l[j], f->ctx);
    free(l);
    return f->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
