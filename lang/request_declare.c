/* Declarations: large, small, given, grant, let, drop. The one idea: everything is read and checked first, the session
 * is changed last, so a statement that fails leaves it as it was. */
#include <stdlib.h>
#include <string.h>

#include "engine/method/combine.h"
#include "engine/method/descent.h"
#include "engine/method/method.h"
#include "engine/method/phase.h"
#include "lang/request.h"

static void declared(result *r, const statement *st)
{
    text words;
    text_init(&words);
    statement_print(&words, st);
    result_restart(r, "declaration");
    result_string(r, "text", words.bytes);
    r->echo = true;
    text_clear(&words);
}

/* ---- large, small ---- */

static tw_status must_be_free(session *s, syntax_name name)
{
    if (!names_find(&s->names, name.text)) return TW_OK;
    return request_fail(s, name.at, ERROR_NAME, "`%s` is defined by `let`; a parameter needs a free name (or `drop %s`)",
                        name.text, name.text);
}

static bool is_argument_of(const syntax *x, const char *name)
{
    return x->kind == SYNTAX_CALL && strcmp(x->as.call.name.text, "arg") == 0 && x->as.call.count == 1 &&
           x->as.call.arguments[0]->kind == SYNTAX_NAME && strcmp(x->as.call.arguments[0]->as.name, name) == 0;
}

static tw_status declare_large(session *s, const statement *st, large_kind kind)
{
    syntax_name name = st->as.large.name;
    expr *from = NULL, *to = NULL;
    if (must_be_free(s, name) != TW_OK) return TW_ERROR;
    const syntax *sector = st->as.large.sector;
    if (sector) {
        if (!is_argument_of(sector->as.range->value, name.text))
            return request_fail(s, sector->at, ERROR_VALUE, "only a sector `arg(%s) in (A, B)` can stand here", name.text);
        from = session_lower(s, sector->as.range->from);
        to = from ? session_lower(s, sector->as.range->to) : NULL;
        if (!to) return TW_ERROR;
    }
    expr *symbol = expr_symbol(s->e, name.text);
    if (!symbol || facts_set_large(s->e, symbol, kind, from, to) != TW_OK) return request_fail_at(s, name.at);
    return TW_OK;
}

tw_status request_large(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    declared(r, st);
    return declare_large(s, st, st->as.large.integer ? LARGE_INTEGER : LARGE_POSITIVE);
}

tw_status request_small(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    declared(r, st);
    return declare_large(s, st, LARGE_SMALL);
}

/* ---- given, grant ---- */

static tw_status declare_conditions(session *s, const statement *st, condition_label known)
{
    for (size_t k = 0; k < st->as.given.count; k++) {
        const syntax *x = st->as.given.list[k];
        lower_conditions said;
        lower_conditions_init(&said);
        tw_status status = session_lower_condition(s, x, &said);
        for (size_t c = 0; status == TW_OK && c < said.count; c++) {
            s->at = x->at;
            status = facts_add(s->e, said.list[c], known);
        }
        lower_conditions_clear(&said);
        if (status != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

tw_status request_given(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    declared(r, st);
    return declare_conditions(s, st, CONDITION_GIVEN);
}

tw_status request_grant(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    declared(r, st);
    return declare_conditions(s, st, CONDITION_GRANTED);
}

/* ---- let ---- */

tw_status request_may_define(session *s, syntax_name name)
{
    expr *symbol = expr_symbol(s->e, name.text);
    if (!symbol) return request_fail_at(s, name.at);
    if (!session_declares(s, symbol)) return TW_OK;
    return request_fail(s, name.at, ERROR_NAME, "`%s` is a declared parameter; choose another name, or `drop %s` first",
                        name.text, name.text);
}

static void define(session *s, result *r, syntax_name name, const char *kind)
{
    (void)s;
    result_restart(r, "definition");
    result_string(r, "name", name.text);
    result_string(r, "kind", kind);
    r->echo = true;
}

/* "depends on a, b" */
static void add_dependence(session *s, text *out, expr *a)
{
    (void)s;
    expr **symbols;
    size_t count = expr_symbols(a, &symbols);
    text_add(out, count ? "depends on " : "a fixed number");
    for (size_t k = 0; k < count; k++) text_addf(out, "%s%s", k ? ", " : "", symbols[k]->is.name);
    free(symbols);
}

static bool has_integral(expr *a)
{
    if (a->kind == EXPR_INTEGRAL || a->kind == EXPR_CONTOUR) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (has_integral(a->args[k])) return true;
    return false;
}

static tw_status summarise_path(session *s, text *out, expr *a)
{
    char *words;
    tw_status status = descent_summary(s->e, &words, a);
    if (status == TW_OK) {
        text_add(out, words);
    } else if (!error_is_fatal(s->e->error.kind)) {
        add_dependence(s, out, a);
        text_addf(out, "; %s", s->e->error.words);
        engine_forgive(s->e);
        status = TW_OK;
    }
    free(words);
    return status;
}

/* What reading an integral finds, for the echo. An integral that cannot be expanded is a value all the same, so what stands
 * against it is said and the definition holds. */
static tw_status summarise(session *s, text *out, expr *a)
{
    expr *large;
    if (facts_large(s->e, &large) == LARGE_NONE || !expr_has(a, large)) {
        add_dependence(s, out, a);
        return TW_OK;
    }
    if (descent_applies(a)) return summarise_path(s, out, a);
    text oscillating;
    text_init(&oscillating);
    if (phase_summary(s->e, &oscillating, a)) {
        add_dependence(s, out, a);
        text_add(out, oscillating.bytes);
        text_clear(&oscillating);
        return TW_OK;
    }
    text_clear(&oscillating);
    reading seen;
    reading_init(&seen);
    tw_status status = integral_read(s->e, &seen, a);
    if (status == TW_OK && seen.summary) {
        text_add(out, seen.summary);
    } else if (status == TW_OK) {
        add_dependence(s, out, a);
    } else if (!error_is_fatal(s->e->error.kind)) {
        add_dependence(s, out, a);
        text_addf(out, "; %s", s->e->error.words);
        engine_forgive(s->e);
        status = TW_OK;
    }
    reading_clear(&seen);
    return status;
}

/* Terms with one integral each, and nothing of integrals in their other factors. */
static bool is_sum_of_integrals(expr *a)
{
    expr *const *terms, *const *factors;
    size_t count = expr_terms(&a, &terms);
    for (size_t k = 0; k < count; k++) {
        size_t n = expr_factors(&terms[k], &factors), integrals = 0;
        for (size_t i = 0; i < n; i++) {
            if (!has_integral(factors[i])) continue;
            if (factors[i]->kind != EXPR_INTEGRAL && factors[i]->kind != EXPR_CONTOUR) return false;
            integrals++;
        }
        if (integrals != 1) return false;
    }
    return true;
}

/* let L = log(A), let R = A/B, let D = derivative of A in s: an expansion again. One integral (a sum of integrals of one
 * size) is expanded as it is, anything else is combined from the expansions of its integrals. */
static tw_status let_combination(session *s, syntax_name name, const syntax *x, expr *a, result *r)
{
    value *v = value_new(VALUE_EXPANSION);
    slong terms = s->met_terms;
    bool plain = is_sum_of_integrals(a);
    tw_status status = plain ? expand(s->e, &v->expansion, a, terms, NULL) : TW_ERROR;
    bool soft = !plain || s->e->error.kind == ERROR_UNSUITABLE || s->e->error.kind == ERROR_UNAVAILABLE ||
                s->e->error.kind == ERROR_DIVERGENT || s->e->error.kind == ERROR_UNDECIDED;
    if (status != TW_OK && soft) {
        engine_forgive(s->e);
        expansion_clear(&v->expansion);
        status = combine(s->e, &v->expansion, a, terms);
    }
    if (status == TW_OK) status = request_tell_expansion(s, r, name.text, name.text, v);
    if (status == TW_OK) {
        r->echo = false;
        names_set(&s->names, name.text, value_hold(v));
    }
    value_release(v);
    return status == TW_OK ? TW_OK : request_fail_at(s, x->at);
}

static tw_status let_expression(session *s, const statement *st, result *r)
{
    syntax_name name = st->as.let.name;
    const syntax *x = st->as.let.value;
    value *same = x->kind == SYNTAX_NAME ? names_find(&s->names, x->as.name) : NULL;
    if (same && same->kind != VALUE_EXPRESSION) { /* another name for the same thing */
        define(s, r, name, same->kind == VALUE_EXPANSION ? "expansion" : "value");
        result_string(r, "text", x->as.name);
        result_line(r, "%s is %s", name.text, x->as.name);
        names_set(&s->names, name.text, value_hold(same));
        return TW_OK;
    }
    expr *a = session_lower(s, x);
    if (!a) return TW_ERROR;
    if (s->met_expansion && has_integral(a)) return let_combination(s, name, x, a, r);
    bool integral = has_integral(a);
    text words, summary;
    text_init(&words);
    text_init(&summary);
    expr_print(s->e, &words, a);
    define(s, r, name, integral ? "integral" : "expression");
    result_string(r, "text", words.bytes);
    tw_status status = TW_OK;
    if (integral) {
        status = summarise(s, &summary, a);
        result_string(r, "summary", summary.bytes);
        result_prose(r, "%s: %s", name.text, summary.bytes);
    } else {
        result_expression(r, "%s = %s", name.text, words.bytes);
    }
    text_clear(&words);
    text_clear(&summary);
    if (status != TW_OK) return request_fail_at(s, x->at);
    value *v = value_new(VALUE_EXPRESSION);
    v->expression = a;
    conditions_append(&v->conditions, &s->rests);
    if (!conditions_all_sure(&s->rests)) result_conditions(r, &s->rests);
    names_set(&s->names, name.text, v);
    return TW_OK;
}

static tw_status let_function(session *s, const statement *st, result *r)
{
    syntax_name name = st->as.let.name;
    value *v = value_new(VALUE_FUNCTION);
    if (session_lower_function(s, st->as.let.parameters, st->as.let.count, st->as.let.value, &v->function) != TW_OK) {
        value_release(v);
        return TW_ERROR;
    }
    conditions_append(&v->conditions, &s->rests);
    v->parameter_names = base_alloc((v->function.count + 1) * sizeof *v->parameter_names);
    for (size_t k = 0; k < v->function.count; k++) v->parameter_names[k] = base_copy(st->as.let.parameters[k].text);
    define(s, r, name, "function");
    text words;
    text_init(&words);
    value_print(s->e, &words, name.text, v);
    result_string(r, "text", words.bytes);
    result_expression(r, "%s", words.bytes);
    text_clear(&words);
    if (function_find(name.text, -1) != FUNCTION_COUNT || strcmp(name.text, "sqrt") == 0) {
        result_string(r, "notice", "hides the built-in function of this name");
        result_line(r, "  (hides the built-in function %s)", name.text);
    }
    names_set(&s->names, name.text, v);
    return TW_OK;
}

static tw_status let_request(session *s, const statement *st, result *r)
{
    value *kept = NULL;
    s->let_name = st->as.let.name.text;
    tw_status status = request_run(s, st->as.let.request, r, &kept);
    s->let_name = NULL;
    if (status != TW_OK) {
        value_release(kept);
        return TW_ERROR;
    }
    r->echo = true;
    names_set(kept->kind == VALUE_RULE ? &s->rules : &s->names, st->as.let.name.text, kept);
    return TW_OK;
}

tw_status request_let(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    if (request_may_define(s, st->as.let.name) != TW_OK) return TW_ERROR;
    if (st->as.let.request) return let_request(s, st, r);
    if (st->as.let.is_function) return let_function(s, st, r);
    return let_expression(s, st, r);
}

/* ---- drop ---- */

tw_status request_drop(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    syntax_name name = st->as.name;
    declared(r, st);
    bool value_gone = names_drop(&s->names, name.text), rule_gone = names_drop(&s->rules, name.text);
    if (value_gone || rule_gone) return TW_OK;
    expr *symbol = expr_symbol(s->e, name.text);
    if (!symbol) return request_fail_at(s, name.at);
    if (!session_declares(s, symbol)) return session_unknown_name(s, name);
    facts_forget(s->e, symbol);
    return TW_OK;
}
