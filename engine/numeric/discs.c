/* h away from 0. One idea: at an exact point y_m the kept terms are cancelled in the Taylor coefficients of F / T^first, computed
 * with enough bits, and not in the values of balls over a panel; what lies beyond the coefficients is bounded by Cauchy's
 * inequality on a circle on and in which F is proved analytic. The path runs along the real axis of y, where p is explicit, so
 * no inverse function is needed: t = p(y), and p' > 0 on each disc's part of the path is checked. */
#include <math.h>

#include "engine/numeric/analytic.h"
#include "engine/numeric/patches.h"

enum { DISC_LENGTH = 20, LOW_BITS = 64, DISCS_MOST = 3000 };

typedef struct walker {
    problem *p;
    patches *s;
    slong first;
    fmpq_t inverse_m;
} walker;

static bool sheet_alive(const sheet *b, double y)
{
    return !b->end || arf_cmp_d(arb_midref(b->end_y), y) > 0;
}

/* T = p^(1/m) as a series in z at y = c + z. */
static bool coordinate_series(arb_ptr T, walker *w, const arb_t c, slong n, slong bits)
{
    problem *p = w->p;
    acb_t at;
    acb_ptr jet;
    bool fine = true;
    _arb_vec_zero(T, n);
    if (p->pure) {
        arb_set(T, c);
        arb_one(T + 1);
        return true;
    }
    if (problem_is_beyond(p, arb_midref(c))) {
        arb_mul(T, c, p->ratio, bits);
        arb_set(T + 1, p->ratio);
        return true;
    }
    acb_init(at);
    jet = _acb_vec_init(n);
    arb_set(acb_realref(at), c);
    tape_jet(jet, p->phase, at, n, bits);
    for (slong j = 0; j < n; j++) {
        fine = fine && acb_is_finite(jet + j);
        arb_set(T + j, acb_realref(jet + j));
    }
    fine = fine && arb_is_positive(T);
    if (fine && !fmpq_is_one(w->inverse_m)) {
        arb_t power;
        arb_ptr root = _arb_vec_init(n); /* square roots of series must not overwrite their argument */
        arb_init(power);
        arb_set_fmpq(power, w->inverse_m, bits);
        _arb_poly_pow_arb_series(root, T, n, power, n, bits);
        _arb_vec_swap(root, T, n);
        _arb_vec_clear(root, n);
        arb_clear(power);
    }
    _acb_vec_clear(jet, n);
    acb_clear(at);
    return fine;
}

/* out = sum over lanes of ell^k * (sum over n < first of f[k][n] x^n at x = T(z)), modulo z^n. */
static void kept_series(arb_ptr out, walker *w, arb_srcptr T, slong n, slong bits)
{
    problem *p = w->p;
    arb_ptr taylor = _arb_vec_init(n), shift = _arb_vec_init(n), ell = _arb_vec_init(n), part = _arb_vec_init(n);
    _arb_vec_zero(out, n);
    _arb_vec_set(shift, T, n);
    arb_zero(shift);
    if (p->lanes > 1) {
        arb_t factor;
        arb_init(factor);
        _arb_poly_log_series(ell, T, n, n, bits);
        arb_mul_fmpz(factor, p->ell_factor, fmpq_numref(p->m), bits);
        arb_div_fmpz(factor, factor, fmpq_denref(p->m), bits);
        _arb_vec_scalar_mul(ell, ell, n, factor, bits);
        arb_clear(factor);
    }
    for (slong k = p->lanes - 1; k >= 0; k--) {
        if (k < p->lanes - 1) {
            _arb_poly_mullow(part, out, n, ell, n, n, bits);
            _arb_vec_set(out, part, n);
        }
        kept_taylor(taylor, n, p->f[k], w->first, T, bits);
        if (!p->pure) {
            _arb_poly_compose_series(part, taylor, n, shift, n, n, bits);
            _arb_vec_set(taylor, part, n);
        }
        _arb_vec_add(out, out, taylor, n, bits);
    }
    _arb_vec_clear(part, n);
    _arb_vec_clear(ell, n);
    _arb_vec_clear(shift, n);
    _arb_vec_clear(taylor, n);
}

/* Bounds of |T| on the disc around c of radius R, and p' away from 0 on its real part; false when not proved. */
static bool coordinate_range(mag_t most, arb_t least, walker *w, const arf_t c, const arf_t R)
{
    problem *p = w->p;
    acb_t disc;
    arb_t modulus;
    bool fine = true;
    acb_init(disc);
    arb_init(modulus);
    arb_set_arf(acb_realref(disc), c);
    arf_get_mag(arb_radref(acb_realref(disc)), R);
    arf_get_mag(arb_radref(acb_imagref(disc)), R);
    if (p->pure || problem_is_beyond(p, c)) {
        /* exactly c - R <= |y| <= c + R on the disc */
        arb_set(modulus, acb_realref(disc));
        if (!p->pure)
            arb_mul(modulus, modulus, p->ratio, LOW_BITS);
    } else {
        acb_t value;
        acb_init(value);
        tape_eval(value, p->phase, disc, true, LOW_BITS);
        acb_abs(modulus, value, LOW_BITS);
        fine = acb_is_finite(value);
        if (fine && arb_is_positive(modulus))
            arb_pow_fmpq(modulus, modulus, w->inverse_m, LOW_BITS);
        acb_clear(value);
    }
    fine = fine && arb_is_positive(modulus) && arb_is_finite(modulus);
    if (fine) {
        arb_get_mag(most, modulus);
        arb_get_lbound_arf(arb_midref(least), modulus, LOW_BITS);
        mag_zero(arb_radref(least));
    }
    arb_clear(modulus);
    acb_clear(disc);
    return fine && arb_is_positive(least);
}

/* p increases on [c - width, c + width]. */
static bool slope_positive(walker *w, const arf_t c, const arf_t width)
{
    acb_t real, value;
    bool fine;
    if (w->p->pure || problem_is_beyond(w->p, c))
        return true;
    acb_init(real);
    acb_init(value);
    arb_set_arf(acb_realref(real), c);
    arf_get_mag(arb_radref(acb_realref(real)), width);
    tape_eval(value, w->p->slope, real, true, LOW_BITS);
    fine = acb_is_finite(value) && arb_is_positive(acb_realref(value));
    acb_clear(value);
    acb_clear(real);
    return fine;
}

/* Bound of |h| on the disc: (max |F| + sum over kept terms of |f| Tmost^n |ell|^k) / Tleast^first. */
static void disc_size(mag_t size, walker *w, const mag_t amplitude, const mag_t most, const arb_t least)
{
    problem *p = w->p;
    mag_t sum, part, ell;
    arb_t x;
    mag_init(sum);
    mag_init(part);
    mag_init(ell);
    arb_init(x);
    mag_set(size, amplitude);
    if (p->lanes > 1) { /* |log T| <= |log |T|| + pi */
        arb_log(x, least, LOW_BITS);
        arb_get_mag(ell, x);
        arf_set_mag(arb_midref(x), most);
        mag_zero(arb_radref(x));
        arb_log(x, x, LOW_BITS);
        arb_get_mag(part, x);
        mag_max(ell, ell, part);
        mag_set_d(part, 3.15);
        mag_add(ell, ell, part);
        arb_mul_fmpz(x, p->ell_factor, fmpq_numref(p->m), LOW_BITS);
        arb_div_fmpz(x, x, fmpq_denref(p->m), LOW_BITS);
        arb_get_mag(part, x);
        mag_mul(ell, ell, part);
    }
    mag_zero(sum);
    for (slong k = p->lanes - 1; k >= 0; k--) {
        mag_t row;
        mag_init(row);
        for (slong n = w->first - 1; n >= 0; n--) {
            mag_mul(row, row, most);
            arb_get_mag(part, p->f[k] + n);
            mag_add(row, row, part);
        }
        mag_mul(sum, sum, ell);
        mag_add(sum, sum, row);
        mag_clear(row);
    }
    mag_add(size, size, sum);
    arb_inv(x, least, LOW_BITS);
    arb_get_mag(part, x);
    mag_pow_ui(part, part, (ulong)w->first);
    mag_mul(size, size, part);
    arb_clear(x);
    mag_clear(ell);
    mag_clear(part);
    mag_clear(sum);
}

/* Taylor coefficients of h at c, scaled by width^j, into poly. */
static bool disc_series(arb_ptr poly, walker *w, const arf_t c, const arf_t width, slong n, slong bits)
{
    problem *p = w->p;
    arb_ptr T = _arb_vec_init(n), h = _arb_vec_init(n), part = _arb_vec_init(n);
    acb_ptr jet = _acb_vec_init(n);
    acb_t at;
    arb_t x, power;
    double y = arf_get_d(c, ARF_RND_NEAR);
    bool fine;
    acb_init(at);
    arb_init(x);
    arb_init(power);
    arb_set_arf(x, c);
    fine = coordinate_series(T, w, x, n, bits);
    if (fine) {
        kept_series(h, w, T, n, bits);
        _arb_vec_neg(h, h, n);
        arb_set(acb_realref(at), x);
        for (size_t b = 0; b < p->sheet_count && fine; b++) {
            if (!sheet_alive(p->sheets + b, y))
                continue;
            tape_jet(jet, p->sheets[b].value, at, n, bits);
            for (slong j = 0; j < n; j++) {
                fine = fine && acb_is_finite(jet + j) && arb_contains_zero(acb_imagref(jet + j));
                arb_add(h + j, h + j, acb_realref(jet + j), bits);
            }
        }
    }
    if (fine) {
        arb_set_si(power, -w->first);
        _arb_poly_pow_arb_series(part, T, n, power, n, bits);
        _arb_poly_mullow(T, h, n, part, n, n, bits);
        arb_one(power);
        for (slong j = 0; j < n; j++) {
            arb_mul(poly + j, T + j, power, LOW_BITS);
            arb_mul_arf(power, power, width, LOW_BITS);
        }
    }
    arb_clear(power);
    arb_clear(x);
    acb_clear(at);
    _acb_vec_clear(jet, n);
    _arb_vec_clear(part, n);
    _arb_vec_clear(h, n);
    _arb_vec_clear(T, n);
    return fine;
}

/* Proves the disc around c of radius R; the bound of |h| on it. */
static bool disc_prove(mag_t size, walker *w, const arf_t c, const arf_t R)
{
    problem *p = w->p;
    mag_t amplitude, part, most;
    arb_t least;
    double y = arf_get_d(c, ARF_RND_NEAR);
    bool fine;
    mag_init(amplitude);
    mag_init(part);
    mag_init(most);
    arb_init(least);
    fine = coordinate_range(most, least, w, c, R);
    for (size_t b = 0; b < p->sheet_count && fine; b++)
        if (sheet_alive(p->sheets + b, y)) {
            fine = disc_bound(p->e, part, p->sheets[b].value, c, R);
            mag_add(amplitude, amplitude, part);
        }
    if (fine)
        disc_size(size, w, amplitude, most, least);
    arb_clear(least);
    mag_clear(most);
    mag_clear(part);
    mag_clear(amplitude);
    return fine && mag_is_finite(size);
}

/* Near 0 the kept terms are F itself (the series ends and all of it is kept): by the identity theorem they are F wherever F has
 * been continued analytically along the path, so h = 0 there; a sheet that has ended breaks it. */
static bool vanishes(const walker *w, double y)
{
    if (!w->p->terminates)
        return false;
    for (slong n = w->first; n < w->p->known; n++)
        if (!problem_is_zero(w->p, n))
            return false;
    for (size_t b = 0; b < w->p->sheet_count; b++)
        if (!sheet_alive(w->p->sheets + b, y))
            return false;
    return true;
}

/* Is the error small beside the polynomial? */
static bool error_small(const patch *q, bool fine)
{
    mag_t sum, part;
    bool small;
    mag_init(sum);
    mag_init(part);
    for (slong j = 0; j < q->length; j++) {
        arb_get_mag(part, q->poly + j);
        mag_max(sum, sum, part);
    }
    mag_mul_2exp_si(part, q->error[0], fine ? 22 : 9);
    small = mag_cmp(part, sum) < 0;
    mag_clear(part);
    mag_clear(sum);
    return small;
}

/* The patch around c; false when the disc is too large to be proved, or (when choosy) when its error spoils h. */
static bool disc_patch(walker *w, double c, double width, bool choosy)
{
    arf_t centre, half, R;
    mag_t size, ratio;
    patch *q = NULL;
    bool fine;
    arf_init(centre);
    arf_init(half);
    arf_init(R);
    mag_init(size);
    mag_init(ratio);
    arf_set_d(centre, c);
    arf_set_d(half, width);
    arf_set_d(R, 5 * width);
    fine = slope_positive(w, centre, half) && disc_prove(size, w, centre, R);
    if (fine) {
        slong bits = w->p->bits, length = DISC_LENGTH + w->first / 6; /* the kept terms cancel like (t/rho)^first */
        q = patches_add(w->s, 1, length);
        fine = vanishes(w, c) || disc_series(q->poly, w, centre, half, length, bits);
        if (vanishes(w, c)) {
            arf_set(q->centre, centre);
            arf_set(q->width, half);
        } else if (fine) {
            arf_set(q->centre, centre);
            arf_set(q->width, half);
            /* sum over j >= length of size * (width/R)^j = size * 5^-length * 5/4 */
            mag_set_ui_2exp_si(ratio, 1, 0);
            mag_div_ui(ratio, ratio, 5);
            mag_pow_ui(ratio, ratio, (ulong)length);
            mag_mul(q->error[0], size, ratio);
            mag_mul_ui(q->error[0], q->error[0], 11); /* 5/4 and a tenth for |z| a little above 1, see patch_range */
            mag_mul_2exp_si(q->error[0], q->error[0], -3);
            fine = !choosy || error_small(q, w->s->fine);
        }
        if (fine) {
            w->s->discs++;
        } else {
            w->s->count--;
            arf_clear(q->centre);
            arf_clear(q->width);
            _arb_vec_clear(q->poly, length);
            for (slong j = 0; j < PROBLEM_LOGS; j++)
                mag_clear(q->error[j]);
            arb_clear(q->t_left);
            arb_clear(q->t_right);
        }
    }
    mag_clear(ratio);
    mag_clear(size);
    arf_clear(R);
    arf_clear(half);
    arf_clear(centre);
    return fine;
}

/* The range of h over the real interval [a, b] by plain balls, for the last bit before an end at which F is not analytic. */
static bool crude_patch(walker *w, const arb_t a, const arb_t b)
{
    problem *p = w->p;
    acb_t at, value;
    arb_t sum, part, T, ell;
    double y;
    bool fine = true;
    acb_init(at);
    acb_init(value);
    arb_init(sum);
    arb_init(part);
    arb_init(T);
    arb_init(ell);
    arb_union(acb_realref(at), a, b, LOW_BITS);
    y = arf_get_d(arb_midref(acb_realref(at)), ARF_RND_NEAR);
    problem_t(T, p, acb_realref(at), LOW_BITS);
    fine = arb_is_positive(T);
    if (fine) {
        arb_log(ell, T, LOW_BITS);
        arb_mul(ell, ell, p->ell_factor, LOW_BITS);
        arb_pow_fmpq(T, T, w->inverse_m, LOW_BITS);
        for (slong k = p->lanes - 1; k >= 0; k--) {
            arb_mul(sum, sum, ell, LOW_BITS);
            _arb_poly_evaluate(part, p->f[k], w->first, T, LOW_BITS);
            arb_sub(sum, sum, part, LOW_BITS);
        }
    }
    for (size_t k = 0; k < p->sheet_count && fine; k++)
        if (sheet_alive(p->sheets + k, y)) {
            tape_eval(value, p->sheets[k].value, at, false, LOW_BITS);
            fine = acb_is_finite(value) && arb_contains_zero(acb_imagref(value));
            arb_add(sum, sum, acb_realref(value), LOW_BITS);
        }
    if (fine) {
        patch *q;
        arb_pow_ui(T, T, (ulong)w->first, LOW_BITS);
        arb_div(sum, sum, T, LOW_BITS);
        fine = arb_is_finite(sum);
        if (fine) {
            q = patches_add(w->s, 1, 2);
            arb_set(q->poly, sum);
            arf_set(q->centre, arb_midref(acb_realref(at)));
            arf_set_mag(q->width, arb_radref(acb_realref(at)));
            problem_t(q->t_left, p, a, 2 * LOW_BITS);
            problem_t(q->t_right, p, b, 2 * LOW_BITS);
        }
    }
    arb_clear(ell);
    arb_clear(T);
    arb_clear(part);
    arb_clear(sum);
    acb_clear(value);
    acb_clear(at);
    return fine;
}

/* min(1, T/(y T')) at y, in doubles: how much narrower than y itself the steps have to be where T grows faster than y. */
static double coordinate_pace(walker *w, double y)
{
    const problem *p = w->p;
    acb_t at, t, slope;
    double pace = 1;
    arf_t here;
    bool beyond;
    arf_init(here);
    arf_set_d(here, y);
    beyond = problem_is_beyond(p, here);
    arf_clear(here);
    if (p->pure || beyond)
        return 1;
    acb_init(at);
    acb_init(t);
    acb_init(slope);
    acb_set_d(at, y);
    tape_eval(t, p->phase, at, false, LOW_BITS);
    tape_eval(slope, p->slope, at, false, LOW_BITS);
    if (acb_is_finite(t) && acb_is_finite(slope) && arb_is_positive(acb_realref(slope)) && arb_is_positive(acb_realref(t)))
        pace = fmpz_get_d(fmpq_numref(p->m)) / fmpz_get_d(fmpq_denref(p->m)) *
               arf_get_d(arb_midref(acb_realref(t)), ARF_RND_NEAR) / (y * arf_get_d(arb_midref(acb_realref(slope)), ARF_RND_NEAR));
    acb_clear(slope);
    acb_clear(t);
    acb_clear(at);
    return fmax(fmin(pace, 1), 1e-4);
}

/* Patches from the exact real `left` to `right` (balls, t_left and t_right their heights), no sheet ending in between. */
static bool walk_stretch(walker *w, const arb_t left, const arb_t t_left, const arb_t right, const arb_t t_right)
{
    problem *p = w->p;
    arb_t y, t;
    double at = arf_get_d(arb_midref(left), ARF_RND_NEAR) * (1 - 1e-12), end = arf_get_d(arb_midref(right), ARF_RND_NEAR);
    bool fine = true, start = true;
    arb_init(y);
    arb_init(t);
    arb_set(t, t_left);
    end *= 1 + 1e-12;
    while (fine && at < end) {
        double width = fmin(at / (w->first + 3), at / 7) * coordinate_pace(w, at), narrow = width / 12, next;
        bool last;
        if (at + 2 * width > end - 0.2 * width)
            width = (end - at) / 2 * (1 + 1e-12);
        fine = w->s->count < DISCS_MOST && budget_ok(p->e);
        while (fine && !disc_patch(w, at + width, width, width > narrow)) {
            width /= 1.6;
            if (width < 1e-7 * at) {
                arb_set_d(y, at);
                if (start)
                    arb_set(y, left);
                fine = (end - at) < 1e-4 * at && crude_patch(w, y, right);
                if (fine)
                    width = end - at;
                else
                    w->s->reason = "the integrand could not be proved analytic along the path";
                break;
            }
        }
        if (!fine)
            break;
        next = at + 2 * width * (1 - 1e-13);
        last = next >= end * (1 - 1e-12);
        arb_set(w->s->list[w->s->count - 1].t_left, t);
        if (last) {
            arb_set(t, t_right);
        } else {
            arb_set_d(y, next);
            problem_t(t, p, y, p->bits + LOW_BITS);
        }
        arb_set(w->s->list[w->s->count - 1].t_right, t);
        at = last ? end : next;
        start = false;
    }
    arb_clear(t);
    arb_clear(y);
    return fine;
}

/* The real y with T(y) = T_near, as a ball: Newton in doubles, then a bracket by the sign of p - t. */
static bool start_point(arb_t y, const problem *p, const arb_t t)
{
    double guess = arf_get_d(arb_midref(t), ARF_RND_NEAR), low, high;
    arb_t at, value;
    bool fine = true;
    arb_init(at);
    arb_init(value);
    high = guess > 0 ? guess : 1;
    for (int k = 0; k < 200; k++) {
        arb_set_d(at, high);
        problem_t(value, p, at, 128);
        if (arb_gt(value, t))
            break;
        high *= 1.5;
    }
    fine = arb_gt(value, t);
    low = 0;
    for (int k = 0; k < 200 && fine && high - low > 1e-13 * high; k++) {
        double middle = low + (high - low) * (k % 2 ? 0.47 : 0.5);
        arb_set_d(at, middle);
        problem_t(value, p, at, 128);
        if (arb_gt(value, t))
            high = middle;
        else if (arb_lt(value, t))
            low = middle; /* where neither is known the next round tries another point */
    }
    fine = fine && low > 0 && high - low < 4e-13 * high;
    arb_set_d(y, low);
    arb_set_d(at, high);
    arb_union(y, y, at, 128);
    arb_clear(value);
    arb_clear(at);
    return fine;
}

/* The first end beyond `from`, or y_far. */
static void next_stop(arb_t y, arb_t t, const problem *p, double from, double y_far)
{
    arb_set_d(y, y_far);
    problem_t(t, p, y, p->bits + LOW_BITS);
    for (size_t b = 0; b < p->sheet_count; b++) {
        const sheet *one = p->sheets + b;
        if (one->end && arf_cmp_d(arb_midref(one->end_y), from) > 0 && arf_cmp(arb_midref(one->end_y), arb_midref(y)) < 0) {
            arb_set(y, one->end_y);
            arb_set(t, one->end_t);
        }
    }
}

static bool all_ended(const problem *p, double y)
{
    for (size_t b = 0; b < p->sheet_count; b++)
        if (sheet_alive(p->sheets + b, y))
            return false;
    return true;
}

bool discs_build(patches *s, problem *p, double T_near, double y_far)
{
    walker w = {.p = p, .s = s, .first = s->first};
    arb_t left, t_left, right, t_right;
    double at;
    bool fine = true;
    fmpq_init(w.inverse_m);
    fmpq_inv(w.inverse_m, p->m);
    arb_init(left);
    arb_init(t_left);
    arb_init(right);
    arb_init(t_right);
    arb_set_d(left, T_near);
    problem_power(t_left, p, left, p->bits + LOW_BITS);
    if (!p->pure)
        fine = start_point(left, p, t_left);
    if (!fine)
        s->reason = "the phase could not be followed along the path";
    at = arf_get_d(arb_midref(left), ARF_RND_NEAR);
    while (fine && at < y_far * (1 - 1e-9)) {
        slong before = s->count;
        next_stop(right, t_right, p, at * (1 + 1e-9), y_far);
        fine = walk_stretch(&w, left, t_left, right, t_right);
        for (slong k = before; k < s->count; k++)
            s->list[k].ended = all_ended(p, at * (1 + 1e-9));
        arb_set(left, right);
        arb_set(t_left, t_right);
        at = arf_get_d(arb_midref(left), ARF_RND_NEAR);
    }
    if (!fine && !s->reason)
        s->reason = "the integrand could not be proved analytic along the path";
    arb_clear(t_right);
    arb_clear(right);
    arb_clear(t_left);
    arb_clear(left);
    fmpq_clear(w.inverse_m);
    return fine;
}
