/*
 * chart.h: a curve drawn with characters, at most 60 by 10, each half a character high.
 */
#ifndef REPORT_CHART_H
#define REPORT_CHART_H

#include "report/layout.h"

enum { CHART_COLUMNS = 60, CHART_ROWS = 10 };

struct chart {
    const double *x, *y; /* [count], x rising; a y that is not finite leaves a gap */
    int count;
    struct dimension x_dimension, y_dimension;
    const char *x_name;
    double edge;           /* x of the dotted upright; NAN: none */
    const char *edge_name; /* "compliance" */
    double point;          /* x of the marked point on the curve; NAN: none */
    const char *point_name;
};

/* Draws into the layout, zero always inside. Fewer than two points, no width in x, or nothing but
 * zero: one line says so instead. */
void chart_draw(struct layout *layout, const struct chart *chart);

#endif
