/* Derivations by hand: derive, the moves, undo, done, replay, expansion of. The one idea: a statement becomes one move of
 * the engine's, as data; whether it is kept is the engine's to say, and what is shown afterwards is the form that the
 * engine has. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "lang/describe.h"
#include "lang/request.h"
#include "lang/rules.h"

enum { MOVE_TIMES_LIMIT = 10000, MOVE_TERMS_LIMIT = 10000, INTEGRALS_LIMIT = 1000000 };

/* ---- telling ---- */

static void add_remainders(result *r, const manual *m)
{
    text words;
    text_init(&words);
    manual_print_remainders(m, &words);
    result_string(r, "remainder", words.length ? words.bytes : NULL);
    bool listed = manual_now(m)->live.count + manual_now(m)->split_off.count > 1; /* then it stands in the list */
    if (words.length && !listed) result_line(r, "  exact remainder: %s", words.bytes);
    text_clear(&words);
}

/* Where there are several integrals, each with its number for `in integral K`. */
static void add_integrals(result *r, const manual *m)
{
    const manual_frame *now = manual_now(m);
    size_t total = now->live.count + now->split_off.count;
    text words, json;
    text_init(&words);
    text_init(&json);
    text_add_char(&json, '[');
    for (size_t k = 0; k < total; k++) {
        text_cut(&words, 0);
        manual_print_term(m, k, &words);
        if (total > 1)
            result_line(r, "  integral %zu: %s%s", k + 1, words.bytes, k < now->live.count ? "" : "  (exact remainder)");
        json_next(&json);
        json_string(&json, words.bytes);
    }
    text_add_char(&json, ']');
    result_json(r, "integrals", json.bytes);
    text_clear(&json);
    text_clear(&words);
}

/* The derivative in a that the form is equal to, if there is one. */
static void add_pending(result *r, const manual *m)
{
    for (const manual_pending *p = manual_now(m)->pending; p; p = p->outer)
        result_line(r, "  the derivative in %s of what it was: `integrate back in %s from ...` undoes that", p->parameter->is.name,
                    p->parameter->is.name);
}

static const char *known_word(const manual *m)
{
    return manual_is_proved(m) ? "proved" : "conditional";
}

static void tell_form(session *s, result *r, const char *name, bool is_name, const manual *m)
{
    (void)s;
    text form, line;
    text_init(&form);
    text_init(&line);
    manual_print_form(m, &form);
    text_addf(&line, "%s = %s", is_name ? name : "integral", form.bytes);
    result_string(r, "form", form.bytes);
    result_labelled(r, line.bytes, known_word(m), NULL);
    result_string(r, "label", known_word(m));
    add_pending(r, m);
    add_remainders(r, m);
    add_integrals(r, m);
    text_clear(&line);
    text_clear(&form);
}

/* What the last move needed and how it was checked. */
static void tell_step(result *r, const manual *m)
{
    const step *last = &m->record.steps[m->record.count - 1];
    result_string(r, "move", last->rule);
    result_string(r, "checked", last->detail);
    for (size_t k = 0; k < last->conditions.count; k++) {
        const condition *c = &last->conditions.list[k];
        if (c->label == CONDITION_OPEN || c->label == CONDITION_GRANTED)
            result_line(r, "  rests on: %s (%s)", c->words, condition_label_word(c->label));
    }
    text json;
    text_init(&json);
    json_conditions(&json, &last->conditions);
    result_json(r, "conditions", json.bytes);
    text_clear(&json);
}

/* ---- derive ---- */

static tw_status nothing_open(session *s, span at, const char *words)
{
    return request_fail(s, at, ERROR_VALUE, "%s needs an open derivation: `derive INTEGRAL` opens one", words);
}

static void open_derivation(session *s, manual *m, const char *name, bool is_name)
{
    manual_release(s->open);
    free(s->open_name);
    s->open = m;
    s->open_name = base_copy(name);
    s->open_is_name = is_name;
}

tw_status request_derive(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    const syntax *typed = st->as.subject;
    if (s->open)
        return request_fail(s, st->at, ERROR_VALUE, "a derivation of %.60s is open: `done` ends it", s->open_name);
    subject x;
    if (subject_read(s, &x, typed) != TW_OK) return TW_ERROR;
    tw_status status = TW_OK;
    if (!x.expression) status = request_fail(s, typed->at, ERROR_VALUE, "`%s` is %s; a derivation begins with an integral", x.name,
                                             x.kept->kind == VALUE_EXPANSION ? "an expansion" : x.kept->what);
    manual *m = status == TW_OK ? manual_new(s->e, x.expression) : NULL;
    if (m) {
        s->current = x.expression;
        open_derivation(s, m, x.name, x.is_name);
        result_restart(r, "derivation");
        result_string(r, "of", x.name);
        tell_form(s, r, x.name, x.is_name, m);
        r->echo = true;
    } else if (status == TW_OK) {
        status = request_fail_at(s, typed->at);
    }
    subject_clear(&x);
    return status;
}

/* ---- moves ---- */

static expr *symbol_of(session *s, syntax_name name)
{
    return expr_symbol(s->e, name.text);
}

static void names_in(const syntax *x, void (*take)(void *host, const char *name, span at), void *host);

static void names_in_list(syntax *const *list, size_t count, void (*take)(void *, const char *, span), void *host)
{
    for (size_t k = 0; k < count; k++) names_in(list[k], take, host);
}

/* The names that stand free in an expression of a move. Binders inside are rare there; their variables count too. */
static void names_in(const syntax *x, void (*take)(void *host, const char *name, span at), void *host)
{
    if (!x) return;
    switch (x->kind) {
    case SYNTAX_NAME: take(host, x->as.name, x->at); break;
    case SYNTAX_CALL: names_in_list(x->as.call.arguments, x->as.call.count, take, host); break;
    case SYNTAX_SUM:
    case SYNTAX_PRODUCT: names_in_list(x->as.list.parts, x->as.list.count, take, host); break;
    case SYNTAX_NEGATE:
    case SYNTAX_FACTORIAL: names_in(x->as.operand, take, host); break;
    case SYNTAX_POWER:
        names_in(x->as.power.base, take, host);
        names_in(x->as.power.exponent, take, host);
        break;
    default: break;
    }
}

typedef struct unknown_names {
    session *s;
    expr *form;
    const char *first;
    size_t count; /* different ones */
    const char *old; /* the variable that is replaced */
} unknown_names;

static bool is_constant_word(const char *name)
{
    static const char *const words[] = {"pi", "i", "inf", "euler_constant"};
    for (size_t k = 0; k < sizeof words / sizeof *words; k++)
        if (strcmp(words[k], name) == 0) return true;
    return false;
}

static void take_unknown(void *host, const char *name, span at)
{
    unknown_names *u = host;
    (void)at;
    expr *symbol = expr_symbol(u->s->e, name);
    if (is_constant_word(name) || !symbol || manual_has_variable(u->s->open, symbol) || expr_has(u->form, symbol) ||
        session_declares(u->s, symbol) || names_find(&u->s->names, name))
        return;
    if (u->first && strcmp(u->first, name) == 0) return;
    u->first = name;
    u->count++;
}

static void take_variable(void *host, const char *name, span at)
{
    unknown_names *u = host;
    (void)at;
    expr *symbol = expr_symbol(u->s->e, name);
    if (!symbol || strcmp(name, u->old) == 0 || !manual_has_variable(u->s->open, symbol) || expr_has(u->form, symbol)) return;
    if (u->first && strcmp(u->first, name) == 0) return;
    u->first = name;
    u->count++;
}

/* The new variable of a substitution: the one name not yet known, or what `with` says. */
static tw_status find_new_variable(session *s, const statement *st, const char **name)
{
    const syntax *typed = st->as.move->as.substitute.value;
    if (st->as.move->as.substitute.new_name.text) {
        *name = st->as.move->as.substitute.new_name.text;
        return TW_OK;
    }
    unknown_names u = {s, manual_value(s->open), NULL, 0, st->as.move->as.substitute.name.text};
    if (!u.form) return request_fail_at(s, st->at);
    names_in(typed, take_unknown, &u);
    if (u.count == 1) {
        *name = u.first;
        return TW_OK;
    }
    if (u.count == 0) { /* the variable of another integral may serve again */
        u.first = NULL;
        names_in(typed, take_variable, &u);
        *name = u.first;
    }
    if (u.count == 1) return TW_OK;
    if (u.count == 0)
        return request_fail(s, typed->at, ERROR_NAME, "no name here is new, so the new variable is not known; choose one that has "
                                                      "no meaning yet, or say `with NEW = ...`");
    return request_fail(s, typed->at, ERROR_NAME, "more than one name here is new; declare the parameters (`given ...`), or say "
                                                  "`with NEW = ...`");
}

static tw_status read_substitute(session *s, const statement *st, manual_move *m)
{
    const char *name = NULL;
    if (find_new_variable(s, st, &name) != TW_OK) return TW_ERROR;
    syntax_name variable = st->as.move->as.substitute.name;
    m->symbol = symbol_of(s, variable);
    m->fresh = expr_symbol(s->e, name);
    if (!m->symbol || !m->fresh) return request_fail_at(s, variable.at);
    if (!manual_has_variable(s->open, m->symbol))
        return request_fail(s, variable.at, ERROR_NAME, "`%s` is no variable of the form", variable.text);
    s->move_new = name;
    m->value = session_lower(s, st->as.move->as.substitute.value);
    if (!m->value) return TW_ERROR;
    const syntax *inverse = st->as.move->as.substitute.inverse;
    if (!inverse) return TW_OK;
    m->extra = session_lower(s, inverse);
    return m->extra ? TW_OK : TW_ERROR;
}

static tw_status read_parameter(session *s, syntax_name name, manual_move *m)
{
    m->symbol = symbol_of(s, name);
    if (!m->symbol) return request_fail_at(s, name.at);
    if (manual_has_variable(s->open, m->symbol))
        return request_fail(s, name.at, ERROR_NAME, "`%s` is the variable of the integral; this needs a parameter", name.text);
    if (names_find(&s->names, name.text))
        return request_fail(s, name.at, ERROR_NAME, "`%s` is defined by `let`; this needs a parameter", name.text);
    return TW_OK;
}

static tw_status read_value(session *s, const syntax *x, expr **out)
{
    *out = session_lower(s, x);
    return *out ? TW_OK : TW_ERROR;
}

/* A rule is used at the first place that it fits. The rules are checked before their first use. */
static tw_status read_rewrite(session *s, const statement *st, manual_move *m)
{
    syntax_pass named = {.kind = PASS_NAME, .at = st->as.move->as.rule.at, .name = st->as.move->as.rule.text}, *parts[] = {&named};
    syntax_pass once = {.kind = PASS_ONCE, .at = named.at, .count = 1, .parts = parts};
    const syntax_pass *typed = st->as.move->kind == MOVE_USE_RULE ? &once : st->as.move->as.with;
    m->pass = session_pass(s, typed);
    if (!m->pass) return TW_ERROR;
    return session_check_pass(s, m->pass) == TW_OK ? TW_OK : request_fail_at(s, typed->at);
}

static tw_status read_move(session *s, const statement *st, manual_move *m)
{
    const syntax *factor;
    switch (st->as.move->kind) {
    case MOVE_SUBSTITUTE: m->kind = MANUAL_SUBSTITUTE; return read_substitute(s, st, m);
    case MOVE_PARTS: m->kind = MANUAL_PARTS; return read_value(s, st->as.move->as.factor, &m->value);
    case MOVE_REPEAT_PARTS:
        m->kind = MANUAL_REPEAT_PARTS;
        return session_lower_count(s, st->as.move->as.times, "the number of times", 1, MOVE_TIMES_LIMIT, &m->count);
    case MOVE_DIFFERENTIATE:
        m->kind = MANUAL_DIFFERENTIATE;
        return read_parameter(s, st->as.move->as.parameter.in, m);
    case MOVE_INTEGRATE_BACK:
        m->kind = MANUAL_INTEGRATE_BACK;
        if (read_parameter(s, st->as.move->as.parameter.in, m) != TW_OK) return TW_ERROR;
        return read_value(s, st->as.move->as.parameter.from, &m->value);
    case MOVE_SPLIT: m->kind = MANUAL_SPLIT; return read_value(s, st->as.move->as.place, &m->value);
    case MOVE_ROTATE: m->kind = MANUAL_ROTATE; return read_value(s, st->as.move->as.place, &m->value);
    case MOVE_EXPAND:
        m->kind = MANUAL_EXPAND;
        factor = st->as.move->as.expand.factor;
        if (read_value(s, factor, &m->value) != TW_OK || read_value(s, st->as.move->as.expand.around, &m->extra) != TW_OK)
            return TW_ERROR;
        return session_lower_count(s, st->as.move->as.expand.terms, "the number of terms", 1, MOVE_TERMS_LIMIT, &m->count);
    case MOVE_TERMWISE: m->kind = MANUAL_TERMWISE; return TW_OK;
    case MOVE_USE_RULE:
    case MOVE_REWRITE: m->kind = MANUAL_REWRITE; return read_rewrite(s, st, m);
    case MOVE_SWAP: m->kind = MANUAL_SWAP; return TW_OK;
    default: return request_unavailable(s, st->at, statement_words(st));
    }
}

static const char *words_of_move(session *s, const statement *st)
{
    text words;
    text_init(&words);
    statement_print(&words, st);
    const char *kept = arena_copy(&s->e->arena, words.bytes, words.length);
    text_clear(&words);
    return kept;
}

tw_status request_move(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    text opening;
    text_init(&opening);
    text_addf(&opening, "the move `%s`", statement_words(st));
    tw_status status = s->open ? TW_OK : nothing_open(s, st->at, opening.bytes);
    text_clear(&opening);
    if (status != TW_OK) return TW_ERROR;
    manual_move m;
    memset(&m, 0, sizeof m);
    s->reads_move = true;
    status = read_move(s, st, &m);
    if (status == TW_OK && st->as.move->integral)
        status = session_lower_count(s, st->as.move->integral, "the number of the integral", 1, INTEGRALS_LIMIT, &m.which);
    s->reads_move = false;
    if (status == TW_OK) {
        m.words = words_of_move(s, st);
        status = manual_apply(s->open, &m);
        if (status != TW_OK) request_fail_at(s, st->at);
    }
    pass_release(m.pass); /* the derivation holds it now */
    if (status != TW_OK) return TW_ERROR;
    s->current = manual_value(s->open);
    result_restart(r, "derivation");
    result_string(r, "of", s->open_name);
    tell_form(s, r, s->open_name, s->open_is_name, s->open);
    tell_step(r, s->open);
    r->echo = true;
    return TW_OK;
}

tw_status request_undo(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    if (!s->open) return nothing_open(s, st->at, "`undo`");
    if (!manual_undo(s->open)) return request_fail(s, st->at, ERROR_VALUE, "no move has been made yet: there is nothing to undo");
    s->current = manual_value(s->open);
    result_restart(r, "derivation");
    result_string(r, "of", s->open_name);
    tell_form(s, r, s->open_name, s->open_is_name, s->open);
    r->echo = true;
    return TW_OK;
}

/* ---- the whole ---- */

/* The conditions that are open or granted. */
static void tell_unsure(result *r, const condition_list *all)
{
    condition_list some;
    conditions_init(&some);
    for (size_t k = 0; k < all->count; k++)
        if (all->list[k].label == CONDITION_OPEN || all->list[k].label == CONDITION_GRANTED)
            conditions_add(&some, all->list[k].words, all->list[k].relation, all->list[k].label);
    if (some.count > 0) result_conditions(r, &some);
    conditions_clear(&some);
}

void derivation_tell_steps(session *s, result *r, const char *name, const manual *m)
{
    result_restart(r, "steps");
    result_string(r, "of", name);
    describe_steps(s, r, &m->record);
}

void derivation_show(session *s, result *r, const char *name, const manual *m)
{
    condition_list all;
    conditions_init(&all);
    result_line(r, "%s: a derivation of %zu move%s", name, m->count - 1, m->count == 2 ? "" : "s");
    tell_form(s, r, name, false, m);
    manual_conditions(m, &all);
    tell_unsure(r, &all);
    text json;
    text_init(&json);
    json_conditions(&json, &all);
    result_json(r, "conditions", json.bytes);
    text_clear(&json);
    conditions_clear(&all);
}

/* One line, and what it rests on unless everything is proved. */
static void tell_done(result *r, const char *name, const manual *m)
{
    condition_list all;
    text form;
    conditions_init(&all);
    text_init(&form);
    text_addf(&form, "%s: a derivation of %zu move%s", name, m->count - 1, m->count == 2 ? "" : "s");
    result_labelled(r, form.bytes, known_word(m), NULL);
    text_cut(&form, 0);
    manual_print_form(m, &form);
    result_string(r, "form", form.bytes);
    result_string(r, "label", known_word(m));
    manual_conditions(m, &all);
    tell_unsure(r, &all);
    text_clear(&form);
    conditions_clear(&all);
}

tw_status derivation_steps(session *s, result *r, span at)
{
    if (!s->open) return nothing_open(s, at, "`steps` without a name");
    derivation_tell_steps(s, r, s->open_name, s->open);
    return s->e->error.kind == ERROR_NONE ? TW_OK : request_fail_at(s, at);
}

tw_status derivation_show_open(session *s, result *r, span at)
{
    if (!s->open) return nothing_open(s, at, "`show` without a name");
    result_restart(r, "derivation");
    result_string(r, "of", s->open_name);
    derivation_show(s, r, s->open_name, s->open);
    return TW_OK;
}

tw_status request_done(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    syntax_name as = st->as.name;
    if (!s->open) return nothing_open(s, st->at, "`done`");
    if (as.text && request_may_define(s, as) != TW_OK) return TW_ERROR;
    result_restart(r, "derivation");
    result_string(r, "of", s->open_name);
    result_string(r, "name", as.text);
    result_integer(r, "moves", (long)s->open->count - 1);
    tell_done(r, as.text ? as.text : s->open_is_name ? s->open_name : "done", s->open);
    r->echo = true;
    if (as.text) {
        value *v = value_new(VALUE_DERIVATION);
        v->derivation = manual_hold(s->open);
        names_set(&s->names, as.text, v);
    }
    manual_release(s->open);
    free(s->open_name);
    s->open = NULL;
    s->open_name = NULL;
    return TW_OK;
}

/* A kept derivation by name. */
static tw_status read_derivation(session *s, subject *x, const syntax *typed)
{
    if (subject_read(s, x, typed) != TW_OK) return TW_ERROR;
    if (x->kept && x->kept->kind == VALUE_DERIVATION) return TW_OK;
    tw_status status = request_fail(s, typed->at, ERROR_VALUE, "`%.60s` is no derivation; `derive INTEGRAL` ... `done as NAME` "
                                                               "makes one", x->name);
    subject_clear(x);
    return status;
}

tw_status request_replay(session *s, const statement *st, result *r, value **keep)
{
    const syntax *on = st->as.replay.on;
    subject x, g;
    if (read_derivation(s, &x, st->as.replay.derivation) != TW_OK) return TW_ERROR;
    if (subject_read(s, &g, on) != TW_OK) {
        subject_clear(&x);
        return TW_ERROR;
    }
    tw_status status = TW_OK;
    if (!g.expression) status = request_fail(s, on->at, ERROR_VALUE, "`%s` is no integral", g.name);
    manual *m = status == TW_OK ? manual_replay(s->e, x.kept->derivation, g.expression) : NULL;
    if (m) {
        result_restart(r, "derivation");
        result_string(r, "of", g.name);
        derivation_show(s, r, g.is_name ? g.name : "integral", m);
        if (keep) {
            *keep = value_new(VALUE_DERIVATION);
            (*keep)->derivation = m;
        } else {
            manual_release(m);
        }
    } else if (status == TW_OK) {
        status = request_fail_at(s, on->at);
    }
    subject_clear(&g);
    subject_clear(&x);
    return status;
}

tw_status request_expansion_of(session *s, const statement *st, result *r, value **keep)
{
    subject x;
    if (read_derivation(s, &x, st->as.subject) != TW_OK) return TW_ERROR;
    value *v = value_new(VALUE_EXPANSION);
    tw_status status = manual_expansion(x.kept->derivation, &v->expansion);
    if (status == TW_OK)
        status = request_tell_expansion(s, r, s->let_name ? s->let_name : x.name, x.name, v);
    if (status != TW_OK) request_fail_at(s, st->as.subject->at);
    subject_clear(&x);
    if (status == TW_OK && keep) *keep = v;
    else value_release(v);
    return status;
}

tw_status request_rule_from(session *s, const statement *st, result *r, value **keep)
{
    subject x;
    if (read_derivation(s, &x, st->as.subject) != TW_OK) return TW_ERROR;
    rule *made = manual_rule(x.kept->derivation, s->let_name ? s->let_name : x.name);
    subject_clear(&x);
    if (!made) return request_fail_at(s, st->as.subject->at);
    made->file = s->file ? base_copy(s->file) : NULL;
    made->line = s->line;
    value *v = value_new(VALUE_RULE);
    v->rule = made;
    result_restart(r, "rule");
    result_string(r, "name", made->name);
    show_rule_value(s, r, made->name, v);
    if (keep) *keep = v;
    else value_release(v);
    return TW_OK;
}
