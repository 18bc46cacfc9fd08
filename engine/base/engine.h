/* The engine's state and how it fails. One tw_engine holds everything: arena, interned expressions, facts, the error of
 * the last failed call, limits. Two engines can live side by side. This room knows no mathematics.
 *
 * Whoever finds an error calls engine_fail() once and returns its value; everybody else cleans up and passes the
 * status on. */
#ifndef TW_BASE_ENGINE_H
#define TW_BASE_ENGINE_H

#include <signal.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>

#include "engine/base/arena.h"
#include "engine/termwise.h"

typedef enum tw_status { TW_OK = 0, TW_ERROR = 1 } tw_status;

/* One row a kind of error: identifier, the word used in JSON's "kind". */
#define ERROR_KINDS(X)                                                                                                \
    X(NONE, "none")                                                                                                   \
    X(SYNTAX, "syntax")           /* the text is not a statement */                                                   \
    X(NAME, "name")               /* a name that means nothing here, or may not be defined */                         \
    X(VALUE, "value")             /* a value outside the domain of what was asked */                                  \
    X(UNAVAILABLE, "unavailable") /* the language has it, this version does not */                                    \
    X(UNSUITABLE, "unsuitable")   /* the method does not fit the integral; the words say why and advise */            \
    X(DIVERGENT, "divergent")     /* the integral does not converge */                                                \
    X(UNDECIDED, "undecided")     /* a condition could be neither proved nor refuted */                               \
    X(PRECISION, "precision")     /* the digits asked for cannot be had */                                            \
    X(REFUTED, "refuted")         /* a check failed: a proved bound or a rule is contradicted */                      \
    X(FILE, "file")                                                                                                   \
    X(TIME, "time")                                                                                                   \
    X(MEMORY, "memory")                                                                                               \
    X(INTERRUPT, "interrupt")                                                                                         \
    X(INTERNAL, "internal")

typedef enum error_kind {
#define X(id, word) ERROR_##id,
    ERROR_KINDS(X)
#undef X
} error_kind;

typedef struct tw_error {
    error_kind kind;
    char *words; /* plain English, no line end; owned by the engine, valid until engine_forgive() or the next failure */
} tw_error;

struct expr_table; /* engine/expr */
struct facts;      /* engine/expr/facts.h */
struct matching;   /* engine/rewrite */

struct tw_engine {
    arena arena;                         /* what lives as long as the engine: expressions, names */
    arena scratch;                       /* a stack of arrays that live as long as one call; the edge puts it back */
    tw_error error;
    volatile sig_atomic_t interrupted;   /* set by a signal handler of the host; budget_ok() notices it */
    double seconds;                      /* allowance of each call through the public header; 0: none */
    double deadline;                     /* seconds of CLOCK_MONOTONIC; 0: none */
    size_t memory_limit;                 /* bytes of resident memory of the process; 0: none */
    unsigned budget_ticks;
    unsigned jumps;                      /* how often an edge has caught an abort: memories made before may be half made */
    double memory_checked;               /* when the resident memory was last looked at */
    size_t memory_before, memory_lost;   /* resident as the call began; lost at jumps, for which the limit makes room */
    unsigned jumps_seen;
    long allocations_left;               /* tests: after so many more allocations fail; negative: never */
    struct expr_table *exprs;
    struct facts *facts;
    struct matching *matching;           /* NULL until the first pattern is matched */
    void (*progress)(void *host, const char *words); /* told now and then what long work is doing; may be NULL */
    void *progress_host;
    const struct root_names *root_names; /* names by which algebraic numbers are printed; NULL: in full (expr/root_names.h) */
    FILE *trace;                         /* developers' dump of stages; NULL: off */
};

/* Sets kind and words (printf format) and returns TW_ERROR. The first error stays: a second call before
 * engine_forgive() changes nothing. */
tw_status engine_fail(tw_engine *e, error_kind kind, const char *format, ...) __attribute__((format(printf, 3, 4)));

/* Forgets the error. The caller that handles a failure calls this. */
void engine_forgive(tw_engine *e);

/* The JSON word of an error kind, e.g. "syntax". */
const char *error_kind_word(error_kind kind);

/* Gives the host a sign of life; cheap when nobody listens. */
void engine_progress(tw_engine *e, const char *words);

/* The edge: runs run(host) and turns an abort of FLINT on this thread (out of memory, ...) into an error of kind
 * MEMORY or INTERNAL. FLINT objects alive at the jump are lost, so sizes and divisors are checked before FLINT sees
 * them. May be nested; the innermost edge catches. */
tw_status engine_protect(tw_engine *e, tw_status (*run)(void *host), void *host);

/* To be asked in every loop that can run long: false, with the error set, when the host interrupted, the deadline has
 * passed or the memory limit is exceeded. Costs a few nanoseconds on most calls. */
bool budget_ok(tw_engine *e);

/* Starts a new allowance: seconds from now (0: none). Also clears an old interrupt. */
void budget_start(tw_engine *e, double seconds);

/* Seconds of CLOCK_MONOTONIC; whether the process is within the memory limit (asks the system: some 10 us). */
double budget_clock(void);
bool budget_memory_ok(tw_engine *e);

/* Memory from the scratch stack: take a mark with arena_mark(&e->scratch), give it back with arena_release. */
void *engine_scratch(tw_engine *e, size_t count, size_t bytes_each);

/* malloc, realloc and a copy of a string that never return NULL: failure leaves through the edge as ERROR_MEMORY. */
void *base_alloc(size_t bytes);
void *base_resize(void *old, size_t bytes);
char *base_copy(const char *words);

/* Sets up the base parts of an engine, and takes them down. termwise.c calls these; nobody else. */
void engine_base_init(tw_engine *e);
void engine_base_clear(tw_engine *e);

#endif
