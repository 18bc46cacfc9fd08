/* Conditions decided from facts and by ball arithmetic: yes, no or unknown, never a guess. */
#ifndef TW_BALL_DECIDE_H
#define TW_BALL_DECIDE_H

#include "engine/ball/tape.h"
#include "engine/expr/facts.h"

/* Does `condition` (EXPR_RELATION) hold for all values of its symbols that the facts allow? YES: proved for all; NO:
 * proved false for all; else UNKNOWN. *label (may be NULL) on YES: GIVEN when it is a declared fact itself, GRANTED
 * when it rests on a granted one, else PROVED. Uses intervals of the symbols, monotonicity, balls, subdivision
 * (bounded work). */
answer decide(tw_engine *e, expr *condition, condition_label *label);

/* Sign of a real expression under the facts: +1, -1, 0 exactly zero; 2 unknown. */
int decide_sign(tw_engine *e, expr *f);

/* Is f > 0 (or >= 0 when `weak`) for all x in (from, to), to possibly inf, other symbols under the facts? Branch and
 * bound with balls, the growth record at infinity, jets at a zero end. UNKNOWN when the work limit is met. */
answer decide_positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak);

/* Is the value of f (no free symbols; integrals allowed) real for a reason of structure? false: not known. */
bool decide_real_value(tw_engine *e, expr *f);

#endif
