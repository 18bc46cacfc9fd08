/* Conditions of rules and passes: decided from facts, with infinite values allowed. */
#ifndef TW_REWRITE_CONDITION_H
#define TW_REWRITE_CONDITION_H

#include "engine/expr/facts.h"

/* As decide() of engine/ball, faster for numbers, and with inf and -inf as values of either side: -inf < x < inf. A
 * NULL condition (its values have no meaning) is unknown; an error of kind VALUE is then forgiven. */
answer condition_answer(tw_engine *e, expr *condition, condition_label *label);
/* Is the value real, or inf or -inf? */
answer condition_of_real(tw_engine *e, expr *value, condition_label *label);

/* The facts of a variable within its binder's range: from < x < to and the like, as far as the ends' order is known. x
 * stands for the opened variable. facts_forget(e, x) ends it. */
void condition_assume_range(tw_engine *e, expr *binder, expr *x);

#endif
