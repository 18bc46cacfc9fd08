/* Inside the quadrature: a piece is an integral over 0 < y < length (or y > 0) of an expression that may be singular at
 * the end 0 and, where the range is infinite, decays; it is regular at a finite upper end and has no kink inside. */
#ifndef TW_BALL_QUADRATURE_PIECE_H
#define TW_BALL_QUADRATURE_PIECE_H

#include "engine/ball/growth.h"
#include "engine/ball/quadrature.h"

/* ---- variables (quadrature_map.c) ---- */

typedef enum quad_map {
    QUAD_PLAIN,   /* y = t */
    QUAD_POWER,   /* y = t^k */
    QUAD_INVERSE, /* y = t^-k: the end at infinity becomes 0 */
    QUAD_EXP,     /* y = e^t */
} quad_map;

/* f(y) dy/dt (its modulus) as an expression in t, for y > 0. For POWER and INVERSE *k receives the exponent that makes
 * powers of t whole. NULL with the error set, or without one where the form does not allow it. */
expr *quad_map_integrand(tw_engine *e, expr *f, expr *y, expr *t, quad_map map, ulong *k);
/* F = Q exp(L): exponentials and high powers gathered in L; L is NULL where there is nothing to gain (L absent or
 * linear). */
void quad_split(tw_engine *e, expr *F, expr *t, expr **Q, expr **L);

/* ---- where the mass lies (quadrature_scan.c) ---- */

typedef struct quad_sample {
    arf_t y;
    double log2_y, log2_f; /* log2_f: -1e300 for 0; NaN where the value is not finite */
} quad_sample;

typedef struct quad_peak {
    arf_t y;
    double log2_y, log2_f;
    double log2_below, log2_above; /* distances at which |f| has fallen by e; broad peaks: about log2_y */
} quad_peak;

enum { QUAD_PEAK_LIMIT = 24 };

typedef struct quad_scan {
    quad_sample *samples; /* by growing y */
    size_t count, room;
    quad_peak peaks[QUAD_PEAK_LIMIT];
    size_t peak_count;
    double log2_mass;     /* a guess of log2 of the integral of |f| */
    double log2_best;     /* log2 of the y with the greatest y |f(y)| */
    slong prec;           /* at which values at the peak are sharp */
    slong lost;           /* bits lost there by cancellation */
} quad_scan;

void quad_scan_init(quad_scan *s);
void quad_scan_clear(quad_scan *s);
/* length NULL: infinite. false when the budget is spent or no sample is finite. */
bool quad_scan_run(quad_scan *s, tw_engine *e, tape *values, const arb_struct *length);
double quad_log2_value(tape *values, const arf_t y, slong prec);

/* ---- one piece (quadrature_piece.c) ---- */

typedef struct quad_part {
    quad_map map;
    ulong k;
    expr *t, *F;
    tape *plain, *Q, *L;
} quad_part;

typedef struct quad_piece {
    tw_engine *e;
    expr *typed, *f, *y, *length; /* f: the normal form of the integrand as typed; length NULL: infinite */
    const char *from, *to; /* words for the ends */
    tape *values;
    growth_program *records; /* of f towards infinity or, inverted, 0 */
    arb_t extent;          /* the length as a ball */
    quad_scan scan;
    quad_part parts[2];
    size_t part_count;
    arf_t join;            /* two parts: where they meet */
    bool cut_low, cut_high; /* that end is cut off and bounded */
    bool oscillates;
    slong evaluations;
} quad_piece;

/* Is f regular (analytic on a small disc) at y = 0? scale: log2 of a typical y. */
bool quad_is_regular(tape *values, double log2_scale);

/* Prepares; from, to name the ends in errors. Errors: DIVERGENT, UNDECIDED, UNSUITABLE, TIME, ... The piece can be
 * cleared in any case. */
tw_status quad_piece_init(quad_piece *p, tw_engine *e, expr *f, expr *y, expr *length, const char *from,
        const char *to);
void quad_piece_clear(quad_piece *p);
/* value = the integral, error aimed at 2^tolerance in absolute terms; a ball in any case when TW_OK. goal: relative
 * bits. */
tw_status quad_piece_integrate(quad_piece *p, acb_t value, slong tolerance, slong goal, slong prec);

#endif
