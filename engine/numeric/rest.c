/* The part of the path that no dominant contribution's local form covers: lesser points, what lies beyond a hill. One idea: it is
 * an integral like any other, exponentially small, so certified quadrature bounds it: signed at one point; with moduli at the first
 * point of a range, from where it falls like exp(-scale * floor), since the phase is at least `floor` there. */
#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/terms.h"

enum { REST_DIGITS = 4, REST_BITS = 128 };

/* |f| on (0, end) without a kink where its sign is plain. */
static expr *modulus_on(tw_engine *e, expr *f, const branch *b)
{
    expr *zero = expr_int(e, 0);
    if (f && decide_positive_on(e, f, b->x, zero, b->end, true) == ANSWER_YES)
        return f;
    if (f && decide_positive_on(e, expr_neg(e, f), b->x, zero, b->end, true) == ANSWER_YES)
        return expr_neg(e, f);
    return expr_call1(e, FUNCTION_ABS, f);
}

/* The sum over the rest's branches of int q exp(-scale p), of |q| when `positive`; a value with everything put in. */
static tw_status rest_sum(tw_engine *e, arb_t out, expansion *a, const env *at, bool positive, bool *made)
{
    const local_form *l = &a->rest;
    env none = {0};
    acb_t value;
    expr *sum = expr_int(e, 0);
    tw_status status;
    *made = true;
    for (size_t k = 0; k < l->count; k++) {
        const branch *b = l->branches + k;
        branch here = {b->x, expr_is_inf(b->end) ? b->end : put_values(e, b->end, at), put_values(e, b->p, at),
                       put_values(e, b->q, at)};
        if (positive && here.q && here.end)
            here.q = modulus_on(e, here.q, &here);
        expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, put_values(e, l->scale, at), here.p)));
        sum = expr_add(e, sum, expr_integral(e, here.x, expr_int(e, 0), here.end, expr_mul(e, here.q, kernel)));
    }
    if (!sum)
        return TW_ERROR;
    acb_init(value);
    status = quadrature(e, value, sum, &none, REST_DIGITS, true, NULL);
    arb_set(out, acb_realref(value));
    *made = status == TW_OK && arb_is_finite(out) && arb_contains_zero(acb_imagref(value));
    if (status != TW_OK && e->error.kind != ERROR_TIME && e->error.kind != ERROR_INTERRUPT && e->error.kind != ERROR_MEMORY) {
        engine_forgive(e);
        arb_zero(out);
        status = TW_OK;
    }
    acb_clear(value);
    return status;
}

tw_status rest_at(tw_engine *e, arb_t out, expansion *a, const env *at, bool *made)
{
    arb_t factor;
    tw_status status = rest_sum(e, out, a, at, false, made);
    arb_init(factor);
    if (status == TW_OK)
        status = real_ball(e, factor, put_values(e, a->rest.factor, at), REST_BITS);
    arb_mul(out, out, factor, REST_BITS);
    arb_clear(factor);
    return status;
}

tw_status rest_modulus(tw_engine *e, arb_t C, expansion *a, const env *at, bool *made)
{
    tw_status status = rest_sum(e, C, a, at, true, made);
    arb_abs(C, C);
    return status;
}
