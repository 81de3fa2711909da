/*
 * models.c: model, valid, measured_at and corner statements to checked parameter values.
 */
#include "circuit/build.h"

#include <stdio.h>
#include <string.h>

/* What a file says about all of its models. */
struct file_facts {
    double measured_kelvin;
    double kelvin[2], length[2], width[2];
    const char *process;
};

bool build_range(const struct parameter *p, double value, struct span where,
                 struct diagnostics *diagnostics)
{
    const bool low = p->above_least ? !(value > p->least) : !(value >= p->least);
    if (!low && value <= p->most) {
        return true;
    }
    char unit[40], found[64], limit[64];
    dimension_unit(p->dimension, unit, sizeof unit);
    number_show(value, 4, unit, found, sizeof found);
    number_show(low ? p->least : p->most, 4, unit, limit, sizeof limit);
    /* a width such as 10 was meant in um */
    const bool is_metre = !low && dimension_equal(p->dimension, DIMENSION_LENGTH);
    char digits[40], hint[64];
    number_exact(value, digits, sizeof digits);
    (void)snprintf(hint, sizeof hint, "did you mean '%su'?", digits);
    diagnostics_add(diagnostics, where, is_metre ? hint : NULL, "%s must be %s %s; this is %s",
                    p->name, low ? (p->above_least ? "above" : "at least") : "at most", limit,
                    found);
    return false;
}

bool build_parameter(const struct parameter *p, const struct expression *e,
                     const struct expression_scope *scope, struct diagnostics *diagnostics,
                     double *value)
{
    if (e->kind == EXPRESSION_NAME && strcmp(e->name, "none") == 0) {
        if (p->when_absent != DEFAULT_NONE) {
            diagnostics_add(diagnostics, e->span, NULL, "%s cannot be none", p->name);
            return false;
        }
        *value = PARAMETER_NONE;
        return true;
    }
    const bool plain = dimension_equal(p->dimension, DIMENSION_NONE);
    const bool good = plain ? expression_share(e, scope, diagnostics, value)
                            : expression_wanted(e, scope, p->dimension, diagnostics, value);
    return good && build_range(p, *value, e->span, diagnostics);
}

static void unknown_parameter(struct builder *b, const struct model *m, const struct word *key)
{
    const struct device_type *type = m->type;
    int count = 0;
    for (int k = 0; k < type->model_parameter_count && count < LIST_LIMIT; k++) {
        b->known[count++] = type->model_parameters[k].name;
    }
    diagnostics_add(
        b->diagnostics, key->span,
        hint_near(b->arena, key->text, b->known, count, "`ampstead models FILE` lists them all"),
        "a model of kind %s has no parameter '%s'", type->model_kind, key->text);
}

static void read_values(struct builder *b, struct model *m, const struct statement *statement,
                        const struct expression_scope *scope)
{
    const struct device_type *type = m->type;
    for (int k = 0; k < statement->assignment_count; k++) {
        const struct assignment *a = &statement->assignments[k];
        const int p =
            parameter_find(type->model_parameters, type->model_parameter_count, a->key.text);
        if (p < 0) {
            unknown_parameter(b, m, &a->key);
        } else if (m->given[p]) {
            diagnostics_add(b->diagnostics, a->key.span, NULL, "%s is given twice", a->key.text);
        } else {
            m->given[p] = build_parameter(&type->model_parameters[p], a->value, scope,
                                          b->diagnostics, &m->values[p]);
        }
    }
    for (int p = 0; p < type->model_parameter_count; p++) {
        bool wrong = false; /* given but wrong: already reported */
        for (int k = 0; k < statement->assignment_count; k++) {
            wrong |=
                strcmp(statement->assignments[k].key.text, type->model_parameters[p].name) == 0;
        }
        if (type->model_parameters[p].when_absent == DEFAULT_REQUIRED && !wrong) {
            diagnostics_add(b->diagnostics, statement->name.span, type->model_parameters[p].text,
                            "model %s needs a value for '%s'", m->name,
                            type->model_parameters[p].name);
        }
    }
}

static const struct device_type *model_type(struct builder *b, const struct word *kind)
{
    const struct device_type *type = device_find_model_kind(kind->text);
    if (type != NULL) {
        return type;
    }
    int count = 0;
    for (int k = 0; k < device_type_count; k++) {
        if (device_types[k]->model_kind != NULL) {
            b->known[count++] = device_types[k]->model_kind;
        }
    }
    diagnostics_add(b->diagnostics, kind->span,
                    hint_near(b->arena, kind->text, b->known, count,
                              hint_list(b->arena, "known: ", b->known, count, NULL)),
                    "there is no model kind '%s'", kind->text);
    return NULL;
}

static bool add_model(struct builder *b, const struct statement *statement,
                      const struct file_facts *facts, const struct expression_scope *scope)
{
    struct circuit *c = b->circuit;
    const struct device_type *type = model_type(b, &statement->type);
    if (type == NULL) {
        return true;
    }
    if (names_find(c->names, NAME_MODEL, statement->name.text) >= 0) {
        diagnostics_add(b->diagnostics, statement->name.span, "give it another name",
                        "there are two models called '%s'", statement->name.text);
        return true;
    }
    if (c->model_count >= CIRCUIT_MODEL_LIMIT) {
        diagnostics_add(b->diagnostics, statement->name.span, NULL,
                        "the cell has more than %d models, the limit", CIRCUIT_MODEL_LIMIT);
        return true;
    }
    struct model *list =
        arena_grow(b->arena, c->models, c->model_count, &c->model_capacity, sizeof *list);
    if (list == NULL || !names_add(c->names, NAME_MODEL, statement->name.text, c->model_count)) {
        return false;
    }
    c->models = list;
    struct model *m = &list[c->model_count++];
    *m = (struct model){.name = statement->name.text,
                        .type = type,
                        .values = arena_new_array(b->arena, double, type->model_parameter_count),
                        .given = arena_new_array(b->arena, bool, type->model_parameter_count),
                        .measured_kelvin = facts->measured_kelvin,
                        .process = facts->process,
                        .where = statement->name.span};
    if (m->values == NULL || m->given == NULL) {
        return false;
    }
    memcpy(m->valid_kelvin, facts->kelvin, sizeof facts->kelvin);
    memcpy(m->valid_length, facts->length, sizeof facts->length);
    memcpy(m->valid_width, facts->width, sizeof facts->width);
    for (int p = 0; p < type->model_parameter_count; p++) {
        const struct parameter *row = &type->model_parameters[p];
        m->values[p] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    read_values(b, m, statement, scope);
    return true;
}

static void read_range(struct builder *b, const struct statement *statement,
                       const struct expression_scope *scope, struct file_facts *facts)
{
    double *range = NULL;
    const char *what = statement->name.text;
    if (strcmp(what, "temperature") == 0) {
        expression_temperature(statement->from, scope, b->diagnostics, &facts->kelvin[0]);
        expression_temperature(statement->to, scope, b->diagnostics, &facts->kelvin[1]);
        return;
    }
    range = strcmp(what, "L") == 0 ? facts->length : strcmp(what, "W") == 0 ? facts->width : NULL;
    if (range == NULL) {
        diagnostics_add(b->diagnostics, statement->name.span, "temperature, L or W",
                        "a valid range of '%s' is not known", what);
    } else {
        expression_wanted(statement->from, scope, DIMENSION_LENGTH, b->diagnostics, &range[0]);
        expression_wanted(statement->to, scope, DIMENSION_LENGTH, b->diagnostics, &range[1]);
    }
}

static struct file_facts read_facts(struct builder *b, const struct tree *tree, const char *process,
                                    const struct expression_scope *scope)
{
    struct file_facts facts = {.measured_kelvin = 300.15,
                               .kelvin = {NAN, NAN},
                               .length = {NAN, NAN},
                               .width = {NAN, NAN},
                               .process = process};
    for (int k = 0; k < tree->count; k++) {
        const struct statement *statement = tree->statements[k];
        if (statement->kind == STATEMENT_MEASURED_AT) {
            expression_temperature(statement->value, scope, b->diagnostics, &facts.measured_kelvin);
        } else if (statement->kind == STATEMENT_VALID) {
            read_range(b, statement, scope, &facts);
        }
    }
    return facts;
}

static bool models_of(struct builder *b, const struct tree *tree, const char *process)
{
    const struct frame top = {.builder = b, .prefix = ""};
    struct expression_scope scope = frame_scope(&top);
    const struct file_facts facts = read_facts(b, tree, process, &scope);
    if (process == NULL) {
        b->circuit->measured_kelvin = facts.measured_kelvin;
    }
    for (int k = 0; k < tree->count; k++) {
        const struct statement *statement = tree->statements[k];
        if (statement->kind == STATEMENT_MODEL && !add_model(b, statement, &facts, &scope)) {
            return false;
        }
    }
    return true;
}

static void unknown_model(struct builder *b, const struct assignment *a, const char *name)
{
    if (b->process_missing || diagnostics_has_lost(b->diagnostics, name)) {
        return;
    }
    const int count = names_list(b->circuit->names, NAME_MODEL, b->known, LIST_LIMIT);
    diagnostics_add(b->diagnostics, a->key.span, hint_near(b->arena, name, b->known, count, NULL),
                    "there is no model '%s'", name);
}

/* resistor.value *= f */
static void scale_resistors(struct builder *b, const struct assignment *a,
                            const struct expression_scope *scope, bool in_force)
{
    double factor;
    if (a->operation != 'm') {
        diagnostics_add(b->diagnostics, a->key.span, "resistor.value *= 1.1",
                        "a corner can only scale the resistors");
    } else if (expression_share(a->value, scope, b->diagnostics, &factor)) {
        if (!(factor > 0)) {
            diagnostics_add(b->diagnostics, a->value->span, NULL,
                            "the factor of the resistors must be above 0");
        } else if (in_force) {
            b->circuit->resistor_factor *= factor;
        }
    }
}

/* One line of a corner: MODEL.parameter += value, *= factor, or resistor.value *= f. It is checked
 * in every corner and takes effect only in the one in force. */
static void apply_line(struct builder *b, const struct assignment *a,
                       const struct expression_scope *scope, bool in_force)
{
    struct circuit *c = b->circuit;
    const char *dot = strchr(a->key.text, '.');
    if (dot == NULL || a->value == NULL) {
        return;
    }
    if (strcmp(a->key.text, "resistor.value") == 0) {
        scale_resistors(b, a, scope, in_force);
        return;
    }
    const char *name = arena_copy(b->arena, a->key.text, (size_t)(dot - a->key.text));
    const int m = name == NULL ? -1 : names_find(c->names, NAME_MODEL, name);
    if (m < 0) {
        unknown_model(b, a, name == NULL ? "" : name);
        return;
    }
    struct model *model = &c->models[m];
    const int p =
        parameter_find(model->type->model_parameters, model->type->model_parameter_count, dot + 1);
    if (p < 0) {
        struct word parameter = {dot + 1, a->key.span};
        parameter.span.begin += (uint32_t)(dot + 1 - a->key.text);
        unknown_parameter(b, model, &parameter);
        return;
    }
    const struct parameter *row = &model->type->model_parameters[p];
    if (isnan(model->values[p]) && a->operation != '=') {
        diagnostics_add(b->diagnostics, a->key.span, NULL, "%s is none in model %s and cannot move",
                        row->name, model->name);
        return;
    }
    double value;
    const bool good =
        a->operation == 'm'
            ? expression_share(a->value, scope, b->diagnostics, &value)
            : expression_wanted(a->value, scope, row->dimension, b->diagnostics, &value);
    if (!good) {
        return;
    }
    value = a->operation == 'm'   ? model->values[p] * value
            : a->operation == 'a' ? model->values[p] + value
                                  : value;
    if (build_range(row, value, a->value->span, b->diagnostics) && in_force) {
        model->values[p] = value;
    }
}

static bool note_corner(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    for (int k = 0; k < c->corner_count; k++) {
        if (strcmp(c->corners[k].name, statement->name.text) == 0) {
            return true;
        }
    }
    struct corner_line *list =
        arena_grow(b->arena, c->corners, c->corner_count, &c->corner_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->corners = list;
    list[c->corner_count++] =
        (struct corner_line){.name = statement->name.text, .where = statement->name.span};
    return true;
}

/* All corners are checked before the one in force moves any value. */
static bool corners_of(struct builder *b, const struct tree *tree, bool apply)
{
    const struct frame top = {.builder = b, .prefix = ""};
    struct expression_scope scope = frame_scope(&top);
    const char *wanted = b->settings->corner;
    for (int k = 0; k < tree->count; k++) {
        const struct statement *statement = tree->statements[k];
        if (statement->kind != STATEMENT_CORNER) {
            continue;
        }
        if (!note_corner(b, statement)) {
            return false;
        }
        const bool in_force = wanted != NULL && strcmp(wanted, statement->name.text) == 0;
        if (!apply || in_force) {
            for (int a = 0; a < statement->assignment_count; a++) {
                apply_line(b, &statement->assignments[a], &scope, apply && in_force);
            }
        }
    }
    return true;
}

static void check_corner(struct builder *b)
{
    const struct circuit *c = b->circuit;
    const char *wanted = b->settings->corner;
    if (wanted == NULL || b->process_missing) {
        return;
    }
    int count = 0;
    for (int k = 0; k < c->corner_count && count < LIST_LIMIT; k++) {
        if (strcmp(c->corners[k].name, wanted) == 0) {
            return;
        }
        b->known[count++] = c->corners[k].name;
    }
    diagnostics_add(b->diagnostics, SPAN_NONE,
                    hint_near(b->arena, wanted, b->known, count,
                              hint_list(b->arena, "known: ", b->known, count,
                                        "the processes of this cell have no corners")),
                    "there is no corner '%s'", wanted);
}

static bool process_is_missing(struct cell *cell)
{
    int named = 0;
    for (int k = 0; k < cell->tree.count; k++) {
        const struct statement *statement = cell->tree.statements[k];
        named += statement->kind == STATEMENT_PROCESS;
    }
    return named > cell->process_count || diagnostics_has_lost(&cell->diagnostics, "process");
}

bool build_models(struct builder *b)
{
    b->circuit->resistor_factor = 1;
    b->process_missing = process_is_missing(b->cell);
    if (!models_of(b, &b->cell->tree, NULL)) {
        return false;
    }
    for (int k = 0; k < b->cell->process_count; k++) {
        if (!models_of(b, &b->cell->processes[k].tree, b->cell->processes[k].name)) {
            return false;
        }
    }
    for (int apply = 0; apply < 2; apply++) {
        if (!corners_of(b, &b->cell->tree, apply == 1)) {
            return false;
        }
        for (int k = 0; k < b->cell->process_count; k++) {
            if (!corners_of(b, &b->cell->processes[k].tree, apply == 1)) {
                return false;
            }
        }
    }
    check_corner(b);
    return true;
}
