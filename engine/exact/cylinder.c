/* Airy and Bessel functions of a generalised series: at 0 from the published power series (with logarithms where
 * the order is whole), at other points from their differential equation, whose solutions with unit initial values
 * have coefficients in the field of the point. Knows series, not the tree. */
#include "engine/exact/compose.h"

#include <stdlib.h>

#include "engine/exact/values.h"

static void fmpq_div_by(fmpq_t out, const fmpq_t a, slong n)
{
    fmpz_t t;
    fmpz_init_set_si(t, n);
    fmpq_div_fmpz(out, a, t);
    fmpz_clear(t);
}

/* A rational outer series c_k = c_(k-1) * top(k)/bottom(k). */
static void outer_hypergeometric(work *w, tail *outer, const fmpq_t shift, bool alternating)
{
    /* sum (+-1)^k / (k! (shift + 1)_k) */
    slong n = outer_length(w);
    fmpq_t c, t;
    fmpq_init(c), fmpq_init(t);
    fmpq_one(c);
    for (slong k = 0; k < n; k++) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        fmpq_set_si(t, k + 1, 1);
        fmpq_add(t, t, shift);
        fmpq_mul_si(t, t, alternating ? -(k + 1) : k + 1);
        fmpq_div(c, c, t);
    }
    outer->known = n;
    outer->gap = 1;
    fmpq_clear(c), fmpq_clear(t);
}

/* A second-order linear equation at an ordinary point c: fills y[2..n-1] of the Taylor coefficients from y[0], y[1]. */
typedef void (*taylor_rule)(work *w, element *y, slong n, const element *c, const element *nu2, int sign);

/* out = y(c) * (solution 1, 0) + y'(c) * (solution 0, 1), each in powers of the argument's small part. nu may be
 * NULL. */
static tw_status push_solutions(work *w, pieces *out, const argument *a, expr *y, expr *slope, expr *nu,
                                taylor_rule rule, int sign)
{
    field *f = &w->f;
    expr *initial[2] = {y, slope};
    element c, nu2;
    pieces part;
    element_init(f, &c), element_init(f, &nu2), pieces_init(&part);
    pieces_clear(w, out);
    tw_status s = field_from_expr(f, &c, a->value);
    if (s == TW_OK && nu != NULL)
        s = field_from_expr(f, &nu2, nu);
    if (s == TW_OK)
        field_mul(f, &nu2, &nu2, &nu2);
    for (int k = 0; k < 2 && s == TW_OK; k++) {
        tail outer;
        tail_init(&outer);
        tail_promote(f, &outer);
        elements_free(f, outer.m, outer.count);
        outer.count = outer.known = outer_length(w) + 1;
        outer.gap = 1;
        outer.m = elements_new(f, outer.count);
        fmpz_mpoly_q_one(outer.m + k, f->ctx);
        rule(w, outer.m, outer.count, &c, &nu2, sign);
        tail_demote(f, &outer);
        s = push_outer(w, &part, a, initial[k], &outer);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &part, 1);
        tail_clear(f, &outer);
    }
    element_clear(f, &c), element_clear(f, &nu2), pieces_clear(w, &part);
    return s;
}

/* The derivative in z of f(z), at a value. */
static expr *slope_at(tw_engine *e, expr *f, expr *z, expr *value)
{
    expr *slope = f == NULL ? NULL : expr_derivative(e, f, z);
    return slope == NULL ? NULL : expr_substitute(e, slope, z, value);
}

/* ---- Airy functions ---- */

/* The two power series of DLMF 9.4.1 and 9.4.3: f (start 0) and g (start 1). */
static void outer_airy(work *w, tail *outer, slong start)
{
    slong n = outer_length(w);
    fmpq_t c;
    fmpq_init(c);
    fmpq_one(c);
    for (slong k = start; k < n; k += 3) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        fmpq_div_by(c, c, (k + 3) * (k + 2)); /* y'' = z y */
    }
    outer->known = n;
    outer->offset = start;
    outer->gap = 3;
    fmpq_clear(c);
}

/* Ai(0) = 3^(-2/3)/Gamma(2/3), Ai'(0) = -3^(-1/3)/Gamma(1/3), Bi(0) = 3^(-1/6)/Gamma(2/3), Bi'(0) = 3^(1/6)/Gamma(1/3):
 * DLMF 9.2.3 to 9.2.6. */
static expr *airy_initial(tw_engine *e, bool bi, slong derivative)
{
    static const int power[2][2] = {{-4, -2}, {-1, 1}}; /* in sixths */
    expr *value = expr_div(e, expr_pow(e, expr_int(e, 3), expr_frac(e, power[bi][derivative], 6)),
                           expr_call1(e, FUNCTION_GAMMA, expr_frac(e, derivative ? 1 : 2, 3)));
    return !bi && derivative ? expr_neg(e, value) : value;
}

/* y'' = z y: y_(k+2) (k + 2)(k + 1) = c y_k + y_(k-1). */
static void airy_taylor(work *w, element *y, slong n, const element *c, const element *nu2, int sign)
{
    field *f = &w->f;
    (void)nu2, (void)sign;
    for (slong k = 0; k + 2 < n && budget_ok(w->e); k++) {
        field_mul(f, y + k + 2, c, y + k);
        if (k > 0)
            fmpz_mpoly_q_add(y + k + 2, y + k + 2, y + k - 1, f->ctx);
        fmpz_mpoly_q_div_si(y + k + 2, y + k + 2, (k + 2) * (k + 1), f->ctx);
    }
}

static tw_status airy_at_point(work *w, pieces *out, function_id id, const argument *a)
{
    tw_engine *e = w->e;
    expr *z = expr_fresh(e, "z");
    if (!value_is_real(e, a->value)) /* Ai' has a name along the real axis only */
        return work_refuse(w, "has an argument that is not known to be real");
    return push_solutions(w, out, a, expr_call1(e, id, a->value), slope_at(e, expr_call1(e, id, z), z, a->value), NULL,
                          airy_taylor, 0);
}

static tw_status compose_airy(work *w, pieces *out, expr *call, const pieces *g)
{
    argument a;
    tail f, h;
    pieces second;
    argument_init(&a), tail_init(&f), tail_init(&h), pieces_init(&second);
    bool bi = call->is.function == FUNCTION_BI;
    tw_status s = argument_split(w, &a, g);
    if (s == TW_OK && !expr_is_zero(a.value))
        s = airy_at_point(w, out, call->is.function, &a);
    else if (s == TW_OK) {
        outer_airy(w, &f, 0);
        outer_airy(w, &h, 1);
        s = push_outer(w, out, &a, airy_initial(w->e, bi, 0), &f);
        if (s == TW_OK)
            s = push_outer(w, &second, &a, airy_initial(w->e, bi, 1), &h);
        if (s == TW_OK)
            s = pieces_add(w, out, out, &second, 1);
    }
    argument_clear(w, &a), tail_clear(&w->f, &f), tail_clear(&w->f, &h), pieces_clear(w, &second);
    return s;
}

/* ---- Bessel functions ---- */

static expr *bessel(tw_engine *e, function_id id, expr *nu, expr *z)
{
    expr *args[2] = {nu, z};
    return expr_call(e, id, args, 2);
}

/* 1/(k! (nu + 1)_k) */
static expr *bessel_coefficient(tw_engine *e, const void *host, slong k)
{
    expr *nu = host, *product = expr_int(e, 1);
    fmpz_t factorial;
    fmpz_init(factorial);
    fmpz_fac_ui(factorial, (ulong)k);
    for (slong j = 1; j <= k && product != NULL; j++)
        product = expr_mul(e, product, expr_add(e, nu, expr_int(e, j)));
    expr *out = expr_div(e, expr_int(e, 1), expr_mul(e, expr_fmpz(e, factorial), product));
    fmpz_clear(factorial);
    return out;
}

/* (z/2)^nu/Gamma(nu + 1) sum (-+ z^2/4)^k / (k! (nu + 1)_k): DLMF 10.2.2, 10.25.2; z -> 0, nu no negative integer. */
static tw_status bessel_at_zero(work *w, pieces *out, bool modified, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    argument a;
    tail outer;
    pieces half, square;
    argument_init(&a), tail_init(&outer), pieces_init(&half), pieces_init(&square);
    tw_status s = TW_OK;
    expr *order = expr_add(e, nu, expr_int(e, 1));
    if (!expr_is_number(nu) && order != NULL && value_sign(e, order) != 1)
        s = work_need(w, expr_relation_of(e, RELATION_LESS, expr_int(e, -1), nu));
    if (s == TW_OK && expr_is_number(nu))
        outer_hypergeometric(w, &outer, expr_number(nu), !modified);
    else if (s == TW_OK) {
        s = outer_from_exprs(w, &outer, bessel_coefficient, nu);
        for (slong k = 1; s == TW_OK && !modified && !outer.rational && k < outer.count; k += 2)
            fmpz_mpoly_q_neg(outer.m + k, outer.m + k, w->f.ctx);
    }
    pieces_set(w, &half, g);
    if (s == TW_OK)
        s = pieces_scale(w, &half, expr_frac(e, 1, 2));
    if (s == TW_OK)
        s = pieces_mul(w, &square, &half, &half);
    if (s == TW_OK)
        s = argument_split(w, &a, &square);
    if (s == TW_OK)
        s = push_outer(w, out, &a, expr_div(e, expr_int(e, 1), expr_call1(e, FUNCTION_GAMMA, order)), &outer);
    if (s == TW_OK && !expr_is_zero(nu)) {
        s = pieces_pow(w, &half, &half, nu);
        if (s == TW_OK)
            s = pieces_mul(w, out, out, &half);
    }
    argument_clear(w, &a), tail_clear(&w->f, &outer), pieces_clear(w, &half), pieces_clear(w, &square);
    return s;
}

/* sum over k < n of (n-k-1)!/k! (+-y)^k and sum of (H_k + H_(n+k))/(k! (n+k)!) (+-y)^k, y = z^2/4. */
static void outer_bessel_finite(tail *outer, slong n, bool alternating)
{
    fmpq_t c;
    fmpq_init(c);
    fmpz_fac_ui(fmpq_numref(c), (ulong)(n - 1));
    for (slong k = 0; k < n; k++) {
        fmpq_poly_set_coeff_fmpq(outer->q, k, c);
        if (k + 1 < n)
            fmpq_div_by(c, c, (alternating ? -1 : 1) * (k + 1) * (n - k - 1));
    }
    fmpq_clear(c);
}

static void outer_bessel_harmonic(work *w, tail *outer, slong n, bool alternating)
{
    fmpq_t c, t, h;
    slong length = outer_length(w);
    fmpq_init(c), fmpq_init(t), fmpq_init(h);
    fmpq_harmonic_ui(h, (ulong)n); /* H_k + H_(n+k) */
    fmpz_fac_ui(fmpq_denref(c), (ulong)n);
    fmpz_one(fmpq_numref(c));
    for (slong k = 0; k < length; k++) {
        fmpq_mul(t, c, h);
        fmpq_poly_set_coeff_fmpq(outer->q, k, t);
        fmpq_div_by(c, c, (alternating ? -1 : 1) * (k + 1) * (n + k + 1));
        fmpq_set_si(t, 1, (ulong)(k + 1));
        fmpq_add(h, h, t);
        fmpq_set_si(t, 1, (ulong)(n + k + 1));
        fmpq_add(h, h, t);
    }
    outer->known = length;
    outer->gap = 1;
    fmpq_clear(c), fmpq_clear(t), fmpq_clear(h);
}

/* (z/2)^power times outer(z^2/4) times value, added to out. */
static tw_status add_bessel_part(work *w, pieces *out, const pieces *half, slong power, const tail *outer, expr *value)
{
    argument a;
    pieces square, part, front;
    argument_init(&a), pieces_init(&square), pieces_init(&part), pieces_init(&front);
    tw_status s = pieces_mul(w, &square, half, half);
    if (s == TW_OK)
        s = argument_split(w, &a, &square);
    if (s == TW_OK)
        s = push_outer(w, &part, &a, value, outer);
    if (s == TW_OK)
        s = pieces_pow(w, &front, half, expr_int(w->e, power));
    if (s == TW_OK)
        s = pieces_mul(w, &part, &part, &front);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &part, 1);
    argument_clear(w, &a), pieces_clear(w, &square), pieces_clear(w, &part), pieces_clear(w, &front);
    return s;
}

/* K_n: 1/2 (z/2)^-n S_1 + (-1)^(n+1) (log(z/2) + gamma) I_n + (-1)^n/2 (z/2)^n S_2   (DLMF 10.31.1)
 * Y_n: -1/pi (z/2)^-n S_1 + 2/pi (log(z/2) + gamma) J_n - 1/pi (z/2)^n S_2           (DLMF 10.8.1)
 * with the sums above; psi(k + 1) = H_k - gamma. */
static tw_status second_kind_integer(work *w, pieces *out, bool modified, slong n, const pieces *g)
{
    tw_engine *e = w->e;
    tail finite, harmonic;
    pieces half, l, first;
    tail_init(&finite), tail_init(&harmonic), pieces_init(&half), pieces_init(&l), pieces_init(&first);
    expr *over_pi = expr_pow(e, expr_constant_of(e, CONSTANT_PI), expr_int(e, -1));
    expr *one = modified ? expr_frac(e, 1, 2) : expr_neg(e, over_pi);
    expr *two = modified ? expr_int(e, n & 1 ? 1 : -1) : expr_mul(e, expr_int(e, 2), over_pi);
    expr *three = modified ? expr_frac(e, n & 1 ? -1 : 1, 2) : expr_neg(e, over_pi);
    pieces_set(w, &half, g);
    tw_status s = pieces_scale(w, &half, expr_frac(e, 1, 2));
    if (s == TW_OK)
        s = compose_log(w, &l, &half);
    if (s == TW_OK)
        s = add_value(w, &l, expr_constant_of(e, CONSTANT_EULER));
    if (s == TW_OK)
        s = bessel_at_zero(w, &first, modified, expr_int(e, n), g);
    if (s == TW_OK)
        s = pieces_mul(w, out, &l, &first);
    if (s == TW_OK)
        s = pieces_scale(w, out, two);
    if (s == TW_OK && n > 0) {
        outer_bessel_finite(&finite, n, modified);
        s = add_bessel_part(w, out, &half, -n, &finite, one);
    }
    if (s == TW_OK) {
        outer_bessel_harmonic(w, &harmonic, n, !modified);
        s = add_bessel_part(w, out, &half, n, &harmonic, three);
    }
    tail_clear(&w->f, &finite), tail_clear(&w->f, &harmonic);
    pieces_clear(w, &half), pieces_clear(w, &l), pieces_clear(w, &first);
    return s;
}

/* K = pi/2 (I_-nu - I_nu)/sin(nu pi) (DLMF 10.27.4), Y = (J_nu cos(nu pi) - J_-nu)/sin(nu pi) (DLMF 10.2.3). */
static tw_status second_kind_fractional(work *w, pieces *out, bool modified, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    pieces plus, minus;
    pieces_init(&plus), pieces_init(&minus);
    expr *angle = expr_mul(e, nu, expr_constant_of(e, CONSTANT_PI));
    expr *over = expr_pow(e, expr_call1(e, FUNCTION_SIN, angle), expr_int(e, -1));
    expr *front =
        modified ? expr_mul(e, expr_mul(e, expr_constant_of(e, CONSTANT_PI), expr_frac(e, 1, 2)), over) : over;
    tw_status s = bessel_at_zero(w, &plus, modified, nu, g);
    if (s == TW_OK)
        s = bessel_at_zero(w, &minus, modified, expr_neg(e, nu), g);
    if (s == TW_OK)
        s = pieces_scale(w, &plus,
                         modified ? expr_neg(e, front) : expr_mul(e, front, expr_call1(e, FUNCTION_COS, angle)));
    if (s == TW_OK)
        s = pieces_scale(w, &minus, modified ? front : expr_neg(e, front));
    if (s == TW_OK)
        s = pieces_add(w, out, &plus, &minus, 1);
    pieces_clear(w, &plus), pieces_clear(w, &minus);
    return s;
}

static tw_status bessel_kind_at_zero(work *w, pieces *out, function_id id, expr *nu, const pieces *g)
{
    tw_engine *e = w->e;
    bool modified = id == FUNCTION_BESSEL_I || id == FUNCTION_BESSEL_K;
    bool first = id == FUNCTION_BESSEL_I || id == FUNCTION_BESSEL_J;
    bool integer = expr_is_number(nu) && fmpz_is_one(fmpq_denref(expr_number(nu)));
    if (integer && fmpz_bits(fmpq_numref(expr_number(nu))) > 10)
        return work_refuse(w, "has too large an order");
    slong n = integer ? fmpz_get_si(fmpq_numref(expr_number(nu))) : 0;
    if (!first && !integer && !expr_is_number(nu)) {
        expr *above = expr_add(e, expr_int(e, 1), nu), *below = expr_sub(e, expr_int(e, 1), nu);
        if (above == NULL || below == NULL || value_sign(e, above) != 1 || value_sign(e, below) != 1 ||
            value_sign(e, nu) == 0 || value_sign(e, nu) == 2)
            return work_refuse(w, "has an order that is not known to lie between two integers next to 0");
    }
    if (!first && !integer)
        return second_kind_fractional(w, out, modified, nu, g);
    /* negative integers: I_-n = I_n, J_-n = (-1)^n J_n, and so for K and Y (DLMF 10.27.1, 10.4.1, 10.27.3) */
    tw_status s = first ? bessel_at_zero(w, out, modified, integer ? expr_int(e, n < 0 ? -n : n) : nu, g)
                        : second_kind_integer(w, out, modified, n < 0 ? -n : n, g);
    if (s == TW_OK && n < 0 && (n & 1) && !modified)
        s = pieces_scale(w, out, expr_int(e, -1));
    return s;
}

/* z^2 y'' + z y' + (sign z^2 - nu^2) y = 0 (DLMF 10.2.1, 10.25.1). */
static void bessel_taylor(work *w, element *y, slong n, const element *c, const element *nu2, int sign)
{
    field *f = &w->f;
    element t, c2, den;
    element_init(f, &t), element_init(f, &c2), element_init(f, &den);
    field_mul(f, &c2, c, c);
    for (slong k = 0; k + 2 < n && budget_ok(w->e); k++) {
        element *next = y + k + 2;
        fmpz_mpoly_q_mul_si(&t, c, -(k + 1) * (2 * k + 1), f->ctx); /* -(k + 1)(2 k + 1) c y_(k+1) */
        field_addmul(f, next, &t, y + k + 1);
        fmpz_mpoly_q_mul_si(&t, &c2, -sign, f->ctx); /* -(k^2 + sign c^2 - nu^2) y_k */
        fmpz_mpoly_q_add(&t, &t, nu2, f->ctx);
        fmpz_mpoly_q_sub_si(&t, &t, k * k, f->ctx);
        field_addmul(f, next, &t, y + k);
        if (k >= 1) { /* -2 sign c y_(k-1) */
            fmpz_mpoly_q_mul_si(&t, c, -2 * sign, f->ctx);
            field_addmul(f, next, &t, y + k - 1);
        }
        if (k >= 2) {
            fmpz_mpoly_q_mul_si(&t, y + k - 2, -sign, f->ctx);
            fmpz_mpoly_q_add(next, next, &t, f->ctx);
        }
        fmpz_mpoly_q_mul_si(&den, &c2, (k + 2) * (k + 1), f->ctx);
        field_div(f, next, next, &den);
    }
    element_clear(f, &t), element_clear(f, &c2), element_clear(f, &den);
}

static tw_status bessel_at_point(work *w, pieces *out, function_id id, expr *nu, const argument *a)
{
    tw_engine *e = w->e;
    int sign = id == FUNCTION_BESSEL_J || id == FUNCTION_BESSEL_Y ? 1 : -1;
    if (!value_off_cut(e, a->value))
        return work_refuse(w, "has an argument that is not known to be off its branch cut");
    expr *z = expr_fresh(e, "z");
    return push_solutions(w, out, a, bessel(e, id, nu, a->value), slope_at(e, bessel(e, id, nu, z), z, a->value), nu,
                          bessel_taylor, sign);
}

static tw_status compose_bessel(work *w, pieces *out, expr *call, const pieces *args)
{
    expr *nu = call->args[0];
    if (expr_has(nu, w->x))
        return work_refuse(w, "has an order that depends on the variable");
    argument a;
    argument_init(&a);
    /* the split also refuses what grows; at 0 the series in z^2 and the power are taken from g itself */
    bool small = true;
    for (size_t k = 0; k < args[1].count; k++)
        small = small && args[1].at[k].log_power == 0 && fmpq_sgn(args[1].at[k].lead) > 0 &&
                expr_is_zero(args[1].at[k].sigma);
    tw_status s = small ? TW_OK : argument_split(w, &a, args + 1);
    pieces_clear(w, out);
    if (s == TW_OK && (small || expr_is_zero(a.value)))
        s = bessel_kind_at_zero(w, out, call->is.function, nu, args + 1);
    else if (s == TW_OK)
        s = bessel_at_point(w, out, call->is.function, nu, &a);
    argument_clear(w, &a);
    return s;
}

tw_status compose_cylinder(work *w, pieces *out, expr *call, const pieces *args)
{
    bool airy = call->is.function == FUNCTION_AI || call->is.function == FUNCTION_BI;
    return airy ? compose_airy(w, out, call, args) : compose_bessel(w, out, call, args);
}
