/*
 * size.h: the values that the `choose` lines ask for, and what preferred values do.
 */
#ifndef ANALYSES_SIZE_H
#define ANALYSES_SIZE_H

#include "analyses/analysis.h"
#include "analyses/derivative.h"

/* A rounded set of values and what it gives. */
struct rounding {
    const char *name;       /* "E24", "E96", "grid" */
    const double *values;   /* [choice_count] */
    const double *reached;  /* [choice_count] the quantities with all of these values together; NAN:
                               no value */
    const bool *is_rounded; /* [choice_count] false: this value has no series and stays exact */
};

enum bound { BOUND_NONE, BOUND_FROM, BOUND_TO };

struct chosen {
    const struct choice *choice;
    double before;    /* the value in the cell */
    double value;     /* SI */
    double reached;   /* its quantity there */
    enum bound bound; /* the end of its range that stops it */
};

struct size_result {
    struct chosen *list;
    int count;
    bool solved;        /* all targets are met; else the values are the nearest achievable */
    const char *method; /* "Newton", "Newton, the targets moved in steps", ... */
    int evaluations;    /* operating points solved */
    struct rounding *roundings;
    int rounding_count;
    double grid; /* m, of lengths and widths */
};

/*
 * size_find: solves all `choose` lines together. Each unknown starts at the cell's own value when
 * that lies in its range, else in the (geometric) middle.
 *
 * home    polished point of the cell as written; stays so
 * grid    m
 * result  gets `size`
 *
 * Returns STATUS_OK (also when there is no solution inside the bounds), STATUS_INPUT after messages
 * in the cell's diagnostics (no `choose` line, one unknown or quantity twice, an unknown that
 * changes no target, a target that no unknown changes, targets that move together),
 * STATUS_UNSOLVED, STATUS_STOPPED or STATUS_MEMORY.
 */
enum status size_find(struct operating_point *home, const struct analysis_options *options,
                      double grid, struct result *result);

/* Preferred values (IEC 60063) nearest by ratio; ties go up. */
double preferred_e24(double value);
double preferred_e96(double value);

/*
 * size_rewrite: the text of the cell with values in place of what is written there; comments and
 * layout stay.
 *
 * values  [choice_count]
 *
 * NULL when memory is short, or after a message in the cell's diagnostics when a value has no place
 * of its own in the text (inside a block).
 */
const char *size_rewrite(const struct circuit *circuit, const double *values, struct arena *arena);

#endif
