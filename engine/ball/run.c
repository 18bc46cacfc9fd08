/* Running a tape: one loop on complex balls, another on power series. Constants are computed once for each precision.
 * Beside every value stands whether it is real for real variables: then abs, sign, min, max, re ... of it mean their
 * holomorphic continuation off the real line. Integrals are asked of quadrature() and nothing else is known of them. */
#include "engine/ball/ops.h"

#include <stdlib.h>

#include "engine/ball/functions.h"
#include "engine/ball/interval.h"
#include "engine/ball/quadrature.h"
#include "engine/ball/sign.h"
#include "engine/expr/facts.h"

/* ---- constants ---- */

/* A root of a function that is no polynomial: Newton from the value given, then a disc around it on which f' keeps away
 * from 0 and the Newton operator maps into itself: the disc holds exactly one root, and the value lies in it. */
static void transcendental_root(tw_engine *e, acb_t out, expr *body, expr *x, expr *near, slong prec)
{
    expr *const vars[] = {x};
    tape *t = tape_new(e, body, vars, 1);
    acb_t z, step;
    acb_ptr jet = _acb_vec_init(2);
    slong bits = 2 * prec + 64;
    acb_init(z);
    acb_init(step);
    bool fine = t && ball_value(e, z, near, bits) == TW_OK && acb_is_finite(z);
    if (fine) {
        mag_zero(arb_radref(acb_realref(z)));
        mag_zero(arb_radref(acb_imagref(z)));
        bool real = arb_is_zero(acb_imagref(z)) && sign_is_real(e, body);
        /* the disc around the value given: radius four Newton steps and some */
        acb_t disc, image, middle;
        mag_t radius, floor;
        acb_init(disc);
        acb_init(image);
        acb_init(middle);
        mag_init(radius);
        mag_init(floor);
        tape_jet(jet, t, z, 2, bits);
        acb_div(step, jet, jet + 1, bits);
        fine = acb_is_finite(step);
        acb_get_mag(radius, step);
        mag_mul_2exp_si(radius, radius, 2);
        acb_get_mag(floor, z);
        mag_mul_2exp_si(floor, floor, -60);
        if (mag_is_zero(floor)) mag_set_ui_2exp_si(floor, 1, -60);
        mag_max(radius, radius, floor);
        acb_set(middle, z);
        acb_set(disc, z);
        acb_add_error_mag(disc, radius);
        for (int round = 0; round < 12 && fine; round++) { /* interval Newton: m - f(m)/f'(disc) */
            tape_jet(jet, t, disc, 2, bits);
            fine = acb_is_finite(jet + 1) && !acb_contains_zero(jet + 1);
            if (!fine) break;
            acb_set(step, jet + 1);
            tape_eval(image, t, middle, false, bits);
            acb_div(image, image, step, bits);
            acb_sub(image, middle, image, bits);
            fine = acb_is_finite(image) && (round > 0 || acb_contains_interior(disc, image));
            if (!fine) break;
            if (!arb_intersection(acb_realref(disc), acb_realref(disc), acb_realref(image), bits) ||
                !arb_intersection(acb_imagref(disc), acb_imagref(disc), acb_imagref(image), bits)) {
                fine = false;
                break;
            }
            acb_get_mid(middle, disc);
            if (acb_rel_accuracy_bits(disc) >= prec + 8) break;
        }
        if (fine) {
            acb_set(out, disc);
            if (real) arb_zero(acb_imagref(out)); /* a real function has the conjugate of a root for a root: the only one is real */
        }
        mag_clear(floor);
        mag_clear(radius);
        acb_clear(middle);
        acb_clear(image);
        acb_clear(disc);
    }
    _acb_vec_clear(jet, 2);
    acb_clear(step);
    acb_clear(z);
    tape_free(t);
}

/* The root of a rational polynomial nearest to the value given; non-finite when two are equally near. Other functions:
 * see above. */
static void root_value(tw_engine *e, acb_t out, expr *a, slong prec)
{
    acb_indeterminate(out);
    expr *x = expr_fresh(e, "r"), *body = expr_open(e, a, x), **c = NULL;
    slong degree;
    if (!body) return;
    if (expr_polynomial(e, body, x, 1000, &c, &degree) != TW_OK) {
        if (e->error.kind == ERROR_NONE) transcendental_root(e, out, body, x, a->args[1], prec);
        return;
    }
    fmpq_poly_t p;
    fmpq_poly_init(p);
    bool rational = degree >= 1;
    for (slong k = 0; k <= degree && rational; k++) {
        rational = expr_is_number(c[k]);
        if (rational) fmpq_poly_set_coeff_fmpq(p, k, &c[k]->is.number);
    }
    free(c);
    acb_t near;
    acb_init(near);
    if (rational && ball_value(e, near, a->args[1], prec) == TW_OK) {
        fmpz_poly_t z, d, g;
        fmpz_poly_init(z);
        fmpz_poly_init(d);
        fmpz_poly_init(g);
        fmpq_poly_get_numerator(z, p);
        fmpz_poly_derivative(d, z);
        fmpz_poly_gcd(g, z, d);
        fmpz_poly_div(z, z, g);
        slong n = fmpz_poly_degree(z), best = -1;
        acb_ptr roots = _acb_vec_init(n);
        arb_fmpz_poly_complex_roots(roots, z, 0, prec);
        arb_t least, distance;
        arb_init(least);
        arb_init(distance);
        acb_t difference;
        acb_init(difference);
        for (int round = 0; round < 2; round++) /* 0 finds the candidate, 1 proves that no other is as near */
            for (slong k = 0; k < n; k++) {
                acb_sub(difference, roots + k, near, prec);
                acb_abs(distance, difference, prec);
                if (round == 0 && (best < 0 || arf_cmp(arb_midref(distance), arb_midref(least)) < 0)) {
                    best = k;
                    arb_set(least, distance);
                }
                if (round == 1 && best >= 0 && k != best && !arb_gt(distance, least)) best = -2;
            }
        if (best >= 0) acb_set(out, roots + best);
        acb_clear(difference);
        arb_clear(least);
        arb_clear(distance);
        _acb_vec_clear(roots, n);
        fmpz_poly_clear(z);
        fmpz_poly_clear(d);
        fmpz_poly_clear(g);
    }
    acb_clear(near);
    fmpq_poly_clear(p);
}

static void fixed_value(tape *t, acb_t out, op *o, slong prec)
{
    if (o->kept_prec < prec) {
        if (o->node->kind == EXPR_ROOT) {
            root_value(t->e, o->kept, o->node, prec);
            forgive_trouble(t->e);
        } else {
            env nowhere = {0};
            slong digits = (slong)((double)prec * 0.30103) + 1;
            if (quadrature(t->e, o->kept, o->node, &nowhere, digits, true, NULL) != TW_OK) {
                acb_indeterminate(o->kept);
                forgive_trouble(t->e);
            }
        }
        o->kept_prec = prec;
    }
    acb_set_round(out, o->kept, prec);
}

static void leaf_value(tape *t, acb_t out, op *o, slong prec)
{
    switch (o->kind) {
    case OP_NUMBER:
        arb_set_fmpq(acb_realref(out), &o->node->is.number, prec);
        arb_zero(acb_imagref(out));
        break;
    case OP_PI: acb_const_pi(out, prec); break;
    case OP_I: acb_onei(out); break;
    case OP_EULER:
        arb_const_euler(acb_realref(out), prec);
        arb_zero(acb_imagref(out));
        break;
    case OP_FIXED: fixed_value(t, out, o, prec); break;
    default: acb_indeterminate(out); break;
    }
}

/* ---- pieces ---- */

/* Does left REL right hold for the whole ball, compared by real parts? open: not only there but around it, so that
 * the ball's edge or an exact point does not count (what an analytic function needs). */
static answer compare(const acb_t left, const acb_t right, expr_relation r, bool open)
{
    arb_srcptr a = acb_realref(left), b = acb_realref(right);
    bool less = arb_lt(a, b), more = arb_gt(a, b), same = !open && arb_is_exact(a) && arb_equal(a, b);
    switch (r) {
    case RELATION_LESS: return less ? ANSWER_YES : more || (!open && arb_ge(a, b)) ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_LESS_EQUAL: return less || (!open && arb_le(a, b)) ? ANSWER_YES : more ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_EQUAL: return same ? ANSWER_YES : less || more ? ANSWER_NO : ANSWER_UNKNOWN;
    case RELATION_NOT_EQUAL: return less || more ? ANSWER_YES : same ? ANSWER_NO : ANSWER_UNKNOWN;
    default: return ANSWER_UNKNOWN;
    }
}

static acb_srcptr plain_value(const tape *t, size_t k)
{
    return t->values + k;
}

static acb_srcptr jet_value(const tape *t, size_t k)
{
    static const acb_struct zero; /* all bits 0 is the exact 0 */
    return t->jets[k].length ? t->jets[k].coeffs : &zero;
}

/* Condition number c of the piecewise o (its operands start at k). */
static answer condition_holds(const tape *t, const op *o, uint32_t c, size_t k, bool open,
                              acb_srcptr (*value)(const tape *, size_t))
{
    size_t left = t->operands[o->first + k], right = t->operands[o->first + k + 1];
    if (!t->real[left] || !t->real[right]) return ANSWER_UNKNOWN;
    open = open && !(t->ops[left].constant && t->ops[right].constant);
    return compare(value(t, left), value(t, right), o->node->args[c]->is.relation, open);
}

/* The pieces that may apply somewhere on the ball into pieces[] (at most node->count of them); how many. One: it
 * applies on the whole ball. value(k) gives the constant term of operand k. */
static size_t pieces_of(const tape *t, const op *o, bool open, acb_srcptr (*value)(const tape *, size_t),
                        size_t *pieces)
{
    size_t n = 0, k = 0;
    for (uint32_t c = 0; c + 1 < o->node->count; c += 2, k += 3) {
        answer holds = condition_holds(t, o, c, k, open, value);
        if (holds != ANSWER_NO) pieces[n++] = t->operands[o->first + k + 2];
        if (holds == ANSWER_YES) return n;
    }
    pieces[n++] = t->operands[o->first + k];
    return n;
}

static void run_piecewise(tape *t, acb_t out, const op *o, bool analytic, bool *real, slong prec)
{
    size_t *pieces = base_alloc(o->node->count * sizeof *pieces), n = pieces_of(t, o, analytic, plain_value, pieces);
    acb_set(out, t->values + pieces[0]);
    *real = t->real[pieces[0]];
    for (size_t k = 1; k < n; k++) {
        acb_union(out, out, t->values + pieces[k], prec);
        *real = *real && t->real[pieces[k]];
    }
    if (analytic && n > 1) acb_indeterminate(out);
    free(pieces);
}

static void jet_piecewise(tape *t, acb_poly_t out, const op *o, bool *real, slong len)
{
    size_t *pieces = base_alloc(o->node->count * sizeof *pieces), n = pieces_of(t, o, true, jet_value, pieces);
    *real = t->real[pieces[0]];
    if (n == 1) acb_poly_set(out, &t->jets[pieces[0]]);
    else jet_unknown(out, len);
    free(pieces);
}

/* ---- running on balls ---- */

/* Is the value of a call real where its arguments are real? `value` gives their balls. */
static bool call_is_real(const tape *t, const op *o, acb_srcptr (*value)(const tape *, size_t))
{
    const size_t *from = o->count > 0 ? t->operands + o->first : NULL;
    acb_srcptr a = value(t, from[0]);
    switch (o->function) {
    case FUNCTION_ABS:
    case FUNCTION_RE:
    case FUNCTION_IM:
    case FUNCTION_ARG: return true;
    default: break;
    }
    for (size_t k = 0; k < o->count; k++)
        if (!t->real[from[k]]) return false;
    switch (o->function) {
    case FUNCTION_LOG:
    case FUNCTION_LNGAMMA:
    case FUNCTION_E1: return arb_is_positive(acb_realref(a));
    case FUNCTION_ASIN:
    case FUNCTION_ACOS:
    case FUNCTION_ATANH: return ball_real_within_one(a);
    case FUNCTION_ACOSH: return ball_real_beyond_one(a);
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_I: return acb_is_int(a) || arb_is_positive(acb_realref(value(t, from[1])));
    case FUNCTION_GAMMA_UPPER:
    case FUNCTION_BESSEL_Y:
    case FUNCTION_BESSEL_K: return arb_is_positive(acb_realref(value(t, from[1])));
    default: return true;
    }
}

/* The same for every operation but pieces. */
static bool is_real(const tape *t, const op *o, acb_srcptr (*value)(const tape *, size_t))
{
    const size_t *from = o->count > 0 ? t->operands + o->first : NULL;
    acb_srcptr a = o->count ? value(t, from[0]) : NULL;
    switch (o->kind) {
    case OP_VARIABLE: return o->real;
    case OP_CALL: return call_is_real(t, o, value);
    case OP_POWER_RATIONAL:
        if (fmpz_is_one(fmpq_denref(&o->node->is.number))) return t->real[from[0]];
        return t->real[from[0]] && (arb_is_positive(acb_realref(a)) || ball_is_nonnegative(a));
    case OP_POWER: return t->real[from[0]] && t->real[from[1]] && arb_is_positive(acb_realref(a));
    case OP_LOG1P:
    case OP_POWM1: return t->real[from[0]] && ball_real_beyond(a, -1);
    default:
        for (size_t k = 0; k < o->count; k++)
            if (!t->real[from[k]]) return false;
        return true;
    }
}

static void run_call(tape *t, acb_t out, const op *o, bool analytic, slong prec)
{
    acb_srcptr small[8], *args = o->count <= 8 ? small : base_alloc(o->count * sizeof *args);
    ball_mode m = {.analytic = analytic, .real_args = true, .off_line = t->off_line && !o->constant};
    for (size_t k = 0; k < o->count; k++) {
        size_t from = t->operands[o->first + k];
        args[k] = t->values + from;
        m.real_args = m.real_args && t->real[from];
    }
    ball_function_of(o->function)(out, (acb_srcptr const *)args, o->count, m, prec);
    if (args != small) free(args);
}

/* log(1 + u), exp(u) - 1, cos(u) - 1, cosh(u) - 1, (1 + u)^r - 1. */
static void run_special(acb_t out, const op *o, const acb_t u, bool analytic, slong prec)
{
    switch (o->kind) {
    case OP_LOG1P: ball_log1p(out, u, analytic, prec); break;
    case OP_EXPM1: ball_expm1(out, u, prec); break;
    case OP_COSM1: ball_cosm1(out, u, prec); break;
    case OP_COSHM1: ball_coshm1(out, u, prec); break;
    default: ball_powm1(out, u, expr_number(o->node->args[1]), analytic, prec); break;
    }
}

/* A value that is real because its operands' balls are: what the function's own arithmetic left as imaginary part
 * goes. */
static bool operands_are_real(const tape *t, const op *o)
{
    for (size_t k = 0; k < o->count; k++)
        if (!acb_is_real(t->values + t->operands[o->first + k])) return false;
    return o->count > 0;
}

static void run_op(tape *t, size_t k, acb_srcptr at, bool analytic, slong prec)
{
    op *o = &t->ops[k];
    acb_ptr out = t->values + k;
    const size_t *from = o->count > 0 ? t->operands + o->first : NULL;
    switch (o->kind) {
    case OP_VARIABLE:
        acb_set(out, at + o->index);
        t->off_line = t->off_line || (o->real && !acb_is_real(out));
        break;
    case OP_SUM:
        acb_set(out, t->values + from[0]);
        for (size_t j = 1; j < o->count; j++) acb_add(out, out, t->values + from[j], prec);
        break;
    case OP_PRODUCT:
        acb_set(out, t->values + from[0]);
        for (size_t j = 1; j < o->count; j++) ball_mul(out, out, t->values + from[j], prec);
        break;
    case OP_POWER_RATIONAL:
        ball_power_rational(out, t->values + from[0], expr_number(o->node), analytic, prec);
        break;
    case OP_POWER: ball_power(out, t->values + from[0], t->values + from[1], analytic, prec); break;
    case OP_CALL: run_call(t, out, o, analytic, prec); break;
    case OP_LOG1P:
    case OP_EXPM1:
    case OP_COSM1:
    case OP_COSHM1:
    case OP_POWM1: run_special(out, o, t->values + from[0], analytic, prec); break;
    case OP_PIECEWISE: run_piecewise(t, out, o, analytic, &t->real[k], prec); return;
    default: leaf_value(t, out, o, prec); break;
    }
    t->real[k] = is_real(t, o, plain_value);
    if (t->real[k] && !acb_is_real(out) && operands_are_real(t, o)) arb_zero(acb_imagref(out));
}

/* Constants need no analyticity: abs(3 + 4*i) is 5. */
static void run_constants(tape *t, slong prec)
{
    if (t->constants_prec == prec) return;
    for (size_t k = 0; k < t->count; k++) {
        if (!t->ops[k].constant) continue;
        run_op(t, k, NULL, false, prec);
        t->real[k] = acb_is_real(t->values + k);
    }
    t->constants_prec = prec;
}

void tape_eval(acb_t out, tape *t, acb_srcptr at, bool analytic, slong prec)
{
    run_constants(t, prec);
    t->off_line = false;
    for (size_t k = 0; k < t->count; k++)
        if (!t->ops[k].constant) run_op(t, k, at, analytic, prec);
    acb_set(out, t->values + t->count - 1);
}

/* ---- running on power series ---- */

static void jet_call(tape *t, acb_poly_t out, const op *o, slong len, slong prec)
{
    const acb_poly_struct *small[8], **args = o->count <= 8 ? small : base_alloc(o->count * sizeof *args);
    ball_mode m = {.analytic = true, .real_args = true};
    for (size_t k = 0; k < o->count; k++) {
        size_t from = t->operands[o->first + k];
        args[k] = &t->jets[from];
        m.real_args = m.real_args && t->real[from];
    }
    jet_function_of(o->function)(out, args, o->count, m, len, prec);
    if (args != small) free(args);
}

/* The series of the function itself; its constant term, where plain arithmetic would cancel, by run_special. */
static void jet_special(acb_poly_t out, const op *o, const acb_poly_struct *u, const acb_t u0, slong len, slong prec)
{
    acb_t c;
    acb_init(c);
    run_special(c, o, u0, true, prec);
    if (!acb_is_finite(c)) {
        jet_unknown(out, len);
    } else {
        acb_poly_t w;
        acb_poly_init(w);
        if (o->kind == OP_LOG1P || o->kind == OP_POWM1) acb_poly_add_si(w, u, 1, prec);
        switch (o->kind) {
        case OP_LOG1P: acb_poly_log_series(out, w, len, prec); break;
        case OP_EXPM1: acb_poly_exp_series(out, u, len, prec); break;
        case OP_COSM1: acb_poly_cos_series(out, u, len, prec); break;
        case OP_COSHM1: acb_poly_cosh_series(out, u, len, prec); break;
        default: jet_power_rational(out, w, expr_number(o->node->args[1]), len, prec); break;
        }
        acb_poly_set_coeff_acb(out, 0, c);
        acb_poly_clear(w);
    }
    acb_clear(c);
}

static bool operand_jets_are_real(const tape *t, const op *o)
{
    for (size_t k = 0; k < o->count; k++) {
        const acb_poly_struct *u = &t->jets[t->operands[o->first + k]];
        for (slong j = 0; j < u->length; j++)
            if (!acb_is_real(u->coeffs + j)) return false;
    }
    return o->count > 0;
}

static void jet_op(tape *t, size_t k, acb_srcptr at, slong len, slong prec)
{
    op *o = &t->ops[k];
    acb_poly_struct *out = &t->jets[k];
    const size_t *from = o->count > 0 ? t->operands + o->first : NULL;
    switch (o->kind) {
    case OP_VARIABLE:
        acb_poly_zero(out);
        acb_poly_set_coeff_acb(out, 0, at + o->index);
        if (o->index == 0 && len > 1) acb_poly_set_coeff_si(out, 1, 1);
        break;
    case OP_SUM:
        acb_poly_set(out, &t->jets[from[0]]);
        for (size_t j = 1; j < o->count; j++) acb_poly_add(out, out, &t->jets[from[j]], prec);
        break;
    case OP_PRODUCT:
        acb_poly_set(out, &t->jets[from[0]]);
        for (size_t j = 1; j < o->count; j++) jet_mul(out, out, &t->jets[from[j]], len, prec);
        break;
    case OP_POWER_RATIONAL: jet_power_rational(out, &t->jets[from[0]], expr_number(o->node), len, prec); break;
    case OP_POWER: jet_power(out, &t->jets[from[0]], &t->jets[from[1]], len, prec); break;
    case OP_CALL: jet_call(t, out, o, len, prec); break;
    case OP_PIECEWISE: jet_piecewise(t, out, o, &t->real[k], len); return;
    default: jet_special(out, o, &t->jets[from[0]], jet_value(t, from[0]), len, prec); break;
    }
    t->real[k] = is_real(t, o, jet_value);
    if (t->real[k] && operand_jets_are_real(t, o))
        for (slong j = 0; j < out->length; j++) arb_zero(acb_imagref(out->coeffs + j));
}

void tape_jet(acb_ptr out, tape *t, acb_srcptr at, slong len, slong prec)
{
    if (!t->jets) {
        t->jets = base_alloc(t->count * sizeof *t->jets);
        for (size_t k = 0; k < t->count; k++) acb_poly_init(&t->jets[k]);
    }
    run_constants(t, prec);
    for (size_t k = 0; k < t->count; k++) {
        if (t->ops[k].constant) acb_poly_set_acb(&t->jets[k], t->values + k);
        else jet_op(t, k, at, len, prec);
    }
    const acb_poly_struct *last = &t->jets[t->count - 1];
    for (slong k = 0; k < len; k++) {
        if (k < last->length) acb_set(out + k, last->coeffs + k);
        else acb_zero(out + k);
    }
}

/* ---- closed values ---- */

tw_status ball_value(tw_engine *e, acb_t out, expr *f, slong prec)
{
    tape *t = tape_new(e, f, NULL, 0);
    if (!t) return TW_ERROR;
    tape_eval(out, t, NULL, false, prec);
    tape_free(t);
    return TW_OK;
}

tw_status evaluate_closed(tw_engine *e, acb_t value, expr *f, const env *at, slong bits)
{
    expr *g = at->count ? expr_substitute_all(e, f, at->symbols, at->values, at->count) : f;
    if (!g) return TW_ERROR;
    return ball_value(e, value, g, bits);
}
