/* The session: a table of requests, and the care that a failed statement leaves no trace. The one idea: a statement reads,
 * computes, and only then changes names; the declarations, which change the engine's facts as they go, are taken back from a
 * copy when they fail. */
#include "lang/session.h"

#include <stdlib.h>
#include <string.h>

#include "lang/request.h"
#include "lang/verdicts.h"

/* ---- the table of requests ---- */

/* Statements without a row are read and answered as not available. */
static const struct {
    request_function *run;
    enum { CHANGES_LAST, CHANGES_FACTS, CHANGES_ALL } care; /* what it changes as it goes: taken back on failure */
} requests[STATEMENT_KIND_COUNT] = {
    [STATEMENT_LARGE] = {request_large, CHANGES_FACTS},
    [STATEMENT_SMALL] = {request_small, CHANGES_FACTS},
    [STATEMENT_GIVEN] = {request_given, CHANGES_FACTS},
    [STATEMENT_GRANT] = {request_grant, CHANGES_FACTS},
    [STATEMENT_USE] = {request_use, CHANGES_ALL},
    [STATEMENT_RULE] = {request_rule, CHANGES_FACTS},
    [STATEMENT_PASS] = {request_pass, CHANGES_LAST},
    [STATEMENT_REWRITE] = {request_rewrite, CHANGES_FACTS},
    [STATEMENT_CHECK_RULE] = {request_check_rule, CHANGES_FACTS},
    [STATEMENT_WHY_NOT] = {request_why_not, CHANGES_FACTS},
    [STATEMENT_CHECK_FILE] = {request_check_file, CHANGES_ALL},
    [STATEMENT_DROP] = {request_drop, CHANGES_FACTS},
    [STATEMENT_LET] = {request_let, CHANGES_FACTS},
    [STATEMENT_DERIVE] = {request_derive, CHANGES_FACTS},
    [STATEMENT_MOVE] = {request_move, CHANGES_FACTS},
    [STATEMENT_DONE] = {request_done, CHANGES_LAST},
    [STATEMENT_UNDO] = {request_undo, CHANGES_LAST},
    [STATEMENT_REPLAY] = {request_replay, CHANGES_FACTS},
    [STATEMENT_EXPANSION_OF] = {request_expansion_of, CHANGES_FACTS},
    [STATEMENT_RULE_FROM] = {request_rule_from, CHANGES_FACTS},
    [STATEMENT_EXPAND] = {request_expand, CHANGES_FACTS},
    [STATEMENT_STEPS] = {request_steps, CHANGES_LAST},
    [STATEMENT_COEFFICIENTS] = {request_coefficients, CHANGES_LAST},
    [STATEMENT_REMAINDER] = {request_remainder, CHANGES_FACTS},
    [STATEMENT_EVALUATE] = {request_evaluate, CHANGES_LAST},
    [STATEMENT_COMPARE] = {request_compare, CHANGES_LAST},
    [STATEMENT_RECURRENCE] = {request_recurrence, CHANGES_LAST},
    [STATEMENT_GROWTH] = {request_growth, CHANGES_LAST},
    [STATEMENT_CHECK_RECURRENCE] = {request_check_recurrence, CHANGES_LAST},
    [STATEMENT_WRITE] = {request_write, CHANGES_FACTS},
    [STATEMENT_SHOW] = {request_show, CHANGES_FACTS},
    [STATEMENT_HELP] = {request_help, CHANGES_LAST},
    [STATEMENT_QUIT] = {request_quit, CHANGES_LAST},
};

tw_status request_run(session *s, const statement *st, result *r, value **keep)
{
    request_function *run = requests[st->kind].run;
    if (run) return run(s, st, r, keep);
    const char *words = statement_words(st);
    size_t length = strlen(words);
    span opening = {st->at.from, st->at.from + (uint32_t)strcspn(words, " ")};
    if (length > 3 && strcmp(words + length - 3, " of") == 0) length -= 3;
    char *named = strndup(words, length);
    request_unavailable(s, opening, named ? named : words);
    free(named);
    return TW_ERROR;
}

/* ---- taking back ---- */

static void names_copy(name_table *to, const name_table *from)
{
    for (size_t k = 0; k < from->room; k++)
        if (from->entries[k].name) names_set(to, from->entries[k].name, value_hold(from->entries[k].value));
}

/* Back: the names as they were; in any case the copy goes. */
static void names_end(name_table *now, name_table *copy, bool back)
{
    if (back) {
        name_table failed = *now;
        *now = *copy;
        *copy = failed;
    }
    names_clear(copy);
}

void session_mark_set(session *s, session_mark *m, bool with_names)
{
    memset(m, 0, sizeof *m);
    m->facts = facts_copy(s->e);
    m->with_names = with_names;
    if (!with_names) return;
    names_copy(&m->names, &s->names);
    names_copy(&m->rules, &s->rules);
    names_copy(&m->files, &s->files);
}

void session_mark_end(session *s, session_mark *m, bool back)
{
    if (back) facts_restore(s->e, m->facts);
    else facts_discard(m->facts);
    names_end(&s->names, &m->names, back && m->with_names);
    names_end(&s->rules, &m->rules, back && m->with_names);
    names_end(&s->files, &m->files, back && m->with_names);
}

/* ---- running ---- */

typedef struct job {
    session *s;
    const statement *st;
    result *r;
} job;

static tw_status run_job(void *host)
{
    job *j = host;
    return request_run(j->s, j->st, j->r, NULL);
}

static tw_status run_marked(void *host)
{
    job *j = host;
    session_mark m;
    session_mark_set(j->s, &m, requests[j->st->kind].care == CHANGES_ALL);
    tw_status status = engine_protect(j->s->e, run_job, j);
    session_mark_end(j->s, &m, status != TW_OK);
    return status;
}

tw_status session_run(session *s, const statement *st, result *r)
{
    job j = {s, st, r};
    s->at = st->at;
    s->let_name = NULL;
    conditions_clear(&s->rests);
    s->reads_move = false;
    s->move_new = NULL;
    engine_forgive(s->e);
    tw_status status = engine_protect(s->e, requests[st->kind].care != CHANGES_LAST ? run_marked : run_job, &j);
    s->let_name = NULL;
    if (status != TW_OK && (s->e->error.kind == ERROR_TIME || s->e->error.kind == ERROR_MEMORY)) s->at = st->at;
    if (status != TW_OK && s->e->error.kind != ERROR_REFUTED) text_cut(&r->words, 0);
    return status;
}

void session_describe(const statement *st, text *out)
{
    statement_print(out, st);
    for (size_t k = 0; k < out->length; k++)
        if (out->bytes[k] == '\n') out->bytes[k] = ' ';
    if (out->length > 60) {
        text_cut(out, 57);
        text_add(out, "...");
    }
}

/* ---- names within expressions ---- */

static lower_meaning meaning_of(void *host, const char *name, expr **stands_for, const char **what)
{
    session *s = host;
    value *v = names_find(&s->names, name);
    if (s->reads_move && s->open) { /* variables of the form come first, as inside an integral */
        expr *variable = expr_symbol(s->e, name);
        bool is_new = s->move_new && strcmp(s->move_new, name) == 0;
        if (is_new || (variable && manual_has_variable(s->open, variable))) return MEANING_DECLARED;
    }
    if (!v || v->kind == VALUE_FUNCTION) {
        expr *symbol = expr_symbol(s->e, name);
        return symbol && session_declares(s, symbol) ? MEANING_DECLARED : MEANING_FREE;
    }
    *stands_for = v->expression;
    conditions_append(&s->rests, &v->conditions);
    if (v->kind == VALUE_EXPRESSION) return MEANING_VALUE;
    if (v->kind == VALUE_EXPANSION && v->expansion.integral) { /* its integral stands for it; `let` expands the whole again */
        slong terms = v->expansion.terms_asked;
        if (!s->met_expansion || terms > s->met_terms) s->met_terms = terms;
        s->met_expansion = true;
        *stands_for = v->expansion.integral;
        return MEANING_VALUE;
    }
    *what = v->kind == VALUE_EXPANSION ? "an expansion" : v->what;
    return MEANING_OTHER;
}

static const lower_function *function_of(void *host, const char *name)
{
    session *s = host;
    value *v = names_find(&s->names, name);
    if (!v || v->kind != VALUE_FUNCTION) return NULL;
    conditions_append(&s->rests, &v->conditions);
    return &v->function;
}

typedef struct function_offer {
    session *s;
    suggestion *to;
} function_offer;

static void offer_if_function(void *host, const char *name)
{
    function_offer *o = host;
    if (function_of(o->s, name)) suggestion_offer(o->to, name);
}

static void offer_functions(void *host, suggestion *to)
{
    session *s = host;
    function_offer o = {s, to};
    names_each(&s->names, offer_if_function, &o);
}

void session_lowering_start(session *s, lowering *l)
{
    lowering_init(l, s->e, s);
    l->meaning = meaning_of;
    l->function = function_of;
    l->offer_functions = offer_functions;
    s->met_expansion = false;
}

/* Ends it; a failure's place becomes the session's. */
tw_status session_lowering_end(session *s, lowering *l, bool good, span whole)
{
    if (!good) s->at = l->failed ? l->place : whole;
    lowering_clear(l);
    return good ? TW_OK : TW_ERROR;
}

expr *session_lower(session *s, const syntax *x)
{
    if (syntax_is_condition(x)) {
        request_fail(s, x->at, ERROR_VALUE, "a condition is no value");
        return NULL;
    }
    lowering l;
    session_lowering_start(s, &l);
    expr *a = lower_expression(&l, x);
    return session_lowering_end(s, &l, a != NULL, x->at) == TW_OK ? a : NULL;
}

tw_status session_lower_function(session *s, const syntax_name *parameters, size_t count, const syntax *body,
                                 lower_function *out)
{
    lowering l;
    session_lowering_start(s, &l);
    tw_status status = lower_function_define(&l, parameters, count, body, out);
    return session_lowering_end(s, &l, status == TW_OK, body->at);
}

tw_status session_lower_condition(session *s, const syntax *x, lower_conditions *out)
{
    lowering l;
    session_lowering_start(s, &l);
    tw_status status = lower_condition(&l, x, out);
    return session_lowering_end(s, &l, status == TW_OK, x->at);
}

tw_status session_lower_count(session *s, const syntax *x, const char *what, slong least, slong most, slong *out)
{
    lowering l;
    session_lowering_start(s, &l);
    tw_status status = lower_count(&l, x, what, least, most, out);
    return session_lowering_end(s, &l, status == TW_OK, x->at);
}

/* ---- questions ---- */

static void offer_name(void *host, const char *name)
{
    suggestion_offer(host, name);
}

tw_status session_unknown_name(session *s, syntax_name name)
{
    suggestion near;
    suggestion_init(&near, name.text);
    names_each(&s->names, offer_name, &near);
    expr *large;
    if (facts_large(s->e, &large) != LARGE_NONE) suggestion_offer(&near, large->is.name);
    if (near.best)
        return request_fail(s, name.at, ERROR_NAME, "`%s` is not defined; did you mean `%s`?", name.text, near.best);
    return request_fail(s, name.at, ERROR_NAME, "`%s` is not defined", name.text);
}

void session_blame(session *s, const source *other, span at)
{
    session_forget_blame(s);
    s->elsewhere.name = base_copy(other->name);
    text_add_bytes(&s->elsewhere.bytes, other->bytes, other->length);
    s->elsewhere.at = at;
}

void session_forget_blame(session *s)
{
    free(s->elsewhere.name);
    s->elsewhere.name = NULL;
    text_clear(&s->elsewhere.bytes);
}

bool session_declares(session *s, expr *symbol)
{
    expr *large;
    if (facts_large(s->e, &large) != LARGE_NONE && large == symbol) return true;
    for (size_t k = 0; k < facts_count(s->e); k++) {
        condition_label known;
        if (expr_has(facts_at(s->e, k, &known), symbol)) return true;
    }
    return false;
}

bool error_is_fatal(error_kind kind)
{
    return kind == ERROR_TIME || kind == ERROR_MEMORY || kind == ERROR_INTERRUPT || kind == ERROR_INTERNAL;
}

/* ---- life ---- */

tw_status session_init(session *s)
{
    memset(s, 0, sizeof *s);
    s->digits = SESSION_DIGITS;
    s->folder = "";
    s->e = tw_engine_new();
    return s->e ? TW_OK : TW_ERROR;
}

void session_clear(session *s)
{
    session_forget_blame(s);
    names_clear(&s->names);
    manual_release(s->open);
    free(s->open_name);
    names_clear(&s->rules);
    names_clear(&s->files);
    conditions_clear(&s->rests);
    verdicts_free(s->verdicts);
    tw_engine_free(s->e);
    s->e = NULL;
}
