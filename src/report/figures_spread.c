/* figures_spread.c: what spreads: histograms of the samples with their limits, causes ranked, and
 * curves over the conditions. */
#include "report/figures_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/spread_result.h"
#include "report/limits.h"
#include "report/markup.h"
#include "report/show.h"

enum { CAUSES_SHOWN = 10, CURVE_STEPS = 4, SHARED_LIMIT = 12 };

/* A smaller share of the variance is not worth a row. */
#define CAUSE_LEAST 5e-4

static const char *probe_text(struct layout *layout, const struct probe *probe, double value)
{
    return markup_units(layout->arena, show_probe(layout, probe, value));
}

static double shown_factor(const struct probe *probe)
{
    return figures_is_share(probe) ? 100.0 : 1.0;
}

static struct figure_axis probe_axis(struct layout *layout, const struct probe *probe)
{
    const char *name = layout_short(layout, probe->text, 40);
    return figures_is_share(probe) ? (struct figure_axis){name, "%", false}
                                   : figures_axis(layout, name, probe->dimension);
}

/* --- limits ----------------------------------------------------------------------------------- */

static const char *limit_text(struct layout *layout, const struct probe *probe,
                              const struct limit *limit)
{
    return layout_format(layout, "at %s %s", limit->is_upper ? "most" : "least",
                         probe_text(layout, probe, limit->value));
}

/* --- histograms ------------------------------------------------------------------------------- */

/* The allowed range as band, its ends as lines; a limit more than a width away is a note. */
static void mark_limits(struct layout *layout, struct figure *figure, const struct circuit *circuit,
                        const struct spread_of_probe *row)
{
    struct limit limits[LIMIT_COUNT];
    const int count = limits_find(circuit, row->probe, false, limits);
    const double factor = shown_factor(row->probe);
    const double from = row->histogram.from, to = row->histogram.to, width = to - from;
    if (count > 0) {
        figure->band = (struct figure_band){(double)-INFINITY, (double)INFINITY, ""};
    }
    for (int k = 0; k < count; k++) {
        const char *text = limit_text(layout, row->probe, &limits[k]);
        const double value = limits[k].value;
        if (limits[k].is_upper) {
            figure->band.to = fmin(figure->band.to, value * factor);
        } else {
            figure->band.from = fmax(figure->band.from, value * factor);
        }
        if (limits_seen(limits, k)) {
            continue;
        }
        if (value >= from - width && value <= to + width) {
            figure->edges[figure->edge_count++] =
                (struct figure_edge){.x = value * factor, .text = text, .series = 1};
        } else {
            figures_note(figure, layout_format(layout, "wanted %s: %s of this picture", text,
                                               value < from ? "left" : "right"));
        }
    }
}

/* The normal curve of the same mean and sigma, as samples a bar; its points hold all middles of
 * bars. */
static bool add_normal(struct layout *layout, struct figure *figure,
                       const struct spread_of_probe *row)
{
    const struct histogram *h = &row->histogram;
    const double factor = shown_factor(row->probe), bin = (h->to - h->from) / h->bins;
    const int count = h->bins * CURVE_STEPS + 1;
    const double peak = row->sampled.count * bin / (row->sampled.sigma * sqrt(2.0 * acos(-1.0)));
    double *x = arena_new_array(layout->arena, double, count);
    double *y = arena_new_array(layout->arena, double, count);
    if (x == NULL || y == NULL) {
        return false;
    }
    for (int k = 0; k < count; k++) {
        const double value = h->from + bin * k / CURVE_STEPS;
        const double z = (value - row->sampled.mean) / row->sampled.sigma;
        x[k] = value * factor;
        y[k] = peak * exp(-0.5 * z * z);
    }
    figure->series[figure->series_count++] =
        (struct figure_series){"normal", x, y, count, (double)NAN, 0.0, 0.0};
    return true;
}

static void note_samples(struct layout *layout, struct figure *figure,
                         const struct mismatch_result *r, const struct spread_of_probe *row)
{
    const double share = row->sampled.sigma / fabs(row->own);
    figures_note(figure,
                 layout_format(layout, "%d samples: mean %s, sigma %s%s%s%s", row->sampled.count,
                               probe_text(layout, row->probe, row->sampled.mean),
                               probe_text(layout, row->probe, row->sampled.sigma),
                               isfinite(share) ? " (" : "",
                               isfinite(share) ? show_share(layout, share, "", false) : "",
                               isfinite(share) ? ")" : ""));
    if (r->failed > 0 || row->missing > 0) {
        figures_note(figure,
                     layout_format(layout, "%d without an operating point, %d without a value",
                                   r->failed, row->missing));
    }
}

static bool add_histogram(struct layout *layout, struct figure_list *figures,
                          const struct result *result, const struct spread_of_probe *row)
{
    const struct histogram *h = &row->histogram;
    const double factor = shown_factor(row->probe), bin = (h->to - h->from) / h->bins;
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_room(layout, figure, LIMIT_COUNT + 1)) {
        return false;
    }
    figure->bars = arena_new_array(layout->arena, struct figure_bar, h->bins);
    if (figure->bars == NULL) {
        return false;
    }
    figure->title =
        layout_format(layout, "%s over mismatch", layout_short(layout, row->probe->text, 40));
    figure->x = probe_axis(layout, row->probe);
    figure->y = (struct figure_axis){"samples", "", false};
    figure->labels_above = true;
    figure->keeps_zero = true;
    for (int b = 0; b < h->bins; b++) {
        figure->bars[figure->bar_count++] = (struct figure_bar){
            (h->from + bin * b) * factor, (h->from + bin * (b + 1)) * factor, h->counts[b]};
    }
    note_samples(layout, figure, result->mismatch, row);
    mark_limits(layout, figure, result->circuit, row);
    if (isfinite(row->own) && row->own >= h->from && row->own <= h->to) {
        figure->edges[figure->edge_count++] = (struct figure_edge){
            row->own * factor,
            layout_format(layout, "without mismatch %s", probe_text(layout, row->probe, row->own)),
            4};
    }
    return add_normal(layout, figure, row);
}

static void add_samples(struct layout *layout, struct figure_list *figures,
                        const struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    for (int q = 0; r != NULL && q < r->quantity_count; q++) {
        const struct spread_of_probe *row = &r->quantities[q];
        if (row->sampled.count > 1 && row->histogram.bins > 1 && row->sampled.sigma > 0.0 &&
            !add_histogram(layout, figures, result, row)) {
            return;
        }
    }
}

/* --- causes ----------------------------------------------------------------------------------- */

static bool add_causes(struct layout *layout, struct figure_list *figures,
                       const struct spread_of_probe *row)
{
    struct figure *figure = figures_add(layout, figures);
    int count = 0;
    double rest = 1.0;
    if (figure == NULL || !figures_rows(layout, figure, CAUSES_SHOWN + 1)) {
        return false;
    }
    figure->title = layout_format(layout, "%s: what its variance comes from",
                                  layout_short(layout, row->probe->text, 40));
    figures_note(figure,
                 layout_format(layout, "to first order, sigma %s; what one sigma of each does",
                               probe_text(layout, row->probe, row->linear_sigma)));
    for (; count < CAUSES_SHOWN && count < row->contributor_count &&
           row->contributors[count].share > CAUSE_LEAST;
         count++) {
        const struct contributor *part = &row->contributors[count];
        figures_row(
            figure,
            layout_format(layout, "%s %s", layout_short(layout, part->instance->name, 24),
                          part->cause),
            part->share, layout_format(layout, "%.1f %%", 100.0 * part->share),
            markup_units(layout->arena, show_probe_difference(layout, row->probe, part->slope)));
        rest -= part->share;
    }
    if (count < row->contributor_count) {
        rest = fmax(rest, 0.0);
        figures_row(figure, layout_format(layout, "%d more", row->contributor_count - count), rest,
                    layout_format(layout, "%.1f %%", 100.0 * rest), "");
    }
    return true;
}

/* --- conditions ------------------------------------------------------------------------------- */

static double zero_of(const struct knob *knob)
{
    return knob->kind == KNOB_TEMPERATURE ? 273.15 : 0.0;
}

/* Quantities of one kind and size share a picture, unless a limit is to be shown. */
static bool fits(const struct result *result, int a, int b)
{
    const struct conditions_result *r = result->conditions;
    const struct probe *x = &r->probes[a], *y = &r->probes[b];
    const double own = fabs(r->ranges[a].own), other = fabs(r->ranges[b].own);
    struct limit limits[LIMIT_COUNT];
    return a == b || (x->kind == y->kind && x->quantity == y->quantity && x->kind != PROBE_DEVICE &&
                      own < FIGURES_SPAN * other && other < FIGURES_SPAN * own &&
                      limits_find(result->circuit, x, true, limits) == 0 &&
                      limits_find(result->circuit, y, true, limits) == 0);
}

static bool add_curve(struct layout *layout, struct figure *figure,
                      const struct conditions_result *r, int axis, int q)
{
    const struct condition_axis *along = &r->axes[axis];
    const double zero = zero_of(along->knob), factor = shown_factor(&r->probes[q]);
    const double own = r->ranges[q].own * factor;
    double *x = arena_new_array(layout->arena, double, along->fine_count);
    double *y = arena_new_array(layout->arena, double, along->fine_count);
    if (x == NULL || y == NULL) {
        return false;
    }
    for (int k = 0; k < along->fine_count; k++) {
        const struct condition_point *point = &r->points[along->fine_first + k];
        x[k] = point->at[axis] - zero;
        y[k] = point->is_solved ? point->values[q] * factor : (double)NAN;
    }
    figure->marks[figure->mark_count++] = (struct figure_mark){
        .x = along->own - zero, .y = own, .text = "", .series = figure->series_count};
    figure->series[figure->series_count++] =
        (struct figure_series){layout_short(layout, r->probes[q].text, 22),
                               x,
                               y,
                               along->fine_count,
                               fabs(own) > 0.0 ? own : (double)NAN,
                               fmin(along->from, along->to) - zero,
                               fmax(along->from, along->to) - zero};
    return true;
}

/* Limits of an `everywhere` line, where they are not far from the curve. */
static void level_limits(struct layout *layout, struct figure *figure,
                         const struct circuit *circuit, const struct probe *probe)
{
    const struct figure_series *curve = &figure->series[0];
    double low = (double)INFINITY, high = (double)-INFINITY;
    struct limit limits[LIMIT_COUNT];
    const int count = limits_find(circuit, probe, true, limits);
    figure->levels = arena_new_array(layout->arena, struct figure_level, LIMIT_COUNT);
    for (int k = 0; k < curve->count; k++) {
        low = isfinite(curve->y[k]) ? fmin(low, curve->y[k]) : low;
        high = isfinite(curve->y[k]) ? fmax(high, curve->y[k]) : high;
    }
    for (int k = 0; k < count && figure->levels != NULL; k++) {
        const double value = limits[k].value * shown_factor(probe);
        const double room = fmax(high - low, 0.05 * fmax(fabs(low), fabs(high)));
        if (value >= low - room && value <= high + room && !limits_seen(limits, k)) {
            figure->levels[figure->level_count++] = (struct figure_level){
                value, limit_text(layout, probe, &limits[k]), limits[k].is_upper};
        }
    }
}

static bool add_conditions(struct layout *layout, struct figure_list *figures,
                           const struct result *result, int axis, int q)
{
    const struct conditions_result *r = result->conditions;
    const struct knob *knob = r->axes[axis].knob;
    struct figure *figure = figures_add(layout, figures);
    if (figure == NULL || !figures_room(layout, figure, SHARED_LIMIT)) {
        return false;
    }
    for (int other = q; other < r->probe_count && figure->series_count < SHARED_LIMIT; other++) {
        if (fits(result, q, other) && !add_curve(layout, figure, r, axis, other)) {
            return false;
        }
    }
    const bool is_shared = figure->series_count > 1;
    figure->title =
        layout_format(layout, "%s against %s",
                      is_shared ? "Quantities" : layout_short(layout, r->probes[q].text, 40),
                      layout_short(layout, knob->name, 30));
    figure->x = figures_knob_axis(layout, knob);
    figure->y = probe_axis(layout, &r->probes[q]);
    if (is_shared) {
        figure->y.name = "value";
    } else {
        level_limits(layout, figure, result->circuit, &r->probes[q]);
    }
    figure->keeps_zero = figures_wants_zero(figure);
    if (figure->keeps_zero) {
        figure_choose_close_up(figure);
    }
    return true;
}

static bool has_value(const struct conditions_result *r, int axis, int q)
{
    for (int k = 0; k < r->axes[axis].fine_count; k++) {
        const struct condition_point *point = &r->points[r->axes[axis].fine_first + k];
        if (point->is_solved && isfinite(point->values[q])) {
            return true;
        }
    }
    return false;
}

static void add_all_conditions(struct layout *layout, struct figure_list *figures,
                               const struct result *result)
{
    const struct conditions_result *r = result->conditions;
    for (int q = 0; r != NULL && q < r->probe_count; q++) {
        bool is_done = false;
        for (int before = 0; before < q; before++) {
            is_done = is_done || fits(result, before, q);
        }
        for (int axis = 0; !is_done && axis < r->axis_count; axis++) {
            if (has_value(r, axis, q) && !add_conditions(layout, figures, result, axis, q)) {
                return;
            }
        }
    }
}

struct figure_list figures_of_samples(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    add_samples(layout, &figures, result);
    return figures;
}

struct figure_list figures_of_conditions(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    add_all_conditions(layout, &figures, result);
    return figures;
}

struct figure_list figures_of_spread(struct layout *layout, const struct result *result)
{
    struct figure_list figures = {NULL, 0, 0};
    const struct mismatch_result *r = result->mismatch;
    add_samples(layout, &figures, result);
    for (int q = 0; r != NULL && q < r->quantity_count; q++) {
        if (r->quantities[q].contributor_count > 0 &&
            !add_causes(layout, &figures, &r->quantities[q])) {
            break;
        }
    }
    add_all_conditions(layout, &figures, result);
    return figures;
}
