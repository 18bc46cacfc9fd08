/* Elementary functions of a generalised series: exp turns multiples of log(x) into powers, log splits its
 * argument's leading term off, the circular and hyperbolic ones use their addition theorems so that only their
 * values at one point are constants, the inverse ones are integrated. Knows series and values, not the tree they
 * come from. */
#include "engine/exact/compose.h"

#include <stdlib.h>

#include "engine/exact/values.h"

void argument_init(argument *a)
{
    a->value = NULL;
    tail_init(&a->u);
    a->den = 1;
    a->real = true;
}

void argument_clear(work *w, argument *a) { tail_clear(&w->f, &a->u); }

/* Takes the coefficient of x^0 out of p (lead = 0) and adds it to *value. */
static tw_status take_constant_term(work *w, piece *p, expr **value)
{
    if (p->c.known <= 0) {
        w->thin = true;
        return TW_ERROR;
    }
    *value = expr_add(w->e, *value, piece_leading(w, p));
    tail first;
    element c;
    tail_init(&first);
    element_init(&w->f, &c);
    slong known = p->c.known;
    tail_coefficient(&w->f, &c, &p->c, 0);
    tail_set_element(&w->f, &first, &c);
    tail_demote(&w->f, &first);
    tail_add(&w->f, &p->c, &p->c, &first, -1);
    p->c.known = known;
    tail_clear(&w->f, &first);
    element_clear(&w->f, &c);
    return *value == NULL ? TW_ERROR : TW_OK;
}

/* The part of g that tends to zero, in one piece and in powers of x^(1/den). */
static tw_status take_small_part(work *w, argument *a, const pieces *rest)
{
    if (rest->count == 0)
        return TW_OK;
    piece p;
    piece_init(w, &p);
    tw_status s = pieces_gather(w, &p, rest,
                                "has no expansion in powers with a fixed step (powers and logarithms mix inside it)");
    if (s == TW_OK)
        s = piece_fold(w, &p, true);
    if (s == TW_OK) {
        fmpq_t zero;
        fmpq_init(zero);
        slong steps = 0;
        slong finer = fmpz_fits_si(fmpq_denref(p.lead)) ? fmpz_get_si(fmpq_denref(p.lead)) : 0;
        if (finer <= 0 || finer > 10000)
            s = work_refuse(w, "has powers with too large denominators");
        else {
            piece_refine(w, &p, lcm_of(p.den, finer));
            if (!steps_between(&steps, zero, p.lead, p.den))
                steps = WORD_MAX / 2;
            tail_add_shifted(w, &a->u, &p.c, steps);
            a->den = p.den;
        }
        fmpq_clear(zero);
    }
    piece_clear(w, &p);
    return s;
}

/* Does p tend to a nonzero limit (0), to zero (1) or grow (-1)? Proves the leading coefficient where it matters. */
static tw_status piece_tendency(work *w, piece *p, int *tendency)
{
    *tendency = fmpq_sgn(p->lead);
    if (*tendency < 0) {
        if (piece_prove_leading(w, p) != TW_OK)
            return TW_ERROR;
        *tendency = fmpq_sgn(p->lead);
    }
    return TW_OK;
}

static tw_status argument_split_words(work *w, argument *a, const pieces *g, const char *mixed, const char *grows)
{
    pieces rest;
    pieces_init(&rest);
    a->value = expr_int(w->e, 0);
    a->real = g->real;
    tw_status s = TW_OK;
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        piece p;
        int tendency = 0;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        if (p.log_power != 0 || !expr_is_zero(p.sigma))
            s = work_refuse(w, mixed);
        else
            s = piece_tendency(w, &p, &tendency);
        if (s == TW_OK && tendency < 0)
            s = work_refuse(w, grows);
        if (s == TW_OK && tendency == 0)
            s = take_constant_term(w, &p, &a->value);
        if (s == TW_OK)
            s = pieces_push(w, &rest, &p);
        else
            piece_clear(w, &p);
    }
    if (s == TW_OK)
        s = take_small_part(w, a, &rest);
    pieces_clear(w, &rest);
    return s;
}

tw_status argument_split(work *w, argument *a, const pieces *g)
{
    return argument_split_words(w, a, g, "has an argument with logarithms or symbolic powers",
                                "has an argument that grows without bound");
}

tw_status pieces_from_argument(work *w, pieces *out, const argument *a, expr *value, const tail *c)
{
    return pieces_from_tail(w, out, value, expr_int(w->e, 0), c, a->den,
                            a->real && value != NULL && value_is_real(w->e, value));
}

/* ---- exp and log ---- */

/* exp(c log x) = x^c: takes such pieces out of g. */
static tw_status take_logs(work *w, pieces *rest, expr **power, const pieces *g)
{
    tw_status s = TW_OK;
    *power = expr_int(w->e, 0);
    rest->real = g->real;
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        if (p.log_power == 1 && expr_is_zero(p.sigma) && fmpq_is_zero(p.lead) && p.c.known == TAIL_EXACT &&
            tail_length(&p.c) == 1) {
            *power = expr_add(w->e, *power, piece_leading(w, &p));
            piece_clear(w, &p);
            s = *power == NULL ? TW_ERROR : TW_OK;
        } else
            s = pieces_push(w, rest, &p);
    }
    return s;
}

/* What to say of exp(g) when g grows. */
static const char *exponential_words(work *w, const pieces *g)
{
    for (size_t k = 0; k < g->count; k++) {
        const piece *p = g->at + k;
        if (fmpq_sgn(p->lead) >= 0 || tail_length(&p->c) == 0)
            continue;
        expr *leading = piece_leading(w, p);
        int sign = leading != NULL && value_is_real(w->e, leading) ? value_sign(w->e, leading) : 2;
        return sign == -1 ? "is flat" : sign == 1 ? "grows faster than any power" : "is flat, grows or oscillates";
    }
    return "is flat or grows faster than any power";
}

tw_status compose_exp(work *w, pieces *out, const pieces *g)
{
    pieces rest;
    argument a;
    expr *power;
    pieces_init(&rest);
    argument_init(&a);
    tw_status s = take_logs(w, &rest, &power, g);
    if (s == TW_OK)
        s = argument_split_words(w, &a, &rest,
                                 "has no expansion in powers with a fixed step (powers and logarithms mix inside exp)",
                                 exponential_words(w, &rest));
    if (s == TW_OK) {
        expr *value = expr_call1(w->e, FUNCTION_EXP, a.value);
        tail_exp(&w->f, &a.u, &a.u, w->terms);
        s = pieces_from_tail(w, out, value, power, &a.u, a.den, a.real);
    }
    argument_clear(w, &a);
    pieces_clear(w, &rest);
    return s;
}

/* log of the value in front, over the factors that are positive. */
static expr *log_of_value(work *w, expr *value)
{
    return simplify_value(w, expr_call1(w->e, FUNCTION_LOG, value));
}

tw_status compose_log(work *w, pieces *out, const pieces *g)
{
    piece p;
    pieces part;
    bool real = g->real; /* out may be g */
    piece_init(w, &p);
    pieces_init(&part);
    tw_status s = pieces_gather(
        w, &p, g, "has no expansion in powers with a fixed step (powers and logarithms mix inside log)");
    if (s == TW_OK)
        s = piece_need_leading(w, &p);
    if (s == TW_OK && !value_is_real(w->e, p.sigma))
        s = work_refuse(w, "has a power whose exponent is not known to be real");
    if (s == TW_OK)
        s = piece_need_split(w, &p, real, false);
    expr *leading = s == TW_OK ? piece_leading(w, &p) : NULL;
    expr *front = leading == NULL ? NULL : log_of_value(w, leading);
    if (front == NULL)
        s = TW_ERROR;
    if (s == TW_OK) {
        tail_make_monic(w, &p.c);
        tail_log(&w->f, &p.c, &p.c, w->terms);
        s = pieces_from_tail(w, out, expr_int(w->e, 1), expr_int(w->e, 0), &p.c, p.den, real);
    }
    if (s == TW_OK) /* the exponent times log x */
        s = pieces_from_value(w, &part, piece_exponent(w, &p));
    for (size_t k = 0; k < part.count && s == TW_OK; k++)
        part.at[k].log_power = 1;
    if (s == TW_OK)
        s = pieces_add(w, out, out, &part, 1);
    if (s == TW_OK)
        s = pieces_from_value(w, &part, front);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &part, 1);
    if (s == TW_OK)
        out->real = real && value_is_real(w->e, front);
    pieces_clear(w, &part);
    piece_clear(w, &p);
    return s;
}

/* ---- addition theorems ---- */

/* value1 * c1 + sign * value2 * c2 */
static tw_status two_terms(work *w, pieces *out, const argument *a, expr *value1, const tail *c1, int sign,
                           expr *value2, const tail *c2)
{
    pieces second;
    pieces_init(&second);
    tw_status s = pieces_from_argument(w, out, a, value1, c1);
    if (s == TW_OK)
        s = pieces_from_argument(w, &second, a, value2, c2);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &second, sign);
    pieces_clear(w, &second);
    return s;
}

/* tan(c + u) from y' = 1 + y^2, y(0) = tan(c) (tanh: y' = 1 - y^2): coefficients are polynomials in tan(c). The
 * quotient of sine and cosine gives fractions whose size explodes (100 terms of tan(1 + x): 4 s against 0.4 s). */
static tw_status tangent_at_point(work *w, pieces *out, const argument *a, bool hyperbolic)
{
    field *f = &w->f;
    tail outer;
    tail_init(&outer);
    tail_promote(f, &outer);
    elements_free(f, outer.m, outer.count);
    outer.count = outer.known = w->terms + 1;
    outer.gap = 1;
    outer.m = elements_new(f, outer.count);
    tw_status s = field_from_expr(f, outer.m, expr_call1(w->e, hyperbolic ? FUNCTION_TANH : FUNCTION_TAN, a->value));
    for (slong k = 0; k + 1 < outer.count && s == TW_OK; k++) {
        element *next = outer.m + k + 1;
        for (slong j = 0; j <= k; j++)
            field_addmul(f, next, outer.m + j, outer.m + k - j);
        if (hyperbolic)
            fmpz_mpoly_q_neg(next, next, f->ctx);
        if (k == 0)
            fmpz_mpoly_q_add_si(next, next, 1, f->ctx);
        fmpz_mpoly_q_div_si(next, next, k + 1, f->ctx);
        s = budget_ok(w->e) ? TW_OK : TW_ERROR;
    }
    if (s == TW_OK) {
        tail_demote(f, &outer);
        tail_compose(f, &outer, &outer, &a->u, w->terms);
        s = pieces_from_argument(w, out, a, expr_int(w->e, 1), &outer);
        out->real = a->real && value_is_real(w->e, a->value);
    }
    tail_clear(f, &outer);
    return s;
}

/* Is the tangent finite at the argument's limit, with a condition where that is not known? False at its poles. */
static tw_status tangent_is_finite(work *w, const argument *a, bool hyperbolic, bool *finite)
{
    tw_engine *e = w->e;
    expr *cosine = expr_call1(e, hyperbolic ? FUNCTION_COSH : FUNCTION_COS, a->value);
    if (cosine == NULL)
        return TW_ERROR;
    *finite = value_is_zero(e, cosine) == ANSWER_NO;
    if (!*finite || expr_is_closed_value(cosine) || (hyperbolic && value_is_real(e, a->value)))
        return TW_OK;
    return work_need(w, expr_relation_of(e, RELATION_NOT_EQUAL, cosine, expr_int(e, 0)));
}

/* DLMF 4.21.2, 4.21.5 and 4.35.1, 4.35.5 (addition theorems): which = 0 the sine, 1 the cosine, 2 the tangent. */
static tw_status compose_circular(work *w, pieces *out, const pieces *g, bool hyperbolic, int which)
{
    argument a;
    tail s, c;
    pieces cosine;
    argument_init(&a), tail_init(&s), tail_init(&c), pieces_init(&cosine);
    bool finite = false;
    tw_status status = argument_split(w, &a, g);
    if (status == TW_OK && which == 2)
        status = tangent_is_finite(w, &a, hyperbolic, &finite);
    if (status == TW_OK && finite && !(expr_is_zero(a.value) && a.u.rational))
        status = tangent_at_point(w, out, &a, hyperbolic);
    else if (status == TW_OK && finite) {
        tail_tan(&w->f, &s, &a.u, w->terms, hyperbolic);
        status = pieces_from_argument(w, out, &a, expr_int(w->e, 1), &s);
    } else if (status == TW_OK) {
        tail_sin_cos(&w->f, &s, &c, &a.u, w->terms, hyperbolic);
        expr *sine0 = expr_call1(w->e, hyperbolic ? FUNCTION_SINH : FUNCTION_SIN, a.value);
        expr *cosine0 = expr_call1(w->e, hyperbolic ? FUNCTION_COSH : FUNCTION_COS, a.value);
        if (which != 1)
            status = two_terms(w, out, &a, sine0, &c, 1, cosine0, &s);
        if (which != 0 && status == TW_OK)
            status = two_terms(w, &cosine, &a, cosine0, &c, hyperbolic ? 1 : -1, sine0, &s);
        if (which == 1 && status == TW_OK)
            pieces_swap(out, &cosine);
        if (which == 2 && status == TW_OK)
            status = pieces_div(w, out, out, &cosine, 1);
    }
    argument_clear(w, &a), tail_clear(&w->f, &s), tail_clear(&w->f, &c), pieces_clear(w, &cosine);
    return status;
}

/* ---- inverse functions ---- */

tw_status compose_by_derivative(work *w, pieces *out, expr *f, expr *z, const pieces *g, expr *value)
{
    pieces slope, inner, constant;
    pieces_init(&slope), pieces_init(&inner), pieces_init(&constant);
    expr *derivative = expr_derivative(w->e, f, z);
    tw_status s = derivative == NULL ? TW_ERROR : evaluate_bound(w, &slope, derivative, z, g);
    if (s == TW_OK)
        s = pieces_derivative(w, &inner, g);
    if (s == TW_OK)
        s = pieces_mul(w, &slope, &slope, &inner);
    if (s == TW_OK)
        s = pieces_integral(w, out, &slope, true);
    if (s == TW_OK)
        s = pieces_from_value(w, &constant, value);
    if (s == TW_OK)
        s = pieces_add(w, out, out, &constant, 1);
    pieces_clear(w, &slope), pieces_clear(w, &inner), pieces_clear(w, &constant);
    return s;
}

/* The limit of g as x -> 0+: into *value when finite; *infinite = -1, 1 for a real g that grows. */
static tw_status pieces_limit(work *w, const pieces *g, expr **value, int *infinite)
{
    bool grows = false;
    *infinite = 0;
    *value = expr_int(w->e, 0);
    for (size_t k = 0; k < g->count; k++) {
        const piece *p = g->at + k;
        int tendency = fmpq_sgn(p->lead);
        if (!expr_is_zero(p->sigma)) {
            expr *exponent = piece_exponent(w, p);
            tendency = exponent == NULL ? 0 : value_sign(w->e, exponent);
            if (tendency != 1)
                return work_refuse(w, "has an argument with a power whose limit is not known");
        }
        if (tendency < 0 || (tendency == 0 && p->log_power > 0))
            grows = true;
        else if (tendency == 0) {
            if (p->c.known <= 0) {
                w->thin = true;
                return TW_ERROR;
            }
            *value = expr_add(w->e, *value, piece_leading(w, p));
            if (*value == NULL)
                return TW_ERROR;
        }
    }
    if (!grows)
        return TW_OK;
    if (!g->real)
        return work_refuse(w, "has an argument that grows without bound");
    return pieces_sign(w, infinite, g);
}

/* f(z) with z replaced by g, f an elementary expression in the fresh symbol z. */
static tw_status compose_expression(work *w, pieces *out, expr *f, expr *z, const pieces *g)
{
    return f == NULL ? TW_ERROR : evaluate_bound(w, out, f, z, g);
}

/* Large arguments by reflection into small ones (DLMF 4.24.? from memory; 4.37.16, 4.37.19): atan(z) = sign pi/2 -
 * atan(1/z), asinh(z) = sign log(|z| + sqrt(z^2 + 1)), acosh(z) = log(z + sqrt(z^2 - 1)). */
static tw_status inverse_at_infinity(work *w, pieces *out, function_id id, int sign, expr *z, const pieces *g)
{
    tw_engine *e = w->e;
    expr *one = expr_int(e, 1), *half = expr_frac(e, 1, 2), *s = expr_int(e, sign), *square = expr_mul(e, z, z);
    expr *size = expr_mul(e, s, z);
    if (id == FUNCTION_ATAN)
        return compose_expression(w, out,
                                  expr_sub(e, expr_mul(e, expr_mul(e, s, half), expr_constant_of(e, CONSTANT_PI)),
                                           expr_call1(e, FUNCTION_ATAN, expr_pow(e, z, expr_int(e, -1)))),
                                  z, g);
    if (id == FUNCTION_ASINH)
        return compose_expression(
            w, out,
            expr_mul(e, s, expr_call1(e, FUNCTION_LOG, expr_add(e, size, expr_sqrt(e, expr_add(e, square, one))))), z,
            g);
    if (id == FUNCTION_ACOSH && sign > 0)
        return compose_expression(
            w, out, expr_call1(e, FUNCTION_LOG, expr_add(e, z, expr_sqrt(e, expr_sub(e, square, one)))), z, g);
    return work_refuse(w, "has an argument that grows without bound");
}

/* Is f analytic or one-sidedly regular at the limit c of a real g? The range where the inverse function is real. */
static tw_status inverse_domain(work *w, function_id id, const pieces *g)
{
    if (id == FUNCTION_ATAN || id == FUNCTION_ASINH)
        return g->real ? TW_OK : work_refuse(w, "has a complex argument, which may lie on its branch cut");
    if (!g->real)
        return work_refuse(w, "has a complex argument, which may lie on its branch cut");
    pieces one, gap;
    pieces_init(&one), pieces_init(&gap);
    int sign = 0;
    tw_status s = pieces_from_value(w, &one, expr_int(w->e, 1));
    if (s == TW_OK && id == FUNCTION_ACOSH)
        s = pieces_add(w, &gap, g, &one, -1);
    else if (s == TW_OK) {
        s = pieces_mul(w, &gap, g, g);
        if (s == TW_OK)
            s = pieces_add(w, &gap, &one, &gap, -1);
    }
    if (s == TW_OK)
        s = pieces_sign(w, &sign, &gap);
    if (s == TW_OK && sign <= 0)
        s = work_refuse(w, "lies on its branch cut for small values of the variable");
    pieces_clear(w, &one), pieces_clear(w, &gap);
    return s;
}

static bool argument_is_small(const pieces *g)
{
    for (size_t k = 0; k < g->count; k++)
        if (!expr_is_zero(g->at[k].sigma) || fmpq_sgn(g->at[k].lead) <= 0)
            return false;
    return true;
}

static tw_status compose_inverse(work *w, pieces *out, expr *call, const pieces *g)
{
    tw_engine *e = w->e;
    function_id id = call->is.function;
    expr *z = expr_fresh(e, "z"), *value;
    int infinite = 0;
    bool small = argument_is_small(g) && id != FUNCTION_ACOSH;
    tw_status s = small ? TW_OK : inverse_domain(w, id, g);
    if (s == TW_OK)
        s = pieces_limit(w, g, &value, &infinite);
    if (s != TW_OK)
        return s;
    if (infinite != 0)
        return inverse_at_infinity(w, out, id, infinite, z, g);
    expr *square = expr_mul(e, value, value);
    if (id == FUNCTION_ATANH && square != NULL && expr_is_one(square)) { /* DLMF 4.37.24 */
        expr *one = expr_int(e, 1);
        expr *difference = expr_sub(e, expr_call1(e, FUNCTION_LOG, expr_add(e, one, z)),
                                    expr_call1(e, FUNCTION_LOG, expr_sub(e, one, z)));
        return compose_expression(w, out, expr_mul(e, expr_frac(e, 1, 2), difference), z, g);
    }
    return compose_by_derivative(w, out, expr_call1(e, id, z), z, g, expr_call1(e, id, value));
}

/* ---- signs ---- */

tw_status pieces_sign(work *w, int *sign, const pieces *g)
{
    *sign = 0;
    if (g->count == 0)
        return TW_OK;
    if (!g->real)
        return work_refuse(w, "is not known to be real");
    /* the dominant term: least exponent, then highest power of log */
    pieces rest;
    pieces_init(&rest);
    pieces_set(w, &rest, g);
    tw_status s = TW_OK;
    for (size_t k = 0; k < rest.count && s == TW_OK; k++) {
        if (rest.at[k].sigma != rest.at[0].sigma)
            s = work_refuse(w, "has no leading term that the facts decide");
        else
            s = piece_prove_leading(w, rest.at + k);
    }
    const piece *top = rest.at;
    for (size_t k = 1; k < rest.count && s == TW_OK; k++) {
        int order = fmpq_cmp(rest.at[k].lead, top->lead);
        if (order < 0 || (order == 0 && rest.at[k].log_power > top->log_power))
            top = rest.at + k;
    }
    expr *sum = expr_int(w->e, 0);
    for (size_t k = 0; k < rest.count && s == TW_OK; k++)
        if (fmpq_equal(rest.at[k].lead, top->lead) && rest.at[k].log_power == top->log_power)
            sum = expr_add(w->e, sum, piece_leading(w, rest.at + k));
    if (s == TW_OK && sum == NULL)
        s = TW_ERROR;
    if (s == TW_OK) {
        int found = value_sign(w->e, sum);
        if (found == 2 || found == 0)
            s = work_refuse(w, "has a leading term whose sign is not known");
        else
            *sign = top->log_power & 1 ? -found : found;
    }
    pieces_clear(w, &rest);
    return s;
}

static tw_status compose_by_sign(work *w, pieces *out, function_id id, const pieces *g)
{
    int sign;
    tw_status s = pieces_sign(w, &sign, g);
    if (s != TW_OK)
        return s;
    if (id == FUNCTION_SIGN)
        return pieces_from_value(w, out, expr_int(w->e, sign));
    if (id == FUNCTION_ARG)
        return pieces_from_value(w, out, sign >= 0 ? expr_int(w->e, 0) : expr_constant_of(w->e, CONSTANT_PI));
    pieces_set(w, out, g);
    return sign < 0 ? pieces_scale(w, out, expr_int(w->e, -1)) : TW_OK;
}

static tw_status compose_extreme(work *w, pieces *out, expr *call, const pieces *args, int wanted)
{
    size_t best = 0;
    pieces gap;
    pieces_init(&gap);
    tw_status s = TW_OK;
    for (size_t k = 1; k < call->count && s == TW_OK; k++) {
        int sign = 0;
        s = pieces_add(w, &gap, args + k, args + best, -1);
        if (s == TW_OK)
            s = pieces_sign(w, &sign, &gap);
        if (sign == wanted)
            best = k;
    }
    if (s == TW_OK)
        pieces_set(w, out, args + best);
    pieces_clear(w, &gap);
    return s;
}

/* Of a real series: itself, or zero. */
static tw_status compose_real_part(work *w, pieces *out, function_id id, const pieces *g)
{
    if (!g->real)
        return work_refuse(w, "has an argument that is not known to be real");
    if (id == FUNCTION_IM)
        return pieces_from_value(w, out, expr_int(w->e, 0));
    pieces_set(w, out, g);
    return TW_OK;
}

tw_status compose_call(work *w, pieces *out, expr *call, const pieces *args)
{
    switch (call->is.function) {
    case FUNCTION_EXP: return compose_exp(w, out, args);
    case FUNCTION_LOG: return compose_log(w, out, args);
    case FUNCTION_SIN: return compose_circular(w, out, args, false, 0);
    case FUNCTION_COS: return compose_circular(w, out, args, false, 1);
    case FUNCTION_TAN: return compose_circular(w, out, args, false, 2);
    case FUNCTION_SINH: return compose_circular(w, out, args, true, 0);
    case FUNCTION_COSH: return compose_circular(w, out, args, true, 1);
    case FUNCTION_TANH: return compose_circular(w, out, args, true, 2);
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ACOSH:
    case FUNCTION_ATANH: return compose_inverse(w, out, call, args);
    case FUNCTION_ABS:
    case FUNCTION_SIGN:
    case FUNCTION_ARG: return compose_by_sign(w, out, call->is.function, args);
    case FUNCTION_RE:
    case FUNCTION_IM:
    case FUNCTION_CONJ: return compose_real_part(w, out, call->is.function, args);
    case FUNCTION_MIN: return compose_extreme(w, out, call, args, -1);
    case FUNCTION_MAX: return compose_extreme(w, out, call, args, 1);
    default: return compose_special(w, out, call, args);
    }
}
