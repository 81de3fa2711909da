/* junction_curve.c: what a diode or bipolar model says to a row of readings. */
#include "calibrate/junction_curve.h"

#include <assert.h>
#include <math.h>
#include <string.h>

enum { STEP_LIMIT = 200, OWN_LIMIT = 8, COLLECTOR = 0, BASE = 1, EMITTER = 2, ANODE = 0 };

/* Newton ends when a step is below this share of the voltages. */
static const long double step_end = 1e-17L;

void junction_prepare(struct junction *junction, const struct device_type *type,
                      const double *model, double multiplicity, double kelvin, double measured)
{
    double own[OWN_LIMIT];
    for (int k = 0; k < type->parameter_count; k++) {
        own[k] = type->parameters[k].standard;
    }
    own[parameter_find(type->parameters, type->parameter_count, "m")] = multiplicity;
    struct device_values values = {own, model, NULL, 1};
    struct device_conditions conditions = {kelvin, measured, EFFECTS_FULL, 0};
    junction->type = type;
    type->prepare(&values, &conditions, junction->prepared);
    memset(junction->resistance, 0, sizeof junction->resistance);
    for (int k = 0; k < type->series_count; k++) {
        int place = parameter_find(type->model_parameters, type->model_parameter_count,
                                   type->series[k].model_parameter);
        junction->resistance[type->series[k].terminal] = model[place] / multiplicity;
    }
}

static long double polarity_of(const struct junction *junction)
{
    return junction->type->polarity < 0 ? -1 : 1;
}

static bool is_forced(const struct measured_row *row)
{
    return isnan(row->value[COLUMN_VBE]);
}

/* Voltages at the outer terminals; a forced base has none. */
static void find_outer(const struct junction *junction, const struct measured_row *row,
                       long double *outer)
{
    long double polarity = polarity_of(junction);
    outer[0] = outer[1] = outer[2] = 0;
    if (junction->type->terminal_count == 2) {
        outer[ANODE] = polarity * row->value[COLUMN_V];
        return;
    }
    outer[COLLECTOR] = polarity * row->value[COLUMN_VCE];
    outer[BASE] = is_forced(row) ? 0 : polarity * row->value[COLUMN_VBE];
}

void junction_begin(const struct junction *junction, const struct measured_row *row,
                    long double *inner)
{
    find_outer(junction, row, inner);
    if (junction->type->terminal_count == 3 && is_forced(row)) {
        inner[BASE] = polarity_of(junction) * 0.6L;
    }
}

/* Elimination with partial pivoting; n at most 3. False when singular. */
static bool solve_small(int n, long double *a, long double *b)
{
    for (int k = 0; k < n; k++) {
        int pivot = k;
        for (int r = k + 1; r < n; r++) {
            pivot = fabsl(a[n * r + k]) > fabsl(a[n * pivot + k]) ? r : pivot;
        }
        if (!(fabsl(a[n * pivot + k]) > 0)) {
            return false;
        }
        for (int c = 0; c < n; c++) {
            long double swap = a[n * k + c];
            a[n * k + c] = a[n * pivot + c];
            a[n * pivot + c] = swap;
        }
        long double swap = b[k];
        b[k] = b[pivot];
        b[pivot] = swap;
        for (int r = k + 1; r < n; r++) {
            long double factor = a[n * r + k] / a[n * k + k];
            for (int c = k; c < n; c++) {
                a[n * r + c] -= factor * a[n * k + c];
            }
            b[r] -= factor * b[k];
        }
    }
    for (int k = n - 1; k >= 0; k--) {
        for (int c = k + 1; c < n; c++) {
            b[k] -= a[n * k + c] * b[c];
        }
        b[k] /= a[n * k + k];
    }
    return true;
}

/* The share of a step that the junctions can bear. */
static long double share_of(const struct junction *junction, const long double *x,
                            const long double *step)
{
    double at[JUNCTION_TERMINALS], by[JUNCTION_TERMINALS];
    for (int k = 0; k < junction->type->terminal_count; k++) {
        at[k] = (double)x[k];
        by[k] = (double)step[k];
    }
    return junction->type->longest_step != NULL
               ? junction->type->longest_step(junction->prepared, at, by)
               : 1;
}

/*
 * Newton on the voltages behind the resistances: the current into each terminal is what its
 * resistance carries; without resistance the voltage is the outer one; a forced base carries ib.
 */
void junction_currents(const struct junction *junction, const struct measured_row *row,
                       long double *inner, long double *main, long double *base)
{
    long double outer[JUNCTION_TERMINALS], f[JUNCTION_TERMINALS];
    long double jac[JUNCTION_TERMINALS * JUNCTION_TERMINALS];
    long double polarity = polarity_of(junction);
    const int n = junction->type->terminal_count;
    assert(n >= 2 && n <= JUNCTION_TERMINALS);
    find_outer(junction, row, outer);
    for (int step = 0; step < STEP_LIMIT; step++) {
        long double change[JUNCTION_TERMINALS], size = 0;
        junction->type->evaluate_extended(junction->prepared, inner, f, jac);
        for (int k = 0; k < n; k++) {
            long double resistance = junction->resistance[k];
            if (n == 3 && k == BASE && is_forced(row)) {
                change[k] = polarity * row->value[COLUMN_IB] - f[k];
                continue;
            }
            for (int c = 0; c < n; c++) {
                jac[n * k + c] = resistance * jac[n * k + c] + (c == k ? 1 : 0);
            }
            change[k] = outer[k] - inner[k] - resistance * f[k];
        }
        if (!solve_small(n, jac, change)) {
            break;
        }
        long double share = share_of(junction, inner, change);
        for (int k = 0; k < n; k++) {
            inner[k] += share * change[k];
            size = fmaxl(size, fabsl(change[k]) / (fabsl(inner[k]) + 1e-3L));
        }
        if (size <= step_end) {
            break;
        }
    }
    junction->type->evaluate_extended(junction->prepared, inner, f, jac);
    *main = polarity * f[0];
    *base = n == 3 ? polarity * f[BASE] : 0;
}
