/* An expression as text of the language, in a mathematician's order; what is printed parses back to the same
 * expression. Knows the grammar's precedences (language.md), nothing of lines or terminals. Its one idea: every node
 * is printed at a level, and a node that binds less tightly than the level asks for gets brackets. Canonical form is
 * only dressed up: 1/2*2^(1/2) is shown as sqrt(2)/2, -1*x + y as y - x. */
#include "engine/expr/node.h"
#include "engine/expr/root_names.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { LEVEL_ANY, LEVEL_SUM, LEVEL_PRODUCT, LEVEL_OPERAND, LEVEL_BASE };

/* Trees larger than this are described, not printed: a shared tree can unfold to more text than any memory holds. */
enum { PRINT_SIZE_LIMIT = 4000000 };

typedef struct fresh_name {
    expr *symbol;
    char *name;
} fresh_name;

typedef struct printer {
    tw_engine *engine;
    text *out;
    fresh_name *fresh;    /* names given to fresh symbols */
    size_t fresh_count;
    const char **bound;   /* names of the binders around, outermost first */
    size_t bound_count;
} printer;

static void print(printer *p, expr *a, int level);
static void print_term(printer *p, expr *a, bool negate, int level);

/* ---- names ---- */

static const char *symbol_name(const printer *p, expr *a)
{
    for (size_t k = 0; a->fresh && k < p->fresh_count; k++)
        if (p->fresh[k].symbol == a)
            return p->fresh[k].name;
    return a->is.name;
}

static bool name_is_among(const printer *p, const char *name, expr *const *symbols, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (strcmp(symbol_name(p, symbols[k]), name) == 0)
            return true;
    return false;
}

static bool name_is_bound(const printer *p, const char *name)
{
    for (size_t k = 0; k < p->bound_count; k++)
        if (strcmp(p->bound[k], name) == 0)
            return true;
    return false;
}

/* hint, or hint1, hint2, ...: the first that no symbol has and no binder around. A binder's closing word must not be
 * the name of a symbol either. In scratch memory. */
static char *name_choose(printer *p, const char *hint, expr *const *symbols, size_t n)
{
    const size_t room = strlen(hint) + 24;
    char *word = engine_scratch(p->engine, room + 1, 1), *name = word + 1;
    word[0] = 'd';
    for (unsigned long k = 0;; k++) {
        if (k == 0)
            snprintf(name, room, "%s", hint);
        else
            snprintf(name, room, "%s%lu", hint, k);
        if (!name_is_among(p, name, symbols, n) && !name_is_among(p, word, symbols, n) && !name_is_bound(p, name))
            return name;
    }
}

static void name_fresh_symbols(printer *p, expr *a)
{
    expr **symbols;
    size_t n = node_symbols(p->engine, a, &symbols);
    p->fresh = engine_scratch(p->engine, n, sizeof *p->fresh);
    for (size_t k = 0; k < n; k++) {
        if (!symbols[k]->fresh)
            continue;
        /* those not yet named stand under their hint; so does this one, which is taken out of the list meanwhile */
        expr *symbol = symbols[k];
        symbols[k] = symbols[0];
        symbols[0] = symbol;
        char *name = name_choose(p, symbol->is.name, symbols + 1, n - 1);
        symbols[0] = symbols[k];
        symbols[k] = symbol;
        p->fresh[p->fresh_count++] = (fresh_name){symbol, name};
    }
}

static const char *leaf_name(const printer *p, expr *a)
{
    if (a->kind == EXPR_SYMBOL)
        return symbol_name(p, a);
    return a->is.index < p->bound_count ? p->bound[p->bound_count - 1 - a->is.index] : NULL;
}

/* ---- numbers ---- */

static void print_fmpz(printer *p, const fmpz_t n)
{
    const arena_place mark = arena_mark(&p->engine->scratch);
    char *digits = engine_scratch(p->engine, fmpz_sizeinbase(n, 10) + 2, 1);
    text_add(p->out, fmpz_get_str(digits, 10, n));
    arena_release(&p->engine->scratch, mark);
}

static void print_fmpz_modulus(printer *p, const fmpz_t n)
{
    const arena_place mark = arena_mark(&p->engine->scratch);
    char *digits = engine_scratch(p->engine, fmpz_sizeinbase(n, 10) + 2, 1);
    fmpz_get_str(digits, 10, n);
    text_add(p->out, digits + (digits[0] == '-'));
    arena_release(&p->engine->scratch, mark);
}

static void print_fmpq_modulus(printer *p, const fmpq_t q)
{
    print_fmpz_modulus(p, fmpq_numref(q));
    if (fmpz_is_one(fmpq_denref(q)))
        return;
    text_add_char(p->out, '/');
    print_fmpz(p, fmpq_denref(q));
}

static void print_number(printer *p, expr *a, bool negate, int level)
{
    const fmpq *q = &a->is.number;
    const bool minus = fmpq_sgn(q) != 0 && (fmpq_sgn(q) < 0) != negate;
    const int own = minus ? LEVEL_SUM : fmpz_is_one(fmpq_denref(q)) ? LEVEL_BASE : LEVEL_PRODUCT;
    text_add(p->out, own < level ? "(" : "");
    text_add(p->out, minus ? "-" : "");
    print_fmpq_modulus(p, q);
    text_add(p->out, own < level ? ")" : "");
}

/* ---- powers ---- */

static void print_exponent(printer *p, expr *exponent)
{
    text_add_char(p->out, '^');
    if (exponent->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&exponent->is.number)))
        print_fmpz(p, fmpq_numref(&exponent->is.number));
    else
        print(p, exponent, LEVEL_BASE);
}

static bool is_half(expr *exponent, slong p)
{
    return exponent->kind == EXPR_NUMBER && fmpz_equal_si(fmpq_denref(&exponent->is.number), 2) &&
           fmpz_equal_si(fmpq_numref(&exponent->is.number), p);
}

/* base^exponent as an operand above or below a bar. */
static void print_power(printer *p, expr *base, expr *exponent)
{
    if (!exponent || expr_is_one(exponent)) {
        print(p, base, LEVEL_OPERAND);
    } else if (is_half(exponent, 1)) {
        text_add(p->out, "sqrt(");
        print(p, base, LEVEL_ANY);
        text_add_char(p->out, ')');
    } else {
        print(p, base, LEVEL_BASE);
        print_exponent(p, exponent);
    }
}

/* ---- products ---- */

typedef struct item {
    expr *base, *exponent;
    fmpz_t *merged;  /* the product of the number bases that have this exponent, or NULL */
    bool below;
} item;

typedef struct layout {
    item *items;
    size_t count;
    fmpq_t number;   /* coefficient */
    bool bar;        /* anything below it? */
    bool series;     /* a negative power of a name stands above the bar */
} layout;

static bool is_negative_number(expr *a)
{
    return a->kind == EXPR_NUMBER && fmpq_sgn(&a->is.number) < 0;
}

static bool mentions(expr *a, expr *leaf, uint32_t level)
{
    if (leaf->kind == EXPR_SYMBOL)
        return expr_has(a, leaf);
    if (a->loose <= level)
        return false;
    if (a->kind == EXPR_BOUND)
        return a->is.index == leaf->is.index + level;
    for (size_t k = 0; k < a->count; k++)
        if (mentions(a->args[k], leaf, level + node_child_is_under(a->kind, a->count, k)))
            return true;
    return false;
}

/* A negative power of a name goes below the bar beside a factor that depends on the name: exp(-x)/x, but 9*s^-5. */
static bool goes_below(expr *product, size_t at)
{
    expr *a = product->args[at];
    if (a->kind != EXPR_POWER || !is_negative_number(a->args[1]))
        return false;
    if (a->args[0]->kind != EXPR_SYMBOL && a->args[0]->kind != EXPR_BOUND)
        return true;
    for (size_t k = 0; k < product->count; k++)
        if (k != at && mentions(product->args[k], a->args[0], 0))
            return true;
    return false;
}

static void layout_add(printer *p, layout *l, expr *product, size_t k)
{
    expr *a = product->args[k];
    item *new = &l->items[l->count];
    *new = (item){.base = a->kind == EXPR_POWER ? a->args[0] : a,
        .exponent = a->kind == EXPR_POWER ? a->args[1] : NULL};
    new->below = goes_below(product, k);
    l->bar = l->bar || new->below;
    l->series = l->series || (!new->below && new->exponent && is_negative_number(new->exponent));
    if (new->below)
        new->exponent = expr_neg(p->engine, new->exponent);
    const bool number = a->kind == EXPR_POWER && new->base->kind == EXPR_NUMBER && fmpq_sgn(&new->base->is.number) > 0;
    for (size_t j = 0; number && j < l->count; j++) {
        item *old = &l->items[j];
        if (!old->merged || old->exponent != new->exponent)
            continue;
        fmpz_mul(*old->merged, *old->merged, fmpq_numref(&new->base->is.number));
        return;
    }
    if (number) {
        new->merged = engine_scratch(p->engine, 1, sizeof *new->merged);
        fmpz_init_set(*new->merged, fmpq_numref(&new->base->is.number));
    }
    l->count++;
}

static void print_item(printer *p, const item *i)
{
    if (!i->merged) {
        print_power(p, i->base, i->exponent);
        return;
    }
    const bool root = is_half(i->exponent, 1);
    text_add(p->out, root ? "sqrt(" : "");
    print_fmpz(p, *i->merged);
    if (root)
        text_add_char(p->out, ')');
    else
        print_exponent(p, i->exponent);
}

static size_t print_items(printer *p, const layout *l, bool below, bool begun)
{
    size_t printed = 0;
    for (size_t k = 0; k < l->count; k++) {
        if (l->items[k].below != below)
            continue;
        if (begun || printed)
            text_add_char(p->out, '*');
        print_item(p, &l->items[k]);
        printed++;
    }
    return printed;
}

static size_t count_items(const layout *l, bool below)
{
    size_t count = 0;
    for (size_t k = 0; k < l->count; k++)
        count += l->items[k].below == below;
    return count;
}

/* Would a minus in front meet a sum at once? `-(a + b)*c` reads as (-a - b)*c, another node. */
static bool begins_with_sum(const layout *l)
{
    if (!fmpz_is_one(fmpq_numref(l->number)))
        return false;
    for (size_t k = 0; k < l->count; k++)
        if (!l->items[k].below)
            return !l->items[k].exponent && l->items[k].base->kind == EXPR_SUM;
    return false;
}

/* The layout with a positive coefficient: 3*x*y/(2*(1 + z)), or 9/2*s^-3. */
static void print_layout(printer *p, layout *l)
{
    const fmpz *above = fmpq_numref(l->number), *below = fmpq_denref(l->number);
    if (!l->bar && l->series && !fmpz_is_one(below)) {
        print_fmpq_modulus(p, l->number);
        print_items(p, l, false, true);
        return;
    }
    const bool shown = !fmpz_is_one(above) || count_items(l, false) == 0;
    if (shown)
        print_fmpz(p, above);
    print_items(p, l, false, shown);
    if (!l->bar && fmpz_is_one(below))
        return;
    text_add_char(p->out, '/');
    const bool whole = !fmpz_is_one(below), brackets = count_items(l, true) + whole > 1;
    if (brackets)
        text_add_char(p->out, '(');
    if (whole)
        print_fmpz(p, below);
    print_items(p, l, true, whole);
    if (brackets)
        text_add_char(p->out, ')');
}

static void print_product(printer *p, expr *a, bool negate, int level)
{
    layout l = {.items = engine_scratch(p->engine, a->count, sizeof *l.items)};
    fmpq_init(l.number);
    fmpq_one(l.number);
    size_t first = 0;
    if (a->args[0]->kind == EXPR_NUMBER) {
        fmpq_set(l.number, &a->args[0]->is.number);
        first = 1;
    }
    if (negate)
        fmpq_neg(l.number, l.number);
    for (size_t k = first; k < a->count; k++)
        layout_add(p, &l, a, k);
    const bool minus = fmpq_sgn(l.number) < 0;
    const int own = minus ? LEVEL_SUM : LEVEL_PRODUCT;
    fmpq_abs(l.number, l.number);
    const bool meets_sum = minus && begins_with_sum(&l);
    const bool apart = meets_sum && (l.bar || fmpz_is_one(fmpq_denref(l.number)));
    l.series = l.series || meets_sum; /* -1/2*(a + b) */
    if (own < level)
        text_add_char(p->out, '(');
    if (minus)
        text_add(p->out, apart ? "-(" : "-");
    print_layout(p, &l);
    if (apart)
        text_add_char(p->out, ')');
    if (own < level)
        text_add_char(p->out, ')');
    for (size_t k = 0; k < l.count; k++)
        if (l.items[k].merged)
            fmpz_clear(*l.items[k].merged);
    fmpq_clear(l.number);
}

/* A power that is no factor of a product. */
static void print_lone_power(printer *p, expr *a, int level)
{
    const bool leaf = a->args[0]->kind == EXPR_SYMBOL || a->args[0]->kind == EXPR_BOUND;
    if (leaf || !is_negative_number(a->args[1])) {
        const bool brackets = level >= LEVEL_BASE && !is_half(a->args[1], 1);
        if (brackets)
            text_add_char(p->out, '(');
        print_power(p, a->args[0], a->args[1]);
        if (brackets)
            text_add_char(p->out, ')');
        return;
    }
    if (level > LEVEL_PRODUCT)
        text_add_char(p->out, '(');
    text_add(p->out, "1/");
    print_power(p, a->args[0], expr_neg(p->engine, a->args[1]));
    if (level > LEVEL_PRODUCT)
        text_add_char(p->out, ')');
}

/* ---- sums ---- */

typedef struct placed_term {
    expr *term;
    double degree; /* in all names together */
    expr *front;   /* the first factor's base if it is a name, and its power */
    double front_power;
    size_t place;
} placed_term;

static double exponent_value(expr *exponent)
{
    return exponent->kind != EXPR_NUMBER ? 0
         : fmpz_get_d(fmpq_numref(&exponent->is.number)) / fmpz_get_d(fmpq_denref(&exponent->is.number));
}

static placed_term term_place(expr *term, size_t place)
{
    expr *const *factors;
    const size_t n = expr_factors(&term, &factors);
    placed_term t = {.term = term, .place = place};
    for (size_t k = 0; k < n; k++) {
        expr *base = factors[k]->kind == EXPR_POWER ? factors[k]->args[0] : factors[k];
        if (base->kind != EXPR_SYMBOL && base->kind != EXPR_BOUND && base->kind != EXPR_SUM)
            continue;
        const double power = factors[k]->kind == EXPR_POWER ? exponent_value(factors[k]->args[1]) : 1;
        if (k == (n > 1 && factors[0]->kind == EXPR_NUMBER)) {
            t.front = base;
            t.front_power = power;
        }
        t.degree += power;
    }
    return t;
}

/* In equal degree the higher power of the name in front comes first: x^2 + 2*x*y + y^2. */
static int compare_equal_degree(const placed_term *s, const placed_term *t)
{
    if (s->front && s->front == t->front && s->front_power != t->front_power)
        return s->front_power > t->front_power ? -1 : 1;
    return (s->place > t->place) - (s->place < t->place);
}

static int compare_rising(const void *a, const void *b)
{
    const placed_term *s = a, *t = b;
    if (s->degree != t->degree)
        return s->degree < t->degree ? -1 : 1;
    return compare_equal_degree(s, t);
}

static int compare_falling(const void *a, const void *b)
{
    const placed_term *s = a, *t = b;
    if (s->degree != t->degree)
        return s->degree > t->degree ? -1 : 1;
    return compare_equal_degree(s, t);
}

/* Does the number come last, as in n + 1, nu + 1/2, x - 1? It comes first in 1 + x. */
static bool number_comes_last(printer *p, const placed_term *t, size_t n)
{
    static const char variables[] = " x y z t u v w r s h ";
    if (expr_leads_negative(t[0].term))
        return true;
    for (size_t k = 1; k < n; k++) {
        if (t[k].degree > 1 || t[k].degree <= 0)
            return false;
        expr *const *factors;
        const size_t m = expr_factors(&t[k].term, &factors);
        for (size_t j = 0; j < m; j++) {
            if (factors[j]->kind != EXPR_SYMBOL && factors[j]->kind != EXPR_BOUND)
                continue;
            const char *name = leaf_name(p, factors[j]);
            const char word[4] = {' ', name ? name[0] : 'x', ' ', 0};
            if (!name || (strstr(variables, word) && strspn(name + 1, "0123456789") == strlen(name + 1)))
                return false;
        }
    }
    return true;
}

static void move_term(placed_term *t, size_t from, size_t to)
{
    const placed_term moved = t[from];
    if (from < to)
        memmove(t + from, t + from + 1, (to - from) * sizeof *t);
    else
        memmove(t + to + 1, t + to, (from - to) * sizeof *t);
    t[to] = moved;
}

static placed_term *order_terms(printer *p, expr *a)
{
    placed_term *t = engine_scratch(p->engine, a->count, sizeof *t);
    bool falling = true;
    for (size_t k = 0; k < a->count; k++) {
        t[k] = term_place(a->args[k], k);
        falling = falling && t[k].degree <= 0;
    }
    const bool number = t[0].term->kind == EXPR_NUMBER;
    const bool last = number && number_comes_last(p, t, a->count);
    qsort(t + number, a->count - number, sizeof *t, falling ? compare_falling : compare_rising);
    if (number && !last && !falling) { /* among the others by degree: 1 stands before x, behind x^-1 */
        size_t to = 0;
        while (to + 1 < a->count && t[to + 1].degree < 0)
            to++;
        move_term(t, 0, to);
    }
    if (last)
        move_term(t, 0, a->count - 1);
    for (size_t k = 0; expr_leads_negative(t[0].term) && k < a->count; k++)
        if (!expr_leads_negative(t[k].term))
            move_term(t, k, 0);
    return t;
}

static void print_sum(printer *p, expr *a, int level)
{
    const placed_term *t = order_terms(p, a);
    if (level > LEVEL_SUM)
        text_add_char(p->out, '(');
    for (size_t k = 0; k < a->count; k++) {
        const bool minus = expr_leads_negative(t[k].term) && t[k].term->kind != EXPR_SUM;
        if (k > 0)
            text_add(p->out, minus ? " - " : " + ");
        print_term(p, t[k].term, k > 0 && minus, k > 0 ? LEVEL_PRODUCT : LEVEL_SUM);
    }
    if (level > LEVEL_SUM)
        text_add_char(p->out, ')');
}

static void print_term(printer *p, expr *a, bool negate, int level)
{
    if (a->kind == EXPR_NUMBER)
        print_number(p, a, negate, level);
    else if (a->kind == EXPR_PRODUCT)
        print_product(p, a, negate, level);
    else if (a->kind == EXPR_SUMMATION)
        print(p, a, LEVEL_SUM);
    else
        print(p, a, level);
}

/* ---- binders and the rest ---- */

static void print_limit(printer *p, expr *a)
{
    const bool brackets = node_is_binder(a);
    if (brackets)
        text_add_char(p->out, '(');
    print(p, a, LEVEL_SUM);
    if (brackets)
        text_add_char(p->out, ')');
}

/* The name that the binder's variable gets here. */
static const char *binder_name(printer *p, expr *a)
{
    expr **symbols;
    size_t n = node_symbols(p->engine, a->args[a->kind == EXPR_ROOT ? 0 : a->count - 1], &symbols);
    return name_choose(p, a->is.name, symbols, n);
}

static void print_body(printer *p, expr *body, const char *name, int level)
{
    const char **bound = engine_scratch(p->engine, p->bound_count + 1, sizeof *bound);
    const char **outer = p->bound;
    if (p->bound_count)
        memcpy(bound, outer, p->bound_count * sizeof *bound);
    bound[p->bound_count] = name;
    p->bound = bound;
    p->bound_count++;
    print(p, body, level);
    p->bound_count--;
    p->bound = outer;
}

static void print_binder(printer *p, expr *a)
{
    const char *name = binder_name(p, a);
    expr *body = a->args[a->kind == EXPR_ROOT ? 0 : a->count - 1];
    switch (a->kind) {
    case EXPR_SUMMATION: text_addf(p->out, "sum from %s = ", name); break;
    case EXPR_INTEGRAL: text_add(p->out, "integral from "); break;
    case EXPR_CONTOUR: text_add(p->out, "integral along "); break;
    default: text_add(p->out, "root of "); break;
    }
    for (size_t k = 0; a->kind != EXPR_ROOT && k + 1 < a->count; k++) {
        if (k > 0)
            text_add(p->out, " to ");
        print_limit(p, a->args[k]);
    }
    if (a->kind != EXPR_ROOT)
        text_add(p->out, " of ");
    print_body(p, body, name, a->kind == EXPR_SUMMATION && body->kind == EXPR_SUM ? LEVEL_PRODUCT : LEVEL_SUM);
    if (a->kind == EXPR_INTEGRAL || a->kind == EXPR_CONTOUR)
        text_addf(p->out, " d%s", name);
    if (a->kind == EXPR_ROOT) {
        text_addf(p->out, " in %s near ", name);
        print(p, a->args[1], LEVEL_SUM);
    }
}

static void print_list(printer *p, const char *name, expr *a)
{
    text_addf(p->out, "%s(", name);
    for (size_t k = 0; k < a->count; k++) {
        text_add(p->out, k > 0 ? ", " : "");
        print(p, a->args[k], LEVEL_SUM);
    }
    text_add_char(p->out, ')');
}

/* f(u), and of a derived one (derivative of f(t) in t order 2 at t = u) with a name t that u does not hold. */
static void print_apply(printer *p, expr *a)
{
    static const char *const slots[] = {"t", "u", "v", "w"};
    const size_t n = expr_apply_arity(a);
    size_t derived = n;
    for (size_t k = 0; k < n; k++)
        if (!expr_is_zero(a->args[1 + n + k]))
            derived = k;
    const char *slot = derived < n ? slots[derived < 4 ? derived : 3] : NULL;
    if (slot)
        text_add(p->out, "(derivative of ");
    text_addf(p->out, "%s(", symbol_name(p, a->args[0]));
    for (size_t k = 0; k < n; k++) {
        text_add(p->out, k > 0 ? ", " : "");
        if (k == derived)
            text_add(p->out, slot);
        else
            print(p, a->args[1 + k], LEVEL_SUM);
    }
    text_add_char(p->out, ')');
    if (!slot)
        return;
    text_addf(p->out, " in %s", slot);
    if (!expr_is_one(a->args[1 + n + derived])) {
        text_add(p->out, " order ");
        print(p, a->args[1 + n + derived], LEVEL_SUM);
    }
    text_addf(p->out, " at %s = ", slot);
    print(p, a->args[1 + derived], LEVEL_SUM);
    text_add_char(p->out, ')');
}

static void print_piecewise(printer *p, expr *a)
{
    text_add(p->out, "piecewise(");
    for (size_t k = 0; k + 1 < a->count; k += 2) {
        print(p, a->args[k + 1], LEVEL_SUM);
        text_add(p->out, " when ");
        print(p, a->args[k], LEVEL_ANY);
        text_add(p->out, ", ");
    }
    print(p, a->args[a->count - 1], LEVEL_SUM);
    text_add(p->out, " otherwise)");
}

static void print_relation(printer *p, expr *a)
{
    static const char *const signs[] = {" < ", " <= ", " = ", " != ", " integer", " real", " complex"};
    static const char *const turned[] = {" > ", " >= ", " = ", " != "};
    const expr_relation r = a->is.relation;
    const bool turn = r <= RELATION_LESS_EQUAL && a->args[0]->kind == EXPR_NUMBER && a->args[1]->kind != EXPR_NUMBER;
    print(p, a->args[turn], LEVEL_SUM);
    text_add(p->out, turn ? turned[r] : signs[r]);
    if (r < RELATION_INTEGER)
        print(p, a->args[!turn], LEVEL_SUM);
}

static int own_level(expr *a)
{
    switch (a->kind) {
    case EXPR_INTEGRAL: case EXPR_CONTOUR: return LEVEL_OPERAND;
    case EXPR_SUMMATION: return LEVEL_SUM;
    case EXPR_ROOT: case EXPR_RELATION: return LEVEL_ANY;
    default: return LEVEL_BASE;
    }
}

static void print_kind(printer *p, expr *a)
{
    static const char *const constants[] = {"pi", "i", "inf", "euler_constant"};
    const char *name;
    switch (a->kind) {
    case EXPR_CONSTANT: text_add(p->out, constants[a->is.constant]); break;
    case EXPR_SYMBOL: text_add(p->out, symbol_name(p, a)); break;
    case EXPR_BOUND:
        name = leaf_name(p, a);
        if (name)
            text_add(p->out, name);
        else
            text_addf(p->out, "_%u", a->is.index - (uint32_t)p->bound_count);
        break;
    case EXPR_CALL: print_list(p, function_name(a->is.function), a); break;
    case EXPR_DIRECTION: print_list(p, "inf", a); break;
    case EXPR_PIECEWISE: print_piecewise(p, a); break;
    case EXPR_RELATION: print_relation(p, a); break;
    case EXPR_APPLY: print_apply(p, a); break;
    default: print_binder(p, a); break;
    }
}

static void print(printer *p, expr *a, int level)
{
    const arena_place mark = arena_mark(&p->engine->scratch);
    switch (a->kind) {
    case EXPR_NUMBER: print_number(p, a, false, level); break;
    case EXPR_PRODUCT: print_product(p, a, false, level); break;
    case EXPR_POWER: print_lone_power(p, a, level); break;
    case EXPR_SUM: print_sum(p, a, level); break;
    case EXPR_ROOT:
        if (p->engine->root_names && root_name_of(p->engine->root_names, a)) {
            text_add(p->out, root_name_of(p->engine->root_names, a));
            break;
        }
        /* fall through */
    default:
        if (own_level(a) < level)
            text_add_char(p->out, '(');
        print_kind(p, a);
        if (own_level(a) < level)
            text_add_char(p->out, ')');
    }
    arena_release(&p->engine->scratch, mark);
}

void expr_print(tw_engine *e, text *out, expr *a)
{
    if (a->size > PRINT_SIZE_LIMIT) {
        text_addf(out, "(an expression of %llu parts)", (unsigned long long)a->size);
        return;
    }
    const arena_place mark = arena_mark(&e->scratch);
    printer p = {.engine = e, .out = out};
    name_fresh_symbols(&p, a);
    print(&p, a, LEVEL_ANY);
    arena_release(&e->scratch, mark);
}

/* A text under construction is freed when memory runs out: these jobs have an edge of their own, and then go on to the
 * caller's. */
typedef struct text_job {
    tw_engine *engine;
    expr *expression;
    text out;
    char *copy; /* in scratch memory */
} text_job;

static tw_status text_run(void *host)
{
    text_job *job = host;
    text_init(&job->out);
    expr_print(job->engine, &job->out, job->expression);
    return TW_OK;
}

static tw_status text_run_copy(void *host)
{
    text_job *job = host;
    text_run(job);
    job->copy = arena_copy(&job->engine->scratch, job->out.bytes, job->out.length);
    return TW_OK;
}

static void text_protect(text_job *job, tw_status (*run)(void *host))
{
    if (engine_protect(job->engine, run, job) == TW_OK)
        return;
    text_clear(&job->out);
    edge_leave_memory();
}

char *expr_text(tw_engine *e, expr *a)
{
    text_job job = {.engine = e, .expression = a};
    text_protect(&job, text_run);
    return text_take(&job.out);
}

const char *node_text(tw_engine *e, expr *a)
{
    text_job job = {.engine = e, .expression = a};
    text_protect(&job, text_run_copy);
    text_clear(&job.out);
    return job.copy;
}
