/* No proved bound is ever wrong: random integrals, random numbers of kept terms, random s, judged by certified quadrature. The
 * count is TW_TRIALS (default 150); a trial counts when the bound is proved and the judge's radius is below a tenth of it; at
 * least 95 of 100 must count. Built with -DTW_BOUND_FACTOR=0.3 for the engine the test turns red. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <math.h>
#include <cmocka.h>

#include "engine/numeric/evaluate.h"
#include "engine/numeric/problem.h"
#include "engine/method/method.h"
#include "tests/engine/numeric/random_integral.h"
#include "tests/engine/numeric/reading.h"

enum { BITS = 256 };

typedef struct tally {
    long trials, counted, unproved, unjudged, violated, all_s;
    double worst_one, worst_all; /* bound over truth, log2 */
    char which_one[600], which_all[600];
} tally;

static double log2_of(const arb_t x)
{
    mag_t m;
    double out;
    mag_init(m);
    arb_get_mag(m, x);
    out = mag_is_zero(m) ? -1e9 : mag_log2(m);
    mag_clear(m);
    return out;
}

static tw_status term_sum(tw_engine *e, arb_t sum, expansion *a, const env *at, slong terms)
{
    tw_status status = TW_OK;
    arb_zero(sum);
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++) {
        term *order = NULL;
        slong found = 0;
        if (!a->contributions[k].dominant)
            continue;
        status = expansion_order(e, a, k, terms, &order, &found);
        for (slong j = 0; j < found && status == TW_OK; j++) {
            acb_t z;
            expr *f = expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, order[j]));
            f = expr_substitute_all(e, f, at->symbols, at->values, at->count);
            acb_init(z);
            status = ball_value(e, z, f, BITS);
            arb_add(sum, sum, acb_realref(z), BITS);
            acb_clear(z);
        }
        free(order);
    }
    return status;
}

/* The truth integral - sum with a radius below 2^wanted, where that can be had. */
static bool truth_at(tw_engine *e, arb_t truth, expansion *a, const env *at, const arb_t sum, double wanted)
{
    acb_t value;
    bool good = false;
    slong digits = 16;
    acb_init(value);
    for (int pass = 0; pass < 5 && !good; pass++) {
        mag_t m;
        if (quadrature(e, value, a->integral, at, digits, true, NULL) != TW_OK) {
            engine_forgive(e);
            break;
        }
        arb_sub(truth, acb_realref(value), sum, 1000);
        mag_init(m);
        mag_set(m, arb_radref(truth));
        good = mag_is_zero(m) || mag_log2(m) < wanted;
        if (!good)
            digits += FLINT_MAX(8, (slong)((mag_log2(m) - wanted) * 0.302) + 2);
        mag_clear(m);
        if (digits > 400)
            break;
    }
    acb_clear(value);
    return good;
}

static void try_one_s(tw_engine *e, tally *t, expansion *a, const env *at, slong terms, const char *words)
{
    point_bound b;
    arb_t sum, truth;
    point_bound_init(&b);
    arb_init(sum);
    arb_init(truth);
    t->trials++;
    if (remainder_at(e, &b, a, at, terms, 128) != TW_OK) {
        printf("  no bound: %s\n    %s\n", words, e->error.words);
        engine_forgive(e);
        t->unproved++;
    } else if (b.label > LABEL_CONDITIONAL || b.label == LABEL_EXACT) {
        printf("  not proved (%s): %s\n", b.reason ? b.reason : "?", words);
        t->unproved++;
    } else if (term_sum(e, sum, a, at, terms) != TW_OK || !truth_at(e, truth, a, at, sum, log2_of(b.error) - 3.4)) {
        engine_forgive(e);
        t->unjudged++;
        printf("  not judged: %s\n", words);
    } else {
        double ratio = log2_of(b.error) - log2_of(truth);
        t->counted++;
        if (ratio > t->worst_one && !b.manner) {
            t->worst_one = ratio;
            char *there = expr_text(e, at->values[0]);
            snprintf(t->which_one, sizeof t->which_one, "%s, %ld terms, s = %s", words, (long)terms, there);
            free(there);
        }
        if (!arb_overlaps(truth, b.error)) {
            t->violated++;
            printf("VIOLATED at one s: %s, %ld terms, s = ", words, (long)terms);
            arb_printn(b.error, 10, 0);
            printf(" truth ");
            arb_printn(truth, 10, 0);
            printf("\n");
        }
    }
    arb_clear(truth);
    arb_clear(sum);
    point_bound_clear(&b);
}

/* The bound for all s, tried at from * factor. */
static double try_all_s(tw_engine *e, tally *t, expansion *a, const remainder_bound *r, expr *s, double factor, const char *words)
{
    expr *value = expr_mul(e, r->from ? r->from : expr_int(e, 7), expr_frac(e, (slong)(factor * 100), 100));
    env at = {1, &s, &value};
    acb_t bound;
    arb_t sum, truth;
    double ratio = HUGE_VAL;
    acb_init(bound);
    arb_init(sum);
    arb_init(truth);
    if (ball_value(e, bound, expr_substitute(e, r->bound, s, value), 128) == TW_OK &&
        term_sum(e, sum, a, &at, r->terms) == TW_OK &&
        truth_at(e, truth, a, &at, sum, log2_of(acb_realref(bound)) - 3.4)) {
        ratio = log2_of(acb_realref(bound)) - log2_of(truth);
        t->all_s++;
        if (ratio < 0) {
            arb_abs(truth, truth);
            if (arb_gt(truth, acb_realref(bound))) {
                t->violated++;
                char *bound_words = expr_text(e, r->bound), *there = expr_text(e, value);
                printf("VIOLATED for all s: %s, %ld terms, bound %s at %s: log2 ratio %g\n", words, (long)r->terms, bound_words,
                       there, ratio);
                free(bound_words);
                free(there);
            }
        }
    }
    engine_forgive(e);
    arb_clear(truth);
    arb_clear(sum);
    acb_clear(bound);
    return ratio;
}

static void try_remainder(tw_engine *e, tally *t, expansion *a, expr *s, slong terms, const char *words)
{
    static const env nowhere = {0};
    remainder_bound r;
    remainder_bound_init(&r);
    if (remainder_for_all(e, &r, a, &nowhere, terms, NULL) == TW_OK && r.label <= LABEL_CONDITIONAL && r.label != LABEL_EXACT) {
        /* quality at 1.25 times the least s: the least ratio for v in [0.8, 1.25] of it; R may have zeros */
        static const double parts[] = {1, 1.12, 1.25, 1.4, 1.56};
        double quality = HUGE_VAL;
        for (int k = 0; k < 5; k++)
            quality = fmin(quality, try_all_s(e, t, a, &r, s, parts[k], words));
        try_all_s(e, t, a, &r, s, 6, words);
        if (quality < HUGE_VAL && quality > t->worst_all && !r.manner) {
            t->worst_all = quality;
            snprintf(t->which_all, sizeof t->which_all, "%s, %ld terms", words, (long)r.terms);
        }
    } else {
        printf("  not proved for all s (%s): %s\n", r.reason ? r.reason : e->error.words ? e->error.words : "exact", words);
    }
    engine_forgive(e);
    remainder_bound_clear(&r);
}

/* One random integral; false when it has no expansion by these methods. */
static bool trial(dice *d, tally *t)
{
    char words[500];
    tw_engine *e = tw_engine_new();
    expr *s = expr_symbol(e, "s"), *integral, *value;
    expansion a;
    slong terms = dice_between(d, 1, 8);
    bool made;
    random_integral(d, words, sizeof words);
    value = expr_int(e, dice_between(d, 3, 60));
    facts_set_large(e, s, LARGE_POSITIVE, NULL, NULL);
    budget_start(e, 60);
    integral = read_expr(e, words);
    assert_non_null(integral);
    expansion_init(&a);
    made = expand(e, &a, integral, terms, NULL) == TW_OK && !a.exact;
    if (made) {
        env at = {1, &s, &value};
        try_one_s(e, t, &a, &at, terms, words);
        if (t->trials % 4 == 0)
            try_remainder(e, t, &a, s, terms, words);
    }
    expansion_clear(&a);
    tw_engine_free(e);
    return made;
}

static void bounds_hold(void **state)
{
    const char *count = getenv("TW_TRIALS");
    long wanted = count ? atol(count) : 150;
    dice d = {dice_seed("test_violation")};
    tally t = {0};
    (void)state;
    for (long k = 0; t.trials < wanted && k < 5 * wanted; k++)
        trial(&d, &t);
    printf("%ld trials: %ld counted, %ld not proved, %ld not judged, %ld checks for all s, %ld violated; worst bound/truth %.3g "
           "at one s, quality %.3g for all s\n", t.trials, t.counted, t.unproved, t.unjudged, t.all_s, t.violated, exp2(t.worst_one),
           exp2(t.worst_all));
    printf("worst at one s: %s\nworst for all s: %s\n", t.which_one, t.which_all);
    assert_int_equal(t.violated, 0);
    assert_true(t.trials >= wanted);
    assert_true(100 * t.counted >= 95 * t.trials);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(bounds_hold)};
    return cmocka_run_group_tests_name("test_violation", tests, NULL, NULL);
}
