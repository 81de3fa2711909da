/*
 * sensitivity.h: how a quantity follows every parameter of the cell and its models.
 */
#ifndef ANALYSES_SENSITIVITY_H
#define ANALYSES_SENSITIVITY_H

#include "analyses/quantity.h"

struct sensitivity_row {
    const char *parameter; /* "RE", "M1.W", "n180.threshold", "temperature" */
    double value;          /* of the parameter, SI */
    struct dimension dimension;
    double absolute;   /* dQ/dp, SI */
    double relative;   /* (p/Q) dQ/dp, 1; NAN where p or Q is 0 */
    bool is_condition; /* a rail or the temperature */
};

struct sensitivity_table {
    struct probe probe;
    double value;
    enum derivative_way way;
    struct sensitivity_row *rows; /* greatest |relative| first, those without one last */
    int row_count;
    int idle_count;      /* rows at the end whose effect is below 1e-9 of the quantity: none */
    const char *trouble; /* why there are no rows; NULL otherwise */
};

/* One quantity at a polished point, into the arena. */
enum status sensitivity_find(struct operating_point *point, const struct probe *probe,
                             struct arena *arena, struct sensitivity_table *table);

#endif
