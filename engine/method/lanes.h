/* From strands of a series to lanes of an expansion: Watson's lemma termwise (DLMF 2.3.8, 2.3.9). The last step that
 * all local methods share; private to this room. */
#ifndef TW_METHOD_LANES_H
#define TW_METHOD_LANES_H

#include "engine/method/expansion.h"

/* What the kernel is: exp(-scale * x^mu) with scale = constant * large^power; far ends: exp(+scale * x). */
typedef struct kernel {
    fmpq_t mu;      /* > 0 */
    expr *constant; /* > 0, free of the large parameter */
    fmpq_t power;
    bool pure;            /* the phase is x^mu on every branch */
    bool far_end;         /* the formal integral with exp(+scale * x): mu = 1, terms get (-1)^z; integer z only */
    fmpq_t factor_power;  /* the factor's power of the large parameter, added to every exponent */
    fmpq_t factor_number; /* the factor's rational number, multiplied into the coefficients */
} kernel;

void kernel_init(kernel *k);
void kernel_clear(kernel *k);
/* The kernel of a contribution's local form, or of its formal one. */
tw_status kernel_read(tw_engine *e, kernel *k, const contribution *c, expr *large);

void lane_init(lane *l);
void lane_clear(lane *l);
void contribution_clear_lanes(contribution *c);

/* Nonzero coefficients in all lanes. */
slong contribution_count_terms(const contribution *c);

/* As expansion_order, for a contribution by itself. */
tw_status contribution_order(tw_engine *e, const contribution *c, bool small, slong count, term **terms, slong *found);

/* The same for the terms of the first `count` powers: terms of different lanes with the same power of the large parameter and
 * of its logarithm count once, and no power is given in part. *powers: how many powers these are (fewer where the next term is
 * not known). */
tw_status contribution_order_powers(tw_engine *e, const contribution *c, bool small, slong count, term **terms, slong *found,
                                    slong *powers);

/* Lanes being collected. */
typedef struct draft draft;
typedef struct drafts {
    size_t count;
    draft **list;
    size_t sources; /* calls of drafts_add: what several branches give is brought to lowest terms, so that it cancels */
} drafts;
void drafts_init(drafts *d);
void drafts_clear(drafts *d);

/* Adds what the strands give under the kernel. ERROR_DIVERGENT when a term's integral does not converge at 0;
 * ERROR_UNSUITABLE for a far end whose exponents are no integers or that has logarithms. */
tw_status drafts_add(tw_engine *e, drafts *d, const series *q, const kernel *k);

/* Turns the drafts into the lanes of c (old ones are cleared) and sets its domain. */
tw_status drafts_finish(tw_engine *e, drafts *d, contribution *c, const kernel *k);

/* One more lane with these coefficients (copied) and no logarithm; the contribution's domain is widened. */
tw_status contribution_set_lane(tw_engine *e, contribution *c, expr *constant, expr *first_exponent, const fmpq_t step,
                                expr *const *x, slong count);

/* Fills the lanes of c from its local form (or the formal one): at least `terms` nonzero terms in order of size and no
 * more, or all of them when it terminates. conditions: of the coefficients, appended; may be NULL. */
tw_status contribution_fill(tw_engine *e, contribution *c, expr *large, bool small, slong terms,
                            condition_list *conditions);

/* The same without a recurrence's help, however many terms are wanted. */
tw_status contribution_fill_directly(tw_engine *e, contribution *c, expr *large, bool small, slong terms,
                                     condition_list *conditions);

/* Splits factor = number * large^power * rest. */
void factor_split(tw_engine *e, expr *factor, expr *large, fmpq_t number, fmpq_t power, expr **rest);

/* p = x^mu exactly: true and mu set. */
bool is_pure_power(tw_engine *e, expr *p, expr *x, fmpq_t mu);

/* psi^(order)(r) for rational r in (0, 1], in known constants where there are (DLMF 5.4(ii), 5.15). */
expr *polygamma_value(tw_engine *e, slong order, const fmpq_t r);

/* stride.c: the amplitude's coefficients in the branch's own variable t (pure: x with p = x^mu) vanish for a reason of
 * structure but at every so-many-th place of a lane; 1 when no such reason is known. */
slong local_stride(tw_engine *e, const branch *b, bool pure, const fmpq_t mu);
/* Leaves those zeros out of the lane; a lane that has something else there stays as it is. */
void lane_thin(tw_engine *e, lane *l, slong stride);

#endif
