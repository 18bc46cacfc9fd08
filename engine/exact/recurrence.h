/* Linear recurrences with polynomial coefficients,
 *
 *     a_0(n) c[n] + a_1(n) c[n+1] + ... + a_r(n) c[n+r] = 0   for n >= 0 but those that are left out,
 *
 * over Q or over the rational functions of the field's generators. What a recurrence rests on is its maker's business:
 * the label says it. */
#ifndef TW_EXACT_RECURRENCE_H
#define TW_EXACT_RECURRENCE_H

#include "engine/ball/tape.h"
#include "engine/exact/hyper.h"

typedef enum recurrence_label { RECURRENCE_PROVED, RECURRENCE_FITTED } recurrence_label;
const char *recurrence_label_word(recurrence_label l); /* "proved", "fitted" */

/* One identity behind a proved recurrence: sum_j c_j p^(-h j) F = d/dx (R F) with F = q p^(-(z + h n)); c_j, z and h are
 * the recurrence's. */
typedef struct certificate {
    expr *x, *q, *p, *r;
} certificate;

typedef struct recurrence {
    field *f;              /* owned */
    expr *n;               /* the index, a generator of f */
    slong variable;        /* of n */
    slong order;
    fmpz_mpoly_struct *a;  /* order + 1, without a common factor */
    slong degree;          /* the greatest degree in n */
    fmpz_poly_struct *p;   /* the same over Z when n is the only generator in use, else NULL */
    slong void_count;      /* n >= 0 at which the identity behind it is void */
    slong *voids;
    slong needed;          /* so many first values, c[0] ..., must come from elsewhere */
    recurrence_label label;
    slong tried;           /* fitted: on so many coefficients that were not used */
    /* proved ones */
    expr *z;
    slong h;
    expr **c;              /* of the certificates' identity, order + 1 */
    size_t certificate_count;
    certificate *certificates;
} recurrence;

/* Takes over f, and a (order + 1 entries made in f, which is made primitive here). `voided` (may be NULL): a polynomial
 * where the identity behind it is void. */
recurrence *recurrence_new(tw_engine *e, field *f, expr *n, fmpz_mpoly_struct *a, slong order, const fmpz_mpoly_t voided);
void recurrence_free(recurrence *r);

/* Over Q: c[known ..] up to count - 1 from the earlier ones; known >= r->needed and >= r->order. c has `count`
 * initialised entries. TW_ERROR with the engine's error when the budget is out. */
tw_status recurrence_extend(tw_engine *e, const recurrence *r, fmpq *c, slong known, slong count);

/* The first n in 0 .. count - 1 - order, voids left out, at which the coefficients do not fit; -1 when all do; -2 with
 * the engine's error set. c: expressions; at (may be NULL): values of the parameters, put in already in c. */
slong recurrence_misfit(tw_engine *e, const recurrence *r, const env *at, expr *const *c, slong count);
/* a_r c[n+r] and minus the other terms at this n. */
void recurrence_sides(tw_engine *e, const recurrence *r, const env *at, expr *const *c, slong n, expr **left,
                      expr **right);

/* a_j factored, as an expression in n. */
expr *recurrence_coefficient(tw_engine *e, const recurrence *r, slong j);
/* "c[n+1] = -(2*n + 1)^2 * c[n]" */
tw_status recurrence_print(tw_engine *e, text *out, const recurrence *r);
/* Integer roots >= 0 of p in n that do not depend on the other generators, into a fresh sorted array. */
slong *polynomial_roots(const field *f, slong variable, const fmpz_mpoly_t p, slong *count);
/* A polynomial, factored, as an expression; NULL with the error set. */
expr *polynomial_factored(tw_engine *e, field *f, const fmpz_mpoly_t p);

#endif
