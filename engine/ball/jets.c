/* The functions of the table as power series: f(u(y)) modulo y^len, u given by its ball coefficients. Where Arb has
 * the series it is used; else f(u) = f(u_0) + int f'(u) u' dy (elementary inverses, exponential integrals), or the
 * function's differential equation gives its Taylor coefficients at u_0 (Bessel functions, DLMF 10.2.1, 10.25.1).
 * Non-finite where f is not analytic at the whole ball u_0. */
#include "engine/ball/functions.h"

#include "engine/ball/interval.h"

static acb_srcptr term_at(const acb_poly_struct *u, slong k)
{
    static const acb_struct zero; /* all bits 0 is the exact 0 */
    return k < u->length ? u->coeffs + k : &zero;
}

void jet_unknown(acb_poly_t out, slong len)
{
    acb_poly_fit_length(out, len);
    for (slong k = 0; k < len; k++) acb_indeterminate(out->coeffs + k);
    _acb_poly_set_length(out, len);
}

#define SERIES(name, call)                                                                                            \
    static void jet_##name(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len,         \
                           slong prec)                                                                                \
    {                                                                                                                 \
        (void)n, (void)m;                                                                                             \
        call(out, a[0], len, prec);                                                                                   \
    }

static void erfc_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    acb_t c;
    acb_init(c);
    acb_hypgeom_erfc(c, term_at(u, 0), prec);
    acb_hypgeom_erf_series(out, u, len, prec);
    acb_poly_neg(out, out);
    acb_poly_set_coeff_acb(out, 0, c); /* erfc itself: 1 - erf would cancel */
    acb_clear(c);
}

static void tanh_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    acb_poly_t c;
    acb_poly_init(c);
    acb_poly_sinh_cosh_series(out, c, u, len, prec);
    acb_poly_div_series(out, out, c, len, prec);
    acb_poly_clear(c);
    acb_t t;
    acb_init(t);
    acb_tanh(t, term_at(u, 0), prec);
    acb_poly_set_coeff_acb(out, 0, t);
    acb_clear(t);
}

static void log_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    if (ball_meets_cut(term_at(u, 0))) jet_unknown(out, len);
    else acb_poly_log_series(out, u, len, prec);
}

static void lngamma_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    if (ball_meets_cut(term_at(u, 0))) jet_unknown(out, len);
    else acb_poly_lgamma_series(out, u, len, prec);
}

static void zeta_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    acb_t one;
    acb_init(one);
    acb_one(one);
    acb_poly_zeta_series(out, u, one, 0, len, prec);
    acb_clear(one);
}

static void ai_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    acb_hypgeom_airy_series(out, NULL, NULL, NULL, u, len, prec);
}

static void bi_series(acb_poly_t out, const acb_poly_t u, slong len, slong prec)
{
    acb_hypgeom_airy_series(NULL, NULL, out, NULL, u, len, prec);
}

SERIES(exp, acb_poly_exp_series)
SERIES(log, log_series)
SERIES(sin, acb_poly_sin_series)
SERIES(cos, acb_poly_cos_series)
SERIES(tan, acb_poly_tan_series)
SERIES(sinh, acb_poly_sinh_series)
SERIES(cosh, acb_poly_cosh_series)
SERIES(tanh, tanh_series)
SERIES(erf, acb_hypgeom_erf_series)
SERIES(erfc, erfc_series)
SERIES(gamma, acb_poly_gamma_series)
SERIES(lngamma, lngamma_series)
SERIES(psi, acb_poly_digamma_series)
SERIES(zeta, zeta_series)
SERIES(ai, ai_series)
SERIES(bi, bi_series)

/* out = f(u_0) + int slope(u) u' dy, the value f(u_0) from the ball function (which knows the cuts). */
static void by_slope(acb_poly_t out, const acb_poly_struct *const *a, size_t n, size_t which, function_id f,
                     const acb_poly_t slope, slong len, slong prec)
{
    acb_srcptr at[2] = {NULL, NULL};
    for (size_t k = 0; k < n; k++) at[k] = term_at(a[k], 0);
    acb_t value;
    acb_init(value);
    ball_function_of(f)(value, at, n, (ball_mode){.analytic = true, .real_args = true}, prec);
    acb_poly_t d;
    acb_poly_init(d);
    if (!acb_is_finite(value)) {
        jet_unknown(out, len);
    } else {
        acb_poly_derivative(d, a[which], prec);
        acb_poly_mullow(d, d, slope, len - 1 > 0 ? len - 1 : 1, prec);
        acb_poly_integral(d, d, prec);
        acb_poly_truncate(d, len);
        acb_poly_set_coeff_acb(d, 0, value);
        acb_poly_set(out, d);
    }
    acb_poly_clear(d);
    acb_clear(value);
}

/* slope = sign * (c + k u^2)^power for the inverse functions (DLMF 4.24, 4.40). */
static void inverse_function(acb_poly_t out, const acb_poly_struct *const *a, function_id f, int sign, int k, int c,
                             int half, slong len, slong prec)
{
    acb_poly_t s;
    acb_poly_init(s);
    acb_poly_mullow(s, a[0], a[0], len, prec);
    if (k < 0) acb_poly_neg(s, s);
    acb_t t;
    acb_init(t);
    acb_poly_get_coeff_acb(t, s, 0);
    acb_add_si(t, t, c, prec);
    acb_poly_set_coeff_acb(s, 0, t);
    if (acb_contains_zero(t)) {
        jet_unknown(out, len);
    } else {
        if (half) acb_poly_rsqrt_series(s, s, len, prec);
        else acb_poly_inv_series(s, s, len, prec);
        if (sign < 0) acb_poly_neg(s, s);
        by_slope(out, a, 1, 0, f, s, len, prec);
    }
    acb_clear(t);
    acb_poly_clear(s);
}

#define INVERSE(name, id, sign, k, c, half)                                                                           \
    static void jet_##name(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len,         \
                           slong prec)                                                                                \
    {                                                                                                                 \
        (void)n, (void)m;                                                                                             \
        inverse_function(out, a, FUNCTION_##id, sign, k, c, half, len, prec);                                         \
    }

INVERSE(asin, ASIN, 1, -1, 1, 1)
INVERSE(acos, ACOS, -1, -1, 1, 1)
INVERSE(atan, ATAN, 1, 1, 1, 0)
INVERSE(asinh, ASINH, 1, 1, 1, 1)
INVERSE(atanh, ATANH, 1, -1, 1, 0)

/* acosh' = 1/(sqrt(u - 1) sqrt(u + 1)): both roots, so that the principal branch holds off (-inf, 1]. */
static void jet_acosh(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)m;
    acb_poly_t s, r;
    acb_poly_init(s);
    acb_poly_init(r);
    acb_poly_set(s, a[0]);
    acb_poly_set(r, a[0]);
    acb_t t;
    acb_init(t);
    acb_sub_ui(t, term_at(a[0], 0), 1, prec);
    acb_poly_set_coeff_acb(s, 0, t);
    bool bad = ball_meets_cut(t);
    acb_add_ui(t, term_at(a[0], 0), 1, prec);
    acb_poly_set_coeff_acb(r, 0, t);
    if (bad) {
        jet_unknown(out, len);
    } else {
        acb_poly_rsqrt_series(s, s, len, prec);
        acb_poly_rsqrt_series(r, r, len, prec);
        acb_poly_mullow(s, s, r, len, prec);
        by_slope(out, a, 1, 0, FUNCTION_ACOSH, s, len, prec);
    }
    acb_clear(t);
    acb_poly_clear(s);
    acb_poly_clear(r);
}

/* E1' = -exp(-u)/u, Ei' = exp(u)/u (DLMF 6.2.1, 6.2.5); Gamma(a, u)' = -u^(a-1) exp(-u) (DLMF 8.8.13). */
static void exponential_slope(acb_poly_t s, const acb_poly_t u, const acb_t power, int sign, slong len, slong prec)
{
    acb_poly_t p;
    acb_poly_init(p);
    acb_poly_pow_acb_series(p, u, power, len, prec);
    if (sign < 0) acb_poly_neg(s, u);
    else acb_poly_set(s, u);
    acb_poly_exp_series(s, s, len, prec);
    acb_poly_mullow(s, s, p, len, prec);
    if (sign < 0) acb_poly_neg(s, s);
    acb_poly_clear(p);
}

static void jet_exponential_integral(acb_poly_t out, const acb_poly_struct *const *a, function_id f, int sign,
                                     slong len, slong prec)
{
    acb_poly_t s;
    acb_t power;
    acb_poly_init(s);
    acb_init(power);
    acb_set_si(power, -1);
    if (ball_meets_cut(term_at(a[0], 0))) {
        jet_unknown(out, len);
    } else {
        exponential_slope(s, a[0], power, sign, len, prec);
        by_slope(out, a, 1, 0, f, s, len, prec);
    }
    acb_clear(power);
    acb_poly_clear(s);
}

static void jet_e1(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)m;
    jet_exponential_integral(out, a, FUNCTION_E1, -1, len, prec);
}

static void jet_ei(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)m;
    jet_exponential_integral(out, a, FUNCTION_EI, 1, len, prec);
}

static void jet_gamma_upper(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len,
                            slong prec)
{
    (void)m;
    if (a[0]->length > 1 || ball_meets_cut(term_at(a[1], 0))) {
        jet_unknown(out, len);
        return;
    }
    acb_poly_t s;
    acb_t power;
    acb_poly_init(s);
    acb_init(power);
    acb_sub_ui(power, term_at(a[0], 0), 1, prec);
    exponential_slope(s, a[1], power, -1, len, prec);
    by_slope(out, a, n, 1, FUNCTION_GAMMA_UPPER, s, len, prec);
    acb_clear(power);
    acb_poly_clear(s);
}

/* f(u) from f's Taylor coefficients c at u_0. */
static void compose_at(acb_poly_t out, const acb_poly_t c, const acb_poly_struct *u, slong len, slong prec)
{
    acb_poly_t v;
    acb_poly_init(v);
    acb_poly_set(v, u);
    acb_poly_truncate(v, len);
    if (v->length) acb_zero(v->coeffs);
    _acb_poly_normalise(v);
    acb_poly_compose_series(out, c, v, len, prec);
    acb_poly_clear(v);
}

static void jet_polygamma(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)m;
    if (a[0]->length > 1 || !acb_is_int(term_at(a[0], 0)) || arb_is_negative(acb_realref(term_at(a[0], 0)))) {
        jet_unknown(out, len);
        return;
    }
    acb_poly_t c;
    acb_t order, value;
    acb_poly_init(c);
    acb_init(order);
    acb_init(value);
    for (slong k = 0; k < len; k++) { /* polygamma(n, z)' = polygamma(n + 1, z), DLMF 5.15 */
        acb_add_ui(order, term_at(a[0], 0), (ulong)k, prec);
        acb_polygamma(value, order, term_at(a[1], 0), prec);
        arb_t f;
        arb_init(f);
        arb_fac_ui(f, (ulong)k, prec);
        acb_div_arb(value, value, f, prec);
        arb_clear(f);
        acb_poly_set_coeff_acb(c, k, value);
    }
    compose_at(out, c, a[1], len, prec);
    acb_clear(order);
    acb_clear(value);
    acb_poly_clear(c);
}

static void jet_beta(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)m;
    acb_poly_t s, g;
    acb_poly_init(s);
    acb_poly_init(g);
    acb_poly_add(s, a[0], a[1], prec);
    acb_poly_rgamma_series(s, s, len, prec);
    for (int k = 0; k < 2; k++) {
        acb_poly_gamma_series(g, a[k], len, prec);
        acb_poly_mullow(s, s, g, len, prec);
    }
    acb_poly_set(out, s);
    acb_poly_clear(s);
    acb_poly_clear(g);
}

/* z^2 w'' + z w' + (sign z^2 - nu^2) w = 0: Taylor coefficients at z_0 from the first two (DLMF 10.2.1, 10.25.1). */
static void bessel_taylor(acb_poly_t c, const acb_t nu, const acb_t z, const acb_t w0, const acb_t w1, int sign,
                          slong len, slong prec)
{
    acb_t sum, t, z2, nu2;
    acb_init(sum);
    acb_init(t);
    acb_init(z2);
    acb_init(nu2);
    acb_mul(z2, z, z, prec);
    acb_mul(nu2, nu, nu, prec);
    acb_poly_fit_length(c, len < 2 ? 2 : len);
    acb_set(c->coeffs, w0);
    acb_set(c->coeffs + 1, w1);
    for (slong k = 0; k + 2 < len; k++) {
        acb_mul_si(t, z, (2 * k + 1) * (k + 1), prec);
        acb_mul(sum, t, c->coeffs + k + 1, prec);
        if (sign > 0) acb_sub(t, z2, nu2, prec);
        else acb_add(t, z2, nu2, prec), acb_neg(t, t);
        acb_add_si(t, t, k * k, prec);
        acb_addmul(sum, t, c->coeffs + k, prec);
        if (k >= 1) {
            acb_mul_2exp_si(t, z, 1);
            acb_mul(t, t, c->coeffs + k - 1, prec);
            if (k >= 2) acb_add(t, t, c->coeffs + k - 2, prec);
            if (sign > 0) acb_add(sum, sum, t, prec);
            else acb_sub(sum, sum, t, prec);
        }
        acb_mul_si(t, z2, (k + 1) * (k + 2), prec);
        acb_div(sum, sum, t, prec);
        acb_neg(c->coeffs + k + 2, sum);
    }
    _acb_poly_set_length(c, len < 2 ? 2 : len);
    acb_poly_truncate(c, len);
    acb_clear(sum);
    acb_clear(t);
    acb_clear(z2);
    acb_clear(nu2);
}

/* J and I of whole order n are entire in z: the kth derivative is 2^-k sum_j sign^j binomial(k, j) w(n - k + 2j),
 * sign -1 for J and +1 for I (DLMF 10.6.7, 10.29.5). Serves where z may be 0 or lie on the cut of the general order. */
__attribute__((noinline)) /* inlined after acb_is_int(n), gcc 12 mistakes n's size (-Wstringop-overread) */
static void bessel_whole_order(acb_poly_t c, const acb_t n, const acb_t z,
                               void (*call)(acb_t, const acb_t, const acb_t, slong), int sign, slong len, slong prec)
{
    const slong count = 2 * len - 1;
    acb_ptr w = _acb_vec_init(count); /* w[j]: order n - len + 1 + j */
    acb_t order, sum, term;
    acb_init(order);
    acb_init(sum);
    acb_init(term);
    acb_set(order, n);
    acb_sub_ui(order, order, (ulong)len - 1, prec);
    for (slong j = 0; j < count; j++) {
        call(w + j, order, z, prec);
        acb_add_ui(order, order, 1, prec);
    }
    fmpz_t binomial, factorial;
    fmpz_init(binomial);
    fmpz_init(factorial);
    fmpz_one(factorial);
    acb_poly_zero(c);
    for (slong k = 0; k < len; k++) {
        acb_zero(sum);
        for (slong j = 0; j <= k; j++) {
            fmpz_bin_uiui(binomial, (ulong)k, (ulong)j);
            acb_mul_fmpz(term, w + (len - 1 - k + 2 * j), binomial, prec);
            if (sign > 0 && j % 2) acb_sub(sum, sum, term, prec);
            else acb_add(sum, sum, term, prec);
        }
        if (k) fmpz_mul_ui(factorial, factorial, (ulong)k);
        acb_mul_2exp_si(sum, sum, -k);
        acb_div_fmpz(sum, sum, factorial, prec);
        acb_poly_set_coeff_acb(c, k, sum);
    }
    fmpz_clear(binomial);
    fmpz_clear(factorial);
    acb_clear(order);
    acb_clear(sum);
    acb_clear(term);
    _acb_vec_clear(w, count);
}

typedef void (*bessel_call)(acb_t out, const acb_t nu, const acb_t z, slong prec);

/* sign: +1 for J and Y, -1 for I and K.  w' = next*w(nu + 1) + (nu/z) w(nu), next = -1 for J, Y, K and +1 for I (DLMF
 * 10.6.2, 10.29.2). */
static void bessel_jet(acb_poly_t out, const acb_poly_struct *const *a, bessel_call call, int sign, int next, slong len,
                       slong prec)
{
    acb_srcptr nu = term_at(a[0], 0), z = term_at(a[1], 0);
    if (a[0]->length <= 1 && acb_is_int(nu) && sign == -next && ball_meets_cut(z)) { /* J and I */
        acb_poly_t w;
        acb_poly_init(w);
        bessel_whole_order(w, nu, z, call, sign, len, prec);
        compose_at(out, w, a[1], len, prec);
        acb_poly_clear(w);
        return;
    }
    if (a[0]->length > 1 || acb_contains_zero(z) || ball_meets_cut(z)) {
        jet_unknown(out, len);
        return;
    }
    acb_t w0, w1, t;
    acb_init(w0);
    acb_init(w1);
    acb_init(t);
    call(w0, nu, z, prec);
    acb_add_ui(t, nu, 1, prec);
    call(w1, t, z, prec);
    if (next < 0) acb_neg(w1, w1);
    acb_div(t, nu, z, prec);
    acb_addmul(w1, t, w0, prec);
    if (acb_is_real(nu) && acb_is_real(z)) {
        arb_zero(acb_imagref(w0));
        arb_zero(acb_imagref(w1));
    }
    acb_poly_t c;
    acb_poly_init(c);
    bessel_taylor(c, nu, z, w0, w1, sign, len, prec);
    compose_at(out, c, a[1], len, prec);
    acb_poly_clear(c);
    acb_clear(w0);
    acb_clear(w1);
    acb_clear(t);
}

#define BESSEL(name, call, sign, next)                                                                                \
    static void jet_##name(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len,         \
                           slong prec)                                                                                \
    {                                                                                                                 \
        (void)n, (void)m;                                                                                             \
        bessel_jet(out, a, call, sign, next, len, prec);                                                              \
    }

BESSEL(bessel_j, acb_hypgeom_bessel_j, 1, -1)
BESSEL(bessel_y, acb_hypgeom_bessel_y, 1, -1)
BESSEL(bessel_i, acb_hypgeom_bessel_i, -1, 1)
BESSEL(bessel_k, acb_hypgeom_bessel_k, -1, -1)

/* ---- functions of the real line ---- */

/* +1, -1 by the real part of the constant term, 0 when it may vanish. */
static int side(const acb_poly_struct *u)
{
    acb_srcptr c = term_at(u, 0);
    return arb_is_positive(acb_realref(c)) ? 1 : arb_is_negative(acb_realref(c)) ? -1 : 0;
}

static void jet_abs(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)prec;
    int s = m.real_args ? side(a[0]) : 0;
    if (s > 0) acb_poly_set(out, a[0]);
    else if (s < 0) acb_poly_neg(out, a[0]);
    else jet_unknown(out, len);
}

static void jet_sign(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)prec;
    int s = m.real_args ? side(a[0]) : 0;
    if (s == 0) {
        jet_unknown(out, len);
        return;
    }
    acb_poly_zero(out);
    acb_poly_set_coeff_si(out, 0, s);
}

static void jet_extreme(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec,
                        int want)
{
    size_t best = 0;
    bool sure = m.real_args;
    acb_poly_t d;
    acb_poly_init(d);
    for (size_t k = 1; k < n && sure; k++) {
        acb_poly_sub(d, a[k], a[best], prec);
        int s = side(d);
        sure = s != 0;
        if (s == want) best = k;
    }
    if (sure) acb_poly_set(out, a[best]);
    else jet_unknown(out, len);
    acb_poly_clear(d);
}

static void jet_min(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    jet_extreme(out, a, n, m, len, prec, -1);
}

static void jet_max(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    jet_extreme(out, a, n, m, len, prec, 1);
}

static void jet_re(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n, (void)prec;
    if (m.real_args) acb_poly_set(out, a[0]);
    else jet_unknown(out, len);
}

#define jet_conj jet_re

static void jet_im(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)a, (void)n, (void)prec;
    if (m.real_args) acb_poly_zero(out);
    else jet_unknown(out, len);
}

static void jet_arg(acb_poly_t out, const acb_poly_struct *const *a, size_t n, ball_mode m, slong len, slong prec)
{
    (void)n;
    int s = m.real_args ? side(a[0]) : 0;
    acb_poly_zero(out);
    if (s == 0) {
        jet_unknown(out, len);
    } else if (s < 0) {
        acb_poly_fit_length(out, 1);
        acb_const_pi(out->coeffs, prec);
        _acb_poly_set_length(out, 1);
    }
}

/* ---- powers ---- */

void jet_power(acb_poly_t out, const acb_poly_t base, const acb_poly_t exponent, slong len, slong prec)
{
    acb_srcptr b = term_at(base, 0), e = term_at(exponent, 0);
    if (exponent->length <= 1 && acb_is_int(e) && arf_cmpabs_2exp_si(arb_midref(acb_realref(e)), 40) < 0) {
        slong n = arf_get_si(arb_midref(acb_realref(e)), ARF_RND_DOWN);
        acb_poly_t p;
        acb_poly_init(p);
        if (n < 0 && acb_contains_zero(b)) {
            jet_unknown(out, len);
        } else if (acb_contains_zero(b) || (n >= -64 && n <= 64)) {
            acb_poly_pow_ui_trunc_binexp(p, base, (ulong)(n < 0 ? -n : n), len, prec);
            if (n < 0) acb_poly_inv_series(p, p, len, prec);
            acb_poly_set(out, p);
        } else {
            acb_poly_pow_acb_series(out, base, e, len, prec);
        }
        acb_poly_clear(p);
    } else if (ball_meets_cut(b)) {
        jet_unknown(out, len);
    } else if (exponent->length <= 1) {
        acb_poly_pow_acb_series(out, base, e, len, prec);
    } else {
        acb_poly_t l;
        acb_poly_init(l);
        acb_poly_log_series(l, base, len, prec);
        acb_poly_mullow(l, l, exponent, len, prec);
        acb_poly_exp_series(out, l, len, prec);
        acb_poly_clear(l);
    }
}

/* (u0 + u1 y)^e with sharp powers of a wide real u0 > 0: the coefficients are binomial(e, k) u1^k u0^(e - k). */
static void power_of_wide_line(acb_poly_t out, const acb_poly_t base, const fmpq_t exponent, slong len, slong prec)
{
    fmpq_t e, factor;
    acb_t c, slope, u0;
    fmpq_init(e);
    fmpq_init(factor);
    acb_init(c);
    acb_init(slope);
    acb_init(u0);
    acb_set(u0, term_at(base, 0));
    acb_set(slope, term_at(base, 1));
    fmpq_set(e, exponent);
    fmpq_one(factor);
    acb_poly_zero(out);
    for (slong k = 0; k < len && !fmpq_is_zero(factor); k++) {
        arb_t f;
        arb_init(f);
        arb_set_fmpq(f, factor, prec);
        ball_power_rational(c, u0, e, true, prec);
        if (fmpq_is_zero(e)) acb_one(c);
        acb_mul_arb(c, c, f, prec);
        arb_clear(f);
        acb_t p;
        acb_init(p);
        acb_pow_ui(p, slope, (ulong)k, prec);
        ball_mul(c, c, p, prec);
        acb_clear(p);
        acb_poly_set_coeff_acb(out, k, c);
        fmpq_mul(factor, factor, e);
        fmpq_div_fmpz(factor, factor, (fmpz[]){k + 1});
        fmpq_sub_si(e, e, 1);
    }
    fmpq_clear(e);
    fmpq_clear(factor);
    acb_clear(c);
    acb_clear(slope);
    acb_clear(u0);
}

enum { WIDE_LENGTH = 6 }; /* longer series on wide balls are not asked for their sharpness */

void jet_power_rational(acb_poly_t out, const acb_poly_t base, const fmpq_t exponent, slong len, slong prec)
{
    acb_srcptr u0 = term_at(base, 0);
    const bool whole = fmpz_is_one(fmpq_denref(exponent));
    if (len <= WIDE_LENGTH && base->length <= 2 && ball_is_wide(u0) &&
        (whole ? fmpq_sgn(exponent) > 0 || !acb_contains_zero(u0) : arb_is_positive(acb_realref(u0)))) {
        power_of_wide_line(out, base, exponent, len, prec);
        return;
    }
    acb_poly_t e;
    acb_poly_init2(e, 1);
    arb_set_fmpq(acb_realref(e->coeffs), exponent, prec);
    _acb_poly_set_length(e, 1);
    jet_power(out, base, e, len, prec);
    acb_poly_clear(e);
}

void jet_mul(acb_poly_t out, const acb_poly_t a, const acb_poly_t b, slong len, slong prec)
{
    if (len > WIDE_LENGTH || !(ball_is_wide(term_at(a, 0)) || ball_is_wide(term_at(b, 0)))) {
        acb_poly_mullow(out, a, b, len, prec);
        return;
    }
    acb_poly_t p;
    acb_t sum, term;
    acb_poly_init(p);
    acb_init(sum);
    acb_init(term);
    for (slong k = 0; k < len; k++) {
        acb_zero(sum);
        for (slong j = 0; j <= k; j++) {
            ball_mul(term, term_at(a, j), term_at(b, k - j), prec);
            acb_add(sum, sum, term, prec);
        }
        acb_poly_set_coeff_acb(p, k, sum);
    }
    acb_poly_swap(out, p);
    acb_poly_clear(p);
    acb_clear(sum);
    acb_clear(term);
}

static const jet_function table[] = {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) jet_##jet,
#include "engine/expr/functions.def"
#undef FUNCTION
};

jet_function jet_function_of(function_id f)
{
    return table[f];
}
