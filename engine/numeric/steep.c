/* Remainders of steepest descent: G(t) = sum over half branches of n_k q dz/dt along p = p0 + t, less the kept terms, weighed with
 * exp(-S t). Next to the critical point the further coefficients and Cauchy's bound on a disc where the root of p - p0 is univalent;
 * away from it, at points t_c one after the other, the Taylor series of all branches' inverses at once, cancelled against the kept
 * terms in the coefficients (remainders.md: the circle lemma again with m = 1); far out an explicit bound.
 *
 * One idea: the discs in which p is proved univalent make each inverse one analytic function, and consecutive discs share a point, so
 * that it is the continuation of the one before. All arithmetic is in balls; nothing is assumed of the branches but what is proved. */
#include "engine/numeric/steep.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/numeric/problem.h"
#include "engine/numeric/terms.h"

enum { NEAR_PIECES = 24, PANEL_PIECES = 8, PANEL_MOST = 400, HALVES_MOST = 16 };

void steep_bound_init(steep_bound *b)
{
    memset(b, 0, sizeof *b);
    acb_init(b->error);
    acb_init(b->kept);
    arb_init(b->alpha);
    arb_init(b->beyond);
}

void steep_bound_clear(steep_bound *b)
{
    free(b->reason);
    acb_clear(b->error);
    acb_clear(b->kept);
    arb_clear(b->alpha);
    arb_clear(b->beyond);
    if (b->t) {
        _arb_vec_clear(b->t, PANEL_MOST * PANEL_PIECES + NEAR_PIECES + 2);
        _arb_vec_clear(b->height, PANEL_MOST * PANEL_PIECES + NEAR_PIECES + 2);
    }
    memset(b, 0, sizeof *b);
}

typedef struct steep {
    tw_engine *e;
    const steepest *s;
    landscape l;
    const spot *spot;
    struct spot end;         /* when the place is no saddle */
    bool has_end;
    expr *q;
    tape *amplitude;
    slong m, first, known, bits;
    acb_ptr g;               /* g[N-1], N <= known: q dz = sum g_N v^(N-1) dv */
    acb_ptr G;               /* sum_k n_k (root w^k)^N g_N: the coefficient of t^(N/m-1)/m */
    acb_t root;
    arb_t S, near_end;       /* t up to which the near zone goes */
    arb_t C, rho, theta;     /* |g_N| <= C rho^(1-N); |v| <= theta rho in the near zone */
    slong weight;            /* sum |n_k| */
    size_t half_count;
    slong halves[HALVES_MOST];
    acb_struct at[HALVES_MOST]; /* the present point of each half branch */
    arb_t target;            /* absolute size that no longer matters */
    steep_bound *out;
    const char *reason;
} steep;

/* ---- setting up ---- */

static const spot *find_spot(steep *p)
{
    for (size_t k = 0; k < p->l.count; k++)
        if (p->l.spots[k].place == p->s->place)
            return p->l.spots + k;
    p->has_end = landscape_point(&p->l, &p->end, p->s->place);
    return p->has_end ? &p->end : NULL;
}

/* The Taylor series of q at z. */
static bool amplitude_series(acb_poly_t out, const steep *p, const acb_t z, slong length, slong bits)
{
    acb_ptr c = _acb_vec_init(length);
    tape_jet(c, p->amplitude, z, length, bits);
    acb_poly_zero(out);
    bool fine = true;
    for (slong k = 0; k < length; k++) {
        fine = fine && acb_is_finite(c + k);
        acb_poly_set_coeff_acb(out, k, c + k);
    }
    _acb_vec_clear(c, length);
    return fine;
}

/* p(z + u) - p(z). */
static bool phase_series(acb_poly_t out, const landscape *l, const acb_t z, slong length, slong bits)
{
    acb_poly_t a, b;
    acb_poly_init(a);
    acb_poly_init(b);
    acb_poly_taylor_shift(a, l->top, z, bits);
    acb_poly_taylor_shift(b, l->bottom, z, bits);
    acb_poly_div_series(out, a, b, length, bits);
    acb_poly_set_coeff_si(out, 0, 0);
    acb_poly_clear(a);
    acb_poly_clear(b);
    return true;
}

/* q(z + x(y)) x'(y), x the inverse of `phase` (no constant term, nonzero slope). */
static bool density(acb_poly_t out, const steep *p, const acb_t z, const acb_poly_t phase, slong length, slong bits)
{
    acb_poly_t x, q;
    acb_poly_init(x);
    acb_poly_init(q);
    acb_poly_revert_series(x, phase, length + 1, bits);
    bool fine = amplitude_series(q, p, z, length, bits);
    acb_poly_compose_series(q, q, x, length, bits);
    acb_poly_derivative(x, x, bits);
    acb_poly_mullow(out, q, x, length, bits);
    acb_poly_clear(x);
    acb_poly_clear(q);
    return fine;
}

/* v(u) = u ((p - p0)/(lead u^m))^(1/m). */
static void root_series(acb_poly_t out, const steep *p, slong length)
{
    acb_t one;
    acb_poly_t f;
    acb_init(one);
    acb_poly_init(f);
    phase_series(f, &p->l, p->spot->z, length + p->m, p->bits);
    acb_poly_shift_right(f, f, p->m);
    acb_inv(one, p->spot->lead, p->bits);
    acb_poly_scalar_mul(f, f, one, p->bits);
    acb_one(one);
    acb_poly_set_coeff_acb(f, 0, one); /* exactly */
    acb_poly_log_series(f, f, length, p->bits);
    acb_set_si(one, p->m);
    acb_poly_scalar_div(f, f, one, p->bits);
    acb_poly_exp_series(f, f, length, p->bits);
    acb_poly_shift_left(out, f, 1);
    acb_clear(one);
    acb_poly_clear(f);
}

static bool find_coefficients(steep *p)
{
    acb_poly_t v, g;
    acb_poly_init(v);
    acb_poly_init(g);
    root_series(v, p, p->known + 1);
    bool fine = density(g, p, p->spot->z, v, p->known, p->bits);
    p->g = _acb_vec_init(p->known);
    p->G = _acb_vec_init(p->known);
    acb_t power, unit, sum, t;
    fmpq_t angle;
    acb_init(power), acb_init(unit), acb_init(sum), acb_init(t);
    fmpq_init(angle);
    acb_one(power);
    for (slong N = 1; N <= p->known && fine; N++) {
        acb_poly_get_coeff_acb(p->g + N - 1, g, N - 1);
        acb_mul(power, power, p->root, p->bits);
        acb_zero(sum);
        for (slong k = 0; k < p->m; k++) {
            if (!p->s->n[k])
                continue;
            fmpq_set_si(angle, 2 * (k * N % p->m), (ulong)p->m);
            arb_sin_cos_pi_fmpq(acb_imagref(unit), acb_realref(unit), angle, p->bits);
            acb_addmul_si(sum, unit, p->s->n[k], p->bits);
        }
        acb_mul(t, power, sum, p->bits);
        if (p->s->half)
            acb_mul_2exp_si(t, t, -1);
        acb_mul(p->G + N - 1, t, p->g + N - 1, p->bits);
        fine = acb_is_finite(p->G + N - 1);
    }
    acb_clear(power), acb_clear(unit), acb_clear(sum), acb_clear(t);
    fmpq_clear(angle);
    acb_poly_clear(v);
    acb_poly_clear(g);
    return fine;
}

/* Upper bound of |q| on |z - c| <= r. */
static bool amplitude_bound(arb_t out, const steep *p, const acb_t c, const arb_t r)
{
    acb_t z;
    mag_t m;
    acb_init(z);
    mag_init(m);
    acb_set(z, c);
    arb_get_mag(m, r);
    acb_add_error_mag(z, m);
    tape_eval(z, p->amplitude, z, true, 64);
    bool fine = acb_is_finite(z);
    acb_get_mag(m, z);
    arb_zero(out);
    arf_set_mag(arb_midref(out), m);
    acb_clear(z);
    mag_clear(m);
    return fine;
}

/* The disc at the spot: C, rho, the near zone's end. */
static bool near_zone(steep *p)
{
    arb_t r, kappa, reach, t;
    arb_init(r), arb_init(kappa), arb_init(reach), arb_init(t);
    bool fine = univalent_disc(r, kappa, reach, &p->l, p->spot->z, p->m > 1 ? p->spot : NULL);
    for (int tries = 0; tries < 12 && fine && !amplitude_bound(p->C, p, p->spot->z, r); tries++) { /* a pole of q: a smaller disc */
        arb_mul_2exp_si(r, r, -1);
        arb_mul_2exp_si(reach, reach, -1); /* kappa only falls */
        if (tries == 11)
            fine = false;
    }
    if (fine) {
        arb_set(p->rho, reach);
        arb_sub_ui(t, kappa, 1, 64);
        arb_neg(t, t);
        arb_div(p->C, p->C, t, 64);
        arb_set_d(p->theta, 0.6);
        arb_mul(t, p->theta, p->rho, 64);
        arb_pow_ui(t, t, (ulong)p->m, 64);
        acb_abs(r, p->spot->lead, 64);
        arb_mul(t, t, r, 64);
        arb_get_lbound_arf(arb_midref(p->near_end), t, 40);
        mag_zero(arb_radref(p->near_end));
        fine = arb_is_positive(p->near_end) && arb_is_finite(p->C);
    }
    arb_clear(r), arb_clear(kappa), arb_clear(reach), arb_clear(t);
    return fine;
}

static void exponent_of(arb_t out, const steep *p, slong N)
{
    arb_set_si(out, N);
    arb_div_si(out, out, p->m, p->bits);
}

/* G_N/m Gamma(N/m) S^(-N/m) */
static void whole_term(acb_t out, const steep *p, slong N)
{
    arb_t a, w;
    arb_init(a);
    arb_init(w);
    exponent_of(a, p, N);
    arb_gamma(w, a, p->bits);
    arb_neg(a, a);
    arb_pow(a, p->S, a, p->bits);
    arb_mul(w, w, a, p->bits);
    arb_div_si(w, w, p->m, p->bits);
    acb_mul_arb(out, p->G + N - 1, w, p->bits);
    arb_clear(a);
    arb_clear(w);
}

/* ---- steps of the bound ---- */

static void add_height(steep *p, const arb_t from, const arb_t to, const acb_t h)
{
    steep_bound *b = p->out;
    arb_t size, t;
    arb_init(size);
    arb_init(t);
    acb_abs(size, h, 64);
    arb_sub_ui(t, b->alpha, 1, 64); /* over t^(alpha - 1), at the end where that is smaller */
    arb_neg(t, t);
    arb_pow(t, arb_is_negative(t) ? from : to, t, 64);
    if (arb_is_positive(b->alpha) && arb_is_zero(from))
        arb_indeterminate(t);
    arb_mul(size, size, t, 64);
    arb_get_ubound_arf(arb_midref(b->height + b->count), size, 64);
    mag_zero(arb_radref(b->height + b->count));
    arb_set(b->t + b->count, from);
    arb_set(b->t + b->count + 1, to);
    b->count++;
    arb_clear(size);
    arb_clear(t);
}

/* int_a^b exp(-S t) dt */
static void panel_weight(arb_t out, const steep *p, const arb_t a, const arb_t b)
{
    arb_t t, u;
    arb_init(t);
    arb_init(u);
    arb_mul(t, p->S, a, 128);
    arb_neg(t, t);
    arb_exp(t, t, 128);
    arb_mul(u, p->S, b, 128);
    arb_neg(u, u);
    arb_exp(u, u, 128);
    arb_sub(out, t, u, 128);
    arb_div(out, out, p->S, 128);
    arb_clear(t);
    arb_clear(u);
}

/* Near: heights over t^(alpha-1) from the coefficients first .. known and the tail, and the signed integral. */
static bool near_part(steep *p)
{
    steep_bound *b = p->out;
    arb_t a, w, tail, from, to, y, g;
    acb_t sum, v;
    arb_init(a), arb_init(w), arb_init(tail), arb_init(from), arb_init(to), arb_init(y), arb_init(g);
    acb_init(sum), acb_init(v);
    arb_mul(y, p->S, p->near_end, p->bits);
    for (slong N = p->first; N <= p->known; N++) { /* G_N/m S^(-a) gamma(a, S near_end) */
        exponent_of(a, p, N);
        arb_hypgeom_gamma_lower(g, a, y, 0, p->bits + 64);
        arb_neg(a, a);
        arb_pow(w, p->S, a, p->bits);
        arb_mul(g, g, w, p->bits);
        arb_div_si(g, g, p->m, p->bits);
        acb_addmul_arb(b->error, p->G + N - 1, g, p->bits);
    }
    /* the tail: weight*C/(1 - theta) rho^-M |root|^(M+1)/m t^((M+1)/m - 1) */
    slong M = p->known;
    arb_sub_ui(tail, p->theta, 1, 64);
    arb_neg(tail, tail);
    arb_div(tail, p->C, tail, 64);
    arb_mul_si(tail, tail, p->weight, 64);
    arb_pow_ui(w, p->rho, (ulong)M, 64);
    arb_div(tail, tail, w, 64);
    acb_abs(w, p->root, 64);
    arb_pow_ui(w, w, (ulong)(M + 1), 64);
    arb_mul(tail, tail, w, 64);
    arb_div_si(tail, tail, p->m, 64);
    exponent_of(a, p, M + 1);
    arb_hypgeom_gamma_lower(g, a, y, 0, p->bits + 64);
    arb_neg(a, a);
    arb_pow(w, p->S, a, p->bits);
    arb_mul(g, g, w, p->bits);
    arb_mul(g, g, tail, 64);
    mag_t err;
    mag_init(err);
    arb_get_mag(err, g);
    acb_add_error_mag(b->error, err);
    mag_clear(err);
    bool fine = acb_is_finite(b->error);
    for (slong k = 0; k < NEAR_PIECES && fine; k++) { /* heights on pieces, as a polynomial in y = t^(1/m) */
        arb_mul_si(from, p->near_end, k * k, 64);
        arb_div_si(from, from, NEAR_PIECES * NEAR_PIECES, 64);
        arb_mul_si(to, p->near_end, (k + 1) * (k + 1), 64);
        arb_div_si(to, to, NEAR_PIECES * NEAR_PIECES, 64);
        if (k + 1 == NEAR_PIECES)
            arb_set(to, p->near_end);
        arb_union(y, from, to, 64);
        arb_root_ui(y, y, (ulong)p->m, 64);
        if (k == 0) {
            arb_root_ui(y, to, (ulong)p->m, 64);
            arb_zero(w);
            arb_union(y, y, w, 64);
        }
        acb_zero(sum);
        for (slong N = p->known; N >= p->first; N--) {
            acb_mul_arb(sum, sum, y, 64);
            acb_add(sum, sum, p->G + N - 1, 64);
        }
        acb_div_si(sum, sum, p->m, 64);
        arb_root_ui(w, to, (ulong)p->m, 64);
        arb_pow_ui(w, w, (ulong)(M + 1 - p->first), 64);
        arb_mul(w, w, tail, 64);
        acb_abs(g, sum, 64);
        arb_add(g, g, w, 64);
        arb_get_ubound_arf(arb_midref(b->height + b->count), g, 64);
        mag_zero(arb_radref(b->height + b->count));
        arb_set(b->t + b->count, from);
        arb_set(b->t + b->count + 1, to);
        b->count++;
        fine = arb_is_finite(b->height + b->count - 1);
    }
    arb_clear(a), arb_clear(w), arb_clear(tail), arb_clear(from), arb_clear(to), arb_clear(y), arb_clear(g);
    acb_clear(sum), acb_clear(v);
    return fine;
}

/* ---- away ---- */

/* z with p(z) = p0 + t from a start near by; exact. */
static bool solve_phase(acb_t z, const steep *p, const arb_t t)
{
    acb_t f, d;
    acb_init(f);
    acb_init(d);
    bool fine = true;
    for (int k = 0; k < 60 && fine; k++) {
        landscape_value(f, &p->l, z, p->bits);
        acb_sub(f, f, p->spot->height, p->bits);
        acb_sub_arb(f, f, t, p->bits);
        landscape_slope(d, &p->l, z, p->bits);
        acb_div(f, f, d, p->bits);
        acb_get_mid(f, f);
        acb_sub(z, z, f, p->bits);
        acb_get_mid(z, z);
        fine = acb_is_finite(z);
        mag_t a, b;
        mag_init(a), mag_init(b);
        acb_get_mag(a, f);
        acb_get_mag(b, z);
        mag_mul_2exp_si(b, b, -p->bits + 24);
        bool small = mag_cmp(a, b) <= 0;
        mag_clear(a), mag_clear(b);
        if (small)
            break;
    }
    acb_clear(f);
    acb_clear(d);
    return fine;
}

/* The first points, at the near zone's end, one a half branch: inside the spot's disc, in its sector. */
static bool first_points(steep *p)
{
    arb_t r, kappa, reach, size, pi;
    acb_t w, unit;
    fmpq_t angle;
    arb_init(r), arb_init(kappa), arb_init(reach), arb_init(size), arb_init(pi);
    acb_init(w), acb_init(unit);
    fmpq_init(angle);
    bool fine = univalent_disc(r, kappa, reach, &p->l, p->spot->z, p->m > 1 ? p->spot : NULL);
    for (size_t j = 0; j < p->half_count && fine; j++) {
        fmpq_set_si(angle, 2 * p->halves[j], (ulong)p->m);
        arb_sin_cos_pi_fmpq(acb_imagref(unit), acb_realref(unit), angle, p->bits);
        acb_mul(unit, unit, p->root, p->bits);
        arb_root_ui(size, p->near_end, (ulong)p->m, p->bits);
        acb_mul_arb(w, unit, size, p->bits); /* v, about u */
        acb_add(p->at + j, p->spot->z, w, p->bits);
        acb_get_mid(p->at + j, p->at + j);
        fine = solve_phase(p->at + j, p, p->near_end);
        acb_sub(w, p->at + j, p->spot->z, p->bits);
        acb_abs(size, w, 64);
        fine = fine && arb_lt(size, r);
        acb_div(w, w, unit, 64);
        fine = fine && arb_is_positive(acb_realref(w));
        acb_arg(size, w, 64);
        arb_abs(size, size);
        arb_mul_si(size, size, 2 * p->m, 64);
        arb_const_pi(pi, 64);
        fine = fine && arb_lt(size, pi);
    }
    arb_clear(r), arb_clear(kappa), arb_clear(reach), arb_clear(size), arb_clear(pi);
    acb_clear(w), acb_clear(unit);
    fmpq_clear(angle);
    return fine;
}

typedef struct disc {
    arb_t r, kappa, reach; /* reach: of the image, in units of t */
    arb_t C;               /* |dz/dt q| on the image disc */
} disc;

static void disc_init(disc *d)
{
    arb_init(d->r), arb_init(d->kappa), arb_init(d->reach), arb_init(d->C);
}

static void disc_clear(disc *d)
{
    arb_clear(d->r), arb_clear(d->kappa), arb_clear(d->reach), arb_clear(d->C);
}

static bool disc_at(disc *d, const steep *p, const acb_t c)
{
    acb_t s;
    arb_t slope, t;
    acb_init(s);
    arb_init(slope), arb_init(t);
    bool fine = univalent_disc(d->r, d->kappa, d->reach, &p->l, c, NULL);
    for (int tries = 0; tries < 12 && fine && !amplitude_bound(d->C, p, c, d->r); tries++) {
        arb_mul_2exp_si(d->r, d->r, -1);
        arb_mul_2exp_si(d->reach, d->reach, -1);
        if (tries == 11)
            fine = false;
    }
    landscape_slope(s, &p->l, c, 128);
    acb_abs(slope, s, 64);
    arb_mul(d->reach, d->reach, slope, 64);
    arb_sub_ui(t, d->kappa, 1, 64);
    arb_neg(t, t);
    arb_mul(t, t, slope, 64);
    arb_div(d->C, d->C, t, 64);
    fine = fine && arb_is_finite(d->C) && arb_is_positive(d->reach);
    acb_clear(s);
    arb_clear(slope), arb_clear(t);
    return fine;
}

/* The kept terms sum G_N/m t^(N/m-1), N < first, at t_c + x; its values on |x| <= t_c/2 are at most `most`. */
static void kept_series(acb_poly_t out, arb_t most, const steep *p, const arb_t t, slong length)
{
    acb_poly_t y, v;
    acb_t c;
    arb_t size, high, g;
    fmpq_t power;
    acb_poly_init(y), acb_poly_init(v);
    acb_init(c);
    arb_init(size), arb_init(high), arb_init(g);
    fmpq_init(power);
    acb_poly_set_coeff_si(v, 1, 1);
    acb_set_arb(c, t);
    acb_poly_set_coeff_acb(v, 0, c);
    fmpq_set_si(power, 1, (ulong)p->m);
    acb_set_si(c, 1);
    acb_div_si(c, c, p->m, p->bits);
    acb_poly_pow_acb_series(y, v, c, length, p->bits); /* t^(1/m) */
    acb_poly_zero(out);
    arb_zero(most);
    arb_mul_si(high, t, 3, 64);
    arb_mul_2exp_si(high, high, -1);
    arb_root_ui(size, high, (ulong)p->m, 64);
    for (slong N = p->first - 1; N >= 1; N--) {
        acb_poly_mullow(out, out, y, length, p->bits);
        acb_poly_get_coeff_acb(c, out, 0);
        acb_add(c, c, p->G + N - 1, p->bits);
        acb_poly_set_coeff_acb(out, 0, c);
        arb_mul(most, most, size, 64);
        acb_abs(g, p->G + N - 1, 64);
        arb_add(most, most, g, 64);
    }
    if (p->first > 1) { /* times y/(m t) */
        acb_poly_mullow(out, out, y, length, p->bits);
        acb_poly_div_series(out, out, v, length, p->bits);
        acb_set_si(c, p->m);
        acb_poly_scalar_div(out, out, c, p->bits);
        arb_mul(most, most, size, 64);
        arb_mul_2exp_si(most, most, 1); /* over t/2 */
        arb_div(most, most, t, 64);
        arb_div_si(most, most, p->m, 64);
    }
    acb_poly_clear(y), acb_poly_clear(v);
    acb_clear(c);
    arb_clear(size), arb_clear(high), arb_clear(g);
    fmpq_clear(power);
}

/* C (w/R)^J/(1 - w/R) */
static void cauchy_tail(arb_t out, const arb_t C, const arb_t w, const arb_t R, slong J)
{
    arb_t q, t;
    arb_init(q);
    arb_init(t);
    arb_div(q, w, R, 64);
    arb_pow_ui(out, q, (ulong)J, 64);
    arb_sub_ui(t, q, 1, 64);
    arb_neg(t, t);
    arb_div(out, out, t, 64);
    arb_mul(out, out, C, 64);
    if (!arb_is_positive(t))
        arb_indeterminate(out);
    arb_clear(q);
    arb_clear(t);
}

/* One panel [from, to] around t_c = their middle. */
static bool panel(steep *p, const disc *discs, const arb_t from, const arb_t to)
{
    enum { ORDER_FIRST = 32, ORDER_MOST = 400 };
    steep_bound *b = p->out;
    arb_t t, w, tail, one, a, c, weight, third;
    acb_t y, h, x;
    acb_poly_t D, K, f;
    arb_init(t), arb_init(w), arb_init(tail), arb_init(one), arb_init(a), arb_init(c), arb_init(weight), arb_init(third);
    acb_init(y), acb_init(h), acb_init(x);
    acb_poly_init(D), acb_poly_init(K), acb_poly_init(f);
    arb_add(t, from, to, p->bits);
    arb_mul_2exp_si(t, t, -1);
    arb_get_mid_arb(t, t);
    arb_sub(w, to, t, 64);
    panel_weight(weight, p, from, to);
    bool fine = true, enough = false;
    for (slong J = ORDER_FIRST; fine && !enough && J <= ORDER_MOST; J = 2 * J) {
        arb_mul_2exp_si(a, t, -1);
        kept_series(K, c, p, t, J);
        cauchy_tail(tail, c, w, a, J);
        acb_poly_zero(D);
        for (size_t j = 0; j < p->half_count && fine; j++) {
            phase_series(f, &p->l, p->at + j, J + 1, p->bits);
            fine = density(f, p, p->at + j, f, J, p->bits);
            landscape_value(y, &p->l, p->at + j, p->bits); /* the expansion's own centre, next to t */
            acb_sub(y, y, p->spot->height, p->bits);
            acb_sub_arb(y, y, t, p->bits);
            acb_neg(y, y);
            acb_abs(one, y, 64);
            arb_add(one, one, w, 64);
            cauchy_tail(a, discs[j].C, one, discs[j].reach, J);
            arb_mul_si(a, a, FLINT_ABS(p->s->n[p->halves[j]]), 64);
            arb_add(tail, tail, a, 64);
            acb_poly_taylor_shift(f, f, y, p->bits);
            acb_set_si(y, p->s->n[p->halves[j]]);
            if (p->s->half)
                acb_mul_2exp_si(y, y, -1);
            acb_poly_scalar_mul(f, f, y, p->bits);
            acb_poly_add(D, D, f, p->bits);
        }
        acb_poly_sub(D, D, K, p->bits);
        arb_mul(one, tail, weight, 64);
        enough = arb_lt(one, p->target) || 2 * J > ORDER_MOST;
    }
    for (slong k = 0; k < PANEL_PIECES && fine; k++) {
        arb_sub(c, to, from, 64);
        arb_mul_si(one, c, k, 64);
        arb_div_si(one, one, PANEL_PIECES, 64);
        arb_add(one, one, from, 64);
        arb_mul_si(third, c, k + 1, 64);
        arb_div_si(third, third, PANEL_PIECES, 64);
        arb_add(third, third, from, 64);
        arb_get_mid_arb(one, one);
        arb_get_mid_arb(third, third);
        if (k == 0)
            arb_set(one, from);
        if (k + 1 == PANEL_PIECES)
            arb_set(third, to);
        arb_union(a, one, third, 64);
        arb_sub(a, a, t, 64);
        acb_set_arb(x, a);
        acb_poly_evaluate(h, D, x, p->bits);
        mag_t err;
        mag_init(err);
        arb_get_mag(err, tail);
        acb_add_error_mag(h, err);
        mag_clear(err);
        panel_weight(weight, p, one, third);
        acb_addmul_arb(b->error, h, weight, 128);
        add_height(p, one, third, h);
        fine = acb_is_finite(h);
    }
    arb_clear(t), arb_clear(w), arb_clear(tail), arb_clear(one), arb_clear(a), arb_clear(c), arb_clear(weight), arb_clear(third);
    acb_clear(y), acb_clear(h), acb_clear(x);
    acb_poly_clear(D), acb_poly_clear(K), acb_poly_clear(f);
    return fine;
}

/* The half branches' points moved to t_c, inside the discs of the old ones; *discs are then the new ones'. */
static bool move_points(steep *p, disc *discs, const arb_t t)
{
    arb_t size;
    acb_t w, old;
    arb_init(size);
    acb_init(w), acb_init(old);
    bool fine = true;
    for (size_t j = 0; j < p->half_count && fine; j++) {
        acb_set(old, p->at + j);
        landscape_value(w, &p->l, old, p->bits); /* a Newton step as the start */
        fine = solve_phase(p->at + j, p, t);
        acb_sub(w, p->at + j, old, p->bits);
        acb_abs(size, w, 64);
        fine = fine && arb_lt(size, discs[j].r) && disc_at(&discs[j], p, p->at + j);
    }
    arb_clear(size);
    acb_clear(w), acb_clear(old);
    return fine;
}

/* ---- far ---- */

/* On |z| >= R: |f| >= or <= |leading coefficient| |z|^degree times a factor; R > 0. False where the lower one is not positive. */
static bool outside(arb_t low, arb_t high, const acb_poly_t f, const arb_t R)
{
    slong n = acb_poly_length(f) - 1;
    arb_t power, c, sum, lead;
    arb_init(power), arb_init(c), arb_init(sum), arb_init(lead);
    arb_one(power);
    for (slong k = n - 1; k >= 0; k--) {
        arb_div(power, power, R, 64);
        acb_abs(c, acb_poly_get_coeff_ptr(f, k), 64);
        arb_addmul(sum, c, power, 64);
    }
    acb_abs(lead, acb_poly_get_coeff_ptr(f, n), 64);
    arb_sub(low, lead, sum, 64);
    arb_add(high, lead, sum, 64);
    bool fine = arb_is_positive(low);
    arb_clear(power), arb_clear(c), arb_clear(sum), arb_clear(lead);
    return fine;
}

static void gauss_ball(acb_poly_t out, const gauss_poly *a)
{
    acb_poly_set2_fmpq_poly(out, a->re, a->im, 128);
}

/* |int_T^inf G exp(-S t) dt| of one half branch that goes to infinity beyond its point at T: with R = |z|/2 and t > max |p - p0| on
 * |z| = R the curve stays outside; there |q/p'| <= K |z|^a exp(c |z|^g), |z| <= (t/A)^(1/d). */
static bool far_branch(arb_t out, steep *p, const amplitude *q, const acb_t z, const arb_t T)
{
    slong d = p->l.at_infinity, grow, degree;
    arb_t R, low, high, A, K, x, slope, u;
    acb_poly_t f;
    arb_init(R), arb_init(low), arb_init(high), arb_init(A), arb_init(K), arb_init(x), arb_init(slope), arb_init(u);
    acb_poly_init(f);
    acb_abs(R, z, 64);
    arb_mul_2exp_si(R, R, -1);
    arb_get_lbound_arf(arb_midref(R), R, 40);
    mag_zero(arb_radref(R));
    bool fine = d > 0 && q->exact && arb_is_positive(R);
    if (fine) { /* |p - p0| between A |z|^d and the upper bound, which at R must lie below T */
        acb_t h;
        acb_init(h);
        acb_poly_scalar_mul(f, p->l.bottom, p->spot->height, 128);
        acb_poly_sub(f, p->l.top, f, 128);
        acb_poly_set_coeff_acb(f, acb_poly_length(p->l.top) - 1, acb_poly_get_coeff_ptr(f, acb_poly_length(p->l.top) - 1));
        fine = outside(low, high, f, R);
        arb_set(A, low);
        arb_set(x, high);
        fine = fine && outside(low, high, p->l.bottom, R);
        arb_div(A, A, high, 64);
        arb_div(x, x, low, 64);
        arb_pow_ui(u, R, (ulong)d, 64);
        arb_mul(x, x, u, 64);
        fine = fine && arb_lt(x, T);
        acb_clear(h);
    }
    if (fine) { /* K: q over p' */
        fine = outside(low, high, p->l.rise, R);
        arb_inv(K, low, 64);
        fine = fine && outside(low, high, p->l.bottom, R);
        arb_mul(K, K, high, 64);
        arb_mul(K, K, high, 64);
        gauss_ball(f, &q->top);
        outside(low, high, f, R);
        arb_mul(K, K, high, 64);
        degree = acb_poly_length(f) - 1;
        gauss_ball(f, &q->bottom);
        fine = fine && outside(low, high, f, R);
        arb_div(K, K, low, 64);
        degree -= acb_poly_length(f) - 1 + d - 1;
        gauss_ball(f, &q->growth);
        grow = FLINT_MAX(acb_poly_length(f) - 1, 0);
        arb_zero(slope); /* c */
        if (grow > 0) {
            outside(low, slope, f, R);
        }
        acb_t c;
        acb_init(c);
        fine = fine && ball_value(p->e, c, q->factor, 128) == TW_OK && acb_is_finite(c);
        acb_abs(u, c, 64);
        arb_mul(K, K, u, 64);
        acb_clear(c);
    }
    if (fine) { /* h(t) = a/d log(t/A) + c (t/A)^(g/d), concave; a >= 0 */
        if (degree < 0) {
            arb_pow_ui(u, R, (ulong)-degree, 64);
            arb_div(K, K, u, 64);
            degree = 0;
        }
        arb_div(x, T, A, 64);
        arb_root_ui(u, x, (ulong)d, 64); /* |z| at most */
        arb_pow_ui(low, u, (ulong)degree, 64);
        arb_mul(K, K, low, 64);
        arb_pow_ui(low, u, (ulong)grow, 64);
        arb_mul(low, low, slope, 64); /* c (T/A)^(g/d) */
        arb_exp(high, low, 64);
        arb_mul(K, K, high, 64);
        arb_mul_si(low, low, grow, 64); /* h' = (a + g c ...)/(d T) */
        arb_add_si(low, low, degree, 64);
        arb_div_si(low, low, d, 64);
        arb_div(low, low, T, 64);
        arb_sub(low, p->S, low, 64);
        fine = arb_is_positive(low);
        arb_mul(x, p->S, T, 64);
        arb_neg(x, x);
        arb_exp(x, x, 64);
        arb_mul(out, K, x, 64);
        arb_div(out, out, low, 64);
    }
    arb_clear(R), arb_clear(low), arb_clear(high), arb_clear(A), arb_clear(K), arb_clear(x), arb_clear(slope), arb_clear(u);
    acb_poly_clear(f);
    return fine;
}

/* The kept terms beyond T: sum |G_N|/m S^(-N/m) Gamma(N/m, S T). */
static void far_kept(arb_t out, const steep *p, const arb_t T)
{
    arb_t a, x, g;
    arb_init(a), arb_init(x), arb_init(g);
    arb_mul(x, p->S, T, p->bits);
    arb_zero(out);
    for (slong N = 1; N < p->first; N++) {
        exponent_of(a, p, N);
        arb_hypgeom_gamma_upper(g, a, x, 0, p->bits);
        arb_neg(a, a);
        arb_pow(a, p->S, a, p->bits);
        arb_mul(g, g, a, 64);
        acb_abs(a, p->G + N - 1, 64);
        arb_mul(g, g, a, 64);
        arb_div_si(g, g, p->m, 64);
        arb_add(out, out, g, 64);
    }
    arb_clear(a), arb_clear(x), arb_clear(g);
}

/* Everything beyond T, as one bound; false where a branch does not go to infinity (yet). */
static bool far_part(arb_t out, steep *p, const amplitude *q, const arb_t T)
{
    arb_t one;
    arb_init(one);
    far_kept(out, p, T);
    bool fine = true;
    for (size_t j = 0; j < p->half_count && fine; j++) {
        fine = far_branch(one, p, q, p->at + j, T);
        arb_mul_si(one, one, FLINT_ABS(p->s->n[p->halves[j]]), 64);
        arb_add(out, out, one, 64);
    }
    arb_clear(one);
    return fine && arb_is_finite(out);
}

/* ---- the whole ---- */

/* From the near zone's end outwards until what is left does not matter. */
static bool away_part(steep *p, const amplitude *q)
{
    disc *discs = base_alloc(p->half_count * sizeof *discs);
    arb_t from, to, w, t, rest;
    arb_init(from), arb_init(to), arb_init(w), arb_init(t), arb_init(rest);
    for (size_t j = 0; j < p->half_count; j++)
        disc_init(discs + j);
    bool fine = first_points(p), done = false;
    for (size_t j = 0; j < p->half_count && fine; j++)
        fine = disc_at(discs + j, p, p->at + j);
    arb_set(from, p->near_end);
    for (slong k = 0; fine && !done && k < PANEL_MOST && budget_ok(p->e); k++) {
        arb_mul_2exp_si(w, from, -3); /* the panel's half width: within a third of every disc, an eighth of t */
        for (size_t j = 0; j < p->half_count; j++) {
            arb_mul_2exp_si(t, discs[j].reach, -2);
            arb_min(w, w, t, 64);
        }
        arb_div(t, w, w, 64);
        arb_get_lbound_arf(arb_midref(w), w, 30);
        mag_zero(arb_radref(w));
        bool moved = false;
        for (int tries = 0; tries < 12 && !moved && fine; tries++) {
            arb_add(t, from, w, p->bits);
            acb_ptr old = _acb_vec_init((slong)p->half_count);
            for (size_t j = 0; j < p->half_count; j++)
                acb_set(old + j, p->at + j);
            moved = move_points(p, discs, t);
            for (size_t j = 0; j < p->half_count && moved; j++) { /* the new discs must reach over the panel */
                arb_mul_2exp_si(rest, discs[j].reach, -1);
                moved = arb_lt(w, rest);
            }
            if (!moved) {
                for (size_t j = 0; j < p->half_count; j++) {
                    acb_set(p->at + j, old + j);
                    fine = fine && disc_at(discs + j, p, p->at + j);
                }
                arb_mul_2exp_si(w, w, -1);
            }
            _acb_vec_clear(old, (slong)p->half_count);
        }
        fine = fine && moved;
        arb_add(to, t, w, p->bits);
        arb_get_mid_arb(to, to);
        fine = fine && panel(p, discs, from, to);
        arb_set(from, to);
        /* beyond? first a cheap look */
        arb_mul(rest, p->S, from, 64);
        if (fine && arf_cmp_si(arb_midref(rest), 2) > 0 && k % 3 == 2)
            done = far_part(rest, p, q, from) && arb_lt(rest, p->target);
    }
    if (fine && done) {
        mag_t err;
        mag_init(err);
        arb_get_mag(err, rest);
        acb_add_error_mag(p->out->error, err);
        arf_set_mag(arb_midref(p->out->beyond), err);
        mag_clear(err);
    }
    for (size_t j = 0; j < p->half_count; j++)
        disc_clear(discs + j);
    free(discs);
    arb_clear(from), arb_clear(to), arb_clear(w), arb_clear(t), arb_clear(rest);
    return fine && done;
}

static bool prepare(steep *p, const env *at)
{
    tw_engine *e = p->e;
    slong count = 0;
    p->reason = "the phase or a critical point of it is out of the machine's reach";
    if (!p->s->lead || p->s->residue || p->first < 1)
        return false;
    p->q = put_values(e, p->s->q, at);
    expr *z = p->s->z;
    p->amplitude = p->q ? tape_new(e, p->q, &z, 1) : NULL;
    p->spot = find_spot(p);
    if (!p->amplitude || !p->spot)
        return false;
    p->m = p->s->m;
    for (slong k = 0; k < p->m && count < HALVES_MOST; k++)
        if (p->s->n[k]) {
            p->halves[count++] = k;
            p->weight += FLINT_ABS(p->s->n[k]);
        }
    p->half_count = (size_t)count;
    acb_t v;
    acb_init(v);
    expr *scale = put_values(e, p->s->scale, at);
    bool fine = scale && ball_value(e, v, scale, 1024) == TW_OK && acb_is_finite(v);
    arb_set(p->S, acb_realref(v));
    acb_clear(v);
    p->known = p->first + 12 * p->m + 24;
    p->bits = 192 + 8 * p->known;
    landscape_refine(&p->l, p->bits);
    if (p->has_end && fine) {
        spot_clear(&p->end);
        p->has_end = landscape_point(&p->l, &p->end, p->s->place);
    }
    half_root(p->root, p->spot, p->m, p->bits);
    return fine && arb_is_positive(p->S) && count > 0;
}

/* Some terms more, so that the near zone's tail is nothing; the target is a small part of the largest of the next terms. */
static bool make(steep *p, const env *at)
{
    steep_bound *out = p->out;
    acb_t one;
    arb_t size;
    amplitude q;
    if (!prepare(p, at) || !near_zone(p))
        return false;
    p->reason = "the coefficients lose all their digits";
    if (!find_coefficients(p))
        return false;
    acb_init(one);
    arb_init(size);
    for (slong N = p->first; N <= FLINT_MIN(p->known, p->first + 2 * p->m); N++) {
        whole_term(one, p, N);
        acb_abs(size, one, 64);
        if (arb_gt(size, p->target))
            arb_set(p->target, size);
    }
    arb_get_ubound_arf(arb_midref(p->target), p->target, 30);
    mag_zero(arb_radref(p->target));
    arb_mul_2exp_si(p->target, p->target, -14);
    for (slong N = 1; N < p->first; N++) {
        whole_term(one, p, N);
        acb_add(out->kept, out->kept, one, p->bits);
    }
    exponent_of(out->alpha, p, p->first);
    p->reason = "near the critical point the series has no bound of use";
    bool fine = arb_is_positive(p->target) && near_part(p);
    amplitude_read(&q, p->e, p->q, p->s->z);
    if (fine) {
        p->reason = "a steepest curve could not be followed to infinity";
        fine = away_part(p, &q);
    }
    amplitude_clear(&q);
    acb_clear(one);
    arb_clear(size);
    return fine && acb_is_finite(out->error);
}

tw_status steep_bound_at(tw_engine *e, steep_bound *out, const steepest *s, slong first, const env *at)
{
    steep p = {.e = e, .s = s, .first = first, .out = out};
    if (!landscape_read(&p.l, e, s->p, s->z)) {
        out->reason = base_copy("the phase is not read");
        return e->error.kind ? TW_ERROR : TW_OK;
    }
    slong room = PANEL_MOST * PANEL_PIECES + NEAR_PIECES + 2;
    out->t = _arb_vec_init(room);
    out->height = _arb_vec_init(room);
    acb_init(p.root);
    arb_init(p.S), arb_init(p.near_end), arb_init(p.C), arb_init(p.rho), arb_init(p.theta), arb_init(p.target);
    for (int j = 0; j < HALVES_MOST; j++)
        acb_init(p.at + j);
    out->made = make(&p, at);
    if (!out->made)
        out->reason = base_copy(p.reason);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_UNSUITABLE)
        engine_forgive(e);
    for (int j = 0; j < HALVES_MOST; j++)
        acb_clear(p.at + j);
    if (p.g)
        _acb_vec_clear(p.g, p.known);
    if (p.G)
        _acb_vec_clear(p.G, p.known);
    acb_clear(p.root);
    arb_clear(p.S), arb_clear(p.near_end), arb_clear(p.C), arb_clear(p.rho), arb_clear(p.theta), arb_clear(p.target);
    tape_free(p.amplitude);
    if (p.has_end)
        spot_clear(&p.end);
    landscape_clear(&p.l);
    return e->error.kind ? TW_ERROR : TW_OK;
}
