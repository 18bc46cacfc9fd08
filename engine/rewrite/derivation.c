/* The record of how a result came about: steps in order, each with its conditions. The room's one idea: a condition
 * keeps the weakest label under which it was ever used, so a list can only lose strength as it grows. It may not know
 * integrals. */
#include "engine/rewrite/derivation.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"

/* ---- conditions ---- */

void conditions_init(condition_list *c)
{
    *c = (condition_list){0, 0, NULL};
}

void conditions_clear(condition_list *c)
{
    for (size_t k = 0; k < c->count; k++) free(c->list[k].words);
    free(c->list);
    conditions_init(c);
}

/* 0 is the weakest. */
static int label_strength(condition_label l)
{
    return l == CONDITION_OPEN ? 0 : l == CONDITION_GRANTED ? 1 : 2;
}

void conditions_add(condition_list *c, const char *words, expr *relation, condition_label label)
{
    for (size_t k = 0; k < c->count; k++) {
        condition *old = &c->list[k];
        if (strcmp(old->words, words) != 0) continue;
        if (label_strength(label) < label_strength(old->label)) old->label = label;
        if (!old->relation) old->relation = relation;
        return;
    }
    if (c->count == c->room) {
        c->room = c->room ? 2 * c->room : 4;
        c->list = base_resize(c->list, c->room * sizeof *c->list);
    }
    c->list[c->count] = (condition){base_copy(words), relation, label};
    c->count++;
}

void conditions_append(condition_list *to, const condition_list *from)
{
    for (size_t k = 0; k < from->count; k++)
        conditions_add(to, from->list[k].words, from->list[k].relation, from->list[k].label);
}

bool conditions_all_sure(const condition_list *c)
{
    for (size_t k = 0; k < c->count; k++)
        if (label_strength(c->list[k].label) < 2) return false;
    return true;
}

tw_status conditions_require(tw_engine *e, condition_list *c, expr *relation)
{
    if (!relation) return TW_ERROR;
    condition_label label = CONDITION_OPEN;
    answer holds = decide(e, relation, &label);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    char *words = expr_text(e, relation);
    if (!words) return TW_ERROR;
    tw_status status = TW_OK;
    if (holds == ANSWER_NO) status = engine_fail(e, ERROR_UNSUITABLE, "this needs %s, which does not hold", words);
    else conditions_add(c, words, relation, holds == ANSWER_YES ? label : CONDITION_OPEN);
    free(words);
    return status;
}

/* ---- steps ---- */

void derivation_init(derivation *d)
{
    *d = (derivation){0, 0, NULL};
}

static void step_clear(step *s)
{
    free(s->rule);
    free(s->source);
    free(s->detail);
    free(s->form);
    conditions_clear(&s->conditions);
}

void derivation_clear(derivation *d)
{
    for (size_t k = 0; k < d->count; k++) step_clear(&d->steps[k]);
    free(d->steps);
    derivation_init(d);
}

void derivation_cut(derivation *d, size_t count)
{
    while (d->count > count) step_clear(&d->steps[--d->count]);
}

static void make_room(derivation *d)
{
    if (d->count < d->room) return;
    d->room = d->room ? 2 * d->room : 8;
    d->steps = base_resize(d->steps, d->room * sizeof *d->steps);
}

void derivation_move(derivation *to, derivation *from)
{
    for (size_t k = 0; k < from->count; k++) {
        make_room(to);
        to->steps[to->count++] = from->steps[k];
    }
    from->count = 0;
}

step *derivation_add(derivation *d, const char *rule, const char *source)
{
    make_room(d);
    step *s = &d->steps[d->count++];
    memset(s, 0, sizeof *s);
    s->rule = base_copy(rule);
    s->source = source ? base_copy(source) : NULL;
    conditions_init(&s->conditions);
    return s;
}
