/* Words for expansions: the series in one line, tables of coefficients, steps, bounds. The one idea: the engine's structs are
 * walked here and nowhere else in this room, so that expand, show and coefficients say the same thing in the same form. Draws
 * no mathematics: what is printed was computed by the engine. */
#include "lang/describe.h"

#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"
#include "engine/expr/root_names.h"
#include "engine/method/method.h"

enum { TERMS_SHOWN = 4, NOTE_COLUMN = 54 };

/* ---- numbers ---- */

void describe_value(text *out, const acb_t z, slong digits)
{
    if (arb_is_zero(acb_imagref(z))) {
        print_ball(out, acb_realref(z), digits);
        return;
    }
    if (!arb_is_zero(acb_realref(z))) {
        text_add_char(out, '(');
        print_ball(out, acb_realref(z), digits);
        text_add(out, ") + ");
    }
    text_add_char(out, '(');
    print_ball(out, acb_imagref(z), digits);
    text_add(out, ")*i");
}

static void add_decimal(text *out, const arb_t x, slong digits)
{
    if (!arb_is_finite(x) || (arb_contains_zero(x) && !arb_is_zero(x))) {
        print_ball(out, x, digits);
        return;
    }
    char *words = arb_get_str(x, digits, ARB_STR_NO_RADIUS);
    text_add(out, words);
    flint_free(words);
}

void describe_decimal(text *out, const acb_t z, slong digits)
{
    add_decimal(out, acb_realref(z), digits);
    if (arb_is_zero(acb_imagref(z))) return;
    text_add(out, " + (");
    add_decimal(out, acb_imagref(z), digits);
    text_add(out, ")*i");
}

/* ---- the series ---- */

static void add_expr(session *s, text *out, expr *a, bool brackets)
{
    if (!a) return;
    if (brackets) text_add_char(out, '(');
    expr_print(s->e, out, a);
    if (brackets) text_add_char(out, ')');
}

/* One more term of a sum, its sign in front. */
static void add_term(session *s, text *out, expr *a, bool first)
{
    text words;
    text_init(&words);
    add_expr(s, &words, a, a && a->kind == EXPR_SUM);
    if (words.length > 0 && words.bytes[0] == '-') {
        text_add(out, first ? "-" : " - ");
        text_add(out, words.bytes + 1);
    } else if (words.length > 0) {
        text_add(out, first ? "" : " + ");
        text_add(out, words.bytes);
    }
    text_clear(&words);
}

static slong count_terms(const contribution *c)
{
    slong count = 0;
    for (size_t l = 0; l < c->lane_count; l++)
        for (slong n = 0; n < c->lanes[l].c.count; n++)
            if (!coefficient_is_zero(&c->lanes[l].c, n)) count++;
    return count;
}

/* The first terms in the order of the lanes, where an order of size cannot be decided. */
static slong terms_by_lane(const contribution *c, slong wanted, term **terms)
{
    slong found = 0;
    *terms = base_alloc((size_t)wanted * sizeof **terms);
    for (size_t l = 0; l < c->lane_count; l++)
        for (slong n = 0; n < c->lanes[l].c.count && found < wanted; n++)
            if (!coefficient_is_zero(&c->lanes[l].c, n)) (*terms)[found++] = (term){l, n};
    return found;
}

static tw_status first_terms(session *s, expansion *a, size_t k, term **terms, slong *found)
{
    const contribution *c = &a->contributions[k];
    slong wanted = count_terms(c);
    if (wanted > TERMS_SHOWN) wanted = TERMS_SHOWN;
    if (wanted == 0) {
        *terms = NULL;
        *found = 0;
        return TW_OK;
    }
    if (expansion_order(s->e, a, k, wanted, terms, found) == TW_OK) return TW_OK;
    if (s->e->error.kind != ERROR_UNDECIDED) return TW_ERROR;
    engine_forgive(s->e);
    *found = terms_by_lane(&a->contributions[k], wanted, terms);
    return TW_OK;
}

static tw_status add_contribution(session *s, text *out, expansion *a, size_t k)
{
    term *terms;
    slong found;
    if (first_terms(s, a, k, &terms, &found) != TW_OK) return TW_ERROR;
    const contribution *c = &a->contributions[k];
    bool more = !c->terminates || (a->remainder && !expr_is_zero(a->remainder)) || count_terms(c) > found;
    bool factor = !expr_is_one(c->prefactor);
    bool brackets = factor && (found > 1 || more);
    bool one = found == 1 && !more && expr_is_one(expansion_term(s->e, a, k, terms[0])); /* the prefactor is all */
    if (factor) {
        add_expr(s, out, c->prefactor, c->prefactor->kind == EXPR_SUM);
        text_add(out, brackets ? "*(" : one ? "" : "*");
    }
    for (slong n = 0; n < found && !(factor && one); n++)
        add_term(s, out, expansion_term_shown(s->e, a, k, terms[n]), n == 0);
    if (found == 0) text_add_char(out, '0');
    if (more) text_add(out, " + ...");
    if (brackets) text_add_char(out, ')');
    free(terms);
    return s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static void add_place(session *s, text *out, const contribution *c)
{
    if (!c->place) {
        text_add(out, "the form");
        return;
    }
    if (c->variable) expr_print(s->e, out, c->variable);
    text_add(out, " = ");
    expr_print(s->e, out, c->place);
}

static const char *method_title(const char *name)
{
    const method *m = name ? method_find(name) : NULL;
    return m ? m->title : name ? name : "";
}

/* "(Watson's lemma at x = 0)" behind the series in its own column. */
static void add_note(session *s, text *out, const expansion *a)
{
    const contribution *first = NULL;
    for (size_t k = 0; k < a->contribution_count && !first; k++)
        if (a->contributions[k].dominant) first = &a->contributions[k];
    if (!first) return;
    text_add(out, "  ");
    while (out->length < NOTE_COLUMN) text_add_char(out, ' ');
    if (!first->place) {
        text_add(out, "(a derivation by hand)");
        return;
    }
    text_addf(out, "(%s at ", method_title(first->method));
    add_place(s, out, first);
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        if (!c->dominant || c == first || c->place == a->contributions[k - 1].place) continue;
        text_add(out, ", ");
        add_place(s, out, c);
    }
    text_add_char(out, ')');
}

static tw_status add_lesser(session *s, result *r, expansion *a, size_t k)
{
    text line;
    text_init(&line);
    text_add(&line, a->contributions[k].on_stokes_line ? "  on a Stokes line, from " : "  subdominant, from ");
    add_place(s, &line, &a->contributions[k]);
    text_add(&line, ": ");
    tw_status status = add_contribution(s, &line, a, k);
    if (status == TW_OK) result_expression(r, "%s", line.bytes);
    text_clear(&line);
    return status;
}

/* ---- names of algebraic numbers ---- */

static void begin_names(session *s, root_names *n, const expansion *a)
{
    root_names_init(n);
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        root_names_collect(n, c->place, a->integral);
        root_names_collect(n, c->prefactor, a->integral);
        for (size_t l = 0; l < c->lane_count; l++) {
            root_names_collect(n, c->lanes[l].constant, a->integral);
            for (slong j = 0; c->lanes[l].c.x && j < c->lanes[l].c.count; j++)
                root_names_collect(n, c->lanes[l].c.x[j], a->integral);
        }
    }
    s->e->root_names = n;
}

/* A line for each name: what it stands for. */
static void end_names(session *s, result *r, root_names *n)
{
    s->e->root_names = NULL;
    for (size_t k = 0; k < n->count; k++) {
        char *words = expr_text(s->e, n->roots[k]);
        acb_t z;
        acb_init(z);
        if (words && ball_value(s->e, z, n->roots[k], 128) == TW_OK) {
            text digits;
            text_init(&digits);
            add_decimal(&digits, acb_realref(z), 12);
            result_expression(r, "  with %s = %s, which is %s...", n->names[k], words, digits.bytes);
            text_clear(&digits);
        }
        acb_clear(z);
        free(words);
    }
    root_names_clear(n);
}

static tw_status describe_series_named(session *s, result *r, const char *name, expansion *a)
{
    text line;
    text_init(&line);
    text_addf(&line, "%s %s ", name, a->exact ? "=" : "~");
    bool first = true;
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < a->contribution_count; k++) {
        if (!a->contributions[k].dominant) continue;
        if (!first) text_add(&line, " + ");
        first = false;
        status = add_contribution(s, &line, a, k);
    }
    if (first) text_add_char(&line, '0');
    add_note(s, &line, a);
    if (status == TW_OK) result_expression(r, "%s", line.bytes);
    text_clear(&line);
    for (size_t k = 0; status == TW_OK && k < a->contribution_count; k++)
        if (!a->contributions[k].dominant) status = add_lesser(s, r, a, k);
    if (status == TW_OK && !conditions_all_sure(&a->conditions)) result_conditions(r, &a->conditions);
    return status;
}

tw_status describe_series(session *s, result *r, const char *name, expansion *a)
{
    root_names n;
    begin_names(s, &n, a);
    tw_status status = describe_series_named(s, r, name, a);
    end_names(s, r, &n);
    return status;
}

/* ---- coefficients ---- */

/* More terms until every lane that goes on has its number `to`; lanes share the terms that are asked for, so their number is
 * doubled until it suffices or nothing more comes. */
static bool lanes_reach(const expansion *a, slong to)
{
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        if (!c->dominant || c->terminates) continue;
        for (size_t l = 0; l < c->lane_count; l++)
            if (c->lanes[l].c.count <= to) return false;
    }
    return true;
}

static slong count_all(const expansion *a)
{
    slong count = 0;
    for (size_t k = 0; k < a->contribution_count; k++)
        for (size_t l = 0; l < a->contributions[k].lane_count; l++) count += a->contributions[k].lanes[l].c.count;
    return count;
}

static tw_status reach(session *s, expansion *a, slong to)
{
    slong wanted = to + 1;
    while (!lanes_reach(a, to)) {
        if (!budget_ok(s->e)) return TW_ERROR;
        slong before = count_all(a);
        if (expansion_extend(s->e, a, wanted) != TW_OK) return TW_ERROR;
        if (count_all(a) == before && wanted > 8 * (to + 1)) return TW_OK;
        wanted *= 2;
    }
    return TW_OK;
}

static void add_lane_title(session *s, text *out, const expansion *a, const contribution *c, const lane *l)
{
    text_add(out, "lane of ");
    add_place(s, out, c);
    text_add(out, ": ");
    if (!expr_is_one(c->prefactor)) {
        add_expr(s, out, c->prefactor, c->prefactor->kind == EXPR_SUM);
        text_add(out, " * ");
    }
    add_expr(s, out, l->constant, l->constant->kind == EXPR_SUM);
    if (l->log_power) text_addf(out, " * log(%s)", a->large->is.name);
    if (l->log_power > 1) text_addf(out, "^%ld", (long)l->log_power);
}

void describe_lane_title(session *s, result *r, const expansion *a, const contribution *c, const lane *l)
{
    text title;
    text_init(&title);
    add_lane_title(s, &title, a, c, l);
    result_line(r, "%s", title.bytes);
    text_clear(&title);
}

static bool lane_is_plain(const contribution *c, const lane *l)
{
    return expr_is_one(c->prefactor) && expr_is_one(l->constant) && l->log_power == 0 && c->lane_count == 1;
}

static void add_row(session *s, table *t, text *json, const lane *l, slong n, bool zeros)
{
    fmpq_t shift;
    fmpq_init(shift);
    fmpq_mul_si(shift, l->step, n);
    expr *exponent = expr_add(s->e, l->first_exponent, expr_fmpq(s->e, shift));
    fmpq_clear(shift);
    expr *c = coefficient_expr(s->e, &l->c, n);
    if (!exponent || !c) return;
    if (zeros || !coefficient_is_zero(&l->c, n)) {
        text cell;
        text_init(&cell);
        text_addf(&cell, "%ld", (long)n);
        table_take(t, &cell);
        expr_print(s->e, &cell, exponent);
        table_take(t, &cell);
        expr_print(s->e, &cell, c);
        table_take(t, &cell);
    }
    const root_names *names = s->e->root_names; /* for people only: the result's text parses by itself */
    s->e->root_names = NULL;
    json_next(json);
    text_addf(json, "{\"n\": %ld, \"exponent\": ", (long)n);
    json_expr(s->e, json, exponent);
    text_add(json, ", \"coefficient\": ");
    json_expr(s->e, json, c);
    s->e->root_names = names;
    text_add_char(json, '}');
}

static tw_status add_lane(session *s, result *r, text *json, const expansion *a, const contribution *c, const lane *l,
                          slong from, slong to)
{
    table t;
    table_init(&t, 3);
    table_cell(&t, "n");
    table_cell(&t, "exponent");
    table_cell(&t, "coefficient");
    if (!lane_is_plain(c, l) || a->contribution_count > 1) describe_lane_title(s, r, a, c, l);
    json_next(json);
    text_add(json, "{\"prefactor\": ");
    json_expr(s->e, json, c->prefactor);
    text_add(json, ", \"constant\": ");
    json_expr(s->e, json, l->constant);
    text_addf(json, ", \"log_power\": %ld, \"rows\": [", (long)l->log_power);
    slong last = to < 0 || to >= l->c.count ? l->c.count - 1 : to;
    bool good = true;
    for (slong n = from; good && n <= last; n++) {
        good = budget_ok(s->e);
        if (good) add_row(s, &t, json, l, n, to >= 0);
    }
    text_add(json, "]}");
    table_print(&t, &r->words, "  ");
    table_clear(&t);
    return good && s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

tw_status describe_coefficients(session *s, result *r, expansion *a, slong from, slong to)
{
    if (to >= 0 && reach(s, a, to) != TW_OK) return TW_ERROR;
    text json;
    text_init(&json);
    root_names n;
    begin_names(s, &n, a);
    text_add_char(&json, '[');
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < a->contribution_count; k++)
        for (size_t l = 0; status == TW_OK && l < a->contributions[k].lane_count; l++)
            status = add_lane(s, r, &json, a, &a->contributions[k], &a->contributions[k].lanes[l], from, to);
    text_add_char(&json, ']');
    end_names(s, r, &n);
    result_json(r, "lanes", json.bytes);
    text_clear(&json);
    return status;
}

/* ---- remainder ---- */

/* What the engine remembers of bounds with free parameters was decided from facts that may have changed since. */
static void forget_bounds(expansion *a)
{
    bound_cache_free(a->cache);
    a->cache = NULL;
}

static bool mentions(expr *fact, expr *const *symbols, size_t count)
{
    for (size_t k = 0; k < count; k++)
        if (expr_has(fact, symbols[k])) return true;
    return false;
}

/* The granted facts about the other parameters of the integral into a fresh array; *count of them. */
static expr **find_granted(session *s, const expansion *a, size_t *count, bool *has_parameters)
{
    expr **symbols;
    size_t symbol_count = expr_symbols(a->integral, &symbols), fact_count = facts_count(s->e);
    expr **granted = base_alloc((fact_count + 1) * sizeof *granted);
    *count = 0;
    *has_parameters = false;
    for (size_t k = 0; k < symbol_count; k++) *has_parameters = *has_parameters || symbols[k] != a->large;
    for (size_t k = 0; *has_parameters && k < fact_count; k++) {
        condition_label known;
        expr *fact = facts_at(s->e, k, &known);
        if (known == CONDITION_GRANTED && mentions(fact, symbols, symbol_count)) granted[(*count)++] = fact;
    }
    free(symbols);
    return granted;
}

/* Only what is given stays. */
static void hide_granted(session *s)
{
    size_t count = facts_count(s->e), kept = 0;
    expr **given = base_alloc((count + 1) * sizeof *given), *large;
    large_kind kind = facts_large(s->e, &large);
    for (size_t k = 0; k < count; k++) {
        condition_label known;
        expr *fact = facts_at(s->e, k, &known);
        if (known == CONDITION_GIVEN) given[kept++] = fact;
    }
    facts_clear(s->e);
    facts_init(s->e);
    if (kind != LARGE_NONE) (void)facts_set_large(s->e, large, kind, NULL, NULL);
    for (size_t k = 0; k < kept; k++) (void)facts_add(s->e, given[k], CONDITION_GIVEN);
    free(given);
}

/* Once more with the granted facts: what holds now rests on them. */
static tw_status bound_by_grant(session *s, remainder_bound *bound, expansion *a, slong terms, expr *const *granted,
                                size_t count)
{
    static const env nowhere = {0, NULL, NULL};
    remainder_bound_clear(bound);
    remainder_bound_init(bound);
    forget_bounds(a);
    if (remainder_for_all(s->e, bound, a, &nowhere, terms, NULL) != TW_OK) return TW_ERROR;
    if (bound->label > LABEL_CONDITIONAL) return TW_OK;
    bound->label = LABEL_CONDITIONAL;
    for (size_t k = 0; k < count; k++) {
        char *words = expr_text(s->e, granted[k]);
        conditions_add(&bound->conditions, words, granted[k], CONDITION_GRANTED);
        free(words);
    }
    forget_bounds(a);
    return TW_OK;
}

tw_status describe_find_bound(session *s, remainder_bound *bound, expansion *a, slong terms)
{
    static const env nowhere = {0, NULL, NULL};
    size_t count;
    bool has_parameters;
    expr **granted = find_granted(s, a, &count, &has_parameters);
    if (has_parameters) forget_bounds(a);
    struct facts *all = count > 0 ? facts_copy(s->e) : NULL;
    if (all) hide_granted(s);
    tw_status status = remainder_for_all(s->e, bound, a, &nowhere, terms, NULL);
    if (all) facts_restore(s->e, all);
    if (all && !(status == TW_OK && bound->label <= LABEL_PROVED) && !error_is_fatal(s->e->error.kind)) {
        engine_forgive(s->e);
        status = bound_by_grant(s, bound, a, terms, granted, count);
    }
    free(granted);
    return status;
}

tw_status describe_bound(session *s, remainder_bound *bound, expansion *a)
{
    if (describe_find_bound(s, bound, a, -1) == TW_OK) return TW_OK;
    if (error_is_fatal(s->e->error.kind)) return TW_ERROR;
    remainder_bound_clear(bound);
    remainder_bound_init(bound);
    bound->label = LABEL_UNKNOWN;
    bound->reason = base_copy(s->e->error.words);
    engine_forgive(s->e);
    return TW_OK;
}

void describe_remainder(session *s, result *r, const expansion *a, const remainder_bound *bound)
{
    text line;
    text_init(&line);
    if (bound->bound && !expr_is_zero(bound->bound)) {
        text_addf(&line, "|rest after %ld term%s| <= ", (long)bound->terms, bound->terms == 1 ? "" : "s");
        expr_print(s->e, &line, bound->bound);
        if (bound->from) {
            text_addf(&line, "  for %s %s ", a->large->is.name, a->small ? "<=" : ">=");
            expr_print(s->e, &line, bound->from);
        } else {
            text_addf(&line, "  for all %s > 0", a->large->is.name);
        }
    } else {
        text_add(&line, bound->bound || a->exact ? "nothing remains" : "no bound");
    }
    result_labelled(r, line.bytes, label_word(bound->label), bound->manner);
    text_clear(&line);
    if (bound->source) result_prose(r, "  source: %s", bound->source);
    if (bound->reason) result_prose(r, "  not proved: %s", bound->reason);
    result_conditions(r, &bound->conditions);
}

/* ---- steps ---- */

static void add_step_lines(session *s, result *r, size_t nth, const step *p)
{
    text line;
    text_init(&line);
    text_addf(&line, "%2zu. %s", nth, p->rule);
    if (p->source) text_addf(&line, "  (%s)", p->source);
    result_line(r, "%s", line.bytes);
    if (p->detail) result_prose(r, "      %s", p->detail);
    text_cut(&line, 0);
    if (p->after) expr_print(s->e, &line, p->after);
    else if (p->form) text_add(&line, p->form);
    if (line.length > 0) result_expression(r, "      = %s", line.bytes);
    if (p->remainder) {
        text_cut(&line, 0);
        expr_print(s->e, &line, p->remainder);
        result_expression(r, "      exact remainder: %s", line.bytes);
    }
    for (size_t k = 0; k < p->conditions.count; k++)
        result_line(r, "      needs: %s (%s)", p->conditions.list[k].words,
                    condition_label_word(p->conditions.list[k].label));
    text_clear(&line);
}

static void add_step_object(session *s, text *json, const step *p)
{
    json_next(json);
    text_add(json, "{\"rule\": ");
    json_string(json, p->rule);
    text_add(json, ", \"source\": ");
    json_string(json, p->source);
    text_add(json, ", \"form\": ");
    if (p->after) json_expr(s->e, json, p->after);
    else json_string(json, p->form);
    text_add(json, ", \"detail\": ");
    json_string(json, p->detail);
    text_add(json, ", \"remainder\": ");
    json_expr(s->e, json, p->remainder);
    text_add(json, ", \"conditions\": ");
    json_conditions(json, &p->conditions);
    text_add_char(json, '}');
}

void describe_steps(session *s, result *r, const derivation *d)
{
    text json;
    text_init(&json);
    text_add_char(&json, '[');
    for (size_t k = 0; k < d->count; k++) {
        add_step_lines(s, r, k + 1, &d->steps[k]);
        add_step_object(s, &json, &d->steps[k]);
    }
    text_add_char(&json, ']');
    result_json(r, "steps", json.bytes);
    text_clear(&json);
}

/* ---- the whole ---- */

tw_status describe_object(session *s, result *r, const char *name, expansion *a)
{
    const format *json = format_find("json");
    remainder_bound bound;
    remainder_bound_init(&bound);
    text object;
    text_init(&object);
    tw_status status = describe_bound(s, &bound, a);
    if (status == TW_OK) status = json->write(s->e, &object, name, a, &bound);
    if (status == TW_OK) result_object(r, object.bytes);
    text_clear(&object);
    remainder_bound_clear(&bound);
    return status;
}

static void add_place_lines(session *s, result *r, const expansion *a)
{
    for (size_t k = 0; k < a->contribution_count; k++) {
        const contribution *c = &a->contributions[k];
        text line;
        text_init(&line);
        add_place(s, &line, c);
        result_line(r, "  contribution of %s: %s, %s, by %s%s", line.bytes, point_kind_word(c->kind),
                    c->on_stokes_line ? "on a Stokes line" : c->dominant ? "dominant" : "subdominant", method_title(c->method), c->terminates ? ", ends by itself" : "");
        text_clear(&line);
    }
}

static bool is_listed(const condition_list *list, const condition *c)
{
    for (size_t k = 0; k < list->count; k++)
        if (list->list[k].label == c->label && strcmp(list->list[k].words, c->words) == 0) return true;
    return false;
}

tw_status describe_expansion(session *s, result *r, const char *name, expansion *a)
{
    remainder_bound bound;
    remainder_bound_init(&bound);
    text line;
    text_init(&line);
    expr_print(s->e, &line, a->integral);
    result_expression(r, "%s: expansion of %s", name, line.bytes);
    text_clear(&line);
    result_line(r, "  %s %s", a->small ? "small" : "large", a->large->is.name);
    if (a->why) result_prose(r, "  %s", a->why);
    add_place_lines(s, r, a);
    tw_status status = describe_coefficients(s, r, a, 0, -1);
    if (status == TW_OK) status = describe_bound(s, &bound, a);
    if (status == TW_OK) describe_remainder(s, r, a, &bound);
    if (status == TW_OK) { /* those that the bound has not listed yet */
        condition_list others;
        conditions_init(&others);
        for (size_t k = 0; k < a->conditions.count; k++)
            if (!is_listed(&bound.conditions, &a->conditions.list[k]))
                conditions_add(&others, a->conditions.list[k].words, a->conditions.list[k].relation, a->conditions.list[k].label);
        result_conditions(r, &others);
        conditions_clear(&others);
    }
    remainder_bound_clear(&bound);
    return status;
}
