/* json_spread.c: conditions and mismatch as JSON keys. */
#include "analyses/spread_result.h"
#include "report/json_parts.h"

/* {"temperature": 358.15, "vdd": 2.7, "process": "slow"} */
static json_t *place(struct writer *writer, const struct result *result, const double *at)
{
    const struct conditions_result *r = result->conditions;
    json_t *object = json_object();
    for (int k = 0; k < r->axis_count; k++) {
        const struct knob *knob = r->axes[k].knob;
        if (knob->kind == KNOB_PROCESS) {
            const int corner = (int)at[k];
            put_text(writer, object, knob->name,
                     corner < 0 ? "typical" : result->circuit->corners[corner].name);
        } else {
            put_number(writer, object, knob->name, at[k]);
        }
    }
    return object;
}

static void put_place(struct writer *writer, json_t *object, const char *key,
                      const struct result *result, const double *at)
{
    if (at != NULL) {
        put(writer, object, key, place(writer, result, at));
    }
}

/* --- conditions ------------------------------------------------------------------------------- */

static void put_axes(struct writer *writer, json_t *object, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    const struct circuit *c = result->circuit;
    json_t *axes = put_array(writer, object, "varied");
    for (int k = 0; k < r->axis_count; k++) {
        const struct condition_axis *axis = &r->axes[k];
        json_t *row = append_object(writer, axes);
        put_text(writer, row, "thing", axis->knob->name);
        if (axis->knob->kind != KNOB_PROCESS) {
            put_number(writer, row, "from", axis->from);
            put_number(writer, row, "to", axis->to);
            put_number(writer, row, "own", axis->own);
            continue;
        }
        json_t *corners = put_array(writer, row, "corners");
        append(writer, corners, make_text("typical"));
        for (int n = 0; n < c->corner_count; n++) {
            append(writer, corners, make_text(c->corners[n].name));
        }
    }
}

static void put_ranges(struct writer *writer, json_t *object, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    json_t *ranges = put_object(writer, object, "ranges");
    for (int q = 0; q < r->probe_count; q++) {
        const struct condition_range *range = &r->ranges[q];
        json_t *row = put_object(writer, ranges, r->probes[q].text);
        put_number(writer, row, "own", range->own);
        put_number(writer, row, "least", range->least);
        put_place(writer, row, "least_at", result, range->least_at);
        put_number(writer, row, "most", range->most);
        put_place(writer, row, "most_at", result, range->most_at);
    }
}

static void put_drift(struct writer *writer, json_t *object, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    json_t *drifts = put_array(writer, object, "drift");
    for (int k = 0; k < r->drift_count; k++) {
        const struct condition_drift *drift = &r->drifts[k];
        json_t *row = append_object(writer, drifts);
        put_text(writer, row, "quantity", r->probes[drift->probe].text);
        put_text(writer, row, "thing", r->axes[drift->axis].knob->name);
        put_number(writer, row, "share_per_unit", drift->share_per_unit);
    }
    json_t *supplies = put_array(writer, object, "lowest_rail");
    for (int k = 0; k < r->supply_count; k++) {
        const struct supply_limit *limit = &r->supplies[k];
        json_t *row = append_object(writer, supplies);
        put_text(writer, row, "rail", result->circuit->rails[limit->rail].name);
        put_text(writer, row, "quantity", r->probes[limit->probe].text);
        put_number(writer, row, "within", limit->within);
        put_number(writer, row, "v", limit->least);
        put_text(writer, row, "remark", limit->remark);
    }
}

static void put_conditions(struct writer *writer, json_t *root, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    json_t *object = put_object(writer, root, "conditions");
    put_axes(writer, object, result);
    put(writer, object, "combinations", json_integer(r->combination_count));
    put(writer, object, "points", json_integer(r->point_count));
    if (r->done_count < r->point_count) {
        put(writer, object, "done", json_integer(r->done_count));
    }
    put(writer, object, "unsolved", json_integer(r->unsolved_count));
    put_place(writer, object, "unsolved_at", result, r->unsolved_at);
    put_ranges(writer, object, result);
    put_drift(writer, object, result);
}

/* --- mismatch --------------------------------------------------------------------------------- */

static void put_figures(struct writer *writer, json_t *root, const struct mismatch_result *r)
{
    json_t *mean = put_object(writer, root, "mean");
    json_t *sigma = put_object(writer, root, "sigma");
    json_t *linear = put_object(writer, root, "sigma_first_order");
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        put_number(writer, mean, row->probe->text, row->sampled.mean);
        put_number(writer, sigma, row->probe->text, row->sampled.sigma);
        put_number(writer, linear, row->probe->text, row->linear_sigma);
    }
}

static void put_details(struct writer *writer, json_t *root, const struct mismatch_result *r)
{
    json_t *array = put_array(writer, root, "distributions");
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        if (row->sampled.count == 0) {
            continue;
        }
        json_t *object = append_object(writer, array);
        put_text(writer, object, "quantity", row->probe->text);
        put(writer, object, "count", json_integer(row->sampled.count));
        put(writer, object, "missing", json_integer(row->missing));
        put_number(writer, object, "least", row->sampled.least);
        put_number(writer, object, "most", row->sampled.most);
        put_number(writer, object, "sigma_error", row->sampled.sigma_error);
        if (row->agreement != AGREEMENT_UNKNOWN) {
            put(writer, object, "agrees_with_first_order",
                json_boolean(row->agreement == AGREEMENT_HOLDS));
        }
        json_t *histogram = put_object(writer, object, "histogram");
        put_number(writer, histogram, "from", row->histogram.from);
        put_number(writer, histogram, "to", row->histogram.to);
        json_t *counts = put_array(writer, histogram, "counts");
        for (int b = 0; b < row->histogram.bins; b++) {
            append(writer, counts, json_integer(row->histogram.counts[b]));
        }
    }
}

static void put_contributors(struct writer *writer, json_t *root, const struct mismatch_result *r)
{
    json_t *array = put_array(writer, root, "contributors");
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        for (int k = 0; k < row->contributor_count; k++) {
            const struct contributor *part = &row->contributors[k];
            json_t *object = append_object(writer, array);
            put_text(writer, object, "quantity", row->probe->text);
            put_text(writer, object, "device", part->instance->name);
            put_text(writer, object, "cause", part->cause);
            put_number(writer, object, "share", part->share);
            put_number(writer, object, "per_sigma", part->slope);
        }
    }
}

static void put_yield(struct writer *writer, json_t *object, const struct yield_result *y)
{
    put(writer, object, "met", json_integer(y->hits));
    put(writer, object, "of", json_integer(y->count));
    put_number(writer, object, "share", y->share);
    put_number(writer, object, "low", y->low);
    put_number(writer, object, "high", y->high);
}

static void put_mismatch(struct writer *writer, json_t *root, const struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    json_t *samples = put_object(writer, root, "samples");
    put(writer, samples, "wanted", json_integer(r->wanted));
    put(writer, samples, "done", json_integer(r->done));
    put(writer, samples, "failed", json_integer(r->failed));
    put(writer, samples, "searched", json_integer(r->searched));
    put(writer, samples, "deviates", json_integer(r->deviate_count));
    put(writer, samples, "seed", json_integer((json_int_t)r->seed));
    put_figures(writer, root, r);
    put_details(writer, root, r);
    json_t *yields = put_array(writer, root, "yield");
    for (int k = 0; r->yields != NULL && r->done > 0 && k < result->requirement_count; k++) {
        json_t *object = append_object(writer, yields);
        put_text(writer, object, "text", result->requirements[k].requirement->text);
        put_yield(writer, object, &r->yields[k]);
    }
    put_contributors(writer, root, r);
}

void json_put_spread(struct writer *writer, json_t *root, const struct result *result)
{
    const bool is_spread = strcmp(result->command, "spread") == 0;
    if (result->conditions != NULL && is_spread) {
        put_conditions(writer, root, result);
    }
    if (result->mismatch != NULL) {
        put_mismatch(writer, root, result);
    }
}

void json_put_spread_of(struct writer *writer, json_t *object, const struct result *result,
                        const struct requirement_result *row)
{
    put_place(writer, object, "worst_at", result, row->worst_at);
    if (row->yield != NULL && row->yield->count > 0) {
        put_yield(writer, put_object(writer, object, "yield"), row->yield);
    }
}
