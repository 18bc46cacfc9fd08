/* Balls as decimal text. Two faces: json_ball writes the pair of decimals for programs, print_ball the form for people. Both
 * round outwards: the ball that the text names holds the engine's ball. Exponents have any size (2.7e-434295), so nothing
 * here passes through a double. */
#include <string.h>

#include "engine/export/format.h"

/* mid * 10^exponent as text: plain notation from 10^least to 10^20 unless many zeros would end it, else with e. */
static void add_decimal(text *out, const fmpz_t mid, const fmpz_t exponent, slong least)
{
    fmpz_t m, ten, place;
    fmpz_init_set(m, mid);
    fmpz_init(place);
    fmpz_init_set_ui(ten, 10);
    slong trimmed = fmpz_is_zero(m) ? 0 : fmpz_remove(m, m, ten); /* trailing zeros say nothing */
    fmpz_add_si(place, exponent, trimmed);
    char *digits = fmpz_get_str(NULL, 10, m);
    const char *d = digits;
    if (*d == '-') {
        text_add_char(out, '-');
        d++;
    }
    slong count = (slong)strlen(d);
    fmpz_t lead; /* the power of ten of the first digit */
    fmpz_init(lead);
    fmpz_add_si(lead, place, count - 1);
    if (fmpz_is_zero(m)) {
        text_add_char(out, '0');
    } else if (fmpz_cmp_si(lead, least) < 0 || fmpz_cmp_si(lead, 20) > 0 ||
               (fmpz_cmp_si(lead, 9) > 0 && fmpz_cmp_si(place, 4) > 0)) { /* zeros would only say how large it is */
        text_add_char(out, d[0]);
        if (count > 1) {
            text_add_char(out, '.');
            text_add(out, d + 1);
        }
        char *e = fmpz_get_str(NULL, 10, lead);
        text_addf(out, "e%s", e);
        flint_free(e);
    } else {
        slong first = fmpz_get_si(lead);
        slong last = fmpz_get_si(place);
        if (first < 0) {
            text_add(out, "0.");
            for (slong k = -1; k > first; k--) text_add_char(out, '0');
            text_add(out, d);
        } else {
            for (slong k = first; k >= 0 || k >= last; k--) {
                if (k == -1) text_add_char(out, '.');
                text_add_char(out, first - k < count ? d[first - k] : '0');
            }
        }
    }
    flint_free(digits);
    fmpz_clear(lead);
    fmpz_clear(m);
    fmpz_clear(ten);
    fmpz_clear(place);
}

/* mid, rad, exponent with at most `digits` decimal digits in mid and at most `radius_digits` in rad; outward. */
static void outward_decimal(fmpz_t mid, fmpz_t rad, fmpz_t exponent, const arb_t x, slong digits, slong radius_digits)
{
    arb_get_fmpz_mid_rad_10exp(mid, rad, exponent, x, digits + 5);
    fmpz_t ten_k, rest, half;
    fmpz_init(ten_k);
    fmpz_init(rest);
    fmpz_init(half);
    slong cut = 0;
    if (!fmpz_is_zero(rad) && (slong)fmpz_sizeinbase(rad, 10) > radius_digits)
        cut = (slong)fmpz_sizeinbase(rad, 10) - radius_digits;
    fmpz_abs(rest, mid);
    if ((slong)fmpz_sizeinbase(rest, 10) - cut > digits) cut = (slong)fmpz_sizeinbase(rest, 10) - digits;
    if (cut > 0) {
        fmpz_ui_pow_ui(ten_k, 10, (ulong)cut);
        fmpz_fdiv_q_2exp(half, ten_k, 1);
        fmpz_add(mid, mid, half);
        fmpz_fdiv_qr(mid, rest, mid, ten_k);
        fmpz_sub(rest, rest, half); /* what rounding moved the midpoint by */
        fmpz_abs(rest, rest);
        fmpz_add(rad, rad, rest);
        fmpz_cdiv_q(rad, rad, ten_k);
        fmpz_add_si(exponent, exponent, cut);
    }
    fmpz_clear(ten_k);
    fmpz_clear(rest);
    fmpz_clear(half);
}

static slong accurate_digits(const arb_t x)
{
    slong bits = arb_rel_accuracy_bits(x);
    if (arb_is_exact(x)) bits = arb_bits(x);
    if (bits < 1) bits = 1;
    return (slong)((double)bits * 0.30103) + 3;
}

void decimal_ball(text *mid_text, text *radius_text, const arb_t x)
{
    if (!arb_is_finite(x)) {
        text_add(mid_text, "0");
        text_add(radius_text, "inf");
        return;
    }
    fmpz_t mid, rad, exponent;
    fmpz_init(mid);
    fmpz_init(rad);
    fmpz_init(exponent);
    outward_decimal(mid, rad, exponent, x, accurate_digits(x), 3);
    add_decimal(mid_text, mid, exponent, -7);
    add_decimal(radius_text, rad, exponent, -3);
    fmpz_clear(mid);
    fmpz_clear(rad);
    fmpz_clear(exponent);
}

void json_ball(text *out, const arb_t x)
{
    text mid, radius;
    text_init(&mid);
    text_init(&radius);
    decimal_ball(&mid, &radius, x);
    text_addf(out, "{\"mid\": \"%s\", \"radius\": \"%s\"}", mid.bytes, radius.bytes);
    text_clear(&mid);
    text_clear(&radius);
}

void print_ball(text *out, const arb_t x, slong digits)
{
    if (!arb_is_finite(x)) {
        text_add(out, "unbounded");
        return;
    }
    fmpz_t mid, rad, exponent;
    fmpz_init(mid);
    fmpz_init(rad);
    fmpz_init(exponent);
    slong accurate = accurate_digits(x);
    outward_decimal(mid, rad, exponent, x, accurate < digits ? accurate : digits, 2);
    if (fmpz_cmpabs(mid, rad) <= 0) { /* the ball holds 0: its midpoint says nothing */
        fmpz_abs(mid, mid);
        fmpz_add(rad, rad, mid);
        fmpz_zero(mid);
    }
    add_decimal(out, mid, exponent, -7);
    if (!fmpz_is_zero(rad)) {
        text_add(out, " +/- ");
        add_decimal(out, rad, exponent, -3);
    }
    fmpz_clear(mid);
    fmpz_clear(rad);
    fmpz_clear(exponent);
}
