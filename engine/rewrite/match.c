/* Matching, associative and commutative, with neutral values and Miller's pattern functions. Knows patterns and
 * expressions, nothing of rules. Its one idea: what is still to be matched is a list of goals; a goal either fails, or
 * changes bindings and views and goes on with the goals behind it; what it changed is taken back from a trail. So all
 * matches come in order, and none is kept that is not wanted. */
#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/pattern_node.h"

/* How many trials one match may take; sums of more than LARGE_VIEW parts are searched, not read through. */
enum { TRIAL_LIMIT = 200000, LARGE_VIEW = 48 };

typedef struct goal {
    const part *part;
    expr *subject;           /* NULL: the parts of `group` from `at` on */
    view *group;
    size_t at;
    const struct goal *next;
} goal;

typedef struct trail_entry {
    view *group;
    size_t index;
    expr *old;
} trail_entry;

typedef struct matcher {
    tw_engine *e;
    const pattern *p;
    expr **values;
    uint64_t bound;
    view *top;               /* the view whose rest is kept, or NULL */
    expr *subject;           /* without a top view */
    expr *whole_number;      /* of the top view, before the pattern's own left it */
    expr *top_number;        /* what is left of it at the report */
    trail_entry *trail;
    size_t trail_count, trail_room;
    taken *taken;
    long trials, depth;
    nearest *nearest;        /* where failures are noted, or NULL */
    match_visitor *visit;
    void *host;
    bool found, failed;
} matcher;

/* True: stop, by the visitor's wish or because of an error. */
static bool solve(matcher *m, const goal *g);

static bool fail(matcher *m)
{
    m->failed = true;
    return true;
}

/* Counts; false when there were too many. */
static bool trial(matcher *m, size_t weight)
{
    m->trials += (long)weight;
    if (m->trials <= TRIAL_LIMIT) return budget_ok(m->e);
    char *words = m->subject ? expr_text(m->e, m->subject) : NULL;
    engine_fail(m->e, ERROR_UNDECIDED, "the rule `%s` fits %.60s%s in too many ways: none of the first %d was accepted",
                m->p->name ? m->p->name : "pattern", words ? words : "this sum",
                words && strlen(words) > 60 ? "..." : "", TRIAL_LIMIT);
    free(words);
    return false;
}

/* The part is about to be tried here. */
static void note(matcher *m, const part *p, expr *place)
{
    if (!m->nearest || m->depth <= m->nearest->depth) return;
    *m->nearest = (nearest){m->depth, p->form, place};
}

/* ---- views ---- */

void view_init(tw_engine *e, view *v, expr *subject, bool product)
{
    expr *const *parts;
    expr **own = engine_scratch(e, 1, sizeof *own);
    *own = subject;
    size_t n = product ? expr_factors(own, &parts) : expr_terms(own, &parts);
    *v = (view){.product = product, .number = expr_int(e, product), .whole = subject};
    if (n > 0 && parts[0]->kind == EXPR_NUMBER) {
        v->number = parts[0];
        parts++;
        n--;
    }
    v->count = n;
    v->items = parts;
    v->left = engine_scratch(e, n + 1, sizeof *v->left);
    memcpy(v->left, parts, n * sizeof *v->left);
}

static expr *join(tw_engine *e, bool product, expr *const *parts, size_t n)
{
    return product ? expr_product(e, parts, n) : expr_sum(e, parts, n);
}

expr *view_left(tw_engine *e, const view *v)
{
    expr **parts = engine_scratch(e, v->count + 1, sizeof *parts);
    size_t n = 0;
    for (size_t k = 0; k < v->count; k++)
        if (v->left[k]) parts[n++] = v->left[k];
    parts[n++] = v->number;
    return join(e, v->product, parts, n);
}

static void trail_push(matcher *m, view *g, size_t index, expr *left)
{
    if (m->trail_count == m->trail_room) {
        m->trail_room = m->trail_room ? 2 * m->trail_room : 32;
        m->trail = base_resize(m->trail, m->trail_room * sizeof *m->trail);
    }
    m->trail[m->trail_count++] = (trail_entry){g, index, g->left[index]};
    g->left[index] = left;
}

static void trail_back(matcher *m, size_t to)
{
    while (m->trail_count > to) {
        const trail_entry *t = &m->trail[--m->trail_count];
        t->group->left[t->index] = t->old;
    }
}

/* The place of an item equal to a, whole; count when there is none. */
static size_t view_find(const view *v, expr *a)
{
    if (v->count <= LARGE_VIEW) {
        for (size_t k = 0; k < v->count; k++)
            if (v->left[k] == a) return k;
        return v->count;
    }
    size_t low = 0, high = v->count;
    while (low < high) {
        size_t middle = low + (high - low) / 2;
        int order = expr_order(v->items[middle], a);
        if (order == 0) return v->left[middle] == a ? middle : v->count;
        if (order < 0) low = middle + 1;
        else high = middle;
    }
    return v->count;
}

/* ---- bindings ---- */

static uint64_t bit(size_t k)
{
    return (uint64_t)1 << k;
}

/* Does a hold none of the variables bound above this level, but for the arguments of `form` when it is a function? */
static bool in_scope(matcher *m, const part *p, expr *a)
{
    for (uint32_t l = 0; l < p->level; l++) {
        expr *symbol = matching_symbol(m->e, l);
        if (!expr_has(a, symbol)) continue;
        bool argument = false;
        if (p->kind == PART_FUNCTION)
            for (size_t k = 0; k < m->p->variables[p->variable].arity; k++)
                argument = argument || p->form->args[1 + k] == symbol;
        if (!argument) return false;
    }
    return true;
}

/* What a variable's or function's part would bind when it stands for a. */
static expr *bound_value(matcher *m, const part *p, expr *a)
{
    if (p->kind != PART_FUNCTION) return a;
    return expr_substitute_all(m->e, a, p->form->args + 1, m->p->parameters[p->variable],
                               m->p->variables[p->variable].arity);
}

/* Binds, or compares with the binding; *fresh when it was bound now. False: it does not fit (or an error is set). */
static bool bind(matcher *m, const part *p, expr *a, bool *fresh)
{
    *fresh = false;
    if (!a || !in_scope(m, p, a)) return false;
    expr *value = bound_value(m, p, a);
    if (!value) return false;
    if (m->bound & bit(p->variable)) return m->values[p->variable] == value;
    m->values[p->variable] = value;
    m->bound |= bit(p->variable);
    *fresh = true;
    return true;
}

static void unbind(matcher *m, const part *p)
{
    m->bound &= ~bit(p->variable);
    m->values[p->variable] = NULL;
}

static expr *instance_of(matcher *m, expr *form)
{
    const match now = {.of = m->p, .values = m->values};
    return match_instance(m->e, &now, form);
}

/* ---- the report ---- */

/* What was taken out of a sum. */
static expr *view_taken_sum(matcher *m)
{
    expr **parts = engine_scratch(m->e, m->trail_count + 1, sizeof *parts);
    size_t n = 0;
    for (size_t k = 0; k < m->trail_count; k++)
        if (m->trail[k].group == m->top && !m->top->left[m->trail[k].index]) parts[n++] = m->trail[k].old;
    parts[n++] = expr_sub(m->e, m->whole_number, m->top_number);
    return expr_sum(m->e, parts, n);
}

static expr *kept_with(matcher *m, expr *made)
{
    view v = *m->top;
    v.number = m->top_number;
    expr *const pair[2] = {made, view_left(m->e, &v)};
    return join(m->e, v.product, pair, 2);
}

/* Is the instance with what is kept the subject again? */
static bool is_verified(matcher *m)
{
    expr *made = instance_of(m, m->p->form);
    if (!made) return false;
    if (!m->top) return made == m->subject;
    if (!m->top->product && m->top->count > LARGE_VIEW) return made == view_taken_sum(m);
    view whole = *m->top;
    whole.number = m->whole_number;
    expr **left = engine_scratch(m->e, whole.count + 1, sizeof *left);
    memcpy(left, whole.left, whole.count * sizeof *left);
    for (size_t k = m->trail_count; k-- > 0;)
        if (m->trail[k].group == m->top) left[m->trail[k].index] = m->trail[k].old;
    whole.left = left;
    return kept_with(m, made) == view_left(m->e, &whole);
}

/* An error of the values that were tried is no error of the match; an exhausted budget is. */
static bool passes_over(matcher *m)
{
    const error_kind k = m->e->error.kind;
    if (k == ERROR_NONE) return true;
    if (k != ERROR_VALUE && k != ERROR_UNSUITABLE) return false;
    engine_forgive(m->e);
    return true;
}

static bool report(matcher *m)
{
    for (size_t k = 0; k < m->p->count; k++)
        if (!m->values[k]) return false;
    const arena_place mark = arena_mark(&m->e->scratch);
    const bool good = is_verified(m);
    arena_release(&m->e->scratch, mark);
    if (!good) return passes_over(m) ? false : fail(m);
    m->found = true;
    const match now = {.of = m->p, .values = m->values, .by = m};
    const bool stop = m->visit && m->visit(m->host, &now);
    return m->e->error.kind != ERROR_NONE ? fail(m) : stop || !m->visit;
}

expr *match_join(tw_engine *e, const match *m, expr *replacement)
{
    matcher *by = (matcher *)m->by;
    if (!replacement || !by->top) return replacement;
    const arena_place mark = arena_mark(&e->scratch);
    expr *made = kept_with(by, replacement);
    arena_release(&e->scratch, mark);
    return made;
}

size_t match_taken(const match *m, const taken **list, expr **number)
{
    matcher *by = (matcher *)m->by;
    by->taken = base_resize(by->taken, (by->trail_count + 1) * sizeof *by->taken);
    size_t n = 0;
    for (size_t k = 0; k < by->trail_count; k++)
        if (by->trail[k].group == by->top)
            by->taken[n++] = (taken){by->trail[k].index, by->top->left[by->trail[k].index]};
    *list = by->taken;
    *number = by->top_number;
    return n;
}

/* ---- sums and products: what is left over ---- */

/* The factors of a like b^e, each to the power 1/q. */
static expr *root_of(matcher *m, expr *a, const fmpq_t q)
{
    tw_engine *e = m->e;
    fmpq_t inverse;
    fmpq_init(inverse);
    fmpq_inv(inverse, q);
    expr *const *factors, *made = expr_int(e, 1);
    const size_t n = expr_factors(&a, &factors);
    for (size_t k = 0; k < n; k++) {
        expr *base, *exponent;
        expr_as_power(e, factors[k], &base, &exponent);
        made = expr_mul(e, made, expr_pow(e, base, expr_mul(e, exponent, expr_fmpq(e, inverse))));
    }
    fmpq_clear(inverse);
    return made;
}

/* May this taker hold this left-over part? */
static bool may_take(matcher *m, const part *group, const part *taker, expr *left)
{
    if (!in_scope(m, taker, left)) return false;
    if (taker->kind != PART_ROOTED || !group->alone) return true;
    if (left->kind != EXPR_POWER || !expr_is_number(left->args[1])) return false;
    fmpq_t ratio;
    fmpq_init(ratio);
    fmpq_div(ratio, expr_number(left->args[1]), taker->number);
    const bool good = fmpq_sgn(ratio) > 0 && fmpz_is_one(fmpq_denref(ratio));
    fmpq_clear(ratio);
    return good;
}

/* See pattern.h: must the number show in the subject? */
static bool number_shows(const part *group, expr *residual)
{
    const fmpq *r = expr_number(residual);
    if (group->kind == PART_SUM) return fmpq_is_zero(r) || fmpq_sgn(r) == fmpq_sgn(group->number);
    if (fmpq_is_one(group->number)) return true;
    const bool unit = fmpz_is_one(fmpq_denref(group->number)) && fmpz_is_pm1(fmpq_numref(group->number));
    return fmpq_sgn(r) > 0 && (unit || fmpz_is_one(fmpq_denref(r)));
}

static bool may_take_number(const part *group, const part *taker, expr *residual)
{
    if (!group->free_number && !number_shows(group, residual)) return false;
    if (taker->kind != PART_ROOTED || !group->alone) return true;
    const fmpq *r = expr_number(residual);
    return fmpq_sgn(r) > 0 && (fmpq_sgn(taker->number) < 0 ? fmpz_is_one(fmpq_numref(r)) : fmpz_is_one(fmpq_denref(r)));
}

/* The leftovers of a group and who takes each. */
typedef struct share {
    view *group;
    const part *part;
    const goal *next;
    size_t count;            /* of leftovers */
    size_t *index;
    uint32_t *owner;         /* of each leftover: a taker, or taker_count for the rest */
    const part **takers;     /* those that are not bound yet */
    size_t taker_count;
    bool with_rest;
} share;

/* The first owner from `from` on that may hold leftover k; one past all when there is none. */
static uint32_t owner_from(matcher *m, const share *s, size_t k, uint32_t from)
{
    for (; from < s->taker_count; from++)
        if (may_take(m, s->part, s->takers[from], s->group->left[s->index[k]])) return from;
    return from + (from == s->taker_count && !s->with_rest);
}

static uint32_t owner_limit(const share *s)
{
    return (uint32_t)s->taker_count + s->with_rest;
}

static bool shares_start(matcher *m, share *s)
{
    for (size_t k = 0; k < s->count; k++)
        if ((s->owner[k] = owner_from(m, s, k, 0)) >= owner_limit(s)) return false;
    return true;
}

/* The next distribution, the last leftover changing first. */
static bool shares_next(matcher *m, share *s)
{
    for (size_t k = s->count; k-- > 0;) {
        if ((s->owner[k] = owner_from(m, s, k, s->owner[k] + 1)) < owner_limit(s)) return true;
        s->owner[k] = owner_from(m, s, k, 0);
    }
    return false;
}

/* What taker t gets; number is NULL or the residual that it takes too. */
static expr *share_of(matcher *m, const share *s, uint32_t t, expr *number)
{
    expr **parts = engine_scratch(m->e, s->count + 1, sizeof *parts);
    size_t n = 0;
    if (number) parts[n++] = number;
    for (size_t k = 0; k < s->count; k++)
        if (s->owner[k] == t) parts[n++] = s->group->left[s->index[k]];
    expr *whole = join(m->e, s->group->product, parts, n);
    if (!whole || s->takers[t]->kind != PART_ROOTED) return whole;
    expr *root = root_of(m, whole, s->takers[t]->number);
    return root && expr_pow(m->e, root, expr_fmpq(m->e, s->takers[t]->number)) == whole ? root : NULL;
}

/* Binds all takers and goes on; number_owner: who gets the number (owner_limit: it is neutral). */
static bool shares_try(matcher *m, const share *s, uint32_t number_owner)
{
    bool good = trial(m, 1 + s->count / 8), stop = !good;
    uint64_t fresh = 0;
    const size_t mark = m->trail_count;
    uint32_t t = 0;
    for (; good && t < s->taker_count; t++) {
        bool is_fresh;
        good = bind(m, s->takers[t], share_of(m, s, t, number_owner == t ? s->group->number : NULL), &is_fresh);
        if (is_fresh) fresh |= bit(t);
    }
    if (stop) return fail(m);
    if (good) {
        const bool kept = s->with_rest && (number_owner == s->taker_count || number_owner >= owner_limit(s));
        for (size_t k = 0; k < s->count; k++)
            if (s->owner[k] < s->taker_count) trail_push(m, s->group, s->index[k], NULL);
        if (s->with_rest) m->top_number = kept ? s->group->number : expr_int(m->e, s->group->product);
        stop = solve(m, s->next);
    } else if (!passes_over(m)) {
        stop = fail(m);
    }
    trail_back(m, mark);
    for (t = 0; t < s->taker_count; t++)
        if (fresh & bit(t)) unbind(m, s->takers[t]);
    return stop;
}

static bool number_is_neutral(const view *g)
{
    return expr_is_int(g->number, g->product);
}

/* May what is kept hold the number? As a coefficient it must show, too. */
static bool rest_may_take_number(const share *s)
{
    return s->with_rest && (s->group->product ? number_shows(s->part, s->group->number)
                                              : fmpq_is_zero(s->part->number) || number_is_neutral(s->group));
}

static bool shares_with_number(matcher *m, const share *s)
{
    if (number_is_neutral(s->group)) return shares_try(m, s, owner_limit(s));
    for (uint32_t t = 0; t < owner_limit(s); t++) {
        const bool may = t < s->taker_count ? may_take_number(s->part, s->takers[t], s->group->number)
                                            : rest_may_take_number(s);
        if (may && shares_try(m, s, t)) return true;
    }
    return false;
}

/* Nothing takes but the rest, which holds whatever is left: no need to look at it. */
static bool solve_kept(matcher *m, const share *s)
{
    if (!number_is_neutral(s->group) && !rest_may_take_number(s)) return false;
    m->top_number = s->group->number;
    return solve(m, s->next);
}

static bool solve_shares(matcher *m, view *g, const part *p, const goal *next)
{
    const arena_place mark = arena_mark(&m->e->scratch);
    share s = {.group = g, .part = p, .next = next, .with_rest = g == m->top};
    s.takers = engine_scratch(m->e, p->takers + 1, sizeof *s.takers);
    for (size_t k = p->count - p->takers; k < p->count; k++)
        if (!(m->bound & bit(p->parts[k]->variable))) s.takers[s.taker_count++] = p->parts[k];
    bool stop = false;
    if (s.taker_count == 0 && s.with_rest) {
        stop = solve_kept(m, &s);
    } else {
        s.index = engine_scratch(m->e, g->count + 1, sizeof *s.index);
        s.owner = engine_scratch(m->e, g->count + 1, sizeof *s.owner);
        for (size_t k = 0; k < g->count; k++)
            if (g->left[k]) s.index[s.count++] = k;
        bool more = shares_start(m, &s);
        while (more && !stop) {
            stop = shares_with_number(m, &s);
            if (!stop && !trial(m, 1)) stop = fail(m);
            more = !stop && shares_next(m, &s);
        }
    }
    arena_release(&m->e->scratch, mark);
    return stop;
}

/* ---- sums and products: parts that are bound already ---- */

/* Is the number term a part of the one that is there: of the same sign and not greater? */
static bool number_is_within(expr *piece, expr *whole)
{
    const fmpq *p = expr_number(piece), *w = expr_number(whole);
    return fmpq_sgn(p) == fmpq_sgn(w) && fmpq_sgn(p) * fmpq_cmp(w, p) >= 0;
}

/* Takes one term or factor out of the view. */
static bool take_piece(matcher *m, view *g, expr *piece)
{
    if (piece->kind == EXPR_NUMBER) {
        if (g->product ? expr_is_zero(piece) : !g->exponent && !number_is_within(piece, g->number)) return false;
        g->number = g->product ? expr_div(m->e, g->number, piece) : expr_sub(m->e, g->number, piece);
        return g->number != NULL;
    }
    size_t k = view_find(g, piece);
    if (k < g->count) {
        trail_push(m, g, k, NULL);
        return true;
    }
    if (!g->product) return false;
    expr *base, *exponent, *own_base, *own_exponent;
    expr_as_power(m->e, piece, &base, &exponent);
    for (k = 0; expr_is_number(exponent) && k < g->count; k++) {
        if (!g->left[k]) continue;
        expr_as_power(m->e, g->left[k], &own_base, &own_exponent);
        if (own_base != base || !expr_is_number(own_exponent)) continue;
        if (fmpq_sgn(expr_number(exponent)) * fmpq_cmp(expr_number(own_exponent), expr_number(exponent)) <= 0) continue;
        trail_push(m, g, k, expr_pow(m->e, base, expr_sub(m->e, own_exponent, exponent)));
        return g->left[k] != NULL;
    }
    return false;
}

/* Takes a value out of the view; the caller takes the trail and the number back. */
static bool take_value(matcher *m, view *g, expr *value)
{
    expr *const *pieces;
    if (!value) return false;
    const size_t n = g->product ? expr_factors(&value, &pieces) : expr_terms(&value, &pieces);
    if (expr_is_int(value, g->product)) return true;
    for (size_t k = 0; k < n; k++)
        if (!take_piece(m, g, pieces[k])) return false;
    return true;
}

/* All takers that are bound leave the view, then the others share what is left. */
static bool solve_takers(matcher *m, view *g, const part *p, const goal *next)
{
    expr *number = g->number;
    const size_t mark = m->trail_count;
    bool good = true, stop = false;
    for (size_t k = p->count - p->takers; good && k < p->count; k++)
        if (m->bound & bit(p->parts[k]->variable)) good = take_value(m, g, instance_of(m, p->parts[k]->form));
    if (good) stop = solve_shares(m, g, p, next);
    else if (!passes_over(m)) stop = fail(m);
    trail_back(m, mark);
    g->number = number;
    return stop;
}

/* ---- sums and products: the other parts in turn ---- */

/* Can the part match the expression at all, by their heads? */
static bool heads_agree(const part *p, expr *a)
{
    switch (p->kind) {
    case PART_FIXED: return p->form == a;
    case PART_BINDER: return p->form->kind == a->kind && p->form->count == a->count;
    case PART_OTHER:
        return p->form->kind == a->kind && p->form->count == a->count &&
               (a->kind != EXPR_CALL || p->form->is.function == a->is.function) &&
               (a->kind != EXPR_RELATION || p->form->is.relation == a->is.relation);
    case PART_POWER:
        if (p->parts[0]->kind == PART_FIXED && p->parts[0]->form != (a->kind == EXPR_POWER ? a->args[0] : a)) return false;
        return p->parts[1]->kind != PART_FIXED || (a->kind == EXPR_POWER && a->args[1] == p->parts[1]->form);
    default: return true;
    }
}

/* A part that stands for one of several like factors: the exponent it asks for, NULL when it is no number. */
static expr *split_exponent(matcher *m, const part *p)
{
    if (p->kind == PART_POWER) return p->parts[1]->kind == PART_FIXED ? p->parts[1]->form : NULL;
    if (p->kind == PART_FIXED && p->form->kind == EXPR_POWER) return p->form->args[1];
    return expr_int(m->e, 1);
}

/* Takes the part out of a higher power and leaves the rest of it. */
static bool solve_split(matcher *m, view *g, const part *p, size_t k, const goal *then)
{
    expr *whole = g->left[k], *wanted = split_exponent(m, p);
    if (whole->kind != EXPR_POWER || !wanted || !expr_is_number(wanted) || !expr_is_number(whole->args[1])) return false;
    const fmpq *has = expr_number(whole->args[1]), *wants = expr_number(wanted);
    if (fmpq_sgn(has) != fmpq_sgn(wants) || fmpq_sgn(wants) * fmpq_cmp(has, wants) <= 0) return false;
    const part *base = p->kind == PART_POWER ? p->parts[0] : p;
    if (p->kind == PART_FIXED && (p->form->kind == EXPR_POWER ? p->form->args[0] : p->form) != whole->args[0]) return false;
    if (p->kind != PART_FIXED && !heads_agree(base, whole->args[0])) return false;
    const size_t mark = m->trail_count;
    trail_push(m, g, k, expr_pow(m->e, whole->args[0], expr_sub(m->e, whole->args[1], wanted)));
    const goal matching = {.part = base, .subject = whole->args[0], .next = then};
    bool stop = g->left[k] ? solve(m, p->kind == PART_FIXED ? then : &matching) : fail(m);
    trail_back(m, mark);
    return stop;
}

/* May a power in the view be split? Only where what is left of it can go somewhere. */
static bool splits(const matcher *m, const view *g, const part *group)
{
    if (!g->product) return false;
    if (g == m->top) return true;
    for (size_t k = group->count - group->takers; k < group->count; k++)
        if (group->parts[k]->kind == PART_FUNCTION) return true;
    return false;
}

/* The part is bound: it must be there. */
static bool solve_bound(matcher *m, view *g, const part *p, const goal *then)
{
    expr *number = g->number;
    const size_t mark = m->trail_count;
    expr *value = instance_of(m, p->form);
    bool stop = false;
    if (take_value(m, g, value)) stop = solve(m, then);
    else if (!passes_over(m)) stop = fail(m);
    trail_back(m, mark);
    g->number = number;
    return stop;
}

/* Lets the part stand for item k, or for a part of it. */
static bool solve_at(matcher *m, view *g, const part *group, const part *p, size_t k, const goal *then)
{
    if (!g->left[k]) return false;
    bool stop = false;
    if (heads_agree(p, g->left[k])) {
        if (!trial(m, 1)) return fail(m);
        const goal matching = {.part = p, .subject = g->left[k], .next = then};
        const size_t mark = m->trail_count;
        trail_push(m, g, k, NULL);
        stop = solve(m, &matching);
        trail_back(m, mark);
    }
    return stop || (splits(m, g, group) && solve_split(m, g, p, k, then));
}

static bool solve_absent(matcher *m, const part *p, const goal *then)
{
    const goal matching = {.part = p->parts[1], .subject = expr_int(m->e, 0), .next = then};
    return solve(m, &matching);
}

static bool solve_part(matcher *m, view *g, const part *group, size_t at, const goal *next)
{
    const part *p = group->parts[at];
    const goal then = {.part = group, .group = g, .at = at + 1, .next = next};
    note(m, p, g->whole);
    if (p->kind == PART_CHECKED && !(m->bound & bit(p->variable))) return false;
    if (p->kind == PART_FIXED || (p->variables & ~m->bound) == 0) return solve_bound(m, g, p, &then);
    bool stop = false;
    if (g == m->top && g->candidates) {
        candidates *c = &g->candidates[at];
        while (c->start < c->count && !g->left[c->list[c->start]]) c->start++;
        for (size_t k = c->start; k < c->count && !stop; k++) stop = solve_at(m, g, group, p, c->list[k], &then);
    } else {
        for (size_t k = 0; k < g->count && !stop; k++) stop = solve_at(m, g, group, p, k, &then);
    }
    return stop || (g->product && p->may_vanish && solve_absent(m, p, &then));
}

static bool solve_group(matcher *m, const goal *g)
{
    const part *p = g->part;
    if (g->at + p->takers < p->count) return solve_part(m, g->group, p, g->at, g->next);
    return solve_takers(m, g->group, p, g->next);
}

/* The number of the pattern leaves the view; false when what is left of it can have no taker. */
static bool number_leaves(matcher *m, view *g, const part *p)
{
    expr *own = expr_fmpq(m->e, p->number);
    g->number = g->product ? expr_div(m->e, g->number, own) : expr_sub(m->e, g->number, own);
    return g->number != NULL;
}

static bool start_group(matcher *m, const part *p, expr *subject, const goal *next)
{
    view g;
    view_init(m->e, &g, subject, p->kind == PART_PRODUCT);
    g.exponent = p->exponent;
    if (!number_leaves(m, &g, p)) return passes_over(m) ? false : fail(m);
    const goal parts = {.part = p, .group = &g, .next = next};
    return solve_group(m, &parts);
}

/* ---- the other forms ---- */

static bool solve_power(matcher *m, const part *p, expr *subject, const goal *next)
{
    const bool is_power = subject->kind == EXPR_POWER;
    const goal exponent = {.part = p->parts[1], .subject = is_power ? subject->args[1] : expr_int(m->e, 1), .next = next};
    const goal base = {.part = p->parts[0], .subject = is_power ? subject->args[0] : subject, .next = &exponent};
    if (heads_agree(p, subject) && solve(m, &base)) return true;
    return expr_is_one(subject) && p->may_vanish && solve_absent(m, p, next);
}

static bool solve_children(matcher *m, const part *p, expr *subject, const goal *next)
{
    if (!heads_agree(p, subject)) return false;
    goal *goals = engine_scratch(m->e, p->count, sizeof *goals);
    for (size_t k = p->count; k-- > 0;) {
        const bool under = p->opened && node_child_is_under(subject->kind, subject->count, k);
        expr *child = under ? matching_open(m->e, subject, p->level) : subject->args[k];
        if (!child) return fail(m);
        goals[k] = (goal){.part = p->parts[k], .subject = child, .next = next};
        next = &goals[k];
    }
    return solve(m, next);
}

static bool solve_variable(matcher *m, const part *p, expr *subject, const goal *next)
{
    bool fresh;
    if (!bind(m, p, subject, &fresh)) return m->e->error.kind != ERROR_NONE ? fail(m) : false;
    const bool stop = solve(m, next);
    if (fresh) unbind(m, p);
    return stop;
}

static bool solve_checked(matcher *m, const part *p, expr *subject, const goal *next)
{
    if (!(m->bound & bit(p->variable))) return false;
    expr *value = instance_of(m, p->form);
    if (!value) return passes_over(m) ? false : fail(m);
    return value == subject && solve(m, next);
}

static bool solve_one(matcher *m, const goal *g)
{
    const arena_place mark = arena_mark(&m->e->scratch);
    bool stop = false;
    note(m, g->part, g->subject);
    switch (g->part->kind) {
    case PART_FIXED: stop = g->part->form == g->subject && solve(m, g->next); break;
    case PART_VARIABLE: case PART_FUNCTION: stop = solve_variable(m, g->part, g->subject, g->next); break;
    case PART_CHECKED: stop = solve_checked(m, g->part, g->subject, g->next); break;
    case PART_SUM: case PART_PRODUCT: stop = start_group(m, g->part, g->subject, g->next); break;
    case PART_POWER: stop = solve_power(m, g->part, g->subject, g->next); break;
    case PART_BINDER: case PART_OTHER: stop = solve_children(m, g->part, g->subject, g->next); break;
    case PART_ROOTED: break; /* stands in products only, which share it out */
    }
    arena_release(&m->e->scratch, mark);
    return stop;
}

static bool solve(matcher *m, const goal *g)
{
    if (!g) return report(m);
    if (!trial(m, 1)) return fail(m);
    m->depth++;
    const bool stop = g->subject ? solve_one(m, g) : solve_group(m, g);
    m->depth--;
    return stop;
}

/* ---- the whole ---- */

static tw_status run(matcher *m, const goal *first, bool *found)
{
    const arena_place mark = arena_mark(&m->e->scratch);
    m->values = engine_scratch(m->e, m->p->count + 1, sizeof *m->values);
    memset(m->values, 0, (m->p->count + 1) * sizeof *m->values);
    solve(m, first);
    free(m->trail);
    free(m->taken);
    arena_release(&m->e->scratch, mark);
    if (found) *found = m->found;
    return m->failed || m->e->error.kind != ERROR_NONE ? TW_ERROR : TW_OK;
}

static bool is_group(const part *p)
{
    return p->kind == PART_SUM || p->kind == PART_PRODUCT;
}

tw_status pattern_match(tw_engine *e, const pattern *p, expr *subject, bool with_rest, match_visitor *visit, void *host,
                        bool *found)
{
    if (found) *found = false;
    if (!subject) return TW_ERROR;
    if (with_rest && is_group(p->root)) {
        const arena_place mark = arena_mark(&e->scratch);
        view v;
        view_init(e, &v, subject, p->root->kind == PART_PRODUCT);
        tw_status status = pattern_match_view(e, p, &v, visit, host, found);
        arena_release(&e->scratch, mark);
        return status;
    }
    matcher m = {.e = e, .p = p, .subject = subject, .visit = visit, .host = host};
    const goal first = {.part = p->root, .subject = subject};
    return run(&m, &first, found);
}

tw_status pattern_match_view(tw_engine *e, const pattern *p, view *v, match_visitor *visit, void *host, bool *found)
{
    matcher m = {.e = e, .p = p, .visit = visit, .host = host, .top = v, .whole_number = v->number};
    expr *number = v->number;
    const goal first = {.part = p->root, .group = v};
    if (found) *found = false;
    if (!number_leaves(&m, v, p->root)) {
        v->number = number;
        return passes_over(&m) ? TW_OK : TW_ERROR;
    }
    tw_status status = run(&m, &first, found);
    v->number = number;
    return status;
}

tw_status pattern_nearest(tw_engine *e, const pattern *p, expr *subject, nearest *out)
{
    const arena_place mark = arena_mark(&e->scratch);
    matcher m = {.e = e, .p = p, .nearest = out};
    view v;
    goal first = {.part = p->root, .subject = subject};
    bool sound = true;
    if (is_group(p->root)) {
        view_init(e, &v, subject, p->root->kind == PART_PRODUCT);
        m.top = &v;
        m.whole_number = v.number;
        first = (goal){.part = p->root, .group = &v};
        sound = number_leaves(&m, &v, p->root);
    } else {
        m.subject = subject;
    }
    tw_status status = sound ? run(&m, &first, NULL) : passes_over(&m) ? TW_OK : TW_ERROR;
    arena_release(&e->scratch, mark);
    return status;
}

void view_prepare(tw_engine *e, view *v, const pattern *p)
{
    const part *root = p->root;
    v->candidates = engine_scratch(e, root->count + 1, sizeof *v->candidates);
    for (size_t at = 0; at < root->count; at++) {
        candidates *c = &v->candidates[at];
        const part *one = root->parts[at];
        *c = (candidates){0, 0, NULL};
        if (at + root->takers >= root->count || one->kind == PART_FIXED) continue;
        c->list = engine_scratch(e, v->count + 1, sizeof *c->list);
        for (size_t k = 0; k < v->count; k++) {
            expr *base = v->product && v->items[k]->kind == EXPR_POWER ? v->items[k]->args[0] : NULL;
            if (heads_agree(one, v->items[k]) || (base && heads_agree(one->kind == PART_POWER ? one->parts[0] : one, base)))
                c->list[c->count++] = (uint32_t)k;
        }
    }
}
