/* Derivatives against central differences in 200 bits: each function of the table, random trees, integrals and sums
 * with ends that move. */
#include "tests/engine/expr/plain.h"

static tw_engine *e;
static expr *x, *y;

static expr *n(slong k)
{
    return expr_int(e, k);
}

static expr *call2(function_id f, expr *a, expr *b)
{
    expr *const args[2] = {a, b};
    return expr_call(e, f, args, 2);
}

/* (f(x + h) - f(x - h))/(2 h) with h = 2^-50: its own error is about h^2 = 1e-30 times the third derivative. */
static void difference(acb_t out, expr *f, plain_env *v, const acb_t at)
{
    acb_t h, point, below;
    acb_init(h);
    acb_init(point);
    acb_init(below);
    acb_one(h);
    acb_mul_2exp_si(h, h, -50);
    acb_add(point, at, h, PLAIN_BITS);
    plain_bind(v, x, point);
    plain_eval(e, out, f, v);
    acb_sub(point, at, h, PLAIN_BITS);
    plain_bind(v, x, point);
    plain_eval(e, below, f, v);
    acb_sub(out, out, below, PLAIN_BITS);
    acb_mul_2exp_si(out, out, 49);
    plain_bind(v, x, at);
    acb_clear(h);
    acb_clear(point);
    acb_clear(below);
}

/* Returns whether both sides were sharp enough to be compared. */
static bool agrees(expr *f, double re, double im)
{
    plain_env v;
    acb_t at, rule, quotient;
    plain_env_init(&v);
    acb_init(at);
    acb_init(rule);
    acb_init(quotient);
    acb_set_d(at, 0.7);
    plain_bind(&v, y, at);
    acb_set_d_d(at, re, im);
    plain_bind(&v, x, at);
    difference(quotient, f, &v, at);
    expr *derivative = expr_derivative(e, f, x);
    assert_non_null(derivative);
    plain_eval(e, rule, derivative, &v);
    const bool sharp = acb_is_finite(rule) && acb_is_finite(quotient) && acb_rel_accuracy_bits(rule) > 40 &&
                       acb_rel_accuracy_bits(quotient) > 40;
    if (sharp && plain_distance(rule, quotient) > 1e-12) {
        char *words = expr_text(e, f), *derived = expr_text(e, derivative);
        print_message("derivative of %s at %g %+gi: %s\n", words, re, im, derived);
        acb_printd(rule, 20);
        printf("  but  ");
        acb_printd(quotient, 20);
        printf("\n");
        free(words);
        free(derived);
        fail();
    }
    acb_clear(at);
    acb_clear(rule);
    acb_clear(quotient);
    plain_env_clear(&v);
    return sharp;
}

static void every_function_of_one(void **state)
{
    static const double points[][2] = {{0.3, 0}, {0.9, 0}, {1.7, 0}, {2.6, 0}, {-0.4, 0}, {-1.6, 0}, {0.4, 0.8}, {1.3,
        -0.6}, {-0.7, 1.1}};
    (void)state;
    for (int f = 0; f < FUNCTION_COUNT; f++) {
        if (function_fewest(f) != 1 || function_most(f) != 1 || f == FUNCTION_ZETA)
            continue;
        const bool real_only = f == FUNCTION_SIGN || f == FUNCTION_ABS || f == FUNCTION_RE || f == FUNCTION_IM ||
                               f == FUNCTION_CONJ || f == FUNCTION_ARG || f == FUNCTION_EI || f == FUNCTION_AI
                                   || f == FUNCTION_BI;
        int compared = 0;
        for (size_t k = 0; k < sizeof points / sizeof *points; k++)
            if (points[k][1] == 0 || !real_only)
                compared += agrees(expr_call1(e, f, x), points[k][0], points[k][1]);
        if (compared < 2 && f != FUNCTION_IM && f != FUNCTION_ARG && f != FUNCTION_SIGN) {
            print_message("%s was compared at %d points only\n", function_name(f), compared);
            fail();
        }
    }
}

static void every_function_of_two(void **state)
{
    static const function_id bessel[] = {FUNCTION_BESSEL_J, FUNCTION_BESSEL_Y, FUNCTION_BESSEL_I, FUNCTION_BESSEL_K,
                                         FUNCTION_GAMMA_UPPER};
    (void)state;
    for (size_t k = 0; k < sizeof bessel / sizeof *bessel; k++)
        for (slong order = -5; order <= 5; order++) {
            assert_true(agrees(call2(bessel[k], expr_frac(e, order, 3), x), 1.3, 0));
            assert_true(agrees(call2(bessel[k], expr_frac(e, order, 2), x), 0.6, 1.9));
        }
    assert_true(agrees(call2(FUNCTION_BETA, x, y), 1.25, 0));
    assert_true(agrees(call2(FUNCTION_BETA, y, expr_add(e, x, n(1))), 1.25, 0.5));
    assert_true(agrees(call2(FUNCTION_POLYGAMMA, n(2), x), 1.25, 0.5));
    assert_true(agrees(call2(FUNCTION_MIN, expr_pow(e, x, n(2)), y), 0.3, 0));
    assert_true(agrees(call2(FUNCTION_MIN, expr_pow(e, x, n(2)), expr_sub(e, y, x)), 1.3, 0));
    assert_true(agrees(call2(FUNCTION_MAX, expr_pow(e, x, n(2)), expr_sub(e, y, x)), 1.3, 0));
    expr *const three[3] = {x, expr_pow(e, x, n(3)), expr_sub(e, y, x)};
    assert_true(agrees(expr_call(e, FUNCTION_MAX, three, 3), 1.3, 0));
    assert_true(agrees(expr_call(e, FUNCTION_MIN, three, 3), 0.2, 0));
}

static void parameters_without_a_derivative_say_so(void **state)
{
    (void)state;
    expr *const bad[] = {call2(FUNCTION_BESSEL_K, x, y), call2(FUNCTION_GAMMA_UPPER, x, y), call2(FUNCTION_POLYGAMMA,
        x, y),
                         expr_call1(e, FUNCTION_ZETA, x), expr_summation(e, y, n(0), x, y),
                         expr_call1(e, FUNCTION_AI, expr_mul(e, x, expr_constant_of(e, CONSTANT_I)))};
    for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
        assert_non_null(bad[k]);
        assert_null(expr_derivative(e, bad[k], x));
        assert_int_equal(e->error.kind, ERROR_VALUE);
        engine_forgive(e);
    }
    assert_true(expr_is_zero(expr_derivative(e, call2(FUNCTION_BESSEL_K, y, y), x)));
    assert_null(expr_derivative(e, x, n(1)));
    engine_forgive(e);
}

static void moduli_of_complex_values(void **state)
{
    (void)state;
    expr *w = expr_add(e, expr_pow(e, x, n(2)), expr_mul(e, expr_constant_of(e, CONSTANT_I), expr_call1(e,
        FUNCTION_SIN, x)));
    assert_true(agrees(expr_call1(e, FUNCTION_ABS, w), 0.8, 0));
    assert_true(agrees(expr_call1(e, FUNCTION_ARG, w), 0.8, 0));
    assert_true(agrees(expr_call1(e, FUNCTION_RE, expr_call1(e, FUNCTION_EXP, w)), 0.8, 0));
    assert_true(agrees(expr_call1(e, FUNCTION_CONJ, w), 0.8, 0));
}

static void powers_and_binders(void **state)
{
    (void)state;
    expr *t = expr_symbol(e, "t"), *k = expr_symbol(e, "k"), *xt = expr_mul(e, x, t);
    assert_true(agrees(expr_pow(e, x, x), 1.3, 0.4));
    assert_true(agrees(expr_pow(e, expr_add(e, x, y), expr_mul(e, y, x)), 1.3, 0.4));
    assert_true(agrees(expr_pow(e, n(2), x), 1.3, 0.4));
    expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, xt));
    expr *integral = expr_integral(e, t, expr_pow(e, x, n(2)), expr_add(e, x, n(1)), kernel);
    assert_true(agrees(integral, 0.6, 0));
    assert_true(agrees(expr_mul(e, x, integral), 0.6, 0));
    assert_true(agrees(expr_summation(e, k, n(1), n(5), expr_pow(e, x, k)), 0.6, 0));
    expr *inner = expr_integral(e, k, n(0), t, expr_mul(e, expr_pow(e, k, n(2)), xt));
    assert_true(agrees(expr_integral(e, t, n(0), x, inner), 0.6, 0));
    expr *far = expr_integral(e, t, x, expr_constant_of(e, CONSTANT_INF), kernel);
    char *words = expr_text(e, expr_derivative(e, far, x));
    assert_string_equal(words, "integral from x to inf of -t*exp(-x*t) dt - exp(-x^2)");
    free(words);
    expr *condition = expr_relation_of(e, RELATION_LESS, x, n(1)), *value = expr_pow(e, x, n(2));
    expr *piecewise = expr_piecewise(e, &condition, &value, 1, expr_sub(e, n(2), x));
    assert_true(agrees(piecewise, 0.5, 0));
    assert_true(agrees(piecewise, 1.5, 0));
}

static void roots_move_with_their_polynomial(void **state)
{
    (void)state;
    expr *r = expr_symbol(e, "r");
    expr *root = expr_root(e, r, expr_sub(e, expr_pow(e, r, n(2)), x), n(2)); /* sqrt(x): the derivative is 1/(2 r) */
    assert_ptr_equal(expr_derivative(e, root, x), expr_div(e, expr_frac(e, 1, 2), root));
}

static expr *random_tree(int depth)
{
    static const function_id analytic[] = {FUNCTION_EXP, FUNCTION_SIN, FUNCTION_COS, FUNCTION_SINH, FUNCTION_COSH,
        FUNCTION_LOG,
                                           FUNCTION_ATAN, FUNCTION_ASINH, FUNCTION_ERF, FUNCTION_TANH, FUNCTION_ACOS};
    if (depth == 0)
        return plain_random(2) ? x : plain_random(2) ? y : n((slong)plain_random(7) - 3);
    expr *a = random_tree(depth - 1);
    switch (plain_random(5)) {
    case 0: return expr_add(e, a, random_tree(depth - 1));
    case 1: return expr_mul(e, a, random_tree(depth - 1));
    case 2: return expr_pow(e, a, expr_frac(e, (slong)plain_random(9) - 4, 1 + (slong)plain_random(3)));
    case 3: return expr_pow(e, a, random_tree(depth - 1));
    default: return expr_call1(e, analytic[plain_random(sizeof analytic / sizeof *analytic)], a);
    }
}

static void random_trees(void **state)
{
    (void)state;
    int compared = 0;
    for (int k = 0; k < 1500; k++) {
        expr *f = random_tree(1 + (int)plain_random(4)), *derivative = f ? expr_derivative(e, f, x) : NULL;
        engine_forgive(e);
        if (derivative)
            compared += agrees(f, plain_uniform(-2, 2), plain_uniform(0.1, 2));
        engine_forgive(e);
    }
    assert_true(compared > 700);
}

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    x = expr_symbol(e, "x");
    y = expr_symbol(e, "y");
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
        cmocka_unit_test(every_function_of_one),
        cmocka_unit_test(every_function_of_two),
        cmocka_unit_test(parameters_without_a_derivative_say_so),
        cmocka_unit_test(moduli_of_complex_values),
        cmocka_unit_test(powers_and_binders),
        cmocka_unit_test(roots_move_with_their_polynomial),
        cmocka_unit_test(random_trees),
    };
    plain_seed("test_derive");
    return cmocka_run_group_tests_name("test_derive", tests, set_up, tear_down);
}
