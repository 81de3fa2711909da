/*
 * point.h: one operating point, as plain data. A NAN is a value that does not apply.
 */
#ifndef SOLVE_POINT_H
#define SOLVE_POINT_H

#include "circuit/circuit.h"

/* How the operating point was found, and how good it is. */
struct solver_result {
    bool converged;
    const char *method;     /* a rung of the ladder in operating_point.c: "direct", ... */
    int iterations;         /* Newton iterations in all */
    double worst_residual;  /* largest |sum of currents| / sum of |currents|, extended precision */
    const char *worst_name; /* node or branch where it is */
    const char *limited_by; /* what keeps worst_residual above 1e-12; NULL when it is below */
    const char *trouble;    /* not converged: what happened, in circuit words; NULL otherwise */
    const char *advice;     /* not converged: what to look at; NULL otherwise */
};

struct device_result {
    const struct instance *instance;
    unsigned region;
    const char *region_text; /* "" when it has none */
    const double *q;         /* [type->quantity_count] */
};

struct rail_result {
    const struct rail *rail;
    double v, current, power; /* current delivered to the cell */
};

struct point_result {
    struct solver_result solver;
    const double *x;               /* [unknown_count] rounded to double */
    struct device_result *devices; /* [device_count] hidden instances left out */
    int device_count;
    struct rail_result *rails; /* [circuit->rail_count] */
    double least_headroom;     /* V, NAN when there is no transistor */
    const char *least_headroom_device;
    double cell_power; /* W delivered by all rails and sources */
};

#endif
