/* Convergence of int_0^end q exp(-scale p) dx for large s, and the smoothness of q on the way. Private to this room. */
#ifndef TW_METHOD_CONVERGENCE_H
#define TW_METHOD_CONVERGENCE_H

#include "engine/method/method.h"

/* How f behaves as x -> +inf: log|f(x)| <= b x^c + o(x^c) + a log x + k log log x, with = instead of <= when sharp. */
typedef struct behaviour {
    bool known, sharp;
    expr *b;  /* 0: no exponential part */
    fmpq_t c; /* > 0 where b is not 0 */
    expr *a;
    slong k;
} behaviour;

void behaviour_init(behaviour *f);
void behaviour_clear(behaviour *f);

/* Structural and sound; known = false where no rule is known. x is a symbol, positive. Never sets an error but for the
 * budget. */
void behaviour_at_infinity(tw_engine *e, behaviour *out, expr *f, expr *x);

/* f > 0 for all positive x and all values of the parameters that the facts allow, seen from the signs of its parts. */
bool plainly_positive(tw_engine *e, expr *f, expr *x);

/* f > 0 on (0, end): plainly, or by branch and bound. */
answer positive_on_branch(tw_engine *e, expr *f, expr *x, expr *end);

/* The signs that f(x), real, is proved by balls to take at sample points of (0, end). NONE: at some sample the sign is
 * not known, or f has other symbols than x. */
enum { SIGN_SEEN_POSITIVE = 1, SIGN_SEEN_NEGATIVE = 2, SIGN_SEEN_NONE = 4 };
int signs_seen(tw_engine *e, expr *f, expr *x, expr *end);

/* Adds the conditions under which the integral over branch k of the point converges, and q is continuous inside, to r->conditions
 * with their labels. *least: raised to the value of the scale beyond which it converges (0 at first). DIVERGENT when it
 * never does. */
tw_status branch_converges(tw_engine *e, reading *r, const critical_point *c, size_t k, expr **least, bool *proved);

/* The same for a branch of the rest, which starts at a regular place; at a finite end the phase may be infinite. */
tw_status rest_converges(tw_engine *e, reading *r, const branch *b, expr **least, bool *proved);

#endif
