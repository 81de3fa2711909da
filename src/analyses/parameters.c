/*
 * parameters.c: every parameter of a cell and its models by name, for derivative.h.
 */
#include <math.h>
#include <string.h>

#include "analyses/derivative.h"
#include "solve/variant.h"

struct parameter_ref derivative_own(const struct system *s, int instance, int index)
{
    const struct parameter *row = &s->circuit->instances[instance].type->parameters[index];
    return (struct parameter_ref){.sort = PARAMETER_OWN,
                                  .instance = instance,
                                  .index = index,
                                  .row = row,
                                  .name = row->name,
                                  .dimension = row->dimension,
                                  .value = s->own[instance][index]};
}

struct parameter_ref derivative_knob(const struct system *s, const struct knob *knob)
{
    if (knob->kind == KNOB_VALUE) {
        struct parameter_ref own = derivative_own(s, knob->instance, knob->parameter);
        own.name = knob->name;
        return own;
    }
    return (struct parameter_ref){.sort = PARAMETER_KNOB,
                                  .knob = *knob,
                                  .name = knob->name,
                                  .dimension = knob->dimension,
                                  .value = knob_value(s, knob)};
}

static bool add(struct parameter_list *list, struct arena *arena, struct parameter_ref ref)
{
    struct parameter_ref *grown = ref.name == NULL ? NULL
                                                   : arena_grow(arena, list->list, list->count,
                                                                &list->capacity, sizeof *grown);
    if (grown == NULL) {
        return false;
    }
    list->list = grown;
    grown[list->count++] = ref;
    return true;
}

/* Coefficients of spread change no point. */
static bool is_spread(const struct parameter *row)
{
    static const char *const names[] = {"tol", "match", "match_threshold", "match_gain",
                                        "match_saturation"};
    for (size_t k = 0; k < sizeof names / sizeof names[0]; k++) {
        if (strcmp(row->name, names[k]) == 0) {
            return true;
        }
    }
    return false;
}

/* A hidden row, `none`, or an effect that the cell does not have: zero by default, or at a zero
 * below which it cannot go. */
static bool is_absent(const struct parameter *row, double value, bool given)
{
    return row->when_absent == DEFAULT_HIDDEN || isnan(value) || is_spread(row) ||
           (!(fabs(value) > 0) && (!given || row->least >= 0));
}

static bool add_instance(struct parameter_list *list, struct arena *arena, const struct system *s,
                         int k)
{
    const struct instance *instance = &s->circuit->instances[k];
    const struct device_type *type = instance->type;
    for (int p = 0; p < type->parameter_count; p++) {
        const struct parameter *row = &type->parameters[p];
        if (is_absent(row, s->own[k][p], instance->given[p] || p == type->value_parameter)) {
            continue;
        }
        struct parameter_ref ref = derivative_own(s, k, p);
        ref.name = p == type->value_parameter
                       ? instance->name
                       : arena_format(arena, "%s.%s", instance->name, row->name);
        if (!add(list, arena, ref)) {
            return false;
        }
    }
    return true;
}

/* The model of the first instance that uses it; the others are the same one. */
static bool add_model(struct parameter_list *list, struct arena *arena, const struct system *s,
                      int k)
{
    const struct instance *instance = &s->circuit->instances[k];
    const struct device_type *type = instance->type;
    for (int before = 0; before < k; before++) {
        if (s->circuit->instances[before].model_values == instance->model_values) {
            return true;
        }
    }
    const char *owner = instance->model != NULL ? instance->model->name : instance->name;
    for (int p = 0; p < type->model_parameter_count; p++) {
        const struct parameter *row = &type->model_parameters[p];
        const bool given = instance->model != NULL && instance->model->given[p];
        if (is_absent(row, instance->model_values[p], given)) {
            continue;
        }
        const struct parameter_ref ref = {.sort = PARAMETER_MODEL,
                                          .instance = -1,
                                          .model_values = instance->model_values,
                                          .index = p,
                                          .row = row,
                                          .name = arena_format(arena, "%s.%s", owner, row->name),
                                          .dimension = row->dimension,
                                          .value = instance->model_values[p]};
        if (!add(list, arena, ref)) {
            return false;
        }
    }
    return true;
}

bool derivative_parameters(const struct system *s, struct arena *arena, struct parameter_list *list)
{
    const struct circuit *c = s->circuit;
    *list = (struct parameter_list){0};
    for (int k = 0; k < c->instance_count; k++) {
        if (c->instances[k].parent < 0 && !add_instance(list, arena, s, k)) {
            return false;
        }
    }
    for (int k = 0; k < c->instance_count; k++) {
        if (c->instances[k].model_values != NULL && !add_model(list, arena, s, k)) {
            return false;
        }
    }
    for (int k = 0; k < c->let_count; k++) {
        const struct knob knob = {KNOB_LET, -1, k, c->lets[k].name, c->lets[k].value.dimension};
        if (!add(list, arena, derivative_knob(s, &knob))) {
            return false;
        }
    }
    const struct knob hot = {KNOB_TEMPERATURE, -1, -1, "temperature", DIMENSION_TEMPERATURE};
    return add(list, arena, derivative_knob(s, &hot));
}
