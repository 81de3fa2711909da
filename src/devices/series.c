/*
 * series.c: table of a lead resistance (part of the effect "finite beta and series resistance").
 */
#include "devices/series.h"

#include "devices/series_prepared.h"

static const struct terminal terminals[] = {{"a", "outer end", false, NULL},
                                            {"b", "inner end", false, NULL}};

static const struct parameter parameters[] = {
    {"resistance", {12, -12, 0, 0}, DEFAULT_REQUIRED, 0, 0, INFINITY, false, "ohm of the lead"}};

static const struct quantity_row quantities[] = {{"i", {0, 12, 0, 0}, "current from a to b"},
                                                 {"v", {12, 0, 0, 0}, "voltage from a to b"},
                                                 {"power", {12, 12, 0, 0}, "dissipated power"}};

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared)
{
    struct series_prepared *p = prepared;
    p->resistance = (conditions->effects & EFFECT_GAIN) != 0 ? values->own[0] : 0;
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    (void)prepared;
    q[0] = inner[2];
    q[1] = outer[0] - outer[1];
    q[2] = q[0] * q[1];
    return REGION_NONE;
}

static const bool pattern[9] = {0, 0, 1, 0, 0, 1, 1, 1, 1};
static const uint32_t paths[2] = {1, 1};

const struct device_type device_series = {
    .word = "series resistance",
    .summary = "resistance in a lead of a device",
    .form = FORM_ARROW,
    .terminals = terminals,
    .terminal_count = 2,
    .branch_count = 1,
    .parameters = parameters,
    .parameter_count = 1,
    .value_parameter = 0,
    .quantities = quantities,
    .quantity_count = 3,
    .quantity_current = 0,
    .quantity_headroom = -1,
    .quantity_power = 2,
    .prepared_size = sizeof(struct series_prepared),
    .prepare = prepare,
    .evaluate = series_evaluate,
    .evaluate_extended = series_evaluate_extended,
    .describe = describe,
    .pattern = pattern,
    .paths = paths,
};
