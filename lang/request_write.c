/* Requests that show or write what there is: write, show, help, quit. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "lang/describe.h"
#include "lang/file.h"
#include "lang/help.h"
#include "lang/request.h"
#include "lang/rules.h"
#include "lang/suggest.h"

/* ---- write ---- */

static const format *find_format(session *s, syntax_name name)
{
    const format *f = format_find(name.text);
    if (f) return f;
    if (format_is_planned(name.text)) {
        request_unavailable(s, name.at, name.text);
        return NULL;
    }
    size_t count;
    const format *const *formats = format_table(&count);
    const char **names = base_alloc(count * sizeof *names);
    for (size_t k = 0; k < count; k++) names[k] = formats[k]->name;
    request_no_such(s, name, "format", names, count);
    free(names);
    return NULL;
}

static tw_status make_text(session *s, text *out, const format *f, const subject *x)
{
    remainder_bound bound;
    remainder_bound_init(&bound);
    tw_status status = describe_bound(s, &bound, &x->kept->expansion);
    if (status == TW_OK) status = f->write(s->e, out, x->name, &x->kept->expansion, &bound);
    remainder_bound_clear(&bound);
    return status;
}

/* A derivation has one format. */
static tw_status write_derivation(session *s, const statement *st, text *out, const format *f, const char *name,
                                  const manual *m)
{
    if (strcmp(f->name, "json") != 0)
        return request_fail(s, st->as.write.format.at, ERROR_VALUE,
                            "a derivation is written as json; an expansion of it (`let A = expansion of %s`) as %s, too", name,
                            f->name);
    return derivation_json(s->e, out, name, m);
}

static tw_status put_text(session *s, const char *file, const text *content)
{
    text why;
    text_init(&why);
    tw_status status = TW_OK;
    if (!file_write(file, content->bytes, content->length, &why)) status = engine_fail(s->e, ERROR_FILE, "%s", why.bytes);
    text_clear(&why);
    return status;
}

tw_status request_write(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    const format *f = find_format(s, st->as.write.format);
    if (!f) return TW_ERROR;
    subject x;
    const syntax *typed = st->as.write.subject;
    value *named = typed->kind == SYNTAX_NAME ? names_find(&s->names, typed->as.name) : NULL;
    bool is_derivation = named && named->kind == VALUE_DERIVATION;
    if ((is_derivation ? subject_read(s, &x, typed) : subject_read_expansion(s, &x, typed)) != TW_OK) return TW_ERROR;
    text content;
    text_init(&content);
    s->at = st->at;
    tw_status status = is_derivation ? write_derivation(s, st, &content, f, x.name, named->derivation)
                                     : make_text(s, &content, f, &x);
    if (status == TW_OK) status = put_text(s, st->as.write.to_file, &content);
    if (status == TW_OK) {
        result_restart(r, "file");
        result_string(r, "of", x.name);
        result_string(r, "format", f->name);
        result_string(r, "file", st->as.write.to_file);
        result_integer(r, "bytes", (long)content.length);
        result_line(r, "%s written to \"%s\" as %s", x.name, st->as.write.to_file, f->name);
        r->echo = true;
    }
    text_clear(&content);
    subject_clear(&x);
    return status == TW_OK ? TW_OK : request_fail_at(s, s->at);
}

/* ---- show ---- */

static void show_facts(session *s, result *r, expr *symbol)
{
    text json;
    text_init(&json);
    text_add_char(&json, '[');
    expr *large;
    large_kind kind = facts_large(s->e, &large);
    bool is_large = kind != LARGE_NONE && large == symbol;
    if (is_large)
        result_line(r, "%s: %s", symbol->is.name,
                    kind == LARGE_SMALL ? "the small parameter" : kind == LARGE_INTEGER ? "the large parameter, an integer"
                                                                                        : "the large parameter");
    else result_line(r, "%s: a parameter", symbol->is.name);
    for (size_t k = 0; k < facts_count(s->e); k++) {
        condition_label known;
        expr *fact = facts_at(s->e, k, &known);
        if (!expr_has(fact, symbol)) continue;
        char *words = expr_text(s->e, fact);
        result_line(r, "  %s (%s)", words, condition_label_word(known));
        free(words);
        json_next(&json);
        json_expr(s->e, &json, fact);
    }
    text_add_char(&json, ']');
    result_json(r, "facts", json.bytes);
    text_clear(&json);
}

static tw_status show_value(session *s, result *r, const char *name, value *v)
{
    text words;
    text_init(&words);
    tw_status status = TW_OK;
    switch (v->kind) {
    case VALUE_EXPRESSION:
    case VALUE_FUNCTION:
        value_print(s->e, &words, name, v);
        result_string(r, "text", words.bytes);
        result_expression(r, "%s", words.bytes);
        break;
    case VALUE_EXPANSION:
        status = describe_expansion(s, r, name, &v->expansion);
        if (status == TW_OK && s->json) status = describe_object(s, r, name, &v->expansion);
        break;
    case VALUE_DERIVATION: derivation_show(s, r, name, v->derivation); break;
    case VALUE_RULE:
    case VALUE_PASS:
        show_rule_value(s, r, name, v);
        break;
    case VALUE_RESULT:
        result_line(r, "%s: %s", name, v->what);
        text_add(&r->words, v->result.words.bytes);
        text_add(&words, v->result.object.bytes);
        text_add_char(&words, '}');
        result_object(r, words.bytes);
        result_string(r, "name", name);
        break;
    }
    text_clear(&words);
    return status;
}

tw_status request_show(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    syntax_name name = st->as.name;
    if (!name.text) return derivation_show_open(s, r, st->at);
    result_restart(r, "value");
    result_string(r, "name", name.text);
    value *v = names_find(&s->names, name.text);
    bool shown = v != NULL;
    if (v && show_value(s, r, name.text, v) != TW_OK) return request_fail_at(s, name.at);
    value *x = names_find(&s->rules, name.text);
    if (x) show_rule_value(s, r, name.text, x);
    shown = show_file(s, r, name.text) || shown || x;
    shown = show_method(s, r, name.text) || shown;
    if (shown) return TW_OK;
    expr *symbol = expr_symbol(s->e, name.text);
    if (!symbol) return request_fail_at(s, name.at);
    if (!session_declares(s, symbol)) return session_unknown_name(s, name);
    show_facts(s, r, symbol);
    return TW_OK;
}

/* ---- help, quit ---- */

static void offer_word(void *host, const char *word)
{
    suggestion_offer(host, word);
}

tw_status request_help(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    const char *word = st->as.help;
    result_restart(r, "help");
    if (help_answer(r, word)) return TW_OK;
    if (names_find(&s->names, word))
        return request_fail(s, st->at, ERROR_NAME, "`%s` is a name of yours; `show %s` shows it", word, word);
    suggestion near;
    suggestion_init(&near, word);
    help_each_word(offer_word, &near);
    for (int f = 0; f < FUNCTION_COUNT; f++) suggestion_offer(&near, function_name((function_id)f));
    if (near.best)
        return request_fail(s, st->at, ERROR_NAME, "there is no help for \"%.60s\"; did you mean `%s`?", word, near.best);
    return request_fail(s, st->at, ERROR_NAME, "there is no help for \"%.60s\"; `help` lists all words", word);
}

tw_status request_quit(session *s, const statement *st, result *r, value **keep)
{
    (void)st;
    (void)keep;
    result_restart(r, "quit");
    r->echo = true;
    s->quit = true;
    return TW_OK;
}
