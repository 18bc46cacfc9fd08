/* What is known half way through reading an integral. Shared by read.c and wells.c only. */
#ifndef TW_METHOD_FRAME_H
#define TW_METHOD_FRAME_H

#include "engine/method/place.h"
#include "engine/method/scale.h"

typedef struct frame {
    tw_engine *e;
    reading *r;
    expr *binder;         /* the EXPR_INTEGRAL */
    expr *x, *from, *to;  /* opened; x a fresh symbol */
    expr *body, *outside; /* integral = outside * int body dx */
    bool mirrored;
    expr *
        logarithm; /* u with u = log of a linear function of the variable before it, `unwound` that variable; or NULL */
    expr *unwound;
    separation s;
    place p;
} frame;

/* Appends a step that leads to `after`; the detail is in words. */
step *frame_record(frame *f, const char *rule, const char *source, expr *after, const char *format, ...)
    __attribute__((format(printf, 5, 6)));

/* The original variable at t. */
expr *frame_place(const frame *f, expr *t);

/* wells.c: all points of the path that count, the branches that belong to them, and the rest. */
tw_status frame_find_wells(frame *f);

#endif
