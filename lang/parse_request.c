/* The grammar of requests: what a session is asked to do with expansions, integrals, rules and files. Options may
 * come in any order; the printer knows the usual one. Whether a request can be met is not asked here. */
#include <string.h>

#include "lang/parser.h"

/* ---- parts that several requests have ---- */

/* `of` SUBJECT after the opening word. */
static bool parse_of(parser *p, syntax **subject, const char *what)
{
    parser_go_on(p);
    if (!parser_expect_word(p, "of", what))
        return false;
    parser_skip_lines(p);
    return (*subject = parse_sum(p, "`of` needs a name or an expression here", "")) != NULL;
}

/* `WORD COUNT UNIT`, at WORD: to 8 terms, with 5 terms, to 20 digits. */
static bool parse_count(parser *p, syntax **count, const char *need, const char *unit, const char *what)
{
    parser_go_on(p);
    *count = parse_sum(p, need, unit);
    return *count != NULL && parser_expect_word(p, unit, what);
}

static bool fail_twice(parser *p, const char *option)
{
    return parser_fail_here(p, "`%s` is given twice", option);
}

static bool parse_as_name(parser *p, syntax_name *out)
{
    parser_go_on(p);
    return parser_new_name(p, out, "a name after `as`");
}

/* ---- rules ---- */

static bool parse_check_recurrence(parser *p, statement *out)
{
    out->kind = STATEMENT_CHECK_RECURRENCE;
    parser_go_on(p);
    if (!parser_at_word(p, "of")) {
        p->indexed = true;
        out->as.check_recurrence.left = parse_sum(p, "`recurrence` needs `of`, or an equation for c[n], here", "of");
        if (out->as.check_recurrence.left == NULL
            || !parser_expect_sign(p, TOKEN_EQUAL, "`=` and the recurrence's right side"))
            return false;
        out->as.check_recurrence.right = parse_sum(p, "`=` needs the recurrence's right side here", "of");
        if (out->as.check_recurrence.right == NULL)
            return false;
        p->indexed = false;
    }
    if (!parser_expect_word(p, "of", "`of` and an expansion"))
        return false;
    parser_skip_lines(p);
    return (out->as.check_recurrence.of = parse_sum(p, "`of` needs an expansion here", "")) != NULL;
}

bool parse_check(parser *p, statement *out)
{
    static const char *const words[] = {"rule", "recurrence", NULL};
    parser_go_on(p);
    if (parser_at_word(p, "recurrence"))
        return parse_check_recurrence(p, out);
    if (parser_at(p, TOKEN_TEXT)) {
        out->kind = STATEMENT_CHECK_FILE;
        return (out->as.file = parser_text(p, "")) != NULL;
    }
    if (!parser_at_word(p, "rule"))
        return parser_expected_one_of(p, "`rule`, `recurrence` or a file in quotes after `check`", words);
    out->kind = STATEMENT_CHECK_RULE;
    parser_go_on(p);
    return parser_new_name(p, &out->as.name, "the rule's name");
}

bool parse_rewrite(parser *p, statement *out)
{
    parser_go_on(p);
    if (parser_at_word(p, "with"))
        return parse_rewrite_move(p, out);
    out->kind = STATEMENT_REWRITE;
    out->as.rewrite.value = parse_sum(p, "`rewrite` needs an expression here", "with");
    if (out->as.rewrite.value == NULL || !parser_expect_word(p, "with", "`with` and a pass"))
        return false;
    parser_skip_lines(p);
    return (out->as.rewrite.with = parse_pass(p)) != NULL;
}

bool parse_why(parser *p, statement *out)
{
    out->kind = STATEMENT_WHY_NOT;
    parser_go_on(p);
    if (!parser_expect_word(p, "not", "`not` and a rule's name after `why`"))
        return false;
    parser_skip_lines(p);
    return parser_new_name(p, &out->as.name, "the rule's name after `why not`");
}

bool parse_replay(parser *p, statement *out)
{
    out->kind = STATEMENT_REPLAY;
    parser_go_on(p);
    out->as.replay.derivation = parse_sum(p, "`replay` needs a derivation here", "on");
    if (out->as.replay.derivation == NULL || !parser_expect_word(p, "on", "`on` and an integral"))
        return false;
    parser_skip_lines(p);
    return (out->as.replay.on = parse_sum(p, "`on` needs an integral here", "")) != NULL;
}

/* ---- expansions ---- */

/* to N terms, by METHOD, as NAME, each at most once. */
static bool parse_expand_options(parser *p, statement *out)
{
    static const char *const words[] = {"to", "by", "as", NULL};
    for (;;) {
        if (parser_at_word(p, "to")) {
            if (out->as.expand->terms != NULL)
                return fail_twice(p, "to");
            if (!parse_count(p, &out->as.expand->terms, "`to` needs a number of terms here", "terms",
                             "`terms` after the number"))
                return false;
        } else if (parser_at_word(p, "by")) {
            if (out->as.expand->by.text != NULL)
                return fail_twice(p, "by");
            parser_go_on(p);
            if (!parser_new_name(p, &out->as.expand->by, "a method or a pass after `by`"))
                return false;
        } else if (parser_at_word(p, "as")) {
            if (out->as.expand->as.text != NULL)
                return fail_twice(p, "as");
            if (!parse_as_name(p, &out->as.expand->as))
                return false;
        } else if (out->as.expand->terms == NULL) {
            return parser_expected_one_of(p, "`to N terms`", words);
        } else if (!parser_at_line_end(p)) {
            return parser_expected_one_of(p, "`by`, `as` or the end of the statement", words);
        } else {
            return true;
        }
    }
}

bool parse_expand(parser *p, statement *out)
{
    parser_go_on(p);
    syntax *subject = parse_sum(p, "`expand` needs an integral here", "to");
    if (subject == NULL)
        return false;
    if (parser_at_word(p, "around"))
        return parse_expand_move(p, out, subject);
    out->kind = STATEMENT_EXPAND;
    out->as.expand = parser_alloc(p, sizeof *out->as.expand);
    out->as.expand->subject = subject;
    return parse_expand_options(p, out);
}

bool parse_coefficients(parser *p, statement *out)
{
    out->kind = STATEMENT_COEFFICIENTS;
    if (!parse_of(p, &out->as.coefficients.of, "`of` and an expansion after `coefficients`"))
        return false;
    if (!parser_at_word(p, "from"))
        return true;
    parser_go_on(p);
    out->as.coefficients.from = parse_sum(p, "`from` needs the first index here", "to");
    if (out->as.coefficients.from == NULL || !parser_expect_word(p, "to", "`to` and the last index"))
        return false;
    parser_skip_lines(p);
    return (out->as.coefficients.to = parse_sum(p, "`to` needs the last index here", "")) != NULL;
}

bool parse_recurrence(parser *p, statement *out)
{
    out->kind = STATEMENT_RECURRENCE;
    return parse_of(p, &out->as.subject, "`of` and an expansion after `recurrence`");
}

bool parse_growth(parser *p, statement *out)
{
    out->kind = STATEMENT_GROWTH;
    return parse_of(p, &out->as.subject, "`of` and an expansion after `growth`");
}

bool parse_remainder(parser *p, statement *out)
{
    out->kind = STATEMENT_REMAINDER;
    if (!parse_of(p, &out->as.remainder.of, "`of` and an expansion after `remainder`"))
        return false;
    return !parser_at_word(p, "with")
        || parse_count(p, &out->as.remainder.terms, "`with` needs a number of terms here", "terms",
                       "`terms` after the number");
}

/* ---- numbers ---- */

/* at points of "file", or at NAME = ..., at `at`. */
static bool parse_evaluate_at(parser *p, statement *out)
{
    if (out->as.evaluate->at.count > 0 || out->as.evaluate->points_file != NULL)
        return fail_twice(p, "at");
    parser_go_on(p);
    if (!parser_at_word(p, "points") || !parser_peek_word(p, "of"))
        return parse_bindings(p, &out->as.evaluate->at, false);
    parser_advance(p);
    parser_go_on(p);
    return (out->as.evaluate->points_file = parser_text(p, "the file with the points, in quotes")) != NULL;
}

/* to "file" or to N digits, at `to`. */
static bool parse_evaluate_to(parser *p, statement *out)
{
    if (parser_peek(p).kind == TOKEN_TEXT) {
        if (out->as.evaluate->to_file != NULL)
            return fail_twice(p, "to");
        parser_go_on(p);
        return (out->as.evaluate->to_file = parser_text(p, "")) != NULL;
    }
    if (out->as.evaluate->digits != NULL)
        return fail_twice(p, "to");
    return parse_count(p, &out->as.evaluate->digits, "`to` needs a number of digits, or a file in quotes, here",
                       "digits", "`digits` after the number");
}

/* At `all`: is it the word, and no name of a number of terms? */
static bool all_is_a_word(const parser *p)
{
    token_kind next = parser_peek(p).kind;
    return next == TOKEN_LINE_END || next == TOKEN_END || (next == TOKEN_NAME && !parser_peek_word(p, "terms"));
}

/* with all contributions, or with M terms, at `with`. */
static bool parse_evaluate_with(parser *p, statement *out)
{
    parser_go_on(p);
    if (parser_at_word(p, "all") && all_is_a_word(p)) {
        parser_go_on(p);
        out->as.evaluate->all_contributions = true;
        return parser_expect_word(p, "contributions", "`contributions` after `with all`");
    }
    if (out->as.evaluate->terms != NULL)
        return parser_fail_here(p, "a second number of terms after `with`");
    out->as.evaluate->terms = parse_sum(p, "`with` needs a number of terms, or `all contributions`, here", "terms");
    return out->as.evaluate->terms != NULL && parser_expect_word(p, "terms", "`terms` after the number");
}

bool parse_evaluate(parser *p, statement *out)
{
    static const char *const words[] = {"at", "to", "with", NULL};
    out->kind = STATEMENT_EVALUATE;
    out->as.evaluate = parser_alloc(p, sizeof *out->as.evaluate);
    parser_go_on(p);
    out->as.evaluate->subject = parse_sum(p, "`evaluate` needs an expansion or an integral here", "at");
    if (out->as.evaluate->subject == NULL)
        return false;
    for (;;) {
        bool sound = true;
        if (parser_at_word(p, "at"))
            sound = parse_evaluate_at(p, out);
        else if (parser_at_word(p, "to"))
            sound = parse_evaluate_to(p, out);
        else if (parser_at_word(p, "with"))
            sound = parse_evaluate_with(p, out);
        else if (!parser_at_line_end(p))
            sound = parser_expected_one_of(p, "`at`, `to`, `with` or the end of the statement", words);
        else
            return true;
        if (!sound)
            return false;
    }
}

/* `at` and its bindings, which must be there. */
static bool parse_at(parser *p, syntax_bindings *out)
{
    if (!parser_expect_word(p, "at", "`at` and a value, such as `at s = 10`"))
        return false;
    parser_skip_lines(p);
    return parse_bindings(p, out, false);
}

bool parse_compare(parser *p, statement *out)
{
    out->kind = STATEMENT_COMPARE;
    parser_go_on(p);
    out->as.compare.subject = parse_sum(p, "`compare` needs an expansion here", "at");
    return out->as.compare.subject != NULL && parse_at(p, &out->as.compare.at);
}

bool parse_plan(parser *p, statement *out)
{
    out->kind = STATEMENT_PLAN;
    out->as.plan = parser_alloc(p, sizeof *out->as.plan);
    parser_go_on(p);
    if ((out->as.plan->subject = parse_sum(p, "`plan` needs an expansion here", "for")) == NULL
        || !parser_expect_word(p, "for", "`for relative error` and its size"))
        return false;
    parser_skip_lines(p);
    if (!parser_expect_word(p, "relative", "`relative error` after `for`")
        || !parser_expect_word(p, "error", "`error` after `relative`"))
        return false;
    if ((out->as.plan->error = parse_sum(p, "`error` needs its size here", "over")) == NULL)
        return false;
    if (!parser_at_word(p, "over"))
        return true;
    parser_go_on(p);
    if (!parser_new_name(p, &out->as.plan->over, "the parameter's name after `over`")
        || !parser_expect_word(p, "from", "`from` and the least value"))
        return false;
    parser_skip_lines(p);
    if ((out->as.plan->from = parse_sum(p, "`from` needs the least value here", "to")) == NULL
        || !parser_expect_word(p, "to", "`to` and the greatest value"))
        return false;
    parser_skip_lines(p);
    return (out->as.plan->to = parse_sum(p, "`to` needs the greatest value here", "")) != NULL;
}

/* ---- files and the session ---- */

static const char *parse_to_file(parser *p)
{
    if (!parser_expect_word(p, "to", "`to` and a file name in quotes"))
        return NULL;
    parser_skip_lines(p);
    return parser_text(p, "a file name in quotes after `to`");
}

bool parse_plot(parser *p, statement *out)
{
    static const char *const words[] = {"error", "terms", NULL};
    out->kind = STATEMENT_PLOT;
    out->as.plot = parser_alloc(p, sizeof *out->as.plot);
    parser_go_on(p);
    out->as.plot->terms = parser_at_word(p, "terms");
    if (!out->as.plot->terms && !parser_at_word(p, "error"))
        return parser_expected_one_of(p, "`error` or `terms` after `plot`", words);
    return parse_of(p, &out->as.plot->of, "`of` and an expansion")
        && parse_at(p, &out->as.plot->at)
        && (out->as.plot->to_file = parse_to_file(p)) != NULL;
}

bool parse_write(parser *p, statement *out)
{
    out->kind = STATEMENT_WRITE;
    parser_go_on(p);
    if ((out->as.write.subject = parse_sum(p, "`write` needs an expansion here", "as")) == NULL
        || !parser_expect_word(p, "as", "`as` and a format"))
        return false;
    parser_skip_lines(p);
    return parser_name(p, &out->as.write.format, "a format after `as`, such as json, csv or text")
        && (out->as.write.to_file = parse_to_file(p)) != NULL;
}

bool parse_show(parser *p, statement *out)
{
    out->kind = STATEMENT_SHOW;
    parser_advance(p);
    if (parser_at_line_end(p))
        return true;
    parser_skip_lines(p);
    return parser_new_name(p, &out->as.name, "a name after `show`");
}

bool parse_drop(parser *p, statement *out)
{
    out->kind = STATEMENT_DROP;
    parser_go_on(p);
    return parser_new_name(p, &out->as.name, "a name after `drop`");
}

/* Takes the rest of the line from the bytes, whatever they are, as long as they are UTF-8 without a NUL. */
bool parse_help(parser *p, statement *out)
{
    out->kind = STATEMENT_HELP;
    const char *from = p->lexer.cursor, *end = memchr(from, '\n', (size_t)(p->lexer.limit - from));
    const char *to = end ? end : p->lexer.limit;
    while (from < to && (*from == ' ' || *from == '\t'))
        from++;
    while (to > from && (to[-1] == ' ' || to[-1] == '\t' || to[-1] == '\r'))
        to--;
    size_t bad = source_check_bytes(from, (size_t)(to - from));
    if (bad < (size_t)(to - from)) {
        p->lexer.cursor = from + bad;
        parser_advance(p); /* the next token is the bad byte: its complaint is the statement's */
        return parser_fail_here(p, "expected a word");
    }
    out->as.help = arena_copy(&p->out->arena, from, (size_t)(to - from));
    p->lexer.cursor = to;
    parser_advance(p);
    p->last.at.to = (uint32_t)(to - p->source->bytes);
    return true;
}

bool parse_quit(parser *p, statement *out)
{
    out->kind = STATEMENT_QUIT;
    parser_advance(p);
    return true;
}
