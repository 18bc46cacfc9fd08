/* The table of tightness: bound over truth at one s, and for all s >= s0 the quality of methods.md, section 9: the bound over
 * the greatest (v/s)^alpha |R(v)| for v in [0.8 s, 1.25 s]. Shared by test_panels and bench_remainder. */
#ifndef TW_TESTS_NUMERIC_TABLE_H
#define TW_TESTS_NUMERIC_TABLE_H

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/method/method.h"
#include "engine/numeric/panels.h"
#include "tests/engine/numeric/reading.h"

typedef struct table_row {
    const char *name, *integral;
    slong s, first; /* groups of powers x^n, n < first, are kept */
} table_row;

/* W1 to W4 at several s, near the least term and with three terms, and cases with a fractional power, a finite end, a logarithm, another kernel, a general phase. */
static const table_row table_rows[] = {
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 5, 4},
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 5, 6},
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 20, 20},
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 20, 6},
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 100, 100},
    {"W1", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", 100, 6},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 5, 4},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 5, 3},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 20, 19},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 20, 3},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 100, 100},
    {"W2", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", 100, 3},
    {"W3", "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx", 5, 0},
    {"W3", "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx", 20, 0},
    {"W3", "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx", 100, 5},
    {"W3", "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx", 100, 3},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 5, 6},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 5, 3},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 20, 21},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 20, 3},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 100, 101},
    {"W4", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", 100, 3},
    {"third root", "integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1+x) dx", 10, 6},
    {"end", "integral from 0 to 2 of exp(-s*x)/(1+x)^2 dx", 10, 6},
    {"logarithm", "integral from 0 to inf of exp(-s*x)*log(x)/(1+x) dx", 10, 6},
    {"cubic", "integral from 0 to inf of exp(-s*x^3)*exp(-x) dx", 20, 3},
    {"phase", "integral from 0 to inf of exp(-s*(x+x^2))/(1+x) dx", 20, 5},
    {"sinh", "integral from 0 to 1 of exp(-s*sinh(x))/(1+x) dx", 20, 6},
    {"removable", "integral from 0 to inf of exp(-s*x)*x/(exp(x)-1) dx", 20, 6},
    {"square root", "integral from 0 to inf of exp(-s*x)*sqrt(x+x^2) dx", 20, 6},
};
enum { TABLE_ROWS = sizeof table_rows / sizeof *table_rows };

typedef struct table_result {
    bool made;
    double one_s, quality, all_s, one_ms, all_ms; /* ratios; CPU time */
    bool holds;                                   /* the truth is in the interval, and below the bound at every v tried */
    panel_report report;
} table_result;

static inline double table_cpu_ms(void)
{
    return (double)clock() * 1000 / CLOCKS_PER_SEC;
}

static inline double table_log2(const arb_t x)
{
    mag_t m;
    double out;
    mag_init(m);
    arb_get_mag(m, x);
    out = mag_is_zero(m) ? -1e9 : mag_log2(m);
    mag_clear(m);
    return out;
}

/* The truth at S by quadrature, accurate to 2^-14 of itself. */
static inline bool table_truth(tw_engine *e, arb_t truth, problem *p, slong first, expr *integral, expr *s, expr *value)
{
    env at = {1, &s, &value};
    acb_t z;
    arb_t S, kept;
    bool fine = false;
    acb_init(z);
    arb_init(S);
    arb_init(kept);
    ball_value(e, z, value, 1200);
    arb_set(S, acb_realref(z));
    if (panels_kept_sum(p, first, S, kept, 900) == TW_OK)
        for (slong digits = 20; digits < 260 && !fine; digits = digits * 3 / 2) {
            if (quadrature(e, z, integral, &at, digits, true, NULL) != TW_OK)
                break;
            arb_sub(truth, acb_realref(z), kept, 1000);
            fine = arb_rel_accuracy_bits(truth) > 14;
        }
    arb_clear(kept);
    arb_clear(S);
    acb_clear(z);
    return fine;
}

/* false: the expansion could not be made. */
static inline bool table_run(const table_row *row, table_result *out)
{
    static const double parts[] = {0.8, 0.88, 0.95, 1, 1.08, 1.16, 1.25};
    static const double beyond[] = {1, 1.1, 1.5, 4, 30};
    tw_engine *e = tw_engine_new();
    expr *s = expr_symbol(e, "s"), *value = expr_int(e, row->s), *integral;
    expansion a;
    env at = {1, &s, &value};
    problem *p = NULL;
    char *reason = NULL;
    bool fine;
    memset(out, 0, sizeof *out);
    budget_start(e, 120);
    facts_set_large(e, s, LARGE_POSITIVE, NULL, NULL);
    integral = read_expr(e, row->integral);
    expansion_init(&a);
    fine = integral && expand(e, &a, integral, 3, NULL) == TW_OK &&
           problem_new(e, &p, &a.contributions[0].local, s, &at, &reason) == TW_OK && p;
    if (fine) {
        power_bound b;
        arb_t S, error, truth, bound;
        double start = table_cpu_ms(), most = -HUGE_VAL;
        power_bound_init(&b);
        arb_init(S);
        arb_init(error);
        arb_init(truth);
        arb_init(bound);
        arb_set_si(S, row->s);
        fine = panels_at(p, row->first, value, S, 0.008, error, &out->made, &out->report) == TW_OK && out->made;
        out->one_ms = table_cpu_ms() - start;
        start = table_cpu_ms();
        fine = fine && panels_for_all(p, row->first, value, S, &b, &out->made, &out->report) == TW_OK && out->made;
        out->all_ms = table_cpu_ms() - start;
        fine = fine && table_truth(e, truth, p, row->first, integral, s, value);
        if (fine) {
            double alpha = arf_get_d(arb_midref(b.alpha), ARF_RND_NEAR);
            out->holds = arb_overlaps(truth, error);
            out->one_s = exp2(table_log2(error) - table_log2(truth));
            power_bound_value(bound, &b, S, 128);
            out->all_s = exp2(table_log2(bound) - table_log2(truth));
            for (size_t k = 0; k < sizeof parts / sizeof *parts; k++)
                if (table_truth(e, truth, p, row->first, integral, s,
                                expr_mul(e, value, expr_frac(e, (slong)(100 * parts[k] + 0.5), 100))))
                    most = fmax(most, table_log2(truth) + alpha * log2(parts[k]));
            out->quality = exp2(table_log2(bound) - most);
            for (size_t k = 0; k < sizeof beyond / sizeof *beyond; k++) {
                expr *there = expr_mul(e, value, expr_frac(e, (slong)(100 * beyond[k] + 0.5), 100));
                if (!table_truth(e, truth, p, row->first, integral, s, there))
                    continue;
                arb_set_fmpq(S, expr_number(there), 200);
                power_bound_value(bound, &b, S, 128);
                arb_abs(truth, truth);
                out->holds = out->holds && !arb_gt(truth, bound);
            }
        }
        arb_clear(bound);
        arb_clear(truth);
        arb_clear(error);
        arb_clear(S);
        power_bound_clear(&b);
    }
    free(reason);
    problem_free(p);
    expansion_clear(&a);
    tw_engine_free(e);
    return fine;
}

static inline void table_print(const table_row *row, const table_result *r)
{
    printf("%-12s s=%-4ld first=%-4ld one s %.3f  all s %.3f  quality %.3f  panels %ld discs %ld bits %ld rho %.3g  %.1f + %.1f ms%s\n",
           row->name, (long)row->s, (long)row->first, r->one_s, r->all_s, r->quality, (long)r->report.panels,
           (long)r->report.discs, (long)r->report.bits, r->report.rho, r->one_ms, r->all_ms, r->holds ? "" : "  WRONG");
}

#endif
