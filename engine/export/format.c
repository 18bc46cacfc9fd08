/* The table of formats, and the pieces of JSON that an expansion's file and the results on standard output share. */
#include "engine/export/format.h"

#include <stdlib.h>
#include <string.h>

extern const format format_json, format_csv, format_text;

static const format *const formats[] = {&format_json, &format_csv, &format_text};

const format *const *format_table(size_t *count)
{
    *count = sizeof formats / sizeof *formats;
    return formats;
}

const format *format_find(const char *name)
{
    for (size_t k = 0; k < sizeof formats / sizeof *formats; k++)
        if (strcmp(formats[k]->name, name) == 0) return formats[k];
    return NULL;
}

bool format_is_planned(const char *name)
{
    return strcmp(name, "latex") == 0 || strcmp(name, "c") == 0;
}

void json_string(text *out, const char *words)
{
    if (!words) {
        text_add(out, "null");
        return;
    }
    text_add_char(out, '"');
    for (const char *p = words; *p; p++) {
        unsigned char c = (unsigned char)*p;
        if (c == '"' || c == '\\') {
            text_add_char(out, '\\');
            text_add_char(out, *p);
        } else if (c == '\n') {
            text_add(out, "\\n");
        } else if (c == '\t') {
            text_add(out, "\\t");
        } else if (c < 0x20 || c == 0x7f) {
            text_addf(out, "\\u%04x", c);
        } else {
            text_add_char(out, *p);
        }
    }
    text_add_char(out, '"');
}

void json_expr(tw_engine *e, text *out, expr *a)
{
    if (!a) {
        text_add(out, "null");
        return;
    }
    char *words = expr_text(e, a);
    json_string(out, words);
    free(words);
}

void json_conditions(text *out, const condition_list *c)
{
    text_add_char(out, '[');
    for (size_t k = 0; k < c->count; k++) {
        if (k) text_add(out, ", ");
        text_add(out, "{\"text\": ");
        json_string(out, c->list[k].words);
        text_addf(out, ", \"label\": \"%s\"}", condition_label_word(c->list[k].label));
    }
    text_add_char(out, ']');
}

void json_number(text *out, const char *of, const env *at, const number *n, tw_engine *e)
{
    text_add(out, "{\"result\": \"number\", \"of\": ");
    json_string(out, of);
    text_add(out, ", \"at\": {");
    for (size_t k = 0; at && k < at->count; k++) {
        if (k) text_add(out, ", ");
        json_expr(e, out, at->symbols[k]);
        text_add(out, ": ");
        json_expr(e, out, at->values[k]);
    }
    text_add(out, "}, \"re\": ");
    json_ball(out, acb_realref(n->value));
    text_add(out, ", \"im\": ");
    json_ball(out, acb_imagref(n->value));
    text_addf(out, ", \"label\": \"%s\"", label_word(n->label));
    if (n->manner) {
        text_add(out, ", \"manner\": ");
        json_string(out, n->manner);
    }
    text_add(out, ", \"way\": ");
    json_string(out, n->way);
    if (n->terms >= 0) text_addf(out, ", \"terms\": %ld", (long)n->terms);
    if (n->least_term >= 0) text_addf(out, ", \"least_term\": %ld", (long)n->least_term);
    if (n->reason) {
        text_add(out, ", \"reason\": ");
        json_string(out, n->reason);
    }
    text_add(out, ", \"conditions\": ");
    json_conditions(out, &n->conditions);
    text_add_char(out, '}');
}
