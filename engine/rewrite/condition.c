/* Conditions of rules and passes. Knows facts and how to decide from them; nothing of rules. Its one idea: infinite
 * values are told apart before anything is computed with them. */
#include "engine/rewrite/condition.h"

#include "engine/ball/decide.h"

static bool is_infinite(expr *a)
{
    return expr_is_inf(a) || expr_is_minus_inf(a);
}

/* Of two sides one of which is inf or -inf at least: -1, 0, 1 by order; 2 when a side is not known to be real. */
static int infinite_order(tw_engine *e, expr *left, expr *right)
{
    condition_label label;
    const int l = expr_is_inf(left) ? 1 : expr_is_minus_inf(left) ? -1 : 0;
    const int r = expr_is_inf(right) ? 1 : expr_is_minus_inf(right) ? -1 : 0;
    if ((l == 0 && condition_of_real(e, left, &label) != ANSWER_YES) ||
        (r == 0 && condition_of_real(e, right, &label) != ANSWER_YES))
        return 2;
    return (l > r) - (l < r);
}

static answer answer_of(bool yes)
{
    return yes ? ANSWER_YES : ANSWER_NO;
}

static answer order_answer(expr_relation r, int order)
{
    switch (r) {
    case RELATION_LESS: return answer_of(order < 0);
    case RELATION_LESS_EQUAL: return answer_of(order <= 0);
    case RELATION_EQUAL: return answer_of(order == 0);
    case RELATION_NOT_EQUAL: return answer_of(order != 0);
    default: return ANSWER_NO; /* an infinite value is no integer, no number */
    }
}

answer condition_answer(tw_engine *e, expr *condition, condition_label *label)
{
    *label = CONDITION_PROVED;
    if (!condition) {
        if (e->error.kind == ERROR_VALUE) engine_forgive(e);
        return ANSWER_UNKNOWN;
    }
    expr *left = condition->args[0], *right = condition->args[1];
    const expr_relation r = condition->is.relation;
    if (is_infinite(left) || is_infinite(right)) {
        const int order = infinite_order(e, left, right);
        return order == 2 ? ANSWER_UNKNOWN : order_answer(r, order);
    }
    if (r <= RELATION_NOT_EQUAL && expr_is_number(left) && expr_is_number(right))
        return order_answer(r, fmpq_cmp(expr_number(left), expr_number(right)));
    return decide(e, condition, label);
}

answer condition_of_real(tw_engine *e, expr *value, condition_label *label)
{
    *label = CONDITION_PROVED;
    if (is_infinite(value) || expr_is_number(value)) return ANSWER_YES;
    return decide(e, expr_relation_of(e, RELATION_REAL, value, value), label);
}

/* ---- ranges ---- */

static void assume(tw_engine *e, expr_relation r, expr *left, expr *right)
{
    expr *fact = expr_relation_of(e, r, left, right);
    if (!fact || facts_add(e, fact, CONDITION_GIVEN) != TW_OK)
        if (e->error.kind == ERROR_VALUE) engine_forgive(e);
}

static void assume_between(tw_engine *e, expr_relation r, expr *from, expr *x, expr *to)
{
    if (!is_infinite(from)) assume(e, r, from, x);
    if (!is_infinite(to)) assume(e, r, x, to);
}

void condition_assume_range(tw_engine *e, expr *binder, expr *x)
{
    condition_label label;
    switch (binder->kind) {
    case EXPR_INTEGRAL: {
        expr *from = binder->args[0], *to = binder->args[1];
        if (condition_answer(e, expr_relation_of(e, RELATION_LESS, from, to), &label) == ANSWER_YES)
            assume_between(e, RELATION_LESS, from, x, to);
        else if (condition_answer(e, expr_relation_of(e, RELATION_LESS, to, from), &label) == ANSWER_YES)
            assume_between(e, RELATION_LESS, to, x, from);
        break;
    }
    case EXPR_SUMMATION:
        assume(e, RELATION_INTEGER, x, x);
        assume_between(e, RELATION_LESS_EQUAL, binder->args[0], x, binder->args[1]);
        break;
    default: assume(e, RELATION_COMPLEX, x, x);
    }
}
