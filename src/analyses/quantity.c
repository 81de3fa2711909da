/*
 * quantity.c: one door to every quantity and its derivatives.
 */
#include "analyses/quantity.h"

#include <math.h>
#include <string.h>

#include "analyses/judge.h"
#include "solve/linearised.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "analyses/trial.h"

static bool is_of_output(const struct probe *probe)
{
    return probe->kind == PROBE_OUTPUT && probe->quantity != OUTPUT_CURRENT;
}

/* Quantities that the linearised equations at `at` give. */
static bool is_small_signal(const struct probe *probe)
{
    return is_of_output(probe) &&
           (probe->quantity == OUTPUT_RESISTANCE || probe->quantity == OUTPUT_LINE ||
            probe->quantity == OUTPUT_TEMPCO || probe->quantity == OUTPUT_SIGMA);
}

static unsigned edge_of(const struct probe *probe)
{
    return probe->quantity == OUTPUT_COMPLIANCE ? EDGE_COMPLIANCE
           : probe->quantity == OUTPUT_LOW      ? EDGE_LOW
           : probe->quantity == OUTPUT_HIGH     ? EDGE_HIGH
                                                : 0;
}

/* --- values ------------------------------------------------------------------------------------
 */

static enum status read_outputs(struct operating_point *point, const struct probe *probes,
                                int count, struct result *into)
{
    const struct circuit *c = point->system->circuit;
    into->outputs = arena_new_array(into->arena, struct output_result, c->output_count);
    if (into->outputs == NULL) {
        return STATUS_MEMORY;
    }
    into->output_count = c->output_count;
    for (int o = 0; o < c->output_count; o++) {
        bool wanted = false, swept = false, whole = false;
        unsigned edges = 0;
        for (int k = 0; k < count; k++) {
            const bool here = is_of_output(&probes[k]) && probes[k].index == o;
            wanted |= here;
            swept |= here && !is_small_signal(&probes[k]);
            whole |= here && probes[k].quantity == OUTPUT_FLATNESS;
            edges |= here ? edge_of(&probes[k]) : 0;
        }
        if (wanted && !swept && !output_at_point(point, o, into->arena, &into->outputs[o])) {
            return STATUS_MEMORY;
        }
        if (swept) {
            enum status status =
                whole ? analyse_output(point, o, into->arena, &into->outputs[o])
                      : output_edges(point, o, edges, into->arena, &into->outputs[o]);
            status = status == STATUS_OK ? operating_point_polish(point) : status;
            if (status != STATUS_OK) {
                return status;
            }
        }
    }
    return STATUS_OK;
}

enum status quantity_values(struct operating_point *point, const struct probe *probes, int count,
                            double *values)
{
    bool outputs = false;
    for (int k = 0; k < count; k++) {
        outputs |= is_of_output(&probes[k]);
        values[k] = probes[k].kind == PROBE_DEVICE
                        ? measure_device_quantity(point->system, probes[k].index,
                                                  probes[k].quantity, point->refined)
                        : measure_probe(point->system, &probes[k], point->x);
    }
    if (!outputs) {
        return STATUS_OK;
    }
    struct result scratch = {.arena = arena_create(), .circuit = point->system->circuit};
    if (scratch.arena == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = read_outputs(point, probes, count, &scratch);
    status = arena_failed(scratch.arena) ? STATUS_MEMORY : status;
    for (int k = 0; status == STATUS_OK && k < count; k++) {
        if (is_of_output(&probes[k])) {
            values[k] = result_value(&scratch, &probes[k]);
        }
    }
    arena_destroy(scratch.arena);
    return status;
}

/* --- derivatives of small-signal quantities ----------------------------------------------------
 */

static int output_branch(const struct circuit *c, int index)
{
    return system_branch(&c->instances[c->outputs[index].instance]);
}

/* R = -1/T with T = d(branch current)/d(load voltage), so dR = R^2 dT. */
static enum status resistance_slope(struct operating_point *point, const struct probe *probe,
                                    const struct parameter_ref *parameters, int count, double value,
                                    double *result)
{
    const int branch = output_branch(point->system->circuit, probe->index);
    const enum status status =
        derivative_transfer(point, branch, branch, parameters, count, result);
    for (int k = 0; status == STATUS_OK && k < count; k++) {
        result[k] *= value * value;
    }
    return status;
}

/* line = T/I, T = d(branch current)/d(rail voltage) with the sign of the current, for the rail
 * that moves the current most. */
static enum status line_slope(struct operating_point *point, const struct probe *probe,
                              const struct parameter_ref *parameters, int count, double value,
                              double *result)
{
    const struct circuit *c = point->system->circuit;
    const int branch = output_branch(c, probe->index);
    const double current = (double)point->refined[branch];
    int driver = -1;
    double largest = -1;
    for (int k = 0; k < c->rail_count; k++) {
        const int candidate = system_branch(&c->instances[c->rails[k].instance]);
        const double transfer = (double)fabsl(linearised_transfer(point, branch, candidate));
        if (transfer > largest) {
            largest = transfer;
            driver = candidate;
        }
    }
    struct arena *arena = arena_create();
    double *currents = arena == NULL ? NULL : arena_new_array(arena, double, count);
    const struct probe of_current = {PROBE_OUTPUT, probe->index, OUTPUT_CURRENT, DIMENSION_CURRENT,
                                     probe->text};
    enum status status = currents == NULL ? STATUS_MEMORY
                         : driver < 0     ? STATUS_UNSOLVED
                                          : STATUS_OK;
    if (status == STATUS_OK) {
        status = derivative_transfer(point, branch, driver, parameters, count, result);
    }
    if (status == STATUS_OK) {
        status = derivative_probe(point, &of_current, parameters, count, currents);
    }
    for (int k = 0; status == STATUS_OK && k < count; k++) {
        result[k] = result[k] / current - value * currents[k] / fabs(current);
    }
    arena_destroy(arena);
    return status;
}

/* --- derivatives of edges of the curve ----------------------------------------------------------
 */

/*
 * An edge is the load voltage v at which g(v, p) = 0, so dv/dp = -g_p/g_v: g is the headroom of one
 * transistor, or the distance of the current from the end of its band, factor * I(at).
 */
struct edge {
    struct probe probe;
    double volts;
    double factor; /* of the current at home; 0 for a headroom */
};

static enum status find_edge(struct operating_point *point, const struct probe *probe, double value,
                             struct edge *edge)
{
    const struct circuit *c = point->system->circuit;
    struct arena *arena = arena_create();
    struct output_result r;
    if (arena == NULL) {
        return STATUS_MEMORY;
    }
    *edge = (struct edge){.volts = value};
    enum status status = STATUS_OK;
    if (probe->quantity != OUTPUT_COMPLIANCE) {
        edge->probe = (struct probe){PROBE_OUTPUT, probe->index, OUTPUT_CURRENT, DIMENSION_CURRENT,
                                     probe->text};
        edge->factor = 1;
    } else {
        status = output_edges(point, probe->index, EDGE_COMPLIANCE, arena, &r);
        status = status == STATUS_OK ? operating_point_polish(point) : status;
        const int k = status != STATUS_OK || r.compliance_device == NULL
                          ? -1
                          : circuit_find_instance(c, r.compliance_device);
        if (k >= 0) {
            edge->probe = (struct probe){PROBE_DEVICE, k, c->instances[k].type->quantity_headroom,
                                         DIMENSION_VOLTAGE, probe->text};
        } else if (status == STATUS_OK) {
            status = STATUS_UNSOLVED;
        }
    }
    arena_destroy(arena);
    return status;
}

static bool is_load(const struct parameter_ref *p, int instance, int index)
{
    return p->sort == PARAMETER_OWN && p->instance == instance && p->index == index;
}

static enum status edge_slope(struct operating_point *point, const struct probe *probe,
                              const struct parameter_ref *parameters, int count, double value,
                              double *result)
{
    const struct circuit *c = point->system->circuit;
    const int load = c->outputs[probe->index].instance;
    const int index = c->instances[load].type->value_parameter;
    const struct parameter_ref own = derivative_own(point->system, load, index);
    const int branch = output_branch(c, probe->index);
    struct edge edge;
    struct trial trial = {0};
    struct arena *arena = arena_create();
    double *home = arena == NULL ? NULL : arena_new_array(arena, double, count);
    enum status status = home == NULL ? STATUS_MEMORY : find_edge(point, probe, value, &edge);
    if (status == STATUS_OK && edge.factor > 0) {
        status = derivative_probe(point, &edge.probe, parameters, count, home);
    }
    if (status == STATUS_OK) {
        status = trial_open(&trial, point, NULL, &own, &edge.volts, 1);
    }
    if (status == STATUS_OK) {
        edge.factor *= (double)fabsl(trial.point.refined[branch] / point->refined[branch]);
        status = derivative_probe(&trial.point, &edge.probe, parameters, count, result);
    }
    double along = NAN;
    if (status == STATUS_OK) {
        status = derivative_probe(&trial.point, &edge.probe, &own, 1, &along);
    }
    for (int k = 0; status == STATUS_OK && k < count; k++) {
        /* the load voltage at home is not that of the edge */
        const double there = is_load(&parameters[k], load, index) ? 0 : result[k];
        result[k] = -(there - edge.factor * home[k]) / along;
    }
    trial_close(&trial);
    arena_destroy(arena);
    return status;
}

/* --- derivatives by solving again ---------------------------------------------------------------
 */

/* The fifth-order term at this relative step is near 1e-10, the rounding of the curve's roots,
 * found to 1e-12 V, near 1e-9. */
static double solved_step(const struct parameter_ref *p)
{
    if (p->sort == PARAMETER_KNOB && p->knob.kind == KNOB_TEMPERATURE) {
        return 0.1;
    }
    return fabs(p->value) > 0 ? 1e-3 * fabs(p->value) : 10 * stencil_step(p->row, 0);
}

static enum status solved_slope(struct operating_point *point, const struct probe *probe,
                                const struct parameter_ref *p, double *result)
{
    if (p->sort == PARAMETER_KNOB && !(fabs(p->value) > 0)) {
        *result = NAN;
        return STATUS_OK;
    }
    const double step = solved_step(p);
    *result = 0;
    for (int k = 0; k < STENCIL_POINTS; k++) {
        const double at = p->value + stencil_offset[k] * step;
        double value = NAN;
        struct trial trial;
        enum status status = trial_open(&trial, point, NULL, p, &at, 1);
        if (status == STATUS_OK) {
            status = quantity_values(&trial.point, probe, 1, &value);
        }
        trial_close(&trial);
        if (status != STATUS_OK && status != STATUS_UNSOLVED) {
            return status;
        }
        *result += stencil_weight[k] / step * value;
    }
    return STATUS_OK;
}

static enum status all_solved(struct operating_point *point, const struct probe *probe,
                              const struct parameter_ref *parameters, int count, double *result)
{
    enum status status = STATUS_OK;
    for (int k = 0; k < count && status == STATUS_OK; k++) {
        status = solved_slope(point, probe, &parameters[k], &result[k]);
    }
    return status;
}

/* --- the door -----------------------------------------------------------------------------------
 */

static enum derivative_way way_of(const struct probe *probe)
{
    if (!is_of_output(probe)) {
        return WAY_ADJOINT;
    }
    switch (probe->quantity) {
    case OUTPUT_RESISTANCE:
    case OUTPUT_LINE:
        return WAY_TRANSFER;
    case OUTPUT_COMPLIANCE:
    case OUTPUT_LOW:
    case OUTPUT_HIGH:
        return WAY_EDGE;
    default:
        return WAY_SOLVED;
    }
}

enum status quantity_derivative(struct operating_point *point, const struct probe *probe,
                                const struct parameter_ref *parameters, int count, double *value,
                                double *result, enum derivative_way *way)
{
    const enum derivative_way how = way_of(probe);
    double found = NAN;
    enum status status = quantity_values(point, probe, 1, &found);
    for (int k = 0; k < count; k++) {
        result[k] = NAN;
    }
    if (value != NULL) {
        *value = found;
    }
    if (way != NULL) {
        *way = how;
    }
    if (status != STATUS_OK || !isfinite(found)) {
        return status;
    }
    switch (how) {
    case WAY_ADJOINT:
        return derivative_probe(point, probe, parameters, count, result);
    case WAY_TRANSFER:
        return probe->quantity == OUTPUT_RESISTANCE
                   ? resistance_slope(point, probe, parameters, count, found, result)
                   : line_slope(point, probe, parameters, count, found, result);
    case WAY_EDGE:
        return edge_slope(point, probe, parameters, count, found, result);
    case WAY_SOLVED:
        break;
    }
    return all_solved(point, probe, parameters, count, result);
}
