/* Oscillating integrals by proved paths: closed forms at 40 digits, relations between integrals that go different ways,
 * the laws of a region's proof (a pole inside is a loop, one on the path is refused, an arc that does not vanish is
 * refused). TW_SEED gives the seed of the random amplitudes. */
#include "engine/ball/quadrature_oscillating.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/ball/quadrature.h"
#include "tests/engine/ball/balls.h"

static void take(tw_engine *e, acb_t value, const char *words, const char *s, slong digits)
{
    expr *name = expr_symbol(e, "s"), *v = text_parse(e, s);
    env at = {1, &name, &v};
    if (quadrature(e, value, text_parse(e, words), &at, digits, false, NULL) != TW_OK)
        fail_msg("%s at s = %s: %s", words, s, e->error.words);
}

static void closed(tw_engine *e, acb_t value, const char *words, const char *s)
{
    expr *name = expr_symbol(e, "s");
    assert_int_equal(ball_value(e, value, expr_substitute(e, text_parse(e, words), name, text_parse(e, s)), 400), TW_OK);
}

/* Integrals and their values. */
static const struct {
    const char *integral, *value; /* DLMF */
} forms[] = {
    {"integral from 0 to inf of cos(s*x)/(1+x^2) dx", "pi/2*exp(-s)"},                           /* 1.14, table 1.14.2 */
    {"integral from 0 to inf of cos(s*x)/(1+x^2)^2 dx", "pi/4*(1+s)*exp(-s)"},                   /* from it, in a */
    {"integral from 0 to inf of x*sin(s*x)/(1+x^2) dx", "pi/2*exp(-s)"},                         /* from it, in s */
    {"integral from 0 to inf of cos(s*x)/cosh(x) dx", "pi/(exp(pi*s/2)+exp(-pi*s/2))"},          /* residues */
    {"integral from 0 to inf of exp(-x^2)*cos(s*x) dx", "sqrt(pi)/2*exp(-s^2/4)"},               /* 7.7.3 */
    {"integral from 0 to inf of sin(s*x)/x dx", "pi/2"},                                         /* 6.2.14 */
    {"integral from 0 to inf of (1-cos(s*x))/x^(3/2) dx", "sqrt(2*pi*s)"},                       /* 5.9.6, by parts */
    {"integral from 0 to inf of cos(s*x^2) dx", "sqrt(pi/(8*s))"},                               /* 7.7.3 */
    {"integral from 0 to inf of exp(i*s*x^3) dx", "Gamma(4/3)*s^(-1/3)*exp(i*pi/6)"},            /* 5.9.1 */
    {"integral from 0 to inf of x^(-1/2)*exp(-x)*exp(i*s*x) dx", "sqrt(pi)*(1-i*s)^(-1/2)"},     /* 5.9.1 */
    {"integral from 0 to pi of cos(2*x-s*sin(x)) dx", "pi*J(2, s)"},                             /* 10.9.2 */
    {"integral from -1 to 1 of exp(i*s*x)*sqrt(1-x^2) dx", "pi*J(1, s)/s"},                      /* 10.9.4 */
    {"integral from 1 to inf of sin(s*x)/sqrt(x^2-1) dx", "pi/2*J(0, s)"},                       /* 10.9.12 */
    {"integral from 1 to inf of exp(i*s*x)/x dx", "E1(-i*s)"},                                   /* 6.2.2 */
    {"integral from 0 to inf of cos(s*sinh(x)) dx", "K(0, s)"},                                  /* 10.32.7 */
};

static void test_closed_forms(void **unused)
{
    (void)unused;
    static const char *const at[] = {"10", "100", "10000", "1000000"};
    tw_engine *e = tw_engine_new();
    acb_t got, want;
    acb_init(got);
    acb_init(want);
    for (size_t k = 0; k < sizeof forms / sizeof *forms; k++) {
        for (size_t j = 0; j < sizeof at / sizeof *at; j++) {
            take(e, got, forms[k].integral, at[j], 40);
            closed(e, want, forms[k].value, at[j]);
            if (!acb_overlaps(got, want))
                fail_msg("%s at s = %s misses %s", forms[k].integral, at[j], forms[k].value);
            if (acb_rel_accuracy_bits(got) < 130)
                fail_msg("%s at s = %s: only %ld bits", forms[k].integral, at[j], (long)acb_rel_accuracy_bits(got));
        }
    }
    acb_clear(got);
    acb_clear(want);
    tw_engine_free(e);
}

/* ---- the proof of a region ---- */

static void wave_of(quad_wave *w, tw_engine *e, const char *Q, const char *L)
{
    *w = (quad_wave){.e = e, .z = expr_symbol(e, "x"), .Q = text_parse(e, Q), .L = text_parse(e, L), .pure = true};
    w->slope = expr_derivative(e, w->L, w->z);
    w->values_Q = tape_new(e, w->Q, &w->z, 1);
    w->values_L = tape_new(e, w->L, &w->z, 1);
    w->values_slope = tape_new(e, w->slope, &w->z, 1);
}

static void wave_free(quad_wave *w)
{
    tape_free(w->values_Q);
    tape_free(w->values_L);
    tape_free(w->values_slope);
}

static void test_regions(void **unused)
{
    (void)unused;
    static const struct {
        const char *Q, *L;
        double a, b, height, slope;
        int side;
        quad_verdict verdict;
        size_t loops;
    } cases[] = {
        {"1/(1+x^2)", "10*i*x", 0, INFINITY, 0, 0.5, 1, QUAD_PROVED, 0},      /* the pole is left of the ray */
        {"1/(x-1-i)", "10*i*x", 0, INFINITY, 0, 0.5, 1, QUAD_PROVED, 1},      /* under it */
        {"1/(x-1-i)", "10*i*x", 0, INFINITY, 0, 1, 1, QUAD_SINGULAR, 0},      /* on it */
        {"1/(x-1)", "10*i*x", 0, INFINITY, 0, 0.5, 1, QUAD_SINGULAR, 0},      /* on the range */
        {"1/(1+x^2)", "10*i*x", 0, INFINITY, 0, 0.5, -1, QUAD_INFINITY, 0},   /* the wrong side */
        {"1", "10*i*x", 0, INFINITY, 0, 0.5, 1, QUAD_INFINITY, 0},            /* a = n - 1 */
        {"x^(1/2)", "10*i*x^2", 0, INFINITY, 0, 1, 1, QUAD_PROVED, 0},        /* a < n - 1 */
        {"x", "10*i*x^2", 0, INFINITY, 0, 1, 1, QUAD_INFINITY, 0},
        {"1/(1+x)", "10*i*x^2", 0, INFINITY, 0, 0, 1,   QUAD_INFINITY, 0},    /* turned by too much */
        {"x^(-1/2)", "10*i*x", 0, 1, 1, 0, 1, QUAD_PROVED, 0},                /* a corner that vanishes */
        {"x^(-1)", "10*i*x", 0, 1, 1, 0, 1, QUAD_LOW, 0},                     /* and one that does not */
        {"(1-x)^(-2)", "10*i*x", 0, 1, 1, 0, 1, QUAD_HIGH, 0},
        {"1/(x-1/2-i/2)", "10*i*x", 0, 1, 1, 0, 1, QUAD_PROVED, 1},
        {"1/((x-1/4-i/2)*(x-3/4-i/4))", "10*i*x", 0, 1, 1, 0, 1, QUAD_PROVED, 2},
        {"sqrt(x-1/2-i/2)", "10*i*x", 0, 1, 1, 0, 1, QUAD_SINGULAR, 0},       /* a cut reaches the path */
        {"1/(x-1/2-2*i)", "10*i*x", 0, 1, 1, 0, 1, QUAD_PROVED, 0},           /* above the path */
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        tw_engine *e = tw_engine_new();
        quad_wave w;
        wave_of(&w, e, cases[k].Q, cases[k].L);
        quad_path p = {.a = cases[k].a, .b = cases[k].b, .height = cases[k].height, .slope_a = cases[k].slope,
                       .slope_b = cases[k].slope, .side = cases[k].side, .A = expr_int(e, 0),
                       .B = isfinite(cases[k].b) ? expr_int(e, 1) : NULL};
        quad_loops *loops = malloc(sizeof *loops);
        assert_non_null(loops);
        quad_verdict v = quad_region_prove(&w, &p, loops);
        if (v != cases[k].verdict || (v == QUAD_PROVED && loops->count != cases[k].loops))
            fail_msg("%s exp(%s): verdict %d, %zu loops", cases[k].Q, cases[k].L, (int)v, loops->count);
        free(loops);
        wave_free(&w);
        tw_engine_free(e);
    }
}

/* ---- sums of pieces ---- */

/* The integral over (0, 3) is that over (0, c) plus that over (c, 3): different paths, the same number. */
static void test_splitting(void **unused)
{
    (void)unused;
    static const char *const amplitudes[] = {"1/(1+%d*x)", "exp(-x/%d)", "x^(-1/2)*cos(x/%d)", "log(x)/(%d+x)",
                                             "1/((x-1)^2+1/(10+%d))", "(3-x)^(1/3)*(x+%d)", "cosh(x/%d)"};
    static const char *const phases[] = {"x", "x^2-x", "x^3/3-x", "(x-1)^2*(x-2)^2", "sin(x)", "exp(x/3)", "sqrt(1+x^2)"};
    random_seed("test_quadrature_oscillating");
    tw_engine *e = tw_engine_new();
    acb_t whole, sum, part;
    acb_init(whole);
    acb_init(sum);
    acb_init(part);
    for (int trial = 0; trial < 25; trial++) {
        char q[100], words[300], s[20];
        snprintf(q, sizeof q, amplitudes[random_below(sizeof amplitudes / sizeof *amplitudes)], 1 + (int)random_below(4));
        const char *p = phases[random_below(sizeof phases / sizeof *phases)];
        const char *wave = random_below(2) ? "cos(s*(%s))" : "exp(i*s*(%s))";
        static const char *const ends[][2] = {{"0", "3"}, {"0", "c"}, {"c", "3"}};
        int c = 1 + (int)random_below(11);
        snprintf(s, sizeof s, "%d", 150 + (int)random_below(2000));
        for (int k = 0; k < 3; k++) {
            char kernel[100], low[10], high[10];
            snprintf(kernel, sizeof kernel, wave, p);
            snprintf(low, sizeof low, ends[k][0][0] == 'c' ? "%d/4" : "%d", ends[k][0][0] == 'c' ? c : 0);
            snprintf(high, sizeof high, ends[k][1][0] == 'c' ? "%d/4" : "%d", ends[k][1][0] == 'c' ? c : 3);
            snprintf(words, sizeof words, "integral from %s to %s of %s*%s dx", low, high, kernel, q);
            take(e, k ? part : whole, words, s, 16);
            if (k == 1)
                acb_set(sum, part);
            else if (k == 2)
                acb_add(sum, sum, part, 200);
        }
        if (!acb_overlaps(sum, whole))
            fail_msg("the parts at %d/4 do not add up: %s", c, words);
    }
    acb_clear(whole);
    acb_clear(sum);
    acb_clear(part);
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_closed_forms),
        cmocka_unit_test(test_regions),
        cmocka_unit_test(test_splitting),
    };
    return cmocka_run_group_tests_name("oscillating quadrature", tests, NULL, NULL);
}
