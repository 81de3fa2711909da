/*
 * conditions.c: a cell over its `vary` lines: combinations, corners, fine sweeps, worst cases.
 *
 * Each point is solved by itself, from the cell's own point: the answer does not depend on the
 * order or on how many threads there are.
 */
#include "analyses/conditions.h"

#include <math.h>
#include <string.h>

#include "analyses/judge.h"
#include "analyses/setup.h"
#include "base/workers.h"

enum { FINE_POINTS = 41 };

/* Values closer than this share are equal: of equal cases the first, the cell's own, is named. */
static const double equal_share = 1e-9;

static bool is_less(double a, double b)
{
    return a < b - equal_share * fabs(b);
}

/* --- axes and points -------------------------------------------------------------------------- */

static double own_value(const struct circuit *c, const struct knob *knob)
{
    switch (knob->kind) {
    case KNOB_TEMPERATURE:
        return c->kelvin;
    case KNOB_VALUE:
        return c->instances[knob->instance].own[knob->parameter];
    case KNOB_LET:
        return c->lets[knob->parameter].value.value;
    case KNOB_PROCESS:
        break;
    }
    for (int k = 0; k < c->corner_count; k++) {
        if (c->corner != NULL && strcmp(c->corners[k].name, c->corner) == 0) {
            return k;
        }
    }
    return CONDITION_TYPICAL;
}

static void add_end(struct condition_axis *axis, double *ends, double value)
{
    for (int k = 0; k < axis->end_count; k++) {
        if (ends[k] == value) {
            return;
        }
    }
    ends[axis->end_count++] = value;
}

/* Whatever is asked first stands first, so that of two equal cases the cell's own is named. */
static bool make_axis(struct condition_axis *axis, const struct circuit *c,
                      const struct condition *condition, struct arena *arena)
{
    const bool is_process = condition->knob.kind == KNOB_PROCESS;
    double *ends = arena_new_array(arena, double, is_process ? c->corner_count + 1 : 3);
    *axis = (struct condition_axis){.knob = &condition->knob,
                                    .from = condition->from,
                                    .to = condition->to,
                                    .own = own_value(c, &condition->knob),
                                    .ends = ends};
    if (ends == NULL) {
        return false;
    }
    add_end(axis, ends, axis->own);
    if (!is_process) {
        add_end(axis, ends, axis->from);
        add_end(axis, ends, axis->to);
        return true;
    }
    for (int k = -1; k < c->corner_count; k++) {
        add_end(axis, ends, k);
    }
    return true;
}

/* The points that are needed, or -1 when they are too many. */
static int count_points(struct conditions_result *r)
{
    double combinations = 1;
    int fine = 0;
    for (int k = 0; k < r->axis_count; k++) {
        struct condition_axis *axis = &r->axes[k];
        combinations *= axis->end_count;
        axis->fine_count = axis->knob->kind == KNOB_PROCESS ? 0 : FINE_POINTS;
        fine += axis->fine_count;
    }
    if (combinations + fine > CONDITION_POINT_LIMIT) {
        return -1;
    }
    r->combination_count = (int)combinations;
    int next = r->combination_count;
    for (int k = 0; k < r->axis_count; k++) {
        r->axes[k].fine_first = next;
        next += r->axes[k].fine_count;
    }
    return next;
}

static void place_points(const struct conditions_result *r, double *at)
{
    const size_t axes = (size_t)r->axis_count;
    for (int k = 0; k < r->combination_count; k++, at += axes) {
        for (int a = 0, rest = k; a < r->axis_count; a++) {
            at[a] = r->axes[a].ends[rest % r->axes[a].end_count];
            rest /= r->axes[a].end_count;
        }
    }
    for (int k = 0; k < r->axis_count; k++) {
        const struct condition_axis *axis = &r->axes[k];
        for (int f = 0; f < axis->fine_count; f++, at += axes) {
            for (int a = 0; a < r->axis_count; a++) {
                at[a] = r->axes[a].own;
            }
            at[k] = f == axis->fine_count - 1
                        ? axis->to
                        : axis->from + (axis->to - axis->from) * f / (axis->fine_count - 1);
        }
    }
}

static enum status make_points(struct conditions_result *r, const struct circuit *c,
                               const struct reading_list *list, struct arena *arena)
{
    r->axis_count = c->condition_count;
    r->axes = arena_new_array(arena, struct condition_axis, r->axis_count);
    for (int k = 0; k < r->axis_count; k++) {
        if (r->axes == NULL || !make_axis(&r->axes[k], c, &c->conditions[k], arena)) {
            return STATUS_MEMORY;
        }
    }
    r->probes = list->probes;
    r->probe_count = list->probe_count;
    r->point_count = count_points(r);
    if (r->point_count < 0) {
        r->point_count = 0;
        return STATUS_INPUT;
    }
    const size_t count = (size_t)r->point_count, probes = (size_t)r->probe_count;
    const size_t requirements = (size_t)c->requirement_count;
    r->points = arena_new_array(arena, struct condition_point, count);
    double *at = arena_new_array(arena, double, count *(size_t)r->axis_count);
    double *values = arena_new_array(arena, double, count *probes);
    double *margins = arena_new_array(arena, double, count *requirements);
    if (r->points == NULL || at == NULL || values == NULL || margins == NULL) {
        return STATUS_MEMORY;
    }
    place_points(r, at);
    for (size_t k = 0; k < count * probes; k++) {
        values[k] = NAN;
    }
    for (size_t k = 0; k < count * requirements; k++) {
        margins[k] = NAN;
    }
    for (size_t k = 0; k < count; k++) {
        r->points[k] = (struct condition_point){.at = at + k * (size_t)r->axis_count,
                                                .values = values + k * probes,
                                                .margins = margins + k * requirements};
    }
    return STATUS_OK;
}

/* --- solving ---------------------------------------------------------------------------------- */

struct solve_task {
    struct circuit *circuit;
    const struct analysis_options *options;
    enum reading_scope scope;
    struct conditions_result *result;
    const double *home;
    int home_count;
};

static enum status solve_point(void *self, struct worker *worker, int index)
{
    const struct solve_task *t = self;
    struct condition_point *point = &t->result->points[index];
    struct analysis_options options = *t->options;
    options.stopped = worker_stopped;
    options.stopped_self = worker;
    options.progress = NULL;
    struct setup setup;
    enum status status = setup_open(&setup, t->circuit, t->result->axes, t->result->axis_count,
                                    point->at, t->scope, &options);
    if (status == STATUS_OK) {
        status = setup_solve(&setup, t->home, t->home_count, NULL);
    }
    if (status == STATUS_OK) {
        status = reading_take(&setup.point, &setup.list, point->values, point->margins);
        point->is_solved = status == STATUS_OK;
    }
    setup_close(&setup);
    status = status == STATUS_UNSOLVED ? STATUS_OK : status;
    point->is_done = status == STATUS_OK;
    return status;
}

/* --- what the points say ---------------------------------------------------------------------- */

static void count_points_done(struct conditions_result *r)
{
    for (int k = 0; k < r->point_count; k++) {
        r->done_count += r->points[k].is_done;
        if (r->points[k].is_done && !r->points[k].is_solved) {
            r->unsolved_at = r->unsolved_count == 0 ? r->points[k].at : r->unsolved_at;
            r->unsolved_count++;
        }
    }
}

static bool find_ranges(struct conditions_result *r, struct arena *arena)
{
    r->ranges = arena_new_array(arena, struct condition_range, r->probe_count);
    for (int q = 0; r->ranges != NULL && q < r->probe_count; q++) {
        struct condition_range *range = &r->ranges[q];
        /* the first combination is the cell's own conditions */
        *range = (struct condition_range){r->points[0].values[q], NAN, NAN, NULL, NULL};
        for (int k = 0; k < r->point_count; k++) {
            const double value = r->points[k].values[q];
            if (!isnan(value) && (range->least_at == NULL || is_less(value, range->least))) {
                range->least = value;
                range->least_at = r->points[k].at;
            }
            if (!isnan(value) && (range->most_at == NULL || is_less(range->most, value))) {
                range->most = value;
                range->most_at = r->points[k].at;
            }
        }
    }
    return r->ranges != NULL;
}

/*
 * The worst point of one requirement; one without a state or a value is worse than any. Where the
 * work was stopped, a failure at a point that was done stands, and success is no verdict.
 */
static bool judge_everywhere(const struct conditions_result *r, int k, int probe,
                             struct arena *arena, struct requirement_result *row)
{
    const struct condition_point *worst = NULL;
    for (int p = 0; p < r->point_count; p++) {
        const struct condition_point *point = &r->points[p];
        const double margin = point->margins[k];
        if (!point->is_done) {
            continue;
        }
        if (worst == NULL || (isnan(margin) && !isnan(worst->margins[k])) ||
            is_less(margin, worst->margins[k])) {
            worst = point;
        }
        if (!point->is_solved) {
            worst = point;
            break;
        }
    }
    if (worst == NULL) {
        return true;
    }
    row->margin = worst->margins[k];
    row->computed = worst->values[probe];
    row->worst_at = worst->at;
    row->remark = !worst->is_solved ? "no operating point was found" : NULL;
    if (worst->is_solved && isnan(row->margin)) {
        row->remark = "has no value";
    }
    row->judgement = isnan(row->margin)                            ? JUDGED_UNKNOWN
                     : judge_is_met(row->requirement, row->margin) ? JUDGED_MET
                                                                   : JUDGED_NOT_MET;
    if (r->axis_count == 0 && row->remark == NULL) {
        row->remark = "the cell has no `vary` line";
    }
    if (r->done_count < r->point_count && row->judgement == JUDGED_MET) {
        row->judgement = JUDGED_NOT;
        row->remark = arena_format(arena, "met at the %d of %d conditions done before the stop",
                                   r->done_count, r->point_count);
    }
    return row->judgement != JUDGED_NOT || row->remark != NULL;
}

enum status analyse_conditions(struct circuit *circuit, const struct operating_point *home,
                               const struct analysis_options *options, struct result *result)
{
    const enum reading_scope scope = options->all_conditions ? READING_ALL : READING_EVERYWHERE;
    struct reading_list list;
    struct conditions_result *r = arena_new(result->arena, struct conditions_result);
    if (r == NULL || !reading_list_make(&list, circuit, scope, result->arena)) {
        return STATUS_MEMORY;
    }
    enum status status = make_points(r, circuit, &list, result->arena);
    if (status == STATUS_INPUT) {
        diagnostics_add(
            &circuit->cell->diagnostics, circuit->conditions[0].where, "vary fewer things",
            "the `vary` lines make more than %d combinations, the limit", CONDITION_POINT_LIMIT);
    }
    if (status != STATUS_OK) {
        return status;
    }
    struct solve_task task = {circuit, options, scope, r, home->x, home->system->n};
    const struct workers_task work = {.self = &task,
                                      .count = r->point_count,
                                      .jobs = workers_jobs(options->jobs, r->point_count),
                                      .piece = solve_point,
                                      .stopped = options->stopped,
                                      .stopped_self = options->stopped_self,
                                      .progress = options->progress,
                                      .progress_self = options->progress_self,
                                      .what = "conditions"};
    status = workers_run(&work);
    if (status != STATUS_OK && status != STATUS_STOPPED) {
        return status;
    }
    count_points_done(r);
    if (!find_ranges(r, result->arena)) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < result->requirement_count; k++) {
        if (result->requirements[k].requirement->scope == SCOPE_EVERYWHERE &&
            !judge_everywhere(r, k, list.probe_of[k], result->arena, &result->requirements[k])) {
            return STATUS_MEMORY;
        }
    }
    judge_verdict(result);
    result->conditions = r;
    return status;
}

/* --- drift and fine sweeps -------------------------------------------------------------------- */

static double box_drift(const struct conditions_result *r, const struct condition_axis *axis,
                        int probe)
{
    double least = NAN, most = NAN;
    for (int k = 0; k < axis->fine_count; k++) {
        const double value = r->points[axis->fine_first + k].values[probe];
        if (isnan(value)) {
            return NAN;
        }
        least = value >= least ? least : value;
        most = value <= most ? most : value;
    }
    return (most - least) / (fabs(r->ranges[probe].own) * fabs(axis->to - axis->from));
}

bool conditions_drift(struct result *result)
{
    struct conditions_result *r = result->conditions;
    r->drifts = arena_new_array(result->arena, struct condition_drift,
                                (size_t)r->axis_count * (size_t)r->probe_count);
    for (int a = 0; r->drifts != NULL && a < r->axis_count; a++) {
        for (int q = 0; r->axes[a].fine_count > 0 && q < r->probe_count; q++) {
            const double drift = box_drift(r, &r->axes[a], q);
            if (isfinite(drift)) {
                r->drifts[r->drift_count++] = (struct condition_drift){a, q, drift};
            }
        }
    }
    return r->drifts != NULL;
}

static bool make_sweep(const struct conditions_result *r, const struct condition_axis *axis,
                       int axis_number, struct arena *arena, struct sweep_table *table)
{
    struct sweep *sweep = arena_new(arena, struct sweep);
    struct sweep_series *series = arena_new(arena, struct sweep_series);
    const size_t shown = (size_t)r->probe_count, count = (size_t)axis->fine_count;
    double *knob = arena_new_array(arena, double, count);
    double *values = arena_new_array(arena, double, count *shown);
    struct probe *probes = arena_new_array(arena, struct probe, shown);
    if (sweep == NULL || series == NULL || knob == NULL || values == NULL || probes == NULL) {
        return false;
    }
    if (shown > 0) {
        memcpy(probes, r->probes, shown * sizeof *probes);
    }
    for (size_t k = 0; k < count; k++) {
        const struct condition_point *point = &r->points[(size_t)axis->fine_first + k];
        knob[k] = point->at[axis_number];
        for (size_t q = 0; q < shown; q++) {
            values[k * shown + q] = point->values[q];
        }
    }
    *sweep = (struct sweep){.knob = *axis->knob,
                            .from = axis->from,
                            .to = axis->to,
                            .points = axis->fine_count,
                            .shown = probes,
                            .shown_count = r->probe_count};
    *series = (struct sweep_series){
        .family_value = NAN, .count = axis->fine_count, .knob = knob, .values = values};
    *table = (struct sweep_table){sweep, series, 1};
    return true;
}

bool conditions_sweeps(struct result *result)
{
    const struct conditions_result *r = result->conditions;
    result->sweeps = arena_new_array(result->arena, struct sweep_table, r->axis_count);
    for (int a = 0; result->sweeps != NULL && a < r->axis_count; a++) {
        if (r->axes[a].fine_count == 0) {
            continue;
        }
        if (!make_sweep(r, &r->axes[a], a, result->arena, &result->sweeps[result->sweep_count])) {
            return false;
        }
        result->sweep_count++;
    }
    return result->sweeps != NULL;
}
