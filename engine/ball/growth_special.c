/* Growth records of the special functions: Gamma and its kin, exponential integrals, Airy and Bessel functions, where
 * their argument is real and grows without bound or falls to 0. Knows records and nothing of expressions.
 *
 * The one idea: each is an elementary head times a factor that a published inequality, or a known monotone quantity,
 * holds in an interval for all x >= X; so its record is the head's record times that interval. */
#include "engine/ball/growth_special.h"

/* u real, positive, and 1/u -> 0: its reciprocal's record and the least value that u takes. */
static bool grows(growth_record *inverse, arb_t least, const growth_record *u, const growth_place *p)
{
    fmpq_t minus_one;
    acb_t t;
    arf_t top;
    if (!record_is_real(u) || !arb_is_positive(acb_realref(u->g)) || record_decays(u))
        return false;
    fmpq_init(minus_one);
    acb_init(t);
    arf_init(top);
    fmpq_set_si(minus_one, -1, 1);
    bool ok = record_pow_fmpq(inverse, u, minus_one, p) && record_decays(inverse) && record_ball(t, inverse, p);
    if (ok) {
        arb_get_ubound_arf(top, acb_realref(t), p->prec);
        arb_set_arf(least, top);
        arb_inv(least, least, p->prec);
        arb_get_lbound_arf(top, least, p->prec);
        arb_set_arf(least, top);
        ok = arb_is_positive(least);
    }
    fmpq_clear(minus_one);
    acb_clear(t);
    arf_clear(top);
    return ok;
}

/* u real, positive, u -> 0: the greatest value that u takes. */
static bool falls(arb_t greatest, const growth_record *u, const growth_place *p)
{
    acb_t t;
    arf_t top;
    if (!record_is_real(u) || !arb_is_positive(acb_realref(u->g)) || !record_decays(u))
        return false;
    acb_init(t);
    arf_init(top);
    bool ok = record_ball(t, u, p);
    arb_get_ubound_arf(top, acb_realref(t), p->prec);
    arb_set_arf(greatest, top);
    ok = ok && arb_is_finite(greatest) && arb_is_positive(greatest);
    acb_clear(t);
    arf_clear(top);
    return ok;
}

/* A real parameter's values. */
static bool parameter(arb_t nu, const growth_record *r, const growth_place *p)
{
    acb_t t;
    acb_init(t);
    bool ok = record_is_real(r) && record_ball(t, r, p);
    arb_set(nu, acb_realref(t));
    acb_clear(t);
    return ok;
}

static void record_set_arb(growth_record *out, const arb_t x)
{
    acb_t t;
    acb_init(t);
    acb_set_arb(t, x);
    record_set_ball(out, t);
    acb_clear(t);
}

/* Anything between two real balls. */
static bool record_set_between(growth_record *out, const arb_t a, const arb_t b, const growth_place *p)
{
    arb_t t;
    arb_init(t);
    arb_union(t, a, b, p->prec);
    record_set_arb(out, t);
    bool ok = arb_is_finite(t);
    arb_clear(t);
    return ok;
}

/* out = factor * u^power * exp(sign u), exp left out for sign 0. */
static bool head(growth_record *out, const growth_record *factor, const growth_record *u, slong numerator,
                 slong denominator, slong sign, const growth_place *p)
{
    growth_record t;
    fmpq_t power;
    record_init(&t);
    fmpq_init(power);
    fmpq_set_si(power, numerator, denominator);
    bool ok = record_pow_fmpq(&t, u, power, p) && record_mul(&t, &t, factor, p);
    if (ok && sign) {
        growth_record w;
        record_init(&w);
        ok = record_scale(&w, u, sign, p) && record_exp(&w, &w, p) && record_mul(&t, &t, &w, p);
        record_clear(&w);
    }
    if (ok)
        record_swap(out, &t);
    record_clear(&t);
    fmpq_clear(power);
    return ok;
}

/* out = factor * u^nu, nu a real ball. */
static bool real_power(growth_record *out, const growth_record *factor, const growth_record *u, const arb_t nu,
                       const growth_place *p)
{
    growth_record t;
    acb_t power;
    record_init(&t);
    acb_init(power);
    acb_set_arb(power, nu);
    bool ok = record_pow_ball(&t, u, power, p) && record_mul(out, &t, factor, p);
    record_clear(&t);
    acb_clear(power);
    return ok;
}

/* ---- exponential integrals ---- */

/* E1(u) = e^-u/u * h, 1 - 1/u <= h <= 1 (DLMF 6.12.1 and the text after it). */
static bool e1_large(growth_record *out, const growth_record *u, const growth_record *inverse, const arb_t least,
                     const growth_place *p)
{
    growth_record h;
    arb_t low, one;
    record_init(&h);
    arb_init(low);
    arb_init(one);
    arb_one(one);
    arb_inv(low, least, p->prec);
    arb_sub(low, one, low, p->prec);
    arb_nonnegative_part(low, low);
    bool ok = record_set_between(&h, low, one, p) && record_mul(&h, &h, inverse, p) && head(out, &h, u, 0, 1, -1, p);
    record_clear(&h);
    arb_clear(low);
    arb_clear(one);
    return ok;
}

/* euler_constant + log(u) + u h: for Ei sign = 1, h between 1 and (e^u - 1)/u; for -E1 sign = -1, h in exp(-u s), 0 <= s
 * <= 1, negated (DLMF 6.2.3, 6.2.7: Ein(z) = z times the mean of exp(-r s z) over r, s in (0, 1)). */
static bool integral_small(growth_record *out, const growth_record *u, slong sign, const growth_place *p)
{
    growth_record t, w;
    acb_t star;
    fmpq_t zero;
    record_init(&t);
    record_init(&w);
    acb_init(star);
    fmpq_init(zero);
    bool ok = record_star(star, u, p);
    if (ok) {
        acb_mul_si(star, star, sign, p->prec);
        acb_exp(star, star, p->prec);
        acb_mul_si(star, star, sign, p->prec);
        ok = record_near(&t, zero, u, star, p) && record_log(&w, u, p) && record_add(&t, &t, &w, p);
    }
    if (ok) {
        arb_const_euler(acb_realref(star), p->prec);
        arb_zero(acb_imagref(star));
        record_set_ball(&w, star);
        ok = record_add(out, &t, &w, p);
    }
    record_clear(&t);
    record_clear(&w);
    acb_clear(star);
    fmpq_clear(zero);
    return ok;
}

bool growth_e1(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record inverse;
    arb_t edge;
    record_init(&inverse);
    arb_init(edge);
    bool ok = false;
    if (grows(&inverse, edge, u, p))
        ok = e1_large(out, u, &inverse, edge, p);
    else if (falls(edge, u, p))
        ok = integral_small(out, u, -1, p) && record_scale(out, out, -1, p);
    record_clear(&inverse);
    arb_clear(edge);
    return ok;
}

/* u -> +inf: Ei(u) = e^u/u * (1 + r), |r| <= (1 + chi(2))/u = 3/u (DLMF 6.12.2 cut after its first term). */
bool growth_ei(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record inverse, minus;
    arb_t edge;
    record_init(&inverse);
    record_init(&minus);
    arb_init(edge);
    bool ok = false;
    if (grows(&inverse, edge, u, p)) {
        growth_record h;
        arb_t r, one;
        record_init(&h);
        arb_init(r);
        arb_init(one);
        arb_one(one);
        arb_ui_div(r, 3, edge, p->prec);
        arb_add_error(one, r);
        record_set_arb(&h, one);
        ok = record_mul(&h, &h, &inverse, p) && head(out, &h, u, 0, 1, 1, p);
        record_clear(&h);
        arb_clear(r);
        arb_clear(one);
    } else if (falls(edge, u, p)) {
        ok = integral_small(out, u, 1, p);
    } else if (record_scale(&minus, u, -1, p) && grows(&inverse, edge, &minus, p)) { /* Ei(-x) = -E1(x), DLMF 6.2.6 */
        ok = e1_large(out, &minus, &inverse, edge, p) && record_scale(out, out, -1, p);
    }
    record_clear(&inverse);
    record_clear(&minus);
    arb_clear(edge);
    return ok;
}

/* ---- Gamma and its kin ---- */

/* c/u + f(1 + u) for u -> 0, f by its ball (DLMF 5.5.2, and 5.5.1 with the product in place of the sum). */
static bool one_above(growth_record *out, const growth_record *u, void (*f)(acb_t, const acb_t, slong),
                      const growth_place *p)
{
    acb_t v;
    acb_init(v);
    bool ok = record_decays(u) && record_ball(v, u, p);
    if (ok) {
        acb_add_ui(v, v, 1, p->prec);
        ok = arb_is_positive(acb_realref(v));
        f(v, v, p->prec);
        record_set_ball(out, v);
        ok = ok && acb_is_finite(v);
    }
    acb_clear(v);
    return ok;
}

/* lnGamma(u) = (u - 1/2) log u - u + log(2 pi)/2 + h/u, 0 <= h <= 1/12 (DLMF 5.11.1, 5.11(ii)). */
static bool lngamma_large(growth_record *out, const growth_record *u, const growth_record *inverse,
                          const growth_place *p)
{
    growth_record sum, t, w;
    arb_t c, zero;
    fmpq_t half;
    record_init(&sum);
    record_init(&t);
    record_init(&w);
    arb_init(c);
    arb_init(zero);
    fmpq_init(half);
    fmpq_set_si(half, -1, 2);
    record_set_fmpq(&t, half);
    bool ok = record_add(&t, u, &t, p) && record_log(&w, u, p) && record_mul(&sum, &t, &w, p) &&
              record_scale(&t, u, -1, p) && record_add(&sum, &sum, &t, p);
    arb_const_pi(c, p->prec);
    arb_mul_2exp_si(c, c, 1);
    arb_log(c, c, p->prec);
    arb_mul_2exp_si(c, c, -1);
    record_set_arb(&t, c);
    ok = ok && record_add(&sum, &sum, &t, p);
    arb_one(c);
    arb_div_ui(c, c, 12, p->prec);
    ok = ok && record_set_between(&t, zero, c, p) && record_mul(&t, &t, inverse, p) && record_add(out, &sum, &t, p);
    record_clear(&sum);
    record_clear(&t);
    record_clear(&w);
    arb_clear(c);
    arb_clear(zero);
    fmpq_clear(half);
    return ok;
}

bool growth_lngamma(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record t;
    arb_t edge;
    record_init(&t);
    arb_init(edge);
    bool ok = false;
    if (grows(&t, edge, u, p)) {
        ok = lngamma_large(out, u, &t, p);
    } else if (falls(edge, u, p)) {
        growth_record w;
        record_init(&w);
        ok = one_above(&t, u, acb_lgamma, p) && record_log(&w, u, p) && record_scale(&w, &w, -1, p) &&
             record_add(out, &t, &w, p);
        record_clear(&w);
    }
    record_clear(&t);
    arb_clear(edge);
    return ok;
}

bool growth_gamma(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record t;
    arb_t edge;
    record_init(&t);
    arb_init(edge);
    bool ok = false;
    if (grows(&t, edge, u, p))
        ok = lngamma_large(&t, u, &t, p) && record_exp(out, &t, p);
    else if (one_above(&t, u, acb_gamma, p))
        ok = head(out, &t, u, -1, 1, 0, p);
    record_clear(&t);
    arb_clear(edge);
    return ok;
}

/* psi(u) = log u - 1/(2 u) - h/u^2, 0 <= h <= 1/12 (DLMF 5.11.2, 5.11(ii)). */
bool growth_psi(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record inverse, t, w;
    arb_t edge, c, zero;
    fmpq_t half;
    record_init(&inverse);
    record_init(&t);
    record_init(&w);
    arb_init(edge);
    arb_init(c);
    arb_init(zero);
    fmpq_init(half);
    bool ok = false;
    if (grows(&inverse, edge, u, p)) {
        fmpq_set_si(half, -1, 2);
        record_set_fmpq(&w, half);
        arb_set_si(c, -1);
        arb_div_ui(c, c, 12, p->prec);
        ok = record_set_between(&t, zero, c, p) && record_mul(&t, &t, &inverse, p) && record_add(&t, &t, &w, p) &&
             record_mul(&t, &t, &inverse, p) && record_log(&w, u, p) && record_add(out, &t, &w, p);
    } else if (one_above(&t, u, acb_digamma, p)) {
        record_set_si(&w, -1);
        ok = head(&w, &w, u, -1, 1, 0, p) && record_add(out, &t, &w, p);
    }
    record_clear(&inverse);
    record_clear(&t);
    record_clear(&w);
    arb_clear(edge);
    arb_clear(c);
    arb_clear(zero);
    fmpq_clear(half);
    return ok;
}

static void upper_gamma(arb_t out, const arb_t a, const arb_t x, slong prec)
{
    acb_t s, z;
    acb_init(s);
    acb_init(z);
    acb_set_arb(s, a);
    acb_set_arb(z, x);
    acb_hypgeom_gamma_upper(s, s, z, 0, prec);
    arb_set(out, acb_realref(s));
    acb_clear(s);
    acb_clear(z);
}

/* Gamma(a, u) e^u u^(1-a) = int_0^inf (1 + t/u)^(a-1) e^-t dt (DLMF 8.6.5) lies between 1 and its value at the least u:
 * it is monotone in u and tends to 1. */
static bool upper_gamma_large(growth_record *out, const arb_t a, const growth_record *u, const arb_t least,
                              const growth_place *p)
{
    growth_record h;
    arb_t v, w, one;
    record_init(&h);
    arb_init(v);
    arb_init(w);
    arb_init(one);
    arb_one(one);
    upper_gamma(v, a, least, p->prec);
    arb_sub(w, one, a, p->prec);
    arb_pow(w, least, w, p->prec);
    arb_mul(v, v, w, p->prec);
    arb_exp(w, least, p->prec);
    arb_mul(v, v, w, p->prec);
    arb_sub(w, a, one, p->prec);
    bool ok = record_set_between(&h, v, one, p) && real_power(&h, &h, u, w, p) && head(out, &h, u, 0, 1, -1, p);
    record_clear(&h);
    arb_clear(v);
    arb_clear(w);
    arb_clear(one);
    return ok;
}

/* a > 0: between Gamma(a) and the value at the greatest u. a < 0: u^-a Gamma(a, u) = e^-u int_0^inf e^(-u t) (1 +
 * t)^(a-1) dt (DLMF 8.6.5) falls from -1/a at 0. */
static bool upper_gamma_small(growth_record *out, const arb_t a, const growth_record *u, const arb_t greatest,
                              const growth_place *p)
{
    growth_record h;
    arb_t v, w;
    record_init(&h);
    arb_init(v);
    arb_init(w);
    bool ok = false;
    upper_gamma(v, a, greatest, p->prec);
    if (arb_is_positive(a)) {
        arb_gamma(w, a, p->prec);
        ok = record_set_between(out, v, w, p);
    } else if (arb_is_negative(a)) {
        arb_neg(w, a);
        arb_pow(w, greatest, w, p->prec);
        arb_mul(v, v, w, p->prec);
        arb_inv(w, a, p->prec);
        arb_neg(w, w);
        ok = record_set_between(&h, v, w, p) && real_power(out, &h, u, a, p);
    }
    record_clear(&h);
    arb_clear(v);
    arb_clear(w);
    return ok;
}

bool growth_gamma_upper(growth_record *out, const growth_record *args, const growth_place *p)
{
    growth_record inverse;
    arb_t a, edge;
    record_init(&inverse);
    arb_init(a);
    arb_init(edge);
    bool ok = false;
    if (parameter(a, args, p)) {
        if (grows(&inverse, edge, args + 1, p))
            ok = upper_gamma_large(out, a, args + 1, edge, p);
        else if (falls(edge, args + 1, p))
            ok = upper_gamma_small(out, a, args + 1, edge, p);
    }
    record_clear(&inverse);
    arb_clear(a);
    arb_clear(edge);
    return ok;
}

/* ---- Airy functions ---- */

/* zeta = (2/3) u^(3/2); *slope is 5/(72 zeta) at the least u: the first term that is left out below. */
static bool airy_exponent(growth_record *zeta, arb_t slope, const growth_record *u, const arb_t least,
                          const growth_place *p)
{
    growth_record t;
    fmpq_t q;
    record_init(&t);
    fmpq_init(q);
    fmpq_set_si(q, 2, 3);
    record_set_fmpq(&t, q);
    bool ok = head(zeta, &t, u, 3, 2, 0, p);
    fmpq_set_si(q, 3, 2);
    arb_set_fmpq(slope, q, p->prec);
    arb_pow(slope, least, slope, p->prec);
    arb_mul_ui(slope, slope, 48, p->prec);
    arb_ui_div(slope, 5, slope, p->prec);
    record_clear(&t);
    fmpq_clear(q);
    return ok;
}

/* out = h u^(-1/4) exp(sign zeta)/sqrt(pi) */
static bool airy_head(growth_record *out, const arb_t h, const growth_record *u, const growth_record *zeta, slong sign,
                      const growth_place *p)
{
    growth_record t;
    arb_t c;
    record_init(&t);
    arb_init(c);
    arb_const_sqrt_pi(c, p->prec);
    arb_div(c, h, c, p->prec);
    record_set_arb(&t, c);
    bool ok = head(&t, &t, u, -1, 4, 0, p) && head(out, &t, zeta, 0, 1, sign, p);
    record_clear(&t);
    arb_clear(c);
    return ok;
}

/* u -> -inf, x = -u: |Ai|, |Bi| <= (1 + 5/(72 zeta)) / (sqrt(pi) x^(1/4)) (DLMF 9.7.9, 9.7.11, each sum cut before its
 * first term: 9.7(iii)). */
static bool airy_oscillating(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record inverse, x, zeta;
    arb_t edge, slope, h;
    record_init(&inverse);
    record_init(&x);
    record_init(&zeta);
    arb_init(edge);
    arb_init(slope);
    arb_init(h);
    bool ok = record_scale(&x, u, -1, p) && grows(&inverse, edge, &x, p) && airy_exponent(&zeta, slope, &x, edge, p);
    if (ok) {
        arb_add_ui(slope, slope, 1, p->prec);
        arb_add_error(h, slope);
        ok = airy_head(out, h, &x, &zeta, 0, p);
    }
    record_clear(&inverse);
    record_clear(&x);
    record_clear(&zeta);
    arb_clear(edge);
    arb_clear(slope);
    arb_clear(h);
    return ok;
}

/* sign -1: Ai(u) = e^-zeta/(sqrt(pi) u^(1/4)) h/2, 1 - 5/(72 zeta) <= h <= 1 (DLMF 9.7.5, 9.7(iii)).
 * sign +1: Bi(u) = e^zeta/(sqrt(pi) u^(1/4)) (1 + r), |r| <= (chi(7/6) + 1) 5/(72 zeta), chi(7/6) < chi(2) = 2 (DLMF
 * 9.7.7, 9.7(iii), 9.7.1: chi increases). */
static bool airy(growth_record *out, const growth_record *u, slong sign, const growth_place *p)
{
    growth_record inverse, zeta;
    arb_t edge, slope, h;
    record_init(&inverse);
    record_init(&zeta);
    arb_init(edge);
    arb_init(slope);
    arb_init(h);
    bool ok;
    if (grows(&inverse, edge, u, p)) {
        ok = airy_exponent(&zeta, slope, u, edge, p);
        arb_one(h);
        if (sign < 0) {
            arb_sub(slope, h, slope, p->prec);
            arb_nonnegative_part(slope, slope);
            arb_union(h, slope, h, p->prec);
            arb_mul_2exp_si(h, h, -1);
        } else {
            arb_mul_ui(slope, slope, 3, p->prec);
            arb_add_error(h, slope);
        }
        ok = ok && airy_head(out, h, u, &zeta, sign, p);
    } else {
        ok = airy_oscillating(out, u, p);
    }
    record_clear(&inverse);
    record_clear(&zeta);
    arb_clear(edge);
    arb_clear(slope);
    arb_clear(h);
    return ok;
}

bool growth_ai(growth_record *out, const growth_record *u, const growth_place *p)
{
    return airy(out, u, -1, p);
}

bool growth_bi(growth_record *out, const growth_record *u, const growth_place *p)
{
    return airy(out, u, 1, p);
}

/* ---- Bessel functions ---- */

/* h u^nu with h = sum (sign u^2/4)^k/(k! Gamma(nu + k + 1)) / 2^nu by its ball (DLMF 10.2.2, 10.25.2), u -> 0. */
static bool bessel_small(growth_record *out, const arb_t nu, const growth_record *u, slong sign, const growth_place *p)
{
    growth_record h;
    acb_t z, a;
    arb_t edge, two;
    record_init(&h);
    acb_init(z);
    acb_init(a);
    arb_init(edge);
    arb_init(two);
    bool ok = falls(edge, u, p) && record_ball(z, u, p);
    if (ok) {
        acb_sqr(z, z, p->prec);
        acb_mul_2exp_si(z, z, -2);
        acb_mul_si(z, z, sign, p->prec);
        arb_add_ui(acb_realref(a), nu, 1, p->prec);
        acb_hypgeom_0f1(z, a, z, 1, p->prec);
        arb_set_ui(two, 2);
        arb_pow(two, two, nu, p->prec);
        acb_div_arb(z, z, two, p->prec);
        record_set_arb(&h, acb_realref(z));
        ok = acb_is_finite(z) && real_power(out, &h, u, nu, p);
    }
    record_clear(&h);
    acb_clear(z);
    acb_clear(a);
    arb_clear(edge);
    arb_clear(two);
    return ok;
}

/* |J|, |Y| <= m u^(-1/2), m^2 the greater of 2/pi and u (J^2 + Y^2) at the least u: u (J^2 + Y^2) is monotone, falling
 * for |nu| > 1/2, rising for |nu| < 1/2, and tends to 2/pi (Watson 1944, section 13.74). */
static bool bessel_oscillating(growth_record *out, const arb_t nu, const growth_record *u, const arb_t least,
                               const growth_place *p)
{
    growth_record h;
    acb_t j, y, order, x;
    arb_t m;
    record_init(&h);
    acb_init(j);
    acb_init(y);
    acb_init(order);
    acb_init(x);
    arb_init(m);
    acb_set_arb(order, nu);
    acb_set_arb(x, least);
    acb_hypgeom_bessel_jy(j, y, order, x, p->prec);
    arb_sqr(m, acb_realref(j), p->prec);
    arb_addmul(m, acb_realref(y), acb_realref(y), p->prec);
    arb_mul(m, m, least, p->prec);
    arb_const_pi(acb_realref(x), p->prec);
    arb_ui_div(acb_realref(x), 2, acb_realref(x), p->prec);
    arb_max(m, m, acb_realref(x), p->prec);
    arb_sqrt(m, m, p->prec);
    arb_zero(acb_realref(j));
    arb_add_error(acb_realref(j), m);
    record_set_arb(&h, acb_realref(j));
    bool ok = arb_is_finite(m) && head(out, &h, u, -1, 2, 0, p);
    record_clear(&h);
    acb_clear(j);
    acb_clear(y);
    acb_clear(order);
    acb_clear(x);
    arb_clear(m);
    return ok;
}

/* |J_nu(x)| <= 1 for real x >= 0 and nu >= 0 (DLMF 10.14.1), where nothing better is known. */
static bool bessel_j_at_most_one(growth_record *out, const arb_t nu, const growth_record *u, const growth_place *p)
{
    acb_t t;
    arb_t one;
    acb_init(t);
    arb_init(one);
    bool ok = arb_is_nonnegative(nu) && record_is_real(u) && arb_is_nonnegative(acb_realref(u->g)) &&
              !record_ball(t, u, p);
    mag_one(arb_radref(one));
    record_set_arb(out, one);
    acb_clear(t);
    arb_clear(one);
    return ok;
}

bool growth_bessel_j(growth_record *out, const growth_record *args, const growth_place *p)
{
    growth_record inverse;
    arb_t nu, edge;
    record_init(&inverse);
    arb_init(nu);
    arb_init(edge);
    bool ok = parameter(nu, args, p);
    if (ok && grows(&inverse, edge, args + 1, p))
        ok = bessel_oscillating(out, nu, args + 1, edge, p);
    else
        ok = ok && (bessel_small(out, nu, args + 1, -1, p) || bessel_j_at_most_one(out, nu, args + 1, p));
    record_clear(&inverse);
    arb_clear(nu);
    arb_clear(edge);
    return ok;
}

bool growth_bessel_y(growth_record *out, const growth_record *args, const growth_place *p)
{
    growth_record inverse;
    arb_t nu, edge;
    record_init(&inverse);
    arb_init(nu);
    arb_init(edge);
    bool ok = parameter(nu, args, p) && grows(&inverse, edge, args + 1, p) &&
              bessel_oscillating(out, nu, args + 1, edge, p);
    record_clear(&inverse);
    arb_clear(nu);
    arb_clear(edge);
    return ok;
}

/* K(nu, u) = sqrt(pi/(2 u)) e^-u (1 + r), |r| <= 2 |a_1| e^(|nu^2 - 1/4|/u)/u, a_1 = (4 nu^2 - 1)/8 (DLMF 10.40.11). */
static bool bessel_k_large(growth_record *out, const arb_t nu, const growth_record *u, const arb_t least,
                           const growth_place *p)
{
    growth_record h;
    arb_t m, r, one;
    record_init(&h);
    arb_init(m);
    arb_init(r);
    arb_init(one);
    arb_sqr(m, nu, p->prec);
    arb_mul_2exp_si(m, m, 2);
    arb_sub_ui(m, m, 1, p->prec);
    arb_abs(m, m);
    arb_mul_2exp_si(m, m, -2); /* |nu^2 - 1/4| = 2 |a_1| */
    arb_div(m, m, least, p->prec);
    arb_exp(r, m, p->prec);
    arb_mul(r, r, m, p->prec);
    arb_one(one);
    arb_add_error(one, r);
    arb_nonnegative_part(one, one);
    arb_const_pi(m, p->prec);
    arb_mul_2exp_si(m, m, -1);
    arb_sqrt(m, m, p->prec);
    arb_mul(one, one, m, p->prec);
    record_set_arb(&h, one);
    bool ok = arb_is_finite(one) && head(out, &h, u, -1, 2, -1, p);
    record_clear(&h);
    arb_clear(m);
    arb_clear(r);
    arb_clear(one);
    return ok;
}

static void bessel_k_value(arb_t out, const arb_t nu, const arb_t x, slong prec)
{
    acb_t a, z;
    acb_init(a);
    acb_init(z);
    acb_set_arb(a, nu);
    acb_set_arb(z, x);
    acb_hypgeom_bessel_k(z, a, z, prec);
    arb_set(out, acb_realref(z));
    acb_clear(a);
    acb_clear(z);
}

/* u -> 0, nu >= 0: u^nu K(nu, u) falls (DLMF 10.29.4) from 2^(nu-1) Gamma(nu) (DLMF 10.30.2); K(0, u) + log u rises
 * from log 2 - euler_constant (DLMF 10.31.2), as u K(1, u) falls from 1. */
static bool bessel_k_small(growth_record *out, const arb_t nu, const growth_record *u, const arb_t greatest,
                           const growth_place *p)
{
    growth_record h;
    arb_t v, w;
    record_init(&h);
    arb_init(v);
    arb_init(w);
    bool ok = false;
    bessel_k_value(v, nu, greatest, p->prec);
    if (arb_is_zero(nu)) {
        arb_log(w, greatest, p->prec);
        arb_add(v, v, w, p->prec);
        arb_const_log2(w, p->prec);
        growth_record t;
        record_init(&t);
        arb_t euler;
        arb_init(euler);
        arb_const_euler(euler, p->prec);
        arb_sub(w, w, euler, p->prec);
        ok = record_set_between(&h, v, w, p) && record_log(&t, u, p) && record_scale(&t, &t, -1, p) &&
             record_add(out, &h, &t, p);
        arb_clear(euler);
        record_clear(&t);
    } else if (arb_is_positive(nu)) {
        arb_pow(w, greatest, nu, p->prec);
        arb_mul(v, v, w, p->prec);
        arb_gamma(w, nu, p->prec);
        arb_mul_2exp_si(w, w, -1);
        arb_t two;
        arb_init(two);
        arb_set_ui(two, 2);
        arb_pow(two, two, nu, p->prec);
        arb_mul(w, w, two, p->prec);
        arb_neg(two, nu);
        ok = record_set_between(&h, v, w, p) && real_power(out, &h, u, two, p);
        arb_clear(two);
    }
    record_clear(&h);
    arb_clear(v);
    arb_clear(w);
    return ok;
}

bool growth_bessel_k(growth_record *out, const growth_record *args, const growth_place *p)
{
    growth_record inverse;
    arb_t nu, edge;
    record_init(&inverse);
    arb_init(nu);
    arb_init(edge);
    bool ok = parameter(nu, args, p);
    arb_abs(nu, nu); /* K is even in its order: DLMF 10.27.3 */
    if (ok && grows(&inverse, edge, args + 1, p))
        ok = bessel_k_large(out, nu, args + 1, edge, p);
    else
        ok = ok && falls(edge, args + 1, p) && bessel_k_small(out, nu, args + 1, edge, p);
    record_clear(&inverse);
    arb_clear(nu);
    arb_clear(edge);
    return ok;
}

/* nu >= 0: 1 = u (I(nu) K(nu + 1) + I(nu + 1) K(nu)) (DLMF 10.28.2), where both products are positive and the second is
 * the smaller one (DLMF 10.37); so I = h/(u K(nu + 1, u)), 1/2 <= h <= 1. */
bool growth_bessel_i(growth_record *out, const growth_record *args, const growth_place *p)
{
    growth_record inverse, k;
    arb_t nu, edge, one;
    record_init(&inverse);
    record_init(&k);
    arb_init(nu);
    arb_init(edge);
    arb_init(one);
    bool ok = parameter(nu, args, p);
    if (ok && arb_is_nonnegative(nu) && grows(&inverse, edge, args + 1, p)) {
        arb_add_ui(nu, nu, 1, p->prec);
        arb_one(one);
        arb_mul_2exp_si(one, one, -1);
        ok = bessel_k_large(&k, nu, args + 1, edge, p) && record_mul(&k, &k, args + 1, p);
        arb_one(nu);
        growth_record h;
        record_init(&h);
        ok = ok && record_set_between(&h, one, nu, p) && head(out, &h, &k, -1, 1, 0, p);
        record_clear(&h);
    } else {
        ok = ok && bessel_small(out, nu, args + 1, 1, p);
    }
    record_clear(&inverse);
    record_clear(&k);
    arb_clear(nu);
    arb_clear(edge);
    arb_clear(one);
    return ok;
}
