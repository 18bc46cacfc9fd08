/* Identities that the engine proves by itself. Knows normal forms, nothing of samples. Its one idea: functions are written
 * through few others by their defining equations (trigonometric and hyperbolic ones by exponentials, DLMF 4.14, 4.28; Beta by
 * Gamma, 5.12.1; Gamma's argument moved by 5.5.1; erfc by erf, 7.2.2), then the difference of both sides is brought over one
 * denominator; a numerator that expands to 0 proves the identity wherever both sides have values. The converse is not
 * claimed. */
#include "engine/rewrite/prove.h"

#include "engine/expr/node.h"

/* Larger forms are given up, and so are arguments of Gamma moved further. */
enum { PROOF_SIZE = 6000, SHIFT_LIMIT = 12 };

typedef struct fraction {
    expr *over, *under;
} fraction;

static expr *defined(tw_engine *e, expr *a);

/* exp of a sum as a product of exponentials. */
static expr *split_exp(tw_engine *e, expr *argument)
{
    expr *all = expr_expand(e, argument), *made = expr_int(e, 1);
    if (!all) return NULL;
    expr *const *terms;
    const size_t n = expr_terms(&all, &terms);
    for (size_t k = 0; k < n; k++) made = expr_mul(e, made, expr_call1(e, FUNCTION_EXP, terms[k]));
    return made;
}

/* (exp(c*u) + sign*exp(-c*u))/by */
static expr *two_exponentials(tw_engine *e, expr *c, expr *u, slong sign, expr *by)
{
    expr *up = expr_mul(e, c, u), *down = up ? expr_neg(e, up) : NULL;
    if (!down) return NULL;
    return expr_div(e, expr_add(e, split_exp(e, up), expr_mul(e, expr_int(e, sign), split_exp(e, down))), by);
}

/* Gamma(u + n) with the number in [0, 1): products of u + k leave it. */
static expr *moved_gamma(tw_engine *e, expr *argument)
{
    expr *u = expr_expand(e, argument);
    if (!u || u->kind != EXPR_SUM || !expr_is_number(u->args[0])) return u ? expr_call1(e, FUNCTION_GAMMA, u) : NULL;
    fmpz_t whole;
    fmpz_init(whole);
    const fmpq *number = expr_number(u->args[0]);
    fmpz_fdiv_q(whole, fmpq_numref(number), fmpq_denref(number));
    const slong n = fmpz_cmpabs(whole, (const fmpz[]){SHIFT_LIMIT}) <= 0 ? fmpz_get_si(whole) : 0;
    fmpz_clear(whole);
    expr *base = expr_sub(e, u, expr_int(e, n)), *made = base ? expr_call1(e, FUNCTION_GAMMA, base) : NULL;
    for (slong k = 0; k < n; k++) made = expr_mul(e, made, expr_add(e, base, expr_int(e, k)));
    for (slong k = n; k < 0; k++) made = expr_div(e, made, expr_add(e, base, expr_int(e, k)));
    return made;
}

static expr *defined_call(tw_engine *e, expr *a, expr *const *args)
{
    expr *u = args[0], *one = expr_int(e, 1), *two = expr_int(e, 2), *i = expr_constant_of(e, CONSTANT_I);
    switch (a->is.function) {
    case FUNCTION_EXP: return split_exp(e, u);
    case FUNCTION_SIN: return two_exponentials(e, i, u, -1, expr_mul(e, two, i));
    case FUNCTION_COS: return two_exponentials(e, i, u, 1, two);
    case FUNCTION_TAN:
        return expr_div(e, two_exponentials(e, i, u, -1, expr_mul(e, two, i)), two_exponentials(e, i, u, 1, two));
    case FUNCTION_SINH: return two_exponentials(e, one, u, -1, two);
    case FUNCTION_COSH: return two_exponentials(e, one, u, 1, two);
    case FUNCTION_TANH: return expr_div(e, two_exponentials(e, one, u, -1, two), two_exponentials(e, one, u, 1, two));
    case FUNCTION_ERFC: return expr_sub(e, one, expr_call1(e, FUNCTION_ERF, u));
    case FUNCTION_GAMMA: return moved_gamma(e, u);
    case FUNCTION_BETA:
        return expr_div(e, expr_mul(e, moved_gamma(e, u), moved_gamma(e, args[1])), moved_gamma(e, expr_add(e, u, args[1])));
    default: return expr_call(e, a->is.function, args, a->count);
    }
}

/* Written through the few functions; not under binders, in conditions or pattern functions. */
static expr *defined(tw_engine *e, expr *a)
{
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT && a->kind != EXPR_POWER && a->kind != EXPR_CALL) return a;
    if (!budget_ok(e)) return NULL;
    const arena_place mark = arena_mark(&e->scratch);
    expr **args = engine_scratch(e, a->count, sizeof *args), *made = a;
    for (size_t k = 0; k < a->count && made; k++) {
        args[k] = defined(e, a->args[k]);
        if (!args[k]) made = NULL;
    }
    if (made) made = a->kind == EXPR_CALL ? defined_call(e, a, args) : expr_rebuild(e, a, args);
    arena_release(&e->scratch, mark);
    return made;
}

/* ---- one denominator ---- */

static bool is_small(const fraction *f)
{
    return f->over && f->under && expr_size(f->over) < PROOF_SIZE && expr_size(f->under) < PROOF_SIZE;
}

static bool multiply(tw_engine *e, fraction *f, fraction by)
{
    *f = (fraction){expr_expand(e, expr_mul(e, f->over, by.over)), expr_expand(e, expr_mul(e, f->under, by.under))};
    return is_small(f);
}

static bool fraction_of(tw_engine *e, expr *a, fraction *out);

static bool fraction_of_power(tw_engine *e, expr *a, fraction *out)
{
    const fmpq *q = expr_is_number(a->args[1]) ? expr_number(a->args[1]) : NULL;
    if (!q || !fmpz_is_one(fmpq_denref(q)) || fmpz_cmpabs(fmpq_numref(q), (const fmpz[]){SHIFT_LIMIT}) > 0) return true;
    slong n = fmpz_get_si(fmpq_numref(q));
    fraction base;
    if (!fraction_of(e, a->args[0], &base)) return false;
    if (n < 0) base = (fraction){base.under, base.over};
    *out = (fraction){expr_int(e, 1), expr_int(e, 1)};
    for (n = n < 0 ? -n : n; n > 0; n--)
        if (!multiply(e, out, base)) return false;
    return true;
}

static bool fraction_of(tw_engine *e, expr *a, fraction *out)
{
    *out = (fraction){a, expr_int(e, 1)};
    if (!budget_ok(e)) return false;
    if (a->kind == EXPR_POWER) return fraction_of_power(e, a, out);
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT) return true;
    *out = (fraction){expr_int(e, a->kind == EXPR_PRODUCT), expr_int(e, 1)};
    for (size_t k = 0; k < a->count; k++) {
        fraction part;
        if (!fraction_of(e, a->args[k], &part)) return false;
        if (a->kind == EXPR_PRODUCT) {
            if (!multiply(e, out, part)) return false;
            continue;
        }
        expr *cross = expr_add(e, expr_mul(e, out->over, part.under), expr_mul(e, part.over, out->under));
        *out = (fraction){expr_expand(e, cross), expr_expand(e, expr_mul(e, out->under, part.under))};
        if (!is_small(out)) return false;
    }
    return true;
}

static bool proves(tw_engine *e, const rule *r)
{
    if (expr_size(r->left) + expr_size(r->right) > PROOF_SIZE) return false;
    expr *difference = expr_sub(e, defined(e, r->left), defined(e, r->right));
    fraction f;
    if (!difference || !fraction_of(e, difference, &f)) return false;
    return expr_is_zero(f.over) && !expr_is_zero(f.under);
}

bool rule_prove(tw_engine *e, const rule *r)
{
    const bool proved = proves(e, r);
    if (e->error.kind == ERROR_VALUE || e->error.kind == ERROR_UNSUITABLE) {
        engine_forgive(e);
        return false;
    }
    return proved;
}
