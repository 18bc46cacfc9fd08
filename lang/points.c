/* The points of `at`: values typed, sweeps, and tables read from a file. The one idea: whatever their origin, points end up as
 * one array of exact values, and each is held against the facts before anything is computed. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/ball/tape.h"
#include "lang/csv.h"
#include "lang/file.h"
#include "lang/parse.h"
#include "lang/request.h"
#include "lang/words.h"

enum { POINTS_LIMIT = 100000 };

/* The values of one binding. */
typedef struct values {
    size_t count;
    expr **list;
} values;

static tw_status read_value(session *s, const syntax *x, expr **out)
{
    *out = session_lower(s, x);
    if (!*out) return TW_ERROR;
    if (!expr_is_closed_value(*out) || expr_is_inf(*out) || expr_is_minus_inf(*out) || (*out)->kind == EXPR_RELATION)
        return request_fail(s, x->at, ERROR_VALUE, "a value here must be a fixed number");
    return TW_OK;
}

/* from + k*step while not beyond `to`: the number of steps, or -1 when they are too many or lead nowhere. */
static slong count_steps(const fmpq_t from, const fmpq_t to, const fmpq_t stride)
{
    fmpq_t n;
    fmpz_t whole;
    slong count = -1;
    if (fmpq_is_zero(stride)) return -1;
    fmpq_init(n);
    fmpz_init(whole);
    fmpq_sub(n, to, from);
    fmpq_div(n, n, stride);
    fmpz_fdiv_q(whole, fmpq_numref(n), fmpq_denref(n));
    if (fmpz_sgn(whole) >= 0 && fmpz_cmp_si(whole, POINTS_LIMIT) < 0) count = fmpz_get_si(whole);
    fmpz_clear(whole);
    fmpq_clear(n);
    return count;
}

static tw_status sweep_steps(session *s, const syntax_binding *b, expr *from, expr *to, values *out)
{
    expr *stride;
    if (read_value(s, b->step, &stride) != TW_OK) return TW_ERROR;
    if (!expr_is_number(from) || !expr_is_number(to) || !expr_is_number(stride))
        return request_fail(s, b->step->at, ERROR_VALUE, "a sweep by steps needs rational ends and step");
    slong count = count_steps(expr_number(from), expr_number(to), expr_number(stride));
    if (count < 0)
        return request_fail(s, b->step->at, ERROR_VALUE, "this step does not lead from the first to the last value in at "
                                                         "most %d points", POINTS_LIMIT);
    out->list = base_alloc(((size_t)count + 1) * sizeof *out->list);
    for (slong k = 0; k <= count; k++)
        out->list[out->count++] = expr_add(s->e, from, expr_mul(s->e, expr_int(s->e, k), stride));
    return TW_OK;
}

/* A decimal of 10 digits near the positive value: what stands between the ends of a log scale shall be short to read and
 * exact to use. The value itself where its decimal would be very long. */
static expr *round_value(session *s, expr *x)
{
    enum { BITS = 128, DIGITS = 10, LENGTH = 30 };
    acb_t z;
    acb_init(z);
    expr *rounded = ball_value(s->e, z, x, BITS) == TW_OK ? x : NULL;
    if (rounded && arb_rel_accuracy_bits(acb_realref(z)) > BITS / 2) {
        char *words = arb_get_str(acb_realref(z), DIGITS, ARB_STR_NO_RADIUS);
        if (strlen(words) < LENGTH) {
            fmpq_t q;
            fmpq_init(q);
            lower_number(words, q);
            rounded = expr_fmpq(s->e, q);
            fmpq_clear(q);
        }
        flint_free(words);
    }
    acb_clear(z);
    return rounded;
}

static tw_status sweep_points(session *s, const syntax_binding *b, expr *from, expr *to, values *out)
{
    slong count;
    if (session_lower_count(s, b->points, "the number of points", 2, POINTS_LIMIT, &count) != TW_OK) return TW_ERROR;
    if (b->log_scale && (decide_sign(s->e, from) != 1 || decide_sign(s->e, to) != 1))
        return request_fail(s, b->from->at, ERROR_VALUE, "a log scale needs positive ends");
    expr *range = b->log_scale ? expr_div(s->e, to, from) : expr_sub(s->e, to, from);
    out->list = base_alloc((size_t)count * sizeof *out->list);
    for (slong k = 0; k < count; k++) {
        expr *part = expr_frac(s->e, k, count - 1);
        expr *x = b->log_scale ? expr_mul(s->e, from, expr_pow(s->e, range, part))
                               : expr_add(s->e, from, expr_mul(s->e, range, part));
        if (b->log_scale && x && !expr_is_number(x) && k > 0 && k < count - 1) x = round_value(s, x);
        if (!x) return request_fail_at(s, b->from->at);
        out->list[out->count++] = x;
    }
    return TW_OK;
}

static tw_status read_values(session *s, const syntax_binding *b, values *out)
{
    if (b->count == 0) {
        expr *from, *to;
        if (read_value(s, b->from, &from) != TW_OK || read_value(s, b->to, &to) != TW_OK) return TW_ERROR;
        return b->step ? sweep_steps(s, b, from, to, out) : sweep_points(s, b, from, to, out);
    }
    out->list = base_alloc(b->count * sizeof *out->list);
    for (; out->count < b->count; out->count++)
        if (read_value(s, b->values[out->count], &out->list[out->count]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

static tw_status read_symbol(session *s, const points *p, syntax_name name, const points_use *use, expr **out)
{
    *out = expr_symbol(s->e, name.text);
    if (!*out) return request_fail_at(s, name.at);
    if (names_find(&s->names, name.text))
        return request_fail(s, name.at, ERROR_NAME, "`%s` is defined by `let`; only a free parameter takes a value here",
                            name.text);
    if (!expr_has(use->f, *out))
        return request_fail(s, name.at, ERROR_NAME, "`%.60s` does not depend on `%s`", use->name, name.text);
    for (size_t k = 0; k < p->width; k++)
        if (p->symbols[k] == *out)
            return request_fail(s, name.at, ERROR_VALUE, "`%s` has got a value already", name.text);
    return TW_OK;
}

/* Adds a binding: each point so far is repeated for each of the values. */
static tw_status multiply_points(session *s, points *p, span at, expr *symbol, const values *v)
{
    size_t count = p->count * v->count;
    if (count > POINTS_LIMIT) return request_fail(s, at, ERROR_VALUE, "these are more than %d points", POINTS_LIMIT);
    expr **wider = base_alloc(count * (p->width + 1) * sizeof *wider);
    for (size_t k = 0; k < p->count; k++)
        for (size_t j = 0; j < v->count; j++) {
            expr **row = wider + (k * v->count + j) * (p->width + 1);
            for (size_t c = 0; c < p->width; c++) row[c] = p->values[k * p->width + c];
            row[p->width] = v->list[j];
        }
    free(p->values);
    p->values = wider;
    p->count = count;
    p->symbols[p->width++] = symbol;
    return TW_OK;
}

static tw_status all_have_values(session *s, const points *p, span place, const points_use *use)
{
    expr **symbols;
    size_t count = expr_symbols(use->f, &symbols);
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < count; k++) {
        const char *missing = symbols[k]->is.name;
        bool found = false;
        for (size_t c = 0; c < p->width; c++) found = found || p->symbols[c] == symbols[k];
        if (found) continue;
        if (p->table)
            status = request_fail(s, place, ERROR_VALUE, "`%.60s` depends on `%s`, for which the table has no column", use->name,
                                  missing);
        else
            status = request_fail(s, place, ERROR_VALUE, "`%.60s` depends on `%s`, which has no value here: add `%s%s = ...`",
                                  use->name, missing, p->width ? ", " : "at ", missing);
    }
    free(symbols);
    return status;
}

/* The values of a point must not contradict the facts. */
static tw_status facts_allow(session *s, const points *p, size_t k, span place, const points_use *use)
{
    for (size_t f = 0; f < use->fact_count; f++) {
        expr *here = expr_substitute_all(s->e, use->facts[f], p->symbols, p->values + k * p->width, p->width);
        if (!here) return request_fail_at(s, place);
        if (here == use->facts[f] || decide(s->e, here, NULL) != ANSWER_NO) continue;
        char *words = expr_text(s->e, use->facts[f]);
        request_fail(s, place, ERROR_VALUE, "a value contradicts the declared `%s`", words);
        free(words);
        return TW_ERROR;
    }
    expr *large;
    if (facts_large(s->e, &large) == LARGE_NONE) return TW_OK;
    for (size_t c = 0; c < p->width; c++)
        if (p->symbols[c] == large && decide_sign(s->e, p->values[k * p->width + c]) != 1)
            return request_fail(s, place, ERROR_VALUE, "`%s` must be a positive number", large->is.name);
    return TW_OK;
}

tw_status points_read(session *s, points *out, const syntax_bindings *at, span place, const points_use *use)
{
    memset(out, 0, sizeof *out);
    out->count = 1;
    out->symbols = base_alloc((at->count + 1) * sizeof *out->symbols);
    out->values = base_alloc(sizeof *out->values);
    for (size_t k = 0; k < at->count; k++) {
        const syntax_binding *b = &at->list[k];
        values v = {0, NULL};
        expr *symbol;
        tw_status status = read_symbol(s, out, b->name, use, &symbol);
        if (status == TW_OK) status = read_values(s, b, &v);
        if (status == TW_OK) status = multiply_points(s, out, b->name.at, symbol, &v);
        free(v.list);
        if (status != TW_OK) return TW_ERROR;
    }
    if (s->e->error.kind != ERROR_NONE) return request_fail_at(s, place);
    if (all_have_values(s, out, place, use) != TW_OK) return TW_ERROR;
    span bindings = at->count ? at->list[0].name.at : place;
    for (size_t k = 0; k < out->count; k++) {
        if (!budget_ok(s->e)) return request_fail_at(s, place);
        if (facts_allow(s, out, k, bindings, use) != TW_OK) return TW_ERROR;
    }
    return TW_OK;
}

/* ---- points of a file ---- */

struct points_table {
    text bytes;
    source source;
    csv_table cells;
};

static span row_span(const points *p, size_t k)
{
    const csv_cell *row = p->table->cells.cells + (k + 1) * p->width;
    return (span){row[0].at.from, row[p->width - 1].at.to};
}

/* The error is set, or set here; its place in the table is `at`, in the statement `place`. */
static tw_status fail_in_table(session *s, const points *p, span at, span place, const char *words)
{
    if (words) engine_fail(s->e, ERROR_FILE, "%s", words);
    if (!error_is_fatal(s->e->error.kind)) session_blame(s, &p->table->source, at);
    return request_fail_at(s, place);
}

static tw_status open_table(session *s, points *out, const char *path, span place)
{
    struct points_table *t = base_alloc(sizeof *t);
    memset(t, 0, sizeof *t);
    text_init(&t->bytes);
    out->table = t;
    text why;
    text_init(&why);
    span at = {0, 0};
    tw_status status = TW_OK;
    if (!file_read(path, &t->bytes, &why)) {
        status = request_fail(s, place, ERROR_FILE, "%s", why.bytes);
    } else if (t->bytes.length > SOURCE_LENGTH_LIMIT) {
        status = request_fail(s, place, ERROR_FILE, "\"%s\" is longer than 4 GiB", path);
    } else {
        source_init(&t->source, path, t->bytes.bytes, t->bytes.length);
        if (!csv_read(&t->source, &t->cells, &at, &why)) status = fail_in_table(s, out, at, place, why.bytes);
        else if (t->cells.count == 0)
            status = request_fail(s, place, ERROR_FILE, "\"%s\" is empty: its first line must name the parameters", path);
    }
    text_clear(&why);
    return status;
}

static tw_status read_heading(session *s, points *out, span place, const points_use *use)
{
    const csv_table *t = &out->table->cells;
    out->symbols = base_alloc(t->width * sizeof *out->symbols);
    for (size_t c = 0; c < t->width; c++) {
        const csv_cell *cell = &t->cells[c];
        if (!*cell->words)
            return fail_in_table(s, out, (span){cell->at.from, cell->at.from + 1}, place,
                                 "the heading must name a parameter here");
        if (t->width == 1 && strpbrk(cell->words, ";\t"))
            return fail_in_table(s, out, cell->at, place, "the cells of a table are separated by commas");
        expr *symbol;
        if (read_symbol(s, out, (syntax_name){cell->words, place}, use, &symbol) != TW_OK)
            return fail_in_table(s, out, cell->at, place, NULL);
        out->symbols[out->width++] = symbol;
    }
    return TW_OK;
}

/* A cell as an expression of the language with a fixed value. */
static tw_status read_cell(session *s, const points *p, size_t column, const csv_cell *cell, span place, expr **out)
{
    const char *symbol = p->symbols[column]->is.name;
    text words;
    text_init(&words);
    source part;
    source_init(&part, p->table->source.name, cell->words, strlen(cell->words));
    syntax_text tree;
    syntax_text_init(&tree);
    tw_status status = TW_OK;
    syntax *x = *cell->words ? parse_expression_text(&part, &tree) : NULL;
    span at = cell->at;
    if (at.to == at.from) at.to++;
    if (!*cell->words) text_addf(&words, "the value of `%s` is missing", symbol);
    else if (!x)
        text_addf(&words, "\"%.40s\" is no value for `%s`: %s", cell->words, symbol,
                  tree.error_count ? tree.errors[0].words : "it cannot be read");
    if (words.length > 0 || read_value(s, x, out) != TW_OK)
        status = fail_in_table(s, p, at, place, words.length ? words.bytes : NULL);
    syntax_text_clear(&tree);
    text_clear(&words);
    return status;
}

static tw_status read_rows(session *s, points *out, span place, const points_use *use)
{
    const csv_table *t = &out->table->cells;
    size_t rows = t->count / t->width - 1;
    if (rows == 0) return request_fail(s, place, ERROR_FILE, "\"%s\" holds no row below its heading", out->table->source.name);
    if (rows > POINTS_LIMIT)
        return fail_in_table(s, out, t->cells[(POINTS_LIMIT + 1) * t->width].at, place, "these are more than 100000 points");
    out->values = base_alloc(rows * t->width * sizeof *out->values);
    for (size_t k = 0; k < rows; k++) {
        if (!budget_ok(s->e)) return request_fail_at(s, place);
        for (size_t c = 0; c < t->width; c++)
            if (read_cell(s, out, c, &t->cells[(k + 1) * t->width + c], place, &out->values[k * t->width + c]) != TW_OK)
                return TW_ERROR;
        out->count = k + 1;
        if (facts_allow(s, out, k, place, use) != TW_OK) return fail_in_table(s, out, row_span(out, k), place, NULL);
    }
    return TW_OK;
}

tw_status points_read_file(session *s, points *out, const char *path, span place, const points_use *use)
{
    memset(out, 0, sizeof *out);
    if (open_table(s, out, path, place) != TW_OK || read_heading(s, out, place, use) != TW_OK) return TW_ERROR;
    if (all_have_values(s, out, place, use) != TW_OK)
        return fail_in_table(s, out, (span){out->table->cells.cells[0].at.from, out->table->cells.cells[out->width - 1].at.to},
                             place, NULL);
    return read_rows(s, out, place, use);
}

/* ---- any points ---- */

void points_clear(points *p)
{
    if (p->table) {
        csv_clear(&p->table->cells);
        text_clear(&p->table->bytes);
        free(p->table);
    }
    free(p->symbols);
    free(p->values);
    memset(p, 0, sizeof *p);
}

env points_at(const points *p, size_t k)
{
    return (env){p->width, p->symbols, p->values + k * p->width};
}

/* q as a decimal with at most SHORT places, when it is one. */
static bool add_short_decimal(text *out, const fmpq_t q)
{
    enum { SHORT = 12 };
    fmpz_t whole, ten_k;
    fmpz_init(whole);
    fmpz_init(ten_k);
    fmpz_set_ui(ten_k, 10);
    fmpz_pow_ui(ten_k, ten_k, SHORT);
    bool good = fmpz_divisible(ten_k, fmpq_denref(q));
    if (good) {
        fmpz_divexact(ten_k, ten_k, fmpq_denref(q));
        fmpz_mul(whole, ten_k, fmpq_numref(q));
        if (fmpz_sgn(whole) < 0) text_add_char(out, '-');
        fmpz_abs(whole, whole);
        char *digits = fmpz_get_str(NULL, 10, whole);
        size_t length = strlen(digits), before = length > SHORT ? length - SHORT : 0, after = length;
        while (after > before && digits[after - 1] == '0') after--;
        if (before == 0) text_add_char(out, '0');
        text_add_bytes(out, digits, before);
        if (after > before) {
            text_add_char(out, '.');
            for (size_t k = length; k < SHORT; k++) text_add_char(out, '0');
            text_add_bytes(out, digits + before, after - before);
        }
        flint_free(digits);
    }
    fmpz_clear(ten_k);
    fmpz_clear(whole);
    return good;
}

void points_print_value(session *s, text *out, const points *p, size_t k, size_t c)
{
    expr *x = p->values[k * p->width + c];
    if (p->table) text_add(out, p->table->cells.cells[(k + 1) * p->width + c].words);
    else if (!expr_is_number(x) || !add_short_decimal(out, expr_number(x))) expr_print(s->e, out, x);
}

void points_blame(session *s, const points *p, size_t k)
{
    error_kind kind = s->e->error.kind;
    if (error_is_fatal(kind)) return;
    if (p->table) {
        session_blame(s, &p->table->source, row_span(p, k));
        return;
    }
    text words;
    text_init(&words);
    for (size_t c = 0; c < p->width; c++) {
        text_addf(&words, "%s%s = ", c ? ", " : "at ", p->symbols[c]->is.name);
        points_print_value(s, &words, p, k, c);
    }
    text_addf(&words, ": %s", s->e->error.words);
    engine_forgive(s->e);
    engine_fail(s->e, kind, "%s", words.bytes);
    text_clear(&words);
}
