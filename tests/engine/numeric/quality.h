/* Quality of the proved bounds as a user meets them: `evaluate` at one s (bound over truth), and `remainder` for all s >= s0 with as
 * many terms as `evaluate` keeps there: the least of bound(v)/|R(v)| for v in [0.8 s0, 1.25 s0], where the bound is read as the
 * formula it is, because R may have zeros (methods.md, section 9). Shared by test_quality and bench_quality. */
#ifndef TW_TESTS_NUMERIC_QUALITY_H
#define TW_TESTS_NUMERIC_QUALITY_H

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/method/method.h"
#include "engine/numeric/evaluate.h"
#include "engine/numeric/problem.h"
#include "tests/engine/numeric/random_integral.h"
#include "tests/engine/numeric/reading.h"

typedef struct quality {
    bool expanded, proved_one, proved_all, judged;
    bool wrong;               /* a proved bound was violated */
    double one, all;          /* ratios; 0 where there is none */
    double one_ms, all_ms;
    slong terms;
    const char *manner;
    char reason[160];
} quality;

enum { QUALITY_BITS = 400 };

static inline double quality_log2(const arb_t x)
{
    mag_t m;
    double out;
    mag_init(m);
    arb_get_mag(m, x);
    out = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
    mag_clear(m);
    return out;
}

static inline double quality_ms(void)
{
    return (double)clock() * 1000 / CLOCKS_PER_SEC;
}

static inline bool quality_value(tw_engine *e, arb_t out, expr *f, const env *at)
{
    acb_t z;
    bool fine;
    acb_init(z);
    f = f ? expr_substitute_all(e, f, at->symbols, at->values, at->count) : NULL;
    fine = f && ball_value(e, z, f, QUALITY_BITS) == TW_OK && acb_is_finite(z);
    arb_set(out, acb_realref(z));
    acb_clear(z);
    return fine;
}

static inline bool quality_sum(tw_engine *e, arb_t sum, expansion *a, const env *at, slong terms)
{
    bool fine = true;
    arb_t one;
    arb_init(one);
    arb_zero(sum);
    for (size_t k = 0; k < a->contribution_count && fine; k++) {
        term *order = NULL;
        slong found = 0;
        if (!a->contributions[k].dominant)
            continue;
        fine = expansion_order(e, a, k, terms, &order, &found) == TW_OK;
        for (slong j = 0; j < found && fine; j++) {
            fine = quality_value(e, one, expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, order[j])), at);
            arb_add(sum, sum, one, QUALITY_BITS);
        }
        free(order);
    }
    arb_clear(one);
    return fine;
}

/* integral - sum, to 14 bits of itself or with a radius below 2^enough. */
static inline bool quality_truth(tw_engine *e, arb_t truth, expansion *a, const env *at, slong terms, double enough)
{
    acb_t value;
    arb_t sum;
    bool fine = false;
    acb_init(value);
    arb_init(sum);
    if (quality_sum(e, sum, a, at, terms))
        for (slong digits = 20; digits < 110 && !fine; digits = digits * 3 / 2) {
            if (quadrature(e, value, a->integral, at, digits, true, NULL) != TW_OK)
                break;
            arb_sub(truth, acb_realref(value), sum, 2 * QUALITY_BITS);
            mag_t radius;
            mag_init_set(radius, arb_radref(truth));
            fine = arb_rel_accuracy_bits(truth) > 14 || mag_is_zero(radius) || mag_log2(radius) < enough;
            mag_clear(radius);
        }
    engine_forgive(e);
    arb_clear(sum);
    acb_clear(value);
    return fine;
}

static inline void quality_one(tw_engine *e, quality *q, expansion *a, const env *at)
{
    number n;
    evaluate_options o = {0, -1, false};
    arb_t sum, truth;
    double start = quality_ms();
    number_init(&n);
    arb_init(sum);
    arb_init(truth);
    if (evaluate_expansion(e, &n, a, at, &o) == TW_OK) {
        q->one_ms = quality_ms() - start;
        q->terms = n.terms;
        q->manner = n.manner;
        q->proved_one = n.label == LABEL_PROVED || n.label == LABEL_CONDITIONAL;
        if (n.reason)
            snprintf(q->reason, sizeof q->reason, "%s", n.reason);
    } else {
        snprintf(q->reason, sizeof q->reason, "%s", e->error.words ? e->error.words : "?");
        engine_forgive(e);
    }
    if (q->proved_one && quality_sum(e, sum, a, at, n.terms)) {
        arb_sub(sum, acb_realref(n.value), sum, QUALITY_BITS); /* what the bound leaves for the remainder */
        q->judged = quality_truth(e, truth, a, at, n.terms, quality_log2(sum) - 8);
        if (q->judged) {
            q->wrong = !arb_overlaps(truth, sum);
            q->one = exp2(quality_log2(sum) - quality_log2(truth));
        }
    }
    arb_clear(truth);
    arb_clear(sum);
    number_clear(&n);
}

static inline void quality_all(tw_engine *e, quality *q, expansion *a, const env *at)
{
    static const int parts[] = {100, 125, 116, 108, 95, 88, 80};
    remainder_bound r;
    env there = *at;
    expr *values[8];
    arb_t bound, truth;
    double start = quality_ms(), least = HUGE_VAL;
    remainder_bound_init(&r);
    arb_init(bound);
    arb_init(truth);
    for (size_t k = 0; k < at->count; k++)
        values[k] = at->values[k];
    there.values = values;
    if (remainder_for_all(e, &r, a, at, q->terms, at->values[0]) == TW_OK) {
        q->all_ms = quality_ms() - start;
        q->proved_all = (r.label == LABEL_PROVED || r.label == LABEL_CONDITIONAL) && r.bound;
        if (r.reason)
            snprintf(q->reason, sizeof q->reason, "%s", r.reason);
    } else {
        snprintf(q->reason, sizeof q->reason, "%s", e->error.words ? e->error.words : "?");
        engine_forgive(e);
    }
    for (int k = 0; k < 7 && q->proved_all; k++) {
        values[0] = expr_mul(e, at->values[0], expr_frac(e, parts[k], 100));
        if (!quality_value(e, bound, r.bound, &there) ||
            !quality_truth(e, truth, a, &there, q->terms, quality_log2(bound) - 8))
            continue;
        least = fmin(least, quality_log2(bound) - quality_log2(truth));
        arb_abs(truth, truth);
        q->wrong = q->wrong || (parts[k] >= 100 && arb_gt(truth, bound));
    }
    q->all = least < HUGE_VAL ? exp2(least) : 0;
    arb_clear(truth);
    arb_clear(bound);
    remainder_bound_clear(&r);
}

/* words: the integral, large parameter s; asked: terms; parameters by name and value: name, value, ..., NULL. */
static inline quality quality_run(const char *words, slong asked, slong s_value, const char *parameter, const char *parameter_value,
                                  bool all)
{
    tw_engine *e = tw_engine_new();
    quality q = {0};
    expr *symbols[2] = {expr_symbol(e, "s"), parameter ? expr_symbol(e, parameter) : NULL};
    expr *values[2] = {expr_int(e, s_value), parameter ? read_expr(e, parameter_value) : NULL};
    env at = {parameter ? 2 : 1, symbols, values};
    expr *integral;
    expansion a;
    budget_start(e, 60);
    facts_set_large(e, symbols[0], LARGE_POSITIVE, NULL, NULL);
    if (parameter)
        facts_add(e, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), symbols[1]), CONDITION_GIVEN);
    integral = read_expr(e, words);
    expansion_init(&a);
    q.expanded = integral && expand(e, &a, integral, asked, NULL) == TW_OK && !a.exact;
    if (!q.expanded)
        snprintf(q.reason, sizeof q.reason, "%s", e->error.words ? e->error.words : "terminates");
    engine_forgive(e);
    if (q.expanded)
        quality_one(e, &q, &a, &at);
    if (q.expanded && q.proved_one && all)
        quality_all(e, &q, &a, &at);
    expansion_clear(&a);
    tw_engine_free(e);
    return q;
}

static inline void quality_print(const char *words, slong s, const quality *q)
{
    printf("%-60s s=%-3ld terms %-3ld one s %.4f%s  all s %.3f  %.1f + %.1f ms%s%s %s\n", words, (long)s, (long)q->terms, q->one,
           q->manner ? " (enclosing)" : "", q->all, q->one_ms, q->all_ms, q->judged ? "" : " not judged", q->wrong ? "  WRONG" : "", q->reason);
}

#endif
