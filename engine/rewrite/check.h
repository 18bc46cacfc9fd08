/* The checking of rules: tried at random admissible values, both sides as certified balls. */
#ifndef TW_REWRITE_CHECK_H
#define TW_REWRITE_CHECK_H

#include "engine/rewrite/rule.h"

/* So many overlapping pairs, each of both relative radii below 1e-10, let a rule pass. */
enum { CHECK_PAIRS = 20 };

typedef struct check_report {
    size_t pairs;      /* that overlapped and count */
    size_t samples;    /* admissible ones that were tried */
    size_t without;    /* of these: where a side had no value or no ball */
    bool engine_proof; /* did the engine prove the identity? */
} check_report;

/* Checks the rule and sets its status, `checked` and finding. PROVED when the engine proves the identity of both sides
 * (prove.h) and no sample speaks against it; REFUTED by one disjoint pair, or by one side that is proved to diverge
 * where the other has a finite ball; PASSED; else UNCHECKED, the finding says why. The samples depend on the seed only.
 * seconds: about so long at most, 0: a default. TW_ERROR only when the budget is out, the host interrupted. */
tw_status rule_check(tw_engine *e, rule *r, uint64_t seed, double seconds, check_report *report /* may be NULL */);

#endif
