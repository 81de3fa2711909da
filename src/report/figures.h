/* figures.h: which pictures a result has. */
#ifndef REPORT_FIGURES_H
#define REPORT_FIGURES_H

#include "report/figure.h"
#include "report/layout.h"

struct figure_list {
    struct figure *list;
    int count, capacity;
};

/* All pictures of a result, by its command; texts and arrays in the layout's arena, curves borrowed
 * from the result. No figure: the result holds nothing to draw. When memory is short the arena
 * tells. */
struct figure_list figures_of(struct layout *layout, const struct result *result);

/* Its parts: load curves and sweeps; the loop of `states`; samples, causes and conditions of
 * `spread`; samples alone; conditions alone; shares of the effects; ranked derivatives. */
struct figure_list figures_of_curves(struct layout *layout, const struct result *result);
struct figure_list figures_of_states(struct layout *layout, const struct result *result);
struct figure_list figures_of_spread(struct layout *layout, const struct result *result);
struct figure_list figures_of_samples(struct layout *layout, const struct result *result);
struct figure_list figures_of_conditions(struct layout *layout, const struct result *result);
struct figure_list figures_of_reasons(struct layout *layout, const struct result *result);
struct figure_list figures_of_ranking(struct layout *layout, const struct result *result);

/*
 * figures_loop_linear: A, where the axis of a loop curve stops being logarithmic.
 *
 * A push spans many decades on both sides of zero, and the least one decides whether the cell
 * starts: the axis is straight only below that push or the bound it is judged by.
 */
double figures_loop_linear(const struct states_result *found);

#endif
