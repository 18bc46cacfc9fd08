/* Random integrals of the families of Watson's lemma and parts, as texts, for the tests of this room. */
#ifndef TW_TESTS_NUMERIC_RANDOM_INTEGRAL_H
#define TW_TESTS_NUMERIC_RANDOM_INTEGRAL_H

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

typedef struct dice {
    uint64_t state;
} dice;

static inline uint32_t dice_roll(dice *d, uint32_t sides)
{
    d->state += 0x9E3779B97F4A7C15u; /* splitmix64 */
    uint64_t z = d->state;
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
    return (uint32_t)((z ^ (z >> 31)) % sides);
}

static inline int dice_between(dice *d, int low, int high)
{
    return low + (int)dice_roll(d, (uint32_t)(high - low + 1));
}

static inline uint64_t dice_seed(const char *test)
{
    const char *words = getenv("TW_SEED");
    uint64_t seed = words ? strtoull(words, NULL, 10) : 20261201;
    printf("%s: seed %llu (TW_SEED)\n", test, (unsigned long long)seed);
    return seed;
}

/* An amplitude analytic on [0, inf) that grows at most like exp(x). */
static inline void random_factor(dice *d, char *out, size_t room)
{
    int a = dice_between(d, 1, 5), b = dice_between(d, 1, 4);
    switch (dice_roll(d, 13)) {
    case 0: snprintf(out, room, "1/(%d + %d*x)", b, a); break;
    case 1: snprintf(out, room, "(1 + %d*x)^(%d/3)", a, dice_between(d, -5, 2)); break;
    case 2: snprintf(out, room, "1/sqrt(1 + %d*x^2)", a); break;
    case 3: snprintf(out, room, "1/((%d*x - 1)^2 + %d)", a, b); break;
    case 4: snprintf(out, room, "cos(%d*x)", a); break;
    case 5: snprintf(out, room, "exp(-%d*x/%d)", a, b); break;
    case 6: snprintf(out, room, "log(%d + %d*x)", b, a); break;
    case 7: snprintf(out, room, "atan(1 + %d*x)", a); break;
    case 8: snprintf(out, room, "cosh(x/%d)", b); break;
    case 9: snprintf(out, room, "(%d - %d*x + x^2)", a, b); break;
    case 10: snprintf(out, room, "1/(%d + exp(x))", b); break;
    case 11: snprintf(out, room, "sin(1 + %d*x)", b); break;
    default: snprintf(out, room, "(1 + %d*x^3)^(-1/%d)", a, b + 1); break;
    }
}

/* The whole text; large parameter s. */
static inline void random_integral(dice *d, char *out, size_t room)
{
    static const char *const powers[] = {"", "", "", "x^(-1/2)*", "x^(-2/3)*", "x^(1/3)*", "sqrt(x)*", "x*", "x^(3/4)*"};
    static const char *const kernels[] = {"x", "x", "x", "x", "2*x", "x^2", "x^3", "x/3"};
    static const char *const phases[] = {"(x + x^2)", "sinh(x)", "(exp(x) - 1)", "(2*x + x^3)", "log(1 + x)", "(x + x^2/5 + x^4)"};
    static const char *const last[] = {"(%s - x)^(-1/2)", "(%s - x)^(1/3)", "log(%s - x)", "(1 + %s - x)^(-1/3)"};
    char one[120], two[120], end[24];
    bool parts = dice_roll(d, 4) == 0, singular;
    random_factor(d, one, sizeof one);
    random_factor(d, two, sizeof two);
    if (dice_roll(d, 2))
        snprintf(two, sizeof two, "1");
    if (dice_roll(d, 4) == 0)
        snprintf(end, sizeof end, "%d/%d", dice_between(d, 1, 5), dice_between(d, 1, 2));
    else
        snprintf(end, sizeof end, "inf");
    singular = end[0] != 'i' && dice_roll(d, 3) == 0;
    if (singular) /* at the far end, mostly */
        snprintf(two, sizeof two, last[dice_roll(d, 4)], end);
    if (parts) {
        snprintf(out, room, "integral from 0 to %s of %s*%s*exp(-s*%s) dx", end, one, two, phases[dice_roll(d, 6)]);
    } else if (dice_roll(d, 6) == 0) {
        snprintf(out, room, "integral from 1 to inf of %s*%s*exp(-s*x) dx", one, singular ? "1" : two);
    } else {
        const char *log_part = dice_roll(d, 8) == 0 ? "log(x)*" : "";
        snprintf(out, room, "integral from 0 to %s of %s%s%s*%s*exp(-s*%s) dx", end, powers[dice_roll(d, 9)], log_part, one, two,
                 kernels[dice_roll(d, 8)]);
    }
}

#endif
