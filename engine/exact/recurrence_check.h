/* Recurrences from elsewhere: made from what was typed, compared with one that is known. */
#ifndef TW_EXACT_RECURRENCE_CHECK_H
#define TW_EXACT_RECURRENCE_CHECK_H

#include "engine/exact/recurrence.h"

/* sum over k < count of factors[k](n) c[n + offsets[k]] = 0 as a recurrence (label fitted: nothing is claimed). *shift: its
 * n is the typed n plus *shift. ERROR_VALUE when a factor is no rational function of n, or all vanish. */
tw_status recurrence_from_terms(tw_engine *e, recurrence **out, slong *shift, expr *n, expr *const *factors,
                                const slong *offsets, size_t count);

/* Does every sequence that satisfies `known` for n >= 0 satisfy `typed` for n >= *from? By right division of the operators
 * over the rational functions of n; YES is a proof, UNKNOWN says that the remainder does not vanish. */
answer recurrence_follows(tw_engine *e, const recurrence *typed, const recurrence *known, slong *from);

#endif
