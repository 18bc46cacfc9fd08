/* Moves on the whole form: differentiate in a parameter, integrate back, rewrite by a rule or a pass. The one idea: after
 * `differentiate` the form is equal to the derivative of what it was equal to, and the state remembers what that was;
 * integrating back is the fundamental theorem of calculus from a value of the parameter where the integral is put in as it
 * stands, simple or not. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/manual/work.h"

/* ---- differentiate ---- */

/* d/da int f dx = int df/da dx wherever int |df/da| dx converges locally uniformly in a; the bounds behind
 * converges_absolutely hold for all values of the parameters that the facts allow and change continuously with them. */
static tw_status differentiate_term(work *w, const manual_term *t, expr *a)
{
    tw_engine *e = w->e;
    expr *slope = expr_derivative(e, t->outside, a);
    piece p;
    if (!slope) return TW_ERROR;
    if (!piece_open(w, &p, t))
        return e->error.kind != ERROR_NONE ? TW_ERROR
                                           : engine_fail(e, ERROR_UNSUITABLE, "a contour integral is not differentiated here");
    piece q = p;
    q.outside = slope;
    if (!expr_is_zero(slope) && work_add_integral(w, &q) != TW_OK) return TW_ERROR;
    q = p;
    q.body = expr_derivative(e, p.body, a);
    if (!q.body) return TW_ERROR;
    if (!expr_is_zero(q.body)) {
        expr *seen = tidy(e, q.body, p.x, range_is_positive(e, p.from));
        answer c = seen ? converges_absolutely(e, seen, p.x, p.from, p.to) : ANSWER_UNKNOWN;
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (c == ANSWER_NO)
            return engine_fail(e, ERROR_DIVERGENT, "the derivative under the integral sign is not integrable");
        work_needs(w, c == ANSWER_YES ? CONDITION_PROVED : CONDITION_OPEN,
                   "the integral of the derivative in %s converges absolutely and locally uniformly", a->is.name);
        if (work_add_integral(w, &q) != TW_OK) return TW_ERROR;
    }
    expr *ends[] = {p.to, p.from}; /* Leibniz' rule: ends that move */
    for (int k = 0; k < 2; k++) {
        if (ends[k]->infinite || !expr_has(ends[k], a)) continue;
        expr *there;
        if (limit_at(e, &there, p.body, p.x, p.from, p.to, k == 0) != TW_OK) return TW_ERROR;
        if (there->infinite)
            return engine_fail(e, ERROR_UNSUITABLE, "the integrand is infinite at an end that moves with %s", a->is.name);
        expr *edge = expr_mul(e, p.outside, expr_mul(e, expr_derivative(e, ends[k], a), there));
        if (work_add_plain(w, k ? expr_neg(e, edge) : edge) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

/* (V(a + h) - V(a - h))/(2h), which is V'(a) up to h^2 V'''/6: what the balls compare with. */
static expr *difference_quotient(tw_engine *e, expr *v, expr *a)
{
    expr *h = expr_frac(e, 1, 512);
    expr *above = expr_substitute(e, v, a, expr_add(e, a, h)), *below = expr_substitute(e, v, a, expr_sub(e, a, h));
    return expr_mul(e, expr_int(e, 256), expr_sub(e, above, below));
}

tw_status move_differentiate(work *w)
{
    tw_engine *e = w->e;
    expr *a = w->move->symbol, *before = manual_value(w->m);
    const manual_frame *now = manual_now(w->m);
    if (!before) return TW_ERROR;
    if (facts_is_integer(e, a))
        return engine_fail(e, ERROR_UNSUITABLE, "%s is an integer: there is nothing to differentiate", a->is.name);
    if (!expr_has(before, a))
        return engine_fail(e, ERROR_UNSUITABLE, "the form does not depend on %s", a->is.name);
    if (work_add_plain(w, expr_derivative(e, now->plain, a)) != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < now->live.count; k++)
        if (differentiate_term(w, &now->live.list[k], a) != TW_OK) return TW_ERROR;
    w->remainder = true;
    for (size_t k = 0; k < now->split_off.count; k++)
        if (differentiate_term(w, &now->split_off.list[k], a) != TW_OK) return TW_ERROR;
    w->remainder = false;
    manual_pending *p = arena_alloc(&e->arena, sizeof *p);
    *p = (manual_pending){a, now->subject, before, now->pending};
    w->next.pending = p;
    w->next.subject = expr_derivative(e, now->subject, a);
    w->expected = difference_quotient(e, before, a);
    w->loosely = true;
    w->source = "differentiation under the integral sign";
    return w->next.subject && w->expected ? TW_OK : TW_ERROR;
}

/* ---- integrate back ---- */

/* Is the form continuous in a up to a = from, an end of what the facts allow? Yes, if with a allowed there, too, either the
 * derivatives of the integrands or the integrands themselves are bounded by integrable functions that hold for all such a:
 * |V(a) - V(from)| <= |a - from| int sup |df/da| dx, or dominated convergence. */
static bool continuous_up_to(work *w, expr *form, expr *a, expr *from, bool above)
{
    tw_engine *e = w->e;
    work probe = *w;
    struct facts *kept = facts_copy(e);
    memset(&probe.next, 0, sizeof probe.next);
    probe.next.plain = expr_int(e, 0);
    facts_forget(e, a);
    bool good = facts_add(e, above ? expr_relation_of(e, RELATION_LESS_EQUAL, from, a)
                                   : expr_relation_of(e, RELATION_LESS_EQUAL, a, from), CONDITION_GIVEN) == TW_OK &&
                work_add_any(&probe, form, NULL) == TW_OK && !expr_has(probe.next.plain, a);
    for (size_t k = 0; k < probe.next.live.count && good; k++) {
        piece p;
        good = piece_open(&probe, &p, &probe.next.live.list[k]) && !expr_has(p.outside, a) && !expr_has(p.from, a) &&
               !expr_has(p.to, a);
        bool positive = good && range_is_positive(e, p.from);
        expr *slope = good ? tidy(e, expr_derivative(e, p.body, a), p.x, positive) : NULL;
        good = slope && (converges_absolutely(e, slope, p.x, p.from, p.to) == ANSWER_YES ||
                         (forgive(e) && converges_absolutely(e, p.body, p.x, p.from, p.to) == ANSWER_YES));
    }
    terms_clear_list(&probe.next.live);
    facts_restore(e, kept);
    return forgive(e) && good;
}

/* The whole way from the value to the parameter must be allowed by the facts. */
static tw_status check_way(work *w, expr *form, expr *a, expr *from)
{
    tw_engine *e = w->e;
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    int known = facts_interval(e, a, low, high);
    bool inside = true, at_low = false;
    if (known & 1) {
        int side = decide_sign(e, expr_sub(e, from, expr_fmpq(e, low)));
        inside = side == 1 || (side == 0 && !(known & 4));
        at_low = side == 0;
    }
    bool at_high = false;
    if (known & 2) {
        int side = decide_sign(e, expr_sub(e, expr_fmpq(e, high), from));
        inside = inside && (side == 1 || (side == 0 && !(known & 8)));
        at_high = side == 0;
    }
    fmpq_clear(low);
    fmpq_clear(high);
    if (!forgive(e)) return TW_ERROR;
    if (inside) return TW_OK;
    bool proved = (at_low || at_high) && continuous_up_to(w, form, a, from, at_low);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    char *words = expr_text(e, from);
    work_needs(w, proved ? CONDITION_PROVED : CONDITION_OPEN, "the integral is continuous in %s up to %s", a->is.name, words ? words : "the value");
    free(words);
    return TW_OK;
}

/* A factor exp(-a u(x)) with u > 0 in the range, beside |f| integrable at some a: then the integral tends to 0 as
 * a -> inf by monotone convergence. */
static bool vanishes_at_infinity(work *w, expr *form, expr *a)
{
    tw_engine *e = w->e;
    work probe = *w;
    memset(&probe.next, 0, sizeof probe.next);
    probe.next.plain = expr_int(e, 0);
    bool good = work_add_any(&probe, form, NULL) == TW_OK && expr_is_zero(probe.next.plain);
    for (size_t k = 0; k < probe.next.live.count && good; k++) {
        piece p;
        good = piece_open(&probe, &p, &probe.next.live.list[k]) && !expr_has(p.outside, a) && !expr_has(p.from, a) &&
               !expr_has(p.to, a);
        if (!good) break;
        expr *rest = expr_div(e, expr_derivative(e, p.body, a), p.body);
        rest = rest ? tidy(e, rest, p.x, range_is_positive(e, p.from)) : NULL;
        good = rest && !expr_has(rest, a) && sign_on(e, rest, p.x, p.from, p.to) == -1 &&
               converges_absolutely(e, p.body, p.x, p.from, p.to) == ANSWER_YES;
    }
    terms_clear_list(&probe.next.live);
    return forgive(e) && good;
}

/* The value at a = from of what the form was equal to. */
static tw_status value_at(work *w, const manual_pending *p, expr *from, expr **out)
{
    tw_engine *e = w->e;
    if (!from->infinite) {
        *out = expr_substitute(e, p->form, p->parameter, from);
        return *out ? TW_OK : TW_ERROR;
    }
    if (!expr_is_inf(from) || !vanishes_at_infinity(w, p->form, p->parameter)) {
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        return engine_fail(e, ERROR_UNSUITABLE, "the limit of the integral there is not known; integrate back from a value at "
                                                "which it is");
    }
    work_needs(w, CONDITION_PROVED, "the integral tends to 0 as %s -> inf (monotone convergence)", p->parameter->is.name);
    *out = expr_int(e, 0);
    return TW_OK;
}

/* int_from^a form(u) du of one term: in closed form where it has one. */
static tw_status integrate_plain(work *w, expr *a, expr *from)
{
    tw_engine *e = w->e;
    const manual_frame *now = manual_now(w->m);
    expr *u = expr_fresh(e, a->is.name), *f = u ? expr_substitute(e, now->plain, a, u) : NULL;
    if (!f) return TW_ERROR;
    if (expr_is_zero(f)) return TW_OK;
    int positive = decide_sign(e, a) == 1 && range_is_positive(e, from);
    expr *F = antiderivative(e, f, u, positive);
    expr *low = NULL, *high = F ? expr_substitute(e, F, u, a) : NULL, *inf = expr_constant_of(e, CONSTANT_INF);
    bool good = high && (from->infinite ? limit_at(e, &low, F, u, expr_int(e, 0), inf, true) == TW_OK
                                        : limit_at(e, &low, F, u, from, inf, false) == TW_OK);
    if (good && !low->infinite) return work_add_plain(w, expr_sub(e, high, low));
    if (!forgive(e)) return TW_ERROR;
    piece p = {expr_int(e, 1), u, from, a, f, "u"};
    if (from->infinite) {
        p.outside = expr_int(e, -1);
        p.from = a;
        p.to = from;
    }
    return work_add_integral(w, &p);
}

static tw_status integrate_terms(work *w, const manual_terms *t, expr *a, expr *from)
{
    tw_engine *e = w->e;
    for (size_t k = 0; k < t->count; k++) {
        expr *u = expr_fresh(e, a->is.name);
        expr *f = u ? expr_substitute(e, expr_mul(e, t->list[k].outside, t->list[k].integral), a, u) : NULL;
        if (!f) return TW_ERROR;
        piece p = {expr_int(e, 1), u, from, a, f, "u"};
        if (from->infinite) {
            p.outside = expr_int(e, -1);
            p.from = a;
            p.to = from;
        }
        if (work_add_integral(w, &p) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

tw_status move_integrate_back(work *w)
{
    tw_engine *e = w->e;
    const manual_frame *now = manual_now(w->m);
    const manual_pending *p = now->pending;
    expr *a = w->move->symbol, *from = w->move->value, *start = NULL;
    if (!p) return engine_fail(e, ERROR_UNSUITABLE, "nothing has been differentiated: there is nothing to integrate back");
    if (p->parameter != a)
        return engine_fail(e, ERROR_UNSUITABLE, "the last differentiation was in %s, not in %s", p->parameter->is.name,
                           a->is.name);
    if (expr_has(from, a)) return engine_fail(e, ERROR_VALUE, "the value must not hold %s itself", a->is.name);
    if (expr_is_minus_inf(from)) return engine_fail(e, ERROR_UNSUITABLE, "integrate back from a finite value or inf");
    if (value_at(w, p, from, &start) != TW_OK || (!from->infinite && check_way(w, p->form, a, from) != TW_OK)) return TW_ERROR;
    w->next.pending = p->outer;
    w->next.subject = p->subject;
    w->expected = p->form;
    w->source = "the fundamental theorem of calculus";
    if (work_add_any(w, start, NULL) != TW_OK || integrate_plain(w, a, from) != TW_OK ||
        integrate_terms(w, &now->live, a, from) != TW_OK)
        return TW_ERROR;
    w->remainder = true;
    tw_status status = integrate_terms(w, &now->split_off, a, from);
    w->remainder = false;
    return status;
}

/* ---- rewrite ---- */

static tw_status rewrite_part(work *w, expr *f, expr **out, size_t *changed)
{
    rewriting r;
    rewriting_init(&r);
    *out = f;
    tw_status status = pass_run(w->e, w->move->pass, f, &r);
    if (status == TW_OK && r.applied && r.after && r.after != f) {
        *out = r.after;
        ++*changed;
        conditions_append(&w->needs, &r.conditions);
        for (size_t k = 0; k < r.steps.count; k++) {
            const step *one = &r.steps.steps[k];
            text_addf(&w->detail, "%sby %s", w->detail.length ? ", " : "", one->rule);
            if (one->source) text_addf(&w->detail, " (%s)", one->source);
        }
    }
    rewriting_clear(&r);
    return status;
}

static tw_status rewrite_terms(work *w, const manual_terms *t, slong offset, size_t *changed)
{
    tw_engine *e = w->e;
    for (size_t k = 0; k < t->count && budget_ok(e); k++) {
        const manual_term *one = &t->list[k];
        slong which = w->move->which;
        bool picked = which ? which == offset + (slong)k + 1 : !w->remainder;
        expr *made = one->integral;
        if (picked && rewrite_part(w, one->integral, &made, changed) != TW_OK) return TW_ERROR;
        bool same_range = made->kind == EXPR_INTEGRAL && one->integral->kind == EXPR_INTEGRAL &&
                          made->args[0] == one->integral->args[0] && made->args[1] == one->integral->args[1];
        tw_status status = made == one->integral
                               ? work_add_term(w, one)
                               : work_add_any(w, expr_mul(e, one->outside, made), same_range ? one->name : NULL);
        if (status != TW_OK) return TW_ERROR;
    }
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* On the integrals of the form, one by one; when none changes, on the form as a whole. */
tw_status move_rewrite(work *w)
{
    tw_engine *e = w->e;
    const manual_frame *now = manual_now(w->m);
    size_t changed = 0, total = now->live.count + now->split_off.count;
    if (w->move->which > (slong)total)
        return engine_fail(e, ERROR_VALUE, "the form has %zu integral%s, so there is no integral %ld", total,
                           total == 1 ? "" : "s", (long)w->move->which);
    if (work_add_plain(w, now->plain) != TW_OK || rewrite_terms(w, &now->live, 0, &changed) != TW_OK) return TW_ERROR;
    w->remainder = true;
    tw_status status = rewrite_terms(w, &now->split_off, (slong)now->live.count, &changed);
    w->remainder = false;
    if (status != TW_OK) return TW_ERROR;
    if (changed > 0) return TW_OK;
    if (w->move->which == 0) {
        expr *whole = now->plain, *made;
        for (size_t k = 0; k < now->live.count; k++)
            whole = expr_add(e, whole, expr_mul(e, now->live.list[k].outside, now->live.list[k].integral));
        if (!whole || rewrite_part(w, whole, &made, &changed) != TW_OK) return TW_ERROR;
        if (changed > 0) {
            w->next.plain = expr_int(e, 0);
            w->next.live.count = 0;
            return work_add_any(w, made, NULL);
        }
    }
    return engine_fail(e, ERROR_UNSUITABLE, "nothing of it applies to any part of the form (`why not RULE` says why)");
}
