/*
 * lanes_table.c: which equations go with which device type, for lanes.
 */
#include "devices/bipolar.h"
#include "devices/device.h"
#include "devices/diode.h"
#include "devices/jfet.h"
#include "devices/linear.h"
#include "devices/mos.h"
#include "devices/opamp.h"
#include "devices/real.h"
#include "devices/series_prepared.h"

static const struct {
    void (*single)(const void *prepared, const double *x, double *f, double *jac);
    lanes_evaluate *lanes;
} equations[] = {
    {mos_evaluate, REAL_NAME(mos_evaluate)},
    {diode_evaluate, REAL_NAME(diode_evaluate)},
    {bipolar_evaluate, REAL_NAME(bipolar_evaluate)},
    {jfet_evaluate, REAL_NAME(jfet_evaluate)},
    {resistor_evaluate, REAL_NAME(resistor_evaluate)},
    {current_evaluate, REAL_NAME(current_evaluate)},
    {voltage_evaluate, REAL_NAME(voltage_evaluate)},
    {opamp_evaluate, REAL_NAME(opamp_evaluate)},
    {series_evaluate, REAL_NAME(series_evaluate)},
};

lanes_evaluate *REAL_NAME(device)(const struct device_type *type)
{
    for (size_t k = 0; k < sizeof equations / sizeof equations[0]; k++) {
        if (equations[k].single == type->evaluate) {
            return equations[k].lanes;
        }
    }
    return NULL;
}
