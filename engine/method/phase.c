/* Stationary phase to all orders: every end and every stationary point of the phase gives the terms of Laplace's
 * method with the scale turned by a right angle (DLMF 2.3.15 with 2.3.19 to 2.3.24; Olver 1974, ch. 3, sections 11 to
 * 13). Knows nothing of remainders.
 *
 * The one idea: on the side of a point where p = p0 + tau P, P > 0 and tau = 1 or -1, each Laplace term
 * g * Gamma(alpha) * scale^-alpha is multiplied by exp(i tau pi alpha/2). Terms of one lane whose alphas differ by an
 * even number differ by a sign only, so every lane falls into a few lanes with the old coefficients, each with a phase
 * of its own, which goes into the prefactor; for cosines and sines the conjugate contributions are added at once. */
#include "engine/method/phase.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/ball/growth.h"
#include "engine/ball/sign.h"
#include "engine/method/lanes.h"
#include "engine/method/local.h"
#include "engine/method/scale.h"

enum { RESIDUES = 64 };

/* What the lanes of one point have in common. */
typedef struct point_work {
    tw_engine *e;
    expansion *out;
    const phase_reading *r;
    phase_kernel kernel;
    expr *place, *height; /* p there */
    point_kind kind;
    int tau;
    size_t first; /* contributions from here on belong to this point */
    slong terms;
    expr *rest; /* what the factor in front of the integral has beside numbers and powers of the large parameter */
} point_work;

/* ---- prefactors ---- */

/* The contribution of this point with this prefactor. */
static contribution *contribution_with(point_work *w, expr *prefactor)
{
    for (size_t k = w->first; k < w->out->contribution_count; k++)
        if (w->out->contributions[k].prefactor == prefactor) return &w->out->contributions[k];
    contribution *c = expansion_add(w->out);
    c->variable = w->r->variable;
    c->place = w->place;
    c->kind = w->kind;
    c->method = "phase";
    c->dominant = true;
    c->prefactor = prefactor;
    c->domain = DOMAIN_RATIONAL;
    return c;
}

/* theta (in units of pi) = phi + quarter/2 with -1/4 <= phi < 1/4. */
static slong take_quarters(fmpq_t phi, const fmpq_t theta)
{
    fmpq_t t;
    fmpz_t k;
    fmpq_init(t);
    fmpz_init(k);
    fmpq_mul_2exp(t, theta, 1);
    fmpz_mul_ui(fmpq_numref(phi), fmpq_numref(t), 2);
    fmpz_add(fmpq_numref(phi), fmpq_numref(phi), fmpq_denref(t));
    fmpz_mul_ui(k, fmpq_denref(t), 2);
    fmpz_fdiv_q(k, fmpq_numref(phi), k); /* floor(2 theta + 1/2) */
    fmpq_sub_fmpz(t, t, k);
    fmpq_div_2exp(phi, t, 1);
    slong quarter = (slong)fmpz_fdiv_ui(k, 4);
    fmpq_clear(t);
    fmpz_clear(k);
    return quarter;
}

/* K(scale height + pi theta): *prefactor and a constant beside it; NULL constant on an error, 0 where it vanishes. */
static expr *turned_kernel(const point_work *w, const fmpq_t theta, expr **prefactor)
{
    tw_engine *e = w->e;
    fmpq_t phi;
    fmpq_init(phi);
    slong quarter = take_quarters(phi, theta);
    if (w->kernel == PHASE_EXP && fmpz_equal_si(fmpq_numref(phi), -1) && fmpz_equal_ui(fmpq_denref(phi), 4)) {
        fmpz_one(fmpq_numref(phi)); /* exp(i*pi/4) rather than i*exp(-i*pi/4) */
        quarter = (quarter + 3) % 4;
    }
    expr *i = expr_constant_of(e, CONSTANT_I);
    expr *angle = expr_mul(e, expr_fmpq(e, phi), expr_constant_of(e, CONSTANT_PI));
    expr *scale = expr_pow(e, w->r->large, expr_fmpq(e, w->r->power));
    expr *moving = expr_expand(e, expr_mul(e, scale, w->height));
    fmpq_clear(phi);
    bool still = w->height && expr_is_zero(w->height);
    if (w->kernel == PHASE_EXP) {
        *prefactor = expr_mul(e, w->rest, expr_call1(e, FUNCTION_EXP, expr_mul(e, i, expr_add(e, moving, angle))));
        return expr_pow(e, i, expr_int(e, quarter));
    }
    slong turn = (w->kernel == PHASE_COS ? quarter : quarter + 3) % 4; /* sin x = cos(x - pi/2) */
    bool cosine = turn % 2 == 0;
    slong sign = turn == 1 || turn == 2 ? -1 : 1; /* cos, -sin, -cos, sin */
    fmpq_t front;
    bool mirrored = !still && w->height && decide_sign(e, w->height) == -1;
    expr *whole = expr_add(e, moving, angle);
    if (mirrored) {
        whole = expr_expand(e, expr_neg(e, whole));
        if (!cosine) sign = -sign;
    }
    expr *value = expr_call1(e, cosine ? FUNCTION_COS : FUNCTION_SIN, whole);
    expr *shown = value, *front_sign = expr_int(e, sign);
    if (value && !still) { /* an odd function's sign goes to the coefficients */
        fmpq_init(front);
        expr_as_coefficient(e, value, front, &shown);
        front_sign = expr_mul(e, front_sign, expr_fmpq(e, front));
        fmpq_clear(front);
    }
    *prefactor = still ? w->rest : expr_mul(e, w->rest, shown);
    return still ? expr_mul(e, front_sign, value) : front_sign;
}

/* ---- lanes ---- */

/* Adds to a lane of the contribution with the same constant and powers, from the other side of the point; as far as
 * both are known. */
static bool merge_lane(point_work *w, contribution *c, expr *constant, slong logs, expr *first, const fmpq_t by,
                       expr *const *x, slong count, tw_status *status)
{
    for (size_t k = 0; k < c->lane_count; k++) {
        lane *l = &c->lanes[k];
        if (l->constant != constant || l->log_power != logs || l->first_exponent != first || !fmpq_equal(l->step, by))
            continue;
        slong both = FLINT_MIN(count, l->c.count);
        expr **sum = base_alloc((size_t)both * sizeof *sum);
        for (slong n = 0; n < both; n++) sum[n] = expr_add(w->e, x[n], coefficient_expr(w->e, &l->c, n));
        lane_clear(l);
        *l = c->lanes[--c->lane_count];
        bool zero = true;
        for (slong n = 0; n < both && zero; n++) zero = sum[n] && expr_is_zero(sum[n]);
        *status = zero ? TW_OK : contribution_set_lane(w->e, c, constant, first, by, sum, both);
        if (*status == TW_OK && !zero) c->lanes[c->lane_count - 1].log_power = logs;
        free(sum);
        return true;
    }
    return false;
}

/* One lane of this point: constant * pi-phase theta * (log large)^logs * sum of x[k] large^(first + k by). */
static tw_status put_lane(point_work *w, expr *constant, const fmpq_t theta, slong logs, expr *first, const fmpq_t by,
                          expr *const *x, slong count)
{
    expr *prefactor, *front = turned_kernel(w, theta, &prefactor);
    if (!front || !prefactor) return TW_ERROR;
    bool zero = expr_is_zero(front);
    for (slong k = 0; k < count && !zero; k++) {
        if (!expr_is_zero(x[k])) break;
        zero = k + 1 == count;
    }
    if (zero || count == 0) return TW_OK;
    contribution *c = contribution_with(w, prefactor);
    expr *whole = expr_mul(w->e, front, constant);
    fmpq_t number;
    fmpq_init(number);
    expr *rest;
    if (whole) expr_as_coefficient(w->e, whole, number, &rest);
    expr **scaled = base_alloc((size_t)count * sizeof *scaled);
    for (slong k = 0; k < count; k++) scaled[k] = expr_mul(w->e, expr_fmpq(w->e, number), x[k]);
    tw_status status = whole ? TW_OK : TW_ERROR;
    if (status == TW_OK && !merge_lane(w, c, rest, logs, first, by, scaled, count, &status)) {
        status = contribution_set_lane(w->e, c, rest, first, by, scaled, count);
        if (status == TW_OK) c->lanes[c->lane_count - 1].log_power = logs;
    }
    free(scaled);
    fmpq_clear(number);
    return status;
}

/* The terms n = j, j + stride, ... of a lane, whose alphas differ by even numbers. */
static tw_status put_residue(point_work *w, const lane *l, const fmpq_t factor_power, slong j, slong stride)
{
    tw_engine *e = w->e;
    slong count = l->c.count > j ? (l->c.count - j + stride - 1) / stride : 0;
    if (count == 0) return TW_OK;
    fmpq_t first, alpha, by, d, theta;
    fmpq_init(first);
    fmpq_init(alpha);
    fmpq_init(by);
    fmpq_init(d);
    fmpq_init(theta);
    fmpq_mul_si(d, l->step, j);
    fmpq_add(first, expr_number(l->first_exponent), d);
    fmpq_mul_si(by, l->step, stride);
    fmpq_sub(alpha, factor_power, first); /* large^first = factor power * scale^-alpha */
    fmpq_div(alpha, alpha, w->r->power);
    fmpq_div(d, by, w->r->power);
    fmpq_neg(d, d); /* alpha grows by d, an even number */
    bool alternate = fmpz_fdiv_ui(fmpq_numref(d), 4) == 2;
    expr **x = base_alloc((size_t)count * sizeof *x);
    for (slong k = 0; k < count; k++) {
        x[k] = coefficient_expr(e, &l->c, j + k * stride);
        if (alternate && k % 2) x[k] = expr_neg(e, x[k]);
    }
    expr *exponent = expr_fmpq(e, first);
    tw_status status = TW_OK;
    fmpz_t binomial;
    fmpz_init(binomial);
    for (slong m = 0; m <= l->log_power && status == TW_OK; m++) { /* log large -> log large - i tau pi/(2 power) */
        fmpq_div_2exp(theta, alpha, 1);
        fmpq_set_si(d, -m, 2);
        fmpq_add(theta, theta, d);
        if (w->tau < 0) fmpq_neg(theta, theta);
        fmpz_bin_uiui(binomial, (ulong)l->log_power, (ulong)m);
        expr *twice = expr_mul(e, expr_int(e, 2), expr_fmpq(e, w->r->power));
        expr *half = expr_div(e, expr_constant_of(e, CONSTANT_PI), twice);
        expr *share = expr_mul(e, expr_fmpz(e, binomial), expr_pow(e, half, expr_int(e, m)));
        expr *constant = expr_mul(e, l->constant, share);
        status = put_lane(w, constant, theta, l->log_power - m, exponent, by, x, count);
    }
    fmpz_clear(binomial);
    free(x);
    fmpq_clear(first);
    fmpq_clear(alpha);
    fmpq_clear(by);
    fmpq_clear(d);
    fmpq_clear(theta);
    return status;
}

static tw_status put_lanes(point_work *w, const contribution *base, const fmpq_t factor_power)
{
    for (size_t k = 0; k < base->lane_count; k++) {
        const lane *l = &base->lanes[k];
        if (!expr_is_number(l->first_exponent))
            return engine_fail(w->e, ERROR_UNSUITABLE, "the exponents at %s hold a parameter: give it a value",
                               w->r->variable->is.name);
        fmpq_t d;
        fmpq_init(d);
        fmpq_div(d, l->step, w->r->power);
        slong stride = 1;
        for (; stride < RESIDUES; stride++) { /* stride * d even */
            fmpq_t t;
            fmpq_init(t);
            fmpq_mul_si(t, d, stride);
            bool even = fmpz_is_one(fmpq_denref(t)) && fmpz_is_even(fmpq_numref(t));
            fmpq_clear(t);
            if (even) break;
        }
        fmpq_clear(d);
        if (stride == RESIDUES) return engine_fail(w->e, ERROR_UNSUITABLE, "the powers have too large a denominator");
        for (slong j = 0; j < stride; j++)
            if (put_residue(w, l, factor_power, j, stride) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

/* ---- one side or both sides of a point ---- */

/* The side of the place where x = place + way*y, 0 < y < length. */
static tw_status add_side(point_work *w, local_form *l, expr *q, int way, expr *length)
{
    tw_engine *e = w->e;
    expr *y = expr_fresh(e, "y"), *x = expr_add(e, w->place, expr_mul(e, expr_int(e, way), y));
    expr *p = expr_sub(e, expr_substitute(e, w->r->p, w->r->x, x), w->height);
    p = normal_under_facts(e, expr_expand(e, expr_mul(e, expr_int(e, w->tau), p)), &y, 1);
    expr *amplitude = normal_under_facts(e, expr_substitute(e, q, w->r->x, x), &y, 1);
    if (!p || !amplitude) return TW_ERROR;
    local_form_add(l, y, length, p, amplitude);
    return TW_OK;
}

/* p = c*y^mu on every branch: the constant goes into the scale. */
static void take_constant(tw_engine *e, local_form *l)
{
    expr *constant = NULL;
    fmpq_t c, mu;
    fmpq_init(c);
    fmpq_init(mu);
    bool pure = true;
    for (size_t k = 0; k < l->count && pure; k++) {
        expr *rest;
        expr_as_coefficient(e, l->branches[k].p, c, &rest);
        expr *front = expr_fmpq(e, c);
        pure = is_pure_power(e, rest, l->branches[k].x, mu) && fmpq_sgn(c) > 0 && (!constant || front == constant);
        constant = front;
    }
    for (size_t k = 0; k < l->count && pure; k++) {
        expr *rest;
        expr_as_coefficient(e, l->branches[k].p, c, &rest);
        l->branches[k].p = rest;
    }
    if (pure && constant) l->scale = expr_mul(e, constant, l->scale);
    fmpq_clear(c);
    fmpq_clear(mu);
}

/* Cuts the contribution's lanes to the powers of its first `terms` nonzero terms; how many there are. */
static slong cut_contribution(contribution *c, bool small, slong terms)
{
    size_t room = 0, n = 0;
    for (size_t k = 0; k < c->lane_count; k++) room += (size_t)c->lanes[k].c.count;
    fmpq *list = _fmpq_vec_init((slong)room + 1);
    for (size_t k = 0; k < c->lane_count; k++)
        for (slong m = 0; m < c->lanes[k].c.count; m++) {
            if (coefficient_is_zero(&c->lanes[k].c, m)) continue;
            fmpq_mul_si(&list[n], c->lanes[k].step, m);
            fmpq_add(&list[n], &list[n], expr_number(c->lanes[k].first_exponent));
            n++;
        }
    for (size_t k = 1; k < n; k++) /* in order of size */
        for (size_t j = k; j > 0; j--) {
            int order = fmpq_cmp(&list[j], &list[j - 1]);
            if (order == 0 || (order > 0) == small) break;
            fmpq_swap(&list[j], &list[j - 1]);
        }
    if ((slong)n > terms) {
        fmpq *last = &list[terms - 1];
        fmpq_t at;
        fmpq_init(at);
        for (size_t k = 0; k < c->lane_count; k++) {
            lane *l = &c->lanes[k];
            slong keep = 0;
            for (slong m = 0; m < l->c.count; m++) {
                fmpq_mul_si(at, l->step, m);
                fmpq_add(at, at, expr_number(l->first_exponent));
                int order = fmpq_cmp(at, last);
                if (order == 0 || (order > 0) != small) keep = m + 1;
            }
            if (l->c.q)
                for (slong m = keep; m < l->c.count; m++) fmpq_zero(&l->c.q[m]);
            if (keep < l->c.count && l->c.q) {
                fmpq *q = _fmpq_vec_init(keep);
                for (slong m = 0; m < keep; m++) fmpq_swap(&q[m], &l->c.q[m]);
                _fmpq_vec_clear(l->c.q, l->c.count);
                l->c.q = q;
            }
            l->c.count = keep;
        }
        fmpq_clear(at);
        size_t kept = 0;
        for (size_t k = 0; k < c->lane_count; k++)
            if (c->lanes[k].c.count == 0) lane_clear(&c->lanes[k]);
            else c->lanes[kept++] = c->lanes[k];
        c->lane_count = kept;
    }
    _fmpq_vec_clear(list, (slong)room + 1);
    return (slong)n;
}

static void drop_contributions(expansion *out, size_t from)
{
    for (size_t k = from; k < out->contribution_count; k++) contribution_clear(&out->contributions[k]);
    out->contribution_count = from;
}

/* The terms of one local form of this point, again with a greater length while a contribution has too few. */
static tw_status expand_form(point_work *w, const local_form *l, const fmpq_t factor_power)
{
    tw_engine *e = w->e;
    slong wanted = 2 * w->terms + 2;
    size_t before = w->out->contribution_count;
    for (int tries = 0;; tries++, wanted *= 2) {
        contribution base;
        contribution_init(&base);
        local_form_copy(&base.local, l);
        tw_status status = contribution_fill(e, &base, w->r->large, w->r->small, wanted, &w->out->conditions);
        if (status != TW_OK && e->error.kind == ERROR_UNSUITABLE && strstr(e->error.words, "all vanish")) {
            engine_forgive(e); /* this point gives nothing */
            contribution_clear(&base);
            return TW_OK;
        }
        if (status == TW_OK) status = put_lanes(w, &base, factor_power);
        bool ends = base.terminates, few = false;
        contribution_clear(&base);
        if (status != TW_OK) return TW_ERROR;
        for (size_t k = before; k < w->out->contribution_count; k++) {
            contribution *c = &w->out->contributions[k];
            slong found = 0;
            for (size_t n = 0; n < c->lane_count; n++)
                for (slong m = 0; m < c->lanes[n].c.count; m++) found += !coefficient_is_zero(&c->lanes[n].c, m);
            few = few || found < w->terms;
            c->terminates = ends;
        }
        if (!few || ends || tries == 3) break;
        drop_contributions(w->out, before);
    }
    return TW_OK;
}

/* The sides of point k with the sign tau, for each part of the kernel. */
static tw_status expand_sides(tw_engine *e, expansion *out, const phase_reading *r, size_t k, int tau, slong terms,
                              size_t first)
{
    bool inside = r->stationary[k];
    expr *inf = expr_constant_of(e, CONSTANT_INF), *place = r->points[k];
    int left = r->signs[k], right = r->signs[k + 1]; /* of p' on both sides; 0: not on the path */
    for (size_t part = 0; part < r->part_count; part++) {
        point_work w = {e, out, r, r->parts[part].kernel, place, expr_substitute(e, r->p, r->x, place),
                        inside ? POINT_STATIONARY : POINT_END, tau, first, terms, expr_int(e, 1)};
        w.height = w.height ? normal_under_facts(e, expr_expand(e, w.height), NULL, 0) : NULL;
        local_form l;
        local_form_init(&l);
        l.scale = expr_pow(e, r->large, expr_fmpq(e, r->power));
        l.factor = r->outside;
        tw_status status = w.height ? TW_OK : TW_ERROR;
        if (status == TW_OK && right == tau) {
            expr *length = k + 1 < r->point_count ? expr_sub(e, r->points[k + 1], place) : inf;
            status = add_side(&w, &l, r->parts[part].q, 1, length);
        }
        if (status == TW_OK && left && -left == tau) {
            expr *length = k > 0 ? expr_sub(e, place, r->points[k - 1]) : inf;
            status = add_side(&w, &l, r->parts[part].q, -1, length);
        }
        fmpq_t number, power;
        fmpq_init(number);
        fmpq_init(power);
        expr *rest;
        factor_split(e, r->outside, r->large, number, power, &rest);
        if (status == TW_OK && l.count > 0) {
            take_constant(e, &l);
            w.rest = rest;
            status = expand_form(&w, &l, power);
        }
        fmpq_clear(number);
        fmpq_clear(power);
        local_form_clear(&l);
        if (status != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

static tw_status expand_point(tw_engine *e, expansion *out, const phase_reading *r, size_t k, slong terms)
{
    size_t first = out->contribution_count;
    for (int tau = 1; tau >= -1; tau -= 2)
        if (expand_sides(e, out, r, k, tau, terms, first) != TW_OK) return TW_ERROR;
    for (size_t c = first; c < out->contribution_count; c++)
        cut_contribution(&out->contributions[c], r->small, terms);
    for (size_t c = first; c < out->contribution_count;) { /* what cancelled altogether */
        if (out->contributions[c].lane_count > 0) {
            c++;
            continue;
        }
        contribution_clear(&out->contributions[c]);
        memmove(&out->contributions[c], &out->contributions[c + 1],
                (out->contribution_count - c - 1) * sizeof *out->contributions);
        out->contribution_count--;
    }
    return TW_OK;
}

/* ---- infinite ends ---- */

/* Is f > 0 for all large x? */
static bool is_positive_far_out(tw_engine *e, expr *f, expr *x)
{
    growth_program *t = growth_compile(e, f, x);
    growth_bound g;
    arf_t X;
    acb_t v;
    growth_bound_init(&g);
    arf_init(X);
    acb_init(v);
    bool positive = false;
    arf_set_ui(X, 16);
    for (int tries = 0; t && !positive && tries < 24; tries++) {
        if (growth_run(t, &g, X) && growth_is_real(t) && growth_is_nonzero(t)) {
            arb_set_arf(acb_realref(v), X);
            growth_value(v, t, acb_realref(v), 64);
            positive = arb_is_positive(acb_realref(v));
        }
        arf_mul_2exp_si(X, X, 1);
    }
    growth_free(t);
    growth_bound_clear(&g);
    arf_clear(X);
    acb_clear(v);
    return positive;
}

/* Is f seen to be the germ at infinity of a Hardy field: made of x and real constants by arithmetic, real powers and
 * logarithms of what is positive, exp, and functions that are integrals of such (Hardy 1910, ch. III; Rosenlicht 1983,
 * Theorem 2)? */
static bool is_hardy(tw_engine *e, expr *f, expr *x)
{
    if (f == x) return true;
    if (!expr_has(f, x)) return sign_is_real(e, f);
    switch ((expr_kind)f->kind) {
    case EXPR_SUM:
    case EXPR_PRODUCT:
        break;
    case EXPR_POWER:
        if (!(expr_is_number(f->args[1]) && fmpz_is_one(fmpq_denref(expr_number(f->args[1])))) &&
            !is_positive_far_out(e, f->args[0], x))
            return false;
        break;
    case EXPR_CALL:
        switch (f->is.function) {
        case FUNCTION_LOG:
        case FUNCTION_E1:
            if (!is_positive_far_out(e, f->args[0], x)) return false;
            break;
        case FUNCTION_EXP:
        case FUNCTION_SINH:
        case FUNCTION_COSH:
        case FUNCTION_TANH:
        case FUNCTION_ATAN:
        case FUNCTION_ASINH:
        case FUNCTION_ERF:
        case FUNCTION_ERFC:
            break;
        default:
            return false;
        }
        break;
    default:
        return false;
    }
    for (uint32_t k = 0; k < f->count; k++)
        if (!is_hardy(e, f->args[k], x)) return false;
    return true;
}

/* Is f(y) = O(y^a) with a below the limit, or at it where may_meet? */
static bool grows_at_most(tw_engine *e, expr *f, expr *y, slong limit, bool may_meet)
{
    growth_bound g;
    fmpq_t top;
    growth_bound_init(&g);
    fmpq_init(top);
    fmpq_set_si(top, limit, 1);
    bool ok = f && growth_at_infinity(e, &g, f, y, NULL, 16) == TW_OK;
    int order = fmpq_cmp(g.a, top);
    ok = ok && (arb_is_positive(g.b) || (fmpq_is_zero(g.c) && (order < 0 || (may_meet && order == 0 && g.k <= 0))));
    growth_bound_clear(&g);
    fmpq_clear(top);
    return ok;
}

/* The integral converges and the end gives no term of any order (DLMF 2.3.4): f = q/p' = O(y^a) with a < 0 and 1/p' =
 * O(y) in a Hardy field, where f = O(y^a) gives f' = O(y^(a-1)) and every germ is monotone in the end (Rosenlicht 1983,
 * Theorem 3); so D^n f, D f = f'/p', tends to 0 and has finite variation for each n. */
static bool end_is_quiet(tw_engine *e, const phase_reading *r, expr *q, bool right)
{
    expr *y = expr_fresh(e, "y"), *x = right ? y : expr_neg(e, y);
    expr *slope = expr_derivative(e, r->p, r->x);
    expr *f = expr_substitute(e, expr_div(e, q, slope), r->x, x);
    expr *inverse = expr_substitute(e, expr_pow(e, slope, expr_int(e, -1)), r->x, x);
    bool quiet = f && inverse && is_hardy(e, f, y) && is_hardy(e, inverse, y) && grows_at_most(e, f, y, 0, false) &&
                 grows_at_most(e, inverse, y, 1, true);
    error_kind kind = e->error.kind;
    if (kind == ERROR_TIME || kind == ERROR_MEMORY || kind == ERROR_INTERRUPT) return false;
    engine_forgive(e); /* nothing is known of the end: the condition stays open */
    return quiet;
}

static void check_infinite_ends(tw_engine *e, expansion *out, const phase_reading *r)
{
    for (int side = 0; side < 2; side++) {
        if (side ? !expr_is_inf(r->to) : !expr_is_minus_inf(r->from)) continue;
        bool quiet = true;
        for (size_t k = 0; k < r->part_count; k++) quiet = quiet && end_is_quiet(e, r, r->parts[k].q, side == 1);
        conditions_add(&out->conditions, side ? "the integral converges at inf and that end gives no terms"
                                              : "the integral converges at -inf and that end gives no terms",
                       NULL, quiet ? CONDITION_PROVED : CONDITION_OPEN);
    }
}

/* ---- the record ---- */

static void record_points(tw_engine *e, expansion *out, const phase_reading *r)
{
    step *s = derivation_add(&out->derivation, "as typed", NULL);
    s->before = s->after = r->integral;
    s = derivation_add(&out->derivation, "find the ends and the stationary points of the phase", "DLMF 2.3(iv)");
    text words;
    text_init(&words);
    text_addf(&words, "the phase is ");
    expr *shown = expr_mul(e, expr_pow(e, r->large, expr_fmpq(e, r->power)),
                           expr_substitute(e, r->p, r->x, r->variable));
    if (shown) expr_print(e, &words, shown);
    for (size_t k = 0; k < r->point_count; k++) {
        text_addf(&words, "%s %s%s = ", k ? "," : ";", r->stationary[k] ? "stationary at " : "end ",
                  r->variable->is.name);
        expr_print(e, &words, r->points[k]);
    }
    s->form = text_take(&words);
    s->detail = base_copy("between them the slope of the phase has one sign, proved by branch and bound");
    conditions_append(&s->conditions, &out->conditions);
    text_clear(&words);
}

static const char *kernel_words(const phase_reading *r)
{
    return r->parts[0].kernel == PHASE_EXP ? "each term of order alpha has the factor exp(i*tau*pi*alpha/2)"
                                           : "the contributions of exp(i*phase) and exp(-i*phase) are added: a real "
                                             "result";
}

tw_status phase_expand(tw_engine *e, expansion *out, const phase_reading *r, slong terms)
{
    out->large = r->large;
    out->small = r->small;
    out->terms_asked = terms;
    conditions_append(&out->conditions, &r->conditions);
    check_infinite_ends(e, out, r);
    record_points(e, out, r);
    for (size_t k = 0; k < r->point_count && e->error.kind == ERROR_NONE; k++) {
        size_t before = out->contribution_count;
        if (expand_point(e, out, r, k, terms) != TW_OK) return TW_ERROR;
        for (size_t c = before; c < out->contribution_count; c++) {
            step *s = local_record_sum(e, out, c, "turn the scale by a right angle and expand at the point",
                                       r->stationary[k] ? "DLMF 2.3.15, 2.3.23" : "DLMF 2.3.15, 2.3.19");
            if (s) s->detail = base_copy(kernel_words(r));
        }
    }
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (out->contribution_count == 0)
        return engine_fail(e, ERROR_UNSUITABLE,
                           "every term of every end vanishes: the integral is smaller than all powers of %s; "
                           "`evaluate` gives its value",
                           r->large->is.name);
    return TW_OK;
}

/* ---- the method ---- */

static answer phase_suits(tw_engine *e, const reading *r, char **why)
{
    (void)e;
    (void)r;
    return suits_answer(why, ANSWER_NO, "the kernel does not oscillate");
}

static tw_status phase_expand_reading(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    (void)out;
    (void)terms;
    return engine_fail(e, ERROR_INTERNAL, "%s is read by a method of its own", r->large->is.name);
}

/* More terms: everything anew, which costs no more than twice the last time where lengths are doubled. */
static tw_status phase_extend(tw_engine *e, expansion *a, slong terms)
{
    bool enough = true;
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        enough = enough && (c->terminates || contribution_count_terms(c) >= terms || c->searched >= terms);
    }
    if (enough) return TW_OK;
    phase_reading r;
    char *why = NULL;
    expansion more;
    phase_reading_init(&r);
    expansion_init(&more);
    bool read = phase_read(e, &r, a->integral, &why) == ANSWER_YES;
    tw_status status = read ? phase_expand(e, &more, &r, terms + terms / 2) : TW_ERROR;
    if (status == TW_OK) {
        contribution *list = a->contributions;
        size_t count = a->contribution_count;
        a->contributions = more.contributions;
        a->contribution_count = more.contribution_count;
        more.contributions = list;
        more.contribution_count = count;
        for (size_t k = 0; k < a->contribution_count; k++) a->contributions[k].searched = terms;
    } else if (!read && e->error.kind == ERROR_NONE) { /* a sum with other integrals: its terms are all that is known */
        for (size_t k = 0; k < a->contribution_count; k++) a->contributions[k].searched = terms;
        status = TW_OK;
    }
    free(why);
    expansion_clear(&more);
    phase_reading_clear(&r);
    return status;
}

const method method_phase = {"phase", "stationary phase", phase_suits, phase_expand_reading, phase_extend};
