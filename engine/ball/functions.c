/* The functions of the table on complex balls: each value encloses, or is non-finite. Real arguments give real results wherever
 * the function is real there, which keeps radii and types honest further up. The table at the end takes its columns from
 * functions.def. */
#include "engine/ball/functions.h"

#include <string.h>

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
/* The same with a branch cut. */
#define CUT(name, call, meets)                                                                                        \
    static void ball_##name(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)                        \
    {                                                                                                                 \
        (void)n;                                                                                                      \
        if (m.analytic && meets(a[0])) acb_indeterminate(out);                                                        \
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

ENTIRE(exp, acb_exp)
ENTIRE(sin, acb_sin)
ENTIRE(cos, acb_cos)
ENTIRE(tan, acb_tan)
ENTIRE(sinh, acb_sinh)
ENTIRE(cosh, acb_cosh)
ENTIRE(tanh, acb_tanh)
ENTIRE(erf, acb_hypgeom_erf)
ENTIRE(erfc, acb_hypgeom_erfc)
ENTIRE(gamma, acb_gamma)
ENTIRE(psi, acb_digamma)
ENTIRE(zeta, acb_zeta)
CUT(log, acb_log, ball_meets_cut)
CUT(lngamma, acb_lgamma, ball_meets_cut)
CUT(asin, acb_asin, meets_outer_cuts)
CUT(acos, acb_acos, meets_outer_cuts)
CUT(atanh, acb_atanh, meets_outer_cuts)
CUT(atan, acb_atan, meets_imaginary_cuts)
CUT(asinh, acb_asinh, meets_imaginary_cuts)
CUT(e1, e1_value, ball_meets_cut)
CUT(ei, ei_value, ball_meets_cut)

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
        if (acb_is_real(a[0]) && acb_is_real(a[1]) && arb_is_positive(acb_realref(a[1]))) arb_zero(acb_imagref(out)); \
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
    acb_polygamma(out, a[0], a[1], prec);
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

static bool no_continuation(acb_t out, ball_mode m)
{
    if (!m.analytic || m.real_args) return false;
    acb_indeterminate(out);
    return true;
}

static void ball_abs(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    if (m.analytic) {
        acb_real_abs(out, a[0], 1, prec);
    } else {
        arb_t r;
        arb_init(r);
        acb_abs(r, a[0], prec);
        acb_set_arb(out, r);
        arb_clear(r);
    }
}

static void ball_sign(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    acb_real_sgn(out, a[0], m.analytic, prec);
}

static void fold_extreme(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec, bool greatest)
{
    if (no_continuation(out, m)) return;
    acb_t best;
    acb_init(best);
    acb_set(best, a[0]);
    for (size_t k = 1; k < n; k++) {
        if (greatest) acb_real_max(best, best, a[k], m.analytic, prec);
        else acb_real_min(best, best, a[k], m.analytic, prec);
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
    if (m.analytic) acb_set(out, a[0]);
    else acb_set_arb(out, acb_realref(a[0]));
}

static void ball_im(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)prec;
    if (no_continuation(out, m)) return;
    if (m.analytic) acb_zero(out);
    else acb_set_arb(out, acb_imagref(a[0]));
}

static void ball_conj(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n, (void)prec;
    if (no_continuation(out, m)) return;
    if (m.analytic) acb_set(out, a[0]);
    else acb_conj(out, a[0]);
}

static void ball_arg(acb_t out, acb_srcptr const *a, size_t n, ball_mode m, slong prec)
{
    (void)n;
    if (no_continuation(out, m)) return;
    if (!m.analytic) {
        arb_t r;
        arb_init(r);
        acb_arg(r, a[0], prec);
        acb_set_arb(out, r);
        arb_clear(r);
    } else if (arb_is_positive(acb_realref(a[0]))) {
        acb_zero(out);
    } else if (arb_is_negative(acb_realref(a[0]))) {
        acb_const_pi(out, prec);
    } else {
        acb_indeterminate(out);
    }
}

/* ---- powers ---- */

void ball_power(acb_t out, const acb_t base, const acb_t exponent, bool analytic, slong prec)
{
    bool whole = acb_is_int(exponent);
    if (analytic && !whole && ball_meets_cut(base)) {
        acb_indeterminate(out);
    } else if (acb_is_zero(base) && arb_is_positive(acb_realref(exponent))) {
        acb_zero(out);
    } else if (acb_is_real(base) && acb_is_real(exponent) && !whole && arb_is_nonnegative(acb_realref(base)) &&
               !arb_is_positive(acb_realref(base)) && arb_is_positive(acb_realref(exponent))) {
        /* [0, b]^e for e > 0: rises from 0 to b^e */
        arf_t top;
        arf_init(top);
        arb_get_ubound_arf(top, acb_realref(base), prec);
        acb_t b;
        acb_init(b);
        arb_set_arf(acb_realref(b), top);
        acb_pow(b, b, exponent, prec);
        arb_nonnegative_part(acb_realref(b), acb_realref(b));
        arb_t zero;
        arb_init(zero);
        arb_union(acb_realref(out), zero, acb_realref(b), prec);
        arb_zero(acb_imagref(out));
        arb_clear(zero);
        acb_clear(b);
        arf_clear(top);
    } else {
        acb_pow(out, base, exponent, prec);
    }
}

void ball_power_rational(acb_t out, const acb_t base, const fmpq_t exponent, bool analytic, slong prec)
{
    if (fmpz_is_one(fmpq_denref(exponent))) {
        acb_pow_fmpz(out, base, fmpq_numref(exponent), prec);
        return;
    }
    if (fmpz_cmp_ui(fmpq_denref(exponent), 4) <= 0 && (!analytic || !ball_meets_cut(base)) &&
        !(acb_contains_zero(base) && !acb_is_zero(base))) {
        acb_t root;
        acb_init(root);
        acb_root_ui(root, base, fmpz_get_ui(fmpq_denref(exponent)), prec);
        if (acb_is_real(base) && arb_is_nonnegative(acb_realref(base))) arb_zero(acb_imagref(root));
        acb_pow_fmpz(out, root, fmpq_numref(exponent), prec);
        acb_clear(root);
        return;
    }
    acb_t y;
    acb_init(y);
    arb_set_fmpq(acb_realref(y), exponent, prec);
    ball_power(out, base, y, analytic, prec);
    acb_clear(y);
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
