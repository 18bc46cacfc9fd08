/* The field of coefficients beyond the rationals: rational functions over Q of generators. A generator is a
 * parameter (a symbol) or an atom that the field does not look into (pi, exp(1), 2^(1/3), a^b, psi(1/3)).
 * Algebraic atoms carry their relation (g^3 = 2, i^2 = -1, cos(c)^2 = 1 - sin(c)^2), by which elements are
 * reduced. Other relations among constants are not known to the field: an element that is not the zero polynomial
 * is proved nonzero by field_is_zero, never assumed so. */
#ifndef TW_EXACT_FIELD_H
#define TW_EXACT_FIELD_H

#include "engine/exact/series.h"

typedef struct generator {
    expr *atom;
    bool parameter; /* a symbol */
    bool closed;    /* no symbols inside */
    slong degree;   /* atom^degree is a polynomial in earlier generators; 0: no relation */
    fmpz_mpoly_t relation; /* atom^degree - that polynomial */
    bool valued;
    acb_t value;    /* its ball at a sample of the parameters, once `valued` */
} generator;

typedef struct field {
    tw_engine *e;
    fmpz_mpoly_ctx_t ctx; /* generator k is variable room - 1 - k, so that later ones lead in the lexicographic order */
    slong room, count;
    generator *generators;
    bool full;            /* a generator more than `room` was needed: the caller starts again with a wider field */
} field;

typedef fmpz_mpoly_q_struct element;

void field_init(field *f, tw_engine *e, slong room);
void field_clear(field *f);

void element_init(field *f, element *a);
void element_clear(field *f, element *a);

/* A fresh array of n zeros, and back. */
element *elements_new(field *f, slong n);
void elements_free(field *f, element *a, slong n);

/* out = a, an expression free of x. TW_ERROR with f->full set and no engine error when the field is too narrow; with
 * ERROR_VALUE on division by zero. */
tw_status field_from_expr(field *f, element *out, expr *a);
expr *field_to_expr(field *f, const element *a); /* NULL when an engine error is set */

void field_mul(field *f, element *out, const element *a, const element *b);
void field_div(field *f, element *out, const element *a, const element *b); /* b not the zero polynomial */
tw_status field_pow(field *f, element *out, const element *a, slong n);     /* a not the zero polynomial when n < 0 */
/* out += a*b and out -= a*b */
void field_addmul(field *f, element *out, const element *a, const element *b);
void field_submul(field *f, element *out, const element *a, const element *b);

bool field_is_rational(const element *a, field *f, fmpq_t value);

/* Is the element zero for all values of the parameters? YES: proved; NO: proved not identically zero (nonzero at some
 * value); UNKNOWN. */
answer field_is_zero(field *f, const element *a);

/* Which generators an element holds, as a domain. */
domain_kind field_domain(field *f, const element *a);

/* Nonconstant irreducible factors of the numerator, as expressions, into a fresh array (free() it). */
tw_status field_numerator_factors(field *f, const element *a, expr ***factors, size_t *count);

#endif
