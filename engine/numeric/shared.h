/* What bound.c, remainder.c and evaluate.c share. Private to engine/numeric. */
#ifndef TW_NUMERIC_SHARED_H
#define TW_NUMERIC_SHARED_H

#include "engine/numeric/evaluate.h"
#include "engine/numeric/panels.h"

/* Tests build with -DTW_BOUND_FACTOR=0.3 to see that a wrong bound is noticed. */
#ifndef TW_BOUND_FACTOR
#define TW_BOUND_FACTOR 1
#endif

/* Does the enclosing theorem hold for the contribution at these values? */
answer known_encloses(tw_engine *e, expansion *a, size_t index, const env *at);

/* As remainder_at; sharp: where the enclosing theorem holds the panels are tried as well, and the smaller bound stands. */
tw_status remainder_at_as(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits, bool sharp);

/* How many parts the panels bound the contribution in (a branch each when the phase is no pure power); 0: *reason says why none. */
tw_status power_bound_count(tw_engine *e, expansion *a, size_t index, const env *at, size_t *count, char **reason);

/* The panels' bound of part `part` for all S from the scale at this point on; *extra: terms of the last group that are not kept, to be added
 * to it. *made false: *reason, fresh words, says why. */
tw_status power_bound_of(tw_engine *e, power_bound *out, expansion *a, size_t index, size_t part, const env *at, slong terms,
                         bool *made, slong *extra, char **reason);

/* combined.c: value minus partial sum of a combined expansion, from the parts' balls. */
tw_status combined_error(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits);

/* rest.c: what the dominant contributions' local forms leave out, at a point (every symbol has a value there), by certified
 * quadrature; *made false: it could not be had. REST_REASON says so to people. */
tw_status rest_at(tw_engine *e, arb_t out, expansion *a, const env *at, bool *made);
/* |rest| <= C * |factor| * exp(-(scale - scale at the point) * floor) for all scales from the point's on. */
tw_status rest_modulus(tw_engine *e, arb_t C, expansion *a, const env *at, bool *made);
#define REST_REASON "the part of the path away from the points that count could not be bounded"

/* Are the machine's kept groups and the expansion's kept terms the same sum, as far as balls see at this point? */
tw_status groups_agree(tw_engine *e, expansion *a, size_t index, const env *at, slong terms, bool *agree);

/* The expansion's conditions with the point's values put in: an open one that holds there is proved, one that fails is
 * ERROR_VALUE. */
tw_status conditions_at(tw_engine *e, condition_list *out, const expansion *a, const env *at);

/* |f| for an expression that is real where it stands: abs only around factors of unknown sign. */
expr *bound_modulus(tw_engine *e, expr *f);

/* The number of terms with the least bound by the envelope of the terms at the point, at most `most`; *least: index of the least
 * term. */
tw_status best_terms(tw_engine *e, expansion *a, const env *at, slong most, slong *terms, slong *least);

/* Pieces of a comparison, for real and complex terms alike (compare.c). The point, copied: */
void comparison_at(env *to, const env *from);
/* Rows, initialised, for sums of `first`, first + 1, ... terms up to `most`, at most 40 around `terms`; returns first. */
slong comparison_rows(comparison *out, slong most, slong terms);
/* The certified value beside a row whose sum, bound and label stand: the error, and whether it violates a proved bound. */
void comparison_judge(comparison_row *row, const acb_t value);

#endif
