/* Real balls as intervals: for wide balls the image of the ends is the image of the ball. Knows nothing of
 * expressions. */
#include "engine/ball/interval.h"

bool ball_is_wide(const acb_t z)
{
    if (mag_is_zero(arb_radref(acb_realref(z))) || !arb_is_zero(acb_imagref(z))) return false;
    return arb_is_finite(acb_realref(z)) && arb_rel_accuracy_bits(acb_realref(z)) < INTERVAL_BITS;
}

bool ball_is_nonnegative(const acb_t z)
{
    return arb_is_zero(acb_imagref(z)) && arb_is_nonnegative(acb_realref(z));
}

/* Bits for a difference beyond the operand's own: not exact, for the exponents may lie 2^40 apart. */
enum { DIFFERENCE_BITS = 64 };

bool ball_real_beyond(const acb_t z, slong n)
{
    arb_t d;
    arb_init(d);
    arb_sub_si(d, acb_realref(z), n, DIFFERENCE_BITS + arb_bits(acb_realref(z)));
    bool beyond = arb_is_positive(d);
    arb_clear(d);
    return beyond;
}

bool ball_real_beyond_one(const acb_t z)
{
    return ball_real_beyond(z, 1);
}

bool ball_real_within_one(const acb_t z)
{
    arb_t d;
    arb_init(d);
    arb_sub_si(d, acb_realref(z), 1, DIFFERENCE_BITS + arb_bits(acb_realref(z)));
    bool within = arb_is_negative(d) && ball_real_beyond(z, -1);
    arb_clear(d);
    return within;
}

/* The interval's ends, outwards. */
static void ends(arf_t low, arf_t high, const arb_t x)
{
    arb_get_interval_arf(low, high, x, 2 * MAG_BITS + arb_bits(x));
}

void ball_mul(acb_t out, const acb_t a, const acb_t b, slong prec)
{
    const bool wide = ball_is_wide(a) || ball_is_wide(b);
    if (!wide || !acb_is_real(a) || !acb_is_real(b) || !acb_is_finite(a) || !acb_is_finite(b)) {
        acb_mul(out, a, b, prec);
        return;
    }
    arf_t e[2][2], p, low, high;
    for (int k = 0; k < 4; k++) arf_init(e[k / 2][k % 2]);
    arf_init(p);
    arf_init(low);
    arf_init(high);
    ends(e[0][0], e[0][1], acb_realref(a));
    ends(e[1][0], e[1][1], acb_realref(b));
    for (int k = 0; k < 4; k++) {
        arf_mul(p, e[0][k / 2], e[1][k % 2], ARF_PREC_EXACT, ARF_RND_DOWN);
        if (k == 0 || arf_cmp(p, low) < 0) arf_set(low, p);
        if (k == 0 || arf_cmp(p, high) > 0) arf_set(high, p);
    }
    arb_set_interval_arf(acb_realref(out), low, high, prec);
    arb_zero(acb_imagref(out));
    for (int k = 0; k < 4; k++) arf_clear(e[k / 2][k % 2]);
    arf_clear(p);
    arf_clear(low);
    arf_clear(high);
}

static void union_of_images(acb_t out, const arf_t low, const arf_t high, real_call f, slong prec)
{
    arb_t a, b;
    arb_init(a);
    arb_init(b);
    arb_set_arf(a, low);
    arb_set_arf(b, high);
    f(a, a, prec);
    f(b, b, prec);
    arb_union(acb_realref(out), a, b, prec);
    arb_zero(acb_imagref(out));
    arb_clear(a);
    arb_clear(b);
}

void ball_monotone(acb_t out, const acb_t z, real_call f, slong prec)
{
    arf_t low, high;
    arf_init(low);
    arf_init(high);
    ends(low, high, acb_realref(z));
    union_of_images(out, low, high, f, prec);
    arf_clear(low);
    arf_clear(high);
}

void ball_even(acb_t out, const acb_t z, real_call f, slong prec)
{
    arf_t low, high;
    arf_init(low);
    arf_init(high);
    ends(low, high, acb_realref(z));
    const bool through_zero = arf_sgn(low) <= 0 && arf_sgn(high) >= 0;
    arf_abs(low, low);
    arf_abs(high, high);
    if (arf_cmp(low, high) > 0) arf_swap(low, high);
    if (through_zero) arf_zero(low);
    union_of_images(out, low, high, f, prec);
    arf_clear(low);
    arf_clear(high);
}

void ball_pow_fmpz(acb_t out, const acb_t z, const fmpz_t n, slong prec)
{
    if (fmpz_equal_si(n, -1) && !ball_is_wide(z)) {
        acb_inv(out, z, prec);
        return;
    }
    if (!ball_is_wide(z) || (fmpz_sgn(n) < 0 && acb_contains_zero(z))) {
        acb_pow_fmpz(out, z, n, prec);
        return;
    }
    const bool even = fmpz_is_even(n);
    arf_t e[2];
    arb_t p[2];
    for (int k = 0; k < 2; k++) {
        arf_init(e[k]);
        arb_init(p[k]);
    }
    ends(e[0], e[1], acb_realref(z));
    const bool through_zero = arf_sgn(e[0]) < 0 && arf_sgn(e[1]) > 0;
    for (int k = 0; k < 2; k++) {
        arb_set_arf(p[k], e[k]);
        arb_pow_fmpz(p[k], p[k], n, prec);
    }
    arb_union(acb_realref(out), p[0], p[1], prec);
    if (even && through_zero) { /* n > 0: the least value is 0 */
        arb_zero(p[0]);
        arb_union(acb_realref(out), acb_realref(out), p[0], prec);
    }
    arb_zero(acb_imagref(out));
    for (int k = 0; k < 2; k++) {
        arf_clear(e[k]);
        arb_clear(p[k]);
    }
}
