/* Algebraic numbers written `root of P in r near v`: their polynomial, their exact value, and values brought to lowest
 * terms in the field that they and the parameters generate. Private to the engine. */
#ifndef TW_EXACT_ALGEBRAIC_H
#define TW_EXACT_ALGEBRAIC_H

#include "engine/expr/expr.h"

/* The primitive irreducible polynomial of an EXPR_ROOT over the integers, leading coefficient positive; false when its
 * body is no polynomial with rational coefficients or the root could not be told from the others. */
bool algebraic_polynomial(tw_engine *e, fmpz_poly_t out, expr *root);

/* The number itself. False as above. */
bool algebraic_number(tw_engine *e, qqbar_t out, expr *root);

/* `root of m in r near v` for the real root of the irreducible m that the ball `near` isolates; rational and quadratic
 * ones as numbers and square roots. NULL when an engine error is set. */
expr *algebraic_expr(tw_engine *e, const fmpz_poly_t m, const arb_t near);

/* a, free of the variable at hand, as a quotient of polynomials in its generators in lowest terms, reduced by what is
 * known of them: exactly 0 gives 0 where the relations show it. a itself where that cannot be done. NULL: error set. */
expr *value_canonical(tw_engine *e, expr *a);

#endif
