/* Ctrl-C: the signal's way to the engine. */
#ifndef TW_LANG_INTERRUPT_H
#define TW_LANG_INTERRUPT_H

#include <stdbool.h>

#include "engine/base/engine.h"

/* From now on an interrupt reaches this engine. */
void interrupt_install(tw_engine *e);
/* Before the engine is freed. */
void interrupt_remove(void);

/* Has one come since the last interrupt_forget()? The third one in a row, unanswered, ends the program with status 130. */
bool interrupt_seen(void);
void interrupt_forget(void);

#endif
