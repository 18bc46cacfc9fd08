/* Rules and passes within a session. Inside lang only. */
#ifndef TW_LANG_RULES_H
#define TW_LANG_RULES_H

#include "lang/session.h"

/* The pass that x means now; to be released. NULL with the error and its place set. */
pass *session_pass(session *s, const syntax_pass *x);

/* Checks a rule unless it was checked, or again. The verdict is the rule's; TW_ERROR only when time or patience is out. */
tw_status session_check_rule(session *s, rule *r, bool again);

/* Checks the rules of a pass that were not checked yet; ERROR_REFUTED when one is refuted. */
tw_status session_check_pass(session *s, const pass *p);

/* The path of the file that `use "FILE"` means; into a fresh string. */
char *find_user_file(session *s, const char *file);
/* Runs a file; unless `again`, one that was used already is passed over. */
tw_status run_used_file(session *s, const char *path, bool again);

/* What `show NAME` says of a file that was used, or of one of the standard library: its rules and definitions. False:
 * there is none. */
bool show_file(session *s, result *r, const char *name);

/* A built-in method as a pass, or a built-in step. False: no such name. */
bool show_method(session *s, result *r, const char *name);

/* A rule or a pass in full, for `show`. */
void show_rule_value(session *s, result *r, const char *name, const value *v);

#endif
