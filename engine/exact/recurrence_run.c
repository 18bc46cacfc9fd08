/* Running a recurrence over Q far. The one idea: for small orders every term in lowest terms costs least; from order 3 on
 * the integers e[n] = d C^n c[n] are run instead, with C and d read off the first coefficients and every division tested, so
 * that a C that is too small shows itself and never gives a wrong number. */
#include <stdlib.h>
#include <string.h>

#include "engine/exact/recurrence.h"

/* ---- in lowest terms ---- */

static tw_status run_fractions(tw_engine *e, const recurrence *r, fmpq *c, slong known, slong count)
{
    fmpz_t at, value;
    fmpq_t sum, t;
    fmpz_init(at), fmpz_init(value);
    fmpq_init(sum), fmpq_init(t);
    for (slong m = known; m < count && budget_ok(e); m++) {
        fmpz_set_si(at, m - r->order);
        fmpq_zero(sum);
        for (slong j = 0; j < r->order; j++) {
            fmpz_poly_evaluate_fmpz(value, &r->p[j], at);
            fmpq_mul_fmpz(t, &c[m - r->order + j], value);
            fmpq_sub(sum, sum, t);
        }
        fmpz_poly_evaluate_fmpz(value, &r->p[r->order], at);
        fmpq_div_fmpz(&c[m], sum, value);
    }
    fmpz_clear(at), fmpz_clear(value);
    fmpq_clear(sum), fmpq_clear(t);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* One factor: c[m+1] = ratio(m) c[m]. */
static tw_status run_ratio(tw_engine *e, const recurrence *r, fmpq *c, slong known, slong count)
{
    fmpz_t at;
    fmpq_t ratio;
    fmpz_init(at);
    fmpq_init(ratio);
    for (slong m = known; m < count && budget_ok(e); m++) {
        fmpz_set_si(at, m - 1);
        fmpz_poly_evaluate_fmpz(fmpq_numref(ratio), &r->p[0], at);
        fmpz_poly_evaluate_fmpz(fmpq_denref(ratio), &r->p[1], at);
        fmpz_neg(fmpq_numref(ratio), fmpq_numref(ratio));
        fmpq_canonicalise(ratio);
        fmpq_mul(&c[m], &c[m - 1], ratio);
    }
    fmpz_clear(at);
    fmpq_clear(ratio);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* ---- over the integers ---- */

enum { PRIMES_LIMIT = 24 };

/* c[n] has the denominator d C^n: primes and their powers in C and d. */
typedef struct scaling {
    slong count;
    ulong prime[PRIMES_LIMIT];
    slong slope[PRIMES_LIMIT], offset[PRIMES_LIMIT];
    fmpz_t c;
} scaling;

static slong valuation(const fmpz_t a, ulong prime)
{
    fmpz_t t, p;
    fmpz_init(t);
    fmpz_init_set_ui(p, prime);
    slong v = fmpz_is_zero(a) ? 0 : fmpz_remove(t, a, p);
    fmpz_clear(t);
    fmpz_clear(p);
    return v;
}

/* The primes of the denominators of c[0 .. known-1]; false when there are too many or too large ones. */
static bool find_primes(scaling *s, const fmpq *c, slong known)
{
    fmpz_t all;
    fmpz_init(all);
    fmpz_one(all);
    for (slong n = 0; n < known; n++) fmpz_lcm(all, all, fmpq_denref(&c[n]));
    fmpz_factor_t parts;
    fmpz_factor_init(parts);
    bool good = true;
    fmpz_factor_trial_range(parts, all, 0, 170);
    s->count = 0;
    fmpz_set(s->c, all);
    for (slong k = 0; k < parts->num && good; k++) {
        good = s->count < PRIMES_LIMIT && fmpz_cmp_ui(parts->p + k, 1000) < 0;
        if (!good) break;
        s->prime[s->count++] = fmpz_get_ui(parts->p + k);
        fmpz_remove(s->c, s->c, parts->p + k);
    }
    good = good && fmpz_is_one(s->c);
    fmpz_factor_clear(parts);
    fmpz_clear(all);
    return good;
}

/* slope and offset of each prime: v(den c[n]) <= offset + slope*n for the known n. */
static void find_slopes(scaling *s, const fmpq *c, slong known)
{
    fmpz_t power;
    fmpz_init(power);
    fmpz_one(s->c);
    for (slong k = 0; k < s->count; k++) {
        slong slope = 0, offset = 0;
        for (slong n = 0; n < known; n++) {
            slong v = valuation(fmpq_denref(&c[n]), s->prime[k]);
            if (n < 4) offset = FLINT_MAX(offset, v);
            else slope = FLINT_MAX(slope, (v + n - 1) / n);
        }
        s->slope[k] = slope;
        s->offset[k] = offset;
        fmpz_ui_pow_ui(power, s->prime[k], (ulong)slope);
        fmpz_mul(s->c, s->c, power);
    }
    fmpz_clear(power);
}

/* e[n] = d C^n c[n]; false when that is no integer. */
static bool scaled(fmpz_t out, const scaling *s, const fmpq_t c, slong n)
{
    fmpz_t power;
    fmpz_init(power);
    fmpz_set(out, fmpq_numref(c));
    for (slong k = 0; k < s->count; k++) {
        fmpz_ui_pow_ui(power, s->prime[k], (ulong)(s->slope[k] * n + s->offset[k]));
        fmpz_mul(out, out, power);
    }
    bool whole = fmpz_divisible(out, fmpq_denref(c));
    if (whole) fmpz_divexact(out, out, fmpq_denref(c));
    fmpz_clear(power);
    return whole;
}

/* c[n] in lowest terms: the primes of the denominator are taken out of e[n] one by one. */
static void unscaled(fmpq_t out, const scaling *s, const fmpz_t e, slong n)
{
    if (fmpz_is_zero(e)) {
        fmpq_zero(out);
        return;
    }
    fmpz_t p, power;
    fmpz_init(p), fmpz_init(power);
    fmpz_set(fmpq_numref(out), e);
    fmpz_one(fmpq_denref(out));
    for (slong k = 0; k < s->count; k++) {
        slong have = s->slope[k] * n + s->offset[k], drop;
        fmpz_set_ui(p, s->prime[k]);
        if (s->prime[k] == 2) {
            drop = FLINT_MIN((slong)fmpz_val2(fmpq_numref(out)), have);
            fmpz_fdiv_q_2exp(fmpq_numref(out), fmpq_numref(out), (ulong)drop);
        } else {
            drop = fmpz_remove(fmpq_numref(out), fmpq_numref(out), p);
            fmpz_ui_pow_ui(power, s->prime[k], (ulong)FLINT_MAX(drop - have, 0));
            if (drop > have) fmpz_mul(fmpq_numref(out), fmpq_numref(out), power);
            drop = FLINT_MIN(drop, have);
        }
        fmpz_ui_pow_ui(power, s->prime[k], (ulong)(have - drop));
        fmpz_mul(fmpq_denref(out), fmpq_denref(out), power);
    }
    fmpz_clear(p), fmpz_clear(power);
}

/* The values a_j(n) C^(order - j), j <= order. */
static void weights_at(fmpz *w, const recurrence *r, const fmpz *powers, slong n)
{
    fmpz_t at;
    fmpz_init_set_si(at, n);
    for (slong j = 0; j <= r->order; j++) {
        fmpz_poly_evaluate_fmpz(w + j, &r->p[j], at);
        if (j < r->order) fmpz_mul(w + j, w + j, powers + (r->order - j));
    }
    fmpz_clear(at);
}

/* False when a division is not exact, or the engine's budget is out. */
static bool run_integers(tw_engine *e, const recurrence *r, const scaling *s, fmpz *v, slong known, slong count)
{
    fmpz *w = _fmpz_vec_init(r->order + 1), *powers = _fmpz_vec_init(r->order + 1);
    fmpz_one(powers);
    for (slong j = 1; j <= r->order; j++) fmpz_mul(powers + j, powers + j - 1, s->c);
    fmpz_t sum;
    fmpz_init(sum);
    bool good = true;
    for (slong m = known; m < count && good; m++) {
        weights_at(w, r, powers, m - r->order);
        fmpz_zero(sum);
        for (slong j = 0; j < r->order; j++) fmpz_submul(sum, w + j, v + (m - r->order + j));
        good = fmpz_divisible(sum, w + r->order) && budget_ok(e);
        if (good) fmpz_divexact(v + m, sum, w + r->order);
    }
    fmpz_clear(sum);
    _fmpz_vec_clear(w, r->order + 1);
    _fmpz_vec_clear(powers, r->order + 1);
    return good;
}

/* True when it went through. */
static bool run_scaled(tw_engine *e, const recurrence *r, fmpq *c, slong known, slong count)
{
    scaling s;
    fmpz_init(s.c);
    bool good = known >= 16 && find_primes(&s, c, known);
    if (good) find_slopes(&s, c, known);
    fmpz *v = _fmpz_vec_init(count);
    for (slong n = 0; n < known && good; n++) good = scaled(v + n, &s, &c[n], n);
    if (good) good = run_integers(e, r, &s, v, known, count);
    for (slong n = known; n < count && good; n++) unscaled(&c[n], &s, v + n, n);
    _fmpz_vec_clear(v, count);
    fmpz_clear(s.c);
    return good;
}

tw_status recurrence_extend(tw_engine *e, const recurrence *r, fmpq *c, slong known, slong count)
{
    if (known < r->needed || known < r->order || !r->p)
        return engine_fail(e, ERROR_INTERNAL, "a recurrence needs %ld first values", (long)r->needed);
    if (count <= known) return TW_OK;
    if (r->order == 0) {
        for (slong n = known; n < count; n++) fmpq_zero(&c[n]);
        return TW_OK;
    }
    if (r->order == 1) return run_ratio(e, r, c, known, count);
    if (r->order >= 3 && run_scaled(e, r, c, known, count)) return TW_OK;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    return run_fractions(e, r, c, known, count);
}
