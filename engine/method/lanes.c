/* From strands to lanes: int_0^inf x^a log(x)^k exp(-S x^mu) dx for every term of a series, with S = c s^K.
 *
 * The one idea: with z = (a + 1)/mu the integral is
 *
 *     mu^-(k+1) (d/dz)^k [Gamma(z) S^-z]                                            (DLMF 2.3.8, 2.3.9)
 *       = mu^-(k+1) Gamma(z) c^-z s^(-K z) sum_i C(k,i) (-K log s)^i E_(k-i)(z),
 *     E_0 = 1,  E_(m+1) = sum_i C(m,i) E_(m-i) P_i,  P_0 = psi(z) - log c,  P_i = polygamma(i, z),
 *
 * and along a residue class z = r + i of the integers Gamma(z) = Gamma(r) (r)_i (DLMF 5.5.1) and polygamma(j, z) moves
 * by rational numbers (DLMF 5.15.5), so that each class has one constant and rational coefficients (times psi values).
 */
#include "engine/method/lanes.h"

#include <stdlib.h>
#include <string.h>

#include "engine/exact/algebraic.h"

struct draft {
    expr *constant;
    slong log_power;
    expr *base; /* z of index 0; index n stands for z = base + n*step */
    slong step;
    slong count;
    fmpq *q;  /* count entries while all are rational, else NULL */
    expr **x; /* then these */
};

void kernel_init(kernel *k)
{
    memset(k, 0, sizeof *k);
    fmpq_init(k->mu);
    fmpq_init(k->power);
    fmpq_init(k->factor_power);
    fmpq_init(k->factor_number);
}

void kernel_clear(kernel *k)
{
    fmpq_clear(k->mu);
    fmpq_clear(k->power);
    fmpq_clear(k->factor_power);
    fmpq_clear(k->factor_number);
}

void drafts_init(drafts *d)
{
    *d = (drafts){0, NULL};
}

static void draft_clear_values(draft *d)
{
    if (d->q) _fmpq_vec_clear(d->q, d->count);
    free(d->x);
    d->q = NULL;
    d->x = NULL;
}

void drafts_clear(drafts *d)
{
    for (size_t k = 0; k < d->count; k++) {
        draft_clear_values(d->list[k]);
        free(d->list[k]);
    }
    free(d->list);
    drafts_init(d);
}

/* ---- values of psi ---- */

/* psi at p/q in (0, 1] for q = 1, 2, 3, 4, 6: -euler_constant - (logs) - sign*(cotangent part)
 * (DLMF 5.4.12, 5.4.13, 5.4.19). */
static expr *psi_known(tw_engine *e, slong p, slong q)
{
    expr *pi = expr_constant_of(e, CONSTANT_PI), *half = expr_frac(e, 1, 2);
    expr *log2 = expr_call1(e, FUNCTION_LOG, expr_int(e, 2)), *log3 = expr_call1(e, FUNCTION_LOG, expr_int(e, 3));
    expr *root3 = expr_sqrt(e, expr_int(e, 3)), *zero = expr_int(e, 0);
    expr *logs = zero, *cotangent = zero;
    if (q == 2) logs = expr_mul(e, expr_int(e, 2), log2);
    if (q == 3) logs = expr_mul(e, expr_frac(e, 3, 2), log3);
    if (q == 4) logs = expr_mul(e, expr_int(e, 3), log2);
    if (q == 6) logs = expr_add(e, expr_mul(e, expr_int(e, 2), log2), expr_mul(e, expr_frac(e, 3, 2), log3));
    if (q == 3) cotangent = expr_mul(e, expr_frac(e, 1, 6), expr_mul(e, pi, root3));
    if (q == 4) cotangent = expr_mul(e, half, pi);
    if (q == 6) cotangent = expr_mul(e, half, expr_mul(e, pi, root3));
    if (2 * p > q) cotangent = expr_neg(e, cotangent);
    return expr_neg(e, expr_add(e, expr_constant_of(e, CONSTANT_EULER), expr_add(e, logs, cotangent)));
}

/* zeta(n), n >= 2; even ones in powers of pi (DLMF 25.6.2). */
static expr *zeta_value(tw_engine *e, slong n)
{
    if (n % 2) return expr_call1(e, FUNCTION_ZETA, expr_int(e, n));
    fmpq_t b, f;
    fmpq_init(b);
    fmpq_init(f);
    bernoulli_fmpq_ui(b, (ulong)n);
    fmpq_abs(b, b);
    fmpz_fac_ui(fmpq_denref(f), (ulong)n);
    fmpz_one_2exp(fmpq_numref(f), (ulong)(n - 1));
    fmpq_canonicalise(f);
    fmpq_mul(b, b, f);
    expr *value = expr_mul(e, expr_fmpq(e, b), expr_pow(e, expr_constant_of(e, CONSTANT_PI), expr_int(e, n)));
    fmpq_clear(b);
    fmpq_clear(f);
    return value;
}

/* polygamma(n, 1) = (-1)^(n+1) n! zeta(n+1), at 1/2 times 2^(n+1) - 1 (DLMF 5.15.2, 5.15.3). */
static expr *polygamma_known(tw_engine *e, slong n, bool at_half)
{
    fmpz_t number, two;
    fmpz_init(number);
    fmpz_init(two);
    fmpz_fac_ui(number, (ulong)n);
    fmpz_one_2exp(two, (ulong)(n + 1));
    fmpz_sub_ui(two, two, 1);
    if (at_half) fmpz_mul(number, number, two);
    if (n % 2 == 0) fmpz_neg(number, number);
    expr *value = expr_mul(e, expr_fmpz(e, number), zeta_value(e, n + 1));
    fmpz_clear(number);
    fmpz_clear(two);
    return value;
}

expr *polygamma_value(tw_engine *e, slong order, const fmpq_t r)
{
    ulong q = fmpz_abs_fits_ui(fmpq_denref(r)) ? fmpz_get_ui(fmpq_denref(r)) : 0;
    if (order == 0 && (q == 1 || q == 2 || q == 3 || q == 4 || q == 6))
        return psi_known(e, fmpz_get_si(fmpq_numref(r)), (slong)q);
    if (order == 0) return expr_call1(e, FUNCTION_PSI, expr_fmpq(e, r));
    if (q == 1 || q == 2) return polygamma_known(e, order, q == 2);
    expr *args[] = {expr_int(e, order), expr_fmpq(e, r)};
    return args[0] && args[1] ? expr_call(e, FUNCTION_POLYGAMMA, args, 2) : NULL;
}

/* ---- walking along a residue class ---- */

/* At z = base + i: the rising factorial (base)_i, and the moving parts of the polygamma values. */
typedef struct walk {
    tw_engine *e;
    bool rational; /* base is r in (0, 1] */
    fmpq_t r, z;   /* then; z = r + i */
    expr *base;
    slong i;
    fmpq_t rising;
    expr *rising_x; /* of a base that is not rational */
    slong logs;     /* P_0 .. P_(logs-1) are wanted */
    expr **start;   /* P_j at base (log c taken off P_0) */
    fmpq *moved;    /* P_j(z) - P_j(base) when rational */
    expr **moved_x; /* and when not */
} walk;

/* base + i with the constant c of the scale. */
static void walk_init(walk *w, tw_engine *e, expr *base, slong logs, expr *c)
{
    memset(w, 0, sizeof *w);
    w->e = e;
    w->base = base;
    w->rational = expr_is_number(base);
    w->logs = logs;
    fmpq_init(w->r);
    fmpq_init(w->z);
    fmpq_init(w->rising);
    fmpq_one(w->rising);
    w->rising_x = expr_int(e, 1);
    if (w->rational) fmpq_set(w->r, expr_number(base));
    fmpq_set(w->z, w->r);
    w->start = base_alloc((size_t)(logs + 1) * sizeof *w->start);
    w->moved_x = base_alloc((size_t)(logs + 1) * sizeof *w->moved_x);
    w->moved = _fmpq_vec_init(logs + 1);
    for (slong j = 0; j < logs; j++) {
        expr *args[] = {expr_int(e, j), base};
        w->start[j] = w->rational ? polygamma_value(e, j, w->r)
                      : j == 0    ? expr_call1(e, FUNCTION_PSI, base)
                      : args[0]   ? expr_call(e, FUNCTION_POLYGAMMA, args, 2)
                                  : NULL;
        if (j == 0) w->start[j] = expr_sub(e, w->start[j], expr_call1(e, FUNCTION_LOG, c));
        w->moved_x[j] = expr_int(e, 0);
    }
}

static void walk_clear(walk *w)
{
    fmpq_clear(w->r);
    fmpq_clear(w->z);
    fmpq_clear(w->rising);
    free(w->start);
    free(w->moved_x);
    _fmpq_vec_clear(w->moved, w->logs + 1);
}

/* (-1)^j j!: the factor of z^-(j+1) in polygamma(j, z + 1) - polygamma(j, z) (DLMF 5.15.5). */
static void move_rational(walk *w)
{
    fmpq_t u, power;
    fmpq_init(u);
    fmpq_init(power);
    fmpq_inv(power, w->z);
    fmpq_set(u, power);
    for (slong j = 0; j < w->logs; j++) {
        if (j > 0) fmpq_mul(u, u, power);
        if (j > 0) fmpq_mul_si(u, u, -j);
        fmpq_add(&w->moved[j], &w->moved[j], u);
    }
    fmpq_mul(w->rising, w->rising, w->z);
    fmpq_add_si(w->z, w->z, 1);
    fmpq_clear(u);
    fmpq_clear(power);
}

static void move_symbolic(walk *w)
{
    tw_engine *e = w->e;
    expr *z = expr_add(e, w->base, expr_int(e, w->i));
    fmpz_t f;
    fmpz_init(f);
    for (slong j = 0; j < w->logs; j++) {
        fmpz_fac_ui(f, (ulong)j);
        if (j % 2) fmpz_neg(f, f);
        expr *u = expr_mul(e, expr_fmpz(e, f), expr_pow(e, z, expr_int(e, -j - 1)));
        w->moved_x[j] = expr_add(e, w->moved_x[j], u);
    }
    fmpz_clear(f);
    w->rising_x = expr_mul(e, w->rising_x, z);
}

static void walk_forward(walk *w, slong steps)
{
    for (slong n = 0; n < steps; n++) {
        if (w->rational) move_rational(w);
        else move_symbolic(w);
        w->i++;
    }
}

/* E_m at the present z, m <= logs. */
static expr *walk_bell(const walk *w, slong m)
{
    tw_engine *e = w->e;
    expr **bell = base_alloc((size_t)(m + 1) * sizeof *bell);
    bell[0] = expr_int(e, 1);
    fmpz_t binomial;
    fmpz_init(binomial);
    for (slong n = 0; n < m; n++) {
        expr *sum = expr_int(e, 0);
        for (slong i = 0; i <= n; i++) {
            expr *moved = w->rational ? expr_fmpq(e, &w->moved[i]) : w->moved_x[i];
            expr *p = expr_add(e, w->start[i], moved);
            fmpz_bin_uiui(binomial, (ulong)n, (ulong)i);
            sum = expr_add(e, sum, expr_mul(e, expr_fmpz(e, binomial), expr_mul(e, bell[n - i], p)));
        }
        bell[n + 1] = expr_expand(e, sum);
    }
    fmpz_clear(binomial);
    expr *value = bell[m];
    free(bell);
    return value;
}

/* ---- drafts ---- */

/* Room for indices up to count - 1; new ones are zero. */
static void draft_widen(tw_engine *e, draft *d, slong count)
{
    if (count <= d->count) return;
    if (d->x) {
        d->x = base_resize(d->x, (size_t)count * sizeof *d->x);
        for (slong n = d->count; n < count; n++) d->x[n] = expr_int(e, 0);
    } else {
        fmpq *wider = _fmpq_vec_init(count);
        for (slong n = 0; n < d->count; n++) fmpq_swap(&wider[n], &d->q[n]);
        if (d->q) _fmpq_vec_clear(d->q, d->count);
        d->q = wider;
    }
    d->count = count;
}

/* The coefficients move up by `shift` > 0 places: the base moves down. */
static void draft_shift(tw_engine *e, draft *d, slong shift)
{
    slong old = d->count;
    draft_widen(e, d, old + shift);
    for (slong n = old - 1; n >= 0; n--) {
        if (d->x) {
            d->x[n + shift] = d->x[n];
            d->x[n] = expr_int(e, 0);
        } else {
            fmpq_swap(&d->q[n + shift], &d->q[n]);
        }
    }
    d->base = expr_sub(e, d->base, expr_int(e, shift * d->step));
}

static void draft_leave_rationals(tw_engine *e, draft *d)
{
    if (d->x) return;
    expr **x = base_alloc((size_t)(d->count > 0 ? d->count : 1) * sizeof *x);
    for (slong n = 0; n < d->count; n++) x[n] = expr_fmpq(e, &d->q[n]);
    if (d->q) _fmpq_vec_clear(d->q, d->count);
    d->q = NULL;
    d->x = x;
}

/* Where z = base stands in draft d, in steps; false when it is in another class. */
static bool draft_offset(tw_engine *e, const draft *d, expr *base, slong *offset)
{
    expr *away = expr_sub(e, base, d->base);
    if (!away || !expr_is_number(away)) return false;
    const fmpq *a = expr_number(away);
    if (!fmpz_is_one(fmpq_denref(a)) || !fmpz_fits_si(fmpq_numref(a))) return false;
    slong n = fmpz_get_si(fmpq_numref(a));
    if (n % d->step) return false;
    *offset = n / d->step;
    return true;
}

/* The draft with this constant and class, its base at or below `base`; *offset: where base stands. */
static draft *drafts_find(tw_engine *e, drafts *d, expr *constant, slong log_power, expr *base, slong stride,
                          slong *offset)
{
    for (size_t k = 0; k < d->count; k++) {
        draft *old = d->list[k];
        if (old->constant != constant || old->log_power != log_power || old->step != stride) continue;
        if (!draft_offset(e, old, base, offset)) continue;
        if (*offset < 0) {
            draft_shift(e, old, -*offset);
            *offset = 0;
        }
        return old;
    }
    draft *made = base_alloc(sizeof *made);
    *made = (draft){constant, log_power, base, stride, 0, NULL, NULL};
    d->list = base_resize(d->list, (d->count + 1) * sizeof *d->list);
    d->list[d->count++] = made;
    *offset = 0;
    return made;
}

static void draft_add_q(tw_engine *e, draft *d, slong n, const fmpq_t value)
{
    draft_widen(e, d, n + 1);
    if (d->x) d->x[n] = expr_add(e, d->x[n], expr_fmpq(e, value));
    else fmpq_add(&d->q[n], &d->q[n], value);
}

static void draft_add_x(tw_engine *e, draft *d, slong n, expr *value)
{
    draft_widen(e, d, n + 1);
    draft_leave_rationals(e, d);
    d->x[n] = expr_add(e, d->x[n], value);
}

/* ---- one residue class of one strand ---- */

typedef struct class_of {
    tw_engine *e;
    drafts *to;
    const strand *s;
    const kernel *k;
    slong first, period, step; /* indices first, first + period, ...; z moves by `step` */
    expr *z;                   /* at index `first` */
    expr *base;                /* r in (0, 1] when z is rational, else z */
    slong lead;                /* z - base */
    fmpq_t number;             /* the rational number of the constant */
    expr *constant;
    expr *folded; /* the strand's constant, where it goes into the coefficients; else NULL */
} class_of;

/* (1/mu)^(k+1), the factor's number, C(k,i) (-K)^i. */
static void weight_of_log(fmpq_t out, const class_of *c, slong i)
{
    slong k = c->s->log_power;
    fmpz_t binomial;
    fmpq_t u;
    fmpz_init(binomial);
    fmpq_init(u);
    fmpq_pow_si(out, c->k->mu, -(k + 1));
    fmpz_bin_uiui(binomial, (ulong)k, (ulong)i);
    fmpq_mul_fmpz(out, out, binomial);
    fmpq_neg(u, c->k->power);
    fmpq_pow_si(u, u, i);
    fmpq_mul(out, out, u);
    fmpq_mul(out, out, c->k->factor_number);
    fmpq_mul(out, out, c->number);
    fmpz_clear(binomial);
    fmpq_clear(u);
}

/* A number into the terms of a sum: 2 - 3*a, not 2*(1 - 3*a/2). */
static expr *number_times(tw_engine *e, expr *a, const fmpq_t number)
{
    expr *factor = expr_fmpq(e, number);
    if (!a || a->kind != EXPR_SUM) return expr_mul(e, a, factor);
    expr *sum = expr_int(e, 0);
    for (uint32_t k = 0; k < a->count; k++) sum = expr_add(e, sum, expr_mul(e, a->args[k], factor));
    return sum;
}

/* One term: its rational weight, and what is not rational of it (NULL: nothing). Numbers are multiplied into sums, and
 * sums of fixed constants into each other, so that like ones meet; products of parameters stay as they are. */
static void add_term(class_of *c, draft *d, slong n, const fmpq_t weight, expr *rest, slong index)
{
    if (coefficient_is_zero(&c->s->c, index)) return;
    if (!rest && c->s->c.domain == DOMAIN_RATIONAL) {
        fmpq_t value;
        fmpq_init(value);
        fmpq_mul(value, weight, &c->s->c.q[index]);
        draft_add_q(c->e, d, n, value);
        fmpq_clear(value);
        return;
    }
    expr *value = number_times(c->e, coefficient_expr(c->e, &c->s->c, index), weight);
    if (rest) value = expr_mul(c->e, value, rest);
    bool constants = (c->s->log_power > 0 || c->folded) && expr_is_number(c->z) && c->s->c.domain == DOMAIN_RATIONAL;
    draft_add_x(c->e, d, n, constants ? expr_expand(c->e, value) : value);
}

/* c^-(i): into the weight when c is rational, else into *rest. */
static void scale_weight(const class_of *c, fmpq_t weight, expr **rest, slong i)
{
    tw_engine *e = c->e;
    if (expr_is_one(c->k->constant)) return;
    if (expr_is_number(c->k->constant)) {
        fmpq_t u;
        fmpq_init(u);
        fmpq_pow_si(u, expr_number(c->k->constant), -i);
        fmpq_mul(weight, weight, u);
        fmpq_clear(u);
        return;
    }
    expr *power = expr_pow(e, c->k->constant, expr_int(e, -i));
    *rest = *rest ? expr_mul(e, *rest, power) : power;
}

/* The terms with (log s)^i of the class. */
static tw_status class_add_log(class_of *c, slong i)
{
    tw_engine *e = c->e;
    slong bell = c->s->log_power - i, offset;
    draft *d = drafts_find(e, c->to, c->constant, i, expr_add(e, c->base, expr_int(e, c->lead)), c->step, &offset);
    fmpq_t front, weight;
    fmpq_init(front);
    fmpq_init(weight);
    weight_of_log(front, c, i);
    walk w;
    walk_init(&w, e, c->base, bell, c->k->constant);
    walk_forward(&w, c->lead);
    slong n = 0;
    for (slong index = c->first; index < c->s->c.count && budget_ok(e); index += c->period, n++) {
        if (n > 0) walk_forward(&w, c->step);
        fmpq_mul(weight, front, w.rising);
        if (c->k->far_end && w.i % 2 == 0) fmpq_neg(weight, weight);
        expr *rest = w.rational ? NULL : w.rising_x;
        if (bell > 0 && !coefficient_is_zero(&c->s->c, index)) {
            expr *value = walk_bell(&w, bell);
            rest = rest ? expr_mul(e, rest, value) : value;
        }
        scale_weight(c, weight, &rest, w.i);
        if (c->folded) rest = rest ? expr_mul(e, rest, c->folded) : c->folded;
        add_term(c, d, offset + n, weight, rest, index);
    }
    if (d->count < offset + n) draft_widen(e, d, offset + n);
    walk_clear(&w);
    fmpq_clear(front);
    fmpq_clear(weight);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* z at index `first` as base + lead; checks that the integral of the term converges. */
static tw_status class_place(class_of *c)
{
    tw_engine *e = c->e;
    expr *a = expr_add(e, c->s->exponent, expr_frac(e, c->first, c->s->den));
    expr *z = expr_div(e, expr_add(e, a, expr_int(e, 1)), expr_fmpq(e, c->k->mu));
    if (!z) return TW_ERROR;
    c->z = c->base = z;
    c->lead = 0;
    if (!expr_is_number(z)) {
        if (!c->k->far_end) return TW_OK;
        return engine_fail(e, ERROR_UNSUITABLE, "the far end has a power that is no integer");
    }
    fmpz_t up;
    fmpz_init(up);
    fmpz_cdiv_q(up, fmpq_numref(expr_number(z)), fmpq_denref(expr_number(z)));
    bool fits = fmpz_fits_si(up);
    c->lead = fits ? fmpz_get_si(up) - 1 : 0;
    fmpz_clear(up);
    if (!fits) return engine_fail(e, ERROR_VALUE, "an exponent is too large");
    if (c->lead < 0)
        return engine_fail(e, ERROR_DIVERGENT,
                           "the integral does not converge where the exponent is least: "
                           "the amplitude is too singular there");
    c->base = expr_sub(e, z, expr_int(e, c->lead));
    if (c->k->far_end && (!expr_is_one(c->base) || c->s->log_power > 0))
        return engine_fail(e, ERROR_UNSUITABLE, "the far end is a branch point of the amplitude");
    return TW_OK;
}

/* strand constant * Gamma(base) * c^-base, its rational number apart. Beside logarithms the strand's constant (log(2),
 * say) may meet psi values, so it goes into the coefficients. */
static tw_status class_constant(class_of *c)
{
    tw_engine *e = c->e;
    if (c->folded && expr_is_one(c->folded)) c->folded = NULL;
    expr *parts[] = {c->folded ? expr_int(e, 1) : c->s->constant, expr_call1(e, FUNCTION_GAMMA, c->base),
                     expr_pow(e, c->k->constant, expr_neg(e, c->base))};
    if (!parts[1] || !parts[2]) return TW_ERROR;
    expr *constant = expr_product(e, parts, 3);
    if (!constant) return TW_ERROR;
    expr_as_coefficient(e, constant, c->number, &c->constant);
    return c->constant ? TW_OK : TW_ERROR;
}

static tw_status class_add(class_of *c)
{
    fmpq_init(c->number);
    tw_status status = class_place(c) == TW_OK && class_constant(c) == TW_OK ? TW_OK : TW_ERROR;
    for (slong i = 0; i <= c->s->log_power && status == TW_OK; i++) status = class_add_log(c, i);
    fmpq_clear(c->number);
    return status;
}

tw_status drafts_add(tw_engine *e, drafts *d, const series *q, const kernel *k)
{
    bool logs = false;
    d->sources++;
    for (size_t s = 0; s < q->count; s++) logs = logs || q->strands[s].log_power > 0;
    for (size_t s = 0; s < q->count; s++) {
        const strand *one = &q->strands[s];
        fmpq_t forward, unit;
        fmpq_init(forward);
        fmpq_init(unit);
        fmpq_inv(forward, k->mu);
        fmpq_set_si(unit, 1, (ulong)one->den);
        fmpq_mul(forward, forward, unit);
        fmpq_clear(unit);
        slong period = fmpz_get_si(fmpq_denref(forward)), steps = fmpz_get_si(fmpq_numref(forward));
        fmpq_clear(forward);
        for (slong j = 0; j < period && j < one->c.count; j++) {
            class_of c = {.e = e, .to = d, .s = one, .k = k, .first = j, .period = period, .step = steps};
            c.folded = logs ? one->constant : NULL;
            if (class_add(&c) != TW_OK) return TW_ERROR;
        }
    }
    return TW_OK;
}

/* ---- from drafts to lanes ---- */

/* Does a hold a symbol (bit 1), a fixed constant that is no rational (bit 2), an algebraic number written as a root (4)? */
static int expr_ingredients(expr *a)
{
    if (a->kind == EXPR_NUMBER) return 0;
    if (a->kind == EXPR_SYMBOL) return 1;
    if (a->kind == EXPR_CONSTANT) return 2;
    if (a->kind == EXPR_ROOT) return 4;
    bool arithmetic =
        a->kind == EXPR_SUM || a->kind == EXPR_PRODUCT ||
        (a->kind == EXPR_POWER && a->args[1]->kind == EXPR_NUMBER && fmpz_is_one(fmpq_denref(expr_number(a->args[1]))));
    int found = arithmetic ? 0 : 2;
    for (uint32_t k = 0; k < a->count && found != 7; k++) found |= expr_ingredients(a->args[k]);
    return found;
}

static domain_kind values_domain(expr *const *x, slong count)
{
    static const domain_kind kinds[] = {DOMAIN_RATIONAL,  DOMAIN_FUNCTIONS, DOMAIN_CONSTANTS, DOMAIN_MIXED,
                                        DOMAIN_ALGEBRAIC, DOMAIN_MIXED,     DOMAIN_CONSTANTS, DOMAIN_MIXED};
    int found = 0;
    for (slong n = 0; n < count; n++) found |= expr_ingredients(x[n]);
    return kinds[found];
}

/* x NULL: the rationals q. */
static void coefficients_take(coefficients *c, const fmpq *q, expr *const *x, slong count)
{
    c->domain = x ? values_domain(x, count) : DOMAIN_RATIONAL;
    c->count = count;
    if (c->domain == DOMAIN_RATIONAL) {
        c->q = _fmpq_vec_init(count);
        for (slong n = 0; n < count; n++) fmpq_set(&c->q[n], x ? expr_number(x[n]) : &q[n]);
    } else {
        c->x = base_alloc((size_t)count * sizeof *c->x);
        memcpy(c->x, x, (size_t)count * sizeof *c->x);
    }
}

static void widen_domain(contribution *c, domain_kind d)
{
    if (c->domain == DOMAIN_RATIONAL) c->domain = d;
    else if (d != c->domain && d != DOMAIN_RATIONAL) c->domain = DOMAIN_MIXED;
}

tw_status contribution_set_lane(tw_engine *e, contribution *c, expr *constant, expr *first_exponent,
                                const fmpq_t forward, expr *const *x, slong count)
{
    for (slong n = 0; n < count; n++)
        if (!x[n]) return TW_ERROR;
    if (!constant || !first_exponent) return TW_ERROR;
    c->lanes = base_resize(c->lanes, (c->lane_count + 1) * sizeof *c->lanes);
    lane *l = &c->lanes[c->lane_count++];
    lane_init(l);
    l->constant = constant;
    l->first_exponent = first_exponent;
    fmpq_set(l->step, forward);
    coefficients_take(&l->c, NULL, x, count);
    widen_domain(c, l->c.domain);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static bool draft_is_zero(const draft *d)
{
    for (slong n = 0; n < d->count; n++)
        if (d->x ? !expr_is_zero(d->x[n]) : !fmpq_is_zero(&d->q[n])) return false;
    return true;
}

/* The order of size of the lanes' first terms, where their exponents are numbers: only for the eye. */
static bool lane_leads(const lane *a, const lane *b, bool small)
{
    if (!expr_is_number(a->first_exponent) || !expr_is_number(b->first_exponent)) return false;
    int order = fmpq_cmp(expr_number(a->first_exponent), expr_number(b->first_exponent));
    return order == 0 ? a->log_power > b->log_power : (order > 0) != small;
}

static void lanes_sort(contribution *c, bool small)
{
    for (size_t k = 1; k < c->lane_count; k++)
        for (size_t n = k; n > 0 && lane_leads(&c->lanes[n], &c->lanes[n - 1], small); n--) {
            lane swap = c->lanes[n];
            c->lanes[n] = c->lanes[n - 1];
            c->lanes[n - 1] = swap;
        }
}

tw_status drafts_finish(tw_engine *e, drafts *d, contribution *c, const kernel *k)
{
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    contribution_clear_lanes(c);
    c->lanes = base_alloc((d->count + 1) * sizeof *c->lanes);
    c->zeros = base_alloc((d->count + 1) * sizeof *c->zeros);
    c->domain = DOMAIN_RATIONAL;
    fmpq_t minus;
    fmpq_init(minus);
    fmpq_neg(minus, k->power);
    for (size_t n = 0; n < d->count; n++) {
        draft *one = d->list[n];
        for (slong j = 0; d->sources > 1 && one->x && j < one->count; j++) {
            if (one->x[j] && one->x[j]->kind == EXPR_SUM) one->x[j] = value_canonical(e, one->x[j]);
            if (!one->x[j]) break;
        }
        if (e->error.kind != ERROR_NONE) break;
        bool zero = draft_is_zero(one);
        lane *l = zero ? &c->zeros[c->zero_count++] : &c->lanes[c->lane_count++];
        lane_init(l);
        l->constant = one->constant;
        l->log_power = one->log_power;
        l->first_exponent = expr_add(e, expr_mul(e, expr_fmpq(e, minus), one->base), expr_fmpq(e, k->factor_power));
        fmpq_mul_si(l->step, minus, one->step);
        coefficients_take(&l->c, one->q, one->x, one->count);
        if (!zero) widen_domain(c, l->c.domain);
    }
    fmpq_clear(minus);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    lanes_sort(c, fmpq_sgn(k->power) < 0);
    return TW_OK;
}
