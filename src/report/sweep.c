/* sweep.c: sweeps as tables, with what happened on the way. */
#include "report/page_parts.h"

#include <math.h>

#include "report/chart.h"
#include "report/show.h"
#include "report/table.h"

/* A longer table is thinned to about SHOWN rows, and says so. */
enum { ROW_LIMIT = 60, SHOWN = 40 };

static const char *knob_value(struct layout *layout, const struct knob *knob, double value)
{
    return knob->kind == KNOB_TEMPERATURE ? show_celsius(layout, value)
                                          : show_value(layout, value, knob->dimension);
}

static void point_rows(struct layout *layout, const struct sweep *sweep,
                       const struct sweep_series *series)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = layout_short(layout, sweep->knob.name, 24),
                                               .right = true});
    int columns = sweep->shown_count;
    if (columns > TABLE_COLUMN_LIMIT - 1) {
        columns = TABLE_COLUMN_LIMIT - 1;
    }
    for (int q = 0; q < columns; q++) {
        table_column(&table,
                     (struct table_column){.head = layout_short(layout, sweep->shown[q].text, 24),
                                           .right = true,
                                           .may_drop = q > 0});
    }
    int step = series->count > ROW_LIMIT ? (series->count + SHOWN - 1) / SHOWN : 1;
    for (int k = 0; k < series->count; k++) {
        if (k % step != 0 && k != series->count - 1) {
            continue;
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, knob_value(layout, &sweep->knob, series->knob[k]));
        for (int q = 0; q < columns; q++) {
            table_cell(
                &table, 1 + q,
                show_probe(layout, &sweep->shown[q], series->values[k * sweep->shown_count + q]));
        }
    }
    table_write(&table);
    if (step > 1) {
        layout_line(layout, TONE_QUIET,
                    layout_format(layout, "one row in %d of %d points; --csv and --json have all",
                                  step, series->count));
    }
}

/* The first quantity shown, as a curve. */
static void first_curve(struct layout *layout, const struct sweep *sweep,
                        const struct sweep_series *series)
{
    double *values = arena_new_array(layout->arena, double, series->count);
    double *knob = arena_new_array(layout->arena, double, series->count);
    if (values == NULL || knob == NULL || series->count < 2 || sweep->shown_count == 0) {
        return;
    }
    bool is_temperature = sweep->knob.kind == KNOB_TEMPERATURE;
    bool rising = series->knob[series->count - 1] >= series->knob[0];
    for (int k = 0; k < series->count; k++) {
        int from = rising ? k : series->count - 1 - k;
        knob[k] = series->knob[from] - (is_temperature ? 273.15 : 0.0);
        values[k] = series->values[from * sweep->shown_count];
    }
    const struct chart chart = {
        .x = knob,
        .y = values,
        .count = series->count,
        .x_dimension = is_temperature ? DIMENSION_NONE : sweep->knob.dimension,
        .y_dimension = sweep->shown[0].dimension,
        .x_name = is_temperature ? "temperature, C" : layout_short(layout, sweep->knob.name, 30),
        .edge = NAN,
        .point = NAN,
    };
    layout_line(layout, TONE_STRONG, layout_short(layout, sweep->shown[0].text, 50));
    chart_draw(layout, &chart);
    layout_gap(layout);
}

static void sweep_part(struct layout *layout, const struct sweep_table *table)
{
    const struct sweep *sweep = table->sweep;
    layout_part(layout, "sweep");
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "%s from %s to %s",
                              layout_short(layout, sweep->knob.name, 30),
                              knob_value(layout, &sweep->knob, sweep->from),
                              knob_value(layout, &sweep->knob, sweep->to)));
    for (int s = 0; s < table->series_count; s++) {
        const struct sweep_series *series = &table->series[s];
        if (sweep->has_family) {
            layout_gap(layout);
            layout_line(layout, TONE_STRONG,
                        layout_format(layout, "%s = %s",
                                      layout_short(layout, sweep->family.name, 30),
                                      knob_value(layout, &sweep->family, series->family_value)));
        } else {
            first_curve(layout, sweep, series);
        }
        point_rows(layout, sweep, series);
        for (int k = 0; k < series->event_count; k++) {
            page_event(layout, &series->events[k], sweep->knob.dimension);
        }
    }
}

void report_sweep(const struct result *result, const struct report_style *style, struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (result->point.solver.converged) {
        for (int k = 0; k < result->sweep_count; k++) {
            sweep_part(&layout, &result->sweeps[k]);
        }
        if (result->sweep_count == 0 && !style->stopped) {
            layout_part(&layout, "sweep");
            layout_paragraph(
                &layout, TONE_PLAIN, 0,
                "the cell has neither a `sweep` line nor an output; write one, or give "
                "--sweep \"THING from A to B show QUANTITY\"");
        }
    } else if (!style->stopped) {
        page_unsolved(&layout, result);
    }
    page_cautions(&layout, result);
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}
