/* Certified quadrature as others see it: an expression that may hold integrals, its value as a ball of the relative
 * accuracy that was asked. This file splits ranges into pieces, adds the pieces up, and tries again with another
 * tolerance or precision until the sum is good enough; what one piece is and how it is integrated is
 * quadrature_piece.c. Knows no methods.
 *
 * The one idea: accuracy is relative, so a guess of the size comes first (a scan), a ball second; that ball then gives
 * a proved lower bound of the size, and the tolerance of the next attempt where one is needed. */
#include "engine/ball/quadrature.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/ball/decide.h"
#include "engine/ball/quadrature_contour.h"
#include "engine/ball/quadrature_kinks.h"
#include "engine/ball/quadrature_oscillating.h"
#include "engine/ball/quadrature_piece.h"
#include "engine/ball/sign.h"

enum { ATTEMPTS = 24, GUARD_BITS = 12, GAP_LIMIT = 4200, PART_GAP_LIMIT = 512, TEXT_LIMIT = 60, WORDS_LIMIT = 200 };

/* One integral: a sum of pieces, each with a sign or factor, and thin slices around points that are known only closely.
 */
typedef struct quad_slice {
    tape *values, *taken; /* taken: the form that a piece integrates there instead, or NULL */
    arb_t place;
} quad_slice;

typedef struct quad_sum {
    tw_engine *e;
    quad_piece *pieces;
    slong *factors;
    bool *real; /* only the real part of that piece counts */
    char **names;
    size_t count, room, name_count;
    bool turned; /* a range was turned off the real line: the parts of the value may be of different size */
    bool only_real;
    quad_slice *slices;
    size_t slice_count;
    slong evaluations, bits;
    bool imaginary; /* the value is i times a real number */
} quad_sum;

static void sum_clear(quad_sum *s)
{
    for (size_t k = 0; k < s->count; k++)
        quad_piece_clear(&s->pieces[k]);
    for (size_t k = 0; k < s->name_count; k++)
        free(s->names[k]);
    for (size_t k = 0; k < s->slice_count; k++) {
        tape_free(s->slices[k].values);
        tape_free(s->slices[k].taken);
        arb_clear(s->slices[k].place);
    }
    free(s->slices);
    free(s->pieces);
    free(s->factors);
    free(s->real);
    free(s->names);
}

/* ---- from a range to pieces ---- */

/* Words for a point of the range; owned by the sum. */
static const char *point_words(quad_sum *s, expr *x)
{
    char *words = expr_text(s->e, x);
    if (words && strlen(words) > TEXT_LIMIT) {
        acb_t v;
        acb_init(v);
        if (ball_value(s->e, v, x, 64) == TW_OK) {
            char *digits = arb_get_str(acb_realref(v), 8, ARB_STR_NO_RADIUS);
            free(words);
            words = base_copy(digits);
            flint_free(digits);
        }
        acb_clear(v);
    }
    s->names = base_resize(s->names, (s->name_count + 1) * sizeof *s->names);
    return s->names[s->name_count++] = words ? words : base_copy("an end");
}

/* Takes g(y), y > 0, up to `length` (NULL: infinite). */
static tw_status add_piece(quad_sum *s, slong factor, expr *g, expr *y, expr *length, const char *from, const char *to)
{
    if (!g)
        return TW_ERROR;
    if (expr_is_zero(g))
        return TW_OK;
    if (s->count == s->room) {
        s->room = s->room ? 2 * s->room : 4;
        s->pieces = base_resize(s->pieces, s->room * sizeof *s->pieces);
        s->factors = base_resize(s->factors, s->room * sizeof *s->factors);
        s->real = base_resize(s->real, s->room * sizeof *s->real);
    }
    s->factors[s->count] = factor;
    s->real[s->count] = s->only_real;
    return quad_piece_init(&s->pieces[s->count++], s->e, g, y, length, from, to);
}

/* f(from + y) or f(from - y). */
static expr *moved(tw_engine *e, expr *f, expr *x, expr *from, expr *y, bool backwards)
{
    return expr_substitute(e, f, x, backwards ? expr_sub(e, from, y) : expr_add(e, from, y));
}

static bool end_is_regular(tw_engine *e, expr *f, expr *x, expr *from, bool backwards, double log2_length)
{
    expr *y = expr_fresh(e, "y"), *g = moved(e, f, x, from, y, backwards);
    tape *values = g ? tape_new(e, g, &y, 1) : NULL;
    bool regular = values && quad_is_regular(values, log2_length);
    tape_free(values);
    return regular;
}

static double log2_length(tw_engine *e, expr *length)
{
    acb_t v;
    mag_t m;
    acb_init(v);
    mag_init(m);
    double out = 0;
    if (ball_value(e, v, length, 64) == TW_OK) {
        acb_get_mag(m, v);
        out = mag_is_zero(m) ? -1000 : mag_get_d_log2_approx(m);
    }
    acb_clear(v);
    mag_clear(m);
    return out;
}

/* A range without interior kinks, from < to, along the real line. */
static tw_status add_straight(quad_sum *s, slong factor, expr *f, expr *x, expr *from, expr *to)
{
    tw_engine *e = s->e;
    expr *y = expr_fresh(e, "y");
    if (!f || !from || !to)
        return TW_ERROR;
    const char *a = point_words(s, from), *b = point_words(s, to);
    if (expr_is_minus_inf(from) && expr_is_inf(to)) {
        expr *right = expr_substitute(e, f, x, y), *left = expr_substitute(e, f, x, expr_neg(e, y));
        const char *zero = point_words(s, expr_int(e, 0));
        if (right && right == left)
            return add_piece(s, 2 * factor, right, y, NULL, zero, b);
        tw_status status = add_piece(s, factor, right, y, NULL, zero, b);
        return status == TW_OK ? add_piece(s, factor, left, y, NULL, zero, a) : status;
    }
    if (expr_is_inf(to))
        return add_piece(s, factor, moved(e, f, x, from, y, false), y, NULL, a, b);
    if (expr_is_minus_inf(from))
        return add_piece(s, factor, moved(e, f, x, to, y, true), y, NULL, b, a);
    expr *length = expr_sub(e, to, from);
    if (!length)
        return TW_ERROR;
    double size = log2_length(e, length);
    if (end_is_regular(e, f, x, to, true, size))
        return add_piece(s, factor, moved(e, f, x, from, y, false), y, length, a, b);
    if (end_is_regular(e, f, x, from, false, size))
        return add_piece(s, factor, moved(e, f, x, to, y, true), y, length, b, a);
    expr *half = expr_mul(e, expr_frac(e, 1, 2), length);
    const char *middle = point_words(s, expr_add(e, from, half));
    tw_status status = add_piece(s, factor, moved(e, f, x, from, y, false), y, half, a, middle);
    return status == TW_OK ? add_piece(s, factor, moved(e, f, x, to, y, true), y, half, b, middle) : status;
}

static tw_status add_legs(quad_sum *s, slong factor, const quad_legs *legs)
{
    tw_status status = TW_OK;
    bool all_real = s->only_real;
    for (size_t k = 0; status == TW_OK && k < legs->count; k++) {
        const quad_leg *leg = &legs->list[k];
        s->only_real = all_real || leg->real;
        if (leg->from)
            status = add_straight(s, factor * leg->factor, leg->f, leg->y, leg->from, leg->to);
        else
            status = add_piece(s, factor * leg->factor, leg->f, leg->y, leg->length,
                               "the start of a path in the complex plane",
                               leg->length ? "the end of a path in the complex plane"
                                           : "the infinite end of a path in the complex plane");
    }
    s->only_real = all_real;
    return status;
}

/* A range without interior kinks, from < to: turned into the complex plane where the integrand oscillates. */
static tw_status add_range(quad_sum *s, slong factor, expr *f, expr *x, expr *from, expr *to)
{
    tw_engine *e = s->e;
    if (!f || !from || !to)
        return TW_ERROR;
    quad_legs legs = {0};
    quad_turned turned = QUAD_NO_NEED;
    char why[WORDS_LIMIT];
    tw_status status = factor ? quad_turn(e, &legs, f, x, from, to, &turned, why, sizeof why) : TW_OK;
    if (status == TW_OK && turned == QUAD_TURNED) {
        s->turned = true;
        status = add_legs(s, factor, &legs);
    } else if (status == TW_OK && turned == QUAD_ENDLESS) {
        status = engine_fail(e, ERROR_UNSUITABLE, "the integrand oscillates without end between %s and %s, and the "
                             "range could not be turned into the complex plane: %s",
                             point_words(s, from), point_words(s, to), why);
    } else if (status == TW_OK) {
        status = add_straight(s, factor, f, x, from, to);
        error_kind kind = e->error.kind;
        if (status != TW_OK && factor && why[0] && (kind == ERROR_UNSUITABLE || kind == ERROR_UNDECIDED)) {
            char *words = base_copy(e->error.words);
            engine_forgive(e);
            engine_fail(e, kind, "%s; nor could the range be turned into the complex plane: %s", words, why);
            free(words);
        }
    }
    quad_legs_free(&legs);
    return status;
}

/* The integral of f over a part of `place`, in the sum with any sign; a piece has taken g there (NULL: nothing). */
static tw_status add_slice(quad_sum *s, expr *f, expr *g, expr *x, const arb_t place)
{
    s->slices = base_resize(s->slices, (s->slice_count + 1) * sizeof *s->slices);
    quad_slice *slice = &s->slices[s->slice_count++];
    slice->values = tape_new(s->e, f, &x, 1);
    slice->taken = g ? tape_new(s->e, g, &x, 1) : NULL;
    arb_init(slice->place);
    arb_set(slice->place, place);
    return slice->values && (slice->taken || !g) ? TW_OK : TW_ERROR;
}

/* Next to an end known by its ball only a kink may lie on either side of the end: the piece there integrates g, and the
 * difference to f counts on what is between. Forms that differ by their branch only are not worth the trouble. */
static tw_status add_end_slices(quad_sum *s, expr *f, expr *g, expr *x, const quad_points *points, bool first, bool last)
{
    tw_status status = TW_OK;
    for (int side = 0; side < 2 && status == TW_OK; side++)
        if ((side ? last : first) && points->unsure[side] && f != g)
            status = add_slice(s, f, g, x, points->near_end[side]);
    return status;
}

/* A number inside (from, to): the middle, or a point at distance 1 of a finite end. */
static void inner_point(arf_t out, const arb_t from, bool from_infinite, const arb_t to, bool to_infinite)
{
    arb_t t;
    arb_init(t);
    if (from_infinite && to_infinite)
        arb_zero(t);
    else if (from_infinite)
        arb_sub_ui(t, to, 1, 64);
    else if (to_infinite)
        arb_add_ui(t, from, 1, 64);
    else {
        arb_add(t, from, to, 256);
        arb_mul_2exp_si(t, t, -1);
    }
    arf_set(out, arb_midref(t));
    arb_clear(t);
}

/* The value of an end as a real ball; infinite ends give zero. */
static tw_status end_value(tw_engine *e, arb_t out, expr *end, slong prec)
{
    if (expr_is_inf(end) || expr_is_minus_inf(end))
        return TW_OK;
    acb_t v;
    acb_init(v);
    tw_status status = ball_value(e, v, end, FLINT_MAX(256, prec + 64));
    if (status == TW_OK && (!acb_is_finite(v) || !arb_contains_zero(acb_imagref(v))))
        status = engine_fail(e, ERROR_UNSUITABLE, "quadrature needs real ends");
    arb_set(out, acb_realref(v));
    acb_clear(v);
    return status;
}

/* The points of the range from < to and its ends as balls, with more bits where a point and an end can't be told apart. */
static tw_status find_points(quad_points *points, tw_engine *e, expr *f, expr *x, expr *from, expr *to, arb_t a, arb_t b,
                             slong prec)
{
    tw_status status = TW_OK;
    for (int k = 0; k < 4 && status == TW_OK; k++, prec *= 4) {
        quad_range range = {from, to, a, b, expr_is_minus_inf(from), expr_is_inf(to)};
        status = end_value(e, a, from, prec);
        if (status == TW_OK)
            status = end_value(e, b, to, prec);
        if (k) {
            quad_points_clear(points);
            quad_points_init(points);
        }
        if (status == TW_OK)
            status = quad_points_find(points, e, f, x, &range, prec);
        if (!points->unsure[0] && !points->unsure[1])
            break;
    }
    return status;
}

/* The range cut at the integrand's kinks and branch points. */
static tw_status add_with_kinks(quad_sum *s, slong factor, expr *f, expr *x, expr *from, expr *to, slong prec)
{
    tw_engine *e = s->e;
    bool low_infinite = expr_is_minus_inf(from), high_infinite = expr_is_inf(to);
    arb_t a, b;
    quad_points points;
    arf_t inside;
    quad_points_init(&points);
    arf_init(inside);
    arb_init(a);
    arb_init(b);
    tw_status status = find_points(&points, e, f, x, from, to, a, b, prec);
    expr *start = from;
    for (size_t k = 0; status == TW_OK && k <= points.count; k++) {
        bool last = k == points.count;
        inner_point(inside, k ? points.list[k - 1].place : a, !k && low_infinite, last ? b : points.list[k].place,
                    last && high_infinite);
        expr *g = quad_resolve(e, f, x, inside, points.complete);
        expr *end = last ? to : points.list[k].low;
        status = g ? add_range(s, factor, g, x, start, end) : TW_ERROR;
        if (status == TW_OK && factor)
            status = add_end_slices(s, f, g, x, &points, !k, last);
        if (!last) {
            start = points.list[k].high;
            if (status == TW_OK && factor && points.list[k].low != points.list[k].high)
                status = add_slice(s, f, NULL, x, points.list[k].place);
        }
    }
    quad_points_clear(&points);
    arf_clear(inside);
    arb_clear(a);
    arb_clear(b);
    return status;
}

static bool holds_integral(expr *f)
{
    if (f->kind == EXPR_INTEGRAL || f->kind == EXPR_CONTOUR)
        return true;
    for (uint32_t k = 0; k < f->count; k++)
        if (holds_integral(f->args[k]))
            return true;
    return false;
}

/* +1: from < to, -1: from > to, 0: equal. */
static tw_status range_order(tw_engine *e, expr *from, expr *to, const arb_t a, const arb_t b, int *order)
{
    bool low = expr_is_minus_inf(from) || expr_is_inf(to), high = expr_is_inf(from) || expr_is_minus_inf(to);
    *order = from == to ? 0 : low ? 1 : high || arb_gt(a, b) ? -1 : 1;
    if (!low && !high && from != to && !arb_lt(a, b) && !arb_gt(a, b))
        return engine_fail(e, ERROR_UNDECIDED, "the order of the ends of the range could not be decided");
    return TW_OK;
}

/* i -> -i: the conjugate where every symbol is real and no function is on its cut; NULL: not of that form. */
static expr *conjugate(tw_engine *e, expr *f)
{
    if (!f || expr_is_constant(f, CONSTANT_I))
        return f ? expr_neg(e, f) : NULL;
    if (!f->count)
        return f->kind == EXPR_NUMBER || f->kind == EXPR_CONSTANT || f->kind == EXPR_SYMBOL ? f : NULL;
    expr **args = base_alloc(f->count * sizeof *args), *out = NULL;
    for (uint32_t k = 0; k < f->count; k++)
        args[k] = conjugate(e, f->args[k]);
    if (f->kind == EXPR_SUM)
        out = expr_sum(e, args, f->count);
    else if (f->kind == EXPR_PRODUCT)
        out = expr_product(e, args, f->count);
    else if (f->kind == EXPR_POWER && expr_is_number(f->args[1]) &&
             fmpz_is_one(fmpq_denref(expr_number(f->args[1]))))
        out = args[0] ? expr_pow(e, args[0], args[1]) : NULL;
    else if (expr_is_call(f, FUNCTION_EXP) || expr_is_call(f, FUNCTION_COS) || expr_is_call(f, FUNCTION_SIN))
        out = args[0] ? expr_call1(e, f->is.function, args[0]) : NULL;
    else if (f->kind == EXPR_CALL && sign_is_real(e, f))
        out = f;
    else if (f->kind == EXPR_POWER && sign_is_real(e, f))
        out = f;
    free(args);
    return out;
}

/* sign * int of f from `from` to `to` on the real line. */
static tw_status add_line(quad_sum *s, slong sign, expr *f, expr *x, expr *from, expr *to, slong prec)
{
    tw_engine *e = s->e;
    arb_t a, b;
    arb_init(a);
    arb_init(b);
    int order = 0;
    tw_status status = end_value(e, a, from, prec);
    if (status == TW_OK)
        status = end_value(e, b, to, prec);
    if (status == TW_OK)
        status = range_order(e, from, to, a, b, &order);
    if (status == TW_OK && order && from == expr_neg(e, to)) { /* parity */
        expr *mirrored = expr_substitute(e, f, x, expr_neg(e, x));
        if (mirrored && mirrored == expr_neg(e, f)) { /* 0, once the half is seen to converge */
            status = order > 0 ? add_with_kinks(s, 0, f, x, expr_int(e, 0), to, prec)
                               : add_with_kinks(s, 0, f, x, expr_int(e, 0), from, prec);
            order = 0;
        }
        /* the imaginary parts of the halves cancel */
        s->only_real = mirrored && quad_tidy(e, mirrored, x) == quad_tidy(e, conjugate(e, f), x);
    }
    if (status == TW_OK && order > 0)
        status = add_with_kinks(s, sign, f, x, from, to, prec);
    else if (status == TW_OK && order < 0)
        status = add_with_kinks(s, -sign, f, x, to, from, prec);
    s->only_real = false;
    arb_clear(a);
    arb_clear(b);
    return status;
}

/* A leg off the real line, over u in (0, 1) or (0, inf). */
static tw_status add_leg(quad_sum *s, const contour_leg *leg)
{
    tw_engine *e = s->e;
    const char *near = point_words(s, leg->near), *far = point_words(s, leg->far);
    if (expr_is_inf(leg->to))
        return add_piece(s, leg->sign, leg->g, leg->u, NULL, near, far);
    expr *y = expr_fresh(e, "y"), *one = expr_int(e, 1), *half = expr_frac(e, 1, 2);
    if (end_is_regular(e, leg->g, leg->u, one, true, 0))
        return add_piece(s, leg->sign, leg->g, leg->u, one, near, far);
    expr *back = moved(e, leg->g, leg->u, one, y, true);
    if (end_is_regular(e, leg->g, leg->u, expr_int(e, 0), false, 0))
        return add_piece(s, leg->sign, back, y, one, far, near);
    tw_status status = add_piece(s, leg->sign, leg->g, leg->u, half, near, "the middle of a leg");
    return status == TW_OK ? add_piece(s, leg->sign, back, y, half, far, "the middle of a leg") : status;
}

static tw_status add_path(quad_sum *s, expr *contour, slong prec)
{
    contour_path path;
    contour_path_init(&path);
    tw_status status = contour_path_read(&path, s->e, contour);
    for (size_t k = 0; k < path.count && status == TW_OK; k++) {
        const contour_leg *leg = &path.list[k];
        status = leg->on_line ? add_line(s, leg->sign, leg->g, leg->u, leg->from, leg->to, prec) : add_leg(s, leg);
    }
    s->imaginary = path.imaginary;
    contour_path_clear(&path);
    return status;
}

static tw_status sum_build(quad_sum *s, expr *integral, slong prec)
{
    tw_engine *e = s->e;
    expr *x = expr_fresh(e, expr_binder_name(integral)), *f = expr_open(e, integral, x);
    if (!f)
        return TW_ERROR;
    bool nested = holds_integral(f);
    for (uint32_t k = 0; k + 1 < integral->count; k++)
        nested = nested || holds_integral(integral->args[k]);
    if (nested)
        return engine_fail(e, ERROR_UNSUITABLE,
                "quadrature takes one integral at a time: the integrand or an end holds another");
    if (integral->kind == EXPR_CONTOUR)
        return add_path(s, integral, prec);
    return add_line(s, 1, f, x, integral->args[0], integral->args[1], prec);
}

/* ---- attempts ---- */

/* Bits of relative accuracy: log2(|value|/radius), from a proved lower bound; less than 0 where the ball holds 0. */
static slong accuracy(const acb_t v)
{
    arf_t low, radius;
    mag_t m;
    arf_init(low);
    arf_init(radius);
    mag_init(m);
    acb_get_abs_lbound_arf(low, v, 64);
    mag_hypot(m, arb_radref(acb_realref(v)), arb_radref(acb_imagref(v)));
    arf_set_mag(radius, m);
    slong bits = -1;
    if (arf_is_zero(radius))
        bits = WORD_MAX / 4;
    else if (arf_sgn(low) > 0) {
        arf_div(low, low, radius, 30, ARF_RND_FLOOR);
        bits = arf_cmp_si(low, 1) < 0 ? -1 : arf_abs_bound_lt_2exp_si(low) - 1;
    }
    arf_clear(low);
    arf_clear(radius);
    mag_clear(m);
    return bits;
}

/* The same of the worse of the two parts. */
static slong part_accuracy(const acb_t v)
{
    acb_t part;
    acb_init(part);
    arb_set(acb_realref(part), acb_realref(v));
    slong bits = accuracy(part);
    if (!arb_is_zero(acb_imagref(v))) {
        arb_set(acb_realref(part), acb_imagref(v));
        slong other = accuracy(part);
        bits = other < bits ? other : bits;
    }
    acb_clear(part);
    return bits;
}

static double log2_upper(const acb_t v)
{
    mag_t m;
    mag_init(m);
    acb_get_mag(m, v);
    double out = mag_is_zero(m) ? -1e300 : mag_get_d_log2_approx(m);
    mag_clear(m);
    return out;
}

static double smaller_part(const acb_t v)
{
    acb_t part;
    acb_init(part);
    arb_set(acb_realref(part), acb_realref(v));
    double size = log2_upper(part);
    if (!arb_is_zero(acb_imagref(v))) {
        arb_set(acb_realref(part), acb_imagref(v));
        size = fmin(size, log2_upper(part));
    }
    acb_clear(part);
    return size;
}

static double log2_radius(const acb_t v)
{
    mag_t m;
    mag_init(m);
    mag_hypot(m, arb_radref(acb_realref(v)), arb_radref(acb_imagref(v)));
    double out = mag_is_zero(m) ? -1e300 : mag_get_d_log2_approx(m);
    mag_clear(m);
    return out;
}

/* The thin slices around closely known points, with either sign: width times the values there. Where a piece has
 * taken another form, the difference lies within width times the sum of the moduli. */
static void add_slices(quad_sum *s, acb_t value, slong prec)
{
    acb_t x, v, taken;
    mag_t width, size, part;
    acb_init(x);
    acb_init(v);
    acb_init(taken);
    mag_init(width);
    mag_init(size);
    mag_init(part);
    for (size_t k = 0; k < s->slice_count; k++) {
        const quad_slice *slice = s->slices + k;
        arb_set(acb_realref(x), slice->place);
        mag_mul_2exp_si(width, arb_radref(slice->place), 1);
        tape_eval(v, slice->values, x, false, prec);
        acb_get_mag(size, v);
        if (slice->taken) {
            tape_eval(taken, slice->taken, x, false, prec);
            acb_get_mag(part, taken);
            mag_add(size, size, part);
        }
        mag_mul(size, size, width);
        mag_add(arb_radref(acb_realref(value)), arb_radref(acb_realref(value)), size);
        if (!acb_is_real(v) || (slice->taken && !acb_is_real(taken)))
            mag_add(arb_radref(acb_imagref(value)), arb_radref(acb_imagref(value)), size);
        if (!mag_is_finite(size))
            acb_indeterminate(value);
    }
    mag_clear(part);
    mag_clear(size);
    mag_clear(width);
    acb_clear(taken);
    acb_clear(v);
    acb_clear(x);
}

/* lost: bits by which the value is smaller than its largest piece. */
static tw_status sum_attempt(quad_sum *s, acb_t value, double log2_size, slong goal, slong lost, slong prec)
{
    acb_t part;
    acb_init(part);
    acb_zero(value);
    tw_status status = TW_OK;
    slong tolerance = (slong)floor(log2_size) - goal - 2 - (slong)FLINT_BIT_COUNT(s->count);
    engine_progress(s->e, "quadrature");
    for (size_t k = 0; status == TW_OK && k < s->count; k++) {
        if (!s->factors[k])
            continue;
        status = quad_piece_integrate(&s->pieces[k], part, tolerance, goal + lost + 2, prec);
        if (s->real[k])
            arb_zero(acb_imagref(part));
        acb_addmul_si(value, part, s->factors[k], prec);
        if (status == TW_OK && !acb_is_finite(part))
            status = engine_fail(s->e, ERROR_UNDECIDED,
                    "no finite enclosure between %s and %s: the integrand may have a pole there",
                                 s->pieces[k].from, s->pieces[k].to);
    }
    if (status == TW_OK)
        add_slices(s, value, prec);
    acb_clear(part);
    return status;
}

static double seconds_now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* The value of one integral to `goal` relative bits. On TW_OK with *reached < goal the ball is the best that was found.
 */
static tw_status integral_value(quad_sum *s, acb_t value, slong goal, slong *reached)
{
    double size = -1e300, first;
    slong lost = 0;
    for (size_t k = 0; k < s->count; k++) {
        if (s->factors[k] && s->pieces[k].scan.log2_mass > size)
            size = s->pieces[k].scan.log2_mass;
        if (s->pieces[k].scan.lost > lost)
            lost = s->pieces[k].scan.lost;
    }
    acb_zero(value);
    *reached = WORD_MAX / 4;
    if (size < -1e299)
        return TW_OK;
    first = size;
    size -= 2;
    slong prec = goal + lost + GUARD_BITS, best = -2, gap = 64, stalled = 0;
    acb_t attempt;
    acb_init(attempt);
    tw_status status = TW_OK;
    for (int k = 0; k < ATTEMPTS && best < goal && stalled < 3; k++) {
        double start = seconds_now();
        status = sum_attempt(s, attempt, size, goal, (slong)fmax(first - size - 2, 0), prec);
        s->bits = prec;
        if (status != TW_OK)
            break;
        slong whole = accuracy(attempt), bits = s->turned ? part_accuracy(attempt) : whole;
        if (whole >= goal && first - size > PART_GAP_LIMIT) /* one part is much the smaller, or 0 */
            bits = whole;
        if (k == 0 || bits > best || (bits < 0 && best < 0 && log2_radius(attempt) < log2_radius(value))) {
            stalled = 0;
            best = bits;
            acb_set(value, attempt);
        } else if (bits >= 0) {
            stalled++;
        }
        if (bits >= goal)
            break;
        double radius = log2_radius(attempt), aimed = size - (double)goal;
        if (radius > aimed + 3) /* rounding, not the tolerance, is what hurts */
            prec += (slong)fmin(fmax(radius - aimed, 8), 1e5) + 8;
        if (bits >= 0) {
            size = fmin(size, (s->turned ? smaller_part(attempt) : log2_upper(attempt)) - 1);
        } else {
            if (first - size > GAP_LIMIT || seconds_now() - start > 3)
                break;
            size = fmin(size - (double)gap, log2_upper(attempt));
            prec += gap;
            gap *= 2;
        }
    }
    acb_clear(attempt);
    *reached = best;
    return status;
}

/* ---- expressions that hold integrals ---- */

typedef struct integrals {
    expr **nodes, **symbols;
    size_t count;
} integrals;

/* Integrals of f that are not inside another one replaced by symbols. */
static expr *take_integrals(tw_engine *e, integrals *list, expr *f)
{
    if (!f || !holds_integral(f))
        return f;
    if (f->kind == EXPR_INTEGRAL || f->kind == EXPR_CONTOUR) {
        for (size_t k = 0; k < list->count; k++)
            if (list->nodes[k] == f)
                return list->symbols[k];
        list->nodes = base_resize(list->nodes, (list->count + 1) * sizeof *list->nodes);
        list->symbols = base_resize(list->symbols, (list->count + 1) * sizeof *list->symbols);
        list->nodes[list->count] = f;
        return list->symbols[list->count++] = expr_fresh(e, "J");
    }
    expr **args = base_alloc((f->count + 1) * sizeof *args);
    for (uint32_t k = 0; k < f->count; k++)
        args[k] = take_integrals(e, list, f->args[k]);
    expr *out = NULL;
    switch ((expr_kind)f->kind) {
    case EXPR_SUM:
        out = expr_sum(e, args, f->count);
        break;
    case EXPR_PRODUCT:
        out = expr_product(e, args, f->count);
        break;
    case EXPR_POWER:
        out = expr_pow(e, args[0], args[1]);
        break;
    case EXPR_CALL:
        out = expr_call(e, f->is.function, args, f->count);
        break;
    default:
        engine_fail(e, ERROR_UNSUITABLE, "quadrature takes integrals in sums, products, powers and functions only");
    }
    free(args);
    return out;
}

static tw_status values_of(tw_engine *e, const integrals *list, acb_ptr values, slong goal, slong *reached,
                           quadrature_report *report)
{
    *reached = WORD_MAX / 4;
    tw_status status = TW_OK;
    for (size_t k = 0; status == TW_OK && k < list->count; k++) {
        quad_sum s = {.e = e};
        slong bits = 0;
        status = sum_build(&s, list->nodes[k], goal + 60);
        if (status == TW_OK)
            status = integral_value(&s, values + k, goal, &bits);
        if (s.imaginary)
            arb_zero(acb_realref(values + k));
        if (bits < *reached)
            *reached = bits;
        for (size_t j = 0; j < s.count; j++)
            report->evaluations += s.pieces[j].evaluations;
        if (s.bits > report->bits)
            report->bits = s.bits;
        sum_clear(&s);
    }
    return status;
}

static tw_status combine(tw_engine *e, acb_t value, expr *f, integrals *list, slong goal, slong *reached,
                         quadrature_report *report)
{
    tape *values = tape_new(e, f, list->symbols, list->count);
    if (!values)
        return TW_ERROR;
    acb_ptr at = _acb_vec_init((slong)list->count + 1);
    tw_status status = TW_OK;
    slong extra = list->count == 1 && f == list->symbols[0] ? 0 : 6;
    *reached = -2;
    for (int k = 0; k < 5 && status == TW_OK && *reached < goal; k++) {
        slong inner = 0;
        status = values_of(e, list, at, goal + extra, &inner, report);
        if (status == TW_OK) {
            tape_eval(value, values, at, false, goal + extra + 40);
            *reached = accuracy(value);
            if (inner < goal && *reached < goal)
                break;
            extra = 2 * extra + (*reached < 0 ? goal : goal - *reached) + 16;
        }
    }
    _acb_vec_clear(at, (slong)list->count + 1);
    tape_free(values);
    return status;
}

tw_status quadrature(tw_engine *e, acb_t value, expr *f, const env *at, slong digits, bool accept_less,
                     quadrature_report *report)
{
    quadrature_report own = {0, 0}, *r = report ? report : &own;
    *r = own;
    if (digits < 1 || digits > 1000000)
        return engine_fail(e, ERROR_VALUE, "digits must be between 1 and 1000000");
    expr *g = at && at->count ? expr_substitute_all(e, f, at->symbols, at->values, at->count) : f;
    if (!g)
        return TW_ERROR;
    slong goal = (slong)ceil((double)digits * 3.3219280948873624) + 1, reached = -2;
    integrals list = {0};
    expr *h = take_integrals(e, &list, g);
    tw_status status = h && !e->error.kind ? combine(e, value, h, &list, goal, &reached, r) : TW_ERROR;
    free(list.nodes);
    free(list.symbols);
    if (status == TW_OK && !arb_is_zero(acb_imagref(value)) && arb_contains_zero(acb_imagref(value)) &&
            decide_real_value(e, g))
        arb_zero(acb_imagref(value));
    if (status != TW_OK || reached >= goal - 1 || accept_less)
        return status;
    if (!acb_is_finite(value))
        return engine_fail(e, ERROR_UNDECIDED, "no finite value was found");
    if (reached < 1)
        return engine_fail(e, ERROR_PRECISION,
                "the value is 0 or too near to it: it lies within 10^%ld of 0, and no relative accuracy can be had",
                           (long)ceil(log2_upper(value) * 0.30103));
    return engine_fail(e, ERROR_PRECISION, "%ld digits cannot be had here; %ld can", (long)digits,
            (long)(reached * 0.30103));
}
