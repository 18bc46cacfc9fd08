/* Results with two faces: members and lines, tables, a finished object taken over. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "lang/help.h"
#include "lang/result.h"
#include "lang/words.h"

static char *shown(const result *r, bool json)
{
    char *bytes = NULL;
    size_t length = 0;
    FILE *out = open_memstream(&bytes, &length);
    assert_true(result_show(r, out, json));
    fclose(out);
    return bytes;
}

static void assert_shown(const result *r, bool json, const char *want)
{
    char *got = shown(r, json);
    assert_string_equal(got, want);
    free(got);
}

static void test_two_faces(void **state)
{
    (void)state;
    result r;
    result_init(&r, "definition");
    result_string(&r, "name", "a \"quoted\" name\n");
    result_integer(&r, "count", -3);
    result_truth(&r, "known", true);
    result_string(&r, "nothing", NULL);
    result_json(&r, "list", "[1,\n 2]");
    result_line(&r, "%s = %d", "a", 3);
    assert_shown(&r, true, "{\"result\": \"definition\", \"name\": \"a \\\"quoted\\\" name\\n\", \"count\": -3, \"known\": "
                           "true, \"nothing\": null, \"list\": [1,  2]}\n");
    assert_shown(&r, false, "a = 3\n");
    result_restart(&r, "other");
    assert_shown(&r, true, "{\"result\": \"other\"}\n");
    assert_shown(&r, false, "");
    result_clear(&r);
}

static void test_finished_object(void **state)
{
    (void)state;
    result r;
    result_init(&r, "x");
    result_object(&r, "\n {\"result\": \"number\",\n \"of\": \"A\"}\n");
    assert_shown(&r, true, "{\"result\": \"number\",  \"of\": \"A\"}\n");
    result_string(&r, "name", "v");
    assert_shown(&r, true, "{\"result\": \"number\",  \"of\": \"A\", \"name\": \"v\"}\n");
    result_clear(&r);
}

/* The label stands in one column, and two blanks away when the words reach beyond it. */
static void test_labels(void **state)
{
    (void)state;
    result r;
    result_init(&r, "x");
    char wide[200];
    for (int width = 0; width < 150; width += 7) {
        result_restart(&r, "x");
        memset(wide, 'w', (size_t)width);
        wide[width] = '\0';
        result_labelled(&r, wide, "proved", width % 2 ? "enclosing" : NULL);
        const char *label_at = strstr(r.words.bytes, "proved");
        assert_int_equal(label_at - r.words.bytes, width < 71 ? 72 : width + 2);
        assert_string_equal(label_at, width % 2 ? "proved, enclosing\n" : "proved\n");
    }
    result_clear(&r);
}

static void test_table(void **state)
{
    (void)state;
    table t;
    table_init(&t, 3);
    const char *cells[] = {"n", "exponent", "coefficient", "0", "-1", "1", "10", "", "-225", "3", "-7", ""};
    for (size_t k = 0; k < 12; k++) table_cell(&t, cells[k]);
    text out;
    text_init(&out);
    table_print(&t, &out, "  ");
    assert_string_equal(out.bytes, "  n   exponent  coefficient\n  0   -1        1\n  10            -225\n  3   -7\n");
    text_clear(&out);
    table_clear(&t);
}

static void take_word(void *host, const char *word)
{
    size_t *count = host;
    (*count)++;
    assert_non_null(help_find(word));
    result r;
    result_init(&r, "help");
    assert_true(help_answer(&r, word));
    assert_non_null(strstr(r.words.bytes, "Example:"));
    result_clear(&r);
}

/* Each entry has an example, its own or that of the word it points to. */
static void test_help_has_examples(void **state)
{
    (void)state;
    size_t count, words = 0;
    const help_entry *t = help_table(&count);
    for (size_t k = 0; k < count; k++) {
        assert_true(t[k].example || t[k].see);
        if (t[k].see) assert_non_null(help_find(t[k].see));
        for (const char *p = t[k].about; *p;) {
            assert_true(strcspn(p, "\n") <= 76);
            p += strcspn(p, "\n");
            p += *p == '\n';
        }
    }
    help_each_word(take_word, &words);
    assert_true(words > 80);
    const char *word;
    for (size_t k = 0; (word = word_at(k, NULL)); k++) {
        if (strcmp(word, "a") == 0) continue; /* of `on a log scale` */
        result made;
        result_init(&made, "help");
        if (!help_answer(&made, word)) fail_msg("no help for `%s`", word);
        result_clear(&made);
    }
    result r;
    result_init(&r, "help");
    assert_false(help_answer(&r, "no such word"));
    assert_true(help_answer(&r, NULL));
    assert_true(help_answer(&r, "Gamma"));
    result_clear(&r);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_two_faces), cmocka_unit_test(test_finished_object), cmocka_unit_test(test_labels),
        cmocka_unit_test(test_table),     cmocka_unit_test(test_help_has_examples),
    };
    return cmocka_run_group_tests_name("result", tests, NULL, NULL);
}
