/* An expression read as a polynomial in one symbol. Knows sums, products and natural powers; coefficients are
 * expressions free of the symbol. Its one idea: polynomials are lists of the terms that are there, rising in degree,
 * computed bottom-up and remembered by node. */
#include "engine/expr/node.h"

#include <stdlib.h>
#include <string.h>
#include <string.h>

typedef struct monomial {
    slong degree;
    expr *coefficient; /* free of the symbol, not 0 */
} monomial;

typedef struct polynomial {
    size_t count; /* 0: the zero polynomial */
    monomial terms[];
} polynomial;

typedef struct polynomial_walk {
    tw_engine *engine;
    expr *symbol;
    slong limit;
    memo memo;
} polynomial_walk;

static polynomial *walk(polynomial_walk *w, expr *a);

static polynomial *polynomial_new(polynomial_walk *w, size_t room)
{
    polynomial *p = engine_scratch(w->engine, 1, sizeof *p + room * sizeof *p->terms);
    p->count = 0;
    return p;
}

static polynomial *polynomial_of_term(polynomial_walk *w, slong degree, expr *coefficient)
{
    if (!coefficient)
        return NULL;
    polynomial *p = polynomial_new(w, 1);
    p->count = !expr_is_zero(coefficient);
    p->terms[0] = (monomial){degree, coefficient};
    return p;
}

static int compare_degrees(const void *a, const void *b)
{
    const monomial *p = a, *q = b;
    return (p->degree > q->degree) - (p->degree < q->degree);
}

/* Terms in any order, some of equal degree, become a polynomial. */
static polynomial *polynomial_collect(polynomial_walk *w, monomial *terms, size_t n)
{
    polynomial *p = polynomial_new(w, n);
    expr **same = engine_scratch(w->engine, n, sizeof *same);
    qsort(terms, n, sizeof *terms, compare_degrees);
    for (size_t k = 0, end; k < n; k = end) {
        size_t count = 0;
        for (end = k; end < n && terms[end].degree == terms[k].degree; end++)
            same[count++] = terms[end].coefficient;
        expr *sum = expr_sum(w->engine, same, count);
        if (!sum || !budget_ok(w->engine))
            return NULL;
        if (!expr_is_zero(sum))
            p->terms[p->count++] = (monomial){terms[k].degree, sum};
    }
    return p;
}

static polynomial *polynomial_multiply(polynomial_walk *w, const polynomial *p, const polynomial *q)
{
    monomial *terms = engine_scratch(w->engine, p->count * q->count, sizeof *terms);
    size_t count = 0;
    for (size_t j = 0; j < p->count; j++) {
        for (size_t k = 0; k < q->count; k++) {
            const slong degree = p->terms[j].degree + q->terms[k].degree;
            expr *coefficient = expr_mul(w->engine, p->terms[j].coefficient, q->terms[k].coefficient);
            if (!coefficient || degree > w->limit || !budget_ok(w->engine))
                return NULL;
            terms[count++] = (monomial){degree, coefficient};
        }
    }
    return polynomial_collect(w, terms, count);
}

static polynomial *walk_sum(polynomial_walk *w, expr *a)
{
    const polynomial **parts = engine_scratch(w->engine, a->count, sizeof *parts);
    size_t count = 0;
    for (size_t k = 0; k < a->count; k++) {
        parts[k] = walk(w, a->args[k]);
        if (!parts[k])
            return NULL;
        count += parts[k]->count;
    }
    monomial *terms = engine_scratch(w->engine, count, sizeof *terms);
    count = 0;
    for (size_t k = 0; k < a->count; k++)
        for (size_t j = 0; j < parts[k]->count; j++)
            terms[count++] = parts[k]->terms[j];
    return polynomial_collect(w, terms, count);
}

static polynomial *walk_product(polynomial_walk *w, expr *a)
{
    polynomial *product = walk(w, a->args[0]);
    for (size_t k = 1; product && k < a->count; k++) {
        const polynomial *factor = walk(w, a->args[k]);
        product = factor ? polynomial_multiply(w, product, factor) : NULL;
    }
    return product;
}

/* A natural power within the limit; -1 for anything else. */
static slong natural_exponent(const polynomial_walk *w, expr *exponent)
{
    if (exponent->kind != EXPR_NUMBER || !fmpz_is_one(fmpq_denref(&exponent->is.number)) ||
        fmpq_sgn(&exponent->is.number) < 0 || fmpz_cmp_si(fmpq_numref(&exponent->is.number), w->limit) > 0)
        return -1;
    return fmpz_get_si(fmpq_numref(&exponent->is.number));
}

static polynomial *walk_power(polynomial_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    const slong n = natural_exponent(w, a->args[1]);
    const polynomial *base = n < 0 ? NULL : walk(w, a->args[0]);
    if (!base || base->count == 0)
        return (polynomial *)base;
    if (base->terms[base->count - 1].degree > w->limit / n)
        return NULL;
    if (base->count == 1)
        return polynomial_of_term(w, base->terms[0].degree * n, expr_pow(e, base->terms[0].coefficient, a->args[1]));
    polynomial *power = polynomial_of_term(w, 0, expr_int(e, 1));
    for (slong k = 0; power && k < n; k++)
        power = polynomial_multiply(w, power, base);
    return power;
}

static polynomial *walk_kind(polynomial_walk *w, expr *a)
{
    switch (a->kind) {
    case EXPR_SUM: return walk_sum(w, a);
    case EXPR_PRODUCT: return walk_product(w, a);
    case EXPR_POWER: return walk_power(w, a);
    default: return NULL;
    }
}

/* NULL: no polynomial within the limit, or the engine's error is set. */
static polynomial *walk(polynomial_walk *w, expr *a)
{
    polynomial *known = memo_find(&w->memo, a, 0);
    if (known)
        return known;
    if (a == w->symbol)
        known = w->limit >= 1 ? polynomial_of_term(w, 1, expr_int(w->engine, 1)) : NULL;
    else
        known = expr_has(a, w->symbol) ? walk_kind(w, a) : polynomial_of_term(w, 0, a);
    if (known)
        memo_keep(&w->memo, a, 0, known);
    return known;
}

tw_status expr_polynomial(tw_engine *e, expr *a, expr *symbol, slong limit, expr ***coefficients, slong *degree)
{
    *coefficients = NULL;
    if (!a || !symbol)
        return TW_ERROR;
    const arena_place mark = arena_mark(&e->scratch);
    polynomial_walk w = {.engine = e, .symbol = symbol, .limit = limit};
    memo_init(&w.memo, e);
    polynomial *p = walk(&w, a);
    if (p) {
        const size_t count = p->count ? (size_t)p->terms[p->count - 1].degree + 1 : 1;
        expr **list = engine_scratch(e, count, sizeof *list);
        for (size_t n = 0; n < count; n++)
            list[n] = expr_int(e, 0);
        for (size_t n = 0; n < p->count; n++)
            list[p->terms[n].degree] = p->terms[n].coefficient;
        *degree = (slong)count - 1;
        *coefficients = base_alloc(count * sizeof *list); /* last: nothing after it can leave through the edge */
        memcpy(*coefficients, list, count * sizeof *list);
    }
    arena_release(&e->scratch, mark);
    return p ? TW_OK : TW_ERROR;
}
