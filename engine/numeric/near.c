/* h near 0 from its exact coefficients. One idea: the coefficients beyond the kept ones, up to the M-th, are the function; what is
 * left beyond them is a geometric series by the lemma on a contour (contour.c), and the contour reaches as far as it can be proved. */
#include "engine/numeric/patches.h"

#include <math.h>

#include "engine/numeric/analytic.h"

enum { NEAR_BITS = 64, NEAR_LENGTH = 26 };

/* log2 |x|, -inf for 0; good for any exponent. */
static double log2_abs(const arb_t x)
{
    mag_t m;
    double out;
    mag_init(m);
    arb_get_mag(m, x);
    out = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
    mag_clear(m);
    return out;
}

static double log2_coefficient(const problem *p, slong n)
{
    double most = -HUGE_VAL;
    for (slong k = 0; k < p->lanes; k++)
        if (n < p->known)
            most = fmax(most, log2_abs(p->f[k] + n));
    return most;
}

/* log2 of the radius that the growth of the coefficients suggests: the upper envelope's slope over the later half. */
static double log2_radius(const problem *p)
{
    slong from = p->known / 2;
    double base = -HUGE_VAL, slope = -HUGE_VAL;
    for (slong n = 0; n < p->known / 4 + 1; n++)
        base = fmax(base, log2_coefficient(p, n));
    if (base == -HUGE_VAL)
        base = 0;
    for (slong n = from; n < p->known; n++) {
        double c = log2_coefficient(p, n);
        if (c != -HUGE_VAL && n > 0)
            slope = fmax(slope, (c - base) / n);
    }
    return slope == -HUGE_VAL ? 60 : -slope;
}

typedef struct lemma {
    mag_t constants[PROBLEM_LOGS];
    arb_t rho;
    double rho_d;
} lemma;

static bool lemma_find(lemma *l, problem *p, double most)
{
    static const double parts[] = {0.985, 0.95, 0.9, 0.82, 0.7, 0.55, 0.4, 0.25, 0.12, 0.05};
    double guess = fmin(exp2(log2_radius(p)), most);
    for (size_t k = 0; k < sizeof parts / sizeof *parts; k++) {
        contour c;
        bool fine;
        if (!contour_trace(&c, p, guess * parts[k]))
            continue;
        fine = contour_prove(p, &c, l->constants, l->rho);
        contour_clear(&c);
        if (fine) {
            l->rho_d = arf_get_d(arb_midref(l->rho), ARF_RND_DOWN);
            return true;
        }
        if (!budget_ok(p->e))
            return false;
    }
    return false;
}

/* Upper bound of the sum over n >= known of |f[k][n]| T^(n - first). */
static void tail_bound(mag_t out, const problem *p, const lemma *l, slong k, slong first, const arb_t T)
{
    arb_t ratio, rest;
    if (p->terminates) {
        mag_zero(out);
        return;
    }
    arb_init(ratio);
    arb_init(rest);
    arb_div(ratio, T, l->rho, NEAR_BITS);
    arb_sub_ui(rest, ratio, 1, NEAR_BITS);
    arb_neg(rest, rest);
    if (arb_is_positive(rest)) {
        arb_pow_ui(ratio, ratio, (ulong)(p->known - first), NEAR_BITS);
        arb_div(ratio, ratio, rest, NEAR_BITS);
        arb_pow_ui(rest, l->rho, (ulong)first, NEAR_BITS);
        arb_div(ratio, ratio, rest, NEAR_BITS);
        arb_get_mag(out, ratio);
        mag_mul(out, out, l->constants[k]);
    } else {
        mag_inf(out);
    }
    arb_clear(rest);
    arb_clear(ratio);
}

static bool tail_small(const problem *p, const lemma *l, slong first, double T, double below)
{
    arb_t at;
    mag_t tail;
    bool small = true;
    arb_init(at);
    mag_init(tail);
    arb_set_d(at, T);
    for (slong k = 0; k < p->lanes && small; k++) {
        double scale = -HUGE_VAL;
        tail_bound(tail, p, l, k, first, at);
        for (slong n = first; n < p->known; n++)
            scale = fmax(scale, log2_coefficient(p, n) + (n - first) * log2(T));
        small = mag_is_zero(tail) || mag_log2(tail) < scale - below;
    }
    mag_clear(tail);
    arb_clear(at);
    return small;
}

/* One patch [a, b] of T: Taylor coefficients at its middle, truncated; what is cut off is bounded by Cauchy's inequality on the
 * circle of radius R around the middle, R = 3 half widths or as far as the contour lets. */
static void near_patch(patches *s, const problem *p, const lemma *l, double a, double b)
{
    slong first = s->first, count = p->known - first;
    patch *q = patches_add(s, p->lanes, NEAR_LENGTH);
    arb_t c, T, power;
    mag_t tail, cut, ratio;
    double w = (b - a) / 2 * (1 + 1e-12), R = 3.2 * w;
    arb_init(c);
    arb_init(T);
    arb_init(power);
    mag_init(tail);
    mag_init(cut);
    mag_init(ratio);
    q->near = true;
    arf_set_d(q->centre, (a + b) / 2);
    arf_set_d(q->width, w);
    arb_set_arf(c, q->centre);
    for (slong k = 0; k < p->lanes; k++) {
        arb_ptr poly = q->poly + k * NEAR_LENGTH;
        kept_taylor(poly, NEAR_LENGTH, p->f[k] + first, count, c, p->bits);
        arb_set_arf(T, q->width);
        arb_one(power);
        for (slong j = 0; j < NEAR_LENGTH; j++) {
            arb_mul(poly + j, poly + j, power, NEAR_BITS);
            arb_mul(power, power, T, NEAR_BITS);
        }
        /* sum over n of |f_n| (c + R)^n bounds the polynomial on that circle */
        mag_zero(cut);
        if (count > NEAR_LENGTH) {
            mag_t reach, part;
            mag_init(reach);
            mag_init(part);
            mag_set_d(reach, (a + b) / 2 + R);
            for (slong n = count - 1; n >= 0; n--) {
                mag_mul(cut, cut, reach);
                arb_get_mag(part, p->f[k] + first + n);
                mag_add(cut, cut, part);
            }
            mag_set_d(ratio, 1 / 3.19999);
            mag_pow_ui(ratio, ratio, NEAR_LENGTH);
            mag_mul(cut, cut, ratio);
            mag_mul_2exp_si(cut, cut, 1); /* 1/(1 - 1/3.2) and some for |z| a little above 1 */
            mag_clear(part);
            mag_clear(reach);
        }
        arb_set_d(T, b * (1 + 1e-5));
        tail_bound(tail, p, l, k, first, T);
        mag_add(q->error[k], cut, tail);
    }
    arb_set_d(T, a);
    problem_power(q->t_left, p, T, p->bits + NEAR_BITS);
    if (a == 0)
        arb_zero(q->t_left);
    arb_set_d(T, b);
    problem_power(q->t_right, p, T, p->bits + NEAR_BITS);
    mag_clear(ratio);
    mag_clear(cut);
    mag_clear(tail);
    arb_clear(power);
    arb_clear(T);
    arb_clear(c);
}

/* The least T at which a sheet ends, or inf. */
static double first_end(const problem *p)
{
    double least = HUGE_VAL, m = fmpz_get_d(fmpq_numref(p->m)) / fmpz_get_d(fmpq_denref(p->m));
    for (size_t b = 0; b < p->sheet_count; b++)
        if (p->sheets[b].end)
            least = fmin(least, pow(arf_get_d(arb_midref(p->sheets[b].end_t), ARF_RND_DOWN), 1 / m));
    return least * (1 - 1e-9);
}

static bool near_cut(patches *s, problem *p, lemma *l, double *T)
{
    slong most = s->first + 60 + 4 * s->first;
    while (!tail_small(p, l, s->first, *T, s->fine ? 28 : 11)) {
        slong more = s->first + (p->known - s->first) * 3 / 2;
        if (more > most) {
            *T *= 0.8;
            if (*T < 0.02 * l->rho_d) {
                s->reason = "the coefficients' tail near the critical point could not be made small";
                return false;
            }
            continue;
        }
        if (problem_coefficients(p, more, p->bits) != TW_OK)
            return false;
    }
    return true;
}

bool near_build(patches *s, problem *p, double T_needed, double *T_near)
{
    lemma l;
    bool fine = true;
    double T, a = 0;
    for (slong k = 0; k < PROBLEM_LOGS; k++)
        mag_init(l.constants[k]);
    arb_init(l.rho);
    T = fmin(T_needed, first_end(p));
    l.rho_d = HUGE_VAL;
    /* also where the series ends: abs(x - 3) is 3 - x near 0 only */
    fine = lemma_find(&l, p, 1.35 * T_needed);
    if (!fine)
        s->reason = "the integrand could not be proved analytic around the critical point";
    T = fmin(T, 0.8 * l.rho_d);
    s->rho = l.rho_d;
    fine = fine && near_cut(s, p, &l, &T);
    while (fine && a < T) {
        double b = a + 0.46 * (fmin(l.rho_d, 4 * T) - a) * 0.98;
        if (b > 0.93 * T)
            b = T;
        near_patch(s, p, &l, a, b);
        a = b;
        fine = budget_ok(p->e);
    }
    *T_near = T;
    arb_clear(l.rho);
    for (slong k = 0; k < PROBLEM_LOGS; k++)
        mag_clear(l.constants[k]);
    return fine;
}
