/* Medians of the CPU time for 8, 100 and 1000 coefficients of q's series, for the four classes of integrands that the
 * goals name. Prints one line a function: median milliseconds at each length, and the growth from 100 to 1000 as a
 * power of N. Seed-free. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#include "../engine/exact/texts.h"

enum { RUNS = 7 };

static const char *const functions[][2] = {
    {"x-rational", "1/(2 + 3*x + x^2)"},       {"x-rational", "(1 + x)^2/(1 - x + 3*x^3)"},
    {"algebraic", "1/sqrt(1 + x^2)"},          {"algebraic", "(1 + x)^(1/3)/(1 + x^2)"},
    {"logarithm", "log(1 + 2*x)"},             {"logarithm", "log(x)/(1 + x)"},
    {"fractional powers", "sqrt(x)/(1 + x^(1/3))"}, {"fractional powers", "x^(-1/2)/(1 + x)^(5/2)"},
};

static double now_ms(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec * 1e3 + (double)t.tv_nsec / 1e6;
}

static int compare(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

static double median_ms(const char *words, slong length)
{
    double times[RUNS];
    for (int k = 0; k < RUNS; k++) {
        tw_engine *e = tw_engine_new();
        expr *f = read_expr(e, words), *x = expr_symbol(e, "x");
        series s;
        series_init(&s);
        double start = now_ms();
        if (series_at_zero(e, &s, f, x, length, NULL, NULL) != TW_OK) {
            fprintf(stderr, "%s: %s\n", words, e->error.words);
            exit(1);
        }
        times[k] = now_ms() - start;
        series_clear(&s);
        tw_engine_free(e);
    }
    qsort(times, RUNS, sizeof *times, compare);
    return times[RUNS / 2];
}

int main(void)
{
    printf("%-18s %-26s %10s %10s %10s %8s\n", "class", "q", "8 [ms]", "100 [ms]", "1000 [ms]", "growth");
    for (size_t k = 0; k < sizeof functions / sizeof *functions; k++) {
        double few = median_ms(functions[k][1], 8), some = median_ms(functions[k][1], 100),
               many = median_ms(functions[k][1], 1000);
        printf("%-18s %-26s %10.3f %10.3f %10.3f %8.2f\n", functions[k][0], functions[k][1], few, some, many,
               log10(many / some));
    }
    return 0;
}
