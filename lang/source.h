/* A source text with its name: what spans point into. Lines and columns are computed only when somebody asks. */
#ifndef TW_LANG_SOURCE_H
#define TW_LANG_SOURCE_H

#include <stddef.h>
#include <stdint.h>

#include "engine/base/text.h"

/* Bytes [from, to) of a source. */
typedef struct span {
    uint32_t from, to;
} span;

/* The greatest length of a source in bytes; a longer text is not read. */
#define SOURCE_LENGTH_LIMIT ((size_t)UINT32_MAX - 16)

typedef struct source {
    const char *name;      /* "fade.tw", "<input>": what error messages begin with */
    const char *bytes;     /* `length` bytes and a NUL after them; the owner of the bytes outlives the source */
    size_t length;
    uint32_t known_offset; /* private: the last line that was looked up */
    uint32_t known_line;
} source;

typedef struct source_place {
    uint32_t line, column; /* from 1; the column counts characters */
} source_place;

/* Both strings stay the caller's; length <= SOURCE_LENGTH_LIMIT and bytes[length] == 0. */
void source_init(source *s, const char *name, const char *bytes, size_t length);

/* Where the byte at `offset` (<= length) stands. Asking in rising order costs one walk over the text in all. */
source_place source_find(source *s, uint32_t offset);

/* How many bytes come before the first that is a NUL or no UTF-8; `length` when all are sound. */
size_t source_check_bytes(const char *bytes, size_t length);

/* Adds a complaint as language.md shows it, with a line end after each of its lines:
 *     fade.tw:3:23: error: `from` needs a lower limit here
 *        3 | let F = integral from to inf of exp(-s*x) dx
 *                                  ^^
 * A span of several lines is marked to the end of its first line. A long line is shown in part. */
void source_show_error(source *s, text *out, span at, const char *words);

#endif
