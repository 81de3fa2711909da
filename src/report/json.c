/*
 * json.c: results as one JSON object (RFC 8259), written by jansson: SI units, 17 significant
 * digits, so that every number reads back as the same bits. A value that does not apply has no key.
 */
#include "report/report.h"

#include <math.h>
#include <string.h>

#include "report/json_parts.h"
#include "report/json_states.h"
#include "report/json_remedies.h"
#include "report/page_parts.h"

enum { SCHEMA_VERSION = 1, DIGITS = 17 };

static const char *verdict_text(enum verdict verdict)
{
    switch (verdict) {
    case VERDICT_MET:
        return "met";
    case VERDICT_NOT_MET:
        return "not met";
    case VERDICT_NO_REQUIREMENTS:
        return "no requirements";
    case VERDICT_UNSOLVED:
        break;
    }
    return "unsolved";
}

/* The key says already that it is a node. */
static const char *bare_name(const char *name)
{
    static const char word[] = "node ";
    bool has_word = name != NULL && strncmp(name, word, sizeof word - 1) == 0;
    return has_word ? name + sizeof word - 1 : name;
}

static void put_solver(struct writer *writer, json_t *root, const struct solver_result *solver)
{
    json_t *object = put_object(writer, root, "solver");
    put(writer, object, "converged", json_boolean(solver->converged));
    put_text(writer, object, "method", solver->method);
    put(writer, object, "iterations", json_integer(solver->iterations));
    put_number(writer, object, "worst_residual", solver->worst_residual);
    put_text(writer, object, "worst_node", bare_name(solver->worst_name));
    put_text(writer, object, "limited_by", solver->limited_by);
    put_text(writer, object, "trouble", solver->trouble);
    put_text(writer, object, "advice", solver->advice);
}

static void put_point(struct writer *writer, json_t *root, const struct result *result)
{
    const struct circuit *circuit = result->circuit;
    const struct point_result *point = &result->point;
    json_t *nodes = put_object(writer, root, "nodes");
    for (int k = 1; k < circuit->node_count; k++) {
        if (!circuit->nodes[k].is_hidden) {
            json_t *node = put_object(writer, nodes, circuit->nodes[k].name);
            put_number(writer, node, "v", point->x[k - 1]);
        }
    }
    json_t *rails = put_object(writer, root, "rails");
    for (int k = 0; k < circuit->rail_count; k++) {
        json_t *rail = put_object(writer, rails, point->rails[k].rail->name);
        put_number(writer, rail, "v", point->rails[k].v);
        put_number(writer, rail, "current", point->rails[k].current);
        put_number(writer, rail, "power", point->rails[k].power);
    }
    json_t *devices = put_object(writer, root, "devices");
    for (int k = 0; k < point->device_count; k++) {
        const struct device_result *row = &point->devices[k];
        const struct device_type *type = row->instance->type;
        json_t *device = put_object(writer, devices, row->instance->name);
        put_text(writer, device, "kind", type->word);
        if (row->region_text[0] != '\0') {
            put_text(writer, device, "region", row->region_text);
        }
        for (int q = 0; q < type->quantity_count; q++) {
            put_number(writer, device, type->quantities[q].name, row->q[q]);
        }
    }
}

static void put_events(struct writer *writer, json_t *object, const struct sweep_event *events,
                       int count)
{
    if (count == 0) {
        return;
    }
    json_t *array = put_array(writer, object, "events");
    for (int k = 0; k < count; k++) {
        json_t *event = append_object(writer, array);
        put_number(writer, event, "at", events[k].at);
        put_text(writer, event, "text", events[k].text);
    }
}

static void put_output(struct writer *writer, json_t *outputs, const struct circuit *circuit,
                       const struct output_result *row)
{
    json_t *object = put_object(writer, outputs, row->output->name);
    put_text(writer, object, "direction", row->is_sink ? "sink" : "source");
    put_number(writer, object, "at", row->output->at);
    put_number(writer, object, "current", row->current);
    if (row->resistance_unlimited) {
        put(writer, object, "resistance_unlimited", json_true());
    } else {
        put_number(writer, object, "resistance", row->resistance);
    }
    put_number(writer, object, "compliance", row->compliance);
    put_text(writer, object, "compliance_device",
             row->unheld_device != NULL ? row->unheld_device : row->compliance_device);
    put_number(writer, object, "low", row->low);
    put_number(writer, object, "high", row->high);
    put_number(writer, object, "flatness", row->flatness);
    if (row->line != NULL && circuit->rail_count > 0) {
        json_t *line = put_object(writer, object, "line");
        for (int k = 0; k < circuit->rail_count; k++) {
            put_number(writer, line, circuit->rails[k].name, row->line[k]);
        }
    }
    put_number(writer, object, "tempco", row->tempco);
    put_number(writer, object, "sigma", row->sigma);
    if (row->curve.count > 0) {
        json_t *curve = put_object(writer, object, "curve");
        put_numbers(writer, curve, "v", row->curve.v, row->curve.count, 1);
        put_numbers(writer, curve, "current", row->curve.current, row->curve.count, 1);
    }
    put_events(writer, object, row->events, row->event_count);
}

static void put_hands(struct writer *writer, json_t *root, const struct result *result)
{
    json_t *array = put_array(writer, root, "hand");
    for (int k = 0; k < result->hand_count; k++) {
        const struct hand_result *row = &result->hands[k];
        json_t *object = append_object(writer, array);
        put_text(writer, object, "quantity", row->hand->probe.text);
        put_number(writer, object, "hand", row->hand->value);
        put_number(writer, object, "computed", row->computed);
        put_number(writer, object, "difference", row->difference);
        put_number(writer, object, "square_law", row->in_hand_view);
        if (k < result->explanation_count && result->explanations[k].trouble == NULL) {
            const struct explanation *why = &result->explanations[k];
            put_text(writer, object, "shares_as", why->as_conductance ? "conductance" : NULL);
            put_text(writer, object, "note", why->note);
            put_text(writer, object, "first_with", why->first_with);
            put(writer, object, "shares", json_shares(why));
        }
    }
}

static void put_limit(struct writer *writer, json_t *object, const struct requirement *requirement)
{
    const bool is_within = requirement->relation == RELATION_WITHIN;
    put_text(writer, object, "relation",
             is_within                                 ? "within"
             : requirement->relation == RELATION_BELOW ? "below"
                                                       : "above");
    put_number(writer, object, "limit", requirement->value);
    if (is_within) {
        put_number(writer, object, "tolerance", requirement->tolerance);
    }
}

static void put_requirements(struct writer *writer, json_t *root, const struct result *result)
{
    json_t *array = put_array(writer, root, "requirements");
    for (int k = 0; k < result->requirement_count; k++) {
        const struct requirement_result *row = &result->requirements[k];
        json_t *object = append_object(writer, array);
        put_text(writer, object, "text", row->requirement->text);
        put(writer, object, "line",
            json_integer(source_line(&result->circuit->cell->sources, row->requirement->where)));
        put_text(writer, object, "quantity", row->requirement->probe.text);
        put_limit(writer, object, row->requirement);
        put_number(writer, object, "computed", row->computed);
        put_number(writer, object, "margin", row->margin);
        if (row->judgement == JUDGED_NOT) {
            put(writer, object, "judged", json_false());
        } else {
            put(writer, object, "met", json_boolean(row->judgement == JUDGED_MET));
        }
        json_put_spread_of(writer, object, result, row);
        if (result->repairs != NULL && result->repairs[k].looked_for) {
            put(writer, object, "repairs", json_repairs(&result->repairs[k]));
        } else if (result->repairs != NULL) {
            put_text(writer, object, "no_repairs", result->repairs[k].why_not);
        }
    }
}

static void put_series(struct writer *writer, json_t *array, const struct sweep *sweep,
                       const struct sweep_series *series)
{
    json_t *object = append_object(writer, array);
    put_number(writer, object, "family", series->family_value);
    put_numbers(writer, object, "knob", series->knob, series->count, 1);
    json_t *values = put_object(writer, object, "values");
    for (int q = 0; q < sweep->shown_count; q++) {
        put_numbers(writer, values, sweep->shown[q].text, series->values + q, series->count,
                    sweep->shown_count);
    }
    put_events(writer, object, series->events, series->event_count);
    put(writer, object, "lost", json_integer(series->lost));
}

static void put_sweeps(struct writer *writer, json_t *root, const struct result *result)
{
    if (result->sweep_count == 0) {
        return;
    }
    json_t *array = put_array(writer, root, "sweeps");
    for (int k = 0; k < result->sweep_count; k++) {
        const struct sweep *sweep = result->sweeps[k].sweep;
        json_t *object = append_object(writer, array);
        put_text(writer, object, "knob", sweep->knob.name);
        put_number(writer, object, "from", sweep->from);
        put_number(writer, object, "to", sweep->to);
        if (sweep->has_family) {
            put_text(writer, object, "family", sweep->family.name);
        }
        json_t *quantities = put_array(writer, object, "quantities");
        for (int q = 0; q < sweep->shown_count; q++) {
            append(writer, quantities, make_text(sweep->shown[q].text));
        }
        json_t *series = put_array(writer, object, "series");
        for (int s = 0; s < result->sweeps[k].series_count; s++) {
            put_series(writer, series, sweep, &result->sweeps[k].series[s]);
        }
    }
}

/* Parts of the commands explain, size and sensitivity. */
static void put_remedies(struct writer *writer, json_t *root, const struct result *result)
{
    if (result->hand_count == 0 && result->explanation_count > 0) {
        json_t *array = put_array(writer, root, "hand");
        for (int k = 0; k < result->explanation_count; k++) {
            append(writer, array, json_hand(&result->explanations[k]));
        }
    }
    if (result->size != NULL) {
        put(writer, root, "choices", json_choices(result->size));
    }
    if (result->sensitivity_count > 0) {
        put(writer, root, "sensitivities",
            json_sensitivities(result->sensitivities, result->sensitivity_count));
    }
}

static void put_caution(struct writer *writer, json_t *array, const struct caution *caution)
{
    json_t *object = append_object(writer, array);
    put_text(writer, object, "code", caution->code);
    if (caution->line > 0) {
        put(writer, object, "line", json_integer(caution->line));
    }
    put_text(writer, object, "thing", caution->thing);
    put_text(writer, object, "text", caution->text);
    put_text(writer, object, "rule", caution->rule);
}

/* The last is always there: what every text ends with. */
static void put_cautions(struct writer *writer, json_t *root, const struct caution_list *cautions)
{
    const struct caution always = {caution_name(CAUTION_MODEL), "", page_sign_off, NULL, 0};
    json_t *array = put_array(writer, root, "cautions");
    for (int k = 0; k < cautions->count; k++) {
        put_caution(writer, array, &cautions->list[k]);
    }
    put_caution(writer, array, &always);
    if (cautions->silenced_count > 0) {
        json_t *silenced = put_array(writer, root, "silenced");
        for (int k = 0; k < cautions->silenced_count; k++) {
            put_caution(writer, silenced, &cautions->silenced[k]);
        }
    }
}

static void put_heading(struct writer *writer, json_t *root, const char *version,
                        const char *command, const struct circuit *circuit, double kelvin)
{
    put_text(writer, root, "ampstead", version);
    put(writer, root, "schema", json_integer(SCHEMA_VERSION));
    put_text(writer, root, "command", command);
    put_text(writer, root, "file", circuit->cell->path);
    put_text(writer, root, "title", circuit->title);
    put_number(writer, root, "temperature", kelvin);
    put_text(writer, root, "corner", circuit->corner);
}

static int dump_to_buffer(const char *text, size_t length, void *data)
{
    struct buffer *out = data;
    buffer_put(out, text, length);
    return out->failed ? -1 : 0;
}

/* Writes and frees the object. */
static void finish(struct writer *writer, json_t *root, struct buffer *out)
{
    const size_t flags = JSON_INDENT(1) | JSON_PRESERVE_ORDER | JSON_REAL_PRECISION(DIGITS);
    if (writer->failed || json_dump_callback(root, dump_to_buffer, out, flags) != 0) {
        out->failed = true;
    }
    buffer_text(out, "\n");
    json_decref(root);
}

void report_json(const struct result *result, const char *version, struct buffer *out)
{
    struct writer writer = {false};
    json_t *root = json_object();
    put_heading(&writer, root, version, result->command, result->circuit, result->kelvin);
    put_text(&writer, root, "view", result->view == VIEW_HAND ? "hand" : "full");
    put_text(&writer, root, "verdict",
             result->is_stopped ? "stopped" : verdict_text(result->verdict));
    put_solver(&writer, root, &result->point.solver);
    if (result->point.solver.converged) {
        put_point(&writer, root, result);
        json_t *outputs = put_object(&writer, root, "outputs");
        for (int k = 0; k < result->output_count; k++) {
            put_output(&writer, outputs, result->circuit, &result->outputs[k]);
        }
        if (result->explanation_count == 0 || result->hand_count > 0) {
            put_hands(&writer, root, result);
        }
        put_requirements(&writer, root, result);
        json_put_spread(&writer, root, result);
        put_sweeps(&writer, root, result);
        put_remedies(&writer, root, result);
    }
    json_put_states(&writer, root, result);
    put_cautions(&writer, root, &result->cautions);
    finish(&writer, root, out);
}

static void put_range(struct writer *writer, json_t *object, const char *key, const double *range)
{
    if (isfinite(range[0]) || isfinite(range[1])) {
        put_numbers(writer, object, key, range, 2, 1);
    }
}

static void put_model(struct writer *writer, json_t *models, const struct model *model)
{
    json_t *object = put_object(writer, models, model->name);
    put_text(writer, object, "kind", model->type->model_kind);
    put_text(writer, object, "process", model->process);
    put_number(writer, object, "measured_at", model->measured_kelvin);
    put_range(writer, object, "valid_temperature", model->valid_kelvin);
    put_range(writer, object, "valid_L", model->valid_length);
    put_range(writer, object, "valid_W", model->valid_width);
    json_t *parameters = put_object(writer, object, "parameters");
    for (int k = 0; k < model->type->model_parameter_count; k++) {
        const struct parameter *parameter = &model->type->model_parameters[k];
        char unit[64];
        if (parameter->when_absent == DEFAULT_HIDDEN) {
            continue;
        }
        dimension_unit(parameter->dimension, unit, sizeof unit);
        json_t *row = put_object(writer, parameters, parameter->name);
        put_number(writer, row, "value", model->values[k]);
        put_text(writer, row, "unit", unit);
        put(writer, row, "given", json_boolean(model->given[k]));
        put_text(writer, row, "text", parameter->text);
    }
}

void report_json_models(const struct circuit *circuit, const char *version, struct buffer *out)
{
    struct writer writer = {false};
    json_t *root = json_object();
    put_heading(&writer, root, version, "models", circuit, circuit->kelvin);
    json_t *models = put_object(&writer, root, "models");
    for (int k = 0; k < circuit->model_count; k++) {
        put_model(&writer, models, &circuit->models[k]);
    }
    finish(&writer, root, out);
}
