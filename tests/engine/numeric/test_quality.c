/* Tightness of the proved bounds on random integrals, as `evaluate` and `remainder` give them. bench_quality measures the worst; this
 * notices when the machine as a whole has become worse, so it asks for most of the rows and for no single one: the rest may have a
 * zero near the point, where no bound of the form is near it. TW_SEED, TW_TRIALS (default 40). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "tests/engine/numeric/quality.h"

static void most_are_tight(void **state)
{
    const char *count = getenv("TW_TRIALS");
    long wanted = count ? atol(count) : 40, rows = 0, judged = 0, tight = 0, near = 0, wide = 0, made = 0;
    double worst_one = 0, worst_all = 0;
    dice d = {dice_seed("test_quality")};
    (void)state;
    for (long k = 0; rows < wanted && k < 5 * wanted; k++) {
        char words[500];
        slong asked, s;
        random_integral(&d, words, sizeof words);
        asked = dice_between(&d, 1, 12);
        s = dice_between(&d, 3, 60);
        quality q = quality_run(words, asked, s, NULL, NULL, true);
        if (!q.expanded)
            continue;
        rows++;
        if (q.wrong || !q.proved_one || !q.proved_all)
            quality_print(words, s, &q);
        assert_false(q.wrong);
        judged += q.judged;
        tight += q.judged && q.one < 1.05;
        made += q.all > 0;
        near += q.all > 0 && q.all < 2.5;
        wide += q.all > 10;
        worst_one = fmax(worst_one, q.one);
        worst_all = fmax(worst_all, q.all);
    }
    printf("%ld rows: %ld judged, %ld within 1.05 at one s (worst %.4f); %ld for all s, %ld within 2.5, %ld beyond 10 (worst %.3g)\n", rows,
           judged, tight, worst_one, made, near, wide, worst_all);
    assert_true(rows >= wanted);
    assert_true(100 * judged >= 85 * rows);
    assert_true(100 * tight >= 90 * judged);
    assert_true(100 * near >= 70 * made);
    assert_true(100 * wide <= 15 * made);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(most_are_tight)};
    return cmocka_run_group_tests_name("test_quality", tests, NULL, NULL);
}
