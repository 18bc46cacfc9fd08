/* Numbers from expansions. One idea: partial sum plus an interval that holds the remainder; the number of terms is chosen by the
 * envelope of the terms and settled by the bounds themselves. */
#include "engine/numeric/evaluate.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "engine/numeric/problem.h"
#include "engine/numeric/complex.h"
#include "engine/numeric/shared.h"
#include "engine/numeric/terms.h"
#include "engine/numeric/turned.h"

enum { TERMS_MOST = 600 };

void number_init(number *n)
{
    memset(n, 0, sizeof *n);
    acb_init(n->value);
    n->label = LABEL_UNKNOWN;
    n->terms = n->least_term = -1;
    n->way = "expansion";
    conditions_init(&n->conditions);
}

void number_clear(number *n)
{
    acb_clear(n->value);
    free(n->reason);
    conditions_clear(&n->conditions);
    memset(n, 0, sizeof *n);
}

static double log2_ball(const arb_t x)
{
    mag_t m;
    double out;
    mag_init(m);
    arb_get_mag(m, x);
    out = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
    mag_clear(m);
    return out;
}

/* Envelope of the terms: the greater of two neighbours, over all dominant contributions. */
static double envelope(const term_table *t, slong n)
{
    double most = -HUGE_VAL;
    for (size_t b = 0; b < t->count; b++)
        for (slong j = n; j <= n + 1 && j < t->list[b].count; j++)
            most = fmax(most, log2_ball(t->list[b].value + j));
    return most;
}

static slong table_length(const term_table *t)
{
    slong most = 0;
    for (size_t b = 0; b < t->count; b++)
        most = FLINT_MAX(most, t->list[b].count);
    return most;
}

tw_status best_terms(tw_engine *e, expansion *a, const env *at, slong most, slong *terms, slong *least)
{
    term_table t;
    double low = HUGE_VAL, small = HUGE_VAL;
    if (expansion_extend(e, a, most + 2) != TW_OK)
        return TW_ERROR;
    if (terms_at(e, &t, a, at, most + 2, false, 64) != TW_OK)
        return TW_ERROR;
    *terms = FLINT_MIN(most, table_length(&t));
    *least = -1;
    for (slong n = 0; n <= most && n < table_length(&t); n++) {
        double here = envelope(&t, n), one = -HUGE_VAL;
        if (here < low) {
            low = here;
            *terms = n;
        }
        for (size_t b = 0; b < t.count; b++)
            if (n < t.list[b].count)
                one = fmax(one, log2_ball(t.list[b].value + n));
        if (one < small && n < most) {
            small = one;
            *least = n;
        }
    }
    terms_clear(&t);
    return TW_OK;
}

/* Sum of the first `terms` terms of the dominant contributions. */
static tw_status partial_sum(tw_engine *e, arb_t sum, expansion *a, const env *at, slong terms, slong bits)
{
    term_table t;
    if (terms_at(e, &t, a, at, terms, false, bits) != TW_OK)
        return TW_ERROR;
    arb_zero(sum);
    for (size_t b = 0; b < t.count; b++)
        for (slong k = 0; k < t.list[b].count; k++)
            arb_add(sum, sum, t.list[b].value + k, bits);
    terms_clear(&t);
    return TW_OK;
}

/* value of the ball with `terms` kept. */
typedef struct attempt {
    arb_t value;
    point_bound bound;
    slong terms;
} attempt;

static void try_init(attempt *t)
{
    arb_init(t->value);
    point_bound_init(&t->bound);
    t->terms = -1;
}

static void try_clear(attempt *t)
{
    arb_clear(t->value);
    point_bound_clear(&t->bound);
}

/* The sum is made with so many bits that its rounding is nothing beside the bound, which may be exponentially small. */
static tw_status try_terms(tw_engine *e, attempt *t, expansion *a, const env *at, slong terms, slong bits, bool sharp)
{
    enum { BITS_MOST = 40000 };
    arb_t sum;
    double more;
    tw_status status;
    arb_init(sum);
    t->terms = terms;
    status = partial_sum(e, sum, a, at, terms, bits);
    if (status == TW_OK)
        status = remainder_at_as(e, &t->bound, a, at, terms, bits, sharp);
    if (status == TW_OK) {
        mag_t radius;
        mag_init_set(radius, arb_radref(t->bound.error));
        more = mag_is_zero(radius) ? -HUGE_VAL : log2_ball(sum) - mag_log2(radius) + 32;
        mag_clear(radius);
        if (more > (double)bits && more < BITS_MOST) {
            bits = (slong)more;
            status = partial_sum(e, sum, a, at, terms, bits);
        }
    }
    if (status == TW_OK)
        arb_add(t->value, sum, t->bound.error, bits + 64);
    arb_clear(sum);
    return status;
}

static bool try_better(const attempt *x, const attempt *y)
{
    if (x->bound.label != y->bound.label)
        return x->bound.label < y->bound.label;
    return log2_ball(x->bound.error) < log2_ball(y->bound.error);
}

/* Around the envelope's choice; the enclosing theorem's bound is the term itself, so the choice stands there. Terms of several lanes
 * alternate in size: one worse neighbour is looked past. */
static tw_status try_best(tw_engine *e, attempt *best, expansion *a, const env *at, slong terms, slong most, slong bits, bool sharp)
{
    tw_status status = try_terms(e, best, a, at, terms, bits, sharp);
    for (int side = -1; side <= 1 && status == TW_OK; side += 2)
        for (slong next = best->terms + side, worse = 0; worse < 2 && next >= 0 && next <= most; next += side) {
            attempt other;
            bool better;
            if (best->bound.manner || best->bound.label != LABEL_PROVED || status != TW_OK)
                break;
            try_init(&other);
            status = try_terms(e, &other, a, at, next, bits, sharp);
            better = status == TW_OK && try_better(&other, best);
            worse = better ? 0 : worse + 1;
            if (better) {
                attempt swap = *best;
                *best = other;
                other = swap;
            }
            try_clear(&other);
        }
    return status;
}

static bool has_digits(const arb_t value, slong digits)
{
    return arb_rel_accuracy_bits(value) >= (slong)ceil(digits * 3.32192809488736) + 1;
}

static slong digits_of(const arb_t value)
{
    slong bits = arb_rel_accuracy_bits(value);
    return bits <= 1 ? 0 : (slong)floor((bits - 1) * 0.30102999566398);
}

/* ---- to D digits ---- */

static slong terms_that_pay(tw_engine *e, expansion *a, const env *at, slong digits, slong most, tw_status *status)
{
    slong terms = FLINT_MIN(most, 8), least;
    for (;; terms = FLINT_MIN(2 * terms, most)) {
        slong best;
        term_table t;
        bool enough;
        *status = best_terms(e, a, at, terms, &best, &least);
        if (*status != TW_OK)
            return 0;
        *status = terms_at(e, &t, a, at, best + 2, false, 64);
        if (*status != TW_OK)
            return 0;
        enough = table_length(&t) == 0 || envelope(&t, best) < envelope(&t, 0) - 3.33 * digits - 8;
        if (enough) /* as few as will do */
            for (slong n = best; n >= 1 && envelope(&t, n) < envelope(&t, 0) - 3.33 * digits - 8; n--)
                best = n;
        terms_clear(&t);
        if (enough || best < terms || terms == most)
            return best;
        if (!budget_ok(e)) {
            *status = TW_ERROR;
            return 0;
        }
    }
}

/* The best ball that the expansion gives there with whatever number of terms. */
static tw_status best_ball(tw_engine *e, attempt *best, expansion *a, const env *at, slong digits, slong bits)
{
    tw_status status;
    slong terms = terms_that_pay(e, a, at, digits, TERMS_MOST, &status);
    if (status != TW_OK)
        return status;
    status = try_terms(e, best, a, at, terms, bits, false);
    if (status == TW_OK && !has_digits(best->value, digits)) {
        /* the panels' interval is a few per cent of the remainder, the theorem's is all of it */
        attempt sharp;
        try_init(&sharp);
        status = try_best(e, &sharp, a, at, terms, TERMS_MOST, bits, true);
        if (status == TW_OK && sharp.bound.label <= best->bound.label &&
            arb_rel_accuracy_bits(sharp.value) > arb_rel_accuracy_bits(best->value)) {
            attempt swap = *best;
            *best = sharp;
            sharp = swap;
        }
        try_clear(&sharp);
    }
    return status;
}

static void point_with(env *out, const env *at, expr *large, expr *value)
{
    out->count = at->count;
    out->symbols = base_alloc((at->count + 1) * sizeof *out->symbols);
    out->values = base_alloc((at->count + 1) * sizeof *out->values);
    for (size_t k = 0; k < at->count; k++) {
        out->symbols[k] = at->symbols[k];
        out->values[k] = at->symbols[k] == large ? value : at->values[k];
    }
}

static expr *two_digits(tw_engine *e, double x, bool up)
{
    int exponent = (int)floor(log10(x)) - 1;
    double mantissa = x / pow(10, exponent);
    expr *ten = expr_pow(e, expr_int(e, 10), expr_int(e, exponent));
    mantissa = up ? ceil(mantissa - 1e-9) : floor(mantissa + 1e-9);
    return expr_mul(e, expr_int(e, (slong)mantissa), ten);
}

static tw_status digits_from(tw_engine *e, bool *has, expansion *a, const env *at, expr *value, slong digits, slong bits)
{
    env there;
    attempt t;
    tw_status status;
    point_with(&there, at, a->large, value);
    try_init(&t);
    status = best_ball(e, &t, a, &there, digits, bits);
    *has = status == TW_OK && has_digits(t.value, digits);
    try_clear(&t);
    free(there.symbols);
    free(there.values);
    return status;
}

/* The least value of the large parameter (two digits) from which the digits can be had, found by doubling and bisection with
 * the bound itself; NULL when none was found. */
static expr *where_digits(tw_engine *e, expansion *a, const env *at, slong digits, slong bits)
{
    arb_t x;
    double low, high, sign = a->small ? -1 : 1;
    expr *found = NULL;
    bool has = false;
    arb_init(x);
    if (real_ball(e, x, put_values(e, a->large, at), 64) != TW_OK)
        return NULL;
    low = high = arf_get_d(arb_midref(x), ARF_RND_NEAR);
    arb_clear(x);
    for (int k = 0; k < 14 && !has; k++) {
        low = high;
        high *= pow(2, sign);
        found = two_digits(e, high, !a->small);
        if (!found || digits_from(e, &has, a, at, found, digits, bits) != TW_OK)
            return NULL;
    }
    for (int k = 0; k < 5 && has; k++) {
        double middle = sqrt(low * high);
        bool here;
        expr *value = two_digits(e, middle, !a->small);
        if (!value || digits_from(e, &here, a, at, value, digits, bits) != TW_OK)
            return found;
        if (here) {
            high = middle;
            found = value;
        } else {
            low = middle;
        }
    }
    return has ? found : NULL;
}

static tw_status fail_digits(tw_engine *e, expansion *a, const env *at, const attempt *best, slong digits, slong bits)
{
    text words;
    expr *from, *here = put_values(e, a->large, at);
    char *ball = arb_get_str(best->value, FLINT_MAX(digits_of(best->value), 1) + 1, 0), *place;
    tw_status status;
    text_init(&words);
    from = where_digits(e, a, at, digits, bits);
    if (e->error.kind == ERROR_TIME || e->error.kind == ERROR_INTERRUPT || e->error.kind == ERROR_MEMORY)
        status = TW_ERROR;
    else {
        engine_forgive(e);
        place = expr_text(e, here);
        text_addf(&words, "%ld digits cannot be had from the expansion at %s = %s: the best there is %ld digit%s, %s, with %ld term%s",
                  (long)digits, a->large->is.name, place, (long)digits_of(best->value), digits_of(best->value) == 1 ? "" : "s",
                  ball, (long)best->terms, best->terms == 1 ? "" : "s");
        free(place);
        if (from) {
            place = expr_text(e, from);
            text_addf(&words, "; from %s = %s on they can be had", a->large->is.name, place);
            free(place);
        }
        text_add(&words, "; `evaluate INTEGRAL` gives them by certified quadrature");
        status = engine_fail(e, ERROR_PRECISION, "%s", words.bytes);
    }
    flint_free(ball);
    text_clear(&words);
    return status;
}

/* ---- the whole ---- */

static tw_status sum_exact(tw_engine *e, number *out, expansion *a, const env *at, slong bits)
{
    term_table t;
    arb_t sum;
    if (terms_at(e, &t, a, at, TERMS_MOST, true, bits) != TW_OK)
        return TW_ERROR;
    arb_init(sum);
    for (size_t b = 0; b < t.count; b++)
        for (slong k = 0; k < t.list[b].count; k++)
            arb_add(sum, sum, t.list[b].value + k, bits);
    out->terms = out->terms_known = table_length(&t);
    acb_set_arb(out->value, sum);
    arb_clear(sum);
    terms_clear(&t);
    if (conditions_at(e, &out->conditions, a, at) != TW_OK)
        return TW_ERROR;
    out->label = conditions_all_sure(&out->conditions) ? LABEL_EXACT : LABEL_CONDITIONAL;
    return TW_OK;
}

static tw_status take_try(number *out, const attempt *t)
{
    acb_set_arb(out->value, t->value);
    out->label = t->bound.label;
    out->manner = t->bound.manner;
    out->terms = t->terms;
    if (t->bound.reason)
        out->reason = base_copy(t->bound.reason);
    conditions_append(&out->conditions, &t->bound.conditions);
    return TW_OK;
}

tw_status evaluate_expansion(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o)
{
    slong bits = FLINT_MAX(128, (slong)(o->digits * 3.33) + 96), most, terms, least;
    attempt best;
    tw_status status = point_complete(e, a, at);
    if (status != TW_OK)
        return status;
    if (a->combined)
        return combined_number(e, out, a, at, o);
    if (expansion_is_complex(a))
        return evaluate_complex(e, out, a, at, o);
    if (turned_is_complex(a)) {
        out->terms = o->terms >= 0 ? o->terms : a->terms_asked;
        out->terms_known = FLINT_MAX(out->terms, a->terms_asked);
        out->label = LABEL_PROVED;
        status = turned_value(e, out->value, a, at, out->terms, bits);
        if (status != TW_OK || conditions_at(e, &out->conditions, a, at) != TW_OK)
            return TW_ERROR;
        if (!conditions_all_sure(&out->conditions))
            out->label = LABEL_CONDITIONAL;
        return TW_OK;
    }
    if (a->exact && o->terms < 0)
        return sum_exact(e, out, a, at, bits);
    most = o->terms >= 0 ? o->terms : a->terms_asked;
    if (best_terms(e, a, at, most, &terms, &least) != TW_OK)
        return TW_ERROR;
    out->least_term = least;
    out->terms_known = FLINT_MAX(most, a->terms_asked);
    try_init(&best);
    if (a->remainder) /* what is left is known exactly, whatever is kept */
        status = try_terms(e, &best, a, at, most, bits, false);
    else if (o->terms >= 0)
        status = try_terms(e, &best, a, at, o->terms, bits, true);
    else
        status = try_best(e, &best, a, at, terms, most, bits, true);
    if (status == TW_OK && o->digits > 0 && !has_digits(best.value, o->digits)) {
        attempt more;
        try_init(&more);
        if (o->terms < 0)
            status = best_ball(e, &more, a, at, o->digits, bits);
        if (status == TW_OK && o->terms < 0 && more.bound.label <= best.bound.label &&
            arb_rel_accuracy_bits(more.value) > arb_rel_accuracy_bits(best.value)) {
            attempt swap = best;
            best = more;
            more = swap;
        }
        try_clear(&more);
        if (status == TW_OK && !has_digits(best.value, o->digits))
            status = fail_digits(e, a, at, &best, o->digits, bits);
        out->terms_known = FLINT_MAX(out->terms_known, best.terms);
    }
    if (status == TW_OK)
        take_try(out, &best);
    try_clear(&best);
    return status;
}
