/* Requests about recurrences: recurrence of A, check recurrence of A, check recurrence EQUATION of A. The one idea: a typed
 * equation is read like any expression once its c[n+j] have become symbols of their own; the engine knows only the factors in
 * front of them. */
#include <stdlib.h>
#include <string.h>

#include "engine/exact/closed_form.h"
#include "engine/exact/recurrence_check.h"
#include "engine/export/format.h"
#include "engine/method/attach.h"
#include "lang/describe.h"
#include "lang/request.h"

enum { COMPARED = 48, SHOWN_VALUES = 6 };

/* ---- recurrence of A ---- */

/* "  order 2, degree 3, for n >= 0 but n = 4; c[0] = 1, c[1] = 1/3" */
static void tell_range(session *s, result *r, const recurrence *found, const lane *l)
{
    text t;
    text_init(&t);
    text_addf(&t, "  order %ld, degree %ld, for %s >= 0", (long)found->order, (long)found->degree, found->n->is.name);
    for (slong k = 0; k < found->void_count; k++)
        text_addf(&t, k ? ", %ld" : " but n = %ld", (long)found->voids[k]);
    for (slong n = 0; n < found->needed && n < l->c.count && n < SHOWN_VALUES; n++) {
        text_addf(&t, n ? ", c[%ld] = " : "; c[%ld] = ", (long)n);
        expr *c = coefficient_expr(s->e, &l->c, n);
        if (c) expr_print(s->e, &t, c);
    }
    if (found->needed > SHOWN_VALUES) text_addf(&t, " ... c[%ld]", (long)found->needed - 1);
    result_line(r, "%s", t.bytes);
    text_clear(&t);
}

/* c[n] by Gamma functions, where the recurrence has order one and splits; NULL otherwise. */
static char *closed_words(session *s, const recurrence *found, const lane *l)
{
    closed_form closed;
    if (l->c.count < 1 || !closed_form_find(s->e, &closed, found, coefficient_expr(s->e, &l->c, 0))) return NULL;
    return expr_text(s->e, closed_form_expr(s->e, &closed, found->n));
}

static void add_object(session *s, text *json, const contribution *c, const lane *l, const recurrence *found,
                       const char *words)
{
    json_next(json);
    text_add(json, "{\"prefactor\": ");
    json_expr(s->e, json, c->prefactor);
    text_add(json, ", \"constant\": ");
    json_expr(s->e, json, l->constant);
    text_add(json, ", \"text\": ");
    json_string(json, words);
    text_addf(json, ", \"label\": \"%s\", \"order\": %ld, \"degree\": %ld, \"from\": 0, \"left_out\": [",
              recurrence_label_word(found->label), (long)found->order, (long)found->degree);
    for (slong k = 0; k < found->void_count; k++) text_addf(json, k ? ", %ld" : "%ld", (long)found->voids[k]);
    text_add(json, "], \"first_values\": [");
    for (slong n = 0; n < found->needed && n < l->c.count; n++) {
        if (n) text_add(json, ", ");
        json_expr(s->e, json, coefficient_expr(s->e, &l->c, n));
    }
    char *closed = closed_words(s, found, l), *proof = recurrence_certificate(s->e, found);
    text_add(json, "], \"closed_form\": ");
    json_string(json, closed);
    text_add(json, ", \"certificate\": ");
    json_string(json, proof);
    free(closed);
    free(proof);
    text_add_char(json, '}');
}

static tw_status tell_recurrence(session *s, result *r, text *json, const contribution *c, const lane *l,
                                 const recurrence *found, const char *why)
{
    text t;
    text_init(&t);
    tw_status status = recurrence_print(s->e, &t, found);
    if (status == TW_OK) {
        result_labelled(r, t.bytes, recurrence_label_word(found->label), NULL);
        tell_range(s, r, found, l);
        char *closed = closed_words(s, found, l);
        if (closed) result_line(r, "  closed form: c[%s] = %s", found->n->is.name, closed);
        free(closed);
        if (found->label == RECURRENCE_FITTED)
            result_line(r, "  found from the coefficients and tested on %ld others; not proved: %s", (long)found->tried, why);
        add_object(s, json, c, l, found, t.bytes);
    }
    text_clear(&t);
    return status;
}

/* Does the expansion have more lanes than one? Then each gets a title. */
static size_t count_lanes(const expansion *a)
{
    size_t count = 0;
    for (size_t k = 0; k < a->contribution_count; k++) count += a->contributions[k].lane_count;
    return count;
}

static void tell_end(result *r, const lane *l)
{
    slong last = l->c.count - 1;
    while (last >= 0 && coefficient_is_zero(&l->c, last)) last--;
    text t;
    text_init(&t);
    text_addf(&t, "c[n] = 0 for n > %ld", (long)last);
    result_labelled(r, t.bytes, "exact", NULL);
    text_clear(&t);
}

/* The proved recurrence, or one that fits; NULL for none. *why: why none is proved. */
static tw_status find_any(session *s, const expansion *a, contribution *c, const lane *l, const recurrence **known,
                          char **why)
{
    if (lane_recurrence(s->e, c, l, a->large, known) == TW_OK) return TW_OK;
    if (s->e->error.kind != ERROR_UNSUITABLE) return TW_ERROR;
    free(*why);
    *why = base_copy(s->e->error.words);
    engine_forgive(s->e);
    return lane_recurrence_fitted(s->e, c, l, a->large, a->small, known);
}

/* One lane; *found counts those that have a recurrence or end. The reason of the last that has none stays in *why. */
static tw_status tell_lane(session *s, result *r, text *json, expansion *a, contribution *c, size_t k, size_t *found,
                           char **why)
{
    const lane *l = &c->lanes[k];
    const recurrence *known;
    if (count_lanes(a) > 1) describe_lane_title(s, r, a, c, l);
    if (c->terminates) {
        tell_end(r, l);
        ++*found;
        return TW_OK;
    }
    tw_status status = find_any(s, a, c, l, &known, why);
    if (status == TW_OK && !known) {
        result_line(r, "  %s", *why);
        return TW_OK;
    }
    if (status == TW_OK && known->needed > l->c.count) status = expansion_extend(s->e, a, known->needed);
    if (status == TW_OK) status = tell_recurrence(s, r, json, c, &c->lanes[k], known, *why ? *why : "");
    if (status == TW_OK) ++*found;
    return status;
}

static tw_status tell_all(session *s, result *r, expansion *a)
{
    text json;
    text_init(&json);
    text_add_char(&json, '[');
    size_t found = 0;
    char *why = NULL;
    tw_status status = TW_OK;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++)
        for (size_t n = 0; n < a->contributions[k].lane_count && status == TW_OK; n++)
            status = tell_lane(s, r, &json, a, &a->contributions[k], n, &found, &why);
    text_add_char(&json, ']');
    result_json(r, "lanes", json.bytes);
    text_clear(&json);
    if (status == TW_OK && found == 0)
        status = engine_fail(s->e, ERROR_UNSUITABLE, "%s", why ? why : "the expansion has no coefficients");
    free(why);
    return status;
}

tw_status request_recurrence(session *s, const statement *st, result *r, value **keep)
{
    subject x;
    if (subject_read_expansion(s, &x, st->as.subject) != TW_OK) return TW_ERROR;
    result_restart(r, "recurrence");
    result_string(r, "of", x.name);
    tw_status status = tell_all(s, r, &x.kept->expansion);
    subject_clear(&x);
    if (status != TW_OK) return request_fail_at(s, st->as.subject->at);
    if (keep) *keep = value_of_result(r, "a recurrence");
    return TW_OK;
}

/* ---- a typed equation ---- */

enum { OFFSETS_LIMIT = 64 };

/* The c[n+j] of an equation: their offsets, and the symbols that stand for them. */
typedef struct indexed {
    session *s;
    expr *n;      /* the index; NULL until the first is met */
    size_t count;
    slong offsets[OFFSETS_LIMIT];
    expr *symbols[OFFSETS_LIMIT];
    char *names[OFFSETS_LIMIT];
    arena nodes;  /* copies of the tree */
} indexed;

static tw_status bad_index(indexed *x, const syntax *a)
{
    return request_fail(x->s, a->at, ERROR_VALUE, "an index here is a name plus a whole number, such as %s[n + 1]",
                        a->as.indexed.name);
}

/* index = n + offset */
static tw_status read_index(indexed *x, const syntax *a, slong *offset)
{
    tw_engine *e = x->s->e;
    expr *index = session_lower(x->s, a->as.indexed.index);
    if (!index) return TW_ERROR;
    expr **symbols;
    size_t count = expr_symbols(index, &symbols);
    expr *n = count == 1 ? symbols[0] : NULL;
    free(symbols);
    if (!n) return bad_index(x, a);
    if (!x->n) x->n = n;
    if (x->n != n)
        return request_fail(x->s, a->at, ERROR_VALUE, "one index runs through a recurrence: here are `%s` and `%s`",
                            x->n->is.name, n->is.name);
    expr *away = expr_sub(e, index, n);
    if (!away || !expr_is_number(away) || !fmpz_is_one(fmpq_denref(expr_number(away))) ||
        !fmpz_fits_si(fmpq_numref(expr_number(away))))
        return bad_index(x, a);
    *offset = fmpz_get_si(fmpq_numref(expr_number(away)));
    return TW_OK;
}

/* The symbol that stands for c[n + offset]; its name cannot be typed. */
static tw_status find_symbol(indexed *x, const syntax *a, const char **name)
{
    slong offset = 0;
    if (read_index(x, a, &offset) != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < x->count; k++)
        if (x->offsets[k] == offset) {
            *name = x->names[k];
            return TW_OK;
        }
    if (x->count == OFFSETS_LIMIT) return request_fail(x->s, a->at, ERROR_VALUE, "too many different indices");
    text t;
    text_init(&t);
    text_addf(&t, "%s[%ld]", a->as.indexed.name, (long)offset);
    x->names[x->count] = text_take(&t);
    x->offsets[x->count] = offset;
    x->symbols[x->count] = expr_symbol(x->s->e, x->names[x->count]);
    *name = x->names[x->count++];
    return TW_OK;
}

static syntax *copy_tree(indexed *x, const syntax *a);

static bool copy_list(indexed *x, syntax *to, const syntax *a)
{
    to->as.list.parts = arena_alloc(&x->nodes, a->as.list.count * sizeof *to->as.list.parts);
    for (size_t k = 0; k < a->as.list.count; k++)
        if (!(to->as.list.parts[k] = copy_tree(x, a->as.list.parts[k]))) return false;
    return true;
}

/* The tree with names for c[...]; they may stand in sums, products, quotients and under a minus sign only. */
static syntax *copy_tree(indexed *x, const syntax *a)
{
    syntax *to = arena_alloc(&x->nodes, sizeof *to);
    *to = *a;
    switch (a->kind) {
    case SYNTAX_INDEXED:
        to->kind = SYNTAX_NAME;
        return find_symbol(x, a, &to->as.name) == TW_OK ? to : NULL;
    case SYNTAX_SUM:
    case SYNTAX_PRODUCT: return copy_list(x, to, a) ? to : NULL;
    case SYNTAX_NEGATE: return (to->as.operand = copy_tree(x, a->as.operand)) ? to : NULL;
    case SYNTAX_POWER:
        to->as.power.base = copy_tree(x, a->as.power.base);
        to->as.power.exponent = to->as.power.base ? copy_tree(x, a->as.power.exponent) : NULL;
        return to->as.power.exponent ? to : NULL;
    default: return to;
    }
}

/* left - right as a linear form: factors of the c[n + offset]. */
static tw_status read_factors(indexed *x, const statement *st, expr **factors)
{
    tw_engine *e = x->s->e;
    span at = st->as.check_recurrence.left->at;
    syntax *left = copy_tree(x, st->as.check_recurrence.left),
           *right = left ? copy_tree(x, st->as.check_recurrence.right) : NULL;
    if (!right) return TW_ERROR;
    expr *l = session_lower(x->s, left), *r = l ? session_lower(x->s, right) : NULL;
    if (!r) return TW_ERROR;
    if (x->count == 0) return request_fail(x->s, at, ERROR_VALUE, "an equation for c[n] is needed, such as c[n+1] = n*c[n]");
    expr *rest = expr_sub(e, l, r);
    for (size_t k = 0; k < x->count; k++) factors[k] = rest ? expr_derivative(e, rest, x->symbols[k]) : NULL;
    for (size_t k = 0; k < x->count && rest; k++) rest = expr_substitute(e, rest, x->symbols[k], expr_int(e, 0));
    bool linear = rest && expr_is_zero(expr_expand(e, rest));
    for (size_t k = 0; k < x->count; k++)
        for (size_t m = 0; m < x->count && factors[k]; m++) linear = linear && !expr_has(factors[k], x->symbols[m]);
    if (e->error.kind != ERROR_NONE) return request_fail_at(x->s, at);
    if (!linear)
        return request_fail(x->s, at, ERROR_VALUE, "a recurrence here is linear in the c[...], with nothing else added");
    return TW_OK;
}

static void indexed_clear(indexed *x)
{
    for (size_t k = 0; k < x->count; k++) free(x->names[k]);
    arena_clear(&x->nodes);
}

static tw_status read_equation(session *s, const statement *st, recurrence **out, slong *shift)
{
    indexed x = {.s = s};
    arena_init(&x.nodes);
    expr *factors[OFFSETS_LIMIT];
    tw_status status = read_factors(&x, st, factors);
    if (status == TW_OK) {
        status = recurrence_from_terms(s->e, out, shift, x.n, factors, x.offsets, x.count);
        if (status != TW_OK) request_fail_at(s, st->as.check_recurrence.left->at);
    }
    indexed_clear(&x);
    return status;
}

/* ---- checking ---- */

/* What one lane says of a recurrence. */
typedef struct verdict {
    slong misfit;   /* in the recurrence's n; -1: none */
    slong compared;
    bool proved;
    expr *left, *right; /* at the misfit: a_r c[n+r] and minus the rest */
} verdict;

/* Compares with the lane's coefficients, computed directly. */
static tw_status compare_lane(session *s, verdict *v, const expansion *a, const contribution *c, const lane *l,
                              const recurrence *r)
{
    v->misfit = lane_compare(s->e, c, l, a->large, a->small, r, COMPARED + r->needed, &v->compared, &v->left, &v->right);
    return v->misfit == -2 ? TW_ERROR : TW_OK;
}

/* Does the typed one follow from what is proved of the lane? */
static tw_status prove_typed(session *s, verdict *v, const expansion *a, contribution *c, const lane *l,
                             const recurrence *typed)
{
    const recurrence *known;
    slong from;
    if (c->terminates) return TW_OK;
    if (lane_recurrence(s->e, c, l, a->large, &known) != TW_OK) {
        if (s->e->error.kind != ERROR_UNSUITABLE) return TW_ERROR;
        engine_forgive(s->e);
        return TW_OK;
    }
    answer follows = recurrence_follows(s->e, typed, known, &from);
    v->proved = follows == ANSWER_YES && known->label == RECURRENCE_PROVED && from < v->compared - typed->order;
    return s->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static tw_status check_lane(session *s, verdict *v, expansion *a, contribution *c, const lane *l, const recurrence *typed)
{
    const recurrence *r = typed;
    *v = (verdict){.misfit = -1};
    if (!typed) {
        char *why = NULL;
        tw_status status = find_any(s, a, c, l, &r, &why);
        if (status == TW_OK && !r) status = engine_fail(s->e, ERROR_UNSUITABLE, "%s", why);
        free(why);
        if (status != TW_OK || recurrence_verify(s->e, r) != TW_OK) return TW_ERROR;
        v->proved = r->label == RECURRENCE_PROVED;
    }
    if (compare_lane(s, v, a, c, l, r) != TW_OK) return TW_ERROR;
    return typed && v->misfit < 0 ? prove_typed(s, v, a, c, l, typed) : TW_OK;
}

static void tell_refusal(session *s, text *t, const verdict *v, slong shift)
{
    char *left = v->left ? expr_text(s->e, v->left) : NULL, *right = v->right ? expr_text(s->e, v->right) : NULL;
    text_addf(t, "it fails at n = %ld: %.120s is not %.120s", (long)(v->misfit - shift), left ? left : "?", right ? right : "?");
    free(left);
    free(right);
}

static void tell_verdict(session *s, result *r, text *json, const contribution *c, const lane *l, const verdict *v,
                         slong shift, bool typed)
{
    text t;
    text_init(&t);
    if (v->misfit >= 0) {
        tell_refusal(s, &t, v, shift);
        result_labelled(r, t.bytes, "refuted", NULL);
    } else if (v->proved) {
        text_addf(&t, typed ? "it follows from the proved recurrence and fits %ld coefficients computed directly"
                            : "the certificate holds; %ld coefficients computed directly fit",
                  (long)v->compared);
        result_labelled(r, t.bytes, "proved", NULL);
    } else {
        text_addf(&t, "it fits %ld coefficients computed directly", (long)v->compared);
        result_labelled(r, t.bytes, "fitted", NULL);
    }
    json_next(json);
    text_add(json, "{\"constant\": ");
    json_expr(s->e, json, l->constant);
    text_add(json, ", \"prefactor\": ");
    json_expr(s->e, json, c->prefactor);
    text_addf(json, ", \"verdict\": \"%s\", \"compared\": %ld, \"words\": ",
              v->misfit >= 0 ? "refuted" : v->proved ? "proved" : "fitted", (long)v->compared);
    json_string(json, t.bytes);
    text_add_char(json, '}');
    text_clear(&t);
}

/* All lanes; refused when it holds for none. */
static tw_status check_all(session *s, result *r, expansion *a, const recurrence *typed, slong shift)
{
    text json, refusal;
    text_init(&json);
    text_init(&refusal);
    text_add_char(&json, '[');
    size_t held = 0, met = 0;
    tw_status status = TW_OK;
    for (size_t k = 0; k < a->contribution_count && status == TW_OK; k++)
        for (size_t n = 0; n < a->contributions[k].lane_count && status == TW_OK; n++) {
            contribution *c = &a->contributions[k];
            verdict v;
            if (count_lanes(a) > 1) describe_lane_title(s, r, a, c, &c->lanes[n]);
            status = check_lane(s, &v, a, c, &c->lanes[n], typed);
            if (status != TW_OK) break;
            met++;
            held += v.misfit < 0;
            if (v.misfit >= 0 && refusal.length == 0) tell_refusal(s, &refusal, &v, shift);
            tell_verdict(s, r, &json, c, &c->lanes[n], &v, shift, typed != NULL);
        }
    text_add_char(&json, ']');
    result_json(r, "lanes", json.bytes);
    if (status == TW_OK && (held == 0 || (!typed && held < met)))
        status = engine_fail(s->e, ERROR_REFUTED, "the recurrence is refuted: %s", refusal.bytes ? refusal.bytes : "");
    text_clear(&json);
    text_clear(&refusal);
    return status;
}

tw_status request_check_recurrence(session *s, const statement *st, result *r, value **keep)
{
    recurrence *typed = NULL;
    slong shift = 0;
    subject x;
    if (subject_read_expansion(s, &x, st->as.check_recurrence.of) != TW_OK) return TW_ERROR;
    tw_status status = TW_OK;
    if (st->as.check_recurrence.left) status = read_equation(s, st, &typed, &shift);
    if (status == TW_OK) {
        result_restart(r, "check");
        result_string(r, "recurrence", x.name);
        status = check_all(s, r, &x.kept->expansion, typed, shift);
        if (status != TW_OK)
            request_fail_at(s, typed ? st->as.check_recurrence.left->at : st->as.check_recurrence.of->at);
    }
    recurrence_free(typed);
    subject_clear(&x);
    if (status == TW_OK && keep) *keep = value_of_result(r, "a check");
    return status;
}
