/*
 * parts.c: rails, parts and uses of blocks to nodes and instances.
 */
#include "circuit/build.h"

#include <stdio.h>
#include <string.h>

#include "devices/law.h"
#include "devices/series.h"
#include "language/parser.h"

enum { TERMINAL_LIMIT = 6 };

/* A part line on its way to an instance. */
struct part {
    const struct frame *frame;
    const struct statement *statement;
    const struct device_type *type;
    const char *name;          /* with the prefix of its block */
    int nodes[TERMINAL_LIMIT]; /* -1: not joined yet */
    double *own;
    bool *given;
    bool *wrong; /* reported: no second message about it */
    const struct model *model;
    bool model_named;
};

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
    const char *full =
        frame->prefix[0] == '\0' ? name : arena_format(b->arena, "%s%s", frame->prefix, name);
    int index = full == NULL ? -1 : names_find(c->names, NAME_NODE, full);
    if (full == NULL || index >= 0) {
        return index;
    }
    struct node *list =
        arena_grow(b->arena, c->nodes, c->node_count, &c->node_capacity, sizeof *list);
    if (list == NULL || !names_add(c->names, NAME_NODE, full, c->node_count)) {
        return -1;
    }
    c->nodes = list;
    index = c->node_count++;
    list[index] = (struct node){.name = full, .where = where};
    return index;
}

static int hidden_node(struct builder *b, const char *part, const char *terminal, struct span where)
{
    struct circuit *c = b->circuit;
    struct node *list =
        arena_grow(b->arena, c->nodes, c->node_count, &c->node_capacity, sizeof *list);
    const char *name = arena_format(b->arena, "%s.%s (inner)", part, terminal);
    if (list == NULL || name == NULL) {
        return -1;
    }
    c->nodes = list;
    list[c->node_count] = (struct node){.name = name, .where = where, .is_hidden = true};
    return c->node_count++;
}

static struct instance *new_instance(struct builder *b, const char *name,
                                     const struct device_type *type, struct span where)
{
    struct circuit *c = b->circuit;
    struct instance *list =
        arena_grow(b->arena, c->instances, c->instance_count, &c->instance_capacity, sizeof *list);
    if (list == NULL) {
        return NULL;
    }
    c->instances = list;
    struct instance *instance = &list[c->instance_count++];
    *instance = (struct instance){.name = name, .type = type, .parent = -1, .where = where};
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
 * (finish_unknowns).
 */
static bool join(struct builder *b, struct instance *instance, const int *outer, const int *local,
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

static void finish_unknowns(struct circuit *c)
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
    struct instance *instance = new_instance(b, name, type, where);
    const int nodes[2] = {node, 0};
    if (instance == NULL || !join(b, instance, nodes, nodes, NULL, 0)) {
        return -1;
    }
    instance->is_hidden = true;
    instance->own[type->value_parameter] = volts;
    return b->circuit->instance_count - 1;
}

/* "an nmos", "a pmos". */
static const char *article(const struct device_type *type)
{
    return strchr("aeino", type->word[0]) != NULL ? "an" : "a";
}

/* --- parts --------------------------------------------------------------------------------- */

static void unknown_word(struct builder *b, const struct statement *statement)
{
    int count = 0;
    for (int k = 0; k < device_type_count; k++) {
        b->known[count++] = device_types[k]->word;
    }
    const char *const *words;
    const int word_count = parser_statement_words(TREE_CELL, &words);
    for (int k = 0; k < word_count; k++) {
        b->known[count++] = words[k];
    }
    const char *near = near_name(statement->type.text, b->known, count);
    diagnostics_add(b->diagnostics, statement->type.span,
                    near == NULL ? "docs/language.md lists the statements"
                                 : arena_format(b->arena, "did you mean '%s'?", near),
                    "'%s' is neither a statement nor a device", statement->type.text);
}

static const struct device_type *part_type(struct builder *b, const struct statement *statement)
{
    const struct device_type *type = device_find(statement->type.text);
    if (type == NULL) {
        unknown_word(b, statement);
        return NULL;
    }
    for (int k = 0; type->alternative != NULL && k < statement->assignment_count; k++) {
        if (strcmp(statement->assignments[k].key.text, type->alternative_key) == 0) {
            return type->alternative;
        }
    }
    return type;
}

static int find_terminal(const struct device_type *type, const char *key)
{
    for (int t = 0; type->form == FORM_PINS && t < type->terminal_count; t++) {
        if (strcmp(type->terminals[t].name, key) == 0) {
            return t;
        }
    }
    return -1;
}

/* Whether a value names a value (let, unit) rather than a node: for keys that may be either. */
static bool is_value(const struct part *part, const struct expression *e)
{
    if (e->kind != EXPRESSION_NAME) {
        return true;
    }
    struct expression_scope scope = frame_scope(part->frame);
    struct quantity ignored;
    return scope.find(scope.self, e->name, e->span, &ignored);
}

static bool set_terminal(struct part *part, int t, const struct assignment *a)
{
    struct builder *b = part->frame->builder;
    if (part->nodes[t] >= 0) {
        diagnostics_add(b->diagnostics, a->key.span, NULL, "terminal %s is joined twice",
                        a->key.text);
        return true;
    }
    if (a->value->kind != EXPRESSION_NAME) {
        diagnostics_add(b->diagnostics, a->value->span, NULL,
                        "terminal %s wants the name of a node", a->key.text);
        part->nodes[t] = 0;
        return true;
    }
    part->nodes[t] = build_node(part->frame, a->value->name, a->value->span);
    return part->nodes[t] >= 0;
}

static void set_model(struct part *part, const struct assignment *a)
{
    struct builder *b = part->frame->builder;
    struct circuit *c = b->circuit;
    part->model_named = true;
    if (part->type->model_kind == NULL || a->value->kind != EXPRESSION_NAME) {
        diagnostics_add(b->diagnostics,
                        part->type->model_kind == NULL ? a->key.span : a->value->span, NULL,
                        part->type->model_kind == NULL ? "%s %s has no model"
                                                       : "%s %s wants the name of a model",
                        article(part->type), part->type->word);
        return;
    }
    const int m = names_find(c->names, NAME_MODEL, a->value->name);
    if (m < 0 && b->process_missing) {
        return; /* reported with the process */
    }
    if (m < 0) {
        int count = 0;
        for (int k = 0; k < c->model_count && count < LIST_LIMIT; k++) {
            if (strcmp(c->models[k].type->model_kind, part->type->model_kind) == 0) {
                b->known[count++] = c->models[k].name;
            }
        }
        const char *near = near_name(a->value->name, b->known, count);
        diagnostics_add(b->diagnostics, a->value->span,
                        near != NULL ? arena_format(b->arena, "did you mean '%s'?", near)
                        : count > 0  ? arena_format(b->arena, "there is '%s'", b->known[0])
                                     : "no model of this kind is known: name a process",
                        "there is no model '%s'", a->value->name);
    } else if (strcmp(c->models[m].type->model_kind, part->type->model_kind) != 0) {
        diagnostics_add(b->diagnostics, a->value->span, NULL,
                        "model '%s' is of kind %s; %s %s needs one of kind %s", c->models[m].name,
                        c->models[m].type->model_kind, article(part->type), part->type->word,
                        part->type->model_kind);
    } else {
        part->model = &c->models[m];
    }
}

static void unknown_key(const struct part *part, const struct word *key)
{
    struct builder *b = part->frame->builder;
    const struct device_type *type = part->type;
    int count = 0;
    for (int t = 0; type->form == FORM_PINS && t < type->terminal_count; t++) {
        b->known[count++] = type->terminals[t].name;
    }
    for (int p = 0; p < type->parameter_count; p++) {
        if (type->parameters[p].when_absent != DEFAULT_HIDDEN && p != type->value_parameter) {
            b->known[count++] = type->parameters[p].name;
        }
    }
    if (type->model_kind != NULL) {
        b->known[count++] = "model";
    }
    if (type->extra_kind == EXTRA_LAW) {
        b->known[count++] = "i";
    }
    const char *near = near_name(key->text, b->known, count);
    const char *hint = near == NULL ? NULL : arena_format(b->arena, "did you mean '%s'?", near);
    if (near == NULL) {
        struct buffer list = BUFFER_EMPTY;
        for (int k = 0; k < count; k++) {
            buffer_format(&list, "%s%s", k == 0 ? "known: " : ", ", b->known[k]);
        }
        hint = list.length == 0 ? "it takes none" : arena_copy(b->arena, list.data, list.length);
        buffer_free(&list);
    }
    diagnostics_add(b->diagnostics, key->span, hint, "%s %s has no parameter '%s'", article(type),
                    type->word, key->text);
}

static void set_parameter(struct part *part, int p, const struct expression *value,
                          struct span where)
{
    struct builder *b = part->frame->builder;
    const struct parameter *row = &part->type->parameters[p];
    if (part->given[p]) {
        diagnostics_add(b->diagnostics, where, NULL, "%s is given twice", row->name);
        return;
    }
    struct expression_scope scope = frame_scope(part->frame);
    frame_names(part->frame, &scope);
    part->given[p] = build_parameter(row, value, &scope, b->diagnostics, &part->own[p]);
    part->wrong[p] = !part->given[p];
}

/* "a=x" where "x -> y" is wanted: read_arrow tells it. */
static bool is_arrow_end(const struct part *part, const char *key)
{
    const struct device_type *type = part->type;
    return type->form == FORM_ARROW && part->statement->node_from.text == NULL &&
           (strcmp(type->terminals[0].name, key) == 0 || strcmp(type->terminals[1].name, key) == 0);
}

static bool read_assignments(struct part *part)
{
    const struct device_type *type = part->type;
    const struct statement *statement = part->statement;
    for (int k = 0; k < statement->assignment_count; k++) {
        const struct assignment *a = &statement->assignments[k];
        const int t = find_terminal(type, a->key.text);
        int p = parameter_find(type->parameters, type->parameter_count, a->key.text);
        if (p >= 0 && type->parameters[p].when_absent == DEFAULT_HIDDEN) {
            p = -1;
        }
        if (a->value == NULL) {
            if (t >= 0) {
                part->nodes[t] = 0;
            } else if (p >= 0) {
                part->wrong[p] = true;
            }
        } else if (t >= 0 && (p < 0 || !is_value(part, a->value))) {
            if (!set_terminal(part, t, a)) {
                return false;
            }
        } else if (p >= 0 && p != type->value_parameter) {
            set_parameter(part, p, a->value, a->key.span);
        } else if (strcmp(a->key.text, "model") == 0) {
            set_model(part, a);
        } else if (!is_arrow_end(part, a->key.text) &&
                   !(type->extra_kind == EXTRA_LAW && strcmp(a->key.text, "i") == 0)) {
            unknown_key(part, &a->key);
        }
    }
    return true;
}

static bool read_arrow(struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct statement *statement = part->statement;
    const struct device_type *type = part->type;
    const bool has_arrow = statement->node_from.text != NULL && statement->node_to.text != NULL;
    if (type->form == FORM_ARROW && !has_arrow) {
        diagnostics_add(
            b->diagnostics, statement->name.span,
            arena_format(b->arena, "%s %s %s -> %s ...", type->word, statement->name.text,
                         type->terminals[0].name, type->terminals[1].name),
            "%s %s stands between two nodes joined by an arrow", article(type), type->word);
        part->nodes[0] = part->nodes[1] = 0;
    } else if (type->form == FORM_PINS && has_arrow) {
        diagnostics_add(b->diagnostics, statement->node_from.span,
                        "write each terminal as name=node", "%s %s has no arrow", article(type),
                        type->word);
    } else if (has_arrow) {
        part->nodes[0] =
            build_node(part->frame, statement->node_from.text, statement->node_from.span);
        part->nodes[1] = build_node(part->frame, statement->node_to.text, statement->node_to.span);
        return part->nodes[0] >= 0 && part->nodes[1] >= 0;
    }
    return true;
}

static void read_value(struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct statement *statement = part->statement;
    const int p = part->type->value_parameter;
    if (statement->value != NULL && p >= 0) {
        set_parameter(part, p, statement->value, statement->value->span);
    } else if (statement->value != NULL) {
        diagnostics_add(b->diagnostics, statement->value->span, "write parameters as name=value",
                        "%s %s takes no value here", article(part->type), part->type->word);
    }
    if (statement->text != NULL && part->type->extra_kind != EXTRA_CURVE) {
        diagnostics_add(b->diagnostics, statement->text_span, NULL, "%s %s takes no file",
                        article(part->type), part->type->word);
    }
}

/* The one positive rail for a p-channel bulk; -1 after an error. */
static int positive_rail(const struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct circuit *c = b->circuit;
    int found = -1;
    for (int k = 0; k < c->rail_count; k++) {
        if (c->rails[k].volts > 0) {
            if (found >= 0) {
                diagnostics_add(b->diagnostics, part->statement->name.span, "add b=NODE",
                                "the bulk of %s must be given: rails '%s' and '%s' are both "
                                "positive",
                                part->name, c->rails[found].name, c->rails[k].name);
                return -1;
            }
            found = k;
        }
    }
    if (found < 0) {
        diagnostics_add(b->diagnostics, part->statement->name.span, "add b=NODE",
                        "the bulk of %s must be given: there is no positive rail", part->name);
        return -1;
    }
    return c->rails[found].unknown + 1;
}

static void default_terminals(struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct device_type *type = part->type;
    const bool wrong_form = type->form == FORM_PINS && part->statement->node_from.text != NULL;
    for (int t = 0; t < type->terminal_count; t++) {
        const struct terminal *row = &type->terminals[t];
        if (part->nodes[t] >= 0) {
            continue;
        }
        part->nodes[t] = 0;
        if (wrong_form) {
            continue; /* reported by read_arrow */
        }
        const int p = parameter_find(type->parameters, type->parameter_count, row->name);
        if (p >= 0 && !part->given[p] && !part->wrong[p]) { /* a limit of an opamp */
            diagnostics_add(b->diagnostics, part->statement->name.span,
                            arena_format(b->arena, "add %s=VALUE or %s=NODE", row->name, row->name),
                            "%s leaves out '%s'", part->name, row->name);
        }
        if (!row->optional) {
            diagnostics_add(b->diagnostics, part->statement->name.span,
                            arena_format(b->arena, "add %s=NODE (%s)", row->name, row->text),
                            "%s leaves out its terminal %s", part->name, row->name);
        } else if (row->joined_to != NULL && strcmp(row->joined_to, "gnd") != 0) {
            part->nodes[t] = part->nodes[find_terminal(type, row->joined_to)];
        } else if (row->joined_to == NULL && type->polarity < 0) {
            const int node = positive_rail(part);
            part->nodes[t] = node < 0 ? 0 : node;
        }
    }
}

static void required_values(const struct part *part)
{
    struct builder *b = part->frame->builder;
    for (int p = 0; p < part->type->parameter_count; p++) {
        const struct parameter *row = &part->type->parameters[p];
        if (row->when_absent == DEFAULT_REQUIRED && !part->given[p] && !part->wrong[p]) {
            diagnostics_add(b->diagnostics, part->statement->name.span,
                            p == part->type->value_parameter
                                ? "write it after the nodes"
                                : arena_format(b->arena, "add %s=... (%s)", row->name, row->text),
                            "%s needs a value for '%s'", part->name, row->name);
        }
    }
}

/* The default model of a kind: the only one, or the one that is named like the kind. */
static void default_model(struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct circuit *c = b->circuit;
    const char *kind = part->type->model_kind;
    if (kind == NULL || part->model_named) {
        return;
    }
    int found = -1, count = 0;
    for (int m = 0; m < c->model_count; m++) {
        if (strcmp(c->models[m].type->model_kind, kind) == 0) {
            if (strcmp(c->models[m].name, kind) == 0) {
                part->model = &c->models[m];
                return;
            }
            found = m;
            count++;
        }
    }
    if (count == 1) {
        part->model = &c->models[found];
    } else if (count > 1) {
        diagnostics_add(
            b->diagnostics, part->statement->name.span,
            arena_format(b->arena, "add model=NAME, such as model=%s", c->models[found].name),
            "%s must name its model: %d of kind %s are known", part->name, count, kind);
    } else if (!part->type->model_optional && !b->process_missing) {
        diagnostics_add(b->diagnostics, part->statement->name.span,
                        "name a process, or write a model in the cell",
                        "%s has no model: none of kind %s is known", part->name, kind);
    }
}

static const double *model_values(struct builder *b, const struct part *part)
{
    const struct device_type *type = part->type;
    if (part->model != NULL || type->model_kind == NULL) {
        return part->model == NULL ? NULL : part->model->values;
    }
    double *values = arena_new_array(b->arena, double, type->model_parameter_count);
    for (int p = 0; values != NULL && p < type->model_parameter_count; p++) {
        const struct parameter *row = &type->model_parameters[p];
        values[p] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    return values;
}

/* Series resistances of the model: a hidden node and a hidden branch each. */
static bool add_series(struct builder *b, const struct part *part, const double *model,
                       const int *outer, int *local, int parent)
{
    const struct device_type *type = part->type;
    const int area = parameter_find(type->parameters, type->parameter_count, "area");
    const int many = parameter_find(type->parameters, type->parameter_count, "m");
    for (int k = 0; k < type->series_count; k++) {
        const struct series_row *row = &type->series[k];
        const int p = parameter_find(type->model_parameters, type->model_parameter_count,
                                     row->model_parameter);
        if (!(model[p] > 0)) {
            continue;
        }
        const char *terminal = type->terminals[row->terminal].name;
        const int node = hidden_node(b, part->name, terminal, part->statement->name.span);
        const char *name = arena_format(b->arena, "%s.%s", part->name, row->model_parameter);
        struct instance *series =
            node < 0 || name == NULL
                ? NULL
                : new_instance(b, name, &device_series, part->statement->name.span);
        const int ends[2] = {outer[row->terminal], node};
        if (series == NULL || !join(b, series, ends, ends, NULL, 0)) {
            return false;
        }
        series->own[0] =
            model[p] / ((area < 0 ? 1 : part->own[area]) * (many < 0 ? 1 : part->own[many]));
        series->is_hidden = true;
        series->parent = parent;
        local[row->terminal] = node;
    }
    return true;
}

static bool add_extra(struct part *part, const void **extra, int **inputs, int *input_count)
{
    struct builder *b = part->frame->builder;
    const struct statement *statement = part->statement;
    if (part->type->extra_kind == EXTRA_CURVE) {
        *extra = build_curve(part->frame, statement);
        return *extra != NULL;
    }
    if (part->type->extra_kind != EXTRA_LAW) {
        return true;
    }
    for (int k = 0; k < statement->assignment_count; k++) {
        const struct assignment *a = &statement->assignments[k];
        if (strcmp(a->key.text, "i") == 0 && a->value != NULL) {
            const struct law_program *program = build_law(part->frame, a->value, inputs);
            *extra = program;
            *input_count = program == NULL ? 0 : program->input_count;
            return program != NULL;
        }
    }
    diagnostics_add(b->diagnostics, statement->name.span, "add i = EXPRESSION",
                    "%s needs the expression of its current", part->name);
    return false;
}

static bool make_instance(struct part *part)
{
    struct builder *b = part->frame->builder;
    struct circuit *c = b->circuit;
    const void *extra = NULL;
    int *inputs = NULL, input_count = 0;
    if (!add_extra(part, &extra, &inputs, &input_count)) {
        return !arena_failed(b->arena);
    }
    const double *model = model_values(b, part);
    if (model == NULL && part->type->model_kind != NULL) {
        return false;
    }
    const struct device_values values = {part->own, model, extra, c->resistor_factor};
    const char *wrong = part->type->check == NULL ? NULL : part->type->check(&values);
    if (wrong != NULL) {
        diagnostics_add(b->diagnostics, part->statement->name.span, NULL, "%s: %s", part->name,
                        wrong);
        return true;
    }
    struct instance *instance = new_instance(b, part->name, part->type, part->statement->name.span);
    if (instance == NULL) {
        return false;
    }
    const int index = c->instance_count - 1;
    memcpy(instance->own, part->own, (size_t)part->type->parameter_count * sizeof *part->own);
    memcpy(instance->given, part->given, (size_t)part->type->parameter_count);
    instance->model = part->model;
    instance->model_values = model;
    instance->extra = extra;
    int local[TERMINAL_LIMIT];
    memcpy(local, part->nodes, sizeof local);
    if (!add_series(b, part, model, part->nodes, local, index)) {
        return false;
    }
    return join(b, &c->instances[index], part->nodes, local, inputs, input_count);
}

static bool new_name(struct builder *b, const char *name, struct span where, bool *is_new)
{
    const int before = names_find(b->circuit->names, NAME_INSTANCE, name);
    *is_new = before == -1; /* the names of blocks and of rejected parts are taken, too */
    if (!*is_new) {
        diagnostics_add(b->diagnostics, where, "give it another name", "there are two '%s'", name);
    }
    return true;
}

static bool add_part(const struct frame *frame, const struct statement *statement)
{
    struct builder *b = frame->builder;
    const struct device_type *type = part_type(b, statement);
    if (type == NULL || statement->name.text == NULL) {
        return true;
    }
    struct part part = {.frame = frame, .statement = statement, .type = type};
    part.name = frame->prefix[0] == '\0'
                    ? statement->name.text
                    : arena_format(b->arena, "%s%s", frame->prefix, statement->name.text);
    part.own = arena_new_array(b->arena, double, type->parameter_count);
    part.given = arena_new_array(b->arena, bool, type->parameter_count);
    part.wrong = arena_new_array(b->arena, bool, type->parameter_count);
    if (part.name == NULL || part.own == NULL || part.given == NULL || part.wrong == NULL) {
        return false;
    }
    for (int p = 0; p < type->parameter_count; p++) {
        const struct parameter *row = &type->parameters[p];
        part.own[p] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    for (int t = 0; t < TERMINAL_LIMIT; t++) {
        part.nodes[t] = -1;
    }
    bool is_new;
    const int errors = b->diagnostics->count;
    if (!new_name(b, part.name, statement->name.span, &is_new) || !read_arrow(&part) ||
        !read_assignments(&part)) {
        return false;
    }
    read_value(&part);
    default_terminals(&part);
    required_values(&part);
    default_model(&part);
    if (!is_new) {
        return true;
    }
    const int index = b->circuit->instance_count;
    if (b->diagnostics->count == errors && !make_instance(&part)) {
        return false;
    }
    return names_add(b->circuit->names, NAME_INSTANCE, part.name,
                     index < b->circuit->instance_count ? index : NAME_REJECTED);
}

/* --- blocks -------------------------------------------------------------------------------- */

static bool add_use(const struct frame *outer, const struct statement *use);

static bool add_body(const struct frame *frame, struct statement *const *body, int count)
{
    for (int k = 0; k < count; k++) {
        const struct statement *statement = body[k];
        if (statement->kind == STATEMENT_PART && !add_part(frame, statement)) {
            return false;
        }
        if (statement->kind == STATEMENT_USE && !add_use(frame, statement)) {
            return false;
        }
    }
    return true;
}

static bool keep_value(struct frame *frame, const char *name, struct quantity value,
                       struct span where)
{
    struct builder *b = frame->builder;
    struct let_value *list = arena_grow(b->arena, frame->values, frame->value_count,
                                        &frame->value_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    frame->values = list;
    list[frame->value_count++] = (struct let_value){.name = name, .value = value, .where = where};
    return true;
}

static const struct assignment *find_assignment(const struct statement *statement, const char *key)
{
    for (int k = 0; k < statement->assignment_count; k++) {
        if (strcmp(statement->assignments[k].key.text, key) == 0) {
            return &statement->assignments[k];
        }
    }
    return NULL;
}

/* Parameters of a block: the defaults, replaced by what the use says; then its lets. */
static bool block_values(struct frame *frame, const struct frame *outer,
                         const struct statement *block, const struct statement *use)
{
    struct builder *b = frame->builder;
    struct expression_scope scope = frame_scope(outer);
    for (int k = 0; k < block->assignment_count; k++) {
        const struct assignment *standard = &block->assignments[k];
        const struct assignment *given = find_assignment(use, standard->key.text);
        const struct expression *e = given != NULL ? given->value : standard->value;
        struct quantity value = {.value = 1, .bare = true};
        if (e != NULL) {
            frame_names(outer, &scope);
            expression_value(e, &scope, b->diagnostics, &value);
        }
        if (!keep_value(frame, standard->key.text, value, standard->key.span)) {
            return false;
        }
    }
    struct expression_scope inner = frame_scope(frame);
    for (int k = 0; k < block->body_count; k++) {
        const struct statement *let = block->body[k];
        if (let->kind == STATEMENT_LET && let->value != NULL && let->name.text != NULL) {
            struct quantity value = {.value = 1, .bare = true};
            frame_names(frame, &inner);
            expression_value(let->value, &inner, b->diagnostics, &value);
            if (!keep_value(frame, let->name.text, value, let->name.span)) {
                return false;
            }
        }
    }
    return true;
}

static bool block_pins(const struct frame *outer, const struct statement *block,
                       const struct statement *use, int *nodes)
{
    struct builder *b = outer->builder;
    for (int k = 0; k < block->word_count; k++) {
        const struct assignment *a = find_assignment(use, block->words[k].text);
        nodes[k] = 0;
        if (a == NULL) {
            diagnostics_add(b->diagnostics, use->name.span,
                            arena_format(b->arena, "add %s=NODE", block->words[k].text),
                            "%s leaves out pin '%s' of block %s", use->name.text,
                            block->words[k].text, block->name.text);
        } else if (a->value != NULL && a->value->kind != EXPRESSION_NAME) {
            diagnostics_add(b->diagnostics, a->value->span, NULL, "pin %s wants the name of a node",
                            a->key.text);
        } else if (a->value != NULL) {
            nodes[k] = build_node(outer, a->value->name, a->value->span);
            if (nodes[k] < 0) {
                return false;
            }
        }
    }
    for (int k = 0; k < use->assignment_count; k++) {
        const struct assignment *a = &use->assignments[k];
        bool known = find_assignment(block, a->key.text) != NULL;
        int count = 0;
        for (int p = 0; p < block->word_count && count < LIST_LIMIT; p++) {
            known |= strcmp(block->words[p].text, a->key.text) == 0;
            b->known[count++] = block->words[p].text;
        }
        for (int p = 0; p < block->assignment_count && count < LIST_LIMIT; p++) {
            b->known[count++] = block->assignments[p].key.text;
        }
        if (!known) {
            const char *near = near_name(a->key.text, b->known, count);
            diagnostics_add(b->diagnostics, a->key.span,
                            near == NULL ? NULL
                                         : arena_format(b->arena, "did you mean '%s'?", near),
                            "block %s has no pin or parameter '%s'", block->name.text, a->key.text);
        }
    }
    return true;
}

static const struct statement *find_block(struct builder *b, const struct word *name)
{
    const int index = names_find(b->circuit->names, NAME_BLOCK, name->text);
    if (index >= 0) {
        return b->blocks[index].statement;
    }
    const int count = names_list(b->circuit->names, NAME_BLOCK, b->known, LIST_LIMIT);
    const char *near = near_name(name->text, b->known, count);
    diagnostics_add(b->diagnostics, name->span,
                    near == NULL ? NULL : arena_format(b->arena, "did you mean '%s'?", near),
                    "there is no block '%s'", name->text);
    return NULL;
}

static bool add_use(const struct frame *outer, const struct statement *use)
{
    struct builder *b = outer->builder;
    if (use->name.text == NULL || use->type.text == NULL) {
        return true;
    }
    const struct statement *block = find_block(b, &use->type);
    if (block == NULL) {
        return true;
    }
    if (outer->depth >= BLOCK_DEPTH_LIMIT) {
        diagnostics_add(b->diagnostics, use->name.span, NULL,
                        "blocks that use blocks are nested deeper than %d (does %s use itself?)",
                        BLOCK_DEPTH_LIMIT, block->name.text);
        return true;
    }
    struct frame frame = {.builder = b,
                          .outer = outer,
                          .pins = block->words,
                          .pin_count = block->word_count,
                          .depth = outer->depth + 1};
    const char *name = arena_format(b->arena, "%s%s", outer->prefix, use->name.text);
    frame.prefix = name == NULL ? NULL : arena_format(b->arena, "%s.", name);
    int *nodes = arena_new_array(b->arena, int, block->word_count);
    bool is_new;
    if (frame.prefix == NULL || nodes == NULL || !new_name(b, name, use->name.span, &is_new) ||
        !block_pins(outer, block, use, nodes)) {
        return false;
    }
    if (!is_new) {
        return true;
    }
    frame.pin_nodes = nodes;
    return names_add(b->circuit->names, NAME_INSTANCE, name, NAME_OF_BLOCK) &&
           block_values(&frame, outer, block, use) &&
           add_body(&frame, block->body, block->body_count);
}

static bool collect_blocks(struct builder *b)
{
    for (int k = 0; k < b->cell->tree.count; k++) {
        const struct statement *statement = b->cell->tree.statements[k];
        if (statement->kind != STATEMENT_BLOCK || statement->name.text == NULL) {
            continue;
        }
        if (names_find(b->circuit->names, NAME_BLOCK, statement->name.text) >= 0) {
            diagnostics_add(b->diagnostics, statement->name.span, "give it another name",
                            "there are two blocks called '%s'", statement->name.text);
            continue;
        }
        struct block_entry *list =
            arena_grow(b->arena, b->blocks, b->block_count, &b->block_capacity, sizeof *list);
        if (list == NULL ||
            !names_add(b->circuit->names, NAME_BLOCK, statement->name.text, b->block_count)) {
            return false;
        }
        b->blocks = list;
        list[b->block_count++] = (struct block_entry){statement};
    }
    return true;
}

/* --- rails --------------------------------------------------------------------------------- */

static bool add_rail(const struct frame *top, const struct statement *statement)
{
    struct builder *b = top->builder;
    struct circuit *c = b->circuit;
    const char *name = statement->name.text;
    struct expression_scope scope = frame_scope(top);
    frame_names(top, &scope);
    double volts = 1;
    if (statement->value != NULL) {
        expression_wanted(statement->value, &scope, DIMENSION_VOLTAGE, b->diagnostics, &volts);
    }
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
    frame_names(top, &scope);
    struct output out = {
        .name = statement->name.text, .within = 0.01, .where = statement->name.span};
    if (statement->at == NULL || statement->from == NULL || statement->to == NULL) {
        return true;
    }
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

bool build_parts(struct builder *b)
{
    const struct frame top = {.builder = b, .prefix = ""};
    const struct tree *tree = &b->cell->tree;
    for (int k = 0; k < tree->count; k++) { /* first: they decide the bulk of p-channel devices */
        if (tree->statements[k]->kind == STATEMENT_RAIL && tree->statements[k]->name.text != NULL &&
            !add_rail(&top, tree->statements[k])) {
            return false;
        }
    }
    if (!collect_blocks(b) || !add_body(&top, tree->statements, tree->count)) {
        return false;
    }
    for (int k = 0; k < tree->count; k++) {
        if (tree->statements[k]->kind == STATEMENT_OUTPUT &&
            tree->statements[k]->name.text != NULL && !add_output(&top, tree->statements[k])) {
            return false;
        }
    }
    finish_unknowns(b->circuit);
    return true;
}
