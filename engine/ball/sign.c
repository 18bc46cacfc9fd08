/* Signs by structure: sums of like signs, products, powers, functions of known sign. Simple inequality reasoning,
 * exact and never a guess; what it cannot see is left to balls (decide.c). */
#include "engine/ball/sign.h"

#include <stdlib.h>

#include "engine/ball/tape.h"
#include "engine/expr/facts.h"

void forgive_trouble(tw_engine *e)
{
    error_kind k = e->error.kind;
    if (k != ERROR_TIME && k != ERROR_MEMORY && k != ERROR_INTERRUPT && k != ERROR_INTERNAL) engine_forgive(e);
}

int sign_times(int a, int b)
{
    int signs = 0;
    if ((a | b) & SIGN_ZERO) signs |= SIGN_ZERO;
    const int both = a & b & (SIGN_POSITIVE | SIGN_NEGATIVE); /* signs that the two share */
    if (both) signs |= SIGN_POSITIVE;
    if (((a & SIGN_POSITIVE) && (b & SIGN_NEGATIVE)) || ((a & SIGN_NEGATIVE) && (b & SIGN_POSITIVE)))
        signs |= SIGN_NEGATIVE;
    return signs;
}

int sign_plus(int a, int b)
{
    if (a == SIGN_ZERO) return b;
    if (b == SIGN_ZERO) return a;
    int both = a | b;
    if (!(both & SIGN_NEGATIVE)) return (a & b & SIGN_ZERO) ? both : SIGN_POSITIVE;
    if (!(both & SIGN_POSITIVE)) return (a & b & SIGN_ZERO) ? both : SIGN_NEGATIVE;
    return SIGN_ANY;
}

static int number_sign(const fmpq *q)
{
    int s = fmpq_sgn(q);
    return s > 0 ? SIGN_POSITIVE : s < 0 ? SIGN_NEGATIVE : SIGN_ZERO;
}

/* A fact a != 0 takes the zero out. */
static int signs_without_zero(tw_engine *e, expr *a, int signs)
{
    for (size_t k = 0; (signs & SIGN_ZERO) && k < facts_count(e); k++) {
        condition_label l;
        expr *fact = facts_at(e, k, &l);
        if (fact->is.relation == RELATION_NOT_EQUAL && fact->args[0] == a && expr_is_zero(fact->args[1]) &&
            !facts_is_complex(e, a))
            signs &= ~SIGN_ZERO;
    }
    return signs;
}

static int symbol_sign(tw_engine *e, expr *a, const sign_context *c)
{
    for (size_t k = 0; c && k < c->count; k++)
        if (c->symbols[k] == a) return c->signs[k];
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    int known = facts_is_complex(e, a) ? 0 : facts_interval(e, a, low, high), signs = SIGN_ANY;
    if (known & 1) {
        int s = fmpq_sgn(low);
        if (s >= 0) signs &= ~SIGN_NEGATIVE;
        if (s > 0 || (s == 0 && (known & 4))) signs &= ~SIGN_ZERO;
    }
    if (known & 2) {
        int s = fmpq_sgn(high);
        if (s <= 0) signs &= ~SIGN_POSITIVE;
        if (s < 0 || (s == 0 && (known & 8))) signs &= ~SIGN_ZERO;
    }
    fmpq_clear(low);
    fmpq_clear(high);
    return signs_without_zero(e, a, signs);
}

static int power_sign(tw_engine *e, expr *a, const sign_context *c)
{
    if (expr_is_inf(a->args[0])) return SIGN_ANY;
    int base = sign_of(e, a->args[0], c);
    if (base == SIGN_POSITIVE)
        return sign_is_real(e, a->args[1]) || sign_of(e, a->args[1], c) != SIGN_ANY ? SIGN_POSITIVE : SIGN_ANY;
    if (!expr_is_number(a->args[1])) return SIGN_ANY;
    const fmpq *q = expr_number(a->args[1]);
    if (fmpz_is_one(fmpq_denref(q))) {
        if (base == SIGN_ANY && !sign_is_real(e, a->args[0])) return SIGN_ANY;
        if (fmpq_sgn(q) < 0) base &= ~SIGN_ZERO; /* a value 0 has no such power */
        if (base == 0) return SIGN_ANY;
        if (fmpz_is_odd(fmpq_numref(q))) return base;
        return (base & SIGN_ZERO) | ((base & ~SIGN_ZERO) ? SIGN_POSITIVE : 0);
    }
    if (!(base & SIGN_NEGATIVE)) return fmpq_sgn(q) > 0 ? base : SIGN_POSITIVE;
    return SIGN_ANY;
}

/* Is the value real whatever the real symbols are? Enough of an answer for even powers and exponentials. */
bool sign_is_real(tw_engine *e, expr *a)
{
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_CONSTANT: return a->is.constant == CONSTANT_PI || a->is.constant == CONSTANT_EULER;
    case EXPR_SYMBOL: return !facts_is_complex(e, a);
    case EXPR_POWER:
        if (expr_is_number(a->args[1]) && fmpz_is_one(fmpq_denref(expr_number(a->args[1]))))
            return sign_is_real(e, a->args[0]);
        return sign_is_real(e, a->args[1]) && sign_of(e, a->args[0], NULL) == SIGN_POSITIVE;
    case EXPR_SUM:
    case EXPR_PRODUCT:
        for (uint32_t k = 0; k < a->count; k++)
            if (!sign_is_real(e, a->args[k])) return false;
        return true;
    case EXPR_CALL:
        switch (a->is.function) {
        case FUNCTION_EXP:
        case FUNCTION_SIN:
        case FUNCTION_COS:
        case FUNCTION_SINH:
        case FUNCTION_COSH:
        case FUNCTION_TANH:
        case FUNCTION_ATAN:
        case FUNCTION_ASINH:
        case FUNCTION_ERF:
        case FUNCTION_ERFC:
        case FUNCTION_GAMMA:
        case FUNCTION_PSI:
        case FUNCTION_AI:
        case FUNCTION_BI: return sign_is_real(e, a->args[0]);
        case FUNCTION_LOG:
        case FUNCTION_LNGAMMA: return sign_of(e, a->args[0], NULL) == SIGN_POSITIVE;
        case FUNCTION_ABS:
        case FUNCTION_RE:
        case FUNCTION_IM:
        case FUNCTION_ARG: return true;
        default: return false;
        }
    default: return false;
    }
}

static int call_sign(tw_engine *e, expr *a, const sign_context *c)
{
    switch (a->is.function) {
    case FUNCTION_EXP:
    case FUNCTION_COSH:
    case FUNCTION_ERFC:
        return sign_is_real(e, a->args[0]) || sign_of(e, a->args[0], c) != SIGN_ANY ? SIGN_POSITIVE : SIGN_ANY;
    case FUNCTION_ABS: {
        int s = sign_of(e, a->args[0], c);
        return s == SIGN_ANY ? SIGN_ZERO | SIGN_POSITIVE : (s & SIGN_ZERO) | ((s & ~SIGN_ZERO) ? SIGN_POSITIVE : 0);
    }
    case FUNCTION_SINH: /* odd and increasing, zero only at 0 */
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ERF:
    case FUNCTION_SIGN: return sign_of(e, a->args[0], c);
    case FUNCTION_GAMMA:
    case FUNCTION_E1: return sign_of(e, a->args[0], c) == SIGN_POSITIVE ? SIGN_POSITIVE : SIGN_ANY;
    case FUNCTION_LOG: {
        int s = sign_of(e, a->args[0], c);
        if (s != SIGN_POSITIVE) return SIGN_ANY;
        return sign_of(e, expr_sub(e, a->args[0], expr_int(e, 1)), c);
    }
    default: return SIGN_ANY;
    }
}

/* A fixed number: balls at rising precision. A ball that keeps holding 0 proves nothing. */
static int fixed_sign(tw_engine *e, expr *f)
{
    acb_t z;
    acb_init(z);
    int signs = SIGN_ANY;
    for (slong prec = 64; prec <= 1024 && signs == SIGN_ANY; prec *= 4) {
        if (ball_value(e, z, f, prec) != TW_OK) {
            forgive_trouble(e);
            break;
        }
        if (!acb_is_real(z)) break; /* perhaps not a real number: no sign */
        if (arb_is_positive(acb_realref(z))) signs = SIGN_POSITIVE;
        if (arb_is_negative(acb_realref(z))) signs = SIGN_NEGATIVE;
    }
    acb_clear(z);
    return signs;
}

int sign_of(tw_engine *e, expr *f, const sign_context *c)
{
    if (!f || !budget_ok(e)) return SIGN_ANY;
    int signs;
    switch ((expr_kind)f->kind) {
    case EXPR_NUMBER: return number_sign(expr_number(f));
    case EXPR_CONSTANT: return f->is.constant == CONSTANT_I ? SIGN_ANY : SIGN_POSITIVE; /* inf too */
    case EXPR_SYMBOL: return symbol_sign(e, f, c);
    case EXPR_SUM:
        signs = SIGN_ZERO;
        for (uint32_t k = 0; k < f->count; k++) signs = sign_plus(signs, sign_of(e, f->args[k], c));
        break;
    case EXPR_PRODUCT:
        signs = SIGN_POSITIVE;
        for (uint32_t k = 0; k < f->count; k++) {
            int s = sign_of(e, f->args[k], c);
            if (s == SIGN_ANY) { /* may not even be real */
                signs = SIGN_ANY;
                break;
            }
            signs = sign_times(signs, s);
        }
        break;
    case EXPR_POWER: signs = power_sign(e, f, c); break;
    case EXPR_CALL: signs = call_sign(e, f, c); break;
    default: signs = SIGN_ANY; break;
    }
    if (signs != SIGN_POSITIVE && signs != SIGN_NEGATIVE && signs != SIGN_ZERO && expr_is_closed_value(f)) {
        int fixed = fixed_sign(e, f);
        if (fixed != SIGN_ANY) signs = fixed;
    }
    return signs;
}

static void context_add(sign_context *c, expr *symbol, int signs)
{
    c->symbols = base_resize(c->symbols, (c->count + 1) * sizeof *c->symbols);
    c->signs = base_resize(c->signs, (c->count + 1) * sizeof *c->signs);
    c->symbols[c->count] = symbol;
    c->signs[c->count++] = signs;
}

expr *sign_shift(tw_engine *e, expr *f, sign_context *c)
{
    if (!f) return NULL;
    expr **symbols;
    size_t n = expr_symbols(f, &symbols), m = 0;
    expr **values = base_alloc((n + 1) * sizeof *values), **moved = base_alloc((n + 1) * sizeof *moved);
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    for (size_t k = 0; k < n; k++) {
        if (facts_is_complex(e, symbols[k])) continue;
        bool known_here = false;
        for (size_t j = 0; j < c->count; j++) known_here = known_here || c->symbols[j] == symbols[k];
        int known = known_here ? 0 : facts_interval(e, symbols[k], low, high);
        if (!(known & 3)) continue;
        bool from_low = known & 1;
        bool open = known & (from_low ? 4 : 8);
        expr *w = expr_fresh(e, "w"), *end = expr_fmpq(e, from_low ? low : high);
        values[m] = from_low ? expr_add(e, end, w) : expr_sub(e, end, w);
        moved[m++] = symbols[k];
        context_add(c, w, open ? SIGN_POSITIVE : SIGN_ZERO | SIGN_POSITIVE);
    }
    fmpq_clear(low);
    fmpq_clear(high);
    expr *made = m ? expr_expand(e, expr_substitute_all(e, f, moved, values, m)) : expr_expand(e, f);
    free(symbols);
    free(values);
    free(moved);
    return made;
}

int sign_by_structure(tw_engine *e, expr *f)
{
    sign_context c = {0};
    int signs = sign_of(e, f, NULL);
    if (signs & (signs - 1)) signs &= sign_of(e, sign_shift(e, f, &c), &c);
    forgive_trouble(e);
    free(c.symbols);
    free(c.signs);
    return signs;
}
