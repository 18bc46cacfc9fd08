/* The state of a derivation by hand: its frames, how a move is made and kept, how it is shown. The one idea: a frame is a
 * value; a move builds the next one beside it, and only when every check has passed is it put behind the last, so a failed
 * move leaves no trace and undo is forgetting the last frame. Knows nothing of how single moves work. */
#include "engine/manual/work.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#define CONVERGES "the integral as typed converges"

/* ---- terms ---- */

static char *keep_words(tw_engine *e, const char *words)
{
    return arena_copy(&e->arena, words, strlen(words));
}

static void list_add(manual_terms *t, const manual_term *one)
{
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 4;
        t->list = base_resize(t->list, t->room * sizeof *t->list);
    }
    t->list[t->count++] = *one;
}

static bool same_term(const manual_term *a, const manual_term *b)
{
    return a->integral == b->integral;
}

void terms_clear_list(manual_terms *t)
{
    free(t->list);
    memset(t, 0, sizeof *t);
}

static manual_terms terms_copy(const manual_terms *t)
{
    manual_terms made = {0, 0, NULL};
    for (size_t k = 0; k < t->count; k++) list_add(&made, &t->list[k]);
    return made;
}

static void frame_clear(manual_frame *f)
{
    terms_clear_list(&f->live);
    terms_clear_list(&f->split_off);
}

/* ---- work ---- */

bool piece_open(work *w, piece *p, const manual_term *t)
{
    if (t->integral->kind != EXPR_INTEGRAL) return false;
    p->outside = t->outside;
    p->name = t->name;
    p->x = expr_fresh(w->e, t->name);
    p->from = t->integral->args[0];
    p->to = t->integral->args[1];
    p->body = p->x ? expr_open(w->e, t->integral, p->x) : NULL;
    return p->body != NULL;
}

expr *piece_read(work *w, const piece *p, expr *typed)
{
    return expr_substitute(w->e, typed, expr_symbol(w->e, p->name), p->x);
}

tw_status work_add_plain(work *w, expr *a)
{
    a = expr_add(w->e, w->next.plain, a);
    if (!a) return TW_ERROR;
    w->next.plain = a;
    return TW_OK;
}

tw_status work_add_term(work *w, const manual_term *t)
{
    manual_terms *list = w->remainder ? &w->next.split_off : &w->next.live;
    if (!t->outside || !t->integral) return TW_ERROR;
    for (size_t k = 0; k < list->count; k++)
        if (same_term(&list->list[k], t)) {
            expr *sum = expr_add(w->e, list->list[k].outside, t->outside);
            if (!sum) return TW_ERROR;
            list->list[k].outside = sum;
            return TW_OK;
        }
    list_add(list, t);
    return TW_OK;
}

/* A name for the variable that nothing else in the term has. */
static const char *free_name(tw_engine *e, const char *wanted, expr *const *parts, size_t count)
{
    text name;
    text_init(&name);
    text_add(&name, wanted);
    for (unsigned long n = 1;; n++) {
        expr *symbol = expr_symbol(e, name.bytes);
        bool taken = false;
        for (size_t k = 0; symbol && k < count; k++) taken = taken || expr_has(parts[k], symbol);
        if (!taken) break;
        text_cut(&name, 0);
        text_addf(&name, "%s%lu", wanted, n);
    }
    const char *kept = strcmp(name.bytes, wanted) == 0 ? wanted : keep_words(e, name.bytes);
    text_clear(&name);
    return kept;
}

/* exp(-s - s*y) = exp(-s) exp(-s*y) */
static void split_exponential(tw_engine *e, expr *f, expr *x, expr **outside, expr **inside)
{
    expr *const *parts, *free_part = expr_int(e, 0), *rest = expr_int(e, 0);
    size_t count = expr_terms(&f->args[0], &parts);
    for (size_t k = 0; k < count; k++)
        if (expr_has(parts[k], x)) rest = expr_add(e, rest, parts[k]);
        else free_part = expr_add(e, free_part, parts[k]);
    *outside = expr_mul(e, *outside, expr_call1(e, FUNCTION_EXP, free_part));
    *inside = expr_mul(e, *inside, expr_call1(e, FUNCTION_EXP, rest));
}

/* Factors free of the variable go in front; a body that vanishes leaves nothing. */
tw_status work_add_integral(work *w, const piece *p)
{
    tw_engine *e = w->e;
    if (!p->outside || !p->from || !p->to || !p->body) return TW_ERROR;
    expr *body = tidy(e, p->body, p->x, range_is_positive(e, p->from)), *outside = p->outside, *inside = expr_int(e, 1);
    if (!body) return TW_ERROR;
    if (is_identically_zero(e, body, p->x)) return TW_OK;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    expr *const *factors;
    size_t count = expr_factors(&body, &factors);
    for (size_t k = 0; k < count; k++)
        if (!expr_has(factors[k], p->x)) outside = expr_mul(e, outside, factors[k]);
        else if (expr_is_call(factors[k], FUNCTION_EXP)) split_exponential(e, factors[k], p->x, &outside, &inside);
        else inside = expr_mul(e, inside, factors[k]);
    outside = tidy(e, outside, NULL, false);
    expr *integral = expr_integral(e, p->x, p->from, p->to, inside);
    expr *parts[] = {outside, integral};
    if (!integral || !outside) return TW_ERROR;
    manual_term t = {outside, integral, free_name(e, p->name, parts, 2)};
    return work_add_term(w, &t);
}

static bool has_integral(expr *a)
{
    if (a->kind == EXPR_INTEGRAL || a->kind == EXPR_CONTOUR) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (has_integral(a->args[k])) return true;
    return false;
}

/* outside * one integral? */
static bool split_term(tw_engine *e, expr *part, expr **outside, expr **integral)
{
    expr *const *factors;
    size_t count = expr_factors(&part, &factors);
    *outside = expr_int(e, 1);
    *integral = NULL;
    for (size_t k = 0; k < count; k++) {
        bool is_one = factors[k]->kind == EXPR_INTEGRAL || factors[k]->kind == EXPR_CONTOUR;
        if (is_one && !*integral) *integral = factors[k];
        else if (has_integral(factors[k])) return false;
        else *outside = expr_mul(e, *outside, factors[k]);
    }
    return *integral != NULL && *outside != NULL;
}

tw_status work_add_any(work *w, expr *a, const char *name)
{
    tw_engine *e = w->e;
    if (!a) return TW_ERROR;
    if (has_integral(a) && a->kind == EXPR_PRODUCT) a = expr_expand(e, a);
    if (!a) return TW_ERROR;
    expr *const *parts;
    size_t count = expr_terms(&a, &parts);
    for (size_t k = 0; k < count; k++) {
        manual_term t = {NULL, NULL, name};
        if (!split_term(e, parts[k], &t.outside, &t.integral)) {
            if (work_add_plain(w, parts[k]) != TW_OK) return TW_ERROR;
            continue;
        }
        const char *own = name ? name : expr_binder_name(t.integral);
        expr *all[] = {t.outside, t.integral};
        t.name = free_name(e, own ? own : "x", all, 2);
        if (work_add_term(w, &t) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

void work_needs(work *w, condition_label label, const char *format, ...)
{
    va_list args;
    char *words;
    va_start(args, format);
    int length = vasprintf(&words, format, args);
    va_end(args);
    if (length < 0) return;
    conditions_add(&w->needs, words, NULL, label);
    free(words);
}

tw_status work_require(work *w, expr *relation)
{
    return conditions_require(w->e, &w->needs, relation);
}

/* ---- life ---- */

static void push_frame(manual *m, const manual_frame *f)
{
    if (m->count == m->room) {
        m->room = m->room ? 2 * m->room : 8;
        m->frames = base_resize(m->frames, m->room * sizeof *m->frames);
        m->moves = base_resize(m->moves, m->room * sizeof *m->moves);
    }
    m->frames[m->count++] = *f;
}

static void work_init(work *w, manual *m, const manual_move *move)
{
    memset(w, 0, sizeof *w);
    w->e = m->e;
    w->m = m;
    w->move = move;
    w->proved = true;
    conditions_init(&w->needs);
    text_init(&w->detail);
    w->next.plain = expr_int(m->e, 0);
}

static void work_clear(work *w)
{
    conditions_clear(&w->needs);
    text_clear(&w->detail);
}

static bool all_converge(tw_engine *e, work *w, const manual_terms *t)
{
    bool good = true;
    for (size_t k = 0; k < t->count && good && budget_ok(e); k++) {
        piece p;
        good = piece_open(w, &p, &t->list[k]) && converges_absolutely(e, p.body, p.x, p.from, p.to) == ANSWER_YES;
    }
    return good;
}

/* What is known now is what the moves may rest on. */
static void note_facts(manual *m)
{
    for (size_t k = 0; k < facts_count(m->e); k++) {
        condition_label label;
        expr *fact = facts_at(m->e, k, &label);
        bool known = false;
        for (size_t j = 0; j < m->fact_count && !known; j++) {
            known = m->facts[j] == fact;
            if (known && label == CONDITION_GRANTED) m->fact_labels[j] = label;
        }
        if (known) continue;
        m->facts = base_resize(m->facts, (m->fact_count + 1) * sizeof *m->facts);
        m->fact_labels = base_resize(m->fact_labels, (m->fact_count + 1) * sizeof *m->fact_labels);
        m->facts[m->fact_count] = fact;
        m->fact_labels[m->fact_count++] = label;
    }
}

manual *manual_new(tw_engine *e, expr *f)
{
    if (!f) return NULL;
    manual *m = base_alloc(sizeof *m);
    memset(m, 0, sizeof *m);
    m->e = e;
    m->typed = f;
    m->holders = 1;
    derivation_init(&m->record);
    large_kind kind = facts_large(e, &m->large);
    if (kind == LARGE_NONE) m->large = NULL;
    m->small = kind == LARGE_SMALL;
    work w;
    work_init(&w, m, NULL);
    tw_status status = work_add_any(&w, f, NULL);
    if (status == TW_OK && w.next.live.count == 0)
        status = engine_fail(e, ERROR_UNSUITABLE, "this is no integral, and no sum of terms with one integral each: there is "
                                                  "nothing for the moves to act on");
    if (status == TW_OK) {
        w.next.subject = f;
        w.next.converges = all_converge(e, &w, &w.next.live);
        if (e->error.kind != ERROR_NONE) status = TW_ERROR;
    }
    slong tried = 0;
    if (status == TW_OK) status = verify_by_balls(&w, f, f, &tried);
    if (status != TW_OK) frame_clear(&w.next);
    work_clear(&w);
    if (status != TW_OK) {
        manual_release(m);
        return NULL;
    }
    step *s = derivation_add(&m->record, "as typed", NULL);
    if (w.next.converges) conditions_add(&s->conditions, CONVERGES, NULL, CONDITION_PROVED);
    push_frame(m, &w.next);
    note_facts(m);
    m->frames[0].steps = 1;
    text form;
    text_init(&form);
    manual_print_form(m, &form);
    s->form = text_take(&form);
    return m;
}

manual *manual_hold(manual *m)
{
    m->holders++;
    return m;
}

void manual_release(manual *m)
{
    if (!m || --m->holders > 0) return;
    for (size_t k = 0; k < m->count; k++) frame_clear(&m->frames[k]);
    for (size_t k = 0; k + 1 < m->count; k++) pass_release(m->moves[k].pass);
    free(m->frames);
    free(m->moves);
    free(m->facts);
    free(m->fact_labels);
    derivation_clear(&m->record);
    manual_values_free(m->values);
    free(m);
}

const manual_frame *manual_now(const manual *m)
{
    return &m->frames[m->count - 1];
}

/* ---- making a move ---- */

static piece_move *const piece_moves[MANUAL_MOVE_COUNT] = {
    [MANUAL_SUBSTITUTE] = move_substitute, [MANUAL_PARTS] = move_parts,     [MANUAL_REPEAT_PARTS] = move_parts,
    [MANUAL_SPLIT] = move_split,           [MANUAL_ROTATE] = move_rotate,   [MANUAL_EXPAND] = move_expand,
    [MANUAL_TERMWISE] = move_termwise,     [MANUAL_SWAP] = move_swap,
};
static whole_move *const whole_moves[MANUAL_MOVE_COUNT] = {
    [MANUAL_DIFFERENTIATE] = move_differentiate,
    [MANUAL_INTEGRATE_BACK] = move_integrate_back,
    [MANUAL_REWRITE] = move_rewrite,
};

/* What a move on one integral may have changed, to be taken back when it does not fit. */
typedef struct place_in_work {
    expr *plain;
    manual_terms live, split_off;
    size_t needs, detail;
    bool proved;
} place_in_work;

static place_in_work mark_work(const work *w)
{
    return (place_in_work){w->next.plain, terms_copy(&w->next.live), terms_copy(&w->next.split_off), w->needs.count,
                           w->detail.length, w->proved};
}

static void back_to(work *w, place_in_work *mark)
{
    w->next.plain = mark->plain;
    frame_clear(&w->next);
    w->next.live = mark->live;
    w->next.split_off = mark->split_off;
    for (size_t k = mark->needs; k < w->needs.count; k++) free(w->needs.list[k].words);
    if (w->needs.count > mark->needs) w->needs.count = mark->needs;
    text_cut(&w->detail, mark->detail);
    w->proved = mark->proved;
}

static void forget_mark(place_in_work *mark)
{
    terms_clear_list(&mark->live);
    terms_clear_list(&mark->split_off);
}

static tw_status run_on(work *w, const manual_term *t)
{
    piece p;
    if (!piece_open(w, &p, t)) {
        if (w->e->error.kind != ERROR_NONE) return TW_ERROR;
        return engine_fail(w->e, ERROR_UNSUITABLE, "this is an integral along a contour; the moves act on integrals over a "
                                                   "real range");
    }
    return piece_moves[w->move->kind](w, &p);
}

/* The move on every live integral that it fits, or on the one picked; the others stay. */
static tw_status run_on_pieces(work *w)
{
    tw_engine *e = w->e;
    const manual_frame *now = manual_now(w->m);
    size_t total = now->live.count + now->split_off.count, fits = 0;
    slong which = w->move->which;
    if (which > (slong)total)
        return engine_fail(e, ERROR_VALUE, "the form has %zu integral%s, so there is no integral %ld", total,
                           total == 1 ? "" : "s", (long)which);
    tw_error first = {ERROR_NONE, NULL};
    tw_status status = work_add_plain(w, now->plain);
    for (size_t k = 0; k < total && status == TW_OK && budget_ok(e); k++) {
        bool off = k >= now->live.count;
        const manual_term *t = off ? &now->split_off.list[k - now->live.count] : &now->live.list[k];
        w->remainder = off;
        if (which ? which != (slong)k + 1 : off) {
            status = work_add_term(w, t);
            continue;
        }
        place_in_work mark = mark_work(w);
        status = run_on(w, t);
        bool passes = which == 0 && now->live.count > 1 &&
                      (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED);
        if (status == TW_OK) {
            fits++;
            forget_mark(&mark);
        } else if (passes) {
            if (!first.words) first = (tw_error){e->error.kind, base_copy(e->error.words)};
            engine_forgive(e);
            back_to(w, &mark);
            status = work_add_term(w, t);
        } else {
            forget_mark(&mark);
        }
    }
    w->remainder = false;
    if (status == TW_OK && e->error.kind == ERROR_NONE && fits == 0 && first.words)
        status = engine_fail(e, first.kind, "no integral of the form fits; the first: %s", first.words);
    free(first.words);
    return e->error.kind == ERROR_NONE ? status : TW_ERROR;
}

static expr *terms_value(tw_engine *e, const manual_terms *t)
{
    expr *sum = expr_int(e, 0);
    for (size_t k = 0; k < t->count; k++) sum = expr_add(e, sum, expr_mul(e, t->list[k].outside, t->list[k].integral));
    return sum;
}

static expr *frame_value(tw_engine *e, const manual_frame *f)
{
    return expr_add(e, f->plain, expr_add(e, terms_value(e, &f->live), terms_value(e, &f->split_off)));
}

static bool same_terms(const manual_terms *a, const manual_terms *b)
{
    if (a->count != b->count) return false;
    for (size_t k = 0; k < a->count; k++)
        if (!same_term(&a->list[k], &b->list[k]) || a->list[k].outside != b->list[k].outside ||
            strcmp(a->list[k].name, b->list[k].name) != 0) /* a new name alone is a change of variable, too */
            return false;
    return true;
}

static bool same_form(const manual_frame *a, const manual_frame *b)
{
    return a->plain == b->plain && a->subject == b->subject && same_terms(&a->live, &b->live) &&
           same_terms(&a->split_off, &b->split_off);
}

/* By its theorem, by balls, or not at all. */
static tw_status verify(work *w)
{
    tw_engine *e = w->e;
    expr *before = frame_value(e, manual_now(w->m)), *after = frame_value(e, &w->next);
    if (!before || !after) return TW_ERROR;
    slong tried = 0;
    if (verify_by_balls(w, w->expected ? w->expected : before, after, &tried) != TW_OK) return TW_ERROR;
    if (tried > 0 || w->proved) return TW_OK;
    return engine_fail(e, ERROR_UNDECIDED, "this move is not proved, and no ball for it could be had at any sample value of the "
                                           "parameters: it is not kept");
}

static void record_move(work *w, size_t number)
{
    manual *m = w->m;
    step *s = derivation_add(&m->record, w->move->goes_on ? "repeat parts 1 times" : w->move->words, w->source);
    if (w->detail.length > 0) s->detail = base_copy(w->detail.bytes);
    text form;
    text_init(&form);
    manual_print_form(m, &form);
    s->form = text_take(&form);
    const manual_frame *now = manual_now(m);
    if (now->split_off.count > 0) s->remainder = terms_value(w->e, &now->split_off);
    conditions_append(&s->conditions, &w->needs);
    if (!w->proved) {
        text words;
        text_init(&words);
        text_addf(&words, "move %zu, `%s`, was tried at samples only", number, w->move->words);
        conditions_add(&s->conditions, words.bytes, NULL, CONDITION_OPEN);
        text_clear(&words);
    }
}

static tw_status make(work *w)
{
    manual *m = w->m;
    tw_engine *e = m->e;
    const manual_frame *now = manual_now(m);
    w->next.subject = now->subject;
    w->next.factor = now->factor;
    w->next.factor_variable = now->factor_variable;
    w->next.pending = now->pending;
    w->next.converges = now->converges;
    w->next.tried = now->tried;
    tw_status status = whole_moves[w->move->kind] ? whole_moves[w->move->kind](w) : run_on_pieces(w);
    if (status == TW_OK) {
        expr *plain = w->next.plain ? tidy(e, expr_expand(e, w->next.plain), NULL, false) : NULL;
        if (plain) w->next.plain = plain;
        else status = TW_ERROR;
    }
    if (status == TW_OK && same_form(now, &w->next))
        status = engine_fail(e, ERROR_UNSUITABLE, "this changes nothing");
    return status == TW_OK ? verify(w) : TW_ERROR;
}

static void drop_frame(manual *m)
{
    frame_clear(&m->frames[--m->count]);
    pass_release(m->moves[m->count - 1].pass);
    derivation_cut(&m->record, m->frames[m->count - 1].steps);
}

tw_status manual_apply(manual *m, const manual_move *move)
{
    work w;
    work_init(&w, m, move);
    if (move->kind == MANUAL_REPEAT_PARTS && move->count > 1) { /* each time is a step of its own */
        size_t before = m->count;
        manual_move once = *move;
        once.count = 1;
        tw_status all = TW_OK;
        for (slong k = 0; k < move->count && all == TW_OK && budget_ok(m->e); k++) {
            once.goes_on = k > 0;
            all = manual_apply(m, &once);
        }
        if (all != TW_OK || m->e->error.kind != ERROR_NONE) {
            while (m->count > before) drop_frame(m);
            work_clear(&w);
            return TW_ERROR;
        }
        work_clear(&w);
        return TW_OK;
    }
    tw_status status = make(&w);
    if (status == TW_OK) {
        if (!w.proved) w.next.tried++;
        size_t number = m->count;
        push_frame(m, &w.next);
        note_facts(m);
        m->moves[number - 1] = *move;
        if (move->pass) pass_hold(move->pass);
        record_move(&w, number);
        m->frames[m->count - 1].steps = m->record.count;
    } else {
        frame_clear(&w.next);
    }
    work_clear(&w);
    return status;
}

bool manual_undo(manual *m)
{
    if (m->count < 2) return false;
    bool more = true;
    while (more && m->count > 1) {
        more = m->moves[m->count - 2].goes_on;
        drop_frame(m);
    }
    return true;
}

manual *manual_replay(tw_engine *e, const manual *m, expr *g)
{
    manual *made = manual_new(e, g);
    if (!made) return NULL;
    manual_terms *mine = &made->frames[0].live;
    const manual_terms *theirs = &m->frames[0].live;
    if (mine->count != theirs->count) {
        engine_fail(e, ERROR_UNSUITABLE, "the derivation begins with %zu integral%s, this has %zu: not the same shape",
                    theirs->count, theirs->count == 1 ? "" : "s", mine->count);
        manual_release(made);
        return NULL;
    }
    for (size_t k = 0; k < mine->count; k++) {
        expr *all[] = {mine->list[k].outside, mine->list[k].integral};
        mine->list[k].name = free_name(e, theirs->list[k].name, all, 2);
    }
    for (size_t k = 0; k + 1 < m->count; k++) {
        if (budget_ok(e) && manual_apply(made, &m->moves[k]) == TW_OK) continue;
        error_kind kind = e->error.kind;
        char *why = base_copy(e->error.words ? e->error.words : "");
        engine_forgive(e);
        engine_fail(e, kind, "move %zu, `%s`, fails here: %s", k + 1, m->moves[k].words, why);
        free(why);
        manual_release(made);
        return NULL;
    }
    return made;
}

/* ---- questions ---- */

bool manual_has_variable(const manual *m, expr *symbol)
{
    const manual_frame *now = manual_now(m);
    for (size_t k = 0; k < now->live.count; k++)
        if (strcmp(now->live.list[k].name, symbol->is.name) == 0) return true;
    for (size_t k = 0; k < now->split_off.count; k++)
        if (strcmp(now->split_off.list[k].name, symbol->is.name) == 0) return true;
    return false;
}

expr *manual_value(const manual *m)
{
    return frame_value(m->e, manual_now(m));
}

/* Signs and convergence are decided from all facts, granted ones among them, without saying which were needed: so a
 * granted fact about a symbol of the integral counts as needed. */
static void add_granted(const manual *m, condition_list *out)
{
    for (size_t k = 0; k < m->fact_count; k++) {
        if (m->fact_labels[k] != CONDITION_GRANTED) continue;
        expr **symbols;
        size_t n = expr_symbols(m->facts[k], &symbols);
        bool speaks = false;
        for (size_t j = 0; j < n; j++) speaks = speaks || expr_has(m->typed, symbols[j]);
        free(symbols);
        char *words = speaks ? expr_text(m->e, m->facts[k]) : NULL;
        if (words) conditions_add(out, words, m->facts[k], CONDITION_GRANTED);
        free(words);
    }
}

void manual_conditions(const manual *m, condition_list *out)
{
    conditions_add(out, CONVERGES, NULL,
                   manual_now(m)->converges ? CONDITION_PROVED : CONDITION_OPEN);
    for (size_t k = 0; k < m->record.count; k++) conditions_append(out, &m->record.steps[k].conditions);
    add_granted(m, out);
}

bool manual_is_proved(const manual *m)
{
    condition_list all;
    conditions_init(&all);
    manual_conditions(m, &all);
    bool sure = conditions_all_sure(&all) && manual_now(m)->tried == 0;
    conditions_clear(&all);
    return sure;
}

/* ---- printing ---- */

static void print_integral(tw_engine *e, text *out, const manual_term *t)
{
    if (t->integral->kind != EXPR_INTEGRAL) {
        expr_print(e, out, t->integral);
        return;
    }
    expr *body = expr_open(e, t->integral, expr_symbol(e, t->name));
    text_add(out, "integral from ");
    expr_print(e, out, t->integral->args[0]);
    text_add(out, " to ");
    expr_print(e, out, t->integral->args[1]);
    text_add(out, " of ");
    if (body) expr_print(e, out, body);
    text_addf(out, " d%s", t->name);
}

/* The sign, and the term without it. */
static void print_term(tw_engine *e, text *out, const manual_term *t, bool first)
{
    expr *outside = t->outside;
    fmpq_t c;
    expr *rest;
    fmpq_init(c);
    expr_as_coefficient(e, outside, c, &rest);
    bool minus = fmpq_sgn(c) < 0;
    fmpq_clear(c);
    if (minus) outside = expr_neg(e, outside);
    text_add(out, first ? (minus ? "-" : "") : minus ? " - " : " + ");
    if (outside && !expr_is_one(outside)) {
        bool sum = outside->kind == EXPR_SUM;
        if (sum) text_add_char(out, '(');
        expr_print(e, out, outside);
        text_add(out, sum ? ")*" : "*");
    }
    print_integral(e, out, t);
}

static void print_terms(tw_engine *e, text *out, const manual_terms *t, bool first)
{
    for (size_t k = 0; k < t->count; k++) {
        print_term(e, out, &t->list[k], first);
        first = false;
    }
}

void manual_print_form(const manual *m, text *out)
{
    const manual_frame *now = manual_now(m);
    bool plain = !expr_is_zero(now->plain) || now->live.count == 0;
    if (plain) expr_print(m->e, out, now->plain);
    print_terms(m->e, out, &now->live, !plain);
}

void manual_print_remainders(const manual *m, text *out)
{
    print_terms(m->e, out, &manual_now(m)->split_off, true);
}

void manual_print_term(const manual *m, size_t k, text *out)
{
    const manual_frame *now = manual_now(m);
    if (k < now->live.count) print_term(m->e, out, &now->live.list[k], true);
    else print_term(m->e, out, &now->split_off.list[k - now->live.count], true);
}
