/* A second, plain reading of expressions for the tests: each node evaluated by the book at one point, in 200 bits,
 * without any of the constructors' rules. Integrals over finite ranges by Gauss's formula (smooth integrands only).
 * Also random numbers with a printed seed. */
#ifndef TW_TESTS_PLAIN_H
#define TW_TESTS_PLAIN_H

#include <stdarg.h>
#include <setjmp.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/expr/expr.h"

enum { PLAIN_BITS = 200, PLAIN_NODES = 40 };

typedef struct plain_env {
    size_t count;
    expr *symbols[16];
    acb_struct values[16];
} plain_env;

static inline void plain_env_init(plain_env *v)
{
    v->count = 0;
    for (size_t k = 0; k < 16; k++)
        acb_init(v->values + k);
}

static inline void plain_env_clear(plain_env *v)
{
    for (size_t k = 0; k < 16; k++)
        acb_clear(v->values + k);
}

static inline void plain_bind(plain_env *v, expr *symbol, const acb_t value)
{
    size_t k = 0;
    while (k < v->count && v->symbols[k] != symbol)
        k++;
    assert_true(k < 16);
    v->symbols[k] = symbol;
    acb_set(v->values + k, value);
    if (k == v->count)
        v->count++;
}

static inline void plain_eval(tw_engine *e, acb_t out, expr *a, plain_env *v);

static inline void plain_call(tw_engine *e, acb_t out, expr *a, plain_env *v)
{
    const slong p = PLAIN_BITS;
    acb_t z, w;
    acb_init(z);
    acb_init(w);
    plain_eval(e, z, a->args[0], v);
    if (a->count > 1)
        plain_eval(e, w, a->args[1], v);
    switch (a->is.function) {
    case FUNCTION_EXP: acb_exp(out, z, p); break;
    case FUNCTION_LOG: acb_log(out, z, p); break;
    case FUNCTION_ABS: acb_abs(acb_realref(out), z, p); arb_zero(acb_imagref(out)); break;
    case FUNCTION_SIN: acb_sin(out, z, p); break;
    case FUNCTION_COS: acb_cos(out, z, p); break;
    case FUNCTION_TAN: acb_tan(out, z, p); break;
    case FUNCTION_SINH: acb_sinh(out, z, p); break;
    case FUNCTION_COSH: acb_cosh(out, z, p); break;
    case FUNCTION_TANH: acb_tanh(out, z, p); break;
    case FUNCTION_ASIN: acb_asin(out, z, p); break;
    case FUNCTION_ACOS: acb_acos(out, z, p); break;
    case FUNCTION_ATAN: acb_atan(out, z, p); break;
    case FUNCTION_ASINH: acb_asinh(out, z, p); break;
    case FUNCTION_ACOSH: acb_acosh(out, z, p); break;
    case FUNCTION_ATANH: acb_atanh(out, z, p); break;
    case FUNCTION_RE: arb_set(acb_realref(out), acb_realref(z)); arb_zero(acb_imagref(out)); break;
    case FUNCTION_IM: arb_set(acb_realref(out), acb_imagref(z)); arb_zero(acb_imagref(out)); break;
    case FUNCTION_CONJ: acb_conj(out, z); break;
    case FUNCTION_ARG: acb_arg(acb_realref(out), z, p); arb_zero(acb_imagref(out)); break;
    case FUNCTION_SIGN: arb_sgn(acb_realref(out), acb_realref(z)); arb_zero(acb_imagref(out)); break;
    case FUNCTION_MIN: case FUNCTION_MAX:
        acb_set(out, z);
        for (size_t k = 1; k < a->count; k++) {
            plain_eval(e, w, a->args[k], v);
            if (a->is.function == FUNCTION_MIN)
                arb_min(acb_realref(out), acb_realref(out), acb_realref(w), p);
            else
                arb_max(acb_realref(out), acb_realref(out), acb_realref(w), p);
        }
        break;
    case FUNCTION_ERF: acb_hypgeom_erf(out, z, p); break;
    case FUNCTION_ERFC: acb_hypgeom_erfc(out, z, p); break;
    case FUNCTION_GAMMA: acb_gamma(out, z, p); break;
    case FUNCTION_GAMMA_UPPER: acb_hypgeom_gamma_upper(out, z, w, 0, p); break;
    case FUNCTION_LNGAMMA: acb_lgamma(out, z, p); break;
    case FUNCTION_PSI: acb_digamma(out, z, p); break;
    case FUNCTION_POLYGAMMA: acb_polygamma(out, z, w, p); break;
    case FUNCTION_BETA: acb_hypgeom_beta_lower(out, z, w, (acb_one(out), out), 0, p); break;
    case FUNCTION_ZETA: acb_zeta(out, z, p); break;
    case FUNCTION_E1: acb_hypgeom_expint(out, (acb_one(w), w), z, p); break;
    case FUNCTION_EI: acb_hypgeom_ei(out, z, p); break;
    case FUNCTION_AI: acb_hypgeom_airy(out, NULL, NULL, NULL, z, p); break;
    case FUNCTION_BI: acb_hypgeom_airy(NULL, NULL, out, NULL, z, p); break;
    case FUNCTION_BESSEL_J: acb_hypgeom_bessel_j(out, z, w, p); break;
    case FUNCTION_BESSEL_Y: acb_hypgeom_bessel_y(out, z, w, p); break;
    case FUNCTION_BESSEL_I: acb_hypgeom_bessel_i(out, z, w, p); break;
    case FUNCTION_BESSEL_K: acb_hypgeom_bessel_k(out, z, w, p); break;
    default: acb_indeterminate(out); break;
    }
    acb_clear(z);
    acb_clear(w);
}

static inline void plain_binder(tw_engine *e, acb_t out, expr *a, plain_env *v)
{
    const slong p = PLAIN_BITS;
    expr *t = expr_fresh(e, "t");
    expr *body = expr_open(e, a, t);
    acb_t from, to, at, value;
    arb_t node, weight;
    acb_init(from);
    acb_init(to);
    acb_init(at);
    acb_init(value);
    arb_init(node);
    arb_init(weight);
    plain_eval(e, from, a->args[0], v);
    plain_eval(e, to, a->args[1], v);
    acb_zero(out);
    if (a->kind == EXPR_SUMMATION) {
        const double first = arf_get_d(arb_midref(acb_realref(from)), ARF_RND_NEAR);
        const double last = arf_get_d(arb_midref(acb_realref(to)), ARF_RND_NEAR);
        for (double k = first; k <= last; k++) {
            acb_set_d(at, k);
            plain_bind(v, t, at);
            plain_eval(e, value, body, v);
            acb_add(out, out, value, p);
            v->count--;
        }
    } else {
        acb_sub(to, to, from, p);
        acb_mul_2exp_si(to, to, -1);
        acb_add(from, from, to, p);
        for (ulong k = 0; k < PLAIN_NODES; k++) {
            arb_hypgeom_legendre_p_ui_root(node, weight, PLAIN_NODES, k, p);
            acb_set(at, from);
            acb_addmul_arb(at, to, node, p);
            acb_get_mid(at, at);
            plain_bind(v, t, at);
            plain_eval(e, value, body, v);
            acb_addmul_arb(out, value, weight, p);
            v->count--;
        }
        acb_mul(out, out, to, p);
    }
    acb_clear(from);
    acb_clear(to);
    acb_clear(at);
    acb_clear(value);
    arb_clear(node);
    arb_clear(weight);
}

static inline bool plain_holds(tw_engine *e, expr *relation, plain_env *v)
{
    acb_t left, right;
    acb_init(left);
    acb_init(right);
    plain_eval(e, left, relation->args[0], v);
    plain_eval(e, right, relation->args[1], v);
    const double a = arf_get_d(arb_midref(acb_realref(left)), ARF_RND_NEAR);
    const double b = arf_get_d(arb_midref(acb_realref(right)), ARF_RND_NEAR);
    acb_clear(left);
    acb_clear(right);
    switch (relation->is.relation) {
    case RELATION_LESS: return a < b;
    case RELATION_LESS_EQUAL: return a <= b;
    case RELATION_EQUAL: return a == b;
    default: return a != b;
    }
}

static inline void plain_piecewise(tw_engine *e, acb_t out, expr *a, plain_env *v)
{
    for (size_t k = 0; k + 1 < a->count; k += 2)
        if (plain_holds(e, a->args[k], v)) {
            plain_eval(e, out, a->args[k + 1], v);
            return;
        }
    plain_eval(e, out, a->args[a->count - 1], v);
}

static inline void plain_eval(tw_engine *e, acb_t out, expr *a, plain_env *v)
{
    const slong p = PLAIN_BITS;
    acb_t part, total;
    acb_init(part);
    acb_init(total);
    acb_indeterminate(total);
    switch (a->kind) {
    case EXPR_NUMBER: acb_set_fmpq(total, &a->is.number, p); break;
    case EXPR_CONSTANT:
        acb_zero(total);
        if (a->is.constant == CONSTANT_PI)
            acb_const_pi(total, p);
        else if (a->is.constant == CONSTANT_I)
            acb_onei(total);
        else if (a->is.constant == CONSTANT_EULER)
            arb_const_euler(acb_realref(total), p);
        else
            acb_indeterminate(total);
        break;
    case EXPR_SYMBOL:
        for (size_t k = 0; k < v->count; k++)
            if (v->symbols[k] == a)
                acb_set(total, v->values + k);
        break;
    case EXPR_SUM: case EXPR_PRODUCT:
        acb_set_si(total, a->kind == EXPR_PRODUCT);
        for (size_t k = 0; k < a->count; k++) {
            plain_eval(e, part, a->args[k], v);
            if (a->kind == EXPR_SUM)
                acb_add(total, total, part, p);
            else
                acb_mul(total, total, part, p);
        }
        break;
    case EXPR_POWER:
        plain_eval(e, total, a->args[0], v);
        plain_eval(e, part, a->args[1], v);
        acb_pow(total, total, part, p);
        break;
    case EXPR_CALL: plain_call(e, total, a, v); break;
    case EXPR_INTEGRAL: case EXPR_SUMMATION: plain_binder(e, total, a, v); break;
    case EXPR_PIECEWISE: plain_piecewise(e, total, a, v); break;
    default: break;
    }
    acb_swap(out, total);
    acb_clear(part);
    acb_clear(total);
}

/* Is the ball known well enough to be compared? */
static inline bool plain_is_sharp(const acb_t z)
{
    return acb_is_finite(z) && acb_rel_accuracy_bits(z) > 60;
}

/* Distance relative to 1 + |z|, as a double. */
static inline double plain_distance(const acb_t z, const acb_t w)
{
    acb_t difference;
    arb_t size;
    acb_init(difference);
    arb_init(size);
    acb_sub(difference, z, w, PLAIN_BITS);
    acb_abs(size, difference, PLAIN_BITS);
    const double distance = arf_get_d(arb_midref(size), ARF_RND_NEAR);
    acb_abs(size, z, PLAIN_BITS);
    const double scale = 1 + arf_get_d(arb_midref(size), ARF_RND_NEAR);
    acb_clear(difference);
    arb_clear(size);
    return distance / scale;
}

/* ---- random numbers ---- */

static uint64_t plain_state;

static inline void plain_seed(const char *program)
{
    const char *given = getenv("TW_SEED");
    plain_state = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL) * 2654435761u;
    printf("%s: TW_SEED=%llu\n", program, (unsigned long long)plain_state);
    plain_state |= 1;
}

static inline uint64_t plain_random(uint64_t below)
{
    plain_state = plain_state * 6364136223846793005u + 1442695040888963407u;
    return (plain_state >> 33) % below;
}

static inline double plain_uniform(double from, double to)
{
    return from + (to - from) * (double)plain_random(1u << 30) / (double)(1u << 30);
}

#endif
