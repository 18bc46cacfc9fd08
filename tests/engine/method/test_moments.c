/* Closed moments: exact, with symbolic exponents and rates; what does not close is not called exact. */
#include "texts.h"

typedef struct closed {
    const char *large, *given, *integral, *value, *source;
} closed;

/* The sum of all contributions is the integral. */
static const closed CASES[] = {
    {"s", "n > -1", "integral from 0 to inf of x^n*exp(-s*x) dx", "Gamma(n + 1)/s^(n + 1)", "DLMF 5.9.1"},
    {"s", "n > -1, a > 0", "integral from 0 to inf of x^n*exp(-(s + a)*x) dx", "Gamma(n + 1)*(s + a)^(-n - 1)",
     "DLMF 5.9.1"},
    {"s", "n > -1, a > 0", "integral from 0 to inf of x^n*exp(-a*s*x^2) dx", "Gamma((n + 1)/2)/2*(a*s)^(-(n + 1)/2)",
     "DLMF 5.9.1"},
    {"s", "b > 0", "integral from 0 to inf of x^4*exp(-s*x^2 - b*x^2) dx", "3*sqrt(pi)/8*(s + b)^(-5/2)", "DLMF 5.9.1"},
    {"s", NULL, "integral from -inf to inf of x^4*exp(-s*x^2) dx", "3*sqrt(pi)/4*s^(-5/2)", "DLMF 5.9.3"},
    {"s", NULL, "integral from -inf to inf of (1 + x)^2*exp(-3*s*(x - 1)^2) dx", "sqrt(pi/(3*s))*(4 + 1/(6*s))",
     "DLMF 5.9.3"},
    {"s", NULL, "integral from 0 to inf of (x^3 + 2*x + sqrt(x))*exp(-(s + 2)*x) dx",
     "6/(s + 2)^4 + 2/(s + 2)^2 + sqrt(pi)/2*(s + 2)^(-3/2)", "DLMF 5.9.1"},
    {"s", NULL, "integral from 0 to inf of (1 + x)^3*exp(-s*x) dx", "1/s + 3/s^2 + 6/s^3 + 6/s^4", "DLMF 5.9.1"},
    {"s", NULL, "integral from 0 to 1 of x^2*exp(-s*x) dx", "2/s^3 - exp(-s)*(1/s + 2/s^2 + 2/s^3)", "parts"},
    {"s", NULL, "integral from 0 to inf of x*log(x)*exp(-s*x) dx", "(1 - euler_constant - log(s))/s^2",
     "DLMF 5.9.19, 5.4.14"},
    {"s", "n > -1", "integral from 0 to inf of x^n*log(x)*exp(-s*x) dx", "Gamma(n + 1)/s^(n + 1)*(psi(n + 1) - log(s))",
     "DLMF 5.9.19"},
    {"small h", NULL, "integral from 0 to inf of x^3*exp(-x^2/(2*h)) dx", "2*h^2", "DLMF 5.9.1"},
    {"s", NULL, "integral from -inf to inf of x*exp(-s*x^2) dx", "0", "odd"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x) + x*exp(-2*s*x) dx", "1/s + 1/(4*s^2)", "DLMF 5.9.1 term by term"},
    {"s", NULL, "2*integral from 0 to inf of exp(-s*x) dx + integral from 0 to inf of x*exp(-s*x) dx/s", "2/s + 1/s^3",
     "DLMF 5.9.1"},
};

static void test_closed(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof CASES / sizeof *CASES; k++) {
        const closed *c = &CASES[k];
        bool small = strncmp(c->large, "small ", 6) == 0;
        tw_engine *e = text_engine(small ? c->large + 6 : c->large, small ? LARGE_SMALL : LARGE_POSITIVE);
        if (c->given) text_given(e, c->given);
        expansion a;
        expansion_init(&a);
        if (expand(e, &a, text_parse(e, c->integral), 2, NULL) != TW_OK)
            fail_msg("%s: %s", c->integral, e->error.words);
        assert_true(a.exact);
        expr *sum = expr_int(e, 0);
        for (size_t n = 0; n < a.contribution_count; n++) {
            assert_true(a.contributions[n].terminates);
            sum = expr_add(e, sum, text_sum(e, &a, n, 100));
        }
        assert_same_value(e, sum, c->value);
        expansion_clear(&a);
        tw_engine_free(e);
    }
}

/* Locally finite is not finite: a kink or a pole elsewhere, or a series that only begins like a polynomial. */
static void test_not_exact(void **state)
{
    (void)state;
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x)*abs(x - 1) dx", "moments", ERROR_UNSUITABLE, "does not close");
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x)*piecewise(1 when x < 1, 2 otherwise) dx", "moments",
                 ERROR_UNSUITABLE, "does not close");
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x)/(1 + x) dx", "moments", ERROR_UNSUITABLE,
                 "does not close");
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expansion a;
    expansion_init(&a);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-s*x)*(1 + x^7/(1 + x)) dx"), 3, NULL),
                     TW_OK);
    assert_false(a.exact);
    assert_string_equal(a.made_by->name, "watson");
    expansion_clear(&a);
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_closed),
        cmocka_unit_test(test_not_exact),
    };
    return cmocka_run_group_tests_name("moments", tests, NULL, NULL);
}
