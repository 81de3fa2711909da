/* measured.c: CSV files of measured curves to rows in SI units. */
#include "calibrate/measured.h"

#include <math.h>
#include <string.h>

#include "calibrate/csv.h"

const struct column_row column_rows[COLUMN_COUNT] = {
    [COLUMN_VGS] = {"vgs", {12, 0, 0, 0}},
    [COLUMN_VDS] = {"vds", {12, 0, 0, 0}},
    [COLUMN_VSB] = {"vsb", {12, 0, 0, 0}},
    [COLUMN_ID] = {"id", {0, 12, 0, 0}},
    [COLUMN_V] = {"v", {12, 0, 0, 0}},
    [COLUMN_I] = {"i", {0, 12, 0, 0}},
    [COLUMN_VBE] = {"vbe", {12, 0, 0, 0}},
    [COLUMN_VCE] = {"vce", {12, 0, 0, 0}},
    [COLUMN_IC] = {"ic", {0, 12, 0, 0}},
    [COLUMN_IB] = {"ib", {0, 12, 0, 0}},
    [COLUMN_TEMPERATURE] = {"temperature", {0, 0, 12, 0}},
};

/* A header cell: name and unit. */
struct heading {
    struct csv_field name;
    double factor, shift; /* SI = factor * number + shift */
    bool has_unit;
    struct dimension dimension;
};

static const struct source_file *source_of(const struct measured_context *context, uint32_t file)
{
    return &context->sources->files[file];
}

/* "C" is the one unit with a zero of its own. */
static bool read_unit(const struct source_file *source, uint32_t begin, uint32_t end,
                      struct heading *heading)
{
    bool is_celsius = false;
    while (end > begin && (source->text[end - 1] == ' ')) {
        end--;
    }
    if (begin >= end || !unit_parse(source->text + begin, end - begin, &heading->factor,
                                    &heading->dimension, &is_celsius)) {
        return false;
    }
    heading->has_unit = true;
    heading->shift = is_celsius ? 273.15 : 0;
    return true;
}

/* name, name unit, name [unit], name (unit), name/unit, name_unit; "M1.id" is id */
static struct heading read_heading(const struct source_file *source, struct csv_field field)
{
    struct heading it = {.name = field, .factor = 1};
    const char *text = source->text;
    for (uint32_t k = field.begin; k < field.end; k++) {
        it.name.begin = text[k] == '.' ? k + 1 : it.name.begin;
    }
    for (uint32_t k = field.begin; k < field.end; k++) {
        if (strchr(" [(/_", text[k]) == NULL) {
            continue;
        }
        uint32_t begin = k, end = field.end;
        while (begin < end && strchr(" [(/_", text[begin]) != NULL) {
            begin++;
        }
        if (end > begin && (text[end - 1] == ']' || text[end - 1] == ')')) {
            end--;
        }
        if (read_unit(source, begin, end, &it)) {
            it.name.end = k;
            return it;
        }
    }
    return it;
}

static bool same_dimension(const struct heading *heading, enum column column)
{
    return !heading->has_unit || dimension_equal(heading->dimension, column_rows[column].dimension);
}

/* What the fields of a file mean: for each column its field, or -1. */
struct map {
    int field[COLUMN_COUNT];
    double factor[COLUMN_COUNT], shift[COLUMN_COUNT];
    int field_count;
};

static bool set_map(struct measured_context *context, struct measured *device, struct map *map,
                    enum column column, int index, const struct heading *heading, double factor)
{
    if (map->field[column] >= 0) {
        diagnostics_add(context->diagnostics,
                        (struct span){device->file, heading->name.begin, heading->name.end}, NULL,
                        "column '%s' is there twice", column_rows[column].name);
        return false;
    }
    map->field[column] = index;
    map->factor[column] = factor;
    map->shift[column] = heading->shift;
    device->has_column[column] = true;
    return true;
}

static bool map_field(struct measured_context *context, struct measured *device, struct map *map,
                      int index, struct csv_field field, const bool *allowed)
{
    const struct source_file *source = source_of(context, device->file);
    for (int k = 0; k < context->replacement_count; k++) {
        const struct replacement *it = &context->replacements[k];
        if (csv_is(source, field, it->header) && allowed[it->column]) {
            const struct heading plain = {.name = field, .factor = 1};
            return set_map(context, device, map, it->column, index, &plain, it->factor);
        }
    }
    struct heading heading = read_heading(source, field);
    for (int c = 0; c < COLUMN_COUNT; c++) {
        bool is_reversed = c == COLUMN_VSB && csv_is(source, heading.name, "vbs");
        bool is_short = c == COLUMN_TEMPERATURE && csv_is(source, heading.name, "t");
        if (!allowed[c] ||
            (!csv_is(source, heading.name, column_rows[c].name) && !is_reversed && !is_short)) {
            continue;
        }
        if (!same_dimension(&heading, (enum column)c)) {
            diagnostics_add(context->diagnostics,
                            (struct span){device->file, field.begin, field.end}, NULL,
                            "the unit of column '%s' does not fit it", column_rows[c].name);
            return false;
        }
        double factor = is_reversed ? -heading.factor : heading.factor;
        return set_map(context, device, map, (enum column)c, index, &heading, factor);
    }
    if (device->unused == NULL) {
        device->unused = csv_text(context->arena, source, field);
    }
    return true;
}

static bool check_map(struct measured_context *context, const struct measured *device,
                      const struct map *map, struct csv_field first, struct csv_field last,
                      const enum column *wanted, int wanted_count)
{
    for (int k = 0; k < wanted_count; k++) {
        if (map->field[wanted[k]] < 0) {
            diagnostics_add(context->diagnostics,
                            (struct span){device->file, first.begin, last.end},
                            "the first line names the columns; --columns gives other names",
                            "no column is called '%s'", column_rows[wanted[k]].name);
            return false;
        }
    }
    return true;
}

static int find_kelvin(struct measured *device, double kelvin)
{
    for (int k = 0; k < device->kelvin_count; k++) {
        if (fabs(device->kelvins[k] - kelvin) < 1e-6) {
            return k;
        }
    }
    if (device->kelvin_count == MEASURED_TEMPERATURE_LIMIT) {
        return -1;
    }
    device->kelvins[device->kelvin_count] = kelvin;
    return device->kelvin_count++;
}

/* One number of a row; false after an error. */
static bool read_value(struct measured_context *context, const struct measured *device,
                       const struct map *map, enum column column, const struct csv_field *fields,
                       int count, struct measured_row *row)
{
    const struct source_file *source = source_of(context, device->file);
    const char *name = column_rows[column].name;
    int index = map->field[column];
    double number;
    if (index >= count || fields[index].begin == fields[index].end) {
        struct span where = {device->file, row->begin, row->end};
        diagnostics_add(context->diagnostics, where, NULL, "the value of '%s' is missing", name);
        return false;
    }
    struct span where = {device->file, fields[index].begin, fields[index].end};
    if (!csv_number(source, fields[index], &number)) {
        diagnostics_add(context->diagnostics, where, NULL, "a number is wanted for '%s'", name);
        return false;
    }
    row->value[column] = map->factor[column] * number + map->shift[column];
    if (column == COLUMN_TEMPERATURE && !(row->value[column] > 0)) {
        diagnostics_add(context->diagnostics, where, NULL,
                        "a temperature is above 0 K (a column in C is headed 'temperature C')");
        return false;
    }
    return true;
}

/* Adds one row; false after an error or when memory is short. */
static bool read_row(struct measured_context *context, struct measured *device,
                     const struct map *map, const struct csv_field *fields, int count,
                     double kelvin, int *capacity)
{
    struct measured_row row = {.begin = fields[0].begin, .end = fields[count - 1].end};
    bool is_good = true;
    for (int c = 0; c < COLUMN_COUNT; c++) {
        row.value[c] = NAN;
        if (map->field[c] >= 0) {
            is_good &= read_value(context, device, map, (enum column)c, fields, count, &row);
        }
    }
    if (!is_good) {
        return false;
    }
    double own = row.value[COLUMN_TEMPERATURE];
    row.kelvin = find_kelvin(device, isnan(own) ? kelvin : own);
    if (row.kelvin < 0 || device->row_count == MEASURED_ROW_LIMIT) {
        diagnostics_add(context->diagnostics, (struct span){device->file, row.begin, row.end}, NULL,
                        row.kelvin < 0 ? "more than %d temperatures in one file"
                                       : "more than %d rows in one file",
                        row.kelvin < 0 ? MEASURED_TEMPERATURE_LIMIT : MEASURED_ROW_LIMIT);
        return false;
    }
    struct measured_row *rows =
        arena_grow(context->arena, device->rows, device->row_count, capacity, sizeof *rows);
    if (rows == NULL) {
        return false;
    }
    device->rows = rows;
    rows[device->row_count++] = row;
    return true;
}

enum status measured_read(struct measured_context *context, struct measured *device, double kelvin,
                          const enum column *wanted, int wanted_count, const enum column *optional,
                          int optional_count)
{
    const struct source_file *source = source_of(context, device->file);
    struct csv_field fields[CSV_FIELD_LIMIT];
    struct map map;
    bool allowed[COLUMN_COUNT] = {false};
    uint32_t at = 0;
    int capacity = 0, error_count = 0;
    memset(&map, 0, sizeof map);
    for (int c = 0; c < COLUMN_COUNT; c++) {
        map.field[c] = -1;
    }
    for (int k = 0; k < wanted_count; k++) {
        allowed[wanted[k]] = true;
    }
    for (int k = 0; k < optional_count; k++) {
        allowed[optional[k]] = true;
    }
    int count = csv_line(source, &at, fields);
    if (count == 0) {
        diagnostics_add(context->diagnostics, (struct span){device->file, 0, 0}, NULL,
                        "the file has no rows");
        return STATUS_INPUT;
    }
    bool is_good = true;
    for (int k = 0; k < count; k++) {
        is_good &= map_field(context, device, &map, k, fields[k], allowed);
    }
    if (!is_good ||
        !check_map(context, device, &map, fields[0], fields[count - 1], wanted, wanted_count)) {
        return STATUS_INPUT;
    }
    while ((count = csv_line(source, &at, fields)) > 0 && error_count <= DIAGNOSTIC_LIMIT) {
        error_count += read_row(context, device, &map, fields, count, kelvin, &capacity) ? 0 : 1;
        if (arena_failed(context->arena)) {
            return STATUS_MEMORY;
        }
    }
    return error_count == 0 ? STATUS_OK : STATUS_INPUT;
}

static bool read_replacement(struct measured_context *context, uint32_t file,
                             struct csv_field field, struct replacement *it)
{
    const struct source_file *source = source_of(context, file);
    const char *text = source->text;
    struct span where = {file, field.begin, field.end};
    uint32_t equals = field.begin;
    while (equals < field.end && text[equals] != '=') {
        equals++;
    }
    struct csv_field left = {field.begin, equals}, right = {equals + 1, field.end};
    while (left.end > left.begin && text[left.end - 1] == ' ') {
        left.end--;
    }
    while (right.begin < right.end && text[right.begin] == ' ') {
        right.begin++;
    }
    double sign = 1;
    if (right.begin < right.end && text[right.begin] == '-') {
        sign = -1;
        right.begin++;
    }
    if (equals == field.end || right.begin >= right.end) {
        diagnostics_add(context->diagnostics, where, "such as vgs=VG, id=-ID uA",
                        "COLUMN=HEADER is wanted here");
        return false;
    }
    int column = 0;
    while (column < COLUMN_COUNT && !csv_is(source, left, column_rows[column].name)) {
        column++;
    }
    struct heading heading = {.name = right, .factor = 1};
    for (uint32_t k = right.begin; k < right.end; k++) {
        if (text[k] == ' ' && read_unit(source, k + 1, right.end, &heading)) {
            heading.name.end = k;
            break;
        }
    }
    if (column == COLUMN_COUNT || !same_dimension(&heading, (enum column)column) ||
        heading.shift > 0) {
        diagnostics_add(context->diagnostics, where, NULL,
                        column == COLUMN_COUNT ? "this column is not known"
                                               : "the unit does not fit this column");
        return false;
    }
    *it = (struct replacement){(enum column)column, csv_text(context->arena, source, heading.name),
                               sign * heading.factor};
    return it->header != NULL;
}

int measured_replacements(struct measured_context *context, uint32_t file, struct replacement *list)
{
    struct csv_field fields[CSV_FIELD_LIMIT];
    uint32_t at = 0;
    int count = csv_line(source_of(context, file), &at, fields);
    if (count == 0 || count > MEASURED_REPLACEMENT_LIMIT) {
        diagnostics_add(context->diagnostics, (struct span){file, 0, 0},
                        "such as vgs=VG, id=-ID uA", "COLUMN=HEADER is wanted here");
        return -1;
    }
    for (int k = 0; k < count; k++) {
        if (!read_replacement(context, file, fields[k], &list[k])) {
            return -1;
        }
    }
    return count;
}
