/* How the large parameter enters a body: body dx = factor * amplitude(t) * exp(-large^power * phase(t)) dt with
 * x = large^stretch * t. Private to this room. */
#ifndef TW_METHOD_SCALE_H
#define TW_METHOD_SCALE_H

#include "engine/expr/expr.h"
#include "engine/expr/facts.h"

typedef struct separation {
    expr *variable;          /* t; x itself when the stretch is 0 */
    expr *from, *to;         /* of t */
    expr *factor;            /* free of t */
    expr *amplitude, *phase; /* free of the large parameter */
    fmpq_t power, stretch;   /* power > 0, for a small parameter < 0 */
} separation;

void separation_init(separation *s);
void separation_clear(separation *s);

/* Tries stretch 0 (unless `stretched`), then the exponents at which large and x meet in the body or the ends. x runs over (from, to).
 * ERROR_UNSUITABLE or UNAVAILABLE with the reason and advice when nothing separates them. */
tw_status body_separate(tw_engine *e, separation *out, expr *body, expr *x, expr *from, expr *to, expr *large,
                        bool small, bool stretched);

/* expr_normal with all symbols that the facts make positive, and those of `more`. */
expr *normal_under_facts(tw_engine *e, expr *a, expr *const *more, size_t count);

/* a = symbol^power * rest with the rest as free of the (positive) symbol as can be: sums give up common powers. */
expr *draw_power(tw_engine *e, expr *a, expr *symbol, fmpq_t power);

#endif
