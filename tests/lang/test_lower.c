/* Lowering: texts that must give the same expression, what names stand for, conditions as relations, errors with
 * their place, and the way back: an expression's printed text gives the same expression. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <cmocka.h>

#include "lang/lexer.h"
#include "lang/lower.h"
#include "lang/parse.h"

enum { EXPRESSIONS = 4000 };

static tw_engine *e;
static lower_function own_function;

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    return e == NULL;
}

static int tear_down(void **state)
{
    (void)state;
    tw_engine_free(e);
    return 0;
}

/* ---- a host with some names ---- */

static expr *lower_with(const char *words, lowering *l, text *complaint);

static lower_meaning meaning(void *host, const char *name, expr **value, const char **what)
{
    (void)host;
    if (strcmp(name, "two") == 0)
        *value = expr_int(e, 2);
    else if (strcmp(name, "q") == 0) /* let q = 1/(1 + x) */
        *value = expr_pow(e, expr_add(e, expr_int(e, 1), expr_symbol(e, "x")), expr_int(e, -1));
    else if (strcmp(name, "A") == 0)
        return *what = "an expansion", MEANING_OTHER;
    else
        return strcmp(name, "known") == 0 ? MEANING_DECLARED : MEANING_FREE;
    return MEANING_VALUE;
}

static const lower_function *function(void *host, const char *name)
{
    (void)host;
    return strcmp(name, "f") == 0 && own_function.body != NULL ? &own_function : NULL;
}

static void offer(void *host, suggestion *s)
{
    (void)host;
    suggestion_offer(s, "fade");
}

static void host_init(lowering *l)
{
    lowering_init(l, e, NULL);
    l->meaning = meaning;
    l->function = function;
    l->offer_functions = offer;
}

/* Parses and lowers; NULL with the complaint in full, as a user would see it. */
static expr *lower_with(const char *words, lowering *l, text *complaint)
{
    source s;
    syntax_text t;
    source_init(&s, "in", words, strlen(words));
    syntax_text_init(&t);
    syntax *a = parse_expression_text(&s, &t);
    if (a == NULL)
        fail_msg("does not parse: %s: %s", words, t.errors[0].words);
    expr *result = lower_expression(l, a);
    if (result == NULL) {
        assert_true(l->failed);
        assert_int_not_equal(e->error.kind, ERROR_NONE);
        source_show_error(&s, complaint, l->place, e->error.words);
        engine_forgive(e);
    }
    syntax_text_clear(&t);
    return result;
}

static expr *lower_words(const char *words)
{
    lowering l;
    text complaint;
    text_init(&complaint);
    host_init(&l);
    expr *result = lower_with(words, &l, &complaint);
    if (result == NULL)
        fail_msg("%s", complaint.bytes);
    lowering_clear(&l);
    text_clear(&complaint);
    return result;
}

/* let f(y) = y^2*x + y */
static void define_own_function(void)
{
    static const char words[] = "let f(y) = y^2*x + y";
    source s;
    syntax_text t;
    lowering l;
    host_init(&l);
    source_init(&s, "in", words, strlen(words));
    syntax_text_init(&t);
    parse_text(&s, &t);
    const statement *let = t.statements[0];
    assert_int_equal(lower_function_define(&l, let->as.let.parameters, let->as.let.count, let->as.let.value, &own_function),
                     TW_OK);
    syntax_text_clear(&t);
    lowering_clear(&l);
}

/* ---- same expressions ---- */

static const char *const same[][2] = {
    {"0.25", "1/4"},
    {"1e-8", "1/10^8"},
    {"12.5e3", "12500"},
    {"0.000e7", "0"},
    {"-x^2", "-(x^2)"},
    {"2^-x", "1/2^x"},
    {"2^3^2", "512"},
    {"a - b - c", "a - (b + c)"},
    {"a/b/c", "a/(b*c)"},
    {"a - -b", "a + b"},
    {"a*-b", "-(a*b)"},
    {"n!", "Gamma(n + 1)"},
    {"5!", "120"},
    {"x^n!", "x^Gamma(n + 1)"},
    {"-3!", "-6"},
    {"sqrt(x)", "x^(1/2)"},
    {"\u03c0*\u0393(x)", "pi*Gamma(x)"},
    {"i^2", "-1"},
    {"two*x", "x + x"},
    {"(two at two = 3)", "3"},
    {"(x^2 at x = 3)", "9"},
    {"(x + 2*y at x = y, y = x)", "y + 2*x"},
    {"(q at x = 1)", "1/2"},
    {"derivative of x^3*y in x", "3*x^2*y"},
    {"derivative of x^3 in x order 2", "6*x"},
    {"derivative of x^3 in x order 0", "x^3"},
    {"derivative of x^3 in x order 1 + 1", "3*x^2 + 1"},
    {"derivative of two^2 in two", "4"}, /* at the value that the name has */
    {"integral from 0 to 1 of x^2*s dx", "integral from 0 to 1 of s*t^2 dt"},
    {"integral from 0 to x of x dx", "integral from 0 to x of t dt"},
    {"integral from 0 to 1 of two dtwo", "integral from 0 to 1 of t dt"},
    {"integral from 0 to inf of exp(-s*x)*q dx", "integral from 0 to inf of exp(-s*t)/(1 + t) dt"},
    {"integral from 0 to 1 of integral from 0 to x of x*y dy dx", "integral from 0 to 1 of integral from 0 to a of a*b db da"},
    {"integral along inf(pi/4) to 0 to inf of z dz", "integral along inf(pi/4) to 0 to inf of w dw"},
    {"sum from k = 0 to n of k*x", "sum from j = 0 to n of j*x"},
    {"root of r^2 - 2 in r near 1.4", "root of t^2 - 2 in t near 7/5"},
    {"f(3)", "9*x + 3"},
    {"f(y)", "x*y^2 + y"},
    {"f(x)", "x^3 + x"},
    {"integral from 0 to 1 of f(2) dx", "integral from 0 to 1 of 4*t + 2 dt"},
    {"piecewise(1 when 0 < x < 1, 2 otherwise)", "piecewise(piecewise(1 when x < 1, 2 otherwise) when x > 0, 2 otherwise)"},
    {"piecewise(1 when x > 0, 2 when x = 0, 3 otherwise)", "piecewise(1 when 0 < x, piecewise(2 when x = 0, 3 otherwise) otherwise)"},
    {"piecewise(1 when x in (-inf, 3], 2 otherwise)", "piecewise(1 when x <= 3, 2 otherwise)"},
    {"known*e1", "e1*known"},
};

static void texts_give_the_same_expression(void **state)
{
    (void)state;
    define_own_function();
    for (size_t k = 0; k < sizeof same / sizeof *same; k++) {
        expr *a = lower_words(same[k][0]), *b = lower_words(same[k][1]);
        if (a != b) {
            char *left = expr_text(e, a), *right = expr_text(e, b);
            print_error("%s gives %s\n%s gives %s\n", same[k][0], left, same[k][1], right);
            free(left);
            free(right);
            fail();
        }
    }
}

static void different_texts_do_not(void **state)
{
    static const char *const pairs[][2] = {
        {"x", "y"}, {"2^3^2", "(2^3)^2"}, {"-x^2", "(-x)^2"}, {"integral from 0 to 1 of x dx", "integral from 0 to 1 of x dy"},
        {"piecewise(1 when x < 0, 2 otherwise)", "piecewise(1 when x <= 0, 2 otherwise)"},
        {"Gamma(x)", "Gamma(x, 1)"}, {"gamma", "Gamma(1)"}, {"sum from k = 0 to 2 of k*x", "(sum from k = 0 to 2 of k) + x"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++)
        assert_ptr_not_equal(lower_words(pairs[k][0]), lower_words(pairs[k][1]));
}

/* ---- conditions ---- */

static void conditions_become_relations(void **state)
{
    static const char *const table[][2] = {
        {"given a > 0, 0 > b", "a > 0; b < 0"},
        {"given 0 < p < 1", "p > 0; p < 1"},
        {"given 0 <= p < q2 != 3", "p >= 0; p < q2; q2 != 3"},
        {"given t in (-pi/4, pi/4]", "-pi/4 < t; t <= pi/4"},
        {"given t in [0, inf)", "t >= 0"},
        {"given t in (-inf, inf)", "t real"},
        {"given n integer, n >= 0", "n integer; n >= 0"},
        {"given z complex", "z complex"},
        {"given x = two", "x = 2"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        source s;
        syntax_text t;
        lowering l;
        lower_conditions all;
        text out;
        text_init(&out);
        host_init(&l);
        lower_conditions_init(&all);
        source_init(&s, "in", table[k][0], strlen(table[k][0]));
        syntax_text_init(&t);
        parse_text(&s, &t);
        for (size_t j = 0; j < t.statements[0]->as.given.count; j++)
            assert_int_equal(lower_condition(&l, t.statements[0]->as.given.list[j], &all), TW_OK);
        for (size_t j = 0; j < all.count; j++) {
            text_add(&out, j ? "; " : "");
            expr_print(e, &out, all.list[j]);
        }
        assert_string_equal(out.bytes, table[k][1]);
        syntax_text_clear(&t);
        lower_conditions_clear(&all);
        lowering_clear(&l);
        text_clear(&out);
    }
}

/* ---- errors ---- */

static void errors_name_the_place(void **state)
{
    static const char *const bad[][2] = {
        {"x + e^2", "in:1:5: error: `e` is not declared: Euler's number is exp(1); for a parameter of that name write `given e "
                    "real` first\n   1 | x + e^2\n           ^\n"},
        {"1 + A", "in:1:5: error: `A` is an expansion, not an expression\n   1 | 1 + A\n           ^\n"},
        {"x*snh(y)", "in:1:3: error: there is no function `snh`; did you mean `sinh`?\n   1 | x*snh(y)\n         ^^^\n"},
        {"Fade(y)", "in:1:1: error: there is no function `Fade`; did you mean `fade`?\n   1 | Fade(y)\n       ^^^^\n"},
        {"zzzzzz(y)", "in:1:1: error: there is no function `zzzzzz`\n   1 | zzzzzz(y)\n       ^^^^^^\n"},
        {"pi(2)", "in:1:1: error: `pi` is no function; multiplication is always written: `pi*(...)`\n   1 | pi(2)\n       ^^\n"},
        {"two(2)", "in:1:1: error: `two` is no function; multiplication is always written: `two*(...)`\n"
                   "   1 | two(2)\n       ^^^\n"},
        {"(x at x = 1)*exp(1, 2)", "in:1:14: error: `exp` takes 1 argument, not 2\n   1 | (x at x = 1)*exp(1, 2)\n"
                                   "                    ^^^^^^^^^\n"},
        {"Gamma(1, 2, 3)", "in:1:1: error: `Gamma` takes 1 or 2 arguments, not 3\n   1 | Gamma(1, 2, 3)\n"
                           "       ^^^^^^^^^^^^^^\n"},
        {"1 + J(1)", "in:1:5: error: `J` takes 2 arguments, not 1\n   1 | 1 + J(1)\n           ^^^^\n"},
        {"sqrt(1, 2)", "in:1:1: error: `sqrt` takes 1 argument, not 2\n   1 | sqrt(1, 2)\n       ^^^^^^^^^^\n"},
        {"f(1, 2)", "in:1:1: error: `f` takes 1 argument, not 2\n   1 | f(1, 2)\n       ^^^^^^^\n"},
        {"2*f", "in:1:3: error: `f` is a function: write its argument in brackets\n   1 | 2*f\n         ^\n"},
        {"derivative of x in x order (-1)", "in:1:29: error: the order of a derivative must be a whole number from 0 to 1000\n"
                                          "   1 | derivative of x in x order (-1)\n                                   ^^\n"},
        {"(x at x = 1, x = 2)", "in:1:14: error: `x` is given two values\n   1 | (x at x = 1, x = 2)\n"
                                "                    ^\n"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
        lowering l;
        text complaint;
        text_init(&complaint);
        host_init(&l);
        assert_null(lower_with(bad[k][0], &l, &complaint));
        assert_string_equal(complaint.bytes, bad[k][1]);
        assert_int_equal(l.pending_count, 0);
        assert_null(l.scope);
        lowering_clear(&l);
        text_clear(&complaint);
    }
}

static void a_constructor_s_error_has_a_place(void **state)
{
    (void)state;
    lowering l;
    text complaint;
    text_init(&complaint);
    host_init(&l);
    assert_null(lower_with("x + 3/(2 - two)", &l, &complaint));
    assert_string_equal(complaint.bytes, "in:1:8: error: division by zero\n"
                                         "   1 | x + 3/(2 - two)\n"
                                         "              ^^^^^^^\n");
    lowering_clear(&l);
    text_clear(&complaint);
}

static void counts_are_whole_and_bounded(void **state)
{
    static const struct {
        const char *words;
        slong value; /* -1: refused */
    } table[] = {{"8", 8}, {"two^3 + 1", 9}, {"0", -1}, {"101", -1}, {"1/2", -1}, {"x", -1}, {"1e30", -1}, {"100", 100}};
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        source s;
        syntax_text t;
        lowering l;
        slong n = -1;
        host_init(&l);
        source_init(&s, "in", table[k].words, strlen(table[k].words));
        syntax_text_init(&t);
        tw_status status = lower_count(&l, parse_expression_text(&s, &t), "the number of terms", 1, 100, &n);
        assert_int_equal(status == TW_OK, table[k].value >= 0);
        assert_int_equal(n, table[k].value);
        engine_forgive(e);
        syntax_text_clear(&t);
        lowering_clear(&l);
    }
}

/* ---- depth ---- */

static void deep_texts_end_well(void **state)
{
    static const char *const units[][2] = {{"sin(", ")"}, {"(1 + x*", ")"}, {"(1 + 1/", ")"}, {"(x + 2)^", ""},
                                           {"integral from 0 to 1 of x + ", " dx"}, {"-(1 + x*", ")^2"}};
    (void)state;
    for (size_t k = 0; k < sizeof units / sizeof *units; k++) {
        text words, complaint;
        lowering l;
        text_init(&words);
        text_init(&complaint);
        host_init(&l);
        for (int n = 0; n < 480; n++)
            text_add(&words, units[k][0]);
        text_add(&words, "y");
        for (int n = 0; n < 480; n++)
            text_add(&words, units[k][1]);
        expr *a = lower_with(words.bytes, &l, &complaint); /* an error is as good: it has words and a place */
        assert_true(a != NULL || complaint.length > 0);
        lowering_clear(&l);
        text_clear(&words);
        text_clear(&complaint);
    }
}

/* ---- there and back ---- */

static uint64_t random_state;

static unsigned pick(unsigned n)
{
    random_state = random_state * 6364136223846793005u + 1442695040888963407u;
    return (unsigned)(random_state >> 33) % n;
}

#define PICK(list) (list)[pick(sizeof(list) / sizeof *(list))]

static void write_random(text *out, unsigned size);

static void write_binary(text *out, unsigned size, const char *sign)
{
    text_add(out, "(");
    write_random(out, size);
    text_add(out, sign);
    write_random(out, size);
    text_add(out, ")");
}

static void write_call(text *out, unsigned size)
{
    function_id f = (function_id)pick(FUNCTION_COUNT);
    int most = function_most(f) > 3 ? 3 : function_most(f);
    int n = function_fewest(f) + (int)pick((unsigned)(most - function_fewest(f) + 1));
    text_addf(out, "%s(", function_name(f));
    for (int k = 0; k < n; k++) {
        text_add(out, k ? ", " : "");
        write_random(out, size);
    }
    text_add(out, ")");
}

static void write_condition(text *out)
{
    static const char *const relations[] = {" < ", " <= ", " > ", " = ", " != "};
    write_random(out, 0);
    text_add(out, PICK(relations));
    write_random(out, 1);
}

static void write_random(text *out, unsigned size)
{
    static const char *const leaves[] = {"x", "y", "s", "nu", "dx", "x1", "2", "3", "1/2", "-1", "0.3", "pi", "i", "t", "k",
                                         "euler_constant", "12", "-7/3", "8"};
    static const char *const signs[] = {" + ", " - ", "*", "/", "^"};
    if (size == 0) {
        text_add(out, "(");
        text_add(out, PICK(leaves));
        text_add(out, ")");
        return;
    }
    size--;
    switch (pick(12)) {
    case 0: case 1: case 2: case 3: case 4:
        write_binary(out, size, PICK(signs));
        return;
    case 5:
        text_add(out, "(-");
        write_random(out, size);
        text_add(out, ")");
        return;
    case 6: case 7:
        write_call(out, size);
        return;
    case 8:
        text_add(out, "(integral from ");
        write_random(out, 0);
        text_add(out, pick(2) ? " to inf of " : " to y of ");
        write_random(out, size);
        text_add(out, pick(2) ? " dx)" : " dt)");
        return;
    case 9:
        text_add(out, "(sum from k = 0 to ");
        write_random(out, 0);
        text_add(out, " of ");
        write_random(out, size);
        text_add(out, ")");
        return;
    case 10:
        text_add(out, "piecewise(");
        write_random(out, size);
        text_add(out, " when ");
        write_condition(out);
        text_add(out, ", ");
        write_random(out, size);
        text_add(out, " otherwise)");
        return;
    default:
        text_add(out, pick(2) ? "(integral along inf(pi/4) to 0 to " : "(integral along i to -1 to ");
        write_random(out, 0);
        text_add(out, " of ");
        write_random(out, size);
        text_add(out, " dz)");
        return;
    }
}

static void printed_expressions_come_back(void **state)
{
    (void)state;
    const char *given = getenv("TW_SEED");
    random_state = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL) * 1000003u;
    printf("TW_SEED=%llu\n", (unsigned long long)random_state);
    unsigned built = 0;
    own_function.body = NULL;
    for (unsigned k = 0; k < EXPRESSIONS; k++) {
        text words, complaint;
        lowering l;
        text_init(&words);
        text_init(&complaint);
        lowering_init(&l, e, NULL);
        write_random(&words, 1 + pick(4));
        expr *a = lower_with(words.bytes, &l, &complaint);
        if (a != NULL) {
            char *printed = expr_text(e, a);
            bool typeable = strlen(printed) <= NUMBER_DIGIT_LIMIT; /* a longer one may hold a number that is too long */
            expr *b = typeable ? lower_with(printed, &l, &complaint) : a;
            if (a != b)
                fail_msg("%s\nprints %s\n%s", words.bytes, printed, complaint.bytes ? complaint.bytes : "another expression");
            free(printed);
            built++;
        }
        lowering_clear(&l);
        text_clear(&complaint);
        text_clear(&words);
    }
    assert_true(built > EXPRESSIONS / 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(texts_give_the_same_expression),
        cmocka_unit_test(different_texts_do_not),
        cmocka_unit_test(conditions_become_relations),
        cmocka_unit_test(errors_name_the_place),
        cmocka_unit_test(a_constructor_s_error_has_a_place),
        cmocka_unit_test(counts_are_whole_and_bounded),
        cmocka_unit_test(deep_texts_end_well),
        cmocka_unit_test(printed_expressions_come_back),
    };
    return cmocka_run_group_tests_name("lower", tests, set_up, tear_down);
}
