/* The expansion as a value: lifetime, the order of its terms by size, a term as an expression. The one idea: the terms
 * of a contribution's lanes are merged like sorted lists; a lane that is known only so far stops the merge where its
 * next, unknown term could come first. It may not know how lanes are made. */
#include "engine/method/expansion.h"

#include "engine/method/combine.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/method/attach.h"
#include "engine/method/descent.h"
#include "engine/method/lanes.h"
#include "engine/method/method.h"
#include "engine/numeric/bound.h"

const char *point_kind_word(point_kind k)
{
    static const char *const words[] = {"end", "interior", "stationary", "saddle", "singular", "far-end", "form"};
    return words[k];
}

/* ---- lifetime ---- */

void local_form_init(local_form *l)
{
    *l = (local_form){NULL, NULL, 0, NULL};
}

void local_form_clear(local_form *l)
{
    free(l->branches);
    local_form_init(l);
}

branch *local_form_add(local_form *l, expr *x, expr *end, expr *p, expr *q)
{
    l->branches = base_resize(l->branches, (l->count + 1) * sizeof *l->branches);
    l->branches[l->count] = (branch){x, end, p, q};
    return &l->branches[l->count++];
}

void local_form_copy(local_form *to, const local_form *from)
{
    to->scale = from->scale;
    to->factor = from->factor;
    for (size_t k = 0; k < from->count; k++) {
        const branch *b = &from->branches[k];
        local_form_add(to, b->x, b->end, b->p, b->q);
    }
}

void lane_init(lane *l)
{
    *l = (lane){NULL, 0, NULL, {{0}}, {0}};
    fmpq_init(l->step);
    coefficients_init(&l->c);
}

void lane_clear(lane *l)
{
    fmpq_clear(l->step);
    coefficients_clear(&l->c);
}

void contribution_init(contribution *c)
{
    memset(c, 0, sizeof *c);
    local_form_init(&c->local);
    local_form_init(&c->formal);
}

void contribution_clear_lanes(contribution *c)
{
    for (size_t k = 0; k < c->lane_count; k++) lane_clear(&c->lanes[k]);
    for (size_t k = 0; k < c->zero_count; k++) lane_clear(&c->zeros[k]);
    free(c->lanes);
    free(c->zeros);
    c->lanes = c->zeros = NULL;
    c->lane_count = c->zero_count = 0;
    c->lanes_cut = false;
}

void contribution_clear(contribution *c)
{
    contribution_clear_lanes(c);
    steepest_free(c->steepest);
    c->steepest = NULL;
    local_form_clear(&c->local);
    local_form_clear(&c->formal);
    recurrence_memo_free(c->recurrences);
    c->recurrences = NULL;
}

void expansion_init(expansion *a)
{
    memset(a, 0, sizeof *a);
    conditions_init(&a->conditions);
    derivation_init(&a->derivation);
    local_form_init(&a->rest);
}

void expansion_clear(expansion *a)
{
    for (size_t k = 0; k < a->contribution_count; k++) contribution_clear(&a->contributions[k]);
    free(a->contributions);
    local_form_clear(&a->rest);
    combination_free(a->combined);
    conditions_clear(&a->conditions);
    derivation_clear(&a->derivation);
    free(a->why);
    free(a->facts);
    free(a->fact_labels);
    if (a->cache) bound_cache_free(a->cache);
    expansion_init(a);
}

contribution *expansion_add(expansion *a)
{
    a->contributions = base_resize(a->contributions, (a->contribution_count + 1) * sizeof *a->contributions);
    contribution *c = &a->contributions[a->contribution_count++];
    contribution_init(c);
    return c;
}

/* ---- order ---- */

typedef struct order {
    tw_engine *e;
    const contribution *c;
    bool small;
    slong *next;      /* of each lane: the first index not yet taken, zeros skipped */
    fmpq *base;       /* of each lane: its first exponent minus that of lane 0, where that is a number */
    bool *has_base;
    size_t last_lane; /* of the term taken last */
    slong last_n;
} order;

static bool lane_is_out(const order *o, size_t k)
{
    return o->next[k] >= o->c->lanes[k].c.count;
}

static void skip_zeros(order *o, size_t k)
{
    const coefficients *c = &o->c->lanes[k].c;
    while (o->next[k] < c->count && coefficient_is_zero(c, o->next[k])) o->next[k]++;
}

static void order_init(order *o, tw_engine *e, const contribution *c, bool small)
{
    *o = (order){.e = e, .c = c, .small = small};
    o->next = base_alloc((c->lane_count + 1) * sizeof *o->next);
    o->has_base = base_alloc((c->lane_count + 1) * sizeof *o->has_base);
    o->base = _fmpq_vec_init((slong)c->lane_count);
    for (size_t k = 0; k < c->lane_count; k++) {
        o->next[k] = 0;
        skip_zeros(o, k);
        expr *d = expr_sub(e, c->lanes[k].first_exponent, c->lanes[0].first_exponent);
        o->has_base[k] = d && expr_is_number(d);
        if (o->has_base[k]) fmpq_set(&o->base[k], expr_number(d));
    }
}

static void order_clear(order *o)
{
    _fmpq_vec_clear(o->base, (slong)o->c->lane_count);
    free(o->has_base);
    free(o->next);
}

/* Sign of the exponent of term m of lane i minus that of term n of lane j; 2 when it cannot be decided. */
static int compare_exponents(order *o, size_t i, slong m, size_t j, slong n)
{
    const lane *a = &o->c->lanes[i], *b = &o->c->lanes[j];
    fmpq_t steps, u;
    fmpq_init(steps);
    fmpq_init(u);
    fmpq_mul_si(steps, a->step, m);
    fmpq_mul_si(u, b->step, n);
    fmpq_sub(steps, steps, u);
    int sign;
    if (o->has_base[i] && o->has_base[j]) {
        fmpq_sub(u, &o->base[i], &o->base[j]);
        fmpq_add(steps, steps, u);
        sign = fmpq_sgn(steps);
    } else {
        expr *d = expr_add(o->e, expr_sub(o->e, a->first_exponent, b->first_exponent), expr_fmpq(o->e, steps));
        sign = !d ? 2 : expr_is_number(d) ? fmpq_sgn(expr_number(d)) : decide_sign(o->e, d);
    }
    fmpq_clear(steps);
    fmpq_clear(u);
    return sign;
}

/* Does lane i's next term come before lane j's? */
static bool comes_before(order *o, size_t i, size_t j)
{
    int sign = compare_exponents(o, i, o->next[i], j, o->next[j]);
    if (sign == 2 && o->e->error.kind == ERROR_NONE) {
        char *a = expr_text(o->e, o->c->lanes[i].first_exponent), *b = expr_text(o->e, o->c->lanes[j].first_exponent);
        engine_fail(o->e, ERROR_UNDECIDED,
                    "the facts do not order the exponents %s and %s (up to whole steps): declare more of their "
                    "parameters with `given`",
                    a ? a : "", b ? b : "");
        free(a);
        free(b);
    }
    if (sign == 1 || sign == -1) return (sign > 0) != o->small;
    return o->c->lanes[i].log_power > o->c->lanes[j].log_power;
}

/* The lane whose next term is the largest; -1 when none is left, or when an unknown term would come first. */
static slong largest_lane(order *o)
{
    slong best = -1;
    for (size_t k = 0; k < o->c->lane_count; k++) {
        if (lane_is_out(o, k) && o->c->terminates) continue;
        if (best < 0 || comes_before(o, k, (size_t)best)) best = (slong)k;
    }
    return best >= 0 && lane_is_out(o, (size_t)best) ? -1 : best;
}

/* Has lane k's next term the power, also of the logarithm, of the term taken last? */
static bool goes_on(order *o, size_t k)
{
    return o->c->lanes[k].log_power == o->c->lanes[o->last_lane].log_power
           && compare_exponents(o, k, o->next[k], o->last_lane, o->last_n) == 0;
}

static void take(order *o, term **terms, slong *found, slong *room)
{
    if (*found == *room) {
        *room = *room ? 2 * *room : 16;
        *terms = base_resize(*terms, (size_t)*room * sizeof **terms);
    }
    (*terms)[(*found)++] = (term){o->last_lane, o->last_n};
}

/* Terms in order of size: `count` of them, or with by_power those of the first `count` powers, whole ones; *powers of them. */
static tw_status order_terms(order *o, slong count, bool by_power, term **terms, slong *found, slong *powers)
{
    slong room = 0, power_starts = 0;
    *terms = NULL;
    *found = *powers = 0;
    bool known = true;
    while (by_power || *found < count) {
        if (!budget_ok(o->e)) return TW_ERROR;
        slong k = largest_lane(o);
        if (o->e->error.kind != ERROR_NONE) return TW_ERROR;
        known = k >= 0;
        if (!known) break;
        bool same = *found > 0 && goes_on(o, (size_t)k);
        if (by_power && !same && *powers == count) break;
        if (!same) power_starts = *found;
        if (!same) ++*powers;
        o->last_lane = (size_t)k;
        o->last_n = o->next[k]++;
        take(o, terms, found, &room);
        skip_zeros(o, (size_t)k);
    }
    if (by_power && !known && !o->c->terminates && *powers > 0) { /* more of the last power may be unknown */
        *found = power_starts;
        --*powers;
    }
    return TW_OK;
}

static tw_status order_contribution(tw_engine *e, const contribution *c, bool small, slong count, bool by_power, term **terms,
                                    slong *found, slong *powers)
{
    order o;
    order_init(&o, e, c, small);
    tw_status status = e->error.kind == ERROR_NONE ? order_terms(&o, count, by_power, terms, found, powers) : TW_ERROR;
    order_clear(&o);
    if (status == TW_OK) return TW_OK;
    free(*terms);
    *terms = NULL;
    *found = 0;
    return TW_ERROR;
}

tw_status contribution_order(tw_engine *e, const contribution *c, bool small, slong count, term **terms, slong *found)
{
    slong powers;
    *terms = NULL;
    *found = 0;
    return order_contribution(e, c, small, count, false, terms, found, &powers);
}

tw_status contribution_order_powers(tw_engine *e, const contribution *c, bool small, slong count, term **terms, slong *found,
                                    slong *powers)
{
    *terms = NULL;
    *found = *powers = 0;
    return order_contribution(e, c, small, count, true, terms, found, powers);
}

tw_status expansion_order(tw_engine *e, expansion *a, size_t k, slong count, term **terms, slong *found)
{
    return contribution_order(e, &a->contributions[k], a->small, count, terms, found);
}

/* ---- terms ---- */

/* Nonzero coefficients in all lanes. */
slong contribution_count_terms(const contribution *c)
{
    slong count = 0;
    for (size_t l = 0; l < c->lane_count; l++)
        for (slong n = 0; n < c->lanes[l].c.count; n++)
            if (!coefficient_is_zero(&c->lanes[l].c, n)) count++;
    return count;
}

static bool lacks_terms(const contribution *c, slong terms)
{
    return !c->terminates && contribution_count_terms(c) < terms && terms > c->searched;
}

/* What a method changes of a contribution when it extends it. */
typedef struct kept_lanes {
    size_t lane_count;
    lane *lanes;
    domain_kind domain;
    slong searched;
    bool terminates;
    bool aside; /* is being extended */
} kept_lanes;

typedef struct extension {
    tw_engine *e;
    expansion *a;
    const method *m;
    slong terms;
} extension;

static tw_status run_extension(void *host)
{
    extension *x = host;
    return x->m->extend(x->e, x->a, x->terms);
}

static void lanes_set_aside(kept_lanes *k, contribution *c)
{
    *k = (kept_lanes){c->lane_count, c->lanes, c->domain, c->searched, c->terminates, true};
    c->lane_count = 0;
    c->lanes = NULL;
}

static void lanes_put_back(kept_lanes *k, contribution *c)
{
    c->lane_count = k->lane_count;
    c->lanes = k->lanes;
    c->domain = k->domain;
    c->searched = k->searched;
    c->terminates = k->terminates;
}

static void lanes_drop(lane *lanes, size_t count)
{
    for (size_t l = 0; l < count; l++) lane_clear(&lanes[l]);
    free(lanes);
}

/* All or nothing: until the method is done the old lanes are kept aside, because an expansion outlives a failed request. */
static tw_status extend_by(extension *x)
{
    expansion *a = x->a;
    kept_lanes *old = base_alloc((a->contribution_count + 1) * sizeof *old);
    for (size_t k = 0; k < a->contribution_count; k++) {
        old[k].aside = false;
        if (lacks_terms(&a->contributions[k], x->terms)) lanes_set_aside(&old[k], &a->contributions[k]);
    }
    unsigned jumps = x->e->jumps;
    tw_status status = engine_protect(x->e, run_extension, x);
    for (size_t k = 0; k < a->contribution_count; k++) {
        contribution *c = &a->contributions[k];
        if (!old[k].aside) continue;
        if (status == TW_OK && c->lanes) {
            lanes_drop(old[k].lanes, old[k].lane_count);
        } else { /* failed, or of another method */
            if (x->e->jumps == jumps) lanes_drop(c->lanes, c->lane_count);
            lanes_put_back(&old[k], c);
        }
    }
    free(old);
    return status;
}

tw_status expansion_extend(tw_engine *e, expansion *a, slong terms)
{
    if (a->combined) return a->made_by->extend(e, a, terms);
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        if (!lacks_terms(c, terms)) continue;
        const method *m = method_find(c->method);
        if (!m) return engine_fail(e, ERROR_INTERNAL, "no method is called %s", c->method);
        extension x = {e, a, m, terms};
        if (extend_by(&x) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

expr *expansion_term(tw_engine *e, const expansion *a, size_t k, term t)
{
    const lane *l = &a->contributions[k].lanes[t.lane];
    fmpq_t steps;
    fmpq_init(steps);
    fmpq_mul_si(steps, l->step, t.n);
    expr *exponent = expr_add(e, l->first_exponent, expr_fmpq(e, steps));
    fmpq_clear(steps);
    expr *log_part = l->log_power == 0 ? expr_int(e, 1)
                                       : expr_pow(e, expr_call1(e, FUNCTION_LOG, a->large), expr_int(e, l->log_power));
    expr *parts[] = {coefficient_expr(e, &l->c, t.n), l->constant, log_part, expr_pow(e, a->large, exponent)};
    for (size_t n = 0; n < 4; n++)
        if (!parts[n]) return NULL;
    return expr_product(e, parts, 4);
}

static bool begins_with_minus(tw_engine *e, expr *a)
{
    char *words = expr_text(e, a);
    bool minus = words && words[0] == '-';
    free(words);
    return minus;
}

expr *expansion_term_shown(tw_engine *e, const expansion *a, size_t k, term t)
{
    expr *whole = expansion_term(e, a, k, t), *const *factors;
    size_t count = whole ? expr_factors(&whole, &factors) : 0;
    if (count < 2) return whole;
    for (size_t n = 0; n < count; n++) {
        if (factors[n]->kind != EXPR_SUM || !begins_with_minus(e, factors[n])) continue;
        expr *other = expr_neg(e, factors[n]);
        if (!other || begins_with_minus(e, other)) continue;
        expr *rest = expr_int(e, -1);
        for (size_t m = 0; m < count; m++) rest = expr_mul(e, rest, m == n ? other : factors[m]);
        return rest;
    }
    return whole;
}
