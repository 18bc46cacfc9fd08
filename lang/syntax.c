/* What can be asked of a tree without its text: equality, the words of a kind. Places never count. */
#include "lang/syntax.h"

#include <stdlib.h>
#include <string.h>

void syntax_text_init(syntax_text *t)
{
    memset(t, 0, sizeof *t);
    arena_init(&t->arena);
    text_init(&t->words);
}

void syntax_text_clear(syntax_text *t)
{
    free(t->statements);
    free(t->errors);
    text_clear(&t->words);
    arena_clear(&t->arena);
    memset(t, 0, sizeof *t);
}

const char *move_words(move_kind kind)
{
    static const char *const words[] = {
#define X(id, w) w,
        MOVE_KINDS(X)
#undef X
    };
    return words[kind];
}

const char *statement_words(const statement *s)
{
    static const char *const words[] = {
#define X(id, w) w,
        STATEMENT_KINDS(X)
#undef X
    };
    return s->kind == STATEMENT_MOVE ? move_words((move_kind)s->as.move->kind) : words[s->kind];
}

bool statement_gives_value(statement_kind kind)
{
    switch (kind) {
    case STATEMENT_REWRITE: case STATEMENT_REPLAY: case STATEMENT_EXPAND: case STATEMENT_STEPS:
    case STATEMENT_COEFFICIENTS: case STATEMENT_RECURRENCE: case STATEMENT_GROWTH: case STATEMENT_REMAINDER:
    case STATEMENT_EVALUATE: case STATEMENT_COMPARE: case STATEMENT_PLAN: case STATEMENT_EXPANSION_OF:
    case STATEMENT_RULE_FROM:
        return true;
    default:
        return false;
    }
}

bool syntax_is_condition(const syntax *a)
{
    return a->kind >= SYNTAX_COMPARISON;
}

/* ---- equality ---- */

static bool words_equal(const char *a, const char *b)
{
    return a == b || (a != NULL && b != NULL && strcmp(a, b) == 0);
}

static bool names_equal(syntax_name a, syntax_name b)
{
    return words_equal(a.text, b.text);
}

static bool lists_equal(syntax *const *a, syntax *const *b, size_t n)
{
    for (size_t k = 0; k < n; k++)
        if (!syntax_equal(a[k], b[k]))
            return false;
    return true;
}

static bool binding_equal(const syntax_binding *a, const syntax_binding *b)
{
    return names_equal(a->name, b->name) && a->count == b->count && lists_equal(a->values, b->values, a->count)
        && syntax_equal(a->from, b->from) && syntax_equal(a->to, b->to) && syntax_equal(a->step, b->step)
        && syntax_equal(a->points, b->points) && a->log_scale == b->log_scale;
}

static bool bindings_equal(const syntax_binding *a, size_t m, const syntax_binding *b, size_t n)
{
    if (m != n)
        return false;
    for (size_t k = 0; k < n; k++)
        if (!binding_equal(&a[k], &b[k]))
            return false;
    return true;
}

bool syntax_equal(const syntax *a, const syntax *b)
{
    if (a == NULL || b == NULL || a->kind != b->kind)
        return a == b;
    switch ((syntax_kind)a->kind) {
    case SYNTAX_NUMBER:
        return words_equal(a->as.number, b->as.number);
    case SYNTAX_NAME:
        return words_equal(a->as.name, b->as.name);
    case SYNTAX_CALL:
        return names_equal(a->as.call.name, b->as.call.name) && a->as.call.count == b->as.call.count
            && lists_equal(a->as.call.arguments, b->as.call.arguments, a->as.call.count);
    case SYNTAX_INDEXED:
        return words_equal(a->as.indexed.name, b->as.indexed.name)
            && syntax_equal(a->as.indexed.index, b->as.indexed.index);
    case SYNTAX_SUM: case SYNTAX_PRODUCT:
        return a->as.list.count == b->as.list.count && memcmp(a->as.list.signs, b->as.list.signs, a->as.list.count) == 0
            && lists_equal(a->as.list.parts, b->as.list.parts, a->as.list.count);
    case SYNTAX_NEGATE: case SYNTAX_FACTORIAL:
        return syntax_equal(a->as.operand, b->as.operand);
    case SYNTAX_POWER:
        return syntax_equal(a->as.power.base, b->as.power.base)
            && syntax_equal(a->as.power.exponent, b->as.power.exponent);
    case SYNTAX_INTEGRAL: case SYNTAX_SUMMATION:
        return names_equal(a->as.binder->variable, b->as.binder->variable)
            && syntax_equal(a->as.binder->from, b->as.binder->from) && syntax_equal(a->as.binder->to, b->as.binder->to)
            && syntax_equal(a->as.binder->body, b->as.binder->body);
    case SYNTAX_CONTOUR:
        return names_equal(a->as.contour->variable, b->as.contour->variable)
            && a->as.contour->count == b->as.contour->count
            && lists_equal(a->as.contour->points, b->as.contour->points, a->as.contour->count)
            && syntax_equal(a->as.contour->body, b->as.contour->body);
    case SYNTAX_DERIVATIVE:
        return names_equal(a->as.derivative->in, b->as.derivative->in)
            && syntax_equal(a->as.derivative->of, b->as.derivative->of)
            && syntax_equal(a->as.derivative->order, b->as.derivative->order);
    case SYNTAX_AT:
        return syntax_equal(a->as.substitution.body, b->as.substitution.body)
            && bindings_equal(a->as.substitution.bindings, a->as.substitution.count, b->as.substitution.bindings,
                              b->as.substitution.count);
    case SYNTAX_PIECEWISE:
        return a->as.piecewise->count == b->as.piecewise->count
            && lists_equal(a->as.piecewise->values, b->as.piecewise->values, a->as.piecewise->count)
            && lists_equal(a->as.piecewise->conditions, b->as.piecewise->conditions, a->as.piecewise->count)
            && syntax_equal(a->as.piecewise->otherwise, b->as.piecewise->otherwise);
    case SYNTAX_ROOT:
        return names_equal(a->as.root->in, b->as.root->in) && syntax_equal(a->as.root->of, b->as.root->of)
            && syntax_equal(a->as.root->near, b->as.root->near);
    case SYNTAX_COMPARISON:
        return a->as.comparison.count == b->as.comparison.count
            && memcmp(a->as.comparison.relations, b->as.comparison.relations, a->as.comparison.count) == 0
            && lists_equal(a->as.comparison.operands, b->as.comparison.operands, a->as.comparison.count + 1);
    case SYNTAX_RANGE:
        return a->as.range->with_from == b->as.range->with_from && a->as.range->with_to == b->as.range->with_to
            && syntax_equal(a->as.range->value, b->as.range->value)
            && syntax_equal(a->as.range->from, b->as.range->from) && syntax_equal(a->as.range->to, b->as.range->to);
    case SYNTAX_DOMAIN:
        return a->as.domain.domain == b->as.domain.domain && syntax_equal(a->as.domain.value, b->as.domain.value);
    }
    return false;
}

bool syntax_pass_equal(const syntax_pass *a, const syntax_pass *b)
{
    if (a->kind != b->kind || a->count != b->count || !words_equal(a->name, b->name))
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (!syntax_pass_equal(a->parts[k], b->parts[k]))
            return false;
    return true;
}

static bool parameters_equal(const syntax_parameter *a, const syntax_parameter *b)
{
    if (!names_equal(a->name, b->name) || a->count != b->count)
        return false;
    for (size_t k = 0; k < a->count; k++)
        if (!names_equal(a->names[k], b->names[k]))
            return false;
    return true;
}

static bool conditions_equal(syntax_conditions a, syntax_conditions b)
{
    return a.count == b.count && lists_equal(a.list, b.list, a.count);
}

static bool binding_lists_equal(syntax_bindings a, syntax_bindings b)
{
    return bindings_equal(a.list, a.count, b.list, b.count);
}

static bool lets_equal(const statement *a, const statement *b)
{
    if (!names_equal(a->as.let.name, b->as.let.name) || a->as.let.is_function != b->as.let.is_function
        || a->as.let.count != b->as.let.count || !syntax_equal(a->as.let.value, b->as.let.value))
        return false;
    for (size_t k = 0; k < a->as.let.count; k++)
        if (!names_equal(a->as.let.parameters[k], b->as.let.parameters[k]))
            return false;
    if (a->as.let.request == NULL || b->as.let.request == NULL)
        return a->as.let.request == b->as.let.request;
    return statement_equal(a->as.let.request, b->as.let.request);
}

static bool rules_equal(const statement *a, const statement *b)
{
    if (!names_equal(a->as.rule->name, b->as.rule->name) || a->as.rule->count != b->as.rule->count)
        return false;
    for (size_t k = 0; k < a->as.rule->count; k++)
        if (!parameters_equal(&a->as.rule->parameters[k], &b->as.rule->parameters[k]))
            return false;
    return syntax_equal(a->as.rule->pattern, b->as.rule->pattern)
        && syntax_equal(a->as.rule->becomes, b->as.rule->becomes)
        && conditions_equal(a->as.rule->when, b->as.rule->when)
        && words_equal(a->as.rule->because, b->as.rule->because);
}

static bool moves_equal(const statement *a, const statement *b)
{
    if (a->as.move->kind != b->as.move->kind || !syntax_equal(a->as.move->integral, b->as.move->integral))
        return false;
    switch ((move_kind)a->as.move->kind) {
    case MOVE_SUBSTITUTE:
        return names_equal(a->as.move->as.substitute.name, b->as.move->as.substitute.name)
            && syntax_equal(a->as.move->as.substitute.value, b->as.move->as.substitute.value)
            && names_equal(a->as.move->as.substitute.new_name, b->as.move->as.substitute.new_name)
            && syntax_equal(a->as.move->as.substitute.inverse, b->as.move->as.substitute.inverse);
    case MOVE_PARTS:
        return syntax_equal(a->as.move->as.factor, b->as.move->as.factor);
    case MOVE_REPEAT_PARTS:
        return syntax_equal(a->as.move->as.times, b->as.move->as.times);
    case MOVE_DIFFERENTIATE: case MOVE_INTEGRATE_BACK:
        return names_equal(a->as.move->as.parameter.in, b->as.move->as.parameter.in)
            && syntax_equal(a->as.move->as.parameter.from, b->as.move->as.parameter.from);
    case MOVE_SPLIT: case MOVE_ROTATE:
        return syntax_equal(a->as.move->as.place, b->as.move->as.place);
    case MOVE_EXPAND:
        return syntax_equal(a->as.move->as.expand.factor, b->as.move->as.expand.factor)
            && syntax_equal(a->as.move->as.expand.around, b->as.move->as.expand.around)
            && syntax_equal(a->as.move->as.expand.terms, b->as.move->as.expand.terms);
    case MOVE_USE_RULE:
        return names_equal(a->as.move->as.rule, b->as.move->as.rule);
    case MOVE_REWRITE:
        return syntax_pass_equal(a->as.move->as.with, b->as.move->as.with);
    default: /* TERMWISE, SWAP */
        return true;
    }
}

static bool evaluates_equal(const statement *a, const statement *b)
{
    return syntax_equal(a->as.evaluate->subject, b->as.evaluate->subject)
        && binding_lists_equal(a->as.evaluate->at, b->as.evaluate->at)
        && words_equal(a->as.evaluate->points_file, b->as.evaluate->points_file)
        && syntax_equal(a->as.evaluate->digits, b->as.evaluate->digits)
        && syntax_equal(a->as.evaluate->terms, b->as.evaluate->terms)
        && a->as.evaluate->all_contributions == b->as.evaluate->all_contributions
        && words_equal(a->as.evaluate->to_file, b->as.evaluate->to_file);
}

bool statement_equal(const statement *a, const statement *b)
{
    if (a->kind != b->kind)
        return false;
    switch ((statement_kind)a->kind) {
    case STATEMENT_LARGE: case STATEMENT_SMALL:
        return names_equal(a->as.large.name, b->as.large.name) && a->as.large.integer == b->as.large.integer
            && syntax_equal(a->as.large.sector, b->as.large.sector);
    case STATEMENT_GIVEN: case STATEMENT_GRANT:
        return conditions_equal(a->as.given, b->as.given);
    case STATEMENT_LET:
        return lets_equal(a, b);
    case STATEMENT_USE:
        return names_equal(a->as.use.name, b->as.use.name) && words_equal(a->as.use.file, b->as.use.file);
    case STATEMENT_RULE:
        return rules_equal(a, b);
    case STATEMENT_PASS:
        return names_equal(a->as.pass.name, b->as.pass.name) && syntax_pass_equal(a->as.pass.value, b->as.pass.value);
    case STATEMENT_CHECK_RULE: case STATEMENT_WHY_NOT: case STATEMENT_SHOW: case STATEMENT_DROP: case STATEMENT_DONE:
        return names_equal(a->as.name, b->as.name);
    case STATEMENT_CHECK_FILE:
        return words_equal(a->as.file, b->as.file);
    case STATEMENT_CHECK_RECURRENCE:
        return syntax_equal(a->as.check_recurrence.left, b->as.check_recurrence.left)
            && syntax_equal(a->as.check_recurrence.right, b->as.check_recurrence.right)
            && syntax_equal(a->as.check_recurrence.of, b->as.check_recurrence.of);
    case STATEMENT_REWRITE:
        return syntax_equal(a->as.rewrite.value, b->as.rewrite.value)
            && syntax_pass_equal(a->as.rewrite.with, b->as.rewrite.with);
    case STATEMENT_DERIVE: case STATEMENT_STEPS: case STATEMENT_RECURRENCE: case STATEMENT_GROWTH:
    case STATEMENT_EXPANSION_OF: case STATEMENT_RULE_FROM:
        return syntax_equal(a->as.subject, b->as.subject);
    case STATEMENT_MOVE:
        return moves_equal(a, b);
    case STATEMENT_REPLAY:
        return syntax_equal(a->as.replay.derivation, b->as.replay.derivation)
            && syntax_equal(a->as.replay.on, b->as.replay.on);
    case STATEMENT_EXPAND:
        return syntax_equal(a->as.expand->subject, b->as.expand->subject)
            && syntax_equal(a->as.expand->terms, b->as.expand->terms) && names_equal(a->as.expand->by, b->as.expand->by)
            && names_equal(a->as.expand->as, b->as.expand->as);
    case STATEMENT_COEFFICIENTS:
        return syntax_equal(a->as.coefficients.of, b->as.coefficients.of)
            && syntax_equal(a->as.coefficients.from, b->as.coefficients.from)
            && syntax_equal(a->as.coefficients.to, b->as.coefficients.to);
    case STATEMENT_REMAINDER:
        return syntax_equal(a->as.remainder.of, b->as.remainder.of)
            && syntax_equal(a->as.remainder.terms, b->as.remainder.terms);
    case STATEMENT_EVALUATE:
        return evaluates_equal(a, b);
    case STATEMENT_COMPARE:
        return syntax_equal(a->as.compare.subject, b->as.compare.subject)
            && binding_lists_equal(a->as.compare.at, b->as.compare.at);
    case STATEMENT_PLAN:
        return syntax_equal(a->as.plan->subject, b->as.plan->subject)
            && syntax_equal(a->as.plan->error, b->as.plan->error)
            && names_equal(a->as.plan->over, b->as.plan->over) && syntax_equal(a->as.plan->from, b->as.plan->from)
            && syntax_equal(a->as.plan->to, b->as.plan->to);
    case STATEMENT_PLOT:
        return a->as.plot->terms == b->as.plot->terms && syntax_equal(a->as.plot->of, b->as.plot->of)
            && binding_lists_equal(a->as.plot->at, b->as.plot->at)
            && words_equal(a->as.plot->to_file, b->as.plot->to_file);
    case STATEMENT_WRITE:
        return syntax_equal(a->as.write.subject, b->as.write.subject)
            && names_equal(a->as.write.format, b->as.write.format)
            && words_equal(a->as.write.to_file, b->as.write.to_file);
    case STATEMENT_HELP:
        return words_equal(a->as.help, b->as.help);
    case STATEMENT_UNDO: case STATEMENT_QUIT:
        return true;
    case STATEMENT_KIND_COUNT:
        break;
    }
    return false;
}
