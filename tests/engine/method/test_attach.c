/* Recurrences of lanes: against published ones; random hyperexponential integrands (recurrence found, certificate verified
 * by the other way, coefficients those of the direct method, changed certificates refused); indices at which a certificate
 * is void; where none can be had. TW_SEED gives the seed, TW_TRIALS the number of random integrands (default 40). */
#include "texts.h"

#include <stdio.h>
#include <time.h>

#include "engine/method/attach.h"
#include "engine/method/lanes.h"

/* A contribution with exp(-s p), amplitude q, filled with `terms` terms. */
static void make_contribution(tw_engine *e, contribution *c, const char *p, const char *q, slong terms)
{
    contribution_init(c);
    c->method = "watson";
    c->prefactor = expr_int(e, 1);
    c->local.scale = expr_symbol(e, "s");
    c->local.factor = expr_int(e, 1);
    local_form_add(&c->local, expr_symbol(e, "x"), expr_constant_of(e, CONSTANT_INF), text_parse(e, p), text_parse(e, q));
    if (contribution_fill_directly(e, c, expr_symbol(e, "s"), false, terms, NULL) != TW_OK)
        fail_msg("p = %s, q = %s: %s", p, q, e->error.words);
}

static const recurrence *find(tw_engine *e, contribution *c, size_t k, const char *what)
{
    const recurrence *r = NULL;
    if (lane_recurrence(e, c, &c->lanes[k], expr_symbol(e, "s"), &r) != TW_OK) fail_msg("%s: %s", what, e->error.words);
    return r;
}

/* ---- published ---- */

typedef struct known {
    const char *given, *p, *q, *words, *source;
} known;

/* With c[0] the leading coefficient of the lane. Where a source gives the coefficients, the recurrence is the ratio of
 * neighbours. */
static const known KNOWN[] = {
    {NULL, "x", "(1 + x^2)^(-1/2)", "c[n+1] = -(2*n + 1)^2 * c[n]", "the square of 1*3*5*...*(2n - 1)"},
    {NULL, "x", "1/(1 + x)", "c[n+1] = -(n + 1) * c[n]", "DLMF 6.12.1"},
    {"nu > -1/2", "x", "x^(nu - 1/2)*(1 + x/2)^(nu - 1/2)",
     "c[n+1] = -(2*n - 2*nu + 1)*(2*n + 2*nu + 1)/(8*(n + 1)) * c[n]", "DLMF 10.40.2 with 10.17.1"},
    {"a > 0", "x", "x^(a - 1)*(1 + x)^(b - a - 1)", "c[n+1] = -(a + n)*(a - b + n + 1)/(n + 1) * c[n]", "DLMF 13.7.3"},
    {NULL, "x + x^2/2", "1", "c[n+1] = -(2*n + 1) * c[n]", "DLMF 7.12.1"},
    {"a > 0", "x", "(1 + x)^(a - 1)", "c[n+1] = -(n - a + 1) * c[n]", "DLMF 8.11.2"},
    {"a > -1/2", "x", "x^(a - 1/2)*exp(-x^2/2)", "c[n+1] = -(2*a + 4*n + 1)*(2*a + 4*n + 3)/(8*(n + 1)) * c[n]",
     "DLMF 12.9.1, its ratio of neighbours"},
};

static void test_known(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof KNOWN / sizeof *KNOWN; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        if (KNOWN[k].given) text_given(e, KNOWN[k].given);
        contribution c;
        make_contribution(e, &c, KNOWN[k].p, KNOWN[k].q, 5);
        const recurrence *r = find(e, &c, 0, KNOWN[k].source);
        text t;
        text_init(&t);
        assert_int_equal(recurrence_print(e, &t, r), TW_OK);
        assert_string_equal(t.bytes, KNOWN[k].words);
        text_clear(&t);
        assert_int_equal(recurrence_verify(e, r), TW_OK);
        contribution_clear(&c);
        tw_engine_free(e);
    }
}

/* ---- random integrands ---- */

static uint64_t random_state;

static slong below(slong n)
{
    random_state = random_state * 6364136223846793005u + 1442695040888963407u;
    return (slong)((random_state >> 33) % (uint64_t)n);
}

static slong nonzero(void)
{
    slong k = below(6) - 3;
    return k >= 0 ? k + 1 : k;
}

/* 1 + a x + b x^2 */
static void add_polynomial(text *t)
{
    text_addf(t, "(1 + (%ld/%ld)*x", (long)nonzero(), (long)below(3) + 1);
    if (below(2)) text_addf(t, " + (%ld/%ld)*x^2", (long)nonzero(), (long)below(3) + 1);
    text_add(t, ")");
}

static void random_phase(text *t, slong mu)
{
    text_addf(t, "x^%ld", (long)mu);
    slong kind = below(5);
    if (kind >= 2) text_add(t, "*"), add_polynomial(t);
    if (kind == 4) text_add(t, "/"), add_polynomial(t);
}

static void random_amplitude(text *t)
{
    static const char *const powers[] = {"(-1)", "(1/2)", "(-1/3)", "(2/3)", "2", "(-5/2)", "(-2)"};
    text_addf(t, "x^(%ld/%ld)", (long)below(3), (long)below(3) + 1);
    for (slong k = below(3); k >= 0; k--) {
        text_add(t, "*");
        add_polynomial(t);
        text_addf(t, "^%s", powers[below(7)]);
    }
    if (below(4) == 0) text_addf(t, "*exp(%ld*x)", (long)nonzero());
    if (below(6) == 0) text_addf(t, "*exp(-%ld*x^2)", (long)below(3) + 1);
}

/* The identity with one coefficient changed, and with another certificate, is refused. */
static void refuse_changes(tw_engine *e, const recurrence *r)
{
    recurrence wrong = *r;
    expr **c = base_alloc((size_t)(r->order + 1) * sizeof *c);
    memcpy(c, r->c, (size_t)(r->order + 1) * sizeof *c);
    slong at = below(r->order + 1);
    c[at] = expr_add(e, c[at], expr_int(e, nonzero()));
    wrong.c = c;
    assert_int_equal(recurrence_verify(e, &wrong), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_REFUTED);
    engine_forgive(e);
    certificate one = r->certificates[0];
    one.r = expr_add(e, one.r, expr_div(e, expr_int(e, nonzero()), expr_add(e, one.x, expr_int(e, 17))));
    wrong = *r;
    wrong.certificates = &one;
    wrong.certificate_count = 1;
    assert_int_equal(recurrence_verify(e, &wrong), TW_ERROR);
    assert_int_equal(e->error.kind, ERROR_REFUTED);
    engine_forgive(e);
    free(c);
}

/* 40 coefficients by the recurrence from its first values are those of the direct method. */
static void compare_run(tw_engine *e, const recurrence *r, const lane *l, const char *what)
{
    slong count = l->c.count, first = r->needed > r->order ? r->needed : r->order;
    if (!r->p || !l->c.q || first >= count) return;
    fmpq *c = _fmpq_vec_init(count);
    for (slong n = 0; n < first; n++) fmpq_set(&c[n], &l->c.q[n]);
    assert_int_equal(recurrence_extend(e, r, c, first, count), TW_OK);
    for (slong n = 0; n < count; n++)
        if (!fmpq_equal(&c[n], &l->c.q[n])) fail_msg("%s: c[%ld] differs", what, (long)n);
    _fmpq_vec_clear(c, count);
}

static void check_one(slong trial, slong *voids, slong *greatest)
{
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    slong mu = 1 + below(3);
    text p, q, what;
    text_init(&p), text_init(&q), text_init(&what);
    random_phase(&p, mu);
    random_amplitude(&q);
    text_addf(&what, "number %ld: p = %s, q = %s", (long)trial, p.bytes, q.bytes);
    contribution c;
    make_contribution(e, &c, p.bytes, q.bytes, 40 * mu);
    for (size_t k = 0; k < c.lane_count && !c.terminates; k++) {
        const recurrence *r = find(e, &c, k, what.bytes);
        assert_int_equal(r->label, RECURRENCE_PROVED);
        if (recurrence_verify(e, r) != TW_OK) fail_msg("%s: %s", what.bytes, e->error.words);
        expr *left, *right;
        slong compared;
        slong misfit = lane_compare(e, &c, &c.lanes[k], expr_symbol(e, "s"), false, r, 40, &compared, &left, &right);
        if (misfit != -1) fail_msg("%s: misfit %ld", what.bytes, (long)misfit);
        compare_run(e, r, &c.lanes[k], what.bytes);
        if (k == 0) refuse_changes(e, r);
        *voids += r->void_count > 0;
        if (r->order > *greatest) *greatest = r->order;
    }
    contribution_clear(&c);
    text_clear(&p), text_clear(&q), text_clear(&what);
    tw_engine_free(e);
}

static void test_random(void **state)
{
    (void)state;
    slong trials = getenv("TW_TRIALS") ? strtol(getenv("TW_TRIALS"), NULL, 10) : 40, voids = 0, greatest = 0;
    for (slong k = 0; k < trials; k++) check_one(k, &voids, &greatest);
    printf("%ld integrands, %ld lanes with indices left out, greatest order %ld\n", (long)trials, (long)voids,
           (long)greatest);
}

/* ---- two sides of an interior point ---- */

/* Both branches p(x), p(-x), with the amplitudes q(x), q(-x). */
static void test_interior(void **state)
{
    static const known cases[] = {
        {NULL, "x^2 + x^3/3", "1", "c[n+1] = (6*n + 1)*(6*n + 5)/(48*(n + 1)) * c[n]",
         "DLMF 9.7.2: u_k with zeta = 2 s/3, its ratio of neighbours"},
        {NULL, "cosh(x) - 1", "1", "c[n+1] = -(2*n + 1)^2/(8*(n + 1)) * c[n]", "DLMF 10.40.2, nu = 0"},
        {"nu > 0", "cosh(x) - 1", "cosh(nu*x)", "c[n+1] = -(2*n - 2*nu + 1)*(2*n + 2*nu + 1)/(8*(n + 1)) * c[n]",
         "DLMF 10.40.2 with 10.17.1"},
        {NULL, "1 - cos(x)", "1", "c[n+1] = (2*n + 1)^2/(8*(n + 1)) * c[n]", "DLMF 10.40.1, nu = 0"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        if (cases[k].given) text_given(e, cases[k].given);
        expr *x = expr_symbol(e, "x"), *s = expr_symbol(e, "s"), *back = expr_neg(e, x), *inf = expr_constant_of(e, CONSTANT_INF);
        expr *p = text_parse(e, cases[k].p), *q = text_parse(e, cases[k].q);
        contribution c;
        contribution_init(&c);
        c.method = "watson";
        c.prefactor = c.local.factor = expr_int(e, 1);
        c.local.scale = s;
        local_form_add(&c.local, x, inf, p, q);
        local_form_add(&c.local, x, inf, expr_substitute(e, p, x, back), expr_substitute(e, q, x, back));
        if (contribution_fill_directly(e, &c, s, false, 8, NULL) != TW_OK) fail_msg("%s: %s", cases[k].p, e->error.words);
        assert_int_equal((int)c.lane_count, 1);
        const recurrence *r = find(e, &c, 0, cases[k].source);
        text t;
        text_init(&t);
        assert_int_equal(recurrence_print(e, &t, r), TW_OK);
        assert_string_equal(t.bytes, cases[k].words);
        text_clear(&t);
        assert_int_equal(recurrence_verify(e, r), TW_OK);
        contribution_clear(&c);
        tw_engine_free(e);
    }
}

/* ---- indices left out ---- */

/* The certificate's denominator vanishes at n = 0, and the relation is false there. */
static void test_void(void **state)
{
    (void)state;
    tw_engine *e = text_engine("s", LARGE_POSITIVE);
    contribution c;
    make_contribution(e, &c, "x^3*(1 + 2/3*x)", "x*(1 - 2/3*x)^2", 120);
    size_t left_out = 0;
    for (size_t k = 0; k < c.lane_count; k++) {
        const recurrence *r = find(e, &c, k, "void");
        assert_int_equal(recurrence_verify(e, r), TW_OK);
        if (r->void_count == 0) continue;
        left_out++;
        assert_int_equal(r->void_count, 1);
        assert_int_equal(r->voids[0], 0);
        expr **list = base_alloc((size_t)c.lanes[k].c.count * sizeof *list);
        for (slong n = 0; n < c.lanes[k].c.count; n++) list[n] = coefficient_expr(e, &c.lanes[k].c, n);
        assert_int_equal(recurrence_misfit(e, r, NULL, list, c.lanes[k].c.count), -1);
        recurrence everywhere = *r;
        everywhere.void_count = 0;
        assert_int_equal(recurrence_misfit(e, &everywhere, NULL, list, c.lanes[k].c.count), 0);
        free(list);
        compare_run(e, r, &c.lanes[k], "void");
    }
    assert_true(left_out == 1);
    contribution_clear(&c);
    tw_engine_free(e);
}

/* ---- refusals ---- */

static void test_none(void **state)
{
    static const struct {
        const char *p, *q, *part;
    } cases[] = {
        {"x - log(1 + x)", "1/(1 + x)", "no finite recurrence exists"},
        {"exp(x) - x - 1", "exp(x)", "no finite recurrence exists"},
        {"x", "log(1 + x)^2", "no recurrence can be proved"},
        {"x", "1/(1 + exp(2*x))", "no finite recurrence exists"},
        {"x", "tan(x)/x", "no recurrence can be proved"},
        {"x^2", "1/(2 + cos(x))", "no finite recurrence exists"},
    };
    (void)state;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        tw_engine *e = text_engine("s", LARGE_POSITIVE);
        contribution c;
        make_contribution(e, &c, cases[k].p, cases[k].q, 5);
        const recurrence *r;
        assert_int_equal(lane_recurrence(e, &c, &c.lanes[0], expr_symbol(e, "s"), &r), TW_ERROR);
        assert_int_equal(e->error.kind, ERROR_UNSUITABLE);
        assert_non_null(strstr(e->error.words, cases[k].part));
        engine_forgive(e);
        assert_int_equal(lane_recurrence(e, &c, &c.lanes[0], expr_symbol(e, "s"), &r), TW_ERROR); /* remembered */
        contribution_clear(&c);
        tw_engine_free(e);
    }
}

int main(void)
{
    random_state = getenv("TW_SEED") ? strtoull(getenv("TW_SEED"), NULL, 10) : (uint64_t)time(NULL) * 2654435761u;
    printf("test_attach: TW_SEED=%llu\n", (unsigned long long)random_state);
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_known),
        cmocka_unit_test(test_random),
        cmocka_unit_test(test_interior),
        cmocka_unit_test(test_void),
        cmocka_unit_test(test_none),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
