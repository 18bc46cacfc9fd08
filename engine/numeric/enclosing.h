/* The enclosing theorem. Private to engine/numeric. */
#ifndef TW_NUMERIC_ENCLOSING_H
#define TW_NUMERIC_ENCLOSING_H

#include "engine/ball/tape.h"
#include "engine/method/expansion.h"

/* Does every partial sum of the contribution enclose: R_N has the sign of the first omitted nonzero term and is smaller? YES only
 * when proved. The symbols in `at` have values, the others stand under the facts. */
answer contribution_encloses(tw_engine *e, const local_form *l, expr *large, const env *at);

#endif
