/* mos_figures.c: how far a MOS model is from the readings of a device. */
#include <math.h>
#include <string.h>

#include "calibrate/mos_fit.h"
#include "devices/mos_gradient.h"

/* Saturation: beyond this drain voltage, this far above the constant-current threshold, and more
 * than this current, ten times the usual noise. */
static const double saturation_drain = 0.4, above_threshold = 0.05; /* V */
static const double least_current = 20e-9;                          /* A */

/* A slope counts when its own standard error is below this share of it. */
static const double slope_error = 0.15;

enum { SLOPE_POINTS = 6 }; /* fewest readings of a slope */

struct judge {
    const struct calibration *calibration;
    const struct calibrated_device *device;
    double prepared[PREPARED_SIZE_LIMIT];
    int kelvin; /* the block is prepared for it; -1: for none */
    const double *model;
    double offset;
};

static void prepare(struct judge *judge, int kelvin)
{
    const struct calibrated_device *device = judge->device;
    double own[OWN_VALUE_LIMIT];
    if (judge->kelvin == kelvin) {
        return;
    }
    mos_own(device, judge->offset, own);
    struct device_values values = {own, judge->model, NULL, 1};
    struct device_conditions conditions = {device->data.kelvins[kelvin],
                                           judge->calibration->measured_kelvin, EFFECTS_FULL, 0};
    device->type->prepare(&values, &conditions, judge->prepared);
    judge->kelvin = kelvin;
}

static double body_of(const struct measured_row *row)
{
    return isnan(row->value[COLUMN_VSB]) ? 0 : row->value[COLUMN_VSB];
}

static double current(struct judge *judge, const struct measured_row *row)
{
    double gradient[MOS_CONSTANTS];
    prepare(judge, row->kelvin);
    return mos_gradient(judge->prepared, row->value[COLUMN_VGS], row->value[COLUMN_VDS],
                        body_of(row), gradient);
}

static bool is_above(const struct judge *judge, const struct measured_row *row)
{
    return row->value[COLUMN_VGS] >
           mos_threshold_at(&judge->device->facts, body_of(row)) + above_threshold;
}

static bool counts(const struct measured_row *row)
{
    return !row->is_left_out && row->value[COLUMN_ID] > least_current &&
           row->value[COLUMN_VDS] > 1e-3;
}

static void judge_currents(struct judge *judge, struct device_figures *figures)
{
    const struct measured *data = &judge->device->data;
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        if (!counts(row)) {
            continue;
        }
        enum region_of_figures region = !is_above(judge, row) ? FIGURES_WEAK
                                        : row->value[COLUMN_VDS] > saturation_drain
                                            ? FIGURES_SATURATION
                                            : FIGURES_TRIODE;
        misfit_add(&figures->id[region], current(judge, row) / row->value[COLUMN_ID] - 1);
    }
}

/* Transconductance between the neighbours of a reading, from both the same way. */
static void judge_gate_sweep(struct judge *judge, const struct measured_sweep *sweep,
                             struct misfit *figure)
{
    const struct measured_row *rows = judge->device->data.rows + sweep->first;
    for (int k = 1; k + 1 < sweep->count; k++) {
        if (!counts(&rows[k]) || !is_above(judge, &rows[k]) || rows[k - 1].is_left_out ||
            rows[k + 1].is_left_out || !(rows[k].value[COLUMN_VDS] > saturation_drain)) {
            continue;
        }
        double measured = rows[k + 1].value[COLUMN_ID] - rows[k - 1].value[COLUMN_ID];
        double found = current(judge, &rows[k + 1]) - current(judge, &rows[k - 1]);
        if (measured > 0) {
            misfit_add(figure, found / measured - 1);
        }
    }
}

static bool is_saturated(struct judge *judge, const struct measured_row *row)
{
    const struct device_type *type = judge->device->type;
    double q[32], polarity = type->polarity, body = body_of(row);
    double x[4] = {polarity * (row->value[COLUMN_VDS] + body),
                   polarity * (row->value[COLUMN_VGS] + body), polarity * body, 0};
    prepare(judge, row->kelvin);
    return (type->describe(judge->prepared, x, x, q) & REGION_SATURATED) != 0;
}

/* Slope of the saturated part of a drain sweep: a straight line through the readings and one
 * through the model at the same voltages. */
static void judge_drain_sweep(struct judge *judge, const struct measured_sweep *sweep,
                              struct misfit *figure)
{
    const struct measured_row *rows = judge->device->data.rows + sweep->first;
    double n = 0, sx = 0, sxx = 0, sy = 0, sxy = 0, syy = 0, sm = 0, sxm = 0;
    for (int k = 0; k < sweep->count; k++) {
        if (!counts(&rows[k]) || !is_above(judge, &rows[k]) ||
            !(rows[k].value[COLUMN_VDS] > saturation_drain) || !is_saturated(judge, &rows[k])) {
            continue;
        }
        double x = rows[k].value[COLUMN_VDS], y = rows[k].value[COLUMN_ID];
        double m = current(judge, &rows[k]);
        n += 1;
        sx += x;
        sy += y;
        sxx += x * x;
        sxy += x * y;
        syy += y * y;
        sm += m;
        sxm += x * m;
    }
    if (n < SLOPE_POINTS) {
        return;
    }
    double spread = sxx - sx * sx / n;
    double slope = (sxy - sx * sy / n) / spread, found = (sxm - sx * sm / n) / spread;
    double rest = fmax(syy - sy * sy / n - slope * slope * spread, 0);
    double error = sqrt(rest / (n - 2) / spread);
    if (slope > 0 && error < slope_error * slope) {
        misfit_add(figure, found / slope - 1);
    }
}

void mos_compare(const struct calibration *calibration, const struct calibrated_device *device,
                 const double *model, double offset, struct device_figures *figures)
{
    struct judge judge = {.calibration = calibration,
                          .device = device,
                          .kelvin = -1,
                          .model = model,
                          .offset = offset};
    memset(figures, 0, sizeof *figures);
    judge_currents(&judge, figures);
    for (int s = 0; s < device->data.sweep_count; s++) {
        const struct measured_sweep *sweep = &device->data.sweeps[s];
        if (sweep->moved == COLUMN_VGS) {
            judge_gate_sweep(&judge, sweep, &figures->gm);
        } else if (sweep->moved == COLUMN_VDS) {
            judge_drain_sweep(&judge, sweep, &figures->gds);
        }
    }
    for (int k = 0; k < FIGURES_REGIONS; k++) {
        misfit_finish(&figures->id[k]);
    }
    misfit_finish(&figures->gm);
    misfit_finish(&figures->gds);
    misfit_finish(&figures->ib);
}

/* The gate sweep with the most drain voltage, then the least body voltage; NULL: none. */
static const struct measured_sweep *chart_sweep(const struct measured *data)
{
    const struct measured_sweep *found = NULL;
    for (int s = 0; s < data->sweep_count; s++) {
        const struct measured_sweep *sweep = &data->sweeps[s];
        const struct measured_row *row = &data->rows[sweep->first];
        const struct measured_row *known = found == NULL ? NULL : &data->rows[found->first];
        if (sweep->moved != COLUMN_VGS || sweep->count < 3) {
            continue;
        }
        if (known == NULL || row->value[COLUMN_VDS] > known->value[COLUMN_VDS] ||
            (row->value[COLUMN_VDS] >= known->value[COLUMN_VDS] && body_of(row) < body_of(known))) {
            found = sweep;
        }
    }
    return found;
}

bool mos_error_curve(const struct calibration *calibration, const struct calibrated_device *device,
                     const double *model, double offset, struct error_curve *curve)
{
    struct judge judge = {.calibration = calibration,
                          .device = device,
                          .kelvin = -1,
                          .model = model,
                          .offset = offset};
    const struct measured_sweep *sweep = chart_sweep(&device->data);
    *curve = (struct error_curve){.voltage = column_rows[COLUMN_VGS].name};
    if (sweep == NULL) {
        return true;
    }
    curve->x = arena_new_array(calibration->arena, double, sweep->count);
    curve->y = arena_new_array(calibration->arena, double, sweep->count);
    if (curve->x == NULL || curve->y == NULL) {
        return false;
    }
    const struct measured_row *rows = device->data.rows + sweep->first;
    bool is_falling = rows[sweep->count - 1].value[COLUMN_VGS] < rows[0].value[COLUMN_VGS];
    for (int k = 0; k < sweep->count; k++) {
        const struct measured_row *row = &rows[is_falling ? sweep->count - 1 - k : k];
        if (!counts(row)) {
            continue;
        }
        curve->x[curve->count] = row->value[COLUMN_VGS];
        curve->y[curve->count++] = current(&judge, row) / row->value[COLUMN_ID] - 1;
    }
    return true;
}
