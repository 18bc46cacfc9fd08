/* The remainder at one value of the scale: the sum of the panels' parts, signs kept; and the kept terms summed as the panels group
 * them. One idea: when the sum is small beside its parts, the patches are made again with smaller errors of their own. */
#include "engine/numeric/sheaf.h"

#include <math.h>
#include <string.h>
#include <stdlib.h>
#include <stdio.h>

#include "engine/numeric/shared.h"

double panels_relative(const arb_t x)
{
    mag_t m;
    double size, radius = mag_is_zero(arb_radref(x)) ? -HUGE_VAL : mag_log2(arb_radref(x));
    mag_init(m);
    arb_get_mag_lower(m, x);
    size = mag_is_zero(m) ? -HUGE_VAL : mag_log2(m);
    mag_clear(m);
    return radius == -HUGE_VAL ? 0 : exp2(radius - size);
}

static tw_status add_tail(sheaf *s, problem *p, expr *S_expr, arb_t sum, bool *made)
{
    tw_status status = TW_OK;
    arb_t tail;
    arb_init(tail);
    if (problem_has_tail(p, tail)) {
        *made = problem_tail(tail, p, S_expr, false);
        arb_add(sum, sum, tail, 2 * SUM_BITS);
        if (!*made)
            s->patches.reason = "the integral next to the far end, where the amplitude is singular, could not be certified";
        status = p->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    }
    arb_clear(tail);
    return status;
}

static tw_status sheaf_sum(sheaf *s, problem *p, bool fine, slong first, expr *S_expr, const arb_t S, double goal, arb_t sum,
                           bool *made)
{
    tw_status status;
    sheaf_init(s, p);
    s->fine = fine;
    status = sheaf_make(s, &first, S_expr, S, made);
    if (status == TW_OK && *made && !sheaf_refine(s, sum, goal))
        status = TW_ERROR;
    if (status == TW_OK && *made) {
        sheaf_denormalise(sum, s);
        mag_add(arb_radref(sum), arb_radref(sum), s->far);
        sheaf_over_m(sum, p);
        status = add_tail(s, p, S_expr, sum, made);
    }
    return status;
}

tw_status panels_at(problem *p, slong first, expr *S_expr, const arb_t S, double goal, arb_t error, bool *made,
                    panel_report *report)
{
    sheaf s;
    tw_status status = sheaf_sum(&s, p, goal < 1e-4, first, S_expr, S, goal, error, made);
    if (status == TW_OK && *made && !s.fine && panels_relative(error) > 2.5 * goal) {
        sheaf again;
        arb_t other;
        bool fine = false;
        arb_init(other);
        status = sheaf_sum(&again, p, true, first, S_expr, S, goal, other, &fine);
        if (status == TW_OK && fine && mag_cmp(arb_radref(other), arb_radref(error)) < 0) {
            sheaf swap = s;
            s = again;
            again = swap;
            arb_swap(error, other);
        }
        sheaf_clear(&again);
        arb_clear(other);
    }
    if (status == TW_OK && *made && TW_BOUND_FACTOR != 1) {
        arb_t factor;
        arb_init(factor);
        arb_set_d(factor, TW_BOUND_FACTOR);
        arb_mul(error, error, factor, SUM_BITS);
        arb_clear(factor);
    }
    sheaf_report(&s, report);
    sheaf_clear(&s);
    return status;
}

/* ---- for all S >= S0 ---- */

void power_bound_init(power_bound *b)
{
    memset(b, 0, sizeof *b);
    arb_init(b->alpha);
    arb_init(b->S0);
    arb_init(b->end);
    arb_init(b->end_t);
}

void power_bound_clear(power_bound *b)
{
    arb_clear(b->alpha);
    arb_clear(b->S0);
    arb_clear(b->end);
    arb_clear(b->end_t);
    if (b->table)
        _arb_vec_clear(b->table, (b->K + 1) * (b->K + 1));
    if (b->signed_part)
        _arb_vec_clear(b->signed_part, b->signed_count);
    if (b->step_t) {
        _arb_vec_clear(b->step_t, b->step_count + 1);
        _arb_vec_clear(b->step_height, b->step_count);
    }
}

void power_bound_value(arb_t out, const power_bound *b, const arb_t S, slong bits)
{
    arb_t x;
    arb_init(x);
    omega_total(out, b->table, b->alpha, S, b->K, bits);
    if (b->signed_count) {
        arb_t power, sum;
        arb_init(power);
        arb_init(sum);
        arb_inv(x, S, bits);
        _arb_poly_evaluate(sum, b->signed_part, b->signed_count, x, bits);
        arb_pow(power, x, b->alpha, bits);
        arb_mul(sum, sum, power, bits);
        arb_abs(sum, sum);
        arb_add(out, out, sum, bits);
        arb_clear(sum);
        arb_clear(power);
    }
    if (!arb_is_zero(b->end)) {
        arb_sub(x, b->S0, S, bits);
        arb_mul(x, x, b->end_t, bits);
        arb_exp(x, x, bits);
        arb_addmul(out, x, b->end, bits);
    }
    arb_clear(x);
}

/* ---- the kept terms ---- */

tw_status panels_kept_sum(problem *p, slong first, const arb_t S, arb_t sum, slong bits)
{
    arb_ptr gamma = _arb_vec_init(PROBLEM_LOGS + 1), powers = _arb_vec_init(PROBLEM_LOGS + 1);
    arb_t alpha, log_S, x, y;
    tw_status status = problem_coefficients(p, first, FLINT_MAX(bits, p->bits));
    slong lanes = p->lanes;
    arb_init(alpha);
    arb_init(log_S);
    arb_init(x);
    arb_init(y);
    arb_log(log_S, S, bits);
    arb_zero(sum);
    for (slong n = 0; status == TW_OK && n < first && n < p->known; n++) {
        bool any = false;
        for (slong k = 0; k < lanes; k++)
            any = any || !arb_is_zero(p->f[k] + n);
        if (!any)
            continue;
        /* d^k/dalpha^k of Gamma(alpha) S^-alpha, over k!, as the product of two series */
        problem_alpha(alpha, p, n, bits);
        _arb_vec_zero(gamma, lanes + 1);
        arb_set(gamma, alpha);
        arb_one(gamma + 1);
        _arb_poly_gamma_series(gamma, gamma, 2, lanes, bits);
        arb_neg(x, alpha);
        arb_pow(powers, S, x, bits);
        for (slong k = 1; k < lanes; k++) {
            arb_mul(powers + k, powers + k - 1, log_S, bits);
            arb_div_si(powers + k, powers + k, -k, bits);
        }
        for (slong k = 0; k < lanes; k++) {
            if (arb_is_zero(p->f[k] + n))
                continue;
            arb_zero(x);
            for (slong j = 0; j <= k; j++)
                arb_addmul(x, gamma + j, powers + k - j, bits);
            arb_fac_ui(y, (ulong)k, bits);
            arb_mul(x, x, y, bits);
            arb_pow_ui(y, p->ell_factor, (ulong)k, bits);
            arb_mul(x, x, y, bits);
            arb_addmul(sum, x, p->f[k] + n, bits);
        }
        if (!budget_ok(p->e))
            status = TW_ERROR;
    }
    arb_mul_fmpz(sum, sum, fmpq_denref(p->m), bits);
    arb_div_fmpz(sum, sum, fmpq_numref(p->m), bits);
    arb_clear(y);
    arb_clear(x);
    arb_clear(log_S);
    arb_clear(alpha);
    _arb_vec_clear(powers, PROBLEM_LOGS + 1);
    _arb_vec_clear(gamma, PROBLEM_LOGS + 1);
    return status;
}
