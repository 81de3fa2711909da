/* trace.c: what a fitted model says to the readings of a device, one value a reading. */
#include <math.h>

#include "calibrate/junction_curve.h"
#include "calibrate/mos_fit.h"
#include "devices/mos_gradient.h"

enum column calibration_current(const struct calibrated_device *device)
{
    return device->data.has_column[COLUMN_ID]   ? COLUMN_ID
           : device->data.has_column[COLUMN_IC] ? COLUMN_IC
                                                : COLUMN_I;
}

static void trace_transistor(const struct calibration *c, const struct calibrated_device *device,
                             const double *model, double offset, double *values)
{
    const struct measured *data = &device->data;
    double own[OWN_VALUE_LIMIT], prepared[PREPARED_SIZE_LIMIT], gradient[MOS_CONSTANTS];
    struct device_values given = {own, model, NULL, 1};
    mos_own(device, offset, own);
    for (int t = 0; t < data->kelvin_count; t++) {
        struct device_conditions conditions = {data->kelvins[t], c->measured_kelvin, EFFECTS_FULL,
                                               0};
        device->type->prepare(&given, &conditions, prepared);
        for (int k = 0; k < data->row_count; k++) {
            const struct measured_row *row = &data->rows[k];
            double vsb = row->value[COLUMN_VSB];
            if (row->kelvin == t) {
                values[k] = mos_gradient(prepared, row->value[COLUMN_VGS], row->value[COLUMN_VDS],
                                         isnan(vsb) ? 0 : vsb, gradient);
            }
        }
    }
}

static void trace_junction(const struct calibration *c, const struct calibrated_device *device,
                           const double *model, double *values)
{
    const struct measured *data = &device->data;
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        long double inner[JUNCTION_TERMINALS], main = 0, base = 0;
        struct junction junction;
        bool is_forced = device->type->terminal_count == 3 && isnan(row->value[COLUMN_VBE]);
        values[k] = NAN;
        if (is_forced && !(row->value[COLUMN_IB] > 0)) {
            continue;
        }
        junction_prepare(&junction, device->type, model, data->multiplicity,
                         data->kelvins[row->kelvin], c->measured_kelvin);
        junction_begin(&junction, row, inner);
        junction_currents(&junction, row, inner, &main, &base);
        values[k] = (double)main;
    }
}

void calibration_trace(const struct calibration *calibration, const struct comparison *comparison,
                       double *values)
{
    const struct calibrated_device *device = &calibration->devices[comparison->device];
    double model[MODEL_VALUE_LIMIT];
    fitting_values(&calibration->fits[comparison->fit], model);
    if (isnan(device->data.length)) {
        trace_junction(calibration, device, model, values);
    } else {
        trace_transistor(calibration, device, model, comparison->offset, values);
    }
}
