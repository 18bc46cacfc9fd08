/* Recurrences as values: made, printed, tested on coefficients. The one idea: coefficients are polynomials in a field
 * whose generators are the index and the parameters, so that a recurrence with parameters is no other thing than one
 * over Q. Running them far is recurrence_run.c's. */
#include "engine/exact/recurrence.h"

#include <stdlib.h>
#include <string.h>

const char *recurrence_label_word(recurrence_label l)
{
    return l == RECURRENCE_PROVED ? "proved" : "fitted";
}

/* ---- roots ---- */

static int compare_slongs(const void *a, const void *b)
{
    slong x = *(const slong *)a, y = *(const slong *)b;
    return x < y ? -1 : x > y;
}

/* Integer roots >= 0 of a univariate polynomial. */
static slong *integer_roots(const fmpz_poly_t p, slong *count)
{
    fmpz_poly_factor_t parts;
    fmpz_poly_factor_init(parts);
    fmpz_poly_factor(parts, p);
    slong *roots = base_alloc((size_t)(parts->num + 1) * sizeof *roots);
    *count = 0;
    fmpz_t root;
    fmpz_init(root);
    for (slong k = 0; k < parts->num; k++) {
        const fmpz_poly_struct *one = parts->p + k;
        if (fmpz_poly_degree(one) != 1 || !fmpz_is_pm1(one->coeffs + 1)) continue;
        fmpz_mul(root, one->coeffs, one->coeffs + 1);
        fmpz_neg(root, root);
        if (fmpz_sgn(root) >= 0 && fmpz_fits_si(root)) roots[(*count)++] = fmpz_get_si(root);
    }
    fmpz_clear(root);
    fmpz_poly_factor_clear(parts);
    qsort(roots, (size_t)*count, sizeof *roots, compare_slongs);
    return roots;
}

slong *polynomial_roots(const field *f, slong variable, const fmpz_mpoly_t p, slong *count)
{
    slong *others = base_alloc((size_t)f->room * sizeof *others), n = 0;
    for (slong k = 0; k < f->room; k++)
        if (k != variable) others[n++] = k;
    fmpz_mpoly_t common;
    fmpz_poly_t u;
    fmpz_mpoly_init(common, f->ctx);
    fmpz_poly_init(u);
    slong *roots = NULL;
    *count = 0;
    if (n == 0) fmpz_mpoly_set(common, p, f->ctx);
    else if (!fmpz_mpoly_content_vars(common, p, others, n, f->ctx)) fmpz_mpoly_one(common, f->ctx);
    if (fmpz_mpoly_get_fmpz_poly(u, common, variable, f->ctx) && fmpz_poly_length(u) > 1) roots = integer_roots(u, count);
    free(others);
    fmpz_mpoly_clear(common, f->ctx);
    fmpz_poly_clear(u);
    return roots ? roots : base_alloc(sizeof *roots);
}

/* ---- life ---- */

/* Divides all a_j by their greatest common factor. Where that factor vanishes the relation would be lost, but for factors
 * whose roots are no n >= 0: those are left out in *voided*, to be looked at. */
static void make_primitive(recurrence *r, fmpz_mpoly_t removed)
{
    const fmpz_mpoly_ctx_struct *ctx = r->f->ctx;
    fmpz_mpoly_zero(removed, ctx);
    for (slong j = 0; j <= r->order; j++)
        if (!fmpz_mpoly_gcd(removed, removed, &r->a[j], ctx)) fmpz_mpoly_one(removed, ctx);
    if (fmpz_mpoly_is_zero(removed, ctx)) return;
    for (slong j = 0; j <= r->order; j++)
        if (!fmpz_mpoly_is_zero(&r->a[j], ctx)) fmpz_mpoly_divides(&r->a[j], &r->a[j], removed, ctx);
    fmpz_t sign;
    fmpz_init(sign);
    if (!fmpz_mpoly_is_zero(&r->a[r->order], ctx)) fmpz_mpoly_get_term_coeff_fmpz(sign, &r->a[r->order], 0, ctx);
    if (fmpz_sgn(sign) < 0)
        for (slong j = 0; j <= r->order; j++) fmpz_mpoly_neg(&r->a[j], &r->a[j], ctx);
    fmpz_clear(sign);
}

static void add_voids(recurrence *r, const fmpz_mpoly_t p)
{
    slong count;
    slong *roots = polynomial_roots(r->f, r->variable, p, &count);
    for (slong k = 0; k < count; k++) {
        bool old = false;
        for (slong m = 0; m < r->void_count; m++) old = old || r->voids[m] == roots[k];
        if (old) continue;
        r->voids = base_resize(r->voids, ((size_t)r->void_count + 1) * sizeof *r->voids);
        r->voids[r->void_count++] = roots[k];
    }
    free(roots);
    if (r->void_count) qsort(r->voids, (size_t)r->void_count, sizeof *r->voids, compare_slongs);
}

/* Out = p as a polynomial in the variable alone; false when another one occurs. */
static bool univariate(fmpz_poly_t out, const fmpz_mpoly_t p, slong variable, const field *f)
{
    return fmpz_mpoly_is_fmpz_poly(p, variable, f->ctx) && fmpz_mpoly_get_fmpz_poly(out, p, variable, f->ctx);
}

/* Over Z when nothing but n occurs. */
static void set_univariate(recurrence *r)
{
    r->p = base_alloc((size_t)(r->order + 1) * sizeof *r->p);
    bool good = true;
    for (slong j = 0; j <= r->order; j++) fmpz_poly_init(&r->p[j]);
    for (slong j = 0; j <= r->order && good; j++)
        good = univariate(&r->p[j], &r->a[j], r->variable, r->f);
    if (good) return;
    for (slong j = 0; j <= r->order; j++) fmpz_poly_clear(&r->p[j]);
    free(r->p);
    r->p = NULL;
}

/* c[m] must be given for m < order, and where the leading coefficient vanishes or the identity is void at m - order. */
static void set_needed(recurrence *r)
{
    slong count;
    slong *roots = polynomial_roots(r->f, r->variable, &r->a[r->order], &count);
    r->needed = r->order;
    for (slong k = 0; k < count; k++) r->needed = FLINT_MAX(r->needed, roots[k] + r->order + 1);
    for (slong k = 0; k < r->void_count; k++) r->needed = FLINT_MAX(r->needed, r->voids[k] + r->order + 1);
    free(roots);
}

recurrence *recurrence_new(tw_engine *e, field *f, expr *n, fmpz_mpoly_struct *a, slong order, const fmpz_mpoly_t voided)
{
    (void)e;
    recurrence *r = base_alloc(sizeof *r);
    *r = (recurrence){.f = f, .n = n, .order = order, .a = a};
    r->variable = field_variable(f, n);
    fmpz_mpoly_t removed;
    fmpz_mpoly_init(removed, f->ctx);
    make_primitive(r, removed);
    add_voids(r, removed);
    if (voided) add_voids(r, voided);
    fmpz_mpoly_clear(removed, f->ctx);
    for (slong j = 0; j <= order; j++)
        r->degree = FLINT_MAX(r->degree, fmpz_mpoly_degree_si(&a[j], r->variable, f->ctx));
    set_univariate(r);
    set_needed(r);
    return r;
}

void recurrence_free(recurrence *r)
{
    if (!r) return;
    for (slong j = 0; j <= r->order; j++) fmpz_mpoly_clear(&r->a[j], r->f->ctx);
    free(r->a);
    if (r->p)
        for (slong j = 0; j <= r->order; j++) fmpz_poly_clear(&r->p[j]);
    free(r->p);
    free(r->voids);
    free(r->c);
    free(r->certificates);
    field_clear(r->f);
    free(r->f);
    free(r);
}

/* ---- as expressions ---- */

static expr *element_expr(field *f, const fmpz_mpoly_t p)
{
    element a;
    element_init(f, &a);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&a), p, f->ctx);
    expr *made = field_to_expr(f, &a);
    element_clear(f, &a);
    return made;
}

expr *polynomial_factored(tw_engine *e, field *f, const fmpz_mpoly_t p)
{
    fmpz_mpoly_factor_t parts;
    fmpz_mpoly_factor_init(parts, f->ctx);
    if (fmpz_mpoly_is_zero(p, f->ctx) || !fmpz_mpoly_factor(parts, p, f->ctx)) {
        fmpz_mpoly_factor_clear(parts, f->ctx);
        return element_expr(f, p);
    }
    expr **factors = base_alloc((size_t)(parts->num + 1) * sizeof *factors);
    factors[0] = expr_fmpz(e, parts->constant);
    for (slong k = 0; k < parts->num; k++)
        factors[k + 1] = expr_pow(e, element_expr(f, parts->poly + k), expr_fmpz(e, parts->exp + k));
    bool good = true;
    for (slong k = 0; k <= parts->num; k++) good = good && factors[k];
    expr *made = good ? expr_product(e, factors, (size_t)parts->num + 1) : NULL;
    free(factors);
    fmpz_mpoly_factor_clear(parts, f->ctx);
    return made;
}

expr *recurrence_coefficient(tw_engine *e, const recurrence *r, slong j)
{
    return polynomial_factored(e, r->f, &r->a[j]);
}

/* A quotient of polynomials as its factors: a number, powers above and below the line. */
typedef struct ratio {
    bool negative;
    fmpz_t num, den;
    text above, below;
    slong above_count, below_count;
} ratio;

static void ratio_init(ratio *q)
{
    *q = (ratio){.negative = false};
    fmpz_init(q->num), fmpz_init(q->den);
    fmpz_one(q->num), fmpz_one(q->den);
    text_init(&q->above), text_init(&q->below);
}

static void ratio_clear(ratio *q)
{
    fmpz_clear(q->num), fmpz_clear(q->den);
    text_clear(&q->above), text_clear(&q->below);
}

/* "*(2*n + 1)^2" */
static tw_status add_power(tw_engine *e, field *f, text *out, const fmpz_mpoly_t base, const fmpz_t power)
{
    char *words = expr_text(e, element_expr(f, base));
    if (!words) return TW_ERROR;
    text_addf(out, fmpz_mpoly_length(base, f->ctx) > 1 ? "*(%s)" : "*%s", words);
    free(words);
    if (fmpz_is_one(power)) return TW_OK;
    char *exponent = fmpz_get_str(NULL, 10, power);
    text_addf(out, "^%s", exponent);
    flint_free(exponent);
    return TW_OK;
}

/* Multiplies by p, or divides. Irreducible factors of both sides are distinct when num and den have none in common. */
static tw_status ratio_take(tw_engine *e, ratio *q, field *f, const fmpz_mpoly_t p, bool below)
{
    fmpz_mpoly_factor_t parts;
    fmpz_mpoly_factor_init(parts, f->ctx);
    tw_status status = TW_OK;
    if (!fmpz_mpoly_factor(parts, p, f->ctx)) {
        fmpz_one(parts->constant);
        status = engine_fail(e, ERROR_UNDECIDED, "a polynomial of the recurrence could not be factored");
    }
    fmpz_mpoly_factor_sort(parts, f->ctx);
    if (fmpz_sgn(parts->constant) < 0) q->negative = !q->negative;
    fmpz_t size;
    fmpz_init(size);
    fmpz_abs(size, parts->constant);
    fmpz_mul(below ? q->den : q->num, below ? q->den : q->num, size);
    fmpz_clear(size);
    for (slong k = 0; k < parts->num && status == TW_OK; k++) {
        status = add_power(e, f, below ? &q->below : &q->above, parts->poly + k, parts->exp + k);
        ++*(below ? &q->below_count : &q->above_count);
    }
    fmpz_mpoly_factor_clear(parts, f->ctx);
    return status;
}

/* Its words without the sign: "4*n^2*(n + 1)/(3*(n + 2))". */
static void ratio_print(text *out, const ratio *q)
{
    char *num = fmpz_get_str(NULL, 10, q->num), *den = fmpz_get_str(NULL, 10, q->den);
    bool one = fmpz_is_one(q->num) && q->above_count > 0, unit = fmpz_is_one(q->den);
    if (!one) text_add(out, num);
    if (q->above_count) text_add(out, q->above.bytes + one);
    bool brackets = q->below_count + !unit > 1;
    if (q->below_count + !unit > 0) text_add(out, brackets ? "/(" : "/");
    if (!unit) text_add(out, den);
    if (q->below_count) text_add(out, q->below.bytes + unit);
    if (brackets) text_add_char(out, ')');
    flint_free(num);
    flint_free(den);
}

static void add_value(text *out, const recurrence *r, slong j)
{
    if (j == 0) text_addf(out, "c[%s]", r->n->is.name);
    else text_addf(out, "c[%s+%ld]", r->n->is.name, (long)j);
}

/* "a/b * c[n+j]" with the sign in front as in a sum; first: no blanks around the sign. a NULL: 1; b NULL: 1. */
static tw_status add_part(tw_engine *e, text *out, const recurrence *r, const fmpz_mpoly_struct *a,
                          const fmpz_mpoly_struct *b, slong j, bool negative, bool first)
{
    field *f = r->f;
    ratio q;
    fmpz_mpoly_q_t value;
    ratio_init(&q);
    fmpz_mpoly_q_init(value, f->ctx);
    fmpz_mpoly_q_one(value, f->ctx);
    if (a) fmpz_mpoly_set(fmpz_mpoly_q_numref(value), a, f->ctx);
    if (b) fmpz_mpoly_set(fmpz_mpoly_q_denref(value), b, f->ctx);
    fmpz_mpoly_q_canonicalise(value, f->ctx);
    tw_status status = ratio_take(e, &q, f, fmpz_mpoly_q_numref(value), false);
    if (status == TW_OK) status = ratio_take(e, &q, f, fmpz_mpoly_q_denref(value), true);
    if (q.negative) negative = !negative;
    text_add(out, first ? (negative ? "-" : "") : negative ? " - " : " + ");
    bool one = fmpz_is_one(q.num) && fmpz_is_one(q.den) && q.above_count + q.below_count == 0;
    if (!one) {
        ratio_print(out, &q);
        text_add(out, " * ");
    }
    add_value(out, r, j);
    fmpz_mpoly_q_clear(value, f->ctx);
    ratio_clear(&q);
    return status;
}

tw_status recurrence_print(tw_engine *e, text *out, const recurrence *r)
{
    const fmpz_mpoly_struct *lead = &r->a[r->order];
    bool solved = r->order <= 1 || fmpz_mpoly_is_fmpz(lead, r->f->ctx);
    if (add_part(e, out, r, solved ? NULL : lead, NULL, r->order, false, true) != TW_OK) return TW_ERROR;
    text_add(out, " = ");
    bool first = true;
    for (slong j = r->order - 1; j >= 0; j--) {
        if (fmpz_mpoly_is_zero(&r->a[j], r->f->ctx)) continue;
        if (add_part(e, out, r, &r->a[j], solved ? lead : NULL, j, true, first) != TW_OK) return TW_ERROR;
        first = false;
    }
    if (first) text_add(out, "0");
    return TW_OK;
}

/* ---- on coefficients ---- */

static bool is_void(const recurrence *r, slong n)
{
    for (slong k = 0; k < r->void_count; k++)
        if (r->voids[k] == n) return true;
    return false;
}

static bool fits_rational(const recurrence *r, expr *const *c, slong n)
{
    fmpq_t sum, t;
    fmpz_t at, value;
    fmpq_init(sum), fmpq_init(t);
    fmpz_init_set_si(at, n), fmpz_init(value);
    for (slong j = 0; j <= r->order; j++) {
        fmpz_poly_evaluate_fmpz(value, &r->p[j], at);
        fmpq_mul_fmpz(t, expr_number(c[n + j]), value);
        fmpq_add(sum, sum, t);
    }
    bool fits = fmpq_is_zero(sum);
    fmpq_clear(sum), fmpq_clear(t);
    fmpz_clear(at), fmpz_clear(value);
    return fits;
}

/* NO when it is proved not to fit. */
static answer fits_symbolic(tw_engine *e, const recurrence *r, expr *const *a, expr *const *c, slong n)
{
    expr *sum = expr_int(e, 0);
    for (slong j = 0; j <= r->order; j++) {
        expr *here = expr_substitute(e, a[j], r->n, expr_int(e, n));
        sum = expr_add(e, sum, expr_mul(e, here, c[n + j]));
    }
    if (!sum) return ANSWER_UNKNOWN;
    if (expr_is_number(sum)) return expr_is_zero(sum) ? ANSWER_YES : ANSWER_NO;
    answer known = ANSWER_UNKNOWN;
    for (slong room = 4; room <= 32 && known == ANSWER_UNKNOWN && e->error.kind == ERROR_NONE; room *= 2) {
        field f;
        element value;
        field_init(&f, e, room);
        element_init(&f, &value);
        bool full = field_from_expr(&f, &value, sum) != TW_OK && f.full;
        if (!full && e->error.kind == ERROR_NONE) known = field_is_zero(&f, &value);
        element_clear(&f, &value);
        field_clear(&f);
        if (!full) break;
    }
    return known;
}

/* The coefficients as expressions, values of parameters put in; fresh array. */
static expr **coefficients_at(tw_engine *e, const recurrence *r, const env *at)
{
    expr **a = base_alloc((size_t)(r->order + 1) * sizeof *a);
    for (slong j = 0; j <= r->order; j++) {
        a[j] = recurrence_coefficient(e, r, j);
        if (at && at->count && a[j]) a[j] = expr_substitute_all(e, a[j], at->symbols, at->values, at->count);
    }
    return a;
}

slong recurrence_misfit(tw_engine *e, const recurrence *r, const env *at, expr *const *c, slong count)
{
    bool rational = r->p != NULL;
    for (slong n = 0; n < count && rational; n++) rational = expr_is_number(c[n]);
    expr **a = coefficients_at(e, r, at);
    slong found = -1;
    for (slong n = 0; n + r->order < count && found == -1 && budget_ok(e); n++) {
        if (is_void(r, n)) continue;
        bool fits = rational ? fits_rational(r, c, n) : fits_symbolic(e, r, a, c, n) != ANSWER_NO;
        if (!fits) found = n;
    }
    free(a);
    return e->error.kind == ERROR_NONE ? found : -2;
}

void recurrence_sides(tw_engine *e, const recurrence *r, const env *at, expr *const *c, slong n, expr **left,
                      expr **right)
{
    expr **a = coefficients_at(e, r, at), *sum = expr_int(e, 0);
    for (slong j = 0; j <= r->order; j++) {
        expr *value = expr_mul(e, expr_substitute(e, a[j], r->n, expr_int(e, n)), c[n + j]);
        if (j == r->order) *left = expr_expand(e, value);
        else sum = expr_sub(e, sum, value);
    }
    *right = expr_expand(e, sum);
    free(a);
}
