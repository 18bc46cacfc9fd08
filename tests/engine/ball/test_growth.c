/* Soundness of the growth records: random trees, random X, random points x >= X. At each point the value of the tree, a
 * ball, must meet the two-sided record and lie below the bound; bounds of tails must lie above lower Riemann sums.
 * TW_SEED gives the seed, TW_TRIALS the number of points (default 100000). */
#include "engine/ball/growth.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <time.h>

#include <cmocka.h>

enum { TREES_PER_ENGINE = 500, POINTS_PER_TREE = 5 };

static uint64_t state;

static unsigned roll(unsigned n) /* 0 .. n-1; xorshift64* (Vigna 2016) */
{
    state ^= state >> 12;
    state ^= state << 25;
    state ^= state >> 27;
    return (unsigned)((state * 2685821657736338717ULL) >> 33) % n;
}

static double chance(void)
{
    return roll(1 << 30) / (double)(1 << 30);
}

static expr *random_number(tw_engine *e)
{
    switch (roll(12)) {
    case 0:
        return expr_constant_of(e, CONSTANT_PI);
    case 1:
        return expr_sqrt(e, expr_int(e, 2));
    case 2:
        return expr_mul(e, expr_int(e, (slong)roll(5) - 2), expr_constant_of(e, CONSTANT_I));
    case 3:
        return expr_frac(e, 1, 1 << roll(12));
    default:
        return expr_frac(e, (slong)roll(13) - 6, 1 + roll(4));
    }
}

static expr *random_power(tw_engine *e)
{
    switch (roll(8)) {
    case 0:
        return expr_sqrt(e, expr_frac(e, 1 + roll(3), 1 + roll(2)));
    case 1:
        return expr_int(e, (slong)roll(5) - 2);
    default:
        return expr_frac(e, (slong)roll(11) - 5, 1 + roll(3));
    }
}

static expr *random_special(tw_engine *e, expr *a)
{
    static const function_id one[] = {FUNCTION_E1, FUNCTION_EI, FUNCTION_GAMMA, FUNCTION_LNGAMMA,
                                      FUNCTION_PSI, FUNCTION_AI, FUNCTION_BI},
                             two[] = {FUNCTION_GAMMA_UPPER, FUNCTION_BESSEL_J, FUNCTION_BESSEL_Y, FUNCTION_BESSEL_I,
                                      FUNCTION_BESSEL_K};
    if (roll(2))
        return expr_call1(e, one[roll(sizeof one / sizeof *one)], a);
    expr *args[] = {roll(3) ? expr_frac(e, (slong)roll(21) - 6, 1 + roll(4)) : expr_int(e, roll(3)), a};
    return expr_call(e, two[roll(sizeof two / sizeof *two)], args, 2);
}

static expr *random_tree(tw_engine *e, expr *x, int depth)
{
    static const function_id functions[] = {FUNCTION_SIN,  FUNCTION_COS,   FUNCTION_SINH,  FUNCTION_COSH, FUNCTION_TANH,
                                            FUNCTION_ATAN, FUNCTION_ASINH, FUNCTION_ACOSH, FUNCTION_ABS,  FUNCTION_ERF,
                                            FUNCTION_ERFC, FUNCTION_SIGN,  FUNCTION_LOG,   FUNCTION_LOG};
    if (depth == 0)
        return roll(3) ? expr_pow(e, x, roll(3) ? expr_int(e, 1) : random_power(e)) : random_number(e);
    expr *a = random_tree(e, x, depth - 1);
    switch (roll(14)) {
    case 0:
    case 1:
        return expr_add(e, a, random_tree(e, x, depth - 1));
    case 2:
        return expr_add(e, a, random_number(e));
    case 3:
    case 4:
        return expr_mul(e, a, random_tree(e, x, depth - 1));
    case 5:
        return expr_mul(e, a, random_number(e));
    case 6:
    case 7:
        return expr_pow(e, a, random_power(e));
    case 8:
        return expr_call1(e, FUNCTION_EXP, a);
    case 13:
        return roll(3) ? expr_call1(e, FUNCTION_EXP, a) : random_special(e, a);
    case 9:
        return expr_call1(e, FUNCTION_EXP, expr_neg(e, a));
    case 10:
        return expr_call1(e, FUNCTION_LOG, expr_add(e, expr_int(e, 1), a));
    case 11:
        return expr_add(e, expr_call1(e, FUNCTION_EXP, a), expr_int(e, -1));
    default:
        return expr_call1(e, functions[roll(sizeof functions / sizeof *functions)], a);
    }
}

/* log of the bound at x */
static void bound_log_at(arb_t out, const growth_bound *g, const arb_t x, slong prec)
{
    arb_t l, t, u;
    arb_init(l);
    arb_init(t);
    arb_init(u);
    arb_log(l, x, prec);
    arb_set_fmpq(t, g->a, prec);
    arb_mul(t, t, l, prec);
    arb_add(t, t, g->log_C, prec);
    arb_log(u, l, prec);
    arb_mul_si(u, u, g->k, prec);
    arb_add(t, t, u, prec);
    arb_set_fmpq(u, g->c, prec);
    arb_mul(u, u, l, prec);
    arb_exp(u, u, prec);
    arb_submul(t, u, g->b, prec);
    arb_swap(out, t);
    arb_clear(l);
    arb_clear(t);
    arb_clear(u);
}

static void violated(tw_engine *e, expr *f, const char *what, const arb_t x, const acb_t value)
{
    char *words = expr_text(e, f);
    char *at = arb_get_str(x, 20, 0), *re = arb_get_str(acb_realref(value), 20, 0),
            *im = arb_get_str(acb_imagref(value), 20, 0);
    fail_msg("%s: f = %s at x = %s is %s + i %s", what, words, at, re, im);
}

static unsigned long points, judged, trees, recorded;

static void check_point(tw_engine *e, expr *f, tape *values, growth_program *t, const growth_bound *g, const arf_t X,
        int kind)
{
    acb_t x, v, w;
    arb_t size, bound;
    acb_init(x);
    acb_init(v);
    acb_init(w);
    arb_init(size);
    arb_init(bound);
    arb_set_arf(acb_realref(x), X);
    if (kind == 1)
        arb_set_d(size, 1 + chance() / 16), arb_mul(acb_realref(x), acb_realref(x), size, 128);
    else if (kind == 2)
        arb_set_d(size, 1 + 4 * chance()), arb_mul(acb_realref(x), acb_realref(x), size, 128);
    else if (kind > 2)
        arb_mul_2exp_si(acb_realref(x), acb_realref(x), roll(kind == 3 ? 6 : 30));
    arb_get_mid_arb(acb_realref(x), acb_realref(x));
    points++;
    tape_eval(v, values, x, false, 192);
    if (acb_is_finite(v) && acb_rel_accuracy_bits(v) > 10) {
        judged++;
        growth_value(w, t, acb_realref(x), 128);
        if (acb_is_finite(w) && !acb_overlaps(v, w))
            violated(e, f, "outside the record", acb_realref(x), v);
        acb_abs(size, v, 128);
        arb_log(size, size, 128);
        bound_log_at(bound, g, acb_realref(x), 128);
        if (arb_is_finite(size) && !arf_is_nan(arb_midref(bound)) && arb_gt(size, bound))
            violated(e, f, "above the bound", acb_realref(x), v);
    }
    acb_clear(x);
    acb_clear(v);
    acb_clear(w);
    arb_clear(size);
    arb_clear(bound);
}

static void check_tree(tw_engine *e)
{
    expr *x = expr_symbol(e, "x");
    expr *f = random_tree(e, x, 1 + (int)roll(4));
    engine_forgive(e);
    if (!f || expr_size(f) > 300)
        return;
    growth_program *t = growth_compile(e, f, x);
    tape *values = tape_new(e, f, &x, 1);
    engine_forgive(e);
    growth_bound g;
    arf_t X;
    growth_bound_init(&g);
    arf_init(X);
    arf_set_d(X, 3 + (roll(4) ? 20 : 2000) * chance());
    trees++;
    if (t && values && growth_run(t, &g, X)) {
        recorded++;
        for (int k = 0; k < POINTS_PER_TREE; k++)
            check_point(e, f, values, t, &g, X, k);
    }
    growth_bound_clear(&g);
    arf_clear(X);
    growth_free(t);
    tape_free(values);
}

/* ---- sectors ---- */

static bool analytic_form(expr *f)
{
    if (f->kind == EXPR_CALL && (f->is.function == FUNCTION_ABS || f->is.function == FUNCTION_SIGN))
        return false;
    for (uint32_t k = 0; k < f->count; k++)
        if (!analytic_form(f->args[k]))
            return false;
    return true;
}

static void set_direction(acb_t turn, double from, double to)
{
    arb_t phi;
    arb_init(phi);
    arb_set_d(phi, 0.5 * (from + to));
    mag_set_d(arb_radref(phi), 0.5 * (to - from) + 1e-15);
    arb_sin_cos(acb_imagref(turn), acb_realref(turn), phi, 64);
    arb_clear(phi);
}

/* z = r e^(i phi) for the angles from, to, at distance v or 1/v */
static void set_arc(acb_t z, const arb_t v, bool inverted, double from, double to)
{
    set_direction(z, from, to);
    if (inverted)
        acb_div_arb(z, z, v, 192);
    else
        acb_mul_arb(z, z, v, 192);
}

/* Analytic all along the arc: a piece that resists down to a tiny size, though values are had there, is a cut. */
static void check_arc(tw_engine *e, expr *f, tape *values, const arb_t v, bool inverted, double from, double to,
                      int depth)
{
    acb_t z, w;
    acb_init(z);
    acb_init(w);
    set_arc(z, v, inverted, from, to);
    tape_eval(w, values, z, true, 192);
    bool good = acb_is_finite(w);
    if (!good && depth < 30) {
        double middle = 0.5 * (from + to);
        check_arc(e, f, values, v, inverted, from, middle, depth + 1);
        check_arc(e, f, values, v, inverted, middle, to, depth < 10 ? depth + 20 : 30); /* one way deep is enough */
    } else if (!good) {
        acb_get_mid(z, z);
        tape_eval(w, values, z, false, 192);
        if (acb_is_finite(w) && acb_rel_accuracy_bits(w) > 60) {
            tape_eval(w, values, z, true, 192);
            if (!acb_is_finite(w))
                violated(e, f, "not analytic in the sector", v, z);
        }
    }
    acb_clear(z);
    acb_clear(w);
}

static unsigned long sector_points, sector_trees, sector_recorded;

static void check_sector_point(tw_engine *e, expr *f, tape *values, growth_program *t, const growth_bound *g,
                               double from, double to, bool inverted)
{
    acb_t z, value, record;
    arb_t v, size, bound;
    acb_init(z);
    acb_init(value);
    acb_init(record);
    arb_init(v);
    arb_init(size);
    arb_init(bound);
    arb_set_d(v, 1 + (roll(2) ? 3 : 0.05) * chance());
    arb_set_arf(size, g->X);
    arb_mul(v, v, size, 128);
    arb_mul_2exp_si(v, v, roll(3) ? 0 : (slong)roll(10));
    arb_get_mid_arb(v, v);
    double phi = from + (to - from) * chance();
    set_arc(z, v, inverted, phi, phi);
    sector_points++;
    tape_eval(value, values, z, false, 192);
    if (inverted) { /* the record is that of f |dz/dv| */
        acb_div_arb(value, value, v, 192);
        acb_div_arb(value, value, v, 192);
    }
    if (acb_is_finite(value) && acb_rel_accuracy_bits(value) > 10) {
        growth_value(record, t, v, 128);
        if (acb_is_finite(record) && !acb_overlaps(value, record))
            violated(e, f, "outside the record of a sector", v, value);
        acb_abs(size, value, 128);
        arb_log(size, size, 128);
        bound_log_at(bound, g, v, 128);
        if (arb_is_finite(size) && !arf_is_nan(arb_midref(bound)) && arb_gt(size, bound))
            violated(e, f, "above the bound of a sector", v, value);
    }
    check_arc(e, f, values, v, inverted, from, to, 0);
    acb_clear(z);
    acb_clear(value);
    acb_clear(record);
    arb_clear(v);
    arb_clear(size);
    arb_clear(bound);
}

static void check_sector(tw_engine *e)
{
    expr *x = expr_symbol(e, "x"), *f = random_tree(e, x, 1 + (int)roll(4));
    engine_forgive(e);
    if (!f || expr_size(f) > 300 || !analytic_form(f))
        return;
    growth_program *t = growth_compile(e, f, x);
    tape *values = tape_new(e, f, &x, 1);
    engine_forgive(e);
    growth_bound g;
    arf_t X;
    acb_t turn;
    growth_bound_init(&g);
    arf_init(X);
    acb_init(turn);
    arf_set_d(X, 3 + (roll(4) ? 20 : 2000) * chance());
    double from = 6.4 * chance() - 3.2, to = from + (roll(3) ? 0.05 : 0.5) * chance();
    bool inverted = roll(3) == 0;
    sector_trees++;
    set_direction(turn, from, to);
    if (t && values) {
        growth_turn(t, turn);
        growth_scale(t, 0, inverted);
        if (growth_run(t, &g, X)) {
            sector_recorded++;
            check_sector_point(e, f, values, t, &g, from, to, inverted);
        }
    }
    growth_bound_clear(&g);
    arf_clear(X);
    acb_clear(turn);
    growth_free(t);
    tape_free(values);
}

static void test_sectors(void **unused)
{
    (void)unused;
    unsigned long trials = getenv("TW_TRIALS") ? strtoul(getenv("TW_TRIALS"), NULL, 10) : 20000;
    while (sector_points < trials) {
        tw_engine *e = tw_engine_new();
        for (int k = 0; k < TREES_PER_ENGINE; k++)
            check_sector(e);
        tw_engine_free(e);
    }
    printf("%lu points of sectors; %lu of %lu trees have a record\n", sector_points, sector_recorded, sector_trees);
    assert_true(5 * sector_recorded > sector_trees);
}

static void test_random_trees(void **unused)
{
    (void)unused;
    unsigned long trials = getenv("TW_TRIALS") ? strtoul(getenv("TW_TRIALS"), NULL, 10) : 100000;
    while (points < trials) {
        tw_engine *e = tw_engine_new();
        for (int k = 0; k < TREES_PER_ENGINE && points < trials; k++)
            check_tree(e);
        tw_engine_free(e);
    }
    printf("%lu points, %lu with a sharp value; %lu of %lu trees have a record\n", points, judged, recorded, trees);
    assert_true(2 * judged > points);
    assert_true(2 * recorded > trees);
}

static void test_tails(void **unused)
{
    (void)unused;
    tw_engine *e = tw_engine_new();
    for (int trial = 0; trial < 1000; trial++) {
        growth_bound g;
        growth_bound_init(&g);
        arf_set_d(g.X, 3 + 10 * chance());
        arb_set_si(g.log_C, (slong)roll(20) - 10);
        fmpq_set_si(g.a, (slong)roll(13) - 6, 1 + roll(3));
        g.k = (slong)roll(5) - 2;
        if (roll(3)) {
            fmpq_set_si(g.c, 1 + roll(4), 1 + roll(3));
            arb_set_d(g.b, 0.1 + 3 * chance());
        }
        arb_t tail, sum, x, y, low, high, step;
        arb_init(tail);
        arb_init(sum);
        arb_init(x);
        arb_init(y);
        arb_init(low);
        arb_init(high);
        arb_init(step);
        tw_status s = growth_tail(e, tail, &g);
        assert_int_equal(s == TW_OK, growth_integrable(&g));
        engine_forgive(e);
        arb_set_arf(x, g.X);
        bound_log_at(low, &g, x, 64);
        for (int k = 0; s == TW_OK &&
                k < 400; k++) { /* the bound has one greatest value: the ends of a step hold its least */
            arb_mul_ui(y, x, 51, 64);
            arb_div_ui(y, y, 50, 64);
            bound_log_at(high, &g, y, 64);
            arb_min(step, low, high, 64);
            arb_exp(step, step, 64);
            arb_sub(x, y, x, 64);
            arb_addmul(sum, x, step, 64);
            arb_set(x, y);
            arb_set(low, high);
        }
        if (s == TW_OK) {
            arb_exp(tail, tail, 64);
            if (!arb_lt(sum, tail) && !arb_overlaps(sum, tail))
                fail_msg("the bound of a tail is below a lower sum");
        }
        arb_clear(tail);
        arb_clear(sum);
        arb_clear(x);
        arb_clear(y);
        arb_clear(low);
        arb_clear(high);
        arb_clear(step);
        growth_bound_clear(&g);
    }
    tw_engine_free(e);
}

static expr *exp_of(tw_engine *e, expr *a)
{
    return expr_call1(e, FUNCTION_EXP, a);
}

/* What the second record is for: each of these loses its leading terms. The power of x that must be left is known by
 * hand. */
static void test_cancellation(void **unused)
{
    (void)unused;
    tw_engine *e = tw_engine_new();
    expr *x = expr_symbol(e, "x"), *one = expr_int(e, 1), *inverse = expr_pow(e, x, expr_int(e, -1));
    expr *root = expr_sqrt(e, expr_add(e, expr_pow(e, x, expr_int(e, 2)), one));
    struct {
        expr *f;
        slong a;
    } cases[] = {
        {expr_call1(e, FUNCTION_LOG, expr_add(e, one, inverse)), -1},
        {expr_sub(e, exp_of(e, inverse), one), -1},
        {expr_sub(e, root, x), -1},
        {expr_sub(e, one, expr_call1(e, FUNCTION_COS, inverse)), -2},
        {expr_sub(e, expr_call1(e, FUNCTION_LOG, expr_add(e, one, x)), expr_call1(e, FUNCTION_LOG, x)), -1},
        {expr_sub(e, expr_call1(e, FUNCTION_TANH, inverse), inverse), -2},
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        growth_bound g;
        growth_bound_init(&g);
        fmpq_t a;
        fmpq_init(a);
        fmpq_set_si(a, cases[k].a, 1);
        assert_int_equal(growth_at_infinity(e, &g, cases[k].f, x, NULL, 10), TW_OK);
        if (k == 5) /* two derivatives are kept, not three */
            assert_true(fmpq_sgn(g.a) < 0);
        else
            assert_true(fmpq_cmp(g.a, a) <= 0);
        fmpq_clear(a);
        growth_bound_clear(&g);
    }
    tw_engine_free(e);
}

int main(void)
{
    state = getenv("TW_SEED") ? strtoull(getenv("TW_SEED"), NULL, 10) : (uint64_t)time(NULL) * 2654435761u;
    printf("TW_SEED=%llu\n", (unsigned long long)state);
    if (!state)
        state = 1;
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_random_trees),
        cmocka_unit_test(test_sectors),
        cmocka_unit_test(test_tails),
        cmocka_unit_test(test_cancellation),
    };
    return cmocka_run_group_tests_name("growth", tests, NULL, NULL);
}
