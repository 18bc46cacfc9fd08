/* Milliseconds of CPU time of certified quadrature on the table of tests/engine/ball/quadrature_cases.h: medians of repeated runs
 * in one process (nodes of the quadrature rules are kept from the first on), with the first run beside them. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/ball/quadrature.h"
#include "lang/lower.h"
#include "lang/parse.h"
#include "tests/engine/ball/quadrature_cases.h"

enum { RUNS = 9 };

static expr *read_expr(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    source_init(&s, "<bench>", words, strlen(words));
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
    return made;
}

static double now_ms(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return 1e3 * (double)t.tv_sec + 1e-6 * (double)t.tv_nsec;
}

static int by_size(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static void measure(tw_engine *e, const char *words, const char *parameter, slong digits)
{
    expr *f = read_expr(e, words), *s = expr_symbol(e, "s"), *v = read_expr(e, parameter);
    env at = {1, &s, &v};
    double times[RUNS];
    quadrature_report report = {0, 0};
    for (int k = 0; k < RUNS; k++) {
        acb_t value;
        acb_init(value);
        double start = now_ms();
        tw_status status = quadrature(e, value, f, &at, digits, false, &report);
        times[k] = now_ms() - start;
        acb_clear(value);
        if (status != TW_OK) {
            printf("  %ld: %s", (long)digits, e->error.words);
            engine_forgive(e);
            return;
        }
    }
    double first = times[0];
    qsort(times, RUNS, sizeof *times, by_size);
    printf("  %ld: %.1f ms (first %.1f, %ld values)", (long)digits, times[RUNS / 2], first, (long)report.evaluations);
}

int main(void)
{
    static const slong digits[] = {16, 50, 200};
    tw_engine *e = tw_engine_new();
    for (size_t k = 0; k < QUADRATURE_INTEGRALS; k++)
        for (size_t j = 0; j < QUADRATURE_PARAMETERS; j++) {
            printf("%s, s = %s\n ", quadrature_integrals[k], quadrature_parameters[j]);
            for (size_t d = 0; d < 3; d++)
                measure(e, quadrature_integrals[k], quadrature_parameters[j], digits[d]);
            printf("\n");
        }
    tw_engine_free(e);
    return 0;
}
