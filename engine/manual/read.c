/* A derivation's last form read as an expansion. The one idea: the plain terms are the expansion, all integrals together are
 * its remainder, exactly. Where the terms are those that the engine's own expansion of the same integral has, that one
 * serves, because its remainder can be bounded for all values of the parameter; else the integrals that were split off are
 * kept in the expansion and bounded themselves. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/manual/work.h"
#include "engine/method/lanes.h"
#include "engine/method/method.h"

/* One plain term: prefactor * constant * s^exponent * log(s)^logs. */
typedef struct reading_term {
    expr *prefactor, *constant, *exponent;
    slong logs;
} reading_term;

typedef struct reading_list {
    size_t count;
    reading_term *list;
} reading_list;

static tw_status fail_term(tw_engine *e, const manual *m, expr *part)
{
    char *words = expr_text(e, part);
    engine_fail(e, ERROR_UNSUITABLE, "the term %.200s is no power of %s (with logarithms of it and an exponential in front), so "
                                     "the form is not read as an expansion; go on with the derivation", words ? words : "",
                m->large->is.name);
    free(words);
    return TW_ERROR;
}

static tw_status read_term(const manual *m, expr *part, reading_term *out)
{
    tw_engine *e = m->e;
    expr *const *factors;
    size_t count = expr_factors(&part, &factors);
    *out = (reading_term){expr_int(e, 1), expr_int(e, 1), expr_int(e, 0), 0};
    for (size_t k = 0; k < count; k++) {
        expr *f = factors[k], *base, *r;
        if (!expr_has(f, m->large)) {
            out->constant = expr_mul(e, out->constant, f);
            continue;
        }
        expr_as_power(e, f, &base, &r);
        bool whole = expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r))) && fmpq_sgn(expr_number(r)) > 0;
        if (base == m->large && !expr_has(r, m->large)) out->exponent = expr_add(e, out->exponent, r);
        else if (expr_is_call(base, FUNCTION_LOG) && base->args[0] == m->large && whole)
            out->logs += fmpz_get_si(fmpq_numref(expr_number(r)));
        else if (expr_is_call(f, FUNCTION_EXP)) out->prefactor = expr_mul(e, out->prefactor, f);
        else return fail_term(e, m, part);
    }
    return out->constant && out->exponent && out->prefactor ? TW_OK : TW_ERROR;
}

static tw_status read_terms(const manual *m, reading_list *out)
{
    tw_engine *e = m->e;
    expr *wide = tidy(e, manual_now(m)->plain, NULL, false);
    if (wide) wide = expr_expand(e, wide);
    if (wide) wide = tidy(e, wide, NULL, false);
    if (!wide) return TW_ERROR;
    expr *const *parts;
    size_t count = expr_is_zero(wide) ? 0 : expr_terms(&wide, &parts);
    out->list = base_alloc((count + 1) * sizeof *out->list);
    for (out->count = 0; out->count < count; out->count++)
        if (read_term(m, parts[out->count], &out->list[out->count]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

/* ---- the engine's own expansion ---- */

/* Different powers among the terms with this exponential in front. */
static slong count_powers(const reading_list *t, expr *prefactor)
{
    slong count = 0;
    for (size_t k = 0; k < t->count; k++) {
        bool seen = t->list[k].prefactor != prefactor;
        for (size_t j = 0; j < k && !seen; j++)
            seen = t->list[j].prefactor == prefactor && t->list[j].exponent == t->list[k].exponent &&
                   t->list[j].logs == t->list[k].logs;
        count += !seen;
    }
    return count;
}

static expr *exponential_of(tw_engine *e, expr *f, expr *large)
{
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    expr *made = expr_int(e, 1);
    for (size_t k = 0; k < count; k++)
        if (expr_is_call(factors[k], FUNCTION_EXP) && expr_has(factors[k], large)) made = expr_mul(e, made, factors[k]);
    return made;
}

/* The first terms of the engine's dominant contributions, as many as are asked of each. */
static expr *engine_sum(tw_engine *e, expansion *a, slong terms, slong *used)
{
    expr *sum = expr_int(e, 0);
    *used = 0;
    for (size_t k = 0; k < a->contribution_count; k++) {
        term *order = NULL;
        slong found = 0;
        if (!a->contributions[k].dominant) continue;
        if (expansion_order(e, a, k, terms, &order, &found) != TW_OK) return NULL;
        for (slong n = 0; n < found; n++)
            sum = expr_add(e, sum, expr_mul(e, a->contributions[k].prefactor, expansion_term(e, a, k, order[n])));
        *used += found;
        free(order);
    }
    return sum;
}

/* out becomes the engine's expansion if its first terms are those of the form. */
static bool take_engine(const manual *m, const reading_list *t, expansion *out)
{
    tw_engine *e = m->e;
    expr *lead = t->count ? t->list[0].prefactor : NULL;
    if (!lead || !facts_large(e, &(expr *){NULL})) return false;
    expansion_init(out);
    bool same = false;
    /* the exponential of the dominant contributions says which of the form's terms are compared with them */
    if (expand(e, out, manual_now(m)->subject, 1, NULL) == TW_OK) {
        expr *front = NULL;
        for (size_t k = 0; k < out->contribution_count && !front; k++)
            if (out->contributions[k].dominant) front = exponential_of(e, out->contributions[k].prefactor, m->large);
        slong wanted = front ? count_powers(t, front) : 0, used = 0;
        expr *mine = expr_int(e, 0);
        for (size_t k = 0; k < t->count; k++)
            if (t->list[k].prefactor == front) {
                expr *power = expr_mul(e, t->list[k].constant, expr_pow(e, m->large, t->list[k].exponent));
                if (t->list[k].logs)
                    power = expr_mul(e, power, expr_pow(e, expr_call1(e, FUNCTION_LOG, m->large),
                                                        expr_int(e, t->list[k].logs)));
                mine = expr_add(e, mine, expr_mul(e, front, power));
            }
        if (wanted > 0 && expansion_extend(e, out, wanted) == TW_OK)
            for (slong terms = 1; terms <= 2 * wanted && !same && forgive(e) && budget_ok(e); terms++) {
                expr *theirs = engine_sum(e, out, terms, &used);
                expr *rest = theirs ? tidy(e, expr_expand(e, expr_sub(e, theirs, mine)), NULL, false) : NULL;
                same = rest && is_identically_zero(e, rest, NULL);
                if (same) out->terms_asked = terms;
                if (used < terms) break;
            }
    }
    bool fatal = !forgive(e);
    if (!same || fatal) expansion_clear(out);
    return same && !fatal;
}

/* ---- an expansion of its own ---- */

static int compare_terms(tw_engine *e, const reading_term *a, const reading_term *b, bool small)
{
    int sign = a->exponent == b->exponent ? 0 : decide_sign(e, expr_sub(e, b->exponent, a->exponent));
    forgive(e);
    if (sign == 2) sign = expr_order(a->exponent, b->exponent);
    return small ? -sign : sign;
}

static void sort_terms(tw_engine *e, reading_list *t, bool small)
{
    for (size_t k = 1; k < t->count; k++) {
        reading_term one = t->list[k];
        size_t place = k;
        while (place > 0 && compare_terms(e, &t->list[place - 1], &one, small) > 0) {
            t->list[place] = t->list[place - 1];
            place--;
        }
        t->list[place] = one;
    }
}

/* exponent = first + n*step for a whole n >= 0? */
static bool place_in_lane(tw_engine *e, expr *first, expr *exponent, const fmpq_t stride, slong *n)
{
    expr *difference = expr_sub(e, exponent, first);
    if (!difference || !expr_is_number(difference)) return false;
    fmpq_t q;
    fmpq_init(q);
    fmpq_div(q, expr_number(difference), stride);
    bool good = fmpz_is_one(fmpq_denref(q)) && fmpq_sgn(q) >= 0 && fmpz_cmp_si(fmpq_numref(q), 1000000) < 0;
    if (good) *n = fmpz_get_si(fmpq_numref(q));
    fmpq_clear(q);
    return good;
}

/* The greatest step that reaches every exponent of the lane of term k: 1/den with den the least common denominator. */
static void stride_of(tw_engine *e, const reading_list *t, size_t k, bool small, fmpq_t stride)
{
    fmpz_t gcd, den, num;
    fmpz_init(gcd);
    fmpz_init_set_ui(den, 1);
    fmpz_init(num);
    for (int round = 0; round < 2; round++)
        for (size_t j = 0; j < t->count; j++) {
            if (t->list[j].logs != t->list[k].logs || t->list[j].prefactor != t->list[k].prefactor) continue;
            expr *d = expr_sub(e, t->list[j].exponent, t->list[k].exponent);
            if (!d || !expr_is_number(d)) continue;
            if (round == 0) fmpz_lcm(den, den, fmpq_denref(expr_number(d)));
            else {
                fmpz_divexact(num, den, fmpq_denref(expr_number(d)));
                fmpz_mul(num, num, fmpq_numref(expr_number(d)));
                fmpz_gcd(gcd, gcd, num);
            }
        }
    if (fmpz_is_zero(gcd)) fmpz_one(gcd);
    fmpq_set_fmpz_frac(stride, gcd, den);
    if (!small) fmpq_neg(stride, stride);
    fmpz_clear(gcd);
    fmpz_clear(den);
    fmpz_clear(num);
}

/* A rational function of the parameters? */
static bool is_rational_function(expr *a)
{
    if (a->kind == EXPR_NUMBER || a->kind == EXPR_SYMBOL) return true;
    if (a->kind == EXPR_POWER)
        return is_rational_function(a->args[0]) && expr_is_number(a->args[1]) &&
               fmpz_is_one(fmpq_denref(expr_number(a->args[1])));
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT) return false;
    for (uint32_t k = 0; k < a->count; k++)
        if (!is_rational_function(a->args[k])) return false;
    return true;
}

/* What of a constant is no rational function of the parameters: the lane's constant. */
static expr *irrational_part(tw_engine *e, expr *c)
{
    expr *const *factors, *rest = expr_int(e, 1);
    size_t count = expr_factors(&c, &factors);
    for (size_t k = 0; k < count; k++)
        if (!is_rational_function(factors[k])) rest = expr_mul(e, rest, factors[k]);
    return rest;
}

static tw_status add_lane(const manual *m, contribution *c, const reading_list *t, size_t k, bool *taken)
{
    tw_engine *e = m->e;
    fmpq_t stride;
    fmpq_init(stride);
    stride_of(e, t, k, m->small, stride);
    slong length = 0, n;
    expr *constant = irrational_part(e, t->list[k].constant);
    for (size_t j = k; j < t->count; j++)
        if (!taken[j] && t->list[j].logs == t->list[k].logs && t->list[j].prefactor == t->list[k].prefactor &&
            irrational_part(e, t->list[j].constant) == constant &&
            place_in_lane(e, t->list[k].exponent, t->list[j].exponent, stride, &n) && n + 1 > length)
            length = n + 1;
    expr **x = base_alloc((size_t)(length + 1) * sizeof *x);
    for (slong j = 0; j < length; j++) x[j] = expr_int(e, 0);
    for (size_t j = k; j < t->count; j++)
        if (!taken[j] && t->list[j].logs == t->list[k].logs && t->list[j].prefactor == t->list[k].prefactor &&
            irrational_part(e, t->list[j].constant) == constant &&
            place_in_lane(e, t->list[k].exponent, t->list[j].exponent, stride, &n)) {
            x[n] = expr_add(e, x[n], expr_div(e, t->list[j].constant, constant));
            taken[j] = true;
        }
    tw_status status = contribution_set_lane(e, c, constant, t->list[k].exponent, stride, x, length);
    if (status == TW_OK) c->lanes[c->lane_count - 1].log_power = t->list[k].logs;
    free(x);
    fmpq_clear(stride);
    return status;
}

static tw_status build_own(const manual *m, reading_list *t, expansion *out)
{
    tw_engine *e = m->e;
    sort_terms(e, t, m->small);
    bool *taken = base_alloc((t->count + 1) * sizeof *taken);
    memset(taken, 0, (t->count + 1) * sizeof *taken);
    tw_status status = TW_OK;
    for (size_t k = 0; k < t->count && status == TW_OK; k++) {
        if (taken[k]) continue;
        contribution *c = expansion_add(out);
        c->kind = POINT_FORM;
        c->method = "by hand";
        c->dominant = true;
        c->terminates = true;
        c->prefactor = t->list[k].prefactor;
        for (size_t j = k; j < t->count && status == TW_OK; j++)
            if (!taken[j] && t->list[j].prefactor == c->prefactor) status = add_lane(m, c, t, j, taken);
        slong terms = contribution_count_terms(c);
        if (terms > out->terms_asked) out->terms_asked = terms;
    }
    free(taken);
    const manual_frame *now = manual_now(m);
    out->remainder = expr_int(e, 0);
    for (int off = 0; off < 2; off++) {
        const manual_terms *list = off ? &now->split_off : &now->live;
        for (size_t k = 0; k < list->count; k++)
            out->remainder = expr_add(e, out->remainder, expr_mul(e, list->list[k].outside, list->list[k].integral));
    }
    if (!out->remainder) return TW_ERROR;
    out->exact = expr_is_zero(out->remainder);
    return status;
}

/* ---- the whole ---- */

static void take_steps(const manual *m, expansion *out)
{
    derivation_clear(&out->derivation);
    for (size_t k = 0; k < m->record.count; k++) {
        const step *from = &m->record.steps[k];
        step *s = derivation_add(&out->derivation, from->rule, from->source);
        s->detail = from->detail ? base_copy(from->detail) : NULL;
        s->form = from->form ? base_copy(from->form) : NULL;
        s->after = from->after;
        s->remainder = from->remainder;
        conditions_append(&s->conditions, &from->conditions);
    }
}

/* Those that are not proved; the steps have them all. */
static void take_conditions(const manual *m, expansion *out)
{
    condition_list all;
    conditions_init(&all);
    manual_conditions(m, &all);
    for (size_t k = 0; k < all.count; k++)
        if (all.list[k].label == CONDITION_OPEN || all.list[k].label == CONDITION_GRANTED)
            conditions_add(&out->conditions, all.list[k].words, all.list[k].relation, all.list[k].label);
    conditions_clear(&all);
}

static void keep_facts(const manual *m, expansion *out)
{
    free(out->facts);
    free(out->fact_labels);
    out->fact_count = m->fact_count;
    out->facts = base_alloc((out->fact_count + 1) * sizeof *out->facts);
    out->fact_labels = base_alloc((out->fact_count + 1) * sizeof *out->fact_labels);
    for (size_t k = 0; k < out->fact_count; k++) {
        out->facts[k] = m->facts[k];
        out->fact_labels[k] = m->fact_labels[k];
    }
}

tw_status manual_expansion(const manual *m, expansion *out)
{
    tw_engine *e = m->e;
    if (!m->large)
        return engine_fail(e, ERROR_UNSUITABLE, "no large or small parameter was declared when the derivation began");
    if (manual_now(m)->plain == NULL || expr_is_zero(manual_now(m)->plain))
        return engine_fail(e, ERROR_UNSUITABLE, "the form has no terms yet, only integrals");
    reading_list t = {0, NULL};
    tw_status status = read_terms(m, &t);
    bool engines = status == TW_OK && take_engine(m, &t, out);
    if (status == TW_OK && e->error.kind != ERROR_NONE) status = TW_ERROR;
    if (status == TW_OK && !engines) {
        expansion_init(out);
        status = build_own(m, &t, out);
    }
    if (status == TW_OK) {
        out->integral = manual_now(m)->subject;
        out->large = m->large;
        out->small = m->small;
        free(out->why);
        out->why = base_copy(engines ? "a derivation by hand; its terms are those of the engine's own expansion, which bounds the "
                                       "remainder"
                                     : "a derivation by hand; the integrals that were split off are the remainder");
        take_conditions(m, out);
        take_steps(m, out);
        keep_facts(m, out);
    }
    free(t.list);
    return status;
}
