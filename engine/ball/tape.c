/* The tape: an expression's nodes in the order of their evaluation, each once. This file compiles; run.c runs.
 * Differences that would cancel (exp(u) - 1 and its like) become operations of their own. Knows nothing of integrals:
 * a closed one is a constant. */
#include "engine/ball/ops.h"

#include <limits.h>
#include <stdlib.h>
#include <string.h>

#include "engine/expr/facts.h"

/* ---- compiling ---- */

static void seen_put(tape *t, expr *a, size_t at);

static void seen_grow(tape *t)
{
    size_t room = t->seen_room, *at = t->seen_at;
    expr **keys = t->seen;
    t->seen_room = room ? 2 * room : 64;
    t->seen = base_alloc(t->seen_room * sizeof *t->seen);
    t->seen_at = base_alloc(t->seen_room * sizeof *t->seen_at);
    memset(t->seen, 0, t->seen_room * sizeof *t->seen);
    t->seen_count = 0;
    for (size_t k = 0; k < room; k++)
        if (keys[k]) seen_put(t, keys[k], at[k]);
    free(keys);
    free(at);
}

static void seen_put(tape *t, expr *a, size_t at)
{
    if (2 * (t->seen_count + 1) > t->seen_room) seen_grow(t);
    size_t k = a->hash & (t->seen_room - 1);
    while (t->seen[k]) k = (k + 1) & (t->seen_room - 1);
    t->seen[k] = a;
    t->seen_at[k] = at;
    t->seen_count++;
}

static bool seen_get(const tape *t, expr *a, size_t *at)
{
    if (!t->seen_room) return false;
    for (size_t k = a->hash & (t->seen_room - 1); t->seen[k]; k = (k + 1) & (t->seen_room - 1))
        if (t->seen[k] == a) {
            *at = t->seen_at[k];
            return true;
        }
    return false;
}

static op *add_op(tape *t, op_kind kind, expr *node, const size_t *operands, size_t n)
{
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 16;
        t->ops = base_resize(t->ops, t->room * sizeof *t->ops);
    }
    if (t->operand_count + n > t->operand_room) {
        t->operand_room = 2 * (t->operand_count + n);
        t->operands = base_resize(t->operands, t->operand_room * sizeof *t->operands);
    }
    op *o = &t->ops[t->count++];
    memset(o, 0, sizeof *o);
    o->kind = kind;
    o->node = node;
    o->first = t->operand_count;
    o->count = n;
    o->constant = kind != OP_VARIABLE;
    acb_init(o->kept);
    for (size_t k = 0; k < n; k++) {
        t->operands[t->operand_count++] = operands[k];
        o->constant = o->constant && t->ops[operands[k]].constant;
    }
    return o;
}

static tw_status compile(tape *t, expr *a, size_t *at);

static tw_status compile_all(tape *t, expr *const *args, size_t n, size_t *at)
{
    for (size_t k = 0; k < n; k++)
        if (compile(t, args[k], &at[k]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status compile_symbol(tape *t, expr *a)
{
    for (size_t k = 0; k < t->var_count; k++) {
        if (t->vars[k] != a) continue;
        op *o = add_op(t, OP_VARIABLE, a, NULL, 0);
        o->index = k;
        o->real = !facts_is_complex(t->e, a);
        return TW_OK;
    }
    char *name = expr_text(t->e, a);
    engine_fail(t->e, ERROR_VALUE, "`%s` has no value here", name);
    free(name);
    return TW_ERROR;
}

static tw_status compile_power(tape *t, expr *a)
{
    size_t at[2];
    if (a->args[1]->kind == EXPR_NUMBER) {
        if (compile(t, a->args[0], at) != TW_OK) return TW_ERROR;
        add_op(t, OP_POWER_RATIONAL, a->args[1], at, 1);
        return TW_OK;
    }
    if (compile_all(t, a->args, 2, at) != TW_OK) return TW_ERROR;
    add_op(t, OP_POWER, a, at, 2);
    return TW_OK;
}

/* a is 1 + u: u, else NULL. */
static expr *beyond_one(tape *t, expr *a)
{
    if (a->kind != EXPR_SUM || !expr_is_one(a->args[0])) return NULL;
    return expr_sum(t->e, a->args + 1, a->count - 1);
}

static tw_status compile_call(tape *t, expr *a)
{
    expr *u = expr_is_call(a, FUNCTION_LOG) ? beyond_one(t, a->args[0]) : NULL;
    size_t small[8], *at = a->count <= 8 ? small : base_alloc(a->count * sizeof *at);
    tw_status status = u ? compile(t, u, at) : compile_all(t, a->args, a->count, at);
    if (status == TW_OK) add_op(t, u ? OP_LOG1P : OP_CALL, a, at, a->count)->function = a->is.function;
    if (at != small) free(at);
    return status;
}

/* The operation for f - 1 where f is 1 at some simple place, and its operand. */
static bool limited_function(tape *t, expr *f, op_kind *kind, expr **operand)
{
    if (f->kind == EXPR_POWER && f->args[1]->kind == EXPR_NUMBER) {
        *kind = OP_POWM1;
        *operand = fmpq_sgn(expr_number(f->args[1])) && !fmpz_is_one(fmpq_denref(expr_number(f->args[1])))
                       ? beyond_one(t, f->args[0]) : NULL;
        return *operand;
    }
    if (f->kind != EXPR_CALL) return false;
    *kind = f->is.function == FUNCTION_EXP ? OP_EXPM1 : f->is.function == FUNCTION_COS ? OP_COSM1 : OP_COSHM1;
    *operand = f->args[0];
    return f->is.function == FUNCTION_EXP || f->is.function == FUNCTION_COS || f->is.function == FUNCTION_COSH;
}

typedef struct limited_term {
    expr *term;     /* the sum's term k*f, beside the number -k */
    expr *function; /* f */
    expr *factor;   /* k */
    expr *operand;
    op_kind kind;
} limited_term;

/* k*f beside the number -k in a sum: together k*(f - 1), computed without cancellation. */
static limited_term find_limited_term(tape *t, expr *sum)
{
    limited_term found = {0};
    if (sum->args[0]->kind != EXPR_NUMBER) return found;
    fmpq_t c, k;
    fmpq_init(c);
    fmpq_init(k);
    fmpq_neg(k, expr_number(sum->args[0]));
    for (uint32_t j = 1; j < sum->count && !found.term; j++) {
        expr *rest;
        expr_as_coefficient(t->e, sum->args[j], c, &rest);
        if (!fmpq_equal(c, k) || !limited_function(t, rest, &found.kind, &found.operand)) continue;
        found.term = sum->args[j];
        found.function = rest;
        found.factor = expr_fmpq(t->e, k);
    }
    fmpq_clear(c);
    fmpq_clear(k);
    return found;
}

static tw_status compile_limited_term(tape *t, const limited_term *l, size_t *at)
{
    size_t parts[2];
    if (!l->factor || compile(t, l->operand, &parts[0]) != TW_OK) return TW_ERROR;
    add_op(t, l->kind, l->function, parts, 1);
    *at = t->count - 1;
    if (expr_is_one(l->factor)) return TW_OK;
    parts[0] = *at;
    if (compile(t, l->factor, &parts[1]) != TW_OK) return TW_ERROR;
    add_op(t, OP_PRODUCT, l->term, parts, 2);
    *at = t->count - 1;
    return TW_OK;
}

static tw_status compile_sum(tape *t, expr *a)
{
    const limited_term l = find_limited_term(t, a);
    size_t *at = base_alloc(a->count * sizeof *at), n = 0;
    tw_status status = TW_OK;
    for (uint32_t j = l.term ? 1 : 0; j < a->count && status == TW_OK; j++, n++)
        status = a->args[j] == l.term ? compile_limited_term(t, &l, &at[n]) : compile(t, a->args[j], &at[n]);
    if (status == TW_OK) add_op(t, OP_SUM, a, at, n);
    free(at);
    return status;
}

static tw_status compile_parts(tape *t, op_kind kind, expr *a)
{
    size_t *at = base_alloc(a->count * sizeof *at);
    tw_status status = compile_all(t, a->args, a->count, at);
    if (status == TW_OK) add_op(t, kind, a, at, a->count);
    free(at);
    return status;
}

/* Operands: left and right of each condition and its value, ..., the value otherwise. */
static tw_status compile_piecewise(tape *t, expr *a)
{
    size_t *at = base_alloc((2 * (size_t)a->count + 1) * sizeof *at), n = 0;
    tw_status status = TW_OK;
    for (uint32_t k = 0; k < a->count && status == TW_OK; k++) {
        if (a->args[k]->kind == EXPR_RELATION) {
            if (a->args[k]->is.relation > RELATION_NOT_EQUAL)
                status = engine_fail(t->e, ERROR_UNSUITABLE,
                                     "a piece of `piecewise` needs a comparison of real values");
            else status = compile_all(t, a->args[k]->args, 2, at + n);
            n += 2;
        } else {
            status = compile(t, a->args[k], &at[n]);
            n++;
        }
    }
    if (status == TW_OK) add_op(t, OP_PIECEWISE, a, at, n);
    free(at);
    return status;
}

enum { SUM_TERMS_LIMIT = 20000 };

/* A finite sum with integer ends is written out. */
static tw_status compile_summation(tape *t, expr *a, size_t *at)
{
    expr *from = a->args[0], *to = a->args[1];
    if (!expr_is_number(from) || !expr_is_number(to) || !fmpz_is_one(fmpq_denref(&from->is.number)) ||
        !fmpz_is_one(fmpq_denref(&to->is.number)))
        return engine_fail(t->e, ERROR_UNSUITABLE,
                           "a sum whose ends are not whole numbers cannot be evaluated by balls");
    fmpz_t k, length;
    fmpz_init_set(k, fmpq_numref(&from->is.number));
    fmpz_init(length);
    fmpz_sub(length, fmpq_numref(&to->is.number), k);
    fmpz_add_ui(length, length, 1);
    tw_status status = TW_OK;
    if (fmpz_cmp_si(length, SUM_TERMS_LIMIT) > 0) {
        status = engine_fail(t->e, ERROR_UNSUITABLE, "a sum of more than %d terms is not evaluated term by term",
                             SUM_TERMS_LIMIT);
    } else {
        slong n = fmpz_sgn(length) > 0 ? fmpz_get_si(length) : 0;
        expr **terms = base_alloc(((size_t)n + 1) * sizeof *terms);
        for (slong j = 0; j < n; j++) {
            terms[j] = budget_ok(t->e) ? expr_open(t->e, a, expr_fmpz(t->e, k)) : NULL;
            fmpz_add_ui(k, k, 1);
        }
        expr *sum = expr_sum(t->e, terms, (size_t)n);
        free(terms);
        status = sum ? compile(t, sum, at) : TW_ERROR;
    }
    fmpz_clear(k);
    fmpz_clear(length);
    return status;
}

static tw_status compile_fixed(tape *t, expr *a)
{
    if (!expr_is_closed_value(a))
        return engine_fail(t->e, ERROR_UNSUITABLE,
                           "an integral or root that depends on a variable cannot be evaluated by balls here");
    add_op(t, OP_FIXED, a, NULL, 0);
    return TW_OK;
}

static tw_status compile_node(tape *t, expr *a, size_t *at)
{
    tw_status status = TW_OK;
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: add_op(t, OP_NUMBER, a, NULL, 0); break;
    case EXPR_CONSTANT:
        if (a->is.constant == CONSTANT_PI) add_op(t, OP_PI, a, NULL, 0);
        else if (a->is.constant == CONSTANT_EULER) add_op(t, OP_EULER, a, NULL, 0);
        else if (a->is.constant == CONSTANT_I) add_op(t, OP_I, a, NULL, 0);
        else add_op(t, OP_UNKNOWN, a, NULL, 0);
        break;
    case EXPR_SYMBOL: status = compile_symbol(t, a); break;
    case EXPR_SUM: status = compile_sum(t, a); break;
    case EXPR_PRODUCT: status = compile_parts(t, OP_PRODUCT, a); break;
    case EXPR_POWER: status = compile_power(t, a); break;
    case EXPR_CALL: status = compile_call(t, a); break;
    case EXPR_PIECEWISE: status = compile_piecewise(t, a); break;
    case EXPR_SUMMATION: return compile_summation(t, a, at);
    case EXPR_INTEGRAL:
    case EXPR_CONTOUR:
    case EXPR_ROOT: status = compile_fixed(t, a); break;
    case EXPR_BOUND:
    case EXPR_DIRECTION:
    case EXPR_APPLY:
    case EXPR_RELATION: add_op(t, OP_UNKNOWN, a, NULL, 0); break;
    }
    *at = t->count - 1;
    return status;
}

static tw_status compile(tape *t, expr *a, size_t *at)
{
    if (seen_get(t, a, at)) return TW_OK;
    if (!budget_ok(t->e)) return TW_ERROR;
    if (compile_node(t, a, at) != TW_OK) return TW_ERROR;
    seen_put(t, a, *at);
    return TW_OK;
}

tape *tape_new(tw_engine *e, expr *f, expr *const *vars, size_t n)
{
    if (!f) return NULL;
    tape *t = base_alloc(sizeof *t);
    memset(t, 0, sizeof *t);
    t->e = e;
    t->vars = vars;
    t->var_count = n;
    size_t at;
    tw_status status = compile(t, f, &at);
    free(t->seen);
    free(t->seen_at);
    t->seen = NULL;
    t->seen_at = NULL;
    t->vars = NULL;
    if (status != TW_OK) {
        tape_free(t);
        return NULL;
    }
    if (at != t->count - 1) { /* the last op is the value */
        size_t operand = at;
        add_op(t, OP_SUM, f, &operand, 1);
    }
    t->values = _acb_vec_init((slong)t->count);
    t->real = base_alloc(t->count * sizeof *t->real);
    return t;
}

void tape_free(tape *t)
{
    if (!t) return;
    for (size_t k = 0; k < t->count; k++) acb_clear(t->ops[k].kept);
    if (t->values) _acb_vec_clear(t->values, (slong)t->count);
    if (t->jets) {
        for (size_t k = 0; k < t->count; k++) acb_poly_clear(&t->jets[k]);
        free(t->jets);
    }
    free(t->ops);
    free(t->operands);
    free(t->real);
    free(t);
}
