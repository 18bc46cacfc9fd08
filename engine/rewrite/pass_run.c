/* Runs passes. Knows rules and the order of places; nothing of what rules mean. Its one idea: expressions are interned,
 * so what a part of a pass makes of a subexpression is remembered by pointer and never done twice; a subexpression that
 * came out unchanged costs a look-up in every later sweep. Inside an integral or a sum the variable is opened and its
 * range is a fact. */
#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/condition.h"
#include "engine/rewrite/index.h"
#include "engine/rewrite/pass.h"

/* How often `repeat` goes round, and how large the expression may grow meanwhile. */
enum { ROUND_LIMIT = 10000, CIRCLE_SHOWN = 6 };
static const uint64_t SIZE_LIMIT = 20000000;

/* A part of a pass made ready: an `or` of rules has its index. */
typedef struct runnable {
    const pass *p;
    strategy kind;             /* of p, names left aside; RULE for one or several rules */
    size_t rule_count;
    rule **rules;
    rule_index *index;         /* of several rules */
    size_t count;
    struct runnable **parts;
} runnable;

typedef struct memory_entry {
    const runnable *by;
    expr *a, *after;
} memory_entry;

typedef struct usage {
    const rule *rule;
    const pass_step *step;
    size_t times;
    expr *before, *after;      /* where it was used first */
    condition_list conditions;
} usage;

typedef struct runner {
    tw_engine *e;
    memory_entry *memory;
    size_t count, room;
    usage *used;
    size_t used_count, used_room;
} runner;

static tw_status run(runner *r, const runnable *p, expr *a, expr **after);

/* ---- making ready ---- */

static bool only_rules(const pass *p)
{
    if (p->kind == STRATEGY_RULE) return true;
    if (p->kind != STRATEGY_OR && p->kind != STRATEGY_NAMED) return false;
    for (size_t k = 0; k < p->count; k++)
        if (!only_rules(p->parts[k])) return false;
    return true;
}

static void list_rules(const pass *p, runnable *to)
{
    if (p->rule) {
        to->rules = base_resize(to->rules, (to->rule_count + 1) * sizeof *to->rules);
        to->rules[to->rule_count++] = p->rule;
    }
    for (size_t k = 0; k < p->count; k++) list_rules(p->parts[k], to);
}

static runnable *make_ready(tw_engine *e, const pass *p)
{
    while (p->kind == STRATEGY_NAMED) p = p->parts[0];
    runnable *r = base_alloc(sizeof *r);
    *r = (runnable){.p = p, .kind = p->kind};
    if (only_rules(p)) {
        r->kind = STRATEGY_RULE;
        list_rules(p, r);
        if (r->rule_count > 1) r->index = index_new(e, r->rules, r->rule_count);
        return r;
    }
    r->count = p->count;
    r->parts = base_alloc((p->count + 1) * sizeof *r->parts);
    for (size_t k = 0; k < p->count; k++) r->parts[k] = make_ready(e, p->parts[k]);
    return r;
}

static void runnable_free(runnable *r)
{
    for (size_t k = 0; k < r->count; k++) runnable_free(r->parts[k]);
    free(r->parts);
    free(r->rules);
    index_free(r->index);
    free(r);
}

/* ---- memory ---- */

static size_t memory_slot(const runner *r, const runnable *by, expr *a)
{
    size_t at = (a->hash * 0x9e3779b9u ^ (size_t)((uintptr_t)by >> 4) * 31u ^ (size_t)a->serial) & (r->room - 1);
    while (r->memory[at].a && (r->memory[at].a != a || r->memory[at].by != by)) at = (at + 1) & (r->room - 1);
    return at;
}

static expr *memory_find(const runner *r, const runnable *by, expr *a)
{
    return r->room ? r->memory[memory_slot(r, by, a)].after : NULL;
}

static void memory_keep(runner *r, const runnable *by, expr *a, expr *after)
{
    if ((r->count + 1) * 2 > r->room) {
        memory_entry *old = r->memory;
        const size_t old_room = r->room;
        r->room = old_room ? 2 * old_room : 1024;
        r->memory = base_alloc(r->room * sizeof *r->memory);
        memset(r->memory, 0, r->room * sizeof *r->memory);
        for (size_t k = 0; k < old_room; k++)
            if (old[k].a) r->memory[memory_slot(r, old[k].by, old[k].a)] = old[k];
        free(old);
    }
    memory_entry *entry = &r->memory[memory_slot(r, by, a)];
    r->count += !entry->a;
    *entry = (memory_entry){by, a, after};
}

/* ---- what was used ---- */

static usage *usage_of(runner *r, const rule *rule_used, const pass_step *step_used)
{
    for (size_t k = 0; k < r->used_count; k++)
        if (r->used[k].rule == rule_used && r->used[k].step == step_used) return &r->used[k];
    if (r->used_count == r->used_room) {
        r->used_room = r->used_room ? 2 * r->used_room : 8;
        r->used = base_resize(r->used, r->used_room * sizeof *r->used);
    }
    usage *u = &r->used[r->used_count++];
    *u = (usage){.rule = rule_used, .step = step_used};
    conditions_init(&u->conditions);
    return u;
}

static void note_usage(runner *r, const rule *rule_used, const pass_step *step_used, expr *before, expr *after,
                       size_t times, const condition_list *conditions)
{
    usage *u = usage_of(r, rule_used, step_used);
    if (u->times == 0) {
        u->before = before;
        u->after = after;
    }
    u->times += times;
    conditions_append(&u->conditions, conditions);
}

/* ---- rules and steps ---- */

/* The rule at the root of a; in a sweep at every disjoint group of its parts. */
static tw_status run_rule(runner *r, const rule *x, expr *a, bool sweep, expr **after)
{
    rule_outcome o;
    size_t times = 1;
    rule_outcome_init(&o);
    tw_status status = rule_usable(r->e, x);
    if (status == TW_OK) status = sweep ? rule_apply_all(r->e, x, a, &o, &times) : rule_apply(r->e, x, a, &o);
    if (status == TW_OK && o.after) note_usage(r, x, NULL, a, o.after, times, &o.conditions);
    *after = o.after ? o.after : a;
    rule_outcome_clear(&o);
    return status;
}

/* The first rule that applies. In a sweep over the parts of a sum or product one rule after the other. */
static tw_status run_rules(runner *r, const runnable *p, expr *a, bool sweep, expr **after)
{
    *after = a;
    if (!p->index) return run_rule(r, p->rules[0], a, sweep, after);
    const uint32_t *found;
    const size_t n = index_find(p->index, a, &found);
    tw_status status = r->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    uint32_t *own = n ? base_alloc(n * sizeof *own) : NULL;
    if (n) memcpy(own, found, n * sizeof *own);
    for (size_t k = 0; status == TW_OK && k < n && *after == a; k++)
        status = run_rule(r, p->rules[own[k]], a, sweep, after);
    free(own);
    return status;
}

static tw_status run_step(runner *r, const pass_step *s, expr *a, expr **after)
{
    condition_list conditions;
    conditions_init(&conditions);
    *after = NULL;
    tw_status status = s->run ? s->run(r->e, a, after, &conditions) : TW_OK;
    if (!*after) *after = a;
    if (status == TW_OK && *after != a) note_usage(r, NULL, s, a, *after, 1, &conditions);
    conditions_clear(&conditions);
    return status;
}

/* ---- inside ---- */

typedef tw_status inner_run(runner *r, const runnable *p, expr *a, expr **after);

/* The body of a binder under its opened variable, whose range is known meanwhile. */
static tw_status run_body(runner *r, const runnable *p, expr *a, inner_run *inner, size_t under, expr **args, bool *changed)
{
    tw_engine *e = r->e;
    expr *x = expr_fresh(e, expr_binder_name(a)), *body = expr_open(e, a, x), *made;
    if (!body) return TW_ERROR;
    condition_assume_range(e, a, x);
    tw_status status = e->error.kind == ERROR_NONE ? inner(r, p, body, &made) : TW_ERROR;
    facts_forget(e, x);
    if (status != TW_OK) return status;
    if (made == body) return TW_OK;
    expr *closed = NULL, *one = expr_int(e, 1), *zero = expr_int(e, 0);
    switch (a->kind) { /* any ends will do: the closed body is what counts */
    case EXPR_ROOT: closed = expr_root(e, x, made, one); break;
    case EXPR_SUMMATION: closed = expr_summation(e, x, zero, one, made); break;
    default: closed = expr_integral(e, x, zero, one, made);
    }
    if (!closed) return TW_ERROR;
    args[under] = node_is_binder(closed) ? closed->args[a->kind == EXPR_ROOT ? 0 : closed->count - 1] : closed;
    *changed = true;
    return TW_OK;
}

/* Runs `inner` on the children of a, all of them or up to the first that it changes. */
static tw_status run_children(runner *r, const runnable *p, expr *a, inner_run *inner, bool all, expr **after)
{
    *after = a;
    if (a->count == 0) return TW_OK;
    const arena_place mark = arena_mark(&r->e->scratch);
    expr **args = engine_scratch(r->e, a->count, sizeof *args);
    memcpy(args, a->args, a->count * sizeof *args);
    bool changed = false;
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < a->count && (all || !changed); k++) {
        if (node_is_binder(a) && node_child_is_under(a->kind, a->count, k)) {
            status = run_body(r, p, a, inner, k, args, &changed);
        } else {
            status = inner(r, p, a->args[k], &args[k]);
            changed = changed || (status == TW_OK && args[k] != a->args[k]);
        }
    }
    if (status == TW_OK && changed) *after = expr_rebuild(r->e, a, args);
    arena_release(&r->e->scratch, mark);
    return status == TW_OK && *after ? TW_OK : TW_ERROR;
}

/* ---- strategies ---- */

static tw_status sweep(runner *r, const runnable *p, expr *a, expr **after)
{
    expr *known = memory_find(r, p, a), *inside;
    *after = known;
    if (known) return TW_OK;
    if (!budget_ok(r->e)) return TW_ERROR;
    if (run_children(r, p, a, sweep, true, &inside) != TW_OK) return TW_ERROR;
    const runnable *one = p->parts[0];
    tw_status status = one->kind == STRATEGY_RULE ? run_rules(r, one, inside, true, after) : run(r, one, inside, after);
    if (status == TW_OK) memory_keep(r, p, a, *after);
    return status;
}

static tw_status run_once(runner *r, const runnable *p, expr *a, expr **after)
{
    *after = memory_find(r, p, a);
    if (*after) return TW_OK;
    if (!budget_ok(r->e) || run(r, p->parts[0], a, after) != TW_OK) return TW_ERROR;
    if (*after == a && run_children(r, p, a, run_once, false, after) != TW_OK) return TW_ERROR;
    memory_keep(r, p, a, *after);
    return TW_OK;
}

static tw_status report_circle(runner *r, expr *const *states, size_t from, size_t to)
{
    text words;
    text_init(&words);
    for (size_t k = from; k < to && k < from + CIRCLE_SHOWN; k++) {
        char *form = expr_text(r->e, states[k]);
        text_addf(&words, "%.120s%s -> ", form ? form : "?", form && strlen(form) > 120 ? "..." : "");
        free(form);
    }
    if (to - from > CIRCLE_SHOWN) text_addf(&words, "... (%zu more) -> ", to - from - CIRCLE_SHOWN);
    char *form = expr_text(r->e, states[from]);
    text_addf(&words, "%.120s%s", form ? form : "?", form && strlen(form) > 120 ? "..." : "");
    free(form);
    engine_fail(r->e, ERROR_UNSUITABLE, "`repeat` goes in a circle: %s", words.bytes);
    text_clear(&words);
    return TW_ERROR;
}

static tw_status run_repeat(runner *r, const runnable *p, expr *a, expr **after)
{
    expr **states = NULL;
    size_t count = 0, room = 0;
    tw_status status = TW_OK;
    *after = a;
    for (bool going = true; going && status == TW_OK;) {
        if (count == room) {
            room = room ? 2 * room : 16;
            states = base_resize(states, room * sizeof *states);
        }
        expr *next, *now = *after;
        states[count++] = now;
        status = budget_ok(r->e) ? run(r, p->parts[0], now, &next) : TW_ERROR;
        if (status != TW_OK) break;
        going = next != now;
        for (size_t k = 0; going && k < count && status == TW_OK; k++)
            if (states[k] == next) status = report_circle(r, states, k, count);
        if (status == TW_OK && (count > ROUND_LIMIT || expr_size(next) > SIZE_LIMIT))
            status = engine_fail(r->e, ERROR_UNSUITABLE, "`repeat` does not come to an end: after %zu rounds the expression "
                                 "has %llu parts and still changes", count, (unsigned long long)expr_size(next));
        *after = next;
    }
    free(states);
    return status;
}

static tw_status run_then(runner *r, const runnable *p, expr *a, expr **after)
{
    *after = a;
    for (size_t k = 0; k < p->count; k++)
        if (run(r, p->parts[k], *after, after) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status run_or(runner *r, const runnable *p, expr *a, expr **after)
{
    *after = a;
    for (size_t k = 0; k < p->count && *after == a; k++)
        if (run(r, p->parts[k], a, after) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status run(runner *r, const runnable *p, expr *a, expr **after)
{
    if (!budget_ok(r->e)) return TW_ERROR;
    switch (p->kind) {
    case STRATEGY_RULE: return run_rules(r, p, a, false, after);
    case STRATEGY_STEP: return run_step(r, p->p->step, a, after);
    case STRATEGY_NAMED: break; /* left aside when made ready */
    case STRATEGY_REPEAT: return run_repeat(r, p, a, after);
    case STRATEGY_EVERYWHERE: return sweep(r, p, a, after);
    case STRATEGY_ONCE: return run_once(r, p, a, after);
    case STRATEGY_THEN: return run_then(r, p, a, after);
    case STRATEGY_OR: return run_or(r, p, a, after);
    }
    return engine_fail(r->e, ERROR_INTERNAL, "a pass of an unknown kind was run");
}

/* ---- the whole ---- */

void rewriting_init(rewriting *w)
{
    w->after = NULL;
    w->applied = false;
    derivation_init(&w->steps);
    conditions_init(&w->conditions);
}

void rewriting_clear(rewriting *w)
{
    derivation_clear(&w->steps);
    conditions_clear(&w->conditions);
    w->after = NULL;
}

/* One step for each rule and step that was used; the conditions of all. */
static void write_steps(runner *r, rewriting *out)
{
    for (size_t k = 0; k < r->used_count; k++) {
        const usage *u = &r->used[k];
        step *s = u->rule ? derivation_add(&out->steps, u->rule->name, u->rule->source)
                          : derivation_add(&out->steps, u->step->name, u->step->source);
        text detail;
        text_init(&detail);
        if (u->times > 1) text_addf(&detail, "used %zu times, first here", u->times);
        if (u->rule) text_addf(&detail, "%s%s", detail.length ? "; " : "", rule_status_word(u->rule->status));
        if (detail.length) s->detail = text_take(&detail);
        text_clear(&detail);
        s->before = u->before;
        s->after = u->after;
        conditions_append(&s->conditions, &u->conditions);
        conditions_append(&out->conditions, &u->conditions);
    }
}

void pass_forget(pass *p)
{
    if (p->ready) runnable_free(p->ready);
    p->ready = NULL;
}

tw_status pass_run(tw_engine *e, const pass *p, expr *subject, rewriting *out)
{
    if (!subject) return TW_ERROR;
    runner r = {.e = e};
    if (!p->ready) ((pass *)p)->ready = make_ready(e, p); /* the index of many rules is made once */
    struct facts *before = facts_copy(e);
    tw_status status = run(&r, p->ready, subject, &out->after);
    facts_restore(e, before);
    out->applied = status == TW_OK && out->after != subject;
    if (status == TW_OK) write_steps(&r, out);
    for (size_t k = 0; k < r.used_count; k++) conditions_clear(&r.used[k].conditions);
    free(r.used);
    free(r.memory);
    return status;
}
