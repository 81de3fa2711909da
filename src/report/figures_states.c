/* figures_states.c: the loop curve: what pushes an opened loop, against the voltage where it is
 * opened, with the resting states where the push is zero. */
#include "report/figures_parts.h"

#include <math.h>

#include "analyses/states.h"
#include "report/show.h"

/* Decades that a push may span in the picture. */
static const double widest = 1e12;

double figures_loop_linear(const struct states_result *found)
{
    double greatest = 0.0, least = isfinite(found->push_bound) ? found->push_bound : 1e-9;
    for (int k = 0; k < found->curve_count; k++) {
        greatest = fmax(greatest, fabs(found->curve_push[k]));
    }
    if (found->push > 0.0) {
        least = fmin(least, found->push);
    }
    double part = pow(10.0, floor(log10(fmin(least, greatest)) - 1e-9));
    return fmax(part, pow(10.0, ceil(log10(greatest / widest))));
}

static void mark_states(struct layout *layout, struct figure *figure,
                        const struct states_result *found)
{
    for (int k = 0; k < found->state_count; k++) {
        const struct state_result *state = &found->states[k];
        double volts = state->x[found->probe_unknown];
        figure->edges[figure->edge_count++] = (struct figure_edge){
            .x = volts,
            .text = layout_format(layout, "state %d at %s: %s", k + 1,
                                  figures_value(layout, volts, DIMENSION_VOLTAGE),
                                  state->can_hold ? "can be held" : "cannot be held"),
            .series = state->can_hold ? 2 : 1};
        figure->marks[figure->mark_count++] = (struct figure_mark){
            .x = volts, .y = 0.0, .text = "", .series = 4, .is_filled = state->can_hold};
    }
}

static void note_push(struct layout *layout, struct figure *figure,
                      const struct states_result *found)
{
    figures_note(figure, layout_format(layout, "Loop %s, opened at %s",
                                       layout_short(layout, found->loop_path, 60),
                                       layout_short(layout, found->probe, 30)));
    if (!isfinite(found->push)) {
        return;
    }
    figures_note(
        figure, layout_format(layout, "Start-up %s: the least push on the way from %s is %s, at %s",
                              found->startup == STARTUP_CERTAIN ? "certain" : "at risk",
                              figures_value(layout, found->push_off, DIMENSION_VOLTAGE),
                              figures_value(layout, found->push, DIMENSION_CURRENT),
                              figures_value(layout, found->push_at, DIMENSION_VOLTAGE)));
    if (isfinite(found->push_bound)) {
        figure->levels[figure->level_count++] = (struct figure_level){
            found->push_bound,
            layout_format(layout, "wanted above %s",
                          figures_round(layout, found->push_bound, DIMENSION_CURRENT)),
            true};
    }
}

struct figure_list figures_of_states(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    const struct states_result *found = result->states;
    if (found == NULL || found->curve_count < 2 || found->probe == NULL) {
        return figures;
    }
    struct figure *figure = figures_add(layout, &figures);
    if (figure == NULL || !figures_room(layout, figure, found->state_count + 1)) {
        return figures;
    }
    figure->levels = arena_new_array(layout->arena, struct figure_level, 1);
    if (figure->levels == NULL) {
        return figures;
    }
    figure->title = layout_format(layout, "Loop at %s: where the push is zero the cell rests",
                                  layout_short(layout, found->probe, 30));
    figure->x = (struct figure_axis){
        layout_format(layout, "voltage of %s", layout_short(layout, found->probe, 30)), "V", true};
    figure->y = (struct figure_axis){"push into the node", "A", true};
    figure->linear = figures_loop_linear(found);
    figure->labels_above = true;
    figure->keeps_zero = true;
    figure->series[figure->series_count++] = (struct figure_series){
        "", found->curve_v, found->curve_push, found->curve_count, (double)NAN, 0.0, 0.0};
    note_push(layout, figure, found);
    mark_states(layout, figure, found);
    return figures;
}
