/* Series in a new local variable: t = p(x), G(t) = q(x(t)) dx/dt. Published coefficients, and the identity
 * G(p(x)) p'(x) = q(x) at small x in balls. */
#include <stdint.h>
#include <stdio.h>

#include "texts.h"

typedef struct branch_case {
    const char *p, *q;
    slong length;
    const char *expected, *source;
} branch_case;

static const branch_case exact_cases[] = {
    {"x", "1/(1 + x)", 3, "1 x^(0) /1: 1, -1, 1", "identity"},
    {"2*x", "1/(1 + x)", 3, "1 x^(0) /1: 1/2, -1/4, 1/8", "x = t/2"},
    {"x^2", "1/(1 + x)", 4, "1 x^(-1/2) /2: 1/2, -1/2, 1/2, -1/2", "x = sqrt(t)"},
    {"sinh(x)", "1", 5, "1 x^(0) /1: 1, 0, -1/2, 0, 3/8", "1/sqrt(1+t^2), DLMF 4.38.1 differentiated"},
    {"x + x^2", "1", 4, "1 x^(0) /1: 1, -2, 6, -20", "1/sqrt(1+4t)"},
    {"x + x^2", "x^(-1/2)", 4, "1 x^(-1/2) /1: 1, -3/2, 35/8, -231/16", "Lagrange's formula, DLMF 1.10.14"},
    {"x^2 + x^3", "1", 4, "1 x^(-1/2) /2: 1/2, -1/2, 15/16, -2", "DLMF 2.3.18, exact rational recomputation"},
    /* c_k of the odd half powers: sqrt(2) c_k Gamma(k + 1/2) = sqrt(2 pi)/2 * (1, 1/12, 1/288, -139/51840) */
    {"x - log(1 + x)", "1", 4,
     "sqrt(2) x^(-1/2) /1: 1/2, 1/12, 1/432, -139/194400; 1 x^(0) /1: 2/3, -4/135, 4/2835, 8/25515",
     "DLMF 5.11.4 with 2.3.18 (1/12, 1/288, -139/51840)"},
    {"cosh(x) - 1", "1", 4, "sqrt(2) x^(-1/2) /1: 1/2, -1/8, 3/64, -5/256",
     "1/sqrt(t(2+t)), DLMF 4.38.4 differentiated"},
    {"1 - cos(x)", "1", 3, "sqrt(2) x^(-1/2) /1: 1/2, 1/8, 3/64", "1/sqrt(t(2-t))"},
    {"3*x", "log(x)", 2, "1 x^(0) log^1 /1: 1/3; log(3) x^(0) /1: -1/3.", "log(t/3)"},
    {"sinh(x)", "log(x)", 3, "1 x^(0) log^1 /1: 1, 0, -1/2; 1 x^(2) /1: -1/6, 0, 13/90",
     "exact rational recomputation"},
    {"sqrt(x) + x", "1", 3, "1 x^(1) /1: 2, -6, 20", "derivative of (sqrt(1+4t)-1)^2/4"},
    {"a*x^2", "1", 3, "a^(-1/2) x^(-1/2) /1: 1/2.", "x = sqrt(t/a)"},
};

static void test_exact(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof exact_cases / sizeof *exact_cases; k++) {
        const branch_case *c = exact_cases + k;
        tw_engine *e = tw_engine_new();
        give(e, RELATION_LESS, "0", "a");
        series s;
        series_init(&s);
        if (series_branch(e, &s, read_expr(e, c->p), read_expr(e, c->q), expr_symbol(e, "x"), c->length, NULL,
                          NULL) != TW_OK)
            fail_msg("%s, %s: %s", c->p, c->q, e->error.words);
        char *found = series_text(e, &s);
        if (strcmp(found, c->expected) != 0)
            fail_msg("%s, %s (%s):\n  found    %s\n  expected %s", c->p, c->q, c->source, found, c->expected);
        free(found);
        series_clear(&s);
        tw_engine_free(e);
    }
}

/* G(p(x)) p'(x) = q(x). */
static void check_branch(tw_engine *e, const char *words, expr *p, expr *q, slong length, const env *at,
                         slong bits_of_x)
{
    enum { PREC = 3000 };
    expr *x = expr_symbol(e, "x");
    series s;
    series_init(&s);
    if (series_branch(e, &s, p, q, x, length, NULL, NULL) != TW_OK)
        fail_msg("%s: %s", words, e->error.words);
    fmpq_t point;
    acb_t t, slope, value, sum;
    arf_t next, size;
    fmpq_init(point), acb_init(t), acb_init(slope), acb_init(value), acb_init(sum), arf_init(next), arf_init(size);
    fmpz_one(fmpq_numref(point));
    fmpz_one_2exp(fmpq_denref(point), (ulong)bits_of_x);
    expr *here = expr_fmpq(e, point);
    value_at(e, value, expr_substitute(e, q, x, here), at, PREC);
    value_at(e, slope, expr_substitute(e, expr_derivative(e, p, x), x, here), at, PREC);
    value_at(e, t, expr_substitute(e, p, x, here), at, PREC);
    partial_sum_ball(e, sum, next, &s, t, at, PREC);
    acb_mul(sum, sum, slope, PREC);
    acb_get_abs_ubound_arf(size, slope, 64);
    arf_mul(next, next, size, 64, ARF_RND_UP);
    if (!agrees(value, sum, next, PREC))
        fail_msg("%s: the partial sum is off; series %.2000s", words, series_text(e, &s));
    fmpq_clear(point), acb_clear(t), acb_clear(slope), acb_clear(value), acb_clear(sum), arf_clear(next),
        arf_clear(size);
    series_clear(&s);
}

static const char *const value_cases[][2] = {
    {"sinh(x)", "1/(1 + x)"},       {"exp(x) - 1 - x", "1 + x"},   {"x^2/2 + x^4/4", "1/(1 + x^2)"},
    {"cosh(x) - 1", "x^(1/3)"},     {"x + x^2", "log(x)/(1 + x)"}, {"3*x^2 + x^3", "log(x)^2*exp(x)"},
    {"x^3 + x^4", "cos(x)"},        {"x^(3/2) + x^2", "sqrt(x)"},  {"a*x + x^2", "1/(1 + x)"},
    {"a*x^2 + b*x^3", "x^nu"},      {"sinh(a*x)", "log(x)"},       {"pi*x + x^2", "1/(1 + x)"},
    {"x^2*(2 + x)", "exp(x)"},      {"tan(x)", "Gamma(1 + x)"},    {"x*exp(x)", "x^nu*cos(b*x)"},
    {"sqrt(2)*x^2 + x^3", "1 + x"}, {"x - sin(x)", "1/(1 + x)"},   {"x^(1/3)", "1/(1 + x)"},
    {"log(1 + x)", "1/(2 + x)"},
};

static void test_values(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof value_cases / sizeof *value_cases; k++) {
        tw_engine *e = tw_engine_new();
        give(e, RELATION_LESS, "0", "a");
        give(e, RELATION_LESS, "0", "nu");
        expr *symbols[] = {expr_symbol(e, "a"), expr_symbol(e, "b"), expr_symbol(e, "nu")};
        expr *values[] = {expr_frac(e, 7, 5), expr_frac(e, 2, 7), expr_frac(e, 5, 3)};
        env at = {3, symbols, values};
        char words[200];
        snprintf(words, sizeof words, "t = %s, q = %s", value_cases[k][0], value_cases[k][1]);
        check_branch(e, words, read_expr(e, value_cases[k][0]), read_expr(e, value_cases[k][1]), 5, &at, 60);
        tw_engine_free(e);
    }
}

static uint64_t random_state;

static slong random_below(slong n)
{
    random_state ^= random_state << 13;
    random_state ^= random_state >> 7;
    random_state ^= random_state << 17;
    return (slong)((random_state >> 33) % (uint64_t)n);
}

/* p = x^mu (p0 + p1 x^a + p2 x^b), q = x^r (1 + q1 x)^k or with exp and log. */
static void test_random(void **state)
{
    (void)state;
    const char *seed = getenv("TW_SEED");
    random_state = seed != NULL ? strtoull(seed, NULL, 10) : (uint64_t)(uintptr_t)&random_state ^ 88172645463325252ull;
    printf("test_branch: TW_SEED=%llu\n", (unsigned long long)random_state);
    for (int trial = 0; trial < 60; trial++) {
        tw_engine *e = tw_engine_new();
        char p[200], q[200], words[420];
        snprintf(p, sizeof p, "x^(%ld/%ld)*(%ld/%ld + %ld*x + %ld*x^2%s)", random_below(4) + 1, random_below(2) + 1,
                 random_below(4) + 1, random_below(3) + 1, random_below(7) - 3, random_below(7) - 3,
                 random_below(2) ? "" : " + x^(1/2)");
        snprintf(q, sizeof q, "x^(%ld/%ld)*(1 + %ld*x)^(%ld/3)%s", random_below(7) - 3, random_below(3) + 1,
                 random_below(5) - 2, random_below(7) - 3,
                 random_below(3)   ? ""
                 : random_below(2) ? "*log(x)"
                                   : "*exp(x)");
        snprintf(words, sizeof words, "t = %s, q = %s", p, q);
        check_branch(e, words, read_expr(e, p), read_expr(e, q), 4, NULL, 200);
        tw_engine_free(e);
    }
}

/* Several hundred terms are had, and begin like the few. */
static void test_long(void **state)
{
    (void)state;
    static const char *const phases[] = {"sinh(x)", "x + x^2", "exp(x) - 1 - x", "x^2 + x^3", "cosh(x) - 1"};
    for (size_t k = 0; k < sizeof phases / sizeof *phases; k++) {
        tw_engine *e = tw_engine_new();
        series few, many;
        series_init(&few), series_init(&many);
        expr *p = read_expr(e, phases[k]), *q = read_expr(e, "1/(1 + x)"), *x = expr_symbol(e, "x");
        assert_int_equal(series_branch(e, &few, p, q, x, 10, NULL, NULL), TW_OK);
        assert_int_equal(series_branch(e, &many, p, q, x, 200, NULL, NULL), TW_OK);
        assert_int_equal(few.count, many.count);
        for (size_t j = 0; j < few.count; j++) {
            assert_int_equal(many.strands[j].c.count, 200);
            for (slong n = 0; n < 10; n++)
                assert_true(coefficient_expr(e, &few.strands[j].c, n) == coefficient_expr(e, &many.strands[j].c, n));
        }
        series_clear(&few), series_clear(&many);
        tw_engine_free(e);
    }
}

static const struct refusal {
    const char *p, *q, *words;
} refusals[] = {
    {"1 + x", "1", "does not tend to zero"},   {"-x", "1", "not positive"},
    {"x*log(x)", "1", "logarithms"},           {"x^nu", "1", "rational power"},
    {"x", "exp(-1/x)", "is flat at x = 0"},    {"x + x^nu", "1", "powers"},
};

static void test_refusals(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof refusals / sizeof *refusals; k++) {
        tw_engine *e = tw_engine_new();
        series s;
        series_init(&s);
        if (series_branch(e, &s, read_expr(e, refusals[k].p), read_expr(e, refusals[k].q), expr_symbol(e, "x"), 4, NULL,
                          NULL) == TW_OK)
            fail_msg("%s has an inverse", refusals[k].p);
        assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
        if (strstr(e->error.words, refusals[k].words) == NULL)
            fail_msg("%s: %s", refusals[k].p, e->error.words);
        tw_engine_free(e);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_exact),  cmocka_unit_test(test_values),   cmocka_unit_test(test_random),
        cmocka_unit_test(test_long),   cmocka_unit_test(test_refusals),
    };
    return cmocka_run_group_tests_name("branch", tests, NULL, NULL);
}
