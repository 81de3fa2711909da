/* figures.c: results to pictures: load curves of the outputs, and sweeps; which command has which.
 */
#include "report/figures_parts.h"

#include <math.h>
#include <string.h>

#include "report/show.h"

enum { SHARED_LIMIT = 12 };

static const struct figure_axis load_axis = {"load voltage", "V", true};
static const struct figure_axis current_axis = {"output current", "A", true};

/* "out sinks 97.13 nA at 0.9 V; resistance 343.7 MΩ; compliance 188.7 mV (M2)" */
static const char *output_note(struct layout *layout, const struct output_result *row)
{
    const char *resistance =
        row->resistance_unlimited ? "; resistance unlimited"
        : isfinite(row->resistance)
            ? layout_format(layout, "; resistance %s",
                            figures_value(layout, row->resistance, DIMENSION_RESISTANCE))
            : "";
    const char *compliance = "";
    if (isfinite(row->compliance)) {
        compliance = layout_format(
            layout, "; compliance %s%s%s%s",
            figures_value(layout, row->compliance, DIMENSION_VOLTAGE),
            row->compliance_device != NULL ? " (" : "",
            row->compliance_device != NULL ? layout_short(layout, row->compliance_device, 20) : "",
            row->compliance_device != NULL ? ")" : "");
    }
    return layout_format(layout, "%s %s %s at %s%s%s", layout_short(layout, row->output->name, 24),
                         row->is_sink ? "sinks" : "sources",
                         figures_value(layout, fabs(row->current), DIMENSION_CURRENT),
                         figures_round(layout, row->output->at, DIMENSION_VOLTAGE), resistance,
                         compliance);
}

/* The range of load voltages in which an output should be flat: from a little inside the
 * compliance edge to the far end; the knee itself would hide the slope. */
static void flat_range(const struct output_result *row, double *from, double *to)
{
    double low = row->output->from, high = row->output->to;
    if (isfinite(row->compliance) && row->is_sink) {
        low = row->compliance + 0.15 * (high - row->compliance);
    } else if (isfinite(row->compliance)) {
        high = row->compliance - 0.15 * (row->compliance - low);
    }
    *from = low;
    *to = high;
}

static void add_output(struct layout *layout, struct figure *figure,
                       const struct output_result *row)
{
    int index = figure->series_count++;
    double from = 0.0, to = 0.0;
    flat_range(row, &from, &to);
    figure->series[index] = (struct figure_series){
        .name = layout_short(layout, row->output->name, 22),
        .x = row->curve.v,
        .y = row->curve.current,
        .count = row->curve.count,
        .reference = fabs(row->current) > 0.0 ? fabs(row->current) : (double)NAN,
        .flat_from = from,
        .flat_to = to,
    };
    figure->marks[figure->mark_count++] = (struct figure_mark){
        .x = row->output->at, .y = fabs(row->current), .text = "", .series = index};
    if (isfinite(row->compliance)) {
        figure->edges[figure->edge_count++] =
            (struct figure_edge){.x = row->compliance, .text = "", .series = index};
    }
    figures_note(figure, output_note(layout, row));
    for (int k = 0; k < row->event_count; k++) {
        figures_note(figure,
                     layout_format(layout, "at %s: %s",
                                   figures_value(layout, row->events[k].at, DIMENSION_VOLTAGE),
                                   layout_clean(layout, row->events[k].text)));
    }
}

/* What only a picture of one output says: the band, and values beside ring and edge. */
static void detail_output(struct layout *layout, struct figure *figure,
                          const struct output_result *row)
{
    const struct output *output = row->output;
    figure->title = layout_format(layout, "Output %s: current against load voltage",
                                  layout_short(layout, output->name, 30));
    figure->marks[0].text = layout_format(
        layout, "%s at %s", figures_value(layout, fabs(row->current), DIMENSION_CURRENT),
        figures_round(layout, output->at, DIMENSION_VOLTAGE));
    if (figure->edge_count > 0) {
        figure->edges[0].text = layout_format(
            layout, "compliance %s", figures_value(layout, row->compliance, DIMENSION_VOLTAGE));
    }
    figure->band.from = isfinite(row->low) ? row->low : output->from;
    figure->band.to = isfinite(row->high) ? row->high : output->to;
    figure->band.text = layout_format(layout, "within %s %%",
                                      show_round(layout, output->within * 100.0, DIMENSION_NONE));
}

static bool shares_picture(const struct output_result *first, const struct output_result *row)
{
    double a = fabs(first->current), b = fabs(row->current);
    return a > 0.0 && b > 0.0 && a < FIGURES_SPAN * b && b < FIGURES_SPAN * a;
}

static void add_outputs(struct layout *layout, struct figure_list *figures,
                        const struct result *result)
{
    int k = 0;
    while (k < result->output_count) {
        const struct output_result *first = &result->outputs[k];
        struct figure *figure = figures_add(layout, figures);
        if (figure == NULL || !figures_room(layout, figure, SHARED_LIMIT)) {
            return;
        }
        figure->x = load_axis;
        figure->y = current_axis;
        figure->keeps_zero = true;
        while (k < result->output_count && figure->series_count < SHARED_LIMIT &&
               (figure->series_count == 0 || shares_picture(first, &result->outputs[k]))) {
            if (result->outputs[k].curve.count > 1) {
                add_output(layout, figure, &result->outputs[k]);
            }
            k++;
        }
        figure->title = "Outputs: current against load voltage";
        if (figure->series_count == 1) {
            detail_output(layout, figure, first);
        }
        if (figure->series_count == 0) {
            figures->count--;
        } else {
            figure_choose_close_up(figure);
        }
    }
}

/* The middle value of a curve, from which its close-up counts. */
static double middle_value(const double *values, int count)
{
    double value = count > 0 ? values[count / 2] : (double)NAN;
    return fabs(value) > 0.0 ? value : (double)NAN;
}

static const char *family_name(struct layout *layout, const struct sweep *sweep, double value)
{
    const char *shown = sweep->family.kind == KNOB_TEMPERATURE
                            ? show_celsius(layout, value)
                            : figures_round(layout, value, sweep->family.dimension);
    return layout_format(layout, "%s = %s", layout_short(layout, sweep->family.name, 12), shown);
}

/* Adds one quantity of one series; false when memory is short. */
static bool add_column(struct layout *layout, struct figure *figure, const struct sweep *sweep,
                       const struct sweep_series *series, int quantity)
{
    double *x = arena_new_array(layout->arena, double, series->count);
    double *y = arena_new_array(layout->arena, double, series->count);
    if (x == NULL || y == NULL) {
        return false;
    }
    double zero = sweep->knob.kind == KNOB_TEMPERATURE ? 273.15 : 0.0;
    double factor = figures_is_share(&sweep->shown[quantity]) ? 100.0 : 1.0;
    for (int k = 0; k < series->count; k++) {
        x[k] = series->knob[k] - zero;
        y[k] = series->values[k * sweep->shown_count + quantity] * factor;
    }
    figure->series[figure->series_count++] = (struct figure_series){
        .name = sweep->has_family ? family_name(layout, sweep, series->family_value)
                                  : layout_short(layout, sweep->shown[quantity].text, 22),
        .x = x,
        .y = y,
        .count = series->count,
        .reference = middle_value(y, series->count),
        .flat_from = fmin(sweep->from, sweep->to) - zero,
        .flat_to = fmax(sweep->from, sweep->to) - zero,
    };
    for (int k = 0; k < series->event_count; k++) {
        figures_note(figure, layout_format(layout, "at %s: %s",
                                           sweep->knob.kind == KNOB_TEMPERATURE
                                               ? show_celsius(layout, series->events[k].at)
                                               : figures_value(layout, series->events[k].at,
                                                               sweep->knob.dimension),
                                           layout_clean(layout, series->events[k].text)));
    }
    return true;
}

static void finish_sweep(struct layout *layout, struct figure *figure, const struct sweep *sweep,
                         const char *what)
{
    figure->title =
        layout_format(layout, "%s against %s", what, layout_short(layout, sweep->knob.name, 30));
    figure->keeps_zero = figures_wants_zero(figure);
    if (figure->keeps_zero) {
        figure_choose_close_up(figure);
    }
}

/* With a family one picture a quantity; else quantities of one unit share a picture. */
static void add_sweep(struct layout *layout, struct figure_list *figures,
                      const struct sweep_table *table)
{
    const struct sweep *sweep = table->sweep;
    for (int q = 0; q < sweep->shown_count; q++) {
        const struct probe *probe = &sweep->shown[q];
        bool is_done = false;
        for (int before = 0; before < q && !sweep->has_family; before++) {
            is_done =
                is_done || (dimension_equal(sweep->shown[before].dimension, probe->dimension) &&
                            figures_is_share(&sweep->shown[before]) == figures_is_share(probe));
        }
        struct figure *figure = is_done ? NULL : figures_add(layout, figures);
        if (figure == NULL) {
            continue;
        }
        if (!figures_room(layout, figure, table->series_count * sweep->shown_count)) {
            return;
        }
        const char *name = layout_short(layout, probe->text, 40);
        for (int s = 0; s < table->series_count; s++) {
            for (int other = q; other < sweep->shown_count; other++) {
                bool fits = other == q ||
                            (!sweep->has_family &&
                             dimension_equal(sweep->shown[other].dimension, probe->dimension) &&
                             figures_is_share(&sweep->shown[other]) == figures_is_share(probe));
                if (fits && !add_column(layout, figure, sweep, &table->series[s], other)) {
                    return;
                }
            }
        }
        bool is_shared = !sweep->has_family && figure->series_count > 1;
        const char *what = is_shared ? "Quantities" : name;
        figure->x = figures_knob_axis(layout, &sweep->knob);
        figure->y = figures_is_share(probe)
                        ? (struct figure_axis){name, "%", false}
                        : figures_axis(layout, is_shared ? "value" : name, probe->dimension);
        finish_sweep(layout, figure, sweep, what);
    }
}

struct figure_list figures_of_curves(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    if (result->point.solver.converged) {
        add_outputs(layout, &figures, result);
        /* those of a spread stand as its conditions */
        const bool has_sweeps = strcmp(result->command, "spread") != 0;
        for (int k = 0; has_sweeps && k < result->sweep_count; k++) {
            add_sweep(layout, &figures, &result->sweeps[k]);
        }
    }
    return figures;
}

struct figure_list figures_of(struct layout *layout, const struct result *result)
{
    static const struct {
        const char *command;
        struct figure_list (*make)(struct layout *layout, const struct result *result);
    } own[] = {
        {"states", figures_of_states},
        {"spread", figures_of_spread},
        {"explain", figures_of_reasons},
        {"sensitivity", figures_of_ranking},
    };
    for (size_t k = 0; k < sizeof own / sizeof own[0]; k++) {
        if (strcmp(result->command, own[k].command) == 0) {
            return own[k].make(layout, result);
        }
    }
    return figures_of_curves(layout, result);
}
