/* page_mismatch.c: samples, their histogram, causes, and the yield of each requirement. */
#include "report/page_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/spread_result.h"
#include "report/limits.h"
#include "report/show.h"
#include "report/table.h"

enum { BAR_COLUMNS = 40, BAR_ROWS = 16, CAUSES_SHOWN = 6, PROBES_WITH_CAUSES = 2 };

const char *page_samples(struct layout *layout, const struct mismatch_result *r)
{
    const char *text = layout_format(layout, "%d random deviates; ", r->deviate_count);
    if (r->wanted == 0) {
        return layout_format(layout, "%sno samples were asked for", text);
    }
    text = layout_format(layout, "%s%d samples of seed %llu, each a full solve", text, r->done,
                         (unsigned long long)r->seed);
    if (r->done < r->wanted) {
        text = layout_format(layout, "%s (%d were asked for)", text, r->wanted);
    }
    text = layout_format(layout, "%s; %d without an operating point", text, r->failed);
    if (r->searched > 0) {
        text = layout_format(layout, "%s, %d found only from cold", text, r->searched);
    }
    return text;
}

static const char *of_own(struct layout *layout, double sigma, const struct spread_of_probe *row)
{
    return show_share(layout, sigma / fabs(row->own), "", false);
}

static void figures_table(struct layout *layout, const struct mismatch_result *r)
{
    static const char *const heads[] = {"", "here", "mean", "sigma", "", "first order", ""};
    static const int drops[] = {0, 0, 2, 0, 0, 1, 3};
    struct table table;
    table_begin(&table, layout);
    for (int c = 0; c < 7; c++) {
        table_column(&table,
                     (struct table_column){.head = heads[c], .right = c > 0, .may_drop = drops[c]});
    }
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        const bool share = row->own != 0 && isfinite(row->own);
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, layout_short(layout, row->probe->text, 30));
        table_cell(&table, 1, show_probe(layout, row->probe, row->own));
        table_cell(&table, 2, show_probe(layout, row->probe, row->sampled.mean));
        table_cell(&table, 3, show_probe(layout, row->probe, row->sampled.sigma));
        table_cell(&table, 4, share ? of_own(layout, row->sampled.sigma, row) : "");
        table_cell(&table, 5, show_probe(layout, row->probe, row->linear_sigma));
        table_cell(&table, 6, share ? of_own(layout, row->linear_sigma, row) : "");
    }
    table_write(&table);
}

/* What the table does not say by itself. */
static void figures_remarks(struct layout *layout, const struct mismatch_result *r)
{
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        const char *name = layout_short(layout, row->probe->text, 30);
        if (row->agreement == AGREEMENT_FAILS) {
            layout_paragraph(
                layout, TONE_WARN, 2,
                layout_format(
                    layout,
                    "! %s: sampled and first-order sigma differ by %s, more than sampling "
                    "explains at 99 %%: the cell is not linear over its mismatch; use "
                    "the sampled one",
                    name,
                    show_share(layout, row->sampled.sigma / row->linear_sigma - 1, "", true)));
        }
        if (row->missing > 0) {
            layout_paragraph(layout, TONE_WARN, 2,
                             layout_format(layout, "! %s has no value in %d solved samples", name,
                                           row->missing));
        }
    }
}

/* The limits between the lower end of this bar and that of the next. */
static void limit_lines(struct layout *layout, const struct spread_of_probe *row,
                        const struct limit *limits, int count, double from, double to)
{
    for (int k = 0; k < count; k++) {
        if (limits[k].value >= from && limits[k].value < to && !limits_seen(limits, k)) {
            const char *value = show_probe(layout, row->probe, limits[k].value);
            const int blank = 12 - text_width(value);
            layout_line(layout, TONE_WARN,
                        layout_format(layout, "%*s%s  %s the requirement wants at %s this",
                                      blank > 0 ? blank : 0, "", value,
                                      layout->style.ascii
                                          ? "----"
                                          : "\xE2\x94\x84\xE2\x94\x84\xE2\x94\x84\xE2\x94\x84",
                                      limits[k].is_upper ? "most" : "least"));
        }
    }
}

/* One bar a row; neighbouring bins are joined until BAR_ROWS are left. */
static void draw_histogram(struct layout *layout, const struct circuit *circuit,
                           const struct spread_of_probe *row)
{
    const struct histogram *h = &row->histogram;
    const int join = (h->bins + BAR_ROWS - 1) / BAR_ROWS;
    const char *ink = layout->style.ascii ? "#" : "\xE2\x96\x88";
    struct limit limits[LIMIT_COUNT];
    const int count = limits_find(circuit, row->probe, false, limits);
    int most = 1;
    for (int b = 0; b < h->bins; b += join) {
        int sum = 0;
        for (int k = b; k < b + join && k < h->bins; k++) {
            sum += h->counts[k];
        }
        most = sum > most ? sum : most;
    }
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "%s of the samples; each bar from",
                              layout_short(layout, row->probe->text, 50)));
    for (int b = 0; b < h->bins; b += join) {
        int sum = 0;
        for (int k = b; k < b + join && k < h->bins; k++) {
            sum += h->counts[k];
        }
        const double from = h->from + (h->to - h->from) * b / h->bins;
        const int length = (int)((double)sum * BAR_COLUMNS / most + 0.5);
        const char *bar = "";
        for (int k = 0; k < length; k++) {
            bar = layout_format(layout, "%s%s", bar, ink);
        }
        const char *value = show_probe(layout, row->probe, from);
        const int blank = 12 - text_width(value);
        layout_line(layout, TONE_PLAIN,
                    layout_format(layout, "%*s%s  %s%s%d", blank > 0 ? blank : 0, "", value, bar,
                                  length > 0 ? " " : "", sum));
        limit_lines(layout, row, limits, count, from,
                    h->from + (h->to - h->from) * (b + join) / h->bins);
    }
}

static void causes_table(struct layout *layout, const struct spread_of_probe *row)
{
    struct table table;
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "variance of %s to first order, by cause",
                              layout_short(layout, row->probe->text, 40)));
    table_begin(&table, layout);
    for (int c = 0; c < 4; c++) {
        table_column(&table, (struct table_column){.head = "", .right = c > 1});
    }
    int shown = 0;
    double rest = 1;
    for (; shown < row->contributor_count && shown < CAUSES_SHOWN; shown++) {
        const struct contributor *part = &row->contributors[shown];
        rest -= part->share;
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0,
                   layout_format(layout, "  %s", layout_short(layout, part->instance->name, 28)));
        table_cell(&table, 1, part->cause);
        table_cell(&table, 2, layout_format(layout, "%.1f %%", 100.0 * part->share));
        table_cell(&table, 3,
                   layout_format(layout, "%s a sigma",
                                 show_probe_difference(layout, row->probe, part->slope)));
    }
    if (shown < row->contributor_count) {
        table_row(&table, TONE_QUIET);
        table_cell(&table, 0, layout_format(layout, "  %d more", row->contributor_count - shown));
        table_cell(&table, 2, layout_format(layout, "%.1f %%", 100.0 * fmax(rest, 0)));
    }
    table_write(&table);
}

static void yield_part(struct layout *layout, const struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    struct table table;
    layout_part(layout, "yield");
    if (r->yields == NULL || r->done == 0) {
        return;
    }
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = "", .right = true});
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    for (int k = 0; k < result->requirement_count; k++) {
        const struct yield_result *y = &r->yields[k];
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, layout_format(layout, "%.2f %%", 100.0 * y->share));
        table_cell(&table, 1,
                   layout_format(layout, "%.2f to %.2f %%", 100.0 * y->low, 100.0 * y->high));
        table_cell(&table, 2, requirement_text(layout, result->requirements[k].requirement));
    }
    table_write(&table);
    if (result->requirement_count > 0) {
        layout_paragraph(layout, TONE_QUIET, 0,
                         layout_format(layout,
                                       "of %d samples at the cell's own conditions; interval at 95 "
                                       "%% (Wilson); a sample without an operating point meets "
                                       "nothing",
                                       r->done));
    }
}

void page_mismatch(struct layout *layout, const struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    layout_part(layout, "mismatch");
    if (r->deviate_count == 0) {
        layout_paragraph(layout, TONE_PLAIN, 0,
                         "no device here has a mismatch coefficient (match_... of a model, match= "
                         "or tol= of a resistor)");
        return;
    }
    layout_paragraph(layout, r->failed > 0 ? TONE_WARN : TONE_PLAIN, 0, page_samples(layout, r));
    figures_table(layout, r);
    figures_remarks(layout, r);
    if (r->quantity_count > 0 && r->quantities[0].sampled.count > 1) {
        layout_gap(layout);
        draw_histogram(layout, result->circuit, &r->quantities[0]);
    }
    int shown = 0;
    for (int q = 0; q < r->quantity_count && shown < PROBES_WITH_CAUSES; q++) {
        if (r->quantities[q].contributor_count > 0) {
            layout_gap(layout);
            causes_table(layout, &r->quantities[q]);
            shown++;
        }
    }
    yield_part(layout, result);
}
