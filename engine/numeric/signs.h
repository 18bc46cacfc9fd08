/* The second enclosing route: signs of the amplitude's remainders. Private to engine/numeric. */
#ifndef TW_NUMERIC_SIGNS_H
#define TW_NUMERIC_SIGNS_H

#include "engine/ball/tape.h"
#include "engine/method/expansion.h"

/* Does the sum of the contribution's first `terms` terms enclose: the rest has the sign of the first omitted term and is smaller? YES
 * only when proved; every symbol but the large parameter must have its value in `at`. */
answer signs_enclose(tw_engine *e, const local_form *l, expr *large, const env *at, slong terms);

#endif
