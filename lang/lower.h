/* From syntax to expressions: names are resolved, functions found, everything is built through the engine's
 * constructors. Knows what is bound where; what a free name stands for it asks the host. */
#ifndef TW_LANG_LOWER_H
#define TW_LANG_LOWER_H

#include "engine/expr/expr.h"
#include "lang/suggest.h"
#include "lang/syntax.h"

/* A user's function: let f(x, y) = body. */
typedef struct lower_function {
    size_t count;
    expr **parameters; /* symbols of its own */
    expr *body;
} lower_function;

/* What a free name is. */
typedef enum lower_meaning {
    MEANING_FREE,     /* nothing is known of it: a real parameter, unless it is `e` */
    MEANING_DECLARED, /* a parameter that was declared */
    MEANING_VALUE,    /* it stands for *value */
    MEANING_OTHER,    /* it is defined, but no expression: *what says what it is, such as "an expansion" */
} lower_meaning;

/* A bound name and the symbol that it stands for, innermost first. */
typedef struct lower_scope {
    const char *name;
    expr *symbol;
    struct lower_scope *outer;
} lower_scope;

/* A function that is known in one statement only, such as a rule's pattern function. */
typedef struct lower_local {
    const char *name;
    lower_function function;
} lower_local;

typedef struct lowering {
    tw_engine *engine;
    void *host;
    lower_meaning (*meaning)(void *host, const char *name, expr **value, const char **what);
    /* The user's function of this name, or NULL. */
    const lower_function *(*function)(void *host, const char *name);
    /* Offers the names of the user's functions, for `did you mean`; may be NULL. */
    void (*offer_functions)(void *host, suggestion *s);

    bool failed;
    span place; /* once failed: the part of the source that the engine's error is about */

    lower_scope *scope;        /* bound names, innermost first */
    const lower_local *locals; /* functions that hide all others of their names */
    size_t local_count;
    expr **pending;            /* private: items of lists under construction */
    size_t pending_count, pending_room;
} lowering;

/* meaning and function may be NULL: every free name is then a parameter, and there are no functions of the user. */
void lowering_init(lowering *l, tw_engine *e, void *host);
void lowering_clear(lowering *l);

/* The expression, or NULL with the engine's error set (ERROR_NAME, ERROR_VALUE or what a constructor says) and
 * l->place. Inside an integral, a sum, a root, a derivative or `at`, its variable hides everything else of that name.
 * A defined name's value may hold the variable: let q = 1/(1 + x) can be integrated over x. A factorial n! is Gamma(n
 * + 1). a must not be a condition. */
expr *lower_expression(lowering *l, const syntax *a);

/* A list of conditions that all hold; relations are EXPR_RELATION. */
typedef struct lower_conditions {
    size_t count, room;
    expr **list;
} lower_conditions;
void lower_conditions_init(lower_conditions *c);
void lower_conditions_clear(lower_conditions *c);

/* Appends what a condition says: a chain 0 < p < 1 as its two halves, a range as its two ends (an end at infinity says
 * nothing), n integer as one RELATION_INTEGER. */
tw_status lower_condition(lowering *l, const syntax *a, lower_conditions *out);

/* let f(x, y) = body: parameters (fresh symbols, count of them, in the engine's arena) and body into *out. */
tw_status lower_function_define(lowering *l, const syntax_name *parameters, size_t count, const syntax *body,
                                lower_function *out);

/* A whole number between least and most that is fixed by what is defined now; `what` names it in the error: "the
 * number of terms". */
tw_status lower_count(lowering *l, const syntax *a, const char *what, slong least, slong most, slong *out);

/* A number as typed, e.g. 0.25 or 1e-8, exactly. q is initialised. */
void lower_number(const char *digits, fmpq_t q);

#endif
