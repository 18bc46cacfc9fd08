/* Masses of the weight t^(alpha-1) exp(-S t), and of its logarithmic kin. Private. */
#ifndef TW_NUMERIC_WEIGHTS_H
#define TW_NUMERIC_WEIGHTS_H

#include "engine/numeric/problem.h"

/* The weight, normalised: density t^(alpha-1) S^alpha exp(-S t)/Gamma(alpha). */
typedef struct weight {
    arb_t alpha, S, gamma; /* gamma: Gamma(alpha + 1) */
    slong bits;
} weight;
void weight_init(weight *w, const arb_t alpha, const arb_t S);
void weight_clear(weight *w);

/* A joint of panels: t, and the mass below and above it (regularised incomplete Gamma functions, DLMF 8.2.4). */
typedef struct joint {
    arb_t t, below, above;
    arb_t next; /* (S t)^alpha exp(-S t) / Gamma(alpha + 1): below less it, above plus it are the masses for alpha + 1 */
} joint;
void joint_init(joint *j);
void joint_clear(joint *j);
void joint_set(joint *j, const weight *w, const arb_t t);
/* Mass between two joints a < b. */
void joint_mass(arb_t mass, const joint *a, const joint *b, slong bits);
/* The integral of t over the same part, in the same units. */
void joint_moment(arb_t moment, const weight *w, const joint *a, const joint *b);
/* Gamma(alpha) * S^-alpha */
void weight_total(arb_t total, const weight *w);

/* omega(t) = (c - log t + (2/e) t)^K >= |log t|^K: because log t <= t/e. Its integral with the weight as a polynomial,
 *
 *     int_0^inf omega t^(alpha-1) exp(-S t) dt = sum over i, j of  table[i*(K+1) + j] * S^(-alpha-i) * (log S)^j
 *
 * by derivatives of Gamma(alpha) S^-alpha in alpha (DLMF 5.9.1). table has (K+1)^2 entries. */
void omega_table(arb_ptr table, const arb_t alpha, const arb_t c, slong K, slong bits);
void omega_value(arb_t out, const arb_t t, const arb_t c, slong K, slong bits);
void omega_total(arb_t out, arb_srcptr table, const arb_t alpha, const arb_t S, slong K, slong bits);
/* Upper bound of int_0^t0 (d + |log t|)^K t^(alpha-1) dt for 0 < t0 < 1, d >= 0. */
void omega_crumb(mag_t out, const arb_t alpha, const arb_t d, const arb_t t0, slong K);

#endif
