/* Sums of complex terms with their remainders. The one idea: each contribution of steepest descent carries its own bound along its
 * steepest curves (steep.c); the dominant ones are summed, and what the others weigh, bounded the same way with no term kept, is part
 * of the error. */
#include "engine/numeric/complex.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/quadrature_contour.h"
#include "engine/method/lanes.h"
#include "engine/numeric/problem.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/steep.h"
#include "engine/numeric/terms.h"

bool expansion_is_complex(const expansion *a)
{
    for (size_t k = 0; k < a->contribution_count; k++)
        if (a->contributions[k].steepest)
            return true;
    return false;
}

/* ---- terms ---- */

typedef struct complex_terms {
    slong count;
    term *order;
    acb_ptr value; /* prefactor included */
} complex_terms;

static void terms_free(complex_terms *t)
{
    free(t->order);
    if (t->value)
        _acb_vec_clear(t->value, t->count + 1);
    *t = (complex_terms){0};
}

static tw_status value_of(tw_engine *e, acb_t out, expr *f, const env *at, slong bits)
{
    expr *here = f ? put_values(e, f, at) : NULL;
    if (!here || ball_value(e, out, here, bits) != TW_OK)
        return TW_ERROR;
    return acb_is_finite(out) ? TW_OK : engine_fail(e, ERROR_VALUE, "a term has no finite value there");
}

/* Up to `most` terms of contribution k. */
static tw_status terms_of(tw_engine *e, complex_terms *out, expansion *a, size_t k, const env *at, slong most, slong bits)
{
    const contribution *c = a->contributions + k;
    acb_t front, x;
    *out = (complex_terms){0};
    if (expansion_order(e, a, k, most, &out->order, &out->count) != TW_OK)
        return TW_ERROR;
    acb_init(front);
    acb_init(x);
    out->value = _acb_vec_init(out->count + 1);
    acb_ptr lanes = _acb_vec_init((slong)c->lane_count + 1);
    tw_status status = value_of(e, front, c->prefactor, at, bits);
    for (size_t l = 0; l < c->lane_count && status == TW_OK; l++)
        status = value_of(e, lanes + l, c->lanes[l].constant, at, bits);
    for (slong n = 0; n < out->count && status == TW_OK && budget_ok(e); n++) {
        term t = out->order[n];
        const lane *l = c->lanes + t.lane;
        fmpq_t steps;
        fmpq_init(steps);
        fmpq_mul_si(steps, l->step, t.n);
        expr *exponent = expr_add(e, l->first_exponent, expr_fmpq(e, steps));
        fmpq_clear(steps);
        status = value_of(e, x, expr_pow(e, a->large, exponent), at, bits);
        acb_mul(out->value + n, front, x, bits);
        acb_mul(out->value + n, out->value + n, lanes + t.lane, bits);
        if (status == TW_OK)
            status = value_of(e, x, coefficient_expr(e, &l->c, t.n), at, bits);
        acb_mul(out->value + n, out->value + n, x, bits);
    }
    _acb_vec_clear(lanes, (slong)c->lane_count + 1);
    acb_clear(front);
    acb_clear(x);
    if (status == TW_OK && e->error.kind == ERROR_NONE)
        return TW_OK;
    terms_free(out);
    return TW_ERROR;
}

/* N of the term: its power is S^(-N/m). */
static bool index_of(tw_engine *e, slong *N, const contribution *c, expr *large, term t)
{
    const steepest *s = c->steepest;
    const lane *l = c->lanes + t.lane;
    fmpq_t numeral, scale, factor, steps;
    expr *rest;
    fmpq_init(numeral), fmpq_init(scale), fmpq_init(factor), fmpq_init(steps);
    factor_split(e, s->scale, large, numeral, scale, &rest);
    factor_split(e, s->factor, large, numeral, factor, &rest);
    fmpq_mul_si(steps, l->step, t.n);
    expr *exponent = expr_add(e, l->first_exponent, expr_fmpq(e, steps));
    bool fine = exponent && expr_is_number(exponent) && !fmpq_is_zero(scale);
    if (fine) {
        fmpq_sub(steps, factor, expr_number(exponent));
        fmpq_mul_si(steps, steps, s->m);
        fmpq_div(steps, steps, scale);
        fine = fmpz_is_one(fmpq_denref(steps)) && fmpz_fits_si(fmpq_numref(steps));
        if (fine)
            *N = fmpz_get_si(fmpq_numref(steps));
    }
    fmpq_clear(numeral), fmpq_clear(scale), fmpq_clear(factor), fmpq_clear(steps);
    return fine;
}

/* ---- errors ---- */

typedef struct piece_error {
    label label;
    acb_t error;
    char *reason; /* fresh */
} piece_error;

static double log2_size(const acb_t z)
{
    mag_t m;
    mag_init(m);
    acb_get_mag(m, z);
    double out = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
    mag_clear(m);
    return out;
}

/* Three times the largest of the next terms, as a disc. */
static void estimate(acb_t error, const complex_terms *t, slong kept)
{
    mag_t most, one;
    mag_init(most);
    mag_init(one);
    for (slong n = FLINT_MAX(FLINT_MIN(kept, t->count - 1), 0); n < t->count && n < kept + 3; n++) {
        acb_get_mag(one, t->value + n);
        mag_max(most, most, one);
    }
    mag_mul_ui(most, most, 3);
    acb_zero(error);
    acb_add_error_mag(error, most);
    mag_clear(most);
    mag_clear(one);
}

/* integral of the contribution - its first `kept` terms. */
static tw_status error_of(tw_engine *e, piece_error *out, expansion *a, size_t k, const env *at, const complex_terms *t, slong kept,
                          slong bits)
{
    const contribution *c = a->contributions + k;
    steep_bound b;
    slong first = 1;
    bool enough = kept < t->count || !c->terminates;
    out->label = LABEL_PROVED;
    acb_zero(out->error);
    if (c->terminates && kept >= t->count)
        return TW_OK; /* the lanes are all of it */
    if (kept > 0 && t->count > 0 && !index_of(e, &first, c, a->large, t->order[FLINT_MIN(kept, t->count) - 1]))
        enough = false;
    first = kept > 0 ? first + 1 : 1;
    steep_bound_init(&b);
    tw_status status = enough ? steep_bound_at(e, &b, c->steepest, first, at) : TW_OK;
    if (status == TW_OK && b.made) {
        acb_t front, sum;
        acb_init(front);
        acb_init(sum);
        expr *p0 = expr_neg(e, expr_mul(e, c->steepest->scale, c->steepest->height));
        status = value_of(e, front, expr_mul(e, c->steepest->factor, expr_call1(e, FUNCTION_EXP, p0)), at, bits + 256);
        for (slong n = 0; n < kept && n < t->count; n++)
            acb_add(sum, sum, t->value + n, bits + 256);
        acb_mul(b.kept, b.kept, front, bits + 256);
        acb_sub(b.kept, b.kept, sum, bits + 256); /* 0 as a ball, unless a group of terms is cut */
        acb_mul(out->error, b.error, front, bits);
        acb_add(out->error, out->error, b.kept, bits);
        acb_clear(front);
        acb_clear(sum);
    }
    if (status == TW_OK && (!b.made || !acb_is_finite(out->error))) {
        out->label = LABEL_ESTIMATED;
        out->reason = base_copy(b.reason ? b.reason : "the bound is not finite there");
        estimate(out->error, t, kept);
    }
    steep_bound_clear(&b);
    return status;
}

typedef struct point_sum {
    acb_t sum, error, last;
    label label;
    char *reason;
} point_sum;

static void point_sum_init(point_sum *p)
{
    acb_init(p->sum);
    acb_init(p->error);
    acb_init(p->last);
    p->label = LABEL_EXACT;
    p->reason = NULL;
}

static void point_sum_clear(point_sum *p)
{
    acb_clear(p->sum);
    acb_clear(p->error);
    acb_clear(p->last);
    free(p->reason);
}

/* The sum of the counted contributions with `terms` each, and what the integral differs from it. */
static tw_status sum_at(tw_engine *e, point_sum *out, expansion *a, const env *at, slong terms, bool all, slong bits, bool bounds)
{
    tw_status status = TW_OK;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++) {
        bool counts = contribution_counts(a, k, all);
        complex_terms t;
        piece_error one = {.label = LABEL_PROVED};
        slong kept = counts ? terms : 0;
        status = terms_of(e, &t, a, k, at, FLINT_MAX(terms, 1) + 3, bits + 256);
        if (status != TW_OK)
            break;
        for (slong n = 0; n < kept && n < t.count; n++)
            acb_add(out->sum, out->sum, t.value + n, bits + 256);
        if (counts && terms > 0 && terms <= t.count)
            acb_add(out->last, out->last, t.value + terms - 1, bits);
        if (bounds) {
            acb_init(one.error);
            bool whole = !counts && a->contributions[k].terminates; /* left out, and known exactly */
            if (a->contributions[k].on_stokes_line) {
                one.label = LABEL_ESTIMATED;
                one.reason = base_copy("a Stokes line: the path is there two different sums of steepest curves");
                estimate(one.error, &t, 0);
            } else if (whole) {
                for (slong n = 0; n < t.count; n++)
                    acb_add(one.error, one.error, t.value + n, bits + 256);
            } else {
                status = error_of(e, &one, a, k, at, &t, kept, bits);
            }
            acb_add(out->error, out->error, one.error, bits + 256);
            out->label = FLINT_MAX(out->label, one.label);
            if (one.reason && !out->reason)
                out->reason = one.reason;
            else
                free(one.reason);
            acb_clear(one.error);
        }
        terms_free(&t);
    }
    if (status == TW_OK && bounds && a->stokes_passed) {
        out->label = FLINT_MAX(out->label, LABEL_ESTIMATED);
        if (!out->reason)
            out->reason = base_copy("a Stokes line: the path is there two different sums of steepest curves");
    }
    return status;
}

/* ---- how many terms ---- */

/* The envelope's least: the greater of two neighbouring terms. */
static tw_status choose_terms(tw_engine *e, expansion *a, const env *at, slong most, slong *terms, slong *least)
{
    double low = HUGE_VAL, small = HUGE_VAL;
    if (expansion_extend(e, a, most + 3) != TW_OK)
        return TW_ERROR;
    double *size = base_alloc((size_t)(most + 4) * sizeof *size);
    for (slong n = 0; n < most + 3; n++)
        size[n] = -HUGE_VAL;
    slong known = 0;
    for (size_t k = 0; k < a->contribution_count; k++) {
        complex_terms t;
        if (!contribution_counts(a, k, false))
            continue;
        if (terms_of(e, &t, a, k, at, most + 3, 64) != TW_OK) {
            free(size);
            return TW_ERROR;
        }
        for (slong n = 0; n < t.count && n < most + 3; n++)
            size[n] = fmax(size[n], log2_size(t.value + n));
        known = FLINT_MAX(known, t.count);
        terms_free(&t);
    }
    *terms = FLINT_MIN(most, known);
    *least = -1;
    for (slong n = 0; n <= most && n < known; n++) {
        double here = fmax(size[n], n + 1 < known ? size[n + 1] : -HUGE_VAL);
        if (here < low) {
            low = here;
            *terms = n;
        }
        if (size[n] < small && n < most) {
            small = size[n];
            *least = n;
        }
    }
    free(size);
    return TW_OK;
}

/* ---- requests ---- */

/* A part that is 0 by the integral's own symmetry. */
static tw_status keep_symmetry(tw_engine *e, acb_t value, const expansion *a, const env *at)
{
    expr *here = put_values(e, a->integral, at);
    int symmetry = here ? contour_symmetry(e, here) : 0;
    if (symmetry == 1)
        arb_zero(acb_imagref(value));
    else if (symmetry == -1)
        arb_zero(acb_realref(value));
    return e->error.kind ? TW_ERROR : TW_OK;
}

static slong digits_in(const acb_t z)
{
    slong bits = acb_rel_accuracy_bits(z);
    return bits <= 1 ? 0 : (slong)floor((double)(bits - 1) * 0.30103);
}

tw_status evaluate_complex(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o)
{
    slong bits = FLINT_MAX(128, (slong)((double)o->digits * 3.33) + 96), most = o->terms >= 0 ? o->terms : a->terms_asked, terms, least;
    point_sum p;
    tw_status status = point_complete(e, a, at);
    if (status != TW_OK || choose_terms(e, a, at, most, &terms, &least) != TW_OK)
        return TW_ERROR;
    if (o->terms >= 0)
        terms = o->terms;
    point_sum_init(&p);
    status = sum_at(e, &p, a, at, terms, o->all_contributions, bits, true);
    if (status == TW_OK) {
        acb_add(out->value, p.sum, p.error, bits);
        out->label = p.label;
        out->terms = terms;
        out->least_term = least;
        out->terms_known = FLINT_MAX(most, a->terms_asked);
        if (p.reason)
            out->reason = base_copy(p.reason);
        status = keep_symmetry(e, out->value, a, at);
        if (status == TW_OK)
            status = conditions_at(e, &out->conditions, a, at);
        if (out->label <= LABEL_PROVED && !conditions_all_sure(&out->conditions))
            out->label = LABEL_CONDITIONAL;
        if (out->label == LABEL_EXACT && acb_rel_accuracy_bits(out->value) < bits / 2)
            out->label = LABEL_PROVED;
    }
    if (status == TW_OK && o->digits > 0 && digits_in(out->value) < o->digits)
        status = engine_fail(e, ERROR_PRECISION,
                             "%ld digits cannot be had from the expansion there: the best is %ld, with %ld terms; `evaluate INTEGRAL` "
                             "gives them by certified quadrature", (long)o->digits, (long)digits_in(out->value), (long)terms);
    point_sum_clear(&p);
    return status;
}

static tw_status judge_value(tw_engine *e, acb_t value, const comparison *c, expansion *a, const env *at)
{
    slong digits = 15;
    tw_status status;
    mag_t least;
    mag_init(least);
    arb_get_mag(least, c->rows[c->best].bound);
    double wanted = mag_is_zero(least) ? -HUGE_VAL : mag_log2(least);
    mag_clear(least);
    for (;;) {
        status = quadrature(e, value, a->integral, at, digits, true, NULL);
        if (status != TW_OK || digits >= 400)
            break;
        mag_t m;
        mag_init(m);
        mag_hypot(m, arb_radref(acb_realref(value)), arb_radref(acb_imagref(value)));
        double radius = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
        mag_clear(m);
        if (radius <= wanted - 3.4)
            break;
        digits = acb_contains_zero(value) ? 2 * digits : FLINT_MAX(digits + 5, digits + (slong)ceil((radius - wanted) * 0.302) + 2);
    }
    return status;
}

tw_status compare_complex(tw_engine *e, comparison *out, expansion *a, const env *at)
{
    slong most = a->terms_asked, terms, least;
    acb_t value;
    tw_status status = point_complete(e, a, at);
    if (status != TW_OK)
        return status;
    comparison_at(&out->at, at);
    if (choose_terms(e, a, at, most, &terms, &least) != TW_OK)
        return TW_ERROR;
    const slong first = comparison_rows(out, most, terms);
    acb_init(value);
    for (size_t r = 0; r < out->count && status == TW_OK; r++) {
        comparison_row *row = out->rows + r;
        point_sum p;
        mag_t m;
        point_sum_init(&p);
        mag_init(m);
        row->terms = first + (slong)r;
        status = sum_at(e, &p, a, at, row->terms, false, 192, true);
        acb_set(row->sum, p.sum);
        acb_set(row->term, p.last);
        acb_get_mag(m, p.error);
        arf_set_mag(arb_midref(row->bound), m);
        row->label = p.label;
        if (out->best < 0 || arb_lt(row->bound, out->rows[out->best].bound))
            out->best = (slong)r;
        mag_clear(m);
        point_sum_clear(&p);
    }
    if (status == TW_OK)
        status = judge_value(e, value, out, a, at);
    for (size_t r = 0; r < out->count && status == TW_OK; r++)
        comparison_judge(out->rows + r, value);
    acb_clear(value);
    return status;
}

/* ---- for all s ---- */

static expr *above(tw_engine *e, const arb_t x)
{
    arf_t up;
    fmpq_t q;
    fmpz_t n, ten;
    arb_t t;
    arf_init(up);
    fmpq_init(q);
    fmpz_init(n), fmpz_init(ten);
    arb_init(t);
    arb_get_ubound_arf(up, x, 40);
    slong digits = 4 - (arf_is_zero(up) ? 0 : (slong)floor((double)arf_abs_bound_lt_2exp_si(up) * 0.30103));
    fmpz_ui_pow_ui(ten, 10, (ulong)FLINT_ABS(digits));
    arb_set_arf(t, up);
    if (digits >= 0)
        arb_mul_fmpz(t, t, ten, 256);
    else
        arb_div_fmpz(t, t, ten, 256);
    arb_get_ubound_arf(up, t, 256);
    arf_get_fmpz(n, up, ARF_RND_CEIL);
    if (digits >= 0)
        fmpq_set_fmpz_frac(q, n, ten);
    else {
        fmpz_mul(n, n, ten);
        fmpq_set_fmpz(q, n);
    }
    expr *out = expr_fmpq(e, q);
    arf_clear(up);
    fmpq_clear(q);
    fmpz_clear(n), fmpz_clear(ten);
    arb_clear(t);
    return out;
}

/* Gamma(alpha) sum of running maxima times [Q(alpha, S0 t_j) - Q(alpha, S0 t_(j+1))] (remainders.md, 9.4). */
static void power_coefficient(arb_t out, const steep_bound *b, const arb_t S0)
{
    arb_t run, x, lo, hi;
    arb_init(run), arb_init(x), arb_init(lo), arb_init(hi);
    slong bits = 128;
    arb_zero(out);
    for (slong j = 0; j < b->count; j++) {
        arb_max(run, run, b->height + j, 64);
        arb_mul(x, S0, b->t + j, bits);
        arb_hypgeom_gamma_upper(lo, b->alpha, x, 0, bits + 256);
        arb_mul(x, S0, b->t + j + 1, bits);
        arb_hypgeom_gamma_upper(hi, b->alpha, x, 0, bits + 256);
        arb_sub(lo, lo, hi, bits + 256);
        arb_addmul(out, run, lo, bits);
    }
    arb_clear(run), arb_clear(x), arb_clear(lo), arb_clear(hi);
}

static tw_status bound_of(tw_engine *e, expr **sum, expansion *a, size_t k, const env *values, expr *s0, slong kept, bool *made,
                          char **reason)
{
    const contribution *c = a->contributions + k;
    const steepest *s = c->steepest;
    term *order = NULL;
    slong found = 0, first = 1;
    env at = {values->count, values->symbols, values->values};
    steep_bound b;
    arb_t S0, A, size;
    acb_t v;
    arb_init(S0), arb_init(A), arb_init(size);
    acb_init(v);
    steep_bound_init(&b);
    tw_status status = expansion_order(e, a, k, kept + 1, &order, &found);
    *made = false;
    bool cut = false;
    if (status == TW_OK && kept > 0 && found > 0) {
        slong next = -1;
        bool fine = index_of(e, &first, c, a->large, order[FLINT_MIN(kept, found) - 1]);
        if (fine && found > kept)
            cut = index_of(e, &next, c, a->large, order[kept]) && next == first;
        first = fine ? first + 1 : 0;
    }
    free(order);
    env with = {0, base_alloc((at.count + 1) * sizeof(expr *)), base_alloc((at.count + 1) * sizeof(expr *))};
    for (size_t j = 0; j < at.count; j++)
        if (at.symbols[j] != a->large) {
            with.symbols[with.count] = at.symbols[j];
            with.values[with.count++] = at.values[j];
        }
    env fixed = with;
    with.symbols[with.count] = a->large;
    with.values[with.count++] = s0;
    if (status == TW_OK && !cut)
        status = steep_bound_at(e, &b, s, first, &with);
    if (status == TW_OK && b.made)
        status = value_of(e, v, s->scale, &with, 256);
    arb_set(S0, acb_realref(v));
    if (status == TW_OK && b.made) {
        power_coefficient(A, &b, S0);
        fmpq_t numeral, power, scale;
        expr *rest, *front;
        fmpq_init(numeral), fmpq_init(power), fmpq_init(scale);
        factor_split(e, s->factor, a->large, numeral, power, &rest);
        rest = put_values(e, expr_mul(e, rest, expr_fmpq(e, numeral)), &fixed);
        status = rest && !expr_has(rest, a->large) ? value_of(e, v, rest, &fixed, 128) : TW_ERROR;
        if (status != TW_OK && !e->error.kind) {
            *reason = base_copy("the factor in front is no power of the large parameter");
            status = TW_OK;
        } else if (status == TW_OK) {
            acb_abs(size, v, 64);
            status = value_of(e, v, put_values(e, s->height, &fixed), &fixed, 128);
            arb_mul(A, A, size, 64);
            arb_mul(b.beyond, b.beyond, size, 64);
            expr *depth = above(e, acb_realref(v)); /* |exp(-S p0)| = exp(-S Re p0); Re p0 rounded down */
            arb_neg(acb_realref(v), acb_realref(v));
            depth = expr_neg(e, above(e, acb_realref(v)));
            expr *exact = s->height;
            if (expr_is_number(exact))
                depth = exact;
            front = expr_mul(e, expr_pow(e, a->large, expr_fmpq(e, power)), expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, s->scale, depth))));
            fmpq_set_si(numeral, -first, (ulong)s->m);
            /* exp(-(S - S0) T) <= (S0/S)^alpha where T >= alpha/S0: then one power says it all */
            arb_mul(size, S0, b.t + b.count, 64);
            bool together = arb_ge(size, b.alpha);
            if (together) {
                arb_pow(size, S0, b.alpha, 64);
                arb_addmul(A, size, b.beyond, 64);
            }
            expr *one = expr_mul(e, above(e, A), expr_pow(e, s->scale, expr_fmpq(e, numeral)));
            arb_neg(size, b.t + b.count);
            expr *end = expr_neg(e, above(e, size)), *fall = expr_sub(e, s->scale, expr_substitute(e, s->scale, a->large, s0));
            expr *two = expr_mul(e, above(e, b.beyond), expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, fall, end))));
            *sum = expr_add(e, *sum, expr_mul(e, front, together ? one : expr_add(e, one, two)));
            *made = *sum != NULL && arb_is_finite(A);
        }
        fmpq_clear(numeral), fmpq_clear(power), fmpq_clear(scale);
    }
    if (status == TW_OK && !*made && !*reason)
        *reason = base_copy(cut ? "the kept terms end inside a group of equal powers" : b.reason ? b.reason : "the bound is not finite");
    free(with.symbols);
    free(with.values);
    steep_bound_clear(&b);
    arb_clear(S0), arb_clear(A), arb_clear(size);
    acb_clear(v);
    return status;
}

tw_status remainder_complex(tw_engine *e, remainder_bound *out, expansion *a, const env *values, expr *s0)
{
    expr *sum = expr_int(e, 0);
    tw_status status = TW_OK;
    bool made = true;
    char *reason = NULL;
    if (out->terms < 0)
        out->terms = a->terms_asked;
    if (!s0)
        s0 = a->small ? expr_frac(e, 1, 10) : expr_int(e, 10);
    out->from = s0;
    if (expansion_extend(e, a, out->terms + 1) != TW_OK)
        return TW_ERROR;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK && made; k++) {
        bool counts = contribution_counts(a, k, false);
        const contribution *c = a->contributions + k;
        if (c->on_stokes_line || a->stokes_passed) {
            made = false;
            reason = base_copy("a Stokes line: the path is there two different sums of steepest curves");
        } else if (c->steepest->residue) {
            if (counts)
                continue;
            made = false;
            reason = base_copy("a pole's residue is left out as exponentially small");
        } else if (!(c->terminates && counts && contribution_count_terms(c) <= out->terms)) {
            status = bound_of(e, &sum, a, k, values, s0, counts ? out->terms : 0, &made, &reason);
        }
    }
    if (status != TW_OK) {
        free(reason);
        return status;
    }
    if (made) {
        out->label = conditions_all_sure(&out->conditions) ? LABEL_PROVED : LABEL_CONDITIONAL;
        out->bound = sum;
        out->source = base_copy("bounds along the steepest curves, on discs in which the exponent is proved univalent");
        return TW_OK;
    }
    out->label = LABEL_UNKNOWN;
    out->reason = reason ? reason : base_copy("no bound was found");
    return TW_OK;
}
