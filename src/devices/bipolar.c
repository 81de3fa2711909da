/*
 * bipolar.c: tables and preparation of the bipolar transistor. The equations stand in
 * bipolar_current.c.
 */
#include "devices/bipolar.h"

#include <string.h>

#include "devices/junction.h"
#include "devices/types.h"

enum { OWN_AREA, OWN_M, OWN_SATURATION_SHIFT };

static const struct parameter own_parameters[] = {
    [OWN_AREA] = {"area", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                  "emitter area relative to the model's"},
    [OWN_M] = {"m", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true, "equal devices in parallel"},
    [OWN_SATURATION_SHIFT] = {"saturation_shift", UNIT_NONE, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY,
                              false, "relative deviate of the saturation current"},
};

enum {
    MODEL_SATURATION,
    MODEL_BETA,
    MODEL_BETA_REVERSE,
    MODEL_EMISSION,
    MODEL_EMISSION_REVERSE,
    MODEL_EARLY,
    MODEL_EARLY_REVERSE,
    MODEL_KNEE,
    MODEL_KNEE_REVERSE,
    MODEL_LEAK_EMITTER,
    MODEL_LEAK_EMITTER_EMISSION,
    MODEL_LEAK_COLLECTOR,
    MODEL_LEAK_COLLECTOR_EMISSION,
    MODEL_BASE_RESISTANCE,
    MODEL_EMITTER_RESISTANCE,
    MODEL_COLLECTOR_RESISTANCE,
    MODEL_BANDGAP,
    MODEL_SATURATION_EXPONENT,
    MODEL_BETA_EXPONENT,
    MODEL_SATURATION_VOLTAGE,
    MODEL_MATCH_SATURATION
};

static const struct parameter model_parameters[] = {
    [MODEL_SATURATION] = {"saturation_current", UNIT_AMPERE, DEFAULT_VALUE, 1e-15, 0, INFINITY,
                          true, "transport saturation current"},
    [MODEL_BETA] = {"beta", UNIT_NONE, DEFAULT_VALUE, 100, 0, INFINITY, true,
                    "current gain, forward"},
    [MODEL_BETA_REVERSE] = {"beta_reverse", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                            "current gain, reverse"},
    [MODEL_EMISSION] = {"emission", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                        "emission coefficient, forward"},
    [MODEL_EMISSION_REVERSE] = {"emission_reverse", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                                "emission coefficient, reverse"},
    [MODEL_EARLY] = {"early", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true,
                     "Early voltage, forward"},
    [MODEL_EARLY_REVERSE] = {"early_reverse", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true,
                             "Early voltage, reverse"},
    [MODEL_KNEE] = {"knee", UNIT_AMPERE, DEFAULT_NONE, 0, 0, INFINITY, true,
                    "current at which high injection sets in, forward"},
    [MODEL_KNEE_REVERSE] = {"knee_reverse", UNIT_AMPERE, DEFAULT_NONE, 0, 0, INFINITY, true,
                            "current at which high injection sets in, reverse"},
    [MODEL_LEAK_EMITTER] = {"leak_emitter", UNIT_AMPERE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                            "base-emitter leakage saturation current"},
    [MODEL_LEAK_EMITTER_EMISSION] = {"leak_emitter_emission", UNIT_NONE, DEFAULT_VALUE, 1.5, 0,
                                     INFINITY, true, "its emission coefficient"},
    [MODEL_LEAK_COLLECTOR] = {"leak_collector", UNIT_AMPERE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                              "base-collector leakage saturation current"},
    [MODEL_LEAK_COLLECTOR_EMISSION] = {"leak_collector_emission", UNIT_NONE, DEFAULT_VALUE, 2, 0,
                                       INFINITY, true, "its emission coefficient"},
    [MODEL_BASE_RESISTANCE] = {"base_resistance", UNIT_OHM, DEFAULT_VALUE, 0, 0, INFINITY, false,
                               "resistance in series with the base"},
    [MODEL_EMITTER_RESISTANCE] = {"emitter_resistance", UNIT_OHM, DEFAULT_VALUE, 0, 0, INFINITY,
                                  false, "resistance in series with the emitter"},
    [MODEL_COLLECTOR_RESISTANCE] = {"collector_resistance", UNIT_OHM, DEFAULT_VALUE, 0, 0, INFINITY,
                                    false, "resistance in series with the collector"},
    [MODEL_BANDGAP] = {"bandgap", UNIT_VOLT, DEFAULT_VALUE, 1.12, 0, INFINITY, true,
                       "bandgap voltage of the saturation current"},
    [MODEL_SATURATION_EXPONENT] = {"saturation_exponent", UNIT_NONE, DEFAULT_VALUE, 3, -INFINITY,
                                   INFINITY, false,
                                   "power of temperature in the saturation current"},
    [MODEL_BETA_EXPONENT] = {"beta_exponent", UNIT_NONE, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                             false, "power of temperature in the current gains"},
    [MODEL_SATURATION_VOLTAGE] = {"saturation_voltage", UNIT_VOLT, DEFAULT_VALUE, 0.2, -INFINITY,
                                  INFINITY, false, "vce below which headroom is gone"},
    [MODEL_MATCH_SATURATION] = {"match_saturation", UNIT_NONE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                                "relative sigma of the saturation current at area 1"},
};

static const struct terminal terminals[] = {
    {"c", "collector", false, NULL},
    {"b", "base", false, NULL},
    {"e", "emitter", false, NULL},
};

static const struct series_row series[] = {
    {BIPOLAR_B, "base_resistance"},
    {BIPOLAR_E, "emitter_resistance"},
    {BIPOLAR_C, "collector_resistance"},
};

enum {
    ROW_IC,
    ROW_IB,
    ROW_IE,
    ROW_VBE,
    ROW_VCE,
    ROW_BETA,
    ROW_GM,
    ROW_RO,
    ROW_HEADROOM,
    ROW_POWER
};

static const struct quantity_row quantities[] = {
    [ROW_IC] = {"ic", UNIT_AMPERE, "collector current"},
    [ROW_IB] = {"ib", UNIT_AMPERE, "base current"},
    [ROW_IE] = {"ie", UNIT_AMPERE, "emitter current"},
    [ROW_VBE] = {"vbe", UNIT_VOLT, "base-emitter voltage"},
    [ROW_VCE] = {"vce", UNIT_VOLT, "collector-emitter voltage"},
    [ROW_BETA] = {"beta", UNIT_NONE, "collector current over base current"},
    [ROW_GM] = {"gm", UNIT_SIEMENS, "transconductance from the base"},
    [ROW_RO] = {"ro", UNIT_OHM, "output resistance"},
    [ROW_HEADROOM] = {"headroom", UNIT_VOLT, "vce minus the saturation voltage"},
    [ROW_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

static const uint32_t paths[BIPOLAR_TERMINALS] = {1, 1, 1};

static double inverse(double value)
{
    return isnan(value) ? 0 : 1 / value;
}

/* Leakage currents grow as the saturation current with their own emission, over the gain. */
static double leak_growth(const double *model, int emission, double kelvin, double measured)
{
    return junction_growth(kelvin, measured, model[emission], model[MODEL_BANDGAP],
                           model[MODEL_SATURATION_EXPONENT]) *
           pow(kelvin / measured, -model[MODEL_BETA_EXPONENT]);
}

static void prepare_effects(const double *model, unsigned effects, double size, double kelvin,
                            double measured, struct bipolar_prepared *p)
{
    if ((effects & EFFECT_GAIN) != 0) {
        double growth = pow(kelvin / measured, model[MODEL_BETA_EXPONENT]);
        p->per_beta = 1 / (model[MODEL_BETA] * growth);
        p->per_beta_reverse = 1 / (model[MODEL_BETA_REVERSE] * growth);
        p->per_knee = inverse(model[MODEL_KNEE]) / size;
        p->per_knee_reverse = inverse(model[MODEL_KNEE_REVERSE]) / size;
    }
    if ((effects & EFFECT_MODULATION) != 0) {
        p->per_early = inverse(model[MODEL_EARLY]);
        p->per_early_reverse = inverse(model[MODEL_EARLY_REVERSE]);
    }
    if ((effects & EFFECT_LEAKAGE) != 0) {
        p->leak_emitter = size * model[MODEL_LEAK_EMITTER] *
                          leak_growth(model, MODEL_LEAK_EMITTER_EMISSION, kelvin, measured);
        p->leak_collector = size * model[MODEL_LEAK_COLLECTOR] *
                            leak_growth(model, MODEL_LEAK_COLLECTOR_EMISSION, kelvin, measured);
    }
}

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared, double polarity)
{
    struct bipolar_prepared *p = prepared;
    memset(p, 0, sizeof *p);
    const double *model = values->model;
    double kelvin = device_kelvin(conditions);
    double measured = conditions->measured_kelvin;
    double thermal = BOLTZMANN_OVER_CHARGE * kelvin;
    double size = values->own[OWN_AREA] * values->own[OWN_M];
    p->polarity = polarity;
    p->saturation = size * model[MODEL_SATURATION] *
                    junction_growth(kelvin, measured, 1, model[MODEL_BANDGAP],
                                    model[MODEL_SATURATION_EXPONENT]) *
                    device_share(values->own[OWN_SATURATION_SHIFT]);
    p->thermal_f = model[MODEL_EMISSION] * thermal;
    p->thermal_r = model[MODEL_EMISSION_REVERSE] * thermal;
    p->leak_emitter_thermal = model[MODEL_LEAK_EMITTER_EMISSION] * thermal;
    p->leak_collector_thermal = model[MODEL_LEAK_COLLECTOR_EMISSION] * thermal;
    p->saturation_voltage = model[MODEL_SATURATION_VOLTAGE];
    prepare_effects(model, conditions->effects, size, kelvin, measured, p);
}

static void prepare_npn(const struct device_values *values,
                        const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, 1);
}

static void prepare_pnp(const struct device_values *values,
                        const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, -1);
}

/* On: a junction carries a hundred saturation currents (0.12 V at 27 C); at 85 C that is
 * nanoamperes, and a transistor there still works as a current source. */
static unsigned region_of(const struct bipolar_prepared *p, const double *inner, double vce)
{
    double vbe = p->polarity * (inner[BIPOLAR_B] - inner[BIPOLAR_E]);
    double vbc = p->polarity * (inner[BIPOLAR_B] - inner[BIPOLAR_C]);
    double least = log(100);
    if (!(vbe > least * p->thermal_f) && !(vbc > least * p->thermal_r)) {
        return REGION_OFF;
    }
    if (vce < 0) {
        return REGION_ON | REGION_REVERSED;
    }
    return REGION_ON | (vce >= p->saturation_voltage ? REGION_SATURATED : REGION_TRIODE);
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    const struct bipolar_prepared *p = prepared;
    double f[BIPOLAR_TERMINALS], jac[BIPOLAR_TERMINALS * BIPOLAR_TERMINALS];
    bipolar_evaluate(p, inner, f, jac);
    q[ROW_IC] = p->polarity * f[BIPOLAR_C];
    q[ROW_IB] = p->polarity * f[BIPOLAR_B];
    q[ROW_IE] = -p->polarity * f[BIPOLAR_E];
    q[ROW_VBE] = p->polarity * (outer[BIPOLAR_B] - outer[BIPOLAR_E]);
    q[ROW_VCE] = p->polarity * (outer[BIPOLAR_C] - outer[BIPOLAR_E]);
    q[ROW_BETA] = q[ROW_IB] > 0 || q[ROW_IB] < 0 ? q[ROW_IC] / q[ROW_IB] : NAN;
    q[ROW_GM] = jac[BIPOLAR_B];
    double gce = jac[BIPOLAR_C];
    q[ROW_RO] = gce > 0 || gce < 0 ? 1 / gce : NAN;
    q[ROW_HEADROOM] = q[ROW_VCE] - p->saturation_voltage;
    q[ROW_POWER] = 0;
    for (int k = 0; k < BIPOLAR_TERMINALS; k++) {
        q[ROW_POWER] += (outer[k] - outer[BIPOLAR_E]) * f[k];
    }
    return region_of(p, inner, q[ROW_VCE]);
}

static double longest_step(const void *prepared, const double *x, const double *dx)
{
    const struct bipolar_prepared *p = prepared;
    double share = 1;
    static const int ends[] = {BIPOLAR_E, BIPOLAR_C};
    for (int k = 0; k < 2; k++) {
        double thermal = k == 0 ? p->thermal_f : p->thermal_r;
        share = fmin(share, junction_share(p->polarity * (x[BIPOLAR_B] - x[ends[k]]),
                                           p->polarity * (dx[BIPOLAR_B] - dx[ends[k]]),
                                           p->saturation, thermal));
    }
    return share;
}

/* The base-emitter voltage at 1 uA. */
static bool typical(const void *prepared, int *high, int *low, double *volts)
{
    const struct bipolar_prepared *p = prepared;
    *high = p->polarity > 0 ? BIPOLAR_B : BIPOLAR_E;
    *low = p->polarity > 0 ? BIPOLAR_E : BIPOLAR_B;
    *volts = junction_voltage(1e-6, p->saturation, p->thermal_f);
    return true;
}

static double saturation_sigma(const struct device_values *values)
{
    return values->model[MODEL_MATCH_SATURATION] / sqrt(values->own[OWN_AREA] * values->own[OWN_M]);
}

static const struct deviate deviates[] = {
    [BIPOLAR_SATURATION] = {"saturation current", OWN_SATURATION_SHIFT, saturation_sigma,
                            DEVIATE_SCALES, offsetof(struct bipolar_prepared, saturation)},
};

#define BIPOLAR_COMMON                                                                             \
    .form = FORM_PINS, .is_transistor = true, .terminals = terminals,                              \
    .terminal_count = BIPOLAR_TERMINALS, .parameters = own_parameters,                             \
    .parameter_count = ROWS(own_parameters), .value_parameter = -1,                                \
    .model_parameters = model_parameters, .model_parameter_count = ROWS(model_parameters),         \
    .model_optional = true, .series = series, .series_count = ROWS(series),                        \
    .quantities = quantities, .quantity_count = ROWS(quantities), .quantity_current = ROW_IC,      \
    .quantity_headroom = ROW_HEADROOM, .quantity_power = ROW_POWER, .deviates = deviates,          \
    .deviate_count = ROWS(deviates), .prepared_size = sizeof(struct bipolar_prepared),             \
    .evaluate = bipolar_evaluate, .evaluate_extended = bipolar_evaluate_extended,                  \
    .describe = describe, .longest_step = longest_step, .typical = typical, .paths = paths

const struct device_type device_npn = {
    BIPOLAR_COMMON, .word = "npn",       .summary = "npn bipolar transistor",
    .polarity = 1,  .model_kind = "npn", .prepare = prepare_npn,
};

const struct device_type device_pnp = {
    BIPOLAR_COMMON, .word = "pnp",       .summary = "pnp bipolar transistor",
    .polarity = -1, .model_kind = "pnp", .prepare = prepare_pnp,
};
