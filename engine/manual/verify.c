/* The check that every move passes: the value before and after as certified balls at sample values of the parameters. The
 * one idea: disjoint balls refute a move whatever its theorem says, and are shown with the values; overlapping ones are
 * counted. Samples are drawn from the facts, the same for every move, so that a script runs the same way twice. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/ball/quadrature.h"
#include "engine/manual/work.h"

enum { SAMPLES_WANTED = 2, SAMPLES_MOST = 5, DIGITS = 8, VALUES_KEPT = 12 };
#define SECONDS_EACH 2.0

/* ---- samples ---- */

static uint64_t hash(const char *name, uint64_t salt)
{
    uint64_t h = 14695981039346656037u ^ (salt * 0x9E3779B97F4A7C15u);
    for (; *name; name++) h = (h ^ (unsigned char)*name) * 1099511628211u;
    h ^= h >> 31;
    h *= 0xBF58476D1CE4E5B9u;
    return h ^ (h >> 29);
}

/* A value that the facts about this symbol alone allow. Between two ends: a fraction of the way; else some way from the
 * known end. */
static expr *sample_of(tw_engine *e, expr *symbol, slong trial)
{
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    int known = facts_interval(e, symbol, low, high);
    uint64_t h = hash(symbol->is.name, (uint64_t)trial);
    expr *large = NULL, *value;
    bool is_large = facts_large(e, &large) != LARGE_NONE && large == symbol;
    if (facts_is_integer(e, symbol)) {
        slong whole = (slong)(h % 4) + (is_large ? 2 : 0);
        fmpz_t base;
        fmpz_init(base);
        if (known & 1) fmpz_cdiv_q(base, fmpq_numref(low), fmpq_denref(low));
        else if (known & 2) {
            fmpz_fdiv_q(base, fmpq_numref(high), fmpq_denref(high));
            whole = -whole;
        }
        if ((known & 4) && fmpz_is_one(fmpq_denref(low))) fmpz_add_ui(base, base, 1);
        value = expr_add(e, expr_fmpz(e, base), expr_int(e, whole));
        fmpz_clear(base);
    } else if ((known & 3) == 3) {
        value = expr_add(e, expr_fmpq(e, low), expr_mul(e, expr_frac(e, 1 + (slong)(h % 7), 9),
                                                         expr_sub(e, expr_fmpq(e, high), expr_fmpq(e, low))));
    } else {
        bool shrinks = is_large && facts_large(e, &large) == LARGE_SMALL;
        slong num = 2 + (slong)(h % 11), den = shrinks ? 8 + (slong)(h % 5) : is_large ? 2 : 3 + (slong)((h >> 8) % 3);
        expr *away = expr_frac(e, is_large && !shrinks ? num + 4 : num, den);
        value = known & 1 ? expr_add(e, expr_fmpq(e, low), away) : known & 2 ? expr_sub(e, expr_fmpq(e, high), away) : away;
    }
    fmpq_clear(low);
    fmpq_clear(high);
    return value;
}

typedef struct sample {
    size_t count;
    expr **symbols, **values;
} sample;

static void sample_free(sample *s)
{
    free(s->symbols);
    free(s->values);
    memset(s, 0, sizeof *s);
}

/* Facts about several symbols at once may forbid a sample. */
static bool facts_allow(tw_engine *e, const sample *s)
{
    for (size_t k = 0; k < facts_count(e); k++) {
        condition_label l;
        expr *fact = facts_at(e, k, &l), *here = expr_substitute_all(e, fact, s->symbols, s->values, s->count);
        if (!here) return forgive(e) && false;
        if (here != fact && decide(e, here, NULL) == ANSWER_NO) return false;
        if (!forgive(e)) return false;
    }
    return true;
}

static bool sample_draw(tw_engine *e, sample *s, expr *before, expr *after, slong trial)
{
    expr *pair = expr_relation_of(e, RELATION_EQUAL, before, after);
    memset(s, 0, sizeof *s);
    if (!pair) return forgive(e) && false;
    s->count = expr_symbols(pair->kind == EXPR_RELATION ? pair : before, &s->symbols);
    s->values = base_alloc((s->count + 1) * sizeof *s->values);
    for (size_t k = 0; k < s->count; k++)
        if (!(s->values[k] = sample_of(e, s->symbols[k], trial))) return false;
    return facts_allow(e, s);
}

/* ---- balls ---- */

struct manual_values {
    size_t next;
    struct {
        expr *f;
        slong trial;
        error_kind kind; /* why there is no ball; NONE: there is one */
        acb_t value;
    } list[VALUES_KEPT];
};

void manual_values_free(struct manual_values *v)
{
    for (size_t k = 0; v && k < VALUES_KEPT; k++) acb_clear(v->list[k].value);
    free(v);
}

static bool known_value(const manual *m, expr *f, slong trial, acb_t out, error_kind *kind)
{
    for (size_t k = 0; m->values && k < VALUES_KEPT; k++)
        if (m->values->list[k].f == f && m->values->list[k].trial == trial) {
            acb_set(out, m->values->list[k].value);
            *kind = m->values->list[k].kind;
            return true;
        }
    return false;
}

static void keep_value(manual *m, expr *f, slong trial, const acb_t value, error_kind kind)
{
    if (!m->values) {
        m->values = base_alloc(sizeof *m->values);
        memset(m->values, 0, sizeof *m->values);
        for (size_t k = 0; k < VALUES_KEPT; k++) acb_init(m->values->list[k].value);
    }
    size_t k = m->values->next++ % VALUES_KEPT;
    m->values->list[k].f = f;
    m->values->list[k].trial = trial;
    m->values->list[k].kind = kind;
    acb_set(m->values->list[k].value, value);
}

typedef struct ball_job {
    tw_engine *e;
    acb_ptr out;
    expr *f;
    const env *at;
} ball_job;

static tw_status run_ball(void *host)
{
    ball_job *j = host;
    return quadrature(j->e, j->out, j->f, j->at, DIGITS, true, NULL);
}

/* The value, within an allowance of its own so that one hard sample does not eat the request's. False: none was had; a
 * spent budget of the request stays an error. *kind: why none was had. */
static bool ball_at(manual *m, acb_t out, expr *f, const sample *s, slong trial, error_kind *kind)
{
    tw_engine *e = m->e;
    if (known_value(m, f, trial, out, kind)) return *kind == ERROR_NONE;
    env at = {s->count, s->symbols, s->values};
    double deadline = e->deadline, mine = budget_clock() + SECONDS_EACH;
    bool lent = deadline == 0 || mine < deadline;
    if (lent) e->deadline = mine;
    ball_job job = {e, out, f, &at};
    tw_status status = engine_protect(e, run_ball, &job); /* a library call may be left in the middle */
    e->deadline = deadline;
    *kind = status == TW_OK ? ERROR_NONE : e->error.kind;
    if (status != TW_OK && e->error.kind == ERROR_TIME && lent) engine_forgive(e);
    if (status != TW_OK && !forgive(e)) return false;
    bool good = status == TW_OK && acb_is_finite(out);
    if (!good && *kind == ERROR_NONE) *kind = ERROR_PRECISION;
    keep_value(m, f, trial, out, *kind);
    return good;
}

static void add_values(tw_engine *e, text *out, const sample *s)
{
    for (size_t k = 0; k < s->count; k++) {
        text_addf(out, k ? ", %s = " : "%s = ", s->symbols[k]->is.name);
        expr_print(e, out, s->values[k]);
    }
}

static void add_ball(text *out, const acb_t z)
{
    char *re = arb_get_str(acb_realref(z), 7, 0);
    text_add(out, re);
    flint_free(re);
    if (arb_is_zero(acb_imagref(z))) return;
    char *im = arb_get_str(acb_imagref(z), 7, 0);
    text_addf(out, " + (%s)*i", im);
    flint_free(im);
}

static tw_status refute(work *w, const sample *s, const acb_t before, const acb_t after)
{
    text words;
    text_init(&words);
    text_add(&words, "this move would change the value");
    if (s->count) {
        text_add(&words, ": at ");
        add_values(w->e, &words, s);
    }
    text_add(&words, s->count ? " it is " : ": it is ");
    add_ball(&words, before);
    text_add(&words, ", and after the move it would be ");
    add_ball(&words, after);
    engine_fail(w->e, ERROR_REFUTED, "%s", words.bytes);
    text_clear(&words);
    return TW_ERROR;
}

static void note(work *w, const sample *s, const acb_t value, slong tried)
{
    text *d = &w->detail;
    if (tried == 1) text_addf(d, "%schecked by balls", d->length ? "; " : "");
    text_add(d, tried == 1 ? (s->count ? " at " : "") : " and ");
    add_values(w->e, d, s);
    text_add(d, ": ");
    add_ball(d, value);
}

/* A difference quotient comes near a derivative only: a hundredth is granted. */
static void loosen(acb_t x, const acb_t y)
{
    mag_t a, b;
    mag_init(a);
    mag_init(b);
    acb_get_mag(a, x);
    acb_get_mag(b, y);
    mag_add(a, a, b);
    mag_mul_2exp_si(a, a, -7);
    acb_add_error_mag(x, a);
    mag_clear(a);
    mag_clear(b);
}

tw_status verify_by_balls(work *w, expr *before, expr *after, slong *tried)
{
    tw_engine *e = w->e;
    acb_t x, y;
    tw_status status = TW_OK;
    slong failed = 0, diverged = 0;
    *tried = 0;
    acb_init(x);
    acb_init(y);
    for (slong trial = 0; trial < SAMPLES_MOST && *tried < SAMPLES_WANTED && failed < 3 && status == TW_OK; trial++) {
        sample s;
        error_kind kind = ERROR_NONE;
        if (!budget_ok(e)) break;
        bool drawn = sample_draw(e, &s, before, after, trial);
        if (drawn && ball_at(w->m, x, before, &s, trial, &kind) &&
            (before == after || ball_at(w->m, y, after, &s, trial, &kind))) {
            if (w->loosely) loosen(x, y);
            if (before != after && !acb_overlaps(x, y)) status = refute(w, &s, x, y);
            else {
                ++*tried;
                note(w, &s, x, *tried);
            }
            if (s.count == 0) trial = SAMPLES_MOST; /* there is only one value */
        } else if (drawn) {
            failed++;
            if (kind == ERROR_DIVERGENT) diverged++;
        }
        sample_free(&s);
        if (status == TW_OK && !forgive(e)) status = TW_ERROR;
    }
    acb_clear(x);
    acb_clear(y);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (status == TW_OK && *tried == 0 && diverged == failed && failed > 0)
        return engine_fail(e, ERROR_DIVERGENT, before == after
                                                   ? "the integral does not converge at any sample value of its parameters"
                                                   : "after this move the integral would not converge at any sample value of "
                                                     "the parameters");
    if (status == TW_OK && *tried == 0 && before != after) text_addf(&w->detail, "%sno ball could be had at the samples",
                                                                     w->detail.length ? "; " : "");
    return status;
}
