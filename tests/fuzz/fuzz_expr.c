/* Fuzzes the constructors and the walks of the expression room: the input is a program for a stack machine whose
 * instructions build, differentiate, substitute, expand and print. Nothing may crash, leak or outlast its budget, and a
 * canonical node must rebuild to itself. */
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "engine/expr/expr.h"
#include "engine/expr/facts.h"

enum { STACK = 32, STEPS = 200 };

typedef struct machine {
    tw_engine *e;
    const uint8_t *bytes;
    size_t left;
    expr *stack[STACK];
    size_t height;
} machine;

static unsigned next(machine *m)
{
    if (m->left == 0)
        return 0;
    m->left--;
    return *m->bytes++;
}

static expr *pop(machine *m)
{
    return m->height > 0 ? m->stack[--m->height] : expr_int(m->e, 1);
}

static void push(machine *m, expr *a)
{
    if (a && m->height < STACK)
        m->stack[m->height++] = a;
    engine_forgive(m->e);
}

static expr *name(machine *m)
{
    static const char *const names[] = {"x", "y", "s", "n"};
    return expr_symbol(m->e, names[next(m) % 4]);
}

static void relate(machine *m)
{
    expr *left = pop(m), *right = pop(m);
    expr *relation = expr_relation_of(m->e, next(m) % 7, left, right);
    if (relation && next(m) % 2)
        facts_add(m->e, relation, CONDITION_GIVEN);
    engine_forgive(m->e);
    expr *value = pop(m);
    if (relation)
        push(m, expr_piecewise(m->e, &relation, &value, 1, pop(m)));
}

static void call(machine *m)
{
    const function_id f = next(m) % FUNCTION_COUNT;
    expr *args[3] = {pop(m)};
    size_t n = 1;
    while (n < (size_t)function_fewest(f) || (n < 3 && n < (size_t)function_most(f)))
        args[n++] = pop(m);
    push(m, expr_call(m->e, f, args, n));
}

static void print(machine *m, expr *a)
{
    if (a && expr_size(a) < 3000)
        free(expr_text(m->e, a));
}

static void read_polynomial(machine *m)
{
    expr **coefficients = NULL, *a = pop(m);
    slong degree;
    if (expr_polynomial(m->e, a, name(m), next(m), &coefficients, &degree) == TW_OK)
        push(m, coefficients[degree]);
    free(coefficients);
    engine_forgive(m->e);
}

static void step(machine *m)
{
    tw_engine *e = m->e;
    expr *a, *b;
    switch (next(m) % 24) {
    case 0: push(m, expr_int(e, (int8_t)next(m))); break;
    case 1: a = expr_int(e, (int8_t)next(m)); push(m, expr_div(e, a, expr_int(e, (int8_t)next(m)))); break;
    case 2: case 3: push(m, name(m)); break;
    case 4: push(m, expr_constant_of(e, next(m) % 4)); break;
    case 5: case 6: a = pop(m); push(m, expr_add(e, a, pop(m))); break;
    case 7: case 8: a = pop(m); push(m, expr_mul(e, a, pop(m))); break;
    case 9: case 10: a = pop(m); push(m, expr_pow(e, a, pop(m))); break;
    case 11: a = pop(m); push(m, a); push(m, a); break;
    case 12: case 13: call(m); break;
    case 14: a = pop(m); b = pop(m); push(m, expr_integral(e, name(m), a, b, pop(m))); break;
    case 15: a = pop(m); b = pop(m); push(m, expr_summation(e, name(m), a, b, pop(m))); break;
    case 16: a = pop(m); push(m, expr_root(e, name(m), a, pop(m))); break;
    case 17: relate(m); break;
    case 18: a = pop(m); push(m, expr_derivative(e, a, name(m))); break;
    case 19: a = pop(m); b = pop(m); push(m, expr_substitute(e, a, name(m), b)); break;
    case 20: push(m, expr_expand(e, pop(m))); break;
    case 21: a = name(m); push(m, expr_normal(e, pop(m), &a, 1)); break;
    case 22: read_polynomial(m); break;
    default:
        a = pop(m);
        push(m, a->kind == EXPR_INTEGRAL || a->kind == EXPR_SUMMATION || a->kind == EXPR_ROOT ? expr_open(e, a,
            pop(m)) : a);
    }
}

static tw_status run(void *host)
{
    machine *m = host;
    for (int k = 0; k < STEPS && m->left > 0; k++) {
        step(m);
        engine_forgive(m->e);
    }
    while (m->height > 0) {
        expr *a = pop(m), *const again[2] = {a, expr_int(m->e, 0)};
        print(m, a);
        expr *sum = expr_sum(m->e, again, 2);
        if (sum ? sum != a : m->e->error.kind == ERROR_NONE)
            abort();
        engine_forgive(m->e);
    }
    return TW_OK;
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    machine m = {.e = tw_engine_new(), .bytes = bytes, .left = size};
    if (!m.e)
        return 0;
    budget_start(m.e, 2);
    engine_protect(m.e, run, &m);
    tw_engine_free(m.e);
    return 0;
}
