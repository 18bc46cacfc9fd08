/* The parser: which tree a text has, written out with all its brackets; when a line goes on; what is left of a text
 * with errors; depth, length and time. */
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

/* ---- trees written out ---- */

static void dump(text *out, const syntax *a);

static void dump_all(text *out, syntax *const *list, size_t count)
{
    for (size_t k = 0; k < count; k++) {
        text_add_char(out, ' ');
        dump(out, list[k]);
    }
}

static void dump_list(text *out, const syntax *a)
{
    text_add(out, a->kind == SYNTAX_SUM ? "(sum" : "(product");
    for (size_t k = 0; k < a->as.list.count; k++) {
        text_addf(out, " %c", a->as.list.signs[k]);
        dump(out, a->as.list.parts[k]);
    }
    text_add_char(out, ')');
}

static void dump(text *out, const syntax *a)
{
    static const char *const domains[] = {"integer", "real", "complex"};
    static const char *const relations[] = {"<", "<=", ">", ">=", "=", "!="};
    switch ((syntax_kind)a->kind) {
    case SYNTAX_NUMBER:
        text_add(out, a->as.number);
        return;
    case SYNTAX_NAME:
        text_add(out, a->as.name);
        return;
    case SYNTAX_CALL:
        text_addf(out, "(call %s", a->as.call.name.text);
        dump_all(out, a->as.call.arguments, a->as.call.count);
        break;
    case SYNTAX_INDEXED:
        text_addf(out, "(indexed %s", a->as.indexed.name);
        dump_all(out, &a->as.indexed.index, 1);
        break;
    case SYNTAX_SUM: case SYNTAX_PRODUCT:
        dump_list(out, a);
        return;
    case SYNTAX_NEGATE: case SYNTAX_FACTORIAL:
        text_add(out, a->kind == SYNTAX_NEGATE ? "(negate" : "(factorial");
        dump_all(out, &a->as.operand, 1);
        break;
    case SYNTAX_POWER:
        text_add(out, "(power");
        dump_all(out, &a->as.power.base, 1);
        dump_all(out, &a->as.power.exponent, 1);
        break;
    case SYNTAX_INTEGRAL: case SYNTAX_SUMMATION:
        text_addf(out, "(%s %s", a->kind == SYNTAX_INTEGRAL ? "integral" : "summation", a->as.binder->variable.text);
        dump_all(out, &a->as.binder->from, 1);
        dump_all(out, &a->as.binder->to, 1);
        dump_all(out, &a->as.binder->body, 1);
        break;
    case SYNTAX_CONTOUR:
        text_addf(out, "(contour %s", a->as.contour->variable.text);
        dump_all(out, a->as.contour->points, a->as.contour->count);
        dump_all(out, &a->as.contour->body, 1);
        break;
    case SYNTAX_DERIVATIVE:
        text_addf(out, "(derivative %s", a->as.derivative->in.text);
        dump_all(out, &a->as.derivative->of, 1);
        dump_all(out, &a->as.derivative->order, a->as.derivative->order != NULL);
        break;
    case SYNTAX_AT:
        text_add(out, "(at");
        dump_all(out, &a->as.substitution.body, 1);
        for (size_t k = 0; k < a->as.substitution.count; k++) {
            text_addf(out, " %s", a->as.substitution.bindings[k].name.text);
            dump_all(out, a->as.substitution.bindings[k].values, 1);
        }
        break;
    case SYNTAX_PIECEWISE:
        text_add(out, "(piecewise");
        for (size_t k = 0; k < a->as.piecewise->count; k++) {
            dump_all(out, &a->as.piecewise->values[k], 1);
            dump_all(out, &a->as.piecewise->conditions[k], 1);
        }
        dump_all(out, &a->as.piecewise->otherwise, 1);
        break;
    case SYNTAX_ROOT:
        text_addf(out, "(root %s", a->as.root->in.text);
        dump_all(out, &a->as.root->of, 1);
        dump_all(out, &a->as.root->near, 1);
        break;
    case SYNTAX_COMPARISON:
        text_add(out, "(compare");
        for (size_t k = 0; k <= a->as.comparison.count; k++) {
            dump_all(out, &a->as.comparison.operands[k], 1);
            text_addf(out, k < a->as.comparison.count ? " %s" : "%s",
                      k < a->as.comparison.count ? relations[a->as.comparison.relations[k]] : "");
        }
        break;
    case SYNTAX_RANGE:
        text_addf(out, "(range %c%c", a->as.range->with_from ? '[' : '(', a->as.range->with_to ? ']' : ')');
        dump_all(out, &a->as.range->value, 1);
        dump_all(out, &a->as.range->from, 1);
        dump_all(out, &a->as.range->to, 1);
        break;
    case SYNTAX_DOMAIN:
        text_addf(out, "(%s", domains[a->as.domain.domain]);
        dump_all(out, &a->as.domain.value, 1);
        break;
    }
    text_add_char(out, ')');
}

typedef struct parsed {
    source source;
    syntax_text text;
} parsed;

static void parse_bytes(parsed *p, const char *bytes, size_t length)
{
    source_init(&p->source, "in", bytes, length);
    syntax_text_init(&p->text);
    parse_text(&p->source, &p->text);
}

/* Parses what must be sound. */
static void parse_sound(parsed *p, const char *words)
{
    parse_bytes(p, words, strlen(words));
    if (p->text.error_count == 0)
        return;
    text shown;
    text_init(&shown);
    source_show_error(&p->source, &shown, p->text.errors[0].at, p->text.errors[0].words);
    fail_msg("%s", shown.bytes);
}

static void parsed_clear(parsed *p)
{
    syntax_text_clear(&p->text);
}

static void expressions_bind_as_the_page_says(void **state)
{
    static const char *const table[][2] = {
        {"a + b - c", "(sum +a +b -c)"},
        {"a - (b - c)", "(sum +a -(sum +b -c))"},
        {"a/b*c", "(product *a /b *c)"},
        {"a + b*c", "(sum +a +(product *b *c))"},
        {"-x^2", "(negate (power x 2))"},
        {"-a*b", "(product *(negate a) *b)"},
        {"a*-b", "(product *a *(negate b))"},
        {"a - -b", "(sum +a -(negate b))"},
        {"+a - +b", "(sum +a -b)"},
        {"x^y^z", "(power x (power y z))"},
        {"s^-1", "(power s (negate 1))"},
        {"s^-x^2*y", "(product *(power s (negate (power x 2))) *y)"},
        {"s^+1", "(power s 1)"},
        {"x^n!", "(power x (factorial n))"},
        {"n!^2", "(power (factorial n) 2)"},
        {"-n!", "(negate (factorial n))"},
        {"n!!", "(factorial (factorial n))"},
        {"2*n! - 1", "(sum +(product *2 *(factorial n)) -1)"},
        {"f (x, y + 1)", "(call f x (sum +y +1))"},
        {"inf(theta)", "(call inf theta)"},
        {"integral from 0 to inf of exp(-s*x) + 1 dx + y",
         "(sum +(integral x 0 inf (sum +(call exp (product *(negate s) *x)) +1)) +y)"},
        {"integral from a + 1 to b*c of x dx*2", "(product *(integral x (sum +a +1) (product *b *c) x) *2)"},
        {"2^integral from 0 to 1 of x dx", "(power 2 (integral x 0 1 x))"},
        {"(integral from 0 to 1 of x dx)^2", "(power (integral x 0 1 x) 2)"},
        {"integral from 0 to 1 of integral from 0 to x of x*y dy dx", "(integral x 0 1 (integral y 0 x (product *x *y)))"},
        {"integral from integral from 0 to 1 of t dt to 2 of x dx", "(integral x (integral t 0 1 t) 2 x)"},
        {"integral from 0 to 1 of 1 dx", "(integral x 0 1 1)"},
        {"integral from 0 to 1 of dx*x dx", "(integral x 0 1 (product *dx *x))"},
        {"integral from 0 to 1 of dx dx", "(integral x 0 1 dx)"},
        {"integral from 0 to 1 of x dθ", "(integral θ 0 1 x)"},
        {"integral from from to to of of dx", "(integral x from to of)"},
        {"integral from to to of of x dx", "(integral x to of x)"},
        {"dx + delta*d", "(sum +dx +(product *delta *d))"},
        {"integral along inf(-pi/4) to 0 to i of z dz",
         "(contour z (call inf (product *(negate pi) /4)) 0 i z)"},
        {"sum from k = 0 to n of x^k/k! + 1", "(sum +(summation k 0 n (product *(power x k) /(factorial k))) +1)"},
        {"sum from k = 0 to n of -x*k - 1", "(sum +(summation k 0 n (product *(negate x) *k)) -1)"},
        {"2*sum from k = 0 to n of k*x", "(product *2 *(summation k 0 n (product *k *x)))"},
        {"derivative of x*y in x*2", "(product *(derivative x (product *x *y)) *2)"},
        {"derivative of derivative of f in x order 2 in y", "(derivative y (derivative x f 2))"},
        {"derivative of (a + b) in x order n - 1", "(sum +(derivative x (sum +a +b) n) -1)"},
        {"(f at x = 3, y = z + 1)", "(at f x 3 y (sum +z +1))"},
        {"(at at at = at)", "(at at at at)"},
        {"piecewise(x^2 when x < 1, 2 - x otherwise)", "(piecewise (power x 2) (compare x < 1) (sum +2 -x))"},
        {"piecewise(1 when 0 < x < 1, 2 when n integer, 3 when t in [a, b), 4 otherwise)",
         "(piecewise 1 (compare 0 < x < 1) 2 (integer n) 3 (range [) t a b) 4)"},
        {"root of r^3 - r - 1 in r near 1.3247 + x", "(sum +(root r (sum +(power r 3) -r -1) 1.3247) +x)"},
        {"root of r - 1 in r near -13/10", "(root r (sum +r -1) (product *(negate 13) /10))"},
        {"π·Γ(x)^∞", "(product *pi *(power (call Gamma x) inf))"},
        {"(\n a\n +\n b)", "(sum +a +b)"},
        {"f(\n x,\n\n # a comment\n y\n)", "(call f x y)"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        text words, out;
        parsed p;
        text_init(&words);
        text_init(&out);
        text_addf(&words, "let A = %s", table[k][0]);
        parse_sound(&p, words.bytes);
        assert_int_equal(p.text.count, 1);
        dump(&out, p.text.statements[0]->as.let.value);
        assert_string_equal(out.bytes, table[k][1]);
        parsed_clear(&p);
        text_clear(&out);
        text_clear(&words);
    }
}

static void conditions_are_read(void **state)
{
    static const char *const table[][2] = {
        {"a > 0", "(compare a > 0)"},
        {"0 < p <= 1 != q", "(compare 0 < p <= 1 != q)"},
        {"theta in (-pi/4, pi/4]", "(range (] theta (product *(negate pi) /4) (product *pi /4))"},
        {"x in [0, 1)", "(range [) x 0 1)"},
        {"2*n integer", "(integer (product *2 *n))"},
        {"z complex", "(complex z)"},
        {"in in (0, 1)", "(range () in 0 1)"},
        {"integer integer", "(integer integer)"},
        {"n! = 6", "(compare (factorial n) = 6)"},
        {"n!=6", "(compare n != 6)"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        text words, out;
        parsed p;
        text_init(&words);
        text_init(&out);
        text_addf(&words, "given %s", table[k][0]);
        parse_sound(&p, words.bytes);
        assert_int_equal(p.text.statements[0]->as.given.count, 1);
        dump(&out, p.text.statements[0]->as.given.list[0]);
        assert_string_equal(out.bytes, table[k][1]);
        parsed_clear(&p);
        text_clear(&out);
        text_clear(&words);
    }
}

/* ---- statements ---- */

static void the_parts_of_statements_are_where_they_belong(void **state)
{
    (void)state;
    parsed p;
    parse_sound(&p, "large n integer, arg(n) in [0, 1)\n"
                    "let f(x, y) = x\n"
                    "let A = expand F to 8 terms by watson\n"
                    "rule r(n, f(x)):\n  a\n\n  becomes b\n  # a comment\n  when n > 0, c < 1 because \"it\"\n"
                    "evaluate A at s = 3, 10, nu = 1/3, t from 1 to 2 in 5 points on a log scale to 9 digits with 3 terms "
                    "with all contributions to \"out\"\n"
                    "evaluate A at points of \"in\"\n"
                    "check recurrence c[n+1] = 2*c[n] of A\n"
                    "check recurrence of A\n"
                    "parts integrating exp(-t) in integral 2\n"
                    "steps\n"
                    "done as D\n"
                    "done\n"
                    "help  two words # all \n"
                    "let R = rule from D\n"
                    "let E = expansion of D\n"
                    "let G = expansion\n");
    statement **s = p.text.statements;
    assert_int_equal(p.text.count, 16);
    assert_true(s[0]->as.large.integer && s[0]->as.large.sector->as.range->with_from);
    assert_string_equal(s[0]->as.large.name.text, "n");
    assert_true(s[1]->as.let.is_function && s[1]->as.let.count == 2 && s[1]->as.let.value != NULL);
    assert_string_equal(s[1]->as.let.parameters[1].text, "y");
    assert_int_equal(s[2]->as.let.request->kind, STATEMENT_EXPAND);
    assert_string_equal(s[2]->as.let.request->as.expand->by.text, "watson");
    assert_null(s[2]->as.let.request->as.expand->as.text);
    assert_int_equal(s[3]->as.rule->count, 2);
    assert_int_equal(s[3]->as.rule->parameters[1].count, 1);
    assert_int_equal(s[3]->as.rule->when.count, 2);
    assert_string_equal(s[3]->as.rule->because, "it");
    assert_int_equal(s[4]->as.evaluate->at.count, 3);
    assert_int_equal(s[4]->as.evaluate->at.list[0].count, 2);
    assert_int_equal(s[4]->as.evaluate->at.list[1].count, 1);
    assert_true(s[4]->as.evaluate->at.list[2].count == 0 && s[4]->as.evaluate->at.list[2].log_scale);
    assert_true(s[4]->as.evaluate->digits && s[4]->as.evaluate->terms && s[4]->as.evaluate->all_contributions);
    assert_string_equal(s[4]->as.evaluate->to_file, "out");
    assert_string_equal(s[5]->as.evaluate->points_file, "in");
    assert_int_equal(s[6]->as.check_recurrence.left->kind, SYNTAX_INDEXED);
    assert_null(s[7]->as.check_recurrence.left);
    assert_int_equal(s[8]->as.move->kind, MOVE_PARTS);
    assert_non_null(s[8]->as.move->integral);
    assert_null(s[9]->as.subject);
    assert_string_equal(s[10]->as.name.text, "D");
    assert_null(s[11]->as.name.text);
    assert_string_equal(s[12]->as.help, "two words # all");
    assert_int_equal(s[13]->as.let.request->kind, STATEMENT_RULE_FROM);
    assert_int_equal(s[14]->as.let.request->kind, STATEMENT_EXPANSION_OF);
    assert_int_equal(s[15]->as.let.value->kind, SYNTAX_NAME);
    parsed_clear(&p);
}

static void places_are_exact(void **state)
{
    static const char words[] = "  let A = 3*(é + f(x))  # end\n";
    (void)state;
    parsed p;
    parse_sound(&p, words);
    const statement *s = p.text.statements[0];
    const syntax *product = s->as.let.value, *sum = product->as.list.parts[1], *call = sum->as.list.parts[1];
    assert_int_equal(s->at.from, 2);
    assert_int_equal(s->at.to, strstr(words, "  #") - words);
    assert_int_equal(s->as.let.name.at.from, 6);
    assert_memory_equal(words + product->at.from, "3*(é", 4);
    assert_int_equal(product->at.to, s->at.to);
    assert_memory_equal(words + call->at.from, "f(x)", call->at.to - call->at.from);
    assert_int_equal(call->at.to - call->at.from, 4);
    parsed_clear(&p);
}

/* ---- lines that go on ---- */

static void a_prompt_knows_when_to_ask_for_more(void **state)
{
    static const struct {
        const char *words;
        bool more;
    } table[] = {
        {"", false},
        {"\n", false},
        {"# only this\n", false},
        {"large s\n", false},
        {"large\n", true},
        {"let\n", true},
        {"let A\n", false},
        {"let A =\n", true},
        {"let A =\n\n", true},
        {"let A =\n3\n", false},
        {"let A = (1 +\n", true},
        {"let A = (1\n", true},
        {"let A = (1\n)\n", false},
        {"let A = (1 ]\n", false},
        {"let A = n!\n", false},
        {"let A = n *\n", true},
        {"let A = n ^ # a comment\n", true},
        {"let A = integral from\n", true},
        {"let A = integral from 0 to\n", true},
        {"let A = integral from 0 to inf of\n", true},
        {"let A = integral from 0 to inf of x\n", false},
        {"let A = integral from 0 to inf of x +\n", true},
        {"let A = integral from 0 to inf of x dx\n", false},
        {"let A = \"abc\n", false},
        {"given a > 0,\n", true},
        {"given a >\n", true},
        {"given theta in\n", true},
        {"expand F\n", false},
        {"expand F to\n", true},
        {"expand F to 8 terms\n", false},
        {"expand F to 8 terms by\n", true},
        {"evaluate A at s = 3,\n", true},
        {"write A as json to\n", true},
        {"steps\n", false},
        {"help\n", false},
        {"help expand\n", false},
        {"why\n", true},
        {"why not\n", true},
        {"check\n", true},
        {"rule r(x):\n", true},
        {"rule r(x):\n\n", true},
        {"rule r(x):\n  x^2\n", true},
        {"rule r(x):\n  x^2\n\n", false}, /* an error: it never became anything */
        {"rule r(x):\n  x^2\n  becomes x\n", true},
        {"rule r(x):\n  x^2\n  becomes x\n  \t\n", false},
        {"rule r(x):\n  x^2\n  becomes x\n  when x > 0\n", true},
        {"rule r(x):\n  x^2\n  becomes x\n  when\n", true},
        {"rule r(x):\n  x^2\n  becomes x\n  when\n\n", true},
        {"rule r(x): x^2 becomes x when x > 0 because \"it\"\n", false},
        {"pass p = a then\n", true},
        {"pass p = repeat\n", true},
        {"pass p = a\n", false},
        {"derive F\n", false},
        {"let = 3\nlet A = (\n", false}, /* the first error is shown at once */
        {"nonsense (\n", false},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++)
        if (parse_wants_more(table[k].words, strlen(table[k].words)) != table[k].more)
            fail_msg("%s: %s", table[k].words, table[k].more ? "goes on" : "is complete");
}

static void lines_go_on_where_they_may(void **state)
{
    static const struct {
        const char *words;
        size_t count;
    } table[] = {
        {"large s\nlet A =\n  x +\n  y\nquit\n", 3},
        {"let A = (x\n + y)\nquit", 2},
        {"given a > 0,\n  b > 0\nquit", 2},
        {"let F = integral\n from\n 0\n to\n", 0},
        {"let F = integral from\n0 to\ninf of\nx dx\nquit", 2},
        {"rule r(x): x becomes y\nrule q(x):\nx\nbecomes\ny\n\n\nwhen x > 0\nquit", 3},
        {"\n\n\n", 0},
        {"quit", 1},
        {"expand F\n to 8 terms", 0},
        {"\r\nlarge s\r\nlet A =\r\n3\r\n", 2},
        {"\xEF\xBB\xBFlarge s\n", 1},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        parsed p;
        parse_bytes(&p, table[k].words, strlen(table[k].words));
        assert_int_equal(p.text.count, table[k].count);
        parsed_clear(&p);
    }
}

/* ---- after errors ---- */

static void an_error_costs_its_statement_only(void **state)
{
    static const struct {
        const char *words;
        size_t statements, errors;
    } table[] = {
        {"let A = (1\nlet B = 2\nquit", 2, 1},
        {"let A = (1 +\nlet B = 2\nquit", 2, 1},
        {"let A = ((((\nlet B = 2\nquit", 2, 1},
        {"let A = 1 +* 2\nquit", 1, 1},
        {"let A = f(1,,\n 2,\n 3)\nquit", 1, 1},
        {"let A = 1 1 +\n 2\nquit", 1, 1},
        {"rule r(x): x^\n becomes )\n when x > 0\n because \"it\"\nquit", 1, 1},
        {"rule r(x) x\n becomes y\nquit", 1, 1},
        {"lett A = 1\nlett B = 2\nquit", 1, 2},
        {"\"abc\n\"def\nquit", 1, 2},
        {"let A = \xFF\nlet B = \x01\nlet C = 3", 1, 2},
        {"let A = 3 $\nquit", 1, 1},
        {"derive F\n  substitute x 3\n  parts exp(-t)\n  split at 1\ndone", 3, 2},
        {"expand F\n  to 8 terms\nquit", 1, 1},
        {"let A = )\nlet B = (\nquit", 1, 2},
        {"large s, (\nlarge t", 1, 1},
    };
    (void)state;
    for (size_t k = 0; k < sizeof table / sizeof *table; k++) {
        parsed p;
        parse_bytes(&p, table[k].words, strlen(table[k].words));
        if (p.text.count != table[k].statements || p.text.error_count != table[k].errors)
            fail_msg("%s: %zu statements, %zu errors", table[k].words, p.text.count, p.text.error_count);
        for (size_t j = 1; j < p.text.error_count; j++)
            assert_true(p.text.errors[j - 1].at.from < p.text.errors[j].at.from);
        parsed_clear(&p);
    }
}

static void an_expression_alone_can_be_read(void **state)
{
    (void)state;
    source s;
    syntax_text t;
    source_init(&s, "in", "\n 1 +\n x \n", 10);
    syntax_text_init(&t);
    assert_int_equal(parse_expression_text(&s, &t)->kind, SYNTAX_SUM);
    syntax_text_clear(&t);
    source_init(&s, "in", "1 + x y", 7);
    syntax_text_init(&t);
    assert_null(parse_expression_text(&s, &t));
    assert_int_equal(t.error_count, 1);
    syntax_text_clear(&t);
}

/* ---- depth, length, time ---- */

static void repeat_words(text *out, const char *words, size_t times)
{
    for (size_t k = 0; k < times; k++)
        text_add(out, words);
}

static void depth_is_bounded(void **state)
{
    static const char *const units[][2] = {
        {"(", ")"}, {"-", ""}, {"- -", ""}, {"f(", ")"}, {"x^", ""}, {"x^-", ""}, {"", "!"}, {"(1 + ", ")"}, {"(a*", ")^2"},
        {"integral from 0 to ", " of x dx"}, {"integral from 0 to 1 of ", " dx"}, {"sum from k = 0 to 2 of ", ""},
        {"derivative of ", " in x"}, {"root of ", " in r near 1"}, {"piecewise(", " when x < 1, 2 otherwise)"},
        {"piecewise(1 when ", " < 1, 2 otherwise)"}, {"(", " at x = 1)"}, {"(x at x = ", ")"}, {"integral along 0 to ", " of z dz"},
        {"derivative of x in x order ", ""}, {"root of r in r near ", ""},
    };
    (void)state;
    for (size_t k = 0; k < sizeof units / sizeof *units; k++)
        for (int deep = 0; deep < 2; deep++) {
            size_t times = deep ? 100000 : 300;
            text words;
            parsed p;
            text_init(&words);
            text_add(&words, "let A = ");
            repeat_words(&words, units[k][0], times);
            text_add(&words, "1");
            repeat_words(&words, units[k][1], times);
            text_add(&words, "\nquit\n");
            parse_bytes(&p, words.bytes, words.length);
            if (!deep && p.text.error_count > 0)
                fail_msg("%s: %s", units[k][0], p.text.errors[0].words);
            assert_int_equal(p.text.count, deep ? 1 : 2);
            assert_int_equal(p.text.error_count, deep);
            if (deep)
                assert_string_equal(p.text.errors[0].words,
                                    "brackets, signs and exponents nest deeper here than the limit of 1000 levels");
            parsed_clear(&p);
            text_clear(&words);
        }
}

static void passes_are_bounded_too(void **state)
{
    (void)state;
    for (int k = 0; k < 2; k++) {
        text words;
        parsed p;
        text_init(&words);
        text_add(&words, "pass p = ");
        repeat_words(&words, k ? "(" : "repeat ", 100000);
        parse_bytes(&p, words.bytes, words.length);
        assert_int_equal(p.text.error_count, 1);
        assert_non_null(strstr(p.text.errors[0].words, "limit of 1000 levels"));
        parsed_clear(&p);
        text_clear(&words);
    }
}

static double seconds_to_parse(const char *unit, const char *prefix, size_t bytes)
{
    text words;
    parsed p;
    text_init(&words);
    text_add(&words, prefix);
    repeat_words(&words, unit, bytes / strlen(unit));
    struct timespec from, to;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &from);
    parse_bytes(&p, words.bytes, words.length);
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &to);
    assert_true(p.text.arena.bytes < 64 * words.length + (1u << 20));
    parsed_clear(&p);
    text_clear(&words);
    return (double)(to.tv_sec - from.tv_sec) + 1e-9 * (double)(to.tv_nsec - from.tv_nsec);
}

/* Time grows with the length: eight times the text takes no more than some twenty times as long, also where all is
 * wrong. */
static void time_and_memory_are_proportional(void **state)
{
    static const char *const units[][2] = {
        {"let F = integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx\n", ""},
        {" + 2*x", "let A = 1"},
        {" + name", "let A = 1"},
        {"*x!", "let A = 1"},
        {", 1", "let A = f(1"},
        {"let A = (1 + ]\n", ""},
        {"let A = ((((\n", ""},
        {"\n", "let A = ("},
        {"#\n", "rule r(x): x\n"},
        {"rule r(x): x\n\n", ""},
        {"evaluate A at s = 1, t = 2\n", ""},
        {", s = 1", "evaluate A at s = 1"},
        {"\n", "evaluate A at s = 1,"},
        {"\"", ""},
        {"\xFF", ""},
        {"a", "let "},
        {"(to ", ""},
    };
    (void)state;
    for (size_t k = 0; k < sizeof units / sizeof *units; k++) {
        double little = seconds_to_parse(units[k][0], units[k][1], 1u << 17);
        double much = seconds_to_parse(units[k][0], units[k][1], 1u << 20);
        if (much > 20 * little + 0.5)
            fail_msg("%s: %g s and %g s", units[k][0], little, much);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(expressions_bind_as_the_page_says),
        cmocka_unit_test(conditions_are_read),
        cmocka_unit_test(the_parts_of_statements_are_where_they_belong),
        cmocka_unit_test(places_are_exact),
        cmocka_unit_test(a_prompt_knows_when_to_ask_for_more),
        cmocka_unit_test(lines_go_on_where_they_may),
        cmocka_unit_test(an_error_costs_its_statement_only),
        cmocka_unit_test(an_expression_alone_can_be_read),
        cmocka_unit_test(depth_is_bounded),
        cmocka_unit_test(passes_are_bounded_too),
        cmocka_unit_test(time_and_memory_are_proportional),
    };
    return cmocka_run_group_tests_name("parse", tests, NULL, NULL);
}
