/* What a request gives back: built once, shown as text for people or as one JSON object on a line for programs. */
#ifndef TW_LANG_RESULT_H
#define TW_LANG_RESULT_H

#include <stdbool.h>
#include <stdio.h>

#include "engine/base/text.h"
#include "engine/rewrite/derivation.h"

typedef struct result {
    text object; /* the JSON object up to, without, its closing brace */
    text words;  /* lines of text, each with its line end */
    size_t width; /* where expressions and prose are wrapped */
    bool echo;   /* answers a declaration or a definition: silent under --quiet */
} result;

enum { RESULT_WIDTH = 120 };

/* Starts a result of this kind, the word of the member "result". */
void result_init(result *r, const char *kind);
void result_clear(result *r);
/* Forgets what was put in and starts again. */
void result_restart(result *r, const char *kind);
/* Takes over a finished JSON object "{...}" (white space around it allowed) in place of the members so far. */
void result_object(result *r, const char *object);

/* Members of the JSON object. */
void result_string(result *r, const char *name, const char *words); /* NULL: null */
void result_integer(result *r, const char *name, long value);
void result_truth(result *r, const char *name, bool value);
void result_json(result *r, const char *name, const char *json);    /* a value that is JSON already */

/* Lines of the text. */
void result_line(result *r, const char *form, ...) __attribute__((format(printf, 2, 3)));
/* The same, wrapped where it is too long: an expression behind operators, prose at blanks (lang/wrap.h). */
void result_expression(result *r, const char *form, ...) __attribute__((format(printf, 2, 3)));
void result_prose(result *r, const char *form, ...) __attribute__((format(printf, 2, 3)));
/* An expression with how it is known behind it, the label in its own column. */
void result_labelled(result *r, const char *words, const char *known, const char *manner);
/* Conditions below a result: "  rests on: nu > -1 (granted)". The open and granted ones only: on what is proved or given
 * nothing rests that the user must look at. */
void result_conditions(result *r, const condition_list *conditions);

/* Writes one of the two faces; false when the stream is broken. */
bool result_show(const result *r, FILE *out, bool json);

/* JSON in pieces: the comma that is due before the next member or element, the name of a member. */
void json_next(text *t);
void json_member(text *t, const char *name);

/* A table: columns as wide as their widest cell, cells to the left. */
typedef struct table {
    size_t columns, count, room; /* count: cells so far, the headings first */
    char **cells;
} table;

void table_init(table *t, size_t columns);
void table_clear(table *t);
void table_cell(table *t, const char *words);
void table_take(table *t, text *words); /* the cell is what words holds; words is empty after it */
void table_print(const table *t, text *out, const char *indent);

#endif
