/* Wrapped lines: short enough where they can be, and what is typed as printed is read as printed. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include "lang/parse.h"
#include "lang/wrap.h"

static size_t longest(const char *words)
{
    size_t most = 0;
    while (*words) {
        size_t length = strcspn(words, "\n");
        if (length > most) most = length;
        words += length + (words[length] == '\n');
    }
    return most;
}

/* Both texts are one statement, the same. */
static void check_same(const char *plain, const char *wrapped)
{
    source a, b;
    source_init(&a, "plain", plain, strlen(plain));
    source_init(&b, "wrapped", wrapped, strlen(wrapped));
    syntax_text x, y;
    syntax_text_init(&x);
    syntax_text_init(&y);
    parse_text(&a, &x);
    parse_text(&b, &y);
    assert_int_equal(x.error_count, 0);
    assert_int_equal(y.error_count, 0);
    assert_int_equal(x.count, 1);
    assert_int_equal(y.count, 1);
    assert_true(statement_equal(x.statements[0], y.statements[0]));
    syntax_text_clear(&x);
    syntax_text_clear(&y);
}

static const char *const statements[] = {
    "let g(x) = 2*(1 + tan(x)^2)*exp(sin(x))*cos(x)/(1 + x^2) - 4*x*(1 + tan(x)^2)*exp(sin(x))/(1 + x^2)^2 + 8*x^2*tan(x)",
    "let F = integral from 0 to inf of exp(-s*x)*(1 + x + x^2 + x^3)*cos(a*x)*sin(b*x)/(1 + sqrt(x + y + z)) dx + 3*s^-1",
    "let p = piecewise(x^2 when x < 1, 2 - x when x < 2, exp(-x) - exp(-2)*(x - 3)*(x - 4)*(x - 5)*(x - 6) otherwise)",
    "given a > 0, nu > -1/2, 0 < p < 1, theta in (-pi/4, pi/4], n integer, n >= 0, b > a + 1, c != 0, d < 100000000",
    "let w = -a - b - c - d - f - g - h - k - l - m - n - o - p - q - r - (s - t - u - v)*(w - x)^-3 - (y - z)^(-n - 1)",
};

static void test_reads_back(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof statements / sizeof *statements; k++)
        for (size_t width = 20; width <= 120; width += 7) {
            text out;
            text_init(&out);
            wrap_line(&out, statements[k], width, false);
            check_same(statements[k], out.bytes);
            if (width >= 60) assert_true(longest(out.bytes) <= width);
            text_clear(&out);
        }
}

static void check(const char *line, size_t width, bool prose, const char *wanted)
{
    text out;
    text_init(&out);
    wrap_line(&out, line, width, prose);
    assert_string_equal(out.bytes, wanted);
    text_clear(&out);
}

static void test_places(void **state)
{
    (void)state;
    check("F ~ s^-1 - s^-3", 40, false, "F ~ s^-1 - s^-3");
    check("F ~ 11111111 + 22222222*(33333333 + 44444444)", 30, false, "F ~ 11111111 + 22222222*\n    (33333333 + 44444444)");
    check("F ~ 1111111111 + 2222222222 + ...      (by parts)", 35, false, "F ~ 1111111111 + 2222222222 + ...\n    (by parts)");
    check("  needs: every good thing (and this one) has an end", 31, true,
          "  needs: every good thing\n      (and this one) has an end");
    check("onewordthatcannotbebrokenatall", 10, true, "onewordthatcannotbebrokenatall");
    check("a-b-c-d-e-f-g-h", 8, false, "a-b-c-d-e-f-g-h"); /* a sign without blanks may be a unary minus */
    check("", 10, false, "");
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_reads_back), cmocka_unit_test(test_places)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
