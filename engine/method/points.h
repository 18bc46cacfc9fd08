/* The path cut into pieces on which the phase is monotone. Private to this room. */
#ifndef TW_METHOD_POINTS_H
#define TW_METHOD_POINTS_H

#include "engine/method/method.h"

/* A place where the path is cut: an end, a zero of the phase's slope, a singularity of the phase, a kink. */
typedef struct joint_place {
    expr *place;     /* inf, -inf at open ends */
    expr *level;     /* the phase there, as its limit from the pieces beside it; inf, -inf; NULL: not needed yet */
    bool stationary; /* the slope vanishes there from both sides */
    bool turning;    /* found as a zero of the slope (or a singularity of it) */
} joint_place;

/* Between joints k and k + 1. */
typedef struct path_piece {
    expr *phase, *amplitude; /* smooth inside: abs, min, max, piecewise resolved */
    int slope;               /* the sign of the phase's derivative inside: 1, -1, 0 (constant) */
} path_piece;

typedef struct path_cut {
    size_t count; /* of pieces; joints: count + 1 */
    joint_place *joints;
    path_piece *pieces;
} path_cut;

void path_cut_init(path_cut *c);
void path_cut_clear(path_cut *c);

/* Cuts (from, to), ends possibly infinite, at everything that matters; proved complete. Conditions that rest on
 * parameters are appended. ERROR_UNDECIDED, ERROR_UNSUITABLE with the reason. */
tw_status path_cut_make(tw_engine *e, path_cut *out, expr *phase, expr *amplitude, expr *x, expr *from, expr *to,
                        condition_list *conditions);

/* The zeros of f in the open range, ascending, into a fresh array (free() it): all of them, proved. f is smooth there
 * but for its own singularities. */
tw_status zeros_between(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***zeros, size_t *count);

/* -1, 0, 1 as a < b, a = b, a > b; 2: not known. Infinite ones too. */
int places_compare(tw_engine *e, expr *a, expr *b);

#endif
