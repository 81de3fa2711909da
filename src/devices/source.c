/*
 * source.c: tables and preparation of the ideal sources.
 */
#include "devices/linear.h"
#include "devices/two_terminal.h"

static const struct parameter current_parameters[] = {
    {"current", UNIT_AMPERE, DEFAULT_REQUIRED, 0, -INFINITY, INFINITY, false,
     "current in the direction of the arrow"},
};

static const struct parameter voltage_parameters[] = {
    {"voltage", UNIT_VOLT, DEFAULT_REQUIRED, 0, -INFINITY, INFINITY, false,
     "voltage of the first node above the second"},
};

static const struct terminal terminals[] = {
    {"a", "where the arrow begins", false, NULL},
    {"b", "where the arrow ends", false, NULL},
};

static const struct quantity_row quantities[] = {
    [TWO_I] = {"i", UNIT_AMPERE, "current through the source in the direction of the arrow"},
    [TWO_V] = {"v", UNIT_VOLT, "voltage of the first node above the second"},
    [TWO_POWER] = {"power", UNIT_WATT, "dissipated power, negative when the source delivers"},
};

static const uint32_t voltage_paths[LINEAR_TERMINALS] = {1, 1};
static const uint32_t current_paths[LINEAR_TERMINALS] = {0, 0};

static const bool current_pattern[LINEAR_TERMINALS * LINEAR_TERMINALS] = {false};

static const bool voltage_pattern[] = {
    false, false, true,  /* a */
    false, false, true,  /* b */
    true,  true,  false, /* branch */
};

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct linear_prepared *p = prepared;
    (void)conditions;
    p->value = values->own[0];
}

static unsigned describe_current(const void *prepared, const double *outer, const double *inner,
                                 double *q)
{
    const struct linear_prepared *p = prepared;
    (void)inner;
    return two_terminal_describe(p->value, outer, q);
}

static unsigned describe_voltage(const void *prepared, const double *outer, const double *inner,
                                 double *q)
{
    (void)prepared;
    return two_terminal_describe(inner[LINEAR_BRANCH], outer, q);
}

static void drive_current(const void *prepared, double *f)
{
    const struct linear_prepared *p = prepared;
    f[LINEAR_A] = p->value;
    f[LINEAR_B] = -p->value;
}

static void drive_voltage(const void *prepared, double *f)
{
    const struct linear_prepared *p = prepared;
    f[LINEAR_A] = 0;
    f[LINEAR_B] = 0;
    f[LINEAR_BRANCH] = -p->value;
}

#define SOURCE_COMMON                                                                              \
    .form = FORM_ARROW, .terminals = terminals, .terminal_count = LINEAR_TERMINALS,                \
    .value_parameter = 0, .quantities = quantities, .quantity_count = ROWS(quantities),            \
    .quantity_current = TWO_I, .quantity_headroom = -1, .quantity_power = TWO_POWER,               \
    .prepared_size = sizeof(struct linear_prepared), .prepare = prepare

const struct device_type device_current = {
    SOURCE_COMMON,
    .word = "current",
    .summary = "ideal current source",
    .parameters = current_parameters,
    .parameter_count = ROWS(current_parameters),
    .evaluate = current_evaluate,
    .evaluate_extended = current_evaluate_extended,
    .describe = describe_current,
    .drive = drive_current,
    .pattern = current_pattern,
    .paths = current_paths,
    .is_current_source = true,
};

const struct device_type device_voltage = {
    SOURCE_COMMON,
    .word = "voltage",
    .summary = "ideal voltage source",
    .branch_count = 1,
    .parameters = voltage_parameters,
    .parameter_count = ROWS(voltage_parameters),
    .evaluate = voltage_evaluate,
    .evaluate_extended = voltage_evaluate_extended,
    .describe = describe_voltage,
    .drive = drive_voltage,
    .pattern = voltage_pattern,
    .paths = voltage_paths,
    .fixes_voltage = true,
};
