/* The one printer of syntax. It puts back the brackets that the grammar needs and no others, so a printed tree never
 * nests deeper than the text it came from. Two things decide about brackets: how tightly the surroundings bind, and
 * whether what follows would end an operand that has no end of its own (a sum's body, the value after `near`). */
#include <string.h>

#include "lang/syntax.h"
#include "lang/words.h"

/* How tightly an expression holds together; brackets go around what is looser than its place allows. */
enum { BIND_SUM, BIND_PRODUCT, BIND_SIGN, BIND_POWER, BIND_OPERAND };

static int binding_of(const syntax *a)
{
    switch ((syntax_kind)a->kind) {
    case SYNTAX_SUM:
        return BIND_SUM;
    case SYNTAX_PRODUCT:
        return BIND_PRODUCT;
    case SYNTAX_NEGATE:
        return BIND_SIGN;
    case SYNTAX_POWER: case SYNTAX_INTEGRAL: case SYNTAX_CONTOUR: case SYNTAX_DERIVATIVE: case SYNTAX_SUMMATION:
    case SYNTAX_ROOT:
        return BIND_POWER; /* an operand, but not before `^` and `!` */
    default:
        return BIND_OPERAND;
    }
}

/* Would more of the text belong to its last part? */
static bool has_open_end(const syntax *a)
{
    return a->kind == SYNTAX_SUMMATION || a->kind == SYNTAX_ROOT;
}

/* A name that is also a linking word would often be taken for that where an operand may begin. */
static bool begins_with_linking_name(const syntax *a)
{
    const char *name = a->kind == SYNTAX_NAME ? a->as.name
        : a->kind == SYNTAX_CALL              ? a->as.call.name.text
        : a->kind == SYNTAX_INDEXED           ? a->as.indexed.name : NULL;
    return name != NULL && word_find(name) == WORD_LINK;
}

/* ended: what follows is no operator that would bind more tightly than `+`. */
static void print_at(text *out, const syntax *a, int binding, bool ended);

static void print_sum(text *out, const syntax *a)
{
    print_at(out, a, BIND_SUM, true);
}

static void print_list(text *out, const syntax *a, bool ended)
{
    bool sum = a->kind == SYNTAX_SUM;
    size_t n = a->as.list.count;
    for (size_t k = 0; k < n; k++) {
        if (k > 0)
            text_addf(out, sum ? " %c " : "%c", a->as.list.signs[k]);
        print_at(out, a->as.list.parts[k], sum ? BIND_PRODUCT : BIND_SIGN, k + 1 < n ? sum : ended);
    }
}

static void print_power(text *out, const syntax *a, bool ended)
{
    const syntax *exponent = a->as.power.exponent;
    print_at(out, a->as.power.base, BIND_OPERAND, false);
    text_add_char(out, '^');
    print_at(out, exponent, exponent->kind == SYNTAX_NEGATE ? BIND_SIGN : BIND_POWER, ended);
}

static void print_arguments(text *out, syntax *const *list, size_t count)
{
    for (size_t k = 0; k < count; k++) {
        text_add(out, k ? ", " : "");
        print_sum(out, list[k]);
    }
}

static void print_binder(text *out, const syntax *a)
{
    bool integral = a->kind == SYNTAX_INTEGRAL;
    text_add(out, integral ? "integral from " : "sum from ");
    if (!integral)
        text_addf(out, "%s = ", a->as.binder->variable.text);
    print_sum(out, a->as.binder->from);
    text_add(out, " to ");
    print_sum(out, a->as.binder->to);
    text_add(out, " of ");
    print_at(out, a->as.binder->body, integral ? BIND_SUM : BIND_PRODUCT, true);
    if (integral)
        text_addf(out, " d%s", a->as.binder->variable.text);
}

static void print_contour(text *out, const syntax *a)
{
    for (size_t k = 0; k < a->as.contour->count; k++) {
        text_add(out, k ? " to " : "integral along ");
        print_sum(out, a->as.contour->points[k]);
    }
    text_add(out, " of ");
    print_sum(out, a->as.contour->body);
    text_addf(out, " d%s", a->as.contour->variable.text);
}

static void print_derivative(text *out, const syntax *a)
{
    text_add(out, "derivative of ");
    print_at(out, a->as.derivative->of, BIND_PRODUCT, true);
    text_addf(out, " in %s", a->as.derivative->in.text);
    if (a->as.derivative->order != NULL) {
        text_add(out, " order ");
        print_at(out, a->as.derivative->order, BIND_POWER, false);
    }
}

static void print_bindings(text *out, const syntax_binding *list, size_t count)
{
    for (size_t k = 0; k < count; k++) {
        const syntax_binding *b = &list[k];
        text_addf(out, "%s%s %s ", k ? ", " : "", b->name.text, b->count ? "=" : "from");
        print_arguments(out, b->values, b->count);
        if (b->count > 0)
            continue;
        print_sum(out, b->from);
        text_add(out, " to ");
        print_sum(out, b->to);
        text_add(out, b->step ? " step " : " in ");
        print_sum(out, b->step ? b->step : b->points);
        text_add(out, b->step ? "" : b->log_scale ? " points on a log scale" : " points");
    }
}

static void print_piecewise(text *out, const syntax *a)
{
    text_add(out, "piecewise(");
    for (size_t k = 0; k < a->as.piecewise->count; k++) {
        print_sum(out, a->as.piecewise->values[k]);
        text_add(out, " when ");
        print_sum(out, a->as.piecewise->conditions[k]);
        text_add(out, ", ");
    }
    print_sum(out, a->as.piecewise->otherwise);
    text_add(out, " otherwise)");
}

static void print_root(text *out, const syntax *a)
{
    text_add(out, "root of ");
    print_sum(out, a->as.root->of);
    text_addf(out, " in %s near ", a->as.root->in.text);
    print_at(out, a->as.root->near, BIND_PRODUCT, true);
}

static void print_comparison(text *out, const syntax *a)
{
    static const char *const signs[] = {"<", "<=", ">", ">=", "=", "!="};
    for (size_t k = 0; k <= a->as.comparison.count; k++) {
        if (k > 0)
            text_addf(out, " %s ", signs[a->as.comparison.relations[k - 1]]);
        print_sum(out, a->as.comparison.operands[k]);
    }
}

static void print_range(text *out, const syntax *a)
{
    print_sum(out, a->as.range->value);
    text_addf(out, " in %c", a->as.range->with_from ? '[' : '(');
    print_sum(out, a->as.range->from);
    text_add(out, ", ");
    print_sum(out, a->as.range->to);
    text_add_char(out, a->as.range->with_to ? ']' : ')');
}

static void print_bare(text *out, const syntax *a, bool ended)
{
    static const char *const domains[] = {"integer", "real", "complex"};
    switch ((syntax_kind)a->kind) {
    case SYNTAX_NUMBER:
        text_add(out, a->as.number);
        return;
    case SYNTAX_NAME:
        text_add(out, a->as.name);
        return;
    case SYNTAX_CALL:
        text_addf(out, "%s(", a->as.call.name.text);
        print_arguments(out, a->as.call.arguments, a->as.call.count);
        text_add_char(out, ')');
        return;
    case SYNTAX_INDEXED:
        text_addf(out, "%s[", a->as.indexed.name);
        print_sum(out, a->as.indexed.index);
        text_add_char(out, ']');
        return;
    case SYNTAX_SUM: case SYNTAX_PRODUCT:
        print_list(out, a, ended);
        return;
    case SYNTAX_NEGATE:
        text_add_char(out, '-');
        print_at(out, a->as.operand, BIND_SIGN, ended);
        return;
    case SYNTAX_POWER:
        print_power(out, a, ended);
        return;
    case SYNTAX_FACTORIAL:
        print_at(out, a->as.operand, BIND_OPERAND, false);
        text_add_char(out, '!');
        return;
    case SYNTAX_INTEGRAL: case SYNTAX_SUMMATION:
        print_binder(out, a);
        return;
    case SYNTAX_CONTOUR:
        print_contour(out, a);
        return;
    case SYNTAX_DERIVATIVE:
        print_derivative(out, a);
        return;
    case SYNTAX_AT:
        text_add_char(out, '(');
        print_sum(out, a->as.substitution.body);
        text_add(out, " at ");
        print_bindings(out, a->as.substitution.bindings, a->as.substitution.count);
        text_add_char(out, ')');
        return;
    case SYNTAX_PIECEWISE:
        print_piecewise(out, a);
        return;
    case SYNTAX_ROOT:
        print_root(out, a);
        return;
    case SYNTAX_COMPARISON:
        print_comparison(out, a);
        return;
    case SYNTAX_RANGE:
        print_range(out, a);
        return;
    case SYNTAX_DOMAIN:
        print_sum(out, a->as.domain.value);
        text_addf(out, " %s", domains[a->as.domain.domain]);
        return;
    }
}

static void print_at(text *out, const syntax *a, int binding, bool ended)
{
    bool brackets = binding_of(a) < binding || (has_open_end(a) && !ended) || begins_with_linking_name(a);
    text_add(out, brackets ? "(" : "");
    print_bare(out, a, ended || brackets);
    text_add(out, brackets ? ")" : "");
}

void syntax_print(text *out, const syntax *a)
{
    print_sum(out, a);
}

/* ---- passes ---- */

void syntax_pass_print(text *out, const syntax_pass *a)
{
    static const char *const words[] = {"", "repeat ", "everywhere ", "once ", " then ", " or "};
    static const int tightness[] = {2, 2, 2, 2, 1, 0};
    if (a->kind == PASS_NAME)
        text_add(out, a->name);
    for (size_t k = 0; k < a->count; k++) {
        const syntax_pass *part = a->parts[k];
        bool joined = a->kind >= PASS_THEN;
        bool brackets = tightness[part->kind] < (joined ? tightness[a->kind] + 1 : 2);
        if (!joined || k > 0)
            text_add(out, words[a->kind]);
        text_add(out, brackets ? "(" : "");
        syntax_pass_print(out, part);
        text_add(out, brackets ? ")" : "");
    }
}

/* ---- statements ---- */

static void print_quoted(text *out, const char *words)
{
    text_add_char(out, '"');
    for (; *words; words++) {
        if (*words == '"' || *words == '\\')
            text_add_char(out, '\\');
        text_add_char(out, *words);
    }
    text_add_char(out, '"');
}

/* The option's words before and after an expression, when that was typed. */
static void print_option(text *out, const char *before, const syntax *a, const char *after)
{
    if (a == NULL)
        return;
    text_add(out, before);
    print_sum(out, a);
    text_add(out, after);
}

static void print_named(text *out, const char *before, syntax_name name)
{
    if (name.text != NULL)
        text_addf(out, "%s%s", before, name.text);
}

static void print_file(text *out, const char *before, const char *file)
{
    if (file == NULL)
        return;
    text_add(out, before);
    print_quoted(out, file);
}

static void print_conditions(text *out, syntax_conditions c)
{
    print_arguments(out, c.list, c.count);
}

static void print_names(text *out, const syntax_name *names, size_t count)
{
    text_add_char(out, '(');
    for (size_t k = 0; k < count; k++)
        text_addf(out, "%s%s", k ? ", " : "", names[k].text);
    text_add_char(out, ')');
}

static void print_let(text *out, const statement *s)
{
    text_addf(out, "let %s", s->as.let.name.text);
    if (s->as.let.is_function)
        print_names(out, s->as.let.parameters, s->as.let.count);
    text_add(out, " = ");
    if (s->as.let.request != NULL)
        statement_print(out, s->as.let.request);
    else
        print_sum(out, s->as.let.value);
}

static void print_rule(text *out, const statement *s)
{
    text_addf(out, "rule %s", s->as.rule->name.text);
    for (size_t k = 0; k < s->as.rule->count; k++) {
        text_addf(out, "%s%s", k ? ", " : "(", s->as.rule->parameters[k].name.text);
        if (s->as.rule->parameters[k].count > 0)
            print_names(out, s->as.rule->parameters[k].names, s->as.rule->parameters[k].count);
    }
    text_add(out, s->as.rule->count ? "):\n    " : ":\n    ");
    print_sum(out, s->as.rule->pattern);
    print_option(out, "\n    becomes ", s->as.rule->becomes, "");
    if (s->as.rule->when.count > 0) {
        text_add(out, "\n    when ");
        print_conditions(out, s->as.rule->when);
    }
    print_file(out, "\n    because ", s->as.rule->because);
}

static void print_move(text *out, const statement *s)
{
    text_add(out, move_words((move_kind)s->as.move->kind));
    switch ((move_kind)s->as.move->kind) {
    case MOVE_SUBSTITUTE:
        text_addf(out, " %s = ", s->as.move->as.substitute.name.text);
        print_sum(out, s->as.move->as.substitute.value);
        print_named(out, " with ", s->as.move->as.substitute.new_name);
        print_option(out, " = ", s->as.move->as.substitute.inverse, "");
        break;
    case MOVE_PARTS:
        print_option(out, " ", s->as.move->as.factor, "");
        break;
    case MOVE_REPEAT_PARTS:
        print_option(out, " ", s->as.move->as.times, " times");
        break;
    case MOVE_DIFFERENTIATE: case MOVE_INTEGRATE_BACK:
        print_named(out, " ", s->as.move->as.parameter.in);
        print_option(out, " from ", s->as.move->as.parameter.from, "");
        break;
    case MOVE_SPLIT: case MOVE_ROTATE:
        print_option(out, " ", s->as.move->as.place, "");
        break;
    case MOVE_EXPAND:
        print_option(out, " ", s->as.move->as.expand.factor, "");
        print_option(out, " around ", s->as.move->as.expand.around, "");
        print_option(out, " to ", s->as.move->as.expand.terms, " terms");
        break;
    case MOVE_USE_RULE:
        print_named(out, " ", s->as.move->as.rule);
        break;
    case MOVE_REWRITE:
        text_add_char(out, ' ');
        syntax_pass_print(out, s->as.move->as.with);
        break;
    default: /* TERMWISE, SWAP: the words are all */
        break;
    }
    print_option(out, " in integral ", s->as.move->integral, "");
}

static void print_at_bindings(text *out, syntax_bindings b)
{
    text_add(out, b.count ? " at " : "");
    print_bindings(out, b.list, b.count);
}

static void print_evaluate(text *out, const statement *s)
{
    print_option(out, "evaluate ", s->as.evaluate->subject, "");
    print_at_bindings(out, s->as.evaluate->at);
    print_file(out, " at points of ", s->as.evaluate->points_file);
    print_option(out, " to ", s->as.evaluate->digits, " digits");
    print_option(out, " with ", s->as.evaluate->terms, " terms");
    text_add(out, s->as.evaluate->all_contributions ? " with all contributions" : "");
    print_file(out, " to ", s->as.evaluate->to_file);
}

static void print_check_recurrence(text *out, const statement *s)
{
    text_add(out, "check recurrence");
    print_option(out, " ", s->as.check_recurrence.left, " =");
    print_option(out, " ", s->as.check_recurrence.right, "");
    print_option(out, " of ", s->as.check_recurrence.of, "");
}

void statement_print(text *out, const statement *s)
{
    switch ((statement_kind)s->kind) {
    case STATEMENT_LARGE: case STATEMENT_SMALL:
        text_addf(out, "%s %s%s", statement_words(s), s->as.large.name.text, s->as.large.integer ? " integer" : "");
        print_option(out, ", ", s->as.large.sector, "");
        return;
    case STATEMENT_GIVEN: case STATEMENT_GRANT:
        text_addf(out, "%s ", statement_words(s));
        print_conditions(out, s->as.given);
        return;
    case STATEMENT_LET:
        print_let(out, s);
        return;
    case STATEMENT_USE:
        text_add(out, "use");
        print_named(out, " ", s->as.use.name);
        print_file(out, " ", s->as.use.file);
        return;
    case STATEMENT_RULE:
        print_rule(out, s);
        return;
    case STATEMENT_PASS:
        text_addf(out, "pass %s = ", s->as.pass.name.text);
        syntax_pass_print(out, s->as.pass.value);
        return;
    case STATEMENT_CHECK_RULE: case STATEMENT_WHY_NOT: case STATEMENT_SHOW: case STATEMENT_DROP:
        text_add(out, statement_words(s));
        print_named(out, " ", s->as.name);
        return;
    case STATEMENT_DONE:
        text_add(out, "done");
        print_named(out, " as ", s->as.name);
        return;
    case STATEMENT_CHECK_FILE:
        print_file(out, "check ", s->as.file);
        return;
    case STATEMENT_CHECK_RECURRENCE:
        print_check_recurrence(out, s);
        return;
    case STATEMENT_REWRITE:
        print_option(out, "rewrite ", s->as.rewrite.value, " with ");
        syntax_pass_print(out, s->as.rewrite.with);
        return;
    case STATEMENT_DERIVE: case STATEMENT_STEPS: case STATEMENT_RECURRENCE: case STATEMENT_GROWTH:
    case STATEMENT_EXPANSION_OF: case STATEMENT_RULE_FROM:
        text_add(out, statement_words(s));
        print_option(out, " ", s->as.subject, "");
        return;
    case STATEMENT_MOVE:
        print_move(out, s);
        return;
    case STATEMENT_REPLAY:
        print_option(out, "replay ", s->as.replay.derivation, "");
        print_option(out, " on ", s->as.replay.on, "");
        return;
    case STATEMENT_EXPAND:
        print_option(out, "expand ", s->as.expand->subject, "");
        print_option(out, " to ", s->as.expand->terms, " terms");
        print_named(out, " by ", s->as.expand->by);
        print_named(out, " as ", s->as.expand->as);
        return;
    case STATEMENT_COEFFICIENTS:
        print_option(out, "coefficients of ", s->as.coefficients.of, "");
        print_option(out, " from ", s->as.coefficients.from, "");
        print_option(out, " to ", s->as.coefficients.to, "");
        return;
    case STATEMENT_REMAINDER:
        print_option(out, "remainder of ", s->as.remainder.of, "");
        print_option(out, " with ", s->as.remainder.terms, " terms");
        return;
    case STATEMENT_EVALUATE:
        print_evaluate(out, s);
        return;
    case STATEMENT_COMPARE:
        print_option(out, "compare ", s->as.compare.subject, "");
        print_at_bindings(out, s->as.compare.at);
        return;
    case STATEMENT_PLAN:
        print_option(out, "plan ", s->as.plan->subject, " for relative error ");
        print_sum(out, s->as.plan->error);
        print_named(out, " over ", s->as.plan->over);
        print_option(out, " from ", s->as.plan->from, "");
        print_option(out, " to ", s->as.plan->to, "");
        return;
    case STATEMENT_PLOT:
        print_option(out, s->as.plot->terms ? "plot terms of " : "plot error of ", s->as.plot->of, "");
        print_at_bindings(out, s->as.plot->at);
        print_file(out, " to ", s->as.plot->to_file);
        return;
    case STATEMENT_WRITE:
        print_option(out, "write ", s->as.write.subject, "");
        print_named(out, " as ", s->as.write.format);
        print_file(out, " to ", s->as.write.to_file);
        return;
    case STATEMENT_HELP:
        text_addf(out, "help%s%s", *s->as.help ? " " : "", s->as.help);
        return;
    case STATEMENT_UNDO: case STATEMENT_QUIT:
        text_add(out, statement_words(s));
        return;
    case STATEMENT_KIND_COUNT:
        return;
    }
}
