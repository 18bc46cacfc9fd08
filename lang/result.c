/* Results with two faces. The one idea: whoever answers a request fills members and lines side by side and never asks which
 * face is wanted; only result_show knows. Knows nothing of mathematics or of the terminal. */
#include "lang/result.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "engine/base/engine.h"
#include "engine/export/format.h"
#include "lang/wrap.h"

enum { LABEL_COLUMN = 72 };

/* ---- JSON in pieces ---- */

void json_next(text *t)
{
    if (t->length == 0) return;
    char last = t->bytes[t->length - 1];
    if (last != '{' && last != '[' && last != ' ') text_add(t, ", ");
}

void json_member(text *t, const char *name)
{
    json_next(t);
    json_string(t, name);
    text_add(t, ": ");
}

/* ---- life ---- */

static void begin(result *r, const char *kind)
{
    text_add_char(&r->object, '{');
    result_string(r, "result", kind);
    r->echo = false;
}

void result_init(result *r, const char *kind)
{
    text_init(&r->object);
    text_init(&r->words);
    r->width = RESULT_WIDTH;
    begin(r, kind);
}

void result_clear(result *r)
{
    text_clear(&r->object);
    text_clear(&r->words);
}

void result_restart(result *r, const char *kind)
{
    text_cut(&r->object, 0);
    text_cut(&r->words, 0);
    begin(r, kind);
}

void result_object(result *r, const char *object)
{
    text_cut(&r->object, 0);
    text_add(&r->object, object + strspn(object, " \n"));
    while (r->object.length > 0 && strchr(" \n", r->object.bytes[r->object.length - 1]))
        text_cut(&r->object, r->object.length - 1);
    text_cut(&r->object, r->object.length - 1);
}

/* ---- members ---- */

void result_string(result *r, const char *name, const char *words)
{
    json_member(&r->object, name);
    json_string(&r->object, words);
}

void result_integer(result *r, const char *name, long value)
{
    json_member(&r->object, name);
    text_addf(&r->object, "%ld", value);
}

void result_truth(result *r, const char *name, bool value)
{
    result_json(r, name, value ? "true" : "false");
}

void result_json(result *r, const char *name, const char *json)
{
    json_member(&r->object, name);
    text_add(&r->object, json);
}

/* ---- lines ---- */

static void add_wrapped(result *r, bool prose, const char *form, va_list args)
{
    char *line;
    if (vasprintf(&line, form, args) < 0) return;
    wrap_line(&r->words, line, r->width, prose);
    text_add_char(&r->words, '\n');
    free(line);
}

void result_line(result *r, const char *form, ...)
{
    va_list args;
    va_start(args, form);
    char *line;
    int length = vasprintf(&line, form, args);
    va_end(args);
    if (length < 0) return;
    text_add(&r->words, line);
    text_add_char(&r->words, '\n');
    free(line);
}

void result_expression(result *r, const char *form, ...)
{
    va_list args;
    va_start(args, form);
    add_wrapped(r, false, form, args);
    va_end(args);
}

void result_prose(result *r, const char *form, ...)
{
    va_list args;
    va_start(args, form);
    add_wrapped(r, true, form, args);
    va_end(args);
}

void result_labelled(result *r, const char *words, const char *known, const char *manner)
{
    size_t start = r->words.length;
    wrap_line(&r->words, words, r->width, false);
    for (size_t k = start; k < r->words.length; k++)
        if (r->words.bytes[k] == '\n') start = k + 1;
    size_t width = r->words.length - start;
    do text_add_char(&r->words, ' ');
    while (++width < LABEL_COLUMN);
    if (width > LABEL_COLUMN) text_add_char(&r->words, ' ');
    text_add(&r->words, known);
    if (manner) text_addf(&r->words, ", %s", manner);
    text_add_char(&r->words, '\n');
}

void result_conditions(result *r, const condition_list *conditions)
{
    for (size_t k = 0; k < conditions->count; k++) {
        const condition *c = &conditions->list[k];
        if (c->label == CONDITION_OPEN || c->label == CONDITION_GRANTED)
            result_prose(r, "  rests on: %s (%s)", c->words, condition_label_word(c->label));
    }
}

bool result_show(const result *r, FILE *out, bool json)
{
    if (!json) return fwrite(r->words.bytes, 1, r->words.length, out) == r->words.length;
    for (size_t k = 0; k < r->object.length; k++) /* line ends stand between values only: strings escape theirs */
        putc(r->object.bytes[k] == '\n' ? ' ' : r->object.bytes[k], out);
    return fputs("}\n", out) >= 0 && !ferror(out);
}

/* ---- tables ---- */

void table_init(table *t, size_t columns)
{
    memset(t, 0, sizeof *t);
    t->columns = columns;
}

void table_clear(table *t)
{
    for (size_t k = 0; k < t->count; k++) free(t->cells[k]);
    free(t->cells);
    memset(t, 0, sizeof *t);
}

static void add_cell(table *t, char *cell)
{
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 32;
        t->cells = base_resize(t->cells, t->room * sizeof *t->cells);
    }
    t->cells[t->count++] = cell;
}

void table_cell(table *t, const char *words)
{
    add_cell(t, base_copy(words));
}

void table_take(table *t, text *words)
{
    add_cell(t, text_take(words));
}

void table_print(const table *t, text *out, const char *indent)
{
    size_t *width = base_alloc(t->columns * sizeof *width);
    memset(width, 0, t->columns * sizeof *width);
    for (size_t k = 0; k < t->count; k++) {
        size_t length = strlen(t->cells[k]);
        if (length > width[k % t->columns]) width[k % t->columns] = length;
    }
    for (size_t k = 0; k < t->count; k++) {
        size_t column = k % t->columns;
        text_add(out, column == 0 ? indent : "  ");
        text_add(out, t->cells[k]);
        if (column + 1 == t->columns) {
            while (out->length > 0 && out->bytes[out->length - 1] == ' ') text_cut(out, out->length - 1);
            text_add_char(out, '\n');
        } else {
            for (size_t pad = strlen(t->cells[k]); pad < width[column]; pad++) text_add_char(out, ' ');
        }
    }
    free(width);
}
