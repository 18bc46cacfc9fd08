/* The table of nodes: every expression exists once, so equality is equality of pointers. Knows nothing of algebra. Its
 * one idea: a node is found by its content's hash, which is made of its children's hashes. */
#include "engine/expr/node.h"

#include <stdlib.h>
#include <string.h>

struct expr_table {
    size_t count, room; /* room is a power of two, at least twice count */
    expr **slots;
    uint64_t serial;
    struct number_list *numbers;
};

/* Numbers own an fmpq, which has to be cleared. */
struct number_list {
    expr_node *node;
    struct number_list *next;
};

static const uint64_t SIZE_CEILING = (uint64_t)1 << 63;

static uint64_t mix(uint64_t h, uint64_t value)
{
    h = (h ^ value) * 0x9e3779b97f4a7c15u;
    return h ^ (h >> 29);
}

void expr_table_init(tw_engine *e)
{
    struct expr_table *t = base_alloc(sizeof *t);
    *t = (struct expr_table){0};
    e->exprs = t; /* before the slots, so that a failure below leaks nothing */
    const size_t room = edge_counts_allocations() ? 4 : 4096;
    t->slots = base_alloc(room * sizeof *t->slots);
    memset(t->slots, 0, room * sizeof *t->slots);
    t->room = room;
}

void expr_table_clear(tw_engine *e)
{
    struct expr_table *t = e->exprs;
    if (!t)
        return;
    for (struct number_list *n = t->numbers; n; n = n->next)
        fmpq_clear(&n->node->is.number);
    free(t->slots);
    free(t);
    e->exprs = NULL;
}

static void table_grow(struct expr_table *t)
{
    if ((t->count + 1) * 2 <= t->room)
        return;
    const size_t room = t->room * 2;
    expr **slots = base_alloc(room * sizeof *slots);
    memset(slots, 0, room * sizeof *slots);
    for (size_t k = 0; k < t->room; k++) {
        if (!t->slots[k])
            continue;
        size_t at = t->slots[k]->hash & (room - 1);
        while (slots[at])
            at = (at + 1) & (room - 1);
        slots[at] = t->slots[k];
    }
    free(t->slots);
    t->slots = slots;
    t->room = room;
}

static void table_add(struct expr_table *t, expr *a)
{
    size_t at = a->hash & (t->room - 1);
    while (t->slots[at])
        at = (at + 1) & (t->room - 1);
    t->slots[at] = a;
    t->count++;
}

bool node_is_binder(expr *a)
{
    return a->kind == EXPR_INTEGRAL || a->kind == EXPR_CONTOUR || a->kind == EXPR_SUMMATION || a->kind == EXPR_ROOT;
}

bool node_child_is_under(expr_kind kind, size_t n, size_t k)
{
    switch (kind) {
    case EXPR_INTEGRAL: case EXPR_CONTOUR: case EXPR_SUMMATION: return k + 1 == n;
    case EXPR_ROOT: return k == 0;
    default: return false;
    }
}

/* A new node, not in the table yet; all fields that follow from the children are set. NULL when too deep. */
static expr_node *node_new(tw_engine *e, expr_kind kind, uint64_t hash, expr *const *args, size_t n)
{
    unsigned depth = 0;
    uint64_t size = 1, names = 0;
    uint32_t loose = 0;
    bool infinite = false;
    for (size_t k = 0; k < n; k++) {
        expr *child = args[k];
        uint32_t outside = child->loose;
        if (outside && node_child_is_under(kind, n, k))
            outside--;
        loose = outside > loose ? outside : loose;
        depth = child->depth > depth ? child->depth : depth;
        size = child->size >= SIZE_CEILING - size ? SIZE_CEILING : size + child->size;
        names |= child->names;
        infinite = infinite || child->infinite;
    }
    if (depth >= EXPR_DEPTH_LIMIT) {
        engine_fail(e, ERROR_VALUE, "the expression nests deeper than %d levels", EXPR_DEPTH_LIMIT);
        return NULL;
    }
    if (n > UINT32_MAX) {
        engine_fail(e, ERROR_MEMORY, "the expression has too many parts");
        return NULL;
    }
    expr_node *a = arena_alloc(&e->arena, sizeof *a + n * sizeof(expr *));
    memset(a, 0, sizeof *a);
    a->kind = (uint8_t)kind;
    a->depth = (uint16_t)(depth + 1);
    a->hash = (uint32_t)(hash ^ (hash >> 32));
    a->loose = loose;
    a->count = (uint32_t)n;
    a->serial = ++e->exprs->serial;
    a->size = size;
    a->names = names;
    a->infinite = infinite && (kind == EXPR_SUM || kind == EXPR_PRODUCT || kind == EXPR_POWER);
    for (size_t k = 0; k < n; k++)
        a->args[k] = args[k];
    return a;
}

static unsigned node_tag(expr *a)
{
    switch (a->kind) {
    case EXPR_CONSTANT: return a->is.constant;
    case EXPR_BOUND: return a->is.index;
    case EXPR_CALL: return a->is.function;
    case EXPR_RELATION: return a->is.relation;
    default: return 0;
    }
}

static void node_set_tag(expr_node *a, unsigned tag, const char *name)
{
    switch (a->kind) {
    case EXPR_CONSTANT: a->is.constant = tag; break;
    case EXPR_BOUND: a->is.index = tag; break;
    case EXPR_CALL: a->is.function = tag; break;
    case EXPR_RELATION: a->is.relation = tag; break;
    default: a->is.name = name; break;
    }
}

static expr *node_intern(tw_engine *e, expr_kind kind, unsigned tag, const char *name, expr *const *args, size_t n)
{
    struct expr_table *t = e->exprs;
    uint64_t hash = mix(mix(kind, tag), n);
    for (size_t k = 0; k < n; k++)
        hash = mix(hash, args[k]->hash);
    const uint32_t short_hash = (uint32_t)(hash ^ (hash >> 32));
    for (size_t at = short_hash & (t->room - 1); t->slots[at]; at = (at + 1) & (t->room - 1)) {
        expr *a = t->slots[at];
        if (a->hash == short_hash && a->kind == kind && a->count == n && node_tag(a) == tag &&
            (n == 0 || memcmp(a->args, args, n * sizeof *args) == 0))
            return a;
    }
    table_grow(t);
    expr_node *a = node_new(e, kind, hash, args, n);
    if (!a)
        return NULL;
    if (name)
        name = arena_copy(&e->arena, name, strlen(name));
    node_set_tag(a, tag, name);
    if (kind == EXPR_BOUND)
        a->loose = tag + 1;
    if (kind == EXPR_CONSTANT)
        a->infinite = tag == CONSTANT_INF;
    table_add(t, a);
    return a;
}

expr *node_make(tw_engine *e, expr_kind kind, unsigned tag, expr *const *args, size_t n)
{
    return node_intern(e, kind, tag, NULL, args, n);
}

expr *node_make_binder(tw_engine *e, expr_kind kind, const char *name, expr *const *args, size_t n)
{
    return node_intern(e, kind, 0, name, args, n);
}

expr *node_power(tw_engine *e, expr *base, expr *exponent)
{
    expr *const pair[2] = {base, exponent};
    if (!base || !exponent)
        return NULL;
    return node_make(e, EXPR_POWER, 0, pair, 2);
}

expr *node_bound(tw_engine *e, uint32_t index)
{
    return node_make(e, EXPR_BOUND, index, NULL, 0);
}

expr *expr_constant_of(tw_engine *e, expr_constant c)
{
    return node_make(e, EXPR_CONSTANT, c, NULL, 0);
}

/* ---- numbers ---- */

static uint64_t fmpz_hash(uint64_t hash, const fmpz_t n)
{
    if (!COEFF_IS_MPZ(*n))
        return mix(hash, (uint64_t)*n);
    const mpz_srcptr big = COEFF_TO_PTR(*n);
    hash = mix(hash, mpz_sgn(big) < 0);
    for (size_t k = 0; k < mpz_size(big); k++)
        hash = mix(hash, mpz_getlimbn(big, (mp_size_t)k));
    return hash;
}

bool number_fits(const fmpq_t q)
{
    return fmpz_bits(fmpq_numref(q)) <= NUMBER_BITS_LIMIT && fmpz_bits(fmpq_denref(q)) <= NUMBER_BITS_LIMIT;
}

expr *fail_too_large(tw_engine *e)
{
    engine_fail(e, ERROR_VALUE, "the number is too large: it has more than %d binary digits", NUMBER_BITS_LIMIT);
    return NULL;
}

expr *expr_fmpq(tw_engine *e, const fmpq_t q)
{
    struct expr_table *t = e->exprs;
    if (!number_fits(q))
        return fail_too_large(e);
    uint64_t hash = fmpz_hash(fmpz_hash(mix(EXPR_NUMBER, 1), fmpq_numref(q)), fmpq_denref(q));
    const uint32_t short_hash = (uint32_t)(hash ^ (hash >> 32));
    for (size_t at = short_hash & (t->room - 1); t->slots[at]; at = (at + 1) & (t->room - 1)) {
        expr *a = t->slots[at];
        if (a->hash == short_hash && a->kind == EXPR_NUMBER && fmpq_equal(&a->is.number, q))
            return a;
    }
    table_grow(t);
    struct number_list *item = arena_alloc(&e->arena, sizeof *item);
    expr_node *a = node_new(e, EXPR_NUMBER, hash, NULL, 0);
    if (!a)
        return NULL;
    fmpq_init(&a->is.number);
    *item = (struct number_list){a, t->numbers};
    t->numbers = item;
    fmpq_set(&a->is.number, q);
    table_add(t, a);
    return a;
}

expr *expr_fmpz(tw_engine *e, const fmpz_t n)
{
    fmpq_t q;
    fmpq_init(q);
    fmpz_set(fmpq_numref(q), n);
    expr *a = expr_fmpq(e, q);
    fmpq_clear(q);
    return a;
}

expr *expr_frac(tw_engine *e, slong p, slong q)
{
    if (q == 0) {
        engine_fail(e, ERROR_VALUE, "division by zero");
        return NULL;
    }
    fmpq_t value;
    fmpq_init(value);
    fmpz_set_si(fmpq_numref(value), p);
    fmpz_set_si(fmpq_denref(value), q);
    fmpq_canonicalise(value);
    expr *a = expr_fmpq(e, value);
    fmpq_clear(value);
    return a;
}

expr *expr_int(tw_engine *e, slong n)
{
    return expr_frac(e, n, 1);
}

/* ---- symbols ---- */

static uint64_t name_hash(const char *name)
{
    uint64_t hash = mix(EXPR_SYMBOL, 7);
    for (; *name; name++)
        hash = mix(hash, (unsigned char)*name);
    return hash;
}

static expr *symbol_new(tw_engine *e, const char *name, uint64_t hash)
{
    expr_node *a = node_new(e, EXPR_SYMBOL, hash, NULL, 0);
    if (!a)
        return NULL;
    a->is.name = arena_copy(&e->arena, name, strlen(name));
    a->names = (uint64_t)1 << (mix(hash, 3) >> 58);
    return a;
}

expr *expr_symbol(tw_engine *e, const char *name)
{
    struct expr_table *t = e->exprs;
    const uint64_t hash = name_hash(name);
    const uint32_t short_hash = (uint32_t)(hash ^ (hash >> 32));
    for (size_t at = short_hash & (t->room - 1); t->slots[at]; at = (at + 1) & (t->room - 1)) {
        expr *a = t->slots[at];
        if (a->hash == short_hash && a->kind == EXPR_SYMBOL && strcmp(a->is.name, name) == 0)
            return a;
    }
    table_grow(t);
    expr *a = symbol_new(e, name, hash);
    if (a)
        table_add(t, a);
    return a;
}

/* Not in the table: nothing typed or made later can be this symbol. */
expr *expr_fresh(tw_engine *e, const char *hint)
{
    expr_node *a = (expr_node *)symbol_new(e, hint, mix(name_hash(hint), e->exprs->serial));
    if (a)
        a->fresh = 1;
    return a;
}

/* ---- memo ---- */

struct memo_entry {
    expr *node;
    void *value;
    uint32_t level;
};

void memo_init(memo *m, tw_engine *e)
{
    *m = (memo){.engine = e, .room = 64};
    m->entries = engine_scratch(e, m->room, sizeof *m->entries);
    memset(m->entries, 0, m->room * sizeof *m->entries);
}

static struct memo_entry *memo_slot(struct memo_entry *entries, size_t room, expr *a, uint32_t level)
{
    size_t at = mix(a->hash + a->serial, level) & (room - 1);
    while (entries[at].node && (entries[at].node != a || entries[at].level != level))
        at = (at + 1) & (room - 1);
    return entries + at;
}

void *memo_find(const memo *m, expr *a, uint32_t level)
{
    return memo_slot(m->entries, m->room, a, level)->value;
}

void memo_keep(memo *m, expr *a, uint32_t level, void *value)
{
    if ((m->count + 1) * 2 > m->room) {
        const size_t room = m->room * 4;
        struct memo_entry *entries = engine_scratch(m->engine, room, sizeof *entries);
        memset(entries, 0, room * sizeof *entries);
        for (size_t k = 0; k < m->room; k++)
            if (m->entries[k].node)
                *memo_slot(entries, room, m->entries[k].node, m->entries[k].level) = m->entries[k];
        m->entries = entries;
        m->room = room;
    }
    struct memo_entry *slot = memo_slot(m->entries, m->room, a, level);
    if (!slot->node)
        m->count++;
    *slot = (struct memo_entry){a, value, level};
}
