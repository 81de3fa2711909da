/* size.c: the chosen values, and what preferred values do. */
#include "analyses/size.h"

#include <math.h>

#include "report/page_parts.h"
#include "report/show.h"
#include "report/table.h"

static const char *distance_text(struct layout *layout, const struct choice *choice, double reached)
{
    const double share = reached / choice->value - 1;
    if (isnan(reached)) {
        return "no value";
    }
    return fabs(share) < 1e-6 || !isfinite(share)
               ? show_probe(layout, &choice->probe, reached)
               : layout_format(layout, "%s (%s)", show_probe(layout, &choice->probe, reached),
                               show_share(layout, share, "", true));
}

static const char *range_text(struct layout *layout, const struct choice *choice)
{
    return layout_format(layout, "%s to %s",
                         show_round(layout, choice->from, choice->knob.dimension),
                         show_round(layout, choice->to, choice->knob.dimension));
}

static void chosen_part(struct layout *layout, const struct size_result *size)
{
    static const char *const heads[] = {"", "now", "value", "range", "so", "target", "gives"};
    struct table table;
    layout_part(layout, size->solved ? "chosen" : "nearest");
    table_begin(&table, layout);
    for (int c = 0; c < 7; c++) {
        table_column(&table, (struct table_column){
                                 .head = heads[c], .right = c > 0 && c != 4, .may_drop = c == 3});
    }
    for (int k = 0; k < size->count; k++) {
        const struct chosen *it = &size->list[k];
        const struct choice *choice = it->choice;
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, choice->knob.name, 24));
        table_cell(&table, 1, show_value(layout, it->before, choice->knob.dimension));
        table_cell(&table, 2, show_value(layout, it->value, choice->knob.dimension));
        table_cell(&table, 3, range_text(layout, choice));
        table_cell(&table, 4, layout_short(layout, choice->probe.text, 24));
        table_cell(&table, 5, show_probe(layout, &choice->probe, choice->value));
        table_cell(&table, 6, distance_text(layout, choice, it->reached));
    }
    table_write(&table);
}

static void bounds_part(struct layout *layout, const struct size_result *size)
{
    for (int k = 0; !size->solved && k < size->count; k++) {
        const struct chosen *it = &size->list[k];
        if (it->bound != BOUND_NONE) {
            const bool low = it->bound == BOUND_FROM;
            layout_line(layout, TONE_BAD,
                        layout_format(layout, "%s is stopped by the %s end of its range, %s",
                                      layout_clean(layout, it->choice->knob.name),
                                      low ? "lower" : "upper",
                                      show_round(layout, low ? it->choice->from : it->choice->to,
                                                 it->choice->knob.dimension)));
        }
    }
}

static void rounded_part(struct layout *layout, const struct size_result *size)
{
    struct table table;
    layout_part(layout, "rounded");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "value", .right = true});
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "gives"});
    for (int r = 0; r < size->rounding_count; r++) {
        const struct rounding *it = &size->roundings[r];
        for (int k = 0; k < size->count; k++) {
            const struct choice *choice = size->list[k].choice;
            table_row(&table, TONE_STRONG);
            table_cell(&table, 0, k == 0 ? it->name : "");
            table_cell(&table, 1, layout_short(layout, choice->knob.name, 24));
            table_cell(&table, 2,
                       it->is_rounded[k]
                           ? show_round(layout, it->values[k], choice->knob.dimension)
                           : show_value(layout, it->values[k], choice->knob.dimension));
            table_cell(&table, 3, layout_short(layout, choice->probe.text, 24));
            table_cell(&table, 4, distance_text(layout, choice, it->reached[k]));
        }
    }
    table_write(&table);
}

void report_size(const struct result *result, const struct report_style *style, struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (result->size != NULL) {
        chosen_part(&layout, result->size);
        bounds_part(&layout, result->size);
        rounded_part(&layout, result->size);
        layout_part(&layout, "evidence");
        layout_paragraph(&layout, TONE_PLAIN, 0,
                         layout_format(&layout, "%s; the cell was solved at %d places",
                                       result->size->method, result->size->evaluations));
    } else if (!style->stopped) {
        page_unsolved(&layout, result);
    }
    page_closing(&layout);
    layout_end(&layout);
}
