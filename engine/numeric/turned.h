/* Remainders of oscillating integrals. Private to engine/numeric. */
#ifndef TW_NUMERIC_TURNED_H
#define TW_NUMERIC_TURNED_H

#include "engine/numeric/bound.h"

/* Was the expansion made by stationary phase? Its contributions have no local form on the real line. */
bool is_turned(const expansion *a);

/* error = the integral less its first `terms` terms at the point, enclosed by certified quadrature along proved paths.
 * Label PROVED; ESTIMATED with an error that is not finite and the reason where quadrature fails. */
tw_status turned_at(tw_engine *e, point_bound *out, expansion *a, const env *at, slong terms);

/* Complex terms (the kernel was exp(i ...)): value = the first `terms` terms and the remainder, enclosed as above. */
bool turned_is_complex(const expansion *a);
tw_status turned_value(tw_engine *e, acb_t value, expansion *a, const env *at, slong terms, slong bits);

/* A bound for all values of the large parameter, where only ends count and the amplitude is smooth there: the next
 * terms and the total variation behind them (DLMF 2.3(i), the text before 2.3.6). *made false: *reason, fresh words,
 * says why. */
tw_status turned_for_all(tw_engine *e, remainder_bound *out, expansion *a, const env *values, bool *made,
                         char **reason);

#endif
