/* Tapes of whole expressions: random trees against the plain reading of the expression room, on points and on balls,
 * with the flag and as series; constants, roots, sums, pieces, integrals inside; refusals with words. */
#include "tests/engine/expr/plain.h"
#include "tests/engine/method/texts.h"

#include "engine/ball/quadrature.h"

static expr *random_expr(tw_engine *e, expr *x, int depth)
{
    static const function_id functions[] = {FUNCTION_EXP,   FUNCTION_LOG,  FUNCTION_SIN,   FUNCTION_COS,
                                            FUNCTION_SINH,  FUNCTION_COSH, FUNCTION_TANH,  FUNCTION_ATAN,
                                            FUNCTION_ASINH, FUNCTION_ERF,  FUNCTION_ABS,   FUNCTION_ASIN,
                                            FUNCTION_SIGN,  FUNCTION_RE,   FUNCTION_ACOSH, FUNCTION_TAN};
    if (depth == 0 || plain_random(7) == 0) {
        switch (plain_random(5)) {
        case 0:
            return expr_int(e, (slong)plain_random(5) - 2);
        case 1:
            return expr_frac(e, (slong)plain_random(9) - 4, 1 + (slong)plain_random(5));
        case 2:
            return plain_random(4) ? x : expr_constant_of(e, CONSTANT_PI);
        default:
            return x;
        }
    }
    expr *a = random_expr(e, x, depth - 1), *b;
    switch (plain_random(6)) {
    case 0:
    case 1:
        b = random_expr(e, x, depth - 1);
        return expr_add(e, a, b);
    case 2:
    case 3:
        b = random_expr(e, x, depth - 1);
        return expr_mul(e, a, b);
    case 4:
        return expr_pow(e, a, expr_frac(e, (slong)plain_random(9) - 4, 1 + (slong)plain_random(3)));
    default:
        return expr_call1(e, functions[plain_random(sizeof functions / sizeof *functions)], a);
    }
}

/* x as a real variable at a real point, at which no continuation differs from the plain meaning. */
static void random_trees(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    plain_env v;
    plain_env_init(&v);
    acb_t point, plain, narrow, box, wide;
    acb_init(point);
    acb_init(plain);
    acb_init(narrow);
    acb_init(box);
    acb_init(wide);
    acb_ptr at_point = _acb_vec_init(4), on_box = _acb_vec_init(4);
    int compared = 0, boxed = 0, jets = 0;
    for (int trial = 0; trial < 1500; trial++) {
        expr *f = random_expr(e, x, 1 + (int)plain_random(5));
        tape *t = f ? tape_new(e, f, &x, 1) : NULL;
        engine_forgive(e);
        if (!t) continue;
        acb_set_d(point, plain_uniform(-3, 3));
        plain_bind(&v, x, point);
        plain_eval(e, plain, f, &v);
        tape_eval(narrow, t, point, false, 128);
        if (plain_is_sharp(plain) && acb_is_finite(narrow)) {
            compared++;
            if (!acb_overlaps(plain, narrow)) {
                char *words = expr_text(e, f);
                fail_msg("%s: the tape misses the plain value", words);
            }
        }
        acb_set(box, point);
        mag_set_d(arb_radref(acb_realref(box)), ldexp(1, -(int)plain_random(20)));
        if (plain_random(2)) { /* a real point in a complex box, as quadrature has it */
            arb_set_d(acb_imagref(box), 0);
            mag_set_d(arb_radref(acb_imagref(box)), ldexp(1, -(int)plain_random(20)));
        }
        for (int analytic = 0; analytic < 2; analytic++) {
            tape_eval(wide, t, box, analytic, 64);
            if (!acb_is_finite(wide) || !plain_is_sharp(plain)) continue;
            boxed++;
            if (!acb_overlaps(plain, wide)) {
                char *words = expr_text(e, f);
                fail_msg("%s: the tape on a box misses a point's value", words);
            }
        }
        tape_jet(at_point, t, point, 4, 128);
        tape_jet(on_box, t, box, 4, 64);
        for (int k = 0; k < 4; k++) {
            if (!acb_is_finite(at_point + k) || !acb_is_finite(on_box + k)) continue;
            jets++;
            if (!acb_overlaps(at_point + k, on_box + k) ||
                (k == 0 && plain_is_sharp(plain) && !acb_overlaps(plain, on_box))) {
                char *words = expr_text(e, f);
                fail_msg("%s: coefficient %d of the series on a box misses a point's", words, k);
            }
        }
        tape_free(t);
    }
    if (compared < 500 || boxed < 500 || jets < 1000) fail_msg("only %d, %d, %d comparisons", compared, boxed, jets);
    acb_clear(point);
    acb_clear(plain);
    acb_clear(narrow);
    acb_clear(box);
    acb_clear(wide);
    _acb_vec_clear(at_point, 4);
    _acb_vec_clear(on_box, 4);
    plain_env_clear(&v);
    tw_engine_free(e);
}

/* Where the tape says analytic, its values at points of the box satisfy the mean value property. */
static void random_trees_analytic(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    acb_t box, value, mean, p;
    acb_init(box);
    acb_init(value);
    acb_init(mean);
    acb_init(p);
    int seen = 0;
    for (int trial = 0; trial < 1200; trial++) {
        expr *f = random_expr(e, x, 1 + (int)plain_random(4));
        tape *t = f ? tape_new(e, f, &x, 1) : NULL;
        engine_forgive(e);
        if (!t) continue;
        const double re = plain_uniform(-3, 3), im = plain_random(2) ? plain_uniform(-2, 2) : 0,
                     r = ldexp(1, -(int)plain_random(6));
        acb_set_d_d(box, re, im);
        mag_set_d(arb_radref(acb_realref(box)), r);
        mag_set_d(arb_radref(acb_imagref(box)), r);
        tape_eval(value, t, box, true, 64);
        arf_t bound; /* of the values on the box; 64 points leave 2^-64 of it */
        arf_init(bound);
        acb_get_abs_ubound_arf(bound, value, 53);
        const double top = ldexp(arf_get_d(bound, ARF_RND_UP), -50);
        arf_clear(bound);
        if (acb_is_finite(value)) {
            acb_zero(mean);
            double size = 1;
            for (int k = 0; k < 64; k++) {
                acb_set_d_d(p, re + r / 2 * cos(6.283185307179586 * (k + 0.5) / 64),
                            im + r / 2 * sin(6.283185307179586 * (k + 0.5) / 64));
                tape_eval(value, t, p, false, 192);
                acb_add(mean, mean, value, 192);
                size += fabs(arf_get_d(arb_midref(acb_realref(value)), ARF_RND_NEAR)) / 64;
            }
            acb_div_ui(mean, mean, 64, 192);
            acb_set_d_d(p, re, im);
            tape_eval(value, t, p, false, 192);
            acb_sub(mean, mean, value, 192);
            double off = fabs(arf_get_d(arb_midref(acb_realref(mean)), ARF_RND_NEAR)) +
                         fabs(arf_get_d(arb_midref(acb_imagref(mean)), ARF_RND_NEAR));
            if (acb_is_finite(mean) && acb_rel_accuracy_bits(value) > 60) {
                seen++;
                if (off > 1e-6 * size + top) {
                    char *words = expr_text(e, f);
                    fail_msg("%s is called analytic on %g + %g i +- %g; the mean over a circle is %g away", words, re,
                             im, r, off);
                }
            }
        }
        tape_free(t);
    }
    if (seen < 200) fail_msg("only %d boxes were analytic", seen);
    acb_clear(box);
    acb_clear(value);
    acb_clear(mean);
    acb_clear(p);
    tw_engine_free(e);
}

static void assert_value(tw_engine *e, const char *f, const char *decimal)
{
    acb_t v;
    arb_t d;
    acb_init(v);
    arb_init(d);
    if (ball_value(e, v, text_parse(e, f), 128) != TW_OK) fail_msg("%s has no value: %s", f, e->error.words);
    arb_set_str(d, decimal, 128);
    arb_add_error_2exp_si(d, -90);
    if (!acb_is_finite(v) || !arb_contains(d, acb_realref(v)) || !acb_is_real(v)) fail_msg("%s is not %s", f, decimal);
    acb_clear(v);
    arb_clear(d);
}

static void closed_values(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    /* mpmath 1.3.0, 40 digits, where no closed form is written */
    assert_value(e, "pi", "3.141592653589793238462643383279502884197");
    assert_value(e, "euler_constant", "0.5772156649015328606065120900824024310422");
    assert_value(e, "abs(3 + 4*i)", "5");
    assert_value(e, "im(log(-1))/pi", "1");
    assert_value(e, "re(exp(i*pi/3))", "0.5");
    assert_value(e, "root of t^3 - t - 1 in t near 1.3247", "1.324717957244746025960908854478097340734");
    assert_value(e, "root of t^2 - 2 in t near -1", "-1.414213562373095048801688724209698078570");
    assert_value(e, "root of (t^2 - 2)^2 in t near 1", "1.414213562373095048801688724209698078570");
    assert_value(e, "sum from k = 1 to 20 of 1/k^2", "1.596163243913023316640878872057643220503");
    assert_value(e, "sum from k = 5 to 4 of k", "0");
    assert_value(e, "piecewise(1 when 2 < 1, 2 when 1 < pi, 3 otherwise)", "2");
    assert_value(e, "piecewise(1 when 1 <= 1, 2 otherwise)", "1");
    assert_value(e, "2*integral from 0 to 1 of exp(-x^2) dx", "1.493648265624854050798934872263706010709");
    tw_engine_free(e);
}

static void no_closed_value(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    static const char *const none[] = {"inf", "root of t^2 - 1 in t near 0", "root of t - pi in t near 3"};
    acb_t v;
    acb_init(v);
    for (size_t k = 0; k < sizeof none / sizeof *none; k++) {
        if (ball_value(e, v, text_parse(e, none[k]), 64) == TW_OK && acb_is_finite(v))
            fail_msg("%s has a value", none[k]);
        engine_forgive(e);
    }
    expr *x = expr_symbol(e, "x"), *y = expr_symbol(e, "y");
    assert_null(tape_new(e, expr_add(e, x, y), &x, 1));
    assert_int_equal(e->error.kind, ERROR_VALUE);
    assert_non_null(strstr(e->error.words, "y"));
    engine_forgive(e);
    assert_null(tape_new(e, text_parse(e, "sum from k = 1 to x of k"), &x, 1));
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    engine_forgive(e);
    assert_null(tape_new(e, text_parse(e, "sum from k = 1 to 10^9 of k*x"), &x, 1));
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    engine_forgive(e);
    acb_clear(v);
    tw_engine_free(e);
}

/* Two variables; only the first has a series. Shared nodes are computed once: 2^60 paths, 60 nodes. */
static void several_variables(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *vars[2] = {expr_symbol(e, "x"), expr_symbol(e, "y")};
    tape *t = tape_new(e, text_parse(e, "x^2*y + exp(y)*x"), vars, 2);
    assert_non_null(t);
    acb_ptr at = _acb_vec_init(2), jet = _acb_vec_init(4);
    acb_t v;
    acb_init(v);
    acb_set_si(at, 3);
    acb_set_si(at + 1, 2);
    tape_jet(jet, t, at, 4, 64);
    tape_eval(v, t, at, true, 64);
    assert_true(acb_overlaps(v, jet));
    assert_true(acb_equal_si(jet + 2, 2)); /* y */
    assert_true(acb_is_zero(jet + 3));
    tape_free(t);
    expr *f = vars[0];
    for (int k = 0; k < 60; k++)
        f = expr_call1(e, FUNCTION_ATAN, expr_add(e, f, expr_mul(e, f, expr_call1(e, FUNCTION_ATAN, f))));
    t = tape_new(e, f, vars, 1);
    assert_non_null(t);
    tape_eval(v, t, at, true, 64);
    assert_true(acb_is_finite(v));
    tape_free(t);
    acb_clear(v);
    _acb_vec_clear(at, 2);
    _acb_vec_clear(jet, 4);
    tw_engine_free(e);
}

/* The same tape at rising and falling precision. */
static void precision_changes(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    tape *t = tape_new(e, text_parse(e, "sqrt(2)*x + pi/3 + log(7)*root of t^3 - t - 1 in t near 1.3"), &x, 1);
    assert_non_null(t);
    acb_t at, v;
    acb_init(at);
    acb_init(v);
    acb_set_d(at, 0.75);
    static const slong precs[] = {64, 512, 100, 64, 1024};
    for (size_t k = 0; k < sizeof precs / sizeof *precs; k++) {
        tape_eval(v, t, at, false, precs[k]);
        if (acb_rel_accuracy_bits(v) < precs[k] - 12) fail_msg("%ld bits give %ld", precs[k], acb_rel_accuracy_bits(v));
    }
    acb_clear(at);
    acb_clear(v);
    tape_free(t);
    tw_engine_free(e);
}

/* Values whose exponents are far apart cost no memory. */
static void huge_and_tiny(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    static const char *const far[] = {"log(1 + exp(exp(x)))",
                                      "sqrt(1 + exp(exp(x))) - 1",
                                      "log(1 - exp(-exp(x)))",
                                      "acosh(exp(exp(x)))",
                                      "atanh(exp(-exp(x)))",
                                      "asin(exp(-exp(x)))",
                                      "exp(exp(x))*(1 + exp(-exp(x)))",
                                      "1 - cos(exp(-exp(x)))",
                                      "(1 + exp(exp(x)))^(1/3)"};
    acb_t at, v;
    acb_ptr jet = _acb_vec_init(3);
    acb_init(at);
    acb_init(v);
    for (size_t k = 0; k < sizeof far / sizeof *far; k++) {
        tape *t = tape_new(e, text_parse(e, far[k]), &x, 1);
        for (int wide = 0; wide < 2; wide++) {
            acb_set_d(at, 30.5);
            if (wide) mag_set_d(arb_radref(acb_realref(at)), 20);
            tape_eval(v, t, at, false, 64);
            if (!wide && !acb_is_finite(v)) fail_msg("%s at 30.5 has no value", far[k]);
            tape_eval(v, t, at, true, 64);
            tape_jet(jet, t, at, 3, 64);
        }
        tape_free(t);
    }
    _acb_vec_clear(jet, 3);
    acb_clear(at);
    acb_clear(v);
    tw_engine_free(e);
}

/* No digits lost near 0: the value beside its first Taylor term, relatively. */
static void small_differences(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    static const char *const small[] = {"exp(x) - 1",         "2*exp(x) - 2",        "1 - exp(-x)",     "1 - cos(x)",
                                        "cosh(x) - 1",        "3 - 3*cosh(x)",       "sqrt(1 + x) - 1", "log(1 + x)",
                                        "1 - (1 + x)^(-1/3)", "(1 + x^2)^(3/2) - 1", "log(1 + x + x^2)"};
    acb_t at, v;
    acb_ptr jet = _acb_vec_init(3);
    acb_init(at);
    acb_init(v);
    acb_one(at);
    acb_mul_2exp_si(at, at, -100);
    for (size_t k = 0; k < sizeof small / sizeof *small; k++) {
        tape *t = tape_new(e, text_parse(e, small[k]), &x, 1);
        tape_eval(v, t, at, true, 64);
        if (acb_rel_accuracy_bits(v) < 55) fail_msg("%s loses digits: %ld bits", small[k], acb_rel_accuracy_bits(v));
        tape_jet(jet, t, at, 3, 64);
        if (acb_rel_accuracy_bits(jet) < 55 || !acb_overlaps(jet, v))
            fail_msg("the series of %s loses digits", small[k]);
        tape_free(t);
    }
    _acb_vec_clear(jet, 3);
    acb_clear(at);
    acb_clear(v);
    tw_engine_free(e);
}

int main(void)
{
    plain_seed("test_tape");
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(random_trees),      cmocka_unit_test(random_trees_analytic),
        cmocka_unit_test(closed_values),     cmocka_unit_test(no_closed_value),
        cmocka_unit_test(several_variables), cmocka_unit_test(precision_changes),
        cmocka_unit_test(small_differences), cmocka_unit_test(huge_and_tiny),
    };
    return cmocka_run_group_tests_name("test_tape", tests, NULL, NULL);
}
