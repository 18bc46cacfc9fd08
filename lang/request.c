/* What the requests share: how they fail, how they read counts, subjects and points. */
#include "lang/request.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "lang/suggest.h"
#include "lang/words.h"

enum { POINTS_LIMIT = 100000 };

tw_status request_fail(session *s, span at, error_kind kind, const char *format, ...)
{
    va_list args;
    va_start(args, format);
    char *words;
    int length = vasprintf(&words, format, args);
    va_end(args);
    s->at = at;
    if (length < 0) return engine_fail(s->e, ERROR_MEMORY, "out of memory");
    engine_fail(s->e, kind, "%s", words);
    free(words);
    return TW_ERROR;
}

tw_status request_fail_at(session *s, span at)
{
    s->at = at;
    return TW_ERROR;
}

tw_status request_unavailable(session *s, span at, const char *words)
{
    return request_fail(s, at, ERROR_UNAVAILABLE, "`%s` is not available in this version", words);
}

tw_status request_no_such(session *s, syntax_name wrong, const char *what, const char *const *names, size_t count)
{
    suggestion near;
    suggestion_init(&near, wrong.text);
    text all;
    text_init(&all);
    for (size_t k = 0; k < count; k++) {
        suggestion_offer(&near, names[k]);
        text_addf(&all, "%s%s", k ? ", " : "", names[k]);
    }
    if (near.best)
        request_fail(s, wrong.at, ERROR_NAME, "no %s is called `%s`; did you mean `%s`?", what, wrong.text, near.best);
    else request_fail(s, wrong.at, ERROR_NAME, "no %s is called `%s`; there are %s", what, wrong.text, all.bytes);
    text_clear(&all);
    return TW_ERROR;
}

/* ---- subjects ---- */

/* A bare name that is neither defined nor declared nor a constant. */
static bool means_nothing(session *s, const syntax *x)
{
    if (x->kind != SYNTAX_NAME || word_is_reserved(x->as.name) || names_find(&s->names, x->as.name)) return false;
    expr *symbol = expr_symbol(s->e, x->as.name);
    return symbol && !session_declares(s, symbol);
}

tw_status subject_read(session *s, subject *out, const syntax *x)
{
    memset(out, 0, sizeof *out);
    if (means_nothing(s, x)) return session_unknown_name(s, (syntax_name){x->as.name, x->at});
    value *v = x->kind == SYNTAX_NAME ? names_find(&s->names, x->as.name) : NULL;
    if (v && v->kind == VALUE_FUNCTION)
        return request_fail(s, x->at, ERROR_VALUE, "`%s` is a function; write it with its arguments", x->as.name);
    if (v && v->kind != VALUE_EXPRESSION) {
        out->kept = value_hold(v);
    } else {
        out->expression = session_lower(s, x);
        if (!out->expression) return TW_ERROR;
    }
    text words;
    text_init(&words);
    syntax_print(&words, x);
    out->name = text_take(&words);
    out->is_name = x->kind == SYNTAX_NAME;
    return TW_OK;
}

tw_status subject_read_expansion(session *s, subject *out, const syntax *x)
{
    if (subject_read(s, out, x) != TW_OK) return TW_ERROR;
    if (out->kept && out->kept->kind == VALUE_EXPANSION) return TW_OK;
    tw_status status;
    if (out->kept)
        status = request_fail(s, x->at, ERROR_VALUE, "`%s` is %s; this needs an expansion", out->name, out->kept->what);
    else
        status = request_fail(s, x->at, ERROR_VALUE, "`%.60s` is no expansion; `let A = expand %.60s to 8 terms` makes one",
                              out->name, out->name);
    subject_clear(out);
    return status;
}

void subject_clear(subject *x)
{
    free(x->name);
    value_release(x->kept);
    memset(x, 0, sizeof *x);
}

/* ---- points ---- */

/* The values of one binding. */
typedef struct values {
    size_t count;
    expr **list;
} values;

static tw_status read_value(session *s, const syntax *x, expr **out)
{
    *out = session_lower(s, x);
    if (!*out) return TW_ERROR;
    if (!expr_is_closed_value(*out) || expr_is_inf(*out) || expr_is_minus_inf(*out) || (*out)->kind == EXPR_RELATION)
        return request_fail(s, x->at, ERROR_VALUE, "a value here must be a fixed number");
    return TW_OK;
}

/* from + k*step while not beyond `to`: the number of steps, or -1 when they are too many or lead nowhere. */
static slong count_steps(const fmpq_t from, const fmpq_t to, const fmpq_t stride)
{
    fmpq_t n;
    fmpz_t whole;
    slong count = -1;
    if (fmpq_is_zero(stride)) return -1;
    fmpq_init(n);
    fmpz_init(whole);
    fmpq_sub(n, to, from);
    fmpq_div(n, n, stride);
    fmpz_fdiv_q(whole, fmpq_numref(n), fmpq_denref(n));
    if (fmpz_sgn(whole) >= 0 && fmpz_cmp_si(whole, POINTS_LIMIT) < 0) count = fmpz_get_si(whole);
    fmpz_clear(whole);
    fmpq_clear(n);
    return count;
}

static tw_status sweep_steps(session *s, const syntax_binding *b, expr *from, expr *to, values *out)
{
    expr *stride;
    if (read_value(s, b->step, &stride) != TW_OK) return TW_ERROR;
    if (!expr_is_number(from) || !expr_is_number(to) || !expr_is_number(stride))
        return request_fail(s, b->step->at, ERROR_VALUE, "a sweep by steps needs rational ends and step");
    slong count = count_steps(expr_number(from), expr_number(to), expr_number(stride));
    if (count < 0)
        return request_fail(s, b->step->at, ERROR_VALUE, "this step does not lead from the first to the last value in at "
                                                         "most %d points", POINTS_LIMIT);
    out->list = base_alloc(((size_t)count + 1) * sizeof *out->list);
    for (slong k = 0; k <= count; k++)
        out->list[out->count++] = expr_add(s->e, from, expr_mul(s->e, expr_int(s->e, k), stride));
    return TW_OK;
}

static tw_status sweep_points(session *s, const syntax_binding *b, expr *from, expr *to, values *out)
{
    slong count;
    if (session_lower_count(s, b->points, "the number of points", 2, POINTS_LIMIT, &count) != TW_OK) return TW_ERROR;
    if (b->log_scale && (decide_sign(s->e, from) != 1 || decide_sign(s->e, to) != 1))
        return request_fail(s, b->from->at, ERROR_VALUE, "a log scale needs positive ends");
    expr *range = b->log_scale ? expr_div(s->e, to, from) : expr_sub(s->e, to, from);
    out->list = base_alloc((size_t)count * sizeof *out->list);
    for (slong k = 0; k < count; k++) {
        expr *part = expr_frac(s->e, k, count - 1);
        out->list[out->count++] = b->log_scale ? expr_mul(s->e, from, expr_pow(s->e, range, part))
                                               : expr_add(s->e, from, expr_mul(s->e, range, part));
    }
    return TW_OK;
}

static tw_status read_values(session *s, const syntax_binding *b, values *out)
{
    if (b->count == 0) {
        expr *from, *to;
        if (read_value(s, b->from, &from) != TW_OK || read_value(s, b->to, &to) != TW_OK) return TW_ERROR;
        return b->step ? sweep_steps(s, b, from, to, out) : sweep_points(s, b, from, to, out);
    }
    out->list = base_alloc(b->count * sizeof *out->list);
    for (; out->count < b->count; out->count++)
        if (read_value(s, b->values[out->count], &out->list[out->count]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status read_symbol(session *s, const points *p, const syntax_binding *b, const char *name, expr *f, expr **out)
{
    *out = expr_symbol(s->e, b->name.text);
    if (!*out) return request_fail_at(s, b->name.at);
    if (names_find(&s->names, b->name.text))
        return request_fail(s, b->name.at, ERROR_NAME, "`%s` is defined by `let`; only a free parameter takes a value here",
                            b->name.text);
    if (!expr_has(f, *out))
        return request_fail(s, b->name.at, ERROR_NAME, "`%.60s` does not depend on `%s`", name, b->name.text);
    for (size_t k = 0; k < p->width; k++)
        if (p->symbols[k] == *out)
            return request_fail(s, b->name.at, ERROR_VALUE, "`%s` has got a value already", b->name.text);
    return TW_OK;
}

/* Adds a binding: each point so far is repeated for each of the values. */
static tw_status multiply_points(session *s, points *p, span at, expr *symbol, const values *v)
{
    size_t count = p->count * v->count;
    if (count > POINTS_LIMIT) return request_fail(s, at, ERROR_VALUE, "these are more than %d points", POINTS_LIMIT);
    expr **wider = base_alloc(count * (p->width + 1) * sizeof *wider);
    for (size_t k = 0; k < p->count; k++)
        for (size_t j = 0; j < v->count; j++) {
            expr **row = wider + (k * v->count + j) * (p->width + 1);
            for (size_t c = 0; c < p->width; c++) row[c] = p->values[k * p->width + c];
            row[p->width] = v->list[j];
        }
    free(p->values);
    p->values = wider;
    p->count = count;
    p->symbols[p->width++] = symbol;
    return TW_OK;
}

static tw_status all_have_values(session *s, const points *p, span place, const char *name, expr *f)
{
    expr **symbols;
    size_t count = expr_symbols(f, &symbols);
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < count; k++) {
        bool found = false;
        for (size_t c = 0; c < p->width; c++) found = found || p->symbols[c] == symbols[k];
        if (!found)
            status = request_fail(s, place, ERROR_VALUE, "`%.60s` depends on `%s`, which has no value here: add `%s%s = ...`",
                                  name, symbols[k]->is.name, p->width ? ", " : "at ", symbols[k]->is.name);
    }
    free(symbols);
    return status;
}

/* The values of a point must not contradict the facts. */
static tw_status facts_allow(session *s, const points *p, size_t k, span place, expr *const *facts, size_t fact_count)
{
    for (size_t f = 0; f < fact_count; f++) {
        expr *here = expr_substitute_all(s->e, facts[f], p->symbols, p->values + k * p->width, p->width);
        if (!here) return request_fail_at(s, place);
        if (here == facts[f] || decide(s->e, here, NULL) != ANSWER_NO) continue;
        char *words = expr_text(s->e, facts[f]);
        request_fail(s, place, ERROR_VALUE, "a value contradicts the declared `%s`", words);
        free(words);
        return TW_ERROR;
    }
    expr *large;
    if (facts_large(s->e, &large) == LARGE_NONE) return TW_OK;
    for (size_t c = 0; c < p->width; c++)
        if (p->symbols[c] == large && decide_sign(s->e, p->values[k * p->width + c]) != 1)
            return request_fail(s, place, ERROR_VALUE, "`%s` must be a positive number", large->is.name);
    return TW_OK;
}

tw_status points_read(session *s, points *out, const syntax_bindings *at, span place, const char *name, expr *f,
                      expr *const *facts, size_t fact_count)
{
    memset(out, 0, sizeof *out);
    out->count = 1;
    out->symbols = base_alloc((at->count + 1) * sizeof *out->symbols);
    out->values = base_alloc(sizeof *out->values);
    for (size_t k = 0; k < at->count; k++) {
        const syntax_binding *b = &at->list[k];
        values v = {0, NULL};
        expr *symbol;
        tw_status status = read_symbol(s, out, b, name, f, &symbol);
        if (status == TW_OK) status = read_values(s, b, &v);
        if (status == TW_OK) status = multiply_points(s, out, b->name.at, symbol, &v);
        free(v.list);
        if (status != TW_OK) return TW_ERROR;
    }
    if (s->e->error.kind != ERROR_NONE) return request_fail_at(s, place);
    if (all_have_values(s, out, place, name, f) != TW_OK) return TW_ERROR;
    span bindings = at->count ? at->list[0].name.at : place;
    for (size_t k = 0; k < out->count; k++) {
        if (!budget_ok(s->e)) return request_fail_at(s, place);
        if (facts_allow(s, out, k, bindings, facts, fact_count) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

void points_clear(points *p)
{
    free(p->symbols);
    free(p->values);
    memset(p, 0, sizeof *p);
}

env points_at(const points *p, size_t k)
{
    return (env){p->width, p->symbols, p->values + k * p->width};
}
