/* Reading an integral with an oscillating kernel. */
#ifndef TW_METHOD_PHASE_H
#define TW_METHOD_PHASE_H

#include "engine/method/method.h"

typedef enum phase_kernel { PHASE_COS, PHASE_SIN, PHASE_EXP } phase_kernel;

/* A kernel with its amplitude: q cos(scale p), q sin(scale p) or q exp(i scale p). */
typedef struct phase_part {
    phase_kernel kernel;
    expr *q;
} phase_part;

enum { PHASE_POINTS = 40 };

/* Exactly: integral = outside * sum over parts of int_from^to q K(scale p) dx, scale = large^power; p is real and
 * monotone between neighbours of the list of points, which holds the finite ends and every stationary point inside. */
typedef struct phase_reading {
    expr *integral, *large, *variable; /* variable: the name as typed */
    bool small;
    fmpq_t power;
    expr *outside, *x, *from, *to, *p;
    phase_part parts[2];
    size_t part_count;
    expr *points[PHASE_POINTS]; /* by growing place */
    bool stationary[PHASE_POINTS];
    size_t point_count;
    int signs[PHASE_POINTS + 1]; /* of p' before points[0], between, and behind the last; 0: no such interval */
    condition_list conditions;
} phase_reading;

void phase_reading_init(phase_reading *r);
void phase_reading_clear(phase_reading *r);

/* YES: read. NO: no oscillating kernel, or not one of these forms; *why (fresh words) says what is in the way where the
 * kernel does oscillate, and is NULL where it does not. Errors: those of the budget. */
answer phase_read(tw_engine *e, phase_reading *out, expr *integral, char **why);

/* "; the kernel oscillates; critical points: the end x = 0, x = 1 (stationary)"; false: not an integral of this kind,
 * nothing is added. */
bool phase_summary(tw_engine *e, text *out, expr *integral);

/* The terms of every end and stationary point, into an expansion that has its integral set. */
tw_status phase_expand(tw_engine *e, expansion *out, const phase_reading *r, slong terms);

#endif
