/* The one idea: put K Gamma(m n + b)/F^n into the recurrence; the highest power of n that is left gives an equation for F
 * alone, the next one is linear in b. Constants K belong to the sequence, not to the recurrence: they are found by fitting
 * K_i (1 + k_(i,1)/n + ... + k_(i,M)/n^M), all parts together, at places far out, twice; a part that is not in the sequence
 * shows itself by estimates that shrink. */
#include "engine/exact/large_order.h"

#include <stdlib.h>
#include <string.h>

#include "engine/exact/values.h"

enum { PLACES = 160, CORRECTIONS = 10, ESTIMATE_BITS = 1600 };

void large_order_init(large_order *g)
{
    memset(g, 0, sizeof *g);
    for (int k = 0; k < LARGE_ORDER_PARTS; k++) acb_init(g->parts[k].value);
}

void large_order_clear(large_order *g)
{
    for (int k = 0; k < LARGE_ORDER_PARTS; k++) acb_clear(g->parts[k].value);
}

static tw_status refuse(tw_engine *e, const char *words)
{
    return engine_fail(e, ERROR_UNSUITABLE, "%s", words);
}

/* ---- the characteristic polynomial ---- */

typedef struct balance {
    slong m, top;        /* degree p_j + m j is at most `top` */
    fmpz_poly_t chi;     /* sum over those that attain it of the leading coefficients times lambda^j */
    fmpq_poly_t linear, rest; /* b * linear(lambda) + rest(lambda) = 0 */
} balance;

/* m = max (deg p_j - deg p_r)/(r - j), when it is a whole number >= 0. */
static tw_status find_power(tw_engine *e, balance *x, const recurrence *r)
{
    slong last = fmpz_poly_degree(&r->p[r->order]), up = 0, down = 1;
    bool any = false;
    for (slong j = 0; j < r->order; j++) {
        if (fmpz_poly_is_zero(&r->p[j])) continue;
        slong u = fmpz_poly_degree(&r->p[j]) - last, d = r->order - j;
        if (!any || u * down > up * d) up = u, down = d;
        any = true;
    }
    if (!any) return refuse(e, "the coefficients end");
    if (up < 0) return refuse(e, "the coefficients decrease faster than any power: the series converges");
    if (up % down) return refuse(e, "the coefficients grow like a fractional power of n!, a form that is not resolved");
    x->m = up / down;
    x->top = last + x->m * r->order;
    return TW_OK;
}

/* The factor of the correction of order 1/n of c[n+j]/c[n]: b*j + j (m j - 1)/2, or b*j when m = 0. */
static void set_balance(balance *x, const recurrence *r)
{
    fmpq_t u, v;
    fmpz_t c;
    fmpq_init(u), fmpq_init(v);
    fmpz_init(c);
    for (slong j = 0; j <= r->order; j++) {
        slong d = fmpz_poly_degree(&r->p[j]), size = d + x->m * j;
        if (d < 0 || size < x->top - 1) continue;
        fmpz_poly_get_coeff_fmpz(c, &r->p[j], d);
        fmpq_set_fmpz(u, c);
        if (size == x->top - 1) {
            fmpq_poly_get_coeff_fmpq(v, x->rest, j);
            fmpq_add(v, v, u);
            fmpq_poly_set_coeff_fmpq(x->rest, j, v);
            continue;
        }
        fmpz_poly_set_coeff_fmpz(x->chi, j, c);
        fmpq_mul_si(v, u, j);
        fmpq_poly_set_coeff_fmpq(x->linear, j, v);
        fmpq_mul_si(v, u, x->m > 0 ? j * (x->m * j - 1) : 0);
        fmpq_div_2exp(v, v, 1);
        if (d > 0) {
            fmpz_poly_get_coeff_fmpz(c, &r->p[j], d - 1);
            fmpq_add_fmpz(v, v, c);
        }
        fmpq_poly_set_coeff_fmpq(x->rest, j, v);
    }
    fmpq_clear(u), fmpq_clear(v);
    fmpz_clear(c);
}

/* ---- roots ---- */

typedef struct root {
    acb_t f;       /* its ball */
    fmpq_poly_t b; /* as a polynomial in lambda modulo its irreducible factor */
    bool simple;
    slong degree;
    expr *exact_f, *exact_b;
    expr *square; /* |F|^2 of a complex root of degree two, else NULL */
} root;

/* b = -rest/linear modulo g (of lambda). False when lambda is a multiple root. */
static bool solve_power(fmpq_poly_t b, const balance *x, const fmpz_poly_t g)
{
    fmpq_poly_t modulus, inverse, other, common, reduced;
    fmpq_poly_init(modulus), fmpq_poly_init(inverse), fmpq_poly_init(other), fmpq_poly_init(common), fmpq_poly_init(reduced);
    fmpq_poly_set_fmpz_poly(modulus, g);
    fmpq_poly_rem(reduced, x->linear, modulus);
    bool simple = !fmpq_poly_is_zero(reduced);
    if (simple) {
        fmpq_poly_xgcd(common, inverse, other, reduced, modulus);
        simple = fmpq_poly_degree(common) == 0;
    }
    if (simple) {
        fmpq_poly_mul(b, x->rest, inverse);
        fmpq_poly_neg(b, b);
        fmpq_poly_rem(b, b, modulus);
    }
    fmpq_poly_clear(modulus), fmpq_poly_clear(inverse), fmpq_poly_clear(other), fmpq_poly_clear(common);
    fmpq_poly_clear(reduced);
    return simple;
}

/* The polynomial of F = m^m / lambda (1/lambda when m = 0) from that of lambda. */
static void reverse_polynomial(fmpz_poly_t out, const fmpz_poly_t g, slong m)
{
    fmpz_t scale, c;
    fmpz_init(scale), fmpz_init(c);
    slong degree = fmpz_poly_degree(g);
    fmpz_poly_zero(out);
    for (slong j = 0; j <= degree; j++) {
        fmpz_poly_get_coeff_fmpz(c, g, j);
        fmpz_ui_pow_ui(scale, m > 0 ? (ulong)m : 1, (ulong)(m * j));
        fmpz_mul(c, c, scale);
        fmpz_poly_set_coeff_fmpz(out, degree - j, c);
    }
    fmpz_poly_primitive_part(out, out);
    if (fmpz_sgn(fmpz_poly_lead(out)) < 0) fmpz_poly_neg(out, out);
    fmpz_clear(scale), fmpz_clear(c);
}

static expr *polynomial_in(tw_engine *e, const fmpz_poly_t p, expr *x)
{
    expr *sum = expr_int(e, 0);
    for (slong j = 0; j <= fmpz_poly_degree(p); j++)
        sum = expr_add(e, sum, expr_mul(e, expr_fmpz(e, fmpz_poly_get_coeff_ptr(p, j)), expr_pow(e, x, expr_int(e, j))));
    return sum;
}

/* (-B +- sqrt(B^2 - 4 A C))/(2 A), the sign by the ball. */
static expr *quadratic_root(tw_engine *e, const fmpz_poly_t p, const acb_t near)
{
    fmpz_t d, t;
    fmpz_init(d), fmpz_init(t);
    const fmpz *c = fmpz_poly_get_coeff_ptr(p, 0), *b = fmpz_poly_get_coeff_ptr(p, 1), *a = fmpz_poly_get_coeff_ptr(p, 2);
    fmpz_mul(d, b, b);
    fmpz_mul(t, a, c);
    fmpz_submul_ui(d, t, 4);
    bool complex = fmpz_sgn(d) < 0;
    fmpz_abs(d, d);
    expr *square = expr_sqrt(e, expr_fmpz(e, d)), *two_a = expr_mul(e, expr_int(e, 2), expr_fmpz(e, a));
    if (complex) square = expr_mul(e, expr_constant_of(e, CONSTANT_I), square);
    expr *middle = expr_div(e, expr_neg(e, expr_fmpz(e, b)), two_a), *half = expr_div(e, square, two_a);
    acb_t centre;
    acb_init(centre);
    arb_set_fmpz(acb_realref(centre), b);
    arb_div_fmpz(acb_realref(centre), acb_realref(centre), a, 128);
    arb_mul_2exp_si(acb_realref(centre), acb_realref(centre), -1);
    arb_neg(acb_realref(centre), acb_realref(centre));
    acb_sub(centre, near, centre, 128);
    bool minus = complex ? arb_is_negative(acb_imagref(centre)) : arb_is_negative(acb_realref(centre));
    acb_clear(centre);
    fmpz_clear(d), fmpz_clear(t);
    return minus ? expr_sub(e, middle, half) : expr_add(e, middle, half);
}

/* The midpoint to so many binary places. */
static expr *near_number(tw_engine *e, const arb_t x, slong places)
{
    fmpz_t n;
    arf_t t;
    fmpz_init(n);
    arf_init(t);
    arf_mul_2exp_si(t, arb_midref(x), places);
    arf_get_fmpz(n, t, ARF_RND_NEAR);
    expr *made = expr_mul(e, expr_fmpz(e, n), expr_pow(e, expr_int(e, 2), expr_int(e, -places)));
    fmpz_clear(n);
    arf_clear(t);
    return made;
}

/* So many binary places that the rounded root is much nearer to its root than to any other. */
static slong places_needed(acb_srcptr values, slong count, slong k)
{
    arb_t gap;
    acb_t away;
    arb_init(gap), acb_init(away);
    slong places = 2;
    for (slong j = 0; j < count; j++) {
        if (j == k) continue;
        acb_sub(away, values + j, values + k, 128);
        acb_abs(gap, away, 128);
        slong bits = arb_is_positive(gap) ? 4 - (slong)arf_abs_bound_lt_2exp_si(arb_midref(gap)) : 60;
        places = FLINT_MIN(FLINT_MAX(places, bits), 200);
    }
    arb_clear(gap), acb_clear(away);
    return places;
}

static expr *root_expr(tw_engine *e, const fmpz_poly_t p, acb_srcptr values, slong k)
{
    acb_srcptr near = values + k;
    slong places = places_needed(values, fmpz_poly_degree(p), k);
    if (fmpz_poly_degree(p) == 1)
        return expr_div(e, expr_neg(e, expr_fmpz(e, fmpz_poly_get_coeff_ptr(p, 0))),
                        expr_fmpz(e, fmpz_poly_get_coeff_ptr(p, 1)));
    if (fmpz_poly_degree(p) == 2) return quadratic_root(e, p, near);
    expr *r = expr_fresh(e, "r");
    expr *place = expr_add(e, near_number(e, acb_realref(near), places),
                           expr_mul(e, expr_constant_of(e, CONSTANT_I), near_number(e, acb_imagref(near), places)));
    return expr_root(e, r, polynomial_in(e, p, r), place);
}

/* b at this root: a number when it is one, else the polynomial at lambda = m^m/F. */
static expr *power_expr(tw_engine *e, const fmpq_poly_t b, expr *f, slong m)
{
    expr *scale = m > 0 ? expr_pow(e, expr_int(e, m), expr_int(e, m)) : expr_int(e, 1);
    expr *lambda = expr_div(e, scale, f), *sum = expr_int(e, 0);
    fmpq_t c;
    fmpq_init(c);
    for (slong j = 0; j <= fmpq_poly_degree(b); j++) {
        fmpq_poly_get_coeff_fmpq(c, b, j);
        sum = expr_add(e, sum, expr_mul(e, expr_fmpq(e, c), expr_pow(e, lambda, expr_int(e, j))));
    }
    fmpq_clear(c);
    return sum;
}

typedef struct roots {
    size_t count;
    root *list;
} roots;

static void roots_clear(roots *x)
{
    for (size_t k = 0; k < x->count; k++) {
        acb_clear(x->list[k].f);
        fmpq_poly_clear(x->list[k].b);
    }
    free(x->list);
}

static void add_roots(tw_engine *e, roots *all, const balance *x, const fmpz_poly_t g)
{
    fmpz_poly_t p;
    fmpq_poly_t b;
    fmpz_poly_init(p);
    fmpq_poly_init(b);
    bool simple = solve_power(b, x, g);
    reverse_polynomial(p, g, x->m);
    slong degree = fmpz_poly_degree(p);
    acb_ptr values = _acb_vec_init(degree);
    arb_fmpz_poly_complex_roots(values, p, 0, 256);
    for (slong k = 0; k < degree; k++) {
        all->list = base_resize(all->list, (all->count + 1) * sizeof *all->list);
        root *one = &all->list[all->count++];
        *one = (root){.simple = simple, .degree = degree};
        acb_init(one->f);
        acb_set(one->f, values + k);
        fmpq_poly_init(one->b);
        fmpq_poly_set(one->b, b);
        one->exact_f = root_expr(e, p, values, k);
        if (degree == 2 && !arb_contains_zero(acb_imagref(values + k)))
            one->square = expr_div(e, expr_fmpz(e, fmpz_poly_get_coeff_ptr(p, 0)), expr_fmpz(e, fmpz_poly_get_coeff_ptr(p, 2)));
        one->exact_b = simple && one->exact_f ? power_expr(e, b, one->exact_f, x->m) : NULL;
    }
    _acb_vec_clear(values, degree);
    fmpz_poly_clear(p);
    fmpq_poly_clear(b);
}

/* -1, 0, 1 by |F|; 0: the same as far as balls tell. */
static int compare_size(const root *a, const root *b)
{
    arb_t u, v;
    arb_init(u), arb_init(v);
    acb_abs(u, a->f, 128);
    acb_abs(v, b->f, 128);
    int order = arb_lt(u, v) ? -1 : arb_gt(u, v) ? 1 : 0;
    arb_clear(u), arb_clear(v);
    return order;
}

static void find_roots(tw_engine *e, roots *all, const balance *x)
{
    fmpz_poly_factor_t parts;
    fmpz_poly_factor_init(parts);
    fmpz_poly_factor(parts, x->chi);
    for (slong k = 0; k < parts->num; k++)
        if (!(fmpz_poly_degree(parts->p + k) == 1 && fmpz_is_zero(fmpz_poly_get_coeff_ptr(parts->p + k, 0))))
            add_roots(e, all, x, parts->p + k);
    fmpz_poly_factor_clear(parts);
    for (size_t k = 1; k < all->count; k++)
        for (size_t n = k; n > 0 && compare_size(&all->list[n], &all->list[n - 1]) < 0; n--) {
            root swap = all->list[n];
            all->list[n] = all->list[n - 1];
            all->list[n - 1] = swap;
        }
}

/* ---- the constants ---- */

/* n-th value of Gamma(m n + b)/F^n, or n^b/F^n. */
static tw_status form_value(tw_engine *e, acb_t out, const root *x, slong m, slong n, slong bits)
{
    acb_t b, f, t;
    acb_init(b), acb_init(f), acb_init(t);
    tw_status status = ball_value(e, b, x->exact_b, bits);
    if (status == TW_OK) status = ball_value(e, f, x->exact_f, bits);
    if (status == TW_OK && m > 0) {
        acb_add_si(b, b, m * n, bits);
        acb_gamma(out, b, bits);
    } else if (status == TW_OK) {
        acb_set_si(t, n);
        acb_pow(out, t, b, bits);
    }
    if (status == TW_OK) {
        acb_pow_ui(t, f, (ulong)n, bits);
        acb_div(out, out, t, bits);
    }
    acb_clear(b), acb_clear(f), acb_clear(t);
    return status;
}

/* The K of `count` roots from c at count*CORRECTIONS places from `from` on. */
static tw_status fit(tw_engine *e, acb_ptr k, const root *list, size_t count, slong m, const fmpq *c, slong from)
{
    slong size = (slong)count * CORRECTIONS;
    acb_mat_t a, x, y;
    acb_t value, first;
    acb_mat_init(a, size, size), acb_mat_init(x, size, 1), acb_mat_init(y, size, 1);
    acb_init(value), acb_init(first);
    tw_status status = TW_OK;
    for (slong i = 0; i < size && status == TW_OK; i++) {
        slong n = from + i;
        status = form_value(e, first, &list[0], m, n, ESTIMATE_BITS);
        acb_set_fmpq(acb_mat_entry(y, i, 0), &c[n], ESTIMATE_BITS);
        acb_div(acb_mat_entry(y, i, 0), acb_mat_entry(y, i, 0), first, ESTIMATE_BITS);
        for (size_t j = 0; j < count && status == TW_OK; j++) {
            status = j == 0 ? TW_OK : form_value(e, value, &list[j], m, n, ESTIMATE_BITS);
            if (j == 0) acb_one(value);
            else acb_div(value, value, first, ESTIMATE_BITS);
            for (slong p = 0; p < CORRECTIONS; p++) {
                acb_set(acb_mat_entry(a, i, (slong)j * CORRECTIONS + p), value);
                acb_div_si(value, value, n, ESTIMATE_BITS);
            }
        }
        if (!budget_ok(e)) status = TW_ERROR;
    }
    if (status == TW_OK && !acb_mat_solve(x, a, y, ESTIMATE_BITS))
        status = refuse(e, "the constant of the large-order form could not be fitted");
    for (size_t j = 0; j < count && status == TW_OK; j++) acb_set(k + j, acb_mat_entry(x, (slong)j * CORRECTIONS, 0));
    acb_mat_clear(a), acb_mat_clear(x), acb_mat_clear(y);
    acb_clear(value), acb_clear(first);
    return status;
}

static double size_of(const acb_t z)
{
    mag_t m;
    mag_init(m);
    acb_get_mag(m, z);
    double size = mag_get_d(m);
    mag_clear(m);
    return size;
}

/* The group's K by two fits; *present: they agree, so the group is in the sequence. */
static tw_status estimate(tw_engine *e, large_order *out, const root *list, size_t count, const fmpq *c, bool *present)
{
    acb_ptr near = _acb_vec_init((slong)count), far = _acb_vec_init((slong)count);
    acb_t away;
    acb_init(away);
    tw_status status = fit(e, near, list, count, out->m, c, PLACES);
    if (status == TW_OK) status = fit(e, far, list, count, out->m, c, 2 * PLACES);
    double most = 0, gap = 0;
    for (size_t j = 0; j < count && status == TW_OK; j++) {
        acb_sub(away, far + j, near + j, ESTIMATE_BITS);
        out->parts[j].spread = size_of(away);
        acb_set(out->parts[j].value, far + j);
        most = FLINT_MAX(most, FLINT_MAX(size_of(near + j), size_of(far + j)));
        gap = FLINT_MAX(gap, out->parts[j].spread);
    }
    *present = status == TW_OK && most > 0 && gap < 0.25 * most;
    acb_clear(away);
    _acb_vec_clear(near, (slong)count), _acb_vec_clear(far, (slong)count);
    return status;
}

/* Drops the parts whose estimate is 0 beside the others'. */
static void drop_absent(large_order *out)
{
    double most = 0;
    for (size_t j = 0; j < out->count; j++) most = FLINT_MAX(most, size_of(out->parts[j].value));
    size_t kept = 0;
    for (size_t j = 0; j < out->count; j++) {
        if (size_of(out->parts[j].value) < 1e-9 * most && out->parts[j].spread < 1e-8 * most) continue;
        if (kept < j) {
            out->parts[kept].f = out->parts[j].f;
            out->parts[kept].b = out->parts[j].b;
            out->parts[kept].spread = out->parts[j].spread;
            acb_set(out->parts[kept].value, out->parts[j].value);
        }
        kept++;
    }
    out->count = kept;
}

/* |F| of a group as an expression: the root of c/a for the complex roots of a x^2 + b x + c. */
static expr *distance_of(tw_engine *e, const root *x, bool *rounded)
{
    *rounded = x->degree > 1 && !x->square;
    if (x->degree == 1) return expr_call1(e, FUNCTION_ABS, x->exact_f);
    if (x->square) return expr_sqrt(e, x->square);
    arb_t size;
    arb_init(size);
    acb_abs(size, x->f, 128);
    expr *made = near_number(e, size, 40);
    arb_clear(size);
    return made;
}

static tw_status find_group(tw_engine *e, large_order *out, const roots *all, const fmpq *c)
{
    for (size_t from = 0; from < all->count;) {
        size_t to = from + 1;
        while (to < all->count && compare_size(&all->list[from], &all->list[to]) == 0) to++;
        if (to - from > LARGE_ORDER_PARTS) return refuse(e, "too many singularities are equally near");
        for (size_t k = from; k < to; k++)
            if (!all->list[k].simple || !all->list[k].exact_b)
                return refuse(e, "the characteristic polynomial has a multiple root: the form has other factors");
        bool present;
        if (estimate(e, out, all->list + from, to - from, c, &present) != TW_OK) return TW_ERROR;
        if (present) {
            out->count = to - from;
            for (size_t k = from; k < to; k++) {
                out->parts[k - from].f = all->list[k].exact_f;
                out->parts[k - from].b = all->list[k].exact_b;
            }
            out->distance = distance_of(e, &all->list[from], &out->rounded);
            drop_absent(out);
            return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
        }
        from = to;
    }
    return refuse(e, "the constants of the large-order form could not be told from the coefficients");
}

/* ---- the whole ---- */

static tw_status find_by_fit(tw_engine *e, large_order *out, const recurrence *r, expr *const *c, slong count)
{
    slong wanted = 2 * PLACES + LARGE_ORDER_PARTS * CORRECTIONS + 1;
    if (!r->p) return refuse(e, "the recurrence has parameters and an order above one: give the parameters values");
    for (slong n = 0; n < count; n++)
        if (!expr_is_number(c[n])) return refuse(e, "the coefficients are not rational: their constants are not estimated");
    if (count < r->needed || count < r->order) return refuse(e, "too few coefficients are known");
    balance x = {0, 0, {{0}}, {{0}}, {{0}}};
    fmpz_poly_init(x.chi);
    fmpq_poly_init(x.linear), fmpq_poly_init(x.rest);
    roots all = {0, NULL};
    fmpq *q = _fmpq_vec_init(FLINT_MAX(wanted, count));
    for (slong n = 0; n < count; n++) fmpq_set(&q[n], expr_number(c[n]));
    tw_status status = find_power(e, &x, r);
    if (status == TW_OK) {
        out->m = x.m;
        set_balance(&x, r);
        find_roots(e, &all, &x);
        status = e->error.kind == ERROR_NONE ? recurrence_extend(e, r, q, count, wanted) : TW_ERROR;
    }
    if (status == TW_OK) status = find_group(e, out, &all, q);
    roots_clear(&all);
    _fmpq_vec_clear(q, FLINT_MAX(wanted, count));
    fmpz_poly_clear(x.chi);
    fmpq_poly_clear(x.linear), fmpq_poly_clear(x.rest);
    return status;
}

tw_status large_order_find(tw_engine *e, large_order *out, const recurrence *r, expr *const *c, slong count)
{
    closed_form closed;
    if (r->order == 0 || count < 1) return refuse(e, "the coefficients end");
    if (closed_form_find(e, &closed, r, c[0])) {
        large_order_part *one = &out->parts[0];
        if (!closed_form_growth(e, &closed, &out->m, &one->f, &one->b, &one->k)) {
            if (e->error.kind != ERROR_NONE) return TW_ERROR;
            return refuse(e, "the coefficients decrease faster than any power: the series converges");
        }
        out->exact = true;
        out->count = 1;
        int sign = value_is_real(e, one->f) ? value_sign(e, one->f) : 2;
        out->distance = sign == 1 ? one->f : sign == -1 ? expr_neg(e, one->f) : expr_call1(e, FUNCTION_ABS, one->f);
        return out->distance ? TW_OK : TW_ERROR;
    }
    return e->error.kind == ERROR_NONE ? find_by_fit(e, out, r, c, count) : TW_ERROR;
}
