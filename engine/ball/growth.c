/* Growth records of expressions: the walk over the tree, and what is read off the record of the root. Knows nothing of
 * integrals. The one idea: the tree is laid out once as a list; each X then costs one pass over the list, so a caller
 * may look for a good X by trying. */
#include "engine/ball/growth.h"

#include <stdlib.h>

#include "engine/ball/growth_record.h"

typedef struct growth_node {
    expr *f;
    size_t *args; /* places of the arguments in the list */
    bool constant;
    tape *values; /* the function alone, for bounded arguments; made when first needed */
    growth_record record;
} growth_node;

struct growth_program {
    tw_engine *e;
    expr *x, *resists;
    growth_place place;
    growth_node *nodes;
    size_t count, room;
    slong shift;          /* x = 2^shift v, or 1/(2^shift v) when inverted; records are in v, of f(x) |dx/dv| */
    bool inverted;
    bool turned;          /* x = turn * 2^shift v instead, turn anywhere in a ball of directions */
    acb_t turn;
    growth_record result;
};

void growth_bound_init(growth_bound *g)
{
    arf_init(g->X);
    arb_init(g->log_C);
    fmpq_init(g->a);
    fmpq_init(g->c);
    arb_init(g->b);
    g->k = 0;
}

void growth_bound_clear(growth_bound *g)
{
    arf_clear(g->X);
    arb_clear(g->log_C);
    fmpq_clear(g->a);
    fmpq_clear(g->c);
    arb_clear(g->b);
}

/* ---- the list ---- */

static bool node_is_walked(expr *f)
{
    switch ((expr_kind)f->kind) {
    case EXPR_SUM:
    case EXPR_PRODUCT:
    case EXPR_POWER:
    case EXPR_CALL:
    case EXPR_PIECEWISE:
    case EXPR_RELATION:
        return true;
    default:
        return false;
    }
}

static bool constant_record(growth_record *r, tw_engine *e, expr *f)
{
    if (expr_is_number(f)) {
        fmpq_t q;
        fmpq_init(q);
        fmpq_set(q, expr_number(f));
        record_set_fmpq(r, q);
        fmpq_clear(q);
        return true;
    }
    acb_t v;
    acb_init(v);
    bool ok = ball_value(e, v, f, 96) == TW_OK && acb_is_finite(v);
    record_set_ball(r, v);
    acb_clear(v);
    return ok;
}

static size_t place_of(const growth_program *t, expr *f)
{
    for (size_t k = 0; k < t->count; k++)
        if (t->nodes[k].f == f)
            return k;
    return SIZE_MAX;
}

static bool lay_out(growth_program *t, expr *f, size_t *at)
{
    size_t known = place_of(t, f);
    if (known != SIZE_MAX) {
        *at = known;
        return true;
    }
    if (!budget_ok(t->e))
        return false;
    growth_node n = {.f = f, .constant = f != t->x && !expr_has(f, t->x)};
    if (!n.constant && f != t->x) {
        if (!node_is_walked(f)) {
            engine_fail(t->e, ERROR_UNDECIDED,
                    "nothing is known of the growth of an integral or a sum inside the integrand");
            return false;
        }
        n.args = base_alloc(f->count * sizeof *n.args);
        for (uint32_t k = 0; k < f->count; k++) {
            if (f->args[k]->kind == EXPR_RELATION && !expr_has(f->args[k], t->x)) {
                free(n.args);
                engine_fail(t->e, ERROR_UNDECIDED,
                        "a condition without the variable of integration is left in the integrand");
                return false;
            }
            if (!lay_out(t, f->args[k], &n.args[k])) {
                free(n.args);
                return false;
            }
        }
    }
    record_init(&n.record);
    if (n.constant && f->kind != EXPR_RELATION && !constant_record(&n.record, t->e, f)) {
        char *words = expr_text(t->e, f);
        engine_fail(t->e, ERROR_UNDECIDED, "%s has no finite value", words ? words : "a part of the integrand");
        free(words);
        record_clear(&n.record);
        return false;
    }
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 32;
        t->nodes = base_resize(t->nodes, t->room * sizeof *t->nodes);
    }
    *at = t->count;
    t->nodes[t->count++] = n;
    return true;
}

growth_program *growth_compile(tw_engine *e, expr *f, expr *x)
{
    if (!f)
        return NULL;
    growth_program *t = base_alloc(sizeof *t);
    *t = (growth_program){.e = e, .x = x};
    growth_place_init(&t->place, e);
    acb_init(t->turn);
    record_init(&t->result);
    size_t at;
    if (!lay_out(t, f, &at)) {
        growth_free(t);
        return NULL;
    }
    return t;
}

void growth_free(growth_program *t)
{
    if (!t)
        return;
    for (size_t k = 0; k < t->count; k++) {
        record_clear(&t->nodes[k].record);
        free(t->nodes[k].args);
        tape_free(t->nodes[k].values);
    }
    free(t->nodes);
    record_clear(&t->result);
    growth_place_clear(&t->place);
    acb_clear(t->turn);
    free(t);
}

/* ---- one pass ---- */

static const growth_record *argument(const growth_program *t, const growth_node *n, size_t k)
{
    return &t->nodes[n->args[k]].record;
}

/* The sign of a - b for all x >= X: 1, -1, 0 identical; 2 unknown. */
static int difference_sign(const growth_program *t, const growth_record *a, const growth_record *b)
{
    growth_record d;
    record_init(&d);
    int sign = 2;
    if (record_scale(&d, b, -1, &t->place) && record_add(&d, a, &d, &t->place) && record_is_real(&d)) {
        if (record_is_zero(&d))
            sign = 0;
        else if (!arb_contains_zero(acb_realref(d.g)))
            sign = arb_is_positive(acb_realref(d.g)) ? 1 : -1;
    }
    record_clear(&d);
    return sign;
}

/* min, max: the one that wins for all x >= X. */
static bool extreme(growth_record *out, const growth_program *t, const growth_node *n, int wanted)
{
    size_t best = 0;
    for (size_t k = 1; k < n->f->count; k++) {
        int sign = difference_sign(t, argument(t, n, k), argument(t, n, best));
        if (sign == 2)
            return false;
        if (sign == wanted)
            best = k;
    }
    record_set(out, argument(t, n, best));
    return true;
}

/* A function whose argument stays bounded: its value on the ball. */
static bool bounded_call(growth_record *out, growth_program *t, growth_node *n)
{
    size_t count = n->f->count;
    if (count > 4)
        return false;
    acb_ptr at = _acb_vec_init((slong)count);
    acb_t v;
    acb_init(v);
    bool ok = true;
    for (size_t k = 0; ok && k < count; k++)
        ok = record_ball(at + k, argument(t, n, k), &t->place);
    if (ok && !n->values) {
        expr *vars[4];
        for (size_t k = 0; k < count; k++)
            vars[k] = expr_fresh(t->e, "w");
        expr *call = expr_call(t->e, n->f->is.function, vars, count);
        n->values = call ? tape_new(t->e, call, vars, count) : NULL;
        ok = n->values != NULL;
    }
    if (ok) {
        tape_eval(v, n->values, at, t->place.analytic, t->place.prec);
        record_set_ball(out, v);
        ok = acb_is_finite(v);
    }
    _acb_vec_clear(at, (slong)count);
    acb_clear(v);
    return ok;
}

/* Functions whose rules for records hold on complex balls and never join two sheets. */
static bool rule_is_analytic(function_id f)
{
    switch (f) {
    case FUNCTION_EXP:
    case FUNCTION_LOG:
    case FUNCTION_SIN:
    case FUNCTION_COS:
    case FUNCTION_SINH:
    case FUNCTION_COSH:
    case FUNCTION_TANH:
    case FUNCTION_ERF:
    case FUNCTION_ERFC: return true;
    default: return false;
    }
}

static bool call_record(growth_record *out, growth_program *t, growth_node *n)
{
    if (t->place.analytic && !rule_is_analytic(n->f->is.function))
        return bounded_call(out, t, n);
    if (n->f->is.function == FUNCTION_MIN)
        return extreme(out, t, n, -1);
    if (n->f->is.function == FUNCTION_MAX)
        return extreme(out, t, n, 1);
    growth_record args[2]; /* views, read only */
    if (n->f->count > 2)
        return bounded_call(out, t, n);
    for (size_t k = 0; k < n->f->count; k++)
        args[k] = *argument(t, n, k);
    return growth_call(out, n->f->is.function, args, n->f->count, &t->place) || bounded_call(out, t, n);
}

static bool power_record(growth_record *out, const growth_program *t, const growth_node *n)
{
    const growth_record *base = argument(t, n, 0), *exponent = argument(t, n, 1);
    expr *p = n->f->args[1];
    if (expr_is_number(p)) {
        fmpq_t q;
        fmpq_init(q);
        fmpq_set(q, expr_number(p));
        bool ok = record_pow_fmpq(out, base, q, &t->place);
        fmpq_clear(q);
        return ok;
    }
    if (!expr_has(p, t->x))
        return record_pow_ball(out, base, exponent->g, &t->place);
    return record_log(out, base, &t->place) && record_mul(out, out, exponent, &t->place) && record_exp(out, out,
            &t->place);
}

static bool fold(growth_record *out, const growth_program *t, const growth_node *n)
{
    growth_record sum;
    record_init(&sum);
    record_set(&sum, argument(t, n, 0));
    bool ok = true;
    for (size_t k = 1; ok && k < n->f->count; k++)
        ok = n->f->kind == EXPR_SUM ? record_add(&sum, &sum, argument(t, n, k), &t->place)
                                    : record_mul(&sum, &sum, argument(t, n, k), &t->place);
    record_swap(out, &sum);
    record_clear(&sum);
    return ok;
}

/* 1: true for all x >= X, 0: false for all, 2: unknown */
static int relation_truth(const growth_program *t, const growth_node *n)
{
    int sign;
    switch (n->f->is.relation) {
    case RELATION_LESS:
        sign = difference_sign(t, argument(t, n, 0), argument(t, n, 1));
        return sign == 2 ? 2 : sign < 0;
    case RELATION_LESS_EQUAL:
        sign = difference_sign(t, argument(t, n, 0), argument(t, n, 1));
        return sign == 2 ? 2 : sign <= 0;
    case RELATION_EQUAL:
        sign = difference_sign(t, argument(t, n, 0), argument(t, n, 1));
        return sign == 2 ? 2 : sign == 0;
    case RELATION_NOT_EQUAL:
        sign = difference_sign(t, argument(t, n, 0), argument(t, n, 1));
        return sign == 2 ? 2 : sign != 0;
    default:
        return 2;
    }
}

static bool piecewise_record(growth_record *out, const growth_program *t, const growth_node *n)
{
    for (uint32_t k = 0; k + 1 < n->f->count; k += 2) {
        int truth = relation_truth(t, &t->nodes[n->args[k]]);
        if (truth == 2)
            return false;
        if (truth == 1) {
            record_set(out, argument(t, n, k + 1));
            return true;
        }
    }
    record_set(out, argument(t, n, n->f->count - 1));
    return true;
}

void growth_scale(growth_program *t, slong shift, bool inverted)
{
    t->shift = shift;
    t->inverted = inverted;
}

void growth_turn(growth_program *t, const acb_t turn)
{
    acb_set(t->turn, turn);
    t->turned = true;
    t->place.analytic = true;
}

bool growth_falls(const growth_program *t, fmpq_t power)
{
    const growth_record *r = &t->result;
    fmpq_sub(power, r->a, r->slack);
    return !t->resists && fmpq_is_zero(r->c) && fmpq_sgn(r->k) >= 0 && arb_is_negative(acb_realref(r->g));
}

/* x as a function of v; its modulus only where not `directed` */
static void variable_record(growth_record *out, const growth_program *t, bool directed)
{
    fmpq_t scale;
    fmpq_init(scale);
    fmpq_set_si(scale, 1, 1);
    slong shift = t->inverted ? -t->shift : t->shift;
    if (shift >= 0)
        fmpq_mul_2exp(scale, scale, (flint_bitcnt_t)shift);
    else
        fmpq_div_2exp(scale, scale, (flint_bitcnt_t)-shift);
    if (t->turned && directed) {
        acb_t w;
        arb_t factor;
        acb_init(w);
        arb_init(factor);
        arb_set_fmpq(factor, scale, t->place.prec);
        acb_mul_arb(w, t->turn, factor, t->place.prec);
        record_set_ball(out, w);
        arb_clear(factor);
        acb_clear(w);
    } else {
        record_set_fmpq(out, scale);
    }
    fmpq_set_si(out->a, t->inverted ? -1 : 1, 1);
    fmpq_clear(scale);
}

/* f(x) |dx/dv| */
static bool result_record(growth_program *t)
{
    const growth_record *root = &t->nodes[t->count - 1].record;
    growth_record jacobian;
    record_init(&jacobian);
    variable_record(&jacobian, t, false); /* directions have modulus 1 */
    fmpz_sub(fmpq_numref(jacobian.a), fmpq_numref(jacobian.a), fmpq_denref(jacobian.a));
    bool ok = record_mul(&t->result, root, &jacobian, &t->place);
    record_clear(&jacobian);
    return ok;
}

static bool node_record(growth_program *t, growth_node *n)
{
    if (n->constant || n->f->kind == EXPR_RELATION)
        return true;
    if (n->f == t->x) {
        variable_record(&n->record, t, true);
        return true;
    }
    switch ((expr_kind)n->f->kind) {
    case EXPR_SUM:
    case EXPR_PRODUCT:
        return fold(&n->record, t, n);
    case EXPR_POWER:
        return power_record(&n->record, t, n);
    case EXPR_CALL:
        return call_record(&n->record, t, n);
    case EXPR_PIECEWISE:
        return piecewise_record(&n->record, t, n);
    default:
        return false;
    }
}

/* An upper bound of the root's record, with an integer power of log x (log x >= 1). */
static void bound_of(growth_bound *out, const growth_record *r, const arf_t X, const growth_place *p)
{
    arf_t top;
    fmpz_t k;
    arf_init(top);
    fmpz_init(k);
    arf_set(out->X, X);
    acb_srcptr factor = r->g;
    acb_get_abs_ubound_arf(top, factor, p->prec);
    arb_set_arf(out->log_C, top);
    if (arf_is_zero(top))
        arb_neg_inf(out->log_C);
    else
        arb_log(out->log_C, out->log_C, p->prec);
    arb_get_ubound_arf(top, out->log_C, p->prec);
    arb_set_arf(out->log_C, top);
    fmpq_add(out->a, r->a, r->slack);
    fmpz_cdiv_q(k, fmpq_numref(r->k), fmpq_denref(r->k));
    out->k = fmpz_get_si(k);
    fmpq_set(out->c, r->c);
    arb_get_ubound_arf(top, acb_realref(r->T), p->prec);
    arb_set_arf(out->b, top);
    arb_neg(out->b, out->b);
    if (arf_is_zero(top))
        fmpq_zero(out->c);
    arf_clear(top);
    fmpz_clear(k);
}

bool growth_run(growth_program *t, growth_bound *out, const arf_t X)
{
    growth_place_set(&t->place, X);
    for (size_t k = 0; k < t->count; k++) {
        if (!node_record(t, &t->nodes[k])) {
            t->resists = t->nodes[k].f;
            return false;
        }
    }
    const growth_record *r = &t->result;
    if (!result_record(t) || !acb_is_finite(r->g) || !acb_is_finite(r->T) || !fmpz_fits_si(fmpq_numref(r->k))) {
        t->resists = t->nodes[t->count - 1].f;
        return false;
    }
    t->resists = NULL;
    bound_of(out, r, X, &t->place);
    return true;
}

expr *growth_resists(const growth_program *t)
{
    return t->resists ? t->resists : t->nodes[t->count - 1].f;
}

bool growth_diverges(const growth_program *t)
{
    const growth_record *r = &t->result;
    if (t->resists || record_is_zero(r) || acb_contains_zero(r->g) || !acb_is_real(r->T))
        return false;
    if (!fmpq_is_zero(r->c))
        return arb_is_positive(acb_realref(r->T));
    fmpq_t low;
    fmpq_init(low);
    fmpq_sub(low, r->a, r->slack);
    fmpz_add(fmpq_numref(low), fmpq_numref(low), fmpq_denref(low));
    bool yes = fmpq_sgn(low) > 0 || (fmpq_is_zero(low) && fmpz_cmp_si(fmpq_numref(r->k), 0) >= 0);
    if (fmpq_is_zero(low) && fmpq_sgn(r->k) < 0) { /* 1/(x (log x)^m) diverges for m <= 1 */
        fmpz_t s;
        fmpz_init(s);
        fmpz_add(s, fmpq_numref(r->k), fmpq_denref(r->k));
        yes = fmpz_sgn(s) >= 0;
        fmpz_clear(s);
    }
    fmpq_clear(low);
    return yes;
}

bool growth_is_nonzero(const growth_program *t)
{
    return !acb_contains_zero(t->result.g);
}

bool growth_is_real(const growth_program *t)
{
    return record_is_real(&t->result);
}

void growth_value(acb_t value, const growth_program *t, const arb_t x, slong prec)
{
    const growth_record *r = &t->result;
    arb_t log_x, s, u;
    acb_t w;
    arf_t slack;
    arb_init(log_x);
    arb_init(s);
    arb_init(u);
    acb_init(w);
    arf_init(slack);
    arb_log(log_x, x, prec);
    arb_set_fmpq(u, r->a, prec);
    arb_set_fmpq(s, r->slack, prec);
    arb_get_ubound_arf(slack, s, prec);
    arb_add_error_arf(u, slack);
    arb_mul(u, u, log_x, prec); /* (a + d) log x */
    arb_set_fmpq(s, r->k, prec);
    arb_log(acb_realref(w), log_x, prec);
    arb_addmul(u, s, acb_realref(w), prec);
    arb_set_fmpq(s, r->c, prec);
    arb_mul(s, s, log_x, prec);
    arb_exp(s, s, prec); /* x^c */
    acb_mul_arb(w, r->T, s, prec);
    arb_add(acb_realref(w), acb_realref(w), u, prec);
    acb_exp(w, w, prec);
    acb_mul(value, w, r->g, prec);
    arb_clear(log_x);
    arb_clear(s);
    arb_clear(u);
    acb_clear(w);
    arf_clear(slack);
}

/* ---- bounds and tails ---- */

static bool bound_is_zero(const growth_bound *g)
{
    return arf_is_neg_inf(arb_midref(g->log_C));
}

bool growth_integrable(const growth_bound *g)
{
    if (bound_is_zero(g) || arb_is_positive(g->b))
        return true;
    if (!fmpq_is_zero(g->c))
        return false;
    fmpq_t s;
    fmpq_init(s);
    fmpq_add_si(s, g->a, 1);
    bool yes = fmpq_sgn(s) < 0 || (fmpq_is_zero(s) && g->k < -1);
    fmpq_clear(s);
    return yes;
}

tw_status growth_at_infinity(tw_engine *e, growth_bound *out, expr *f, expr *x, const env *at, double X_wanted)
{
    expr *g = at && at->count ? expr_substitute_all(e, f, at->symbols, at->values, at->count) : f;
    growth_program *t = growth_compile(e, g, x);
    if (!t)
        return TW_ERROR;
    growth_bound first;
    arf_t X;
    growth_bound_init(&first);
    arf_init(X);
    arf_set_d(X, X_wanted >= 4 ? X_wanted : 4);
    bool found = false, good = false;
    for (int tries = 0; tries < 48 && !good && budget_ok(e); tries++) {
        if (growth_run(t, out, X)) {
            good = growth_integrable(out);
            if (!found) {
                found = true;
                arf_set(first.X, out->X);
                arb_set(first.log_C, out->log_C);
                fmpq_set(first.a, out->a);
                fmpq_set(first.c, out->c);
                arb_set(first.b, out->b);
                first.k = out->k;
            }
        }
        arf_mul_2exp_si(X, X, 1);
    }
    if (found && !good) {
        growth_bound swap = *out;
        *out = first;
        first = swap;
    }
    if (!found) {
        char *words = expr_text(e, growth_resists(t));
        engine_fail(e, ERROR_UNDECIDED, "no bound was found for the growth of %s", words ? words : "the integrand");
        free(words);
    }
    growth_bound_clear(&first);
    arf_clear(X);
    growth_free(t);
    return found && !e->error.kind ? TW_OK : TW_ERROR;
}

/* With p = a + 1 - c (b > 0) or p = 0 (b = 0):  x^p (log x)^k e^(-(b-r) x^c) decreases from X on where (b - r) c X^c >=
 * max(p, 0) + max(k, 0)/log X. Then the integral of x^(c-1) e^(-r x^c) (or of x^(a+1-1)) is elementary: tail <= X^p
 * (log X)^k e^(-b X^c) / (c r). rate = c r X^c, the tail is X f(X)/rate; false where no r > 0 serves. */
static bool tail_rate(arb_t rate, const growth_bound *g, const arb_t log_X, slong prec)
{
    arb_t t, u;
    fmpq_t p;
    arb_init(t);
    arb_init(u);
    fmpq_init(p);
    if (arb_is_positive(g->b)) {
        arb_set_fmpq(t, g->c, prec);
        arb_mul(u, t, log_X, prec);
        arb_exp(u, u, prec);
        arb_mul(u, u, t, prec);
        arb_mul(rate, u, g->b, prec);
        const fmpq *c = g->c;
        fmpq_sub(p, g->a, c);
        fmpq_add_si(p, p, 1);
        if (fmpq_sgn(p) > 0) {
            arb_set_fmpq(t, p, prec);
            arb_sub(rate, rate, t, prec);
        }
    } else {
        fmpq_add_si(p, g->a, 1);
        arb_set_fmpq(rate, p, prec);
        arb_neg(rate, rate);
    }
    if (g->k > 0) {
        arb_set_si(t, g->k);
        arb_div(t, t, log_X, prec);
        arb_sub(rate, rate, t, prec);
    }
    arb_clear(t);
    arb_clear(u);
    fmpq_clear(p);
    return arb_is_positive(rate);
}

/* log of the bound at the point with logarithm log_x, without exp(-b x^c) where `plain`. */
static void bound_log(arb_t out, const growth_bound *g, const arb_t log_x, slong prec)
{
    arb_t t, u;
    arb_init(t);
    arb_init(u);
    arb_set_fmpq(t, g->a, prec);
    arb_mul(t, t, log_x, prec);
    arb_add(t, t, g->log_C, prec);
    arb_log(u, log_x, prec);
    arb_mul_si(u, u, g->k, prec);
    arb_add(t, t, u, prec);
    if (!fmpq_is_zero(g->c)) {
        arb_set_fmpq(u, g->c, prec);
        arb_mul(u, u, log_x, prec);
        arb_exp(u, u, prec);
        arb_submul(t, u, g->b, prec);
    }
    arb_swap(out, t);
    arb_clear(t);
    arb_clear(u);
}

/* log of an upper bound of the integral from X to Y, log Y = log_Y: the length times the greatest value, each factor at
 * the end where it is greater. */
static void middle_log(arb_t out, const growth_bound *g, const arb_t log_X, const arb_t log_Y, slong prec)
{
    arb_t t, u;
    arb_init(t);
    arb_init(u);
    arb_set_fmpq(t, g->a, prec);
    arb_mul(t, t, fmpq_sgn(g->a) > 0 ? log_Y : log_X, prec);
    arb_add(t, t, g->log_C, prec);
    arb_log(u, g->k > 0 ? log_Y : log_X, prec);
    arb_mul_si(u, u, g->k, prec);
    arb_add(t, t, u, prec);
    if (!fmpq_is_zero(g->c)) {
        arb_set_fmpq(u, g->c, prec);
        arb_mul(u, u, log_X, prec);
        arb_exp(u, u, prec);
        arb_submul(t, u, g->b, prec);
    }
    arb_add(out, t, log_Y, prec);
    arb_clear(t);
    arb_clear(u);
}

tw_status growth_tail(tw_engine *e, arb_t log_tail, const growth_bound *g)
{
    slong prec = 64;
    if (bound_is_zero(g)) {
        arb_neg_inf(log_tail);
        return TW_OK;
    }
    if (!growth_integrable(g))
        return engine_fail(e, ERROR_DIVERGENT, "the bound of the growth is not integrable at infinity");
    arb_t log_X, log_Y, rate, part;
    arf_t top;
    arb_init(log_X);
    arb_init(log_Y);
    arb_init(rate);
    arb_init(part);
    arf_init(top);
    arb_set_arf(log_X, g->X);
    arb_log(log_X, log_X, prec);
    arb_set(log_Y, log_X);
    bool found = false;
    fmpq_t p;
    fmpq_init(p);
    fmpq_add_si(p, g->a, 1);
    if (!arb_is_positive(g->b) && fmpq_is_zero(p)) { /* int dx/x (log x)^k = (log X)^(k+1)/(-k-1), k < -1 */
        arb_log(log_tail, log_X, prec);
        arb_mul_si(log_tail, log_tail, g->k + 1, prec);
        arb_add(log_tail, log_tail, g->log_C, prec);
        found = true;
    }
    for (int tries = 0; !found && tries < 60; tries++) {
        if (tail_rate(rate, g, log_Y, prec)) {
            bound_log(log_tail, g, log_Y, prec);
            arb_add(log_tail, log_tail, log_Y, prec);
            arb_log(rate, rate, prec);
            arb_sub(log_tail, log_tail, rate, prec);
            if (tries) {
                middle_log(part, g, log_X, log_Y, prec);
                arb_max(log_tail, log_tail, part, prec);
                arb_const_log2(part, prec);
                arb_add(log_tail, log_tail, part, prec); /* a sum of two is at most twice the greater */
            }
            found = true;
        } else {
            arb_const_log2(part, prec);
            arb_addmul_ui(log_Y, part, (ulong)(1 + tries), prec);
        }
    }
    arb_get_ubound_arf(top, log_tail, prec);
    arb_set_arf(log_tail, top);
    arb_clear(log_X);
    arb_clear(log_Y);
    arb_clear(rate);
    arb_clear(part);
    arf_clear(top);
    fmpq_clear(p);
    if (!found || arf_is_nan(arb_midref(log_tail)))
        return engine_fail(e, ERROR_UNDECIDED, "no bound was found for the tail at infinity");
    return TW_OK;
}
