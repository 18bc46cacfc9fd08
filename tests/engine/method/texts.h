/* Texts for the tests of this room: parse an expression in the language, declare facts, expand, evaluate the terms of
 * an expansion at a point in high precision. Independent of engine/numeric. */
#ifndef TW_TESTS_METHOD_TEXTS_H
#define TW_TESTS_METHOD_TEXTS_H

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/ball/tape.h"
#include "engine/method/method.h"
#include "lang/lower.h"
#include "lang/parse.h"

static inline expr *text_parse(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    source_init(&s, "<test>", words, strlen(words));
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
    if (!made) fail_msg("cannot read `%s`: %s", words, e->error.words ? e->error.words : "syntax");
    return made;
}

/* What stands after `given`, such as "a > 0, 0 < p < 1", as facts. */
static inline void text_given(tw_engine *e, const char *conditions)
{
    char words[256] = "given ";
    strncat(words, conditions, sizeof words - 8);
    source s;
    syntax_text t;
    source_init(&s, "<test>", words, strlen(words));
    syntax_text_init(&t);
    parse_text(&s, &t);
    if (t.count != 1) fail_msg("cannot read `%s`", words);
    lowering l;
    lowering_init(&l, e, NULL);
    lower_conditions list;
    lower_conditions_init(&list);
    for (size_t k = 0; k < t.statements[0]->as.given.count; k++)
        assert_int_equal(lower_condition(&l, t.statements[0]->as.given.list[k], &list), TW_OK);
    for (size_t k = 0; k < list.count; k++) assert_int_equal(facts_add(e, list.list[k], CONDITION_GIVEN), TW_OK);
    lower_conditions_clear(&list);
    lowering_clear(&l);
    syntax_text_clear(&t);
}

static inline tw_engine *text_engine(const char *large, large_kind kind)
{
    tw_engine *e = tw_engine_new();
    assert_non_null(e);
    if (large) assert_int_equal(facts_set_large(e, expr_symbol(e, large), kind, NULL, NULL), TW_OK);
    return e;
}

/* value of a (closed after substitution) as a ball. */
static inline void text_value(tw_engine *e, acb_t out, expr *a, expr *const *symbols, expr *const *values, size_t n,
                              slong bits)
{
    expr *closed = expr_substitute_all(e, a, symbols, values, n);
    assert_non_null(closed);
    if (ball_value(e, out, closed, bits) != TW_OK) fail_msg("no value: %s", e->error.words);
}

static inline void assert_text(tw_engine *e, expr *a, const char *words)
{
    if (!a) fail_msg("no expression where `%s` was expected: %s", words, e->error.words ? e->error.words : "");
    char *made = expr_text(e, a);
    assert_string_equal(made, words);
    free(made);
}

/* a and the expression `words` are the same number at the sample values of their symbols, to 60 digits. */
static inline void assert_same_value(tw_engine *e, expr *a, const char *words)
{
    expr *d = expr_sub(e, a, text_parse(e, words));
    assert_non_null(d);
    expr **symbols;
    size_t n = expr_symbols(d, &symbols);
    expr **values = malloc((n + 1) * sizeof *values);
    for (size_t k = 0; k < n; k++) values[k] = expr_frac(e, 7 + (slong)k, 5 + 2 * (slong)k);
    acb_t v;
    acb_init(v);
    text_value(e, v, d, symbols, values, n, 400);
    arf_t up;
    arf_init(up);
    acb_get_abs_ubound_arf(up, v, 30);
    if (arf_cmp_2exp_si(up, -200) > 0) {
        char *left = expr_text(e, a);
        fail_msg("`%s` is not `%s`", left, words);
    }
    arf_clear(up);
    acb_clear(v);
    free(symbols);
    free(values);
}

/* prefactor * (the first `terms` terms of contribution k in order of size). */
static inline expr *text_sum(tw_engine *e, expansion *a, size_t k, slong terms)
{
    term *list;
    slong found;
    if (expansion_order(e, a, k, terms, &list, &found) != TW_OK) fail_msg("no order: %s", e->error.words);
    expr *sum = expr_int(e, 0);
    for (slong n = 0; n < found; n++) sum = expr_add(e, sum, expansion_term(e, a, k, list[n]));
    free(list);
    return expr_mul(e, a->contributions[k].prefactor, sum);
}

/* A case of a table: what is declared, the integral, and what its expansion must be. */
typedef struct text_case {
    const char *large, *given, *integral;
    slong terms;
    const char *by;     /* or NULL */
    const char *sum;    /* prefactor*terms of the first contribution */
    const char *second; /* of the second one, or NULL when there is no second */
    const char *source;
} text_case;

static inline void text_check(const text_case *t)
{
    bool small = strncmp(t->large, "small ", 6) == 0;
    tw_engine *e = text_engine(small ? t->large + 6 : t->large, small ? LARGE_SMALL : LARGE_POSITIVE);
    if (t->given) text_given(e, t->given);
    expansion a;
    expansion_init(&a);
    if (expand(e, &a, text_parse(e, t->integral), t->terms, t->by) != TW_OK)
        fail_msg("%s: %s", t->integral, e->error.words);
    assert_true(a.contribution_count == (t->second ? 2u : 1u));
    assert_same_value(e, text_sum(e, &a, 0, t->terms), t->sum);
    if (t->second) assert_same_value(e, text_sum(e, &a, 1, t->terms), t->second);
    for (size_t k = 0; k < a.derivation.count; k++)
        assert_true(a.derivation.steps[k].after || a.derivation.steps[k].form || a.derivation.steps[k].detail);
    expansion_clear(&a);
    tw_engine_free(e);
}

/* The integral cannot be expanded, for a reason of this kind whose words hold `part`. */
static inline void text_refused(const char *large, const char *given, const char *integral, const char *by,
                                error_kind kind, const char *part)
{
    bool small = strncmp(large, "small ", 6) == 0;
    tw_engine *e = text_engine(small ? large + 6 : large, small ? LARGE_SMALL : LARGE_POSITIVE);
    if (given) text_given(e, given);
    expansion a;
    expansion_init(&a);
    if (expand(e, &a, text_parse(e, integral), 4, by) == TW_OK) fail_msg("%s was expanded", integral);
    if (e->error.kind != kind) fail_msg("%s: kind %s: %s", integral, error_kind_word(e->error.kind), e->error.words);
    if (!strstr(e->error.words, part)) fail_msg("%s: `%s` is not in: %s", integral, part, e->error.words);
    expansion_clear(&a);
    tw_engine_free(e);
}

#endif
