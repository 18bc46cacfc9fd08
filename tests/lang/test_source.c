/* Whole complaints, as text: file, line, column, words, the line, carets. Also places in odd texts: tabs, wide
 * characters, bytes that are no UTF-8, long lines. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>
#include <cmocka.h>

#include "lang/parse.h"

/* All complaints about a text, one after the other. */
static void complain(text *out, const char *bytes, size_t length)
{
    source s;
    syntax_text t;
    source_init(&s, "bad.tw", bytes, length);
    syntax_text_init(&t);
    parse_text(&s, &t);
    for (size_t k = 0; k < t.error_count; k++)
        source_show_error(&s, out, t.errors[k].at, t.errors[k].words);
    syntax_text_clear(&t);
}

static const struct {
    const char *input, *complaint;
} bad[] = {
        {"let F = integral from to inf of exp(-s*x) dx",
         "bad.tw:1:23: error: `from` needs a lower limit here\n"
         "   1 | let F = integral from to inf of exp(-s*x) dx\n"
         "                             ^^\n"},
        {"let F = integral from 0 inf of exp(-s*x) dx",
         "bad.tw:1:25: error: expected `to` and the upper limit, found `inf`\n"
         "   1 | let F = integral from 0 inf of exp(-s*x) dx\n"
         "                               ^^^\n"},
        {"let F = integral from 0 to of exp(-s*x) dx",
         "bad.tw:1:28: error: `to` needs an upper limit here\n"
         "   1 | let F = integral from 0 to of exp(-s*x) dx\n"
         "                                  ^^\n"},
        {"let F = integral from 0 to inf exp(-s*x) dx",
         "bad.tw:1:32: error: expected `of` and the integral's body, found `exp`\n"
         "   1 | let F = integral from 0 to inf exp(-s*x) dx\n"
         "                                      ^^^\n"},
        {"let F = integral of exp(-s*x) dx",
         "bad.tw:1:18: error: expected `from` and the limits, or `along` and a path, after `integral`, found `of`\n"
         "   1 | let F = integral of exp(-s*x) dx\n"
         "                        ^^\n"},
        {"let F = integral from 0 to inf of dx",
         "bad.tw:1:35: error: the integral has no body: write `of 1 dx`\n"
         "   1 | let F = integral from 0 to inf of dx\n"
         "                                         ^^\n"},
        {"let F = integral from 0 to inf of exp(-s*x)",
         "bad.tw:1:44: error: the integral of line 1 is not closed here: expected its variable, such as `dx`\n"
         "   1 | let F = integral from 0 to inf of exp(-s*x)\n"
         "                                                  ^\n"},
        {"let F = integral from 0 to inf of (exp(-s*x) dx",
         "bad.tw:1:46: error: expected `)` for the `(` of line 1, found `dx`\n"
         "   1 | let F = integral from 0 to inf of (exp(-s*x) dx\n"
         "                                                    ^^\n"},
        {"let F = integral from 0 to inf of exp(-s*x) dpi",
         "bad.tw:1:45: error: `pi` is a constant: it can't be defined, bound or declared\n"
         "   1 | let F = integral from 0 to inf of exp(-s*x) dpi\n"
         "                                                   ^^^\n"},
        {"let F = integral from 0 to 1 of x dx^2",
         "bad.tw:1:37: error: an integral takes `^` only in brackets\n"
         "   1 | let F = integral from 0 to 1 of x dx^2\n"
         "                                           ^\n"},
        {"let F = integral along 0 of x dz",
         "bad.tw:1:26: error: expected `to` and the path's next point, found `of`\n"
         "   1 | let F = integral along 0 of x dz\n"
         "                                ^^\n"},
        {"let F = integral from 0 to inf of exp(-s*x) d x",
         "bad.tw:1:45: error: the `d` and the variable that close an integral are one word, such as `dx`\n"
         "   1 | let F = integral from 0 to inf of exp(-s*x) d x\n"
         "                                                   ^\n"},
        {"let S = sum k = 0 to 3 of k",
         "bad.tw:1:13: error: expected `from` after `sum`, found `k`\n"
         "   1 | let S = sum k = 0 to 3 of k\n"
         "                   ^\n"},
        {"let S = sum from pi = 0 to 3 of k",
         "bad.tw:1:18: error: `pi` is a constant: it can't be defined, bound or declared\n"
         "   1 | let S = sum from pi = 0 to 3 of k\n"
         "                        ^^\n"},
        {"let D = derivative of x + 1 in x",
         "bad.tw:1:25: error: `derivative of` takes one product: put brackets around the sum\n"
         "   1 | let D = derivative of x + 1 in x\n"
         "                               ^\n"},
        {"let D = derivative x^2 in x",
         "bad.tw:1:20: error: expected `of` after `derivative`, found `x`\n"
         "   1 | let D = derivative x^2 in x\n"
         "                          ^\n"},
        {"let P = piecewise(x when x < 1, 2)",
         "bad.tw:1:34: error: expected `when` and a condition, or `otherwise`, found `)`\n"
         "   1 | let P = piecewise(x when x < 1, 2)\n"
         "                                        ^\n"},
        {"let P = piecewise(x otherwise)",
         "bad.tw:1:21: error: a piecewise needs a case with `when` before `otherwise`\n"
         "   1 | let P = piecewise(x otherwise)\n"
         "                           ^^^^^^^^^\n"},
        {"let R = root of r^2 - 2 in r",
         "bad.tw:1:29: error: expected `near` and a value close to the root, but the line ends\n"
         "   1 | let R = root of r^2 - 2 in r\n"
         "                                   ^\n"},
        {"let A = (f at x)",
         "bad.tw:1:16: error: expected `=` and a value, found `)`\n"
         "   1 | let A = (f at x)\n"
         "                      ^\n"},
        {"let A = 2x + 1",
         "bad.tw:1:10: error: expected the end of the statement, found `x`; "
         "multiplication is always written, with `*`\n"
         "   1 | let A = 2x + 1\n"
         "                ^\n"},
        {"let A = (1 + x)(1 - x)",
         "bad.tw:1:16: error: expected the end of the statement, found `(`; "
         "multiplication is always written, with `*`\n"
         "   1 | let A = (1 + x)(1 - x)\n"
         "                      ^\n"},
        {"let A = x y",
         "bad.tw:1:11: error: expected the end of the statement, found `y`; "
         "multiplication is always written, with `*`\n"
         "   1 | let A = x y\n"
         "                 ^\n"},
        {"let A = 3 +",
         "bad.tw:1:12: error: `+` needs an operand here\n"
         "   1 | let A = 3 +\n"
         "                  ^\n"},
        {"let A = * 3",
         "bad.tw:1:9: error: `=` needs an expression or a request here\n"
         "   1 | let A = * 3\n"
         "               ^\n"},
        {"let A = (1 + 2",
         "bad.tw:1:15: error: the `(` of line 1 is still open: expected `)`, but the text ends\n"
         "   1 | let A = (1 + 2\n"
         "                     ^\n"},
        {"let A = (1 + 2]",
         "bad.tw:1:15: error: `]` does not close the `(` of line 1\n"
         "   1 | let A = (1 + 2]\n"
         "                     ^\n"},
        {"let A = [1, 2)",
         "bad.tw:1:9: error: `=` needs an expression or a request here\n"
         "   1 | let A = [1, 2)\n"
         "               ^\n"},
        {"let A = f()",
         "bad.tw:1:11: error: `f` needs an argument within its brackets\n"
         "   1 | let A = f()\n"
         "                 ^\n"},
        {"let A = a < b",
         "bad.tw:1:11: error: expected the end of the statement, found `<`; "
         "a comparison has no place here\n"
         "   1 | let A = a < b\n"
         "                 ^\n"},
        {"let A = .5",
         "bad.tw:1:9: error: `.` means nothing here; "
         "type a decimal number with a digit on both sides of its point\n"
         "   1 | let A = .5\n"
         "               ^\n"},
        {"let A = 5. + 1",
         "bad.tw:1:10: error: `.` means nothing here; "
         "type a decimal number with a digit on both sides of its point\n"
         "   1 | let A = 5. + 1\n"
         "                ^\n"},
        {"let A = 'x'",
         "bad.tw:1:9: error: `'` means nothing here; "
         "type `\"` around a text\n"
         "   1 | let A = 'x'\n"
         "               ^\n"},
        {"let A = \"abc",
         "bad.tw:1:9: error: `\"abc` has no closing quote on this line\n"
         "   1 | let A = \"abc\n"
         "               ^^^^\n"},
        {"let A = a − b",
         "bad.tw:1:11: error: `−` means nothing here; "
         "type `-`\n"
         "   1 | let A = a − b\n"
         "                 ^\n"},
        {"let A = c[3]",
         "bad.tw:1:10: error: `c[...]` is read in `check recurrence` only\n"
         "   1 | let A = c[3]\n"
         "                ^\n"},
        {"let A",
         "bad.tw:1:6: error: expected `=` and what the name stands for, but the line ends\n"
         "   1 | let A\n"
         "            ^\n"},
        {"let = 3",
         "bad.tw:1:5: error: expected the name to define after `let`, found `=`\n"
         "   1 | let = 3\n"
         "           ^\n"},
        {"let 3 = A",
         "bad.tw:1:5: error: expected the name to define after `let`, found `3`\n"
         "   1 | let 3 = A\n"
         "           ^\n"},
        {"let pi = 3",
         "bad.tw:1:5: error: `pi` is a constant: it can't be defined, bound or declared\n"
         "   1 | let pi = 3\n"
         "           ^^\n"},
        {"let expand = 3",
         "bad.tw:1:5: error: `expand` is a word of the language: it can't be defined, bound or declared\n"
         "   1 | let expand = 3\n"
         "           ^^^^^^\n"},
        {"let f(x, i) = x",
         "bad.tw:1:10: error: `i` is a constant: it can't be defined, bound or declared\n"
         "   1 | let f(x, i) = x\n"
         "                ^\n"},
        {"let A = write B as json to \"b.json\"",
         "bad.tw:1:9: error: `write` gives nothing that `let` could keep\n"
         "   1 | let A = write B as json to \"b.json\"\n"
         "               ^^^^^\n"},
        {"lett A = 3",
         "bad.tw:1:1: error: expected the opening word of a statement, found `lett`; "
         "did you mean `let`?\n"
         "   1 | lett A = 3\n"
         "       ^^^^\n"},
        {"A = 3",
         "bad.tw:1:1: error: a name is defined with `let`: `let A = ...`\n"
         "   1 | A = 3\n"
         "       ^\n"},
        {"exp(-x)",
         "bad.tw:1:1: error: an expression alone is no statement: write `let NAME = ...`, `evaluate ...` or "
         "`expand ...`\n"
         "   1 | exp(-x)\n"
         "       ^^^\n"},
        {"1 + 2",
         "bad.tw:1:1: error: a statement begins with a word, such as `let`, `expand` or `evaluate`\n"
         "   1 | 1 + 2\n"
         "       ^\n"},
        {"large",
         "bad.tw:1:6: error: expected the name of the large parameter, but the line ends\n"
         "   1 | large\n"
         "            ^\n"},
        {"large s, a > 0",
         "bad.tw:1:10: error: only the sector of `s` may stand here, such as arg(s) in (-pi/4, pi/4); "
         "declare other facts with `given`\n"
         "   1 | large s, a > 0\n"
         "                ^^^^^\n"},
        {"given a",
         "bad.tw:1:8: error: expected a comparison, `in`, `integer`, `real` or `complex`, but the line ends\n"
         "   1 | given a\n"
         "              ^\n"},
        {"given a > ",
         "bad.tw:1:10: error: the comparison needs its other side here\n"
         "   1 | given a > \n"
         "                ^\n"},
        {"given a in 3",
         "bad.tw:1:12: error: expected a range such as (a, b] after `in`, found `3`\n"
         "   1 | given a in 3\n"
         "                  ^\n"},
        {"given a in (0, 1",
         "bad.tw:1:17: error: the `(` of line 1 is still open: expected `)`, but the text ends\n"
         "   1 | given a in (0, 1\n"
         "                       ^\n"},
        {"given a interger",
         "bad.tw:1:9: error: expected a comparison, `in`, `integer`, `real` or `complex`, found `interger`; "
         "did you mean `integer`?\n"
         "   1 | given a interger\n"
         "               ^^^^^^^^\n"},
        {"expand F",
         "bad.tw:1:9: error: expected `to N terms`, but the line ends\n"
         "   1 | expand F\n"
         "               ^\n"},
        {"expand F to 8 term",
         "bad.tw:1:15: error: expected `terms` after the number, found `term`; "
         "did you mean `terms`?\n"
         "   1 | expand F to 8 term\n"
         "                     ^^^^\n"},
        {"expand F to 8 terms bye parts",
         "bad.tw:1:21: error: expected `by`, `as` or the end of the statement, found `bye`; "
         "did you mean `by`?\n"
         "   1 | expand F to 8 terms bye parts\n"
         "                           ^^^\n"},
        {"expand F to 8 terms to 9 terms",
         "bad.tw:1:21: error: `to` is given twice\n"
         "   1 | expand F to 8 terms to 9 terms\n"
         "                           ^^\n"},
        {"evaluate F att s = 3",
         "bad.tw:1:12: error: expected `at`, `to`, `with` or the end of the statement, found `att`; "
         "did you mean `at`?\n"
         "   1 | evaluate F att s = 3\n"
         "                  ^^^\n"},
        {"evaluate F at 3",
         "bad.tw:1:15: error: expected a name and its value, such as `s = 3`, found `3`\n"
         "   1 | evaluate F at 3\n"
         "                     ^\n"},
        {"evaluate F at s = 3 too 20 digits",
         "bad.tw:1:21: error: expected `at`, `to`, `with` or the end of the statement, found `too`; "
         "did you mean `to`?\n"
         "   1 | evaluate F at s = 3 too 20 digits\n"
         "                           ^^^\n"},
        {"evaluate F at s from 1 to 2",
         "bad.tw:1:28: error: expected `step` and its size, or `in N points`, but the line ends\n"
         "   1 | evaluate F at s from 1 to 2\n"
         "                                  ^\n"},
        {"evaluate F at s = 3 to 20",
         "bad.tw:1:26: error: expected `digits` after the number, but the line ends\n"
         "   1 | evaluate F at s = 3 to 20\n"
         "                                ^\n"},
        {"compare F",
         "bad.tw:1:10: error: expected `at` and a value, such as `at s = 10`, but the line ends\n"
         "   1 | compare F\n"
         "                ^\n"},
        {"plan F for error 1e-8",
         "bad.tw:1:12: error: expected `relative error` after `for`, found `error`\n"
         "   1 | plan F for error 1e-8\n"
         "                  ^^^^^\n"},
        {"plot F at s = 3 to \"f.svg\"",
         "bad.tw:1:6: error: expected `error` or `terms` after `plot`, found `F`\n"
         "   1 | plot F at s = 3 to \"f.svg\"\n"
         "            ^\n"},
        {"write F as json",
         "bad.tw:1:16: error: expected `to` and a file name in quotes, but the line ends\n"
         "   1 | write F as json\n"
         "                      ^\n"},
        {"write F to \"f.json\"",
         "bad.tw:1:9: error: expected `as` and a format, found `to`\n"
         "   1 | write F to \"f.json\"\n"
         "               ^^\n"},
        {"write F as json to f.json",
         "bad.tw:1:20: error: expected a file name in quotes after `to`, found `f`\n"
         "   1 | write F as json to f.json\n"
         "                          ^\n"},
        {"rule r(x) x^2 becomes x",
         "bad.tw:1:11: error: expected `:` and the rule's pattern, found `x`\n"
         "   1 | rule r(x) x^2 becomes x\n"
         "                 ^\n"},
        {"rule r(x): x^2",
         "bad.tw:1:15: error: the rule `r` needs `becomes` and what its pattern is replaced by\n"
         "   1 | rule r(x): x^2\n"
         "                     ^\n"},
        {"rule r(x): x^2 becomes x becomes y",
         "bad.tw:1:26: error: a second `becomes` in the same rule\n"
         "   1 | rule r(x): x^2 becomes x becomes y\n"
         "                                ^^^^^^^\n"},
        {"rule r(x): x^2 becomes x because DLMF",
         "bad.tw:1:34: error: expected a source in quotes after `because`, found `DLMF`\n"
         "   1 | rule r(x): x^2 becomes x because DLMF\n"
         "                                        ^^^^\n"},
        {"pass p = repeat",
         "bad.tw:1:16: error: expected the name of a rule or a pass, or `repeat`, `everywhere`, `once`, but the line ends\n"
         "   1 | pass p = repeat\n"
         "                      ^\n"},
        {"check r",
         "bad.tw:1:7: error: expected `rule`, `recurrence` or a file in quotes after `check`, found `r`\n"
         "   1 | check r\n"
         "             ^\n"},
        {"check recurrence c[n] of A",
         "bad.tw:1:23: error: expected `=` and the recurrence's right side, found `of`\n"
         "   1 | check recurrence c[n] of A\n"
         "                             ^^\n"},
        {"why power_decay",
         "bad.tw:1:5: error: expected `not` and a rule's name after `why`, found `power_decay`\n"
         "   1 | why power_decay\n"
         "           ^^^^^^^^^^^\n"},
        {"coefficients A",
         "bad.tw:1:14: error: expected `of` and an expansion after `coefficients`, found `A`\n"
         "   1 | coefficients A\n"
         "                    ^\n"},
        {"steps of A",
         "bad.tw:1:7: error: `steps` takes the name without `of`: `steps A`\n"
         "   1 | steps of A\n"
         "             ^^\n"},
        {"substitute t",
         "bad.tw:1:13: error: expected `=` and what takes the variable's place, but the line ends\n"
         "   1 | substitute t\n"
         "                   ^\n"},
        {"repeat parts 3",
         "bad.tw:1:15: error: expected `times` after the number, but the line ends\n"
         "   1 | repeat parts 3\n"
         "                     ^\n"},
        {"integrate by parts",
         "bad.tw:1:11: error: expected `termwise`, or `back in` and a parameter, after `integrate`, found `by`\n"
         "   1 | integrate by parts\n"
         "                 ^^\n"},
        {"split 1",
         "bad.tw:1:7: error: expected `at` and a point after `split`, found `1`\n"
         "   1 | split 1\n"
         "             ^\n"},
        {"let A = \001",
         "bad.tw:1:9: error: a control character (0x01) means nothing here\n"
         "   1 | let A = ?\n"
         "               ^\n"},
        {"let A = \377",
         "bad.tw:1:9: error: bad byte 0xFF: the text is not UTF-8 here\n"
         "   1 | let A = ?\n"
         "               ^\n"},
        {"let A = \"a\\nb\"",
         "bad.tw:1:11: error: within a text only `\\\"` and `\\\\` may follow a `\\`\n"
         "   1 | let A = \"a\\nb\"\n"
         "                 ^^\n"},
        {"let A = 1e1000001",
         "bad.tw:1:9: error: `1e1000001` is too long a number: at most 100000 digits and an exponent of at most 1000000\n"
         "   1 | let A = 1e1000001\n"
         "               ^^^^^^^^^\n"},
        {"let Ωμέγα = 変数 変数",
         "bad.tw:1:16: error: expected the end of the statement, found `変数`; "
         "multiplication is always written, with `*`\n"
         "   1 | let Ωμέγα = 変数 変数\n"
         "                        ^^^^\n"},
        {"\tlet A = (\t1 ]",
         "bad.tw:1:14: error: `]` does not close the `(` of line 1\n"
         "   1 | \tlet A = (\t1 ]\n"
         "       \t         \t  ^\n"},
        {"let A = (1 +\n"
         "  2 +\n"
         "\n"
         "large s",
         "bad.tw:4:1: error: `+` needs an operand here; "
         "`large` opens a statement\n"
         "   4 | large s\n"
         "       ^^^^^\n"},
        {"large s\r\n"
         "let A = 3 +* 4\r\n",
         "bad.tw:2:12: error: `+` needs an operand here\n"
         "   2 | let A = 3 +* 4\n"
         "                  ^\n"},
        {"# only\n"
         "let A = 3 $ 4",
         "bad.tw:2:11: error: `$` means nothing here\n"
         "   2 | let A = 3 $ 4\n"
         "                 ^\n"},
        {"let A = {x}",
         "bad.tw:1:9: error: `{` means nothing here; "
         "type `(`\n"
         "   1 | let A = {x}\n"
         "               ^\n"},
        {"let A = x;",
         "bad.tw:1:10: error: `;` means nothing here; "
         "type each statement on a line of its own\n"
         "   1 | let A = x;\n"
         "                ^\n"},
        {"let A = ∫ x",
         "bad.tw:1:9: error: `∫` means nothing here; "
         "type `integral from ... to ... of ... dx`\n"
         "   1 | let A = ∫ x\n"
         "               ^\n"},
        {"let A = 変 ] 数",
         "bad.tw:1:11: error: expected the end of the statement, found `]`\n"
         "   1 | let A = 変 ] 数\n"
         "                  ^\n"},
};

static void bad_statements_are_explained(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
        text out;
        text_init(&out);
        complain(&out, bad[k].input, strlen(bad[k].input));
        assert_string_equal(out.bytes, bad[k].complaint);
        text_clear(&out);
    }
}

static void check_bytes(const char *bytes, size_t length, const char *complaint)
{
    text out;
    text_init(&out);
    complain(&out, bytes, length);
    assert_string_equal(out.bytes, complaint);
    text_clear(&out);
}

static void a_nul_is_reported_and_ends_nothing(void **state)
{
    static const char bytes[] = "let A = a\0b\nlet B = \0";
    (void)state;
    check_bytes(bytes, sizeof bytes - 1,
                "bad.tw:1:10: error: bad byte 0x00: a NUL has no place in a text\n"
                "   1 | let A = a?b\n"
                "                ^\n"
                "bad.tw:2:9: error: bad byte 0x00: a NUL has no place in a text\n"
                "   2 | let B = ?\n"
                "               ^\n");
}

static void bytes_that_are_no_utf_8_are_reported(void **state)
{
    (void)state;
    static const char *const wrong[] = {"\x80", "\xC0\x80", "\xE2\x82", "\xED\xA0\x80", "\xF8\x88\x80\x80\x80",
                                        "\xF4\x90\x80\x80"};
    for (size_t k = 0; k < sizeof wrong / sizeof *wrong; k++) {
        text in, out;
        text_init(&in);
        text_init(&out);
        text_addf(&in, "let ä = %s", wrong[k]);
        complain(&out, in.bytes, in.length);
        text words;
        text_init(&words);
        text_addf(&words, "bad.tw:1:9: error: bad byte 0x%02X: the text is not UTF-8 here\n   1 | let ä = ",
                  (unsigned)(unsigned char)wrong[k][0]);
        assert_memory_equal(out.bytes, words.bytes, words.length);
        text_clear(&words);
        text_clear(&out);
        text_clear(&in);
    }
}

static void all_errors_of_a_text_are_reported(void **state)
{
    (void)state;
    static const char text_of_many[] = "large s\n"
                                       "let A = (1 + 2\n"
                                       "let B = 3\n"
                                       "rule r(x):\n"
                                       "    integral from 0 inf of x dx\n"
                                       "    becomes x\n"
                                       "    when x > 0\n"
                                       "lett C = 4\n"
                                       "let D = f(1,\n"
                                       "  2 3,\n"
                                       "  4)\n"
                                       "quit now\n";
    check_bytes(text_of_many, sizeof text_of_many - 1,
                "bad.tw:3:1: error: expected `)` for the `(` of line 2, found `let`\n"
                "   3 | let B = 3\n"
                "       ^^^\n"
                "bad.tw:5:21: error: expected `to` and the upper limit, found `inf`\n"
                "   5 |     integral from 0 inf of x dx\n"
                "                           ^^^\n"
                "bad.tw:8:1: error: expected the opening word of a statement, found `lett`; did you mean `let`?\n"
                "   8 | lett C = 4\n"
                "       ^^^^\n"
                "bad.tw:10:5: error: expected `)` for the `(` of line 9, found `3`; multiplication is always written, with `*`\n"
                "  10 |   2 3,\n"
                "           ^\n"
                "bad.tw:12:6: error: expected the end of the statement, found `now`\n"
                "  12 | quit now\n"
                "            ^^^\n");
}

static void a_long_line_is_shown_in_part(void **state)
{
    (void)state;
    text in, out;
    text_init(&in);
    text_init(&out);
    text_add(&in, "let A = 1");
    for (int k = 0; k < 100000; k++)
        text_add(&in, " + é*x");
    text_add(&in, " +) - 1");
    for (int k = 0; k < 100000; k++)
        text_add(&in, " + é*x");
    complain(&out, in.bytes, in.length);
    assert_string_equal(out.bytes,
                        "bad.tw:1:600012: error: `+` needs an operand here\n"
                        "   1 | ...*x + é*x + é*x + é*x + é*x + é*x + é*x + é*x + é*x +) - 1 + é*x + é*x + é*x + é*x + é*x...\n"
                        "                                                              ^\n");
    text_clear(&out);
    text_clear(&in);
}

static void places_are_found_in_any_order(void **state)
{
    (void)state;
    static const char bytes[] = "a\nbé\xFFz\r\n\n\xE5\xA4\x89x";
    static const struct {
        uint32_t offset, line, column;
    } places[] = {{0, 1, 1}, {1, 1, 2}, {2, 2, 1}, {3, 2, 2}, {5, 2, 3}, {6, 2, 4}, {7, 2, 5}, {9, 3, 1}, {10, 4, 1},
                  {13, 4, 2}, {14, 4, 3}};
    enum { COUNT = sizeof places / sizeof *places };
    source s;
    source_init(&s, "x", bytes, sizeof bytes - 1);
    for (unsigned k = 0; k < 200; k++) {
        unsigned j = k * 7 % COUNT;
        source_place p = source_find(&s, places[j].offset);
        assert_int_equal(p.line, places[j].line);
        assert_int_equal(p.column, places[j].column);
    }
}

static void a_span_over_lines_is_marked_to_its_first_line_end(void **state)
{
    (void)state;
    static const char bytes[] = "one two\nthree";
    source s;
    text out;
    text_init(&out);
    source_init(&s, "x", bytes, sizeof bytes - 1);
    source_show_error(&s, &out, (span){4, 12}, "here");
    source_show_error(&s, &out, (span){13, 13}, "at the end");
    source_show_error(&s, &out, (span){7, 7}, "at the line's end");
    assert_string_equal(out.bytes, "x:1:5: error: here\n   1 | one two\n           ^^^\n"
                                   "x:2:6: error: at the end\n   2 | three\n            ^\n"
                                   "x:1:8: error: at the line's end\n   1 | one two\n              ^\n");
    text_clear(&out);
}

static void the_number_of_kept_errors_is_bounded(void **state)
{
    (void)state;
    text in;
    source s;
    syntax_text t;
    text_init(&in);
    for (int k = 0; k < 1000; k++)
        text_add(&in, "let = 3\nlarge s\n");
    source_init(&s, "x", in.bytes, in.length);
    syntax_text_init(&t);
    parse_text(&s, &t);
    assert_int_equal(t.error_count, SYNTAX_ERROR_LIMIT);
    assert_int_equal(t.count, 1000);
    assert_non_null(strstr(t.errors[SYNTAX_ERROR_LIMIT - 1].words, "errors after this one are not shown"));
    syntax_text_clear(&t);
    text_clear(&in);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(bad_statements_are_explained),
        cmocka_unit_test(a_nul_is_reported_and_ends_nothing),
        cmocka_unit_test(bytes_that_are_no_utf_8_are_reported),
        cmocka_unit_test(all_errors_of_a_text_are_reported),
        cmocka_unit_test(a_long_line_is_shown_in_part),
        cmocka_unit_test(places_are_found_in_any_order),
        cmocka_unit_test(a_span_over_lines_is_marked_to_its_first_line_end),
        cmocka_unit_test(the_number_of_kept_errors_is_bounded),
    };
    return cmocka_run_group_tests_name("source", tests, NULL, NULL);
}
