/* The public header alone: an integral built, expanded, evaluated and written from C, and what failing calls leave behind.
 * Nothing but engine/termwise.h is included on purpose. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/termwise.h"

/* integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx: Struve type, DLMF 11.6(i); value at s = 20 by mpmath's quadrature */
static tw_expr *struve_tail(tw_engine *e)
{
    tw_expr *s = tw_symbol(e, "s"), *x = tw_symbol(e, "x"), *one = tw_rational(e, "1"), *two = tw_rational(e, "2");
    assert_int_equal(tw_large(e, s), 0);
    tw_expr *kernel = tw_call(e, "exp", (tw_expr *[]){tw_neg(e, tw_mul(e, s, x))}, 1);
    tw_expr *root = tw_call(e, "sqrt", (tw_expr *[]){tw_add(e, one, tw_pow(e, x, two))}, 1);
    tw_expr *f = tw_integral(e, x, tw_rational(e, "0"), tw_inf(e), tw_div(e, kernel, root));
    assert_non_null(f);
    return f;
}

static void test_whole_way(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    tw_set_limits(e, 60, 0);
    tw_expr *f = struve_tail(e), *s = tw_symbol(e, "s"), *at = tw_rational(e, "20");
    tw_expansion *a = tw_expand(e, f, 8, NULL);
    if (!a) fail_msg("%s", tw_error_words(e));
    char *third = tw_text(e, tw_term(e, a, 2));
    assert_string_equal(third, "9*s^-5");
    free(third);
    tw_value v;
    assert_int_equal(tw_evaluate(e, &v, a, &s, &at, 1, 0), 0);
    assert_string_equal(v.label, "proved");
    assert_true(strtod(v.radius, NULL) < 1e-9);
    assert_true(strtod(v.mid, NULL) > 0.0498776548 && strtod(v.mid, NULL) < 0.0498776549);
    tw_value_clear(&v);
    assert_int_equal(tw_quadrature(e, &v, f, &s, &at, 1, 30), 0);
    assert_memory_equal(v.mid, "0.04987765484230911442447192040", 31);
    tw_value_clear(&v);
    char *json = tw_write(e, a, "A", "json");
    assert_non_null(json);
    assert_non_null(strstr(json, "\"termwise expansion\""));
    free(json);
    tw_expansion_free(a);
    tw_engine_free(e);
}

static void test_failures(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    assert_null(tw_rational(e, "1/0"));
    assert_string_equal(tw_error_kind(e), "value");
    assert_null(tw_add(e, NULL, tw_pi(e)));
    tw_expr *f = struve_tail(e);
    assert_null(tw_call(e, "sinus", &f, 1));
    assert_null(tw_expand(e, f, 0, NULL));
    assert_null(tw_expand(e, f, 4, "guess"));
    assert_true(strlen(tw_error_words(e)) > 0);
    tw_expansion *a = tw_expand(e, f, 4, "watson");
    assert_non_null(a);
    assert_null(tw_write(e, a, "A", "pictures"));
    tw_expansion_free(a);
    tw_engine_free(e);
}

static void test_two_engines(void **state)
{
    (void)state;
    tw_engine *one = tw_engine_new(), *two = tw_engine_new();
    tw_expansion *a = tw_expand(one, struve_tail(one), 3, NULL), *b = tw_expand(two, struve_tail(two), 3, NULL);
    assert_non_null(a);
    assert_non_null(b);
    tw_expansion_free(a);
    tw_engine_free(one);
    char *term = tw_text(two, tw_term(two, b, 1));
    assert_string_equal(term, "-s^-3");
    free(term);
    tw_expansion_free(b);
    tw_engine_free(two);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_whole_way), cmocka_unit_test(test_failures),
                                       cmocka_unit_test(test_two_engines)};
    return cmocka_run_group_tests_name("api", tests, NULL, NULL);
}
