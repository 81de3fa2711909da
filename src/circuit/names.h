/*
 * names.h: from a name to the object that has it. One table a circuit; objects of different sorts
 * may share a name (an output is at a node of the same name).
 */
#ifndef CIRCUIT_NAMES_H
#define CIRCUIT_NAMES_H

#include "base/arena.h"

enum name_sort {
    NAME_NODE,
    NAME_INSTANCE,
    NAME_RAIL,
    NAME_OUTPUT,
    NAME_LET,
    NAME_MODEL,
    NAME_BLOCK,
    NAME_SORT_COUNT
};

struct names;

struct names *names_create(struct arena *arena);

/* Index of the object, or -1. */
int names_find(const struct names *names, enum name_sort sort, const char *name);

/* Adds a name (borrowed); false when memory is short. The name must be new for its sort. */
bool names_add(struct names *names, enum name_sort sort, const char *name, int index);

/* All names of one sort, in the order they came; at most `limit`. Returns how many. */
int names_list(const struct names *names, enum name_sort sort, const char **list, int limit);

#endif
