/* states.c: every resting state, the proof, and the start-up verdict. */
#include "analyses/states.h"

#include <math.h>
#include <string.h>

#include "report/chart.h"
#include "report/figures.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/table.h"

enum { STATES_ABREAST = 5 };

/* "±4 pV": one digit, rounded up, since only the order of it says something. */
static const char *width_text(struct layout *layout, double half)
{
    const double unit = half > 0 ? pow(10, floor(log10(half))) : 1;
    return layout_format(layout, "±%s",
                         show_round(layout, ceil(half / unit) * unit, DIMENSION_VOLTAGE));
}

static const char *state_name(struct layout *layout, int k)
{
    return layout_format(layout, "state %d", k + 1);
}

static const char *count_text(struct layout *layout, const struct states_result *found)
{
    return found->state_count == 1 ? "1 state"
                                   : layout_format(layout, "%d states", found->state_count);
}

/* What was proved, in one sentence, and on what it rests. */
static void proof_part(struct layout *layout, const struct states_result *found)
{
    const char *range =
        layout_format(layout, "%s to %s", show_value(layout, found->low, DIMENSION_VOLTAGE),
                      show_value(layout, found->high, DIMENSION_VOLTAGE));
    layout_part(layout, "states");
    if (found->is_large) {
        layout_paragraph(
            layout, TONE_WARN, 0,
            layout_format(layout,
                          "nothing proved: the proof takes cells of at most %d devices "
                          "and %d unknown nodes",
                          STATES_PART_LIMIT, STATES_NODE_LIMIT));
        return;
    }
    if (found->is_complete) {
        layout_paragraph(layout, TONE_GOOD, 0,
                         layout_format(layout,
                                       "%s, and no other: proved for all node voltages from %s",
                                       count_text(layout, found), range));
    } else {
        layout_paragraph(layout, TONE_WARN, 0,
                         layout_format(layout, "%s found; not proved that these are all",
                                       count_text(layout, found)));
    }
    if (!found->is_complete) {
        layout_paragraph(layout, TONE_QUIET, 0,
                         layout_format(layout, "looked for at node voltages from %s", range));
    }
    if (found->is_assumed) {
        layout_paragraph(layout, TONE_QUIET, 0,
                         "that range is a choice: nothing was found that bounds all nodes");
    } else {
        layout_paragraph(layout, TONE_QUIET, 0,
                         "no node of a cell of these devices can lie outside that range");
    }
}

static void state_rows(struct layout *layout, const struct result *result, int first, int count)
{
    const struct states_result *found = result->states;
    const struct circuit *c = result->circuit;
    struct table table;
    layout_gap(layout);
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    for (int k = first; k < first + count; k++) {
        table_column(&table, (struct table_column){.head = state_name(layout, k), .right = true});
    }
    for (int i = 1; i < c->node_count; i++) {
        if (c->nodes[i].is_hidden) {
            continue;
        }
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_clean(layout, c->nodes[i].name));
        for (int k = 0; k < count; k++) {
            table_cell(&table, 1 + k,
                       show_value(layout, found->states[first + k].x[i - 1], DIMENSION_VOLTAGE));
        }
    }
    for (int i = 0; i < c->output_count; i++) {
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0,
                   layout_format(layout, "%s.current", layout_clean(layout, c->outputs[i].name)));
        for (int k = 0; k < count; k++) {
            table_cell(&table, 1 + k,
                       show_value(layout, found->states[first + k].outputs[i], DIMENSION_CURRENT));
        }
    }
    table_row(&table, TONE_QUIET);
    table_cell(&table, 0, "power");
    for (int k = 0; k < count; k++) {
        table_cell(&table, 1 + k,
                   show_value(layout, found->states[first + k].power, DIMENSION_POWER));
    }
    table_write(&table);
}

/* One line a state: what is proved of it. */
static void state_lines(struct layout *layout, const struct result *result)
{
    const struct states_result *found = result->states;
    const bool by_point = strcmp(result->point.solver.method, "search for all states") != 0;
    const char *wanted =
        by_point ? "; the wanted one: `point` shows it" : "; taken as the wanted one";
    bool all_hold = true;
    layout_gap(layout);
    for (int k = 0; k < found->state_count; k++) {
        const struct state_result *state = &found->states[k];
        const char *proof =
            state->is_certified
                ? layout_format(layout, "proved unique within %s at every node",
                                width_text(layout, state->widest))
                : "found, but not certified: the equations are nearly singular there";
        layout_paragraph(layout, state->can_hold ? TONE_PLAIN : TONE_WARN, 2,
                         layout_format(layout, "%s: %s%s%s", state_name(layout, k), proof,
                                       state->can_hold ? "" : "; cannot be held",
                                       k == found->wanted ? wanted : ""));
        all_hold = all_hold && state->can_hold;
    }
    layout_paragraph(layout, TONE_QUIET, 0,
                     all_hold
                         ? "Whether a state is stable also depends on capacitances: this is no "
                           "dynamic analysis."
                         : "\"Cannot be held\": unstable whatever the capacitances (Green and "
                           "Willson 1992). The others meet a necessary condition only: this "
                           "is no dynamic analysis.");
}

static void undecided_part(struct layout *layout, const struct states_result *found)
{
    struct table table;
    if (found->undecided_count == 0) {
        return;
    }
    layout_part(layout, "undecided");
    layout_paragraph(layout, TONE_WARN, 0,
                     layout_format(layout,
                                   "%ld boxes within this part are left after a budget of %ld "
                                   "boxes; --boxes gives more",
                                   found->undecided_boxes, found->box_limit));
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "from", .right = true});
    table_column(&table, (struct table_column){.head = "to", .right = true});
    for (int k = 0; k < found->undecided_count; k++) {
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_clean(layout, found->undecided[k].node));
        table_cell(&table, 1, show_value(layout, found->undecided[k].low, DIMENSION_VOLTAGE));
        table_cell(&table, 2, show_value(layout, found->undecided[k].high, DIMENSION_VOLTAGE));
    }
    table_write(&table);
}

static void loop_lines(struct layout *layout, const struct states_result *found)
{
    if (!found->has_loop) {
        layout_paragraph(
            layout, TONE_PLAIN, 0,
            found->loop_unsure
                ? "the structure is too large to say whether a loop could hold it off"
                : "no loop of positive sign: nothing in the cell could hold itself off");
        return;
    }
    layout_paragraph(layout, TONE_PLAIN, 0,
                     layout_format(layout, "the loop %s could hold more than one state",
                                   layout_clean(layout, found->loop_path)));
    if (isfinite(found->push)) {
        layout_paragraph(layout, TONE_PLAIN, 0,
                         layout_format(layout,
                                       "start-up push %s, least at %s = %s on the way from %s",
                                       show_value(layout, found->push, DIMENSION_CURRENT),
                                       layout_clean(layout, found->probe),
                                       show_value(layout, found->push_at, DIMENSION_VOLTAGE),
                                       show_value(layout, found->push_off, DIMENSION_VOLTAGE)));
    } else if (found->rests_off) {
        layout_paragraph(layout, TONE_PLAIN, 0, "the wanted state is the off end of that loop");
    } else {
        layout_paragraph(layout, TONE_PLAIN, 0,
                         "no start-up push: the loop could not be followed from its off end");
    }
}

/* The push against the voltage where the loop is opened, on an axis of decades of both signs. */
static void loop_chart(struct layout *layout, const struct states_result *found)
{
    struct chart_mark *marks =
        arena_new_array(layout->arena, struct chart_mark, found->state_count);
    bool has_unheld = false;
    if (marks == NULL || found->curve_count < 2 || found->probe == NULL) {
        return;
    }
    for (int k = 0; k < found->state_count; k++) {
        marks[k] = (struct chart_mark){found->states[k].x[found->probe_unknown], 0.0,
                                       found->states[k].can_hold};
        has_unheld = has_unheld || !marks[k].is_filled;
    }
    const struct chart chart = {
        .x = found->curve_v,
        .y = found->curve_push,
        .count = found->curve_count,
        .x_dimension = DIMENSION_VOLTAGE,
        .y_dimension = DIMENSION_CURRENT,
        .x_name = layout_format(layout, "voltage of %s", layout_short(layout, found->probe, 24)),
        .edge = NAN,
        .point = NAN,
        .linear = figures_loop_linear(found),
        .marks = marks,
        .mark_count = found->state_count,
    };
    layout_gap(layout);
    layout_line(layout, TONE_STRONG,
                layout_format(layout, "push into %s, in decades of both signs",
                              layout_short(layout, found->probe, 24)));
    chart_draw(layout, &chart);
    layout_line(layout, TONE_QUIET,
                layout_format(layout, "%*s  %s a state%s", 10, "",
                              layout->style.ascii ? "o" : "\xE2\x97\x8F",
                              !has_unheld           ? ""
                              : layout->style.ascii ? "   x one that cannot be held"
                                                    : "   \xE2\x97\x8B one that cannot be held"));
    layout_gap(layout);
}

static void ramp_line(struct layout *layout, const struct states_result *found)
{
    if (!found->ramp_begins) {
        return;
    }
    const char *where =
        found->ramp_state < 0 ? "no state found"
        : found->ramp_state == found->wanted
            ? layout_format(layout, "%s, the wanted one", state_name(layout, found->ramp_state))
            : layout_format(layout, "%s, not the wanted one",
                            state_name(layout, found->ramp_state));
    layout_paragraph(
        layout, TONE_PLAIN, 0,
        isfinite(found->ramp_break)
            ? layout_format(layout,
                            "all rails slowly from 0: the line of states turns back at "
                            "%s of the supply, where a cell would jump; it leads to %s",
                            show_share(layout, found->ramp_break, "", false), where)
            : layout_format(layout, "all rails slowly from 0: lands in %s", where));
}

static void starter_rows(struct layout *layout, const struct states_result *found)
{
    struct table table;
    if (found->starter_count == 0) {
        return;
    }
    layout_gap(layout);
    layout_line(layout, TONE_PLAIN, "start-up branch");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "push without it", .right = true});
    table_column(&table, (struct table_column){.head = "carries, starting", .right = true});
    table_column(&table, (struct table_column){.head = "takes, running", .right = true});
    for (int k = 0; k < found->starter_count; k++) {
        const struct starter_result *row = &found->starters[k];
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, row->instance->name, 24));
        table_cell(&table, 1, show_value(layout, row->push_without, DIMENSION_CURRENT));
        table_cell(&table, 2, show_value(layout, row->start_current, DIMENSION_CURRENT));
        table_cell(&table, 3, show_value(layout, row->run_current, DIMENSION_CURRENT));
    }
    table_write(&table);
}

static void startup_part(struct layout *layout, const struct states_result *found)
{
    const bool certain = found->startup == STARTUP_CERTAIN;
    layout_part(layout, "start-up");
    layout_line(layout, certain ? TONE_GOOD : TONE_BAD, certain ? "certain" : "AT RISK");
    for (int k = 0; k < found->reason_count; k++) {
        layout_paragraph(layout, TONE_PLAIN, 2, layout_format(layout, "- %s", found->reasons[k]));
    }
    ramp_line(layout, found);
    loop_lines(layout, found);
    if (found->has_loop) {
        loop_chart(layout, found);
    }
    starter_rows(layout, found);
    for (int k = 0; k < found->supply_count; k++) {
        const struct supply_result *row = &found->supplies[k];
        layout_paragraph(layout, TONE_PLAIN, 0,
                         row->reason == NULL
                             ? layout_format(layout, "the wanted state holds down to %s = 0",
                                             layout_clean(layout, row->rail->name))
                             : layout_format(layout, "lowest %s %s: below it %s",
                                             layout_clean(layout, row->rail->name),
                                             show_value(layout, row->lowest, DIMENSION_VOLTAGE),
                                             row->reason));
    }
}

void page_certificate(struct layout *layout, const struct result *result)
{
    const struct circuit *c = result->circuit;
    const struct states_result *found = result->states;
    struct table table;
    if (found == NULL || found->state_count != 1 || strcmp(result->command, "point") != 0) {
        return;
    }
    layout_part(layout, "certificate");
    if (!found->states[0].is_certified) {
        layout_paragraph(layout, TONE_WARN, 0,
                         "none: the equations are too nearly singular here to prove the point");
        return;
    }
    layout_line(layout, TONE_GOOD,
                layout_format(layout, "proved unique within %s",
                              width_text(layout, found->states[0].widest)));
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .right = true});
    for (int k = 1; k < c->node_count; k++) {
        if (!c->nodes[k].is_hidden) {
            table_row(&table, TONE_STRONG);
            table_cell(&table, 0, layout_clean(layout, c->nodes[k].name));
            const double half = found->states[0].half_width[k - 1];
            table_cell(&table, 1, half > 0 ? width_text(layout, half) : "held");
        }
    }
    table_write(&table);
}

/* The search came to an end and found nothing: that is a proof too. */
static void no_state_part(struct layout *layout, const struct states_result *found)
{
    if (found != NULL && found->is_complete) {
        layout_part(layout, "states");
        layout_paragraph(layout, TONE_BAD, 0,
                         layout_format(layout, "none: proved for all node voltages from %s to %s",
                                       show_value(layout, found->low, DIMENSION_VOLTAGE),
                                       show_value(layout, found->high, DIMENSION_VOLTAGE)));
    } else if (found != NULL) {
        undecided_part(layout, found);
    }
}

void report_states(const struct result *result, const struct report_style *style,
                   struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    const struct states_result *found = result->states;
    if (found != NULL && found->state_count > 0) {
        proof_part(&layout, found);
        for (int first = 0; first < found->state_count; first += STATES_ABREAST) {
            const int left = found->state_count - first;
            state_rows(&layout, result, first, left < STATES_ABREAST ? left : STATES_ABREAST);
        }
        state_lines(&layout, result);
        undecided_part(&layout, found);
        if (!style->stopped && !found->is_large) {
            startup_part(&layout, found);
        }
    } else if (!result->point.solver.converged && !style->stopped) {
        no_state_part(&layout, found);
        page_unsolved(&layout, result);
    }
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}
