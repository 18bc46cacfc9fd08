/* A derivation by hand as one JSON object (RFC 8259). Exact things are text in the language's own syntax; a form parses back
 * to the expression that it shows. */
#include <stdlib.h>

#include "engine/export/format.h"

static void add_words(text *out, const char *key, const char *words)
{
    text_addf(out, ", \"%s\": ", key);
    json_string(out, words);
}

static void add_step(tw_engine *e, text *out, const step *s)
{
    text_add(out, "\n  {\"move\": ");
    json_string(out, s->rule);
    add_words(out, "source", s->source);
    text_add(out, ", \"form\": ");
    if (s->after) json_expr(e, out, s->after);
    else json_string(out, s->form);
    text_add(out, ", \"remainder\": ");
    json_expr(e, out, s->remainder);
    add_words(out, "checked", s->detail);
    text_add(out, ", \"conditions\": ");
    json_conditions(out, &s->conditions);
    text_add_char(out, '}');
}

static void add_parameters(tw_engine *e, text *out, const manual *m)
{
    expr **symbols;
    size_t count = expr_symbols(m->typed, &symbols);
    bool first = true;
    text_add_char(out, '[');
    for (size_t k = 0; k < count; k++) {
        if (symbols[k] == m->large) continue;
        text_add(out, first ? "{\"name\": " : ", {\"name\": ");
        first = false;
        json_expr(e, out, symbols[k]);
        text_add(out, ", \"facts\": [");
        bool first_fact = true;
        for (size_t f = 0; f < m->fact_count; f++) {
            expr *fact = m->facts[f];
            if (!expr_has(fact, symbols[k])) continue;
            if (!first_fact) text_add(out, ", ");
            first_fact = false;
            json_expr(e, out, fact);
        }
        text_add(out, "]}");
    }
    text_add_char(out, ']');
    free(symbols);
}

tw_status derivation_json(tw_engine *e, text *out, const char *name, const manual *m)
{
    text words;
    condition_list all;
    text_init(&words);
    conditions_init(&all);
    text_add(out, "{\"format\": \"termwise derivation\", \"version\": 1,\n \"name\": ");
    json_string(out, name);
    text_add(out, ",\n \"integral\": ");
    json_expr(e, out, m->typed);
    text_addf(out, ",\n \"%s\": ", m->small ? "small" : "large");
    json_expr(e, out, m->large);
    text_add(out, ",\n \"parameters\": ");
    add_parameters(e, out, m);
    manual_print_form(m, &words);
    text_add(out, ",\n \"form\": ");
    json_string(out, words.bytes);
    text_cut(&words, 0);
    manual_print_remainders(m, &words);
    text_add(out, ",\n \"remainder\": ");
    json_string(out, words.length ? words.bytes : NULL);
    text_add(out, ",\n \"equals\": ");
    json_expr(e, out, manual_now(m)->subject);
    text_add(out, ",\n \"label\": ");
    json_string(out, manual_is_proved(m) ? "proved" : "conditional");
    manual_conditions(m, &all);
    text_add(out, ",\n \"conditions\": ");
    json_conditions(out, &all);
    text_add(out, ",\n \"steps\": [");
    for (size_t k = 0; k < m->record.count; k++) {
        if (k) text_add_char(out, ',');
        add_step(e, out, &m->record.steps[k]);
    }
    text_add(out, "]}\n");
    text_clear(&words);
    conditions_clear(&all);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
