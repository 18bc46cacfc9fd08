/* Places in a source, and how a complaint shows them. It knows nothing of the language; it must stand any bytes,
 * lines of megabytes included. Its one idea: nothing is computed until a message needs it. */
#include "lang/source.h"

#include <stdbool.h>
#include <string.h>

enum {
    SHOWN_WIDTH = 100, /* columns of a source line in a message */
    SHOWN_BEFORE = 60, /* of them before the marked place, when the line is too long */
};

void source_init(source *s, const char *name, const char *bytes, size_t length)
{
    s->name = name;
    s->bytes = bytes;
    s->length = length;
    s->known_offset = 0;
    s->known_line = 1;
}

/* One character: its bytes, how many columns a terminal gives it, whether it is UTF-8, and whether it can be shown as
 * it is. */
typedef struct glyph {
    size_t bytes;
    int width;
    bool valid, printable;
} glyph;

static bool code_is_in(uint32_t code, const uint32_t (*ranges)[2], size_t count)
{
    for (size_t k = 0; k < count; k++)
        if (code >= ranges[k][0] && code <= ranges[k][1])
            return true;
    return false;
}

/* Columns of a character, by the blocks that matter: combining marks stand on the letter before them; the scripts of
 * East Asia and pictures take two columns. */
static int code_width(uint32_t code)
{
    static const uint32_t none[][2] = {{0x300, 0x36F},   {0x483, 0x489},   {0x591, 0x5BD},   {0x610, 0x61A},
                                       {0x64B, 0x65F},   {0x200B, 0x200F}, {0x20D0, 0x20FF}, {0xFE00, 0xFE0F},
                                       {0xFE20, 0xFE2F}, {0xFEFF, 0xFEFF}};
    static const uint32_t two[][2] = {{0x1100, 0x115F}, {0x2E80, 0xA4CF},   {0xAC00, 0xD7A3},   {0xF900, 0xFAFF},
                                      {0xFE30, 0xFE6F}, {0xFF00, 0xFF60},   {0xFFE0, 0xFFE6},   {0x1F300, 0x1F64F},
                                      {0x1F680, 0x1FAFF}, {0x20000, 0x3FFFD}};
    if (code < 0x300)
        return 1;
    if (code_is_in(code, none, sizeof none / sizeof *none))
        return 0;
    return code_is_in(code, two, sizeof two / sizeof *two) ? 2 : 1;
}

/* The character that starts at `at`; a byte that is no UTF-8 counts as one character. */
static glyph glyph_read(const char *at, const char *end)
{
    const unsigned char *u = (const unsigned char *)at;
    glyph g = {1, 1, u[0] < 128, u[0] >= ' ' && u[0] < 127};
    size_t length = u[0] < 0xC2 || u[0] > 0xF4 ? 1 : u[0] < 0xE0 ? 2 : u[0] < 0xF0 ? 3 : 4;
    if (length == 1 || (size_t)(end - at) < length)
        return g;
    uint32_t code = u[0] & (0xFFu >> (length + 1));
    for (size_t k = 1; k < length; k++) {
        if ((u[k] & 0xC0) != 0x80)
            return g;
        code = code << 6 | (u[k] & 0x3F);
    }
    static const uint32_t smallest[] = {0, 0, 0x80, 0x800, 0x10000};
    if (code < smallest[length] || code > 0x10FFFF || (code >= 0xD800 && code <= 0xDFFF))
        return g;
    g.bytes = length;
    g.valid = true;
    g.width = code_width(code);
    g.printable = code >= 0xA0;
    return g;
}

size_t source_check_bytes(const char *bytes, size_t length)
{
    const char *at = bytes, *end = bytes + length;
    while (at < end && *at != 0) {
        glyph g = glyph_read(at, end);
        if (!g.valid)
            break;
        at += g.bytes;
    }
    return (size_t)(at - bytes);
}

/* Where the line that holds `offset` begins. */
static uint32_t line_start(const source *s, uint32_t offset)
{
    while (offset > 0 && s->bytes[offset - 1] != '\n')
        offset--;
    return offset;
}

static uint32_t line_end(const source *s, uint32_t offset)
{
    const char *end = memchr(s->bytes + offset, '\n', s->length - offset);
    uint32_t to = end == NULL ? (uint32_t)s->length : (uint32_t)(end - s->bytes);
    return to > offset && s->bytes[to - 1] == '\r' ? to - 1 : to;
}

source_place source_find(source *s, uint32_t offset)
{
    if (offset < s->known_offset) {
        s->known_offset = 0;
        s->known_line = 1;
    }
    const char *at = s->bytes + s->known_offset, *end = s->bytes + offset;
    for (const char *next; at < end && (next = memchr(at, '\n', (size_t)(end - at))) != NULL; at = next + 1)
        s->known_line++;
    s->known_offset = line_start(s, offset);
    source_place p = {s->known_line, 1};
    for (at = s->bytes + s->known_offset; at < end; p.column++)
        at += glyph_read(at, s->bytes + s->length).bytes;
    return p;
}

/* The part of a line that a message shows: all of it, or a window around the marked place. */
static void choose_window(const source *s, uint32_t *from, uint32_t *to, uint32_t mark)
{
    if (*to - *from <= SHOWN_WIDTH)
        return;
    if (mark - *from > SHOWN_BEFORE) {
        *from = mark - SHOWN_BEFORE;
        while (((unsigned char)s->bytes[*from] & 0xC0) == 0x80 && *from < mark)
            (*from)++;
    }
    if (*to - *from > SHOWN_WIDTH) {
        *to = *from + SHOWN_WIDTH;
        while (((unsigned char)s->bytes[*to] & 0xC0) == 0x80 && *to > mark)
            (*to)--;
    }
}

/* Adds the line's characters as they are, but for those that would upset a terminal. */
static void add_line(const source *s, text *out, uint32_t from, uint32_t to)
{
    while (from < to) {
        glyph g = glyph_read(s->bytes + from, s->bytes + to);
        if (g.printable || s->bytes[from] == '\t')
            text_add_bytes(out, s->bytes + from, g.bytes);
        else
            text_add_char(out, '?');
        from += g.bytes;
    }
}

/* Adds what brings the cursor below byte `to`: a tab below a tab, else spaces. */
static void add_padding(const source *s, text *out, uint32_t from, uint32_t to)
{
    while (from < to) {
        glyph g = glyph_read(s->bytes + from, s->bytes + to);
        if (s->bytes[from] == '\t')
            text_add_char(out, '\t');
        else
            for (int k = 0; k < (g.printable ? g.width : 1); k++)
                text_add_char(out, ' ');
        from += g.bytes;
    }
}

static void add_carets(const source *s, text *out, uint32_t from, uint32_t to)
{
    int carets = 0;
    while (from < to) {
        glyph g = glyph_read(s->bytes + from, s->bytes + to);
        carets += g.printable ? g.width : 1;
        from += g.bytes;
    }
    do
        text_add_char(out, '^');
    while (--carets > 0);
}

void source_show_error(source *s, text *out, span at, const char *words)
{
    source_place place = source_find(s, at.from);
    uint32_t from = line_start(s, at.from), to = line_end(s, from);
    uint32_t mark = at.from > to ? to : at.from, mark_end = at.to > to ? to : at.to < mark ? mark : at.to;
    uint32_t whole_from = from, whole_to = to;
    choose_window(s, &from, &to, mark);
    const char *left = from > whole_from ? "..." : "", *right = to < whole_to ? "..." : "";
    text_addf(out, "%s:%u:%u: error: %s\n", s->name, place.line, place.column, words);
    text_addf(out, "%4u | %s", place.line, left);
    add_line(s, out, from, to);
    text_addf(out, "%s\n", right);
    size_t margin = out->length;
    text_addf(out, "%4u | ", place.line); /* as wide as the margin above */
    for (size_t k = margin; k < out->length; k++)
        out->bytes[k] = ' ';
    text_add(out, *left ? "   " : "");
    add_padding(s, out, from, mark);
    add_carets(s, out, mark, mark_end > to ? to : mark_end);
    text_add_char(out, '\n');
}
