/* Binders and every replacement of leaves. A bound variable is a de Bruijn index inside its binder: the number of
 * binders between it and its own. Knows nothing of what integrals mean. Its one idea: substitution, opening a binder,
 * closing one and shifting are the same walk with another rule for the leaves, memoised by node and level, so shared
 * trees stay linear. */
#include "engine/expr/node.h"

#include <string.h>

typedef enum answer_of_numbers { NUMBERS_NO, NUMBERS_YES, NUMBERS_UNKNOWN } answer_of_numbers;

typedef enum walk_mode { WALK_SUBSTITUTE, WALK_OPEN, WALK_CLOSE, WALK_SHIFT } walk_mode;

typedef struct walk {
    tw_engine *engine;
    walk_mode mode;
    memo memo;
    expr *const *symbols; /* SUBSTITUTE, CLOSE */
    expr *const *values;  /* SUBSTITUTE, OPEN */
    size_t count;
    uint64_t names;       /* of all symbols */
    uint32_t by;          /* SHIFT */
    bool by_level;        /* does the result depend on the level? */
} walk;

static bool walk_passes(const walk *w, expr *a, uint32_t level)
{
    const bool names = (a->names & w->names) != 0;
    return w->mode == WALK_SUBSTITUTE ? !names : !(w->mode == WALK_CLOSE && names) && a->loose <= level;
}

static expr *walk_symbol(const walk *w, expr *a, uint32_t level)
{
    for (size_t k = 0; k < w->count; k++)
        if (w->symbols[k] == a)
            return w->mode == WALK_CLOSE ? node_bound(w->engine, level) : node_shift(w->engine, w->values[k], level);
    return a;
}

/* index >= level here, see walk_passes. */
static expr *walk_bound(const walk *w, expr *a, uint32_t level)
{
    const uint32_t index = a->is.index;
    switch (w->mode) {
    case WALK_OPEN:
        return index == level ? node_shift(w->engine, w->values[0], level) : node_bound(w->engine, index - 1);
    case WALK_CLOSE: return node_bound(w->engine, index + 1);
    case WALK_SHIFT: return node_bound(w->engine, index + w->by);
    default: return a;
    }
}

static expr *walk_node(walk *w, expr *a, uint32_t level)
{
    if (walk_passes(w, a, level))
        return a;
    if (a->kind == EXPR_SYMBOL)
        return walk_symbol(w, a, level);
    if (a->kind == EXPR_BOUND)
        return walk_bound(w, a, level);
    const uint32_t key = w->by_level ? level : 0;
    expr *known = memo_find(&w->memo, a, key);
    if (known)
        return known;
    if (!budget_ok(w->engine))
        return NULL;
    expr **args = engine_scratch(w->engine, a->count, sizeof *args);
    bool same = true;
    for (size_t k = 0; k < a->count; k++) {
        args[k] = walk_node(w, a->args[k], level + node_child_is_under(a->kind, a->count, k));
        if (!args[k])
            return NULL;
        same = same && args[k] == a->args[k];
    }
    expr *made = same ? a : expr_rebuild(w->engine, a, args);
    if (made)
        memo_keep(&w->memo, a, key, (void *)made);
    return made;
}

static expr *walk_run(walk *w, expr *a)
{
    const arena_place mark = arena_mark(&w->engine->scratch);
    memo_init(&w->memo, w->engine);
    expr *made = walk_node(w, a, 0);
    arena_release(&w->engine->scratch, mark);
    return made;
}

expr *node_shift(tw_engine *e, expr *a, uint32_t by)
{
    if (by == 0 || a->loose == 0)
        return a;
    walk w = {.engine = e, .mode = WALK_SHIFT, .by = by, .by_level = true};
    return walk_run(&w, a);
}

expr *expr_substitute_all(tw_engine *e, expr *a, expr *const *symbols, expr *const *values, size_t n)
{
    walk w = {.engine = e, .mode = WALK_SUBSTITUTE, .symbols = symbols, .values = values, .count = n};
    if (!a)
        return NULL;
    for (size_t k = 0; k < n; k++) {
        if (!symbols[k] || !values[k])
            return NULL;
        w.names |= symbols[k]->names;
        w.by_level = w.by_level || values[k]->loose > 0;
    }
    return walk_run(&w, a);
}

expr *expr_substitute(tw_engine *e, expr *a, expr *symbol, expr *value)
{
    return expr_substitute_all(e, a, &symbol, &value, 1);
}

expr *expr_open(tw_engine *e, expr *binder, expr *value)
{
    if (!binder || !value)
        return NULL;
    if (!node_is_binder(binder)) {
        engine_fail(e, ERROR_INTERNAL, "an expression without a bound variable was opened");
        return NULL;
    }
    walk w = {.engine = e, .mode = WALK_OPEN, .values = &value, .count = 0, .by_level = true};
    return walk_run(&w, binder->args[binder->kind == EXPR_ROOT ? 0 : binder->count - 1]);
}

/* The body with the free symbol turned into the innermost bound variable. */
static expr *body_close(tw_engine *e, expr *variable, expr *body)
{
    if (!variable || !body)
        return NULL;
    if (variable->kind != EXPR_SYMBOL) {
        engine_fail(e, ERROR_VALUE, "the variable of an integral, sum or root must be a name");
        return NULL;
    }
    walk w = {.engine = e, .mode = WALK_CLOSE, .symbols = &variable, .count = 1, .names = variable->names,
        .by_level = true};
    return walk_run(&w, body);
}

static bool is_integer_number(expr *a)
{
    return a->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->is.number));
}

expr *node_rebind(tw_engine *e, expr_kind kind, const char *name, expr *const *args, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!args[k])
            return NULL;
    if (kind != EXPR_ROOT && expr_is_zero(args[n - 1]))
        return args[n - 1];
    if (kind == EXPR_INTEGRAL && args[0] == args[1])
        return expr_int(e, 0);
    if (kind == EXPR_SUMMATION && is_integer_number(args[0]) && is_integer_number(args[1]) &&
        fmpq_cmp(&args[0]->is.number, &args[1]->is.number) > 0)
        return expr_int(e, 0);
    return node_make_binder(e, kind, name, args, n);
}

expr *expr_integral(tw_engine *e, expr *variable, expr *from, expr *to, expr *body)
{
    expr *const args[3] = {from, to, body_close(e, variable, body)};
    return variable ? node_rebind(e, EXPR_INTEGRAL, variable->is.name, args, 3) : NULL;
}

expr *expr_contour(tw_engine *e, expr *variable, expr *const *points, size_t n, expr *body)
{
    const arena_place mark = arena_mark(&e->scratch);
    expr **args = engine_scratch(e, n + 1, sizeof *args);
    memcpy(args, points, n * sizeof *args);
    args[n] = body_close(e, variable, body);
    expr *contour = variable ? node_rebind(e, EXPR_CONTOUR, variable->is.name, args, n + 1) : NULL;
    arena_release(&e->scratch, mark);
    return contour;
}

expr *expr_summation(tw_engine *e, expr *variable, expr *from, expr *to, expr *body)
{
    expr *const args[3] = {from, to, body_close(e, variable, body)};
    return variable ? node_rebind(e, EXPR_SUMMATION, variable->is.name, args, 3) : NULL;
}

expr *expr_root(tw_engine *e, expr *variable, expr *polynomial, expr *near)
{
    expr *const args[2] = {body_close(e, variable, polynomial), near};
    return variable ? node_rebind(e, EXPR_ROOT, variable->is.name, args, 2) : NULL;
}

expr *expr_direction(tw_engine *e, expr *theta)
{
    if (!theta)
        return NULL;
    return expr_is_zero(theta) ? expr_constant_of(e, CONSTANT_INF) : node_make(e, EXPR_DIRECTION, 0, &theta, 1);
}

expr *expr_relation_of(tw_engine *e, expr_relation r, expr *left, expr *right)
{
    if (!left || (r < RELATION_INTEGER && !right))
        return NULL;
    if (r >= RELATION_INTEGER)
        right = left;
    const bool turn = (r == RELATION_EQUAL || r == RELATION_NOT_EQUAL) && right->kind != EXPR_NUMBER &&
                      (left->kind == EXPR_NUMBER || expr_order(left, right) > 0);
    expr *const sides[2] = {turn ? right : left, turn ? left : right};
    return node_make(e, EXPR_RELATION, r, sides, 2);
}

expr *expr_apply(tw_engine *e, expr *f, expr *const *arguments, expr *const *orders, size_t n)
{
    const arena_place mark = arena_mark(&e->scratch);
    expr **args = engine_scratch(e, 2 * n + 1, sizeof *args);
    bool sound = f != NULL;
    args[0] = f;
    for (size_t k = 0; sound && k < n; k++) {
        args[1 + k] = arguments[k];
        args[1 + n + k] = orders ? orders[k] : expr_int(e, 0);
        sound = args[1 + k] && args[1 + n + k];
    }
    expr *made = sound ? node_make(e, EXPR_APPLY, 0, args, 2 * n + 1) : NULL;
    arena_release(&e->scratch, mark);
    return made;
}

size_t expr_apply_arity(expr *a)
{
    return (a->count - 1) / 2;
}

/* Of two numbers the relation is plain; anything else is left to those who know the facts. */
static answer_of_numbers relation_of_numbers(expr *relation)
{
    expr *left = relation->args[0], *right = relation->args[1];
    if (relation->kind != EXPR_RELATION || left->kind != EXPR_NUMBER || right->kind != EXPR_NUMBER)
        return NUMBERS_UNKNOWN;
    const int order = fmpq_cmp(&left->is.number, &right->is.number);
    bool holds = true;
    switch (relation->is.relation) {
    case RELATION_LESS: holds = order < 0; break;
    case RELATION_LESS_EQUAL: holds = order <= 0; break;
    case RELATION_EQUAL: holds = order == 0; break;
    case RELATION_NOT_EQUAL: holds = order != 0; break;
    case RELATION_INTEGER: holds = is_integer_number(left); break;
    case RELATION_REAL: case RELATION_COMPLEX: break;
    }
    return holds ? NUMBERS_YES : NUMBERS_NO;
}

/* What holds otherwise may be piecewise again: its cases follow. */
static expr *piecewise_flat(tw_engine *e, expr *const *args, size_t n)
{
    expr *otherwise = args[n - 1];
    if (otherwise->kind == EXPR_PIECEWISE) {
        expr **all = engine_scratch(e, n - 1 + otherwise->count, sizeof *all);
        memcpy(all, args, (n - 1) * sizeof *all);
        memcpy(all + n - 1, otherwise->args, otherwise->count * sizeof *all);
        n += otherwise->count - 1;
        args = all;
        otherwise = args[n - 1];
    }
    expr **kept = engine_scratch(e, n, sizeof *kept);
    size_t count = 0;
    for (size_t k = 0; k + 1 < n; k += 2) {
        answer_of_numbers holds = relation_of_numbers(args[k]);
        if (holds == NUMBERS_YES) {
            otherwise = args[k + 1];
            break;
        }
        if (holds == NUMBERS_NO)
            continue;
        kept[count++] = args[k];
        kept[count++] = args[k + 1];
    }
    while (count > 0 && kept[count - 1] == otherwise)
        count -= 2;
    kept[count++] = otherwise;
    return count == 1 ? otherwise : node_make(e, EXPR_PIECEWISE, 0, kept, count);
}

static expr *piecewise_make(tw_engine *e, expr *const *args, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!args[k])
            return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    expr *piecewise = piecewise_flat(e, args, n);
    arena_release(&e->scratch, mark);
    return piecewise;
}

expr *expr_piecewise(tw_engine *e, expr *const *conditions, expr *const *values, size_t n, expr *otherwise)
{
    const arena_place mark = arena_mark(&e->scratch);
    expr **args = engine_scratch(e, 2 * n + 1, sizeof *args);
    for (size_t k = 0; k < n; k++) {
        args[2 * k] = conditions[k];
        args[2 * k + 1] = values[k];
    }
    args[2 * n] = otherwise;
    expr *piecewise = piecewise_make(e, args, 2 * n + 1);
    arena_release(&e->scratch, mark);
    return piecewise;
}

expr *expr_rebuild(tw_engine *e, expr *a, expr *const *args)
{
    switch (a->kind) {
    case EXPR_SUM: return expr_sum(e, args, a->count);
    case EXPR_PRODUCT: return expr_product(e, args, a->count);
    case EXPR_POWER: return expr_pow(e, args[0], args[1]);
    case EXPR_CALL: return expr_call(e, a->is.function, args, a->count);
    case EXPR_INTEGRAL: case EXPR_CONTOUR: case EXPR_SUMMATION: case EXPR_ROOT:
        return node_rebind(e, a->kind, a->is.name, args, a->count);
    case EXPR_PIECEWISE: return piecewise_make(e, args, a->count);
    case EXPR_DIRECTION: return expr_direction(e, args[0]);
    case EXPR_RELATION: return expr_relation_of(e, a->is.relation, args[0], args[1]);
    case EXPR_APPLY: return node_make(e, EXPR_APPLY, 0, args, a->count);
    default: return a;
    }
}
