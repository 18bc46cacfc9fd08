/* Expressions and conditions: one function a level of binding, from sums down to operands. Knows which words open an
 * expression and which names can't be bound; what a name means is not asked here. Sums and products are flat lists,
 * so that a long one is not a deep one. */
#include "lang/parser.h"

#include <string.h>

static syntax *parse_operand(parser *p);

static syntax *node_new(parser *p, syntax_kind kind, uint32_t from)
{
    syntax *a = parser_alloc(p, sizeof *a);
    a->kind = (uint8_t)kind;
    a->at.from = from;
    return a;
}

static syntax *node_done(parser *p, syntax *a)
{
    a->at = parser_span(p, a->at.from);
    p->operand_end = a->at.to;
    return a;
}

static bool token_is(const parser *p, token t, const char *word)
{
    size_t length = t.at.to - t.at.from;
    return t.kind == TOKEN_NAME && length == strlen(word) && memcmp(p->source->bytes + t.at.from, word, length) == 0;
}

static bool token_is_differential(const parser *p, token t)
{
    const char *at = p->source->bytes + t.at.from;
    return t.kind == TOKEN_NAME && *at == 'd' && lexer_is_name(at + 1, t.at.to - t.at.from - 1);
}

/* In place of the word that ends an operand: any dx. */
static const char differential[] = "dx";

/* ---- operands ---- */

static syntax *parse_number(parser *p)
{
    syntax *a = node_new(p, SYNTAX_NUMBER, p->token.at.from);
    a->as.number = arena_copy(&p->out->arena, p->source->bytes + p->token.at.from, p->token.at.to - p->token.at.from);
    parser_advance(p);
    return node_done(p, a);
}

/* The list after an open bracket, up to and with its closing. */
static bool parse_arguments(parser *p, syntax *call)
{
    token bracket;
    size_t base = p->pending_count;
    parser_open(p, &bracket);
    if (parser_at(p, TOKEN_CLOSE))
        return parser_fail_here(p, "`%s` needs an argument within its brackets", call->as.call.name.text);
    for (;;) {
        syntax *argument = parse_sum(p, "a function's argument is missing here", "");
        if (argument == NULL)
            return false;
        parser_push(p, argument, 0);
        if (!parser_at(p, TOKEN_COMMA))
            break;
        parser_advance(p);
    }
    if (!parser_close(p, bracket, TOKEN_CLOSE))
        return false;
    call->as.call.count = p->pending_count - base;
    call->as.call.arguments = parser_pop(p, base, NULL);
    return true;
}

static syntax *parse_index(parser *p, syntax_name name)
{
    if (!p->indexed) {
        parser_fail_here(p, "`%s[...]` is read in `check recurrence` only", name.text);
        return NULL;
    }
    token bracket;
    syntax *a = node_new(p, SYNTAX_INDEXED, name.at.from);
    a->as.indexed.name = name.text;
    parser_open(p, &bracket);
    a->as.indexed.index = parse_sum(p, "the index is missing here", "");
    return a->as.indexed.index && parser_close(p, bracket, TOKEN_CLOSE_SQUARE) ? node_done(p, a) : NULL;
}

/* A name, a call, or a coefficient c[n]. */
static syntax *parse_named(parser *p)
{
    syntax_name name = {p->name->text, p->token.at};
    parser_advance(p);
    if (parser_at(p, TOKEN_OPEN)) {
        syntax *call = node_new(p, SYNTAX_CALL, name.at.from);
        call->as.call.name = name;
        return parse_arguments(p, call) ? node_done(p, call) : NULL;
    }
    if (parser_at(p, TOKEN_OPEN_SQUARE))
        return parse_index(p, name);
    syntax *a = node_new(p, SYNTAX_NAME, name.at.from);
    a->as.name = name.text;
    return node_done(p, a);
}

/* EXPRESSION, or EXPRESSION at x = 3, y = 2, in brackets. */
static syntax *parse_brackets(parser *p)
{
    token bracket;
    syntax_bindings bindings;
    parser_open(p, &bracket);
    syntax *body = parse_sum(p, "expected an expression after `(`", "at");
    if (body == NULL)
        return NULL;
    if (!parser_at_word(p, "at")) {
        if (!parser_close(p, bracket, TOKEN_CLOSE))
            return NULL;
        p->operand_end = p->last.at.to;
        return body;
    }
    parser_go_on(p);
    syntax *a = node_new(p, SYNTAX_AT, bracket.at.from);
    if (!parse_bindings(p, &bindings, true) || !parser_close(p, bracket, TOKEN_CLOSE))
        return NULL;
    a->as.substitution.body = body;
    a->as.substitution.count = bindings.count;
    a->as.substitution.bindings = bindings.list;
    return node_done(p, a);
}

/* The differential that closes an integral. */
static bool parse_differential(parser *p, const syntax *body, token opening, syntax_name *variable)
{
    if (parser_at(p, TOKEN_NAME) && p->name->differential != NULL) {
        variable->text = p->name->differential;
        variable->at = (span){p->token.at.from + 1, p->token.at.to};
        if (word_is_reserved(variable->text))
            return parser_fail_reserved(p, variable->text);
        parser_advance(p);
        return true;
    }
    if (p->failed)
        return false;
    const char *name = body->kind == SYNTAX_NAME ? body->as.name : "";
    if (name[0] == 'd' && lexer_is_name(name + 1, strlen(name + 1)))
        return parser_fail(p, body->at, "the integral has no body: write `of 1 %s`", name);
    if (parser_at_word(p, "d") && parser_peek(p).kind == TOKEN_NAME)
        return parser_fail_here(p, "the `d` and the variable that close an integral are one word, such as `dx`");
    if (token_is_bad(p->token.kind) || parser_at(p, TOKEN_NAME) || parser_at(p, TOKEN_OPEN)
        || parser_at(p, TOKEN_NUMBER))
        return parser_expected(p, "an operator, or the `d...` that closes the integral, such as `dx`");
    return parser_fail_here(p, "the integral of line %u is not closed here: expected its variable, such as `dx`",
                            source_find(p->source, opening.at.from).line);
}

static syntax *parse_line_integral(parser *p, token opening)
{
    syntax *a = node_new(p, SYNTAX_INTEGRAL, opening.at.from);
    a->as.binder = parser_alloc(p, sizeof *a->as.binder);
    parser_go_on(p);
    if ((a->as.binder->from = parse_sum(p, "`from` needs a lower limit here", "to")) == NULL
        || !parser_expect_word(p, "to", "`to` and the upper limit"))
        return NULL;
    parser_skip_lines(p);
    if ((a->as.binder->to = parse_sum(p, "`to` needs an upper limit here", "of")) == NULL
        || !parser_expect_word(p, "of", "`of` and the integral's body"))
        return NULL;
    parser_skip_lines(p);
    a->as.binder->body = parse_sum(p, "`of` needs the integral's body here", differential);
    if (a->as.binder->body == NULL || !parse_differential(p, a->as.binder->body, opening, &a->as.binder->variable))
        return NULL;
    return node_done(p, a);
}

static syntax *parse_contour(parser *p, token opening)
{
    syntax *a = node_new(p, SYNTAX_CONTOUR, opening.at.from);
    a->as.contour = parser_alloc(p, sizeof *a->as.contour);
    size_t base = p->pending_count;
    const char *need = "`along` needs the path's first point here";
    do {
        parser_go_on(p);
        syntax *point = parse_sum(p, need, "to");
        if (point == NULL)
            return NULL;
        parser_push(p, point, 0);
        need = "`to` needs the path's next point here";
    } while (parser_at_word(p, "to"));
    if (p->pending_count - base < 2) {
        parser_expect_word(p, "to", "`to` and the path's next point");
        return NULL;
    }
    a->as.contour->count = p->pending_count - base;
    a->as.contour->points = parser_pop(p, base, NULL);
    if (!parser_expect_word(p, "of", "`to` and another point, or `of` and the integral's body"))
        return NULL;
    parser_skip_lines(p);
    a->as.contour->body = parse_sum(p, "`of` needs the integral's body here", differential);
    if (a->as.contour->body == NULL || !parse_differential(p, a->as.contour->body, opening, &a->as.contour->variable))
        return NULL;
    return node_done(p, a);
}

static syntax *parse_integral(parser *p)
{
    token opening = p->token;
    parser_go_on(p);
    if (parser_at_word(p, "from"))
        return parse_line_integral(p, opening);
    if (parser_at_word(p, "along"))
        return parse_contour(p, opening);
    static const char *const words[] = {"from", "along", NULL};
    parser_expected_one_of(p, "`from` and the limits, or `along` and a path, after `integral`", words);
    return NULL;
}

static syntax *parse_summation(parser *p)
{
    syntax *a = node_new(p, SYNTAX_SUMMATION, p->token.at.from);
    a->as.binder = parser_alloc(p, sizeof *a->as.binder);
    parser_go_on(p);
    if (!parser_expect_word(p, "from", "`from` after `sum`"))
        return NULL;
    parser_skip_lines(p);
    if (!parser_new_name(p, &a->as.binder->variable, "the sum's index after `from`")
        || !parser_expect_sign(p, TOKEN_EQUAL, "`=` and the index's first value"))
        return NULL;
    if ((a->as.binder->from = parse_sum(p, "`=` needs the index's first value here", "to")) == NULL
        || !parser_expect_word(p, "to", "`to` and the index's last value"))
        return NULL;
    parser_skip_lines(p);
    if ((a->as.binder->to = parse_sum(p, "`to` needs the index's last value here", "of")) == NULL
        || !parser_expect_word(p, "of", "`of` and the sum's body"))
        return NULL;
    parser_skip_lines(p);
    a->as.binder->body = parse_product(p, "`of` needs the sum's body here", "");
    return a->as.binder->body ? node_done(p, a) : NULL;
}

static syntax *parse_power(parser *p);

static syntax *parse_derivative(parser *p)
{
    syntax *a = node_new(p, SYNTAX_DERIVATIVE, p->token.at.from);
    a->as.derivative = parser_alloc(p, sizeof *a->as.derivative);
    parser_go_on(p);
    if (!parser_expect_word(p, "of", "`of` after `derivative`"))
        return NULL;
    parser_skip_lines(p);
    if ((a->as.derivative->of = parse_product(p, "`of` needs what is differentiated here", "in")) == NULL)
        return NULL;
    if (parser_at(p, TOKEN_PLUS) || parser_at(p, TOKEN_MINUS)) {
        parser_fail_here(p, "`derivative of` takes one product: put brackets around the sum");
        return NULL;
    }
    if (!parser_expect_word(p, "in", "`in` and the variable of the derivative"))
        return NULL;
    parser_skip_lines(p);
    if (!parser_new_name(p, &a->as.derivative->in, "the variable of the derivative"))
        return NULL;
    if (parser_at_word(p, "order")) {
        parser_go_on(p);
        p->need = "`order` needs a number here";
        if ((a->as.derivative->order = parse_power(p)) == NULL)
            return NULL;
    }
    return node_done(p, a);
}

/* One VALUE when CONDITION, or the VALUE otherwise: true when there may be another. */
static bool parse_case(parser *p, syntax *a, size_t *cases)
{
    syntax *value = parse_sum(p, "a value is missing here", "when");
    if (value == NULL)
        return false;
    if (parser_take_word(p, "otherwise")) {
        a->as.piecewise->otherwise = value;
        if (*cases == 0)
            parser_fail(p, p->last.at, "a piecewise needs a case with `when` before `otherwise`");
        return false;
    }
    if (!parser_expect_word(p, "when", "`when` and a condition, or `otherwise`"))
        return false;
    syntax *condition = parse_condition(p, "`when` needs a condition here");
    if (condition == NULL)
        return false;
    parser_push(p, value, 0);
    parser_push(p, condition, 0);
    ++*cases;
    return parser_expect_sign(p, TOKEN_COMMA, "`,` and the next case, at the end one with `otherwise`");
}

static syntax *parse_piecewise(parser *p)
{
    syntax *a = node_new(p, SYNTAX_PIECEWISE, p->token.at.from);
    a->as.piecewise = parser_alloc(p, sizeof *a->as.piecewise);
    token bracket;
    size_t base = p->pending_count, cases = 0;
    parser_advance(p);
    if (!parser_at(p, TOKEN_OPEN)) {
        parser_expected(p, "`(` after `piecewise`");
        return NULL;
    }
    parser_open(p, &bracket);
    while (parse_case(p, a, &cases))
        continue;
    if (p->failed || !parser_close(p, bracket, TOKEN_CLOSE))
        return NULL;
    syntax **pairs = parser_pop(p, base, NULL);
    a->as.piecewise->count = cases;
    a->as.piecewise->values = parser_alloc(p, cases * sizeof *pairs);
    a->as.piecewise->conditions = parser_alloc(p, cases * sizeof *pairs);
    for (size_t k = 0; k < cases; k++) {
        a->as.piecewise->values[k] = pairs[2 * k];
        a->as.piecewise->conditions[k] = pairs[2 * k + 1];
    }
    return node_done(p, a);
}

static syntax *parse_root(parser *p)
{
    syntax *a = node_new(p, SYNTAX_ROOT, p->token.at.from);
    a->as.root = parser_alloc(p, sizeof *a->as.root);
    parser_go_on(p);
    if (!parser_expect_word(p, "of", "`of` after `root`"))
        return NULL;
    parser_skip_lines(p);
    if ((a->as.root->of = parse_sum(p, "`of` needs a polynomial here", "in")) == NULL
        || !parser_expect_word(p, "in", "`in` and the polynomial's variable"))
        return NULL;
    parser_skip_lines(p);
    if (!parser_new_name(p, &a->as.root->in, "the polynomial's variable")
        || !parser_expect_word(p, "near", "`near` and a value close to the root"))
        return NULL;
    parser_skip_lines(p);
    a->as.root->near = parse_product(p, "`near` needs a value close to the root here", "");
    return a->as.root->near ? node_done(p, a) : NULL;
}

static const struct {
    const char *word;
    syntax *(*parse)(parser *p);
} openers[] = {
    {"integral", parse_integral},   {"sum", parse_summation}, {"derivative", parse_derivative},
    {"piecewise", parse_piecewise}, {"root", parse_root},
};

static syntax *parse_opened(parser *p)
{
    size_t k = 0;
    while (strcmp(openers[k].word, p->name->text) != 0)
        k++;
    return openers[k].parse(p);
}

/* A linking word where an operand should stand: is it a name all the same? It is when what comes next can only follow
 * an operand. */
static bool link_is_a_name(const parser *p)
{
    token next = parser_peek(p);
    switch (next.kind) {
    case TOKEN_NUMBER: case TOKEN_TEXT:
        return false;
    case TOKEN_OPEN: /* at(x) is a call, `to (x)` more likely lacks what stands before it */
        return next.at.from == p->token.at.to;
    case TOKEN_NAME:
        return p->closer == differential ? token_is_differential(p, next) : token_is(p, next, p->closer);
    case TOKEN_END: case TOKEN_LINE_END:
        return p->last_goes_on == false || p->last.kind != TOKEN_NAME; /* not: `from to` at the end of a line */
    default:
        return true;
    }
}

static syntax *fail_operand(parser *p)
{
    if (p->token.kind == TOKEN_NAME && p->name->is == WORD_STATEMENT)
        parser_fail_here(p, "%s; `%s` opens a statement", p->need, p->name->text);
    else
        parser_fail_here(p, "%s", p->need);
    return NULL;
}

/* An operand without its signs `!` and `^`. */
static syntax *parse_operand(parser *p)
{
    parser_skip_lines(p);
    if (parser_at(p, TOKEN_NUMBER))
        return parse_number(p);
    if (parser_at(p, TOKEN_OPEN))
        return parse_brackets(p);
    if (!parser_at(p, TOKEN_NAME) || p->name->is == WORD_STATEMENT)
        return fail_operand(p);
    if (p->name->is == WORD_EXPRESSION)
        return parse_opened(p);
    if (p->name->is == WORD_LINK && !link_is_a_name(p))
        return fail_operand(p);
    return parse_named(p);
}

/* ---- operators ---- */

/* An integral or a derivative ends with a name: `^` and `!` after it would seem to belong to that. */
static bool takes_no_power(const syntax *a)
{
    return a->kind == SYNTAX_INTEGRAL || a->kind == SYNTAX_CONTOUR || a->kind == SYNTAX_DERIVATIVE;
}

static syntax *parse_factorial(parser *p)
{
    parser_skip_lines(p);
    bool in_brackets = parser_at(p, TOKEN_OPEN);
    uint32_t from = p->token.at.from;
    syntax *a = parse_operand(p);
    if (a == NULL)
        return NULL;
    if (!in_brackets && takes_no_power(a) && (parser_at(p, TOKEN_FACTORIAL) || parser_at(p, TOKEN_POWER))) {
        parser_fail_here(p, "%s takes %s only in brackets", a->kind == SYNTAX_DERIVATIVE ? "a derivative" : "an integral",
                         token_kind_words(p->token.kind));
        return NULL;
    }
    unsigned depth = p->depth;
    for (; parser_at(p, TOKEN_FACTORIAL); ) {
        if (!parser_enter(p))
            return NULL;
        parser_advance(p);
        syntax *n = node_new(p, SYNTAX_FACTORIAL, from);
        n->as.operand = a;
        a = node_done(p, n);
    }
    p->depth = depth;
    return a;
}

static syntax *parse_signed(parser *p);

/* BASE ^ EXPONENT; the exponent may start with a sign and groups to the right. */
static syntax *parse_power(parser *p)
{
    parser_skip_lines(p);
    uint32_t from = p->token.at.from;
    if (!parser_enter(p))
        return NULL;
    syntax *base = parse_factorial(p);
    if (base != NULL && parser_at(p, TOKEN_POWER)) {
        syntax *a = node_new(p, SYNTAX_POWER, from);
        parser_go_on(p);
        p->need = "`^` needs an exponent here";
        a->as.power.base = base;
        a->as.power.exponent = parse_signed(p);
        base = a->as.power.exponent ? node_done(p, a) : NULL;
    }
    p->depth--;
    return base;
}

/* Signs before a power; a plus leaves no trace. */
static syntax *parse_signed(parser *p)
{
    parser_skip_lines(p);
    if (!parser_at(p, TOKEN_MINUS) && !parser_at(p, TOKEN_PLUS))
        return parse_power(p);
    syntax *a = parser_at(p, TOKEN_MINUS) ? node_new(p, SYNTAX_NEGATE, p->token.at.from) : NULL;
    p->need = a ? "`-` needs an operand here" : "`+` needs an operand here";
    if (!parser_enter(p))
        return NULL;
    parser_go_on(p);
    syntax *operand = parse_signed(p);
    p->depth--;
    if (operand == NULL || a == NULL)
        return operand;
    a->as.operand = operand;
    return node_done(p, a);
}

/* Operands joined by either of two operators, as one flat list. */
static syntax *parse_list(parser *p, syntax_kind kind, syntax *(*parse_part)(parser *p))
{
    token_kind plain = kind == SYNTAX_SUM ? TOKEN_PLUS : TOKEN_TIMES;
    token_kind inverse = kind == SYNTAX_SUM ? TOKEN_MINUS : TOKEN_OVER;
    static const char *const needs[][2] = {{"`+` needs an operand here", "`-` needs an operand here"},
                                           {"`*` needs an operand here", "`/` needs an operand here"}};
    parser_skip_lines(p);
    uint32_t from = p->token.at.from;
    syntax *first = parse_part(p);
    if (first == NULL || (!parser_at(p, plain) && !parser_at(p, inverse)))
        return first;
    size_t base = p->pending_count;
    parser_push(p, first, kind == SYNTAX_SUM ? '+' : '*');
    while (parser_at(p, plain) || parser_at(p, inverse)) {
        bool inverted = parser_at(p, inverse);
        p->need = needs[kind != SYNTAX_SUM][inverted];
        parser_go_on(p);
        syntax *part = parse_part(p);
        if (part == NULL)
            return NULL;
        parser_push(p, part, (kind == SYNTAX_SUM ? "+-" : "*/")[inverted]);
    }
    syntax *a = node_new(p, kind, from);
    a->as.list.count = p->pending_count - base;
    a->as.list.parts = parser_pop(p, base, &a->as.list.signs);
    return node_done(p, a);
}

static syntax *parse_factors(parser *p)
{
    return parse_list(p, SYNTAX_PRODUCT, parse_signed);
}

/* Runs a level with its own words for a missing operand; the surroundings' come back after it. */
static syntax *parse_level(parser *p, const char *need, const char *closer, syntax_kind kind)
{
    const char *outer = p->closer;
    p->need = need;
    p->closer = closer;
    syntax *a = kind == SYNTAX_SUM ? parse_list(p, SYNTAX_SUM, parse_factors) : parse_factors(p);
    p->closer = outer;
    return a;
}

syntax *parse_sum(parser *p, const char *need, const char *closer)
{
    return parse_level(p, need, closer, SYNTAX_SUM);
}

syntax *parse_product(parser *p, const char *need, const char *closer)
{
    return parse_level(p, need, closer, SYNTAX_PRODUCT);
}

/* ---- conditions ---- */

static bool relation_of(token_kind k, syntax_relation *r)
{
    switch (k) {
    case TOKEN_LESS: *r = COMPARE_LESS; return true;
    case TOKEN_LESS_EQUAL: *r = COMPARE_LESS_EQUAL; return true;
    case TOKEN_GREATER: *r = COMPARE_GREATER; return true;
    case TOKEN_GREATER_EQUAL: *r = COMPARE_GREATER_EQUAL; return true;
    case TOKEN_EQUAL: *r = COMPARE_EQUAL; return true;
    case TOKEN_NOT_EQUAL: *r = COMPARE_NOT_EQUAL; return true;
    default: return false;
    }
}

static syntax *parse_comparison(parser *p, syntax *left)
{
    syntax *a = node_new(p, SYNTAX_COMPARISON, left->at.from);
    size_t base = p->pending_count;
    syntax_relation r;
    parser_push(p, left, 0);
    while (relation_of(p->token.kind, &r)) {
        parser_go_on(p);
        syntax *operand = parse_sum(p, "the comparison needs its other side here", "");
        if (operand == NULL)
            return NULL;
        parser_push(p, operand, (char)r);
    }
    size_t count = p->pending_count - base;
    char *relations;
    a->as.comparison.count = count - 1;
    a->as.comparison.operands = parser_pop(p, base, &relations);
    a->as.comparison.relations = (uint8_t *)relations + 1; /* the first operand has none before it */
    return node_done(p, a);
}

static syntax *parse_range(parser *p, syntax *value)
{
    syntax *a = node_new(p, SYNTAX_RANGE, value->at.from);
    a->as.range = parser_alloc(p, sizeof *a->as.range);
    a->as.range->value = value;
    token bracket;
    parser_go_on(p);
    if (!parser_at(p, TOKEN_OPEN) && !parser_at(p, TOKEN_OPEN_SQUARE)) {
        parser_expected(p, "a range such as (a, b] after `in`");
        return NULL;
    }
    a->as.range->with_from = parser_at(p, TOKEN_OPEN_SQUARE);
    parser_open(p, &bracket);
    if ((a->as.range->from = parse_sum(p, "the range's lower end is missing here", "")) == NULL
        || !parser_expect_sign(p, TOKEN_COMMA, "`,` and the range's upper end")
        || (a->as.range->to = parse_sum(p, "the range's upper end is missing here", "")) == NULL)
        return NULL;
    a->as.range->with_to = parser_at(p, TOKEN_CLOSE_SQUARE);
    return parser_close(p, bracket, a->as.range->with_to ? TOKEN_CLOSE_SQUARE : TOKEN_CLOSE) ? node_done(p, a) : NULL;
}

syntax *parse_condition(parser *p, const char *need)
{
    static const char *const words[] = {"in", "integer", "real", "complex", NULL};
    parser_skip_lines(p);
    syntax_relation r;
    syntax *left = parse_sum(p, need, "in");
    if (left == NULL)
        return NULL;
    if (relation_of(p->token.kind, &r))
        return parse_comparison(p, left);
    if (parser_at_word(p, "in"))
        return parse_range(p, left);
    for (size_t k = 1; words[k] != NULL; k++)
        if (parser_take_word(p, words[k])) {
            syntax *a = node_new(p, SYNTAX_DOMAIN, left->at.from);
            a->as.domain.value = left;
            a->as.domain.domain = (syntax_domain)(k - 1);
            return node_done(p, a);
        }
    parser_expected_one_of(p, "a comparison, `in`, `integer`, `real` or `complex`", words);
    return NULL;
}

bool parse_conditions(parser *p, syntax_conditions *out, const char *need)
{
    size_t base = p->pending_count;
    for (;;) {
        syntax *condition = parse_condition(p, need);
        if (condition == NULL)
            return false;
        parser_push(p, condition, 0);
        if (!parser_at(p, TOKEN_COMMA))
            break;
        parser_go_on(p);
        need = "`,` needs another condition here";
    }
    out->count = p->pending_count - base;
    out->list = parser_pop(p, base, NULL);
    return true;
}

/* ---- bindings ---- */

/* At a comma: does `NAME =` or `NAME from` come after it? Then it belongs to the list of bindings, not of values. */
static bool binding_follows(const parser *p)
{
    lexer ahead = p->lexer;
    token name, next;
    do
        name = lexer_next(&ahead);
    while (name.kind == TOKEN_LINE_END);
    next = lexer_next(&ahead);
    return name.kind == TOKEN_NAME
        && (next.kind == TOKEN_EQUAL
            || (token_is(p, next, "from") && !token_is(p, name, "integral") && !token_is(p, name, "sum")));
}

/* from A to B, then step H or in N points [on a log scale]. */
static bool parse_sweep(parser *p, syntax_binding *b)
{
    static const char *const words[] = {"step", "in", NULL};
    parser_go_on(p);
    if ((b->from = parse_sum(p, "`from` needs the first value here", "to")) == NULL
        || !parser_expect_word(p, "to", "`to` and the last value"))
        return false;
    parser_skip_lines(p);
    if ((b->to = parse_sum(p, "`to` needs the last value here", "")) == NULL)
        return false;
    if (parser_at_word(p, "step")) {
        parser_go_on(p);
        return (b->step = parse_sum(p, "`step` needs its size here", "")) != NULL;
    }
    if (!parser_at_word(p, "in"))
        return parser_expected_one_of(p, "`step` and its size, or `in N points`", words);
    parser_go_on(p);
    if ((b->points = parse_sum(p, "`in` needs the number of points here", "points")) == NULL
        || !parser_expect_word(p, "points", "`points`"))
        return false;
    if (parser_at_word(p, "on")) {
        parser_go_on(p);
        b->log_scale = true;
        return parser_expect_word(p, "a", "`a log scale` after `on`") && parser_expect_word(p, "log", "`log scale`")
            && parser_expect_word(p, "scale", "`scale`");
    }
    return true;
}

static bool parse_values(parser *p, syntax_binding *b, bool single)
{
    size_t base = p->pending_count;
    const char *need = "`=` needs a value here";
    for (;;) {
        syntax *value = parse_sum(p, need, "");
        if (value == NULL)
            return false;
        parser_push(p, value, 0);
        if (single || !parser_at(p, TOKEN_COMMA))
            break;
        if (binding_follows(p))
            break;
        parser_go_on(p);
        need = "`,` needs another value or `NAME =` here";
    }
    b->count = p->pending_count - base;
    b->values = parser_pop(p, base, NULL);
    return true;
}

static bool parse_binding(parser *p, syntax_binding *b, bool single)
{
    if (!parser_new_name(p, &b->name, "a name and its value, such as `s = 3`"))
        return false;
    if (!single && parser_at_word(p, "from"))
        return parse_sweep(p, b);
    return parser_expect_sign(p, TOKEN_EQUAL, single ? "`=` and a value" : "`=` and a value, or `from`")
        && parse_values(p, b, single);
}

bool parse_bindings(parser *p, syntax_bindings *out, bool single)
{
    size_t base = p->pending_count;
    for (;;) {
        syntax_binding *b = parser_alloc(p, sizeof *b);
        if (!parse_binding(p, b, single))
            return false;
        parser_push(p, b, 0);
        if (!parser_at(p, TOKEN_COMMA))
            break;
        parser_go_on(p);
    }
    out->count = p->pending_count - base;
    out->list = parser_pop_values(p, base, sizeof *out->list);
    return true;
}
