/* The session: a table of requests, and the care that a failed statement leaves no trace. The one idea: a statement reads,
 * computes, and only then changes names; the declarations, which change the engine's facts as they go, are taken back from a
 * copy when they fail. */
#include "lang/session.h"

#include <stdlib.h>
#include <string.h>

#include "lang/request.h"

/* ---- the table of requests ---- */

/* Statements without a row are read and answered as not available. */
static const struct {
    request_function *run;
    bool declares; /* changes facts or, through other statements, names as it goes: taken back on failure */
} requests[STATEMENT_KIND_COUNT] = {
    [STATEMENT_LARGE] = {request_large, true},
    [STATEMENT_SMALL] = {request_small, true},
    [STATEMENT_GIVEN] = {request_given, true},
    [STATEMENT_GRANT] = {request_grant, true},
    [STATEMENT_USE] = {request_use, true},
    [STATEMENT_DROP] = {request_drop, true},
    [STATEMENT_LET] = {request_let, false},
    [STATEMENT_EXPAND] = {request_expand, false},
    [STATEMENT_STEPS] = {request_steps, false},
    [STATEMENT_COEFFICIENTS] = {request_coefficients, false},
    [STATEMENT_REMAINDER] = {request_remainder, false},
    [STATEMENT_EVALUATE] = {request_evaluate, false},
    [STATEMENT_COMPARE] = {request_compare, false},
    [STATEMENT_WRITE] = {request_write, false},
    [STATEMENT_SHOW] = {request_show, false},
    [STATEMENT_HELP] = {request_help, false},
    [STATEMENT_QUIT] = {request_quit, false},
};

tw_status request_run(session *s, const statement *st, result *r, value **keep)
{
    request_function *run = requests[st->kind].run;
    if (!run) return request_unavailable(s, st->at, statement_words(st));
    return run(s, st, r, keep);
}

/* ---- taking back ---- */

typedef struct mark {
    name_table names;
    size_t fact_count;
    expr **facts;
    condition_label *labels;
    large_kind kind;
    expr *large;
} mark;

static void mark_set(session *s, mark *m)
{
    memset(m, 0, sizeof *m);
    for (size_t k = 0; k < s->names.room; k++)
        if (s->names.entries[k].name) names_set(&m->names, s->names.entries[k].name, value_hold(s->names.entries[k].value));
    m->fact_count = facts_count(s->e);
    m->facts = base_alloc((m->fact_count + 1) * sizeof *m->facts);
    m->labels = base_alloc((m->fact_count + 1) * sizeof *m->labels);
    for (size_t k = 0; k < m->fact_count; k++) m->facts[k] = facts_at(s->e, k, &m->labels[k]);
    m->kind = facts_large(s->e, &m->large);
}

static void mark_clear(mark *m)
{
    names_clear(&m->names);
    free(m->facts);
    free(m->labels);
}

static void mark_restore(session *s, mark *m)
{
    name_table failed = s->names;
    s->names = m->names;
    m->names = failed;
    facts_clear(s->e);
    facts_init(s->e);
    if (m->kind != LARGE_NONE) (void)facts_set_large(s->e, m->large, m->kind, NULL, NULL);
    for (size_t k = 0; k < m->fact_count; k++) (void)facts_add(s->e, m->facts[k], m->labels[k]);
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
    mark m;
    mark_set(j->s, &m);
    tw_status status = engine_protect(j->s->e, run_job, j);
    if (status != TW_OK) mark_restore(j->s, &m);
    mark_clear(&m);
    return status;
}

tw_status session_run(session *s, const statement *st, result *r)
{
    job j = {s, st, r};
    s->at = st->at;
    s->let_name = NULL;
    tw_status status = engine_protect(s->e, requests[st->kind].declares ? run_marked : run_job, &j);
    s->let_name = NULL;
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

/* ---- questions ---- */

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
    names_clear(&s->names);
    tw_engine_free(s->e);
    s->e = NULL;
}
