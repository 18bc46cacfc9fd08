/* How the large parameter enters. The one idea: write everything as powers of s times what is free of s (sums of terms
 * with one common power give it up), so that a body is factor * amplitude * exp(-s^K phase) or it is not; and where it
 * is not, the powers at which s and x meet (x/s, s^2*x^3) name the few substitutions x = s^a t that could make it so.
 */
#include "engine/method/scale.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"

void separation_init(separation *s)
{
    memset(s, 0, sizeof *s);
    fmpq_init(s->power);
    fmpq_init(s->stretch);
}

void separation_clear(separation *s)
{
    fmpq_clear(s->power);
    fmpq_clear(s->stretch);
}

static bool is_positive_symbol(tw_engine *e, expr *symbol)
{
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    int ends = facts_interval(e, symbol, low, high);
    bool positive = (ends & 1) && (fmpq_sgn(low) > 0 || (fmpq_is_zero(low) && (ends & 4)));
    fmpq_clear(low);
    fmpq_clear(high);
    return positive;
}

expr *normal_under_facts(tw_engine *e, expr *a, expr *const *more, size_t count)
{
    if (!a) return NULL;
    expr **symbols;
    size_t found = expr_symbols(a, &symbols), kept = 0;
    expr **positive = base_alloc((found + count + 1) * sizeof *positive);
    for (size_t k = 0; k < found; k++)
        if (!symbols[k]->fresh && is_positive_symbol(e, symbols[k])) positive[kept++] = symbols[k];
    for (size_t k = 0; k < count; k++) positive[kept++] = more[k];
    expr *made = expr_normal(e, a, positive, kept);
    free(positive);
    free(symbols);
    return made;
}

/* ---- drawing out powers ---- */

static expr *draw_all(tw_engine *e, expr *a, expr *symbol)
{
    fmpq_t power;
    fmpq_init(power);
    expr *rest = draw_power(e, a, symbol, power);
    expr *whole = fmpq_is_zero(power) ? rest : expr_mul(e, expr_pow(e, symbol, expr_fmpq(e, power)), rest);
    fmpq_clear(power);
    return whole;
}

static expr *draw_product(tw_engine *e, expr *a, expr *symbol, fmpq_t power)
{
    expr *rest = expr_int(e, 1);
    fmpq_t one;
    fmpq_init(one);
    for (uint32_t k = 0; k < a->count; k++) {
        rest = expr_mul(e, rest, draw_power(e, a->args[k], symbol, one));
        fmpq_add(power, power, one);
    }
    fmpq_clear(one);
    return rest;
}

static expr *draw_sum(tw_engine *e, expr *a, expr *symbol, fmpq_t power)
{
    expr *rest = expr_int(e, 0), *whole = expr_int(e, 0);
    fmpq_t one;
    fmpq_init(one);
    bool common = true;
    for (uint32_t k = 0; k < a->count; k++) {
        expr *part = draw_power(e, a->args[k], symbol, one);
        if (k == 0) fmpq_set(power, one);
        common = common && fmpq_equal(power, one);
        rest = expr_add(e, rest, part);
        whole = expr_add(e, whole, expr_mul(e, expr_pow(e, symbol, expr_fmpq(e, one)), part));
    }
    if (!common) fmpq_zero(power);
    fmpq_clear(one);
    return common ? rest : whole;
}

static expr *draw_call(tw_engine *e, expr *a, expr *symbol)
{
    if (a->is.function == FUNCTION_LOG) {
        fmpq_t power;
        fmpq_init(power);
        expr *rest = draw_power(e, a->args[0], symbol, power);
        expr *sum = expr_add(e, expr_mul(e, expr_fmpq(e, power), expr_call1(e, FUNCTION_LOG, symbol)),
                             expr_call1(e, FUNCTION_LOG, rest));
        fmpq_clear(power);
        return sum;
    }
    expr **args = base_alloc((a->count + 1) * sizeof *args);
    bool good = true;
    for (uint32_t k = 0; k < a->count; k++) {
        args[k] = draw_all(e, a->args[k], symbol);
        good = good && args[k];
    }
    expr *made = good ? expr_call(e, a->is.function, args, a->count) : NULL;
    free(args);
    return made;
}

expr *draw_power(tw_engine *e, expr *a, expr *symbol, fmpq_t power)
{
    fmpq_zero(power);
    if (!a || !expr_has(a, symbol)) return a;
    if (a == symbol) {
        fmpq_one(power);
        return expr_int(e, 1);
    }
    if (a->kind == EXPR_PRODUCT) return draw_product(e, a, symbol, power);
    if (a->kind == EXPR_SUM) return draw_sum(e, a, symbol, power);
    if (a->kind == EXPR_CALL) return draw_call(e, a, symbol);
    if (a->kind == EXPR_POWER && expr_is_number(a->args[1])) {
        expr *rest = draw_power(e, a->args[0], symbol, power);
        fmpq_mul(power, power, expr_number(a->args[1]));
        return expr_pow(e, rest, a->args[1]);
    }
    if (a->kind == EXPR_POWER) return expr_pow(e, draw_all(e, a->args[0], symbol), draw_all(e, a->args[1], symbol));
    return a;
}

/* ---- separating one product ---- */

typedef struct sorting {
    tw_engine *e;
    expr *x, *large;
    expr *factor, *amplitude, *phase; /* phase NULL: none yet */
    fmpq_t power;
    const char *why; /* why it cannot be separated; static words */
    expr *culprit;
} sorting;

static bool refuse(sorting *s, const char *why, expr *culprit)
{
    if (!s->why) {
        s->why = why;
        s->culprit = culprit;
    }
    return false;
}

/* One term of the exponent. */
static bool sort_exponent_term(sorting *s, expr *t, bool may_expand)
{
    tw_engine *e = s->e;
    if (!expr_has(t, s->large)) {
        expr *whole = expr_call1(e, FUNCTION_EXP, t);
        if (expr_has(t, s->x)) s->amplitude = expr_mul(e, s->amplitude, whole);
        else s->factor = expr_mul(e, s->factor, whole);
        return true;
    }
    if (!expr_has(t, s->x)) {
        s->factor = expr_mul(e, s->factor, expr_call1(e, FUNCTION_EXP, t));
        return true;
    }
    fmpq_t power;
    fmpq_init(power);
    expr *rest = draw_power(e, t, s->large, power);
    bool good = rest && !expr_has(rest, s->large);
    if (good && !s->phase) {
        fmpq_set(s->power, power);
        s->phase = expr_neg(e, rest);
    } else if (good && fmpq_equal(power, s->power)) {
        s->phase = expr_sub(e, s->phase, rest);
    } else if (good) {
        good = refuse(s, "two scales meet in the exponent", t);
    } else if (may_expand && rest) {
        expr *wide = expr_expand(e, t);
        expr *const *terms;
        size_t count = wide ? expr_terms(&wide, &terms) : 0;
        good = count > 0;
        for (size_t k = 0; k < count && good; k++) good = sort_exponent_term(s, terms[k], false);
    } else {
        good = refuse(s, "the large parameter does not separate from the variable", t);
    }
    fmpq_clear(power);
    return good;
}

static bool sort_exponent(sorting *s, expr *exponent)
{
    expr *const *terms;
    size_t count = expr_terms(&exponent, &terms);
    for (size_t k = 0; k < count; k++)
        if (!sort_exponent_term(s, terms[k], true)) return false;
    return true;
}

static bool sort_factor(sorting *s, expr *f)
{
    tw_engine *e = s->e;
    if (expr_is_call(f, FUNCTION_EXP)) return sort_exponent(s, f->args[0]);
    if (!expr_has(f, s->x)) {
        s->factor = expr_mul(e, s->factor, f);
        return true;
    }
    if (!expr_has(f, s->large)) {
        s->amplitude = expr_mul(e, s->amplitude, f);
        return true;
    }
    if (f->kind == EXPR_POWER && expr_has(f->args[1], s->large) && !expr_has(f->args[0], s->large))
        return sort_exponent(s, expr_mul(e, f->args[1], expr_call1(e, FUNCTION_LOG, f->args[0])));
    return refuse(s, "the large parameter does not separate from the variable", f);
}

static bool sort_product(sorting *s, expr *body)
{
    s->factor = s->amplitude = expr_int(s->e, 1);
    s->phase = NULL;
    expr *const *factors;
    size_t count = expr_factors(&body, &factors);
    for (size_t k = 0; k < count; k++)
        if (!sort_factor(s, factors[k])) return false;
    return true;
}

/* A sum whose terms have one kernel: the amplitudes add. */
static bool sort_body(sorting *s, expr *body)
{
    expr *const *terms;
    size_t count = expr_terms(&body, &terms);
    if (!sort_product(s, terms[0])) return false;
    expr *factor = s->factor, *amplitude = s->amplitude, *phase = s->phase;
    fmpq_t power;
    fmpq_init(power);
    fmpq_set(power, s->power);
    bool good = true;
    for (size_t k = 1; k < count && good; k++) {
        good = sort_product(s, terms[k]);
        expr *ratio = good ? expr_div(s->e, s->factor, factor) : NULL;
        if (good && (!ratio || s->phase != phase || !fmpq_equal(power, s->power) || expr_has(ratio, s->large)))
            good = refuse(s, "the terms of the integrand have different kernels", body);
        if (good) amplitude = expr_add(s->e, amplitude, expr_mul(s->e, ratio, s->amplitude));
    }
    s->factor = factor;
    s->amplitude = amplitude;
    s->phase = phase;
    fmpq_clear(power);
    return good;
}

/* ---- stretches ---- */

typedef struct stretches {
    size_t count, room;
    fmpq *met; /* pairs: exponent of x, exponent of the large parameter */
} stretches;

static void note_meeting(stretches *s, const fmpq_t m, const fmpq_t k)
{
    for (size_t n = 0; n < s->count; n++)
        if (fmpq_equal(&s->met[2 * n], m) && fmpq_equal(&s->met[2 * n + 1], k)) return;
    if (s->count == s->room) return;
    fmpq_set(&s->met[2 * s->count], m);
    fmpq_set(&s->met[2 * s->count + 1], k);
    s->count++;
}

/* The powers of x and of the large parameter that every product (or single factor) in a holds. */
static void collect_meetings(tw_engine *e, stretches *s, expr *a, expr *x, expr *large)
{
    if (!expr_has(a, x) && !expr_has(a, large)) return;
    fmpq_t m, k;
    fmpq_init(m);
    fmpq_init(k);
    expr *const *factors;
    size_t count = expr_factors(&a, &factors);
    for (size_t n = 0; n < count; n++) {
        expr *base, *exponent;
        expr_as_power(e, factors[n], &base, &exponent);
        if (base == x && expr_is_number(exponent)) fmpq_add(m, m, expr_number(exponent));
        if (base == large && expr_is_number(exponent)) fmpq_add(k, k, expr_number(exponent));
    }
    if (!fmpq_is_zero(m) || !fmpq_is_zero(k)) note_meeting(s, m, k);
    fmpq_clear(m);
    fmpq_clear(k);
    for (uint32_t n = 0; n < a->count; n++) collect_meetings(e, s, a->args[n], x, large);
}

enum { MEETINGS_AT_MOST = 12 };

static void note_candidate(fmpq *list, size_t *count, const fmpq_t a)
{
    for (size_t k = 0; k < *count; k++)
        if (fmpq_equal(&list[k], a)) return;
    fmpq_set(&list[(*count)++], a);
}

/* The stretches worth trying: 0; those that free one meeting of the large parameter; those that make two alike. */
static size_t list_candidates(tw_engine *e, fmpq *list, expr *body, expr *from, expr *to, expr *x, expr *large)
{
    stretches s = {0, MEETINGS_AT_MOST, _fmpq_vec_init(2 * MEETINGS_AT_MOST)};
    collect_meetings(e, &s, body, x, large);
    size_t count = 0;
    fmpq_t a, d;
    fmpq_init(a);
    fmpq_init(d);
    note_candidate(list, &count, a);
    for (int end = 0; end < 2; end++) {
        expr *rest = draw_power(e, end ? to : from, large, a);
        if (rest && !expr_has(rest, large)) note_candidate(list, &count, a);
    }
    for (size_t i = 0; i < s.count; i++) {
        if (fmpq_is_zero(&s.met[2 * i])) continue;
        fmpq_div(a, &s.met[2 * i + 1], &s.met[2 * i]);
        fmpq_neg(a, a);
        note_candidate(list, &count, a);
    }
    for (size_t i = 0; i < s.count; i++)
        for (size_t j = 0; j < i; j++) {
            fmpq_sub(d, &s.met[2 * i], &s.met[2 * j]);
            if (fmpq_is_zero(d)) continue;
            fmpq_sub(a, &s.met[2 * j + 1], &s.met[2 * i + 1]);
            fmpq_div(a, a, d);
            note_candidate(list, &count, a);
        }
    fmpq_clear(a);
    fmpq_clear(d);
    _fmpq_vec_clear(s.met, 2 * MEETINGS_AT_MOST);
    return count;
}

/* ---- reasons ---- */

/* What in a keeps s and x together, for the words of the refusal. */
static expr *find_call_with(expr *a, expr *x, expr *large, bool (*is)(expr *a))
{
    if (!expr_has(a, large) || !expr_has(a, x)) return NULL;
    if (is(a)) return a;
    for (uint32_t k = 0; k < a->count; k++) {
        expr *found = find_call_with(a->args[k], x, large, is);
        if (found) return found;
    }
    return NULL;
}

static bool holds_i(expr *a)
{
    if (expr_is_constant(a, CONSTANT_I)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_i(a->args[k])) return true;
    return false;
}

static bool is_oscillating(expr *a)
{
    if (a->kind != EXPR_CALL) return false;
    if (a->is.function == FUNCTION_EXP) return holds_i(a->args[0]);
    return a->is.function == FUNCTION_SIN || a->is.function == FUNCTION_COS;
}

static bool is_growing(expr *a)
{
    return expr_is_call(a, FUNCTION_SINH) || expr_is_call(a, FUNCTION_COSH);
}

static bool is_special_kernel(expr *a)
{
    if (a->kind != EXPR_CALL) return false;
    switch (a->is.function) {
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K:
    case FUNCTION_AI:
    case FUNCTION_BI:
    case FUNCTION_ERFC:
    case FUNCTION_ERF:
    case FUNCTION_E1:
    case FUNCTION_EI:
    case FUNCTION_GAMMA_UPPER:
    case FUNCTION_ATAN:
    case FUNCTION_TANH:
    case FUNCTION_LOG: return true;
    default: return false;
    }
}

static tw_status refuse_body(tw_engine *e, expr *body, expr *x, expr *large, const char *why, expr *culprit)
{
    const char *s = large->is.name;
    expr *found = find_call_with(body, x, large, is_oscillating);
    const char *format = NULL;
    error_kind kind = ERROR_UNAVAILABLE;
    if (found) {
        format = "the kernel %s oscillates in a form that stationary phase does not take";
    } else if ((found = find_call_with(body, x, large, is_growing))) {
        kind = ERROR_UNSUITABLE;
        format = "%s is the sum of a growing and a decaying exponential: write it with exp and expand the parts";
    } else if ((found = find_call_with(body, x, large, is_special_kernel))) {
        format = "the kernel %s is no exponential: that needs the method `mellin`, which this version does not have";
    }
    char *words = expr_text(e, found ? found : culprit ? culprit : body);
    if (!words) return TW_ERROR;
    if (found) engine_fail(e, kind, format, words);
    else
        engine_fail(e, ERROR_UNSUITABLE, "%s (in %s), and no substitution %s = %s^a*t separates them",
                    why ? why : "no kernel found", words, x->is.name, s);
    free(words);
    return TW_ERROR;
}

/* ---- flat amplitudes ---- */

/* The power of x in a product of powers and things free of x; false when x stands elsewhere in it. rest: what is left. */
static bool read_monomial(tw_engine *e, expr *a, expr *x, fmpq_t power, expr **rest)
{
    expr *const *factors;
    size_t count = expr_factors(&a, &factors);
    fmpq_zero(power);
    *rest = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        expr *base, *exponent;
        expr_as_power(e, factors[k], &base, &exponent);
        if (base == x && expr_is_number(exponent)) fmpq_add(power, power, expr_number(exponent));
        else if (expr_has(factors[k], x)) return false;
        else *rest = expr_mul(e, *rest, factors[k]);
    }
    return *rest != NULL;
}

/* Does the argument of an exponential tend to -inf like a negative power of x as x -> 0+? least: that power. */
static bool sinks_at_zero(tw_engine *e, expr *argument, expr *x, fmpq_t least)
{
    expr *const *terms, *front = NULL;
    size_t count = expr_terms(&argument, &terms);
    fmpq_t power;
    fmpq_init(power);
    fmpq_zero(least);
    for (size_t k = 0; k < count; k++) {
        expr *rest;
        if (!read_monomial(e, terms[k], x, power, &rest) || fmpq_cmp(power, least) >= 0) continue;
        fmpq_set(least, power);
        front = rest;
    }
    fmpq_clear(power);
    return front && decide_sign(e, front) == -1;
}

/* An end where the kernel is largest and the amplitude is smaller than every power. */
typedef struct flat_end {
    expr *factor;   /* the amplitude's, as it is written; NULL: no such end was seen */
    fmpq_t power;   /* it sinks like exp(-y^power), y the distance from the end */
    fmpq_t mu;      /* the phase rises like y^mu */
    fmpq_t scale;   /* ... times the large parameter to this power */
} flat_end;

static void flat_end_init(flat_end *f)
{
    f->factor = NULL;
    fmpq_init(f->power);
    fmpq_init(f->mu);
    fmpq_init(f->scale);
}

static void flat_end_clear(flat_end *f)
{
    fmpq_clear(f->power);
    fmpq_clear(f->mu);
    fmpq_clear(f->scale);
}

/* a at x = from + y. */
static expr *seen_from(tw_engine *e, const separation *s, expr *a, expr *y)
{
    return expr_expand(e, expr_substitute(e, a, s->variable, expr_add(e, s->from, y)));
}

/* Is the phase c*(x - from)^mu, up to a constant, with c, mu > 0? */
static bool rises_from_start(tw_engine *e, const separation *s, expr *y, fmpq_t mu)
{
    expr *phase = seen_from(e, s, s->phase, y), *const *terms, *moving = expr_int(e, 0), *rest;
    size_t count = phase ? expr_terms(&phase, &terms) : 0;
    for (size_t k = 0; k < count; k++)
        if (expr_has(terms[k], y)) moving = expr_add(e, moving, terms[k]);
    return moving && read_monomial(e, moving, y, mu, &rest) && fmpq_sgn(mu) > 0 && decide_sign(e, rest) == 1;
}

static void find_flat_start(tw_engine *e, const separation *s, flat_end *out)
{
    if (expr_is_minus_inf(s->from)) return;
    expr *y = expr_fresh(e, "y");
    if (!rises_from_start(e, s, y, out->mu)) return;
    fmpq_set(out->scale, s->power);
    expr *const *factors;
    size_t count = expr_factors(&s->amplitude, &factors);
    for (size_t k = 0; k < count && !out->factor && e->error.kind == ERROR_NONE; k++) {
        if (!expr_is_call(factors[k], FUNCTION_EXP)) continue;
        expr *argument = expr_substitute(e, factors[k]->args[0], s->variable, expr_add(e, s->from, y));
        if (argument && sinks_at_zero(e, argument, y, out->power)) out->factor = factors[k];
    }
}

/* s^K y^mu against y^power: y = s^(-K/(mu - power)). */
static void flat_end_stretch(const flat_end *f, fmpq_t a)
{
    fmpq_sub(a, f->mu, f->power);
    fmpq_div(a, f->scale, a);
    fmpq_neg(a, a);
}

/* No powers of s arise at a flat end. What would help: x = s^a*t with which kernel and flat factor are of one size. */
static tw_status advise_stretch(tw_engine *e, const flat_end *f, expr *x, expr *from, expr *large)
{
    fmpq_t a;
    fmpq_init(a);
    flat_end_stretch(f, a);
    char *flat = expr_text(e, f->factor), *place = expr_text(e, from), *by = expr_text(e, expr_pow(e, large, expr_fmpq(e, a)));
    bool at_zero = expr_is_zero(from);
    engine_fail(e, ERROR_UNSUITABLE,
                "%s is smaller than every power at the end %s = %s, which gives no terms; with %s = %s%s%s*t kernel and this "
                "factor get one scale, and where the rest is a power of t the method `laplace` applies",
                flat, x->is.name, place, x->is.name, at_zero ? "" : place, at_zero ? "" : " + ", by);
    free(flat);
    free(place);
    free(by);
    fmpq_clear(a);
    return TW_ERROR;
}

/* ---- the whole ---- */

/* Is x > 0 on the path for certain? */
static bool runs_positive(tw_engine *e, expr *from)
{
    if (expr_is_minus_inf(from)) return false;
    int sign = decide_sign(e, from);
    return sign == 0 || sign == 1;
}

/* Does the body separate under x = large^a t? The result goes into out. */
static bool try_stretch(tw_engine *e, separation *out, sorting *s, expr *body, expr *x, expr *from, expr *to,
                        const fmpq_t a)
{
    expr *by = expr_pow(e, s->large, expr_fmpq(e, a));
    bool stretched = !fmpq_is_zero(a);
    expr *t = stretched ? expr_fresh(e, "t") : x;
    expr *ends[] = {from, to};
    for (int k = 0; k < 2; k++) {
        if (stretched && !expr_is_inf(ends[k]) && !expr_is_minus_inf(ends[k]))
            ends[k] = draw_all(e, expr_div(e, ends[k], by), s->large);
        if (!ends[k] || expr_has(ends[k], s->large)) return refuse(s, "an end of the path moves with it", ends[k]);
    }
    if (stretched) body = expr_mul(e, by, expr_substitute(e, body, x, expr_mul(e, by, t)));
    expr *positive[] = {s->large, t};
    size_t count = runs_positive(e, from) ? 2 : 1;
    body = draw_all(e, normal_under_facts(e, body, positive, count), s->large);
    body = normal_under_facts(e, body, positive, count);
    s->x = t;
    if (!body || !sort_body(s, body)) return false;
    *out = (separation){t, ends[0], ends[1], s->factor, s->amplitude, s->phase, {out->power[0]}, {out->stretch[0]}};
    fmpq_set(out->power, s->power);
    fmpq_set(out->stretch, a);
    return true;
}

static bool power_grows(const separation *s, bool small)
{
    return s->phase && fmpq_sgn(s->power) == (small ? -1 : 1);
}

/* Does an exponential of the variable stand in a? Its place is in the kernel when the variable was stretched for it. */
static bool holds_exponential(expr *a, expr *x)
{
    if (!expr_has(a, x)) return false;
    if (expr_is_call(a, FUNCTION_EXP)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_exponential(a->args[k], x)) return true;
    return false;
}

tw_status body_separate(tw_engine *e, separation *out, expr *body, expr *x, expr *from, expr *to, expr *large,
                        bool small, bool stretched)
{
    enum { CANDIDATES_AT_MOST = 3 + MEETINGS_AT_MOST + MEETINGS_AT_MOST * MEETINGS_AT_MOST };
    fmpq *list = _fmpq_vec_init(CANDIDATES_AT_MOST);
    size_t count = list_candidates(e, list, body, from, to, x, large);
    const char *why = NULL;
    expr *culprit = NULL;
    bool found = false, weak = false;
    flat_end flat; /* when nothing is stretched: another scale may then do better */
    flat_end_init(&flat);
    for (size_t k = stretched ? 1 : 0; k < count && !found && budget_ok(e); k++) {
        sorting s = {e, x, large, NULL, NULL, NULL, {{0}}, NULL, NULL};
        fmpq_init(s.power);
        bool separated = try_stretch(e, out, &s, body, x, from, to, &list[k]);
        found = separated && power_grows(out, small) && !(stretched && holds_exponential(out->amplitude, out->variable));
        weak = weak || (separated && !found);
        if (found && k == 0) find_flat_start(e, out, &flat);
        if (k == 0 && flat.factor) { /* only the stretch that brings both to one scale can help */
            found = false;
            count = expr_is_zero(from) ? 2 : 1;
            flat_end_stretch(&flat, &list[1]);
        }
        if (!why) {
            why = s.why;
            culprit = s.culprit;
        }
        fmpq_clear(s.power);
    }
    _fmpq_vec_clear(list, CANDIDATES_AT_MOST);
    if (flat.factor && !found && e->error.kind == ERROR_NONE) (void)advise_stretch(e, &flat, x, from, large);
    flat_end_clear(&flat);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (found) return TW_OK;
    if (weak && !why)
        return engine_fail(e, ERROR_UNSUITABLE,
                           "the integrand has no kernel that narrows as %s %s: there is no large parameter in "
                           "its exponent",
                           large->is.name, small ? "tends to 0" : "grows");
    return refuse_body(e, body, x, large, why, culprit);
}
