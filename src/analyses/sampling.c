/*
 * sampling.c: samples in blocks over threads.
 *
 * A block goes to an engine, which keeps its system from block to block. Samples are solved side by
 * side where the processor can (lanes.h); what fails there, and all of them elsewhere, one after
 * the other.
 */
#include "analyses/sampling.h"

#include <math.h>
#include <string.h>

#include "analyses/judge.h"
#include "analyses/lanes.h"
#include "analyses/setup.h"
#include "base/workers.h"
#include "numerics/linear.h"
#include "numerics/random.h"

enum { BLOCK = 32, TOOL_MEMORY_LIMIT = 64 << 20 };

/* What one thread works with. */
struct engine {
    struct setup setup;
    struct analysis_options options; /* stopped by the worker */
    double *deviates;                /* [mismatch->count] */
    double *margins;                 /* [requirement_count] */
    double *home_values;             /* [nonzeros] Jacobian at the own point */
    const struct lanes_kind *kind;   /* NULL: one sample at a time */
    struct lanes_engine *lanes;
    int full; /* factorisations when the pivots were chosen at the own point */
    bool is_open;
};

struct run {
    const struct sampling_plan *plan;
    struct sample_rows *rows;
    struct engine *engines; /* [jobs] */
};

/*
 * The pivots of the last factorisation are kept for the next. So that a sample does not feel which
 * sample came before it on the same thread, each starts with the pivots of the own point.
 */
static enum status restore_pivots(struct engine *e)
{
    struct linear_solver *solver = e->setup.system->solver;
    int full, again;
    linear_counts(solver, &full, &again);
    if (full == e->full) {
        return STATUS_OK;
    }
    linear_forget(solver);
    const enum linear_status status = linear_factor(solver, e->home_values);
    linear_counts(solver, &e->full, &again);
    return status == LINEAR_MEMORY ? STATUS_MEMORY : STATUS_OK;
}

static enum status open_lanes(struct engine *e, const struct sampling_plan *plan)
{
    e->lanes = NULL;
    e->kind = e->options.lanes == 1 ? NULL : lanes_find(e->options.lanes);
    if (e->kind == NULL) {
        return STATUS_OK;
    }
    const enum status status = restore_pivots(e);
    if (status == STATUS_OK) {
        e->lanes = e->kind->begin(e->setup.system, plan->mismatch, plan->home, e->home_values,
                                  e->setup.arena);
    }
    return arena_failed(e->setup.arena) ? STATUS_MEMORY : status;
}

static enum status open_engine(struct engine *e, const struct sampling_plan *plan)
{
    enum status status =
        setup_open(&e->setup, plan->circuit, NULL, 0, NULL, READING_ALL, &e->options);
    e->is_open = true;
    if (status != STATUS_OK) {
        return status;
    }
    struct system *s = e->setup.system;
    struct arena *arena = e->setup.arena;
    const size_t n = (size_t)s->n;
    e->deviates = arena_new_array(arena, double, plan->mismatch->count);
    e->margins = arena_new_array(arena, double, plan->circuit->requirement_count);
    e->home_values = arena_new_array(arena, double, s->nonzeros);
    double *f = arena_new_array(arena, double, 2 * n);
    if (e->deviates == NULL || e->margins == NULL || e->home_values == NULL || f == NULL) {
        return STATUS_MEMORY;
    }
    (void)s->face.evaluate(s, plan->home, f, f + n, e->home_values);
    e->full = -1;
    return open_lanes(e, plan);
}

/*
 * Newton's last step is below 1e-9 and not taken, which leaves an error of that size; taking it
 * leaves its square, so that a sample is the same to rounding in whatever way it was solved. Not
 * after a search that ended otherwise (a polish).
 */
static void take_last_step(struct operating_point *p)
{
    const struct system *s = p->system;
    const struct newton_options options = newton_default_options();
    const double *dx = newton_last_step(&s->face, s->work);
    bool is_tiny = p->report.residual <= options.tolerance;
    for (int k = 0; k < s->n && is_tiny; k++) {
        const double w = s->weight[k];
        is_tiny = fabs(w * dx[k]) <= options.step_tolerance * (1 + fabs(w * p->x[k]));
    }
    for (int k = 0; k < s->n && is_tiny; k++) {
        p->x[k] += dx[k];
    }
}

/* Newton from the own point; where it does not get there, the search from cold. */
static enum status find_state(struct engine *e, const struct sampling_plan *plan,
                              enum sample_state *state)
{
    struct operating_point *p = &e->setup.point;
    memcpy(p->x, plan->home, (size_t)e->setup.system->n * sizeof *p->x);
    *state = SAMPLE_SOLVED;
    enum newton_status newton = operating_point_newton(p);
    enum status status = newton == NEWTON_CONVERGED ? STATUS_OK
                         : newton == NEWTON_STOPPED ? STATUS_STOPPED
                         : newton == NEWTON_MEMORY  ? STATUS_MEMORY
                                                    : STATUS_UNSOLVED;
    if (status == STATUS_OK) {
        take_last_step(p);
    }
    if (status == STATUS_OK && e->setup.list.needs_outputs) {
        status = operating_point_polish(p);
    }
    if (status == STATUS_UNSOLVED) {
        *state = SAMPLE_SEARCHED;
        status = operating_point_find(p);
    }
    return status;
}

/* Reads the state in the system's point into row k. */
static enum status take_row(struct engine *e, const struct run *run, int k, enum sample_state state)
{
    const struct reading_list *list = &e->setup.list;
    const struct circuit *c = run->plan->circuit;
    double *values = run->rows->values + (size_t)k * (size_t)list->probe_count;
    unsigned char *met = run->rows->met + (size_t)k * (size_t)c->requirement_count;
    const enum status status = reading_take(&e->setup.point, list, values, e->margins);
    if (status != STATUS_OK) {
        return status;
    }
    for (int q = 0; q < c->requirement_count; q++) {
        met[q] = judge_is_met(&c->requirements[q], e->margins[q]);
    }
    run->rows->states[k] = (unsigned char)state;
    return STATUS_OK;
}

static void fail_row(const struct engine *e, const struct run *run, int k)
{
    const int count = e->setup.list.probe_count;
    for (int q = 0; q < count; q++) {
        run->rows->values[(size_t)k * (size_t)count + (size_t)q] = NAN;
    }
    run->rows->states[k] = SAMPLE_FAILED;
}

static void prepare_sample(struct engine *e, const struct run *run, int k)
{
    const struct sampling_plan *plan = run->plan;
    random_normals(plan->options->seed, (uint64_t)(plan->first + k), plan->mismatch->count,
                   e->deviates);
    mismatch_apply(e->setup.system, plan->mismatch, e->deviates);
}

static enum status solve_sample(struct engine *e, const struct run *run, int k)
{
    enum sample_state state;
    enum status status = restore_pivots(e);
    if (status != STATUS_OK) {
        return status;
    }
    prepare_sample(e, run, k);
    status = find_state(e, run->plan, &state);
    if (status == STATUS_OK) {
        status = take_row(e, run, k, state);
    }
    if (status == STATUS_UNSOLVED) {
        fail_row(e, run, k);
        status = STATUS_OK;
    }
    return status;
}

static enum status scalar_block(struct engine *e, const struct run *run, struct worker *worker,
                                int first, int count)
{
    for (int k = first; k < first + count; k++) {
        if (worker_stopped(worker)) {
            return STATUS_STOPPED;
        }
        const enum status status = solve_sample(e, run, k);
        if (status != STATUS_OK) {
            return status;
        }
    }
    return STATUS_OK;
}

/* A sample that was solved in a lane. An output's own analysis moves its system about: it gets all
 * values, polished; for the rest the prepared blocks do. */
static enum status take_lane(struct engine *e, const struct run *run, int k, int lane)
{
    struct operating_point *p = &e->setup.point;
    e->kind->read(e->lanes, lane, p->x);
    if (!e->setup.list.needs_outputs) {
        e->kind->stand_in(e->lanes, lane);
        return take_row(e, run, k, SAMPLE_SOLVED);
    }
    enum status status = restore_pivots(e);
    if (status == STATUS_OK) {
        prepare_sample(e, run, k);
        status = operating_point_polish(p);
    }
    if (status == STATUS_OK) {
        status = take_row(e, run, k, SAMPLE_SOLVED);
    }
    return status == STATUS_UNSOLVED ? solve_sample(e, run, k) : status;
}

static enum status lanes_block(struct engine *e, const struct run *run, struct worker *worker,
                               int first, int count)
{
    const struct sampling_plan *plan = run->plan;
    for (int k = first; k < first + count; k += e->kind->width) {
        if (worker_stopped(worker)) {
            return STATUS_STOPPED;
        }
        const unsigned solved =
            e->kind->solve(e->lanes, plan->options->seed, (uint64_t)(plan->first + k));
        for (int lane = 0; lane < e->kind->width && k + lane < first + count; lane++) {
            const enum status status = (solved >> lane & 1) != 0 ? take_lane(e, run, k + lane, lane)
                                                                 : solve_sample(e, run, k + lane);
            if (status != STATUS_OK) {
                return status;
            }
        }
    }
    return STATUS_OK;
}

static enum status one_block(void *self, struct worker *worker, int index)
{
    const struct run *run = self;
    const struct sampling_plan *plan = run->plan;
    struct engine *e = &run->engines[worker->number];
    /* searches that fail leave their words in the system's memory */
    if (e->is_open && arena_used(e->setup.system->arena) > TOOL_MEMORY_LIMIT) {
        setup_close(&e->setup);
        e->is_open = false;
    }
    if (!e->is_open) {
        e->options = *plan->options;
        e->options.stopped = worker_stopped;
        e->options.stopped_self = worker;
        e->options.progress = NULL;
        const enum status status = open_engine(e, plan);
        if (status != STATUS_OK) {
            return status;
        }
    }
    const int first = index * BLOCK;
    const int left = plan->count - first;
    const int count = left < BLOCK ? left : BLOCK;
    return e->lanes != NULL ? lanes_block(e, run, worker, first, count)
                            : scalar_block(e, run, worker, first, count);
}

enum status sampling_run(const struct sampling_plan *plan, struct sample_rows *rows)
{
    const struct analysis_options *options = plan->options;
    const int blocks = (plan->count + BLOCK - 1) / BLOCK;
    const int jobs = workers_jobs(options->jobs, blocks);
    struct arena *scratch = arena_create();
    struct run run = {.plan = plan, .rows = rows};
    run.engines = scratch == NULL ? NULL : arena_new_array(scratch, struct engine, jobs);
    if (run.engines == NULL) {
        arena_destroy(scratch);
        return STATUS_MEMORY;
    }
    const struct workers_task task = {.self = &run,
                                      .count = blocks,
                                      .jobs = jobs,
                                      .piece = one_block,
                                      .stopped = options->stopped,
                                      .stopped_self = options->stopped_self,
                                      .progress = options->progress,
                                      .progress_self = options->progress_self,
                                      .what = "mismatch samples"};
    const enum status status = workers_run(&task);
    for (int k = 0; k < jobs; k++) {
        if (run.engines[k].is_open) {
            setup_close(&run.engines[k].setup);
        }
    }
    arena_destroy(scratch);
    return status;
}
