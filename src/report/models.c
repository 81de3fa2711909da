/* models.c: every model value in force. */
#include "report/page_parts.h"

#include <math.h>

#include "report/show.h"
#include "report/table.h"

static const char *range_text(struct layout *layout, const char *name, const double *range,
                              struct dimension unit)
{
    if (isnan(range[0]) && isnan(range[1])) {
        return "";
    }
    bool is_kelvin = unit.kelvin != 0;
    const char *from =
        is_kelvin ? show_celsius(layout, range[0]) : show_round(layout, range[0], unit);
    const char *to =
        is_kelvin ? show_celsius(layout, range[1]) : show_round(layout, range[1], unit);
    return layout_format(layout, ", valid %s %s to %s", name, from, to);
}

static void model_part(struct layout *layout, const struct model *model)
{
    struct table table;
    layout_part(layout, "model");
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "%s, %s", layout_short(layout, model->name, 40),
                              model->type->model_kind));
    layout_paragraph(
        layout, TONE_QUIET, 2,
        layout_format(layout, "from %s, measured at %s%s%s%s",
                      model->process != NULL ? layout_clean(layout, model->process) : "the cell",
                      show_celsius(layout, model->measured_kelvin),
                      range_text(layout, "temperature", model->valid_kelvin, DIMENSION_TEMPERATURE),
                      range_text(layout, "L", model->valid_length, DIMENSION_LENGTH),
                      range_text(layout, "W", model->valid_width, DIMENSION_LENGTH)));
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "value", .right = true});
    table_column(&table, (struct table_column){.head = "", .may_drop = 0});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    for (int k = 0; k < model->type->model_parameter_count; k++) {
        const struct parameter *parameter = &model->type->model_parameters[k];
        if (parameter->when_absent == DEFAULT_HIDDEN) {
            continue;
        }
        double value = model->values[k];
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, parameter->name);
        table_cell(&table, 1,
                   isnan(value) ? "none" : show_round(layout, value, parameter->dimension));
        table_cell(&table, 2, model->given[k] ? "given" : "default");
        table_cell(&table, 3, parameter->text);
    }
    table_write(&table);
}

void report_models(const struct circuit *circuit, const struct report_style *style,
                   struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    for (int k = 0; k < circuit->model_count; k++) {
        model_part(&layout, &circuit->models[k]);
    }
    if (circuit->model_count == 0) {
        layout_part(&layout, "model");
        layout_line(&layout, TONE_PLAIN, "no model is in use");
    }
    page_closing(&layout);
    layout_end(&layout);
}
