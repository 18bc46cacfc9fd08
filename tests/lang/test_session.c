/* The session within a process: names and values, statements that fail and leave no trace, random statements that must not
 * crash. The seed of the random part is printed and taken back from TW_SEED. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <cmocka.h>

#include "lang/parse.h"
#include "lang/session.h"

static int set_up(void **state)
{
    session *s = malloc(sizeof *s);
    *state = s;
    return session_init(s) == TW_OK ? 0 : -1;
}

static int tear_down(void **state)
{
    session_clear(*state);
    free(*state);
    return 0;
}

/* Runs a text; the kind of the first error, ERROR_NONE when all went well. *words (may be NULL): what was answered. */
static error_kind run(session *s, const char *bytes, text *words)
{
    source src;
    source_init(&src, "test", bytes, strlen(bytes));
    syntax_text tree;
    syntax_text_init(&tree);
    parse_text(&src, &tree);
    error_kind kind = tree.error_count ? ERROR_SYNTAX : ERROR_NONE;
    for (size_t k = 0; kind == ERROR_NONE && k < tree.count; k++) {
        result r;
        result_init(&r, "");
        budget_start(s->e, 20);
        if (session_run(s, tree.statements[k], &r) != TW_OK) {
            kind = s->e->error.kind;
            assert_true(kind != ERROR_NONE);
            assert_true(s->at.from <= s->at.to && s->at.to <= src.length);
            engine_forgive(s->e);
        } else {
            assert_int_equal(s->e->error.kind, ERROR_NONE);
        }
        if (words) text_add(words, r.words.bytes);
        result_clear(&r);
    }
    syntax_text_clear(&tree);
    return kind;
}

static void assert_answers(session *s, const char *bytes, const char *want)
{
    text words;
    text_init(&words);
    assert_int_equal(run(s, bytes, &words), ERROR_NONE);
    assert_string_equal(words.bytes, want);
    text_clear(&words);
}

static void test_names(void **state)
{
    (void)state;
    name_table t = {0};
    char name[32];
    enum { COUNT = 3000 };
    for (int k = 0; k < COUNT; k++) {
        snprintf(name, sizeof name, "n%d", k);
        names_set(&t, name, value_new(VALUE_EXPRESSION));
    }
    assert_int_equal(t.count, COUNT);
    for (int k = 0; k < COUNT; k += 3) {
        snprintf(name, sizeof name, "n%d", k);
        assert_true(names_drop(&t, name));
        assert_false(names_drop(&t, name));
    }
    for (int k = 0; k < COUNT; k++) {
        snprintf(name, sizeof name, "n%d", k);
        assert_true((names_find(&t, name) != NULL) == (k % 3 != 0));
    }
    value *v = names_find(&t, "n1");
    names_set(&t, "again", value_hold(v));
    assert_int_equal(v->holders, 2);
    names_set(&t, "n1", value_new(VALUE_FUNCTION));
    assert_int_equal(v->holders, 1);
    names_clear(&t);
    assert_null(names_find(&t, "n1"));
    assert_false(names_drop(&t, "n1"));
}

static void test_definitions(void **state)
{
    session *s = *state;
    assert_answers(s, "let c = 2\nlet f = c*x\nlet c = 5\nshow f", "c = 2\nf = 2*x\nc = 5\nf = 2*x\n");
    assert_answers(s, "let g(u, v) = u - v\nlet h = g(v, u)", "g(u, v) = u - v\nh = v - u\n");
    assert_answers(s, "drop f\nlet f = 1", "f = 1\n");
    assert_int_equal(run(s, "show nobody", NULL), ERROR_NAME);
    assert_int_equal(run(s, "let a = g(1)", NULL), ERROR_VALUE);
}

/* Each failure leaves facts and names as they were. */
static void test_failures_leave_no_trace(void **state)
{
    session *s = *state;
    assert_int_equal(run(s, "large s\ngiven p > 0\nlet kept = 3", NULL), ERROR_NONE);
    size_t facts = facts_count(s->e);
    assert_int_equal(run(s, "given q > 1, p < -1", NULL), ERROR_VALUE);
    assert_int_equal(facts_count(s->e), facts);
    expr *large;
    assert_int_equal(facts_large(s->e, &large), LARGE_POSITIVE);
    assert_string_equal(large->is.name, "s");
    assert_int_equal(run(s, "large kept", NULL), ERROR_NAME);
    assert_int_equal(facts_large(s->e, &large), LARGE_POSITIVE);
    assert_int_equal(run(s, "let kept = p + )", NULL), ERROR_SYNTAX);
    assert_int_equal(run(s, "let p = 3", NULL), ERROR_NAME);
    assert_int_equal(run(s, "let kept = expand kept to 3 terms", NULL), ERROR_UNSUITABLE);
    assert_answers(s, "show kept", "kept = 3\n");
    assert_int_equal(run(s, "use \"anything.tw\"", NULL), ERROR_UNAVAILABLE); /* no host to run it */
    assert_int_equal(run(s, "rewrite kept with tidy", NULL), ERROR_NAME);
    assert_answers(s, "drop p\nlet p = 3", "p = 3\n");
}

static void test_quit(void **state)
{
    session *s = *state;
    assert_int_equal(run(s, "quit", NULL), ERROR_NONE);
    assert_true(s->quit);
}

/* Sentences put together at random from words of the language: any answer will do, but not a crash, a leak or a success that
 * leaves an error behind. */
static void test_random_statements(void **state)
{
    static const char *const pieces[] = {
        "let", "large", "given", "evaluate", "expand", "coefficients of", "show", "drop", "compare", "steps", "remainder of",
        "write", "use", "at", "to", "terms", "digits", "from", "of", "with", "by", "watson", "as", "json", "=", "+", "-", "*",
        "/", "^", "(", ")", ",", "!", "<", ">", "x", "s", "a", "A", "F", "f(", "f(x) =", "1", "2", "0", "1/3", "exp(", "log(",
        "integral from 0 to inf of", "integral from 0 to 1 of", "exp(-s*x)", "dx", "pi", "inf", "i", "\n", "\n", "\"x\"",
        "A = expand F to 3 terms\n", "F = integral from 0 to inf of exp(-s*x)/(1 + x^2) dx\n", "s = 3", "in (0, 1)", "help",
    };
    session *s = *state;
    const char *typed = getenv("TW_SEED");
    unsigned seed = typed ? (unsigned)strtoul(typed, NULL, 10) : (unsigned)time(NULL);
    print_message("seed %u\n", seed);
    srand(seed);
    clock_t end = clock() + 6 * CLOCKS_PER_SEC;
    for (int k = 0; k < 4000 && clock() < end; k++) {
        text bytes;
        text_init(&bytes);
        int length = 1 + rand() % 14;
        for (int j = 0; j < length; j++) {
            text_add(&bytes, pieces[(size_t)rand() % (sizeof pieces / sizeof *pieces)]);
            text_add_char(&bytes, ' ');
        }
        if (!strstr(bytes.bytes, "write")) (void)run(s, bytes.bytes, NULL);
        text_clear(&bytes);
    }
    assert_int_equal(run(s, "let survived = 1", NULL), ERROR_NONE);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_names),
        cmocka_unit_test_setup_teardown(test_definitions, set_up, tear_down),
        cmocka_unit_test_setup_teardown(test_failures_leave_no_trace, set_up, tear_down),
        cmocka_unit_test_setup_teardown(test_quit, set_up, tear_down),
        cmocka_unit_test_setup_teardown(test_random_statements, set_up, tear_down),
    };
    return cmocka_run_group_tests_name("session", tests, NULL, NULL);
}
