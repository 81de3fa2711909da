/*
 * diode.c: tables and preparation of the diode. The equation stands in diode_current.c.
 */
#include "devices/diode.h"

#include "devices/junction.h"
#include "devices/types.h"

enum { OWN_AREA, OWN_M };

static const struct parameter own_parameters[] = {
    [OWN_AREA] = {"area", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                  "area relative to the model's"},
    [OWN_M] = {"m", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true, "equal devices in parallel"},
};

enum {
    MODEL_SATURATION,
    MODEL_EMISSION,
    MODEL_SERIES_RESISTANCE,
    MODEL_BREAKDOWN_VOLTAGE,
    MODEL_BREAKDOWN_CURRENT,
    MODEL_BREAKDOWN_EMISSION,
    MODEL_BREAKDOWN_TEMPCO,
    MODEL_BANDGAP,
    MODEL_SATURATION_EXPONENT
};

static const struct parameter model_parameters[] = {
    [MODEL_SATURATION] = {"saturation_current", UNIT_AMPERE, DEFAULT_VALUE, 10e-15, 0, INFINITY,
                          true, "saturation current"},
    [MODEL_EMISSION] = {"emission", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                        "emission coefficient"},
    [MODEL_SERIES_RESISTANCE] = {"series_resistance", UNIT_OHM, DEFAULT_VALUE, 0, 0, INFINITY,
                                 false, "series resistance"},
    [MODEL_BREAKDOWN_VOLTAGE] = {"breakdown_voltage", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true,
                                 "reverse voltage at breakdown_current"},
    [MODEL_BREAKDOWN_CURRENT] = {"breakdown_current", UNIT_AMPERE, DEFAULT_VALUE, 1e-3, 0, INFINITY,
                                 true, "reverse current at breakdown_voltage"},
    [MODEL_BREAKDOWN_EMISSION] = {"breakdown_emission", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY,
                                  true, "sharpness of the breakdown"},
    [MODEL_BREAKDOWN_TEMPCO] = {"breakdown_tempco", UNIT_PER_KELVIN, DEFAULT_VALUE, 0, -INFINITY,
                                INFINITY, false, "relative change of breakdown_voltage per kelvin"},
    [MODEL_BANDGAP] = {"bandgap", UNIT_VOLT, DEFAULT_VALUE, 1.12, 0, INFINITY, true,
                       "bandgap voltage of the saturation current"},
    [MODEL_SATURATION_EXPONENT] = {"saturation_exponent", UNIT_NONE, DEFAULT_VALUE, 3, -INFINITY,
                                   INFINITY, false,
                                   "power of temperature in the saturation current"},
};

static const struct terminal terminals[] = {
    {"a", "anode", false, NULL},
    {"k", "cathode", false, NULL},
};

static const struct series_row series[] = {{DIODE_A, "series_resistance"}};

enum { ROW_I, ROW_V, ROW_POWER };

static const struct quantity_row quantities[] = {
    [ROW_I] = {"i", UNIT_AMPERE, "current from anode to cathode"},
    [ROW_V] = {"v", UNIT_VOLT, "voltage from anode to cathode"},
    [ROW_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

static const uint32_t paths[DIODE_TERMINALS] = {1, 1};

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct diode_prepared *p = prepared;
    const double *model = values->model;
    double kelvin = device_kelvin(conditions);
    double measured = conditions->measured_kelvin;
    double thermal = BOLTZMANN_OVER_CHARGE * kelvin;
    double size = values->own[OWN_AREA] * values->own[OWN_M];
    p->saturation = size * model[MODEL_SATURATION] *
                    junction_growth(kelvin, measured, model[MODEL_EMISSION], model[MODEL_BANDGAP],
                                    model[MODEL_SATURATION_EXPONENT]);
    p->thermal = model[MODEL_EMISSION] * thermal;
    p->breakdown = 0;
    p->breakdown_voltage = 0;
    p->breakdown_thermal = model[MODEL_BREAKDOWN_EMISSION] * thermal;
    if (!isnan(model[MODEL_BREAKDOWN_VOLTAGE])) {
        p->breakdown = size * model[MODEL_BREAKDOWN_CURRENT];
        p->breakdown_voltage = model[MODEL_BREAKDOWN_VOLTAGE] *
                               (1 + model[MODEL_BREAKDOWN_TEMPCO] * (kelvin - measured));
    }
}

/* On: a thousand saturation currents forwards; breakdown: as many backwards. */
static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    const struct diode_prepared *p = prepared;
    double f[DIODE_TERMINALS], jac[DIODE_TERMINALS * DIODE_TERMINALS];
    diode_evaluate(p, inner, f, jac);
    q[ROW_I] = f[DIODE_A];
    q[ROW_V] = outer[DIODE_A] - outer[DIODE_K];
    q[ROW_POWER] = q[ROW_V] * q[ROW_I];
    if (q[ROW_I] > 1e3 * p->saturation) {
        return REGION_ON;
    }
    return q[ROW_I] < -1e3 * p->saturation ? REGION_BREAKDOWN : REGION_OFF;
}

static double longest_step(const void *prepared, const double *x, const double *dx)
{
    const struct diode_prepared *p = prepared;
    double v = x[DIODE_A] - x[DIODE_K], dv = dx[DIODE_A] - dx[DIODE_K];
    double share = junction_share(v, dv, p->saturation, p->thermal);
    if (p->breakdown > 0) { /* the breakdown is a junction seen from the other side */
        share = fmin(share, junction_share(-v - p->breakdown_voltage, -dv, p->breakdown,
                                           p->breakdown_thermal));
    }
    return share;
}

/* The forward voltage at 1 uA. A Zener works backwards: no guess. */
static bool typical(const void *prepared, int *high, int *low, double *volts)
{
    const struct diode_prepared *p = prepared;
    /* A Zener diode is there for its breakdown. */
    const bool reversed = p->breakdown > 0;
    *high = reversed ? DIODE_K : DIODE_A;
    *low = reversed ? DIODE_A : DIODE_K;
    *volts = reversed ? p->breakdown_voltage : junction_voltage(1e-6, p->saturation, p->thermal);
    return true;
}

const struct device_type device_diode = {
    .word = "diode",
    .summary = "junction diode; a Zener diode by its breakdown voltage",
    .form = FORM_ARROW,
    .terminals = terminals,
    .terminal_count = DIODE_TERMINALS,
    .parameters = own_parameters,
    .parameter_count = ROWS(own_parameters),
    .value_parameter = -1,
    .model_kind = "diode",
    .model_parameters = model_parameters,
    .model_parameter_count = ROWS(model_parameters),
    .model_optional = true,
    .series = series,
    .series_count = ROWS(series),
    .quantities = quantities,
    .quantity_count = ROWS(quantities),
    .quantity_current = ROW_I,
    .quantity_headroom = -1,
    .quantity_power = ROW_POWER,
    .prepared_size = sizeof(struct diode_prepared),
    .prepare = prepare,
    .evaluate = diode_evaluate,
    .evaluate_extended = diode_evaluate_extended,
    .describe = describe,
    .longest_step = longest_step,
    .typical = typical,
    .paths = paths,
};
