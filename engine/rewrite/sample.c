/* Samples for the checking of rules. Knows rules and facts, nothing of balls or verdicts. Its one idea: each variable
 * has a deck of proposals, made from what its conditions say of it alone (its interval, whether it is an integer,
 * complex), in which the corners lie where wrong rules fail: close to both ends, at closed ends, negative values,
 * whole numbers and fractions, small and large ones, all quadrants and both axes. Decks are shuffled and dealt, so every corner has its turn; a
 * deal that breaks a condition is dealt again. */
#include "engine/rewrite/sample.h"

#include <stdlib.h>
#include <string.h>

#include "engine/expr/node.h"
#include "engine/rewrite/condition.h"

/* Deals that are thrown away before a sample is given up. */
enum { DEAL_LIMIT = 600, DECK_LIMIT = 40 };

typedef struct deck {
    expr *symbol;
    size_t arity;              /* > 0: a pattern function */
    expr **parameters;
    size_t count, at;
    expr *cards[DECK_LIMIT];   /* values; of functions bodies in the parameters */
} deck;

struct sampler {
    tw_engine *e;
    const rule *r;
    uint64_t state;
    size_t count;
    deck *decks;
    pattern_variable *variables;
    expr **values;
    expr ***parameters;
};

/* ---- random numbers: splitmix64 ---- */

static uint64_t random_next(sampler *s)
{
    uint64_t z = s->state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

static slong random_below(sampler *s, slong n)
{
    return (slong)(random_next(s) % (uint64_t)n);
}

/* ---- what is known of a variable alone ---- */

typedef struct range {
    bool integer, complex, has_low, has_high, open_low, open_high, may_be_infinite;
    fmpq_t low, high;
} range;

static void range_read(sampler *s, range *g, expr *symbol)
{
    fmpq_init(g->low);
    fmpq_init(g->high);
    const int bits = facts_interval(s->e, symbol, g->low, g->high);
    g->integer = facts_is_integer(s->e, symbol);
    g->complex = facts_is_complex(s->e, symbol);
    g->has_low = bits & 1;
    g->has_high = bits & 2;
    g->open_low = bits & 4;
    g->open_high = bits & 8;
    g->may_be_infinite = false;
}

static void range_clear(range *g)
{
    fmpq_clear(g->low);
    fmpq_clear(g->high);
}

/* Is the symbol the end of an integral in a? Upper and lower ends count as bits 1 and 2. */
static int ends_of(expr *a, expr *symbol)
{
    int ends = 0;
    if (a->kind == EXPR_INTEGRAL) ends = (a->args[1] == symbol) + 2 * (a->args[0] == symbol);
    for (size_t k = 0; k < a->count; k++) ends |= ends_of(a->args[k], symbol);
    return ends;
}

/* ---- decks ---- */

static void deck_put(deck *d, expr *card)
{
    for (size_t k = 0; k < d->count; k++)
        if (d->cards[k] == card) return;
    if (card && d->count < DECK_LIMIT) d->cards[d->count++] = card;
}

/* p/q, |p| <= top, q <= bottom. Drawn one after the other: arguments are evaluated in any order, and samples shall not
 * depend on the compiler. */
static expr *random_fraction(sampler *s, slong top, slong bottom)
{
    const slong p = random_below(s, 2 * top + 1) - top;
    return expr_frac(s->e, p, 1 + random_below(s, bottom));
}

/* low + p/q, or high - p/q. */
static void put_beside(sampler *s, deck *d, const fmpq_t end, slong p, slong q, bool integer)
{
    expr *by = integer ? expr_int(s->e, (p + (q > 0 ? q : -q) - 1) / q) : expr_frac(s->e, p, q);
    deck_put(d, expr_add(s->e, expr_fmpq(s->e, end), by));
}

/* Distances from an end, small ones first. */
static const slong steps[][2] = {{1, 400}, {1, 50}, {1, 8}, {1, 3}, {1, 2}, {2, 3}, {1, 1}, {3, 2}, {2, 1}, {7, 3}, {3, 1}, {9, 2},
                                 {6, 1}, {31, 3}};
enum { STEP_COUNT = sizeof steps / sizeof *steps };

static void put_half_line(sampler *s, deck *d, const range *g)
{
    const slong sign = g->has_low ? 1 : -1;
    const fmpq *end = g->has_low ? g->low : g->high;
    if (!(g->has_low ? g->open_low : g->open_high)) deck_put(d, expr_fmpq(s->e, end));
    for (size_t k = 0; k < STEP_COUNT; k++) put_beside(s, d, end, sign * steps[k][0], steps[k][1], false);
    deck_put(d, expr_mul(s->e, expr_frac(s->e, 1, 2), expr_fmpq(s->e, end))); /* the corner at 0, when it lies inside */
    if (fmpq_sgn(end) * sign < 0) deck_put(d, expr_int(s->e, 0));
    for (int k = 0; k < 3; k++) {
        const slong p = 1 + random_below(s, 40), q = 1 + random_below(s, 9);
        put_beside(s, d, end, sign * p, q, false);
    }
}

static void put_between(sampler *s, deck *d, const range *g)
{
    static const slong parts[][2] = {{1, 2}, {1, 3}, {3, 4}, {1, 50}, {49, 50}, {1, 8}, {7, 8}, {2, 5}, {2, 3}, {1, 5}};
    expr *low = expr_fmpq(s->e, g->low), *width = expr_sub(s->e, expr_fmpq(s->e, g->high), low);
    if (!g->open_low) deck_put(d, low);
    if (!g->open_high) deck_put(d, expr_fmpq(s->e, g->high));
    for (size_t k = 0; k < sizeof parts / sizeof *parts; k++)
        deck_put(d, expr_add(s->e, low, expr_mul(s->e, width, expr_frac(s->e, parts[k][0], parts[k][1]))));
    for (int k = 0; k < 4; k++)
        deck_put(d, expr_add(s->e, low, expr_mul(s->e, width, expr_frac(s->e, 1 + random_below(s, 96), 97))));
}

static void put_line(sampler *s, deck *d)
{
    for (size_t k = 1; k < STEP_COUNT; k++)
        for (slong sign = -1; sign <= 1; sign += 2) deck_put(d, expr_frac(s->e, sign * steps[k][0], steps[k][1]));
    deck_put(d, expr_int(s->e, 0));
    for (int k = 0; k < 4; k++) deck_put(d, random_fraction(s, 20, 9));
}

static void put_integers(sampler *s, deck *d, const range *g)
{
    fmpz_t from;
    fmpz_init(from);
    slong sign = 1;
    if (g->has_low) {
        fmpz_cdiv_q(from, fmpq_numref(g->low), fmpq_denref(g->low));
    } else if (g->has_high) {
        fmpz_fdiv_q(from, fmpq_numref(g->high), fmpq_denref(g->high));
        sign = -1;
    }
    static const slong wholes[] = {0, 1, 2, 3, 4, 5, 6, 7, 9, 12};
    for (size_t k = 0; k < sizeof wholes / sizeof *wholes; k++) {
        expr *start = expr_fmpz(s->e, from);
        deck_put(d, expr_add(s->e, start, expr_int(s->e, sign * wholes[k])));
        if (!g->has_low && !g->has_high) deck_put(d, expr_int(s->e, -wholes[k]));
    }
    fmpz_clear(from);
}

static void put_complex(sampler *s, deck *d)
{
    static const slong corners[][4] = {{1, 1, 1, 1}, {-1, 1, 1, 2}, {-3, 2, -2, 1}, {2, 1, -1, 3}, {0, 1, 3, 2}, {0, 1, -1, 1},
                                       {-2, 1, 0, 1}, {3, 1, 0, 1}, {1, 3, 4, 1}, {-1, 4, -5, 2}, {-4, 1, 1, 5}, {5, 2, 3, 1},
                                       {1, 2, 0, 1}, {-7, 2, -1, 7}, {1, 5, -3, 1}, {4, 1, -2, 3}};
    expr *i = expr_constant_of(s->e, CONSTANT_I);
    for (size_t k = 0; k < sizeof corners / sizeof *corners; k++) {
        const slong *c = corners[k];
        deck_put(d, expr_add(s->e, expr_frac(s->e, c[0], c[1]), expr_mul(s->e, i, expr_frac(s->e, c[2], c[3]))));
    }
    for (int k = 0; k < 6; k++) {
        expr *re = random_fraction(s, 16, 7), *im = random_fraction(s, 16, 7);
        deck_put(d, expr_add(s->e, re, expr_mul(s->e, i, im)));
    }
}

static void deck_values(sampler *s, deck *d)
{
    range g;
    range_read(s, &g, d->symbol);
    const int ends = ends_of(s->r->left, d->symbol);
    if (g.complex) put_complex(s, d);
    else if (g.integer) put_integers(s, d, &g);
    else if (g.has_low && g.has_high) put_between(s, d, &g);
    else if (g.has_low || g.has_high) put_half_line(s, d, &g);
    else put_line(s, d);
    expr *inf = expr_constant_of(s->e, CONSTANT_INF);
    for (int k = 0; k < 2 && !g.complex && !g.integer; k++) { /* several times, so that ends meet */
        if ((ends & 1) && !g.has_high && d->count < DECK_LIMIT) d->cards[d->count++] = inf;
        if ((ends & 2) && !g.has_low && d->count < DECK_LIMIT) d->cards[d->count++] = expr_neg(s->e, inf);
    }
    range_clear(&g);
}

/* ---- functions ---- */

/* Where the integrals reach in which the function stands: 1: to inf, 2: from -inf; also through variables that may be
 * infinite. */
static int reach_of(const rule *r, expr *a, expr *f)
{
    int reach = 0;
    if (a->kind == EXPR_CONTOUR && expr_has(a, f)) reach = 3;
    if (a->kind == EXPR_INTEGRAL && expr_has(a->args[2], f)) {
        const bool from_symbol = a->args[0]->kind == EXPR_SYMBOL, to_symbol = a->args[1]->kind == EXPR_SYMBOL;
        if (expr_is_inf(a->args[1]) || expr_is_inf(a->args[0]) || to_symbol) reach |= 1;
        if (expr_is_minus_inf(a->args[0]) || expr_is_minus_inf(a->args[1]) || from_symbol) reach |= 2;
    }
    for (size_t k = 0; k < a->count; k++) reach |= reach_of(r, a->args[k], f);
    return reach;
}

typedef struct maker {
    tw_engine *e;
    expr *x;
} maker;

static expr *num(const maker *m, slong p, slong q)
{
    return expr_frac(m->e, p, q);
}

static expr *call(const maker *m, function_id f, expr *a)
{
    return expr_call1(m->e, f, a);
}

static expr *square(const maker *m)
{
    return expr_pow(m->e, m->x, expr_int(m->e, 2));
}

/* exp(-p/q*x^2) */
static expr *bell(const maker *m, slong p, slong q)
{
    return call(m, FUNCTION_EXP, expr_mul(m->e, num(m, -p, q), square(m)));
}

/* (1 + x^2)^-n */
static expr *hill(const maker *m, slong n)
{
    return expr_pow(m->e, expr_add(m->e, num(m, 1, 1), square(m)), expr_int(m->e, -n));
}

/* a + b*x */
static expr *line(const maker *m, slong a, slong b)
{
    return expr_add(m->e, num(m, a, 1), expr_mul(m->e, num(m, b, 1), m->x));
}

static expr *times(const maker *m, expr *a, expr *b)
{
    return expr_mul(m->e, a, b);
}

/* Smooth functions that are integrable over the whole line with all their derivatives. */
static void put_integrable(sampler *s, deck *d, const maker *m)
{
    tw_engine *e = m->e;
    deck_put(d, bell(m, 1, 1));
    deck_put(d, times(m, line(m, 2, -1), bell(m, 1, 2)));
    deck_put(d, hill(m, 1));
    deck_put(d, times(m, m->x, bell(m, 1, 1)));
    deck_put(d, times(m, line(m, 1, 3), hill(m, 2)));
    deck_put(d, times(m, call(m, FUNCTION_COS, times(m, num(m, 3, 1), m->x)), bell(m, 1, 2)));
    deck_put(d, expr_pow(e, call(m, FUNCTION_COSH, m->x), num(m, -1, 1)));
    deck_put(d, times(m, num(m, -2, 1), hill(m, 2)));
    deck_put(d, times(m, call(m, FUNCTION_EXP, times(m, expr_constant_of(e, CONSTANT_I), m->x)), bell(m, 2, 1)));
    deck_put(d, times(m, expr_sqrt(e, expr_add(e, num(m, 4, 1), square(m))), bell(m, 1, 3)));
    deck_put(d, times(m, square(m), bell(m, 2, 1)));
    (void)s;
}

/* On (a, inf) and on finite ranges. */
static void put_right(deck *d, const maker *m)
{
    deck_put(d, call(m, FUNCTION_EXP, times(m, num(m, -1, 1), m->x)));
    deck_put(d, times(m, line(m, 3, 1), call(m, FUNCTION_EXP, times(m, num(m, -2, 1), m->x))));
}

static void put_bounded(deck *d, const maker *m)
{
    deck_put(d, expr_add(m->e, num(m, 1, 1), square(m)));
    deck_put(d, call(m, FUNCTION_EXP, times(m, num(m, 1, 2), m->x)));
    deck_put(d, call(m, FUNCTION_SIN, times(m, num(m, 2, 1), m->x)));
    deck_put(d, line(m, -1, 2));
    deck_put(d, num(m, 1, 1));
}

/* Of several arguments: a function of one that decays, times another of the sum of all, so that no product splits. */
static expr *with_others(sampler *s, const deck *d, expr *card)
{
    for (size_t k = 1; k < d->arity && card; k++) {
        expr *y = d->parameters[k], *sum = expr_add(s->e, d->parameters[0], y);
        expr *square_y = expr_pow(s->e, y, expr_int(s->e, 2));
        expr *bump = expr_add(s->e, expr_int(s->e, 2), expr_call1(s->e, FUNCTION_COS, sum));
        expr *const parts[3] = {card, bump, expr_call1(s->e, FUNCTION_EXP, expr_neg(s->e, square_y))};
        card = expr_product(s->e, parts, 3);
    }
    return card;
}

static void deck_functions(sampler *s, deck *d)
{
    const int reach = reach_of(s->r, s->r->left, d->symbol) | reach_of(s->r, s->r->right, d->symbol);
    const maker m = {s->e, d->parameters[0]};
    put_integrable(s, d, &m);
    if (!(reach & 2)) put_right(d, &m);
    if (!reach) put_bounded(d, &m);
    for (size_t k = 0; k < d->count; k++) d->cards[k] = with_others(s, d, d->cards[k]);
}

/* ---- the sampler ---- */

static void add_deck(sampler *s, expr *symbol, size_t arity, expr *const *parameters)
{
    for (size_t k = 0; k < s->count; k++)
        if (s->decks[k].symbol == symbol) return;
    s->decks = base_resize(s->decks, (s->count + 1) * sizeof *s->decks);
    s->decks[s->count] = (deck){.symbol = symbol, .arity = arity};
    if (arity) s->decks[s->count].parameters = (expr **)parameters;
    s->count++;
}

/* Is it the argument that a pattern function is written with in a condition: f(x) > 0 for all x? */
static bool is_argument(const rule *r, expr *symbol)
{
    return symbol->fresh && !expr_has(r->left, symbol) && !expr_has(r->right, symbol);
}

static void add_symbols(sampler *s, expr *a)
{
    expr **symbols;
    const size_t n = expr_symbols(a, &symbols);
    for (size_t k = 0; k < n; k++)
        if (!is_argument(s->r, symbols[k])) add_deck(s, symbols[k], 0, NULL);
    free(symbols);
}

static void fill_decks(sampler *s)
{
    const pattern_variable *list;
    const size_t n = pattern_variables(s->r->pattern, &list);
    for (size_t k = 0; k < n; k++) add_deck(s, list[k].symbol, list[k].arity, pattern_parameters(s->r->pattern, k));
    add_symbols(s, s->r->left);
    add_symbols(s, s->r->right);
    for (size_t k = 0; k < s->r->condition_count; k++) add_symbols(s, s->r->conditions[k]);
    for (size_t k = 0; k < s->count; k++) {
        if (s->decks[k].arity) deck_functions(s, &s->decks[k]);
        else deck_values(s, &s->decks[k]);
        s->decks[k].at = s->decks[k].count;
    }
}

sampler *sampler_new(tw_engine *e, const rule *r, uint64_t seed)
{
    sampler *s = base_alloc(sizeof *s);
    memset(s, 0, sizeof *s);
    s->e = e;
    s->r = r;
    s->state = seed;
    struct facts *before = facts_copy(e);
    for (size_t k = 0; k < r->condition_count; k++)
        if (facts_add(e, r->conditions[k], CONDITION_GIVEN) != TW_OK && e->error.kind == ERROR_VALUE) engine_forgive(e);
    fill_decks(s);
    facts_restore(e, before);
    s->variables = base_alloc((s->count + 1) * sizeof *s->variables);
    s->values = base_alloc((s->count + 1) * sizeof *s->values);
    s->parameters = base_alloc((s->count + 1) * sizeof *s->parameters);
    for (size_t k = 0; k < s->count; k++) {
        s->variables[k] = (pattern_variable){s->decks[k].symbol, s->decks[k].arity};
        s->parameters[k] = s->decks[k].parameters;
        s->values[k] = NULL;
    }
    return s;
}

void sampler_free(sampler *s)
{
    if (!s) return;
    free(s->decks);
    free(s->variables);
    free(s->values);
    free(s->parameters);
    free(s);
}

static expr *deal(sampler *s, deck *d)
{
    if (d->at >= d->count) { /* shuffled anew */
        for (size_t k = d->count; k > 1; k--) {
            const size_t j = (size_t)random_below(s, (slong)k);
            expr *card = d->cards[k - 1];
            d->cards[k - 1] = d->cards[j];
            d->cards[j] = card;
        }
        d->at = 0;
    }
    return d->count ? d->cards[d->at++] : NULL;
}

expr *sampler_put(sampler *s, expr *form)
{
    expr *made = pattern_instance(s->e, form, s->variables, s->count, s->values, (expr *const *const *)s->parameters);
    if (!made && (s->e->error.kind == ERROR_VALUE || s->e->error.kind == ERROR_UNSUITABLE)) engine_forgive(s->e);
    return made;
}

static bool is_admissible(sampler *s)
{
    for (size_t k = 0; k < s->r->condition_count && s->e->error.kind == ERROR_NONE; k++) {
        condition_label label;
        if (s->r->conditions[k]->is.relation == RELATION_COMPLEX) continue;
        if (condition_answer(s->e, sampler_put(s, s->r->conditions[k]), &label) != ANSWER_YES) return false;
    }
    for (size_t k = 0; k < facts_count(s->e) && s->e->error.kind == ERROR_NONE; k++) { /* of symbols that stand for themselves */
        condition_label label;
        expr *fact = facts_at(s->e, k, &label), *here = sampler_put(s, fact);
        if (here != fact && condition_answer(s->e, here, &label) == ANSWER_NO) return false;
    }
    return s->e->error.kind == ERROR_NONE;
}

tw_status sampler_next(sampler *s, bool *found)
{
    *found = false;
    for (int k = 0; k < DEAL_LIMIT && !*found; k++) {
        for (size_t j = 0; j < s->count; j++) {
            s->values[j] = deal(s, &s->decks[j]);
            if (!s->values[j]) return s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
        }
        *found = is_admissible(s);
        if (s->e->error.kind != ERROR_NONE || !budget_ok(s->e)) return TW_ERROR;
        if (s->count == 0) break;
    }
    return TW_OK;
}

void sampler_describe(sampler *s, text *out)
{
    for (size_t k = 0; k < s->count; k++) {
        const deck *d = &s->decks[k];
        text_addf(out, "%s%s", k ? ", " : "", d->symbol->is.name);
        expr *value = s->values[k];
        static const char *const names[] = {"x", "y", "z", "w"};
        for (size_t j = 0; j < d->arity; j++) {
            const char *name = names[j < 4 ? j : 3];
            text_addf(out, "%s%s", j ? ", " : "(", name);
            value = expr_substitute(s->e, value, d->parameters[j], expr_symbol(s->e, name));
        }
        text_add(out, d->arity ? ") = " : " = ");
        if (value) expr_print(s->e, out, value);
    }
}
