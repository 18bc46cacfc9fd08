/* The sheaf of panels: patches of the path cut into panels, each with h on it, its mass of the weight, and what it adds to the
 * remainder. Private to panels.c, majorant.c and sheaf.c. */
#ifndef TW_NUMERIC_SHEAF_H
#define TW_NUMERIC_SHEAF_H

#include "engine/numeric/panels.h"

enum { SUM_BITS = 64, PANELS_MOST = 4000, PASSES_MOST = 14 };

typedef struct panel {
    slong patch, left, right; /* joints */
    double z0, z1;
    arb_t h, mass;            /* all values of h; mass of the normalised weight */
    arb_t part;               /* holds the integral of h with the normalised weight */
    bool lines;               /* line, t, ell are known: see patch_affine */
    affine line, t, ell;
} panel;

typedef struct sheaf {
    problem *p;
    patches patches;
    weight w;
    slong joint_count, joint_room, panel_count, panel_room;
    joint *joints;
    panel *panels;
    slong lanes;
    mag_t crumb;   /* of |h| below the first joint, in units of the normalised weight */
    bool has_crumb;
    mag_t far;     /* absolute, without 1/m for the amplitude: already in it */
    arb_t t_far;
    bool fine;     /* patches with smaller errors of their own */
} sheaf;

void sheaf_init(sheaf *s, problem *p);
void sheaf_clear(sheaf *s);
/* Patches and first panels; *first skips coefficients that are 0. *made false: s->patches.reason says why. */
tw_status sheaf_make(sheaf *s, slong *first, expr *S_expr, const arb_t S, bool *made);
/* Splits every panel whose loss is above 0.3 of the mean; losses has panel_count entries. */
void sheaf_split_losers(sheaf *s, const double *losses);
/* Splits until the radius of the sum of the parts, in units of the normalised weight, is below goal times its middle, or as far as
 * that can be had; false when the budget is spent. */
bool sheaf_refine(sheaf *s, arb_t sum, double goal);
void sheaf_report(const sheaf *s, panel_report *r);
/* x * Gamma(alpha) S^-alpha, and x / m */
void sheaf_denormalise(arb_t x, const sheaf *s);
void sheaf_over_m(arb_t x, const problem *p);
/* |x| as a double. */
double arb_size(const arb_t x);

#endif
