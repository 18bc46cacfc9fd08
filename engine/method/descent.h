/* Steepest descent: integrals along paths in the complex plane as sums over saddles, ends and poles (methods.md, 6). */
#ifndef TW_METHOD_DESCENT_H
#define TW_METHOD_DESCENT_H

#include "engine/method/saddle_series.h"
#include "engine/method/thimble.h"
#include "engine/method/expansion.h"

/* What stands behind a contribution of this method. The contribution's integral is, exactly,
 *
 *   factor * sum over k of n[k] * int over D_k of q(z) exp(-scale*p(z)) dz
 *
 * D_k the descending half branches at the place (thimble.h), factor including all that is free of z; for a pole of q instead
 * factor * n[0] * 2 pi i * residue. */
typedef struct steepest {
    expr *p, *q, *z;
    expr *scale, *factor; /* factor without exp(-scale*p(place)) */
    expr *place, *height, *lead;
    slong m;
    slong *n;             /* m integers; twice the mean of both sides' on a Stokes line, `half` then */
    bool half;
    bool residue, on_stokes_line;
    slong base;           /* lead^(-1/m), principal value, points along D_base */
    acb_t direction;      /* of D_0, a unit */
} steepest;

void steepest_free(steepest *s);

/* Does this method take the integral (a contour, or an ordinary integral when asked)? */
bool descent_applies(expr *integral);
/* Reads, counts crossings, and fills out. Errors: UNSUITABLE with the reason, DIVERGENT, UNDECIDED ... */
tw_status descent_expand(tw_engine *e, expansion *out, expr *integral, slong terms);
/* What the path meets, in words, for `let` (fresh text). */
tw_status descent_summary(tw_engine *e, char **words, expr *integral);

/* ---- descent_read.c ---- */

typedef struct descent_problem {
    tw_engine *e;
    expr *integral, *large;
    bool small;
    expr *variable;      /* for the eye */
    expr *z;             /* of the (stretched) integrand */
    expr *p, *q, *scale, *factor;
    expr *stretch;       /* typed variable = stretch * z; 1 */
    size_t point_count;
    expr **points;       /* of z; 0 put in between two points at infinity */
    expr *turned[2];     /* the direction taken instead of the typed one, NULL: none */
    landscape l;
    route r;
    amplitude amplitude;
    spot ends[2];
    bool has_end[2], closed;
    size_t pole_count;
    spot *poles;         /* of q */
    shares found;
    bool read_l, read_r, read_q, read_found;
    derivation derivation;
    condition_list conditions;
} descent_problem;

void descent_problem_init(descent_problem *d, tw_engine *e);
void descent_problem_clear(descent_problem *d);
tw_status descent_read(descent_problem *d, expr *integral);

#endif
