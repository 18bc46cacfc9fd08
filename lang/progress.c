/* A timer ticks while a statement runs. The tick writes the progress line and counts towards the guard: it may
 * only do what a signal handler may (write, _exit), so its words are prepared outside. It cannot be late, because it does
 * not need the engine's cooperation; that is the point, since a single call of a library may compute for hours. State is
 * static, because a signal handler has no argument: one statement runs at a time. */
#include "lang/progress.h"

#include <string.h>
#include <sys/time.h>
#include <unistd.h>

enum { WORDS_ROOM = 72, TICKS_A_SECOND = 4 };

static char words_now[2][WORDS_ROOM + 1];    /* what the engine does; the handler reads one while the other is filled */
static volatile sig_atomic_t words_shown;    /* which of the two */
static volatile sig_atomic_t ticks_gone;
static volatile sig_atomic_t ticks_allowed; /* 0: no guard */
static volatile sig_atomic_t line_wanted, line_drawn, json_wanted;

static void put(int fd, const char *bytes, size_t length)
{
    ssize_t put_bytes = write(fd, bytes, length);
    (void)put_bytes; /* nothing can be done about it here */
}

static void put_words(int fd, const char *words)
{
    put(fd, words, strlen(words));
}

static void wipe_line(void)
{
    if (line_drawn) put_words(STDERR_FILENO, "\r\033[K");
    line_drawn = 0;
}

static void draw_line(long seconds)
{
    char number[24];
    size_t at = sizeof number;
    do {
        number[--at] = (char)('0' + seconds % 10);
        seconds /= 10;
    } while (seconds > 0 && at > 0);
    put_words(STDERR_FILENO, "\r\033[K");
    put_words(STDERR_FILENO, words_now[words_shown]);
    put_words(STDERR_FILENO, " ... ");
    put(STDERR_FILENO, number + at, sizeof number - at);
    put_words(STDERR_FILENO, " s");
    line_drawn = 1;
}

static void tick(int signal_number)
{
    (void)signal_number;
    ticks_gone = ticks_gone + 1;
    if (ticks_allowed && ticks_gone >= ticks_allowed) {
        wipe_line();
        put_words(STDERR_FILENO, "termwise: error: a computation does not answer long after its time limit; giving up\n");
        if (json_wanted)
            put_words(STDOUT_FILENO, "{\"result\": \"error\", \"kind\": \"time\", \"message\": \"a computation does not answer "
                                     "long after its time limit; giving up\", \"file\": null, \"line\": null, \"column\": "
                                     "null}\n");
        _exit(1);
    }
    if (line_wanted && ticks_gone % TICKS_A_SECOND == 0) draw_line(ticks_gone / TICKS_A_SECOND);
}

static void set_words(const char *words)
{
    int other = !words_shown;
    size_t length = strlen(words);
    if (length > WORDS_ROOM) length = WORDS_ROOM;
    memcpy(words_now[other], words, length);
    words_now[other][length] = '\0';
    words_shown = other;
}

static void engine_speaks(void *host, const char *words)
{
    (void)host;
    if (words) set_words(words);
}

static void set_timer(bool on)
{
    struct itimerval every = {{0, on ? 1000000 / TICKS_A_SECOND : 0}, {0, on ? 1000000 / TICKS_A_SECOND : 0}};
    setitimer(ITIMER_REAL, &every, NULL);
}

void progress_start(tw_engine *e, const char *words, bool show, double limit, bool patient, bool json)
{
    set_words(words);
    ticks_gone = 0;
    line_wanted = show && isatty(STDERR_FILENO);
    json_wanted = json;
    double allowed = patient ? 2 * limit + 20 : 1.1 * limit + 0.9;
    ticks_allowed = limit > 0 && limit < 1e8 ? (sig_atomic_t)(TICKS_A_SECOND * allowed) : 0;
    if (!line_wanted && !ticks_allowed) return;
    e->progress = engine_speaks;
    struct sigaction action;
    memset(&action, 0, sizeof action);
    action.sa_handler = tick;
    action.sa_flags = SA_RESTART;
    sigemptyset(&action.sa_mask);
    sigaction(SIGALRM, &action, NULL);
    set_timer(true);
}

void progress_end(tw_engine *e)
{
    if (line_wanted || ticks_allowed) set_timer(false);
    wipe_line();
    line_wanted = 0;
    ticks_allowed = 0;
    e->progress = NULL;
}
