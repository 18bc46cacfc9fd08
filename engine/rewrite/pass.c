/* Passes as values: made, shared, taken apart. Running one is pass_run.c. */
#include "engine/rewrite/pass.h"

#include <stdlib.h>
#include <string.h>

static pass *pass_new(strategy kind)
{
    pass *p = base_alloc(sizeof *p);
    memset(p, 0, sizeof *p);
    p->holders = 1;
    p->kind = kind;
    return p;
}

pass *pass_of_rule(rule *r)
{
    pass *p = pass_new(STRATEGY_RULE);
    p->rule = rule_hold(r);
    return p;
}

pass *pass_of_step(const pass_step *s)
{
    pass *p = pass_new(STRATEGY_STEP);
    p->step = s;
    return p;
}

pass *pass_join(strategy kind, pass *const *parts, size_t n)
{
    pass *p = pass_new(kind);
    p->count = n;
    p->parts = base_alloc((n + 1) * sizeof *p->parts);
    memcpy(p->parts, parts, n * sizeof *parts);
    return p;
}

pass *pass_named(const char *name, pass *inner)
{
    pass *p = pass_join(STRATEGY_NAMED, &inner, 1);
    p->name = base_copy(name);
    return p;
}

pass *pass_hold(pass *p)
{
    p->holders++;
    return p;
}

void pass_release(pass *p)
{
    if (!p || --p->holders > 0) return;
    for (size_t k = 0; k < p->count; k++) pass_release(p->parts[k]);
    pass_forget(p);
    rule_release(p->rule);
    free(p->parts);
    free(p->name);
    free(p);
}

typedef struct rule_list {
    size_t count, room;
    rule **list;
} rule_list;

static void collect_rules(const pass *p, rule_list *l)
{
    if (p->rule) {
        for (size_t k = 0; k < l->count; k++)
            if (l->list[k] == p->rule) return;
        if (l->count == l->room) {
            l->room = l->room ? 2 * l->room : 16;
            l->list = base_resize(l->list, l->room * sizeof *l->list);
        }
        l->list[l->count++] = p->rule;
    }
    for (size_t k = 0; k < p->count; k++) collect_rules(p->parts[k], l);
}

size_t pass_rules(const pass *p, rule ***rules)
{
    rule_list l = {0, 0, NULL};
    collect_rules(p, &l);
    *rules = l.list;
    return l.count;
}
