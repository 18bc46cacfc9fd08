/* Inside the ball room: the record of behaviour at infinity and its arithmetic.
 *
 *     f(x) = exp(T x^c) * x^(a + d) * (log x)^k * g(x)    for every real x >= X > e
 *
 * where T = T(x) lies in a complex ball, d = d(x) in [-slack, slack], g(x) in a complex ball; a, c, k, slack are exact
 * rationals (slack is 0 unless an exponent is irrational). Where `exact` is set, g(x) = q + rest(x) as well, q a
 * rational and rest a record of its own (NULL: the rest is 0): this survives cancellation of leading terms. */
#ifndef TW_BALL_GROWTH_RECORD_H
#define TW_BALL_GROWTH_RECORD_H

#include "engine/ball/tape.h"

typedef struct growth_record {
    fmpq_t c, a, slack, k, q;
    acb_t T, g;
    bool exact;
    struct growth_record *rest;
} growth_record;

/* Where the records hold, and what each operation needs of it. */
typedef struct growth_place {
    tw_engine *e;
    arb_t X, log_X, log_log_X; /* X is exact and > e */
    slong prec;
    bool analytic; /* a record is given only where the function is analytic as well: no ball meets a branch cut */
} growth_place;

void growth_place_init(growth_place *p, tw_engine *e);
void growth_place_clear(growth_place *p);
void growth_place_set(growth_place *p, const arf_t X); /* X > e */

void record_init(growth_record *r);
void record_clear(growth_record *r);
void record_swap(growth_record *r, growth_record *s);
void record_set(growth_record *r, const growth_record *s);

void record_set_fmpq(growth_record *r, const fmpq_t q);
void record_set_si(growth_record *r, slong n);
void record_set_ball(growth_record *r, const acb_t value); /* a constant, or anything inside the ball for all x >= X */
void record_set_variable(growth_record *r);                /* x itself */
bool record_is_zero(const growth_record *r);
bool record_is_real(const growth_record *r);
/* A ball that holds f(x) for all x >= X; false where f is not seen to be bounded. */
bool record_ball(acb_t value, const growth_record *r, const growth_place *p);
/* Does f tend to 0 (as the exponents say)? */
bool record_decays(const growth_record *r);

void record_make_inexact(growth_record *r);
/* The head of r alone, or its reciprocal. */
void record_head(growth_record *out, const growth_record *r, bool reciprocal);
/* A finite ball's centre and radius as rationals. */
void growth_ball_as_fmpq(fmpq_t centre, fmpq_t radius, const arb_t x);

/* The operations: false where no record is found (X may be too small). out may be an operand. */
bool record_add(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p);
bool record_mul(growth_record *out, const growth_record *r, const growth_record *s, const growth_place *p);
bool record_scale(growth_record *out, const growth_record *r, slong n, const growth_place *p);
bool record_pow_fmpq(growth_record *out, const growth_record *r, const fmpq_t power, const growth_place *p);
bool record_pow_ball(growth_record *out, const growth_record *r, const acb_t power, const growth_place *p);
bool record_log(growth_record *out, const growth_record *r, const growth_place *p);
bool record_exp(growth_record *out, const growth_record *r, const growth_place *p);
bool record_abs(growth_record *out, const growth_record *r, const growth_place *p);

/* f(q + w) = f(q) + w h with w the decaying record and h inside a ball: out = value + w * h, value exact. */
bool record_near(growth_record *out, const fmpq_t value, const growth_record *w, const acb_t h, const growth_place *p);
/* The ball that holds all s*w(x), 0 <= s <= 1, x >= X. */
bool record_star(acb_t star, const growth_record *w, const growth_place *p);

/* The sum of log-sup of  exp(tau1 x^c1 + tau2 x^c2) x^alpha (log x)^kappa  over x >= X: finite and exact from above
 * only where the function is seen to be nonincreasing from X on; false else. tau1, tau2 are exact reals; c1 != c2
 * unless a tau is 0. */
bool growth_sup_log(arb_t out, const fmpq_t c1, const arf_t tau1, const fmpq_t c2, const arf_t tau2, const fmpq_t alpha,
                    const fmpq_t kappa, const growth_place *p);

/* The rules of the functions (growth_functions.c). false: no record. */
bool growth_call(growth_record *out, function_id f, const growth_record *args, size_t n, const growth_place *p);

#endif
