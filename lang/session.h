/* A session: the engine, what is declared in it, what names stand for. It runs one statement after another and gives each
 * a result; it prints nothing. A statement that fails leaves the session as it was. */
#ifndef TW_LANG_SESSION_H
#define TW_LANG_SESSION_H

#include <stdbool.h>

#include "engine/manual/manual.h"
#include "engine/method/expansion.h"
#include "engine/numeric/evaluate.h"
#include "engine/rewrite/pass.h"
#include "lang/lower.h"
#include "lang/result.h"
#include "lang/syntax.h"

typedef enum value_kind {
    VALUE_EXPRESSION, /* integrals, too */
    VALUE_FUNCTION,
    VALUE_EXPANSION,
    VALUE_DERIVATION, /* by hand */
    VALUE_RULE,
    VALUE_PASS,
    VALUE_RESULT,     /* what a request gave that is no expression: a number, a table, steps */
} value_kind;

typedef struct value {
    value_kind kind;
    unsigned holders;      /* names and running requests that hold it */
    expr *expression;      /* EXPRESSION */
    lower_function function; /* FUNCTION, with the names of its parameters to print */
    char **parameter_names;
    expansion expansion;   /* EXPANSION */
    manual *derivation;    /* DERIVATION */
    rule *rule;            /* RULE, held */
    pass *pass;            /* PASS, held */
    char *text;            /* PASS: as it is typed */
    char *file;            /* PASS: where it was read, or NULL */
    unsigned line;
    condition_list conditions; /* EXPRESSION: what it rests on when it was rewritten */
    result result;         /* RESULT */
    const char *what;      /* RESULT: "a number", "a table of coefficients", ...; DERIVATION: "a derivation" */
} value;

value *value_new(value_kind kind);
value *value_hold(value *v);
void value_release(value *v); /* NULL: nothing */
value *value_of_result(const result *r, const char *what); /* keeps a copy */
/* An expression or a function as the statement that would define it, without `let`. */
void value_print(tw_engine *e, text *out, const char *name, const value *v);

/* What names stand for. */
typedef struct name_entry {
    char *name;
    value *value;
} name_entry;

typedef struct name_table {
    size_t count, room;    /* room: a power of two, open addressing; an entry without a name is free */
    name_entry *entries;
} name_table;

value *names_find(const name_table *t, const char *name); /* borrowed; NULL when it means nothing */
void names_set(name_table *t, const char *name, value *v); /* takes a hold over */
bool names_drop(name_table *t, const char *name);
void names_clear(name_table *t);
void names_each(const name_table *t, void (*take)(void *host, const char *name), void *host);

/* A place in a file that a statement read; name NULL: none. */
typedef struct session_elsewhere {
    char *name;
    text bytes;
    span at;
} session_elsewhere;

typedef struct session {
    tw_engine *e;
    name_table names;
    name_table rules;      /* rules and passes: they have names of their own */
    name_table files;      /* by path: those that `use` has run, each once */
    slong digits;          /* significant digits: of tables, and of `evaluate INTEGRAL` without `to D digits` */
    bool json;             /* the object of a result is wanted: an expansion's holds its bound, which takes time */
    const char *folder;    /* where `use "FILE"` looks: the folder of the file that runs, "" for the working folder */
    const char *file;      /* the file that runs, or NULL */
    unsigned line;         /* where in it the running statement begins */
    struct verdicts *verdicts; /* lang/verdicts.h; NULL: not read yet */
    condition_list rests;  /* what the names met in this statement rest on: rewritten by rules that are not proved, ... */
    expr *current;         /* the expression that was rewritten last, for `why not`; NULL: none */
    bool quit;             /* `quit` has run */
    span at;               /* after a failure: where in the statement's source */
    session_elsewhere elsewhere; /* after a failure in a file that the statement read: where in that */
    bool met_expansion; /* names of expansions stood in the expression; met_terms: the most terms that one of them has */
    slong met_terms;
    manual *open;          /* the derivation that `derive` opened; NULL: none */
    char *open_name;       /* what it is of: a name, or the integral as typed */
    bool open_is_name;
    bool reads_move;       /* a move is being read: the variables of the form hide what is defined */
    const char *move_new;  /* and so does the new variable of a substitution */
    const char *let_name;  /* the name behind a `let` whose request runs, else NULL */
    /* Runs a file for `use` and says whether all of it succeeded; set by the host. */
    tw_status (*run_file)(void *host, const char *path);
    void *host;
} session;

enum { SESSION_DIGITS = 10, SESSION_DIGITS_LIMIT = 1000000 };

tw_status session_init(session *s); /* TW_ERROR: no memory for an engine */
void session_clear(session *s);

/* The state that names and facts have now, and the end of it: back to it, or on from here. */
typedef struct session_mark {
    struct facts *facts;
    bool with_names;
    name_table names, rules, files;
} session_mark;
void session_mark_set(session *s, session_mark *m, bool with_names);
void session_mark_end(session *s, session_mark *m, bool back);

/* Runs a statement; r is initialised and filled. On failure the engine holds the error, s->at its place, and r holds what is
 * to be shown nevertheless (nothing, but for a refuted comparison). */
tw_status session_run(session *s, const statement *st, result *r);

/* What a running statement does, for the progress line: "expand F to 8 terms". */
void session_describe(const statement *st, text *out);

/* A lowering in which names mean what they mean now; its end, whose failure's place becomes the session's. */
void session_lowering_start(session *s, lowering *l);
tw_status session_lowering_end(session *s, lowering *l, bool good, span whole);

/* The expression that x means now, names put in; NULL with the error set. */
expr *session_lower(session *s, const syntax *x);
tw_status session_lower_function(session *s, const syntax_name *parameters, size_t count, const syntax *body,
                                 lower_function *out);
/* Appends the relations that a condition says: `0 < p < 1` says two. */
tw_status session_lower_condition(session *s, const syntax *x, lower_conditions *out);
tw_status session_lower_count(session *s, const syntax *x, const char *what, slong least, slong most, slong *out);

/* The error that is set, or about to be, lies in another text: copies its name and bytes. */
void session_blame(session *s, const source *other, span at);
void session_forget_blame(session *s);

/* Is something declared of the symbol: a fact, or that it is the large or small parameter? */
bool session_declares(session *s, expr *symbol);

/* The error that a name means nothing, with the nearest name that does. */
tw_status session_unknown_name(session *s, syntax_name name);

/* Out of time, memory or patience, or broken: an error that nobody may pass over. */
bool error_is_fatal(error_kind kind);

#endif
