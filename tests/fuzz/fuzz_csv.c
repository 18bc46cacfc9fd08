/* Fuzzes the reader of tables: it takes any bytes, its places lie in the text, its rows are of one width, and a table written
 * again cell by cell reads back as itself. */
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "lang/csv.h"

static bool read_table(const text *in, csv_table *t)
{
    source s;
    span at = {0, 0};
    text why;
    text_init(&why);
    memset(t, 0, sizeof *t);
    source_init(&s, "fuzz", in->bytes, in->length);
    bool good = csv_read(&s, t, &at, &why);
    if (good != (why.length == 0) || (!good && (at.from > at.to || at.from > in->length))) abort();
    if (good && t->width > 0 && t->count % t->width != 0) abort();
    for (size_t k = 0; k < t->count; k++)
        if (t->cells[k].at.from > t->cells[k].at.to || t->cells[k].at.to > in->length) abort();
    text_clear(&why);
    return good;
}

static void check_again(const csv_table *t)
{
    text again;
    csv_table u;
    text_init(&again);
    for (size_t k = 0; k < t->count; k++) {
        csv_field(&again, t->cells[k].words);
        text_add(&again, (k + 1) % t->width == 0 ? "\r\n" : ",");
    }
    bool lone_blank = t->width == 1; /* an empty cell alone on its line is an empty line, which counts for nothing */
    if (!read_table(&again, &u)) abort();
    if (!lone_blank && (u.width != t->width || u.count != t->count)) abort();
    csv_clear(&u);
    text_clear(&again);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    text in;
    csv_table t;
    text_init(&in);
    text_add_bytes(&in, (const char *)data, size);
    if (read_table(&in, &t) && t.count > 0) check_again(&t);
    csv_clear(&t);
    text_clear(&in);
    return 0;
}
