/* Recurrences guessed from coefficients: `fitted`, never proved. */
#ifndef TW_EXACT_GUESS_H
#define TW_EXACT_GUESS_H

#include "engine/exact/recurrence.h"

enum { GUESS_COEFFICIENTS = 150, GUESS_UNUSED = 50 };

/* The recurrence of fewest unknowns (order at most 6, degree at most 8) that fits c[0 .. count-1] exactly, found from all but
 * the last GUESS_UNUSED or more of them and tested on these. *out is NULL, without an error, when none does. */
tw_status recurrence_guess(tw_engine *e, recurrence **out, expr *n, const fmpq *c, slong count);

#endif
