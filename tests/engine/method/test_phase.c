/* Stationary phase against published expansions, coefficient by coefficient; what it must refuse; real results for real
 * integrals; and remainders: at a point the interval holds the truth, and so does the bound for all values. TW_SEED
 * gives the seed of the random phases. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "engine/method/lanes.h"
#include "engine/numeric/evaluate.h"
#include "tests/engine/ball/balls.h"

static void make(tw_engine *e, expansion *a, const char *integral, slong terms)
{
    facts_set_large(e, expr_symbol(e, "s"), LARGE_POSITIVE, NULL, NULL);
    expansion_init(a);
    if (expand(e, a, text_parse(e, integral), terms, NULL) != TW_OK) fail_msg("%s: %s", integral, e->error.words);
}

/* The n-th term in order of size of the contributions with this prefactor, as a number at s = 7. */
static void assert_terms(const char *integral, const char *const *prefactors, const char *const (*terms)[3])
{
    tw_engine *e = tw_engine_new();
    expansion a;
    make(e, &a, integral, 3);
    expr *s = expr_symbol(e, "s"), *seven = expr_int(e, 7);
    for (int k = 0; prefactors[k]; k++) {
        size_t c = 0;
        expr *wanted = text_parse(e, prefactors[k]);
        while (c < a.contribution_count && a.contributions[c].prefactor != wanted) c++;
        if (c == a.contribution_count) fail_msg("%s has no contribution %s", integral, prefactors[k]);
        term *order;
        slong found;
        assert_int_equal(expansion_order(e, &a, c, 3, &order, &found), TW_OK);
        for (slong n = 0; n < 3 && terms[k][n]; n++) {
            acb_t got, want;
            acb_init(got);
            acb_init(want);
            assert_true(n < found);
            assert_int_equal(ball_value(e, got, expr_substitute(e, expansion_term(e, &a, c, order[n]), s, seven), 200), TW_OK);
            assert_int_equal(ball_value(e, want, expr_substitute(e, text_parse(e, terms[k][n]), s, seven), 200), TW_OK);
            if (!acb_overlaps(got, want)) fail_msg("%s: term %ld of %s is not %s", integral, (long)n, prefactors[k], terms[k][n]);
            acb_clear(got);
            acb_clear(want);
        }
        free(order);
    }
    expansion_clear(&a);
    tw_engine_free(e);
}

/* pi J_0(s) by its integral (DLMF 10.9.1): sqrt(2 pi/s) (cos omega (1 - 9/128 s^-2 ...) + sin omega/8 (s^-1 - 75/128
 * s^-3 ...)), omega = s - pi/4 (DLMF 10.17.3 with a_1 = -1/8, a_2 = 9/128, a_3 = -75/1024, a_4 = 3675/32768). */
static void test_bessel_j(void **state)
{
    (void)state;
    static const char *const prefactors[] = {"cos(pi/4 - s)", "sin(pi/4 - s)", NULL};
    static const char *const terms[][3] = {
        {"sqrt(2*pi/s)", "-sqrt(2*pi/s)*9/128/s^2", "sqrt(2*pi/s)*3675/32768/s^4"},
        {"-sqrt(2*pi/s)/8/s", "sqrt(2*pi/s)*75/1024/s^3", NULL},
    };
    assert_terms("integral from 0 to pi of cos(s*sin(x)) dx", prefactors, terms);
}

/* pi z^(1/4) s^(-1/3) Ai(-z), z = s^(2/3) (DLMF 9.5.1): sqrt(pi) times cos(2s/3 - pi/4) sum (-1)^k u_2k/(2s/3)^2k and
 * sin(2s/3 - pi/4) sum (-1)^k u_2k+1/(2s/3)^(2k+1), u_1 = 5/72, u_2 = 385/10368 (DLMF 9.7.9, 9.7.2). */
static void test_airy(void **state)
{
    (void)state;
    static const char *const prefactors[] = {"sin(pi/4 + 2*s/3)", "cos(pi/4 + 2*s/3)", NULL};
    static const char *const terms[][3] = {
        {"sqrt(pi/s)", "-sqrt(pi/s)*385/10368*(3/(2*s))^2", NULL},
        {"-sqrt(pi/s)*5/72*3/(2*s)", NULL, NULL},
    };
    assert_terms("integral from 0 to inf of cos(s*(x^3/3 - x)) dx", prefactors, terms);
}

/* int_1^inf cos(s x^2) dx = sqrt(pi/(2s)) (1/2 - C) = cos(s)/(4 s^2) (1 - 15/(4 s^2) ...) - sin(s)/(2 s) (1 - 3/(4 s^2)
 * ...) (DLMF 7.2.8, 7.5.3 with 7.12.2, 7.12.3 at z = sqrt(2 s/pi)). */
static void test_fresnel(void **state)
{
    (void)state;
    static const char *const prefactors[] = {"sin(s)", "cos(s)", NULL};
    static const char *const terms[][3] = {
        {"-1/(2*s)", "3/(8*s^3)", "-105/(32*s^5)"},
        {"1/(4*s^2)", "-15/(16*s^4)", "945/(64*s^6)"},
    };
    assert_terms("integral from 1 to inf of cos(s*x^2) dx", prefactors, terms);
}

/* int_0^pi cos(s t)/(1 + t^2) dt ~ (-1)^s * (-2 pi/(1 + pi^2)^2)/s^2 ... for whole s (DLMF 2.11.1 to 2.11.4): the end pi gives
 * q(pi) sin(pi s)/s + q'(pi) cos(pi s)/s^2. */
static void test_warning_example(void **state)
{
    (void)state;
    static const char *const prefactors[] = {"sin(pi*s)", "cos(pi*s)", NULL};
    static const char *const terms[][3] = {
        {"1/((1 + pi^2)*s)", NULL, NULL},
        {"-2*pi/(1 + pi^2)^2/s^2", NULL, NULL},
    };
    assert_terms("integral from 0 to pi of cos(s*x)/(1 + x^2) dx", prefactors, terms);
}

/* A cubic stationary point at an end, and singular ends (DLMF 2.3.15 turned; 5.9.1, 5.9.6, 5.9.7). */
static void test_singular(void **state)
{
    (void)state;
    static const char *const none[] = {"1", NULL};
    static const char *const cubic[][3] = {{"Gamma(1/3)/3*cos(pi/6)*s^(-1/3)", NULL, NULL}};
    static const char *const power[][3] = {{"Gamma(2/3)*cos(pi/3)*s^(-2/3)", NULL, NULL}};
    static const char *const logarithm[][3] = {{"-pi/2/s", NULL, NULL}};
    assert_terms("integral from 0 to inf of cos(s*x^3) dx", none, cubic);
    assert_terms("integral from 0 to inf of x^(-1/3)*cos(s*x) dx", none, power);
    assert_terms("integral from 0 to inf of log(x)*cos(s*x)*exp(-x) dx", none, logarithm);
}

static void test_refusals(void **state)
{
    (void)state;
    text_refused("s", NULL, "integral from 0 to 2 of cos(s*x)*abs(x - 1) dx", NULL, ERROR_UNSUITABLE, "analytic");
    text_refused("s", NULL, "integral from 0 to 2 of cos(s*x)/(1 + (x - 1)^(1/3)) dx", NULL, ERROR_UNSUITABLE, "analytic");
    text_refused("s", NULL, "integral from 0 to 1 of cos(s*x)*sin(s*x^2)*exp(x) dx", NULL, ERROR_UNSUITABLE, "two factors");
    text_refused("s", NULL, "integral from 0 to inf of cos(s*x)/(1 + x^2) dx", NULL, ERROR_UNSUITABLE, "smaller than all");
    text_refused("s", NULL, "integral from 0 to 1 of exp(-s*x) dx", "phase", ERROR_UNSUITABLE, "does not oscillate");
    text_refused("s", NULL, "integral from 0 to 2 of cos(s*(x^2 - exp(x)/3)) dx", NULL, ERROR_UNSUITABLE, "no exact form");
}

/* ---- remainders ---- */

/* The value at the point lies in the interval, and below the bound for all values where one is proved. */
static void judge(tw_engine *e, const char *integral, const char *at_s, slong kept)
{
    expansion a;
    make(e, &a, integral, 4);
    expr *s = expr_symbol(e, "s"), *v = text_parse(e, at_s);
    env at = {1, &s, &v};
    number n;
    number_init(&n);
    evaluate_options o = {.terms = kept};
    acb_t truth, size;
    acb_init(truth);
    acb_init(size);
    if (evaluate_expansion(e, &n, &a, &at, &o) != TW_OK || quadrature(e, truth, a.integral, &at, 20, true, NULL) != TW_OK)
        fail_msg("%s at s = %s: %s", integral, at_s, e->error.words);
    if (n.label == LABEL_PROVED && !acb_overlaps(n.value, truth)) fail_msg("%s at s = %s: the number is wrong", integral, at_s);
    env nowhere = {0, NULL, NULL};
    remainder_bound b;
    remainder_bound_init(&b);
    assert_int_equal(remainder_for_all(e, &b, &a, &nowhere, kept, NULL), TW_OK);
    if (b.label == LABEL_PROVED && !b.from) { /* the terms kept against the truth */
        expr *rest = a.integral;
        for (size_t k = 0; k < a.contribution_count; k++) {
            term *order;
            slong found;
            assert_int_equal(expansion_order(e, &a, k, kept, &order, &found), TW_OK);
            for (slong j = 0; j < found; j++)
                rest = expr_sub(e, rest, expr_mul(e, a.contributions[k].prefactor, expansion_term(e, &a, k, order[j])));
            free(order);
        }
        assert_int_equal(quadrature(e, truth, rest, &at, 8, true, NULL), TW_OK);
        assert_int_equal(ball_value(e, size, expr_substitute(e, b.bound, s, v), 100), TW_OK);
        acb_abs(acb_realref(truth), truth, 100);
        if (arb_gt(acb_realref(truth), acb_realref(size))) fail_msg("%s at s = %s: beyond its proved bound", integral, at_s);
    }
    remainder_bound_clear(&b);
    acb_clear(truth);
    acb_clear(size);
    number_clear(&n);
    expansion_clear(&a);
}

static void test_random(void **state)
{
    (void)state;
    static const char *const phases[] = {"x", "x^2", "x^2 - x", "x^3/3 - x/4", "x + x^2/2", "(x - 1)^2*(x - 1/3)", "x^4/4 - x^2/3"};
    static const char *const amplitudes[] = {"1/(%d + x)", "exp(-x/%d)", "cos(%d*x)", "1/(%d + x^2)", "log(%d + 1 + x)",
                                             "sqrt(%d + x)"};
    random_seed("test_phase");
    int trials = getenv("TW_TRIALS") ? atoi(getenv("TW_TRIALS")) : 12;
    for (int k = 0; k < trials; k++) {
        char q[80], integral[240], s[20];
        const char *p = phases[random_below(sizeof phases / sizeof *phases)];
        snprintf(q, sizeof q, amplitudes[random_below(sizeof amplitudes / sizeof *amplitudes)], 1 + (int)random_below(4));
        snprintf(integral, sizeof integral, "integral from 0 to %s of %s(s*(%s))*%s dx", random_below(2) ? "1" : "2",
                 random_below(2) ? "cos" : "sin", p, q);
        snprintf(s, sizeof s, "%d", 20 + (int)random_below(200));
        tw_engine *e = tw_engine_new();
        judge(e, integral, s, 1 + (slong)random_below(3));
        tw_engine_free(e);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_bessel_j), cmocka_unit_test(test_airy),     cmocka_unit_test(test_fresnel),
        cmocka_unit_test(test_warning_example), cmocka_unit_test(test_singular), cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_random),
    };
    return cmocka_run_group_tests_name("stationary phase", tests, NULL, NULL);
}
