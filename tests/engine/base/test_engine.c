/* The base of an engine: arenas and texts, one error at a time, the budget, and every allocation made to fail once. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <cmocka.h>

#include "engine/expr/expr.h"
#include "engine/expr/facts.h"

static void texts_grow(void **state)
{
    text t;
    (void)state;
    text_init(&t);
    assert_string_equal(t.bytes, "");
    for (int k = 0; k < 1000; k++)
        text_addf(&t, "%d,", k);
    text_add_char(&t, '!');
    assert_int_equal(t.length, strlen(t.bytes));
    assert_memory_equal(t.bytes, "0,1,2,3,", 8);
    text_cut(&t, 3);
    assert_string_equal(t.bytes, "0,1");
    text_cut(&t, 10);
    assert_string_equal(t.bytes, "0,1");
    text_add_bytes(&t, "a\0b", 3);
    assert_int_equal(t.length, 6);
    char *taken = text_take(&t);
    assert_memory_equal(taken, "0,1a\0b", 7);
    free(taken);
    taken = text_take(&t);
    assert_string_equal(taken, "");
    free(taken);
    text_clear(&t);
}

static void arenas_go_back_to_a_mark(void **state)
{
    arena a;
    (void)state;
    arena_init(&a);
    char *kept = arena_copy(&a, "kept words", 4);
    const arena_place mark = arena_mark(&a);
    for (int round = 0; round < 3; round++) {
        for (size_t size = 1; size < 300000; size = size * 3 + 1) {
            char *piece = arena_alloc(&a, size);
            assert_int_equal((uintptr_t)piece % sizeof(void *), 0);
            memset(piece, 0x5a, size);
        }
        arena_release(&a, mark);
        assert_int_equal(a.bytes, mark.bytes);
    }
    assert_string_equal(kept, "kept");
    arena_clear(&a);
}

static void the_first_error_stays(void **state)
{
    tw_engine *e = tw_engine_new();
    (void)state;
    assert_int_equal(engine_fail(e, ERROR_VALUE, "%s is %d", "x", 3), TW_ERROR);
    assert_int_equal(engine_fail(e, ERROR_TIME, "later"), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_VALUE);
    assert_string_equal(e->error.words, "x is 3");
    engine_forgive(e);
    assert_int_equal(e->error.kind, ERROR_NONE);
    engine_fail(e, ERROR_UNDECIDED, "now");
    assert_string_equal(e->error.words, "now");
    assert_string_equal(error_kind_word(e->error.kind), "undecided");
    tw_engine_free(e);
    tw_engine_free(NULL);
}

static void the_budget_ends(void **state)
{
    tw_engine *e = tw_engine_new();
    (void)state;
    budget_start(e, 0);
    for (int k = 0; k < 100000; k++)
        assert_true(budget_ok(e));
    budget_start(e, 0.05);
    const clock_t before = clock();
    while (budget_ok(e))
        assert_true(clock() - before < 5 * CLOCKS_PER_SEC);
    assert_int_equal(e->error.kind, ERROR_TIME);
    engine_forgive(e);
    budget_start(e, 0);
    e->interrupted = 1;
    assert_false(budget_ok(e));
    assert_int_equal(e->error.kind, ERROR_INTERRUPT);
    engine_forgive(e);
    budget_start(e, 0); /* clears the interrupt */
    assert_true(budget_ok(e));
    e->memory_limit = 1 << 20; /* any process is larger than a MiB */
    budget_start(e, 0);
    assert_false(budget_ok(e));
    assert_int_equal(e->error.kind, ERROR_MEMORY);
    tw_engine_free(e);
}

/* An expression whose walks take long stops at the deadline. */
static void long_work_stops(void **state)
{
    tw_engine *e = tw_engine_new();
    (void)state;
    expr *sum = expr_int(e, 1);
    const char *const names[] = {"a", "b", "c", "d", "f", "g", "h", "j"};
    for (size_t k = 0; k < 8; k++)
        sum = expr_add(e, sum, expr_symbol(e, names[k]));
    budget_start(e, 0.1);
    assert_null(expr_expand(e, expr_pow(e, sum, expr_int(e, 40))));
    assert_true(e->error.kind == ERROR_TIME || e->error.kind == ERROR_VALUE);
    tw_engine_free(e);
}

/* ---- the edge ---- */

static tw_status divide_by_zero(void *host)
{
    fmpz_t a;
    (void)host;
    fmpz_init(a);
    fmpz_fdiv_q(a, a, a); /* FLINT's own abort */
    return TW_OK;
}

static tw_status fail_inside(void *host)
{
    tw_engine *e = host;
    assert_int_equal(engine_protect(e, divide_by_zero, e), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_INTERNAL);
    engine_forgive(e);
    return TW_OK;
}

static void aborts_become_errors(void **state)
{
    tw_engine *e = tw_engine_new();
    (void)state;
    assert_int_equal(engine_protect(e, divide_by_zero, e), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_INTERNAL);
    engine_forgive(e);
    assert_int_equal(engine_protect(e, fail_inside, e), TW_OK); /* the inner edge catches */
    tw_engine_free(e);
}

typedef struct job {
    tw_engine *engine;
    char *words;
} job;

/* A bit of everything in the expression room. */
static tw_status work(void *host)
{
    job *j = host;
    tw_engine *e = j->engine;
    expr *x = expr_symbol(e, "x"), *s = expr_symbol(e, "s"), *a = expr_symbol(e, "a");
    expr *root = expr_pow(e, expr_frac(e, 12, 35), expr_frac(e, 1, 2));
    expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, s, x)));
    expr *body = expr_mul(e, kernel, expr_pow(e, expr_add(e, root, expr_mul(e, a, x)), expr_frac(e, -1, 2)));
    expr *integral = expr_integral(e, x, expr_int(e, 0), expr_constant_of(e, CONSTANT_INF), body);
    expr *derivative = expr_derivative(e, integral, s);
    expr *put = expr_substitute(e, derivative, a, expr_pow(e, x, expr_int(e, 2)));
    expr *normal = expr_normal(e, expr_mul(e, body, kernel), &x, 1);
    expr *expanded = expr_expand(e, expr_pow(e, expr_add(e, x, a), expr_int(e, 5)));
    expr **coefficients;
    slong degree;
    if (!put || !normal || !expanded || facts_add(e, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), a),
        CONDITION_GIVEN) != TW_OK)
        return TW_ERROR;
    if (expr_polynomial(e, expanded, x, 5, &coefficients, &degree) != TW_OK)
        return TW_ERROR;
    free(coefficients);
    if (facts_add(e, expr_relation_of(e, RELATION_LESS, a, expr_int(e, 0)), CONDITION_GIVEN) == TW_OK)
        return TW_ERROR;
    if (e->error.kind != ERROR_VALUE)
        return TW_ERROR;
    engine_forgive(e);
    j->words = expr_text(e, put);
    return TW_OK;
}

static void every_allocation_fails_once(void **state)
{
    long failures = 0;
    (void)state;
    for (long left = 0;; left++) {
        job j = {tw_engine_new(), NULL};
        assert_non_null(j.engine);
        j.engine->allocations_left = left;
        const tw_status status = engine_protect(j.engine, work, &j);
        j.engine->allocations_left = -1;
        if (status == TW_OK) {
            assert_string_equal(j.words, "integral from 0 to inf of -x1*exp(-s*x1)/sqrt(2*sqrt(105)/35 + x^2*x1) dx1");
            free(j.words);
            tw_engine_free(j.engine);
            break;
        }
        assert_int_equal(j.engine->error.kind, ERROR_MEMORY);
        assert_null(j.words);
        engine_forgive(j.engine);
        /* the engine is as good as new */
        assert_int_equal(engine_protect(j.engine, work, &j), TW_OK);
        assert_non_null(j.words);
        free(j.words);
        tw_engine_free(j.engine);
        failures++;
    }
    print_message("%ld allocations were made to fail\n", failures);
    assert_true(failures > 100);
}

static void two_engines_side_by_side(void **state)
{
    tw_engine *one = tw_engine_new(), *two = tw_engine_new();
    (void)state;
    expr *x = expr_symbol(one, "x"), *y = expr_symbol(two, "x");
    assert_ptr_not_equal(x, y);
    assert_int_equal(facts_add(one, expr_relation_of(one, RELATION_LESS, expr_int(one, 0), x), CONDITION_GIVEN), TW_OK);
    assert_int_equal(facts_add(two, expr_relation_of(two, RELATION_LESS, y, expr_int(two, 0)), CONDITION_GIVEN), TW_OK);
    assert_null(expr_pow(one, expr_int(one, 0), expr_int(one, -1)));
    assert_int_equal(two->error.kind, ERROR_NONE);
    job j = {two, NULL};
    assert_int_equal(engine_protect(two, work, &j), TW_OK);
    free(j.words);
    tw_engine_free(one);
    char *words = expr_text(two, expr_mul(two, y, y));
    assert_string_equal(words, "x^2");
    free(words);
    tw_engine_free(two);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(texts_grow),
        cmocka_unit_test(arenas_go_back_to_a_mark),
        cmocka_unit_test(the_first_error_stays),
        cmocka_unit_test(the_budget_ends),
        cmocka_unit_test(long_work_stops),
        cmocka_unit_test(aborts_become_errors),
        cmocka_unit_test(every_allocation_fails_once),
        cmocka_unit_test(two_engines_side_by_side),
    };
    int failed = cmocka_run_group_tests_name("test_engine", tests, NULL, NULL);
    flint_cleanup();
    return failed;
}
