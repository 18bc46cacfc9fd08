/* Remainders of oscillating integrals. The one idea: at a point the remainder is a number, the integral less the terms,
 * and certified quadrature encloses it to some digits however small it is; for all values it is one more integration by
 * parts, and then the total variation, which is one number free of the large parameter. */
#include "engine/numeric/turned.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/growth.h"
#include "engine/method/phase.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/terms.h"

bool is_turned(const expansion *a)
{
    return a->made_by == &method_phase;
}

static bool is_fatal(const tw_engine *e)
{
    error_kind kind = e->error.kind;
    return kind == ERROR_TIME || kind == ERROR_MEMORY || kind == ERROR_INTERRUPT || kind == ERROR_INTERNAL;
}

/* ---- at a point ---- */

/* The integral less the first `terms` terms of each contribution. */
static expr *rest_expression(tw_engine *e, expansion *a, slong terms)
{
    expr *rest = a->integral;
    for (size_t k = 0; k < a->contribution_count; k++) {
        term *order = NULL;
        slong found = 0;
        if (!contribution_counts(a, k, false)) continue;
        if (expansion_order(e, a, k, terms, &order, &found) != TW_OK) return NULL;
        for (slong n = 0; n < found; n++)
            rest = expr_sub(e, rest, expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, order[n])));
        free(order);
    }
    return rest;
}

tw_status turned_at(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms)
{
    enum { DIGITS = 6 };
    if (expansion_extend(e, a, terms + 1) != TW_OK) return TW_ERROR;
    expr *rest = rest_expression(e, a, terms);
    if (!rest) return TW_ERROR;
    acb_t value;
    acb_init(value);
    tw_status status = quadrature(e, value, rest, at, DIGITS, true, NULL);
    out->label = LABEL_PROVED;
    if (status == TW_OK && !arb_contains_zero(acb_imagref(value)))
        status = engine_fail(e, ERROR_UNAVAILABLE, "the expansion is complex there: expand its real and "
                                                   "imaginary parts, with cos and sin in place of exp");
    arb_set(out->error, acb_realref(value));
    if (TW_BOUND_FACTOR != 1) arb_mul_2exp_si(out->error, out->error, -2);
    if (status != TW_OK && !is_fatal(e) && e->error.kind != ERROR_UNAVAILABLE) {
        text words;
        text_init(&words);
        text_addf(&words, "the integral could not be enclosed there: %s", e->error.words);
        engine_forgive(e);
        out->reason = text_take(&words);
        out->label = LABEL_ESTIMATED;
        arb_indeterminate(out->error);
        status = TW_OK;
    }
    acb_clear(value);
    return status;
}

/* ---- complex values ---- */

static bool holds_i(expr *a)
{
    if (expr_is_constant(a, CONSTANT_I)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_i(a->args[k])) return true;
    return false;
}

bool turned_is_complex(const expansion *a)
{
    if (!is_turned(a)) return false;
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        if (holds_i(c->prefactor)) return true;
        for (size_t n = 0; n < c->lane_count; n++)
            if (holds_i(c->lanes[n].constant)) return true;
    }
    return false;
}

tw_status turned_value(tw_engine *e, acb_t value, expansion *a, const env *at, slong terms, slong bits)
{
    enum { DIGITS = 6 };
    if (expansion_extend(e, a, terms + 1) != TW_OK) return TW_ERROR;
    expr *rest = rest_expression(e, a, terms), *sum = put_values(e, expr_sub(e, a->integral, rest), at);
    if (!rest || !sum) return TW_ERROR;
    acb_t left;
    acb_init(left);
    tw_status status = quadrature(e, left, rest, at, DIGITS, true, NULL);
    if (status == TW_OK) status = ball_value(e, value, sum, bits);
    acb_add(value, value, left, bits);
    acb_clear(left);
    return status;
}

/* ---- total variation ---- */

typedef struct piece {
    double from, to, bound; /* bound: greatest |h| times the width */
} piece;

static double piece_bound_of(tape *values, double from, double to)
{
    acb_t x, v;
    arf_t top;
    acb_init(x);
    acb_init(v);
    arf_init(top);
    arb_set_d(acb_realref(x), 0.5 * (from + to));
    /* room for the rounding of the middle: neighbouring pieces leave no gap */
    double room = 0x1p-50 * fmax(fabs(from), fabs(to)) + 1e-300;
    mag_set_d(arb_radref(acb_realref(x)), 0.5 * (to - from) * (1 + 1e-12) + room);
    tape_eval(v, values, x, true, 64);
    double out = INFINITY;
    if (acb_is_finite(v)) {
        acb_get_abs_ubound_arf(top, v, 30);
        out = arf_get_d(top, ARF_RND_UP) * (to - from) * (1 + 1e-12);
    }
    acb_clear(x);
    acb_clear(v);
    arf_clear(top);
    return out;
}

/* An upper bound of int_from^to |h| dx, 0 < to - from: pieces are halved where they weigh most. INFINITY: none found.
 */
static double variation_on(tw_engine *e, tape *values, double from, double to)
{
    enum { PIECES = 3000 };
    piece *list = base_alloc((PIECES + 2) * sizeof *list);
    size_t count = 1;
    list[0] = (piece){from, to, piece_bound_of(values, from, to)};
    while (count < PIECES && budget_ok(e)) {
        size_t worst = 0;
        double sum = 0;
        for (size_t k = 0; k < count; k++) {
            sum += list[k].bound;
            if (list[k].bound > list[worst].bound) worst = k;
        }
        if (list[worst].bound <= 0.002 * sum) break;
        piece p = list[worst];
        double middle = 0.5 * (p.from + p.to);
        if (middle <= p.from || middle >= p.to) break;
        list[worst] = (piece){p.from, middle, piece_bound_of(values, p.from, middle)};
        list[count++] = (piece){middle, p.to, piece_bound_of(values, middle, p.to)};
    }
    double sum = 0;
    for (size_t k = 0; k < count; k++) sum += list[k].bound;
    free(list);
    return sum * (1 + 1e-9);
}

/* The same over (from, inf): up to a power of 2, and the rest by the growth of h. */
static double variation_to_infinity(tw_engine *e, tape *values, expr *h, expr *x, double from)
{
    growth_bound g;
    growth_bound_init(&g);
    arb_t log_tail;
    arb_init(log_tail);
    double sum = INFINITY;
    if (growth_at_infinity(e, &g, h, x, NULL, fmax(64, 2 * fabs(from))) == TW_OK && growth_integrable(&g) &&
        growth_tail(e, log_tail, &g) == TW_OK) {
        arf_t top;
        arf_init(top);
        arb_exp(log_tail, log_tail, 64);
        arb_get_ubound_arf(top, log_tail, 30);
        sum = arf_get_d(top, ARF_RND_UP);
        double X = arf_get_d(g.X, ARF_RND_UP) * (1 + 1e-12), start = from;
        for (double width = 1; start < X && isfinite(sum) && budget_ok(e); width *= 4) {
            double end = fmin(start + width, X);
            sum += variation_on(e, values, start, end);
            start = end;
        }
        arf_clear(top);
    }
    arb_clear(log_tail);
    growth_bound_clear(&g);
    if (!is_fatal(e)) engine_forgive(e);
    return sum;
}

/* An upper bound of |f| at a point where f is analytic; INFINITY else. */
static double modulus_at(tape *values, const arb_t place)
{
    acb_t x, v;
    arf_t top;
    acb_init(x);
    acb_init(v);
    arf_init(top);
    arb_set(acb_realref(x), place);
    mag_t little;
    mag_init(little);
    mag_set_ui_2exp_si(little, 1, -40);
    arb_add_error_mag(acb_realref(x), little);
    arb_add_error_mag(acb_imagref(x), little);
    tape_eval(v, values, x, true, 64);
    acb_get_abs_ubound_arf(top, v, 30);
    double out = acb_is_finite(v) ? arf_get_d(top, ARF_RND_UP) : INFINITY;
    mag_clear(little);
    acb_clear(x);
    acb_clear(v);
    arf_clear(top);
    return out;
}

/* |g| at the finite ends and the variation of g between. */
static double ends_and_variation(tw_engine *e, const phase_reading *r, expr *g)
{
    expr *h = expr_derivative(e, g, r->x);
    tape *values = g ? tape_new(e, g, &r->x, 1) : NULL, *slopes = h ? tape_new(e, h, &r->x, 1) : NULL;
    bool low = !expr_is_minus_inf(r->from), high = !expr_is_inf(r->to);
    double sum = values && slopes ? 0 : INFINITY, a = 0, b = 0;
    arb_t place;
    arb_init(place);
    for (int side = 0; side < 2 && isfinite(sum); side++) {
        if (side ? !high : !low) continue;
        if (real_ball(e, place, side ? r->to : r->from, 128) != TW_OK) {
            sum = INFINITY;
            break;
        }
        sum += modulus_at(values, place);
        *(side ? &b : &a) = arf_get_d(arb_midref(place), side ? ARF_RND_CEIL : ARF_RND_FLOOR);
    }
    if (low) a = a - 1e-15 * fabs(a); /* outside of the end as it was rounded */
    if (high) b = b + 1e-15 * fabs(b);
    if (isfinite(sum) && low && high) sum += variation_on(e, slopes, a, b);
    else if (isfinite(sum)) {
        expr *x = r->x, *mirrored = expr_substitute(e, h, x, expr_neg(e, x));
        if (high || !low) { /* down to -inf */
            tape *back = mirrored ? tape_new(e, mirrored, &x, 1) : NULL;
            sum += back ? variation_to_infinity(e, back, mirrored, x, high ? -b : 0) : INFINITY;
            tape_free(back);
        }
        if (low || !high) sum += variation_to_infinity(e, slopes, h, x, low ? a : 0);
    }
    arb_clear(place);
    tape_free(values);
    tape_free(slopes);
    return sum;
}

/* ---- for all values ---- */

enum { MORE = 8 }; /* terms of one power in different lanes, at most */

/* D^n q / p', D f = (f/p')'. */
static expr *parts_function(tw_engine *e, const phase_reading *r, expr *q, slong n)
{
    expr *slope = expr_derivative(e, r->p, r->x), *f = q;
    for (slong k = 0; k < n && f; k++) f = expr_derivative(e, expr_div(e, f, slope), r->x);
    return expr_div(e, f, slope);
}

/* Do D^n q / p', n = 0 .. most, tend to 0 at the infinite ends? */
static bool ends_vanish(tw_engine *e, const phase_reading *r, slong most)
{
    bool yes = true;
    for (int side = 0; side < 2; side++) {
        if (side ? !expr_is_inf(r->to) : !expr_is_minus_inf(r->from)) continue;
        for (size_t k = 0; k < r->part_count; k++)
            for (slong n = 0; n <= most && yes; n++) {
                expr *g = parts_function(e, r, r->parts[k].q, n);
                if (g && side == 0) g = expr_substitute(e, g, r->x, expr_neg(e, r->x));
                growth_bound b;
                growth_bound_init(&b);
                yes = g && growth_at_infinity(e, &b, g, r->x, NULL, 16) == TW_OK &&
                      (arb_is_positive(b.b) || (fmpq_is_zero(b.c) && fmpq_sgn(b.a) < 0));
                growth_bound_clear(&b);
            }
    }
    return yes;
}

/* The greatest M such that all terms up to scale^-M are among the first `terms` of their contributions; the moduli of
 * kept terms behind it, and of the terms of order M + 1, which are not all kept, into *extra. */
static tw_status count_orders(tw_engine *e, expansion *a, const phase_reading *r, slong terms, slong *M, expr **extra)
{
    *M = WORD_MAX;
    for (int pass = 0; pass < 2; pass++)
        for (size_t k = 0; k < a->contribution_count; k++) {
            const contribution *c = &a->contributions[k];
            term *order = NULL;
            slong found = 0;
            if (expansion_order(e, a, k, terms + MORE, &order, &found) != TW_OK) return TW_ERROR;
            for (slong n = 0; n < found; n++) {
                const lane *l = &c->lanes[order[n].lane];
                fmpq_t q;
                fmpq_init(q);
                fmpq_mul_si(q, l->step, order[n].n);
                fmpq_add(q, q, expr_number(l->first_exponent));
                fmpq_div(q, q, r->power);
                slong m = fmpz_is_one(fmpq_denref(q)) ? -fmpz_get_si(fmpq_numref(q)) : 0;
                fmpq_clear(q);
                if (pass == 0 && n >= terms && m - 1 < *M) *M = m - 1;
                if (pass == 1 && ((n < terms && m > *M) || (n >= terms && m == *M + 1))) {
                    expr *one = expr_mul(e, c->prefactor, expansion_term(e, a, k, order[n]));
                    *extra = expr_add(e, *extra, bound_modulus(e, one));
                }
            }
            free(order);
        }
    return *extra ? TW_OK : TW_ERROR;
}

static tw_status say(char **reason, const char *words)
{
    *reason = base_copy(words);
    return TW_OK;
}

static expr *rounded_up(tw_engine *e, double x)
{
    int exponent = x > 0 ? (int)floor(log10(x)) - 3 : 0;
    double mantissa = ceil(x / pow(10, exponent) * (1 + 1e-12)) + 1;
    return expr_mul(e, expr_int(e, (slong)mantissa), expr_pow(e, expr_int(e, 10), expr_int(e, exponent)));
}

tw_status turned_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *values, bool *made, char **reason)
{
    enum { ORDERS = 14 };
    *made = false;
    *reason = NULL;
    phase_reading r;
    char *why = NULL;
    phase_reading_init(&r);
    expr *integral = put_values(e, a->integral, values);
    answer read = integral ? phase_read(e, &r, integral, &why) : ANSWER_NO;
    free(why);
    tw_status status = e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    bool stationary = false;
    for (size_t k = 0; k < r.point_count; k++) stationary = stationary || r.stationary[k];
    slong M = 0;
    expr *extra = expr_int(e, 0);
    if (status == TW_OK && read != ANSWER_YES) {
        status = say(reason, "it is a sum with other integrals: expand each by itself; at one value `evaluate` proves "
                             "one");
    } else if (status == TW_OK && stationary) {
        status = say(reason, "a stationary point counts: for all values no bound of its turned branch is known; at one "
                             "value `evaluate` proves one");
    } else if (status == TW_OK && expr_has(r.outside, r.large)) {
        status = say(reason, "the factor in front of the integral holds the large parameter: expand the integral "
                             "alone");
    } else if (status == TW_OK) {
        if (expansion_extend(e, a, out->terms + MORE + 1) != TW_OK) status = TW_ERROR;
        if (status == TW_OK) status = count_orders(e, a, &r, out->terms, &M, &extra);
        if (status == TW_OK && (M < 0 || M > ORDERS))
            status = say(reason, "the amplitude is not smooth at an end, or too many terms are kept for the variation "
                                 "bound");
        if (status == TW_OK && !*reason) {
            double C = ends_vanish(e, &r, M + 1) ? 0 : INFINITY;
            for (size_t k = 0; k < r.part_count && isfinite(C); k++) {
                expr *g = parts_function(e, &r, r.parts[k].q, M + 1);
                C += g ? ends_and_variation(e, &r, g) : INFINITY;
            }
            if (!is_fatal(e)) engine_forgive(e);
            else status = TW_ERROR;
            if (status == TW_OK && !isfinite(C))
                status = say(reason, "the amplitude or the phase is not smooth up to the ends, so that the variation "
                                     "bound does not hold; at one value `evaluate` proves one");
            if (status == TW_OK && !*reason) {
                expr *scale = expr_pow(e, r.large, expr_fmpq(e, r.power));
                expr *front = expr_mul(e, rounded_up(e, C * TW_BOUND_FACTOR), bound_modulus(e, r.outside));
                expr *tail = expr_mul(e, front, expr_pow(e, scale, expr_int(e, -(M + 2))));
                out->bound = expr_add(e, put_values(e, extra, values), tail);
                out->label = LABEL_PROVED;
                out->source = base_copy("the next terms, and the total variation behind them (DLMF 2.3(i))");
                out->from = NULL;
                *made = out->bound != NULL;
                if (!*made) status = TW_ERROR;
            }
        }
    }
    phase_reading_clear(&r);
    return status;
}
