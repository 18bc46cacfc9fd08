/* Verdicts on rules kept between runs, in a file of the user's cache directory. It may be deleted at any time; what is
 * not whole in it is passed over. */
#ifndef TW_LANG_VERDICTS_H
#define TW_LANG_VERDICTS_H

#include "lang/session.h"

void verdicts_free(struct verdicts *v); /* NULL: nothing */

/* Sets the rule's verdict from the cache: false when there is none for a rule of this content, checked by this version
 * of the program. */
bool verdict_recall(session *s, rule *r);
/* Keeps the verdict of a checked rule; without a cache directory it does nothing. */
void verdict_keep(session *s, const rule *r);

#endif
