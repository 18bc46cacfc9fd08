/* Figures of rewriting: 1000 rules none of which matches beside one such rule on the same expression; `repeat everywhere` over
 * sums of 10^4 and 10^5 terms, time per term; each a median of five runs. */
#include <stdio.h>
#include <time.h>

#include "tests/engine/rewrite/texts.h"

#include "engine/rewrite/pass.h"

enum { RUNS = 5 };

static double now_ms(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec * 1e3 + (double)t.tv_nsec / 1e6;
}

static int compare(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static double run_ms(tw_engine *e, const pass *p, expr *a, expr **after)
{
    double times[RUNS];
    for (int k = 0; k < RUNS; k++) {
        rewriting w;
        rewriting_init(&w);
        const double start = now_ms();
        if (pass_run(e, p, a, &w) != TW_OK) {
            fprintf(stderr, "%s\n", e->error.words);
            exit(1);
        }
        times[k] = now_ms() - start;
        *after = w.after;
        rewriting_clear(&w);
    }
    qsort(times, RUNS, sizeof *times, compare);
    return times[RUNS / 2];
}

/* everywhere (r0 or r1 or ...), the rules' patterns made by `form` from a number. */
static pass *many(tw_engine *e, const char *form, int n)
{
    pass **parts = malloc((size_t)n * sizeof *parts);
    for (int k = 0; k < n; k++) {
        char words[400];
        snprintf(words, sizeof words, form, k, k + 2);
        rule *r = text_rule(e, words);
        parts[k] = pass_of_rule(r);
        rule_release(r);
    }
    pass *inner = n == 1 ? parts[0] : pass_join(STRATEGY_OR, parts, (size_t)n);
    free(parts);
    return pass_join(STRATEGY_EVERYWHERE, &inner, 1);
}

static void thousand(const char *name, const char *form)
{
    tw_engine *e = tw_engine_new();
    expr *after, *sum = expr_int(e, 0);
    static const char *const pieces[] = {"sin(3001*y)*exp(-y)", "integral from 0 to inf of t^3001*exp(-s*t) dt",
                                         "J(3001, z)^2", "log(1 + sqrt(x))*x^3001"};
    for (int k = 0; k < 400; k++)
        sum = expr_add(e, sum, expr_mul(e, text_parse(e, pieces[k % 4]), expr_pow(e, expr_symbol(e, "q"), expr_int(e, k))));
    pass *one = many(e, form, 1), *all = many(e, form, 1000);
    const double a = run_ms(e, one, sum, &after), b = run_ms(e, all, sum, &after);
    printf("1000 rules, none matching (%s): one rule %.2f ms, all %.2f ms, ratio %.2f%s\n", name, a, b, b / a,
           after == sum ? "" : "  CHANGED");
    pass_release(one);
    pass_release(all);
    tw_engine_free(e);
}

static double per_term(const char *text_of_rule, const char *term, int n)
{
    tw_engine *e = tw_engine_new();
    expr **terms = malloc((size_t)n * sizeof *terms), *after;
    expr *form = text_parse(e, term), *k_symbol = expr_symbol(e, "k");
    for (int k = 0; k < n; k++) {
        expr *number = expr_int(e, k + 1);
        terms[k] = expr_substitute(e, form, k_symbol, number);
    }
    expr *sum = expr_sum(e, terms, (size_t)n);
    rule *r = text_rule(e, text_of_rule);
    pass *p = pass_of_rule(r);
    p = pass_join(STRATEGY_EVERYWHERE, &p, 1);
    p = pass_join(STRATEGY_REPEAT, &p, 1);
    const double t = run_ms(e, p, sum, &after) / n;
    if (after == sum) printf("UNCHANGED ");
    pass_release(p);
    rule_release(r);
    free(terms);
    tw_engine_free(e);
    return t * 1e3;
}

static void linear(const char *name, const char *text_of_rule, const char *term)
{
    const double a = per_term(text_of_rule, term, 10000), b = per_term(text_of_rule, term, 100000);
    printf("repeat everywhere, %s: %.2f us a term at 10^4, %.2f us at 10^5, ratio %.2f\n", name, a, b, b / a);
}

int main(void)
{
    setvbuf(stdout, NULL, _IOLBF, 0);
    thousand("sin(k*x)", "rule r%d(a): sin(%d*x*a)*cos(a) becomes a");
    thousand("x^k under an integral", "rule r%d(a): integral from 0 to inf of x^%d*exp(-a*x)*cos(x) dx becomes a");
    thousand("numbers in a call", "rule r%d(a): J(%d, a)*K(1, a) becomes a");
    linear("each term by itself", "rule r(x): sin(x)^2 becomes (1 - cos(2*x))/2", "k*sin(k*y)^2");
    linear("terms in pairs", "rule r(a, b): log(a) + log(b) becomes log(a*b) when a != -1", "log(k + z)");
    linear("pairs that belong together", "rule r(x): sin(x)^2 + cos(x)^2 becomes 1", "sin(k*y)^2 + cos(k*y)^2");
    return 0;
}
