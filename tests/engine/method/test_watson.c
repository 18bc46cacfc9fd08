/* Watson's lemma: kernels and amplitudes of all the kinds that it takes, against published expansions and closed forms.
 */
#include "texts.h"

static const text_case CASES[] = {
    {"s", NULL, "integral from 0 to inf of exp(-s*x)/(1 + x) dx", 5, "watson", "1/s - 1/s^2 + 2/s^3 - 6/s^4 + 24/s^5",
     NULL, "DLMF 6.12.1 with 6.2.2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)/(sqrt(x)*(1 + x)) dx", 4, "watson",
     "sqrt(pi)*(s^(-1/2) - s^(-3/2)/2 + 3/4*s^(-5/2) - 15/8*s^(-7/2))", NULL, "DLMF 7.12.1 with 7.7.1"},
    {"s", "a > -5", "integral from 0 to inf of exp(-s*x)*(1 + x)^(a - 1) dx", 4, NULL,
     "1/s + (a - 1)/s^2 + (a - 1)*(a - 2)/s^3 + (a - 1)*(a - 2)*(a - 3)/s^4", NULL, "DLMF 8.11.2"},
    {"s", "nu > -1/2", "integral from 0 to inf of exp(-s*t)*(1 + t^2)^(nu - 1/2) dt", 3, NULL,
     "1/s + (2*nu - 1)/s^3 + (2*nu - 1)*(2*nu - 3)*3/s^5", NULL, "DLMF 11.6.1 with 11.5.2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*t)*(1/(exp(t) - 1) - 1/t + 1/2)/t dt", 4, NULL,
     "1/(12*s) - 1/(360*s^3) + 1/(1260*s^5) - 1/(1680*s^7)", NULL, "DLMF 5.11.1 with 5.9.10_2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*log(x) dx", 2, "watson", "-log(s)/s - euler_constant/s", NULL,
     "DLMF 5.9.18"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*log(x)^2 dx", 3, "watson",
     "((log(s) + euler_constant)^2 + pi^2/6)/s", NULL, "DLMF 5.9.19 with 5.4.12 and 5.4 (psi'(1) = zeta(2))"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*log(x)^3 dx", 4, "watson",
     "-((log(s) + euler_constant)^3 + 3*(log(s) + euler_constant)*pi^2/6 + 2*zeta(3))/s", NULL,
     "DLMF 5.9.19, third derivative"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*log(x)/sqrt(x) dx", 2, "watson",
     "sqrt(pi/s)*(-euler_constant - 2*log(2) - log(s))", NULL, "DLMF 5.9.19 with 5.4.13"},
    {"s", NULL, "integral from 0 to inf of exp(-5*s*x^3)*log(x)/(1 + x^9) dx", 2, "watson",
     "Gamma(1/3)*(5*s)^(-1/3)/9*(psi(1/3) - log(5*s))", NULL, "DLMF 2.3.9; psi(1/3) from Arb"},
    {"s", NULL, "integral from 0 to inf of x^(-3/4)*exp(-s*x)*log(x)/(1 + x^9) dx", 2, "watson",
     "Gamma(1/4)*s^(-1/4)*(psi(1/4) - log(s))", NULL, "DLMF 2.3.9"},
    {"s", NULL, "integral from 0 to inf of x^(-1/5)*exp(-s*x)*log(x)^2/(1 + x^9) dx", 3, "watson",
     "Gamma(4/5)*s^(-4/5)*((psi(4/5) - log(s))^2 + polygamma(1, 4/5))", NULL, "DLMF 2.3.9 twice"},
    {"s", NULL, "integral from 0 to inf of x^(-1/6)*exp(-s*x)*log(x)*(1 + x) dx", 4, NULL,
     "Gamma(5/6)*s^(-5/6)*(psi(5/6) - log(s)) + Gamma(11/6)*s^(-11/6)*(psi(11/6) - log(s))", NULL, "DLMF 2.3.9"},
    {"s", "n > -1", "integral from 0 to inf of x^n*log(x)*exp(-s*x)/(1 + x^2) dx", 2, NULL,
     "Gamma(n + 1)*s^(-n - 1)*(psi(n + 1) - log(s))", NULL, "DLMF 2.3.9, symbolic exponent"},
    {"s", "n > -1", "integral from 0 to inf of x^n*log(x)*exp(-s*x)*(1 - x) dx", 4, "watson",
     "Gamma(n + 1)*s^(-n - 1)*(psi(n + 1) - log(s)) - Gamma(n + 2)*s^(-n - 2)*(psi(n + 2) - log(s))", NULL,
     "DLMF 2.3.9"},
    {"s", "nu > -1", "integral from 0 to inf of x^nu*exp(-s*x)/(1 + x^2) dx", 3, NULL,
     "Gamma(nu + 1)*s^(-nu - 1) - Gamma(nu + 3)*s^(-nu - 3) + Gamma(nu + 5)*s^(-nu - 5)", NULL, "DLMF 2.3.8"},
    {"s", "a > 0, b > 0", "integral from 0 to inf of t^(a - 1)*(1 + t)^(b - a - 1)*exp(-s*t) dt", 3, NULL,
     "Gamma(a)*s^(-a)*(1 - a*(a - b + 1)/s + a*(a + 1)*(a - b + 1)*(a - b + 2)/(2*s^2))", NULL,
     "DLMF 13.7.3 with 13.4.4"},
    {"s", "a > 0", "integral from 0 to inf of exp(-a*s*x)/(1 + x) dx", 3, NULL, "1/(a*s) - 1/(a*s)^2 + 2/(a*s)^3", NULL,
     "DLMF 6.12.1"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*cosh(nu*x)/(1 + x) dx", 4, NULL,
     "1/s - 1/s^2 + (2 + nu^2)/s^3 - (6 + 3*nu^2)/s^4", NULL, "DLMF 2.3.2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*sqrt(x))/(1 + x) dx", 3, NULL, "2/s^2 - 12/s^4 + 240/s^6", NULL,
     "x = u^2, DLMF 2.3.2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x^3)*exp(-x) dx", 4, NULL,
     "Gamma(1/3)/3*s^(-1/3) - Gamma(2/3)/3*s^(-2/3) + 1/(6*s) - Gamma(4/3)/18*s^(-4/3)", NULL, "DLMF 2.3.8"},
    {"s", NULL, "integral from -inf to inf of exp(-s*x^2)/(1 + x^2) dx", 3, NULL,
     "sqrt(pi)*(s^(-1/2) - s^(-3/2)/2 + 3/4*s^(-5/2))", NULL, "DLMF 7.12.1 with 7.7.1: pi*exp(s)*erfc(sqrt(s))"},
    {"s", NULL, "integral from -inf to inf of exp(-s*(x - c)^2)/(1 + x^2) dx", 2, NULL,
     "sqrt(pi/s)*(1/(1 + c^2) + (3*c^2 - 1)/(2*(1 + c^2)^3*s))", NULL, "DLMF 2.3.15: half the second derivative"},
    {"s", NULL, "integral from -1 to inf of exp(-s*x^2)/(2 + x) dx", 2, NULL, "sqrt(pi/s)*(1/2 + 1/(16*s))",
     "-exp(-s)*(1/(2*s) + 1/(4*s^3))", "DLMF 2.3.15 and parts at the far end"},
    {"s", NULL, "integral from -inf to inf of exp(-s*abs(x))/(2 + x) *exp(-x^2)*(2+x) dx", 3, NULL,
     "2/s - 4/s^3 + 24/s^5", NULL, "DLMF 2.3.2 on both sides"},
    {"s", NULL, "integral from 0 to 2 of exp(-s*x)/(1 + x)^2 dx", 3, NULL, "1/s - 2/s^2 + 6/s^3",
     "-exp(-2*s)*(1/(9*s) - 2/(27*s^2) + 6/(81*s^3))", "DLMF 2.3.2 at both ends"},
    {"s", NULL, "integral from 0 to 1 of exp(-s*x^2)*(1 + x) dx", 2, "watson", "sqrt(pi/s)/2 + 1/(2*s)",
     "-exp(-s)*(1/s - 1/(4*s^2))", "far end in t = x^2: DLMF 2.3.4 turned"},
    {"s", NULL, "integral from -inf to 2 of exp(s*x)/(3 - x) dx", 3, NULL, "exp(2*s)*(1/s - 1/s^2 + 2/s^3)", NULL,
     "mirrored, DLMF 6.12.1"},
    {"s", NULL, "3*integral from 1 to 0 of exp(-s*x)*exp(-1/2*x)/(1 - x/4) dx/pi", 2, NULL, "-3/pi*(1/s - 1/(4*s^2))",
     "3/pi*exp(-s - 1/2)*(4/3/s - 2/9/s^2)", "a path turned round"},
    {"s", NULL, "integral from 0 to inf of exp(-x)/(1 + x/s)^(5/2) dx", 3, NULL, "1 - 5/2/s + 35/4/s^2", NULL,
     "x = s*t"},
    {"s", NULL, "integral from 0 to inf of exp(-x^2)/(s + x) dx", 3, NULL,
     "sqrt(pi)/(2*s) - 1/(2*s^2) + sqrt(pi)/(4*s^3)", NULL, "x = s*t"},
    {"s", NULL, "integral from 0 to s of exp(-x)*sqrt(1 - x/s) dx", 3, NULL, "1 - 1/(2*s) - 1/(4*s^2)", NULL,
     "the end moves with s"},
    {"s", NULL, "integral from 0 to inf of exp(-x - x^2/s) dx", 3, NULL, "1 - 2/s + 12/s^2", NULL, "two scales"},
    {"s", NULL, "integral from 0 to inf of exp(-(s + 1)*x)/(1 + x) dx", 3, NULL, "1/s - 2/s^2 + 5/s^3", NULL, "s + 1"},
    {"s", NULL, "integral from 0 to inf of exp(-s^2*x - x)/(1 + x) dx", 3, NULL, "1/s^2 - 2/s^4 + 5/s^6", NULL, "s^2"},
    {"s", NULL, "integral from 0 to inf of exp(-sqrt(s)*x)/(1 + x) dx", 3, NULL, "s^(-1/2) - 1/s + 2*s^(-3/2)", NULL,
     "sqrt(s)"},
    {"small h", NULL, "integral from 0 to inf of exp(-x/h)/(1 + x) dx", 3, NULL, "h - h^2 + 2*h^3", NULL, "small h"},
    {"small h", NULL, "integral from 0 to inf of exp(-x/h^2)/(1 + x) dx", 3, NULL, "h^2 - h^4 + 2*h^6", NULL, "h^2"},
    {"small h", NULL, "integral from 0 to inf of sqrt(x)*(1 + x)^(1/3)*exp(-x^2/(2*h)) dx", 2, NULL,
     "(2*h)^(3/4)*Gamma(3/4)/2 + (2*h)^(5/4)*Gamma(5/4)/6", NULL, "DLMF 2.3.8"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*K(0, x) dx", 2, NULL, "(log(2*s))/s", NULL,
     "DLMF 10.31.2 and 2.3.9"},
    {"s", NULL, "integral from 0 to inf of exp(-pi*s*x)*sqrt(1 + x) dx", 3, NULL,
     "1/(pi*s) + 1/(2*pi^2*s^2) - 1/(4*pi^3*s^3)", NULL, "DLMF 2.3.2"},
};

static void test_cases(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof CASES / sizeof *CASES; k++) text_check(&CASES[k]);
}

/* The constants of the lanes are the plain ones, and rational coefficients stay rational. */
static void test_constants(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expansion a;
    expansion_init(&a);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1 + x) dx"), 4, NULL),
                     TW_OK);
    assert_int_equal(a.contributions[0].lane_count, 1);
    const lane *l = &a.contributions[0].lanes[0];
    assert_text(e, l->constant, "Gamma(1/3)");
    assert_text(e, l->first_exponent, "-1/3");
    assert_int_equal(a.contributions[0].domain, DOMAIN_RATIONAL);
    assert_text(e, coefficient_expr(e, &l->c, 3), "-28/27");
    expansion_clear(&a);
    expansion_init(&a);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-8*s*x^3)/(1 + x^3) dx"), 4, NULL),
                     TW_OK);
    assert_text(e, a.contributions[0].lanes[0].constant, "Gamma(1/3)");
    assert_text(e, coefficient_expr(e, &a.contributions[0].lanes[0].c, 0), "1/6");
    expansion_clear(&a);
    tw_engine_free(e);
}

/* Extending gives what asking for more at once gives, and the terms kept before are the same. */
static void test_extend(void **state)
{
    (void)state;
    static const char *const integrals[] = {
        "integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx",
        "integral from 0 to inf of exp(-s*x^2)/(1 + x) dx",
        "integral from 0 to inf of exp(-s*x)*log(x)/(1 + x) dx",
        "integral from 0 to 1 of exp(-s*x)*x^(1/3)/(1 + x) dx",
    };
    for (size_t k = 0; k < sizeof integrals / sizeof *integrals; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        expansion few, many;
        expansion_init(&few);
        expansion_init(&many);
        expr *integral = text_parse(e, integrals[k]);
        assert_int_equal(expand(e, &few, integral, 3, NULL), TW_OK);
        expr *before = text_sum(e, &few, 0, 3);
        assert_int_equal(expand(e, &many, integral, 17, NULL), TW_OK);
        assert_int_equal(expansion_extend(e, &few, 17), TW_OK);
        assert_ptr_equal(text_sum(e, &few, 0, 3), before);
        for (size_t c = 0; c < many.contribution_count; c++)
            assert_ptr_equal(text_sum(e, &few, c, 17), text_sum(e, &many, c, 17));
        expansion_clear(&few);
        expansion_clear(&many);
        tw_engine_free(e);
    }
}

/* Just as many nonzero terms as asked for, in falling order of size. */
static void test_count(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expr *integral = text_parse(e, "integral from 0 to inf of exp(-s*x^(3/2))*cos(x)*(1 + x^(1/2)) dx");
    for (slong n = 1; n < 20; n += 3) {
        expansion a;
        expansion_init(&a);
        assert_int_equal(expand(e, &a, integral, n, NULL), TW_OK);
        term *list;
        slong found;
        assert_int_equal(expansion_order(e, &a, 0, n + 5, &list, &found), TW_OK);
        assert_int_equal(found, n);
        const lane *l = a.contributions[0].lanes;
        for (slong k = 1; k < found; k++) {
            expr *up = expr_add(e, l[list[k - 1].lane].first_exponent,
                                expr_mul(e, expr_fmpq(e, l[list[k - 1].lane].step), expr_int(e, list[k - 1].n)));
            expr *down = expr_add(e, l[list[k].lane].first_exponent,
                                  expr_mul(e, expr_fmpq(e, l[list[k].lane].step), expr_int(e, list[k].n)));
            assert_true(fmpq_cmp(expr_number(up), expr_number(down)) >= 0);
        }
        free(list);
        expansion_clear(&a);
    }
    tw_engine_free(e);
}

/* The local form is the integral: its factor, scale and branches put together and expanded again give the same terms.
 */
static void test_local_form(void **state)
{
    (void)state;
    static const char *const integrals[] = {
        "2*integral from 1 to inf of exp(-3*s*x)/(1 + x) dx",
        "integral from 0 to inf of exp(-x)/(1 + x/s)^(5/2) dx",
        "integral from -inf to 1 of exp(s*x)*cos(x) dx",
    };
    for (size_t k = 0; k < sizeof integrals / sizeof *integrals; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        expansion a, b;
        expansion_init(&a);
        expansion_init(&b);
        assert_int_equal(expand(e, &a, text_parse(e, integrals[k]), 5, NULL), TW_OK);
        const local_form *l = &a.contributions[0].local;
        assert_int_equal(l->count, 1);
        assert_false(expr_has(l->branches[0].q, a.large) || expr_has(l->branches[0].p, a.large));
        if (expand(e, &b, local_form_integral(e, l), 5, NULL) != TW_OK) fail_msg("%s", e->error.words);
        assert_ptr_equal(text_sum(e, &a, 0, 5), text_sum(e, &b, 0, 5));
        expansion_clear(&a);
        expansion_clear(&b);
        tw_engine_free(e);
    }
}

static void test_refusals(void **state)
{
    (void)state;
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*x)*exp(-1/x)/(1 + x) dx", NULL, ERROR_UNSUITABLE, "smaller than every power");
    text_refused("s", "nu > -1", "integral from 0 to inf of (x^nu + x)*exp(-s*x)/(1 + x) dx", NULL, ERROR_UNDECIDED,
                 "exponents");
    text_refused("s", NULL, "integral from 0 to inf of exp(-s*sinh(x)) dx", "watson", ERROR_UNSUITABLE, "pure power");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_cases), cmocka_unit_test(test_constants),  cmocka_unit_test(test_extend),
        cmocka_unit_test(test_count), cmocka_unit_test(test_local_form), cmocka_unit_test(test_refusals),
    };
    return cmocka_run_group_tests_name("watson", tests, NULL, NULL);
}
