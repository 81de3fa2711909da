/*
 * figure.c: a figure as SVG with real text (W3C SVG 1.1).
 *
 * Colours are those of Okabe and Ito, "Color Universal Design" (2008), which people with any of the
 * common colour deficiencies tell apart; yellow is left out because it is lost on white paper. The
 * order keeps neighbours apart in lightness too, so that a grey print still tells them; after seven
 * curves the strokes are dashed. Text is never coloured: it is dark, with the colour beside it.
 */
#include "report/figure.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "report/figure_ink.h"
#include "report/markup.h"

enum {
    COLOR_COUNT = 7,
    LABEL_LIMIT = 24, /* more curves than this are not labelled */
    PANEL = 270,
    CLOSE_PANEL = 120,
    CLOSE_GAP = 40, /* holds the caption of the close-up */
    FOOT = 50,
    LABEL_STEP = 15,
    EDGE_STEP = 15
};

/* A curve counts as flat when its greatest deviation is smaller than this share. */
static const double flat_share = 0.1;

static const char style_sheet[] =
    "<style>"
    ".figure{font:12px 'Liberation Sans',Arial,Helvetica,'DejaVu Sans',sans-serif;fill:#1a1a1a}"
    ".f-title{font-size:15px;font-weight:bold}.f-note{fill:#444}"
    ".f-paper{fill:#fff}.f-grid{stroke:#e3e3e3}.f-frame{stroke:#555;fill:none}"
    ".f-band{fill:#eaf2f8}.f-edge{stroke-dasharray:2 3;stroke-width:1.5}"
    ".f-curve{fill:none;stroke-width:2;stroke-linejoin:round}"
    ".f-mark{fill:#fff;stroke-width:2}.f-dot{stroke-width:1}.f-halo{stroke:#fff;stroke-width:4;"
    "paint-order:stroke;"
    "stroke-linejoin:round}"
    ".f-bar{fill:#7fb8d8}.f-out{fill:#e9975f}.f-minus{fill:#e9975f}"
    ".f-full{fill:#1a1a1a}.f-rule{stroke:#999}.f-strong{font-weight:bold}"
    ".c0{stroke:#0072b2}.c1{stroke:#d55e00}.c2{stroke:#009e73}.c3{stroke:#cc79a7}"
    ".c4{stroke:#000}.c5{stroke:#e69f00}.c6{stroke:#56b4e9}"
    "</style>\n";

static bool is_labelled(const struct figure *figure)
{
    return figure->series_count > 1 && figure->series_count <= LABEL_LIMIT;
}

/* Right of the panel: as wide as the longest label needs. */
static double label_room(const struct figure *figure)
{
    size_t longest = 0;
    for (int s = 0; s < figure->series_count && is_labelled(figure); s++) {
        size_t length = strlen(figure->series[s].name);
        longest = length > longest ? length : longest;
    }
    return is_labelled(figure) ? 30.0 + 1.1 * INK_GLYPH * (double)longest : FIGURE_RIGHT;
}

double figure_panel_top(const struct figure *figure)
{
    return FIGURE_HEAD + FIGURE_NOTE_LINE * figure->note_count + 12;
}

int figure_height(const struct figure *figure)
{
    if (figure->row_count > 0) {
        return figure_rows_height(figure);
    }
    int height = (int)figure_panel_top(figure) + PANEL + FOOT;
    return figure->has_close_up ? height + CLOSE_GAP + CLOSE_PANEL : height;
}

static double deviation(const struct figure_series *series, int k)
{
    return (series->y[k] - series->reference) / fabs(series->reference);
}

/* Range of the deviations inside the close-up; false when no curve has any. */
static bool close_range(const struct figure *figure, double *low, double *high)
{
    bool has_any = false;
    *low = 0.0;
    *high = 0.0;
    for (int s = 0; s < figure->series_count; s++) {
        const struct figure_series *series = &figure->series[s];
        for (int k = 0; k < series->count; k++) {
            bool is_inside = series->x[k] >= series->flat_from && series->x[k] <= series->flat_to;
            double share = deviation(series, k);
            if (is_inside && isfinite(share)) {
                *low = fmin(*low, share);
                *high = fmax(*high, share);
                has_any = true;
            }
        }
    }
    return has_any && *high > *low;
}

void figure_choose_close_up(struct figure *figure)
{
    double low = 0.0, high = 0.0;
    figure->has_close_up = close_range(figure, &low, &high) && high - low < flat_share;
}

/* "c3": the colour of a curve. */
static void series_class(int series, char *text, size_t size)
{
    snprintf(text, size, "c%d", series % COLOR_COUNT);
}

/* Range of all finite y, with zero when it is kept. */
static void y_range(const struct figure *figure, double *low, double *high)
{
    *low = figure->keeps_zero ? 0.0 : (double)INFINITY;
    *high = figure->keeps_zero ? 0.0 : (double)-INFINITY;
    for (int s = 0; s < figure->series_count; s++) {
        for (int k = 0; k < figure->series[s].count; k++) {
            double y = figure->series[s].y[k];
            if (isfinite(y)) {
                *low = fmin(*low, y);
                *high = fmax(*high, y);
            }
        }
    }
    for (int d = 0; d < figure->dots_count; d++) {
        for (int k = 0; k < figure->dots[d].count; k++) {
            *low = fmin(*low, isfinite(figure->dots[d].y[k]) ? figure->dots[d].y[k] : *low);
            *high = fmax(*high, isfinite(figure->dots[d].y[k]) ? figure->dots[d].y[k] : *high);
        }
    }
    for (int k = 0; k < figure->bar_count; k++) {
        *low = fmin(*low, fmin(figure->bars[k].y, 0.0));
        *high = fmax(*high, figure->bars[k].y);
    }
    for (int k = 0; k < figure->level_count; k++) {
        *low = fmin(*low, figure->levels[k].y);
        *high = fmax(*high, figure->levels[k].y);
    }
    if (!(*high >= *low)) {
        *low = 0.0;
        *high = 1.0;
    }
    /* a faint wrong-way current at one end is not worth an axis of its own */
    if (figure->keeps_zero && *high > 0.0 && -*low < 1e-3 * *high) {
        *low = 0.0;
    }
}

static void x_range(const struct figure *figure, double *low, double *high)
{
    *low = (double)INFINITY;
    *high = (double)-INFINITY;
    for (int s = 0; s < figure->series_count; s++) {
        for (int k = 0; k < figure->series[s].count; k++) {
            *low = fmin(*low, figure->series[s].x[k]);
            *high = fmax(*high, figure->series[s].x[k]);
        }
    }
    for (int k = 0; k < figure->bar_count; k++) {
        *low = fmin(*low, figure->bars[k].from);
        *high = fmax(*high, figure->bars[k].to);
    }
    for (int k = 0; k < figure->edge_count && figure->bar_count > 0; k++) {
        *low = fmin(*low, figure->edges[k].x);
        *high = fmax(*high, figure->edges[k].x);
    }
    if (!(*high >= *low)) {
        *low = 0.0;
        *high = 1.0;
    }
}

/* Name and unit of an axis: "load voltage (mV)". */
static void put_axis_name(struct drawing *drawing, const char *name, const char *unit)
{
    markup_text(drawing->out, name);
    if (unit[0] != '\0') {
        ink(drawing, " (");
        markup_text(drawing->out, unit);
        ink(drawing, ")");
    }
    ink(drawing, "</text>\n");
}

static void draw_grid(struct drawing *drawing, bool with_x_numbers)
{
    const struct scale *x = &drawing->x, *y = &drawing->y;
    double ticks[SCALE_TICK_LIMIT];
    int count = scale_ticks(y, ticks);
    for (int k = 0; k < count; k++) {
        double at = scale_pixel(y, ticks[k]);
        ink_line(drawing, "f-grid", FIGURE_LEFT, at, drawing->right, at);
        ink_begin_text(drawing, "f-tick", "end", FIGURE_LEFT - 8, at + 4.0);
        scale_put_tick(y, ticks[k], drawing->out);
        ink(drawing, "</text>\n");
    }
    count = scale_ticks(x, ticks);
    for (int k = 0; k < count; k++) {
        double at = scale_pixel(x, ticks[k]);
        ink_line(drawing, "f-grid", at, drawing->top, at, drawing->bottom);
        if (with_x_numbers) {
            ink_begin_text(drawing, "f-tick", "middle", at, drawing->bottom + 18.0);
            scale_put_tick(x, ticks[k], drawing->out);
            ink(drawing, "</text>\n");
        }
    }
}

static void draw_band(struct drawing *drawing, bool with_text)
{
    const struct figure_band *band = &drawing->figure->band;
    if (!(band->to > band->from)) {
        return;
    }
    double from = scale_pixel(&drawing->x, fmax(band->from, drawing->x.low));
    double to = scale_pixel(&drawing->x, fmin(band->to, drawing->x.high));
    ink_rect(drawing, "f-band", from, drawing->top, to - from, drawing->bottom - drawing->top);
    if (with_text && (double)strlen(band->text) * INK_GLYPH < to - from) {
        ink_words(drawing, "f-note", "middle", 0.5 * (from + to), drawing->bottom - 8.0,
                  band->text);
    }
}

/* The pieces of a curve between gaps; `close`: the deviation instead of the value. */
static void draw_curve(struct drawing *drawing, int index, bool close)
{
    const struct figure_series *series = &drawing->figure->series[index];
    char color[8];
    series_class(index, color, sizeof color);
    buffer_format(drawing->out, "<path class=\"f-curve %s\"%s data-series=\"%d\" d=\"", color,
                  index >= COLOR_COUNT * 2 ? " stroke-dasharray=\"2 3\""
                  : index >= COLOR_COUNT   ? " stroke-dasharray=\"7 3\""
                                           : "",
                  index);
    bool is_open = false;
    for (int k = 0; k < series->count; k++) {
        double value = close ? deviation(series, k) : series->y[k];
        if (!isfinite(value)) {
            is_open = false;
            continue;
        }
        ink(drawing, is_open ? "L" : "M");
        markup_fixed(drawing->out, scale_pixel(&drawing->x, series->x[k]), 2);
        ink(drawing, " ");
        markup_fixed(drawing->out, scale_pixel(&drawing->y, value), 2);
        is_open = true;
    }
    ink(drawing, "\"/>\n");
}

static void draw_dots(struct drawing *drawing, const struct figure_dots *dots)
{
    char color[8];
    series_class(dots->series, color, sizeof color);
    for (int k = 0; k < dots->count; k++) {
        if (!isfinite(dots->y[k])) {
            continue;
        }
        buffer_format(drawing->out, "<circle class=\"f-mark f-dot %s\" r=\"2\"", color);
        const struct ink_piece pieces[] = {{" cx=\"", scale_pixel(&drawing->x, dots->x[k])},
                                           {"\" cy=\"", scale_pixel(&drawing->y, dots->y[k])},
                                           {"\"/>\n", INK_NONE},
                                           {NULL, 0.0}};
        ink_pieces(drawing, pieces);
    }
}

/* Curves, cut off at the panel: an inner <svg> clips without a name, which must be unique in a
 * page. */
static void draw_curves(struct drawing *drawing, bool close)
{
    double width = drawing->right - FIGURE_LEFT, height = drawing->bottom - drawing->top;
    const struct ink_piece pieces[] = {{"<svg x=\"", FIGURE_LEFT},
                                       {"\" y=\"", drawing->top},
                                       {"\" width=\"", width},
                                       {"\" height=\"", height},
                                       {"\" viewBox=\"", FIGURE_LEFT},
                                       {" ", drawing->top},
                                       {" ", width},
                                       {" ", height},
                                       {"\">\n", INK_NONE},
                                       {NULL, 0.0}};
    ink_pieces(drawing, pieces);
    for (int s = 0; s < drawing->figure->series_count; s++) {
        if (!close || isfinite(drawing->figure->series[s].reference)) {
            draw_curve(drawing, s, close);
        }
    }
    for (int d = 0; d < drawing->figure->dots_count && !close; d++) {
        draw_dots(drawing, &drawing->figure->dots[d]);
    }
    ink(drawing, "</svg>\n");
}

/* Bars; what of them lies outside the band is set off. */
static void draw_bars(struct drawing *drawing)
{
    const struct figure *figure = drawing->figure;
    bool has_band = figure->band.to > figure->band.from;
    for (int k = 0; k < figure->bar_count; k++) {
        const struct figure_bar *bar = &figure->bars[k];
        double from = has_band ? fmin(fmax(figure->band.from, bar->from), bar->to) : bar->from;
        double to = has_band ? fmax(fmin(figure->band.to, bar->to), from) : bar->to;
        const double ends[] = {bar->from, from, to, bar->to};
        double top = scale_pixel(&drawing->y, bar->y), zero = scale_pixel(&drawing->y, 0.0);
        for (int part = 0; part < 3 && bar->y > 0.0; part++) {
            double left = scale_pixel(&drawing->x, ends[part]);
            double right = scale_pixel(&drawing->x, ends[part + 1]);
            double gap = part == 2 || (part == 1 && to >= bar->to) ? 1.0 : 0.0;
            if (right - left > 1e-6) {
                ink_rect(drawing, part == 1 ? "f-bar" : "f-bar f-out", left, top,
                         fmax(right - left - gap, 0.2), zero - top);
            }
        }
    }
}

static void draw_levels(struct drawing *drawing)
{
    const struct figure *figure = drawing->figure;
    for (int k = 0; k < figure->level_count; k++) {
        double at = scale_pixel(&drawing->y, figure->levels[k].y);
        ink_line(drawing, "f-edge c1", FIGURE_LEFT, at, drawing->right, at);
        if (figure->levels[k].text[0] != '\0') {
            bool goes_up = figure->levels[k].is_upper ? at - drawing->top > EDGE_STEP
                                                      : drawing->bottom - at < EDGE_STEP;
            ink_words(drawing, "f-halo", "end", drawing->right - 6.0,
                      goes_up ? at - 5.0 : at + 14.0, figure->levels[k].text);
        }
    }
}

static void draw_edges(struct drawing *drawing, bool with_text)
{
    const struct figure *figure = drawing->figure;
    int row = 0;
    for (int k = 0; k < figure->edge_count; k++) {
        const struct figure_edge *edge = &figure->edges[k];
        if (!(edge->x >= drawing->x.low && edge->x <= drawing->x.high)) {
            continue;
        }
        char color[8], classes[24];
        series_class(edge->series, color, sizeof color);
        snprintf(classes, sizeof classes, "f-edge %s", color);
        double at = scale_pixel(&drawing->x, edge->x);
        ink_line(drawing, classes, at, drawing->top, at, drawing->bottom);
        if (with_text && edge->text[0] != '\0') {
            double width = (double)strlen(edge->text) * INK_GLYPH;
            bool goes_left = at + 6.0 + width > drawing->right;
            ink_words(drawing, "f-halo", goes_left ? "end" : "start",
                      goes_left ? at - 6.0 : at + 6.0,
                      figure->labels_above ? drawing->top + EDGE_STEP * (row + 1)
                                           : drawing->bottom - 30.0 - EDGE_STEP * row,
                      edge->text);
            row++;
        }
    }
}

static void draw_marks(struct drawing *drawing, bool close)
{
    const struct figure *figure = drawing->figure;
    double middle = 0.5 * (drawing->top + drawing->bottom);
    for (int k = 0; k < figure->mark_count; k++) {
        const struct figure_mark *mark = &figure->marks[k];
        double y = close ? 0.0 : mark->y;
        if (!isfinite(mark->x) || !isfinite(y)) {
            continue;
        }
        char color[8];
        series_class(mark->series, color, sizeof color);
        double px = scale_pixel(&drawing->x, mark->x), py = scale_pixel(&drawing->y, y);
        buffer_format(drawing->out, "<circle class=\"f-mark %s%s\" r=\"4.5\"", color,
                      mark->is_filled ? " f-full" : "");
        const struct ink_piece pieces[] = {
            {" cx=\"", px}, {"\" cy=\"", py}, {"\"/>\n", INK_NONE}, {NULL, 0.0}};
        ink_pieces(drawing, pieces);
        if (!close && mark->text[0] != '\0') {
            bool goes_left = px > 0.5 * (FIGURE_LEFT + drawing->right);
            ink_words(drawing, "f-halo", goes_left ? "end" : "start",
                      goes_left ? px - 2.0 : px + 2.0, py < middle ? py + 22.0 : py - 12.0,
                      mark->text);
        }
    }
}

/* Last finite value of a curve, NAN when there is none. */
static double last_value(const struct figure_series *series)
{
    for (int k = series->count - 1; k >= 0; k--) {
        if (isfinite(series->y[k])) {
            return series->y[k];
        }
    }
    return (double)NAN;
}

/* Names right of the panel at the ends of their curves, pushed apart where they would touch. */
static void draw_series_labels(struct drawing *drawing)
{
    const struct figure *figure = drawing->figure;
    int order[LABEL_LIMIT];
    double at[LABEL_LIMIT];
    int count = 0;
    for (int s = 0; s < figure->series_count; s++) {
        double value = last_value(&figure->series[s]);
        if (!isfinite(value)) {
            continue;
        }
        double y = scale_pixel(&drawing->y, value);
        int place = count++;
        for (; place > 0 && at[place - 1] > y; place--) {
            at[place] = at[place - 1];
            order[place] = order[place - 1];
        }
        at[place] = y;
        order[place] = s;
    }
    double wanted[LABEL_LIMIT];
    memcpy(wanted, at, sizeof at);
    for (int k = 0; k < count; k++) {
        double least = k == 0 ? drawing->top + 4.0 : at[k - 1] + LABEL_STEP;
        at[k] = fmax(at[k], least);
    }
    for (int k = count - 1; k >= 0; k--) {
        double most = k == count - 1 ? drawing->bottom : at[k + 1] - LABEL_STEP;
        at[k] = fmin(at[k], most);
    }
    for (int k = 0; k < count; k++) {
        char color[8];
        series_class(order[k], color, sizeof color);
        ink_line(drawing, color, drawing->right + 1.0, wanted[k], drawing->right + 14.0, at[k]);
        ink_words(drawing, "f-label", "start", drawing->right + 18.0, at[k] + 4.0,
                  figure->series[order[k]].name);
    }
}

static void draw_y_name(struct drawing *drawing, const char *name)
{
    double middle = 0.5 * (drawing->top + drawing->bottom);
    const struct ink_piece pieces[] = {
        {"<text class=\"f-name\" text-anchor=\"middle\" transform=\"translate(18 ", middle},
        {") rotate(-90)\">", INK_NONE},
        {NULL, 0.0}};
    ink_pieces(drawing, pieces);
    put_axis_name(drawing, name, drawing->y.linear > 0.0 ? "" : drawing->y.unit);
}

/* Px for the labels of upright lines above what is drawn. */
static double label_rows(const struct figure *figure)
{
    int rows = 0;
    for (int k = 0; k < figure->edge_count && figure->labels_above; k++) {
        rows += figure->edges[k].text[0] != '\0';
    }
    return rows > 0 ? EDGE_STEP * rows + 8.0 : 0.0;
}

static void draw_panel(struct drawing *drawing, bool close)
{
    const struct figure *figure = drawing->figure;
    drawing->y.pixel_low = drawing->bottom;
    drawing->y.pixel_high = drawing->top + (close ? 0.0 : label_rows(figure));
    bool is_last = close || !figure->has_close_up;
    draw_band(drawing, !close);
    draw_grid(drawing, is_last);
    ink_rect(drawing, "f-frame", FIGURE_LEFT, drawing->top, drawing->right - FIGURE_LEFT,
             drawing->bottom - drawing->top);
    if (drawing->y.linear > 0.0) {
        double zero = scale_pixel(&drawing->y, 0.0);
        ink_line(drawing, "f-frame", FIGURE_LEFT, zero, drawing->right, zero);
    }
    if (!close) {
        draw_bars(drawing);
        draw_levels(drawing);
    }
    draw_edges(drawing, !close);
    draw_curves(drawing, close);
    draw_marks(drawing, close);
    draw_y_name(drawing, close ? "deviation" : figure->y.name);
    if (is_last) {
        ink_begin_text(drawing, "f-name", "middle", 0.5 * (FIGURE_LEFT + drawing->right),
                       drawing->bottom + 38.0);
        put_axis_name(drawing, figure->x.name, drawing->x.unit);
    }
}

static void draw_close_up(struct drawing *drawing)
{
    double low = 0.0, high = 0.0;
    if (!close_range(drawing->figure, &low, &high)) {
        return;
    }
    double room = 0.15 * (high - low);
    drawing->top = drawing->bottom + CLOSE_GAP;
    drawing->bottom = drawing->top + CLOSE_PANEL;
    drawing->y = scale_make_share(low - room, high + room, 4);
    ink_words(drawing, "f-note", "start", FIGURE_LEFT, drawing->top - 9.0,
              drawing->figure->mark_count > 0
                  ? "Close-up of the flat part: deviation from the value at the ring"
                  : "Close-up: deviation from the value in the middle of the sweep");
    draw_panel(drawing, true);
}

/* What the page's script needs to turn a place into values. */
static void put_geometry(struct drawing *drawing)
{
    const struct scale *x = &drawing->x, *y = &drawing->y;
    const struct ink_piece pieces[] = {
        {" data-left=\"", FIGURE_LEFT},
        {"\" data-right=\"", drawing->right},
        {"\" data-top=\"", drawing->top + label_rows(drawing->figure)},
        {"\" data-bottom=\"", drawing->bottom},
        {NULL, 0.0}};
    ink_pieces(drawing, pieces);
    const double values[] = {x->low, x->high, y->low, y->high, y->linear};
    static const char *const names[] = {"x-low", "x-high", "y-low", "y-high", "y-linear"};
    for (int k = 0; k < 5; k++) {
        buffer_format(drawing->out, "\" data-%s=\"", names[k]);
        markup_number(drawing->out, values[k]);
    }
    ink(drawing, "\"");
}

static void begin_figure(struct drawing *drawing, enum figure_use use, int top)
{
    const struct figure *figure = drawing->figure;
    int height = figure_height(figure);
    buffer_format(drawing->out,
                  "<svg class=\"figure\" x=\"0\" y=\"%d\" width=\"%d\" height=\"%d\" "
                  "viewBox=\"0 0 %d %d\" role=\"img\" aria-label=\"",
                  top, FIGURE_WIDTH, height, FIGURE_WIDTH, height);
    markup_text(drawing->out, figure->title);
    ink(drawing, "\"");
    if (use == FIGURE_IN_PAGE) {
        put_geometry(drawing);
    }
    ink(drawing, ">\n");
    ink_words(drawing, "f-title", "start", FIGURE_LEFT, FIGURE_HEAD - 6, figure->title);
    for (int k = 0; k < figure->note_count; k++) {
        ink_words(drawing, "f-note", "start", FIGURE_LEFT, FIGURE_HEAD + 12 + FIGURE_NOTE_LINE * k,
                  figure->notes[k]);
    }
}

static struct scale make_y(const struct figure *figure)
{
    double low = 0.0, high = 0.0;
    y_range(figure, &low, &high);
    if (figure->linear > 0.0) {
        return scale_make_signed(&figure->y, low, high, figure->linear);
    }
    double room = 0.03 * (high - low); /* no curve runs along the frame */
    return scale_make(&figure->y, low < 0.0 || !figure->keeps_zero ? low - room : low,
                      high > 0.0 || !figure->keeps_zero ? high + room : high, 6, true);
}

void figure_draw(const struct figure *figure, enum figure_use use, int top, struct buffer *out)
{
    double low = 0.0, high = 0.0;
    struct drawing drawing = {.figure = figure, .out = out};
    drawing.right = FIGURE_WIDTH - label_room(figure);
    drawing.top = figure_panel_top(figure);
    drawing.bottom = drawing.top + PANEL;
    x_range(figure, &low, &high);
    double room = figure->bar_count > 0 ? 0.03 * (high - low) : 0.0;
    drawing.x = scale_make(&figure->x, low - room, high + room, 7, false);
    drawing.x.pixel_low = FIGURE_LEFT;
    drawing.x.pixel_high = drawing.right;
    drawing.y = make_y(figure);
    begin_figure(&drawing, use, top);
    if (figure->row_count > 0) {
        figure_rows_draw(&drawing);
        ink(&drawing, "</svg>\n");
        return;
    }
    draw_panel(&drawing, false);
    if (is_labelled(figure)) {
        draw_series_labels(&drawing);
    }
    if (figure->has_close_up) {
        draw_close_up(&drawing);
    }
    ink(&drawing, "</svg>\n");
}

void figures_document(const struct figure *figures, int count, struct buffer *out)
{
    int height = 0;
    for (int k = 0; k < count; k++) {
        height += figure_height(&figures[k]);
    }
    buffer_format(out,
                  "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"%d\" height=\"%d\" "
                  "viewBox=\"0 0 %d %d\">\n",
                  FIGURE_WIDTH, height, FIGURE_WIDTH, height);
    buffer_text(out, style_sheet);
    buffer_text(out, "<rect class=\"f-paper\" width=\"100%\" height=\"100%\"/>\n");
    int top = 0;
    for (int k = 0; k < count; k++) {
        figure_draw(&figures[k], FIGURE_ALONE, top, out);
        top += figure_height(&figures[k]);
    }
    buffer_text(out, "</svg>\n");
}
