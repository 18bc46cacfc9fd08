/* An expansion as one JSON object (RFC 8259), in the form that the project's page on exports fixes. Exact things are text in
 * the language's own syntax, so no reader rounds them. */
#include <stdlib.h>

#include "engine/ball/tape.h"
#include "engine/export/format.h"
#include "engine/expr/root_names.h"
#include "engine/method/attach.h"

static void add_key(text *out, const char *key)
{
    text_addf(out, ",\n \"%s\": ", key);
}

/* Symbols other than the large parameter, each with the facts that mention it. */
static void add_parameters(tw_engine *e, text *out, const expansion *a)
{
    expr **symbols;
    size_t count = expr_symbols(a->integral, &symbols);
    bool first = true;
    text_add_char(out, '[');
    for (size_t k = 0; k < count; k++) {
        if (symbols[k] == a->large) continue;
        text_add(out, first ? "{\"name\": " : ", {\"name\": ");
        first = false;
        json_expr(e, out, symbols[k]);
        text_add(out, ", \"facts\": [");
        bool first_fact = true;
        for (size_t f = 0; f < a->fact_count; f++) {
            if (!expr_has(a->facts[f], symbols[k])) continue;
            if (!first_fact) text_add(out, ", ");
            first_fact = false;
            json_expr(e, out, a->facts[f]);
        }
        text_add(out, "]}");
    }
    text_add_char(out, ']');
    free(symbols);
}

/* The recurrence of the lane's coefficients, proved, or null. */
static tw_status add_recurrence(tw_engine *e, text *out, const expansion *a, contribution *c, const lane *l)
{
    const recurrence *r = NULL;
    if (!c->terminates && lane_recurrence_if_quick(e, c, l, a->large, &r) != TW_OK) return TW_ERROR;
    text words;
    text_init(&words);
    if (!r || recurrence_print(e, &words, r) != TW_OK) {
        text_add(out, "null");
        text_clear(&words);
        return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    }
    text_add(out, "{\"text\": ");
    json_string(out, words.bytes);
    text_addf(out, ", \"label\": \"%s\", \"order\": %ld, \"degree\": %ld, \"from\": 0, \"left_out\": [",
              recurrence_label_word(r->label), (long)r->order, (long)r->degree);
    for (slong k = 0; k < r->void_count; k++) text_addf(out, k ? ", %ld" : "%ld", (long)r->voids[k]);
    text_addf(out, "], \"first_values\": %ld, \"certificate\": ", (long)r->needed);
    char *proof = recurrence_certificate(e, r);
    json_string(out, proof);
    free(proof);
    text_add(out, "}");
    text_clear(&words);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static tw_status add_lane(tw_engine *e, text *out, const expansion *a, contribution *c, const lane *l)
{
    text_add(out, "\n     {\"constant\": ");
    json_expr(e, out, l->constant);
    text_addf(out, ", \"log_power\": %ld, \"first_exponent\": ", (long)l->log_power);
    json_expr(e, out, l->first_exponent);
    text_add(out, ", \"step\": ");
    json_expr(e, out, expr_fmpq(e, l->step));
    text_add(out, ",\n      \"coefficients\": [");
    for (slong n = 0; n < l->c.count; n++) {
        if (n) text_add(out, ", ");
        json_expr(e, out, coefficient_expr(e, &l->c, n));
    }
    text_add(out, "],\n      \"recurrence\": ");
    tw_status status = add_recurrence(e, out, a, c, l);
    text_add(out, "}");
    return status;
}

static void collect_roots(tw_engine *e, root_names *n, const expansion *a, const contribution *c)
{
    root_names_collect(n, c->place, a->integral);
    root_names_collect(n, c->prefactor, a->integral);
    for (size_t k = 0; k < c->lane_count; k++) {
        const lane *l = &c->lanes[k];
        root_names_collect(n, l->constant, a->integral);
        for (slong j = 0; l->c.x && j < l->c.count; j++) root_names_collect(n, coefficient_expr(e, &l->c, j), a->integral);
    }
}

/* {"name": "r", "polynomial": "r^3 - r - 1", "value": "1.3247..."}: at least 60 digits. */
static tw_status add_generator(tw_engine *e, text *out, const char *name, expr *root)
{
    enum { DIGITS = 60 };
    acb_t z;
    acb_init(z);
    tw_status status = ball_value(e, z, root, 400);
    text_add(out, "{\"name\": ");
    json_string(out, name);
    text_add(out, ", \"polynomial\": ");
    json_expr(e, out, expr_open(e, root, expr_symbol(e, name)));
    char *re = arb_get_str(acb_realref(z), DIGITS, ARB_STR_NO_RADIUS), *im = arb_get_str(acb_imagref(z), DIGITS, ARB_STR_NO_RADIUS);
    text_addf(out, ", \"value\": \"%s", re);
    if (!arb_is_zero(acb_imagref(z))) text_addf(out, " + (%s)*i", im);
    text_add(out, "\"}");
    flint_free(re);
    flint_free(im);
    acb_clear(z);
    return status;
}

static tw_status add_named_contribution(tw_engine *e, text *out, const expansion *a, contribution *c, const root_names *n);

/* Algebraic numbers are printed by the names of the contribution's generators. */
static tw_status add_contribution(tw_engine *e, text *out, const expansion *a, contribution *c)
{
    root_names n;
    root_names_init(&n);
    collect_roots(e, &n, a, c);
    e->root_names = &n;
    tw_status status = add_named_contribution(e, out, a, c, &n);
    e->root_names = NULL;
    root_names_clear(&n);
    return status;
}

static tw_status add_named_contribution(tw_engine *e, text *out, const expansion *a, contribution *c, const root_names *n)
{
    text place;
    text_init(&place);
    if (c->variable) expr_print(e, &place, c->variable);
    if (c->place) {
        text_add(&place, " = ");
        expr_print(e, &place, c->place);
    }
    text_add(out, "\n  {\"point\": ");
    json_string(out, place.bytes);
    text_clear(&place);
    text_addf(out, ", \"kind\": \"%s\", \"method\": \"%s\", \"dominance\": \"%s\", \"prefactor\": ",
              point_kind_word(c->kind), c->method, c->on_stokes_line ? "on a Stokes line" : c->dominant ? "dominant" : "subdominant");
    json_expr(e, out, c->prefactor);
    text_add(out, ",\n   \"lanes\": [");
    for (size_t k = 0; k < c->lane_count; k++) {
        if (k) text_add_char(out, ',');
        if (add_lane(e, out, a, c, &c->lanes[k]) != TW_OK) return TW_ERROR;
    }
    text_addf(out, "],\n   \"domain\": \"%s\", \"generators\": [", domain_word(c->domain));
    for (size_t k = 0; k < n->count; k++) {
        if (k) text_add(out, ", ");
        if (add_generator(e, out, n->names[k], n->roots[k]) != TW_OK) return TW_ERROR;
    }
    text_add(out, "]}");
    return TW_OK;
}

static void add_remainder(tw_engine *e, text *out, const expansion *a, const remainder_bound *r)
{
    text_addf(out, "{\"label\": \"%s\", \"manner\": ", label_word(r->label));
    json_string(out, r->manner);
    text_addf(out, ", \"terms\": %ld, \"bound\": ", (long)r->terms);
    json_expr(e, out, r->bound);
    text_add(out, ", \"from\": ");
    if (r->bound && !r->from) json_string(out, a->small ? "inf" : "0"); /* for all values */
    else json_expr(e, out, r->from);
    text_add(out, ", \"source\": ");
    json_string(out, r->source);
    if (r->reason) {
        text_add(out, ", \"reason\": ");
        json_string(out, r->reason);
    }
    text_add(out, ",\n  \"panels\": ");
    if (r->panel_count == 0) {
        text_add(out, "null");
    } else {
        text_add(out, "{\"power\": ");
        json_expr(e, out, r->panel_power);
        text_add(out, ", \"scale\": ");
        json_expr(e, out, a->contributions[0].local.scale);
        text_add(out, ", \"steps\": [");
        for (size_t k = 0; k < r->panel_count; k++) {
            text_add(out, k ? ", [" : "[");
            json_string(out, r->panel_t[k]);
            text_add(out, ", ");
            json_string(out, r->panel_height[k]);
            text_add_char(out, ']');
        }
        text_add(out, "]}");
    }
    text_add_char(out, '}');
}

static void add_steps(tw_engine *e, text *out, const derivation *d)
{
    text_add_char(out, '[');
    for (size_t k = 0; k < d->count; k++) {
        const step *s = &d->steps[k];
        text_add(out, k ? ",\n  {\"rule\": " : "\n  {\"rule\": ");
        json_string(out, s->rule);
        text_add(out, ", \"source\": ");
        json_string(out, s->source);
        text_add(out, ", \"form\": ");
        if (s->after) json_expr(e, out, s->after);
        else json_string(out, s->form);
        if (s->detail) {
            text_add(out, ", \"detail\": ");
            json_string(out, s->detail);
        }
        if (s->remainder) {
            text_add(out, ", \"remainder\": ");
            json_expr(e, out, s->remainder);
        }
        text_add(out, ", \"conditions\": ");
        json_conditions(out, &s->conditions);
        text_add_char(out, '}');
    }
    text_add_char(out, ']');
}

static tw_status write_json(tw_engine *e, text *out, const char *name, expansion *a, const remainder_bound *r)
{
    text_add(out, "{\"format\": \"termwise expansion\", \"version\": 1,\n \"name\": ");
    json_string(out, name);
    add_key(out, "integral");
    json_expr(e, out, a->integral);
    add_key(out, a->small ? "small" : "large");
    json_expr(e, out, a->large);
    add_key(out, "parameters");
    add_parameters(e, out, a);
    add_key(out, "contributions");
    text_add_char(out, '[');
    for (size_t k = 0; k < a->contribution_count; k++) {
        if (!budget_ok(e)) return TW_ERROR;
        if (k) text_add_char(out, ',');
        if (add_contribution(e, out, a, &a->contributions[k]) != TW_OK) return TW_ERROR;
    }
    text_add_char(out, ']');
    add_key(out, "remainder");
    add_remainder(e, out, a, r);
    add_key(out, "conditions");
    json_conditions(out, &a->conditions);
    add_key(out, "steps");
    add_steps(e, out, &a->derivation);
    text_add(out, "}\n");
    return TW_OK;
}

const format format_json = {"json", "one JSON object with everything: coefficients, remainder, conditions, steps", write_json};
