/* Numbers from expansions: partial sums, the number of terms to keep, and the comparison with certified quadrature. */
#ifndef TW_NUMERIC_EVALUATE_H
#define TW_NUMERIC_EVALUATE_H

#include "engine/numeric/bound.h"

typedef struct number {
    acb_t value;             /* encloses the integral when label is proved (or exact) */
    label label;
    const char *manner;
    const char *way;         /* "expansion", "quadrature", "summation" */
    slong terms;             /* kept; -1 when not from an expansion */
    slong least_term;        /* index n (in order of size, from 0) of the least term at this s; -1 unknown */
    slong terms_known;       /* how many terms the expansion has */
    char *reason;            /* for estimated, unknown */
    condition_list conditions;
} number;
void number_init(number *n);
void number_clear(number *n);

typedef struct evaluate_options {
    slong digits;            /* relative digits wanted; 0: the best that the expansion gives */
    slong terms;             /* M, or -1: the number of terms with the least bound */
    bool all_contributions;
} evaluate_options;

/* evaluate A at ...: encloses the true value. digits that cannot be had: ERROR_PRECISION whose words say the best that can be had
 * there, from which value of the large parameter on the digits can be had, and that `evaluate INTEGRAL` gives them. */
tw_status evaluate_expansion(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o);

/* The same for a combined expansion: the parts' balls, combined. */
tw_status combined_number(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o);

typedef struct comparison_row {
    slong terms;             /* kept */
    acb_t term;              /* the last kept term, the sum, certified value, true error = value - sum */
    acb_t sum, value, error;
    arb_t bound;             /* upper bound of |error| */
    label label;
    bool violated;           /* a proved bound that the certified value contradicts: must never happen */
} comparison_row;

typedef struct comparison {
    env at;                  /* the point (owns its arrays) */
    size_t count;
    comparison_row *rows;    /* a row a number of kept terms, from 1 to what the expansion has (at most 40 around the least) */
    slong best;              /* row with the least bound */
} comparison;
void comparison_init(comparison *c);
void comparison_clear(comparison *c);
tw_status compare_expansion(tw_engine *e, comparison *out, expansion *a, const env *at);

#endif
