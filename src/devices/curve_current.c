/*
 * curve_current.c: current of a measured two-terminal curve: cubic between two points by their
 * values and slopes, straight outside.
 */
#include "devices/curve.h"

#include "devices/real.h"

/* The interval [v[k], v[k+1]] that holds `at`; the first or last one outside. */
static int find_interval(const struct curve *curve, real at)
{
    int low = 0, high = curve->count - 1;
    while (high - low > 1) {
        int middle = low + (high - low) / 2;
        if ((real)curve->v[middle] <= at) {
            low = middle;
        } else {
            high = middle;
        }
    }
    return low;
}

static real curve_at(const struct curve *curve, real at, real *slope)
{
    int last = curve->count - 1;
    if (!(at > (real)curve->v[0])) {
        *slope = curve->slope[0];
        return (real)curve->i[0] + *slope * (at - (real)curve->v[0]);
    }
    if (!(at < (real)curve->v[last])) {
        *slope = curve->slope[last];
        return (real)curve->i[last] + *slope * (at - (real)curve->v[last]);
    }
    int k = find_interval(curve, at);
    real h = (real)curve->v[k + 1] - (real)curve->v[k];
    real t = (at - (real)curve->v[k]) / h;
    real rise = (real)curve->i[k + 1] - (real)curve->i[k];
    real d0 = h * (real)curve->slope[k], d1 = h * (real)curve->slope[k + 1];
    /* i[k] + d0 t + (3 rise - 2 d0 - d1) t^2 + (d0 + d1 - 2 rise) t^3 */
    real c2 = 3 * rise - 2 * d0 - d1, c3 = d0 + d1 - 2 * rise;
    *slope = (d0 + t * (2 * c2 + 3 * c3 * t)) / h;
    return (real)curve->i[k] + t * (d0 + t * (c2 + c3 * t));
}

void REAL_NAME(table_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    real slope;
    f[0] = curve_at(prepared, x[0] - x[1], &slope);
    f[1] = -f[0];
    jac[0] = jac[3] = slope;
    jac[1] = jac[2] = -slope;
}
