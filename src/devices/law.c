/*
 * law.c: table of the `law` device. Its program runs in law_current.c.
 */
#include "devices/law.h"

#include "devices/two_terminal.h"

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
    return two_terminal_describe(f[0], outer, q);
}

const struct device_type device_law = {
    TWO_TERMINAL_TABLE,
    .word = "law",
    .summary = "current set by an expression of node voltages",
    .extra_kind = EXTRA_LAW,
    .uses_ground = true,
    .value_parameter = -1,
    .prepared_size = sizeof(struct law_program),
    .prepare = prepare,
    .evaluate = law_evaluate,
    .evaluate_extended = law_evaluate_extended,
    .describe = describe,
    .local_count = local_count,
};
