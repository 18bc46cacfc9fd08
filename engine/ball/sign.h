/* Private to engine/ball: signs by structure. */
#ifndef TW_BALL_SIGN_H
#define TW_BALL_SIGN_H

#include "engine/expr/expr.h"

/* The signs that a real value may have; SIGN_ANY when nothing is known (also when it may not be real). */
enum { SIGN_NEGATIVE = 1, SIGN_ZERO = 2, SIGN_POSITIVE = 4, SIGN_ANY = 7 };

/* What is known of some symbols beyond the facts. */
typedef struct sign_context {
    size_t count;
    expr **symbols;
    int *signs;
} sign_context;

/* Signs that f can have when its symbols take any values that facts and context allow. Sound: a sign not in the
 * result never occurs. f == NULL: SIGN_ANY. Depth of the walk is bounded by the expression's depth limit. */
int sign_of(tw_engine *e, expr *f, const sign_context *c);

/* The signs of a product and of a sum from those of the parts. */
int sign_times(int a, int b);
int sign_plus(int a, int b);
/* Is the value real whatever the real symbols are? false: not seen. */
bool sign_is_real(tw_engine *e, expr *a);

/* Forgets an error of the question just tried; an exhausted budget or an interrupt stays. */
void forgive_trouble(tw_engine *e);

/* Each symbol of f with a known finite end a is replaced by a +- (a fresh symbol of known sign), and the sum
 * expanded: brings nu + 1 with nu > -1/2 to 1/2 + w. The context takes the fresh symbols in; its arrays are the
 * caller's to free. */
expr *sign_shift(tw_engine *e, expr *f, sign_context *c);

/* Signs of f under the facts alone: as it stands, and shifted. */
int sign_by_structure(tw_engine *e, expr *f);

#endif
