/* Inside the room of derivations by hand: the move being made, and what the moves share. */
#ifndef TW_MANUAL_WORK_H
#define TW_MANUAL_WORK_H

#include "engine/manual/manual.h"

/* One integral opened: outside * int_from^to body d(x), x a fresh symbol. */
typedef struct piece {
    expr *outside, *x, *from, *to, *body;
    const char *name;
} piece;

/* The move being made. What it gives is collected in `next`; nothing of it is kept when it fails. */
typedef struct work {
    tw_engine *e;
    manual *m;
    const manual_move *move;
    manual_frame next;
    condition_list needs;
    bool proved;        /* by the move's own theorem, under `needs` */
    const char *source; /* of the theorem */
    text detail;        /* what was chosen, for the record */
    bool remainder;     /* integrals added now are remainders */
    expr *expected;     /* what the value after should be; NULL: the value before */
    bool loosely;       /* `expected` is so only nearly: a difference quotient */
} work;

void terms_add(manual_terms *t, expr *outside, expr *integral, const char *name);
void terms_clear_list(manual_terms *t);

/* Opens a term; false for a contour. */
bool piece_open(work *w, piece *p, const manual_term *t);
/* What the user wrote, with the variable's symbol replaced by the piece's own. */
expr *piece_read(work *w, const piece *p, expr *typed);

/* Adds to the form that is being made. A NULL argument: TW_ERROR, the error being set. */
tw_status work_add_plain(work *w, expr *a);
tw_status work_add_integral(work *w, const piece *p);
/* The term as it is. */
tw_status work_add_term(work *w, const manual_term *t);
/* Adds a plain expression or a sum in which integrals may stand as factors. */
tw_status work_add_any(work *w, expr *a, const char *name);

/* body/factor, in a form in which the factor has gone where it is one: rest * factor = body is proved when it is not the
 * plain quotient. */
expr *quotient_of(work *w, const piece *p, expr *factor);

/* A condition in words (open), and a relation that is decided: yes and no as conditions_require has it. */
void work_needs(work *w, condition_label label, const char *format, ...) __attribute__((format(printf, 3, 4)));
tw_status work_require(work *w, expr *relation);

/* One move on one integral: adds to the form what takes the integral's place. UNSUITABLE where it does not fit. */
typedef tw_status piece_move(work *w, const piece *p);
piece_move move_substitute, move_parts, move_split, move_rotate, move_expand, move_termwise, move_swap;
/* Moves on the whole form. */
typedef tw_status whole_move(work *w);
whole_move move_differentiate, move_integrate_back, move_rewrite;

/* ---- questions (limits.c) ---- */

/* The limit of f at the end `at` of x's range (from, to), approached from inside; at may be inf or -inf. *out is free of
 * x; it may be inf or -inf. UNSUITABLE when it is not found. */
tw_status limit_at(tw_engine *e, expr **out, expr *f, expr *x, expr *from, expr *to, bool upper);
/* f of one sign on all of (from, to): +1, -1; 0 not seen. */
int sign_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to);
/* Does the integral of |f| over (from, to) converge for all values of the parameters that the facts allow? NO: f is not
 * even integrable. UNKNOWN: not seen. */
answer converges_absolutely(tw_engine *e, expr *f, expr *x, expr *from, expr *to);
/* Is f continuous in the open range (from, to), for certain? */
bool is_smooth_inside(tw_engine *e, expr *f, expr *x, expr *from, expr *to);
/* Is the range within the positive axis? */
bool range_is_positive(tw_engine *e, expr *from);
/* An error that a question may pass over; a spent budget stays. */
bool forgive(tw_engine *e);

/* ---- identity (identity.c) ---- */

/* Is f = 0 for all values of its symbols? YES: proved. x: positive where it is not NULL. */
bool is_identically_zero(tw_engine *e, expr *f, expr *x);
/* Normal form for the form's texts: under the facts, with x positive when `positive`. */
expr *tidy(tw_engine *e, expr *f, expr *x, bool positive);

/* ---- antiderivatives (antiderivative.c) ---- */

/* F with F' = f in x, proved by differentiation; NULL without an error when none is found. positive: x > 0. */
expr *antiderivative(tw_engine *e, expr *f, expr *x, bool positive);
/* The integral of f over (from, to) in closed form: the table of kernels (Gamma integrals), or an antiderivative and its
 * limits; the conditions are added. NULL without an error when there is none. */
expr *definite_integral(work *w, expr *f, expr *x, expr *from, expr *to);

/* The same while another variable, `other`, runs over (low, high): the conditions must hold for all its values, none is
 * added. */
expr *inner_integral(work *w, expr *f, expr *x, expr *from, expr *to, expr *other, expr *low, expr *high);

/* t = psi(x) solved from x = phi(t): NULL without an error when it is not found. */
expr *solve_inverse(tw_engine *e, expr *phi, expr *t, expr *x);

/* ---- checking (verify.c) ---- */

/* Compares the value of `after` with that of `before` at sample values of their parameters by certified balls. Disjoint:
 * ERROR_REFUTED with the values. *tried: at so many samples balls were had for both. detail: words for the record. */
tw_status verify_by_balls(work *w, expr *before, expr *after, slong *tried);
void manual_values_free(struct manual_values *v); /* NULL: nothing */

#endif
