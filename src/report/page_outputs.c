/* page_outputs.c: the figures of each output, and its curve. */
#include "report/page_parts.h"

#include <math.h>

#include "report/chart.h"
#include "report/show.h"
#include "report/table.h"

/* More outputs than this are shown without a curve, which would fill pages. */
enum { CURVE_OUTPUT_LIMIT = 3 };

static void fact(struct table *table, const char *name, const char *value, const char *remark)
{
    table_row(table, TONE_QUIET);
    table_cell(table, 0, name);
    table_cell(table, 1, value);
    table_cell(table, 2, remark);
}

static void resistance_fact(struct table *table, const struct output_result *row)
{
    struct layout *layout = table->layout;
    if (row->resistance_unlimited) {
        fact(table, "resistance", "unlimited", "nothing in the model lets the current follow");
    } else if (isfinite(row->resistance)) {
        fact(table, "resistance", show_value(layout, row->resistance, DIMENSION_RESISTANCE),
             row->resistance < 0.0 ? "negative: the current falls as the voltage rises" : "");
    }
}

static void compliance_fact(struct table *table, const struct output_result *row)
{
    struct layout *layout = table->layout;
    const struct output *output = row->output;
    double end = row->is_sink ? output->from : output->to;
    const char *way = row->is_sink ? "down" : "up";
    if (isfinite(row->compliance)) {
        const char *who =
            row->compliance_device != NULL
                ? layout_format(layout, "holds %s to here, where %s runs out of headroom", way,
                                layout_short(layout, row->compliance_device, 28))
                : layout_format(layout, "holds %s to here", way);
        fact(table, "compliance", show_value(layout, row->compliance, DIMENSION_VOLTAGE), who);
    } else if (row->compliance_beyond) {
        fact(table, "compliance", show_value(layout, end, DIMENSION_VOLTAGE),
             layout_format(layout, "the end of the sweep; still held there, so the edge lies %s",
                           row->is_sink ? "lower" : "higher"));
    } else if (row->unheld_device != NULL) {
        fact(table, "compliance", "-",
             layout_format(layout, "not held: %s is out of headroom already",
                           layout_short(layout, row->unheld_device, 28)));
    } else {
        fact(table, "compliance", "-", "no transistor holds the current here");
    }
}

/* The voltages between which the current stays in its band. */
static void band_facts(struct table *table, const struct output_result *row)
{
    struct layout *layout = table->layout;
    const struct output *output = row->output;
    const char *band = show_round(layout, output->within * 100.0, DIMENSION_NONE);
    double low = isfinite(row->low) ? row->low : output->from;
    double high = isfinite(row->high) ? row->high : output->to;
    fact(table, "low", show_value(layout, low, DIMENSION_VOLTAGE),
         layout_format(layout,
                       isfinite(row->low) ? "current within %s %% from here"
                                          : "current within %s %% from the start of the sweep",
                       band));
    fact(table, "high", show_value(layout, high, DIMENSION_VOLTAGE),
         isfinite(row->high) ? "to here" : "to the end of the sweep");
    if (isfinite(row->flatness)) {
        fact(table, "flatness", show_share(layout, row->flatness, "", false),
             "(greatest - least) / nominal, from compliance to the far end");
    }
}

static void drift_facts(struct table *table, const struct result *result,
                        const struct output_result *row)
{
    struct layout *layout = table->layout;
    for (int k = 0; row->line != NULL && k < result->circuit->rail_count; k++) {
        if (isfinite(row->line[k])) {
            fact(table, "line", show_share(layout, row->line[k], "/V", true),
                 layout_format(layout, "of %s",
                               layout_short(layout, result->circuit->rails[k].name, 30)));
        }
    }
    if (isfinite(row->tempco)) {
        fact(table, "tempco", show_share(layout, row->tempco, "/K", true),
             layout_format(layout, "at %s", show_celsius(layout, result->kelvin)));
    }
    if (isfinite(row->sigma)) {
        fact(table, "sigma", show_share(layout, row->sigma, "", false),
             "one standard deviation from mismatch");
    }
}

static void output_curve(struct layout *layout, const struct output_result *row)
{
    const struct chart chart = {
        .x = row->curve.v,
        .y = row->curve.current,
        .count = row->curve.count,
        .x_dimension = DIMENSION_VOLTAGE,
        .y_dimension = DIMENSION_CURRENT,
        .x_name = "load voltage",
        .edge = row->compliance,
        .edge_name = "compliance",
        .point = row->output->at,
        .point_name = "here, at",
    };
    layout_gap(layout);
    chart_draw(layout, &chart);
}

static void one_output(struct layout *layout, const struct result *result,
                       const struct output_result *row)
{
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "%s %s %s at %s", layout_short(layout, row->output->name, 28),
                              row->is_sink ? "sinks" : "sources",
                              show_value(layout, fabs(row->current), DIMENSION_CURRENT),
                              show_value(layout, row->output->at, DIMENSION_VOLTAGE)));
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .right = true});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    resistance_fact(&table, row);
    compliance_fact(&table, row);
    band_facts(&table, row);
    drift_facts(&table, result, row);
    table_write(&table);
    for (int k = 0; k < row->event_count; k++) {
        page_event(layout, &row->events[k], DIMENSION_VOLTAGE);
    }
}

void page_outputs(struct layout *layout, const struct result *result)
{
    layout_part(layout, result->output_count == 1 ? "output" : "outputs");
    for (int k = 0; k < result->output_count; k++) {
        if (k > 0) {
            layout_gap(layout);
        }
        one_output(layout, result, &result->outputs[k]);
        if (result->output_count <= CURVE_OUTPUT_LIMIT && result->outputs[k].curve.count > 0) {
            output_curve(layout, &result->outputs[k]);
        }
    }
}
