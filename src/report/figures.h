/* figures.h: which pictures a result has. */
#ifndef REPORT_FIGURES_H
#define REPORT_FIGURES_H

#include "report/figure.h"
#include "report/layout.h"

struct figure_list {
    struct figure *list;
    int count, capacity;
};

/* All pictures of a result; texts and arrays in the layout's arena, curves borrowed from the
 * result. No figure: the result holds no curve. When memory is short the arena tells. */
struct figure_list figures_of(struct layout *layout, const struct result *result);

#endif
