/* value.c: one quantity of a result by its name. */
#include "library/value.h"

#include <math.h>

static double rail_value(const struct rail_result *rail, int quantity)
{
    switch (quantity) {
    case RAIL_V:
        return rail->v;
    case RAIL_CURRENT:
        return rail->current;
    default:
        return rail->power;
    }
}

static double device_value(const struct result *result, const struct probe *probe)
{
    const struct instance *wanted = &result->circuit->instances[probe->index];
    for (int k = 0; k < result->point.device_count; k++) {
        if (result->point.devices[k].instance == wanted) {
            return result->point.devices[k].q[probe->quantity];
        }
    }
    return NAN;
}

/* The line sensitivity of greatest size. */
static double greatest_line(const double *line, int count)
{
    double greatest = NAN;
    for (int k = 0; line != NULL && k < count; k++) {
        if (!(fabs(line[k]) <= fabs(greatest))) {
            greatest = isnan(line[k]) ? greatest : line[k];
        }
    }
    return greatest;
}

static double output_value(const struct result *result, const struct probe *probe)
{
    const struct output *wanted = &result->circuit->outputs[probe->index];
    const struct output_result *row = NULL;
    for (int k = 0; k < result->output_count; k++) {
        if (result->outputs[k].output == wanted) {
            row = &result->outputs[k];
        }
    }
    if (row == NULL) {
        return NAN;
    }
    switch ((enum output_quantity)probe->quantity) {
    case OUTPUT_CURRENT:
        return row->current;
    case OUTPUT_RESISTANCE:
        return row->resistance_unlimited ? (double)INFINITY : row->resistance;
    case OUTPUT_COMPLIANCE:
        return row->compliance;
    case OUTPUT_LOW:
        return row->low;
    case OUTPUT_HIGH:
        return row->high;
    case OUTPUT_FLATNESS:
        return row->flatness;
    case OUTPUT_LINE:
        return greatest_line(row->line, result->circuit->rail_count);
    case OUTPUT_TEMPCO:
        return row->tempco;
    case OUTPUT_SIGMA:
        return row->sigma;
    case OUTPUT_QUANTITY_COUNT:
        break;
    }
    return NAN;
}

static double probe_value(const struct result *result, const struct probe *probe)
{
    switch (probe->kind) {
    case PROBE_NODE:
        return probe->index == CIRCUIT_GROUND ? 0.0 : result->point.x[probe->index];
    case PROBE_RAIL:
        return rail_value(&result->point.rails[probe->index], probe->quantity);
    case PROBE_DEVICE:
        return device_value(result, probe);
    case PROBE_OUTPUT:
        return output_value(result, probe);
    case PROBE_ALL:
        return result->point.least_headroom;
    case PROBE_CELL:
        return result->point.cell_power;
    }
    return NAN;
}

double value_of(const struct result *result, const char *name)
{
    struct probe probe = {0};
    double value = NAN;
    if (!result->point.solver.converged) {
        return NAN;
    }
    /* a wrong name is no error here: its message is made and thrown away */
    struct diagnostics scratch = {.arena = arena_create()};
    if (scratch.arena != NULL &&
        circuit_probe(result->circuit, name, SPAN_NONE, &scratch, &probe)) {
        value = probe_value(result, &probe);
    }
    arena_destroy(scratch.arena);
    return value;
}
