/* The parser's ground floor: tokens with one of lookahead, names looked up once, errors, and what happens after one.
 * It knows what a word may be used for, and no statement's grammar. Its one idea: an error costs its statement and
 * nothing else. */
#include "lang/parse.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "engine/base/engine.h"
#include "lang/parser.h"
#include "lang/suggest.h"

/* ---- memory ---- */

void *parser_alloc(parser *p, size_t bytes)
{
    return memset(arena_alloc(&p->out->arena, bytes), 0, bytes);
}

void parser_push(parser *p, void *item, char sign)
{
    if (p->pending_count == p->pending_room) {
        size_t room = p->pending_room ? 2 * p->pending_room : 64;
        pending *more = arena_alloc(&p->out->arena, room * sizeof *more);
        if (p->pending_count > 0)
            memcpy(more, p->pending, p->pending_count * sizeof *more);
        p->pending = more;
        p->pending_room = room;
    }
    p->pending[p->pending_count++] = (pending){item, sign};
}

void *parser_pop(parser *p, size_t base, char **signs)
{
    size_t n = p->pending_count - base;
    void **items = arena_alloc(&p->out->arena, n * sizeof *items);
    char *marks = signs ? arena_alloc(&p->out->arena, n) : NULL;
    for (size_t k = 0; k < n; k++) {
        items[k] = p->pending[base + k].item;
        if (marks)
            marks[k] = p->pending[base + k].sign;
    }
    if (signs)
        *signs = marks;
    p->pending_count = base;
    return items;
}

void *parser_pop_values(parser *p, size_t base, size_t bytes)
{
    size_t n = p->pending_count - base;
    char *values = arena_alloc(&p->out->arena, n * bytes);
    for (size_t k = 0; k < n; k++)
        memcpy(values + k * bytes, p->pending[base + k].item, bytes);
    p->pending_count = base;
    return values;
}

/* ---- names ---- */

static uint32_t name_hash(const char *bytes, size_t length)
{
    uint32_t h = 2166136261u; /* FNV-1a */
    for (size_t k = 0; k < length; k++)
        h = (h ^ (unsigned char)bytes[k]) * 16777619u;
    return h;
}

static void names_grow(parser *p)
{
    size_t room = p->name_room ? 2 * p->name_room : 256;
    name_entry *names = parser_alloc(p, room * sizeof *names);
    for (size_t k = 0; k < p->name_room; k++)
        if (p->names[k].text != NULL) {
            size_t at = p->names[k].hash & (room - 1);
            while (names[at].text != NULL)
                at = (at + 1) & (room - 1);
            names[at] = p->names[k];
        }
    p->names = names;
    p->name_room = room;
}

/* Valid until the next name is looked up, its text as long as the arena. */
static const name_entry *name_find(parser *p, const char *bytes, size_t length)
{
    static const char *const signs[][2] = {{"\u03c0", "pi"}, {"\u221e", "inf"}, {"\u0393", "Gamma"}};
    for (size_t k = 0; (unsigned char)bytes[0] > 127 && k < sizeof signs / sizeof *signs; k++)
        if (length == strlen(signs[k][0]) && memcmp(bytes, signs[k][0], length) == 0)
            return name_find(p, signs[k][1], strlen(signs[k][1]));
    if (2 * p->name_count >= p->name_room)
        names_grow(p);
    uint32_t hash = name_hash(bytes, length);
    size_t at = hash & (p->name_room - 1);
    for (; p->names[at].text != NULL; at = (at + 1) & (p->name_room - 1))
        if (p->names[at].hash == hash && strncmp(p->names[at].text, bytes, length) == 0
            && p->names[at].text[length] == 0)
            return &p->names[at];
    name_entry *n = &p->names[at];
    n->text = arena_copy(&p->out->arena, bytes, length);
    n->hash = hash;
    n->is = word_find(n->text);
    n->reserved = word_is_reserved(n->text);
    if (n->text[0] == 'd' && lexer_is_name(n->text + 1, length - 1))
        n->differential = n->text + 1;
    if (n->differential && strcmp(n->differential, "\u03c0") == 0)
        n->differential = "pi";
    p->name_count++;
    return n;
}

/* ---- tokens ---- */

static void read_token(parser *p)
{
    p->token = lexer_next(&p->lexer);
    if (p->token.kind == TOKEN_NAME)
        p->name = name_find(p, p->source->bytes + p->token.at.from, p->token.at.to - p->token.at.from);
}

/* Is the next token one that cannot end a statement? */
static bool token_is_open_ended(const parser *p)
{
    switch (p->token.kind) {
    case TOKEN_NAME:
        return p->name->is == WORD_LINK;
    case TOKEN_PLUS: case TOKEN_MINUS: case TOKEN_TIMES: case TOKEN_OVER: case TOKEN_POWER: case TOKEN_COMMA:
    case TOKEN_COLON: case TOKEN_EQUAL: case TOKEN_LESS: case TOKEN_LESS_EQUAL: case TOKEN_GREATER:
    case TOKEN_GREATER_EQUAL: case TOKEN_NOT_EQUAL:
        return true;
    default:
        return false;
    }
}

void parser_advance(parser *p)
{
    p->last = p->token;
    p->last_goes_on = token_is_open_ended(p);
    p->starts_line = false;
    do {
        p->starts_line = p->starts_line || p->token.kind == TOKEN_LINE_END;
        read_token(p);
    } while (p->open > 0 && p->token.kind == TOKEN_LINE_END);
}

void parser_skip_lines(parser *p)
{
    token last = p->last; /* a line end is not what a span ends with */
    bool last_goes_on = p->last_goes_on;
    while (p->token.kind == TOKEN_LINE_END)
        parser_advance(p);
    p->last = last;
    p->last_goes_on = last_goes_on;
}

void parser_go_on(parser *p)
{
    parser_advance(p);
    parser_skip_lines(p);
}

bool parser_at(const parser *p, token_kind k)
{
    return p->token.kind == k;
}

bool parser_at_word(const parser *p, const char *word)
{
    return p->token.kind == TOKEN_NAME && strcmp(p->name->text, word) == 0;
}

bool parser_at_line_end(const parser *p)
{
    return p->token.kind == TOKEN_LINE_END || p->token.kind == TOKEN_END;
}

token parser_peek(const parser *p)
{
    lexer ahead = p->lexer;
    token t;
    do
        t = lexer_next(&ahead);
    while (p->open > 0 && t.kind == TOKEN_LINE_END);
    return t;
}

bool parser_peek_word(const parser *p, const char *word)
{
    token t = parser_peek(p);
    size_t length = strlen(word);
    return t.kind == TOKEN_NAME && t.at.to - t.at.from == length
        && memcmp(p->source->bytes + t.at.from, word, length) == 0;
}

span parser_span(const parser *p, uint32_t from)
{
    span s = {from, p->last.at.to > from ? p->last.at.to : from};
    return s;
}

bool parser_enter(parser *p)
{
    if (p->depth >= SYNTAX_DEPTH_LIMIT)
        return parser_fail_here(p, "brackets, signs and exponents nest deeper here than the limit of %d levels",
                                SYNTAX_DEPTH_LIMIT);
    p->depth++;
    return true;
}

/* ---- errors ---- */

static void errors_add(parser *p, span at, const char *words)
{
    syntax_text *out = p->out;
    if (out->error_count >= SYNTAX_ERROR_LIMIT)
        return;
    if (out->error_count == out->error_room) {
        out->error_room = out->error_room ? 2 * out->error_room : 8;
        out->errors = base_resize(out->errors, out->error_room * sizeof *out->errors);
    }
    const char *more = out->error_count == SYNTAX_ERROR_LIMIT - 1 ? " (errors after this one are not shown)" : "";
    size_t length = strlen(words), extra = strlen(more);
    char *copy = parser_alloc(p, length + extra + 1);
    memcpy(copy, words, length);
    memcpy(copy + length, more, extra);
    out->errors[out->error_count].at = at;
    out->errors[out->error_count++].words = copy;
}

static bool fail_with(parser *p, span at, const char *words)
{
    if (!p->failed) {
        p->failed = true;
        errors_add(p, at, words);
    }
    return false;
}

/* The words of a message, in the arena. */
static const char *format_words(parser *p, const char *format, va_list arguments)
{
    va_list again;
    va_copy(again, arguments);
    int length = vsnprintf(NULL, 0, format, arguments);
    char *words = parser_alloc(p, (size_t)length + 1);
    vsnprintf(words, (size_t)length + 1, format, again);
    va_end(again);
    return words;
}

bool parser_fail(parser *p, span at, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    const char *words = format_words(p, format, arguments);
    va_end(arguments);
    return fail_with(p, at, words);
}

/* Fails at the next token; a line's end is marked behind its last word. */
static bool fail_here_with(parser *p, const char *words)
{
    span at = p->token.at;
    if (parser_at_line_end(p) && p->last.kind != TOKEN_LINE_END)
        at = (span){p->last.at.to, p->last.at.to};
    if (!p->failed)
        p->at_end = p->token.kind == TOKEN_END;
    return fail_with(p, at, words);
}

static bool fail_bad_token(parser *p)
{
    text_cut(&p->out->words, 0);
    token_complain(p->source, p->token, &p->out->words);
    return fail_with(p, p->token.at, p->out->words.bytes);
}

bool parser_fail_here(parser *p, const char *format, ...)
{
    if (token_is_bad(p->token.kind))
        return fail_bad_token(p);
    va_list arguments;
    va_start(arguments, format);
    const char *words = format_words(p, format, arguments);
    va_end(arguments);
    return fail_here_with(p, words);
}

/* Does another operand follow an operand, as if a `*` could be left out? */
static bool misses_operator(const parser *p)
{
    if (p->operand_end != p->last.at.to)
        return false;
    return p->token.kind == TOKEN_NUMBER || p->token.kind == TOKEN_OPEN
        || (p->token.kind == TOKEN_NAME && p->name->differential == NULL
            && (p->name->is == WORD_NONE || p->name->is == WORD_FUNCTION || p->name->is == WORD_CONSTANT
                || p->name->is == WORD_EXPRESSION));
}

/* What the next token is, as the end of a sentence. */
static void add_found(const parser *p, text *t)
{
    size_t length = p->token.at.to - p->token.at.from;
    if (p->token.kind == TOKEN_END && p->open > 0)
        text_add(t, ", but the text ends");
    else if (parser_at_line_end(p))
        text_add(t, ", but the line ends");
    else if (p->token.kind == TOKEN_TEXT || length > 60)
        text_addf(t, ", found %s", token_kind_words(p->token.kind));
    else
        text_addf(t, ", found `%.*s`", (int)length, p->source->bytes + p->token.at.from);
}

bool parser_expected(parser *p, const char *what)
{
    return parser_expected_one_of(p, what, NULL);
}

bool parser_expected_one_of(parser *p, const char *what, const char *const *words)
{
    if (p->failed)
        return false;
    if (token_is_bad(p->token.kind))
        return fail_bad_token(p);
    text *t = &p->out->words;
    text_cut(t, 0);
    text_addf(t, "expected %s", what);
    add_found(p, t);
    bool operand = misses_operator(p), glued = operand && p->last.at.to == p->token.at.from;
    if (glued)
        words = NULL;
    suggestion meant;
    suggestion_init(&meant, p->token.kind == TOKEN_NAME ? p->name->text : "");
    for (size_t k = 0; words && words[k]; k++)
        suggestion_offer(&meant, words[k]);
    if (p->token.kind == TOKEN_LESS || p->token.kind == TOKEN_GREATER || p->token.kind == TOKEN_NOT_EQUAL)
        text_add(t, "; a comparison has no place here");
    else if (meant.best != NULL)
        text_addf(t, "; did you mean `%s`?", meant.best);
    else if (operand && words == NULL)
        text_add(t, "; multiplication is always written, with `*`");
    return fail_here_with(p, t->bytes);
}

/* ---- small things that many statements need ---- */

bool parser_take_word(parser *p, const char *word)
{
    if (!parser_at_word(p, word))
        return false;
    parser_advance(p);
    return true;
}

bool parser_expect_word(parser *p, const char *word, const char *what)
{
    if (parser_take_word(p, word))
        return true;
    const char *const words[] = {word, NULL};
    return parser_expected_one_of(p, what, words);
}

bool parser_expect_sign(parser *p, token_kind k, const char *what)
{
    if (!parser_at(p, k))
        return parser_expected(p, what);
    parser_go_on(p);
    return true;
}

bool parser_open(parser *p, token *bracket)
{
    *bracket = p->token;
    p->open++;
    parser_advance(p);
    return true;
}

bool parser_close(parser *p, token bracket, token_kind k)
{
    if (parser_at(p, k)) {
        p->open--;
        parser_advance(p);
        return true;
    }
    if (p->failed)
        return false;
    uint32_t line = source_find(p->source, bracket.at.from).line;
    const char *opening = token_kind_words(bracket.kind), *closing = token_kind_words(k);
    char what[160];
    if (parser_at(p, TOKEN_CLOSE) || parser_at(p, TOKEN_CLOSE_SQUARE))
        return parser_fail_here(p, "%s does not close the %s of line %u", token_kind_words(p->token.kind), opening,
                                line);
    if (p->token.kind == TOKEN_END)
        return parser_fail_here(p, "the %s of line %u is still open: expected %s, but the text ends", opening, line,
                                closing);
    snprintf(what, sizeof what, "%s for the %s of line %u", closing, opening, line);
    return parser_expected(p, what);
}

bool parser_name(parser *p, syntax_name *out, const char *what)
{
    if (!parser_at(p, TOKEN_NAME))
        return parser_expected(p, what);
    out->text = p->name->text;
    out->at = p->token.at;
    parser_advance(p);
    return true;
}

bool parser_fail_reserved(parser *p, const char *name)
{
    return parser_fail_here(p, "`%s` is a %s: it can't be defined, bound or declared", name,
                            word_find(name) == WORD_CONSTANT ? "constant" : "word of the language");
}

bool parser_new_name(parser *p, syntax_name *out, const char *what)
{
    if (parser_at(p, TOKEN_NAME) && p->name->reserved)
        return parser_fail_reserved(p, p->name->text);
    return parser_name(p, out, what);
}

const char *parser_text(parser *p, const char *what)
{
    if (!parser_at(p, TOKEN_TEXT)) {
        parser_expected(p, what);
        return NULL;
    }
    const char *from = p->source->bytes + p->token.at.from + 1, *to = p->source->bytes + p->token.at.to - 1;
    char *words = parser_alloc(p, (size_t)(to - from) + 1), *end = words;
    for (; from < to; from++) {
        if (*from == '\\')
            from++;
        *end++ = *from;
    }
    parser_advance(p);
    return words;
}

/* ---- the text as a whole ---- */

static bool at_opener(const parser *p)
{
    return p->token.kind == TOKEN_NAME && (p->name->is == WORD_STATEMENT || p->name->is == WORD_MOVE);
}

/* After an error: on to the end of the broken statement, by the rules by which a line goes on. A line that begins
 * with the opening word of a statement is a new one even while a bracket is open; one that begins with a linking word
 * never is. */
static void skip_statement(parser *p)
{
    long open = p->open;
    p->open = 0;
    while (p->token.kind != TOKEN_END) {
        if (p->starts_line && at_opener(p))
            return;
        if (p->token.kind == TOKEN_LINE_END) {
            bool ends = open <= 0 && !p->last_goes_on;
            parser_skip_lines(p);
            if (ends && !(p->token.kind == TOKEN_NAME && p->name->is == WORD_LINK))
                return;
            if (p->token.kind == TOKEN_END || (p->starts_line && at_opener(p)))
                return;
        }
        open += p->token.kind == TOKEN_OPEN || p->token.kind == TOKEN_OPEN_SQUARE;
        open -= p->token.kind == TOKEN_CLOSE || p->token.kind == TOKEN_CLOSE_SQUARE;
        parser_advance(p);
    }
}

static void statements_add(syntax_text *out, statement *s)
{
    if (out->count == out->room) {
        out->room = out->room ? 2 * out->room : 16;
        out->statements = base_resize(out->statements, out->room * sizeof *out->statements);
    }
    out->statements[out->count++] = s;
}

static void parser_init(parser *p, source *s, syntax_text *out)
{
    memset(p, 0, sizeof *p);
    p->source = s;
    p->out = out;
    p->closer = "";
    p->operand_end = UINT32_MAX;
    p->need = "expected an expression here";
    lexer_init(&p->lexer, s);
    p->token.kind = TOKEN_LINE_END; /* the first token stands at the start of a line */
    parser_advance(p);
    p->last.kind = TOKEN_LINE_END;
}

void parse_text(source *s, syntax_text *out)
{
    parser p;
    parser_init(&p, s, out);
    for (parser_skip_lines(&p); p.token.kind != TOKEN_END; parser_skip_lines(&p)) {
        p.failed = p.at_end = p.rule_may_go_on = p.indexed = false;
        p.open = p.depth = 0;
        p.pending_count = 0;
        statement *read = parse_statement(&p);
        if (read != NULL)
            statements_add(out, read);
        else
            skip_statement(&p);
    }
    bool sound = out->error_count == 0 || (out->error_count == 1 && p.failed);
    out->wants_more = sound && (p.at_end || p.rule_may_go_on);
    out->rule_is_open = sound && p.rule_may_go_on && !p.at_end;
}

syntax *parse_expression_text(source *s, syntax_text *out)
{
    parser p;
    parser_init(&p, s, out);
    parser_skip_lines(&p);
    syntax *read = parse_sum(&p, "expected an expression here", "");
    parser_skip_lines(&p);
    if (read != NULL && p.token.kind != TOKEN_END) {
        parser_expected(&p, "the end of the expression");
        read = NULL;
    }
    return read;
}

/* Is the last line, its line end included, empty? */
static bool ends_with_empty_line(const char *bytes, size_t length)
{
    if (length == 0 || bytes[length - 1] != '\n')
        return false;
    for (length--; length > 0 && bytes[length - 1] != '\n'; length--)
        if (bytes[length - 1] != ' ' && bytes[length - 1] != '\t' && bytes[length - 1] != '\r')
            return false;
    return length > 0;
}

bool parse_wants_more(const char *bytes, size_t length)
{
    source s;
    syntax_text t;
    source_init(&s, "", bytes, length);
    syntax_text_init(&t);
    parse_text(&s, &t);
    bool more = t.wants_more && !(t.rule_is_open && ends_with_empty_line(bytes, length));
    syntax_text_clear(&t);
    return more;
}
