/* The lemma at 0 on a contour. One idea: the coefficients of F in powers of T are contour integrals,
 *
 *     f[n] = (1/(2 pi i)) int A(y) T(y)^(-v-1-n) dy     (the residue form of DLMF 2.3.18),
 *
 * so |f[n]| <= constant * rho^-n with rho = min |T| on the contour, wherever A y^-v and p are analytic inside and p has no zero
 * there but the one at 0. The contour is found in doubles, anyhow; the proof then takes its edges as balls. */
#include "engine/numeric/analytic.h"

#include <complex.h>
#include <math.h>

enum { CONTOUR_POINTS = 48, CONTOUR_BITS = 64, EDGE_DEPTH = 7, CELL_DEPTH = 8, CONTOUR_CELLS = 4000 };

void contour_clear(contour *c)
{
    flint_free(c->re);
    flint_free(c->im);
    c->re = c->im = NULL;
    c->count = 0;
}

/* p(y) and p'(y) near the point y, in doubles. */
static bool phase_near(const problem *p, double complex y, double complex *value, double complex *slope)
{
    acb_t at;
    acb_ptr jet = _acb_vec_init(2);
    bool fine;
    acb_init(at);
    acb_set_d_d(at, creal(y), cimag(y));
    tape_jet(jet, p->phase, at, 2, CONTOUR_BITS);
    fine = acb_is_finite(jet) && acb_is_finite(jet + 1);
    if (fine) {
        *value = arf_get_d(arb_midref(acb_realref(jet)), ARF_RND_NEAR) +
                 I * arf_get_d(arb_midref(acb_imagref(jet)), ARF_RND_NEAR);
        *slope = arf_get_d(arb_midref(acb_realref(jet + 1)), ARF_RND_NEAR) +
                 I * arf_get_d(arb_midref(acb_imagref(jet + 1)), ARF_RND_NEAR);
    }
    acb_clear(at);
    _acb_vec_clear(jet, 2);
    return fine;
}

/* Newton's method for p(y) = target from the guess *y. */
static bool solve_phase(const problem *p, double complex target, double complex *y)
{
    for (int k = 0; k < 30; k++) {
        double complex value, slope, move;
        if (!phase_near(p, *y, &value, &slope) || cabs(slope) == 0)
            return false;
        move = (target - value) / slope;
        *y += move;
        if (cabs(move) < 1e-9 * cabs(*y))
            return true;
        if (cabs(move) > 0.5 * cabs(*y))
            return false;
    }
    return false;
}

static void contour_allocate(contour *c, slong count)
{
    c->count = count;
    c->re = flint_malloc(count * sizeof(double));
    c->im = flint_malloc(count * sizeof(double));
}

static bool trace_level(contour *out, const problem *p, double rho)
{
    double m = fmpz_get_d(fmpq_numref(p->m)) / fmpz_get_d(fmpq_denref(p->m)), level, start = rho;
    double complex y;
    /* Out along the real axis: p grows there like a constant times y^m. */
    y = 1e-3 * rho;
    for (int k = 0; k < 60; k++) {
        double complex value, slope;
        double factor;
        if (!phase_near(p, y, &value, &slope) || creal(value) <= 0)
            return false;
        factor = pow(pow(1e-3 * rho, m) / creal(value), 1 / m);
        y *= factor;
        if (fabs(factor - 1) < 0.1)
            break;
    }
    for (level = 1e-3 * rho; level < start * 1.12; level *= 1.12) {
        if (!solve_phase(p, pow(fmin(level, start), m), &y) || creal(y) <= 0)
            return false;
    }
    y = creal(y);
    if (!solve_phase(p, pow(start, m), &y))
        return false;
    contour_allocate(out, CONTOUR_POINTS + 1);
    for (slong k = 0; k <= CONTOUR_POINTS; k++) {
        /* four steps a vertex */
        for (int j = k ? 3 : 0; j >= 0; j--) {
            double theta = M_PI * (k - j * 0.25) / CONTOUR_POINTS;
            if (!solve_phase(p, pow(start, m) * cexp(I * m * theta), &y))
                return false;
        }
        out->re[k] = creal(y);
        out->im[k] = cimag(y);
        if (k > 0 && k < CONTOUR_POINTS && cimag(y) <= 0)
            return false;
    }
    out->im[0] = out->im[CONTOUR_POINTS] = 0;
    return out->re[0] > 0 && out->re[CONTOUR_POINTS] < 0;
}

bool contour_trace(contour *out, const problem *p, double rho)
{
    out->count = 0;
    out->re = out->im = NULL;
    if (!p->pure) {
        if (trace_level(out, p, rho))
            return true;
        contour_clear(out);
        return false;
    }
    contour_allocate(out, CONTOUR_POINTS + 1);
    for (slong k = 0; k <= CONTOUR_POINTS; k++) {
        out->re[k] = rho * cos(M_PI * k / CONTOUR_POINTS);
        out->im[k] = k % CONTOUR_POINTS ? rho * sin(M_PI * k / CONTOUR_POINTS) : 0;
    }
    return true;
}

/* ---- the edges ---- */

typedef struct walk {
    problem *p;
    slong lanes;
    mag_t *constants; /* integral of |A y^-v| |y|^v |p|^(-(v+1)/m) |dy| over the upper half, for each power of the log */
    arb_ptr rho;      /* lower bound of |T| so far */
    double turn;      /* change of arg p along the way */
} walk;

static void point_acb(acb_t z, double complex a)
{
    acb_set_d_d(z, creal(a), cimag(a));
}

/* The smallest box around the segment from a to b. */
static void segment_box(acb_t box, double complex a, double complex b)
{
    acb_t z;
    acb_init(z);
    point_acb(box, a);
    point_acb(z, b);
    acb_union(box, box, z, CONTOUR_BITS);
    acb_clear(z);
}

/* |T|^... of the segment: modulus of p to the power 1/m, and the change of the argument of p. */
static bool edge_phase(walk *w, arb_t T, double *turn, const acb_t box, double complex a, double complex b)
{
    problem *p = w->p;
    acb_t value, first, last;
    fmpq_t inverse;
    bool fine = true;
    *turn = 0;
    if (p->pure) {
        acb_abs(T, box, CONTOUR_BITS);
        return arb_is_positive(T);
    }
    acb_init(value);
    acb_init(first);
    acb_init(last);
    fmpq_init(inverse);
    tape_eval(value, p->phase, box, true, CONTOUR_BITS);
    acb_abs(T, value, CONTOUR_BITS);
    fine = acb_is_finite(value) && arb_is_positive(T);
    if (fine) {
        point_acb(first, a);
        point_acb(last, b);
        tape_eval(first, p->phase, first, true, CONTOUR_BITS);
        tape_eval(last, p->phase, last, true, CONTOUR_BITS);
        /* p maps the edge into a convex set without 0, so the change of its argument is the principal argument of the ratio. */
        acb_div(last, last, first, CONTOUR_BITS);
        acb_arg(acb_realref(value), last, CONTOUR_BITS);
        fine = acb_is_finite(last) && mag_cmp_2exp_si(arb_radref(acb_realref(value)), -10) < 0;
        *turn = arf_get_d(arb_midref(acb_realref(value)), ARF_RND_NEAR);
        fmpq_inv(inverse, p->m);
        arb_pow_fmpq(T, T, inverse, CONTOUR_BITS);
    }
    fmpq_clear(inverse);
    acb_clear(last);
    acb_clear(first);
    acb_clear(value);
    return fine && arb_is_finite(T);
}

/* Adds |A y^-v| |y|^v |T|^-(v+1) |dy| for the edge; false when a value is not finite or too coarse to be of use. */
static bool edge_amplitude(walk *w, const acb_t box, const arb_t T, double length, bool coarse_too)
{
    problem *p = w->p;
    acb_t value;
    arb_t modulus, power, one;
    mag_t sum[PROBLEM_LOGS], part;
    bool fine = true;
    acb_init(value);
    arb_init(modulus);
    arb_init(power);
    arb_init(one);
    mag_init(part);
    acb_abs(modulus, box, CONTOUR_BITS);
    arb_div(power, modulus, T, CONTOUR_BITS);
    if (!arb_is_zero(p->v) && !p->pure)
        arb_pow(power, power, p->v, CONTOUR_BITS);
    else
        arb_one(power);
    arb_div(power, power, T, CONTOUR_BITS);
    for (slong k = 0; k < w->lanes; k++)
        mag_init(sum[k]);
    for (size_t b = 0; b < p->sheet_count && fine; b++)
        for (slong k = 0; k < w->lanes && fine; k++) {
            if (!p->sheets[b].regular[k])
                continue;
            tape_eval(value, p->sheets[b].regular[k], box, true, CONTOUR_BITS);
            fine = acb_is_finite(value);
            acb_abs(modulus, value, CONTOUR_BITS);
            fine = fine && (coarse_too || mag_cmp_2exp_si(arb_radref(modulus), 0) < 0 ||
                            arb_rel_accuracy_bits(modulus) >= 1);
            arb_mul(modulus, modulus, power, CONTOUR_BITS);
            arb_get_mag(part, modulus);
            mag_add(sum[k], sum[k], part);
        }
    mag_set_d(part, length);
    for (slong k = 0; k < w->lanes; k++) {
        if (fine)
            mag_addmul(w->constants[k], sum[k], part);
        mag_clear(sum[k]);
    }
    mag_clear(part);
    arb_clear(one);
    arb_clear(power);
    arb_clear(modulus);
    acb_clear(value);
    return fine;
}

static bool walk_edge(walk *w, double complex a, double complex b, int depth)
{
    acb_t box;
    arb_t T;
    double turn;
    bool fine;
    if (!budget_ok(w->p->e))
        return false;
    acb_init(box);
    arb_init(T);
    segment_box(box, a, b);
    fine = edge_phase(w, T, &turn, box, a, b) && edge_amplitude(w, box, T, cabs(b - a) * (1 + 1e-12), depth >= 4);
    if (fine) {
        arb_min(w->rho, w->rho, T, CONTOUR_BITS);
        w->turn += turn;
    }
    arb_clear(T);
    acb_clear(box);
    if (fine)
        return true;
    if (depth == EDGE_DEPTH)
        return false;
    return walk_edge(w, a, (a + b) / 2, depth + 1) && walk_edge(w, (a + b) / 2, b, depth + 1);
}

/* ---- the inside ---- */

static double edge_distance(double complex z, double complex a, double complex b)
{
    double complex d = b - a;
    double s = cabs(d) > 0 ? creal((z - a) * conj(d)) / (cabs(d) * cabs(d)) : 0;
    return cabs(z - (a + fmin(fmax(s, 0), 1) * d));
}

/* Surely outside: the square's centre is outside and no edge comes near the square. The mirrored half is seen by symmetry. */
static bool cell_outside(const contour *c, double x, double y, double half)
{
    double complex z = x + I * y;
    double reach = 1.4143 * half * (1 + 1e-9) + 1e-12 * cabs(z), turn = 0;
    for (slong k = 0; k + 1 < c->count; k++) {
        double complex a = c->re[k] + I * c->im[k], b = c->re[k + 1] + I * c->im[k + 1];
        if (edge_distance(z, a, b) <= reach || edge_distance(z, conj(a), conj(b)) <= reach)
            return false;
        turn += carg((b - z) / (a - z)) + carg((conj(a) - z) / (conj(b) - z));
    }
    return fabs(turn) < 1;
}

typedef struct inside {
    problem *p;
    const contour *c;
    double core; /* |y| <= core is proved by other means; 0: not */
    slong cells;
} inside;

static bool cell_analytic(problem *p, const acb_t cell)
{
    acb_t value;
    bool fine = true;
    acb_init(value);
    if (!p->pure) {
        tape_eval(value, p->phase, cell, true, CONTOUR_BITS);
        fine = acb_is_finite(value);
    }
    for (size_t b = 0; b < p->sheet_count && fine; b++)
        for (slong k = 0; k < p->lanes && fine; k++)
            if (p->sheets[b].regular[k]) {
                tape_eval(value, p->sheets[b].regular[k], cell, true, CONTOUR_BITS);
                fine = acb_is_finite(value);
            }
    acb_clear(value);
    return fine;
}

static bool cover_inside(inside *w, double x, double y, double half, int depth)
{
    acb_t cell;
    bool fine;
    if (++w->cells > CONTOUR_CELLS || !budget_ok(w->p->e))
        return false;
    if (w->core > 0 && hypot(fabs(x) + half, fabs(y) + half) < w->core * (1 - 1e-9))
        return true;
    if (cell_outside(w->c, x, y, half))
        return true;
    acb_init(cell);
    acb_set_d_d(cell, x, y);
    mag_set_d(arb_radref(acb_realref(cell)), half * (1 + 1e-12));
    mag_set_d(arb_radref(acb_imagref(cell)), half * (1 + 1e-12));
    fine = cell_analytic(w->p, cell);
    acb_clear(cell);
    if (fine)
        return true;
    if (depth == CELL_DEPTH)
        return false;
    half /= 2;
    return cover_inside(w, x - half, y + half, half, depth + 1) && cover_inside(w, x + half, y + half, half, depth + 1) &&
           cover_inside(w, x - half, y - half, half, depth + 1) && cover_inside(w, x + half, y - half, half, depth + 1);
}

/* Does the formula itself stay finite on a small ball around 0? */
static bool regular_at_zero(problem *p, double radius)
{
    acb_t cell;
    bool fine;
    acb_init(cell);
    mag_set_d(arb_radref(acb_realref(cell)), radius);
    mag_set_d(arb_radref(acb_imagref(cell)), radius);
    fine = cell_analytic(p, cell);
    acb_clear(cell);
    return fine;
}

static bool core_removable(problem *p, double radius)
{
    if (!p->pure && !removable_at_zero(p, p->phase_expr, radius))
        return false;
    for (size_t b = 0; b < p->sheet_count; b++)
        for (slong k = 0; k < p->lanes; k++)
            if (p->sheets[b].regular[k] && !removable_at_zero(p, p->sheets[b].regular_expr[k], radius))
                return false;
    return true;
}

static bool prove_inside(problem *p, const contour *c)
{
    inside w = {.p = p, .c = c};
    double most = 0, least = HUGE_VAL, core;
    for (slong k = 0; k < c->count; k++) {
        most = fmax(most, hypot(c->re[k], c->im[k]));
        least = fmin(least, hypot(c->re[k], c->im[k]));
    }
    if (!regular_at_zero(p, 1e-3 * least)) {
        for (core = 0.5 * least; core > 1e-3 * least && !core_removable(p, core);)
            core /= 2;
        if (core <= 1e-3 * least)
            return false;
        w.core = core;
    }
    most *= 1 + 1e-9;
    return cover_inside(&w, -most / 2, most / 2, most / 2, 0) && cover_inside(&w, most / 2, most / 2, most / 2, 0);
}

bool contour_prove(problem *p, const contour *c, mag_t *constants, arb_t rho)
{
    walk w = {.p = p, .lanes = p->lanes, .constants = constants, .rho = rho};
    double m = fmpz_get_d(fmpq_numref(p->m)) / fmpz_get_d(fmpq_denref(p->m));
    mag_t inverse_pi;
    if (c->count < 2 || (!p->pure && !fmpz_is_one(fmpq_denref(p->m))))
        return false;
    for (slong k = 0; k < p->lanes; k++)
        mag_zero(constants[k]);
    arb_pos_inf(rho);
    for (slong k = 0; k + 1 < c->count; k++)
        if (!walk_edge(&w, c->re[k] + I * c->im[k], c->re[k + 1] + I * c->im[k + 1], 0))
            return false;
    /* By the argument principle p has as many zeros inside as arg p turns: m, all of them at 0. */
    if (!p->pure && fabs(w.turn - M_PI * m) > 0.5)
        return false;
    if (!prove_inside(p, c))
        return false;
    mag_init(inverse_pi);
    mag_set_d(inverse_pi, 0.3183098861838);
    for (slong k = 0; k < p->lanes; k++)
        mag_mul(constants[k], constants[k], inverse_pi); /* both halves, over 2 pi */
    mag_clear(inverse_pi);
    arb_get_lbound_arf(arb_midref(rho), rho, CONTOUR_BITS);
    mag_zero(arb_radref(rho));
    return arb_is_positive(rho);
}
