/* growth of A: the form of the coefficients for large n, where the least term lies and how small the error can become. Draws no
 * mathematics of its own: the engine found it. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/exact/large_order.h"
#include "engine/export/format.h"
#include "engine/method/attach.h"
#include "lang/describe.h"
#include "lang/request.h"

/* ---- words ---- */

/* "K", or "K_2" where there are several parts. */
static void add_name(text *t, const char *name, const large_order *g, size_t k)
{
    text_add(t, name);
    if (g->count > 1) text_addf(t, "_%zu", k + 1);
}

static void add_expr(session *s, text *t, expr *a)
{
    if (a) expr_print(s->e, t, a);
}

/* "c[n] ~ K * Gamma(2*n + 1/2) / F^n" */
static void add_form(session *s, text *t, const large_order *g, expr *n)
{
    text_addf(t, "c[%s] ~ ", n->is.name);
    for (size_t k = 0; k < g->count; k++) {
        const large_order_part *one = &g->parts[k];
        if (k) text_add(t, " + ");
        add_name(t, "K", g, k);
        if (g->m > 0) {
            text_add(t, " * Gamma(");
            add_expr(s, t, expr_add(s->e, expr_mul(s->e, expr_int(s->e, g->m), n), one->b));
            text_add(t, ")");
        } else if (!expr_is_zero(one->b)) {
            text_addf(t, " * %s^(", n->is.name);
            add_expr(s, t, one->b);
            text_add(t, ")");
        }
        text_add(t, " / ");
        add_name(t, "F", g, k);
        text_addf(t, "^%s", n->is.name);
    }
}

/* The estimate with the digits that its spread leaves. */
static void add_estimate(session *s, text *t, const large_order_part *one)
{
    acb_t z;
    mag_t spread;
    acb_init(z);
    mag_init(spread);
    mag_set_d(spread, one->spread);
    acb_set(z, one->value);
    acb_get_mid(z, z);
    arb_add_error_mag(acb_realref(z), spread);
    if (arb_contains_zero(acb_imagref(one->value)) ||
        fabs(arf_get_d(arb_midref(acb_imagref(one->value)), ARF_RND_NEAR)) <= one->spread)
        arb_zero(acb_imagref(z));
    else arb_add_error_mag(acb_imagref(z), spread);
    describe_value(t, z, s->digits);
    acb_clear(z);
    mag_clear(spread);
}

static void tell_part(session *s, result *r, const large_order *g, size_t k)
{
    const large_order_part *one = &g->parts[k];
    text t;
    text_init(&t);
    text_add(&t, "  ");
    add_name(&t, "F", g, k);
    text_add(&t, " = ");
    add_expr(s, &t, one->f);
    text_add(&t, one->k ? ", " : " (exact), ");
    add_name(&t, "K", g, k);
    text_add(&t, " = ");
    if (one->k) add_expr(s, &t, one->k);
    else add_estimate(s, &t, one);
    if (!one->k) text_add(&t, " (estimated by Richardson's method)");
    result_line(r, "%s", t.bytes);
    text_clear(&t);
}

/* ---- the least term ---- */

/* s^(-step/m) */
static expr *reach_power(session *s, const expansion *a, const lane *l, const large_order *g)
{
    fmpq_t power;
    fmpq_init(power);
    fmpq_neg(power, l->step);
    fmpz_mul_si(fmpq_denref(power), fmpq_denref(power), g->m);
    fmpq_canonicalise(power);
    expr *made = expr_pow(s->e, a->large, expr_fmpq(s->e, power));
    fmpq_clear(power);
    return made;
}

/* (|F| s^-step)^(1/m)/divisor: the terms fall until m n is about that. A rounded |F| is shown as a decimal. */
static void add_reach(session *s, text *t, const expansion *a, const lane *l, const large_order *g, slong divisor)
{
    tw_engine *e = s->e;
    expr *power = reach_power(s, a, l, g);
    expr *front = expr_div(e, expr_pow(e, g->distance, expr_frac(e, 1, g->m)), expr_int(e, divisor));
    acb_t z;
    acb_init(z);
    if (power && front && g->rounded && ball_value(e, z, front, 64) == TW_OK) {
        char *words = arb_get_str(acb_realref(z), 6, ARB_STR_NO_RADIUS);
        text_addf(t, "%s*", words);
        flint_free(words);
        add_expr(s, t, power);
    } else {
        add_expr(s, t, front && power ? expr_mul(e, front, power) : NULL);
    }
    acb_clear(z);
}

/* before: how the line begins. */
static void tell_least(session *s, result *r, const expansion *a, const lane *l, const large_order *g, const char *before)
{
    if (g->m == 0) {
        result_line(r, "  the series converges where the terms fall: there is no least one");
        return;
    }
    text t;
    text_init(&t);
    text_addf(&t, "  %s near n = ", before);
    add_reach(s, &t, a, l, g, g->m);
    text_add(&t, "; the error there is about exp(-");
    add_reach(s, &t, a, l, g, 1);
    text_add(&t, ")");
    result_line(r, "%s", t.bytes);
    text_clear(&t);
}

/* ---- one lane ---- */

static void add_object(session *s, text *json, const lane *l, const large_order *g, const char *form)
{
    json_next(json);
    text_add(json, "{\"constant\": ");
    json_expr(s->e, json, l->constant);
    text_add(json, ", \"form\": ");
    json_string(json, form);
    text_addf(json, ", \"label\": \"%s\", \"m\": %ld, \"parts\": [", g->exact ? "proved" : "estimated", (long)g->m);
    for (size_t k = 0; k < g->count; k++) {
        const large_order_part *one = &g->parts[k];
        text_add(json, k ? ", {\"F\": " : "{\"F\": ");
        json_expr(s->e, json, one->f);
        text_add(json, ", \"b\": ");
        json_expr(s->e, json, one->b);
        text_add(json, ", \"K\": ");
        if (one->k) {
            json_expr(s->e, json, one->k);
        } else {
            text t;
            text_init(&t);
            add_estimate(s, &t, one);
            json_string(json, t.bytes);
            text_clear(&t);
        }
        text_add_char(json, '}');
    }
    text_add(json, "]}");
}

static tw_status tell_growth(session *s, result *r, text *json, const expansion *a, const lane *l, const large_order *g,
                             const recurrence *known)
{
    text t;
    text_init(&t);
    add_form(s, &t, g, known->n);
    bool sure = g->exact && known->label == RECURRENCE_PROVED;
    result_labelled(r, t.bytes, sure ? "proved" : "estimated", NULL);
    for (size_t k = 0; k < g->count; k++) tell_part(s, r, g, k);
    if (known->label == RECURRENCE_FITTED) result_line(r, "  from a recurrence that is fitted, not proved");
    tell_least(s, r, a, l, g, "least term");
    add_object(s, json, l, g, t.bytes);
    text_clear(&t);
    return s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* The recurrence behind it, NULL with the reason in *why when there is none. */
static tw_status find_recurrence(session *s, const expansion *a, contribution *c, const lane *l, const recurrence **known,
                                 char **why)
{
    *known = NULL;
    if (c->terminates) {
        *why = base_copy("the coefficients end");
        return TW_OK;
    }
    if (lane_recurrence(s->e, c, l, a->large, known) == TW_OK) return TW_OK;
    if (s->e->error.kind != ERROR_UNSUITABLE) return TW_ERROR;
    *why = base_copy(s->e->error.words);
    engine_forgive(s->e);
    return lane_recurrence_fitted(s->e, c, l, a->large, a->small, known);
}

static tw_status find_growth(session *s, large_order *g, const lane *l, const recurrence *known)
{
    expr **c = base_alloc((size_t)(l->c.count + 1) * sizeof *c);
    bool good = true;
    for (slong n = 0; n < l->c.count && good; n++) good = (c[n] = coefficient_expr(s->e, &l->c, n)) != NULL;
    tw_status status = good ? large_order_find(s->e, g, known, c, l->c.count) : TW_ERROR;
    free(c);
    return status;
}

/* *why is left with a reason when the form cannot be had. */
static tw_status tell_lane(session *s, result *r, text *json, expansion *a, contribution *c, size_t k, bool title,
                           char **why)
{
    const recurrence *known;
    if (title) describe_lane_title(s, r, a, c, &c->lanes[k]);
    if (find_recurrence(s, a, c, &c->lanes[k], &known, why) != TW_OK) return TW_ERROR;
    if (!known) return TW_OK;
    free(*why);
    *why = NULL;
    slong wanted = FLINT_MAX(known->needed, FLINT_MAX(known->order, 16)) + 1;
    if (c->lanes[k].c.count < wanted && expansion_extend(s->e, a, wanted * (slong)c->lane_count) != TW_OK) return TW_ERROR;
    large_order g;
    large_order_init(&g);
    tw_status status = find_growth(s, &g, &c->lanes[k], known);
    if (status == TW_OK) status = tell_growth(s, r, json, a, &c->lanes[k], &g, known);
    large_order_clear(&g);
    if (status == TW_OK || s->e->error.kind != ERROR_UNSUITABLE) return status;
    *why = base_copy(s->e->error.words);
    engine_forgive(s->e);
    return TW_OK;
}

static tw_status tell_all(session *s, result *r, expansion *a)
{
    text json;
    text_init(&json);
    text_add_char(&json, '[');
    size_t lanes = 0, told = 0;
    char *why = NULL;
    tw_status status = TW_OK;
    for (size_t k = 0; k < a->contribution_count; k++) lanes += a->contributions[k].lane_count;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++)
        for (size_t n = 0; n < a->contributions[k].lane_count && status == TW_OK; n++) {
            char *reason = NULL;
            status = tell_lane(s, r, &json, a, &a->contributions[k], n, lanes > 1, &reason);
            if (status == TW_OK && reason) result_line(r, "  %s", reason);
            told += status == TW_OK && !reason;
            if (reason) {
                free(why);
                why = reason;
            }
        }
    text_add_char(&json, ']');
    result_json(r, "lanes", json.bytes);
    text_clear(&json);
    if (status == TW_OK && told == 0)
        status = engine_fail(s->e, ERROR_UNSUITABLE, "%s", why ? why : "the expansion has no coefficients");
    free(why);
    return status;
}

/* The first lane of the first dominant contribution, when its form is found quickly. */
static void try_growth(session *s, result *r, expansion *a, contribution *c)
{
    const recurrence *known;
    if (lane_recurrence(s->e, c, &c->lanes[0], a->large, &known) != TW_OK) return;
    slong wanted = FLINT_MAX(known->needed, FLINT_MAX(known->order, 16)) + 1;
    if (c->lanes[0].c.count < wanted && expansion_extend(s->e, a, wanted * (slong)c->lane_count) != TW_OK) return;
    large_order g;
    large_order_init(&g);
    if (find_growth(s, &g, &c->lanes[0], known) == TW_OK && g.m > 0)
        tell_least(s, r, a, &c->lanes[0], &g, "the terms are least");
    large_order_clear(&g);
}

tw_status growth_tell_least(session *s, result *r, expansion *a)
{
    contribution *c = NULL;
    for (size_t k = 0; k < a->contribution_count && !c; k++)
        if (a->contributions[k].dominant) c = &a->contributions[k];
    if (!c || c->terminates || c->lane_count == 0) return TW_OK;
    double before = quick_begin(s->e, 1);
    try_growth(s, r, a, c);
    return quick_end(s->e, before) ? TW_OK : TW_ERROR;
}

tw_status request_growth(session *s, const statement *st, result *r, value **keep)
{
    subject x;
    if (subject_read_expansion(s, &x, st->as.subject) != TW_OK) return TW_ERROR;
    result_restart(r, "growth");
    result_string(r, "of", x.name);
    tw_status status = tell_all(s, r, &x.kept->expansion);
    subject_clear(&x);
    if (status != TW_OK) return request_fail_at(s, st->as.subject->at);
    if (keep) *keep = value_of_result(r, "a form for large n");
    return TW_OK;
}
