/*
 * reading.h: the quantities that a cell asks for, and the margins of its requirements, read at a
 * solved point.
 */
#ifndef ANALYSES_READING_H
#define ANALYSES_READING_H

#include "solve/operating_point.h"

/* What is read of one circuit. */
struct reading_list {
    const struct circuit *circuit;
    struct probe *probes;
    int probe_count;
    int *probe_of;     /* [requirement_count] probe of each requirement, -1: not read */
    bool *with_output; /* [output_count] needs the curve and the derivatives of that output */
    bool needs_outputs;
};

enum reading_scope { READING_ALL, READING_EVERYWHERE };

/*
 * reading_list_make: READING_ALL: the current of each output, then the quantity of each
 * requirement; READING_EVERYWHERE: only those of `everywhere` requirements. The same for each
 * circuit that is built from one cell. False when memory is short.
 */
bool reading_list_make(struct reading_list *list, const struct circuit *circuit,
                       enum reading_scope scope, struct arena *arena);

/*
 * reading_take: at a root; polished when list->needs_outputs.
 *
 * values   [probe_count] out, NAN where there is none
 * margins  [requirement_count] out: distance to the limit, NAN: not read or no value
 */
enum status reading_take(struct operating_point *point, const struct reading_list *list,
                         double *values, double *margins);

/* A quantity of an output that only its whole analysis gives. */
bool reading_is_of_output(const struct probe *probe);

#endif
