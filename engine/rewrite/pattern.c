/* Compiles patterns. Knows expressions, nothing of matching or rules. Its one idea: what can be asked once is asked
 * here: which parts are fixed, which take what is left over, which may be absent, and in which order parts are tried. */
#include "engine/rewrite/pattern.h"

#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/pattern_node.h"

typedef struct compiling {
    tw_engine *e;
    pattern *p;
    uint64_t bound;     /* variables with an occurrence that binds them */
    uint64_t functions; /* pattern functions with an occurrence that binds them */
} compiling;

static part *compile(compiling *c, expr *form, uint32_t level, bool exponent);

static const char *pattern_title(const pattern *p)
{
    return p->name ? p->name : "pattern";
}

static uint64_t bit(size_t k)
{
    return (uint64_t)1 << k;
}

static uint64_t variables_in(const pattern *p, expr *form)
{
    uint64_t in = 0;
    for (size_t k = 0; k < p->count; k++)
        if (expr_has(form, p->variables[k].symbol)) in |= bit(k);
    return in;
}

static size_t variable_of(const pattern *p, expr *symbol)
{
    size_t k = 0;
    while (k < p->count && p->variables[k].symbol != symbol) k++;
    return k;
}

static part *part_new(compiling *c, part_kind kind, expr *form, uint32_t level)
{
    pattern *p = c->p;
    if (p->numbered_count == p->numbered_room) {
        p->numbered_room = p->numbered_room ? 2 * p->numbered_room : 16;
        p->numbered = base_resize(p->numbered, p->numbered_room * sizeof *p->numbered);
    }
    part *a = arena_alloc(&p->memory, sizeof *a);
    memset(a, 0, sizeof *a);
    a->kind = kind;
    a->form = form;
    a->level = level;
    a->variable = PATTERN_VARIABLE_LIMIT;
    fmpq_init(a->number);
    p->numbered[p->numbered_count++] = a;
    return a;
}

static bool part_room(compiling *c, part *a, size_t n)
{
    a->parts = arena_alloc(&c->p->memory, (n + 1) * sizeof *a->parts);
    return true;
}

static bool part_push(part *a, part *child)
{
    if (!child) return false;
    a->parts[a->count++] = child;
    a->variables |= child->variables;
    return true;
}

/* ---- pattern functions ---- */

/* Are the arguments different variables bound within the pattern? */
static bool arguments_are_bound(compiling *c, expr *form, uint32_t level)
{
    const size_t n = expr_apply_arity(form);
    for (size_t k = 0; k < n; k++) {
        bool found = false;
        for (uint32_t l = 0; l < level; l++) found = found || form->args[1 + k] == matching_symbol(c->e, l);
        for (size_t j = 0; j < k; j++) found = found && form->args[1 + j] != form->args[1 + k];
        if (!found) return false;
    }
    return true;
}

static part *compile_function(compiling *c, expr *form, uint32_t level)
{
    const size_t n = expr_apply_arity(form), k = variable_of(c->p, form->args[0]);
    const char *name = form->args[0]->is.name;
    if (k == c->p->count || c->p->variables[k].arity != n) {
        engine_fail(c->e, ERROR_VALUE, "the pattern function `%s` of `%s` is used with %zu argument%s", name,
                    pattern_title(c->p), n, n == 1 ? "" : "s");
        return NULL;
    }
    for (size_t j = 0; j < n; j++)
        if (!expr_is_zero(form->args[1 + n + j])) {
            engine_fail(c->e, ERROR_VALUE, "the pattern of `%s` differentiates `%s`, which no matching can undo",
                        pattern_title(c->p), name);
            return NULL;
        }
    const bool binds = arguments_are_bound(c, form, level);
    part *a = part_new(c, binds ? PART_FUNCTION : PART_CHECKED, form, level);
    a->variable = k;
    a->variables = binds ? bit(k) : variables_in(c->p, form);
    if (binds) c->functions |= bit(k);
    return a;
}

/* ---- sums and products ---- */

static bool is_taker(const part *a)
{
    return a->kind == PART_VARIABLE || a->kind == PART_ROOTED || a->kind == PART_FUNCTION;
}

/* When a part has its turn. */
static int part_rank(const part *a)
{
    if (is_taker(a)) return 5;
    if (a->kind == PART_CHECKED) return 4;
    if (a->kind == PART_FIXED) return 0;
    if (!a->may_vanish) return 1;
    return a->parts[0]->variables ? 3 : 2;
}

static bool comes_before(const part *a, const part *b)
{
    const int rank_a = part_rank(a), rank_b = part_rank(b);
    return rank_a != rank_b ? rank_a < rank_b : rank_a == 5 && a->variable < b->variable;
}

static void sort_parts(part *a)
{
    for (size_t k = 1; k < a->count; k++) {
        part *moving = a->parts[k];
        size_t at = k;
        for (; at > 0 && comes_before(moving, a->parts[at - 1]); at--) a->parts[at] = a->parts[at - 1];
        a->parts[at] = moving;
    }
}

/* A factor v^q of a product, v a variable and q a number. */
static part *compile_rooted(compiling *c, expr *form, uint32_t level)
{
    part *a = part_new(c, PART_ROOTED, form, level);
    a->variable = variable_of(c->p, form->args[0]);
    a->variables = bit(a->variable);
    fmpq_set(a->number, expr_number(form->args[1]));
    c->bound |= a->variables;
    return a;
}

static bool is_rooted(const pattern *p, expr *form)
{
    return form->kind == EXPR_POWER && expr_is_number(form->args[1]) && variable_of(p, form->args[0]) < p->count;
}

static part *compile_group(compiling *c, expr *form, uint32_t level, bool exponent)
{
    const bool product = form->kind == EXPR_PRODUCT;
    part *a = part_new(c, product ? PART_PRODUCT : PART_SUM, form, level);
    part_room(c, a, form->count);
    fmpq_set_si(a->number, product, 1);
    for (size_t k = 0; k < form->count; k++) {
        expr *piece = form->args[k];
        if (expr_is_number(piece)) {
            fmpq_set(a->number, expr_number(piece));
            continue;
        }
        part *child = product && is_rooted(c->p, piece) ? compile_rooted(c, piece, level)
                                                        : compile(c, piece, level, false);
        if (!part_push(a, child)) return NULL;
    }
    sort_parts(a);
    for (size_t k = 0; k < a->count; k++) a->takers += is_taker(a->parts[k]);
    a->exponent = exponent;
    a->alone = a->takers == a->count;
    a->free_number = !a->alone || exponent || (product ? fmpq_is_one(a->number) : fmpq_is_zero(a->number));
    return a;
}

/* ---- the others ---- */

static part *compile_power(compiling *c, expr *form, uint32_t level)
{
    part *a = part_new(c, PART_POWER, form, level);
    part_room(c, a, 2);
    if (!part_push(a, compile(c, form->args[0], level, false))) return NULL;
    if (!part_push(a, compile(c, form->args[1], level, true))) return NULL;
    a->may_vanish = a->parts[1]->variables != 0;
    return a;
}

static part *compile_node(compiling *c, expr *form, uint32_t level)
{
    const bool binder = node_is_binder(form);
    part *a = part_new(c, binder ? PART_BINDER : PART_OTHER, form, level);
    part_room(c, a, form->count);
    a->opened = binder ? matching_symbol(c->e, level) : NULL;
    for (size_t k = 0; k < form->count; k++) {
        const bool under = node_child_is_under(form->kind, form->count, k);
        expr *child = under ? matching_open(c->e, form, level) : form->args[k];
        if (!child || !part_push(a, compile(c, child, level + under, false))) return NULL;
    }
    return a;
}

static part *compile(compiling *c, expr *form, uint32_t level, bool exponent)
{
    const uint64_t inside = variables_in(c->p, form);
    if (!budget_ok(c->e)) return NULL;
    if (inside == 0) return part_new(c, PART_FIXED, form, level);
    switch (form->kind) {
    case EXPR_SYMBOL: {
        part *a = part_new(c, PART_VARIABLE, form, level);
        a->variable = variable_of(c->p, form);
        a->variables = inside;
        c->bound |= inside;
        return a;
    }
    case EXPR_APPLY: return compile_function(c, form, level);
    case EXPR_SUM: case EXPR_PRODUCT: return compile_group(c, form, level, exponent);
    case EXPR_POWER: return compile_power(c, form, level);
    default: return compile_node(c, form, level);
    }
}

/* ---- the whole ---- */

static tw_status check_variables(compiling *c)
{
    const pattern *p = c->p;
    for (size_t k = 0; k < p->count; k++) {
        const char *name = p->variables[k].symbol->is.name;
        if (!(p->root->variables & bit(k)))
            return engine_fail(c->e, ERROR_VALUE, "the pattern variable `%s` does not occur in the pattern of `%s`", name,
                               pattern_title(p));
        if (p->variables[k].arity > 0 && !(c->functions & bit(k)))
            return engine_fail(c->e, ERROR_VALUE, "the pattern of `%s` has no place where the pattern function `%s` stands "
                               "with variables that are bound by an integral or a sum", pattern_title(p), name);
        if (p->variables[k].arity == 0 && !(c->bound & bit(k)))
            return engine_fail(c->e, ERROR_VALUE, "the pattern variable `%s` of `%s` occurs only within a pattern "
                               "function's argument, where it cannot be found", name, pattern_title(p));
    }
    if (p->root->kind == PART_VARIABLE || p->root->kind == PART_FUNCTION)
        return engine_fail(c->e, ERROR_VALUE, "the pattern of `%s` is one variable: it would match everything",
                           pattern_title(p));
    return TW_OK;
}

static void copy_variables(tw_engine *e, pattern *p, const pattern_variable *variables, size_t count)
{
    p->count = count;
    p->variables = base_alloc((count + 1) * sizeof *p->variables);
    p->parameters = base_alloc((count + 1) * sizeof *p->parameters);
    for (size_t k = 0; k < count; k++) {
        p->variables[k] = variables[k];
        p->parameters[k] = NULL;
        p->with_functions = p->with_functions || variables[k].arity > 0;
        if (variables[k].arity > 0)
            p->parameters[k] = arena_alloc(&e->arena, variables[k].arity * sizeof *p->parameters[k]);
        for (size_t j = 0; j < variables[k].arity; j++) p->parameters[k][j] = expr_fresh(e, "x");
    }
}

pattern *pattern_new(tw_engine *e, const char *name, expr *form, const pattern_variable *variables, size_t count)
{
    if (!form) return NULL;
    if (count > PATTERN_VARIABLE_LIMIT) {
        engine_fail(e, ERROR_VALUE, "`%s` has more than %d pattern variables", name ? name : "pattern",
                    PATTERN_VARIABLE_LIMIT);
        return NULL;
    }
    pattern *p = base_alloc(sizeof *p);
    memset(p, 0, sizeof *p);
    p->e = e;
    p->form = form;
    arena_init(&p->memory);
    p->name = name ? base_copy(name) : NULL;
    copy_variables(e, p, variables, count);
    compiling c = {.e = e, .p = p};
    const bool group = form->kind == EXPR_SUM || form->kind == EXPR_PRODUCT; /* with a rest also without variables */
    p->root = group ? compile_group(&c, form, 0, false) : compile(&c, form, 0, false);
    if (!p->root || check_variables(&c) != TW_OK) {
        pattern_free(p);
        return NULL;
    }
    return p;
}

void pattern_free(pattern *p)
{
    if (!p) return;
    for (size_t k = 0; k < p->numbered_count; k++) fmpq_clear(p->numbered[k]->number);
    free(p->numbered);
    arena_clear(&p->memory);
    free(p->variables);
    free(p->parameters);
    free(p->name);
    free(p);
}

expr *pattern_form(const pattern *p)
{
    return p->form;
}

size_t pattern_variables(const pattern *p, const pattern_variable **list)
{
    *list = p->variables;
    return p->count;
}

expr *const *pattern_parameters(const pattern *p, size_t k)
{
    return p->parameters[k];
}
