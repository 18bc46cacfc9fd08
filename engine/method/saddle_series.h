/* Exact coefficients at a saddle or an end, in the number field of the place. Private to this room. */
#ifndef TW_METHOD_SADDLE_SERIES_H
#define TW_METHOD_SADDLE_SERIES_H

#include "engine/exact/field_series.h"
#include "engine/method/landscape.h"

/* q = factor * top/bottom * exp(growth); exact where the parts are over Q(i). */
typedef struct amplitude {
    expr *whole;          /* q(z) */
    bool exact;           /* the parts below hold */
    expr *factor;         /* free of z */
    gauss_poly top, bottom, growth; /* growth without constant term */
} amplitude;

/* Reads q(z). The fields top, bottom, growth are set where `exact`. */
void amplitude_read(amplitude *a, tw_engine *e, expr *q, expr *z);
void amplitude_clear(amplitude *a);

/* What a spot's field gives. */
typedef struct saddle_field {
    tw_engine *e;
    const landscape *l;
    const spot *s;
    number_field k;
    fmpz_t lead;          /* theta = lead * place */
    bool i_inside;
    fmpq_poly_t i_value;  /* i as a polynomial in theta */
} saddle_field;

/* False where the field is not made (budget, or the place is no root of a polynomial of small degree). */
bool saddle_field_init(saddle_field *f, tw_engine *e, const landscape *l, const spot *s);
void saddle_field_clear(saddle_field *f);

/* p(z0) and the leading coefficient of p - p(z0), as expressions in the place. */
bool saddle_height(saddle_field *f, expr **height, expr **lead);

/* With z(v) the branch on which p - p(z0) = lead v^m, q dz/dv = front * sum over N of g_N v^(N-1): c[N-1] = g_N/m * lead^-j * (r/m)_j,
 * N = r + m j, 1 <= r <= m, for N <= count, into c (expressions). front: an expression free of N. */
tw_status saddle_coefficients(saddle_field *f, const amplitude *q, slong count, expr **c, expr **front);

#endif
