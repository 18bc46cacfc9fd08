/* Runs texts in a session and tells people and programs how it went. The one idea: every text, from a file, a pipe, the
 * command line or the prompt, goes through run_source(): parse, then each statement in order, results to standard output,
 * complaints to standard error. Knows statements only as things to run; what they mean is the session's. */
#include "lang/run.h"

#include <errno.h>
#include <malloc.h>
#include <poll.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include "engine/export/format.h"
#include "lang/file.h"
#include "lang/interrupt.h"
#include "lang/parse.h"
#include "lang/progress.h"

enum { USE_DEPTH_LIMIT = 16 };

/* ---- complaints ---- */

static void worsen(run *r, int status)
{
    if (status > r->status) r->status = status;
}

static void show_error_object(run *r, error_kind kind, const char *words, const char *file, const source_place *place)
{
    if (r->depth > 0) { /* the `use` that started it says it in its own object */
        text_cut(&r->inner, 0);
        if (place) text_addf(&r->inner, "%s:%u:%u: ", file, place->line, place->column);
        text_add(&r->inner, words);
        return;
    }
    if (!r->options.json) return;
    result object;
    result_init(&object, "error");
    result_string(&object, "kind", error_kind_word(kind));
    result_string(&object, "message", words);
    result_string(&object, "file", file);
    if (place) {
        result_integer(&object, "line", place->line);
        result_integer(&object, "column", place->column);
    } else {
        result_json(&object, "line", "null");
        result_json(&object, "column", "null");
    }
    result_show(&object, stdout, true);
    fflush(stdout);
    result_clear(&object);
}

/* The complaint in colour: bold red for the word `error`, and nothing else. */
static void print_complaint(run *r, const char *words)
{
    fflush(stdout);
    const char *mark = r->colour ? strstr(words, ": error: ") : NULL;
    if (mark) {
        fwrite(words, 1, (size_t)(mark + 2 - words), stderr);
        fputs("\033[1;31merror:\033[0m", stderr);
        words = mark + 8;
    }
    fputs(words, stderr);
    fflush(stderr);
}

static int status_of(error_kind kind)
{
    return kind == ERROR_REFUTED ? EXIT_REFUTED : kind == ERROR_INTERRUPT ? EXIT_INTERRUPTED : EXIT_FAILED;
}

void run_complain(run *r, error_kind kind, const char *file, const char *words)
{
    text line;
    text_init(&line);
    text_addf(&line, "termwise: error: %s\n", words);
    print_complaint(r, line.bytes);
    text_clear(&line);
    show_error_object(r, kind, words, file, NULL);
    worsen(r, status_of(kind));
}

/* An interrupt has no place in the text. */
static void complain_interrupted(run *r)
{
    print_complaint(r, "termwise: interrupted\n");
    show_error_object(r, ERROR_INTERRUPT, "interrupted", NULL, NULL);
    worsen(r, EXIT_INTERRUPTED);
}

static void complain_at(run *r, source *whole, span at, error_kind kind, const char *words)
{
    text lines;
    text_init(&lines);
    source_show_error(whole, &lines, at, words);
    print_complaint(r, lines.bytes);
    text_clear(&lines);
    source_place place = source_find(whole, at.from);
    show_error_object(r, kind, words, whole->name, &place);
    worsen(r, status_of(kind));
}

/* The fault lies in a file that the statement read: its place comes first, then the statement's. */
static void complain_elsewhere(run *r, source *whole, span at, error_kind kind, const char *words)
{
    session_elsewhere *other = &r->session.elsewhere;
    source file;
    source_init(&file, other->name, other->bytes.bytes, other->bytes.length);
    complain_at(r, &file, other->at, kind, words);
    source_place place = source_find(whole, at.from);
    text line;
    text_init(&line);
    text_addf(&line, "%s:%u:%u: which is read here\n", whole->name, place.line, place.column);
    print_complaint(r, line.bytes);
    text_clear(&line);
    session_forget_blame(&r->session);
}

/* ---- one statement ---- */

static bool shown(const run *r, const result *given)
{
    if (!given->echo) return true;
    return r->options.json ? r->depth == 0 : r->depth == 0 && !r->options.quiet;
}

static bool show(run *r, const result *given)
{
    if (!shown(r, given) || (result_show(given, stdout, r->options.json) && fflush(stdout) == 0)) return true;
    text words;
    text_init(&words);
    text_addf(&words, "cannot write to standard output: %s", strerror(errno));
    clearerr(stdout);
    r->options.json = false;
    run_complain(r, ERROR_FILE, NULL, words.bytes);
    text_clear(&words);
    return false;
}

static span shifted(span at, size_t by)
{
    return (span){at.from + (uint32_t)by, at.to + (uint32_t)by};
}

/* An interrupt at the prompt ends the statement, elsewhere the whole run. */
static bool go_on_after(const run *r, error_kind kind)
{
    if (r->at_prompt && r->depth == 0) return true;
    return r->options.keep_going && r->depth == 0 && kind != ERROR_INTERRUPT;
}

/* After a statement that took too much memory or time the system gets back what was freed, so that the next one is not refused for
 * it. */
static void give_back_memory(void)
{
    flint_cleanup();
    malloc_trim(0);
}

static bool run_statement(run *r, source *whole, size_t from, const statement *st)
{
    tw_engine *e = r->session.e;
    text words;
    text_init(&words);
    session_describe(st, &words);
    budget_start(e, r->options.time_limit);
    progress_start(e, words.bytes, true, r->options.time_limit, r->at_prompt, r->options.json);
    r->session.line = source_find(whole, st->at.from + (uint32_t)from).line;
    result made;
    result_init(&made, "done");
    made.width = r->width;
    tw_status status = session_run(&r->session, st, &made);
    progress_end(e);
    bool written = true;
    if (status == TW_OK || made.words.length > 0) written = show(r, &made);
    error_kind kind = e->error.kind;
    if (status != TW_OK && kind == ERROR_INTERRUPT) {
        complain_interrupted(r);
        engine_forgive(e);
    } else if (status != TW_OK) {
        (r->session.elsewhere.name ? complain_elsewhere : complain_at)(r, whole, shifted(r->session.at, from), kind,
                                                                       e->error.words);
        engine_forgive(e);
    }
    result_clear(&made);
    text_clear(&words);
    if (kind == ERROR_MEMORY || kind == ERROR_TIME || kind == ERROR_INTERRUPT) give_back_memory();
    if (!written || r->session.quit) return false;
    return status == TW_OK || go_on_after(r, kind);
}

/* ---- a text ---- */

static bool interrupted_between(run *r)
{
    if (!interrupt_seen()) return false;
    complain_interrupted(r);
    return true;
}

/* Runs the bytes of `whole` from `from` on. Statements and syntax errors take their turns in the order of the text. */
static bool run_source(run *r, source *whole, size_t from)
{
    source part;
    source_init(&part, whole->name, whole->bytes + from, whole->length - from);
    syntax_text tree;
    syntax_text_init(&tree);
    parse_text(&part, &tree);
    bool go_on = true;
    size_t k = 0, x = 0;
    while (go_on && (k < tree.count || x < tree.error_count)) {
        if (interrupted_between(r)) {
            go_on = false;
        } else if (x < tree.error_count && (k == tree.count || tree.errors[x].at.from < tree.statements[k]->at.from)) {
            complain_at(r, whole, shifted(tree.errors[x].at, from), ERROR_SYNTAX, tree.errors[x].words);
            x++;
            go_on = r->options.parse_only || go_on_after(r, ERROR_SYNTAX);
        } else {
            go_on = r->options.parse_only || run_statement(r, whole, from, tree.statements[k]);
            k++;
        }
    }
    syntax_text_clear(&tree);
    return go_on;
}

static bool too_long(run *r, const char *name, size_t length)
{
    if (length <= SOURCE_LENGTH_LIMIT) return false;
    run_complain(r, ERROR_FILE, name, "the text is longer than 4 GiB");
    return true;
}

bool run_words(run *r, const char *name, const char *words)
{
    source whole;
    if (too_long(r, name, strlen(words))) return false;
    source_init(&whole, name, words, strlen(words));
    return run_source(r, &whole, 0);
}

/* Runs the bytes of a file; `use` within it looks beside it. */
static bool run_bytes(run *r, const char *path, const text *bytes)
{
    if (too_long(r, path, bytes->length)) return false;
    const char *before = r->session.folder;
    char *folder = file_folder(path);
    r->session.folder = folder;
    const char *outer = r->session.file;
    r->session.file = path;
    source whole;
    source_init(&whole, path, bytes->bytes, bytes->length);
    bool go_on = run_source(r, &whole, 0);
    r->session.folder = before;
    r->session.file = outer;
    free(folder);
    return go_on;
}

bool run_file(run *r, const char *path)
{
    text bytes, why;
    text_init(&bytes);
    text_init(&why);
    bool go_on = file_read(path, &bytes, &why);
    if (go_on) {
        go_on = run_bytes(r, path, &bytes);
    } else {
        run_complain(r, ERROR_FILE, path, why.bytes);
        go_on = r->options.keep_going || r->options.parse_only;
    }
    text_clear(&bytes);
    text_clear(&why);
    return go_on;
}

/* ---- use ---- */

static tw_status refuse_circle(run *r, const char *path)
{
    for (const use_frame *f = r->uses; f; f = f->outer)
        if (strcmp(f->path, path) == 0)
            return engine_fail(r->session.e, ERROR_FILE, "\"%s\" uses itself", path);
    if (r->depth < USE_DEPTH_LIMIT) return TW_OK;
    return engine_fail(r->session.e, ERROR_FILE, "files use one another more than %d deep", USE_DEPTH_LIMIT);
}

/* The worst that happened inside counts for the program, too. */
static tw_status run_used(run *r, const char *path, const text *bytes)
{
    int before = r->status;
    use_frame frame = {path, r->uses};
    r->uses = &frame;
    r->status = EXIT_DONE;
    r->depth++;
    bool good = run_bytes(r, path, bytes);
    r->depth--;
    r->uses = frame.outer;
    int inner = r->status;
    r->status = before > inner ? before : inner;
    if (r->session.quit || (good && inner == EXIT_DONE)) return TW_OK;
    error_kind kind = inner == EXIT_INTERRUPTED ? ERROR_INTERRUPT : inner == EXIT_REFUTED ? ERROR_REFUTED : ERROR_FILE;
    return engine_fail(r->session.e, kind, "\"%s\" did not run to its end (%.300s)", path, r->inner.bytes);
}

/* The file's statements run in the same session; definitions do not echo, the first failure ends it. */
static tw_status use_file(void *host, const char *path)
{
    run *r = host;
    if (refuse_circle(r, path) != TW_OK) return TW_ERROR;
    text bytes, why;
    text_init(&bytes);
    text_init(&why);
    tw_status status = file_read(path, &bytes, &why) ? run_used(r, path, &bytes)
                                                     : engine_fail(r->session.e, ERROR_FILE, "%s", why.bytes);
    text_clear(&bytes);
    text_clear(&why);
    return status;
}

/* ---- lines as they come ---- */

void feed_init(feed *f, const char *name)
{
    f->name = name;
    text_init(&f->all);
    f->done = 0;
}

void feed_clear(feed *f)
{
    text_clear(&f->all);
}

bool run_feed(run *r, feed *f, bool last, bool *wants_more)
{
    *wants_more = false;
    size_t length = f->all.length - f->done;
    if (length == 0) return true;
    if (!last && parse_wants_more(f->all.bytes + f->done, length)) {
        *wants_more = true;
        return true;
    }
    if (too_long(r, f->name, f->all.length)) return false;
    source whole;
    source_init(&whole, f->name, f->all.bytes, f->all.length);
    bool go_on = run_source(r, &whole, f->done);
    f->done = f->all.length;
    return go_on;
}

static bool more_is_ready(int fd)
{
    struct pollfd p = {fd, POLLIN, 0};
    return poll(&p, 1, 0) == 1;
}

/* Runs the whole lines that have come. What waits for more is looked at again when it has grown by a quarter, or when the
 * other side pauses: so a long text in one bracket is not read over and over. */
static bool run_lines(run *r, feed *f, size_t *look_again, bool pause)
{
    size_t whole = f->all.length;
    while (whole > f->done && f->all.bytes[whole - 1] != '\n') whole--;
    if (whole == f->done || (whole < *look_again && !pause)) return true;
    char *rest = base_copy(f->all.bytes + whole);
    size_t rest_length = f->all.length - whole;
    text_cut(&f->all, whole);
    bool wants_more;
    bool go_on = run_feed(r, f, false, &wants_more);
    text_add_bytes(&f->all, rest, rest_length);
    free(rest);
    *look_again = wants_more ? whole + (whole - f->done) / 4 : 0;
    return go_on;
}

bool run_input(run *r, int fd)
{
    feed f;
    feed_init(&f, "<input>");
    size_t look_again = 0;
    bool go_on = true, wants_more;
    while (go_on) {
        char piece[65536];
        ssize_t got = read(fd, piece, sizeof piece);
        if (got < 0 && errno == EINTR && !interrupt_seen()) continue;
        if (got < 0 && errno == EINTR) {
            interrupted_between(r);
            go_on = false;
        } else if (got < 0) {
            text words;
            text_init(&words);
            text_addf(&words, "cannot read standard input: %s", strerror(errno));
            run_complain(r, ERROR_FILE, f.name, words.bytes);
            text_clear(&words);
            go_on = false;
        } else if (got == 0) {
            go_on = run_feed(r, &f, true, &wants_more);
            break;
        } else {
            text_add_bytes(&f.all, piece, (size_t)got);
            if (f.all.length - f.done < (1u << 20) && more_is_ready(fd)) continue;
            go_on = run_lines(r, &f, &look_again, !more_is_ready(fd));
        }
    }
    feed_clear(&f);
    return go_on;
}

/* ---- life ---- */

/* Columns of the terminal that results go to, RESULT_WIDTH at most and elsewhere. */
static size_t find_width(void)
{
    struct winsize size;
    if (ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) != 0 || size.ws_col < 40 || size.ws_col > RESULT_WIDTH) return RESULT_WIDTH;
    return size.ws_col;
}

bool run_init(run *r, const run_options *options)
{
    memset(r, 0, sizeof *r);
    r->options = *options;
    r->width = find_width();
    text_init(&r->inner);
    if (session_init(&r->session) != TW_OK) {
        fputs("termwise: error: no memory for an engine\n", stderr);
        return false;
    }
    r->session.json = options->json;
    if (options->digits > 0) r->session.digits = options->digits;
    r->session.e->memory_limit = options->memory_limit << 20;
    r->session.run_file = use_file;
    r->session.host = r;
    const char *no_colour = getenv("NO_COLOR");
    r->colour = isatty(STDERR_FILENO) && !(no_colour && *no_colour);
    interrupt_install(r->session.e);
    return true;
}

void run_clear(run *r)
{
    interrupt_remove();
    session_clear(&r->session);
    text_clear(&r->inner);
}
