/* A rule: pattern, replacement, conditions, name, source, and how it is known. Rules are shared and counted: whoever
 * keeps one holds it. */
#ifndef TW_REWRITE_RULE_H
#define TW_REWRITE_RULE_H

#include "engine/rewrite/derivation.h"
#include "engine/rewrite/pattern.h"

typedef enum rule_status { RULE_UNCHECKED, RULE_PASSED, RULE_PROVED, RULE_REFUTED } rule_status;
const char *rule_status_word(rule_status s); /* "unchecked", "passed", ... */

typedef struct rule {
    unsigned holders;
    char *name;
    size_t count;                /* of variables */
    pattern_variable *variables;
    expr *left, *right;          /* pattern and replacement */
    size_t condition_count;
    expr **conditions;           /* EXPR_RELATION, in the variables */
    char *source;                /* "DLMF 5.9.1", or NULL */
    char *text;                  /* the rule as it is typed, several lines */
    char *file;                  /* where it was read, or NULL */
    unsigned line;
    rule_status status;
    bool checked;                /* was it tried? false: not yet */
    char *finding;               /* what the check found, in words (of a refuted one: the values and the balls); or NULL */
    pattern *pattern;
    uint64_t complex_variables;  /* a bit each: declared complex; the others stand for real values */
} rule;

/* Takes nothing over; copies names and lists. NULL with the error of pattern_new, and when the replacement or a
 * condition holds a variable that the pattern does not bind. source may be NULL. */
rule *rule_new(tw_engine *e, const char *name, const pattern_variable *variables, size_t count, expr *left, expr *right,
               expr *const *conditions, size_t condition_count, const char *source);
rule *rule_hold(rule *r);
void rule_release(rule *r); /* NULL: nothing */

/* How a rule applied. */
typedef struct rule_outcome {
    expr *after;               /* the whole subject rewritten; NULL: it does not apply */
    condition_list conditions; /* those that it rests on, each with its label; also whether the rule only passed */
} rule_outcome;

void rule_outcome_init(rule_outcome *o);
void rule_outcome_clear(rule_outcome *o);

/* Applies the rule at the root of the subject, to the first match whose conditions are all decided as holding (yes by
 * the facts, granted ones among them) and whose result differs from the subject. Whether the rule may be used at all is
 * the caller's question (rule_usable). */
tw_status rule_apply(tw_engine *e, const rule *r, expr *subject, rule_outcome *out);

/* The same for every disjoint part of a sum or product that the rule fits, in one go: what was put in is not looked at
 * again, and the whole is put together once. *times: how often. */
tw_status rule_apply_all(tw_engine *e, const rule *r, expr *subject, rule_outcome *out, size_t *times);

/* May the rule be used? ERROR_REFUTED with what was found when it was refuted. */
tw_status rule_usable(tw_engine *e, const rule *r);

/* Why does the rule not apply anywhere in the subject? Words for a person: the place of the nearest match, the part or
 * the condition that failed and what is known of it. TW_OK also when it does apply (the words say so). */
tw_status rule_why_not(tw_engine *e, const rule *r, expr *subject, text *words);

#endif
