/*
 * instances.c: nodes and instances, and the unknowns that they see.
 */
#include "circuit/build.h"

#include <stdio.h>
#include <string.h>

/* Room for one more node. */
static bool grow_nodes(struct builder *b)
{
    struct circuit *c = b->circuit;
    struct node *list =
        arena_grow(b->arena, c->nodes, c->node_count, &c->node_capacity, sizeof *list);
    if (list != NULL && list != c->nodes) {
        arena_give_back(b->arena, c->nodes);
        c->nodes = list;
    }
    return list != NULL;
}

int build_node(const struct frame *frame, const char *name, struct span where)
{
    struct builder *b = frame->builder;
    struct circuit *c = b->circuit;
    if (strcmp(name, "gnd") == 0) {
        return 0;
    }
    for (int k = 0; k < frame->pin_count; k++) {
        if (strcmp(frame->pins[k].text, name) == 0) {
            return frame->pin_nodes[k];
        }
    }
    char text[256]; /* a node is mentioned more often than made */
    const char *full = name;
    if (frame->prefix[0] != '\0') {
        const int length = snprintf(text, sizeof text, "%s%s", frame->prefix, name);
        const bool fits = length >= 0 && (size_t)length < sizeof text;
        full = fits ? text : arena_format(b->arena, "%s%s", frame->prefix, name);
    }
    const int index = full == NULL ? -1 : names_find(c->names, NAME_NODE, full);
    if (full == NULL || index >= 0) {
        return index;
    }
    full = full == text ? arena_copy(b->arena, text, strlen(text)) : full;
    if (full == NULL || !grow_nodes(b) || !names_add(c->names, NAME_NODE, full, c->node_count)) {
        return -1;
    }
    c->nodes[c->node_count] = (struct node){.name = full, .where = where};
    return c->node_count++;
}

int build_hidden_node(struct builder *b, const char *part, const char *terminal, struct span where)
{
    struct circuit *c = b->circuit;
    const char *name = arena_format(b->arena, "%s.%s (inner)", part, terminal);
    if (name == NULL || !grow_nodes(b)) {
        return -1;
    }
    c->nodes[c->node_count] = (struct node){.name = name, .where = where, .is_hidden = true};
    return c->node_count++;
}

struct instance *build_bare_instance(struct builder *b, const char *name,
                                     const struct device_type *type, struct span where)
{
    struct circuit *c = b->circuit;
    struct instance *list =
        arena_grow(b->arena, c->instances, c->instance_count, &c->instance_capacity, sizeof *list);
    if (list == NULL) {
        return NULL;
    }
    if (list != c->instances) {
        arena_give_back(b->arena, c->instances);
    }
    c->instances = list;
    struct instance *instance = &list[c->instance_count++];
    *instance = (struct instance){.name = name, .type = type, .parent = -1, .where = where};
    return instance;
}

struct instance *build_instance(struct builder *b, const char *name, const struct device_type *type,
                                struct span where)
{
    struct instance *instance = build_bare_instance(b, name, type, where);
    if (instance == NULL) {
        return NULL;
    }
    instance->own = arena_new_array(b->arena, double, type->parameter_count);
    instance->given = arena_new_array(b->arena, bool, type->parameter_count);
    if (instance->own == NULL || instance->given == NULL) {
        return NULL;
    }
    for (int p = 0; p < type->parameter_count; p++) {
        const struct parameter *row = &type->parameters[p];
        instance->own[p] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    return instance;
}

/*
 * Unknowns of an instance: local terminals (perhaps hidden nodes), law inputs, then branches, whose
 * numbers are counted from 0 here and moved behind the nodes when all nodes are known
 * (build_finish_unknowns).
 */
bool build_join(struct builder *b, struct instance *instance, const int *outer, const int *local,
                const int *inputs, int input_count)
{
    const struct device_type *type = instance->type;
    const int terminals = type->terminal_count;
    instance->local_count = terminals + input_count + type->branch_count;
    instance->outer = arena_new_array(b->arena, int, terminals);
    instance->local = arena_new_array(b->arena, int, instance->local_count);
    if (instance->outer == NULL || instance->local == NULL) {
        return false;
    }
    for (int t = 0; t < terminals; t++) {
        /* NOLINTNEXTLINE(clang-analyzer-core.CallAndMessage): callers give all terminals */
        instance->outer[t] = node_unknown(outer[t]);
        instance->local[t] = node_unknown(local[t]);
    }
    for (int k = 0; k < input_count; k++) {
        instance->local[terminals + k] = node_unknown(inputs[k]);
    }
    for (int k = 0; k < type->branch_count; k++) {
        instance->local[terminals + input_count + k] = b->circuit->branch_count++;
    }
    return true;
}

void build_finish_unknowns(struct circuit *c)
{
    const int nodes = c->node_count - 1;
    for (int k = 0; k < c->instance_count; k++) {
        struct instance *instance = &c->instances[k];
        const int branches = instance->type->branch_count;
        for (int l = instance->local_count - branches; l < instance->local_count; l++) {
            instance->local[l] += nodes;
        }
    }
    c->unknown_count = nodes + c->branch_count;
}

int build_holder(struct builder *b, const char *name, int node, double volts, struct span where)
{
    const struct device_type *type = device_find("voltage");
    struct instance *instance = build_instance(b, name, type, where);
    const int nodes[2] = {node, 0};
    if (instance == NULL || !build_join(b, instance, nodes, nodes, NULL, 0)) {
        return -1;
    }
    instance->is_hidden = true;
    instance->own[type->value_parameter] = volts;
    return b->circuit->instance_count - 1;
}

bool build_name_is_new(struct builder *b, const char *name, struct span where)
{
    /* The names of blocks and of rejected parts are taken, too. */
    if (names_find(b->circuit->names, NAME_INSTANCE, name) == -1) {
        return true;
    }
    diagnostics_add(b->diagnostics, where, "give it another name", "there are two '%s'", name);
    return false;
}
