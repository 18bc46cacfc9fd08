/* Numbers of combined expansions. One idea: the parts' balls enclose the integrals, and the same arithmetic on the balls encloses
 * the combination: what is proved of the parts is proved of it. */
#include <stdlib.h>

#include "engine/method/combine.h"
#include "engine/numeric/evaluate.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/terms.h"

tw_status combined_number(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o)
{
    struct combination *c = a->combined;
    acb_ptr balls = _acb_vec_init((slong)c->count);
    evaluate_options part = {.digits = o->digits > 0 ? o->digits + 3 : 0, .terms = -1};
    tw_status status = TW_OK;
    slong bits = 256 + 4 * o->digits;
    out->label = LABEL_EXACT;
    for (size_t k = 0; k < c->count && status == TW_OK; k++) {
        number one;
        number_init(&one);
        status = evaluate_expansion(e, &one, c->leaves + k, at, &part);
        if (status == TW_OK) {
            acb_set(balls + k, one.value);
            out->label = FLINT_MAX(out->label, one.label);
            if (one.reason && !out->reason)
                out->reason = base_copy(one.reason);
            conditions_append(&out->conditions, &one.conditions);
        }
        number_clear(&one);
    }
    if (status == TW_OK) {
        expr *form = put_values(e, c->form, at);
        tape *t = form ? tape_new(e, form, c->symbols, c->count) : NULL;
        if (t)
            tape_eval(out->value, t, balls, false, bits);
        else
            status = TW_ERROR;
        tape_free(t);
        if (status == TW_OK && !acb_is_finite(out->value))
            status = engine_fail(e, ERROR_PRECISION, "the parts' enclosures are too wide there to be combined");
        if (out->label == LABEL_EXACT)
            out->label = LABEL_PROVED; /* the value is a ball all the same */
    }
    _acb_vec_clear(balls, (slong)c->count);
    return status;
}

tw_status combined_error(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits)
{
    number n;
    term_table t;
    evaluate_options best = {.terms = -1};
    tw_status status;
    number_init(&n);
    status = combined_number(e, &n, a, at, &best);
    if (status == TW_OK)
        status = terms_at(e, &t, a, at, terms, false, bits + 64);
    if (status == TW_OK) {
        arb_set(out->error, acb_realref(n.value));
        for (size_t b = 0; b < t.count; b++)
            for (slong k = 0; k < terms && k < t.list[b].count; k++)
                arb_sub(out->error, out->error, t.list[b].value + k, bits + 64);
        terms_clear(&t);
        out->label = n.label;
        if (n.reason)
            out->reason = base_copy(n.reason);
        conditions_append(&out->conditions, &n.conditions);
        if (!arb_contains_zero(acb_imagref(n.value)))
            status = engine_fail(e, ERROR_UNAVAILABLE, "the combination is complex there");
    }
    number_clear(&n);
    return status;
}
