/* Terms of an expansion as real balls, in order of size. Powers of the large parameter are taken once a lane and multiplied on. */
#include "engine/numeric/terms.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static bool is_moved(expr *f, const env *at)
{
    for (size_t k = 0; k < at->count; k++)
        if (expr_has(f, at->symbols[k]))
            return true;
    return false;
}

static expr *put_plain(tw_engine *e, expr *f, const env *at)
{
    return expr_substitute_all(e, f, at->symbols, at->values, at->count);
}

/* b^x as exp(x*acosh((b + 1/b)/2)) for rational b > 0: the same value, but no constructor writes it out in digits (s^(1 + s) at
 * s = 10^6 has 20 million of them). NULL: small enough as it is. */
static expr *huge_power(tw_engine *e, expr *base, expr *exponent)
{
    enum { BITS_MOST = 1 << 16 };
    expr *two = expr_int(e, 2);
    if (!base || !exponent || !expr_is_number(base) || !expr_is_number(exponent) || fmpq_sgn(expr_number(base)) <= 0)
        return NULL;
    double bits = (double)(fmpz_bits(fmpq_numref(expr_number(base))) + fmpz_bits(fmpq_denref(expr_number(base))));
    if (fabs(fmpz_get_d(fmpq_numref(expr_number(exponent)))) * bits < BITS_MOST)
        return NULL;
    bool below = fmpz_cmp(fmpq_numref(expr_number(base)), fmpq_denref(expr_number(base))) < 0;
    expr *cosh = expr_div(e, expr_add(e, base, expr_pow(e, base, expr_int(e, -1))), two);
    expr *log = expr_call1(e, FUNCTION_ACOSH, cosh);
    return expr_call1(e, FUNCTION_EXP, expr_mul(e, below ? expr_neg(e, exponent) : exponent, log));
}

/* The large powers first, then the rest by plain substitution. */
static expr *tame_powers(tw_engine *e, expr *f, const env *at)
{
    if (!f || !is_moved(f, at))
        return f;
    if (f->kind == EXPR_POWER && is_moved(f->args[1], at)) {
        expr *tamed = huge_power(e, put_plain(e, f->args[0], at), put_plain(e, f->args[1], at));
        return tamed ? tamed : f;
    }
    if (f->kind != EXPR_PRODUCT && f->kind != EXPR_SUM)
        return f;
    expr *made = expr_int(e, f->kind == EXPR_SUM ? 0 : 1);
    for (uint32_t k = 0; k < f->count; k++) {
        expr *part = tame_powers(e, f->args[k], at);
        made = f->kind == EXPR_SUM ? expr_add(e, made, part) : expr_mul(e, made, part);
    }
    return made;
}

expr *put_values(tw_engine *e, expr *f, const env *at)
{
    f = at->count == 0 ? f : tame_powers(e, f, at);
    return !f || at->count == 0 ? f : put_plain(e, f, at);
}

tw_status real_ball(tw_engine *e, arb_t out, expr *f, slong bits)
{
    acb_t z;
    tw_status status;
    if (!f)
        return TW_ERROR;
    acb_init(z);
    status = ball_value(e, z, f, bits);
    if (status == TW_OK && !acb_is_finite(z))
        status = engine_fail(e, ERROR_VALUE, "a term has no finite value there");
    else if (status == TW_OK && !arb_contains_zero(acb_imagref(z)))
        status = engine_fail(e, ERROR_UNAVAILABLE, "the expansion is complex there; sums of complex terms are not available yet");
    arb_set(out, acb_realref(z));
    acb_clear(z);
    return status;
}

bool contribution_counts(const expansion *a, size_t k, bool all)
{
    return all || a->contributions[k].dominant;
}

static bool has_value(const env *at, expr *symbol)
{
    for (size_t k = 0; k < at->count; k++)
        if (at->symbols[k] == symbol)
            return true;
    return false;
}

tw_status point_complete(tw_engine *e, const expansion *a, const env *at)
{
    expr **symbols;
    size_t n = expr_symbols(a->integral, &symbols);
    tw_status status = TW_OK;
    for (size_t k = 0; k < n && status == TW_OK; k++)
        if (!has_value(at, symbols[k]))
            status = engine_fail(e, ERROR_NAME, "%s has no value; say: at %s = ..., %s = ...", symbols[k]->is.name,
                                 a->large->is.name, symbols[k]->is.name);
    if (status == TW_OK && !has_value(at, a->large))
        status = engine_fail(e, ERROR_NAME, "%s has no value; say: at %s = ...", a->large->is.name, a->large->is.name);
    free(symbols);
    return status;
}

/* What a lane's terms share at the point: constant * prefactor * (log s)^k, s^step, and s^first. */
typedef struct lane_value {
    arb_t front, ratio, power;
    slong n; /* power is s^(first + n*step) */
} lane_value;

static tw_status lane_at(tw_engine *e, lane_value *v, const expansion *a, const contribution *c, const lane *l,
                         const env *at, slong bits)
{
    expr *s = put_values(e, a->large, at);
    expr *front = expr_mul(e, put_values(e, l->constant, at), put_values(e, c->prefactor, at));
    if (l->log_power > 0)
        front = expr_mul(e, front, expr_pow(e, expr_call1(e, FUNCTION_LOG, s), expr_int(e, l->log_power)));
    v->n = 0;
    if (real_ball(e, v->front, front, bits) != TW_OK ||
        real_ball(e, v->ratio, expr_pow(e, s, expr_fmpq(e, l->step)), bits) != TW_OK)
        return TW_ERROR;
    return real_ball(e, v->power, expr_pow(e, s, put_values(e, l->first_exponent, at)), bits);
}

static tw_status one_term(tw_engine *e, arb_t out, lane_value *v, const lane *l, slong n, const env *at, slong bits)
{
    tw_status status = TW_OK;
    for (; v->n < n; v->n++)
        arb_mul(v->power, v->power, v->ratio, bits);
    if (l->c.q)
        arb_set_fmpq(out, l->c.q + n, bits);
    else
        status = real_ball(e, out, put_values(e, l->c.x[n], at), bits);
    arb_mul(out, out, v->front, bits);
    arb_mul(out, out, v->power, bits);
    return status;
}

static tw_status values_at(tw_engine *e, term_values *t, expansion *a, const env *at, slong count, slong bits)
{
    const contribution *c = a->contributions + t->contribution;
    lane_value *lanes = base_alloc((c->lane_count + 1) * sizeof *lanes);
    tw_status status = expansion_order(e, a, t->contribution, count, &t->order, &t->count);
    size_t made = 0;
    slong found = status == TW_OK ? t->count : 0;
    t->count = found;
    t->value = _arb_vec_init(found);
    for (; made < c->lane_count && status == TW_OK; made++) {
        arb_init(lanes[made].front);
        arb_init(lanes[made].ratio);
        arb_init(lanes[made].power);
        status = lane_at(e, lanes + made, a, c, c->lanes + made, at, bits);
    }
    for (slong k = 0; k < found && status == TW_OK; k++) {
        term one = t->order[k];
        status = one_term(e, t->value + k, lanes + one.lane, c->lanes + one.lane, one.n, at, bits);
        if (!budget_ok(e))
            status = TW_ERROR;
    }
    for (size_t k = 0; k < made; k++) {
        arb_clear(lanes[k].front);
        arb_clear(lanes[k].ratio);
        arb_clear(lanes[k].power);
    }
    free(lanes);
    return status;
}

tw_status terms_at(tw_engine *e, term_table *out, expansion *a, const env *at, slong count, bool all, slong bits)
{
    tw_status status = TW_OK;
    out->count = 0;
    out->list = base_alloc((a->contribution_count + 1) * sizeof *out->list);
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++) {
        term_values *t;
        if (!contribution_counts(a, k, all))
            continue;
        t = out->list + out->count++;
        memset(t, 0, sizeof *t);
        t->contribution = k;
        status = values_at(e, t, a, at, count, bits);
    }
    if (status != TW_OK)
        terms_clear(out);
    return status;
}

void terms_clear(term_table *t)
{
    for (size_t k = 0; k < t->count; k++) {
        if (t->list[k].value)
            _arb_vec_clear(t->list[k].value, t->list[k].count);
        free(t->list[k].order);
    }
    free(t->list);
    t->list = NULL;
    t->count = 0;
}
