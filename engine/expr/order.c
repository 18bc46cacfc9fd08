/* The canonical total order of expressions. Knows nothing of meaning. Its one idea: a product is compared as the list
 * of its factors, a power as its base and then its exponent, a sum as the list of its terms, and a rational
 * coefficient only when all else is equal; so like terms and like factors stand side by side after sorting. Equal
 * pointers are equal, so at each level only the first pair that differs is entered: shared trees cost no more than
 * their depth. */
#include "engine/expr/node.h"

#include <string.h>

static int sign_of(int64_t difference)
{
    return (difference > 0) - (difference < 0);
}

static int order_lists(expr *const *a, size_t m, expr *const *b, size_t n)
{
    for (size_t k = 0; k < m && k < n; k++)
        if (a[k] != b[k])
            return expr_order(a[k], b[k]);
    return (m > n) - (m < n);
}

/* Factors without the rational coefficient; a number has none. */
static size_t factors_bare(expr *const *a, expr *const **parts)
{
    size_t n = expr_factors(a, parts);
    if (n && expr_is_number((*parts)[0])) {
        ++*parts;
        --n;
    }
    return n;
}

static int order_number_one(expr *a, bool a_is_one, expr *b, bool b_is_one)
{
    if (a_is_one && b_is_one)
        return 0;
    if (a_is_one)
        return b->kind == EXPR_NUMBER ? -fmpq_cmp_si(&b->is.number, 1) : -1;
    if (b_is_one)
        return a->kind == EXPR_NUMBER ? fmpq_cmp_si(&a->is.number, 1) : 1;
    return expr_order(a, b);
}

static int order_powers(expr *a, expr *b)
{
    expr *const base_a = a->kind == EXPR_POWER ? a->args[0] : a;
    expr *const base_b = b->kind == EXPR_POWER ? b->args[0] : b;
    if (base_a != base_b)
        return expr_order(base_a, base_b);
    return order_number_one(a->kind == EXPR_POWER ? a->args[1] : NULL, a->kind != EXPR_POWER,
                            b->kind == EXPR_POWER ? b->args[1] : NULL, b->kind != EXPR_POWER);
}

static int order_products(expr *a, expr *b)
{
    expr *const *factors_a, *const *factors_b;
    const size_t m = factors_bare(&a, &factors_a), n = factors_bare(&b, &factors_b);
    int order = order_lists(factors_a, m, factors_b, n);
    if (order)
        return order;
    expr *const number_a = a->kind == EXPR_PRODUCT ? a->args[0] : a;
    expr *const number_b = b->kind == EXPR_PRODUCT ? b->args[0] : b;
    const bool bare_a = number_a->kind != EXPR_NUMBER, bare_b = number_b->kind != EXPR_NUMBER;
    return order_number_one(number_a, bare_a, number_b, bare_b);
}

static int order_symbols(expr *a, expr *b)
{
    int order = strcmp(a->is.name, b->is.name);
    return order ? sign_of(order) : sign_of((int64_t)(a->serial - b->serial));
}

int expr_order(expr *a, expr *b)
{
    if (a == b)
        return 0;
    if (a->kind == EXPR_NUMBER && b->kind == EXPR_NUMBER)
        return fmpq_cmp(&a->is.number, &b->is.number);
    if (a->kind == EXPR_NUMBER || b->kind == EXPR_NUMBER)
        return a->kind == EXPR_NUMBER ? -1 : 1;
    if (a->kind == EXPR_PRODUCT || b->kind == EXPR_PRODUCT)
        return order_products(a, b);
    if (a->kind == EXPR_POWER || b->kind == EXPR_POWER)
        return order_powers(a, b);
    if (a->kind != b->kind)
        return sign_of((int64_t)a->kind - (int64_t)b->kind);
    switch (a->kind) {
    case EXPR_CONSTANT: return sign_of((int64_t)a->is.constant - (int64_t)b->is.constant);
    case EXPR_SYMBOL: return order_symbols(a, b);
    case EXPR_BOUND: return sign_of((int64_t)b->is.index - (int64_t)a->is.index); /* outer ones first */
    case EXPR_CALL:
        if (a->is.function != b->is.function)
            return sign_of((int64_t)a->is.function - (int64_t)b->is.function);
        break;
    case EXPR_RELATION:
        if (a->is.relation != b->is.relation)
            return sign_of((int64_t)a->is.relation - (int64_t)b->is.relation);
        break;
    default: break;
    }
    if (a->kind != EXPR_SUM && a->depth != b->depth) /* deep towers of calls are told apart at their tops */
        return sign_of((int64_t)a->depth - (int64_t)b->depth);
    return order_lists(a->args, a->count, b->args, b->count);
}
