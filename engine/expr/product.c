/* Canonical products: flat, sorted, like factors collected, the number first. Its one idea: each factor is a base with
 * an exponent; sorting by the base puts like factors side by side. What is collected is true for all complex values:
 * x^a * x^b = x^(a+b), exp(a*u) * exp(b*u) = exp((a+b)*u), and i is (-1)^(1/2). */
#include "engine/expr/node.h"

#include <stdlib.h>

typedef enum factor_class { CLASS_POWER, CLASS_NUMBER_TO_RATIONAL, CLASS_EXP } factor_class;

typedef struct factor_part {
    expr *factor;         /* as it came */
    expr *base;           /* of CLASS_EXP: u of exp(c*u) with rational c */
    factor_class group;
} factor_part;

typedef struct collection {
    fmpq_t number;        /* the rational coefficient */
    fmpq_t turn;          /* the factor (-1)^turn */
    factor_part *parts;
    size_t count;
    bool infinite;
} collection;

/* exp(c*u) for a sum that leads with a minus takes c = -1, so exp(x - y) and exp(y - x) meet. */
static expr *exp_base(tw_engine *e, expr *argument)
{
    if (argument->kind == EXPR_SUM)
        return expr_leads_negative(argument) ? expr_neg(e, argument) : argument;
    if (argument->kind == EXPR_NUMBER)
        return expr_int(e, 1);
    if (argument->kind == EXPR_PRODUCT && argument->args[0]->kind == EXPR_NUMBER)
        return argument->count == 2 ? argument->args[1]
                                    : node_make(e, EXPR_PRODUCT, 0, argument->args + 1, argument->count - 1);
    return argument;
}

static bool collect_factor(tw_engine *e, collection *c, expr *a)
{
    factor_part *p = &c->parts[c->count];
    *p = (factor_part){a, a, CLASS_POWER};
    if (a->kind == EXPR_NUMBER) {
        fmpq_mul(c->number, c->number, &a->is.number);
        if (number_fits(c->number))
            return true;
        fail_too_large(e);
        return false;
    }
    if (expr_is_constant(a, CONSTANT_I)) {
        fmpq_t half;
        fmpq_init(half);
        fmpq_set_si(half, 1, 2);
        fmpq_add(c->turn, c->turn, half);
        fmpq_clear(half);
        return true;
    }
    if (a->kind == EXPR_POWER) {
        p->base = a->args[0];
        if (a->args[0]->kind == EXPR_NUMBER && a->args[1]->kind == EXPR_NUMBER) {
            if (expr_is_int(a->args[0], -1)) {
                fmpq_add(c->turn, c->turn, &a->args[1]->is.number);
                return true;
            }
            p->group = CLASS_NUMBER_TO_RATIONAL;
        }
    } else if (expr_is_call(a, FUNCTION_EXP)) {
        p->group = CLASS_EXP;
        p->base = exp_base(e, a->args[0]);
    }
    c->infinite = c->infinite || expr_is_inf(a);
    c->count++;
    return p->base != NULL;
}

static int part_compare(const void *a, const void *b)
{
    const factor_part *p = a, *q = b;
    if (p->group != q->group)
        return (p->group > q->group) - (p->group < q->group);
    return expr_order(p->base, q->base);
}

static int factor_compare(const void *a, const void *b)
{
    return expr_order(*(expr *const *)a, *(expr *const *)b);
}

/* One factor for the run of n >= 2 parts with the same base. */
static expr *merge_run(tw_engine *e, const factor_part *parts, size_t n)
{
    expr **exponents = engine_scratch(e, n, sizeof *exponents);
    for (size_t k = 0; k < n; k++) {
        expr *a = parts[k].factor;
        exponents[k] = parts[k].group == CLASS_EXP ? a->args[0] : a == parts[k].base ? expr_int(e, 1) : a->args[1];
    }
    expr *exponent = expr_sum(e, exponents, n);
    if (parts[0].group == CLASS_EXP)
        return expr_call1(e, FUNCTION_EXP, exponent);
    return expr_pow(e, parts[0].base, exponent);
}

/* Can the merged factor still meet another one? A product has to be flattened, a number joins the coefficient, a power
 * of another base and exp join theirs. */
static bool is_settled(expr *merged, const factor_part *p)
{
    switch (merged->kind) {
    case EXPR_NUMBER: case EXPR_PRODUCT: return false;
    case EXPR_POWER: return merged->args[0] == p->base && p->group != CLASS_EXP;
    case EXPR_CONSTANT: return merged->is.constant != CONSTANT_I;
    case EXPR_CALL: return expr_is_call(merged, FUNCTION_EXP) == (p->group == CLASS_EXP);
    default: return merged == p->base && p->group == CLASS_POWER;
    }
}

/* The factors after merging, into fresh scratch; *again when one of them came out as something else than a power of its
 * base, so that the product has to be collected once more. */
static expr **merge_all(tw_engine *e, collection *c, size_t *count, bool *again)
{
    expr **merged = engine_scratch(e, c->count + 2, sizeof *merged);
    qsort(c->parts, c->count, sizeof *c->parts, part_compare);
    *count = 0;
    for (size_t k = 0, end; k < c->count; k = end) {
        for (end = k + 1; end < c->count && part_compare(&c->parts[k], &c->parts[end]) == 0;)
            end++;
        expr *factor = end == k + 1 ? c->parts[k].factor : merge_run(e, c->parts + k, end - k);
        if (!factor)
            return NULL;
        if (end > k + 1 && !is_settled(factor, &c->parts[k]))
            *again = true;
        merged[(*count)++] = factor;
    }
    return merged;
}

/* inf times positive constants is inf; a zero times inf has no value. */
static bool absorb_infinite(tw_engine *e, collection *c, expr **factors, size_t *count)
{
    if (fmpq_is_zero(c->number)) {
        engine_fail(e, ERROR_VALUE, "0*inf has no value");
        return false;
    }
    size_t kept = 0;
    for (size_t k = 0; k < *count; k++)
        if (!expr_is_positive_constant(factors[k]))
            factors[kept++] = factors[k];
    *count = kept;
    fmpq_set_si(c->number, fmpq_sgn(c->number), 1);
    return true;
}

static expr *negate_terms(tw_engine *e, expr *sum)
{
    expr **terms = engine_scratch(e, sum->count, sizeof *terms);
    for (size_t k = 0; k < sum->count; k++) {
        terms[k] = expr_neg(e, sum->args[k]);
        if (!terms[k])
            return NULL;
    }
    return expr_sum(e, terms, sum->count);
}

/* number and (-1)^turn times the settled factors. factors has room for two more. */
static expr *assemble(tw_engine *e, collection *c, expr **factors, size_t count)
{
    if (!fmpq_is_zero(c->turn)) {
        expr *turn = minus_one_power(e, c->turn), *rest = turn;
        if (!turn)
            return NULL;
        if (turn->kind == EXPR_NUMBER || turn->kind == EXPR_PRODUCT) { /* 1, -1, -i, -(-1)^r */
            expr *sign = turn->kind == EXPR_NUMBER ? turn : turn->args[0];
            rest = turn->kind == EXPR_NUMBER ? NULL : turn->args[1];
            fmpq_mul(c->number, c->number, &sign->is.number);
        }
        if (rest)
            factors[count++] = rest;
    }
    if (count == 0 || fmpq_is_zero(c->number))
        return expr_fmpq(e, c->number);
    if (count == 1 && fmpq_is_one(c->number))
        return factors[0];
    if (count == 1 && factors[0]->kind == EXPR_SUM && fmpq_equal_si(c->number, -1))
        return negate_terms(e, factors[0]);
    qsort(factors, count, sizeof *factors, factor_compare);
    if (fmpq_is_one(c->number))
        return node_make(e, EXPR_PRODUCT, 0, factors, count);
    expr **all = engine_scratch(e, count + 1, sizeof *all);
    all[0] = expr_fmpq(e, c->number);
    for (size_t k = 0; k < count; k++)
        all[k + 1] = factors[k];
    return all[0] ? node_make(e, EXPR_PRODUCT, 0, all, count + 1) : NULL;
}

/* Collects once more with the merged factors, the number and the turn. */
static expr *collect_again(tw_engine *e, collection *c, expr *const *factors, size_t count)
{
    expr **all = engine_scratch(e, count + 2, sizeof *all);
    for (size_t k = 0; k < count; k++)
        all[k] = factors[k];
    all[count] = expr_fmpq(e, c->number);
    all[count + 1] = minus_one_power(e, c->turn);
    return expr_product(e, all, count + 2);
}

static expr *product_collected(tw_engine *e, collection *c, expr *const *factors, size_t n)
{
    size_t flat = 0;
    for (size_t k = 0; k < n; k++)
        flat += factors[k]->kind == EXPR_PRODUCT ? factors[k]->count : 1;
    c->parts = engine_scratch(e, flat + 1, sizeof *c->parts);
    for (size_t k = 0; k < n; k++) {
        expr *const *parts;
        const size_t m = expr_factors(&factors[k], &parts);
        for (size_t j = 0; j < m; j++)
            if (!collect_factor(e, c, parts[j]))
                return NULL;
    }
    if (fmpq_is_zero(c->number) && !c->infinite)
        return expr_int(e, 0);
    size_t count;
    bool again = false;
    expr **merged = merge_all(e, c, &count, &again);
    if (!merged || !budget_ok(e))
        return NULL;
    if (again)
        return collect_again(e, c, merged, count);
    if (c->infinite && !absorb_infinite(e, c, merged, &count))
        return NULL;
    return assemble(e, c, merged, count);
}

expr *expr_product(tw_engine *e, expr *const *factors, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!factors[k])
            return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    collection c = {.count = 0};
    fmpq_init(c.number);
    fmpq_one(c.number);
    fmpq_init(c.turn);
    expr *product = product_collected(e, &c, factors, n);
    fmpq_clear(c.number);
    fmpq_clear(c.turn);
    arena_release(&e->scratch, mark);
    return product;
}

expr *expr_mul(tw_engine *e, expr *a, expr *b)
{
    expr *const pair[2] = {a, b};
    return expr_product(e, pair, 2);
}

expr *expr_div(tw_engine *e, expr *a, expr *b)
{
    return expr_mul(e, a, expr_pow(e, b, b ? expr_int(e, -1) : NULL));
}
