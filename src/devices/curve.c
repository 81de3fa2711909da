/*
 * curve.c: slopes of a monotone cubic, and the table of the `table` device.
 */
#include "devices/curve.h"

#include "devices/two_terminal.h"

/* Three-point slope at the end of the data, from the two secants next to it, kept from turning
 * the curve round. */
static double end_slope(double h0, double h1, double secant0, double secant1)
{
    double slope = ((2 * h0 + h1) * secant0 - h0 * secant1) / (h0 + h1);
    return slope * secant0 > 0 ? slope : 0;
}

static double secant(const double *v, const double *i, int k)
{
    return (i[k + 1] - i[k]) / (v[k + 1] - v[k]);
}

/*
 * Fritsch and Carlson, SIAM J. Numer. Anal. 17 (1980) 238-246: start from three-point slopes, set
 * them to 0 at an extremum, and where (alpha, beta) = (slopes of an interval over its secant)
 * leave the circle of radius 3, shorten both onto it: their region S2.
 */
void curve_slopes(const double *v, const double *i, double *slope, int count)
{
    if (count == 2) {
        slope[0] = slope[1] = secant(v, i, 0);
        return;
    }
    for (int k = 1; k + 1 < count; k++) {
        double before = secant(v, i, k - 1), after = secant(v, i, k);
        double h0 = v[k] - v[k - 1], h1 = v[k + 1] - v[k];
        slope[k] = before * after > 0 ? (h1 * before + h0 * after) / (h0 + h1) : 0;
    }
    slope[0] = end_slope(v[1] - v[0], v[2] - v[1], secant(v, i, 0), secant(v, i, 1));
    slope[count - 1] = end_slope(v[count - 1] - v[count - 2], v[count - 2] - v[count - 3],
                                 secant(v, i, count - 2), secant(v, i, count - 3));
    for (int k = 0; k + 1 < count; k++) {
        double rise = secant(v, i, k);
        if (!(rise > 0) && !(rise < 0)) {
            slope[k] = slope[k + 1] = 0;
            continue;
        }
        double radius = hypot(slope[k] / rise, slope[k + 1] / rise);
        if (radius > 3) {
            slope[k] *= 3 / radius;
            slope[k + 1] *= 3 / radius;
        }
    }
}

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct curve *p = prepared;
    (void)conditions;
    *p = *(const struct curve *)values->extra;
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    double f[2], jac[4];
    table_evaluate(prepared, inner, f, jac);
    return two_terminal_describe(f[0], outer, q);
}

const struct device_type device_table = {
    TWO_TERMINAL_TABLE,
    .word = "table",
    .summary = "measured curve of a two-terminal device",
    .extra_kind = EXTRA_CURVE,
    .value_parameter = -1,
    .prepared_size = sizeof(struct curve),
    .prepare = prepare,
    .evaluate = table_evaluate,
    .evaluate_extended = table_evaluate_extended,
    .describe = describe,
};
