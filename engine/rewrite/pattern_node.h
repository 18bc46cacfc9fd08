/* Inside the rewriting room: a compiled pattern, what it shares with the matcher and the index. */
#ifndef TW_REWRITE_PATTERN_NODE_H
#define TW_REWRITE_PATTERN_NODE_H

#include "engine/rewrite/pattern.h"

typedef enum part_kind {
    PART_FIXED,    /* no variables: the same expression */
    PART_VARIABLE, /* v */
    PART_ROOTED,   /* v^q with a number q, as a factor: stands for a group of factors like v */
    PART_FUNCTION, /* f(x, y) with different bound variables: binds f */
    PART_CHECKED,  /* f(0): f is bound elsewhere, this must fit */
    PART_SUM, PART_PRODUCT,
    PART_POWER,    /* base and exponent, the exponent with variables or the base with variables */
    PART_BINDER,   /* integral, contour, sum, root: parts[] as the node's children, the body opened */
    PART_OTHER     /* any other kind: children in order */
} part_kind;

/* One node of a pattern. */
typedef struct part {
    part_kind kind;
    expr *form;            /* with the bound variables above it opened */
    uint32_t level;        /* how many binders of the pattern are above it */
    uint64_t variables;    /* a bit for each pattern variable within */
    size_t variable;       /* VARIABLE, ROOTED, FUNCTION, CHECKED: which one */
    bool may_vanish;       /* a power whose exponent may be 0: as a factor it may be absent */
    bool free_number;      /* SUM, PRODUCT: may its variables take any number? see pattern.h */
    bool exponent;         /* SUM, PRODUCT: is it an exponent? */
    bool alone;            /* SUM, PRODUCT: all its parts are variables */
    size_t count;          /* of parts; SUM, PRODUCT: fixed and composite ones first, then the `takers` */
    size_t takers;         /* SUM, PRODUCT: how many of the last parts are VARIABLE, ROOTED or FUNCTION */
    struct part **parts;
    fmpq_t number;         /* SUM: its number term; PRODUCT: its coefficient; ROOTED: q */
    expr *opened;          /* BINDER: the symbol of its variable */
} part;

struct pattern {
    tw_engine *e;
    char *name;
    expr *form;
    size_t count;
    pattern_variable *variables;
    expr ***parameters;    /* of functions: count symbols each; NULL for plain variables */
    part *root;
    arena memory;          /* of the parts */
    part **numbered;       /* all parts, so that their numbers can be cleared */
    size_t numbered_count, numbered_room;
    bool with_functions;
};

/* The parts of a sum or product that a pattern may take some of. */
typedef struct view {
    bool product;
    size_t count;
    expr *const *items;  /* sorted, without the number */
    expr **left;         /* what is left of each: itself, a lower power of it, NULL when it is taken */
    expr *number;        /* the coefficient or number term that is left */
    expr *whole;         /* the sum or product itself */
    bool exponent;       /* it is an exponent */
    struct candidates *candidates; /* for each part of the pattern where it may stand; NULL: not prepared */
} view;

/* Which items a part may match; dead ones are passed over from the front. */
typedef struct candidates {
    size_t count, start;
    uint32_t *list;
} candidates;

/* A view of the subject in scratch memory of the caller's mark. */
void view_init(tw_engine *e, view *v, expr *subject, bool product);
/* The sum or product of what is left. */
expr *view_left(tw_engine *e, const view *v);
/* Prepares candidates for a pattern whose root is a sum or product; for views that are matched many times. */
void view_prepare(tw_engine *e, view *v, const pattern *p);

/* A change of a view in a match. */
typedef struct taken {
    size_t index;
    expr *left;
} taken;

/* As pattern_match with the rest of a view that is kept from match to match. */
tw_status pattern_match_view(tw_engine *e, const pattern *p, view *v, match_visitor *visit, void *host, bool *found);
/* How far matching came where it failed: the part of the pattern that fitted nothing, and where it was tried. */
typedef struct nearest {
    long depth;          /* parts that did fit; 0: none */
    expr *part, *place;
} nearest;
/* Matches as pattern_match with a rest, and keeps the failure that came furthest in *out, if it came further. */
tw_status pattern_nearest(tw_engine *e, const pattern *p, expr *subject, nearest *out);

/* In a visitor: the changes of the kept view, as many as returned; *number is what is left of its number. */
size_t match_taken(const match *m, const taken **list, expr **number);

/* What matching keeps in an engine: the symbols that stand for bound variables by level, and opened bodies. */
struct matching;
void matching_free(struct matching *m);
/* The symbol for the variable of a binder that has `level` binders above it. The same for all patterns and subjects. */
expr *matching_symbol(tw_engine *e, uint32_t level);
/* The body of a binder with that symbol as its variable; remembered. NULL with the error set. */
expr *matching_open(tw_engine *e, expr *binder, uint32_t level);

#endif
