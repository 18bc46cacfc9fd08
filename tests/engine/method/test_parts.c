/* Integration by parts: ends, general exponents, the exact remainder. */
#include "texts.h"

static const text_case CASES[] = {
    {"s", NULL, "integral from 1 to inf of exp(-s*x)/(x^2*(1 + x)) dx", 3, "parts",
     "exp(-s)*(1/(2*s) - 5/4/s^2 + 17/4/s^3)", NULL, "DLMF 2.3.2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*sinh(x))/(1 + x) dx", 4, NULL, "1/s - 1/s^2 + 1/s^3 - 2/s^4", NULL,
     "DLMF 2.3.15"},
    {"s", "nu > 0", "integral from 0 to inf of exp(-s*sinh(t) - nu*t) dt", 4, NULL,
     "1/s - nu/s^2 + (nu^2 - 1)/s^3 - nu*(nu^2 - 4)/s^4", NULL, "DLMF 11.11.2 with 11.10.4, from memory"},
    {"s", "p > 1", "integral from 1 to inf of exp(-s*t)/t^p dt", 3, "parts", "exp(-s)/s*(1 - p/s + p*(p + 1)/s^2)",
     NULL, "DLMF 8.20.2"},
    {"s", NULL, "integral from 0 to 1 of exp(-s*x)*cos(x) dx", 3, "parts", "1/s - 1/s^3 + 1/s^5",
     "exp(-s)*(-cos(1)/s + sin(1)/s^2 + cos(1)/s^3)", "DLMF 2.3.2 at both ends"},
    {"s", NULL, "integral from 0 to 1 of exp(-s*(x + x^2)) dx", 3, NULL, "1/s - 2/s^2 + 12/s^3",
     "-exp(-2*s)*(1/(3*s) - 2/(27*s^2) + 12/(243*s^3))", "DLMF 2.3.2 with D f = (f/p')'"},
    {"s", NULL, "integral from 0 to inf of (1 + x)^(-s)*exp(-x) dx", 3, NULL, "1/s - 1/s^3 - 1/s^4", NULL,
     "DLMF 8.20.2 with exp(1): p = s, the term 1/s*(1 + ...) in powers of 1/s"},
    {"s", NULL, "integral from 0 to inf of (1 + x)^(-s)*x^2 dx", 3, NULL, "2/s^3 + 12/s^4 + 50/s^5", NULL,
     "2/((s - 1)*(s - 2)*(s - 3)), DLMF 5.12.3"},
    {"s", NULL, "integral from 0 to 1 of x^s*cos(x) dx", 3, NULL, "cos(1)/s + (sin(1) - cos(1))/s^2", NULL,
     "x = exp(-t)"},
    {"s", NULL, "integral from 1 to inf of exp(-s*x^2)/(1 + x) dx", 3, NULL,
     "exp(-s)*(1/(4*s) - 3/(16*s^2) + 5/(16*s^3))", NULL, "DLMF 2.3.2 with D f = (f/p')'"},
    {"s", "a > 0", "integral from 0 to inf of exp(-s*(x + a*x^2))/(2 + x) dx", 2, NULL, "1/(2*s) - (a + 1/4)/s^2", NULL,
     "D f = (f/p')'"},
    {"small h", NULL, "integral from 0 to inf of exp(-sinh(x)/h)*(1 + x) dx", 4, "parts", "h + h^2 - h^3 - 4*h^4", NULL,
     "D f = (f/p')'"},
};

static void test_cases(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof CASES / sizeof *CASES; k++) text_check(&CASES[k]);
}

/* The recorded remainder after n steps is the integral minus the end terms, exactly: checked in a closed family, where
 * the remainder integral can be expanded again and must carry on the series. */
static void test_remainder(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expansion a;
    expansion_init(&a);
    assert_int_equal(
        expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-s*(x + x^2/2))*exp(-x) dx"), 6, "parts"), TW_OK);
    slong steps = 0;
    for (size_t k = 0; k < a.derivation.count; k++) {
        expr *rest = a.derivation.steps[k].remainder;
        if (!rest) continue;
        steps++;
        expansion b;
        expansion_init(&b);
        if (expand(e, &b, rest, 6 - steps, "parts") != TW_OK) fail_msg("%s", e->error.words);
        expr *tail = expr_sub(e, text_sum(e, &a, 0, 6), text_sum(e, &a, 0, steps));
        assert_ptr_equal(expr_expand(e, text_sum(e, &b, 0, 6 - steps)), expr_expand(e, tail));
        expansion_clear(&b);
    }
    assert_true(steps >= 2);
    expansion_clear(&a);
    tw_engine_free(e);
}

static void test_refusals(void **state)
{
    (void)state;
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x)*sqrt(x)/(1 + x) dx", "parts", ERROR_UNSUITABLE,
                 "smooth");
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x^2)/(1 + x) dx", "parts", ERROR_UNSUITABLE, "slope");
    text_refused("s", NULL, "integral from 0 to 1 of exp(-s*(x^2 + x^3)) dx", "parts", ERROR_UNSUITABLE, "slope");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_cases),
        cmocka_unit_test(test_remainder),
        cmocka_unit_test(test_refusals),
    };
    return cmocka_run_group_tests_name("parts", tests, NULL, NULL);
}
