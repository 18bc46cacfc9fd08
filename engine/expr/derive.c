/* Derivatives. Knows one rule a function (a column of functions.def) and how to go under binders. Its one idea: the
 * walk is memoised by node, so a shared tree has a shared derivative. Differentiation under an integral's sign is
 * formal; who uses it answers for its conditions. Names are real unless declared complex, which is what abs, re and
 * the like rest on. */
#include "engine/expr/node.h"

#include <string.h>

#include "engine/expr/facts.h"

typedef struct derivation_walk {
    tw_engine *engine;
    expr *symbol;
    memo memo;
    unsigned contours; /* how many contours the walk is inside of: their variables are complex */
} derivation_walk;

/* A rule: the part of the derivative of f(args) that comes from args[k], whose own derivative is d. */
typedef expr *derive_rule(derivation_walk *w, expr *const *args, size_t n, size_t k, expr *d);

static expr *derive(derivation_walk *w, expr *a);

/* ---- pieces of rules ---- */

static expr *fail_parameter(derivation_walk *w, const char *what)
{
    engine_fail(w->engine, ERROR_VALUE, "the derivative of %s has no name in the language", what);
    return NULL;
}

static expr *square(tw_engine *e, expr *z)
{
    return expr_pow(e, z, expr_int(e, 2));
}

static expr *power(tw_engine *e, expr *z, slong p, slong q)
{
    return expr_pow(e, z, expr_frac(e, p, q));
}

static expr *one_plus(tw_engine *e, expr *z)
{
    return expr_add(e, expr_int(e, 1), z);
}

static expr *one_minus(tw_engine *e, expr *z)
{
    return expr_sub(e, expr_int(e, 1), z);
}

#define RULE(name)                                                                                                    \
    static expr *derive_##name(derivation_walk *w, expr *const *args, size_t n, size_t k, expr *d)
#define PLAIN(name, derivative) /* of one argument z, analytic */                                                     \
    RULE(name)                                                                                                        \
    {                                                                                                                 \
        tw_engine *e = w->engine;                                                                                     \
        expr *z = args[0];                                                                                            \
        (void)n, (void)k;                                                                                             \
        return expr_mul(e, d, derivative);                                                                            \
    }

/* ---- elementary functions: DLMF 4.2, 4.20, 4.24, 4.34, 4.38 ---- */

PLAIN(exp, expr_call1(e, FUNCTION_EXP, z))
PLAIN(log, power(e, z, -1, 1))
PLAIN(sin, expr_call1(e, FUNCTION_COS, z))
PLAIN(cos, expr_neg(e, expr_call1(e, FUNCTION_SIN, z)))
PLAIN(tan, one_plus(e, square(e, expr_call1(e, FUNCTION_TAN, z))))
PLAIN(sinh, expr_call1(e, FUNCTION_COSH, z))
PLAIN(cosh, expr_call1(e, FUNCTION_SINH, z))
PLAIN(tanh, one_minus(e, square(e, expr_call1(e, FUNCTION_TANH, z))))
PLAIN(asin, power(e, one_minus(e, square(e, z)), -1, 2))
PLAIN(acos, expr_neg(e, power(e, one_minus(e, square(e, z)), -1, 2)))
PLAIN(atan, power(e, one_plus(e, square(e, z)), -1, 1))
PLAIN(asinh, power(e, one_plus(e, square(e, z)), -1, 2))
PLAIN(acosh, expr_mul(e, power(e, expr_sub(e, z, expr_int(e, 1)), -1, 2), power(e, one_plus(e, z), -1, 2)))
PLAIN(atanh, power(e, one_minus(e, square(e, z)), -1, 1))

/* ---- functions that are not analytic: along a real parameter ---- */

static bool parameter_is_real(derivation_walk *w, const char *what)
{
    if (!facts_is_complex(w->engine, w->symbol))
        return true;
    engine_fail(w->engine, ERROR_VALUE, "%s has no derivative in the complex variable %s", what, w->symbol->is.name);
    return false;
}

RULE(re)
{
    (void)args, (void)n, (void)k;
    return parameter_is_real(w, "re") ? expr_call1(w->engine, FUNCTION_RE, d) : NULL;
}

RULE(im)
{
    (void)args, (void)n, (void)k;
    return parameter_is_real(w, "im") ? expr_call1(w->engine, FUNCTION_IM, d) : NULL;
}

RULE(conj)
{
    (void)args, (void)n, (void)k;
    return parameter_is_real(w, "conj") ? expr_call1(w->engine, FUNCTION_CONJ, d) : NULL;
}

RULE(arg)
{
    (void)n, (void)k;
    return parameter_is_real(w, "arg") ? expr_call1(w->engine, FUNCTION_IM, expr_div(w->engine, d, args[0])) : NULL;
}

/* |f|' = sign(f) f' for real f, else re(conj(f) f')/|f|. */
RULE(abs)
{
    tw_engine *e = w->engine;
    (void)n, (void)k;
    if (!parameter_is_real(w, "abs"))
        return NULL;
    if (expr_is_real(e, args[0], w->contours == 0))
        return expr_mul(e, d, expr_call1(e, FUNCTION_SIGN, args[0]));
    expr *along = expr_call1(e, FUNCTION_RE, expr_mul(e, expr_call1(e, FUNCTION_CONJ, args[0]), d));
    return expr_div(e, along, expr_call1(e, FUNCTION_ABS, args[0]));
}

RULE(sign)
{
    (void)args, (void)n, (void)k, (void)d;
    return parameter_is_real(w, "sign") ? expr_int(w->engine, 0) : NULL;
}

/* args[k]' where args[k] is the extreme one, else 0. */
static expr *derive_extreme(derivation_walk *w, function_id f, expr *const *args, size_t n, size_t k, expr *d)
{
    tw_engine *e = w->engine;
    if (!parameter_is_real(w, function_name(f)))
        return NULL;
    expr **others = engine_scratch(e, n, sizeof *others);
    size_t count = 0;
    for (size_t j = 0; j < n; j++)
        if (j != k)
            others[count++] = args[j];
    expr *rest = expr_call(e, f, others, count);
    expr *condition = f == FUNCTION_MIN ? expr_relation_of(e, RELATION_LESS, args[k], rest)
                                        : expr_relation_of(e, RELATION_LESS, rest, args[k]);
    return expr_piecewise(e, &condition, &d, 1, expr_int(e, 0));
}

RULE(min)
{
    return derive_extreme(w, FUNCTION_MIN, args, n, k, d);
}

RULE(max)
{
    return derive_extreme(w, FUNCTION_MAX, args, n, k, d);
}

/* ---- higher functions ---- */

static expr *gauss(tw_engine *e, expr *z, slong factor) /* factor/sqrt(pi) exp(-z^2), DLMF 7.10.1 */
{
    expr *const parts[3] = {expr_int(e, factor), power(e, expr_constant_of(e, CONSTANT_PI), -1, 2),
                            expr_call1(e, FUNCTION_EXP, expr_neg(e, square(e, z)))};
    return expr_product(e, parts, 3);
}

static expr *polygamma(tw_engine *e, expr *order, expr *z)
{
    expr *const args[2] = {order, z};
    return expr_call(e, FUNCTION_POLYGAMMA, args, 2);
}

PLAIN(erf, gauss(e, z, 2))
PLAIN(erfc, gauss(e, z, -2))
PLAIN(gamma, expr_mul(e, expr_call1(e, FUNCTION_GAMMA, z), expr_call1(e, FUNCTION_PSI, z)))
PLAIN(lngamma, expr_call1(e, FUNCTION_PSI, z))
PLAIN(psi, polygamma(e, expr_int(e, 1), z))
PLAIN(e1, expr_neg(e, expr_div(e, expr_call1(e, FUNCTION_EXP, expr_neg(e, z)), z)))
PLAIN(ei, expr_div(e, expr_call1(e, FUNCTION_EXP, z), z))

RULE(zeta)
{
    (void)args, (void)n, (void)k, (void)d;
    return fail_parameter(w, "zeta");
}

RULE(polygamma)
{
    (void)n;
    if (k == 0)
        return fail_parameter(w, "polygamma in its order");
    return expr_mul(w->engine, d, polygamma(w->engine, expr_add(w->engine, args[0], expr_int(w->engine, 1)), args[1]));
}

RULE(gamma_upper) /* DLMF 8.8.13 */
{
    tw_engine *e = w->engine;
    (void)n;
    if (k == 0)
        return fail_parameter(w, "Gamma(a, z) in a");
    expr *const parts[4] = {expr_int(e, -1), d, expr_pow(e, args[1], expr_sub(e, args[0], expr_int(e, 1))),
                            expr_call1(e, FUNCTION_EXP, expr_neg(e, args[1]))};
    return expr_product(e, parts, 4);
}

RULE(beta)
{
    tw_engine *e = w->engine;
    (void)n;
    expr *psi = expr_call1(e, FUNCTION_PSI, args[k]);
    expr *psi_sum = expr_call1(e, FUNCTION_PSI, expr_add(e, args[0], args[1]));
    expr *const parts[3] = {d, expr_call(e, FUNCTION_BETA, args, 2), expr_sub(e, psi, psi_sum)};
    return expr_product(e, parts, 3);
}

/* scale * (C(nu - 1, z) + sign * C(nu + 1, z)): DLMF 10.6.1, 10.29.1 */
static expr *derive_bessel(derivation_walk *w, function_id f, expr *const *args, size_t k, expr *d, slong sign, slong p)
{
    tw_engine *e = w->engine;
    if (k == 0)
        return fail_parameter(w, "a Bessel function in its order");
    expr *const below[2] = {expr_sub(e, args[0], expr_int(e, 1)), args[1]};
    expr *const above[2] = {expr_add(e, args[0], expr_int(e, 1)), args[1]};
    expr *both = expr_add(e, expr_call(e, f, below, 2), expr_mul(e, expr_int(e, sign), expr_call(e, f, above, 2)));
    expr *const parts[3] = {expr_frac(e, p, 2), d, both};
    return expr_product(e, parts, 3);
}

RULE(bessel_j)
{
    (void)n;
    return derive_bessel(w, FUNCTION_BESSEL_J, args, k, d, -1, 1);
}

RULE(bessel_y)
{
    (void)n;
    return derive_bessel(w, FUNCTION_BESSEL_Y, args, k, d, -1, 1);
}

RULE(bessel_i)
{
    (void)n;
    return derive_bessel(w, FUNCTION_BESSEL_I, args, k, d, 1, 1);
}

RULE(bessel_k)
{
    (void)n;
    return derive_bessel(w, FUNCTION_BESSEL_K, args, k, d, 1, -1);
}

static expr *bessel_third(tw_engine *e, function_id f, slong order, expr *zeta) /* C(order/3, zeta) */
{
    expr *const args[2] = {expr_frac(e, order, 3), zeta};
    return expr_call(e, f, args, 2);
}

/* Ai' and Bi' have no names in the language, so for real x they are written with Bessel functions of order 2/3 and
 * zeta = (2/3)|x|^(3/2)  (DLMF 9.6.3, 9.6.5, 9.6.7, 9.6.9):
 *     x > 0:  Ai'(x) = -x/(pi sqrt(3)) K(2/3, zeta),        Bi'(x) = x/sqrt(3) (I(2/3, zeta) + I(-2/3, zeta))
 *     x < 0:  Ai'(x) = |x|/3 (J(2/3, zeta) - J(-2/3, zeta)), Bi'(x) = |x|/sqrt(3) (J(-2/3, zeta) + J(2/3, zeta))
 *     x = 0:  Ai'(0) = -1/(3^(1/3) Gamma(1/3)),             Bi'(0) = 3^(1/6)/Gamma(1/3). */
static expr *airy_prime(tw_engine *e, bool bi, expr *x)
{
    expr *minus = expr_neg(e, x), *zero = expr_int(e, 0), *root = expr_sqrt(e, expr_int(e, 3));
    expr *right = expr_mul(e, expr_frac(e, 2, 3), power(e, x, 3, 2));
    expr *left = expr_mul(e, expr_frac(e, 2, 3), power(e, minus, 3, 2));
    expr *j_up = bessel_third(e, FUNCTION_BESSEL_J, 2, left), *j_down = bessel_third(e, FUNCTION_BESSEL_J, -2, left);
    expr *values[2], *at_zero = expr_call1(e, FUNCTION_GAMMA, expr_frac(e, 1, 3));
    if (bi) {
        expr *i_up = bessel_third(e, FUNCTION_BESSEL_I, 2, right);
        expr *i_down = bessel_third(e, FUNCTION_BESSEL_I, -2, right);
        expr *both = expr_add(e, i_up, i_down);
        values[0] = expr_mul(e, expr_div(e, x, root), both);
        values[1] = expr_mul(e, expr_div(e, minus, root), expr_add(e, j_down, j_up));
        at_zero = expr_div(e, power(e, expr_int(e, 3), 1, 6), at_zero);
    } else {
        expr *k = bessel_third(e, FUNCTION_BESSEL_K, 2, right);
        values[0] = expr_div(e, expr_mul(e, minus, k), expr_mul(e, expr_constant_of(e, CONSTANT_PI), root));
        values[1] = expr_mul(e, expr_div(e, minus, expr_int(e, 3)), expr_sub(e, j_up, j_down));
        at_zero = expr_neg(e, expr_div(e, power(e, expr_int(e, 3), -1, 3), at_zero));
    }
    expr *const conditions[2] = {expr_relation_of(e, RELATION_LESS, zero, x),
                                 expr_relation_of(e, RELATION_LESS, x, zero)};
    return expr_piecewise(e, conditions, values, 2, at_zero);
}

static expr *derive_airy(derivation_walk *w, bool bi, expr *z, expr *d)
{
    tw_engine *e = w->engine;
    if (expr_is_real(e, z, w->contours == 0))
        return expr_mul(e, d, airy_prime(e, bi, z));
    return fail_parameter(w, bi ? "Bi at a complex argument" : "Ai at a complex argument");
}

RULE(ai)
{
    (void)n, (void)k;
    return derive_airy(w, false, args[0], d);
}

RULE(bi)
{
    (void)n, (void)k;
    return derive_airy(w, true, args[0], d);
}

static derive_rule *const rules[FUNCTION_COUNT] = {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) derive_##derivative,
#include "engine/expr/functions.def"
#undef FUNCTION
};

/* ---- the walk ---- */

static expr *derive_sum(derivation_walk *w, expr *a)
{
    expr **terms = engine_scratch(w->engine, a->count, sizeof *terms);
    for (size_t k = 0; k < a->count; k++) {
        terms[k] = derive(w, a->args[k]);
        if (!terms[k])
            return NULL;
    }
    return expr_sum(w->engine, terms, a->count);
}

static expr *derive_product(derivation_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    expr **terms = engine_scratch(e, a->count, sizeof *terms);
    expr **factors = engine_scratch(e, a->count, sizeof *factors);
    size_t count = 0;
    for (size_t k = 0; k < a->count; k++) {
        expr *d = derive(w, a->args[k]);
        if (!d)
            return NULL;
        if (expr_is_zero(d))
            continue;
        memcpy(factors, a->args, a->count * sizeof *factors);
        factors[k] = d;
        terms[count++] = expr_product(e, factors, a->count);
    }
    return expr_sum(e, terms, count);
}

/* (u^v)' = v u^(v-1) u' + u^v log(u) v' */
static expr *derive_power(derivation_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    expr *u = a->args[0], *v = a->args[1], *du = derive(w, u), *dv = derive(w, v);
    if (!du || !dv)
        return NULL;
    expr *sum = expr_int(e, 0);
    if (!expr_is_zero(du)) {
        expr *const parts[3] = {v, expr_pow(e, u, expr_sub(e, v, expr_int(e, 1))), du};
        sum = expr_product(e, parts, 3);
    }
    if (!expr_is_zero(dv)) {
        expr *const parts[3] = {a, expr_call1(e, FUNCTION_LOG, u), dv};
        sum = expr_add(e, sum, expr_product(e, parts, 3));
    }
    return sum;
}

static expr *derive_call(derivation_walk *w, expr *a)
{
    expr **terms = engine_scratch(w->engine, a->count, sizeof *terms);
    size_t count = 0;
    for (size_t k = 0; k < a->count; k++) {
        expr *d = derive(w, a->args[k]);
        if (!d)
            return NULL;
        if (!expr_is_zero(d))
            terms[count++] = rules[a->is.function](w, a->args, a->count, k, d);
    }
    return expr_sum(w->engine, terms, count);
}

/* sign * f(end) * end' of an integral whose body is f; an infinite end does not move. */
static expr *derive_end(derivation_walk *w, expr *a, expr *end, slong sign)
{
    tw_engine *e = w->engine;
    if (end->kind == EXPR_DIRECTION)
        return expr_has(end, w->symbol) ? fail_parameter(w, "an integral whose direction depends on the variable")
                                        : expr_int(e, 0);
    expr *d = derive(w, end);
    if (!d || expr_is_zero(d))
        return d;
    expr *const parts[3] = {expr_int(e, sign), d, expr_open(e, a, end)};
    return expr_product(e, parts, 3);
}

/* The integral of the derivative, and what the two outer ends bring in; the inner points of a contour may
 * move freely. */
static expr *derive_integral(derivation_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    const size_t last = a->count - 1;
    expr **args = engine_scratch(e, a->count, sizeof *args);
    memcpy(args, a->args, a->count * sizeof *args);
    w->contours += a->kind == EXPR_CONTOUR;
    args[last] = derive(w, a->args[last]);
    w->contours -= a->kind == EXPR_CONTOUR;
    expr *const terms[3] = {node_rebind(e, a->kind, a->is.name, args, a->count), derive_end(w, a, a->args[last - 1], 1),
                            derive_end(w, a, a->args[0], -1)};
    return expr_sum(e, terms, 3);
}

static expr *derive_summation(derivation_walk *w, expr *a)
{
    if (expr_has(a->args[0], w->symbol) || expr_has(a->args[1], w->symbol))
        return fail_parameter(w, "a sum in its limits");
    expr *const args[3] = {a->args[0], a->args[1], derive(w, a->args[2])};
    return node_rebind(w->engine, EXPR_SUMMATION, a->is.name, args, 3);
}

/* r' = -P_s/P_r at the root r of P. */
static expr *derive_root(derivation_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    expr *variable = expr_fresh(e, a->is.name);
    expr *polynomial = expr_open(e, a, variable);
    if (!polynomial)
        return NULL;
    expr *slope = expr_div(e, derive(w, polynomial), expr_derivative(e, polynomial, variable));
    return expr_neg(e, expr_substitute(e, slope, variable, a));
}

static expr *derive_piecewise(derivation_walk *w, expr *a)
{
    expr **args = engine_scratch(w->engine, a->count, sizeof *args);
    for (size_t k = 0; k < a->count; k++) {
        args[k] = k % 2 == 0 && k + 1 < a->count ? a->args[k] : derive(w, a->args[k]);
        if (!args[k])
            return NULL;
    }
    return expr_rebuild(w->engine, a, args);
}

/* The chain rule over the arguments of a pattern function. */
static expr *derive_apply(derivation_walk *w, expr *a)
{
    tw_engine *e = w->engine;
    const size_t n = expr_apply_arity(a);
    expr **terms = engine_scratch(e, n, sizeof *terms), **args = engine_scratch(e, a->count, sizeof *args);
    size_t count = 0;
    for (size_t k = 0; k < n; k++) {
        expr *d = derive(w, a->args[1 + k]);
        if (!d)
            return NULL;
        if (expr_is_zero(d))
            continue;
        memcpy(args, a->args, a->count * sizeof *args);
        args[1 + n + k] = expr_add(e, args[1 + n + k], expr_int(e, 1));
        terms[count++] = args[1 + n + k] ? expr_mul(e, d, expr_rebuild(e, a, args)) : NULL;
    }
    return expr_sum(e, terms, count);
}

static expr *derive_kind(derivation_walk *w, expr *a)
{
    switch (a->kind) {
    case EXPR_SYMBOL: return expr_int(w->engine, a == w->symbol);
    case EXPR_SUM: return derive_sum(w, a);
    case EXPR_PRODUCT: return derive_product(w, a);
    case EXPR_POWER: return derive_power(w, a);
    case EXPR_CALL: return derive_call(w, a);
    case EXPR_INTEGRAL: case EXPR_CONTOUR: return derive_integral(w, a);
    case EXPR_SUMMATION: return derive_summation(w, a);
    case EXPR_ROOT: return derive_root(w, a);
    case EXPR_PIECEWISE: return derive_piecewise(w, a);
    case EXPR_APPLY: return derive_apply(w, a);
    case EXPR_RELATION: case EXPR_DIRECTION:
        engine_fail(w->engine, ERROR_VALUE, "a condition or a direction has no derivative");
        return NULL;
    default: return expr_int(w->engine, 0);
    }
}

static expr *derive(derivation_walk *w, expr *a)
{
    if ((a->names & w->symbol->names) == 0)
        return expr_int(w->engine, 0);
    expr *known = memo_find(&w->memo, a, w->contours > 0);
    if (known)
        return known;
    if (!budget_ok(w->engine))
        return NULL;
    expr *d = derive_kind(w, a);
    if (d)
        memo_keep(&w->memo, a, w->contours > 0, (void *)d);
    return d;
}

expr *expr_derivative(tw_engine *e, expr *a, expr *symbol)
{
    if (!a || !symbol)
        return NULL;
    if (symbol->kind != EXPR_SYMBOL) {
        engine_fail(e, ERROR_VALUE, "a derivative is taken in a name");
        return NULL;
    }
    const arena_place mark = arena_mark(&e->scratch);
    derivation_walk w = {.engine = e, .symbol = symbol};
    memo_init(&w.memo, e);
    expr *d = derive(&w, a);
    arena_release(&e->scratch, mark);
    return d;
}
