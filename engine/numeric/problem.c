/* From a contribution to the machine's problem: numbers for the parameters, one coordinate with integer steps, the exact series as
 * balls. Coefficients come from engine/exact; the tapes from the same expressions. No bounds here. */
#include "engine/numeric/problem.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/numeric/pull.h"

/* What the coefficients are made from: branches with the parameters' values, and where a strand's n-th coefficient goes. */
struct problem_source {
    expr *x;
    size_t count;
    branch *branches; /* in x, end NULL when infinite */
    slong spread;     /* D: x = y^D */
    expr *v;          /* exponent of y in front of A */
    expr *least;      /* least exponent of x in the series of q */
    slong length;     /* coefficients a strand had last time */
    bool made;
    size_t series_count;
    series *series;
    fmpq_t mu;        /* pure: t = x^mu */
    bool constant;    /* not pure: F is a constant */
};

static char *words(const char *format, const char *what)
{
    size_t room = strlen(format) + strlen(what) + 1;
    char *out = base_alloc(room);
    snprintf(out, room, format, what);
    return out;
}

double mag_log2(const mag_t m)
{
    arf_t x, mantissa;
    fmpz_t exponent;
    double out;
    if (mag_is_zero(m))
        return -HUGE_VAL;
    if (mag_is_inf(m))
        return HUGE_VAL;
    arf_init(x);
    arf_init(mantissa);
    fmpz_init(exponent);
    arf_set_mag(x, m);
    arf_frexp(mantissa, exponent, x);
    out = log2(arf_get_d(mantissa, ARF_RND_NEAR)) + fmpz_get_d(exponent);
    fmpz_clear(exponent);
    arf_clear(mantissa);
    arf_clear(x);
    return out;
}

bool problem_is_zero(const problem *p, slong n)
{
    for (slong k = 0; k < p->lanes && n < p->known; k++)
        if (!arb_is_zero(p->f[k] + n))
            return false;
    return n < p->known || p->terminates;
}

void problem_power(arb_t t, const problem *p, const arb_t T, slong bits)
{
    arb_pow_fmpq(t, T, p->m, bits);
}

void problem_alpha(arb_t alpha, const problem *p, slong n, slong bits)
{
    arb_add_si(alpha, p->v, n + 1, bits);
    arb_mul_fmpz(alpha, alpha, fmpq_denref(p->m), bits);
    arb_div_fmpz(alpha, alpha, fmpq_numref(p->m), bits);
}

bool problem_is_beyond(const problem *p, const arf_t y)
{
    return p->ends && arf_cmp(y, arb_midref(p->beyond)) > 0;
}

void problem_t(arb_t t, const problem *p, const arb_t y, slong bits)
{
    acb_t at, value;
    if (p->pure) {
        problem_power(t, p, y, bits);
        return;
    }
    if (problem_is_beyond(p, arb_midref(y))) {
        arb_mul(t, y, p->ratio, bits);
        problem_power(t, p, t, bits);
        return;
    }
    acb_init(at);
    acb_init(value);
    arb_set(acb_realref(at), y);
    tape_eval(value, p->phase, at, false, bits);
    arb_set(t, acb_realref(value));
    acb_clear(value);
    acb_clear(at);
}

/* ---- series ---- */

static void source_forget(struct problem_source *s)
{
    for (size_t k = 0; k < s->series_count; k++)
        series_clear(s->series + k);
    free(s->series);
    s->series = NULL;
    s->series_count = 0;
    s->made = false;
}

static tw_status source_make(problem *p, slong length)
{
    struct problem_source *s = p->source;
    tw_status status = TW_OK;
    if (s->made && s->length >= length)
        return TW_OK;
    source_forget(s);
    s->series = base_alloc(s->count * sizeof *s->series);
    for (size_t b = 0; b < s->count && status == TW_OK; b++) {
        series *one = s->series + s->series_count++;
        series_init(one);
        status = p->pure ? series_at_zero(p->e, one, s->branches[b].q, s->x, length, NULL, NULL)
                         : series_branch(p->e, one, s->branches[b].p, s->branches[b].q, s->x, length, NULL, NULL);
    }
    s->length = length;
    s->made = status == TW_OK;
    return status;
}

/* The index of coefficient j of a strand: n of T^n. False when it is no integer >= 0. */
static bool strand_index(problem *p, const strand *one, slong j, slong *n)
{
    tw_engine *e = p->e;
    struct problem_source *s = p->source;
    expr *exponent = expr_add(e, one->exponent, expr_frac(e, j, one->den)), *power;
    bool fine;
    if (p->pure) /* x^a gives D y^(D a + D - 1) */
        power = expr_sub(e, expr_mul(e, expr_int(e, s->spread), expr_add(e, exponent, expr_int(e, 1))),
                         expr_add(e, s->v, expr_int(e, 1)));
    else /* t^a gives m T^(m (a + 1) - 1) dT */
        power = expr_sub(e, expr_mul(e, expr_fmpq(e, p->m), expr_add(e, exponent, expr_int(e, 1))),
                         expr_add(e, s->v, expr_int(e, 1)));
    fine = power && expr_is_number(power) && fmpz_is_one(fmpq_denref(expr_number(power))) &&
           fmpq_sgn(expr_number(power)) >= 0 && fmpz_cmp_si(fmpq_numref(expr_number(power)), 100000) < 0;
    if (fine)
        *n = fmpz_get_si(fmpq_numref(expr_number(power)));
    return fine;
}

static tw_status strand_add(problem *p, const strand *one, slong count, slong bits)
{
    acb_t constant, value;
    arb_t c;
    tw_status status;
    slong k = one->log_power, stride;
    double D = p->pure ? (double)p->source->spread : 0;
    slong first, second = 0;
    if (k >= PROBLEM_LOGS || !strand_index(p, one, 0, &first) || !strand_index(p, one, 1, &second))
        return engine_fail(p->e, ERROR_UNSUITABLE, "the powers in the series have no common step");
    stride = second - first;
    acb_init(constant);
    acb_init(value);
    arb_init(c);
    status = ball_value(p->e, constant, one->constant, bits);
    /* pure: dx = D y^(D-1) dy, log(x)^k = D^k log(y)^k; else F = m G t^(1-(v+1)/m), G's log(t) powers do not occur */
    if (p->pure) {
        fmpz_t power;
        fmpz_init(power);
        fmpz_set_si(power, (slong)D);
        fmpz_pow_ui(power, power, (ulong)k + 1);
        acb_mul_fmpz(constant, constant, power, bits);
        fmpz_clear(power);
    } else {
        acb_mul_fmpz(constant, constant, fmpq_numref(p->m), bits);
        acb_div_fmpz(constant, constant, fmpq_denref(p->m), bits);
    }
    for (slong j = 0; status == TW_OK && j < one->c.count; j++) {
        slong n = first + j * stride;
        if (n >= count)
            break;
        if (coefficient_is_zero(&one->c, j))
            continue;
        if (one->c.q) {
            arb_set_fmpq(c, one->c.q + j, bits);
        } else {
            status = ball_value(p->e, value, one->c.x[j], bits);
            arb_set(c, acb_realref(value));
        }
        arb_mul(c, c, acb_realref(constant), bits);
        arb_add(p->f[k] + n, p->f[k] + n, c, bits);
        p->lanes = FLINT_MAX(p->lanes, k + 1);
        if (!budget_ok(p->e))
            status = TW_ERROR;
    }
    arb_clear(c);
    acb_clear(value);
    acb_clear(constant);
    return status;
}

tw_status problem_coefficients(problem *p, slong count, slong bits)
{
    tw_status status;
    if (count <= p->known && bits <= p->bits)
        return TW_OK;
    count = FLINT_MAX(count, p->known);
    bits = FLINT_MAX(bits, p->bits);
    if (!p->terminates || !p->source->made) {
        status = source_make(p, p->source->constant ? 4 : count + 1);
        if (status != TW_OK)
            return status;
    }
    for (slong k = 0; k < PROBLEM_LOGS; k++) {
        if (p->f[k])
            _arb_vec_clear(p->f[k], p->known);
        p->f[k] = _arb_vec_init(count);
    }
    p->known = count;
    p->bits = bits;
    p->terminates = true;
    status = TW_OK;
    for (size_t b = 0; b < p->source->series_count && status == TW_OK; b++) {
        const series *one = p->source->series + b;
        p->terminates = p->terminates && one->terminates;
        for (size_t k = 0; k < one->count && status == TW_OK; k++) {
            slong last;
            status = strand_add(p, one->strands + k, count, bits);
            if (status == TW_OK && one->terminates && strand_index(p, one->strands + k, one->strands[k].c.count - 1, &last) &&
                last >= count)
                p->terminates = false;
        }
    }
    p->terminates = p->terminates || p->source->constant;
    return status;
}

/* ---- the coordinate ---- */

static slong lcm_step(slong a, slong b)
{
    return a / (slong)n_gcd((ulong)a, (ulong)b) * b;
}

/* D with all exponents of x in the strands in one class modulo 1/D; least: the exponent in front. False: no such D. */
static bool common_step(tw_engine *e, const series *list, size_t count, slong *D, expr **least)
{
    for (size_t b = 0; b < count; b++)
        for (size_t k = 0; k < list[b].count; k++) {
            const strand *s = list[b].strands + k;
            expr *d;
            *D = lcm_step(*D, s->den);
            if (!*least) {
                *least = s->exponent;
                continue;
            }
            d = expr_sub(e, s->exponent, *least);
            if (!d || !expr_is_number(d) || fmpz_cmp_si(fmpq_denref(expr_number(d)), 64) > 0)
                return false;
            *D = lcm_step(*D, fmpz_get_si(fmpq_denref(expr_number(d))));
            if (fmpq_sgn(expr_number(d)) < 0)
                *least = s->exponent;
        }
    return *least && *D <= 64;
}

static bool find_step(problem *p, slong *D, char **reason)
{
    struct problem_source *s = p->source;
    *D = 1;
    if (source_make(p, 6) != TW_OK)
        return false;
    if (!common_step(p->e, s->series, s->series_count, D, &s->least))
        *reason = base_copy("the powers in the series at the critical point have no common step");
    source_forget(s);
    if (!*reason && !p->pure) { /* the coordinate must suit p and q in x, not only G in t */
        series both[2];
        bool fine;
        *D = 1;
        series_init(both);
        series_init(both + 1);
        fine = series_at_zero(p->e, both, s->branches[0].q, s->x, 6, NULL, NULL) == TW_OK &&
               series_at_zero(p->e, both + 1, s->branches[0].p, s->x, 6, NULL, NULL) == TW_OK;
        if (fine) {
            expr *own = NULL;
            slong steps = 1;
            s->least = NULL;
            if (!common_step(p->e, both, 1, D, &s->least) || !common_step(p->e, both + 1, 1, &steps, &own) ||
                !expr_is_number(own))
                *reason = base_copy("the powers in the series at the critical point have no common step");
            else {
                *D = lcm_step(lcm_step(*D, steps), fmpz_get_si(fmpq_denref(expr_number(own))));
                fmpq_mul_si(p->m, expr_number(own), *D);
                if (!fmpz_is_one(fmpq_denref(p->m)) || *D > 64)
                    *reason = base_copy("the phase has no whole power in the coordinate");
            }
        }
        series_clear(both);
        series_clear(both + 1);
        if (!fine)
            return false;
    }
    return !*reason;
}

static tape *tape_in(problem *p, expr *f)
{
    expr *const vars[] = {p->y};
    return f ? tape_new(p->e, f, vars, 1) : NULL;
}

/* Does f not depend on y, as far as the normal form of its derivative shows? */
static bool is_constant(problem *p, expr *f)
{
    expr *positive[] = {p->y};
    expr *slope = f ? expr_normal(p->e, expr_derivative(p->e, f, p->y), positive, 1) : NULL;
    return slope && expr_is_zero(slope);
}

/* The regular parts of each sheet: A y^-v as a polynomial in log(y). v is what every sheet can give. */
static bool sheets_regular(problem *p, char **reason)
{
    tw_engine *e = p->e;
    /* the exponent of the series' first term, which the written powers may exceed: y/(exp(y) - 1) */
    expr *D = expr_int(e, p->source->spread);
    expr *L = expr_fresh(e, "L");
    expr *v = expr_sub(e, expr_mul(e, D, expr_add(e, p->source->least, expr_int(e, 1))), expr_int(e, 1));
    expr **powers = base_alloc(p->sheet_count * sizeof *powers), **rests = base_alloc(p->sheet_count * sizeof *rests);
    bool fine = true;
    for (size_t b = 0; b < p->sheet_count && fine; b++) {
        expr *d;
        power_pull(e, p->sheets[b].amplitude, p->y, L, powers + b, rests + b);
        fine = rests[b] != NULL;
        if (fine && v) {
            d = expr_sub(e, powers[b], v);
            if (!d || !expr_is_number(d))
                *reason = base_copy("the branches have powers that do not fit together");
            else if (fmpq_sgn(expr_number(d)) < 0)
                v = powers[b];
        } else if (fine) {
            v = powers[b];
        }
        fine = fine && !*reason;
    }
    for (size_t b = 0; b < p->sheet_count && fine; b++) {
        sheet *s = p->sheets + b;
        expr **parts = NULL, *whole = expr_int(e, 0);
        slong degree = 0;
        expr *rest = expr_mul(e, rests[b], expr_pow(e, p->y, expr_sub(e, powers[b], v)));
        if (!rest)
            fine = false;
        else if (expr_polynomial(e, rest, L, PROBLEM_LOGS - 1, &parts, &degree) != TW_OK) {
            if (e->error.kind != ERROR_NONE)
                fine = false;
            else
                *reason = base_copy("the amplitude is no polynomial in the logarithm");
        }
        fine = fine && !*reason;
        for (slong k = 0; fine && k <= degree; k++) {
            if (expr_is_zero(parts[k]))
                continue;
            s->regular_expr[k] = parts[k];
            s->regular[k] = tape_in(p, parts[k]);
            fine = s->regular[k] != NULL;
            whole = expr_add(e, whole, expr_mul(e, parts[k], expr_pow(e, expr_call1(e, FUNCTION_LOG, p->y), expr_int(e, k))));
            p->lanes = FLINT_MAX(p->lanes, k + 1);
        }
        if (fine && !p->pure && p->lanes > 1)
            *reason = base_copy("logarithms at the critical point of a general phase");
        if (fine && !*reason) {
            expr *value = whole;
            if (!p->pure) { /* F = m A / p' * p^(1 - (v+1)/m) */
                expr *m = expr_fmpq(e, p->m);
                expr *power = expr_sub(e, expr_int(e, 1), expr_div(e, expr_add(e, v, expr_int(e, 1)), m));
                value = expr_mul(e, expr_mul(e, m, s->amplitude),
                                 expr_mul(e, expr_pow(e, expr_derivative(e, p->phase_expr, p->y), expr_int(e, -1)),
                                          expr_pow(e, p->phase_expr, power)));
            }
            if (!p->pure && p->sheet_count == 1)
                p->source->constant = is_constant(p, value);
            s->value = tape_in(p, value);
            fine = s->value != NULL;
        }
        free(parts);
        fine = fine && !*reason;
    }
    p->source->v = p->v_expr = v;
    free(powers);
    free(rests);
    return fine;
}

static bool real_value(problem *p, arb_t out, expr *f, slong bits)
{
    acb_t z;
    bool fine;
    acb_init(z);
    fine = f && ball_value(p->e, z, f, bits) == TW_OK && acb_is_finite(z) && arb_contains_zero(acb_imagref(z));
    arb_set(out, acb_realref(z));
    acb_clear(z);
    return fine;
}

/* Is A analytic on a small disc around its end? */
static bool regular_end(problem *p, const sheet *one)
{
    acb_t at, value;
    mag_t r;
    tape *t = tape_in(p, one->amplitude);
    bool fine = t != NULL;
    acb_init(at);
    acb_init(value);
    mag_init(r);
    if (fine) {
        arb_get_mag(r, one->end_y);
        mag_mul_2exp_si(r, r, -16);
        arb_set(acb_realref(at), one->end_y);
        mag_add(arb_radref(acb_realref(at)), arb_radref(acb_realref(at)), r);
        mag_set(arb_radref(acb_imagref(at)), r);
        tape_eval(value, t, at, true, 128);
        fine = acb_is_finite(value);
    }
    mag_clear(r);
    acb_clear(value);
    acb_clear(at);
    tape_free(t);
    return fine;
}

/* The end of the sheet and its height; false, with the reason, where they have no value. */
static bool sheet_end(problem *p, sheet *one, expr *end, slong D, char **reason)
{
    enum { END_BITS = 320 };
    tw_engine *e = p->e;
    one->end = expr_pow(e, end, expr_frac(e, 1, D));
    if (!real_value(p, one->end_y, one->end, END_BITS) || !arb_is_positive(one->end_y)) {
        *reason = base_copy("an end of the path could not be evaluated");
        return false;
    }
    problem_t(one->end_t, p, one->end_y, END_BITS);
    if (!arb_is_finite(one->end_t) || !arb_is_positive(one->end_t)) {
        *reason = base_copy("the phase at an end of the path could not be evaluated");
        return false;
    }
    return true;
}

static bool sheets_make(problem *p, char **reason)
{
    tw_engine *e = p->e;
    struct problem_source *s = p->source;
    slong D = s->spread;
    expr *x = expr_pow(e, p->y, expr_int(e, D));
    expr *positive[] = {p->y};
    p->sheet_count = s->count;
    p->sheets = base_alloc(s->count * sizeof *p->sheets);
    memset(p->sheets, 0, s->count * sizeof *p->sheets);
    for (size_t b = 0; b < s->count; b++) {
        arb_init(p->sheets[b].end_y);
        arb_init(p->sheets[b].end_t);
    }
    p->phase_expr = expr_normal(e, expr_substitute(e, s->branches[0].p, s->x, x), positive, 1);
    if (!p->phase_expr)
        return false;
    if (!p->pure) {
        p->phase = tape_in(p, p->phase_expr);
        p->slope = tape_in(p, expr_derivative(e, p->phase_expr, p->y));
        if (!p->phase || !p->slope)
            return false;
    }
    for (size_t b = 0; b < s->count; b++) {
        sheet *one = p->sheets + b;
        expr *q = expr_mul(e, expr_substitute(e, s->branches[b].q, s->x, x), expr_mul(e, expr_int(e, D), expr_pow(e, p->y, expr_int(e, D - 1))));
        one->amplitude = expr_normal(e, q, positive, 1);
        if (!one->amplitude)
            return false;
        if (s->branches[b].end) {
            if (!sheet_end(p, one, s->branches[b].end, D, reason))
                return false;
            if (s->count == 1 && !regular_end(p, one)) {
                one->tail_to = s->branches[b].end;
                one->tail_from = expr_mul(e, one->tail_to, expr_frac(e, 7, 8));
                p->tail_x = s->x;
                p->tail_q = s->branches[b].q;
                p->tail_p = s->branches[b].p;
                if (!sheet_end(p, one, one->tail_from, D, reason))
                    return false;
            }
        }
    }
    return sheets_regular(p, reason);
}

/* Beyond the last end the coordinate is continued linearly in T. */
static void continue_coordinate(problem *p)
{
    enum { END_BITS = 320 };
    const sheet *last = p->sheets;
    fmpq_t inverse;
    for (size_t b = 0; b < p->sheet_count; b++) {
        if (!p->sheets[b].end)
            return;
        if (arf_cmp(arb_midref(p->sheets[b].end_y), arb_midref(last->end_y)) > 0)
            last = p->sheets + b;
    }
    fmpq_init(inverse);
    fmpq_inv(inverse, p->m);
    arb_pow_fmpq(p->ratio, last->end_t, inverse, END_BITS);
    arb_div(p->ratio, p->ratio, last->end_y, END_BITS);
    arb_set(p->beyond, last->end_y);
    p->ends = true;
    fmpq_clear(inverse);
}

/* ---- from the contribution ---- */

static bool has_unit(expr *a)
{
    if (a->kind == EXPR_CONSTANT)
        return a->is.constant == CONSTANT_I;
    for (uint32_t k = 0; k < a->count; k++)
        if (has_unit(a->args[k]))
            return true;
    return false;
}

static expr *with_values(tw_engine *e, expr *a, const env *at, expr *large)
{
    for (size_t k = 0; a && k < at->count; k++)
        if (at->symbols[k] != large)
            a = expr_substitute(e, a, at->symbols[k], at->values[k]);
    return a;
}

/* Only x may be left free. */
static bool only_symbol(expr *a, expr *x, char **reason)
{
    expr **symbols;
    size_t n = expr_symbols(a, &symbols);
    for (size_t k = 0; k < n && !*reason; k++)
        if (symbols[k] != x)
            *reason = words("the parameter %s has no value", symbols[k]->is.name);
    free(symbols);
    return !*reason;
}

static bool pure_power(tw_engine *e, expr *p, expr *x, fmpq_t mu)
{
    expr *base, *exponent;
    expr_as_power(e, p, &base, &exponent);
    if (base != x || !expr_is_number(exponent) || fmpq_sgn(expr_number(exponent)) <= 0)
        return false;
    fmpq_set(mu, expr_number(exponent));
    return true;
}

static bool source_read(problem *p, const local_form *l, const env *at, expr *large, char **reason)
{
    tw_engine *e = p->e;
    struct problem_source *s = p->source;
    expr *positive[] = {s->x};
    fmpq_t mu;
    bool fine = true;
    fmpq_init(mu);
    s->branches = base_alloc(l->count * sizeof *s->branches);
    p->pure = true;
    for (size_t b = 0; b < l->count && fine; b++) {
        branch *one = s->branches + b;
        const branch *from = l->branches + b;
        one->x = s->x;
        one->p = with_values(e, expr_substitute(e, from->p, from->x, s->x), at, large);
        one->q = expr_normal(e, with_values(e, expr_substitute(e, from->q, from->x, s->x), at, large), positive, 1);
        one->end = expr_is_inf(from->end) ? NULL : with_values(e, from->end, at, large);
        s->count++;
        fine = one->p && one->q && (one->end || expr_is_inf(from->end)) && only_symbol(one->p, s->x, reason) &&
               only_symbol(one->q, s->x, reason) && (!one->end || only_symbol(one->end, s->x, reason));
        if (fine && (has_unit(one->p) || has_unit(one->q)))
            *reason = base_copy("the integrand is complex");
        if (fine && !pure_power(e, one->p, s->x, mu))
            p->pure = false;
        if (fine && p->pure && b > 0 && !fmpq_equal(mu, s->mu))
            p->pure = false;
        if (fine && b == 0)
            fmpq_set(s->mu, mu);
        fine = fine && !*reason;
    }
    if (fine && !p->pure && l->count > 1)
        *reason = base_copy("several branches of a general phase");
    fmpq_clear(mu);
    return fine && !*reason;
}

/* The first power of the series is a whole number of steps above the factor in front: sqrt(1 - exp(-x)) has no such factor. */
static bool starts_whole(const problem *p)
{
    tw_engine *e = p->e;
    if (!p->pure)
        return true;
    expr *first = expr_mul(e, expr_int(e, p->source->spread), expr_add(e, p->source->least, expr_int(e, 1)));
    expr *away = expr_sub(e, first, expr_add(e, p->v_expr, expr_int(e, 1)));
    return away && (!expr_is_number(away) || fmpz_is_one(fmpq_denref(expr_number(away))));
}

static bool problem_make(problem *p, const local_form *l, const env *at, expr *large, char **reason)
{
    slong D;
    fmpq_t inverse;
    if (!source_read(p, l, at, large, reason) || !find_step(p, &D, reason))
        return false;
    p->source->spread = D;
    if (p->pure)
        fmpq_mul_si(p->m, p->source->mu, D);
    if (!sheets_make(p, reason) || !real_value(p, p->v, p->v_expr, 400))
        return false;
    if (!starts_whole(p)) {
        *reason = base_copy("the amplitude begins with a fractional power that is hidden in a root");
        return false;
    }
    if (!p->pure)
        continue_coordinate(p);
    fmpq_init(inverse);
    fmpq_inv(inverse, p->m);
    arb_set_fmpq(p->ell_factor, inverse, 400);
    fmpq_clear(inverse);
    return true;
}

tw_status problem_new(tw_engine *e, problem **out, const local_form *l, expr *large, const env *at, char **reason)
{
    problem *p = base_alloc(sizeof *p);
    *out = NULL;
    *reason = NULL;
    memset(p, 0, sizeof *p);
    p->e = e;
    p->y = expr_fresh(e, "y");
    p->lanes = 1;
    fmpq_init(p->m);
    arb_init(p->v);
    arb_init(p->ell_factor);
    arb_init(p->beyond);
    arb_init(p->ratio);
    p->source = base_alloc(sizeof *p->source);
    memset(p->source, 0, sizeof *p->source);
    fmpq_init(p->source->mu);
    p->source->x = expr_fresh(e, "x");
    if (p->y && p->source->x && problem_make(p, l, at, large, reason)) {
        *out = p;
        return TW_OK;
    }
    problem_free(p);
    if (*reason) {
        engine_forgive(e);
        return TW_OK;
    }
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE) {
        *reason = base_copy(e->error.words ? e->error.words : "the series could not be made");
        engine_forgive(e);
        return TW_OK;
    }
    if (e->error.kind == ERROR_NONE)
        *reason = base_copy("a value could not be computed");
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

void problem_free(problem *p)
{
    if (!p)
        return;
    source_forget(p->source);
    free(p->source->branches);
    fmpq_clear(p->source->mu);
    free(p->source);
    for (size_t b = 0; b < p->sheet_count; b++) {
        for (slong k = 0; k < PROBLEM_LOGS; k++)
            tape_free(p->sheets[b].regular[k]);
        tape_free(p->sheets[b].value);
        arb_clear(p->sheets[b].end_y);
        arb_clear(p->sheets[b].end_t);
    }
    free(p->sheets);
    for (slong k = 0; k < PROBLEM_LOGS; k++)
        if (p->f[k])
            _arb_vec_clear(p->f[k], p->known);
    tape_free(p->phase);
    tape_free(p->slope);
    fmpq_clear(p->m);
    arb_clear(p->v);
    arb_clear(p->ell_factor);
    arb_clear(p->beyond);
    arb_clear(p->ratio);
    free(p);
}
