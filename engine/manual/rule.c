/* A derivation as a rule of its own. The one idea: the integral as typed is the pattern, its parameters are the variables,
 * and what was known of them when the moves were made are the conditions; so the rule says no more than was derived. */
#include <stdlib.h>
#include <string.h>

#include "engine/manual/work.h"

typedef struct rule_draft {
    tw_engine *e;
    size_t count;
    expr **symbols;              /* as typed */
    pattern_variable *variables; /* fresh ones of the same names */
    expr **fresh;
    size_t condition_count, room;
    expr **conditions, **typed_conditions;
} rule_draft;

static expr *with_variables(const rule_draft *d, expr *a)
{
    return expr_substitute_all(d->e, a, d->symbols, d->fresh, d->count);
}

static bool speaks_of_variables_only(const rule_draft *d, expr *a)
{
    expr **symbols;
    size_t n = expr_symbols(a, &symbols);
    bool good = n > 0;
    for (size_t k = 0; k < n && good; k++) {
        bool known = false;
        for (size_t j = 0; j < d->count; j++) known = known || d->symbols[j] == symbols[k];
        good = known;
    }
    free(symbols);
    return good;
}

static void add_condition(rule_draft *d, expr *relation)
{
    if (!relation || !speaks_of_variables_only(d, relation)) return;
    for (size_t k = 0; k < d->condition_count; k++)
        if (d->typed_conditions[k] == relation) return;
    if (d->condition_count == d->room) {
        d->room = d->room ? 2 * d->room : 8;
        d->conditions = base_resize(d->conditions, d->room * sizeof *d->conditions);
        d->typed_conditions = base_resize(d->typed_conditions, d->room * sizeof *d->typed_conditions);
    }
    d->typed_conditions[d->condition_count] = relation;
    d->conditions[d->condition_count++] = with_variables(d, relation);
}

/* The facts in force, the sign of the large parameter, and what the moves needed. */
static void collect_conditions(rule_draft *d, const manual *m)
{
    tw_engine *e = d->e;
    if (m->large && expr_has(m->typed, m->large))
        add_condition(d, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), m->large));
    for (size_t k = 0; k < m->fact_count; k++) add_condition(d, m->facts[k]);
    condition_list all;
    conditions_init(&all);
    manual_conditions(m, &all);
    for (size_t k = 0; k < all.count; k++)
        if (all.list[k].label != CONDITION_PROVED) add_condition(d, all.list[k].relation);
    conditions_clear(&all);
}

/* The rule as it would be typed. */
static char *rule_words(const rule_draft *d, const manual *m, const char *name, expr *right)
{
    text out;
    text_init(&out);
    text_addf(&out, "rule %s(", name);
    for (size_t k = 0; k < d->count; k++) text_addf(&out, "%s%s", k ? ", " : "", d->symbols[k]->is.name);
    text_add(&out, "):\n    ");
    expr_print(d->e, &out, m->typed);
    text_add(&out, "\n    becomes ");
    expr_print(d->e, &out, right);
    for (size_t k = 0; k < d->condition_count; k++) {
        text_add(&out, k ? ", " : "\n    when ");
        expr_print(d->e, &out, d->typed_conditions[k]);
    }
    text_add(&out, "\n    because \"a derivation by hand\"");
    return text_take(&out);
}

static void draft_init(rule_draft *d, const manual *m)
{
    memset(d, 0, sizeof *d);
    d->e = m->e;
    d->count = expr_symbols(m->typed, &d->symbols);
    d->variables = base_alloc((d->count + 1) * sizeof *d->variables);
    d->fresh = base_alloc((d->count + 1) * sizeof *d->fresh);
    for (size_t k = 0; k < d->count; k++) {
        d->fresh[k] = expr_fresh(d->e, d->symbols[k]->is.name);
        d->variables[k] = (pattern_variable){.symbol = d->fresh[k], .arity = 0};
    }
}

static void draft_clear(rule_draft *d)
{
    free(d->symbols);
    free(d->variables);
    free(d->fresh);
    free(d->conditions);
    free(d->typed_conditions);
}

rule *manual_rule(const manual *m, const char *name)
{
    tw_engine *e = m->e;
    expr *right = manual_value(m);
    if (!right) return NULL;
    if (manual_now(m)->pending) {
        engine_fail(e, ERROR_UNSUITABLE, "a differentiation in %s has not been integrated back: the form is a derivative of the "
                                         "integral, no value of it", manual_now(m)->pending->parameter->is.name);
        return NULL;
    }
    if (right == m->typed) {
        engine_fail(e, ERROR_UNSUITABLE, "the derivation has changed nothing, so it is no rule");
        return NULL;
    }
    rule_draft d;
    draft_init(&d, m);
    collect_conditions(&d, m);
    expr *left = with_variables(&d, m->typed), *after = with_variables(&d, right);
    rule *made = left && after ? rule_new(e, name, d.variables, d.count, left, after, d.conditions, d.condition_count,
                                          "a derivation by hand")
                               : NULL;
    if (made) {
        free(made->text);
        made->text = rule_words(&d, m, name, right);
        if (manual_is_proved(m)) {
            made->status = RULE_PROVED;
            made->checked = true;
            free(made->finding);
            made->finding = base_copy("a derivation made of proved moves");
        }
    }
    draft_clear(&d);
    return made;
}
