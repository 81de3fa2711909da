/*
 * size_round.c: chosen values at the nearest preferred ones.
 */
#include <math.h>
#include <string.h>

#include "analyses/sizer.h"

static bool is_whole(const struct sizer *z, int k)
{
    return z->refs[k].row != NULL && strcmp(z->refs[k].row->name, "m") == 0;
}

/* The value a series has for an unknown; NAN: none. */
static double rounded(const struct sizer *z, int k, double value, int series, double grid)
{
    const struct dimension dimension = z->choices[k].knob.dimension;
    if (dimension_equal(dimension, DIMENSION_LENGTH)) {
        return fmax(round(value / grid), 1) * grid;
    }
    if (is_whole(z, k)) {
        return fmax(round(value), 1);
    }
    if (dimension_equal(dimension, DIMENSION_RESISTANCE) && value > 0 && series < 2) {
        return series == 0 ? preferred_e24(value) : preferred_e96(value);
    }
    return NAN;
}

static enum status round_values(struct sizer *z, struct arena *arena, int series, const char *name,
                                struct size_result *size)
{
    double *values = arena_new_array(arena, double, z->n);
    double *reached = arena_new_array(arena, double, z->n);
    bool *is_rounded = arena_new_array(arena, bool, z->n);
    if (values == NULL || reached == NULL || is_rounded == NULL) {
        return STATUS_MEMORY;
    }
    bool resistors = false, others = false;
    for (int k = 0; k < z->n; k++) {
        const double value = rounded(z, k, size->list[k].value, series, size->grid);
        const bool resistor = dimension_equal(z->choices[k].knob.dimension, DIMENSION_RESISTANCE);
        is_rounded[k] = isfinite(value);
        values[k] = is_rounded[k] ? value : size->list[k].value;
        resistors |= resistor && is_rounded[k];
        others |= !resistor && is_rounded[k];
        reached[k] = NAN;
    }
    if (series < 2 ? !resistors : !others) {
        return STATUS_OK;
    }
    struct trial trial;
    enum status status = trial_open(&trial, z->home, z->state, z->refs, values, z->n);
    if (status == STATUS_OK) {
        status = quantity_values(&trial.point, z->probes, z->n, reached);
    }
    trial_close(&trial);
    size->roundings[size->rounding_count++] = (struct rounding){name, values, reached, is_rounded};
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}

/* E24 and E96 where a resistance is chosen (lengths and counts are rounded with them); the grid
 * alone where none is. */
enum status sizer_round(struct sizer *z, struct arena *arena, struct size_result *size)
{
    static const char *const names[] = {"E24", "E96", "grid"};
    size->roundings = arena_new_array(arena, struct rounding, 3);
    if (size->roundings == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    for (int series = 0; series < 3 && status == STATUS_OK; series++) {
        if (series < 2 || size->rounding_count == 0) {
            status = round_values(z, arena, series, names[series], size);
        }
    }
    return status;
}
