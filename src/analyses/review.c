/*
 * review.c: the commands: point, review, sweep.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/analysis.h"
#include "analyses/conditions.h"
#include "analyses/judge.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "analyses/remarks.h"
#include "analyses/states.h"
#include "analyses/remedies.h"
#include "analyses/result_create.h"
#include "analyses/sweep.h"

static unsigned effects_of(enum view view)
{
    return view == VIEW_HAND ? EFFECTS_HAND : EFFECTS_FULL;
}

struct session {
    struct system *system;
    struct operating_point point;
};

static void close_session(struct session *session)
{
    system_free(session->system);
}

/* Whether a text is missing: arenas remember. */
static bool lost_memory(const struct session *session, const struct result *result)
{
    return arena_failed(result->arena) || arena_failed(result->circuit->arena) ||
           (session->system != NULL && arena_failed(session->system->arena));
}

/* The operating point, measured into the result. */
static enum status solve_point(struct circuit *circuit, const struct analysis_options *options,
                               struct session *session, struct result *result)
{
    session->system = system_create(circuit, circuit->kelvin, effects_of(options->view));
    if (session->system == NULL ||
        !operating_point_create(&session->point, session->system, options->stopped,
                                options->stopped_self)) {
        return STATUS_MEMORY;
    }
    const enum status status = operating_point_find(&session->point);
    result_keep_solver(result, &session->point.solver);
    if (status == STATUS_OK && !measure_point(&session->point, result->arena, &result->point)) {
        return STATUS_MEMORY;
    }
    return status;
}

static enum status solve_outputs(const struct circuit *circuit,
                                 const struct analysis_options *options, struct session *session,
                                 struct result *result)
{
    result->outputs = arena_new_array(result->arena, struct output_result, circuit->output_count);
    if (result->outputs == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < circuit->output_count; k++) {
        if (options->progress != NULL) {
            options->progress(options->progress_self, circuit->outputs[k].name,
                              (double)k / circuit->output_count);
        }
        /* The sweep of an output leaves the point where it found it, but not the factors. */
        enum status status = k == 0 ? STATUS_OK : operating_point_polish(&session->point);
        if (status == STATUS_OK) {
            status = analyse_output(&session->point, k, result->arena, &result->outputs[k]);
        }
        if (status != STATUS_OK) {
            return status == STATUS_UNSOLVED ? STATUS_OK : status;
        }
        result->output_count++;
    }
    return STATUS_OK;
}

static enum status finish(enum status status, struct session *session, struct result **result)
{
    const bool lost = lost_memory(session, *result);
    close_session(session);
    if (status == STATUS_MEMORY || lost) {
        result_free(*result);
        *result = NULL;
        return STATUS_MEMORY;
    }
    (*result)->is_stopped = status == STATUS_STOPPED;
    return status;
}

enum status analysis_point(struct circuit *circuit, const struct analysis_options *options,
                           struct result **result)
{
    struct session session = {0};
    *result = result_create(circuit, options->view, "point");
    if (*result == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = solve_point(circuit, options, &session, *result);
    if (status == STATUS_OK) {
        (*result)->verdict = VERDICT_NO_REQUIREMENTS;
        if (!remarks_add(&session.point, *result) ||
            (options->certify && !states_certify(&session.point, *result))) {
            status = STATUS_MEMORY;
        }
    }
    return finish(status, &session, result);
}

static bool wants_conditions(const struct circuit *circuit, const struct analysis_options *options)
{
    bool wanted = options->all_conditions;
    for (int k = 0; k < circuit->requirement_count; k++) {
        wanted |= circuit->requirements[k].scope == SCOPE_EVERYWHERE;
    }
    return wanted;
}

enum status analysis_review(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result)
{
    struct session session = {0};
    *result = result_create(circuit, options->view, "review");
    if (*result == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = solve_point(circuit, options, &session, *result);
    if (status == STATUS_OK) {
        status = solve_outputs(circuit, options, &session, *result);
        if (status != STATUS_MEMORY &&
            (!judge_all(*result) || !remarks_add(&session.point, *result))) {
            status = STATUS_MEMORY;
        }
        if (status == STATUS_OK) {
            status = states_review(&session.point, options, *result);
        }
    }
    if (status == STATUS_OK && wants_conditions(circuit, options)) {
        status = analyse_conditions(circuit, &session.point, options, *result);
    }
    if (status == STATUS_OK && !options->all_conditions) {
        status = remedies_add(circuit, options, *result);
    }
    return finish(status, &session, result);
}

enum status analysis_sweep(struct circuit *circuit, const struct analysis_options *options,
                           struct result **result)
{
    struct session session = {0};
    *result = result_create(circuit, options->view, "sweep");
    if (*result == NULL) {
        return STATUS_MEMORY;
    }
    const struct sweep *sweeps = circuit->sweeps;
    int count = circuit->sweep_count;
    if (options->extra_sweep != NULL) {
        sweeps = options->extra_sweep;
        count = 1;
    } else if (count == 0) {
        sweeps = sweep_loads(circuit, (*result)->arena);
        count = sweeps != NULL ? circuit->output_count : 0;
    }
    enum status status = solve_point(circuit, options, &session, *result);
    if (status == STATUS_UNSOLVED) {
        status = STATUS_OK; /* the cell may have a state elsewhere on the sweep */
    }
    (*result)->sweeps = arena_new_array((*result)->arena, struct sweep_table, count);
    if ((*result)->sweeps == NULL) {
        status = STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        status = analyse_sweeps(circuit, sweeps, count, options, (*result)->arena,
                                (*result)->sweeps, &(*result)->sweep_count);
    }
    if (status == STATUS_OK) {
        (*result)->verdict = VERDICT_NO_REQUIREMENTS;
    }
    return finish(status, &session, result);
}
