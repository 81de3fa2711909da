/*
 * parts.c: a part line to an instance: terminals, values, model, series resistances.
 */
#include "circuit/build.h"

#include <stdio.h>
#include <string.h>

#include "devices/law.h"
#include "devices/resistor.h"
#include "devices/series.h"
#include "language/parser.h"

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

/* "an nmos", "a pmos". */
static const char *article(const struct device_type *type)
{
    return strchr("aeino", type->word[0]) != NULL ? "an" : "a";
}

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
    diagnostics_add(b->diagnostics, statement->type.span,
                    hint_near(b->arena, statement->type.text, b->known, count,
                              "docs/language.md lists the statements"),
                    "'%s' is neither a statement nor a device", statement->type.text);
    if (statement->name.text != NULL) {
        diagnostics_lose(b->diagnostics, statement->name.text);
    }
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
        diagnostics_add(b->diagnostics, a->value->span, build_ground_hint(a->value),
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
    if (m < 0 && (b->process_missing || diagnostics_has_lost(b->diagnostics, a->value->name))) {
        return; /* reported with the process or the model */
    }
    if (m < 0) {
        int count = 0;
        for (int k = 0; k < c->model_count && count < LIST_LIMIT; k++) {
            if (strcmp(c->models[k].type->model_kind, part->type->model_kind) == 0) {
                b->known[count++] = c->models[k].name;
            }
        }
        diagnostics_add(b->diagnostics, a->value->span,
                        hint_near(b->arena, a->value->name, b->known, count,
                                  hint_list(b->arena, "known: ", b->known, count,
                                            "no model of this kind is known: name a process")),
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
    const char *hint = hint_near(b->arena, key->text, b->known, count,
                                 hint_list(b->arena, "known: ", b->known, count, "it takes none"));
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
        if (t >= 0 && (p < 0 || !is_value(part, a->value))) {
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

/* "write 'i = 3 A'" for a value that stands where the current of a law is wanted. */
static const char *law_hint(struct builder *b, const struct expression *value)
{
    const struct span where = value->span;
    const bool is_plain = value->kind == EXPRESSION_NUMBER && value->number.bare;
    return arena_format(b->arena, "write 'i = %.*s%s'", (int)(where.end - where.begin),
                        b->cell->sources.files[where.file].text + where.begin,
                        is_plain ? " A" : "");
}

static void read_value(struct part *part)
{
    struct builder *b = part->frame->builder;
    const struct statement *statement = part->statement;
    const int p = part->type->value_parameter;
    if (statement->value != NULL && p >= 0) {
        set_parameter(part, p, statement->value, statement->value->span);
    } else if (statement->value != NULL) {
        const bool is_law = part->type->extra_kind == EXTRA_LAW;
        diagnostics_add(b->diagnostics, statement->value->span,
                        is_law ? law_hint(b, statement->value) : "write parameters as name=value",
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
    } else if ((!part->type->model_optional || b->cell->process_count > 0) && !b->process_missing) {
        diagnostics_add(b->diagnostics, part->statement->name.span,
                        b->cell->process_count == 0
                            ? "name a process, or write a model in the cell"
                            : arena_format(b->arena,
                                           "write 'model %s %s ... end' in the cell, or name a "
                                           "process that has one",
                                           kind, kind),
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
        /* types with series rows have models */
        if (!(model[p] > 0)) { /* NOLINT(clang-analyzer-core.NullDereference) */
            continue;
        }
        const char *terminal = type->terminals[row->terminal].name;
        const int node = build_hidden_node(b, part->name, terminal, part->statement->name.span);
        const char *name = arena_format(b->arena, "%s.%s", part->name, row->model_parameter);
        struct instance *series =
            node < 0 || name == NULL
                ? NULL
                : build_instance(b, name, &device_series, part->statement->name.span);
        const int ends[2] = {outer[row->terminal], node};
        if (series == NULL || !build_join(b, series, ends, ends, NULL, 0)) {
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
        if (strcmp(a->key.text, "i") == 0) {
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

/* A resistor whose tempco turns it negative at the cell's temperature. False after an error. */
static bool check_resistor(const struct part *part, const struct device_values *values)
{
    struct builder *b = part->frame->builder;
    const struct circuit *c = b->circuit;
    if (!part->type->is_resistor) {
        return true;
    }
    const struct device_conditions conditions = {
        .kelvin = c->kelvin, .measured_kelvin = c->measured_kelvin, .effects = EFFECTS_FULL};
    if (resistor_at(values, &conditions) > 0) {
        return true;
    }
    char celsius[40];
    number_show(c->kelvin - 273.15, 4, "", celsius, sizeof celsius);
    diagnostics_add(b->diagnostics, part->statement->name.span, "look at tempco and tempco2",
                    "%s would be negative at %s C", part->name, celsius);
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
    if (!check_resistor(part, &values)) {
        return true;
    }
    struct instance *instance =
        build_bare_instance(b, part->name, part->type, part->statement->name.span);
    if (instance == NULL) {
        return false;
    }
    const int index = c->instance_count - 1;
    instance->own = part->own;
    instance->given = part->given;
    instance->model = part->model;
    instance->model_values = model;
    instance->extra = extra;
    int local[TERMINAL_LIMIT];
    memcpy(local, part->nodes, sizeof local);
    if (!add_series(b, part, model, part->nodes, local, index)) {
        return false;
    }
    return build_join(b, &c->instances[index], part->nodes, local, inputs, input_count);
}

bool build_part(const struct frame *frame, const struct statement *statement)
{
    struct builder *b = frame->builder;
    const struct device_type *type = part_type(b, statement);
    if (type == NULL) {
        return true;
    }
    struct part part = {.frame = frame, .statement = statement, .type = type};
    part.name = frame->prefix[0] == '\0'
                    ? statement->name.text
                    : arena_format(b->arena, "%s%s", frame->prefix, statement->name.text);
    part.own = arena_new_array(b->arena, double, type->parameter_count);
    part.given = arena_new_array(b->arena, bool, 2 * type->parameter_count);
    if (part.name == NULL || part.own == NULL || part.given == NULL) {
        return false;
    }
    part.wrong = part.given + type->parameter_count;
    for (int p = 0; p < type->parameter_count; p++) {
        const struct parameter *row = &type->parameters[p];
        part.own[p] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    for (int t = 0; t < TERMINAL_LIMIT; t++) {
        part.nodes[t] = -1;
    }
    const int errors = b->diagnostics->count + b->diagnostics->passed_over;
    const bool is_new = build_name_is_new(b, part.name, statement->name.span);
    if (!read_arrow(&part) || !read_assignments(&part)) {
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
    if (b->diagnostics->count + b->diagnostics->passed_over == errors && !make_instance(&part)) {
        return false;
    }
    return names_add(b->circuit->names, NAME_INSTANCE, part.name,
                     index < b->circuit->instance_count ? index : NAME_REJECTED);
}
