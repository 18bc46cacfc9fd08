/* What each function of the table does to a growth record. Knows records and nothing of expressions; a function that
 * has no row here (`none`) has a record only where its argument stays bounded, by its value on the argument's ball
 * (growth.c). */
#include "engine/ball/growth_special.h"

/* Is u real, of one sign, and unbounded? */
static int grows_with_sign(const growth_record *u)
{
    if (!record_is_real(u) || arb_contains_zero(acb_realref(u->g)) || record_decays(u))
        return 0;
    return arb_is_positive(acb_realref(u->g)) ? 1 : -1;
}

/* 1/u -> 0? Then *inverse is its record. */
static bool inverse_decays(growth_record *inverse, const growth_record *u, const growth_place *p)
{
    fmpq_t minus_one;
    fmpq_init(minus_one);
    fmpq_set_si(minus_one, -1, 1);
    bool ok = record_pow_fmpq(inverse, u, minus_one, p) && record_decays(inverse);
    fmpq_clear(minus_one);
    return ok;
}

static bool add_si(growth_record *out, const growth_record *u, slong n, const growth_place *p)
{
    growth_record t;
    record_init(&t);
    record_set_si(&t, n);
    bool ok = record_add(out, u, &t, p);
    record_clear(&t);
    return ok;
}

static bool pow_si(growth_record *out, const growth_record *u, slong numerator, slong denominator,
        const growth_place *p)
{
    fmpq_t q;
    fmpq_init(q);
    fmpq_set_si(q, numerator, denominator);
    bool ok = record_pow_fmpq(out, u, q, p);
    fmpq_clear(q);
    return ok;
}

static bool growth_exp(growth_record *out, const growth_record *u, const growth_place *p)
{
    return record_exp(out, u, p);
}

static bool growth_log(growth_record *out, const growth_record *u, const growth_place *p)
{
    return record_log(out, u, p);
}

static bool growth_abs(growth_record *out, const growth_record *u, const growth_place *p)
{
    return record_abs(out, u, p);
}

static bool growth_sign(growth_record *out, const growth_record *u, const growth_place *p)
{
    (void)p;
    if (record_is_zero(u))
        return false;
    if (!record_is_real(u) || arb_contains_zero(acb_realref(u->g)))
        return false;
    record_set_si(out, arb_is_negative(acb_realref(u->g)) ? -1 : 1);
    return true;
}

/* f of something decaying: f(0) + w h with h in f'(star). */
static bool near_zero(growth_record *out, slong value, const growth_record *u, void (*derivative)(acb_t, const acb_t,
        slong),
                      const growth_place *p)
{
    if (!record_decays(u))
        return false;
    acb_t star;
    fmpq_t q;
    acb_init(star);
    fmpq_init(q);
    fmpq_set_si(q, value, 1);
    bool ok = record_star(star, u, p);
    if (ok) {
        derivative(star, star, p->prec);
        ok = record_near(out, q, u, star, p);
    }
    acb_clear(star);
    fmpq_clear(q);
    return ok;
}

static bool bounded_value(growth_record *out, const growth_record *u, void (*f)(acb_t, const acb_t, slong),
                          const growth_place *p)
{
    acb_t v;
    acb_init(v);
    bool ok = record_ball(v, u, p);
    if (ok) {
        f(v, v, p->prec);
        record_set_ball(out, v);
        ok = acb_is_finite(v);
    }
    acb_clear(v);
    return ok;
}

static void set_unit_interval(growth_record *out)
{
    acb_t v;
    acb_init(v);
    mag_one(arb_radref(acb_realref(v)));
    record_set_ball(out, v);
    acb_clear(v);
}

/* (e^u + sign e^-u)/2 */
static bool half_exponentials(growth_record *out, const growth_record *u, int sign, const growth_place *p)
{
    growth_record r, s;
    record_init(&r);
    record_init(&s);
    bool ok = record_exp(&r, u, p) && record_scale(&s, u, -1, p) && record_exp(&s, &s, p) &&
              record_scale(&s, &s, sign, p) && record_add(&r, &r, &s, p);
    if (ok) {
        fmpq_t half;
        fmpq_init(half);
        fmpq_set_si(half, 1, 2);
        record_set_fmpq(&s, half);
        ok = record_mul(out, &r, &s, p);
        fmpq_clear(half);
    }
    record_clear(&r);
    record_clear(&s);
    return ok;
}

static bool times_i(growth_record *out, const growth_record *u, int sign, const growth_place *p)
{
    growth_record t;
    acb_t i;
    record_init(&t);
    acb_init(i);
    acb_onei(i);
    if (sign < 0)
        acb_neg(i, i);
    record_set_ball(&t, i);
    bool ok = record_mul(out, u, &t, p);
    record_clear(&t);
    acb_clear(i);
    return ok;
}

/* f even with f(0) = 1, f of something decaying: 1 + w^2 h, h in f''(star)/2. */
static bool near_zero_even(growth_record *out, const growth_record *u, void (*second)(acb_t, const acb_t, slong),
                           const growth_place *p)
{
    if (!record_decays(u))
        return false;
    growth_record square;
    acb_t star;
    fmpq_t one;
    record_init(&square);
    acb_init(star);
    fmpq_init(one);
    fmpq_one(one);
    bool ok = record_star(star, u, p) && record_mul(&square, u, u, p);
    if (ok) {
        second(star, star, p->prec);
        acb_mul_2exp_si(star, star, -1);
        ok = record_near(out, one, &square, star, p);
    }
    record_clear(&square);
    acb_clear(star);
    fmpq_clear(one);
    return ok;
}

static void minus_cos(acb_t out, const acb_t z, slong prec)
{
    acb_cos(out, z, prec);
    acb_neg(out, out);
}

static bool growth_sin(growth_record *out, const growth_record *u, const growth_place *p)
{
    if (near_zero(out, 0, u, acb_cos, p) || bounded_value(out, u, acb_sin, p))
        return true;
    if (record_is_real(u)) {
        set_unit_interval(out);
        return true;
    }
    growth_record r; /* sin u = -i sinh(i u) */
    record_init(&r);
    bool ok = times_i(&r, u, 1, p) && half_exponentials(&r, &r, -1, p) && times_i(out, &r, -1, p);
    record_clear(&r);
    return ok;
}

static bool growth_cos(growth_record *out, const growth_record *u, const growth_place *p)
{
    if (near_zero_even(out, u, minus_cos, p) || bounded_value(out, u, acb_cos, p))
        return true;
    if (record_is_real(u)) {
        set_unit_interval(out);
        return true;
    }
    growth_record r;
    record_init(&r);
    bool ok = times_i(&r, u, 1, p) && half_exponentials(out, &r, 1, p);
    record_clear(&r);
    return ok;
}

static bool growth_sinh(growth_record *out, const growth_record *u, const growth_place *p)
{
    return near_zero(out, 0, u, acb_cosh, p) || bounded_value(out, u, acb_sinh, p) || half_exponentials(out, u, -1, p);
}

static bool growth_cosh(growth_record *out, const growth_record *u, const growth_place *p)
{
    return near_zero_even(out, u, acb_cosh, p) || bounded_value(out, u, acb_cosh, p) || half_exponentials(out, u, 1, p);
}

static void sech_squared(acb_t out, const acb_t z, slong prec)
{
    acb_sech(out, z, prec);
    acb_sqr(out, out, prec);
}

/* tanh u = sign (1 - E)/(1 + E), E = exp(-2 sign u) */
static bool growth_tanh(growth_record *out, const growth_record *u, const growth_place *p)
{
    int sign = grows_with_sign(u);
    if (near_zero(out, 0, u, sech_squared, p) || (!sign && bounded_value(out, u, acb_tanh, p)))
        return true;
    if (!sign) {
        if (!record_is_real(u))
            return false;
        set_unit_interval(out);
        return true;
    }
    growth_record r, s;
    record_init(&r);
    record_init(&s);
    bool ok = record_scale(&r, u, -2 * sign, p) && record_exp(&r, &r, p) && add_si(&s, &r, 1, p) &&
              pow_si(&s, &s, -1, 1, p) && record_scale(&r, &r, -1, p) && add_si(&r, &r, 1, p) &&
              record_mul(&r, &r, &s, p) && record_scale(out, &r, sign, p);
    record_clear(&r);
    record_clear(&s);
    return ok;
}

static void atan_slope(acb_t out, const acb_t z, slong prec)
{
    acb_sqr(out, z, prec);
    acb_add_ui(out, out, 1, prec);
    if (acb_contains_zero(out))
        acb_indeterminate(out);
    else
        acb_inv(out, out, prec);
}

/* u -> +-inf: atan u = +-pi/2 - atan(1/u) (DLMF 4.24.17) */
static bool growth_atan(growth_record *out, const growth_record *u, const growth_place *p)
{
    int sign = grows_with_sign(u);
    growth_record r, s;
    acb_t v;
    record_init(&r);
    record_init(&s);
    acb_init(v);
    bool ok = false;
    if (near_zero(out, 0, u, atan_slope, p)) {
        ok = true;
    } else if (sign && inverse_decays(&r, u, p) && near_zero(&r, 0, &r, atan_slope, p)) {
        acb_const_pi(v, p->prec);
        acb_mul_2exp_si(v, v, -1);
        if (sign < 0)
            acb_neg(v, v);
        record_set_ball(&s, v);
        ok = record_scale(&r, &r, -1, p) && record_add(out, &s, &r, p);
    } else if (bounded_value(out, u, acb_atan, p)) {
        ok = true;
    } else if (record_is_real(u)) {
        arf_t bound;
        arf_init(bound);
        arf_set_d(bound, 1.5707963267948968); /* above pi/2 = 1.57079632679489661... */
        arb_add_error_arf(acb_realref(v), bound);
        arf_clear(bound);
        record_set_ball(out, v);
        ok = true;
    }
    record_clear(&r);
    record_clear(&s);
    acb_clear(v);
    return ok;
}

static void asinh_slope(acb_t out, const acb_t z, slong prec)
{
    atan_slope(out, z, prec);
    acb_sqrt(out, out, prec);
}

/* asinh u = log(u + sqrt(u^2 + 1)) (DLMF 4.37.16), odd */
static bool growth_asinh(growth_record *out, const growth_record *u, const growth_place *p)
{
    int sign = grows_with_sign(u);
    growth_record r, s;
    record_init(&r);
    record_init(&s);
    bool ok = record_is_real(u) && near_zero(out, 0, u, asinh_slope, p);
    if (!ok && sign)
        ok = record_scale(&r, u, sign, p) && record_mul(&s, &r, &r, p) && add_si(&s, &s, 1, p) &&
             pow_si(&s, &s, 1, 2, p) && record_add(&r, &r, &s, p) && record_log(&r, &r, p) &&
             record_scale(out, &r, sign, p);
    if (!ok)
        ok = bounded_value(out, u, acb_asinh, p);
    record_clear(&r);
    record_clear(&s);
    return ok;
}

/* acosh u = log(u + sqrt(u^2 - 1)) for u >= 1 (DLMF 4.37.19) */
static bool growth_acosh(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record r, s;
    record_init(&r);
    record_init(&s);
    bool ok = grows_with_sign(u) > 0 && record_mul(&s, u, u, p) && add_si(&s, &s, -1, p) && grows_with_sign(&s) > 0 &&
              pow_si(&s, &s, 1, 2, p) && record_add(&r, u, &s, p) && record_log(out, &r, p);
    if (!ok)
        ok = bounded_value(out, u, acb_acosh, p);
    record_clear(&r);
    record_clear(&s);
    return ok;
}

static void erf_slope(acb_t out, const acb_t z, slong prec)
{
    arb_t c;
    arb_init(c);
    acb_sqr(out, z, prec);
    acb_neg(out, out);
    acb_exp(out, out, prec);
    arb_const_sqrt_pi(c, prec);
    arb_mul_2exp_si(c, c, -1);
    acb_div_arb(out, out, c, prec);
    arb_clear(c);
}

static void erf_minus_slope(acb_t out, const acb_t z, slong prec)
{
    erf_slope(out, z, prec);
    acb_neg(out, out);
}

/* u -> +inf: erfc u = e^(-u^2)/u * h with 0 <= h <= 1/sqrt(pi) and h >= 1/sqrt(pi) (1 - 1/(2 u^2)) (DLMF 7.12(i)) */
static bool erfc_large(growth_record *out, const growth_record *u, const growth_place *p)
{
    growth_record r, s;
    acb_t h;
    arb_t c, one;
    record_init(&r);
    record_init(&s);
    acb_init(h);
    arb_init(c);
    arb_init(one);
    bool ok = inverse_decays(&s, u, p) && record_mul(&r, &s, &s, p) && record_ball(h, &r, p);
    if (ok) {
        arb_const_sqrt_pi(c, p->prec);
        arb_inv(c, c, p->prec);
        arb_mul_2exp_si(acb_realref(h), acb_realref(h), -1);
        arb_sub_ui(acb_realref(h), acb_realref(h), 1, p->prec);
        arb_neg(acb_realref(h), acb_realref(h));
        arb_one(one);
        arb_union(acb_realref(h), acb_realref(h), one, p->prec);
        arb_zero(acb_imagref(h));
        arb_nonnegative_part(acb_realref(h), acb_realref(h));
        acb_mul_arb(h, h, c, p->prec);
        record_set_ball(&r, h);
        ok = record_mul(&s, &s, &r, p) && record_mul(&r, u, u, p) && record_scale(&r, &r, -1, p) &&
             record_exp(&r, &r, p) && record_mul(out, &r, &s, p);
    }
    record_clear(&r);
    record_clear(&s);
    acb_clear(h);
    arb_clear(c);
    arb_clear(one);
    return ok;
}

static void erfc_value(acb_t out, const acb_t z, slong prec)
{
    acb_hypgeom_erfc(out, z, prec);
}

static void erf_value(acb_t out, const acb_t z, slong prec)
{
    acb_hypgeom_erf(out, z, prec);
}

static bool growth_erfc(growth_record *out, const growth_record *u, const growth_place *p)
{
    int sign = grows_with_sign(u);
    if (near_zero(out, 1, u, erf_minus_slope, p))
        return true;
    if (sign > 0 && erfc_large(out, u, p))
        return true;
    if (sign < 0) { /* erfc u = 2 - erfc(-u) */
        growth_record r;
        record_init(&r);
        bool ok = record_scale(&r, u, -1, p) && erfc_large(&r, &r, p) && record_scale(&r, &r, -1, p) && add_si(out,
                &r, 2, p);
        record_clear(&r);
        if (ok)
            return true;
    }
    return bounded_value(out, u, erfc_value, p);
}

static bool growth_erf(growth_record *out, const growth_record *u, const growth_place *p)
{
    if (near_zero(out, 0, u, erf_slope, p))
        return true;
    if (grows_with_sign(u)) { /* erf u = 1 - erfc u */
        growth_record r;
        record_init(&r);
        bool ok = growth_erfc(&r, u, p) && record_scale(&r, &r, -1, p) && add_si(out, &r, 1, p);
        record_clear(&r);
        if (ok)
            return true;
    }
    if (bounded_value(out, u, erf_value, p))
        return true;
    if (!record_is_real(u))
        return false;
    set_unit_interval(out);
    return true;
}

#define growth_none NULL
static growth_rule *const rules[FUNCTION_COUNT] = {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) [FUNCTION_##id] = growth_##growth,
#include "engine/expr/functions.def"
#undef FUNCTION
};

bool growth_call(growth_record *out, function_id f, const growth_record *args, size_t n, const growth_place *p)
{
    return n <= 2 && rules[f] && rules[f](out, args, p);
}
