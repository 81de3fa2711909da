/*
 * groups.h: like devices of a cell evaluated side by side, one a lane of a vector (base/lanes.h).
 *
 * Devices are alike when they have one type and their prepared blocks differ in nothing but what
 * mismatch moves. The transistors of a mirror are, and those of a bias tree. The values agree with
 * those of single devices to some units in the last place; the polish in long double evaluates
 * every device by itself.
 */
#ifndef SOLVE_GROUPS_H
#define SOLVE_GROUPS_H

#include "solve/system.h"

enum { GROUP_WIDTH = 8, GROUP_MOVED = 2 };

/* Devices that are alike. */
struct group_class {
    const struct device_type *type;
    const size_t *moved; /* [moved_count] places in the prepared block of what mismatch moves */
    int moved_count;
    void *block; /* room for GROUP_MOVED vectors, then the prepared block without what moves */
    int local_count, members;
    int open; /* group that still has room, -1: none; used while groups are made */
};

/* Up to a vector of them. */
struct group {
    int class, count;
    unsigned left_out;        /* lanes whose block has changed: evaluated by themselves */
    int members[GROUP_WIDTH]; /* instances */
};

/* One width of vector. */
struct groups_kind {
    int width;
    bool (*is_supported)(void);
    /* Whether there are lanes for a type, and what they read of each lane; -1: none. */
    int (*moved)(const struct device_type *type, const size_t **moved);
    /* Adds currents, magnitudes and derivatives of a group. at: [local_count * width] unknowns;
     * moved: [GROUP_MOVED * width]. */
    void (*evaluate)(const struct system *system, const struct group_class *class,
                     const struct group *group, const int *at, const double *moved, const double *x,
                     double *f, double *scale, double *values);
};

struct groups {
    const struct groups_kind *kind;
    const struct system *system;
    struct group_class *classes; /* [class_count] */
    int class_count;
    int *table;           /* [table_size] hash of a class to its number + 1, half free at least */
    size_t table_size;    /* a power of two */
    char *blocks;         /* of the classes */
    char *masked;         /* scratch for one block */
    struct group *groups; /* [group_count] */
    int group_count;
    int *at;       /* of all groups, the longest local_count each */
    double *moved; /* of all groups */
    int *group_of; /* [instance] -1: none */
    int *singles;  /* [single_count] instances without a group */
    int single_count;
    int left_out_count;
    int longest; /* local_count of the types that occur */
};

/* For the system's circuit, in its arena. NULL: this build, processor or cell has no use for
 * groups, or memory is short; every device is then evaluated by itself. */
struct groups *groups_create(struct system *system);

/* Finds the like devices among the blocks in force. */
void groups_make(struct groups *groups);

/* The block of an instance was prepared anew. */
void groups_update(struct groups *groups, int instance);

/* Adds all groups; the singles and those left out are the caller's. */
void groups_evaluate(const struct groups *groups, const double *x, double *f, double *scale,
                     double *values);

/* Whether the caller must evaluate an instance that is no single. */
bool groups_left_out(const struct groups *groups, int instance);

#endif
