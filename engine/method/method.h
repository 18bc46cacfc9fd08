/* From an integral to an expansion: reading (section 0 of methods.md), then one method. Each method is one file with
 * one struct `method` at its end and one line in the table of method.c. */
#ifndef TW_METHOD_METHOD_H
#define TW_METHOD_METHOD_H

#include "engine/method/expansion.h"

/* One point of the path that counts. Its part of the integral is, exactly (the conditions granted),
 *
 *   local.factor * sum over local.branches of int_0^end q(x) exp(-local.scale * p(x)) dx
 *
 * with p(0) = 0 and p increasing on (0, end); two branches when the path runs on both sides of the point. Where p is a
 * constant times a pure power, the constant is in the scale and p is x^mu. */
typedef struct critical_point {
    point_kind kind;     /* POINT_END, POINT_INTERIOR, ... */
    expr *place;         /* the original variable there; may hold the large parameter where the variable was stretched */
    expr *depth;         /* the phase there: local.factor holds exp(-scale * depth); NULL: 0 */
    bool dominant;       /* among the deepest; the others are exponentially smaller */
    local_form local;
    expr *far_places[2]; /* the original variable at each branch's end where that is an end of the path; else NULL */
    bool pure;           /* p is x^mu on every branch */
    fmpq_t mu;           /* then */
    expr *scale_constant; /* scale = scale_constant * large^power, > 0 */
} critical_point;

/* What reading an integral found: the form each method starts from. Exactly (the conditions granted),
 *
 *   integral = sum over the dominant points of their parts + rest
 *
 * where rest (its branches may lie anywhere on the path and need not be monotone) has p >= rest_floor > 0 throughout,
 * p measured from the depth of the dominant points: exponentially small beside them. The lesser points lie in the
 * rest. */
typedef struct reading {
    expr *integral; /* as typed */
    expr *large;    /* symbol; h when small */
    bool small;
    expr *original_variable; /* for the eye: "x" */
    size_t point_count;      /* at least 1; the dominant ones first, in the order of the path */
    critical_point *points;
    local_form rest;           /* no branches: nothing is left out */
    expr *rest_floor;          /* NULL when there is no rest */
    fmpq_t power;              /* every scale = a constant * large^power */
    condition_list conditions; /* convergence, no other critical point, ... with their labels */
    derivation derivation;     /* steps so far */
    char *summary;             /* for `let`: "depends on s; one critical point, the end x = 0; converges for s > 0" */
} reading;

void reading_init(reading *r);
void reading_clear(reading *r);
/* A new empty point at the end of the list; valid until the next call. */
critical_point *reading_add(reading *r);

/* Reads an integral (EXPR_INTEGRAL, or a product of one with factors free of its variable; sums of integrals are
 * handled by expand). Errors: UNSUITABLE with reason and advice, DIVERGENT. */
tw_status integral_read(tw_engine *e, reading *out, expr *integral);

/* factor * sum over branches of the integrals, as an expression. */
expr *local_form_integral(tw_engine *e, const local_form *l);

struct method {
    const char *name;  /* the word after `by` */
    const char *title; /* "Watson's lemma" */
    /* Does it fit? YES, NO, with a reason in words for either (fresh text into *why, may be NULL-checked). */
    answer (*suits)(tw_engine *e, const reading *r, char **why);
    tw_status (*expand)(tw_engine *e, expansion *out, const reading *r, slong terms);
    /* More terms of contribution k into its lanes, at least `terms` nonzero ones. */
    tw_status (*extend)(tw_engine *e, expansion *a, slong terms);
};

extern const method method_watson, method_parts, method_moments, method_laplace, method_phase, method_descent;
/* The table, in the order in which the engine tries them; *count of them. */
const method *const *method_table(size_t *count);
const method *method_find(const char *name);
/* Words of the language for methods that this version lacks: phase, mellin. */
bool method_is_planned(const char *name);

/* The one function that lists the stages in order: read, choose, expand, prove. by: a method's name or NULL.
 * terms >= 1. out is initialised. */
tw_status expand(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by);

#endif
