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

static const struct device_lanes equations[] = {
    {mos_evaluate,
     REAL_NAME(mos_evaluate),
     2,
     {[MOS_MOVED_VT] = offsetof(struct mos_prepared, vt),
      [MOS_MOVED_BETA] = offsetof(struct mos_prepared, beta)}},
    {bipolar_evaluate,
     REAL_NAME(bipolar_evaluate),
     1,
     {[BIPOLAR_SATURATION] = offsetof(struct bipolar_prepared, saturation)}},
    {resistor_evaluate,
     REAL_NAME(resistor_evaluate),
     1,
     {[RESISTOR_VALUE] = offsetof(struct linear_prepared, value)}},
    {diode_evaluate, REAL_NAME(diode_evaluate), 0, {0}},
    {jfet_evaluate, REAL_NAME(jfet_evaluate), 0, {0}},
    {current_evaluate, REAL_NAME(current_evaluate), 0, {0}},
    {voltage_evaluate, REAL_NAME(voltage_evaluate), 0, {0}},
    {opamp_evaluate, REAL_NAME(opamp_evaluate), 0, {0}},
    {series_evaluate, REAL_NAME(series_evaluate), 0, {0}},
};

const struct device_lanes *REAL_NAME(device)(const struct device_type *type)
{
    for (size_t k = 0; k < sizeof equations / sizeof equations[0]; k++) {
        if (equations[k].single == type->evaluate) {
            return &equations[k];
        }
    }
    return NULL;
}
