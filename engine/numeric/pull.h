/* Powers and logarithms of the coordinate taken out of an expression. Private. */
#ifndef TW_NUMERIC_PULL_H
#define TW_NUMERIC_PULL_H

#include "engine/expr/expr.h"

/* a = y^power * rest for y > 0, where `rest` has no factor y^r in front and every log(y^r w) in it is r*L + log(w), L the given
 * symbol. power is free of y. NULL in *rest: the engine's error is set. */
void power_pull(tw_engine *e, expr *a, expr *y, expr *L, expr **power, expr **rest);

#endif
