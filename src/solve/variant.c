/*
 * variant.c: a circuit built again with other named values or another temperature.
 */
#include "solve/variant.h"

#include <math.h>
#include <string.h>

double knob_value(const struct system *s, const struct knob *knob)
{
    switch (knob->kind) {
    case KNOB_TEMPERATURE:
        return s->conditions.kelvin;
    case KNOB_VALUE:
        return s->own[knob->instance][knob->parameter];
    case KNOB_LET:
        return s->circuit->lets[knob->parameter].value.value;
    case KNOB_PROCESS:
        break;
    }
    return NAN;
}

static bool builds_anew(const struct setting *settings, int count)
{
    for (int k = 0; k < count; k++) {
        if (settings[k].knob->kind != KNOB_VALUE) {
            return true;
        }
    }
    return false;
}

/* The settings that `base` was built with and the new ones; the list of lets lies in the arena. */
static bool join_settings(const struct circuit *base, const struct setting *settings, int count,
                          struct arena *arena, struct circuit_settings *joined)
{
    *joined = base->settings;
    struct set_value *sets = arena_new_array(arena, struct set_value, joined->set_count + count);
    if (sets == NULL) {
        return false;
    }
    if (joined->set_count > 0) {
        memcpy(sets, joined->sets, (size_t)joined->set_count * sizeof *sets);
    }
    joined->sets = sets;
    for (int k = 0; k < count; k++) {
        const struct knob *knob = settings[k].knob;
        if (knob->kind == KNOB_TEMPERATURE) {
            joined->kelvin = settings[k].value;
        } else if (knob->kind == KNOB_PROCESS) {
            const int corner = (int)settings[k].value;
            joined->corner = corner < 0 ? NULL : base->corners[corner].name;
        } else if (knob->kind == KNOB_LET) {
            struct quantity value = base->lets[knob->parameter].value;
            value.value = settings[k].value;
            sets[joined->set_count++] =
                (struct set_value){.name = knob->name, .value = value, .where = SPAN_NONE};
        }
    }
    return true;
}

enum status variant_build(const struct circuit *base, const struct setting *settings, int count,
                          struct circuit **own)
{
    *own = NULL;
    if (!builds_anew(settings, count)) {
        return STATUS_OK;
    }
    struct arena *arena = arena_create();
    struct circuit_settings joined;
    if (arena == NULL || !join_settings(base, settings, count, arena, &joined)) {
        arena_destroy(arena);
        return STATUS_MEMORY;
    }
    struct diagnostics unseen = {.arena = arena};
    const enum status status = circuit_build(base->cell, &joined, &unseen, own);
    arena_destroy(arena);
    return status == STATUS_INPUT || status == STATUS_FILE ? STATUS_UNSOLVED : status;
}

enum status variant_turn(struct system *system, const struct circuit *base,
                         const struct setting *settings, int count)
{
    const struct circuit *circuit = system->circuit;
    for (int k = 0; k < count; k++) {
        struct knob knob = *settings[k].knob;
        struct diagnostics unseen = {.arena = system->arena};
        if (knob.kind != KNOB_VALUE) {
            continue;
        }
        if (circuit != base && !circuit_knob(circuit, knob.name, SPAN_NONE, &unseen, &knob)) {
            return arena_failed(circuit->arena) ? STATUS_MEMORY : STATUS_UNSOLVED;
        }
        system_set(system, knob.instance, knob.parameter, settings[k].value);
    }
    return STATUS_OK;
}

/* Values that differ from those of the base's circuit were turned there; they stay. */
static void keep_turned(struct system *s, const struct system *base)
{
    const struct circuit *c = base->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        for (int p = 0; p < c->instances[k].type->parameter_count; p++) {
            const double value = base->own[k][p], before = c->instances[k].own[p];
            if (c->instances[k].parent < 0 && (value < before || value > before)) {
                system_set(s, k, p, value);
            }
        }
    }
}

enum status variant_open(struct variant *v, const struct system *base,
                         const struct setting *settings, int count)
{
    const struct circuit *circuit = base->circuit;
    double kelvin = base->conditions.kelvin;
    *v = (struct variant){0};
    const enum status status = variant_build(circuit, settings, count, &v->own_circuit);
    if (status != STATUS_OK) {
        return status;
    }
    if (v->own_circuit != NULL) {
        if (v->own_circuit->unknown_count != circuit->unknown_count ||
            v->own_circuit->instance_count != circuit->instance_count) {
            return STATUS_UNSOLVED;
        }
        circuit = v->own_circuit;
    }
    for (int k = 0; k < count; k++) {
        kelvin = settings[k].knob->kind == KNOB_TEMPERATURE ? settings[k].value : kelvin;
    }
    v->system = system_create(circuit, kelvin, base->conditions.effects);
    if (v->system == NULL) {
        return STATUS_MEMORY;
    }
    keep_turned(v->system, base);
    return variant_turn(v->system, base->circuit, settings, count);
}

void variant_close(struct variant *v)
{
    system_free(v->system);
    circuit_free(v->own_circuit);
    *v = (struct variant){0};
}
