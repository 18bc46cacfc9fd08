/* The functions of the table on complex balls: each value encloses, or is non-finite. Real arguments give real
 * results wherever the function is real there, which keeps radii and types honest further up. The table at the end
 * takes its columns from functions.def. */
#include "engine/ball/functions.h"

#include "engine/ball/interval.h"

bool ball_meets_cut(const acb_t z)
{
    return arb_contains_zero(acb_imagref(z)) && !arb_is_positive(acb_realref(z));
}

static bool meets_outer_cuts(const acb_t z) /* (-inf, -1] and [1, inf) */
{
    if (!arb_contains_zero(acb_imagref(z))) return false;
    arb_t a;
    arb_init(a);
    arb_abs(a, acb_realref(z));
    arb_sub_ui(a, a, 1, 64);
    bool inside = arb_is_negative(a);
    arb_clear(a);
    return !inside;
}

static bool meets_imaginary_cuts(const acb_t z) /* i[1, inf) and -i[1, inf) */
{
    acb_t w;
    acb_init(w);
    acb_mul_onei(w, z);
    bool meets = meets_outer_cuts(w);
    acb_clear(w);
    return meets;
}

/* Functions that one call of Arb serves. */
#define ENTIRE(name, call)                                                                                            \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n, (void)m;                                                                                             \
        call(out, a[0], prec);                                                                                        \
    }
/* The same for a function that is monotone on the real line: wide real balls by their ends. */
#define MONOTONE(name, call, real_function)                                                                           \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n, (void)m;                                                                                             \
        if (ball_is_wide(a[0])) ball_monotone(out, a[0], real_function, prec);                                        \
        else call(out, a[0], prec);                                                                                   \
    }
/* With a branch cut. */
#define CUT(name, call, meets)                                                                                        \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n;                                                                                                      \
        if (m.analytic && meets(a[0])) acb_indeterminate(out);                                                        \
        else call(out, a[0], prec);                                                                                   \
    }

/* Monotone on the reals, with cuts away from them. */
#define MONOTONE_CUT(name, call, real_function, meets)                                                                \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n;                                                                                                      \
        if (m.analytic && meets(a[0])) acb_indeterminate(out);                                                        \
        else if (ball_is_wide(a[0])) ball_monotone(out, a[0], real_function, prec);                                   \
        else call(out, a[0], prec);                                                                                   \
    }

static void e1_value(acb_t out, const acb_t z, slong prec)
{
    acb_t one;
    acb_init(one);
    acb_one(one);
    acb_hypgeom_expint(out, one, z, prec);
    acb_clear(one);
    if (arb_is_zero(acb_imagref(z)) && arb_is_positive(acb_realref(z))) arb_zero(acb_imagref(out));
}

static void ei_value(acb_t out, const acb_t z, slong prec)
{
    acb_hypgeom_ei(out, z, prec);
    if (acb_is_real(z)) arb_zero(acb_imagref(out)); /* the principal value on the real line */
}

MONOTONE(exp, acb_exp, arb_exp)
ENTIRE(sin, acb_sin)
ENTIRE(cos, acb_cos)
ENTIRE(tan, acb_tan)
MONOTONE(sinh, acb_sinh, arb_sinh)
MONOTONE(tanh, acb_tanh, arb_tanh)
MONOTONE(erf, acb_hypgeom_erf, arb_hypgeom_erf)
MONOTONE(erfc, acb_hypgeom_erfc, arb_hypgeom_erfc)
ENTIRE(gamma, acb_gamma)
ENTIRE(psi, acb_digamma)
ENTIRE(zeta, acb_zeta)
CUT(lngamma, acb_lgamma, ball_meets_cut)
CUT(asin, acb_asin, meets_outer_cuts)
CUT(acos, acb_acos, meets_outer_cuts)
CUT(atanh, acb_atanh, meets_outer_cuts)
MONOTONE_CUT(atan, acb_atan, arb_atan, meets_imaginary_cuts)
MONOTONE_CUT(asinh, acb_asinh, arb_asinh, meets_imaginary_cuts)
CUT(e1, e1_value, ball_meets_cut)
CUT(ei, ei_value, ball_meets_cut)

static void ball_log(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (m.analytic && ball_meets_cut(a[0])) acb_indeterminate(out);
    else if (ball_is_wide(a[0]) && arb_is_positive(acb_realref(a[0]))) ball_monotone(out, a[0], arb_log, prec);
    else acb_log(out, a[0], prec);
}

static void ball_cosh(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)m;
    if (ball_is_wide(a[0])) ball_even(out, a[0], arb_cosh, prec);
    else acb_cosh(out, a[0], prec);
}

static void ball_acosh(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    acb_t below;
    acb_init(below);
    acb_sub_ui(below, a[0], 1, prec);
    if (m.analytic && ball_meets_cut(below)) acb_indeterminate(out);
    else acb_acosh(out, a[0], prec);
    acb_clear(below);
}

static void ball_ai(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)m;
    acb_hypgeom_airy(out, NULL, NULL, NULL, a[0], prec);
}

static void ball_bi(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)m;
    acb_hypgeom_airy(NULL, NULL, out, NULL, a[0], prec);
}

/* Functions of two arguments with a cut in the second. */
#define CUT_SECOND(name, call)                                                                                        \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n;                                                                                                      \
        if (m.analytic && ball_meets_cut(a[1]) && !(acb_is_int(a[0]) && whole_##name)) acb_indeterminate(out);        \
        else call(out, a[0], a[1], prec);                                                                             \
        if (acb_is_real(a[0]) && acb_is_real(a[1]) &&                                                                 \
            (arb_is_positive(acb_realref(a[1])) || (acb_is_int(a[0]) && whole_##name)))                               \
            arb_zero(acb_imagref(out));                                                                               \
    }
enum { whole_bessel_j = 1, whole_bessel_i = 1, whole_bessel_y = 0, whole_bessel_k = 0, whole_gamma_upper = 0 };

static void gamma_upper_value(acb_t out, const acb_t a, const acb_t z, slong prec)
{
    acb_hypgeom_gamma_upper(out, a, z, 0, prec);
}

CUT_SECOND(bessel_j, acb_hypgeom_bessel_j)
CUT_SECOND(bessel_y, acb_hypgeom_bessel_y)
CUT_SECOND(bessel_i, acb_hypgeom_bessel_i)
CUT_SECOND(bessel_k, acb_hypgeom_bessel_k)
CUT_SECOND(gamma_upper, gamma_upper_value)

static void ball_polygamma(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)m;
    if (acb_is_int(a[0]) && arb_is_nonnegative(acb_realref(a[0]))) acb_polygamma(out, a[0], a[1], prec);
    else acb_indeterminate(out); /* DLMF 5.15 has whole orders only */
    if (acb_is_real(a[1])) arb_zero(acb_imagref(out));
}

static void ball_beta(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)m;
    acb_t g;
    acb_init(g);
    acb_add(g, a[0], a[1], prec);
    acb_rgamma(g, g, prec);
    for (int k = 0; k < 2; k++) {
        acb_t f;
        acb_init(f);
        acb_gamma(f, a[k], prec);
        acb_mul(g, g, f, prec);
        acb_clear(f);
    }
    acb_set(out, g);
    acb_clear(g);
}

/* ---- functions of the real line: holomorphic only piece by piece ---- */

/* With arguments that are real for real variables each of them means its holomorphic continuation off the real line:
 * abs(x) is x to the right of the imaginary axis and -x to the left. With others, as in abs(x + i), it has none. */
static bool no_continuation(acb_t out, ball_mode m)
{
    if (m.real_args || !(m.analytic || m.off_line)) return false;
    acb_indeterminate(out);
    return true;
}

static void set_real(acb_t out, void (*f)(arb_t, const acb_t, slong), const acb_t z, slong prec)
{
    f(acb_realref(out), z, prec);
    arb_zero(acb_imagref(out));
}

static void ball_abs(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    if (m.analytic || (m.real_args && !acb_is_real(a[0]))) acb_real_abs(out, a[0], m.analytic, prec);
    else set_real(out, acb_abs, a[0], prec);
}

static void ball_sign(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    if (m.real_args) acb_real_sgn(out, a[0], m.analytic, prec);
    else acb_indeterminate(out); /* of real numbers only */
}

static void fold_extreme(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec, bool greatest)
{
    if (n == 1) {
        acb_set(out, a[0]);
        return;
    }
    if (!m.real_args) {
        acb_indeterminate(out);
        return;
    }
    acb_t best;
    acb_init(best);
    acb_set(best, a[0]);
    for (size_t k = 1; k < n; k++) {
        if (acb_is_real(best) && acb_is_real(a[k]) && !m.analytic) {
            if (greatest) arb_max(acb_realref(best), acb_realref(best), acb_realref(a[k]), prec);
            else arb_min(acb_realref(best), acb_realref(best), acb_realref(a[k]), prec);
        } else if (greatest) {
            acb_real_max(best, best, a[k], m.analytic, prec);
        } else {
            acb_real_min(best, best, a[k], m.analytic, prec);
        }
    }
    acb_set(out, best);
    acb_clear(best);
}

static void ball_min(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    fold_extreme(out, a, n, m, prec, false);
}

static void ball_max(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    fold_extreme(out, a, n, m, prec, true);
}

static void ball_re(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)prec;
    if (no_continuation(out, m)) return;
    if (m.real_args) acb_set(out, a[0]);
    else acb_set_arb(out, acb_realref(a[0]));
}

static void ball_im(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)prec;
    if (no_continuation(out, m)) return;
    if (m.real_args) acb_zero(out);
    else acb_set_arb(out, acb_imagref(a[0]));
}

static void ball_conj(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)prec;
    if (no_continuation(out, m)) return;
    if (m.real_args) acb_set(out, a[0]);
    else acb_conj(out, a[0]);
}

static void ball_arg(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    if (!m.real_args || (!m.analytic && acb_is_real(a[0]))) set_real(out, acb_arg, a[0], prec);
    else if (arb_is_positive(acb_realref(a[0]))) acb_zero(out);
    else if (arb_is_negative(acb_realref(a[0]))) acb_const_pi(out, prec);
    else acb_indeterminate(out);
}

/* ---- powers ---- */

/* A ball around 0 to a real power e > 0: |z|^e is at most R^e, R the greatest modulus; on the real line from -r to b
 * the values are 0 ... b^e and 0 ... r^e (cos(pi e) + i sin(pi e)). */
static void power_around_zero(acb_t out, const acb_t base, const arb_t e, slong prec)
{
    arb_t top, bottom, part, zero;
    arb_init(top);
    arb_init(bottom);
    arb_init(part);
    arb_init(zero);
    arf_t low, high;
    arf_init(low);
    arf_init(high);
    if (acb_is_real(base)) {
        arb_get_interval_arf(low, high, acb_realref(base), prec);
        arf_neg(low, low);
        arb_set_arf(top, high);
        arb_set_arf(bottom, low);
        arb_pow(top, top, e, prec);
        arb_pow(bottom, bottom, e, prec);
        arb_union(acb_realref(out), zero, top, prec);
        arb_sin_cos_pi(part, top, e, prec);
        arb_mul(top, top, bottom, prec);
        arb_union(acb_realref(out), acb_realref(out), top, prec);
        arb_mul(part, part, bottom, prec);
        arb_union(acb_imagref(out), zero, part, prec);
        if (arf_sgn(low) <= 0) arb_zero(acb_imagref(out));
    } else {
        acb_get_abs_ubound_arf(high, base, prec);
        arb_set_arf(top, high);
        arb_pow(top, top, e, prec);
        arb_neg(bottom, top);
        arb_union(acb_realref(out), bottom, top, prec);
        arb_set(acb_imagref(out), acb_realref(out));
    }
    arb_clear(top);
    arb_clear(bottom);
    arb_clear(part);
    arb_clear(zero);
    arf_clear(low);
    arf_clear(high);
}

/* exp(exponent * log(base)) by the ends, for real wide balls with base > 0. */
static void power_of_wide(acb_t out, const acb_t base, const acb_t exponent, slong prec)
{
    acb_t l;
    acb_init(l);
    if (ball_is_wide(base)) ball_monotone(l, base, arb_log, prec);
    else acb_log(l, base, prec);
    ball_mul(l, l, exponent, prec);
    if (ball_is_wide(l)) ball_monotone(out, l, arb_exp, prec);
    else acb_exp(out, l, prec);
    acb_clear(l);
}

void ball_power(acb_t out, const acb_t base, const acb_t exponent, bool analytic, slong prec)
{
    const bool real_positive = acb_is_real(exponent) && arb_is_positive(acb_realref(exponent));
    if (acb_is_int(exponent)) acb_pow(out, base, exponent, prec);
    else if (analytic && ball_meets_cut(base)) acb_indeterminate(out);
    else if (acb_is_zero(base) && real_positive) acb_zero(out);
    else if (acb_contains_zero(base) && real_positive && acb_is_finite(base))
        power_around_zero(out, base, acb_realref(exponent), prec);
    else if ((ball_is_wide(base) || ball_is_wide(exponent)) && acb_is_real(base) && acb_is_real(exponent) &&
             arb_is_positive(acb_realref(base)))
        power_of_wide(out, base, exponent, prec);
    else acb_pow(out, base, exponent, prec);
}

/* Denominators for which a root and a whole power are better than exp(e*log(z)). */
enum { ROOT_LIMIT = 4 };

void ball_power_rational(acb_t out, const acb_t base, const fmpq_t exponent, bool analytic, slong prec)
{
    if (fmpz_is_one(fmpq_denref(exponent))) {
        ball_pow_fmpz(out, base, fmpq_numref(exponent), prec);
        return;
    }
    if (fmpz_cmp_ui(fmpq_denref(exponent), ROOT_LIMIT) <= 0 && !ball_is_wide(base) && !acb_contains_zero(base) &&
        !(analytic && ball_meets_cut(base))) {
        const ulong q = fmpz_get_ui(fmpq_denref(exponent));
        if (fmpz_equal_si(fmpq_numref(exponent), -1) && q == 2) {
            acb_rsqrt(out, base, prec);
            return;
        }
        acb_root_ui(out, base, q, prec);
        if (ball_is_nonnegative(base)) arb_zero(acb_imagref(out));
        if (!fmpz_is_one(fmpq_numref(exponent))) acb_pow_fmpz(out, out, fmpq_numref(exponent), prec);
        return;
    }
    acb_t y;
    acb_init(y);
    arb_set_fmpq(acb_realref(y), exponent, prec);
    ball_power(out, base, y, analytic, prec);
    acb_clear(y);
}

/* ---- differences without cancellation ---- */

void ball_log1p(acb_t out, const acb_t u, bool analytic, slong prec)
{
    acb_t z;
    acb_init(z);
    acb_add_ui(z, u, 1, prec);
    if (analytic && ball_meets_cut(z)) acb_indeterminate(out);
    else if (ball_is_wide(u) && ball_real_beyond(u, -1)) ball_monotone(out, u, arb_log1p, prec);
    else acb_log1p(out, u, prec);
    acb_clear(z);
}

void ball_expm1(acb_t out, const acb_t u, slong prec)
{
    if (ball_is_wide(u)) ball_monotone(out, u, arb_expm1, prec);
    else acb_expm1(out, u, prec);
}

/* cos(u) - 1 = -2 sin(u/2)^2 (DLMF 4.21.2), cosh(u) - 1 = 2 sinh(u/2)^2 (DLMF 4.35.2). */
static void twice_square(acb_t out, int sign, slong prec)
{
    fmpz_t two;
    fmpz_init_set_ui(two, 2);
    ball_pow_fmpz(out, out, two, prec);
    acb_mul_si(out, out, 2 * sign, prec);
    fmpz_clear(two);
}

void ball_cosm1(acb_t out, const acb_t u, slong prec)
{
    acb_mul_2exp_si(out, u, -1);
    acb_sin(out, out, prec);
    twice_square(out, -1, prec);
}

void ball_coshm1(acb_t out, const acb_t u, slong prec)
{
    acb_mul_2exp_si(out, u, -1);
    if (ball_is_wide(out)) ball_monotone(out, out, arb_sinh, prec);
    else acb_sinh(out, out, prec);
    twice_square(out, 1, prec);
}

void ball_powm1(acb_t out, const acb_t u, const fmpq_t r, bool analytic, slong prec)
{
    acb_t z, e;
    acb_init(z);
    acb_init(e);
    acb_add_ui(z, u, 1, prec);
    if (acb_contains_zero(z) || ball_meets_cut(z)) { /* nothing cancels here */
        ball_power_rational(out, z, r, analytic, prec);
        acb_sub_ui(out, out, 1, prec);
    } else {
        arb_set_fmpq(acb_realref(e), r, prec);
        ball_log1p(z, u, analytic, prec);
        ball_mul(z, z, e, prec);
        ball_expm1(out, z, prec);
    }
    acb_clear(z);
    acb_clear(e);
}

static const ball_function table[] = {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) ball_##ball,
#include "engine/expr/functions.def"
#undef FUNCTION
};

ball_function ball_function_of(function_id f)
{
    return table[f];
}
