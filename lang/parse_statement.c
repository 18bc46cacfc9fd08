/* The table of statements, and the grammar of those that declare: large, small, given, grant, let, use, rule, pass. A
 * new statement is a row here, a kind in syntax.h and a line in the printer. */
#include <string.h>

#include "lang/parser.h"

/* ---- declarations ---- */

static bool parse_sector(parser *p, statement *out)
{
    parser_go_on(p);
    syntax *c = parse_condition(p, "`,` needs a sector here, such as arg(s) in (-pi/4, pi/4)");
    if (c == NULL)
        return false;
    const char *name = out->as.large.name.text;
    if (c->kind == SYNTAX_RANGE && c->as.range->value->kind == SYNTAX_CALL) {
        const syntax *call = c->as.range->value, *argument = call->as.call.arguments[0];
        if (strcmp(call->as.call.name.text, "arg") == 0 && call->as.call.count == 1 && argument->kind == SYNTAX_NAME
            && strcmp(argument->as.name, name) == 0) {
            out->as.large.sector = c;
            return true;
        }
    }
    return parser_fail(p, c->at, "only the sector of `%s` may stand here, such as arg(%s) in (-pi/4, pi/4); "
                       "declare other facts with `given`", name, name);
}

static bool parse_large(parser *p, statement *out)
{
    out->kind = STATEMENT_LARGE;
    parser_go_on(p);
    if (!parser_new_name(p, &out->as.large.name, "the name of the large parameter"))
        return false;
    out->as.large.integer = parser_take_word(p, "integer");
    return !parser_at(p, TOKEN_COMMA) || parse_sector(p, out);
}

static bool parse_small(parser *p, statement *out)
{
    out->kind = STATEMENT_SMALL;
    parser_go_on(p);
    return parser_new_name(p, &out->as.large.name, "the name of the small parameter");
}

static bool parse_given(parser *p, statement *out)
{
    out->kind = STATEMENT_GIVEN;
    parser_go_on(p);
    return parse_conditions(p, &out->as.given, "`given` needs a condition here, such as `a > 0`");
}

static bool parse_grant(parser *p, statement *out)
{
    out->kind = STATEMENT_GRANT;
    parser_go_on(p);
    return parse_conditions(p, &out->as.given, "`grant` needs a condition here, such as `a > 0`");
}

/* Names between brackets; *count of them. */
static syntax_name *parse_names(parser *p, size_t *count)
{
    token bracket;
    size_t base = p->pending_count;
    parser_open(p, &bracket);
    for (;;) {
        syntax_name *n = parser_alloc(p, sizeof *n);
        if (!parser_new_name(p, n, "the name of a variable"))
            return NULL;
        parser_push(p, n, 0);
        if (!parser_at(p, TOKEN_COMMA))
            break;
        parser_advance(p);
    }
    if (!parser_close(p, bracket, TOKEN_CLOSE))
        return NULL;
    *count = p->pending_count - base;
    return parser_pop_values(p, base, sizeof(syntax_name));
}

static bool parse_let(parser *p, statement *out)
{
    out->kind = STATEMENT_LET;
    parser_go_on(p);
    if (!parser_new_name(p, &out->as.let.name, "the name to define after `let`"))
        return false;
    if (parser_at(p, TOKEN_OPEN)) {
        out->as.let.is_function = true;
        if ((out->as.let.parameters = parse_names(p, &out->as.let.count)) == NULL)
            return false;
    }
    if (!parser_expect_sign(p, TOKEN_EQUAL, "`=` and what the name stands for"))
        return false;
    if (!out->as.let.is_function) {
        out->as.let.request = parse_kept_request(p);
        if (out->as.let.request != NULL || p->failed)
            return !p->failed;
    }
    return (out->as.let.value = parse_sum(p, "`=` needs an expression or a request here", "")) != NULL;
}

static bool parse_use(parser *p, statement *out)
{
    out->kind = STATEMENT_USE;
    parser_go_on(p);
    if (parser_at_word(p, "rule"))
        return parse_use_rule_move(p, out);
    if (parser_at(p, TOKEN_TEXT))
        return (out->as.use.file = parser_text(p, "")) != NULL;
    return parser_new_name(p, &out->as.use.name, "the name of a library, or a file in quotes, after `use`");
}

/* ---- rules and passes ---- */

static bool parse_parameter(parser *p, syntax_parameter *out)
{
    if (!parser_new_name(p, &out->name, "a pattern variable of the rule"))
        return false;
    return !parser_at(p, TOKEN_OPEN) || (out->names = parse_names(p, &out->count)) != NULL;
}

static bool parse_parameters(parser *p, statement *out)
{
    token bracket;
    size_t base = p->pending_count;
    parser_open(p, &bracket);
    while (!parser_at(p, TOKEN_CLOSE)) {
        syntax_parameter *a = parser_alloc(p, sizeof *a);
        if (!parse_parameter(p, a))
            return false;
        parser_push(p, a, 0);
        if (!parser_at(p, TOKEN_COMMA))
            break;
        parser_advance(p);
    }
    out->as.rule->count = p->pending_count - base;
    out->as.rule->parameters = parser_pop_values(p, base, sizeof(syntax_parameter));
    return parser_close(p, bracket, TOKEN_CLOSE);
}

enum { CLAUSE_BECOMES = 1, CLAUSE_WHEN = 2, CLAUSE_BECAUSE = 4, CLAUSE_ALL = 7 };

static int clause_of(const parser *p)
{
    return parser_at_word(p, "becomes") ? CLAUSE_BECOMES
        : parser_at_word(p, "when")     ? CLAUSE_WHEN
        : parser_at_word(p, "because")  ? CLAUSE_BECAUSE : 0;
}

/* A rule's next clause may stand on the next line: passes over line ends if one begins there. */
static void find_clause(parser *p, int seen)
{
    if (!parser_at_line_end(p))
        return;
    lexer ahead = p->lexer;
    token t = p->token;
    while (t.kind == TOKEN_LINE_END)
        t = lexer_next(&ahead);
    if (t.kind == TOKEN_END) {
        p->rule_may_go_on = seen != CLAUSE_ALL;
        return;
    }
    const char *at = p->source->bytes + t.at.from;
    size_t length = t.at.to - t.at.from;
    if (t.kind == TOKEN_NAME && ((length == 7 && (memcmp(at, "becomes", 7) == 0 || memcmp(at, "because", 7) == 0))
                                 || (length == 4 && memcmp(at, "when", 4) == 0)))
        parser_skip_lines(p);
}

static bool parse_clause(parser *p, statement *out, int clause)
{
    parser_go_on(p);
    switch (clause) {
    case CLAUSE_BECOMES:
        return (out->as.rule->becomes = parse_sum(p, "`becomes` needs an expression here", "")) != NULL;
    case CLAUSE_WHEN:
        return parse_conditions(p, &out->as.rule->when, "`when` needs a condition here");
    default:
        return (out->as.rule->because = parser_text(p, "a source in quotes after `because`")) != NULL;
    }
}

static bool parse_rule(parser *p, statement *out)
{
    static const char *const clauses[] = {"becomes", "when", "because", NULL};
    out->kind = STATEMENT_RULE;
    out->as.rule = parser_alloc(p, sizeof *out->as.rule);
    parser_go_on(p);
    if (!parser_new_name(p, &out->as.rule->name, "the rule's name")
        || (parser_at(p, TOKEN_OPEN) && !parse_parameters(p, out))
        || !parser_expect_sign(p, TOKEN_COLON, "`:` and the rule's pattern")
        || (out->as.rule->pattern = parse_sum(p, "the rule's pattern is missing here", "")) == NULL)
        return false;
    int seen = 0;
    for (;;) {
        find_clause(p, seen);
        int clause = clause_of(p);
        if (clause == 0)
            break;
        if (seen & clause)
            return parser_fail_here(p, "a second `%s` in the same rule", p->name->text);
        if (!parse_clause(p, out, clause))
            return false;
        seen |= clause;
    }
    if (parser_at_line_end(p) && !(seen & CLAUSE_BECOMES))
        return parser_fail_here(p, "the rule `%s` needs `becomes` and what its pattern is replaced by",
                                out->as.rule->name.text);
    return parser_at_line_end(p)
        || parser_expected_one_of(p, "`becomes`, `when`, `because` or the end of the rule", clauses);
}

static bool parse_pass_statement(parser *p, statement *out)
{
    out->kind = STATEMENT_PASS;
    parser_go_on(p);
    return parser_new_name(p, &out->as.pass.name, "the pass's name")
        && parser_expect_sign(p, TOKEN_EQUAL, "`=` and the pass")
        && (out->as.pass.value = parse_pass(p)) != NULL;
}

/* ---- the table ---- */

static const struct opener {
    const char *word;
    statement_parser *parse;
} openers[] = {
    {"large", parse_large},
    {"small", parse_small},
    {"given", parse_given},
    {"grant", parse_grant},
    {"let", parse_let},
    {"use", parse_use},
    {"rule", parse_rule},
    {"pass", parse_pass_statement},
    {"check", parse_check},
    {"rewrite", parse_rewrite},
    {"why", parse_why},
    {"derive", parse_derive},
    {"substitute", parse_move},
    {"parts", parse_move},
    {"repeat", parse_move},
    {"differentiate", parse_move},
    {"integrate", parse_move},
    {"split", parse_move},
    {"rotate", parse_move},
    {"swap", parse_move},
    {"done", parse_done},
    {"undo", parse_undo},
    {"replay", parse_replay},
    {"expand", parse_expand},
    {"steps", parse_steps},
    {"coefficients", parse_coefficients},
    {"recurrence", parse_recurrence},
    {"growth", parse_growth},
    {"remainder", parse_remainder},
    {"evaluate", parse_evaluate},
    {"compare", parse_compare},
    {"plan", parse_plan},
    {"plot", parse_plot},
    {"write", parse_write},
    {"show", parse_show},
    {"drop", parse_drop},
    {"help", parse_help},
    {"quit", parse_quit},
};

enum { OPENER_COUNT = sizeof openers / sizeof *openers };

static const struct opener *opener_find(const parser *p)
{
    for (size_t k = 0; k < OPENER_COUNT; k++)
        if (parser_at_word(p, openers[k].word))
            return &openers[k];
    return NULL;
}

static bool fail_opening(parser *p)
{
    if (!parser_at(p, TOKEN_NAME))
        return parser_fail_here(p, "a statement begins with a word, such as `let`, `expand` or `evaluate`");
    if (parser_peek(p).kind == TOKEN_EQUAL)
        return parser_fail_here(p, "a name is defined with `let`: `let %s = ...`", p->name->text);
    if (p->name->is == WORD_EXPRESSION || p->name->is == WORD_FUNCTION || p->name->is == WORD_CONSTANT)
        return parser_fail_here(p, "an expression alone is no statement: write `let NAME = ...`, `evaluate ...` or "
                                "`expand ...`");
    const char *words[OPENER_COUNT + 1] = {NULL};
    for (size_t k = 0; k < OPENER_COUNT; k++)
        words[k] = openers[k].word;
    return parser_expected_one_of(p, "the opening word of a statement", words);
}

static statement *parse_with(parser *p, statement_parser *parse)
{
    statement *s = parser_alloc(p, sizeof *s);
    uint32_t from = p->token.at.from;
    if (!parse(p, s))
        return NULL;
    s->at = parser_span(p, from);
    return s;
}

static bool parse_expansion_of(parser *p, statement *out)
{
    out->kind = STATEMENT_EXPANSION_OF;
    parser_advance(p);
    parser_go_on(p);
    return (out->as.subject = parse_sum(p, "`expansion of` needs a derivation here", "")) != NULL;
}

static bool parse_rule_from(parser *p, statement *out)
{
    out->kind = STATEMENT_RULE_FROM;
    parser_go_on(p);
    if (!parser_expect_word(p, "from", "`from` and a derivation after `rule`"))
        return false;
    parser_skip_lines(p);
    return (out->as.subject = parse_sum(p, "`rule from` needs a derivation here", "")) != NULL;
}

statement *parse_kept_request(parser *p)
{
    if (parser_at_word(p, "expansion") && parser_peek_word(p, "of"))
        return parse_with(p, parse_expansion_of);
    if (parser_at_word(p, "rule"))
        return parse_with(p, parse_rule_from);
    const struct opener *opener = parser_at(p, TOKEN_NAME) && p->name->is == WORD_STATEMENT ? opener_find(p) : NULL;
    if (opener == NULL)
        return NULL;
    span word = p->token.at;
    statement *s = parse_with(p, opener->parse);
    if (s != NULL && !statement_gives_value((statement_kind)s->kind))
        parser_fail(p, word, "`%s` gives nothing that `let` could keep", opener->word);
    return p->failed ? NULL : s;
}

statement *parse_statement(parser *p)
{
    const struct opener *opener = opener_find(p);
    if (opener == NULL) {
        fail_opening(p);
        return NULL;
    }
    statement *s = parse_with(p, opener->parse);
    if (s != NULL && !parser_at_line_end(p))
        parser_expected(p, "the end of the statement");
    return p->failed ? NULL : s;
}
