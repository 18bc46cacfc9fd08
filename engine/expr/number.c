/* Exact powers of rational numbers. Its one idea: a positive rational is a product of prime powers, and p^(k + f) with
 * 0 < f < 1 is the rational p^k times the irrational p^f, which makes the form unique: 12^(1/2) = 2*3^(1/2), and
 * 2^(-1/2) = 1/2 * 2^(1/2). Numbers whose factors are too hard to find keep an unfactored part; that form is true, only
 * not unique. */
#include "engine/expr/node.h"

enum {
    FACTOR_FULL_BITS = 64,      /* factored completely */
    FACTOR_TRIAL_BITS = 8192,   /* divided by the primes of FLINT's small table */
    FACTOR_TRIAL_PRIMES = 3512,
    FACTOR_HUGE_PRIMES = 4      /* beyond that: 2, 3, 5, 7 only, for the powers of ten */
};

typedef struct prime_factor {
    fmpz_t p;         /* a prime where that is cheap to find out */
    ulong multiplicity;
} prime_factor;

typedef struct factors {
    size_t count;
    prime_factor *list; /* in scratch memory, but for the inside of large p */
} factors;

static void factors_clear(factors *f)
{
    for (size_t k = 0; k < f->count; k++)
        fmpz_clear(f->list[k].p);
}

static void factors_push(factors *f, const fmpz_t p, ulong multiplicity)
{
    if (fmpz_is_one(p))
        return;
    fmpz_init_set(f->list[f->count].p, p);
    f->list[f->count++].multiplicity = multiplicity;
}

static void factors_append(factors *f, const fmpz_t n, ulong multiplicity)
{
    fmpz_factor_t small;
    if (fmpz_bits(n) > FACTOR_FULL_BITS) {
        factors_push(f, n, multiplicity);
        return;
    }
    fmpz_factor_init(small);
    fmpz_factor(small, n);
    for (slong k = 0; k < small->num; k++)
        factors_push(f, small->p + k, small->exp[k] * multiplicity);
    fmpz_factor_clear(small);
}

/* n > FACTOR_FULL_BITS bits: small primes first, then a perfect power, then what is left. */
static void factors_of_large(factors *f, const fmpz_t n)
{
    fmpz_t rest, p;
    fmpz_init_set(rest, n);
    fmpz_init(p);
    const ulong *primes = n_primes_arr_readonly(FACTOR_TRIAL_PRIMES);
    const slong count = fmpz_bits(n) <= FACTOR_TRIAL_BITS ? FACTOR_TRIAL_PRIMES : FACTOR_HUGE_PRIMES;
    for (slong k = 0; k < count && !fmpz_is_one(rest); k++) {
        if (fmpz_fdiv_ui(rest, primes[k]) != 0)
            continue;
        fmpz_set_ui(p, primes[k]);
        slong multiplicity = fmpz_remove(rest, rest, p);
        factors_push(f, p, (ulong)multiplicity);
    }
    int power = 1;
    if (fmpz_bits(rest) <= FACTOR_TRIAL_BITS && fmpz_bits(rest) > FACTOR_FULL_BITS) {
        power = fmpz_is_perfect_power(p, rest);
        if (power > 1)
            fmpz_swap(rest, p);
    }
    factors_append(f, rest, power > 1 ? (ulong)power : 1);
    fmpz_clear(rest);
    fmpz_clear(p);
}

/* n > 0 as a product. The list is taken before FLINT is asked for anything, so that nothing is lost at the edge. */
static factors factor_some(tw_engine *e, const fmpz_t n)
{
    const bool large = fmpz_bits(n) > FACTOR_FULL_BITS;
    factors f = {0, engine_scratch(e, large ? FACTOR_TRIAL_PRIMES + 16 : 16, sizeof(prime_factor))};
    if (large)
        factors_of_large(&f, n);
    else
        factors_append(&f, n, 1);
    return f;
}

static bool power_fits(const fmpq_t base, const fmpz_t exponent)
{
    if (fmpz_is_one(fmpq_denref(base)) && fmpz_is_pm1(fmpq_numref(base)))
        return true;
    if (!fmpz_fits_si(exponent) || fmpz_get_si(exponent) == WORD_MIN)
        return false;
    const double bits = (double)FLINT_MAX(fmpz_bits(fmpq_numref(base)), fmpz_bits(fmpq_denref(base)));
    return (bits - 1) * (double)FLINT_ABS(fmpz_get_si(exponent)) <= NUMBER_BITS_LIMIT;
}

static expr *integer_power(tw_engine *e, const fmpq_t base, const fmpz_t exponent)
{
    if (fmpz_is_one(fmpq_denref(base)) && fmpz_is_pm1(fmpq_numref(base)))
        return expr_int(e, fmpz_is_one(fmpq_numref(base)) || fmpz_is_even(exponent) ? 1 : -1);
    if (!power_fits(base, exponent))
        return fail_too_large(e);
    fmpq_t value;
    fmpq_init(value);
    fmpq_pow_si(value, base, fmpz_get_si(exponent));
    expr *power = expr_fmpq(e, value);
    fmpq_clear(value);
    return power;
}

expr *minus_one_power(tw_engine *e, const fmpq_t r)
{
    fmpz_t whole;
    fmpq_t part;
    fmpz_init(whole);
    fmpq_init(part);
    fmpz_fdiv_q(whole, fmpq_numref(r), fmpq_denref(r));
    fmpq_sub_fmpz(part, r, whole);
    expr *power = fmpq_is_zero(part) ? expr_int(e, 1)
                : fmpz_equal_si(fmpq_denref(part), 2) ? expr_constant_of(e, CONSTANT_I)
                : node_power(e, expr_int(e, -1), expr_fmpq(e, part));
    if (power && fmpz_is_odd(whole))
        power = expr_neg(e, power);
    fmpz_clear(whole);
    fmpq_clear(part);
    return power;
}

/* factor^exponent split into a rational, multiplied into *rational, and the irrational rest (1 when there is none). */
static expr *prime_power(tw_engine *e, fmpq_t rational, const fmpz_t factor, const fmpq_t exponent)
{
    fmpz_t whole;
    fmpq_t part, base;
    expr *rest = NULL;
    fmpz_init(whole);
    fmpq_init(part);
    fmpq_init(base);
    fmpz_set(fmpq_numref(base), factor);
    fmpz_fdiv_q(whole, fmpq_numref(exponent), fmpq_denref(exponent));
    fmpq_sub_fmpz(part, exponent, whole);
    if (!power_fits(base, whole)) {
        fail_too_large(e);
    } else {
        if (fmpq_is_zero(part))
            rest = expr_int(e, 1);
        else
            rest = node_power(e, expr_fmpz(e, factor), expr_fmpq(e, part));
        fmpq_pow_si(base, base, fmpz_get_si(whole));
        fmpq_mul(rational, rational, base);
        if (!number_fits(rational))
            rest = fail_too_large(e);
    }
    fmpz_clear(whole);
    fmpq_clear(part);
    fmpq_clear(base);
    return rest;
}

/* Appends the powers of n's factors; n > 0, sign is 1 above the bar and -1 below. */
static bool append_factors(tw_engine *e, expr **list, size_t *count, fmpq_t rational, const factors *f,
                           const fmpq_t exponent, int sign)
{
    fmpq_t each;
    fmpq_init(each);
    bool ok = true;
    for (size_t k = 0; ok && k < f->count; k++) {
        fmpq_mul_ui(each, exponent, f->list[k].multiplicity);
        if (sign < 0)
            fmpq_neg(each, each);
        list[*count] = prime_power(e, rational, f->list[k].p, each);
        ok = list[(*count)++] != NULL;
    }
    fmpq_clear(each);
    return ok;
}

static void factor_both(tw_engine *e, const fmpq_t q, factors *above, factors *below)
{
    fmpz_t modulus;
    fmpz_init(modulus);
    fmpz_abs(modulus, fmpq_numref(q));
    *above = factor_some(e, modulus);
    *below = factor_some(e, fmpq_denref(q));
    fmpz_clear(modulus);
}

static expr *rational_power(tw_engine *e, const fmpq_t base, const fmpq_t exponent)
{
    const arena_place mark = arena_mark(&e->scratch);
    factors above, below;
    factor_both(e, base, &above, &below);
    expr **list = engine_scratch(e, above.count + below.count + 2, sizeof *list);
    size_t count = 0;
    fmpq_t rational;
    fmpq_init(rational);
    fmpq_one(rational);
    if (fmpq_sgn(base) < 0)
        list[count++] = minus_one_power(e, exponent);
    expr *power = NULL;
    if (append_factors(e, list, &count, rational, &above, exponent, 1) &&
        append_factors(e, list, &count, rational, &below, exponent, -1)) {
        list[count++] = expr_fmpq(e, rational);
        power = expr_product(e, list, count);
    }
    factors_clear(&above);
    factors_clear(&below);
    fmpq_clear(rational);
    arena_release(&e->scratch, mark);
    return power;
}

/* Already a prime (or an unfactored part) to a power between 0 and 1? Then nothing is left to do. */
static bool is_prime_power(const fmpq_t base, const fmpq_t exponent)
{
    return fmpz_is_one(fmpq_denref(base)) && fmpz_cmp_ui(fmpq_numref(base), 10) < 0 &&
           fmpz_sgn(fmpq_numref(base)) > 0 && n_is_prime(fmpz_get_ui(fmpq_numref(base))) && fmpq_sgn(exponent) > 0 &&
           fmpz_cmp(fmpq_numref(exponent), fmpq_denref(exponent)) < 0;
}

expr *number_power(tw_engine *e, const fmpq_t base, const fmpq_t exponent)
{
    if (fmpz_is_one(fmpq_denref(exponent)))
        return integer_power(e, base, fmpq_numref(exponent));
    if (fmpz_is_one(fmpq_denref(base)) && fmpz_equal_si(fmpq_numref(base), -1))
        return minus_one_power(e, exponent);
    if (is_prime_power(base, exponent))
        return node_power(e, expr_fmpq(e, base), expr_fmpq(e, exponent));
    return rational_power(e, base, exponent);
}

static bool append_symbolic(tw_engine *e, expr **list, size_t *count, const factors *f, expr *exponent, slong sign)
{
    for (size_t k = 0; k < f->count; k++) {
        expr *each = expr_mul(e, expr_int(e, sign * (slong)f->list[k].multiplicity), exponent);
        list[*count] = node_power(e, expr_fmpz(e, f->list[k].p), each);
        if (!list[(*count)++])
            return false;
    }
    return true;
}

/* The exponent is no number and no sum that starts with one. b^u = (-1)^u * 2^(..*u) * 3^(..*u) ..., true for all u. */
static expr *number_power_split(tw_engine *e, const fmpq_t base, expr *exponent)
{
    const arena_place mark = arena_mark(&e->scratch);
    factors above, below;
    factor_both(e, base, &above, &below);
    expr **list = engine_scratch(e, above.count + below.count + 1, sizeof *list);
    size_t count = 0;
    expr *power = NULL;
    if (fmpq_sgn(base) < 0)
        list[count++] = node_power(e, expr_int(e, -1), exponent);
    if (append_symbolic(e, list, &count, &above, exponent, 1) && append_symbolic(e, list, &count, &below, exponent, -1))
        power = expr_product(e, list, count);
    factors_clear(&above);
    factors_clear(&below);
    arena_release(&e->scratch, mark);
    return power;
}

expr *number_power_symbolic(tw_engine *e, const fmpq_t base, expr *exponent)
{
    if (exponent->kind != EXPR_SUM || exponent->args[0]->kind != EXPR_NUMBER)
        return number_power_split(e, base, exponent);
    expr *rest = expr_sum(e, exponent->args + 1, exponent->count - 1);
    if (!rest)
        return NULL;
    return expr_mul(e, number_power(e, base, &exponent->args[0]->is.number), number_power_symbolic(e, base, rest));
}
