/* Private to engine/ball: operations on real balls that are wide beside their middle, where the plain rules of ball
 * arithmetic lose the sign ([1, 3]^2 as 2 +- 1 gives 4 +- 5). By the ends of the interval instead. */
#ifndef TW_BALL_INTERVAL_H
#define TW_BALL_INTERVAL_H

#include "engine/base/flint.h"

#include <stdbool.h>

/* Real, finite, and known to fewer than INTERVAL_BITS bits? */
enum { INTERVAL_BITS = 6 };
bool ball_is_wide(const acb_t z);
/* Exactly real and >= 0 on the whole ball? */
bool ball_is_nonnegative(const acb_t z);
/* Is the real part of every point of z greater than n; greater than 1; strictly between -1 and 1? */
bool ball_real_beyond(const acb_t z, slong n);
bool ball_real_beyond_one(const acb_t z);
bool ball_real_within_one(const acb_t z);

/* out = a*b, by the ends where a factor is wide; the best enclosure up to rounding. */
void ball_mul(acb_t out, const acb_t a, const acb_t b, slong prec);
/* out = z^n for n != 0. */
void ball_pow_fmpz(acb_t out, const acb_t z, const fmpz_t n, slong prec);
/* out = f on a wide ball for an f that is monotone (rising or falling) on the whole interval. f may be called with
 * out and its argument the same. */
typedef void (*real_call)(arb_t out, const arb_t x, slong prec);
void ball_monotone(acb_t out, const acb_t z, real_call f, slong prec);
/* The same for an f that is even and rises on [0, inf). */
void ball_even(acb_t out, const acb_t z, real_call f, slong prec);

#endif
