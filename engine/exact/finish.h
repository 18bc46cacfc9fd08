/* From the working form to the finished series, with the tries that this takes. */
#ifndef TW_EXACT_FINISH_H
#define TW_EXACT_FINISH_H

#include "engine/exact/pieces.h"

/* Makes the pieces: series.c evaluates an expression, branch.c changes the variable first. */
typedef tw_status (*pieces_maker)(work *w, pieces *out, const void *host);

/* Runs make with enough terms and generators that each strand gets `length` coefficients; *out and the conditions as
 * series_at_zero gives them. f: for words. */
tw_status series_by_tries(tw_engine *e, series *out, pieces_maker make, const void *host, expr *f, expr *x,
                          slong length, expr ***conditions, size_t *condition_count);

#endif
