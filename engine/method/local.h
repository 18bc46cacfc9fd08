/* What the methods at a critical point share: contributions made from a reading, far ends, steps. Private to this room.
 */
#ifndef TW_METHOD_LOCAL_H
#define TW_METHOD_LOCAL_H

#include "engine/method/method.h"

/* The contributions of all points of the reading, the dominant ones first, lanes filled with `terms` terms each. */
tw_status local_expand(tw_engine *e, expansion *out, const reading *r, slong terms, const char *name);

/* The contributions of finite far ends of the dominant points, exponentially small, behind them. One that has no such form (a branch point
 * there) is left out with a note in the derivation; *all: none was left out. */
tw_status local_expand_far_ends(tw_engine *e, expansion *out, const reading *r, slong terms, const char *name,
                                bool *all);

/* More terms for every contribution made by the method `name` that has fewer and does not end. */
tw_status local_extend(tw_engine *e, expansion *a, slong terms, const char *name);

/* prefactor*(first terms + ...) of contribution k; an expression with at most `terms` terms. */
expr *local_partial_sum(tw_engine *e, expansion *a, size_t k, slong terms);

/* Appends a step whose form is the partial sum in words ("s^-1 - s^-3 + ..."). */
step *local_record_sum(tw_engine *e, expansion *a, size_t k, const char *rule, const char *source);

/* Answers with words; a `suits` function returns it. */
answer suits_answer(char **why, answer a, const char *format, ...) __attribute__((format(printf, 3, 4)));

#endif
