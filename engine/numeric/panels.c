/* From h on patches to proved bounds. One idea: the remainder is (1/m) int h(t) t^(alpha-1) exp(-S t) dt with h known on panels as
 * balls. At one S: the sum of ball times mass, signs kept. For all S >= S0: with running maxima H of |h|, because as S grows the
 * weight moves towards 0 (monotone likelihood ratio), so the mean of a non-decreasing H falls; beyond the weight's mean at S0
 * a panel's share of the weight falls by itself, so there H may stay as it is and the excess of |h| is added. Panels are split where
 * they lose most. All sums are ball sums. */
#include "engine/numeric/panels.h"

#include <math.h>
#include <string.h>

#include "engine/numeric/shared.h"

enum { SUM_BITS = 64, PANELS_MOST = 6000, PASSES_MOST = 14 };

typedef struct panel {
    slong patch, left, right; /* joints */
    double z0, z1;
    arb_t h, mass;
} panel;

typedef struct sheaf {
    problem *p;
    patches patches;
    weight w;
    slong joint_count, joint_room, panel_count, panel_room;
    joint *joints;
    panel *panels;
    slong lanes;
    mag_t crumb;   /* of |h| below the first joint, in units of the normalised weight */
    bool has_crumb;
    mag_t far;     /* absolute, without 1/m for the amplitude: already in it */
    arb_t t_far;
} sheaf;

static void sheaf_init(sheaf *s, problem *p)
{
    memset(s, 0, sizeof *s);
    s->p = p;
    patches_init(&s->patches);
    mag_init(s->crumb);
    mag_init(s->far);
    arb_init(s->t_far);
    arb_init(s->w.alpha);
    arb_init(s->w.S);
}

static void sheaf_clear(sheaf *s)
{
    patches_clear(&s->patches);
    for (slong k = 0; k < s->joint_count; k++)
        joint_clear(s->joints + k);
    for (slong k = 0; k < s->panel_count; k++) {
        arb_clear(s->panels[k].h);
        arb_clear(s->panels[k].mass);
    }
    flint_free(s->joints);
    flint_free(s->panels);
    mag_clear(s->crumb);
    mag_clear(s->far);
    arb_clear(s->t_far);
    weight_clear(&s->w);
}

static slong sheaf_joint(sheaf *s, const arb_t t)
{
    if (s->joint_count == s->joint_room) {
        s->joint_room = 2 * s->joint_room + 32;
        s->joints = flint_realloc(s->joints, s->joint_room * sizeof(joint));
    }
    joint_init(s->joints + s->joint_count);
    joint_set(s->joints + s->joint_count, &s->w, t);
    return s->joint_count++;
}

static void panel_measure(sheaf *s, panel *q)
{
    patch_range(q->h, s->p, s->patches.list + q->patch, q->z0, q->z1);
    joint_mass(q->mass, s->joints + q->left, s->joints + q->right, s->w.bits);
}

static panel *sheaf_panel(sheaf *s, slong k, double z0, double z1, slong left, slong right)
{
    panel *q;
    if (s->panel_count == s->panel_room) {
        s->panel_room = 2 * s->panel_room + 32;
        s->panels = flint_realloc(s->panels, s->panel_room * sizeof(panel));
    }
    q = s->panels + s->panel_count++;
    q->patch = k;
    q->z0 = z0;
    q->z1 = z1;
    q->left = left;
    q->right = right;
    arb_init(q->h);
    arb_init(q->mass);
    panel_measure(s, q);
    return q;
}

/* With logarithms the panel next to 0 cannot be bounded by a constant: panels shrink towards 0 by halves, and below the last
 * one |h| <= sum of bounds * |ell|^k is integrated in closed form. */
static slong sheaf_start_logs(sheaf *s)
{
    enum { HALVINGS = 33 };
    arb_t t, zero, total;
    mag_t part, bound, ell;
    slong left;
    double z = -1 + exp2(1 - HALVINGS);
    arb_init(t);
    arb_init(zero);
    arb_init(total);
    mag_init(part);
    mag_init(bound);
    mag_init(ell);
    patch_t(t, s->p, s->patches.list, z);
    arb_get_mag(ell, s->p->ell_factor);
    s->has_crumb = true;
    for (slong k = 0; k < s->lanes; k++) {
        patch_lane_bound(bound, s->patches.list, k, -1, z);
        omega_crumb(part, s->w.alpha, zero, t, k);
        mag_mul(bound, bound, part);
        mag_pow_ui(part, ell, (ulong)k);
        mag_addmul(s->crumb, bound, part);
    }
    weight_total(total, &s->w);
    arb_inv(total, total, SUM_BITS);
    arb_get_mag(part, total);
    mag_mul(s->crumb, s->crumb, part);
    left = sheaf_joint(s, t);
    for (int j = HALVINGS - 1; j >= 1; j--) {
        double z1 = -1 + exp2(1 - j);
        slong right;
        patch_t(t, s->p, s->patches.list, z1);
        right = sheaf_joint(s, t);
        sheaf_panel(s, 0, z, z1, left, right);
        left = right;
        z = z1;
    }
    mag_clear(ell);
    mag_clear(bound);
    mag_clear(part);
    arb_clear(total);
    arb_clear(zero);
    arb_clear(t);
    return left;
}

static void sheaf_panels(sheaf *s)
{
    slong left;
    double z0 = -1;
    if (s->lanes > 1) {
        left = sheaf_start_logs(s);
        z0 = 0;
    } else {
        left = sheaf_joint(s, s->patches.list[0].t_left);
    }
    for (slong k = 0; k < s->patches.count; k++) {
        slong right = sheaf_joint(s, s->patches.list[k].t_right);
        sheaf_panel(s, k, z0, 1, left, right);
        left = right;
        z0 = -1;
    }
}

/* Cuts panel k in two; the new right half goes to the end of the list. */
static void sheaf_split(sheaf *s, slong k)
{
    panel *q = s->panels + k, *half;
    double z = q->z0 / 2 + q->z1 / 2, z1 = q->z1;
    slong right = q->right, middle, from = q->patch;
    arb_t t;
    arb_init(t);
    patch_t(t, s->p, s->patches.list + q->patch, z);
    middle = sheaf_joint(s, t);
    q->z1 = z;
    q->right = middle;
    panel_measure(s, q);
    half = sheaf_panel(s, from, z, z1, middle, right);
    (void)half;
    arb_clear(t);
}

static int panel_compare(const void *a, const void *b)
{
    const panel *x = a, *y = b;
    if (x->patch != y->patch)
        return x->patch < y->patch ? -1 : 1;
    return x->z0 < y->z0 ? -1 : x->z0 > y->z0;
}

/* Splits every panel whose loss is above 0.3 of the mean; losses has panel_count entries. */
static void sheaf_split_losers(sheaf *s, const double *losses)
{
    slong count = s->panel_count;
    double sum = 0;
    for (slong k = 0; k < count; k++)
        sum += losses[k];
    for (slong k = 0; k < count; k++)
        if (losses[k] > 0.3 * sum / count && s->panels[k].z1 - s->panels[k].z0 > 1e-6)
            sheaf_split(s, k);
    qsort(s->panels, s->panel_count, sizeof(panel), panel_compare);
}

static double arb_size(const arb_t x)
{
    mag_t m;
    double d;
    mag_init(m);
    arb_get_mag(m, x);
    d = mag_get_d(m);
    mag_clear(m);
    return d;
}

/* ---- the far part ---- */

/* log2 of (1/m) max over lanes |f[first]| Gamma(alpha) S^-alpha: the size of the first omitted term. */
static double log2_term(const sheaf *s, slong first)
{
    arb_t total;
    mag_t most, part;
    double out;
    if (first >= s->p->known)
        return -HUGE_VAL;
    arb_init(total);
    mag_init(most);
    mag_init(part);
    weight_total(total, &s->w);
    for (slong k = 0; k < s->p->lanes; k++) {
        arb_get_mag(part, s->p->f[k] + first);
        mag_max(most, most, part);
    }
    arb_get_mag(part, total);
    mag_mul(most, most, part);
    out = mag_is_zero(most) ? -HUGE_VAL : mag_log2(most);
    mag_clear(part);
    mag_clear(most);
    arb_clear(total);
    return out;
}

/* The kept terms beyond t_far: T^n <= T^first * T_far^(n - first) there, |log t| <= (|log t_far| + 1) t/t_far. Without 1/m. */
static void far_kept(mag_t out, sheaf *s, slong first, const arb_t t)
{
    problem *p = s->p;
    arb_t T, x, alpha, sum, part, y;
    fmpq_t inverse;
    mag_t m;
    arb_init(T);
    arb_init(x);
    arb_init(y);
    arb_init(alpha);
    arb_init(sum);
    arb_init(part);
    fmpq_init(inverse);
    mag_init(m);
    fmpq_inv(inverse, p->m);
    arb_pow_fmpq(T, t, inverse, SUM_BITS);
    mag_zero(out);
    for (slong k = 0; k < p->lanes; k++) {
        arb_zero(sum);
        for (slong n = 0; n < first && n < p->known; n++) {
            arb_abs(part, p->f[k] + n);
            arb_div(sum, sum, T, SUM_BITS);
            arb_add(sum, sum, part, SUM_BITS);
        }
        /* sum = sum of |f_n| T^(n - (first-1)) */
        arb_div(sum, sum, T, SUM_BITS);
        arb_add_si(alpha, s->w.alpha, k, s->w.bits);
        arb_mul(x, s->w.S, t, s->w.bits);
        arb_hypgeom_gamma_upper(y, alpha, x, 0, s->w.bits);
        arb_neg(alpha, alpha);
        arb_pow(x, s->w.S, alpha, s->w.bits);
        arb_mul(y, y, x, SUM_BITS);
        arb_mul(sum, sum, y, SUM_BITS);
        if (k > 0) {
            arb_log(x, t, SUM_BITS);
            arb_abs(x, x);
            arb_add_ui(x, x, 1, SUM_BITS);
            arb_div(x, x, t, SUM_BITS);
            arb_mul(x, x, p->ell_factor, SUM_BITS);
            arb_pow_ui(x, x, (ulong)k, SUM_BITS);
            arb_mul(sum, sum, x, SUM_BITS);
        }
        arb_get_mag(m, sum);
        mag_add(out, out, m);
    }
    mag_clear(m);
    fmpq_clear(inverse);
    arb_clear(part);
    arb_clear(sum);
    arb_clear(alpha);
    arb_clear(y);
    arb_clear(x);
    arb_clear(T);
}

static double m_double(const problem *p)
{
    return fmpz_get_d(fmpq_numref(p->m)) / fmpz_get_d(fmpq_denref(p->m));
}

/* A y with p(y) about t. */
static double coordinate_at(const problem *p, double t)
{
    arb_t y, value;
    double low = 0, high = pow(t, 1 / m_double(p));
    if (p->pure)
        return high;
    arb_init(y);
    arb_init(value);
    for (int k = 0; k < 400 && high - low > 1e-6 * high; k++) {
        double at = low == 0 ? high : low + (high - low) / 2;
        arb_set_d(y, at);
        problem_t(value, p, y, SUM_BITS);
        if (arf_cmp_d(arb_midref(value), t) < 0 && arb_is_finite(value)) {
            if (low == 0 && at == high)
                high *= 1.6;
            else
                low = at;
        } else if (low == 0 && at == high) {
            low = 1e-300;
        } else {
            high = at;
        }
    }
    arb_clear(value);
    arb_clear(y);
    return high;
}

/* The greatest end when every sheet ends, else 0. */
static double last_end_t(const problem *p, double *y)
{
    double most = 0;
    *y = 0;
    for (size_t b = 0; b < p->sheet_count; b++) {
        if (!p->sheets[b].end)
            return 0;
        most = fmax(most, arf_get_d(arb_midref(p->sheets[b].end_t), ARF_RND_UP));
        *y = fmax(*y, arf_get_d(arb_midref(p->sheets[b].end_y), ARF_RND_UP));
    }
    return most;
}

/* Chooses y_far so that what lies beyond it is below 3e-4 of the first omitted term. */
static bool sheaf_far(sheaf *s, slong first, expr *S_expr, double *y_far, bool plenty)
{
    problem *p = s->p;
    double alpha = arf_get_d(arb_midref(s->w.alpha), ARF_RND_NEAR), S = arf_get_d(arb_midref(s->w.S), ARF_RND_NEAR);
    double t = (alpha + 6 * sqrt(alpha) + 14) / S, target, end_y, end_t = last_end_t(p, &end_y);
    arb_t y;
    mag_t kept, rest;
    bool fine = false;
    (void)plenty;
    arb_init(y);
    mag_init(kept);
    mag_init(rest);
    target = log2_term(s, first) - 11.7;
    if (end_t > 0 && (target == -HUGE_VAL || end_t < t))
        t = fmax(t, end_t * 1.01 + (20 + 4 * sqrt(alpha)) / S);
    for (int k = 0; k < 60 && budget_ok(p->e); k++) {
        double at = coordinate_at(p, t);
        fine = far_bound(rest, p, S_expr, &at);
        if (!fine)
            break;
        arb_set_d(y, at);
        problem_t(s->t_far, p, y, 2 * SUM_BITS);
        fine = arb_is_finite(s->t_far) && arb_is_positive(s->t_far);
        if (!fine)
            break;
        far_kept(kept, s, first, s->t_far);
        /* both in the units without 1/m: the amplitude's part times m */
        mag_mul_ui(rest, rest, (ulong)ceil(m_double(p)));
        mag_add(s->far, rest, kept);
        *y_far = at;
        t = arf_get_d(arb_midref(s->t_far), ARF_RND_NEAR);
        if (mag_is_zero(s->far) || target == -HUGE_VAL || mag_log2(s->far) < target)
            break;
        t *= k < 8 ? 1.1 : 1.25;
    }
    mag_clear(rest);
    mag_clear(kept);
    arb_clear(y);
    if (!fine)
        s->patches.reason = "no bound of the integrand far out on the path is known";
    return fine;
}

/* ---- making the sheaf ---- */

/* The first index >= first with a coefficient that is not zero; known when there is none. */
static slong skip_zeros(const problem *p, slong first)
{
    for (; first < p->known; first++)
        for (slong k = 0; k < p->lanes; k++)
            if (!arb_is_zero(p->f[k] + first))
                return first;
    return first;
}

static slong bits_wanted(const problem *p, slong first, double alpha)
{
    double bits = 96 + 0.3 * alpha, lost = 0;
    (void)p;
    lost = 1.6 * first;
    return (slong)(bits + lost) + 32;
}

static tw_status sheaf_make(sheaf *s, slong *first, expr *S_expr, const arb_t S, bool *made)
{
    problem *p = s->p;
    arb_t alpha;
    double y_far;
    *made = false;
    if (problem_coefficients(p, *first + 64, FLINT_MAX(p->bits, 160)) != TW_OK)
        return TW_ERROR;
    *first = skip_zeros(p, *first);
    if (*first == p->known && !p->terminates) {
        s->patches.reason = "no further nonzero coefficient was found";
        return TW_OK;
    }
    arb_init(alpha);
    problem_alpha(alpha, p, *first, SUM_BITS);
    if (problem_coefficients(p, *first + 64, bits_wanted(p, *first, arf_get_d(arb_midref(alpha), ARF_RND_NEAR))) != TW_OK) {
        arb_clear(alpha);
        return TW_ERROR;
    }
    problem_alpha(alpha, p, *first, p->bits);
    arb_clear(s->w.alpha);
    arb_clear(s->w.S);
    weight_init(&s->w, alpha, S);
    arb_clear(alpha);
    problem_alpha(s->w.alpha, p, *first, s->w.bits);
    s->lanes = p->lanes;
    if (!sheaf_far(s, *first, S_expr, &y_far, false))
        return p->e->error.kind ? TW_ERROR : TW_OK;
    if (!patches_build(&s->patches, p, *first, y_far))
        return p->e->error.kind ? TW_ERROR : TW_OK;
    sheaf_panels(s);
    *made = true;
    return TW_OK;
}

static void sheaf_report(const sheaf *s, panel_report *r)
{
    r->panels = s->panel_count;
    r->discs = s->patches.discs;
    r->bits = s->p->bits;
    r->known = s->p->known;
    r->rho = s->patches.rho;
    r->reason = s->patches.reason;
}

/* ---- at one S ---- */

static void signed_sum(arb_t sum, sheaf *s)
{
    arb_t part;
    arb_init(part);
    arb_zero(sum);
    for (slong k = 0; k < s->panel_count; k++) {
        arb_mul(part, s->panels[k].h, s->panels[k].mass, SUM_BITS);
        arb_add(sum, sum, part, SUM_BITS);
    }
    mag_add(arb_radref(sum), arb_radref(sum), s->crumb);
    arb_clear(part);
}

static bool refine_signed(sheaf *s, arb_t sum)
{
    for (int pass = 0; pass < PASSES_MOST; pass++) {
        double *losses, middle, radius;
        signed_sum(sum, s);
        middle = fabs(arf_get_d(arb_midref(sum), ARF_RND_NEAR));
        radius = mag_get_d(arb_radref(sum));
        if (radius < 0.008 * middle || s->panel_count > PANELS_MOST)
            return true;
        if (!budget_ok(s->p->e))
            return false;
        losses = flint_malloc((size_t)s->panel_count * sizeof *losses);
        for (slong k = 0; k < s->panel_count; k++)
            losses[k] = mag_get_d(arb_radref(s->panels[k].h)) * arb_size(s->panels[k].mass);
        sheaf_split_losers(s, losses);
        flint_free(losses);
    }
    signed_sum(sum, s);
    return true;
}

/* x * Gamma(alpha) S^-alpha / m */
static void denormalise(arb_t x, const sheaf *s)
{
    arb_t total;
    arb_init(total);
    weight_total(total, &s->w);
    arb_mul(x, x, total, SUM_BITS);
    arb_clear(total);
}

static void over_m(arb_t x, const problem *p)
{
    arb_mul_fmpz(x, x, fmpq_denref(p->m), SUM_BITS);
    arb_div_fmpz(x, x, fmpq_numref(p->m), SUM_BITS);
}

tw_status panels_at(problem *p, slong first, expr *S_expr, const arb_t S, arb_t error, bool *made, panel_report *report)
{
    sheaf s;
    tw_status status;
    sheaf_init(&s, p);
    status = sheaf_make(&s, &first, S_expr, S, made);
    if (status == TW_OK && *made && !refine_signed(&s, error))
        status = TW_ERROR;
    if (status == TW_OK && *made) {
        denormalise(error, &s);
        mag_add(arb_radref(error), arb_radref(error), s.far);
        over_m(error, p);
        if (TW_BOUND_FACTOR != 1) {
            arb_t factor;
            arb_init(factor);
            arb_set_d(factor, TW_BOUND_FACTOR);
            arb_mul(error, error, factor, SUM_BITS);
            arb_clear(factor);
        }
    }
    sheaf_report(&s, report);
    sheaf_clear(&s);
    return status;
}

/* ---- for all S >= S0 ---- */

void power_bound_init(power_bound *b)
{
    memset(b, 0, sizeof *b);
    arb_init(b->alpha);
    arb_init(b->S0);
    arb_init(b->end);
    arb_init(b->end_t);
}

void power_bound_clear(power_bound *b)
{
    arb_clear(b->alpha);
    arb_clear(b->S0);
    arb_clear(b->end);
    arb_clear(b->end_t);
    if (b->table)
        _arb_vec_clear(b->table, (b->K + 1) * (b->K + 1));
    if (b->step_t) {
        _arb_vec_clear(b->step_t, b->step_count + 1);
        _arb_vec_clear(b->step_height, b->step_count);
    }
}

void power_bound_value(arb_t out, const power_bound *b, const arb_t S, slong bits)
{
    arb_t x;
    arb_init(x);
    omega_total(out, b->table, b->alpha, S, b->K, bits);
    if (!arb_is_zero(b->end)) {
        arb_sub(x, b->S0, S, bits);
        arb_mul(x, x, b->end_t, bits);
        arb_exp(x, x, bits);
        arb_addmul(out, x, b->end, bits);
    }
    arb_clear(x);
}

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

/* Upper bound of |h|/omega on a panel and of omega * mass. */
static void majorant_panel(mag_t h, arb_t mass, const majorant *m, const panel *q)
{
    arb_t a, b, x;
    arb_init(a);
    arb_init(b);
    arb_init(x);
    arb_get_mag(h, q->h);
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
        majorant_panel(h, mass, m, q);
        excess[k] = mag_get_d(h) * fmin(1, 2 * mag_get_d(arb_radref(q->h)) / (arb_size(q->h) + 1e-300));
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
    if (m->K > 0 || n == 0)
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
        over_m(out->step_height + k, s->p);
    }
    arb_set(out->step_t + n, s->joints[s->panels[last].right].t);
    if (!arb_is_zero(far_units)) {
        while (last > 0 && !arb_is_positive(s->panels[last].mass))
            last--;
        arb_div(x, far_units, s->panels[last].mass, SUM_BITS);
        over_m(x, s->p);
        for (; last < n; last++)
            arb_add(out->step_height + last, out->step_height + last, x, SUM_BITS);
    }
    arb_clear(x);
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
    if (m->ended < s->panel_count)
        arb_add(m->end, m->end, far, SUM_BITS);
    else
        arb_add(m->mean, m->mean, far, SUM_BITS);
    /* |R| <= (1/m) (mean / total) * omega_total(S) */
    arb_div(m->mean, m->mean, m->total, SUM_BITS);
    over_m(m->mean, s->p);
    arb_mul(m->end, m->end, total, SUM_BITS);
    over_m(m->end, s->p);
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
        mag_init(m.crumb_h);
        mag_init(m.crumb_mass);
        m.table = _arb_vec_init((m.K + 1) * (m.K + 1));
        majorant_shift(&m);
        majorant_mean(&m);
        majorant_crumb(&m);
        if (!arb_is_finite(m.total) || !arb_is_positive(m.total)) {
            *made = false;
            s.patches.reason = "the weight's mass could not be computed";
        } else if (!refine_signed(&s, sum) || !refine_majorant(&m)) {
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

/* ---- the kept terms ---- */

tw_status panels_kept_sum(problem *p, slong first, const arb_t S, arb_t sum, slong bits)
{
    arb_ptr gamma = _arb_vec_init(PROBLEM_LOGS + 1), powers = _arb_vec_init(PROBLEM_LOGS + 1);
    arb_t alpha, log_S, x, y;
    tw_status status = problem_coefficients(p, first, FLINT_MAX(bits, p->bits));
    slong lanes = p->lanes;
    arb_init(alpha);
    arb_init(log_S);
    arb_init(x);
    arb_init(y);
    arb_log(log_S, S, bits);
    arb_zero(sum);
    for (slong n = 0; status == TW_OK && n < first && n < p->known; n++) {
        bool any = false;
        for (slong k = 0; k < lanes; k++)
            any = any || !arb_is_zero(p->f[k] + n);
        if (!any)
            continue;
        /* d^k/dalpha^k of Gamma(alpha) S^-alpha, over k!, as the product of two series */
        problem_alpha(alpha, p, n, bits);
        _arb_vec_zero(gamma, lanes + 1);
        arb_set(gamma, alpha);
        arb_one(gamma + 1);
        _arb_poly_gamma_series(gamma, gamma, 2, lanes, bits);
        arb_neg(x, alpha);
        arb_pow(powers, S, x, bits);
        for (slong k = 1; k < lanes; k++) {
            arb_mul(powers + k, powers + k - 1, log_S, bits);
            arb_div_si(powers + k, powers + k, -k, bits);
        }
        for (slong k = 0; k < lanes; k++) {
            if (arb_is_zero(p->f[k] + n))
                continue;
            arb_zero(x);
            for (slong j = 0; j <= k; j++)
                arb_addmul(x, gamma + j, powers + k - j, bits);
            arb_fac_ui(y, (ulong)k, bits);
            arb_mul(x, x, y, bits);
            arb_pow_ui(y, p->ell_factor, (ulong)k, bits);
            arb_mul(x, x, y, bits);
            arb_addmul(sum, x, p->f[k] + n, bits);
        }
        if (!budget_ok(p->e))
            status = TW_ERROR;
    }
    arb_mul_fmpz(sum, sum, fmpq_denref(p->m), bits);
    arb_div_fmpz(sum, sum, fmpq_numref(p->m), bits);
    arb_clear(y);
    arb_clear(x);
    arb_clear(log_S);
    arb_clear(alpha);
    _arb_vec_clear(powers, PROBLEM_LOGS + 1);
    _arb_vec_clear(gamma, PROBLEM_LOGS + 1);
    return status;
}
