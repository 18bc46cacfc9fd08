/* Masses of panels. One idea: of the two regularised incomplete Gamma functions take the one that is small at the joint, so that
 * a panel far out on either side keeps its relative accuracy. Knows numbers only. */
#include "engine/numeric/weights.h"

void weight_init(weight *w, const arb_t alpha, const arb_t S)
{
    arb_init(w->alpha);
    arb_init(w->S);
    arb_set(w->alpha, alpha);
    arb_set(w->S, S);
    /* Arb's incomplete Gamma function loses about alpha bits around its turning point. */
    w->bits = 128 + (slong)arf_get_d(arb_midref(alpha), ARF_RND_UP);
    arb_init(w->gamma);
    arb_add_ui(w->gamma, alpha, 1, w->bits);
    arb_gamma(w->gamma, w->gamma, w->bits);
}

void weight_clear(weight *w)
{
    arb_clear(w->alpha);
    arb_clear(w->S);
    arb_clear(w->gamma);
}

void joint_init(joint *j)
{
    arb_init(j->t);
    arb_init(j->below);
    arb_init(j->above);
    arb_init(j->next);
}

void joint_clear(joint *j)
{
    arb_clear(j->t);
    arb_clear(j->below);
    arb_clear(j->above);
    arb_clear(j->next);
}

/* A probability: what is computed, cut to [0, 1]. */
static void clip(arb_t x, slong bits)
{
    arb_t unit;
    if (arb_is_finite(x) && !arb_contains_zero(x))
        return;
    arb_init(unit);
    arb_set_d(unit, 0.5);
    mag_set_d(arb_radref(unit), 0.5);
    if (!arb_is_finite(x) || !arb_intersection(x, x, unit, bits))
        arb_set(x, unit);
    arb_clear(unit);
}

void joint_set(joint *j, const weight *w, const arb_t t)
{
    arb_t x;
    arb_set(j->t, t);
    if (arb_is_zero(t)) {
        arb_zero(j->below);
        arb_one(j->above);
        arb_zero(j->next);
        return;
    }
    arb_init(x);
    arb_mul(x, w->S, t, w->bits);
    if (arf_cmp(arb_midref(x), arb_midref(w->alpha)) < 0) {
        arb_hypgeom_gamma_lower(j->below, w->alpha, x, 1, w->bits);
        clip(j->below, w->bits);
        arb_sub_ui(j->above, j->below, 1, w->bits);
        arb_neg(j->above, j->above);
    } else {
        arb_hypgeom_gamma_upper(j->above, w->alpha, x, 1, w->bits);
        clip(j->above, w->bits);
        arb_sub_ui(j->below, j->above, 1, w->bits);
        arb_neg(j->below, j->below);
    }
    arb_pow(j->next, x, w->alpha, w->bits);
    arb_neg(x, x);
    arb_exp(x, x, w->bits);
    arb_mul(j->next, j->next, x, w->bits);
    arb_div(j->next, j->next, w->gamma, w->bits);
    arb_clear(x);
}

void joint_mass(arb_t mass, const joint *a, const joint *b, slong bits)
{
    arb_t other;
    arb_init(other);
    arb_sub(mass, b->below, a->below, bits);
    arb_sub(other, a->above, b->above, bits);
    if (mag_cmp(arb_radref(other), arb_radref(mass)) < 0)
        arb_swap(mass, other);
    arb_nonnegative_part(mass, mass);
    arb_clear(other);
}

void joint_moment(arb_t moment, const weight *w, const joint *a, const joint *b)
{
    arb_t other, less;
    arb_init(other);
    arb_init(less);
    /* DLMF 8.8.5, 8.8.6: P and Q for alpha + 1 */
    arb_sub(less, b->next, a->next, w->bits);
    arb_sub(moment, b->below, a->below, w->bits);
    arb_sub(other, a->above, b->above, w->bits);
    if (mag_cmp(arb_radref(other), arb_radref(moment)) < 0)
        arb_swap(moment, other);
    arb_sub(moment, moment, less, w->bits);
    arb_mul(moment, moment, w->alpha, w->bits);
    arb_div(moment, moment, w->S, w->bits);
    arb_clear(less);
    arb_clear(other);
}

void weight_total(arb_t total, const weight *w)
{
    arb_t x;
    arb_init(x);
    arb_gamma(total, w->alpha, w->bits);
    arb_neg(x, w->alpha);
    arb_pow(x, w->S, x, w->bits);
    arb_mul(total, total, x, w->bits);
    arb_clear(x);
}

/* kappa = 2/e */
static void omega_kappa(arb_t kappa, slong bits)
{
    arb_set_si(kappa, -1);
    arb_exp(kappa, kappa, bits);
    arb_mul_2exp_si(kappa, kappa, 1);
}

void omega_value(arb_t out, const arb_t t, const arb_t c, slong K, slong bits)
{
    arb_t x;
    arb_init(x);
    omega_kappa(out, bits);
    arb_mul(out, out, t, bits);
    arb_add(out, out, c, bits);
    arb_log(x, t, bits);
    arb_sub(out, out, x, bits);
    arb_pow_ui(out, out, (ulong)K, bits);
    arb_clear(x);
}

void omega_table(arb_ptr table, const arb_t alpha, const arb_t c, slong K, slong bits)
{
    arb_ptr gamma = _arb_vec_init(K + 2);
    arb_t a, kappa, x, y;
    fmpz_t many;
    arb_init(a);
    arb_init(kappa);
    arb_init(x);
    arb_init(y);
    fmpz_init(many);
    omega_kappa(kappa, bits);
    _arb_vec_zero(table, (K + 1) * (K + 1));
    for (slong i = 0; i <= K; i++) {
        /* Taylor coefficients of Gamma at alpha + i: gamma[l] = Gamma^(l)/l! */
        _arb_vec_zero(gamma, K + 2);
        arb_add_si(gamma, alpha, i, bits);
        arb_one(gamma + 1);
        _arb_poly_gamma_series(gamma, gamma, 2, K + 1, bits);
        for (slong j = 0; i + j <= K; j++)
            for (slong l = 0; l <= j; l++) {
                /* K!/(i! j! (K-i-j)!) c^(K-i-j) kappa^i * (-1)^j * binomial(j, l) l! gamma[l] (-log S)^(j-l) */
                arb_pow_ui(x, c, (ulong)(K - i - j), bits);
                arb_pow_ui(y, kappa, (ulong)i, bits);
                arb_mul(x, x, y, bits);
                arb_mul(x, x, gamma + l, bits);
                fmpz_bin_uiui(many, (ulong)K, (ulong)i);
                arb_mul_fmpz(x, x, many, bits);
                fmpz_bin_uiui(many, (ulong)(K - i), (ulong)j);
                arb_mul_fmpz(x, x, many, bits);
                fmpz_bin_uiui(many, (ulong)j, (ulong)l);
                arb_mul_fmpz(x, x, many, bits);
                fmpz_fac_ui(many, (ulong)l);
                arb_mul_fmpz(x, x, many, bits);
                if (l % 2)
                    arb_neg(x, x);
                arb_add(table + i * (K + 1) + j - l, table + i * (K + 1) + j - l, x, bits);
            }
    }
    fmpz_clear(many);
    arb_clear(y);
    arb_clear(x);
    arb_clear(kappa);
    arb_clear(a);
    _arb_vec_clear(gamma, K + 2);
}

void omega_total(arb_t out, arb_srcptr table, const arb_t alpha, const arb_t S, slong K, slong bits)
{
    arb_t log_S, x, sum;
    arb_init(log_S);
    arb_init(x);
    arb_init(sum);
    arb_log(log_S, S, bits);
    for (slong i = K; i >= 0; i--) {
        arb_div(sum, sum, S, bits);
        arb_zero(x);
        for (slong j = K; j >= 0; j--) {
            arb_mul(x, x, log_S, bits);
            arb_add(x, x, table + i * (K + 1) + j, bits);
        }
        arb_add(sum, sum, x, bits);
    }
    arb_neg(x, alpha);
    arb_pow(x, S, x, bits);
    arb_mul(out, sum, x, bits);
    arb_clear(sum);
    arb_clear(x);
    arb_clear(log_S);
}

void omega_crumb(mag_t out, const arb_t alpha, const arb_t d, const arb_t t0, slong K)
{
    enum { BITS = 64 };
    arb_t u, sum, part, x;
    arb_init(u);
    arb_init(sum);
    arb_init(part);
    arb_init(x);
    /* integrating by parts: t0^alpha/alpha * sum over j of K!/(K-j)! (d + |log t0|)^(K-j) / alpha^j */
    arb_log(u, t0, BITS);
    arb_sub(u, d, u, BITS);
    arb_one(part);
    for (slong j = 0; j <= K; j++) {
        arb_pow_ui(x, u, (ulong)(K - j), BITS);
        arb_mul(x, x, part, BITS);
        arb_add(sum, sum, x, BITS);
        arb_mul_si(part, part, K - j, BITS);
        arb_div(part, part, alpha, BITS);
    }
    arb_pow(x, t0, alpha, BITS);
    arb_mul(sum, sum, x, BITS);
    arb_div(sum, sum, alpha, BITS);
    arb_get_mag(out, sum);
    arb_clear(x);
    arb_clear(part);
    arb_clear(sum);
    arb_clear(u);
}
