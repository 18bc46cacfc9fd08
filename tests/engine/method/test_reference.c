/* The reference cases of the families that this room has, term by term: reference and expansion are both evaluated at a
 * very large value of the parameter, in 400 bits, and compared at equal powers. The cases carry their sources
 * (tests/reference). */
#include "texts.h"

#include <stdio.h>

/* ---- a reader for the file: objects, arrays, strings; numbers are kept as words ---- */

typedef struct json {
    char kind;   /* '{', '[', '"' */
    char *words; /* of a string or a number */
    size_t count;
    char **names;
    struct json **parts;
} json;

static const char *pass_blanks(const char *t)
{
    while (*t == ' ' || *t == '\n' || *t == '\t' || *t == '\r' || *t == ',' || *t == ':') t++;
    return t;
}

static char *read_words(const char **t)
{
    const char *s = *t;
    bool quoted = *s == '"';
    if (quoted) s++;
    size_t n = 0;
    char *words = malloc(strlen(s) + 1);
    while (*s && (quoted ? *s != '"' : !strchr(",]} \n", *s))) {
        if (quoted && *s == '\\') s++;
        words[n++] = *s++;
    }
    words[n] = 0;
    *t = quoted ? s + 1 : s;
    return words;
}

static json *read_json(const char **t)
{
    json *j = calloc(1, sizeof *j);
    *t = pass_blanks(*t);
    j->kind = **t;
    if (**t != '{' && **t != '[') {
        j->kind = '"';
        j->words = read_words(t);
        return j;
    }
    char close = **t == '{' ? '}' : ']';
    for (*t = pass_blanks(*t + 1); **t && **t != close; *t = pass_blanks(*t)) {
        j->names = realloc(j->names, (j->count + 1) * sizeof *j->names);
        j->parts = realloc(j->parts, (j->count + 1) * sizeof *j->parts);
        j->names[j->count] = close == '}' ? read_words(t) : NULL;
        j->parts[j->count] = read_json(t);
        j->count++;
    }
    if (**t) (*t)++;
    return j;
}

static void free_json(json *j)
{
    for (size_t k = 0; k < j->count; k++) {
        free(j->names[k]);
        free_json(j->parts[k]);
    }
    free(j->names);
    free(j->parts);
    free(j->words);
    free(j);
}

static json *get(const json *j, const char *name)
{
    for (size_t k = 0; k < j->count; k++)
        if (j->names[k] && strcmp(j->names[k], name) == 0) return j->parts[k];
    fail_msg("the reference file has no %s", name);
    return NULL;
}

static json *load_cases(void)
{
    FILE *f = fopen("tests/reference/cases.json", "r");
    if (!f) fail_msg("run the tests from the top of the project: tests/reference/cases.json is not there");
    fseek(f, 0, SEEK_END);
    size_t n = (size_t)ftell(f);
    rewind(f);
    char *bytes = malloc(n + 1);
    n = fread(bytes, 1, n, f);
    bytes[n] = 0;
    fclose(f);
    const char *t = bytes;
    json *j = read_json(&t);
    free(bytes);
    return j;
}

/* ---- terms as numbers ---- */

enum { BITS = 1200, TERMS_LIMIT = 200 };

typedef struct numbers {
    slong count;
    arb_struct exponent[TERMS_LIMIT], value[TERMS_LIMIT];
    slong log_power[TERMS_LIMIT];
} numbers;

typedef struct point {
    expr *symbols[4], *values[4];
    size_t count;
} point;

static void numbers_init(numbers *n)
{
    n->count = 0;
    for (slong k = 0; k < TERMS_LIMIT; k++) {
        arb_init(&n->exponent[k]);
        arb_init(&n->value[k]);
    }
}

static void numbers_clear(numbers *n)
{
    for (slong k = 0; k < TERMS_LIMIT; k++) {
        arb_clear(&n->exponent[k]);
        arb_clear(&n->value[k]);
    }
}

static void real_value(tw_engine *e, arb_t out, expr *a, const point *at)
{
    acb_t v;
    acb_init(v);
    text_value(e, v, a, at->symbols, at->values, at->count, BITS);
    arb_set(out, acb_realref(v));
    acb_clear(v);
}

/* Adds a term; terms of one power and one power of log are one. */
static void numbers_add(tw_engine *e, numbers *n, expr *exponent, slong log_power, expr *one, const point *at)
{
    arb_t x, v;
    arb_init(x);
    arb_init(v);
    real_value(e, x, exponent, at);
    real_value(e, v, one, at);
    slong k = 0;
    while (k < n->count && (!arb_overlaps(x, &n->exponent[k]) || n->log_power[k] != log_power)) k++;
    assert_true(k < TERMS_LIMIT);
    if (k == n->count) {
        arb_set(&n->exponent[k], x);
        n->log_power[k] = log_power;
        n->count++;
    }
    arb_add(&n->value[k], &n->value[k], v, BITS);
    arb_clear(x);
    arb_clear(v);
}

static expr *steps_on(tw_engine *e, expr *first, expr *forward, slong n)
{
    return expr_add(e, first, expr_mul(e, forward, expr_int(e, n)));
}

static void reference_terms(tw_engine *e, numbers *out, const json *expansion_json, expr *large, const point *at,
                            arb_t horizon)
{
    expr *prefactor = text_parse(e, get(expansion_json, "prefactor")->words);
    json *lanes = get(expansion_json, "lanes");
    arb_t last;
    arb_init(last);
    for (size_t l = 0; l < lanes->count; l++) {
        json *one = lanes->parts[l], *c = get(one, "coefficients");
        expr *first = text_parse(e, get(one, "first_exponent")->words),
             *forward = text_parse(e, get(one, "step")->words);
        slong logs = atol(get(one, "log_power")->words);
        for (size_t n = 0; n < c->count; n++) {
            expr *exponent = steps_on(e, first, forward, (slong)n);
            expr *parts[] = {prefactor, text_parse(e, get(one, "constant")->words), text_parse(e, c->parts[n]->words),
                             expr_pow(e, expr_call1(e, FUNCTION_LOG, large), expr_int(e, logs)),
                             expr_pow(e, large, exponent)};
            numbers_add(e, out, exponent, logs, expr_product(e, parts, 5), at);
            real_value(e, last, exponent, at);
        }
        if (l == 0 || arb_gt(last, horizon)) arb_set(horizon, last);
    }
    arb_clear(last);
}

static void expansion_terms(tw_engine *e, numbers *out, expansion *a, const point *at)
{
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        for (size_t l = 0; c->dominant && l < c->lane_count; l++) {
            const lane *one = &c->lanes[l];
            for (slong n = 0; n < one->c.count; n++)
                numbers_add(e, out, steps_on(e, one->first_exponent, expr_fmpq(e, one->step), n), one->log_power,
                            expr_mul(e, c->prefactor, expansion_term(e, a, k, (term){l, n})), at);
        }
    }
}

/* Every reference term at or above the horizon is there with the same value, and the expansion has no others there. */
static slong compare(const numbers *want, const numbers *got, const arb_t horizon, const char *id)
{
    slong compared = 0;
    arb_t d, size;
    arb_init(d);
    arb_init(size);
    for (slong k = 0; k < want->count; k++) {
        if (arb_lt(&want->exponent[k], horizon)) continue;
        slong n = 0;
        while (n < got->count &&
               (!arb_overlaps(&got->exponent[n], &want->exponent[k]) || got->log_power[n] != want->log_power[k]))
            n++;
        if (n == got->count && arb_is_zero(&want->value[k])) { /* left out, as it should be */
            compared++;
            continue;
        }
        if (n == got->count) fail_msg("%s: term %ld of the reference is missing", id, (long)k);
        arb_sub(d, &got->value[n], &want->value[k], BITS);
        arb_mul_2exp_si(size, &want->value[k], -600);
        arb_abs(size, size);
        arb_abs(d, d);
        if (arb_is_zero(size) ? !arb_contains_zero(d) : !arb_le(d, size)) fail_msg("%s: term %ld differs", id, (long)k);
        compared++;
    }
    for (slong n = 0; n < got->count; n++) {
        slong k = 0;
        while (k < want->count &&
               (!arb_overlaps(&got->exponent[n], &want->exponent[k]) || got->log_power[n] != want->log_power[k]))
            k++;
        if (k == want->count && !arb_contains_zero(&got->value[n]) && !arb_lt(&got->exponent[n], horizon))
            fail_msg("%s: the expansion has a term that the reference lacks", id);
    }
    arb_clear(d);
    arb_clear(size);
    return compared;
}

static point read_point(tw_engine *e, const json *c, expr *large)
{
    point at = {.count = 1};
    at.symbols[0] = large;
    at.values[0] = text_parse(e, "10^6");
    json *values = get(c, "values"), *last = get(values->parts[values->count - 1], "at");
    for (size_t k = 0; k < last->count; k++) {
        if (strcmp(last->names[k], large->is.name) == 0) continue;
        at.symbols[at.count] = expr_symbol(e, last->names[k]);
        at.values[at.count++] = text_parse(e, last->parts[k]->words);
    }
    return at;
}

static slong count_nonzero(const numbers *n)
{
    slong count = 0;
    for (slong k = 0; k < n->count; k++)
        if (!arb_contains_zero(&n->value[k])) count++;
    return count;
}

static void check_case(const json *c)
{
    const char *id = get(c, "id")->words, *name = get(c, "large")->words;
    tw_engine *e = text_engine(name, LARGE_POSITIVE);
    json *facts = get(c, "other_parameters");
    for (size_t k = 0; k < facts->count; k++) text_given(e, facts->parts[k]->words);
    expr *large = expr_symbol(e, name), *integral = text_parse(e, get(c, "integral")->words);
    point at = read_point(e, c, large);
    numbers *want = malloc(sizeof *want), *got = malloc(sizeof *got);
    numbers_init(want);
    numbers_init(got);
    arb_t horizon;
    arb_init(horizon);
    reference_terms(e, want, get(c, "expansion"), large, &at, horizon);
    expansion a;
    expansion_init(&a);
    if (expand(e, &a, integral, count_nonzero(want), NULL) != TW_OK) fail_msg("%s: %s", id, e->error.words);
    assert_true(conditions_all_sure(&a.conditions));
    expansion_terms(e, got, &a, &at);
    slong compared = compare(want, got, horizon, id);
    print_message("%s: %ld terms compared\n", id, (long)compared);
    assert_true(compared >= 8 || compared == count_nonzero(want)); /* l-root2 lists four */
    expansion_clear(&a);
    arb_clear(horizon);
    numbers_clear(want);
    numbers_clear(got);
    free(want);
    free(got);
    tw_engine_free(e);
}

static void test_cases(void **state)
{
    (void)state;
    static const char *const families[] = {"watson", "parts", "symbolic-parameter", "mellin-log", "laplace-interior", "laplace-endpoint",
                                           "high-order-saddle", "laplace-multi", "bessel-kernel", "two-scale"};
    json *j = load_cases(), *cases = get(j, "cases");
    size_t checked = 0;
    for (size_t k = 0; k < cases->count; k++) {
        json *c = cases->parts[k];
        bool ours = false;
        for (size_t f = 0; f < sizeof families / sizeof *families; f++) ours = ours || strcmp(get(c, "family")->words, families[f]) == 0;
        if (!ours) continue;
        check_case(c);
        checked++;
    }
    assert_true(checked >= 30);
    free_json(j);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_cases),
    };
    return cmocka_run_group_tests_name("reference", tests, NULL, NULL);
}
