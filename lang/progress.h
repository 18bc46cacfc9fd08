/* What goes on beside a running statement: a line on the terminal that says what long work is doing, and the last guard
 * against a library call that no longer answers. */
#ifndef TW_LANG_PROGRESS_H
#define TW_LANG_PROGRESS_H

#include <stdbool.h>

#include "engine/base/engine.h"

/* Called as a statement starts. words: what it does ("expanding F"). show: write to standard error when it takes longer than
 * a second. limit: seconds after which the statement should have ended by itself (0: none); much later than that the program
 * ends with exit status 1. json: say so on standard output, too. */
void progress_start(tw_engine *e, const char *words, bool show, double limit, bool patient, bool json);

/* Called when it has ended: wipes the line, disarms the guard. */
void progress_end(tw_engine *e);

#endif
