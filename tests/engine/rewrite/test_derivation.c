/* The record of a derivation: labels only ever weaken, words are owned, steps keep their order. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <string.h>

#include <cmocka.h>

#include "engine/rewrite/derivation.h"

static void test_labels_weaken(void **state)
{
    (void)state;
    condition_list c;
    conditions_init(&c);
    conditions_add(&c, "a > 0", NULL, CONDITION_PROVED);
    conditions_add(&c, "b > 0", NULL, CONDITION_GIVEN);
    assert_true(conditions_all_sure(&c));
    conditions_add(&c, "a > 0", NULL, CONDITION_GRANTED);
    assert_int_equal(c.count, 2);
    assert_int_equal(c.list[0].label, CONDITION_GRANTED);
    assert_false(conditions_all_sure(&c));
    conditions_add(&c, "a > 0", NULL, CONDITION_OPEN);
    conditions_add(&c, "a > 0", NULL, CONDITION_PROVED);
    assert_int_equal(c.list[0].label, CONDITION_OPEN);
    conditions_clear(&c);
}

static void test_append(void **state)
{
    (void)state;
    condition_list a, b;
    conditions_init(&a);
    conditions_init(&b);
    conditions_add(&a, "x", NULL, CONDITION_PROVED);
    for (int k = 0; k < 20; k++) conditions_add(&b, (char[]){(char)('a' + k), 0}, NULL, CONDITION_GIVEN);
    conditions_append(&a, &b);
    conditions_append(&a, &b);
    assert_int_equal(a.count, 21);
    conditions_clear(&b);
    assert_string_equal(a.list[20].words, "t");
    conditions_clear(&a);
}

static void test_require(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    condition_list c;
    conditions_init(&c);
    expr *a = expr_symbol(e, "a"), *zero = expr_int(e, 0);
    expr *positive = expr_relation_of(e, RELATION_LESS, zero, a),
         *negative = expr_relation_of(e, RELATION_LESS, a, zero);
    assert_int_equal(conditions_require(e, &c, positive), TW_OK);
    assert_int_equal(c.list[0].label, CONDITION_OPEN);
    conditions_clear(&c);
    assert_int_equal(facts_add(e, expr_relation_of(e, RELATION_LESS, expr_int(e, 1), a), CONDITION_GIVEN), TW_OK);
    assert_int_equal(conditions_require(e, &c, positive), TW_OK);
    assert_int_equal(c.list[0].label, CONDITION_PROVED);
    assert_string_equal(c.list[0].words, "a > 0");
    assert_int_equal(conditions_require(e, &c, negative), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    assert_int_equal(c.count, 1);
    conditions_clear(&c);
    tw_engine_free(e);
}

static void test_steps(void **state)
{
    (void)state;
    derivation d;
    derivation_init(&d);
    for (int k = 0; k < 50; k++) {
        step *s = derivation_add(&d, (char[]){(char)('A' + k % 26), 0}, k % 2 ? "DLMF 2.3.8" : NULL);
        conditions_add(&s->conditions, "a > 0", NULL, CONDITION_GIVEN);
    }
    assert_int_equal(d.count, 50);
    assert_string_equal(d.steps[27].rule, "B");
    assert_string_equal(d.steps[27].source, "DLMF 2.3.8");
    assert_null(d.steps[26].source);
    derivation_clear(&d);
    assert_int_equal(d.count, 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_labels_weaken),
        cmocka_unit_test(test_append),
        cmocka_unit_test(test_require),
        cmocka_unit_test(test_steps),
    };
    return cmocka_run_group_tests_name("derivation", tests, NULL, NULL);
}
