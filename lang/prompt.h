/* The prompt at a terminal. */
#ifndef TW_LANG_PROMPT_H
#define TW_LANG_PROMPT_H

#include "lang/run.h"

/* Reads statements from the terminal and runs them until `quit` or the end of input (Ctrl-D). */
void run_prompt(run *r);

#endif
