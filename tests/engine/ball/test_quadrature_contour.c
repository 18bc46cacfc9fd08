/* Certified quadrature along paths in the complex plane: against functions defined by contour integrals, against antiderivatives on
 * random polygons, and what must be refused. TW_SEED gives the seed of the random paths, TW_TRIALS their number. */
#include "engine/ball/quadrature.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <cmocka.h>

#include "lang/lower.h"
#include "lang/parse.h"

static expr *read_expr(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    source_init(&s, "<test>", words, strlen(words));
    syntax_text_init(&t);
    syntax *a = parse_expression_text(&s, &t);
    expr *made = NULL;
    if (a) {
        lowering l;
        lowering_init(&l, e, NULL);
        made = lower_expression(&l, a);
        lowering_clear(&l);
    }
    syntax_text_clear(&t);
    if (!made)
        fail_msg("cannot read `%s`: %s", words, e->error.words ? e->error.words : "syntax");
    return made;
}

static slong accuracy(const acb_t v)
{
    arb_t size;
    arf_t low;
    mag_t radius;
    arb_init(size);
    arf_init(low);
    mag_init(radius);
    acb_abs(size, v, 400);
    mag_hypot(radius, arb_radref(acb_realref(v)), arb_radref(acb_imagref(v)));
    arb_get_lbound_arf(low, size, 64);
    slong bits = !acb_is_finite(v) || arf_sgn(low) <= 0 ? -1
                 : mag_is_zero(radius)                 ? 10000
                                                       : arf_abs_bound_lt_2exp_si(low) - 1 - MAG_EXP(radius);
    arb_clear(size);
    arf_clear(low);
    mag_clear(radius);
    return bits;
}

static void assert_same(tw_engine *e, const char *integral, const char *value, slong digits)
{
    acb_t v, w;
    acb_init(v);
    acb_init(w);
    if (quadrature(e, v, read_expr(e, integral), NULL, digits, false, NULL) != TW_OK)
        fail_msg("%s: %s", integral, e->error.words);
    if (quadrature(e, w, read_expr(e, value), NULL, digits + 5, false, NULL) != TW_OK)
        fail_msg("%s: %s", value, e->error.words);
    if (!acb_overlaps(v, w))
        fail_msg("%s: the balls do not meet", integral);
    if (accuracy(v) < (slong)(3.32 * (double)digits) - 2)
        fail_msg("%s: only %ld bits", integral, (long)accuracy(v));
    acb_clear(v);
    acb_clear(w);
}

static void test_known_values(void **state)
{
    (void)state;
    static const struct {
        const char *integral, *value;
        slong digits;
    } rows[] = {
        /* DLMF 9.5.4, 9.5.5 */
        {"integral along inf(-pi/3) to inf(pi/3) of exp(z^3/3 - z) dz", "2*pi*i*Ai(1)", 40},
        {"integral along inf(-pi/3) to inf(pi/3) of exp(z^3/3 - 4*z) dz", "2*pi*i*Ai(4)", 20},
        {"integral along -inf to inf(pi/3) of exp(z^3/3 - z/2) dz + integral along -inf to inf(-pi/3) of exp(z^3/3 - z/2) dz",
         "2*pi*Bi(1/2)", 20},
        /* DLMF 10.9.17, Schlaefli's integral between inf - i*pi and inf + i*pi */
        {"integral along inf to -i*pi to i*pi to inf of exp(2*sinh(z) - z) dz", "2*pi*i*J(1, 2)", 20},
        /* DLMF 5.9.2, Hankel's loop: 1/Gamma(5) */
        {"integral along 1 to i to -1 to -i to 1 of exp(z)*z^(-5) dz", "2*pi*i/24", 30},
        {"integral along 1 to i to -1 to -i to 1 of 1/z dz", "2*pi*i", 50},
        /* DLMF 7.2.1 on a ray */
        {"integral along 0 to inf(pi/8) of exp(-z^2) dz", "sqrt(pi)/2", 30},
        {"integral along 0 to 1 + i of exp(-z^2) dz", "sqrt(pi)/2*erf(1 + i)", 30},
        {"integral along -1 to 1 of abs(z) dz", "1", 20},
        /* an end with a fractional power; the square of Gamma(1/2), DLMF 5.4.6 */
        {"(integral along 0 to 1 + i to inf of z^(-1/2)*exp(-z) dz)^2", "pi", 20},
        {"integral along 0 to 1 + i of log(z) dz", "(1 + i)*log(1 + i) - (1 + i)", 25},
        {"integral along 2*i to inf(pi/6) of exp(-z)/z dz", "E1(2*i)", 25},
    };
    tw_engine *e = tw_engine_new();
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++)
        assert_same(e, rows[k].integral, rows[k].value, rows[k].digits);
    tw_engine_free(e);
}

static void assert_refused(tw_engine *e, const char *integral, error_kind kind, const char *part)
{
    acb_t v;
    acb_init(v);
    if (quadrature(e, v, read_expr(e, integral), NULL, 10, true, NULL) == TW_OK)
        fail_msg("%s got a value", integral);
    if (e->error.kind != kind || !strstr(e->error.words, part))
        fail_msg("%s: %s", integral, e->error.words);
    engine_forgive(e);
    acb_clear(v);
}

static void test_refusals(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    assert_refused(e, "integral along -i to i of 1/z dz", ERROR_DIVERGENT, "near 0 + 0*i");
    assert_refused(e, "integral along -1 to i of 1/(2*z + 1 - i) dz", ERROR_DIVERGENT, "near -0.5 + 0.5*i");
    assert_refused(e, "integral along -1 - i to -1 + i of sqrt(z) dz", ERROR_UNDECIDED, "branch cut");
    assert_refused(e, "integral along 0 to inf(pi/2) of exp(-z^2) dz", ERROR_DIVERGENT, "inf(pi/2)");
    assert_refused(e, "integral along 0 to inf(pi/8) to 3 of exp(-z^2) dz", ERROR_UNSUITABLE, "first and the last");
    assert_refused(e, "integral along -1 to 1 + i of abs(z) dz", ERROR_UNSUITABLE, "abs is not analytic");
    assert_refused(e, "integral along 0 to inf(i) of exp(-z) dz", ERROR_VALUE, "angle");
    tw_engine_free(e);
}

/* On a polygon the integral of F' is F(last) - F(first). */
static void test_antiderivatives(void **state)
{
    (void)state;
    const char *seed_text = getenv("TW_SEED"), *trials_text = getenv("TW_TRIALS");
    ulong seed = seed_text ? strtoul(seed_text, NULL, 10) : (ulong)time(NULL);
    long trials = trials_text ? strtol(trials_text, NULL, 10) : 25;
    print_message("seed %lu\n", seed);
    flint_rand_t rand;
    flint_randinit(rand);
    flint_randseed(rand, seed, seed ^ 0x9e3779b97f4a7c15);
    static const char *const forms[] = {
        "(z^2 - ((%d)+(%d)*i)*z)*exp(((%d)/3 + (%d)*i/2)*z)", "exp(-z^2/((%d)^2 + 1))*(z + (%d)*i) + (%d)*cos(z + (%d))",
        "sin((%d)*z/2)*((%d) + i*z)/((%d)^2 + 1) + (%d)*z^3", "exp(z*((%d) + i)/4)*(z^3 - (%d)) - (%d)*i*z*cosh(z/((%d)^2 + 2))"};
    tw_engine *e = tw_engine_new();
    for (long trial = 0; trial < trials; trial++) {
        char words[200];
        int c[4];
        for (int k = 0; k < 4; k++)
            c[k] = (int)n_randint(rand, 7) - 3;
        snprintf(words, sizeof words, forms[n_randint(rand, 4)], c[0], c[1], c[2], c[3]);
        expr *z = expr_symbol(e, "z"), *F = read_expr(e, words), *points[6], *i = expr_constant_of(e, CONSTANT_I);
        size_t n = 2 + n_randint(rand, 4);
        for (size_t k = 0; k < n; k++)
            points[k] = expr_add(e, expr_frac(e, (slong)n_randint(rand, 21) - 10, 4),
                                 expr_mul(e, i, expr_frac(e, (slong)n_randint(rand, 21) - 10, 4)));
        expr *integral = expr_contour(e, z, points, n, expr_derivative(e, F, z));
        expr *value = expr_sub(e, expr_substitute(e, F, z, points[n - 1]), expr_substitute(e, F, z, points[0]));
        acb_t v, w;
        acb_init(v);
        acb_init(w);
        if (!integral || !value || quadrature(e, v, integral, NULL, 18, true, NULL) != TW_OK ||
            ball_value(e, w, value, 128) != TW_OK)
            fail_msg("%s on %zu points: %s", words, n, e->error.words);
        if (!acb_overlaps(v, w))
            fail_msg("%s on %zu points: the integral is not the difference of the antiderivative", words, n);
        if (!acb_contains_zero(w) && accuracy(v) < 50)
            fail_msg("%s on %zu points: %ld bits", words, n, (long)accuracy(v));
        acb_clear(v);
        acb_clear(w);
    }
    tw_engine_free(e);
    flint_randclear(rand);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_known_values),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_antiderivatives),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
