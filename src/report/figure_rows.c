/* figure_rows.c: ranked bars of a figure: names, bars from a common zero, values in words. */
#include <math.h>

#include "report/figure_ink.h"
#include "report/markup.h"

enum { ROW = 22, BAR = 13, GAP = 14, FOOT = 18, SUM_GAP = 8 };

/* Bold figures are wider. */
static const double bold = 1.15;

int figure_rows_height(const struct figure *figure)
{
    int height = (int)figure_panel_top(figure) + ROW * figure->row_count + FOOT;
    for (int k = 0; k < figure->row_count; k++) {
        height += figure->rows[k].is_sum ? SUM_GAP : 0;
    }
    return height;
}

/* Zero is always inside. */
static void find_range(const struct figure *figure, double *low, double *high)
{
    for (int k = 0; k < figure->row_count; k++) {
        double value = figure->rows[k].value;
        if (isfinite(value)) {
            *low = fmin(*low, value);
            *high = fmax(*high, value);
        }
    }
    *high = *high > *low ? *high : *low + 1.0;
}

/* Where the column of values ends. */
static double value_end(const struct figure *figure)
{
    double details = 0.0;
    for (int k = 0; k < figure->row_count; k++) {
        details = fmax(details, bold * ink_width(figure->rows[k].detail));
    }
    return FIGURE_WIDTH - FIGURE_RIGHT - (details > 0.0 ? details + GAP : 0.0);
}

static void draw_row(struct drawing *drawing, const struct figure_row *row, double top)
{
    double base = top + 0.5 * (ROW + BAR) - 2.0;
    double zero = scale_pixel(&drawing->x, 0.0);
    ink_words(drawing, row->is_sum ? "f-name f-strong" : "f-name", "start", FIGURE_LEFT, base,
              row->name);
    if (isfinite(row->value)) {
        double end = scale_pixel(&drawing->x, row->value);
        ink_rect(drawing, row->value < 0.0 ? "f-bar f-minus" : "f-bar", fmin(zero, end),
                 top + 0.5 * (ROW - BAR), fabs(end - zero), BAR);
    }
    ink_words(drawing, row->is_sum ? "f-value f-strong" : "f-value", "end",
              value_end(drawing->figure), base, row->text);
    ink_words(drawing, "f-value", "end", FIGURE_WIDTH - FIGURE_RIGHT, base, row->detail);
}

void figure_rows_draw(struct drawing *drawing)
{
    const struct figure *figure = drawing->figure;
    double low = 0.0, high = 0.0, names = 0.0, values = 0.0, top = drawing->top;
    for (int k = 0; k < figure->row_count; k++) {
        names = fmax(names, ink_width(figure->rows[k].name));
        values = fmax(values, ink_width(figure->rows[k].text));
    }
    find_range(figure, &low, &high);
    drawing->x = (struct scale){.low = low,
                                .high = high,
                                .pixel_low = FIGURE_LEFT + names + GAP,
                                .pixel_high = value_end(figure) - bold * values - GAP};
    for (int k = 0; k < figure->row_count; k++) {
        if (figure->rows[k].is_sum) {
            double at = top + 0.5 * SUM_GAP;
            ink_line(drawing, "f-rule", FIGURE_LEFT, at, FIGURE_WIDTH - FIGURE_RIGHT, at);
            top += SUM_GAP;
        }
        draw_row(drawing, &figure->rows[k], top);
        top += ROW;
    }
    double zero = scale_pixel(&drawing->x, 0.0);
    ink_line(drawing, "f-rule", zero, drawing->top, zero, top);
}
