/*
 * lets.c: named values of cell, processes and blocks, computed when first asked for, so that their
 * order does not matter; and the temperature, which they may use.
 */
#include "circuit/build.h"

#include <string.h>

static bool add_let(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    const char *name = statement->name.text;
    double factor;
    struct dimension dimension;
    bool celsius;
    if (unit_parse(name, strlen(name), &factor, &dimension, &celsius)) {
        diagnostics_add(b->diagnostics, statement->name.span, "give it a longer name",
                        "'%s' is a unit and cannot name a value", name);
        diagnostics_lose(b->diagnostics, name);
        return true;
    }
    if (names_find(c->names, NAME_LET, name) >= 0) {
        diagnostics_add(b->diagnostics, statement->name.span, "give it another name",
                        "'%s' is already defined by another let", name);
        return true;
    }
    struct let_value *list =
        arena_grow(b->arena, c->lets, c->let_count, &c->let_capacity, sizeof *list);
    struct let_entry *entries =
        arena_grow(b->arena, b->lets, c->let_count, &b->let_capacity, sizeof *entries);
    if (list == NULL || entries == NULL || !names_add(c->names, NAME_LET, name, c->let_count)) {
        return false;
    }
    c->lets = list;
    b->lets = entries;
    list[c->let_count] = (struct let_value){.name = name, .where = statement->name.span};
    entries[c->let_count] =
        (struct let_entry){.expression = statement->value, .written = statement->value};
    c->let_count++;
    return true;
}

static bool collect(struct builder *b, const struct tree *tree)
{
    for (int k = 0; k < tree->count; k++) {
        const struct statement *statement = tree->statements[k];
        if (statement->kind == STATEMENT_LET && !add_let(b, statement)) {
            return false;
        }
    }
    return true;
}

static void apply_sets(struct builder *b)
{
    struct circuit *c = b->circuit;
    for (int k = 0; k < b->settings->set_count; k++) {
        const struct set_value *set = &b->settings->sets[k];
        const int index = names_find(c->names, NAME_LET, set->name);
        if (index < 0) {
            const int count = names_list(c->names, NAME_LET, b->known, LIST_LIMIT);
            diagnostics_add(
                b->diagnostics, set->where,
                hint_near(b->arena, set->name, b->known, count, "only a `let` can be set"),
                "no let is called '%s'", set->name);
            continue;
        }
        c->lets[index].is_set = true;
        if (set->expression != NULL) {
            b->lets[index].expression = set->expression;
            b->lets[index].state = LET_WAITING;
        } else {
            c->lets[index].value = set->value;
            b->lets[index].expression = NULL;
            b->lets[index].state = LET_WAITING;
        }
    }
}

static bool find_let(struct builder *b, int index, struct span where, struct quantity *value);

static bool find_in_frame(void *self, const char *name, struct span where, struct quantity *value)
{
    const struct frame *frame = self;
    struct builder *b = frame->builder;
    for (const struct frame *f = frame; f != NULL; f = f->outer) {
        for (int k = 0; k < f->value_count; k++) {
            if (strcmp(f->values[k].name, name) == 0) {
                *value = f->values[k].value;
                return true;
            }
        }
    }
    const int index = names_find(b->circuit->names, NAME_LET, name);
    return index >= 0 && find_let(b, index, where, value);
}

static int list_in_frame(void *self, const char *const **names)
{
    const struct frame *frame = self;
    struct builder *b = frame->builder;
    int count = names_list(b->circuit->names, NAME_LET, b->known, LIST_LIMIT);
    for (const struct frame *f = frame; f != NULL; f = f->outer) {
        for (int k = 0; k < f->value_count && count < LIST_LIMIT; k++) {
            b->known[count++] = f->values[k].name;
        }
    }
    *names = b->known;
    return count;
}

struct expression_scope frame_scope(const struct frame *frame)
{
    union {
        const struct frame *from;
        void *to;
    } plain = {.from = frame};
    return (struct expression_scope){.find = find_in_frame,
                                     .self = plain.to,
                                     .list = list_in_frame,
                                     .thermal_voltage = frame->builder->thermal_voltage};
}

/* Where the value of a let was set: the expression, else the name; the last one counts. */
static struct span set_place(const struct builder *b, const char *name)
{
    struct span where = SPAN_NONE;
    for (int k = 0; k < b->settings->set_count; k++) {
        const struct set_value *set = &b->settings->sets[k];
        if (strcmp(set->name, name) == 0) {
            where = set->expression != NULL ? set->expression->span : set->where;
        }
    }
    return where;
}

/* A plain number from outside has the unit of the let that it replaces; any other must have its
 * dimension. False after an error. */
static bool take_dimension(struct builder *b, const struct let_entry *entry, const char *name,
                           const struct expression_scope *scope, struct quantity *value)
{
    struct diagnostics unseen = {.arena = b->arena};
    struct quantity written;
    if (entry->written == NULL || !expression_value(entry->written, scope, &unseen, &written)) {
        return true;
    }
    if (value->bare) {
        value->dimension = written.dimension;
        value->bare = written.bare;
    } else if (!written.bare && !dimension_equal(value->dimension, written.dimension)) {
        char in_cell[96], found[96];
        dimension_describe(written.dimension, in_cell, sizeof in_cell);
        dimension_describe(value->dimension, found, sizeof found);
        diagnostics_add(b->diagnostics, set_place(b, name), NULL,
                        "%s is %s in the cell; this is %s", name, in_cell, found);
        return false;
    }
    return true;
}

static bool find_let(struct builder *b, int index, struct span where, struct quantity *value)
{
    struct let_value *let = &b->circuit->lets[index];
    struct let_entry *entry = &b->lets[index];
    /* After an error the value is a harmless plain 1: the cell is already rejected. */
    *value = (struct quantity){.value = 1, .bare = true};
    if (entry->state == LET_VISITING || b->let_depth >= LET_DEPTH_LIMIT) {
        if (entry->state == LET_VISITING) {
            diagnostics_add(b->diagnostics, where, NULL, "'%s' is defined by itself", let->name);
        } else {
            diagnostics_add(b->diagnostics, where, NULL,
                            "lets that use lets are nested deeper than %d", LET_DEPTH_LIMIT);
        }
        return true;
    }
    if (entry->state == LET_WAITING) {
        const struct frame top = {.builder = b, .prefix = ""};
        struct expression_scope scope = frame_scope(&top);
        entry->state = LET_VISITING;
        b->let_depth++;
        const bool good =
            (entry->expression == NULL ||
             expression_value(entry->expression, &scope, b->diagnostics, &let->value)) &&
            (!let->is_set || take_dimension(b, entry, let->name, &scope, &let->value));
        b->let_depth--;
        entry = &b->lets[index];
        entry->state = good ? LET_DONE : LET_WRONG;
    }
    if (entry->state == LET_DONE) {
        *value = let->value;
    }
    return true;
}

/* The cell's temperature: the option, else the last statement, else 27 C. */
static void find_temperature(struct builder *b, const struct expression_scope *scope)
{
    const double standard = 300.15;
    b->circuit->kelvin = standard;
    const struct statement *before = NULL;
    for (int k = 0; k < b->cell->tree.count; k++) {
        const struct statement *statement = b->cell->tree.statements[k];
        if (statement->kind != STATEMENT_TEMPERATURE) {
            continue;
        }
        if (before != NULL) {
            diagnostics_add(b->diagnostics, statement->span, NULL,
                            "the temperature is already given on line %d",
                            source_line(&b->cell->sources, before->span));
        }
        before = statement;
        double kelvin;
        if (expression_temperature(statement->value, scope, b->diagnostics, &kelvin)) {
            b->circuit->kelvin = kelvin;
        }
    }
    if (!isnan(b->settings->kelvin)) {
        b->circuit->kelvin = b->settings->kelvin;
    }
}

bool build_lets(struct builder *b)
{
    b->known = arena_new_array(b->arena, const char *, LIST_LIMIT);
    if (b->known == NULL || !collect(b, &b->cell->tree)) {
        return false;
    }
    for (int k = 0; k < b->cell->process_count; k++) {
        if (!collect(b, &b->cell->processes[k].tree)) {
            return false;
        }
    }
    const struct frame top = {.builder = b, .prefix = ""};
    struct expression_scope scope = frame_scope(&top);
    apply_sets(b);
    find_temperature(b, &scope);
    /* Values that the temperature asked for saw no thermal voltage yet: compute them anew. */
    b->thermal_voltage = BOLTZMANN_OVER_CHARGE * b->circuit->kelvin;
    for (int k = 0; k < b->circuit->let_count; k++) {
        if (b->lets[k].expression != NULL && b->lets[k].state != LET_WRONG) {
            b->lets[k].state = LET_WAITING;
        }
    }
    for (int k = 0; k < b->circuit->let_count; k++) {
        struct quantity ignored;
        find_let(b, k, b->circuit->lets[k].where, &ignored);
    }
    return true;
}
