/*
 * mismatch.c: random deviates of devices, and their effect to first order.
 *
 * Rows are independent, so that the variance of a quantity is the sum of the squares of its slopes
 * (Pelgrom, Duinmaijer and Welbers 1989, for the sigma of a device).
 */
#include "analyses/mismatch.h"

#include <math.h>

#include "analyses/quantity.h"

static struct device_values values_of(const struct system *s, int k)
{
    const struct instance *instance = &s->circuit->instances[k];
    return (struct device_values){s->own[k], instance->model_values, instance->extra,
                                  s->circuit->resistor_factor};
}

static void add_row(struct mismatch *m, int instance, const struct deviate *deviate,
                    const struct device_values *values, bool is_even)
{
    const double sigma = deviate == NULL ? 0 : deviate->sigma(values);
    if (sigma > 0) {
        m->rows[m->count++] = (struct mismatch_row){instance, deviate, sigma, is_even};
    }
}

bool mismatch_list(const struct system *s, struct arena *arena, struct mismatch *m)
{
    const struct circuit *c = s->circuit;
    int most = 0;
    for (int k = 0; k < c->instance_count; k++) {
        most += c->instances[k].type->deviate_count + 1;
    }
    *m = (struct mismatch){.rows = arena_new_array(arena, struct mismatch_row, most)};
    for (int k = 0; m->rows != NULL && k < c->instance_count; k++) {
        const struct device_values values = values_of(s, k);
        const struct device_type *type = c->instances[k].type;
        for (int d = 0; d < type->deviate_count; d++) {
            add_row(m, k, &type->deviates[d], &values, false);
        }
        add_row(m, k, type->tolerance, &values, true);
    }
    return m->rows != NULL;
}

/* It comes from the normal number by its own distribution: 2 Phi(z) - 1 is even between -1 and 1,
 * whose sigma is 1/sqrt(3). */
double mismatch_even(double z)
{
    return sqrt(3) * erf(z / sqrt(2));
}

static double shift_of(const struct mismatch_row *row, double z)
{
    return row->sigma * (row->is_even ? mismatch_even(z) : z);
}

void mismatch_apply(struct system *s, const struct mismatch *m, const double *deviates)
{
    for (int k = 0; k < m->count; k++) {
        const struct mismatch_row *row = &m->rows[k];
        const int parameter = row->deviate->own_parameter;
        double *own = s->own[row->instance];
        const bool again = k > 0 && m->rows[k - 1].instance == row->instance &&
                           m->rows[k - 1].deviate->own_parameter == parameter;
        const double base =
            again ? own[parameter] : s->circuit->instances[row->instance].own[parameter];
        own[parameter] = base + shift_of(row, deviates[k]);
        /* a device is prepared once, after its last row */
        if (k + 1 == m->count || m->rows[k + 1].instance != row->instance) {
            system_set(s, row->instance, parameter, own[parameter]);
        }
    }
}

enum status mismatch_slopes(struct operating_point *p, const struct mismatch *m,
                            const struct probe *probe, double *slopes)
{
    struct arena *scratch = arena_create();
    struct parameter_ref *list =
        scratch == NULL ? NULL : arena_new_array(scratch, struct parameter_ref, m->count);
    if (list == NULL) {
        arena_destroy(scratch);
        return STATUS_MEMORY;
    }
    for (int k = 0; k < m->count; k++) {
        const struct mismatch_row *row = &m->rows[k];
        list[k] = derivative_own(p->system, row->instance, row->deviate->own_parameter);
    }
    const enum status status = quantity_derivative(p, probe, list, m->count, NULL, slopes, NULL);
    for (int k = 0; status == STATUS_OK && k < m->count; k++) {
        slopes[k] *= m->rows[k].sigma;
    }
    arena_destroy(scratch);
    return status;
}
