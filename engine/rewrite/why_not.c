/* Why a rule does not apply. Knows rules and how a match fails. Its one idea: at every place of the expression either the
 * pattern does not match, and the part that failed after the most others had fitted is the nearest; or it matches and a
 * condition is not met, which is nearer still. The nearest of all places is told. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/expr/node.h"
#include "engine/rewrite/condition.h"
#include "engine/rewrite/pattern_node.h"
#include "engine/rewrite/rule.h"

typedef struct search {
    tw_engine *e;
    const rule *r;
    expr *place;         /* the subexpression that is looked at */
    size_t met;          /* conditions met by the best match so far, plus 1; 0: no match yet */
    text best;           /* its words */
    bool applies;
    nearest form;        /* of failures of the pattern */
    expr *form_place;
} search;

static void add_form(search *s, text *out, expr *a)
{
    char *words = expr_text(s->e, a);
    text_addf(out, "`%.100s%s`", words ? words : "?", words && strlen(words) > 100 ? "..." : "");
    free(words);
}

static void add_values(search *s, text *out, const match *m)
{
    bool any = false;
    for (size_t k = 0; k < s->r->count; k++) {
        text_addf(out, "%s%s = ", any ? ", " : " with ", s->r->variables[k].symbol->is.name);
        expr_print(s->e, out, m->values[k]);
        any = true;
    }
}

/* What is declared of the condition's names. */
static void add_known(search *s, text *out, expr *wanted)
{
    size_t count = 0;
    for (size_t k = 0; k < facts_count(s->e); k++) {
        condition_label label;
        expr *fact = facts_at(s->e, k, &label);
        if ((fact->names & wanted->names) == 0) continue;
        text_add(out, count++ ? ", " : "; known is ");
        expr_print(s->e, out, fact);
    }
    if (count == 0 && wanted->names) text_add(out, "; nothing is declared of its names");
}

static void add_condition(search *s, text *out, expr *here, expr *typed, answer a)
{
    text_add(out, ": its condition ");
    add_form(s, out, typed);
    if (here && here != typed) {
        text_add(out, ", here ");
        add_form(s, out, here);
        text_add(out, ",");
    }
    text_add(out, a == ANSWER_NO ? " does not hold" : " is neither proved nor refuted");
    if (a != ANSWER_NO && here) {
        add_known(s, out, here);
        if (here->names) {
            text_add(out, "; `grant ");
            expr_print(s->e, out, here);
            text_add(out, "` would take it as true");
        }
    }
}

/* The first condition that is not met, into words; false when all are. */
static bool first_unmet(search *s, const match *m, text *out, size_t *met)
{
    const rule *r = s->r;
    for (size_t k = 0; k < r->count; k++) {
        condition_label label;
        if (r->variables[k].arity > 0 || (r->complex_variables >> k & 1)) continue;
        expr *value = m->values[k];
        if (condition_of_real(s->e, value, &label) != ANSWER_YES) {
            text_addf(out, ": `%s` stands for real values (the rule does not declare it complex), and ",
                      r->variables[k].symbol->is.name);
            add_form(s, out, value);
            text_add(out, " is not known to be real");
            return true;
        }
        ++*met;
    }
    for (size_t k = 0; k < r->condition_count; k++) {
        if (r->conditions[k]->is.relation == RELATION_COMPLEX) continue;
        condition_label label;
        expr *here = match_instance(s->e, m, r->conditions[k]);
        const answer a = condition_answer(s->e, here, &label);
        if (a != ANSWER_YES) {
            add_condition(s, out, here, r->conditions[k], a);
            return true;
        }
        ++*met;
    }
    return false;
}

static bool judge_match(void *host, const match *m)
{
    search *s = host;
    size_t met = 1;
    text words;
    text_init(&words);
    text_add(&words, "it matches ");
    add_form(s, &words, s->place);
    add_values(s, &words, m);
    if (!first_unmet(s, m, &words, &met)) {
        expr *made = match_join(s->e, m, match_instance(s->e, m, s->r->right));
        if (made && made != s->place) {
            s->applies = true;
        } else {
            if (!made && s->e->error.kind == ERROR_VALUE) engine_forgive(s->e);
            text_add(&words, made ? ", but changes nothing there" : ", but the replacement has no value there");
        }
    }
    if (s->applies || met > s->met) {
        text_clear(&s->best);
        s->best = words;
        s->met = met;
    } else {
        text_clear(&words);
    }
    return s->applies;
}

static tw_status look_at(search *s, expr *a);

static tw_status look_inside(search *s, expr *a)
{
    for (size_t k = 0; k < a->count && !s->applies; k++) {
        tw_status status;
        if (node_is_binder(a) && node_child_is_under(a->kind, a->count, k)) {
            expr *x = expr_fresh(s->e, expr_binder_name(a)), *body = expr_open(s->e, a, x);
            if (!body) return TW_ERROR;
            condition_assume_range(s->e, a, x);
            status = look_at(s, body);
            facts_forget(s->e, x);
        } else {
            status = look_at(s, a->args[k]);
        }
        if (status != TW_OK) return status;
    }
    return TW_OK;
}

static tw_status look_at(search *s, expr *a)
{
    if (!budget_ok(s->e)) return TW_ERROR;
    s->place = a;
    bool found = false;
    if (pattern_match(s->e, s->r->pattern, a, true, judge_match, s, &found) != TW_OK) return TW_ERROR;
    if (!found) {
        nearest here = s->form;
        if (pattern_nearest(s->e, s->r->pattern, a, &here) != TW_OK) return TW_ERROR;
        if (here.depth > s->form.depth) {
            s->form = here;
            s->form_place = a;
        }
    }
    return look_inside(s, a);
}

tw_status rule_why_not(tw_engine *e, const rule *r, expr *subject, text *words)
{
    search s = {.e = e, .r = r};
    text_init(&s.best);
    struct facts *before = facts_copy(e);
    tw_status status = look_at(&s, subject);
    facts_restore(e, before);
    if (status == TW_OK) {
        text_addf(words, "%s %s: ", r->name, s.applies ? "applies" : "does not apply");
        if (s.met > 0) {
            text_add(words, s.best.bytes);
        } else if (s.form.part && s.form.depth > 1) {
            text_add(words, "the nearest place is ");
            add_form(&s, words, s.form_place);
            text_add(words, ", where the part ");
            add_form(&s, words, s.form.part);
            text_add(words, " of the pattern finds nothing that fits in ");
            add_form(&s, words, s.form.place);
        } else {
            text_add(words, "nothing in the expression has the form of the pattern ");
            add_form(&s, words, r->left);
        }
        if (r->status == RULE_REFUTED) text_add(words, "; besides, the rule is refuted");
    }
    text_clear(&s.best);
    return status;
}
