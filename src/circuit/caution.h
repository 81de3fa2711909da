/*
 * caution.h: remarks that are no errors. Each has a code (silenced by `quiet CODE [NAME]`) and the
 * rule behind it, both in one table.
 */
#ifndef CIRCUIT_CAUTION_H
#define CIRCUIT_CAUTION_H

#include <stdbool.h>

#include "base/arena.h"

struct circuit;

enum caution_code {
    CAUTION_CASE_NAMES,
    CAUTION_SQUARE_LAW,
    CAUTION_TRIODE,
    CAUTION_HEADROOM,
    CAUTION_MIRROR_LENGTH,
    CAUTION_MIRROR_VOLTAGE,
    CAUTION_MODEL_RANGE,
    CAUTION_LEAKAGE,
    CAUTION_HOT,
    CAUTION_TOUCH,
    CAUTION_DISSIPATION,
    CAUTION_ASSUMED_SLOPE,
    CAUTION_OFF_STATE,
    CAUTION_LOOP,
    CAUTION_SWEEP,
    CAUTION_CONDITIONING,
    CAUTION_FORWARD_JUNCTION,
    CAUTION_OUTPUT_DIRECTION,
    CAUTION_MODEL,
    CAUTION_COUNT
};

struct caution {
    const char *code;  /* "mirror-length" */
    const char *thing; /* device, node or output; "" for the whole cell */
    const char *text;  /* with this cell's own figures */
    const char *rule;  /* the published rule or fact of the trade behind it; NULL: none */
    int line;          /* of the cell, 0: none */
};

struct caution_list {
    struct arena *arena;
    struct caution *list;
    int count, capacity;
    struct caution *silenced; /* by `quiet` lines, on record */
    int silenced_count, silenced_capacity;
};

/* The code as written in a cell, and its rule (NULL: none). */
const char *caution_name(enum caution_code code);
const char *caution_rule(enum caution_code code);

/* Adds a caution, to the silenced ones where a `quiet` line of the circuit says so. False when
 * memory is short. */
bool caution_append(struct caution_list *list, const struct caution *caution, bool is_silenced);
bool caution_add(const struct circuit *circuit, struct caution_list *list, enum caution_code code,
                 const char *thing, int line, const char *format, ...)
    __attribute__((format(printf, 6, 7)));

#endif
