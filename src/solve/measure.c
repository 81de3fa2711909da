/*
 * measure.c: quantities of a solved point.
 */
#include "solve/measure.h"

#include <math.h>
#include <string.h>

enum { QUANTITY_LIMIT = 32 };

/*
 * Voltages are taken against the last terminal before they are rounded to double: 1 uV across a
 * resistor at 5 V would otherwise lose its digits. A device that looks at absolute voltages is
 * given those.
 */
unsigned measure_device(const struct system *system, int k, const long double *x, double *q)
{
    const struct instance *instance = &system->circuit->instances[k];
    const struct device_type *type = instance->type;
    const int terminals = type->terminal_count;
    double outer[DEVICE_LOCAL_LIMIT], inner[DEVICE_LOCAL_LIMIT];
    const int last = instance->local[terminals - 1];
    const long double reference = type->uses_ground || last < 0 ? 0 : x[last];
    const int nodes = instance->local_count - type->branch_count;
    for (int l = 0; l < instance->local_count; l++) {
        const long double v = instance->local[l] < 0 ? 0 : x[instance->local[l]];
        inner[l] = (double)(l < nodes ? v - reference : v);
    }
    for (int t = 0; t < terminals; t++) {
        const long double v = instance->outer[t] < 0 ? 0 : x[instance->outer[t]];
        outer[t] = (double)(v - reference);
    }
    return type->describe(system_block(system, k), outer, inner, q);
}

double measure_device_quantity(const struct system *system, int k, int quantity,
                               const long double *x)
{
    double q[QUANTITY_LIMIT];
    measure_device(system, k, x, q);
    return q[quantity];
}

static unsigned describe_plain(const struct system *system, int k, const double *x, double *q)
{
    const struct instance *instance = &system->circuit->instances[k];
    double outer[DEVICE_LOCAL_LIMIT], inner[DEVICE_LOCAL_LIMIT];
    system_gather(instance, x, inner);
    for (int t = 0; t < instance->type->terminal_count; t++) {
        outer[t] = instance->outer[t] < 0 ? 0 : x[instance->outer[t]];
    }
    return instance->type->describe(system_block(system, k), outer, inner, q);
}

double measure_headroom(const struct system *system, int k, const double *x, unsigned *region)
{
    double q[QUANTITY_LIMIT];
    const struct device_type *type = system->circuit->instances[k].type;
    const unsigned found = describe_plain(system, k, x, q);
    if (region != NULL) {
        *region = found;
    }
    return type->quantity_headroom < 0 ? NAN : q[type->quantity_headroom];
}

static double branch_current(const struct system *system, int instance, const double *x)
{
    return x[system_branch(&system->circuit->instances[instance])];
}

static bool is_output(const struct circuit *c, int instance)
{
    for (int k = 0; k < c->output_count; k++) {
        if (c->outputs[k].instance == instance) {
            return true;
        }
    }
    return false;
}

/*
 * Rails and sources deliver. The load at an output is not part of the cell, and a source that takes
 * power stands for a part that does: it is not given back.
 */
double measure_delivered(const struct system *system, int k, const double *x)
{
    const struct instance *instance = &system->circuit->instances[k];
    const struct device_type *type = instance->type;
    if (type->drive == NULL || type->quantity_power < 0 || is_output(system->circuit, k)) {
        return NAN;
    }
    double q[QUANTITY_LIMIT];
    describe_plain(system, k, x, q);
    const double delivered = -q[type->quantity_power];
    return delivered > 0 || instance->is_hidden ? delivered : (double)NAN;
}

static double source_power(const struct system *system, const double *x)
{
    double sum = 0;
    for (int k = 0; k < system->circuit->instance_count; k++) {
        const double delivered = measure_delivered(system, k, x);
        if (isfinite(delivered)) {
            sum += delivered;
        }
    }
    return sum;
}

static double least_headroom(const struct system *system, const double *x, int *where)
{
    double least = NAN;
    for (int k = 0; k < system->circuit->instance_count; k++) {
        if (!system->circuit->instances[k].type->is_transistor) {
            continue;
        }
        const double headroom = measure_headroom(system, k, x, NULL);
        if (isfinite(headroom) && !(headroom >= least)) {
            least = headroom;
            *where = k;
        }
    }
    return least;
}

int measure_tightest(const struct system *system, const double *x)
{
    int where = -1;
    least_headroom(system, x, &where);
    return where;
}

double measure_probe(const struct system *system, const struct probe *probe, const double *x)
{
    const struct circuit *c = system->circuit;
    double q[QUANTITY_LIMIT];
    int where;
    switch (probe->kind) {
    case PROBE_NODE:
        return x[probe->index];
    case PROBE_RAIL: {
        const struct rail *rail = &c->rails[probe->index];
        const double v = x[rail->unknown], i = -branch_current(system, rail->instance, x);
        return probe->quantity == RAIL_V ? v : probe->quantity == RAIL_CURRENT ? i : v * i;
    }
    case PROBE_DEVICE:
        describe_plain(system, probe->index, x, q);
        return q[probe->quantity];
    case PROBE_ALL:
        return least_headroom(system, x, &where);
    case PROBE_CELL:
        return source_power(system, x);
    case PROBE_OUTPUT:
        if (probe->quantity == OUTPUT_CURRENT) {
            return fabs(branch_current(system, c->outputs[probe->index].instance, x));
        }
        break;
    }
    return NAN;
}

static bool measure_devices(const struct operating_point *p, struct arena *arena,
                            struct point_result *result)
{
    const struct circuit *c = p->system->circuit;
    result->devices = arena_new_array(arena, struct device_result, c->instance_count);
    for (int k = 0; result->devices != NULL && k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        if (instance->is_hidden) {
            continue;
        }
        double *q = arena_new_array(arena, double, instance->type->quantity_count);
        char text[80];
        if (q == NULL) {
            return false;
        }
        const unsigned region = measure_device(p->system, k, p->refined, q);
        region_describe(region, instance->type, text, sizeof text);
        struct device_result *device = &result->devices[result->device_count++];
        *device =
            (struct device_result){instance, region, arena_copy(arena, text, strlen(text)), q};
        if (device->region_text == NULL) {
            return false;
        }
    }
    return result->devices != NULL;
}

bool measure_point(const struct operating_point *p, struct arena *arena,
                   struct point_result *result)
{
    const struct system *s = p->system;
    const struct circuit *c = s->circuit;
    double *x = arena_new_array(arena, double, s->n);
    result->rails = arena_new_array(arena, struct rail_result, c->rail_count);
    if (x == NULL || result->rails == NULL || !measure_devices(p, arena, result)) {
        return false;
    }
    for (int k = 0; k < s->n; k++) {
        x[k] = (double)p->refined[k];
    }
    result->x = x;
    for (int k = 0; k < c->rail_count; k++) {
        const struct rail *rail = &c->rails[k];
        const double v = x[rail->unknown], i = -branch_current(s, rail->instance, x);
        result->rails[k] = (struct rail_result){rail, v, i, v * i};
    }
    int where = -1;
    result->least_headroom = least_headroom(s, x, &where);
    result->least_headroom_device = where < 0 ? NULL : c->instances[where].name;
    result->cell_power = source_power(s, x);
    return true;
}
