/* Private to engine/ball: the tape's operations, shared by the compiler (tape.c) and the runs on balls and on power
 * series (run.c). */
#ifndef TW_BALL_OPS_H
#define TW_BALL_OPS_H

#include "engine/ball/tape.h"

typedef enum op_kind {
    OP_NUMBER,    /* exact rational */
    OP_PI,
    OP_I,
    OP_EULER,
    OP_FIXED,     /* an expensive constant: kept at the precision last asked */
    OP_VARIABLE,
    OP_SUM,
    OP_PRODUCT,
    OP_POWER_RATIONAL,
    OP_POWER,
    OP_CALL,
    OP_LOG1P,     /* log(1 + u): the operand is u */
    /* differences that would cancel: exp(u) - 1, cos(u) - 1, cosh(u) - 1, (1 + u)^r - 1 */
    OP_EXPM1,
    OP_COSM1,
    OP_COSHM1,
    OP_POWM1,
    OP_PIECEWISE,
    OP_UNKNOWN    /* no value on balls: inf, a direction */
} op_kind;

typedef struct op {
    op_kind kind;
    bool real;              /* OP_VARIABLE: takes real values */
    bool constant;          /* depends on no variable */
    function_id function;
    size_t first, count;    /* operands: t->operands[first ...] */
    size_t index;           /* variable */
    expr *node;             /* number, exponent, fixed constant, piecewise */
    slong kept_prec;
    acb_t kept;
} op;

struct tape {
    tw_engine *e;
    size_t count, room;
    op *ops;
    size_t operand_count, operand_room;
    size_t *operands;
    expr *const *vars;      /* only while compiling */
    size_t var_count;
    acb_ptr values;
    /* Beside each value: for real values of the variables inside their balls, is it real? Then abs, sign, min, ... of
     * it have a holomorphic continuation off the real line, which is what they mean there. */
    bool *real;
    bool off_line;          /* some real variable's ball is not real in this run */
    slong constants_prec;   /* the constants' values stand at this precision; 0: not yet computed */
    acb_poly_struct *jets;  /* made at the first jet */
    expr **seen;            /* node -> op + 1, open addressing, only while compiling */
    size_t *seen_at, seen_room, seen_count;
};

#endif
