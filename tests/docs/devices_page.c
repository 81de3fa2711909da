/*
 * devices_page.c: prints docs/devices.md from the device tables.
 */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "devices/device.h"

#include "devices_text.h"

enum { TEXT_SIZE = 80, PART_SIZE = 36 };

/* The type of a family; "nmos hand" is the alternative of nmos. */
static const struct device_type *find_type(const char *word)
{
    size_t length = strcspn(word, " ");
    for (int k = 0; k < device_type_count; k++) {
        const struct device_type *type = device_types[k];
        if (strlen(type->word) == length && memcmp(type->word, word, length) == 0) {
            return word[length] != '\0' ? type->alternative : type;
        }
    }
    return NULL;
}

/* "10 fA": engineering notation without idle zeros, or plain digits where there is no prefix. */
static void show(double value, struct dimension dimension, char *text, size_t size)
{
    char unit[PART_SIZE], number[PART_SIZE];
    dimension_unit(dimension, unit, sizeof unit);
    number_show(value, 4, unit, number, sizeof number);
    if (value == 0 || strchr(number, 'e') != NULL) {
        number_exact(value, number, sizeof number);
        snprintf(text, size, "%s%s%s", number, value == 0 || unit[0] == '\0' ? "" : " ",
                 value == 0 ? "" : unit);
        return;
    }
    char *end = strchr(number, ' ');
    size_t length = end != NULL ? (size_t)(end - number) : strlen(number);
    const char *rest = end != NULL ? end : "";
    bool has_point = memchr(number, '.', length) != NULL;
    while (has_point && (number[length - 1] == '0' || number[length - 1] == '.')) {
        has_point = number[--length] != '.';
    }
    snprintf(text, size, "%.*s%s", (int)length, number, rest);
}

static void show_default(const struct parameter *row, char *text, size_t size)
{
    if (row->when_absent == DEFAULT_REQUIRED) {
        snprintf(text, size, "must be given");
    } else if (row->when_absent == DEFAULT_NONE || isnan(row->standard)) {
        snprintf(text, size, "none");
    } else {
        show(row->standard, row->dimension, text, size);
    }
}

static void show_range(const struct parameter *row, char *text, size_t size)
{
    char least[TEXT_SIZE], most[TEXT_SIZE];
    show(row->least, row->dimension, least, sizeof least);
    show(row->most, row->dimension, most, sizeof most);
    const char *sign = row->above_least ? "above" : "from";
    if (isinf(row->least) && isinf(row->most)) {
        snprintf(text, size, "any");
    } else if (isinf(row->most)) {
        snprintf(text, size, "%s %s", sign, least);
    } else if (isinf(row->least)) {
        snprintf(text, size, "to %s", most);
    } else {
        snprintf(text, size, "%s %s to %s", sign, least, most);
    }
}

static void print_parameters(const char *heading, const struct parameter *rows, int count)
{
    int shown = 0;
    for (int k = 0; k < count; k++) {
        char unit[TEXT_SIZE], standard[TEXT_SIZE], range[4 * TEXT_SIZE];
        const struct parameter *row = &rows[k];
        if (row->when_absent == DEFAULT_HIDDEN) {
            continue;
        }
        if (shown++ == 0) {
            printf("\n%s\n\n| parameter | unit | default | range | meaning |\n"
                   "| --- | --- | --- | --- | --- |\n",
                   heading);
        }
        dimension_unit(row->dimension, unit, sizeof unit);
        show_default(row, standard, sizeof standard);
        show_range(row, range, sizeof range);
        printf("| `%s` | %s | %s | %s | %s |\n", row->name, unit[0] != '\0' ? unit : "1", standard,
               range, row->text);
    }
}

static void print_form(const struct device_type *type)
{
    printf("\n    %s NAME", type->word);
    if (type->form == FORM_ARROW) {
        printf(" %s -> %s", type->terminals[0].name, type->terminals[1].name);
    }
    for (int k = 0; type->form == FORM_PINS && k < type->terminal_count; k++) {
        const struct terminal *row = &type->terminals[k];
        printf(row->optional ? " [%s=]" : " %s=", row->name);
    }
    if (type->value_parameter >= 0) {
        printf(" VALUE");
    }
    for (int k = 0; k < type->parameter_count; k++) {
        const struct parameter *row = &type->parameters[k];
        bool is_terminal = false; /* a limit of an opamp is a value or a node */
        for (int t = 0; t < type->terminal_count; t++) {
            is_terminal |= strcmp(type->terminals[t].name, row->name) == 0;
        }
        if (row->when_absent == DEFAULT_HIDDEN || k == type->value_parameter || is_terminal) {
            continue;
        }
        printf(row->when_absent == DEFAULT_REQUIRED ? " %s=" : " [%s=]", row->name);
    }
    printf("%s%s%s\n", type->model_kind != NULL ? " [model=]" : "",
           type->extra_kind == EXTRA_LAW ? " i = EXPRESSION" : "",
           type->extra_kind == EXTRA_CURVE ? " \"FILE.csv\"" : "");
}

static void print_terminals(const struct device_type *type)
{
    printf("\nTerminals:");
    for (int k = 0; k < type->terminal_count; k++) {
        printf("%s `%s` %s", k > 0 ? "," : "", type->terminals[k].name, type->terminals[k].text);
    }
    printf(".\n");
}

static void print_quantities(const struct device_type *type)
{
    printf("\nQuantities:\n\n| quantity | unit | meaning |\n| --- | --- | --- |\n");
    for (int k = 0; k < type->quantity_count; k++) {
        char unit[TEXT_SIZE];
        dimension_unit(type->quantities[k].dimension, unit, sizeof unit);
        printf("| `%s` | %s | %s |\n", type->quantities[k].name, unit[0] != '\0' ? unit : "1",
               type->quantities[k].text);
    }
}

/* Whether a second family member shares the tables, so that one print serves both. */
static bool same_tables(const struct device_type *a, const struct device_type *b)
{
    return b != NULL && a->parameters == b->parameters &&
           a->model_parameters == b->model_parameters && a->quantities == b->quantities &&
           a->terminals == b->terminals;
}

static bool print_family(const struct family *family)
{
    const struct device_type *type = find_type(family->word);
    const struct device_type *mirror = family->mirror != NULL ? find_type(family->mirror) : NULL;
    if (type == NULL || (family->mirror != NULL && !same_tables(type, mirror))) {
        fprintf(stderr, "devices_page: no such device, or unlike tables: %s\n", family->word);
        return false;
    }
    printf("\n## %s\n\n`%s`: %s.", family->heading, type->word, type->summary);
    if (mirror != NULL) {
        printf(" `%s`: %s, the same with every voltage and current reflected.", mirror->word,
               mirror->summary);
    }
    printf("\n");
    print_form(type);
    print_terminals(type);
    printf("\n%s", family->text);
    print_parameters("Of the device:", type->parameters, type->parameter_count);
    if (type->model_kind != NULL) {
        char heading[TEXT_SIZE];
        snprintf(heading, sizeof heading, "Of a model of kind `%s`%s%s%s:", type->model_kind,
                 mirror != NULL ? " or `" : "", mirror != NULL ? mirror->model_kind : "",
                 mirror != NULL ? "`" : "");
        print_parameters(heading, type->model_parameters, type->model_parameter_count);
    }
    print_quantities(type);
    return true;
}

/* Every device of the program must be in some family. */
static bool all_told(void)
{
    const int count = (int)(sizeof families / sizeof families[0]);
    for (int k = 0; k < device_type_count; k++) {
        bool told = false;
        for (int f = 0; f < count; f++) {
            const struct family *family = &families[f];
            told |= find_type(family->word) == device_types[k] ||
                    (family->mirror != NULL && find_type(family->mirror) == device_types[k]);
        }
        if (!told) {
            fprintf(stderr, "devices_page: no text for %s\n", device_types[k]->word);
            return false;
        }
    }
    return true;
}

int main(void)
{
    printf("# Devices\n\n"
           "Made by `tests/docs/devices_page.c` from the tables in `src/devices`; a test compares "
           "them.\n"
           "Units are SI; T is the temperature of the cell, T0 that of the model values "
           "(`measured_at`,\n"
           "27 C). A parameter that is `none` switches its effect off. Currents and voltages of "
           "transistors\n"
           "are positive in normal operation, in both polarities. `ampstead models FILE` shows "
           "every value\n"
           "in force.\n\n"
           "The hand view has none of these effects, the full view all of them:\n\n");
    for (int bit = 0; bit < EFFECT_COUNT; bit++) {
        printf("- %s\n", effect_name(bit));
    }
    bool good = all_told();
    for (size_t k = 0; k < sizeof families / sizeof families[0]; k++) {
        good = print_family(&families[k]) && good;
    }
    return good && fflush(stdout) == 0 ? 0 : 1;
}
