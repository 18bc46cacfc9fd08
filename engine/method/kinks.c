/* Kinks. The one idea: abs(u), sign(u), min(u, v), max(u, v) and piecewise values change only where u, u - v or the two
 * sides of a condition are equal; between such places each of them is one of its smooth forms, told by a sign. */
#include "engine/method/kinks.h"

#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/exact/values.h"
#include "engine/method/convergence.h"
#include "engine/method/points.h"
#include "engine/method/zeros.h"

/* The differences whose signs decide; f itself may be one of several. */
static void collect(tw_engine *e, expr *f, expr *x, expr ***list, size_t *count)
{
    if (!expr_has(f, x)) return;
    if (expr_is_call(f, FUNCTION_ABS) || expr_is_call(f, FUNCTION_SIGN)) expr_list_add(list, count, f->args[0]);
    if (expr_is_call(f, FUNCTION_MIN) || expr_is_call(f, FUNCTION_MAX))
        for (uint32_t i = 0; i < f->count; i++)
            for (uint32_t j = 0; j < i; j++) expr_list_add(list, count, expr_sub(e, f->args[i], f->args[j]));
    if (f->kind == EXPR_PIECEWISE)
        for (uint32_t k = 0; k + 1 < f->count; k += 2)
            if (f->args[k]->kind == EXPR_RELATION && expr_has(f->args[k], x))
                expr_list_add(list, count, expr_sub(e, f->args[k]->args[0], f->args[k]->args[1]));
    if (f->kind == EXPR_RELATION) return;
    for (uint32_t k = 0; k < f->count; k++) collect(e, f->args[k], x, list, count);
}

static tw_status kinks_nested(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***places, size_t *count,
                              int level)
{
    expr **deciding = NULL;
    size_t n = 0;
    collect(e, f, x, &deciding, &n);
    tw_status status = TW_OK;
    for (size_t k = 0; k < n && status == TW_OK; k++) {
        expr **zeros = NULL;
        size_t m = 0, inner = *count;
        if (level < 3) status = kinks_nested(e, deciding[k], x, from, to, places, count, level + 1);
        if (status != TW_OK) break;
        if (*count == inner) {
            status = zeros_between(e, deciding[k], x, from, to, &zeros, &m);
            for (size_t j = 0; j < m && status == TW_OK; j++) expr_list_add(places, count, zeros[j]);
            free(zeros);
        } else { /* a kink inside a kink: piece by piece */
            size_t last = *count;
            expr **cuts = base_alloc((last - inner + 2) * sizeof *cuts);
            for (size_t j = inner; j < last; j++) cuts[j - inner + 1] = (*places)[j];
            size_t pieces = last - inner + 1;
            cuts[0] = from;
            for (size_t a = 1; a < pieces; a++) /* by insertion; a handful */
                for (size_t b = a; b > 1 && places_compare(e, cuts[b], cuts[b - 1]) < 0; b--) {
                    expr *swap = cuts[b];
                    cuts[b] = cuts[b - 1];
                    cuts[b - 1] = swap;
                }
            for (size_t a = 0; a < pieces && status == TW_OK; a++) {
                expr *end = a + 1 < pieces ? cuts[a + 1] : to;
                expr *smooth = kinks_resolved(e, deciding[k], x, cuts[a], end);
                status = smooth ? zeros_between(e, smooth, x, cuts[a], end, &zeros, &m) : TW_ERROR;
                for (size_t j = 0; j < m && status == TW_OK; j++) expr_list_add(places, count, zeros[j]);
                if (status == TW_OK) free(zeros);
            }
            free(cuts);
        }
    }
    free(deciding);
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

tw_status kinks_between(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***places, size_t *count)
{
    *places = NULL;
    *count = 0;
    tw_status status = kinks_nested(e, f, x, from, to, places, count, 0);
    if (status != TW_OK) {
        free(*places);
        *places = NULL;
        *count = 0;
    }
    return status;
}

/* ---- smooth forms ---- */

typedef struct stretch {
    tw_engine *e;
    expr *x, *from, *to;
} stretch;

/* The sign of u, which has no zero inside; 0 where it is identically 0; 2 not known. */
static int sign_inside(const stretch *s, expr *u)
{
    tw_engine *e = s->e;
    if (!u) return 2;
    if (expr_is_zero(u)) return 0;
    expr *middle = expr_is_minus_inf(s->from)
                       ? (expr_is_inf(s->to) ? expr_int(e, 0) : expr_sub(e, s->to, expr_int(e, 1)))
                   : expr_is_inf(s->to) ? expr_add(e, s->from, expr_int(e, 1))
                                        : expr_mul(e, expr_frac(e, 1, 2), expr_add(e, s->from, s->to));
    expr *value = expr_substitute(e, u, s->x, middle);
    int sign = !value ? 2 : expr_is_closed_value(value) ? value_sign(e, value) : decide_sign(e, value);
    if (sign == 1 || sign == -1) return sign;
    if (e->error.kind == ERROR_VALUE) engine_forgive(e);
    if (decide_positive_on(e, u, s->x, s->from, s->to, true) == ANSWER_YES) return 1;
    if (decide_positive_on(e, expr_neg(e, u), s->x, s->from, s->to, true) == ANSWER_YES) return -1;
    return 2;
}

static expr *resolve(const stretch *s, expr *f);

static expr *resolve_piecewise(const stretch *s, expr *f)
{
    tw_engine *e = s->e;
    for (uint32_t k = 0; k + 1 < f->count; k += 2) {
        expr *c = f->args[k];
        if (c->kind != EXPR_RELATION) return NULL;
        int sign = sign_inside(s, resolve(s, expr_sub(e, c->args[0], c->args[1])));
        if (sign == 2) return NULL;
        bool holds = c->is.relation == RELATION_LESS         ? sign < 0
                     : c->is.relation == RELATION_LESS_EQUAL ? sign <= 0
                     : c->is.relation == RELATION_EQUAL      ? sign == 0
                     : c->is.relation == RELATION_NOT_EQUAL  ? sign != 0
                                                             : false;
        if (holds) return resolve(s, f->args[k + 1]);
    }
    return resolve(s, f->args[f->count - 1]);
}

static expr *resolve_extreme(const stretch *s, expr *f, bool least)
{
    expr *best = resolve(s, f->args[0]);
    for (uint32_t k = 1; k < f->count && best; k++) {
        expr *other = resolve(s, f->args[k]);
        int sign = sign_inside(s, expr_sub(s->e, best, other));
        if (sign == 2) return NULL;
        if (least ? sign > 0 : sign < 0) best = other;
    }
    return best;
}

static expr *resolve(const stretch *s, expr *f)
{
    tw_engine *e = s->e;
    if (!f || !expr_has(f, s->x) || f->count == 0) return f;
    if (f->kind == EXPR_PIECEWISE) return resolve_piecewise(s, f);
    if (expr_is_call(f, FUNCTION_ABS) || expr_is_call(f, FUNCTION_SIGN)) {
        expr *u = resolve(s, f->args[0]);
        int sign = sign_inside(s, u);
        if (sign == 2 || sign == 0) return sign == 0 ? expr_int(e, 0) : NULL;
        if (f->is.function == FUNCTION_SIGN) return expr_int(e, sign);
        return sign > 0 ? u : expr_neg(e, u);
    }
    if (expr_is_call(f, FUNCTION_MIN) || expr_is_call(f, FUNCTION_MAX))
        return resolve_extreme(s, f, f->is.function == FUNCTION_MIN);
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER && f->kind != EXPR_CALL) return f;
    expr **args = base_alloc((f->count + 1) * sizeof *args);
    bool good = true, same = true;
    for (uint32_t k = 0; k < f->count; k++) {
        args[k] = resolve(s, f->args[k]);
        good = good && args[k];
        same = same && args[k] == f->args[k];
    }
    expr *made = !good ? NULL : same ? f : expr_rebuild(e, f, args);
    free(args);
    return made;
}

expr *kinks_resolved(tw_engine *e, expr *f, expr *x, expr *from, expr *to)
{
    stretch s = {e, x, from, to};
    expr *made = resolve(&s, f);
    if (made || e->error.kind != ERROR_NONE) return made;
    char *words = expr_text(e, f);
    engine_fail(e, ERROR_UNDECIDED, "which form %s has on a part of the path is not known", words ? words : "");
    free(words);
    return NULL;
}
