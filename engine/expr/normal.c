/* The normal form that methods start from, valid while the named symbols are positive (and under the given facts): one
 * exponential with its exponent expanded and collected in those symbols, powers and logarithms of positive factors
 * split. Each rewriting is an identity there: log(c*z) = log(c) + log(z), (c*z)^v = c^v * z^v and (c^u)^v = c^(u*v)
 * for c > 0 and real u, exp(c*log(u)) = u^c. */
#include "engine/expr/node.h"

#include <stdlib.h>
#include <string.h>

typedef struct normal_walk {
    tw_engine *engine;
    expr *const *positive;
    size_t count;
    memo memo;
} normal_walk;

static expr *normal(normal_walk *w, expr *a);

/* ---- questions ---- */

static bool is_real(normal_walk *w, expr *a);

static bool is_listed(const normal_walk *w, expr *a)
{
    for (size_t k = 0; k < w->count; k++)
        if (w->positive[k] == a)
            return true;
    return false;
}

static bool is_positive(normal_walk *w, expr *a)
{
    if (a->size > REAL_SIZE_LIMIT)
        return false;
    switch (a->kind) {
    case EXPR_SYMBOL: return is_listed(w, a) || facts_symbol_is_positive(w->engine, a);
    case EXPR_SUM: case EXPR_PRODUCT:
        for (size_t k = 0; k < a->count; k++)
            if (!is_positive(w, a->args[k]))
                return false;
        return true;
    case EXPR_POWER: return is_positive(w, a->args[0]) && is_real(w, a->args[1]);
    case EXPR_CALL:
        if (a->is.function == FUNCTION_EXP || a->is.function == FUNCTION_COSH)
            return is_real(w, a->args[0]);
        return a->is.function == FUNCTION_GAMMA && is_positive(w, a->args[0]);
    default: return expr_is_positive_constant(a);
    }
}

static bool is_real(normal_walk *w, expr *a)
{
    if (a->size > REAL_SIZE_LIMIT)
        return false;
    if (expr_is_real(w->engine, a, false) || is_positive(w, a))
        return true;
    if (a->kind == EXPR_CALL && a->is.function == FUNCTION_LOG)
        return is_positive(w, a->args[0]);
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT)
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (!is_real(w, a->args[k]))
            return false;
    return true;
}

/* ---- exponents ---- */

typedef struct collected {
    expr *monomial, *coefficient;
} collected;

static int compare_collected(const void *a, const void *b)
{
    const collected *p = a, *q = b;
    return expr_order(p->monomial, q->monomial);
}

/* term = monomial in the listed symbols * coefficient. */
static bool split_term(normal_walk *w, expr *term, collected *c)
{
    tw_engine *e = w->engine;
    expr *const *factors;
    const size_t n = expr_factors(&term, &factors);
    expr **inside = engine_scratch(e, n, sizeof *inside), **outside = engine_scratch(e, n, sizeof *outside);
    size_t in = 0, out = 0;
    for (size_t k = 0; k < n; k++) {
        if (is_listed(w, factors[k]) || (factors[k]->kind == EXPR_POWER && is_listed(w, factors[k]->args[0])))
            inside[in++] = factors[k];
        else
            outside[out++] = factors[k];
    }
    c->monomial = expr_product(e, inside, in);
    c->coefficient = expr_product(e, outside, out);
    return c->monomial && c->coefficient;
}

/* sum of coefficient * monomial with equal monomials brought together. */
static expr *collect_terms(normal_walk *w, expr *const *terms, size_t n)
{
    tw_engine *e = w->engine;
    collected *c = engine_scratch(e, n, sizeof *c);
    expr **parts = engine_scratch(e, n, sizeof *parts), **coefficients = engine_scratch(e, n, sizeof *coefficients);
    size_t count = 0;
    for (size_t k = 0; k < n; k++)
        if (!split_term(w, terms[k], &c[k]))
            return NULL;
    qsort(c, n, sizeof *c, compare_collected);
    for (size_t k = 0, end; k < n; k = end) {
        size_t same = 0;
        for (end = k; end < n && c[end].monomial == c[k].monomial; end++)
            coefficients[same++] = c[end].coefficient;
        parts[count++] = expr_mul(e, expr_sum(e, coefficients, same), c[k].monomial);
    }
    return expr_sum(e, parts, count);
}

/* c*log(u) of an exponent: base u and exponent c. */
static bool as_logarithm(normal_walk *w, expr *term, expr **power)
{
    tw_engine *e = w->engine;
    expr *const *factors;
    const size_t n = expr_factors(&term, &factors);
    size_t logs = 0, at = 0;
    for (size_t k = 0; k < n; k++)
        if (expr_is_call(factors[k], FUNCTION_LOG)) {
            logs++;
            at = k;
        }
    if (logs != 1)
        return false;
    expr **others = engine_scratch(e, n, sizeof *others);
    memcpy(others, factors, n * sizeof *others);
    others[at] = expr_int(e, 1);
    *power = expr_pow(e, factors[at]->args[0], expr_product(e, others, n));
    return true;
}

/* exp(argument): the exponent expanded and collected, its logarithms turned into powers. */
static expr *normal_exp(normal_walk *w, expr *argument)
{
    tw_engine *e = w->engine;
    expr *expanded = expr_expand(e, argument);
    if (!expanded)
        return NULL;
    expr *const *terms;
    const size_t n = expr_terms(&expanded, &terms);
    expr **left = engine_scratch(e, n, sizeof *left), **factors = engine_scratch(e, n + 1, sizeof *factors);
    size_t kept = 0, count = 0;
    for (size_t k = 0; k < n; k++) {
        if (as_logarithm(w, terms[k], &factors[count]))
            count++;
        else
            left[kept++] = terms[k];
    }
    factors[count++] = expr_call1(e, FUNCTION_EXP, collect_terms(w, left, kept));
    return expr_product(e, factors, count);
}

/* Several exponentials become one. */
static expr *merge_exponentials(normal_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    if (!a || a->kind != EXPR_PRODUCT)
        return a;
    expr **exponents = engine_scratch(e, a->count, sizeof *exponents);
    expr **others = engine_scratch(e, a->count, sizeof *others);
    size_t n = 0, m = 0;
    for (size_t k = 0; k < a->count; k++) {
        if (expr_is_call(a->args[k], FUNCTION_EXP))
            exponents[n++] = a->args[k]->args[0];
        else
            others[m++] = a->args[k];
    }
    if (n < 2)
        return a;
    others[m++] = normal_exp(w, expr_sum(e, exponents, n));
    return expr_product(e, others, m);
}

/* ---- powers and functions; the parts are normal already ---- */

static expr *normal_power(normal_walk *w, expr *base, expr *exponent)
{
    tw_engine *e = w->engine;
    if (!base || !exponent)
        return NULL;
    if (exponent->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&exponent->is.number)))
        return expr_pow(e, base, exponent);
    if (expr_is_call(base, FUNCTION_EXP) && is_real(w, base->args[0]))
        return normal_exp(w, expr_mul(e, base->args[0], exponent));
    if (base->kind == EXPR_POWER && is_positive(w, base->args[0]) && is_real(w, base->args[1]))
        return normal_power(w, base->args[0], expr_mul(e, base->args[1], exponent));
    if (base->kind != EXPR_PRODUCT)
        return expr_pow(e, base, exponent);
    expr **outside = engine_scratch(e, base->count + 1, sizeof *outside);
    expr **inside = engine_scratch(e, base->count, sizeof *inside);
    size_t out = 0, in = 0;
    for (size_t k = 0; k < base->count; k++) {
        if (is_positive(w, base->args[k]))
            outside[out++] = normal_power(w, base->args[k], exponent);
        else
            inside[in++] = base->args[k];
    }
    outside[out++] = in ? expr_pow(e, expr_product(e, inside, in), exponent) : expr_int(e, 1);
    return expr_product(e, outside, out);
}

static expr *normal_log(normal_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    if (expr_is_call(a, FUNCTION_EXP) && is_real(w, a->args[0]))
        return a->args[0];
    if (a->kind == EXPR_POWER && is_positive(w, a->args[0]) && is_real(w, a->args[1]))
        return expr_mul(e, a->args[1], normal_log(w, a->args[0]));
    if (a->kind != EXPR_PRODUCT)
        return expr_call1(e, FUNCTION_LOG, a);
    expr **logs = engine_scratch(e, a->count + 1, sizeof *logs), **inside = engine_scratch(e, a->count, sizeof *inside);
    size_t count = 0, in = 0;
    for (size_t k = 0; k < a->count; k++) {
        if (is_positive(w, a->args[k]))
            logs[count++] = normal_log(w, a->args[k]);
        else
            inside[in++] = a->args[k];
    }
    logs[count++] = in ? expr_call1(e, FUNCTION_LOG, expr_product(e, inside, in)) : expr_int(e, 0);
    return expr_sum(e, logs, count);
}

/* |u*v| = |u|*|v|, and the modulus of what is positive is itself. */
static expr *normal_abs(normal_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    expr *const *factors;
    const size_t n = expr_factors(&a, &factors);
    expr **moduli = engine_scratch(e, n, sizeof *moduli);
    for (size_t k = 0; k < n; k++)
        moduli[k] = is_positive(w, factors[k]) ? factors[k] : expr_call1(e, FUNCTION_ABS, factors[k]);
    return expr_product(e, moduli, n);
}

static expr *normal_call(normal_walk *w, function_id f, expr *const *args, size_t n)
{
    tw_engine *e = w->engine;
    switch (f) {
    case FUNCTION_EXP: return normal_exp(w, args[0]);
    case FUNCTION_LOG: return normal_log(w, args[0]);
    case FUNCTION_ABS: return normal_abs(w, args[0]);
    case FUNCTION_SIGN: return is_positive(w, args[0]) ? expr_int(e, 1) : expr_call(e, f, args, n);
    case FUNCTION_RE: case FUNCTION_CONJ: return is_real(w, args[0]) ? args[0] : expr_call(e, f, args, n);
    case FUNCTION_IM: return is_real(w, args[0]) ? expr_int(e, 0) : expr_call(e, f, args, n);
    case FUNCTION_ARG: return is_positive(w, args[0]) ? expr_int(e, 0) : expr_call(e, f, args, n);
    default: return expr_call(e, f, args, n);
    }
}

static expr *normal_node(normal_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    expr **args = engine_scratch(e, a->count, sizeof *args);
    for (size_t k = 0; k < a->count; k++) {
        args[k] = normal(w, a->args[k]);
        if (!args[k])
            return NULL;
    }
    switch (a->kind) {
    case EXPR_POWER: return merge_exponentials(w, normal_power(w, args[0], args[1]));
    case EXPR_CALL: return normal_call(w, a->is.function, args, a->count);
    case EXPR_PRODUCT: return merge_exponentials(w, expr_product(e, args, a->count));
    default: return expr_rebuild(e, a, args);
    }
}

static expr *normal(normal_walk *w, expr *a)
{
    if (a->count == 0)
        return a;
    expr *known = memo_find(&w->memo, a, 0);
    if (known)
        return known;
    if (!budget_ok(w->engine))
        return NULL;
    known = normal_node(w, a);
    if (known)
        memo_keep(&w->memo, a, 0, (void *)known);
    return known;
}

expr *expr_normal(tw_engine *e, expr *a, expr *const *positive, size_t n)
{
    if (!a)
        return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    normal_walk w = {.engine = e, .positive = positive, .count = n};
    memo_init(&w.memo, e);
    expr *result = normal(&w, a);
    arena_release(&e->scratch, mark);
    return result;
}
