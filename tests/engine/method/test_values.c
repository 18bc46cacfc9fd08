/* Random integrals of these families: the certified value of the integral minus the partial sum must be of the size of
 * the first omitted term, for several numbers of terms, at a large value of the parameter. Nothing here shares code
 * with the making of coefficients but the expressions themselves. The seed is printed and taken back from TW_SEED;
 * TW_TRIALS sets the number. */
#include "texts.h"

#include <stdio.h>
#include <time.h>

#include "engine/ball/quadrature.h"

static unsigned long seed_state;

static unsigned roll(unsigned n)
{
    seed_state = seed_state * 6364136223846793005ul + 1442695040888963407ul;
    return (unsigned)((seed_state >> 33) % n);
}

static const char *pick(const char *const *list, unsigned n)
{
    return list[roll(n)];
}

#define PICK(list) pick(list, sizeof list / sizeof *list)

static const char *const HEADS[] = {"",     "x^(-1/2)*", "x^(1/3)*",        "x^(-2/3)*",
                                    "x^2*", "log(x)*",   "x^(1/2)*log(x)*", "log(x)^2*"};
static const char *const AMPLITUDES[] = {
    "1/(1 + x)", "1/(2 + 3*x + x^2)", "(1 + x)^(1/3)",   "cos(x)",          "exp(-x)/(3 + x)", "1/(1 + x^2)",
    "tanh(x)",   "log(1 + 2*x)",      "sqrt(2 + x)",     "cosh(x)/(1 + x)", "1/sqrt(1 + x^2)", "x/(exp(x) - 1)",
    "atan(x)",   "sin(2*x)",          "1/(1 + sqrt(x))", "erfc(x)",         "(1 - exp(-x))",   "1/(5 - 4*cos(x))"};
static const char *const KERNELS[] = {"s*x", "3*s*x", "s*x^2", "s*x^3/2", "s^2*x", "s*x^(3/2)", "s*sqrt(x)"};
static const char *const PARTS_PHASES[] = {"sinh(x)",    "x + x^2",      "x + x^3/3",
                                           "exp(x) - 1", "2*x + sin(x)", "log(1 + x)*2"};
static const char *const SMOOTH[] = {"1/(1 + x)", "cos(x)", "(2 + x)^(1/3)", "exp(-2*x)", "1/(2 + sin(x))", "1 + x^2"};
static const char *const ENDS[] = {"inf", "inf", "2", "1"};

static void make_integral(char *out, size_t room)
{
    switch (roll(3)) {
    case 0:
        snprintf(out, room, "integral from 0 to %s of %s%s*exp(-%s) dx", PICK(ENDS), PICK(HEADS), PICK(AMPLITUDES),
                 PICK(KERNELS));
        break;
    case 1:
        snprintf(out, room, "integral from 0 to %s of %s*exp(-s*(%s)) dx", PICK(ENDS), PICK(SMOOTH),
                 PICK(PARTS_PHASES));
        break;
    default:
        snprintf(out, room, "integral from %s to inf of (%s)*exp(-%s) dx", roll(2) ? "-inf" : "-1",
                 PICK(SMOOTH) == NULL ? ""
                                      : (roll(2)   ? "1/(3 + x^2)"
                                         : roll(2) ? "cos(x - 1)"
                                                   : "exp(-x/2)/(2 + x^2)"),
                 roll(2) ? "s*x^2" : "s*abs(x)");
        break;
    }
}

/* |value - sum of the first n terms| <= 4 |term n| + 4 |term n+1|: refuted by no n. Proved for how many? */
static slong check_sums(tw_engine *e, expansion *a, const acb_t value, expr *at, slong terms, const char *integral)
{
    acb_t v, d;
    arb_t error, limit;
    acb_init(v);
    acb_init(d);
    arb_init(error);
    arb_init(limit);
    expr *symbols[] = {a->large}, *values[] = {at};
    slong proved = 0;
    for (slong n = 1; n + 1 < terms; n++) {
        text_value(e, v, text_sum(e, a, 0, n), symbols, values, 1, 400);
        acb_sub(d, value, v, 400);
        acb_abs(error, d, 400);
        arb_zero(limit);
        for (slong k = n; k <= n + 1; k++) {
            text_value(e, v, expr_sub(e, text_sum(e, a, 0, k + 1), text_sum(e, a, 0, k)), symbols, values, 1, 400);
            acb_abs(acb_realref(v), v, 400);
            arb_addmul_ui(limit, acb_realref(v), 4, 400);
        }
        if (arb_gt(error, limit)) {
            char *left = arb_get_str(error, 5, 0), *right = arb_get_str(limit, 5, 0);
            fail_msg("%s: with %ld terms the error is %s, the next terms %s", integral, (long)n, left, right);
        }
        proved += arb_le(error, limit);
    }
    acb_clear(v);
    acb_clear(d);
    arb_clear(error);
    arb_clear(limit);
    return proved;
}

static void check_integral(const char *integral, slong *counted)
{
    enum { TERMS = 6 };
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    expr *f = text_parse(e, integral), *at = text_parse(e, "300");
    expansion a;
    expansion_init(&a);
    if (expand(e, &a, f, TERMS, NULL) != TW_OK) {
        if (e->error.kind != ERROR_UNAVAILABLE && e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_DIVERGENT)
            fail_msg("%s: %s", integral, e->error.words);
    } else if (!a.exact && !a.contributions[0].terminates) {
        acb_t value;
        acb_init(value);
        expr *symbols[] = {a.large}, *values[] = {at};
        env where = {1, symbols, values};
        if (quadrature(e, value, f, &where, 60, true, NULL) == TW_OK) {
            if (check_sums(e, &a, value, at, TERMS, integral) >= 3) (*counted)++;
        }
        acb_clear(value);
    }
    expansion_clear(&a);
    tw_engine_free(e);
}

static void test_values(void **state)
{
    (void)state;
    const char *typed = getenv("TW_SEED"), *many = getenv("TW_TRIALS");
    seed_state = typed ? strtoul(typed, NULL, 10) : (unsigned long)time(NULL);
    slong trials = many ? atol(many) : 60, counted = 0;
    print_message("TW_SEED=%lu\n", seed_state);
    for (slong k = 0; k < trials; k++) {
        char integral[256];
        make_integral(integral, sizeof integral);
        check_integral(integral, &counted);
    }
    print_message("%ld of %ld integrals compared\n", (long)counted, (long)trials);
    assert_true(2 * counted > trials);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_values)};
    return cmocka_run_group_tests_name("values", tests, NULL, NULL);
}
