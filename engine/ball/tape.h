/* An expression as a function on complex balls: compiled once into a tape, run many times. Also as a power series
 * (jet). Every ball result encloses the exact value; where no enclosure is known the result is non-finite
 * (acb_indeterminate), never wrong. Knows nothing of integrals' methods. */
#ifndef TW_BALL_TAPE_H
#define TW_BALL_TAPE_H

#include "engine/expr/expr.h"

typedef struct tape tape;

/* Compiles f as a function of vars[0..n-1] (symbols). Integrals and sums with numeric ends inside f are allowed: they
 * are evaluated by quadrature / summation when closed. ERROR_VALUE when f has other symbols (named in the words),
 * NULL then. */
tape *tape_new(tw_engine *e, expr *f, expr *const *vars, size_t n);
void tape_free(tape *t);

/* out = f(at[0], ..., at[n-1]). With analytic true the result is finite only if f is analytic (holomorphic in every
 * variable jointly, no branch cut touched) on the whole product of balls; that is the flag of acb_calc_integrate. */
void tape_eval(acb_t out, tape *t, acb_srcptr at, bool analytic, slong prec);

/* out = power series of f(at[0] + y, at[1], ...) modulo y^len; coefficients are balls that hold the exact Taylor
 * coefficients for every point of the ball at[0]. Non-finite where not analytic there. out has len entries,
 * initialised. */
void tape_jet(acb_ptr out, tape *t, acb_srcptr at, slong len, slong prec);

/* The value of a closed expression (no symbols, no integrals unless they can be evaluated). */
tw_status ball_value(tw_engine *e, acb_t out, expr *f, slong prec);

/* Values of parameters. */
typedef struct env {
    size_t count;
    expr **symbols;
    expr **values; /* closed expressions; exact as typed */
} env;

#endif
