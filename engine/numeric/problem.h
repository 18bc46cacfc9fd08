/* What the panel machine works on: one contribution with numbers put in for the parameters, brought to one coordinate y > 0 in
 * which everything has integer steps. Private to engine/numeric.
 *
 *   contribution = factor * sum over sheets of  int_0^end A(y) exp(-scale * p(y)) dy
 *   t = p(y) = T(y)^m,  T = y (1 + ...);  pure: p = y^m and T = y
 *   F(y) = A / T' * T^-v  =  m * A / p' * p^(1 - (v+1)/m)  =  sum over k, n of f[k][n] * T^n * ell^k,   ell = log(t) * ell_factor
 *   contribution = factor/m * int F * t^((v+1)/m - 1) * exp(-scale * t) dt                                  (methods.md, 9) */
#ifndef TW_NUMERIC_PROBLEM_H
#define TW_NUMERIC_PROBLEM_H

#include "engine/numeric/bound.h"

/* gcc 12 takes the first member's address (arb_midref, fmpq_numref) for the whole object in later calls and warns wrongly. */
#if defined(__GNUC__) && !defined(__clang__)
#pragma GCC diagnostic ignored "-Wstringop-overread"
#pragma GCC diagnostic ignored "-Wstringop-overflow"
#endif

enum { PROBLEM_LOGS = 6 }; /* highest power of the logarithm + 1 */

/* One branch in the coordinate y. regular[k]: y^-v times the part of A that goes with ell^k, analytic at 0. */
typedef struct sheet {
    expr *amplitude;             /* A(y) */
    expr *end;                   /* NULL: infinite */
    tape *value;                 /* F(y), logarithms included, for y > 0 */
    expr *regular_expr[PROBLEM_LOGS];
    tape *regular[PROBLEM_LOGS]; /* NULL: this power does not occur */
    arb_t end_y, end_t;          /* finite ends only */
    expr *tail_from, *tail_to;   /* in x; NULL: none. What lies next to an end at which A is singular is no part of the sheet */
} sheet;

typedef struct problem {
    tw_engine *e;
    expr *y;
    size_t sheet_count;
    sheet *sheets;
    bool pure;
    expr *phase_expr;       /* p(y) */
    tape *phase, *slope;    /* p, p'; NULL when pure */
    bool ends;              /* a general phase all of whose sheets end: beyond the last end, where only the kept terms are left, */
    arb_t beyond, ratio;    /* y >= beyond, the coordinate goes on as T = ratio*y (p itself may turn there) */
    fmpq_t m;
    expr *v_expr;
    arb_t v;
    arb_t ell_factor;
    slong lanes;            /* powers of the logarithm 0 .. lanes - 1 */
    slong known;            /* coefficients in f */
    slong bits;             /* their precision */
    bool terminates;        /* the series is F itself: no further coefficients */
    arb_ptr f[PROBLEM_LOGS]; /* exact zeros are zero balls */
    struct problem_source *source; /* what problem_coefficients needs */
    expr *tail_x, *tail_q, *tail_p;  /* q and p in x, for the tails */
} problem;

/* Makes the problem of a local form with values for the parameters. *out NULL with TW_OK: the machine does not apply, *reason
 * (fresh words) says why. */
tw_status problem_new(tw_engine *e, problem **out, const local_form *l, expr *large, const env *at, char **reason);
void problem_free(problem *p);

/* At least `count` coefficients to `bits` bits of precision; TW_OK also when the series terminates earlier (then zeros). */
tw_status problem_coefficients(problem *p, slong count, slong bits);

/* Are all coefficients of T^n exactly 0? Also true beyond the known ones of a series that terminates. */
bool problem_is_zero(const problem *p, slong n);

/* t at the exact coordinate y, as a ball. */
void problem_t(arb_t t, const problem *p, const arb_t y, slong bits);

/* log2 of a positive mag, to double precision whatever its exponent (-inf for 0). */
double mag_log2(const mag_t m);

/* Is y beyond the last end of a general phase? */
bool problem_is_beyond(const problem *p, const arf_t y);

/* T^m */
void problem_power(arb_t t, const problem *p, const arb_t T, slong bits);

/* (v + 1 + n)/m */
void problem_alpha(arb_t alpha, const problem *p, slong n, slong bits);

/* Is there a tail, and where in t does the first one begin? */
bool problem_has_tail(const problem *p, arb_t t);
/* The sum over the tails of int A exp(-S p), of |A| when `positive`, by certified quadrature; false when that cannot be had
 * (end_tail.c). */
bool problem_tail(arb_t out, problem *p, expr *S, bool positive);

/* Upper bound of the integral of |A| exp(-S p) over y >= *y of all sheets that reach beyond it (far.c). *y is raised when a growth
 * record is valid only later. False: no bound is known. */
bool far_bound(mag_t bound, problem *p, expr *S, double *y);

#endif
