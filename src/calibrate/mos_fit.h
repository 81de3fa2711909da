/*
 * mos_fit.h: fits of a MOS model to measured drain currents. Private to calibrate/.
 */
#ifndef CALIBRATE_MOS_FIT_H
#define CALIBRATE_MOS_FIT_H

#include "calibrate/fitting.h"

extern const struct sought mos_sought[];
extern const int mos_sought_count;

/* A value of a set that stays near a usual one where the data leave it open. */
struct usual {
    const char *name;
    double value, spread; /* spread of the logarithm where logarithmic */
    bool logarithmic;
};

extern const struct usual mos_usual[];
extern const int mos_usual_count;

/* The facts of one device; false when its readings do not cross the threshold, or memory is
 * short. */
bool mos_find_facts(struct arena *arena, const struct measured *data,
                    const struct device_type *type, struct mos_facts *facts);

/* Threshold at a body voltage, between the ones measured. */
double mos_threshold_at(const struct mos_facts *facts, double vsb);

/*
 * mos_fit: one model over devices list[count] of the calibration.
 *
 * fit  in: name, type, is_set; out: the rest
 *
 * The devices have their facts. Returns STATUS_OK, STATUS_MEMORY or STATUS_STOPPED.
 */
enum status mos_fit(struct calibration *calibration, const struct calibration_request *request,
                    const int *list, int count, struct fit *fit);

/* Errors of model values on one device. */
void mos_compare(const struct calibration *calibration, const struct calibrated_device *device,
                 const double *model, double offset, struct device_figures *figures);

/* Error along the gate sweep with the most drain voltage; false when memory is short. */
bool mos_error_curve(const struct calibration *calibration, const struct calibrated_device *device,
                     const double *model, double offset, struct error_curve *curve);

/* Instance parameters of a device; W, L, m, the threshold offset. */
void mos_own(const struct calibrated_device *device, double offset, double *own);

#endif
