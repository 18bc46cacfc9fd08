/* Checks of rules, on request and before their first use. The one idea: a verdict is found once; it is kept in the rule,
 * and between runs in the user's cache (lang/verdicts.h). */
#include <stdlib.h>
#include <string.h>

#include "engine/rewrite/check.h"
#include "lang/request.h"
#include "lang/rules.h"
#include "lang/verdicts.h"

/* The seed of a rule's samples: its text, so that a rule is checked the same way every time. */
static uint64_t seed_of(const rule *r)
{
    uint64_t h = 14695981039346656037u; /* FNV-1a, 64 bits */
    for (const char *p = r->text ? r->text : r->name; *p; p++) h = (h ^ (unsigned char)*p) * 1099511628211u;
    return h;
}

tw_status session_check_rule(session *s, rule *r, bool again)
{
    if (r->checked && !again) return TW_OK;
    if (!again && verdict_recall(s, r)) return TW_OK;
    if (rule_check(s->e, r, seed_of(r), 0, NULL) != TW_OK) return TW_ERROR;
    verdict_keep(s, r);
    return TW_OK;
}

tw_status session_check_pass(session *s, const pass *p)
{
    rule **rules;
    const size_t n = pass_rules(p, &rules);
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < n; k++) {
        status = session_check_rule(s, rules[k], false);
        if (status == TW_OK) status = rule_usable(s->e, rules[k]);
    }
    free(rules);
    return status;
}

static tw_status refuse(session *s, span at, const rule *r)
{
    return request_fail(s, at, ERROR_REFUTED, "the rule `%s` is refuted: %s", r->name, r->finding);
}

tw_status request_check_rule(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    syntax_name name = st->as.name;
    const value *v = names_find(&s->rules, name.text);
    if (!v || v->kind != VALUE_RULE) return request_fail(s, name.at, ERROR_NAME, "no rule is called `%s`", name.text);
    rule *x = v->rule;
    if (session_check_rule(s, x, true) != TW_OK) return request_fail_at(s, st->at);
    result_restart(r, "check");
    result_string(r, "rule", x->name);
    result_string(r, "status", rule_status_word(x->status));
    result_string(r, "finding", x->finding);
    text words;
    text_init(&words);
    text_addf(&words, "%s: %s", x->name, x->finding ? x->finding : "");
    result_labelled(r, words.bytes, rule_status_word(x->status), NULL);
    text_clear(&words);
    return x->status == RULE_REFUTED ? refuse(s, name.at, x) : TW_OK;
}

/* ---- a file ---- */

typedef struct rules_found {
    session *s;
    const char *path;
    size_t count;
    rule **list;
} rules_found;

static void find_rule(void *host, const char *name)
{
    rules_found *f = host;
    const value *v = names_find(&f->s->rules, name);
    if (v->kind != VALUE_RULE || !v->rule->file || strcmp(v->rule->file, f->path) != 0) return;
    f->list = base_resize(f->list, (f->count + 1) * sizeof *f->list);
    f->list[f->count++] = rule_hold(v->rule);
}

static int by_line(const void *a, const void *b)
{
    const rule *x = *(rule *const *)a, *y = *(rule *const *)b;
    return (x->line > y->line) - (x->line < y->line);
}

/* The verdict on each rule, and the count of each verdict. */
static tw_status check_rules(session *s, result *r, const rules_found *f, span at)
{
    size_t counts[4] = {0};
    table t;
    table_init(&t, 3);
    tw_status status = TW_OK;
    const rule *wrong = NULL;
    for (size_t k = 0; status == TW_OK && k < f->count; k++) {
        rule *x = f->list[k];
        status = session_check_rule(s, x, true);
        if (status != TW_OK) break;
        counts[x->status]++;
        if (x->status == RULE_REFUTED && !wrong) wrong = x;
        table_cell(&t, x->name);
        table_cell(&t, rule_status_word(x->status));
        table_cell(&t, x->finding ? x->finding : "");
    }
    table_print(&t, &r->words, "  ");
    table_clear(&t);
    if (status != TW_OK) return request_fail_at(s, at);
    result_line(r, "%zu proved, %zu passed, %zu unchecked, %zu refuted", counts[RULE_PROVED], counts[RULE_PASSED],
                counts[RULE_UNCHECKED], counts[RULE_REFUTED]);
    for (rule_status k = RULE_UNCHECKED; k <= RULE_REFUTED; k++)
        result_integer(r, rule_status_word(k), (long)counts[k]);
    if (!wrong) return TW_OK;
    return request_fail(s, at, ERROR_REFUTED, "\"%s\":%u: the rule `%s` is refuted: %s", f->path, wrong->line, wrong->name,
                        wrong->finding);
}

tw_status request_check_file(session *s, const statement *st, result *r, value **keep)
{
    (void)keep;
    char *path = find_user_file(s, st->as.file);
    session_mark m;
    session_mark_set(s, &m, true);
    tw_status status = run_used_file(s, path, true);
    if (status == TW_OK) {
        result_restart(r, "check");
        result_string(r, "file", path);
        rules_found f = {.s = s, .path = path};
        names_each(&s->rules, find_rule, &f);
        if (f.count > 1) qsort(f.list, f.count, sizeof *f.list, by_line);
        status = check_rules(s, r, &f, st->at);
        for (size_t k = 0; k < f.count; k++) rule_release(f.list[k]);
        free(f.list);
    } else {
        request_fail_at(s, st->at);
    }
    session_mark_end(s, &m, true);
    free(path);
    return status;
}
