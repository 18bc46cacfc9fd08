/* Steepest descent: from the integers of saddles, ends and poles to contributions with exact coefficients. The one idea: on each
 * descending half branch the Laplace residue formula holds with v = (p - p0)/lead to the power 1/m, so that a contribution's lanes
 * are one list of coefficients in the place's own field times sums of roots of unity (DLMF 2.3.18, 2.4(iv)). Knows nothing of how
 * the integers were found. */
#include "engine/method/descent.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/exact/values.h"
#include "engine/method/lanes.h"
#include "engine/method/local.h"
#include "engine/method/method.h"

void steepest_free(steepest *s)
{
    if (!s)
        return;
    acb_clear(s->direction);
    free(s->n);
    free(s);
}

/* ---- coefficients ---- */

/* c[N-1] for N <= count, without the lane's constant; front: an expression free of N. */
static tw_status local_coefficients(descent_problem *d, const spot *s, slong count, expr **c, expr **front)
{
    tw_engine *e = d->e;
    saddle_field f;
    tw_status status = TW_ERROR;
    if (saddle_field_init(&f, e, &d->l, s))
        status = saddle_coefficients(&f, &d->amplitude, count, c, front);
    saddle_field_clear(&f);
    return status == TW_OK || e->error.kind ? status : engine_fail(e, ERROR_UNSUITABLE, "the saddle's number field is too large");
}

/* A list of coefficients of one constant: strand k of the series in v. */
typedef struct list {
    expr *front;
    expr **c;
    bool ends; /* all further ones are 0 */
} list;

typedef struct lists {
    size_t count;
    list *at;
    slong length;
} lists;

static void lists_clear(lists *l)
{
    for (size_t k = 0; k < l->count; k++)
        free(l->at[k].c);
    free(l->at);
    *l = (lists){0};
}

static list *lists_find(tw_engine *e, lists *l, expr *front)
{
    for (size_t k = 0; k < l->count; k++)
        if (l->at[k].front == front)
            return l->at + k;
    l->at = base_resize(l->at, (l->count + 1) * sizeof *l->at);
    list *one = l->at + l->count++;
    *one = (list){front, base_alloc((size_t)(l->length + 1) * sizeof *one->c), false};
    for (slong n = 0; n < l->length; n++)
        one->c[n] = expr_int(e, 0);
    return one;
}

/* p(place + u) - height over lead, with no constant and no first terms left to cancel: u^m (1 + ...). */
static expr *monic_phase(tw_engine *e, const steepest *s, expr *u)
{
    expr **c, *sum = expr_int(e, 0);
    slong degree;
    expr *moved = expr_expand(e, expr_substitute(e, s->p, s->z, expr_add(e, s->place, u)));
    if (moved && expr_polynomial(e, moved, u, 60, &c, &degree) == TW_OK) {
        for (slong k = s->m + 1; k <= degree; k++)
            sum = expr_add(e, sum, expr_mul(e, expr_expand(e, expr_div(e, c[k], s->lead)), expr_pow(e, u, expr_int(e, k))));
        free(c);
        return expr_add(e, expr_pow(e, u, expr_int(e, s->m)), sum);
    }
    return expr_div(e, expr_sub(e, expr_substitute(e, s->p, s->z, expr_add(e, s->place, u)), s->height), s->lead);
}

/* By the general series: for amplitudes with parameters, trigonometric functions, ... */
static tw_status general_coefficients(descent_problem *d, const steepest *s, lists *out)
{
    tw_engine *e = d->e;
    expr *u = expr_fresh(e, "u"), *p = monic_phase(e, s, u), *q = expr_substitute(e, s->q, s->z, expr_add(e, s->place, u));
    expr **conditions = NULL;
    size_t condition_count = 0;
    series g;
    series_init(&g);
    tw_status status = series_branch(e, &g, p, q, u, out->length, &conditions, &condition_count);
    for (size_t k = 0; k < condition_count && status == TW_OK; k++)
        status = conditions_require(e, &d->conditions, conditions[k]);
    free(conditions);
    fmpq_t power, stride, m;
    fmpq_init(power), fmpq_init(stride), fmpq_init(m);
    fmpq_set_si(m, s->m, 1);
    for (size_t k = 0; k < g.count && status == TW_OK; k++) {
        const strand *t = g.strands + k;
        if (!expr_is_number(t->exponent) || t->log_power) {
            status = engine_fail(e, ERROR_UNSUITABLE, "the integrand is singular at the critical point");
            break;
        }
        list *one = lists_find(e, out, t->constant);
        fmpq_set_si(stride, 1, (ulong)t->den);
        for (slong n = 0; n < t->c.count && status == TW_OK; n++) {
            if (coefficient_is_zero(&t->c, n))
                continue;
            fmpq_mul_si(power, stride, n); /* t^(N/m - 1) */
            fmpq_add(power, power, expr_number(t->exponent));
            fmpq_add_si(power, power, 1);
            fmpq_mul(power, power, m);
            if (!fmpz_is_one(fmpq_denref(power)) || fmpq_sgn(power) <= 0) {
                status = engine_fail(e, ERROR_UNSUITABLE, "the integrand is singular at the critical point");
                break;
            }
            if (fmpz_cmp_si(fmpq_numref(power), out->length) > 0)
                continue;
            slong N = fmpz_get_si(fmpq_numref(power)), j = (N - 1) / s->m, r = N - s->m * j;
            expr *factor = expr_pow(e, s->lead, expr_int(e, -j));
            for (slong i = 0; i < j; i++)
                factor = expr_mul(e, factor, expr_frac(e, r + s->m * i, s->m));
            expr *c = expr_mul(e, coefficient_expr(e, &t->c, n), expr_is_number(s->lead) ? factor : expr_expand(e, factor));
            one->c[N - 1] = expr_add(e, one->c[N - 1], c);
        }
        one->ends = g.terminates;
    }
    fmpq_clear(power), fmpq_clear(stride), fmpq_clear(m);
    series_clear(&g);
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static tw_status all_coefficients(descent_problem *d, const spot *at, const steepest *s, lists *out)
{
    if (!d->amplitude.exact)
        return general_coefficients(d, s, out);
    expr **c = base_alloc((size_t)(out->length + 1) * sizeof *c), *front;
    tw_status status = local_coefficients(d, at, out->length, c, &front);
    if (status == TW_OK) {
        list *one = lists_find(d->e, out, front);
        memcpy(one->c, c, (size_t)out->length * sizeof *c);
    }
    free(c);
    return status;
}

/* ---- lanes ---- */

/* lead^(-1/m), in polar form where the argument is a simple part of pi: a branch, perhaps not the principal one. */
static expr *inverse_root(tw_engine *e, expr *lead, slong m)
{
    enum { PARTS = 12 };
    expr *root = expr_pow(e, lead, expr_frac(e, -1, m));
    if (!lead || expr_is_number(lead) || m == 1)
        return root;
    acb_t v;
    acb_init(v);
    double part = NAN;
    if (ball_value(e, v, lead, 128) == TW_OK)
        part = atan2(arf_get_d(arb_midref(acb_imagref(v)), ARF_RND_NEAR), arf_get_d(arb_midref(acb_realref(v)), ARF_RND_NEAR)) * PARTS / M_PI;
    acb_clear(v);
    if (!(fabs(part - nearbyint(part)) < 1e-9))
        return root;
    expr *i = expr_constant_of(e, CONSTANT_I), *pi = expr_constant_of(e, CONSTANT_PI);
    slong k = (slong)nearbyint(part);
    expr *square = expr_expand(e, expr_mul(e, lead, expr_expand(e, expr_call1(e, FUNCTION_CONJ, lead))));
    expr *modulus = expr_sqrt(e, square);
    expr *unit = expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_mul(e, i, pi), expr_frac(e, k, PARTS)));
    if (!modulus || !square || !expr_is_number(square) || value_is_zero(e, expr_sub(e, lead, expr_mul(e, modulus, unit))) != ANSWER_YES)
        return root;
    return expr_mul(e, expr_pow(e, modulus, expr_frac(e, -1, m)),
                    expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_mul(e, i, pi), expr_frac(e, -k, PARTS * m))));
}

/* sum n_k exp(2 pi i (k - base) r/m), exactly. */
static expr *weight_of(tw_engine *e, const steepest *s, slong r)
{
    expr *sum = expr_int(e, 0), *i = expr_constant_of(e, CONSTANT_I), *pi = expr_constant_of(e, CONSTANT_PI);
    for (slong k = 0; k < s->m; k++) {
        if (!s->n[k])
            continue;
        slong turn = ((k - s->base) * r % s->m + s->m) % s->m;
        expr *unit = expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_mul(e, i, pi), expr_frac(e, 2 * turn, s->m)));
        if (2 * turn == s->m)
            unit = expr_int(e, -1);
        sum = expr_add(e, sum, expr_mul(e, expr_frac(e, s->n[k], s->half ? 2 : 1), unit));
    }
    return sum;
}

static bool weight_vanishes(tw_engine *e, expr *w)
{
    acb_t v;
    acb_init(v);
    bool zero = !w || expr_is_zero(w) || (ball_value(e, v, w, 128) == TW_OK && acb_contains_zero(v));
    acb_clear(v);
    return zero;
}

/* Is the lane r left out: the sum of n_k exp(2 pi i k r/m) is 0? A sum of few roots of unity with small integers is 0 or not small:
 * its norm is an integer. */
static slong count_kept(const lists *l, const bool *live, slong m, slong upto)
{
    slong kept = 0;
    for (slong N = 1; N <= upto; N++)
        for (size_t k = 0; k < l->count; k++)
            if (live[(N - 1) % m] && !expr_is_zero(l->at[k].c[N - 1]))
                kept++;
    return kept;
}

static tw_status set_lanes(tw_engine *e, contribution *c, const steepest *s, const lists *l, const bool *live, slong upto)
{
    expr *root = inverse_root(e, s->lead, s->m);
    fmpq_t power, scale_power;
    expr *large, *front;
    fmpq_init(power);
    fmpq_init(scale_power);
    tw_status status = facts_large(e, &large) == LARGE_NONE ? TW_ERROR : TW_OK;
    fmpq_t number;
    fmpq_init(number);
    factor_split(e, s->scale, large, number, scale_power, &front); /* scale = large^scale_power */
    factor_split(e, s->factor, large, number, power, &front);
    for (size_t k = 0; k < l->count && status == TW_OK; k++)
        for (slong r = 1; r <= s->m && status == TW_OK; r++) {
            slong count = 0;
            if (!live[r - 1])
                continue;
            expr **x = base_alloc((size_t)(upto / s->m + 2) * sizeof *x);
            bool any = false;
            for (slong N = r; N <= upto; N += s->m) {
                x[count++] = l->at[k].c[N - 1];
                any = any || !expr_is_zero(l->at[k].c[N - 1]);
            }
            while (count > 0 && c->terminates && expr_is_zero(x[count - 1]))
                count--;
            if (any && count > 0) {
                expr *constant = expr_mul(e, expr_mul(e, weight_of(e, s, r), expr_fmpq(e, number)),
                                          expr_mul(e, l->at[k].front, expr_mul(e, expr_call1(e, FUNCTION_GAMMA, expr_frac(e, r, s->m)),
                                                                               expr_pow(e, root, expr_int(e, r)))));
                fmpq_t rational; /* goes into the coefficients */
                fmpq_init(rational);
                if (constant)
                    expr_as_coefficient(e, constant, rational, &constant);
                for (slong n = 0; n < count; n++)
                    x[n] = expr_expand(e, expr_mul(e, expr_fmpq(e, rational), x[n]));
                fmpq_clear(rational);
                fmpq_t first, forward;
                fmpq_init(first), fmpq_init(forward);
                fmpq_set_si(first, -r, (ulong)s->m);
                fmpq_mul(first, first, scale_power);
                fmpq_add(first, first, power);
                fmpq_neg(forward, scale_power);
                status = contribution_set_lane(e, c, constant, expr_fmpq(e, first), forward, x, count);
                fmpq_clear(first), fmpq_clear(forward);
            }
            free(x);
        }
    fmpq_clear(number);
    fmpq_clear(power);
    fmpq_clear(scale_power);
    return status;
}

/* The integrand's own kernel is a pure power and the amplitude a polynomial: the series ends. */
static bool series_ends(const descent_problem *d, const steepest *s)
{
    const gauss_poly *n = &d->l.numerator, *D = &d->l.denominator;
    if (!d->amplitude.exact || !fmpq_poly_is_zero(d->amplitude.growth.re) || !fmpq_poly_is_zero(d->amplitude.growth.im) ||
        fmpq_poly_degree(d->amplitude.bottom.re) > 0 || fmpq_poly_degree(d->amplitude.bottom.im) > 0 || fmpq_poly_degree(D->re) > 0 ||
        fmpq_poly_degree(D->im) > 0)
        return false;
    /* a spot of full order is the only zero of p' */
    return s->m == FLINT_MAX(fmpq_poly_degree(n->re), fmpq_poly_degree(n->im)) && d->l.count <= 1;
}

static tw_status fill(descent_problem *d, contribution *c, const spot *at, slong terms)
{
    enum { SEARCH_LIMIT = 4096 };
    tw_engine *e = d->e;
    steepest *s = c->steepest;
    bool *live = base_alloc((size_t)s->m * sizeof *live);
    for (slong r = 1; r <= s->m; r++)
        live[r - 1] = !weight_vanishes(e, weight_of(e, s, r));
    slong classes = 0;
    for (slong r = 0; r < s->m; r++)
        classes += live[r];
    tw_status status = TW_OK;
    bool enough = false;
    c->terminates = series_ends(d, s);
    for (slong length = s->m * ((terms + classes - 1) / FLINT_MAX(classes, 1) + 1); !enough && status == TW_OK && budget_ok(e);) {
        lists l = {.length = length};
        status = all_coefficients(d, at, s, &l);
        slong upto = length, kept = status == TW_OK ? count_kept(&l, live, s->m, length) : 0;
        enough = kept >= terms || length > SEARCH_LIMIT ||
                 (c->terminates && length > s->m + FLINT_MAX(fmpq_poly_degree(d->amplitude.top.re), fmpq_poly_degree(d->amplitude.top.im)));
        if (status == TW_OK && enough) {
            while (upto > 1 && !c->terminates && count_kept(&l, live, s->m, upto - 1) >= terms)
                upto--;
            contribution_clear_lanes(c);
            c->domain = DOMAIN_RATIONAL;
            status = set_lanes(e, c, s, &l, live, upto);
            if (kept < terms)
                c->searched = terms;
        }
        lists_clear(&l);
        length = 2 * length;
    }
    free(live);
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- poles of the amplitude ---- */

/* The residue of q exp(-scale p) at a simple pole. */
static tw_status fill_residue(descent_problem *d, contribution *c)
{
    tw_engine *e = d->e;
    steepest *s = c->steepest;
    expr *u = expr_fresh(e, "u"), **conditions = NULL;
    size_t count = 0;
    series q;
    series_init(&q);
    expr *moved = expr_substitute(e, s->q, s->z, expr_add(e, s->place, u));
    tw_status status = series_at_zero(e, &q, moved, u, 1, &conditions, &count);
    free(conditions);
    expr *residue = expr_int(e, 0);
    for (size_t k = 0; k < q.count && status == TW_OK; k++) {
        const strand *t = q.strands + k;
        if (!expr_is_int(t->exponent, -1))
            status = engine_fail(e, ERROR_UNSUITABLE, "the amplitude has a pole of higher order at a point that counts");
        else
            residue = expr_add(e, residue, expr_mul(e, t->constant, coefficient_expr(e, &t->c, 0)));
    }
    series_clear(&q);
    if (status != TW_OK)
        return status;
    fmpq_t number, power, zero;
    expr *rest, *one = expr_int(e, 1);
    fmpq_init(number), fmpq_init(power), fmpq_init(zero);
    factor_split(e, s->factor, d->large, number, power, &rest);
    expr *two_pi_i = expr_mul(e, expr_frac(e, 2 * s->n[0], s->half ? 2 : 1), expr_mul(e, expr_constant_of(e, CONSTANT_PI), expr_constant_of(e, CONSTANT_I)));
    expr *constant = expr_mul(e, expr_mul(e, two_pi_i, expr_fmpq(e, number)), residue);
    fmpq_set_si(zero, d->small ? 1 : -1, 1);
    c->terminates = true;
    c->domain = DOMAIN_RATIONAL;
    status = contribution_set_lane(e, c, constant, expr_fmpq(e, power), zero, &one, 1);
    fmpq_clear(number), fmpq_clear(power), fmpq_clear(zero);
    return status;
}

/* ---- contributions ---- */

/* Which D_k the principal value of lead^(-1/m) points along; false: not seen. */
static bool find_base(tw_engine *e, steepest *s)
{
    acb_t v, w;
    arb_t a, pi;
    acb_init(v), acb_init(w);
    arb_init(a), arb_init(pi);
    bool found = false;
    expr *root = inverse_root(e, s->lead, s->m);
    if (root && ball_value(e, v, root, 256) == TW_OK && acb_is_finite(v)) {
        acb_div(v, v, s->direction, 128);
        for (slong k = 0; k < s->m && !found; k++) { /* v = |v| exp(2 pi i k/m) */
            fmpq_t t;
            fmpq_init(t);
            fmpq_set_si(t, -2 * k, (ulong)s->m);
            arb_sin_cos_pi_fmpq(acb_imagref(w), acb_realref(w), t, 128);
            acb_mul(w, w, v, 128);
            acb_arg(a, w, 64);
            arb_const_pi(pi, 64);
            arb_mul_si(a, a, 4 * s->m, 64);
            arb_abs(a, a);
            if (arb_is_positive(acb_realref(w)) && arb_lt(a, pi)) {
                s->base = k;
                found = true;
            }
            fmpq_clear(t);
        }
    }
    acb_clear(v), acb_clear(w);
    arb_clear(a), arb_clear(pi);
    return found;
}

/* On a Stokes line the mean of both sides counts; it may be nothing. */
static bool is_zero_share(const share *h)
{
    for (slong k = 0; k < h->halves; k++)
        if (h->n[k] + h->other[k])
            return false;
    return true;
}

static tw_status add_contribution(descent_problem *d, expansion *out, const share *h, const acb_struct *direction, slong terms)
{
    tw_engine *e = d->e;
    contribution *c = expansion_add(out);
    steepest *s = base_alloc(sizeof *s);
    memset(s, 0, sizeof *s);
    acb_init(s->direction);
    acb_set(s->direction, direction);
    c->steepest = s;
    *s = (steepest){d->p, d->q, d->z, d->scale, d->factor, h->at->place, NULL, NULL, h->halves, NULL, h->stokes, h->residue,
                    h->stokes, 0, {*s->direction}};
    s->n = base_alloc((size_t)h->halves * sizeof *s->n);
    for (slong k = 0; k < h->halves; k++)
        s->n[k] = h->stokes ? h->n[k] + h->other[k] : h->n[k];
    saddle_field f;
    bool fine = saddle_field_init(&f, e, &d->l, h->at);
    if (fine)
        fine = saddle_height(&f, &s->height, &s->lead);
    saddle_field_clear(&f);
    if (!fine)
        return e->error.kind ? TW_ERROR : engine_fail(e, ERROR_UNSUITABLE, "the saddle's number field is too large");
    c->variable = d->variable;
    c->place = expr_mul(e, d->stretch, s->place);
    c->kind = h->residue ? POINT_SINGULAR : h->at == &d->ends[0] || h->at == &d->ends[1] ? POINT_END : POINT_SADDLE;
    c->method = "descent";
    c->on_stokes_line = h->stokes;
    expr *exponential = expr_call1(e, FUNCTION_EXP, expr_expand(e, expr_neg(e, expr_mul(e, d->scale, s->height)))), *rest;
    fmpq_t number, power;
    fmpq_init(number), fmpq_init(power);
    factor_split(e, d->factor, d->large, number, power, &rest);
    fmpq_clear(number), fmpq_clear(power);
    c->prefactor = expr_mul(e, rest, exponential);
    if (!c->prefactor || !c->place)
        return TW_ERROR;
    if (h->residue)
        return fill_residue(d, c);
    if (!find_base(e, s))
        return e->error.kind ? TW_ERROR : engine_fail(e, ERROR_UNDECIDED, "the direction of a steepest curve could not be decided");
    return fill(d, c, h->at, terms);
}

/* ---- dominance ---- */

/* The deepest spots that count for certain dominate. */
static tw_status set_dominance(descent_problem *d, expansion *out, const spot *const *at)
{
    tw_engine *e = d->e;
    size_t best = SIZE_MAX;
    for (size_t k = 0; k < out->contribution_count; k++) {
        if (out->contributions[k].on_stokes_line)
            continue;
        int sign = best == SIZE_MAX ? -1 : heights_compare(&d->l, at[k], at[best], 0);
        if (e->error.kind != ERROR_NONE)
            return TW_ERROR;
        if (sign == -1)
            best = k;
    }
    for (size_t k = 0; k < out->contribution_count && best != SIZE_MAX; k++) {
        int sign = k == best ? 0 : heights_compare(&d->l, at[k], at[best], 0);
        if (sign == 2) { /* equal as far as thousands of bits show */
            char *one = expr_text(e, out->contributions[k].place), *other = expr_text(e, out->contributions[best].place);
            text t;
            text_init(&t);
            text_addf(&t, "%s = %s and %s are equally deep", d->variable->is.name, one ? one : "", other ? other : "");
            conditions_add(&out->conditions, t.bytes, NULL, CONDITION_OPEN);
            text_clear(&t);
            free(one);
            free(other);
        }
        out->contributions[k].dominant = (sign == 0 || sign == 2) && !out->contributions[k].on_stokes_line;
    }
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* Dominant ones first. */
static void sort_contributions(expansion *out)
{
    size_t kept = 0;
    for (size_t k = 0; k < out->contribution_count; k++)
        if (out->contributions[k].dominant) {
            contribution swap = out->contributions[k];
            memmove(out->contributions + kept + 1, out->contributions + kept, (k - kept) * sizeof swap);
            out->contributions[kept++] = swap;
        }
}

/* ---- words ---- */

static void add_integers(text *t, const share *h, const slong *n, const acb_struct *direction)
{
    if (h->residue) {
        text_addf(t, "%ld turn%s", (long)n[0], n[0] == 1 || n[0] == -1 ? "" : "s");
        return;
    }
    bool zero = true;
    for (slong k = 0; k < h->halves; k++)
        zero = zero && !n[k];
    if (zero) {
        text_add(t, "0");
        return;
    }
    double x = arf_get_d(arb_midref(acb_realref(direction)), ARF_RND_NEAR), y = arf_get_d(arb_midref(acb_imagref(direction)), ARF_RND_NEAR);
    bool first = true;
    for (slong k = 0; k < h->halves; k++) {
        if (!n[k])
            continue;
        double angle = remainder(atan2(y, x) + 2 * M_PI * (double)k / (double)h->halves, 2 * M_PI);
        if (h->halves == 2 && n[k] < 0)
            continue; /* the other half says it */
        text_addf(t, "%s%ld towards the angle %.4g", first ? "" : ", ", (long)n[k], fabs(angle) < 1e-12 ? 0 : angle);
        first = false;
    }
}

static tw_status record_thimbles(descent_problem *d)
{
    tw_engine *e = d->e;
    text words;
    text_init(&words);
    for (size_t k = 0; k < d->found.count; k++) {
        const share *h = d->found.list + k;
        char *place = expr_text(e, expr_mul(e, d->stretch, h->at->place));
        if (!place) {
            text_clear(&words);
            return TW_ERROR;
        }
        text_addf(&words, "%s%s %s = %s: ", k ? "; " : "",
                  h->residue ? "pole" : h->at == &d->ends[0] || h->at == &d->ends[1] ? "end" : "saddle", d->variable->is.name, place);
        free(place);
        add_integers(&words, h, h->n, d->found.directions + k);
        if (h->stokes) {
            text_add(&words, " on one side of a Stokes line, ");
            add_integers(&words, h, h->other, d->found.directions + k);
            text_add(&words, " on the other");
        }
    }
    step *s = derivation_add(&d->derivation, "write the path as steepest curves", "DLMF 2.4(iv)");
    s->detail = text_take(&words);
    text t;
    text_init(&t);
    text_addf(&t, "the integer of a point is the number of times the path crosses its ascending curve, followed by %ld discs in which "
              "the exponent is proved univalent%s", (long)d->found.discs,
              d->found.turned ? "; heights meet, so the exponent was turned a little both ways" : "");
    s->form = text_take(&t);
    return TW_OK;
}

/* ---- the method ---- */

static void take_problem(expansion *out, descent_problem *d, expr *integral, slong terms)
{
    out->integral = integral;
    out->large = d->large;
    out->small = d->small;
    out->terms_asked = terms;
    out->made_by = &method_descent;
    conditions_append(&out->conditions, &d->conditions);
    derivation_move(&out->derivation, &d->derivation);
    text t;
    text_init(&t);
    text_addf(&t, "%s: the path is deformed to steepest curves through %zu of its saddles, ends and poles", method_descent.title,
              out->contribution_count);
    out->why = text_take(&t);
}

tw_status descent_expand(tw_engine *e, expansion *out, expr *integral, slong terms)
{
    descent_problem d;
    descent_problem_init(&d, e);
    tw_status status = descent_read(&d, integral);
    if (status == TW_OK)
        status = record_thimbles(&d);
    const spot **at = base_alloc((d.found.count + 1) * sizeof *at);
    for (size_t k = 0; k < d.found.count && status == TW_OK && d.read_found; k++) {
        const share *h = d.found.list + k;
        out->stokes_passed = out->stokes_passed || h->stokes;
        if (is_zero_share(h))
            continue;
        at[out->contribution_count] = h->at;
        status = add_contribution(&d, out, h, d.found.directions + k, terms);
    }
    if (status == TW_OK && out->contribution_count == 0)
        status = engine_fail(e, ERROR_UNSUITABLE, "the path can be deformed away: no saddle, end or pole counts and the integral is 0");
    if (status == TW_OK)
        status = set_dominance(&d, out, at);
    free(at);
    if (status == TW_OK) {
        sort_contributions(out);
        take_problem(out, &d, integral, terms);
        for (size_t k = 0; k < out->contribution_count; k++)
            local_record_sum(e, out, k, out->contributions[k].steepest->residue ? "take the residue" : "expand at the saddle or end",
                             out->contributions[k].steepest->residue ? "DLMF 1.10.8" : "DLMF 2.3.18, 2.4(iv)");
        if (e->error.kind != ERROR_NONE)
            status = TW_ERROR;
    }
    descent_problem_clear(&d);
    return status;
}

tw_status descent_summary(tw_engine *e, char **words, expr *integral)
{
    descent_problem d;
    descent_problem_init(&d, e);
    *words = NULL;
    tw_status status = descent_read(&d, integral);
    if (status == TW_OK) {
        text t;
        text_init(&t);
        text_addf(&t, "depends on %s; a path over", d.large->is.name);
        bool first = true;
        for (size_t k = 0; k < d.found.count; k++) {
            const share *h = d.found.list + k;
            if (is_zero_share(h))
                continue;
            char *place = expr_text(e, expr_mul(e, d.stretch, h->at->place));
            text_addf(&t, "%s the %s %s = %s", first ? "" : ",",
                      h->residue ? "pole" : h->at == &d.ends[0] || h->at == &d.ends[1] ? "end" : "saddle", d.variable->is.name,
                      place ? place : "");
            free(place);
            first = false;
        }
        if (first)
            text_add(&t, " no saddle");
        *words = text_take(&t);
    }
    descent_problem_clear(&d);
    return status;
}

static answer descent_suits(tw_engine *e, const reading *r, char **why)
{
    (void)e;
    (void)r;
    return suits_answer(why, ANSWER_NO, "it takes paths in the complex plane");
}

static tw_status descent_from_reading(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    return descent_expand(e, out, r->integral, terms);
}

/* More terms: the contributions are made anew from the integral. */
static tw_status descent_extend(tw_engine *e, expansion *a, slong terms)
{
    descent_problem d;
    descent_problem_init(&d, e);
    tw_status status = descent_read(&d, a->integral);
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++) {
        contribution *c = a->contributions + k;
        if (!c->steepest || c->terminates || contribution_count_terms(c) >= terms || terms <= c->searched)
            continue;
        const share *h = NULL;
        for (size_t j = 0; j < d.found.count && !h; j++)
            if (d.found.list[j].at->place == c->steepest->place)
                h = d.found.list + j;
        c->steepest->z = d.z;
        c->steepest->p = d.p;
        c->steepest->q = d.q;
        status = h ? fill(&d, c, h->at, terms) : engine_fail(e, ERROR_INTERNAL, "a saddle was lost");
    }
    descent_problem_clear(&d);
    return status;
}

const method method_descent = {"descent", "steepest descent", descent_suits, descent_from_reading, descent_extend};
