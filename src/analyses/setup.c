/*
 * setup.c: a circuit under conditions of its own.
 *
 * Lets, the temperature and the corner reach many values at once: the circuit is built anew. A
 * value of one device is turned in the system alone.
 */
#include "analyses/setup.h"

#include <math.h>
#include <string.h>

static bool needs_build(const struct condition_axis *axis, double at)
{
    return axis->knob->kind != KNOB_VALUE && !(at == axis->own);
}

/* The settings of the base with the conditions in force; lists in the setup's arena. */
static bool make_settings(struct setup *setup, const struct circuit *base,
                          const struct condition_axis *axes, int count, const double *at,
                          struct circuit_settings *wanted)
{
    *wanted = base->settings;
    struct set_value *sets =
        arena_new_array(setup->arena, struct set_value, wanted->set_count + count);
    if (sets == NULL) {
        return false;
    }
    if (wanted->set_count > 0) {
        memcpy(sets, wanted->sets, (size_t)wanted->set_count * sizeof *sets);
    }
    wanted->sets = sets;
    for (int k = 0; k < count; k++) {
        const struct knob *knob = axes[k].knob;
        if (knob->kind == KNOB_TEMPERATURE) {
            wanted->kelvin = at[k];
        } else if (knob->kind == KNOB_PROCESS) {
            const int corner = (int)at[k];
            wanted->corner = corner < 0 ? NULL : base->corners[corner].name;
        } else if (knob->kind == KNOB_LET) {
            struct quantity value = base->lets[knob->parameter].value;
            value.value = at[k];
            sets[wanted->set_count++] =
                (struct set_value){.name = knob->name, .value = value, .where = SPAN_NONE};
        }
    }
    return true;
}

static enum status build_circuit(struct setup *setup, struct circuit *base,
                                 const struct condition_axis *axes, int count, const double *at)
{
    bool anew = false;
    for (int k = 0; k < count; k++) {
        anew |= needs_build(&axes[k], at[k]);
    }
    setup->circuit = base;
    if (!anew) {
        return STATUS_OK;
    }
    struct circuit_settings wanted;
    struct diagnostics unseen = {.arena = setup->arena};
    if (!make_settings(setup, base, axes, count, at, &wanted)) {
        return STATUS_MEMORY;
    }
    const enum status status = circuit_build(base->cell, &wanted, &unseen, &setup->own_circuit);
    if (status != STATUS_OK) {
        return status == STATUS_INPUT ? STATUS_UNSOLVED : status;
    }
    setup->circuit = setup->own_circuit;
    return STATUS_OK;
}

/* Turns the values of single devices, which are looked up again where the circuit is a new one. */
static enum status turn_values(struct setup *setup, const struct condition_axis *axes, int count,
                               const double *at)
{
    for (int k = 0; k < count; k++) {
        struct knob knob = *axes[k].knob;
        struct diagnostics unseen = {.arena = setup->arena};
        if (knob.kind != KNOB_VALUE) {
            continue;
        }
        if (setup->own_circuit != NULL &&
            !circuit_knob(setup->circuit, knob.name, SPAN_NONE, &unseen, &knob)) {
            return arena_failed(setup->circuit->arena) ? STATUS_MEMORY : STATUS_UNSOLVED;
        }
        system_set(setup->system, knob.instance, knob.parameter, at[k]);
    }
    return STATUS_OK;
}

enum status setup_open(struct setup *setup, struct circuit *base, const struct condition_axis *axes,
                       int axis_count, const double *at, enum reading_scope scope,
                       const struct analysis_options *options)
{
    *setup = (struct setup){.arena = arena_create()};
    if (setup->arena == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = build_circuit(setup, base, axes, axis_count, at);
    if (status != STATUS_OK) {
        return status;
    }
    const unsigned effects = options->view == VIEW_HAND ? EFFECTS_HAND : EFFECTS_FULL;
    setup->system = system_create(setup->circuit, setup->circuit->kelvin, effects);
    if (setup->system == NULL || !operating_point_create(&setup->point, setup->system, options) ||
        !reading_list_make(&setup->list, setup->circuit, scope, setup->arena)) {
        return STATUS_MEMORY;
    }
    return turn_values(setup, axes, axis_count, at);
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
