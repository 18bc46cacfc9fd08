/* The calculus of completely monotone functions and the enclosing theorem with its counterexamples: alternating coefficients, one
 * sign alone, a finite range, another variable than the series'. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "engine/numeric/enclosing.h"
#include "engine/numeric/evaluate.h"
#include "engine/numeric/monotone.h"
#include "engine/method/method.h"
#include "tests/engine/numeric/reading.h"

static tw_engine *e;
static expr *s;

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    s = expr_symbol(e, "s");
    return facts_set_large(e, s, LARGE_POSITIVE, NULL, NULL) == TW_OK ? 0 : 1;
}

static int tear_down(void **state)
{
    (void)state;
    tw_engine_free(e);
    return 0;
}

static void calculus(void **state)
{
    static const struct {
        const char *f;
        answer monotone;
    } rows[] = {
        {"(1 + y)^(-1/2)", ANSWER_YES},
        {"1/(2 + 3*y + y^2)", ANSWER_YES},  /* zeros -1, -2 */
        {"1/(1 + y + y^2)", ANSWER_UNKNOWN}, /* complex zeros; not CM: the inverse transform changes sign */
        {"exp(-3*y)", ANSWER_YES},
        {"exp(-sqrt(y))", ANSWER_YES},      /* in y; the series at 0 is in sqrt(y) */
        {"exp(1/(1 + y))", ANSWER_YES},
        {"exp(y)", ANSWER_UNKNOWN},
        {"1 - y + 10*y^2", ANSWER_UNKNOWN},
        {"1/(1 + log(1 + y))", ANSWER_YES},
        {"1/(2 - exp(-y))", ANSWER_YES},    /* 2 - exp(-y) is a Bernstein function */
        {"1/(1/2 - exp(-y))", ANSWER_UNKNOWN},
        {"1/(1 + y/(3 + y))", ANSWER_YES},
        {"cos(y)", ANSWER_UNKNOWN},
        {"2 - 1/(1 + y)", ANSWER_UNKNOWN},
        {"exp(-y)/(1 + y)^2 + 5", ANSWER_YES},
    };
    expr *y = expr_symbol(e, "y");
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        answer a = completely_monotone(e, read_expr(e, rows[k].f), y);
        if (a != rows[k].monotone)
            fail_msg("%s: %d", rows[k].f, a);
    }
}

static void enclosing(void **state)
{
    static const struct {
        const char *integral;
        bool encloses;
    } rows[] = {
        {"integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx", true}, /* (1 + y)^(-1/2), y = x^2 */
        {"integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1 + x) dx", true},
        {"integral from 0 to inf of exp(-s*x^2)/(1 + x) dx", true},
        {"integral from 0 to inf of (1 - x + 10*x^2)*exp(-s*x)/(1 + x^4) dx", false},
        {"integral from 0 to inf of exp(x)*exp(-s*x)/(1 + x) dx", false},
        {"integral from 0 to 1/10 of exp(-s*x)/(1 + x) dx", false},
        {"integral from 0 to inf of exp(-sqrt(x))*exp(-s*x) dx", false},
        {"integral from 0 to inf of cos(x)*exp(-s*x)/(1 + x) dx", false},
        {"integral from 0 to inf of exp(-s*x)*log(x)/(1 + x) dx", false},
        {"integral from 0 to inf of exp(-s*x)/((20*x - 1)^2 + 1) dx", false},
    };
    static const env nowhere = {0};
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        expansion a;
        expr *integral = read_expr(e, rows[k].integral);
        expansion_init(&a);
        assert_non_null(integral);
        if (expand(e, &a, integral, 3, NULL) != TW_OK)
            fail_msg("%s: %s", rows[k].integral, e->error.words);
        if ((contribution_encloses(e, &a.contributions[0].local, s, &nowhere) == ANSWER_YES) != rows[k].encloses)
            fail_msg("%s: enclosing should be %d", rows[k].integral, rows[k].encloses);
        expansion_clear(&a);
    }
}

/* exp(x), 1/(1+x) on [0, 1/10]: the rest does leave the interval between 0 and the first omitted term, so the label matters. */
static void a_counterexample_is_one(void **state)
{
    expr *integral = read_expr(e, "integral from 0 to 1/10 of exp(-s*x)/(1 + x) dx");
    expr *ten = expr_int(e, 10);
    env at = {1, &s, &ten};
    expansion a;
    acb_t value;
    (void)state;
    expansion_init(&a);
    acb_init(value);
    assert_int_equal(expand(e, &a, integral, 3, NULL), TW_OK);
    assert_int_equal(quadrature(e, value, integral, &at, 20, false, NULL), TW_OK);
    /* 1/s - 1/s^2 = 0.09; the integral is about 0.0604: the rest has the wrong sign (the term is + 2/s^3) */
    arb_sub_si(acb_realref(value), acb_realref(value), 0, 64);
    assert_true(arf_cmp_d(arb_midref(acb_realref(value)), 0.09) < 0);
    acb_clear(value);
    expansion_clear(&a);
}

/* The theorem holds for all values of a parameter that the facts allow. */
static void with_a_parameter(void **state)
{
    static const env nowhere = {0};
    expr *integral = read_expr(e, "integral from 0 to inf of x^nu*exp(-s*x)/(1 + x^2) dx"), *nu = expr_symbol(e, "nu");
    remainder_bound r;
    expansion a;
    (void)state;
    assert_int_equal(facts_add(e, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), nu), CONDITION_GIVEN), TW_OK);
    expansion_init(&a);
    remainder_bound_init(&r);
    assert_int_equal(expand(e, &a, integral, 4, NULL), TW_OK);
    assert_int_equal(remainder_for_all(e, &r, &a, &nowhere, 2, NULL), TW_OK);
    assert_int_equal(r.label, LABEL_PROVED);
    assert_string_equal(r.manner, "enclosing");
    remainder_bound_clear(&r);
    expansion_clear(&a);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(calculus, set_up, tear_down),
        cmocka_unit_test_setup_teardown(enclosing, set_up, tear_down),
        cmocka_unit_test_setup_teardown(a_counterexample_is_one, set_up, tear_down),
        cmocka_unit_test_setup_teardown(with_a_parameter, set_up, tear_down),
    };
    return cmocka_run_group_tests_name("test_monotone", tests, NULL, NULL);
}
