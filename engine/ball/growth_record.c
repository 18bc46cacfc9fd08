/* The arithmetic of growth records. Each operation takes what is known of its operands for ALL x >= X and gives what is
 * then known of the result for all x >= X, or says that it knows nothing. Knows no expressions.
 *
 * The one idea: whatever is dropped is bounded by its value at X, after checking that the bounding function (constant
 * coefficients, upper bounds only) decreases from X on. */
#include "engine/ball/growth_record.h"

#include <stdlib.h>

enum { REST_DEPTH = 3, Q_BITS_LIMIT = 400 };

void growth_place_init(growth_place *p, tw_engine *e)
{
    p->e = e;
    p->prec = 64;
    p->analytic = false;
    arb_init(p->X);
    arb_init(p->log_X);
    arb_init(p->log_log_X);
}

void growth_place_clear(growth_place *p)
{
    arb_clear(p->X);
    arb_clear(p->log_X);
    arb_clear(p->log_log_X);
}

void growth_place_set(growth_place *p, const arf_t X)
{
    arb_set_arf(p->X, X);
    arb_log(p->log_X, p->X, p->prec);
    arb_log(p->log_log_X, p->log_X, p->prec);
}

void record_init(growth_record *r)
{
    fmpq_init(r->c);
    fmpq_init(r->a);
    fmpq_init(r->slack);
    fmpq_init(r->k);
    fmpq_init(r->q);
    acb_init(r->T);
    acb_init(r->g);
    r->exact = true;
    r->rest = NULL;
}

static void drop_rest(growth_record *r)
{
    if (r->rest) {
        record_clear(r->rest);
        free(r->rest);
        r->rest = NULL;
    }
}

void record_make_inexact(growth_record *r)
{
    drop_rest(r);
    r->exact = false;
}

void record_clear(growth_record *r)
{
    drop_rest(r);
    fmpq_clear(r->c);
    fmpq_clear(r->a);
    fmpq_clear(r->slack);
    fmpq_clear(r->k);
    fmpq_clear(r->q);
    acb_clear(r->T);
    acb_clear(r->g);
}

void record_swap(growth_record *r, growth_record *s)
{
    growth_record t = *r;
    *r = *s;
    *s = t;
}

static growth_record *record_new(void)
{
    growth_record *r = base_alloc(sizeof *r);
    record_init(r);
    return r;
}

static void head_set(growth_record *r, const growth_record *s)
{
    fmpq_set(r->c, s->c);
    fmpq_set(r->a, s->a);
    fmpq_set(r->slack, s->slack);
    fmpq_set(r->k, s->k);
    acb_set(r->T, s->T);
}

void record_set(growth_record *r, const growth_record *s)
{
    if (r == s)
        return;
    drop_rest(r);
    head_set(r, s);
    fmpq_set(r->q, s->q);
    acb_set(r->g, s->g);
    r->exact = s->exact;
    if (s->rest) {
        r->rest = record_new();
        record_set(r->rest, s->rest);
    }
}

static void head_one(growth_record *r)
{
    fmpq_zero(r->c);
    fmpq_zero(r->a);
    fmpq_zero(r->slack);
    fmpq_zero(r->k);
    acb_zero(r->T);
}

void record_set_fmpq(growth_record *r, const fmpq_t q)
{
    drop_rest(r);
    head_one(r);
    r->exact = true;
    fmpq_set(r->q, q);
    acb_set_fmpq(r->g, q, 64);
}

void record_set_si(growth_record *r, slong n)
{
    fmpq_t q;
    fmpq_init(q);
    fmpq_set_si(q, n, 1);
    record_set_fmpq(r, q);
    fmpq_clear(q);
}

void record_set_ball(growth_record *r, const acb_t value)
{
    record_make_inexact(r);
    head_one(r);
    acb_set(r->g, value);
}

void record_set_variable(growth_record *r)
{
    record_set_si(r, 1);
    fmpq_one(r->a);
}

bool record_is_zero(const growth_record *r)
{
    return acb_is_zero(r->g);
}

bool record_is_real(const growth_record *r)
{
    return acb_is_real(r->g) && acb_is_real(r->T);
}

bool record_decays(const growth_record *r)
{
    if (record_is_zero(r))
        return true;
    if (!fmpq_is_zero(r->c))
        return arb_is_negative(acb_realref(r->T));
    fmpq_t top;
    fmpq_init(top);
    fmpq_add(top, r->a, r->slack);
    bool yes = fmpq_sgn(top) < 0 || (fmpq_is_zero(top) && fmpq_sgn(r->k) < 0);
    fmpq_clear(top);
    return yes;
}

/* ---- suprema ---- */

/* X^q */
static void X_power(arb_t out, const fmpq_t q, const growth_place *p)
{
    arb_set_fmpq(out, q, p->prec);
    arb_mul(out, out, p->log_X, p->prec);
    arb_exp(out, out, p->prec);
}

/* c tau X^c */
static void X_slope(arb_t out, const fmpq_t c, const arf_t tau, const growth_place *p)
{
    arb_t t;
    arb_init(t);
    X_power(out, c, p);
    arb_set_fmpq(t, c, p->prec);
    arb_mul(out, out, t, p->prec);
    arb_set_arf(t, tau);
    arb_mul(out, out, t, p->prec);
    arb_clear(t);
}

/* x d/dx of the logarithm is  sum c tau x^c + alpha + kappa/log x.  Its greatest power of x must carry a negative
 * coefficient and outweigh the positive parts at X; the quotient of each positive part by it does not grow with x. */
static bool seen_to_decrease(const fmpq_t c1, const arf_t tau1, const fmpq_t c2, const arf_t tau2, const fmpq_t alpha,
                             const fmpq_t kappa, const growth_place *p)
{
    arb_t loss, gain, t;
    bool none1 = arf_is_zero(tau1) || fmpq_is_zero(c1), none2 = arf_is_zero(tau2) || fmpq_is_zero(c2);
    bool yes = true;
    arb_init(loss);
    arb_init(gain);
    arb_init(t);
    if (none1 && none2) {
        if (fmpq_sgn(alpha) > 0 || (fmpq_is_zero(alpha) && fmpq_sgn(kappa) > 0))
            yes = false;
        arb_set_fmpq(loss, alpha, p->prec);
        arb_neg(loss, loss);
    } else {
        bool first = none2 || (!none1 && fmpq_cmp(c1, c2) > 0);
        arf_srcptr main = first ? tau1 : tau2, other = first ? tau2 : tau1;
        if (arf_sgn(main) > 0 || (!none1 && !none2 && fmpq_equal(c1, c2)))
            yes = false;
        X_slope(loss, first ? c1 : c2, main, p);
        arb_neg(loss, loss);
        if (!none1 && !none2 && arf_sgn(other) > 0)
            X_slope(gain, first ? c2 : c1, other, p);
        if (fmpq_sgn(alpha) > 0) {
            arb_set_fmpq(t, alpha, p->prec);
            arb_add(gain, gain, t, p->prec);
        }
    }
    if (fmpq_sgn(kappa) > 0) {
        arb_set_fmpq(t, kappa, p->prec);
        arb_div(t, t, p->log_X, p->prec);
        arb_add(gain, gain, t, p->prec);
    }
    yes = yes && (arb_is_zero(gain) || arb_ge(loss, gain));
    arb_clear(loss);
    arb_clear(gain);
    arb_clear(t);
    return yes;
}

bool growth_sup_log(arb_t out, const fmpq_t c1, const arf_t tau1, const fmpq_t c2, const arf_t tau2, const fmpq_t alpha,
                    const fmpq_t kappa, const growth_place *p)
{
    if (!arf_is_finite(tau1) || !arf_is_finite(tau2) || !seen_to_decrease(c1, tau1, c2, tau2, alpha, kappa, p))
        return false;
    arb_t t, u;
    arb_init(t);
    arb_init(u);
    arb_set_fmpq(u, alpha, p->prec);
    arb_mul(t, u, p->log_X, p->prec);
    if (!fmpq_is_zero(kappa)) {
        arb_set_fmpq(u, kappa, p->prec);
        arb_addmul(t, u, p->log_log_X, p->prec);
    }
    if (!arf_is_zero(tau1) && !fmpq_is_zero(c1)) {
        X_power(u, c1, p);
        arb_addmul_arf(t, u, tau1, p->prec);
    }
    if (!arf_is_zero(tau2) && !fmpq_is_zero(c2)) {
        X_power(u, c2, p);
        arb_addmul_arf(t, u, tau2, p->prec);
    }
    arb_swap(out, t);
    arb_clear(t);
    arb_clear(u);
    return arb_is_finite(out);
}

static void real_upper(arf_t out, const arb_t x, const growth_place *p)
{
    arb_get_ubound_arf(out, x, p->prec);
}

static void real_lower(arf_t out, const arb_t x, const growth_place *p)
{
    arb_get_lbound_arf(out, x, p->prec);
}

/* log of the supremum of |head of s| / |head of r| over x >= X. */
static bool head_ratio_sup_log(arb_t out, const growth_record *s, const growth_record *r, const growth_place *p)
{
    arf_t tau1, tau2;
    fmpq_t alpha, kappa;
    arb_t t;
    arf_init(tau1);
    arf_init(tau2);
    fmpq_init(alpha);
    fmpq_init(kappa);
    arb_init(t);
    if (fmpq_equal(s->c, r->c)) {
        if (!(acb_equal(s->T, r->T) && acb_is_exact(s->T))) {
            arb_sub(t, acb_realref(s->T), acb_realref(r->T), p->prec);
            real_upper(tau1, t, p);
        }
    } else {
        real_upper(tau1, acb_realref(s->T), p);
        real_lower(tau2, acb_realref(r->T), p);
        arf_neg(tau2, tau2);
    }
    fmpq_sub(alpha, s->a, r->a);
    fmpq_add(alpha, alpha, s->slack);
    fmpq_add(alpha, alpha, r->slack);
    fmpq_sub(kappa, s->k, r->k);
    bool yes = growth_sup_log(out, s->c, tau1, r->c, tau2, alpha, kappa, p);
    arf_clear(tau1);
    arf_clear(tau2);
    fmpq_clear(alpha);
    fmpq_clear(kappa);
    arb_clear(t);
    return yes;
}

/* value * [0, sup] where the factor is real and positive, else value * (disc of radius sup). */
static void shrink(acb_t out, const acb_t value, const arb_t sup_log, bool positive, const growth_place *p)
{
    arb_t sup;
    arf_t zero, top;
    acb_t factor;
    arb_init(sup);
    arf_init(zero);
    arf_init(top);
    acb_init(factor);
    arb_exp(sup, sup_log, p->prec);
    real_upper(top, sup, p);
    if (positive)
        arb_set_interval_arf(acb_realref(factor), zero, top, p->prec);
    else {
        arb_add_error_arf(acb_realref(factor), top);
        arb_add_error_arf(acb_imagref(factor), top);
    }
    acb_mul(out, value, factor, p->prec);
    arb_clear(sup);
    arf_clear(zero);
    arf_clear(top);
    acb_clear(factor);
}

static const growth_record *one_record(growth_record *store)
{
    record_init(store);
    record_set_si(store, 1);
    return store;
}

bool record_ball(acb_t value, const growth_record *r, const growth_place *p)
{
    growth_record one;
    arb_t sup;
    arb_init(sup);
    bool yes = true;
    one_record(&one);
    if (record_is_zero(r))
        acb_zero(value);
    else if (fmpq_is_zero(r->c) && fmpq_is_zero(r->a) && fmpq_is_zero(r->k) && fmpq_is_zero(r->slack))
        acb_set(value, r->g);
    else if (head_ratio_sup_log(sup, r, &one, p))
        shrink(value, r->g, sup, acb_is_real(r->T), p);
    else
        yes = false;
    record_clear(&one);
    arb_clear(sup);
    return yes && acb_is_finite(value);
}

bool record_star(acb_t star, const growth_record *w, const growth_place *p)
{
    arb_t zero;
    arb_init(zero);
    bool yes = record_ball(star, w, p);
    if (yes) {
        arb_union(acb_realref(star), acb_realref(star), zero, p->prec);
        arb_union(acb_imagref(star), acb_imagref(star), zero, p->prec);
    }
    arb_clear(zero);
    return yes;
}

/* ---- products and sums ---- */

/* Forgets rests of rests beyond a depth, and numbers that grew too long, so that the work stays bounded. */
static void trim(growth_record *r, int depth)
{
    if (r->exact && (fmpz_bits(fmpq_numref(r->q)) > Q_BITS_LIMIT || fmpz_bits(fmpq_denref(r->q)) > Q_BITS_LIMIT))
        record_make_inexact(r);
    if (!r->rest)
        return;
    if (depth == 0)
        record_make_inexact(r);
    else
        trim(r->rest, depth - 1);
}

/* exp(T1 x^c1) exp(T2 x^c2) as one exponential; the lower power joins the ball of the higher one's coefficient. */
static void exponential_mul(fmpq_t c, acb_t T, const growth_record *r, const growth_record *s, const growth_place *p)
{
    int order = fmpq_cmp(r->c, s->c);
    if (order == 0 || fmpq_is_zero(s->c) || fmpq_is_zero(r->c)) {
        acb_add(T, r->T, s->T, p->prec);
        fmpq_set(c, order >= 0 ? r->c : s->c);
    } else {
        const growth_record *high = order > 0 ? r : s, *low = order > 0 ? s : r;
        fmpq_t d;
        arb_t shrinking;
        acb_t t;
        fmpq_init(d);
        arb_init(shrinking);
        acb_init(t);
        fmpq_sub(d, low->c, high->c);
        arb_set_fmpq(shrinking, d, p->prec);
        arb_mul(shrinking, shrinking, p->log_X, p->prec);
        shrink(t, low->T, shrinking, true, p);
        acb_add(T, high->T, t, p->prec);
        fmpq_set(c, high->c);
        fmpq_clear(d);
        arb_clear(shrinking);
        acb_clear(t);
    }
    if (acb_is_zero(T))
        fmpq_zero(c);
}

/* The rest of a product: q_r rest_s + q_s rest_r + rest_r rest_s. */
static bool product_rest(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    growth_record t, u;
    bool ok = true;
    record_init(&t);
    record_init(&u);
    if (s->rest) {
        record_set_fmpq(&u, r->q);
        ok = record_mul(&t, s->rest, &u, p);
    }
    if (ok && r->rest) {
        record_set_fmpq(&u, s->q);
        ok = record_mul(&u, r->rest, &u, p) && record_add(&t, &t, &u, p);
    }
    if (ok && r->rest && s->rest)
        ok = record_mul(&u, r->rest, s->rest, p) && record_add(&t, &t, &u, p);
    record_swap(out, &t);
    record_clear(&t);
    record_clear(&u);
    return ok;
}

bool record_mul(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    growth_record t;
    record_init(&t);
    if (record_is_zero(r) || record_is_zero(s)) {
        record_swap(out, &t);
        record_clear(&t);
        return true;
    }
    exponential_mul(t.c, t.T, r, s, p);
    fmpq_add(t.a, r->a, s->a);
    fmpq_add(t.slack, r->slack, s->slack);
    fmpq_add(t.k, r->k, s->k);
    acb_mul(t.g, r->g, s->g, p->prec);
    t.exact = r->exact && s->exact;
    fmpq_mul(t.q, r->q, s->q);
    if (t.exact && (r->rest || s->rest)) {
        t.rest = record_new();
        if (!product_rest(t.rest, r, s, p))
            record_make_inexact(&t);
    }
    trim(&t, REST_DEPTH);
    record_swap(out, &t);
    record_clear(&t);
    return acb_is_finite(out->g) && acb_is_finite(out->T);
}

bool record_scale(growth_record *out, const growth_record *r, slong n, const growth_place *p)
{
    growth_record t;
    record_init(&t);
    record_set_si(&t, n);
    bool ok = record_mul(out, r, &t, p);
    record_clear(&t);
    return ok;
}

/* The head of r, or its reciprocal, alone. */
void record_head(growth_record *out, const growth_record *r, bool reciprocal)
{
    record_set_si(out, 1);
    head_set(out, r);
    if (reciprocal) {
        fmpq_neg(out->a, out->a);
        fmpq_neg(out->k, out->k);
        acb_neg(out->T, out->T);
    }
}

static bool same_head(const growth_record *r, const growth_record *s)
{
    return fmpq_equal(r->c, s->c) && acb_equal(r->T, s->T) && acb_is_exact(r->T) && fmpq_equal(r->a, s->a) &&
           fmpq_equal(r->k, s->k) && fmpq_is_zero(r->slack) && fmpq_is_zero(s->slack);
}

static bool add_same_head(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    growth_record t, head;
    bool ok = true;
    record_init(&t);
    record_init(&head);
    head_set(&t, r);
    acb_add(t.g, r->g, s->g, p->prec);
    t.exact = r->exact && s->exact;
    fmpq_add(t.q, r->q, s->q);
    if (t.exact && (r->rest || s->rest)) {
        growth_record zero;
        record_init(&zero);
        t.rest = record_new();
        if (!record_add(t.rest, r->rest ? r->rest : &zero, s->rest ? s->rest : &zero, p))
            record_make_inexact(&t);
        record_clear(&zero);
    }
    if (t.exact && fmpq_is_zero(t.q)) {
        record_head(&head, &t, false);
        if (!t.rest) {
            record_set_si(&t, 0);
        } else {
            ok = record_mul(&head, &head, t.rest, p);
            record_swap(&t, &head);
        }
    }
    trim(&t, REST_DEPTH);
    record_swap(out, &t);
    record_clear(&t);
    record_clear(&head);
    return ok;
}

/* r + s with s measured against the head of r. */
static bool add_dominated(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    arb_t sup;
    arb_init(sup);
    if (!head_ratio_sup_log(sup, s, r, p)) {
        arb_clear(sup);
        return false;
    }
    growth_record t, part;
    acb_t small;
    record_init(&t);
    record_init(&part);
    acb_init(small);
    shrink(small, s->g, sup, acb_is_real(r->T) && acb_is_real(s->T), p);
    record_set(&t, r);
    acb_add(t.g, t.g, small, p->prec);
    if (t.exact && fmpq_is_zero(r->slack)) {
        record_head(&part, r, true);
        bool ok = record_mul(&part, &part, s, p) && record_decays(&part);
        if (ok && t.rest)
            ok = record_add(&part, t.rest, &part, p);
        if (ok) {
            if (!t.rest)
                t.rest = record_new();
            record_swap(t.rest, &part);
        } else {
            record_make_inexact(&t);
        }
    } else {
        record_make_inexact(&t);
    }
    trim(&t, REST_DEPTH);
    record_swap(out, &t);
    record_clear(&t);
    record_clear(&part);
    acb_clear(small);
    arb_clear(sup);
    return acb_is_finite(out->g);
}

/* Neither dominates: the sum of the moduli under a head above both. */
static bool add_moduli(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    growth_record t;
    arb_t sup1, sup2;
    acb_t g1, g2;
    arf_t u, v;
    record_init(&t);
    arb_init(sup1);
    arb_init(sup2);
    acb_init(g1);
    acb_init(g2);
    arf_init(u);
    arf_init(v);
    fmpq_t ra, sa;
    fmpq_init(ra);
    fmpq_init(sa);
    fmpq_set(t.c, fmpq_cmp(r->c, s->c) >= 0 ? r->c : s->c);
    real_upper(u, acb_realref(r->T), p);
    real_upper(v, acb_realref(s->T), p);
    arf_max(u, u, v);
    arf_abs(v, u);
    arf_mul_2exp_si(v, v, -40); /* room for rounding */
    arf_add(u, u, v, p->prec, ARF_RND_CEIL);
    if (arf_is_zero(u) || !fmpq_equal(r->c, s->c)) { /* powers of x differ: only a head without exponential is tried */
        fmpq_zero(t.c);
        arf_zero(u);
    }
    arb_set_arf(acb_realref(t.T), u);
    fmpq_add(ra, r->a, r->slack);
    fmpq_add(sa, s->a, s->slack);
    fmpq_set(t.a, fmpq_cmp(ra, sa) >= 0 ? ra : sa);
    fmpq_set(t.k, fmpq_cmp(r->k, s->k) >= 0 ? r->k : s->k);
    bool ok = head_ratio_sup_log(sup1, r, &t, p) && head_ratio_sup_log(sup2, s, &t, p);
    if (ok) {
        shrink(g1, r->g, sup1, false, p);
        shrink(g2, s->g, sup2, false, p);
        acb_add(t.g, g1, g2, p->prec);
        record_make_inexact(&t);
        record_swap(out, &t);
        ok = acb_is_finite(out->g);
    }
    fmpq_clear(ra);
    fmpq_clear(sa);
    record_clear(&t);
    arb_clear(sup1);
    arb_clear(sup2);
    acb_clear(g1);
    acb_clear(g2);
    arf_clear(u);
    arf_clear(v);
    return ok;
}

bool record_add(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p)
{
    if (record_is_zero(r) || record_is_zero(s)) {
        record_set(out, record_is_zero(r) ? s : r);
        return true;
    }
    if (same_head(r, s))
        return add_same_head(out, r, s, p);
    return add_dominated(out, r, s, p) || add_dominated(out, s, r, p) || add_moduli(out, r, s, p);
}

/* ---- powers ---- */

/* q^power when that is rational and q > 0 (or the power an integer of moderate size). */
static bool rational_power(fmpq_t out, const fmpq_t q, const fmpq_t power)
{
    if (fmpq_is_one(q)) {
        fmpq_one(out);
        return true;
    }
    if (fmpz_cmpabs(fmpq_numref(power), fmpq_denref(power)) > 0 && fmpz_bits(fmpq_numref(power)) > 8)
        return false;
    if (fmpz_bits(fmpq_numref(power)) > 8 || fmpz_bits(fmpq_denref(power)) > 6 || fmpq_is_zero(q))
        return false;
    if (!fmpz_is_one(fmpq_denref(power)) && fmpq_sgn(q) < 0)
        return false;
    slong n = fmpz_get_si(fmpq_numref(power));
    ulong root = fmpz_get_ui(fmpq_denref(power));
    fmpq_t t;
    fmpq_init(t);
    bool ok = true;
    if (root > 1)
        ok = fmpz_root(fmpq_numref(t), fmpq_numref(q), root) && fmpz_root(fmpq_denref(t), fmpq_denref(q), root);
    else
        fmpq_set(t, q);
    if (ok)
        fmpq_pow_si(out, t, n);
    fmpq_clear(t);
    return ok;
}

/* |z|^power as a ball around 0, power >= 0 real. */
static void modulus_power(acb_t out, const acb_t z, const arb_t power, const growth_place *p)
{
    arf_t top;
    arb_t m;
    arf_init(top);
    arb_init(m);
    acb_get_abs_ubound_arf(top, z, p->prec);
    arb_set_arf(m, top);
    if (arf_is_zero(top))
        arb_zero(m);
    else
        arb_pow(m, m, power, p->prec);
    real_upper(top, m, p);
    acb_zero(out);
    arb_add_error_arf(acb_realref(out), top);
    arb_add_error_arf(acb_imagref(out), top);
    arf_clear(top);
    arb_clear(m);
}

/* Does z meet the cut (-inf, 0]? */
static bool meets_cut(const acb_t z)
{
    return arb_contains_zero(acb_imagref(z)) && !arb_is_positive(acb_realref(z));
}

/* The ball of g for the power of a record with real exponent `power` (exact integer n when integer). */
static bool power_ball(acb_t out, const growth_record *r, const arb_t power, bool integer, const growth_place *p)
{
    if (p->analytic && !integer && (meets_cut(r->g) || !acb_is_real(r->T)))
        return false;
    if (!acb_contains_zero(r->g) && (integer || acb_is_real(r->T))) {
        acb_t e;
        acb_init(e);
        acb_set_arb(e, power);
        if (acb_is_real(r->g) && (arb_is_positive(acb_realref(r->g)) || integer)) {
            acb_zero(out);
            arb_pow(acb_realref(out), acb_realref(r->g), power, p->prec);
        } else {
            acb_pow(out, r->g, e, p->prec);
        }
        acb_clear(e);
    } else if (arb_is_positive(power)) {
        if (integer && arb_is_exact(power) && arf_cmpabs_2exp_si(arb_midref(power), 12) < 0)
            acb_pow_ui(out, r->g, (ulong)arf_get_si(arb_midref(power), ARF_RND_DOWN), p->prec);
        else
            modulus_power(out, r->g, power, p);
    } else if (!acb_contains_zero(r->g)) {
        arf_t low, top;
        arb_t m;
        arf_init(low);
        arf_init(top);
        arb_init(m);
        acb_get_abs_lbound_arf(low, r->g, p->prec);
        arb_set_arf(m, low);
        arb_pow(m, m, power, p->prec);
        real_upper(top, m, p);
        acb_zero(out);
        arb_add_error_arf(acb_realref(out), top);
        arb_add_error_arf(acb_imagref(out), top);
        arf_clear(low);
        arf_clear(top);
        arb_clear(m);
    } else {
        return false;
    }
    return acb_is_finite(out);
}

/* (q + w)^power = q^power + w (power q^(power - 1) + w h),  h in power (power - 1)/2 (q + star)^(power - 2): two orders,
 * so that a sum may lose its first without losing all. */
static bool power_rest(growth_record *rest, fmpq_t value, const growth_record *r, const fmpq_t power,
        const growth_place *p)
{
    if (!rational_power(value, r->q, power))
        return false;
    if (!r->rest)
        return true;
    acb_t h, e;
    growth_record t;
    fmpq_t slope;
    acb_init(h);
    acb_init(e);
    record_init(&t);
    fmpq_init(slope);
    bool ok = record_star(h, r->rest, p);
    if (ok) {
        acb_set_fmpq(e, r->q, p->prec);
        acb_add(h, h, e, p->prec);
        ok = arb_is_positive(acb_realref(h)) || (fmpz_is_one(fmpq_denref(power)) && !acb_contains_zero(h));
    }
    if (ok) {
        acb_set_fmpq(e, power, p->prec);
        acb_sub_ui(e, e, 2, p->prec);
        acb_pow(h, h, e, p->prec);
        acb_add_ui(e, e, 1, p->prec);
        acb_mul(h, h, e, p->prec);
        acb_add_ui(e, e, 1, p->prec);
        acb_mul(h, h, e, p->prec);
        acb_mul_2exp_si(h, h, -1);
        fmpq_div(slope, value, r->q);
        fmpq_mul(slope, slope, power);
        ok = acb_is_finite(h) && record_near(&t, slope, r->rest, h, p) && record_mul(rest, r->rest, &t, p);
    }
    record_clear(&t);
    acb_clear(h);
    acb_clear(e);
    fmpq_clear(slope);
    return ok;
}

static bool power_real(growth_record *out, const growth_record *r, const fmpq_t power, const arb_t ball, bool integer,
                       const fmpq_t doubt, const growth_place *p)
{
    growth_record t;
    fmpq_t u;
    record_init(&t);
    fmpq_init(u);
    fmpq_set(t.c, r->c);
    acb_mul_arb(t.T, r->T, ball, p->prec);
    if (!integer && !acb_is_real(r->T)) /* only the modulus is known */
        arb_zero(acb_imagref(t.T));
    if (acb_is_zero(t.T))
        fmpq_zero(t.c);
    fmpq_mul(t.a, r->a, power);
    fmpq_mul(t.k, r->k, power);
    fmpq_mul(t.slack, r->slack, power);
    fmpq_abs(t.slack, t.slack);
    if (!fmpq_is_zero(doubt)) { /* the exponent is power + something within doubt */
        fmpq_abs(u, r->a);
        fmpq_add(u, u, r->slack);
        fmpq_mul(u, u, doubt);
        fmpq_add(t.slack, t.slack, u);
    }
    bool ok = power_ball(t.g, r, ball, integer, p) && (fmpq_is_zero(doubt) || fmpq_is_zero(r->k));
    t.exact = ok && r->exact && fmpq_is_zero(doubt) && (integer || acb_is_real(r->T));
    if (t.exact) {
        t.rest = r->rest ? record_new() : NULL;
        if (!power_rest(t.rest, t.q, r, power, p))
            record_make_inexact(&t);
    } else {
        record_make_inexact(&t);
    }
    trim(&t, REST_DEPTH);
    record_swap(out, &t);
    record_clear(&t);
    fmpq_clear(u);
    return ok && acb_is_finite(out->T);
}

bool record_pow_fmpq(growth_record *out, const growth_record *r, const fmpq_t power, const growth_place *p)
{
    if (fmpq_is_zero(power)) {
        record_set_si(out, 1);
        return true;
    }
    if (record_is_zero(r)) {
        record_set(out, r);
        return fmpq_sgn(power) > 0;
    }
    arb_t ball;
    fmpq_t none;
    arb_init(ball);
    fmpq_init(none);
    arb_set_fmpq(ball, power, p->prec);
    bool ok = power_real(out, r, power, ball, fmpz_is_one(fmpq_denref(power)), none, p);
    arb_clear(ball);
    fmpq_clear(none);
    return ok;
}

/* A ball's centre and radius as rationals. */
void growth_ball_as_fmpq(fmpq_t centre, fmpq_t radius, const arb_t x)
{
    arf_t r;
    arf_init(r);
    arf_get_fmpq(centre, arb_midref(x));
    arf_set_mag(r, arb_radref(x));
    arf_get_fmpq(radius, r);
    arf_clear(r);
}

bool record_pow_ball(growth_record *out, const growth_record *r, const acb_t power, const growth_place *p)
{
    if (record_is_zero(r) || !acb_is_finite(power))
        return false;
    if (!acb_is_real(power)) { /* f^(u + iv) = exp((u + iv) log f) */
        growth_record t;
        record_init(&t);
        record_set_ball(&t, power);
        bool ok = record_log(out, r, p) && record_mul(out, out, &t, p) && record_exp(out, out, p);
        record_clear(&t);
        return ok;
    }
    fmpq_t centre, radius;
    fmpq_init(centre);
    fmpq_init(radius);
    bool small = arf_cmpabs_2exp_si(arb_midref(acb_realref(power)), 60) < 0 &&
                 (arf_is_zero(arb_midref(acb_realref(power))) ||
                  arf_cmpabs_2exp_si(arb_midref(acb_realref(power)), -200) > 0);
    bool ok = small;
    if (ok) {
        growth_ball_as_fmpq(centre, radius, acb_realref(power));
        ok = power_real(out, r, centre, acb_realref(power), false, radius, p);
    }
    fmpq_clear(centre);
    fmpq_clear(radius);
    return ok;
}

/* ---- modulus ---- */

bool record_abs(growth_record *out, const growth_record *r, const growth_place *p)
{
    if (record_is_real(r) && !arb_contains_zero(acb_realref(r->g)))
        return record_scale(out, r, arb_is_negative(acb_realref(r->g)) ? -1 : 1, p);
    growth_record t;
    record_init(&t);
    head_set(&t, r);
    arb_zero(acb_imagref(t.T));
    if (acb_is_zero(t.T))
        fmpq_zero(t.c);
    acb_abs(acb_realref(t.g), r->g, p->prec);
    record_make_inexact(&t);
    record_swap(out, &t);
    record_clear(&t);
    return true;
}
