/* Ctrl-C. The handler only sets flags: the engine's, which its loops ask, and one of its own, because the engine forgets its
 * flag with every new allowance. Static, because a signal handler has no argument. System calls are not restarted, so a
 * read that waits for input ends, too. */
#include "lang/interrupt.h"

#include <string.h>
#include <unistd.h>

enum { PATIENCE = 3 };

static tw_engine *volatile engine_told;
static volatile sig_atomic_t seen;

static void on_interrupt(int signal_number)
{
    (void)signal_number;
    seen = seen + 1;
    if (engine_told) engine_told->interrupted = 1;
    if (seen >= PATIENCE) {
        static const char words[] = "\ntermwise: stopped\n";
        ssize_t put = write(STDERR_FILENO, words, sizeof words - 1);
        (void)put;
        _exit(130);
    }
}

static void set_handler(void (*handler)(int))
{
    struct sigaction action;
    memset(&action, 0, sizeof action);
    action.sa_handler = handler;
    sigemptyset(&action.sa_mask);
    sigaction(SIGINT, &action, NULL);
}

void interrupt_install(tw_engine *e)
{
    engine_told = e;
    seen = 0;
    set_handler(on_interrupt);
}

void interrupt_remove(void)
{
    set_handler(SIG_DFL);
    engine_told = NULL;
}

bool interrupt_seen(void)
{
    return seen > 0;
}

void interrupt_forget(void)
{
    seen = 0;
    if (engine_told) engine_told->interrupted = 0;
}
