/* calibration.c: a calibration on a page: fit table, charts, values with errors, remarks. */
#include "report/calibration.h"

#include <math.h>
#include <string.h>

#include "report/chart.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/table.h"

enum { CHART_LIMIT = 3 /* devices whose error curve is drawn */, BAR_CELLS = 20, NAME_LIMIT = 36 };

/* A full bar in the overview. */
static const double bar_full = 0.2;

/* "1.64", "-": in per cent */
static const char *rms_text(struct layout *layout, const struct misfit *figure)
{
    return figure->count == 0 ? "-" : layout_format(layout, "%.2f", 100 * figure->rms);
}

static const char *worst_text(struct layout *layout, const struct misfit *figure)
{
    return figure->count == 0 ? "" : layout_format(layout, "%+.1f", 100 * figure->worst);
}

/* "nch_w7u_l8u", or its middle left out */
static const char *device_text(struct layout *layout, const struct calibration *c, int device)
{
    const char *name = report_file_name(c, device), *dot = strrchr(name, '.');
    size_t length = dot == NULL ? strlen(name) : (size_t)(dot - name);
    return layout_short(layout, layout_format(layout, "%.*s", (int)length, name), NAME_LIMIT);
}

static const char *model_text(struct layout *layout, const struct calibration *c,
                              const struct comparison *it)
{
    const char *name = c->fits[it->fit].name;
    return it->is_held ? layout_format(layout, "%s, predicted", name) : name;
}

static bool has_geometry(const struct calibration *c, const struct comparison *it)
{
    return !isnan(c->devices[it->device].data.length);
}

static void opening(struct layout *layout, const struct calibration *c)
{
    int fitted = 0, held = 0;
    for (int k = 0; k < c->device_count; k++) {
        fitted += c->devices[k].is_held ? 0 : 1;
        held += c->devices[k].is_held ? 1 : 0;
    }
    layout_part(layout, "calibration");
    layout_line(layout, TONE_STRONG,
                held == 0
                    ? layout_format(layout, "%d device%s fitted", fitted, fitted == 1 ? "" : "s")
                    : layout_format(layout, "%d device%s fitted, %d predicted", fitted,
                                    fitted == 1 ? "" : "s", held));
    layout_line(layout, TONE_QUIET,
                layout_format(layout, "measured at %s; readings good to %s and %.2g %%",
                              show_celsius(layout, c->measured_kelvin),
                              show_round(layout, c->noise, DIMENSION_CURRENT), 100 * c->relative));
}

static void transistor_row(struct table *table, const struct calibration *c,
                           const struct comparison *it)
{
    struct layout *layout = table->layout;
    const struct device_figures *figures = &it->figures;
    table_row(table, TONE_PLAIN);
    table_cell(table, 0, device_text(layout, c, it->device));
    table_cell(table, 1, model_text(layout, c, it));
    table_cell(table, 2, rms_text(layout, &figures->id[FIGURES_SATURATION]));
    table_cell(table, 3, worst_text(layout, &figures->id[FIGURES_SATURATION]));
    table_cell(table, 4, rms_text(layout, &figures->id[FIGURES_TRIODE]));
    table_cell(table, 5, rms_text(layout, &figures->id[FIGURES_WEAK]));
    table_cell(table, 6, rms_text(layout, &figures->gm));
    table_cell(table, 7,
               figures->gds.count == 0 ? "-"
                                       : layout_format(layout, "%.1f (%d)", 100 * figures->gds.rms,
                                                       figures->gds.count));
}

static void begin_table(struct table *table, struct layout *layout, const char *const *heads,
                        int count)
{
    table_begin(table, layout);
    for (int k = 0; k < count; k++) {
        table_column(table, (struct table_column){.head = heads[k], .right = k > 1});
    }
}

static void transistor_table(struct layout *layout, const struct calibration *c)
{
    static const char *const heads[] = {"error, %", "model", "saturation", "worst",
                                        "triode",   "weak",  "gm",         "gds"};
    struct table table;
    begin_table(&table, layout, heads, (int)(sizeof heads / sizeof heads[0]));
    for (int k = 0; k < c->comparison_count; k++) {
        if (has_geometry(c, &c->comparisons[k])) {
            transistor_row(&table, c, &c->comparisons[k]);
        }
    }
    layout_part(layout, "fit table");
    table_write(&table);
    if (table.row_count > 0) {
        layout_paragraph(
            layout, TONE_QUIET, 2,
            "rms of model/reading - 1; saturation: vds > 0.4 V, 50 mV above threshold, id > 20 nA; "
            "gm there; gds: slope of each drain sweep there (sweeps that show one)");
    }
}

static void junction_table(struct layout *layout, const struct calibration *c)
{
    static const char *const heads[] = {"error, %", "model", "current", "worst", "base current"};
    struct table table;
    begin_table(&table, layout, heads, (int)(sizeof heads / sizeof heads[0]));
    for (int k = 0; k < c->comparison_count; k++) {
        const struct comparison *it = &c->comparisons[k];
        if (has_geometry(c, it)) {
            continue;
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, device_text(layout, c, it->device));
        table_cell(&table, 1, model_text(layout, c, it));
        table_cell(&table, 2, rms_text(layout, &it->figures.id[FIGURES_SATURATION]));
        table_cell(&table, 3, worst_text(layout, &it->figures.id[FIGURES_SATURATION]));
        table_cell(&table, 4, rms_text(layout, &it->figures.ib));
    }
    layout_part(layout, "fit table");
    table_write(&table);
}

/* One bar a device: the rms error in saturation. */
static void overview(struct layout *layout, const struct calibration *c)
{
    struct table table;
    const char *block = layout->style.ascii ? "#" : "\xE2\x96\x88";
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .right = true});
    table_column(&table, (struct table_column){.head = ""});
    for (int k = 0; k < c->comparison_count; k++) {
        const struct comparison *it = &c->comparisons[k];
        const struct misfit *figure = &it->figures.id[FIGURES_SATURATION];
        int cells = (int)fmin(round(BAR_CELLS * figure->rms / bar_full), BAR_CELLS);
        const char *bar = "";
        for (int n = 0; figure->count > 0 && n < (cells < 1 ? 1 : cells); n++) {
            bar = layout_format(layout, "%s%s", bar, block);
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, device_text(layout, c, it->device));
        table_cell(&table, 1, model_text(layout, c, it));
        table_cell(&table, 2, layout_format(layout, "%s %%", rms_text(layout, figure)));
        table_cell(&table, 3, bar);
    }
    layout_part(layout, "error, rms");
    table_write(&table);
}

static void error_charts(struct layout *layout, const struct calibration *c)
{
    for (int k = 0; k < c->comparison_count && c->comparison_count <= CHART_LIMIT; k++) {
        const struct comparison *it = &c->comparisons[k];
        struct chart chart = {.x = it->curve.x,
                              .y = it->curve.y,
                              .count = it->curve.count,
                              .x_dimension = DIMENSION_VOLTAGE,
                              .y_dimension = DIMENSION_NONE,
                              .x_name = it->curve.voltage,
                              .edge = NAN,
                              .point = NAN};
        if (it->curve.count < 2) {
            continue;
        }
        if (has_geometry(c, it)) {
            chart.edge = c->devices[it->device].facts.threshold;
            chart.edge_name = "threshold";
        }
        layout_part(layout, "error curve");
        layout_line(layout, TONE_PLAIN,
                    layout_format(layout, "%s, %s: model/reading - 1 at the highest vds",
                                  device_text(layout, c, it->device), c->fits[it->fit].name));
        layout_gap(layout);
        chart_draw(layout, &chart);
    }
}

static const char *origin_text(const struct fitted_value *it)
{
    switch (it->origin) {
    case ORIGIN_FITTED:
        return "";
    case ORIGIN_LIMIT:
        return "at the end of its range";
    case ORIGIN_HELD:
        return "held";
    case ORIGIN_SHAPE:
        return "fixed";
    case ORIGIN_DEFAULT:
    case ORIGIN_COUNT:
        break;
    }
    return "default";
}

static void values_table(struct layout *layout, const struct fit *fit)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "value", .right = true});
    table_column(&table, (struct table_column){.head = "standard error", .right = true});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    for (int k = 0; k < fit->value_count; k++) {
        const struct fitted_value *it = &fit->values[k];
        bool is_absent = isnan(it->value) && it->parameter->when_absent == DEFAULT_NONE;
        bool is_fixed = it->origin == ORIGIN_SHAPE &&
                        (is_absent || (fabs(it->value) <= 0 && fabs(it->parameter->standard) <= 0));
        if ((it->origin == ORIGIN_DEFAULT && it->reason == NULL) || is_fixed) {
            continue;
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, it->parameter->name);
        table_cell(&table, 1,
                   isnan(it->value) ? "none"
                                    : show_value(layout, it->value, it->parameter->dimension));
        table_cell(&table, 2,
                   it->origin == ORIGIN_FITTED
                       ? show_value(layout, it->standard, it->parameter->dimension)
                       : "");
        table_cell(&table, 3,
                   it->reason != NULL && it->origin != ORIGIN_LIMIT
                       ? layout_format(layout, "%s: %s", origin_text(it), it->reason)
                       : origin_text(it));
    }
    table_write(&table);
}

static const char *correlated_name(struct layout *layout, const struct calibration *c,
                                   const struct fit *fit, int index)
{
    if (index >= 0) {
        return fit->values[index].parameter->name;
    }
    return layout_format(layout, "offset of %s", device_text(layout, c, -1 - index));
}

/* The threshold offsets of a set. */
static void offsets_table(struct layout *layout, const struct calibration *c, const struct fit *fit)
{
    static const char *const heads[] = {"", "", "threshold offset", "standard error"};
    struct table table;
    begin_table(&table, layout, heads, (int)(sizeof heads / sizeof heads[0]));
    for (int k = 0; k < fit->device_count && fit->is_set; k++) {
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, device_text(layout, c, fit->devices[k]));
        table_cell(&table, 2, layout_format(layout, "%+.1f mV", 1e3 * fit->offsets[k]));
        table_cell(&table, 3, layout_format(layout, "%.1f mV", 1e3 * fit->offset_errors[k]));
    }
    table_write(&table);
}

static void model_part(struct layout *layout, const struct calibration *c, const struct fit *fit)
{
    layout_part(layout, "model");
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "%s, %s", fit->name, fit->type->model_kind));
    if (fit->alias_of != NULL) {
        layout_paragraph(layout, TONE_QUIET, 2,
                         layout_format(layout, "the values of %s: %s", fit->alias_of, fit->remark));
        return;
    }
    layout_paragraph(
        layout, TONE_QUIET, 2,
        layout_format(layout,
                      "%s; rank %d of %d free values, %d readings and rises, rms of the weighted "
                      "residuals %.2f",
                      fit->is_set ? "one set for all devices, a threshold offset each"
                      : !isfinite(fit->length_range[0]) ? "one device"
                                                        : "one card for one size",
                      fit->rank, fit->free_count, fit->residual_count, sqrt(fit->reduced)));
    layout_line(
        layout, TONE_QUIET,
        layout_format(layout, "search: %d evaluations, then %s", fit->evaluations, fit->ended));
    if (fit->remark != NULL) {
        layout_paragraph(layout, TONE_WARN, 2, fit->remark);
    }
    values_table(layout, fit);
    offsets_table(layout, c, fit);
    for (int k = 0; k < fit->correlation_count; k++) {
        const struct correlated *it = &fit->correlations[k];
        layout_line(layout, TONE_QUIET,
                    layout_format(layout, "correlation %+.3f  %s, %s", it->value,
                                  correlated_name(layout, c, fit, it->a),
                                  correlated_name(layout, c, fit, it->b)));
    }
}

/* A resistor is no model: its line for a cell. */
static void resistor_part(struct layout *layout, const struct calibration *c,
                          const struct fitted_resistor *it)
{
    layout_part(layout, "resistor");
    layout_line(layout, TONE_PLAIN,
                layout_format(layout, "%s: %s, standard error %s, at %s",
                              device_text(layout, c, it->device),
                              show_value(layout, it->ohm, DIMENSION_RESISTANCE),
                              show_value(layout, it->ohm_error, DIMENSION_RESISTANCE),
                              show_celsius(layout, it->kelvin)));
    if (!isnan(it->tempco)) {
        layout_line(layout, TONE_PLAIN,
                    layout_format(layout, "tempco %.1f ppm/K, standard error %.1f ppm/K",
                                  1e6 * it->tempco, 1e6 * it->tempco_error));
    }
    if (!isnan(it->tempco2)) {
        layout_line(layout, TONE_PLAIN,
                    layout_format(layout, "tempco2 %.4g 1/K^2, standard error %.2g 1/K^2",
                                  it->tempco2, it->tempco2_error));
    }
    layout_line(
        layout, TONE_QUIET,
        layout_format(
            layout, "in a cell: resistor R1 a -> b %.6g%s%s", it->ohm,
            isnan(it->tempco) ? "" : layout_format(layout, " tempco=%.6g/K", it->tempco),
            isnan(it->tempco2) ? "" : layout_format(layout, " tempco2=%.6g/K^2", it->tempco2)));
}

static void remarks(struct layout *layout, const struct calibration *c)
{
    layout_part(layout, "remarks");
    for (int k = 0; k < c->remark_count; k++) {
        const struct calibration_remark *it = &c->remarks[k];
        layout_paragraph(layout, TONE_PLAIN, 2,
                         layout_format(layout, "%s: %s%s%s", it->code,
                                       it->device < 0 ? "" : device_text(layout, c, it->device),
                                       it->device < 0 ? "" : ": ", it->text));
    }
}

void report_calibration(const struct calibration *calibration, const struct report_style *style,
                        struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    opening(&layout, calibration);
    transistor_table(&layout, calibration);
    junction_table(&layout, calibration);
    overview(&layout, calibration);
    error_charts(&layout, calibration);
    for (int k = 0; k < calibration->fit_count; k++) {
        model_part(&layout, calibration, &calibration->fits[k]);
    }
    for (int k = 0; k < calibration->resistor_count; k++) {
        resistor_part(&layout, calibration, &calibration->resistors[k]);
    }
    remarks(&layout, calibration);
    page_closing(&layout);
    layout_end(&layout);
}
