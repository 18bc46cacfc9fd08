/* Constructors, questions, substitution and the forms made of them, against a plain evaluation that knows none of their
 * rules: a random tree is built through the constructors and evaluated by the book at the same time. */
#include "tests/engine/expr/plain.h"


static tw_engine *e;
static expr *x, *y, *z;

static expr *n(slong k)
{
    return expr_int(e, k);
}

static expr *q(slong a, slong b)
{
    return expr_frac(e, a, b);
}

static void fails_with(expr *a, error_kind kind)
{
    assert_null(a);
    assert_int_equal(e->error.kind, kind);
    engine_forgive(e);
}

static void reads(expr *a, const char *words)
{
    assert_non_null(a);
    char *t = expr_text(e, a);
    assert_string_equal(t, words);
    free(t);
}

/* ---- random trees ---- */

static const function_id elementary[] = {
    FUNCTION_EXP, FUNCTION_LOG, FUNCTION_SIN, FUNCTION_COS, FUNCTION_TAN, FUNCTION_SINH, FUNCTION_COSH, FUNCTION_TANH,
    FUNCTION_ASIN, FUNCTION_ACOS, FUNCTION_ATAN, FUNCTION_ASINH, FUNCTION_ACOSH, FUNCTION_ATANH, FUNCTION_RE,
        FUNCTION_IM,
    FUNCTION_CONJ, FUNCTION_ABS, FUNCTION_ARG, FUNCTION_ERF,
};

static expr *random_leaf(acb_t value, plain_env *v)
{
    expr *leaf;
    switch (plain_random(8)) {
    case 0: case 1: leaf = n((slong)plain_random(9) - 4); break;
    case 2: leaf = q((slong)plain_random(17) - 8, 1 + (slong)plain_random(6)); break;
    case 3: leaf = expr_constant_of(e, plain_random(2) ? CONSTANT_I : CONSTANT_PI); break;
    default: leaf = plain_random(3) == 0 ? x : plain_random(2) ? y : z;
    }
    plain_eval(e, value, leaf, v);
    return leaf;
}

/* The expression by the constructors, the value by the book. NULL where the constructors say that there is no value. */
static expr *random_tree(acb_t value, plain_env *v, int depth)
{
    if (depth == 0 || plain_random(6) == 0)
        return random_leaf(value, v);
    acb_t other;
    acb_init(other);
    expr *a = random_tree(value, v, depth - 1), *b = NULL;
    const uint64_t what = plain_random(10);
    if (a && what < 8)
        b = random_tree(other, v, depth - 1);
    if (a && what < 3) {
        a = expr_add(e, a, b);
        acb_add(value, value, other, PLAIN_BITS);
    } else if (a && what < 6) {
        a = expr_mul(e, a, b);
        acb_mul(value, value, other, PLAIN_BITS);
    } else if (a && what == 6) {
        a = expr_pow(e, a, b);
        acb_pow(value, value, other, PLAIN_BITS);
    } else if (a && what == 7) {
        const slong p = (slong)plain_random(9) - 4, den = 1 + (slong)plain_random(4);
        a = expr_pow(e, a, q(p, den));
        fmpq_t r;
        fmpq_init(r);
        fmpq_set_si(r, p, (ulong)den);
        fmpq_canonicalise(r);
        acb_set_fmpq(other, r, PLAIN_BITS);
        acb_pow(value, value, other, PLAIN_BITS);
        fmpq_clear(r);
    } else if (a) {
        plain_env single;
        plain_env_init(&single);
        expr *t = expr_symbol(e, "hole");
        const function_id f = elementary[plain_random(sizeof elementary / sizeof *elementary)];
        plain_bind(&single, t, value);
        plain_eval(e, value, expr_call1(e, f, t), &single);
        plain_env_clear(&single);
        a = expr_call1(e, f, a);
    }
    acb_clear(other);
    if (!a)
        engine_forgive(e);
    return a;
}

static void random_point(plain_env *v, bool positive)
{
    acb_t value;
    acb_init(value);
    expr *const symbols[3] = {x, y, z};
    for (size_t k = 0; k < 3; k++) {
        if (positive)
            acb_set_d(value, plain_uniform(0.1, 3));
        else
            acb_set_d_d(value, plain_uniform(-2, 2), plain_random(4) ? plain_uniform(-2, 2) : 0);
        plain_bind(v, symbols[k], value);
    }
    acb_clear(value);
}

static void must_agree(const acb_t value, expr *a, plain_env *v, const char *what)
{
    acb_t own;
    acb_init(own);
    plain_eval(e, own, a, v);
    if (plain_is_sharp(value) && plain_is_sharp(own) && plain_distance(value, own) > 1e-15) {
        char *t = expr_text(e, a);
        print_message("%s: %s\n", what, t);
        acb_printd(value, 20);
        printf("  but  ");
        acb_printd(own, 20);
        printf("\n");
        free(t);
        fail();
    }
    acb_clear(own);
}

static void constructors_keep_the_value(void **state)
{
    plain_env v;
    acb_t value;
    (void)state;
    plain_env_init(&v);
    acb_init(value);
    int compared = 0;
    for (int k = 0; k < 4000; k++) {
        random_point(&v, false);
        expr *a = random_tree(value, &v, 1 + (int)plain_random(5));
        if (!a)
            continue;
        must_agree(value, a, &v, "constructors");
        compared += plain_is_sharp(value);
    }
    assert_true(compared > 1500);
    acb_clear(value);
    plain_env_clear(&v);
}

static void forms_keep_the_value(void **state)
{
    plain_env v;
    acb_t value;
    (void)state;
    plain_env_init(&v);
    acb_init(value);
    expr *const all[3] = {x, y, z};
    for (int k = 0; k < 3000; k++) {
        random_point(&v, true);
        expr *a = random_tree(value, &v, 1 + (int)plain_random(5));
        if (!a)
            continue;
        expr *normal = expr_normal(e, a, all, 3), *expanded = expr_expand(e, a);
        if (normal)
            must_agree(value, normal, &v, "normal");
        engine_forgive(e);
        random_point(&v, false);
        plain_eval(e, value, a, &v);
        if (expanded)
            must_agree(value, expanded, &v, "expand");
        engine_forgive(e);
    }
    acb_clear(value);
    plain_env_clear(&v);
}

static void substitution_keeps_the_value(void **state)
{
    plain_env v;
    acb_t value, inner;
    (void)state;
    plain_env_init(&v);
    acb_init(value);
    acb_init(inner);
    for (int k = 0; k < 2000; k++) {
        random_point(&v, false);
        expr *b = random_tree(inner, &v, 2);
        expr *a = random_tree(value, &v, 1 + (int)plain_random(4));
        expr *put = a && b ? expr_substitute(e, a, x, b) : NULL;
        if (put) {
            plain_eval(e, inner, b, &v);
            acb_get_mid(inner, inner);
            plain_eval(e, value, put, &v);
            plain_bind(&v, x, inner);
            must_agree(value, a, &v, "substitute");
        }
        engine_forgive(e);
    }
    acb_clear(value);
    acb_clear(inner);
    plain_env_clear(&v);
}

/* A binder's body is opened and closed without a change, whatever the name. */
static void binders_have_no_names(void **state)
{
    (void)state;
    acb_t value;
    plain_env v;
    plain_env_init(&v);
    acb_init(value);
    random_point(&v, false);
    for (int k = 0; k < 500; k++) {
        expr *body = random_tree(value, &v, 3);
        if (!body || expr_is_zero(body))
            continue;
        expr *t = expr_symbol(e, "t"), *renamed = expr_substitute(e, body, x, t);
        expr *integral = expr_integral(e, x, n(0), n(1), body);
        assert_ptr_equal(integral, expr_integral(e, t, n(0), n(1), renamed));
        assert_ptr_equal(expr_open(e, integral, x), body);
        assert_int_equal(integral->loose, 0);
        assert_false(expr_has(integral, x));
        /* no capture: y becomes x, and the bound variable stays itself */
        expr *put = expr_substitute(e, integral, y, x);
        assert_ptr_equal(put, expr_integral(e, t, n(0), n(1), expr_substitute(e, renamed, y, x)));
    }
    acb_clear(value);
    plain_env_clear(&v);
}

/* integral over t of (integral over u of f(t, u)), under a third binder. */
static void nested_binders_shift(void **state)
{
    (void)state;
    expr *t = expr_symbol(e, "t"), *u = expr_symbol(e, "u");
    expr *inner = expr_integral(e, u, n(0), t, expr_mul(e, t, expr_pow(e, u, n(2))));
    expr *outer = expr_integral(e, t, n(0), y, inner);
    reads(outer, "integral from 0 to y of integral from 0 to t of t*u^2 du dt");
    expr *summed = expr_summation(e, y, n(1), n(3), outer);
    reads(summed, "sum from y = 1 to 3 of integral from 0 to y of integral from 0 to t of t*u^2 du dt");
    reads(expr_open(e, summed, n(2)), "integral from 0 to 2 of integral from 0 to t of t*u^2 du dt");
    reads(expr_open(e, expr_open(e, summed, x), x), "integral from 0 to x of x*u^2 du");
    assert_ptr_equal(expr_open(e, outer, t), inner);
}

static void order_is_total(void **state)
{
    enum { COUNT = 60 };
    expr *sample[COUNT];
    acb_t value;
    plain_env v;
    (void)state;
    plain_env_init(&v);
    acb_init(value);
    random_point(&v, false);
    for (int k = 0; k < COUNT;) {
        sample[k] = random_tree(value, &v, 3);
        k += sample[k] != NULL;
    }
    for (int a = 0; a < COUNT; a++)
        for (int b = 0; b < COUNT; b++) {
            const int order = expr_order(sample[a], sample[b]);
            assert_int_equal(order == 0, sample[a] == sample[b]);
            assert_int_equal((order > 0) - (order < 0), -((expr_order(sample[b],
                sample[a]) > 0) - (expr_order(sample[b], sample[a]) < 0)));
            for (int c = 0; c < COUNT; c++)
                if (order < 0 && expr_order(sample[b], sample[c]) < 0)
                    assert_true(expr_order(sample[a], sample[c]) < 0);
        }
    acb_clear(value);
    plain_env_clear(&v);
}

/* The same terms in any order give the same node; so do factors. And rebuilding a canonical node changes nothing. */
static void order_of_building_does_not_matter(void **state)
{
    enum { COUNT = 12 };
    acb_t value;
    plain_env v;
    (void)state;
    plain_env_init(&v);
    acb_init(value);
    random_point(&v, false);
    for (int round = 0; round < 300; round++) {
        expr *parts[COUNT];
        for (int k = 0; k < COUNT;) {
            parts[k] = random_tree(value, &v, 2);
            k += parts[k] != NULL;
        }
        expr *sum = expr_sum(e, parts, COUNT), *product = expr_product(e, parts, COUNT);
        engine_forgive(e);
        expr *one_by_one = n(0);
        for (int k = 0; k < COUNT; k++)
            one_by_one = expr_add(e, one_by_one, parts[k]);
        assert_ptr_equal(sum, one_by_one);
        for (int k = COUNT - 1; k > 0; k--) {
            const size_t j = plain_random((uint64_t)k + 1);
            expr *swap = parts[k];
            parts[k] = parts[j];
            parts[j] = swap;
        }
        assert_ptr_equal(sum, expr_sum(e, parts, COUNT));
        assert_ptr_equal(product, expr_product(e, parts, COUNT));
        engine_forgive(e);
        if (sum)
            assert_ptr_equal(sum, expr_sum(e, &sum, 1));
        expr *const again[2] = {product, n(1)};
        if (product)
            assert_ptr_equal(product, expr_product(e, again, 2));
    }
    acb_clear(value);
    plain_env_clear(&v);
}

/* ---- what is promised by name ---- */

static void canonical_examples(void **state)
{
    (void)state;
    expr *i = expr_constant_of(e, CONSTANT_I), *pi = expr_constant_of(e, CONSTANT_PI), *sum = expr_add(e, x, y);
    assert_ptr_equal(expr_add(e, x, expr_mul(e, n(2), x)), expr_mul(e, n(3), x));
    assert_true(expr_is_zero(expr_sub(e, sum, sum)));
    assert_ptr_equal(expr_mul(e, expr_pow(e, x, y), expr_pow(e, x, z)), expr_pow(e, x, expr_add(e, y, z)));
    assert_true(expr_is_one(expr_mul(e, expr_pow(e, x, y), expr_pow(e, x, expr_neg(e, y)))));
    reads(expr_mul(e, n(2), sum), "2*(x + y)");
    reads(expr_neg(e, sum), "-x - y");
    reads(expr_sqrt(e, expr_pow(e, x, n(2))), "sqrt(x^2)");
    reads(expr_sqrt(e, n(12)), "2*sqrt(3)");
    reads(expr_pow(e, q(1, 2), q(-1, 2)), "sqrt(2)");
    assert_ptr_equal(expr_pow(e, n(8), q(1, 3)), n(2));
    assert_ptr_equal(expr_pow(e, i, n(6)), n(-1));
    assert_ptr_equal(expr_mul(e, expr_sqrt(e, i), expr_sqrt(e, i)), i);
    assert_ptr_equal(expr_sqrt(e, n(-4)), expr_mul(e, n(2), i));
    assert_ptr_equal(expr_pow(e, expr_sqrt(e, x), n(2)), x);
    assert_ptr_equal(expr_call1(e, FUNCTION_GAMMA, n(5)), n(24));
    assert_ptr_equal(expr_call1(e, FUNCTION_GAMMA, q(1, 2)), expr_sqrt(e, pi));
    assert_ptr_equal(expr_call1(e, FUNCTION_EXP, expr_call1(e, FUNCTION_LOG, sum)), sum);
    assert_ptr_equal(expr_call1(e, FUNCTION_LOG, expr_call1(e, FUNCTION_EXP, n(3))), n(3));
    reads(expr_call1(e, FUNCTION_LOG, expr_call1(e, FUNCTION_EXP, x)), "log(exp(x))");
    assert_ptr_equal(expr_call1(e, FUNCTION_EXP, expr_mul(e, i, pi)), n(-1));
    assert_ptr_equal(expr_mul(e, expr_call1(e, FUNCTION_EXP, x), expr_call1(e, FUNCTION_EXP, expr_neg(e, x))), n(1));
    assert_ptr_equal(expr_mul(e, expr_call1(e, FUNCTION_EXP, expr_sub(e, x, y)), expr_call1(e, FUNCTION_EXP,
        expr_sub(e, y, x))), n(1));
    reads(expr_call1(e, FUNCTION_SIN, expr_sub(e, y, x)), "-sin(x - y)");
    reads(expr_call1(e, FUNCTION_COS, expr_neg(e, x)), "cos(x)");
    assert_ptr_equal(expr_call1(e, FUNCTION_SIN, expr_neg(e, x)), expr_neg(e, expr_call1(e, FUNCTION_SIN, x)));
    assert_ptr_equal(expr_pow(e, n(0), n(0)), n(1));
    assert_ptr_equal(expr_pow(e, x, n(0)), n(1));
}

static void infinities(void **state)
{
    (void)state;
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    assert_true(expr_is_inf(expr_add(e, inf, n(1))));
    assert_true(expr_is_inf(expr_add(e, inf, inf)));
    assert_true(expr_is_inf(expr_mul(e, n(2), inf)));
    assert_true(expr_is_minus_inf(expr_mul(e, q(-1, 2), inf)));
    assert_true(expr_is_minus_inf(expr_neg(e, inf)));
    assert_true(expr_is_zero(expr_pow(e, inf, n(-1))));
    assert_true(expr_is_zero(expr_call1(e, FUNCTION_EXP, expr_neg(e, inf))));
    assert_true(expr_is_inf(expr_sub(e, inf, x)));
    reads(expr_mul(e, x, inf), "inf*x");
    fails_with(expr_sub(e, inf, inf), ERROR_VALUE);
    fails_with(expr_mul(e, n(0), inf), ERROR_VALUE);
    fails_with(expr_sub(e, expr_mul(e, x, inf), expr_mul(e, x, inf)), ERROR_VALUE);
    fails_with(expr_pow(e, inf, n(0)), ERROR_VALUE);
}

static void impossible_values(void **state)
{
    (void)state;
    fails_with(expr_pow(e, n(0), n(-1)), ERROR_VALUE);
    fails_with(expr_div(e, x, n(0)), ERROR_VALUE);
    fails_with(expr_frac(e, 1, 0), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_GAMMA, n(-3)), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_LOG, n(0)), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_ZETA, n(1)), ERROR_VALUE);
    fails_with(expr_pow(e, n(10), n(1000000000)), ERROR_VALUE);
    fails_with(expr_pow(e, n(10), expr_pow(e, n(10), n(40))), ERROR_VALUE);
    fails_with(expr_pow(e, n(3), q(1000000001, 2)), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_GAMMA, n(100000000)), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_GAMMA, expr_pow(e, n(10), n(30))), ERROR_VALUE);
    fails_with(expr_call1(e, FUNCTION_GAMMA, q(100000001, 2)), ERROR_VALUE);
    assert_ptr_equal(expr_pow(e, n(-1), expr_pow(e, n(10), n(40))), n(1));
    fails_with(expr_add(e, NULL, x) ? x : (engine_fail(e, ERROR_VALUE, "-"), NULL), ERROR_VALUE);
}

/* Exact values of functions against their values computed without the tables. */
static void exact_values(void **state)
{
    (void)state;
    plain_env v;
    acb_t value;
    plain_env_init(&v);
    acb_init(value);
    expr *t = expr_symbol(e, "hole"), *pi = expr_constant_of(e, CONSTANT_PI);
    for (int f = 0; f < FUNCTION_COUNT; f++) {
        if (function_fewest(f) != 1 || f == FUNCTION_EI)
            continue;
        for (slong a = -24; a <= 24; a++) {
            for (slong b = 1; b <= 12; b++) {
                for (int times_pi = 0; times_pi < 3; times_pi++) {
                    expr *unit = times_pi == 0 ? n(1) : times_pi == 1 ? pi : expr_mul(e, pi, expr_constant_of(e,
                        CONSTANT_I));
                    expr *argument = expr_mul(e, q(a, b), unit), *call = expr_call1(e, f, argument);
                    engine_forgive(e);
                    if (!call || expr_is_call(call, f))
                        continue;
                    plain_eval(e, value, argument, &v);
                    plain_bind(&v, t, value);
                    plain_eval(e, value, expr_call1(e, f, t), &v);
                    must_agree(value, call, &v, function_name(f));
                }
            }
        }
        for (slong k = 1; k < 13; k++) { /* the plain values of sine and tangent, backwards */
            expr *sine = expr_call1(e, FUNCTION_SIN, expr_mul(e, q(k, 12), pi));
            expr *tangent = k == 6 ? n(1) : expr_call1(e, FUNCTION_TAN, expr_mul(e, q(k, 12), pi));
            expr *const arguments[4] = {sine, expr_neg(e, sine), tangent, expr_neg(e, tangent)};
            for (size_t j = 0; j < 4; j++) {
                expr *call = expr_call1(e, f, arguments[j]);
                engine_forgive(e);
                if (!call || expr_is_call(call, f))
                    continue;
                plain_eval(e, value, arguments[j], &v);
                plain_bind(&v, t, value);
                plain_eval(e, value, expr_call1(e, f, t), &v);
                must_agree(value, call, &v, function_name(f));
            }
        }
    }
    acb_clear(value);
    plain_env_clear(&v);
}

static void exact_values_of_two(void **state)
{
    static const function_id two[] = {FUNCTION_GAMMA_UPPER, FUNCTION_POLYGAMMA, FUNCTION_BETA, FUNCTION_BESSEL_J,
                                      FUNCTION_BESSEL_Y, FUNCTION_BESSEL_I, FUNCTION_BESSEL_K};
    (void)state;
    plain_env v;
    acb_t value;
    plain_env_init(&v);
    acb_init(value);
    expr *s = expr_symbol(e, "hole"), *t = expr_symbol(e, "pit");
    for (size_t k = 0; k < sizeof two / sizeof *two; k++) {
        for (slong a = -12; a <= 12; a++) {
            for (slong b = -12; b <= 12; b++) {
                for (slong den = 1; den <= 3; den++) {
                    expr *const args[2] = {q(a, den), q(b, 2)}, *const holes[2] = {s, t};
                    expr *call = expr_call(e, two[k], args, 2);
                    engine_forgive(e);
                    if (!call || (expr_is_call(call, two[k]) && call->args[0] == args[0]))
                        continue;
                    plain_eval(e, value, args[0], &v);
                    plain_bind(&v, s, value);
                    plain_eval(e, value, args[1], &v);
                    plain_bind(&v, t, value);
                    plain_eval(e, value, expr_call(e, two[k], holes, 2), &v);
                    must_agree(value, call, &v, function_name(two[k]));
                }
            }
        }
    }
    acb_clear(value);
    plain_env_clear(&v);
}

/* ---- sizes ---- */

static void depth_is_limited(void **state)
{
    (void)state;
    expr *a = x;
    int levels = 0;
    for (; a && levels < 10000; levels++)
        a = expr_call1(e, FUNCTION_SIN, expr_add(e, a, n(1)));
    assert_in_range(levels, EXPR_DEPTH_LIMIT / 2 - 5, EXPR_DEPTH_LIMIT);
    fails_with(a, ERROR_VALUE);
    a = x;
    for (int k = 0; k < EXPR_DEPTH_LIMIT - 2; k++)
        a = expr_call1(e, FUNCTION_SIN, a);
    assert_non_null(a);
    assert_true(expr_has(a, x));
    assert_non_null(expr_substitute(e, a, x, y));
    expr *derivative = expr_derivative(e, a, x); /* wide, no deeper */
    assert_non_null(derivative);
    assert_int_equal(derivative->count, EXPR_DEPTH_LIMIT - 2);
    assert_non_null(expr_normal(e, a, &x, 1));
    char *t = expr_text(e, a);
    assert_int_equal(strlen(t), 5 * (EXPR_DEPTH_LIMIT - 2) + 1);
    free(t);
    fails_with(expr_substitute(e, a, x, a), ERROR_VALUE);
}

static void large_sums_build_fast(void **state)
{
    enum { COUNT = 100000 };
    (void)state;
    expr **terms = malloc(COUNT * sizeof *terms);
    for (slong k = 0; k < COUNT; k++)
        terms[k] = expr_mul(e, n(k % 7 + 1), expr_pow(e, x, n(COUNT - k)));
    const clock_t before = clock();
    expr *sum = expr_sum(e, terms, COUNT);
    const double seconds = (double)(clock() - before) / CLOCKS_PER_SEC;
    assert_int_equal(sum->count, COUNT);
    print_message("a sum of %d terms: %.2f s\n", COUNT, seconds);
    assert_true(seconds < 5);
    assert_true(expr_is_zero(expr_sub(e, sum, sum)));
    expr **coefficients;
    slong degree;
    assert_int_equal(expr_polynomial(e, sum, x, COUNT - 1, &coefficients, &degree), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_NONE);
    free(terms);
}

/* Repeated squaring by `let`: 300 nodes that unfold to 2^300. */
static void shared_trees_stay_small(void **state)
{
    (void)state;
    expr *a = x;
    for (int k = 0; k < 300; k++)
        a = expr_add(e, expr_call1(e, FUNCTION_SIN, a), expr_mul(e, y, expr_call1(e, FUNCTION_COS, a)));
    assert_true(expr_size(a) == (uint64_t)1 << 63);
    assert_true(expr_has(a, x));
    assert_false(expr_has(a, z));
    expr **symbols;
    assert_int_equal(expr_symbols(a, &symbols), 2);
    free(symbols);
    expr *put = expr_substitute(e, a, x, z);
    assert_true(expr_has(put, z));
    assert_false(expr_has(put, x));
    assert_ptr_equal(expr_substitute(e, put, z, x), a);
    assert_non_null(expr_derivative(e, a, y));
    assert_non_null(expr_normal(e, a, &x, 1));
    assert_non_null(expr_integral(e, x, n(0), n(1), a));
    assert_true(expr_order(a, put) != 0);
    char *t = expr_text(e, a);
    assert_true(strlen(t) < 100);
    free(t);
    expr *c = expr_constant_of(e, CONSTANT_PI), *g = y; /* questions of reality are no walks over 2^100 nodes */
    for (int k = 0; k < 100; k++) {
        c = expr_sqrt(e, expr_add(e, c, expr_mul(e, n(2), expr_call1(e, FUNCTION_EXP, c))));
        g = expr_pow(e, expr_add(e, expr_call1(e, FUNCTION_EXP, g), expr_call1(e, FUNCTION_ABS, g)), q(2, 3));
    }
    assert_non_null(expr_normal(e, expr_mul(e, c, g), &y, 1));
    assert_non_null(expr_derivative(e, g, y));
    assert_true(expr_is_inf(expr_add(e, expr_constant_of(e, CONSTANT_INF), g)));
    expr *b = x; /* a polynomial that grows: the limit stops it */
    for (int k = 0; k < 100; k++)
        b = expr_add(e, expr_pow(e, b, n(2)), b);
    expr **coefficients;
    slong degree;
    assert_int_equal(expr_polynomial(e, b, x, 20, &coefficients, &degree), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_NONE);
}

/* ---- forms ---- */

static void polynomials_are_read(void **state)
{
    (void)state;
    expr **c;
    slong degree;
    expr *a = expr_mul(e, expr_pow(e, expr_add(e, x, y), n(3)), expr_sub(e, n(1), x));
    assert_int_equal(expr_polynomial(e, a, x, 4, &c, &degree), TW_OK);
    assert_int_equal(degree, 4);
    assert_ptr_equal(c[0], expr_pow(e, y, n(3)));
    assert_ptr_equal(c[4], n(-1));
    free(c);
    assert_int_equal(expr_polynomial(e, a, x, 3, &c, &degree), TW_ERROR);
    assert_int_equal(expr_polynomial(e, expr_sqrt(e, x), x, 9, &c, &degree), TW_ERROR);
    assert_int_equal(expr_polynomial(e, y, x, 0, &c, &degree), TW_OK);
    assert_int_equal(degree, 0);
    free(c);
    expr *vanishing = expr_sub(e, expr_pow(e, expr_add(e, x, n(1)), n(2)), expr_pow(e, x, n(2)));
    assert_int_equal(expr_polynomial(e, vanishing, x, 2, &c, &degree), TW_OK);
    assert_int_equal(degree, 1);
    free(c);
    assert_int_equal(e->error.kind, ERROR_NONE);
}

static void expansion_examples(void **state)
{
    (void)state;
    expr *sum = expr_add(e, x, y);
    reads(expr_expand(e, expr_mul(e, expr_add(e, x, n(1)), expr_sub(e, x, n(1)))), "x^2 - 1");
    reads(expr_expand(e, expr_pow(e, sum, n(2))), "x^2 + 2*x*y + y^2");
    assert_int_equal(expr_expand(e, expr_pow(e, sum, n(1000)))->count, 1001);
    assert_int_equal(expr_expand(e, expr_pow(e, expr_add(e, sum, z), n(20)))->count, 231);
    expr *root = expr_sqrt(e, sum);
    assert_ptr_equal(expr_expand(e, expr_mul(e, root, expr_mul(e, root, z))), expr_add(e, expr_mul(e, x, z),
        expr_mul(e, y, z)));
    fails_with(expr_expand(e, expr_pow(e, sum, n(100000000))), ERROR_VALUE);
}

static void normal_examples(void **state)
{
    (void)state;
    expr *s = expr_symbol(e, "s"), *sx = expr_mul(e, s, x);
    expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, sx));
    expr *a = expr_product(e, (expr *const[]){kernel, expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_pow(e, x, n(2)))),
                                              expr_pow(e, expr_mul(e, expr_sqrt(e, x), expr_add(e, n(1), x)), n(-1))},
                                                  3);
    reads(expr_normal(e, a, &x, 1), "exp(-s*x - x^2)/(sqrt(x)*(1 + x))");
    reads(expr_normal(e, expr_call1(e, FUNCTION_LOG, expr_mul(e, n(2), x)), &x, 1), "log(2) + log(x)");
    assert_ptr_equal(expr_normal(e, expr_sqrt(e, expr_pow(e, x, n(2))), &x, 1), x);
    assert_ptr_equal(expr_normal(e, expr_sqrt(e, expr_pow(e, y, n(2))), &x, 1), expr_sqrt(e, expr_pow(e, y, n(2))));
    reads(expr_normal(e, expr_pow(e, expr_mul(e, x, y), q(1, 3)), &x, 1), "x^(1/3)*y^(1/3)");
    assert_ptr_equal(expr_normal(e, expr_call1(e, FUNCTION_ABS, x), &x, 1), x);
    expr *shifted = expr_mul(e, kernel, expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, y, x))));
    reads(expr_normal(e, shifted, &x, 1), "exp(x*(-s - y))");
    assert_ptr_equal(expr_normal(e, expr_call1(e, FUNCTION_EXP, expr_sub(e, expr_mul(e, y, expr_call1(e, FUNCTION_LOG,
        x)), x)), &x, 1),
                     expr_mul(e, expr_pow(e, x, y), expr_call1(e, FUNCTION_EXP, expr_neg(e, x))));
}

static int set_up(void **state)
{
    (void)state;
    e = tw_engine_new();
    x = expr_symbol(e, "x");
    y = expr_symbol(e, "y");
    z = expr_symbol(e, "z");
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
        cmocka_unit_test(canonical_examples),
        cmocka_unit_test(infinities),
        cmocka_unit_test(impossible_values),
        cmocka_unit_test(exact_values),
        cmocka_unit_test(exact_values_of_two),
        cmocka_unit_test(constructors_keep_the_value),
        cmocka_unit_test(forms_keep_the_value),
        cmocka_unit_test(substitution_keeps_the_value),
        cmocka_unit_test(binders_have_no_names),
        cmocka_unit_test(nested_binders_shift),
        cmocka_unit_test(order_is_total),
        cmocka_unit_test(order_of_building_does_not_matter),
        cmocka_unit_test(depth_is_limited),
        cmocka_unit_test(large_sums_build_fast),
        cmocka_unit_test(shared_trees_stay_small),
        cmocka_unit_test(polynomials_are_read),
        cmocka_unit_test(expansion_examples),
        cmocka_unit_test(normal_examples),
    };
    plain_seed("test_expr");
    return cmocka_run_group_tests_name("test_expr", tests, set_up, tear_down);
}
