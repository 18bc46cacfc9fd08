/* Derivations by hand: a current form of an integral, and the moves that change it. The form is
 *
 *     value = plain + sum of outside * integral + (the remainders split off: sum of outside * integral, kept exact)
 *
 * where `plain` and each `outside` hold no integral over the variable of the form. Every move is checked before it is
 * kept: by its own theorem, whose conditions are decided, and by certified balls of the value before and after at sample
 * values of the parameters. A move that fails leaves everything as it was. This room may use all others but export;
 * it knows nothing of the language: moves come as data. */
#ifndef TW_MANUAL_MANUAL_H
#define TW_MANUAL_MANUAL_H

#include "engine/method/expansion.h"
#include "engine/rewrite/pass.h"

typedef enum manual_move_kind {
    MANUAL_SUBSTITUTE,
    MANUAL_PARTS,
    MANUAL_REPEAT_PARTS,
    MANUAL_DIFFERENTIATE,
    MANUAL_INTEGRATE_BACK,
    MANUAL_SPLIT,
    MANUAL_ROTATE,
    MANUAL_EXPAND,
    MANUAL_TERMWISE,
    MANUAL_REWRITE, /* by a rule or a pass */
    MANUAL_SWAP,
    MANUAL_MOVE_COUNT
} manual_move_kind;

/* One move. Expressions name the variables of the form by their symbols. */
typedef struct manual_move {
    manual_move_kind kind;
    expr *symbol;      /* SUBSTITUTE: the variable; DIFFERENTIATE, INTEGRATE_BACK: the parameter */
    expr *fresh;       /* SUBSTITUTE: the new variable */
    expr *value;       /* SUBSTITUTE: what takes the variable's place; PARTS, EXPAND: the factor; SPLIT: the point;
                        * ROTATE: the angle; INTEGRATE_BACK: the value from which */
    expr *extra;       /* SUBSTITUTE: the inverse or NULL; EXPAND: the point */
    slong count;       /* REPEAT_PARTS: times; EXPAND: terms */
    slong which;       /* in integral K, from 1; 0: every integral that it fits */
    bool goes_on;      /* REPEAT_PARTS: not the first time of its line; undone with the one before */
    const char *words; /* as typed; in the engine's arena */
    pass *pass;        /* REWRITE: held by the derivation once the move is made */
} manual_move;

/* One integral of the form. */
typedef struct manual_term {
    expr *outside;    /* free of the variable */
    expr *integral;   /* EXPR_INTEGRAL or EXPR_CONTOUR */
    const char *name; /* of its variable, as the user knows it; in the engine's arena */
} manual_term;

typedef struct manual_terms {
    size_t count, room;
    manual_term *list;
} manual_terms;

/* A differentiation that has not been integrated back yet. */
typedef struct manual_pending {
    expr *parameter;
    expr *subject;                /* what the form was equal to before */
    expr *form;                   /* and the form then, as one expression */
    const struct manual_pending *outer;
} manual_pending;

/* The state after some moves. */
typedef struct manual_frame {
    expr *subject;                /* what the form equals: the integral as typed, or its derivative */
    expr *plain;
    manual_terms live, split_off; /* integrals of the form; remainders */
    expr *factor;                 /* what `repeat parts` integrates next, in the symbol `factor_variable`; NULL: nothing yet */
    expr *factor_variable;
    const manual_pending *pending;
    bool converges;               /* the integral as typed is known to converge */
    size_t steps;                 /* of the record, so far */
    size_t tried;                 /* moves so far that were only tried at samples */
} manual_frame;

/* Values of forms at the samples, so that a form is not integrated again for the move after it (verify.c). */
struct manual_values;

typedef struct manual {
    tw_engine *e;
    expr *typed;
    expr *large;          /* NULL: none was declared */
    bool small;
    size_t count, room;   /* frames: count >= 1; frame k is the state after k moves */
    manual_frame *frames;
    manual_move *moves;   /* count - 1 of them */
    derivation record;
    size_t fact_count;    /* facts in force at the beginning or at a move; they may be dropped later */
    expr **facts;
    condition_label *fact_labels;
    unsigned holders;
    struct manual_values *values;
} manual;

/* A derivation that begins with f: an integral, or a sum of terms each with at most one integral as a factor. NULL with
 * the error set: UNSUITABLE when nothing of the form is an integral, DIVERGENT when it is seen not to converge. */
manual *manual_new(tw_engine *e, expr *f);
manual *manual_hold(manual *m);
void manual_release(manual *m); /* NULL: nothing */

const manual_frame *manual_now(const manual *m);
/* Makes the move, or fails with words and changes nothing. */
tw_status manual_apply(manual *m, const manual_move *move);
/* Takes the last move back; false when there is none. */
bool manual_undo(manual *m);

/* The moves of m on another integral of the same shape: a new derivation. The variables of g take the names that those of
 * m's integral had. NULL with the error set, which names the move that failed. */
manual *manual_replay(tw_engine *e, const manual *m, expr *g);

/* The name of the variable of the first integral has the symbol `symbol`? (Is it a variable of the form?) */
bool manual_has_variable(const manual *m, expr *symbol);

/* The form as text, which parses back: without the remainders; remainders alone, joined by signs ("" when none). */
void manual_print_form(const manual *m, text *out);
void manual_print_remainders(const manual *m, text *out);
/* Term k of the live integrals (from 0), and of the remainders behind them. */
void manual_print_term(const manual *m, size_t k, text *out);

/* The form as one expression, remainders included. */
expr *manual_value(const manual *m);

/* All conditions on which the form rests; moves only tried at samples are open conditions among them. */
void manual_conditions(const manual *m, condition_list *out);
/* No open or granted condition, every move proved. */
bool manual_is_proved(const manual *m);

/* The derivation as a rule: the integral as typed becomes the form, remainders included, under the facts about its
 * parameters (they are the rule's variables) and the conditions of the moves. `proved` when every move is proved and no
 * condition is open or granted; else unchecked, to be tried. UNSUITABLE while a differentiation is not integrated back. */
rule *manual_rule(const manual *m, const char *name);

/* Reads the form as an expansion in the large or small parameter: the plain terms, with all integrals as remainder.
 * UNSUITABLE when a plain term is no power of it (with powers of its logarithm and one exponential in front). */
tw_status manual_expansion(const manual *m, expansion *out);

#endif
