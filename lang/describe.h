/* Expansions and what belongs to them, put into words and members of a result. */
#ifndef TW_LANG_DESCRIBE_H
#define TW_LANG_DESCRIBE_H

#include "lang/session.h"

/* "F ~ s^-1 - s^-3 + 9*s^-5 - ...   (Watson's lemma at x = 0)", and a line for each lesser contribution. */
tw_status describe_series(session *s, result *r, const char *name, expansion *a);

/* Tables of coefficients number from..to, a table for each lane; members of the result, too. Extends the expansion when more
 * are wanted than known. to < 0: as many as there are, and the text leaves out zeros. */
tw_status describe_coefficients(session *s, result *r, expansion *a, slong from, slong to);

/* "lane of x = 0: Gamma(1/3)" */
void describe_lane_title(session *s, result *r, const expansion *a, const contribution *c, const lane *l);

/* The bound as a formula, from where on it holds, its label and source. */
void describe_remainder(session *s, result *r, const expansion *a, const remainder_bound *bound);

void describe_steps(session *s, result *r, const derivation *d);

/* Everything: for `show`. */
tw_status describe_expansion(session *s, result *r, const char *name, expansion *a);

/* The expansion as the JSON object of the formats becomes the object of r. */
tw_status describe_object(session *s, result *r, const char *name, expansion *a);

/* The bound of the remainder with `terms` kept (negative: the engine's choice). What holds only because of a granted condition
 * is `conditional` and lists it. While this runs the engine's facts change; they are put back, also by the caller's mark when
 * memory runs out. */
tw_status describe_find_bound(session *s, remainder_bound *bound, expansion *a, slong terms);

/* Bound of the remainder for files and objects: as `remainder_for_all` gives it, `unknown` with its reason when it cannot be
 * had. Fails only when time, memory or patience is out. */
tw_status describe_bound(session *s, remainder_bound *bound, expansion *a);

/* A complex ball for people; digits: at most so many. */
void describe_value(text *out, const acb_t z, slong digits);
/* The midpoint only, for a cell of a table. */
void describe_decimal(text *out, const acb_t z, slong digits);

#endif
