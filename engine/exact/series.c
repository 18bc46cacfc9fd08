/* The series of an expression at x -> 0+: a walk over its tree, each node's series made of its parts'. The walk
 * knows the kinds of nodes; what is done with the series is in pieces.c, powers.c, elementary.c and special.c. */
#include "engine/exact/series.h"

#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/exact/compose.h"
#include "engine/exact/finish.h"
#include "engine/exact/values.h"

/* ---- subexpressions done: shared nodes are expanded once ---- */

typedef struct memo_entry {
    expr *f;
    pieces g;
} memo_entry;

struct memo {
    size_t count, room;
    memo_entry *entries; /* open addressing; room is a power of two */
};

static memo_entry *memo_slot(const struct memo *m, expr *f)
{
    size_t k = f->hash & (m->room - 1);
    while (m->entries[k].f != NULL && m->entries[k].f != f)
        k = (k + 1) & (m->room - 1);
    return m->entries + k;
}

static struct memo *memo_new(void)
{
    struct memo *m = base_alloc(sizeof *m);
    m->count = 0;
    m->room = 64;
    m->entries = base_alloc(m->room * sizeof *m->entries);
    for (size_t k = 0; k < m->room; k++)
        m->entries[k].f = NULL;
    return m;
}

static void memo_free(work *w, struct memo *m)
{
    for (size_t k = 0; k < m->room; k++)
        if (m->entries[k].f != NULL)
            pieces_clear(w, &m->entries[k].g);
    free(m->entries);
    free(m);
}

static void memo_grow(struct memo *m)
{
    struct memo wider = {m->count, 2 * m->room, base_alloc(2 * m->room * sizeof *m->entries)};
    for (size_t k = 0; k < wider.room; k++)
        wider.entries[k].f = NULL;
    for (size_t k = 0; k < m->room; k++)
        if (m->entries[k].f != NULL)
            *memo_slot(&wider, m->entries[k].f) = m->entries[k];
    free(m->entries);
    *m = wider;
}

static void memo_keep(work *w, expr *f, const pieces *g)
{
    if (w->memo == NULL)
        return;
    if (2 * (w->memo->count + 1) > w->memo->room)
        memo_grow(w->memo);
    memo_entry *slot = memo_slot(w->memo, f);
    if (slot->f != NULL)
        return;
    slot->f = f;
    pieces_init(&slot->g);
    pieces_set(w, &slot->g, g);
    w->memo->count++;
}

/* ---- nodes ---- */

static tw_status evaluate_sum(work *w, pieces *out, expr *f)
{
    pieces term;
    pieces_init(&term);
    tw_status s = pieces_from_value(w, out, expr_int(w->e, 0));
    for (uint32_t k = 0; k < f->count && s == TW_OK; k++) {
        s = evaluate_pieces(w, &term, f->args[k]);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &term, 1);
    }
    pieces_clear(w, &term);
    return s;
}

/* 1/g^n with g of few terms: divided by, after everything else was multiplied. */
static bool is_divisor(work *w, expr *f, slong *times)
{
    if (f->kind != EXPR_POWER || !expr_is_number(f->args[1]) || !expr_has(f->args[0], w->x))
        return false;
    const fmpq *r = expr_number(f->args[1]);
    if (!fmpz_is_one(fmpq_denref(r)) || fmpq_sgn(r) >= 0 || fmpz_cmp_si(fmpq_numref(r), -8) < 0)
        return false;
    *times = -fmpz_get_si(fmpq_numref(r));
    return true;
}

static tw_status divide_by(work *w, pieces *out, expr *base, slong times)
{
    pieces g;
    pieces_init(&g);
    tw_status s = evaluate_pieces(w, &g, base);
    work_blame(w, base);
    if (s == TW_OK)
        s = pieces_div(w, out, out, &g, times);
    pieces_clear(w, &g);
    return s;
}

static tw_status evaluate_product(work *w, pieces *out, expr *f)
{
    pieces factor;
    slong times;
    pieces_init(&factor);
    tw_status s = pieces_from_value(w, out, expr_int(w->e, 1));
    for (uint32_t k = 0; k < f->count && s == TW_OK; k++) {
        if (is_divisor(w, f->args[k], &times))
            continue;
        s = evaluate_pieces(w, &factor, f->args[k]);
        if (s == TW_OK)
            s = pieces_mul(w, out, out, &factor);
    }
    for (uint32_t k = 0; k < f->count && s == TW_OK; k++)
        if (is_divisor(w, f->args[k], &times))
            s = divide_by(w, out, f->args[k]->args[0], times);
    pieces_clear(w, &factor);
    return s;
}

/* b^c = exp(c log b), DLMF 4.2.26. */
static tw_status evaluate_general_power(work *w, pieces *out, expr *f)
{
    pieces base, exponent;
    pieces_init(&base), pieces_init(&exponent);
    tw_status s = evaluate_pieces(w, &base, f->args[0]);
    if (s == TW_OK)
        s = evaluate_pieces(w, &exponent, f->args[1]);
    work_blame(w, f);
    if (s == TW_OK)
        s = compose_log(w, &base, &base);
    if (s == TW_OK)
        s = pieces_mul(w, &exponent, &exponent, &base);
    if (s == TW_OK)
        s = compose_exp(w, out, &exponent);
    pieces_clear(w, &base), pieces_clear(w, &exponent);
    return s;
}

static tw_status evaluate_power(work *w, pieces *out, expr *f)
{
    expr *base = f->args[0], *exponent = f->args[1];
    slong times;
    if (expr_has(exponent, w->x))
        return evaluate_general_power(w, out, f);
    if (is_divisor(w, f, &times)) {
        tw_status s = pieces_from_value(w, out, expr_int(w->e, 1));
        return s == TW_OK ? divide_by(w, out, base, times) : s;
    }
    pieces g;
    pieces_init(&g);
    tw_status s = evaluate_pieces(w, &g, base);
    work_blame(w, f);
    if (s == TW_OK)
        s = pieces_pow(w, out, &g, exponent);
    pieces_clear(w, &g);
    return s;
}

static tw_status evaluate_call(work *w, pieces *out, expr *f)
{
    pieces *args = base_alloc(f->count * sizeof *args);
    tw_status s = TW_OK;
    for (uint32_t k = 0; k < f->count; k++)
        pieces_init(args + k);
    for (uint32_t k = 0; k < f->count && s == TW_OK; k++)
        s = evaluate_pieces(w, args + k, f->args[k]);
    work_blame(w, f);
    if (s == TW_OK)
        s = compose_call(w, out, f, args);
    for (uint32_t k = 0; k < f->count; k++)
        pieces_clear(w, args + k);
    free(args);
    return s;
}

/* Does the condition hold for small x > 0? */
static tw_status condition_near_zero(work *w, expr *condition, bool *holds)
{
    pieces left, right;
    int sign = 0;
    if (!expr_has(condition, w->x)) {
        answer known = decide(w->e, condition, NULL);
        *holds = known == ANSWER_YES;
        return known == ANSWER_UNKNOWN ? work_refuse(w, "has a condition that the facts do not decide") : TW_OK;
    }
    if (condition->kind != EXPR_RELATION || condition->is.relation > RELATION_NOT_EQUAL)
        return work_refuse(w, "has a condition that cannot be decided near 0");
    pieces_init(&left), pieces_init(&right);
    tw_status s = evaluate_pieces(w, &left, condition->args[0]);
    if (s == TW_OK)
        s = evaluate_pieces(w, &right, condition->args[1]);
    if (s == TW_OK)
        s = pieces_add(w, &left, &left, &right, -1);
    if (s == TW_OK)
        s = pieces_sign(w, &sign, &left);
    switch (condition->is.relation) {
    case RELATION_LESS: *holds = sign < 0; break;
    case RELATION_LESS_EQUAL: *holds = sign <= 0; break;
    case RELATION_EQUAL: *holds = sign == 0; break;
    default: *holds = sign != 0; break;
    }
    pieces_clear(w, &left), pieces_clear(w, &right);
    return s;
}

static tw_status evaluate_piecewise(work *w, pieces *out, expr *f)
{
    for (uint32_t k = 0; k + 1 < f->count; k += 2) {
        bool holds = false;
        work_blame(w, f);
        if (condition_near_zero(w, f->args[k], &holds) != TW_OK)
            return TW_ERROR;
        if (holds)
            return evaluate_pieces(w, out, f->args[k + 1]);
    }
    return evaluate_pieces(w, out, f->args[f->count - 1]);
}

/* The part of an integral over a fixed body that an end's movement makes: int from b(0) to b(x) of the body. */
static tw_status moving_end(work *w, pieces *out, expr *f, expr *end, expr **limit)
{
    pieces g, slope, inner;
    argument a;
    pieces_init(&g), pieces_init(&slope), pieces_init(&inner), argument_init(&a);
    tw_status s = evaluate_pieces(w, &g, end);
    work_blame(w, f);
    if (s == TW_OK)
        s = argument_split(w, &a, &g);
    if (s == TW_OK && !g.real)
        s = work_refuse(w, "has an end that is not known to be real");
    expr *t = expr_fresh(w->e, "t"), *body = expr_open(w->e, f, t);
    if (s == TW_OK)
        s = evaluate_bound(w, &slope, body, t, &g);
    if (s == TW_OK)
        s = pieces_derivative(w, &inner, &g);
    if (s == TW_OK)
        s = pieces_mul(w, &slope, &slope, &inner);
    if (s == TW_OK)
        s = pieces_integral(w, out, &slope, true);
    *limit = a.value;
    pieces_clear(w, &g), pieces_clear(w, &slope), pieces_clear(w, &inner), argument_clear(w, &a);
    return s;
}

static tw_status evaluate_integral(work *w, pieces *out, expr *f)
{
    tw_engine *e = w->e;
    expr *ends[2] = {f->args[0], f->args[1]}, *t = expr_fresh(e, expr_binder_name(f)), *body = expr_open(e, f, t);
    pieces part;
    if (body == NULL)
        return TW_ERROR;
    if (expr_has(body, w->x))
        return work_refuse(w, "is an integral whose body depends on the variable");
    pieces_init(&part);
    tw_status s = pieces_from_value(w, out, expr_int(e, 0));
    for (int k = 0; k < 2 && s == TW_OK; k++) {
        if (!expr_has(ends[k], w->x))
            continue;
        s = moving_end(w, &part, f, ends[k], ends + k);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &part, k == 0 ? -1 : 1);
    }
    expr *rest = ends[0] == ends[1] ? expr_int(e, 0) : expr_integral(e, t, ends[0], ends[1], body);
    if (s == TW_OK)
        s = pieces_from_value(w, &part, rest);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &part, 1);
    pieces_clear(w, &part);
    return s;
}

/* A sum with few terms, written out. */
static tw_status evaluate_summation(work *w, pieces *out, expr *f)
{
    enum { MOST_SUMMANDS = 1000 };
    tw_engine *e = w->e;
    expr *from = f->args[0], *to = f->args[1];
    if (!value_is_integer(e, from) || !value_is_integer(e, to) || !expr_is_number(from) || !expr_is_number(to))
        return work_refuse(w, "is a sum without fixed ends");
    expr *count = expr_sub(e, to, from);
    if (count == NULL || fmpq_cmp_si(expr_number(count), MOST_SUMMANDS) > 0)
        return work_refuse(w, "is a sum of too many terms");
    pieces term;
    pieces_init(&term);
    tw_status s = pieces_from_value(w, out, expr_int(e, 0));
    for (slong k = 0; s == TW_OK && fmpq_cmp_si(expr_number(count), k) >= 0; k++) {
        expr *body = expr_open(e, f, expr_add(e, from, expr_int(e, k)));
        s = body == NULL ? TW_ERROR : evaluate_pieces(w, &term, body);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &term, 1);
    }
    pieces_clear(w, &term);
    return s;
}

static bool has_infinity(expr *f)
{
    if (expr_is_inf(f))
        return true;
    if (f->kind == EXPR_INTEGRAL || f->kind == EXPR_SUMMATION || f->kind == EXPR_CONTOUR)
        return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (has_infinity(f->args[k]))
            return true;
    return false;
}

static tw_status evaluate_value(work *w, pieces *out, expr *f)
{
    work_blame(w, f);
    if (has_infinity(f) || value_is_singular(w->e, f))
        return work_refuse(w, "is not finite");
    return pieces_from_value(w, out, f);
}

static tw_status evaluate_variable(work *w, pieces *out)
{
    if (w->binding == NULL)
        return pieces_from_monomial(w, out, expr_int(w->e, 1), expr_int(w->e, 1));
    pieces_set(w, out, w->binding);
    return TW_OK;
}

static tw_status evaluate_node(work *w, pieces *out, expr *f)
{
    work_blame(w, f);
    switch (f->kind) {
    case EXPR_SUM: return evaluate_sum(w, out, f);
    case EXPR_PRODUCT: return evaluate_product(w, out, f);
    case EXPR_POWER: return evaluate_power(w, out, f);
    case EXPR_CALL: return evaluate_call(w, out, f);
    case EXPR_PIECEWISE: return evaluate_piecewise(w, out, f);
    case EXPR_INTEGRAL: return evaluate_integral(w, out, f);
    case EXPR_SUMMATION: return evaluate_summation(w, out, f);
    default: return work_refuse(w, "has no known power series");
    }
}

tw_status evaluate_pieces(work *w, pieces *out, expr *f)
{
    if (f == NULL || !budget_ok(w->e))
        return TW_ERROR;
    if (f == w->x)
        return evaluate_variable(w, out);
    if (!expr_has(f, w->x))
        return evaluate_value(w, out, f);
    if (w->memo != NULL) {
        memo_entry *slot = memo_slot(w->memo, f);
        if (slot->f == f) {
            pieces_set(w, out, &slot->g);
            return TW_OK;
        }
    }
    pieces made;
    pieces_init(&made);
    tw_status s = evaluate_node(w, &made, f);
    if (s == TW_OK) {
        memo_keep(w, f, &made);
        pieces_swap(out, &made);
    }
    pieces_clear(w, &made);
    return s;
}

tw_status evaluate_bound(work *w, pieces *out, expr *body, expr *symbol, const pieces *value)
{
    expr *x = w->x;
    const pieces *binding = w->binding;
    struct memo *memo = w->memo;
    w->x = symbol;
    w->binding = value;
    w->memo = memo_new();
    w->depth++;
    tw_status s = evaluate_pieces(w, out, body);
    w->depth--;
    memo_free(w, w->memo);
    w->x = x;
    w->binding = binding;
    w->memo = memo;
    return s;
}

static tw_status make_series(work *w, pieces *out, const void *host)
{
    w->memo = memo_new();
    tw_status s = evaluate_pieces(w, out, host);
    memo_free(w, w->memo);
    w->memo = NULL;
    return s;
}

tw_status series_at_zero(tw_engine *e, series *out, expr *f, expr *x, slong length, expr ***conditions,
                         size_t *condition_count)
{
    if (f == NULL || x == NULL)
        return TW_ERROR;
    if (length < 1)
        return engine_fail(e, ERROR_VALUE, "a series needs at least one term");
    return series_by_tries(e, out, make_series, f, f, x, length, conditions, condition_count);
}
