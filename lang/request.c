/* What the requests share: how they fail, how they read counts and subjects. */
#include "lang/request.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "lang/suggest.h"
#include "lang/words.h"

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
