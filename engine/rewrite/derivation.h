/* The derivation: the list of states from the integral as typed to the result, each with the rule that led there, its
 * source and its conditions. A value: printed, written, replayed. */
#ifndef TW_REWRITE_DERIVATION_H
#define TW_REWRITE_DERIVATION_H

#include "engine/expr/expr.h"
#include "engine/expr/facts.h"

typedef struct condition {
    char *words;    /* "nu > -1", or a sentence such as "the integral converges absolutely for s > 3" */
    expr *relation; /* NULL when it is a sentence only */
    condition_label label;
} condition;

typedef struct condition_list {
    size_t count, room;
    condition *list;
} condition_list;

void conditions_init(condition_list *c);
void conditions_clear(condition_list *c);
/* Adds unless the same words are there; of two labels the weaker stays (open weaker than granted weaker than given,
 * proved). */
void conditions_add(condition_list *c, const char *words, expr *relation, condition_label label);
void conditions_append(condition_list *to, const condition_list *from);
bool conditions_all_sure(const condition_list *c); /* no open, no granted one */
/* Decides the relation under the facts (ball/decide.h), adds it with its label (open when unknown); ERROR_UNSUITABLE
 * with the condition's words when it is proved false. */
tw_status conditions_require(tw_engine *e, condition_list *c, expr *relation);

typedef struct step {
    char *rule;      /* name of the rewrite: "shift the variable", "Watson's lemma", ... */
    char *source;    /* "DLMF 2.3.8", or NULL */
    char *detail;    /* what was chosen and why, in words; NULL */
    expr *before;    /* NULL when it is the step before's `after` */
    expr *after;     /* NULL when the form is not an expression */
    char *form;      /* the form in words when after is NULL */
    expr *remainder; /* the exact remainder integral split off in this step, or NULL */
    condition_list conditions;
} step;

typedef struct derivation {
    size_t count, room;
    step *steps;
} derivation;

void derivation_init(derivation *d);
void derivation_clear(derivation *d);
/* Appends an empty step with this rule and source and returns it (valid until the next append). */
step *derivation_add(derivation *d, const char *rule, const char *source);
/* Keeps the first `count` steps only. */
void derivation_cut(derivation *d, size_t count);
/* The steps of `from` behind those of `to`; `from` is empty afterwards. */
void derivation_move(derivation *to, derivation *from);

#endif
