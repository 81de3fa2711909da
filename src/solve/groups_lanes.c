/*
 * groups_lanes.c: a group of like devices in one vector; compiled once a width.
 */
#include <string.h>

#include "devices/real.h"
#include "solve/groups.h"

enum { LOCAL = DEVICE_LOCAL_LIMIT };

static int moved_of(const struct device_type *type, const size_t **moved)
{
    const struct device_lanes *known = REAL_NAME(device)(type);
    *moved = known == NULL ? NULL : known->moved;
    return known == NULL ? -1 : known->moved_count;
}

static real load(const double *values)
{
    real vector;
    memcpy(&vector, values, sizeof vector);
    return vector;
}

static void gather(const int *at, int count, const double *x, real *local)
{
    for (int l = 0; l < count; l++) {
        double values[LANES];
        for (int k = 0; k < LANES; k++) {
            values[k] = at[l * LANES + k] < 0 ? 0 : x[at[l * LANES + k]];
        }
        local[l] = load(values);
    }
}

static bool can_be(const struct device_type *type, int count, int r, int q)
{
    return type->pattern == NULL || type->pattern[count * r + q];
}

/* The magnitudes that meet in the equations, as system.c measures them. */
static void measure(const struct device_type *type, int count, const real *local, const real *f,
                    const real *jac, real *size)
{
    const struct system_measure measure = system_measure();
    const int nodes = count - type->branch_count;
    for (int r = 0; r < count; r++) {
        size[r] = lanes_abs(f[r]);
        for (int q = 0; q < count; q++) {
            if (!can_be(type, count, r, q)) {
                continue;
            }
            const real slope = lanes_abs(jac[count * r + q]), volts = lanes_abs(local[q]);
            if (r < nodes) {
                size[r] += slope * (q < nodes ? measure.volts : measure.amperes);
            } else {
                size[r] +=
                    lanes_choose(slope < lanes_of(1), slope, lanes_of(1)) * (volts + measure.volts);
            }
            size[r] += measure.rounding * (slope * volts);
        }
    }
}

/* Adds one row of the device in every lane. */
struct rows {
    const struct group *group;
    const int *at;
    const int *slots[LANES]; /* the next one of each lane */
    int lanes;
};

static void add_row(struct rows *it, int count, int r, const real *f, const real *size,
                    const real *jac, double *sum, double *scale, double *values)
{
    double current[LANES], magnitude[LANES], slope[LOCAL][LANES];
    memcpy(current, &f[r], sizeof current);
    memcpy(magnitude, &size[r], sizeof magnitude);
    for (int q = 0; q < count; q++) {
        memcpy(slope[q], &jac[count * r + q], sizeof slope[q]);
    }
    for (int k = 0; k < it->lanes; k++) {
        const int row = it->at[r * LANES + k];
        if (row < 0) {
            continue;
        }
        const int *slot = it->slots[k];
        it->slots[k] += count;
        if ((it->group->left_out >> k & 1) != 0) {
            continue;
        }
        sum[row] += current[k];
        scale[row] += magnitude[k];
        for (int q = 0; q < count; q++) {
            if (slot[q] >= 0) {
                values[slot[q]] += slope[q][k];
            }
        }
    }
}

static void evaluate(const struct system *system, const struct group_class *class,
                     const struct group *group, const int *at, const double *moved, const double *x,
                     double *f, double *scale, double *values)
{
    const int count = class->local_count;
    real local[LOCAL], part[LOCAL], size[LOCAL], jac[LOCAL * LOCAL];
    real *block = class->block;
    for (int d = 0; d < GROUP_MOVED; d++) {
        block[d] = load(moved + d * LANES);
    }
    gather(at, count, x, local);
    REAL_NAME(device)(class->type)->evaluate(block + GROUP_MOVED, local, part, jac);
    measure(class->type, count, local, part, jac, size);
    struct rows rows = {.group = group, .at = at, .lanes = group->count};
    for (int k = 0; k < group->count; k++) {
        rows.slots[k] = system->slots + system->first_slot[group->members[k]];
    }
    for (int r = 0; r < count; r++) {
        add_row(&rows, count, r, part, size, jac, f, scale, values);
    }
}

#if LANES == 8
#define KIND groups_kind_8
#else
#define KIND groups_kind_4
#endif

extern const struct groups_kind KIND;
const struct groups_kind KIND = {
    .width = LANES, .is_supported = lanes_supported, .moved = moved_of, .evaluate = evaluate};
