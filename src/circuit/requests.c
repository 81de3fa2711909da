/*
 * requests.c: what the cell asks: hand, require, sweep, vary, choose and quiet lines, resolved.
 */
#include "circuit/build.h"

#include <assert.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

static bool is_plain(struct dimension dimension)
{
    return dimension_equal(dimension, DIMENSION_NONE);
}

/* A value of the dimension of a quantity or knob. */
static bool read_as(struct builder *b, const struct expression *e, struct dimension dimension,
                    bool is_temperature, double *value)
{
    const struct frame top = {.builder = b, .prefix = ""};
    struct expression_scope scope = frame_scope(&top);
    if (is_temperature) {
        return expression_temperature(e, &scope, b->diagnostics, value);
    }
    if (is_plain(dimension)) {
        return expression_share(e, &scope, b->diagnostics, value);
    }
    return expression_wanted(e, &scope, dimension, b->diagnostics, value);
}

/* The statement as written, with runs of blanks folded to one. */
static const char *folded(struct builder *b, struct span where)
{
    const char *text = b->cell->sources.files[where.file].text + where.begin;
    const size_t length = where.end - where.begin;
    char *copy = arena_copy(b->arena, text, length);
    size_t used = 0;
    for (size_t k = 0; copy != NULL && k < length; k++) {
        const bool blank = text[k] == ' ' || text[k] == '\t' || text[k] == '\\' ||
                           text[k] == '\n' || text[k] == '\r';
        if (!blank) {
            copy[used++] = text[k];
        } else if (used > 0 && copy[used - 1] != ' ') {
            copy[used++] = ' ';
        }
    }
    if (copy != NULL) {
        copy[used] = '\0';
    }
    return copy;
}

static bool add_hand(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    struct hand_line line = {.where = statement->span};
    if (!circuit_probe(c, statement->quantity.text, statement->quantity.span, b->diagnostics,
                       &line.probe) ||
        !read_as(b, statement->value, line.probe.dimension, false, &line.value)) {
        return true;
    }
    struct hand_line *list =
        arena_grow(b->arena, c->hands, c->hand_count, &c->hand_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->hands = list;
    list[c->hand_count++] = line;
    return true;
}

/* `within` takes a share or a value of the quantity's own dimension. */
static bool read_tolerance(struct builder *b, const struct expression *e, struct requirement *r)
{
    const struct frame top = {.builder = b, .prefix = ""};
    struct expression_scope scope = frame_scope(&top);
    struct quantity found;
    if (!expression_value(e, &scope, b->diagnostics, &found)) {
        return false;
    }
    if (found.bare && !is_plain(r->probe.dimension)) {
        char number[40], hint[80];
        number_exact(found.value, number, sizeof number);
        (void)snprintf(hint, sizeof hint, "write '%s%%', or give it a unit", number);
        diagnostics_add(b->diagnostics, e->span, hint, "a tolerance is a share or has a unit");
        return false;
    }
    const bool is_share = is_plain(found.dimension) && !found.bare;
    if (is_share) {
        r->tolerance_share = found.value;
        r->tolerance = found.value * fabs(r->value);
    } else if (!expression_wanted(e, &scope, r->probe.dimension, b->diagnostics, &r->tolerance)) {
        return false;
    }
    if (!(r->tolerance > 0)) {
        diagnostics_add(b->diagnostics, e->span, "within 2% of a value that is not 0",
                        "the tolerance of a requirement must be above 0");
        return false;
    }
    return true;
}

static bool add_requirement(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    struct requirement r = {.relation = statement->relation,
                            .scope = statement->scope,
                            .tolerance = NAN,
                            .tolerance_share = NAN,
                            .yield = NAN,
                            .where = statement->span};
    if (!circuit_probe(c, statement->quantity.text, statement->quantity.span, b->diagnostics,
                       &r.probe) ||
        !read_as(b, statement->value, r.probe.dimension, false, &r.value)) {
        return true;
    }
    if (r.relation == RELATION_WITHIN && !read_tolerance(b, statement->tolerance, &r)) {
        return true;
    }
    if (r.scope == SCOPE_YIELD) {
        if (!read_as(b, statement->yield, DIMENSION_NONE, false, &r.yield)) {
            return true;
        }
        if (!(r.yield > 0 && r.yield < 1)) {
            diagnostics_add(b->diagnostics, statement->yield->span, "for 99.7%",
                            "a yield lies between 0 and 100 %%");
            return true;
        }
    }
    r.text = folded(b, statement->span);
    struct requirement *list = arena_grow(b->arena, c->requirements, c->requirement_count,
                                          &c->requirement_capacity, sizeof *list);
    if (list == NULL || r.text == NULL) {
        return false;
    }
    c->requirements = list;
    list[c->requirement_count++] = r;
    return true;
}

/* A value for a knob. A let without a unit takes a value of any dimension: whatever uses it checks.
 */
static bool read_knob(struct builder *b, const struct knob *knob, const struct expression *e,
                      double *value)
{
    if (knob->kind == KNOB_LET && b->circuit->lets[knob->parameter].value.bare) {
        const struct frame top = {.builder = b, .prefix = ""};
        struct expression_scope scope = frame_scope(&top);
        struct quantity found;
        if (!expression_value(e, &scope, b->diagnostics, &found)) {
            return false;
        }
        *value = found.value;
        return true;
    }
    return read_as(b, e, knob->dimension, knob->kind == KNOB_TEMPERATURE, value);
}

static bool in_range(struct builder *b, const struct knob *knob, double value, struct span where)
{
    if (knob->kind != KNOB_VALUE) {
        return true;
    }
    const struct instance *instance = &b->circuit->instances[knob->instance];
    return build_range(&instance->type->parameters[knob->parameter], value, where, b->diagnostics);
}

/* from ... to of a knob. */
static bool read_range(struct builder *b, const struct knob *knob,
                       const struct statement *statement, double *from, double *to)
{
    assert(statement->from != NULL && statement->to != NULL); /* only `process` goes without */
    if (!read_knob(b, knob, statement->from, from) || !read_knob(b, knob, statement->to, to)) {
        return false;
    }
    if (*from == *to) {
        diagnostics_add(b->diagnostics, statement->to->span, NULL,
                        "from and to are the same value");
        return false;
    }
    return in_range(b, knob, *from, statement->from->span) &&
           in_range(b, knob, *to, statement->to->span);
}

static bool is_same_knob(const struct knob *a, const struct knob *b)
{
    return a->kind == b->kind && a->instance == b->instance && a->parameter == b->parameter;
}

static bool read_family(struct builder *b, const struct statement *statement, struct sweep *sweep)
{
    struct circuit *c = b->circuit;
    sweep->has_family = true;
    if (!circuit_knob(c, statement->thing2.text, statement->thing2.span, b->diagnostics,
                      &sweep->family)) {
        return false;
    }
    if (is_same_knob(&sweep->knob, &sweep->family)) {
        diagnostics_add(b->diagnostics, statement->thing2.span, NULL, "%s is already swept",
                        statement->thing2.text);
        return false;
    }
    sweep->family_values = arena_new_array(c->arena, double, statement->value_count);
    for (int k = 0; sweep->family_values != NULL && k < statement->value_count; k++) {
        if (!read_knob(b, &sweep->family, statement->values[k], &sweep->family_values[k]) ||
            !in_range(b, &sweep->family, sweep->family_values[k], statement->values[k]->span)) {
            return false;
        }
    }
    sweep->family_count = statement->value_count;
    return sweep->family_values != NULL;
}

/* False after an error: the tables of all sweeps would be too long. */
static bool count_values(struct builder *b, const struct sweep *sweep)
{
    const double points = sweep->points > 0 ? sweep->points : CIRCUIT_POINT_STANDARD;
    b->sweep_values += points * sweep->shown_count * (sweep->has_family ? sweep->family_count : 1);
    if (b->sweep_values <= CIRCUIT_SWEEP_LIMIT) {
        return true;
    }
    diagnostics_add(b->diagnostics, sweep->where, "fewer points, quantities or families",
                    "the sweeps have more than %d values, the limit", CIRCUIT_SWEEP_LIMIT);
    return false;
}

static bool read_sweep(struct builder *b, const struct statement *statement, struct sweep *sweep)
{
    struct circuit *c = b->circuit;
    *sweep = (struct sweep){.where = statement->span};
    bool good =
        circuit_knob(c, statement->name.text, statement->name.span, b->diagnostics, &sweep->knob) &&
        read_range(b, &sweep->knob, statement, &sweep->from, &sweep->to);
    if (statement->points != NULL) {
        double points = 0;
        good &= read_as(b, statement->points, DIMENSION_NONE, false, &points);
        if (good && !(points >= 2 && points <= CIRCUIT_POINT_LIMIT)) {
            diagnostics_add(b->diagnostics, statement->points->span, NULL,
                            "a sweep has 2 to %d points", CIRCUIT_POINT_LIMIT);
            good = false;
        } else if (good && points != floor(points)) {
            diagnostics_add(b->diagnostics, statement->points->span, NULL,
                            "the number of points is a whole number");
            good = false;
        } else if (good) {
            sweep->points = (int)points;
        }
    }
    sweep->shown = arena_new_array(c->arena, struct probe, statement->word_count);
    for (int k = 0; sweep->shown != NULL && k < statement->word_count; k++) {
        good &= circuit_probe(c, statement->words[k].text, statement->words[k].span, b->diagnostics,
                              &sweep->shown[k]);
    }
    sweep->shown_count = statement->word_count;
    if (good && statement->thing2.text != NULL) {
        good = read_family(b, statement, sweep);
    }
    return good && sweep->shown != NULL && count_values(b, sweep);
}

bool circuit_sweep(const struct circuit *circuit, const struct statement *statement,
                   struct diagnostics *diagnostics, struct sweep *sweep)
{
    union {
        const struct circuit *from;
        struct circuit *to;
    } plain = {.from = circuit};
    struct builder b = {.circuit = plain.to,
                        .cell = circuit->cell,
                        .diagnostics = diagnostics,
                        .arena = circuit->arena,
                        .settings = &circuit->settings,
                        .thermal_voltage = BOLTZMANN_OVER_CHARGE * circuit->kelvin};
    b.lets = arena_new_array(b.arena, struct let_entry, circuit->let_count);
    b.known = arena_new_array(b.arena, const char *, LIST_LIMIT);
    if (b.lets == NULL || b.known == NULL) {
        diagnostics->out_of_memory = true;
        return false;
    }
    for (int k = 0; k < circuit->let_count; k++) {
        b.lets[k].state = LET_DONE;
    }
    const bool good = read_sweep(&b, statement, sweep);
    if (arena_failed(circuit->arena) || arena_failed(diagnostics->arena)) {
        diagnostics->out_of_memory = true;
        return false;
    }
    return good;
}

static bool add_sweep(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    struct sweep sweep;
    if (!read_sweep(b, statement, &sweep)) {
        return !arena_failed(b->arena);
    }
    struct sweep *list =
        arena_grow(b->arena, c->sweeps, c->sweep_count, &c->sweep_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->sweeps = list;
    list[c->sweep_count++] = sweep;
    return true;
}

static bool add_condition(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    struct condition condition = {.from = NAN, .to = NAN, .where = statement->span};
    if (statement->from == NULL && strcmp(statement->name.text, "process") == 0) {
        condition.knob = (struct knob){KNOB_PROCESS, -1, -1, "process", DIMENSION_NONE};
        if (c->corner_count == 0 && !b->process_missing) {
            diagnostics_add(b->diagnostics, statement->name.span,
                            "write `corner NAME ... end` in the process file",
                            "the processes of this cell have no corners to vary");
        }
    } else if (!circuit_knob(c, statement->name.text, statement->name.span, b->diagnostics,
                             &condition.knob) ||
               !read_range(b, &condition.knob, statement, &condition.from, &condition.to)) {
        return true;
    }
    for (int k = 0; k < c->condition_count; k++) {
        if (is_same_knob(&c->conditions[k].knob, &condition.knob)) {
            diagnostics_add(b->diagnostics, statement->name.span, NULL,
                            "%s is already varied on line %d", statement->name.text,
                            source_line(&b->cell->sources, c->conditions[k].where));
            return true;
        }
    }
    struct condition *list = arena_grow(b->arena, c->conditions, c->condition_count,
                                        &c->condition_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->conditions = list;
    list[c->condition_count++] = condition;
    return true;
}

static bool add_choice(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    struct choice choice = {.where = statement->span};
    const bool found_knob =
        circuit_knob(c, statement->name.text, statement->name.span, b->diagnostics, &choice.knob);
    const bool found_probe = circuit_probe(c, statement->quantity.text, statement->quantity.span,
                                           b->diagnostics, &choice.probe);
    if (!found_knob || !found_probe ||
        !read_range(b, &choice.knob, statement, &choice.from, &choice.to) ||
        !read_as(b, statement->value, choice.probe.dimension, false, &choice.value)) {
        return true;
    }
    struct choice *list =
        arena_grow(b->arena, c->choices, c->choice_count, &c->choice_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->choices = list;
    list[c->choice_count++] = choice;
    return true;
}

/* The code of a `quiet` line must be one that exists, and its name that of something in the cell.
 */
static void check_quiet(struct builder *b, const struct statement *statement)
{
    const struct names *names = b->circuit->names;
    const struct word *code = &statement->quantity, *name = &statement->name;
    int count = 0;
    for (int k = 0; k < CAUTION_COUNT; k++) {
        b->known[count++] = caution_name((enum caution_code)k);
        if (strcmp(b->known[k], code->text) == 0) {
            count = -1;
            break;
        }
    }
    if (count >= 0) {
        diagnostics_add(b->diagnostics, code->span,
                        hint_near(b->arena, code->text, b->known, count,
                                  "the codes stand beside the cautions of a review"),
                        "there is no caution '%s'", code->text);
    }
    static const enum name_sort sorts[] = {NAME_INSTANCE, NAME_NODE, NAME_OUTPUT, NAME_MODEL,
                                           NAME_LET};
    count = 0;
    for (size_t k = 0; name->text != NULL && k < sizeof sorts / sizeof sorts[0]; k++) {
        if (names_find(names, sorts[k], name->text) != -1) {
            return;
        }
        count += names_list(names, sorts[k], b->known + count, LIST_LIMIT - count);
    }
    if (name->text != NULL && !diagnostics_has_lost(b->diagnostics, name->text)) {
        diagnostics_add(b->diagnostics, name->span,
                        hint_near(b->arena, name->text, b->known, count, NULL),
                        "nothing is called '%s'", name->text);
    }
}

static bool add_quiet(struct builder *b, const struct statement *statement)
{
    struct circuit *c = b->circuit;
    check_quiet(b, statement);
    struct quiet_line *list =
        arena_grow(b->arena, c->quiets, c->quiet_count, &c->quiet_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    c->quiets = list;
    list[c->quiet_count++] = (struct quiet_line){statement->quantity.text, statement->name.text};
    return true;
}

static bool add_request(struct builder *b, const struct statement *statement)
{
    switch (statement->kind) {
    case STATEMENT_TITLE:
        b->circuit->title = statement->text;
        return true;
    case STATEMENT_HAND:
        return add_hand(b, statement);
    case STATEMENT_REQUIRE:
        return add_requirement(b, statement);
    case STATEMENT_SWEEP:
        return add_sweep(b, statement);
    case STATEMENT_VARY:
        return add_condition(b, statement);
    case STATEMENT_CHOOSE:
        return add_choice(b, statement);
    case STATEMENT_QUIET:
        return add_quiet(b, statement);
    default:
        return true;
    }
}

bool build_requests(struct builder *b)
{
    b->circuit->title = "";
    for (int k = 0; k < b->cell->tree.count; k++) {
        const struct statement *statement = b->cell->tree.statements[k];
        if (build_is_over_limit(b, statement->span)) {
            break;
        }
        if (!add_request(b, statement)) {
            return false;
        }
    }
    return true;
}
