/* Private to engine/ball: the functions of the table on complex balls and as power series. */
#ifndef TW_BALL_FUNCTIONS_H
#define TW_BALL_FUNCTIONS_H

#include "engine/expr/expr.h"

/* How a value is wanted. real_args: every argument is real for real values of the variables, so that abs, sign, min,
 * max, re ... have a holomorphic continuation off the real line. */
typedef struct ball_mode {
    bool analytic;
    bool real_args;
    bool off_line; /* a real variable stands at a value that is not real: without real_args nothing is meant */
} ball_mode;

typedef void (*ball_function)(acb_t out, acb_srcptr const *args, size_t n, ball_mode mode, slong prec);
typedef void (*jet_function)(acb_poly_t out, const acb_poly_struct *const *args, size_t n, ball_mode mode, slong len,
                             slong prec);

ball_function ball_function_of(function_id f);
jet_function jet_function_of(function_id f);

/* out = base^exponent; with analytic non-finite when the base touches (-inf, 0] and the power is no integer. */
void ball_power(acb_t out, const acb_t base, const acb_t exponent, bool analytic, slong prec);
void ball_power_rational(acb_t out, const acb_t base, const fmpq_t exponent, bool analytic, slong prec);
void jet_power_rational(acb_poly_t out, const acb_poly_t base, const fmpq_t exponent, slong len, slong prec);
void jet_power(acb_poly_t out, const acb_poly_t base, const acb_poly_t exponent, slong len, slong prec);
void jet_unknown(acb_poly_t out, slong len);
void jet_mul(acb_poly_t out, const acb_poly_t a, const acb_poly_t b, slong len, slong prec);
/* log(1 + u), exp(u) - 1, cos(u) - 1, cosh(u) - 1, (1 + u)^r - 1 with r no integer: no digits lost for small u. */
void ball_log1p(acb_t out, const acb_t u, bool analytic, slong prec);
void ball_expm1(acb_t out, const acb_t u, slong prec);
void ball_cosm1(acb_t out, const acb_t u, slong prec);
void ball_coshm1(acb_t out, const acb_t u, slong prec);
void ball_powm1(acb_t out, const acb_t u, const fmpq_t r, bool analytic, slong prec);
/* Does the ball meet the cut (-inf, 0]? */
bool ball_meets_cut(const acb_t z);

#endif
