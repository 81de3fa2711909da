/* figures_calibration.c: pictures of a calibration: readings as dots, the model as curves, errors.
 */
#include <math.h>
#include <string.h>

#include "report/calibration.h"
#include "report/figures_parts.h"
#include "report/show.h"

enum {
    DEVICES_DRAWN = 8, /* more devices appear in the pictures of errors only */
    CURVES_DRAWN = 24
};

/* Which voltages have pictures of their own. */
static const struct panel {
    enum column moved;
    bool is_logarithmic;
    const char *what, *axis;
} panels[] = {
    {COLUMN_VGS, true, "id against vgs", "gate-source voltage"},
    {COLUMN_VGS, false, "id against vgs", "gate-source voltage"},
    {COLUMN_VDS, false, "id against vds", "drain-source voltage"},
    {COLUMN_VBE, true, "ic against vbe", "base-emitter voltage"},
    {COLUMN_VCE, false, "ic against vce", "collector-emitter voltage"},
    {COLUMN_V, true, "i against v", "voltage"},
};

/* One device with what its model says. */
struct subject {
    const struct calibration *c;
    const struct comparison *comparison;
    const struct calibrated_device *device;
    enum column current;
    const double *model; /* [rows] */
};

/* "vds 0.1 V, vsb 0.9 V": what stays the same along a sweep. */
static const char *sweep_name(struct layout *layout, const struct measured *data,
                              const struct measured_sweep *sweep)
{
    static const enum column kept[] = {COLUMN_VGS, COLUMN_VDS, COLUMN_VSB, COLUMN_VBE, COLUMN_VCE};
    const struct measured_row *row = &data->rows[sweep->first];
    const char *name = "";
    for (size_t k = 0; k < sizeof kept / sizeof kept[0]; k++) {
        double value = row->value[kept[k]];
        bool is_plain = kept[k] == COLUMN_VSB && !(fabs(value) > 0);
        if (kept[k] == sweep->moved || isnan(value) || is_plain) {
            continue;
        }
        name = layout_format(layout, "%s%s%s %s", name, name[0] == '\0' ? "" : ", ",
                             column_rows[kept[k]].name,
                             show_round(layout, value, column_rows[kept[k]].dimension));
    }
    return data->kelvin_count < 2
               ? name
               : layout_format(layout, "%s%s%s", name, name[0] == '\0' ? "" : ", ",
                               show_celsius(layout, data->kelvins[row->kelvin]));
}

/* A sweep with its readings and its model; false when memory is short. */
static bool add_sweep(struct layout *layout, const struct subject *subject,
                      const struct panel *panel, const struct measured_sweep *sweep,
                      struct figure *figure)
{
    const struct measured *data = &subject->device->data;
    double *x = arena_new_array(layout->arena, double, sweep->count);
    double *y = arena_new_array(layout->arena, double, sweep->count);
    double *read = arena_new_array(layout->arena, double, sweep->count);
    if (x == NULL || y == NULL || read == NULL) {
        return false;
    }
    for (int k = 0; k < sweep->count; k++) {
        const struct measured_row *row = &data->rows[sweep->first + k];
        x[k] = row->value[panel->moved];
        y[k] = subject->model[sweep->first + k];
        read[k] = row->value[subject->current];
        if (panel->is_logarithmic && !(read[k] > 0)) {
            read[k] = NAN; /* below the noise; a logarithm has no place for it */
        }
    }
    figure->dots[figure->dots_count++] =
        (struct figure_dots){x, read, sweep->count, figure->series_count};
    figure->series[figure->series_count++] =
        (struct figure_series){.name = sweep_name(layout, data, sweep),
                               .x = x,
                               .y = y,
                               .count = sweep->count,
                               .reference = NAN};
    return true;
}

/* Whether a sweep carries current enough to be seen in this panel. */
static bool is_shown(const struct subject *subject, const struct panel *panel,
                     const struct measured_sweep *sweep)
{
    double most = 0;
    for (int k = 0; k < sweep->count; k++) {
        most =
            fmax(most, fabs(subject->device->data.rows[sweep->first + k].value[subject->current]));
    }
    return sweep->moved == panel->moved && sweep->count > 2 && most > 10 * subject->c->noise;
}

static bool add_panel(struct layout *layout, const struct subject *subject,
                      const struct panel *panel, struct figure_list *figures)
{
    const struct measured *data = &subject->device->data;
    int count = 0;
    for (int s = 0; s < data->sweep_count; s++) {
        count += is_shown(subject, panel, &data->sweeps[s]) ? 1 : 0;
    }
    if (count == 0) {
        return true;
    }
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_room(layout, figure, count)) {
        return false;
    }
    figure->dots = arena_new_array(layout->arena, struct figure_dots, count);
    if (figure->dots == NULL) {
        return false;
    }
    figure->title = layout_format(
        layout, "%s: %s", report_file_name(subject->c, subject->comparison->device), panel->what);
    figures_note(figure, layout_format(layout, "dots: readings; curves: model %s%s",
                                       subject->c->fits[subject->comparison->fit].name,
                                       subject->comparison->is_held ? ", predicted" : ""));
    figure->x = figures_axis(layout, panel->axis, column_rows[panel->moved].dimension);
    figure->y = figures_axis(layout, "current", DIMENSION_CURRENT);
    figure->linear = panel->is_logarithmic ? pow(10, floor(log10(subject->c->noise))) : 0;
    figure->keeps_zero = true;
    for (int s = 0; s < data->sweep_count && figure->series_count < CURVES_DRAWN; s++) {
        if (is_shown(subject, panel, &data->sweeps[s]) &&
            !add_sweep(layout, subject, panel, &data->sweeps[s], figure)) {
            return false;
        }
    }
    return true;
}

static bool add_device(struct layout *layout, const struct calibration *c,
                       const struct comparison *comparison, struct figure_list *figures)
{
    const struct calibrated_device *device = &c->devices[comparison->device];
    double *model = arena_new_array(layout->arena, double, device->data.row_count);
    if (model == NULL) {
        return false;
    }
    calibration_trace(c, comparison, model);
    const struct subject subject = {c, comparison, device, calibration_current(device), model};
    for (size_t k = 0; k < sizeof panels / sizeof panels[0]; k++) {
        if (!add_panel(layout, &subject, &panels[k], figures)) {
            return false;
        }
    }
    return true;
}

static const char *compared_name(struct layout *layout, const struct calibration *c,
                                 const struct comparison *it)
{
    return layout_format(layout, "%s, %s%s", report_file_name(c, it->device), c->fits[it->fit].name,
                         it->is_held ? ", predicted" : "");
}

/* The root mean square of each comparison as a bar. */
static bool add_errors(struct layout *layout, const struct calibration *c,
                       struct figure_list *figures)
{
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_rows(layout, figure, c->comparison_count)) {
        return false;
    }
    figure->title = "Error of the current by device, rms";
    figures_note(figure, "in saturation, for transistors with a size; the worst reading behind");
    for (int k = 0; k < c->comparison_count; k++) {
        const struct misfit *error = &c->comparisons[k].figures.id[FIGURES_SATURATION];
        if (error->count > 0) {
            figures_row(figure, compared_name(layout, c, &c->comparisons[k]), error->rms,
                        layout_format(layout, "%.2f %%", 100 * error->rms),
                        layout_format(layout, "%+.1f %%", 100 * error->worst));
        }
    }
    return true;
}

/* Error along the gate sweep of most drain voltage, all comparisons in one picture. */
static bool add_error_curves(struct layout *layout, const struct calibration *c,
                             struct figure_list *figures)
{
    int count = 0;
    for (int k = 0; k < c->comparison_count; k++) {
        count += c->comparisons[k].curve.count > 1 ? 1 : 0;
    }
    if (count == 0) {
        return true;
    }
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_room(layout, figure, count)) {
        return false;
    }
    figure->title = "Model/reading - 1 at the highest vds";
    figure->x = figures_axis(layout, "gate-source voltage", DIMENSION_VOLTAGE);
    figure->y = (struct figure_axis){"error", "%", false};
    figure->keeps_zero = true;
    for (int k = 0; k < c->comparison_count && figure->series_count < CURVES_DRAWN; k++) {
        const struct error_curve *curve = &c->comparisons[k].curve;
        double *y = arena_new_array(layout->arena, double, curve->count);
        if (y == NULL) {
            return false;
        }
        for (int j = 0; j < curve->count; j++) {
            y[j] = 100 * curve->y[j];
        }
        if (curve->count > 1) {
            figure->series[figure->series_count++] =
                (struct figure_series){.name = compared_name(layout, c, &c->comparisons[k]),
                                       .x = curve->x,
                                       .y = y,
                                       .count = curve->count,
                                       .reference = NAN};
        }
    }
    return true;
}

static bool is_first(const struct calibration *c, int comparison)
{
    for (int k = 0; k < comparison; k++) {
        if (c->comparisons[k].device == c->comparisons[comparison].device) {
            return false;
        }
    }
    return true;
}

static bool add_all(struct layout *layout, const struct calibration *c, struct figure_list *figures)
{
    int drawn = 0;
    if (!add_errors(layout, c, figures) || !add_error_curves(layout, c, figures)) {
        return false;
    }
    for (int k = 0; k < c->comparison_count; k++) {
        if (is_first(c, k) && drawn++ < DEVICES_DRAWN &&
            !add_device(layout, c, &c->comparisons[k], figures)) {
            return false;
        }
    }
    if (drawn > DEVICES_DRAWN) {
        figures_note(&figures->list[0],
                     layout_format(layout,
                                   "the curves below are those of the first %d of %d devices",
                                   DEVICES_DRAWN, drawn));
    }
    return true;
}

void report_plot_calibration(const struct calibration *calibration, struct buffer *out)
{
    struct layout layout;
    struct figure_list figures = {NULL, 0, 0};
    const struct report_style style = {.columns = 0};
    if (!layout_begin(&layout, &style, out)) {
        return;
    }
    if (calibration->comparison_count > 0) {
        if (add_all(&layout, calibration, &figures)) {
            figures_document(figures.list, figures.count, out);
        } else {
            out->failed = true;
        }
    }
    layout_end(&layout);
}
