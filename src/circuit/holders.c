/*
 * holders.c: rails and outputs: nodes that an ideal voltage holds.
 */
#include "circuit/build.h"

#include <string.h>

static bool add_rail(const struct frame *top, const struct statement *statement)
{
    struct builder *b = top->builder;
    struct circuit *c = b->circuit;
    const char *name = statement->name.text;
    struct expression_scope scope = frame_scope(top);
    double volts = 1;
    expression_wanted(statement->value, &scope, DIMENSION_VOLTAGE, b->diagnostics, &volts);
    if (strcmp(name, "gnd") == 0 || names_find(c->names, NAME_RAIL, name) >= 0) {
        diagnostics_add(b->diagnostics, statement->name.span, NULL,
                        strcmp(name, "gnd") == 0 ? "gnd is 0 V already and cannot be a rail"
                                                 : "there are two rails at one node");
        return true;
    }
    const int node = build_node(top, name, statement->name.span);
    struct rail *list =
        arena_grow(b->arena, c->rails, c->rail_count, &c->rail_capacity, sizeof *list);
    const int instance =
        node < 0 || list == NULL ? -1 : build_holder(b, name, node, volts, statement->name.span);
    if (instance < 0 || !names_add(c->names, NAME_RAIL, name, c->rail_count)) {
        return false;
    }
    c->rails = list;
    list[c->rail_count++] = (struct rail){.name = name,
                                          .unknown = node_unknown(node),
                                          .instance = instance,
                                          .volts = volts,
                                          .where = statement->name.span};
    return true;
}

static bool add_output(const struct frame *top, const struct statement *statement)
{
    struct builder *b = top->builder;
    struct circuit *c = b->circuit;
    struct expression_scope scope = frame_scope(top);
    struct output out = {
        .name = statement->name.text, .within = 0.01, .where = statement->name.span};
    /* all three, so that each error is told */
    bool good =
        expression_wanted(statement->at, &scope, DIMENSION_VOLTAGE, b->diagnostics, &out.at);
    good =
        expression_wanted(statement->from, &scope, DIMENSION_VOLTAGE, b->diagnostics, &out.from) &&
        good;
    good = expression_wanted(statement->to, &scope, DIMENSION_VOLTAGE, b->diagnostics, &out.to) &&
           good;
    if (statement->within != NULL &&
        expression_share(statement->within, &scope, b->diagnostics, &out.within) &&
        !(out.within > 0 && out.within < 1)) {
        diagnostics_add(b->diagnostics, statement->within->span, "within 1%",
                        "the band of an output lies between 0 and 100 %%");
    }
    if (out.from > out.to) {
        const double turned = out.from;
        out.from = out.to;
        out.to = turned;
    }
    if (good && !(out.from < out.to)) {
        diagnostics_add(b->diagnostics, statement->to->span, NULL,
                        "the sweep of an output needs two different voltages");
    } else if (good && !(out.at >= out.from && out.at <= out.to)) {
        diagnostics_add(b->diagnostics, statement->at->span, "move `at`, or widen from ... to",
                        "the voltage at which output '%s' is judged lies outside its sweep",
                        out.name);
    }
    if (strcmp(out.name, "gnd") == 0 || names_find(c->names, NAME_OUTPUT, out.name) >= 0) {
        diagnostics_add(b->diagnostics, statement->name.span, NULL,
                        strcmp(out.name, "gnd") == 0 ? "gnd cannot be an output"
                                                     : "there are two outputs at one node");
        return true;
    }
    const int node = build_node(top, out.name, out.where);
    struct output *list =
        arena_grow(b->arena, c->outputs, c->output_count, &c->output_capacity, sizeof *list);
    out.instance =
        node < 0 || list == NULL ? -1 : build_holder(b, out.name, node, out.at, out.where);
    if (out.instance < 0 || !names_add(c->names, NAME_OUTPUT, out.name, c->output_count)) {
        return false;
    }
    out.unknown = node_unknown(node);
    c->outputs = list;
    list[c->output_count++] = out;
    return true;
}

static bool add_all(struct builder *b, enum statement_kind kind,
                    bool (*add)(const struct frame *top, const struct statement *statement))
{
    const struct frame top = {.builder = b, .prefix = ""};
    const struct tree *tree = &b->cell->tree;
    for (int k = 0; k < tree->count; k++) {
        const struct statement *statement = tree->statements[k];
        if (statement->kind == kind && !add(&top, statement)) {
            return false;
        }
    }
    return true;
}

bool build_rails(struct builder *b)
{
    return add_all(b, STATEMENT_RAIL, add_rail);
}

bool build_outputs(struct builder *b)
{
    return add_all(b, STATEMENT_OUTPUT, add_output);
}
