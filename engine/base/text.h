/* A text that grows: what printers write into. Always NUL-terminated. */
#ifndef TW_BASE_TEXT_H
#define TW_BASE_TEXT_H

#include <stddef.h>

typedef struct text {
    char *bytes;
    size_t length, room;
} text;

void text_init(text *t);
void text_clear(text *t);
void text_add(text *t, const char *words);
void text_add_bytes(text *t, const char *bytes, size_t length);
void text_add_char(text *t, char c);
void text_addf(text *t, const char *format, ...) __attribute__((format(printf, 2, 3)));
void text_cut(text *t, size_t length); /* shortens to `length` bytes */
char *text_take(text *t);              /* the bytes, now the caller's to free(); t is empty again */

#endif
