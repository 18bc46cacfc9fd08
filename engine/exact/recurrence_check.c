/* The one idea: recurrences are operators in n and its shift, a Euclidean domain over the rational functions of n (Ore
 * 1933): a typed recurrence follows from a known one when it is divisible by it from the right. */
#include "engine/exact/recurrence_check.h"

#include <stdlib.h>
#include <string.h>

enum { ROOM_LIMIT = 24, ORDER_LIMIT = 200 };

/* ---- from terms ---- */

static tw_status check_offsets(tw_engine *e, const slong *offsets, size_t count, slong *least, slong *most)
{
    if (count == 0) return engine_fail(e, ERROR_VALUE, "there is no c[n] in it");
    *least = *most = offsets[0];
    for (size_t k = 1; k < count; k++) {
        *least = FLINT_MIN(*least, offsets[k]);
        *most = FLINT_MAX(*most, offsets[k]);
    }
    if (*most - *least > ORDER_LIMIT) return engine_fail(e, ERROR_VALUE, "its order is greater than %d", ORDER_LIMIT);
    return TW_OK;
}

/* The factors with n moved so that the least offset is 0, summed by offset, over one denominator. */
static tw_status set_values(tw_engine *e, field *f, expr *n, expr *const *factors, const slong *offsets, size_t count,
                            slong least, element *values)
{
    element one;
    element_init(f, &one);
    tw_status status = field_from_expr(f, &one, n);
    for (size_t k = 0; k < count && status == TW_OK; k++) {
        expr *moved = expr_substitute(e, factors[k], n, expr_sub(e, n, expr_int(e, least)));
        status = moved ? field_from_expr(f, &one, moved) : TW_ERROR;
        if (status == TW_OK) fmpz_mpoly_q_add(&values[offsets[k] - least], &values[offsets[k] - least], &one, f->ctx);
    }
    element_clear(f, &one);
    return status;
}

static bool depends_only_through_n(const field *f, expr *n)
{
    for (slong k = 0; k < f->count; k++)
        if (f->generators[k].atom != n && expr_has(f->generators[k].atom, n)) return false;
    return true;
}

/* Over one denominator; its roots go to `voided`. */
static void clear_denominators(field *f, const element *values, slong order, fmpz_mpoly_struct *a, fmpz_mpoly_t common)
{
    fmpz_mpoly_t g;
    fmpz_mpoly_init(g, f->ctx);
    fmpz_mpoly_one(common, f->ctx);
    for (slong j = 0; j <= order; j++) {
        if (!fmpz_mpoly_gcd(g, common, fmpz_mpoly_q_denref(&values[j]), f->ctx)) fmpz_mpoly_one(g, f->ctx);
        fmpz_mpoly_divides(g, fmpz_mpoly_q_denref(&values[j]), g, f->ctx);
        fmpz_mpoly_mul(common, common, g, f->ctx);
    }
    for (slong j = 0; j <= order; j++) {
        fmpz_mpoly_divides(&a[j], common, fmpz_mpoly_q_denref(&values[j]), f->ctx);
        fmpz_mpoly_mul(&a[j], &a[j], fmpz_mpoly_q_numref(&values[j]), f->ctx);
    }
    fmpz_mpoly_clear(g, f->ctx);
}

/* Takes f over on success. */
static tw_status build(tw_engine *e, recurrence **out, field *f, expr *n, const element *values, slong order)
{
    while (order >= 0 && fmpz_mpoly_q_is_zero(&values[order], f->ctx)) order--;
    if (order < 0) return engine_fail(e, ERROR_VALUE, "all its factors vanish: it says nothing");
    if (!depends_only_through_n(f, n))
        return engine_fail(e, ERROR_VALUE, "its factors are not all rational functions of %s", n->is.name);
    fmpz_mpoly_struct *a = base_alloc((size_t)(order + 1) * sizeof *a);
    for (slong j = 0; j <= order; j++) fmpz_mpoly_init(&a[j], f->ctx);
    fmpz_mpoly_t common;
    fmpz_mpoly_init(common, f->ctx);
    clear_denominators(f, values, order, a, common);
    *out = recurrence_new(e, f, n, a, order, common);
    (*out)->label = RECURRENCE_FITTED;
    fmpz_mpoly_clear(common, f->ctx);
    return TW_OK;
}

tw_status recurrence_from_terms(tw_engine *e, recurrence **out, slong *shift, expr *n, expr *const *factors,
                                const slong *offsets, size_t count)
{
    slong least = 0, most = 0;
    if (check_offsets(e, offsets, count, &least, &most) != TW_OK) return TW_ERROR;
    *shift = least;
    for (slong room = 2; room <= ROOM_LIMIT; room++) {
        field *f = base_alloc(sizeof *f);
        field_init(f, e, room);
        slong order = most - least;
        element *values = elements_new(f, order + 1);
        tw_status status = set_values(e, f, n, factors, offsets, count, least, values);
        bool full = f->full, taken = false;
        if (status == TW_OK) {
            status = build(e, out, f, n, values, order);
            taken = status == TW_OK;
        }
        elements_free(f, values, order + 1);
        if (taken) return TW_OK;
        field_clear(f);
        free(f);
        if (!full || e->error.kind != ERROR_NONE) break;
    }
    if (e->error.kind == ERROR_NONE)
        engine_fail(e, ERROR_VALUE, "its factors are not all rational functions of %s", n->is.name);
    return TW_ERROR;
}

/* ---- division ---- */

/* out = a_j of r with n + d for its index, in another field. */
static tw_status moved_coefficient(tw_engine *e, field *f, element *out, const recurrence *r, slong j, expr *n, slong d)
{
    expr *a = expr_substitute(e, recurrence_coefficient(e, r, j), r->n, expr_add(e, n, expr_int(e, d)));
    return a ? field_from_expr(f, out, a) : TW_ERROR;
}

/* rest[d + j] -= quotient * known_j(n + d), with the quotient that removes rest[d + order]. */
static tw_status divide_step(tw_engine *e, field *f, element *rest, const recurrence *known, slong d)
{
    element quotient, a;
    element_init(f, &quotient), element_init(f, &a);
    tw_status status = moved_coefficient(e, f, &a, known, known->order, known->n, d);
    if (status == TW_OK) field_div(f, &quotient, &rest[d + known->order], &a);
    for (slong j = 0; j <= known->order && status == TW_OK; j++) {
        status = moved_coefficient(e, f, &a, known, j, known->n, d);
        if (status == TW_OK) field_submul(f, &rest[d + j], &quotient, &a);
    }
    element_clear(f, &quotient), element_clear(f, &a);
    return status;
}

static tw_status divide_in(tw_engine *e, field *f, const recurrence *typed, const recurrence *known, answer *zero)
{
    element *rest = elements_new(f, typed->order + 1);
    tw_status status = TW_OK;
    for (slong j = 0; j <= typed->order && status == TW_OK; j++) status = moved_coefficient(e, f, &rest[j], typed, j, known->n, 0);
    for (slong d = typed->order - known->order; d >= 0 && status == TW_OK && budget_ok(e); d--)
        status = divide_step(e, f, rest, known, d);
    *zero = ANSWER_YES;
    for (slong j = 0; j <= typed->order && status == TW_OK; j++)
        if (field_is_zero(f, &rest[j]) != ANSWER_YES) *zero = ANSWER_UNKNOWN;
    elements_free(f, rest, typed->order + 1);
    return e->error.kind == ERROR_NONE ? status : TW_ERROR;
}

answer recurrence_follows(tw_engine *e, const recurrence *typed, const recurrence *known, slong *from)
{
    *from = FLINT_MAX(known->needed - known->order, 0);
    if (typed->order < known->order) return ANSWER_UNKNOWN;
    answer zero = ANSWER_UNKNOWN;
    for (slong room = 2; room <= ROOM_LIMIT; room++) {
        field f;
        field_init(&f, e, room);
        tw_status status = divide_in(e, &f, typed, known, &zero);
        bool full = f.full;
        field_clear(&f);
        if (status == TW_OK) return zero;
        if (!full || e->error.kind != ERROR_NONE) break;
    }
    return ANSWER_UNKNOWN;
}
