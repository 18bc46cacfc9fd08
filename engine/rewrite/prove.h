/* Identities that the engine proves by itself. */
#ifndef TW_REWRITE_PROVE_H
#define TW_REWRITE_PROVE_H

#include "engine/rewrite/rule.h"

/* Are both sides of the rule equal for all admissible values, by rational normal form and the defining equations of
 * the functions? false: not seen. Never fails; an exhausted budget shows in the engine's error. */
bool rule_prove(tw_engine *e, const rule *r);

#endif
