/* The coefficients as plain text: one a line, `n numerator/denominator` (an expression where it is not rational); before each
 * lane a comment line names prefactor, constant, first exponent and step. */
#include <stdlib.h>

#include "engine/export/format.h"

static void add_lane(tw_engine *e, text *out, const contribution *c, const lane *l)
{
    text_add(out, "# prefactor ");
    expr_print(e, out, c->prefactor);
    text_add(out, "; constant ");
    expr_print(e, out, l->constant);
    text_add(out, "; first exponent ");
    expr_print(e, out, l->first_exponent);
    text_add(out, "; step ");
    expr_print(e, out, expr_fmpq(e, l->step));
    if (l->log_power) text_addf(out, "; log power %ld", (long)l->log_power);
    text_add_char(out, '\n');
    for (slong n = 0; n < l->c.count; n++) {
        text_addf(out, "%ld ", (long)n);
        if (l->c.domain == DOMAIN_RATIONAL) {
            char *p = fmpz_get_str(NULL, 10, fmpq_numref(&l->c.q[n]));
            char *d = fmpz_get_str(NULL, 10, fmpq_denref(&l->c.q[n]));
            text_addf(out, "%s/%s", p, d);
            flint_free(p);
            flint_free(d);
        } else {
            expr_print(e, out, coefficient_expr(e, &l->c, n));
        }
        text_add_char(out, '\n');
    }
}

static tw_status write_list(tw_engine *e, text *out, const char *name, expansion *a, const remainder_bound *r)
{
    (void)name;
    (void)r;
    for (size_t k = 0; k < a->contribution_count; k++)
        for (size_t l = 0; l < a->contributions[k].lane_count; l++) {
            if (!budget_ok(e)) return TW_ERROR;
            add_lane(e, out, &a->contributions[k], &a->contributions[k].lanes[l]);
        }
    return TW_OK;
}

const format format_text = {"text", "one coefficient a line, a comment line before each lane", write_list};
