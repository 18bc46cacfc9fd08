/* An expression read as a polynomial in one symbol. Knows sums, products and natural powers; coefficients are expressions
 * free of the symbol. Its one idea: polynomials are arrays of coefficients, computed bottom-up and remembered by node. */
#include "engine/expr/node.h"

#include <stdlib.h>
#include <string.h>

typedef struct polynomial {
    slong degree;
    expr *c[];
} polynomial;

typedef struct polynomial_walk {
    tw_engine *engine;
    expr *symbol;
    slong limit;
    memo memo;
} polynomial_walk;

static polynomial *polynomial_new(polynomial_walk *w, slong degree)
{
    polynomial *p = engine_scratch(w->engine, 1, sizeof *p + ((size_t)degree + 1) * sizeof(expr *));
    p->degree = degree;
    for (slong k = 0; k <= degree; k++)
        p->c[k] = expr_int(w->engine, 0);
    return p;
}

static polynomial *polynomial_trim(polynomial *p)
{
    while (p->degree > 0 && expr_is_zero(p->c[p->degree]))
        p->degree--;
    return p;
}

static polynomial *polynomial_multiply(polynomial_walk *w, const polynomial *p, const polynomial *q)
{
    tw_engine *e = w->engine;
    if (p->degree + q->degree > w->limit)
        return NULL;
    polynomial *product = polynomial_new(w, p->degree + q->degree);
    expr **terms = engine_scratch(e, (size_t)FLINT_MIN(p->degree, q->degree) + 1, sizeof *terms);
    for (slong n = 0; n <= product->degree; n++) {
        size_t count = 0;
        for (slong k = FLINT_MAX(0, n - q->degree); k <= FLINT_MIN(n, p->degree); k++)
            terms[count++] = expr_mul(e, p->c[k], q->c[n - k]);
        product->c[n] = expr_sum(e, terms, count);
        if (!product->c[n] || !budget_ok(e))
            return NULL;
    }
    return product;
}

static polynomial *walk(polynomial_walk *w, expr *a);

static polynomial *walk_sum(polynomial_walk *w, expr *a)
{
    const polynomial **parts = engine_scratch(w->engine, a->count, sizeof *parts);
    expr **terms = engine_scratch(w->engine, a->count, sizeof *terms);
    slong degree = 0;
    for (size_t k = 0; k < a->count; k++) {
        parts[k] = walk(w, a->args[k]);
        if (!parts[k])
            return NULL;
        degree = FLINT_MAX(degree, parts[k]->degree);
    }
    polynomial *sum = polynomial_new(w, degree);
    for (slong n = 0; n <= degree; n++) {
        size_t count = 0;
        for (size_t k = 0; k < a->count; k++)
            if (n <= parts[k]->degree && !expr_is_zero(parts[k]->c[n]))
                terms[count++] = parts[k]->c[n];
        sum->c[n] = expr_sum(w->engine, terms, count);
        if (!sum->c[n])
            return NULL;
    }
    return polynomial_trim(sum);
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

static polynomial *walk_power(polynomial_walk *w, expr *a)
{
    if (a->args[1]->kind != EXPR_NUMBER || fmpq_sgn(&a->args[1]->is.number) < 0 ||
        !fmpz_is_one(fmpq_denref(&a->args[1]->is.number)) || fmpz_cmp_si(fmpq_numref(&a->args[1]->is.number), w->limit) > 0)
        return NULL;
    const polynomial *base = walk(w, a->args[0]);
    if (!base)
        return NULL;
    const slong n = fmpz_get_si(fmpq_numref(&a->args[1]->is.number));
    if (base->degree * n > w->limit)
        return NULL;
    polynomial *power = polynomial_new(w, 0);
    power->c[0] = expr_int(w->engine, 1);
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
    if (a == w->symbol && w->limit >= 1) {
        known = polynomial_new(w, 1);
        known->c[1] = expr_int(w->engine, 1);
    } else if (!expr_has(a, w->symbol)) {
        known = polynomial_new(w, 0);
        known->c[0] = a;
    } else {
        known = walk_kind(w, a);
    }
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
        polynomial_trim(p);
        *degree = p->degree;
        *coefficients = base_alloc(((size_t)p->degree + 1) * sizeof(expr *));
        memcpy(*coefficients, p->c, ((size_t)p->degree + 1) * sizeof(expr *));
    }
    arena_release(&e->scratch, mark);
    return p ? TW_OK : TW_ERROR;
}
