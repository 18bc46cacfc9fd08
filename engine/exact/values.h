/* What is known of a value free of x: is it zero, real, of which sign. Every answer is proved: rational
 * arithmetic, facts, balls, and for fixed constants whose ball holds zero Calcium's exact arithmetic. */
#ifndef TW_EXACT_VALUES_H
#define TW_EXACT_VALUES_H

#include "engine/expr/facts.h"

/* Zero for all values of its parameters: YES; nonzero at some value: NO. */
answer value_is_zero(tw_engine *e, expr *a);
/* Real for all values of the parameters that the facts allow (true: proved). */
bool value_is_real(tw_engine *e, expr *a);
/* +1, -1, 0 for all values allowed; 2 unknown. a is real. */
int value_sign(tw_engine *e, expr *a);
/* A fixed value whose balls are not finite: a pole, 0/0, or nothing that can be computed. */
bool value_is_singular(tw_engine *e, expr *a);
/* a with admissible rational numbers for its parameters, the `trial`-th choice, the same in every expression. */
expr *value_sample(tw_engine *e, expr *a, slong trial);
/* Proved not to be on the negative real axis or zero: log and powers are analytic there. */
bool value_off_cut(tw_engine *e, expr *a);
/* An integer for certain (rational ones, and what the facts say). */
bool value_is_integer(tw_engine *e, expr *a);

#endif
