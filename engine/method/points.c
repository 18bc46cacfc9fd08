/* Cutting the path where the phase turns. The one idea: once every zero of the slope, every singularity and every kink
 * is known, and it is proved that there are no others, the phase is monotone in between; what is least, and how deep,
 * is then read off the joints by exact comparison. */
#include "engine/method/points.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/algebraic.h"
#include "engine/exact/values.h"
#include "engine/method/kinks.h"
#include "engine/method/scale.h"
#include "engine/method/zeros.h"

void path_cut_init(path_cut *c)
{
    memset(c, 0, sizeof *c);
}

void path_cut_clear(path_cut *c)
{
    free(c->joints);
    free(c->pieces);
    path_cut_init(c);
}

int places_compare(tw_engine *e, expr *a, expr *b)
{
    if (a == b) return 0;
    if (expr_is_inf(a) || expr_is_minus_inf(b)) return 1;
    if (expr_is_inf(b) || expr_is_minus_inf(a)) return -1;
    expr *d = value_canonical(e, expr_sub(e, a, b));
    if (!d) return 2;
    if (expr_is_zero(d)) return 0;
    int sign = expr_is_closed_value(d) ? value_sign(e, d) : decide_sign(e, d);
    return sign;
}

/* ---- joints ---- */

static void joint_insert(path_cut *c, size_t at, expr *place)
{
    c->joints = base_resize(c->joints, (c->count + 2) * sizeof *c->joints);
    memmove(c->joints + at + 1, c->joints + at, (c->count + 1 - at) * sizeof *c->joints);
    c->joints[at] = (joint_place){place, NULL, false, false};
    c->count++;
}

static tw_status undecided(tw_engine *e, expr *a, expr *b)
{
    char *one = expr_text(e, a), *two = expr_text(e, b);
    engine_fail(e, ERROR_UNDECIDED, "the facts do not say how %s and %s lie on the path: declare it with `given`",
                one ? one : "", two ? two : "");
    free(one);
    free(two);
    return TW_ERROR;
}

/* A place inside the path becomes a joint, once. */
static tw_status joint_add(tw_engine *e, path_cut *c, expr *place, bool turning)
{
    for (size_t k = 0; k <= c->count; k++) {
        int order = places_compare(e, place, c->joints[k].place);
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (order == 2) return undecided(e, place, c->joints[k].place);
        if (order == 0) return TW_OK;
        if (order < 0) {
            if (k > 0) {
                joint_insert(c, k, place);
                c->joints[k].turning = turning;
            }
            return TW_OK;
        }
    }
    return TW_OK;
}

static tw_status joints_add(tw_engine *e, path_cut *c, expr **places, size_t count, bool turning)
{
    tw_status status = TW_OK;
    for (size_t k = 0; k < count && status == TW_OK; k++) status = joint_add(e, c, places[k], turning);
    free(places);
    return status;
}

/* ---- slopes ---- */

static bool is_finite_place(expr *a)
{
    return !expr_is_inf(a) && !expr_is_minus_inf(a);
}

/* A value inside (a, b). */
static expr *inside_of(tw_engine *e, expr *a, expr *b)
{
    bool low = expr_is_minus_inf(a), high = expr_is_inf(b);
    if (low && high) return expr_int(e, 0);
    if (low) return expr_sub(e, b, expr_int(e, 1));
    if (high) return expr_add(e, a, expr_int(e, 1));
    return expr_mul(e, expr_frac(e, 1, 2), expr_add(e, a, b));
}

/* The sign just right (side 1) or left (-1) of a zero z of the slope, by the first derivative that is not 0 there; 2:
 * not known. */
static int slope_beside(tw_engine *e, expr *slope, expr *x, expr *z, int side)
{
    enum { ORDERS = 12 };
    expr *f = slope;
    int turn = 1;
    for (int m = 0; m < ORDERS && f; m++) {
        expr *value = value_canonical(e, expr_substitute(e, f, x, z));
        if (!value) break;
        int sign = expr_is_zero(value) ? 0 : expr_is_closed_value(value) ? value_sign(e, value) : decide_sign(e, value);
        if (sign == 1 || sign == -1) return sign * turn;
        if (sign == 2) break;
        turn *= side;
        f = expr_derivative(e, f, x);
    }
    if (e->error.kind == ERROR_VALUE) engine_forgive(e);
    return 2;
}

/* The sign of the slope on a piece known to have no zero inside. */
static tw_status slope_of_piece(tw_engine *e, path_piece *p, expr *x, expr *from, expr *to, bool from_stationary,
                                bool to_stationary)
{
    expr *slope = expr_derivative(e, p->phase, x);
    if (!slope) return TW_ERROR;
    if (expr_is_zero(slope)) {
        p->slope = 0;
        return TW_OK;
    }
    expr *middle = inside_of(e, from, to);
    expr *value = middle ? expr_substitute(e, slope, x, middle) : NULL;
    int sign = 2;
    if (value)
        sign =
            expr_is_closed_value(value) ? value_sign(e, value) : decide_sign(e, normal_under_facts(e, value, NULL, 0));
    if (!value && e->error.kind == ERROR_VALUE) engine_forgive(e);
    if (sign != 1 && sign != -1 && from_stationary) sign = slope_beside(e, slope, x, from, 1);
    if (sign != 1 && sign != -1 && to_stationary) sign = slope_beside(e, slope, x, to, -1);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    p->slope = sign;
    if (sign == 1 || sign == -1) return TW_OK;
    char *words = expr_text(e, slope);
    engine_fail(e, ERROR_UNDECIDED, "the sign of %s on a part of the path is not known", words ? words : "");
    free(words);
    return TW_ERROR;
}

/* ---- the whole ---- */

/* Joints at kinks; then each piece in smooth form. */
static tw_status cut_at_kinks(tw_engine *e, path_cut *c, expr *phase, expr *amplitude, expr *x)
{
    expr **kinks;
    size_t count;
    expr *from = c->joints[0].place, *to = c->joints[c->count].place;
    if (kinks_between(e, phase, x, from, to, &kinks, &count) != TW_OK || joints_add(e, c, kinks, count, false) != TW_OK)
        return TW_ERROR;
    if (kinks_between(e, amplitude, x, from, to, &kinks, &count) != TW_OK) return TW_ERROR;
    return joints_add(e, c, kinks, count, false);
}

static tw_status cut_piece(tw_engine *e, path_cut *all, expr *phase, expr *x, expr *from, expr *to)
{
    expr *slope = expr_derivative(e, phase, x);
    if (!slope) return TW_ERROR;
    if (!expr_has(slope, x)) return TW_OK;
    expr **zeros;
    size_t count;
    if (zeros_between(e, slope, x, from, to, &zeros, &count) != TW_OK) return TW_ERROR;
    return joints_add(e, all, zeros, count, true);
}

static bool ball_holds_zero(tw_engine *e, expr *a)
{
    acb_t z;
    acb_init(z);
    bool holds = ball_value(e, z, a, 256) == TW_OK && acb_is_finite(z) && acb_contains_zero(z);
    acb_clear(z);
    return holds;
}

static tw_status mark_stationary(tw_engine *e, path_cut *c, expr *x)
{
    for (size_t k = 0; k <= c->count; k++) {
        joint_place *j = &c->joints[k];
        bool left = k == 0, right = k == c->count; /* at an end the one side decides */
        if (!is_finite_place(j->place)) continue;
        for (int side = k == 0; side < (k == c->count ? 1 : 2); side++) {
            expr *slope = expr_derivative(e, c->pieces[k - 1 + (size_t)side].phase, x);
            expr *value = slope ? expr_substitute(e, slope, x, j->place) : NULL;
            value = value_canonical(e, value);
            bool zero = value &&
                        (expr_is_zero(value) || (expr_is_closed_value(value) && value_is_zero(e, value) == ANSWER_YES));
            if (!value && e->error.kind == ERROR_VALUE) engine_forgive(e);
            /* a zero without a closed form was proved to be one when it was found; a pole has no finite value */
            if (value && !zero && j->turning && expr_is_closed_value(value)) zero = ball_holds_zero(e, value);
            if (side)
                right = zero;
            else
                left = zero;
        }
        j->stationary = left && right;
    }
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

tw_status path_cut_make(tw_engine *e, path_cut *out, expr *phase, expr *amplitude, expr *x, expr *from, expr *to,
                        condition_list *conditions)
{
    (void)conditions;
    out->joints = base_alloc(2 * sizeof *out->joints);
    out->joints[0] = (joint_place){from, NULL, false, false};
    out->joints[1] = (joint_place){to, NULL, false, false};
    out->count = 1;
    if (cut_at_kinks(e, out, phase, amplitude, x) != TW_OK) return TW_ERROR;
    size_t smooth = out->count;
    expr **places = base_alloc((smooth + 1) * sizeof *places);
    for (size_t k = 0; k <= smooth; k++) places[k] = out->joints[k].place;
    tw_status status = TW_OK;
    for (size_t k = 0; k < smooth && status == TW_OK; k++) {
        expr *p = kinks_resolved(e, phase, x, places[k], places[k + 1]);
        status = p ? cut_piece(e, out, p, x, places[k], places[k + 1]) : TW_ERROR;
    }
    free(places);
    if (status != TW_OK) return TW_ERROR;
    out->pieces = base_alloc(out->count * sizeof *out->pieces);
    for (size_t k = 0; k < out->count; k++) {
        path_piece *p = &out->pieces[k];
        p->phase = kinks_resolved(e, phase, x, out->joints[k].place, out->joints[k + 1].place);
        p->amplitude = kinks_resolved(e, amplitude, x, out->joints[k].place, out->joints[k + 1].place);
        p->slope = 0;
        if (!p->phase || !p->amplitude) return TW_ERROR;
    }
    if (mark_stationary(e, out, x) != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < out->count; k++)
        if (slope_of_piece(e, &out->pieces[k], x, out->joints[k].place, out->joints[k + 1].place,
                           is_finite_place(out->joints[k].place) && k > 0,
                           is_finite_place(out->joints[k + 1].place) && k + 1 < out->count) != TW_OK)
            return TW_ERROR;
    return TW_OK;
}
