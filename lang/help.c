/* Answers `help`: looks a word up in the table of help_words.c and in the engine's table of functions. The one idea: both
 * tables are the only lists; what is here turns a row into words. */
#include "lang/help.h"

#include <limits.h>
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"

static const char *const group_titles[HELP_GROUPS] = {
    [HELP_DECLARE] = "Declaring",      [HELP_REQUEST] = "Requests",       [HELP_WRITE] = "Output and session",
    [HELP_RULE] = "Rules, derivations", [HELP_MOVE] = "Moves",            [HELP_EXPRESSION] = "Expressions",
    [HELP_CONSTANT] = "Constants",     [HELP_METHOD] = "Methods",         [HELP_FORMAT] = "Formats",
    [HELP_LABEL] = "How it is known",  [HELP_CLAUSE] = "Words inside",
};

const help_entry *help_find(const char *word)
{
    size_t count;
    const help_entry *t = help_table(&count);
    for (size_t k = 0; k < count; k++)
        if (strcmp(t[k].word, word) == 0) return &t[k];
    return NULL;
}

void help_each_word(void (*take)(void *host, const char *word), void *host)
{
    size_t count;
    const help_entry *t = help_table(&count);
    for (size_t k = 0; k < count; k++)
        if (help_find(t[k].word) == &t[k]) take(host, t[k].word);
}

/* ---- the list ---- */

/* A line of words that breaks before column 78. */
static void add_word(text *out, size_t *column, const char *word)
{
    size_t width = strlen(word);
    if (*column + 1 + width > 78) {
        text_add(out, "\n                    ");
        *column = 20;
    }
    text_add_char(out, ' ');
    text_add(out, word);
    *column += 1 + width;
}

static void list_group(result *r, help_group g)
{
    size_t count;
    const help_entry *t = help_table(&count);
    text line;
    text_init(&line);
    text_addf(&line, "%-20s", group_titles[g]);
    size_t column = 20;
    for (size_t k = 0; k < count; k++)
        if (t[k].group == g) add_word(&line, &column, t[k].word);
    result_line(r, "%s", line.bytes);
    text_clear(&line);
}

static void list_functions(result *r)
{
    text line;
    text_init(&line);
    text_addf(&line, "%-20s", "Functions");
    size_t column = 20;
    for (int f = 0; f < FUNCTION_COUNT; f++)
        if (function_find(function_name((function_id)f), -1) == (function_id)f)
            add_word(&line, &column, function_name((function_id)f));
    add_word(&line, &column, "sqrt");
    result_line(r, "%s", line.bytes);
    text_clear(&line);
}

static void add_json_word(void *host, const char *word)
{
    text *t = host;
    json_next(t);
    json_string(t, word);
}

static void answer_list(result *r)
{
    result_line(r, "A statement ends with its line; `help WORD` explains a word.");
    for (int g = 0; g < HELP_GROUPS; g++) list_group(r, (help_group)g);
    list_functions(r);
    text words;
    text_init(&words);
    text_add_char(&words, '[');
    help_each_word(add_json_word, &words);
    for (int f = 0; f < FUNCTION_COUNT; f++)
        if (function_find(function_name((function_id)f), -1) == (function_id)f)
            add_json_word(&words, function_name((function_id)f));
    add_json_word(&words, "sqrt");
    text_add_char(&words, ']');
    result_json(r, "words", words.bytes);
    text_clear(&words);
}

/* ---- one word ---- */

/* Lines of `words`, each behind `indent`. */
static void add_lines(text *out, const char *indent, const char *words)
{
    while (*words) {
        size_t length = strcspn(words, "\n");
        text_add(out, indent);
        text_add_bytes(out, words, length);
        text_add_char(out, '\n');
        words += length;
        if (*words) words++;
    }
}

static const char *example_of(const help_entry *h)
{
    for (int hops = 0; h && hops < 4; hops++) {
        if (h->example) return h->example;
        h = h->see ? help_find(h->see) : NULL;
    }
    return "";
}

static void add_entry(text *lines, text *json, const char *word, const char *form, const char *about, const char *example,
                      bool available)
{
    if (lines->length > 0) text_add_char(lines, '\n');
    if (form) add_lines(lines, "", form);
    else text_addf(lines, "%s\n", word);
    add_lines(lines, "  ", about);
    if (!available) text_add(lines, "  This version reads it but does not have it yet.\n");
    text_add(lines, "  Example:\n");
    add_lines(lines, "    ", example);
    json_next(json);
    text_add_char(json, '{');
    json_member(json, "form");
    json_string(json, form ? form : word);
    json_member(json, "about");
    json_string(json, about);
    json_member(json, "available");
    text_add(json, available ? "true" : "false");
    json_member(json, "example");
    json_string(json, example);
    text_add_char(json, '}');
}

/* How a function is typed: as its summary begins ("J(nu, z): ..."), else with arguments named here. Returns what is left of
 * the summary. */
static const char *add_form(text *form, const char *name, int arguments, bool more, const char *about)
{
    size_t length = strlen(name);
    const char *end = strstr(about, "): ");
    if (strncmp(about, name, length) == 0 && about[length] == '(' && end) {
        text_add_bytes(form, about, (size_t)(end + 1 - about));
        return end + 3;
    }
    text_addf(form, "%s(", name);
    for (int k = 0; k < arguments; k++) text_add(form, k + 1 == arguments ? "z" : "a, ");
    text_add(form, more ? ", ...)" : ")");
    return about;
}

/* The example's arguments are ones at which every function of the table has a value: the last is 1/2, those before it 1. */
static void add_function(text *lines, text *json, const char *name, int arguments, bool more, const char *about)
{
    text form, example;
    text_init(&form);
    text_init(&example);
    about = add_form(&form, name, arguments, more, about);
    text_addf(&example, "evaluate %s(", name);
    for (int k = 0; k < arguments; k++) text_add(&example, k + 1 == arguments ? "1/2" : "1, ");
    text_add(&example, ") to 15 digits");
    add_entry(lines, json, name, form.bytes, about, example.bytes, true);
    text_clear(&form);
    text_clear(&example);
}

bool help_answer(result *r, const char *word)
{
    if (!word || !*word) {
        answer_list(r);
        return true;
    }
    text lines, json;
    text_init(&lines);
    text_init(&json);
    text_add_char(&json, '[');
    size_t count;
    const help_entry *t = help_table(&count);
    for (size_t k = 0; k < count; k++)
        if (strcmp(t[k].word, word) == 0)
            add_entry(&lines, &json, word, t[k].form, t[k].about, example_of(&t[k]), t[k].available);
    for (int f = 0; f < FUNCTION_COUNT; f++) {
        function_id id = (function_id)f;
        if (strcmp(function_name(id), word) != 0) continue;
        int arguments = function_fewest(id);
        bool more = function_most(id) > arguments;
        add_function(&lines, &json, word, more ? 2 : arguments, more, function_summary(id));
    }
    if (strcmp(word, "sqrt") == 0)
        add_function(&lines, &json, word, 1, false, "square root, z^(1/2); cut (-inf, 0] (DLMF 4.2(iv))");
    text_add_char(&json, ']');
    bool found = lines.length > 0;
    if (found) {
        text_add(&r->words, lines.bytes);
        result_string(r, "word", word);
        result_json(r, "entries", json.bytes);
    }
    text_clear(&lines);
    text_clear(&json);
    return found;
}
