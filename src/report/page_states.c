/* page_states.c: on the page of a review, the states of a cell with a loop, and whether it starts.
 */
#include "report/page_parts.h"

#include <math.h>

#include "analyses/states.h"
#include "report/show.h"
#include "report/table.h"

const char *states_proof_text(struct layout *layout, const struct states_result *found)
{
    const char *count = found->state_count == 1
                            ? "1 state"
                            : layout_format(layout, "%d states", found->state_count);
    const char *also = found->is_assumed ? " where it was looked for" : "";
    return found->is_complete
               ? layout_format(layout, "%s, and no other%s: proved", count, also)
               : layout_format(layout,
                               "%s found; the proof was not finished within the %ld boxes of a "
                               "review: `ampstead states` goes on",
                               count, found->box_limit);
}

const char *states_startup_text(const struct states_result *found)
{
    return found->startup == STARTUP_CERTAIN ? "start-up certain" : "start-up AT RISK";
}

/* What tells one state from another: the currents of the outputs, without them the probe. */
static int columns_of(struct layout *layout, const struct result *result, struct table *table)
{
    const struct states_result *found = result->states;
    const struct circuit *c = result->circuit;
    table_column(table, (struct table_column){.head = ""});
    for (int k = 0; k < c->output_count; k++) {
        table_column(table, (struct table_column){
                                .head = layout_format(layout, "%s.current",
                                                      layout_clean(layout, c->outputs[k].name)),
                                .right = true});
    }
    const bool by_probe = c->output_count == 0 && found->probe != NULL;
    if (by_probe) {
        table_column(table,
                     (struct table_column){
                         .head = layout_format(layout, "%s.v", layout_clean(layout, found->probe)),
                         .right = true});
    }
    table_column(table, (struct table_column){.head = "power", .right = true});
    table_column(table, (struct table_column){.head = ""});
    return c->output_count + by_probe;
}

static void state_table(struct layout *layout, const struct result *result)
{
    const struct states_result *found = result->states;
    struct table table;
    table_begin(&table, layout);
    const int shown = columns_of(layout, result, &table);
    for (int k = 0; k < found->state_count; k++) {
        const struct state_result *state = &found->states[k];
        table_row(&table, state->can_hold ? TONE_STRONG : TONE_WARN);
        table_cell(&table, 0, layout_format(layout, "state %d", k + 1));
        for (int i = 0; i < shown; i++) {
            table_cell(&table, 1 + i,
                       result->circuit->output_count > 0
                           ? show_value(layout, state->outputs[i], DIMENSION_CURRENT)
                           : show_value(layout, state->x[found->probe_unknown], DIMENSION_VOLTAGE));
        }
        table_cell(&table, 1 + shown, show_value(layout, state->power, DIMENSION_POWER));
        table_cell(&table, 2 + shown,
                   layout_format(layout, "%s%s%s", k == found->wanted ? "this page; " : "",
                                 state->can_hold ? "can be held" : "cannot be held",
                                 state->is_certified ? "" : "; not certified"));
    }
    table_write(&table);
}

void page_states(struct layout *layout, const struct result *result)
{
    const struct states_result *found = result->states;
    if (found == NULL || found->state_count == 0) {
        return;
    }
    layout_part(layout, "states");
    layout_paragraph(layout, found->is_complete ? TONE_PLAIN : TONE_WARN, 0,
                     states_proof_text(layout, found));
    layout_paragraph(layout, TONE_QUIET, 0,
                     layout_format(layout, "looked for, since the loop %s could hold more than one",
                                   layout_clean(layout, found->loop_path)));
    state_table(layout, result);
    layout_line(layout, found->startup == STARTUP_CERTAIN ? TONE_GOOD : TONE_BAD,
                states_startup_text(found));
    for (int k = 0; k < found->reason_count; k++) {
        layout_paragraph(layout, TONE_PLAIN, 2, layout_format(layout, "- %s", found->reasons[k]));
    }
    if (isfinite(found->push)) {
        layout_paragraph(layout, TONE_QUIET, 0,
                         layout_format(layout, "start-up push %s; more by `ampstead states`",
                                       show_value(layout, found->push, DIMENSION_CURRENT)));
    }
}
