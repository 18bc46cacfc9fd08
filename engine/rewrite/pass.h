/* A pass: a strategy over rules. Passes are shared and counted. */
#ifndef TW_REWRITE_PASS_H
#define TW_REWRITE_PASS_H

#include "engine/rewrite/rule.h"

typedef enum strategy {
    STRATEGY_RULE,       /* one rule at the root */
    STRATEGY_STEP,       /* a built-in step, see pass_step */
    STRATEGY_NAMED,      /* another pass, by name */
    STRATEGY_REPEAT,     /* until it does not apply; noticed when it goes in a circle */
    STRATEGY_EVERYWHERE, /* once at every place, from the inside out */
    STRATEGY_ONCE,       /* at the first place that applies, from the outside in */
    STRATEGY_THEN,       /* one after the other; applies if one of them does */
    STRATEGY_OR          /* the first that applies */
} strategy;

/* What a pass did. */
typedef struct rewriting {
    expr *after;         /* the subject rewritten; the subject itself when nothing applied */
    bool applied;
    derivation steps;    /* one step a rule that was used, in the order of first use; detail: how often */
    condition_list conditions;
} rewriting;

void rewriting_init(rewriting *w);
void rewriting_clear(rewriting *w);

/* A built-in step: rewrites subject or leaves *after NULL where it does not fit; run NULL: a method, which leaves the
 * expression alone. Words in steps: name, source. */
typedef struct pass_step {
    const char *name, *source, *summary;
    tw_status (*run)(tw_engine *e, expr *subject, expr **after, condition_list *conditions);
} pass_step;

typedef struct pass {
    unsigned holders;
    strategy kind;
    char *name;          /* NAMED: the pass's name */
    rule *rule;          /* RULE: held */
    const pass_step *step;
    size_t count;        /* THEN, OR: two or more; others: one; RULE, STEP: none */
    struct pass **parts; /* held */
    struct runnable *ready; /* private to pass_run.c: made at the first run, or NULL */
} pass;

void pass_forget(pass *p); /* what was made ready for running; pass_release calls it */
pass *pass_of_rule(rule *r);                 /* holds r */
pass *pass_of_step(const pass_step *s);      /* s lives as long as the program */
pass *pass_named(const char *name, pass *p); /* takes p over */
/* REPEAT, EVERYWHERE, ONCE (n = 1), THEN, OR; takes the parts over. */
pass *pass_join(strategy kind, pass *const *parts, size_t n);
pass *pass_hold(pass *p);
void pass_release(pass *p); /* NULL: nothing */

/* The rules of a pass, each once, into a fresh array (free() it). */
size_t pass_rules(const pass *p, rule ***rules);

/* Runs the pass on the expression. Refuted rules: ERROR_REFUTED. A circle of `repeat`: ERROR_UNSUITABLE that shows it.
 */
tw_status pass_run(tw_engine *e, const pass *p, expr *subject, rewriting *out);

#endif
