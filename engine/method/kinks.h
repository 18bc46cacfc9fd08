/* abs, sign, min, max and piecewise: where they change, and what they are in between. Private to this room. */
#ifndef TW_METHOD_KINKS_H
#define TW_METHOD_KINKS_H

#include "engine/expr/facts.h"

/* The places inside the range where f changes its formula, into a fresh array. */
tw_status kinks_between(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***places, size_t *count);

/* f without them on a range inside which no place of kinks_between lies. NULL: error set. */
expr *kinks_resolved(tw_engine *e, expr *f, expr *x, expr *from, expr *to);

#endif
