/* Requests for numbers: evaluate and compare. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "lang/describe.h"
#include "lang/file.h"
#include "lang/request.h"

enum { SHOWN_DIGITS = 1000, EXTRA_DIGITS = 2, LABEL_COUNT = LABEL_UNKNOWN + 1 };

/* ---- one number ---- */

/* What an evaluation is of, and how. */
typedef struct task {
    subject x;
    points points;
    evaluate_options options;
    slong digits; /* of quadrature */
    bool typed_digits;
} task;

static bool holds_kind(expr *a, expr_kind kind)
{
    if (a->kind == kind) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_kind(a->args[k], kind)) return true;
    return false;
}

static const char *way_of(expr *a)
{
    if (holds_kind(a, EXPR_INTEGRAL) || holds_kind(a, EXPR_CONTOUR)) return "quadrature";
    return holds_kind(a, EXPR_SUMMATION) ? "summation" : "evaluation";
}

static tw_status find_number(session *s, number *out, const task *t, const env *at)
{
    if (t->x.kept) return evaluate_expansion(s->e, out, &t->x.kept->expansion, at, &t->options);
    out->label = LABEL_PROVED;
    out->way = way_of(t->x.expression);
    out->terms = -1;
    out->least_term = -1;
    if (quadrature(s->e, out->value, t->x.expression, at, t->digits, !t->typed_digits, NULL) != TW_OK) return TW_ERROR;
    if (!conditions_all_sure(&s->rests)) {
        out->label = LABEL_CONDITIONAL;
        conditions_append(&out->conditions, &s->rests);
    }
    if (acb_is_finite(out->value)) return TW_OK;
    return engine_fail(s->e, ERROR_PRECISION, "the value cannot be enclosed: it is not finite, or beyond every exponent");
}

/* Significant digits to print: what the ball is worth, and of a quadrature not many more than were asked for. */
static slong digits_shown(const task *t)
{
    if (t->x.kept) return t->options.digits > 0 ? t->options.digits + EXTRA_DIGITS : SHOWN_DIGITS;
    return t->digits + EXTRA_DIGITS;
}

/* The name of the least term: c[n] of its lane; its place in the order of size where that is not to be had. */
static tw_status add_least_term(session *s, text *out, expansion *a, slong least)
{
    size_t dominant = 0, which = 0;
    for (size_t k = 0; k < a->contribution_count; k++)
        if (a->contributions[k].dominant) {
            dominant++;
            which = k;
        }
    term *terms = NULL;
    slong found = 0;
    if (dominant == 1 && expansion_order(s->e, a, which, least + 1, &terms, &found) != TW_OK) {
        if (s->e->error.kind != ERROR_UNDECIDED) return TW_ERROR;
        engine_forgive(s->e);
        terms = NULL;
    }
    if (terms && found > least) {
        text_addf(out, "c[%ld]", (long)terms[least].n);
        if (a->contributions[which].lane_count > 1) {
            text_add(out, " of the lane ");
            const lane *l = &a->contributions[which].lanes[terms[least].lane];
            expr_print(s->e, out, l->constant);
            if (l->log_power) text_addf(out, ", log(%s)^%ld", a->large->is.name, (long)l->log_power);
        }
    } else {
        text_addf(out, "number %ld in order of size", (long)least + 1);
    }
    free(terms);
    return TW_OK;
}

static tw_status tell_terms(session *s, result *r, const task *t, const number *n)
{
    if (!t->x.kept || n->terms < 0) return TW_OK;
    text line;
    text_init(&line);
    text_addf(&line, "  %ld of %ld terms kept", (long)n->terms, (long)n->terms_known);
    tw_status status = TW_OK;
    if (n->least_term >= 0) {
        text_add(&line, "; the least term is ");
        status = add_least_term(s, &line, &t->x.kept->expansion, n->least_term);
    }
    const expansion *a = &t->x.kept->expansion;
    if (a->contribution_count > 0 && strcmp(a->contributions[0].method, "phase") == 0 && n->label == LABEL_PROVED)
        text_add(&line, "; what they leave was enclosed by certified quadrature");
    result_line(r, "%s", line.bytes);
    text_clear(&line);
    return status;
}

static tw_status tell_number(session *s, result *r, const task *t, const number *n)
{
    text value_words;
    text_init(&value_words);
    describe_value(&value_words, n->value, digits_shown(t));
    result_labelled(r, value_words.bytes, label_word(n->label), n->manner);
    text_clear(&value_words);
    if (tell_terms(s, r, t, n) != TW_OK) return TW_ERROR;
    if (strcmp(n->way, "quadrature") == 0) result_line(r, "  certified quadrature");
    if (n->reason) result_prose(r, "  not proved: %s", n->reason);
    if (!conditions_all_sure(&n->conditions)) result_conditions(r, &n->conditions);
    return TW_OK;
}

static tw_status evaluate_one(session *s, result *r, const task *t)
{
    env at = points_at(&t->points, 0);
    number n;
    number_init(&n);
    tw_status status = find_number(s, &n, t, &at);
    if (status == TW_OK) {
        text object;
        text_init(&object);
        json_number(&object, t->x.name, &at, &n, s->e);
        result_object(r, object.bytes);
        if (s->let_name) result_string(r, "name", s->let_name);
        text_clear(&object);
        status = tell_number(s, r, t, &n);
    }
    number_clear(&n);
    return status;
}

/* ---- several ---- */

/* Numbers at many points, in the three forms that may be wanted. */
typedef struct listing {
    table rows;    /* for people */
    text json, csv;
    size_t known[LABEL_COUNT]; /* how many of each label */
} listing;

static void listing_init(listing *l, const task *t)
{
    memset(l, 0, sizeof *l);
    table_init(&l->rows, t->points.width + 2);
    text_init(&l->json);
    text_init(&l->csv);
    for (size_t c = 0; c < t->points.width; c++) {
        table_cell(&l->rows, t->points.symbols[c]->is.name);
        csv_field(&l->csv, t->points.symbols[c]->is.name);
        text_add_char(&l->csv, ',');
    }
    table_cell(&l->rows, "value");
    table_cell(&l->rows, "label");
    text_add(&l->csv, "re_mid,re_radius,im_mid,im_radius,label,manner,way,terms,least_term,reason,conditions\r\n");
    text_add_char(&l->json, '[');
}

static void listing_clear(listing *l)
{
    table_clear(&l->rows);
    text_clear(&l->json);
    text_clear(&l->csv);
}

static void add_csv_count(text *out, slong n)
{
    if (n >= 0) text_addf(out, "%ld", (long)n);
    text_add_char(out, ',');
}

static void add_csv_words(text *out, const char *words)
{
    if (words) csv_field(out, words);
    text_add_char(out, ',');
}

static void add_csv_ball(text *out, const arb_t x)
{
    text mid, radius;
    text_init(&mid);
    text_init(&radius);
    decimal_ball(&mid, &radius, x);
    text_addf(out, "%s,%s,", mid.bytes, radius.bytes);
    text_clear(&mid);
    text_clear(&radius);
}

static void add_csv_conditions(text *out, const condition_list *conditions)
{
    text words;
    text_init(&words);
    for (size_t k = 0; k < conditions->count; k++)
        text_addf(&words, "%s%s (%s)", k ? "; " : "", conditions->list[k].words,
                  condition_label_word(conditions->list[k].label));
    csv_field(out, words.bytes);
    text_clear(&words);
}

static void add_csv_row(session *s, text *out, const task *t, size_t k, const number *n)
{
    for (size_t c = 0; c < t->points.width; c++) {
        text cell;
        text_init(&cell);
        points_print_value(s, &cell, &t->points, k, c);
        add_csv_words(out, cell.bytes);
        text_clear(&cell);
    }
    add_csv_ball(out, acb_realref(n->value));
    add_csv_ball(out, acb_imagref(n->value));
    add_csv_words(out, label_word(n->label));
    add_csv_words(out, n->manner);
    add_csv_words(out, n->way);
    add_csv_count(out, n->terms);
    add_csv_count(out, n->least_term);
    add_csv_words(out, n->reason);
    add_csv_conditions(out, &n->conditions);
    text_add(out, "\r\n");
}

static void add_table_row(session *s, table *rows, const task *t, size_t k, const number *n)
{
    text cell;
    text_init(&cell);
    for (size_t c = 0; c < t->points.width; c++) {
        points_print_value(s, &cell, &t->points, k, c);
        table_take(rows, &cell);
    }
    describe_value(&cell, n->value, digits_shown(t));
    table_take(rows, &cell);
    text_add(&cell, label_word(n->label));
    if (n->manner) text_addf(&cell, ", %s", n->manner);
    table_take(rows, &cell);
}

static tw_status add_number(session *s, listing *l, const task *t, size_t k, bool to_file)
{
    env at = points_at(&t->points, k);
    number n;
    number_init(&n);
    tw_status status = find_number(s, &n, t, &at);
    if (status == TW_OK) {
        l->known[n.label]++;
        if (to_file) {
            add_csv_row(s, &l->csv, t, k, &n);
        } else {
            add_table_row(s, &l->rows, t, k, &n);
            json_next(&l->json);
            json_number(&l->json, t->x.name, &at, &n, s->e);
        }
    } else {
        points_blame(s, &t->points, k);
    }
    number_clear(&n);
    return status;
}

static void tell_progress(session *s, const task *t, size_t k)
{
    if (k % 16 != 0) return;
    text words;
    text_init(&words);
    text_addf(&words, "point %zu of %zu", k + 1, t->points.count);
    engine_progress(s->e, words.bytes);
    text_clear(&words);
}

static tw_status put_file(session *s, result *r, const task *t, listing *l, const char *file)
{
    text words, json;
    text_init(&words);
    tw_status status = TW_OK;
    if (!file_write(file, l->csv.bytes, l->csv.length, &words)) status = engine_fail(s->e, ERROR_FILE, "%s", words.bytes);
    text_cut(&words, 0);
    text_init(&json);
    text_add_char(&json, '{');
    for (int k = 0; k < LABEL_COUNT; k++) {
        if (l->known[k] == 0) continue;
        text_addf(&words, "%s%zu %s", words.length ? ", " : "", l->known[k], label_word((label)k));
        json_member(&json, label_word((label)k));
        text_addf(&json, "%zu", l->known[k]);
    }
    text_add_char(&json, '}');
    result_restart(r, "file");
    result_string(r, "of", t->x.name);
    result_string(r, "format", "csv");
    result_string(r, "file", file);
    result_integer(r, "bytes", (long)l->csv.length);
    result_integer(r, "rows", (long)t->points.count);
    result_json(r, "labels", json.bytes);
    result_line(r, "%s at %zu %s written to \"%s\": %s", t->x.name, t->points.count, t->points.count == 1 ? "point" : "points",
                file, words.bytes);
    text_clear(&words);
    text_clear(&json);
    return status;
}

/* to_file: NULL, or the file that gets them as CSV. */
static tw_status evaluate_several(session *s, result *r, const task *t, const char *to_file)
{
    listing l;
    listing_init(&l, t);
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < t->points.count; k++) {
        tell_progress(s, t, k);
        status = budget_ok(s->e) ? TW_OK : TW_ERROR;
        if (status == TW_OK) status = add_number(s, &l, t, k, to_file != NULL);
    }
    text_add_char(&l.json, ']');
    if (status == TW_OK && to_file) {
        status = put_file(s, r, t, &l, to_file);
    } else if (status == TW_OK) {
        result_restart(r, "numbers");
        result_string(r, "of", t->x.name);
        result_json(r, "rows", l.json.bytes);
        if (s->let_name) result_string(r, "name", s->let_name);
        table_print(&l.rows, &r->words, "  ");
    }
    listing_clear(&l);
    return status;
}

/* ---- evaluate ---- */

static tw_status read_options(session *s, const statement *st, task *t)
{
    const syntax *digits = st->as.evaluate->digits, *terms = st->as.evaluate->terms;
    t->digits = s->digits;
    t->options = (evaluate_options){0, -1, st->as.evaluate->all_contributions};
    t->typed_digits = digits != NULL;
    if (digits && session_lower_count(s, digits, "the number of digits", 1, SESSION_DIGITS_LIMIT, &t->digits) != TW_OK)
        return TW_ERROR;
    if (digits) t->options.digits = t->digits;
    if (terms && session_lower_count(s, terms, "the number of terms", 0, 1000000, &t->options.terms) != TW_OK) return TW_ERROR;
    if (t->x.kept) return TW_OK;
    if (terms) return request_fail(s, terms->at, ERROR_VALUE, "`with M terms` is for an expansion; `%s` is none", t->x.name);
    if (st->as.evaluate->all_contributions)
        return request_fail(s, st->at, ERROR_VALUE, "`with all contributions` is for an expansion; `%s` is none", t->x.name);
    return TW_OK;
}

/* file: a table of points, or NULL: the bindings. */
static tw_status read_points(session *s, const syntax_bindings *at, const char *file, span place, task *t)
{
    points_use use = {t->x.name, t->x.kept ? t->x.kept->expansion.integral : t->x.expression, NULL, 0};
    expr **known = NULL;
    if (t->x.kept) {
        use.facts = t->x.kept->expansion.facts;
        use.fact_count = t->x.kept->expansion.fact_count;
    } else {
        condition_label label_of_fact;
        use.fact_count = facts_count(s->e);
        use.facts = known = base_alloc((use.fact_count + 1) * sizeof *known);
        for (size_t k = 0; k < use.fact_count; k++) known[k] = facts_at(s->e, k, &label_of_fact);
    }
    tw_status status = file ? points_read_file(s, &t->points, file, place, &use) : points_read(s, &t->points, at, place, &use);
    free(known);
    return status;
}

tw_status request_evaluate(session *s, const statement *st, result *r, value **keep)
{
    const syntax *subject_words = st->as.evaluate->subject;
    task t;
    memset(&t, 0, sizeof t);
    if (subject_read(s, &t.x, subject_words) != TW_OK) return TW_ERROR;
    tw_status status = TW_OK;
    if (t.x.kept && t.x.kept->kind != VALUE_EXPANSION)
        status = request_fail(s, subject_words->at, ERROR_VALUE, "`%s` is %s, which has no value at a point", t.x.name,
                              t.x.kept->what);
    if (status == TW_OK) status = read_options(s, st, &t);
    if (status == TW_OK) status = read_points(s, &st->as.evaluate->at, st->as.evaluate->points_file, subject_words->at, &t);
    bool single = t.points.count == 1 && !t.points.table && !st->as.evaluate->to_file;
    if (status == TW_OK) {
        status = single ? evaluate_one(s, r, &t) : evaluate_several(s, r, &t, st->as.evaluate->to_file);
        if (status != TW_OK) request_fail_at(s, subject_words->at);
    }
    if (status == TW_OK && keep) *keep = value_of_result(r, single ? "a number" : "a table of numbers");
    points_clear(&t.points);
    subject_clear(&t.x);
    return status;
}

/* ---- compare ---- */

static void take_decimal(table *t, const acb_t x, slong digits)
{
    text cell;
    text_init(&cell);
    describe_decimal(&cell, x, digits);
    table_take(t, &cell);
}

static void take_real(table *t, const arb_t x, slong digits)
{
    acb_t z;
    acb_init(z);
    acb_set_arb(z, x);
    take_decimal(t, z, digits);
    acb_clear(z);
}

/* bound/|error| as an interval; false when the error's ball holds 0, then *ratio is a lower bound of it. */
static bool find_ratio(arb_t ratio, const comparison_row *row)
{
    arb_t size;
    arf_t low;
    arb_init(size);
    arf_init(low);
    acb_abs(size, row->error, 64);
    arb_get_lbound_arf(low, size, 64);
    bool known = arf_sgn(low) > 0;
    if (!known) {
        arb_get_ubound_arf(low, size, 64);
        arb_set_arf(size, low);
    }
    arb_div(ratio, row->bound, size, 64);
    arf_clear(low);
    arb_clear(size);
    return known;
}

static void take_ratio(table *t, text *json, const comparison_row *row)
{
    arb_t ratio;
    arb_init(ratio);
    text cell;
    text_init(&cell);
    json_member(json, "ratio");
    bool known = find_ratio(ratio, row);
    if (!arb_is_finite(ratio)) {
        text_add(&cell, "-");
        text_add(json, "null");
    } else if (known) {
        char *words = arb_get_str(ratio, 3, ARB_STR_NO_RADIUS);
        text_add(&cell, words);
        flint_free(words);
        json_ball(json, ratio);
    } else { /* the error is not resolved: only a lower bound of the ratio is known */
        arf_t low;
        arf_init(low);
        arb_get_lbound_arf(low, ratio, 64);
        text_addf(&cell, "> %.3g", arf_get_d(low, ARF_RND_DOWN));
        text_add(json, "null");
        arf_clear(low);
    }
    table_take(t, &cell);
    arb_clear(ratio);
}

static void add_complex(text *json, const char *name, const acb_t x)
{
    json_member(json, name);
    text_add(json, "{\"re\": ");
    json_ball(json, acb_realref(x));
    text_add(json, ", \"im\": ");
    json_ball(json, acb_imagref(x));
    text_add_char(json, '}');
}

static void add_at(session *s, text *json, const env *at)
{
    json_member(json, "at");
    text_add_char(json, '{');
    for (size_t k = 0; k < at->count; k++) {
        json_member(json, at->symbols[k]->is.name);
        json_expr(s->e, json, at->values[k]);
    }
    text_add_char(json, '}');
}

static void add_comparison_row(session *s, table *t, text *json, const env *at, const comparison_row *row, bool best)
{
    text cell;
    text_init(&cell);
    text_addf(&cell, "%ld%s", (long)row->terms, best ? " *" : "");
    table_take(t, &cell);
    take_decimal(t, row->sum, s->digits);
    take_decimal(t, row->error, 3);
    take_real(t, row->bound, 3);
    json_next(json);
    text_add_char(json, '{');
    add_at(s, json, at);
    json_member(json, "terms");
    text_addf(json, "%ld", (long)row->terms);
    add_complex(json, "term", row->term);
    add_complex(json, "sum", row->sum);
    add_complex(json, "value", row->value);
    add_complex(json, "error", row->error);
    json_member(json, "bound");
    json_ball(json, row->bound);
    take_ratio(t, json, row);
    json_member(json, "label");
    json_string(json, label_word(row->label));
    json_member(json, "best");
    text_add(json, best ? "true" : "false");
    json_member(json, "violated");
    text_add(json, row->violated ? "true" : "false");
    text_add_char(json, '}');
    table_cell(t, row->violated ? "VIOLATED" : label_word(row->label));
}

static void add_title(session *s, result *r, const comparison *c, const env *at)
{
    text line;
    text_init(&line);
    text_add(&line, "at ");
    for (size_t k = 0; k < at->count; k++) {
        text_addf(&line, "%s%s = ", k ? ", " : "", at->symbols[k]->is.name);
        expr_print(s->e, &line, at->values[k]);
    }
    if (c->count > 0) {
        text_add(&line, " the value is ");
        describe_decimal(&line, c->rows[0].value, s->digits + EXTRA_DIGITS);
    }
    result_line(r, "%s", line.bytes);
    text_clear(&line);
}

static tw_status compare_point(session *s, result *r, text *json, const task *t, size_t k, bool *violated)
{
    static const char *const headings[] = {"terms", "partial sum", "error", "bound", "bound/error", "label"};
    env at = points_at(&t->points, k);
    comparison c;
    comparison_init(&c);
    tw_status status = compare_expansion(s->e, &c, &t->x.kept->expansion, &at);
    if (status == TW_OK) {
        table rows;
        table_init(&rows, 6);
        for (size_t h = 0; h < 6; h++) table_cell(&rows, headings[h]);
        for (size_t n = 0; n < c.count; n++) {
            add_comparison_row(s, &rows, json, &at, &c.rows[n], (slong)n == c.best);
            *violated = *violated || c.rows[n].violated;
        }
        add_title(s, r, &c, &at);
        table_print(&rows, &r->words, "  ");
        table_clear(&rows);
    }
    comparison_clear(&c);
    return status;
}

static tw_status compare_all(session *s, result *r, const task *t, bool *violated)
{
    result_restart(r, "comparison");
    result_string(r, "of", t->x.name);
    text json;
    text_init(&json);
    text_add_char(&json, '[');
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < t->points.count; k++) status = compare_point(s, r, &json, t, k, violated);
    text_add_char(&json, ']');
    result_json(r, "rows", json.bytes);
    text_clear(&json);
    return status;
}

tw_status request_compare(session *s, const statement *st, result *r, value **keep)
{
    task t;
    memset(&t, 0, sizeof t);
    const syntax *subject_words = st->as.compare.subject;
    if (subject_read_expansion(s, &t.x, subject_words) != TW_OK) return TW_ERROR;
    bool violated = false;
    tw_status status = read_points(s, &st->as.compare.at, NULL, subject_words->at, &t);
    if (status == TW_OK && compare_all(s, r, &t, &violated) != TW_OK) {
        result_restart(r, "comparison");
        status = request_fail_at(s, subject_words->at);
    }
    if (status == TW_OK && violated)
        status = request_fail(s, subject_words->at, ERROR_REFUTED,
                              "a proved bound is contradicted by the certified value: this is an error of the program");
    if (status == TW_OK && keep) *keep = value_of_result(r, "a comparison");
    points_clear(&t.points);
    subject_clear(&t.x);
    return status;
}
