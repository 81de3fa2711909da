/* sensitivity.c: ranked derivatives as tables. */
#include "analyses/sensitivity.h"

#include <math.h>
#include <string.h>

#include "report/page_parts.h"
#include "report/show.h"
#include "report/table.h"

enum { SHOWN_ROWS = 20 };

static const char *way_text(enum derivative_way way)
{
    switch (way) {
    case WAY_ADJOINT:
        return "by one adjoint solve";
    case WAY_TRANSFER:
        return "from the small-signal transfer, by a second adjoint solve";
    case WAY_EDGE:
        return "at the edge of the curve, by adjoint solves there";
    case WAY_SOLVED:
        break;
    }
    return "by solving the cell again at close values";
}

static bool is_temperature(const struct sensitivity_row *row)
{
    return strcmp(row->parameter, "temperature") == 0;
}

/* "-153.0 pA/ohm", "+1.009 uA/um": the quantity's own unit, by one of the parameter's. */
static const char *absolute_text(struct layout *layout, const struct sensitivity_table *it,
                                 const struct sensitivity_row *row)
{
    const bool is_length = dimension_equal(row->dimension, DIMENSION_LENGTH);
    char unit[40];
    dimension_unit(row->dimension, unit, sizeof unit);
    const char *value =
        show_probe_difference(layout, &it->probe, row->absolute * (is_length ? 1e-6 : 1));
    if (unit[0] == '\0') {
        return value;
    }
    const bool is_compound = strpbrk(unit, "/*^") != NULL;
    return layout_format(layout, is_compound ? "%s/(%s)" : "%s/%s", value, is_length ? "um" : unit);
}

static void rows_table(struct layout *layout, const struct sensitivity_table *it)
{
    struct table table;
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "value", .right = true});
    table_column(&table, (struct table_column){.head = "+1 % moves it by", .right = true});
    table_column(&table, (struct table_column){.head = "a unit moves it by", .right = true});
    const int acting = it->row_count - it->idle_count;
    int left_out = 0;
    for (int k = 0; k < acting; k++) {
        const struct sensitivity_row *row = &it->rows[k];
        if (k >= SHOWN_ROWS && !row->is_condition) {
            left_out++;
            continue;
        }
        const bool hot = is_temperature(row);
        table_row(&table, TONE_STRONG);
        table_cell(&table, 0, layout_short(layout, row->parameter, 34));
        table_cell(&table, 1,
                   hot ? show_celsius(layout, row->value)
                       : show_value(layout, row->value, row->dimension));
        table_cell(&table, 2,
                   hot ? show_share(layout, row->absolute / it->value, "/K", true)
                       : show_share(layout, row->relative / 100, "", true));
        table_cell(&table, 3, absolute_text(layout, it, row));
    }
    table_write(&table);
    if (left_out > 0) {
        layout_line(
            layout, TONE_QUIET,
            layout_format(layout, "%d more with a smaller effect are in the JSON", left_out));
    }
    layout_line(layout, TONE_QUIET,
                layout_format(layout, "%d parameters have no effect on it", it->idle_count));
}

void report_sensitivity(const struct result *result, const struct report_style *style,
                        struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (!result->point.solver.converged && !style->stopped) {
        page_unsolved(&layout, result);
    }
    layout_part(&layout, "follows");
    for (int k = 0; k < result->sensitivity_count; k++) {
        const struct sensitivity_table *it = &result->sensitivities[k];
        const char *name = layout_clean(&layout, it->probe.text);
        layout_gap(&layout);
        if (it->trouble != NULL) {
            layout_paragraph(&layout, TONE_WARN, 2,
                             layout_format(&layout, "%s: %s", name, it->trouble));
            continue;
        }
        layout_paragraph(&layout, TONE_STRONG, 2,
                         layout_format(&layout, "%s is %s; derivatives %s", name,
                                       show_probe(&layout, &it->probe, it->value),
                                       way_text(it->way)));
        rows_table(&layout, it);
    }
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}
