/* page_devices.c: rails, transistors with region and headroom, and the other parts. */
#include "report/page_parts.h"

#include <math.h>
#include <stdlib.h>

#include "report/show.h"
#include "report/table.h"

/* More devices than this and only those with the least headroom are shown. */
enum { DEVICE_LIMIT = 60, NAME_LIMIT = 24 };

const struct quantity_column transistor_columns[TRANSISTOR_COLUMN_COUNT] = {
    {{"id", "ic"}, 0},        {{"vgs", "vbe"}, 1},     {{"vds", "vce"}, 0},
    {{"overdrive", NULL}, 1}, {{"headroom", NULL}, 0}, {{"inversion", "beta"}, 1},
    {{"gm", NULL}, 3},        {{"ro", NULL}, 3},
};
const struct quantity_column part_columns[PART_COLUMN_COUNT] = {
    {{"i", NULL}, 0},
    {{"v", NULL}, 0},
    {{"power", NULL}, 0},
};

int column_quantity(const struct quantity_column *column, const struct device_type *type, int *name)
{
    for (int k = 0; k < COLUMN_NAME_LIMIT && column->names[k] != NULL; k++) {
        int quantity = quantity_find(type, column->names[k]);
        if (quantity >= 0) {
            *name = k;
            return quantity;
        }
    }
    return -1;
}

const char *column_head(struct layout *layout, const struct quantity_column *column,
                        const struct device_result *const *shown, int count)
{
    bool used[COLUMN_NAME_LIMIT] = {false};
    for (int k = 0; k < count; k++) {
        int name = 0;
        if (column_quantity(column, shown[k]->instance->type, &name) >= 0) {
            used[name] = true;
        }
    }
    if (used[0] && used[1]) {
        return layout_format(layout, "%s, %s", column->names[0], column->names[1]);
    }
    return used[0] ? column->names[0] : used[1] ? column->names[1] : "";
}

static void device_table(struct layout *layout, const struct quantity_column *columns,
                         int column_count, const struct device_result *const *shown, int count)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "kind", .may_drop = 2});
    table_column(&table, (struct table_column){.head = "region", .wraps = true});
    for (int c = 0; c < column_count; c++) {
        table_column(&table, (struct table_column){
                                 .head = column_head(layout, &columns[c], shown, count),
                                 .right = true,
                                 .may_drop = columns[c].may_drop,
                             });
    }
    for (int k = 0; k < count; k++) {
        const struct device_type *type = shown[k]->instance->type;
        const int headroom = type->quantity_headroom;
        const bool is_short = headroom >= 0 && shown[k]->q[headroom] < 0.0;
        table_row(&table, is_short ? TONE_WARN : TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, shown[k]->instance->name, NAME_LIMIT));
        table_cell(&table, 1, type->word);
        table_cell(&table, 2, shown[k]->region_text);
        for (int c = 0; c < column_count; c++) {
            int name = 0, quantity = column_quantity(&columns[c], type, &name);
            if (quantity >= 0) {
                table_cell(&table, 3 + c,
                           show_value(layout, shown[k]->q[quantity],
                                      type->quantities[quantity].dimension));
            }
        }
    }
    table_write(&table);
}

static double headroom_of(const struct device_result *device)
{
    int quantity = device->instance->type->quantity_headroom;
    double headroom = quantity >= 0 ? device->q[quantity] : (double)NAN;
    return isnan(headroom) ? (double)INFINITY : headroom;
}

/* By headroom, equal ones in the order of the cell. */
static int compare_headroom(const void *left, const void *right)
{
    const struct device_result *a = *(const struct device_result *const *)left;
    const struct device_result *b = *(const struct device_result *const *)right;
    double x = headroom_of(a), y = headroom_of(b);
    if (x < y || x > y) {
        return x < y ? -1 : 1;
    }
    return a < b ? -1 : a > b;
}

/* The transistors, or the other parts. */
static void device_group(struct layout *layout, const struct result *result, bool transistors)
{
    const struct point_result *point = &result->point;
    const struct device_result **shown =
        arena_new_array(layout->arena, const struct device_result *, point->device_count);
    int count = 0;
    for (int k = 0; shown != NULL && k < point->device_count; k++) {
        if (point->devices[k].instance->type->is_transistor == transistors) {
            shown[count++] = &point->devices[k];
        }
    }
    if (count == 0) {
        return;
    }
    int kept = count;
    if (count > DEVICE_LIMIT) {
        kept = DEVICE_LIMIT;
        if (transistors) {
            qsort(shown, (size_t)count, sizeof(*shown), compare_headroom);
        }
    }
    if (transistors) {
        device_table(layout, transistor_columns, TRANSISTOR_COLUMN_COUNT, shown, kept);
    } else {
        device_table(layout, part_columns, PART_COLUMN_COUNT, shown, kept);
    }
    if (kept < count) {
        layout_line(layout, TONE_QUIET,
                    layout_format(layout, "%s %d of %d; `ampstead point` shows all",
                                  transistors ? "those with the least headroom," : "the first",
                                  kept, count));
    }
}

void page_devices(struct layout *layout, const struct result *result)
{
    layout_part(layout, "transistors");
    device_group(layout, result, true);
    if (isfinite(result->point.least_headroom) && result->point.least_headroom_device != NULL) {
        layout_line(
            layout, TONE_PLAIN,
            layout_format(layout, "least headroom: %s, %s",
                          layout_short(layout, result->point.least_headroom_device, 28),
                          show_value(layout, result->point.least_headroom, DIMENSION_VOLTAGE)));
    }
    layout_part(layout, "parts");
    device_group(layout, result, false);
}

void page_supply(struct layout *layout, const struct result *result)
{
    struct table table;
    layout_part(layout, "supply");
    table_begin(&table, layout);
    static const char *const heads[] = {"", "v", "delivers", "power"};
    for (int c = 0; c < 4; c++) {
        table_column(&table, (struct table_column){.head = heads[c], .right = c > 0});
    }
    for (int k = 0; k < result->circuit->rail_count && result->point.rails != NULL; k++) {
        const struct rail_result *rail = &result->point.rails[k];
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, rail->rail->name, NAME_LIMIT));
        table_cell(&table, 1, show_value(layout, rail->v, DIMENSION_VOLTAGE));
        table_cell(&table, 2, show_value(layout, rail->current, DIMENSION_CURRENT));
        table_cell(&table, 3, show_value(layout, rail->power, DIMENSION_POWER));
    }
    if (isfinite(result->point.cell_power)) {
        table_row(&table, TONE_QUIET);
        table_cell(&table, 0, "cell");
        table_cell(&table, 3, show_value(layout, result->point.cell_power, DIMENSION_POWER));
    }
    table_write(&table);
}
