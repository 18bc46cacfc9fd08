/* Balls printed as decimals: the text must name a ball that holds the ball it was made from. Arb's own reader (arb_set_str) is
 * the judge. */
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/export/format.h"

static void read_decimal(arb_t out, const char *words)
{
    assert_int_equal(arb_set_str(out, words, 4000), 0);
}

/* Is x inside mid +- radius, both read from text? One unit in the last place of 4000 bits is allowed for the reading. */
static void assert_holds(const char *mid, const char *radius, const arb_t x)
{
    arb_t m, r, low, high, t;
    arb_init(m);
    arb_init(r);
    arb_init(low);
    arb_init(high);
    arb_init(t);
    read_decimal(m, mid);
    read_decimal(r, radius);
    arb_sub(low, m, r, 4000);
    arb_add(high, m, r, 4000);
    arb_get_lbound_arf(arb_midref(t), x, 4000);
    assert_false(arb_lt(t, low));
    arb_get_ubound_arf(arb_midref(t), x, 4000);
    assert_false(arb_gt(t, high));
    arb_clear(m);
    arb_clear(r);
    arb_clear(low);
    arb_clear(high);
    arb_clear(t);
}

static void check(const arb_t x, slong digits)
{
    text mid, radius, shown;
    text_init(&mid);
    text_init(&radius);
    text_init(&shown);
    decimal_ball(&mid, &radius, x);
    assert_holds(mid.bytes, radius.bytes, x);
    print_ball(&shown, x, digits);
    char *sign = strstr(shown.bytes, " +/- ");
    if (sign) {
        *sign = '\0';
        assert_holds(shown.bytes, sign + 5, x);
    } else {
        assert_holds(shown.bytes, "0", x);
    }
    text_clear(&mid);
    text_clear(&radius);
    text_clear(&shown);
}

static void test_random(void **state)
{
    (void)state;
    flint_rand_t r;
    flint_randinit(r);
    const char *seed = getenv("TW_SEED");
    ulong s = seed ? strtoul(seed, NULL, 10) : 20261201;
    print_message("seed %lu\n", s);
    for (ulong k = 0; k < s % 1000; k++) n_randlimb(r);
    arb_t x;
    arb_init(x);
    for (int k = 0; k < 20000; k++) {
        arb_randtest(x, r, 1 + (slong)n_randint(r, 300), 1 + (slong)n_randint(r, 11));
        if (arb_is_finite(x)) check(x, 1 + (slong)n_randint(r, 40));
    }
    arb_clear(x);
    flint_randclear(r);
}

static void assert_prints(const char *ball, slong digits, const char *want)
{
    arb_t x;
    text out;
    arb_init(x);
    text_init(&out);
    read_decimal(x, ball);
    print_ball(&out, x, digits);
    assert_string_equal(out.bytes, want);
    text_clear(&out);
    arb_clear(x);
}

static void test_forms(void **state)
{
    (void)state;
    assert_prints("0.0990741 +/- 4.4e-6", 10, "0.0990741 +/- 4.5e-6");
    assert_prints("0.5", 10, "0.5");
    assert_prints("-1200", 10, "-1200");
    assert_prints("2.25e-434298", 10, "2.25e-434298 +/- 1e-434307"); /* no dyadic number */
    assert_prints("0 +/- 1e-30", 10, "0 +/- 1.1e-30");
    assert_prints("123456789", 4, "123500000 +/- 100000");
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_random), cmocka_unit_test(test_forms)};
    int failed = cmocka_run_group_tests_name("decimal", tests, NULL, NULL);
    flint_cleanup();
    return failed;
}
