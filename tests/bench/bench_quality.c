/* Tightness of the proved bounds as a user meets them, the worst of each family: W1 to W4, the reference cases of watson, parts and
 * symbolic-parameter (numbers for the parameters), freshly seeded random integrals. TW_SEED, TW_TRIALS (default 200); TW_LIST=1
 * prints every row. */
#include "tests/engine/numeric/quality.h"

typedef struct quality_case {
    const char *family, *integral;
    slong s[3];
    const char *parameter, *value;
} quality_case;

static const quality_case cases[] = {
    {"W", "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx", {5, 20, 100}},
    {"W", "integral from 0 to inf of exp(-s*x)*cos(x)/(1+x) dx", {5, 20, 100}},
    {"W", "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx", {5, 20, 100}},
    {"W", "integral from 0 to inf of exp(-s*x)*cosh(3*x)*sqrt(1+x) dx", {5, 20, 100}},
    {"watson", "integral from 0 to inf of exp(-s*x)/(2+3*x+x^2) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1+x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-s*x)*(1+x)^(1/3)/(1+x^2) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-s*x)*log(1+2*x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of x^(-1/2)*exp(-s*x)*cos(x)/(1+x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-s*x^2)/(1+x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-s*x^3)*exp(-x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to 2 of exp(-s*x)/(1+x)^2 dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-3*s*x)*tanh(x) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-s*x)/(sqrt(x)*(1+x)) dx", {5, 12, 40}},
    {"watson", "integral from 0 to inf of exp(-x)/(1+s^(-1)*x)^(5/2) dx", {5, 12, 40}},
    {"parts", "integral from 1 to inf of exp(-s*x)/(x^2*(1+x)) dx", {5, 12, 40}},
    {"parts", "integral from 2 to inf of exp(-s*x)/x^3 dx", {5, 12, 40}},
    {"symbolic", "integral from 0 to inf of exp(-s*x)*(1+x)^(a-1) dx", {5, 12, 40}, "a", "1/3"},
    {"symbolic", "integral from 0 to inf of exp(-s*x)*(1+x)^(a-1) dx", {5, 12, 40}, "a", "12/5"},
    {"symbolic", "integral from 0 to inf of x^nu*exp(-s*x)/(1+x^2) dx", {5, 12, 40}, "nu", "1/3"},
    {"symbolic", "integral from 0 to inf of x^nu*exp(-s*x)/(1+x^2) dx", {5, 12, 40}, "nu", "5/2"},
};

typedef struct worst {
    const char *family;
    int rows, proved_one, proved_all, over_one, over_all, wrong;
    double one, all;
    char which_one[640], which_all[640];
} worst;

static void worst_add(worst *w, const char *words, slong s, const quality *q)
{
    char *list = getenv("TW_LIST");
    w->rows++;
    w->proved_one += q->proved_one;
    w->proved_all += q->proved_all;
    w->wrong += q->wrong;
    w->over_one += q->one > 1.05;
    w->over_all += q->all > 2.5;
    if (q->one > w->one) {
        w->one = q->one;
        snprintf(w->which_one, sizeof w->which_one, "%s at s = %ld with %ld terms", words, (long)s, (long)q->terms);
    }
    if (q->all > w->all) {
        w->all = q->all;
        snprintf(w->which_all, sizeof w->which_all, "%s at s = %ld with %ld terms", words, (long)s, (long)q->terms);
    }
    if (q->wrong || !q->proved_one || !q->proved_all || (list && *list == '1'))
        quality_print(words, s, q);
}

static void worst_print(const worst *w)
{
    printf("%-10s %4d rows, proved %d at one s, %d for all s, %d wrong\n", w->family, w->rows, w->proved_one, w->proved_all, w->wrong);
    printf("  one s: worst %.4f, above 1.05: %d   %s\n", w->one, w->over_one, w->which_one);
    printf("  all s: worst %.3f, above 2.5: %d   %s\n", w->all, w->over_all, w->which_all);
}

int main(void)
{
    const char *count = getenv("TW_TRIALS");
    long trials = count ? atol(count) : 200;
    worst w = {0};
    dice d = {dice_seed("bench_quality")};
    int wrong = 0;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        const quality_case *c = cases + k;
        if (!w.family || strcmp(w.family, c->family) != 0) {
            if (w.family)
                worst_print(&w);
            wrong += w.wrong;
            w = (worst){c->family};
        }
        for (int j = 0; j < 3; j++) {
            quality q = quality_run(c->integral, c->s[j] >= 100 ? 60 : 12, c->s[j], c->parameter, c->value, true);
            worst_add(&w, c->integral, c->s[j], &q);
        }
    }
    worst_print(&w);
    wrong += w.wrong;
    w = (worst){"random"};
    for (long k = 0; w.rows < trials && k < 5 * trials; k++) {
        char words[500];
        slong asked, s;
        random_integral(&d, words, sizeof words);
        asked = dice_between(&d, 1, 12);
        s = dice_between(&d, 3, 60);
        quality q = quality_run(words, asked, s, NULL, NULL, true);
        if (q.expanded)
            worst_add(&w, words, s, &q);
    }
    worst_print(&w);
    return wrong + w.wrong > 0;
}
