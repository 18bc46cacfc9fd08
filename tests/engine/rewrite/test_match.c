/* Matching: what fits, with which values, in which order; and against a matcher that tries every assignment there is, on
 * random small terms. TW_SEED, TW_TRIALS. */
#include "tests/engine/rewrite/texts.h"

#include <stdio.h>
#include <time.h>

#include "engine/rewrite/pattern.h"

/* ---- all matches as text ---- */

typedef struct listing {
    tw_engine *e;
    const rule *r;
    text words;
    size_t count, limit;
} listing;

static bool list_match(void *host, const match *m)
{
    listing *l = host;
    if (l->count++) text_add(&l->words, "; ");
    for (size_t k = 0; k < l->r->count; k++) {
        text_addf(&l->words, "%s%s = ", k ? ", " : "", l->r->variables[k].symbol->is.name);
        expr *value = m->values[k];
        if (l->r->variables[k].arity > 0)
            value = expr_substitute(l->e, value, pattern_parameters(m->of, k)[0], expr_symbol(l->e, "x"));
        expr_print(l->e, &l->words, value);
    }
    return l->count >= l->limit;
}

/* rule: variables in brackets and pattern, as in "r(a, b): log(a*b)". */
static void expect(tw_engine *e, const char *head, const char *subject, bool with_rest, size_t limit, const char *awaited)
{
    text words;
    text_init(&words);
    text_addf(&words, "rule %s becomes 0", head);
    rule *r = text_rule(e, words.bytes);
    if (!r) fail_msg("`%s`: %s", head, e->error.words);
    listing l = {.e = e, .r = r, .limit = limit};
    text_init(&l.words);
    bool found;
    assert_int_equal(pattern_match(e, r->pattern, text_parse(e, subject), with_rest, list_match, &l, &found), TW_OK);
    assert_int_equal(found, l.count > 0);
    if (strcmp(l.words.bytes, awaited) != 0)
        fail_msg("%s on %s\n  gives   %s\n  awaited %s", head, subject, l.words.bytes, awaited);
    text_clear(&l.words);
    text_clear(&words);
    rule_release(r);
}

static const struct {
    const char *head, *subject;
    bool with_rest;
    size_t limit;
    const char *awaited;
} cases[] = {
    /* the language page's example */
    {"r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx", "integral from 0 to inf of exp(-x) dx", false, 9, "n = 0, a = 1"},
    {"r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx", "integral from 0 to inf of t*exp(-3*s*t) dt", false, 9,
     "n = 1, a = 3*s"},
    {"r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx", "integral from 0 to inf of exp(-t/s)/sqrt(t) dt", false, 9,
     "n = -1/2, a = s^-1"},
    {"r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx", "integral from 0 to inf of sin(t)*exp(-t) dt", false, 9, ""},
    {"r(n, a): integral from 0 to inf of x^n*exp(-a*x) dx", "integral from 0 to 1 of exp(-t) dt", false, 9, ""},
    /* a variable outside cannot hold the bound variable */
    {"r(a): integral from 0 to 1 of a*sin(x) dx", "integral from 0 to 1 of x*sin(x) dx", false, 9, ""},
    {"r(a): integral from 0 to 1 of a*sin(x) dx", "integral from 0 to 1 of 2*q*sin(x) dx", false, 9, "a = 2*q"},
    /* pattern functions may */
    {"r(c, f(x)): integral from 0 to 1 of c*f(x) dx", "integral from 0 to 1 of q*x*sin(x) dx", false, 9,
     "c = q, f = x*sin(x); c = 1, f = q*x*sin(x)"},
    {"r(f(x), g(x)): integral from 0 to 1 of f(x) + g(x) dx", "integral from 0 to 1 of x + sin(x) dx", false, 9,
     "f = sin(x) + x, g = 0; f = x, g = sin(x); f = sin(x), g = x; f = 0, g = sin(x) + x"},
    {"r(f(x)): f(0) + integral from 0 to 1 of f(x) dx", "cos(0) + integral from 0 to 1 of cos(y) dy", false, 9,
     "f = cos(x)"},
    {"r(f(x)): f(0)*integral from 0 to 1 of f(x) dx", "2*integral from 0 to 1 of cos(y) dy", false, 9, ""},
    {"r(f(x), a): sum from k = 0 to a of f(k)", "sum from j = 0 to n of j^2*q", false, 9, "f = q*x^2, a = n"},
    {"r(f(z), p, q): integral along p to q of f(z) dz", "integral along 0 to 1 + i of exp(t) dt", false, 9,
     "f = exp(x), p = 0, q = 1 + i"},
    {"r(f(z), p, q): integral along p to q of f(z) dz", "integral along 0 to 1 to 1 + i of exp(t) dt", false, 9, ""},
    {"r(f(z), t): integral along inf(t) to inf(-t) of f(z) dz", "integral along inf(pi/3) to inf(-pi/3) of exp(u^3) du", false,
     9, "f = exp(x^3), t = pi/3"},
    {"r(f(x)): integral from 0 to 1 of x*f(x) dx", "integral from 0 to 1 of x^3*cos(x) dx", false, 9, "f = x^2*cos(x)"},
    /* any order, with the rest kept */
    {"r(x): sin(x)^2 + cos(x)^2", "cos(u)^2 + 3 + sin(t)^2 + sin(u)^2 + cos(t)^2", true, 9, "x = t; x = u"},
    {"r(x): sin(x)^2 + cos(x)^2", "cos(u)^2 + 3 + sin(t)^2", true, 9, ""},
    {"r(x): sin(x)*cos(x)", "sin(u)^3*cos(u)*q", true, 9, "x = u"},
    {"r(x): 2*sin(x)*cos(x)", "6*sin(u)*cos(u)", true, 9, "x = u"},
    {"r(x): 2*sin(x)*cos(x)", "sin(u)*cos(u)", true, 9, ""},
    {"r(a, b): log(a) + log(b)", "log(p) + log(q) + log(r)", true, 3, "a = p, b = q; a = p, b = r; a = q, b = p"},
    /* neutral values */
    {"r(a, b): log(a*b)", "log(x)", false, 9, "a = x, b = 1; a = 1, b = x"},
    {"r(a, b): exp(a + b)", "exp(x)", false, 9, "a = x, b = 0; a = 0, b = x"},
    {"r(a, x): sin(a*x^2 + 1)", "sin(y^2 + 1)", false, 9, "a = y^2, x = 1; a = 1, x = y"},
    {"r(n): sin(t^n)", "sin(1)", false, 9, "n = 0"},
    {"r(n): sin(t^n)", "sin(t)", false, 9, "n = 1"},
    /* repeated variables */
    {"r(a): sin(a)*cos(a)", "sin(x)*cos(y)", true, 9, ""},
    {"r(a, b): J(a, b)*K(a, b)", "J(nu, 2*z)*K(nu, 2*z)", false, 9, "a = nu, b = 2*z"},
    {"r(a): exp(a)*sin(a + b)", "exp(x*y)*sin(x*y + b)", false, 9, "a = x*y"},
    /* numbers */
    {"r(a): sin(2*a)", "sin(6*y)", false, 9, "a = 3*y"},
    {"r(a): sin(2*a)", "sin(y)", false, 9, ""},
    {"r(a): sin(2*a)", "sin(3*y)", false, 9, ""},
    {"r(a): Gamma(a + 1)", "Gamma(y + 3)", false, 9, "a = 2 + y"},
    {"r(a): Gamma(a + 1)", "Gamma(y)", false, 9, ""},
    {"r(a): Gamma(a + 1)", "Gamma(y + 1/2)", false, 9, ""},
    {"r(n): integral from 0 to inf of x^(n - 1)*exp(-x) dx", "integral from 0 to inf of exp(-x)*x^4 dx", false, 9, "n = 5"},
    {"r(n): integral from 0 to inf of x^(n - 1)*exp(-x) dx", "integral from 0 to inf of exp(-x) dx", false, 9, "n = 1"},
    {"r(v): integral from -inf to inf of exp(-x^2/(2*v)) dx", "integral from -inf to inf of exp(-3*x^2) dx", false, 9,
     "v = 1/6"},
    {"r(a): integral from -inf to inf of exp(-a^2*x^2) dx", "integral from -inf to inf of exp(-4*k^2*x^2) dx", false, 9,
     "a = 2*k"},
    {"r(a, b): log(a/b)", "log(y/z)", false, 1, "a = y*z^-1, b = 1"},
    {"r(a): -log(a)", "-3*log(x)", true, 9, "a = x"},
    {"r(a): -log(a)", "log(x)", true, 9, ""},
    /* bound variables by position, not by name */
    {"r(a): integral from 0 to a of integral from 0 to x of sin(x*y) dy dx",
     "integral from 0 to 2 of integral from 0 to u of sin(u*w) dw du", false, 9, "a = 2"},
    {"r(a): integral from 0 to a of integral from 0 to x of sin(x*y) dy dx",
     "integral from 0 to 2 of integral from 0 to u of sin(u*2*w) dw du", false, 9, ""},
    {"r(a): integral from 0 to 1 of integral from 0 to 1 of exp(x*y*a) dy dx",
     "integral from 0 to 1 of integral from 0 to 1 of exp(x*y^2) dy dx", false, 9, ""},
    /* conditions of roots and cases are parts like others */
    {"r(a, b): piecewise(a when x < b, 0 otherwise)", "piecewise(y^2 when x < 3, 0 otherwise)", false, 9, "a = y^2, b = 3"},
};

static void test_cases(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++)
        expect(e, cases[k].head, cases[k].subject, cases[k].with_rest, cases[k].limit, cases[k].awaited);
    tw_engine_free(e);
}

static void test_refused(void **state)
{
    (void)state;
    static const struct {
        const char *text, *words;
    } wrong[] = {
        {"rule r(a): a becomes 0", "one variable: it would match everything"},
        {"rule r(a, b): sin(a) becomes 0", "`b` does not occur in the pattern"},
        {"rule r(f(x)): sin(f(2)) becomes 0", "no place where the pattern function `f` stands with variables that are bound"},
        {"rule r(f(x)): integral from 0 to 1 of f(x) dx becomes f(1, 2)", "takes 1 argument"},
        {"rule r(f(x)): integral from 0 to 1 of derivative of f(x) in x dx becomes f(1)", "differentiates `f`"},
        {"rule r(f(x), a): integral from 0 to 1 of f(x) dx + f(a) becomes 0", "only within a pattern function's argument"},
        {"rule r(a, a): sin(a) becomes 0", "stands twice"},
    };
    tw_engine *e = tw_engine_new();
    for (size_t k = 0; k < sizeof wrong / sizeof *wrong; k++) {
        rule *r = text_rule(e, wrong[k].text);
        if (r) fail_msg("`%s` is taken", wrong[k].text);
        if (!e->error.words || !strstr(e->error.words, wrong[k].words))
            fail_msg("`%s` says: %s", wrong[k].text, e->error.words ? e->error.words : "nothing");
        engine_forgive(e);
    }
    tw_engine_free(e);
}

static bool refuse(void *host, const match *m)
{
    (void)m;
    ++*(size_t *)host;
    return false;
}

/* All ways to share 40 terms among two functions are too many: an error that names the rule. */
static void test_exhausted(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    rule *r = text_rule(e, "rule two_parts(f(x), g(x)): integral from 0 to 1 of f(x) + g(x) dx becomes 0");
    text words;
    text_init(&words);
    text_add(&words, "integral from 0 to 1 of 1");
    for (int k = 1; k < 40; k++) text_addf(&words, " + sin(%d*x)", k);
    text_add(&words, " dx");
    size_t count = 0;
    assert_int_equal(pattern_match(e, r->pattern, text_parse(e, words.bytes), false, refuse, &count, NULL), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_UNDECIDED);
    assert_non_null(strstr(e->error.words, "`two_parts`"));
    assert_true(count > 1000);
    text_clear(&words);
    rule_release(r);
    tw_engine_free(e);
}

/* ---- against every assignment ---- */

enum { VARIABLES = 3, SOLUTIONS = 400 };

typedef struct theta {
    expr *values[VARIABLES];
} theta;

typedef struct solutions {
    size_t count;
    bool overflow;
    theta list[SOLUTIONS];
} solutions;

typedef struct naive {
    tw_engine *e;
    expr *variables[VARIABLES];
} naive;

static int variable_of(const naive *n, expr *a)
{
    for (int k = 0; k < VARIABLES; k++)
        if (n->variables[k] == a) return k;
    return -1;
}

static void add_solution(solutions *s, const theta *t)
{
    for (size_t k = 0; k < s->count; k++)
        if (memcmp(&s->list[k], t, sizeof *t) == 0) return;
    if (s->count == SOLUTIONS) s->overflow = true;
    else s->list[s->count++] = *t;
}

static void solve(const naive *n, expr *p, expr *s, const theta *t, solutions *out);

static expr *join(const naive *n, bool product, expr **parts, size_t count)
{
    return product ? expr_product(n->e, parts, count) : expr_sum(n->e, parts, count);
}

/* owner[k]: which part of p gets part k of s; the last one may be the rest. */
static void solve_owned(const naive *n, expr *p, expr *const *parts, size_t count, const size_t *owner, size_t takers,
                        size_t at, const theta *t, solutions *out)
{
    const bool product = p->kind == EXPR_PRODUCT;
    if (at == p->count) {
        add_solution(out, t);
        return;
    }
    (void)takers;
    expr *share[8];
    size_t m = 0;
    for (size_t k = 0; k < count; k++)
        if (owner[k] == at) share[m++] = parts[k];
    solutions *here = malloc(sizeof *here);
    here->count = 0;
    here->overflow = false;
    if (variable_of(n, p->args[at]) >= 0) solve(n, p->args[at], join(n, product, share, m), t, here);
    else if (m == 1) solve(n, p->args[at], share[0], t, here);
    for (size_t k = 0; k < here->count; k++)
        solve_owned(n, p, parts, count, owner, takers, at + 1, &here->list[k], out);
    out->overflow = out->overflow || here->overflow;
    free(here);
}

static void solve_group(const naive *n, expr *p, expr *s, bool with_rest, const theta *t, solutions *out)
{
    expr *const *parts;
    const size_t count = p->kind == EXPR_PRODUCT ? expr_factors(&s, &parts) : expr_terms(&s, &parts);
    const size_t takers = p->count + with_rest;
    size_t owner[8] = {0};
    if (count > 5) {
        out->overflow = true;
        return;
    }
    for (;;) {
        solve_owned(n, p, parts, count, owner, takers, 0, t, out);
        size_t k = 0;
        while (k < count && ++owner[k] == takers) owner[k++] = 0;
        if (k == count) return;
    }
}

static void solve_list(const naive *n, expr *p, expr *s, size_t at, const theta *t, solutions *out)
{
    if (at == p->count) {
        add_solution(out, t);
        return;
    }
    solutions *here = malloc(sizeof *here);
    here->count = 0;
    here->overflow = false;
    solve(n, p->args[at], s->args[at], t, here);
    for (size_t k = 0; k < here->count; k++) solve_list(n, p, s, at + 1, &here->list[k], out);
    out->overflow = out->overflow || here->overflow;
    free(here);
}

static void solve(const naive *n, expr *p, expr *s, const theta *t, solutions *out)
{
    const int v = variable_of(n, p);
    if (v >= 0) {
        theta next = *t;
        if (next.values[v] && next.values[v] != s) return;
        next.values[v] = s;
        add_solution(out, &next);
    } else if (p->kind == EXPR_SUM || p->kind == EXPR_PRODUCT) {
        solve_group(n, p, s, false, t, out);
    } else if (p->count == 0) {
        if (p == s) add_solution(out, t);
    } else if (p->kind == s->kind && p->count == s->count && p->is.function == s->is.function) {
        solve_list(n, p, s, 0, t, out);
    }
}

/* ---- random terms: of functions that are neither 0 nor 1 at the neutral values, so that no part disappears ---- */

static expr *random_term(tw_engine *e, uint64_t *state, int depth)
{
    static const char *const leaves[] = {"p", "q", "r", "u", "v", "w", "k", "m"};
    const unsigned pick = (unsigned)(test_random(state) % 10);
    if (depth == 0 || pick < 3) return expr_symbol(e, leaves[test_random(state) % 8]);
    if (pick < 5) return expr_call1(e, pick == 3 ? FUNCTION_AI : FUNCTION_BI, random_term(e, state, depth - 1));
    if (pick == 5) {
        expr *const pair[2] = {random_term(e, state, depth - 1), random_term(e, state, depth - 1)};
        return expr_call(e, FUNCTION_BESSEL_K, pair, 2);
    }
    expr *parts[4];
    const size_t n = 2 + test_random(state) % 5 / 2;
    for (size_t k = 0; k < n; k++) parts[k] = random_term(e, state, depth - 1);
    return pick < 8 ? expr_sum(e, parts, n) : expr_product(e, parts, n);
}

/* Terms with numbers or powers belong to the cases above: here every part stands once. */
static bool is_plain(expr *a)
{
    if (a->kind == EXPR_NUMBER || a->kind == EXPR_POWER) return false;
    for (size_t k = 0; k < a->count; k++)
        if (!is_plain(a->args[k])) return false;
    return true;
}

/* The term with some of its parts replaced by variables. */
static expr *random_pattern(const naive *n, uint64_t *state, expr *a)
{
    if (test_random(state) % 4 == 0 || a->count == 0)
        return test_random(state) % 2 ? n->variables[test_random(state) % VARIABLES] : a;
    expr *args[8];
    size_t count = 0;
    for (size_t k = 0; k < a->count && k < 8; k++) {
        if ((a->kind == EXPR_SUM || a->kind == EXPR_PRODUCT) && a->count > 2 && test_random(state) % 5 == 0) continue;
        args[count++] = random_pattern(n, state, a->args[k]);
    }
    if (count == 0) return a;
    if (a->kind == EXPR_SUM || a->kind == EXPR_PRODUCT) return join(n, a->kind == EXPR_PRODUCT, args, count);
    return count == a->count ? expr_call(n->e, a->is.function, args, count) : a;
}

typedef struct collected {
    size_t count;
    theta list[SOLUTIONS];
    size_t variables;
    size_t index[VARIABLES];
    const naive *n;
    expr *p;
} collected;

static size_t occurrences(expr *a, expr *symbol)
{
    size_t n = a == symbol;
    for (size_t k = 0; k < a->count; k++) n += occurrences(a->args[k], symbol);
    return n;
}

/* A variable that stands twice and is neutral in one place may wipe out a part in the other: b = 0 in (a + b)*(c + b*r).
 * The plain matcher does not compute, so such matches, and those that b + u = 2*u brings about, are left out on both
 * sides. */
static bool is_compared(const naive *n, expr *p, const theta *t)
{
    for (int k = 0; k < VARIABLES; k++) {
        expr *value = t->values[k];
        if (!value) continue;
        if (expr_is_number(value) ? occurrences(p, n->variables[k]) > 1 : !is_plain(value)) return false;
    }
    expr *symbols[VARIABLES], *values[VARIABLES];
    size_t count = 0;
    for (int k = 0; k < VARIABLES; k++) {
        if (!t->values[k]) continue;
        symbols[count] = n->variables[k];
        values[count++] = t->values[k];
    }
    expr *instance = expr_substitute_all(n->e, p, symbols, values, count);
    assert_non_null(instance);
    return is_plain(instance);
}

static bool collect(void *host, const match *m)
{
    collected *c = host;
    theta t = {{NULL}};
    for (size_t k = 0; k < c->variables; k++) t.values[c->index[k]] = m->values[k];
    if (!is_compared(c->n, c->p, &t)) return false;
    for (size_t k = 0; k < c->count; k++)
        if (memcmp(&c->list[k], &t, sizeof t) == 0) return false; /* the same values by another way */
    if (c->count < SOLUTIONS) c->list[c->count++] = t;
    return false;
}

static void compare(tw_engine *e, const naive *n, expr *p, expr *s, bool with_rest, uint64_t trial)
{
    static collected c;
    static solutions all;
    pattern_variable list[VARIABLES];
    c.count = c.variables = 0;
    c.n = n;
    c.p = p;
    for (size_t k = 0; k < VARIABLES; k++) {
        if (!expr_has(p, n->variables[k])) continue;
        c.index[c.variables] = k;
        list[c.variables++] = (pattern_variable){n->variables[k], 0};
    }
    pattern *made = pattern_new(e, "random", p, list, c.variables);
    assert_non_null(made);
    all.count = 0;
    all.overflow = false;
    const theta none = {{NULL}};
    if (with_rest && (p->kind == EXPR_SUM || p->kind == EXPR_PRODUCT)) solve_group(n, p, s, true, &none, &all);
    else solve(n, p, s, &none, &all);
    tw_status status = pattern_match(e, made, s, with_rest, collect, &c, NULL);
    if (!all.overflow) {
        assert_int_equal(status, TW_OK);
        size_t kept = 0;
        for (size_t k = 0; k < all.count; k++)
            if (is_compared(n, p, &all.list[k])) all.list[kept++] = all.list[k];
        all.count = kept;
        bool same = c.count == all.count;
        for (size_t k = 0; k < c.count && same; k++) {
            bool found = false;
            for (size_t j = 0; j < all.count; j++) found = found || memcmp(&c.list[k], &all.list[j], sizeof none) == 0;
            same = found;
        }
        if (!same) {
            char *form = expr_text(e, p), *on = expr_text(e, s);
            for (size_t k = 0; k < c.count; k++)
                for (size_t v = 0; v < VARIABLES; v++) {
                    char *value = c.list[k].values[v] ? expr_text(e, c.list[k].values[v]) : NULL;
                    printf("%s%s", value ? value : "-", v + 1 < VARIABLES ? ", " : "\n");
                    free(value);
                }
            fail_msg("trial %llu: %s on %s%s: %zu matches, every assignment gives %zu", (unsigned long long)trial, form, on,
                     with_rest ? " with a rest" : "", c.count, all.count);
        }
    } else if (status != TW_OK) {
        engine_forgive(e);
    }
    pattern_free(made);
}

static void test_every_assignment(void **state)
{
    (void)state;
    const char *given = getenv("TW_SEED"), *wanted = getenv("TW_TRIALS");
    const uint64_t seed = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL);
    const uint64_t trials = wanted ? strtoull(wanted, NULL, 10) : 100000;
    printf("seed %llu\n", (unsigned long long)seed);
    uint64_t now = seed, compared = 0;
    tw_engine *e = NULL;
    naive n = {0};
    for (uint64_t k = 0; compared < trials && k < 20 * trials; k++) {
        if (k % 20000 == 0) { /* a new engine now and then, so that its table stays small */
            tw_engine_free(e);
            e = tw_engine_new();
            n.e = e;
            static const char *const names[] = {"a", "b", "c"};
            for (int v = 0; v < VARIABLES; v++) n.variables[v] = expr_fresh(e, names[v]);
        }
        expr *s = random_term(e, &now, 3);
        if (!is_plain(s)) continue;
        expr *p = random_pattern(&n, &now, s);
        if (test_random(&now) % 4 == 0) s = random_term(e, &now, 3); /* mostly one that should fit */
        if (!is_plain(p) || !is_plain(s) || variable_of(&n, p) >= 0) continue;
        compare(e, &n, p, s, test_random(&now) % 2, k);
        compared++;
    }
    assert_true(compared > trials / 2);
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_cases), cmocka_unit_test(test_refused),
                                       cmocka_unit_test(test_exhausted), cmocka_unit_test(test_every_assignment)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
