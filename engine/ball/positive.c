/* Is f > 0 on a whole range? Structure first; then bisection with balls, in second-order form where plain balls fail, with the
 * first non-vanishing derivative at an end where f is 0, and with the growth records of f and 1/f towards infinity (a finite
 * bound of 1/f means that f has no zero out there). quadrature.md, section 4. */
#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/ball/growth.h"
#include "engine/ball/sign.h"

enum { BOXES = 6000, ORDERS = 8 };

typedef struct range_job {
    tw_engine *e;
    tape *t;
    expr *f, *x;
    bool weak;
    slong left;
    bool refuted; /* a point with f < 0 was met */
} range_job;

/* +1 when f > 0 on the interval by f(m) + f'(m) d + f''(ball)/2 d^2. */
static bool positive_second_order(range_job *j, const acb_t box)
{
    acb_ptr middle = _acb_vec_init(2), whole = _acb_vec_init(3);
    acb_t m;
    arb_t d, sum, square;
    acb_init(m);
    arb_init(d);
    arb_init(sum);
    arb_init(square);
    arf_set(arb_midref(acb_realref(m)), arb_midref(acb_realref(box)));
    mag_set(arb_radref(d), arb_radref(acb_realref(box)));
    tape_jet(middle, j->t, m, 2, 64);
    tape_jet(whole, j->t, box, 3, 64);
    bool real = acb_is_real(middle) && acb_is_real(middle + 1) && acb_is_real(whole + 2);
    arf_t top; /* d^2 lies in [0, rad^2] */
    arf_init(top);
    arf_set_mag(top, arb_radref(d));
    arf_mul(top, top, top, 64, ARF_RND_UP);
    arb_set_arf(square, top);
    arb_t zero;
    arb_init(zero);
    arb_union(square, zero, square, 64);
    arb_mul(sum, acb_realref(whole + 2), square, 64);
    arb_addmul(sum, acb_realref(middle + 1), d, 64);
    arb_add(sum, sum, acb_realref(middle), 64);
    bool positive = real && arb_is_positive(sum);
    arb_clear(zero);
    arf_clear(top);
    arb_clear(square);
    arb_clear(sum);
    arb_clear(d);
    acb_clear(m);
    _acb_vec_clear(middle, 2);
    _acb_vec_clear(whole, 3);
    return positive;
}

static bool positive_over(range_job *j, const arf_t low, const arf_t high, int depth)
{
    if (--j->left < 0 || !budget_ok(j->e)) return false;
    acb_t box, v;
    arf_t middle;
    acb_init(box);
    acb_init(v);
    arf_init(middle);
    arb_set_interval_arf(acb_realref(box), low, high, 64);
    tape_eval(v, j->t, box, false, 64);
    bool good = acb_is_real(v) && (j->weak ? arb_is_nonnegative(acb_realref(v)) : arb_is_positive(acb_realref(v)));
    if (acb_is_real(v) && arb_is_negative(acb_realref(v))) j->refuted = true;
    if (!good && !j->refuted && depth >= 3) good = positive_second_order(j, box);
    if (!good && !j->refuted && depth < 60) {
        /* geometric where the ends differ by a lot */
        arf_t four;
        arf_init(four);
        arf_mul_2exp_si(four, low, 2);
        if (arf_sgn(low) > 0 && arf_cmp(high, four) > 0) {
            arf_mul(middle, low, high, 64, ARF_RND_NEAR);
            arf_sqrt(middle, middle, 64, ARF_RND_NEAR);
        } else {
            arf_add(middle, low, high, 64, ARF_RND_NEAR);
            arf_mul_2exp_si(middle, middle, -1);
        }
        arf_clear(four);
        if (arf_cmp(middle, low) > 0 && arf_cmp(middle, high) < 0)
            good = positive_over(j, low, middle, depth + 1) && positive_over(j, middle, high, depth + 1);
    }
    acb_clear(box);
    acb_clear(v);
    arf_clear(middle);
    return good;
}

/* f near the point c, going in direction side: the first derivative of f that is not exactly 0 there must be known and of the
 * right sign, and keep its sign as a ball up to the point `reach`, which is set; false when nothing was proved. */
static bool positive_near(range_job *j, expr *c, int side, arf_t reach)
{
    acb_t at;
    acb_init(at);
    bool good = false, decided = false;
    expr *derivative = j->f;
    if (ball_value(j->e, at, c, 64) != TW_OK) {
        engine_forgive(j->e);
        decided = true;
    }
    for (int order = 0; order < ORDERS && !decided; order++) {
        expr *value = expr_substitute(j->e, derivative, j->x, c);
        int sign = value ? sign_of(j->e, expr_expand(j->e, value), NULL) : SIGN_ANY;
        if (!value) engine_forgive(j->e);
        if (sign != SIGN_ZERO) {
            decided = true;
            int wanted = side < 0 && order % 2 ? SIGN_NEGATIVE : SIGN_POSITIVE;
            if (sign == (wanted == SIGN_POSITIVE ? SIGN_NEGATIVE : SIGN_POSITIVE)) j->refuted = true;
            tape *t = sign == wanted ? tape_new(j->e, derivative, &j->x, 1) : NULL;
            if (!t) engine_forgive(j->e);
            acb_t box, v;
            acb_init(box);
            acb_init(v);
            for (int shrink = 0; t && shrink < 40 && !good; shrink++) {
                arf_set_si_2exp_si(reach, side, 2 - shrink);
                arf_add(reach, arb_midref(acb_realref(at)), reach, 64, ARF_RND_NEAR);
                acb_set(box, at);
                arb_t other;
                arb_init(other);
                arb_set_arf(other, reach);
                arb_union(acb_realref(box), acb_realref(box), other, 64);
                tape_eval(v, t, box, order > 0, 64); /* orders above 0 need f smooth up to the end */
                if (order > 0) { /* and f itself, so that Taylor's theorem holds */
                    acb_t w;
                    acb_init(w);
                    tape_eval(w, j->t, box, true, 64);
                    if (!acb_is_finite(w)) acb_indeterminate(v);
                    acb_clear(w);
                }
                good = acb_is_real(v) && (wanted == SIGN_POSITIVE ? arb_is_positive(acb_realref(v))
                                                                  : arb_is_negative(acb_realref(v)));
                arb_clear(other);
            }
            acb_clear(box);
            acb_clear(v);
            tape_free(t);
        } else {
            derivative = expr_derivative(j->e, derivative, j->x);
            if (!derivative) {
                engine_forgive(j->e);
                decided = true;
            }
        }
    }
    acb_clear(at);
    return good;
}

/* Beyond some X: f and 1/f both have records there, so f has neither pole nor zero, and f(X) > 0. Sets X. */
static bool positive_far(range_job *j, double start, arf_t X)
{
    env nowhere = {0};
    growth_bound up, down;
    growth_bound_init(&up);
    growth_bound_init(&down);
    bool good = growth_at_infinity(j->e, &up, j->f, j->x, &nowhere, start) == TW_OK &&
                growth_at_infinity(j->e, &down, expr_pow(j->e, j->f, expr_int(j->e, -1)), j->x, &nowhere, start) == TW_OK;
    if (good) {
        arf_set(X, arf_cmp(up.X, down.X) > 0 ? up.X : down.X);
        acb_t at, v;
        acb_init(at);
        acb_init(v);
        arb_set_arf(acb_realref(at), X);
        tape_eval(v, j->t, at, false, 64);
        good = acb_is_real(v) && arb_is_positive(acb_realref(v));
        if (acb_is_real(v) && arb_is_negative(acb_realref(v))) j->refuted = true;
        acb_clear(at);
        acb_clear(v);
    } else {
        engine_forgive(j->e);
    }
    growth_bound_clear(&up);
    growth_bound_clear(&down);
    return good;
}

/* f(from + w) with w > 0, by structure alone. */
static answer positive_by_structure(tw_engine *e, expr *f, expr *x, expr *from, bool weak)
{
    sign_context c = {0};
    expr *w = expr_fresh(e, "w");
    c.symbols = base_alloc(sizeof *c.symbols);
    c.signs = base_alloc(sizeof *c.signs);
    c.symbols[0] = w;
    c.signs[0] = SIGN_POSITIVE;
    c.count = 1;
    expr *g = expr_substitute(e, f, x, expr_add(e, from, w));
    int signs = sign_of(e, g, &c);
    if (signs != SIGN_POSITIVE && signs != SIGN_NEGATIVE) signs &= sign_of(e, sign_shift(e, g, &c), &c);
    engine_forgive(e);
    free(c.symbols);
    free(c.signs);
    if (signs == SIGN_POSITIVE || (weak && !(signs & SIGN_NEGATIVE))) return ANSWER_YES;
    return signs == SIGN_NEGATIVE ? ANSWER_NO : ANSWER_UNKNOWN;
}

static void end_arf(arf_t out, const acb_t c, int side)
{
    if (side > 0) arb_get_ubound_arf(out, acb_realref(c), 64);
    else arb_get_lbound_arf(out, acb_realref(c), 64);
}

answer decide_positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak)
{
    if (!f || !from || !to || expr_is_minus_inf(from)) return ANSWER_UNKNOWN;
    answer a = positive_by_structure(e, f, x, from, weak);
    if (a == ANSWER_YES || (a == ANSWER_NO && expr_is_inf(to))) return a;
    acb_t c;
    acb_init(c);
    arf_t low, high, reach;
    arf_init(low);
    arf_init(high);
    arf_init(reach);
    range_job j = {.e = e, .f = f, .x = x, .weak = weak, .left = BOXES};
    j.t = expr_is_closed_value(from) && (expr_is_inf(to) || expr_is_closed_value(to)) ? tape_new(e, f, &x, 1) : NULL;
    bool good = j.t && ball_value(e, c, from, 64) == TW_OK && acb_is_real(c) && acb_is_finite(c);
    if (good) {
        end_arf(low, c, -1);
        if (positive_near(&j, from, 1, reach)) arf_set(low, reach);
        good = !j.refuted;
    }
    if (good && expr_is_inf(to)) {
        good = positive_far(&j, 4.0 + 2.0 * arf_get_d(low, ARF_RND_UP), high);
    } else if (good) {
        good = ball_value(e, c, to, 64) == TW_OK && acb_is_real(c) && acb_is_finite(c);
        end_arf(high, c, 1);
        if (good && positive_near(&j, to, -1, reach)) arf_set(high, reach);
    }
    if (good && !j.refuted && arf_cmp(low, high) < 0) good = positive_over(&j, low, high, 0);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED) engine_forgive(e);
    answer result = j.refuted ? ANSWER_NO : good ? ANSWER_YES : ANSWER_UNKNOWN;
    tape_free(j.t);
    acb_clear(c);
    arf_clear(low);
    arf_clear(high);
    arf_clear(reach);
    return result;
}
