/* Recurrences of the coefficients of a lane, attached to its contribution. */
#ifndef TW_METHOD_ATTACH_H
#define TW_METHOD_ATTACH_H

#include "engine/ball/tape.h"
#include "engine/exact/recurrence.h"
#include "engine/method/expansion.h"

/* The proved recurrence of a lane of c (or of a class of exponents without one, among c->zeros), found when asked for the
 * first time and kept with the contribution.
 * ERROR_UNSUITABLE, with the reason in words, when there is none that this program can prove. */
tw_status lane_recurrence(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out);

/* The same where nobody asked for it by name: *out is NULL, without an error, when there is none or when finding it takes
 * more than two seconds. */
tw_status lane_recurrence_if_quick(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out);

/* A recurrence that fits the lane's first coefficients, found where none is proved; *out is NULL, without an error, when none
 * fits, when it is known that none exists, or when the coefficients are not rational. */
tw_status lane_recurrence_fitted(tw_engine *e, contribution *c, const lane *l, expr *large, bool small,
                                 const recurrence **out);

/* What nobody asked for by name gets little time: begin gives the old deadline, which end puts back; end forgives an error
 * that says only that it was too slow or has no answer, and is false on any other. */
double quick_begin(tw_engine *e, double seconds);
bool quick_end(tw_engine *e, double before);

/* The certificates once more, by another way than the one that found them: as expressions, derived and brought to normal
 * form. ERROR_REFUTED when one does not hold. */
tw_status recurrence_verify(tw_engine *e, const recurrence *r);

/* The certificate in words whose parts are expressions of the language; fresh text. NULL for a fitted recurrence. */
char *recurrence_certificate(tw_engine *e, const recurrence *r);

/* The first `count` coefficients of the lane by the direct method, as expressions into a fresh array (free() it); *found
 * of them. at (may be NULL): values that the parameters get first. */
tw_status lane_coefficients(tw_engine *e, const contribution *c, const lane *wanted, expr *large, bool small, slong count,
                            const env *at, expr ***out, slong *found);

/* The parameters in a contribution's local form other than the large one; symbols has room for PARAMETERS_LIMIT. */
enum { PARAMETERS_LIMIT = 16 };
size_t contribution_parameters(const contribution *c, expr *large, expr **symbols);

/* Compares r with the first `count` coefficients of the lane, computed directly, parameters at admissible rational values:
 * the n at which it fails first, -1 when it does not, -2 with the engine's error set. *left and *right: both sides there. */
slong lane_compare(tw_engine *e, const contribution *c, const lane *l, expr *large, bool small, const recurrence *r,
                   slong count, slong *compared, expr **left, expr **right);

void recurrence_memo_free(struct recurrence_memo *m);

#endif
