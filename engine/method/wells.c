/* From a path cut into monotone pieces to the points that count. The one idea: a piece belongs to the joint at its
 * lower end; the lowest joints are the points that count, their pieces the branches, and what is left (other pieces,
 * and the part of a branch beyond the place where it stops being steep) is the rest, whose floor is read off its lower
 * ends. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/algebraic.h"
#include "engine/exact/values.h"
#include "engine/method/frame.h"
#include "engine/method/lanes.h"
#include "engine/method/points.h"

typedef struct wells {
    frame *f;
    path_cut cut;
    bool *lower;   /* per joint: the phase rises on both sides (or at the one side there is) */
    bool *deepest; /* per joint */
    expr *depth;
    expr *floor; /* of the rest so far; NULL: no rest */
    bool floor_closed;
} wells;

/* ---- limits ---- */

/* The limit of the phase at the place, coming from inside the piece (side 1: the place is its lower end in x): a value,
 * inf or -inf; NULL without an error: not known. */
static expr *limit_at(tw_engine *e, expr *phase, expr *x, expr *where, int side)
{
    bool endless = expr_is_inf(where) || expr_is_minus_inf(where);
    expr *y = expr_fresh(e, "y"), *inf = expr_constant_of(e, CONSTANT_INF), *found = NULL;
    if (!endless) {
        expr *value = expr_substitute(e, phase, x, where);
        acb_t ball;
        acb_init(ball);
        bool plain = value && !value->infinite &&
                     (!expr_is_closed_value(value) || (ball_value(e, ball, value, 64) == TW_OK && acb_is_finite(ball)));
        acb_clear(ball);
        if (plain) return value_canonical(e, value);
        if (e->error.kind == ERROR_VALUE) engine_forgive(e);
        if (e->error.kind != ERROR_NONE) return NULL;
    }
    expr *near = endless ? expr_mul(e, expr_int(e, expr_is_inf(where) ? 1 : -1), expr_pow(e, y, expr_int(e, -1)))
                         : expr_add(e, where, expr_mul(e, expr_int(e, side), y));
    expr *moved = normal_under_facts(e, expr_substitute(e, phase, x, near), &y, 1);
    series s;
    series_init(&s);
    if (moved && series_at_zero(e, &s, moved, y, 1, NULL, NULL) == TW_OK && s.count > 0) {
        /* the strand that grows most */
        size_t best = 0;
        bool ordered = true;
        for (size_t k = 0; k < s.count; k++) {
            if (!expr_is_number(s.strands[k].exponent))
                ordered = false;
            else if (expr_is_number(s.strands[best].exponent)) {
                int order = fmpq_cmp(expr_number(s.strands[k].exponent), expr_number(s.strands[best].exponent));
                if (order < 0 || (order == 0 && s.strands[k].log_power > s.strands[best].log_power)) best = k;
            }
        }
        const strand *b = &s.strands[best];
        expr *front = ordered ? expr_mul(e, b->constant, coefficient_expr(e, &b->c, 0)) : NULL;
        if (front && (fmpq_sgn(expr_number(b->exponent)) < 0 || (expr_is_zero(b->exponent) && b->log_power > 0))) {
            int sign = expr_is_closed_value(front) ? value_sign(e, front) : decide_sign(e, front);
            if (b->log_power % 2) sign = sign == 1 ? -1 : sign == -1 ? 1 : sign; /* log(y) < 0 */
            found = sign == 1 ? inf : sign == -1 ? expr_neg(e, inf) : NULL;
        } else if (front) {
            found = expr_int(e, 0);
            for (size_t k = 0; k < s.count; k++)
                if (expr_is_zero(s.strands[k].exponent))
                    found =
                        expr_add(e, found, expr_mul(e, s.strands[k].constant, coefficient_expr(e, &s.strands[k].c, 0)));
        }
    }
    series_clear(&s);
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    return found;
}

/* ---- which joints are lowest ---- */

static tw_status growing(frame *f)
{
    return engine_fail(
        f->e, ERROR_DIVERGENT,
        "the kernel grows without limit along the path for large %s: the integral does not converge (is a "
        "minus sign missing in the exponent?)",
        f->r->large->is.name);
}

static tw_status level_unknown(wells *w, size_t k)
{
    tw_engine *e = w->f->e;
    char *words = expr_text(e, w->cut.joints[k].place);
    engine_fail(e, ERROR_UNDECIDED, "how the exponent behaves at %s = %s is not known",
                w->f->r->original_variable->is.name, words ? words : "");
    free(words);
    return TW_ERROR;
}

static tw_status find_lower(wells *w)
{
    tw_engine *e = w->f->e;
    size_t n = w->cut.count;
    w->lower = base_alloc((n + 1) * sizeof *w->lower);
    w->deepest = base_alloc((n + 1) * sizeof *w->deepest);
    memset(w->deepest, 0, (n + 1) * sizeof *w->deepest);
    for (size_t k = 0; k < n; k++)
        if (w->cut.pieces[k].slope == 0)
            return engine_fail(e, ERROR_UNSUITABLE,
                               "the exponent is constant on a part of the path: split the integral there");
    for (size_t k = 0; k <= n; k++) {
        joint_place *j = &w->cut.joints[k];
        w->lower[k] = (k == 0 || w->cut.pieces[k - 1].slope < 0) && (k == n || w->cut.pieces[k].slope > 0);
        if (!w->lower[k]) continue;
        j->level = k < n ? limit_at(e, w->cut.pieces[k].phase, w->f->x, j->place, 1)
                         : limit_at(e, w->cut.pieces[k - 1].phase, w->f->x, j->place, -1);
        if (!j->level) return e->error.kind == ERROR_NONE ? level_unknown(w, k) : TW_ERROR;
        if (expr_is_minus_inf(j->level)) return growing(w->f);
        if (k > 0 && k < n) { /* a jump of the phase? */
            expr *left = limit_at(e, w->cut.pieces[k - 1].phase, w->f->x, j->place, -1);
            if (!left) return e->error.kind == ERROR_NONE ? level_unknown(w, k) : TW_ERROR;
            if (places_compare(e, left, j->level) != 0)
                return engine_fail(e, ERROR_UNSUITABLE, "the exponent jumps inside the path: split the integral there");
        }
    }
    return TW_OK;
}

static tw_status find_deepest(wells *w)
{
    tw_engine *e = w->f->e;
    size_t best = SIZE_MAX;
    for (size_t k = 0; k <= w->cut.count; k++) {
        if (!w->lower[k]) continue;
        int order = best == SIZE_MAX ? -1 : places_compare(e, w->cut.joints[k].level, w->cut.joints[best].level);
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (order == 2) {
            char *one = expr_text(e, frame_place(w->f, w->cut.joints[k].place)),
                 *two = expr_text(e, frame_place(w->f, w->cut.joints[best].place));
            const char *x = w->f->r->original_variable->is.name;
            engine_fail(e, ERROR_UNDECIDED,
                        "the facts do not say at which of %s = %s and %s = %s the kernel is greater", x, two ? two : "",
                        x, one ? one : "");
            free(one);
            free(two);
            return TW_ERROR;
        }
        if (order < 0) {
            memset(w->deepest, 0, (w->cut.count + 1) * sizeof *w->deepest);
            best = k;
        }
        if (order <= 0) w->deepest[k] = true;
    }
    if (best == SIZE_MAX) return growing(w->f);
    w->depth = w->cut.joints[best].level;
    for (size_t k = 0; k <= w->cut.count; k++)
        if (w->deepest[k] && (expr_is_inf(w->cut.joints[k].place) || expr_is_minus_inf(w->cut.joints[k].place)))
            return engine_fail(
                e, ERROR_DIVERGENT,
                "the kernel is greatest at infinity, where the exponent tends to a limit: no point of the "
                "path counts, and the kernel does not make the integral converge");
    return TW_OK;
}

/* ---- branches ---- */

/* A branch of the piece that starts at its low end. */
typedef struct side {
    const path_piece *piece;
    expr *low, *high; /* places */
    int sign;         /* x = low + sign*y */
    bool cut;         /* ends before `high`, at y = end */
    bool exponential; /* x = low*exp(sign*y) */
    expr *end;        /* in y */
} side;

/* (0, inf) with the phase infinite at 0: the variable's logarithm makes both branches infinite. */
static bool is_logarithmic(wells *w)
{
    tw_engine *e = w->f->e;
    const path_cut *c = &w->cut;
    if (!expr_is_zero(c->joints[0].place) || !expr_is_inf(c->joints[c->count].place)) return false;
    if (c->pieces[0].slope > 0) return false;
    expr *level = limit_at(e, c->pieces[0].phase, w->f->x, c->joints[0].place, 1);
    return level && expr_is_inf(level);
}

static side side_of(wells *w, size_t piece, bool logarithmic)
{
    tw_engine *e = w->f->e;
    const path_piece *p = &w->cut.pieces[piece];
    size_t low = p->slope > 0 ? piece : piece + 1, high = p->slope > 0 ? piece + 1 : piece;
    bool last = high == 0 || high == w->cut.count;
    const joint_place *top = &w->cut.joints[high];
    side s = {p, w->cut.joints[low].place, top->place, p->slope, false, false, NULL};
    expr *length = expr_is_inf(top->place) || expr_is_minus_inf(top->place)
                       ? expr_constant_of(e, CONSTANT_INF)
                       : expr_mul(e, expr_int(e, s.sign), expr_sub(e, top->place, s.low));
    s.end = value_canonical(e, length);
    if (logarithmic && low > 0 && (last || top->stationary)) {
        s.exponential = true;
        if (last) {
            s.end = expr_constant_of(e, CONSTANT_INF);
            return s;
        }
        s.cut = true; /* y = 9/10 of log(high/low), as a number below it */
        expr *ratio = expr_div(e, top->place, s.low);
        s.end = expr_mul(e, expr_frac(e, 9, 10), expr_mul(e, expr_int(e, s.sign), expr_call1(e, FUNCTION_LOG, ratio)));
        return s;
    }
    bool steep = !top->stationary;
    if (steep && !expr_is_inf(s.end)) { /* a singular top: the phase goes to infinity there */
        expr *level = limit_at(e, p->phase, w->f->x, top->place, -s.sign);
        steep = level && !level->infinite;
        if (!steep) {
            s.cut = true;
            s.end = expr_mul(e, expr_frac(e, 7, 8), s.end);
        }
    } else if (!steep) {
        s.cut = true;
        s.end = expr_mul(e, expr_frac(e, 9, 10), s.end);
    }
    return s;
}

/* A rational number a little below the closed value `a` > 0; a itself when it has parameters. */
static expr *rational_below(tw_engine *e, expr *a)
{
    if (!a || expr_is_number(a) || !expr_is_closed_value(a)) return a;
    acb_t z;
    arf_t low;
    fmpq_t q;
    expr *made = a;
    acb_init(z);
    arf_init(low);
    fmpq_init(q);
    if (ball_value(e, z, a, 64) == TW_OK && acb_is_finite(z)) {
        arb_get_lbound_arf(low, acb_realref(z), 12);
        if (arf_sgn(low) > 0) {
            arf_get_fmpq(q, low);
            made = expr_fmpq(e, q);
        }
    }
    fmpq_clear(q);
    arf_clear(low);
    acb_clear(z);
    return made;
}

static expr *side_x(tw_engine *e, const side *s, expr *y)
{
    if (s->exponential) return expr_mul(e, s->low, expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_int(e, s->sign), y)));
    return expr_add(e, s->low, expr_mul(e, expr_int(e, s->sign), y));
}

/* Polynomials in y get their coefficients in lowest terms: then what vanishes at the point is seen to vanish. */
static expr *tidy(tw_engine *e, expr *p, expr *y)
{
    enum { DEGREE_MOST = 100 };
    expr **c;
    slong degree;
    if (!p || expr_polynomial(e, p, y, DEGREE_MOST, &c, &degree) != TW_OK) return p;
    expr *sum = expr_int(e, 0);
    for (slong k = 0; k <= degree; k++)
        sum = expr_add(e, sum, expr_mul(e, value_canonical(e, c[k]), expr_pow(e, y, expr_int(e, k))));
    free(c);
    return sum;
}

static bool is_transcendental_root(tw_engine *e, expr *a)
{
    if (a->kind == EXPR_ROOT) {
        fmpz_poly_t m;
        fmpz_poly_init(m);
        bool algebraic = algebraic_polynomial(e, m, a);
        fmpz_poly_clear(m);
        return !algebraic;
    }
    for (uint32_t k = 0; k < a->count; k++)
        if (is_transcendental_root(e, a->args[k])) return true;
    return false;
}

/* p along the side: the phase less its value at the low end. At a zero of the slope that has no closed form the slope
 * is taken out, for that it is 0 is the point's definition. */
static expr *side_phase(wells *w, const side *s, expr *y, bool stationary)
{
    tw_engine *e = w->f->e;
    expr *x = side_x(e, s, y);
    expr *value = expr_substitute(e, s->piece->phase, w->f->x, s->low);
    expr *p = expr_sub(e, expr_substitute(e, s->piece->phase, w->f->x, x), value);
    p = tidy(e, normal_under_facts(e, expr_expand(e, p), &y, 1), y);
    if (p && stationary && is_transcendental_root(e, s->low)) {
        expr *slope = expr_substitute(e, expr_derivative(e, s->piece->phase, w->f->x), w->f->x, s->low);
        p = expr_sub(e, p, expr_mul(e, expr_mul(e, expr_int(e, s->sign), slope), y));
    }
    return p;
}

static expr *side_amplitude(wells *w, const side *s, expr *y)
{
    tw_engine *e = w->f->e;
    expr *x = side_x(e, s, y);
    expr *q = expr_substitute(e, s->piece->amplitude, w->f->x, x);
    if (s->exponential) q = expr_mul(e, q, x);
    return normal_under_facts(e, q, &y, 1);
}

/* p = c*y^mu on the branch? */
static bool pure_with_constant(tw_engine *e, expr *p, expr *y, expr **c, fmpq_t mu)
{
    expr *const *factors;
    size_t count = expr_factors(&p, &factors);
    expr *constant = expr_int(e, 1), *moving = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (expr_has(factors[k], y))
            moving = expr_mul(e, moving, factors[k]);
        else
            constant = expr_mul(e, constant, factors[k]);
    }
    *c = constant;
    return moving && constant && is_pure_power(e, moving, y, mu);
}

/* A common constant in front of pure powers goes into the scale. */
static void take_pure(tw_engine *e, critical_point *c)
{
    fmpq_t mu;
    expr *first = NULL;
    fmpq_init(mu);
    c->pure = c->local.count > 0;
    for (size_t k = 0; k < c->local.count && c->pure; k++) {
        expr *constant;
        c->pure = pure_with_constant(e, c->local.branches[k].p, c->local.branches[k].x, &constant, mu) &&
                  (!first || (first == constant && fmpq_equal(mu, c->mu)));
        first = constant;
        fmpq_set(c->mu, mu);
    }
    if (c->pure && (expr_is_closed_value(first) ? value_sign(e, first) : decide_sign(e, first)) != 1) c->pure = false;
    if (c->pure) {
        c->scale_constant = first;
        for (size_t k = 0; k < c->local.count; k++) {
            branch *b = &c->local.branches[k];
            b->p = expr_pow(e, b->x, expr_fmpq(e, c->mu));
        }
    }
    fmpq_clear(mu);
}

static tw_status add_side(wells *w, critical_point *c, const side *s, bool stationary)
{
    frame *f = w->f;
    tw_engine *e = f->e;
    expr *y = expr_fresh(e, expr_binder_name(f->binder));
    expr *p = side_phase(w, s, y, stationary), *q = side_amplitude(w, s, y);
    if (!p || !q || !s->end) return TW_ERROR;
    bool open = expr_is_inf(s->end) || s->cut || s->exponential;
    bool path_end = s->high == w->cut.joints[0].place || s->high == w->cut.joints[w->cut.count].place;
    c->far_places[c->local.count] = open || !path_end ? NULL : frame_place(f, s->high);
    local_form_add(&c->local, y, s->end, p, q);
    return TW_OK;
}

/* ---- the rest ---- */

static tw_status lower_floor(wells *w, expr *level)
{
    tw_engine *e = w->f->e;
    expr *height = value_canonical(e, expr_sub(e, level, w->depth));
    if (!height) return TW_ERROR;
    if (!w->floor) {
        w->floor = height;
        return TW_OK;
    }
    int order = places_compare(e, height, w->floor);
    if (order == 2) {
        expr *both[] = {height, w->floor};
        w->floor = expr_call(e, FUNCTION_MIN, both, 2);
    } else if (order < 0) {
        w->floor = height;
    }
    return w->floor && e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

/* The part of the piece from x = start on, away from its low end. */
static tw_status add_rest(wells *w, const side *s, expr *start, expr *level)
{
    frame *f = w->f;
    tw_engine *e = f->e;
    local_form *rest = &f->r->rest;
    expr *y = expr_fresh(e, expr_binder_name(f->binder));
    bool from_infinity = expr_is_inf(start) || expr_is_minus_inf(start);
    expr *high = s->high;
    int sign = s->sign;
    if (from_infinity) { /* a piece that is lowest at infinity is run through from its other end */
        expr *swap = start;
        start = high;
        high = swap;
        sign = -sign;
        if (expr_is_inf(start) || expr_is_minus_inf(start))
            return engine_fail(e, ERROR_UNSUITABLE, "the exponent has no turning point on the whole line");
    }
    expr *x = expr_add(e, start, expr_mul(e, expr_int(e, sign), y));
    expr *end = expr_is_inf(high) || expr_is_minus_inf(high) ? expr_constant_of(e, CONSTANT_INF)
                                                             : expr_mul(e, expr_int(e, sign), expr_sub(e, high, start));
    expr *p = expr_sub(e, expr_substitute(e, s->piece->phase, f->x, x), w->depth);
    p = normal_under_facts(e, expr_expand(e, p), &y, 1);
    expr *q = normal_under_facts(e, expr_substitute(e, s->piece->amplitude, f->x, x), &y, 1);
    if (!p || !q || !end) return TW_ERROR;
    local_form_add(rest, y, end, p, q);
    return lower_floor(w, level);
}

static tw_status rest_of_piece(wells *w, size_t piece, bool logarithmic)
{
    tw_engine *e = w->f->e;
    const path_piece *p = &w->cut.pieces[piece];
    side s = side_of(w, piece, logarithmic);
    const joint_place *low = &w->cut.joints[p->slope > 0 ? piece : piece + 1];
    size_t index = (size_t)(low - w->cut.joints);
    if (!w->deepest[index]) {
        expr *level = low->level;
        if (!level) level = limit_at(e, p->phase, w->f->x, low->place, s.sign);
        if (!level) return e->error.kind == ERROR_NONE ? level_unknown(w, index) : TW_ERROR;
        return add_rest(w, &s, low->place, level);
    }
    if (!s.cut) return TW_OK;
    expr *start = side_x(e, &s, rational_below(e, s.end));
    return start ? add_rest(w, &s, start, expr_substitute(e, p->phase, w->f->x, start)) : TW_ERROR;
}

/* ---- points ---- */

static tw_status add_point(wells *w, size_t k, bool logarithmic)
{
    frame *f = w->f;
    tw_engine *e = f->e;
    const joint_place *j = &w->cut.joints[k];
    critical_point *c = reading_add(f->r);
    c->kind = k == 0 || k == w->cut.count ? POINT_END : POINT_INTERIOR;
    c->place = frame_place(f, j->place);
    c->dominant = w->deepest[k];
    c->depth = j->level;
    c->scale_constant = expr_int(e, 1);
    if (k < w->cut.count) {
        side s = side_of(w, k, logarithmic);
        if (s.cut) s.end = rational_below(e, s.end);
        if (add_side(w, c, &s, j->stationary) != TW_OK) return TW_ERROR;
    }
    if (k > 0) {
        side s = side_of(w, k - 1, logarithmic);
        if (s.cut) s.end = rational_below(e, s.end);
        if (add_side(w, c, &s, j->stationary) != TW_OK) return TW_ERROR;
    }
    take_pure(e, c);
    expr *large = expr_pow(e, f->r->large, expr_fmpq(e, f->r->power));
    c->local.scale = expr_mul(e, c->scale_constant, large);
    expr *height = expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, large, j->level)));
    c->local.factor = normal_under_facts(e, expr_mul(e, f->outside, height), &f->r->large, 1);
    return c->place && c->local.scale && c->local.factor ? TW_OK : TW_ERROR;
}

enum { LESSER_MOST = 8 };

/* The lesser points nearest in depth, at most LESSER_MOST; *left_out of them are not listed. */
static tw_status add_lesser(wells *w, bool logarithmic, size_t *left_out)
{
    tw_engine *e = w->f->e;
    size_t n = w->cut.count + 1, count = 0;
    size_t *order = base_alloc(n * sizeof *order);
    for (size_t k = 0; k < n; k++) {
        const joint_place *j = &w->cut.joints[k];
        if (!w->lower[k] || w->deepest[k] || expr_is_inf(j->place) || expr_is_minus_inf(j->place) ||
            expr_is_inf(j->level))
            continue;
        size_t at = count++;
        while (at > 0 && places_compare(e, j->level, w->cut.joints[order[at - 1]].level) < 0) {
            order[at] = order[at - 1];
            at--;
        }
        order[at] = k;
    }
    *left_out = count > LESSER_MOST ? count - LESSER_MOST : 0;
    tw_status status = TW_OK;
    for (size_t k = 0; k < count && k < LESSER_MOST && status == TW_OK; k++)
        status = add_point(w, order[k], logarithmic);
    free(order);
    return status;
}

static void record_points(wells *w, bool logarithmic, size_t left_out)
{
    frame *f = w->f;
    tw_engine *e = f->e;
    reading *r = f->r;
    text places;
    text_init(&places);
    const char *x = r->original_variable->is.name;
    size_t dominant = 0;
    expr *form = expr_int(e, 0);
    for (size_t k = 0; k < r->point_count; k++) {
        const critical_point *c = &r->points[k];
        if (!c->dominant) continue;
        text_addf(&places, dominant ? " and %s = " : "%s = ", x);
        expr_print(e, &places, c->place);
        form = expr_add(e, form, local_form_integral(e, &c->local));
        dominant++;
    }
    if (r->rest.count > 0) form = expr_add(e, form, local_form_integral(e, &r->rest));
    const critical_point *one = r->points;
    const char *rule = dominant > 1                  ? "split at the points of equal depth"
                       : one->kind == POINT_INTERIOR ? "split at the critical point"
                       : expr_is_zero(one->place)    ? "find the critical point"
                                                     : "shift to the critical point";
    frame_record(f, rule, NULL, form, "the exponent is greatest at %s only%s%s", places.bytes ? places.bytes : "",
                 logarithmic ? "; there the variable is replaced by the logarithm of its ratio to the point" : "",
                 r->rest.count > 0 ? "; the part of the path away from there is exponentially small" : "");
    if (left_out > 0)
        frame_record(f, "leave out lesser points", NULL, form,
                     "%lu more points of lesser depth are not listed; the bound covers them", (unsigned long)left_out);
    text_clear(&places);
}

static tw_status make_points(wells *w)
{
    frame *f = w->f;
    tw_engine *e = f->e;
    reading *r = f->r;
    size_t left_out = 0;
    bool logarithmic = is_logarithmic(w);
    tw_status status = TW_OK;
    for (size_t k = 0; k <= w->cut.count && status == TW_OK; k++)
        if (w->deepest[k]) status = add_point(w, k, logarithmic);
    for (size_t k = 0; k < w->cut.count && status == TW_OK; k++) status = rest_of_piece(w, k, logarithmic);
    if (status == TW_OK) status = add_lesser(w, logarithmic, &left_out);
    if (status != TW_OK) return TW_ERROR;
    if (r->rest.count > 0) {
        r->rest.scale = expr_pow(e, r->large, expr_fmpq(e, r->power));
        r->rest.factor = r->points->local.factor;
        r->rest_floor = rational_below(e, w->floor);
    }
    record_points(w, logarithmic, left_out);
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

tw_status frame_find_wells(frame *f)
{
    wells w = {.f = f};
    path_cut_init(&w.cut);
    tw_status status = path_cut_make(f->e, &w.cut, f->s.phase, f->s.amplitude, f->x, f->from, f->to, &f->r->conditions);
    if (status == TW_OK) status = find_lower(&w);
    if (status == TW_OK) status = find_deepest(&w);
    if (status == TW_OK) status = make_points(&w);
    free(w.lower);
    free(w.deepest);
    path_cut_clear(&w.cut);
    return status == TW_OK && f->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}
