/* From an integral to an expansion. The one idea: `expand` lists its stages (read, choose, expand, keep the facts) and
 * nobody else knows their order; sums of integrals go through it term by term. A new method is one line in the table
 * below. */
#include "engine/method/lanes.h"
#include "engine/method/method.h"

#include <stdlib.h>
#include <string.h>

#include "engine/method/descent.h"
#include "engine/method/phase.h"
#include "engine/method/scale.h"

static const method *const METHODS[] = {&method_moments, &method_watson, &method_parts, &method_laplace, &method_phase,
                                        &method_descent};
static const char *const PLANNED[] = {"mellin"};

enum { METHOD_COUNT = sizeof METHODS / sizeof *METHODS, PLANNED_COUNT = sizeof PLANNED / sizeof *PLANNED };

const method *const *method_table(size_t *count)
{
    *count = METHOD_COUNT;
    return METHODS;
}

const method *method_find(const char *name)
{
    for (size_t k = 0; k < METHOD_COUNT; k++)
        if (strcmp(METHODS[k]->name, name) == 0) return METHODS[k];
    return NULL;
}

bool method_is_planned(const char *name)
{
    for (size_t k = 0; k < PLANNED_COUNT; k++)
        if (strcmp(PLANNED[k], name) == 0) return true;
    return false;
}

/* ---- choosing ---- */

/* None fits: say what each lacks. */
static tw_status refuse_all(tw_engine *e, const reading *r)
{
    text words;
    text_init(&words);
    for (size_t k = 0; k < METHOD_COUNT; k++) {
        char *why = NULL;
        METHODS[k]->suits(e, r, &why);
        text_addf(&words, "%s%s: %s", k ? "; " : "", METHODS[k]->name, why ? why : "");
        free(why);
    }
    if (e->error.kind == ERROR_NONE)
        engine_fail(e, ERROR_UNAVAILABLE,
                    "no method of this version fits (%s)", words.bytes);
    text_clear(&words);
    return TW_ERROR;
}

/* The method and, in *why, the sentence that says what was chosen and why. */
static tw_status choose_method(tw_engine *e, const reading *r, const char *by, const method **chosen, char **why)
{
    *chosen = NULL;
    for (size_t k = 0; k < METHOD_COUNT && !*chosen; k++) {
        if (by && strcmp(METHODS[k]->name, by) != 0) continue;
        char *reason = NULL;
        answer a = METHODS[k]->suits(e, r, &reason);
        if (e->error.kind == ERROR_NONE && by && a != ANSWER_YES)
            engine_fail(e, ERROR_UNSUITABLE, "%s does not fit: %s", METHODS[k]->title, reason ? reason : "");
        if (e->error.kind == ERROR_NONE && a == ANSWER_YES) {
            *chosen = METHODS[k];
            text t;
            text_init(&t);
            text_addf(&t, "%s%s: %s", METHODS[k]->title, by ? ", as asked" : "", reason ? reason : "");
            *why = text_take(&t);
        }
        free(reason);
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
    }
    return *chosen ? TW_OK : refuse_all(e, r);
}

static tw_status check_name(tw_engine *e, const char *by)
{
    if (!by || method_find(by)) return TW_OK;
    if (method_is_planned(by))
        return engine_fail(e, ERROR_UNAVAILABLE, "this version does not have the method `%s`", by);
    return engine_fail(e, ERROR_NAME, "no method is called `%s`", by);
}

/* ---- one integral ---- */

static void take_reading(expansion *out, reading *r)
{
    out->large = r->large;
    out->small = r->small;
    conditions_append(&out->conditions, &r->conditions);
    out->derivation = r->derivation;
    derivation_init(&r->derivation);
    out->rest = r->rest;
    local_form_init(&r->rest);
    out->rest_floor = r->rest_floor;
}

/* An oscillating kernel has a reading of its own; *done: it is one. */
static tw_status expand_oscillating(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by, bool *done)
{
    bool asked = by && strcmp(by, method_phase.name) == 0;
    phase_reading r;
    char *why = NULL;
    phase_reading_init(&r);
    answer a = !by || asked ? phase_read(e, &r, integral, &why) : ANSWER_NO;
    tw_status status = e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    *done = status != TW_OK || a == ANSWER_YES || why || asked;
    if (status == TW_OK && a == ANSWER_YES) {
        out->made_by = &method_phase;
        out->integral = integral;
        out->why = base_copy("stationary phase: the kernel oscillates");
        status = phase_expand(e, out, &r, terms);
    } else if (status == TW_OK && *done) {
        status = engine_fail(e, ERROR_UNSUITABLE, "stationary phase does not fit: %s",
                             why ? why : "the kernel does not oscillate");
    }
    free(why);
    phase_reading_clear(&r);
    return status;
}

static tw_status expand_one(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by)
{
    if (descent_applies(integral) || (by && strcmp(by, "descent") == 0)) {
        if (by && strcmp(by, "descent") != 0)
            return engine_fail(e, ERROR_UNSUITABLE, "an integral along a path in the complex plane needs the method `descent`");
        return descent_expand(e, out, integral, terms);
    }
    bool done;
    tw_status oscillating = expand_oscillating(e, out, integral, terms, by, &done);
    if (done || oscillating != TW_OK) return oscillating;
    reading r;
    reading_init(&r);
    const method *m = NULL;
    tw_status status = integral_read(e, &r, integral);
    if (status == TW_OK) status = choose_method(e, &r, by, &m, &out->why);
    if (status == TW_OK) {
        take_reading(out, &r);
        out->made_by = m;
        out->integral = integral;
        out->terms_asked = terms;
        status = m->expand(e, out, &r, terms);
    }
    reading_clear(&r);
    return status;
}

/* ---- sums ---- */

/* The exponential part of a prefactor: exp(-2*s) of exp(-2*s)*pi. */
static expr *exponential_part(tw_engine *e, expr *prefactor)
{
    expr *const *factors;
    size_t count = expr_factors(&prefactor, &factors);
    expr *found = expr_int(e, 1);
    for (size_t k = 0; k < count; k++)
        if (expr_is_call(factors[k], FUNCTION_EXP)) found = expr_mul(e, found, factors[k]);
    return found;
}

/* The rests of the parts as one: equal scales, and factors whose ratio is free of the large parameter. */
static tw_status append_rest(tw_engine *e, expansion *out, expansion *part)
{
    if (part->rest.count == 0) return TW_OK;
    if (out->rest.count == 0) {
        local_form_clear(&out->rest);
        out->rest = part->rest;
        out->rest_floor = part->rest_floor;
        local_form_init(&part->rest);
        return TW_OK;
    }
    expr *ratio = normal_under_facts(e, expr_div(e, part->rest.factor, out->rest.factor), &out->large, 1);
    if (!ratio) return TW_ERROR;
    if (part->rest.scale != out->rest.scale || expr_has(ratio, out->large))
        return engine_fail(e, ERROR_UNSUITABLE, "the integrals of this sum have kernels of different kinds: expand each by itself");
    for (size_t k = 0; k < part->rest.count; k++) {
        const branch *b = &part->rest.branches[k];
        local_form_add(&out->rest, b->x, b->end, b->p, expr_mul(e, ratio, b->q));
    }
    expr *both[] = {out->rest_floor, part->rest_floor};
    out->rest_floor = expr_call(e, FUNCTION_MIN, both, 2);
    return out->rest_floor ? TW_OK : TW_ERROR;
}

static tw_status append(tw_engine *e, expansion *out, expansion *part)
{
    if (out->contribution_count > 0 && part->contribution_count > 0) {
        expr *a = exponential_part(e, out->contributions[0].prefactor),
             *b = exponential_part(e, part->contributions[0].prefactor);
        if (a != b)
            return engine_fail(e, ERROR_UNSUITABLE,
                               "the integrals of this sum are of different exponential size: expand each by itself");
    }
    if (append_rest(e, out, part) != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < part->contribution_count; k++) *expansion_add(out) = part->contributions[k];
    part->contribution_count = 0;
    derivation_move(&out->derivation, &part->derivation);
    conditions_append(&out->conditions, &part->conditions);
    out->exact = out->exact && part->exact;
    return TW_OK;
}

/* The first part gives the frame, the others are added. */
static tw_status expand_parts(tw_engine *e, expansion *out, expr *whole, expr *const *parts, size_t count, slong terms,
                              const char *by)
{
    tw_status status = expand_one(e, out, parts[0], terms, by);
    for (size_t k = 1; k < count && status == TW_OK && budget_ok(e); k++) {
        expansion part;
        expansion_init(&part);
        status = expand_one(e, &part, parts[k], terms, by);
        if (status == TW_OK) status = append(e, out, &part);
        expansion_clear(&part);
    }
    out->integral = whole;
    return status == TW_OK && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* outside * int (f + g) -> outside * int f, outside * int g: the parts of a sum under the integral sign, after
 * expanding; NULL when there is only one. Fresh array. */
static expr **split_body(tw_engine *e, expr *integral, size_t *count)
{
    expr *const *factors;
    size_t n = expr_factors(&integral, &factors);
    expr *binder = NULL, *outside = expr_int(e, 1);
    for (size_t k = 0; k < n; k++) {
        if (factors[k]->kind == EXPR_INTEGRAL) binder = factors[k];
        else outside = expr_mul(e, outside, factors[k]);
    }
    *count = 0;
    if (!binder) return NULL;
    expr *x = expr_fresh(e, expr_binder_name(binder));
    expr *body = expr_expand(e, expr_open(e, binder, x));
    if (!body || body->kind != EXPR_SUM) return NULL;
    expr **parts = base_alloc(body->count * sizeof *parts);
    for (uint32_t k = 0; k < body->count; k++) {
        parts[k] = expr_mul(e, outside, expr_integral(e, x, binder->args[0], binder->args[1], body->args[k]));
        if (!parts[k]) {
            free(parts);
            return NULL;
        }
    }
    *count = body->count;
    return parts;
}

/* One integral; where its terms have different kernels, term by term. */
static tw_status expand_integral(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by)
{
    tw_status status = expand_one(e, out, integral, terms, by);
    if (status == TW_OK || (e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_UNAVAILABLE)) return status;
    tw_error first = {e->error.kind, base_copy(e->error.words)};
    engine_forgive(e);
    size_t count;
    expr **parts = split_body(e, integral, &count);
    if (parts) {
        expansion_clear(out);
        status = expand_parts(e, out, integral, parts, count, terms, by);
        free(parts);
    }
    bool hard = e->error.kind == ERROR_TIME || e->error.kind == ERROR_INTERRUPT || e->error.kind == ERROR_MEMORY;
    if (status != TW_OK && !hard) {
        engine_forgive(e);
        engine_fail(e, first.kind, "%s", first.words);
    }
    free(first.words);
    return status;
}

/* ---- the whole ---- */

static void keep_facts(tw_engine *e, expansion *out)
{
    out->fact_count = facts_count(e);
    out->facts = base_alloc((out->fact_count + 1) * sizeof *out->facts);
    out->fact_labels = base_alloc((out->fact_count + 1) * sizeof *out->fact_labels);
    for (size_t k = 0; k < out->fact_count; k++) out->facts[k] = facts_at(e, k, &out->fact_labels[k]);
}

/* Where several lanes share a power, the terms asked for are more than the powers. */
static void count_terms_asked(expansion *out)
{
    for (size_t k = 0; k < out->contribution_count; k++) {
        const contribution *c = &out->contributions[k];
        if (!c->dominant || c->terminates || c->searched > 0) continue;
        slong count = contribution_count_terms(c);
        if (count > out->terms_asked) out->terms_asked = count;
    }
}

tw_status expand(tw_engine *e, expansion *out, expr *integral, slong terms, const char *by)
{
    if (terms < 1) return engine_fail(e, ERROR_VALUE, "the number of terms must be at least 1");
    if (check_name(e, by) != TW_OK) return TW_ERROR;
    expr *const *parts;
    size_t count = expr_terms(&integral, &parts);
    tw_status status = count == 1 ? expand_integral(e, out, integral, terms, by)
                                  : expand_parts(e, out, integral, parts, count, terms, by);
    if (status == TW_OK) {
        keep_facts(e, out);
        count_terms_asked(out);
    }
    return status;
}
