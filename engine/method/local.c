/* Contributions from a reading. The one idea: a critical point and a finite far end are the same thing seen from two
 * sides; at the far end the exponent grows inwards, so its terms come from the formal integral with exp(+scale t)
 * (DLMF 2.3.4 turned to the real axis): n! g_n (-scale)^-(n+1). */

#include "engine/method/local.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "engine/method/lanes.h"
#include "engine/method/scale.h"

static expr *factor_rest(tw_engine *e, expr *factor, expr *large)
{
    fmpq_t number, power;
    fmpq_init(number);
    fmpq_init(power);
    expr *rest;
    factor_split(e, factor, large, number, power, &rest);
    fmpq_clear(number);
    fmpq_clear(power);
    return rest;
}

static tw_status expand_point(tw_engine *e, expansion *out, const reading *r, const critical_point *p, slong terms,
                              const char *name)
{
    contribution *c = expansion_add(out);
    c->variable = r->original_variable;
    c->place = p->place;
    c->kind = p->kind;
    c->method = name;
    c->dominant = p->dominant;
    c->prefactor = factor_rest(e, p->local.factor, r->large);
    local_form_copy(&c->local, &p->local);
    return contribution_fill(e, c, r->large, r->small, terms, p->dominant ? &out->conditions : NULL);
}

/* A lesser point that has no series is left out: the bound covers it. */
static tw_status leave_out(tw_engine *e, expansion *out, const reading *r, const critical_point *p)
{
    if (e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_VALUE && e->error.kind != ERROR_UNDECIDED) return TW_ERROR;
    contribution_clear(&out->contributions[--out->contribution_count]);
    char *place = expr_text(e, p->place);
    text words;
    text_init(&words);
    text_addf(&words, "%s = %s: %s", r->original_variable->is.name, place ? place : "", e->error.words);
    step *s = derivation_add(&out->derivation, "leave out a lesser point", NULL);
    s->detail = text_take(&words);
    s->form = base_copy("unchanged; the remainder's bound covers it");
    free(place);
    engine_forgive(e);
    return TW_OK;
}

tw_status local_expand(tw_engine *e, expansion *out, const reading *r, slong terms, const char *name)
{
    for (size_t k = 0; k < r->point_count; k++) {
        const critical_point *p = &r->points[k];
        if (expand_point(e, out, r, p, terms, name) == TW_OK) continue;
        if (p->dominant || leave_out(e, out, r, p) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

/* exp(-scale p(end)) * int_0 q(end - y) exp(+scale (p(end) - p(end - y))) dy */
static tw_status far_form(tw_engine *e, local_form *out, const reading *r, const critical_point *c, const branch *b)
{
    expr *y = expr_fresh(e, "y"), *x = expr_sub(e, b->end, y);
    expr *height = expr_substitute(e, b->p, b->x, b->end);
    expr *p = expr_expand(e, expr_sub(e, height, expr_substitute(e, b->p, b->x, x)));
    expr *q = normal_under_facts(e, expr_substitute(e, b->q, b->x, x), &y, 1);
    expr *small = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, c->local.scale, height)));
    out->scale = c->local.scale;
    out->factor = normal_under_facts(e, expr_mul(e, c->local.factor, small), &r->large, 1);
    if (!p || !q || !out->factor) return TW_ERROR;
    local_form_add(out, y, b->end, p, q);
    return TW_OK;
}

static tw_status add_far_end(tw_engine *e, expansion *out, const reading *r, const critical_point *from, size_t k,
                             slong terms, const char *name)
{
    contribution *c = expansion_add(out);
    c->variable = r->original_variable;
    c->place = from->far_places[k];
    c->kind = POINT_FAR_END;
    c->method = name;
    c->dominant = false;
    tw_status status = far_form(e, &c->formal, r, from, &from->local.branches[k]);
    if (status == TW_OK) {
        c->prefactor = factor_rest(e, c->formal.factor, r->large);
        status = contribution_fill(e, c, r->large, r->small, terms, NULL);
    }
    if (status == TW_OK) return TW_OK;
    contribution_clear(c);
    out->contribution_count--;
    return TW_ERROR;
}

tw_status local_expand_far_ends(tw_engine *e, expansion *out, const reading *r, slong terms, const char *name,
                                bool *all)
{
    *all = true;
    for (size_t m = 0; m < 2 * r->point_count; m++) {
        const critical_point *c = &r->points[m / 2];
        size_t k = m % 2;
        if (!c->dominant || k >= c->local.count || !c->far_places[k]) continue;
        char *place = expr_text(e, c->far_places[k]);
        if (!place) return TW_ERROR;
        tw_status status = add_far_end(e, out, r, c, k, terms, name);
        bool left_out = status != TW_OK && (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_VALUE);
        text words;
        text_init(&words);
        text_addf(&words, "%s = %s: %s", r->original_variable->is.name, place,
                  left_out ? (e->error.kind == ERROR_VALUE ? "the exponent has no finite value there" : e->error.words)
                           : "exponentially small, listed as a contribution of its own");
        free(place);
        if (status == TW_OK || left_out) {
            step *s =
                derivation_add(&out->derivation, left_out ? "leave out the far end" : "add the far end", "DLMF 2.3.4");
            s->detail = text_take(&words);
            s->form = base_copy(left_out ? "unchanged; the remainder's bound covers it" : "one more contribution");
        }
        text_clear(&words);
        if (left_out) engine_forgive(e);
        else if (status != TW_OK) return TW_ERROR;
        *all = *all && !left_out;
    }
    return TW_OK;
}

tw_status local_extend(tw_engine *e, expansion *a, slong terms, const char *name)
{
    for (size_t k = 0; k < a->contribution_count; k++) {
        contribution *c = &a->contributions[k];
        if (strcmp(c->method, name) != 0 || c->terminates) continue;
        if (contribution_count_terms(c) >= terms || terms <= c->searched) continue;
        if (contribution_fill(e, c, a->large, a->small, terms, NULL) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

/* ---- for the derivation ---- */

expr *local_partial_sum(tw_engine *e, expansion *a, size_t k, slong terms)
{
    term *list;
    slong found;
    if (expansion_order(e, a, k, terms, &list, &found) != TW_OK) return NULL;
    expr *sum = expr_int(e, 0);
    for (slong n = 0; n < found; n++) sum = expr_add(e, sum, expansion_term(e, a, k, list[n]));
    free(list);
    return sum;
}

/* prefactor*(sum), and the prefactor alone where the sum is 1. */
static char *with_prefactor(tw_engine *e, expr *prefactor, const char *sum)
{
    text words;
    text_init(&words);
    expr_print(e, &words, prefactor);
    if (strcmp(sum, "1") != 0) text_addf(&words, "*(%s)", sum);
    return text_take(&words);
}

step *local_record_sum(tw_engine *e, expansion *a, size_t k, const char *rule, const char *source)
{
    enum { SHOWN = 4 };
    const contribution *c = &a->contributions[k];
    step *s = derivation_add(&a->derivation, rule, source);
    text words;
    text_init(&words);
    term *list;
    slong found;
    if (expansion_order(e, a, k, SHOWN, &list, &found) == TW_OK) {
        for (slong n = 0; n < found; n++) {
            char *one = expr_text(e, expansion_term_shown(e, a, k, list[n]));
            bool minus = one && one[0] == '-';
            text_add(&words, n == 0 ? (minus ? "-" : "") : minus ? " - " : " + ");
            if (one) text_add(&words, one + minus);
            free(one);
        }
        free(list);
        if (found == 0) text_add(&words, "0");
    } else if (e->error.kind == ERROR_UNDECIDED) {
        engine_forgive(e);
    }
    if (!c->terminates || contribution_count_terms(c) > SHOWN) text_add(&words, " + ...");
    s->form = expr_is_one(c->prefactor) ? text_take(&words) : with_prefactor(e, c->prefactor, words.bytes);
    text_clear(&words);
    return s;
}

answer suits_answer(char **why, answer a, const char *format, ...)
{
    if (!why) return a;
    char words[512];
    va_list list;
    va_start(list, format);
    vsnprintf(words, sizeof words, format, list);
    va_end(list);
    *why = base_copy(words);
    return a;
}
