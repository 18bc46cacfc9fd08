/* Functions at exact arguments: elementary ones. Knows only values and reductions that are true for all complex
 * arguments on the principal branch (DLMF chapter 4); the higher functions are in special.c. */
#include "engine/expr/exact.h"

#include <stdlib.h>
#include <string.h>

expr *call_undefined(tw_engine *e, function_id f, const char *where)
{
    engine_fail(e, ERROR_VALUE, "%s has no value at %s", function_name(f), where);
    return NULL;
}

bool number_is_integer(expr *a)
{
    return a->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(&a->is.number));
}

bool number_is_half(expr *a)
{
    return a->kind == EXPR_NUMBER && fmpz_equal_si(fmpq_denref(&a->is.number), 2);
}

/* a = re + im*i with rational parts? */
static bool as_gaussian(expr *a, fmpq_t re, fmpq_t im)
{
    expr *const *terms;
    const size_t n = expr_terms(&a, &terms);
    fmpq_zero(re);
    fmpq_zero(im);
    for (size_t k = 0; k < n; k++) {
        expr *t = terms[k];
        if (t->kind == EXPR_NUMBER)
            fmpq_set(re, &t->is.number);
        else if (expr_is_constant(t, CONSTANT_I))
            fmpq_one(im);
        else if (t->kind == EXPR_PRODUCT && t->count == 2 && t->args[0]->kind == EXPR_NUMBER &&
                 expr_is_constant(t->args[1], CONSTANT_I))
            fmpq_set(im, &t->args[0]->is.number);
        else
            return false;
    }
    return true;
}

/* a = r*pi with rational r? */
static bool as_multiple_of_pi(expr *a, fmpq_t r)
{
    if (expr_is_zero(a)) {
        fmpq_zero(r);
        return true;
    }
    if (expr_is_constant(a, CONSTANT_PI)) {
        fmpq_one(r);
        return true;
    }
    if (a->kind != EXPR_PRODUCT || a->count != 2 || a->args[0]->kind != EXPR_NUMBER ||
        !expr_is_constant(a->args[1], CONSTANT_PI))
        return false;
    fmpq_set(r, &a->args[0]->is.number);
    return true;
}

static expr *half_root(tw_engine *e, slong n) /* sqrt(n)/2 */
{
    return expr_mul(e, expr_frac(e, 1, 2), expr_sqrt(e, expr_int(e, n)));
}

/* sin(pi*k/12) for k = 0, 2, 3, 4, 6; NULL elsewhere (no error). */
static expr *sine_of_twelfth(tw_engine *e, slong k)
{
    switch (k) {
    case 0: return expr_int(e, 0);
    case 2: return expr_frac(e, 1, 2);
    case 3: return half_root(e, 2);
    case 4: return half_root(e, 3);
    case 6: return expr_int(e, 1);
    default: return NULL;
    }
}

/* sin(pi*r) when r is a multiple of 1/12 with a plain value. */
static expr *sine_of_turn(tw_engine *e, const fmpq_t r)
{
    fmpz_t k;
    if (fmpz_cmp_si(fmpq_denref(r), 12) > 0)
        return NULL;
    const slong den = fmpz_get_si(fmpq_denref(r));
    if (12 % den != 0)
        return NULL;
    fmpz_init(k);
    fmpz_mul_si(k, fmpq_numref(r), 12 / den);
    slong step = (slong)fmpz_fdiv_ui(k, 24);
    fmpz_clear(k);
    const bool minus = step >= 12;
    step %= 12;
    expr *value = sine_of_twelfth(e, step > 6 ? 12 - step : step);
    return value && minus ? expr_neg(e, value) : value;
}

static bool decide_value(expr **value, expr *found)
{
    *value = found;
    return true;
}

/* f(-u) = sign * f(u) with u leading plus. */
static bool by_parity(tw_engine *e, function_id f, expr *a, slong sign, expr **value)
{
    if (!expr_leads_negative(a))
        return false;
    return decide_value(value, expr_mul(e, expr_int(e, sign), expr_call1(e, f, expr_neg(e, a))));
}

static bool exact_exp(tw_engine *e, expr *a, expr **value)
{
    if (expr_is_inf(a))
        return decide_value(value, a);
    if (expr_is_minus_inf(a))
        return decide_value(value, expr_int(e, 0));
    if (expr_is_call(a, FUNCTION_LOG))
        return decide_value(value, a->args[0]);
    if (a->kind != EXPR_PRODUCT)
        return false;
    size_t logs = 0, at = 0;
    for (size_t k = 0; k < a->count; k++)
        if (expr_is_call(a->args[k], FUNCTION_LOG)) {
            logs++;
            at = k;
        }
    if (logs == 1) { /* exp(v*log(u)) is u^v by definition */
        expr **others = engine_scratch(e, a->count, sizeof *others);
        memcpy(others, a->args, a->count * sizeof *others);
        others[at] = expr_int(e, 1);
        return decide_value(value, expr_pow(e, a->args[at]->args[0], expr_product(e, others, a->count)));
    }
    /* exp(i*pi*r) for r a multiple of 1/2 */
    if (a->count == 3 && a->args[0]->kind == EXPR_NUMBER && fmpz_cmp_ui(fmpq_denref(&a->args[0]->is.number), 2) <= 0 &&
        expr_is_constant(a->args[1], CONSTANT_PI) && expr_is_constant(a->args[2], CONSTANT_I))
        return decide_value(value, minus_one_power(e, &a->args[0]->is.number));
    if (a->count == 2 && expr_is_constant(a->args[0], CONSTANT_PI) && expr_is_constant(a->args[1], CONSTANT_I))
        return decide_value(value, expr_int(e, -1));
    return false;
}

/* The greatest k with n = root^k; n > 1. */
static slong perfect_power(fmpz_t root, const fmpz_t n)
{
    slong total = 1;
    fmpz_set(root, n);
    for (int k; fmpz_bits(root) <= 8192 && (k = fmpz_is_perfect_power(root, root)) > 1;)
        total *= k;
    return total;
}

static bool log_of_positive(tw_engine *e, const fmpq_t q, expr **value)
{
    fmpq_t root;
    fmpq_init(root);
    const bool fraction = fmpz_is_one(fmpq_numref(q));
    slong k = fraction ? 0 : perfect_power(fmpq_numref(root), fmpq_numref(q));
    if (!fmpz_is_one(fmpq_denref(q))) {
        slong below = perfect_power(fmpq_denref(root), fmpq_denref(q));
        slong common = (slong)n_gcd((ulong)k, (ulong)below);
        fmpz_pow_ui(fmpq_numref(root), fraction ? fmpq_numref(q) : fmpq_numref(root),
            fraction ? 1 : (ulong)(k / common));
        fmpz_pow_ui(fmpq_denref(root), fmpq_denref(root), (ulong)(below / common));
        k = common;
    }
    if (fraction) {
        fmpz_swap(fmpq_numref(root), fmpq_denref(root));
        k = -k;
    }
    bool found = k != 1;
    if (found)
        *value = expr_mul(e, expr_int(e, k), expr_call1(e, FUNCTION_LOG, expr_fmpq(e, root)));
    fmpq_clear(root);
    return found;
}

static bool exact_log(tw_engine *e, expr *a, expr **value)
{
    if (expr_is_zero(a))
        return decide_value(value, call_undefined(e, FUNCTION_LOG, "0"));
    if (expr_is_one(a))
        return decide_value(value, expr_int(e, 0));
    if (expr_is_inf(a))
        return decide_value(value, a);
    expr *i = expr_constant_of(e, CONSTANT_I), *pi = expr_constant_of(e, CONSTANT_PI), *turn = expr_mul(e, i, pi);
    if (a == i || a == expr_neg(e, i))
        return decide_value(value, expr_mul(e, expr_frac(e, a == i ? 1 : -1, 2), turn));
    if (expr_leads_negative(a) && (a->kind == EXPR_NUMBER || expr_is_positive_constant(expr_neg(e, a))))
        return decide_value(value, expr_add(e, expr_call1(e, FUNCTION_LOG, expr_neg(e, a)), turn));
    if (a->kind == EXPR_NUMBER)
        return log_of_positive(e, &a->is.number, value);
    if (expr_is_call(a, FUNCTION_EXP) && expr_is_real_constant(a->args[0]))
        return decide_value(value, a->args[0]);
    if (a->kind == EXPR_POWER && expr_is_positive_constant(a->args[0]) && expr_is_real_constant(a->args[1]))
        return decide_value(value, expr_mul(e, a->args[1], expr_call1(e, FUNCTION_LOG, a->args[0])));
    return false;
}

/* Writes the part of a product that is a rational number's modulus and positive constants, and what remains. */
static bool take_positive(tw_engine *e, expr *a, expr **positive, expr **rest, int *sign)
{
    expr *const *factors;
    const size_t n = expr_factors(&a, &factors);
    expr **out = engine_scratch(e, n, sizeof *out), **in = engine_scratch(e, n, sizeof *in);
    size_t taken = 0, left = 0;
    *sign = 1;
    for (size_t k = 0; k < n; k++) {
        if (factors[k]->kind == EXPR_NUMBER) {
            *sign = fmpq_sgn(&factors[k]->is.number);
            out[taken++] = *sign < 0 ? expr_neg(e, factors[k]) : factors[k];
        } else if (expr_is_positive_constant(factors[k])) {
            out[taken++] = factors[k];
        } else {
            in[left++] = factors[k];
        }
    }
    *positive = expr_product(e, out, taken);
    *rest = expr_product(e, in, left);
    return taken > 0;
}

static bool exact_abs(tw_engine *e, expr *a, expr **value)
{
    expr *positive, *rest;
    int sign;
    if (expr_is_zero(a) || expr_is_call(a, FUNCTION_ABS) || expr_is_inf(a))
        return decide_value(value, a);
    if (expr_is_constant(a, CONSTANT_I))
        return decide_value(value, expr_int(e, 1));
    if (take_positive(e, a, &positive, &rest, &sign)) {
        if (!rest || expr_is_one(rest))
            return decide_value(value, rest ? positive : NULL);
        return decide_value(value, expr_mul(e, positive, expr_call1(e, FUNCTION_ABS, rest)));
    }
    fmpq_t re, im;
    fmpq_init(re);
    fmpq_init(im);
    bool gaussian = as_gaussian(a, re, im);
    if (gaussian) {
        fmpq_mul(re, re, re);
        fmpq_addmul(re, im, im);
        *value = expr_sqrt(e, expr_fmpq(e, re));
    }
    fmpq_clear(re);
    fmpq_clear(im);
    return gaussian || by_parity(e, FUNCTION_ABS, a, 1, value);
}

static bool exact_sign(tw_engine *e, expr *a, expr **value)
{
    expr *positive, *rest;
    int sign;
    if (expr_is_zero(a))
        return decide_value(value, a);
    if (expr_is_inf(a))
        return decide_value(value, expr_int(e, 1));
    if (take_positive(e, a, &positive, &rest, &sign)) {
        if (!rest || expr_is_one(rest))
            return decide_value(value, rest ? expr_int(e, sign) : NULL);
        return decide_value(value, expr_mul(e, expr_int(e, sign), expr_call1(e, FUNCTION_SIGN, rest)));
    }
    return by_parity(e, FUNCTION_SIGN, a, -1, value);
}

static bool exact_sine(tw_engine *e, function_id f, expr *a, expr **value)
{
    fmpq_t r;
    fmpq_init(r);
    bool found = false;
    if (as_multiple_of_pi(a, r)) {
        expr *sine = f != FUNCTION_COS ? sine_of_turn(e, r) : NULL, *cosine = NULL;
        fmpq_t half;
        fmpq_init(half);
        fmpq_set_si(half, 1, 2);
        fmpq_add(r, r, half);
        fmpq_clear(half);
        if (f != FUNCTION_SIN)
            cosine = sine_of_turn(e, r);
        if (f == FUNCTION_TAN && sine && cosine) {
            *value = expr_is_zero(cosine) ? call_undefined(e, f, "an odd multiple of pi/2") : expr_div(e, sine, cosine);
            found = true;
        } else if (f != FUNCTION_TAN && (sine || cosine)) {
            *value = sine ? sine : cosine;
            found = true;
        }
    }
    fmpq_clear(r);
    return found || by_parity(e, f, a, f == FUNCTION_COS ? 1 : -1, value);
}

/* asin of the plain values of the sine. */
static expr *arcsine(tw_engine *e, expr *a)
{
    static const slong twelfths[] = {2, 3, 4, 6};
    for (size_t k = 0; k < sizeof twelfths / sizeof *twelfths; k++) {
        expr *sine = sine_of_twelfth(e, twelfths[k]);
        slong sign = a == sine ? 1 : sine && a == expr_neg(e, sine) ? -1 : 0;
        if (sign)
            return expr_mul(e, expr_frac(e, sign * twelfths[k], 12), expr_constant_of(e, CONSTANT_PI));
    }
    return expr_is_zero(a) ? a : NULL;
}

static bool exact_asin(tw_engine *e, function_id f, expr *a, expr **value)
{
    expr *angle = arcsine(e, a);
    if (!angle)
        return f == FUNCTION_ASIN && by_parity(e, f, a, -1, value);
    if (f == FUNCTION_ACOS)
        angle = expr_sub(e, expr_mul(e, expr_frac(e, 1, 2), expr_constant_of(e, CONSTANT_PI)), angle);
    return decide_value(value, angle);
}

static bool exact_atan(tw_engine *e, expr *a, expr **value)
{
    expr *pi = expr_constant_of(e, CONSTANT_PI), *root = expr_sqrt(e, expr_int(e, 3));
    slong part = expr_is_one(a) ? 4 : a == root ? 3 : expr_is_inf(a) ? 2 : 0;
    if (expr_is_zero(a))
        return decide_value(value, a);
    if (root && a == expr_div(e, root, expr_int(e, 3)))
        part = 6;
    if (part)
        return decide_value(value, expr_mul(e, expr_frac(e, 1, part), pi));
    return by_parity(e, FUNCTION_ATAN, a, -1, value);
}

static bool exact_hyperbolic(tw_engine *e, function_id f, expr *a, expr **value)
{
    const bool even = f == FUNCTION_COSH;
    if (expr_is_zero(a))
        return decide_value(value, expr_int(e, even));
    if (expr_is_inf(a) && f != FUNCTION_ATANH)
        return decide_value(value, f == FUNCTION_TANH ? expr_int(e, 1) : a);
    if (f == FUNCTION_ATANH && (expr_is_int(a, 1) || expr_is_int(a, -1)))
        return decide_value(value, call_undefined(e, f, "1 and -1"));
    return by_parity(e, f, a, even ? 1 : -1, value);
}

static bool exact_parts(tw_engine *e, function_id f, expr *a, expr **value)
{
    if (expr_is_real_constant(a)) {
        if (f == FUNCTION_ARG) {
            if (!expr_is_positive_constant(a) && !(a->kind == EXPR_NUMBER && fmpq_sgn(&a->is.number) < 0))
                return false;
            const bool positive = expr_is_positive_constant(a);
            return decide_value(value, positive ? expr_int(e, 0) : expr_constant_of(e, CONSTANT_PI));
        }
        return decide_value(value, f == FUNCTION_IM ? expr_int(e, 0) : a);
    }
    fmpq_t re, im;
    fmpq_init(re);
    fmpq_init(im);
    bool found = as_gaussian(a, re, im);
    if (found && f == FUNCTION_ARG) {
        found = fmpq_is_zero(re);
        if (found)
            *value = expr_mul(e, expr_frac(e, fmpq_sgn(im), 2), expr_constant_of(e, CONSTANT_PI));
    } else if (found) {
        expr *imaginary = expr_fmpq(e, im);
        *value = f == FUNCTION_RE ? expr_fmpq(e, re) : f == FUNCTION_IM ? imaginary
               : expr_sub(e, expr_fmpq(e, re), expr_mul(e, imaginary, expr_constant_of(e, CONSTANT_I)));
    } else if (f != FUNCTION_ARG && a->kind == EXPR_PRODUCT && a->args[0]->kind == EXPR_NUMBER) {
        expr *rest = expr_product(e, a->args + 1, a->count - 1);
        *value = rest ? expr_mul(e, a->args[0], expr_call1(e, f, rest)) : NULL;
        found = true;
    }
    fmpq_clear(re);
    fmpq_clear(im);
    return found;
}

static int compare_args(const void *a, const void *b)
{
    return expr_order(*(expr *const *)a, *(expr *const *)b);
}

/* Flat, sorted, without repeats; numbers and the infinities folded. */
static expr *extreme(tw_engine *e, function_id f, expr *const *args, size_t n)
{
    size_t flat = 0, count = 0;
    for (size_t k = 0; k < n; k++)
        flat += expr_is_call(args[k], f) ? args[k]->count : 1;
    expr **all = engine_scratch(e, flat + 1, sizeof *all);
    expr *number = NULL;
    for (size_t k = 0; k < n; k++) {
        const bool nested = expr_is_call(args[k], f);
        for (size_t j = 0; j < (nested ? args[k]->count : 1); j++) {
            expr *a = nested ? args[k]->args[j] : args[k];
            if (expr_is_inf(a) || expr_is_minus_inf(a)) {
                if (expr_is_inf(a) == (f == FUNCTION_MAX))
                    return a;
                if (n == 1)
                    return a;
            } else if (a->kind != EXPR_NUMBER) {
                all[count++] = a;
            } else if (!number || (fmpq_cmp(&a->is.number, &number->is.number) < 0) == (f == FUNCTION_MIN)) {
                number = a;
            }
        }
    }
    if (number)
        all[count++] = number;
    if (count == 0)
        return args[0];
    qsort(all, count, sizeof *all, compare_args);
    size_t kept = 1;
    for (size_t k = 1; k < count; k++)
        if (all[k] != all[kept - 1])
            all[kept++] = all[k];
    return kept == 1 ? all[0] : node_make(e, EXPR_CALL, f, all, kept);
}

static bool call_value(tw_engine *e, function_id f, expr *const *args, size_t n, expr **value)
{
    expr *a = args[0];
    switch (f) {
    case FUNCTION_EXP:
        return expr_is_zero(a) ? decide_value(value, expr_int(e, 1)) : exact_exp(e, a, value);
    case FUNCTION_LOG: return exact_log(e, a, value);
    case FUNCTION_ABS: return exact_abs(e, a, value);
    case FUNCTION_SIGN: return exact_sign(e, a, value);
    case FUNCTION_SIN: case FUNCTION_COS: case FUNCTION_TAN: return exact_sine(e, f, a, value);
    case FUNCTION_ASIN: case FUNCTION_ACOS: return exact_asin(e, f, a, value);
    case FUNCTION_ATAN: return exact_atan(e, a, value);
    case FUNCTION_SINH: case FUNCTION_COSH: case FUNCTION_TANH: case FUNCTION_ASINH: case FUNCTION_ATANH:
        return exact_hyperbolic(e, f, a, value);
    case FUNCTION_ACOSH: return expr_is_one(a) && decide_value(value, expr_int(e, 0));
    case FUNCTION_RE: case FUNCTION_IM: case FUNCTION_CONJ: case FUNCTION_ARG: return exact_parts(e, f, a, value);
    case FUNCTION_MIN: case FUNCTION_MAX: return decide_value(value, extreme(e, f, args, n));
    default: return special_value(e, f, args, value);
    }
}

expr *expr_call(tw_engine *e, function_id f, expr *const *args, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!args[k])
            return NULL;
    if (f >= FUNCTION_COUNT || n < (size_t)function_fewest(f) || n > (size_t)function_most(f)) {
        const char *name = f < FUNCTION_COUNT ? function_name(f) : "this";
        engine_fail(e, ERROR_VALUE, "%s does not take %zu arguments", name, n);
        return NULL;
    }
    const arena_place mark = arena_mark(&e->scratch);
    expr *value = NULL;
    if (!call_value(e, f, args, n, &value))
        value = node_make(e, EXPR_CALL, f, args, n);
    arena_release(&e->scratch, mark);
    return value;
}

expr *expr_call1(tw_engine *e, function_id f, expr *a)
{
    return expr_call(e, f, &a, 1);
}
