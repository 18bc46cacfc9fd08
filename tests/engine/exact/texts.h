/* For the tests of the series: expressions read from the language's text, a series as text, partial sums as balls. */
#ifndef TW_TESTS_EXACT_TEXTS_H
#define TW_TESTS_EXACT_TEXTS_H

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/ball/tape.h"
#include "engine/exact/series.h"
#include "lang/lower.h"
#include "lang/parse.h"

static inline expr *read_expr(tw_engine *e, const char *words)
{
    source s;
    syntax_text out;
    lowering l;
    source_init(&s, "test", words, strlen(words));
    syntax_text_init(&out);
    syntax *tree = parse_expression_text(&s, &out);
    if (tree == NULL)
        fail_msg("cannot be read: %s", words);
    lowering_init(&l, e, NULL);
    expr *f = lower_expression(&l, tree);
    lowering_clear(&l);
    syntax_text_clear(&out);
    if (f == NULL)
        fail_msg("%s: %s", words, e->error.words);
    return f;
}

static inline void give(tw_engine *e, expr_relation r, const char *left, const char *right)
{
    assert_int_equal(facts_add(e, expr_relation_of(e, r, read_expr(e, left), read_expr(e, right)), CONDITION_GIVEN),
                     TW_OK);
}

static inline void text_expr(tw_engine *e, text *out, expr *a)
{
    char *words = expr_text(e, a);
    text_add(out, words);
    free(words);
}

/* "constant x^(exponent) [log^k] /den: c0, c1, ..." for each strand, separated by "; ", with "." at the end when
 * it terminates. */
static inline char *series_text(tw_engine *e, const series *s)
{
    text out;
    text_init(&out);
    for (size_t k = 0; k < s->count; k++) {
        const strand *d = s->strands + k;
        if (k > 0)
            text_add(&out, "; ");
        text_expr(e, &out, d->constant);
        text_add(&out, " x^(");
        text_expr(e, &out, d->exponent);
        text_add_char(&out, ')');
        if (d->log_power > 0)
            text_addf(&out, " log^%ld", (long)d->log_power);
        text_addf(&out, " /%ld:", (long)d->den);
        for (slong n = 0; n < d->c.count; n++) {
            text_add(&out, n > 0 ? ", " : " ");
            text_expr(e, &out, coefficient_expr(e, &d->c, n));
        }
    }
    if (s->terminates)
        text_add(&out, ".");
    return text_take(&out);
}

/* value = a with the parameters put in. */
static inline void value_at(tw_engine *e, acb_t value, expr *a, const env *at, slong prec)
{
    expr *closed = at == NULL ? a : expr_substitute_all(e, a, at->symbols, at->values, at->count);
    if (closed == NULL || ball_value(e, value, closed, prec) != TW_OK)
        fail_msg("no value: %s", e->error.words);
}

/* sum = the series at x, and in *next (upwards, as a double exponent of 2) the size of the first omitted terms. */
static inline void partial_sum_ball(tw_engine *e, acb_t sum, arf_t next, const series *s, const acb_t x, const env *at,
                                    slong prec)
{
    acb_t front, term, power, c, lx, inner;
    acb_init(front), acb_init(term), acb_init(power), acb_init(c), acb_init(lx), acb_init(inner);
    acb_zero(sum);
    arf_zero(next);
    acb_log(lx, x, prec);
    for (size_t k = 0; k < s->count; k++) {
        const strand *d = s->strands + k;
        acb_t step;
        arf_t size, largest;
        acb_init(step), arf_init(size), arf_init(largest);
        value_at(e, front, d->constant, at, prec);
        value_at(e, power, d->exponent, at, prec);
        acb_mul(power, power, lx, prec);
        acb_exp(power, power, prec);
        acb_mul(front, front, power, prec);
        acb_pow_ui(term, lx, (ulong)d->log_power, prec);
        acb_mul(front, front, term, prec);
        acb_div_si(step, lx, d->den, prec);
        acb_exp(step, step, prec);
        acb_one(power);
        acb_zero(inner);
        for (slong n = 0; n < d->c.count; n++) {
            value_at(e, c, coefficient_expr(e, &d->c, n), at, prec);
            acb_get_abs_ubound_arf(size, c, 64);
            if (n > 0) { /* the growth of the coefficients goes on */
                arf_mul_ui(size, size, 8, 64, ARF_RND_UP);
            }
            if (arf_cmp(size, largest) > 0)
                arf_set(largest, size);
            acb_addmul(inner, c, power, prec);
            acb_mul(power, power, step, prec);
        }
        acb_addmul(sum, front, inner, prec);
        acb_mul(term, front, power, prec);
        acb_get_abs_ubound_arf(size, term, 64);
        arf_add_ui(largest, largest, 1, 64, ARF_RND_UP);
        arf_mul(largest, largest, largest, 64,
                ARF_RND_UP); /* generous: coefficients may grow like a power of the last ones */
        arf_mul(size, size, largest, 64, ARF_RND_UP);
        arf_mul_2exp_si(size, size, 12);
        arf_add(next, next, size, 64, ARF_RND_UP);
        acb_clear(step), arf_clear(size), arf_clear(largest);
    }
    if (s->terminates)
        arf_zero(next);
    acb_clear(front), acb_clear(term), acb_clear(power), acb_clear(c), acb_clear(lx), acb_clear(inner);
}

static inline void partial_sum(tw_engine *e, acb_t sum, arf_t next, const series *s, const fmpq_t x, const env *at,
                               slong prec)
{
    acb_t ball;
    acb_init(ball);
    acb_set_fmpq(ball, x, prec);
    partial_sum_ball(e, sum, next, s, ball, at, prec);
    acb_clear(ball);
}

/* Does |value - sum| stay below the first omitted terms' size? */
static inline bool agrees(const acb_t value, const acb_t sum, const arf_t next, slong prec)
{
    acb_t gap;
    arf_t size;
    acb_init(gap), arf_init(size);
    acb_sub(gap, value, sum, prec);
    acb_get_abs_lbound_arf(size, gap, 64);
    bool ok = acb_is_finite(gap) && arf_cmp(size, next) <= 0;
    acb_clear(gap), arf_clear(size);
    return ok;
}

#endif
