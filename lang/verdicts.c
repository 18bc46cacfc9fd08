/* The cache of verdicts. The one idea: a line a verdict, its key made of all that the verdict depends on (both sides and
 * the conditions as expressions, the declared facts on names that stand for themselves, the version of the program),
 * with a checksum; so a line that was cut, changed or made by another version is as if it were not there. */
#include "lang/verdicts.h"

#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "engine/rewrite/check.h"
#include "lang/file.h"

/* Raised when the checking changes so that old verdicts no longer count. */
enum { CHECK_REVISION = 1, KEY_LENGTH = 32 };

struct verdicts {
    char *path;   /* NULL: there is no place for a cache */
    text bytes;   /* the file as it was read, and what was added since */
};

void verdicts_free(struct verdicts *v)
{
    if (!v) return;
    free(v->path);
    text_clear(&v->bytes);
    free(v);
}

/* $XDG_CACHE_HOME/termwise/rules (XDG Base Directory Specification 0.8), or NULL when there is no home. */
static char *cache_path(void)
{
    const char *cache = getenv("XDG_CACHE_HOME"), *home = getenv("HOME");
    text path;
    text_init(&path);
    if (cache && cache[0] == '/') text_addf(&path, "%s/termwise/rules", cache);
    else if (home && *home) text_addf(&path, "%s/.cache/termwise/rules", home);
    char *found = path.length ? text_take(&path) : NULL;
    text_clear(&path);
    return found;
}

static struct verdicts *verdicts_of(session *s)
{
    if (s->verdicts) return s->verdicts;
    struct verdicts *v = base_alloc(sizeof *v);
    v->path = cache_path();
    text_init(&v->bytes);
    s->verdicts = v;
    text why;
    text_init(&why);
    if (v->path && file_exists(v->path)) file_read(v->path, &v->bytes, &why);
    text_add(&v->bytes, "\n");
    text_clear(&why);
    return v;
}

/* FNV-1a, 64 bits, from two starts: 32 hexadecimal digits. */
static void hash_words(char out[KEY_LENGTH + 1], const char *words)
{
    uint64_t a = 14695981039346656037u, b = 0x6c62272e07bb0142u;
    for (const char *p = words; *p; p++) {
        a = (a ^ (unsigned char)*p) * 1099511628211u;
        b = (b ^ (unsigned char)*p ^ (a >> 56)) * 1099511628211u;
    }
    snprintf(out, KEY_LENGTH + 1, "%016llx%016llx", (unsigned long long)a, (unsigned long long)b);
}

static void add_expr(session *s, text *t, expr *a)
{
    expr_print(s->e, t, a);
    text_add_char(t, '\n');
}

static void rule_key(session *s, const rule *r, char key[KEY_LENGTH + 1])
{
    text all;
    text_init(&all);
    text_addf(&all, "%s %d\n", TW_VERSION, CHECK_REVISION);
    for (size_t k = 0; k < r->count; k++) text_addf(&all, "%s %zu\n", r->variables[k].symbol->is.name, r->variables[k].arity);
    add_expr(s, &all, r->left);
    add_expr(s, &all, r->right);
    for (size_t k = 0; k < r->condition_count; k++) add_expr(s, &all, r->conditions[k]);
    for (size_t k = 0; k < facts_count(s->e); k++) {
        condition_label known;
        expr *fact = facts_at(s->e, k, &known);
        if (((r->left->names | r->right->names) & fact->names) != 0) add_expr(s, &all, fact);
    }
    hash_words(key, all.bytes);
    text_clear(&all);
}

/* The line of this key and status, up to and without its checksum. */
static void add_line(text *line, const char *key, const rule *r)
{
    text_addf(line, "%s %d ", key, (int)r->status);
    for (const char *p = r->finding ? r->finding : ""; *p; p++) text_add_char(line, *p == '\n' ? ' ' : *p);
}

/* One line of the file: KEY STATUS FINDING <tab> CHECKSUM. */
static bool read_line(const char *at, const char *end, rule *r)
{
    const char *tab = memchr(at, '\t', (size_t)(end - at));
    char sum[KEY_LENGTH + 1];
    if (!tab || end - tab != KEY_LENGTH + 1 || tab - at < KEY_LENGTH + 3) return false;
    char *line = strndup(at, (size_t)(tab - at));
    if (!line) return false;
    hash_words(sum, line);
    const int status = line[KEY_LENGTH + 1] - '0';
    const bool good = memcmp(sum, tab + 1, KEY_LENGTH) == 0 && status >= RULE_UNCHECKED && status <= RULE_REFUTED;
    if (good) {
        free(r->finding);
        r->finding = base_copy(line + KEY_LENGTH + 3);
        r->status = (rule_status)status;
        r->checked = true;
    }
    free(line);
    return good;
}

bool verdict_recall(session *s, rule *r)
{
    struct verdicts *v = verdicts_of(s);
    char key[KEY_LENGTH + 1];
    rule_key(s, r, key);
    bool found = false; /* the last line of the key counts */
    for (const char *at = strstr(v->bytes.bytes, key); at; at = strstr(at + 1, key)) {
        const char *end = strchr(at, '\n');
        if (at > v->bytes.bytes && at[-1] == '\n' && end && read_line(at, end, r)) found = true;
    }
    return found;
}

void verdict_keep(session *s, const rule *r)
{
    struct verdicts *v = verdicts_of(s);
    char key[KEY_LENGTH + 1], sum[KEY_LENGTH + 1];
    text line, whole;
    text_init(&line);
    text_init(&whole);
    rule_key(s, r, key);
    add_line(&line, key, r);
    hash_words(sum, line.bytes);
    text_addf(&whole, "\n%s\t%s\n", line.bytes, sum); /* a line end before it, should the last writer have died in a line */
    text_add(&v->bytes, whole.bytes);
    if (v->path && file_make_folders(v->path)) {
        int fd = open(v->path, O_WRONLY | O_APPEND | O_CREAT | O_CLOEXEC, 0600);
        if (fd >= 0) {
            if (write(fd, whole.bytes, whole.length) < 0) { /* a cache that cannot be written is no trouble */
            }
            close(fd);
        }
    }
    text_clear(&line);
    text_clear(&whole);
}
