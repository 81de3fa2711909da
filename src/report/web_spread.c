/* web_spread.c: what conditions and mismatch do to the cell, as HTML. */
#include <math.h>

#include "analyses/spread_result.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/web.h"

static const char *value(struct layout *layout, const struct probe *probe, double number)
{
    return web_units(layout, show_probe(layout, probe, number));
}

/* --- conditions ------------------------------------------------------------------------------- */

static void range_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Quantity", "Here", "Least", "at", "Most", "at"};
    static const bool numbers[] = {false, true, true, false, true, false};
    const struct conditions_result *r = result->conditions;
    struct web_table table;
    web_table_begin(&table, layout->out,
                    layout_format(layout,
                                  "Least and most of each quantity over %d points; %d without an "
                                  "operating point",
                                  r->point_count, r->unsolved_count),
                    heads, numbers, 6);
    for (int q = 0; q < r->probe_count; q++) {
        const struct condition_range *range = &r->ranges[q];
        if (range->least_at == NULL) {
            continue;
        }
        web_table_row(&table);
        web_table_name(&table, r->probes[q].text, 0);
        web_table_value(&table, range->own, value(layout, &r->probes[q], range->own));
        web_table_value(&table, range->least, value(layout, &r->probes[q], range->least));
        web_table_text(&table, page_place(layout, result, range->least_at));
        web_table_value(&table, range->most, value(layout, &r->probes[q], range->most));
        web_table_text(&table, page_place(layout, result, range->most_at));
    }
    web_table_end(&table);
}

static void drift_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Quantity", "Along", "Drift"};
    static const bool numbers[] = {false, false, true};
    const struct conditions_result *r = result->conditions;
    struct web_table table;
    if (r->drift_count == 0) {
        return;
    }
    web_table_begin(&table, layout->out, "Drift by the box method", heads, numbers, 3);
    for (int k = 0; k < r->drift_count; k++) {
        const struct condition_drift *drift = &r->drifts[k];
        const struct knob *knob = r->axes[drift->axis].knob;
        const char *unit = drift_unit(knob);
        if (unit != NULL) {
            web_table_row(&table);
            web_table_name(&table, r->probes[drift->probe].text, 0);
            web_table_text(&table, knob->name);
            web_table_value(&table, drift->share_per_unit,
                            show_share(layout, drift->share_per_unit, unit, false));
        }
    }
    web_table_end(&table);
}

static void supply_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Rail", "Down to", "Keeps", "Within", ""};
    static const bool numbers[] = {false, true, false, true, false};
    const struct conditions_result *r = result->conditions;
    struct web_table table;
    if (r->supply_count == 0) {
        return;
    }
    web_table_begin(&table, layout->out, "How far each rail may go down", heads, numbers, 5);
    for (int k = 0; k < r->supply_count; k++) {
        const struct supply_limit *limit = &r->supplies[k];
        const double least = isnan(limit->least) ? 0.0 : limit->least;
        web_table_row(&table);
        web_table_name(&table, result->circuit->rails[limit->rail].name, 0);
        web_table_value(&table, least,
                        web_units(layout, show_value(layout, least, DIMENSION_VOLTAGE)));
        web_table_text(&table, r->probes[limit->probe].text);
        web_table_value(&table, limit->within, show_share(layout, limit->within, "", false));
        web_table_text(&table, limit->remark != NULL ? limit->remark : "");
    }
    web_table_end(&table);
}

static void conditions_part(struct layout *layout, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    if (r == NULL || r->axis_count == 0 || r->probe_count == 0) {
        return;
    }
    web_heading(layout, "conditions", "Conditions");
    range_table(layout, result);
    drift_table(layout, result);
    supply_table(layout, result);
    struct figure_list figures = figures_of_conditions(layout, result);
    web_figures(layout, &figures);
}

/* --- mismatch --------------------------------------------------------------------------------- */

static void sigma_table(struct layout *layout, const struct mismatch_result *r)
{
    static const char *const heads[] = {"Quantity", "Here",        "Mean",   "Sigma",
                                        "of here",  "First order", "of here"};
    static const bool numbers[] = {false, true, true, true, true, true, true};
    struct web_table table;
    web_table_begin(&table, layout->out, "Mean and standard deviation, sampled and to first order",
                    heads, numbers, 7);
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        const double sampled = row->sampled.sigma / fabs(row->own);
        const double linear = row->linear_sigma / fabs(row->own);
        web_table_row(&table);
        web_table_name(&table, row->probe->text, 0);
        web_table_value(&table, row->own, value(layout, row->probe, row->own));
        web_table_value(&table, row->sampled.mean, value(layout, row->probe, row->sampled.mean));
        web_table_value(&table, row->sampled.sigma, value(layout, row->probe, row->sampled.sigma));
        web_table_value(&table, sampled, show_share(layout, sampled, "", false));
        web_table_value(&table, row->linear_sigma, value(layout, row->probe, row->linear_sigma));
        web_table_value(&table, linear, show_share(layout, linear, "", false));
    }
    web_table_end(&table);
}

static void yield_table(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Requirement", "Yield", "at least", "at most", "Share"};
    static const bool numbers[] = {false, true, true, true, false};
    const struct mismatch_result *r = result->mismatch;
    struct web_table table;
    if (r->yields == NULL || r->done == 0 || result->requirement_count == 0) {
        return;
    }
    web_table_begin(
        &table, layout->out,
        layout_format(layout, "Yield of %d samples; interval at 95 %% (Wilson)", r->done), heads,
        numbers, 5);
    for (int k = 0; k < result->requirement_count; k++) {
        const struct yield_result *y = &r->yields[k];
        const struct requirement *requirement = result->requirements[k].requirement;
        const double shown[] = {y->share, y->low, y->high};
        web_table_row(&table);
        web_table_name(&table, requirement_text(layout, requirement),
                       web_line(result, requirement->where));
        for (int m = 0; m < 3; m++) {
            web_table_value(&table, shown[m], layout_format(layout, "%.2f %%", 100.0 * shown[m]));
        }
        web_table_length(&table, y->share);
    }
    web_table_end(&table);
}

/* The causes of each quantity down to a thousandth of its variance. */
static void cause_table(struct layout *layout, const struct mismatch_result *r)
{
    static const char *const heads[] = {"Quantity", "Device", "Cause",
                                        "Variance", "Share",  "One sigma"};
    static const bool numbers[] = {false, false, false, true, false, true};
    static const double least = 1e-3;
    struct web_table table;
    web_table_begin(&table, layout->out, "What the variance comes from, to first order", heads,
                    numbers, 6);
    for (int q = 0; q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        for (int k = 0; k < row->contributor_count && row->contributors[k].share >= least; k++) {
            const struct contributor *part = &row->contributors[k];
            web_table_row(&table);
            web_table_name(&table, row->probe->text, 0);
            web_table_text(&table, part->instance->name);
            web_table_text(&table, part->cause);
            web_table_value(&table, part->share,
                            layout_format(layout, "%.1f %%", 100.0 * part->share));
            web_table_length(&table, part->share);
            web_table_value(
                &table, part->slope,
                web_units(layout, show_probe_difference(layout, row->probe, part->slope)));
        }
    }
    web_table_end(&table);
}

static void mismatch_part(struct layout *layout, const struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    if (r == NULL || r->deviate_count == 0) {
        return;
    }
    web_heading(layout, "mismatch", "Mismatch");
    web_paragraph(layout, r->failed > 0 ? "bad" : "", page_samples(layout, r));
    sigma_table(layout, r);
    struct figure_list figures = figures_of_samples(layout, result);
    web_figures(layout, &figures);
    yield_table(layout, result);
    cause_table(layout, r);
}

void web_spread(struct layout *layout, const struct result *result)
{
    conditions_part(layout, result);
    mismatch_part(layout, result);
}
