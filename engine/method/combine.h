/* Arithmetic of expansions: sums, products, quotients, rational powers and logarithms of integrals, as one expansion. */
#ifndef TW_METHOD_COMBINE_H
#define TW_METHOD_COMBINE_H

#include "engine/method/expansion.h"

/* What stands behind a combined expansion: the expression with a symbol in place of each integral, and the integrals'
 * own expansions. Numbers come from them: balls for the symbols give a ball for the form. */
struct combination {
    expr *form;
    size_t count;
    expr **symbols;
    expansion *leaves;
};

/* f: sums, products, rational powers and logarithms of integrals and of factors free of integrals. `terms` nonzero terms
 * as far as those of the integrals reach. UNSUITABLE with the reason where the parts do not combine: logarithms of the
 * large parameter in a factor, ... out is initialised. */
tw_status combine(tw_engine *e, expansion *out, expr *f, slong terms);

void combination_free(struct combination *c);

#endif
