/*
 * result_create.c: results made, filled with the solver's story, and freed.
 */
#include "analyses/result_create.h"

#include <string.h>

#include "analyses/analysis.h"

/* The temperature of the hand view: that of the model values, the first used model's where they
 * differ. */
static double measured_kelvin(const struct circuit *circuit)
{
    for (int k = 0; k < circuit->instance_count; k++) {
        if (circuit->instances[k].model != NULL) {
            return circuit->instances[k].model->measured_kelvin;
        }
    }
    return circuit->measured_kelvin;
}

struct result *result_create(const struct circuit *circuit, enum view view, const char *command)
{
    struct arena *arena = arena_create();
    struct result *result = arena == NULL ? NULL : arena_new(arena, struct result);
    if (result == NULL) {
        arena_destroy(arena);
        return NULL;
    }
    result->arena = arena;
    result->circuit = circuit;
    result->command = command;
    result->view = view;
    result->kelvin = view == VIEW_HAND ? measured_kelvin(circuit) : circuit->kelvin;
    result->verdict = VERDICT_UNSOLVED;
    result->cautions.arena = arena;
    return result;
}

void result_free(struct result *result)
{
    if (result != NULL) {
        arena_destroy(result->arena);
    }
}

static const char *keep(struct arena *arena, const char *text)
{
    return text == NULL ? NULL : arena_copy(arena, text, strlen(text));
}

void result_keep_solver(struct result *result, const struct solver_result *solver)
{
    struct solver_result *s = &result->point.solver;
    *s = *solver;
    s->method = keep(result->arena, solver->method);
    s->worst_name = keep(result->arena, solver->worst_name);
    s->limited_by = keep(result->arena, solver->limited_by);
    s->trouble = keep(result->arena, solver->trouble);
    s->advice = keep(result->arena, solver->advice);
}
