/* Shared by the tests of this room: an expression from its text. */
#ifndef TW_TESTS_NUMERIC_READING_H
#define TW_TESTS_NUMERIC_READING_H

#include <string.h>

#include "engine/expr/expr.h"
#include "lang/lower.h"
#include "lang/parse.h"

static inline expr *read_expr(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    lowering l;
    expr *made = NULL;
    source_init(&s, "test", words, strlen(words));
    syntax_text_init(&t);
    syntax *a = parse_expression_text(&s, &t);
    lowering_init(&l, e, NULL);
    if (a)
        made = lower_expression(&l, a);
    lowering_clear(&l);
    syntax_text_clear(&t);
    return made;
}

#endif
