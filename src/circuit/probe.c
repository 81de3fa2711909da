/*
 * probe.c: names of quantities ("tail.current") and of things that can be turned ("RE", "M1.W").
 */
#include "circuit/build.h"

#include <stdio.h>
#include <string.h>

const struct quantity_row node_quantities[1] = {{"v", {12, 0, 0, 0}, "voltage against gnd"}};

const struct quantity_row rail_quantities[3] = {
    {"v", {12, 0, 0, 0}, "voltage against gnd"},
    {"current", {0, 12, 0, 0}, "current delivered to the cell"},
    {"power", {12, 12, 0, 0}, "power delivered to the cell"},
};

const struct quantity_row output_quantities[OUTPUT_QUANTITY_COUNT] = {
    {"current", {0, 12, 0, 0}, "current at `at`, its magnitude"},
    {"resistance", {12, -12, 0, 0}, "output resistance dV/dI at `at`"},
    {"compliance", {12, 0, 0, 0}, "load voltage at which the first transistor loses its headroom"},
    {"low", {12, 0, 0, 0}, "load voltage below which the current leaves its band"},
    {"high", {12, 0, 0, 0}, "load voltage above which the current leaves its band"},
    {"flatness", {0, 0, 0, 0}, "(max - min)/nominal between compliance and the far end"},
    {"line", {-12, 0, 0, 0}, "relative change of current per volt of a rail, the largest"},
    {"tempco", {0, 0, -12, 0}, "relative change of current per kelvin"},
    {"sigma", {0, 0, 0, 0}, "relative standard deviation of the current from mismatch"},
};

static const struct quantity_row all_quantities[1] = {
    {"headroom", {12, 0, 0, 0}, "the least headroom of all transistors"}};
static const struct quantity_row cell_quantities[1] = {
    {"power", {12, 12, 0, 0}, "power delivered by all rails and sources"}};

struct sort {
    enum probe_kind kind;
    const struct quantity_row *rows;
    int row_count;
    int index;
};

/* What a thing name may stand for, in the order in which its quantities are looked for. */
static int sorts_of(const struct circuit *c, const char *thing, struct sort *sorts)
{
    int count = 0;
    if (strcmp(thing, "all") == 0) {
        sorts[count++] = (struct sort){PROBE_ALL, all_quantities, 1, -1};
    }
    if (strcmp(thing, "cell") == 0) {
        sorts[count++] = (struct sort){PROBE_CELL, cell_quantities, 1, -1};
    }
    int index = circuit_find_output(c, thing);
    if (index >= 0) {
        sorts[count++] =
            (struct sort){PROBE_OUTPUT, output_quantities, OUTPUT_QUANTITY_COUNT, index};
    }
    index = circuit_find_rail(c, thing);
    if (index >= 0) {
        sorts[count++] = (struct sort){PROBE_RAIL, rail_quantities, 3, index};
    }
    index = circuit_find_instance(c, thing);
    if (index >= 0) {
        const struct device_type *type = c->instances[index].type;
        sorts[count++] = (struct sort){PROBE_DEVICE, type->quantities, type->quantity_count, index};
    }
    index = circuit_find_node(c, thing);
    if (index >= 0) {
        sorts[count++] = (struct sort){PROBE_NODE, node_quantities, 1, node_unknown(index)};
    }
    return count;
}

static void unknown_thing(const struct circuit *c, const char *thing, struct span where,
                          struct diagnostics *diagnostics)
{
    static const enum name_sort sorts[] = {NAME_OUTPUT, NAME_RAIL, NAME_INSTANCE, NAME_NODE};
    const char *list[LIST_LIMIT];
    int count = 0;
    if (diagnostics_has_lost(diagnostics, thing)) {
        return;
    }
    for (size_t k = 0; k < sizeof sorts / sizeof sorts[0]; k++) {
        count += names_list(c->names, sorts[k], list + count, LIST_LIMIT - count);
    }
    diagnostics_add(diagnostics, where, hint_near(diagnostics->arena, thing, list, count, NULL),
                    "nothing is called '%s'", thing);
}

static void unknown_quantity(const struct sort *sorts, int count, const char *thing,
                             const char *quantity, struct span where,
                             struct diagnostics *diagnostics)
{
    const char *list[200];
    int known = 0;
    if (diagnostics_has_lost(diagnostics, thing)) {
        return; /* what it would have been has more quantities */
    }
    for (int s = 0; s < count; s++) {
        for (int r = 0; r < sorts[s].row_count && known < 200; r++) {
            list[known++] = sorts[s].rows[r].name;
        }
    }
    struct arena *arena = diagnostics->arena;
    const char *hint = strcmp(thing, "gnd") == 0
                           ? "gnd is 0 V by itself"
                           : hint_near(arena, quantity, list, known,
                                       hint_list(arena, "it has: ", list, known, NULL));
    diagnostics_add(diagnostics, where, hint, "%s has no quantity '%s'", thing, quantity);
}

bool circuit_probe(const struct circuit *c, const char *text, struct span where,
                   struct diagnostics *diagnostics, struct probe *probe)
{
    const char *dot = strrchr(text, '.');
    if (dot == NULL) {
        diagnostics_add(diagnostics, where, "such as tail.current or M1.vgs",
                        "a quantity is written thing.quantity; '%s' has no dot", text);
        return false;
    }
    const char *thing = arena_copy(diagnostics->arena, text, (size_t)(dot - text));
    const char *kept = arena_copy(c->arena, text, strlen(text));
    if (thing == NULL || kept == NULL) {
        diagnostics->out_of_memory = true;
        return false;
    }
    struct sort sorts[6];
    const int count = sorts_of(c, thing, sorts);
    for (int s = 0; s < count; s++) {
        for (int r = 0; r < sorts[s].row_count; r++) {
            if (strcmp(sorts[s].rows[r].name, dot + 1) == 0) {
                if (sorts[s].kind == PROBE_NODE && sorts[s].index < 0) {
                    continue; /* gnd.v is 0 and of no interest */
                }
                *probe = (struct probe){sorts[s].kind, sorts[s].index, r,
                                        sorts[s].rows[r].dimension, kept};
                return true;
            }
        }
    }
    const int named = names_find(c->names, NAME_INSTANCE, thing);
    if (named == NAME_REJECTED) {
        return false; /* its own line was reported already */
    }
    if (count > 0) {
        unknown_quantity(sorts, count, thing, dot + 1, where, diagnostics);
    } else if (named == NAME_OF_BLOCK) {
        diagnostics_add(diagnostics, where, "name a part inside it, such as X1.M1.id",
                        "'%s' is the use of a block and has no quantities", thing);
    } else {
        unknown_thing(c, thing, where, diagnostics);
    }
    return false;
}

const struct quantity_row *probe_row(const struct circuit *c, const struct probe *probe)
{
    switch (probe->kind) {
    case PROBE_NODE:
        return &node_quantities[probe->quantity];
    case PROBE_RAIL:
        return &rail_quantities[probe->quantity];
    case PROBE_DEVICE:
        return &c->instances[probe->index].type->quantities[probe->quantity];
    case PROBE_OUTPUT:
        return &output_quantities[probe->quantity];
    case PROBE_ALL:
        return &all_quantities[probe->quantity];
    case PROBE_CELL:
        break;
    }
    return &cell_quantities[probe->quantity];
}

static bool value_knob(const struct circuit *c, int instance, int parameter, const char *name,
                       struct knob *knob)
{
    *knob = (struct knob){KNOB_VALUE, instance, parameter, name,
                          c->instances[instance].type->parameters[parameter].dimension};
    return true;
}

/* "M1.W": a parameter of a part. */
static bool part_knob(const struct circuit *c, const char *text, struct knob *knob)
{
    const char *dot = strrchr(text, '.');
    if (dot == NULL) {
        return false;
    }
    const char *thing = arena_copy(c->arena, text, (size_t)(dot - text));
    const int instance = thing == NULL ? -1 : circuit_find_instance(c, thing);
    if (instance < 0) {
        return false;
    }
    const struct device_type *type = c->instances[instance].type;
    const int p = parameter_find(type->parameters, type->parameter_count, dot + 1);
    return p >= 0 && type->parameters[p].when_absent != DEFAULT_HIDDEN &&
           value_knob(c, instance, p, text, knob);
}

/* "M1.W", "M1.L", ... for the part of a name "M1.w"; returns how many, at most `limit`. */
static int part_knob_names(const struct circuit *c, struct arena *arena, const char *text,
                           const char **list, int limit)
{
    const char *dot = strrchr(text, '.');
    const char *thing = dot == NULL ? NULL : arena_copy(arena, text, (size_t)(dot - text));
    const int instance = thing == NULL ? -1 : circuit_find_instance(c, thing);
    int count = 0;
    if (instance < 0) {
        return 0;
    }
    const struct device_type *type = c->instances[instance].type;
    for (int p = 0; p < type->parameter_count && count < limit; p++) {
        const struct parameter *row = &type->parameters[p];
        const char *name = row->when_absent == DEFAULT_HIDDEN
                               ? NULL
                               : arena_format(arena, "%s.%s", thing, row->name);
        if (name != NULL) {
            list[count++] = name;
        }
    }
    return count;
}

bool circuit_knob(const struct circuit *c, const char *name, struct span where,
                  struct diagnostics *diagnostics, struct knob *knob)
{
    const char *text = arena_copy(c->arena, name, strlen(name));
    if (text == NULL) {
        diagnostics->out_of_memory = true;
        return false;
    }
    if (strcmp(text, "temperature") == 0) {
        *knob = (struct knob){KNOB_TEMPERATURE, -1, -1, text, DIMENSION_TEMPERATURE};
        return true;
    }
    const int let = names_find(c->names, NAME_LET, text);
    if (let >= 0) {
        const struct quantity *value = &c->lets[let].value;
        *knob = (struct knob){KNOB_LET, -1, let, text, value->dimension};
        return true;
    }
    int index = circuit_find_rail(c, text);
    if (index >= 0) {
        const int held = c->rails[index].instance;
        return value_knob(c, held, c->instances[held].type->value_parameter, text, knob);
    }
    index = circuit_find_output(c, text);
    if (index >= 0) {
        const int held = c->outputs[index].instance;
        return value_knob(c, held, c->instances[held].type->value_parameter, text, knob);
    }
    index = circuit_find_instance(c, text);
    if (index >= 0 && c->instances[index].type->value_parameter >= 0) {
        return value_knob(c, index, c->instances[index].type->value_parameter, text, knob);
    }
    if (part_knob(c, text, knob)) {
        return true;
    }
    if (names_find(c->names, NAME_INSTANCE, text) == NAME_REJECTED) {
        return false;
    }
    if (index >= 0) {
        diagnostics_add(diagnostics, where, "name a parameter, such as M1.W",
                        "%s has no single value to turn", text);
        return false;
    }
    static const enum name_sort sorts[] = {NAME_LET, NAME_RAIL, NAME_OUTPUT, NAME_INSTANCE};
    const char *list[LIST_LIMIT];
    int count = part_knob_names(c, diagnostics->arena, text, list, LIST_LIMIT / 2);
    list[count++] = "temperature";
    for (size_t k = 0; k < sizeof sorts / sizeof sorts[0]; k++) {
        count += names_list(c->names, sorts[k], list + count, LIST_LIMIT - count);
    }
    diagnostics_add(diagnostics, where,
                    hint_near(diagnostics->arena, text, list, count,
                              "a rail, let, source, resistor, output, M1.W or temperature"),
                    "'%s' is nothing that can be turned", text);
    return false;
}
