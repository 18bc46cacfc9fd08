/* Canonical sums: flat, sorted, like terms collected, the number first. Its one idea: each term is a rational
 * coefficient times a rest; sorting by the rest puts like terms side by side, so n terms take n log n. */
#include "engine/expr/node.h"

#include <stdlib.h>

typedef struct term_part {
    expr *term;         /* as it came */
    expr *rest;         /* without its coefficient; NULL: the term itself is a number */
    bool has_number;    /* the term is args[0]*rest */
} term_part;

static size_t count_flat(expr *const *terms, size_t n)
{
    size_t count = 0;
    for (size_t k = 0; k < n; k++)
        count += terms[k]->kind == EXPR_SUM ? terms[k]->count : 1;
    return count;
}

static bool part_make(tw_engine *e, term_part *p, expr *term)
{
    *p = (term_part){term, term, false};
    if (term->kind == EXPR_NUMBER) {
        p->rest = NULL;
    } else if (term->kind == EXPR_PRODUCT && term->args[0]->kind == EXPR_NUMBER) {
        p->has_number = true;
        p->rest = term->count == 2 ? term->args[1] : node_make(e, EXPR_PRODUCT, 0, term->args + 1, term->count - 1);
        return p->rest != NULL;
    }
    return true;
}

static int part_compare(const void *a, const void *b)
{
    const term_part *p = a, *q = b;
    if (!p->rest || !q->rest)
        return (p->rest != NULL) - (q->rest != NULL);
    return expr_order(p->rest, q->rest);
}

static expr *part_coefficient(const term_part *p)
{
    return !p->rest ? p->term : p->has_number ? p->term->args[0] : NULL;
}

/* coefficient * rest, where the rest is no number and has no coefficient. */
static expr *term_make(tw_engine *e, const fmpq_t coefficient, expr *rest)
{
    expr *const pair[2] = {expr_fmpq(e, coefficient), rest};
    return pair[0] ? expr_product(e, pair, 2) : NULL;
}

static bool signs_differ(const term_part *parts, size_t n)
{
    bool up = false, down = false;
    for (size_t k = 0; k < n; k++) {
        expr *coefficient = part_coefficient(&parts[k]);
        bool negative = coefficient && fmpq_sgn(&coefficient->is.number) < 0;
        up = up || !negative;
        down = down || negative;
    }
    return up && down;
}

static expr *fail_inf_minus_inf(tw_engine *e)
{
    engine_fail(e, ERROR_VALUE, "inf - inf has no value");
    return NULL;
}

/* Merges parts[*k ...] with equal rest into one term (NULL rest: into the number). */
static expr *merge_run(tw_engine *e, const term_part *parts, size_t n, size_t *k)
{
    const term_part *first = &parts[(*k)++];
    if (*k == n || parts[*k].rest != first->rest)
        return first->term;
    fmpq_t total;
    fmpq_init(total);
    for (const term_part *p = first; p < parts + n && p->rest == first->rest; p++) {
        expr *coefficient = part_coefficient(p);
        if (coefficient)
            fmpq_add(total, total, &coefficient->is.number);
        else
            fmpz_add(fmpq_numref(total), fmpq_numref(total), fmpq_denref(total));
        *k = (size_t)(p - parts) + 1;
        if (!number_fits(total))
            break;
    }
    if (first->rest && signs_differ(first, (size_t)(parts + *k - first)) && first->rest->infinite) {
        fmpq_clear(total);
        return fail_inf_minus_inf(e);
    }
    expr *merged = !number_fits(total) ? fail_too_large(e)
                 : !first->rest || fmpq_is_zero(total) ? expr_fmpq(e, total)
                 : term_make(e, total, first->rest);
    fmpq_clear(total);
    return merged;
}

/* Infinite terms: inf swallows whatever is finite; inf - inf has no value. Writes the terms that stay. */
static expr *const *absorb_infinite(tw_engine *e, expr **terms, size_t *n)
{
    bool up = false, down = false;
    for (size_t k = 0; k < *n; k++) {
        up = up || expr_is_inf(terms[k]);
        down = down || expr_is_minus_inf(terms[k]);
    }
    if (!up && !down)
        return terms;
    if (up && down) {
        fail_inf_minus_inf(e);
        return NULL;
    }
    size_t kept = 0;
    for (size_t k = 0; k < *n; k++)
        if (terms[k]->infinite)
            terms[kept++] = terms[k];
    *n = kept;
    return terms;
}

static expr *sum_flat(tw_engine *e, expr *const *terms, size_t n)
{
    term_part *parts = engine_scratch(e, n, sizeof *parts);
    expr **merged = engine_scratch(e, n, sizeof *merged);
    size_t count = 0;
    for (size_t k = 0; k < n; k++)
        if (!part_make(e, &parts[k], terms[k]))
            return NULL;
    qsort(parts, n, sizeof *parts, part_compare);
    bool again = false;
    for (size_t k = 0; k < n;) {
        if (k % 1024 == 1023 && !budget_ok(e))
            return NULL;
        expr *term = merge_run(e, parts, n, &k);
        if (!term)
            return NULL;
        if (!expr_is_zero(term))
            merged[count++] = term;
        again = again || term->kind == EXPR_SUM;
    }
    if (again)
        return expr_sum(e, merged, count);
    if (!absorb_infinite(e, merged, &count))
        return NULL;
    if (count == 0)
        return expr_int(e, 0);
    return count == 1 ? merged[0] : node_make(e, EXPR_SUM, 0, merged, count);
}

expr *expr_sum(tw_engine *e, expr *const *terms, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!terms[k])
            return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    size_t count = count_flat(terms, n), at = 0;
    expr **flat = engine_scratch(e, count, sizeof *flat);
    for (size_t k = 0; k < n; k++) {
        expr *const *parts;
        size_t m = expr_terms(&terms[k], &parts);
        for (size_t j = 0; j < m; j++)
            flat[at++] = parts[j];
    }
    expr *sum = sum_flat(e, flat, count);
    arena_release(&e->scratch, mark);
    return sum;
}

expr *expr_add(tw_engine *e, expr *a, expr *b)
{
    expr *const pair[2] = {a, b};
    return expr_sum(e, pair, 2);
}

expr *expr_sub(tw_engine *e, expr *a, expr *b)
{
    return expr_add(e, a, expr_neg(e, b));
}

expr *expr_neg(tw_engine *e, expr *a)
{
    return a ? expr_mul(e, expr_int(e, -1), a) : NULL;
}
