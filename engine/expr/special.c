/* The higher functions at exact arguments: values from DLMF 5.4 (Gamma, psi), 5.12 (Beta), 25.6 (zeta), 7.2, 8.4, 9.2
 * (Airy), 10.4, 10.27 (Bessel functions of orders that differ by their sign). Poles are errors. */
#include "engine/expr/exact.h"

#include <math.h>

enum { PSI_LIMIT = 1000, ZETA_LIMIT = 500 };

static bool decided(expr **value, expr *found)
{
    *value = found;
    return true;
}

/* Is q! of a size that is kept exact? */
static bool factorial_fits(const fmpz_t q)
{
    return fmpz_cmp_si(q, 1 << 24) < 0 && lgamma(fmpz_get_d(q) + 1) / log(2) < NUMBER_BITS_LIMIT;
}

static expr *gamma_of_integer(tw_engine *e, const fmpz_t n) /* n >= 1 */
{
    fmpz_t value, below;
    fmpz_init(below);
    fmpz_sub_ui(below, n, 1);
    expr *gamma = NULL;
    if (!factorial_fits(below)) {
        fail_too_large(e);
    } else {
        fmpz_init(value);
        fmpz_fac_ui(value, fmpz_get_ui(below));
        gamma = expr_fmpz(e, value);
        fmpz_clear(value);
    }
    fmpz_clear(below);
    return gamma;
}

/* Gamma(1/2 + k) = (2k)!/(4^k k!) sqrt(pi), Gamma(1/2 - k) = (-4)^k k!/(2k)! sqrt(pi)  (DLMF 5.4.6, 5.5.3) */
static expr *gamma_of_half(tw_engine *e, const fmpq_t half)
{
    fmpz_t k, twice, a, b;
    fmpz_init(k);
    fmpz_init(twice);
    fmpz_init(a);
    fmpz_init(b);
    fmpz_fdiv_q_2exp(k, fmpq_numref(half), 1);
    const bool negative = fmpz_sgn(k) < 0, odd = fmpz_is_odd(k);
    fmpz_abs(k, k);
    fmpz_mul_2exp(twice, k, 1);
    expr *gamma = NULL;
    if (!factorial_fits(twice)) {
        fail_too_large(e);
    } else {
        fmpq_t ratio;
        fmpq_init(ratio);
        fmpz_fac_ui(a, fmpz_get_ui(twice));
        fmpz_fac_ui(b, fmpz_get_ui(k));
        fmpz_mul_2exp(b, b, fmpz_get_ui(twice));
        fmpq_set_fmpz_frac(ratio, a, b);
        if (negative)
            fmpq_inv(ratio, ratio);
        if (negative && odd)
            fmpq_neg(ratio, ratio);
        gamma = expr_mul(e, expr_fmpq(e, ratio), expr_sqrt(e, expr_constant_of(e, CONSTANT_PI)));
        fmpq_clear(ratio);
    }
    fmpz_clear(k);
    fmpz_clear(twice);
    fmpz_clear(a);
    fmpz_clear(b);
    return gamma;
}

static bool is_pole(expr *a) /* 0, -1, -2, ... */
{
    return number_is_integer(a) && fmpq_sgn(&a->is.number) <= 0;
}

static bool exact_gamma(tw_engine *e, expr *a, expr **value)
{
    if (is_pole(a))
        return decided(value, call_undefined(e, FUNCTION_GAMMA, "0, -1, -2, ..."));
    if (number_is_integer(a))
        return decided(value, gamma_of_integer(e, fmpq_numref(&a->is.number)));
    if (number_is_half(a))
        return decided(value, gamma_of_half(e, &a->is.number));
    return expr_is_inf(a) && decided(value, a);
}

static bool exact_gamma_upper(tw_engine *e, expr *a, expr *z, expr **value)
{
    if (expr_is_inf(z))
        return decided(value, expr_int(e, 0));
    if (expr_is_one(a))
        return decided(value, expr_call1(e, FUNCTION_EXP, expr_neg(e, z)));
    if (expr_is_zero(z) && expr_is_positive_constant(a))
        return decided(value, expr_call1(e, FUNCTION_GAMMA, a));
    return false;
}

static bool exact_lngamma(tw_engine *e, expr *a, expr **value)
{
    if (is_pole(a))
        return decided(value, call_undefined(e, FUNCTION_LNGAMMA, "0, -1, -2, ..."));
    if (number_is_integer(a) && fmpz_cmp_si(fmpq_numref(&a->is.number), 1000) <= 0)
        return decided(value, expr_call1(e, FUNCTION_LOG, expr_call1(e, FUNCTION_GAMMA, a)));
    return expr_is_inf(a) && decided(value, a);
}

/* psi(n) = H_(n-1) - euler, psi(n + 1/2) = -euler - 2 log 2 + 2 sum_(k=1)^n 1/(2k-1)  (DLMF 5.4.14, 5.4.15) */
static bool exact_psi(tw_engine *e, expr *a, expr **value)
{
    if (is_pole(a))
        return decided(value, call_undefined(e, FUNCTION_PSI, "0, -1, -2, ..."));
    const bool half = number_is_half(a);
    if ((!number_is_integer(a) && !half) || fmpq_sgn(&a->is.number) < 0 ||
        fmpz_cmp_si(fmpq_numref(&a->is.number), PSI_LIMIT) > 0)
        return false;
    fmpz_t whole;
    fmpq_t sum, term;
    fmpz_init(whole);
    fmpq_init(sum);
    fmpq_init(term);
    fmpz_fdiv_q(whole, fmpq_numref(&a->is.number), fmpq_denref(&a->is.number));
    const slong n = fmpz_get_si(whole) - !half;
    for (slong k = 1; k <= n; k++) {
        fmpq_set_si(term, half ? 2 : 1, half ? (ulong)(2 * k - 1) : (ulong)k);
        fmpq_add(sum, sum, term);
    }
    expr *psi = expr_sub(e, expr_fmpq(e, sum), expr_constant_of(e, CONSTANT_EULER));
    if (half)
        psi = expr_sub(e, psi, expr_mul(e, expr_int(e, 2), expr_call1(e, FUNCTION_LOG, expr_int(e, 2))));
    fmpz_clear(whole);
    fmpq_clear(sum);
    fmpq_clear(term);
    return decided(value, psi);
}

static bool exact_polygamma(tw_engine *e, expr *n, expr *z, expr **value)
{
    if (expr_is_zero(n))
        return decided(value, expr_call1(e, FUNCTION_PSI, z));
    if (is_pole(z))
        return decided(value, call_undefined(e, FUNCTION_POLYGAMMA, "0, -1, -2, ..."));
    /* psi'(1) = pi^2/6, psi'(1/2) = pi^2/2: DLMF 5.15.1 summed by 25.6.1 */
    const slong part = expr_is_one(z) ? 6 : number_is_half(z) && fmpz_is_one(fmpq_numref(&z->is.number)) ? 2 : 0;
    if (!expr_is_one(n) || part == 0)
        return false;
    return decided(value, expr_mul(e, expr_frac(e, 1, part),
                                   expr_pow(e, expr_constant_of(e, CONSTANT_PI), expr_int(e, 2))));
}

static bool is_exact_gamma(expr *a)
{
    return (number_is_integer(a) || number_is_half(a)) && !is_pole(a);
}

static bool exact_beta(tw_engine *e, expr *a, expr *b, expr **value)
{
    if (is_pole(a) || is_pole(b)) /* finite only where the other one's pole cancels it: DLMF 5.12 excludes both */
        return decided(value, call_undefined(e, FUNCTION_BETA, "0, -1, -2, ..."));
    if (is_exact_gamma(a) && is_exact_gamma(b)) {
        expr *sum = expr_add(e, a, b);
        if (!sum || is_pole(sum)) /* 1/Gamma(a + b) = 0 */
            return decided(value, sum ? expr_int(e, 0) : NULL);
        return decided(value, expr_div(e, expr_mul(e, expr_call1(e, FUNCTION_GAMMA, a), expr_call1(e, FUNCTION_GAMMA,
            b)),
                                       expr_call1(e, FUNCTION_GAMMA, sum)));
    }
    if (expr_order(a, b) <= 0)
        return false;
    expr *const turned[2] = {b, a}; /* symmetric */
    return decided(value, expr_call(e, FUNCTION_BETA, turned, 2));
}

/* zeta(-n) = -B_(n+1)/(n+1), zeta(2m) = (2 pi)^(2m) |B_2m| / (2 (2m)!)  (DLMF 25.6.2, 25.6.3) */
static bool exact_zeta(tw_engine *e, expr *a, expr **value)
{
    if (expr_is_one(a))
        return decided(value, call_undefined(e, FUNCTION_ZETA, "1"));
    if (expr_is_inf(a))
        return decided(value, expr_int(e, 1));
    if (!number_is_integer(a) || fmpz_cmp_si(fmpq_numref(&a->is.number), ZETA_LIMIT) > 0 ||
        fmpz_cmp_si(fmpq_numref(&a->is.number), -ZETA_LIMIT) < 0)
        return false;
    const slong n = fmpz_get_si(fmpq_numref(&a->is.number));
    if (n > 0 && n % 2)
        return false;
    fmpq_t b;
    fmpz_t f;
    fmpq_init(b);
    fmpz_init(f);
    if (n <= 0) { /* with B_1 = -1/2 the formula at n = 0 would need +1/2 */
        bernoulli_fmpq_ui(b, (ulong)(1 - n));
        fmpq_div_fmpz(b, b, (fmpz_set_si(f, n == 0 ? 1 : n - 1), f));
        *value = expr_fmpq(e, b);
    } else {
        bernoulli_fmpq_ui(b, (ulong)n);
        fmpq_abs(b, b);
        fmpz_fac_ui(f, (ulong)n);
        fmpq_div_fmpz(b, b, f);
        fmpz_one_2exp(f, (ulong)(n - 1));
        fmpq_mul_fmpz(b, b, f);
        *value = expr_mul(e, expr_fmpq(e, b), expr_pow(e, expr_constant_of(e, CONSTANT_PI), a));
    }
    fmpq_clear(b);
    fmpz_clear(f);
    return true;
}

static bool exact_erf(tw_engine *e, function_id f, expr *a, expr **value)
{
    const bool complement = f == FUNCTION_ERFC;
    if (expr_is_zero(a))
        return decided(value, expr_int(e, complement));
    if (expr_is_inf(a))
        return decided(value, expr_int(e, !complement));
    if (expr_is_minus_inf(a))
        return decided(value, expr_int(e, complement ? 2 : -1));
    if (complement || !expr_leads_negative(a))
        return false;
    return decided(value, expr_neg(e, expr_call1(e, f, expr_neg(e, a))));
}

/* Ai(0) = 3^(-2/3)/Gamma(2/3), Bi(0) = 3^(-1/6)/Gamma(2/3)  (DLMF 9.2.3, 9.2.5) */
static bool exact_airy(tw_engine *e, function_id f, expr *a, expr **value)
{
    if (expr_is_inf(a))
        return decided(value, f == FUNCTION_AI ? expr_int(e, 0) : a);
    if (!expr_is_zero(a))
        return false;
    expr *power = expr_pow(e, expr_int(e, 3), f == FUNCTION_AI ? expr_frac(e, -2, 3) : expr_frac(e, -1, 6));
    return decided(value, expr_div(e, power, expr_call1(e, FUNCTION_GAMMA, expr_frac(e, 2, 3))));
}

static bool exact_bessel(tw_engine *e, function_id f, expr *nu, expr *z, expr **value)
{
    if (expr_is_zero(z) && nu->kind == EXPR_NUMBER) {
        if (f == FUNCTION_BESSEL_Y || f == FUNCTION_BESSEL_K)
            return decided(value, call_undefined(e, f, "z = 0"));
        if (fmpq_sgn(&nu->is.number) >= 0)
            return decided(value, expr_int(e, expr_is_zero(nu)));
    }
    if (!expr_leads_negative(nu) || (f != FUNCTION_BESSEL_K && !number_is_integer(nu)))
        return false;
    /* K of order -nu is K of order nu; J, Y get (-1)^n, I nothing for integers n (DLMF 10.4.1, 10.27.1, 10.27.3) */
    const bool odd = number_is_integer(nu) && fmpz_is_odd(fmpq_numref(&nu->is.number));
    const slong sign = odd && (f == FUNCTION_BESSEL_J || f == FUNCTION_BESSEL_Y) ? -1 : 1;
    expr *const args[2] = {expr_neg(e, nu), z};
    return decided(value, expr_mul(e, expr_int(e, sign), expr_call(e, f, args, 2)));
}

static bool exact_exponential_integral(tw_engine *e, function_id f, expr *a, expr **value)
{
    if (expr_is_zero(a))
        return decided(value, call_undefined(e, f, "0"));
    if (expr_is_inf(a))
        return decided(value, f == FUNCTION_E1 ? expr_int(e, 0) : a);
    return f == FUNCTION_EI && expr_is_minus_inf(a) && decided(value, expr_int(e, 0));
}

bool special_value(tw_engine *e, function_id f, expr *const *args, expr **value)
{
    switch (f) {
    case FUNCTION_GAMMA: return exact_gamma(e, args[0], value);
    case FUNCTION_GAMMA_UPPER: return exact_gamma_upper(e, args[0], args[1], value);
    case FUNCTION_LNGAMMA: return exact_lngamma(e, args[0], value);
    case FUNCTION_PSI: return exact_psi(e, args[0], value);
    case FUNCTION_POLYGAMMA: return exact_polygamma(e, args[0], args[1], value);
    case FUNCTION_BETA: return exact_beta(e, args[0], args[1], value);
    case FUNCTION_ZETA: return exact_zeta(e, args[0], value);
    case FUNCTION_ERF: case FUNCTION_ERFC: return exact_erf(e, f, args[0], value);
    case FUNCTION_E1: case FUNCTION_EI: return exact_exponential_integral(e, f, args[0], value);
    case FUNCTION_AI: case FUNCTION_BI: return exact_airy(e, f, args[0], value);
    case FUNCTION_BESSEL_J: case FUNCTION_BESSEL_Y: case FUNCTION_BESSEL_I: case FUNCTION_BESSEL_K:
        return exact_bessel(e, f, args[0], args[1], value);
    default: return false;
    }
}
