/* Strategies over rules: `repeat`, `everywhere`, `once` bind tightest, then `then`, then `or`. What a name in one
 * stands for is not asked here. */
#include <string.h>

#include "lang/parser.h"

static syntax_pass *pass_new(parser *p, pass_kind kind, uint32_t from)
{
    syntax_pass *a = parser_alloc(p, sizeof *a);
    a->kind = (uint8_t)kind;
    a->at.from = from;
    return a;
}

static syntax_pass *parse_prefixed(parser *p);

static syntax_pass *parse_pass_name(parser *p)
{
    syntax_name name;
    parser_skip_lines(p);
    if (parser_at(p, TOKEN_OPEN)) {
        token bracket;
        parser_open(p, &bracket);
        syntax_pass *inner = parse_pass(p);
        return inner && parser_close(p, bracket, TOKEN_CLOSE) ? inner : NULL;
    }
    uint32_t from = p->token.at.from;
    if (!parser_new_name(p, &name, "the name of a rule or a pass, or `repeat`, `everywhere`, `once`"))
        return NULL;
    syntax_pass *a = pass_new(p, PASS_NAME, from);
    a->name = name.text;
    a->at = name.at;
    return a;
}

static syntax_pass *parse_prefixed(parser *p)
{
    static const struct {
        const char *word;
        pass_kind kind;
    } prefixes[] = {{"repeat", PASS_REPEAT}, {"everywhere", PASS_EVERYWHERE}, {"once", PASS_ONCE}};
    parser_skip_lines(p);
    if (!parser_enter(p))
        return NULL;
    syntax_pass *a = NULL;
    size_t k = 0;
    while (k < 3 && !parser_at_word(p, prefixes[k].word))
        k++;
    if (k == 3) {
        a = parse_pass_name(p);
    } else {
        syntax_pass *whole = pass_new(p, prefixes[k].kind, p->token.at.from);
        parser_go_on(p);
        syntax_pass *part = parse_prefixed(p);
        if (part != NULL) {
            parser_push(p, part, 0);
            whole->count = 1;
            whole->parts = parser_pop(p, p->pending_count - 1, NULL);
            whole->at = parser_span(p, whole->at.from);
            a = whole;
        }
    }
    p->depth--;
    return a;
}

static syntax_pass *parse_joined(parser *p, pass_kind kind, const char *word, syntax_pass *(*parse_part)(parser *p))
{
    parser_skip_lines(p);
    uint32_t from = p->token.at.from;
    size_t base = p->pending_count;
    syntax_pass *first = parse_part(p);
    if (first == NULL || !parser_at_word(p, word))
        return first;
    parser_push(p, first, 0);
    while (parser_at_word(p, word)) {
        parser_go_on(p);
        syntax_pass *part = parse_part(p);
        if (part == NULL)
            return NULL;
        parser_push(p, part, 0);
    }
    syntax_pass *a = pass_new(p, kind, from);
    a->count = p->pending_count - base;
    a->parts = parser_pop(p, base, NULL);
    a->at = parser_span(p, from);
    return a;
}

static syntax_pass *parse_sequence(parser *p)
{
    return parse_joined(p, PASS_THEN, "then", parse_prefixed);
}

syntax_pass *parse_pass(parser *p)
{
    return parse_joined(p, PASS_OR, "or", parse_sequence);
}
