/* Remainders that are known as integrals. One idea: such a remainder needs no theory of its own; at a point it is a number
 * that quadrature encloses, and for all values it is an integral with a large parameter, whose bound after no terms the
 * machine for remainders gives. */
#include "engine/numeric/split_off.h"

#include <stdlib.h>
#include <string.h>

#include "engine/method/method.h"
#include "engine/numeric/terms.h"

static bool is_fatal(const tw_engine *e)
{
    error_kind kind = e->error.kind;
    return kind == ERROR_TIME || kind == ERROR_MEMORY || kind == ERROR_INTERRUPT || kind == ERROR_INTERNAL;
}

/* ---- at a point ---- */

static tw_status dropped_at(tw_engine *e, arb_t sum, expansion *a, const env *at, slong terms, slong bits)
{
    term_table t;
    arb_zero(sum);
    if (terms_at(e, &t, a, at, FLINT_MAX(terms, a->terms_asked), true, bits) != TW_OK) return TW_ERROR;
    for (size_t b = 0; b < t.count; b++)
        for (slong k = terms; k < t.list[b].count; k++) arb_add(sum, sum, t.list[b].value + k, bits);
    terms_clear(&t);
    return TW_OK;
}

tw_status split_off_at(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits)
{
    enum { DIGITS = 8 };
    acb_t rest;
    acb_init(rest);
    out->label = LABEL_PROVED;
    tw_status status = dropped_at(e, out->error, a, at, terms, bits + 64);
    if (status == TW_OK && !expr_is_zero(a->remainder)) {
        status = quadrature(e, rest, a->remainder, at, DIGITS, true, NULL);
        if (status == TW_OK && !arb_contains_zero(acb_imagref(rest)))
            status = engine_fail(e, ERROR_UNSUITABLE, "the remainder is complex there");
        if (status == TW_OK) {
            arb_add(out->error, out->error, acb_realref(rest), bits + 64);
        } else if (!is_fatal(e)) {
            text words;
            text_init(&words);
            text_addf(&words, "the remainder integral could not be computed: %s", e->error.words);
            engine_forgive(e);
            out->reason = text_take(&words);
            out->label = LABEL_UNKNOWN;
            arb_indeterminate(out->error);
            status = TW_OK;
        }
    }
    acb_clear(rest);
    return status;
}

/* ---- for all values ---- */

static tw_status give_up(tw_engine *e, remainder_bound *out, const char *why)
{
    text words;
    text_init(&words);
    text_addf(&words, "no bound of the remainder integral for all %s is known (%s); at one value `evaluate` computes it",
              "values", why ? why : "");
    free(out->reason);
    out->reason = text_take(&words);
    out->label = LABEL_UNKNOWN;
    out->bound = NULL;
    engine_forgive(e);
    return TW_OK;
}

/* One remainder integral: bound and from are added to. */
static tw_status bound_part(tw_engine *e, remainder_bound *out, expansion *a, expr *part, const env *at, expr *s0)
{
    expansion whole;
    remainder_bound one;
    expansion_init(&whole);
    remainder_bound_init(&one);
    tw_status status = expand(e, &whole, part, 1, NULL);
    if (status == TW_OK) status = remainder_for_all(e, &one, &whole, at, 0, s0);
    if (status != TW_OK && !is_fatal(e)) {
        status = give_up(e, out, e->error.words);
    } else if (status == TW_OK && (!one.bound || one.label > LABEL_CONDITIONAL)) {
        status = give_up(e, out, one.reason ? one.reason : "the bound is not proved");
    } else if (status == TW_OK) {
        out->bound = expr_add(e, out->bound, one.bound);
        conditions_append(&out->conditions, &one.conditions);
        if (one.from && out->from && out->from != one.from) {
            expr *both[] = {out->from, one.from};
            out->from = expr_call(e, a->small ? FUNCTION_MIN : FUNCTION_MAX, both, 2);
        } else if (one.from) out->from = one.from;
        if (one.label > out->label) out->label = one.label;
    }
    remainder_bound_clear(&one);
    expansion_clear(&whole);
    return status;
}

/* The moduli of the terms that are not kept, as an expression. */
static tw_status add_dropped(tw_engine *e, remainder_bound *out, expansion *a, const env *at)
{
    for (size_t k = 0; k < a->contribution_count && out->bound; k++) {
        term *order = NULL;
        slong found = 0;
        if (expansion_order(e, a, k, a->terms_asked, &order, &found) != TW_OK) return TW_ERROR;
        for (slong n = out->terms; n < found; n++) {
            expr *one = expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, order[n]));
            out->bound = expr_add(e, out->bound, expr_call1(e, FUNCTION_ABS, put_values(e, one, at)));
        }
        free(order);
    }
    return TW_OK;
}

tw_status split_off_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *at, expr *s0)
{
    expr *rest = put_values(e, a->remainder, at);
    expr *const *parts;
    if (!rest) return TW_ERROR;
    size_t count = expr_is_zero(rest) ? 0 : expr_terms(&rest, &parts);
    out->bound = expr_int(e, 0);
    out->from = NULL;
    out->label = LABEL_PROVED;
    out->source = base_copy("the remainder integrals themselves, each bounded as a whole");
    tw_status status = TW_OK;
    for (size_t k = 0; k < count && status == TW_OK && out->bound; k++)
        status = budget_ok(e) ? bound_part(e, out, a, parts[k], at, s0) : TW_ERROR;
    if (status == TW_OK && out->bound) status = add_dropped(e, out, a, at);
    return status == TW_OK && e->error.kind != ERROR_NONE ? TW_ERROR : status;
}
