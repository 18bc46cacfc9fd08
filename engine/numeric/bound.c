/* The remainder of an expansion: which proof applies, what it gives, under which label. One idea: the strongest proof that holds:
 * the enclosing theorem, then panels, then an estimate that says why it is one. The dominant contributions' local forms and the
 * expansion's rest are the whole integral, so the bound covers other ends, lesser points and tails.
 *
 * Branches of pure powers go through the machine together. Branches of a general phase run through it one by one, each with the same
 * groups kept (those that cancel between two branches included), and the remainders add.
 *
 * Panels keep whole groups of terms (one power of t with all its logarithms and constants); the difference between the groups' sum
 * and the terms that were asked for is computed, not assumed to be 0. */
#include "engine/numeric/bound.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/numeric/enclosing.h"
#include "engine/numeric/panels.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/signs.h"
#include "engine/method/lanes.h"
#include "engine/numeric/split_off.h"
#include "engine/numeric/terms.h"
#include "engine/numeric/turned.h"

/* Beyond so many terms the panels take long and the theorem does. */
enum { SHARP_MOST = 150 };

/* The relative accuracy that the panels are asked for. */
#define GOAL 0.008

const char *label_word(label l)
{
    static const char *const names[] = {"exact", "proved", "conditional", "estimated", "unknown"};
    return names[l];
}

void point_bound_init(point_bound *b)
{
    memset(b, 0, sizeof *b);
    arb_init(b->error);
    conditions_init(&b->conditions);
}

void point_bound_clear(point_bound *b)
{
    arb_clear(b->error);
    free(b->reason);
    conditions_clear(&b->conditions);
    memset(b, 0, sizeof *b);
}

/* ---- memory ---- */

typedef struct known_problem {
    size_t index, value_count;
    expr **symbols, **values; /* without the large parameter */
    size_t count;             /* problems whose sum is the contribution; 0: the machine does not apply, reason says why */
    problem **p;
    char *reason;
    answer encloses;
    bool encloses_known;
    struct known_problem *next;
} known_problem;

struct bound_cache {
    known_problem *first;
    unsigned jumps; /* of the engine when it was made: after another jump what it holds may be half made */
};

void bound_cache_free(struct bound_cache *c)
{
    known_problem *k = c ? c->first : NULL;
    while (k) {
        known_problem *next = k->next;
        for (size_t j = 0; j < k->count; j++)
            problem_free(k->p[j]);
        free(k->p);
        free(k->reason);
        free(k->symbols);
        free(k->values);
        free(k);
        k = next;
    }
    free(c);
}

static bool same_values(const known_problem *k, const env *at, expr *large)
{
    size_t n = 0;
    for (size_t j = 0; j < at->count; j++) {
        if (at->symbols[j] == large)
            continue;
        if (n >= k->value_count || k->symbols[n] != at->symbols[j] || k->values[n] != at->values[j])
            return false;
        n++;
    }
    return n == k->value_count;
}

static known_problem *known_find(tw_engine *e, expansion *a, size_t index, const env *at)
{
    known_problem *k;
    if (a->cache && a->cache->jumps != e->jumps) {
        bound_cache_free(a->cache);
        a->cache = NULL;
    }
    if (!a->cache) {
        a->cache = base_alloc(sizeof *a->cache);
        a->cache->first = NULL;
        a->cache->jumps = e->jumps;
    }
    for (k = a->cache->first; k; k = k->next)
        if (k->index == index && same_values(k, at, a->large))
            return k;
    k = base_alloc(sizeof *k);
    memset(k, 0, sizeof *k);
    k->index = index;
    k->symbols = base_alloc((at->count + 1) * sizeof *k->symbols);
    k->values = base_alloc((at->count + 1) * sizeof *k->values);
    for (size_t j = 0; j < at->count; j++)
        if (at->symbols[j] != a->large) {
            k->symbols[k->value_count] = at->symbols[j];
            k->values[k->value_count++] = at->values[j];
        }
    k->next = a->cache->first;
    a->cache->first = k;
    return k;
}

/* One and the same pure power on every branch? */
static bool branches_are_pure(tw_engine *e, const local_form *l)
{
    fmpq_t mu, first;
    bool pure = true;
    fmpq_init(mu);
    fmpq_init(first);
    for (size_t k = 0; k < l->count && pure; k++) {
        pure = is_pure_power(e, l->branches[k].p, l->branches[k].x, mu) && (k == 0 || fmpq_equal(mu, first));
        fmpq_set(first, mu);
    }
    fmpq_clear(first);
    fmpq_clear(mu);
    return pure;
}

static tw_status add_problem(tw_engine *e, known_problem *k, const local_form *l, expr *large, const env *at)
{
    problem *p;
    tw_status status = problem_new(e, &p, l, large, at, &k->reason);
    if (p) {
        k->p = base_resize(k->p, (k->count + 1) * sizeof *k->p);
        k->p[k->count++] = p;
    } else if (status == TW_OK && !k->reason) {
        k->reason = base_copy("the machine does not apply");
    }
    return status;
}

static tw_status known_problem_of(tw_engine *e, known_problem **out, expansion *a, size_t index, const env *at)
{
    known_problem *k = known_find(e, a, index, at);
    *out = k;
    const local_form *l = &a->contributions[index].local;
    tw_status status = TW_OK;
    if (k->count > 0 || k->reason)
        return TW_OK;
    if (l->count < 2 || branches_are_pure(e, l))
        return add_problem(e, k, l, a->large, at);
    for (size_t j = 0; j < l->count && status == TW_OK && !k->reason; j++) {
        local_form one = {.scale = l->scale, .factor = l->factor, .count = 1, .branches = l->branches + j};
        status = add_problem(e, k, &one, a->large, at);
    }
    if (status != TW_OK || k->reason) {
        for (size_t j = 0; j < k->count; j++)
            problem_free(k->p[j]);
        k->count = 0;
    }
    return status;
}

answer known_encloses(tw_engine *e, expansion *a, size_t index, const env *at)
{
    known_problem *k = known_find(e, a, index, at);
    if (!k->encloses_known) {
        k->encloses = contribution_encloses(e, &a->contributions[index].local, a->large, at);
        k->encloses_known = e->error.kind == ERROR_NONE;
    }
    return k->encloses;
}

/* ---- which groups ---- */

static expr *term_exponent(tw_engine *e, const expansion *a, size_t index, term t, const env *at)
{
    const lane *l = a->contributions[index].lanes + t.lane;
    fmpq_t steps;
    expr *exponent;
    fmpq_init(steps);
    fmpq_mul_si(steps, l->step, t.n);
    exponent = expr_add(e, l->first_exponent, expr_fmpq(e, steps));
    fmpq_clear(steps);
    return exponent ? put_values(e, exponent, at) : NULL;
}

/* How many different powers the first `terms` terms have, a group being all the terms of one power: lanes with several constants
 * and powers of the logarithm. *extra: terms of the last group that are not kept. */
static tw_status count_groups(tw_engine *e, expansion *a, size_t index, const env *at, slong terms, slong *groups, slong *extra)
{
    enum { GROUP_MOST = 24 };
    term *order = NULL;
    slong found = 0;
    expr *last = NULL;
    *groups = *extra = 0;
    if (expansion_extend(e, a, terms + 1) != TW_OK)
        engine_forgive(e);
    if (terms == 0)
        return TW_OK;
    if (expansion_order(e, a, index, terms + GROUP_MOST, &order, &found) != TW_OK)
        return TW_ERROR;
    for (slong k = 0; k < found; k++) {
        expr *here = term_exponent(e, a, index, order[k], at);
        if (k >= terms && here != last)
            break;
        if (here != last)
            ++*groups;
        if (k >= terms)
            ++*extra;
        last = here;
    }
    free(order);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* The exponent of the large parameter in a product. */
static expr *power_in(tw_engine *e, expr *product, expr *large)
{
    expr *const *factors;
    size_t count = expr_factors(&product, &factors);
    expr *sum = expr_int(e, 0);
    for (size_t k = 0; k < count; k++) {
        expr *base, *exponent;
        expr_as_power(e, factors[k], &base, &exponent);
        if (base == large && expr_is_number(exponent)) /* other powers of it stand in the prefactor */
            sum = expr_add(e, sum, exponent);
    }
    return sum;
}

/* The index in the problem whose term goes with large^exponent: group n gives factor * scale^-((v + 1 + n)/m). */
static tw_status index_of_exponent(tw_engine *e, const contribution *c, expr *large, const problem *p, expr *exponent, slong *n)
{
    expr *z = expr_div(e, expr_sub(e, power_in(e, c->local.factor, large), exponent), power_in(e, c->local.scale, large));
    expr *index = expr_sub(e, expr_sub(e, expr_mul(e, expr_fmpq(e, p->m), z), p->v_expr), expr_int(e, 1));
    if (!index)
        return TW_ERROR;
    if (!expr_is_number(index) || !fmpz_is_one(fmpq_denref(expr_number(index))) ||
        fmpz_cmp_si(fmpq_numref(expr_number(index)), 1000000) > 0 || fmpq_sgn(expr_number(index)) < 0)
        return engine_fail(e, ERROR_UNSUITABLE, "the powers of the branches do not fit together");
    *n = fmpz_get_si(fmpq_numref(expr_number(index)));
    return TW_OK;
}

/* For one of several problems of a contribution: everything in front of the first omitted term of the whole contribution is kept,
 * also what cancels against the other branches. */
static tw_status groups_kept_beside(tw_engine *e, expansion *a, size_t index, const env *at, problem *p, slong terms, slong *first,
                                    slong *extra)
{
    slong groups, found = 0, skip;
    term *order = NULL;
    if (count_groups(e, a, index, at, terms, &groups, extra) != TW_OK)
        return TW_ERROR;
    skip = terms + *extra;
    if (expansion_order(e, a, index, skip + 1, &order, &found) != TW_OK)
        return TW_ERROR;
    tw_status status = TW_OK;
    *first = 0;
    if (found > 0) {
        term last = order[FLINT_MIN(found - 1, skip)];
        status = index_of_exponent(e, a->contributions + index, a->large, p, term_exponent(e, a, index, last, at), first);
        if (status == TW_OK && found <= skip)
            ++*first;
    }
    free(order);
    return status == TW_OK ? problem_coefficients(p, *first + 32, FLINT_MAX(p->bits, 128)) : status;
}

/* The first index of the problem that is not kept when `terms` terms are: whole groups, *extra terms of the last
 * one are not among the kept. `beside`: the problem is one of several. */
static tw_status groups_kept(tw_engine *e, expansion *a, size_t index, const env *at, problem *p, bool beside, slong terms,
                             slong *first, slong *extra)
{
    slong n = 0, last = -1, groups;
    if (beside)
        return groups_kept_beside(e, a, index, at, p, terms, first, extra);
    if (count_groups(e, a, index, at, terms, &groups, extra) != TW_OK ||
        problem_coefficients(p, terms + 32, FLINT_MAX(p->bits, 128)) != TW_OK)
        return TW_ERROR;
    for (;; n++) {
        bool here = false;
        if (n == p->known) {
            if (p->terminates || n > 8 * terms + 400) {
                n = last + 1; /* all of it is kept */
                break;
            }
            if (problem_coefficients(p, 2 * n + 32, p->bits) != TW_OK)
                return TW_ERROR;
        }
        for (slong k = 0; k < p->lanes; k++)
            here = here || !arb_is_zero(p->f[k] + n);
        if (here && groups-- == 0)
            break;
        if (here)
            last = n;
    }
    *first = n;
    return TW_OK;
}

/* ---- at one point ---- */

static void sum_terms(arb_t sum, const term_values *t, slong terms, slong bits)
{
    arb_zero(sum);
    for (slong k = 0; k < terms && k < t->count; k++)
        arb_add(sum, sum, t->value + k, bits);
}

/* [0, T] or [T, 0]. */
static void enclosing_error(arb_t error, const arb_t T)
{
    arb_t zero;
    arb_init(zero);
    arb_union(error, zero, T, 64);
    if (TW_BOUND_FACTOR != 1) {
        arb_set_d(zero, TW_BOUND_FACTOR);
        arb_mul(error, error, zero, 64);
    }
    arb_clear(zero);
}

/* The largest of the next omitted terms, three times. */
static tw_status estimate_error(tw_engine *e, arb_t error, expansion *a, size_t index, const env *at, slong terms)
{
    term_table t;
    mag_t most, part;
    tw_status status;
    if (expansion_extend(e, a, terms + 3) != TW_OK)
        engine_forgive(e);
    status = terms_at(e, &t, a, at, terms + 3, false, 64);
    if (status != TW_OK)
        return status;
    mag_init(most);
    mag_init(part);
    for (size_t b = 0; b < t.count; b++)
        if (t.list[b].contribution == index) {
            slong from = FLINT_MIN(terms, t.list[b].count - 1);
            for (slong k = FLINT_MAX(from, 0); k < t.list[b].count; k++) {
                arb_get_mag(part, t.list[b].value + k);
                mag_max(most, most, part);
            }
        }
    mag_mul_ui(most, most, 3);
    arb_zero(error);
    mag_set(arb_radref(error), most);
    mag_clear(part);
    mag_clear(most);
    terms_clear(&t);
    return TW_OK;
}

typedef struct piece_bound {
    label label;
    bool enclosing;
    arb_t error;
    const char *reason;
} piece_bound;

/* The sum of all kept groups of all problems, without the contribution's factor. */
static tw_status kept_sum(tw_engine *e, arb_t out, expansion *a, size_t index, const env *at, const known_problem *k, slong terms,
                          const arb_t S, slong bits)
{
    tw_status status = TW_OK;
    arb_t part;
    arb_init(part);
    arb_zero(out);
    for (size_t j = 0; j < k->count && status == TW_OK; j++) {
        slong first, extra;
        status = groups_kept(e, a, index, at, k->p[j], k->count > 1, terms, &first, &extra);
        if (status == TW_OK)
            status = panels_kept_sum(k->p[j], first, S, part, bits);
        arb_add(out, out, part, bits);
    }
    arb_clear(part);
    return status;
}

/* factor * S_K less the kept terms: 0 as a ball, unless a group is cut. Computed with so many bits that its radius is nothing
 * beside the rest R, which may be exponentially small. */
static tw_status groups_less_kept(tw_engine *e, arb_t out, expansion *a, const term_values *t, const env *at, slong terms,
                                  const known_problem *k, slong bits, const arb_t R)
{
    enum { BITS_MOST = 40000 };
    const contribution *c = a->contributions + t->contribution;
    arb_t S, kept;
    mag_t size, rest;
    term_table fine = {0};
    const term_values *list = t;
    double more;
    tw_status status;
    arb_init(S);
    arb_init(kept);
    mag_init(size);
    mag_init(rest);
    sum_terms(kept, t, terms, bits);
    arb_get_mag(size, kept);
    arb_get_mag(rest, R);
    more = mag_is_zero(rest) ? 0 : mag_log2(size) - mag_log2(rest);
    bits = FLINT_MIN(BITS_MOST, bits + 64 + (more > 0 ? (slong)more : 0));
    status = terms_at(e, &fine, a, at, terms, false, bits);
    for (size_t b = 0; b < fine.count; b++)
        if (fine.list[b].contribution == t->contribution)
            list = fine.list + b;
    if (status == TW_OK)
        status = real_ball(e, S, put_values(e, c->local.scale, at), bits);
    if (status == TW_OK)
        status = kept_sum(e, out, a, t->contribution, at, k, terms, S, bits);
    if (status == TW_OK)
        status = real_ball(e, S, put_values(e, c->local.factor, at), bits);
    if (status == TW_OK) {
        arb_mul(out, out, S, bits);
        sum_terms(kept, list, terms, bits);
        arb_sub(out, out, kept, bits);
    }
    terms_clear(&fine);
    mag_clear(rest);
    mag_clear(size);
    arb_clear(kept);
    arb_clear(S);
    return status;
}

/* By panels, for contribution t: error = R_K + (S_K - sum of the kept terms). */
static tw_status panel_sum(tw_engine *e, arb_t error, expansion *a, const term_values *t, const env *at, slong terms, slong bits,
                           known_problem *k, double goal, bool *made, const char **reason)
{
    const contribution *c = a->contributions + t->contribution;
    arb_t S, factor, part;
    expr *scale = put_values(e, c->local.scale, at);
    panel_report report = {0};
    slong first, extra;
    tw_status status;
    arb_init(S);
    arb_init(factor);
    arb_init(part);
    *made = true;
    status = real_ball(e, S, scale, bits + 64);
    if (status == TW_OK)
        status = real_ball(e, factor, put_values(e, c->local.factor, at), bits + 64);
    arb_zero(error);
    for (size_t j = 0; j < k->count && status == TW_OK && *made; j++) {
        status = groups_kept(e, a, t->contribution, at, k->p[j], k->count > 1, terms, &first, &extra);
        if (status == TW_OK)
            status = panels_at(k->p[j], first, scale, S, goal, part, made, &report);
        if (status == TW_OK && *made)
            arb_add(error, error, part, bits + 64);
    }
    if (status == TW_OK && *made) {
        arb_mul(error, error, factor, bits + 64);
        status = groups_less_kept(e, part, a, t, at, terms, k, bits, error);
        arb_add(error, error, part, bits + 64);
        *made = arb_is_finite(error);
    }
    if (status == TW_OK && !*made)
        *reason = report.reason ? report.reason : "the bound is not finite there";
    arb_clear(part);
    arb_clear(factor);
    arb_clear(S);
    return status;
}

/* Branches and cut groups may cancel: then each is asked for more. */
static tw_status panel_error(tw_engine *e, piece_bound *out, expansion *a, const term_values *t, const env *at, slong terms,
                             slong bits)
{
    known_problem *k;
    arb_t error;
    double goal = GOAL, relative;
    bool made = true;
    tw_status status = known_problem_of(e, &k, a, t->contribution, at);
    if (status != TW_OK)
        return status;
    out->label = LABEL_ESTIMATED;
    if (k->count == 0) {
        out->reason = k->reason;
        return TW_OK;
    }
    arb_init(error);
    for (int pass = 0; pass < 3 && status == TW_OK && made && goal > 1e-7; pass++) {
        status = panel_sum(e, error, a, t, at, terms, bits, k, goal, &made, &out->reason);
        if (status != TW_OK || !made)
            break;
        if (out->label == LABEL_ESTIMATED || mag_cmp(arb_radref(error), arb_radref(out->error)) < 0)
            arb_set(out->error, error);
        out->label = LABEL_PROVED;
        relative = panels_relative(error);
        if (relative < 2.5 * GOAL)
            break;
        goal = fmax(goal * GOAL / relative, goal / 1000);
    }
    if (out->label == LABEL_PROVED)
        out->reason = NULL;
    arb_clear(error);
    return status;
}

/* The theorem's interval is as wide as the first omitted term; the panels' one is a few per cent of the rest. The better one
 * stands, under its own name. */
static tw_status sharpen(tw_engine *e, piece_bound *out, expansion *a, const term_values *t, const env *at, slong terms, slong bits)
{
    piece_bound other = {.label = LABEL_ESTIMATED};
    mag_t mine, theirs;
    tw_status status;
    arb_init(other.error);
    mag_init(mine);
    mag_init(theirs);
    status = panel_error(e, &other, a, t, at, terms, bits);
    arb_get_mag(mine, out->error);
    arb_get_mag(theirs, other.error);
    if (status == TW_OK && other.label == LABEL_PROVED && mag_cmp(theirs, mine) < 0) {
        arb_swap(out->error, other.error);
        out->enclosing = false;
    }
    mag_clear(theirs);
    mag_clear(mine);
    arb_clear(other.error);
    return status;
}

static tw_status contribution_error(tw_engine *e, piece_bound *out, expansion *a, const term_values *t, const env *at,
                                    slong terms, slong bits, bool sharp)
{
    const contribution *c = a->contributions + t->contribution;
    tw_status status = TW_OK;
    out->label = LABEL_ESTIMATED;
    out->enclosing = false;
    out->reason = NULL;
    if (c->terminates && terms >= t->count && a->exact) {
        arb_zero(out->error);
        out->label = LABEL_EXACT;
        return TW_OK;
    }
    if (c->local.count == 0) {
        out->reason = "the contribution has no integral of its own";
    } else if (terms < t->count && known_encloses(e, a, t->contribution, at) == ANSWER_YES) {
        enclosing_error(out->error, t->value + terms);
        out->label = LABEL_PROVED;
        out->enclosing = true;
        return sharp && terms <= SHARP_MOST ? sharpen(e, out, a, t, at, terms, bits) : TW_OK;
    } else {
        status = panel_error(e, out, a, t, at, terms, bits);
    }
    if (status == TW_OK && out->label == LABEL_ESTIMATED && terms < t->count &&
        signs_enclose(e, &c->local, a->large, at, terms) == ANSWER_YES) {
        enclosing_error(out->error, t->value + terms);
        out->label = LABEL_PROVED;
        out->enclosing = true;
        out->reason = NULL;
    }
    if (status == TW_OK && out->label == LABEL_ESTIMATED)
        status = estimate_error(e, out->error, a, t->contribution, at, terms);
    return status;
}

tw_status conditions_at(tw_engine *e, condition_list *out, const expansion *a, const env *at)
{
    for (size_t k = 0; k < a->conditions.count; k++) {
        const condition *c = a->conditions.list + k;
        condition_label l = c->label;
        if (c->relation && (l == CONDITION_OPEN || l == CONDITION_GRANTED)) {
            expr *here = put_values(e, c->relation, at);
            condition_label known;
            answer holds = here && here->kind == EXPR_RELATION ? decide(e, here, &known) : ANSWER_UNKNOWN;
            if (holds == ANSWER_YES && known != CONDITION_GRANTED)
                l = CONDITION_PROVED;
            else if (holds == ANSWER_NO)
                return engine_fail(e, ERROR_VALUE, "the expansion needs %s, which fails there", c->words);
        }
        if (e->error.kind != ERROR_NONE)
            return TW_ERROR;
        conditions_add(out, c->words, c->relation, l);
    }
    return TW_OK;
}

tw_status remainder_at_as(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits, bool sharp)
{
    term_table t;
    piece_bound one;
    tw_status status = point_complete(e, a, at);
    bool all_enclosing = true;
    if (status != TW_OK)
        return status;
    if (a->combined) {
        status = combined_error(e, out, a, at, terms, bits);
        if (status == TW_OK && out->label <= LABEL_PROVED && !conditions_all_sure(&out->conditions))
            out->label = LABEL_CONDITIONAL;
        return status;
    }
    if (a->remainder) {
        status = split_off_at(e, out, a, at, terms, bits);
        if (status == TW_OK)
            status = conditions_at(e, &out->conditions, a, at);
        if (out->label <= LABEL_PROVED && !conditions_all_sure(&out->conditions))
            out->label = LABEL_CONDITIONAL;
        return status;
    }
    if (is_turned(a)) {
        status = turned_at(e, out, a, at, terms);
        if (status == TW_OK)
            status = conditions_at(e, &out->conditions, a, at);
        if (out->label <= LABEL_PROVED && !conditions_all_sure(&out->conditions))
            out->label = LABEL_CONDITIONAL;
        return status;
    }
    if (expansion_extend(e, a, terms + 1) != TW_OK)
        engine_forgive(e); /* fewer terms are known: the enclosing theorem then has none to use */
    status = terms_at(e, &t, a, at, terms + 1, false, bits + 64);
    if (status != TW_OK)
        return status;
    arb_init(one.error);
    arb_zero(out->error);
    out->label = LABEL_EXACT;
    for (size_t k = 0; k < t.count && status == TW_OK; k++) {
        status = contribution_error(e, &one, a, t.list + k, at, terms, bits, sharp);
        if (status != TW_OK)
            break;
        arb_add(out->error, out->error, one.error, bits + 64);
        out->label = FLINT_MAX(out->label, one.label);
        all_enclosing = all_enclosing && one.enclosing;
        if (one.reason && !out->reason)
            out->reason = base_copy(one.reason);
    }
    if (status == TW_OK && a->rest.count > 0) {
        bool made;
        status = rest_at(e, one.error, a, at, &made);
        arb_add(out->error, out->error, one.error, bits + 64);
        out->label = FLINT_MAX(out->label, made ? LABEL_PROVED : LABEL_ESTIMATED);
        all_enclosing = false;
        if (!made && !out->reason)
            out->reason = base_copy(REST_REASON);
    }
    if (status == TW_OK)
        status = conditions_at(e, &out->conditions, a, at);
    if (out->label <= LABEL_PROVED && !conditions_all_sure(&out->conditions))
        out->label = LABEL_CONDITIONAL;
    out->manner = all_enclosing && t.count > 0 ? "enclosing" : NULL;
    arb_clear(one.error);
    terms_clear(&t);
    return status;
}

tw_status remainder_at(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits)
{
    return remainder_at_as(e, out, a, at, terms, bits, false);
}

tw_status power_bound_count(tw_engine *e, expansion *a, size_t index, const env *at, size_t *count, char **reason)
{
    known_problem *k;
    tw_status status = known_problem_of(e, &k, a, index, at);
    *count = status == TW_OK ? k->count : 0;
    if (status == TW_OK && k->count == 0)
        *reason = base_copy(k->reason);
    return status;
}

tw_status power_bound_of(tw_engine *e, power_bound *out, expansion *a, size_t index, size_t part, const env *at, slong terms,
                         bool *made, slong *extra, char **reason)
{
    const contribution *c = a->contributions + index;
    known_problem *k;
    arb_t S;
    panel_report report = {0};
    slong first;
    expr *scale = put_values(e, c->local.scale, at);
    tw_status status = known_problem_of(e, &k, a, index, at);
    *made = false;
    if (status != TW_OK)
        return status;
    if (part >= k->count)
        return engine_fail(e, ERROR_INTERNAL, "a contribution has no such part");
    arb_init(S);
    status = real_ball(e, S, scale, 256);
    if (status == TW_OK)
        status = groups_kept(e, a, index, at, k->p[part], k->count > 1, terms, &first, extra);
    if (status == TW_OK)
        status = panels_for_all(k->p[part], first, scale, S, out, made, &report);
    if (status == TW_OK && !*made)
        *reason = base_copy(report.reason ? report.reason : "the machine could not prove it");
    arb_clear(S);
    return status;
}

tw_status groups_agree(tw_engine *e, expansion *a, size_t index, const env *at, slong terms, bool *agree)
{
    enum { BITS = 256 };
    const contribution *c = a->contributions + index;
    known_problem *k;
    term_table t;
    arb_t S, sum, kept;
    slong groups, extra = 0;
    tw_status status = known_problem_of(e, &k, a, index, at);
    if (status == TW_OK)
        status = count_groups(e, a, index, at, terms, &groups, &extra);
    if (status != TW_OK)
        return status;
    status = terms_at(e, &t, a, at, terms + 24, false, BITS);
    if (status != TW_OK)
        return status;
    arb_init(S);
    arb_init(sum);
    arb_init(kept);
    *agree = false;
    if (k->count > 0) {
        status = real_ball(e, S, put_values(e, c->local.scale, at), BITS);
        if (status == TW_OK)
            status = kept_sum(e, sum, a, index, at, k, terms, S, BITS);
        if (status == TW_OK)
            status = real_ball(e, S, put_values(e, c->local.factor, at), BITS);
        arb_mul(sum, sum, S, BITS);
        for (size_t b = 0; b < t.count; b++)
            if (t.list[b].contribution == index)
                sum_terms(kept, t.list + b, terms + extra, BITS);
        /* both come from the same exact series: this guards against a mistake in between */
        *agree = status == TW_OK && arb_overlaps(sum, kept);
    }
    arb_clear(kept);
    arb_clear(sum);
    arb_clear(S);
    terms_clear(&t);
    return status;
}
