/* point.c: the operating point alone: rails, nodes, and every quantity of every device. */
#include "report/page_parts.h"

#include <math.h>

#include "report/show.h"
#include "report/table.h"

/* Kinds with more quantities are written with one device a column. */
enum { ROW_QUANTITY_LIMIT = 5, DEVICES_ABREAST = 5 };

static void nodes_part(struct layout *layout, const struct result *result)
{
    struct table table;
    const struct circuit *circuit = result->circuit;
    layout_part(layout, "nodes");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "v", .right = true});
    for (int k = 1; k < circuit->node_count; k++) {
        if (!circuit->nodes[k].is_hidden) {
            table_row(&table, TONE_STRONG);
            table_cell(&table, 0, layout_clean(layout, circuit->nodes[k].name));
            table_cell(&table, 1, show_value(layout, result->point.x[k - 1], DIMENSION_VOLTAGE));
        }
    }
    table_write(&table);
}

/* One device a row. */
static void row_table(struct layout *layout, const struct device_type *type,
                      const struct device_result *const *devices, int count)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    for (int q = 0; q < type->quantity_count; q++) {
        table_column(&table,
                     (struct table_column){.head = type->quantities[q].name, .right = true});
    }
    table_column(&table, (struct table_column){.head = "region", .wraps = true});
    for (int k = 0; k < count; k++) {
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, devices[k]->instance->name, 24));
        for (int q = 0; q < type->quantity_count; q++) {
            table_cell(&table, 1 + q,
                       show_value(layout, devices[k]->q[q], type->quantities[q].dimension));
        }
        table_cell(&table, 1 + type->quantity_count, devices[k]->region_text);
    }
    table_write(&table);
}

/* One quantity a row, a few devices side by side, the meaning behind them where there is room. */
static void column_table(struct layout *layout, const struct device_type *type,
                         const struct device_result *const *devices, int count)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    for (int k = 0; k < count; k++) {
        table_column(&table, (struct table_column){
                                 .head = layout_short(layout, devices[k]->instance->name, 14),
                                 .right = true,
                             });
    }
    table_column(&table, (struct table_column){.head = "", .may_drop = 1});
    for (int q = 0; q < type->quantity_count; q++) {
        table_row(&table, TONE_QUIET);
        table_cell(&table, 0, type->quantities[q].name);
        for (int k = 0; k < count; k++) {
            table_cell(&table, 1 + k,
                       show_value(layout, devices[k]->q[q], type->quantities[q].dimension));
        }
        table_cell(&table, 1 + count, type->quantities[q].text);
    }
    table_write(&table);
    for (int k = 0; k < count; k++) {
        if (devices[k]->region_text[0] != '\0') {
            layout_line(layout, TONE_PLAIN,
                        layout_format(layout, "%s: %s",
                                      layout_short(layout, devices[k]->instance->name, 30),
                                      devices[k]->region_text));
        }
    }
}

static void kind_part(struct layout *layout, const struct device_type *type,
                      const struct device_result *const *devices, int count)
{
    layout_part(layout, type->word);
    if (type->quantity_count <= ROW_QUANTITY_LIMIT) {
        row_table(layout, type, devices, count);
        return;
    }
    for (int first = 0; first < count; first += DEVICES_ABREAST) {
        int left = count - first;
        if (first > 0) {
            layout_gap(layout);
        }
        column_table(layout, type, devices + first,
                     left < DEVICES_ABREAST ? left : DEVICES_ABREAST);
    }
}

/* Kinds in the order in which the cell first uses them. */
static void devices_parts(struct layout *layout, const struct result *result)
{
    const struct point_result *point = &result->point;
    const struct device_result **group =
        arena_new_array(layout->arena, const struct device_result *, point->device_count);
    bool *done = arena_new_array(layout->arena, bool, point->device_count);
    for (int first = 0; group != NULL && done != NULL && first < point->device_count; first++) {
        const struct device_type *type = point->devices[first].instance->type;
        int count = 0;
        for (int k = first; k < point->device_count && !done[first]; k++) {
            if (point->devices[k].instance->type == type) {
                group[count++] = &point->devices[k];
                done[k] = done[k] || k > first;
            }
        }
        if (count > 0) {
            kind_part(layout, type, group, count);
        }
    }
}

void report_point(const struct result *result, const struct report_style *style, struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (result->point.solver.converged) {
        page_supply(&layout, result);
        nodes_part(&layout, result);
        devices_parts(&layout, result);
    } else if (!style->stopped) {
        page_unsolved(&layout, result);
    }
    page_certificate(&layout, result);
    page_cautions(&layout, result);
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}
