/* The machine of methods.md section 9: from patches to bounds. Private to engine/numeric. */
#ifndef TW_NUMERIC_PANELS_H
#define TW_NUMERIC_PANELS_H

#include "engine/numeric/patches.h"
#include "engine/numeric/weights.h"

/* A bound valid for all S >= S0, without the contribution's factor:
 *
 *   |R| <= |sum over j of signed_part[j] * S^(-alpha-j)|
 *          + sum over i, j of table[i*(K+1)+j] * S^(-alpha-i) * (log S)^j   +   end * exp(-(S - S0) * end_t)
 *
 * K = 0: table[0] * S^-alpha. With K > 0 it holds for S >= max(S0, 1). */
typedef struct power_bound {
    arb_t alpha, S0;
    slong K;
    arb_ptr table;
    slong signed_count; /* 0: no such part */
    arb_ptr signed_part;
    arb_t end, end_t; /* end = 0: no such term */
    bool cut;         /* end_t is no end of the path, but where a tail begins */
    /* the steps: |R| <= int of t^(alpha-1) H(t) exp(-S t), H = height[j] between t[j] and t[j+1]; K = 0 only */
    slong step_count;
    arb_ptr step_t, step_height; /* step_count + 1, step_count */
} power_bound;
void power_bound_init(power_bound *b);
void power_bound_clear(power_bound *b);
void power_bound_value(arb_t out, const power_bound *b, const arb_t S, slong bits);

typedef struct panel_report {
    slong panels, discs, bits, known;
    double rho;
    const char *reason; /* in words, when TW_OK is returned with *made false */
} panel_report;

/* R = contribution/factor - sum of all kept groups with index below `first` (the first index that is not kept; coefficients that
 * are zero from there on are skipped). S: the scale's value, as expression and ball; goal: the relative accuracy to aim at.
 * *made false: the machine cannot prove it; report->reason says why. */
tw_status panels_at(problem *p, slong first, expr *S_expr, const arb_t S, double goal, arb_t error, bool *made,
                    panel_report *report);
/* The radius over the least modulus; inf when x may be 0. */
double panels_relative(const arb_t x);
/* For all S >= S. */
tw_status panels_for_all(problem *p, slong first, expr *S_expr, const arb_t S, power_bound *out, bool *made,
                         panel_report *report);

/* Sum of the groups with index below `first` at S: (1/m) sum f[k][n] int ell^k t^((v+1+n)/m - 1) exp(-S t) dt. */
tw_status panels_kept_sum(problem *p, slong first, const arb_t S, arb_t sum, slong bits);

#endif
