/* Facts about symbols: what was given, what was granted, which parameter is large. Knows intervals with rational ends
 * and nothing deeper; conditions are decided in engine/ball. Its one idea: when a fact is stored, the bound that it
 * sets for a symbol alone is worked out once, so that questions only compare rational numbers. */
#include "engine/expr/facts.h"

#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"

typedef struct fact {
    expr *condition;
    condition_label label;
    expr *symbol; /* the only symbol of a linear condition, or NULL */
    int bits;     /* as facts_interval */
    fmpq_t lower, upper;
} fact;

struct facts {
    size_t count, room;
    fact *list;
    large_kind large;
    expr *large_symbol, *arg_from, *arg_to;
};

enum { HAS_LOWER = 1, HAS_UPPER = 2, OPEN_LOWER = 4, OPEN_UPPER = 8 };

const char *condition_label_word(condition_label l)
{
    static const char *const words[] = {"given", "proved", "granted", "open"};
    return words[l];
}

void facts_init(tw_engine *e)
{
    struct facts *f = base_alloc(sizeof *f);
    *f = (struct facts){0};
    e->facts = f;
}

static void fact_clear(fact *f)
{
    fmpq_clear(f->lower);
    fmpq_clear(f->upper);
}

static void list_free(struct facts *f)
{
    if (!f)
        return;
    for (size_t k = 0; k < f->count; k++)
        fact_clear(&f->list[k]);
    free(f->list);
    free(f);
}

void facts_clear(tw_engine *e)
{
    list_free(e->facts);
    e->facts = NULL;
}

struct facts *facts_copy(tw_engine *e)
{
    struct facts *f = base_alloc(sizeof *f);
    *f = *e->facts;
    f->room = f->count;
    f->list = f->count ? base_alloc(f->count * sizeof *f->list) : NULL;
    for (size_t k = 0; k < f->count; k++) {
        f->list[k] = e->facts->list[k];
        fmpq_init(f->list[k].lower);
        fmpq_init(f->list[k].upper);
        fmpq_set(f->list[k].lower, e->facts->list[k].lower);
        fmpq_set(f->list[k].upper, e->facts->list[k].upper);
    }
    return f;
}

void facts_restore(tw_engine *e, struct facts *copy)
{
    list_free(e->facts);
    e->facts = copy;
}

void facts_discard(struct facts *copy)
{
    list_free(copy);
}

/* ---- intervals ---- */

/* Narrows one end. side: HAS_LOWER or HAS_UPPER; open: is the end itself excluded? */
static void interval_meet(int *bits, fmpq_t lower, fmpq_t upper, int side, const fmpq_t end, bool open)
{
    fmpq *own = side == HAS_LOWER ? lower : upper;
    const int mark = side == HAS_LOWER ? OPEN_LOWER : OPEN_UPPER;
    int order = *bits & side ? fmpq_cmp(end, own) : side == HAS_LOWER ? 1 : -1;
    if (side == HAS_UPPER)
        order = -order;
    if (order < 0)
        return;
    if (order > 0) {
        fmpq_set(own, end);
        *bits &= ~mark;
    }
    *bits |= side | (open ? mark : 0);
}

static bool interval_is_empty(int bits, const fmpq_t lower, const fmpq_t upper)
{
    if ((bits & 3) != 3)
        return false;
    const int order = fmpq_cmp(lower, upper);
    return order > 0 || (order == 0 && (bits & (OPEN_LOWER | OPEN_UPPER)));
}

/* For an integer symbol the ends move to the next integers inside. */
static void interval_round(int *bits, fmpq_t lower, fmpq_t upper)
{
    fmpz_t whole;
    fmpz_init(whole);
    if (*bits & HAS_LOWER) {
        if (*bits & OPEN_LOWER) {
            fmpz_fdiv_q(whole, fmpq_numref(lower), fmpq_denref(lower));
            fmpz_add_ui(whole, whole, 1);
        } else {
            fmpz_cdiv_q(whole, fmpq_numref(lower), fmpq_denref(lower));
        }
        fmpq_set_fmpz(lower, whole);
    }
    if (*bits & HAS_UPPER) {
        if (*bits & OPEN_UPPER) {
            fmpz_cdiv_q(whole, fmpq_numref(upper), fmpq_denref(upper));
            fmpz_sub_ui(whole, whole, 1);
        } else {
            fmpz_fdiv_q(whole, fmpq_numref(upper), fmpq_denref(upper));
        }
        fmpq_set_fmpz(upper, whole);
    }
    *bits &= HAS_LOWER | HAS_UPPER;
    fmpz_clear(whole);
}

/* A rational at or below (above) the closed value; *exact when it is the value. */
static bool constant_bound(expr *a, bool below, fmpq_t end, bool *exact)
{
    *exact = a->kind == EXPR_NUMBER;
    if (*exact) {
        fmpq_set(end, &a->is.number);
        return true;
    }
    arb_t value;
    arf_t edge;
    arb_init(value);
    arf_init(edge);
    bool ok = a->names == 0 && a->loose == 0 && expr_enclose_constant(a, value, 128) && arb_is_finite(value);
    if (ok) {
        if (below)
            arb_get_lbound_arf(edge, value, 128);
        else
            arb_get_ubound_arf(edge, value, 128);
        ok = arf_cmpabs_2exp_si(edge, 1000) < 0 && (arf_is_zero(edge) || arf_cmpabs_2exp_si(edge, -1000) > 0);
    }
    if (ok)
        arf_get_fmpq(end, edge);
    arb_clear(value);
    arf_clear(edge);
    return ok;
}

/* The one symbol of the condition, or NULL. */
static expr *only_symbol(tw_engine *e, expr *condition)
{
    const arena_place mark = arena_mark(&e->scratch);
    expr **symbols;
    expr *symbol = node_symbols(e, condition, &symbols) == 1 ? symbols[0] : NULL;
    arena_release(&e->scratch, mark);
    return symbol;
}

/* Where the linear f vanishes, and whether it rises there; NULL with no error when f is not linear with a rational
 * slope. */
static expr *linear_root(tw_engine *e, expr *f, expr *symbol, bool *rising)
{
    expr **c;
    slong degree;
    if (expr_polynomial(e, f, symbol, 1, &c, &degree) != TW_OK)
        return NULL;
    expr *constant = c[0], *slope = degree == 1 ? c[1] : NULL;
    free(c);
    if (!slope || slope->kind != EXPR_NUMBER)
        return NULL;
    *rising = fmpq_sgn(&slope->is.number) > 0;
    return expr_neg(e, expr_div(e, constant, slope));
}

/* What the condition says of its only symbol, if it is linear in it: sets symbol, bits and ends of f. */
static tw_status fact_analyse(tw_engine *e, fact *f)
{
    const expr_relation r = f->condition->is.relation;
    expr *symbol = only_symbol(e, f->condition);
    if (!symbol || r > RELATION_EQUAL)
        return TW_OK;
    bool rising = false;
    expr *difference = expr_sub(e, f->condition->args[1], f->condition->args[0]); /* 0 < difference */
    if (!difference && e->error.kind == ERROR_VALUE)
        engine_forgive(e); /* inf - inf and the like tell nothing */
    expr *root = difference ? linear_root(e, difference, symbol, &rising) : NULL;
    if (!root)
        return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    f->symbol = symbol;
    for (int side = HAS_LOWER; side <= HAS_UPPER; side++) {
        bool exact;
        fmpq_t end;
        if (r != RELATION_EQUAL && rising != (side == HAS_LOWER))
            continue;
        fmpq_init(end);
        if (constant_bound(root, side == HAS_LOWER, end, &exact))
            interval_meet(&f->bits, f->lower, f->upper, side, end, r == RELATION_LESS || !exact);
        fmpq_clear(end);
    }
    return TW_OK;
}

static int interval_of(tw_engine *e, expr *symbol, bool given_only, fmpq_t lower, fmpq_t upper)
{
    const struct facts *f = e->facts;
    int bits = 0;
    if (facts_is_complex(e, symbol))
        return 0;
    if (f->large != LARGE_NONE && f->large_symbol == symbol) {
        fmpq_zero(lower);
        bits = HAS_LOWER | OPEN_LOWER;
    }
    for (size_t k = 0; k < f->count; k++) {
        const fact *one = &f->list[k];
        if (one->symbol != symbol || (given_only && one->label != CONDITION_GIVEN))
            continue;
        if (one->bits & HAS_LOWER)
            interval_meet(&bits, lower, upper, HAS_LOWER, one->lower, one->bits & OPEN_LOWER);
        if (one->bits & HAS_UPPER)
            interval_meet(&bits, lower, upper, HAS_UPPER, one->upper, one->bits & OPEN_UPPER);
    }
    if (bits && facts_is_integer(e, symbol))
        interval_round(&bits, lower, upper);
    return bits;
}

int facts_interval(tw_engine *e, expr *symbol, fmpq_t lower, fmpq_t upper)
{
    return interval_of(e, symbol, false, lower, upper);
}

bool facts_symbol_is_positive(tw_engine *e, expr *symbol)
{
    fmpq_t lower, upper;
    fmpq_init(lower);
    fmpq_init(upper);
    const int bits = interval_of(e, symbol, true, lower, upper);
    const bool positive = (bits & HAS_LOWER) && (fmpq_sgn(lower) > 0 || (fmpq_sgn(lower) == 0 && (bits & OPEN_LOWER)));
    fmpq_clear(lower);
    fmpq_clear(upper);
    return positive;
}

static bool symbol_is_impossible(tw_engine *e, expr *symbol)
{
    fmpq_t lower, upper;
    fmpq_init(lower);
    fmpq_init(upper);
    const bool empty = interval_is_empty(facts_interval(e, symbol, lower, upper), lower, upper);
    fmpq_clear(lower);
    fmpq_clear(upper);
    return empty;
}

/* ---- kinds ---- */

static bool has_kind(tw_engine *e, expr *symbol, expr_relation kind)
{
    const struct facts *f = e->facts;
    for (size_t k = 0; k < f->count; k++)
        if (f->list[k].condition->is.relation == kind && f->list[k].condition->args[0] == symbol)
            return true;
    return false;
}

bool facts_is_complex(tw_engine *e, expr *symbol)
{
    return has_kind(e, symbol, RELATION_COMPLEX);
}

bool facts_is_integer(tw_engine *e, expr *symbol)
{
    return has_kind(e, symbol, RELATION_INTEGER) ||
           (e->facts->large == LARGE_INTEGER && e->facts->large_symbol == symbol);
}

/* ---- adding ---- */

/* Do a and b exclude each other by their form? */
static bool relations_exclude(expr *a, expr *b)
{
    const expr_relation r = a->is.relation, q = b->is.relation;
    const bool same = a->args[0] == b->args[0] && a->args[1] == b->args[1];
    const bool turned = a->args[0] == b->args[1] && a->args[1] == b->args[0];
    if (r >= RELATION_INTEGER || q >= RELATION_INTEGER) {
        const bool narrow_r = r == RELATION_INTEGER || r == RELATION_REAL;
        const bool narrow_q = q == RELATION_INTEGER || q == RELATION_REAL;
        return a->args[0] == b->args[0] && ((r == RELATION_COMPLEX && narrow_q) || (q == RELATION_COMPLEX && narrow_r));
    }
    if (turned && (r == RELATION_LESS || q == RELATION_LESS) && r <= RELATION_LESS_EQUAL && q <= RELATION_LESS_EQUAL)
        return true;
    if (!same && !turned)
        return false;
    return (r == RELATION_EQUAL && (q == RELATION_LESS || q == RELATION_NOT_EQUAL)) ||
           (q == RELATION_EQUAL && (r == RELATION_LESS || r == RELATION_NOT_EQUAL));
}

/* False by its form alone: 1 < 0, a < a, 1/2 integer. */
static bool relation_is_false(expr *a)
{
    expr *left = a->args[0], *right = a->args[1];
    const expr_relation r = a->is.relation;
    if (left->kind == EXPR_NUMBER && r == RELATION_INTEGER)
        return !fmpz_is_one(fmpq_denref(&left->is.number));
    if (left == right)
        return r == RELATION_LESS || r == RELATION_NOT_EQUAL;
    if (left->kind != EXPR_NUMBER || right->kind != EXPR_NUMBER)
        return false;
    const int order = fmpq_cmp(&left->is.number, &right->is.number);
    return r == RELATION_EQUAL || (r <= RELATION_LESS_EQUAL && order > 0);
}

static tw_status fail_contradiction(tw_engine *e, expr *condition, expr *known)
{
    const arena_place mark = arena_mark(&e->scratch);
    const char *words = node_text(e, condition);
    engine_fail(e, ERROR_VALUE, "%s contradicts %s", words, known ? node_text(e, known) : "what is known");
    arena_release(&e->scratch, mark);
    return TW_ERROR;
}

/* An order between values that are not real means nothing. */
static tw_status check_order_of_complex(tw_engine *e, expr *condition)
{
    const struct facts *f = e->facts;
    const expr_relation r = condition->is.relation;
    for (size_t side = 0; r <= RELATION_LESS_EQUAL && side < 2; side++)
        if (condition->args[side]->kind == EXPR_SYMBOL && facts_is_complex(e, condition->args[side]))
            return engine_fail(e, ERROR_VALUE, "%s is complex and has no order", condition->args[side]->is.name);
    expr *symbol = condition->args[0];
    if (r != RELATION_COMPLEX)
        return TW_OK;
    if (f->large != LARGE_NONE && f->large_symbol == symbol)
        return engine_fail(e, ERROR_VALUE, "%s is the large or small parameter and real", symbol->is.name);
    for (size_t k = 0; k < f->count; k++)
        if (f->list[k].condition->is.relation <= RELATION_LESS_EQUAL &&
            (f->list[k].condition->args[0] == symbol || f->list[k].condition->args[1] == symbol))
            return fail_contradiction(e, condition, f->list[k].condition);
    return TW_OK;
}

static void fact_remove(struct facts *f, size_t k)
{
    fact_clear(&f->list[k]);
    memmove(f->list + k, f->list + k + 1, (f->count - k - 1) * sizeof *f->list);
    f->count--;
}

static tw_status facts_append(tw_engine *e, expr *condition, condition_label label)
{
    struct facts *f = e->facts;
    if (f->count == f->room) {
        const size_t room = f->room * 2 + 4;
        f->list = base_resize(f->list, room * sizeof *f->list);
        f->room = room;
    }
    fact *new = &f->list[f->count];
    *new = (fact){.condition = condition, .label = label};
    fmpq_init(new->lower);
    fmpq_init(new->upper);
    if (fact_analyse(e, new) != TW_OK) {
        fact_clear(new);
        return TW_ERROR;
    }
    f->count++;
    return TW_OK;
}

tw_status facts_add(tw_engine *e, expr *condition, condition_label label)
{
    struct facts *f = e->facts;
    if (!condition)
        return TW_ERROR;
    if (condition->kind != EXPR_RELATION)
        return engine_fail(e, ERROR_VALUE, "a fact must be a condition");
    if (relation_is_false(condition))
        return fail_contradiction(e, condition, NULL);
    for (size_t k = 0; k < f->count; k++) {
        if (f->list[k].condition == condition) { /* known; given outranks granted */
            if (label == CONDITION_GIVEN)
                f->list[k].label = label;
            return TW_OK;
        }
        if (relations_exclude(condition, f->list[k].condition))
            return fail_contradiction(e, condition, f->list[k].condition);
    }
    if (check_order_of_complex(e, condition) != TW_OK || facts_append(e, condition, label) != TW_OK)
        return TW_ERROR;
    expr *symbol = f->list[f->count - 1].symbol;
    if (condition->is.relation == RELATION_INTEGER && condition->args[0]->kind == EXPR_SYMBOL)
        symbol = condition->args[0];
    if (!symbol || !symbol_is_impossible(e, symbol))
        return TW_OK;
    fact_remove(f, f->count - 1);
    return fail_contradiction(e, condition, NULL);
}

tw_status facts_set_large(tw_engine *e, expr *symbol, large_kind kind, expr *arg_from, expr *arg_to)
{
    struct facts *f = e->facts;
    const struct facts before = *f;
    if (!symbol)
        return TW_ERROR;
    if (symbol->kind != EXPR_SYMBOL)
        return engine_fail(e, ERROR_VALUE, "the large or small parameter must be a name");
    if (facts_is_complex(e, symbol))
        return engine_fail(e, ERROR_VALUE, "%s is declared complex", symbol->is.name);
    f->large = kind;
    f->large_symbol = symbol;
    f->arg_from = arg_from;
    f->arg_to = arg_to;
    if (!symbol_is_impossible(e, symbol))
        return TW_OK;
    f->large = before.large;
    f->large_symbol = before.large_symbol;
    f->arg_from = before.arg_from;
    f->arg_to = before.arg_to;
    return engine_fail(e, ERROR_VALUE, "%s > 0 contradicts what is known", symbol->is.name);
}

large_kind facts_large(tw_engine *e, expr **symbol)
{
    if (e->facts->large != LARGE_NONE && symbol)
        *symbol = e->facts->large_symbol;
    return e->facts->large;
}

bool facts_sector(tw_engine *e, expr **arg_from, expr **arg_to)
{
    *arg_from = e->facts->arg_from;
    *arg_to = e->facts->arg_to;
    return *arg_from && *arg_to;
}

size_t facts_count(tw_engine *e)
{
    return e->facts->count;
}

expr *facts_at(tw_engine *e, size_t k, condition_label *label)
{
    if (label)
        *label = e->facts->list[k].label;
    return e->facts->list[k].condition;
}

void facts_forget(tw_engine *e, expr *symbol)
{
    struct facts *f = e->facts;
    for (size_t k = f->count; k-- > 0;)
        if (expr_has(f->list[k].condition, symbol))
            fact_remove(f, k);
}
