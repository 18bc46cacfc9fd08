/* Built-in steps and the methods as passes over them. Knows the names that methods record (`steps A` prints the summaries'
 * titles) and a few exact rewritings; how a series is computed is in the methods' own files. Its one idea: what can be read
 * is data here: one row a step, one row a method. */
#include "engine/method/steps.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"

/* ---- steps that rewrite ---- */

/* Parameters that are known to be positive, at most `room` of them. */
static size_t positive_symbols(tw_engine *e, expr *a, expr **list, size_t room)
{
    expr **symbols;
    const size_t n = expr_symbols(a, &symbols);
    size_t count = 0;
    for (size_t k = 0; k < n && count < room; k++)
        if (!facts_is_complex(e, symbols[k]) && decide_sign(e, symbols[k]) == 1) list[count++] = symbols[k];
    free(symbols);
    return count;
}

/* Exponentials merged, powers and logarithms of what is known to be positive split and collected. */
static tw_status run_normal_form(tw_engine *e, expr *subject, expr **after, condition_list *conditions)
{
    enum { ROOM = 64 };
    expr *positive[ROOM];
    const size_t n = positive_symbols(e, subject, positive, ROOM);
    for (size_t k = 0; k < n; k++)
        if (conditions_require(e, conditions, expr_relation_of(e, RELATION_LESS, expr_int(e, 0), positive[k])) != TW_OK)
            return TW_ERROR;
    *after = expr_normal(e, subject, positive, n);
    return *after ? TW_OK : TW_ERROR;
}

static tw_status run_multiply_out(tw_engine *e, expr *subject, expr **after, condition_list *conditions)
{
    (void)conditions;
    *after = expr_expand(e, subject);
    return *after ? TW_OK : TW_ERROR;
}

/* integral from A to B of f(x) dx = integral from 0 to B - A of f(A + x) dx, A finite. */
static tw_status run_shift_to_zero(tw_engine *e, expr *subject, expr **after, condition_list *conditions)
{
    (void)conditions;
    if (subject->kind != EXPR_INTEGRAL || expr_is_zero(subject->args[0])) return TW_OK;
    expr *from = subject->args[0], *to = subject->args[1];
    if (expr_is_inf(from) || expr_is_minus_inf(from)) return TW_OK;
    expr *x = expr_fresh(e, expr_binder_name(subject));
    expr *length = expr_is_inf(to) || expr_is_minus_inf(to) ? to : expr_sub(e, to, from);
    *after = expr_integral(e, x, expr_int(e, 0), length, expr_open(e, subject, expr_add(e, from, x)));
    return *after ? TW_OK : TW_ERROR;
}

/* integral from -inf to B of f(x) dx = integral from -B to inf of f(-x) dx. */
static tw_status run_mirror_path(tw_engine *e, expr *subject, expr **after, condition_list *conditions)
{
    (void)conditions;
    if (subject->kind != EXPR_INTEGRAL || !expr_is_minus_inf(subject->args[0]) || expr_is_inf(subject->args[1])) return TW_OK;
    expr *x = expr_fresh(e, expr_binder_name(subject));
    *after = expr_integral(e, x, expr_neg(e, subject->args[1]), expr_constant_of(e, CONSTANT_INF),
                           expr_open(e, subject, expr_neg(e, x)));
    return *after ? TW_OK : TW_ERROR;
}

/* integral from A to B = -integral from B to A, where A > B. */
static tw_status run_turn_path(tw_engine *e, expr *subject, expr **after, condition_list *conditions)
{
    condition_label known;
    (void)conditions;
    if (subject->kind != EXPR_INTEGRAL) return TW_OK;
    expr *from = subject->args[0], *to = subject->args[1];
    const bool falls = expr_is_inf(from) || expr_is_minus_inf(to) ||
                       (!expr_is_inf(to) && !expr_is_minus_inf(from) &&
                        decide(e, expr_relation_of(e, RELATION_LESS, to, from), &known) == ANSWER_YES);
    if (!falls) return TW_OK;
    expr *x = expr_fresh(e, expr_binder_name(subject));
    *after = expr_neg(e, expr_integral(e, x, to, from, expr_open(e, subject, x)));
    return *after ? TW_OK : TW_ERROR;
}

/* ---- the tables ---- */

#define STEP(name_, source_, summary_, run_) {.name = name_, .source = source_, .summary = summary_, .run = run_}

/* The summary of a step that methods record begins with the title that `steps A` shows. */
static const pass_step rows[] = {
    STEP("normal_form", NULL, "exponentials merged, powers and logarithms of positive factors split", run_normal_form),
    STEP("multiply_out", NULL, "products over sums and natural powers of sums multiplied out", run_multiply_out),
    STEP("shift_to_zero", NULL, "the lower end of an integral becomes 0", run_shift_to_zero),
    STEP("turn_path", NULL, "turn the path round", run_turn_path),
    STEP("mirror_path", NULL, "mirror the path", run_mirror_path),
    STEP("stretch_variable", NULL, "stretch the variable, so that the large parameter leaves the amplitude", NULL),
    STEP("separate_kernel", NULL, "separate kernel and amplitude", NULL),
    STEP("take_base", NULL, "take the base of the power for the variable", NULL),
    STEP("shift_to_point", NULL, "shift to the critical point, where the exponent is greatest", NULL),
    STEP("integrate_by_parts", "DLMF 2.3.2", "integrate by parts: the end gives its term, the amplitude is divided by the slope "
         "and differentiated", NULL),
    STEP("collect_end_terms", NULL, "collect the end's terms", NULL),
    STEP("expand_amplitude", "DLMF 2.3.8", "Watson's lemma: expand the amplitude and integrate term by term", NULL),
    STEP("differentiate_in_parameter", "DLMF 5.9.1", "differentiate in a parameter: all moments from one", NULL),
    STEP("add_moments", NULL, "add the moments", NULL),
    STEP("add_far_end", "DLMF 2.3.4", "add the far end, or leave it out when it is smaller than every term", NULL),
    STEP("parts", NULL, "the method: a pass that ends with it is expanded by it", NULL),
    STEP("watson", NULL, "the method: a pass that ends with it is expanded by it", NULL),
    STEP("moments", NULL, "the method: a pass that ends with it is expanded by it", NULL),
    STEP("laplace", NULL, "the method: a pass that ends with it is expanded by it", NULL),
    STEP("phase", NULL, "the method: a pass that ends with it is expanded by it", NULL),
    STEP("descent", NULL, "the method: a pass that ends with it is expanded by it", NULL),
};

#define READ "turn_path then mirror_path then take_base then stretch_variable then separate_kernel then shift_to_point"

static const method_pass passes[] = {
    {"parts", READ " then repeat integrate_by_parts then collect_end_terms then add_far_end"},
    {"watson", READ " then expand_amplitude then add_far_end"},
    {"moments", READ " then repeat differentiate_in_parameter then add_moments then add_far_end"},
};

enum { STEP_COUNT = sizeof rows / sizeof *rows, PASS_COUNT = sizeof passes / sizeof *passes };

const pass_step *steps_table(size_t *count)
{
    *count = STEP_COUNT;
    return rows;
}

const pass_step *steps_find(const char *name)
{
    for (size_t k = 0; k < STEP_COUNT; k++)
        if (strcmp(rows[k].name, name) == 0) return &rows[k];
    return NULL;
}

const method_pass *method_pass_find(const char *name)
{
    for (size_t k = 0; k < PASS_COUNT; k++)
        if (strcmp(passes[k].method, name) == 0) return &passes[k];
    return NULL;
}

const char *pass_method(const pass *p)
{
    while ((p->kind == STRATEGY_NAMED || p->kind == STRATEGY_THEN) && p->count > 0) p = p->parts[p->count - 1];
    return p->kind == STRATEGY_STEP && !p->step->run && method_find(p->step->name) ? p->step->name : NULL;
}
