/*
 * setup.c: a circuit under conditions of its own.
 */
#include "analyses/setup.h"

#include <string.h>

#include "solve/variant.h"

/* What differs from the base; the list lies in the setup's arena. NULL: no memory. */
static struct setting *changes(struct setup *setup, const struct condition_axis *axes, int count,
                               const double *at, int *changed)
{
    struct setting *settings = arena_new_array(setup->arena, struct setting, count);
    *changed = 0;
    for (int k = 0; settings != NULL && k < count; k++) {
        if (axes[k].knob->kind == KNOB_VALUE || !(at[k] == axes[k].own)) {
            settings[(*changed)++] = (struct setting){axes[k].knob, at[k]};
        }
    }
    return settings;
}

enum status setup_open(struct setup *setup, struct circuit *base, const struct condition_axis *axes,
                       int axis_count, const double *at, enum reading_scope scope,
                       const struct analysis_options *options)
{
    *setup = (struct setup){.arena = arena_create()};
    if (setup->arena == NULL) {
        return STATUS_MEMORY;
    }
    int changed;
    const struct setting *settings = changes(setup, axes, axis_count, at, &changed);
    if (settings == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = variant_build(base, settings, changed, &setup->own_circuit);
    if (status != STATUS_OK) {
        return status;
    }
    setup->circuit = setup->own_circuit != NULL ? setup->own_circuit : base;
    const unsigned effects = options->view == VIEW_HAND ? EFFECTS_HAND : EFFECTS_FULL;
    setup->system = system_create(setup->circuit, setup->circuit->kelvin, effects);
    if (setup->system == NULL ||
        !operating_point_create(&setup->point, setup->system, options->stopped,
                                options->stopped_self) ||
        !reading_list_make(&setup->list, setup->circuit, scope, setup->arena)) {
        return STATUS_MEMORY;
    }
    return variant_turn(setup->system, base, settings, changed);
}

void setup_close(struct setup *setup)
{
    system_free(setup->system);
    circuit_free(setup->own_circuit);
    arena_destroy(setup->arena);
    *setup = (struct setup){0};
}

enum status setup_solve(struct setup *setup, const double *near, int near_count, bool *searched)
{
    struct operating_point *p = &setup->point;
    if (near != NULL && near_count == setup->system->n) {
        memcpy(p->x, near, (size_t)near_count * sizeof *near);
        const enum newton_status status = operating_point_newton(p);
        if (status == NEWTON_STOPPED || status == NEWTON_MEMORY) {
            return status == NEWTON_STOPPED ? STATUS_STOPPED : STATUS_MEMORY;
        }
        const enum status polished =
            status == NEWTON_CONVERGED ? operating_point_polish(p) : STATUS_UNSOLVED;
        if (polished != STATUS_UNSOLVED) {
            return polished;
        }
    }
    if (searched != NULL) {
        *searched = true;
    }
    return operating_point_find(p);
}
