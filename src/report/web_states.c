/* web_states.c: the resting states, the loop curve and the start-up verdict as HTML. */
#include <math.h>
#include <string.h>

#include "analyses/states.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/web.h"

enum { STATES_ABREAST = 6, FIXED_HEADS = 4 };

static const char *value(struct layout *layout, double number, struct dimension dimension)
{
    return web_units(layout, show_value(layout, number, dimension));
}

static const char *state_name(struct layout *layout, const struct states_result *found, int k)
{
    return layout_format(layout, "state %d%s", k + 1, k == found->wanted ? " (wanted)" : "");
}

/* One row a state: whether it can be held, how sure that is, and what it does. */
static void state_table(struct layout *layout, const struct result *result)
{
    const struct states_result *found = result->states;
    const struct circuit *c = result->circuit;
    const int count = FIXED_HEADS + c->output_count;
    const char **heads = arena_new_array(layout->arena, const char *, count);
    bool *numbers = arena_new_array(layout->arena, bool, count);
    struct web_table table;
    if (heads == NULL || numbers == NULL) {
        return;
    }
    heads[0] = "State";
    heads[1] = "Verdict";
    heads[2] = "Proof";
    heads[3] = "Power";
    numbers[3] = true;
    for (int k = 0; k < c->output_count; k++) {
        heads[FIXED_HEADS + k] =
            layout_format(layout, "%s.current", layout_short(layout, c->outputs[k].name, 20));
        numbers[FIXED_HEADS + k] = true;
    }
    web_table_begin(&table, layout->out, "Every resting state", heads, numbers, count);
    for (int k = 0; k < found->state_count; k++) {
        const struct state_result *state = &found->states[k];
        web_table_row(&table);
        web_table_name(&table, state_name(layout, found, k), 0);
        buffer_format(layout->out, "<td class=\"%s\">%s</td>", state->can_hold ? "good" : "bad",
                      state->can_hold ? "can be held" : "cannot be held");
        web_table_text(&table, state->is_certified ? "certified" : "not certified");
        web_table_value(&table, state->power, value(layout, state->power, DIMENSION_POWER));
        for (int o = 0; o < c->output_count; o++) {
            web_table_value(&table, state->outputs[o],
                            value(layout, state->outputs[o], DIMENSION_CURRENT));
        }
    }
    web_table_end(&table);
}

/* One row a node, the states abreast. */
static void node_table(struct layout *layout, const struct result *result, int first)
{
    const struct states_result *found = result->states;
    const struct circuit *c = result->circuit;
    const char *heads[STATES_ABREAST + 1] = {"Node"};
    bool numbers[STATES_ABREAST + 1] = {false};
    const int left = found->state_count - first;
    const int count = left < STATES_ABREAST ? left : STATES_ABREAST;
    struct web_table table;
    for (int k = 0; k < count; k++) {
        heads[k + 1] = state_name(layout, found, first + k);
        numbers[k + 1] = true;
    }
    web_table_begin(&table, layout->out, "Node voltages of the states", heads, numbers, count + 1);
    for (int i = 1; i < c->node_count; i++) {
        if (c->nodes[i].is_hidden) {
            continue;
        }
        web_table_row(&table);
        web_table_name(&table, c->nodes[i].name, 0);
        for (int k = 0; k < count; k++) {
            const double volts = found->states[first + k].x[i - 1];
            web_table_value(&table, volts, value(layout, volts, DIMENSION_VOLTAGE));
        }
    }
    web_table_end(&table);
}

static void startup_part(struct layout *layout, const struct states_result *found)
{
    const bool certain = found->startup == STARTUP_CERTAIN;
    buffer_format(layout->out, "<p><strong class=\"%s\">Start-up %s</strong></p>\n",
                  certain ? "good" : "bad", certain ? "certain" : "at risk");
    if (found->reason_count > 0) {
        buffer_text(layout->out, "<ul class=\"cautions\">\n");
        for (int k = 0; k < found->reason_count; k++) {
            buffer_text(layout->out, "<li>");
            web_text(layout, found->reasons[k]);
            buffer_text(layout->out, "</li>\n");
        }
        buffer_text(layout->out, "</ul>\n");
    }
    for (int k = 0; k < found->supply_count; k++) {
        const struct supply_result *row = &found->supplies[k];
        web_paragraph(
            layout, "",
            row->reason == NULL
                ? layout_format(layout, "The wanted state holds down to %s = 0.", row->rail->name)
                : layout_format(layout, "Lowest %s %s: below it %s.", row->rail->name,
                                value(layout, row->lowest, DIMENSION_VOLTAGE), row->reason));
    }
}

void web_states(struct layout *layout, const struct result *result)
{
    const struct states_result *found = result->states;
    if (found == NULL || strcmp(result->command, "states") != 0 || found->state_count == 0) {
        return;
    }
    web_heading(layout, "states", "Resting states");
    web_paragraph(
        layout, "",
        layout_format(layout,
                      found->is_complete
                          ? "%d, and no other: proved for all node voltages from %s to %s."
                          : "%d found, at node voltages from %s to %s; not proved that "
                            "these are all.",
                      found->state_count, value(layout, found->low, DIMENSION_VOLTAGE),
                      value(layout, found->high, DIMENSION_VOLTAGE)));
    state_table(layout, result);
    for (int first = 0; first < found->state_count; first += STATES_ABREAST) {
        node_table(layout, result, first);
    }
    struct figure_list figures = figures_of_states(layout, result);
    web_figures(layout, &figures);
    if (!result->is_stopped && !found->is_large) {
        startup_part(layout, found);
    }
}
