/* web_figures.c: outputs with their curves, and the devices, as HTML. */
#include <math.h>

#include "report/figures.h"
#include "report/markup.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/web.h"

static void put_numbers(struct buffer *out, const char *key, const double *values, int count)
{
    buffer_format(out, "\"%s\":[", key);
    for (int k = 0; k < count; k++) {
        buffer_text(out, k > 0 ? "," : "");
        markup_number(out, values[k]);
    }
    buffer_text(out, "]");
}

static void put_axis(struct buffer *out, const char *key, const struct figure_axis *axis)
{
    buffer_format(out, "\"%s\":{\"name\":", key);
    markup_json(out, axis->name);
    buffer_text(out, ",\"unit\":");
    markup_json(out, axis->unit);
    buffer_format(out, ",\"prefix\":%s},", axis->takes_prefix ? "true" : "false");
}

/* Bars as a curve through the middles of their tops, which the crosshair then follows. */
static void put_bars(struct buffer *out, const struct figure *figure)
{
    markup_json(out, figure->y.name);
    buffer_text(out, ",\"x\":[");
    for (int k = 0; k < figure->bar_count; k++) {
        buffer_text(out, k > 0 ? "," : "");
        markup_number(out, 0.5 * (figure->bars[k].from + figure->bars[k].to));
    }
    buffer_text(out, "],\"y\":[");
    for (int k = 0; k < figure->bar_count; k++) {
        buffer_text(out, k > 0 ? "," : "");
        markup_number(out, figure->bars[k].y);
    }
    buffer_text(out, "]}");
}

/* The data that the crosshair of a picture reads. */
static void put_data(struct buffer *out, const struct figure *figure)
{
    const bool has_bars = figure->bar_count > 0;
    buffer_text(out, "<script type=\"application/json\">{");
    put_axis(out, "x", &figure->x);
    put_axis(out, "y", &figure->y);
    buffer_format(out, "\"bars\":%s,\"series\":[", has_bars ? "true" : "false");
    if (has_bars) {
        buffer_text(out, "{\"name\":");
        put_bars(out, figure);
    }
    for (int s = 0; s < figure->series_count; s++) {
        const struct figure_series *series = &figure->series[s];
        buffer_text(out, s > 0 || has_bars ? ",{\"name\":" : "{\"name\":");
        markup_json(out, series->name);
        buffer_text(out, ",");
        put_numbers(out, "x", series->x, series->count);
        buffer_text(out, ",");
        put_numbers(out, "y", series->y, series->count);
        buffer_text(out, "}");
    }
    buffer_text(out, "]}</script>\n");
}

void web_figure(struct layout *layout, const struct figure *figure)
{
    struct buffer *out = layout->out;
    buffer_text(out, "<div class=\"plot\" tabindex=\"0\" role=\"group\" aria-label=\"");
    markup_text(out, figure->title);
    buffer_text(out, "; arrow keys move the crosshair\">\n");
    figure_draw(figure, FIGURE_IN_PAGE, 0, out);
    put_data(out, figure);
    buffer_format(out,
                  "<p class=\"readout quiet\" aria-live=\"polite\">Point at the %s, or use the "
                  "arrow keys, to read values.</p>\n</div>\n",
                  figure->bar_count > 0 ? "bars" : "curve");
}

void web_figures(struct layout *layout, const struct figure_list *figures)
{
    for (int k = 0; k < figures->count; k++) {
        web_figure(layout, &figures->list[k]);
    }
}

static void output_row(struct layout *layout, struct web_table *table,
                       const struct output_result *row)
{
    const double values[] = {row->output->at, fabs(row->current), row->resistance,
                             row->compliance, row->low,           row->high};
    const struct dimension dimensions[] = {DIMENSION_VOLTAGE,    DIMENSION_CURRENT,
                                           DIMENSION_RESISTANCE, DIMENSION_VOLTAGE,
                                           DIMENSION_VOLTAGE,    DIMENSION_VOLTAGE};
    web_table_row(table);
    web_table_name(table, row->output->name, 0);
    web_table_text(table, row->is_sink ? "sinks" : "sources");
    for (int k = 0; k < 6; k++) {
        bool is_unlimited = k == 2 && row->resistance_unlimited;
        web_table_value(table, is_unlimited ? 1e300 : values[k],
                        is_unlimited ? "unlimited"
                                     : markup_units(layout->arena,
                                                    show_value(layout, values[k], dimensions[k])));
    }
    web_table_value(table, row->flatness, show_share(layout, row->flatness, "", false));
    web_table_value(table, row->tempco, show_share(layout, row->tempco, "/K", true));
    web_table_value(table, row->sigma, show_share(layout, row->sigma, "", false));
}

void web_outputs(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Output",     "",           "At",   "Current",
                                        "Resistance", "Compliance", "Low",  "High",
                                        "Flatness",   "Tempco",     "Sigma"};
    static const bool numbers[] = {false, false, true, true, true, true,
                                   true,  true,  true, true, true};
    struct web_table table;
    struct figure_list figures = figures_of_curves(layout, result);
    if (result->output_count > 0) {
        web_heading(layout, "outputs", result->output_count == 1 ? "Output" : "Outputs");
        web_table_begin(&table, layout->out, "What each output does", heads, numbers, 11);
        for (int k = 0; k < result->output_count; k++) {
            output_row(layout, &table, &result->outputs[k]);
        }
        web_table_end(&table);
    }
    web_figures(layout, &figures);
}

static void rail_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Rail", "Voltage", "Delivers", "Power"};
    static const bool numbers[] = {false, true, true, true};
    struct web_table table;
    if (result->circuit->rail_count == 0) {
        return;
    }
    web_table_begin(&table, layout->out, "Supply", heads, numbers, 4);
    for (int k = 0; k < result->circuit->rail_count; k++) {
        const struct rail_result *rail = &result->point.rails[k];
        web_table_row(&table);
        web_table_name(&table, rail->rail->name, 0);
        web_table_value(
            &table, rail->v,
            markup_units(layout->arena, show_value(layout, rail->v, DIMENSION_VOLTAGE)));
        web_table_value(
            &table, rail->current,
            markup_units(layout->arena, show_value(layout, rail->current, DIMENSION_CURRENT)));
        web_table_value(
            &table, rail->power,
            markup_units(layout->arena, show_value(layout, rail->power, DIMENSION_POWER)));
    }
    web_table_end(&table);
}

static void device_row(struct layout *layout, struct web_table *table,
                       const struct device_result *row, const struct quantity_column *columns,
                       int count)
{
    const struct device_type *type = row->instance->type;
    web_table_row(table);
    web_table_name(table, row->instance->name, 0);
    web_table_text(table, type->word);
    if (type->is_transistor) {
        web_table_text(table, row->region_text);
    }
    for (int c = 0; c < count; c++) {
        int name = 0, quantity = column_quantity(&columns[c], type, &name);
        double value = quantity >= 0 ? row->q[quantity] : (double)NAN;
        web_table_value(
            table, value,
            quantity < 0
                ? ""
                : markup_units(layout->arena,
                               show_value(layout, value, type->quantities[quantity].dimension)));
    }
}

static void device_group(struct layout *layout, const struct result *result, bool transistors)
{
    const struct quantity_column *columns = transistors ? transistor_columns : part_columns;
    int column_count = transistors ? TRANSISTOR_COLUMN_COUNT : PART_COLUMN_COUNT, count = 0;
    const struct device_result **shown =
        arena_new_array(layout->arena, const struct device_result *, result->point.device_count);
    const char *heads[3 + TRANSISTOR_COLUMN_COUNT] = {"Name", "Kind", "Region"};
    bool numbers[3 + TRANSISTOR_COLUMN_COUNT] = {false};
    struct web_table table;
    for (int k = 0; shown != NULL && k < result->point.device_count; k++) {
        if (result->point.devices[k].instance->type->is_transistor == transistors) {
            shown[count++] = &result->point.devices[k];
        }
    }
    if (count == 0) {
        return;
    }
    int first = transistors ? 3 : 2; /* other parts have no region */
    for (int c = 0; c < column_count; c++) {
        heads[first + c] = column_head(layout, &columns[c], shown, count);
        numbers[first + c] = true;
    }
    web_table_begin(&table, layout->out, transistors ? "Transistors" : "Other parts", heads,
                    numbers, first + column_count);
    for (int k = 0; k < count; k++) {
        device_row(layout, &table, shown[k], columns, column_count);
    }
    web_table_end(&table);
}

void web_devices(struct layout *layout, const struct result *result)
{
    web_heading(layout, "devices", "Operating point");
    rail_table(layout, result);
    device_group(layout, result, true);
    device_group(layout, result, false);
}
