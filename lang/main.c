/* The program: reads the command line and runs what it names in one session. */
#include <errno.h>
#include <getopt.h>
#include <malloc.h>
#include <signal.h>
#include <stdio.h>
#include <stdio_ext.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <unistd.h>

#include "engine/base/flint.h"
#include "lang/prompt.h"
#include "lang/run.h"

static const char usage[] =
    "usage: termwise [OPTIONS] [FILE.tw ...]\n"
    "       termwise [OPTIONS] -e 'STATEMENT' ...\n"
    "Without files: the prompt at a terminal, else statements from standard input (also `-`).\n"
    "\n"
    "  -e STATEMENT          run a statement; may stand several times, and between files\n"
    "  --parse-only          read, report errors, do nothing\n"
    "  --results json        each result as one JSON object a line on standard output\n"
    "  --digits N            significant digits of printed numbers and of quadrature (default 10)\n"
    "  --quiet               no echo of declarations and definitions\n"
    "  --keep-going          go on after a failed statement\n"
    "  --time-limit SECONDS  allowance of each statement (default: none)\n"
    "  --memory-limit MIB    resident memory the program may use (default: none)\n"
    "  --version             print the version\n"
    "  --help                print this\n"
    "\n"
    "Exit status: 0 all done; 1 a statement failed; 2 wrong usage; 3 refuted; 130 interrupted.\n";

/* What to run, in the order of the command line. */
typedef struct job {
    bool is_statement;
    const char *words;
} job;

typedef struct command {
    run_options options;
    bool version, help;
    size_t count;
    job *jobs;
} command;

static bool misused(const char *format, const char *word)
{
    fputs("termwise: error: ", stderr);
    fprintf(stderr, format, word);
    fputs("; `termwise --help` lists the options\n", stderr);
    return false;
}

static bool read_number(const char *words, double least, double most, double *out)
{
    char *end;
    errno = 0;
    *out = strtod(words, &end);
    return end != words && *end == '\0' && errno == 0 && *out >= least && *out <= most;
}

enum { OPTION_PARSE = 256, OPTION_RESULTS, OPTION_DIGITS, OPTION_QUIET, OPTION_KEEP, OPTION_TIME, OPTION_MEMORY, OPTION_VERSION,
       OPTION_HELP };

static const struct option options[] = {
    {"parse-only", no_argument, NULL, OPTION_PARSE},
    {"results", required_argument, NULL, OPTION_RESULTS},
    {"digits", required_argument, NULL, OPTION_DIGITS},
    {"quiet", no_argument, NULL, OPTION_QUIET},
    {"keep-going", no_argument, NULL, OPTION_KEEP},
    {"time-limit", required_argument, NULL, OPTION_TIME},
    {"memory-limit", required_argument, NULL, OPTION_MEMORY},
    {"version", no_argument, NULL, OPTION_VERSION},
    {"help", no_argument, NULL, OPTION_HELP},
    {NULL, 0, NULL, 0},
};

static bool take_option(command *c, int option, const char *word)
{
    double x;
    switch (option) {
    case 1: c->jobs[c->count++] = (job){false, word}; return true;
    case 'e': c->jobs[c->count++] = (job){true, word}; return true;
    case OPTION_PARSE: c->options.parse_only = true; return true;
    case OPTION_QUIET: c->options.quiet = true; return true;
    case OPTION_KEEP: c->options.keep_going = true; return true;
    case OPTION_VERSION: c->version = true; return true;
    case OPTION_HELP: c->help = true; return true;
    case OPTION_RESULTS:
        if (strcmp(word, "json") != 0) return misused("--results knows only json, not \"%s\"", word);
        c->options.json = true;
        return true;
    case OPTION_DIGITS:
        if (!read_number(word, 1, SESSION_DIGITS_LIMIT, &x) || x != (long)x)
            return misused("--digits needs a whole number from 1 to 1000000, not \"%s\"", word);
        c->options.digits = (long)x;
        return true;
    case OPTION_TIME:
        if (!read_number(word, 0, 1e9, &x) || x == 0) return misused("--time-limit needs seconds above 0, not \"%s\"", word);
        c->options.time_limit = x;
        return true;
    case OPTION_MEMORY:
        if (!read_number(word, 1, 1e9, &x)) return misused("--memory-limit needs MiB, 1 or more, not \"%s\"", word);
        c->options.memory_limit = (size_t)x;
        return true;
    default: return false;
    }
}

static bool read_command(command *c, int argc, char **argv)
{
    opterr = 0;
    for (;;) {
        int option = getopt_long(argc, argv, "-:e:", options, NULL);
        if (option == -1) break;
        const char *typed = argv[optind - 1];
        if (option == ':') return misused("`%s` needs a value", typed);
        if (option == '?' && optopt > 255) return misused("`%s` takes no value", typed);
        if (option == '?') return misused("unknown option `%s`", typed);
        if (!take_option(c, option, optarg)) return false;
    }
    for (; optind < argc; optind++) c->jobs[c->count++] = (job){false, argv[optind]}; /* after -- */
    return true;
}

/* ---- memory ---- */

#if defined(__SANITIZE_ADDRESS__)
#define SANITIZED 1
#elif defined(__has_feature)
#if __has_feature(address_sanitizer)
#define SANITIZED 1
#endif
#endif

#ifdef SANITIZED
/* A library call that was left at a limit keeps what it held (engine/base/flint.h): after one the leak checker, which
 * asks here, would report just that. Everything else is checked in the runs without one. */
static bool left_a_call;
int __lsan_is_turned_off(void);
int __lsan_is_turned_off(void)
{
    return left_a_call;
}
#endif

/* FLINT's own words about an abort lie in the buffer, behind what has been shown: only ours shall appear. */
static void drop_pending_output(void)
{
    __fpurge(stdout);
}

static void on_abort(int signal_number)
{
    static const char words[] = "termwise: error: memory is out\n";
    (void)signal_number;
    ssize_t put = write(STDERR_FILENO, words, sizeof words - 1);
    (void)put;
    _exit(EXIT_FAILED);
}

/* The engine asks for its memory limit in its loops. Behind that stands the system's limit, for a single library call that
 * takes more than all of it: then an allocation fails, and its statement ends with an error (GMP would end the program, so
 * this host hands it the engine's allocators). Outside of a statement nothing is left but to say so and end. */
static void limit_memory(size_t mib)
{
    signal(SIGABRT, on_abort);
    setvbuf(stdout, NULL, _IOFBF, BUFSIZ);
    edge_install_allocators(drop_pending_output);
#ifndef SANITIZED
    struct rlimit limit;
    rlim_t wanted = ((rlim_t)mib << 21) + ((rlim_t)256 << 20);
    if (mib == 0 || getrlimit(RLIMIT_DATA, &limit) != 0 || wanted > limit.rlim_max) return;
    limit.rlim_cur = wanted;
    (void)setrlimit(RLIMIT_DATA, &limit);
#else
    (void)mib;
#endif
}

/* Expansions take and give back pieces of megabytes all the time: they stay with the process, instead of being asked of the
 * system, page by page, again and again. */
static void tune_memory(void)
{
    mallopt(M_MMAP_THRESHOLD, 32 << 20);
    mallopt(M_TRIM_THRESHOLD, 256 << 20);
    mallopt(M_TOP_PAD, 1 << 20);
}

static void run_jobs(run *r, const command *c)
{
    bool go_on = true;
    for (size_t k = 0; go_on && k < c->count; k++) {
        const job *j = &c->jobs[k];
        if (j->is_statement) go_on = run_words(r, "-e", j->words);
        else if (strcmp(j->words, "-") == 0) go_on = run_input(r, STDIN_FILENO);
        else go_on = run_file(r, j->words);
    }
    if (c->count > 0) return;
    if (isatty(STDIN_FILENO) && isatty(STDOUT_FILENO) && !c->options.parse_only) run_prompt(r);
    else run_input(r, STDIN_FILENO);
}

static int run_command(const command *c)
{
    run r;
    if (!run_init(&r, &c->options)) return EXIT_FAILED;
    run_jobs(&r, c);
    int status = r.status;
#ifdef SANITIZED
    left_a_call = r.session.e->jumps > 0;
#endif
    run_clear(&r);
    return status;
}

int main(int argc, char **argv)
{
    command c = {0};
    c.jobs = calloc((size_t)argc + 1, sizeof *c.jobs);
    int status;
    if (!c.jobs || !read_command(&c, argc, argv)) {
        status = EXIT_USAGE;
    } else if (c.help || c.version) {
        fputs(c.help ? usage : "termwise " TW_VERSION "\n", stdout);
        status = fflush(stdout) == 0 ? EXIT_DONE : EXIT_FAILED;
    } else {
        tune_memory();
        limit_memory(c.options.memory_limit);
        status = run_command(&c);
    }
    free(c.jobs);
    return status;
}
