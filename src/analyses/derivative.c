/*
 * derivative.c: the adjoint, and the partial derivatives that it is applied to.
 *
 * Partial derivatives in a parameter are fourth-order differences of the device equations at a
 * fixed state in long double: no solve, no loss of digits. Adjoint of circuits: Director and Rohrer
 * (1969); of a linear transfer: their section on networks, here in matrix form.
 */
#include "analyses/derivative.h"

#include <math.h>
#include <string.h>

#include "solve/measure.h"
#include "solve/variant.h"

enum { LOCAL = DEVICE_LOCAL_LIMIT };

/* A function of state and parameters whose derivative is wanted. */
struct functional {
    const struct probe *probe; /* NULL: -z^T J y with z and y held */
    const long double *z, *y;  /* [n] */
    struct operating_point *point;
    const double *x;       /* [n] the state, rounded */
    long double *gradient; /* [n] derivative in x */
    long double *adjoint;  /* [n] */
    struct arena *arena;
};

static void gather(const struct instance *instance, const long double *x, long double *local)
{
    for (int l = 0; l < instance->local_count; l++) {
        local[l] = instance->local[l] < 0 ? 0 : x[instance->local[l]];
    }
}

/* --- the functional ----------------------------------------------------------------------------
 */

/* z^T jac y of one instance at its local voltages. */
static long double bilinear(const struct functional *it, const struct system *s, int k,
                            const long double *local)
{
    const struct instance *instance = &s->circuit->instances[k];
    const int n = instance->local_count;
    long double f[LOCAL], jac[LOCAL * LOCAL], z[LOCAL], y[LOCAL], sum = 0;
    instance->type->evaluate_extended(system_block(s, k), local, f, jac);
    gather(instance, it->z, z);
    gather(instance, it->y, y);
    for (int r = 0; r < n; r++) {
        for (int c = 0; c < n; c++) {
            sum += z[r] * jac[n * r + c] * y[c];
        }
    }
    return sum;
}

/* Value minus adjoint times residual, counted over the instances first..last, at a fixed state. */
static long double lagrangian(const struct functional *it, const struct system *s, int first,
                              int last)
{
    long double sum = 0;
    for (int k = first; k <= last; k++) {
        const struct instance *instance = &s->circuit->instances[k];
        long double local[LOCAL], f[LOCAL], jac[LOCAL * LOCAL];
        gather(instance, it->point->refined, local);
        instance->type->evaluate_extended(system_block(s, k), local, f, jac);
        for (int l = 0; l < instance->local_count; l++) {
            sum -= instance->local[l] < 0 ? 0 : it->adjoint[instance->local[l]] * f[l];
        }
        if (it->probe == NULL) {
            sum -= bilinear(it, s, k, local);
        }
    }
    return sum;
}

/* Whether the probe reads values of these instances and not only the state. */
static bool reads(const struct probe *probe, int first, int last)
{
    switch (probe->kind) {
    case PROBE_DEVICE:
        return probe->index >= first && probe->index <= last;
    case PROBE_ALL:
    case PROBE_CELL:
        return true;
    case PROBE_NODE:
    case PROBE_RAIL:
    case PROBE_OUTPUT:
        break;
    }
    return false;
}

static double probe_value(const struct functional *it, const struct system *s)
{
    return it->probe->kind == PROBE_DEVICE
               ? measure_device_quantity(s, it->probe->index, it->probe->quantity,
                                         it->point->refined)
               : measure_probe(s, it->probe, it->x);
}

/* --- its gradient in the state -----------------------------------------------------------------
 */

/* V or A. Widths of the smooth functions of the devices are 1 mV and more. */
static double state_step(const struct system *s, int unknown, long double value)
{
    return unknown < s->node_count ? 1e-5
                                   : 1e-5 * (value < 0   ? -value > 0 ? (double)-value : 1
                                             : value > 0 ? (double)value
                                                         : 1);
}

static void bilinear_gradient(const struct functional *it)
{
    const struct system *s = it->point->system;
    for (int k = 0; k < s->circuit->instance_count; k++) {
        const struct instance *instance = &s->circuit->instances[k];
        long double local[LOCAL];
        gather(instance, it->point->refined, local);
        for (int l = 0; l < instance->local_count; l++) {
            const int row = instance->local[l];
            if (row < 0) {
                continue;
            }
            const long double at = local[l], step = state_step(s, row, at);
            for (int p = 0; p < STENCIL_POINTS; p++) {
                local[l] = at + stencil_offset[p] * step;
                it->gradient[row] -= stencil_weight[p] / step * bilinear(it, s, k, local);
            }
            local[l] = at;
        }
    }
}

/* Derivative of one quantity of a device, scaled by `factor`, in the unknowns that it sees. */
static void add_device_gradient(const struct functional *it, int k, int quantity, double factor)
{
    struct system *s = it->point->system;
    const struct instance *instance = &s->circuit->instances[k];
    long double *x = it->point->refined;
    for (int l = 0; l < instance->local_count + instance->type->terminal_count; l++) {
        const int row = l < instance->local_count ? instance->local[l]
                                                  : instance->outer[l - instance->local_count];
        bool counted = row < 0;
        for (int before = 0; before < l; before++) {
            counted |= row == (before < instance->local_count
                                   ? instance->local[before]
                                   : instance->outer[before - instance->local_count]);
        }
        if (counted) {
            continue;
        }
        const long double at = x[row], step = state_step(s, row, at);
        for (int p = 0; p < STENCIL_POINTS; p++) {
            x[row] = at + stencil_offset[p] * step;
            it->gradient[row] +=
                factor * stencil_weight[p] / step * measure_device_quantity(s, k, quantity, x);
        }
        x[row] = at;
    }
}

static bool probe_gradient(const struct functional *it)
{
    const struct probe *probe = it->probe;
    struct system *s = it->point->system;
    const struct circuit *c = s->circuit;
    switch (probe->kind) {
    case PROBE_NODE:
        it->gradient[probe->index] = 1;
        return true;
    case PROBE_RAIL: {
        const struct rail *rail = &c->rails[probe->index];
        const int branch = system_branch(&c->instances[rail->instance]);
        const bool power = probe->quantity == RAIL_POWER;
        it->gradient[branch] = probe->quantity == RAIL_V ? 0
                               : power                   ? -it->point->refined[rail->unknown]
                                                         : -1;
        if (probe->quantity != RAIL_CURRENT) {
            it->gradient[rail->unknown] = power ? -it->point->refined[branch] : 1;
        }
        return true;
    }
    case PROBE_DEVICE:
        add_device_gradient(it, probe->index, probe->quantity, 1);
        return true;
    case PROBE_ALL: {
        const int k = measure_tightest(s, it->x);
        if (k >= 0) {
            add_device_gradient(it, k, c->instances[k].type->quantity_headroom, 1);
        }
        return k >= 0;
    }
    case PROBE_CELL:
        for (int k = 0; k < c->instance_count; k++) {
            if (isfinite(measure_delivered(s, k, it->x))) {
                add_device_gradient(it, k, c->instances[k].type->quantity_power, -1);
            }
        }
        return true;
    case PROBE_OUTPUT:
        if (probe->quantity == OUTPUT_CURRENT) {
            const int branch = system_branch(&c->instances[c->outputs[probe->index].instance]);
            it->gradient[branch] = it->point->refined[branch] <= 0 ? -1 : 1;
            return true;
        }
        break;
    }
    return false;
}

/* --- one parameter -----------------------------------------------------------------------------
 */

static long double own_slope(const struct functional *it, const struct parameter_ref *p)
{
    struct system *s = it->point->system;
    const int last = system_last_part(s->circuit, p->instance);
    const bool direct = it->probe != NULL && reads(it->probe, p->instance, last);
    const double value = s->own[p->instance][p->index], step = stencil_step(p->row, value);
    long double sum = 0;
    for (int k = 0; k < STENCIL_POINTS; k++) {
        system_set(s, p->instance, p->index, value + stencil_offset[k] * step);
        sum += stencil_weight[k] / step *
               (lagrangian(it, s, p->instance, last) + (direct ? probe_value(it, s) : 0));
    }
    system_set(s, p->instance, p->index, value);
    return sum;
}

/* Values of a model stand in the prepared blocks of all its users. */
static long double model_slope(const struct functional *it, const struct parameter_ref *p,
                               double *values, int value_count)
{
    struct system *s = it->point->system;
    const struct circuit *c = s->circuit;
    const double value = p->model_values[p->index], step = stencil_step(p->row, value);
    memcpy(values, p->model_values, (size_t)value_count * sizeof *values);
    long double sum = 0;
    for (int k = 0; k < STENCIL_POINTS; k++) {
        long double part = 0;
        values[p->index] = value + stencil_offset[k] * step;
        system_swap_model(s, p->model_values, values);
        for (int i = 0; i < c->instance_count; i++) {
            if (c->instances[i].model_values == p->model_values) {
                part += lagrangian(it, s, i, system_last_part(c, i));
            }
        }
        sum += stencil_weight[k] / step * (part + (it->probe != NULL ? probe_value(it, s) : 0));
    }
    system_swap_model(s, p->model_values, NULL);
    return sum;
}

static double knob_step(const struct parameter_ref *p)
{
    return p->knob.kind == KNOB_TEMPERATURE ? 5e-3
           : fabs(p->value) > 0             ? 1e-5 * fabs(p->value)
                                            : 1e-9;
}

static enum status knob_slope(const struct functional *it, const struct parameter_ref *p,
                              long double *sum)
{
    const double step = knob_step(p);
    *sum = 0;
    for (int k = 0; k < STENCIL_POINTS; k++) {
        const struct setting setting = {&p->knob, p->value + stencil_offset[k] * step};
        struct variant variant;
        const enum status status = variant_open(&variant, it->point->system, &setting, 1);
        if (status == STATUS_OK) {
            const struct system *s = variant.system;
            *sum += stencil_weight[k] / step *
                    (lagrangian(it, s, 0, s->circuit->instance_count - 1) +
                     (it->probe != NULL ? probe_value(it, s) : 0));
        }
        variant_close(&variant);
        if (status == STATUS_UNSOLVED) {
            *sum = NAN;
            return STATUS_OK;
        }
        if (status != STATUS_OK) {
            return status;
        }
    }
    return STATUS_OK;
}

static int model_size(const struct circuit *c, const double *values)
{
    for (int k = 0; k < c->instance_count; k++) {
        if (c->instances[k].model_values == values) {
            return c->instances[k].type->model_parameter_count;
        }
    }
    return 0;
}

static enum status all_slopes(const struct functional *it, const struct parameter_ref *parameters,
                              int count, double *result)
{
    for (int k = 0; k < count; k++) {
        const struct parameter_ref *p = &parameters[k];
        long double slope = 0;
        if (p->sort == PARAMETER_OWN) {
            slope = own_slope(it, p);
        } else if (p->sort == PARAMETER_MODEL) {
            const int size = model_size(it->point->system->circuit, p->model_values);
            double *values = arena_new_array(it->arena, double, size);
            if (values == NULL) {
                return STATUS_MEMORY;
            }
            slope = model_slope(it, p, values, size);
        } else {
            const enum status status = knob_slope(it, p, &slope);
            if (status != STATUS_OK) {
                return status;
            }
        }
        result[k] = (double)slope;
    }
    return STATUS_OK;
}

/* --- solves ------------------------------------------------------------------------------------
 */

static void solve(const struct functional *it, const long double *b, long double *y,
                  bool transposed)
{
    struct operating_point *p = it->point;
    linear_refine(p->system->solver, p->system->face.pattern, p->values, b, y,
                  p->linear + 2 * p->system->n, transposed);
}

static bool functional_begin(struct functional *it, struct operating_point *point)
{
    const int n = point->system->n;
    *it = (struct functional){.point = point, .arena = arena_create()};
    if (it->arena == NULL) {
        return false;
    }
    double *x = arena_new_array(it->arena, double, n);
    it->gradient = arena_new_array(it->arena, long double, n);
    it->adjoint = arena_new_array(it->arena, long double, n);
    for (int k = 0; x != NULL && k < n; k++) {
        x[k] = (double)point->refined[k];
    }
    it->x = x;
    return x != NULL && it->gradient != NULL && it->adjoint != NULL;
}

enum status derivative_probe(struct operating_point *point, const struct probe *probe,
                             const struct parameter_ref *parameters, int count, double *result)
{
    struct functional it;
    enum status status = functional_begin(&it, point) ? STATUS_OK : STATUS_MEMORY;
    if (status == STATUS_OK) {
        it.probe = probe;
        status = probe_gradient(&it) ? STATUS_OK : STATUS_UNSOLVED;
    }
    if (status == STATUS_OK) {
        solve(&it, it.gradient, it.adjoint, true);
        status = all_slopes(&it, parameters, count, result);
    }
    arena_destroy(it.arena);
    return status;
}

enum status derivative_exchange(struct operating_point *point, const struct probe *probe,
                                const struct system *other, double *parts)
{
    const struct system *s = point->system;
    struct functional it;
    enum status status = functional_begin(&it, point) ? STATUS_OK : STATUS_MEMORY;
    if (status == STATUS_OK) {
        it.probe = probe;
        status = probe_gradient(&it) ? STATUS_OK : STATUS_UNSOLVED;
    }
    if (status == STATUS_OK) {
        solve(&it, it.gradient, it.adjoint, true);
        for (int k = 0; k < s->circuit->instance_count; k++) {
            parts[k] = (double)(lagrangian(&it, other, k, k) - lagrangian(&it, s, k, k));
            if (probe->kind == PROBE_DEVICE && probe->index == k) {
                parts[k] += probe_value(&it, other) - probe_value(&it, s);
            }
        }
    }
    arena_destroy(it.arena);
    return status;
}

enum status derivative_transfer(struct operating_point *point, int row, int column,
                                const struct parameter_ref *parameters, int count, double *result)
{
    const int n = point->system->n;
    struct functional it;
    enum status status = functional_begin(&it, point) ? STATUS_OK : STATUS_MEMORY;
    long double *unit = status == STATUS_OK ? arena_new_array(it.arena, long double, n) : NULL;
    long double *z = unit == NULL ? NULL : arena_new_array(it.arena, long double, n);
    long double *y = z == NULL ? NULL : arena_new_array(it.arena, long double, n);
    if (y == NULL) {
        arena_destroy(it.arena);
        return STATUS_MEMORY;
    }
    unit[row] = 1;
    solve(&it, unit, z, true);
    unit[row] = 0;
    unit[column] = 1;
    solve(&it, unit, y, false);
    it.z = z;
    it.y = y;
    bilinear_gradient(&it);
    solve(&it, it.gradient, it.adjoint, true);
    status = all_slopes(&it, parameters, count, result);
    arena_destroy(it.arena);
    return status;
}
