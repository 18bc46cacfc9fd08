/* Partial sums against certified quadrature. One idea: the judge must see better than the bound: its digits are raised until its
 * radius is below a tenth of the smallest bound in the table, or as far as it can. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/numeric/evaluate.h"
#include "engine/numeric/complex.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/terms.h"

enum { ROWS_MOST = 40, COMPARE_BITS = 192, ERROR_BITS = 2000, DIGITS_MOST = 400 };

void comparison_init(comparison *c)
{
    memset(c, 0, sizeof *c);
    c->best = -1;
}

void comparison_clear(comparison *c)
{
    for (size_t k = 0; k < c->count; k++) {
        acb_clear(c->rows[k].term);
        acb_clear(c->rows[k].sum);
        acb_clear(c->rows[k].value);
        acb_clear(c->rows[k].error);
        arb_clear(c->rows[k].bound);
    }
    free(c->rows);
    free(c->at.symbols);
    free(c->at.values);
    comparison_init(c);
}

void comparison_at(env *to, const env *from)
{
    to->count = from->count;
    to->symbols = base_alloc((from->count + 1) * sizeof *to->symbols);
    to->values = base_alloc((from->count + 1) * sizeof *to->values);
    for (size_t k = 0; k < from->count; k++) {
        to->symbols[k] = from->symbols[k];
        to->values[k] = from->values[k];
    }
}

static tw_status row_bound(tw_engine *e, comparison_row *row, expansion *a, const env *at)
{
    point_bound b;
    mag_t m;
    tw_status status;
    point_bound_init(&b);
    mag_init(m);
    status = remainder_at_as(e, &b, a, at, row->terms, COMPARE_BITS, true);
    arb_get_mag(m, b.error);
    arf_set_mag(arb_midref(row->bound), m);
    row->label = b.label;
    mag_clear(m);
    point_bound_clear(&b);
    return status;
}

/* Sums and last terms of the rows. */
static tw_status fill_rows(tw_engine *e, comparison *c, expansion *a, const env *at, slong first)
{
    term_table t;
    tw_status status = terms_at(e, &t, a, at, first + (slong)c->count, false, COMPARE_BITS);
    if (status != TW_OK)
        return status;
    for (size_t r = 0; r < c->count && status == TW_OK; r++) {
        comparison_row *row = c->rows + r;
        row->terms = first + (slong)r;
        for (size_t b = 0; b < t.count; b++)
            for (slong k = 0; k < row->terms && k < t.list[b].count; k++) {
                acb_add_arb(row->sum, row->sum, t.list[b].value + k, COMPARE_BITS);
                if (k == row->terms - 1)
                    acb_add_arb(row->term, row->term, t.list[b].value + k, COMPARE_BITS);
            }
        status = row_bound(e, row, a, at);
        if (c->best < 0 || arb_lt(row->bound, c->rows[c->best].bound))
            c->best = (slong)r;
    }
    terms_clear(&t);
    return status;
}

static double log2_mag(const mag_t m)
{
    return mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
}

/* The integral, with a radius below a tenth of the least bound where that can be had. */
static tw_status judge(tw_engine *e, acb_t value, const comparison *c, expansion *a, const env *at)
{
    slong digits = 15;
    double wanted;
    mag_t m;
    tw_status status;
    mag_init(m);
    arb_get_mag(m, c->rows[c->best].bound);
    wanted = log2_mag(m) - 3.4;
    for (;;) {
        double radius;
        status = quadrature(e, value, a->typed ? a->typed : a->integral, at, digits, true, NULL);
        if (status != TW_OK)
            break;
        mag_set(m, arb_radref(acb_realref(value)));
        radius = log2_mag(m);
        if (radius <= wanted || digits >= DIGITS_MOST || wanted == -HUGE_VAL)
            break;
        if (acb_contains_zero(value))
            digits = 2 * digits;
        else
            digits = FLINT_MAX(digits + 5, digits + (slong)ceil((radius - wanted) * 0.302) + 1);
    }
    mag_clear(m);
    return status;
}

void comparison_judge(comparison_row *row, const acb_t value)
{
    mag_t least;
    arf_t low;
    mag_init(least);
    arf_init(low);
    acb_set(row->value, value);
    acb_sub(row->error, value, row->sum, ERROR_BITS);
    acb_get_mag_lower(least, row->error);
    arf_set_mag(low, least);
    row->violated = row->label <= LABEL_PROVED && arf_cmp(low, arb_midref(row->bound)) > 0;
    arf_clear(low);
    mag_clear(least);
}

slong comparison_rows(comparison *out, slong most, slong terms)
{
    const slong first = most > ROWS_MOST ? FLINT_MAX(1, FLINT_MIN(terms - ROWS_MOST / 2, most - ROWS_MOST + 1)) : 1;
    out->count = (size_t)FLINT_MIN(most - first + 1, ROWS_MOST);
    out->rows = base_alloc(out->count * sizeof *out->rows);
    for (size_t r = 0; r < out->count; r++) {
        comparison_row *row = out->rows + r;
        memset(row, 0, sizeof *row);
        acb_init(row->term);
        acb_init(row->sum);
        acb_init(row->value);
        acb_init(row->error);
        arb_init(row->bound);
    }
    return first;
}

tw_status compare_expansion(tw_engine *e, comparison *out, expansion *a, const env *at)
{
    slong most, terms, least;
    acb_t value;
    tw_status status = point_complete(e, a, at);
    if (status != TW_OK)
        return status;
    if (expansion_is_complex(a))
        return compare_complex(e, out, a, at);
    comparison_at(&out->at, at);
    most = a->terms_asked;
    if (best_terms(e, a, at, most, &terms, &least) != TW_OK)
        return TW_ERROR;
    for (size_t k = 0; k < a->contribution_count; k++) /* fewer when everything terminates */
        if (a->contributions[k].dominant && a->contributions[k].terminates && a->contribution_count == 1) {
            term *order = NULL;
            slong found = 0;
            if (expansion_order(e, a, k, most, &order, &found) != TW_OK)
                return TW_ERROR;
            free(order);
            most = FLINT_MAX(1, FLINT_MIN(most, found));
        }
    const slong first = comparison_rows(out, most, terms);
    acb_init(value);
    status = fill_rows(e, out, a, at, first);
    if (status == TW_OK)
        status = judge(e, value, out, a, at);
    for (size_t r = 0; r < out->count && status == TW_OK; r++)
        comparison_judge(out->rows + r, value);
    acb_clear(value);
    return status;
}
