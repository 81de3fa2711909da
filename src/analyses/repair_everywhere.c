/*
 * repair_everywhere.c: a change judged over all conditions. A value is looked for at the few
 * conditions that are extreme, and verified at all of them; what is extreme then is taken in.
 */
#include <math.h>
#include <string.h>

#include "analyses/conditions.h"
#include "analyses/judge.h"
#include "analyses/repair_internal.h"
#include "analyses/setup.h"
#include "base/workers.h"

enum { EXTREME_LIMIT = 8 };

struct everywhere {
    struct arena *arena;
    const struct conditions_result *conditions;
    int requirement, probe;          /* probe: of the conditions */
    const double *at[EXTREME_LIMIT]; /* the extreme conditions */
    int count;
};

/* --- one condition ------------------------------------------------------------------------------
 */

struct reader {
    const struct repairer *r;
    const struct candidate *it; /* NULL: the cell as it is */
    double to;
    struct condition_point *points; /* [point_count] of the conditions */
};

/* Values and margins of the cell with the change, at one condition; NAN without a state. */
static enum status read_at(const struct reader *reader, const struct analysis_options *options,
                           const double *at, double *values, double *margins)
{
    const struct repairer *r = reader->r;
    const struct conditions_result *c = r->everywhere->conditions;
    struct arena *arena = arena_create();
    const int axes = c->axis_count + (reader->it != NULL);
    struct condition_axis *axis =
        arena == NULL ? NULL : arena_new_array(arena, struct condition_axis, axes + 1);
    double *place = axis == NULL ? NULL : arena_new_array(arena, double, axes + 1);
    struct setup setup = {0};
    enum status status = place == NULL ? STATUS_MEMORY : STATUS_OK;
    if (status == STATUS_OK) {
        memcpy(axis, c->axes, (size_t)c->axis_count * sizeof *axis);
        memcpy(place, at, (size_t)c->axis_count * sizeof *place);
        if (reader->it != NULL) {
            axis[axes - 1] = (struct condition_axis){.knob = &reader->it->knob,
                                                     .own = reader->it->parameter.value};
            place[axes - 1] = reader->to;
        }
        status = setup_open(&setup, r->circuit, axis, axes, place, READING_EVERYWHERE, options);
    }
    if (status == STATUS_OK) {
        status = setup_solve(&setup, r->home->x, r->home->system->n, NULL);
    }
    if (status == STATUS_OK) {
        status = reading_take(&setup.point, &setup.list, values, margins);
    }
    setup_close(&setup);
    arena_destroy(arena);
    return status;
}

static void clear(const struct repairer *r, double *values, double *margins)
{
    for (int k = 0; k < r->everywhere->conditions->probe_count; k++) {
        values[k] = NAN;
    }
    for (int k = 0; k < r->circuit->requirement_count; k++) {
        margins[k] = NAN;
    }
}

/* At the extreme conditions: least and greatest value, and the least margin. False: a condition has
 * no value. */
static bool read_extremes(struct repairer *r, const struct candidate *it, double to, double *least,
                          double *most, double *margin)
{
    const struct everywhere *e = r->everywhere;
    const struct reader reader = {.r = r, .it = it, .to = to};
    struct arena *arena = arena_create();
    double *values =
        arena == NULL ? NULL : arena_new_array(arena, double, e->conditions->probe_count + 1);
    double *margins =
        values == NULL ? NULL : arena_new_array(arena, double, r->circuit->requirement_count);
    bool good = margins != NULL;
    r->status = good ? r->status : STATUS_MEMORY;
    *least = *margin = INFINITY;
    *most = -INFINITY;
    struct analysis_options options = *r->options;
    options.progress = NULL;
    for (int k = 0; good && k < e->count; k++) {
        clear(r, values, margins);
        const enum status status = read_at(&reader, &options, e->at[k], values, margins);
        if (status == STATUS_MEMORY || status == STATUS_STOPPED) {
            r->status = status;
        }
        good = status == STATUS_OK && isfinite(values[e->probe]);
        *least = fmin(*least, values[e->probe]);
        *most = fmax(*most, values[e->probe]);
        *margin = fmin(*margin, margins[e->requirement]);
    }
    arena_destroy(arena);
    return good;
}

/* --- the door -----------------------------------------------------------------------------------
 */

static void take_in(struct everywhere *e, const double *at)
{
    for (int k = 0; k < e->count; k++) {
        if (e->at[k] == at) {
            return;
        }
    }
    if (at != NULL && e->count < EXTREME_LIMIT) {
        e->at[e->count++] = at;
    }
}

enum status everywhere_open(struct repairer *r, int requirement, struct arena *arena)
{
    const struct requirement_result *row = &r->result->requirements[requirement];
    const struct conditions_result *c = r->result->conditions;
    struct everywhere *e = arena_new(arena, struct everywhere);
    struct reading_list list;
    if (e == NULL || !reading_list_make(&list, r->circuit, READING_EVERYWHERE, arena)) {
        return STATUS_MEMORY;
    }
    *e = (struct everywhere){.arena = arena,
                             .conditions = c,
                             .requirement = requirement,
                             .probe = list.probe_of[requirement]};
    const enum relation relation = row->requirement->relation;
    if (relation != RELATION_ABOVE) {
        take_in(e, c->ranges[e->probe].most_at);
    }
    if (relation != RELATION_BELOW) {
        take_in(e, c->ranges[e->probe].least_at);
    }
    take_in(e, row->worst_at);
    r->everywhere = e;
    return e->count > 0 ? STATUS_OK : STATUS_UNSOLVED;
}

double everywhere_distance(struct repairer *r, const struct candidate *it, double to)
{
    double least, most, margin;
    const struct requirement *q = r->requirement;
    if (!read_extremes(r, it, to, &least, &most, &margin)) {
        return NAN;
    }
    const double value = q->relation == RELATION_BELOW   ? most
                         : q->relation == RELATION_ABOVE ? least
                                                         : (least + most) / 2;
    return value - repair_aim(q, value);
}

bool everywhere_may_hold(struct repairer *r, const struct candidate *it, double to)
{
    double least, most, margin;
    return read_extremes(r, it, to, &least, &most, &margin) && judge_is_met(r->requirement, margin);
}

/* --- all conditions -----------------------------------------------------------------------------
 */

static enum status read_point(void *self, struct worker *worker, int index)
{
    const struct reader *reader = self;
    struct analysis_options options = *reader->r->options;
    options.stopped = worker_stopped;
    options.stopped_self = worker;
    options.progress = NULL;
    struct condition_point *point = &reader->points[index];
    const enum status status = read_at(reader, &options, point->at, point->values, point->margins);
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}

static bool make_points(const struct repairer *r, struct arena *arena, struct reader *reader)
{
    const struct conditions_result *c = r->everywhere->conditions;
    const size_t count = (size_t)c->point_count;
    const size_t probes = (size_t)c->probe_count, rows = (size_t)r->circuit->requirement_count;
    reader->points = arena_new_array(arena, struct condition_point, count);
    double *values = arena_new_array(arena, double, count *probes);
    double *margins = arena_new_array(arena, double, count *rows);
    if (reader->points == NULL || values == NULL || margins == NULL) {
        return false;
    }
    for (size_t k = 0; k < count; k++) {
        reader->points[k] = (struct condition_point){
            .at = c->points[k].at, .values = values + k * probes, .margins = margins + k * rows};
        clear(r, reader->points[k].values, reader->points[k].margins);
    }
    return true;
}

/* Whether requirement k holds at all points. */
static bool holds_at_all(const struct repairer *r, const struct reader *reader, int k)
{
    for (int p = 0; p < r->everywhere->conditions->point_count; p++) {
        if (!judge_is_met(&r->circuit->requirements[k], reader->points[p].margins[k])) {
            return false;
        }
    }
    return true;
}

/* The worst point, and for a band the extremes on both sides. */
static void take_in_extremes(struct repairer *r, const struct reader *reader)
{
    struct everywhere *e = r->everywhere;
    const struct condition_point *worst = NULL, *least = NULL, *most = NULL;
    for (int p = 0; p < e->conditions->point_count; p++) {
        const struct condition_point *point = &reader->points[p];
        const double value = point->values[e->probe];
        if (isnan(value)) {
            continue;
        }
        worst = worst == NULL || point->margins[e->requirement] < worst->margins[e->requirement]
                    ? point
                    : worst;
        least = least == NULL || value < least->values[e->probe] ? point : least;
        most = most == NULL || value > most->values[e->probe] ? point : most;
    }
    if (worst == NULL) {
        return;
    }
    take_in(e, worst->at);
    if (r->requirement->relation == RELATION_WITHIN) {
        take_in(e, least->at);
        take_in(e, most->at);
    }
}

bool everywhere_is_met(struct repairer *r, const struct candidate *it, double to,
                       const char **breaks)
{
    struct arena *arena = arena_create();
    struct reader reader = {.r = r, .it = it, .to = to};
    const int count = r->everywhere->conditions->point_count;
    *breaks = NULL;
    if (arena == NULL || !make_points(r, arena, &reader)) {
        arena_destroy(arena);
        r->status = STATUS_MEMORY;
        return false;
    }
    const struct workers_task work = {.self = &reader,
                                      .count = count,
                                      .jobs = workers_jobs(r->options->jobs, count),
                                      .piece = read_point,
                                      .stopped = r->options->stopped,
                                      .stopped_self = r->options->stopped_self,
                                      .what = "conditions"};
    r->status = workers_run(&work);
    bool met = false;
    if (r->status == STATUS_OK) {
        met = holds_at_all(r, &reader, r->everywhere->requirement);
        for (int k = 0; k < r->circuit->requirement_count && met && *breaks == NULL; k++) {
            const struct requirement_result *row = &r->result->requirements[k];
            if (row->requirement->scope == SCOPE_EVERYWHERE && row->judgement == JUDGED_MET &&
                !holds_at_all(r, &reader, k)) {
                *breaks = row->requirement->text;
            }
        }
        if (!met) {
            take_in_extremes(r, &reader);
        }
    }
    arena_destroy(arena);
    return met;
}
