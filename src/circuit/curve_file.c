/*
 * curve_file.c: the CSV file of a `table`: two columns, voltage in V and current in A, one header
 * line allowed, `#` comments, blank lines free. Rows may come in any order of voltage.
 */
#include "circuit/build.h"

#include <stdlib.h>
#include <string.h>

#include "devices/curve.h"
#include "language/source.h"

enum { CURVE_POINT_LIMIT = 100000 };

struct row {
    double v, i;
    uint32_t begin, end;
};

struct reader {
    struct builder *builder;
    uint32_t file;
    struct row *rows;
    int count, capacity;
    bool seen_line; /* a line with text was met: no header may come any more */
};

static uint32_t skip_blanks(const char *text, uint32_t k, uint32_t end)
{
    while (k < end && (text[k] == ' ' || text[k] == '\t' || text[k] == '\r')) {
        k++;
    }
    return k;
}

/* A number with its sign; the bytes used, 0 when none stands there. */
static size_t signed_number(const char *text, size_t length, double *value)
{
    const size_t sign = length > 0 && (text[0] == '-' || text[0] == '+');
    const size_t used = number_parse(text + sign, length - sign, value);
    if (sign == 1 && text[0] == '-') {
        *value = -*value;
    }
    return used == 0 ? 0 : sign + used;
}

static bool complain(const struct reader *r, uint32_t begin, uint32_t end, const char *hint,
                     const char *text)
{
    diagnostics_add(r->builder->diagnostics, (struct span){r->file, begin, end}, hint, "%s", text);
    return false;
}

/* End of the field that begins at `k`: before the comma, semicolon or comment behind it. */
static uint32_t field_end(const char *text, uint32_t k, uint32_t end)
{
    while (k < end && strchr(",;#", text[k]) == NULL) {
        k++;
    }
    while (k > 0 && (text[k - 1] == ' ' || text[k - 1] == '\t' || text[k - 1] == '\r')) {
        k--;
    }
    return k;
}

/* The field that begins at *k, a number and nothing more; *k moves behind it. False after an
 * error at the field. */
static bool read_field(const struct reader *r, const char *text, uint32_t *k, uint32_t end,
                       double *value)
{
    const uint32_t begin = *k, last = field_end(text, begin, end);
    const size_t used = signed_number(text + begin, end - begin, value);
    if (last <= begin) {
        return complain(r, begin, begin, "0.65, 1.2e-6",
                        "a row of a table is a voltage and a current; one is missing");
    }
    if (used == 0) {
        return complain(r, begin, last, NULL, "this is not a number");
    }
    if (begin + used < last) {
        return complain(r, begin, last, "0.4e-3 for 0.4m, 3 for 3 V",
                        "a table holds plain numbers, in V and A");
    }
    if (!isfinite(*value)) {
        return complain(r, begin, last, NULL, "this number is too large");
    }
    *k = skip_blanks(text, last, end);
    return true;
}

/* One row; false after an error or when memory is short. */
static bool read_row(struct reader *r, const char *text, uint32_t begin, uint32_t end)
{
    struct builder *b = r->builder;
    struct row row = {.begin = begin, .end = end};
    uint32_t k = skip_blanks(text, begin, end);
    if (k == end || text[k] == '#') {
        return true;
    }
    const size_t used = signed_number(text + k, end - k, &row.v);
    const bool may_be_header = !r->seen_line;
    r->seen_line = true;
    if (used == 0 && may_be_header) {
        return true;
    }
    if (!read_field(r, text, &k, end, &row.v)) {
        return false;
    }
    if (k == end || text[k] != ',') {
        return complain(r, k, k < end ? k + 1 : k, "0.65, 1.2e-6",
                        "a comma is wanted between the voltage and the current");
    }
    k = skip_blanks(text, k + 1, end);
    if (!read_field(r, text, &k, end, &row.i)) {
        return false;
    }
    if (k < end && text[k] != '#') {
        return complain(r, k, end, NULL, "a row of a table is a voltage and a current, no more");
    }
    struct row *list = arena_grow(b->arena, r->rows, r->count, &r->capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    r->rows = list;
    list[r->count++] = row;
    return true;
}

static int by_voltage(const void *a, const void *b)
{
    const struct row *x = a, *y = b;
    return (x->v > y->v) - (x->v < y->v);
}

static bool read_rows(struct reader *r, const struct source_file *file)
{
    bool good = true;
    for (uint32_t begin = 0; begin < file->length;) {
        const char *line_end = memchr(file->text + begin, '\n', file->length - begin);
        const uint32_t end = line_end == NULL ? file->length : (uint32_t)(line_end - file->text);
        good &= read_row(r, file->text, begin, end);
        begin = end + 1;
        if (r->count > CURVE_POINT_LIMIT) {
            diagnostics_add(r->builder->diagnostics, (struct span){r->file, 0, 0}, NULL,
                            "a table may hold at most %d points", CURVE_POINT_LIMIT);
            return false;
        }
    }
    return good;
}

static const struct curve *make_curve(struct builder *b, const struct reader *r)
{
    struct curve *curve = arena_new(b->arena, struct curve);
    double *v = arena_new_array(b->arena, double, r->count);
    double *i = arena_new_array(b->arena, double, r->count);
    double *slope = arena_new_array(b->arena, double, r->count);
    if (curve == NULL || v == NULL || i == NULL || slope == NULL) {
        return NULL;
    }
    for (int k = 0; k < r->count; k++) {
        v[k] = r->rows[k].v;
        i[k] = r->rows[k].i;
        if (k > 0 && !(v[k] > v[k - 1])) {
            diagnostics_add(b->diagnostics,
                            (struct span){r->file, r->rows[k].begin, r->rows[k].end}, NULL,
                            "this voltage stands in the table twice");
            return NULL;
        }
    }
    curve_slopes(v, i, slope, r->count);
    *curve = (struct curve){v, i, slope, r->count};
    return curve;
}

/* The file's text, read once a cell however many circuits are built from it. */
static bool find_source(struct builder *b, const char *path, const struct statement *statement,
                        uint32_t *file)
{
    struct cell *cell = b->cell;
    for (int k = cell->process_count + 1; k < cell->sources.count; k++) {
        if (strcmp(cell->sources.files[k].name, statement->text) == 0) {
            *file = (uint32_t)k;
            return true;
        }
    }
    const enum status status = source_read(cell->arena, &cell->sources, path, statement->text,
                                           statement->text_span, b->diagnostics, file);
    b->diagnostics->out_of_memory |= status == STATUS_MEMORY;
    return status == STATUS_OK;
}

const struct curve *build_curve(const struct frame *frame, const struct statement *statement)
{
    struct builder *b = frame->builder;
    if (statement->text == NULL) {
        diagnostics_add(b->diagnostics, statement->name.span, "table T1 a -> b \"curve.csv\"",
                        "a table needs the name of its file");
        return NULL;
    }
    const char *slash = strrchr(b->cell->path, '/');
    const int folder =
        statement->text[0] == '/' || slash == NULL ? 0 : (int)(slash - b->cell->path) + 1;
    const char *path = arena_format(b->arena, "%.*s%s", folder, b->cell->path, statement->text);
    struct reader reader = {.builder = b};
    if (path == NULL || !find_source(b, path, statement, &reader.file) ||
        !read_rows(&reader, &b->cell->sources.files[reader.file])) {
        return NULL;
    }
    if (reader.count < 2) {
        diagnostics_add(b->diagnostics, statement->text_span, NULL,
                        "table \"%s\" has fewer than two points", statement->text);
        return NULL;
    }
    qsort(reader.rows, (size_t)reader.count, sizeof *reader.rows, by_voltage);
    return make_curve(b, &reader);
}
