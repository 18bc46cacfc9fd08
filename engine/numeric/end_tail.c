/* What lies next to a finite end at which the amplitude is singular, (1 - x)^(-1/2) or log(1 - x). One idea: no disc can reach such an
 * end, but the integral over the last part of the path is one that certified quadrature has; as a ball at one value of the scale,
 * and with the modulus for all greater ones, from where it falls at least like exp(-S t) of its nearer end. */
#include "engine/ball/decide.h"
#include "engine/ball/quadrature.h"
#include "engine/numeric/problem.h"

enum { TAIL_DIGITS = 10 };

bool problem_has_tail(const problem *p, arb_t t)
{
    bool any = false;
    for (size_t b = 0; b < p->sheet_count; b++) {
        const sheet *one = p->sheets + b;
        if (!one->tail_from)
            continue;
        if (!any || arf_cmp(arb_midref(one->end_t), arb_midref(t)) < 0)
            arb_set(t, one->end_t);
        any = true;
    }
    return any;
}

static expr *modulus_between(problem *p, expr *q, expr *from, expr *to)
{
    tw_engine *e = p->e;
    if (decide_positive_on(e, q, p->tail_x, from, to, true) == ANSWER_YES)
        return q;
    if (decide_positive_on(e, expr_neg(e, q), p->tail_x, from, to, true) == ANSWER_YES)
        return expr_neg(e, q);
    return expr_call1(e, FUNCTION_ABS, q);
}

bool problem_tail(arb_t out, problem *p, expr *S, bool positive)
{
    tw_engine *e = p->e;
    env none = {0};
    acb_t value;
    expr *sum = expr_int(e, 0);
    bool fine;
    for (size_t b = 0; b < p->sheet_count; b++) {
        const sheet *one = p->sheets + b;
        if (!one->tail_from)
            continue;
        expr *q = positive ? modulus_between(p, p->tail_q, one->tail_from, one->tail_to) : p->tail_q;
        expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, S, p->tail_p)));
        sum = expr_add(e, sum, expr_integral(e, p->tail_x, one->tail_from, one->tail_to, expr_mul(e, q, kernel)));
    }
    acb_init(value);
    fine = sum && quadrature(e, value, sum, &none, TAIL_DIGITS, true, NULL) == TW_OK && acb_is_finite(value) &&
           arb_contains_zero(acb_imagref(value));
    arb_set(out, acb_realref(value));
    if (!fine && e->error.kind != ERROR_TIME && e->error.kind != ERROR_MEMORY && e->error.kind != ERROR_INTERRUPT)
        engine_forgive(e);
    acb_clear(value);
    return fine;
}
