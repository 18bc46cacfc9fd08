/* Recurrences of sums: the least common left multiple of telescopers. */
#ifndef TW_EXACT_CLOSURE_H
#define TW_EXACT_CLOSURE_H

#include "engine/exact/telescope.h"

/* Each list[k] is a telescoper in n (the variable `index` of the field) of a term whose shift n -> n + 1 is the factor
 * ratios[k]. Afterwards all have the same c_j, those of the least common left multiple, and certificates that fit them.
 * ERROR_UNSUITABLE when its order exceeds `limit`. The new certificates are for the caller to prove (telescope_holds). */
tw_status telescopes_unite(telescope *list, const element *ratios, size_t count, slong index, slong limit);

#endif
