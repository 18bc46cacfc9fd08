/* Moves on the range of an integral: substitute, split, swap. The one idea: each is a theorem of elementary analysis whose
 * conditions are decided for all values of the parameters; what can't be decided stands as an open condition, what is
 * refuted fails. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/manual/work.h"

/* ---- substitute ---- */

typedef struct change {
    expr *t, *phi; /* x = phi(t) */
    expr *from, *to;
} change;

/* phi goes to `wanted` at that end? */
static bool reaches(tw_engine *e, const change *c, bool upper, expr *wanted)
{
    expr *limit;
    if (limit_at(e, &limit, c->phi, c->t, c->from, c->to, upper) != TW_OK) return forgive(e) && false;
    if (limit == wanted) return true;
    if (limit->infinite || wanted->infinite) return false;
    expr *rest = expr_sub(e, limit, wanted);
    return rest && is_identically_zero(e, rest, NULL) && forgive(e);
}

/* The new ends by the inverse; false where a limit is not found. */
static tw_status find_ends(work *w, const piece *p, change *c, expr *inverse)
{
    tw_engine *e = w->e;
    expr *ends[2];
    for (int k = 0; k < 2; k++)
        if (limit_at(e, &ends[k], inverse, p->x, p->from, p->to, k == 1) != TW_OK) return TW_ERROR;
    c->from = ends[0];
    c->to = ends[1];
    return TW_OK;
}

static bool is_less(tw_engine *e, expr *a, expr *b)
{
    if (expr_is_minus_inf(a) ? !expr_is_minus_inf(b) : expr_is_inf(b) && !expr_is_inf(a)) return true;
    if (a->infinite || b->infinite) return false;
    int sign = decide_sign(e, expr_sub(e, b, a));
    return forgive(e) && sign == 1;
}

/* The ends in order: from < to. *turned: they were the other way round. False: the order is not known. */
static bool order_ends(tw_engine *e, change *c, bool *turned)
{
    *turned = false;
    if (is_less(e, c->from, c->to)) return true;
    if (!is_less(e, c->to, c->from)) return false;
    expr *high = c->from;
    c->from = c->to;
    c->to = high;
    *turned = true;
    return true;
}

static tw_status fail_ends(work *w, const piece *p, expr *phi)
{
    char *words = expr_text(w->e, phi);
    engine_fail(w->e, ERROR_UNSUITABLE, "%s = %s does not run through the range of %s once: the ends do not fit", p->name,
                words ? words : "", p->name);
    free(words);
    return TW_ERROR;
}

/* phi runs from end to end in one direction. */
static tw_status check_monotone(work *w, const piece *p, const change *c, bool turned)
{
    tw_engine *e = w->e;
    bool ends = reaches(e, c, turned, p->from) && reaches(e, c, !turned, p->to);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    expr *slope = expr_derivative(e, c->phi, c->t);
    if (!slope) return TW_ERROR;
    int sign = sign_on(e, slope, c->t, c->from, c->to), wanted = turned ? -1 : 1;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (sign == -wanted) return fail_ends(w, p, c->phi);
    if (!ends || sign == 0) {
        char *words = expr_text(e, c->phi);
        w->proved = false;
        work_needs(w, CONDITION_OPEN, "%s is monotone in %s and runs through the range of %s", words ? words : "",
                   w->move->fresh->is.name, p->name);
        free(words);
    } else if (!is_smooth_inside(e, slope, c->t, c->from, c->to)) {
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        w->proved = false;
        work_needs(w, CONDITION_OPEN, "the derivative of the change of variable is continuous inside the range");
    }
    return TW_OK;
}

static tw_status find_inverse(work *w, const piece *p, expr *phi, expr *t, expr **inverse)
{
    tw_engine *e = w->e;
    *inverse = w->move->extra ? piece_read(w, p, w->move->extra) : solve_inverse(e, phi, t, p->x);
    if (*inverse) return TW_OK;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    char *words = expr_text(e, w->move->value);
    engine_fail(e, ERROR_UNSUITABLE, "the inverse of %s = %s is not found; say it: `... with %s = ...`", p->name,
                words ? words : "", w->move->fresh->is.name);
    free(words);
    return TW_ERROR;
}

tw_status move_substitute(work *w, const piece *p)
{
    tw_engine *e = w->e;
    const manual_move *m = w->move;
    if (strcmp(m->symbol->is.name, p->name) != 0)
        return engine_fail(e, ERROR_UNSUITABLE, "the variable of this integral is %s, not %s", p->name, m->symbol->is.name);
    expr *t = expr_fresh(e, m->fresh->is.name);
    expr *phi = t ? expr_substitute(e, piece_read(w, p, m->value), m->fresh, t) : NULL, *inverse;
    if (!phi) return TW_ERROR;
    if (expr_has(phi, p->x))
        return engine_fail(e, ERROR_UNSUITABLE, "what takes the place of %s must not hold %s itself", p->name, p->name);
    if (!expr_has(phi, t)) return fail_ends(w, p, phi);
    change c = {t, phi, NULL, NULL};
    bool turned = false;
    if (find_inverse(w, p, phi, t, &inverse) != TW_OK || find_ends(w, p, &c, inverse) != TW_OK) return TW_ERROR;
    if (!order_ends(e, &c, &turned)) return e->error.kind != ERROR_NONE ? TW_ERROR : fail_ends(w, p, phi);
    if (check_monotone(w, p, &c, turned) != TW_OK) return TW_ERROR;
    expr *slope = expr_derivative(e, phi, t);
    expr *body = expr_mul(e, expr_substitute(e, p->body, p->x, phi), turned ? expr_neg(e, slope) : slope);
    w->source = "change of variable";
    piece made = {p->outside, t, c.from, c.to, body, m->fresh->is.name};
    return work_add_integral(w, &made);
}

/* ---- split ---- */

tw_status move_split(work *w, const piece *p)
{
    tw_engine *e = w->e;
    expr *at = w->move->value;
    if (at->infinite) return engine_fail(e, ERROR_VALUE, "an integral is split at a finite point");
    expr *ends[2][2] = {{p->from, at}, {at, p->to}};
    for (int k = 0; k < 2; k++) {
        if (expr_is_minus_inf(ends[k][0]) || expr_is_inf(ends[k][1])) continue;
        expr *relation = expr_relation_of(e, RELATION_LESS, ends[k][0], ends[k][1]);
        condition_label label;
        if (!relation) return TW_ERROR;
        answer holds = decide(e, relation, &label);
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (holds == ANSWER_NO) {
            char *words = expr_text(e, at);
            engine_fail(e, ERROR_UNSUITABLE, "%s is not inside the range of %s", words ? words : "the point", p->name);
            free(words);
            return TW_ERROR;
        }
        if (work_require(w, relation) != TW_OK) return TW_ERROR;
    }
    piece low = *p, high = *p;
    low.to = at;
    high.from = at;
    w->source = "additivity of the integral";
    return work_add_integral(w, &low) == TW_OK ? work_add_integral(w, &high) : TW_ERROR;
}

/* ---- swap ---- */

/* body = outside * one integral over y with ends free of x. */
static tw_status find_inner(work *w, const piece *p, expr **outside, expr **inner)
{
    tw_engine *e = w->e;
    expr *const *factors;
    size_t count = expr_factors(&p->body, &factors);
    *outside = expr_int(e, 1);
    *inner = NULL;
    for (size_t k = 0; k < count; k++)
        if (factors[k]->kind == EXPR_INTEGRAL && !*inner) *inner = factors[k];
        else *outside = expr_mul(e, *outside, factors[k]);
    if (!*inner) return engine_fail(e, ERROR_UNSUITABLE, "there is no integral inside this one to be swapped with it");
    return *outside ? TW_OK : TW_ERROR;
}

/* int_from^to of |f| in x first, then in y, by bounds of both: both orders of Tonelli's theorem need only one. A bound is
 * had when |f| is a product u(x) v(y) of integrable functions. */
static bool is_separable(tw_engine *e, expr *f, const piece *outer, expr *y, expr *y_from, expr *y_to)
{
    expr *const *factors;
    expr *g = tidy(e, f, outer->x, range_is_positive(e, outer->from)), *u = expr_int(e, 1), *v = expr_int(e, 1);
    if (!g) return forgive(e) && false;
    size_t count = expr_factors(&g, &factors);
    for (size_t k = 0; k < count; k++) {
        bool has_x = expr_has(factors[k], outer->x), has_y = expr_has(factors[k], y);
        if (has_x && has_y) return false;
        if (has_y) v = expr_mul(e, v, factors[k]);
        else u = expr_mul(e, u, factors[k]);
    }
    return converges_absolutely(e, u, outer->x, outer->from, outer->to) == ANSWER_YES &&
           converges_absolutely(e, v, y, y_from, y_to) == ANSWER_YES;
}

/* A positive integrand whose inner integral has a closed form that is integrable (Tonelli's theorem). */
static bool converges_in_turn(work *w, expr *f, const piece *outer, expr *y, expr *y_from, expr *y_to)
{
    tw_engine *e = w->e;
    expr *xs[2] = {outer->x, y}, *froms[2] = {outer->from, y_from}, *tos[2] = {outer->to, y_to};
    for (int k = 0; k < 2; k++) {
        expr *size = expr_int(e, 1), *const *factors;
        size_t count = expr_factors(&f, &factors);
        bool known = true;
        for (size_t j = 0; j < count && known; j++) { /* |f|, or a bound of it */
            expr *one = factors[j];
            if (expr_is_call(one, FUNCTION_SIN) || expr_is_call(one, FUNCTION_COS)) continue;
            expr *base, *r;
            expr_as_power(e, one, &base, &r);
            bool exponential = expr_is_call(one, FUNCTION_EXP);
            known = exponential || sign_on(e, base, xs[k], froms[k], tos[k]) == 1 || !expr_has(base, xs[k]);
            size = expr_mul(e, size, one);
        }
        if (!known || !size) {
            forgive(e);
            continue;
        }
        expr *inner = inner_integral(w, size, xs[k], froms[k], tos[k], xs[1 - k], froms[1 - k], tos[1 - k]);
        if (inner && converges_absolutely(e, inner, xs[1 - k], froms[1 - k], tos[1 - k]) == ANSWER_YES)
            return true;
    }
    return false;
}

tw_status move_swap(work *w, const piece *p)
{
    tw_engine *e = w->e;
    expr *outside, *inner;
    if (find_inner(w, p, &outside, &inner) != TW_OK) return TW_ERROR;
    const char *name = expr_binder_name(inner);
    if (strcmp(name, p->name) == 0) name = "y";
    expr *y = expr_fresh(e, name), *body = y ? expr_open(e, inner, y) : NULL, *from = inner->args[0], *to = inner->args[1];
    if (!body) return TW_ERROR;
    if (expr_has(from, p->x) || expr_has(to, p->x))
        return engine_fail(e, ERROR_UNSUITABLE, "the ends of the inner integral depend on %s: only a rectangular range is "
                                                "swapped", p->name);
    expr *f = expr_mul(e, outside, body);
    if (!f) return TW_ERROR;
    bool sure = is_separable(e, f, p, y, from, to) || (forgive(e) && converges_in_turn(w, f, p, y, from, to));
    if (!forgive(e)) return TW_ERROR;
    work_needs(w, sure ? CONDITION_PROVED : CONDITION_OPEN, "the double integral converges absolutely");
    w->source = "Fubini's theorem";
    const manual_frame *now = manual_now(w->m);
    if (sure && now->live.count == 1 && now->split_off.count == 0 && expr_is_zero(now->plain) && !now->pending)
        w->next.converges = true;
    expr *turned = expr_integral(e, p->x, p->from, p->to, f);
    piece made = {p->outside, y, from, to, turned, name};
    return work_add_integral(w, &made);
}
