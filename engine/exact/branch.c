/* A local change of variable: t = p(x), G(t) = q(x(t)) dx/dt. With p = p0 x^mu (1 + ...) and u = (p/p0)^(1/m),
 * m/mu the step of the exponents, x(u) is a power series; it is found by Newton's iteration on p itself, evaluated
 * on the series by the same walk as any expression, so that no composition with a list of coefficients is needed
 * and the doubling of the length pays for all but the last step. q is then evaluated on x(u) in the same way (DLMF
 * 2.3.16, 2.3.18 give the same numbers one by one). Last, u = (t/p0)^(1/m) puts powers of p0 in front. */
#include "engine/exact/series.h"

#include <stdlib.h>

#include "engine/exact/compose.h"
#include "engine/exact/finish.h"
#include "engine/exact/values.h"

typedef struct change {
    expr *p, *q, *x;
} change;

/* p = p0 u^m, x = u^spread (1 + ...). */
typedef struct local_variable {
    expr *p0;
    slong m, spread;
    slong loss;  /* terms that cancel inside p */
    slong split; /* p0^(split/m) is a coefficient: the classes of powers of u modulo `split` have constants of their
                    own */
    bool real;
} local_variable;

/* The least h that divides n with p0^(h/n) a rational number. */
static slong class_count(tw_engine *e, expr *p0, slong n)
{
    for (slong h = 1; h < n; h++)
        if (n % h == 0) {
            expr *root = expr_pow(e, p0, expr_frac(e, h, n));
            if (root != NULL && expr_is_number(root))
                return h;
        }
    return n;
}

static tw_status read_phase(work *w, local_variable *v, expr *p)
{
    pieces g;
    piece lead;
    pieces_init(&g);
    piece_init(w, &lead);
    tw_status s = evaluate_pieces(w, &g, p);
    work_blame(w, p);
    if (s == TW_OK)
        s = pieces_gather(w, &lead, &g, "cannot be a new variable (powers and logarithms mix in it)");
    if (s == TW_OK && (!expr_is_zero(lead.sigma) || fmpq_sgn(lead.lead) <= 0))
        s = work_refuse(w, "does not tend to zero like a rational power");
    v->p0 = s == TW_OK ? piece_leading(w, &lead) : NULL;
    if (v->p0 == NULL)
        s = TW_ERROR;
    if (s == TW_OK && (!value_is_real(w->e, v->p0) || value_sign(w->e, v->p0) != 1))
        s = expr_is_closed_value(v->p0) ? work_refuse(w, "is not positive for small values of the variable")
                                        : work_need(w, expr_relation_of(w->e, RELATION_LESS, expr_int(w->e, 0), v->p0));
    if (s == TW_OK && (fmpz_cmp_si(fmpq_denref(lead.lead), 1000) > 0 || fmpz_cmp_si(fmpq_numref(lead.lead), 1000) > 0))
        s = work_refuse(w, "has too large an exponent");
    if (s == TW_OK) {
        slong zero_to_lead = 0;
        fmpq_t zero;
        fmpq_init(zero);
        v->spread = lcm_of(lead.den, fmpz_get_si(fmpq_denref(lead.lead)));
        steps_between(&zero_to_lead, zero, lead.lead, v->spread);
        fmpq_clear(zero);
        v->m = zero_to_lead;
        v->loss = lead.c.known == TAIL_EXACT ? 0 : FLINT_MAX(0, w->terms - lead.c.known);
        v->split = class_count(w->e, v->p0, v->m);
        v->real = g.real;
    }
    pieces_clear(w, &g);
    piece_clear(w, &lead);
    return s;
}

/* One Newton step x - (p(x)/p0 - u^m)/(p'(x)/p0) with `terms` wanted; *exact when x solves the equation as it is. */
static tw_status newton_step(work *w, pieces *x, const change *c, expr *slope, const local_variable *v, slong terms,
                             bool *exact)
{
    tw_engine *e = w->e;
    pieces r, d, monomial;
    pieces_init(&r), pieces_init(&d), pieces_init(&monomial);
    expr *over = expr_pow(e, v->p0, expr_int(e, -1));
    w->terms = terms + v->loss;
    tw_status s = evaluate_bound(w, &r, c->p, c->x, x);
    if (s == TW_OK)
        s = pieces_scale(w, &r, over);
    if (s == TW_OK)
        s = pieces_from_monomial(w, &monomial, expr_int(e, 1), expr_int(e, v->m));
    if (s == TW_OK)
        s = pieces_add(w, &r, &r, &monomial, -1);
    *exact = s == TW_OK && r.count == 0;
    if (s == TW_OK && !*exact) {
        s = evaluate_bound(w, &d, slope, c->x, x);
        if (s == TW_OK)
            s = pieces_scale(w, &d, over);
        if (s == TW_OK)
            s = pieces_div(w, &r, &r, &d, 1);
        if (s == TW_OK)
            s = pieces_add(w, x, x, &r, -1);
    }
    pieces_clear(w, &r), pieces_clear(w, &d), pieces_clear(w, &monomial);
    return s;
}

/* Cuts x to a polynomial of at most `terms` coefficients; *k of them. */
static tw_status newton_cut(work *w, pieces *x, slong terms, slong *k, bool real)
{
    piece p;
    piece_init(w, &p);
    tw_status s = pieces_gather(w, &p, x, "cannot be inverted");
    if (s == TW_OK)
        s = piece_fold(w, &p, true);
    if (s == TW_OK && p.den != 1)
        s = work_refuse(w, "cannot be inverted");
    if (s == TW_OK) {
        slong known = FLINT_MIN(terms, p.c.known);
        tail_truncate(&w->f, &p.c, known);
        p.c.known = TAIL_EXACT;
        *k = known;
        pieces_clear(w, x);
        x->real = real;
        s = pieces_push(w, x, &p);
    } else
        piece_clear(w, &p);
    return s;
}

/* x(u) with `terms` coefficients. */
static tw_status invert_phase(work *w, pieces *x, const change *c, const local_variable *v, slong terms)
{
    tw_engine *e = w->e;
    expr *slope = expr_derivative(e, c->p, c->x);
    bool exact = false;
    slong k = 1;
    tw_status s = slope == NULL ? TW_ERROR : pieces_from_monomial(w, x, expr_int(e, 1), expr_int(e, v->spread));
    x->real = v->real;
    while (s == TW_OK && !exact) {
        slong next = FLINT_MIN(2 * k, terms), before = k;
        s = newton_step(w, x, c, slope, v, next, &exact);
        if (s != TW_OK || exact)
            break;
        s = newton_cut(w, x, next, &k, v->real);
        if (s == TW_OK && k >= terms)
            break;
        if (s == TW_OK && k <= before) {
            w->thin = true;
            s = TW_ERROR;
        }
    }
    if (s == TW_OK && !exact)
        x->at[0].c.known = FLINT_MIN(k, terms);
    w->terms = terms;
    return s;
}

/* The residue class r of p's powers of u modulo h, in t: c[r + j h] p0^(-h j / N) x^... with N = m * den. */
static tw_status push_class(work *w, pieces *out, const piece *p, const local_variable *v, slong r, slong h,
                            expr *log_factor, slong log_power, bool real)
{
    tw_engine *e = w->e;
    slong n = v->m * p->den, length = tail_length(&p->c);
    tail c;
    element value, step, power;
    tail_init(&c);
    element_init(&w->f, &value), element_init(&w->f, &step), element_init(&w->f, &power);
    fmpz_mpoly_q_one(&power, w->f.ctx);
    tw_status s = field_from_expr(&w->f, &step, expr_pow(e, v->p0, expr_frac(e, -h, n)));
    slong count = length > r ? (length - r - 1) / h + 1 : 0;
    element *made = elements_new(&w->f, count);
    for (slong j = 0; j < count && s == TW_OK; j++) {
        tail_coefficient(&w->f, &value, &p->c, r + j * h);
        field_mul(&w->f, made + j, &value, &power);
        field_mul(&w->f, &power, &power, &step);
        s = budget_ok(e) ? TW_OK : TW_ERROR;
    }
    tail_promote(&w->f, &c);
    elements_free(&w->f, c.m, c.count);
    c.m = made;
    c.count = count;
    c.gap = 1;
    c.known = p->c.known == TAIL_EXACT ? TAIL_EXACT : p->c.known > r ? (p->c.known - r - 1) / h + 1 : 0;
    tail_demote(&w->f, &c);
    if (s == TW_OK) {
        expr *exponent = expr_add(e, expr_div(e, piece_exponent(w, p), expr_int(e, v->m)), expr_frac(e, r, n));
        expr *front = expr_mul(e, expr_mul(e, p->constant, p->factor), expr_pow(e, v->p0, expr_neg(e, exponent)));
        pieces part;
        pieces_init(&part);
        s = pieces_from_tail(w, &part, front == NULL ? NULL : expr_mul(e, front, log_factor), exponent, &c, n / h,
                             real);
        for (size_t k = 0; k < part.count && s == TW_OK; k++) {
            piece q;
            piece_init(w, &q);
            piece_set(w, &q, part.at + k);
            q.log_power = log_power;
            s = pieces_push(w, out, &q);
        }
        pieces_clear(w, &part);
    }
    tail_clear(&w->f, &c);
    element_clear(&w->f, &value), element_clear(&w->f, &step), element_clear(&w->f, &power);
    return s;
}

/* u = (t/p0)^(1/m), log(u)^k = m^-k (log t - log p0)^k. */
static tw_status piece_in_t(work *w, pieces *out, const piece *p, const local_variable *v, bool real)
{
    tw_engine *e = w->e;
    slong h = class_count(e, v->p0, v->m * p->den);
    tw_status s = TW_OK;
    for (slong r = 0; r < h && s == TW_OK; r++)
        for (slong j = 0; j <= p->log_power && s == TW_OK; j++) { /* log(t)^j */
            if (tail_class_is_zero(&p->c, r, h))
                continue;
            fmpz_t binomial;
            fmpz_init(binomial);
            fmpz_bin_uiui(binomial, (ulong)p->log_power, (ulong)j);
            expr *l = simplify_value(w, expr_call1(e, FUNCTION_LOG, v->p0));
            expr *factor = expr_mul(e, expr_fmpz(e, binomial),
                                    expr_mul(e, expr_pow(e, expr_neg(e, l), expr_int(e, p->log_power - j)),
                                             expr_pow(e, expr_int(e, v->m), expr_int(e, -p->log_power))));
            fmpz_clear(binomial);
            if (factor == NULL)
                s = TW_ERROR;
            else if (!expr_is_zero(factor))
                s = push_class(w, out, p, v, r, h, expr_expand(e, factor), j, real);
        }
    return s;
}

static tw_status transform(work *w, pieces *out, const change *c, const local_variable *v, const pieces *x)
{
    tw_engine *e = w->e;
    pieces g, slope, jacobian;
    pieces_init(&g), pieces_init(&slope), pieces_init(&jacobian);
    w->depth--; /* q is the user's own */
    tw_status s = evaluate_bound(w, &g, c->q, c->x, x);
    w->depth++;
    if (s == TW_OK)
        s = pieces_derivative(w, &slope, x);
    if (s == TW_OK)
        s = pieces_mul(w, &g, &g, &slope);
    if (s == TW_OK) /* dt/du = p0 m u^(m-1) */
        s = pieces_from_monomial(w, &jacobian, expr_div(e, expr_pow(e, v->p0, expr_int(e, -1)), expr_int(e, v->m)),
                                 expr_int(e, 1 - v->m));
    if (s == TW_OK)
        s = pieces_mul(w, &g, &g, &jacobian);
    if (s == TW_OK) {
        pieces_clear(w, out);
        out->real = g.real;
    }
    for (size_t k = 0; k < g.count && s == TW_OK; k++)
        s = piece_in_t(w, out, g.at + k, v, g.real);
    pieces_clear(w, &g), pieces_clear(w, &slope), pieces_clear(w, &jacobian);
    return s;
}

static tw_status make_branch(work *w, pieces *out, const void *host)
{
    const change *c = host;
    local_variable v;
    pieces x;
    pieces_init(&x);
    slong terms = w->terms;
    tw_status s = read_phase(w, &v, c->p);
    if (s == TW_OK)
        s = invert_phase(w, &x, c, &v, terms * v.split);
    if (s == TW_OK)
        s = transform(w, out, c, &v, &x);
    w->terms = terms;
    pieces_clear(w, &x);
    return s;
}

tw_status series_branch(tw_engine *e, series *out, expr *p, expr *q, expr *x, slong length, expr ***conditions,
                        size_t *condition_count)
{
    if (p == NULL || q == NULL || x == NULL)
        return TW_ERROR;
    if (length < 1)
        return engine_fail(e, ERROR_VALUE, "a series needs at least one term");
    change c = {p, q, x};
    return series_by_tries(e, out, make_branch, &c, q, x, length, conditions, condition_count);
}
