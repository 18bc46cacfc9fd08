/* The phase of a contour integral as a landscape: its saddles and poles, exactly. Private to this room. */
#ifndef TW_METHOD_LANDSCAPE_H
#define TW_METHOD_LANDSCAPE_H

#include "engine/ball/tape.h"

/* A polynomial over Q(i). */
typedef struct gauss_poly {
    fmpq_poly_t re, im;
} gauss_poly;

/* A zero or pole of p', or another point of interest (order 0: an end of the path). */
typedef struct spot {
    slong order;   /* of p': k > 0: a saddle, p - height ~ lead*(z - place)^(k+1); k < -1: a pole of p of order -k-1 */
    qqbar_t exact; /* the place */
    acb_t z, height, lead; /* height and lead: where p is finite */
    expr *place;   /* in the language: rational, radicals, or root of ... */
} spot;

typedef struct landscape {
    tw_engine *e;
    expr *p, *z;   /* the phase and its variable */
    gauss_poly numerator, denominator; /* p */
    gauss_poly slope;                  /* numerator of p': slope/denominator^2, perhaps not in lowest terms */
    size_t count;  /* saddles and poles */
    spot *spots;
    acb_t constant; /* p' = constant * prod (z - z_k)^order_k */
    acb_poly_t top, bottom, rise; /* numerator, denominator and slope as balls */
    slong at_infinity; /* p ~ z^at_infinity as z -> inf; 0 where p stays finite */
    slong bits;
} landscape;

/* Reads p, rational in z over Q(i). False without an error when p is not of that form (or of too high a degree); *made is then
 * cleared. Errors: budget. */
bool landscape_read(landscape *made, tw_engine *e, expr *p, expr *z);
void landscape_clear(landscape *l);
/* The balls to at least `bits` bits. */
void landscape_refine(landscape *l, slong bits);

/* A further spot of order 0 or the order of the saddle that lies there: an end of the path at `place`, an expression with an exact
 * value over Q(i). False when it has none or p has a pole there. */
bool landscape_point(landscape *l, spot *out, expr *place);
/* The same for an exact place and a known order of p' there. */
bool landscape_spot(landscape *l, spot *out, const qqbar_t place, slong order);
void spot_clear(spot *s);

/* p, p' at z. */
void landscape_value(acb_t out, const landscape *l, const acb_t z, slong bits);
void landscape_slope(acb_t out, const landscape *l, const acb_t z, slong bits);

/* The sign of Re(a - b) (part 0) or Im(a - b) (part 1) of two heights: +1, -1, 0 exactly equal; 2: not decided. */
int heights_compare(const landscape *l, const spot *a, const spot *b, int part);

/* An algebraic number as an expression: rational, radicals where these are short, else `root of`. */
expr *expr_from_algebraic(tw_engine *e, const qqbar_t x);

/* a = top/bottom over Q(i), both initialised then (and cleared by the caller) when true. */
bool gauss_fraction(tw_engine *e, expr *a, expr *z, gauss_poly *top, gauss_poly *bottom);

/* An expression without symbols in Q(i): true and its parts. */
bool gauss_number(tw_engine *e, expr *a, fmpq_t re, fmpq_t im);

#endif
