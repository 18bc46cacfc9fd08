/* Rules and how one applies at the root of an expression. Knows patterns and facts, nothing of passes. Its one idea: a
 * match counts only when every condition, those the variables' kinds imply among them, is decided as holding; what is
 * unknown leaves the rule unapplied. */
#include "engine/rewrite/rule.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/expr/node.h"
#include "engine/rewrite/condition.h"
#include "engine/rewrite/pattern_node.h"

const char *rule_status_word(rule_status s)
{
    static const char *const words[] = {"unchecked", "passed", "proved", "refuted"};
    return words[s];
}

/* ---- life ---- */

static bool is_of(const rule *r, expr *symbol)
{
    for (size_t k = 0; k < r->count; k++)
        if (r->variables[k].symbol == symbol) return true;
    return false;
}

/* Pattern functions are used as they were declared. */
static tw_status check_functions(tw_engine *e, const rule *r, expr *a)
{
    if (a->kind == EXPR_APPLY) {
        for (size_t k = 0; k < r->count; k++)
            if (r->variables[k].symbol == a->args[0] && r->variables[k].arity != expr_apply_arity(a))
                return engine_fail(e, ERROR_VALUE, "the pattern function `%s` of `%s` takes %zu argument%s",
                                   a->args[0]->is.name, r->name, r->variables[k].arity,
                                   r->variables[k].arity == 1 ? "" : "s");
        if (!is_of(r, a->args[0]))
            return engine_fail(e, ERROR_VALUE, "`%s` is no pattern function of `%s`", a->args[0]->is.name, r->name);
    }
    for (size_t k = 0; k < a->count; k++)
        if (check_functions(e, r, a->args[k]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static void find_complex(rule *r)
{
    for (size_t k = 0; k < r->condition_count; k++)
        for (size_t v = 0; v < r->count; v++)
            if (r->conditions[k]->is.relation == RELATION_COMPLEX && r->conditions[k]->args[0] == r->variables[v].symbol)
                r->complex_variables |= (uint64_t)1 << v;
}

static char *copy_words(const char *words)
{
    return words ? base_copy(words) : NULL;
}

rule *rule_new(tw_engine *e, const char *name, const pattern_variable *variables, size_t count, expr *left, expr *right,
               expr *const *conditions, size_t condition_count, const char *source)
{
    if (!left || !right) return NULL;
    rule *r = base_alloc(sizeof *r);
    memset(r, 0, sizeof *r);
    r->holders = 1;
    r->name = base_copy(name);
    r->source = copy_words(source);
    r->count = count;
    r->variables = base_alloc((count + 1) * sizeof *r->variables);
    if (count) memcpy(r->variables, variables, count * sizeof *variables);
    r->left = left;
    r->right = right;
    r->conditions = base_alloc((condition_count + 1) * sizeof *r->conditions);
    for (size_t k = 0; k < condition_count; k++) r->conditions[r->condition_count++] = conditions[k];
    bool good = true;
    for (size_t k = 0; k < condition_count; k++) good = good && conditions[k] && conditions[k]->kind == EXPR_RELATION;
    if (!good) engine_fail(e, ERROR_INTERNAL, "a condition of the rule `%s` is no condition", name);
    if (good) find_complex(r);
    good = good && check_functions(e, r, right) == TW_OK;
    for (size_t k = 0; good && k < condition_count; k++) good = check_functions(e, r, conditions[k]) == TW_OK;
    if (good) r->pattern = pattern_new(e, name, left, variables, count);
    if (r->pattern) return r;
    rule_release(r);
    return NULL;
}

rule *rule_hold(rule *r)
{
    r->holders++;
    return r;
}

void rule_release(rule *r)
{
    if (!r || --r->holders > 0) return;
    pattern_free(r->pattern);
    free(r->name);
    free(r->source);
    free(r->text);
    free(r->file);
    free(r->finding);
    free(r->variables);
    free(r->conditions);
    free(r);
}

void rule_outcome_init(rule_outcome *o)
{
    o->after = NULL;
    conditions_init(&o->conditions);
}

void rule_outcome_clear(rule_outcome *o)
{
    conditions_clear(&o->conditions);
    rule_outcome_init(o);
}

tw_status rule_usable(tw_engine *e, const rule *r)
{
    if (r->status != RULE_REFUTED) return TW_OK;
    return engine_fail(e, ERROR_REFUTED, "the rule `%s` is refuted and not used: %s", r->name,
                       r->finding ? r->finding : "its sides differ");
}

/* ---- conditions of a match ---- */

/* Does every condition hold? Those that hold by more than arithmetic are added to the list. */
static answer conditions_hold(tw_engine *e, const rule *r, const match *m, condition_list *list)
{
    for (size_t k = 0; k < r->count; k++) {
        if (r->variables[k].arity > 0 || (r->complex_variables >> k & 1)) continue;
        condition_label label;
        answer a = condition_of_real(e, m->values[k], &label);
        if (a != ANSWER_YES) return a;
    }
    for (size_t k = 0; k < r->condition_count; k++) {
        if (r->conditions[k]->is.relation == RELATION_COMPLEX) continue;
        condition_label label;
        expr *here = match_instance(e, m, r->conditions[k]);
        answer a = condition_answer(e, here, &label);
        if (a != ANSWER_YES) return a;
        if (expr_is_closed_value(here)) continue;
        char *words = expr_text(e, here);
        conditions_add(list, words, here, label);
        free(words);
    }
    return ANSWER_YES;
}

/* A rule that is not proved makes a result conditional. */
static void add_standing(const rule *r, condition_list *list)
{
    if (r->status == RULE_PROVED) return;
    text words;
    text_init(&words);
    text_addf(&words, r->status == RULE_PASSED ? "the rule %s (tried at samples, not proved)" : "the rule %s (unchecked)",
              r->name);
    conditions_add(list, words.bytes, NULL, CONDITION_OPEN);
    text_clear(&words);
}

/* ---- applying ---- */

typedef struct applying {
    tw_engine *e;
    const rule *r;
    expr *subject;          /* NULL: a view */
    expr *made;             /* the replacement, joined with the rest unless it is of a view */
    condition_list conditions;
    taken *taken;           /* of a view: what the match took */
    size_t taken_count;
    expr *number;
} applying;

static bool forgive_values(tw_engine *e)
{
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNSUITABLE) engine_forgive(e);
    return e->error.kind == ERROR_NONE;
}

static bool try_match(void *host, const match *m)
{
    applying *a = host;
    conditions_clear(&a->conditions);
    if (conditions_hold(a->e, a->r, m, &a->conditions) != ANSWER_YES) return !forgive_values(a->e);
    expr *made = match_instance(a->e, m, a->r->right);
    if (a->subject) made = match_join(a->e, m, made);
    if (!made) return !forgive_values(a->e);
    if (made == (a->subject ? a->subject : match_instance(a->e, m, a->r->left))) return false;
    a->made = made;
    if (!a->subject) {
        const taken *list;
        a->taken_count = match_taken(m, &list, &a->number);
        a->taken = base_resize(a->taken, (a->taken_count + 1) * sizeof *a->taken);
        memcpy(a->taken, list, a->taken_count * sizeof *list);
    }
    return true;
}

tw_status rule_apply(tw_engine *e, const rule *r, expr *subject, rule_outcome *out)
{
    applying a = {.e = e, .r = r, .subject = subject};
    conditions_init(&a.conditions);
    out->after = NULL;
    tw_status status = pattern_match(e, r->pattern, subject, true, try_match, &a, NULL);
    if (status == TW_OK && a.made) {
        out->after = a.made;
        conditions_append(&out->conditions, &a.conditions);
        add_standing(r, &out->conditions);
    }
    conditions_clear(&a.conditions);
    return status;
}

/* Applies to the view until nothing fits; the replacements are put into `made`, room for view->count + 1. */
static tw_status apply_to_view(applying *a, view *v, expr **made, size_t *times, condition_list *conditions)
{
    tw_status status = TW_OK;
    while (status == TW_OK && *times <= v->count) {
        a->made = NULL;
        status = pattern_match_view(a->e, a->r->pattern, v, try_match, a, NULL);
        if (status != TW_OK || !a->made) break;
        for (size_t k = 0; k < a->taken_count; k++) v->left[a->taken[k].index] = a->taken[k].left;
        v->number = a->number;
        made[(*times)++] = a->made;
        conditions_append(conditions, &a->conditions);
    }
    return status;
}

tw_status rule_apply_all(tw_engine *e, const rule *r, expr *subject, rule_outcome *out, size_t *times)
{
    const part_kind kind = r->pattern->root->kind;
    *times = 0;
    out->after = NULL;
    if (kind != PART_SUM && kind != PART_PRODUCT) {
        tw_status status = rule_apply(e, r, subject, out);
        *times = status == TW_OK && out->after;
        return status;
    }
    const arena_place mark = arena_mark(&e->scratch);
    view v;
    view_init(e, &v, subject, kind == PART_PRODUCT);
    if (v.count > 8) view_prepare(e, &v, r->pattern);
    expr **made = engine_scratch(e, v.count + 3, sizeof *made);
    applying a = {.e = e, .r = r};
    conditions_init(&a.conditions);
    tw_status status = apply_to_view(&a, &v, made, times, &out->conditions);
    if (status == TW_OK && *times > 0) {
        made[*times] = view_left(e, &v);
        out->after = v.product ? expr_product(e, made, *times + 1) : expr_sum(e, made, *times + 1);
        status = out->after ? TW_OK : TW_ERROR;
        if (out->after == subject) out->after = NULL;
        if (out->after) add_standing(r, &out->conditions);
    }
    conditions_clear(&a.conditions);
    free(a.taken);
    arena_release(&e->scratch, mark);
    return status;
}
