/* The coefficients as CSV (RFC 4180, with a header, lines end in CR LF): one row a coefficient. When every coefficient is
 * rational the last columns are numerator and denominator, otherwise one column holds the coefficient as an expression. */
#include <stdlib.h>
#include <string.h>

#include "engine/export/format.h"

void csv_field(text *out, const char *words)
{
    if (!strpbrk(words, ",\"\r\n")) {
        text_add(out, words);
        return;
    }
    text_add_char(out, '"');
    for (const char *p = words; *p; p++) {
        if (*p == '"') text_add_char(out, '"');
        text_add_char(out, *p);
    }
    text_add_char(out, '"');
}

static void add_expr(tw_engine *e, text *out, expr *a)
{
    char *words = expr_text(e, a);
    csv_field(out, words);
    free(words);
    text_add_char(out, ',');
}

static bool all_rational(const expansion *a)
{
    for (size_t k = 0; k < a->contribution_count; k++)
        for (size_t l = 0; l < a->contributions[k].lane_count; l++)
            if (a->contributions[k].lanes[l].c.domain != DOMAIN_RATIONAL) return false;
    return true;
}

static void add_rational(text *out, const fmpq_t q)
{
    char *p = fmpz_get_str(NULL, 10, fmpq_numref(q));
    char *d = fmpz_get_str(NULL, 10, fmpq_denref(q));
    text_addf(out, "%s,%s", p, d);
    flint_free(p);
    flint_free(d);
}

static void add_row(tw_engine *e, text *out, const contribution *c, size_t k, size_t l, slong n, bool rational)
{
    const lane *lane_ = &c->lanes[l];
    fmpq_t shift;
    fmpq_init(shift);
    fmpq_mul_si(shift, lane_->step, n);
    text_addf(out, "%zu,", k);
    add_expr(e, out, c->prefactor);
    text_addf(out, "%zu,", l);
    add_expr(e, out, lane_->constant);
    text_addf(out, "%ld,", (long)n);
    add_expr(e, out, expr_add(e, lane_->first_exponent, expr_fmpq(e, shift)));
    text_addf(out, "%ld,", (long)lane_->log_power);
    if (rational) {
        add_rational(out, &lane_->c.q[n]);
    } else {
        char *words = expr_text(e, coefficient_expr(e, &lane_->c, n));
        csv_field(out, words);
        free(words);
    }
    text_add(out, "\r\n");
    fmpq_clear(shift);
}

static tw_status write_csv(tw_engine *e, text *out, const char *name, expansion *a, const remainder_bound *r)
{
    (void)name;
    (void)r;
    bool rational = all_rational(a);
    text_add(out, "contribution,prefactor,lane,constant,n,exponent,log_power,");
    text_add(out, rational ? "numerator,denominator\r\n" : "coefficient\r\n");
    for (size_t k = 0; k < a->contribution_count; k++)
        for (size_t l = 0; l < a->contributions[k].lane_count; l++)
            for (slong n = 0; n < a->contributions[k].lanes[l].c.count; n++) {
                if (!budget_ok(e)) return TW_ERROR;
                add_row(e, out, &a->contributions[k], k, l, n, rational);
            }
    return TW_OK;
}

const format format_csv = {"csv", "one row a coefficient (RFC 4180)", write_csv};
