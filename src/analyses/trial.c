/*
 * trial.c: a copy of a cell at other values.
 */
#include "analyses/trial.h"

#include <string.h>

/* Values of a model, with those parameters that belong to it turned. */
static bool turn_model(struct system *s, const double *base_values, int size,
                       const struct parameter_ref *parameters, const double *values, int count)
{
    double *turned = arena_new_array(s->arena, double, size);
    if (turned == NULL) {
        return false;
    }
    memcpy(turned, base_values, (size_t)size * sizeof *turned);
    for (int k = 0; k < count; k++) {
        if (parameters[k].sort == PARAMETER_MODEL && parameters[k].model_values == base_values) {
            turned[parameters[k].index] = values[k];
        }
    }
    system_swap_model(s, base_values, turned);
    return true;
}

static bool turn_models(struct system *s, const struct parameter_ref *parameters,
                        const double *values, int count)
{
    for (int k = 0; k < count; k++) {
        if (parameters[k].sort != PARAMETER_MODEL) {
            continue;
        }
        for (int i = 0; i < s->circuit->instance_count; i++) {
            const struct instance *instance = &s->circuit->instances[i];
            if (instance->model_values == parameters[k].model_values) {
                return turn_model(s, instance->model_values, instance->type->model_parameter_count,
                                  parameters, values, count);
            }
        }
    }
    return true;
}

static enum status build(struct trial *trial, const struct system *base,
                         const struct parameter_ref *parameters, const double *values, int count)
{
    struct arena *arena = arena_create();
    struct setting *settings = arena == NULL ? NULL : arena_new_array(arena, struct setting, count);
    struct knob *knobs = settings == NULL ? NULL : arena_new_array(arena, struct knob, count);
    enum status status = knobs == NULL ? STATUS_MEMORY : STATUS_OK;
    int used = 0;
    for (int k = 0; status == STATUS_OK && k < count; k++) {
        if (parameters[k].sort == PARAMETER_MODEL) {
            continue;
        }
        knobs[used] = parameters[k].sort == PARAMETER_KNOB
                          ? parameters[k].knob
                          : (struct knob){KNOB_VALUE, parameters[k].instance, parameters[k].index,
                                          parameters[k].name, parameters[k].dimension};
        settings[used] = (struct setting){&knobs[used], values[k]};
        used++;
    }
    if (status == STATUS_OK) {
        status = variant_open(&trial->variant, base, settings, used);
    }
    if (status == STATUS_OK && !turn_models(trial->variant.system, parameters, values, count)) {
        status = STATUS_MEMORY;
    }
    arena_destroy(arena);
    return status;
}

/* From the state at hand; where that does not lead on, along the way of the first own parameter,
 * then from cold. */
static enum status solve(struct trial *trial, const struct operating_point *home,
                         const double *start, const struct parameter_ref *parameters,
                         const double *values, int count)
{
    struct operating_point *p = &trial->point;
    const size_t size = (size_t)p->system->n * sizeof *p->x;
    memcpy(p->x, start, size);
    const enum newton_status followed = operating_point_newton(p);
    if (followed == NEWTON_CONVERGED) {
        return STATUS_OK;
    }
    if (followed == NEWTON_STOPPED || followed == NEWTON_MEMORY) {
        return followed == NEWTON_STOPPED ? STATUS_STOPPED : STATUS_MEMORY;
    }
    if (count == 1 && parameters->sort == PARAMETER_OWN) {
        bool jumped;
        memcpy(p->x, home->x, size);
        return operating_point_move(p, parameters->instance, parameters->index, parameters->value,
                                    *values, &jumped);
    }
    return operating_point_find(p);
}

enum status trial_open(struct trial *trial, const struct operating_point *home, const double *start,
                       const struct parameter_ref *parameters, const double *values, int count)
{
    *trial = (struct trial){0};
    enum status status = build(trial, home->system, parameters, values, count);
    if (status == STATUS_OK && !operating_point_create(&trial->point, trial->variant.system,
                                                       home->stopped, home->stopped_self)) {
        status = STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        status = solve(trial, home, start == NULL ? home->x : start, parameters, values, count);
    }
    return status == STATUS_OK ? operating_point_polish(&trial->point) : status;
}

void trial_close(struct trial *trial)
{
    variant_close(&trial->variant);
}
