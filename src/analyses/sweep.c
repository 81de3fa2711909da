/*
 * sweep.c: quantities over a range of anything that can be turned.
 *
 * A rail, source, resistor, output or device value is turned in place and the state followed. A let
 * or the temperature changes many values at once: the circuit is built anew for each point, and the
 * search starts from the last state.
 */
#include "analyses/sweep.h"

#include <math.h>
#include <string.h>

#include "analyses/judge.h"
#include "base/workers.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "solve/variant.h"

enum { EVENT_LIMIT = 20 };

/* The circuit and system in force, which may be this sweep's own. */
struct stage {
    struct circuit *circuit, *own_circuit;
    struct system *system;
    struct operating_point point;
    unsigned effects;
    const struct analysis_options *options;
    bool is_solved;
    struct knob knob;          /* what is turned, in the circuit in force */
    const struct probe *shown; /* the same for what is shown */
};

static void stage_close(struct stage *stage)
{
    system_free(stage->system);
    circuit_free(stage->own_circuit);
    *stage = (struct stage){.options = stage->options, .effects = stage->effects};
}

/* A circuit that was built anew may count its parts otherwise: names are looked up in it. */
static bool find_again(struct stage *stage, const struct sweep *sweep)
{
    const struct circuit *c = stage->circuit;
    struct diagnostics unseen = {.arena = c->arena};
    stage->knob = sweep->knob;
    stage->shown = sweep->shown;
    if (stage->own_circuit == NULL) {
        return true;
    }
    struct probe *shown = arena_new_array(c->arena, struct probe, sweep->shown_count);
    stage->shown = shown;
    bool good =
        shown != NULL && circuit_knob(c, sweep->knob.name, SPAN_NONE, &unseen, &stage->knob);
    for (int k = 0; good && k < sweep->shown_count; k++) {
        good = circuit_probe(c, sweep->shown[k].text, SPAN_NONE, &unseen, &shown[k]);
    }
    return good;
}

/* Builds circuit and system with all settings in force. */
static enum status stage_open(struct stage *stage, struct circuit *base, const struct sweep *sweep,
                              const struct setting *settings, int count)
{
    enum status status = variant_build(base, settings, count, &stage->own_circuit);
    if (status != STATUS_OK) {
        return status;
    }
    stage->circuit = stage->own_circuit != NULL ? stage->own_circuit : base;
    stage->system = system_create(stage->circuit, stage->circuit->kelvin, stage->effects);
    if (stage->system == NULL ||
        !operating_point_create(&stage->point, stage->system, stage->options->stopped,
                                stage->options->stopped_self)) {
        return STATUS_MEMORY;
    }
    status = variant_turn(stage->system, base, settings, count);
    return status == STATUS_OK && !find_again(stage, sweep) ? STATUS_UNSOLVED : status;
}

/* --- one point -------------------------------------------------------------------------------- */

static bool wants_output(const struct probe *probe)
{
    return probe->kind == PROBE_OUTPUT && probe->quantity != OUTPUT_CURRENT;
}

static enum status read_outputs(struct stage *stage, const struct sweep *sweep, struct result *into)
{
    const struct circuit *c = stage->circuit;
    into->outputs = arena_new_array(into->arena, struct output_result, c->output_count);
    if (into->outputs == NULL) {
        return STATUS_MEMORY;
    }
    into->output_count = c->output_count;
    for (int k = 0; k < c->output_count; k++) {
        bool wanted = false;
        for (int q = 0; q < sweep->shown_count; q++) {
            wanted |= wants_output(&stage->shown[q]) && stage->shown[q].index == k;
        }
        const enum status status =
            !wanted ? STATUS_OK : analyse_output(&stage->point, k, into->arena, &into->outputs[k]);
        if (status != STATUS_OK) {
            return status;
        }
    }
    return STATUS_OK;
}

static enum status read_point(struct stage *stage, const struct sweep *sweep, double *row)
{
    bool outputs = false;
    for (int q = 0; q < sweep->shown_count; q++) {
        outputs |= wants_output(&stage->shown[q]);
    }
    enum status status = operating_point_polish(&stage->point);
    if (status != STATUS_OK) {
        return status;
    }
    for (int q = 0; q < sweep->shown_count; q++) {
        row[q] = measure_probe(stage->system, &stage->shown[q], stage->point.x);
    }
    if (!outputs) {
        return STATUS_OK;
    }
    struct result scratch = {.arena = arena_create(), .circuit = stage->circuit};
    if (scratch.arena == NULL) {
        return STATUS_MEMORY;
    }
    status = read_outputs(stage, sweep, &scratch);
    for (int q = 0; status == STATUS_OK && q < sweep->shown_count; q++) {
        if (wants_output(&stage->shown[q])) {
            row[q] = result_value(&scratch, &stage->shown[q]);
        }
    }
    arena_destroy(scratch.arena);
    return status;
}

/* --- one series ------------------------------------------------------------------------------- */

struct series_task {
    struct circuit *circuit;
    const struct sweep *sweep;
    const struct analysis_options *options;
    struct arena *arena;
    struct sweep_series *series;
    double *knob, *values;
    unsigned effects;
};

static void add_event(struct series_task *t, double at, const char *text)
{
    struct sweep_series *series = t->series;
    if (series->event_count >= EVENT_LIMIT) {
        return;
    }
    series->events[series->event_count++] = (struct sweep_event){at, text};
}

/* A node that moves further in one step, V, is looked at in smaller steps: it may have jumped. */
static const double longest_move = 0.25;
enum { HALVING_LIMIT = 16 };

static bool is_near(const struct system *system, const double *x, const double *last)
{
    for (int k = 0; k < system->node_count; k++) {
        if (!(fabs(x[k] - last[k]) <= longest_move)) {
            return false;
        }
    }
    return true;
}

/* Builds the circuit anew at `to`, and goes on from `last` [n] where it has as many unknowns.
 * *follows: the state is near the last one. */
static enum status build_at(struct series_task *t, struct stage *stage, double to,
                            const double *last, int n, bool *follows)
{
    const struct sweep *sweep = t->sweep;
    const struct setting settings[2] = {{&sweep->knob, to},
                                        {&sweep->family, t->series->family_value}};
    *follows = false;
    stage_close(stage);
    enum status status = stage_open(stage, t->circuit, sweep, settings, sweep->has_family ? 2 : 1);
    if (status != STATUS_OK || n != stage->system->n) {
        *follows = true; /* another structure: there is nothing to compare with */
        return status != STATUS_OK ? status : operating_point_find(&stage->point);
    }
    memcpy(stage->point.x, last, (size_t)n * sizeof *last);
    status = operating_point_status(operating_point_newton(&stage->point));
    if (status == STATUS_OK) {
        *follows = is_near(stage->system, stage->point.x, last);
    }
    return status == STATUS_UNSOLVED ? operating_point_find(&stage->point) : status;
}

/*
 * A let or the temperature goes from `from` (NAN: there is no state yet) to `to`. A state that ends
 * up far from the last one is approached in halved steps, so that a jump is told, and where.
 */
static enum status build_and_follow(struct series_task *t, struct stage *stage, double from,
                                    double to, int depth)
{
    struct arena *scratch = arena_create();
    const int n = stage->system == NULL || isnan(from) ? 0 : stage->system->n;
    double *last = scratch == NULL ? NULL : arena_new_array(scratch, double, n);
    if (last == NULL) {
        arena_destroy(scratch);
        return STATUS_MEMORY;
    }
    if (n > 0) {
        memcpy(last, stage->point.x, (size_t)n * sizeof *last);
    }
    bool follows = false;
    enum status status = build_at(t, stage, to, last, n, &follows);
    if (status == STATUS_OK && !follows && n > 0 && depth < HALVING_LIMIT) {
        const double middle = (from + to) / 2;
        status = build_at(t, stage, from, last, n, &follows); /* back, to go in smaller steps */
        if (status == STATUS_OK) {
            status = build_and_follow(t, stage, from, middle, depth + 1);
        }
        if (status == STATUS_OK) {
            status = build_and_follow(t, stage, middle, to, depth + 1);
        }
        if (status == STATUS_UNSOLVED &&
            depth == 0) { /* none on the way: is there one at the end? */
            status = build_at(t, stage, to, last, n, &follows);
            if (status == STATUS_OK) {
                add_event(t, from, "no state was found on the way to the next value");
            }
        }
    } else if (status == STATUS_OK && !follows && n > 0) {
        add_event(t, from, "the state cannot be followed from here: it jumps");
    }
    arena_destroy(scratch);
    return status;
}

/* Moves the stage to the next value and solves there, from the state at the last value where there
 * is one. */
static enum status advance(struct series_task *t, struct stage *stage, int k)
{
    const struct sweep *sweep = t->sweep;
    const double v = t->knob[k];
    bool jumped = false;
    if (sweep->knob.kind == KNOB_VALUE && stage->system != NULL) {
        if (!stage->is_solved) {
            system_set(stage->system, stage->knob.instance, stage->knob.parameter, v);
            return operating_point_find(&stage->point);
        }
        const enum status status = operating_point_move(
            &stage->point, stage->knob.instance, stage->knob.parameter, t->knob[k - 1], v, &jumped);
        if (status == STATUS_OK && jumped) {
            add_event(t, stage->point.lost_at, operating_point_lost_text(&stage->point));
        }
        return status;
    }
    const double from = k > 0 && stage->is_solved ? t->knob[k - 1] : NAN;
    return build_and_follow(t, stage, from, v, 0);
}

/* Whether a name or a text of the stage is missing: arenas remember. */
static bool stage_lost_memory(const struct stage *stage)
{
    return (stage->own_circuit != NULL && arena_failed(stage->own_circuit->arena)) ||
           (stage->system != NULL && arena_failed(stage->system->arena));
}

static enum status run_series(struct series_task *t)
{
    const struct sweep *sweep = t->sweep;
    struct stage stage = {.options = t->options, .effects = t->effects};
    enum status status = STATUS_OK;
    int solved = 0;
    for (int k = 0; k < t->series->count; k++) {
        double *row = t->values + (size_t)k * (size_t)sweep->shown_count;
        if (t->options->stopped != NULL && t->options->stopped(t->options->stopped_self)) {
            status = STATUS_STOPPED;
            t->series->count = k;
            break;
        }
        for (int q = 0; q < sweep->shown_count; q++) {
            row[q] = NAN;
        }
        status = advance(t, &stage, k);
        if (status == STATUS_OK) {
            status = read_point(&stage, sweep, row);
        }
        if (stage_lost_memory(&stage)) {
            status = STATUS_MEMORY;
        }
        stage.is_solved = status == STATUS_OK;
        if (status == STATUS_UNSOLVED) {
            t->series->lost++;
            add_event(t, t->knob[k], "no state was found here");
            status = STATUS_OK;
        } else if (status == STATUS_OK) {
            solved++;
        }
        if (status != STATUS_OK) {
            t->series->count = k;
            break;
        }
    }
    stage_close(&stage);
    return status == STATUS_OK && solved == 0 ? STATUS_UNSOLVED : status;
}

/* --- many series, over threads ---------------------------------------------------------------- */

/* Room for a series, events included: threads then take nothing from the arena. */
static bool make_series(struct series_task *t, int points, double family_value)
{
    const struct sweep *sweep = t->sweep;
    t->knob = arena_new_array(t->arena, double, points);
    t->values = arena_new_array(t->arena, double, (size_t)points *(size_t)sweep->shown_count);
    struct sweep_event *events = arena_new_array(t->arena, struct sweep_event, EVENT_LIMIT);
    if (t->knob == NULL || t->values == NULL || events == NULL) {
        return false;
    }
    for (int k = 0; k < points; k++) {
        t->knob[k] = k == points - 1 ? sweep->to
                                     : sweep->from + (sweep->to - sweep->from) * k / (points - 1);
    }
    *t->series = (struct sweep_series){.family_value = family_value,
                                       .count = points,
                                       .knob = t->knob,
                                       .values = t->values,
                                       .events = events};
    return true;
}

/* All series of all sweeps, and how each ended. */
struct sweep_job {
    struct series_task *tasks;
    enum status *ended; /* STATUS_STOPPED until it was done */
    bool *begun;
};

static enum status do_series(void *self, struct worker *worker, int index)
{
    struct sweep_job *job = self;
    struct series_task task = job->tasks[index];
    struct analysis_options options = *task.options;
    options.stopped = worker_stopped;
    options.stopped_self = worker;
    task.options = &options;
    job->begun[index] = true;
    job->ended[index] = run_series(&task);
    return job->ended[index] == STATUS_MEMORY ? STATUS_MEMORY : STATUS_OK;
}

static int series_of(const struct sweep *sweep)
{
    return sweep->has_family ? sweep->family_count : 1;
}

/* Lays out tables and tasks. False when memory is short. */
static bool make_tasks(struct circuit *circuit, const struct sweep *sweeps, int count,
                       const struct analysis_options *options, struct arena *arena,
                       struct sweep_table *tables, struct series_task *tasks)
{
    for (int k = 0; k < count; k++) {
        const struct sweep *sweep = &sweeps[k];
        const int points = sweep->points > 0 ? sweep->points : CIRCUIT_POINT_STANDARD;
        tables[k] = (struct sweep_table){.sweep = sweep};
        tables[k].series = arena_new_array(arena, struct sweep_series, series_of(sweep));
        for (int f = 0; f < series_of(sweep); f++, tasks++) {
            *tasks = (struct series_task){.circuit = circuit,
                                          .sweep = sweep,
                                          .options = options,
                                          .arena = arena,
                                          .series = &tables[k].series[f],
                                          .effects = options->view == VIEW_HAND ? EFFECTS_HAND
                                                                                : EFFECTS_FULL};
            if (tables[k].series == NULL ||
                !make_series(tasks, points, sweep->has_family ? sweep->family_values[f] : NAN)) {
                return false;
            }
        }
    }
    return true;
}

/* What the tables hold, in their order: up to the first that was not begun, and to the end of the
 * first sweep that went wrong. */
static enum status collect(const struct sweep_job *job, struct sweep_table *tables, int count,
                           int *done)
{
    enum status worst = STATUS_OK;
    int at = 0;
    for (*done = 0; *done < count && worst == STATUS_OK; ++*done) {
        struct sweep_table *table = &tables[*done];
        for (int f = 0; f < series_of(table->sweep); f++, at++) {
            worst = job->ended[at] == STATUS_OK ? worst : job->ended[at];
            table->series_count += job->begun[at] && table->series_count == f;
        }
    }
    return worst;
}

enum status analyse_sweeps(struct circuit *circuit, const struct sweep *sweeps, int count,
                           const struct analysis_options *options, struct arena *arena,
                           struct sweep_table *tables, int *done)
{
    int total = 0;
    for (int k = 0; k < count; k++) {
        total += series_of(&sweeps[k]);
    }
    struct sweep_job job = {arena_new_array(arena, struct series_task, total),
                            arena_new_array(arena, enum status, total),
                            arena_new_array(arena, bool, total)};
    *done = 0;
    if (job.tasks == NULL || job.ended == NULL || job.begun == NULL ||
        !make_tasks(circuit, sweeps, count, options, arena, tables, job.tasks)) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < total; k++) {
        job.ended[k] = STATUS_STOPPED;
    }
    const struct workers_task work = {.self = &job,
                                      .count = total,
                                      .jobs = workers_jobs(options->jobs, total),
                                      .piece = do_series,
                                      .stopped = options->stopped,
                                      .stopped_self = options->stopped_self,
                                      .progress = options->progress,
                                      .progress_self = options->progress_self,
                                      .what = "sweeps"};
    const enum status status = workers_run(&work);
    return status == STATUS_MEMORY ? STATUS_MEMORY : collect(&job, tables, count, done);
}

/* The load voltage of one output and its current. */
static bool load_sweep(const struct circuit *circuit, const struct output *output,
                       struct arena *arena, struct sweep *sweep)
{
    struct diagnostics unseen = {.arena = arena};
    const char *current = arena_format(arena, "%s.current", output->name);
    *sweep = (struct sweep){.from = output->from,
                            .to = output->to,
                            .shown = arena_new(arena, struct probe),
                            .shown_count = 1,
                            .where = output->where};
    return current != NULL && sweep->shown != NULL &&
           circuit_knob(circuit, output->name, output->where, &unseen, &sweep->knob) &&
           circuit_probe(circuit, current, output->where, &unseen, sweep->shown);
}

struct sweep *sweep_loads(const struct circuit *circuit, struct arena *arena)
{
    struct sweep *sweeps = arena_new_array(arena, struct sweep, circuit->output_count);
    for (int k = 0; sweeps != NULL && k < circuit->output_count; k++) {
        if (!load_sweep(circuit, &circuit->outputs[k], arena, &sweeps[k])) {
            return NULL;
        }
    }
    return sweeps;
}
