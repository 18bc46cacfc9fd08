/* Multiplying out: products over sums, and natural powers of sums. Arguments of functions, denominators and what
 * stands under binders stay as they are. Its one idea: after each factor like terms are collected, so intermediate
 * results stay as small as the sum allows; a limit on the number of terms keeps a careless power from eating the
 * memory. */
#include "engine/expr/node.h"

#include <string.h>

enum { EXPAND_TERM_LIMIT = 1000000 };

typedef struct expand_walk {
    tw_engine *engine;
    memo memo;
} expand_walk;

static expr *expand(expand_walk *w, expr *a);

static bool is_natural(expr *exponent)
{
    return exponent->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&exponent->is.number)) &&
           fmpq_sgn(&exponent->is.number) > 0;
}

/* Has a product, made of parts that are expanded, a sum among its factors again? sqrt(x + y)*sqrt(x + y) does that. */
static bool is_expandable(expr *a)
{
    if (a->kind == EXPR_POWER)
        return a->args[0]->kind == EXPR_SUM && is_natural(a->args[1]);
    if (a->kind != EXPR_PRODUCT)
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (a->args[k]->kind == EXPR_SUM || is_expandable(a->args[k]))
            return true;
    return false;
}

static expr *multiply(expand_walk *w, expr *a, expr *b)
{
    tw_engine *e = w->engine;
    if (!a || !b)
        return NULL;
    expr *const *left, *const *right;
    const size_t m = expr_terms(&a, &left), n = expr_terms(&b, &right);
    if (m > EXPAND_TERM_LIMIT / n) {
        engine_fail(e, ERROR_VALUE, "multiplying out gives more than %d terms", EXPAND_TERM_LIMIT);
        return NULL;
    }
    expr **terms = engine_scratch(e, m * n, sizeof *terms);
    for (size_t j = 0; j < m; j++) {
        for (size_t k = 0; k < n; k++) {
            expr *term = expr_mul(e, left[j], right[k]);
            if (term && is_expandable(term))
                term = expand(w, term);
            if (!term || !budget_ok(e))
                return NULL;
            terms[j * n + k] = term;
        }
    }
    return expr_sum(e, terms, m * n);
}

/* (first + rest)^n by the binomial theorem; the powers of the rest are made one after the other. */
static expr *power_of_sum(expand_walk *w, expr *sum, ulong n)
{
    tw_engine *e = w->engine;
    if (n >= EXPAND_TERM_LIMIT) {
        engine_fail(e, ERROR_VALUE, "multiplying out gives more than %d terms", EXPAND_TERM_LIMIT);
        return NULL;
    }
    expr *first = sum->args[0], *rest = expr_sum(e, sum->args + 1, sum->count - 1), *rest_power = expr_int(e, 1);
    expr **terms = engine_scratch(e, n + 1, sizeof *terms);
    fmpz_t binomial;
    fmpz_init(binomial);
    fmpz_one(binomial);
    bool ok = rest != NULL;
    for (ulong k = 0; ok && k <= n; k++) {
        expr *const left[2] = {expr_fmpz(e, binomial), expr_pow(e, first, expr_int(e, (slong)(n - k)))};
        terms[k] = multiply(w, expr_product(e, left, 2), rest_power);
        rest_power = k == n ? rest_power
                   : rest->kind == EXPR_SUM ? multiply(w, rest_power, rest)
                   : expr_pow(e, rest, expr_int(e, (slong)k + 1));
        fmpz_mul_ui(binomial, binomial, n - k);
        fmpz_divexact_ui(binomial, binomial, k + 1);
        ok = terms[k] && rest_power && budget_ok(e);
    }
    fmpz_clear(binomial);
    return ok ? expr_sum(e, terms, n + 1) : NULL;
}

static expr *expand_power(expand_walk *w, expr *a)
{
    if (!is_natural(a->args[1]))
        return a;
    expr *base = expand(w, a->args[0]);
    if (!base || base->kind != EXPR_SUM)
        return expr_pow(w->engine, base, a->args[1]);
    if (!fmpz_abs_fits_ui(fmpq_numref(&a->args[1]->is.number)))
        return fail_too_large(w->engine);
    return power_of_sum(w, base, fmpz_get_ui(fmpq_numref(&a->args[1]->is.number)));
}

static expr *expand_product(expand_walk *w, expr *a)
{
    expr *product = expr_int(w->engine, 1);
    for (size_t k = 0; product && k < a->count; k++)
        product = multiply(w, product, expand(w, a->args[k]));
    return product;
}

static expr *expand_sum(expand_walk *w, expr *a)
{
    expr **terms = engine_scratch(w->engine, a->count, sizeof *terms);
    for (size_t k = 0; k < a->count; k++) {
        terms[k] = expand(w, a->args[k]);
        if (!terms[k])
            return NULL;
    }
    return expr_sum(w->engine, terms, a->count);
}

static expr *expand(expand_walk *w, expr *a)
{
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT && a->kind != EXPR_POWER)
        return a;
    expr *known = memo_find(&w->memo, a, 0);
    if (known)
        return known;
    expr *expanded = a->kind == EXPR_SUM ? expand_sum(w, a) : a->kind == EXPR_PRODUCT ? expand_product(w, a)
                                                                                      : expand_power(w, a);
    if (expanded)
        memo_keep(&w->memo, a, 0, (void *)expanded);
    return expanded;
}

expr *expr_expand(tw_engine *e, expr *a)
{
    if (!a)
        return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    expand_walk w = {.engine = e};
    memo_init(&w.memo, e);
    expr *expanded = expand(&w, a);
    arena_release(&e->scratch, mark);
    return expanded;
}
