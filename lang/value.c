/* Values and the table of names. A value lives as long as somebody holds it, so `let B = A` shares and a running request
 * keeps what it works on. The table is open addressing with a power of two of places. */
#include <stdlib.h>
#include <string.h>

#include "lang/session.h"

/* ---- values ---- */

value *value_new(value_kind kind)
{
    value *v = base_alloc(sizeof *v);
    memset(v, 0, sizeof *v);
    v->kind = kind;
    v->holders = 1;
    if (kind == VALUE_EXPANSION) expansion_init(&v->expansion);
    if (kind == VALUE_RESULT) result_init(&v->result, "");
    if (kind == VALUE_DERIVATION) v->what = "a derivation";
    return v;
}

value *value_hold(value *v)
{
    v->holders++;
    return v;
}

void value_release(value *v)
{
    if (!v || --v->holders > 0) return;
    if (v->kind == VALUE_EXPANSION) expansion_clear(&v->expansion);
    if (v->kind == VALUE_RESULT) result_clear(&v->result);
    if (v->kind == VALUE_DERIVATION) manual_release(v->derivation);
    rule_release(v->rule);
    pass_release(v->pass);
    free(v->text);
    free(v->file);
    conditions_clear(&v->conditions);
    for (size_t k = 0; v->parameter_names && k < v->function.count; k++) free(v->parameter_names[k]);
    free(v->parameter_names);
    free(v);
}

value *value_of_result(const result *r, const char *what)
{
    value *v = value_new(VALUE_RESULT);
    v->what = what;
    text_cut(&v->result.object, 0);
    text_add_bytes(&v->result.object, r->object.bytes, r->object.length);
    text_add_bytes(&v->result.words, r->words.bytes, r->words.length);
    return v;
}

void value_print(tw_engine *e, text *out, const char *name, const value *v)
{
    text_add(out, name);
    if (v->kind == VALUE_EXPRESSION) {
        text_add(out, " = ");
        expr_print(e, out, v->expression);
        return;
    }
    const lower_function *f = &v->function;
    expr **named = base_alloc((f->count + 1) * sizeof *named);
    for (size_t k = 0; k < f->count; k++) {
        named[k] = expr_symbol(e, v->parameter_names[k]);
        text_addf(out, "%s%s", k ? ", " : "(", v->parameter_names[k]);
    }
    text_add(out, ") = ");
    expr *body = expr_substitute_all(e, f->body, f->parameters, named, f->count);
    if (body) expr_print(e, out, body);
    free(named);
}

/* ---- names ---- */

static size_t hash_name(const char *name)
{
    uint64_t h = 14695981039346656037u; /* FNV-1a, 64 bits */
    for (; *name; name++) h = (h ^ (unsigned char)*name) * 1099511628211u;
    return (size_t)(h ^ (h >> 32));
}

/* The place of the name, or the free place where it would go. The table is never full. */
static size_t find_place(const name_table *t, const char *name)
{
    size_t k = hash_name(name) & (t->room - 1);
    while (t->entries[k].name && strcmp(t->entries[k].name, name) != 0) k = (k + 1) & (t->room - 1);
    return k;
}

static void grow(name_table *t)
{
    name_table bigger = {t->count, t->room ? 2 * t->room : 32, NULL};
    bigger.entries = base_alloc(bigger.room * sizeof *bigger.entries);
    memset(bigger.entries, 0, bigger.room * sizeof *bigger.entries);
    for (size_t k = 0; k < t->room; k++)
        if (t->entries[k].name) bigger.entries[find_place(&bigger, t->entries[k].name)] = t->entries[k];
    free(t->entries);
    *t = bigger;
}

value *names_find(const name_table *t, const char *name)
{
    return t->room ? t->entries[find_place(t, name)].value : NULL;
}

void names_set(name_table *t, const char *name, value *v)
{
    if (2 * (t->count + 1) > t->room) grow(t);
    name_entry *x = &t->entries[find_place(t, name)];
    if (!x->name) {
        x->name = base_copy(name);
        t->count++;
    }
    value_release(x->value);
    x->value = v;
}

/* Closes the gap: entries after it that would no longer be found move up (Knuth, The Art of Computer Programming 3, 6.4,
 * algorithm R). */
static void close_gap(name_table *t, size_t gap)
{
    for (size_t k = (gap + 1) & (t->room - 1); t->entries[k].name; k = (k + 1) & (t->room - 1)) {
        size_t home = hash_name(t->entries[k].name) & (t->room - 1);
        bool stays = gap <= k ? gap < home && home <= k : gap < home || home <= k;
        if (stays) continue;
        t->entries[gap] = t->entries[k];
        gap = k;
    }
    t->entries[gap] = (name_entry){NULL, NULL};
}

bool names_drop(name_table *t, const char *name)
{
    if (!t->room) return false;
    size_t k = find_place(t, name);
    if (!t->entries[k].name) return false;
    free(t->entries[k].name);
    value_release(t->entries[k].value);
    t->count--;
    close_gap(t, k);
    return true;
}

void names_each(const name_table *t, void (*take)(void *host, const char *name), void *host)
{
    for (size_t k = 0; k < t->room; k++)
        if (t->entries[k].name) take(host, t->entries[k].name);
}

void names_clear(name_table *t)
{
    for (size_t k = 0; k < t->room; k++) {
        free(t->entries[k].name);
        value_release(t->entries[k].value);
    }
    free(t->entries);
    memset(t, 0, sizeof *t);
}
