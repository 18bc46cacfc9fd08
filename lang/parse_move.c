/* The grammar of derivations by hand: derive, the moves, done, undo, steps. Each line is a statement of its own, so
 * that a prompt can take it at once; whether a derivation is open is the session's business. */
#include <string.h>

#include "lang/parser.h"

bool parse_derive(parser *p, statement *out)
{
    out->kind = STATEMENT_DERIVE;
    parser_go_on(p);
    return (out->as.subject = parse_sum(p, "`derive` needs an integral here", "")) != NULL;
}

bool parse_done(parser *p, statement *out)
{
    out->kind = STATEMENT_DONE;
    parser_advance(p);
    if (!parser_at_word(p, "as"))
        return true;
    parser_go_on(p);
    return parser_new_name(p, &out->as.name, "a name after `as`");
}

bool parse_undo(parser *p, statement *out)
{
    out->kind = STATEMENT_UNDO;
    parser_advance(p);
    return true;
}

bool parse_steps(parser *p, statement *out)
{
    out->kind = STATEMENT_STEPS;
    parser_advance(p);
    if (parser_at_word(p, "of"))
        return parser_fail_here(p, "`steps` takes the name without `of`: `steps A`");
    if (parser_at_line_end(p))
        return true;
    return (out->as.subject = parse_sum(p, "`steps` takes the name of a result here", "")) != NULL;
}

/* ---- the moves ---- */

static bool parse_substitute(parser *p, statement *out)
{
    out->as.move->kind = MOVE_SUBSTITUTE;
    parser_go_on(p);
    if (!parser_new_name(p, &out->as.move->as.substitute.name, "the variable after `substitute`")
        || !parser_expect_sign(p, TOKEN_EQUAL, "`=` and what takes the variable's place")
        || (out->as.move->as.substitute.value = parse_sum(p, "`=` needs an expression here", "with")) == NULL)
        return false;
    if (!parser_at_word(p, "with"))
        return true;
    parser_go_on(p);
    return parser_new_name(p, &out->as.move->as.substitute.new_name, "the new variable after `with`")
        && parser_expect_sign(p, TOKEN_EQUAL, "`=` and the new variable in the old one")
        && (out->as.move->as.substitute.inverse = parse_sum(p, "`=` needs an expression here", "")) != NULL;
}

static bool parse_parts(parser *p, statement *out)
{
    out->as.move->kind = MOVE_PARTS;
    parser_go_on(p);
    if (!parser_expect_word(p, "integrating", "`integrating` and a factor after `parts`"))
        return false;
    parser_skip_lines(p);
    return (out->as.move->as.factor = parse_sum(p, "`integrating` needs a factor here", "in")) != NULL;
}

static bool parse_repeat(parser *p, statement *out)
{
    out->as.move->kind = MOVE_REPEAT_PARTS;
    parser_go_on(p);
    if (!parser_expect_word(p, "parts", "`parts` and how many times after `repeat`"))
        return false;
    return (out->as.move->as.times = parse_sum(p, "`repeat parts` needs a number here", "times")) != NULL
        && parser_expect_word(p, "times", "`times` after the number");
}

static bool parse_differentiate(parser *p, statement *out)
{
    out->as.move->kind = MOVE_DIFFERENTIATE;
    parser_go_on(p);
    if (!parser_expect_word(p, "in", "`in` and a parameter after `differentiate`"))
        return false;
    parser_skip_lines(p);
    return parser_new_name(p, &out->as.move->as.parameter.in, "a parameter after `in`");
}

static bool parse_integrate(parser *p, statement *out)
{
    static const char *const words[] = {"back", "termwise", NULL};
    parser_go_on(p);
    if (parser_take_word(p, "termwise")) {
        out->as.move->kind = MOVE_TERMWISE;
        return true;
    }
    out->as.move->kind = MOVE_INTEGRATE_BACK;
    if (!parser_take_word(p, "back"))
        return parser_expected_one_of(p, "`termwise`, or `back in` and a parameter, after `integrate`", words);
    if (!parser_expect_word(p, "in", "`in` and a parameter after `integrate back`"))
        return false;
    parser_skip_lines(p);
    if (!parser_new_name(p, &out->as.move->as.parameter.in, "a parameter after `in`")
        || !parser_expect_word(p, "from", "`from` and the value at which the integral is known"))
        return false;
    parser_skip_lines(p);
    return (out->as.move->as.parameter.from = parse_sum(p, "`from` needs a value here", "in")) != NULL;
}

static bool parse_split(parser *p, statement *out)
{
    out->as.move->kind = MOVE_SPLIT;
    parser_go_on(p);
    if (!parser_expect_word(p, "at", "`at` and a point after `split`"))
        return false;
    parser_skip_lines(p);
    return (out->as.move->as.place = parse_sum(p, "`at` needs a point here", "in")) != NULL;
}

static bool parse_rotate(parser *p, statement *out)
{
    out->as.move->kind = MOVE_ROTATE;
    parser_go_on(p);
    if (!parser_expect_word(p, "by", "`by` and an angle after `rotate`"))
        return false;
    parser_skip_lines(p);
    return (out->as.move->as.place = parse_sum(p, "`by` needs an angle here", "in")) != NULL;
}

static bool parse_swap(parser *p, statement *out)
{
    out->as.move->kind = MOVE_SWAP;
    parser_advance(p);
    return true;
}

/* in integral K, after any move. */
static bool parse_which_integral(parser *p, statement *out)
{
    if (!parser_at_word(p, "in"))
        return true;
    parser_go_on(p);
    if (!parser_expect_word(p, "integral", "`integral` and its number after `in`"))
        return false;
    return (out->as.move->integral = parse_sum(p, "`in integral` needs a number here", "")) != NULL;
}

static void move_begin(parser *p, statement *out)
{
    out->kind = STATEMENT_MOVE;
    out->as.move = parser_alloc(p, sizeof *out->as.move);
}

static const struct {
    const char *word;
    statement_parser *parse;
} moves[] = {
    {"substitute", parse_substitute}, {"parts", parse_parts}, {"repeat", parse_repeat},
    {"differentiate", parse_differentiate}, {"integrate", parse_integrate}, {"split", parse_split},
    {"rotate", parse_rotate}, {"swap", parse_swap},
};

bool parse_move(parser *p, statement *out)
{
    size_t k = 0;
    while (strcmp(moves[k].word, p->name->text) != 0)
        k++;
    move_begin(p, out);
    return moves[k].parse(p, out) && parse_which_integral(p, out);
}

bool parse_use_rule_move(parser *p, statement *out)
{
    move_begin(p, out);
    out->as.move->kind = MOVE_USE_RULE;
    parser_go_on(p);
    return parser_new_name(p, &out->as.move->as.rule, "a rule's name after `use rule`") && parse_which_integral(p, out);
}

bool parse_rewrite_move(parser *p, statement *out)
{
    move_begin(p, out);
    out->as.move->kind = MOVE_REWRITE;
    parser_go_on(p);
    return (out->as.move->as.with = parse_pass(p)) != NULL && parse_which_integral(p, out);
}

bool parse_expand_move(parser *p, statement *out, syntax *factor)
{
    move_begin(p, out);
    out->as.move->kind = MOVE_EXPAND;
    out->as.move->as.expand.factor = factor;
    parser_go_on(p);
    if ((out->as.move->as.expand.around = parse_sum(p, "`around` needs a point here", "to")) == NULL
        || !parser_expect_word(p, "to", "`to` and a number of terms"))
        return false;
    parser_skip_lines(p);
    return (out->as.move->as.expand.terms = parse_sum(p, "`to` needs a number of terms here", "terms")) != NULL
        && parser_expect_word(p, "terms", "`terms` after the number") && parse_which_integral(p, out);
}
