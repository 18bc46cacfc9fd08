/* The prompt: GNU readline with history, completion and continuation lines. The one idea: readline is used through its
 * callbacks, so that this file waits for input itself, and an interrupt is an ordinary case of waiting. Static state is what
 * readline's callbacks, which take no argument, make necessary. */
#include "lang/prompt.h"

#include <errno.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <readline/history.h>
#include <readline/readline.h>

#include "engine/expr/function.h"
#include "lang/file.h"
#include "lang/interrupt.h"
#include "lang/parse.h"
#include "lang/words.h"

enum { HISTORY_LENGTH = 1000 };
#define PROMPT "tw> "
#define PROMPT_MORE "... "

static struct {
    run *run;
    feed feed;
    char *history_file;  /* NULL: none is kept */
    bool waiting;        /* a line is being edited */
    bool more;           /* the statement goes on */
    bool over;
} prompt;

/* ---- history ---- */

/* $XDG_STATE_HOME/termwise/history (XDG Base Directory Specification 0.8), or NULL when there is no home. */
static char *find_history_file(void)
{
    const char *state = getenv("XDG_STATE_HOME"), *home = getenv("HOME");
    text path;
    text_init(&path);
    if (state && *state == '/') text_addf(&path, "%s/termwise/history", state);
    else if (home && *home) text_addf(&path, "%s/.local/state/termwise/history", home);
    if (path.length > 0 && file_make_folders(path.bytes)) return text_take(&path);
    text_clear(&path);
    return NULL;
}

static void start_history(void)
{
    using_history();
    prompt.history_file = find_history_file();
    if (prompt.history_file) read_history(prompt.history_file);
}

static void keep_history(void)
{
    if (!prompt.history_file) return;
    stifle_history(HISTORY_LENGTH);
    write_history(prompt.history_file);
    free(prompt.history_file);
    prompt.history_file = NULL;
}

static void add_entry(const char *words, size_t length)
{
    while (length > 0 && strchr(" \n", words[length - 1])) length--;
    char *entry = base_alloc(length + 1);
    memcpy(entry, words, length);
    entry[length] = '\0';
    for (char *p = entry; *p; p++)
        if (*p == '\n') *p = ' ';
    HIST_ENTRY *last = history_length > 0 ? history_get(history_base + history_length - 1) : NULL;
    if (*entry && !(last && strcmp(last->line, entry) == 0)) add_history(entry);
    free(entry);
}

static bool goes_on(const char *start, const char *end)
{
    text lines; /* the parser wants its text closed by a NUL */
    text_init(&lines);
    text_add_bytes(&lines, start, (size_t)(end - start));
    bool more = parse_wants_more(lines.bytes, lines.length);
    text_clear(&lines);
    return more;
}

/* A whole statement becomes one entry: its line ends turn into spaces, which mean the same, unless a comment stands in it. */
static void remember(const char *words, size_t length)
{
    const char *start = words, *end = words + length;
    for (const char *line = words; line < end;) {
        const char *next = memchr(line, '\n', (size_t)(end - line));
        line = next ? next + 1 : end;
        bool comment = memchr(start, '#', (size_t)(line - start)) != NULL;
        if (!comment && line < end && goes_on(start, line)) continue;
        add_entry(start, (size_t)(line - start));
        start = line;
    }
}

/* ---- completion ---- */

typedef struct candidates {
    const char *start;
    size_t length, count, room;
    char **names;
} candidates;

static void offer(candidates *c, const char *name, const char *tail)
{
    if (strncmp(name, c->start, c->length) != 0) return;
    for (size_t k = 0; k < c->count; k++)
        if (strncmp(c->names[k], name, strlen(name)) == 0 && strcmp(c->names[k] + strlen(name), tail) == 0) return;
    if (c->count == c->room) {
        c->room = c->room ? 2 * c->room : 32;
        c->names = base_resize(c->names, c->room * sizeof *c->names);
    }
    text name_and_tail;
    text_init(&name_and_tail);
    text_addf(&name_and_tail, "%s%s", name, tail);
    c->names[c->count++] = text_take(&name_and_tail);
}

static void offer_own(void *host, const char *name)
{
    const value *v = names_find(&prompt.run->session.names, name);
    offer(host, name, v->kind == VALUE_FUNCTION ? "(" : "");
}

/* Words of the language, functions and the user's names that begin like the text; readline frees what it is handed. */
static char *next_candidate(const char *start, int again)
{
    static candidates all;
    static size_t next;
    if (!again) {
        all = (candidates){start, strlen(start), 0, 0, NULL};
        next = 0;
        word_class class_;
        const char *word;
        for (size_t k = 0; (word = word_at(k, &class_)); k++)
            if (class_ != WORD_FUNCTION) offer(&all, word, "");
        for (int f = 0; f < FUNCTION_COUNT; f++) offer(&all, function_name((function_id)f), "(");
        offer(&all, "sqrt", "(");
        names_each(&prompt.run->session.names, offer_own, &all);
    }
    if (next < all.count) return all.names[next++];
    free(all.names);
    all.names = NULL;
    all.count = 0;
    next = 0;
    return NULL;
}

/* Within quotes readline completes file names; elsewhere never. */
static char **complete(const char *start, int from, int to)
{
    (void)to;
    bool quoted = false;
    for (int k = 0; k < from; k++)
        if (rl_line_buffer[k] == '"' && (k == 0 || rl_line_buffer[k - 1] != '\\')) quoted = !quoted;
    if (quoted) return NULL;
    rl_attempted_completion_over = 1;
    char **found = rl_completion_matches(start, next_candidate);
    bool call = found && !found[1] && found[0][0] && found[0][strlen(found[0]) - 1] == '(';
    rl_completion_append_character = call ? '\0' : ' ';
    return found;
}

/* ---- lines ---- */

static void take_line(char *line);

static void ask(void)
{
    const session *s = &prompt.run->session;
    text words; /* an open derivation shows its name */
    text_init(&words);
    if (prompt.more) text_add(&words, PROMPT_MORE);
    else if (s->open) text_addf(&words, "%.24s> ", s->open_is_name ? s->open_name : "derive");
    else text_add(&words, PROMPT);
    rl_callback_handler_install(words.bytes, take_line);
    text_clear(&words);
    prompt.waiting = true;
}

static void stop_asking(void)
{
    if (prompt.waiting) rl_callback_handler_remove();
    prompt.waiting = false;
}

/* readline hands over a line, or NULL at the end of input. The handler is removed meanwhile, so that the terminal is in its
 * ordinary state while a statement runs and Ctrl-C makes a signal. */
static void take_line(char *line)
{
    stop_asking();
    feed *f = &prompt.feed;
    if (!line) {
        putchar('\n');
        prompt.over = true;
        return;
    }
    text_add(&f->all, line);
    text_add_char(&f->all, '\n');
    free(line);
    size_t from = f->done;
    interrupt_forget();
    bool go_on = run_feed(prompt.run, f, false, &prompt.more);
    interrupt_forget();
    if (!prompt.more) remember(f->all.bytes + from, f->all.length - from);
    if (!go_on) prompt.over = true;
}

/* Ctrl-C while a line is edited: the line, and the statement that it belongs to, are forgotten. */
static void cancel_line(void)
{
    interrupt_forget();
    rl_callback_sigcleanup();
    rl_free_line_state();
    rl_replace_line("", 0);
    stop_asking();
    fputs("^C\n", stdout);
    fflush(stdout);
    text_cut(&prompt.feed.all, prompt.feed.done);
    prompt.more = false;
}

/* While a line is edited readline catches signals (it has the terminal to put in order); each is blocked except within ppoll,
 * so none can slip in between the question and the wait. Handled here, an interrupt goes on to the handler of interrupt.c. */
static void wait_for_input(void)
{
    sigset_t blocked, before;
    sigfillset(&blocked);
    sigprocmask(SIG_BLOCK, &blocked, &before);
    struct pollfd p = {STDIN_FILENO, POLLIN, 0};
    int ready = interrupt_seen() || rl_pending_signal() ? -1 : ppoll(&p, 1, NULL, &before);
    sigprocmask(SIG_SETMASK, &before, NULL);
    if (rl_pending_signal()) rl_check_signals();
    if (interrupt_seen()) cancel_line();
    else if (ready > 0) rl_callback_read_char();
}

static void set_up_readline(void)
{
    rl_readline_name = "termwise";
    rl_catch_signals = 1;
    rl_catch_sigwinch = 1;
    rl_attempted_completion_function = complete;
    rl_basic_word_break_characters = " \t\n\"+-*/^!()[],:=<>";
    rl_completer_word_break_characters = " \t\n\"+-*/^!()[],:=<>";
    rl_completer_quote_characters = "\"";
    rl_variable_bind("enable-bracketed-paste", "on");
    rl_instream = stdin;
    rl_outstream = stdout;
}

void run_prompt(run *r)
{
    memset(&prompt, 0, sizeof prompt);
    prompt.run = r;
    r->at_prompt = true;
    feed_init(&prompt.feed, "<input>");
    set_up_readline();
    start_history();
    if (!r->options.quiet && !r->options.json)
        puts("Termwise " TW_VERSION ": `help` lists the words, Ctrl-D or `quit` leaves.");
    while (!prompt.over) {
        if (!prompt.waiting) ask();
        wait_for_input();
    }
    stop_asking();
    if (r->status != EXIT_REFUTED) r->status = EXIT_DONE; /* people correct themselves at a prompt */
    keep_history();
    rl_clear_history();
    feed_clear(&prompt.feed);
}
