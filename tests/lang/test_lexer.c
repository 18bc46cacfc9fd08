/* Tokens, written out as KIND:bytes and compared as text; bytes that are no token; the words table that stands behind
 * names. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <cmocka.h>

#include "engine/expr/function.h"
#include "lang/lexer.h"
#include "lang/suggest.h"
#include "lang/words.h"

static const char *kind_name(token_kind k)
{
    static const char *const names[] = {
#define X(id, words) #id,
        TOKEN_KINDS(X)
#undef X
    };
    return names[k];
}

static void dump_tokens(text *out, const char *bytes, size_t length)
{
    source s;
    lexer l;
    source_init(&s, "in", bytes, length);
    lexer_init(&l, &s);
    for (;;) {
        token t = lexer_next(&l);
        if (t.kind == TOKEN_END)
            break;
        text_add(out, out->length ? " " : "");
        text_add(out, kind_name(t.kind));
        if (t.kind != TOKEN_LINE_END) {
            text_add_char(out, ':');
            text_add_bytes(out, bytes + t.at.from, t.at.to - t.at.from);
        }
    }
    assert_int_equal(lexer_next(&l).kind, TOKEN_END);
    assert_int_equal(lexer_next(&l).at.to, length);
}

static void texts_fall_into_tokens(void **state)
{
    static const char *const table[][2] = {
        {"", ""},
        {"let A = 3", "NAME:let NAME:A EQUAL:= NUMBER:3"},
        {"+-*/^!()[],:=<<=>>=!=",
         "PLUS:+ MINUS:- TIMES:* OVER:/ POWER:^ FACTORIAL:! OPEN:( CLOSE:) OPEN_SQUARE:[ CLOSE_SQUARE:] COMMA:, COLON:: EQUAL:= "
         "LESS:< LESS_EQUAL:<= GREATER:> GREATER_EQUAL:>= NOT_EQUAL:!="},
        {"n!=3", "NAME:n NOT_EQUAL:!= NUMBER:3"},
        {"n! =3", "NAME:n FACTORIAL:! EQUAL:= NUMBER:3"},
        {"n!!=3", "NAME:n FACTORIAL:! NOT_EQUAL:!= NUMBER:3"},
        {"a≤b≥c≠d·e⋅f", "NAME:a LESS_EQUAL:≤ NAME:b GREATER_EQUAL:≥ NAME:c NOT_EQUAL:≠ NAME:d TIMES:· NAME:e TIMES:⋅ NAME:f"},
        {"π ∞ Γ(x) dπ", "NAME:π NAME:∞ NAME:Γ OPEN:( NAME:x CLOSE:) NAME:dπ"},
        {"∞x", "NAME:∞ NAME:x"},
        {"3 0.25 1e-8 1E+5 2.5e3", "NUMBER:3 NUMBER:0.25 NUMBER:1e-8 NUMBER:1E+5 NUMBER:2.5e3"},
        {"2x 2e 2e+x 1..2", "NUMBER:2 NAME:x NUMBER:2 NAME:e NUMBER:2 NAME:e PLUS:+ NAME:x NUMBER:1 BAD_CHARACTER:. BAD_CHARACTER:. "
                            "NUMBER:2"},
        {"theta_2 x_ _x Übung 変数 ӝ1 x²", "NAME:theta_2 NAME:x_ BAD_CHARACTER:_ NAME:x NAME:Übung NAME:変数 NAME:ӝ1 NAME:x "
                                           "BAD_CHARACTER:²"},
        {"٣x", "BAD_CHARACTER:٣ NAME:x"}, /* a digit of another script begins neither a name nor a number */
        {"x٣", "NAME:x٣"},
        {"\"a \\\"b\\\" \\\\ ü#\" x", "TEXT:\"a \\\"b\\\" \\\\ ü#\" NAME:x"},
        {"\"\"", "TEXT:\"\""},
        {"\"abc", "UNCLOSED_TEXT:\"abc"},
        {"\"abc\nx", "UNCLOSED_TEXT:\"abc LINE_END NAME:x"},
        {"\"abc\r\nx", "UNCLOSED_TEXT:\"abc LINE_END NAME:x"},
        {"\"a\\nb\"", "BAD_ESCAPE:\\n NAME:b UNCLOSED_TEXT:\""},
        {"\"a\\", "BAD_ESCAPE:\\"},
        {"x # a comment \"", "NAME:x"},
        {"x # a comment\ny", "NAME:x LINE_END NAME:y"},
        {"\xEF\xBB\xBFx \xEF\xBB\xBF", "NAME:x BAD_CHARACTER:\xEF\xBB\xBF"},
        {"a\tb\r\n\n", "NAME:a NAME:b LINE_END LINE_END"},
        {"a\xFFz", "NAME:a BAD_BYTE:\xFF NAME:z"},
        {"\"a\xFF\"", "BAD_BYTE:\xFF UNCLOSED_TEXT:\""},
        {"# \xFF", "BAD_BYTE:\xFF"},
        {"\xE2\x82", "BAD_BYTE:\xE2 BAD_BYTE:\x82"},
        {"$;{}", "BAD_CHARACTER:$ BAD_CHARACTER:; BAD_CHARACTER:{ BAD_CHARACTER:}"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        text out;
        text_init(&out);
        dump_tokens(&out, table[k][0], strlen(table[k][0]));
        assert_string_equal(out.bytes, table[k][1]);
        text_clear(&out);
    }
}

static void a_nul_is_a_byte_like_others(void **state)
{
    static const char bytes[] = "a\0b \"x\0\" # \0c";
    static const char tokens[] = "NAME:a BAD_BYTE:\0 NAME:b BAD_BYTE:\0 BAD_BYTE:\0 NAME:c"; /* the second quote opens again */
    (void)state;
    text out;
    text_init(&out);
    dump_tokens(&out, bytes, sizeof bytes - 1);
    assert_int_equal(out.length, sizeof tokens - 1);
    assert_memory_equal(out.bytes, tokens, sizeof tokens);
    text_clear(&out);
}

static void check_number(const char *prefix, size_t digits, const char *suffix, token_kind kind)
{
    text in;
    source s;
    lexer l;
    text_init(&in);
    text_add(&in, prefix);
    for (size_t k = 0; k < digits; k++)
        text_add_char(&in, '7');
    text_add(&in, suffix);
    source_init(&s, "in", in.bytes, in.length);
    lexer_init(&l, &s);
    token t = lexer_next(&l);
    assert_int_equal(t.kind, kind);
    assert_int_equal(t.at.to, in.length);
    text_clear(&in);
}

static void the_length_of_numbers_is_bounded(void **state)
{
    (void)state;
    check_number("", NUMBER_DIGIT_LIMIT, "", TOKEN_NUMBER);
    check_number("", NUMBER_DIGIT_LIMIT + 1, "", TOKEN_LONG_NUMBER);
    check_number("0.", NUMBER_DIGIT_LIMIT - 1, "e5", TOKEN_NUMBER);
    check_number("0.", NUMBER_DIGIT_LIMIT, "e5", TOKEN_LONG_NUMBER);
    check_number("", 1, "e1000000", TOKEN_NUMBER);
    check_number("", 1, "e-1000000", TOKEN_NUMBER);
    check_number("", 1, "E+1000001", TOKEN_LONG_NUMBER);
    check_number("", 1, "e-1000001", TOKEN_LONG_NUMBER);
    check_number("", 1, "e99999999999999999999999999999999999999", TOKEN_LONG_NUMBER);
    check_number("", 1, "e0000000000000000000000000000000000000001", TOKEN_NUMBER);
}

/* Whatever the bytes, the tokens lie in order without overlap, and what lies between them is blank or a comment. */
static void random_bytes_are_covered(void **state)
{
    static const char alphabet[] = "ab1.e+-*!=<>\"\\#\n\r \t()[]\0\xC3\xA4\xE2\x89\xA4\xFF\xF0\x9F\x98\x80\xED\xA0";
    (void)state;
    const char *given = getenv("TW_SEED");
    uint64_t seed = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL) * 1000003u;
    printf("TW_SEED=%llu\n", (unsigned long long)seed);
    for (int round = 0; round < 20000; round++) {
        char bytes[48];
        size_t length = (size_t)(seed >> 40) % (sizeof bytes - 1);
        for (size_t k = 0; k < length; k++) {
            seed = seed * 6364136223846793005u + 1442695040888963407u;
            bytes[k] = alphabet[(seed >> 33) % (sizeof alphabet - 1)];
        }
        bytes[length] = 0;
        seed = seed * 6364136223846793005u + 1442695040888963407u;
        source s;
        lexer l;
        source_init(&s, "in", bytes, length);
        lexer_init(&l, &s);
        uint32_t end = 0;
        bool comment = false;
        for (token t = lexer_next(&l); t.kind != TOKEN_END; t = lexer_next(&l)) {
            assert_true(t.at.from >= end && t.at.to > t.at.from && t.at.to <= length);
            for (comment = false; end < t.at.from; end++) {
                comment = comment || bytes[end] == '#';
                assert_true(comment || token_is_bad(t.kind) || strchr(" \t\r", bytes[end]) != NULL);
            }
            end = t.at.to;
        }
    }
}

/* ---- words ---- */

static void every_word_has_a_class(void **state)
{
    (void)state;
    word_class c;
    size_t count = 0;
    for (const char *word; (word = word_at(count, &c)) != NULL; count++) {
        assert_int_not_equal(word_find(word), WORD_NONE);
        assert_true(lexer_is_name(word, strlen(word)));
        assert_true(word_find(word) <= c);
    }
    assert_true(count > 100);
    assert_int_equal(word_find("expand"), WORD_STATEMENT);
    assert_int_equal(word_find("split"), WORD_MOVE);
    assert_int_equal(word_find("integral"), WORD_EXPRESSION);
    assert_int_equal(word_find("Gamma"), WORD_FUNCTION);
    assert_int_equal(word_find("log"), WORD_FUNCTION);
    assert_int_equal(word_find("pi"), WORD_CONSTANT);
    assert_int_equal(word_find("of"), WORD_LINK);
    assert_int_equal(word_find("digits"), WORD_MINOR);
    assert_int_equal(word_find("gamma"), WORD_NONE);
    assert_int_equal(word_find(""), WORD_NONE);
}

/* The list of the language's page. */
static void reserved_words_are_those_of_the_page(void **state)
{
    static const char *const reserved[] = {
        "i", "pi", "inf", "euler_constant", "large", "small", "given", "grant", "let", "use", "rule", "pass", "check", "rewrite",
        "why", "derive", "done", "undo", "replay", "expand", "steps", "coefficients", "recurrence", "growth", "remainder",
        "evaluate", "compare", "plan", "plot", "write", "show", "drop", "help", "quit", "integral", "sum", "derivative",
        "piecewise", "root",
    };
    (void)state;
    size_t found = 0;
    word_class c;
    for (size_t k = 0; k < sizeof reserved / sizeof *reserved; k++)
        assert_true(word_is_reserved(reserved[k]));
    const char *word;
    for (size_t k = 0; (word = word_at(k, &c)) != NULL; k++)
        found += word_is_reserved(word);
    assert_int_equal(found, sizeof reserved / sizeof *reserved);
}

static void near_names_are_suggested(void **state)
{
    static const char *const offers[] = {"let", "expand", "evaluate", "terms", "at", "sinh", "Gamma", "E1", "power_decay"};
    static const char *const table[][2] = {
        {"lett", "let"}, {"lte", "let"}, {"expnad", "expand"}, {"Expand", "expand"}, {"evalute", "evaluate"}, {"term", "terms"},
        {"att", "at"}, {"snih", "sinh"}, {"gamma", "Gamma"}, {"e1", "E1"}, {"power_dceay", "power_decay"}, {"powr_deca", "power_decay"},
        {"x", NULL}, {"xy", NULL}, {"plot", NULL}, {"zebra", NULL}, {"", NULL}, {"let", NULL},
        {"a_name_so_long_that_nothing_is_compared_with_it_at_all", NULL},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        suggestion s;
        suggestion_init(&s, table[k][0]);
        for (size_t j = 0; j < sizeof offers / sizeof *offers; j++)
            suggestion_offer(&s, offers[j]);
        if (table[k][1] == NULL)
            assert_null(s.best);
        else
            assert_string_equal(s.best ? s.best : "nothing", table[k][1]);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(texts_fall_into_tokens),
        cmocka_unit_test(a_nul_is_a_byte_like_others),
        cmocka_unit_test(the_length_of_numbers_is_bounded),
        cmocka_unit_test(random_bytes_are_covered),
        cmocka_unit_test(every_word_has_a_class),
        cmocka_unit_test(reserved_words_are_those_of_the_page),
        cmocka_unit_test(near_names_are_suggested),
    };
    return cmocka_run_group_tests_name("lexer", tests, NULL, NULL);
}
