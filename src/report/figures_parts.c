/* figures_parts.c: what the makers of pictures share: room, notes, axes. */
#include "report/figures_parts.h"

#include <math.h>

#include "report/markup.h"
#include "report/show.h"

struct figure *figures_add(struct layout *layout, struct figure_list *figures)
{
    struct figure *list =
        arena_grow(layout->arena, figures->list, figures->count, &figures->capacity, sizeof *list);
    if (list == NULL) {
        return NULL;
    }
    figures->list = list;
    list[figures->count] = (struct figure){
        .title = "",
        .x = {"", "", false}, /* a picture that memory was too short to finish can be drawn */
        .y = {"", "", false},
        .band = {(double)NAN, (double)NAN, ""},
    };
    return &list[figures->count++];
}

bool figures_room(struct layout *layout, struct figure *figure, int series)
{
    figure->series = arena_new_array(layout->arena, struct figure_series, series);
    figure->edges = arena_new_array(layout->arena, struct figure_edge, series);
    figure->marks = arena_new_array(layout->arena, struct figure_mark, series);
    figure->notes = arena_new_array(layout->arena, const char *, FIGURES_NOTES + 1);
    return figure->series != NULL && figure->edges != NULL && figure->marks != NULL &&
           figure->notes != NULL;
}

void figures_note(struct figure *figure, const char *note)
{
    if (figure->note_count < FIGURES_NOTES) {
        figure->notes[figure->note_count++] = note;
    }
}

const char *figures_value(struct layout *layout, double value, struct dimension dimension)
{
    return markup_units(layout->arena, show_value(layout, value, dimension));
}

const char *figures_round(struct layout *layout, double value, struct dimension dimension)
{
    return markup_units(layout->arena, show_round(layout, value, dimension));
}

/* A compound unit takes no prefix, and temperatures are shown in degrees Celsius. */
struct figure_axis figures_axis(struct layout *layout, const char *name, struct dimension dimension)
{
    char unit[64];
    dimension_unit(dimension, unit, sizeof unit);
    bool is_simple = true;
    for (const char *at = unit; *at != '\0'; at++) {
        is_simple = is_simple && *at != '/' && *at != '^' && *at != '*';
    }
    return (struct figure_axis){
        layout_short(layout, name, 40),
        markup_units(layout->arena, layout_format(layout, "%s", unit)),
        is_simple,
    };
}

bool figures_is_share(const struct probe *probe)
{
    return probe->kind == PROBE_OUTPUT &&
           (probe->quantity == OUTPUT_FLATNESS || probe->quantity == OUTPUT_SIGMA ||
            probe->quantity == OUTPUT_LINE || probe->quantity == OUTPUT_TEMPCO);
}

struct figure_axis figures_knob_axis(struct layout *layout, const struct knob *knob)
{
    if (knob->kind == KNOB_TEMPERATURE) {
        return (struct figure_axis){"temperature",
                                    "\xC2\xB0"
                                    "C",
                                    false};
    }
    return figures_axis(layout, knob->name, knob->dimension);
}

/* Zero stays on the axis unless the curves are far from it and vary little. */
bool figures_wants_zero(const struct figure *figure)
{
    double low = (double)INFINITY, high = (double)-INFINITY;
    for (int s = 0; s < figure->series_count; s++) {
        for (int k = 0; k < figure->series[s].count; k++) {
            double y = figure->series[s].y[k];
            if (isfinite(y)) {
                low = fmin(low, y);
                high = fmax(high, y);
            }
        }
    }
    double greatest = fmax(fabs(low), fabs(high));
    return !(high - low > 0.02 * greatest && high - low < 0.5 * greatest && low * high > 0.0);
}

bool figures_rows(struct layout *layout, struct figure *figure, int rows)
{
    figure->rows = arena_new_array(layout->arena, struct figure_row, rows);
    return figure->rows != NULL && figures_room(layout, figure, 0);
}

void figures_row(struct figure *figure, const char *name, double value, const char *text,
                 const char *detail)
{
    figure->rows[figure->row_count++] = (struct figure_row){name, text, detail, value, false};
}
