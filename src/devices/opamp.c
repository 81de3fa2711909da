/*
 * opamp.c: table and preparation of the operational amplifier.
 */
#include "devices/opamp.h"

#include "devices/types.h"

enum { OWN_GAIN, OWN_HIGH, OWN_LOW, OWN_OFFSET };

static const struct parameter own_parameters[] = {
    [OWN_GAIN] = {"gain", UNIT_NONE, DEFAULT_REQUIRED, 0, 0, INFINITY, true, "voltage gain"},
    [OWN_HIGH] = {"high", UNIT_VOLT, DEFAULT_NONE, 0, -INFINITY, INFINITY, false,
                  "upper limit of the output: a voltage or a node"},
    [OWN_LOW] = {"low", UNIT_VOLT, DEFAULT_NONE, 0, -INFINITY, INFINITY, false,
                 "lower limit of the output: a voltage or a node"},
    [OWN_OFFSET] = {"offset", UNIT_VOLT, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                    "offset voltage, added to v(plus) - v(minus)"},
};

static const struct terminal terminals[] = {
    {"out", "output", false, NULL},
    {"plus", "input that raises the output", false, NULL},
    {"minus", "input that lowers the output", false, NULL},
    {"high", "upper limit, when it is a node", true, "gnd"},
    {"low", "lower limit, when it is a node", true, "gnd"},
};

enum { ROW_I, ROW_V };

static const struct quantity_row quantities[] = {
    [ROW_I] = {"i", UNIT_AMPERE, "current into the output"},
    [ROW_V] = {"v", UNIT_VOLT, "output voltage"},
};

static const uint32_t paths[OPAMP_TERMINALS] = {UINT32_C(1) << 31, 0, 0, 0, 0};

static const bool pattern[OPAMP_UNKNOWNS * OPAMP_UNKNOWNS] = {
    [OPAMP_UNKNOWNS * OPAMP_OUT + OPAMP_BRANCH] = true,
    [OPAMP_UNKNOWNS * OPAMP_BRANCH + OPAMP_OUT] = true,
    [OPAMP_UNKNOWNS * OPAMP_BRANCH + OPAMP_PLUS] = true,
    [OPAMP_UNKNOWNS * OPAMP_BRANCH + OPAMP_MINUS] = true,
    [OPAMP_UNKNOWNS * OPAMP_BRANCH + OPAMP_HIGH] = true,
    [OPAMP_UNKNOWNS * OPAMP_BRANCH + OPAMP_LOW] = true,
};

/* A comparison with none is false: a limit that is a node is judged by nobody. */
static const char *check(const struct device_values *values)
{
    return values->own[OWN_HIGH] <= values->own[OWN_LOW] ? "high must lie above low" : NULL;
}

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct opamp_prepared *p = prepared;
    const double *own = values->own;
    (void)conditions;
    p->gain = own[OWN_GAIN];
    p->offset = own[OWN_OFFSET];
    p->high_node = isnan(own[OWN_HIGH]);
    p->low_node = isnan(own[OWN_LOW]);
    p->high = p->high_node ? 0 : own[OWN_HIGH];
    p->low = p->low_node ? 0 : own[OWN_LOW];
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    (void)prepared;
    q[ROW_I] = inner[OPAMP_BRANCH];
    q[ROW_V] = outer[OPAMP_OUT];
    return REGION_NONE;
}

/* In a loop of negative feedback the inputs differ by hardly more than the offset. */
static bool typical(const void *prepared, int *high, int *low, double *volts)
{
    const struct opamp_prepared *p = prepared;
    *high = OPAMP_PLUS;
    *low = OPAMP_MINUS;
    *volts = -p->offset;
    return true;
}

const struct device_type device_opamp = {
    .word = "opamp",
    .summary = "operational amplifier of finite gain with smooth limits",
    .form = FORM_PINS,
    .terminals = terminals,
    .terminal_count = OPAMP_TERMINALS,
    .branch_count = 1,
    .parameters = own_parameters,
    .parameter_count = ROWS(own_parameters),
    .value_parameter = -1,
    .quantities = quantities,
    .quantity_count = ROWS(quantities),
    .quantity_current = ROW_I,
    .quantity_headroom = -1,
    .quantity_power = -1,
    .prepared_size = sizeof(struct opamp_prepared),
    .check = check,
    .prepare = prepare,
    .evaluate = opamp_evaluate,
    .evaluate_extended = opamp_evaluate_extended,
    .describe = describe,
    .typical = typical,
    .pattern = pattern,
    .paths = paths,
    .fixes_voltage = true,
};
