/* Fuzzes matching: the input is a text of two lines, the head of a rule and an expression. Whatever matches must be an instance
 * (the matcher verifies that itself), the replacement must build or say why not, and nothing may crash, leak or outlast its
 * budget. */
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "engine/rewrite/pass.h"
#include "lang/lower_rule.h"
#include "lang/parse.h"

static bool next_match(void *host, const match *m)
{
    size_t *left = host;
    (void)m;
    return --*left == 0;
}

static rule *read_rule(tw_engine *e, const char *words, size_t length, syntax_text *t)
{
    source s;
    source_init(&s, "<fuzz>", words, length);
    parse_text(&s, t);
    for (size_t k = 0; k < t->count; k++) {
        if (t->statements[k]->kind != STATEMENT_RULE) continue;
        lowering l;
        lowering_init(&l, e, NULL);
        rule *r = lower_rule(&l, t->statements[k]);
        lowering_clear(&l);
        engine_forgive(e);
        return r;
    }
    return NULL;
}

static expr *read_expr(tw_engine *e, const char *words, size_t length, syntax_text *t)
{
    source s;
    source_init(&s, "<fuzz>", words, length);
    syntax *x = parse_expression_text(&s, t);
    if (!x) return NULL;
    lowering l;
    lowering_init(&l, e, NULL);
    expr *a = lower_expression(&l, x);
    lowering_clear(&l);
    engine_forgive(e);
    return a;
}

typedef struct job {
    tw_engine *e;
    const char *words, *line;
    size_t length;
} job;

static tw_status run(void *host)
{
    job *j = host;
    syntax_text head, body;
    syntax_text_init(&head);
    syntax_text_init(&body);
    rule *r = read_rule(j->e, j->words, (size_t)(j->line - j->words), &head);
    expr *a = r ? read_expr(j->e, j->line + 1, j->length - (size_t)(j->line - j->words) - 1, &body) : NULL;
    if (a) {
        size_t left = 1000;
        pattern_match(j->e, r->pattern, a, true, next_match, &left, NULL);
        engine_forgive(j->e);
        pass *inner = pass_of_rule(r), *p = pass_join(STRATEGY_EVERYWHERE, &inner, 1);
        rewriting w;
        rewriting_init(&w);
        pass_run(j->e, p, a, &w);
        rewriting_clear(&w);
        pass_release(p);
        text words;
        text_init(&words);
        engine_forgive(j->e);
        rule_why_not(j->e, r, a, &words);
        text_clear(&words);
    }
    rule_release(r);
    syntax_text_clear(&head);
    syntax_text_clear(&body);
    return TW_OK;
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    if (size > 2000 || memchr(data, 0, size)) return 0;
    char *words = malloc(size + 1);
    if (!words) return 0;
    memcpy(words, data, size);
    words[size] = 0;
    char *line = strchr(words, '@'); /* between the rule and the expression */
    if (line) {
        tw_engine *e = tw_engine_new();
        e->memory_limit = (size_t)1 << 30;
        budget_start(e, 2);
        job j = {e, words, line, size};
        engine_protect(e, run, &j);
        tw_engine_free(e);
    }
    free(words);
    return 0;
}
