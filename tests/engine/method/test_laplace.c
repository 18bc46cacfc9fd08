/* Laplace's method: published series, points of every kind, and random phases judged by certified quadrature. The number of random
 * ones is TW_TRIALS (default 10), the seed TW_SEED. */
#include "texts.h"

#include <math.h>
#include <stdio.h>
#include <time.h>

#include "engine/method/combine.h"
#include "engine/numeric/evaluate.h"

static void expand_text(tw_engine *e, expansion *a, const char *words, slong terms)
{
    expansion_init(a);
    if (expand(e, a, text_parse(e, words), terms, NULL) != TW_OK) fail_msg("%s: %s", words, e->error.words);
}

/* Stirling's series, DLMF 5.11.3: the first coefficients of 5.11.4 to 5.11.6, and 30 of them against the exponential of
 * 5.11.1, sum of B_2k/(2k(2k-1)) z^(1-2k). */
static void test_stirling(void **state)
{
    (void)state;
    enum { COUNT = 30 };
    static const char *const published[] = {"1", "1/12", "1/288", "-139/51840", "-571/2488320", "163879/209018880",
                                            "5246819/75246796800"};
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expansion a;
    expand_text(e, &a, "integral from 0 to inf of x^s*exp(-x) dx", COUNT);
    assert_int_equal(a.contribution_count, 1);
    assert_int_equal(a.contributions[0].lane_count, 1);
    const coefficients *c = &a.contributions[0].lanes[0].c;
    assert_non_null(c->q);
    assert_true(c->count >= COUNT);
    fmpq_t want, b, sum, part;
    fmpq_init(want), fmpq_init(b), fmpq_init(sum), fmpq_init(part);
    for (size_t k = 0; k < sizeof published / sizeof *published; k++) {
        fmpq_set_str(want, published[k], 10);
        assert_true(fmpq_equal(want, &c->q[k]));
    }
    for (slong n = 1; n < COUNT; n++) { /* n g_n = sum over odd k of k l_k g_(n-k) */
        fmpq_zero(sum);
        for (slong k = 1; k <= n; k += 2) {
            arith_bernoulli_number(b, (ulong)k + 1);
            fmpq_div_fmpz(b, b, (fmpz[]){k + 1});
            fmpq_mul(part, b, &c->q[n - k]);
            fmpq_add(sum, sum, part);
        }
        fmpq_div_fmpz(sum, sum, (fmpz[]){n});
        assert_true(fmpq_equal(sum, &c->q[n]));
    }
    fmpq_clear(want), fmpq_clear(b), fmpq_clear(sum), fmpq_clear(part);
    expansion_clear(&a);
    tw_engine_free(e);
}

/* Modified Bessel functions: DLMF 10.32.9 with 10.40.2, and 10.32.1 with 10.40.1 (nu = 0), a_k(0) = prod (-(2j-1)^2)/(k! 8^k). */
static void test_bessel(void **state)
{
    (void)state;
    enum { COUNT = 12 };
    static const char *const integrals[] = {"integral from 0 to inf of exp(-s*cosh(x)) dx", "integral from 0 to pi of exp(s*cos(x)) dx"};
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    for (int which = 0; which < 2; which++) {
        expansion a;
        expand_text(e, &a, integrals[which], COUNT);
        const coefficients *c = &a.contributions[0].lanes[0].c;
        fmpq_t ratio, want;
        fmpq_init(ratio), fmpq_init(want);
        assert_non_null(c->q);
        for (slong k = 1; k < COUNT; k++) {
            fmpq_div(ratio, &c->q[k], &c->q[k - 1]);
            fmpq_set_si(want, (which ? 1 : -1) * (2 * k - 1) * (2 * k - 1), (ulong)(8 * k));
            fmpq_canonicalise(want);
            assert_true(fmpq_equal(ratio, want));
        }
        fmpq_clear(ratio), fmpq_clear(want);
        expansion_clear(&a);
    }
    tw_engine_free(e);
}

/* The value at s = 20 by expansion and by quadrature meet, and what is proved holds. */
static bool meets(tw_engine *e, const char *words, slong terms, slong s, double *worst)
{
    expansion a;
    expand_text(e, &a, words, terms);
    expr *symbols[] = {a.large}, *values[] = {expr_int(e, s)};
    env at = {1, symbols, values};
    comparison c;
    comparison_init(&c);
    if (compare_expansion(e, &c, &a, &at) != TW_OK) fail_msg("%s at %ld: %s", words, (long)s, e->error.words);
    bool proved = true;
    for (size_t k = 0; k < c.count; k++) {
        const comparison_row *row = &c.rows[k];
        if (row->violated) fail_msg("%s at s = %ld, %ld terms: a proved bound is violated", words, (long)s, (long)row->terms);
        proved = proved && row->label <= LABEL_PROVED;
    }
    if (c.best >= 0 && worst) {
        double bound = arf_get_d(arb_midref(c.rows[c.best].bound), ARF_RND_UP);
        double truth = fabs(arf_get_d(arb_midref(acb_realref(c.rows[c.best].error)), ARF_RND_NEAR));
        if (truth > 0 && bound / truth > *worst) *worst = bound / truth;
    }
    comparison_clear(&c);
    expansion_clear(&a);
    return proved;
}

static void test_kinds(void **state)
{
    (void)state;
    static const char *const integrals[] = {
        "integral from 0 to inf of exp(-s*(x + 2/x))/(1 + x) dx",                  /* a square root for the place */
        "integral from -inf to inf of exp(-s*(x^2 - 1)^2)/(2 + x^2) dx",           /* two of equal depth */
        "integral from -inf to inf of exp(-s*max(x, -3*x))*(1 + x) dx",            /* at a kink */
        "integral from -2 to 2 of exp(-s*x^2)*abs(x - 1/2) dx",                    /* a kink of the amplitude beside it */
        "integral from -1 to inf of exp(-s*(exp(x) - 1 - x))*x^2 dx",              /* the amplitude vanishes there */
        "integral from 0 to 1 of x^(2*s)*(1 - x)^s dx",                            /* powers of s */
        "integral from 0 to 1 of exp(-s*(x^3 - 3*x))*x^(-1/3) dx",                 /* least at the upper end, singular far end */
        "integral from 0 to inf of exp(-s*(x^(3/2) + x^2)) dx",                    /* a fractional power at the end */
        "integral from -inf to inf of exp(-s*(cosh(x) - 1 - x^2/2)) dx",           /* order 4 */
        "integral from 0 to 7 of exp(-s*(2 + cos(x)))*(1 + x) dx",                 /* inside, at pi */
    };
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    for (size_t k = 0; k < sizeof integrals / sizeof *integrals; k++)
        if (!meets(e, integrals[k], 4, 12, NULL)) fail_msg("%s: not proved", integrals[k]);
    tw_engine_free(e);
}

/* Phases with slope (x - z1) ... (x - zk) times a positive factor, zeros rational, distinct: all depths occur. */
static void random_integral(char *words, size_t room)
{
    int zeros = 1 + 2 * (rand() % 2), first = rand() % 5 - 3;
    char slope[200] = "";
    int z[3] = {first, first + 1 + rand() % 3, 0};
    z[2] = z[1] + 1 + rand() % 3;
    /* the antiderivative of the product, written out by hand for one or three zeros, in halves */
    static const char *const amplitudes[] = {"1", "(1 + x)", "1/(9 + x^2)", "exp(x/5)", "exp(-x^2/9)"};
    const char *q = amplitudes[rand() % 5];
    if (zeros == 1) {
        snprintf(slope, sizeof slope, "x^2/2 - %d*x/2 + (x - %d/2)^4/%d", z[0], z[0], 2 + rand() % 6);
    } else { /* (x-a)(x-b)(x-c) = x^3 - A x^2 + B x - C, zeros in halves */
        int A = z[0] + z[1] + z[2], B = z[0] * z[1] + z[0] * z[2] + z[1] * z[2], C = z[0] * z[1] * z[2];
        snprintf(slope, sizeof slope, "x^4/4 - (%d)*x^3/6 + (%d)*x^2/8 - (%d)*x/8", A, B, C);
    }
    snprintf(words, room, "integral from -inf to inf of exp(-s*(%s))*%s dx", slope, q);
}

static void test_random(void **state)
{
    (void)state;
    const char *seed_words = getenv("TW_SEED"), *trial_words = getenv("TW_TRIALS");
    unsigned seed = seed_words ? (unsigned)strtoul(seed_words, NULL, 10) : (unsigned)time(NULL);
    long trials = trial_words ? strtol(trial_words, NULL, 10) : 10, proved = 0;
    double worst = 0;
    print_message("TW_SEED=%u\n", seed);
    srand(seed);
    for (long k = 0; k < trials; k++) {
        char words[400];
        random_integral(words, sizeof words);
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        bool all = meets(e, words, 3, 8, &worst);
        all = meets(e, words, 3, 40, &worst) && all;
        if (!all) print_message("not proved: %s\n", words);
        proved += all;
        tw_engine_free(e);
    }
    print_message("%ld of %ld proved at both points, worst bound/error %.3g\n", proved, trials, worst);
    assert_true(10 * proved >= 8 * trials);
}

/* Arithmetic: numbers from the parts enclose what quadrature gives of the whole. */
static void test_combination(void **state)
{
    (void)state;
    static const char A[] = "(integral from 0 to inf of exp(-s*cosh(x)) dx)", B[] = "(integral from 0 to inf of exp(-s*x)/(2 + x) dx)";
    static const char *const forms[] = {"log(%s)", "%s*%s", "%s/%s", "sqrt(%s)/(1 + 1)", "%s^2*%s"};
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    for (size_t k = 0; k < sizeof forms / sizeof *forms; k++) {
        char words[400];
        snprintf(words, sizeof words, forms[k], A, B);
        expansion a;
        expansion_init(&a);
        if (combine(e, &a, text_parse(e, words), 4) != TW_OK) fail_msg("%s: %s", words, e->error.words);
        expr *symbols[] = {a.large}, *values[] = {expr_int(e, 15)};
        env at = {1, symbols, values};
        comparison c;
        comparison_init(&c);
        if (compare_expansion(e, &c, &a, &at) != TW_OK) fail_msg("%s: %s", words, e->error.words);
        assert_true(c.count >= 3);
        for (size_t n = 0; n < c.count; n++) {
            assert_false(c.rows[n].violated);
            assert_int_equal(c.rows[n].label, LABEL_PROVED);
        }
        comparison_clear(&c);
        expansion_clear(&a);
    }
    expansion bad;
    expansion_init(&bad);
    char words[200];
    snprintf(words, sizeof words, "exp(%s)", A);
    assert_int_equal(combine(e, &bad, text_parse(e, words), 4), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    engine_forgive(e);
    expansion_clear(&bad);
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_stirling), cmocka_unit_test(test_bessel), cmocka_unit_test(test_kinds),
        cmocka_unit_test(test_random),   cmocka_unit_test(test_combination),
    };
    return cmocka_run_group_tests_name("laplace", tests, NULL, NULL);
}
