/* The public header's functions on top of the rooms: argument checks, the edge where aborts of FLINT are caught, and text in
 * place of the engine's own types. No mathematics of its own. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "engine/method/method.h"

struct tw_expansion {
    expansion a;
};

/* Every call that computes goes through here: clean error, the limits of tw_set_limits, the edge. */
typedef struct call {
    tw_engine *e;
    expr *f;
    expansion *a;
    const char *words, *name;
    expr *const *symbols, *const *values;
    size_t n;
    slong count;
    expr *made;
    text *out;
    tw_value *value;
} call;

static int run_call(call *c, tw_status (*run)(void *))
{
    engine_forgive(c->e);
    budget_start(c->e, c->e->seconds);
    return engine_protect(c->e, run, c) == TW_OK ? 0 : 1;
}

const char *tw_error_words(const tw_engine *e)
{
    return e->error.words ? e->error.words : "";
}

const char *tw_error_kind(const tw_engine *e)
{
    return error_kind_word(e->error.kind);
}

void tw_set_limits(tw_engine *e, double seconds, size_t mib)
{
    e->seconds = seconds;
    e->memory_limit = mib << 20;
}

void tw_interrupt(tw_engine *e)
{
    e->interrupted = 1;
}

tw_expr *tw_rational(tw_engine *e, const char *words)
{
    fmpq_t q;
    fmpq_init(q);
    expr *made = NULL;
    if (fmpq_set_str(q, words, 10) != 0 || fmpz_is_zero(fmpq_denref(q)))
        engine_fail(e, ERROR_VALUE, "`%s` is not a rational number such as 3 or -7/2", words);
    else {
        fmpq_canonicalise(q);
        made = expr_fmpq(e, q);
    }
    fmpq_clear(q);
    return made;
}

tw_expr *tw_symbol(tw_engine *e, const char *name)
{
    return expr_symbol(e, name);
}

tw_expr *tw_pi(tw_engine *e)
{
    return expr_constant_of(e, CONSTANT_PI);
}

tw_expr *tw_imaginary_unit(tw_engine *e)
{
    return expr_constant_of(e, CONSTANT_I);
}

tw_expr *tw_inf(tw_engine *e)
{
    return expr_constant_of(e, CONSTANT_INF);
}

tw_expr *tw_add(tw_engine *e, tw_expr *a, tw_expr *b)
{
    return expr_add(e, a, b);
}

tw_expr *tw_sub(tw_engine *e, tw_expr *a, tw_expr *b)
{
    return expr_sub(e, a, b);
}

tw_expr *tw_mul(tw_engine *e, tw_expr *a, tw_expr *b)
{
    return expr_mul(e, a, b);
}

tw_expr *tw_div(tw_engine *e, tw_expr *a, tw_expr *b)
{
    return expr_div(e, a, b);
}

tw_expr *tw_neg(tw_engine *e, tw_expr *a)
{
    return expr_neg(e, a);
}

tw_expr *tw_pow(tw_engine *e, tw_expr *base, tw_expr *exponent)
{
    return expr_pow(e, base, exponent);
}

tw_expr *tw_call(tw_engine *e, const char *function, tw_expr *const *arguments, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!arguments[k]) return NULL;
    if (n == 1 && strcmp(function, "sqrt") == 0) return expr_sqrt(e, arguments[0]);
    function_id f = function_find(function, (int)n);
    if (f == FUNCTION_COUNT) {
        engine_fail(e, ERROR_NAME, "there is no function `%s` of %zu argument%s", function, n, n == 1 ? "" : "s");
        return NULL;
    }
    return expr_call(e, f, arguments, n);
}

tw_expr *tw_integral(tw_engine *e, tw_expr *variable, tw_expr *from, tw_expr *to, tw_expr *body)
{
    if (variable && variable->kind != EXPR_SYMBOL) {
        engine_fail(e, ERROR_VALUE, "the variable of an integral must be a symbol");
        return NULL;
    }
    return expr_integral(e, variable, from, to, body);
}

char *tw_text(tw_engine *e, tw_expr *a)
{
    return a ? expr_text(e, a) : NULL;
}

static tw_status declare_large(tw_engine *e, tw_expr *symbol, large_kind kind)
{
    engine_forgive(e);
    if (!symbol || symbol->kind != EXPR_SYMBOL) return engine_fail(e, ERROR_VALUE, "only a symbol can be large or small");
    return facts_set_large(e, symbol, kind, NULL, NULL);
}

int tw_large(tw_engine *e, tw_expr *symbol)
{
    return declare_large(e, symbol, LARGE_POSITIVE) != TW_OK;
}

int tw_small(tw_engine *e, tw_expr *symbol)
{
    return declare_large(e, symbol, LARGE_SMALL) != TW_OK;
}

static int declare_fact(tw_engine *e, expr *fact)
{
    engine_forgive(e);
    return !fact || facts_add(e, fact, CONDITION_GIVEN) != TW_OK;
}

int tw_given_less(tw_engine *e, tw_expr *left, tw_expr *right)
{
    return declare_fact(e, expr_relation_of(e, RELATION_LESS, left, right));
}

int tw_given_integer(tw_engine *e, tw_expr *symbol)
{
    return declare_fact(e, expr_relation_of(e, RELATION_INTEGER, symbol, symbol));
}

static tw_status run_expand(void *host)
{
    call *c = host;
    return expand(c->e, c->a, c->f, c->count, c->words);
}

tw_expansion *tw_expand(tw_engine *e, tw_expr *integral, long terms, const char *method_name)
{
    if (!integral) return NULL;
    if (terms < 1) {
        engine_forgive(e);
        engine_fail(e, ERROR_VALUE, "an expansion has at least 1 term");
        return NULL;
    }
    tw_expansion *made = base_alloc(sizeof *made);
    expansion_init(&made->a);
    call c = {.e = e, .f = integral, .a = &made->a, .words = method_name, .count = terms};
    if (run_call(&c, run_expand) == 0) return made;
    tw_expansion_free(made);
    return NULL;
}

void tw_expansion_free(tw_expansion *a)
{
    if (!a) return;
    expansion_clear(&a->a);
    free(a);
}

static tw_status run_term(void *host)
{
    call *c = host;
    if (c->a->contribution_count == 0) return TW_OK;
    term *terms;
    slong found;
    if (expansion_extend(c->e, c->a, c->count + 1) != TW_OK) return TW_ERROR;
    if (expansion_order(c->e, c->a, 0, c->count + 1, &terms, &found) != TW_OK) return TW_ERROR;
    if (c->count < found) {
        expr *t = expansion_term(c->e, c->a, 0, terms[c->count]);
        c->made = expr_mul(c->e, c->a->contributions[0].prefactor, t);
    }
    free(terms);
    return TW_OK;
}

tw_expr *tw_term(tw_engine *e, tw_expansion *a, long n)
{
    call c = {.e = e, .a = &a->a, .count = n};
    return n >= 0 && run_call(&c, run_term) == 0 ? c.made : NULL;
}

static tw_status run_write(void *host)
{
    call *c = host;
    const format *f = format_find(c->words);
    if (!f) return engine_fail(c->e, ERROR_NAME, "there is no format `%s`; there are json, csv and text", c->words);
    remainder_bound r;
    remainder_bound_init(&r);
    env nowhere = {0};
    tw_status status = remainder_for_all(c->e, &r, c->a, &nowhere, -1, NULL);
    if (status == TW_OK) status = f->write(c->e, c->out, c->name, c->a, &r);
    remainder_bound_clear(&r);
    return status;
}

char *tw_write(tw_engine *e, tw_expansion *a, const char *name, const char *format_name)
{
    text out;
    text_init(&out);
    call c = {.e = e, .a = &a->a, .words = format_name, .name = name, .out = &out};
    if (run_call(&c, run_write) == 0) return text_take(&out);
    text_clear(&out);
    return NULL;
}

void tw_value_clear(tw_value *v)
{
    free(v->mid);
    free(v->radius);
    free(v->mid_imaginary);
    free(v->radius_imaginary);
    memset(v, 0, sizeof *v);
}

static void ball_words(char **mid, char **radius, const arb_t x)
{
    text m, r;
    text_init(&m);
    text_init(&r);
    decimal_ball(&m, &r, x);
    *mid = text_take(&m);
    *radius = text_take(&r);
}

static void value_set(tw_value *v, const acb_t z, const char *word, slong terms)
{
    ball_words(&v->mid, &v->radius, acb_realref(z));
    ball_words(&v->mid_imaginary, &v->radius_imaginary, acb_imagref(z));
    v->label = word;
    v->terms = terms;
}

static env call_env(const call *c)
{
    return (env){.count = c->n, .symbols = (expr **)c->symbols, .values = (expr **)c->values};
}

static tw_status run_evaluate(void *host)
{
    call *c = host;
    env at = call_env(c);
    number n;
    number_init(&n);
    evaluate_options o = {.digits = c->count, .terms = -1};
    tw_status status = evaluate_expansion(c->e, &n, c->a, &at, &o);
    if (status == TW_OK) value_set(c->value, n.value, label_word(n.label), n.terms);
    number_clear(&n);
    return status;
}

int tw_evaluate(tw_engine *e, tw_value *out, tw_expansion *a, tw_expr *const *symbols, tw_expr *const *values, size_t n,
                long digits)
{
    memset(out, 0, sizeof *out);
    call c = {.e = e, .a = &a->a, .symbols = symbols, .values = values, .n = n, .count = digits, .value = out};
    return run_call(&c, run_evaluate);
}

static tw_status run_quadrature(void *host)
{
    call *c = host;
    env at = call_env(c);
    acb_t z;
    acb_init(z);
    tw_status status = quadrature(c->e, z, c->f, &at, c->count, false, NULL);
    if (status == TW_OK) value_set(c->value, z, label_word(LABEL_PROVED), -1);
    acb_clear(z);
    return status;
}

int tw_quadrature(tw_engine *e, tw_value *out, tw_expr *f, tw_expr *const *symbols, tw_expr *const *values, size_t n,
                  long digits)
{
    memset(out, 0, sizeof *out);
    if (!f || digits < 1) return 1;
    call c = {.e = e, .f = f, .symbols = symbols, .values = values, .n = n, .count = digits, .value = out};
    return run_call(&c, run_quadrature);
}
