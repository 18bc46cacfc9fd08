/* Inside the quadrature: integrals over a real range whose integrand oscillates, taken along paths in the complex
 * plane. Each step from the range to a path is proved (quadrature_region.c) or not taken. */
#ifndef TW_BALL_QUADRATURE_OSCILLATING_H
#define TW_BALL_QUADRATURE_OSCILLATING_H

#include "engine/ball/tape.h"

/* ---- what a turned integral is made of ---- */

/* factor times the integral of f over 0 < y < length (NULL: infinite), its real part only where `real`; or, where
 * from and to are set, factor times the integral of f in y over (from, to) along the real line. */
typedef struct quad_leg {
    expr *f, *y, *length, *from, *to;
    slong factor;
    bool real;
} quad_leg;

typedef struct quad_legs {
    quad_leg *list;
    size_t count, room;
} quad_legs;

void quad_legs_add(quad_legs *legs, quad_leg leg);
void quad_legs_free(quad_legs *legs);

typedef enum quad_turned {
    QUAD_NO_NEED,    /* it does not oscillate enough to be worth it */
    QUAD_TURNED,
    QUAD_NOT_TURNED, /* `why` says what stood in the way */
    QUAD_ENDLESS,    /* the same, and it oscillates without end along the real line */
} quad_turned;

/* The integral of f over (from, to), from < to, one end or both possibly infinite, no kink inside. QUAD_TURNED: legs
 * were found that are proved to add up to it. why has `room` bytes. Errors: only those of the budget and of
 * expressions. */
tw_status quad_turn(tw_engine *e, quad_legs *legs, expr *f, expr *x, expr *from, expr *to, quad_turned *turned,
                    char *why, size_t room);

/* ---- the waves of an expression (quadrature_waves.c) ---- */

typedef struct wave_range {
    tw_engine *e;
    expr *x, *from, *to;
    bool low, high; /* that end is finite */
} wave_range;

/* Q exp(L); L == NULL: no wave. */
typedef struct quad_term {
    expr *Q, *L;
} quad_term;

enum { QUAD_TERM_LIMIT = 32 };

typedef struct quad_terms {
    quad_term list[QUAD_TERM_LIMIT];
    size_t count;
} quad_terms;

/* Is f, is each factor of f, seen to be real for all x of the range? */
bool quad_is_real(const wave_range *r, expr *f);
bool quad_all_real(const wave_range *r, expr *f);
bool quad_holds_wave(expr *f, expr *x);
/* Has f only functions that are analytic where they are defined? */
bool quad_is_analytic(expr *f);
/* Appends f as a sum of waves. *fold: only the real part is wanted; one cosine or sine may then stand as one
 * exponential. false: too many. */
bool quad_collect(quad_terms *t, const wave_range *r, expr *f, bool *fold);
/* f with phases and exponents multiplied out, so that even integrands are seen to be even. */
expr *quad_tidy(tw_engine *e, expr *f, expr *x);
/* cosh and sinh of what holds x by exponentials. */
expr *quad_without_hyperbolic(tw_engine *e, expr *f, expr *x);
/* i p/q */
expr *quad_imaginary(tw_engine *e, slong p, slong q);

/* ---- one wave (quadrature_oscillating.c) ---- */

/* Q(z) exp(L(z)). */
typedef struct quad_wave {
    tw_engine *e;
    expr *z, *Q, *L, *slope; /* slope = L' */
    bool pure;               /* L/i is real for real z of the range */
    tape *values_Q, *values_L, *values_slope;
} quad_wave;

/* log2 |Q exp(L)| at a point; NaN where it is not finite. */
double quad_wave_height(const quad_wave *w, double x, double y);
/* L' there; false where it is not finite. */
bool quad_wave_slope(const quad_wave *w, double x, double y, double *re, double *im);

/* ---- paths (quadrature_path.c) and their proof (quadrature_region.c) ---- */

/* From the real point a to b (infinite: -INFINITY, INFINITY), through the half plane of `side` (1 upper, -1 lower):
 *   finite:    a, a + (slope_a + i side) height, b + (-slope_b + i side) height, b;
 *   half-line: a, then the ray of direction slope_a + i side (b infinite), or its mirror image (a infinite);
 *   line:      two rays from apex + i side height, of directions -slope_a + i side and slope_b + i side; `flat`: of
 *              directions -1 and 1. */
typedef struct quad_path {
    double a, b, height, slope_a, slope_b, apex;
    int side;
    bool flat;
    expr *A, *B; /* the finite ends exactly */
} quad_path;

typedef struct quad_loop {
    double left, right, low, high;
    slong winding; /* of new path minus old path */
} quad_loop;

enum { QUAD_LOOP_LIMIT = 64 };

typedef struct quad_loops {
    quad_loop list[QUAD_LOOP_LIMIT];
    size_t count;
} quad_loops;

typedef enum quad_verdict {
    QUAD_PROVED,    /* range = path - loops */
    QUAD_LOW,       /* the end a is not integrable, as far as seen */
    QUAD_HIGH,      /* the end b */
    QUAD_INFINITY,  /* the arc at infinity was not proved to vanish */
    QUAD_SINGULAR,  /* a singularity lies on the path or the range, or reaches both */
} quad_verdict;

/* Is the integral over [a, b] that over the path minus winding times the loops (counterclockwise)? */
quad_verdict quad_region_prove(const quad_wave *w, const quad_path *path, quad_loops *loops);
/* Is the wave analytic on the square of half width r about x + iy? */
bool quad_wave_analytic(const quad_wave *w, double x, double y, double r);

/* A proved path from a to b with its loops; QUAD_PROVED or the last obstacle. */
quad_verdict quad_path_find(const quad_wave *w, quad_path *path, quad_loops *loops);

#endif
