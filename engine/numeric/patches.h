/* h = (F - kept terms)/T^first as polynomials on patches of the path, with errors: near 0 from the coefficients, away from it from
 * discs. Private. */
#ifndef TW_NUMERIC_PATCHS_H
#define TW_NUMERIC_PATCHS_H

#include "engine/numeric/affine.h"
#include "engine/numeric/problem.h"

/* h = sum over k of (poly_k(z) + error_k) * ell^k for the coordinate centre + width * z, z in [-1, 1]; the coordinate is T when
 * `near`, else y. Every coefficient list has `length` entries. t_left and t_right are where the patch's part of the path starts and
 * ends: exact reals known as balls, the same ball on both sides of a joint. */
typedef struct patch {
    bool near;
    arf_t centre, width;
    slong lanes, length;
    arb_ptr poly;
    mag_t error[PROBLEM_LOGS];
    arb_t t_left, t_right;
    bool ended; /* all sheets have ended */
} patch;

typedef struct patches {
    slong count, room;
    patch *list;
    slong first;     /* index of the first omitted nonzero coefficient */
    bool fine;       /* with errors far below what a panel loses by its width */
    double rho;      /* of the contour, for the record */
    slong discs;
    const char *reason; /* why the patches could not be made, in words; NULL: made */
} patches;

void patches_init(patches *s);
void patches_clear(patches *s);

/* Adds an empty patch and returns it. */
patch *patches_add(patches *s, slong lanes, slong length);

/* Patches from 0 to the coordinate y_far. False: s->reason says why. */
bool patches_build(patches *s, problem *p, slong first, double y_far);

/* From 0 up to about 0.8 of the contour; *T_near is where they end. */
bool near_build(patches *s, problem *p, double T_needed, double *T_near);
/* From there to y_far. */
bool discs_build(patches *s, problem *p, double T_near, double y_far);

/* h, t and (with logarithms) ell as functions of d = z - (z0 + z1)/2 on z0 <= z <= z1; false: one of them bends without bound. */
bool patch_affine(affine *h, affine *t, affine *ell, const problem *p, const patch *s, double z0, double z1);
/* h over z0 <= z <= z1 as a ball. */
void patch_range(arb_t h, const problem *p, const patch *s, double z0, double z1);
/* Upper bound of the factor of ell^k over z0 <= z <= z1. */
void patch_lane_bound(mag_t bound, const patch *s, slong k, double z0, double z1);
/* t at z; the ends are t_left and t_right. */
void patch_t(arb_t t, const problem *p, const patch *s, double z);

/* Taylor coefficients, `length` of them, of sum f[n] x^n (n < count) at x = c. */
void kept_taylor(arb_ptr out, slong length, arb_srcptr f, slong count, const arb_t c, slong bits);

#endif
