/* All zeros of a function on a range, exactly where they are algebraic or elementary. Private to this room. */
#ifndef TW_METHOD_ZEROS_H
#define TW_METHOD_ZEROS_H

#include "engine/expr/facts.h"

/* zeros_balls.c: a smooth f without parameters, by balls: each zero isolated, of whatever order. ERROR_UNDECIDED when
 * that can't be proved. */
tw_status zeros_by_balls(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***list, size_t *count);

/* Appends to a fresh array. */
void expr_list_add(expr ***list, size_t *count, expr *a);

#endif
