/* Reading: what is found, what convergence is proved, and what is refused with which reason. */
#include "texts.h"

typedef struct read_case {
    const char *large, *given, *integral, *summary;
} read_case;

static const read_case SUMMARIES[] = {
    {"s", NULL, "integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 0"},
    {"s", NULL, "integral from 2 to inf of exp(-s*x)/x^3 dx",
     "depends on s; one critical point, the end x = 2; converges for s > 0"},
    {"s", NULL, "integral from -inf to inf of exp(-s*(x - 1)^2)/(1 + x^2) dx",
     "depends on s; one critical point, x = 1 inside the path; converges for s > 0"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*cosh(3*x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 3"},
    {"s", NULL, "integral from 0 to inf of exp(-2*s*x^2)*exp(5*x^2 + x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 5/2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*cosh(nu*x)/(1 + x) dx",
     "depends on s, nu; one critical point, the end x = 0; converges for s > abs(nu)"},
    {"s", NULL, "integral from 0 to inf of exp(-s^2*x)*exp(4*x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 2"},
    {"s", NULL, "integral from 0 to inf of (1 + x)^(-s)*x^2 dx",
     "depends on s; one critical point, the end x = 0; converges for s > 3"},
    {"s", NULL, "integral from 0 to inf of (1 + 2*x)^(-3*s)*sqrt(x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 1/2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*x)*I(0, 2*x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 2"},
    {"s", NULL, "integral from 0 to inf of exp(-s*sinh(x))*exp(5*x) dx",
     "depends on s; one critical point, the end x = 0; converges for s > 0"},
    {"small h", NULL, "integral from 0 to inf of exp(-x/h)*exp(3*x) dx",
     "depends on h; one critical point, the end x = 0; converges for h < 1/3"},
    {"small h", NULL, "integral from 0 to inf of exp(-x^2/(2*h))*(1 + x) dx",
     "depends on h; one critical point, the end x = 0; converges for h > 0"},
    {"s", "a > 0", "integral from a to inf of exp(-s*x)/x dx",
     "depends on s, a; one critical point, the end x = a; converges for s > 0"},
    {"s", NULL, "integral from 0 to 1 of exp(-s*(1 - x))/(1 + x) dx",
     "depends on s; one critical point, the end x = 1; converges for s > 0"},
    {"s", NULL, "integral from -3 to 2 of exp(-s*abs(x))/(4 + x) dx",
     "depends on s; one critical point, x = 0 inside the path; converges for s > 0"},
};

static void test_summaries(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof SUMMARIES / sizeof *SUMMARIES; k++) {
        const read_case *c = &SUMMARIES[k];
        bool small = strncmp(c->large, "small ", 6) == 0;
        tw_engine *e = text_engine(small ? c->large + 6 : c->large, small ? LARGE_SMALL : LARGE_POSITIVE);
        if (c->given) text_given(e, c->given);
        reading r;
        reading_init(&r);
        if (integral_read(e, &r, text_parse(e, c->integral)) != TW_OK) fail_msg("%s: %s", c->integral, e->error.words);
        assert_string_equal(r.summary, c->summary);
        assert_true(conditions_all_sure(&r.conditions));
        assert_true(r.derivation.count >= 2);
        reading_clear(&r);
        tw_engine_free(e);
    }
}

/* A condition that comes with the integral is listed with how it is known. */
static void test_conditions(void **state)
{
    (void)state;
    static const struct {
        const char *given, *integral, *words;
        condition_label label;
    } cases[] = {
        {"nu > -1", "integral from 0 to inf of x^nu*exp(-s*x)/(1 + x) dx", "nu > -1", CONDITION_GIVEN},
        {"nu > 0", "integral from 0 to inf of x^nu*exp(-s*x)/(1 + x) dx", "nu > -1", CONDITION_PROVED},
        {NULL, "integral from 0 to inf of x^nu*exp(-s*x)/(1 + x) dx", "nu > -1", CONDITION_OPEN},
        {"0 < p < 1", "integral from 0 to inf of x^(-p)*exp(-s*x)/(1 + x) dx", "p < 1", CONDITION_GIVEN},
        {"a > 0", "integral from 0 to inf of exp(-a*s*x)/(1 + x) dx", "a > 0", CONDITION_GIVEN},
        {NULL, "integral from 0 to inf of exp(-s*x)/(1 + a*x) dx", "1 + a*x has no zero inside the path",
         CONDITION_OPEN},
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        if (cases[k].given) text_given(e, cases[k].given);
        reading r;
        reading_init(&r);
        if (integral_read(e, &r, text_parse(e, cases[k].integral)) != TW_OK) fail_msg("%s", e->error.words);
        bool found = false;
        for (size_t n = 0; n < r.conditions.count; n++)
            found = found || (strcmp(r.conditions.list[n].words, cases[k].words) == 0 &&
                              r.conditions.list[n].label == cases[k].label);
        if (!found) fail_msg("%s: no condition %s", cases[k].integral, cases[k].words);
        reading_clear(&r);
        tw_engine_free(e);
    }
}

static void test_refusals(void **state)
{
    (void)state;
    static const struct {
        const char *given, *integral;
        error_kind kind;
        const char *part;
    } cases[] = {
        {NULL, "integral from 0 to inf of exp(-x)/(1 + x) dx", ERROR_UNSUITABLE, "s does not occur"},
        {NULL, "s*integral from 0 to inf of exp(-x)/(1 + x) dx", ERROR_UNSUITABLE, "s does not occur"},
        {NULL, "integral from 0 to inf of exp(s*x)/(1 + x) dx", ERROR_DIVERGENT, "grows"},
        {NULL, "integral from 0 to inf of exp(-s*x)*exp(x^2) dx", ERROR_DIVERGENT, "exp(x^2)"},
        {NULL, "integral from 0 to inf of exp(-s*x)/(1 - x) dx", ERROR_DIVERGENT, "principal value"},
        {NULL, "integral from 0 to inf of exp(-s*x)/(x^2 - 3*x + 2) dx", ERROR_DIVERGENT, "principal value"},
        {NULL, "integral from 0 to inf of exp(-s*x)*tan(x) dx", ERROR_DIVERGENT, "cos(x) = 0"},
        {NULL, "integral from 0 to inf of exp(-s*x)/x dx", ERROR_DIVERGENT, "power -1 at the end x = 0"},
        {NULL, "integral from 0 to 1 of exp(-s*x)/(1 - x)^2 dx", ERROR_DIVERGENT, "x = 1"},
        {NULL, "integral from 0 to inf of exp(-s*(x^3/3 - a*x))/(1 + x) dx", ERROR_UNDECIDED, "a"},
        {NULL, "integral from 0 to inf of x^(2*s)*exp(-x^2 - x) dx", ERROR_UNSUITABLE, "moves with s"},
        {NULL, "integral from 0 to inf of exp(-x - s/x)/(1 + x) dx", ERROR_UNSUITABLE, "moves with s"},
        {NULL, "integral from -inf to inf of exp(-s*x^2/(1 + x^4)) dx", ERROR_DIVERGENT, "infinity"},
        {NULL, "integral from 0 to 2 of cos(s*x)*abs(x - 1) dx", ERROR_UNSUITABLE, "analytic"},
        {NULL, "integral from 0 to inf of cos(s*x)/(1 + x^2) dx", ERROR_UNSUITABLE, "smaller than all powers"},
        {NULL, "integral from 0 to inf of K(0, s*x)/(1 + x) dx", ERROR_UNAVAILABLE, "mellin"},
        {NULL, "integral along inf(-pi/3) to inf(pi/3) of exp(s*(z^3/3 - sinh(z))) dz", ERROR_UNSUITABLE, "rational"},
        {NULL, "integral from 0 to inf of cosh(s*x)*exp(-x^2) dx", ERROR_UNSUITABLE, "exp"},
        {NULL, "integral from 0 to inf of exp(-x)/(1 + s*x) dx", ERROR_UNSUITABLE, "separate"},
        {NULL, "integral from 0 to inf of exp(-s*x)*integral from 0 to 1 of exp(-x*y) dy dx", ERROR_UNSUITABLE,
         "one variable"},
        {NULL, "(integral from 0 to inf of exp(-s*x)/(1 + x) dx)^2", ERROR_UNSUITABLE, "by itself"},
        {NULL, "1/(1 + s)", ERROR_UNSUITABLE, "no integral"},
        {NULL, "integral from 0 to inf of exp(-a*s*x)/(1 + x) dx", ERROR_UNDECIDED, "sign of a"},
        {NULL, "integral from 0 to 1 of exp(-s*(x - a)^2) dx", ERROR_UNDECIDED, "x = a"},
        {NULL, "integral from 0 to inf of exp(-s*x)/(1 + x) dx + integral from 1 to inf of exp(-s*x)/x dx",
         ERROR_UNSUITABLE, "exponential size"},
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++)
        text_refused("s", cases[k].given, cases[k].integral, NULL, cases[k].kind, cases[k].part);
}

static void test_no_large_parameter(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expansion a;
    expansion_init(&a);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx"), 3, NULL), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    assert_non_null(strstr(e->error.words, "large s"));
    engine_forgive(e);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx"), 3, "mellin"),
                     TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_UNAVAILABLE);
    engine_forgive(e);
    assert_int_equal(expand(e, &a, text_parse(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx"), 3, "wotson"),
                     TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_NAME);
    expansion_clear(&a);
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_summaries),
        cmocka_unit_test(test_conditions),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_no_large_parameter),
    };
    return cmocka_run_group_tests_name("read", tests, NULL, NULL);
}
