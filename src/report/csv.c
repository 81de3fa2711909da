/* csv.c: curves and sweeps as CSV (RFC 4180), numbers that read back as the same bits. */
#include "report/csv_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/spread_result.h"

enum { NUMBER_SIZE = 40 };

static void put_field(struct buffer *out, const char *text)
{
    if (strpbrk(text, ",\"\r\n") == NULL) {
        buffer_text(out, text);
        return;
    }
    buffer_text(out, "\"");
    for (const char *at = text; *at != '\0'; at++) {
        buffer_put(out, at, 1);
        if (*at == '"') {
            buffer_text(out, "\"");
        }
    }
    buffer_text(out, "\"");
}

void csv_put_number(struct buffer *out, double value)
{
    char text[NUMBER_SIZE];
    if (isfinite(value)) {
        number_exact(value, text, sizeof text);
        buffer_text(out, text);
    }
}

static void put_curves(const struct result *result, struct buffer *out)
{
    buffer_text(out, "output,v [V],current [A]\r\n");
    for (int k = 0; k < result->output_count; k++) {
        const struct output_result *row = &result->outputs[k];
        for (int p = 0; p < row->curve.count; p++) {
            put_field(out, row->output->name);
            buffer_text(out, ",");
            csv_put_number(out, row->curve.v[p]);
            buffer_text(out, ",");
            csv_put_number(out, row->curve.current[p]);
            buffer_text(out, "\r\n");
        }
    }
}

/* A column of the sweep table: the name of a knob or of a quantity. */
struct column {
    const char *name;
    struct dimension dimension;
};

/* Several sweeps share one table: each column stands once, a sweep that lacks it leaves it empty.
 */
static bool add_column(struct arena *arena, struct column **columns, int *count, int *capacity,
                       const char *name, struct dimension dimension)
{
    for (int k = 0; k < *count; k++) {
        if (strcmp((*columns)[k].name, name) == 0) {
            return true;
        }
    }
    struct column *list = arena_grow(arena, *columns, *count, capacity, sizeof **columns);
    if (list == NULL) {
        return false;
    }
    *columns = list;
    list[(*count)++] = (struct column){name, dimension};
    return true;
}

static bool find_columns(const struct result *result, struct arena *arena, struct column **columns,
                         int *count)
{
    int capacity = 0;
    for (int k = 0; k < result->sweep_count; k++) {
        const struct sweep *sweep = result->sweeps[k].sweep;
        if (!add_column(arena, columns, count, &capacity, sweep->knob.name,
                        sweep->knob.dimension) ||
            (sweep->has_family && !add_column(arena, columns, count, &capacity, sweep->family.name,
                                              sweep->family.dimension))) {
            return false;
        }
        for (int q = 0; q < sweep->shown_count; q++) {
            if (!add_column(arena, columns, count, &capacity, sweep->shown[q].text,
                            sweep->shown[q].dimension)) {
                return false;
            }
        }
    }
    return true;
}

/* The value of one column in one row; NAN when this sweep lacks it. */
static double cell_value(const struct sweep *sweep, const struct sweep_series *series, int row,
                         const char *name)
{
    if (strcmp(name, sweep->knob.name) == 0) {
        return series->knob[row];
    }
    if (sweep->has_family && strcmp(name, sweep->family.name) == 0) {
        return series->family_value;
    }
    for (int q = 0; q < sweep->shown_count; q++) {
        if (strcmp(name, sweep->shown[q].text) == 0) {
            return series->values[row * sweep->shown_count + q];
        }
    }
    return NAN;
}

void csv_heading(struct buffer *out, const char *name, struct dimension dimension)
{
    char unit[64];
    dimension_unit(dimension, unit, sizeof unit);
    struct buffer field = BUFFER_EMPTY;
    buffer_text(&field, name);
    if (unit[0] != '\0') {
        buffer_format(&field, " [%s]", unit);
    }
    put_field(out, field.data == NULL ? "" : field.data);
    out->failed = out->failed || field.failed;
    buffer_free(&field);
}

static void put_header(const struct column *columns, int count, struct buffer *out)
{
    buffer_text(out, "sweep");
    for (int k = 0; k < count; k++) {
        buffer_text(out, ",");
        csv_heading(out, columns[k].name, columns[k].dimension);
    }
    buffer_text(out, "\r\n");
}

static void put_sweep(const struct sweep_table *table, int number, const struct column *columns,
                      int count, struct buffer *out)
{
    for (int s = 0; s < table->series_count; s++) {
        const struct sweep_series *series = &table->series[s];
        for (int row = 0; row < series->count; row++) {
            buffer_format(out, "%d", number);
            for (int k = 0; k < count; k++) {
                buffer_text(out, ",");
                csv_put_number(out, cell_value(table->sweep, series, row, columns[k].name));
            }
            buffer_text(out, "\r\n");
        }
    }
}

void report_csv(const struct result *result, struct buffer *out)
{
    if (result->mismatch != NULL && result->mismatch->wanted > 0) {
        csv_samples(result, out);
        return;
    }
    if (result->sweep_count == 0) {
        put_curves(result, out);
        return;
    }
    struct arena *arena = arena_create();
    struct column *columns = NULL;
    int count = 0;
    if (arena == NULL || !find_columns(result, arena, &columns, &count)) {
        out->failed = true;
        arena_destroy(arena);
        return;
    }
    put_header(columns, count, out);
    for (int k = 0; k < result->sweep_count; k++) {
        put_sweep(&result->sweeps[k], k + 1, columns, count, out);
    }
    arena_destroy(arena);
}
