/* Facts: intervals from conditions on one symbol, contradictions, kinds, the large parameter. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/expr/facts.h"

static tw_engine *e;
static expr *a, *b, *m;

static expr *n(slong k)
{
    return expr_int(e, k);
}

static expr *less(expr *left, expr *right)
{
    return expr_relation_of(e, RELATION_LESS, left, right);
}

static expr *at_most(expr *left, expr *right)
{
    return expr_relation_of(e, RELATION_LESS_EQUAL, left, right);
}

static void given(expr *condition)
{
    assert_int_equal(facts_add(e, condition, CONDITION_GIVEN), TW_OK);
}

static void contradicts(expr *condition)
{
    const size_t count = facts_count(e);
    assert_int_equal(facts_add(e, condition, CONDITION_GIVEN), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_VALUE);
    engine_forgive(e);
    assert_int_equal(facts_count(e), count);
}

/* bits as facts_interval; the ends p/q where there are some. */
static void interval_is(expr *symbol, int bits, slong p, ulong q, slong r, ulong s)
{
    fmpq_t lower, upper, end;
    fmpq_init(lower);
    fmpq_init(upper);
    fmpq_init(end);
    assert_int_equal(facts_interval(e, symbol, lower, upper), bits);
    fmpq_set_si(end, p, q);
    assert_true(!(bits & 1) || fmpq_equal(lower, end));
    fmpq_set_si(end, r, s);
    assert_true(!(bits & 2) || fmpq_equal(upper, end));
    fmpq_clear(lower);
    fmpq_clear(upper);
    fmpq_clear(end);
}

static void intervals(void **state)
{
    (void)state;
    interval_is(a, 0, 0, 1, 0, 1);
    given(less(expr_frac(e, -1, 2), a));
    interval_is(a, 1 | 4, -1, 2, 0, 1);
    given(less(n(0), a));
    interval_is(a, 1 | 4, 0, 1, 0, 1);
    given(at_most(n(0), a)); /* the open end stays */
    interval_is(a, 1 | 4, 0, 1, 0, 1);
    given(less(n(-7), a)); /* weaker */
    given(at_most(expr_mul(e, n(3), a), n(2)));
    interval_is(a, 1 | 2 | 4, 0, 1, 2, 3);
    given(less(expr_sub(e, n(1), expr_mul(e, n(2), a)), n(0))); /* 1 - 2a < 0 */
    interval_is(a, 1 | 2 | 4, 1, 2, 2, 3);
    given(expr_relation_of(e, RELATION_EQUAL, a, expr_frac(e, 3, 5)));
    interval_is(a, 3, 3, 5, 3, 5);
    interval_is(b, 0, 0, 1, 0, 1);
    facts_forget(e, a);
    assert_int_equal(facts_count(e), 0);
    interval_is(a, 0, 0, 1, 0, 1);
}

/* theta in (-pi/4, pi/4]: rational ends just outside, open since no rational is the end. */
static void ends_that_are_no_rationals(void **state)
{
    fmpq_t lower, upper;
    (void)state;
    expr *quarter = expr_div(e, expr_constant_of(e, CONSTANT_PI), n(4));
    given(less(expr_neg(e, quarter), a));
    given(at_most(a, quarter));
    fmpq_init(lower);
    fmpq_init(upper);
    assert_int_equal(facts_interval(e, a, lower, upper), 15);
    const double low = fmpz_get_d(fmpq_numref(lower)) / fmpz_get_d(fmpq_denref(lower));
    const double high = fmpz_get_d(fmpq_numref(upper)) / fmpz_get_d(fmpq_denref(upper));
    assert_true(low < -0.785398163397 && low > -0.785398163398 && high > 0.785398163397 && high < 0.785398163398);
    fmpq_clear(lower);
    fmpq_clear(upper);
    contradicts(less(n(1), a));
    given(less(expr_call1(e, FUNCTION_LOG, n(2)), a)); /* 0.693 < a */
    contradicts(less(a, expr_frac(e, 1, 2)));
    given(less(a, expr_constant_of(e, CONSTANT_INF))); /* says nothing, and harms nothing */
}

static void integers(void **state)
{
    (void)state;
    given(expr_relation_of(e, RELATION_INTEGER, m, NULL));
    assert_true(facts_is_integer(e, m));
    given(less(n(0), m));
    interval_is(m, 1, 1, 1, 0, 1);
    given(less(m, expr_frac(e, 7, 2)));
    interval_is(m, 3, 1, 1, 3, 1);
    contradicts(less(n(3), m));
    given(less(n(0), b));
    given(less(b, n(1)));
    contradicts(expr_relation_of(e, RELATION_INTEGER, b, NULL));
    assert_false(facts_is_integer(e, b));
}

static void contradictions(void **state)
{
    (void)state;
    contradicts(less(n(1), n(0)));
    contradicts(less(a, a));
    contradicts(expr_relation_of(e, RELATION_EQUAL, n(1), n(2)));
    contradicts(expr_relation_of(e, RELATION_INTEGER, expr_frac(e, 1, 2), NULL));
    given(less(n(0), a));
    contradicts(less(a, n(0)));
    contradicts(at_most(a, n(0)));
    contradicts(expr_relation_of(e, RELATION_EQUAL, a, n(0)));
    contradicts(expr_relation_of(e, RELATION_EQUAL, a, n(-3)));
    given(less(b, a));
    contradicts(less(a, b));
    contradicts(at_most(a, b));
    contradicts(expr_relation_of(e, RELATION_EQUAL, a, b));
    given(expr_relation_of(e, RELATION_NOT_EQUAL, b, m));
    contradicts(expr_relation_of(e, RELATION_EQUAL, m, b));
    assert_int_equal(facts_add(e, a, CONDITION_GIVEN), TW_ERROR); /* no condition */
    engine_forgive(e);
    assert_int_equal(facts_add(e, less(n(1), n(0)), CONDITION_GIVEN), TW_ERROR);
    assert_string_equal(e->error.words, "1 < 0 contradicts what is known");
    engine_forgive(e);
    assert_int_equal(facts_add(e, less(a, b), CONDITION_GIVEN), TW_ERROR);
    assert_string_equal(e->error.words, "a < b contradicts b < a");
    engine_forgive(e);
}

static void labels(void **state)
{
    condition_label label;
    (void)state;
    assert_int_equal(facts_add(e, less(b, a), CONDITION_GRANTED), TW_OK);
    assert_int_equal(facts_add(e, less(b, a), CONDITION_GRANTED), TW_OK);
    assert_int_equal(facts_count(e), 1);
    assert_ptr_equal(facts_at(e, 0, &label), less(b, a));
    assert_int_equal(label, CONDITION_GRANTED);
    given(less(b, a));
    facts_at(e, 0, &label);
    assert_int_equal(label, CONDITION_GIVEN);
    assert_int_equal(facts_count(e), 1);
    assert_string_equal(condition_label_word(CONDITION_GRANTED), "granted");
    facts_forget(e, m);
    assert_int_equal(facts_count(e), 1);
    facts_forget(e, a);
    assert_int_equal(facts_count(e), 0);
}

static void complex_parameters(void **state)
{
    (void)state;
    given(expr_relation_of(e, RELATION_COMPLEX, a, NULL));
    assert_true(facts_is_complex(e, a));
    assert_false(facts_is_complex(e, b));
    contradicts(less(n(0), a));
    contradicts(expr_relation_of(e, RELATION_REAL, a, NULL));
    contradicts(expr_relation_of(e, RELATION_INTEGER, a, NULL));
    given(less(n(0), b));
    contradicts(expr_relation_of(e, RELATION_COMPLEX, b, NULL));
    assert_int_equal(facts_set_large(e, a, LARGE_POSITIVE, NULL, NULL), TW_ERROR);
    engine_forgive(e);
}

static void large_parameters(void **state)
{
    expr *symbol = NULL, *from, *to;
    (void)state;
    assert_int_equal(facts_large(e, &symbol), LARGE_NONE);
    assert_int_equal(facts_set_large(e, a, LARGE_POSITIVE, NULL, NULL), TW_OK);
    assert_int_equal(facts_large(e, &symbol), LARGE_POSITIVE);
    assert_ptr_equal(symbol, a);
    assert_false(facts_sector(e, &from, &to));
    interval_is(a, 1 | 4, 0, 1, 0, 1);
    contradicts(less(a, n(0)));
    assert_int_equal(facts_set_large(e, m, LARGE_INTEGER, NULL, NULL), TW_OK);
    assert_true(facts_is_integer(e, m));
    interval_is(m, 1, 1, 1, 0, 1);
    interval_is(a, 0, 0, 1, 0, 1);
    given(less(b, n(-1)));
    assert_int_equal(facts_set_large(e, b, LARGE_SMALL, NULL, NULL), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_VALUE);
    engine_forgive(e);
    assert_int_equal(facts_large(e, &symbol), LARGE_INTEGER);
    assert_ptr_equal(symbol, m);
    expr *quarter = expr_div(e, expr_constant_of(e, CONSTANT_PI), n(4));
    assert_int_equal(facts_set_large(e, a, LARGE_POSITIVE, expr_neg(e, quarter), quarter), TW_OK);
    assert_true(facts_sector(e, &from, &to));
    assert_ptr_equal(to, quarter);
}

/* Given facts make parameters positive in the normal form; granted ones do not. */
static void normal_form_uses_given_facts(void **state)
{
    (void)state;
    expr *root = expr_sqrt(e, expr_pow(e, a, n(2)));
    assert_ptr_equal(expr_normal(e, root, NULL, 0), root);
    assert_int_equal(facts_add(e, less(n(0), a), CONDITION_GRANTED), TW_OK);
    assert_ptr_equal(expr_normal(e, root, NULL, 0), root);
    given(less(n(1), a));
    assert_ptr_equal(expr_normal(e, root, NULL, 0), a);
}

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    a = expr_symbol(e, "a");
    b = expr_symbol(e, "b");
    m = expr_symbol(e, "m");
    return 0;
}

static int tear_down(void **state)
{
    (void)state;
    tw_engine_free(e);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(intervals, set_up, tear_down),
        cmocka_unit_test_setup_teardown(ends_that_are_no_rationals, set_up, tear_down),
        cmocka_unit_test_setup_teardown(integers, set_up, tear_down),
        cmocka_unit_test_setup_teardown(contradictions, set_up, tear_down),
        cmocka_unit_test_setup_teardown(labels, set_up, tear_down),
        cmocka_unit_test_setup_teardown(complex_parameters, set_up, tear_down),
        cmocka_unit_test_setup_teardown(large_parameters, set_up, tear_down),
        cmocka_unit_test_setup_teardown(normal_form_uses_given_facts, set_up, tear_down),
    };
    int failed = cmocka_run_group_tests_name("test_facts", tests, NULL, NULL);
    flint_cleanup();
    return failed;
}
