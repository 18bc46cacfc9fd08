/* Questions about an expression that never fail, and its parts. Knows nothing of rewriting. */
#include "engine/expr/node.h"

#include <stdlib.h>
#include <string.h>

bool expr_is_number(expr *a)
{
    return a->kind == EXPR_NUMBER;
}

bool expr_is_int(expr *a, slong n)
{
    return a->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->is.number))
        && fmpz_equal_si(fmpq_numref(&a->is.number), n);
}

bool expr_is_zero(expr *a)
{
    return expr_is_int(a, 0);
}

bool expr_is_one(expr *a)
{
    return expr_is_int(a, 1);
}

bool expr_is_constant(expr *a, expr_constant c)
{
    return a->kind == EXPR_CONSTANT && a->is.constant == c;
}

bool expr_is_inf(expr *a)
{
    return expr_is_constant(a, CONSTANT_INF);
}

bool expr_is_minus_inf(expr *a)
{
    return a->kind == EXPR_PRODUCT && a->count == 2 && expr_is_int(a->args[0], -1) && expr_is_inf(a->args[1]);
}

bool expr_is_call(expr *a, function_id f)
{
    return a->kind == EXPR_CALL && a->is.function == f;
}

bool expr_is_closed_value(expr *a)
{
    return a->names == 0 && a->loose == 0;
}

const fmpq *expr_number(expr *a)
{
    return &a->is.number;
}

uint64_t expr_size(expr *a)
{
    return a->size;
}

const char *expr_binder_name(expr *binder)
{
    return binder->is.name;
}

size_t expr_terms(expr *const *a_address, expr *const **parts)
{
    expr *a = *a_address;
    *parts = a->kind == EXPR_SUM ? a->args : a_address;
    return a->kind == EXPR_SUM ? a->count : 1;
}

size_t expr_factors(expr *const *a_address, expr *const **parts)
{
    expr *a = *a_address;
    *parts = a->kind == EXPR_PRODUCT ? a->args : a_address;
    return a->kind == EXPR_PRODUCT ? a->count : 1;
}

void expr_as_power(tw_engine *e, expr *a, expr **base, expr **exponent)
{
    *base = a->kind == EXPR_POWER ? a->args[0] : a;
    *exponent = a->kind == EXPR_POWER ? a->args[1] : expr_int(e, 1);
}

void expr_as_coefficient(tw_engine *e, expr *a, fmpq_t coefficient, expr **rest)
{
    if (a->kind == EXPR_NUMBER) {
        fmpq_set(coefficient, &a->is.number);
        *rest = expr_int(e, 1);
    } else if (a->kind == EXPR_PRODUCT && a->args[0]->kind == EXPR_NUMBER) {
        fmpq_set(coefficient, &a->args[0]->is.number);
        *rest = a->count == 2 ? a->args[1] : node_make(e, EXPR_PRODUCT, 0, a->args + 1, a->count - 1);
    } else {
        fmpq_one(coefficient);
        *rest = a;
    }
}

/* ---- walks: a set of the nodes seen keeps shared trees linear ---- */

/* These walks have no engine, so their memory is their own: when it runs out, all of it is freed before the edge is
 * left. */
typedef struct seen {
    size_t count, room;
    expr **slots;
    bool out_of_memory;
} seen;

static void *array_grow(void *old, size_t count, size_t bytes_each)
{
    return edge_allocation_fails() || count > SIZE_MAX / bytes_each ? NULL : realloc(old, count * bytes_each);
}

static expr **seen_slot(expr **slots, size_t room, expr *a)
{
    size_t at = (a->hash ^ (uint32_t)(a->serial * 0x9e3779b9u)) & (room - 1);
    while (slots[at] && slots[at] != a)
        at = (at + 1) & (room - 1);
    return slots + at;
}

static bool seen_grow(seen *s)
{
    const size_t room = s->room ? s->room * 4 : 64;
    expr **slots = array_grow(NULL, room, sizeof *slots);
    if (!slots) {
        s->out_of_memory = true;
        return false;
    }
    memset(slots, 0, room * sizeof *slots);
    for (size_t k = 0; k < s->room; k++)
        if (s->slots[k])
            *seen_slot(slots, room, s->slots[k]) = s->slots[k];
    free(s->slots);
    s->slots = slots;
    s->room = room;
    return true;
}

/* False when it was there, or when memory is out. */
static bool seen_add(seen *s, expr *a)
{
    if ((s->count + 1) * 2 > s->room && !seen_grow(s))
        return false;
    expr **slot = seen_slot(s->slots, s->room, a);
    if (*slot)
        return false;
    *slot = a;
    s->count++;
    return true;
}

/* Small trees are searched without a set; visits counts down, and at 0 the search gives up. */
static int has_quick(expr *a, expr *symbol, int *visits)
{
    if (a == symbol)
        return 1;
    if ((a->names & symbol->names) == 0)
        return 0;
    if (--*visits <= 0)
        return -1;
    for (size_t k = 0; k < a->count; k++) {
        int found = has_quick(a->args[k], symbol, visits);
        if (found)
            return found;
    }
    return 0;
}

static bool has_walk(seen *s, expr *a, expr *symbol)
{
    if (a == symbol)
        return true;
    if ((a->names & symbol->names) == 0 || !seen_add(s, a))
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (has_walk(s, a->args[k], symbol))
            return true;
    return false;
}

bool expr_has(expr *a, expr *symbol)
{
    int visits = 200;
    int found = has_quick(a, symbol, &visits);
    if (found >= 0)
        return found;
    seen s = {0};
    bool has = has_walk(&s, a, symbol);
    free(s.slots);
    if (s.out_of_memory)
        edge_leave_memory();
    return has;
}

typedef struct symbol_list {
    seen seen;
    size_t count, room;
    expr **list;
} symbol_list;

static void symbols_walk(symbol_list *l, expr *a)
{
    if (a->names == 0 || !seen_add(&l->seen, a))
        return;
    if (a->kind == EXPR_SYMBOL) {
        if (l->count == l->room) {
            expr **list = array_grow(l->list, l->room * 2 + 4, sizeof *list);
            if (!list) {
                l->seen.out_of_memory = true;
                return;
            }
            l->list = list;
            l->room = l->room * 2 + 4;
        }
        l->list[l->count++] = a;
    }
    for (size_t k = 0; k < a->count && !l->seen.out_of_memory; k++)
        symbols_walk(l, a->args[k]);
}

static int symbol_compare(const void *a, const void *b)
{
    return expr_order(*(expr *const *)a, *(expr *const *)b);
}

size_t expr_symbols(expr *a, expr ***symbols)
{
    symbol_list l = {.room = 4, .list = array_grow(NULL, 4, sizeof(expr *))};
    l.seen.out_of_memory = !l.list;
    if (l.list)
        symbols_walk(&l, a);
    free(l.seen.slots);
    if (l.seen.out_of_memory) {
        free(l.list);
        edge_leave_memory();
    }
    qsort(l.list, l.count, sizeof *l.list, symbol_compare);
    *symbols = l.list;
    return l.count;
}

static void node_symbols_walk(memo *m, expr ***list, size_t *count, size_t *room, expr *a)
{
    if (a->names == 0 || memo_find(m, a, 0))
        return;
    memo_keep(m, a, 0, m);
    if (a->kind == EXPR_SYMBOL) {
        if (*count == *room) {
            expr **larger = engine_scratch(m->engine, *room * 2 + 8, sizeof *larger);
            if (*count)
                memcpy(larger, *list, *count * sizeof *larger);
            *list = larger;
            *room = *room * 2 + 8;
        }
        (*list)[(*count)++] = a;
    }
    for (size_t k = 0; k < a->count; k++)
        node_symbols_walk(m, list, count, room, a->args[k]);
}

size_t node_symbols(tw_engine *e, expr *a, expr ***symbols)
{
    memo m;
    size_t count = 0, room = 0;
    *symbols = NULL;
    if (a->names == 0)
        return 0;
    memo_init(&m, e);
    node_symbols_walk(&m, symbols, &count, &room, a);
    qsort(*symbols, count, sizeof **symbols, symbol_compare);
    return count;
}

/* ---- what the form alone tells ---- */

/* Larger trees are not looked through: shared parts could make that endless. */
enum { CONSTANT_SIZE_LIMIT = 2000 };

bool expr_is_real_constant(expr *a)
{
    if (a->names != 0 || a->loose != 0 || a->size > CONSTANT_SIZE_LIMIT)
        return false;
    switch (a->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_CONSTANT: return a->is.constant == CONSTANT_PI || a->is.constant == CONSTANT_EULER;
    case EXPR_SUM: case EXPR_PRODUCT:
        for (size_t k = 0; k < a->count; k++)
            if (!expr_is_real_constant(a->args[k]))
                return false;
        return true;
    case EXPR_POWER:
        if (!expr_is_real_constant(a->args[1]))
            return false;
        return expr_is_positive_constant(a->args[0]) ||
               (expr_is_real_constant(a->args[0]) && a->args[1]->kind == EXPR_NUMBER &&
                fmpz_is_one(fmpq_denref(&a->args[1]->is.number)));
    case EXPR_CALL:
        switch (a->is.function) {
        case FUNCTION_EXP: case FUNCTION_SIN: case FUNCTION_COS: case FUNCTION_SINH: case FUNCTION_COSH:
        case FUNCTION_TANH: case FUNCTION_ATAN: case FUNCTION_ASINH: case FUNCTION_ERF: case FUNCTION_ERFC:
            return expr_is_real_constant(a->args[0]);
        case FUNCTION_LOG: case FUNCTION_GAMMA: case FUNCTION_PSI: case FUNCTION_LNGAMMA:
            return expr_is_positive_constant(a->args[0]);
        default: return false;
        }
    default: return false;
    }
}

bool expr_is_positive_constant(expr *a)
{
    if (a->names != 0 || a->loose != 0 || a->size > CONSTANT_SIZE_LIMIT)
        return false;
    switch (a->kind) {
    case EXPR_NUMBER: return fmpq_sgn(&a->is.number) > 0;
    case EXPR_CONSTANT: return a->is.constant == CONSTANT_PI || a->is.constant == CONSTANT_EULER;
    case EXPR_SUM: case EXPR_PRODUCT:
        for (size_t k = 0; k < a->count; k++)
            if (!expr_is_positive_constant(a->args[k]))
                return false;
        return true;
    case EXPR_POWER: return expr_is_positive_constant(a->args[0]) && expr_is_real_constant(a->args[1]);
    case EXPR_CALL:
        if (a->is.function == FUNCTION_EXP || a->is.function == FUNCTION_COSH)
            return expr_is_real_constant(a->args[0]);
        return a->is.function == FUNCTION_GAMMA && expr_is_positive_constant(a->args[0]);
    default: return false;
    }
}

bool expr_leads_negative(expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: return fmpq_sgn(&a->is.number) < 0;
    case EXPR_PRODUCT: return expr_leads_negative(a->args[0]) && a->args[0]->kind == EXPR_NUMBER;
    case EXPR_SUM: return expr_leads_negative(a->args[a->args[0]->kind == EXPR_NUMBER]);
    default: return false;
    }
}
