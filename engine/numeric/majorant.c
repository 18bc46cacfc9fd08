/* A bound for all S >= S0. One idea: running maxima H of |h|, because as S grows the weight moves towards 0 (monotone likelihood
 * ratio), so the mean of a non-decreasing H falls; beyond the weight's mean at S0 a panel's share of the weight falls by itself, so
 * there H may stay as it is and the excess of |h| is added. */
#include "engine/numeric/sheaf.h"

#include <math.h>
#include <string.h>

#include "engine/numeric/shared.h"

enum { FIT_MOST = 4 };

typedef struct majorant {
    sheaf *s;
    slong K;
    arb_t c;          /* of omega */
    arb_ptr table;
    arb_t total;      /* int omega t^(alpha-1) exp(-S t), over Gamma(alpha) S^-alpha */
    double t_mean;    /* beyond it no running maximum is needed; rounded up */
    slong ended;      /* first panel beyond the last end; panel_count when there is none */
    mag_t crumb_h, crumb_mass;
    arb_t mean;       /* sum of H * mass, in units of Gamma(alpha) S^-alpha */
    arb_t end;        /* the same of what goes with exp(-(S - S0) end_t) */
    slong fit;        /* 0, or: h is measured from b[0] + b[1] t + ... + b[fit-1] t^(fit-1), whose integral is kept with its sign */
    arb_t b[FIT_MOST];
} majorant;

/* c of omega from the leading coefficients: h = f1 ell + f0 ~ (-log t + c). */
static void majorant_shift(majorant *m)
{
    const problem *p = m->s->p;
    slong first = m->s->patches.first;
    arb_t top;
    arb_init(top);
    arb_zero(m->c);
    if (m->K > 0) {
        arb_mul(top, p->f[m->K] + first, p->ell_factor, SUM_BITS);
        if (!arb_contains_zero(top)) {
            arb_div(m->c, p->f[m->K - 1] + first, top, SUM_BITS);
            arb_neg(m->c, m->c);
            arb_div_si(m->c, m->c, m->K, SUM_BITS);
        }
        mag_zero(arb_radref(m->c));
        if (arf_sgn(arb_midref(m->c)) < 0)
            arb_zero(m->c);
        arf_set_round(arb_midref(m->c), arb_midref(m->c), 20, ARF_RND_UP);
    }
    arb_clear(top);
}

/* h less the fitted polynomial over a panel. */
static void panel_beyond_fit(arb_t out, const majorant *m, const panel *q)
{
    arb_t t, c;
    arb_init(t);
    arb_init(c);
    arb_union(t, m->s->joints[q->left].t, m->s->joints[q->right].t, SUM_BITS);
    _arb_poly_evaluate(t, m->b[0], m->fit, t, SUM_BITS);
    arb_sub(out, q->h, t, SUM_BITS);
    if (q->lines) { /* straight lines cancel before the range is taken */
        affine sum, power;
        affine_init(&sum);
        affine_init(&power);
        affine_set(&sum, &q->line);
        arb_sub(sum.v, sum.v, m->b[0], SUM_BITS);
        affine_set(&power, &q->t);
        for (slong j = 1; j < m->fit; j++) {
            arb_neg(c, m->b[j]);
            affine_addmul(&sum, &power, c, SUM_BITS);
            if (j + 1 < m->fit)
                affine_mul(&power, &power, &q->t, SUM_BITS);
        }
        affine_range(t, &sum, SUM_BITS);
        if (mag_cmp(arb_radref(t), arb_radref(out)) < 0)
            arb_swap(out, t);
        affine_clear(&power);
        affine_clear(&sum);
    }
    arb_clear(c);
    arb_clear(t);
}

/* Upper bound of |h|/omega on a panel and of omega * mass; what part of it is the panel's own width. */
static double majorant_panel(mag_t h, arb_t mass, const majorant *m, const panel *q)
{
    arb_t a, b, x;
    double wide;
    arb_init(a);
    arb_init(b);
    arb_init(x);
    arb_set(a, q->h);
    if (m->fit)
        panel_beyond_fit(a, m, q);
    arb_get_mag(h, a);
    wide = fmin(1, 2 * mag_get_d(arb_radref(a)) / (mag_get_d(h) + 1e-300));
    arb_set(mass, q->mass);
    if (m->K > 0) {
        omega_value(a, m->s->joints[q->left].t, m->c, m->K, SUM_BITS);
        omega_value(b, m->s->joints[q->right].t, m->c, m->K, SUM_BITS);
        /* convex: the greatest value is at an end; the least is found from the ball over the panel */
        arb_max(x, a, b, SUM_BITS);
        arb_mul(mass, mass, x, SUM_BITS);
        arb_union(b, m->s->joints[q->left].t, m->s->joints[q->right].t, SUM_BITS);
        omega_value(x, b, m->c, m->K, SUM_BITS);
        if (arb_is_positive(x)) {
            mag_t low;
            mag_init(low);
            arb_get_mag_lower(low, x);
            mag_div(h, h, low);
            mag_clear(low);
        } else { /* omega >= (c + log 2)^K everywhere */
            arb_const_log2(x, SUM_BITS);
            arb_add(x, x, m->c, SUM_BITS);
            arb_pow_ui(x, x, (ulong)m->K, SUM_BITS);
            arb_inv(x, x, SUM_BITS);
            mag_t inverse;
            mag_init(inverse);
            arb_get_mag(inverse, x);
            mag_mul(h, h, inverse);
            mag_clear(inverse);
        }
    }
    arb_clear(x);
    arb_clear(b);
    arb_clear(a);
    return wide;
}

/* The crumb next to 0: |h| <= H omega^K with omega >= |log t| >= |log t0|, and its mass. */
static void majorant_crumb(majorant *m)
{
    const sheaf *s = m->s;
    arb_t t, x, d, total;
    mag_t bound, part;
    arb_init(t);
    arb_init(x);
    arb_init(d);
    arb_init(total);
    mag_init(bound);
    mag_init(part);
    mag_zero(m->crumb_h);
    mag_zero(m->crumb_mass);
    if (s->has_crumb) {
        double z = s->panels[0].z0;
        arb_set(t, s->joints[s->panels[0].left].t);
        for (slong k = 0; k <= m->K; k++) {
            patch_lane_bound(bound, s->patches.list, k, -1, z);
            arb_log(x, t, SUM_BITS);
            arb_abs(x, x);
            arb_pow_ui(x, x, (ulong)(m->K - k), SUM_BITS);
            arb_inv(x, x, SUM_BITS);
            arb_get_mag(part, x);
            mag_mul(bound, bound, part);
            arb_pow_ui(x, s->p->ell_factor, (ulong)k, SUM_BITS);
            arb_get_mag(part, x);
            mag_addmul(m->crumb_h, bound, part);
        }
        arb_add(d, m->c, t, SUM_BITS); /* c + (2/e) t <= c + t */
        omega_crumb(m->crumb_mass, s->w.alpha, d, t, m->K);
        weight_total(total, &s->w);
        arb_inv(total, total, SUM_BITS);
        arb_get_mag(part, total);
        mag_mul(m->crumb_mass, m->crumb_mass, part);
    }
    mag_clear(part);
    mag_clear(bound);
    arb_clear(total);
    arb_clear(d);
    arb_clear(x);
    arb_clear(t);
}

/* The weight's mean of t at S0: int omega t^alpha e^(-S t) / int omega t^(alpha-1) e^(-S t). */
static void majorant_mean(majorant *m)
{
    const sheaf *s = m->s;
    slong K = m->K;
    arb_ptr next = _arb_vec_init((K + 1) * (K + 1));
    arb_t alpha, x;
    arb_init(alpha);
    arb_init(x);
    omega_table(m->table, s->w.alpha, m->c, K, s->w.bits);
    omega_total(m->total, m->table, s->w.alpha, s->w.S, K, s->w.bits);
    arb_add_ui(alpha, s->w.alpha, 1, s->w.bits);
    omega_table(next, alpha, m->c, K, s->w.bits);
    omega_total(x, next, alpha, s->w.S, K, s->w.bits);
    arb_div(x, x, m->total, SUM_BITS);
    arb_get_ubound_arf(arb_midref(x), x, SUM_BITS);
    m->t_mean = arf_get_d(arb_midref(x), ARF_RND_UP);
    weight_total(x, &s->w);
    arb_div(m->total, m->total, x, SUM_BITS);
    arb_clear(x);
    arb_clear(alpha);
    _arb_vec_clear(next, (K + 1) * (K + 1));
}

static bool beyond_mean(const majorant *m, const panel *q)
{
    arb_t x;
    bool yes;
    arb_init(x);
    arb_set_d(x, m->t_mean);
    yes = arb_ge(m->s->joints[q->left].t, x);
    arb_clear(x);
    return yes;
}

/* Sums with running maxima; losses[k] (may be NULL): what panel k's own width costs. heights (may be NULL): H. */
static void majorant_sum(majorant *m, double *losses, arb_ptr heights)
{
    sheaf *s = m->s;
    mag_t running, h;
    arb_t mass, H, part;
    slong holder = -1;
    double *excess = flint_calloc((size_t)s->panel_count + 1, sizeof(double));
    double *charge = flint_calloc((size_t)s->panel_count + 1, sizeof(double));
    mag_init(running);
    mag_init(h);
    arb_init(mass);
    arb_init(H);
    arb_init(part);
    arb_zero(m->mean);
    arb_zero(m->end);
    mag_set(running, m->crumb_h);
    arf_set_mag(arb_midref(m->mean), m->crumb_h);
    arf_set_mag(arb_midref(part), m->crumb_mass);
    arb_mul(m->mean, m->mean, part, SUM_BITS);
    m->ended = s->panel_count;
    for (slong k = 0; k < s->panel_count; k++)
        if (s->patches.list[s->panels[k].patch].ended) {
            m->ended = k;
            break;
        }
    for (slong k = 0; k < s->panel_count; k++) {
        panel *q = s->panels + k;
        bool late = beyond_mean(m, q), after = k >= m->ended;
        excess[k] = majorant_panel(h, mass, m, q);
        excess[k] *= mag_get_d(h);
        if (late || after) {
            /* The running maximum stays as it is, which keeps it non-decreasing; what exceeds it here falls by itself: with
             * exp(-(S - S0) end_t) beyond the end, with the panel's share of the weight beyond the mean. */
            arf_set_mag(arb_midref(H), running);
            arb_addmul(m->mean, H, mass, SUM_BITS);
            if (mag_cmp(h, running) > 0) {
                arf_set_mag(arb_midref(part), h);
                arb_sub(part, part, H, SUM_BITS);
                arb_addmul(after ? m->end : m->mean, part, mass, SUM_BITS);
                charge[k] += arb_size(mass);
                arf_set_mag(arb_midref(H), h);
            } else if (holder >= 0) {
                charge[holder] += arb_size(mass);
            }
        } else {
            if (mag_cmp(h, running) > 0) {
                mag_set(running, h);
                holder = k;
            }
            arf_set_mag(arb_midref(H), running);
            arb_addmul(m->mean, H, mass, SUM_BITS);
            if (holder >= 0)
                charge[holder] += arb_size(mass);
        }
        if (heights)
            arb_set(heights + k, H);
    }
    if (losses)
        for (slong k = 0; k < s->panel_count; k++)
            losses[k] = excess[k] * charge[k];
    arb_clear(part);
    arb_clear(H);
    arb_clear(mass);
    mag_clear(h);
    mag_clear(running);
    flint_free(excess);
    flint_free(charge);
}

static bool refine_majorant(majorant *m)
{
    for (int pass = 0; pass < PASSES_MOST; pass++) {
        sheaf *s = m->s;
        double *losses = flint_malloc((size_t)s->panel_count * sizeof *losses), sum = 0, whole;
        majorant_sum(m, losses, NULL);
        for (slong k = 0; k < s->panel_count; k++)
            sum += losses[k];
        whole = arb_size(m->mean) + arb_size(m->end);
        if (sum < 0.01 * whole || s->panel_count > PANELS_MOST) {
            flint_free(losses);
            return true;
        }
        sheaf_split_losers(s, losses);
        flint_free(losses);
        if (!budget_ok(s->p->e))
            return false;
    }
    majorant_sum(m, NULL, NULL);
    return true;
}

/* The steps, with the far part and the second term laid on the last one: what comes from beyond t_far falls at least as fast. */
static void majorant_steps(power_bound *out, majorant *m, const arb_t far_units)
{
    sheaf *s = m->s;
    slong n = s->panel_count, last = n - 1;
    arb_t x;
    if (m->K > 0 || n == 0 || out->cut)
        return;
    arb_init(x);
    out->step_count = n;
    out->step_t = _arb_vec_init(n + 1);
    out->step_height = _arb_vec_init(n);
    majorant_sum(m, NULL, out->step_height);
    for (slong k = 0; k < n; k++) {
        arb_set(out->step_t + k, s->joints[s->panels[k].left].t);
        arb_get_mag(arb_radref(x), s->panels[k].h);
        /* the panel's own bound: the running maximum is a convenience of the one-term bound */
        arf_set_mag(arb_midref(out->step_height + k), arb_radref(x));
        mag_zero(arb_radref(out->step_height + k));
        sheaf_over_m(out->step_height + k, s->p);
    }
    arb_set(out->step_t + n, s->joints[s->panels[last].right].t);
    if (!arb_is_zero(far_units)) {
        while (last > 0 && !arb_is_positive(s->panels[last].mass))
            last--;
        arb_div(x, far_units, s->panels[last].mass, SUM_BITS);
        sheaf_over_m(x, s->p);
        for (; last < n; last++)
            arb_add(out->step_height + last, out->step_height + last, x, SUM_BITS);
    }
    arb_clear(x);
}

/* ---- a fitted polynomial ---- */

/* Solves the n x n system in place by elimination; false when it is singular. */
static bool solve(double A[FIT_MOST][FIT_MOST + 1], int n)
{
    for (int k = 0; k < n; k++) {
        int best = k;
        for (int r = k + 1; r < n; r++)
            if (fabs(A[r][k]) > fabs(A[best][k]))
                best = r;
        if (!(fabs(A[best][k]) > 1e-280))
            return false;
        for (int c = 0; c <= n; c++) {
            double swap = A[k][c];
            A[k][c] = A[best][c];
            A[best][c] = swap;
        }
        for (int r = 0; r < n; r++)
            for (int c = n; r != k && c >= k; c--)
                A[r][c] -= A[r][k] / A[k][k] * A[k][c];
    }
    for (int k = 0; k < n; k++)
        A[k][n] /= A[k][k];
    return true;
}

/* b[0] = h(0), the first omitted coefficient; the others by least squares with the weight. Any values will do for the proof. */
static bool fit_make(majorant *m, slong fit)
{
    sheaf *s = m->s;
    double A[FIT_MOST][FIT_MOST + 1] = {0}, b0;
    int n = (int)fit - 1;
    m->fit = fit;
    arb_set(m->b[0], s->p->f[0] + s->patches.first);
    b0 = arf_get_d(arb_midref(m->b[0]), ARF_RND_NEAR);
    for (slong k = 0; k < s->panel_count; k++) {
        const panel *q = s->panels + k;
        double t, h, mass, basis[FIT_MOST] = {1};
        if (!q->lines || s->patches.list[q->patch].ended)
            continue;
        t = arf_get_d(arb_midref(q->t.v), ARF_RND_NEAR) / m->t_mean;
        h = arf_get_d(arb_midref(q->line.v), ARF_RND_NEAR) - b0;
        mass = arf_get_d(arb_midref(q->mass), ARF_RND_NEAR);
        for (int j = 1; j <= n; j++)
            basis[j] = basis[j - 1] * t;
        for (int r = 0; r < n; r++) {
            for (int c = 0; c < n; c++)
                A[r][c] += mass * basis[r + 1] * basis[c + 1];
            A[r][n] += mass * basis[r + 1] * h;
        }
    }
    if (n > 0 && !solve(A, n))
        return false;
    for (int j = 1; j <= n; j++) {
        if (!isfinite(A[j - 1][n] / pow(m->t_mean, j)))
            return false;
        arb_set_d(m->b[j], A[j - 1][n] / pow(m->t_mean, j));
    }
    return true;
}

/* The polynomial's integral with the normalised weight at S0, and in `far` what of its modulus lies beyond t_far; false when that does
 * not fall from S0 on. */
static bool fit_integral(const majorant *m, arb_t value, arb_t far)
{
    const sheaf *s = m->s;
    arb_t x, alpha, part, moment;
    bool fine = true;
    arb_init(x);
    arb_init(alpha);
    arb_init(part);
    arb_init(moment);
    arb_zero(value);
    arb_zero(far);
    arb_one(moment); /* (alpha)_j S^-j */
    for (slong j = 0; j < m->fit && fine; j++) {
        arb_addmul(value, m->b[j], moment, SUM_BITS);
        arb_add_si(alpha, s->w.alpha, j, s->w.bits);
        arb_mul(x, s->w.S, s->t_far, s->w.bits);
        fine = arb_gt(x, alpha);
        arb_hypgeom_gamma_upper(part, alpha, x, 1, s->w.bits);
        arb_mul(part, part, moment, SUM_BITS);
        arb_mul(part, part, m->b[j], SUM_BITS);
        arb_abs(part, part);
        arb_add(far, far, part, SUM_BITS);
        arb_mul(moment, moment, alpha, SUM_BITS);
        arb_div(moment, moment, s->w.S, SUM_BITS);
    }
    arb_clear(moment);
    arb_clear(part);
    arb_clear(alpha);
    arb_clear(x);
    return fine && arb_is_finite(far);
}

/* The whole bound at S0 in units of the normalised weight, what is far left out. */
static double fit_size(majorant *m)
{
    double size = HUGE_VAL;
    arb_t value, far;
    arb_init(value);
    arb_init(far);
    majorant_sum(m, NULL, NULL);
    if (!m->fit)
        size = arb_size(m->mean) + arb_size(m->end);
    else if (fit_integral(m, value, far))
        size = arb_size(value) + arb_size(far) + arb_size(m->mean) + arb_size(m->end);
    arb_clear(far);
    arb_clear(value);
    return isfinite(size) ? size : HUGE_VAL;
}

/* Where the rest at S0 is small beside the bound (six times), because h changes sign, one power cannot be near it: then the polynomial that
 * serves best takes the bulk of h, with its sign. True unless the budget is spent. */
static bool fit_choose(majorant *m, const arb_t sum)
{
    double simple = fit_size(m), rest = fabs(arf_get_d(arb_midref(sum), ARF_RND_NEAR)), best = 0.6 * simple;
    slong chosen = 0;
    if (m->K > 0 || simple <= 6 * rest)
        return true;
    for (slong fit = 1; fit <= FIT_MOST; fit++) {
        double size = fit_make(m, fit) ? fit_size(m) : HUGE_VAL;
        if (size < best) {
            best = size * 0.97; /* a further power has to pay */
            chosen = fit;
        }
    }
    m->fit = 0;
    if (chosen)
        fit_make(m, chosen);
    return refine_majorant(m);
}

/* The polynomial's part of the result, coefficients of S^(-alpha-j). */
static void fit_finish(power_bound *out, majorant *m, arb_t far)
{
    arb_t value, more, alpha;
    if (!m->fit)
        return;
    arb_init(value);
    arb_init(more);
    arb_init(alpha);
    fit_integral(m, value, more);
    arb_add(far, far, more, SUM_BITS);
    out->signed_count = m->fit;
    out->signed_part = _arb_vec_init(m->fit);
    for (slong j = 0; j < m->fit; j++) {
        arb_add_si(alpha, m->s->w.alpha, j, m->s->w.bits);
        arb_gamma(out->signed_part + j, alpha, m->s->w.bits);
        arb_mul(out->signed_part + j, out->signed_part + j, m->b[j], 2 * SUM_BITS);
        sheaf_over_m(out->signed_part + j, m->s->p);
        arb_set_d(alpha, TW_BOUND_FACTOR);
        arb_mul(out->signed_part + j, out->signed_part + j, alpha, 2 * SUM_BITS);
    }
    arb_clear(alpha);
    arb_clear(more);
    arb_clear(value);
}

static void majorant_finish(power_bound *out, majorant *m)
{
    sheaf *s = m->s;
    slong K = m->K;
    arb_t far, total;
    arb_init(far);
    arb_init(total);
    out->K = K;
    out->table = _arb_vec_init((K + 1) * (K + 1));
    arb_set(out->alpha, s->w.alpha);
    arb_set(out->S0, s->w.S);
    weight_total(total, &s->w);
    arf_set_mag(arb_midref(far), s->far);
    arb_div(far, far, total, SUM_BITS); /* in units of Gamma(alpha) S^-alpha */
    majorant_steps(out, m, far);
    fit_finish(out, m, far);
    if (m->ended < s->panel_count)
        arb_add(m->end, m->end, far, SUM_BITS);
    else
        arb_add(m->mean, m->mean, far, SUM_BITS);
    /* |R| <= (1/m) (mean / total) * omega_total(S) */
    arb_div(m->mean, m->mean, m->total, SUM_BITS);
    sheaf_over_m(m->mean, s->p);
    arb_mul(m->end, m->end, total, SUM_BITS);
    sheaf_over_m(m->end, s->p);
    arb_set_d(far, TW_BOUND_FACTOR);
    arb_mul(m->mean, m->mean, far, SUM_BITS);
    arb_mul(m->end, m->end, far, SUM_BITS);
    for (slong k = 0; k < (K + 1) * (K + 1); k++)
        arb_mul(out->table + k, m->table + k, m->mean, SUM_BITS);
    if (m->ended < s->panel_count) {
        arb_set(out->end, m->end);
        arb_set(out->end_t, s->joints[s->panels[m->ended].left].t);
    }
    arb_clear(total);
    arb_clear(far);
}

/* The tails' moduli join what is far: they fall at least like exp(-S t), t where the first begins. False: s->patches.reason says why
 * the bound cannot be had. */
static bool majorant_tail(majorant *m, power_bound *out, expr *S_expr)
{
    sheaf *s = m->s;
    arb_t x;
    mag_t size;
    bool fine = true, ended = false;
    arb_init(x);
    mag_init(size);
    for (slong k = 0; k < s->patches.count; k++)
        ended = ended || s->patches.list[k].ended;
    out->cut = problem_has_tail(s->p, x);
    if (out->cut) { /* a bound that holds the ended patches' share apart takes the tails as they are */
        fine = ended || arf_cmp_d(arb_midref(x), m->t_mean * (1 + 1e-9)) > 0;
        if (!fine)
            s->patches.reason = "the far end, where the amplitude is singular, is too near for this value";
        fine = fine && problem_tail(x, s->p, S_expr, true);
        if (!fine && !s->patches.reason)
            s->patches.reason = "the integral next to the far end, where the amplitude is singular, could not be certified";
        arb_mul_fmpz(x, x, fmpq_numref(s->p->m), SUM_BITS);
        arb_div_fmpz(x, x, fmpq_denref(s->p->m), SUM_BITS);
        arb_get_mag(size, x);
        mag_add(s->far, s->far, size);
    }
    mag_clear(size);
    arb_clear(x);
    return fine;
}

tw_status panels_for_all(problem *p, slong first, expr *S_expr, const arb_t S, power_bound *out, bool *made,
                         panel_report *report)
{
    sheaf s;
    majorant m = {.s = &s};
    arb_t sum;
    tw_status status;
    arb_init(sum);
    sheaf_init(&s, p);
    status = sheaf_make(&s, &first, S_expr, S, made);
    if (status == TW_OK && *made) {
        m.K = p->lanes - 1;
        arb_init(m.c);
        arb_init(m.total);
        arb_init(m.mean);
        arb_init(m.end);
        for (int j = 0; j < FIT_MOST; j++)
            arb_init(m.b[j]);
        mag_init(m.crumb_h);
        mag_init(m.crumb_mass);
        m.table = _arb_vec_init((m.K + 1) * (m.K + 1));
        majorant_shift(&m);
        majorant_mean(&m);
        majorant_crumb(&m);
        if (!arb_is_finite(m.total) || !arb_is_positive(m.total)) {
            *made = false;
            s.patches.reason = "the weight's mass could not be computed";
        } else if (!majorant_tail(&m, out, S_expr)) {
            *made = false;
            status = p->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
        } else if (!sheaf_refine(&s, sum, 0.008) || !refine_majorant(&m) || !fit_choose(&m, sum)) {
            status = TW_ERROR;
        } else if (arf_cmp_d(arb_midref(s.t_far), m.t_mean) < 0) {
            *made = false;
            s.patches.reason = "the weight's mean lies too far out";
        } else if (!arb_is_finite(m.mean) || !arb_is_finite(m.end)) {
            *made = false;
            s.patches.reason = "the bounds on the panels are not finite";
        } else {
            majorant_finish(out, &m);
        }
        _arb_vec_clear(m.table, (m.K + 1) * (m.K + 1));
        mag_clear(m.crumb_mass);
        mag_clear(m.crumb_h);
        for (int j = 0; j < FIT_MOST; j++)
            arb_clear(m.b[j]);
        arb_clear(m.end);
        arb_clear(m.mean);
        arb_clear(m.total);
        arb_clear(m.c);
    }
    sheaf_report(&s, report);
    sheaf_clear(&s);
    arb_clear(sum);
    return status;
}
