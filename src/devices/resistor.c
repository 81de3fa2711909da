/*
 * resistor.c: table and preparation of the resistor.
 */
#include "devices/resistor.h"

#include "devices/linear.h"
#include "devices/types.h"

enum { OWN_RESISTANCE, OWN_TEMPCO, OWN_TEMPCO2, OWN_TOL, OWN_MATCH, OWN_VALUE_SHIFT };

static const struct parameter own_parameters[] = {
    /* a nanoohm is less than any joint has */
    [OWN_RESISTANCE] = {"resistance", UNIT_OHM, DEFAULT_REQUIRED, 0, 1e-9, INFINITY, false,
                        "resistance"},
    [OWN_TEMPCO] = {"tempco", UNIT_PER_KELVIN, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                    "relative change per kelvin"},
    [OWN_TEMPCO2] = {"tempco2", UNIT_PER_KELVIN_SQUARED, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                     false, "relative change per kelvin squared"},
    [OWN_TOL] = {"tol", UNIT_NONE, DEFAULT_VALUE, 0, 0, 1, false,
                 "largest relative deviation of the value"},
    [OWN_MATCH] = {"match", UNIT_NONE, DEFAULT_VALUE, 0, 0, 1, false,
                   "relative sigma against like resistors"},
    [OWN_VALUE_SHIFT] = {"value_shift", UNIT_NONE, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY, false,
                         "relative deviate of the value"},
};

static const struct terminal terminals[] = {
    {"a", "where the current enters", false, NULL},
    {"b", "where the current leaves", false, NULL},
};

enum { ROW_I, ROW_V, ROW_POWER };

static const struct quantity_row quantities[] = {
    [ROW_I] = {"i", UNIT_AMPERE, "current in the direction of the arrow"},
    [ROW_V] = {"v", UNIT_VOLT, "voltage along the arrow"},
    [ROW_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

static const uint32_t paths[LINEAR_TERMINALS] = {1, 1};

double resistor_at(const struct device_values *values, const struct device_conditions *conditions)
{
    const double *own = values->own;
    double rise = device_kelvin(conditions) - conditions->measured_kelvin;
    return own[OWN_RESISTANCE] * (1 + own[OWN_VALUE_SHIFT]) * values->resistor_factor *
           (1 + rise * (own[OWN_TEMPCO] + rise * own[OWN_TEMPCO2]));
}

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct linear_prepared *p = prepared;
    p->value = fmax(resistor_at(values, conditions), 1e-6 * values->own[OWN_RESISTANCE]);
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    const struct linear_prepared *p = prepared;
    q[ROW_I] = (inner[LINEAR_A] - inner[LINEAR_B]) / p->value;
    q[ROW_V] = outer[LINEAR_A] - outer[LINEAR_B];
    q[ROW_POWER] = q[ROW_V] * q[ROW_I];
    return REGION_NONE;
}

static double value_sigma(const struct device_values *values)
{
    return values->own[OWN_MATCH];
}

static const struct deviate deviates[] = {
    [RESISTOR_VALUE] = {"value", OWN_VALUE_SHIFT, value_sigma, DEVIATE_SCALES,
                        offsetof(struct linear_prepared, value)},
};

/* Values anywhere within the tolerance are equally likely: sigma is the half width over sqrt(3). */
static double tolerance_sigma(const struct device_values *values)
{
    return values->own[OWN_TOL] / sqrt(3);
}

static const struct deviate tolerance = {"tolerance", OWN_VALUE_SHIFT, tolerance_sigma,
                                         DEVIATE_SCALES, offsetof(struct linear_prepared, value)};

const struct device_type device_resistor = {
    .word = "resistor",
    .summary = "resistor",
    .form = FORM_ARROW,
    .is_resistor = true,
    .terminals = terminals,
    .terminal_count = LINEAR_TERMINALS,
    .parameters = own_parameters,
    .parameter_count = ROWS(own_parameters),
    .value_parameter = OWN_RESISTANCE,
    .quantities = quantities,
    .quantity_count = ROWS(quantities),
    .quantity_current = ROW_I,
    .quantity_headroom = -1,
    .quantity_power = ROW_POWER,
    .deviates = deviates,
    .deviate_count = ROWS(deviates),
    .tolerance = &tolerance,
    .prepared_size = sizeof(struct linear_prepared),
    .prepare = prepare,
    .evaluate = resistor_evaluate,
    .evaluate_extended = resistor_evaluate_extended,
    .describe = describe,
    .paths = paths,
};
