/* Printing: the manner in which a mathematician would write, and that what is printed can be typed: each text, and
 * each of many random trees, reads back as the same node. */
#include "tests/engine/expr/plain.h"
#include "tests/engine/method/texts.h"

static tw_engine *e;

/* typed reads as an expression that prints as shown, which reads back. */
static void prints(const char *typed, const char *shown)
{
    expr *a = text_parse(e, typed);
    char *t = expr_text(e, a);
    assert_string_equal(t, shown);
    assert_ptr_equal(text_parse(e, t), a);
    free(t);
}

static void sums(void **state)
{
    (void)state;
    prints("x + 1", "1 + x");
    prints("n + 1", "n + 1");
    prints("1/2 + nu", "nu + 1/2");
    prints("1 + 2*n", "2*n + 1");
    prints("x^2 + 1", "1 + x^2");
    prints("r^3 - r - 1", "r^3 - r - 1");
    prints("-1 + x", "x - 1");
    prints("-x + 2", "2 - x");
    prints("-x + y", "y - x");
    prints("-x - y", "-x - y");
    prints("-1 - x", "-x - 1");
    prints("y^2 + 2*y*x + x^2", "x^2 + 2*x*y + y^2");
    prints("1 - x + x^2 - x^3", "1 - x + x^2 - x^3");
    prints("9*s^-5 + s^-1 - s^-3", "s^-1 - s^-3 + 9*s^-5");
    prints("1 + 1/s - 1/s^2", "1 + s^-1 - s^-2");
    prints("x + 2*(y + 1)", "x + 2*(1 + y)");
    prints("sin(x) - (x - x^3/6)", "sin(x) - x + x^3/6");
    prints("exp(-s*x - x^2)", "exp(-s*x - x^2)");
}

static void products_and_powers(void **state)
{
    (void)state;
    prints("exp(-s*x)*(1 + x^2)^-(1/2)", "exp(-s*x)/sqrt(1 + x^2)");
    prints("exp(-s*x)*x^(-1/2)", "exp(-s*x)/sqrt(x)");
    prints("x^n*exp(-a*x)", "x^n*exp(-a*x)");
    prints("1/(x + 1)", "1/(1 + x)");
    prints("1/((1 + x)*(2 + y)^2)", "1/((1 + x)*(2 + y)^2)");
    prints("x/(2*(x + 1))", "x/(2*(1 + x))");
    prints("1/s^3", "s^-3");
    prints("x^(-2/3)", "x^(-2/3)");
    prints("9/2/s^5", "9/2*s^-5");
    prints("s^-1*a", "a*s^-1");
    prints("x/2", "x/2");
    prints("3*x/2", "3*x/2");
    prints("-x/2", "-x/2");
    prints("-3/4", "-3/4");
    prints("sqrt(12)", "2*sqrt(3)");
    prints("sqrt(6)*x", "sqrt(6)*x");
    prints("1/sqrt(2)", "sqrt(2)/2");
    prints("6^(2/3)", "6^(2/3)");
    prints("sqrt(x^2)", "sqrt(x^2)");
    prints("(x^2)^a", "(x^2)^a");
    prints("(x^a)^b", "(x^a)^b");
    prints("x^a^b", "x^(a^b)");
    prints("x^(n + 1)", "x^(n + 1)");
    prints("x^(-a)", "x^(-a)");
    prints("(-x)^a", "(-x)^a");
    prints("(x*y)^a", "(x*y)^a");
    prints("sqrt(x*y)", "sqrt(x*y)");
    prints("(-1)^n", "(-1)^n");
    prints("(-1)^(1/3)", "(-1)^(1/3)");
    prints("6^n", "6^n");
    prints("(a + b)^(1/3)/pi", "(a + b)^(1/3)/pi");
    prints("sqrt(2*pi/s)", "sqrt(2)*sqrt(pi)*sqrt(s^-1)");
    prints("n!", "Gamma(n + 1)");
    prints("2*i*x", "2*i*x");
    prints("-inf", "-inf");
    prints("(1 + x)*(1 - x)", "(1 - x)*(1 + x)");
    prints("-1*((a + b)*c)", "-c*(a + b)");
    prints("-1/2*(a + b)", "-1/2*(a + b)");
    prints("-((a + b)*(x + 1))", "-((1 + x)*(a + b))");
}

static void binders(void **state)
{
    (void)state;
    prints("integral from 0 to inf of exp(-s*x) dx", "integral from 0 to inf of exp(-s*x) dx");
    prints("integral from a to b of x + x^2 dx", "integral from a to b of x + x^2 dx");
    prints("(integral from 0 to 1 of exp(-x*s) dx)^2", "(integral from 0 to 1 of exp(-s*x) dx)^2");
    prints("s*(integral from 0 to 1 of exp(-x*s) dx) + 1", "1 + s*integral from 0 to 1 of exp(-s*x) dx");
    prints("integral from 0 to 1 of (integral from 0 to x of sin(x*y) dy) dx",
           "integral from 0 to 1 of integral from 0 to x of sin(x*y) dy dx");
    prints("sum from k = 0 to n of x^k/k!", "sum from k = 0 to n of x^k/Gamma(k + 1)");
    prints("2*(sum from k = 0 to n of (1 + k))", "2*(sum from k = 0 to n of (k + 1))");
    prints("1 - (sum from k = 1 to 3 of x^k)", "1 - (sum from k = 1 to 3 of x^k)");
    prints("integral along inf(pi) to 0 to inf(theta) of exp(-z^2) dz",
        "integral along inf(pi) to 0 to inf(theta) of exp(-z^2) dz");
    prints("root of r^3 - r - 1 in r near 1.25", "root of r^3 - r - 1 in r near 5/4");
    prints("2*(root of r^3 - r - 1 in r near 1.25)", "2*(root of r^3 - r - 1 in r near 5/4)");
    prints("piecewise(x^2 when x < 1, 2 - x otherwise)", "piecewise(x^2 when x < 1, 2 - x otherwise)");
    prints("1 + piecewise(x^2 when x > a, 3 when x != 2, 2 - x otherwise)",
           "1 + piecewise(x^2 when a < x, 3 when x != 2, 2 - x otherwise)");
    prints("min(x, 3, y)", "min(3, x, y)");
}

/* A bound name gives way to a free one, and to the names around it. */
static void bound_names_give_way(void **state)
{
    (void)state;
    expr *x = expr_symbol(e, "x"), *y = expr_symbol(e, "y"), *u = expr_symbol(e, "u");
    expr *a = expr_integral(e, u, expr_int(e, 0), expr_int(e, 1), expr_call1(e, FUNCTION_COS, expr_mul(e, u, y)));
    expr *moved = expr_substitute(e, a, y, u);
    char *t = expr_text(e, moved);
    assert_string_equal(t, "integral from 0 to 1 of cos(u*u1) du1");
    assert_ptr_equal(text_parse(e, t), moved);
    free(t);
    expr *d = expr_symbol(e, "du"); /* `du` would close the integral */
    moved = expr_substitute(e, a, y, d);
    t = expr_text(e, moved);
    assert_string_equal(t, "integral from 0 to 1 of cos(du*u1) du1");
    assert_ptr_equal(text_parse(e, t), moved);
    free(t);
    expr *fresh = expr_fresh(e, "x"), *other = expr_fresh(e, "x");
    expr *sum = expr_add(e, expr_add(e, x, fresh), other);
    assert_int_equal(sum->count, 3);
    t = expr_text(e, sum);
    assert_string_equal(t, "x + x1 + x2");
    free(t);
    t = expr_text(e, fresh);
    assert_string_equal(t, "x");
    free(t);
}

static void conditions(void **state)
{
    expr *x = expr_symbol(e, "x"), *y = expr_symbol(e, "y"), *zero = expr_int(e, 0);
    const struct { expr *condition; const char *words; } rows[] = {
        {expr_relation_of(e, RELATION_LESS, zero, x), "x > 0"},
        {expr_relation_of(e, RELATION_LESS_EQUAL, zero, x), "x >= 0"},
        {expr_relation_of(e, RELATION_LESS, x, zero), "x < 0"},
        {expr_relation_of(e, RELATION_LESS, y, x), "y < x"},
        {expr_relation_of(e, RELATION_EQUAL, zero, x), "x = 0"},
        {expr_relation_of(e, RELATION_NOT_EQUAL, y, x), "x != y"},
        {expr_relation_of(e, RELATION_INTEGER, x, NULL), "x integer"},
        {expr_relation_of(e, RELATION_COMPLEX, x, x), "x complex"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        char *t = expr_text(e, rows[k].condition);
        assert_string_equal(t, rows[k].words);
        free(t);
    }
}

static expr *random_leaf(void)
{
    static const char *const names[] = {"x", "y", "n", "s", "nu", "dx"};
    switch (plain_random(5)) {
    case 0: return expr_frac(e, (slong)plain_random(19) - 9, 1 + (slong)plain_random(5));
    case 1: return expr_constant_of(e, plain_random(3) == 0 ? CONSTANT_I : plain_random(2) ? CONSTANT_PI
        : CONSTANT_EULER);
    default: return expr_symbol(e, names[plain_random(6)]);
    }
}

static expr *random_tree(int depth)
{
    static const function_id some[] = {FUNCTION_EXP, FUNCTION_LOG, FUNCTION_SIN, FUNCTION_GAMMA, FUNCTION_ABS,
        FUNCTION_ERFC};
    if (depth == 0)
        return random_leaf();
    expr *a = random_tree(depth - 1), *b = random_tree(depth - 1), *x = expr_symbol(e, "x");
    expr *const both[2] = {a, b};
    switch (plain_random(13)) {
    case 0: case 1: return expr_add(e, a, b);
    case 2: return expr_sub(e, a, b);
    case 3: case 4: return expr_mul(e, a, b);
    case 5: return expr_div(e, a, b);
    case 6: return expr_pow(e, a, b);
    case 7: return expr_pow(e, a, expr_frac(e, (slong)plain_random(9) - 4, 1 + (slong)plain_random(3)));
    case 8: return expr_integral(e, x, random_leaf(), a, b);
    case 9: return expr_summation(e, expr_symbol(e, "n"), random_leaf(), a, b);
    case 10: return expr_call(e, plain_random(2) ? FUNCTION_BESSEL_J : FUNCTION_MAX, both, 2);
    case 11: {
        expr *when = expr_relation_of(e, plain_random(2) ? RELATION_LESS : RELATION_LESS_EQUAL, a, x);
        return expr_piecewise(e, &when, &b, 1, random_leaf());
    }
    default: return expr_call1(e, some[plain_random(6)], a);
    }
}

static void random_trees_read_back(void **state)
{
    int read = 0;
    (void)state;
    for (int k = 0; k < 20000; k++) {
        expr *a = random_tree(1 + (int)plain_random(4));
        engine_forgive(e);
        if (!a)
            continue;
        char *t = expr_text(e, a);
        if (strlen(t) > 50000) { /* a typed number has at most 100000 digits */
            free(t);
            continue;
        }
        expr *back = text_parse(e, t);
        if (back != a) {
            char *again = expr_text(e, back);
            fail_msg("`%s` reads as `%s`", t, again);
        }
        free(t);
        read++;
    }
    assert_true(read > 10000);
}

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    return 0;
}

static int tear_down(void **state)
{
    (void)state;
    tw_engine_free(e);
    flint_cleanup();
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(sums),
        cmocka_unit_test(products_and_powers),
        cmocka_unit_test(binders),
        cmocka_unit_test(bound_names_give_way),
        cmocka_unit_test(conditions),
        cmocka_unit_test(random_trees_read_back),
    };
    plain_seed("test_print");
    return cmocka_run_group_tests_name("test_print", tests, set_up, tear_down);
}
