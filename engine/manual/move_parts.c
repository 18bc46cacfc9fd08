/* Moves that split terms off: parts, expand, integrate termwise. The one idea: what is split off and what is left add up to
 * what was there by an identity between functions, so the remainder is an exact integral, whatever its size. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/series.h"
#include "engine/manual/work.h"

/* ---- the rest ---- */

expr *quotient_of(work *w, const piece *p, expr *factor)
{
    enum { FACTORS_MOST = 6 };
    tw_engine *e = w->e;
    bool positive = range_is_positive(e, p->from);
    expr *plain = tidy(e, expr_div(e, p->body, factor), p->x, positive);
    expr *const *factors;
    size_t count = expr_factors(&p->body, &factors);
    if (!plain || count > FACTORS_MOST || expr_size(plain) < expr_size(p->body)) return plain;
    for (size_t chosen = 0; chosen < (size_t)1 << count && budget_ok(e); chosen++) { /* a part of the body's factors */
        expr *rest = expr_int(e, 1);
        for (size_t k = 0; k < count; k++)
            if (chosen >> k & 1) rest = expr_mul(e, rest, factors[k]);
        expr *difference = expr_sub(e, p->body, expr_mul(e, rest, factor));
        if (difference && is_identically_zero(e, difference, positive ? p->x : NULL)) return rest;
        if (!forgive(e)) return NULL;
    }
    return plain;
}

/* ---- parts ---- */

/* The factor of this piece, from what was typed or from the parts before. */
static expr *factor_of(work *w, const piece *p, bool repeat)
{
    tw_engine *e = w->e;
    const manual_frame *now = manual_now(w->m);
    if (!repeat) return piece_read(w, p, w->move->value);
    return now->factor ? expr_substitute(e, now->factor, now->factor_variable, p->x) : NULL;
}

static tw_status boundary(work *w, const piece *p, expr *product, expr **out)
{
    tw_engine *e = w->e;
    expr *ends[2];
    for (int k = 0; k < 2; k++) {
        if (limit_at(e, &ends[k], product, p->x, p->from, p->to, k == 1) != TW_OK) return TW_ERROR;
        if (!ends[k]->infinite) continue;
        char *words = expr_text(e, product), *at = expr_text(e, k ? p->to : p->from);
        engine_fail(e, ERROR_UNSUITABLE, "the boundary term %.200s is infinite at %s = %s", words ? words : "", p->name,
                    at ? at : "");
        free(words);
        free(at);
        return TW_ERROR;
    }
    *out = expr_sub(e, ends[1], ends[0]);
    return *out ? TW_OK : TW_ERROR;
}

tw_status move_parts(work *w, const piece *p)
{
    tw_engine *e = w->e;
    bool repeat = w->move->kind == MANUAL_REPEAT_PARTS, positive = range_is_positive(e, p->from);
    expr *factor = factor_of(w, p, repeat);
    if (!factor && repeat && e->error.kind == ERROR_NONE)
        return engine_fail(e, ERROR_UNSUITABLE, "there are no parts to repeat: say `parts integrating FACTOR` first");
    if (!factor) return TW_ERROR;
    if (expr_is_zero(factor)) return engine_fail(e, ERROR_VALUE, "0 is no factor");
    expr *G = antiderivative(e, factor, p->x, positive);
    if (!G && e->error.kind == ERROR_NONE) {
        char *words = expr_text(e, factor);
        engine_fail(e, ERROR_UNSUITABLE, "no antiderivative of %.200s is found", words ? words : "the factor");
        free(words);
    }
    if (!G) return TW_ERROR;
    expr *rest = quotient_of(w, p, factor), *edge;
    expr *slope = rest ? expr_derivative(e, rest, p->x) : NULL;
    expr *product = slope ? tidy(e, expr_mul(e, G, rest), p->x, positive) : NULL;
    if (!product || boundary(w, p, product, &edge) != TW_OK) return TW_ERROR;
    if (!is_smooth_inside(e, product, p->x, p->from, p->to)) {
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        w->proved = false;
        work_needs(w, CONDITION_OPEN, "the boundary term is continuous inside the range");
    }
    w->source = "integration by parts";
    w->next.factor = G;
    w->next.factor_variable = p->x;
    piece left = *p;
    left.body = expr_neg(e, expr_mul(e, G, slope));
    if (w->remainder) { /* a remainder's own boundary term belongs to the terms */
        if (work_add_plain(w, expr_mul(e, p->outside, edge)) != TW_OK) return TW_ERROR;
        return work_add_integral(w, &left);
    }
    if (work_add_plain(w, expr_mul(e, p->outside, edge)) != TW_OK) return TW_ERROR;
    return work_add_integral(w, &left);
}

/* ---- expand ---- */

typedef struct local_variable {
    expr *y;      /* y -> 0+ is the point */
    expr *inside; /* x in y */
    expr *back;   /* y in x */
} local_variable;

/* The point is an end of the range, or infinity: x = point + y from above, point - y from below, 1/y at infinity. */
static tw_status choose_variable(work *w, const piece *p, expr *point, local_variable *out)
{
    tw_engine *e = w->e;
    expr *minus = expr_int(e, -1);
    out->y = expr_fresh(e, "y");
    if (!out->y) return TW_ERROR;
    if (expr_is_inf(point)) {
        out->inside = expr_pow(e, out->y, minus);
        out->back = expr_pow(e, p->x, minus);
    } else if (point->infinite) {
        return engine_fail(e, ERROR_UNSUITABLE, "a factor is expanded around a finite point or inf");
    } else {
        bool below = point == p->to;
        out->inside = below ? expr_sub(e, point, out->y) : expr_add(e, point, out->y);
        out->back = below ? expr_sub(e, point, p->x) : expr_sub(e, p->x, point);
    }
    return out->inside && out->back ? TW_OK : TW_ERROR;
}

typedef struct series_term {
    expr *exponent, *value;
} series_term;

/* Is the exponent a smaller than b, for all values of the parameters? */
static int compare_exponents(tw_engine *e, expr *a, expr *b)
{
    if (a == b) return 0;
    int sign = decide_sign(e, expr_sub(e, a, b));
    forgive(e);
    return sign == 2 ? expr_order(a, b) : sign;
}

/* All terms of the strands, in order of size; count of them. */
static series_term *list_terms(tw_engine *e, const series *s, expr *y, size_t *count)
{
    size_t room = 0;
    for (size_t k = 0; k < s->count; k++) room += (size_t)s->strands[k].c.count;
    series_term *list = base_alloc((room + 1) * sizeof *list);
    *count = 0;
    for (size_t k = 0; k < s->count; k++) {
        const strand *t = &s->strands[k];
        for (slong n = 0; n < t->c.count; n++) {
            if (coefficient_is_zero(&t->c, n)) continue;
            expr *r = expr_add(e, t->exponent, expr_frac(e, n, t->den));
            expr *v = expr_mul(e, expr_mul(e, t->constant, coefficient_expr(e, &t->c, n)), expr_pow(e, y, r));
            if (t->log_power)
                v = expr_mul(e, v, expr_pow(e, expr_call1(e, FUNCTION_LOG, y), expr_int(e, t->log_power)));
            if (!v) {
                free(list);
                return NULL;
            }
            size_t place = (*count)++;
            while (place > 0 && compare_exponents(e, list[place - 1].exponent, r) > 0) {
                list[place] = list[place - 1];
                place--;
            }
            list[place] = (series_term){r, v};
        }
    }
    return list;
}

/* The first `wanted` terms (those of one power count as one) of f at y -> 0+ as an expression in y. *all: f is that sum. */
static tw_status partial_sum(work *w, expr *f, expr *y, slong wanted, expr **out, bool *all)
{
    tw_engine *e = w->e;
    for (slong length = wanted + 2;; length = 2 * length) {
        series s;
        expr **needs = NULL;
        size_t need_count = 0, count = 0;
        series_init(&s);
        if (series_at_zero(e, &s, f, y, length, &needs, &need_count) != TW_OK) {
            series_clear(&s);
            return TW_ERROR;
        }
        tw_status status = TW_OK;
        series_term *list = list_terms(e, &s, y, &count);
        expr *sum = expr_int(e, 0);
        slong powers = 0;
        for (size_t k = 0; list && k < count; k++) {
            if (k == 0 || list[k].exponent != list[k - 1].exponent) powers++;
            if (powers > wanted) break;
            sum = expr_add(e, sum, list[k].value);
        }
        bool enough = powers > wanted || s.terminates || length > 64 * (wanted + 2);
        *all = s.terminates && powers <= wanted;
        if (!list || !sum) status = TW_ERROR;
        for (size_t k = 0; enough && k < need_count && status == TW_OK; k++) status = work_require(w, needs[k]);
        free(list);
        free(needs);
        series_clear(&s);
        *out = sum;
        if (enough || status != TW_OK || !budget_ok(e)) return e->error.kind == ERROR_NONE ? status : TW_ERROR;
    }
}

static tw_status require_convergence(work *w, const piece *p, expr *body)
{
    tw_engine *e = w->e;
    answer a = converges_absolutely(e, body, p->x, p->from, p->to);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    char *words = expr_text(e, body);
    tw_status status = TW_OK;
    if (a == ANSWER_NO)
        status = engine_fail(e, ERROR_DIVERGENT, "the integral of the terms, %.200s, does not converge", words ? words : "");
    else
        work_needs(w, a == ANSWER_YES ? CONDITION_PROVED : CONDITION_OPEN, "the integral of the terms converges");
    free(words);
    return status;
}

tw_status move_expand(work *w, const piece *p)
{
    tw_engine *e = w->e;
    bool all = false;
    expr *factor = piece_read(w, p, w->move->value), *point = w->move->extra;
    local_variable v = {NULL, NULL, NULL};
    if (!factor || choose_variable(w, p, point, &v) != TW_OK) return TW_ERROR;
    if (!expr_has(factor, p->x))
        return engine_fail(e, ERROR_UNSUITABLE, "the factor does not hold %s: there is nothing to expand", p->name);
    expr *local = tidy(e, expr_substitute(e, factor, p->x, v.inside), v.y, true), *sum;
    if (!local || partial_sum(w, local, v.y, w->move->count, &sum, &all) != TW_OK) return TW_ERROR;
    sum = expr_substitute(e, sum, v.y, v.back);
    expr *rest = quotient_of(w, p, factor);
    if (!sum || !rest) return TW_ERROR;
    piece kept = *p, left = *p;
    kept.body = expr_mul(e, rest, sum);
    left.body = expr_mul(e, rest, expr_sub(e, factor, sum));
    if (!kept.body || !left.body || require_convergence(w, p, tidy(e, kept.body, p->x, range_is_positive(e, p->from))) != TW_OK)
        return TW_ERROR;
    w->source = "the series of the factor";
    bool before = w->remainder;
    w->remainder = false;
    tw_status status = work_add_integral(w, &kept);
    w->remainder = true;
    if (status == TW_OK && !all) status = work_add_integral(w, &left);
    w->remainder = before;
    return status;
}

/* ---- integrate termwise ---- */

/* term = rest * an inner integral that has a closed form for all x of the range: with it put in; else NULL. */
static expr *open_inner(work *w, const piece *p, expr *part)
{
    tw_engine *e = w->e;
    expr *const *factors, *inner = NULL, *rest = expr_int(e, 1);
    size_t count = expr_factors(&part, &factors);
    for (size_t k = 0; k < count; k++)
        if (!inner && factors[k]->kind == EXPR_INTEGRAL) inner = factors[k];
        else rest = expr_mul(e, rest, factors[k]);
    if (!inner) return NULL;
    expr *y = expr_fresh(e, expr_binder_name(inner)), *body = y ? expr_open(e, inner, y) : NULL;
    expr *value = body ? inner_integral(w, body, y, inner->args[0], inner->args[1], p->x, p->from, p->to) : NULL;
    return value ? tidy(e, expr_mul(e, rest, value), p->x, range_is_positive(e, p->from)) : NULL;
}

tw_status move_termwise(work *w, const piece *p)
{
    tw_engine *e = w->e;
    bool positive = range_is_positive(e, p->from);
    expr *body = tidy(e, p->body, p->x, positive);
    if (body) body = expr_expand(e, body);
    if (body) body = tidy(e, body, p->x, positive);
    if (!body) return TW_ERROR;
    expr *const *parts;
    size_t count = expr_terms(&body, &parts), done = 0, inner = 0;
    expr *left = expr_int(e, 0);
    for (size_t k = 0; k < count && budget_ok(e); k++) {
        expr *part = parts[k], *opened = open_inner(w, p, part);
        if (opened) {
            part = opened;
            inner++;
        }
        expr *value = e->error.kind == ERROR_NONE ? definite_integral(w, part, p->x, p->from, p->to) : NULL;
        if (!value && e->error.kind != ERROR_NONE) return TW_ERROR;
        if (value) {
            done++;
            if (work_add_plain(w, expr_mul(e, p->outside, value)) != TW_OK) return TW_ERROR;
        } else left = expr_add(e, left, part);
    }
    if (e->error.kind != ERROR_NONE || !left) return TW_ERROR;
    if (done + inner == 0 && count > 1) { /* then at least each by itself */
        w->source = "additivity of the integral";
        for (size_t k = 0; k < count; k++) {
            piece one = *p;
            one.body = parts[k];
            if (require_convergence(w, p, parts[k]) != TW_OK || work_add_integral(w, &one) != TW_OK) return TW_ERROR;
        }
        return TW_OK;
    }
    if (done + inner == 0) {
        char *words = expr_text(e, parts[0]);
        engine_fail(e, ERROR_UNSUITABLE, "no term has a closed form here; the first is %.200s", words ? words : "");
        free(words);
        return TW_ERROR;
    }
    w->source = "known integrals";
    if (expr_is_zero(left)) return TW_OK;
    piece rest = *p;
    rest.body = left;
    if (require_convergence(w, p, left) != TW_OK) return TW_ERROR;
    return work_add_integral(w, &rest);
}
