/* Fuzzes lexer, parser, printer and complaints with any bytes: nothing may crash or leak, whatever parses must come
 * back from its printed form, and every complaint must have words and lie within the text. */
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "lang/parse.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

/* What is printed must parse to an equal tree, and print the same again. */
static void check_statement(const statement *s)
{
    text first, second;
    source src;
    syntax_text t;
    text_init(&first);
    text_init(&second);
    statement_print(&first, s);
    source_init(&src, "printed", first.bytes, first.length);
    syntax_text_init(&t);
    parse_text(&src, &t);
    if (t.count != 1 || t.error_count != 0 || !statement_equal(s, t.statements[0])) {
        fprintf(stderr, "does not come back: %s\n", first.bytes);
        abort();
    }
    statement_print(&second, t.statements[0]);
    if (strcmp(first.bytes, second.bytes) != 0) {
        fprintf(stderr, "printed in two ways: %s | %s\n", first.bytes, second.bytes);
        abort();
    }
    syntax_text_clear(&t);
    text_clear(&first);
    text_clear(&second);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    text in, shown;
    source src;
    syntax_text t;
    text_init(&in);
    text_init(&shown);
    text_add_bytes(&in, (const char *)data, size);
    source_init(&src, "fuzz", in.bytes, in.length);
    syntax_text_init(&t);
    parse_text(&src, &t);
    for (size_t k = 0; k < t.count; k++)
        check_statement(t.statements[k]);
    for (size_t k = 0; k < t.error_count; k++) {
        span at = t.errors[k].at;
        if (at.from > at.to || at.to > size || t.errors[k].words[0] == 0)
            abort();
        source_show_error(&src, &shown, at, t.errors[k].words);
    }
    (void)parse_wants_more(in.bytes, in.length);
    syntax_text_clear(&t);
    text_clear(&shown);
    text_clear(&in);
    return 0;
}
