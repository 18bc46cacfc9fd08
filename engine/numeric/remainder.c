/* The remainder's bound as a formula in the large parameter, for all values from some on. One idea: the first omitted term where the
 * enclosing theorem holds; else the panels' power bound with its constants rounded up to a few digits, the factor in front of the
 * contribution carried along as it stands. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/numeric/complex.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/signs.h"
#include "engine/numeric/split_off.h"
#include "engine/numeric/terms.h"
#include "engine/numeric/turned.h"

void remainder_bound_init(remainder_bound *r)
{
    memset(r, 0, sizeof *r);
    r->label = LABEL_UNKNOWN;
    conditions_init(&r->conditions);
}

void remainder_bound_clear(remainder_bound *r)
{
    free(r->source);
    free(r->reason);
    for (size_t k = 0; r->panel_t && k < r->panel_count; k++) {
        free(r->panel_t[k]);
        free(r->panel_height[k]);
    }
    free(r->panel_t);
    free(r->panel_height);
    conditions_clear(&r->conditions);
    memset(r, 0, sizeof *r);
}

/* ---- numbers for people ---- */

/* x > 0 as a rational of `digits` significant decimal digits, rounded up (or down). */
static void short_decimal(fmpq_t out, const arb_t x, slong digits, bool up)
{
    arf_t bound;
    fmpz_t mantissa, ten;
    arb_t scaled, power;
    slong exponent;
    mag_t m;
    arf_init(bound);
    fmpz_init(mantissa);
    fmpz_init(ten);
    arb_init(scaled);
    arb_init(power);
    mag_init(m);
    arb_get_mag(m, x);
    fmpq_zero(out);
    if (up && !mag_is_zero(m) && mag_log2(m) < -1e6) { /* a tiny number rounded up generously */
        fmpz_set_ui(ten, 10);
        fmpz_pow_ui(ten, ten, 300000);
        fmpq_set_fmpz(out, ten);
        fmpq_inv(out, out);
    } else if (!mag_is_zero(m) && mag_is_finite(m) && fabs(mag_log2(m)) < 1e7) {
        exponent = (slong)floor(mag_log2(m) * 0.30102999566398) - digits + 1;
        arb_set_ui(power, 10);
        arb_pow_ui(power, power, (ulong)labs(exponent), 128);
        if (exponent >= 0)
            arb_div(scaled, x, power, 128);
        else
            arb_mul(scaled, x, power, 128);
        if (up)
            arb_get_ubound_arf(bound, scaled, 128);
        else
            arb_get_lbound_arf(bound, scaled, 128);
        arf_get_fmpz(mantissa, bound, up ? ARF_RND_CEIL : ARF_RND_FLOOR);
        fmpz_set_ui(ten, 10);
        fmpz_pow_ui(ten, ten, (ulong)labs(exponent));
        fmpq_set_fmpz(out, mantissa);
        if (exponent >= 0)
            fmpq_mul_fmpz(out, out, ten);
        else
            fmpq_div_fmpz(out, out, ten);
    }
    mag_clear(m);
    arb_clear(power);
    arb_clear(scaled);
    fmpz_clear(ten);
    fmpz_clear(mantissa);
    arf_clear(bound);
}

static expr *decimal_expr(tw_engine *e, const arb_t x, slong digits, bool up)
{
    fmpq_t q;
    expr *made;
    arb_t positive;
    fmpq_init(q);
    arb_init(positive);
    if (arb_is_negative(x)) { /* up for a negative number: its modulus down */
        arb_neg(positive, x);
        short_decimal(q, positive, digits, !up);
        fmpq_neg(q, q);
    } else {
        short_decimal(q, x, digits, up);
    }
    made = expr_fmpq(e, q);
    arb_clear(positive);
    fmpq_clear(q);
    return made;
}

static char *decimal_words(const arb_t x, bool up)
{
    fmpq_t q;
    arb_t y;
    char *words;
    fmpq_init(q);
    arb_init(y);
    short_decimal(q, x, 15, up);
    arb_set_fmpq(y, q, 128);
    words = arb_get_str(y, 15, ARB_STR_NO_RADIUS);
    arb_clear(y);
    fmpq_clear(q);
    char *copy = base_copy(words);
    flint_free(words);
    return copy;
}

/* ---- positive factors ---- */

/* |f| for an expression that is real where it stands. */
expr *bound_modulus(tw_engine *e, expr *f)
{
    int sign = f ? decide_sign(e, f) : 2;
    if (!f)
        return NULL;
    if (sign == 1 || sign == 0)
        return f;
    if (sign == -1)
        return expr_neg(e, f);
    if (f->kind == EXPR_PRODUCT) {
        expr *product = expr_int(e, 1);
        for (uint32_t k = 0; k < f->count; k++)
            product = expr_mul(e, product, bound_modulus(e, f->args[k]));
        return product;
    }
    return expr_call1(e, FUNCTION_ABS, f);
}

static const env *without_large(env *out, const env *at, expr *large)
{
    out->count = 0;
    out->symbols = base_alloc((at->count + 1) * sizeof *out->symbols);
    out->values = base_alloc((at->count + 1) * sizeof *out->values);
    for (size_t k = 0; k < at->count; k++)
        if (at->symbols[k] != large) {
            out->symbols[out->count] = at->symbols[k];
            out->values[out->count++] = at->values[k];
        }
    return out;
}

static void env_add(env *v, expr *symbol, expr *value)
{
    v->symbols[v->count] = symbol;
    v->values[v->count++] = value;
}

static void env_free(env *v)
{
    free(v->symbols);
    free(v->values);
}

/* ---- how many terms, from where ---- */

/* The term as a formula, with its prefactor and the parameters' values. */
static expr *term_formula(tw_engine *e, const expansion *a, size_t k, term t, const env *values)
{
    expr *f = expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, t));
    return f ? put_values(e, f, values) : NULL;
}

/* A value of the large parameter (or small h), two digits: from there on term `terms` of contribution k is at most the one before
 * it, so that keeping it pays. */
static tw_status useful_from(tw_engine *e, expr **out, expansion *a, const env *values, slong terms)
{
    enum { BITS = 64 };
    double s = a->small ? 1e-6 : 1e6, best;
    arb_t x;
    double stride = a->small ? 1.25 : 0.8;
    best = s;
    arb_init(x);
    /* down from far out while the last kept term is larger than the first omitted one */
    for (int k = 0; k < 130; k++) {
        term_table t;
        env at;
        bool fine;
        double rounded = s;
        tw_status status;
        expr *value;
        arb_set_d(x, rounded);
        value = decimal_expr(e, x, 2, !a->small);
        without_large(&at, values, a->large);
        env_add(&at, a->large, value);
        status = value ? terms_at(e, &t, a, &at, terms + 2, false, BITS) : TW_ERROR;
        env_free(&at);
        if (status != TW_OK) {
            arb_clear(x);
            return TW_ERROR;
        }
        fine = true;
        for (size_t b = 0; b < t.count && fine; b++) {
            const term_values *one = t.list + b;
            double last, omitted = -HUGE_VAL;
            mag_t m;
            if (one->count <= terms || terms == 0)
                continue;
            mag_init(m);
            arb_get_mag(m, one->value + terms - 1);
            last = mag_log2(m);
            for (slong j = terms; j < one->count; j++) {
                arb_get_mag(m, one->value + j);
                omitted = fmax(omitted, mag_log2(m));
            }
            fine = omitted <= last + 0.05;
            mag_clear(m);
        }
        terms_clear(&t);
        if (!fine)
            break;
        best = s;
        if (a->small ? s > 1 : s < 1)
            break;
        s *= stride;
    }
    arb_set_d(x, best);
    *out = decimal_expr(e, x, 2, !a->small);
    arb_clear(x);
    return *out ? TW_OK : TW_ERROR;
}

/* ---- enclosing ---- */

static bool all_enclose(tw_engine *e, expansion *a, const env *at)
{
    bool any = false;
    if (a->rest.count > 0)
        return false;
    for (size_t k = 0; k < a->contribution_count; k++) {
        if (!contribution_counts(a, k, false))
            continue;
        if (a->contributions[k].local.count == 0 || known_encloses(e, a, k, at) != ANSWER_YES)
            return false;
        any = true;
    }
    return any;
}

/* The same by the signs of the amplitudes' remainders; the parameters have values. */
static bool all_signs_enclose(tw_engine *e, expansion *a, const env *at, slong terms)
{
    bool any = false;
    if (a->rest.count > 0)
        return false;
    for (size_t k = 0; k < a->contribution_count; k++) {
        if (!contribution_counts(a, k, false))
            continue;
        if (a->contributions[k].local.count == 0 || !budget_ok(e) ||
            signs_enclose(e, &a->contributions[k].local, a->large, at, terms) != ANSWER_YES)
            return false;
        any = true;
    }
    return any;
}

/* factor times the moduli of the next `more` terms that are not kept, over the contributions that count; NULL on an error. */
static expr *omitted_terms(tw_engine *e, slong kept, slong more, slong factor, expansion *a, const env *values)
{
    expr *sum = expr_int(e, 0);
    if (expansion_extend(e, a, kept + more) != TW_OK)
        return NULL;
    for (size_t k = 0; k < a->contribution_count; k++) {
        term *order = NULL;
        slong found = 0;
        if (!contribution_counts(a, k, false))
            continue;
        if (expansion_order(e, a, k, kept + more, &order, &found) != TW_OK)
            return NULL;
        for (slong j = kept; j < found; j++)
            sum = expr_add(e, sum, expr_mul(e, expr_int(e, factor), bound_modulus(e, term_formula(e, a, k, order[j], values))));
        free(order);
    }
    return sum;
}

static tw_status enclosing_bound(tw_engine *e, remainder_bound *out, expansion *a, const env *values, const char *source)
{
    expr *sum = omitted_terms(e, out->terms, 1, 1, a, values);
    if (TW_BOUND_FACTOR != 1) {
        arb_t x;
        arb_init(x);
        arb_set_d(x, TW_BOUND_FACTOR);
        sum = expr_mul(e, sum, decimal_expr(e, x, 6, true));
        arb_clear(x);
    }
    out->bound = sum;
    out->label = LABEL_PROVED;
    out->manner = "enclosing";
    out->source = base_copy(source);
    return sum ? TW_OK : TW_ERROR;
}

/* ---- panels ---- */

/* scale^r as a formula: constants as a ball into *front, the rest as an expression. */
static tw_status scale_power(tw_engine *e, arb_t front, expr **rest, expr *scale, expr *r, expr *large)
{
    expr *base, *exponent, *constant = expr_int(e, 1), *power = expr_int(e, 0);
    expr *const *parts;
    size_t n = expr_factors(&scale, &parts);
    for (size_t k = 0; k < n; k++) {
        expr_as_power(e, parts[k], &base, &exponent);
        if (base == large)
            power = expr_add(e, power, exponent);
        else
            constant = expr_mul(e, constant, parts[k]);
    }
    *rest = expr_pow(e, large, expr_mul(e, power, r));
    if (!*rest || expr_has(constant, large))
        return engine_fail(e, ERROR_INTERNAL, "the scale is no power of the large parameter");
    return real_ball(e, front, expr_pow(e, constant, r), 128);
}

/* The constants of |factor| into *front, the rest as an expression. */
static tw_status factor_modulus(tw_engine *e, arb_t front, expr **rest, expr *factor, expr *large)
{
    expr *constant = expr_int(e, 1), *moving = expr_int(e, 1);
    expr *const *parts;
    size_t n = expr_factors(&factor, &parts);
    for (size_t k = 0; k < n; k++)
        if (expr_has(parts[k], large))
            moving = expr_mul(e, moving, parts[k]);
        else
            constant = expr_mul(e, constant, parts[k]);
    *rest = bound_modulus(e, moving);
    if (!*rest)
        return TW_ERROR;
    if (real_ball(e, front, constant, 128) != TW_OK)
        return TW_ERROR;
    arb_abs(front, front);
    return TW_OK;
}

static bool from_one(const arb_t S0)
{
    arb_t one;
    bool yes;
    arb_init(one);
    arb_one(one);
    yes = arb_ge(S0, one);
    arb_clear(one);
    return yes;
}

/* The exponent alpha as an exact expression: it comes from exact rationals with small denominators, so it is recognised from a
 * ball of some hundred bits; *exact false: an irrational one, made a little smaller, which is weaker for S >= 1. */
static expr *alpha_expr(tw_engine *e, const power_bound *b, bool *exact)
{
    fmpq_t q;
    expr *made = NULL;
    fmpq_init(q);
    for (slong d = 1; d <= 4096 && !made; d++) {
        arb_t x;
        fmpz_t n;
        arb_init(x);
        fmpz_init(n);
        arb_mul_si(x, b->alpha, d, 256);
        if (arb_get_unique_fmpz(n, x) && mag_cmp_2exp_si(arb_radref(x), -60) < 0) {
            arb_t check;
            arb_init(check);
            arb_sub_fmpz(check, x, n, 256);
            if (arb_contains_zero(check)) {
                fmpq_set_fmpz(q, n);
                fmpq_div_fmpz(q, q, (fmpz[]){d});
                made = expr_fmpq(e, q);
            }
            arb_clear(check);
        }
        fmpz_clear(n);
        arb_clear(x);
    }
    *exact = made != NULL;
    if (!made)
        made = decimal_expr(e, b->alpha, 8, false);
    fmpq_clear(q);
    return made;
}

static bool exponent_exact(tw_engine *e, const power_bound *b)
{
    bool exact;
    return alpha_expr(e, b, &exact) && exact;
}

/* The part that keeps its sign, with coefficients of five digits; *lost: what the rounding costs at most, as a coefficient of
 * S^-alpha for S >= S0. */
static tw_status add_signed_part(tw_engine *e, expr **sum, arb_t lost, const power_bound *b, expr *alpha, expr *scale,
                                 const arb_t front, expr *factor_rest, expr *large)
{
    arb_t power, c, rounded;
    expr *inner = expr_int(e, 0);
    tw_status status = TW_OK;
    arb_init(power);
    arb_init(c);
    arb_init(rounded);
    for (slong j = 0; j < b->signed_count && status == TW_OK; j++) {
        expr *rest, *decimal;
        status = scale_power(e, power, &rest, scale, expr_neg(e, expr_add(e, alpha, expr_int(e, j))), large);
        if (status != TW_OK)
            break;
        arb_mul(power, power, front, 128);
        arb_mul(c, b->signed_part + j, power, 128);
        decimal = decimal_expr(e, c, 5, true);
        inner = expr_add(e, inner, expr_mul(e, decimal, rest));
        if (!inner) {
            status = TW_ERROR;
            break;
        }
        arb_set_fmpq(rounded, expr_number(decimal), 128);
        arb_sub(c, c, rounded, 128);
        arb_div(c, c, power, 128);
        arb_abs(c, c);
        arb_pow_ui(rounded, b->S0, (ulong)j, 128);
        arb_div(c, c, rounded, 128);
        arb_add(lost, lost, c, 128);
    }
    if (status == TW_OK) {
        *sum = expr_add(e, *sum, expr_mul(e, bound_modulus(e, inner), factor_rest));
        status = *sum ? TW_OK : TW_ERROR;
    }
    arb_clear(rounded);
    arb_clear(c);
    arb_clear(power);
    return status;
}

static tw_status add_power_bound(tw_engine *e, expr **sum, const power_bound *b, expr *scale, expr *factor, expr *s0, expr *end_t,
                                 expr *large)
{
    arb_t front, power, c, lost;
    bool exact;
    expr *factor_rest, *alpha = alpha_expr(e, b, &exact), *scale0 = expr_substitute(e, scale, large, s0);
    tw_status status = TW_OK;
    slong K = b->K;
    arb_init(front);
    arb_init(power);
    arb_init(c);
    arb_init(lost);
    status = alpha ? factor_modulus(e, front, &factor_rest, factor, large) : TW_ERROR;
    arb_zero(lost);
    if (status == TW_OK && b->signed_count)
        status = add_signed_part(e, sum, lost, b, alpha, scale, front, factor_rest, large);
    for (slong i = 0; i <= K && status == TW_OK; i++) {
        expr *rest, *inner = expr_int(e, 0);
        status = scale_power(e, power, &rest, scale, expr_neg(e, expr_add(e, alpha, expr_int(e, i))), large);
        if (status != TW_OK)
            break;
        for (slong j = K; j >= 0; j--) {
            expr *log_part = j ? expr_pow(e, expr_call1(e, FUNCTION_LOG, scale), expr_int(e, j)) : expr_int(e, 1);
            if (arb_is_zero(b->table + i * (K + 1) + j))
                continue;
            arb_set(c, b->table + i * (K + 1) + j);
            if (i == 0 && j == 0)
                arb_add(c, c, lost, 128);
            arb_mul(c, c, power, 128);
            arb_mul(c, c, front, 128);
            inner = expr_add(e, inner, expr_mul(e, decimal_expr(e, c, 4, true), log_part));
        }
        *sum = expr_add(e, *sum, expr_mul(e, inner, expr_mul(e, rest, factor_rest)));
        if (!*sum)
            status = TW_ERROR;
    }
    if (status == TW_OK && !arb_is_zero(b->end)) {
        expr *fall = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, expr_sub(e, scale, scale0), end_t)));
        arb_mul(c, b->end, front, 128);
        *sum = expr_add(e, *sum, expr_mul(e, expr_mul(e, decimal_expr(e, c, 4, true), factor_rest), fall));
        if (!*sum)
            status = TW_ERROR;
    }
    arb_clear(lost);
    arb_clear(c);
    arb_clear(power);
    arb_clear(front);
    return status;
}

static void keep_steps(tw_engine *e, remainder_bound *out, const power_bound *b)
{
    bool exact;
    if (b->step_count == 0)
        return;
    out->panel_count = (size_t)b->step_count + 1;
    out->panel_t = base_alloc(out->panel_count * sizeof(char *));
    out->panel_height = base_alloc(out->panel_count * sizeof(char *));
    /* a joint is rounded towards its lower step, so that the higher one loses no width */
    for (slong k = 0; k <= b->step_count; k++) {
        arb_t h;
        arb_init(h);
        if (k < b->step_count)
            arb_set(h, b->step_height + k);
        out->panel_t[k] = decimal_words(b->step_t + k, false);
        if (k > 0 && k < b->step_count && arb_gt(b->step_height + k - 1, h)) {
            free(out->panel_t[k]);
            out->panel_t[k] = decimal_words(b->step_t + k, true);
        }
        out->panel_height[k] = decimal_words(h, true);
        arb_clear(h);
    }
    free(out->panel_t[b->step_count]);
    out->panel_t[b->step_count] = decimal_words(b->step_t + b->step_count, true);
    out->panel_power = expr_sub(e, alpha_expr(e, b, &exact), expr_int(e, 1));
}

/* The exact height of the last end, p(end), as an expression in the problem's own terms. */
static expr *end_height(tw_engine *e, const local_form *l, const env *values)
{
    expr *height = NULL;
    for (size_t k = 0; k < l->count; k++) {
        const branch *b = l->branches + k;
        expr *t;
        if (expr_is_inf(b->end))
            return NULL;
        t = put_values(e, expr_substitute(e, b->p, b->x, b->end), values);
        height = height && height != t ? NULL : t;
        if (!height)
            return NULL;
    }
    return height;
}

/* What is missing from the last group of one power: terms of one power of the logarithm are added up before the modulus is taken,
 * because constants of different lanes may cancel. */
static tw_status add_missing(tw_engine *e, const remainder_bound *out, expansion *a, size_t index, const env *values, slong extra,
                             expr **sum)
{
    enum { LOGS = 16 };
    expr *fronts[LOGS] = {0}, *rest[LOGS] = {0};
    const contribution *c = a->contributions + index;
    term *order = NULL;
    slong found = 0;
    arb_t x;
    tw_status status = expansion_order(e, a, index, out->terms + extra, &order, &found);
    arb_init(x);
    for (slong k = out->terms; k < found && status == TW_OK; k++) {
        const lane *l = c->lanes + order[k].lane;
        expr *whole = expansion_term(e, a, index, order[k]);
        expr *one = put_values(e, expr_mul(e, coefficient_expr(e, &l->c, order[k].n), l->constant), values);
        slong j = FLINT_MIN(l->log_power, LOGS - 1);
        if (!whole || !one)
            status = TW_ERROR;
        else if (!fronts[j])
            fronts[j] = one, rest[j] = expr_div(e, put_values(e, whole, values), one);
        else
            fronts[j] = expr_add(e, fronts[j], one);
    }
    for (int j = 0; j < LOGS && status == TW_OK; j++) {
        expr *size;
        if (!fronts[j])
            continue;
        status = real_ball(e, x, fronts[j], 128);
        arb_abs(x, x);
        size = status == TW_OK ? decimal_expr(e, x, 4, true) : NULL;
        *sum = expr_add(e, *sum, bound_modulus(e, expr_mul(e, expr_mul(e, size, rest[j]), put_values(e, c->prefactor, values))));
        if (!*sum)
            status = TW_ERROR;
    }
    arb_clear(x);
    free(order);
    return status;
}

/* Is this contribution with its one branch (or its pure branches, which go together) all there is? One step function then says
 * everything. */
static bool is_alone(const expansion *a, size_t index)
{
    const local_form *l = &a->contributions[index].local;
    bool alone = a->rest.count == 0;
    for (size_t k = 0; k < a->contribution_count && alone; k++)
        alone = k == index || !contribution_counts(a, k, false);
    for (size_t k = 0; k < l->count && alone && l->count > 1; k++) {
        const branch *b = l->branches + k;
        alone = b->p == b->x || (b->p->kind == EXPR_POWER && b->p->args[0] == b->x);
    }
    return alone;
}

/* One part of a contribution; *extra: terms of the last group that are not kept. */
/* Are the bound's constants of a size that a formula can show? Where an amplitude oscillates far out, they may be beyond all measure. */
static bool writable(const power_bound *b)
{
    enum { LOG2_MOST = 20000 };
    double most = -HUGE_VAL;
    mag_t m;
    mag_init(m);
    for (slong k = 0; k < (b->K + 1) * (b->K + 1); k++) {
        arb_get_mag(m, b->table + k);
        most = mag_is_zero(m) ? most : fmax(most, mag_log2(m));
    }
    arb_get_mag(m, b->end);
    most = mag_is_zero(m) ? most : fmax(most, mag_log2(m));
    for (slong k = 0; k < b->signed_count; k++) {
        arb_get_mag(m, b->signed_part + k);
        most = mag_is_zero(m) ? most : fmax(most, mag_log2(m));
    }
    mag_clear(m);
    return most < LOG2_MOST;
}

static tw_status part_bound(tw_engine *e, remainder_bound *out, expansion *a, size_t index, size_t part, const env *at,
                            const env *values, slong *extra, expr **sum)
{
    const contribution *c = a->contributions + index;
    power_bound b;
    bool made = false;
    char *reason = NULL;
    tw_status status;
    power_bound_init(&b);
    status = power_bound_of(e, &b, a, index, part, at, out->terms, &made, extra, &reason);
    if (status == TW_OK && made && !writable(&b)) {
        made = false;
        reason = base_copy("the bound is too large to be of use");
    }
    if (status == TW_OK && made && (b.K > 0 || !exponent_exact(e, &b)) && !from_one(b.S0)) {
        made = false;
        reason = base_copy("the bound with logarithms or an irrational power holds from scale 1 on only");
    }
    if (status == TW_OK && made) {
        expr *end = b.cut ? NULL : end_height(e, &c->local, values), *large = a->large, *s0 = out->from;
        if (!end && !arb_is_zero(b.end))
            end = decimal_expr(e, b.end_t, 12, false);
        status = add_power_bound(e, sum, &b, put_values(e, c->local.scale, values), put_values(e, c->local.factor, values), s0, end,
                                 large);
        if (is_alone(a, index))
            keep_steps(e, out, &b);
    }
    if (status == TW_OK && !made) {
        out->label = LABEL_ESTIMATED;
        if (!out->reason)
            out->reason = reason, reason = NULL;
    }
    free(reason);
    power_bound_clear(&b);
    return status;
}

static tw_status panel_bound(tw_engine *e, remainder_bound *out, expansion *a, size_t index, const env *at, const env *values,
                             expr **sum)
{
    size_t parts;
    slong extra = 0;
    bool agree = false;
    char *reason = NULL;
    tw_status status = power_bound_count(e, a, index, at, &parts, &reason);
    if (status == TW_OK && parts > 0)
        status = groups_agree(e, a, index, at, out->terms, &agree);
    if (status == TW_OK && !agree) {
        out->label = LABEL_ESTIMATED;
        if (!reason)
            reason = base_copy("the terms do not group as the machine keeps them");
        if (!out->reason)
            out->reason = reason, reason = NULL;
    }
    for (size_t k = 0; k < parts && status == TW_OK && out->label == LABEL_PROVED; k++)
        status = part_bound(e, out, a, index, k, at, values, &extra, sum);
    if (status == TW_OK && out->label == LABEL_PROVED && extra > 0)
        status = add_missing(e, out, a, index, values, extra, sum);
    free(reason);
    return status;
}

/* C * |factor| * exp(-(scale - scale0) * floor) for what no local form covers. */
static tw_status rest_bound(tw_engine *e, remainder_bound *out, expansion *a, const env *at, const env *values, expr **sum)
{
    arb_t C, front;
    bool made;
    expr *scale = put_values(e, a->rest.scale, values), *moving = NULL;
    expr *scale0 = expr_substitute(e, scale, a->large, out->from);
    expr *fall = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, expr_sub(e, scale, scale0), put_values(e, a->rest_floor, values))));
    tw_status status;
    arb_init(C);
    arb_init(front);
    status = rest_modulus(e, C, a, at, &made);
    if (status == TW_OK && !made) {
        out->label = LABEL_ESTIMATED;
        out->reason = base_copy(REST_REASON);
    } else if (status == TW_OK) {
        status = factor_modulus(e, front, &moving, put_values(e, a->rest.factor, values), a->large);
        arb_mul(C, C, front, 128);
        if (status == TW_OK)
            *sum = expr_add(e, *sum, expr_mul(e, expr_mul(e, decimal_expr(e, C, 4, true), moving), fall));
    }
    arb_clear(front);
    arb_clear(C);
    return status == TW_OK && *sum ? TW_OK : TW_ERROR;
}

/* Not proved: three times the first omitted terms, as a formula. */
static tw_status estimated_bound(tw_engine *e, remainder_bound *out, expansion *a, const env *values)
{
    expr *sum = omitted_terms(e, out->terms, 2, 3, a, values);
    if (sum && expr_is_zero(sum)) { /* the series has ended: its terms say nothing about what is left */
        out->label = LABEL_UNKNOWN;
        return TW_OK;
    }
    out->bound = sum;
    out->source = base_copy("three times the next omitted terms");
    return sum ? TW_OK : TW_ERROR;
}

static tw_status panels_everywhere(tw_engine *e, remainder_bound *out, expansion *a, const env *values)
{
    env at;
    expr *sum = expr_int(e, 0);
    tw_status status = TW_OK;
    without_large(&at, values, a->large);
    env_add(&at, a->large, out->from);
    out->label = LABEL_PROVED;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK && out->label == LABEL_PROVED; k++)
        if (contribution_counts(a, k, false) && !(a->contributions[k].terminates && a->exact)) {
            if (a->contributions[k].local.count == 0) {
                out->label = LABEL_ESTIMATED;
                out->reason = base_copy("the contribution has no integral of its own");
            } else {
                status = panel_bound(e, out, a, k, &at, values, &sum);
            }
        }
    if (status == TW_OK && out->label == LABEL_PROVED && a->rest.count > 0)
        status = rest_bound(e, out, a, &at, values, &sum);
    env_free(&at);
    if (status != TW_OK)
        return status;
    if (out->label == LABEL_ESTIMATED)
        return estimated_bound(e, out, a, values);
    out->bound = sum;
    out->source = base_copy("bounds of the amplitude's remainder on panels, computed in ball arithmetic");
    return sum ? TW_OK : TW_ERROR;
}

/* A parameter of the expansion without a value, or NULL. */
static const char *missing_parameter(const expansion *a, const env *at)
{
    expr **symbols;
    size_t n = expr_symbols(a->integral, &symbols);
    const char *name = NULL;
    for (size_t k = 0; k < n && !name; k++) {
        bool known = symbols[k] == a->large;
        for (size_t j = 0; j < at->count; j++)
            known = known || at->symbols[j] == symbols[k];
        if (!known)
            name = symbols[k]->is.name;
    }
    free(symbols);
    return name;
}

static tw_status default_terms(tw_engine *e, remainder_bound *out, expansion *a, const env *values, expr *s0)
{
    env at;
    slong least;
    tw_status status = TW_OK;
    out->terms = a->terms_asked;
    if (!s0 || missing_parameter(a, values))
        return TW_OK;
    without_large(&at, values, a->large);
    env_add(&at, a->large, s0);
    status = best_terms(e, a, &at, a->terms_asked, &out->terms, &least);
    env_free(&at);
    return status;
}

/* With logarithms or irrational powers the bound's form holds from scale 1 on only. */
static bool needs_scale_one(tw_engine *e, const expansion *a, const env *values)
{
    for (size_t k = 0; k < a->contribution_count; k++)
        for (size_t j = 0; j < a->contributions[k].lane_count && contribution_counts(a, k, false); j++) {
            const lane *l = a->contributions[k].lanes + j;
            expr *first = put_values(e, l->first_exponent, values);
            if (l->log_power > 0 || !first || !expr_is_number(first))
                return true;
        }
    return false;
}

/* Moves *from, two digits, to where every scale is at least 1. */
static tw_status raise_to_scale_one(tw_engine *e, expr **from, const expansion *a, const env *values)
{
    arb_t x, scale, one;
    tw_status status;
    arb_init(x);
    arb_init(scale);
    arb_init(one);
    arb_one(one);
    status = real_ball(e, x, *from, 64);
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++)
        for (int j = 0; j < 200 && status == TW_OK && contribution_counts(a, k, false); j++) {
            expr *here = put_values(e, a->contributions[k].local.scale, values);
            if (a->contributions[k].local.count == 0)
                break;
            status = here ? real_ball(e, scale, expr_substitute(e, here, a->large, *from), 64) : TW_ERROR;
            if (status != TW_OK || arb_ge(scale, one))
                break;
            arb_mul_ui(x, x, a->small ? 4 : 5, 64);
            arb_div_ui(x, x, a->small ? 5 : 4, 64);
            *from = decimal_expr(e, x, 2, !a->small);
            status = *from ? TW_OK : TW_ERROR;
        }
    arb_clear(one);
    arb_clear(scale);
    arb_clear(x);
    return status;
}

tw_status remainder_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *at, slong terms, expr *s0)
{
    env values;
    const char *missing;
    tw_status status = TW_OK;
    without_large(&values, at, a->large);
    out->terms = terms;
    out->from = s0;
    status = conditions_at(e, &out->conditions, a, &values);
    if (status == TW_OK && expansion_is_complex(a)) {
        missing = missing_parameter(a, &values);
        if (missing) {
            text words;
            text_init(&words);
            text_addf(&words, "the parameter %s has no value", missing);
            out->reason = text_take(&words);
        } else {
            status = remainder_complex(e, out, a, &values, s0);
        }
        env_free(&values);
        return status;
    }
    if (status == TW_OK && terms < 0)
        status = default_terms(e, out, a, &values, s0);
    missing = missing_parameter(a, &values);
    if (status == TW_OK && a->combined) {
        out->reason = base_copy("combined expansions are bounded at each value that is asked, from the balls of their parts; "
                                "there is no formula for all values");
        out->label = LABEL_UNKNOWN;
    } else if (status != TW_OK) {
    } else if (a->exact && out->terms >= a->terms_asked) {
        out->label = LABEL_EXACT;
        out->bound = expr_int(e, 0);
    } else if (a->remainder) {
        status = split_off_for_all(e, out, a, &values, s0);
    } else if (is_turned(a) && !missing) {
        bool made;
        status = turned_for_all(e, out, a, &values, &made, &out->reason);
        if (status == TW_OK && !made) {
            out->label = LABEL_ESTIMATED;
            if (!s0 && turned_is_complex(a))
                out->from = expr_int(e, 1);
            else if (!s0)
                status = useful_from(e, &out->from, a, &values, out->terms);
            if (status == TW_OK)
                status = estimated_bound(e, out, a, &values);
        }
    } else if (all_enclose(e, a, &values)) {
        status = enclosing_bound(e, out, a, &values,
                                 "the amplitude is completely monotone, so that each partial sum encloses (Olver 1974, ch. 3)");
    } else if (missing) {
        text words;
        text_init(&words);
        text_addf(&words, "the parameter %s has no value; with a value the bound can be computed", missing);
        out->reason = text_take(&words);
        out->label = LABEL_UNKNOWN;
    } else if (all_signs_enclose(e, a, &values, out->terms)) {
        status = enclosing_bound(e, out, a, &values,
                                 "the amplitude less these terms has one sign, less one term more the opposite one, so that the sum "
                                 "encloses (Olver 1974, ch. 3)");
    } else {
        if (!s0 && expansion_extend(e, a, out->terms + 2) != TW_OK)
            status = TW_ERROR;
        if (!s0 && status == TW_OK)
            status = useful_from(e, &out->from, a, &values, out->terms);
        if (!s0 && status == TW_OK && needs_scale_one(e, a, &values))
            status = raise_to_scale_one(e, &out->from, a, &values);
        if (status == TW_OK)
            status = panels_everywhere(e, out, a, &values);
    }
    if (status == TW_OK && out->label == LABEL_PROVED && !conditions_all_sure(&out->conditions))
        out->label = LABEL_CONDITIONAL;
    env_free(&values);
    return status;
}
