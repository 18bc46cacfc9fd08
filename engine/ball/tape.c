/* The tape: an expression's nodes in the order of their evaluation, each once. One loop runs it on balls, another on power
 * series. Knows nothing of integrals except that a closed one is asked of quadrature(). */
#include "engine/ball/tape.h"

#include <limits.h>
#include <stdlib.h>
#include <string.h>

#include "engine/ball/functions.h"
#include "engine/ball/quadrature.h"
#include "engine/expr/facts.h"

typedef enum op_kind {
    OP_NUMBER,    /* exact rational */
    OP_PI,
    OP_I,
    OP_EULER,
    OP_FIXED,     /* an expensive constant: kept at the precision last asked */
    OP_VARIABLE,
    OP_SUM,
    OP_PRODUCT,
    OP_POWER_RATIONAL,
    OP_POWER,
    OP_CALL,
    OP_EXPM1,     /* exp(u) - 1 without cancellation */
    OP_LOG1P,     /* log(1 + u): the operand is u */
    OP_PIECEWISE,
    OP_UNKNOWN    /* no value on balls: inf, a direction */
} op_kind;

typedef struct op {
    op_kind kind;
    bool real;              /* real for real variables */
    function_id function;
    size_t first, count;    /* operands: t->operands[first ...] */
    size_t index;           /* variable */
    expr *node;             /* number, exponent, fixed constant, piecewise */
    slong kept_prec;
    acb_t kept;
} op;

struct tape {
    tw_engine *e;
    size_t count, room;
    op *ops;
    size_t operand_count, operand_room;
    size_t *operands;
    expr *const *vars;      /* only while compiling */
    size_t var_count;
    acb_ptr values;
    acb_poly_struct *jets;  /* made at the first jet */
    expr **seen;            /* node -> op + 1, open addressing, only while compiling */
    size_t *seen_at, seen_room, seen_count;
};

/* ---- compiling ---- */

static void seen_put(tape *t, expr *a, size_t at);

static void seen_grow(tape *t)
{
    size_t room = t->seen_room, *at = t->seen_at;
    expr **keys = t->seen;
    t->seen_room = room ? 2 * room : 64;
    t->seen = base_alloc(t->seen_room * sizeof *t->seen);
    t->seen_at = base_alloc(t->seen_room * sizeof *t->seen_at);
    memset(t->seen, 0, t->seen_room * sizeof *t->seen);
    t->seen_count = 0;
    for (size_t k = 0; k < room; k++)
        if (keys[k]) seen_put(t, keys[k], at[k]);
    free(keys);
    free(at);
}

static void seen_put(tape *t, expr *a, size_t at)
{
    if (2 * (t->seen_count + 1) > t->seen_room) seen_grow(t);
    size_t k = a->hash & (t->seen_room - 1);
    while (t->seen[k]) k = (k + 1) & (t->seen_room - 1);
    t->seen[k] = a;
    t->seen_at[k] = at;
    t->seen_count++;
}

static bool seen_get(const tape *t, expr *a, size_t *at)
{
    if (!t->seen_room) return false;
    for (size_t k = a->hash & (t->seen_room - 1); t->seen[k]; k = (k + 1) & (t->seen_room - 1))
        if (t->seen[k] == a) {
            *at = t->seen_at[k];
            return true;
        }
    return false;
}

static op *add_op(tape *t, op_kind kind, expr *node, const size_t *operands, size_t n)
{
    if (t->count == t->room) {
        t->room = t->room ? 2 * t->room : 16;
        t->ops = base_resize(t->ops, t->room * sizeof *t->ops);
    }
    if (t->operand_count + n > t->operand_room) {
        t->operand_room = 2 * (t->operand_count + n);
        t->operands = base_resize(t->operands, t->operand_room * sizeof *t->operands);
    }
    op *o = &t->ops[t->count++];
    memset(o, 0, sizeof *o);
    o->kind = kind;
    o->node = node;
    o->first = t->operand_count;
    o->count = n;
    o->real = true;
    acb_init(o->kept);
    for (size_t k = 0; k < n; k++) {
        t->operands[t->operand_count++] = operands[k];
        o->real = o->real && t->ops[operands[k]].real;
    }
    return o;
}

static tw_status compile(tape *t, expr *a, size_t *at);

static tw_status compile_all(tape *t, expr *const *args, size_t n, size_t *at)
{
    for (size_t k = 0; k < n; k++)
        if (compile(t, args[k], &at[k]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status compile_symbol(tape *t, expr *a)
{
    for (size_t k = 0; k < t->var_count; k++) {
        if (t->vars[k] != a) continue;
        op *o = add_op(t, OP_VARIABLE, a, NULL, 0);
        o->index = k;
        o->real = !facts_is_complex(t->e, a);
        return TW_OK;
    }
    char *name = expr_text(t->e, a);
    engine_fail(t->e, ERROR_VALUE, "`%s` has no value here", name);
    free(name);
    return TW_ERROR;
}

/* Is the value of this base positive whatever the real variables are? Enough for exp and positive numbers. */
static bool plainly_positive(expr *a)
{
    if (a->kind == EXPR_NUMBER) return fmpq_sgn(&a->is.number) > 0;
    return expr_is_call(a, FUNCTION_EXP) || expr_is_constant(a, CONSTANT_PI);
}

static bool function_is_real(function_id f)
{
    switch (f) { /* on the whole real line; the others leave it somewhere */
    case FUNCTION_LOG:
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ACOSH:
    case FUNCTION_ATANH:
    case FUNCTION_LNGAMMA:
    case FUNCTION_GAMMA_UPPER:
    case FUNCTION_E1:
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_I:
    case FUNCTION_BESSEL_K: return false;
    default: return true;
    }
}

static tw_status compile_power(tape *t, expr *a)
{
    size_t at[2];
    if (a->args[1]->kind == EXPR_NUMBER) {
        if (compile(t, a->args[0], at) != TW_OK) return TW_ERROR;
        op *o = add_op(t, OP_POWER_RATIONAL, a->args[1], at, 1);
        if (!fmpz_is_one(fmpq_denref(&a->args[1]->is.number)) && !plainly_positive(a->args[0])) o->real = false;
        return TW_OK;
    }
    if (compile_all(t, a->args, 2, at) != TW_OK) return TW_ERROR;
    op *o = add_op(t, OP_POWER, a, at, 2);
    if (!plainly_positive(a->args[0])) o->real = false;
    return TW_OK;
}

static tw_status compile_call(tape *t, expr *a)
{
    size_t small[8], *at = a->count <= 8 ? small : base_alloc(a->count * sizeof *at);
    tw_status status = TW_OK;
    if (expr_is_call(a, FUNCTION_LOG) && a->args[0]->kind == EXPR_SUM && expr_is_one(a->args[0]->args[0])) {
        expr *u = expr_sum(t->e, a->args[0]->args + 1, a->args[0]->count - 1);
        status = u ? compile(t, u, at) : TW_ERROR;
        if (status == TW_OK) add_op(t, OP_LOG1P, a, at, 1)->real = false;
    } else {
        status = compile_all(t, a->args, a->count, at);
        if (status == TW_OK) {
            op *o = add_op(t, OP_CALL, a, at, a->count);
            o->function = a->is.function;
            if (!function_is_real(o->function)) o->real = false;
        }
    }
    if (at != small) free(at);
    return status;
}

/* k*exp(u) beside the number -k in a sum: together k*(exp(u) - 1), computed without cancellation. */
static expr *exponential_beside_its_limit(tape *t, expr *sum, expr **k)
{
    if (sum->args[0]->kind != EXPR_NUMBER) return NULL;
    fmpq_t c;
    fmpq_init(c);
    expr *found = NULL;
    for (uint32_t j = 1; j < sum->count && !found; j++) {
        expr *rest;
        expr_as_coefficient(t->e, sum->args[j], c, &rest);
        if (!expr_is_call(rest, FUNCTION_EXP)) continue;
        fmpq_neg(c, c);
        if (fmpq_equal(c, &sum->args[0]->is.number)) found = sum->args[j];
    }
    fmpq_neg(c, &sum->args[0]->is.number);
    *k = found ? expr_fmpq(t->e, c) : NULL;
    fmpq_clear(c);
    return found;
}

static tw_status compile_limited_exponential(tape *t, expr *term, expr *k, size_t *at)
{
    expr *exponential = term->kind == EXPR_PRODUCT ? term->args[term->count - 1] : term;
    size_t parts[2];
    if (!k || compile(t, exponential->args[0], &parts[0]) != TW_OK) return TW_ERROR;
    add_op(t, OP_EXPM1, term, parts, 1);
    *at = t->count - 1;
    if (expr_is_one(k)) return TW_OK;
    parts[0] = *at;
    if (compile(t, k, &parts[1]) != TW_OK) return TW_ERROR;
    add_op(t, OP_PRODUCT, term, parts, 2);
    *at = t->count - 1;
    return TW_OK;
}

static tw_status compile_sum(tape *t, expr *a)
{
    expr *k = NULL, *exponential = exponential_beside_its_limit(t, a, &k);
    size_t *at = base_alloc(a->count * sizeof *at), n = 0;
    tw_status status = TW_OK;
    for (uint32_t j = exponential ? 1 : 0; j < a->count && status == TW_OK; j++, n++)
        status = a->args[j] == exponential ? compile_limited_exponential(t, exponential, k, &at[n])
                                           : compile(t, a->args[j], &at[n]);
    if (status == TW_OK) add_op(t, OP_SUM, a, at, n);
    free(at);
    return status;
}

static tw_status compile_parts(tape *t, op_kind kind, expr *a)
{
    size_t *at = base_alloc(a->count * sizeof *at);
    tw_status status = compile_all(t, a->args, a->count, at);
    if (status == TW_OK) add_op(t, kind, a, at, a->count);
    free(at);
    return status;
}

/* Operands: left and right of each condition and its value, ..., the value otherwise. */
static tw_status compile_piecewise(tape *t, expr *a)
{
    size_t *at = base_alloc((2 * (size_t)a->count + 1) * sizeof *at), n = 0;
    tw_status status = TW_OK;
    for (uint32_t k = 0; k < a->count && status == TW_OK; k++) {
        if (a->args[k]->kind == EXPR_RELATION) {
            if (a->args[k]->is.relation > RELATION_NOT_EQUAL)
                status = engine_fail(t->e, ERROR_UNSUITABLE, "a piece of `piecewise` needs a comparison of real values");
            else status = compile_all(t, a->args[k]->args, 2, at + n);
            n += 2;
        } else {
            status = compile(t, a->args[k], &at[n]);
            n++;
        }
    }
    if (status == TW_OK) add_op(t, OP_PIECEWISE, a, at, n);
    free(at);
    return status;
}

enum { SUM_TERMS_LIMIT = 20000 };

/* A finite sum with integer ends is written out. */
static tw_status compile_summation(tape *t, expr *a, size_t *at)
{
    expr *from = a->args[0], *to = a->args[1];
    if (!expr_is_number(from) || !expr_is_number(to) || !fmpz_is_one(fmpq_denref(&from->is.number)) ||
        !fmpz_is_one(fmpq_denref(&to->is.number)))
        return engine_fail(t->e, ERROR_UNSUITABLE, "a sum whose ends are not whole numbers cannot be evaluated by balls");
    fmpz_t k, length;
    fmpz_init_set(k, fmpq_numref(&from->is.number));
    fmpz_init(length);
    fmpz_sub(length, fmpq_numref(&to->is.number), k);
    fmpz_add_ui(length, length, 1);
    tw_status status = TW_OK;
    if (fmpz_cmp_si(length, SUM_TERMS_LIMIT) > 0) {
        status = engine_fail(t->e, ERROR_UNSUITABLE, "a sum of more than %d terms is not evaluated term by term",
                             SUM_TERMS_LIMIT);
    } else {
        slong n = fmpz_sgn(length) > 0 ? fmpz_get_si(length) : 0;
        expr **terms = base_alloc(((size_t)n + 1) * sizeof *terms);
        for (slong j = 0; j < n; j++) {
            terms[j] = expr_open(t->e, a, expr_fmpz(t->e, k));
            fmpz_add_ui(k, k, 1);
        }
        expr *sum = expr_sum(t->e, terms, (size_t)n);
        free(terms);
        status = sum ? compile(t, sum, at) : TW_ERROR;
    }
    fmpz_clear(k);
    fmpz_clear(length);
    return status;
}

static tw_status compile_fixed(tape *t, expr *a)
{
    if (!expr_is_closed_value(a))
        return engine_fail(t->e, ERROR_UNSUITABLE,
                           "an integral or root that depends on a variable cannot be evaluated by balls here");
    op *o = add_op(t, OP_FIXED, a, NULL, 0);
    o->real = false;
    return TW_OK;
}

static tw_status compile_node(tape *t, expr *a, size_t *at)
{
    tw_status status = TW_OK;
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: add_op(t, OP_NUMBER, a, NULL, 0); break;
    case EXPR_CONSTANT:
        if (a->is.constant == CONSTANT_PI) add_op(t, OP_PI, a, NULL, 0);
        else if (a->is.constant == CONSTANT_EULER) add_op(t, OP_EULER, a, NULL, 0);
        else if (a->is.constant == CONSTANT_I) add_op(t, OP_I, a, NULL, 0)->real = false;
        else add_op(t, OP_UNKNOWN, a, NULL, 0);
        break;
    case EXPR_SYMBOL: status = compile_symbol(t, a); break;
    case EXPR_SUM: status = compile_sum(t, a); break;
    case EXPR_PRODUCT: status = compile_parts(t, OP_PRODUCT, a); break;
    case EXPR_POWER: status = compile_power(t, a); break;
    case EXPR_CALL: status = compile_call(t, a); break;
    case EXPR_PIECEWISE: status = compile_piecewise(t, a); break;
    case EXPR_SUMMATION: return compile_summation(t, a, at);
    case EXPR_INTEGRAL:
    case EXPR_CONTOUR:
    case EXPR_ROOT: status = compile_fixed(t, a); break;
    case EXPR_BOUND:
    case EXPR_DIRECTION:
    case EXPR_RELATION: add_op(t, OP_UNKNOWN, a, NULL, 0); break;
    }
    *at = t->count - 1;
    return status;
}

static tw_status compile(tape *t, expr *a, size_t *at)
{
    if (seen_get(t, a, at)) return TW_OK;
    if (!budget_ok(t->e)) return TW_ERROR;
    if (compile_node(t, a, at) != TW_OK) return TW_ERROR;
    seen_put(t, a, *at);
    return TW_OK;
}

tape *tape_new(tw_engine *e, expr *f, expr *const *vars, size_t n)
{
    if (!f) return NULL;
    tape *t = base_alloc(sizeof *t);
    memset(t, 0, sizeof *t);
    t->e = e;
    t->vars = vars;
    t->var_count = n;
    size_t at;
    tw_status status = compile(t, f, &at);
    free(t->seen);
    free(t->seen_at);
    t->seen = NULL;
    t->seen_at = NULL;
    t->vars = NULL;
    if (status != TW_OK) {
        tape_free(t);
        return NULL;
    }
    if (at != t->count - 1) { /* the last op is the value */
        size_t operand = at;
        add_op(t, OP_SUM, f, &operand, 1);
    }
    t->values = _acb_vec_init((slong)t->count);
    return t;
}

void tape_free(tape *t)
{
    if (!t) return;
    for (size_t k = 0; k < t->count; k++) acb_clear(t->ops[k].kept);
    if (t->values) _acb_vec_clear(t->values, (slong)t->count);
    if (t->jets) {
        for (size_t k = 0; k < t->count; k++) acb_poly_clear(&t->jets[k]);
        free(t->jets);
    }
    free(t->ops);
    free(t->operands);
    free(t);
}

/* ---- constants ---- */

/* The root of a rational polynomial nearest to the value given; non-finite when two are equally near or it is no polynomial. */
static void root_value(tw_engine *e, acb_t out, expr *a, slong prec)
{
    acb_indeterminate(out);
    expr *x = expr_fresh(e, "r"), *body = expr_open(e, a, x), **c = NULL;
    slong degree;
    if (!body || expr_polynomial(e, body, x, 1000, &c, &degree) != TW_OK) return;
    fmpq_poly_t p;
    fmpq_poly_init(p);
    bool rational = degree >= 1;
    for (slong k = 0; k <= degree && rational; k++) {
        rational = expr_is_number(c[k]);
        if (rational) fmpq_poly_set_coeff_fmpq(p, k, &c[k]->is.number);
    }
    free(c);
    acb_t near;
    acb_init(near);
    if (rational && ball_value(e, near, a->args[1], prec) == TW_OK) {
        fmpz_poly_t z, d, g;
        fmpz_poly_init(z);
        fmpz_poly_init(d);
        fmpz_poly_init(g);
        fmpq_poly_get_numerator(z, p);
        fmpz_poly_derivative(d, z);
        fmpz_poly_gcd(g, z, d);
        fmpz_poly_div(z, z, g);
        slong n = fmpz_poly_degree(z), best = -1;
        acb_ptr roots = _acb_vec_init(n);
        arb_fmpz_poly_complex_roots(roots, z, 0, prec);
        arb_t least, distance;
        arb_init(least);
        arb_init(distance);
        acb_t difference;
        acb_init(difference);
        for (int round = 0; round < 2; round++) /* round 0 finds the candidate, round 1 proves that no other is as near */
            for (slong k = 0; k < n; k++) {
                acb_sub(difference, roots + k, near, prec);
                acb_abs(distance, difference, prec);
                if (round == 0 && (best < 0 || arf_cmp(arb_midref(distance), arb_midref(least)) < 0)) {
                    best = k;
                    arb_set(least, distance);
                }
                if (round == 1 && best >= 0 && k != best && !arb_gt(distance, least)) best = -2;
            }
        if (best >= 0) acb_set(out, roots + best);
        acb_clear(difference);
        arb_clear(least);
        arb_clear(distance);
        _acb_vec_clear(roots, n);
        fmpz_poly_clear(z);
        fmpz_poly_clear(d);
        fmpz_poly_clear(g);
    }
    acb_clear(near);
    fmpq_poly_clear(p);
}

static void fixed_value(tape *t, acb_t out, op *o, slong prec)
{
    if (o->kept_prec < prec) {
        if (o->node->kind == EXPR_ROOT) {
            root_value(t->e, o->kept, o->node, prec);
        } else {
            env nowhere = {0};
            slong digits = (slong)((double)prec * 0.30103) + 1;
            if (quadrature(t->e, o->kept, o->node, &nowhere, digits, true, NULL) != TW_OK) acb_indeterminate(o->kept);
        }
        o->kept_prec = prec;
    }
    acb_set_round(out, o->kept, prec);
}

static void constant_value(tape *t, acb_t out, op *o, slong prec)
{
    switch (o->kind) {
    case OP_NUMBER:
        arb_set_fmpq(acb_realref(out), &o->node->is.number, prec);
        arb_zero(acb_imagref(out));
        break;
    case OP_PI: acb_const_pi(out, prec); break;
    case OP_I: acb_onei(out); break;
    case OP_EULER:
        arb_const_euler(acb_realref(out), prec);
        arb_zero(acb_imagref(out));
        break;
    case OP_FIXED: fixed_value(t, out, o, prec); break;
    default: acb_indeterminate(out); break;
    }
}

/* Does left REL right hold for the whole ball, compared by real parts? */
static answer compare(const acb_t left, const acb_t right, expr_relation r)
{
    arb_srcptr a = acb_realref(left), b = acb_realref(right);
    switch (r) {
    case RELATION_LESS: return arb_lt(a, b) ? ANSWER_YES : arb_ge(a, b) ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_LESS_EQUAL: return arb_le(a, b) ? ANSWER_YES : arb_gt(a, b) ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_EQUAL:
        return arb_is_exact(a) && arb_equal(a, b) ? ANSWER_YES : !arb_overlaps(a, b) ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_NOT_EQUAL:
        return !arb_overlaps(a, b) ? ANSWER_YES : arb_is_exact(a) && arb_equal(a, b) ? ANSWER_NO : ANSWER_UNKNOWN;
    default: return ANSWER_UNKNOWN;
    }
}

/* The operand that holds the piece which applies on the whole ball; SIZE_MAX when the balls do not decide. values(k) gives the
 * constant term of operand k. */
static size_t piece_of(const tape *t, const op *o, acb_srcptr (*values)(const tape *, size_t))
{
    size_t k = 0;
    for (uint32_t c = 0; c + 1 < o->node->count; c += 2) {
        size_t left = t->operands[o->first + k], right = t->operands[o->first + k + 1];
        if (!t->ops[left].real || !t->ops[right].real) return SIZE_MAX;
        answer holds = compare(values(t, left), values(t, right), o->node->args[c]->is.relation);
        if (holds == ANSWER_UNKNOWN) return SIZE_MAX;
        if (holds == ANSWER_YES) return t->operands[o->first + k + 2];
        k += 3;
    }
    return t->operands[o->first + k];
}

/* ---- running on balls ---- */

static acb_srcptr plain_value(const tape *t, size_t k)
{
    return t->values + k;
}

/* Undecided without need of analyticity: the union of all pieces. */
static void union_of_pieces(tape *t, acb_t out, const op *o, slong prec)
{
    size_t k = 0;
    for (uint32_t c = 0; c < o->node->count; c++) {
        if (o->node->args[c]->kind == EXPR_RELATION) {
            k += 2;
            continue;
        }
        acb_srcptr v = t->values + t->operands[o->first + k];
        if (c <= 1) acb_set(out, v);
        else acb_union(out, out, v, prec);
        k++;
    }
}

static void run_call(tape *t, acb_t out, const op *o, bool analytic, slong prec)
{
    acb_srcptr small[8], *args = o->count <= 8 ? small : base_alloc(o->count * sizeof *args);
    ball_mode m = {.analytic = analytic, .real_args = true};
    for (size_t k = 0; k < o->count; k++) {
        size_t from = t->operands[o->first + k];
        args[k] = t->values + from;
        m.real_args = m.real_args && t->ops[from].real;
    }
    ball_function_of(o->function)(out, (acb_srcptr const *)args, o->count, m, prec);
    if (args != small) free(args);
}

static void run_log1p(acb_t out, const acb_t u, bool analytic, slong prec)
{
    acb_t z;
    acb_init(z);
    acb_add_ui(z, u, 1, prec);
    if (analytic && ball_meets_cut(z)) acb_indeterminate(out);
    else acb_log1p(out, u, prec);
    acb_clear(z);
}

static void run_op(tape *t, size_t k, acb_srcptr at, bool analytic, slong prec)
{
    op *o = &t->ops[k];
    acb_ptr out = t->values + k;
    const size_t *from = t->operands + o->first;
    switch (o->kind) {
    case OP_VARIABLE: acb_set(out, at + o->index); break;
    case OP_SUM:
        acb_set(out, t->values + from[0]);
        for (size_t j = 1; j < o->count; j++) acb_add(out, out, t->values + from[j], prec);
        break;
    case OP_PRODUCT:
        acb_set(out, t->values + from[0]);
        for (size_t j = 1; j < o->count; j++) acb_mul(out, out, t->values + from[j], prec);
        break;
    case OP_POWER_RATIONAL:
        ball_power_rational(out, t->values + from[0], &o->node->is.number, analytic, prec);
        break;
    case OP_POWER: ball_power(out, t->values + from[0], t->values + from[1], analytic, prec); break;
    case OP_CALL: run_call(t, out, o, analytic, prec); break;
    case OP_EXPM1: acb_expm1(out, t->values + from[0], prec); break;
    case OP_LOG1P: run_log1p(out, t->values + from[0], analytic, prec); break;
    case OP_PIECEWISE: {
        size_t piece = piece_of(t, o, plain_value);
        if (piece != SIZE_MAX) acb_set(out, t->values + piece);
        else if (analytic) acb_indeterminate(out);
        else union_of_pieces(t, out, o, prec);
        break;
    }
    default: constant_value(t, out, o, prec); break;
    }
}

void tape_eval(acb_t out, tape *t, acb_srcptr at, bool analytic, slong prec)
{
    for (size_t k = 0; k < t->count; k++) run_op(t, k, at, analytic, prec);
    acb_set(out, t->values + t->count - 1);
}

/* ---- running on power series ---- */

static acb_srcptr jet_value(const tape *t, size_t k)
{
    static const acb_struct zero; /* all bits 0 is the exact 0 */
    return t->jets[k].length ? t->jets[k].coeffs : &zero;
}

static void jet_call(tape *t, acb_poly_t out, const op *o, slong len, slong prec)
{
    const acb_poly_struct *small[8], **args = o->count <= 8 ? small : base_alloc(o->count * sizeof *args);
    ball_mode m = {.analytic = true, .real_args = true};
    for (size_t k = 0; k < o->count; k++) {
        size_t from = t->operands[o->first + k];
        args[k] = &t->jets[from];
        m.real_args = m.real_args && t->ops[from].real;
    }
    jet_function_of(o->function)(out, args, o->count, m, len, prec);
    if (args != small) free(args);
}

/* A special constant term where plain series arithmetic would cancel: exp(u) - 1 and log(1 + u). */
static void set_constant_term(acb_poly_t out, const acb_t value)
{
    acb_poly_fit_length(out, 1);
    if (out->length == 0) _acb_poly_set_length(out, 1);
    acb_set(out->coeffs, value);
}

static void jet_special(tape *t, acb_poly_t out, const op *o, slong len, slong prec)
{
    const acb_poly_struct *u = &t->jets[t->operands[o->first]];
    acb_srcptr u0 = jet_value(t, t->operands[o->first]);
    acb_t c;
    acb_init(c);
    if (o->kind == OP_EXPM1) {
        acb_poly_exp_series(out, u, len, prec);
        acb_expm1(c, u0, prec);
        set_constant_term(out, c);
    } else {
        run_log1p(c, u0, true, prec);
        if (!acb_is_finite(c)) {
            jet_unknown(out, len);
        } else {
            acb_poly_t w;
            acb_poly_init(w);
            acb_poly_add_si(w, u, 1, prec);
            acb_poly_log_series(out, w, len, prec);
            set_constant_term(out, c);
            acb_poly_clear(w);
        }
    }
    acb_clear(c);
}

static void jet_op(tape *t, size_t k, acb_srcptr at, slong len, slong prec)
{
    op *o = &t->ops[k];
    acb_poly_struct *out = &t->jets[k];
    const size_t *from = t->operands + o->first;
    switch (o->kind) {
    case OP_VARIABLE:
        acb_poly_zero(out);
        acb_poly_set_coeff_acb(out, 0, at + o->index);
        if (o->index == 0 && len > 1) acb_poly_set_coeff_si(out, 1, 1);
        break;
    case OP_SUM:
        acb_poly_set(out, &t->jets[from[0]]);
        for (size_t j = 1; j < o->count; j++) acb_poly_add(out, out, &t->jets[from[j]], prec);
        break;
    case OP_PRODUCT:
        acb_poly_set(out, &t->jets[from[0]]);
        for (size_t j = 1; j < o->count; j++) acb_poly_mullow(out, out, &t->jets[from[j]], len, prec);
        break;
    case OP_POWER_RATIONAL: jet_power_rational(out, &t->jets[from[0]], &o->node->is.number, len, prec); break;
    case OP_POWER: jet_power(out, &t->jets[from[0]], &t->jets[from[1]], len, prec); break;
    case OP_CALL: jet_call(t, out, o, len, prec); break;
    case OP_EXPM1:
    case OP_LOG1P: jet_special(t, out, o, len, prec); break;
    case OP_PIECEWISE: {
        size_t piece = piece_of(t, o, jet_value);
        if (piece != SIZE_MAX) acb_poly_set(out, &t->jets[piece]);
        else jet_unknown(out, len);
        break;
    }
    default:
        acb_poly_fit_length(out, 1);
        constant_value(t, out->coeffs, o, prec);
        _acb_poly_set_length(out, 1);
        _acb_poly_normalise(out);
        break;
    }
}

void tape_jet(acb_ptr out, tape *t, acb_srcptr at, slong len, slong prec)
{
    if (!t->jets) {
        t->jets = base_alloc(t->count * sizeof *t->jets);
        for (size_t k = 0; k < t->count; k++) acb_poly_init(&t->jets[k]);
    }
    for (size_t k = 0; k < t->count; k++) jet_op(t, k, at, len, prec);
    const acb_poly_struct *last = &t->jets[t->count - 1];
    for (slong k = 0; k < len; k++) {
        if (k < last->length) acb_set(out + k, last->coeffs + k);
        else acb_zero(out + k);
    }
}

/* ---- closed values ---- */

tw_status ball_value(tw_engine *e, acb_t out, expr *f, slong prec)
{
    tape *t = tape_new(e, f, NULL, 0);
    if (!t) return TW_ERROR;
    tape_eval(out, t, NULL, false, prec);
    tape_free(t);
    return TW_OK;
}

tw_status evaluate_closed(tw_engine *e, acb_t value, expr *f, const env *at, slong bits)
{
    expr *g = at->count ? expr_substitute_all(e, f, at->symbols, at->values, at->count) : f;
    if (!g) return TW_ERROR;
    return ball_value(e, value, g, bits);
}
