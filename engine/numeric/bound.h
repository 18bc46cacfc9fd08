/* Proved bounds of the remainder: integral as typed minus what was summed (methods.md section 9, remainders.md).
 * enclosing.c: complete monotonicity; panels.c: the machine of discs. */
#ifndef TW_NUMERIC_BOUND_H
#define TW_NUMERIC_BOUND_H

#include "engine/ball/quadrature.h"
#include "engine/method/expansion.h"

typedef enum label { LABEL_EXACT, LABEL_PROVED, LABEL_CONDITIONAL, LABEL_ESTIMATED, LABEL_UNKNOWN } label;
const char *label_word(label l);

/* |integral - kept terms| <= bound for all s >= from (for small h: 0 < h <= 1/from). */
typedef struct remainder_bound {
    label label;
    const char *manner;      /* "enclosing" or NULL */
    slong terms;             /* kept, of the dominant contributions in order of size */
    expr *bound;             /* an expression in the large parameter, exact rationals rounded up; NULL when unknown */
    expr *from;              /* valid from this value of the large parameter on (for a small h: up to this h) */
    char *source;            /* theorem or computation */
    char *reason;            /* for `estimated` and `unknown`: why not proved; else NULL */
    /* the step function behind it (panels): |R| <= factor * int t^power * H(t) exp(-scale t) dt */
    expr *panel_power;
    size_t panel_count;
    char **panel_t, **panel_height; /* decimals, rounded so that the bound holds */
    condition_list conditions;
} remainder_bound;

void remainder_bound_init(remainder_bound *r);
void remainder_bound_clear(remainder_bound *r);

/* The bound with `terms` kept (negative: as many as `evaluate` keeps at s0), for all s >= s0. s0 NULL: the engine chooses a
 * s0 from which on the bound is useful, as low as it can prove. Parameters must have values in `at` (may be empty); when one is
 * left free the label is UNKNOWN and reason names it, unless the enclosing theorem holds for all of its values. */
tw_status remainder_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *at, slong terms, expr *s0);

/* The bound at one value of the large parameter, as a ball with a tight upper end: encl = 1 and [low, high] relative to the first
 * omitted term is folded into `error`, an interval that holds integral - partial sum (real case). */
typedef struct point_bound {
    label label;
    const char *manner;
    arb_t error;             /* holds integral - sum of the kept terms */
    char *reason;
    condition_list conditions;
} point_bound;
void point_bound_init(point_bound *b);
void point_bound_clear(point_bound *b);
tw_status remainder_at(tw_engine *e, point_bound *out, expansion *a, const env *at /* s too */, slong terms, slong bits);

void bound_cache_free(struct bound_cache *c);

#endif
