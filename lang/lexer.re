/* The lexer, for re2c: one rule a kind of token, the last two for what is none. It reads between two pointers, so a
 * NUL is a byte like any other, and the end of the text is where the length says. It knows no word of the language:
 * whether `from` is a word or a name is the parser's business. */
#include "lang/lexer.h"

#include <stdio.h>
#include <string.h>

/*!include:re2c "letters.inc" */

void lexer_init(lexer *l, const source *s)
{
    l->start = s->bytes;
    l->cursor = s->bytes;
    l->limit = s->bytes + s->length;
    if (s->length >= 3 && memcmp(s->bytes, "\xEF\xBB\xBF", 3) == 0)
        l->cursor += 3; /* the mark that some editors put at the start of a UTF-8 file */
}

static bool number_is_too_long(const char *at, const char *end)
{
    size_t digits = 0;
    for (; at < end && *at != 'e' && *at != 'E'; at++)
        digits += *at != '.';
    if (digits > NUMBER_DIGIT_LIMIT)
        return true;
    if (at < end && (*++at == '+' || *at == '-'))
        at++;
    long exponent = 0;
    for (; at < end && exponent <= NUMBER_EXPONENT_LIMIT; at++)
        exponent = 10 * exponent + (*at - '0');
    return exponent > NUMBER_EXPONENT_LIMIT;
}

/* What is wrong with the text that broke off at `at`. */
static token_kind text_fault(const unsigned char *at, const unsigned char *limit)
{
    if (at >= limit || *at == '\n' || *at == '\r')
        return TOKEN_UNCLOSED_TEXT;
    return *at == '\\' ? TOKEN_BAD_ESCAPE : TOKEN_BAD_BYTE;
}

token lexer_next(lexer *l)
{
    const unsigned char *cursor = (const unsigned char *)l->cursor, *limit = (const unsigned char *)l->limit;
    const unsigned char *marker, *from;
    token_kind kind;
/*!re2c
    re2c:define:YYCTYPE = "unsigned char";
    re2c:define:YYCURSOR = cursor;
    re2c:define:YYLIMIT = limit;
    re2c:define:YYMARKER = marker;
    re2c:yyfill:enable = 0;
    re2c:eof = 0;
    re2c:flags:utf-8 = 1;
    re2c:indent:string = "    ";

    letter = [a-zA-Z] | unicode_letter;
    name   = letter (letter | [0-9_] | unicode_mark)*;
    number = [0-9]+ ("." [0-9]+)? ([eE] [+\-]? [0-9]+)?;
    inside = [^"\\\r\n\x00\ud800-\udfff] | "\\" ["\\]; // half of a UTF-16 pair is no character
*/
next:
    from = cursor;
/*!re2c
    $                   { kind = TOKEN_END; goto done; }
    [ \t\r]+            { goto next; }
    "#" [^\n\x00\ud800-\udfff]*    { goto next; }
    "\n"                { kind = TOKEN_LINE_END; goto done; }
    name | "\u221e"     { kind = TOKEN_NAME; goto done; }
    number              { kind = number_is_too_long((const char *)from, (const char *)cursor) ? TOKEN_LONG_NUMBER
                               : TOKEN_NUMBER;
                          goto done; }
    "\"" inside* "\""   { kind = TOKEN_TEXT; goto done; }
    "\"" inside*        { kind = text_fault(cursor, limit); goto broken_text; }
    "+"                 { kind = TOKEN_PLUS; goto done; }
    "-"                 { kind = TOKEN_MINUS; goto done; }
    "*" | "\u00b7" | "\u22c5" { kind = TOKEN_TIMES; goto done; }
    "/"                 { kind = TOKEN_OVER; goto done; }
    "^"                 { kind = TOKEN_POWER; goto done; }
    "!"                 { kind = TOKEN_FACTORIAL; goto done; }
    "("                 { kind = TOKEN_OPEN; goto done; }
    ")"                 { kind = TOKEN_CLOSE; goto done; }
    "["                 { kind = TOKEN_OPEN_SQUARE; goto done; }
    "]"                 { kind = TOKEN_CLOSE_SQUARE; goto done; }
    ","                 { kind = TOKEN_COMMA; goto done; }
    ":"                 { kind = TOKEN_COLON; goto done; }
    "="                 { kind = TOKEN_EQUAL; goto done; }
    "<"                 { kind = TOKEN_LESS; goto done; }
    "<=" | "\u2264"     { kind = TOKEN_LESS_EQUAL; goto done; }
    ">"                 { kind = TOKEN_GREATER; goto done; }
    ">=" | "\u2265"     { kind = TOKEN_GREATER_EQUAL; goto done; }
    "!=" | "\u2260"     { kind = TOKEN_NOT_EQUAL; goto done; }
    "\x00"              { kind = TOKEN_BAD_BYTE; goto done; }
    [^\ud800-\udfff]    { kind = TOKEN_BAD_CHARACTER; goto done; }
    *                   { kind = TOKEN_BAD_BYTE; goto done; }
*/
broken_text:
    if (kind != TOKEN_UNCLOSED_TEXT) { /* the offending bytes are not those from the quote on */
        from = cursor++;
        if (kind == TOKEN_BAD_ESCAPE && cursor < limit && *cursor >= ' ' && *cursor < 127)
            cursor++;
    }
done:
    l->cursor = (const char *)cursor;
    token t = {kind, {(uint32_t)((const char *)from - l->start), (uint32_t)((const char *)cursor - l->start)}};
    return t;
}

bool lexer_is_name(const char *bytes, size_t length)
{
    lexer l = {bytes, bytes, bytes + length};
    token t = lexer_next(&l);
    return length > 0 && t.kind == TOKEN_NAME && t.at.from == 0 && t.at.to == length;
}

const char *token_kind_words(token_kind k)
{
    static const char *const words[] = {
#define X(id, w) w,
        TOKEN_KINDS(X)
#undef X
    };
    return words[k];
}

bool token_is_bad(token_kind k)
{
    return k >= TOKEN_BAD_BYTE;
}

/* Signs that look like one of the language, and what to type for them. */
static const struct {
    const char *sign, *type;
} lookalikes[] = {
    {"\u2212", "`-`"},   {"\u2013", "`-`"},   {"\u2014", "`-`"},        {"\u00d7", "`*`"},        {"\u22c6", "`*`"},
    {"\u00f7", "`/`"},   {"\u2044", "`/`"},   {"\u201c", "`\"`"},       {"\u201d", "`\"`"},       {"\u201e", "`\"`"},
    {"\u2018", "`\"`"},  {"\u2019", "`\"`"},  {"'", "`\"` around a text"}, {"\u221a", "`sqrt(...)`"}, 
    {"\u222b", "`integral from ... to ... of ... dx`"},
    {"\u2211", "`sum from k = ... to ... of ...`"}, {"\u00b2", "`^2`"},  {"\u00b3", "`^3`"},       {"\u00b9", "`^1`"},
    {"\u00bd", "`1/2`"}, {"\u2208", "`in`"},  {"{", "`(`"},             {"}", "`)`"},
    {"\u00a0", "a plain space"},
    {"\u2202", "`derivative of ... in ...`"}, {"|", "`abs(...)`"},      {";", "each statement on a line of its own"},
    {".", "a decimal number with a digit on both sides of its point"},  {"_", "a letter first in a name"},
};

static void add_first_characters(text *out, const char *bytes, size_t length, size_t most)
{
    size_t shown = length < most ? length : most;
    while (shown < length && ((unsigned char)bytes[shown] & 0xC0) == 0x80)
        shown--; /* not within a character */
    text_add_char(out, '`');
    text_add_bytes(out, bytes, shown);
    text_add(out, shown < length ? "...`" : "`");
}

void token_complain(const source *s, token t, text *out)
{
    const char *bytes = s->bytes + t.at.from;
    size_t length = t.at.to - t.at.from;
    switch (t.kind) {
    case TOKEN_BAD_BYTE:
        text_addf(out, "bad byte 0x%02X: %s", (unsigned)(unsigned char)*bytes,
                  *bytes == 0 ? "a NUL has no place in a text" : "the text is not UTF-8 here");
        return;
    case TOKEN_BAD_ESCAPE:
        text_add(out, "within a text only `\\\"` and `\\\\` may follow a `\\`");
        return;
    case TOKEN_UNCLOSED_TEXT:
        add_first_characters(out, bytes, length, 40);
        text_add(out, " has no closing quote on this line");
        return;
    case TOKEN_LONG_NUMBER:
        add_first_characters(out, bytes, length, 20);
        text_addf(out, " is too long a number: at most %d digits and an exponent of at most %d", NUMBER_DIGIT_LIMIT,
                  NUMBER_EXPONENT_LIMIT);
        return;
    default:
        break;
    }
    if (length == 1 && ((unsigned char)*bytes < ' ' || *bytes == 127))
        text_addf(out, "a control character (0x%02X) means nothing here", (unsigned)*bytes);
    else
        text_addf(out, "`%.*s` means nothing here", (int)length, bytes);
    for (size_t k = 0; k < sizeof lookalikes / sizeof *lookalikes; k++)
        if (strlen(lookalikes[k].sign) == length && memcmp(lookalikes[k].sign, bytes, length) == 0)
            text_addf(out, "; type %s", lookalikes[k].type);
}
