/* input.c: the request and its files to devices with readings. */
#include "calibrate/input.h"

#include <math.h>
#include <string.h>

#include "calibrate/csv.h"
#include "language/expression.h"
#include "language/parser.h"
#include "language/source.h"

enum { DEVICE_LIMIT = 1000 };

/* What a kind of device is measured by. */
struct kind {
    const char *word;
    const char *letter; /* in a list: "n", "p"; NULL: none */
    enum column wanted[3];
    int wanted_count;
    enum column optional[3];
    int optional_count;
    enum column voltages[3]; /* of the sweeps */
    int voltage_count;
    bool has_geometry;
};

static const struct kind kinds[] = {
    {"nmos",
     "n",
     {COLUMN_VGS, COLUMN_VDS, COLUMN_ID},
     3,
     {COLUMN_VSB, COLUMN_TEMPERATURE},
     2,
     {COLUMN_VGS, COLUMN_VDS, COLUMN_VSB},
     3,
     true},
    {"pmos",
     "p",
     {COLUMN_VGS, COLUMN_VDS, COLUMN_ID},
     3,
     {COLUMN_VSB, COLUMN_TEMPERATURE},
     2,
     {COLUMN_VGS, COLUMN_VDS, COLUMN_VSB},
     3,
     true},
    {"diode", NULL, {COLUMN_V, COLUMN_I}, 2, {COLUMN_TEMPERATURE}, 1, {COLUMN_V}, 1, false},
    {"resistor", NULL, {COLUMN_V, COLUMN_I}, 2, {COLUMN_TEMPERATURE}, 1, {COLUMN_V}, 1, false},
    {"npn",
     NULL,
     {COLUMN_VCE, COLUMN_IC},
     2,
     {COLUMN_VBE, COLUMN_IB, COLUMN_TEMPERATURE},
     3,
     {COLUMN_VBE, COLUMN_VCE},
     2,
     false},
    {"pnp",
     NULL,
     {COLUMN_VCE, COLUMN_IC},
     2,
     {COLUMN_VBE, COLUMN_IB, COLUMN_TEMPERATURE},
     3,
     {COLUMN_VBE, COLUMN_VCE},
     2,
     false},
};

enum { KIND_COUNT = sizeof kinds / sizeof kinds[0] };

/* A device as the request or the list names it, before it is read. */
struct entry {
    const char *path, *shown;
    const struct kind *kind;
    double width, length, multiplicity, kelvin; /* NAN: not given */
    struct span where;
    bool is_held;
};

struct reader {
    const struct calibration_request *request;
    struct calibration *calibration;
    const struct kind *kind; /* of --kind; NULL: none */
    double width, length;    /* of --size; NAN */
    double kelvin;           /* of --temperature or assumed */
    struct entry *entries;
    int entry_count, entry_capacity;
    struct replacement replacements[MEASURED_REPLACEMENT_LIMIT];
    int replacement_count;
};

static bool complain(struct reader *reader, struct span where, const char *hint, const char *text)
{
    diagnostics_add(&reader->calibration->diagnostics, where, hint, "%s", text);
    return false;
}

static bool find_nothing(void *self, const char *name, struct span where, struct quantity *value)
{
    (void)self;
    (void)name;
    (void)where;
    (void)value;
    return false;
}

/* An option as a source of its own, so that a wrong one is shown with a mark. */
static bool add_text(struct reader *reader, const char *name, const char *text, size_t length,
                     uint32_t *file)
{
    struct calibration *c = reader->calibration;
    return source_add_text(c->arena, &c->sources, name, text, length, &c->diagnostics, file) ==
           STATUS_OK;
}

static const struct expression *read_expression(struct reader *reader, const char *name,
                                                const char *text, size_t length)
{
    struct calibration *c = reader->calibration;
    uint32_t file = 0;
    return add_text(reader, name, text, length, &file)
               ? parse_expression(c->arena, &c->sources, file, &c->diagnostics)
               : NULL;
}

static const struct expression_scope no_names = {.find = find_nothing, .thermal_voltage = NAN};

/* A value above 0 with its dimension. */
static bool read_value(struct reader *reader, const char *name, const char *text, size_t length,
                       struct dimension dimension, double *value)
{
    const struct expression *expression = read_expression(reader, name, text, length);
    if (expression == NULL || !expression_wanted(expression, &no_names, dimension,
                                                 &reader->calibration->diagnostics, value)) {
        return false;
    }
    if (!(*value > 0) || !isfinite(*value)) {
        struct span where = {(uint32_t)reader->calibration->sources.count - 1, 0, (uint32_t)length};
        return complain(reader, where, NULL, "a value above 0 is wanted here");
    }
    return true;
}

static bool read_size(struct reader *reader, const char *text)
{
    const char *stroke = strchr(text, '/');
    if (stroke == NULL) {
        uint32_t file = 0;
        return add_text(reader, "--size", text, strlen(text), &file) &&
               complain(reader, (struct span){file, 0, (uint32_t)strlen(text)}, "such as 7u/8u",
                        "a size is a width over a length");
    }
    return read_value(reader, "--size", text, (size_t)(stroke - text), DIMENSION_LENGTH,
                      &reader->width) &&
           read_value(reader, "--size", stroke + 1, strlen(stroke + 1), DIMENSION_LENGTH,
                      &reader->length);
}

static const struct kind *find_kind(const char *word)
{
    for (int k = 0; k < KIND_COUNT; k++) {
        if (strcmp(kinds[k].word, word) == 0) {
            return &kinds[k];
        }
    }
    return NULL;
}

static bool read_kind(struct reader *reader, const char *word)
{
    const char *words[KIND_COUNT];
    reader->kind = find_kind(word);
    for (int k = 0; k < KIND_COUNT; k++) {
        words[k] = kinds[k].word;
    }
    if (reader->kind == NULL) {
        const char *near = near_name(word, words, KIND_COUNT);
        diagnostics_add(&reader->calibration->diagnostics, SPAN_NONE, near,
                        "'%s' is no kind that can be calibrated (nmos, pmos, diode, resistor, npn, "
                        "pnp)",
                        word);
        return false;
    }
    return true;
}

static bool read_temperature(struct reader *reader, const char *name, const char *text,
                             size_t length, double *kelvin)
{
    const struct expression *expression = read_expression(reader, name, text, length);
    return expression != NULL &&
           expression_temperature(expression, &no_names, &reader->calibration->diagnostics, kelvin);
}

static bool read_options(struct reader *reader)
{
    const struct calibration_request *request = reader->request;
    struct calibration *c = reader->calibration;
    bool is_good = true;
    c->noise = CALIBRATION_NOISE;
    c->relative = CALIBRATION_RELATIVE;
    reader->width = reader->length = NAN;
    reader->kelvin = CALIBRATION_KELVIN;
    c->is_temperature_assumed = request->temperature == NULL;
    c->is_robust = request->is_robust;
    if (request->kind != NULL) {
        is_good &= read_kind(reader, request->kind);
    }
    if (request->temperature != NULL) {
        is_good &= read_temperature(reader, "--temperature", request->temperature,
                                    strlen(request->temperature), &reader->kelvin);
    }
    if (request->noise != NULL) {
        is_good &= read_value(reader, "--noise", request->noise, strlen(request->noise),
                              DIMENSION_CURRENT, &c->noise);
    }
    if (request->relative != NULL) {
        is_good &= read_value(reader, "--accuracy", request->relative, strlen(request->relative),
                              DIMENSION_NONE, &c->relative);
    }
    if (request->size != NULL) {
        is_good &= read_size(reader, request->size);
    }
    if (request->columns != NULL) {
        uint32_t file = 0;
        struct measured_context context = {c->arena, &c->sources, &c->diagnostics, NULL, 0};
        is_good &= add_text(reader, "--columns", request->columns, strlen(request->columns), &file);
        reader->replacement_count =
            is_good ? measured_replacements(&context, file, reader->replacements) : -1;
        is_good &= reader->replacement_count >= 0;
    }
    return is_good;
}

static struct entry *add_entry(struct reader *reader)
{
    struct entry *list = arena_grow(reader->calibration->arena, reader->entries,
                                    reader->entry_count, &reader->entry_capacity, sizeof *list);
    if (list == NULL) {
        return NULL;
    }
    reader->entries = list;
    struct entry *entry = &list[reader->entry_count++];
    *entry = (struct entry){.kind = reader->kind,
                            .width = NAN,
                            .length = NAN,
                            .multiplicity = 1,
                            .kelvin = NAN,
                            .where = SPAN_NONE};
    return entry;
}

static const char *base_name(const char *path)
{
    const char *slash = strrchr(path, '/');
    return slash == NULL ? path : slash + 1;
}

/* The entry of a list that names the same file; NULL: none. */
static struct entry *find_entry(struct reader *reader, const char *path)
{
    for (int k = 0; k < reader->entry_count; k++) {
        const char *known = reader->entries[k].path;
        if (reader->entries[k].where.file == SPAN_NO_FILE) {
            continue; /* not of the list */
        }
        if (strcmp(known, path) == 0 ||
            (strchr(path, '/') == NULL && strcmp(base_name(known), path) == 0)) {
            return &reader->entries[k];
        }
    }
    return NULL;
}

static bool read_file_entry(struct reader *reader, const struct calibration_file *file)
{
    struct entry *entry = file->is_held ? find_entry(reader, file->path) : NULL;
    if (entry == NULL) {
        entry = add_entry(reader);
        if (entry == NULL) {
            return false;
        }
        entry->path = entry->shown = file->path;
        entry->width = reader->width;
        entry->length = reader->length;
    }
    entry->is_held = file->is_held;
    bool is_good = true;
    if (file->width != NULL) {
        is_good &= read_value(reader, "W", file->width, strlen(file->width), DIMENSION_LENGTH,
                              &entry->width);
    }
    if (file->length != NULL) {
        is_good &= read_value(reader, "L", file->length, strlen(file->length), DIMENSION_LENGTH,
                              &entry->length);
    }
    return is_good;
}

/* Columns of a list. */
enum list_column {
    LIST_FILE,
    LIST_KIND,
    LIST_WIDTH,
    LIST_LENGTH,
    LIST_M,
    LIST_TEMPERATURE,
    LIST_COUNT
};

static const struct {
    enum list_column column;
    const char *name;
    double factor;
} list_names[] = {
    {LIST_FILE, "file", 0},
    {LIST_KIND, "channel", 0},
    {LIST_KIND, "kind", 0},
    {LIST_WIDTH, "w_um", 1e-6},
    {LIST_LENGTH, "l_um", 1e-6},
    {LIST_WIDTH, "w", 0},
    {LIST_LENGTH, "l", 0},
    {LIST_M, "m", 1},
    {LIST_TEMPERATURE, "temperature", 0},
    {LIST_TEMPERATURE, "temperature_c", 1},
};

struct list_map {
    int field[LIST_COUNT];
    double factor[LIST_COUNT];
};

static bool map_list(struct reader *reader, const struct source_file *source, uint32_t file,
                     const struct csv_field *fields, int count, struct list_map *map)
{
    for (int c = 0; c < LIST_COUNT; c++) {
        map->field[c] = -1;
    }
    for (int k = 0; k < count; k++) {
        for (size_t n = 0; n < sizeof list_names / sizeof list_names[0]; n++) {
            if (csv_is(source, fields[k], list_names[n].name)) {
                map->field[list_names[n].column] = k;
                map->factor[list_names[n].column] = list_names[n].factor;
            }
        }
    }
    if (map->field[LIST_FILE] < 0) {
        return complain(reader, (struct span){file, fields[0].begin, fields[count - 1].end},
                        "file, kind, w_um, l_um and, where needed, m and temperature",
                        "the first line of a list names its columns; no column is called 'file'");
    }
    return true;
}

/* A length, a number or a temperature in a list: a plain number times the factor of its column, or
 * text with its unit. An empty field leaves the value. */
static bool list_value(struct reader *reader, const struct source_file *source, uint32_t file,
                       struct csv_field field, const struct list_map *map, enum list_column column,
                       double *value)
{
    double number, factor = map->factor[column];
    struct span where = {file, field.begin, field.end};
    const char *text = source->text + field.begin;
    size_t length = field.end - field.begin;
    if (length == 0) {
        return true;
    }
    if (factor > 0) {
        if (!csv_number(source, field, &number)) {
            return complain(reader, where, NULL, "a number is wanted here");
        }
        *value = factor * number + (column == LIST_TEMPERATURE ? 273.15 : 0);
        if (!(*value > 0)) {
            return complain(reader, where, NULL, "a value above 0 is wanted here");
        }
        return true;
    }
    /* the expression is a source of its own: its name tells the place */
    const char *name = arena_format(reader->calibration->arena, "%s:%d", source->name,
                                    source_line(&reader->calibration->sources, where));
    if (name == NULL) {
        return false;
    }
    return column == LIST_TEMPERATURE
               ? read_temperature(reader, name, text, length, value)
               : read_value(reader, name, text, length, DIMENSION_LENGTH, value);
}

static const struct kind *list_kind(struct reader *reader, const struct source_file *source,
                                    uint32_t file, struct csv_field field)
{
    for (int k = 0; k < KIND_COUNT; k++) {
        if (csv_is(source, field, kinds[k].word) ||
            (kinds[k].letter != NULL && csv_is(source, field, kinds[k].letter))) {
            return &kinds[k];
        }
    }
    complain(reader, (struct span){file, field.begin, field.end},
             "n, p, nmos, pmos, diode, resistor, npn or pnp", "this kind of device is not known");
    return NULL;
}

static bool read_list_row(struct reader *reader, uint32_t file, const struct list_map *map,
                          const struct csv_field *fields, int count)
{
    struct calibration *c = reader->calibration;
    const struct source_file source = c->sources.files[file];
    const struct kind *kind = reader->kind;
    bool is_good = true;
    for (int k = 0; k < LIST_COUNT; k++) {
        if (map->field[k] >= count) {
            return complain(reader, (struct span){file, fields[0].begin, fields[count - 1].end},
                            NULL, "this line has fewer columns than the first one");
        }
    }
    if (map->field[LIST_KIND] >= 0) {
        kind = list_kind(reader, &source, file, fields[map->field[LIST_KIND]]);
        if (kind == NULL || (reader->kind != NULL && kind != reader->kind)) {
            return kind != NULL;
        }
    }
    struct entry *entry = add_entry(reader);
    struct csv_field name = fields[map->field[LIST_FILE]];
    if (entry == NULL) {
        return false;
    }
    const char *list = reader->request->list;
    int folder = strrchr(list, '/') == NULL ? 0 : (int)(strrchr(list, '/') - list) + 1;
    entry->kind = kind;
    entry->where = (struct span){file, name.begin, name.end};
    entry->shown = csv_text(c->arena, &source, name);
    entry->path = arena_format(c->arena, "%.*s%.*s", source.text[name.begin] == '/' ? 0 : folder,
                               list, (int)(name.end - name.begin), source.text + name.begin);
    double *values[LIST_COUNT] = {[LIST_WIDTH] = &entry->width,
                                  [LIST_LENGTH] = &entry->length,
                                  [LIST_M] = &entry->multiplicity,
                                  [LIST_TEMPERATURE] = &entry->kelvin};
    for (int k = LIST_WIDTH; k < LIST_COUNT; k++) {
        if (map->field[k] >= 0) {
            is_good &= list_value(reader, &source, file, fields[map->field[k]], map,
                                  (enum list_column)k, values[k]);
        }
    }
    return is_good && entry->path != NULL && entry->shown != NULL;
}

static bool read_list(struct reader *reader)
{
    struct calibration *c = reader->calibration;
    struct csv_field fields[CSV_FIELD_LIMIT];
    struct list_map map = {{0}, {0}};
    uint32_t file = 0, at = 0;
    if (source_read(c->arena, &c->sources, reader->request->list, NULL, SPAN_NONE, &c->diagnostics,
                    &file) != STATUS_OK) {
        return false;
    }
    int count = csv_line(&c->sources.files[file], &at, fields);
    if (count == 0) {
        return complain(reader, (struct span){file, 0, 0}, NULL, "the list is empty");
    }
    bool is_good = map_list(reader, &c->sources.files[file], file, fields, count, &map);
    while (is_good && (count = csv_line(&c->sources.files[file], &at, fields)) > 0) {
        is_good = read_list_row(reader, file, &map, fields, count);
    }
    return is_good;
}

static bool check_entry(struct reader *reader, const struct entry *entry)
{
    if (entry->kind == NULL) {
        diagnostics_add(&reader->calibration->diagnostics, entry->where,
                        "--kind nmos, pmos, diode, resistor, npn or pnp",
                        "%s: the kind of device is not given", entry->shown);
        return false;
    }
    if (entry->kind->has_geometry && (isnan(entry->width) || isnan(entry->length))) {
        diagnostics_add(&reader->calibration->diagnostics, entry->where,
                        "--size 7u/8u, W=7u L=8u behind the file, or a list",
                        "%s: width and length are not given", entry->shown);
        return false;
    }
    return true;
}

/* Nothing is conducting in the normal direction: the signs were not reflected. */
static bool check_signs(struct reader *reader, const struct calibrated_device *device)
{
    const struct measured *data = &device->data;
    enum column column = data->has_column[COLUMN_ID] ? COLUMN_ID : COLUMN_IC;
    double most = 0, least = 0;
    for (int k = 0; k < data->row_count && data->has_column[column]; k++) {
        most = fmax(most, data->rows[k].value[column]);
        least = fmin(least, data->rows[k].value[column]);
    }
    if (-least > 10 * most && -least > 100 * reader->calibration->noise) {
        return complain(reader, (struct span){data->file, 0, 0},
                        "p-channel and pnp curves are written as for an n-channel or npn device; "
                        "--columns \"vgs=-VGS, vds=-VDS, id=-ID\" reflects them",
                        "the currents are negative");
    }
    return true;
}

static enum status read_device(struct reader *reader, const struct entry *entry,
                               struct calibrated_device *device)
{
    struct calibration *c = reader->calibration;
    struct measured_context context = {c->arena, &c->sources, &c->diagnostics, reader->replacements,
                                       reader->replacement_count};
    const struct kind *kind = entry->kind;
    device->channel = kind->word;
    device->type = strcmp(kind->word, "resistor") == 0 ? NULL : device_find(kind->word);
    device->is_held = entry->is_held;
    device->data.name = entry->shown;
    device->data.width = kind->has_geometry ? entry->width : NAN;
    device->data.length = kind->has_geometry ? entry->length : NAN;
    device->data.multiplicity = entry->multiplicity;
    device->unit_ratio = NAN;
    enum status status = source_read(c->arena, &c->sources, entry->path, entry->shown, entry->where,
                                     &c->diagnostics, &device->data.file);
    if (status != STATUS_OK) {
        return status;
    }
    double kelvin = isnan(entry->kelvin) ? reader->kelvin : entry->kelvin;
    status = measured_read(&context, &device->data, kelvin, kind->wanted, kind->wanted_count,
                           kind->optional, kind->optional_count);
    if (status != STATUS_OK) {
        return status;
    }
    if (device->data.row_count == 0) {
        complain(reader, (struct span){device->data.file, 0, 0}, NULL, "the file has no rows");
        return STATUS_INPUT;
    }
    if (!check_signs(reader, device)) {
        return STATUS_INPUT;
    }
    c->is_temperature_assumed &=
        isnan(entry->kelvin) && !device->data.has_column[COLUMN_TEMPERATURE];
    return measured_find_sweeps(c->arena, &device->data, kind->voltages, kind->voltage_count)
               ? STATUS_OK
               : STATUS_MEMORY;
}

/* The temperature at which the model values hold: the one of most readings. */
static void settle_temperature(struct calibration *c)
{
    int most = 0;
    c->measured_kelvin = CALIBRATION_KELVIN;
    for (int d = 0; d < c->device_count; d++) {
        for (int t = 0; t < c->devices[d].data.kelvin_count; t++) {
            double kelvin = c->devices[d].data.kelvins[t];
            int count = 0;
            for (int e = 0; e < c->device_count; e++) {
                const struct measured *data = &c->devices[e].data;
                for (int k = 0; k < data->row_count; k++) {
                    count += fabs(data->kelvins[data->rows[k].kelvin] - kelvin) < 1e-6 ? 1 : 0;
                }
            }
            if (count > most) {
                most = count;
                c->measured_kelvin = kelvin;
            }
        }
    }
}

/* Diodes and bipolar transistors are measured far below the noise of a wafer prober's MOS set-up.
 */
static void settle_noise(const struct calibration_request *request, struct calibration *c)
{
    for (int k = 0; k < c->device_count; k++) {
        if (!isnan(c->devices[k].data.length)) {
            return;
        }
    }
    c->noise = request->noise == NULL ? CALIBRATION_NOISE_JUNCTION : c->noise;
}

enum status input_read(const struct calibration_request *request, struct calibration *calibration)
{
    struct reader *reader = arena_new(calibration->arena, struct reader);
    if (reader == NULL) {
        return STATUS_MEMORY;
    }
    reader->request = request;
    reader->calibration = calibration;
    bool is_good = read_options(reader);
    if (is_good && request->list != NULL) {
        is_good = read_list(reader);
    }
    for (int k = 0; is_good && k < request->file_count; k++) {
        is_good = read_file_entry(reader, &request->files[k]);
    }
    if (is_good && (reader->entry_count == 0 || reader->entry_count > DEVICE_LIMIT)) {
        is_good = complain(reader, SPAN_NONE, NULL,
                           reader->entry_count == 0 ? "no file of curves is named"
                                                    : "more than 1000 files are named");
    }
    for (int k = 0; is_good && k < reader->entry_count; k++) {
        is_good = check_entry(reader, &reader->entries[k]);
    }
    calibration->devices =
        arena_new_array(calibration->arena, struct calibrated_device, reader->entry_count);
    enum status worst = is_good ? STATUS_OK : STATUS_INPUT;
    for (int k = 0; is_good && calibration->devices != NULL && k < reader->entry_count; k++) {
        enum status status = read_device(reader, &reader->entries[k], &calibration->devices[k]);
        calibration->device_count++;
        worst = status == STATUS_OK ? worst : status;
    }
    if (arena_failed(calibration->arena) || calibration->diagnostics.out_of_memory) {
        return STATUS_MEMORY;
    }
    settle_temperature(calibration);
    settle_noise(request, calibration);
    return worst;
}
