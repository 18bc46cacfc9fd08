/* The integers of saddles on paths: the table of published and hand-made cases, random polynomials against the two independent
 * properties that the integers must have, and refusals. TW_SEED, TW_TRIALS as everywhere. */
#include "engine/method/thimble.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <cmocka.h>

#include "lang/lower.h"
#include "lang/parse.h"

static expr *read_expr(tw_engine *e, const char *words)
{
    source s;
    syntax_text t;
    source_init(&s, "<test>", words, strlen(words));
    syntax_text_init(&t);
    syntax *a = parse_expression_text(&s, &t);
    expr *made = NULL;
    if (a) {
        lowering l;
        lowering_init(&l, e, NULL);
        made = lower_expression(&l, a);
        lowering_clear(&l);
    }
    syntax_text_clear(&t);
    if (!made)
        fail_msg("cannot read `%s`: %s", words, e->error.words ? e->error.words : "syntax");
    return made;
}

/* Directions in units of pi; vertices as pairs. */
typedef struct path {
    bool infinite[2];
    double toward[2];
    size_t count;
    double at[4][2];
} path;

static void make_route(route *r, const path *p)
{
    route_init(r, p->count);
    for (size_t k = 0; k < p->count; k++) {
        arb_set_d(acb_realref(r->at + k), p->at[k][0]);
        arb_set_d(acb_imagref(r->at + k), p->at[k][1]);
    }
    for (int k = 0; k < 2; k++) {
        r->infinite[k] = p->infinite[k];
        arb_t t;
        arb_init(t);
        arb_set_d(t, p->toward[k]);
        arb_sin_cos_pi(acb_imagref(r->toward[k]), acb_realref(r->toward[k]), t, 128);
        arb_clear(t);
    }
}

/* The integer of the outgoing half branch nearest to the path's sense is not fixed by theory but by the root chosen: compare moduli,
 * in the order of the saddles' real parts, then imaginary parts. */
static int by_place(const void *a, const void *b)
{
    const share *x = *(const share *const *)a, *y = *(const share *const *)b;
    double u = arf_get_d(arb_midref(acb_realref(x->at->z)), ARF_RND_NEAR), v = arf_get_d(arb_midref(acb_realref(y->at->z)), ARF_RND_NEAR);
    if (u < v - 1e-9 || u > v + 1e-9)
        return u < v ? -1 : 1;
    u = arf_get_d(arb_midref(acb_imagref(x->at->z)), ARF_RND_NEAR);
    v = arf_get_d(arb_midref(acb_imagref(y->at->z)), ARF_RND_NEAR);
    return u < v ? -1 : u > v ? 1 : 0;
}

static void expect(tw_engine *e, const char *phase, const path *p, const char *wanted)
{
    landscape l;
    route r;
    shares s;
    bool found;
    char *why, got[200] = "";
    expr *z = expr_symbol(e, "z");
    if (!landscape_read(&l, e, read_expr(e, phase), z))
        fail_msg("%s is not read", phase);
    make_route(&r, p);
    const spot *ends[2] = {NULL, NULL};
    for (size_t k = 0; k < l.count; k++)
        for (int j = 0; j < 2; j++)
            if (!p->infinite[j] && l.spots[k].order < 0 && acb_overlaps(l.spots[k].z, r.at + (j ? r.count - 1 : 0)))
                r.valley[j] = true;
    assert_int_equal(thimbles_find(e, &s, &l, &r, ends, NULL, 0, &found, &why), TW_OK);
    if (!found)
        fail_msg("%s: %s", phase, why);
    const share *order[40];
    for (size_t k = 0; k < s.count; k++)
        order[k] = s.list + k;
    qsort(order, s.count, sizeof *order, by_place);
    for (size_t k = 0; k < s.count; k++) {
        slong sum = 0;
        for (slong j = 0; j < order[k]->halves; j++)
            sum += order[k]->n[j];
        assert_int_equal(sum, 0);
        sprintf(got + strlen(got), "%s%ld%s", k ? " " : "", labs(order[k]->n[0]), order[k]->stokes ? "*" : "");
    }
    if (strcmp(got, wanted) != 0)
        fail_msg("%s: integers %s, expected %s", phase, got, wanted);
    shares_clear(&s);
    route_clear(&r);
    landscape_clear(&l);
}

/* The saddles in order of their real, then imaginary parts. */
static void test_table(void **state)
{
    (void)state;
    tw_engine *e = tw_engine_new();
    const path airy = {{true, true}, {-1. / 3, 1. / 3}, 1, {{0, 0}}}, line = {{true, true}, {1, 0}, 1, {{0, 0}}};
    const path round = {{true, false}, {1, 0}, 3, {{-1, -1}, {1, -1}, {0, 0}}};
    expect(e, "z - z^3/3", &airy, "0 1");
    /* saddles -0.34 - 1.16 i ... of z^3 + z + i: 1.32 i is the deepest and has the integer 0 */
    expect(e, "z^4/4 + z^2/2 + i*z", &line, "1 0 1");
    expect(e, "z^4/4 - z^2/2", &line, "1 1* 1");
    expect(e, "(1 + z^2)/(2*z)", &(path){{false, true}, {0, 0}, 2, {{0, 0}, {1, 0}}}, "0 1");
    expect(e, "z^2/2", &line, "1");
    expect(e, "z^2/2", &(path){{true, true}, {1, 0}, 3, {{-1, 0}, {0, 3}, {1, 0}}}, "1");
    expect(e, "z^4", &line, "1");
    (void)round;
    tw_engine_free(e);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_table)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
