/*
 * figure.h: a picture of curves or bars as plain data, and the one function that draws it.
 *
 * Everything is borrowed from an arena of the caller. Adding a picture of another result means
 * filling this struct (figures.c); nothing about drawing is repeated.
 */
#ifndef REPORT_FIGURE_H
#define REPORT_FIGURE_H

#include "base/buffer.h"

struct figure_axis {
    const char *name;  /* "load voltage" */
    const char *unit;  /* "V"; "" for a plain number */
    bool takes_prefix; /* the unit is written with an SI prefix: "nA" */
};

struct figure_series {
    const char *name;    /* direct label; "" when there is one curve only */
    const double *x, *y; /* [count]; a y that is not finite leaves a gap */
    int count;
    double reference;          /* y from which the close-up counts; NAN: not in the close-up */
    double flat_from, flat_to; /* the range of x whose deviations give the close-up its scale */
};

/* An upright bar from zero to y, of a histogram. */
struct figure_bar {
    double from, to, y;
};

/* One ranked bar, lying, with its name before it and its value in words behind; `detail` is a
 * second column there, "" where none is. */
struct figure_row {
    const char *name, *text, *detail;
    double value; /* NAN: no bar */
    bool is_sum;  /* set apart */
};

/* A line across at y. */
struct figure_level {
    double y;
    const char *text;
    bool is_upper; /* its text stands above, else below */
};

/* An upright line at x. */
struct figure_edge {
    double x;
    const char *text;
    int series; /* gives the colour */
};

/* A ring at a point. */
struct figure_mark {
    double x, y;
    const char *text; /* "" : no label */
    int series;
    bool is_filled;
};

/* Readings: small dots in the colour of a curve. */
struct figure_dots {
    const double *x, *y; /* [count]; a y that is not finite is left out */
    int count, series;
};

/* A shaded range of x; at most one. Bars outside of it have another colour. */
struct figure_band {
    double from, to; /* NAN: none; may be infinite */
    const char *text;
};

struct figure {
    const char *title;
    const char **notes; /* [note_count] lines below the title */
    int note_count;
    struct figure_axis x, y;
    struct figure_series *series; /* [series_count] */
    int series_count;
    struct figure_bar *bars; /* [bar_count] rising, drawn behind the curves */
    int bar_count;
    struct figure_row *rows; /* [row_count]; with any, rows are drawn and nothing else */
    int row_count;
    struct figure_level *levels;
    int level_count;
    struct figure_edge *edges;
    int edge_count;
    struct figure_mark *marks;
    int mark_count;
    struct figure_dots *dots;
    int dots_count;
    struct figure_band band;
    double linear;     /* 0, or the y axis is logarithmic on both sides of zero beyond this */
    bool keeps_zero;   /* the y axis begins at zero */
    bool labels_above; /* those of upright lines; else near the x axis */
    bool has_close_up; /* set by figure_choose_close_up */
};

enum figure_use {
    FIGURE_ALONE,  /* a document or part of one: colours inside, dark on white */
    FIGURE_IN_PAGE /* classes only; the page's style sheet gives the colours, and its script reads
                      the geometry from data attributes */
};

/* Whether a close-up is drawn below: when the curves are flatter than the eye sees on an axis from
 * zero. */
void figure_choose_close_up(struct figure *figure);

/* Width and height in px that figure_draw needs. */
enum { FIGURE_WIDTH = 760 };
int figure_height(const struct figure *figure);

/* Appends one <svg> element, its upper edge at `top` of the document around it. */
void figure_draw(const struct figure *figure, enum figure_use use, int top, struct buffer *out);

/* The figures one below the other as a whole SVG document. */
void figures_document(const struct figure *figures, int count, struct buffer *out);

#endif
