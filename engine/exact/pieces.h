/* The working form of a generalised series at x -> 0+: a sum of pieces
 *
 *     constant * factor * x^(sigma + lead) * log(x)^log_power * sum_n c[n] x^(n/den)
 *
 * where `constant` is a product of constants that the coefficients need not know (2^(1/3), exp(a), pi), `factor` a
 * rational function of the parameters (1 unless c is rational), sigma the part of the exponent that is not
 * rational. Pieces differ in (constant, sigma, log_power) or lie on disjoint grids of exponents; each knows its
 * own number of coefficients, since the functions in front of the c's are independent: what is unknown of one says
 * nothing about another. */
#ifndef TW_EXACT_PIECES_H
#define TW_EXACT_PIECES_H

#include "engine/exact/tail.h"

typedef struct piece {
    expr *constant, *factor, *sigma;
    fmpq_t lead;
    slong den;
    slong log_power;
    tail c;
} piece;

typedef struct pieces {
    size_t count;
    piece *at;
    bool real; /* proved real for small x > 0 */
} pieces;

/* One computation of a series: what is being expanded, how far, and what was found on the way. */
typedef struct work {
    tw_engine *e;
    field f;
    expr *x;
    const pieces *binding; /* what x stands for; NULL: x itself */
    slong terms;           /* coefficients wanted of each piece */
    bool thin;             /* some leading coefficient lies beyond what was computed: start again with more terms */
    expr *at_fault;        /* the subexpression in work, for the words of errors */
    expr *shown;           /* the variable as the user knows it */
    int depth;             /* > 0: inside an expression of the engine's own making, which no words should show */
    expr **conditions;
    size_t condition_count;
    struct memo *memo;     /* series.c: subexpressions done */
} work;

void work_init(work *w, tw_engine *e, expr *x, slong terms, slong room);
void work_clear(work *w);
/* Adds "a != 0" for each factor of the value that is not proved nonzero. ERROR_UNDECIDED for a fixed constant. */
tw_status work_need_nonzero(work *w, const element *value);
tw_status work_need(work *w, expr *condition); /* unless known to hold */
void work_blame(work *w, expr *f); /* f is in work */
/* ERROR_UNSUITABLE: "SUBEXPRESSION WORDS at x = 0", unless an error is set or the work is to be started again. */
tw_status work_refuse(work *w, const char *words);

void piece_init(work *w, piece *p); /* 1 * x^0 * 0 */
void piece_clear(work *w, piece *p);
void piece_set(work *w, piece *out, const piece *p);

void pieces_init(pieces *g); /* zero */
void pieces_clear(work *w, pieces *g);
void pieces_set(work *w, pieces *out, const pieces *g);
void pieces_swap(pieces *a, pieces *b);

/* Adds p to g (p is emptied); merges with the pieces of its kind. */
tw_status pieces_push(work *w, pieces *g, piece *p);
/* g = a value free of x. */
tw_status pieces_from_value(work *w, pieces *g, expr *value);
/* g = value * x^exponent * c[0..] in powers of x^(1/den); c is copied. */
tw_status pieces_from_tail(work *w, pieces *g, expr *value, expr *exponent, const tail *c, slong den, bool real);
tw_status pieces_from_monomial(work *w, pieces *g, expr *value, expr *exponent); /* value * x^exponent */

tw_status pieces_add(work *w, pieces *out, const pieces *a, const pieces *b, int sign);
tw_status pieces_mul(work *w, pieces *out, const pieces *a, const pieces *b);
tw_status pieces_scale(work *w, pieces *g, expr *value);
tw_status pieces_derivative(work *w, pieces *out, const pieces *g);
/* The antiderivative without constant term; exponents of g must exceed -1 when `from_zero` (it is then the
 * integral from 0). */
tw_status pieces_integral(work *w, pieces *out, const pieces *g, bool from_zero);
tw_status pieces_pow(work *w, pieces *out, const pieces *g, expr *exponent);

/* All of g on one grid in one piece with c[0] proved nonzero: no logs, one sigma. Thin or refused otherwise. */
tw_status pieces_gather(work *w, piece *out, const pieces *g, const char *refusal);
/* The value in front of the leading power of a gathered piece: constant * factor * c[0]. */
expr *piece_leading(work *w, const piece *p);
/* The exponent sigma + lead. */
expr *piece_exponent(work *w, const piece *p);
/* How many steps of 1/den lie between two exponents, when that is a whole number. */
bool steps_between(slong *steps, const fmpq_t a, const fmpq_t b, slong den);
slong lcm_of(slong a, slong b);
void piece_refine(work *w, piece *p, slong den); /* den a multiple of the old one */
/* c += y^steps d, steps >= 0; d is used up. Where d begins far beyond what is wanted c becomes unknown from there
 * on. */
void tail_add_shifted(work *w, tail *c, tail *d, slong steps);
void piece_strip(work *w, piece *p);             /* moves leading zeros (as polynomials) into the exponent */
/* Strips until c[0] is proved nonzero; thin when nothing known is left. */
tw_status piece_prove_leading(work *w, piece *p);
/* Is the value in front proved nonzero, or may it be called so under conditions (which are recorded)? */
tw_status piece_need_leading(work *w, const piece *p);
/* May K x^a (1 + u) be split into factors under a power or a logarithm? Refused otherwise. */
tw_status piece_need_split(work *w, const piece *p, bool real, bool integer);
void tail_make_monic(work *w, tail *c);          /* c / c[0] */
expr *simplify_value(work *w, expr *a);          /* using which symbols are positive */
/* out = a / g^n, n >= 1: by the recurrence of g's terms. */
tw_status pieces_div(work *w, pieces *out, const pieces *a, const pieces *g, slong n);
/* Puts constant (when `constants`) and factor into the coefficients. */
tw_status piece_fold(work *w, piece *p, bool constants);

#endif
