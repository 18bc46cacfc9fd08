/* The one idea: the coefficients of a recurrence of given order and degree solve linear equations; modulo a word prime it
 * takes microseconds to see that there is no solution, and where there is one its images modulo several primes give it over
 * the rationals by the Chinese remainder theorem and rational reconstruction. What was found is then tested, exactly, on
 * coefficients that took no part. */
#include "engine/exact/guess.h"

#include <stdlib.h>

enum { ORDER_MOST = 6, DEGREE_MOST = 8, PRIMES_MOST = 400 };

typedef struct shape {
    slong order, degree;
} shape;

static slong unknowns(shape s)
{
    return (s.order + 1) * (s.degree + 1);
}

/* The null vector modulo the prime, its last nonzero entry 1; 0: none, -1: the prime divides a denominator, -2: more than
 * one. */
static int null_vector(mp_limb_t *out, shape s, const fmpq *c, slong rows, mp_limb_t prime)
{
    slong width = unknowns(s), count = rows + s.order;
    nmod_t mod;
    nmod_init(&mod, prime);
    mp_limb_t *value = base_alloc((size_t)count * sizeof *value);
    bool good = true;
    for (slong n = 0; n < count && good; n++) {
        mp_limb_t den = fmpz_fdiv_ui(fmpq_denref(&c[n]), prime);
        good = den != 0;
        if (good) value[n] = nmod_div(fmpz_fdiv_ui(fmpq_numref(&c[n]), prime), den, mod);
    }
    int nullity = -1;
    if (good) {
        nmod_mat_t a, x;
        nmod_mat_init(a, rows, width, prime);
        nmod_mat_init(x, width, width, prime);
        for (slong n = 0; n < rows; n++)
            for (slong j = 0; j <= s.order; j++) {
                mp_limb_t v = value[n + j];
                for (slong k = 0; k <= s.degree; k++) {
                    nmod_mat_entry(a, n, j * (s.degree + 1) + k) = v;
                    v = nmod_mul(v, (mp_limb_t)n % prime, mod);
                }
            }
        slong found = nmod_mat_nullspace(x, a);
        nullity = found == 0 ? 0 : found == 1 ? 1 : -2;
        slong last = width - 1;
        if (found == 1) {
            while (last > 0 && nmod_mat_entry(x, last, 0) == 0) last--;
            mp_limb_t inverse = n_invmod(nmod_mat_entry(x, last, 0), prime);
            for (slong k = 0; k < width; k++) out[k] = nmod_mul(nmod_mat_entry(x, k, 0), inverse, mod);
        }
        nmod_mat_clear(a);
        nmod_mat_clear(x);
    }
    free(value);
    return nullity;
}

/* Images modulo primes until the rational vector no longer changes. */
static bool reconstruct(tw_engine *e, fmpq *out, shape s, const fmpq *c, slong rows)
{
    slong width = unknowns(s);
    mp_limb_t *image = base_alloc((size_t)width * sizeof *image), prime = UWORD(1) << 60;
    fmpz *residue = _fmpz_vec_init(width);
    fmpq *next = _fmpq_vec_init(width);
    fmpz_t modulus;
    fmpz_init(modulus);
    fmpz_one(modulus);
    bool stable = false;
    for (slong k = 0; k < PRIMES_MOST && !stable && budget_ok(e); k++) {
        prime = n_nextprime(prime, 1);
        if (null_vector(image, s, c, rows, prime) != 1) continue;
        for (slong j = 0; j < width; j++) fmpz_CRT_ui(residue + j, residue + j, modulus, image[j], prime, 0);
        fmpz_mul_ui(modulus, modulus, prime);
        bool whole = true;
        for (slong j = 0; j < width && whole; j++) whole = fmpq_reconstruct_fmpz(next + j, residue + j, modulus);
        stable = whole;
        for (slong j = 0; j < width && stable; j++) stable = fmpq_equal(next + j, out + j);
        for (slong j = 0; j < width && whole; j++) fmpq_set(out + j, next + j);
    }
    fmpz_clear(modulus);
    _fmpz_vec_clear(residue, width);
    _fmpq_vec_clear(next, width);
    free(image);
    return stable;
}

/* As a recurrence in a field of its own. */
static recurrence *build(tw_engine *e, expr *n, shape s, const fmpq *v)
{
    field *f = base_alloc(sizeof *f);
    field_init(f, e, 1);
    element index;
    element_init(f, &index);
    (void)field_from_expr(f, &index, n);
    element_clear(f, &index);
    fmpz_t den, c;
    fmpz_init(den), fmpz_init(c);
    fmpz_one(den);
    for (slong k = 0; k < unknowns(s); k++) fmpz_lcm(den, den, fmpq_denref(v + k));
    slong order = s.order;
    bool zero = true;
    while (order >= 0 && zero) { /* an order too great shows as a zero leading polynomial */
        for (slong k = 0; k <= s.degree; k++) zero = zero && fmpq_is_zero(v + order * (s.degree + 1) + k);
        order -= zero;
    }
    fmpz_mpoly_struct *a = base_alloc((size_t)(s.order + 1) * sizeof *a);
    for (slong j = 0; j <= s.order; j++) {
        fmpz_mpoly_init(&a[j], f->ctx);
        for (ulong k = 0; k <= (ulong)s.degree; k++) {
            const fmpq *one = v + j * (s.degree + 1) + (slong)k;
            fmpz_divexact(c, den, fmpq_denref(one));
            fmpz_mul(c, c, fmpq_numref(one));
            ulong power[1] = {k};
            if (!fmpz_is_zero(c)) fmpz_mpoly_set_coeff_fmpz_ui(&a[j], c, power, f->ctx);
        }
    }
    for (slong j = order + 1; j <= s.order; j++) fmpz_mpoly_clear(&a[j], f->ctx);
    fmpz_clear(den), fmpz_clear(c);
    recurrence *made = recurrence_new(e, f, n, a, order, NULL);
    made->label = RECURRENCE_FITTED;
    return made;
}

/* Does it fit all of them? */
static bool fits_all(tw_engine *e, const recurrence *r, const fmpq *c, slong count)
{
    expr **list = base_alloc((size_t)count * sizeof *list);
    for (slong n = 0; n < count; n++) list[n] = expr_fmpq(e, &c[n]);
    bool fits = recurrence_misfit(e, r, NULL, list, count) == -1;
    free(list);
    return fits;
}

static bool try_shape(tw_engine *e, recurrence **out, expr *n, shape s, const fmpq *c, slong count)
{
    slong rows = count - GUESS_UNUSED - s.order, width = unknowns(s);
    if (rows < width + 4) return false;
    mp_limb_t *image = base_alloc((size_t)width * sizeof *image);
    int nullity = null_vector(image, s, c, FLINT_MIN(rows, width + 8), (UWORD(1) << 59) + 131);
    if (nullity == -1) nullity = null_vector(image, s, c, FLINT_MIN(rows, width + 8), (UWORD(1) << 58) + 69);
    free(image);
    if (nullity != 1) return false;
    fmpq *v = _fmpq_vec_init(width);
    bool good = reconstruct(e, v, s, c, FLINT_MIN(rows, width + 8));
    if (good) *out = build(e, n, s, v);
    _fmpq_vec_clear(v, width);
    if (good && (*out)->order > 0 && fits_all(e, *out, c, count)) {
        (*out)->tried = count - FLINT_MIN(rows, width + 8) - s.order;
        return true;
    }
    recurrence_free(*out);
    *out = NULL;
    return false;
}

tw_status recurrence_guess(tw_engine *e, recurrence **out, expr *n, const fmpq *c, slong count)
{
    *out = NULL;
    for (slong most = 2; most <= (ORDER_MOST + 1) * (DEGREE_MOST + 1) && !*out; most++)
        for (shape s = {1, 0}; s.order <= ORDER_MOST && !*out; s.order++) {
            s.degree = most / (s.order + 1) - 1;
            if (unknowns(s) != most || s.degree > DEGREE_MOST) continue;
            if (!budget_ok(e)) return TW_ERROR;
            if (try_shape(e, out, n, s, c, count)) break;
        }
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
