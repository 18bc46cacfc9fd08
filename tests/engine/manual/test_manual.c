/* Derivations by hand: each move on integrals whose values are known, what must be refused, undo, replay, and random
 * derivations whose value never changes. TW_SEED gives the seed of the random ones, TW_TRIALS the number of their moves. */
#include "tests/engine/method/texts.h"

#include <stdio.h>
#include <time.h>

#include "engine/ball/quadrature.h"
#include "engine/manual/manual.h"
#include "engine/numeric/evaluate.h"
#include "tests/engine/numeric/random_integral.h"

/* ---- helpers ---- */

static manual *begin(tw_engine *e, const char *words)
{
    manual *m = manual_new(e, text_parse(e, words));
    if (!m) fail_msg("`%s`: %s", words, e->error.words);
    return m;
}

static manual_move move_of(tw_engine *e, manual_move_kind kind, const char *symbol, const char *value)
{
    manual_move m;
    memset(&m, 0, sizeof m);
    m.kind = kind;
    m.symbol = symbol ? expr_symbol(e, symbol) : NULL;
    m.value = value ? text_parse(e, value) : NULL;
    m.words = "a move";
    return m;
}

static tw_status substitute(manual *m, const char *from, const char *value, const char *fresh, const char *inverse)
{
    manual_move move = move_of(m->e, MANUAL_SUBSTITUTE, from, value);
    move.fresh = expr_symbol(m->e, fresh);
    move.extra = inverse ? text_parse(m->e, inverse) : NULL;
    return manual_apply(m, &move);
}

static tw_status simple(manual *m, manual_move_kind kind, const char *symbol, const char *value)
{
    manual_move move = move_of(m->e, kind, symbol, value);
    return manual_apply(m, &move);
}

static tw_status expand_factor(manual *m, const char *factor, const char *point, slong terms)
{
    manual_move move = move_of(m->e, MANUAL_EXPAND, NULL, factor);
    move.extra = text_parse(m->e, point);
    move.count = terms;
    return manual_apply(m, &move);
}

static void made(manual *m, tw_status status)
{
    if (status != TW_OK) fail_msg("a move fails: %s", m->e->error.words);
}

/* The move fails, for this kind of reason and with these words, and nothing has changed. */
static void refused(manual *m, size_t before, tw_status status, error_kind kind, const char *part)
{
    if (status == TW_OK) fail_msg("a wrong move was kept");
    if (m->e->error.kind != kind || !strstr(m->e->error.words, part))
        fail_msg("kind %s: %s", error_kind_word(m->e->error.kind), m->e->error.words);
    engine_forgive(m->e);
    assert_int_equal(m->count, before);
}

static void form_is(manual *m, const char *words)
{
    text form;
    text_init(&form);
    manual_print_form(m, &form);
    assert_string_equal(form.bytes, words);
    text_clear(&form);
}

/* Balls of two expressions at the same point; true when they overlap or one is not to be had. */
static bool same_at(tw_engine *e, expr *a, expr *b, const env *at, bool *seen)
{
    acb_t x, y;
    acb_init(x);
    acb_init(y);
    budget_start(e, 1);
    *seen = quadrature(e, x, a, at, 6, true, NULL) == TW_OK && quadrature(e, y, b, at, 6, true, NULL) == TW_OK;
    engine_forgive(e);
    budget_start(e, 0);
    bool same = !*seen || acb_overlaps(x, y);
    if (!same) {
        acb_printn(x, 20, 0);
        printf(" beside ");
        acb_printn(y, 20, 0);
        printf("\n");
    }
    acb_clear(x);
    acb_clear(y);
    return same;
}

/* ---- single moves ---- */

static void test_substitute(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx");
    made(m, substitute(m, "x", "t/s", "t", NULL));
    form_is(m, "s^-1*integral from 0 to inf of exp(-t)/sqrt(1 + s^-2*t^2) dt");
    assert_true(manual_is_proved(m));
    made(m, substitute(m, "t", "s*sinh(u)", "u", NULL));
    form_is(m, "integral from 0 to inf of exp(-s*sinh(u)) du");
    assert_true(manual_undo(m));
    assert_true(manual_undo(m));
    assert_false(manual_undo(m));
    form_is(m, "integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx");
    /* falling: the ends are exchanged */
    made(m, substitute(m, "x", "1/y", "y", NULL));
    form_is(m, "integral from 0 to inf of exp(-s*y^-1)/(y^2*sqrt(1 + y^-2)) dy");
    assert_true(manual_is_proved(m));
    refused(m, 2, substitute(m, "y", "t^2 - t", "t", "t^2"), ERROR_UNSUITABLE, "");
    refused(m, 2, substitute(m, "z", "2*t", "t", NULL), ERROR_UNSUITABLE, "the variable of this integral is y");
    manual_release(m);
    tw_engine_free(e);
}

/* An inverse that is not one is noticed by the ends, or by the balls. */
static void test_wrong_inverse(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    text_given(e, "a > 0");
    manual *m = begin(e, "integral from 0 to 1 of exp(a*x) dx");
    refused(m, 1, substitute(m, "x", "t^2", "t", "2*sqrt(x)"), ERROR_REFUTED, "at a = ");
    made(m, substitute(m, "x", "t^2", "t", "sqrt(x)"));
    manual_release(m);
    m = begin(e, "integral from -1 to 2 of exp(a*x) dx");
    refused(m, 1, substitute(m, "x", "t^2", "t", "sqrt(x)"), ERROR_UNSUITABLE, "");
    manual_release(m);
    tw_engine_free(e);
}

static void test_parts(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx");
    refused(m, 1, simple(m, MANUAL_REPEAT_PARTS, NULL, NULL), ERROR_UNSUITABLE, "no parts to repeat");
    made(m, simple(m, MANUAL_PARTS, NULL, "exp(-s*x)"));
    form_is(m, "s^-1 - s^-1*integral from 0 to inf of exp(-s*x)/(1 + x)^2 dx");
    manual_move again = move_of(e, MANUAL_REPEAT_PARTS, NULL, NULL);
    again.count = 3;
    made(m, manual_apply(m, &again));
    form_is(m, "s^-1 - s^-2 + 2*s^-3 - 6*s^-4 + 24*s^-4*integral from 0 to inf of exp(-s*x)/(1 + x)^5 dx");
    assert_true(manual_is_proved(m));
    assert_true(manual_undo(m)); /* one line, one undo */
    form_is(m, "s^-1 - s^-1*integral from 0 to inf of exp(-s*x)/(1 + x)^2 dx");
    refused(m, 2, simple(m, MANUAL_PARTS, NULL, "zeta(2 + x)"), ERROR_UNSUITABLE, "no antiderivative");
    manual_release(m);
    m = begin(e, "integral from 1 to 3 of exp(-s*x^2)/x dx"); /* both ends give terms */
    made(m, simple(m, MANUAL_PARTS, NULL, "x*exp(-s*x^2)"));
    form_is(m, "exp(-s)/(2*s) - exp(-9*s)/(18*s) - s^-1*integral from 1 to 3 of exp(-s*x^2)/x^3 dx");
    manual_release(m);
    m = begin(e, "integral from 0 to inf of exp(-s*x)/sqrt(x) dx");
    refused(m, 1, simple(m, MANUAL_PARTS, NULL, "exp(-s*x)"), ERROR_UNSUITABLE, "boundary term");
    manual_release(m);
    tw_engine_free(e);
}

static void test_parameter(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    text_given(e, "a > 0");
    text_given(e, "b > 0");
    manual *m = begin(e, "integral from 0 to inf of exp(-a*x)*sin(b*x)/x dx");
    refused(m, 1, simple(m, MANUAL_INTEGRATE_BACK, "b", "0"), ERROR_UNSUITABLE, "nothing has been differentiated");
    made(m, simple(m, MANUAL_DIFFERENTIATE, "b", NULL));
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    form_is(m, "a/(a^2 + b^2)");
    refused(m, 3, simple(m, MANUAL_INTEGRATE_BACK, "a", "0"), ERROR_UNSUITABLE, "was in b");
    made(m, simple(m, MANUAL_INTEGRATE_BACK, "b", "0"));
    form_is(m, "atan(a^-1*b)"); /* DLMF 1.14.31 ff.: the Laplace transform of sin(b x)/x */
    assert_true(manual_is_proved(m));
    manual_release(m);
    /* from infinity: int exp(-a x) (1 - cos x)/x dx = log(1 + a^-2)/2, Laplace transforms as in DLMF 1.14 */
    m = begin(e, "integral from 0 to inf of exp(-a*x)*(1 - cos(x))/x dx");
    made(m, simple(m, MANUAL_DIFFERENTIATE, "a", NULL));
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    form_is(m, "a/(1 + a^2) - a^-1");
    manual_release(m);
    tw_engine_free(e);
}

static void test_split_and_pick(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx");
    refused(m, 1, simple(m, MANUAL_SPLIT, NULL, "-1"), ERROR_UNSUITABLE, "not inside");
    made(m, simple(m, MANUAL_SPLIT, NULL, "1"));
    manual_move move = move_of(e, MANUAL_SUBSTITUTE, "x", "1 + y");
    move.fresh = expr_symbol(e, "y");
    move.which = 3;
    refused(m, 2, manual_apply(m, &move), ERROR_VALUE, "no integral 3");
    move.which = 2;
    made(m, manual_apply(m, &move));
    form_is(m, "integral from 0 to 1 of exp(-s*x)/(1 + x) dx + exp(-s)*integral from 0 to inf of exp(-s*y)/(2 + y) dy");
    made(m, simple(m, MANUAL_PARTS, NULL, "exp(-s*x)")); /* fits the first only */
    assert_true(manual_is_proved(m));
    manual_release(m);
    tw_engine_free(e);
}

static void test_rotate(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(i*s*x)/(1 + x) dx");
    made(m, simple(m, MANUAL_ROTATE, NULL, "pi/2"));
    form_is(m, "i*integral from 0 to inf of exp(-s*x)/(1 + i*x) dx");
    assert_true(manual_is_proved(m)); /* Jordan's lemma */
    manual_release(m);
    m = begin(e, "integral from 0 to inf of exp(i*s*x^2) dx");
    made(m, simple(m, MANUAL_ROTATE, NULL, "pi/4"));
    assert_true(manual_is_proved(m));
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    assert_same_value(e, manual_now(m)->plain, "exp(i*pi/4)*sqrt(pi/s)/2"); /* DLMF 7.7.1, Fresnel */
    manual_release(m);
    m = begin(e, "integral from 0 to inf of exp(i*s*x)/(1 + x) dx"); /* grows on the other side */
    tw_status status = simple(m, MANUAL_ROTATE, NULL, "-pi/2");
    assert_true(status != TW_OK || !manual_is_proved(m));
    engine_forgive(e);
    manual_release(m);
    /* the pole at x = i lies in the sector: the values differ */
    m = begin(e, "integral from 0 to inf of exp(-s*x)/(1 + x^2) dx");
    status = simple(m, MANUAL_ROTATE, NULL, "2*pi/3");
    assert_true(status != TW_OK);
    engine_forgive(e);
    made(m, simple(m, MANUAL_ROTATE, NULL, "pi/4"));
    assert_true(manual_is_proved(m));
    manual_release(m);
    m = begin(e, "integral from 0 to inf of exp(-s*x)/(9 + x^2 - 2*x) dx"); /* not seen: tried at samples */
    made(m, simple(m, MANUAL_ROTATE, NULL, "pi/6"));
    assert_false(manual_is_proved(m));
    manual_release(m);
    tw_engine_free(e);
}

static void test_expand(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/sqrt(x*(1 + x)) dx");
    made(m, expand_factor(m, "1/sqrt(1 + x)", "0", 3));
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    form_is(m, "sqrt(pi)*s^(-1/2) - 1/4*sqrt(pi)*s^(-3/2) + 9/32*sqrt(pi)*s^(-5/2)");
    assert_int_equal(manual_now(m)->split_off.count, 1);
    assert_true(manual_is_proved(m));
    expansion a;
    if (manual_expansion(m, &a) != TW_OK) fail_msg("%s", e->error.words);
    number n;
    number_init(&n);
    expr *s = expr_symbol(e, "s"), *twelve = expr_int(e, 12);
    env at = {1, &s, &twelve};
    evaluate_options o = {0, -1, false};
    assert_int_equal(evaluate_expansion(e, &n, &a, &at, &o), TW_OK);
    assert_int_equal(n.label, LABEL_PROVED);
    acb_t judge;
    acb_init(judge);
    assert_int_equal(quadrature(e, judge, m->typed, &at, 20, false, NULL), TW_OK);
    assert_true(acb_overlaps(judge, n.value));
    acb_clear(judge);
    number_clear(&n);
    expansion_clear(&a);
    manual_release(m);
    /* the terms' integral diverges */
    m = begin(e, "integral from 0 to inf of 1/((1 + x)^3*(s + x)) dx");
    refused(m, 1, expand_factor(m, "1/(s + x)", "0", 4), ERROR_DIVERGENT, "");
    manual_release(m);
    tw_engine_free(e);
}

/* No method expands this kernel, so the remainder that was split off has to serve: at a point and for all values. */
static void test_own_remainder(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of erfc(sqrt(s*x))/(1 + x) dx");
    made(m, simple(m, MANUAL_PARTS, NULL, "1/(1 + x)"));
    made(m, expand_factor(m, "log(1 + x)", "0", 3));
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    assert_true(manual_is_proved(m));
    expansion a;
    if (manual_expansion(m, &a) != TW_OK) fail_msg("%s", e->error.words);
    assert_non_null(a.remainder);
    expr *s = expr_symbol(e, "s"), *forty = expr_int(e, 40);
    env at = {1, &s, &forty}, none = {0, NULL, NULL};
    acb_t judge;
    acb_init(judge);
    assert_int_equal(quadrature(e, judge, m->typed, &at, 20, false, NULL), TW_OK);
    for (slong terms = 0; terms <= 3; terms++) {
        number n;
        number_init(&n);
        evaluate_options o = {0, terms, false};
        if (evaluate_expansion(e, &n, &a, &at, &o) != TW_OK) fail_msg("%s", e->error.words);
        assert_int_equal(n.label, LABEL_PROVED);
        assert_true(acb_overlaps(judge, n.value));
        number_clear(&n);
        remainder_bound b;
        remainder_bound_init(&b);
        if (remainder_for_all(e, &b, &a, &none, terms, NULL) != TW_OK) fail_msg("%s", e->error.words);
        if (b.bound) { /* |integral - sum| <= bound at s = 40, if it holds from there */
            expr *sum = text_sum(e, &a, 0, terms), *gap = expr_sub(e, m->typed, sum);
            expr *ratio = expr_div(e, expr_call1(e, FUNCTION_ABS, gap), b.bound);
            acb_t r;
            acb_init(r);
            assert_int_equal(quadrature(e, r, ratio, &at, 8, true, NULL), TW_OK);
            arf_t up;
            arf_init(up);
            arb_get_ubound_arf(up, acb_realref(r), 53);
            assert_true(arf_get_d(up, ARF_RND_UP) <= 1.0000001);
            arf_clear(up);
            acb_clear(r);
        }
        remainder_bound_clear(&b);
    }
    acb_clear(judge);
    expansion_clear(&a);
    manual_release(m);
    tw_engine_free(e);
}

static void test_swap(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    text_given(e, "a > 0");
    manual *m = begin(e, "integral from 0 to inf of integral from 1 to 2 of exp(-a*x*y) dy dx");
    made(m, simple(m, MANUAL_SWAP, NULL, NULL));
    assert_true(manual_is_proved(m));
    form_is(m, "integral from 1 to 2 of integral from 0 to inf of exp(-a*y*x) dx dy");
    made(m, simple(m, MANUAL_TERMWISE, NULL, NULL));
    form_is(m, "a^-1*log(2)");
    manual_release(m);
    /* the two orders of this one differ: pi/4 and -pi/4 (Cauchy's example) */
    m = begin(e, "integral from 0 to 1 of integral from 0 to 1 of (x^2 - y^2)/(x^2 + y^2)^2 dy dx");
    if (simple(m, MANUAL_SWAP, NULL, NULL) == TW_OK) assert_false(manual_is_proved(m));
    engine_forgive(e);
    manual_release(m);
    tw_engine_free(e);
}

/* A rule that is wrong is refuted with the values, even if nobody checked it before. */
static void test_wrong_rule(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx");
    pattern_variable a = {.symbol = expr_symbol(e, "a"), .arity = 0};
    rule *wrong = rule_new(e, "wrong", &a, 1, text_parse(e, "1/(1 + a)"), text_parse(e, "1/(1 + 2*a)"), NULL, 0, NULL);
    if (!wrong) fail_msg("%s", e->error.words);
    pass *one = pass_of_rule(wrong), *parts[] = {one};
    pass *p = pass_join(STRATEGY_ONCE, parts, 1);
    manual_move move = move_of(e, MANUAL_REWRITE, NULL, NULL);
    move.pass = p;
    refused(m, 1, manual_apply(m, &move), ERROR_REFUTED, "at s = ");
    form_is(m, "integral from 0 to inf of exp(-s*x)/(1 + x) dx");
    pass_release(p);
    rule_release(wrong);
    manual_release(m);
    tw_engine_free(e);
}

/* What rests on a granted condition is not proved. */
static void test_granted(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    text_given(e, "a > 0");
    expr *a = expr_symbol(e, "a");
    assert_int_equal(facts_add(e, expr_relation_of(e, RELATION_LESS, expr_int(e, 2), a), CONDITION_GRANTED), TW_OK);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/(a - 2 + x) dx");
    made(m, simple(m, MANUAL_PARTS, NULL, "exp(-s*x)"));
    assert_false(manual_is_proved(m));
    rule *r = manual_rule(m, "r");
    assert_non_null(r);
    assert_false(r->status == RULE_PROVED);
    rule_release(r);
    manual_release(m);
    tw_engine_free(e);
}

static void test_begin(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    assert_null(manual_new(e, text_parse(e, "s^2 + 1")));
    assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
    engine_forgive(e);
    assert_null(manual_new(e, text_parse(e, "integral from 0 to inf of 1/(s + x) dx")));
    assert_int_equal(e->error.kind, ERROR_DIVERGENT);
    engine_forgive(e);
    tw_engine_free(e);
}

static void test_replay(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    manual *m = begin(e, "integral from 0 to inf of exp(-s*x)/(1 + x) dx");
    made(m, substitute(m, "x", "t/s", "t", NULL));
    made(m, simple(m, MANUAL_PARTS, NULL, "exp(-t)"));
    manual *n = manual_replay(e, m, text_parse(e, "integral from 0 to inf of exp(-s*y)/(2 + y)^3 dy"));
    if (!n) fail_msg("%s", e->error.words);
    form_is(n, "1/8*s^-1 - 3*s^-2*integral from 0 to inf of exp(-t)/(2 + s^-1*t)^4 dt");
    assert_true(manual_is_proved(n));
    manual_release(n);
    assert_null(manual_replay(e, m, text_parse(e, "integral from 0 to inf of exp(-s*y)/sqrt(y) dy")));
    assert_non_null(strstr(e->error.words, "move 2"));
    engine_forgive(e);
    manual_release(m);
    tw_engine_free(e);
}

/* ---- random derivations ---- */

static const char *const INTEGRALS[] = {
    "integral from 0 to inf of exp(-s*x)/(a + x) dx",
    "integral from 0 to inf of x^2*exp(-s*x)/sqrt(1 + x^2) dx",
    "integral from 0 to inf of exp(-s*x^2)*cos(a*x) dx",
    "integral from 1 to inf of exp(-s*x)/x^2 dx",
    "integral from 0 to 1 of exp(-s*x)*log(1 + a*x) dx",
    "integral from 0 to inf of x^(1/2)*exp(-s*x)/(1 + a*x) dx",
    "integral from 0 to inf of exp(-s*cosh(x)) dx",
    "integral from 0 to 2 of (x + a)^3*exp(-s*x) dx",
    "integral from 0 to inf of exp(-s*x - a*x^2) dx",
    "integral from 0 to inf of exp(-s*x)*sin(a*x)/x dx",
};
static const char *const CHANGES[] = {"t/s", "t^2", "2*t", "sqrt(t)", "1 + t", "sinh(t)", "exp(t) - 1", "t/(1 - t)", "1/t",
                                      "t - 1", "a*t", "t^3/2", "log(1 + t)", "-t"};
static const char *const FACTORS[] = {"exp(-s*VAR)", "exp(-VAR)", "VAR", "VAR^2", "1/(1 + VAR)", "exp(-2*s*VAR)", "cos(a*VAR)",
                                      "1/sqrt(1 + VAR^2)", "1/(a + VAR)", "exp(-s*VAR^2)*VAR"};
static const char *const POINTS[] = {"1", "1/2", "a", "3", "1/s", "2/3"};
static const char *const ANGLES[] = {"pi/6", "-pi/4", "pi/12"};

/* VAR by the name of the variable. */
static expr *parse_with(tw_engine *e, const char *words, const char *name)
{
    text out;
    text_init(&out);
    for (const char *p = words; *p;) {
        if (strncmp(p, "VAR", 3) == 0) {
            text_add(&out, name);
            p += 3;
        } else text_add_char(&out, *p++);
    }
    expr *made_of = text_parse(e, out.bytes);
    text_clear(&out);
    return made_of;
}

#define PICK(list) list[dice_roll(d, sizeof list / sizeof *list)]

static manual_move random_move(dice *d, const manual *m)
{
    tw_engine *e = m->e;
    const manual_frame *now = manual_now(m);
    const char *name = now->live.count ? now->live.list[0].name : "x";
    manual_move move = move_of(e, MANUAL_TERMWISE, NULL, NULL);
    size_t total = now->live.count + now->split_off.count;
    if (total > 1 && dice_roll(d, 2)) move.which = 1 + dice_roll(d, (uint32_t)total);
    if (move.which)
        name = (size_t)move.which <= now->live.count ? now->live.list[move.which - 1].name
                                                     : now->split_off.list[(size_t)move.which - 1 - now->live.count].name;
    switch (dice_roll(d, 8)) {
    case 0:
    case 1: {
        const char *fresh = strcmp(name, "t") == 0 ? "u" : "t";
        move.kind = MANUAL_SUBSTITUTE;
        move.symbol = expr_symbol(e, name);
        move.value = expr_substitute(e, text_parse(e, PICK(CHANGES)), expr_symbol(e, "t"), expr_symbol(e, fresh));
        move.fresh = expr_symbol(e, fresh);
        break;
    }
    case 2:
        move.kind = MANUAL_PARTS; /* mostly a factor that is there */
        move.value = parse_with(e, dice_roll(d, 4) ? "exp(-s*VAR)" : PICK(FACTORS), name);
        break;
    case 3:
        move.kind = MANUAL_REPEAT_PARTS;
        move.count = 1 + dice_roll(d, 2);
        break;
    case 4:
        move.kind = MANUAL_SPLIT;
        move.value = text_parse(e, PICK(POINTS));
        break;
    case 5:
        move.kind = MANUAL_EXPAND;
        move.value = parse_with(e, PICK(FACTORS), name);
        move.extra = expr_int(e, 0);
        move.count = 1 + dice_roll(d, 4);
        break;
    case 6:
        move.kind = MANUAL_ROTATE;
        move.value = text_parse(e, PICK(ANGLES));
        break;
    default: break;
    }
    return move;
}

/* Of this program, so that a busy machine does not shorten the test. */
static double seconds(void)
{
    struct timespec t;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Moves are drawn until enough were kept. After each the value is compared with that of the integral as typed at a point
 * that the moves themselves were not tried at. */
static void test_random(void **state)
{
    (void)state;
    dice dd = {dice_seed("test_manual")}, *d = &dd;
    const char *words = getenv("TW_TRIALS");
    long wanted = words ? atol(words) : 2000, kept = 0, drawn = 0, compared = 0, proved = 0;
    double from = seconds(), most = words ? 1e9 : 12;
    while (kept < wanted && seconds() - from < most) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        text_given(e, "a > 0");
        manual *m = begin(e, PICK(INTEGRALS));
        expr *symbols[] = {expr_symbol(e, "s"), expr_symbol(e, "a")};
        expr *values[] = {expr_frac(e, 5 + dice_roll(d, 9), 2), expr_frac(e, 3 + dice_roll(d, 8), 7)};
        env at = {2, symbols, values};
        for (int k = 0; k < 8 && kept < wanted && seconds() - from < most; k++) {
            manual_move move = random_move(d, m);
            size_t before = m->count;
            drawn++;
            budget_start(e, 5);
            tw_status status = manual_apply(m, &move);
            if (status != TW_OK && e->error.kind == ERROR_INTERNAL) fail_msg("%s", e->error.words);
            budget_start(e, 0);
            if (status != TW_OK) {
                assert_int_equal(m->count, before);
                engine_forgive(e);
                continue;
            }
            kept += (long)(m->count - before);
            proved += manual_is_proved(m);
            bool seen;
            if (!same_at(e, m->typed, manual_value(m), &at, &seen)) {
                text form;
                text_init(&form);
                manual_print_form(m, &form);
                char *typed = expr_text(e, m->typed);
                fail_msg("the value changed: %s is not %s", typed, form.bytes);
            }
            compared += seen;
            if (expr_size(manual_value(m)) > 150) break;
        }
        manual_release(m);
        tw_engine_free(e);
    }
    printf("%ld moves drawn, %ld kept, %ld compared, %ld proved, %.1f s\n", drawn, kept, compared, proved, seconds() - from);
    assert_true(kept > 0 && compared > kept / 4);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_substitute), cmocka_unit_test(test_wrong_inverse), cmocka_unit_test(test_parts),
        cmocka_unit_test(test_parameter),  cmocka_unit_test(test_split_and_pick), cmocka_unit_test(test_rotate),
        cmocka_unit_test(test_expand),     cmocka_unit_test(test_own_remainder),     cmocka_unit_test(test_swap),           cmocka_unit_test(test_wrong_rule),
        cmocka_unit_test(test_granted),    cmocka_unit_test(test_begin),      cmocka_unit_test(test_replay),         cmocka_unit_test(test_random),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
