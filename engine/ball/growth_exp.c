/* Logarithm and exponential of growth records, the two that change the class. Knows no expressions.
 *
 * exp has an exact record only for x^a and for multiples of log x; whatever is left beside them is bounded from above
 * by an exponential of a power: sharp at X, weaker beyond. */
#include "engine/ball/growth_record.h"

static void real_upper(arf_t out, const arb_t x, const growth_place *p)
{
    arb_get_ubound_arf(out, x, p->prec);
}

bool record_near(growth_record *out, const fmpq_t value, const growth_record *w, const acb_t h, const growth_place *p)
{
    growth_record t, one;
    record_init(&t);
    record_init(&one);
    record_set_ball(&t, h);
    record_set_fmpq(&one, value);
    bool ok = acb_is_finite(h) && record_mul(&t, w, &t, p) && record_add(&t, &one, &t, p);
    record_swap(out, &t);
    record_clear(&t);
    record_clear(&one);
    return ok;
}

/* log of the bounded part: log(1 + w) = w/(1 + star), or the ball of the logarithm. */
static bool log_bounded(growth_record *out, const growth_record *r, const growth_place *p)
{
    if (r->exact && fmpq_is_one(r->q)) {
        if (!r->rest) {
            record_set_si(out, 0);
            return true;
        }
        acb_t h;
        fmpq_t zero;
        acb_init(h);
        fmpq_init(zero);
        bool ok = record_star(h, r->rest, p);
        if (ok) {
            acb_add_ui(h, h, 1, p->prec);
            ok = arb_is_positive(acb_realref(h));
            acb_inv(h, h, p->prec);
        }
        ok = ok && record_near(out, zero, r->rest, h, p);
        acb_clear(h);
        fmpq_clear(zero);
        if (ok)
            return true;
    }
    if (acb_contains_zero(r->g))
        return false;
    if (p->analytic && arb_contains_zero(acb_imagref(r->g)) && !arb_is_positive(acb_realref(r->g)))
        return false;
    acb_t v;
    acb_init(v);
    acb_log(v, r->g, p->prec);
    record_set_ball(out, v);
    bool ok = acb_is_finite(v);
    acb_clear(v);
    return ok;
}

/* log log x against log x: the quotient lies in [0, 1/e], and decreases from e^e on. */
static void log_log_quotient(arb_t out, const growth_place *p)
{
    arf_t zero, top;
    arb_t t;
    arf_init(zero);
    arf_init(top);
    arb_init(t);
    if (arb_is_positive(p->log_log_X) && arf_cmp_si(arb_midref(p->X), 16) >= 0)
        arb_div(t, p->log_log_X, p->log_X, p->prec);
    else
        arb_set_d(t, 0.36787944117144239); /* above 1/e = 0.367879441171442321... */
    real_upper(top, t, p);
    arb_set_interval_arf(out, zero, top, p->prec);
    arf_clear(zero);
    arf_clear(top);
    arb_clear(t);
}

bool record_log(growth_record *out, const growth_record *r, const growth_place *p)
{
    if (record_is_zero(r) || !acb_is_real(r->T))
        return false;
    growth_record sum, part;
    acb_t ball;
    arf_t slack;
    record_init(&sum);
    record_init(&part);
    acb_init(ball);
    arf_init(slack);
    bool ok = log_bounded(&sum, r, p);
    if (ok && !fmpq_is_zero(r->k)) {
        acb_set_fmpq(ball, r->k, p->prec);
        arb_t quotient;
        arb_init(quotient);
        log_log_quotient(quotient, p);
        acb_mul_arb(ball, ball, quotient, p->prec);
        arb_clear(quotient);
        record_set_ball(&part, ball);
        fmpq_one(part.k);
        ok = record_add(&sum, &part, &sum, p);
    }
    if (ok && (!fmpq_is_zero(r->a) || !fmpq_is_zero(r->slack))) {
        record_set_fmpq(&part, r->a);
        if (!fmpq_is_zero(r->slack)) {
            acb_set_fmpq(ball, r->slack, p->prec);
            acb_get_abs_ubound_arf(slack, ball, p->prec);
            acb_set_fmpq(ball, r->a, p->prec);
            arb_add_error_arf(acb_realref(ball), slack);
            record_set_ball(&part, ball);
        }
        fmpq_one(part.k);
        ok = record_add(&sum, &part, &sum, p);
    }
    if (ok && !fmpq_is_zero(r->c)) {
        record_set_ball(&part, r->T);
        fmpq_set(part.a, r->c);
        if (acb_is_exact(r->T)) {
            fmpq_t T;
            fmpq_init(T);
            if (arf_cmpabs_2exp_si(arb_midref(acb_realref(r->T)), 200) < 0 &&
                arf_cmpabs_2exp_si(arb_midref(acb_realref(r->T)), -200) > 0) {
                arf_get_fmpq(T, arb_midref(acb_realref(r->T)));
                record_set_fmpq(&part, T);
                fmpq_set(part.a, r->c);
            }
            fmpq_clear(T);
        }
        ok = record_add(&sum, &part, &sum, p);
    }
    record_swap(out, &sum);
    record_clear(&sum);
    record_clear(&part);
    acb_clear(ball);
    arf_clear(slack);
    return ok;
}

static bool no_head(const growth_record *r)
{
    return fmpq_is_zero(r->c) && fmpq_is_zero(r->a) && fmpq_is_zero(r->k) && fmpq_is_zero(r->slack);
}

/* 1 + w (1 + w (1/2 + w h)), h = int_0^1 (1 - s)^2/2 e^(s w) ds in star/6, star a ball that holds all e^(s w): three
 * orders, so that a sum may lose the first ones without losing all. */
static bool exp_near_zero(growth_record *out, const growth_record *w, const acb_t star, const growth_place *p)
{
    growth_record t;
    fmpq_t q;
    acb_t h;
    record_init(&t);
    fmpq_init(q);
    acb_init(h);
    acb_div_ui(h, star, 6, p->prec);
    fmpq_set_si(q, 1, 2);
    bool ok = record_near(&t, q, w, h, p);
    for (int order = 2; ok && order > 0; order--) {
        growth_record c;
        record_init(&c);
        record_set_si(&c, 1);
        ok = record_mul(&t, w, &t, p) && record_add(&t, &t, &c, p);
        record_clear(&c);
    }
    if (ok)
        record_swap(out, &t);
    record_clear(&t);
    fmpq_clear(q);
    acb_clear(h);
    return ok;
}

/* exp of something that stays in a ball. */
static bool exp_bounded(growth_record *out, const growth_record *r, const growth_place *p)
{
    const growth_record *w = NULL;
    if (no_head(r) && r->exact && fmpq_is_zero(r->q))
        w = r->rest;
    else if (record_decays(r))
        w = r;
    acb_t v;
    acb_init(v);
    bool ok = false;
    if (w && record_star(v, w, p)) {
        acb_exp(v, v, p->prec);
        ok = exp_near_zero(out, w, v, p);
    }
    if (!ok && record_ball(v, r, p)) {
        acb_exp(v, v, p->prec);
        record_set_ball(out, v);
        ok = acb_is_finite(v);
    }
    acb_clear(v);
    return ok;
}

/* A record that only bounds from above: exp(tau x^c) times something of modulus at most 1 (in [0, 1] when real). */
static void set_below(growth_record *out, const fmpq_t c, const arf_t tau, bool real)
{
    growth_record t;
    arf_t zero, one;
    record_init(&t);
    arf_init(zero);
    arf_init(one);
    arf_one(one);
    record_make_inexact(&t);
    if (!arf_is_zero(tau)) {
        fmpq_set(t.c, c);
        arb_set_arf(acb_realref(t.T), tau);
    }
    if (real)
        arb_set_interval_arf(acb_realref(t.g), zero, one, 30);
    else
        acb_add_error_arf(t.g, one);
    record_swap(out, &t);
    record_clear(&t);
    arf_clear(zero);
    arf_clear(one);
}

/* exp(x^A (log x)^k y), Re y <= top < 0: below exp(-b x^c) by a minorant  x^A e^(beta x^h) (log x)^k >= m x^c for x >=
 * X, which holds when x^(c-A) e^(-beta x^h) (log x)^(-k) decreases: m is the reciprocal of its supremum. */
static bool exp_falling(growth_record *out, const growth_record *r, const fmpq_t A, const fmpq_t c, const arf_t top,
                        const growth_place *p)
{
    arf_t beta, none;
    fmpq_t alpha, kappa, zero;
    arb_t m;
    arf_init(beta);
    arf_init(none);
    fmpq_init(alpha);
    fmpq_init(kappa);
    fmpq_init(zero);
    arb_init(m);
    arb_get_lbound_arf(beta, acb_realref(r->T), p->prec);
    arf_neg(beta, beta);
    fmpq_sub(alpha, c, A);
    fmpq_neg(kappa, r->k);
    bool ok = growth_sup_log(m, r->c, beta, zero, none, alpha, kappa, p);
    if (ok) {
        arb_neg(m, m);
        arb_exp(m, m, p->prec);
        arb_mul_arf(m, m, top, p->prec);
        real_upper(beta, m, p);
        ok = arf_is_finite(beta) && arf_sgn(beta) < 0;
        if (ok)
            set_below(out, c, beta, record_is_real(r));
    }
    arf_clear(beta);
    arf_clear(none);
    fmpq_clear(alpha);
    fmpq_clear(kappa);
    fmpq_clear(zero);
    arb_clear(m);
    return ok;
}

/* exp(x^A (log x)^k y), Re y <= top, top > 0, no exponential inside: below exp(b x^c) by a majorant x^A (log x)^k <= m
 * x^c. */
static bool exp_rising(growth_record *out, const growth_record *r, const fmpq_t A, const fmpq_t c, const arf_t top,
                       const growth_place *p)
{
    arf_t none;
    fmpq_t alpha, kappa, zero;
    arb_t m;
    arf_init(none);
    fmpq_init(alpha);
    fmpq_init(kappa);
    fmpq_init(zero);
    arb_init(m);
    fmpq_sub(alpha, A, c);
    fmpq_set(kappa, r->k);
    bool ok = growth_sup_log(m, zero, none, zero, none, alpha, kappa, p);
    if (ok) {
        arb_exp(m, m, p->prec);
        arb_mul_arf(m, m, top, p->prec);
        real_upper(none, m, p);
        ok = arf_is_finite(none);
        if (ok)
            set_below(out, c, none, record_is_real(r));
    }
    arf_clear(none);
    fmpq_clear(alpha);
    fmpq_clear(kappa);
    fmpq_clear(zero);
    arb_clear(m);
    return ok;
}

/* One-sided records for what has no exact one: irrational powers, logarithms beside powers, exponentials inside. */
static bool exp_one_sided(growth_record *out, const growth_record *r, const growth_place *p)
{
    arf_t top;
    fmpq_t A, c;
    arf_init(top);
    fmpq_init(A);
    fmpq_init(c);
    bool ok = false;
    if (!acb_is_real(r->T)) {
        ok = false;
    } else {
        real_upper(top, acb_realref(r->g), p);
        if (arf_sgn(top) < 0) {
            fmpq_sub(A, r->a, r->slack);
            if (!fmpq_is_zero(r->c))
                fmpq_set(c, r->c);
            else if (fmpq_sgn(r->k) >= 0)
                fmpq_set(c, A);
            else
                fmpq_div_2exp(c, A, 1);
            ok = (fmpq_sgn(c) > 0 && exp_falling(out, r, A, c, top, p));
        } else if (arf_is_zero(top)) {
            set_below(out, c, top, record_is_real(r));
            ok = true;
        } else if (fmpq_is_zero(r->c)) {
            fmpq_add(A, r->a, r->slack);
            fmpq_set(c, A);
            if (fmpq_sgn(r->k) > 0) {
                fmpq_t half;
                fmpq_init(half);
                fmpq_set_si(half, 1, 2);
                fmpq_add(c, c, half);
                fmpq_clear(half);
            }
            ok = fmpq_sgn(c) > 0 && exp_rising(out, r, A, c, top, p);
        }
    }
    arf_clear(top);
    fmpq_clear(A);
    fmpq_clear(c);
    return ok;
}

/* exp((log x)^k y), no power of x. k = 1: x^y. Else, for Re y <= top: (log x)^k against (log X)^(k-1) log x. */
static bool exp_of_logs(growth_record *out, const growth_record *r, const growth_place *p)
{
    growth_record t;
    arb_t y, scale;
    arf_t top;
    record_init(&t);
    arb_init(y);
    arb_init(scale);
    arf_init(top);
    record_make_inexact(&t);
    bool ok = true, one = fmpq_is_one(r->k), real = record_is_real(r);
    arb_set(y, acb_realref(r->g));
    if (!one) {
        fmpq_t k;
        fmpq_init(k);
        fmpq_set(k, r->k);
        fmpz_sub(fmpq_numref(k), fmpq_numref(k), fmpq_denref(k));
        real_upper(top, y, p);
        /* (log x)^(k-1) is at least (log X)^(k-1) for k >= 1 and at most that for k <= 1 */
        if ((fmpq_sgn(k) > 0 && arf_sgn(top) <= 0) || (fmpq_sgn(k) < 0 && arf_sgn(top) >= 0)) {
            arb_set_fmpq(scale, k, p->prec);
            arb_mul(scale, scale, p->log_log_X, p->prec);
            arb_exp(scale, scale, p->prec);
            arb_set_arf(y, top);
            arb_mul(y, y, scale, p->prec);
        } else if (arf_sgn(top) <= 0) {
            arb_zero(y);
        } else {
            ok = false;
        }
        fmpq_clear(k);
    }
    if (ok && one && real) {
        ok = arf_cmpabs_2exp_si(arb_midref(y), 200) < 0 &&
             (arf_is_zero(arb_midref(y)) || arf_cmpabs_2exp_si(arb_midref(y), -200) > 0);
        if (ok)
            growth_ball_as_fmpq(t.a, t.slack, y);
        acb_one(t.g);
    } else if (ok) {
        real_upper(top, y, p);
        ok = arf_is_finite(top) && arf_cmpabs_2exp_si(top, 200) < 0 &&
             (arf_is_zero(top) || arf_cmpabs_2exp_si(top, -200) > 0);
        arf_t zero, unit;
        arf_init(zero);
        arf_init(unit);
        arf_one(unit);
        if (ok)
            arf_get_fmpq(t.a, top);
        if (real)
            arb_set_interval_arf(acb_realref(t.g), zero, unit, 30);
        else
            acb_add_error_arf(t.g, unit);
        arf_clear(zero);
        arf_clear(unit);
    }
    record_swap(out, &t);
    record_clear(&t);
    arb_clear(y);
    arb_clear(scale);
    arf_clear(top);
    return ok;
}

/* exp(head (q + rest)) = exp(q head) exp(head rest), where exp(q head) has an exact record: head x^a or log x. */
static bool exp_leading(growth_record *out, const growth_record *r, const growth_place *p)
{
    growth_record lead, rest;
    record_init(&lead);
    record_init(&rest);
    bool ok = true;
    record_set_si(&lead, 1);
    if (fmpq_is_zero(r->a)) {
        fmpq_set(lead.a, r->q);
    } else {
        fmpq_set(lead.c, r->a);
        acb_set_fmpq(lead.T, r->q, p->prec);
    }
    if (r->rest) {
        record_head(&rest, r, false);
        ok = record_mul(&rest, &rest, r->rest, p) && record_exp(&rest, &rest, p) && record_mul(&lead, &lead, &rest, p);
    }
    if (ok)
        record_swap(out, &lead);
    record_clear(&lead);
    record_clear(&rest);
    return ok;
}

static bool exp_two_sided(growth_record *out, const growth_record *r)
{
    growth_record t;
    record_init(&t);
    record_set_si(&t, 1);
    fmpq_set(t.c, r->a);
    acb_set(t.T, r->g);
    record_swap(out, &t);
    record_clear(&t);
    return true;
}

bool record_exp(growth_record *out, const growth_record *r, const growth_place *p)
{
    if (record_is_zero(r)) {
        record_set_si(out, 1);
        return true;
    }
    if (exp_bounded(out, r, p))
        return true;
    bool plain_power = fmpq_is_zero(r->c) && fmpq_sgn(r->a) > 0 && fmpq_is_zero(r->k) && fmpq_is_zero(r->slack);
    bool logs = fmpq_is_zero(r->c) && fmpq_is_zero(r->a) && fmpq_is_zero(r->slack) && fmpq_sgn(r->k) > 0;
    if (r->exact && (plain_power || (logs && fmpq_is_one(r->k))) && exp_leading(out, r, p))
        return true;
    if (plain_power)
        return exp_two_sided(out, r);
    return logs ? exp_of_logs(out, r, p) : exp_one_sided(out, r, p);
}
