/* The way out of the working form: leading coefficients proved, constants proved nonzero, coefficients brought to
 * the form in which zero is zero, strands put in order; and the tries: when cancellation ate terms, or the field
 * was too narrow for the constants met, the computation is run again with more. */
#include "engine/exact/finish.h"

#include <stdlib.h>

#include "engine/exact/rational.h"
#include "engine/exact/values.h"

enum { FIRST_ROOM = 8, MOST_ROOM = 512, MOST_EXTRA = 256 };

/* ---- proving what is handed out ---- */

static tw_status constant_prove(work *w, piece *p)
{
    if (expr_is_one(p->constant))
        return TW_OK;
    answer zero = value_is_zero(w->e, p->constant);
    if (zero == ANSWER_YES) {
        tail_clear(&w->f, &p->c);
        tail_init(&p->c);
    }
    return zero == ANSWER_UNKNOWN
               ? engine_fail(w->e, ERROR_UNDECIDED, "whether a constant of the series is zero could not be decided")
               : TW_OK;
}

/* Pieces that share their powers and differ in constants only: their leading values must not cancel unseen
 * (log(6) - log(2) - log(3)). When they do, the constants go into the coefficients. */
static bool same_powers(const piece *a, const piece *b)
{
    slong steps;
    return a->sigma == b->sigma && a->log_power == b->log_power &&
           steps_between(&steps, a->lead, b->lead, lcm_of(a->den, b->den));
}

static tw_status leading_sum(work *w, const pieces *g, size_t k, expr **sum, size_t *members)
{
    *sum = expr_int(w->e, 0);
    *members = 0;
    for (size_t j = 0; j < g->count; j++) {
        if (!same_powers(g->at + k, g->at + j))
            continue;
        if (fmpq_cmp(g->at[j].lead, g->at[k].lead) < 0) { /* another one leads */
            *members = 0;
            return TW_OK;
        }
        if (fmpq_equal(g->at[j].lead, g->at[k].lead)) {
            *sum = expr_add(w->e, *sum, piece_leading(w, g->at + j));
            ++*members;
        }
    }
    return *sum == NULL ? TW_ERROR : TW_OK;
}

static tw_status merge_group(work *w, pieces *g, size_t k)
{
    pieces merged;
    piece like;
    pieces_init(&merged);
    merged.real = g->real;
    piece_init(w, &like);
    piece_set(w, &like, g->at + k);
    tw_status s = TW_OK;
    for (size_t j = 0; j < g->count && s == TW_OK; j++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + j);
        if (same_powers(&like, &p))
            s = piece_fold(w, &p, true);
        if (s == TW_OK)
            s = pieces_push(w, &merged, &p);
        else
            piece_clear(w, &p);
    }
    piece_clear(w, &like);
    if (s == TW_OK)
        pieces_swap(g, &merged);
    pieces_clear(w, &merged);
    return s;
}

static tw_status settle_groups(work *w, pieces *g)
{
    for (size_t k = 0; k < g->count; k++) {
        expr *sum;
        size_t members;
        if (leading_sum(w, g, k, &sum, &members) != TW_OK)
            return TW_ERROR;
        answer zero = members > 1 ? value_is_zero(w->e, sum) : ANSWER_NO;
        if (zero == ANSWER_UNKNOWN)
            return engine_fail(w->e, ERROR_UNDECIDED,
                               "whether the constants of the series' leading term cancel could not be decided");
        if (zero == ANSWER_YES) {
            if (merge_group(w, g, k) != TW_OK)
                return TW_ERROR;
            k = (size_t)-1;
        }
    }
    return TW_OK;
}

/* Drops what is exactly zero, proves each leading coefficient. */
static tw_status settle(work *w, pieces *g)
{
    pieces kept;
    pieces_init(&kept);
    kept.real = g->real;
    tw_status s = TW_OK;
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        s = constant_prove(w, &p);
        if (s == TW_OK && tail_length(&p.c) > 0)
            s = piece_prove_leading(w, &p);
        else if (s == TW_OK && p.c.known != TAIL_EXACT)
            w->thin = true, s = TW_ERROR;
        if (s == TW_OK)
            s = pieces_push(w, &kept, &p);
        else
            piece_clear(w, &p);
    }
    if (s == TW_OK)
        s = settle_groups(w, &kept);
    if (s == TW_OK)
        pieces_swap(g, &kept);
    pieces_clear(w, &kept);
    return s;
}

/* ---- strands ---- */

static int piece_order(const void *left, const void *right)
{
    const piece *a = left, *b = right;
    int order = expr_order(a->sigma, b->sigma);
    if (order == 0)
        order = fmpq_cmp(a->lead, b->lead);
    if (order == 0)
        order = b->log_power > a->log_power ? 1 : b->log_power < a->log_power ? -1 : 0;
    return order != 0 ? order : expr_order(a->constant, b->constant);
}

static domain_kind domain_join(domain_kind a, domain_kind b)
{
    if (a == b || b == DOMAIN_RATIONAL)
        return a;
    return a == DOMAIN_RATIONAL ? b : DOMAIN_MIXED;
}

/* Coefficient k as an expression that is 0 exactly when it is zero. */
static tw_status export_element(work *w, coefficients *c, const tail *t, slong k)
{
    if (k >= t->count || fmpz_mpoly_q_is_zero(t->m + k, w->f.ctx)) {
        c->x[k] = expr_int(w->e, 0);
        return TW_OK;
    }
    domain_kind d = field_domain(&w->f, t->m + k);
    answer zero = d == DOMAIN_RATIONAL || d == DOMAIN_FUNCTIONS ? ANSWER_NO : field_is_zero(&w->f, t->m + k);
    if (zero == ANSWER_UNKNOWN)
        return engine_fail(w->e, ERROR_UNDECIDED, "whether coefficient %ld of the series is zero could not be decided",
                           (long)k);
    c->domain = domain_join(c->domain, d);
    c->x[k] = zero == ANSWER_YES ? expr_int(w->e, 0) : field_to_expr(&w->f, t->m + k);
    return c->x[k] == NULL ? TW_ERROR : TW_OK;
}

static tw_status export_coefficients(work *w, coefficients *c, const tail *t, slong count)
{
    tw_status s = TW_OK;
    c->count = count;
    if (t->rational) {
        c->q = base_alloc((size_t)FLINT_MAX(count, 1) * sizeof *c->q);
        for (slong k = 0; k < count; k++)
            fmpq_init(c->q + k);
        rational_coefficients(c->q, t->q, count);
        return TW_OK;
    }
    c->x = base_alloc((size_t)FLINT_MAX(count, 1) * sizeof *c->x);
    for (slong k = 0; k < count; k++)
        c->x[k] = NULL;
    for (slong k = 0; k < count && s == TW_OK; k++)
        s = budget_ok(w->e) ? export_element(w, c, t, k) : TW_ERROR;
    return s;
}

static tw_status export_strand(work *w, strand *out, const piece *p, slong count)
{
    coefficients_init(&out->c);
    out->constant = expr_mul(w->e, p->constant, p->factor);
    out->exponent = piece_exponent(w, p);
    out->den = p->den;
    out->log_power = p->log_power;
    if (out->constant == NULL || out->exponent == NULL)
        return TW_ERROR;
    return export_coefficients(w, &out->c, &p->c, count);
}

static tw_status export_series(work *w, series *out, pieces *g, slong length)
{
    out->terminates = true;
    out->strands = base_alloc((g->count + 1) * sizeof *out->strands);
    out->count = 0;
    for (size_t k = 0; k < g->count; k++)
        out->terminates = out->terminates && g->at[k].c.known == TAIL_EXACT && tail_length(&g->at[k].c) <= length;
    if (g->count > 1)
        qsort(g->at, g->count, sizeof *g->at, piece_order);
    for (size_t k = 0; k < g->count; k++) {
        slong count = out->terminates ? tail_length(&g->at[k].c) : length;
        if (export_strand(w, out->strands + out->count++, g->at + k, count) != TW_OK)
            return TW_ERROR;
    }
    return TW_OK;
}

/* ---- the tries ---- */

/* How many coefficients are missing at most. */
static slong shortage(const pieces *g, slong length)
{
    slong missing = 0;
    for (size_t k = 0; k < g->count; k++)
        if (g->at[k].c.known < length)
            missing = FLINT_MAX(missing, length - g->at[k].c.known);
    return missing;
}

typedef struct attempt {
    slong terms, extra, room;
} attempt;

/* One run; *again when it has to be repeated with the changed attempt. */
static tw_status try_once(tw_engine *e, series *out, pieces_maker make, const void *host, expr *f, expr *x,
                          slong length, attempt *a, bool *again, expr ***conditions, size_t *condition_count)
{
    work w;
    pieces g;
    work_init(&w, e, x, a->terms + a->extra, a->room);
    work_blame(&w, f);
    pieces_init(&g);
    *again = false;
    tw_status s = make(&w, &g, host);
    if (s == TW_OK)
        s = settle(&w, &g);
    slong missing = s == TW_OK ? shortage(&g, length) : 0;
    if (s == TW_OK && missing == 0)
        s = export_series(&w, out, &g, length);
    if (s == TW_OK && missing > 0) {
        a->terms += missing;
        *again = true;
    } else if (s != TW_OK && e->error.kind == ERROR_NONE && w.f.full) {
        a->room *= 4;
        *again = true;
    } else if (s != TW_OK && e->error.kind == ERROR_NONE && w.thin) {
        a->extra = a->extra == 0 ? 8 : 2 * a->extra;
        *again = true;
    }
    if (s == TW_OK && !*again && conditions != NULL) {
        *conditions = w.conditions;
        *condition_count = w.condition_count;
        w.conditions = NULL;
    }
    pieces_clear(&w, &g);
    work_clear(&w);
    return s;
}

tw_status series_by_tries(tw_engine *e, series *out, pieces_maker make, const void *host, expr *f, expr *x,
                          slong length, expr ***conditions, size_t *condition_count)
{
    attempt a = {FLINT_MAX(length, 1), 0, FIRST_ROOM};
    slong most = 20 * FLINT_MAX(length, 1) + 1000;
    bool again = true;
    tw_status s = TW_OK;
    if (conditions != NULL) {
        *conditions = NULL;
        *condition_count = 0;
    }
    while (again) {
        series made;
        series_init(&made);
        s = try_once(e, &made, make, host, f, x, length, &a, &again, conditions, condition_count);
        if (s == TW_OK && !again) {
            series_clear(out);
            *out = made;
            return TW_OK;
        }
        series_clear(&made);
        if (!again)
            break;
        if (!budget_ok(e))
            return TW_ERROR;
        if (a.room > MOST_ROOM)
            return engine_fail(e, ERROR_UNSUITABLE, "the series holds more than %d different constants and parameters",
                               (int)MOST_ROOM);
        if (a.extra > MOST_EXTRA || a.terms > most)
            return engine_fail(
                e, ERROR_UNDECIDED,
                "a part of the series at %s = 0 vanishes in all of its first %ld terms, and whether it is "
                "zero could not be decided",
                x->is.name, (long)(a.terms + a.extra / 2));
    }
    return s == TW_OK ? engine_fail(e, ERROR_INTERNAL, "a series came to no end") : s;
}
