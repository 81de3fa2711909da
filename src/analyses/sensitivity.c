/*
 * sensitivity.c: derivatives in every parameter, ranked.
 */
#include "analyses/sensitivity.h"

#include <math.h>
#include <stdlib.h>

/* What is below this share of the quantity is rounding. */
static const double idle_share = 1e-9;

static double rank(const struct sensitivity_row *row)
{
    return isnan(row->relative) ? -1 : fabs(row->relative);
}

static int by_rank(const void *a, const void *b)
{
    const double x = rank(a), y = rank(b);
    return x < y ? 1 : x > y ? -1 : 0;
}

/* A parameter at zero has no relative derivative; whether it acts is judged by the step that its
 * derivative was taken with. */
static bool is_idle(const struct sensitivity_row *row)
{
    return isnan(row->relative) ? !(fabs(row->absolute) > 0) : fabs(row->relative) < idle_share;
}

/* What a cell stands in: a rail, or the temperature. */
static bool is_condition(const struct circuit *c, const struct parameter_ref *p)
{
    for (int k = 0; k < c->rail_count; k++) {
        if (p->sort == PARAMETER_OWN && p->instance == c->rails[k].instance) {
            return true;
        }
    }
    return p->sort == PARAMETER_KNOB && p->knob.kind == KNOB_TEMPERATURE;
}

static void fill(struct sensitivity_table *table, const struct circuit *c,
                 const struct parameter_list *parameters, const double *slopes)
{
    for (int k = 0; k < parameters->count; k++) {
        const struct parameter_ref *p = &parameters->list[k];
        const double relative = slopes[k] * p->value / table->value;
        const bool has_relative = fabs(p->value) > 0 && fabs(table->value) > 0;
        table->rows[k] = (struct sensitivity_row){.parameter = p->name,
                                                  .value = p->value,
                                                  .dimension = p->dimension,
                                                  .absolute = slopes[k],
                                                  .relative = has_relative ? relative : NAN,
                                                  .is_condition = is_condition(c, p)};
    }
    table->row_count = parameters->count;
    qsort(table->rows, (size_t)table->row_count, sizeof *table->rows, by_rank);
    for (int k = table->row_count - 1; k >= 0; k--) {
        table->idle_count += is_idle(&table->rows[k]);
    }
}

enum status sensitivity_find(struct operating_point *point, const struct probe *probe,
                             struct arena *arena, struct sensitivity_table *table)
{
    struct parameter_list parameters;
    *table = (struct sensitivity_table){.probe = *probe, .value = NAN};
    if (!derivative_parameters(point->system, arena, &parameters)) {
        return STATUS_MEMORY;
    }
    double *slopes = arena_new_array(arena, double, parameters.count);
    table->rows = arena_new_array(arena, struct sensitivity_row, parameters.count);
    if (slopes == NULL || table->rows == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = quantity_derivative(point, probe, parameters.list, parameters.count,
                                                   &table->value, slopes, &table->way);
    if (status == STATUS_OK && isfinite(table->value)) {
        fill(table, point->system->circuit, &parameters, slopes);
        return STATUS_OK;
    }
    table->trouble = isinf(table->value) ? "it is unlimited" : "it has no value here";
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}
