/*
 * mismatch.c: random deviates of devices, and their effect to first order.
 *
 * With F(x, p) = 0 and a quantity q(x, p): dq/dp = dq/dx . dx/dp + dq/dp|x, and with the adjoint
 * J^T a = dq/dx the first part is -a . dF/dp. Rows are independent, so that the variance is the sum
 * of the squares of sigma dq/dp (Pelgrom, Duinmaijer and Welbers 1989 for the sigma of a device).
 */
#include "analyses/mismatch.h"

#include <math.h>
#include <string.h>

#include "analyses/measure.h"
#include "analyses/reading.h"
#include "numerics/linear.h"

static struct device_values values_of(const struct system *s, int k)
{
    const struct instance *instance = &s->circuit->instances[k];
    return (struct device_values){s->own[k], instance->model_values, instance->extra,
                                  s->circuit->resistor_factor};
}

bool mismatch_list(const struct system *s, struct arena *arena, struct mismatch *m)
{
    const struct circuit *c = s->circuit;
    int most = 0;
    for (int k = 0; k < c->instance_count; k++) {
        most += c->instances[k].type->deviate_count;
    }
    *m = (struct mismatch){.rows = arena_new_array(arena, struct mismatch_row, most)};
    for (int k = 0; m->rows != NULL && k < c->instance_count; k++) {
        const struct device_values values = values_of(s, k);
        const struct device_type *type = c->instances[k].type;
        for (int d = 0; d < type->deviate_count; d++) {
            const double sigma = type->deviates[d].sigma(&values);
            if (sigma > 0) {
                m->rows[m->count++] = (struct mismatch_row){k, &type->deviates[d], sigma};
            }
        }
    }
    return m->rows != NULL;
}

void mismatch_apply(struct system *s, const struct mismatch *m, const double *deviates)
{
    for (int k = 0; k < m->count; k++) {
        const struct mismatch_row *row = &m->rows[k];
        const int parameter = row->deviate->own_parameter;
        const double base = s->circuit->instances[row->instance].own[parameter];
        const double value = base + (deviates == NULL ? 0 : row->sigma * deviates[k]);
        /* a device is prepared once, after its last row */
        if (k + 1 < m->count && m->rows[k + 1].instance == row->instance) {
            s->own[row->instance][parameter] = value;
        } else {
            system_set(s, row->instance, parameter, value);
        }
    }
}

/* --- linear ----------------------------------------------------------------------------------- */

/* Steps of the central differences of a quantity, which is smooth over some millivolts. */
static const double step_volts = 1e-5;
static const double step_share = 1e-4;

static double slope_at(const struct operating_point *p, const struct probe *probe, double *x, int k)
{
    const double value = x[k];
    const double step = k < p->system->node_count ? step_volts : step_share * (fabs(value) + 1e-12);
    x[k] = value + step;
    const double above = measure_probe(p->system, probe, x);
    x[k] = value - step;
    const double below = measure_probe(p->system, probe, x);
    x[k] = value;
    return (above - below) / (2 * step);
}

/* dq/dx into b; only unknowns of the device matter for a device. */
static void gradient(const struct operating_point *p, const struct probe *probe, double *x,
                     long double *b)
{
    const struct circuit *c = p->system->circuit;
    const int n = p->system->n;
    memset(b, 0, (size_t)n * sizeof *b);
    if (probe->kind != PROBE_DEVICE) {
        for (int k = 0; k < n; k++) {
            b[k] = slope_at(p, probe, x, k);
        }
        return;
    }
    const struct instance *instance = &c->instances[probe->index];
    for (int l = 0; l < instance->local_count; l++) {
        if (instance->local[l] >= 0) {
            b[instance->local[l]] = slope_at(p, probe, x, instance->local[l]);
        }
    }
    for (int t = 0; t < instance->type->terminal_count; t++) {
        if (instance->outer[t] >= 0) {
            b[instance->outer[t]] = slope_at(p, probe, x, instance->outer[t]);
        }
    }
}

/* dq/dp at fixed x: the quantities of a device see its own deviates. */
static double direct_slope(struct operating_point *p, const struct probe *probe,
                           const struct mismatch_row *row, const double *x)
{
    const bool may = probe->kind == PROBE_ALL || probe->kind == PROBE_CELL ||
                     (probe->kind == PROBE_DEVICE && probe->index == row->instance);
    if (!may) {
        return 0;
    }
    struct system *s = p->system;
    const int parameter = row->deviate->own_parameter;
    const double value = s->own[row->instance][parameter], step = 1e-3 * row->sigma;
    system_set(s, row->instance, parameter, value + step);
    const double above = measure_probe(s, probe, x);
    system_set(s, row->instance, parameter, value - step);
    const double below = measure_probe(s, probe, x);
    system_set(s, row->instance, parameter, value);
    return (above - below) / (2 * step);
}

/* a . dF/dp over the rows of one instance; terminals may share a node, whose row counts once. */
static long double product(const struct instance *instance, const long double *a,
                           const long double *slope)
{
    long double sum = 0;
    for (int l = 0; l < instance->local_count; l++) {
        const int row = instance->local[l];
        bool counted = row < 0;
        for (int before = 0; before < l; before++) {
            counted |= instance->local[before] == row;
        }
        sum += counted ? 0 : a[row] * slope[row];
    }
    return sum;
}

enum status mismatch_slopes(struct operating_point *p, const struct mismatch *m,
                            const struct probe *probe, double *slopes)
{
    struct system *s = p->system;
    long double *b = p->linear, *a = p->linear + s->n, *work = p->linear + 2 * s->n;
    if (reading_is_of_output(probe)) {
        return STATUS_UNSOLVED;
    }
    struct arena *scratch = arena_create();
    double *x = scratch == NULL ? NULL : arena_new_array(scratch, double, s->n);
    if (x == NULL) {
        arena_destroy(scratch);
        return STATUS_MEMORY;
    }
    memcpy(x, p->x, (size_t)s->n * sizeof *x);
    gradient(p, probe, x, b);
    linear_refine(s->solver, s->face.pattern, p->values, b, a, work, true);
    for (int k = 0; k < m->count; k++) {
        const struct mismatch_row *row = &m->rows[k];
        system_slope(s, row->instance, row->deviate->own_parameter, p->refined, b);
        const long double slope =
            direct_slope(p, probe, row, x) - product(&s->circuit->instances[row->instance], a, b);
        slopes[k] = (double)slope * row->sigma;
    }
    arena_destroy(scratch);
    return STATUS_OK;
}
