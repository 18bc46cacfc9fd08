/* From the syntax of a rule to its expressions. */
#ifndef TW_LANG_LOWER_RULE_H
#define TW_LANG_LOWER_RULE_H

#include "engine/rewrite/rule.h"
#include "lang/lower.h"

/* The rule that the statement (STATEMENT_RULE) defines, with its text. NULL with the engine's error set and l->place.
 * Its variables are symbols of its own; those declared complex by its conditions are complex in its pattern. Facts are
 * put back. */
rule *lower_rule(lowering *l, const statement *st);

#endif
