/* From h on patches to panels. One idea: the remainder is (1/m) int h(t) t^(alpha-1) exp(-S t) dt with h known on panels as a straight
 * line and a bound of what bends; a panel's part is the line's integral with the weight, whose mass and moment are incomplete Gamma
 * functions, and what bends times the mass. Panels are split where they lose most. All sums are ball sums. */
#include "engine/numeric/sheaf.h"

#include <math.h>
#include <string.h>

void sheaf_init(sheaf *s, problem *p)
{
    memset(s, 0, sizeof *s);
    s->p = p;
    patches_init(&s->patches);
    mag_init(s->crumb);
    mag_init(s->far);
    arb_init(s->t_far);
    arb_init(s->w.alpha);
    arb_init(s->w.S);
    arb_init(s->w.gamma);
}

static void panel_clear(panel *q)
{
    arb_clear(q->h);
    arb_clear(q->mass);
    arb_clear(q->part);
    affine_clear(&q->line);
    affine_clear(&q->t);
    affine_clear(&q->ell);
}

void sheaf_clear(sheaf *s)
{
    patches_clear(&s->patches);
    for (slong k = 0; k < s->joint_count; k++)
        joint_clear(s->joints + k);
    for (slong k = 0; k < s->panel_count; k++)
        panel_clear(s->panels + k);
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

/* The integral of d with the weight: t = t.v + t.b d + rest, so d = (t - t.v - rest)/t.b, and t has its own moment. */
static bool panel_shift(arb_t shift, const sheaf *s, const panel *q, const arb_t mass)
{
    arb_t x;
    mag_t m;
    bool fine = arb_is_positive(q->t.b) && arb_is_finite(mass);
    arb_init(x);
    mag_init(m);
    joint_moment(shift, &s->w, s->joints + q->left, s->joints + q->right);
    arb_mul(x, q->t.v, mass, s->w.bits);
    arb_sub(shift, shift, x, s->w.bits);
    arb_get_mag(m, mass);
    mag_mul(m, m, q->t.r);
    mag_add(arb_radref(shift), arb_radref(shift), m);
    arb_div(shift, shift, q->t.b, SUM_BITS);
    /* and no more than half the panel's width away */
    arb_get_mag(m, mass);
    mag_mul(arb_radref(x), m, q->t.half);
    arf_zero(arb_midref(x));
    fine = fine && arb_is_finite(shift) && arb_intersection(shift, shift, x, SUM_BITS);
    mag_clear(m);
    arb_clear(x);
    return fine;
}

static void panel_measure(sheaf *s, panel *q)
{
    arb_t mass, shift, other;
    mag_t m;
    arb_init(mass);
    arb_init(shift);
    arb_init(other);
    mag_init(m);
    patch_range(q->h, s->p, s->patches.list + q->patch, q->z0, q->z1);
    joint_mass(mass, s->joints + q->left, s->joints + q->right, s->w.bits);
    arb_set_round(q->mass, mass, s->w.bits);
    arb_mul(q->part, q->h, mass, SUM_BITS);
    q->lines = patch_affine(&q->line, &q->t, &q->ell, s->p, s->patches.list + q->patch, q->z0, q->z1);
    if (q->lines && panel_shift(shift, s, q, mass)) {
        arb_mul(other, q->line.v, mass, SUM_BITS);
        arb_addmul(other, q->line.b, shift, SUM_BITS);
        arb_get_mag(m, mass);
        mag_mul(m, m, q->line.r);
        mag_add(arb_radref(other), arb_radref(other), m);
        if (mag_cmp(arb_radref(other), arb_radref(q->part)) < 0)
            arb_swap(q->part, other);
    }
    mag_clear(m);
    arb_clear(other);
    arb_clear(shift);
    arb_clear(mass);
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
    arb_init(q->part);
    affine_init(&q->line);
    affine_init(&q->t);
    affine_init(&q->ell);
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

void sheaf_split_losers(sheaf *s, const double *losses)
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

double arb_size(const arb_t x)
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
static bool sheaf_far(sheaf *s, slong first, expr *S_expr, double *y_far)
{
    problem *p = s->p;
    double alpha = arf_get_d(arb_midref(s->w.alpha), ARF_RND_NEAR), S = arf_get_d(arb_midref(s->w.S), ARF_RND_NEAR);
    double t = (alpha + 6 * sqrt(alpha) + 14) / S, target, end_y, end_t = last_end_t(p, &end_y);
    arb_t y;
    mag_t kept, rest;
    bool fine = false;
    arb_init(y);
    mag_init(kept);
    mag_init(rest);
    target = log2_term(s, first) - (s->fine ? 28 : 11.7);
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

/* The first index >= first with a coefficient that is not zero; where there is none, one beyond the last that is not zero. */
static slong skip_zeros(const problem *p, slong first, bool *found)
{
    slong n = first;
    while (n < p->known && problem_is_zero(p, n))
        n++;
    *found = n < p->known;
    if (!*found)
        for (n = first; n > 0 && problem_is_zero(p, n - 1);)
            n--;
    return n;
}

static slong bits_wanted(slong first, double alpha)
{
    return (slong)(96 + 0.3 * alpha + 1.6 * first) + 32;
}

tw_status sheaf_make(sheaf *s, slong *first, expr *S_expr, const arb_t S, bool *made)
{
    problem *p = s->p;
    arb_t alpha;
    double y_far;
    bool found;
    *made = false;
    if (problem_coefficients(p, *first + 64, FLINT_MAX(p->bits, 160)) != TW_OK)
        return TW_ERROR;
    *first = skip_zeros(p, *first, &found);
    if (!found && !p->terminates) {
        s->patches.reason = "no further nonzero coefficient was found";
        return TW_OK;
    }
    arb_init(alpha);
    problem_alpha(alpha, p, *first, SUM_BITS);
    if (problem_coefficients(p, *first + 64, bits_wanted(*first, arf_get_d(arb_midref(alpha), ARF_RND_NEAR))) != TW_OK) {
        arb_clear(alpha);
        return TW_ERROR;
    }
    problem_alpha(alpha, p, *first, 256 + (slong)arf_get_d(arb_midref(alpha), ARF_RND_UP));
    weight_clear(&s->w);
    weight_init(&s->w, alpha, S);
    arb_clear(alpha);
    s->lanes = p->lanes;
    if (!sheaf_far(s, *first, S_expr, &y_far))
        return p->e->error.kind ? TW_ERROR : TW_OK;
    s->patches.fine = s->fine;
    if (!patches_build(&s->patches, p, *first, y_far))
        return p->e->error.kind ? TW_ERROR : TW_OK;
    sheaf_panels(s);
    *made = true;
    return TW_OK;
}

void sheaf_report(const sheaf *s, panel_report *r)
{
    r->panels = s->panel_count;
    r->discs = s->patches.discs;
    r->bits = s->p->bits;
    r->known = s->p->known;
    r->rho = s->patches.rho;
    r->reason = s->patches.reason;
}

/* ---- the sum ---- */

static void signed_sum(arb_t sum, sheaf *s)
{
    arb_zero(sum);
    for (slong k = 0; k < s->panel_count; k++)
        arb_add(sum, sum, s->panels[k].part, SUM_BITS);
    mag_add(arb_radref(sum), arb_radref(sum), s->crumb);
}

bool sheaf_refine(sheaf *s, arb_t sum, double goal)
{
    double before = HUGE_VAL;
    int stale = 0;
    for (int pass = 0; pass < PASSES_MOST; pass++) {
        double *losses, middle, radius;
        signed_sum(sum, s);
        middle = fabs(arf_get_d(arb_midref(sum), ARF_RND_NEAR));
        radius = mag_get_d(arb_radref(sum));
        /* where the patches' own errors are what is left, splitting helps no more */
        stale = radius > 0.85 * before ? stale + 1 : 0;
        before = radius;
        if (radius < goal * middle || stale == 2 || s->panel_count > PANELS_MOST)
            return true;
        if (!budget_ok(s->p->e))
            return false;
        losses = flint_malloc((size_t)s->panel_count * sizeof *losses);
        for (slong k = 0; k < s->panel_count; k++)
            losses[k] = mag_get_d(arb_radref(s->panels[k].part));
        sheaf_split_losers(s, losses);
        flint_free(losses);
    }
    signed_sum(sum, s);
    return true;
}

void sheaf_denormalise(arb_t x, const sheaf *s)
{
    arb_t total;
    arb_init(total);
    weight_total(total, &s->w);
    arb_mul(x, x, total, SUM_BITS);
    arb_clear(total);
}

void sheaf_over_m(arb_t x, const problem *p)
{
    arb_mul_fmpz(x, x, fmpq_denref(p->m), SUM_BITS);
    arb_div_fmpz(x, x, fmpq_numref(p->m), SUM_BITS);
}
