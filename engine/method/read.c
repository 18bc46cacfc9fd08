/* Reading an integral: from what was typed to factor * sum of int_0^end q exp(-scale p) dx (methods in their own files
 * start from there). The one idea: the form is only ever changed by named, recorded, exact rewrites (take out factors,
 * mirror, stretch, shift, split), so that the integral read is the integral typed. integral_read lists the stages in
 * order. */
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/method/convergence.h"
#include "engine/method/frame.h"
#include "engine/method/kinks.h"

void reading_init(reading *r)
{
    memset(r, 0, sizeof *r);
    fmpq_init(r->power);
    local_form_init(&r->rest);
    conditions_init(&r->conditions);
    derivation_init(&r->derivation);
}

static void reading_forget_points(reading *r)
{
    for (size_t k = 0; k < r->point_count; k++) {
        fmpq_clear(r->points[k].mu);
        local_form_clear(&r->points[k].local);
    }
    free(r->points);
    r->points = NULL;
    r->point_count = 0;
    local_form_clear(&r->rest);
    r->rest_floor = NULL;
}

void reading_clear(reading *r)
{
    fmpq_clear(r->power);
    reading_forget_points(r);
    conditions_clear(&r->conditions);
    derivation_clear(&r->derivation);
    free(r->summary);
    memset(r, 0, sizeof *r);
}

critical_point *reading_add(reading *r)
{
    r->points = base_resize(r->points, (r->point_count + 1) * sizeof *r->points);
    critical_point *c = &r->points[r->point_count++];
    memset(c, 0, sizeof *c);
    c->dominant = true;
    fmpq_init(c->mu);
    local_form_init(&c->local);
    return c;
}

/* ---- the record ---- */

step *frame_record(frame *f, const char *rule, const char *source, expr *after, const char *format, ...)
{
    step *s = derivation_add(&f->r->derivation, rule, source);
    s->after = after;
    if (format) {
        char words[512];
        va_list list;
        va_start(list, format);
        vsnprintf(words, sizeof words, format, list);
        va_end(list);
        s->detail = base_copy(words);
    }
    return s;
}

static expr *form_so_far(const frame *f)
{
    return expr_mul(f->e, f->outside, expr_integral(f->e, f->x, f->from, f->to, f->body));
}

expr *local_form_integral(tw_engine *e, const local_form *l)
{
    expr *sum = expr_int(e, 0), *zero = expr_int(e, 0);
    for (size_t k = 0; k < l->count; k++) {
        const branch *b = &l->branches[k];
        expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, l->scale, b->p)));
        sum = expr_add(e, sum, expr_integral(e, b->x, zero, b->end, expr_mul(e, b->q, kernel)));
    }
    return expr_mul(e, l->factor, sum);
}

/* ---- taking apart ---- */

static bool holds_kind(expr *a, expr_kind kind)
{
    if (a->kind == kind) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_kind(a->args[k], kind)) return true;
    return false;
}

static bool holds_i(expr *a)
{
    if (expr_is_constant(a, CONSTANT_I)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_i(a->args[k])) return true;
    return false;
}

static tw_status find_binder(frame *f, expr *integral)
{
    tw_engine *e = f->e;
    expr *const *factors;
    size_t count = expr_factors(&integral, &factors);
    f->outside = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (factors[k]->kind == EXPR_CONTOUR)
            return engine_fail(e, ERROR_UNAVAILABLE,
                               "an integral along a contour needs the method `descent`, which this version "
                               "does not have");
        if (factors[k]->kind == EXPR_INTEGRAL && f->binder)
            return engine_fail(e, ERROR_UNSUITABLE, "this is a product of integrals: expand each by itself");
        if (factors[k]->kind == EXPR_INTEGRAL) f->binder = factors[k];
        else f->outside = expr_mul(e, f->outside, factors[k]);
    }
    if (!f->binder)
        return engine_fail(e, ERROR_UNSUITABLE,
                           holds_kind(integral, EXPR_INTEGRAL)
                               ? "the integral stands inside a power or a function: expand the integral by itself"
                               : "there is no integral in it");
    return f->outside ? TW_OK : TW_ERROR;
}

static tw_status open_binder(frame *f)
{
    tw_engine *e = f->e;
    const char *name = expr_binder_name(f->binder);
    f->x = expr_fresh(e, name);
    f->r->original_variable = expr_symbol(e, name);
    f->from = f->binder->args[0];
    f->to = f->binder->args[1];
    f->body = expr_open(e, f->binder, f->x);
    if (!f->body || !f->x || !f->r->original_variable) return TW_ERROR;
    if (holds_kind(f->body, EXPR_INTEGRAL) || holds_kind(f->body, EXPR_CONTOUR))
        return engine_fail(e, ERROR_UNSUITABLE,
                           "this is an integral over an integral: the methods need one variable, so carry out "
                           "the inner integral first");
    if (holds_kind(f->from, EXPR_INTEGRAL) || holds_kind(f->to, EXPR_INTEGRAL))
        return engine_fail(e, ERROR_UNSUITABLE, "an end of the path is an integral");
    return TW_OK;
}

static tw_status find_large(frame *f)
{
    tw_engine *e = f->e;
    large_kind kind = facts_large(e, &f->r->large);
    if (kind == LARGE_NONE)
        return engine_fail(e, ERROR_UNSUITABLE,
                           "no parameter is declared large or small: say for example `large s` first");
    f->r->small = kind == LARGE_SMALL;
    const char *name = f->r->large->is.name;
    if (!expr_has(f->body, f->r->large) && !expr_has(f->from, f->r->large) && !expr_has(f->to, f->r->large))
        return engine_fail(e, ERROR_UNSUITABLE, "%s does not occur in the integral: there is nothing to expand in",
                           name);
    return TW_OK;
}

/* ---- the path's direction ---- */

static tw_status turn_path(frame *f)
{
    tw_engine *e = f->e;
    bool down = expr_is_inf(f->from) || expr_is_minus_inf(f->to);
    if (!down && !expr_is_minus_inf(f->from) && !expr_is_inf(f->to)) {
        int sign = decide_sign(e, expr_sub(e, f->to, f->from));
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (sign == 0) return engine_fail(e, ERROR_UNSUITABLE, "the path has length 0: the integral is 0");
        down = sign == -1;
        if (sign == 2 &&
            conditions_require(e, &f->r->conditions, expr_relation_of(e, RELATION_LESS, f->from, f->to)) != TW_OK)
            return TW_ERROR;
    }
    if (!down) return TW_OK;
    expr *swap = f->from;
    f->from = f->to;
    f->to = swap;
    f->outside = expr_neg(e, f->outside);
    frame_record(f, "turn the path round", NULL, form_so_far(f), NULL);
    return TW_OK;
}

static tw_status mirror_path(frame *f)
{
    tw_engine *e = f->e;
    if (!expr_is_minus_inf(f->from) || expr_is_inf(f->to)) return TW_OK;
    expr *y = expr_fresh(e, expr_binder_name(f->binder));
    f->body = expr_substitute(e, f->body, f->x, expr_neg(e, y));
    f->from = expr_neg(e, f->to);
    f->to = expr_constant_of(e, CONSTANT_INF);
    f->x = y;
    f->mirrored = true;
    if (!f->body || !f->from) return TW_ERROR;
    frame_record(f, "mirror the path", NULL, form_so_far(f), "%s is replaced by -%s", f->r->original_variable->is.name,
           f->r->original_variable->is.name);
    return TW_OK;
}

/* ---- kernel and amplitude ---- */

static tw_status separate(frame *f, bool moved)
{
    tw_engine *e = f->e;
    reading *r = f->r;
    if (body_separate(e, &f->s, f->body, f->x, f->from, f->to, r->large, r->small, moved) != TW_OK)
        return TW_ERROR;
    if (holds_i(f->s.phase))
        return engine_fail(e, ERROR_UNAVAILABLE,
                           "the exponent is not real on the path, and not of the form i*scale*phase that "
                           "stationary phase takes");
    fmpq_set(r->power, f->s.power);
    f->outside = expr_mul(e, f->outside, f->s.factor);
    bool stretched = !fmpq_is_zero(f->s.stretch);
    f->x = f->s.variable;
    f->from = f->s.from;
    f->to = f->s.to;
    expr *scale = expr_pow(e, r->large, expr_fmpq(e, r->power));
    expr *kernel = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, scale, f->s.phase)));
    f->body = expr_mul(e, f->s.amplitude, kernel);
    expr *form = form_so_far(f);
    if (!form) return TW_ERROR;
    if (stretched) {
        char *by = expr_text(e, expr_pow(e, r->large, expr_fmpq(e, f->s.stretch)));
        frame_record(f, "stretch the variable", NULL, form, "%s = %s*t separates %s from the variable",
               r->original_variable->is.name, by ? by : "", r->large->is.name);
        free(by);
    } else if (form != r->derivation.steps[r->derivation.count - 1].after) {
        frame_record(f, "separate kernel and amplitude", NULL, form, NULL);
    }
    return TW_OK;
}

/* The original variable at t. */
expr *frame_place(const frame *f, expr *t)
{
    tw_engine *e = f->e;
    if (f->logarithm) t = expr_substitute(e, f->unwound, f->logarithm, t);
    expr *x = expr_mul(e, expr_pow(e, f->r->large, expr_fmpq(e, f->s.stretch)), t);
    return f->mirrored ? expr_neg(e, x) : x;
}

/* ---- logarithmic phases ---- */

/* phase = c*log(slope*x + constant) + terms free of x: the linear function and its slope; NULL otherwise. */
static expr *linear_in_logarithm(tw_engine *e, expr *phase, expr *x, expr **slope)
{
    expr *const *terms, *const *factors;
    size_t count = expr_terms(&phase, &terms);
    expr *found = NULL;
    for (size_t k = 0; k < count; k++) {
        if (!expr_has(terms[k], x)) continue;
        size_t n = expr_factors(&terms[k], &factors);
        for (size_t m = 0; m < n; m++) {
            if (!expr_has(factors[m], x)) continue;
            if (found || !expr_is_call(factors[m], FUNCTION_LOG)) return NULL;
            found = factors[m]->args[0];
        }
    }
    expr **a;
    slong degree;
    if (!found || expr_polynomial(e, found, x, 1, &a, &degree) != TW_OK) return NULL;
    *slope = degree == 1 ? a[1] : NULL;
    free(a);
    return *slope ? found : NULL;
}

/* log of the value of `linear` at an end; -inf where it vanishes; NULL where it is negative or not known. */
static expr *end_of_logarithm(tw_engine *e, expr *linear, expr *x, expr *end)
{
    if (expr_is_inf(end) || expr_is_minus_inf(end)) return NULL;
    expr *value = expr_substitute(e, linear, x, end);
    int sign = value ? decide_sign(e, value) : 2;
    if (sign == 0) return expr_neg(e, expr_constant_of(e, CONSTANT_INF));
    return sign == 1 ? expr_call1(e, FUNCTION_LOG, value) : NULL;
}

/* x^s and (1 - x)^s on a finite path that ends where the base vanishes: base = exp(u) makes the phase linear and the
 * path infinite. */
static tw_status unwind_logarithm(frame *f)
{
    tw_engine *e = f->e;
    expr *slope, *linear = linear_in_logarithm(e, f->s.phase, f->x, &slope);
    if (!linear) return TW_OK;
    int sign = decide_sign(e, slope);
    expr *from = end_of_logarithm(e, linear, f->x, f->from), *to = end_of_logarithm(e, linear, f->x, f->to);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (!from || !to || (sign != 1 && sign != -1) || (!expr_is_minus_inf(from) && !expr_is_minus_inf(to))) return TW_OK;
    expr *u = expr_fresh(e, "u"), *base = expr_call1(e, FUNCTION_EXP, u);
    expr *constant = expr_substitute(e, linear, f->x, expr_int(e, 0));
    f->unwound = expr_div(e, expr_sub(e, base, constant), slope);
    f->logarithm = u;
    expr *moved = expr_substitute(e, f->s.amplitude, f->x, f->unwound);
    expr *speed = expr_div(e, base, expr_mul(e, expr_int(e, sign), slope));
    f->s.amplitude = normal_under_facts(e, expr_mul(e, moved, speed), NULL, 0);
    f->s.phase = normal_under_facts(e, expr_expand(e, expr_substitute(e, f->s.phase, f->x, f->unwound)), NULL, 0);
    if (!f->s.amplitude || !f->s.phase) return TW_ERROR;
    f->x = u;
    f->from = sign > 0 ? from : to;
    f->to = sign > 0 ? to : from;
    expr *scale = expr_pow(e, f->r->large, expr_fmpq(e, f->r->power));
    f->body = expr_mul(e, f->s.amplitude, expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, scale, f->s.phase))));
    char *words = expr_text(e, linear);
    frame_record(f, "take the base of the power for the variable", NULL, form_so_far(f), "%s = exp(u)", words ? words : "");
    free(words);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- branches ---- */

static expr *without_abs(tw_engine *e, expr *f, expr *x, expr *end);

static expr *rebuild(tw_engine *e, expr *f, expr *x, expr *end)
{
    expr **args = base_alloc((f->count + 1) * sizeof *args);
    bool good = true, same = true;
    for (uint32_t k = 0; k < f->count; k++) {
        args[k] = without_abs(e, f->args[k], x, end);
        good = good && args[k];
        same = same && args[k] == f->args[k];
    }
    expr *made = !good ? NULL : same ? f : expr_rebuild(e, f, args);
    free(args);
    return made;
}

/* abs(u) and sign(u) replaced where u has one sign on (0, end). */
static expr *without_abs(tw_engine *e, expr *f, expr *x, expr *end)
{
    if (!expr_has(f, x) || f->count == 0) return f;
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER && f->kind != EXPR_CALL) return f;
    if (expr_is_call(f, FUNCTION_ABS) || expr_is_call(f, FUNCTION_SIGN)) {
        bool modulus = f->is.function == FUNCTION_ABS;
        expr *u = f->args[0], *minus = expr_neg(e, u);
        if (positive_on_branch(e, u, x, end) == ANSWER_YES) return modulus ? u : expr_int(e, 1);
        if (positive_on_branch(e, minus, x, end) == ANSWER_YES) return modulus ? minus : expr_int(e, -1);
    }
    return rebuild(e, f, x, end);
}

/* A part of f that has a kink or a jump where nobody said it has none; NULL when there is none. */
static expr *find_kink(expr *f, expr *x)
{
    if (!expr_has(f, x)) return NULL;
    if (f->kind == EXPR_PIECEWISE) return f;
    if (f->kind == EXPR_CALL) {
        switch (f->is.function) {
        case FUNCTION_ABS:
        case FUNCTION_SIGN:
        case FUNCTION_MIN:
        case FUNCTION_MAX:
        case FUNCTION_RE:
        case FUNCTION_IM:
        case FUNCTION_CONJ:
        case FUNCTION_ARG: return f;
        default: break;
        }
    }
    for (uint32_t k = 0; k < f->count; k++) {
        expr *found = find_kink(f->args[k], x);
        if (found) return found;
    }
    return NULL;
}

/* The methods take the amplitude for analytic inside the path: an expansion at its end knows nothing of what a kink
 * adds. */
static tw_status refuse_kinks(tw_engine *e, expr *q, expr *y)
{
    expr *kink = find_kink(q, y);
    if (!kink) return TW_OK;
    char *words = expr_text(e, kink);
    engine_fail(e, ERROR_UNSUITABLE,
                "the amplitude holds %s (%s measured from the critical point), which is not analytic on the whole "
                "path: split the integral where it changes and expand the parts",
                words ? words : "", y->is.name);
    free(words);
    return TW_ERROR;
}

/* The branch that starts at the least point and runs up (sign 1) or down (-1) to `far`. */
static tw_status add_branch(frame *f, critical_point *c, int sign, expr *far)
{
    tw_engine *e = f->e;
    expr *y = expr_fresh(e, expr_binder_name(f->binder));
    bool endless = expr_is_inf(far) || expr_is_minus_inf(far);
    expr *end =
        endless ? expr_constant_of(e, CONSTANT_INF) : expr_mul(e, expr_int(e, sign), expr_sub(e, far, f->p.center));
    end = normal_under_facts(e, end, NULL, 0);
    expr *x = expr_add(e, f->p.center, expr_mul(e, expr_int(e, sign), y));
    expr *q = normal_under_facts(e, expr_substitute(e, f->s.amplitude, f->x, x), &y, 1);
    if (!q || !end) return TW_ERROR;
    q = normal_under_facts(e, without_abs(e, q, y, end), &y, 1);
    expr *p = f->p.pure ? expr_pow(e, y, expr_fmpq(e, f->p.mu)) : NULL;
    if (!p) {
        expr *level = expr_substitute(e, f->s.phase, f->x, f->p.center);
        p = expr_sub(e, expr_substitute(e, f->s.phase, f->x, x), level);
        p = normal_under_facts(e, expr_expand(e, p), &y, 1);
        f->p.level = level;
    }
    if (!p || !q || refuse_kinks(e, q, y) != TW_OK) return TW_ERROR;
    c->far_places[c->local.count] = endless ? NULL : frame_place(f, far);
    local_form_add(&c->local, y, end, p, q);
    return TW_OK;
}

static tw_status make_branches(frame *f)
{
    tw_engine *e = f->e;
    reading *r = f->r;
    const place *p = &f->p;
    critical_point *c = reading_add(r);
    c->kind = p->kind == PLACE_INSIDE ? POINT_INTERIOR : POINT_END;
    c->pure = p->pure;
    fmpq_set(c->mu, p->mu);
    c->place = frame_place(f, p->center);
    if (p->kind != PLACE_TO && add_branch(f, c, 1, f->to) != TW_OK) return TW_ERROR;
    if (p->kind != PLACE_FROM && add_branch(f, c, -1, f->from) != TW_OK) return TW_ERROR;
    c->depth = p->level;
    expr *large = expr_pow(e, r->large, expr_fmpq(e, r->power));
    c->scale_constant = p->pure ? p->c : expr_int(e, 1);
    c->local.scale = expr_mul(e, c->scale_constant, large);
    expr *height = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, large, p->level)));
    c->local.factor = normal_under_facts(e, expr_mul(e, f->outside, height), &r->large, 1);
    if (!c->place || !c->local.scale || !c->local.factor) return TW_ERROR;
    char *words = expr_text(e, c->place);
    const char *rule = p->kind == PLACE_INSIDE   ? "split at the critical point"
                       : expr_is_zero(p->center) ? "find the critical point"
                                                 : "shift to the critical point";
    frame_record(f, rule, NULL, local_form_integral(e, &c->local), "the exponent is greatest at %s = %s only",
           r->original_variable->is.name, words ? words : "");
    free(words);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- convergence, in the large parameter ---- */

/* scale > least as a bound on the parameter itself; NULL when it is no restriction. */
static expr *parameter_bound(frame *f, expr *least)
{
    tw_engine *e = f->e;
    int sign = expr_is_number(least) ? fmpq_sgn(expr_number(least)) : decide_sign(e, least);
    if (sign == 0 || sign == -1) return NULL;
    fmpq_t inverse;
    fmpq_init(inverse);
    fmpq_inv(inverse, f->r->power);
    expr *bound = expr_pow(e, expr_div(e, least, f->r->points->scale_constant), expr_fmpq(e, inverse));
    fmpq_clear(inverse);
    return bound;
}

static tw_status check_convergence(frame *f, text *summary)
{
    tw_engine *e = f->e;
    reading *r = f->r;
    expr *least = NULL;
    bool proved = true;
    for (size_t n = 0; n < r->point_count; n++) {
        const critical_point *c = &r->points[n];
        for (size_t k = 0; k < c->local.count && c->dominant; k++)
            if (branch_converges(e, r, c, k, &least, &proved) != TW_OK) return TW_ERROR;
    }
    for (size_t k = 0; k < r->rest.count; k++)
        if (rest_converges(e, r, &r->rest.branches[k], &least, &proved) != TW_OK) return TW_ERROR;
    const char *s = r->large->is.name, *sign = r->small ? "<" : ">";
    expr *bound = least ? parameter_bound(f, least) : NULL;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    step *last = &r->derivation.steps[r->derivation.count - 1];
    text words;
    text_init(&words);
    if (!proved) {
        text_addf(&words, "the integral converges absolutely for %s %s", r->small ? "small" : "large", s);
        conditions_add(&r->conditions, words.bytes, NULL, CONDITION_OPEN);
        conditions_add(&last->conditions, words.bytes, NULL, CONDITION_OPEN);
        text_addf(summary, "; convergence for %s %s is not proved", r->small ? "small" : "large", s);
    } else {
        char *number = bound ? expr_text(e, bound) : base_copy("0");
        const char *relation = bound ? sign : ">";
        text_addf(&words, "the integral converges absolutely for %s %s %s", s, relation, number ? number : "");
        if (bound) conditions_add(&r->conditions, words.bytes, NULL, CONDITION_PROVED);
        conditions_add(&last->conditions, words.bytes, NULL, CONDITION_PROVED);
        text_addf(summary, "; converges for %s %s %s", s, relation, number ? number : "");
        free(number);
    }
    text_clear(&words);
    conditions_append(&last->conditions, &r->conditions);
    return TW_OK;
}

/* ---- the whole ---- */

static void begin_summary(frame *f, text *t)
{
    expr **symbols;
    size_t count = expr_symbols(f->r->integral, &symbols);
    text_addf(t, "depends on %s", f->r->large->is.name);
    for (size_t k = 0; k < count; k++)
        if (symbols[k] != f->r->large) text_addf(t, ", %s", symbols[k]->is.name);
    free(symbols);
    const reading *r = f->r;
    size_t dominant = 0;
    for (size_t k = 0; k < r->point_count; k++) dominant += r->points[k].dominant;
    text_add(t, dominant == 1 ? "; one critical point, " : "; critical points of equal depth, ");
    for (size_t k = 0; k < r->point_count; k++) {
        const critical_point *c = &r->points[k];
        if (!c->dominant) continue;
        char *words = expr_text(f->e, c->place);
        text_addf(t, "%s%s%s = %s%s", k == 0 ? "" : " and ", c->kind == POINT_END ? "the end " : "",
                  r->original_variable->is.name, words ? words : "", c->kind == POINT_END ? "" : " inside the path");
        free(words);
    }
}

static bool holds_decaying_exponential(expr *a, expr *x)
{
    if (expr_is_call(a, FUNCTION_EXP)) return expr_has(a, x);
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_decaying_exponential(a->args[k], x)) return true;
    return false;
}

/* The points that count: pure powers by themselves, everything else from the path cut where the phase turns; where that
 * cannot be decided, a phase that rises or falls all along is enough. */
static tw_status find_points(frame *f)
{
    tw_engine *e = f->e;
    bool found = false;
    if (place_find_pure(e, &f->p, f->s.phase, f->x, f->from, f->to, f->r->large, &f->r->conditions, &found) != TW_OK)
        return TW_ERROR;
    if (found && !find_kink(f->s.amplitude, f->x)) return make_branches(f);
    if (frame_find_wells(f) == TW_OK) return TW_OK;
    if (e->error.kind != ERROR_UNDECIDED && e->error.kind != ERROR_VALUE) return TW_ERROR;
    tw_error first = {e->error.kind, base_copy(e->error.words)};
    engine_forgive(e);
    reading_forget_points(f->r);
    tw_status status = found ? TW_OK : place_find_by_slope(e, &f->p, f->s.phase, f->x, f->from, f->to, f->r->large, &f->r->conditions);
    if (status == TW_OK) status = make_branches(f);
    bool hard = e->error.kind == ERROR_TIME || e->error.kind == ERROR_INTERRUPT || e->error.kind == ERROR_MEMORY;
    if (status != TW_OK && !hard) {
        engine_forgive(e);
        engine_fail(e, first.kind, "%s", first.words);
    }
    free(first.words);
    return status;
}

/* The kernel by itself first. Where it grows but the amplitude has an exponential of its own (x^s*exp(-x)), the least
 * point moves with the large parameter: a stretched variable keeps it in place. */
static tw_status separate_and_find(frame *f)
{
    tw_engine *e = f->e;
    frame before = *f;
    size_t steps = f->r->derivation.count;
    if (separate(f, false) != TW_OK || unwind_logarithm(f) != TW_OK) return TW_ERROR;
    if (find_points(f) == TW_OK) return TW_OK;
    if (e->error.kind != ERROR_DIVERGENT || !holds_decaying_exponential(f->s.amplitude, f->x)) return TW_ERROR;
    tw_error first = {e->error.kind, base_copy(e->error.words)};
    engine_forgive(e);
    reading_forget_points(f->r);
    derivation_cut(&f->r->derivation, steps);
    f->x = before.x;
    f->from = before.from;
    f->to = before.to;
    f->body = before.body;
    f->outside = before.outside;
    f->logarithm = f->unwound = NULL;
    tw_status status = separate(f, true);
    if (status == TW_OK) status = find_points(f);
    bool soft = e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_DIVERGENT;
    if (status != TW_OK && soft) {
        const char *s = f->r->large->is.name, *x = f->r->original_variable->is.name;
        engine_forgive(e);
        engine_fail(e, ERROR_UNSUITABLE,
                    "the kernel does not hold the integral together, only the amplitude does, so the critical point moves "
                    "with %s; no substitution %s = %s^a*t brings it to rest and separates %s from the variable",
                    s, x, s, s);
    }
    free(first.words);
    return status;
}

static tw_status read_stages(frame *f, text *summary)
{
    reading *r = f->r;
    if (find_binder(f, r->integral) != TW_OK || open_binder(f) != TW_OK || find_large(f) != TW_OK) return TW_ERROR;
    step *first = frame_record(f, "as typed", NULL, r->integral, NULL);
    first->before = r->integral;
    if (turn_path(f) != TW_OK || mirror_path(f) != TW_OK || separate_and_find(f) != TW_OK) return TW_ERROR;
    begin_summary(f, summary);
    return check_convergence(f, summary);
}

tw_status integral_read(tw_engine *e, reading *out, expr *integral)
{
    frame f = {.e = e, .r = out};
    separation_init(&f.s);
    place_init(&f.p);
    out->integral = integral;
    text summary;
    text_init(&summary);
    tw_status status = read_stages(&f, &summary);
    if (status == TW_OK) out->summary = base_copy(summary.bytes ? summary.bytes : "");
    text_clear(&summary);
    separation_clear(&f.s);
    place_clear(&f.p);
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
