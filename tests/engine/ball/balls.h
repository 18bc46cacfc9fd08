/* Texts and balls for the tests of this room: parse, compile, and ask whether one ball holds what another computed much
 * more precisely. Random numbers with a printed seed, taken back from TW_SEED. */
#ifndef TW_TESTS_BALLS_H
#define TW_TESTS_BALLS_H

#include "tests/engine/method/texts.h"

#include <stdint.h>
#include <stdio.h>
#include <time.h>

static uint64_t random_state;

static inline void random_seed(const char *program)
{
    const char *given = getenv("TW_SEED");
    random_state = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL) * 1000003u;
    printf("%s: TW_SEED=%llu\n", program, (unsigned long long)random_state);
}

static inline uint64_t random_below(uint64_t n) /* splitmix64 */
{
    uint64_t z = random_state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return (z ^ (z >> 31)) % n;
}

/* A dyadic number in [from, to], so that points are exact. */
static inline double random_real(double from, double to)
{
    return from + (to - from) * (double)random_below(1 << 20) / (double)(1 << 20);
}

/* The box re +- r, im +- r; the real ball re +- r when `real`. */
static inline void box_set(acb_t z, double re, double im, double r, bool real)
{
    acb_set_d_d(z, re, real ? 0 : im);
    mag_set_d(arb_radref(acb_realref(z)), r);
    if (!real) mag_set_d(arb_radref(acb_imagref(z)), r);
}

/* A random exact point of the box. */
static inline void point_in(acb_t p, const acb_t z)
{
    arf_t t;
    arf_init(t);
    for (int part = 0; part < 2; part++) {
        arb_srcptr x = part ? acb_imagref(z) : acb_realref(z);
        arb_ptr y = part ? acb_imagref(p) : acb_realref(p);
        arf_set_mag(t, arb_radref(x));
        arf_mul_si(t, t, (slong)random_below(2001) - 1000, 53, ARF_RND_DOWN);
        arf_div_si(t, t, 1001, 53, ARF_RND_DOWN);
        arb_set_arf(y, arb_midref(x));
        arf_add(arb_midref(y), arb_midref(y), t, 200, ARF_RND_DOWN);
    }
    arf_clear(t);
}

static inline tape *tape_of(tw_engine *e, expr *f, expr *x)
{
    tape *t = tape_new(e, f, &x, 1);
    if (!t) fail_msg("no tape: %s", e->error.words ? e->error.words : "");
    return t;
}

/* f, a text in x, at the exact point re + i*im. */
static inline void value_at(tw_engine *e, acb_t out, const char *f, double re, double im, bool analytic, slong prec)
{
    tape *t = tape_of(e, text_parse(e, f), expr_symbol(e, "x"));
    acb_t z;
    acb_init(z);
    acb_set_d_d(z, re, im);
    tape_eval(out, t, z, analytic, prec);
    acb_clear(z);
    tape_free(t);
}

static inline bool holds_decimal(const arb_t x, const char *decimal) /* within the last digit of the decimal */
{
    arb_t d;
    arb_init(d);
    arb_set_str(d, decimal, 400);
    arb_sub(d, d, x, 400);
    arb_t size;
    arb_init(size);
    arb_set_str(size, decimal, 400);
    arb_abs(size, size);
    arb_mul_2exp_si(size, size, -120);
    mag_t slack;
    mag_init(slack);
    arb_get_mag(slack, size);
    mag_add(arb_radref(d), arb_radref(d), slack);
    bool holds = arb_contains_zero(d);
    mag_clear(slack);
    arb_clear(size);
    arb_clear(d);
    return holds;
}

#endif
