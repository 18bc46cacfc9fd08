/* Numbers from expansions whose terms are complex: those of steepest descent. Private to engine/numeric. */
#ifndef TW_NUMERIC_COMPLEX_H
#define TW_NUMERIC_COMPLEX_H

#include "engine/numeric/evaluate.h"

/* Is it one that these functions take? */
bool expansion_is_complex(const expansion *a);
tw_status evaluate_complex(tw_engine *e, number *out, expansion *a, const env *at, const evaluate_options *o);
tw_status compare_complex(tw_engine *e, comparison *out, expansion *a, const env *at);
/* After the conditions were taken over; out->terms may be negative. */
tw_status remainder_complex(tw_engine *e, remainder_bound *out, expansion *a, const env *values, expr *s0);

#endif
