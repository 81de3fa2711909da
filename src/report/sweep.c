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

/* One quantity of one series, in the order of a rising knob; NULL when memory is short. */
static double *rising_values(struct layout *layout, const struct sweep *sweep,
                             const struct sweep_series *series, int quantity)
{
    double *values = arena_new_array(layout->arena, double, series->count);
    bool rising = series->count > 0 && series->knob[series->count - 1] >= series->knob[0];
    for (int k = 0; values != NULL && k < series->count; k++) {
        int from = rising ? k : series->count - 1 - k;
        values[k] = series->values[from * sweep->shown_count + quantity];
    }
    return values;
}

static double *rising_knob(struct layout *layout, const struct sweep *sweep,
                           const struct sweep_series *series)
{
    double *knob = arena_new_array(layout->arena, double, series->count);
    double zero = sweep->knob.kind == KNOB_TEMPERATURE ? 273.15 : 0.0;
    bool rising = series->count > 0 && series->knob[series->count - 1] >= series->knob[0];
    for (int k = 0; knob != NULL && k < series->count; k++) {
        knob[k] = series->knob[rising ? k : series->count - 1 - k] - zero;
    }
    return knob;
}

static const char *family_name(struct layout *layout, const struct sweep *sweep, double value)
{
    return layout_format(layout, "%s = %s", layout_short(layout, sweep->family.name, 30),
                         sweep->family.kind == KNOB_TEMPERATURE
                             ? show_celsius(layout, value)
                             : show_round(layout, value, sweep->family.dimension));
}

/* Whether all series have the same points, so that they can stand side by side. */
static bool is_abreast(const struct sweep_table *table)
{
    const struct sweep_series *first = &table->series[0];
    for (int s = 1; s < table->series_count; s++) {
        const struct sweep_series *series = &table->series[s];
        if (series->count != first->count) {
            return false;
        }
        for (int k = 0; k < series->count; k++) {
            if (series->knob[k] != first->knob[k]) {
                return false;
            }
        }
    }
    return table->series_count > 0;
}

/* One quantity: as a curve, or with a curve for each value of the family. */
static void quantity_chart(struct layout *layout, const struct sweep_table *table, int quantity)
{
    enum { LETTERS = 26 };
    const struct sweep *sweep = table->sweep;
    const struct sweep_series *first = &table->series[0];
    const int count = table->series_count < LETTERS ? table->series_count : LETTERS;
    const double **curves = arena_new_array(layout->arena, const double *, count);
    const char **names = arena_new_array(layout->arena, const char *, count);
    double *knob = rising_knob(layout, sweep, first);
    if (curves == NULL || names == NULL || knob == NULL) {
        return;
    }
    for (int s = 0; s < count; s++) {
        curves[s] = rising_values(layout, sweep, &table->series[s], quantity);
        names[s] =
            sweep->has_family ? family_name(layout, sweep, table->series[s].family_value) : "";
        if (curves[s] == NULL) {
            return;
        }
    }
    bool is_temperature = sweep->knob.kind == KNOB_TEMPERATURE;
    const struct chart chart = {
        .x = knob,
        .y = curves[0],
        .count = first->count,
        .x_dimension = is_temperature ? DIMENSION_NONE : sweep->knob.dimension,
        .y_dimension = sweep->shown[quantity].dimension,
        .x_name = is_temperature ? "temperature, C" : layout_short(layout, sweep->knob.name, 30),
        .edge = NAN,
        .point = NAN,
        .family = curves,
        .family_names = names,
        .family_count = sweep->has_family ? count : 0,
    };
    layout_line(layout, TONE_STRONG, layout_short(layout, sweep->shown[quantity].text, 50));
    chart_draw(layout, &chart);
    layout_gap(layout);
}

/* The rows of one quantity, a column for each value of the family. */
static void family_rows(struct layout *layout, const struct sweep_table *all)
{
    const struct sweep *sweep = all->sweep;
    const struct sweep_series *first = &all->series[0];
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = layout_short(layout, sweep->knob.name, 24),
                                               .right = true});
    for (int s = 0; s < all->series_count; s++) {
        table_column(&table, (struct table_column){
                                 .head = family_name(layout, sweep, all->series[s].family_value),
                                 .right = true});
    }
    int step = first->count > ROW_LIMIT ? (first->count + SHOWN - 1) / SHOWN : 1;
    for (int k = 0; k < first->count; k++) {
        if (k % step != 0 && k != first->count - 1) {
            continue;
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, knob_value(layout, &sweep->knob, first->knob[k]));
        for (int s = 0; s < all->series_count; s++) {
            table_cell(&table, 1 + s,
                       show_probe(layout, &sweep->shown[0], all->series[s].values[k]));
        }
    }
    table_write(&table);
    if (step > 1) {
        layout_line(layout, TONE_QUIET,
                    layout_format(layout, "one row in %d of %d points; --csv and --json have all",
                                  step, first->count));
    }
}

/* Events of one series; of a family with the value at which they happened. */
static void series_events(struct layout *layout, const struct sweep *sweep,
                          const struct sweep_series *series)
{
    if (sweep->has_family && series->event_count > 0) {
        layout_line(layout, TONE_STRONG, family_name(layout, sweep, series->family_value));
    }
    for (int k = 0; k < series->event_count; k++) {
        page_event(layout, &series->events[k], sweep->knob.dimension);
    }
}

/* Characters that family_rows needs. */
static int family_width(struct layout *layout, const struct sweep_table *table)
{
    enum { VALUE = 10, GAP = 2 };
    int width = text_width(layout_short(layout, table->sweep->knob.name, 24));
    width = width > VALUE ? width : VALUE;
    for (int s = 0; s < table->series_count; s++) {
        int head = text_width(family_name(layout, table->sweep, table->series[s].family_value));
        width += GAP + (head > VALUE ? head : VALUE);
    }
    return table->series_count < TABLE_COLUMN_LIMIT ? width : layout->width + 1;
}

static void family_part(struct layout *layout, const struct sweep_table *table)
{
    const struct sweep *sweep = table->sweep;
    for (int q = 0; q < sweep->shown_count; q++) {
        quantity_chart(layout, table, q);
    }
    const bool is_compact = sweep->shown_count == 1 && family_width(layout, table) <= layout->width;
    if (is_compact) {
        family_rows(layout, table);
    }
    for (int s = 0; s < table->series_count; s++) {
        if (!is_compact) {
            layout_gap(layout);
            layout_line(layout, TONE_STRONG,
                        family_name(layout, sweep, table->series[s].family_value));
            point_rows(layout, sweep, &table->series[s]);
        }
        series_events(layout, sweep, &table->series[s]);
    }
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
    if (sweep->has_family && is_abreast(table) && table->series[0].count > 1) {
        family_part(layout, table);
        return;
    }
    for (int s = 0; s < table->series_count; s++) {
        const struct sweep_series *series = &table->series[s];
        if (sweep->has_family) {
            layout_gap(layout);
            layout_line(layout, TONE_STRONG, family_name(layout, sweep, series->family_value));
        } else if (series->count > 1 && sweep->shown_count > 0) {
            quantity_chart(layout, table, 0);
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
