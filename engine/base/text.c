/* A text that grows, for printers. Knows nothing of what is printed. The bytes are always NUL-terminated, also before
 * the first addition, so they can be shown at any time. */
#include "engine/base/text.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "engine/base/engine.h"
#include "engine/base/flint.h"

void text_init(text *t)
{
    *t = (text){base_alloc(1), 0, 1};
    t->bytes[0] = 0;
}

void text_clear(text *t)
{
    free(t->bytes);
    *t = (text){0};
}

static void text_reserve(text *t, size_t more)
{
    if (t->room > t->length && t->room - t->length > more)
        return;
    if (more > SIZE_MAX / 4 || t->length > SIZE_MAX / 4)
        edge_leave_memory();
    size_t room = (t->length + more + 1) * 2;
    t->bytes = base_resize(t->bytes, room);
    t->room = room;
}

void text_add_bytes(text *t, const char *bytes, size_t length)
{
    text_reserve(t, length);
    memcpy(t->bytes + t->length, bytes, length);
    t->length += length;
    t->bytes[t->length] = 0;
}

void text_add(text *t, const char *words)
{
    text_add_bytes(t, words, strlen(words));
}

void text_add_char(text *t, char c)
{
    text_add_bytes(t, &c, 1);
}

void text_addf(text *t, const char *format, ...)
{
    va_list list;
    va_start(list, format);
    int length = vsnprintf(NULL, 0, format, list);
    va_end(list);
    if (length < 0)
        return;
    text_reserve(t, (size_t)length);
    va_start(list, format);
    vsnprintf(t->bytes + t->length, (size_t)length + 1, format, list);
    va_end(list);
    t->length += (size_t)length;
}

void text_cut(text *t, size_t length)
{
    if (length >= t->length)
        return;
    t->length = length;
    t->bytes[length] = 0;
}

char *text_take(text *t)
{
    if (!t->bytes)
        text_init(t);
    char *bytes = t->bytes;
    *t = (text){0};
    return bytes;
}
