/* Requests about expansions: expand, steps, coefficients, remainder. */
#include <stdlib.h>
#include <string.h>

#include "engine/method/steps.h"
#include "lang/describe.h"
#include "lang/request.h"
#include "lang/rules.h"

enum { TERMS_LIMIT = 1000000 };

/* ---- expand ---- */

static tw_status check_method(session *s, syntax_name by)
{
    const value *own = by.text ? names_find(&s->rules, by.text) : NULL;
    if (!by.text || method_find(by.text) || own) return TW_OK;
    if (method_is_planned(by.text)) return request_unavailable(s, by.at, by.text);
    size_t count;
    const method *const *methods = method_table(&count);
    const char **names = base_alloc(count * sizeof *names);
    for (size_t k = 0; k < count; k++) names[k] = methods[k]->name;
    request_no_such(s, by, "method", names, count);
    free(names);
    return TW_ERROR;
}

/* How the series line begins: the integral's name, or the integral itself while it is short. */
static const char *title(const subject *x)
{
    return x->is_name || strlen(x->name) <= 48 ? x->name : "integral";
}

tw_status request_tell_expansion(session *s, result *r, const char *name, const char *title_words, value *v)
{
    result_restart(r, "expansion");
    if (describe_series(s, r, title_words, &v->expansion) != TW_OK) return TW_ERROR;
    if (v->expansion.why) result_string(r, "why", v->expansion.why);
    return s->json ? describe_object(s, r, name, &v->expansion) : TW_OK;
}

/* The integral is rewritten by a pass of the user, then expanded by the method that ends the pass, or one that fits. The
 * steps and conditions of the pass come first. */
static tw_status expand_by_pass(session *s, const value *own, expansion *out, expr *integral, slong terms,
                                const char *name)
{
    pass *p = own->kind == VALUE_RULE ? pass_of_rule(own->rule) : pass_hold(own->pass);
    rewriting w;
    rewriting_init(&w);
    tw_status status = session_check_pass(s, p);
    if (status == TW_OK) status = pass_run(s->e, p, integral, &w);
    if (status == TW_OK && !w.applied && !pass_method(p))
        status = engine_fail(s->e, ERROR_UNSUITABLE, "the pass `%s` changes nothing here (`rewrite` and `why not RULE` say why)",
                             name);
    if (status == TW_OK) status = expand(s->e, out, w.after, terms, pass_method(p));
    if (status == TW_OK) {
        derivation all;
        derivation_init(&all);
        if (w.applied && out->derivation.count > 0 && strcmp(out->derivation.steps[0].rule, "as typed") == 0) {
            free(out->derivation.steps[0].rule);
            out->derivation.steps[0].rule = base_copy("as rewritten by the pass");
        }
        derivation_move(&all, &w.steps);
        derivation_move(&all, &out->derivation);
        derivation_clear(&out->derivation);
        out->derivation = all;
        if (w.applied) out->typed = integral;
        conditions_append(&out->conditions, &w.conditions);
    }
    rewriting_clear(&w);
    pass_release(p);
    return status;
}

static tw_status expand_subject(session *s, const statement *st, result *r, const subject *x, value *v, slong terms)
{
    syntax_name by = st->as.expand->by, as = st->as.expand->as;
    const char *name = s->let_name ? s->let_name : as.text ? as.text : title(x);
    if (x->kept)
        return request_fail(s, st->as.expand->subject->at, ERROR_VALUE, "`%s` is not an integral", x->name);
    const value *own = by.text && !method_find(by.text) ? names_find(&s->rules, by.text) : NULL;
    tw_status made = own ? expand_by_pass(s, own, &v->expansion, x->expression, terms, by.text)
                         : expand(s->e, &v->expansion, x->expression, terms, by.text);
    if (made == TW_OK) conditions_append(&v->expansion.conditions, &s->rests);
    if (made != TW_OK || request_tell_expansion(s, r, name, title(x), v) != TW_OK)
        return request_fail_at(s, st->as.expand->subject->at);
    return TW_OK;
}

tw_status request_expand(session *s, const statement *st, result *r, value **keep)
{
    syntax_name as = st->as.expand->as;
    slong terms;
    if (session_lower_count(s, st->as.expand->terms, "the number of terms", 1, TERMS_LIMIT, &terms) != TW_OK ||
        check_method(s, st->as.expand->by) != TW_OK || (as.text && request_may_define(s, as) != TW_OK))
        return TW_ERROR;
    subject x;
    if (subject_read(s, &x, st->as.expand->subject) != TW_OK) return TW_ERROR;
    value *v = value_new(VALUE_EXPANSION);
    tw_status status = expand_subject(s, st, r, &x, v, terms);
    subject_clear(&x);
    if (status == TW_OK && as.text) names_set(&s->names, as.text, value_hold(v));
    if (status == TW_OK && keep) *keep = v;
    else value_release(v);
    return status;
}

/* ---- steps, coefficients, remainder ---- */

static void keep_result(value **keep, const result *r, const char *what)
{
    if (keep) *keep = value_of_result(r, what);
}

tw_status request_steps(session *s, const statement *st, result *r, value **keep)
{
    if (!st->as.subject) return derivation_steps(s, r, st->at);
    subject x;
    value *kept = st->as.subject->kind == SYNTAX_NAME ? names_find(&s->names, st->as.subject->as.name) : NULL;
    if (kept && kept->kind == VALUE_DERIVATION) {
        derivation_tell_steps(s, r, st->as.subject->as.name, kept->derivation);
        keep_result(keep, r, "steps");
        return s->e->error.kind == ERROR_NONE ? TW_OK : request_fail_at(s, st->at);
    }
    if (subject_read_expansion(s, &x, st->as.subject) != TW_OK) return TW_ERROR;
    result_restart(r, "steps");
    result_string(r, "of", x.name);
    const expansion *a = &x.kept->expansion;
    result_string(r, "why", a->why);
    if (a->why) result_prose(r, "%s", a->why);
    describe_steps(s, r, &a->derivation);
    subject_clear(&x);
    keep_result(keep, r, "steps");
    return s->e->error.kind == ERROR_NONE ? TW_OK : request_fail_at(s, st->at);
}

tw_status request_coefficients(session *s, const statement *st, result *r, value **keep)
{
    slong from = 0, to = -1;
    if (st->as.coefficients.from &&
        (session_lower_count(s, st->as.coefficients.from, "the first number", 0, TERMS_LIMIT, &from) != TW_OK ||
         session_lower_count(s, st->as.coefficients.to, "the last number", from, TERMS_LIMIT, &to) != TW_OK))
        return TW_ERROR;
    subject x;
    if (subject_read_expansion(s, &x, st->as.coefficients.of) != TW_OK) return TW_ERROR;
    result_restart(r, "coefficients");
    result_string(r, "of", x.name);
    tw_status status = describe_coefficients(s, r, &x.kept->expansion, from, to);
    subject_clear(&x);
    if (status != TW_OK) return request_fail_at(s, st->as.coefficients.of->at);
    keep_result(keep, r, "a table of coefficients");
    return TW_OK;
}

tw_status request_remainder(session *s, const statement *st, result *r, value **keep)
{
    slong terms = -1;
    const syntax *typed = st->as.remainder.terms;
    if (typed && session_lower_count(s, typed, "the number of terms", 0, TERMS_LIMIT, &terms) != TW_OK) return TW_ERROR;
    subject x;
    if (subject_read_expansion(s, &x, st->as.remainder.of) != TW_OK) return TW_ERROR;
    remainder_bound bound;
    remainder_bound_init(&bound);
    tw_status status = describe_find_bound(s, &bound, &x.kept->expansion, terms);
    if (status == TW_OK) {
        result_restart(r, "remainder");
        result_string(r, "of", x.name);
        describe_remainder(s, r, &x.kept->expansion, &bound);
        status = growth_tell_least(s, r, &x.kept->expansion);
    }
    remainder_bound_clear(&bound);
    subject_clear(&x);
    if (status != TW_OK) return request_fail_at(s, st->as.remainder.of->at);
    keep_result(keep, r, "a bound of the remainder");
    return TW_OK;
}
