/*
 * types.h: the tables of all devices, and the dimensions that their rows use. Private to devices/.
 */
#ifndef DEVICES_TYPES_H
#define DEVICES_TYPES_H

#include "devices/device.h"

/* Dimensions as initialisers (exponents of volt, ampere, kelvin, metre in twelfths). */
#define UNIT_NONE                                                                                  \
    {                                                                                              \
        0, 0, 0, 0                                                                                 \
    }
#define UNIT_VOLT                                                                                  \
    {                                                                                              \
        12, 0, 0, 0                                                                                \
    }
#define UNIT_AMPERE                                                                                \
    {                                                                                              \
        0, 12, 0, 0                                                                                \
    }
#define UNIT_WATT                                                                                  \
    {                                                                                              \
        12, 12, 0, 0                                                                               \
    }
#define UNIT_OHM                                                                                   \
    {                                                                                              \
        12, -12, 0, 0                                                                              \
    }
#define UNIT_SIEMENS                                                                               \
    {                                                                                              \
        -12, 12, 0, 0                                                                              \
    }
#define UNIT_METRE                                                                                 \
    {                                                                                              \
        0, 0, 0, 12                                                                                \
    }
#define UNIT_PER_VOLT                                                                              \
    {                                                                                              \
        -12, 0, 0, 0                                                                               \
    }
#define UNIT_PER_KELVIN                                                                            \
    {                                                                                              \
        0, 0, -12, 0                                                                               \
    }
#define UNIT_PER_KELVIN_SQUARED                                                                    \
    {                                                                                              \
        0, 0, -24, 0                                                                               \
    }
#define UNIT_VOLT_PER_KELVIN                                                                       \
    {                                                                                              \
        12, 0, -12, 0                                                                              \
    }
#define UNIT_ROOT_VOLT                                                                             \
    {                                                                                              \
        6, 0, 0, 0                                                                                 \
    }
#define UNIT_AMPERE_PER_VOLT_SQUARED                                                               \
    {                                                                                              \
        -24, 12, 0, 0                                                                              \
    }
#define UNIT_VOLT_PER_METRE                                                                        \
    {                                                                                              \
        12, 0, 0, -12                                                                              \
    }
#define UNIT_AMPERE_PER_METRE                                                                      \
    {                                                                                              \
        0, 12, 0, -12                                                                              \
    }
#define UNIT_VOLT_METRE                                                                            \
    {                                                                                              \
        12, 0, 0, 12                                                                               \
    }

#define ROWS(table) ((int)(sizeof(table) / sizeof((table)[0])))

extern const struct device_type device_resistor, device_current, device_voltage, device_diode;
extern const struct device_type device_nmos, device_pmos, device_nmos_hand, device_pmos_hand;
extern const struct device_type device_npn, device_pnp, device_njfet, device_pjfet;
extern const struct device_type device_opamp, device_law, device_table;

/* The temperature at which a device is evaluated, K. */
static inline double device_kelvin(const struct device_conditions *conditions)
{
    return (conditions->effects & EFFECT_TEMPERATURE) != 0 ? conditions->kelvin
                                                           : conditions->measured_kelvin;
}

/* 1 + a relative deviate, kept positive: a sample far out in the tail must not turn a device
 * round. */
static inline double device_share(double shift)
{
    return fmax(1 + shift, 1e-3);
}

#endif
