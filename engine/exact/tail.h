/* A power series in one variable y, c[0] + c[1] y + ... with `known` coefficients known (TAIL_EXACT: a polynomial,
 * all of them), either rational (fmpq_poly) or in the field. Functions take the number n of coefficients wanted;
 * results are rational when all operands are. */
#ifndef TW_EXACT_TAIL_H
#define TW_EXACT_TAIL_H

#include "engine/exact/field.h"

#define TAIL_EXACT WORD_MAX

typedef struct tail {
    slong known;
    slong offset,
        gap; /* proved: c[n] = 0 unless n = offset modulo gap; gap 0: unless n = offset. Parity survives truncation */
    bool rational;
    fmpq_poly_t q; /* rational */
    slong count;   /* not rational: stored elements; the further known ones are zero */
    element *m;
} tail;

void tail_init(tail *t); /* zero, exact, rational */
void tail_clear(field *f, tail *t);
void tail_set(field *f, tail *out, const tail *a);
void tail_swap(tail *a, tail *b);
void tail_set_q(field *f, tail *out, const fmpq_t c);      /* the constant c, exact */
void tail_set_element(field *f, tail *out, const element *c);
slong tail_length(const tail *t);                          /* stored coefficients */
bool tail_coefficient_is_zero(const tail *t, field *f, slong k); /* as a polynomial in the generators */
void tail_coefficient(field *f, element *out, const tail *t, slong k);
bool tail_coefficient_q(field *f, fmpq_t out, const tail *t, slong k); /* false when it is not rational */
expr *tail_coefficient_expr(field *f, const tail *t, slong k);

void tail_promote(field *f, tail *t);                      /* into the field */
bool tail_class_is_zero(const tail *t, slong r, slong h);  /* proved: all c[n] with n = r modulo h vanish */
void tail_demote(field *f, tail *t);                       /* back to the rationals if all coefficients are */
void tail_truncate(field *f, tail *t, slong n);            /* at most n known */
void tail_shift(field *f, tail *t, slong k);               /* times y^k; k < 0 drops coefficients, which must be zero */
void tail_stretch(field *f, tail *t, slong g);             /* y -> y^g */

void tail_add(field *f, tail *out, const tail *a, const tail *b, int sign);
void tail_scale_q(field *f, tail *t, const fmpq_t c);
void tail_scale(field *f, tail *t, const element *c);
void tail_mul(field *f, tail *out, const tail *a, const tail *b, slong n);
void tail_div(field *f, tail *out, const tail *a, const tail *b, slong n);  /* b[0] != 0 */
void tail_pow_q(field *f, tail *out, const tail *a, const fmpq_t r, slong n); /* a[0] = 1 */
void tail_pow(field *f, tail *out, const tail *a, const element *r, slong n); /* a[0] = 1 */
void tail_log(field *f, tail *out, const tail *a, slong n);                 /* a[0] = 1 */
void tail_exp(field *f, tail *out, const tail *u, slong n);                 /* u[0] = 0 */
void tail_sin_cos(field *f, tail *s, tail *c, const tail *u, slong n, int hyperbolic); /* u[0] = 0 */
void tail_compose(field *f, tail *out, const tail *outer, const tail *u, slong n);     /* u[0] = 0 */
/* out = tan(u), or tanh(u); u rational, u[0] = 0. */
void tail_tan(field *f, tail *out, const tail *u, slong n, int hyperbolic);
/* c[k] times (or over, when `divide`) alpha + lead + k/den; alpha may be NULL. A zero divisor's coefficient must
 * be zero. */
void tail_weigh(field *f, tail *t, const element *alpha, const fmpq_t lead, slong den, bool divide);

#endif
