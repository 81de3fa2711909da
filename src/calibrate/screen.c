/* screen.c: readings that contradict their neighbours. */
#include "calibrate/screen.h"

#include <math.h>
#include <stdarg.h>

/* Two sweeps contradict each other beyond this share and this many times the noise. */
static const double sweep_share = 0.3, sweep_noise = 5;
/* A reading stands out beyond this difference of ln id from a cubic through its neighbours; all
 * five are this many times above the noise. */
static const double reading_difference = 0.2, reading_noise = 10;

static const double least_voltage = 1e-3; /* V */

static const double same_setting = 1e-6; /* V */

bool calibration_remark(struct calibration *calibration, const char *code, int device,
                        const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    const char *text = arena_format_list(calibration->arena, format, arguments);
    va_end(arguments);
    struct calibration_remark *list =
        arena_grow(calibration->arena, calibration->remarks, calibration->remark_count,
                   &calibration->remark_capacity, sizeof *list);
    if (text == NULL || list == NULL) {
        return false;
    }
    calibration->remarks = list;
    list[calibration->remark_count++] = (struct calibration_remark){code, device, text};
    return true;
}

static double value(const struct measured *data, int row, enum column column)
{
    double it = data->rows[row].value[column];
    return isnan(it) ? 0 : it;
}

/* What the gate sweeps say at the bias of a row, ln id between readings; NAN: nothing. */
static double from_gate_sweeps(const struct measured *data, int row, double noise)
{
    double vgs = value(data, row, COLUMN_VGS);
    for (int s = 0; s < data->sweep_count; s++) {
        const struct measured_sweep *sweep = &data->sweeps[s];
        if (sweep->moved != COLUMN_VGS ||
            data->rows[sweep->first].kelvin != data->rows[row].kelvin ||
            fabs(value(data, sweep->first, COLUMN_VDS) - value(data, row, COLUMN_VDS)) >
                same_setting ||
            fabs(value(data, sweep->first, COLUMN_VSB) - value(data, row, COLUMN_VSB)) >
                same_setting) {
            continue;
        }
        for (int k = sweep->first + 1; k < sweep->first + sweep->count; k++) {
            double a = value(data, k - 1, COLUMN_VGS), b = value(data, k, COLUMN_VGS);
            double ia = value(data, k - 1, COLUMN_ID), ib = value(data, k, COLUMN_ID);
            if ((vgs - a) * (vgs - b) > 0 || a == b) {
                continue;
            }
            double share = (vgs - a) / (b - a);
            return ia > noise && ib > noise ? ia * pow(ib / ia, share) : ia + share * (ib - ia);
        }
    }
    return NAN;
}

/* The worst contradiction of a drain sweep: row, or -1. */
static int contradiction(const struct measured *data, const struct measured_sweep *sweep,
                         double noise, double *wanted)
{
    double worst = 0;
    int found = -1;
    for (int k = sweep->first; k < sweep->first + sweep->count; k++) {
        double id = value(data, k, COLUMN_ID), other = from_gate_sweeps(data, k, noise);
        double allowed = sweep_share * fmax(fabs(id), fabs(other)) + sweep_noise * noise;
        if (fabs(id - other) > allowed && fabs(id - other) / allowed > worst) {
            worst = fabs(id - other) / allowed;
            found = k;
            *wanted = other;
        }
    }
    return found;
}

static bool screen_drain_sweep(struct calibration *calibration, int index,
                               struct measured_sweep *sweep)
{
    struct measured *data = &calibration->devices[index].data;
    double other = 0;
    int row = contradiction(data, sweep, calibration->noise, &other);
    if (row < 0) {
        return true;
    }
    sweep->doubt = fabs(value(data, row, COLUMN_ID) - other);
    for (int k = 0; k < sweep->count && calibration->is_robust; k++) {
        data->rows[sweep->first + k].is_left_out = true;
    }
    return calibration_remark(
        calibration, "outlier", index,
        "the drain sweep at vgs = %.4g V, vsb = %.4g V contradicts the gate sweeps: %.3g A against "
        "%.3g A at vds = %.4g V; it is %s",
        value(data, row, COLUMN_VGS), value(data, row, COLUMN_VSB), value(data, row, COLUMN_ID),
        other, value(data, row, COLUMN_VDS),
        calibration->is_robust ? "left out"
                               : "kept with that difference as its error; --robust leaves it out");
}

/* ln id of the reading over a cubic through two neighbours on each side; 0 where that cannot be
 * said. */
static double deviation(const struct measured *data, const struct measured_sweep *sweep, int k,
                        enum column column, double noise)
{
    double y[5], x[5];
    if (k - 2 < sweep->first || k + 2 >= sweep->first + sweep->count) {
        return 0;
    }
    for (int j = 0; j < 5; j++) {
        double current = value(data, k - 2 + j, column);
        if (!(current > reading_noise * noise)) {
            return 0;
        }
        y[j] = log(current);
        x[j] = value(data, k - 2 + j, sweep->moved);
        if (!(fabs(x[j]) > least_voltage)) {
            return 0; /* at 0 V the offset of a supply is read */
        }
    }
    for (int j = 1; j < 5; j++) {
        if (!(fabs(x[j] - x[j - 1] - (x[4] - x[0]) / 4) < 0.01 * fabs(x[4] - x[0]))) {
            return 0; /* steps of different size */
        }
    }
    return y[2] - (-y[0] + 4 * y[1] + 4 * y[3] - y[4]) / 6;
}

bool screen_readings(struct calibration *calibration, int device, enum column column)
{
    struct measured *data = &calibration->devices[device].data;
    double noise = calibration->noise;
    for (int s = 0; s < data->sweep_count; s++) {
        const struct measured_sweep *sweep = &data->sweeps[s];
        for (int k = sweep->first; k < sweep->first + sweep->count; k++) {
            double own = deviation(data, sweep, k, column, noise);
            double before = deviation(data, sweep, k - 1, column, noise);
            double after = deviation(data, sweep, k + 1, column, noise);
            /* one wrong reading shows in its neighbours too, two thirds as large */
            if (!(fabs(own) > reading_difference) ||
                !(fabs(own) > 1.2 * fmax(fabs(before), fabs(after)))) {
                continue;
            }
            data->rows[k].is_left_out = calibration->is_robust;
            int line =
                source_line(&calibration->sources,
                            (struct span){data->file, data->rows[k].begin, data->rows[k].end});
            if (!calibration_remark(
                    calibration, "outlier", device,
                    "line %d: %s = %.4g A stands %+.0f %% out of its sweep; it is "
                    "%s",
                    line, column_rows[column].name, value(data, k, column), 100 * expm1(own),
                    calibration->is_robust ? "left out" : "kept; --robust leaves it out")) {
                return false;
            }
        }
    }
    return true;
}

bool screen_transistor(struct calibration *calibration, int device)
{
    struct measured *data = &calibration->devices[device].data;
    for (int s = 0; s < data->sweep_count; s++) {
        if (data->sweeps[s].moved == COLUMN_VDS &&
            !screen_drain_sweep(calibration, device, &data->sweeps[s])) {
            return false;
        }
    }
    return screen_readings(calibration, device, COLUMN_ID);
}
