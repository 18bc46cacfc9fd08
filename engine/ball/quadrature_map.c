/* The change of variable of a piece, done on the expression: powers of y are pulled out of every sum, product and
 * power, so that a fractional power of y, a pole of y or an algebraic tail become whole powers of the new variable.
 * Knows no numbers.
 *
 * Each rewriting is an identity for y > 0; where the new form is analytic on a disc, the integral along the real axis
 * is that of the analytic function, whatever the old form's branches do off the axis. */
#include "engine/ball/quadrature_piece.h"

#include <stdlib.h>

/* a = w^q * rest for w > 0, where y = w^sign. */
typedef struct pulled {
    fmpq_t q;
    expr *rest;
} pulled;

typedef struct puller {
    tw_engine *e;
    expr *y, *w;
    int sign;
} puller;

enum { POLYNOMIAL_LIMIT = 16 };

static void pull(pulled *out, puller *p, expr *a);

static void pulled_init(pulled *a)
{
    fmpq_init(a->q);
    a->rest = NULL;
}

static expr *assemble(puller *p, const pulled *a)
{
    return expr_mul(p->e, expr_pow(p->e, p->w, expr_fmpq(p->e, a->q)), a->rest);
}

static expr *pull_whole(puller *p, expr *a)
{
    pulled t;
    pulled_init(&t);
    pull(&t, p, a);
    expr *whole = assemble(p, &t);
    fmpq_clear(t.q);
    return whole;
}

/* The terms measured against the lowest power of w among them. */
static void pull_terms(pulled *out, puller *p, pulled *terms, size_t n)
{
    expr **rests = base_alloc((n + 1) * sizeof *rests);
    size_t used = 0;
    for (size_t k = 0; k < n; k++)
        if (terms[k].rest && !expr_is_zero(terms[k].rest) && (used++ == 0 || fmpq_cmp(terms[k].q, out->q) < 0))
            fmpq_set(out->q, terms[k].q);
    for (size_t k = 0; k < n; k++) {
        fmpq_sub(terms[k].q, terms[k].q, out->q);
        rests[k] = terms[k].rest && expr_is_zero(terms[k].rest) ? terms[k].rest : assemble(p, &terms[k]);
    }
    out->rest = expr_sum(p->e, rests, n);
    free(rests);
}

static void pull_sum(pulled *out, puller *p, expr *a)
{
    expr **coefficients = NULL;
    slong degree = 0;
    bool polynomial = expr_polynomial(p->e, a, p->y, POLYNOMIAL_LIMIT, &coefficients, &degree) == TW_OK;
    size_t n = polynomial ? (size_t)degree + 1 : a->count;
    pulled *terms = base_alloc(n * sizeof *terms);
    for (size_t k = 0; k < n; k++) {
        pulled_init(&terms[k]);
        if (polynomial) {
            fmpq_set_si(terms[k].q, (slong)k * p->sign, 1);
            terms[k].rest = coefficients[k];
        } else {
            pull(&terms[k], p, a->args[k]);
        }
    }
    pull_terms(out, p, terms, n);
    for (size_t k = 0; k < n; k++)
        fmpq_clear(terms[k].q);
    free(terms);
    if (polynomial)
        free(coefficients);
}

static void pull_product(pulled *out, puller *p, expr *a)
{
    expr **rests = base_alloc(a->count * sizeof *rests);
    pulled t;
    pulled_init(&t);
    for (uint32_t k = 0; k < a->count; k++) {
        pull(&t, p, a->args[k]);
        fmpq_add(out->q, out->q, t.q);
        rests[k] = t.rest;
    }
    out->rest = expr_product(p->e, rests, a->count);
    fmpq_clear(t.q);
    free(rests);
}

static void pull_power(pulled *out, puller *p, expr *a)
{
    pulled t;
    pulled_init(&t);
    pull(&t, p, a->args[0]);
    expr *exponent = expr_has(a->args[1], p->y) ? pull_whole(p, a->args[1]) : a->args[1];
    if (exponent && expr_is_number(exponent)) {
        fmpq_mul(out->q, t.q, expr_number(exponent));
        out->rest = expr_pow(p->e, t.rest, exponent);
    } else { /* w^(q v) rest^v */
        expr *q = expr_fmpq(p->e, t.q);
        out->rest = expr_mul(p->e, expr_pow(p->e, p->w, expr_mul(p->e, q, exponent)), expr_pow(p->e, t.rest, exponent));
    }
    fmpq_clear(t.q);
}

static void pull_call(pulled *out, puller *p, expr *a)
{
    if (a->is.function == FUNCTION_LOG) {
        pulled t;
        pulled_init(&t);
        pull(&t, p, a->args[0]);
        expr *q = expr_fmpq(p->e, t.q);
        out->rest = expr_add(p->e, expr_mul(p->e, q, expr_call1(p->e, FUNCTION_LOG, p->w)),
                             expr_call1(p->e, FUNCTION_LOG, t.rest));
        fmpq_clear(t.q);
        return;
    }
    expr **args = base_alloc(a->count * sizeof *args);
    for (uint32_t k = 0; k < a->count; k++)
        args[k] = pull_whole(p, a->args[k]);
    out->rest = expr_call(p->e, a->is.function, args, a->count);
    free(args);
}

static void pull(pulled *out, puller *p, expr *a)
{
    fmpq_zero(out->q);
    out->rest = NULL;
    if (!a || !budget_ok(p->e))
        return;
    if (a == p->y) {
        fmpq_set_si(out->q, p->sign, 1);
        out->rest = expr_int(p->e, 1);
    } else if (!expr_has(a, p->y)) {
        out->rest = a;
    } else if (a->kind == EXPR_SUM) {
        pull_sum(out, p, a);
    } else if (a->kind == EXPR_PRODUCT) {
        pull_product(out, p, a);
    } else if (a->kind == EXPR_POWER) {
        pull_power(out, p, a);
    } else if (a->kind == EXPR_CALL) {
        pull_call(out, p, a);
    } else {
        out->rest = expr_substitute(p->e, a, p->y, expr_pow(p->e, p->w, expr_int(p->e, p->sign)));
    }
}

/* The least common denominator of the powers of w in a. */
static void collect_denominators(fmpz_t k, expr *a, expr *w)
{
    if (!expr_has(a, w))
        return;
    if (a->kind == EXPR_POWER && a->args[0] == w && expr_is_number(a->args[1])) {
        fmpz_lcm(k, k, fmpq_denref(expr_number(a->args[1])));
        return;
    }
    for (uint32_t j = 0; j < a->count; j++)
        collect_denominators(k, a->args[j], w);
}

/* w -> t^k (k > 0) or e^t (k = 0), its powers and its logarithm directly. */
static expr *put_variable(tw_engine *e, expr *a, expr *w, expr *t, ulong k)
{
    if (!a || !expr_has(a, w))
        return a;
    expr *power = expr_int(e, (slong)k);
    if (a == w)
        return k ? expr_pow(e, t, power) : expr_call1(e, FUNCTION_EXP, t);
    if (a->kind == EXPR_POWER && a->args[0] == w && !expr_has(a->args[1], w)) {
        if (k && expr_is_number(a->args[1]))
            return expr_pow(e, t, expr_mul(e, power, a->args[1]));
        expr *log_w = k ? expr_mul(e, power, expr_call1(e, FUNCTION_LOG, t)) : t;
        return expr_call1(e, FUNCTION_EXP, expr_mul(e, a->args[1], log_w));
    }
    if (expr_is_call(a, FUNCTION_LOG) && a->args[0] == w)
        return k ? expr_mul(e, power, expr_call1(e, FUNCTION_LOG, t)) : t;
    expr **args = base_alloc(a->count * sizeof *args);
    for (uint32_t j = 0; j < a->count; j++)
        args[j] = put_variable(e, a->args[j], w, t, k);
    expr *out = NULL;
    switch ((expr_kind)a->kind) {
    case EXPR_SUM:
        out = expr_sum(e, args, a->count);
        break;
    case EXPR_PRODUCT:
        out = expr_product(e, args, a->count);
        break;
    case EXPR_POWER:
        out = expr_pow(e, args[0], args[1]);
        break;
    case EXPR_CALL:
        out = expr_call(e, a->is.function, args, a->count);
        break;
    default:
        out = expr_substitute(e, a, w, k ? expr_pow(e, t, power) : expr_call1(e, FUNCTION_EXP, t));
    }
    free(args);
    return out;
}

expr *quad_map_integrand(tw_engine *e, expr *f, expr *y, expr *t, quad_map map, ulong *k)
{
    *k = 1;
    if (map == QUAD_PLAIN)
        return expr_substitute(e, f, y, t);
    puller p = {.e = e, .y = y, .w = expr_fresh(e, "w"), .sign = map == QUAD_INVERSE ? -1 : 1};
    pulled a;
    fmpz_t lcm;
    expr *F = NULL;
    pulled_init(&a);
    fmpz_init_set_ui(lcm, 1);
    pull(&a, &p, f);
    fmpq_add_si(a.q, a.q, map == QUAD_INVERSE ? -2 : 0); /* dy = w^-2 dw */
    if (a.rest && map == QUAD_EXP) {
        *k = 0;
        fmpq_add_si(a.q, a.q, 1); /* dy = e^t dt */
        F = expr_mul(e, expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_fmpq(e, a.q), t)), put_variable(e, a.rest, p.w,
                t, 0));
    } else if (a.rest) {
        fmpz_set(lcm, fmpq_denref(a.q));
        collect_denominators(lcm, a.rest, p.w);
        if (fmpz_cmp_ui(lcm, 1000) <= 0) { /* w^q dw = k t^(k q + k - 1) dt */
            *k = fmpz_get_ui(lcm);
            fmpq_add_si(a.q, a.q, 1);
            fmpq_mul_fmpz(a.q, a.q, lcm);
            fmpq_sub_si(a.q, a.q, 1);
            expr *factors[] = {expr_int(e, (slong)*k), expr_pow(e, t, expr_fmpq(e, a.q)), put_variable(e, a.rest, p.w,
                    t, *k)};
            F = expr_product(e, factors, 3);
        }
    }
    fmpq_clear(a.q);
    fmpz_clear(lcm);
    return F;
}

/* ---- Q exp(L) ---- */

static bool power_is_high(expr *a)
{
    return a->kind == EXPR_POWER && expr_is_number(a->args[1]) &&
           (fmpz_bits(fmpq_numref(expr_number(a->args[1]))) > 3 + fmpz_bits(fmpq_denref(expr_number(a->args[1]))));
}

void quad_split(tw_engine *e, expr *F, expr *t, expr **Q, expr **L)
{
    expr *const *factors;
    size_t n = expr_factors(&F, &factors);
    expr **plain = base_alloc((n + 1) * sizeof *plain), **logs = base_alloc((n + 1) * sizeof *logs);
    size_t plain_count = 0, log_count = 0;
    for (size_t k = 0; k < n; k++) {
        if (!expr_has(factors[k], t))
            plain[plain_count++] = factors[k];
        else if (expr_is_call(factors[k], FUNCTION_EXP))
            logs[log_count++] = factors[k]->args[0];
        else if (power_is_high(factors[k]))
            logs[log_count++] = expr_mul(e, factors[k]->args[1], expr_call1(e, FUNCTION_LOG, factors[k]->args[0]));
        else
            plain[plain_count++] = factors[k];
    }
    *Q = expr_product(e, plain, plain_count);
    *L = log_count ? expr_sum(e, logs, log_count) : NULL;
    if (*L) {
        expr *slope = expr_derivative(e, *L, t);
        if (!slope || !expr_has(slope, t))
            *L = NULL;
    }
    free(plain);
    free(logs);
}
