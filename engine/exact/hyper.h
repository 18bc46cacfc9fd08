/* Hyperexponential terms: F(x) = prod base_i^power_i * exp(exponent) with polynomials base_i, powers free of x, and a
 * rational function `exponent`, all over Q of the field's generators. F'/F is rational. Constant factors are dropped: F
 * is known up to a factor free of x. */
#ifndef TW_EXACT_HYPER_H
#define TW_EXACT_HYPER_H

#include "engine/exact/field.h"

typedef struct hyper_factor {
    fmpz_mpoly_struct base; /* irreducible, primitive, of positive degree in x */
    element power;          /* free of x */
} hyper_factor;

typedef struct hyper {
    field *f;
    expr *x;
    slong variable; /* of x in f->ctx */
    slong count;
    hyper_factor *factors;
    element exponent;
    expr *at_fault; /* after a refusal: the part that is not of this kind */
} hyper;

/* x becomes a generator of f. TW_ERROR with f->full when the field is too narrow. */
tw_status hyper_init(hyper *h, field *f, expr *x);
void hyper_clear(hyper *h);

/* The variable of a generator in f->ctx; -1 when the field has no such generator. */
slong field_variable(const field *f, expr *atom);

/* out = a as a rational function of x. TW_ERROR without an engine error (at_fault set, or f->full) when it is none. */
tw_status hyper_rational(hyper *h, element *out, expr *a);

/* h *= a^weight, weight free of x. TW_ERROR without an engine error when a is not hyperexponential. */
tw_status hyper_multiply(hyper *h, expr *a, const element *weight);

/* h *= (num/den)^weight for a rational function of x. */
tw_status hyper_multiply_rational(hyper *h, const element *a, const element *weight);

/* out = F'/F */
void hyper_log_derivative(const hyper *h, element *out);

/* out = d a/dx for a rational function. */
void element_derivative(field *f, element *out, const element *a, slong variable);

#endif
