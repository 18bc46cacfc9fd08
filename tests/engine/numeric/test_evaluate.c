/* Numbers from expansions: the interval holds the value, the number of terms is the one with the least bound, digits that cannot
 * be had are refused with what can be had, comparison finds nothing violated. Values: the reference cases (mpmath, 40 digits). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <math.h>
#include <cmocka.h>

#include "engine/method/method.h"
#include "engine/numeric/evaluate.h"
#include "tests/engine/numeric/reading.h"

static tw_engine *e;
static expr *s;
static expansion a;

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    s = expr_symbol(e, "s");
    expansion_init(&a);
    budget_start(e, 120);
    return facts_set_large(e, s, LARGE_POSITIVE, NULL, NULL) == TW_OK ? 0 : 1;
}

static int tear_down(void **state)
{
    (void)state;
    expansion_clear(&a);
    tw_engine_free(e);
    return 0;
}

static void expand_words(const char *words, slong terms)
{
    expr *integral = read_expr(e, words);
    if (!integral || expand(e, &a, integral, terms, NULL) != TW_OK)
        fail_msg("%s: %s", words, e->error.words);
}

static tw_status number_at(number *n, const char *value, slong digits, slong terms)
{
    expr *v = read_expr(e, value);
    env at = {1, &s, &v};
    evaluate_options o = {digits, terms, false};
    return evaluate_expansion(e, n, &a, &at, &o);
}

static void assert_holds(const number *n, const char *value)
{
    arb_t x;
    arb_init(x);
    arb_set_str(x, value, 200);
    if (!arb_overlaps(acb_realref(n->value), x))
        fail_msg("the interval misses %s", value);
    arb_clear(x);
}

/* Value at s = 5, 20 of the reference case w-sqrt-even. Label and terms from the enclosing theorem: |c[5]| is least at s = 10. */
static void enclosing_values(void **state)
{
    number n;
    (void)state;
    expand_words("integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx", 8);
    number_init(&n);
    assert_int_equal(number_at(&n, "20", 0, -1), TW_OK);
    assert_holds(&n, "0.04987765484230911442447192040281435903889");
    assert_int_equal(n.label, LABEL_PROVED);
    number_clear(&n);
    number_init(&n);
    assert_int_equal(number_at(&n, "10", 0, -1), TW_OK);
    assert_int_equal(n.terms, 5);
    assert_int_equal(n.least_term, 5);
    /* the panels come closer than the theorem, and the label is theirs */
    assert_null(n.manner);
    assert_true(mag_cmp_2exp_si(arb_radref(acb_realref(n.value)), -22) < 0);
    number_clear(&n);
    number_init(&n);
    assert_int_equal(number_at(&n, "5", 0, 2), TW_OK);
    assert_holds(&n, "0.1936804586100030315498586190562329284313");
    assert_int_equal(n.terms, 2);
    number_clear(&n);
}

/* Panels: the interval is a few per cent of the first omitted term. */
static void panel_values(void **state)
{
    static const char *const cases[] = {
        "integral from 0 to inf of exp(-s*x)*cos(x)/(1 + x) dx",
        "integral from 0 to 2 of exp(-s*x)/(1 + x)^2 dx",
        "integral from 0 to inf of exp(-s*x)*log(x)/(1 + x) dx",
        "integral from 0 to inf of exp(-s*(x + x^2))*(1 + x)^(1/3) dx",
        "integral from 2 to inf of exp(-s*x)*cos(x)/x^3 dx",
        "integral from 0 to inf of exp(-s*x^2)*cos(x)/(1 + x) dx",
        "integral from 0 to inf of exp(-s*x)*exp(-sqrt(x)) dx",
        /* a far end that no disc reaches */
        "integral from 0 to 1 of exp(-s*x)*(1 - x)^(-1/2) dx",
        "integral from 0 to 1 of exp(-s*x)*x*log(1 - x) dx",
        "integral from 0 to 2 of exp(-s*(x + x^2))*(4 - x^2)^(-1/3) dx",
    };
    (void)state;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        expr *v = expr_int(e, 15);
        env at = {1, &s, &v};
        acb_t truth;
        number n;
        acb_init(truth);
        number_init(&n);
        expansion_clear(&a);
        expansion_init(&a);
        expand_words(cases[k], 6);
        if (number_at(&n, "15", 0, -1) != TW_OK)
            fail_msg("%s: %s", cases[k], e->error.words);
        assert_int_equal(n.label, LABEL_PROVED);
        assert_int_equal(quadrature(e, truth, a.integral, &at, 30, false, NULL), TW_OK);
        assert_true(acb_overlaps(n.value, truth));
        assert_true(acb_rel_accuracy_bits(n.value) > 8);
        acb_clear(truth);
        number_clear(&n);
    }
}

static void exact_ones(void **state)
{
    number n;
    (void)state;
    expand_words("integral from 0 to inf of x^2*exp(-s*x) dx", 6);
    number_init(&n);
    assert_int_equal(number_at(&n, "20", 30, -1), TW_OK);
    assert_int_equal(n.label, LABEL_EXACT);
    assert_holds(&n, "0.00025");
    number_clear(&n);
}

static void digits(void **state)
{
    number n;
    (void)state;
    expand_words("integral from 0 to inf of exp(-s*x)*cos(x)/(1 + x) dx", 4);
    number_init(&n);
    if (number_at(&n, "60", 20, -1) != TW_OK) /* more terms than were asked for are fetched */
        fail_msg("%s", e->error.words);
    assert_true(acb_rel_accuracy_bits(n.value) > 66);
    assert_true(n.terms > 4);
    number_clear(&n);
    number_init(&n);
    assert_int_equal(number_at(&n, "10", 20, -1), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_PRECISION);
    assert_non_null(strstr(e->error.words, "at s = 10"));
    assert_non_null(strstr(e->error.words, "from s = "));
    assert_non_null(strstr(e->error.words, "`evaluate INTEGRAL`"));
    /* and they are had where the words say */
    char from[40];
    assert_int_equal(sscanf(strstr(e->error.words, "from s = ") + 9, "%39[0-9/]", from), 1);
    engine_forgive(e);
    if (number_at(&n, from, 20, -1) != TW_OK)
        fail_msg("not from %s: %s", from, e->error.words);
    number_clear(&n);
}

/* A parameter: without a value an error that names it; with one the condition on it is decided there. */
static void parameters(void **state)
{
    expr *nu = expr_symbol(e, "nu");
    expr *symbols[] = {s, nu}, *values[] = {expr_int(e, 20), expr_frac(e, 1, 3)};
    env both = {2, symbols, values};
    evaluate_options o = {0, -1, false};
    number n;
    (void)state;
    expand_words("integral from 0 to inf of x^nu*exp(-s*x)*cos(x) dx", 4);
    number_init(&n);
    assert_int_equal(number_at(&n, "20", 0, -1), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_NAME);
    assert_non_null(strstr(e->error.words, "nu"));
    engine_forgive(e);
    number_clear(&n);
    number_init(&n);
    if (evaluate_expansion(e, &n, &a, &both, &o) != TW_OK)
        fail_msg("%s", e->error.words);
    assert_int_equal(n.label, LABEL_PROVED);
    /* Gamma(4/3) cos(4/3 atan(1/20)) / (401)^(2/3) (DLMF 5.9.1 with x^nu exp(-(s - i) x)) */
    assert_holds(&n, "0.01638504755023637346");
    number_clear(&n);
}

static void comparisons(void **state)
{
    expr *v = expr_int(e, 10);
    env at = {1, &s, &v};
    comparison c;
    (void)state;
    expand_words("integral from 0 to inf of exp(-s*x)*cos(x)/(1 + x) dx", 9);
    comparison_init(&c);
    if (compare_expansion(e, &c, &a, &at) != TW_OK)
        fail_msg("%s", e->error.words);
    assert_int_equal(c.count, 9);
    for (size_t k = 0; k < c.count; k++) {
        double bound = arf_get_d(arb_midref(c.rows[k].bound), ARF_RND_NEAR);
        double error = fabs(arf_get_d(arb_midref(acb_realref(c.rows[k].error)), ARF_RND_NEAR));
        assert_false(c.rows[k].violated);
        assert_int_equal(c.rows[k].label, LABEL_PROVED);
        assert_true(bound >= error && bound < 1.1 * error);
        assert_true(mag_get_d(arb_radref(acb_realref(c.rows[k].error))) < 0.1 * bound);
    }
    comparison_clear(&c);
}

/* The bound for all s as a formula, read at several s against quadrature. */
static void formulas(void **state)
{
    static const struct {
        const char *integral, *bound;
    } rows[] = {
        {"integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1 + x) dx", "28/27*Gamma(1/3)*s^(-10/3)"}, /* (1/3)_3 = 28/27 */
    };
    static const env nowhere = {0};
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        remainder_bound r;
        expansion_clear(&a);
        expansion_init(&a);
        expand_words(rows[k].integral, 3);
        remainder_bound_init(&r);
        assert_int_equal(remainder_for_all(e, &r, &a, &nowhere, 3, NULL), TW_OK);
        assert_int_equal(r.label, LABEL_PROVED);
        assert_ptr_equal(r.bound, read_expr(e, rows[k].bound));
        remainder_bound_clear(&r);
    }
}

static void steps_and_source(void **state)
{
    static const env nowhere = {0};
    remainder_bound r;
    (void)state;
    expand_words("integral from 0 to 2 of exp(-s*x)*cos(x) dx", 3);
    remainder_bound_init(&r);
    if (remainder_for_all(e, &r, &a, &nowhere, -1, NULL) != TW_OK)
        fail_msg("%s", e->error.words);
    assert_int_equal(r.label, LABEL_PROVED);
    assert_non_null(r.from);
    assert_non_null(r.source);
    assert_true(r.panel_count > 2);
    assert_non_null(r.panel_power);
    /* two terms: a power and what falls like the other end */
    char *words = expr_text(e, r.bound);
    assert_non_null(strstr(words, "exp("));
    free(words);
    remainder_bound_clear(&r);
}

/* The second enclosing route: log(1 + 2*x) and 1/(1 + x + x^2) are not completely monotone; a short range breaks 1/(1 + x), and so
 * do 1 - x + 10 x^2, whose coefficients alternate as well, and exp(x). */
static void signs(void **state)
{
    static const struct {
        const char *integral;
        slong terms;
        const char *bound; /* NULL: does not enclose */
    } rows[] = {
        {"integral from 0 to inf of exp(-s*x)*log(1 + 2*x) dx", 2, "16*s^-4"},
        {"integral from 0 to inf of exp(-s*x)/(1 + x + x^2) dx", 2, "6*s^-4"},
        {"integral from 0 to 1 of exp(-s*x)/(1 + x) dx", 2, "2*s^-3"},
        {"integral from 0 to 1/10 of exp(-s*x)/(1 + x) dx", 2, NULL},
        {"integral from 0 to inf of exp(-s*x)*(1 - x + 10*x^2)/(1 + x^5) dx", 1, NULL},
        {"integral from 0 to inf of exp(-s*x)*exp(-sqrt(x)) dx", 3, "1/8*sqrt(pi)*s^(-5/2)"}, /* exp(-y) in y = sqrt(x) */
        {"integral from 0 to inf of exp(-s*x)*exp(x)/(1 + x^2) dx", 2, NULL},
    };
    static const env nowhere = {0};
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        remainder_bound r;
        expansion_clear(&a);
        expansion_init(&a);
        expand_words(rows[k].integral, rows[k].terms + 2);
        remainder_bound_init(&r);
        assert_int_equal(remainder_for_all(e, &r, &a, &nowhere, rows[k].terms, NULL), TW_OK);
        if (!rows[k].bound != !r.manner)
            fail_msg("%s: %s", rows[k].integral, r.manner ? r.manner : r.reason ? r.reason : "by panels");
        if (rows[k].bound) {
            assert_int_equal(r.label, LABEL_PROVED);
            assert_ptr_equal(r.bound, read_expr(e, rows[k].bound));
        }
        remainder_bound_clear(&r);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(enclosing_values, set_up, tear_down),
        cmocka_unit_test_setup_teardown(panel_values, set_up, tear_down),
        cmocka_unit_test_setup_teardown(exact_ones, set_up, tear_down),
        cmocka_unit_test_setup_teardown(digits, set_up, tear_down),
        cmocka_unit_test_setup_teardown(parameters, set_up, tear_down),
        cmocka_unit_test_setup_teardown(comparisons, set_up, tear_down),
        cmocka_unit_test_setup_teardown(formulas, set_up, tear_down),
        cmocka_unit_test_setup_teardown(signs, set_up, tear_down),
        cmocka_unit_test_setup_teardown(steps_and_source, set_up, tear_down),
    };
    return cmocka_run_group_tests_name("test_evaluate", tests, NULL, NULL);
}
