/*
 * law.c: table of the `law` device. Its program runs in law_current.c.
 */
#include "devices/law.h"

#include "devices/types.h"

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

static const uint32_t paths[] = {1, 1};

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct law_program *p = prepared;
    (void)conditions;
    *p = *(const struct law_program *)values->extra;
}

static int local_count(const void *extra)
{
    return 2 + ((const struct law_program *)extra)->input_count;
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    double f[DEVICE_LOCAL_LIMIT], jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
    law_evaluate(prepared, inner, f, jac);
    q[ROW_I] = f[0];
    q[ROW_V] = outer[0] - outer[1];
    q[ROW_POWER] = q[ROW_V] * q[ROW_I];
    return REGION_NONE;
}

const struct device_type device_law = {
    .word = "law",
    .summary = "current set by an expression of node voltages",
    .form = FORM_ARROW,
    .extra_kind = EXTRA_LAW,
    .uses_ground = true,
    .terminals = terminals,
    .terminal_count = ROWS(terminals),
    .value_parameter = -1,
    .quantities = quantities,
    .quantity_count = ROWS(quantities),
    .quantity_current = ROW_I,
    .quantity_headroom = -1,
    .quantity_power = ROW_POWER,
    .prepared_size = sizeof(struct law_program),
    .prepare = prepare,
    .evaluate = law_evaluate,
    .evaluate_extended = law_evaluate_extended,
    .describe = describe,
    .local_count = local_count,
    .paths = paths,
};
