/* The one idea: c[n+1] = -a_0(n)/a_1(n) c[n] is a product over 0 .. n-1, and a product of linear factors n + alpha is
 * Gamma(n + alpha)/Gamma(alpha) (DLMF 5.5.1). */
#include "engine/exact/closed_form.h"

#include <string.h>

/* u, v with p = u*n + v; false when p is of another degree in n. */
static bool split_linear(const recurrence *r, const fmpz_mpoly_t p, fmpz_mpoly_t u, fmpz_mpoly_t v)
{
    const fmpz_mpoly_ctx_struct *ctx = r->f->ctx;
    slong x = r->variable;
    ulong one = 1, none = 0;
    if (fmpz_mpoly_degree_si(p, x, ctx) != 1) return false;
    fmpz_mpoly_get_coeff_vars_ui(u, p, &x, &one, 1, ctx);
    fmpz_mpoly_get_coeff_vars_ui(v, p, &x, &none, 1, ctx);
    return true;
}

static expr *ratio_expr(const recurrence *r, const fmpz_mpoly_t num, const fmpz_mpoly_t den)
{
    element a;
    element_init(r->f, &a);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&a), num, r->f->ctx);
    fmpz_mpoly_set(fmpz_mpoly_q_denref(&a), den, r->f->ctx);
    fmpz_mpoly_q_canonicalise(&a, r->f->ctx);
    expr *made = field_to_expr(r->f, &a);
    element_clear(r->f, &a);
    return made;
}

/* alpha is no integer <= 0. */
static bool is_regular(expr *alpha)
{
    return alpha && (!expr_is_number(alpha) || !fmpz_is_one(fmpq_denref(expr_number(alpha))) ||
                     fmpq_sgn(expr_number(alpha)) > 0);
}

/* One irreducible factor with its multiplicity: its leading coefficient into the ratio, its root into the list. */
static bool take_factor(tw_engine *e, const recurrence *r, const fmpz_mpoly_t p, slong power, expr **ratio, expr **list,
                        size_t *count, bool below)
{
    const fmpz_mpoly_ctx_struct *ctx = r->f->ctx;
    fmpz_mpoly_t u, v, one;
    fmpz_mpoly_init(u, ctx), fmpz_mpoly_init(v, ctx), fmpz_mpoly_init(one, ctx);
    fmpz_mpoly_one(one, ctx);
    bool constant = fmpz_mpoly_degree_si(p, r->variable, ctx) == 0, good = constant || split_linear(r, p, u, v);
    if (good) {
        expr *lead = ratio_expr(r, constant ? p : u, one);
        *ratio = expr_mul(e, *ratio, expr_pow(e, lead, expr_int(e, below ? -power : power)));
    }
    if (good && !constant) {
        expr *alpha = ratio_expr(r, v, u);
        good = is_regular(alpha) && *count + (size_t)power <= CLOSED_FACTORS;
        for (slong k = 0; k < power && good; k++) list[(*count)++] = alpha;
    }
    fmpz_mpoly_clear(u, ctx), fmpz_mpoly_clear(v, ctx), fmpz_mpoly_clear(one, ctx);
    return good;
}

static bool take_polynomial(tw_engine *e, const recurrence *r, slong j, expr **ratio, expr **list, size_t *count)
{
    fmpz_mpoly_factor_t parts;
    fmpz_mpoly_factor_init(parts, r->f->ctx);
    bool good = fmpz_mpoly_factor(parts, &r->a[j], r->f->ctx);
    if (good) {
        fmpz_mpoly_factor_sort(parts, r->f->ctx);
        expr *number = expr_fmpz(e, parts->constant);
        *ratio = j == 0 ? expr_mul(e, *ratio, number) : expr_div(e, *ratio, number);
    }
    for (slong k = 0; k < parts->num && good; k++)
        good = fmpz_fits_si(parts->exp + k) && fmpz_cmp_si(parts->exp + k, CLOSED_FACTORS) <= 0 &&
               take_factor(e, r, parts->poly + k, fmpz_get_si(parts->exp + k), ratio, list, count, j == 1);
    fmpz_mpoly_factor_clear(parts, r->f->ctx);
    return good;
}

/* Equal entries above and below the line go. */
static void cancel(closed_form *c)
{
    for (size_t i = 0; i < c->above_count; i++)
        for (size_t j = 0; j < c->below_count; j++) {
            if (c->above[i] != c->below[j]) continue;
            c->above[i] = c->above[--c->above_count];
            c->below[j] = c->below[--c->below_count];
            i--;
            break;
        }
}

bool closed_form_find(tw_engine *e, closed_form *out, const recurrence *r, expr *first)
{
    memset(out, 0, sizeof *out);
    if (r->order != 1 || r->void_count > 0 || r->needed > 1 || !first) return false;
    if (fmpz_mpoly_is_zero(&r->a[0], r->f->ctx)) return false;
    out->first = first;
    out->ratio = expr_int(e, -1);
    bool good = take_polynomial(e, r, 0, &out->ratio, out->above, &out->above_count) &&
                take_polynomial(e, r, 1, &out->ratio, out->below, &out->below_count);
    if (e->error.kind == ERROR_VALUE) engine_forgive(e);
    if (good) cancel(out);
    return good && out->ratio && e->error.kind == ERROR_NONE;
}

static expr *gamma_of(tw_engine *e, expr *a)
{
    return expr_call1(e, FUNCTION_GAMMA, a);
}

expr *closed_form_expr(tw_engine *e, const closed_form *c, expr *n)
{
    expr *made = expr_mul(e, c->first, expr_pow(e, c->ratio, n));
    for (size_t k = 0; k < c->above_count; k++)
        made = expr_mul(e, made, expr_div(e, gamma_of(e, expr_add(e, n, c->above[k])), gamma_of(e, c->above[k])));
    for (size_t k = 0; k < c->below_count; k++)
        made = expr_mul(e, made, expr_div(e, gamma_of(e, c->below[k]), gamma_of(e, expr_add(e, n, c->below[k]))));
    return made;
}

/* Gamma(n + alpha) ~ sqrt(2 pi) n^(n + alpha - 1/2) exp(-n), and Gamma(m n + b) ~ sqrt(2 pi) m^(m n + b - 1/2)
 * n^(m n + b - 1/2) exp(-m n): the powers of n give b = sum above - sum below - (m - 1)/2. */
bool closed_form_growth(tw_engine *e, const closed_form *c, slong *m, expr **f, expr **b, expr **k)
{
    if (c->above_count < c->below_count) return false;
    *m = (slong)(c->above_count - c->below_count);
    expr *sum = expr_int(e, 0), *factor = c->first;
    for (size_t i = 0; i < c->above_count; i++) {
        sum = expr_add(e, sum, c->above[i]);
        factor = expr_div(e, factor, gamma_of(e, c->above[i]));
    }
    for (size_t i = 0; i < c->below_count; i++) {
        sum = expr_sub(e, sum, c->below[i]);
        factor = expr_mul(e, factor, gamma_of(e, c->below[i]));
    }
    *b = sum;
    *k = factor;
    *f = expr_pow(e, c->ratio, expr_int(e, -1));
    if (*m > 0) {
        expr *size = expr_int(e, *m), *half = expr_frac(e, 1, 2);
        *b = expr_sub(e, sum, expr_frac(e, *m - 1, 2));
        expr *circle = expr_pow(e, expr_mul(e, expr_int(e, 2), expr_constant_of(e, CONSTANT_PI)), expr_frac(e, *m - 1, 2));
        *k = expr_mul(e, expr_mul(e, factor, circle), expr_pow(e, size, expr_sub(e, half, *b)));
        *f = expr_mul(e, expr_pow(e, size, size), *f);
    }
    return *f && *b && *k;
}
