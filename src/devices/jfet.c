/*
 * jfet.c: tables and preparation of the junction field-effect transistor. The equations stand in
 * jfet_current.c.
 */
#include "devices/jfet.h"

#include "devices/junction.h"
#include "devices/types.h"

enum { OWN_AREA, OWN_M };

static const struct parameter own_parameters[] = {
    [OWN_AREA] = {"area", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                  "area relative to the model's"},
    [OWN_M] = {"m", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true, "equal devices in parallel"},
};

enum {
    MODEL_IDSS,
    MODEL_PINCHOFF,
    MODEL_EARLY,
    MODEL_SATURATION,
    MODEL_EMISSION,
    MODEL_IDSS_TEMPCO,
    MODEL_PINCHOFF_TEMPCO
};

static const struct parameter model_parameters[] = {
    [MODEL_IDSS] = {"idss", UNIT_AMPERE, DEFAULT_REQUIRED, 0, 0, INFINITY, true,
                    "saturated drain current at vgs = 0"},
    [MODEL_PINCHOFF] = {"pinchoff", UNIT_VOLT, DEFAULT_REQUIRED, 0, -INFINITY, INFINITY, false,
                        "pinch-off voltage: negative for njfet, positive for pjfet"},
    [MODEL_EARLY] = {"early", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true, "Early voltage"},
    [MODEL_SATURATION] = {"saturation_current", UNIT_AMPERE, DEFAULT_VALUE, 10e-15, 0, INFINITY,
                          false, "saturation current of each gate junction"},
    [MODEL_EMISSION] = {"emission", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                        "emission coefficient of the gate junctions"},
    [MODEL_IDSS_TEMPCO] = {"idss_tempco", UNIT_PER_KELVIN, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                           false, "relative change of idss per kelvin"},
    [MODEL_PINCHOFF_TEMPCO] = {"pinchoff_tempco", UNIT_VOLT_PER_KELVIN, DEFAULT_VALUE, 0, -INFINITY,
                               INFINITY, false, "change of pinchoff per kelvin"},
};

static const struct terminal terminals[] = {
    {"d", "drain", false, NULL},
    {"g", "gate", false, NULL},
    {"s", "source", false, NULL},
};

enum { ROW_ID, ROW_VGS, ROW_VDS, ROW_HEADROOM, ROW_GM, ROW_GDS, ROW_RO, ROW_POWER };

static const struct quantity_row quantities[] = {
    [ROW_ID] = {"id", UNIT_AMPERE, "drain current"},
    [ROW_VGS] = {"vgs", UNIT_VOLT, "gate-source voltage"},
    [ROW_VDS] = {"vds", UNIT_VOLT, "drain-source voltage"},
    [ROW_HEADROOM] = {"headroom", UNIT_VOLT, "vds minus (vgs minus pinchoff)"},
    [ROW_GM] = {"gm", UNIT_SIEMENS, "transconductance from the gate"},
    [ROW_GDS] = {"gds", UNIT_SIEMENS, "output conductance"},
    [ROW_RO] = {"ro", UNIT_OHM, "output resistance, 1/gds"},
    [ROW_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

static const uint32_t paths[JFET_TERMINALS] = {1, 1, 1};

static const char *check_n(const struct device_values *values)
{
    return values->model[MODEL_PINCHOFF] < 0 ? NULL : "pinchoff of an njfet must be negative";
}

static const char *check_p(const struct device_values *values)
{
    return values->model[MODEL_PINCHOFF] > 0 ? NULL : "pinchoff of a pjfet must be positive";
}

/* The straight temperature laws end where they would turn the device round: at a thousandth of
 * idss and of pinchoff. */
static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared, double polarity)
{
    struct jfet_prepared *p = prepared;
    const double *model = values->model;
    double kelvin = device_kelvin(conditions);
    double measured = conditions->measured_kelvin;
    double size = values->own[OWN_AREA] * values->own[OWN_M];
    double idss =
        size * model[MODEL_IDSS] * device_share(model[MODEL_IDSS_TEMPCO] * (kelvin - measured));
    double pinchoff = polarity * model[MODEL_PINCHOFF];
    p->polarity = polarity;
    p->pinchoff = fmin(1e-3 * pinchoff,
                       pinchoff + polarity * model[MODEL_PINCHOFF_TEMPCO] * (kelvin - measured));
    p->B = idss / (p->pinchoff * p->pinchoff);
    bool modulated = (conditions->effects & EFFECT_MODULATION) != 0 && !isnan(model[MODEL_EARLY]);
    p->per_early = modulated ? 1 / model[MODEL_EARLY] : 0;
    p->gate_thermal = model[MODEL_EMISSION] * BOLTZMANN_OVER_CHARGE * kelvin;
    p->gate_current = 0;
    if ((conditions->effects & EFFECT_LEAKAGE) != 0) {
        p->gate_current = size * model[MODEL_SATURATION] *
                          junction_growth(kelvin, measured, model[MODEL_EMISSION], 1.12, 3);
    }
}

static void prepare_n(const struct device_values *values,
                      const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, 1);
}

static void prepare_p(const struct device_values *values,
                      const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, -1);
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    const struct jfet_prepared *p = prepared;
    double f[JFET_TERMINALS], jac[JFET_TERMINALS * JFET_TERMINALS];
    jfet_evaluate(p, inner, f, jac);
    q[ROW_ID] = p->polarity * f[JFET_D];
    q[ROW_VGS] = p->polarity * (outer[JFET_G] - outer[JFET_S]);
    q[ROW_VDS] = p->polarity * (outer[JFET_D] - outer[JFET_S]);
    q[ROW_HEADROOM] = q[ROW_VDS] - (q[ROW_VGS] - p->pinchoff);
    q[ROW_GM] = jac[JFET_TERMINALS * JFET_D + JFET_G];
    q[ROW_GDS] = jac[JFET_TERMINALS * JFET_D + JFET_D];
    q[ROW_RO] = q[ROW_GDS] > 0 || q[ROW_GDS] < 0 ? 1 / q[ROW_GDS] : NAN;
    q[ROW_POWER] = 0;
    for (int k = 0; k < JFET_TERMINALS; k++) {
        q[ROW_POWER] += (outer[k] - outer[JFET_S]) * f[k];
    }
    double end = q[ROW_VDS] < 0 ? q[ROW_VGS] - q[ROW_VDS] : q[ROW_VGS];
    if (!(end > p->pinchoff)) {
        return REGION_OFF;
    }
    if (q[ROW_VDS] < 0) {
        return REGION_ON | REGION_REVERSED;
    }
    return REGION_ON | (q[ROW_HEADROOM] >= 0 ? REGION_SATURATED : REGION_TRIODE);
}

static double longest_step(const void *prepared, const double *x, const double *dx)
{
    const struct jfet_prepared *p = prepared;
    double share = 1;
    for (int end = JFET_D; end <= JFET_S && p->gate_current > 0; end += JFET_S - JFET_D) {
        share = fmin(share, junction_share(p->polarity * (x[JFET_G] - x[end]),
                                           p->polarity * (dx[JFET_G] - dx[end]), p->gate_current,
                                           p->gate_thermal));
    }
    return share;
}

/* vgs at 0.4 of the pinch-off voltage, that is 0.36 of idss. */
static bool typical(const void *prepared, int *high, int *low, double *volts)
{
    const struct jfet_prepared *p = prepared;
    *high = p->polarity > 0 ? JFET_S : JFET_G;
    *low = p->polarity > 0 ? JFET_G : JFET_S;
    *volts = -0.4 * p->pinchoff;
    return true;
}

#define JFET_COMMON                                                                                \
    .form = FORM_PINS, .is_transistor = true, .terminals = terminals,                              \
    .terminal_count = JFET_TERMINALS, .parameters = own_parameters,                                \
    .parameter_count = ROWS(own_parameters), .value_parameter = -1,                                \
    .model_parameters = model_parameters, .model_parameter_count = ROWS(model_parameters),         \
    .quantities = quantities, .quantity_count = ROWS(quantities), .quantity_current = ROW_ID,      \
    .quantity_headroom = ROW_HEADROOM, .quantity_power = ROW_POWER,                                \
    .prepared_size = sizeof(struct jfet_prepared), .evaluate = jfet_evaluate,                      \
    .evaluate_extended = jfet_evaluate_extended, .describe = describe,                             \
    .longest_step = longest_step, .typical = typical, .paths = paths

const struct device_type device_njfet = {
    JFET_COMMON,
    .word = "njfet",
    .summary = "n-channel junction field-effect transistor",
    .polarity = 1,
    .model_kind = "njfet",
    .check = check_n,
    .prepare = prepare_n,
};

const struct device_type device_pjfet = {
    JFET_COMMON,
    .word = "pjfet",
    .summary = "p-channel junction field-effect transistor",
    .polarity = -1,
    .model_kind = "pjfet",
    .check = check_p,
    .prepare = prepare_p,
};
