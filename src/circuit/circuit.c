/*
 * circuit.c: from a cell to a checked circuit, step by step.
 */
#include "circuit/circuit.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "circuit/build.h"

/* The settings outlive the call: what is swept later is built from them again. */
static bool keep_settings(struct circuit *c, const struct circuit_settings *settings)
{
    c->settings = *settings;
    struct set_value *sets = arena_new_array(c->arena, struct set_value, settings->set_count);
    if (sets == NULL) {
        return false;
    }
    if (settings->set_count > 0) {
        memcpy(sets, settings->sets, (size_t)settings->set_count * sizeof *sets);
    }
    c->settings.sets = sets;
    if (settings->corner != NULL) {
        c->settings.corner = arena_copy(c->arena, settings->corner, strlen(settings->corner));
        return c->settings.corner != NULL;
    }
    return true;
}

static bool start(struct circuit *c, struct cell *cell, const struct circuit_settings *settings)
{
    c->cell = cell;
    c->cautions.arena = c->arena;
    c->names = names_create(c->arena);
    c->nodes = arena_grow(c->arena, NULL, 0, &c->node_capacity, sizeof *c->nodes);
    if (c->names == NULL || c->nodes == NULL || !keep_settings(c, settings)) {
        return false;
    }
    c->corner = c->settings.corner;
    c->nodes[0] = (struct node){.name = "gnd", .where = SPAN_NONE};
    c->node_count = 1;
    return names_add(c->names, NAME_NODE, "gnd", 0);
}

bool build_is_over_limit(struct builder *b, struct span where)
{
    const int parts = b->settings->part_limit > 0 ? b->settings->part_limit : CIRCUIT_PART_LIMIT;
    if (b->is_over_limit) {
        return true;
    }
    b->is_over_limit = true;
    if (b->placed >= parts) {
        diagnostics_add(b->diagnostics, where, "blocks that use blocks multiply",
                        "the cell has more than %d parts, the limit", parts);
    } else if (arena_used(b->arena) >> 20 >= CIRCUIT_MEMORY_LIMIT) {
        diagnostics_add(b->diagnostics, where, "blocks that use blocks multiply",
                        "the parts of the cell need more than %d MiB, the limit",
                        CIRCUIT_MEMORY_LIMIT);
    } else if (b->diagnostics->count - b->errors_before >= LANGUAGE_ERROR_LIMIT) {
        diagnostics_add(b->diagnostics, where, NULL,
                        "more than %d errors: the rest of the cell was not built",
                        LANGUAGE_ERROR_LIMIT);
    } else {
        b->is_over_limit = false;
    }
    return b->is_over_limit;
}

/* Rails first: they decide the bulk of p-channel devices. */
static bool build_parts(struct builder *b)
{
    const struct frame top = {.builder = b, .prefix = ""};
    if (!build_rails(b) || !build_blocks(b) ||
        !build_body(&top, b->cell->tree.statements, b->cell->tree.count) || !build_outputs(b)) {
        return false;
    }
    build_finish_unknowns(b->circuit);
    return true;
}

/* All steps; false when memory is short. */
static bool build(struct builder *b)
{
    const int before = b->diagnostics->count;
    if (!build_lets(b) || !build_models(b) || !build_parts(b)) {
        return false;
    }
    const bool whole = b->diagnostics->count == before && b->cell->diagnostics.count == 0;
    if (!build_requests(b)) {
        return false;
    }
    /* A part that was rejected leaves holes: structure is judged only when all parts stand. */
    return !whole || build_checks(b);
}

enum status circuit_build(struct cell *cell, const struct circuit_settings *settings,
                          struct diagnostics *diagnostics, struct circuit **out)
{
    *out = NULL;
    struct arena *arena = arena_create();
    struct circuit *circuit = arena == NULL ? NULL : arena_new(arena, struct circuit);
    if (circuit == NULL) {
        arena_destroy(arena);
        return STATUS_MEMORY;
    }
    circuit->arena = arena;
    const int before = diagnostics->count;
    struct builder builder = {.circuit = circuit,
                              .cell = cell,
                              .diagnostics = diagnostics,
                              .arena = arena,
                              .settings = settings,
                              .errors_before = before,
                              .thermal_voltage = BOLTZMANN_OVER_CHARGE * 300.15};
    const bool good = start(circuit, cell, settings) && build(&builder);
    if (!good || arena_failed(arena) || arena_failed(diagnostics->arena) ||
        diagnostics->out_of_memory) {
        circuit_free(circuit);
        return STATUS_MEMORY;
    }
    if (diagnostics->count > before || cell->diagnostics.count > 0) {
        circuit_free(circuit);
        return STATUS_INPUT;
    }
    *out = circuit;
    return STATUS_OK;
}

void circuit_free(struct circuit *circuit)
{
    if (circuit != NULL) {
        arena_destroy(circuit->arena);
    }
}

void circuit_unknown_name(const struct circuit *circuit, int unknown, char *text, size_t size)
{
    if (unknown < 0) {
        snprintf(text, size, "gnd");
        return;
    }
    if (unknown < circuit->node_count - 1) {
        snprintf(text, size, "node %s", circuit->nodes[unknown + 1].name);
        return;
    }
    for (int k = 0; k < circuit->instance_count; k++) {
        const struct instance *instance = &circuit->instances[k];
        const int branches = instance->type->branch_count;
        const int first = instance->local_count - branches;
        if (branches > 0 && unknown >= instance->local[first] &&
            unknown < instance->local[first] + branches) {
            snprintf(text, size, "current of %s", instance->name);
            return;
        }
    }
    snprintf(text, size, "unknown %d", unknown);
}

int circuit_find_instance(const struct circuit *circuit, const char *name)
{
    const int index = names_find(circuit->names, NAME_INSTANCE, name);
    return index < 0 ? -1 : index;
}

int circuit_find_rail(const struct circuit *circuit, const char *name)
{
    return names_find(circuit->names, NAME_RAIL, name);
}

int circuit_find_output(const struct circuit *circuit, const char *name)
{
    return names_find(circuit->names, NAME_OUTPUT, name);
}

int circuit_find_node(const struct circuit *circuit, const char *name)
{
    return names_find(circuit->names, NAME_NODE, name);
}
