/* spread.c: the cell over its conditions and its mismatch, as text. */
#include "report/page_parts.h"

#include <math.h>

#include "analyses/spread_result.h"
#include "report/show.h"
#include "report/table.h"

static const char *knob_value(struct layout *layout, const struct circuit *circuit,
                              const struct knob *knob, double value)
{
    if (knob->kind == KNOB_PROCESS) {
        return value < 0 ? "typical" : layout_clean(layout, circuit->corners[(int)value].name);
    }
    return knob->kind == KNOB_TEMPERATURE ? show_celsius(layout, value)
                                          : show_round(layout, value, knob->dimension);
}

const char *page_place(struct layout *layout, const struct result *result, const double *at)
{
    const struct conditions_result *r = result->conditions;
    const char *text = "";
    for (int k = 0; at != NULL && k < r->axis_count; k++) {
        const struct knob *knob = r->axes[k].knob;
        const char *name = knob->kind == KNOB_TEMPERATURE ? ""
                           : knob->kind == KNOB_PROCESS   ? "corner "
                                                        : layout_format(layout, "%s ", knob->name);
        text = layout_format(layout, "%s%s%s%s", text, k > 0 ? ", " : "", name,
                             knob_value(layout, result->circuit, knob, at[k]));
    }
    return text;
}

/* --- conditions ------------------------------------------------------------------------------- */

static const char *corner_names(struct layout *layout, const struct circuit *circuit)
{
    const char *text = "typical";
    for (int k = 0; k < circuit->corner_count; k++) {
        text =
            layout_format(layout, "%s, %s", text, layout_clean(layout, circuit->corners[k].name));
    }
    return text;
}

static void conditions_part(struct layout *layout, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    layout_part(layout, "conditions");
    if (r->probe_count == 0) {
        layout_paragraph(layout, TONE_WARN, 0,
                         "there is nothing to follow: the cell has no `output` and no `require` "
                         "line");
    }
    if (r->axis_count == 0) {
        layout_paragraph(layout, TONE_PLAIN, 0,
                         "the cell has no `vary` line: its own conditions only");
        return;
    }
    int fine = 0;
    for (int k = 0; k < r->axis_count; k++) {
        const struct condition_axis *axis = &r->axes[k];
        const struct circuit *c = result->circuit;
        const bool is_process = axis->knob->kind == KNOB_PROCESS;
        const char *range =
            is_process
                ? corner_names(layout, c)
                : layout_format(layout, "%s to %s", knob_value(layout, c, axis->knob, axis->from),
                                knob_value(layout, c, axis->knob, axis->to));
        layout_paragraph(layout, TONE_PLAIN, 2,
                         layout_format(layout, "%s %s; here %s",
                                       layout_short(layout, axis->knob->name, 30), range,
                                       knob_value(layout, c, axis->knob, axis->own)));
        fine += axis->fine_count;
    }
    layout_paragraph(layout, TONE_QUIET, 0,
                     layout_format(layout,
                                   "%d combinations of ends and own values, %d points along the "
                                   "single ranges",
                                   r->combination_count, fine));
    if (r->done_count < r->point_count) {
        layout_paragraph(layout, TONE_WARN, 2,
                         layout_format(layout,
                                       "! stopped after %d of %d: ranges are over those alone",
                                       r->done_count, r->point_count));
    }
    if (r->unsolved_count > 0) {
        layout_paragraph(layout, TONE_WARN, 2,
                         layout_format(layout,
                                       "! %d of %d have no operating point, the first at %s",
                                       r->unsolved_count, r->point_count,
                                       page_place(layout, result, r->unsolved_at)));
    }
}

static void range_row(struct table *table, const struct result *result, int q, const char *what,
                      double value, const double *at)
{
    struct layout *layout = table->layout;
    table_row(table, TONE_QUIET);
    table_cell(table, 0, what);
    table_cell(table, 1, show_probe(layout, &result->conditions->probes[q], value));
    table_cell(table, 2, page_place(layout, result, at));
}

static void ranges_part(struct layout *layout, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    layout_part(layout, "ranges");
    for (int q = 0; r->axis_count > 0 && q < r->probe_count; q++) {
        const struct condition_range *range = &r->ranges[q];
        const struct probe *probe = &r->probes[q];
        if (range->least_at == NULL) {
            continue;
        }
        layout_line(layout, TONE_STRONG,
                    layout_format(layout, "%s %s", layout_short(layout, probe->text, 40),
                                  show_probe(layout, probe, range->own)));
        struct table table;
        table_begin(&table, layout);
        table_column(&table, (struct table_column){.head = ""});
        table_column(&table, (struct table_column){.head = "", .right = true});
        table_column(&table, (struct table_column){.head = "", .wraps = true});
        range_row(&table, result, q, "  least", range->least, range->least_at);
        range_row(&table, result, q, "  most", range->most, range->most_at);
        table_write(&table);
    }
}

/* --- drift and supply ------------------------------------------------------------------------- */

const char *drift_unit(const struct knob *knob)
{
    if (knob->kind == KNOB_TEMPERATURE) {
        return "/K";
    }
    return dimension_equal(knob->dimension, DIMENSION_VOLTAGE) ? "/V" : NULL;
}

static void drift_part(struct layout *layout, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    struct table table;
    layout_part(layout, "drift");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .right = true});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    for (int k = 0; k < r->drift_count; k++) {
        const struct condition_drift *drift = &r->drifts[k];
        const struct condition_axis *axis = &r->axes[drift->axis];
        const char *unit = drift_unit(axis->knob);
        if (unit == NULL) {
            continue;
        }
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, layout_short(layout, r->probes[drift->probe].text, 40));
        table_cell(&table, 1, show_share(layout, drift->share_per_unit, unit, false));
        table_cell(&table, 2,
                   layout_format(layout, "%s, box over %s to %s",
                                 layout_short(layout, axis->knob->name, 30),
                                 knob_value(layout, result->circuit, axis->knob, axis->from),
                                 knob_value(layout, result->circuit, axis->knob, axis->to)));
    }
    table_write(&table);
}

static void supply_part(struct layout *layout, const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    struct table table;
    layout_part(layout, "lowest rail");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .right = true});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    for (int k = 0; k < r->supply_count; k++) {
        const struct supply_limit *limit = &r->supplies[k];
        const char *band = show_round(layout, limit->within * 100.0, DIMENSION_NONE);
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, layout_short(layout, result->circuit->rails[limit->rail].name, 30));
        table_cell(&table, 1,
                   isnan(limit->least) ? "0 V"
                                       : show_value(layout, limit->least, DIMENSION_VOLTAGE));
        table_cell(&table, 2,
                   layout_format(layout, "keeps %s within %s %%%s%s",
                                 layout_short(layout, r->probes[limit->probe].text, 40), band,
                                 limit->remark != NULL ? "; " : "",
                                 limit->remark != NULL ? limit->remark : ""));
    }
    table_write(&table);
}

/* --- the whole -------------------------------------------------------------------------------- */

void report_spread(const struct result *result, const struct report_style *style,
                   struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (!result->point.solver.converged && !style->stopped) {
        page_unsolved(&layout, result);
    }
    if (result->conditions != NULL) {
        conditions_part(&layout, result);
        ranges_part(&layout, result);
        drift_part(&layout, result);
        supply_part(&layout, result);
    }
    if (result->mismatch != NULL) {
        page_mismatch(&layout, result);
    }
    page_requirements(&layout, result);
    page_cautions(&layout, result);
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}
