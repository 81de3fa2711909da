/* web_paper.c: the paper against what was computed, and the effects behind the difference, as HTML.
 */
#include <math.h>

#include "analyses/explain.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/web.h"

/* The greatest relative difference, for the scale of the bars; at most 1. */
static double greatest_share(const struct result *result)
{
    double greatest = 0.0;
    for (int k = 0; k < result->hand_count; k++) {
        double share = fabs(result->hands[k].difference / result->hands[k].hand->value);
        greatest = isfinite(share) ? fmax(greatest, share) : greatest;
    }
    return fmin(greatest, 1.0);
}

static void hand_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Quantity", "Paper",      "Computed",
                                        "Differs",  "Square law", "Difference"};
    static const bool numbers[] = {false, true, true, true, true, false};
    double scale = greatest_share(result);
    struct web_table table;
    web_table_begin(&table, layout->out,
                    layout_format(layout, "What the paper says; a whole bar is %s or more",
                                  show_share(layout, scale, "", false)),
                    heads, numbers, 6);
    for (int k = 0; k < result->hand_count; k++) {
        const struct hand_result *row = &result->hands[k];
        const struct probe *probe = &row->hand->probe;
        double share = row->difference / fabs(row->hand->value);
        web_table_row(&table);
        web_table_name(&table, probe->text, web_line(result, row->hand->where));
        web_table_value(&table, row->hand->value,
                        web_units(layout, show_probe(layout, probe, row->hand->value)));
        web_table_value(&table, row->computed,
                        web_units(layout, show_probe(layout, probe, row->computed)));
        web_table_value(
            &table, share,
            layout_format(layout, "%s (%s)",
                          web_units(layout, show_probe_difference(layout, probe, row->difference)),
                          isfinite(share) ? show_share(layout, share, "", true) : "-"));
        web_table_value(&table, row->in_hand_view,
                        isnan(row->in_hand_view)
                            ? ""
                            : web_units(layout, show_probe(layout, probe, row->in_hand_view)));
        web_table_bar(&table, scale > 0.0 ? share / scale : (double)NAN);
    }
    web_table_end(&table);
}

/* The greatest size among shares and difference: the scale of the bars of one quantity. */
static double reason_scale(const struct explanation *e)
{
    double greatest = fabs(e->computed - e->paper);
    for (int k = 0; k < e->share_count; k++) {
        greatest = fmax(greatest, fabs(e->shares[k].share));
    }
    return greatest;
}

static void reason_row(struct layout *layout, struct web_table *table, const struct explanation *e,
                       const char *effect, double share)
{
    const double of_paper = share / fabs(e->paper), scale = reason_scale(e);
    web_table_row(table);
    web_table_name(
        table,
        layout_format(layout, "%s%s", e->hand->probe.text, e->as_conductance ? " as 1/R" : ""), 0);
    web_table_text(table, effect);
    web_table_value(table, share, web_units(layout, why_change(layout, e, share)));
    web_table_value(table, of_paper,
                    isfinite(of_paper) ? show_share(layout, of_paper, "", true) : "");
    web_table_bar(table, scale > 0.0 ? share / scale : (double)NAN);
}

static void reason_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Quantity", "Effect", "Adds", "Of the paper", "Share"};
    static const bool numbers[] = {false, false, true, true, false};
    struct web_table table;
    web_table_begin(
        &table, layout->out,
        "Why: what each effect adds to the paper's value; the bars of a quantity add up", heads,
        numbers, 5);
    for (int k = 0; k < result->explanation_count; k++) {
        const struct explanation *e = &result->explanations[k];
        for (int m = 0; e->trouble == NULL && m < e->share_count; m++) {
            if (why_matters(e, m)) {
                reason_row(layout, &table, e, e->shares[m].effect, e->shares[m].share);
            }
        }
        if (e->trouble == NULL) {
            reason_row(layout, &table, e, "together", e->computed - e->paper);
        }
    }
    web_table_end(&table);
}

/* What the effects do in words, with the cell's own figures; or why nothing is known. */
static void reason_words(struct layout *layout, const struct result *result)
{
    buffer_text(layout->out, "<ul class=\"cautions\">\n");
    for (int k = 0; k < result->explanation_count; k++) {
        const struct explanation *e = &result->explanations[k];
        if (e->trouble != NULL) {
            buffer_text(layout->out, "<li>");
            web_text(layout,
                     layout_format(layout, "%s: no shares: %s", e->hand->probe.text, e->trouble));
            buffer_text(layout->out, "</li>\n");
        }
        for (int m = 0; e->trouble == NULL && m < e->share_count; m++) {
            if (e->shares[m].sentence != NULL) {
                buffer_text(layout->out, "<li>");
                web_text(layout, layout_format(layout, "%s, %s: %s", e->hand->probe.text,
                                               e->shares[m].effect, e->shares[m].sentence));
                buffer_text(layout->out, "</li>\n");
            }
        }
    }
    buffer_text(layout->out, "</ul>\n");
}

void web_paper(struct layout *layout, const struct result *result)
{
    if (result->hand_count == 0 && result->explanation_count == 0) {
        return;
    }
    web_heading(layout, "paper", "Paper against computed");
    if (result->hand_count > 0) {
        hand_table(layout, result);
    }
    if (result->explanation_count > 0) {
        reason_table(layout, result);
        reason_words(layout, result);
    }
}
