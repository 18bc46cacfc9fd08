/* The remainder of an expansion that carries it as exact integrals: one read off a derivation by hand. Private to
 * engine/numeric. */
#ifndef TW_NUMERIC_SPLIT_OFF_H
#define TW_NUMERIC_SPLIT_OFF_H

#include "engine/numeric/bound.h"

/* error = the integral less its first `terms` terms at the point: the remainder integrals by certified quadrature, and the
 * terms that are not kept. Label PROVED, or ESTIMATED with the reason where quadrature fails. */
tw_status split_off_at(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms, slong bits);

/* A bound for all values of the large parameter from some on: each remainder integral is expanded itself and its whole is
 * bounded as a remainder after no terms; the terms not kept are added. UNKNOWN with the reason where that fails. */
tw_status split_off_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *at, expr *s0);

#endif
