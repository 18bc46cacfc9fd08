/* Tries rules at samples. Knows how to value an expression by certified balls, nothing of how samples are found. Its
 * one idea: balls are proofs, so a single disjoint pair refutes a rule for good, while overlaps count only when both
 * balls are small. */
#include "engine/rewrite/check.h"

#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/ball/quadrature.h"
#include "engine/rewrite/prove.h"
#include "engine/rewrite/sample.h"

/* Digits of most pairs and of every fourth; samples tried at most; seconds for one side and, by default, for a rule. */
enum { DIGITS = 14, DIGITS_HIGH = 28, SAMPLE_LIMIT = 120, PAIRS_WANTED = 28, PAIRS_PROVED = 6 };
static const double side_seconds = 2.0, rule_seconds = 30.0;

typedef enum side_kind { SIDE_BALL, SIDE_DIVERGES, SIDE_NOTHING } side_kind;

typedef struct checking {
    tw_engine *e;
    rule *r;
    sampler *samples;
    check_report report;
    acb_t left, right;
    char *trouble;         /* the first reason why a side had no ball */
    double until;
} checking;

static double seconds_now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* ---- one side ---- */

/* An error of this try only: forgiven. Time counts as such while the caller's own deadline has not passed. */
static bool forgive_try(tw_engine *e, double deadline)
{
    const error_kind k = e->error.kind;
    if (k == ERROR_INTERRUPT || k == ERROR_MEMORY) return false;
    if (k == ERROR_TIME && deadline > 0 && seconds_now() >= deadline) return false;
    engine_forgive(e);
    return true;
}

typedef struct side_try {
    tw_engine *e;
    acb_ptr out;
    expr *a;
    slong digits;
} side_try;

static tw_status side_quadrature(void *host)
{
    const side_try *t = host;
    const env nothing = {0, NULL, NULL};
    return quadrature(t->e, t->out, t->a, &nothing, t->digits, true, NULL);
}

/* An edge of its own: a library call that goes on past this side's seconds is left, and only this side has no ball. */
static tw_status side_value(checking *c, acb_t out, expr *a, slong digits, side_kind *kind)
{
    tw_engine *e = c->e;
    const double deadline = e->deadline, now = seconds_now();
    double own = now + side_seconds < c->until ? now + side_seconds : c->until;
    if (own < now + 0.05) own = now + 0.05;
    if (deadline <= 0 || own < deadline) e->deadline = own;
    side_try here = {e, out, a, digits};
    tw_status status = engine_protect(e, side_quadrature, &here);
    e->deadline = deadline;
    *kind = status == TW_OK && acb_is_finite(out) ? SIDE_BALL : SIDE_NOTHING;
    if (status == TW_OK) return TW_OK;
    if (e->error.kind == ERROR_DIVERGENT) *kind = SIDE_DIVERGES;
    if (!c->trouble && *kind == SIDE_NOTHING) c->trouble = base_copy(e->error.words);
    return forgive_try(e, deadline) ? TW_OK : TW_ERROR;
}

/* ---- words ---- */

/* "0.1234567 +/- 3.2e-15" */
static void add_real(text *out, const arb_t x)
{
    char *words = arb_get_str(x, 12, 0);
    for (const char *p = words; *p; p++)
        if (*p != '[' && *p != ']') text_add_char(out, *p);
    flint_free(words);
}

static void add_ball(text *out, const acb_t z)
{
    add_real(out, acb_realref(z));
    if (arb_is_zero(acb_imagref(z))) return;
    text_add(out, " + i*(");
    add_real(out, acb_imagref(z));
    text_add_char(out, ')');
}

static void add_side(text *out, const char *name, const acb_t z, side_kind kind)
{
    text_addf(out, "the %s side ", name);
    if (kind == SIDE_DIVERGES) {
        text_add(out, "diverges");
        return;
    }
    text_add(out, "is ");
    add_ball(out, z);
}

static void refute(checking *c, side_kind left, side_kind right)
{
    text words;
    text_init(&words);
    sampler_describe(c->samples, &words);
    text_add(&words, words.length ? ": " : "");
    add_side(&words, "left", c->left, left);
    text_add(&words, ", ");
    add_side(&words, "right", c->right, right);
    free(c->r->finding);
    text at;
    text_init(&at);
    text_addf(&at, "%s%s", words.length && c->r->count ? "at " : "", words.bytes);
    c->r->finding = text_take(&at);
    c->r->status = RULE_REFUTED;
    text_clear(&words);
    text_clear(&at);
}

/* ---- one pair ---- */

/* Is the relative radius below 1e-10? An exact ball counts, zero too. */
static bool is_sharp(const acb_t z)
{
    if (acb_is_exact(z)) return true;
    arf_t low, radius;
    mag_t m;
    arf_init(low);
    arf_init(radius);
    mag_init(m);
    acb_get_abs_lbound_arf(low, z, 64);
    mag_hypot(m, arb_radref(acb_realref(z)), arb_radref(acb_imagref(z)));
    arf_set_mag(radius, m);
    arf_mul_ui(radius, radius, 10000000000u, 64, ARF_RND_CEIL);
    const bool sharp = arf_cmp(radius, low) < 0;
    arf_clear(low);
    arf_clear(radius);
    mag_clear(m);
    return sharp;
}

static tw_status try_sample(checking *c, bool *refuted)
{
    tw_engine *e = c->e;
    expr *left = sampler_put(c->samples, c->r->left);
    expr *right = e->error.kind == ERROR_NONE ? sampler_put(c->samples, c->r->right) : NULL;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    c->report.samples++;
    *refuted = false;
    if (!left || !right) {
        c->report.without++;
        return TW_OK;
    }
    const slong digits = c->report.samples % 4 == 3 ? DIGITS_HIGH : DIGITS;
    side_kind l, r = SIDE_NOTHING;
    tw_status status = side_value(c, c->left, left, digits, &l);
    if (status == TW_OK && l != SIDE_NOTHING) status = side_value(c, c->right, right, digits, &r);
    if (status != TW_OK) return TW_ERROR;
    if (l == SIDE_NOTHING || r == SIDE_NOTHING || (l == SIDE_DIVERGES && r == SIDE_DIVERGES)) {
        c->report.without++;
        return TW_OK;
    }
    *refuted = l != SIDE_BALL || r != SIDE_BALL || !acb_overlaps(c->left, c->right);
    if (*refuted) refute(c, l, r);
    else c->report.pairs += left == right || (is_sharp(c->left) && is_sharp(c->right));
    return TW_OK;
}

/* ---- the verdict ---- */

static void conclude(checking *c)
{
    rule *r = c->r;
    text words;
    text_init(&words);
    if (c->report.engine_proof) {
        r->status = RULE_PROVED;
        text_add(&words, "by the engine: both sides have the same normal form");
    } else if (c->report.pairs >= CHECK_PAIRS) {
        r->status = RULE_PASSED;
        text_addf(&words, "%zu pairs of certified balls agree", c->report.pairs);
    } else {
        r->status = RULE_UNCHECKED;
        if (c->report.samples == 0) text_add(&words, "no admissible values were found");
        else text_addf(&words, "only %zu of %zu samples gave two sharp balls, %d are needed", c->report.pairs,
                       c->report.samples, CHECK_PAIRS);
        if (c->report.samples > 0 && c->trouble) text_addf(&words, " (%.160s)", c->trouble);
    }
    free(r->finding);
    r->finding = text_take(&words);
    text_clear(&words);
}

static tw_status check_samples(checking *c, bool *refuted)
{
    const size_t wanted = c->report.engine_proof ? PAIRS_PROVED : PAIRS_WANTED;
    bool found = true;
    *refuted = false;
    while (found && !*refuted && c->report.pairs < wanted && c->report.samples < SAMPLE_LIMIT) {
        if (seconds_now() > c->until) break;
        if (c->report.samples >= 40 && c->report.pairs * 8 < c->report.samples) break;
        if (sampler_next(c->samples, &found) != TW_OK) return TW_ERROR;
        if (found && try_sample(c, refuted) != TW_OK) return TW_ERROR;
        if (found && c->r->count == 0 && expr_is_closed_value(c->r->left) && c->report.samples >= CHECK_PAIRS) break;
    }
    return TW_OK;
}

tw_status rule_check(tw_engine *e, rule *r, uint64_t seed, double seconds, check_report *report)
{
    checking c = {.e = e, .r = r, .until = seconds_now() + (seconds > 0 ? seconds : rule_seconds)};
    acb_init(c.left);
    acb_init(c.right);
    engine_progress(e, "checking a rule");
    c.report.engine_proof = rule_prove(e, r);
    tw_status status = e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    bool refuted = false;
    if (status == TW_OK) {
        c.samples = sampler_new(e, r, seed);
        status = check_samples(&c, &refuted);
    }
    if (status == TW_OK) {
        if (!refuted) conclude(&c);
        r->checked = true;
    }
    if (report) *report = c.report;
    sampler_free(c.samples);
    free(c.trouble);
    acb_clear(c.left);
    acb_clear(c.right);
    return status;
}
