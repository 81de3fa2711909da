/* why.c: the explain report, and its short form on the review page. */
#include <math.h>
#include <string.h>

#include "analyses/explain.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/table.h"

/* Effects named beside a hand line in a review, and the least part of the difference that is worth
 * naming. */
enum { NAMED = 3 };
static const double least_named = 0.05, least_row = 1e-5;

static struct dimension unit_of(const struct explanation *e)
{
    return e->as_conductance ? DIMENSION_CONDUCTANCE : e->hand->probe.dimension;
}

const char *why_value(struct layout *layout, const struct explanation *e, double value)
{
    return e->as_conductance ? show_value(layout, value, unit_of(e))
                             : show_probe(layout, &e->hand->probe, value);
}

const char *why_change(struct layout *layout, const struct explanation *e, double value)
{
    return e->as_conductance ? show_signed(layout, value, unit_of(e))
                             : show_probe_difference(layout, &e->hand->probe, value);
}

static const char *show_of_paper(struct layout *layout, const struct explanation *e, double value)
{
    const double share = value / fabs(e->paper);
    return isfinite(share) ? show_share(layout, share, "", true) : "";
}

static double greatest(const struct explanation *e)
{
    return e->share_count > 0 ? fabs(e->shares[0].share) : 0;
}

bool why_matters(const struct explanation *e, int k)
{
    return fabs(e->shares[k].share) > least_row * greatest(e);
}

static void heading(struct layout *layout, const struct explanation *e)
{
    const double difference = e->computed - e->paper;
    const char *square_law = isnan(e->hand_view) ? "none" : why_value(layout, e, e->hand_view);
    layout_paragraph(
        layout, TONE_STRONG, 2,
        layout_format(layout, "%s%s: paper %s, square law %s, computed %s: %s%s%s%s",
                      layout_clean(layout, e->hand->probe.text),
                      e->as_conductance ? " (as the conductance 1/R)" : "",
                      why_value(layout, e, e->paper), square_law, why_value(layout, e, e->computed),
                      why_change(layout, e, difference), fabs(e->paper) > 0 ? " (" : "",
                      show_of_paper(layout, e, difference), fabs(e->paper) > 0 ? ")" : ""));
}

static void shares_table(struct layout *layout, const struct explanation *e)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    table_column(&table, (struct table_column){.head = "share", .right = true});
    table_column(&table, (struct table_column){.head = "of the paper", .right = true});
    for (int k = 0; k < e->share_count; k++) {
        const struct effect_share *row = &e->shares[k];
        if (why_matters(e, k)) {
            table_row(&table, TONE_PLAIN);
            table_cell(&table, 0, row->effect);
            table_cell(&table, 1, why_change(layout, e, row->share));
            table_cell(&table, 2, show_of_paper(layout, e, row->share));
        }
    }
    table_row(&table, TONE_STRONG);
    table_cell(&table, 0, "together");
    table_cell(&table, 1, why_change(layout, e, e->computed - e->paper));
    table_cell(&table, 2, show_of_paper(layout, e, e->computed - e->paper));
    table_write(&table);
}

static void explain_part(struct layout *layout, const struct explanation *e)
{
    layout_gap(layout);
    if (e->trouble != NULL) {
        layout_paragraph(layout, TONE_WARN, 2,
                         layout_format(layout, "%s: no shares: %s",
                                       layout_clean(layout, e->hand->probe.text), e->trouble));
        return;
    }
    heading(layout, e);
    if (e->note != NULL) {
        layout_paragraph(layout, TONE_WARN, 2, e->note);
    }
    shares_table(layout, e);
    for (int k = 0; k < e->share_count; k++) {
        if (e->shares[k].sentence != NULL) {
            layout_paragraph(layout, TONE_PLAIN, 2,
                             layout_format(layout, "- %s: %s", e->shares[k].effect,
                                           layout_clean(layout, e->shares[k].sentence)));
        }
    }
}

void report_explain(const struct result *result, const struct report_style *style,
                    struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (result->point.solver.converged) {
        layout_part(&layout, "why");
        for (int k = 0; k < result->explanation_count; k++) {
            explain_part(&layout, &result->explanations[k]);
        }
    } else if (!style->stopped) {
        page_unsolved(&layout, result);
    }
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}

/* "M1.vgs: weak and moderate inversion +31.2 mV, mobility ... +9.1 mV" */
static const char *short_why(struct layout *layout, const struct explanation *e)
{
    const char *text = NULL;
    for (int k = 0; k < e->share_count && k < NAMED; k++) {
        const struct effect_share *row = &e->shares[k];
        if (fabs(row->share) > least_named * greatest(e)) {
            text = layout_format(layout, "%s%s%s %s", text == NULL ? "" : text,
                                 text == NULL ? "" : ", ", row->effect,
                                 why_change(layout, e, row->share));
        }
    }
    return text;
}

void page_why(struct layout *layout, const struct result *result)
{
    for (int k = 0; k < result->explanation_count; k++) {
        const struct explanation *e = &result->explanations[k];
        const char *text = e->trouble != NULL ? e->trouble : short_why(layout, e);
        if (text != NULL && e->note != NULL) {
            text = layout_format(layout, "%s (over the orders that have a state)", text);
        }
        if (text != NULL) {
            layout_paragraph(layout, TONE_PLAIN, 4,
                             layout_format(layout, "%s%s: %s",
                                           layout_clean(layout, e->hand->probe.text),
                                           e->as_conductance ? " as 1/R" : "", text));
        }
    }
}
