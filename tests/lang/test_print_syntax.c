/* Round trips: what is printed parses back to an equal tree, and prints the same again. Trees are made at random and
 * must cover every form of statement, move, pass and expression; the seed is printed and taken from TW_SEED. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <cmocka.h>

#include "lang/parse.h"

enum { TREES = 20000, SOUPS = 40000 };

/* ---- making trees at random ---- */

typedef struct maker {
    arena arena;
    uint64_t state;
    bool indexed;
    unsigned forms[SYNTAX_DOMAIN + 1], statements[STATEMENT_KIND_COUNT], moves[MOVE_KIND_COUNT], passes[PASS_OR + 1];
} maker;

static unsigned pick(maker *m, unsigned n)
{
    m->state = m->state * 6364136223846793005u + 1442695040888963407u;
    return (unsigned)(m->state >> 33) % n;
}

static void *make(maker *m, size_t bytes)
{
    return memset(arena_alloc(&m->arena, bytes), 0, bytes);
}

#define PICK(m, list) (list)[pick(m, sizeof(list) / sizeof *(list))]

/* Names, many of which are words elsewhere; none is reserved. */
static const char *make_word(maker *m)
{
    static const char *const names[] = {
        "x", "s", "A", "nu", "theta_2", "exp", "Gamma", "dx", "delta", "d", "d_1", "of", "to", "from", "in", "at", "with", "by",
        "when", "otherwise", "becomes", "because", "terms", "digits", "points", "integer", "real", "order", "near", "step",
        "over", "as", "on", "then", "or", "not", "log", "c", "json", "all", "parts", "split", "swap", "expansion", "e", "\u00df",
        "\u03a9\u03bc\u03ad\u03b3\u03b1", "\u0436", "\u5909\u6570", "x\u0301", "error", "relative", "integrating", "along",
    };
    return PICK(m, names);
}

static syntax_name make_name(maker *m)
{
    syntax_name n = {make_word(m), {0, 0}};
    return n;
}

static syntax_name maybe_name(maker *m)
{
    static const syntax_name none;
    return pick(m, 2) ? make_name(m) : none;
}

static const char *make_text(maker *m)
{
    static const char *const texts[] = {"fade.json", "", "a \"quoted\" name", "back\\slash\\", "\u00fcber #1", "DLMF 5.9.1"};
    return PICK(m, texts);
}

static syntax *make_expression(maker *m, unsigned size);
static syntax *make_condition(maker *m, unsigned size);

static syntax *maybe_expression(maker *m, unsigned size)
{
    return pick(m, 2) ? make_expression(m, size) : NULL;
}

static syntax **make_expressions(maker *m, size_t count, unsigned size)
{
    syntax **list = make(m, count * sizeof *list);
    for (size_t k = 0; k < count; k++)
        list[k] = make_expression(m, size);
    return list;
}

static syntax_bindings make_bindings(maker *m, unsigned size, bool single)
{
    syntax_bindings b = {1 + pick(m, 3), NULL};
    b.list = make(m, b.count * sizeof *b.list);
    for (size_t k = 0; k < b.count; k++) {
        syntax_binding *one = &b.list[k];
        one->name = make_name(m);
        if (single || pick(m, 2)) {
            one->count = single ? 1 : 1 + pick(m, 3);
            one->values = make_expressions(m, one->count, size);
            continue;
        }
        one->from = make_expression(m, size);
        one->to = make_expression(m, size);
        if (pick(m, 2)) {
            one->step = make_expression(m, size);
        } else {
            one->points = make_expression(m, size);
            one->log_scale = pick(m, 2);
        }
    }
    return b;
}

static syntax *make_leaf(maker *m)
{
    static const char *const numbers[] = {"0", "3", "0.25", "1e-8", "2E+5", "12345678901234567890.0001"};
    static const char *const constants[] = {"pi", "i", "inf", "euler_constant"};
    syntax *a = make(m, sizeof *a);
    a->kind = pick(m, 2) ? SYNTAX_NAME : SYNTAX_NUMBER;
    if (a->kind == SYNTAX_NUMBER)
        a->as.number = PICK(m, numbers);
    else
        a->as.name = pick(m, 4) ? make_word(m) : PICK(m, constants);
    m->forms[a->kind]++;
    return a;
}

static void make_list(maker *m, syntax *a, unsigned size)
{
    size_t n = 2 + pick(m, 3);
    a->as.list.count = n;
    a->as.list.parts = make_expressions(m, n, size);
    a->as.list.signs = make(m, n);
    for (size_t k = 0; k < n; k++)
        a->as.list.signs[k] = (a->kind == SYNTAX_SUM ? "+-" : "*/")[k > 0 && pick(m, 2)];
}

static void make_binder(maker *m, syntax *a, unsigned size)
{
    a->as.binder = make(m, sizeof *a->as.binder);
    a->as.binder->variable = make_name(m);
    a->as.binder->from = make_expression(m, size);
    a->as.binder->to = make_expression(m, size);
    a->as.binder->body = make_expression(m, size);
}

static void make_piecewise(maker *m, syntax *a, unsigned size)
{
    size_t n = 1 + pick(m, 3);
    a->as.piecewise = make(m, sizeof *a->as.piecewise);
    a->as.piecewise->count = n;
    a->as.piecewise->values = make_expressions(m, n, size);
    a->as.piecewise->conditions = make(m, n * sizeof(syntax *));
    for (size_t k = 0; k < n; k++)
        a->as.piecewise->conditions[k] = make_condition(m, size);
    a->as.piecewise->otherwise = make_expression(m, size);
}

static syntax *make_expression(maker *m, unsigned size)
{
    if (size == 0)
        return make_leaf(m);
    unsigned kind = pick(m, SYNTAX_ROOT + 1);
    if (kind <= SYNTAX_NAME || (kind == SYNTAX_INDEXED && !m->indexed))
        return make_leaf(m);
    syntax *a = make(m, sizeof *a);
    a->kind = (uint8_t)kind;
    m->forms[kind]++;
    size--;
    switch ((syntax_kind)kind) {
    case SYNTAX_CALL:
        a->as.call.name = make_name(m);
        a->as.call.count = 1 + pick(m, 3);
        a->as.call.arguments = make_expressions(m, a->as.call.count, size);
        break;
    case SYNTAX_INDEXED:
        a->as.indexed.name = make_word(m);
        a->as.indexed.index = make_expression(m, size);
        break;
    case SYNTAX_SUM: case SYNTAX_PRODUCT:
        make_list(m, a, size);
        break;
    case SYNTAX_NEGATE: case SYNTAX_FACTORIAL:
        a->as.operand = make_expression(m, size);
        break;
    case SYNTAX_POWER:
        a->as.power.base = make_expression(m, size);
        a->as.power.exponent = make_expression(m, size);
        break;
    case SYNTAX_INTEGRAL: case SYNTAX_SUMMATION:
        make_binder(m, a, size);
        break;
    case SYNTAX_CONTOUR:
        a->as.contour = make(m, sizeof *a->as.contour);
        a->as.contour->variable = make_name(m);
        a->as.contour->count = 2 + pick(m, 3);
        a->as.contour->points = make_expressions(m, a->as.contour->count, size);
        a->as.contour->body = make_expression(m, size);
        break;
    case SYNTAX_DERIVATIVE:
        a->as.derivative = make(m, sizeof *a->as.derivative);
        a->as.derivative->of = make_expression(m, size);
        a->as.derivative->in = make_name(m);
        a->as.derivative->order = maybe_expression(m, size);
        break;
    case SYNTAX_AT: {
        syntax_bindings b = make_bindings(m, size, true);
        a->as.substitution.body = make_expression(m, size);
        a->as.substitution.count = b.count;
        a->as.substitution.bindings = b.list;
        break;
    }
    case SYNTAX_PIECEWISE:
        make_piecewise(m, a, size);
        break;
    default: /* SYNTAX_ROOT */
        a->as.root = make(m, sizeof *a->as.root);
        a->as.root->of = make_expression(m, size);
        a->as.root->in = make_name(m);
        a->as.root->near = make_expression(m, size);
        break;
    }
    return a;
}

static syntax *make_range(maker *m, syntax *value, unsigned size)
{
    syntax *a = make(m, sizeof *a);
    a->kind = SYNTAX_RANGE;
    a->as.range = make(m, sizeof *a->as.range);
    a->as.range->value = value;
    a->as.range->from = make_expression(m, size);
    a->as.range->to = make_expression(m, size);
    a->as.range->with_from = pick(m, 2);
    a->as.range->with_to = pick(m, 2);
    m->forms[SYNTAX_RANGE]++;
    return a;
}

static syntax *make_condition(maker *m, unsigned size)
{
    unsigned kind = pick(m, 3);
    if (kind == 0)
        return make_range(m, make_expression(m, size), size);
    syntax *a = make(m, sizeof *a);
    a->kind = kind == 1 ? SYNTAX_COMPARISON : SYNTAX_DOMAIN;
    m->forms[a->kind]++;
    if (kind == 1) {
        a->as.comparison.count = 1 + pick(m, 2);
        a->as.comparison.operands = make_expressions(m, a->as.comparison.count + 1, size);
        a->as.comparison.relations = make(m, a->as.comparison.count);
        for (size_t k = 0; k < a->as.comparison.count; k++)
            a->as.comparison.relations[k] = (uint8_t)pick(m, COMPARE_NOT_EQUAL + 1);
    } else {
        a->as.domain.value = make_expression(m, size);
        a->as.domain.domain = (syntax_domain)pick(m, DOMAIN_COMPLEX + 1);
    }
    return a;
}

static syntax_conditions make_conditions(maker *m, size_t count)
{
    syntax_conditions c = {count, make(m, count * sizeof *c.list)};
    for (size_t k = 0; k < count; k++)
        c.list[k] = make_condition(m, 2);
    return c;
}

static syntax_pass *make_pass(maker *m, unsigned size)
{
    syntax_pass *a = make(m, sizeof *a);
    a->kind = (uint8_t)(size == 0 ? PASS_NAME : pick(m, PASS_OR + 1));
    m->passes[a->kind]++;
    if (a->kind == PASS_NAME) {
        a->name = make_word(m);
        return a;
    }
    a->count = a->kind >= PASS_THEN ? 2 + pick(m, 2) : 1;
    a->parts = make(m, a->count * sizeof *a->parts);
    for (size_t k = 0; k < a->count; k++)
        a->parts[k] = make_pass(m, size - 1);
    return a;
}

static void make_move(maker *m, statement *s)
{
    s->as.move = make(m, sizeof *s->as.move);
    move_kind kind = (move_kind)pick(m, MOVE_KIND_COUNT);
    s->as.move->kind = (uint8_t)kind;
    m->moves[kind]++;
    s->as.move->integral = maybe_expression(m, 1);
    switch (kind) {
    case MOVE_SUBSTITUTE:
        s->as.move->as.substitute.name = make_name(m);
        s->as.move->as.substitute.value = make_expression(m, 2);
        s->as.move->as.substitute.new_name = maybe_name(m);
        if (s->as.move->as.substitute.new_name.text != NULL)
            s->as.move->as.substitute.inverse = make_expression(m, 2);
        break;
    case MOVE_PARTS:
        s->as.move->as.factor = make_expression(m, 3);
        break;
    case MOVE_REPEAT_PARTS:
        s->as.move->as.times = make_expression(m, 1);
        break;
    case MOVE_DIFFERENTIATE: case MOVE_INTEGRATE_BACK:
        s->as.move->as.parameter.in = make_name(m);
        s->as.move->as.parameter.from = kind == MOVE_INTEGRATE_BACK ? make_expression(m, 2) : NULL;
        break;
    case MOVE_SPLIT: case MOVE_ROTATE:
        s->as.move->as.place = make_expression(m, 2);
        break;
    case MOVE_EXPAND:
        s->as.move->as.expand.factor = make_expression(m, 2);
        s->as.move->as.expand.around = make_expression(m, 2);
        s->as.move->as.expand.terms = make_expression(m, 1);
        break;
    case MOVE_USE_RULE:
        s->as.move->as.rule = make_name(m);
        break;
    case MOVE_REWRITE:
        s->as.move->as.with = make_pass(m, 2);
        break;
    default:
        break;
    }
}

static void make_rule(maker *m, statement *s)
{
    s->as.rule = make(m, sizeof *s->as.rule);
    s->as.rule->name = make_name(m);
    s->as.rule->count = pick(m, 4);
    s->as.rule->parameters = make(m, s->as.rule->count * sizeof *s->as.rule->parameters);
    for (size_t k = 0; k < s->as.rule->count; k++) {
        syntax_parameter *p = &s->as.rule->parameters[k];
        p->name = make_name(m);
        p->count = pick(m, 3);
        p->names = make(m, p->count * sizeof *p->names);
        for (size_t j = 0; j < p->count; j++)
            p->names[j] = make_name(m);
    }
    s->as.rule->pattern = make_expression(m, 3);
    s->as.rule->becomes = make_expression(m, 3);
    s->as.rule->when = make_conditions(m, pick(m, 3));
    s->as.rule->because = pick(m, 2) ? make_text(m) : NULL;
}

static statement *make_statement(maker *m, statement_kind kind);

static void make_let(maker *m, statement *s)
{
    s->as.let.name = make_name(m);
    if (pick(m, 3) == 0) {
        statement_kind kind;
        do
            kind = (statement_kind)pick(m, STATEMENT_KIND_COUNT);
        while (!statement_gives_value(kind));
        s->as.let.request = make_statement(m, kind);
        return;
    }
    s->as.let.is_function = pick(m, 2);
    s->as.let.count = s->as.let.is_function ? 1 + pick(m, 3) : 0;
    s->as.let.parameters = make(m, s->as.let.count * sizeof(syntax_name));
    for (size_t k = 0; k < s->as.let.count; k++)
        s->as.let.parameters[k] = make_name(m);
    s->as.let.value = make_expression(m, 4);
}

static void make_large(maker *m, statement *s)
{
    s->as.large.name = make_name(m);
    if (s->kind == STATEMENT_SMALL)
        return;
    s->as.large.integer = pick(m, 2);
    if (pick(m, 2)) {
        syntax *call = make(m, sizeof *call), *name = make_leaf(m);
        name->kind = SYNTAX_NAME;
        name->as.name = s->as.large.name.text;
        call->kind = SYNTAX_CALL;
        call->as.call.name.text = "arg";
        call->as.call.count = 1;
        call->as.call.arguments = make(m, sizeof(syntax *));
        call->as.call.arguments[0] = name;
        s->as.large.sector = make_range(m, call, 1);
    }
}

static void make_evaluate(maker *m, statement *s)
{
    s->as.evaluate = make(m, sizeof *s->as.evaluate);
    s->as.evaluate->subject = make_expression(m, 2);
    if (pick(m, 2))
        s->as.evaluate->at = make_bindings(m, 1, false);
    else if (pick(m, 2))
        s->as.evaluate->points_file = make_text(m);
    s->as.evaluate->digits = maybe_expression(m, 1);
    s->as.evaluate->terms = maybe_expression(m, 1);
    s->as.evaluate->all_contributions = pick(m, 2);
    s->as.evaluate->to_file = pick(m, 2) ? make_text(m) : NULL;
}

static void make_plan(maker *m, statement *s)
{
    s->as.plan = make(m, sizeof *s->as.plan);
    s->as.plan->subject = make_expression(m, 2);
    s->as.plan->error = make_expression(m, 1);
    s->as.plan->over = maybe_name(m);
    if (s->as.plan->over.text != NULL) {
        s->as.plan->from = make_expression(m, 1);
        s->as.plan->to = make_expression(m, 1);
    }
}

static void make_request(maker *m, statement *s)
{
    static const char *const helps[] = {"", "expand", "!= \" # anything", "\u03c0"};
    switch ((statement_kind)s->kind) {
    case STATEMENT_CHECK_RECURRENCE:
        if (pick(m, 2)) {
            m->indexed = true;
            s->as.check_recurrence.left = make_expression(m, 2);
            s->as.check_recurrence.right = make_expression(m, 3);
            m->indexed = false;
        }
        s->as.check_recurrence.of = make_expression(m, 2);
        return;
    case STATEMENT_REWRITE:
        s->as.rewrite.value = make_expression(m, 2);
        s->as.rewrite.with = make_pass(m, 3);
        return;
    case STATEMENT_STEPS:
        s->as.subject = maybe_expression(m, 2);
        return;
    case STATEMENT_REPLAY:
        s->as.replay.derivation = make_expression(m, 1);
        s->as.replay.on = make_expression(m, 2);
        return;
    case STATEMENT_EXPAND:
        s->as.expand = make(m, sizeof *s->as.expand);
        s->as.expand->subject = make_expression(m, 3);
        s->as.expand->terms = make_expression(m, 1);
        s->as.expand->by = maybe_name(m);
        s->as.expand->as = maybe_name(m);
        return;
    case STATEMENT_COEFFICIENTS:
        s->as.coefficients.of = make_expression(m, 2);
        if (pick(m, 2)) {
            s->as.coefficients.from = make_expression(m, 1);
            s->as.coefficients.to = make_expression(m, 1);
        }
        return;
    case STATEMENT_REMAINDER:
        s->as.remainder.of = make_expression(m, 2);
        s->as.remainder.terms = maybe_expression(m, 1);
        return;
    case STATEMENT_EVALUATE:
        make_evaluate(m, s);
        return;
    case STATEMENT_COMPARE:
        s->as.compare.subject = make_expression(m, 2);
        s->as.compare.at = make_bindings(m, 1, false);
        return;
    case STATEMENT_PLAN:
        make_plan(m, s);
        return;
    case STATEMENT_PLOT:
        s->as.plot = make(m, sizeof *s->as.plot);
        s->as.plot->terms = pick(m, 2);
        s->as.plot->of = make_expression(m, 2);
        s->as.plot->at = make_bindings(m, 1, false);
        s->as.plot->to_file = make_text(m);
        return;
    case STATEMENT_WRITE:
        s->as.write.subject = make_expression(m, 2);
        s->as.write.format = make_name(m);
        s->as.write.to_file = make_text(m);
        return;
    case STATEMENT_HELP:
        s->as.help = PICK(m, helps);
        return;
    case STATEMENT_UNDO: case STATEMENT_QUIT:
        return;
    default: /* DERIVE, RECURRENCE, GROWTH, EXPANSION_OF, RULE_FROM */
        s->as.subject = make_expression(m, 3);
        return;
    }
}

static statement *make_statement(maker *m, statement_kind kind)
{
    statement *s = make(m, sizeof *s);
    s->kind = (uint8_t)kind;
    m->statements[kind]++;
    switch (kind) {
    case STATEMENT_LARGE: case STATEMENT_SMALL:
        make_large(m, s);
        break;
    case STATEMENT_GIVEN: case STATEMENT_GRANT:
        s->as.given = make_conditions(m, 1 + pick(m, 3));
        break;
    case STATEMENT_LET:
        make_let(m, s);
        break;
    case STATEMENT_USE:
        if (pick(m, 2))
            s->as.use.name = make_name(m);
        else
            s->as.use.file = make_text(m);
        break;
    case STATEMENT_RULE:
        make_rule(m, s);
        break;
    case STATEMENT_PASS:
        s->as.pass.name = make_name(m);
        s->as.pass.value = make_pass(m, 4);
        break;
    case STATEMENT_CHECK_RULE: case STATEMENT_WHY_NOT: case STATEMENT_SHOW: case STATEMENT_DROP:
        s->as.name = make_name(m);
        break;
    case STATEMENT_DONE:
        s->as.name = maybe_name(m);
        break;
    case STATEMENT_CHECK_FILE:
        s->as.file = make_text(m);
        break;
    case STATEMENT_MOVE:
        make_move(m, s);
        break;
    default:
        make_request(m, s);
        break;
    }
    return s;
}

/* ---- the tests ---- */

static uint64_t test_seed(void)
{
    const char *given = getenv("TW_SEED");
    uint64_t seed = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL) * 1000003u;
    printf("TW_SEED=%llu\n", (unsigned long long)seed);
    return seed;
}

static void fail_with_errors(const char *why, source *s, const syntax_text *t)
{
    text shown;
    text_init(&shown);
    for (size_t k = 0; k < t->error_count; k++)
        source_show_error(s, &shown, t->errors[k].at, t->errors[k].words);
    print_error("%s:\n%s\n", why, s->bytes);
    fail_msg("%s", shown.bytes ? shown.bytes : "another number of statements");
}

/* Prints, parses, compares; then prints again and compares the texts. */
static void check_round_trip(const statement *s)
{
    text first, second;
    source src;
    syntax_text t;
    text_init(&first);
    text_init(&second);
    statement_print(&first, s);
    source_init(&src, "printed", first.bytes, first.length);
    syntax_text_init(&t);
    parse_text(&src, &t);
    if (t.error_count != 0 || t.count != 1)
        fail_with_errors("a printed statement does not parse", &src, &t);
    statement_print(&second, t.statements[0]);
    if (!statement_equal(s, t.statements[0]))
        fail_msg("another tree:\n%s\n%s", first.bytes, second.bytes);
    if (strcmp(first.bytes, second.bytes) != 0)
        fail_msg("printed differently:\n%s\n%s", first.bytes, second.bytes);
    syntax_text_clear(&t);
    text_clear(&first);
    text_clear(&second);
}

static void random_trees_come_back(void **state)
{
    (void)state;
    maker m = {.state = test_seed()};
    for (unsigned k = 0; k < TREES; k++) {
        statement_kind kind;
        do
            kind = (statement_kind)(k % STATEMENT_KIND_COUNT);
        while (kind == STATEMENT_EXPANSION_OF && ++k);
        if (kind == STATEMENT_RULE_FROM)
            kind = STATEMENT_LET; /* both stand after `let NAME =` only */
        arena_init(&m.arena);
        check_round_trip(make_statement(&m, kind));
        arena_clear(&m.arena);
    }
    for (unsigned k = 0; k <= SYNTAX_DOMAIN; k++)
        assert_true(m.forms[k] > 10);
    for (unsigned k = 0; k < STATEMENT_KIND_COUNT; k++)
        assert_true(m.statements[k] > 10);
    for (unsigned k = 0; k < MOVE_KIND_COUNT; k++)
        assert_true(m.moves[k] > 10);
    for (unsigned k = 0; k <= PASS_OR; k++)
        assert_true(m.passes[k] > 10);
}

/* Words thrown together: whatever of it parses must come back. */
static void random_words_come_back(void **state)
{
    static const char *const words[] = {
        "x", "3", "0.5", "+", "-", "*", "/", "^", "!", "(", ")", ",", "=", "<", ">=", "!=", "of", "from", "to", "in", "at", "dx",
        "dt", "inf", "pi", "i", "integral from 0 to 1 of", "sum from k = 0 to", "derivative of", "root of", "near", "order",
        "piecewise(", "when", "otherwise", "let A =", "let f(x) =", "given", "integer", "expand", "terms", "evaluate", "\n",
        "as", "with", "log", "integral along", "check recurrence", "c[", "]", "compare", "by", "steps", "split at", "rotate by",
    };
    (void)state;
    maker m = {.state = test_seed()};
    unsigned parsed = 0;
    for (unsigned k = 0; k < SOUPS; k++) {
        text soup;
        source src;
        syntax_text t;
        text_init(&soup);
        text_add(&soup, pick(&m, 2) ? "let A = " : "");
        for (unsigned n = 1 + pick(&m, 9); n > 0; n--)
            text_addf(&soup, "%s ", PICK(&m, words));
        source_init(&src, "soup", soup.bytes, soup.length);
        syntax_text_init(&t);
        parse_text(&src, &t);
        for (size_t j = 0; j < t.count; j++)
            check_round_trip(t.statements[j]);
        parsed += t.count > 0;
        syntax_text_clear(&t);
        text_clear(&soup);
    }
    assert_true(parsed > SOUPS / 100);
}

/* Texts that are printed in another form than they were typed in. */
static void texts_are_printed_in_the_usual_form(void **state)
{
    static const char *const pairs[][2] = {
        {"let A = ((x))", "let A = x"},
        {"let A = (a+b)+c-(d-e)", "let A = (a + b) + c - (d - e)"},
        {"let A = a*(b/c)/(d*e)*(-f)", "let A = a*(b/c)/(d*e)*-f"},
        {"let A = (-x)^2 + (-(x^2)) + (-x)!", "let A = (-x)^2 + -x^2 + (-x)!"},
        {"let A = x^(y^z) + (x^y)^z + x^(-1) + (x^2)!", "let A = x^y^z + (x^y)^z + x^-1 + (x^2)!"},
        {"let A = (sum from k = 0 to 3 of x^k)*y", "let A = (sum from k = 0 to 3 of x^k)*y"},
        {"let A = y*(sum from k = 0 to 3 of x^k)", "let A = y*sum from k = 0 to 3 of x^k"},
        {"let A = (integral from 0 to 1 of (x) dx)*y", "let A = integral from 0 to 1 of x dx*y"},
        {"let A = \u03c0 + \u0393(\u221e)\u00b72", "let A = pi + Gamma(inf)*2"},
        {"given x\u22643, y\u22655, z\u2260w", "given x <= 3, y >= 5, z != w"},
        {"expand F by parts as A to 3 terms", "expand F to 3 terms by parts as A"},
        {"evaluate A with all contributions with 3 terms to \"f\" to 5 digits at s = 1, 2",
         "evaluate A at s = 1, 2 to 5 digits with 3 terms with all contributions to \"f\""},
        {"pass p = (a then b) then (c or d) or (repeat (once e))", "pass p = (a then b) then (c or d) or repeat once e"},
        {"let A = to + (of)", "let A = (to) + (of)"},
        {"help   large  ", "help large"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++) {
        source src;
        syntax_text t;
        text out;
        text_init(&out);
        source_init(&src, "typed", pairs[k][0], strlen(pairs[k][0]));
        syntax_text_init(&t);
        parse_text(&src, &t);
        if (t.count != 1 || t.error_count != 0)
            fail_with_errors("does not parse", &src, &t);
        statement_print(&out, t.statements[0]);
        assert_string_equal(out.bytes, pairs[k][1]);
        text_clear(&out);
        syntax_text_clear(&t);
    }
}

/* What differs is not called equal: otherwise the round trips would prove nothing. */
static void different_statements_are_not_equal(void **state)
{
    static const char *const pairs[][2] = {
        {"let A = a - b - c", "let A = a - (b - c)"},
        {"let A = a/b*c", "let A = a/(b*c)"},
        {"let A = a - b", "let A = a + b"},
        {"let A = x^y^z", "let A = (x^y)^z"},
        {"let A = 1", "let A = 1.0"},
        {"let A = integral from 0 to 1 of x dx", "let A = integral from 0 to 1 of x dy"},
        {"let A = integral along 0 to 1 of x dx", "let A = integral from 0 to 1 of x dx"},
        {"let A = (f at x = 1)", "let A = (f at x = 2)"},
        {"let A = derivative of f in x", "let A = derivative of f in x order 1"},
        {"given x in (0, 1)", "given x in (0, 1]"},
        {"given x < 1", "given x <= 1"},
        {"given x integer", "given x real"},
        {"large n", "large n integer"},
        {"large n", "small n"},
        {"large s", "large s, arg(s) in (0, 1)"},
        {"use a", "use \"a\""},
        {"pass p = a then b or c", "pass p = a then (b or c)"},
        {"pass p = once a", "pass p = repeat a"},
        {"rule r(x): x becomes 1", "rule r(x): x becomes 1 when x > 0"},
        {"rule r(x): x becomes 1", "rule r(x): x becomes 1 because \"it\""},
        {"rule r(f(x)): x becomes 1", "rule r(f(y)): x becomes 1"},
        {"let f(x) = x", "let f(y) = x"},
        {"let f = x", "let f(x) = x"},
        {"let A = steps B", "let A = growth of B"},
        {"expand A to 3 terms", "expand A to 3 terms by parts"},
        {"expand A to 3 terms as B", "expand A to 3 terms as C"},
        {"coefficients of A", "coefficients of A from 1 to 2"},
        {"remainder of A", "remainder of A with 2 terms"},
        {"evaluate A at s = 1", "evaluate A at s = 1, 2"},
        {"evaluate A at s = 1", "evaluate A at s = 1 to 3 digits"},
        {"evaluate A at s = 1", "evaluate A at s = 1 with 3 terms"},
        {"evaluate A at s = 1", "evaluate A at s = 1 with all contributions"},
        {"evaluate A at s = 1", "evaluate A at points of \"s\""},
        {"evaluate A at s from 1 to 2 step 1", "evaluate A at s from 1 to 2 in 1 points"},
        {"evaluate A at s from 1 to 2 in 9 points", "evaluate A at s from 1 to 2 in 9 points on a log scale"},
        {"plan A for relative error 1", "plan A for relative error 1 over s from 1 to 2"},
        {"plot error of A at s = 1 to \"f\"", "plot terms of A at s = 1 to \"f\""},
        {"write A as json to \"f\"", "write A as csv to \"f\""},
        {"write A as json to \"f\"", "write A as json to \"g\""},
        {"done", "done as D"},
        {"steps", "steps A"},
        {"show A", "drop A"},
        {"help a", "help b"},
        {"split at 1", "rotate by 1"},
        {"swap", "swap in integral 1"},
        {"substitute x = t", "substitute x = t with t = x"},
        {"parts integrating x", "parts integrating y"},
        {"differentiate in a", "integrate back in a from 1"},
        {"check recurrence of A", "check recurrence c[n] = 1 of A"},
        {"rewrite x with a", "rewrite with a"},
        {"use a", "use rule a"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof pairs / sizeof *pairs; k++) {
        source src[2];
        syntax_text t[2];
        for (int j = 0; j < 2; j++) {
            source_init(&src[j], "typed", pairs[k][j], strlen(pairs[k][j]));
            syntax_text_init(&t[j]);
            parse_text(&src[j], &t[j]);
            if (t[j].count != 1 || t[j].error_count != 0)
                fail_with_errors("does not parse", &src[j], &t[j]);
            check_round_trip(t[j].statements[0]);
        }
        if (statement_equal(t[0].statements[0], t[1].statements[0]))
            fail_msg("taken for equal: %s | %s", pairs[k][0], pairs[k][1]);
        syntax_text_clear(&t[0]);
        syntax_text_clear(&t[1]);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(random_trees_come_back),
        cmocka_unit_test(random_words_come_back),
        cmocka_unit_test(texts_are_printed_in_the_usual_form),
        cmocka_unit_test(different_statements_are_not_equal),
    };
    return cmocka_run_group_tests_name("print_syntax", tests, NULL, NULL);
}
