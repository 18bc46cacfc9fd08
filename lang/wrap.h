/* Long lines in pieces. */
#ifndef TW_LANG_WRAP_H
#define TW_LANG_WRAP_H

#include <stdbool.h>
#include <stddef.h>

#include "engine/base/text.h"

/* Appends the line, without a line end at its close, in pieces of at most `width` bytes where it can be broken; the pieces after
 * the first are indented. prose: at blanks. Otherwise it is an expression, perhaps with words around it, and is broken only
 * after an operator, a comma or `of`, where the language lets a line go on, and before a remark that two blanks set off: a
 * piece that is typed as printed is read as printed. */
void wrap_line(text *out, const char *line, size_t width, bool prose);

#endif
