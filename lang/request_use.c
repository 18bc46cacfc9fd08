/* Files that a session uses: the standard library and the user's own. The one idea: a file has one path, whatever name
 * led to it, and runs once. */
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "engine/method/method.h"
#include "lang/file.h"
#include "lang/request.h"
#include "lang/rules.h"

/* ---- finding ---- */

/* FOLDER/NAME.tw if it is there, into a fresh string; NULL otherwise. */
static char *file_in(const char *folder, size_t length, const char *name)
{
    text path;
    text_init(&path);
    text_add_bytes(&path, folder, length);
    text_addf(&path, "%s%s.tw", length && folder[length - 1] != '/' ? "/" : "", name);
    char *found = file_exists(path.bytes) ? text_take(&path) : NULL;
    text_clear(&path);
    return found;
}

/* In one of the folders of a list with colons between them. */
static char *file_in_list(const char *list, const char *name)
{
    char *found = NULL;
    while (list && *list && !found) {
        const size_t length = strcspn(list, ":");
        if (length > 0) found = file_in(list, length, name);
        list += length + (list[length] == ':');
    }
    return found;
}

/* The standard library: first the folders of TERMWISE_PATH. Then, where TW_STDLIB names a folder, that one only; else the
 * installed data, else the source tree that the program was built in. Into a fresh string, NULL when none has it. */
static char *find_library_file(const char *name)
{
    char *found = file_in_list(getenv("TERMWISE_PATH"), name);
    const char *chosen = getenv("TW_STDLIB");
    if (found) return found;
    if (chosen && *chosen) return file_in(chosen, strlen(chosen), name);
    char program[4096];
    ssize_t length = readlink("/proc/self/exe", program, sizeof program - 1);
    program[length > 0 ? length : 0] = '\0';
    char *folder = file_folder(program);
    const char *places[] = {"../share/termwise/stdlib", "../stdlib", "../../stdlib"};
    found = file_in(TW_DATADIR "/stdlib", strlen(TW_DATADIR "/stdlib"), name);
    for (size_t k = 0; !found && k < sizeof places / sizeof *places; k++) {
        text place;
        text_init(&place);
        text_addf(&place, "%s%s", folder, places[k]);
        found = file_in(place.bytes, place.length, name);
        text_clear(&place);
    }
    free(folder);
    return found;
}

char *find_user_file(session *s, const char *file)
{
    text path;
    text_init(&path);
    if (file[0] != '/') text_add(&path, s->folder);
    text_add(&path, file);
    return text_take(&path);
}

/* ---- use ---- */

/* What is remembered of a file is its real path. */
static char *real_path(const char *path)
{
    char *real = realpath(path, NULL);
    return real ? real : base_copy(path);
}

tw_status run_used_file(session *s, const char *path, bool again)
{
    if (!s->run_file) return engine_fail(s->e, ERROR_UNAVAILABLE, "files cannot be used here");
    char *real = real_path(path);
    tw_status status = TW_OK;
    if (again || !names_find(&s->files, real)) {
        status = s->run_file(s->host, path);
        if (status == TW_OK) {
            value *v = value_new(VALUE_RESULT);
            v->what = "a file";
            v->text = base_copy(path);
            names_set(&s->files, real, v);
        }
    }
    free(real);
    return status;
}

tw_status request_use(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    const char *file = st->as.use.file;
    char *path = file ? find_user_file(s, file) : find_library_file(st->as.use.name.text);
    if (!path)
        return request_fail(s, st->as.use.name.at, ERROR_FILE, "the standard library has no file `%s`", st->as.use.name.text);
    span at = st->at;
    tw_status status = run_used_file(s, path, false);
    result_restart(r, "use");
    result_string(r, "file", path);
    r->echo = true;
    free(path);
    return status == TW_OK ? TW_OK : request_fail_at(s, at);
}

/* ---- show ---- */

typedef struct file_contents {
    session *s;
    result *r;
    const char *path;
    size_t count;
    const char **names;
} file_contents;

static void add_name(void *host, const char *name)
{
    file_contents *c = host;
    const value *v = names_find(&c->s->rules, name);
    const char *file = v->kind == VALUE_RULE ? v->rule->file : v->file;
    if (!file || strcmp(file, c->path) != 0) return;
    c->names = base_resize(c->names, (c->count + 1) * sizeof *c->names);
    c->names[c->count++] = name;
}

static unsigned line_of(const session *s, const char *name)
{
    const value *v = names_find(&s->rules, name);
    return v->kind == VALUE_RULE ? v->rule->line : v->line;
}

/* By their lines in the file: few enough for insertion. */
static void sort_names(const file_contents *c)
{
    for (size_t k = 1; k < c->count; k++)
        for (size_t j = k; j > 0 && line_of(c->s, c->names[j]) < line_of(c->s, c->names[j - 1]); j--) {
            const char *name = c->names[j];
            c->names[j] = c->names[j - 1];
            c->names[j - 1] = name;
        }
}

/* The path of a used file whose name without folder and `.tw` is this one, or NULL. */
static const char *used_path(session *s, const char *name)
{
    for (size_t k = 0; k < s->files.room; k++) {
        if (!s->files.entries[k].name) continue;
        const char *path = s->files.entries[k].value->text, *slash = strrchr(path, '/'), *base = slash ? slash + 1 : path;
        const size_t length = strlen(name);
        if (strncmp(base, name, length) == 0 && strcmp(base + length, ".tw") == 0) return path;
    }
    return NULL;
}

static void show_used(session *s, result *r, const char *name, const char *path)
{
    file_contents c = {.s = s, .r = r, .path = path};
    names_each(&s->rules, add_name, &c);
    sort_names(&c);
    text list;
    text_init(&list);
    text_add_char(&list, '[');
    result_line(r, "%s: a file, \"%s\", with %zu rules and passes", name, path, c.count);
    for (size_t k = 0; k < c.count; k++) {
        const value *v = names_find(&s->rules, c.names[k]);
        const rule *x = v->kind == VALUE_RULE ? v->rule : NULL;
        result_line(r, "  %-28s %s%s%s", c.names[k], x ? "rule" : "pass", x && x->source ? "  " : "",
                    x && x->source ? x->source : "");
        json_next(&list);
        text_addf(&list, "\"%s\"", c.names[k]);
    }
    text_add_char(&list, ']');
    result_string(r, "file", path);
    result_json(r, "rules", list.bytes);
    text_clear(&list);
    free(c.names);
}

bool show_file(session *s, result *r, const char *name)
{
    const char *path = used_path(s, name);
    if (path) {
        show_used(s, r, name, path);
        return true;
    }
    char *there = find_library_file(name);
    if (!there) return false;
    result_string(r, "file", there);
    result_line(r, "%s: a file of the standard library; `use %s` runs it", name, name);
    free(there);
    return true;
}
