/* Rules and passes: defining them, rewriting with them. The one idea: a name in a pass is looked up when the pass is
 * defined, so a later rule of the same name changes nothing earlier; a rule is checked before it is used. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "engine/method/steps.h"
#include "lang/lower_rule.h"
#include "lang/request.h"
#include "lang/rules.h"
#include "lang/suggest.h"

/* ---- rule ---- */

tw_status request_rule(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    lowering l;
    session_lowering_start(s, &l);
    rule *made = lower_rule(&l, st);
    if (session_lowering_end(s, &l, made != NULL, st->at) != TW_OK) return TW_ERROR;
    made->file = s->file ? base_copy(s->file) : NULL;
    made->line = s->line;
    result_restart(r, "rule");
    result_string(r, "name", made->name);
    result_string(r, "text", made->text);
    result_string(r, "source", made->source);
    result_line(r, "%s: a rule%s%s", made->name, made->source ? ", source " : "", made->source ? made->source : "");
    r->echo = true;
    value *v = value_new(VALUE_RULE);
    v->rule = made;
    names_set(&s->rules, made->name, v);
    return TW_OK;
}

/* ---- pass ---- */

static void offer_name(void *host, const char *name)
{
    suggestion_offer(host, name);
}

static tw_status no_such_pass(session *s, syntax_name name)
{
    suggestion near;
    suggestion_init(&near, name.text);
    names_each(&s->rules, offer_name, &near);
    size_t count;
    const pass_step *steps = steps_table(&count);
    for (size_t k = 0; k < count; k++) suggestion_offer(&near, steps[k].name);
    if (near.best)
        return request_fail(s, name.at, ERROR_NAME, "no rule or pass is called `%s`; did you mean `%s`?", name.text,
                            near.best);
    return request_fail(s, name.at, ERROR_NAME, "no rule or pass is called `%s`", name.text);
}

static pass *pass_by_name(session *s, syntax_name name)
{
    const value *v = names_find(&s->rules, name.text);
    if (v && v->kind == VALUE_RULE) return pass_of_rule(v->rule);
    if (v && v->kind == VALUE_PASS) return pass_named(name.text, pass_hold(v->pass));
    const pass_step *x = steps_find(name.text);
    if (x && (x->run || method_find(name.text))) return pass_of_step(x);
    if (x) request_fail(s, name.at, ERROR_VALUE, "the step `%s` computes a series and works inside its method only: end the pass "
                        "with the method's name", name.text);
    else no_such_pass(s, name);
    return NULL;
}

pass *session_pass(session *s, const syntax_pass *x)
{
    static const strategy kinds[] = {[PASS_REPEAT] = STRATEGY_REPEAT, [PASS_EVERYWHERE] = STRATEGY_EVERYWHERE,
                                     [PASS_ONCE] = STRATEGY_ONCE, [PASS_THEN] = STRATEGY_THEN, [PASS_OR] = STRATEGY_OR};
    if (x->kind == PASS_NAME) return pass_by_name(s, (syntax_name){x->name, x->at});
    pass **parts = base_alloc((x->count + 1) * sizeof *parts);
    size_t n = 0;
    while (n < x->count && (parts[n] = session_pass(s, x->parts[n])) != NULL) n++;
    pass *made = n == x->count ? pass_join(kinds[x->kind], parts, n) : NULL;
    for (size_t k = 0; !made && k < n; k++) pass_release(parts[k]);
    free(parts);
    return made;
}

tw_status request_pass(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    pass *made = session_pass(s, st->as.pass.value);
    if (!made) return TW_ERROR;
    const char *name = st->as.pass.name.text;
    value *v = value_new(VALUE_PASS);
    v->pass = made;
    text words;
    text_init(&words);
    statement_print(&words, st);
    v->text = text_take(&words);
    v->file = s->file ? base_copy(s->file) : NULL;
    v->line = s->line;
    result_restart(r, "pass");
    result_string(r, "name", name);
    result_string(r, "text", v->text);
    result_line(r, "%s: a pass", name);
    r->echo = true;
    names_set(&s->rules, name, v);
    return TW_OK;
}

/* ---- show ---- */

static void add_lines(result *r, const char *words)
{
    text_add(&r->words, words);
    text_add_char(&r->words, '\n');
}

void show_rule_value(session *s, result *r, const char *name, const value *v)
{
    (void)s;
    if (v->kind == VALUE_PASS) {
        result_string(r, "kind", "pass");
        result_string(r, "text", v->text);
        add_lines(r, v->text);
        return;
    }
    const rule *x = v->rule;
    result_string(r, "kind", "rule");
    result_string(r, "text", x->text);
    result_string(r, "source", x->source);
    result_string(r, "status", x->checked ? rule_status_word(x->status) : "unchecked");
    result_string(r, "file", x->file);
    add_lines(r, x->text);
    if (x->checked) result_line(r, "  %s%s%s", rule_status_word(x->status), x->finding ? ": " : "", x->finding ? x->finding : "");
    else result_line(r, "  not tried yet: `check rule %s` does, and its first use", name);
    if (x->file) result_line(r, "  from \"%s\"", x->file);
}

bool show_method(session *s, result *r, const char *name)
{
    (void)s;
    const method *m = method_find(name);
    const method_pass *p = method_pass_find(name);
    const pass_step *x = steps_find(name);
    if (!m && !x) return false;
    result_string(r, m ? "method" : "step", name);
    if (!p) {
        result_line(r, "%s: %s", name, m ? m->title : x->summary);
        return true;
    }
    result_string(r, "pass", p->strategy);
    result_line(r, "%s: the method %s, as a pass over built-in steps", name, m->title);
    result_line(r, "pass %s = %s", name, p->strategy);
    size_t count;
    const pass_step *steps = steps_table(&count);
    for (size_t k = 0; k < count; k++) {
        const char *at = strstr(p->strategy, steps[k].name);
        if (!at || method_find(steps[k].name)) continue;
        result_line(r, "  %-27s%s%s%s", steps[k].name, steps[k].summary, steps[k].source ? "  " : "",
                    steps[k].source ? steps[k].source : "");
    }
    return true;
}

/* ---- rewrite ---- */

static void rewriting_steps(session *s, result *r, const rewriting *w)
{
    text list;
    text_init(&list);
    text_add_char(&list, '[');
    for (size_t k = 0; k < w->steps.count; k++) {
        const step *x = &w->steps.steps[k];
        json_next(&list);
        text_add_char(&list, '{');
        json_member(&list, "rule");
        json_string(&list, x->rule);
        json_member(&list, "source");
        json_string(&list, x->source);
        json_member(&list, "detail");
        json_string(&list, x->detail);
        text_add_char(&list, '}');
    }
    text_add_char(&list, ']');
    result_json(r, "steps", list.bytes);
    text_clear(&list);
    (void)s;
}

static void rewriting_conditions(result *r, const condition_list *conditions)
{
    text list;
    text_init(&list);
    text_add_char(&list, '[');
    for (size_t k = 0; k < conditions->count; k++) {
        json_next(&list);
        text_add_char(&list, '{');
        json_member(&list, "condition");
        json_string(&list, conditions->list[k].words);
        json_member(&list, "label");
        json_string(&list, condition_label_word(conditions->list[k].label));
        text_add_char(&list, '}');
    }
    text_add_char(&list, ']');
    result_json(r, "conditions", list.bytes);
    text_clear(&list);
}

static void rewriting_shown(session *s, result *r, expr *before, const rewriting *w)
{
    char *from = expr_text(s->e, before), *to = expr_text(s->e, w->after);
    const char *known = conditions_all_sure(&w->conditions) ? "proved" : "conditional";
    result_restart(r, "rewriting");
    result_string(r, "before", from);
    result_string(r, "after", to);
    result_truth(r, "applied", w->applied);
    if (w->applied) {
        result_string(r, "label", known);
        rewriting_conditions(r, &w->conditions);
        rewriting_steps(s, r, w);
        result_labelled(r, to, known, NULL);
        for (size_t k = 0; k < w->steps.count; k++) {
            const step *x = &w->steps.steps[k];
            result_line(r, "  by %s%s%s%s%s%s%s", x->rule, x->source ? "  (" : "", x->source ? x->source : "",
                        x->source ? ")" : "", x->detail ? ": " : "", x->detail ? x->detail : "", "");
        }
        result_conditions(r, &w->conditions);
    } else {
        result_line(r, "%s", to);
        result_line(r, "  unchanged: nothing of the pass applies (`why not RULE` says why)");
    }
    free(from);
    free(to);
}

tw_status request_rewrite(session *s, const statement *st, result *r, value **keep)
{
    expr *before = session_lower(s, st->as.rewrite.value);
    if (!before) return TW_ERROR;
    pass *p = session_pass(s, st->as.rewrite.with);
    if (!p) return TW_ERROR;
    rewriting w;
    rewriting_init(&w);
    tw_status status = session_check_pass(s, p);
    conditions_append(&w.conditions, &s->rests);
    if (status == TW_OK) status = pass_run(s->e, p, before, &w);
    if (status == TW_OK) {
        rewriting_shown(s, r, before, &w);
        s->current = w.after;
    }
    if (status == TW_OK && keep) {
        *keep = value_new(VALUE_EXPRESSION);
        (*keep)->expression = w.after;
        conditions_append(&(*keep)->conditions, &w.conditions);
    }
    rewriting_clear(&w);
    pass_release(p);
    return status == TW_OK ? TW_OK : request_fail_at(s, st->at);
}

/* ---- why not ---- */

tw_status request_why_not(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    syntax_name name = st->as.name;
    const value *v = names_find(&s->rules, name.text);
    if (!v || v->kind != VALUE_RULE) return no_such_pass(s, name);
    if (!s->current)
        return request_fail(s, st->at, ERROR_VALUE, "there is no current form: `rewrite EXPRESSION with PASS` or a derivation "
                            "makes one");
    text words;
    text_init(&words);
    tw_status status = rule_why_not(s->e, v->rule, s->current, &words);
    if (status == TW_OK) {
        result_restart(r, "why not");
        result_string(r, "rule", name.text);
        result_string(r, "reason", words.bytes);
        result_line(r, "%s", words.bytes);
    }
    text_clear(&words);
    return status == TW_OK ? TW_OK : request_fail_at(s, st->at);
}
