/* Inside the ball room: growth records of special functions, rows of the table in growth_functions.c. args holds the
 * arguments' records in order; false where no record is found. Sources stand at each. */
#ifndef TW_BALL_GROWTH_SPECIAL_H
#define TW_BALL_GROWTH_SPECIAL_H

#include "engine/ball/growth_record.h"

typedef bool growth_rule(growth_record *out, const growth_record *args, const growth_place *p);

growth_rule growth_e1, growth_ei, growth_gamma, growth_gamma_upper, growth_lngamma, growth_psi, growth_ai, growth_bi,
    growth_bessel_j, growth_bessel_y, growth_bessel_i, growth_bessel_k;

#endif
