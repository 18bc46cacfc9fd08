/* Filling a contribution from its local form: series of the amplitude, branch by branch, then lanes, cut where the
 * terms asked for end. The one idea: everything is made anew from the local form with a greater length when more is
 * wanted (lengths grow by half at least, so the work in all is a small multiple of the last). */
#include <stdlib.h>
#include <string.h>

#include "engine/method/attach.h"
#include "engine/method/lanes.h"

bool is_pure_power(tw_engine *e, expr *p, expr *x, fmpq_t mu)
{
    expr *base, *exponent;
    expr_as_power(e, p, &base, &exponent);
    if (base != x || !expr_is_number(exponent) || fmpq_sgn(expr_number(exponent)) <= 0) return false;
    fmpq_set(mu, expr_number(exponent));
    return true;
}

void factor_split(tw_engine *e, expr *factor, expr *large, fmpq_t number, fmpq_t power, expr **rest)
{
    expr *left;
    fmpq_zero(power);
    expr_as_coefficient(e, factor, number, &left);
    expr *const *parts;
    size_t count = expr_factors(&left, &parts);
    *rest = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        expr *base, *exponent;
        expr_as_power(e, parts[k], &base, &exponent);
        if (base == large && expr_is_number(exponent)) fmpq_add(power, power, expr_number(exponent));
        else *rest = expr_mul(e, *rest, parts[k]);
    }
}

/* ---- the kernel of a local form ---- */

tw_status kernel_read(tw_engine *e, kernel *k, const contribution *c, expr *large)
{
    const local_form *l = c->local.count > 0 ? &c->local : &c->formal;
    fmpq_t number;
    fmpq_init(number);
    expr *rest;
    factor_split(e, l->scale, large, number, k->power, &rest);
    k->constant = expr_mul(e, expr_fmpq(e, number), rest);
    fmpq_clear(number);
    factor_split(e, l->factor, large, k->factor_number, k->factor_power, &rest);
    k->far_end = c->local.count == 0;
    fmpq_one(k->mu);
    k->pure = !k->far_end;
    for (size_t n = 0; n < l->count && k->pure; n++)
        k->pure = is_pure_power(e, l->branches[n].p, l->branches[n].x, k->mu);
    if (!k->pure) fmpq_one(k->mu);
    if (!k->constant || !rest) return TW_ERROR;
    if (expr_has(k->constant, large))
        return engine_fail(e, ERROR_INTERNAL, "the scale is no power of the large parameter");
    return TW_OK;
}

/* ---- series of all branches ---- */

static void take_conditions(tw_engine *e, condition_list *to, expr **conditions, size_t count)
{
    for (size_t k = 0; to && k < count && e->error.kind == ERROR_NONE; k++) conditions_require(e, to, conditions[k]);
    free(conditions);
}

/* Pure powers on both sides: one amplitude, the sum of both, so that what cancels does so in the coefficients' own
 * domain. */
static branch branches_joined(tw_engine *e, const local_form *l)
{
    branch b = l->branches[0];
    for (size_t k = 1; k < l->count; k++)
        b.q = expr_add(e, b.q, expr_substitute(e, l->branches[k].q, l->branches[k].x, b.x));
    return b;
}

static tw_status branch_series(tw_engine *e, series *out, const branch *b, bool far_end, slong length,
                               condition_list *to)
{
    if (!b->q) return TW_ERROR;
    fmpq_t mu;
    fmpq_init(mu);
    bool pure = far_end ? b->p == b->x : is_pure_power(e, b->p, b->x, mu);
    fmpq_clear(mu);
    expr **conditions = NULL;
    size_t count = 0;
    tw_status status = pure ? series_at_zero(e, out, b->q, b->x, length, &conditions, &count)
                            : series_branch(e, out, b->p, b->q, b->x, length, &conditions, &count);
    if (status != TW_OK) count = 0;
    take_conditions(e, to, conditions, count);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* The series in t = p(x) ends: D^n q = 0 for a small n, D f = (f/p')' (parts.c). */
static bool branch_ends(tw_engine *e, const branch *b)
{
    enum { POWERS = 4, SIZE_LIMIT = 200 };
    expr *slope = expr_derivative(e, b->p, b->x), *f = b->q;
    for (int n = 0; n < POWERS && f && expr_size(f) < SIZE_LIMIT; n++) {
        f = expr_derivative(e, expr_div(e, f, slope), b->x);
        if (f && expr_is_zero(f)) return true;
    }
    return false;
}

/* The strands of one branch (or of both joined) into the drafts; *ends is cleared when they do not end. */
static tw_status draft_branch(tw_engine *e, drafts *d, const branch *b, const kernel *k, slong length,
                              condition_list *to, bool *ends)
{
    series q;
    series_init(&q);
    tw_status status = branch_series(e, &q, b, k->far_end, length, to);
    if (status == TW_OK) *ends = *ends && (q.terminates || (!k->pure && branch_ends(e, b)));
    if (status == TW_OK) status = drafts_add(e, d, &q, k);
    series_clear(&q);
    return status;
}

/* Both sides of a critical point as one amplitude. False, without an error, where its series cannot be had (a part that
 * cancels identically may be beyond the field): the sides are then drafted one by one, and cancel as far as their
 * coefficients do. */
static bool draft_joined(tw_engine *e, drafts *d, const local_form *l, const kernel *k, slong length,
                         condition_list *to, bool *ends)
{
    if (l->count < 2 || !k->pure) return false;
    branch b = branches_joined(e, l);
    if (draft_branch(e, d, &b, k, length, to, ends) == TW_OK) return true;
    if (e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_UNSUITABLE) engine_forgive(e);
    return false;
}

/* The stride that all drafted branches have, 1 when they differ. */
static slong common_stride(tw_engine *e, const local_form *l, const kernel *k, bool joined)
{
    branch both = joined ? branches_joined(e, l) : l->branches[0];
    slong stride = local_stride(e, &both, k->pure, k->mu);
    for (size_t n = 1; n < l->count && !joined; n++)
        if (local_stride(e, &l->branches[n], k->pure, k->mu) != stride) return 1;
    return stride;
}

/* Lanes from the first `length` coefficients of every strand. */
static tw_status fill_to_length(tw_engine *e, contribution *c, const kernel *k, slong length, condition_list *to)
{
    const local_form *l = c->local.count > 0 ? &c->local : &c->formal;
    drafts d;
    drafts_init(&d);
    c->terminates = true;
    bool joined = draft_joined(e, &d, l, k, length, to, &c->terminates);
    tw_status status = e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    if (!joined) c->terminates = true;
    for (size_t n = 0; n < l->count && !joined && status == TW_OK; n++)
        status = draft_branch(e, &d, &l->branches[n], k, length, to, &c->terminates);
    if (status == TW_OK) status = drafts_finish(e, &d, c, k);
    slong stride = status == TW_OK ? common_stride(e, l, k, joined) : 1;
    for (size_t n = 0; n < c->lane_count && status == TW_OK; n++) lane_thin(e, &c->lanes[n], stride);
    drafts_clear(&d);
    return status;
}

/* ---- cutting ---- */

static void lane_cut(lane *l, slong count)
{
    coefficients *c = &l->c;
    if (count >= c->count) return;
    if (c->q) {
        fmpq *q = _fmpq_vec_init(count);
        for (slong n = 0; n < count; n++) fmpq_swap(&q[n], &c->q[n]);
        _fmpq_vec_clear(c->q, c->count);
        c->q = q;
    }
    c->count = count;
}

/* How many coefficients of lane l belong to the terms kept: one past the last kept one, and on over zeros while these
 * come before the last kept term of all (else the lane's unknown rest would seem to come first). */
static slong kept_in_lane(const contribution *c, size_t l, const term *terms, slong found)
{
    slong count = 0;
    for (slong k = 0; k < found; k++)
        if (terms[k].lane == l) count = terms[k].n + 1;
    const coefficients *x = &c->lanes[l].c;
    while (count < x->count && coefficient_is_zero(x, count)) count++;
    return count;
}

/* Zeros at the end of a lane that reach beyond the last kept term say nothing; the lane that holds the last term has
 * none. */
static void lanes_cut(contribution *c, const term *terms, slong found)
{
    size_t last = terms[found - 1].lane, kept = 0;
    for (size_t l = 0; l < c->lane_count; l++) {
        slong count = l == last && c->lane_count == 1 ? terms[found - 1].n + 1 : kept_in_lane(c, l, terms, found);
        lane_cut(&c->lanes[l], count);
    }
    for (size_t l = 0; l < c->lane_count; l++) {
        bool zero = true;
        for (slong n = 0; n < c->lanes[l].c.count && zero; n++) zero = coefficient_is_zero(&c->lanes[l].c, n);
        c->lanes_cut = c->lanes_cut || zero;
        if (zero) lane_clear(&c->lanes[l]);
        else c->lanes[kept++] = c->lanes[l];
    }
    c->lane_count = kept;
}

static void lane_cut_zeros(lane *l)
{
    slong count = l->c.count;
    while (count > 0 && coefficient_is_zero(&l->c, count - 1)) count--;
    lane_cut(l, count);
}

/* Keeps the terms asked for when they are there: terms of one power count once, so that a sum never ends within a power.
 * *found: as many powers there are. */
static tw_status keep_terms(tw_engine *e, contribution *c, bool small, slong wanted, slong *found)
{
    term *terms;
    slong entries;
    if (c->terminates) {
        for (size_t l = 0; l < c->lane_count; l++) lane_cut_zeros(&c->lanes[l]);
        *found = wanted;
        return TW_OK;
    }
    if (contribution_order_powers(e, c, small, wanted, &terms, &entries, found) != TW_OK) return TW_ERROR;
    if (*found >= wanted && entries > 0) lanes_cut(c, terms, entries);
    free(terms);
    return TW_OK;
}

/* Coefficients that are looked at before fewer terms than asked for are enough, and before an amplitude is taken to be
 * flat. */
enum { ZEROS_AT_MOST = 512, SEARCH_FACTOR = 16 };

tw_status contribution_fill_directly(tw_engine *e, contribution *c, expr *large, bool small, slong terms,
                                     condition_list *conditions)
{
    kernel k;
    kernel_init(&k);
    tw_status status = kernel_read(e, &k, c, large);
    slong length = terms + 4, found = 0;
    while (status == TW_OK && budget_ok(e)) {
        status = fill_to_length(e, c, &k, length, conditions);
        if (status == TW_OK) status = keep_terms(e, c, small, terms, &found);
        if (status != TW_OK || found >= terms) break;
        if (found == 0 && length > ZEROS_AT_MOST) {
            status = engine_fail(e, ERROR_UNSUITABLE,
                                 "the first %ld coefficients at the critical point all vanish: the "
                                 "integral is smaller than every power of %s",
                                 (long)length, large->is.name);
            break;
        }
        if (length > SEARCH_FACTOR * terms + ZEROS_AT_MOST) {
            c->searched = terms;
            status = keep_terms(e, c, small, found, &found);
            break;
        }
        slong guess = found > 0 ? length / found * terms + terms : 0;
        length = guess > length + length / 2 && guess < 8 * length ? guess : 2 * length;
        length = FLINT_MIN(length, SEARCH_FACTOR * terms + ZEROS_AT_MOST + 1);
    }
    kernel_clear(&k);
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- with a recurrence's help ---- */

/* From so many terms on a proved recurrence is looked for: finding it costs about what so many terms cost directly. */
enum { TERMS_BY_RECURRENCE = 250, TERMS_FIRST = 96 };

/* The lane's recurrence into *r, NULL when there is none that runs on what is known. */
static tw_status find_runner(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **r)
{
    *r = NULL;
    if (!l->c.q) return TW_OK;
    if (lane_recurrence_if_quick(e, c, l, large, r) != TW_OK) return TW_ERROR;
    if (*r && (!(*r)->p || (*r)->needed > l->c.count || (*r)->order > l->c.count)) *r = NULL;
    return TW_OK;
}

/* All classes of exponents can be run on, and those without a lane have none for ever: the recurrence takes zeros to
 * zeros. */
static tw_status find_runners(tw_engine *e, contribution *c, expr *large, bool *all)
{
    const recurrence *r;
    *all = c->lane_count > 0 && !c->lanes_cut;
    for (size_t k = 0; k < c->lane_count + c->zero_count && *all; k++) {
        const lane *l = k < c->lane_count ? &c->lanes[k] : &c->zeros[k - c->lane_count];
        if (find_runner(e, c, l, large, &r) != TW_OK) return TW_ERROR;
        *all = r != NULL;
    }
    return TW_OK;
}

static tw_status lane_run(tw_engine *e, contribution *c, size_t k, expr *large, slong count)
{
    coefficients *x = &c->lanes[k].c;
    const recurrence *r;
    if (count <= x->count) return TW_OK;
    if (find_runner(e, c, &c->lanes[k], large, &r) != TW_OK || !r) return TW_ERROR;
    fmpq *longer = _fmpq_vec_init(count);
    for (slong n = 0; n < x->count; n++) fmpq_swap(&longer[n], &x->q[n]);
    tw_status status = recurrence_extend(e, r, longer, x->count, count);
    _fmpq_vec_clear(x->q, x->count);
    x->q = longer;
    x->count = count;
    return status;
}

/* All lanes by their recurrences; *done: it worked for all. */
static tw_status lanes_run(tw_engine *e, contribution *c, expr *large, bool small, slong terms, bool *done)
{
    slong length = terms / (slong)FLINT_MAX(c->lane_count, 1) + 1, found = 0;
    if (find_runners(e, c, large, done) != TW_OK) return TW_ERROR;
    while (*done && found < terms && length < SEARCH_FACTOR * terms) {
        for (size_t k = 0; k < c->lane_count; k++)
            if (lane_run(e, c, k, large, length) != TW_OK) return TW_ERROR;
        if (keep_terms(e, c, small, terms, &found) != TW_OK) return TW_ERROR;
        length += length / 4 + 16;
    }
    *done = *done && found >= terms;
    return TW_OK;
}

tw_status contribution_fill(tw_engine *e, contribution *c, expr *large, bool small, slong terms,
                            condition_list *conditions)
{
    if (terms < TERMS_BY_RECURRENCE) return contribution_fill_directly(e, c, large, small, terms, conditions);
    bool done = false;
    slong first = TERMS_FIRST * (slong)FLINT_MAX(c->lane_count, 1);
    if (contribution_fill_directly(e, c, large, small, first, conditions) != TW_OK) return TW_ERROR;
    if (c->terminates || c->searched > 0) return contribution_fill_directly(e, c, large, small, terms, NULL);
    if (lanes_run(e, c, large, small, terms, &done) != TW_OK) return TW_ERROR;
    return done ? TW_OK : contribution_fill_directly(e, c, large, small, terms, NULL);
}
