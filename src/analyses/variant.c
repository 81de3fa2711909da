/*
 * variant.c: a circuit built again with other named values or another temperature.
 */
#include "analyses/variant.h"

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

static enum status build_circuit(struct variant *v, const struct circuit *base,
                                 const struct setting *settings, int count)
{
    struct arena *arena = arena_create();
    struct circuit_settings wanted = base->settings;
    struct set_value *sets =
        arena == NULL ? NULL : arena_new_array(arena, struct set_value, wanted.set_count + count);
    if (sets == NULL) {
        arena_destroy(arena);
        return STATUS_MEMORY;
    }
    if (wanted.set_count > 0) {
        memcpy(sets, wanted.sets, (size_t)wanted.set_count * sizeof *sets);
    }
    wanted.sets = sets;
    for (int k = 0; k < count; k++) {
        const struct knob *knob = settings[k].knob;
        if (knob->kind == KNOB_TEMPERATURE) {
            wanted.kelvin = settings[k].value;
        } else if (knob->kind == KNOB_LET) {
            struct quantity value = base->lets[knob->parameter].value;
            value.value = settings[k].value;
            sets[wanted.set_count++] =
                (struct set_value){.name = knob->name, .value = value, .where = SPAN_NONE};
        }
    }
    struct diagnostics unseen = {.arena = arena};
    enum status status = circuit_build(base->cell, &wanted, &unseen, &v->own_circuit);
    if (status == STATUS_OK && (v->own_circuit->unknown_count != base->unknown_count ||
                                v->own_circuit->instance_count != base->instance_count)) {
        status = STATUS_UNSOLVED;
    }
    arena_destroy(arena);
    return status == STATUS_INPUT || status == STATUS_FILE ? STATUS_UNSOLVED : status;
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
    if (builds_anew(settings, count)) {
        const enum status status = build_circuit(v, circuit, settings, count);
        if (status != STATUS_OK) {
            return status;
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
    for (int k = 0; k < count; k++) {
        const struct knob *knob = settings[k].knob;
        if (knob->kind == KNOB_VALUE) {
            system_set(v->system, knob->instance, knob->parameter, settings[k].value);
        }
    }
    return STATUS_OK;
}

void variant_close(struct variant *v)
{
    system_free(v->system);
    circuit_free(v->own_circuit);
    *v = (struct variant){0};
}
