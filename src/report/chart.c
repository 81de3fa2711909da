/* chart.c: a curve drawn with characters. */
#include "report/chart.h"

#include <math.h>
#include <string.h>

#include "report/show.h"

enum { HALF_ROWS = 2 * CHART_ROWS, AXIS_LABEL = 10 };

struct drawing {
    bool ink[CHART_COLUMNS][HALF_ROWS]; /* row 0 is the top */
    int columns;
    double x_from, x_to, y_low, y_high;
    double linear;
    char letters[CHART_COLUMNS][CHART_ROWS]; /* of a family; 0: none */
};

/* y in a unit that is even along the axis. */
static double even(const struct drawing *drawing, double y)
{
    return drawing->linear > 0.0 ? asinh(0.5 * y / drawing->linear) : y;
}

/* The value at x between the points; NAN outside. */
static double curve_at(const struct chart *chart, const double *y, double x)
{
    int low = 0, high = chart->count - 1;
    if (!(x >= chart->x[0] && x <= chart->x[high])) {
        return NAN;
    }
    while (high - low > 1) {
        int middle = low + (high - low) / 2;
        if (chart->x[middle] <= x) {
            low = middle;
        } else {
            high = middle;
        }
    }
    double width = chart->x[high] - chart->x[low];
    double share = width > 0.0 ? (x - chart->x[low]) / width : 0.0;
    return y[low] + share * (y[high] - y[low]);
}

/* The next of 1, 1.2, 1.5, 2, ... times a power of ten at or above a positive size. */
static double round_up(double size)
{
    static const double steps[] = {1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0};
    double decade = 1.0;
    while (decade > size && decade > 1e-300) {
        decade /= 10.0;
    }
    while (decade * 10.0 < size && decade < 1e300) {
        decade *= 10.0;
    }
    for (size_t k = 0; k < sizeof steps / sizeof steps[0]; k++) {
        if (steps[k] * decade >= size * (1.0 - 1e-9)) {
            return steps[k] * decade;
        }
    }
    return size;
}

/* Ranges of both axes; false when there is nothing to draw. */
static bool find_ranges(const struct chart *chart, struct drawing *drawing)
{
    double low = 0.0, high = 0.0;
    if (chart->count < 2) {
        return false;
    }
    const double *const one[] = {chart->y};
    const double *const *curves = chart->family_count > 0 ? chart->family : one;
    for (int k = 0; k < chart->count; k++) {
        for (int m = 0; m == 0 || m < chart->family_count; m++) {
            low = isfinite(curves[m][k]) ? fmin(low, curves[m][k]) : low;
            high = isfinite(curves[m][k]) ? fmax(high, curves[m][k]) : high;
        }
    }
    drawing->x_from = chart->x[0];
    drawing->x_to = chart->x[chart->count - 1];
    drawing->linear = chart->linear;
    if (chart->linear > 0.0) { /* whole decades */
        drawing->y_high = high > 0.0 ? pow(10.0, ceil(log10(fmax(high, chart->linear)) - 1e-9)) : 0;
        drawing->y_low = low < 0.0 ? -pow(10.0, ceil(log10(fmax(-low, chart->linear)) - 1e-9)) : 0;
        return drawing->x_to > drawing->x_from && drawing->y_high > drawing->y_low;
    }
    /* a faint wrong-way current at one end is not worth an axis of its own */
    drawing->y_high = high > -1e-3 * low && high > 0.0 ? round_up(high) : 0.0;
    drawing->y_low = -low > 1e-3 * high && low < 0.0 ? -round_up(-low) : 0.0;
    return drawing->x_to > drawing->x_from && drawing->y_high > drawing->y_low;
}

static double column_x(const struct drawing *drawing, int column)
{
    double share = ((double)column + 0.5) / (double)drawing->columns;
    return drawing->x_from + share * (drawing->x_to - drawing->x_from);
}

static int x_column(const struct drawing *drawing, double x)
{
    double share = (x - drawing->x_from) / (drawing->x_to - drawing->x_from);
    int column = (int)(share * (double)drawing->columns);
    return column < 0 ? 0 : column >= drawing->columns ? drawing->columns - 1 : column;
}

static int half_row(const struct drawing *drawing, double y)
{
    double low = even(drawing, drawing->y_low), high = even(drawing, drawing->y_high);
    double share = (even(drawing, y) - low) / (high - low);
    share = share < 0.0 ? 0.0 : share > 1.0 ? 1.0 : share;
    int row = (int)((1.0 - share) * HALF_ROWS);
    return row >= HALF_ROWS ? HALF_ROWS - 1 : row;
}

/* Inks the curve; steep parts are joined by an upright stroke. */
static void ink_curve(const struct chart *chart, struct drawing *drawing)
{
    int last = -1;
    for (int c = 0; c < drawing->columns; c++) {
        double y = curve_at(chart, chart->y, column_x(drawing, c));
        if (!isfinite(y)) {
            last = -1;
            continue;
        }
        int row = half_row(drawing, y);
        drawing->ink[c][row] = true;
        for (int r = row; last >= 0 && r != last; r += r < last ? 1 : -1) {
            drawing->ink[c][r] = true;
        }
        last = row;
    }
}

/* The letter of each curve where it passes; where several meet the first stands. */
static void place_letters(const struct chart *chart, struct drawing *drawing)
{
    for (int m = chart->family_count - 1; m >= 0; m--) {
        for (int c = 0; c < drawing->columns; c++) {
            double y = curve_at(chart, chart->family[m], column_x(drawing, c));
            if (isfinite(y)) {
                drawing->letters[c][half_row(drawing, y) / 2] = (char)('a' + m % 26);
            }
        }
    }
}

struct glyphs {
    const char *upper, *lower, *both, *axis, *corner, *floor, *edge, *edge_foot, *point, *empty;
};

static const struct glyphs unicode_glyphs = {
    "\xE2\x96\x80", "\xE2\x96\x84", "\xE2\x96\x88", "\xE2\x94\x82", "\xE2\x94\x94",
    "\xE2\x94\x80", "\xE2\x94\x8A", "\xE2\x94\xB4", "\xE2\x97\x8F", "\xE2\x97\x8B"};
static const struct glyphs ascii_glyphs = {"'", ".", ":", "|", "+", "-", "|", "^", "o", "x"};

static const char *glyph_at(const struct drawing *drawing, const struct glyphs *glyphs, int column,
                            int row, int edge, int point_column, int point_row)
{
    bool upper = drawing->ink[column][2 * row], lower = drawing->ink[column][2 * row + 1];
    if (column == point_column && row == point_row) {
        return glyphs->point;
    }
    if (upper || lower) {
        return upper && lower ? glyphs->both : upper ? glyphs->upper : glyphs->lower;
    }
    return column == edge ? glyphs->edge : " ";
}

static const char *mark_at(const struct chart *chart, const struct drawing *drawing,
                           const struct glyphs *glyphs, int column, int row)
{
    for (int k = 0; k < chart->mark_count; k++) {
        const struct chart_mark *mark = &chart->marks[k];
        if (x_column(drawing, mark->x) == column && half_row(drawing, mark->y) / 2 == row) {
            return mark->is_filled ? glyphs->point : glyphs->empty;
        }
    }
    return NULL;
}

static const char *axis_label(struct layout *layout, const struct chart *chart,
                              const struct drawing *drawing, int row)
{
    int zero_row = half_row(drawing, 0.0) / 2;
    if (row == 0) {
        return show_round(layout, drawing->y_high, chart->y_dimension);
    }
    if (row == CHART_ROWS - 1) {
        return show_round(layout, drawing->y_low, chart->y_dimension);
    }
    return row == zero_row ? "0" : "";
}

static void draw_body(struct layout *layout, const struct chart *chart,
                      const struct drawing *drawing, const struct glyphs *glyphs)
{
    int edge = isnan(chart->edge) ? -1 : x_column(drawing, chart->edge);
    int point = isnan(chart->point) ? -1 : x_column(drawing, chart->point);
    double y = point < 0 ? NAN : curve_at(chart, chart->y, chart->point);
    /* where both signs are drawn, zero is a line of its own */
    const int zero_row = drawing->linear > 0.0 ? half_row(drawing, 0.0) / 2 : -1;
    int point_row = isfinite(y) ? half_row(drawing, y) / 2 : -1;
    for (int row = 0; row < CHART_ROWS; row++) {
        char line[4 * CHART_COLUMNS + 1] = "";
        size_t used = 0;
        for (int c = 0; c < drawing->columns; c++) {
            const char letter[] = {drawing->letters[c][row], '\0'};
            const char *glyph = mark_at(chart, drawing, glyphs, c, row);
            if (glyph == NULL) {
                glyph = letter[0] != '\0'
                            ? letter
                            : glyph_at(drawing, glyphs, c, row, edge, point, point_row);
            }
            if (strcmp(glyph, " ") == 0 && row == zero_row) {
                glyph = glyphs->floor;
            }
            size_t length = strlen(glyph);
            memcpy(line + used, glyph, length);
            used += length;
        }
        while (used > 0 && line[used - 1] == ' ') {
            used--;
        }
        line[used] = '\0';
        layout_line(layout, TONE_PLAIN,
                    layout_format(layout, "%*s %s%s", AXIS_LABEL,
                                  axis_label(layout, chart, drawing, row), glyphs->axis, line));
    }
    char floor[4 * CHART_COLUMNS + 1];
    size_t used = 0;
    for (int c = 0; c < drawing->columns; c++) {
        const char *glyph = c == edge ? glyphs->edge_foot : glyphs->floor;
        size_t length = strlen(glyph);
        memcpy(floor + used, glyph, length);
        used += length;
    }
    floor[used] = '\0';
    layout_line(layout, TONE_PLAIN,
                layout_format(layout, "%*s %s%s", AXIS_LABEL, "", glyphs->corner, floor));
}

/* Ends and name of the x axis, then what the marks mean. */
static void draw_captions(struct layout *layout, const struct chart *chart,
                          const struct drawing *drawing, const struct glyphs *glyphs)
{
    const char *from = show_round(layout, drawing->x_from, chart->x_dimension);
    const char *to = show_round(layout, drawing->x_to, chart->x_dimension);
    int room = drawing->columns - text_width(from) - text_width(to);
    int name = text_width(chart->x_name);
    int before = room > name ? (room - name) / 2 : 1;
    int after = room > name ? room - name - before : 1;
    layout_line(layout, TONE_PLAIN,
                layout_format(layout, "%*s  %s%*s%s%*s%s", AXIS_LABEL, "", from, before, "",
                              chart->x_name, after, "", to));
    const char *point = "", *edge = "";
    if (!isnan(chart->point)) {
        point = layout_format(layout, "%s %s %s   ", glyphs->point, chart->point_name,
                              show_round(layout, chart->point, chart->x_dimension));
    }
    if (!isnan(chart->edge)) {
        edge = layout_format(layout, "%s %s %s", glyphs->edge, chart->edge_name,
                             show_value(layout, chart->edge, chart->x_dimension));
    }
    if (*point != '\0' || *edge != '\0') {
        layout_line(layout, TONE_QUIET,
                    layout_format(layout, "%*s  %s%s", AXIS_LABEL, "", point, edge));
    }
}

/* "a RE = 10 kohm   b RE = 30 kohm", as many in a line as there is room for. */
static void draw_family_names(struct layout *layout, const struct chart *chart)
{
    const char *text = "";
    for (int m = 0; m < chart->family_count; m++) {
        text = layout_format(layout, "%s%s%c %s", text, m > 0 ? "   " : "", 'a' + m % 26,
                             chart->family_names[m]);
    }
    if (chart->family_count > 0) {
        layout_paragraph(layout, TONE_QUIET, 2, text);
    }
}

void chart_draw(struct layout *layout, const struct chart *chart)
{
    struct drawing drawing = {0};
    const struct glyphs *glyphs = layout->style.ascii ? &ascii_glyphs : &unicode_glyphs;
    int room = layout->width - AXIS_LABEL - 2;
    drawing.columns = room < CHART_COLUMNS ? room : CHART_COLUMNS;
    if (!find_ranges(chart, &drawing)) {
        layout_line(layout, TONE_QUIET,
                    chart->count < 2 ? "no curve: fewer than two points"
                                     : "no curve: zero all along, or no range");
        return;
    }
    if (chart->family_count > 0) {
        place_letters(chart, &drawing);
    } else {
        ink_curve(chart, &drawing);
    }
    draw_body(layout, chart, &drawing, glyphs);
    draw_captions(layout, chart, &drawing, glyphs);
    draw_family_names(layout, chart);
}
