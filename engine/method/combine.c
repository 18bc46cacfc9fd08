/* Arithmetic of expansions. The one idea: an expansion without logarithms is prefactor * lead * s^a * (1 + sum a_k
 * s^(-k/d)), and what is in the brackets is an ordinary power series, which products, powers and logarithms keep so;
 * the error is not carried through them term by term: a number is the same arithmetic on the balls of the parts
 * (engine/numeric/combined.c). */
#include "engine/method/combine.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/algebraic.h"
#include "engine/method/lanes.h"
#include "engine/method/method.h"
#include "engine/method/scale.h"

void combination_free(struct combination *c)
{
    if (!c) return;
    for (size_t k = 0; k < c->count; k++) expansion_clear(&c->leaves[k]);
    free(c->leaves);
    free(c->symbols);
    free(c);
}

/* prefactor * lead * large^exponent * sum of a[k] * large^(-+k/den); a[0] = 1. */
typedef struct grid {
    expr *prefactor, *lead, *exponent;
    slong den, count;
    expr **a;
} grid;

typedef struct job {
    tw_engine *e;
    expansion *out;
    struct combination *c;
    expr *large;
    bool small;
    slong terms;
} job;

static void grid_clear(grid *g)
{
    free(g->a);
    memset(g, 0, sizeof *g);
}

static expr *tidy(tw_engine *e, expr *a)
{
    return expr_is_number(a) ? a : value_canonical(e, a);
}

/* ---- from an expansion ---- */

static slong grid_index(const job *j, expr *from, expr *to, slong den)
{
    expr *d = expr_mul(j->e, expr_int(j->e, den), j->small ? expr_sub(j->e, to, from) : expr_sub(j->e, from, to));
    if (!d || !expr_is_number(d) || !fmpz_is_one(fmpq_denref(expr_number(d))) ||
        !fmpz_fits_si(fmpq_numref(expr_number(d))))
        return -1;
    return fmpz_get_si(fmpq_numref(expr_number(d)));
}

typedef struct flat_term {
    expr *exponent, *value;
} flat_term;

static tw_status refuse(job *j, const char *why)
{
    return engine_fail(j->e, ERROR_UNSUITABLE, "these expansions do not combine into one: %s", why);
}

/* All dominant terms as a flat list; *last: per contribution the exponent of its last term, NULL where it ends. */
static tw_status flatten(job *j, expansion *a, flat_term **list, size_t *count, expr ***last, size_t *last_count)
{
    tw_engine *e = j->e;
    expr *front = NULL;
    for (size_t k = 0; k < a->contribution_count; k++) {
        contribution *c = &a->contributions[k];
        if (!c->dominant) continue;
        if (!front) front = c->prefactor;
        expr *ratio = normal_under_facts(e, expr_div(e, c->prefactor, front), &j->large, 1);
        if (!ratio) return TW_ERROR;
        if (expr_has(ratio, j->large))
            return refuse(j, "its points have prefactors that differ in the large parameter");
        term *order;
        slong found;
        if (expansion_order(e, a, k, j->terms + 1, &order, &found) != TW_OK) return TW_ERROR;
        expr *end = NULL;
        for (slong n = 0; n < found; n++) {
            const lane *l = &c->lanes[order[n].lane];
            if (l->log_power > 0) {
                free(order);
                return refuse(j, "there are logarithms of the large parameter in the terms");
            }
            fmpq_t steps;
            fmpq_init(steps);
            fmpq_mul_si(steps, l->step, order[n].n);
            end = expr_add(e, l->first_exponent, expr_fmpq(e, steps));
            fmpq_clear(steps);
            *list = base_resize(*list, (*count + 1) * sizeof **list);
            (*list)[(*count)++] =
                (flat_term){end, expr_mul(e, ratio, expr_mul(e, l->constant, coefficient_expr(e, &l->c, order[n].n)))};
        }
        free(order);
        *last = base_resize(*last, (*last_count + 1) * sizeof **last);
        (*last)[(*last_count)++] = c->terminates && found == contribution_count_terms(c) ? NULL : end;
    }
    return *count > 0 ? TW_OK : refuse(j, "one of them has no terms");
}

static tw_status grid_of_expansion(job *j, grid *g, expansion *a)
{
    enum { DEN_MOST = 24, LENGTH_MOST = 2000 };
    tw_engine *e = j->e;
    flat_term *list = NULL;
    expr **last = NULL;
    size_t count = 0, last_count = 0;
    tw_status status = flatten(j, a, &list, &count, &last, &last_count);
    if (status == TW_OK) {
        expr *top = list[0].exponent;
        slong den = 1, known = LENGTH_MOST;
        for (size_t k = 0; k < count; k++) {
            expr *d = expr_sub(e, list[k].exponent, top);
            if (!d || !expr_is_number(d) || fmpz_cmp_si(fmpq_denref(expr_number(d)), DEN_MOST) > 0)
                status = status == TW_OK ? refuse(j, "their exponents have no common step") : status;
            else {
                slong q = fmpz_get_si(fmpq_denref(expr_number(d)));
                den = den / (slong)n_gcd((ulong)den, (ulong)q) * q;
                if (j->small ? fmpq_sgn(expr_number(d)) < 0 : fmpq_sgn(expr_number(d)) > 0) top = list[k].exponent;
            }
        }
        bool ends = true;
        for (size_t k = 0; k < last_count && status == TW_OK; k++)
            if (last[k]) {
                known = FLINT_MIN(known, grid_index(j, top, last[k], den) + 1);
                ends = false;
            }
        if (status == TW_OK && ends) known = (j->terms + 1) * den + 1;
        if (status == TW_OK) {
            g->den = den;
            g->count = known;
            g->a = base_alloc((size_t)known * sizeof *g->a);
            for (slong n = 0; n < known; n++) g->a[n] = expr_int(e, 0);
            for (size_t k = 0; k < count; k++) {
                slong n = grid_index(j, top, list[k].exponent, den);
                if (n >= 0 && n < known) g->a[n] = expr_add(e, g->a[n], list[k].value);
            }
            for (size_t k = 0; k < a->contribution_count && !g->prefactor; k++)
                if (a->contributions[k].dominant) g->prefactor = a->contributions[k].prefactor;
            g->lead = tidy(e, g->a[0]);
            g->exponent = top;
            if (!g->lead || expr_is_zero(g->lead))
                status = e->error.kind == ERROR_NONE ? refuse(j, "the leading terms cancel") : TW_ERROR;
            for (slong n = 0; n < known && status == TW_OK; n++) {
                g->a[n] = expr_is_zero(g->a[n]) ? g->a[n] : tidy(e, expr_div(e, g->a[n], g->lead));
                if (!g->a[n]) status = TW_ERROR;
            }
        }
    }
    free(last);
    free(list);
    return status;
}

/* ---- series arithmetic ---- */

static tw_status refine(job *j, grid *g, slong den)
{
    slong by = den / g->den, count = (g->count - 1) * by + 1;
    if (by == 1) return TW_OK;
    expr **a = base_alloc((size_t)count * sizeof *a);
    for (slong n = 0; n < count; n++) a[n] = n % by ? expr_int(j->e, 0) : g->a[n / by];
    free(g->a);
    g->a = a;
    g->count = count;
    g->den = den;
    return TW_OK;
}

static slong common_den(const grid *g, const grid *h)
{
    return g->den / (slong)n_gcd((ulong)g->den, (ulong)h->den) * h->den;
}

static tw_status grid_mul(job *j, grid *g, grid *h)
{
    tw_engine *e = j->e;
    slong den = common_den(g, h);
    refine(j, g, den);
    refine(j, h, den);
    slong n = FLINT_MIN(g->count, h->count);
    expr **a = base_alloc((size_t)n * sizeof *a);
    for (slong k = 0; k < n; k++) {
        expr *sum = expr_int(e, 0);
        for (slong i = 0; i <= k; i++)
            if (!expr_is_zero(g->a[i]) && !expr_is_zero(h->a[k - i]))
                sum = expr_add(e, sum, expr_mul(e, g->a[i], h->a[k - i]));
        a[k] = sum ? tidy(e, sum) : NULL;
        if (!a[k] || !budget_ok(e)) {
            free(a);
            return TW_ERROR;
        }
    }
    free(g->a);
    g->a = a;
    g->count = n;
    g->prefactor = normal_under_facts(e, expr_mul(e, g->prefactor, h->prefactor), &j->large, 1);
    g->lead = expr_mul(e, g->lead, h->lead);
    g->exponent = expr_add(e, g->exponent, h->exponent);
    return g->prefactor && g->lead && g->exponent ? TW_OK : TW_ERROR;
}

/* b_0 = 1, b_k = (1/k) sum over i = 1 .. k of (r i - (k - i)) a_i b_(k-i): the series of a^r (Euler). */
static tw_status grid_pow(job *j, grid *g, const fmpq_t r)
{
    tw_engine *e = j->e;
    expr **b = base_alloc((size_t)g->count * sizeof *b), *power = expr_fmpq(e, r);
    b[0] = expr_int(e, 1);
    for (slong k = 1; k < g->count; k++) {
        expr *sum = expr_int(e, 0);
        for (slong i = 1; i <= k; i++) {
            if (expr_is_zero(g->a[i]) || expr_is_zero(b[k - i])) continue;
            expr *weight = expr_sub(e, expr_mul(e, power, expr_int(e, i)), expr_int(e, k - i));
            sum = expr_add(e, sum, expr_mul(e, weight, expr_mul(e, g->a[i], b[k - i])));
        }
        b[k] = sum ? tidy(e, expr_mul(e, expr_frac(e, 1, k), sum)) : NULL;
        if (!b[k] || !budget_ok(e)) {
            free(b);
            return TW_ERROR;
        }
    }
    free(g->a);
    g->a = b;
    g->prefactor = normal_under_facts(e, expr_pow(e, g->prefactor, power), &j->large, 1);
    g->lead = expr_pow(e, g->lead, power);
    g->exponent = expr_mul(e, g->exponent, power);
    return g->prefactor && g->lead && g->exponent ? TW_OK : TW_ERROR;
}

/* l_k = a_k - (1/k) sum over i < k of i l_i a_(k-i). */
static expr **grid_log(job *j, const grid *g)
{
    tw_engine *e = j->e;
    expr **l = base_alloc((size_t)g->count * sizeof *l);
    l[0] = expr_int(e, 0);
    for (slong k = 1; k < g->count; k++) {
        expr *sum = g->a[k];
        for (slong i = 1; i < k; i++)
            if (!expr_is_zero(l[i]) && !expr_is_zero(g->a[k - i]))
                sum = expr_sub(e, sum, expr_mul(e, expr_frac(e, i, k), expr_mul(e, l[i], g->a[k - i])));
        l[k] = sum ? tidy(e, sum) : NULL;
        if (!l[k] || !budget_ok(e)) {
            free(l);
            return NULL;
        }
    }
    return l;
}

/* The exponent's terms with the large parameter: is exp(these) growing (1), decaying (-1), of no exponential size (0);
 * 2: not known. */
static int exponential_size(job *j, expr *ratio)
{
    tw_engine *e = j->e;
    expr *const *factors;
    size_t count = expr_factors(&ratio, &factors);
    expr *exponent = expr_int(e, 0);
    for (size_t k = 0; k < count; k++) {
        expr *base, *power;
        expr_as_power(e, factors[k], &base, &power);
        if (expr_is_call(factors[k], FUNCTION_EXP))
            exponent = expr_add(e, exponent, factors[k]->args[0]);
        else if (expr_has(power, j->large))
            exponent = expr_add(e, exponent, expr_mul(e, power, expr_call1(e, FUNCTION_LOG, base)));
        else if (expr_has(base, j->large) && base != j->large)
            return 2;
    }
    exponent = exponent ? expr_expand(e, exponent) : NULL;
    if (!exponent || !expr_has(exponent, j->large)) return exponent ? 0 : 2;
    fmpq_t power;
    fmpq_init(power);
    expr *rest = draw_power(e, exponent, j->large, power);
    int sign = rest && !expr_has(rest, j->large) && fmpq_sgn(power) == (j->small ? -1 : 1) ? decide_sign(e, rest) : 2;
    fmpq_clear(power);
    return sign;
}

/* g += h; of two exponential sizes the smaller is left out of the terms. */
static tw_status grid_add(job *j, grid *g, grid *h)
{
    tw_engine *e = j->e;
    expr *ratio = normal_under_facts(e, expr_div(e, h->prefactor, g->prefactor), &j->large, 1);
    if (!ratio) return TW_ERROR;
    int size = expr_has(ratio, j->large) ? exponential_size(j, ratio) : 0;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (size == 2 || (size == 0 && expr_has(ratio, j->large))) return refuse(j, "their prefactors cannot be compared");
    if (size != 0) {
        step *s = derivation_add(&j->out->derivation, "leave out what is exponentially smaller", NULL);
        s->form = base_copy("one term of the sum is exponentially small beside the other; numbers include it");
        if (size > 0) {
            grid swap = *g;
            *g = *h;
            *h = swap;
        }
        return TW_OK;
    }
    slong den = common_den(g, h);
    expr *gap = expr_sub(e, h->exponent, g->exponent);
    if (!gap || !expr_is_number(gap) || fmpz_cmp_si(fmpq_denref(expr_number(gap)), 24) > 0)
        return refuse(j, "their exponents have no common step");
    slong q = fmpz_get_si(fmpq_denref(expr_number(gap)));
    den = den / (slong)n_gcd((ulong)den, (ulong)q) * q;
    refine(j, g, den);
    refine(j, h, den);
    slong shift = grid_index(j, g->exponent, h->exponent, den);
    expr *weight = expr_mul(e, ratio, h->lead);
    if ((j->small ? fmpq_sgn(expr_number(gap)) < 0 : fmpq_sgn(expr_number(gap)) > 0)) { /* h leads: put it first */
        grid swap = *g;
        *g = *h;
        *h = swap;
        g->prefactor = h->prefactor;
        g->lead = weight;
        weight = h->lead;
        shift = grid_index(j, g->exponent, h->exponent, den);
    }
    slong n = FLINT_MIN(g->count, h->count + shift), first = 0;
    expr **a = base_alloc((size_t)n * sizeof *a);
    for (slong k = 0; k < n; k++) {
        a[k] = expr_mul(e, g->lead, g->a[k]);
        if (k >= shift) a[k] = expr_add(e, a[k], expr_mul(e, weight, h->a[k - shift]));
        a[k] = a[k] ? tidy(e, a[k]) : NULL;
        if (!a[k]) {
            free(a);
            return TW_ERROR;
        }
    }
    while (first < n && expr_is_zero(a[first])) first++;
    if (first == n) {
        free(a);
        return refuse(j, "all known terms of the sum cancel");
    }
    memmove(a, a + first, (size_t)(n - first) * sizeof *a);
    n -= first;
    expr *lead = a[0];
    for (slong k = 0; k < n; k++) a[k] = expr_is_zero(a[k]) ? a[k] : tidy(e, expr_div(e, a[k], lead));
    free(g->a);
    g->a = a;
    g->count = n;
    g->lead = lead;
    g->exponent = expr_add(e, g->exponent, expr_frac(e, j->small ? first : -first, den));
    return g->exponent ? TW_OK : TW_ERROR;
}

/* ---- the tree ---- */

static bool has_integral(expr *a)
{
    if (a->kind == EXPR_INTEGRAL || a->kind == EXPR_CONTOUR) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (has_integral(a->args[k])) return true;
    return false;
}

/* A factor without an integral: number * large^power * rest. */
static tw_status grid_of_factor(job *j, grid *g, expr *f)
{
    tw_engine *e = j->e;
    fmpq_t number, power;
    fmpq_init(number);
    fmpq_init(power);
    expr *rest;
    factor_split(e, f, j->large, number, power, &rest);
    g->exponent = expr_fmpq(e, power);
    bool moving = rest && expr_has(rest, j->large);
    g->prefactor = moving ? rest : expr_int(e, 1);
    g->lead = expr_mul(e, expr_fmpq(e, number), moving ? expr_int(e, 1) : rest);
    fmpq_clear(number);
    fmpq_clear(power);
    g->den = 1;
    g->count = 4 * j->terms + 8;
    g->a = base_alloc((size_t)g->count * sizeof *g->a);
    for (slong k = 0; k < g->count; k++) g->a[k] = expr_int(e, k == 0);
    if (moving && rest->kind == EXPR_SUM) return refuse(j, "a factor is a sum in the large parameter");
    return g->lead && g->exponent && rest ? TW_OK : TW_ERROR;
}

static tw_status grid_of_integral(job *j, grid *g, expr *f)
{
    tw_engine *e = j->e;
    struct combination *c = j->c;
    size_t k = 0;
    while (k < c->count && c->leaves[k].integral != f) k++;
    if (k == c->count) {
        c->leaves = base_resize(c->leaves, (c->count + 1) * sizeof *c->leaves);
        c->symbols = base_resize(c->symbols, (c->count + 1) * sizeof *c->symbols);
        expansion_init(&c->leaves[c->count]);
        c->symbols[c->count] = expr_fresh(e, "I");
        c->count++;
        if (expand(e, &c->leaves[k], f, j->terms, NULL) != TW_OK) return TW_ERROR;
        c->leaves[k].integral = f;
        conditions_append(&j->out->conditions, &c->leaves[k].conditions);
    }
    return grid_of_expansion(j, g, &c->leaves[k]);
}

static tw_status grid_of(job *j, grid *g, expr *f)
{
    tw_engine *e = j->e;
    if (!f || !budget_ok(e)) return TW_ERROR;
    if (!has_integral(f)) return grid_of_factor(j, g, f);
    if (f->kind == EXPR_INTEGRAL || f->kind == EXPR_CONTOUR) return grid_of_integral(j, g, f);
    if (f->kind == EXPR_POWER && expr_is_number(f->args[1])) {
        tw_status status = grid_of(j, g, f->args[0]);
        return status == TW_OK ? grid_pow(j, g, expr_number(f->args[1])) : status;
    }
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT)
        return refuse(j, "only sums, products, rational powers and logarithms of expansions are expansions again");
    tw_status status = grid_of(j, g, f->args[0]);
    for (uint32_t k = 1; k < f->count && status == TW_OK; k++) {
        grid h = {0};
        status = grid_of(j, &h, f->args[k]);
        if (status == TW_OK) status = f->kind == EXPR_SUM ? grid_add(j, g, &h) : grid_mul(j, g, &h);
        grid_clear(&h);
    }
    return status;
}

/* ---- results ---- */

static tw_status add_lane(job *j, contribution *c, expr *constant, slong log_power, expr *exponent, slong den,
                          expr *const *x, slong count)
{
    fmpq_t forward;
    fmpq_init(forward);
    fmpq_set_si(forward, j->small ? 1 : -1, (ulong)den);
    tw_status status = contribution_set_lane(j->e, c, constant, exponent, forward, x, count);
    if (status == TW_OK) c->lanes[c->lane_count - 1].log_power = log_power;
    fmpq_clear(forward);
    return status;
}

static contribution *new_contribution(job *j, expr *prefactor)
{
    contribution *c = expansion_add(j->out);
    const contribution *like = &j->c->leaves[0].contributions[0];
    c->variable = like->variable;
    c->place = like->place;
    c->kind = like->kind;
    c->method = "combined";
    c->dominant = true;
    c->prefactor = prefactor;
    return c;
}

/* Every stride-th coefficient is enough where the others vanish. */
static slong grid_stride(expr *const *a, slong count)
{
    slong stride = 0;
    for (slong k = 0; k < count; k++)
        if (k > 0 && !expr_is_zero(a[k])) stride = (slong)n_gcd((ulong)stride, (ulong)k);
    return stride ? stride : 1;
}

static tw_status finish_grid(job *j, const grid *g)
{
    contribution *c = new_contribution(j, g->prefactor);
    slong stride = n_gcd((ulong)grid_stride(g->a, g->count), (ulong)g->den), count = (g->count - 1) / stride + 1,
          kept = 0, found = 0;
    expr **x = base_alloc((size_t)count * sizeof *x);
    for (slong k = 0; k < count && found < j->terms; k++) {
        x[k] = g->a[k * stride];
        found += !expr_is_zero(x[k]);
        kept = k + 1;
    }
    while (kept > 1 && expr_is_zero(x[kept - 1])) kept--;
    fmpq_t number;
    fmpq_init(number);
    expr *rest;
    expr_as_coefficient(j->e, g->lead, number, &rest);
    for (slong k = 0; k < kept; k++) x[k] = expr_mul(j->e, expr_fmpq(j->e, number), x[k]);
    fmpq_clear(number);
    tw_status status = rest ? add_lane(j, c, rest, 0, g->exponent, g->den / stride, x, kept) : TW_ERROR;
    free(x);
    return status;
}

/* One term c * large^k * log(large)^m of log(prefactor * lead * large^exponent), into lanes. */
static tw_status add_log_term(job *j, contribution *c, expr *scale, expr *t, const fmpq_t low)
{
    tw_engine *e = j->e;
    expr *const *factors;
    expr *whole = expr_mul(e, scale, t), *constant = expr_int(e, 1), *one = expr_int(e, 1);
    size_t count = whole ? expr_factors(&whole, &factors) : 0;
    fmpq_t power, number;
    fmpq_init(power);
    fmpq_init(number);
    slong logs = 0;
    bool fine = whole != NULL;
    for (size_t k = 0; k < count && fine; k++) {
        expr *base, *exponent;
        expr_as_power(e, factors[k], &base, &exponent);
        if (base == j->large && expr_is_number(exponent))
            fmpq_add(power, power, expr_number(exponent));
        else if (expr_is_call(base, FUNCTION_LOG) && base->args[0] == j->large && expr_is_int(exponent, 1))
            logs++;
        else if (expr_has(factors[k], j->large))
            fine = false;
        else
            constant = expr_mul(e, constant, factors[k]);
    }
    tw_status status = fine    ? TW_OK
                       : whole ? refuse(j, "the logarithm of the prefactor is no sum of powers")
                               : TW_ERROR;
    if (status == TW_OK) {
        expr *rest;
        expr_as_coefficient(e, constant, number, &rest);
        one = expr_fmpq(e, number);
        for (size_t k = 0; k < c->lane_count && status == TW_OK; k++) { /* terms of one power and constant add */
            lane *l = &c->lanes[k];
            if (l->constant != rest || l->log_power != logs || l->first_exponent != expr_fmpq(e, power)) continue;
            fmpq_add(&l->c.q[0], &l->c.q[0], number);
            goto done;
        }
        /* zeros down to the last known power: nothing else is hidden in the lane */
        fmpq_t reach;
        fmpz_t n;
        fmpq_init(reach);
        fmpz_init(n);
        fmpq_sub(reach, power, low);
        if (j->small) fmpq_neg(reach, reach);
        fmpz_cdiv_q(n, fmpq_numref(reach), fmpq_denref(reach));
        slong length = fmpz_sgn(n) > 0 && fmpz_cmp_si(n, 4096) < 0 ? fmpz_get_si(n) + 1 : 1;
        expr **x = base_alloc((size_t)length * sizeof *x);
        for (slong k = 0; k < length; k++) x[k] = k == 0 ? one : expr_int(e, 0);
        status = add_lane(j, c, rest, logs, expr_fmpq(e, power), 1, x, length);
        free(x);
        fmpz_clear(n);
        fmpq_clear(reach);
    }
done:
    fmpq_clear(number);
    fmpq_clear(power);
    return status;
}

/* log of a positive product, term by term. */
static expr *spread_log(tw_engine *e, expr *f)
{
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *sum = expr_int(e, 0);
    for (size_t k = 0; k < count; k++) {
        expr *base, *exponent;
        expr_as_power(e, factors[k], &base, &exponent);
        expr *one = expr_is_call(base, FUNCTION_EXP) ? base->args[0] : expr_call1(e, FUNCTION_LOG, base);
        sum = expr_add(e, sum, expr_mul(e, exponent, one));
    }
    return sum ? expr_expand(e, sum) : NULL;
}

/* scale * log(g) + extra, as lanes of one contribution. */
static tw_status finish_log(job *j, const grid *g, expr *scale, expr *extra)
{
    tw_engine *e = j->e;
    int sign = decide_sign(e, g->lead);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (sign != 1) return refuse(j, "the logarithm is of something that is not known to be positive");
    contribution *c = new_contribution(j, expr_int(e, 1));
    expr *front = expr_add(e, spread_log(e, g->prefactor), spread_log(e, g->lead));
    front = expr_add(e, front, expr_mul(e, g->exponent, expr_call1(e, FUNCTION_LOG, j->large)));
    if (!front) return TW_ERROR;
    expr **l = grid_log(j, g);
    if (!l) return TW_ERROR;
    expr *const *terms;
    size_t front_count = expr_is_zero(front) ? 0 : expr_terms(&front, &terms), extra_count;
    expr *const *more;
    extra_count = expr_is_zero(extra) ? 0 : expr_terms(&extra, &more);
    slong found = (slong)(front_count + extra_count);
    slong stride = (slong)n_gcd((ulong)grid_stride(l, g->count), (ulong)g->den), n = 0, kept = 0;
    expr **x = base_alloc((size_t)g->count * sizeof *x);
    for (slong k = stride; k < g->count && found < j->terms; k += stride) {
        x[n++] = l[k];
        found += !expr_is_zero(l[k]);
        if (!expr_is_zero(l[k])) kept = n;
    }
    fmpq_t power, number, low;
    fmpq_init(power);
    fmpq_init(number);
    fmpq_init(low);
    expr *rest;
    factor_split(e, scale, j->large, number, power, &rest);
    fmpq_set_si(low, (j->small ? 1 : -1) * stride * FLINT_MAX(kept, 1), (ulong)g->den);
    fmpq_canonicalise(low);
    fmpq_add(low, low, power);
    tw_status status = TW_OK;
    for (size_t k = 0; k < front_count && status == TW_OK; k++) status = add_log_term(j, c, scale, terms[k], low);
    for (size_t k = 0; k < extra_count && status == TW_OK; k++)
        status = add_log_term(j, c, expr_int(e, 1), more[k], low);
    expr *exponent = expr_add(e, expr_fmpq(e, power), expr_frac(e, j->small ? stride : -stride, g->den));
    for (slong k = 0; k < kept; k++) x[k] = expr_mul(e, expr_fmpq(e, number), x[k]);
    if (kept > 0 && status == TW_OK) status = add_lane(j, c, rest, 0, exponent, g->den / stride, x, kept);
    fmpq_clear(low);
    fmpq_clear(number);
    fmpq_clear(power);
    free(x);
    free(l);
    return status;
}

/* f = sum of weight_k * log(f_k) + extra: true, *inside = product of f_k^weight_k, weights rational up to a common
 * *scale. */
static bool read_logs(job *j, expr *f, expr **inside, expr **scale, expr **extra)
{
    tw_engine *e = j->e;
    expr *const *terms;
    size_t count = expr_terms(&f, &terms);
    *inside = *scale = NULL;
    *extra = expr_int(e, 0);
    for (size_t k = 0; k < count; k++) {
        if (!has_integral(terms[k])) {
            *extra = expr_add(e, *extra, terms[k]);
            continue;
        }
        expr *const *factors;
        size_t n = expr_factors(&terms[k], &factors);
        expr *log_of = NULL, *weight = expr_int(e, 1);
        for (size_t i = 0; i < n; i++) {
            if (!has_integral(factors[i]))
                weight = expr_mul(e, weight, factors[i]);
            else if (!log_of && expr_is_call(factors[i], FUNCTION_LOG))
                log_of = factors[i]->args[0];
            else
                return false;
        }
        if (!log_of) return false;
        if (!*scale) *scale = weight;
        expr *ratio = expr_div(e, weight, *scale);
        if (!ratio || !expr_is_number(ratio)) return false;
        expr *part = expr_pow(e, log_of, ratio);
        *inside = *inside ? expr_mul(e, *inside, part) : part;
    }
    return *inside && *scale;
}

static expr *with_symbols(tw_engine *e, const struct combination *c, expr *f)
{
    for (size_t k = 0; k < c->count; k++)
        if (c->leaves[k].integral == f) return c->symbols[k];
    if (!f || !has_integral(f)) return f;
    expr **args = base_alloc((f->count + 1) * sizeof *args);
    bool good = true;
    for (uint32_t k = 0; k < f->count; k++) {
        args[k] = with_symbols(e, c, f->args[k]);
        good = good && args[k];
    }
    expr *made = good ? expr_rebuild(e, f, args) : NULL;
    free(args);
    return made;
}

static tw_status combined_extend(tw_engine *e, expansion *a, slong terms)
{
    for (size_t k = 0; k < a->contribution_count; k++)
        if (contribution_count_terms(&a->contributions[k]) >= terms || terms <= a->contributions[k].searched)
            return TW_OK;
    expansion more;
    expansion_init(&more);
    tw_status status = combine(e, &more, a->integral, terms);
    if (status == TW_OK && more.contribution_count == a->contribution_count) {
        for (size_t k = 0; k < a->contribution_count; k++) {
            contribution swap = a->contributions[k];
            a->contributions[k] = more.contributions[k];
            a->contributions[k].searched = terms;
            more.contributions[k] = swap;
        }
    }
    expansion_clear(&more);
    return status;
}

static answer combined_suits(tw_engine *e, const reading *r, char **why)
{
    (void)e, (void)r, (void)why;
    return ANSWER_NO;
}

static const method method_combined = {"combined", "arithmetic of expansions", combined_suits, NULL, combined_extend};

static void record(job *j, expr *f)
{
    step *s = derivation_add(&j->out->derivation, "combine expansions", NULL);
    s->before = f;
    text words;
    text_init(&words);
    text_addf(&words, "%lu expansion%s; the series are combined exactly, numbers come from the parts' balls",
              (unsigned long)j->c->count, j->c->count == 1 ? "" : "s");
    s->detail = text_take(&words);
    s->after = f;
    for (size_t k = 0; k < j->c->count; k++) {
        step *part = derivation_add(&j->out->derivation, "its part", NULL);
        part->after = j->c->leaves[k].integral;
        part->detail = base_copy(j->c->leaves[k].why ? j->c->leaves[k].why : "");
    }
}

tw_status combine(tw_engine *e, expansion *out, expr *f, slong terms)
{
    job j = {.e = e, .out = out, .terms = terms};
    large_kind kind = facts_large(e, &j.large);
    if (kind == LARGE_NONE)
        return engine_fail(e, ERROR_UNSUITABLE,
                           "no parameter is declared large or small: say for example `large s` first");
    j.small = kind == LARGE_SMALL;
    j.c = base_alloc(sizeof *j.c);
    memset(j.c, 0, sizeof *j.c);
    out->combined = j.c;
    out->large = j.large;
    out->small = j.small;
    out->integral = f;
    out->terms_asked = terms;
    out->made_by = &method_combined;
    grid g = {0};
    expr *inside, *scale, *extra;
    bool logs = read_logs(&j, f, &inside, &scale, &extra);
    tw_status status = grid_of(&j, &g, logs ? inside : f);
    if (status == TW_OK) status = logs ? finish_log(&j, &g, scale, extra) : finish_grid(&j, &g);
    grid_clear(&g);
    if (status == TW_OK) {
        j.c->form = with_symbols(e, j.c, f);
        record(&j, f);
        out->why = base_copy("arithmetic of expansions");
        if (!j.c->form) status = TW_ERROR;
    }
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
