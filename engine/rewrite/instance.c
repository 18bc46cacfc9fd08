/* Values put into patterns, replacements and conditions. Knows nothing of matching. Its one idea: pattern functions are
 * applied first, from the inside out, then the plain variables are substituted; both walks are capture-free because
 * bound variables have no names. Also what matching keeps in an engine: the symbols of opened binders. */
#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/pattern_node.h"

/* ---- opened binders ---- */

enum { OPEN_ROOM = 1 << 12 };

struct matching {
    expr **symbols;
    uint32_t count;
    /* The bodies opened last; a place is taken by whoever comes. */
    struct opened {
        expr *binder, *body;
        uint32_t level;
    } opened[OPEN_ROOM];
};

static struct matching *matching_of(tw_engine *e)
{
    if (!e->matching) {
        struct matching *m = base_alloc(sizeof *m);
        memset(m, 0, sizeof *m);
        e->matching = m;
    }
    return e->matching;
}

void matching_free(struct matching *m)
{
    if (!m) return;
    free(m->symbols);
    free(m);
}

expr *matching_symbol(tw_engine *e, uint32_t level)
{
    struct matching *m = matching_of(e);
    while (m->count <= level) {
        expr *symbol = expr_fresh(e, "x");
        m->symbols = base_resize(m->symbols, (m->count + 1) * sizeof *m->symbols);
        m->symbols[m->count++] = symbol;
    }
    return m->symbols[level];
}

expr *matching_open(tw_engine *e, expr *binder, uint32_t level)
{
    expr *symbol = matching_symbol(e, level);
    struct opened *known = &matching_of(e)->opened[(binder->hash + level * 0x9e3779b9u) & (OPEN_ROOM - 1)];
    if (known->binder == binder && known->level == level) return known->body;
    expr *body = expr_open(e, binder, symbol);
    if (body) *known = (struct opened){binder, body, level};
    return body;
}

/* ---- pattern functions applied ---- */

typedef struct applying {
    tw_engine *e;
    const pattern_variable *variables;
    size_t count;
    expr *const *values;
    expr *const *const *parameters;
    memo memo;
} applying;

static expr *apply_walk(applying *w, expr *a);

/* The body of function k differentiated as often as asked, its parameters replaced by the arguments. */
static expr *apply_function(applying *w, size_t k, expr *const *args, size_t n)
{
    expr *body = w->values[k];
    for (size_t j = 0; j < n; j++) {
        if (!expr_is_number(args[1 + n + j])) return NULL;
        slong order = fmpz_get_si(fmpq_numref(expr_number(args[1 + n + j])));
        for (; body && order > 0; order--)
            body = budget_ok(w->e) ? expr_derivative(w->e, body, w->parameters[k][j]) : NULL;
    }
    return expr_substitute_all(w->e, body, w->parameters[k], args + 1, n);
}

static expr *apply_node(applying *w, expr *a)
{
    expr **args = engine_scratch(w->e, a->count, sizeof *args);
    bool same = true;
    for (size_t k = 0; k < a->count; k++) {
        args[k] = apply_walk(w, a->args[k]);
        if (!args[k]) return NULL;
        same = same && args[k] == a->args[k];
    }
    if (a->kind == EXPR_APPLY)
        for (size_t k = 0; k < w->count; k++)
            if (w->variables[k].symbol == a->args[0] && w->variables[k].arity == expr_apply_arity(a) && w->values[k])
                return apply_function(w, k, args, w->variables[k].arity);
    return same ? a : expr_rebuild(w->e, a, args);
}

static expr *apply_walk(applying *w, expr *a)
{
    if (a->count == 0) return a;
    expr *known = memo_find(&w->memo, a, 0);
    if (known) return known;
    if (!budget_ok(w->e)) return NULL;
    known = apply_node(w, a);
    if (known) memo_keep(&w->memo, a, 0, (void *)known);
    return known;
}

/* ---- instances ---- */

static expr *apply_functions(tw_engine *e, expr *form, const pattern_variable *variables, size_t count,
                             expr *const *values, expr *const *const *parameters)
{
    bool any = false;
    for (size_t k = 0; k < count; k++) any = any || (variables[k].arity > 0 && values[k]);
    if (!any) return form;
    applying w = {.e = e, .variables = variables, .count = count, .values = values, .parameters = parameters};
    memo_init(&w.memo, e);
    return apply_walk(&w, form);
}

expr *pattern_instance(tw_engine *e, expr *form, const pattern_variable *variables, size_t count, expr *const *values,
                       expr *const *const *parameters)
{
    if (!form) return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    expr *made = apply_functions(e, form, variables, count, values, parameters);
    expr **from = engine_scratch(e, count + 1, sizeof *from), **to = engine_scratch(e, count + 1, sizeof *to);
    size_t n = 0;
    for (size_t k = 0; k < count; k++) {
        if (variables[k].arity > 0 || !values[k]) continue;
        from[n] = variables[k].symbol;
        to[n++] = values[k];
    }
    if (n > 0) made = expr_substitute_all(e, made, from, to, n);
    arena_release(&e->scratch, mark);
    return made;
}

expr *match_instance(tw_engine *e, const match *m, expr *form)
{
    const pattern *p = m->of;
    return pattern_instance(e, form, p->variables, p->count, m->values, (expr *const *const *)p->parameters);
}
