/*
 * reading.c: what a cell asks for, read at a solved point.
 */
#include "analyses/reading.h"

#include <math.h>
#include <string.h>

#include "analyses/judge.h"
#include "solve/measure.h"
#include "analyses/output.h"

bool reading_is_of_output(const struct probe *probe)
{
    return probe->kind == PROBE_OUTPUT && probe->quantity != OUTPUT_CURRENT;
}

static bool same(const struct probe *a, const struct probe *b)
{
    return a->kind == b->kind && a->index == b->index && a->quantity == b->quantity;
}

static int add_probe(struct reading_list *list, const struct probe *probe)
{
    for (int k = 0; k < list->probe_count; k++) {
        if (same(&list->probes[k], probe)) {
            return k;
        }
    }
    if (reading_is_of_output(probe)) {
        list->with_output[probe->index] = true;
        list->needs_outputs = true;
    }
    list->probes[list->probe_count] = *probe;
    return list->probe_count++;
}

static bool add_currents(struct reading_list *list, struct arena *arena)
{
    const struct circuit *c = list->circuit;
    for (int k = 0; k < c->output_count; k++) {
        const char *text = arena_format(arena, "%s.current", c->outputs[k].name);
        const struct probe probe = {.kind = PROBE_OUTPUT,
                                    .index = k,
                                    .quantity = OUTPUT_CURRENT,
                                    .dimension = output_quantities[OUTPUT_CURRENT].dimension,
                                    .text = text};
        if (text == NULL) {
            return false;
        }
        add_probe(list, &probe);
    }
    return true;
}

bool reading_list_make(struct reading_list *list, const struct circuit *c, enum reading_scope scope,
                       struct arena *arena)
{
    *list = (struct reading_list){.circuit = c};
    list->probes = arena_new_array(arena, struct probe, c->output_count + c->requirement_count);
    list->probe_of = arena_new_array(arena, int, c->requirement_count);
    list->with_output = arena_new_array(arena, bool, c->output_count);
    if (list->probes == NULL || list->probe_of == NULL || list->with_output == NULL ||
        (scope == READING_ALL && !add_currents(list, arena))) {
        return false;
    }
    for (int k = 0; k < c->requirement_count; k++) {
        const struct requirement *q = &c->requirements[k];
        const bool wanted = scope == READING_ALL || q->scope == SCOPE_EVERYWHERE;
        list->probe_of[k] = wanted ? add_probe(list, &q->probe) : -1;
    }
    return true;
}

/* Output analyses into a result of their own, for judge.c to read. */
static enum status read_outputs(struct operating_point *point, const struct reading_list *list,
                                struct result *into)
{
    const struct circuit *c = list->circuit;
    into->outputs = arena_new_array(into->arena, struct output_result, c->output_count);
    if (into->outputs == NULL) {
        return STATUS_MEMORY;
    }
    into->output_count = c->output_count;
    bool moved = false;
    for (int k = 0; k < c->output_count; k++) {
        if (!list->with_output[k]) {
            continue;
        }
        enum status status = moved ? operating_point_polish(point) : STATUS_OK;
        if (status == STATUS_OK) {
            status = analyse_output(point, k, into->arena, &into->outputs[k]);
        }
        if (status != STATUS_OK) {
            return status;
        }
        moved = true;
    }
    return STATUS_OK;
}

enum status reading_take(struct operating_point *point, const struct reading_list *list,
                         double *values, double *margins)
{
    const struct circuit *c = list->circuit;
    struct result scratch = {.circuit = c};
    for (int k = 0; k < list->probe_count; k++) {
        values[k] = measure_probe(point->system, &list->probes[k], point->x);
    }
    enum status status = STATUS_OK;
    if (list->needs_outputs) {
        scratch.arena = arena_create();
        status = scratch.arena == NULL ? STATUS_MEMORY : read_outputs(point, list, &scratch);
        for (int k = 0; status == STATUS_OK && k < list->probe_count; k++) {
            if (reading_is_of_output(&list->probes[k])) {
                values[k] = result_value(&scratch, &list->probes[k]);
            }
        }
    }
    for (int k = 0; status == STATUS_OK && k < c->requirement_count; k++) {
        const int probe = list->probe_of[k];
        margins[k] = probe < 0 ? NAN : judge_margin(&scratch, &c->requirements[k], values[probe]);
    }
    arena_destroy(scratch.arena);
    return status;
}
