/* The expansion, what every method makes: a sum of contributions, one for each critical point. Meaning (export.md):
 *
 *   integral ~ sum over contributions of prefactor * sum over lanes of constant * (log s)^log_power *
 *                                                    sum_n c[n] * s^(first_exponent + n*step)
 *
 * with s the large parameter; where a small h was declared everything is in powers of h and log h. */
#ifndef TW_METHOD_EXPANSION_H
#define TW_METHOD_EXPANSION_H

#include "engine/exact/series.h"
#include "engine/rewrite/derivation.h"

typedef struct lane {
    expr *constant; /* 1, Gamma(1/3), Gamma(nu + 1), ... */
    slong log_power;
    expr *first_exponent; /* may hold the other parameters */
    fmpq_t step;          /* negative for large s, positive for small h */
    coefficients c;       /* zeros inside are kept: c[n] belongs to first_exponent + n*step */
} lane;

/* Local form behind a contribution, for the remainder: contribution's integral = factor * sum over branches of
 *     int_0^end q(x) exp(-scale * p(x)) dx,     p(0) = 0, p increasing on (0, end), q free of the large parameter.
 * x > 0 runs along the branch; q may have x^(lambda-1) and log(x)^k at 0. */
typedef struct branch {
    expr *x;   /* a symbol */
    expr *end; /* inf or an expression > 0 */
    expr *p, *q;
} branch;

typedef struct local_form {
    expr *scale;  /* positive, e.g. s, 3*s, s^2, h^-1: a constant times a power of the large parameter */
    expr *factor; /* e.g. 1, exp(-2*s), s^(1/2) */
    size_t count;
    branch *branches;
} local_form;

typedef enum point_kind {
    POINT_END,
    POINT_INTERIOR,
    POINT_STATIONARY,
    POINT_SADDLE,
    POINT_SINGULAR,
    POINT_FAR_END,
    POINT_FORM /* no point: terms of a form that was derived by hand; `place` is NULL */
} point_kind;
const char *point_kind_word(point_kind k); /* "end", "interior", ..., "far-end", "form" */

typedef struct contribution {
    expr *variable, *place; /* "x = 0" */
    point_kind kind;
    const char *method; /* "watson", ... */
    bool dominant;      /* else subdominant: listed, summed only when asked */
    expr *prefactor;    /* in the large parameter and the others */
    size_t lane_count;
    lane *lanes;
    size_t zero_count; /* classes of exponents whose coefficients are all zero as far as they are known: no lanes */
    lane *zeros;
    bool lanes_cut; /* a lane begins beyond the terms kept and is not in the list */
    domain_kind domain;
    bool on_stokes_line; /* its integer differs on both sides: half of it is taken, and it is not dominant */
    struct steepest *steepest; /* descent: what stands behind it; owned */
    local_form local; /* no branches for a far end */
    local_form
        formal;      /* far ends only: factor * int_0 q exp(+scale * p), whose terms are (-scale)^-(n+1) times n! g_n */
    struct recurrence_memo *recurrences; /* attach.c's memory of what it found for the lanes; NULL: nothing yet */
    slong searched;  /* so many terms were looked for in vain: the coefficients beyond those listed vanish far out */
    bool terminates; /* no further terms: the lanes are the whole expansion of this contribution */
} contribution;

typedef struct method method;

typedef struct expansion {
    expr *integral;    /* as typed */
    expr *large;       /* the symbol */
    bool small;        /* a small parameter: powers of h */
    slong terms_asked; /* terms of each contribution: of N powers, so more than N where lanes share powers */
    size_t contribution_count;
    contribution *contributions;
    local_form rest;           /* what no dominant contribution's local form covers; its branches need not be monotone */
    expr *rest_floor;          /* p >= rest_floor > 0 in the rest, p measured from the dominant depth; NULL: no rest */
    expr *remainder;           /* read off a derivation by hand: the integral less all listed terms, exactly; else NULL */
    bool stokes_passed;      /* descent: a Stokes line; the path is two different sums of steepest curves */
    expr *typed;             /* what `integral` came from by a user's pass; NULL: it is as typed */
    bool exact;              /* terminating and nothing left out: label `exact` */
    bool alternating_proved; /* reserved for numeric: set by bound_prepare */
    condition_list conditions;
    derivation derivation;
    const method *made_by;
    char *why;    /* what the engine chose and why, one sentence */
    expr **facts; /* the facts in force when it was made (EXPR_RELATION) */
    condition_label *fact_labels;
    size_t fact_count;
    struct combination *combined; /* of an expression in several integrals (combine.h); else NULL */
    struct bound_cache *cache; /* engine/numeric's memory of proved bounds; freed through bound_cache_free */
} expansion;

void expansion_init(expansion *a);
void expansion_clear(expansion *a);

void contribution_init(contribution *c);
void contribution_clear(contribution *c);
/* A new empty contribution at the end of the list; valid until the next call. */
contribution *expansion_add(expansion *a);

void local_form_init(local_form *l);
void local_form_clear(local_form *l);
branch *local_form_add(local_form *l, expr *x, expr *end, expr *p, expr *q);
void local_form_copy(local_form *to, const local_form *from); /* `to` is initialised and empty */

/* Makes sure that each contribution has at least `terms` nonzero terms (or terminates): extends the lanes in place. */
tw_status expansion_extend(tw_engine *e, expansion *a, slong terms);

/* One term in order of size: exponent order for large s (ties: higher log power first), across the lanes of a
 * contribution. */
typedef struct term {
    size_t lane;
    slong n; /* index in the lane */
} term;
/* The first `count` nonzero terms of contribution k in order of size into a fresh array (free() it), *found of them
 * (fewer when it terminates). Symbolic exponents are ordered by the facts; ERROR_UNDECIDED when they cannot be. */
tw_status expansion_order(tw_engine *e, expansion *a, size_t k, slong count, term **terms, slong *found);

/* The term as an expression in the large parameter, without the contribution's prefactor. */
expr *expansion_term(tw_engine *e, const expansion *a, size_t k, term t);
/* The same to be shown: the sign of a sum that begins with a minus stands before the whole, -s^-2*(b + c). */
expr *expansion_term_shown(tw_engine *e, const expansion *a, size_t k, term t);

#endif
