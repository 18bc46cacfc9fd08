/* CSV, RFC 4180, read in one walk over the bytes. The one idea: each cell remembers where it stood, so whoever finds its
 * content wrong later can still show line and column. */
#include "lang/csv.h"

#include <stdlib.h>
#include <string.h>

#include "engine/base/engine.h"

/* A walk over the source. */
typedef struct walk {
    const source *s;
    size_t at;
    csv_table *out;
    span *bad;
    text *why;
} walk;

static bool refuse(walk *w, size_t from, size_t to, const char *words)
{
    *w->bad = (span){(uint32_t)from, (uint32_t)to};
    text_add(w->why, words);
    return false;
}

static bool is_blank(char c)
{
    return c == ' ' || c == '\t';
}

static bool at_cell_end(const walk *w)
{
    return w->at >= w->s->length || strchr(",\r\n", w->s->bytes[w->at]);
}

static void take(walk *w, char *words, size_t from, size_t to)
{
    csv_table *t = w->out;
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 64;
        t->cells = base_resize(t->cells, t->room * sizeof *t->cells);
    }
    t->cells[t->count++] = (csv_cell){words, {(uint32_t)from, (uint32_t)to}};
}

/* At the opening quote. */
static bool read_quoted(walk *w)
{
    size_t open = w->at++, from = w->at;
    text words;
    text_init(&words);
    for (; w->at < w->s->length; w->at++) {
        if (w->s->bytes[w->at] == '"') {
            if (w->s->bytes[w->at + 1] != '"') break;
            w->at++;
        }
        text_add_char(&words, w->s->bytes[w->at]);
    }
    if (w->at >= w->s->length) {
        text_clear(&words);
        return refuse(w, open, open + 1, "this quote is not closed");
    }
    size_t to = w->at++;
    while (w->at < w->s->length && is_blank(w->s->bytes[w->at])) w->at++;
    if (!at_cell_end(w)) {
        text_clear(&words);
        return refuse(w, w->at, w->at + 1, "expected a comma or the end of the line after the quoted cell");
    }
    take(w, text_take(&words), from, to);
    return true;
}

static bool read_cell(walk *w)
{
    while (w->at < w->s->length && is_blank(w->s->bytes[w->at])) w->at++;
    if (w->at < w->s->length && w->s->bytes[w->at] == '"') return read_quoted(w);
    size_t from = w->at;
    while (!at_cell_end(w)) w->at++;
    size_t to = w->at;
    while (to > from && is_blank(w->s->bytes[to - 1])) to--;
    char *words = base_alloc(to - from + 1);
    memcpy(words, w->s->bytes + from, to - from);
    words[to - from] = '\0';
    take(w, words, from, to);
    return true;
}

static void skip_line_end(walk *w)
{
    if (w->at < w->s->length && w->s->bytes[w->at] == '\r') w->at++;
    if (w->at < w->s->length && w->s->bytes[w->at] == '\n') w->at++;
}

static bool has_right_width(walk *w, size_t before, size_t line)
{
    size_t width = w->out->count - before;
    if (before == 0) w->out->width = width;
    if (width == w->out->width) return true;
    text words;
    text_init(&words);
    text_addf(&words, "this row has %zu %s, the heading has %zu", width, width == 1 ? "cell" : "cells", w->out->width);
    refuse(w, line, w->at > line ? w->at : line + 1, words.bytes);
    text_clear(&words);
    return false;
}

static bool read_row(walk *w)
{
    size_t before = w->out->count, line = w->at;
    for (;;) {
        if (!read_cell(w)) return false;
        if (w->at >= w->s->length || w->s->bytes[w->at] != ',') break;
        w->at++;
    }
    if (!has_right_width(w, before, line)) return false;
    skip_line_end(w);
    return true;
}

static bool line_is_empty(const walk *w)
{
    size_t k = w->at;
    while (k < w->s->length && is_blank(w->s->bytes[k])) k++;
    return k >= w->s->length || w->s->bytes[k] == '\r' || w->s->bytes[k] == '\n';
}

bool csv_read(const source *s, csv_table *out, span *at, text *why)
{
    walk w = {s, 0, out, at, why};
    size_t sound = source_check_bytes(s->bytes, s->length);
    if (sound < s->length) return refuse(&w, sound, sound + 1, "this byte is not UTF-8 text");
    if (s->length >= 3 && memcmp(s->bytes, "\xEF\xBB\xBF", 3) == 0) w.at = 3;
    while (w.at < s->length) {
        if (line_is_empty(&w)) {
            while (w.at < s->length && is_blank(s->bytes[w.at])) w.at++;
            skip_line_end(&w);
        } else if (!read_row(&w)) {
            return false;
        }
    }
    return true;
}

void csv_clear(csv_table *t)
{
    for (size_t k = 0; k < t->count; k++) free(t->cells[k].words);
    free(t->cells);
    memset(t, 0, sizeof *t);
}
