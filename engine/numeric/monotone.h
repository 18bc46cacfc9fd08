/* Complete monotonicity by a small calculus. Private to engine/numeric. */
#ifndef TW_NUMERIC_MONOTONE_H
#define TW_NUMERIC_MONOTONE_H

#include "engine/expr/facts.h"

/* Is f completely monotone in y on (0, inf): (-1)^n f^(n) >= 0 for all n? YES: proved by the rules (other symbols under the facts);
 * else UNKNOWN. */
answer completely_monotone(tw_engine *e, expr *f, expr *y);

/* Is f a Bernstein function of y on (0, inf): f >= 0 and f' completely monotone? */
answer bernstein(tw_engine *e, expr *f, expr *y);

#endif
