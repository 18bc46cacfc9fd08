/* From an integral to an expansion: reading (section 0 of methods.md), then one method. Each method is one file with one
 * struct `method` at its end and one line in the table of method.c. */
#ifndef TW_METHOD_METHOD_H
#define TW_METHOD_METHOD_H

#include "engine/method/expansion.h"

/* What reading an integral found: the form each method starts from. */
typedef struct reading {
    expr *integral;       /* as typed */
    expr *large;          /* symbol; h when small */
    bool small;
    expr *variable;       /* a fresh symbol, real, > 0 on the path unless from < 0 */
    expr *from, *to;      /* after shift, scale and mirroring; from finite */
    expr *scale;          /* kernel exp(-scale * p): constant * power of the large parameter, positive */
    expr *p, *q;          /* phase and amplitude, free of the large parameter; p(place of its least value) = 0 */
    expr *factor;         /* what stands outside: exp(-2*s), s^(1/2), constants, ... */
    expr *back;           /* the original variable as an expression in `variable` */
    expr *original_variable;
    condition_list conditions; /* convergence, no other critical point, ... with their labels */
    derivation derivation; /* steps so far */
    char *summary;        /* for `let`: "depends on s; one critical point, the end x = 0; converges for s > 0" */
} reading;

void reading_init(reading *r);
void reading_clear(reading *r);

/* Reads an integral (EXPR_INTEGRAL, or a product of one with factors free of its variable; sums of integrals are handled by
 * expand). Errors: UNSUITABLE with reason and advice, DIVERGENT. */
tw_status integral_read(tw_engine *e, reading *out, expr *integral);

struct method {
    const char *name;                                   /* the word after `by` */
    const char *title;                                  /* "Watson's lemma" */
    /* Does it fit? YES, NO, with a reason in words for either (fresh text into *why, may be NULL-checked). */
    answer (*suits)(tw_engine *e, const reading *r, char **why);
    tw_status (*expand)(tw_engine *e, expansion *out, const reading *r, slong terms);
    /* More terms of contribution k into its lanes, at least `terms` nonzero ones. */
    tw_status (*extend)(tw_engine *e, expansion *a, slong terms);
};

extern const method method_watson, method_parts, method_moments;
/* The table, in the order in which the engine tries them; *count of them. */
const method *const *method_table(size_t *count);
const method *method_find(const char *name);
/* Words of the language for methods that this version lacks: laplace, phase, descent, mellin. */
bool method_is_planned(const char *name);

/* The one function that lists the stages in order: read, choose, expand, prove. by: a method's name or NULL.
 * terms >= 1. out is initialised. */
tw_status expand(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by);

#endif
