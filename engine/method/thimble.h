/* Which saddles a path of integration runs over, and how often: certified. Private to this room.
 *
 * A spot with p - p0 ~ lead*w^m (m = 1 at an end of the path) has m descending half branches D_k, in the directions
 * direction*exp(2*pi*i*k/m), and between D_k and D_(k+1) the ascending one A_k. The path is homologous to sum n_k D_k over all spots:
 * each crossing of A_k from right to left moves it from D_k to D_(k+1). */
#ifndef TW_METHOD_THIMBLE_H
#define TW_METHOD_THIMBLE_H

#include "engine/method/landscape.h"

/* A path of straight legs. Finite vertices; the first leg may come from infinity, the last go there. */
typedef struct route {
    size_t count;
    acb_ptr at;
    bool infinite[2];
    acb_t toward[2];  /* unit vectors of the directions at infinity, seen from the finite vertex */
    expr *places[2];  /* finite ends; NULL at infinity */
    bool valley[2];   /* the finite end is a pole of p, met from a valley */
} route;

void route_init(route *r, size_t count);
void route_clear(route *r);

/* One spot's integers. */
typedef struct share {
    const spot *at;
    slong halves;         /* m; for a pole of the amplitude 1: n[0] is the number of turns round it, counterclockwise */
    bool residue;
    slong *n, *other;     /* turned a little one way and the other; equal unless `stokes` */
    bool stokes;
} share;

typedef struct shares {
    size_t count;
    share *list;
    acb_struct *directions; /* of D_0 of each */
    slong discs;            /* followed in all */
    bool turned;            /* heights met, so that both turns were followed */
    double turn;            /* the angle then */
} shares;

void shares_clear(shares *s);

/* r: the path; ends[k]: the spot of a finite end that is no pole (else NULL); poles: of the amplitude, off the saddles. *found false:
 * `why` (fresh words) says what stood in the way. Errors: budget. */
tw_status thimbles_find(tw_engine *e, shares *out, landscape *l, const route *r, const spot *const ends[2], const spot *poles,
                        size_t pole_count, bool *found, char **why);

/* ---- thimble_trace.c ---- */

/* A curve along which turned p falls (ascending: the integrand grows), as a chain of points each in the disc of the one before. */
typedef struct chain {
    slong count, room;
    acb_ptr at;
} chain;
void chain_init(chain *c);
void chain_clear(chain *c);

/* A disc |z - c| <= r in which p is univalent, or own's root (p - p0)^(1/m) where `own` (a saddle; c its place) is given: there
 * |p'/p'(c) - 1| <= kappa < 1 (for the root v = ((p - p0)/lead)^(1/m): |v' - 1| <= kappa), so that the image covers the disc of
 * radius `reach` = (1 - kappa) r about the image of c, in units of p'(c). False: none was found. */
bool univalent_disc(arb_t r, arb_t kappa, arb_t reach, const landscape *l, const acb_t c, const spot *own);

/* lead^(-1/m) along D_0. */
void half_root(acb_t out, const spot *s, slong m, slong bits);

/* Follows from spot s the curve p = p(s) + sign*t*turn, t > 0, in the half branch whose first direction is `direction`, until
 * Re(p/turn) has changed by `span`; keeping away from `avoid` points (not counting s itself). first: greatest first distance from s.
 * False when the chain does not get there (a saddle on the way). */
bool chain_follow(chain *c, landscape *l, const spot *s, int sign, const acb_t turn, const acb_t direction, const arb_t span,
                  acb_srcptr avoid, size_t avoid_count, const mag_t first);

#endif
