/* From syntax to expressions. One function a form; bound names are a chain of scopes on the C stack, which the
 * parser's limit on nesting keeps short. The first failure fixes the place to complain about: the innermost form that
 * could not be built. */
#include "lang/lower.h"

#include <stdlib.h>
#include <string.h>

#include "lang/words.h"

/* The highest order of a derivative that is carried out. */
enum { ORDER_LIMIT = 1000 };

static expr *lower(lowering *l, const syntax *a);

void lowering_init(lowering *l, tw_engine *e, void *host)
{
    memset(l, 0, sizeof *l);
    l->engine = e;
    l->host = host;
}

void lowering_clear(lowering *l)
{
    free(l->pending);
    memset(l, 0, sizeof *l);
}

static void push(lowering *l, expr *item)
{
    if (l->pending_count == l->pending_room) {
        size_t room = l->pending_room ? 2 * l->pending_room : 32;
        l->pending = base_resize(l->pending, room * sizeof *l->pending);
        l->pending_room = room;
    }
    l->pending[l->pending_count++] = item;
}

/* Remembers where the first failure was. */
static expr *placed(lowering *l, expr *result, span at)
{
    if (result == NULL && !l->failed) {
        l->failed = true;
        l->place = at;
    }
    return result;
}

#define FAIL(l, at, kind, ...) (engine_fail((l)->engine, kind, __VA_ARGS__), placed(l, NULL, at))

/* ---- numbers ---- */

void lower_number(const char *digits, fmpq_t q)
{
    size_t length = strcspn(digits, "eE");
    long exponent = digits[length] ? strtol(digits + length + 1, NULL, 10) : 0;
    const char *point = memchr(digits, '.', length);
    if (point != NULL)
        exponent -= (long)(length - (size_t)(point - digits) - 1);
    char *plain = base_alloc(length + 1);
    size_t n = 0;
    for (size_t k = 0; k < length; k++)
        if (digits[k] != '.')
            plain[n++] = digits[k];
    plain[n] = 0;
    fmpz_set_str(fmpq_numref(q), plain, 10);
    free(plain);
    fmpz_one(fmpq_denref(q));
    if (exponent > 0 && !fmpq_is_zero(q)) {
        fmpz_t power;
        fmpz_init(power);
        fmpz_ui_pow_ui(power, 10, (ulong)exponent);
        fmpz_mul(fmpq_numref(q), fmpq_numref(q), power);
        fmpz_clear(power);
    } else if (exponent < 0 && !fmpq_is_zero(q)) {
        fmpz_ui_pow_ui(fmpq_denref(q), 10, (ulong)-exponent);
        fmpq_canonicalise(q);
    }
}

static expr *lower_typed_number(lowering *l, const syntax *a)
{
    fmpq_t q;
    fmpq_init(q);
    lower_number(a->as.number, q);
    expr *result = expr_fmpq(l->engine, q);
    fmpq_clear(q);
    return result;
}

/* ---- names ---- */

static const lower_scope *scope_find(const lowering *l, const char *name)
{
    const lower_scope *s = l->scope;
    while (s != NULL && strcmp(s->name, name) != 0)
        s = s->outer;
    return s;
}

static bool constant_find(const char *name, expr_constant *c)
{
    static const struct {
        const char *name;
        expr_constant is;
    } constants[] = {{"pi", CONSTANT_PI}, {"i", CONSTANT_I}, {"inf", CONSTANT_INF}, {"euler_constant", CONSTANT_EULER}};
    for (size_t k = 0; k < sizeof constants / sizeof *constants; k++)
        if (strcmp(constants[k].name, name) == 0) {
            *c = constants[k].is;
            return true;
        }
    return false;
}

static const lower_function *find_function(const lowering *l, const char *name)
{
    for (size_t k = 0; k < l->local_count; k++)
        if (strcmp(l->locals[k].name, name) == 0)
            return &l->locals[k].function;
    return l->function ? l->function(l->host, name) : NULL;
}

static lower_meaning ask_meaning(const lowering *l, const char *name, expr **value, const char **what)
{
    *value = NULL;
    *what = "no expression";
    return l->meaning ? l->meaning(l->host, name, value, what) : MEANING_FREE;
}

static expr *lower_free_name(lowering *l, const char *name, span at)
{
    expr *value;
    const char *what;
    switch (ask_meaning(l, name, &value, &what)) {
    case MEANING_VALUE:
        return value;
    case MEANING_OTHER:
        return FAIL(l, at, ERROR_NAME, "`%s` is %s, not an expression", name, what);
    case MEANING_FREE:
        if (strcmp(name, "e") == 0)
            return FAIL(l, at, ERROR_NAME, "`e` is not declared: Euler's number is exp(1); "
                        "for a parameter of that name write `given e real` first");
        break;
    case MEANING_DECLARED:
        break;
    }
    if (find_function(l, name) != NULL)
        return FAIL(l, at, ERROR_NAME, "`%s` is a function: write its argument in brackets", name);
    return expr_symbol(l->engine, name);
}

static expr *lower_name(lowering *l, const syntax *a)
{
    expr_constant c;
    const lower_scope *s = scope_find(l, a->as.name);
    if (s != NULL)
        return s->symbol;
    if (constant_find(a->as.name, &c))
        return expr_constant_of(l->engine, c);
    return lower_free_name(l, a->as.name, a->at);
}

/* ---- functions ---- */

/* How many arguments a built-in function takes, in words: "1", "1 or 2", "at least 1". */
static void add_arity(text *t, const char *name)
{
    const char *joint = "";
    for (function_id f = 0; f < FUNCTION_COUNT; f++) {
        if (strcmp(function_name(f), name) != 0)
            continue;
        if (function_most(f) > function_fewest(f))
            text_addf(t, "%sat least %d", joint, function_fewest(f));
        else
            text_addf(t, "%s%d", joint, function_fewest(f));
        joint = " or ";
    }
}

static expr *fail_arity(lowering *l, const syntax *a)
{
    text t;
    text_init(&t);
    add_arity(&t, a->as.call.name.text);
    FAIL(l, a->at, ERROR_VALUE, "`%s` takes %s argument%s, not %zu", a->as.call.name.text, t.bytes,
         strcmp(t.bytes, "1") == 0 ? "" : "s", a->as.call.count);
    text_clear(&t);
    return NULL;
}

static expr *fail_unknown_function(lowering *l, const syntax *a)
{
    const char *name = a->as.call.name.text, *what;
    expr_constant c;
    expr *value;
    lower_meaning m = ask_meaning(l, name, &value, &what);
    if (constant_find(name, &c) || scope_find(l, name) != NULL || m == MEANING_VALUE || m == MEANING_DECLARED)
        return FAIL(l, a->as.call.name.at, ERROR_NAME,
                    "`%s` is no function; multiplication is always written: `%s*(...)`", name, name);
    suggestion s;
    suggestion_init(&s, name);
    suggestion_offer(&s, "sqrt");
    for (function_id f = 0; f < FUNCTION_COUNT; f++)
        suggestion_offer(&s, function_name(f));
    if (l->offer_functions)
        l->offer_functions(l->host, &s);
    if (s.best != NULL)
        return FAIL(l, a->as.call.name.at, ERROR_NAME, "there is no function `%s`; did you mean `%s`?", name, s.best);
    return FAIL(l, a->as.call.name.at, ERROR_NAME, "there is no function `%s`", name);
}

/* Lowers the items onto the pending stack; false after a failure. */
static bool push_all(lowering *l, syntax *const *items, size_t count)
{
    for (size_t k = 0; k < count; k++) {
        expr *item = lower(l, items[k]);
        if (item == NULL)
            return false;
        push(l, item);
    }
    return true;
}

/* The call with its arguments at the top of the pending stack. */
static expr *apply(lowering *l, const syntax *a, expr *const *arguments)
{
    const char *name = a->as.call.name.text;
    size_t n = a->as.call.count;
    const lower_function *own = find_function(l, name);
    if (own != NULL && own->count != n)
        return FAIL(l, a->at, ERROR_VALUE, "`%s` takes %zu argument%s, not %zu", name, own->count,
                    own->count == 1 ? "" : "s", n);
    if (own != NULL)
        return expr_substitute_all(l->engine, own->body, own->parameters, arguments, n);
    if (strcmp(name, "sqrt") == 0 || strcmp(name, "inf") == 0) {
        if (n != 1)
            return FAIL(l, a->at, ERROR_VALUE, "`%s` takes 1 argument, not %zu", name, n);
        return *name == 's' ? expr_sqrt(l->engine, arguments[0]) : expr_direction(l->engine, arguments[0]);
    }
    function_id f = function_find(name, (int)(n < 100000 ? n : 100000));
    if (f != FUNCTION_COUNT)
        return expr_call(l->engine, f, arguments, n);
    return function_find(name, -1) != FUNCTION_COUNT ? fail_arity(l, a) : fail_unknown_function(l, a);
}

static expr *lower_call(lowering *l, const syntax *a)
{
    size_t base = l->pending_count;
    expr *result = push_all(l, a->as.call.arguments, a->as.call.count) ? apply(l, a, l->pending + base) : NULL;
    l->pending_count = base;
    return result;
}

/* ---- operators ---- */

/* Pushes part k of a sum or product. A factor's minus sign becomes a factor of its own, so that -(x + y)*z is not
 * taken for (-x - y)*z. */
static bool push_part(lowering *l, const syntax *a, size_t k)
{
    const syntax *part = a->as.list.parts[k];
    while (a->kind == SYNTAX_PRODUCT && part->kind == SYNTAX_NEGATE) {
        push(l, expr_int(l->engine, -1));
        part = part->as.operand;
    }
    expr *item = lower(l, part);
    if (a->as.list.signs[k] == '-')
        item = placed(l, expr_neg(l->engine, item), part->at);
    else if (a->as.list.signs[k] == '/')
        item = placed(l, expr_pow(l->engine, item, expr_int(l->engine, -1)), part->at);
    push(l, item);
    return item != NULL;
}

static expr *lower_list(lowering *l, const syntax *a)
{
    size_t base = l->pending_count;
    bool sound = true;
    for (size_t k = 0; sound && k < a->as.list.count; k++)
        sound = push_part(l, a, k);
    expr *const *parts = l->pending + base;
    size_t n = l->pending_count - base;
    l->pending_count = base;
    if (!sound)
        return NULL;
    return a->kind == SYNTAX_SUM ? expr_sum(l->engine, parts, n) : expr_product(l->engine, parts, n);
}

/* ---- binders ---- */

/* Lowers a body in which `name` stands for the symbol of that name. The symbol is the plain one, so that a defined
 * name's value that holds it is meant too. */
static expr *lower_under(lowering *l, const char *name, const syntax *body, expr **symbol)
{
    lower_scope s = {name, expr_symbol(l->engine, name), l->scope};
    *symbol = s.symbol;
    if (s.symbol == NULL)
        return NULL;
    l->scope = &s;
    expr *result = lower(l, body);
    l->scope = s.outer;
    return result;
}

static expr *lower_binder(lowering *l, const syntax *a)
{
    expr *symbol;
    expr *from = lower(l, a->as.binder->from);
    expr *to = from ? lower(l, a->as.binder->to) : NULL;
    expr *body = to ? lower_under(l, a->as.binder->variable.text, a->as.binder->body, &symbol) : NULL;
    if (body == NULL)
        return NULL;
    return a->kind == SYNTAX_INTEGRAL ? expr_integral(l->engine, symbol, from, to, body)
                                      : expr_summation(l->engine, symbol, from, to, body);
}

static expr *lower_contour(lowering *l, const syntax *a)
{
    size_t base = l->pending_count;
    expr *symbol, *result = NULL;
    if (push_all(l, a->as.contour->points, a->as.contour->count)) {
        expr *body = lower_under(l, a->as.contour->variable.text, a->as.contour->body, &symbol);
        if (body != NULL)
            result = expr_contour(l->engine, symbol, l->pending + base, a->as.contour->count, body);
    }
    l->pending_count = base;
    return result;
}

static expr *lower_root(lowering *l, const syntax *a)
{
    expr *symbol;
    expr *polynomial = lower_under(l, a->as.root->in.text, a->as.root->of, &symbol);
    expr *near = polynomial ? lower(l, a->as.root->near) : NULL;
    return near ? expr_root(l->engine, symbol, polynomial, near) : NULL;
}

/* The name's own value in place of its symbol, when it has one outside: the derivative at x when x is defined. */
static expr *fill_in(lowering *l, expr *a, const char *name, expr *symbol)
{
    expr *value;
    const char *what;
    if (scope_find(l, name) == NULL && ask_meaning(l, name, &value, &what) == MEANING_VALUE)
        return expr_substitute(l->engine, a, symbol, value);
    return a;
}

static expr *lower_derivative(lowering *l, const syntax *a)
{
    slong order = 1;
    expr *symbol;
    if (a->as.derivative->order != NULL
        && lower_count(l, a->as.derivative->order, "the order of a derivative", 0, ORDER_LIMIT, &order) != TW_OK)
        return NULL;
    expr *result = lower_under(l, a->as.derivative->in.text, a->as.derivative->of, &symbol);
    for (; result != NULL && order > 0; order--)
        result = budget_ok(l->engine) ? expr_derivative(l->engine, result, symbol) : NULL;
    return result ? fill_in(l, result, a->as.derivative->in.text, symbol) : NULL;
}

/* ---- at ---- */

/* The body under all names that are bound from binding k on; their symbols go onto the pending stack. */
static expr *lower_at_body(lowering *l, const syntax *a, size_t k)
{
    if (k == a->as.substitution.count)
        return lower(l, a->as.substitution.body);
    const syntax_binding *b = &a->as.substitution.bindings[k];
    lower_scope s = {b->name.text, expr_symbol(l->engine, b->name.text), l->scope};
    for (size_t j = 0; j < k; j++)
        if (strcmp(a->as.substitution.bindings[j].name.text, b->name.text) == 0)
            return FAIL(l, b->name.at, ERROR_NAME, "`%s` is given two values", b->name.text);
    if (s.symbol == NULL)
        return NULL;
    push(l, s.symbol);
    l->scope = &s;
    expr *result = lower_at_body(l, a, k + 1);
    l->scope = s.outer;
    return result;
}

static expr *lower_at(lowering *l, const syntax *a)
{
    size_t base = l->pending_count, n = a->as.substitution.count;
    if (n > SYNTAX_DEPTH_LIMIT)
        return FAIL(l, a->at, ERROR_VALUE, "`at` takes at most %d bindings", SYNTAX_DEPTH_LIMIT);
    expr *body = lower_at_body(l, a, 0);
    for (size_t k = 0; body != NULL && k < n; k++) {
        expr *value = lower(l, a->as.substitution.bindings[k].values[0]);
        if (value == NULL)
            body = NULL;
        else
            push(l, value);
    }
    if (body != NULL)
        body = expr_substitute_all(l->engine, body, l->pending + base, l->pending + base + n, n);
    l->pending_count = base;
    return body;
}

/* ---- conditions ---- */

void lower_conditions_init(lower_conditions *c)
{
    memset(c, 0, sizeof *c);
}

void lower_conditions_clear(lower_conditions *c)
{
    free(c->list);
    memset(c, 0, sizeof *c);
}

static tw_status conditions_push(lowering *l, lower_conditions *c, expr *relation, span at)
{
    if (placed(l, relation, at) == NULL)
        return TW_ERROR;
    if (c->count == c->room) {
        size_t room = c->room ? 2 * c->room : 4;
        c->list = base_resize(c->list, room * sizeof *c->list);
        c->room = room;
    }
    c->list[c->count++] = relation;
    return TW_OK;
}

static expr *relate(tw_engine *e, syntax_relation r, expr *left, expr *right)
{
    switch (r) {
    case COMPARE_LESS:
        return expr_relation_of(e, RELATION_LESS, left, right);
    case COMPARE_LESS_EQUAL:
        return expr_relation_of(e, RELATION_LESS_EQUAL, left, right);
    case COMPARE_GREATER:
        return expr_relation_of(e, RELATION_LESS, right, left);
    case COMPARE_GREATER_EQUAL:
        return expr_relation_of(e, RELATION_LESS_EQUAL, right, left);
    case COMPARE_EQUAL:
        return expr_relation_of(e, RELATION_EQUAL, left, right);
    case COMPARE_NOT_EQUAL:
        return expr_relation_of(e, RELATION_NOT_EQUAL, left, right);
    }
    return NULL;
}

static tw_status lower_comparison(lowering *l, const syntax *a, lower_conditions *out)
{
    expr *left = lower(l, a->as.comparison.operands[0]);
    for (size_t k = 0; k < a->as.comparison.count; k++) {
        expr *right = left ? lower(l, a->as.comparison.operands[k + 1]) : NULL;
        expr *relation = relate(l->engine, (syntax_relation)a->as.comparison.relations[k], left, right);
        if (conditions_push(l, out, relation, a->at) != TW_OK)
            return TW_ERROR;
        left = right;
    }
    return TW_OK;
}

static tw_status lower_range(lowering *l, const syntax *a, lower_conditions *out)
{
    tw_engine *e = l->engine;
    expr *value = lower(l, a->as.range->value);
    expr *from = value ? lower(l, a->as.range->from) : NULL;
    expr *to = from ? lower(l, a->as.range->to) : NULL;
    if (to == NULL)
        return TW_ERROR;
    expr_relation lower_end = a->as.range->with_from ? RELATION_LESS_EQUAL : RELATION_LESS;
    expr_relation upper_end = a->as.range->with_to ? RELATION_LESS_EQUAL : RELATION_LESS;
    if (!expr_is_minus_inf(from)
        && conditions_push(l, out, expr_relation_of(e, lower_end, from, value), a->at) != TW_OK)
        return TW_ERROR;
    if (!expr_is_inf(to))
        return conditions_push(l, out, expr_relation_of(e, upper_end, value, to), a->at);
    if (expr_is_minus_inf(from)) /* the whole line */
        return conditions_push(l, out, expr_relation_of(e, RELATION_REAL, value, value), a->at);
    return TW_OK;
}

tw_status lower_condition(lowering *l, const syntax *a, lower_conditions *out)
{
    static const expr_relation domains[] = {RELATION_INTEGER, RELATION_REAL, RELATION_COMPLEX};
    if (a->kind == SYNTAX_COMPARISON)
        return lower_comparison(l, a, out);
    if (a->kind == SYNTAX_RANGE)
        return lower_range(l, a, out);
    expr *value = lower(l, a->as.domain.value);
    return conditions_push(l, out, expr_relation_of(l->engine, domains[a->as.domain.domain], value, value), a->at);
}

/* VALUE when all of the conditions hold, else the rest: one piecewise within the other. */
static expr *lower_case(lowering *l, const syntax *condition, expr *value, expr *rest)
{
    size_t base = l->pending_count;
    lower_conditions all;
    lower_conditions_init(&all);
    tw_status status = lower_condition(l, condition, &all);
    for (size_t k = 0; status == TW_OK && k < all.count; k++)
        push(l, all.list[k]);
    lower_conditions_clear(&all);
    for (size_t k = l->pending_count; status == TW_OK && k > base; k--)
        value = expr_piecewise(l->engine, l->pending + k - 1, &value, 1, rest);
    l->pending_count = base;
    return status == TW_OK ? value : NULL;
}

static expr *lower_piecewise(lowering *l, const syntax *a)
{
    size_t base = l->pending_count, n = a->as.piecewise->count;
    if (!push_all(l, a->as.piecewise->values, n)) {
        l->pending_count = base;
        return NULL;
    }
    expr *result = lower(l, a->as.piecewise->otherwise);
    for (size_t k = n; result != NULL && k > 0; k--)
        result = lower_case(l, a->as.piecewise->conditions[k - 1], l->pending[base + k - 1], result);
    l->pending_count = base;
    return result;
}

/* ---- the whole ---- */

static expr *lower_form(lowering *l, const syntax *a)
{
    tw_engine *e = l->engine;
    switch ((syntax_kind)a->kind) {
    case SYNTAX_NUMBER:
        return lower_typed_number(l, a);
    case SYNTAX_NAME:
        return lower_name(l, a);
    case SYNTAX_CALL:
        return lower_call(l, a);
    case SYNTAX_SUM: case SYNTAX_PRODUCT:
        return lower_list(l, a);
    case SYNTAX_NEGATE:
        return expr_neg(e, lower(l, a->as.operand));
    case SYNTAX_POWER: {
        expr *base = lower(l, a->as.power.base);
        return base ? expr_pow(e, base, lower(l, a->as.power.exponent)) : NULL;
    }
    case SYNTAX_FACTORIAL:
        return expr_call1(e, FUNCTION_GAMMA, expr_add(e, lower(l, a->as.operand), expr_int(e, 1)));
    case SYNTAX_INTEGRAL: case SYNTAX_SUMMATION:
        return lower_binder(l, a);
    case SYNTAX_CONTOUR:
        return lower_contour(l, a);
    case SYNTAX_DERIVATIVE:
        return lower_derivative(l, a);
    case SYNTAX_AT:
        return lower_at(l, a);
    case SYNTAX_PIECEWISE:
        return lower_piecewise(l, a);
    case SYNTAX_ROOT:
        return lower_root(l, a);
    case SYNTAX_INDEXED:
        return FAIL(l, a->at, ERROR_NAME, "`%s[...]` is read in `check recurrence` only", a->as.indexed.name);
    case SYNTAX_COMPARISON: case SYNTAX_RANGE: case SYNTAX_DOMAIN:
        break;
    }
    return FAIL(l, a->at, ERROR_VALUE, "a condition is no expression");
}

static expr *lower(lowering *l, const syntax *a)
{
    return placed(l, budget_ok(l->engine) ? lower_form(l, a) : NULL, a->at);
}

expr *lower_expression(lowering *l, const syntax *a)
{
    return lower(l, a);
}

tw_status lower_function_define(lowering *l, const syntax_name *parameters, size_t count, const syntax *body,
                                lower_function *out)
{
    for (size_t k = 0; k < count; k++)
        for (size_t j = 0; j < k; j++)
            if (strcmp(parameters[j].text, parameters[k].text) == 0) {
                FAIL(l, parameters[k].at, ERROR_NAME, "the parameter `%s` stands twice", parameters[k].text);
                return TW_ERROR;
            }
    lower_scope *outer = l->scope;
    lower_scope *scopes = arena_alloc(&l->engine->arena, count * sizeof *scopes);
    expr **symbols = arena_alloc(&l->engine->arena, count * sizeof *symbols);
    for (size_t k = 0; k < count; k++) {
        symbols[k] = expr_fresh(l->engine, parameters[k].text);
        scopes[k] = (lower_scope){parameters[k].text, symbols[k], l->scope};
        if (placed(l, symbols[k], parameters[k].at) == NULL) {
            l->scope = outer;
            return TW_ERROR;
        }
        l->scope = &scopes[k];
    }
    expr *result = lower(l, body);
    l->scope = outer;
    if (result == NULL)
        return TW_ERROR;
    *out = (lower_function){count, symbols, result};
    return TW_OK;
}

tw_status lower_count(lowering *l, const syntax *a, const char *what, slong least, slong most, slong *out)
{
    expr *value = lower(l, a);
    if (value == NULL)
        return TW_ERROR;
    const fmpq *q = expr_is_number(value) ? expr_number(value) : NULL;
    if (q == NULL || !fmpz_is_one(fmpq_denref(q)) || fmpz_cmp_si(fmpq_numref(q), least) < 0
        || fmpz_cmp_si(fmpq_numref(q), most) > 0) {
        FAIL(l, a->at, ERROR_VALUE, "%s must be a whole number from %ld to %ld", what, (long)least, (long)most);
        return TW_ERROR;
    }
    *out = fmpz_get_si(fmpq_numref(q));
    return TW_OK;
}
