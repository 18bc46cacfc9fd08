/* From bytes to tokens, one at a time. Knows signs and the shape of names and numbers, but no word of the language. */
#ifndef TW_LANG_LEXER_H
#define TW_LANG_LEXER_H

#include <stdbool.h>

#include "engine/base/text.h"
#include "lang/source.h"

/* The longest number: digits typed, and the size of a typed exponent. */
enum { NUMBER_DIGIT_LIMIT = 100000, NUMBER_EXPONENT_LIMIT = 1000000 };

/* One row a kind of token: identifier, how a message calls it. Signs are called by themselves. */
#define TOKEN_KINDS(X)                                                                                                \
    X(END, "the end of the text")                                                                                     \
    X(LINE_END, "the end of the line")                                                                                \
    X(NAME, "a name")                                                                                                 \
    X(NUMBER, "a number")                                                                                             \
    X(TEXT, "a text")                                                                                                 \
    X(PLUS, "`+`")                                                                                                    \
    X(MINUS, "`-`")                                                                                                   \
    X(TIMES, "`*`")                                                                                                   \
    X(OVER, "`/`")                                                                                                    \
    X(POWER, "`^`")                                                                                                   \
    X(FACTORIAL, "`!`")                                                                                               \
    X(OPEN, "`(`")                                                                                                    \
    X(CLOSE, "`)`")                                                                                                   \
    X(OPEN_SQUARE, "`[`")                                                                                             \
    X(CLOSE_SQUARE, "`]`")                                                                                            \
    X(COMMA, "`,`")                                                                                                   \
    X(COLON, "`:`")                                                                                                   \
    X(EQUAL, "`=`")                                                                                                   \
    X(LESS, "`<`")                                                                                                    \
    X(LESS_EQUAL, "`<=`")                                                                                             \
    X(GREATER, "`>`")                                                                                                 \
    X(GREATER_EQUAL, "`>=`")                                                                                          \
    X(NOT_EQUAL, "`!=`")                                                                                              \
    X(BAD_BYTE, "a byte that is no UTF-8")                                                                            \
    X(BAD_CHARACTER, "a character without a meaning here")                                                            \
    X(BAD_ESCAPE, "an unknown sign after `\\`")                                                                       \
    X(UNCLOSED_TEXT, "a text without its closing quote")                                                              \
    X(LONG_NUMBER, "a number that is too long")

typedef enum token_kind {
#define X(id, words) TOKEN_##id,
    TOKEN_KINDS(X)
#undef X
} token_kind;

typedef struct token {
    token_kind kind;
    span at; /* the bytes; of a bad token the offending ones */
} token;

/* A reader's place; a copy of it reads on from there. */
typedef struct lexer {
    const char *start, *cursor, *limit;
} lexer;

void lexer_init(lexer *l, const source *s); /* s is not changed and outlives the lexer */
/* The next token; END again and again once the text is over. Spaces and comments are skipped. */
token lexer_next(lexer *l);
/* Is the whole of these bytes one name? bytes[length] must be readable and no part of a name, e.g. 0. */
bool lexer_is_name(const char *bytes, size_t length);

const char *token_kind_words(token_kind k);
bool token_is_bad(token_kind k);
/* The complaint about a bad token, in full. */
void token_complain(const source *s, token t, text *out);

#endif
