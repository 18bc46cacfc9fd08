/* The remainder of one contribution of steepest descent, bounded along its own steepest curves. Private to engine/numeric. */
#ifndef TW_NUMERIC_STEEP_H
#define TW_NUMERIC_STEEP_H

#include "engine/method/descent.h"
#include "engine/numeric/bound.h"

/* R(S) = sum n_k int over D_k of q exp(-S (p - p0)) dz - (its terms with N < first), N counting powers S^(-N/m); the contribution's
 * factor is left out. */
typedef struct steep_bound {
    bool made;
    char *reason;      /* fresh words when not made */
    acb_t error;       /* holds R at the point's S */
    acb_t kept;        /* the terms with N < first, as balls */
    arb_t alpha;       /* first/m */
    /* |R(S)| <= int_0^end of t^(alpha-1) H(t) exp(-S t) dt + beyond*exp(-(S - S0) end), H = height[j] on [t[j], t[j+1]] */
    slong count;
    arb_ptr t, height; /* count + 1, count */
    arb_t beyond;
} steep_bound;

void steep_bound_init(steep_bound *b);
void steep_bound_clear(steep_bound *b);

/* at: values of all parameters, the large one among them. */
tw_status steep_bound_at(tw_engine *e, steep_bound *out, const steepest *s, slong first, const env *at);

#endif
