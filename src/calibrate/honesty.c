/* honesty.c: what a user must know about the data behind a fit. */
#include "calibrate/honesty.h"

#include <math.h>
#include <string.h>

#include "calibrate/screen.h"

/* A device whose current is off by more is not described. */
static const double poor_fit = 0.05;

/* Sizes further apart than this factor say little about each other. */
static const double near_size = 4;

/* Fewer body voltages do not show how the body effect bends. */
enum { BODIES = 3 };

/* The rms of the readings where the transistor is off: what the noise really is. NAN: none. */
static double off_current(const struct calibrated_device *device)
{
    double sum = 0;
    int count = 0;
    for (int k = 0; k < device->data.row_count; k++) {
        const struct measured_row *row = &device->data.rows[k];
        if (row->value[COLUMN_VGS] < device->facts.threshold - 0.4) {
            sum += row->value[COLUMN_ID] * row->value[COLUMN_ID];
            count++;
        }
    }
    return count > 4 ? sqrt(sum / count) : NAN;
}

static bool transistor_remarks(struct calibration *c, int index)
{
    const struct calibrated_device *device = &c->devices[index];
    int below = 0, bodies = device->facts.body_count;
    double off = off_current(device);
    bool is_good = true;
    for (int k = 0; k < device->data.row_count; k++) {
        below += fabs(device->data.rows[k].value[COLUMN_ID]) < 10 * c->noise ? 1 : 0;
    }
    if (below > 0.4 * device->data.row_count) {
        is_good &= calibration_remark(c, "noise", index,
                                      "%d of %d readings are below ten times the noise of %.2g A",
                                      below, device->data.row_count, c->noise);
    }
    if (off > 2 * c->noise) {
        is_good &=
            calibration_remark(c, "noise", index,
                               "the readings of the transistor off are %.2g A rms, the noise "
                               "was said to be %.2g A (--noise)",
                               off, c->noise);
    }
    if (bodies < BODIES) {
        is_good &= calibration_remark(c, "body", index, "%d body voltage%s: the body effect is %s",
                                      bodies, bodies == 1 ? "" : "s",
                                      bodies == 1 ? "not measured" : "known as a slope only");
    }
    return is_good;
}

/* Whether a set knows devices of about that length that are as wide and as narrow. */
static bool is_within(const struct calibration *c, const struct fit *fit,
                      const struct measured *data)
{
    double least = INFINITY, most = 0;
    for (int k = 0; k < fit->device_count; k++) {
        const struct measured *known = &c->devices[fit->devices[k]].data;
        double ratio = known->length / data->length;
        if (ratio <= near_size && ratio >= 1 / near_size) {
            least = fmin(least, known->width);
            most = fmax(most, known->width);
        }
    }
    return data->width <= near_size * most && data->width >= least / near_size;
}

static bool prediction_remark(struct calibration *c, const struct comparison *it)
{
    const struct fit *fit = &c->fits[it->fit];
    if (!it->is_held || !fit->is_set || is_within(c, fit, &c->devices[it->device].data)) {
        return true;
    }
    return calibration_remark(c, "beyond", it->device,
                              "predicted beyond the sizes that %s was fitted to: no device of "
                              "about this length is about as wide",
                              fit->name);
}

static bool comparison_remarks(struct calibration *c, const struct comparison *it)
{
    double rms = it->figures.id[FIGURES_SATURATION].rms;
    if (it->is_held || !c->fits[it->fit].is_written || !(rms > poor_fit)) {
        return true;
    }
    return calibration_remark(c, "fit", it->device, "%s is %.1f %% off (rms) %s",
                              c->fits[it->fit].name, 100 * rms,
                              isnan(c->devices[it->device].data.length) ? "" : "in saturation");
}

static bool temperature_remarks(struct calibration *c)
{
    double least = INFINITY, most = 0;
    for (int d = 0; d < c->device_count; d++) {
        for (int t = 0; t < c->devices[d].data.kelvin_count; t++) {
            least = fmin(least, c->devices[d].data.kelvins[t]);
            most = fmax(most, c->devices[d].data.kelvins[t]);
        }
    }
    if (c->is_temperature_assumed &&
        !calibration_remark(c, "temperature", -1,
                            "no temperature is given: %.0f C is assumed (--temperature)",
                            c->measured_kelvin - 273.15)) {
        return false;
    }
    return most - least > 10 ||
           calibration_remark(c, "temperature", -1,
                              "one temperature: all temperature terms are the program's defaults; "
                              "nothing is measured away from %.0f C",
                              c->measured_kelvin - 273.15);
}

bool honesty_remarks(struct calibration *calibration)
{
    bool is_good = true;
    for (int k = 0; k < calibration->device_count; k++) {
        const struct calibrated_device *device = &calibration->devices[k];
        if (device->data.unused != NULL) {
            is_good &= calibration_remark(calibration, "column", k, "column '%s' is not used",
                                          device->data.unused);
        }
        if (!isnan(device->data.length)) {
            is_good &= transistor_remarks(calibration, k);
        }
    }
    for (int k = 0; k < calibration->comparison_count; k++) {
        is_good &= comparison_remarks(calibration, &calibration->comparisons[k]);
        is_good &= prediction_remark(calibration, &calibration->comparisons[k]);
    }
    return temperature_remarks(calibration) && is_good;
}
