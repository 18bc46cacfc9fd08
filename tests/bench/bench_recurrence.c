/* Recurrences: seconds to find and prove one, to run it far beside printing the same coefficients in decimal, and the general
 * route where none exists. Medians of three. */
#include "tests/engine/method/texts.h"

#include <stdio.h>
#include <time.h>

#include "engine/method/attach.h"
#include "engine/method/lanes.h"

static double cpu_seconds(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static double median(double a, double b, double c)
{
    double low = a < b ? a : b, high = a < b ? b : a;
    return c < low ? low : c > high ? high : c;
}

static void fill(tw_engine *e, contribution *c, const char *p, const char *q, slong terms)
{
    contribution_init(c);
    c->method = "watson";
    c->prefactor = c->local.factor = expr_int(e, 1);
    c->local.scale = expr_symbol(e, "s");
    local_form_add(&c->local, expr_symbol(e, "x"), expr_constant_of(e, CONSTANT_INF), text_parse(e, p), text_parse(e, q));
    if (contribution_fill_directly(e, c, expr_symbol(e, "s"), false, terms, NULL) != TW_OK) fail_msg("%s", e->error.words);
}

typedef struct bench_case {
    const char *name, *p, *q;
} bench_case;

static const bench_case CASES[] = {
    {"Airy, saddle", "x^2 + x^3/3", "1"},
    {"Bessel K, symbolic order", "x", "x^(nu - 1/2)*(1 + x/2)^(nu - 1/2)"},
    {"quartic exponent, symbolic a", "x^4", "exp(-a*x^2)"},
    {"two algebraic factors", "x", "(1 + x^2)^(-1/3)*sqrt(2 + x)"},
    {"three algebraic factors", "x", "(1 + x^2)^(-1/3)*sqrt(2 + x)*(3 + x)^(1/5)"},
    {"quartic/(1 + x^2)", "x^2/2 + x^4/4", "1/(1 + x^2)"},
};

static double find_once(const bench_case *k, slong *order)
{
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    text_given(e, "a > 0, nu > 0");
    contribution c;
    fill(e, &c, k->p, k->q, 6);
    const recurrence *r;
    double start = cpu_seconds();
    if (lane_recurrence(e, &c, &c.lanes[0], expr_symbol(e, "s"), &r) != TW_OK) fail_msg("%s", e->error.words);
    double took = cpu_seconds() - start;
    *order = r->order;
    contribution_clear(&c);
    tw_engine_free(e);
    return took;
}

static void bench_run(const bench_case *k, slong count)
{
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    contribution c;
    fill(e, &c, k->p, k->q, 64);
    const recurrence *r;
    const lane *l = &c.lanes[0];
    if (lane_recurrence(e, &c, l, expr_symbol(e, "s"), &r) != TW_OK || !r->p || !l->c.q) return;
    double took[3], printing = 0;
    for (int n = 0; n < 3; n++) {
        fmpq *v = _fmpq_vec_init(count);
        for (slong m = 0; m < l->c.count; m++) fmpq_set(&v[m], &l->c.q[m]);
        double start = cpu_seconds();
        if (recurrence_extend(e, r, v, l->c.count, count) != TW_OK) fail_msg("%s", e->error.words);
        took[n] = cpu_seconds() - start;
        start = cpu_seconds();
        for (slong m = 0; m < count && n == 0; m++) flint_free(fmpq_get_str(NULL, 10, &v[m]));
        if (n == 0) printing = cpu_seconds() - start;
        _fmpq_vec_clear(v, count);
    }
    printf("%-30s order %ld  %6ld terms  %8.4f s  printing %8.4f s\n", k->name, (long)r->order, (long)count,
           median(took[0], took[1], took[2]), printing);
    contribution_clear(&c);
    tw_engine_free(e);
}

static void bench_direct(slong count)
{
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    contribution c;
    double start = cpu_seconds();
    fill(e, &c, "x - log(1 + x)", "1", 2 * count);
    printf("general route, x - log(1 + x)  %6ld terms of each sign of the root  %8.3f s\n", (long)count,
           cpu_seconds() - start);
    contribution_clear(&c);
    tw_engine_free(e);
}

int main(void)
{
    for (size_t k = 0; k < sizeof CASES / sizeof *CASES; k++) {
        slong order;
        double a = find_once(&CASES[k], &order), b = find_once(&CASES[k], &order), c = find_once(&CASES[k], &order);
        printf("%-30s order %ld  found and proved in %7.2f ms\n", CASES[k].name, (long)order, 1000 * median(a, b, c));
    }
    for (size_t k = 0; k < sizeof CASES / sizeof *CASES; k++) {
        bench_run(&CASES[k], 1000);
        bench_run(&CASES[k], 5000);
    }
    bench_direct(125);
    bench_direct(250);
    return 0;
}
