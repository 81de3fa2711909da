/* request.c: the texts of a request as parsed things. */
#include "library/request.h"

#include <math.h>
#include <string.h>

#include "language/expression.h"
#include "language/parser.h"
#include "language/source.h"

static bool is_name(const char *text, size_t length)
{
    for (size_t k = 0; k < length; k++) {
        const char c = text[k];
        const bool is_letter = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_';
        if (!is_letter && !(k > 0 && c >= '0' && c <= '9')) {
            return false;
        }
    }
    return length > 0;
}

/* An expression that stands alone in a source of its own. */
static enum status read_expression(struct cell *cell, const char *source, const char *text,
                                   const struct expression **expression)
{
    uint32_t file = 0;
    enum status status = source_add_text(cell->arena, &cell->sources, source, text, strlen(text),
                                         &cell->diagnostics, &file);
    if (status != STATUS_OK) {
        return status;
    }
    *expression = parse_expression(cell->arena, &cell->sources, file, &cell->diagnostics);
    if (*expression != NULL) {
        return STATUS_OK;
    }
    return arena_failed(cell->arena) ? STATUS_MEMORY : STATUS_INPUT;
}

enum status request_set(struct cell *cell, const char *text, struct set_value *set)
{
    const char *equals = strchr(text, '=');
    size_t length = equals == NULL ? 0 : (size_t)(equals - text);
    while (length > 0 && text[length - 1] == ' ') {
        length--;
    }
    /* the whole text once, so that a message about the name can mark it */
    uint32_t file = 0;
    enum status status = source_add_text(cell->arena, &cell->sources, "--set", text, strlen(text),
                                         &cell->diagnostics, &file);
    if (status != STATUS_OK) {
        return status;
    }
    if (memchr(text, '.', length) != NULL) {
        diagnostics_add(&cell->diagnostics, (struct span){file, 0, (uint32_t)length},
                        "set a let of the cell that the `use` line passes on",
                        "what is inside a block cannot be set");
        return STATUS_INPUT;
    }
    if (!is_name(text, length)) {
        const struct span where = {file, 0, (uint32_t)(length > 0 ? length : strlen(text))};
        diagnostics_add(&cell->diagnostics, where, "such as RE=51k",
                        "NAME=expression is wanted here");
        return STATUS_INPUT;
    }
    set->name = arena_copy(cell->arena, text, length);
    set->where = (struct span){file, 0, (uint32_t)length};
    const char *source =
        set->name == NULL ? NULL : arena_format(cell->arena, "--set %s", set->name);
    if (source == NULL) {
        return STATUS_MEMORY;
    }
    return read_expression(cell, source, equals + 1, &set->expression);
}

static bool find_nothing(void *self, const char *name, struct span where, struct quantity *value)
{
    (void)self;
    (void)name;
    (void)where;
    (void)value;
    return false;
}

enum status request_temperature(struct cell *cell, const char *text, double *kelvin)
{
    const struct expression *expression = NULL;
    const struct expression_scope scope = {.find = find_nothing, .thermal_voltage = NAN};
    enum status status = read_expression(cell, "--temperature", text, &expression);
    if (status != STATUS_OK) {
        return status;
    }
    return expression_temperature(expression, &scope, &cell->diagnostics, kelvin) ? STATUS_OK
                                                                                  : STATUS_INPUT;
}

enum status request_current(struct cell *cell, const char *name, const char *text, double *amperes)
{
    const struct expression *expression = NULL;
    const struct expression_scope scope = {.find = find_nothing, .thermal_voltage = NAN};
    enum status status = read_expression(cell, name, text, &expression);
    if (status != STATUS_OK) {
        return status;
    }
    return expression_wanted(expression, &scope, DIMENSION_CURRENT, &cell->diagnostics, amperes)
               ? STATUS_OK
               : STATUS_INPUT;
}

enum status request_sweep(struct cell *cell, const struct circuit *circuit, const char *text,
                          struct sweep *sweep)
{
    static const char word[] = "sweep ";
    bool has_word = strncmp(text, word, sizeof word - 1) == 0;
    const char *line = arena_format(cell->arena, "%s%s", has_word ? "" : word, text);
    if (line == NULL) {
        return STATUS_MEMORY;
    }
    uint32_t file = 0;
    enum status status = source_add_text(cell->arena, &cell->sources, "--sweep", line, strlen(line),
                                         &cell->diagnostics, &file);
    if (status != STATUS_OK) {
        return status;
    }
    struct tree tree = {0};
    status = parse_source(cell->arena, &cell->sources, file, TREE_CELL, &cell->diagnostics, &tree);
    if (status != STATUS_OK) {
        return status;
    }
    if (tree.count != 1 || tree.statements[0]->kind != STATEMENT_SWEEP) {
        const struct span where = {file, 0, (uint32_t)strlen(line)};
        diagnostics_add(&cell->diagnostics, where, NULL, "one sweep is wanted here");
        return STATUS_INPUT;
    }
    return circuit_sweep(circuit, tree.statements[0], &cell->diagnostics, sweep) ? STATUS_OK
                                                                                 : STATUS_INPUT;
}

enum status request_probe(struct cell *cell, const struct circuit *circuit, const char *text,
                          struct probe *probe)
{
    uint32_t file = 0;
    enum status status = source_add_text(cell->arena, &cell->sources, "--of", text, strlen(text),
                                         &cell->diagnostics, &file);
    if (status != STATUS_OK) {
        return status;
    }
    const struct span where = {file, 0, (uint32_t)strlen(text)};
    return circuit_probe(circuit, text, where, &cell->diagnostics, probe) ? STATUS_OK
                                                                          : STATUS_INPUT;
}

enum status request_length(struct cell *cell, const char *text, double *length)
{
    const struct expression *expression = NULL;
    const struct expression_scope scope = {.find = find_nothing, .thermal_voltage = NAN};
    enum status status = read_expression(cell, "--grid", text, &expression);
    if (status != STATUS_OK) {
        return status;
    }
    if (!expression_wanted(expression, &scope, DIMENSION_LENGTH, &cell->diagnostics, length)) {
        return STATUS_INPUT;
    }
    if (!(*length > 0)) {
        diagnostics_add(&cell->diagnostics, expression->span, "such as 10 nm",
                        "a grid is above zero");
        return STATUS_INPUT;
    }
    return STATUS_OK;
}
