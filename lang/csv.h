/* Tables as CSV (RFC 4180): reading with places. Knows nothing of the language or of numbers. */
#ifndef TW_LANG_CSV_H
#define TW_LANG_CSV_H

#include <stdbool.h>

#include "lang/source.h"

typedef struct csv_cell {
    char *words; /* without quotes and the blanks around it */
    span at;     /* in the source, without quotes */
} csv_cell;

/* Rows of equal width, the heading first. Empty lines are left out. */
typedef struct csv_table {
    size_t width, count, room; /* of cells: count = width * rows */
    csv_cell *cells;
} csv_table;

/* Reads the whole source; out is freshly zeroed, and to be cleared in either case. False: *why (appended) says what is wrong
 * at *at. A byte order mark at the start and either kind of line end are fine. */
bool csv_read(const source *s, csv_table *out, span *at, text *why);
void csv_clear(csv_table *t);

#endif
