/* Formats for other programs (export.md). A format is one file with one struct `format` at its end and one line in format.c.
 * Everything is text first; putting it on the disk is the host's. */
#ifndef TW_EXPORT_FORMAT_H
#define TW_EXPORT_FORMAT_H

#include "engine/manual/manual.h"
#include "engine/numeric/evaluate.h"

typedef struct format {
    const char *name;   /* the word after `as`: json, csv, text */
    const char *summary;
    /* name: what the user calls the expansion; r: its remainder (never NULL; label may be unknown). */
    tw_status (*write)(tw_engine *e, text *out, const char *name, expansion *a, const remainder_bound *r);
} format;

const format *const *format_table(size_t *count);
const format *format_find(const char *name);
bool format_is_planned(const char *name); /* latex, c */

/* A derivation by hand as one JSON object. */
tw_status derivation_json(tw_engine *e, text *out, const char *name, const manual *m);

/* Pieces shared by json.c and lang's --results json: RFC 8259 strings, balls as decimals whose ball holds the engine's. */
void json_string(text *out, const char *words);                 /* null for NULL */
void json_expr(tw_engine *e, text *out, expr *a);               /* its text as a string; null for NULL */
/* The ball as two decimals, rounded so that the ball they name holds x; "inf" radius when x is unbounded. */
void decimal_ball(text *mid, text *radius, const arb_t x);
void json_ball(text *out, const arb_t x);                       /* {"mid": "...", "radius": "..."} */
void json_conditions(text *out, const condition_list *c);       /* [{"text": ..., "label": ...}] */
void json_number(text *out, const char *of, const env *at, const number *n, tw_engine *e); /* export.md "A number" */
/* The words as one field of CSV, in quotes where RFC 4180 wants them. */
void csv_field(text *out, const char *words);
/* A real ball for people: "0.0990741 +/- 4.5e-6", digits chosen by the radius, at most `digits` significant ones. */
void print_ball(text *out, const arb_t x, slong digits);

#endif
