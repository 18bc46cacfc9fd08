/* What the files that answer requests share: reading the parts of a statement, failing at a place. Inside lang only. */
#ifndef TW_LANG_REQUEST_H
#define TW_LANG_REQUEST_H

#include "lang/session.h"

/* Fails at a place of the statement. */
tw_status request_fail(session *s, span at, error_kind kind, const char *format, ...)
    __attribute__((format(printf, 4, 5)));
/* Returns TW_ERROR for an error that the engine has set; `at` becomes its place. */
tw_status request_fail_at(session *s, span at);
/* "`plot` is not available in this version" */
tw_status request_unavailable(session *s, span at, const char *words);

/* "no method is called `x`; did you mean `y`?", or the list of what there is. */
tw_status request_no_such(session *s, syntax_name wrong, const char *what, const char *const *names, size_t count);

/* What a request is about: an expansion or another kept value, or an expression. */
typedef struct subject {
    char *name;       /* its name, or the expression as typed */
    bool is_name;
    value *kept;      /* held; NULL: an expression */
    expr *expression; /* of an expression or a kept expression; else NULL */
} subject;

tw_status subject_read(session *s, subject *out, const syntax *x);
/* The same, and an error with advice unless it is an expansion. */
tw_status subject_read_expansion(session *s, subject *out, const syntax *x);
void subject_clear(subject *x);

/* May a statement define this name here? Sets the error when not: a declared parameter, the large one. */
tw_status request_may_define(session *s, syntax_name name);

/* The points of `at s = 3, 10, nu = 1/3`: every combination of the values, the first binding changing slowest; or the rows of
 * a table. */
typedef struct points {
    size_t width, count; /* symbols; points */
    expr **symbols;
    expr **values;       /* of point k: values + k*width */
    struct points_table *table; /* the file they come from, or NULL */
} points;

/* What needs the points: its name, the expression whose symbols must all get a value, facts that the values must not
 * contradict. */
typedef struct points_use {
    const char *name;
    expr *f;
    expr *const *facts;
    size_t fact_count;
} points_use;

tw_status points_read(session *s, points *out, const syntax_bindings *at, span place, const points_use *use);
/* The same from a CSV file: the heading names the parameters, each row is a point, each cell a value in the language. */
tw_status points_read_file(session *s, points *out, const char *path, span place, const points_use *use);
void points_clear(points *p);
env points_at(const points *p, size_t k); /* borrows from p */
/* Adds the value of column c at point k as short as it can be said exactly: as it stood in the file, 5.25, or an expression. */
void points_print_value(session *s, text *out, const points *p, size_t k, size_t c);
/* After a failure at point k: the error's words, or its place, say which point it was. */
void points_blame(session *s, const points *p, size_t k);

/* Each answers one kind of statement; the kept value is left in *keep unless keep is NULL. */
typedef tw_status request_function(session *s, const statement *st, result *r, value **keep);
request_function request_large, request_small, request_given, request_grant, request_let, request_use, request_show,
    request_drop, request_expand, request_steps, request_coefficients, request_remainder, request_evaluate, request_compare,
    request_write, request_help, request_quit, request_derive, request_move, request_done, request_undo, request_replay,
    request_expansion_of, request_rule_from;
request_function request_recurrence, request_check_recurrence, request_growth;
/* "  the terms are least near n = s/2; the error there is about exp(-s)", where that is known soon. */
tw_status growth_tell_least(session *s, result *r, expansion *a);
request_function request_rule, request_pass, request_rewrite, request_check_rule, request_check_file, request_why_not;

/* The steps of the open derivation, or an error when none is open; the steps of a kept one. */
tw_status derivation_steps(session *s, result *r, span at);
void derivation_tell_steps(session *s, result *r, const char *name, const manual *m);
/* Everything about a derivation, for `show`; of the open one. */
void derivation_show(session *s, result *r, const char *name, const manual *m);
tw_status derivation_show_open(session *s, result *r, span at);

/* What `expand` and `expansion of` say of what they made. title: how the series line begins. */
tw_status request_tell_expansion(session *s, result *r, const char *name, const char *title, value *v);

/* Runs the request behind `let NAME =`, or says that it is not available. */
tw_status request_run(session *s, const statement *st, result *r, value **keep);

#endif
