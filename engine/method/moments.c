/* Closed moments: I(S) = int_0^inf x^a exp(-S x^mu) dx = Gamma(z)/(mu S^z), z = (a + 1)/mu (DLMF 5.9.1), and everything
 * that differentiation in a parameter makes of it: in S it brings down -x^mu, in a it brings down log(x). The one idea:
 * where the amplitude is a finite sum of such terms, perhaps times exp(-b x^mu), which only moves S to S + b, the
 * expansion ends and is the integral exactly. */
#include <stdlib.h>
#include <string.h>

#include "engine/method/lanes.h"
#include "engine/method/local.h"

enum { LENGTH_LIMIT = 256 }; /* terms of a finite sum that is recognised */

/* ---- recognising ---- */

/* q = exp(-shift x^mu) * core; shift 0 when there is no such factor. False when an exponential of another shape is
 * there. */
static bool split_shift(tw_engine *e, const reading *r, const branch *b, expr **shift, expr **core)
{
    expr *power = expr_pow(e, b->x, expr_fmpq(e, r->points->mu));
    expr *const *factors;
    size_t count = expr_factors(&b->q, &factors);
    *shift = expr_int(e, 0);
    *core = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (!expr_is_call(factors[k], FUNCTION_EXP) || !expr_has(factors[k], b->x)) {
            *core = expr_mul(e, *core, factors[k]);
            continue;
        }
        expr *rate = expr_neg(e, expr_div(e, factors[k]->args[0], power));
        if (!rate || expr_has(rate, b->x)) return false;
        *shift = expr_add(e, *shift, rate);
    }
    return *shift && *core;
}

/* x^a, log(x)^k, anything free of x, and products of these. */
static bool is_moment_term(expr *t, expr *x)
{
    expr *const *factors;
    size_t count = expr_factors(&t, &factors);
    for (size_t k = 0; k < count; k++) {
        expr *f = factors[k];
        if (!expr_has(f, x) || f == x) continue;
        bool power = f->kind == EXPR_POWER && !expr_has(f->args[1], x);
        expr *base = power ? f->args[0] : f;
        if (base == x || (expr_is_call(base, FUNCTION_LOG) && base->args[0] == x)) continue;
        return false;
    }
    return true;
}

/* core is a finite sum of such terms, and so is its series; into *out (initialised). */
static bool ends(tw_engine *e, series *out, expr *core, expr *x)
{
    core = expr_expand(e, core);
    if (!core) return false;
    expr *const *terms;
    size_t count = expr_terms(&core, &terms);
    for (size_t k = 0; k < count; k++)
        if (!is_moment_term(terms[k], x)) return false;
    bool good = series_at_zero(e, out, core, x, LENGTH_LIMIT, NULL, NULL) == TW_OK && out->terminates;
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    return good;
}

static bool has_log(const series *s)
{
    for (size_t k = 0; k < s->count; k++)
        if (s->strands[k].log_power > 0) return true;
    return false;
}

/* All branches have one shift and cores that end. A shift needs infinite ranges and no log. */
static bool closes(tw_engine *e, const reading *r, expr **shift)
{
    if (r->point_count != 1 || r->rest.count > 0 || !r->points->pure || r->points->local.count == 0) return false;
    for (size_t k = 0; k < r->points->local.count; k++) {
        const branch *b = &r->points->local.branches[k];
        expr *one, *core;
        if (!split_shift(e, r, b, &one, &core)) return false;
        if (k > 0 && one != *shift) return false;
        *shift = one;
        bool endless = expr_is_inf(b->end);
        if (!endless && (!expr_is_zero(one) || !fmpq_is_one(r->points->mu))) return false;
        series s;
        series_init(&s);
        bool good = ends(e, &s, core, b->x) && (expr_is_zero(one) || !has_log(&s));
        for (size_t n = 0; n < s.count && good && !endless; n++) {
            expr *a = s.strands[n].exponent;
            good = s.strands[n].den == 1 && s.strands[n].log_power == 0 && expr_is_number(a) &&
                   fmpz_is_one(fmpq_denref(expr_number(a)));
        }
        series_clear(&s);
        if (!good) return false;
    }
    return true;
}

static answer moments_suits(tw_engine *e, const reading *r, char **why)
{
    expr *shift;
    if (closes(e, r, &shift))
        return suits_answer(why, ANSWER_YES,
                            "the amplitude is a finite sum of powers (and logarithms) times the kernel's own kind of "
                            "exponential: the moments close and the expansion is exact");
    return suits_answer(why, ANSWER_NO,
                        "the amplitude is not a finite sum of powers and logarithms times exp(-b*x^mu), so the "
                        "family of moments does not close");
}

/* ---- a moved scale: powers of S + b ---- */

/* sum_m c[m] * (S + b)^(M - m), M the last index and S = c0 s^K, multiplied out in powers of s, into a lane of one
 * contribution whose prefactor takes (S + b)^-z of the last. */
typedef struct moved {
    tw_engine *e;
    const reading *r;
    expr *shift;
    const lane *from;   /* in powers of S */
    slong last, stride; /* last index; z moves by `stride` an index */
} moved;

/* The coefficient of s^(K j). */
static expr *moved_coefficient(const moved *m, slong j)
{
    tw_engine *e = m->e;
    expr *sum = expr_int(e, 0);
    fmpz_t binomial;
    fmpz_init(binomial);
    for (slong n = 0; n <= m->last; n++) {
        slong high = (m->last - n) * m->stride;
        if (high < j || coefficient_is_zero(&m->from->c, n)) continue;
        fmpz_bin_uiui(binomial, (ulong)high, (ulong)j);
        expr *part = expr_mul(e, coefficient_expr(e, &m->from->c, n), expr_fmpz(e, binomial));
        sum = expr_add(e, sum, expr_mul(e, part, expr_pow(e, m->shift, expr_int(e, high - j))));
    }
    fmpz_clear(binomial);
    return expr_mul(e, sum, expr_pow(e, m->r->points->scale_constant, expr_int(e, j)));
}

static tw_status lane_of_moved(moved *m, contribution *c, const kernel *k)
{
    tw_engine *e = m->e;
    slong top = m->last * m->stride;
    fmpq_t power, forward;
    fmpq_init(power);
    fmpq_init(forward);
    fmpq_mul_si(power, m->r->power, top);
    fmpq_add(power, power, k->factor_power);
    expr **x = base_alloc((size_t)(top + 1) * sizeof *x);
    for (slong j = 0; j <= top; j++) x[j] = expr_mul(e, moved_coefficient(m, top - j), expr_fmpq(e, k->factor_number));
    fmpq_neg(forward, m->r->power);
    tw_status status = contribution_set_lane(e, c, expr_int(e, 1), expr_fmpq(e, power), forward, x, top + 1);
    free(x);
    fmpq_clear(forward);
    fmpq_clear(power);
    return status;
}

static tw_status add_moved(moved *m, expansion *out, const kernel *k, expr *rest)
{
    tw_engine *e = m->e;
    const reading *r = m->r;
    contribution *c = expansion_add(out);
    c->variable = r->original_variable;
    c->place = r->points->place;
    c->kind = r->points->kind;
    c->method = "moments";
    c->dominant = true;
    c->terminates = true;
    local_form_copy(&c->local, &r->points->local);
    expr *scale = expr_add(e, r->points->local.scale, m->shift);
    expr *z = expr_add(e, m->from->first_exponent, expr_int(e, -m->last * m->stride));
    expr *parts[] = {rest, m->from->constant, expr_pow(e, scale, z)};
    if (!scale || !z || !parts[2]) return TW_ERROR;
    c->prefactor = expr_product(e, parts, 3);
    return c->prefactor ? lane_of_moved(m, c, k) : TW_ERROR;
}

/* Lanes in powers of S = scale + shift, as if S were the large parameter. */
static tw_status lanes_in_scale(tw_engine *e, const reading *r, contribution *plain)
{
    kernel k;
    kernel_init(&k);
    fmpq_set(k.mu, r->points->mu);
    fmpq_one(k.power);
    fmpq_one(k.factor_number);
    k.constant = expr_int(e, 1);
    drafts d;
    drafts_init(&d);
    tw_status status = TW_OK;
    for (size_t n = 0; n < r->points->local.count && status == TW_OK; n++) {
        const branch *b = &r->points->local.branches[n];
        expr *shift, *core;
        series s;
        series_init(&s);
        if (!split_shift(e, r, b, &shift, &core) || !ends(e, &s, core, b->x)) status = TW_ERROR;
        if (status == TW_OK) status = drafts_add(e, &d, &s, &k);
        series_clear(&s);
    }
    if (status == TW_OK) status = drafts_finish(e, &d, plain, &k);
    drafts_clear(&d);
    kernel_clear(&k);
    return status;
}

static tw_status expand_moved(tw_engine *e, expansion *out, const reading *r, expr *shift)
{
    contribution plain;
    contribution_init(&plain);
    kernel k;
    kernel_init(&k);
    expr *rest;
    factor_split(e, r->points->local.factor, r->large, k.factor_number, k.factor_power, &rest);
    tw_status status = lanes_in_scale(e, r, &plain);
    for (size_t n = 0; n < plain.lane_count && status == TW_OK; n++) {
        moved m = {e, r, shift, &plain.lanes[n], plain.lanes[n].c.count - 1, 1};
        while (m.last > 0 && coefficient_is_zero(&m.from->c, m.last)) m.last--;
        m.stride = -fmpz_get_si(fmpq_numref(m.from->step));
        status = add_moved(&m, out, &k, rest);
    }
    kernel_clear(&k);
    contribution_clear(&plain);
    return status;
}

/* ---- the record ---- */

static void record_family(tw_engine *e, expansion *out, const reading *r, expr *shift)
{
    char *scale = expr_text(e, expr_add(e, r->points->local.scale, shift));
    char *mu = expr_text(e, expr_fmpq(e, r->points->mu));
    step *s = derivation_add(&out->derivation, "differentiate in a parameter", "DLMF 5.9.1");
    text t;
    text_init(&t);
    text_addf(&t, "S = %s; a factor x^mu is minus a derivative in S, a factor log(x) a derivative in a",
              scale ? scale : "");
    s->detail = text_take(&t);
    text_addf(&t, "integral from 0 to inf of x^a*exp(-S*x^mu) dx = Gamma((a + 1)/mu)/(mu*S^((a + 1)/mu)), mu = %s",
              mu ? mu : "");
    s->form = text_take(&t);
    free(scale);
    free(mu);
}

static tw_status moments_expand(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    expr *shift;
    if (!closes(e, r, &shift)) return engine_fail(e, ERROR_UNSUITABLE, "the family of moments does not close");
    if (terms < LENGTH_LIMIT) terms = LENGTH_LIMIT;
    record_family(e, out, r, shift);
    if (!expr_is_zero(shift)) {
        if (expand_moved(e, out, r, shift) != TW_OK) return TW_ERROR;
    } else {
        bool all;
        if (local_expand(e, out, r, terms, "moments") != TW_OK) return TW_ERROR;
        if (local_expand_far_ends(e, out, r, terms, "moments", &all) != TW_OK) return TW_ERROR;
    }
    out->exact = true;
    for (size_t k = 0; k < out->contribution_count; k++) {
        out->exact = out->exact && out->contributions[k].terminates;
        local_record_sum(e, out, k, "add the moments", NULL);
    }
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static tw_status moments_extend(tw_engine *e, expansion *a, slong terms)
{
    return local_extend(e, a, terms, "moments");
}

const method method_moments = {"moments", "moments, exact", moments_suits, moments_expand, moments_extend};
