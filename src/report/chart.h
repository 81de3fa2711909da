/*
 * chart.h: a curve drawn with characters, at most 60 by 10, each half a character high.
 */
#ifndef REPORT_CHART_H
#define REPORT_CHART_H

#include "report/layout.h"

enum { CHART_COLUMNS = 60, CHART_ROWS = 10 };

/* A dot, full or empty. */
struct chart_mark {
    double x, y;
    bool is_filled;
};

struct chart {
    const double *x, *y; /* [count], x rising; a y that is not finite leaves a gap */
    int count;
    struct dimension x_dimension, y_dimension;
    const char *x_name;
    double edge;           /* x of the dotted upright; NAN: none */
    const char *edge_name; /* "compliance" */
    double point;          /* x of the marked point on the curve; NAN: none */
    const char *point_name;
    double linear; /* 0, or y is logarithmic on both sides of zero beyond this */
    const struct chart_mark *marks;
    int mark_count;
    const double *const *family; /* [family_count] curves over the same x, each drawn with a letter,
                                    instead of y; 0: none */
    const char *const *family_names;
    int family_count;
};

/* Draws into the layout, zero always inside. Fewer than two points, no width in x, or nothing but
 * zero: one line says so instead. */
void chart_draw(struct layout *layout, const struct chart *chart);

#endif
