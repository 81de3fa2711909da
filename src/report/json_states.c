/* json_states.c: states, proof and start-up as data; keys in docs/data.md. */
#include "report/json_states.h"

#include <string.h>

#include "analyses/states.h"

static void put_nodes(struct writer *writer, json_t *object, const struct circuit *c,
                      const struct state_result *state)
{
    json_t *nodes = put_object(writer, object, "nodes");
    for (int k = 1; k < c->node_count; k++) {
        if (c->nodes[k].is_hidden) {
            continue;
        }
        json_t *node = put_object(writer, nodes, c->nodes[k].name);
        put_number(writer, node, "v", state->x[k - 1]);
        if (state->half_width != NULL) {
            put_number(writer, node, "within", state->half_width[k - 1]);
        }
    }
}

static void put_state(struct writer *writer, json_t *array, const struct circuit *c,
                      const struct state_result *state, bool is_wanted)
{
    json_t *object = append_object(writer, array);
    put(writer, object, "can_hold", json_boolean(state->can_hold));
    put(writer, object, "certified", json_boolean(state->is_certified));
    put(writer, object, "wanted", json_boolean(is_wanted));
    put_number(writer, object, "power", state->power);
    put_nodes(writer, object, c, state);
    json_t *outputs = put_object(writer, object, "outputs");
    for (int k = 0; k < c->output_count; k++) {
        json_t *output = put_object(writer, outputs, c->outputs[k].name);
        put_number(writer, output, "current", state->outputs[k]);
    }
}

static void put_search(struct writer *writer, json_t *root, const struct states_result *found)
{
    const double range[2] = {found->low, found->high};
    json_t *search = put_object(writer, root, "search");
    put(writer, search, "boxes", json_integer(found->boxes));
    put(writer, search, "budget", json_integer(found->box_limit));
    put(writer, search, "undecided", json_integer(found->undecided_boxes));
    put_numbers(writer, search, "range", range, 2, 1);
    put(writer, search, "range_is_proved", json_boolean(!found->is_assumed));
    if (found->undecided_count > 0) {
        json_t *rest = put_object(writer, search, "rest");
        for (int k = 0; k < found->undecided_count; k++) {
            const double ends[2] = {found->undecided[k].low, found->undecided[k].high};
            put_numbers(writer, rest, found->undecided[k].node, ends, 2, 1);
        }
    }
}

static void put_loop(struct writer *writer, json_t *root, const struct states_result *found)
{
    if (!found->has_loop) {
        return;
    }
    json_t *loop = put_object(writer, root, "loop");
    put_text(writer, loop, "path", found->loop_path);
    put_text(writer, loop, "probe", found->probe);
    if (found->curve_count > 0) {
        json_t *curve = put_object(writer, loop, "curve");
        put_numbers(writer, curve, "v", found->curve_v, found->curve_count, 1);
        put_numbers(writer, curve, "push", found->curve_push, found->curve_count, 1);
    }
}

static void put_startup(struct writer *writer, json_t *root, const struct states_result *found)
{
    put_text(writer, root, "startup", found->startup == STARTUP_CERTAIN ? "certain" : "at risk");
    json_t *reasons = put_array(writer, root, "startup_reasons");
    for (int k = 0; k < found->reason_count; k++) {
        append(writer, reasons, make_text(found->reasons[k]));
    }
    json_t *ramp = put_object(writer, root, "ramp");
    if (found->ramp_state >= 0) {
        put(writer, ramp, "state", json_integer(found->ramp_state));
    }
    put_number(writer, ramp, "breaks_at", found->ramp_break);
    if (isfinite(found->push)) {
        json_t *push = put_object(writer, root, "push");
        put_number(writer, push, "current", found->push);
        put_number(writer, push, "at", found->push_at);
        put_number(writer, push, "from", found->push_off);
        put_number(writer, push, "bound", found->push_bound);
    }
    if (found->is_brief) {
        return;
    }
    json_t *starters = put_object(writer, root, "starters");
    for (int k = 0; k < found->starter_count; k++) {
        json_t *row = put_object(writer, starters, found->starters[k].instance->name);
        put_number(writer, row, "push_without", found->starters[k].push_without);
        put_number(writer, row, "starting", found->starters[k].start_current);
        put_number(writer, row, "running", found->starters[k].run_current);
    }
    json_t *supplies = put_object(writer, root, "lowest_supply");
    for (int k = 0; k < found->supply_count; k++) {
        put_number(writer, supplies, found->supplies[k].rail->name, found->supplies[k].lowest);
    }
}

static void put_certificate(struct writer *writer, json_t *root, const struct circuit *c,
                            const struct state_result *state)
{
    json_t *object = put_object(writer, root, "certificate");
    put(writer, object, "certified", json_boolean(state->is_certified));
    if (!state->is_certified) {
        return;
    }
    put(writer, object, "can_hold", json_boolean(state->can_hold));
    json_t *nodes = put_object(writer, object, "within");
    for (int k = 1; k < c->node_count; k++) {
        if (!c->nodes[k].is_hidden) {
            put_number(writer, nodes, c->nodes[k].name, state->half_width[k - 1]);
        }
    }
}

void json_put_states(struct writer *writer, json_t *root, const struct result *result)
{
    const struct states_result *found = result->states;
    if (found == NULL || found->states == NULL) {
        return;
    }
    if (strcmp(result->command, "point") == 0) {
        put_certificate(writer, root, result->circuit, &found->states[0]);
        return;
    }
    json_t *array = put_array(writer, root, "states");
    for (int k = 0; k < found->state_count; k++) {
        put_state(writer, array, result->circuit, &found->states[k], k == found->wanted);
    }
    put(writer, root, "complete", json_boolean(found->is_complete));
    put_search(writer, root, found);
    put_loop(writer, root, found);
    if (found->state_count > 0) {
        put_startup(writer, root, found);
    }
}
