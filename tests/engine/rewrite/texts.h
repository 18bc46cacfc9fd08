/* Texts for the tests of this room: expressions and rules as they are typed. */
#ifndef TW_TESTS_REWRITE_TEXTS_H
#define TW_TESTS_REWRITE_TEXTS_H

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "engine/rewrite/rule.h"
#include "lang/lower_rule.h"
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

/* A rule from its statement; NULL with the engine's error when it is none. */
static inline rule *text_rule(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    source_init(&s, "<test>", words, strlen(words));
    syntax_text_init(&t);
    parse_text(&s, &t);
    if (t.count != 1 || t.error_count != 0)
        fail_msg("cannot read `%s`: %s", words, t.error_count ? t.errors[0].words : "no statement");
    lowering l;
    lowering_init(&l, e, NULL);
    rule *r = lower_rule(&l, t.statements[0]);
    lowering_clear(&l);
    syntax_text_clear(&t);
    return r;
}

/* "given a > 0, ..." as facts. */
static inline void text_given(tw_engine *e, const char *words)
{
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

/* A number that changes with each call, from a state that a test prints. */
static inline uint64_t test_random(uint64_t *state)
{
    uint64_t z = *state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

#endif
