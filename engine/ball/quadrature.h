/* Certified quadrature, the judge: the value of an integral as a ball of asked RELATIVE accuracy. methods.md section
 * 10, quadrature.md section 1. Never a wrong ball: where it cannot certify, the error says where and why. */
#ifndef TW_BALL_QUADRATURE_H
#define TW_BALL_QUADRATURE_H

#include "engine/ball/tape.h"

typedef struct quadrature_report {
    slong evaluations;
    slong bits; /* working precision of the last pass */
} quadrature_report;

/* value = f with the parameters of `at` put in; f is any closed-after-substitution expression that may hold integrals
 * (EXPR_INTEGRAL, real ranges) and sums, also nested in arithmetic. digits: relative decimal digits wanted (>= 1):
 * radius <= 10^-digits * |value| on success. When the accuracy cannot be had but a ball is known (value 0, or
 * cancellation): TW_OK with that ball if `accept_less`, else ERROR_PRECISION naming what could be had. Errors:
 * DIVERGENT (proved or no bound at an end: the words say which end), UNDECIDED, PRECISION, TIME, ... */
tw_status quadrature(tw_engine *e, acb_t value, expr *f, const env *at, slong digits, bool accept_less,
                     quadrature_report *report /* may be NULL */);

/* f of parameters (no integral inside) on balls; a convenience around tape. */
tw_status evaluate_closed(tw_engine *e, acb_t value, expr *f, const env *at, slong bits);

#endif
