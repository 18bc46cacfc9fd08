/* Functions of a generalised series at 0+. Each function of the table that has a power series where its argument
 * goes. */
#ifndef TW_EXACT_COMPOSE_H
#define TW_EXACT_COMPOSE_H

#include "engine/exact/pieces.h"

/* An argument g = value + u(x^(1/den)), u(0) = 0: what an analytic function needs. */
typedef struct argument {
    expr *value;
    tail u;
    slong den;
    bool real;
} argument;

void argument_init(argument *a);
void argument_clear(work *w, argument *a);
/* Refused when g has logs, symbolic or negative powers. */
tw_status argument_split(work *w, argument *a, const pieces *g);

/* out = value * outer(y), y = x^(1/den): the tail is a series in u's variable. */
tw_status pieces_from_argument(work *w, pieces *out, const argument *a, expr *value, const tail *c);

tw_status compose_exp(work *w, pieces *out, const pieces *g);
tw_status compose_log(work *w, pieces *out, const pieces *g);
/* Sign of g for small x > 0: +1, -1, 0 when g is exactly zero. ERROR_UNSUITABLE when it is not known. */
tw_status pieces_sign(work *w, int *sign, const pieces *g);

/* call(args): call is the EXPR_CALL, args the series of its arguments. */
tw_status compose_call(work *w, pieces *out, expr *call, const pieces *args);
/* Those of special.c and, of them, those of cylinder.c; compose_call hands over. */
tw_status compose_special(work *w, pieces *out, expr *call, const pieces *args);
tw_status compose_cylinder(work *w, pieces *out, expr *call, const pieces *args);

/* ---- outer series: f(c + u) as a power series in u (special.c) ---- */

/* How many of its coefficients are wanted: u begins with x^(1/den) at least. */
slong outer_length(const work *w);
/* outer[k] = make(e, host, k), each a value free of x. */
typedef expr *(*coefficient_maker)(tw_engine *e, const void *host, slong k);
tw_status outer_from_exprs(work *w, tail *outer, coefficient_maker make, const void *host);
/* out = value * outer(u). */
tw_status push_outer(work *w, pieces *out, const argument *a, expr *value, const tail *outer);
/* out += value */
tw_status add_value(work *w, pieces *out, expr *value);

/* out = f(g) = f(value) + integral of f'(g) g', for an f(z) whose derivative in z is elementary; the integrand has
 * to be integrable at 0. `value` is f at the limit of g. */
tw_status compose_by_derivative(work *w, pieces *out, expr *f, expr *z, const pieces *g, expr *value);

/* series.c: the series of f, x standing for w->binding; and of a body in which `symbol` stands for `value`. */
tw_status evaluate_pieces(work *w, pieces *out, expr *f);
tw_status evaluate_bound(work *w, pieces *out, expr *body, expr *symbol, const pieces *value);

#endif
