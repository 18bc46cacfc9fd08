/* The discrimination index. Knows compiled patterns, nothing of conditions. Its one idea: each rule is filed under one
 * way into its pattern that any subject must offer, such as "a product, one of whose factors is sin of a product with
 * the coefficient 17"; the ways form a tree, and a subject is walked along those ways only that some rule is filed
 * under. So the cost of a look-up is that of the ways shared, not that of the rules. */
#include "engine/rewrite/index.h"

#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/pattern_node.h"

/* Ways are followed so deep. */
enum { WAY_DEPTH = 10 };

typedef enum step_kind {
    WAY_HEAD,   /* the expression has this head: kind, tag, number of children; a leaf is the expression itself */
    WAY_CHILD,  /* its child number n */
    WAY_BODY,   /* the body of the binder, opened at level n */
    WAY_FACTOR, /* one of its factors; itself when it is no product */
    WAY_TERM    /* one of its terms */
} step_kind;

typedef struct way_step {
    step_kind kind;
    uint64_t head;     /* HEAD */
    uint32_t n;        /* CHILD, BODY */
} way_step;

typedef struct way_node {
    way_step step;             /* that led here */
    uint32_t *rules;           /* filed here, rising */
    size_t rule_count;
    uint32_t first, sibling;   /* children: a list of those that are no heads; 0: none */
} way_node;

/* Heads are found by a table: (node, head) to the child. */
typedef struct head_entry {
    uint64_t head;
    uint32_t from, to;         /* to 0: free */
} head_entry;

struct rule_index {
    tw_engine *e;
    way_node *nodes;           /* 0: the root */
    size_t count, room;
    head_entry *heads;
    size_t head_count, head_room;
    uint32_t *found;
    size_t found_count, found_room;
    uint64_t *marks;           /* a bit for each rule that is found already */
    size_t rules;
};

/* ---- heads ---- */

static uint64_t mixed(uint64_t a, uint64_t b)
{
    a = (a ^ b) * 0x9e3779b97f4a7c15u;
    return a ^ (a >> 31);
}

static uint64_t head_of(expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: case EXPR_SYMBOL: case EXPR_CONSTANT: case EXPR_BOUND: return mixed(mixed(a->kind, 1), a->serial);
    case EXPR_CALL: return mixed(mixed(a->kind, a->is.function + 2), a->count);
    case EXPR_RELATION: return mixed(mixed(a->kind, a->is.relation + 2), 2);
    case EXPR_POWER: return mixed(a->kind, 2);
    default: return mixed(mixed(a->kind, 2), a->count);
    }
}

/* ---- the tree ---- */

static size_t head_slot(const rule_index *x, uint32_t from, uint64_t head)
{
    size_t at = mixed(head, from) & (x->head_room - 1);
    while (x->heads[at].to && (x->heads[at].from != from || x->heads[at].head != head)) at = (at + 1) & (x->head_room - 1);
    return at;
}

static void heads_grow(rule_index *x)
{
    if ((x->head_count + 1) * 2 <= x->head_room) return;
    head_entry *old = x->heads;
    const size_t old_room = x->head_room;
    x->head_room = old_room ? 2 * old_room : 64;
    x->heads = base_alloc(x->head_room * sizeof *x->heads);
    memset(x->heads, 0, x->head_room * sizeof *x->heads);
    for (size_t k = 0; k < old_room; k++)
        if (old[k].to) x->heads[head_slot(x, old[k].from, old[k].head)] = old[k];
    free(old);
}

static uint32_t node_new(rule_index *x, way_step s)
{
    if (x->count == x->room) {
        x->room = x->room ? 2 * x->room : 64;
        x->nodes = base_resize(x->nodes, x->room * sizeof *x->nodes);
    }
    x->nodes[x->count] = (way_node){.step = s};
    return (uint32_t)x->count++;
}

static bool steps_equal(way_step a, way_step b)
{
    return a.kind == b.kind && a.head == b.head && a.n == b.n;
}

static uint32_t node_go(rule_index *x, uint32_t from, way_step s)
{
    if (s.kind == WAY_HEAD) {
        heads_grow(x);
        head_entry *entry = &x->heads[head_slot(x, from, s.head)];
        if (!entry->to) {
            *entry = (head_entry){s.head, from, node_new(x, s)};
            x->head_count++;
        }
        return entry->to;
    }
    for (uint32_t k = x->nodes[from].first; k; k = x->nodes[k].sibling)
        if (steps_equal(x->nodes[k].step, s)) return k;
    const uint32_t made = node_new(x, s);
    x->nodes[made].sibling = x->nodes[from].first;
    x->nodes[from].first = made;
    return made;
}

static void node_file(rule_index *x, uint32_t at, uint32_t number)
{
    way_node *n = &x->nodes[at];
    n->rules = base_resize(n->rules, (n->rule_count + 1) * sizeof *n->rules);
    n->rules[n->rule_count++] = number;
}

/* ---- the best way into a pattern ---- */

typedef struct way {
    way_step steps[WAY_DEPTH];
    size_t length;
    int worth;          /* how much it tells apart */
} way;

static void way_push(way *w, way_step s)
{
    if (w->length < WAY_DEPTH) w->steps[w->length++] = s;
}

static void way_keep(const way *w, way *best)
{
    if (w->worth > best->worth) *best = *w;
}

/* A fixed expression tells more the rarer it is. */
static int head_worth(expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: return fmpz_is_one(fmpq_denref(expr_number(a))) && fmpz_cmpabs(fmpq_numref(expr_number(a)),
                                                                                  fmpq_denref(expr_number(a))) <= 0 ? 1 : 5;
    case EXPR_CONSTANT: return 2;
    case EXPR_SYMBOL: return a->fresh ? 1 : 4;
    case EXPR_CALL: return a->is.function == FUNCTION_EXP ? 2 : 4;
    case EXPR_INTEGRAL: return 2;
    case EXPR_POWER: return 1;
    default: return 3;
    }
}

static void ways_fixed(expr *a, const way *so_far, way *best);
static void ways_of(const part *p, const way *so_far, way *best);

static bool has_room(const way *w)
{
    return w->length + 3 < WAY_DEPTH;
}

static way with_head(const way *w, expr *a)
{
    way next = *w;
    way_push(&next, (way_step){WAY_HEAD, head_of(a), 0});
    next.worth += head_worth(a);
    return next;
}

static way with_step(const way *w, step_kind kind, uint32_t n)
{
    way next = *w;
    way_push(&next, (way_step){kind, 0, n});
    return next;
}

/* Ways into an expression without variables: all of it must be there. */
static void ways_fixed(expr *a, const way *so_far, way *best)
{
    if (!has_room(so_far)) return;
    if (a->kind == EXPR_SUM || a->kind == EXPR_PRODUCT) { /* its terms lie among those of the subject, the number too */
        const way next = with_step(so_far, a->kind == EXPR_SUM ? WAY_TERM : WAY_FACTOR, 0);
        for (size_t k = 0; k < a->count; k++) {
            expr *piece = a->args[k];
            if (a->kind == EXPR_PRODUCT && piece->kind == EXPR_POWER) piece = piece->args[0];
            if (piece->kind != EXPR_NUMBER) ways_fixed(piece, &next, best);
        }
        return;
    }
    const way next = with_head(so_far, a);
    way_keep(&next, best);
    if (node_is_binder(a) || a->kind == EXPR_APPLY) return;
    for (size_t k = 0; k < a->count; k++) {
        const way inner = with_step(&next, WAY_CHILD, (uint32_t)k);
        ways_fixed(a->args[k], &inner, best);
    }
}

/* Must the pattern's number stand in the subject as it is? */
static bool number_is_fixed(const part *p)
{
    if (p->takers > 0) return false;
    return p->kind == PART_PRODUCT ? !fmpq_is_one(p->number) : !fmpq_is_zero(p->number);
}

/* Of a factor that is a power with a fixed exponent only the base counts: it may come out of a higher power. */
static void ways_factor(const part *p, bool product, const way *so_far, way *best)
{
    if (product && p->kind == PART_FIXED && p->form->kind == EXPR_POWER) ways_fixed(p->form->args[0], so_far, best);
    else if (product && p->kind == PART_POWER) ways_of(p->parts[0], so_far, best);
    else ways_of(p, so_far, best);
}

static void ways_group(const part *p, const way *so_far, bool whole, way *best)
{
    const way next = with_step(so_far, p->kind == PART_PRODUCT ? WAY_FACTOR : WAY_TERM, 0);
    for (size_t k = 0; k + p->takers < p->count; k++)
        if (!p->parts[k]->may_vanish) ways_factor(p->parts[k], p->kind == PART_PRODUCT, &next, best);
    if (!whole || !number_is_fixed(p)) return;
    for (size_t k = 0; k < p->form->count; k++)
        if (p->form->args[k]->kind == EXPR_NUMBER) {
            const way number = with_head(&next, p->form->args[k]);
            way_keep(&number, best);
        }
}

static void ways_of(const part *p, const way *so_far, way *best)
{
    if (!has_room(so_far)) return;
    switch (p->kind) {
    case PART_FIXED: ways_fixed(p->form, so_far, best); return;
    case PART_SUM: case PART_PRODUCT: ways_group(p, so_far, so_far->length > 0, best); return;
    case PART_POWER:
        if (p->parts[1]->kind != PART_FIXED) return; /* an exponent may be 1 or 0 */
        /* fall through */
    case PART_BINDER: case PART_OTHER: {
        const way next = with_head(so_far, p->form);
        way_keep(&next, best);
        for (size_t k = 0; k < p->count; k++) {
            const bool under = p->opened && node_child_is_under(p->form->kind, p->form->count, k);
            const way inner = with_step(&next, under ? WAY_BODY : WAY_CHILD, under ? p->level : (uint32_t)k);
            ways_of(p->parts[k], &inner, best);
        }
        return;
    }
    default: return;
    }
}

/* The steps after the last head tell nothing. */
static void file_rule(rule_index *x, const rule *r, uint32_t number)
{
    way start = {.length = 0}, best = {.length = 0, .worth = 0};
    ways_of(r->pattern->root, &start, &best);
    uint32_t at = 0;
    for (size_t k = 0; k < best.length; k++) at = node_go(x, at, best.steps[k]);
    node_file(x, at, number);
}

/* ---- look-up ---- */

static void found_push(rule_index *x, uint32_t number)
{
    if (x->marks[number / 64] >> (number % 64) & 1) return;
    x->marks[number / 64] |= (uint64_t)1 << (number % 64);
    x->found[x->found_count++] = number;
}

static void walk(rule_index *x, uint32_t at, expr *subject, expr *headed);

static void walk_parts(rule_index *x, uint32_t at, expr *subject, bool product)
{
    expr *const *parts;
    const size_t n = product ? expr_factors(&subject, &parts) : expr_terms(&subject, &parts);
    for (size_t k = 0; k < n; k++) {
        walk(x, at, parts[k], NULL);
        if (product && parts[k]->kind == EXPR_POWER) walk(x, at, parts[k]->args[0], NULL); /* a power may be split */
    }
}

/* The subject, which came along the way to `at`, goes on along all ways from there. headed: the expression whose head
 * was the last step, for its children. */
static void walk(rule_index *x, uint32_t at, expr *subject, expr *headed)
{
    const way_node *n = &x->nodes[at];
    for (size_t k = 0; k < n->rule_count; k++) found_push(x, n->rules[k]);
    for (uint32_t k = n->first; k; k = x->nodes[k].sibling) {
        const way_step s = x->nodes[k].step;
        if (s.kind == WAY_FACTOR) walk_parts(x, k, subject, true);
        else if (s.kind == WAY_TERM) walk_parts(x, k, subject, false);
        else if (headed && s.kind == WAY_CHILD && s.n < headed->count) walk(x, k, headed->args[s.n], NULL);
        else if (headed && s.kind == WAY_BODY) {
            expr *body = matching_open(x->e, headed, s.n);
            if (body) walk(x, k, body, NULL);
        }
    }
    if (headed || x->head_count == 0) return;
    const head_entry *entry = &x->heads[head_slot(x, at, head_of(subject))];
    if (entry->to) walk(x, entry->to, subject, subject);
}

static int by_number(const void *a, const void *b)
{
    const uint32_t x = *(const uint32_t *)a, y = *(const uint32_t *)b;
    return (x > y) - (x < y);
}

size_t index_find(rule_index *x, expr *subject, const uint32_t **list)
{
    for (size_t k = 0; k < x->found_count; k++) x->marks[x->found[k] / 64] = 0;
    x->found_count = 0;
    walk(x, 0, subject, NULL);
    if (x->found_count > 1) qsort(x->found, x->found_count, sizeof *x->found, by_number);
    *list = x->found;
    return x->found_count;
}

/* ---- life ---- */

rule_index *index_new(tw_engine *e, rule *const *rules, size_t count)
{
    rule_index *x = base_alloc(sizeof *x);
    memset(x, 0, sizeof *x);
    x->e = e;
    x->rules = count;
    x->found_room = count + 1;
    x->found = base_alloc(x->found_room * sizeof *x->found);
    x->marks = base_alloc((count / 64 + 1) * sizeof *x->marks);
    memset(x->marks, 0, (count / 64 + 1) * sizeof *x->marks);
    node_new(x, (way_step){WAY_HEAD, 0, 0});
    for (size_t k = 0; k < count; k++) file_rule(x, rules[k], (uint32_t)k);
    return x;
}

void index_free(rule_index *x)
{
    if (!x) return;
    for (size_t k = 0; k < x->count; k++) free(x->nodes[k].rules);
    free(x->nodes);
    free(x->heads);
    free(x->found);
    free(x->marks);
    free(x);
}
