/* Wrong rules must be caught. Every rule of the standard library is changed in small ways (a sign, a factor 2, an exponent off
 * by one, two parameters swapped, a condition dropped or widened, a root's branch, right only for whole numbers) and each
 * mutant is checked like any rule. A mutant that is not refuted is either equivalent, which is seen by trying it beyond what the
 * true rule says, or it was missed; each survivor is named with its reason. At least 98 % of those not equivalent must be
 * refuted. TW_SEED picks other samples and other mutants, TW_TRIALS how many mutants at most (0: all). */
#include "tests/engine/rewrite/texts.h"

#include <glob.h>
#include <stdio.h>
#include <time.h>

#include "engine/ball/quadrature.h"
#include "engine/rewrite/check.h"
#include "engine/rewrite/sample.h"
#include "lang/file.h"

typedef struct mutant {
    const rule *of;
    char kind[48];
    expr *left, *right;
    size_t condition_count;
    expr *conditions[32];
    bool weaker;          /* its conditions say less than the rule's, its sides are the same */
} mutant;

typedef struct count {
    size_t made, refuted, equivalent, missed, unknown;
} count;

typedef struct work {
    tw_engine *e;
    uint64_t state;
    uint64_t keep_one_of;
    count all;
} work;

/* ---- judging ---- */

static rule *mutant_rule(work *w, const mutant *m)
{
    rule *r = rule_new(w->e, m->of->name, m->of->variables, m->of->count, m->left, m->right, m->conditions, m->condition_count,
                       NULL);
    if (!r) engine_forgive(w->e);
    return r;
}

static bool value_of(work *w, acb_t out, expr *a)
{
    const env nothing = {0, NULL, NULL};
    const double before = w->e->deadline;
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    w->e->deadline = (double)now.tv_sec + 1e-9 * (double)now.tv_nsec + 2;
    const bool good = a && quadrature(w->e, out, a, &nothing, 14, true, NULL) == TW_OK && acb_is_finite(out);
    w->e->deadline = before;
    engine_forgive(w->e);
    return good;
}

/* Where both a and b have values at admissible values of r: are they ever disjoint? Counts the pairs. */
static bool ever_differ(work *w, const rule *r, expr *a, expr *b, size_t *pairs)
{
    sampler *s = sampler_new(w->e, r, test_random(&w->state));
    acb_t x, y;
    acb_init(x);
    acb_init(y);
    bool differ = false, found = true;
    *pairs = 0;
    for (int k = 0; k < 60 && found && !differ; k++) {
        if (sampler_next(s, &found) != TW_OK) break;
        if (!found) break;
        if (!value_of(w, x, sampler_put(s, a)) || !value_of(w, y, sampler_put(s, b))) continue;
        ++*pairs;
        differ = !acb_overlaps(x, y);
    }
    engine_forgive(w->e);
    acb_clear(x);
    acb_clear(y);
    sampler_free(s);
    return differ;
}

/* Why a mutant survived: NULL when nothing excuses it. */
static const char *excuse(work *w, const mutant *m, const rule *r)
{
    size_t pairs;
    if (m->left == m->of->left && m->right == m->of->right && !m->weaker) return "the same rule";
    if (m->weaker) return ever_differ(w, r, m->left, m->right, &pairs) ? NULL : "it holds there, too, or has no value there";
    if (ever_differ(w, m->of, m->of->right, m->right, &pairs)) return NULL;
    return pairs > 0 ? "the same values" : "no values to tell it by";
}

static void judge(work *w, const mutant *m)
{
    if (w->keep_one_of > 1 && test_random(&w->state) % w->keep_one_of != 0) return;
    if (!m->left || !m->right) {
        engine_forgive(w->e);
        return;
    }
    rule *r = mutant_rule(w, m);
    if (!r) return;
    if (rule_check(w->e, r, test_random(&w->state), 20, NULL) != TW_OK)
        fail_msg("%s: %s", m->of->name, w->e->error.words ? w->e->error.words : "?");
    w->all.made++;
    if (r->status == RULE_REFUTED) {
        w->all.refuted++;
    } else {
        if (!m->of->checked) assert_int_equal(rule_check(w->e, (rule *)m->of, 1, 20, NULL), TW_OK);
        const char *why = excuse(w, m, r);
        const bool blind = r->status == RULE_UNCHECKED && m->of->status == RULE_UNCHECKED;
        if (why) w->all.equivalent++;
        else if (blind) w->all.unknown++;
        else w->all.missed++;
        printf("  survivor: %s, %s: %s\n", m->of->name, m->kind,
               why ? why : blind ? "the rule itself is unchecked" : "MISSED");
        if (!why && !blind) {
            char *words = expr_text(w->e, m->right);
            printf("    becomes %s\n    %s\n", words, r->finding);
            free(words);
        }
    }
    rule_release(r);
}

static mutant like(const rule *r, const char *kind)
{
    mutant m = {.of = r, .left = r->left, .right = r->right, .condition_count = r->condition_count};
    snprintf(m.kind, sizeof m.kind, "%s", kind);
    for (size_t k = 0; k < r->condition_count && k < 32; k++) m.conditions[k] = r->conditions[k];
    return m;
}

/* ---- mutations of the right side ---- */

static void judge_right(work *w, const rule *r, const char *kind, expr *right)
{
    mutant m = like(r, kind);
    m.right = right;
    judge(w, &m);
}

/* a with the first power found turned into another one: its exponent plus one, or its root's other branch. */
static expr *other_power(tw_engine *e, expr *a, bool branch, bool *done)
{
    if (*done || a->kind == EXPR_INTEGRAL || a->kind == EXPR_SUMMATION || a->kind == EXPR_CONTOUR) return a;
    if (a->kind == EXPR_POWER) {
        const bool root = expr_is_number(a->args[1]) && !fmpz_is_one(fmpq_denref(expr_number(a->args[1])));
        if (!branch || root) {
            *done = true;
            return branch ? expr_neg(e, a) : expr_pow(e, a->args[0], expr_add(e, a->args[1], expr_int(e, 1)));
        }
    }
    if (a->count == 0 || a->count > 16) return a;
    expr *args[16];
    for (size_t k = 0; k < a->count; k++) args[k] = other_power(e, a->args[k], branch, done);
    switch (a->kind) {
    case EXPR_SUM: return expr_sum(e, args, a->count);
    case EXPR_PRODUCT: return expr_product(e, args, a->count);
    case EXPR_POWER: return expr_pow(e, args[0], args[1]);
    case EXPR_CALL: return expr_call(e, a->is.function, args, a->count);
    default: return a;
    }
}

static void mutate_right(work *w, const rule *r)
{
    tw_engine *e = w->e;
    judge_right(w, r, "a sign", expr_neg(e, r->right));
    judge_right(w, r, "a factor 2", expr_mul(e, expr_int(e, 2), r->right));
    bool done = false;
    expr *power = other_power(e, r->right, false, &done);
    if (done) judge_right(w, r, "an exponent off by one", power);
    done = false;
    power = other_power(e, r->right, true, &done);
    if (done) judge_right(w, r, "the other branch of a root", power);
    for (size_t k = 0; k < r->count; k++) {
        expr *x = r->variables[k].symbol;
        if (r->variables[k].arity > 0 || !expr_has(r->right, x)) continue;
        judge_right(w, r, "a parameter off by one", expr_substitute(e, r->right, x, expr_add(e, x, expr_int(e, 1))));
        for (size_t j = k + 1; j < r->count; j++) {
            expr *y = r->variables[j].symbol;
            if (r->variables[j].arity > 0) continue;
            expr *const from[2] = {x, y}, *const to[2] = {y, x};
            judge_right(w, r, "two parameters swapped", expr_substitute_all(e, r->right, from, to, 2));
        }
    }
    /* right for whole numbers only: cos(2*pi*x) is 1 there */
    for (size_t k = 0; k < r->count; k++) {
        expr *x = r->variables[k].symbol;
        bool integer = false;
        for (size_t c = 0; c < r->condition_count; c++)
            integer = integer || (r->conditions[c]->is.relation == RELATION_INTEGER && r->conditions[c]->args[0] == x);
        if (r->variables[k].arity > 0 || integer) continue;
        expr *const turn[3] = {expr_int(e, 2), expr_constant_of(e, CONSTANT_PI), x};
        judge_right(w, r, "right only for whole numbers",
                    expr_mul(e, r->right, expr_call1(e, FUNCTION_COS, expr_product(e, turn, 3))));
        break;
    }
}

/* ---- mutations of the conditions ---- */

static void mutate_conditions(work *w, const rule *r)
{
    tw_engine *e = w->e;
    for (size_t k = 0; k < r->condition_count && r->condition_count <= 32; k++) {
        expr *c = r->conditions[k];
        if (c->is.relation == RELATION_COMPLEX) continue;
        mutant m = like(r, "a condition dropped");
        m.weaker = true;
        m.condition_count = 0;
        for (size_t j = 0; j < r->condition_count; j++)
            if (j != k) m.conditions[m.condition_count++] = r->conditions[j];
        judge(w, &m);
        if (c->is.relation > RELATION_LESS_EQUAL) continue;
        mutant wide = like(r, "a condition widened by 1");
        wide.weaker = true;
        wide.conditions[k] = expr_relation_of(e, c->is.relation, c->args[0], expr_add(e, c->args[1], expr_int(e, 1)));
        if (wide.conditions[k]) judge(w, &wide);
    }
}

/* ---- the library ---- */

typedef struct library {
    size_t count;
    rule **list;
} library;

static void read_file(tw_engine *e, const char *path, library *l)
{
    text bytes, why;
    text_init(&bytes);
    text_init(&why);
    if (!file_read(path, &bytes, &why)) fail_msg("%s", why.bytes);
    source s;
    syntax_text t;
    source_init(&s, path, bytes.bytes, bytes.length);
    syntax_text_init(&t);
    parse_text(&s, &t);
    for (size_t k = 0; k < t.count; k++) {
        if (t.statements[k]->kind != STATEMENT_RULE) continue;
        lowering low;
        lowering_init(&low, e, NULL);
        rule *r = lower_rule(&low, t.statements[k]);
        lowering_clear(&low);
        if (!r) { /* it uses a name that the file defines */
            engine_forgive(e);
            continue;
        }
        l->list = realloc(l->list, (l->count + 1) * sizeof *l->list);
        l->list[l->count++] = r;
    }
    syntax_text_clear(&t);
    text_clear(&bytes);
    text_clear(&why);
}

static void test_library(void **state)
{
    (void)state;
    const char *given = getenv("TW_SEED"), *wanted = getenv("TW_TRIALS"), *folder = getenv("TW_STDLIB");
    work w = {.e = tw_engine_new(), .state = given ? strtoull(given, NULL, 10) : (uint64_t)time(NULL)};
    const uint64_t trials = wanted ? strtoull(wanted, NULL, 10) : 150;
    printf("seed %llu\n", (unsigned long long)w.state);
    library l = {0, NULL};
    char names[4096];
    glob_t files;
    snprintf(names, sizeof names, "%s/*.tw", folder ? folder : "stdlib");
    if (glob(names, 0, NULL, &files) == 0)
        for (size_t k = 0; k < files.gl_pathc; k++) read_file(w.e, files.gl_pathv[k], &l);
    globfree(&files);
    /* about 12 mutants a rule */
    w.keep_one_of = trials == 0 ? 1 : 1 + l.count * 12 / trials;
    for (size_t k = 0; k < l.count; k++) {
        mutate_right(&w, l.list[k]);
        mutate_conditions(&w, l.list[k]);
    }
    const size_t real = w.all.made - w.all.equivalent - w.all.unknown;
    printf("%zu rules, %zu mutants: %zu refuted, %zu equivalent, %zu of unchecked rules, %zu missed: %.1f %% of those not "
           "equivalent refuted\n", l.count, w.all.made, w.all.refuted, w.all.equivalent, w.all.unknown, w.all.missed,
           real ? 100.0 * (double)w.all.refuted / (double)real : 100.0);
    assert_true(w.all.missed * 100 <= 2 * real + 100);
    for (size_t k = 0; k < l.count; k++) rule_release(l.list[k]);
    free(l.list);
    tw_engine_free(w.e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_library)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
