/* The checking of rules: right ones pass, wrong ones are refuted, on rules of our own with the slips that people make: a
 * lost factor, a branch, a condition, right only for whole numbers, an end forgotten. */
#include "tests/engine/rewrite/texts.h"

#include <stdio.h>

#include "engine/rewrite/check.h"

typedef struct verdict_case {
    const char *text;
    rule_status status; /* PASSED stands for proved, too */
} verdict_case;

static const verdict_case cases[] = {
    /* elementary, with their branches */
    {"rule r(x): sqrt(x^2) becomes x", RULE_REFUTED},
    {"rule r(x): sqrt(x^2) becomes x when x >= 0", RULE_PASSED},
    {"rule r(x): sqrt(x^2) becomes abs(x)", RULE_PASSED},
    {"rule r(z): sqrt(z^2) becomes abs(z) when z complex", RULE_REFUTED},
    {"rule r(z): sqrt(z^2) becomes z when z complex, re(z) > 0", RULE_PASSED},
    {"rule r(a, b): log(a*b) becomes log(a) + log(b)", RULE_REFUTED},
    {"rule r(a, b): log(a*b) becomes log(a) + log(b) when a > 0", RULE_PASSED},
    {"rule r(a, b): log(a*b) becomes log(a) + log(b) when a > 0, b complex", RULE_PASSED},
    {"rule r(a, b): log(a*b) becomes log(a) + log(b) when a complex, b complex, re(a) > 0, re(b) > 0", RULE_PASSED},
    {"rule r(a, n): log(a^n) becomes n*log(a)", RULE_REFUTED},
    {"rule r(a, n): log(a^n) becomes n*log(a) when a > 0", RULE_PASSED},
    {"rule r(x): asin(sin(x)) becomes x", RULE_REFUTED},
    {"rule r(x): asin(sin(x)) becomes x when x in [-pi/2, pi/2]", RULE_PASSED},
    {"rule r(x): atan(tan(x)) becomes x when x in (-2, 2)", RULE_REFUTED},
    {"rule r(x): acos(cos(x)) becomes x when x in [0, pi]", RULE_PASSED},
    {"rule r(x): acos(cos(x)) becomes x when x in [-pi, pi]", RULE_REFUTED},
    {"rule r(x, y, a): x^a*y^a becomes (x*y)^a", RULE_REFUTED},
    {"rule r(x, y, a): x^a*y^a becomes (x*y)^a when a integer", RULE_PASSED},
    {"rule r(x, y, a): x^a*y^a becomes (x*y)^a when x > 0", RULE_PASSED},
    {"rule r(x, a, b): (x^a)^b becomes x^(a*b) when x > 0", RULE_PASSED},
    {"rule r(x, a, b): (x^a)^b becomes x^(a*b)", RULE_REFUTED},
    {"rule r(x, y): atan(x) + atan(y) becomes atan((x + y)/(1 - x*y))", RULE_REFUTED},
    {"rule r(x, y): atan(x) + atan(y) becomes atan((x + y)/(1 - x*y)) when x*y < 1", RULE_PASSED},
    {"rule r(x): atan(1/x) becomes pi/2 - atan(x)", RULE_REFUTED},
    {"rule r(x): atan(1/x) becomes pi/2 - atan(x) when x > 0", RULE_PASSED},
    {"rule r(x): log(exp(x)) becomes x", RULE_PASSED},
    {"rule r(z): log(exp(z)) becomes z when z complex", RULE_REFUTED},
    {"rule r(x): abs(x) becomes x when x > -1/100", RULE_REFUTED},
    {"rule r(x): sin(x)^2 becomes (1 + cos(2*x))/2", RULE_REFUTED},
    {"rule r(x): sin(x)^2 becomes (1 - cos(2*x))/2", RULE_PASSED},
    {"rule r(x): cosh(x)^2 + sinh(x)^2 becomes 1", RULE_REFUTED},
    {"rule r(x): cosh(x)^2 - sinh(x)^2 becomes 1", RULE_PASSED},
    {"rule r(n): sin(pi*n) becomes 0", RULE_REFUTED},
    {"rule r(n): sin(pi*n) becomes 0 when n integer", RULE_PASSED},
    {"rule r(n): cos(pi*n) becomes (-1)^n when n integer", RULE_PASSED},
    {"rule r(n): cos(pi*n) becomes (-1)^n", RULE_REFUTED},
    {"rule r(x): acosh(cosh(x)) becomes x", RULE_REFUTED},
    {"rule r(x): tanh(x/2) becomes (cosh(x) - 1)/sinh(x)", RULE_PASSED},
    /* special functions */
    {"rule r(a): Gamma(a + 1) becomes a*Gamma(a) because \"DLMF 5.5.1\"", RULE_PASSED},
    {"rule r(a): Gamma(a + 1) becomes (a + 1)*Gamma(a)", RULE_REFUTED},
    {"rule r(z): Gamma(z)*Gamma(1 - z) becomes pi/sin(pi*z) when z complex because \"DLMF 5.5.3\"", RULE_PASSED},
    {"rule r(z): Gamma(z)*Gamma(1 - z) becomes pi/sin(z)", RULE_REFUTED},
    {"rule r(z): Gamma(2*z) becomes 2^(2*z - 1)*Gamma(z)*Gamma(z + 1/2)/sqrt(pi) because \"DLMF 5.5.5\"", RULE_PASSED},
    {"rule r(z): Gamma(2*z) becomes 2^(2*z)*Gamma(z)*Gamma(z + 1/2)/sqrt(pi)", RULE_REFUTED},
    {"rule r(a, b): Beta(a, b) becomes Gamma(a)*Gamma(b)/Gamma(a + b) when a > 0, b > 0 because \"DLMF 5.12.1\"", RULE_PASSED},
    {"rule r(a, b): Beta(a, b) becomes Gamma(a)*Gamma(b)/Gamma(a*b) when a > 0, b > 0", RULE_REFUTED},
    {"rule r(nu, x): J(nu - 1, x) + J(nu + 1, x) becomes 2*nu/x*J(nu, x) when x > 0 because \"DLMF 10.6.1\"", RULE_PASSED},
    {"rule r(nu, x): J(nu - 1, x) - J(nu + 1, x) becomes 2*nu/x*J(nu, x) when x > 0", RULE_REFUTED},
    {"rule r(nu, x): J(-nu, x) becomes (-1)^nu*J(nu, x) when x > 0", RULE_REFUTED},
    {"rule r(nu, x): J(-nu, x) becomes (-1)^nu*J(nu, x) when x > 0, nu integer because \"DLMF 10.4.1\"", RULE_PASSED},
    {"rule r(nu, x): K(-nu, x) becomes K(nu, x) when x > 0 because \"DLMF 10.27.3\"", RULE_PASSED},
    {"rule r(x): erf(x) becomes 1 + erfc(x)", RULE_REFUTED},
    {"rule r(x): erfc(x) becomes 1 - erf(x)", RULE_PASSED},
    {"rule r(x): E1(x) becomes Gamma(0, x) when x > 0 because \"DLMF 6.11.1\"", RULE_PASSED},
    {"rule r(a, x): Gamma(a + 1, x) becomes a*Gamma(a, x) + x^a*exp(-x) when x > 0 because \"DLMF 8.8.2\"", RULE_PASSED},
    {"rule r(a, x): Gamma(a + 1, x) becomes a*Gamma(a, x) - x^a*exp(-x) when x > 0", RULE_REFUTED},
    {"rule r(x): psi(x + 1) becomes psi(x) + 1/x because \"DLMF 5.5.2\"", RULE_PASSED},
    /* integrals */
    {"rule r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx becomes Gamma(n + 1)/a^(n + 1) when n > -1, a > 0", RULE_PASSED},
    {"rule r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx becomes Gamma(n + 1)/a^n when n > -1, a > 0", RULE_REFUTED},
    {"rule r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx becomes Gamma(n + 1)/a^(n + 1) when a > 0", RULE_REFUTED},
    {"rule r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx becomes Gamma(n + 1)/a^(n + 1) when n > -1", RULE_REFUTED},
    {"rule r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx becomes Gamma(n + 1)/a^(n + 1) when n > -1, a complex, re(a) > 0",
     RULE_PASSED},
    {"rule r(a): integral from -inf to inf of exp(-a*x^2) dx becomes sqrt(pi/a) when a > 0", RULE_PASSED},
    {"rule r(a): integral from 0 to inf of exp(-a*x^2) dx becomes sqrt(pi/a) when a > 0", RULE_REFUTED},
    {"rule r(a, b): integral from -inf to inf of exp(-a*x^2)*cos(b*x) dx becomes sqrt(pi/a)*exp(-b^2/(4*a)) when a > 0",
     RULE_PASSED},
    {"rule r(a, b): integral from -inf to inf of exp(-a*x^2)*cos(b*x) dx becomes sqrt(pi/a)*exp(-b^2/(2*a)) when a > 0",
     RULE_REFUTED},
    {"rule r(a, b): integral from 0 to inf of exp(-a*x)*cos(b*x) dx becomes a/(a^2 + b^2) when a > 0", RULE_PASSED},
    {"rule r(a, b): integral from 0 to inf of exp(-a*x)*cos(b*x) dx becomes b/(a^2 + b^2) when a > 0", RULE_REFUTED},
    {"rule r(a, b): integral from 0 to 1 of x^(a - 1)*(1 - x)^(b - 1) dx becomes Beta(a, b) when a > 0, b > 0", RULE_PASSED},
    {"rule r(a, b): integral from 0 to 1 of x^(a - 1)*(1 - x)^(b - 1) dx becomes Beta(a, b) when a > 0", RULE_REFUTED},
    {"rule r(a, b): integral from 0 to 1 of x^a*(1 - x)^b dx becomes Beta(a, b) when a > 0, b > 0", RULE_REFUTED},
    {"rule r(nu, z): integral from 0 to inf of exp(-z*cosh(t))*cosh(nu*t) dt becomes K(nu, z) when z > 0 because \"DLMF 10.32.9\"",
     RULE_PASSED},
    {"rule r(nu, z): integral from 0 to inf of exp(-z*cosh(t))*sinh(nu*t) dt becomes K(nu, z) when z > 0", RULE_REFUTED},
    {"rule r(n, a, b): integral from a to b of x^n dx becomes (b^(n + 1) - a^(n + 1))/(n + 1) when a > 0, b > 0, n != -1",
     RULE_PASSED},
    {"rule r(n, a, b): integral from a to b of x^n dx becomes (b^(n + 1) - a^(n + 1))/n when a > 0, b > 0, n != 0", RULE_REFUTED},
    {"rule r(a, b): integral from a to b of 1/x dx becomes log(b/a) when a > 0, b > 0", RULE_PASSED},
    {"rule r(a): integral from 0 to inf of 1/(x^2 + a^2) dx becomes pi/(2*a)", RULE_REFUTED},
    {"rule r(a): integral from 0 to inf of 1/(x^2 + a^2) dx becomes pi/(2*a) when a > 0", RULE_PASSED},
    {"rule r(m): integral from 0 to inf of x^(m - 1)/(1 + x) dx becomes pi/sin(pi*m) when m > 0, m < 1", RULE_PASSED},
    {"rule r(m): integral from 0 to inf of x^(m - 1)/(1 + x) dx becomes pi/sin(pi*m) when m > 0", RULE_REFUTED},
    {"rule r(n): integral from 0 to 2*pi of cos(n*x)^2 dx becomes pi", RULE_REFUTED},
    {"rule r(n): integral from 0 to 2*pi of cos(n*x)^2 dx becomes pi when n integer, n > 0", RULE_PASSED},
    {"rule r(n): integral from 0 to 2*pi of cos(n*x)^2 dx becomes pi when n integer", RULE_REFUTED},
    {"rule r(n, a): sum from k = 0 to n of a^k becomes (1 - a^(n + 1))/(1 - a) when n integer, n >= 0, a != 1", RULE_PASSED},
    {"rule r(n, a): sum from k = 0 to n of a^k becomes (1 - a^n)/(1 - a) when n integer, n >= 0, a != 1", RULE_REFUTED},
    {"rule r(n): sum from k = 1 to n of k becomes n*(n + 1)/2 when n integer, n > 0", RULE_PASSED},
    /* pattern functions */
    {"rule r(f(x), g(x), a, b): integral from a to b of f(x) + g(x) dx becomes integral from a to b of f(x) dx + "
     "integral from a to b of g(x) dx", RULE_PASSED},
    {"rule r(f(x), g(x), a, b): integral from a to b of f(x)*g(x) dx becomes (integral from a to b of f(x) dx)*"
     "integral from a to b of g(x) dx", RULE_REFUTED},
    {"rule r(c, f(x), a, b): integral from a to b of c*f(x) dx becomes c*integral from a to b of f(x) dx", RULE_PASSED},
    {"rule r(f(x), a, b, c): integral from a to b of f(x) dx becomes integral from a to c of f(x) dx + "
     "integral from c to b of f(x) dx when a < b", (rule_status)-1}, /* c is not bound by the pattern */
    {"rule r(f(x), s): integral from 0 to inf of exp(-s*x)*f(x) dx becomes (f(0) + integral from 0 to inf of "
     "exp(-s*x)*(derivative of f(x) in x) dx)/s when s > 0", RULE_PASSED},
    {"rule r(f(x), s): integral from 0 to inf of exp(-s*x)*f(x) dx becomes (integral from 0 to inf of "
     "exp(-s*x)*(derivative of f(x) in x) dx)/s when s > 0", RULE_REFUTED},
    {"rule r(f(x), s): integral from 0 to inf of exp(-s*x)*f(x) dx becomes (f(0) - integral from 0 to inf of "
     "exp(-s*x)*(derivative of f(x) in x) dx)/s when s > 0", RULE_REFUTED},
    {"rule r(f(x), a): integral from -a to a of f(x) dx becomes 2*integral from 0 to a of f(x) dx", RULE_REFUTED},
    {"rule r(f(x), a): integral from -a to a of f(x) dx becomes 2*integral from 0 to a of f(x) dx when f(-x) = f(x)",
     RULE_PASSED},
    {"rule r(f(x), a): integral from -a to a of f(x) dx becomes 0 when f(-x) = -f(x)", RULE_PASSED},
    {"rule r(f(x), a, b): integral from a to b of f(x) dx becomes integral from b to a of f(x) dx", RULE_REFUTED},
    {"rule r(f(x), a, b): integral from a to b of f(x) dx becomes -integral from b to a of f(x) dx", RULE_PASSED},
    {"rule r(f(x), a, b): integral from a to b of f(x) dx becomes (b - a)*integral from 0 to 1 of f(a + (b - a)*t) dt",
     RULE_PASSED},
    {"rule r(f(x), a, b): integral from a to b of f(x) dx becomes integral from 0 to 1 of f(a + (b - a)*t) dt", RULE_REFUTED},
    {"rule r(f(x)): integral from 0 to inf of f(x) dx becomes integral from 0 to 1 of f(1/t)/t^2 dt", RULE_REFUTED},
};

static void test_cases(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    size_t wrong = 0;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        rule *r = text_rule(e, cases[k].text);
        if (!r) {
            wrong += cases[k].status != (rule_status)-1;
            if (cases[k].status != (rule_status)-1) printf("%s\n  no rule: %s\n", cases[k].text, e->error.words);
            engine_forgive(e);
            continue;
        }
        assert_int_equal(rule_check(e, r, 1 + k, 0, NULL), TW_OK);
        assert_true(r->checked);
        const rule_status found = r->status == RULE_PROVED ? RULE_PASSED : r->status;
        if (found != cases[k].status) {
            printf("%s\n  %s: %s\n", cases[k].text, rule_status_word(r->status), r->finding);
            wrong++;
        }
        rule_release(r);
    }
    tw_engine_free(e);
    assert_int_equal(wrong, 0);
}

/* A rule without a value that balls can hold stays unchecked, and says why. */
static void test_unchecked(void **state)
{
    (void)state;
    static const char *const texts[] = {
        "rule r(a): sum from k = 0 to inf of a^k/Gamma(k + 1) becomes exp(a)",
        "rule r(a): sin(a) becomes sin(a)*2/2 + 0*a when a > 0, a < -1",
    };
    tw_engine *e = tw_engine_new();
    for (size_t k = 0; k < sizeof texts / sizeof *texts; k++) {
        rule *r = text_rule(e, texts[k]);
        assert_non_null(r);
        assert_int_equal(rule_check(e, r, 1, 0, NULL), TW_OK);
        if (k == 0) assert_int_equal(r->status, RULE_UNCHECKED);
        assert_non_null(r->finding);
        rule_release(r);
    }
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_cases), cmocka_unit_test(test_unchecked)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
