/* From the syntax of a rule to its expressions. Knows how names are bound in a rule, nothing of matching. Its one idea:
 * each pattern variable is a fresh symbol in a scope around the rule, each pattern function a function whose body is
 * that symbol applied to its arguments. */
#include "lang/lower_rule.h"

#include <stdlib.h>
#include <string.h>

#include "engine/expr/facts.h"

typedef struct rule_parts {
    lowering *l;
    const statement *st;
    size_t count;
    pattern_variable *variables;
    lower_scope *scopes;
    lower_local *locals;
    size_t local_count;
    expr *left, *right;
    lower_conditions conditions;
} rule_parts;

static bool fail_at(lowering *l, span at)
{
    if (!l->failed) l->place = at;
    l->failed = true;
    return false;
}

static bool names_differ(rule_parts *p)
{
    const syntax_parameter *list = p->st->as.rule->parameters;
    for (size_t k = 0; k < p->count; k++)
        for (size_t j = 0; j < k; j++)
            if (strcmp(list[j].name.text, list[k].name.text) == 0) {
                engine_fail(p->l->engine, ERROR_NAME, "the pattern variable `%s` stands twice", list[k].name.text);
                return fail_at(p->l, list[k].name.at);
            }
    return true;
}

/* f(x, y): a function of as many parameters, its body the symbol f applied to them. */
static bool declare_function(rule_parts *p, const syntax_parameter *x, expr *symbol)
{
    tw_engine *e = p->l->engine;
    expr **parameters = arena_alloc(&e->arena, x->count * sizeof *parameters);
    for (size_t k = 0; k < x->count; k++) parameters[k] = expr_fresh(e, x->names[k].text);
    expr *body = expr_apply(e, symbol, parameters, NULL, x->count);
    p->locals[p->local_count++] = (lower_local){x->name.text, {x->count, parameters, body}};
    return body != NULL;
}

static bool declare_variables(rule_parts *p)
{
    const syntax_parameter *list = p->st->as.rule->parameters;
    for (size_t k = 0; k < p->count; k++) {
        expr *symbol = expr_fresh(p->l->engine, list[k].name.text);
        if (!symbol) return fail_at(p->l, list[k].name.at);
        p->variables[k] = (pattern_variable){symbol, list[k].count};
        if (list[k].count > 0) {
            if (!declare_function(p, &list[k], symbol)) return fail_at(p->l, list[k].name.at);
        } else {
            p->scopes[k] = (lower_scope){list[k].name.text, symbol, p->l->scope};
            p->l->scope = &p->scopes[k];
        }
    }
    p->l->locals = p->locals;
    p->l->local_count = p->local_count;
    return true;
}

/* In conditions the arguments that f(x) is written with stand for all values. */
static bool lower_rule_conditions(rule_parts *p, lower_scope *scopes)
{
    const syntax_parameter *list = p->st->as.rule->parameters;
    lower_scope *outer = p->l->scope;
    size_t n = 0;
    for (size_t k = 0; k < p->count; k++)
        for (size_t j = 0; j < list[k].count; j++) {
            bool known = false;
            for (const lower_scope *s = p->l->scope; s; s = s->outer) known = known || !strcmp(s->name, list[k].names[j].text);
            if (known) continue;
            scopes[n] = (lower_scope){list[k].names[j].text, expr_fresh(p->l->engine, list[k].names[j].text), p->l->scope};
            p->l->scope = &scopes[n++];
        }
    const syntax_conditions *when = &p->st->as.rule->when;
    bool good = true;
    for (size_t k = 0; good && k < when->count; k++) good = lower_condition(p->l, when->list[k], &p->conditions) == TW_OK;
    p->l->scope = outer;
    return good;
}

/* What is said to be complex is so already while the sides are built: constructors know names as real otherwise. */
static bool assume_complex(rule_parts *p)
{
    tw_engine *e = p->l->engine;
    for (size_t k = 0; k < p->conditions.count; k++)
        if (p->conditions.list[k]->is.relation == RELATION_COMPLEX &&
            facts_add(e, p->conditions.list[k], CONDITION_GIVEN) != TW_OK)
            return fail_at(p->l, p->st->at);
    return true;
}

static rule *build(rule_parts *p)
{
    const statement *st = p->st;
    tw_engine *e = p->l->engine;
    size_t arguments = 0;
    for (size_t k = 0; k < p->count; k++) arguments += st->as.rule->parameters[k].count;
    lower_scope *scopes = base_alloc((arguments + 1) * sizeof *scopes);
    bool good = names_differ(p) && declare_variables(p) && lower_rule_conditions(p, scopes) && assume_complex(p);
    free(scopes);
    if (good) p->left = lower_expression(p->l, st->as.rule->pattern);
    if (p->left) p->right = lower_expression(p->l, st->as.rule->becomes);
    if (!p->right) return NULL;
    rule *r = rule_new(e, st->as.rule->name.text, p->variables, p->count, p->left, p->right, p->conditions.list,
                       p->conditions.count, st->as.rule->because);
    if (!r) {
        fail_at(p->l, st->as.rule->name.at);
        return NULL;
    }
    text words;
    text_init(&words);
    statement_print(&words, st);
    r->text = text_take(&words);
    return r;
}

rule *lower_rule(lowering *l, const statement *st)
{
    rule_parts p = {.l = l, .st = st, .count = st->as.rule->count};
    p.variables = base_alloc((p.count + 1) * sizeof *p.variables);
    p.scopes = base_alloc((p.count + 1) * sizeof *p.scopes);
    p.locals = base_alloc((p.count + 1) * sizeof *p.locals);
    lower_conditions_init(&p.conditions);
    lower_scope *outer = l->scope;
    struct facts *before = facts_copy(l->engine);
    rule *r = build(&p);
    facts_restore(l->engine, before);
    l->scope = outer;
    l->locals = NULL;
    l->local_count = 0;
    lower_conditions_clear(&p.conditions);
    free(p.variables);
    free(p.scopes);
    free(p.locals);
    return r;
}
