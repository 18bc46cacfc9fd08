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
    return a->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->is.number)) && fmpz_equal_si(fmpq_numref(&a->is.number), n);
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

typedef struct seen {
    size_t count, room;
    expr **slots;
} seen;

static bool seen_add(seen *s, expr *a) /* false when it was there */
{
    if ((s->count + 1) * 2 > s->room) {
        seen larger = {0, s->room ? s->room * 4 : 64, NULL};
        larger.slots = base_alloc(larger.room * sizeof *larger.slots);
        memset(larger.slots, 0, larger.room * sizeof *larger.slots);
        for (size_t k = 0; k < s->room; k++)
            if (s->slots[k])
                seen_add(&larger, s->slots[k]);
        free(s->slots);
        *s = larger;
    }
    size_t at = (a->hash ^ (uint32_t)(a->serial * 0x9e3779b9u)) & (s->room - 1);
    for (; s->slots[at]; at = (at + 1) & (s->room - 1))
        if (s->slots[at] == a)
            return false;
    s->slots[at] = a;
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
    return has;
}

typedef struct symbol_list {
    size_t count, room;
    expr **list;
} symbol_list;

static void symbols_walk(seen *s, symbol_list *l, expr *a)
{
    if (a->names == 0 || !seen_add(s, a))
        return;
    if (a->kind == EXPR_SYMBOL) {
        if (l->count == l->room) {
            l->room = l->room * 2 + 4;
            l->list = base_resize(l->list, l->room * sizeof *l->list);
        }
        l->list[l->count++] = a;
    }
    for (size_t k = 0; k < a->count; k++)
        symbols_walk(s, l, a->args[k]);
}

static int symbol_compare(const void *a, const void *b)
{
    return expr_order(*(expr *const *)a, *(expr *const *)b);
}

size_t expr_symbols(expr *a, expr ***symbols)
{
    seen s = {0};
    symbol_list l = {0, 4, base_alloc(4 * sizeof(expr *))};
    symbols_walk(&s, &l, a);
    free(s.slots);
    qsort(l.list, l.count, sizeof *l.list, symbol_compare);
    *symbols = l.list;
    return l.count;
}

/* ---- what the form alone tells ---- */

bool expr_is_real_constant(expr *a)
{
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

bool expr_mentions_inf(expr *a)
{
    if (expr_is_inf(a))
        return true;
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT && a->kind != EXPR_POWER)
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (expr_mentions_inf(a->args[k]))
            return true;
    return false;
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
