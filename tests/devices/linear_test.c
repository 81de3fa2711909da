/*
 * linear_test.c: resistor, sources and opamp.
 */
#include "device_check.h"

#include "devices/resistor.h"
#include "devices/series.h"

static struct subject resistor(double ohms)
{
    struct subject it = subject_of(device_find("resistor"));
    set_value(&it, "resistance", ohms);
    return it;
}

static double ohms_at(struct subject *it, double kelvin)
{
    it->conditions.kelvin = kelvin;
    prepare(it);
    double x[2] = {1.5, 0.5};
    return 1 / quantity(it, "i", x);
}

static void resistor_follows_published_temperature_laws(void **state)
{
    (void)state;
    /* IEC 60028 copper, 100 C over 20 C; +100 ppm/K from 25 C to 125 C */
    struct subject it = resistor(10);
    it.conditions.measured_kelvin = 293.15;
    set_value(&it, "tempco", 3.93e-3);
    check_relative("copper", ohms_at(&it, 373.15), 13.144, 1e-12);
    it = resistor(10e3);
    it.conditions.measured_kelvin = 298.15;
    set_value(&it, "tempco", 100e-6);
    check_relative("10 kohm", ohms_at(&it, 398.15), 10100, 1e-12);
    /* IEC 60751 platinum: 138.51 ohm at 100 C, 247.09 ohm at 400 C */
    it = resistor(100);
    it.conditions.measured_kelvin = 273.15;
    set_value(&it, "tempco", 3.9083e-3);
    set_value(&it, "tempco2", -5.775e-7);
    check_absolute("platinum", ohms_at(&it, 373.15), 138.51, 0.005);
    check_absolute("platinum", ohms_at(&it, 673.15), 247.09, 0.005);
    it.conditions.effects = EFFECTS_HAND;
    check_relative("hand view", ohms_at(&it, 673.15), 100, 1e-14);
}

static void resistor_takes_corner_and_deviate(void **state)
{
    (void)state;
    struct subject it = resistor(2e3);
    it.values.resistor_factor = 1.2;
    set_value(&it, "match", 0.01);
    assert_int_equal(it.type->deviate_count, 1);
    check_relative("sigma", it.type->deviates[0].sigma(values_of(&it)), 0.01, 0);
    it.own[it.type->deviates[0].own_parameter] = -0.1;
    prepare(&it);
    double x[2] = {3, 1};
    check_relative("i", quantity(&it, "i", x), 2 / (2e3 * 1.2 * 0.9), 1e-14);
    check_relative("power", quantity(&it, "power", x), 4 / (2e3 * 1.2 * 0.9), 1e-14);
    check_bias(&it, x, STRICT);
    check_far(&it);
    set_value(&it, "tempco", -0.02); /* negative above 77 C: said as it is, evaluated positive */
    it.conditions.kelvin = 400;
    prepare(&it);
    assert_true(resistor_at(&it.values, &it.conditions) < 0);
    check_relative("floor", 1 / quantity(&it, "i", x) * 2, 2e-3, 1e-12);
}

/* The resistance in a lead, a branch of its own: its quantities by Ohm's law. */
static void series_describes_itself(void **state)
{
    (void)state;
    struct subject it = subject_of(&device_series);
    set_value(&it, "resistance", 50);
    prepare(&it);
    const double x[3] = {1.5, 1, 0.01}; /* both ends, the current of the branch */
    double q[3];
    assert_int_equal(it.type->describe(it.prepared, x, x, q), REGION_NONE);
    check_relative("i", q[0], 0.01, 0);
    check_relative("v", q[1], 0.5, 0);
    check_relative("power", q[2], 5e-3, 1e-15);
}

static void sources_drive_along_their_arrow(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("current"));
    set_value(&it, "current", 3e-6);
    prepare(&it);
    double x[3] = {5, 1, 0}, f[3], jac[9], drive[3];
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("node a loses it", f[0], 3e-6, 0); /* positive into the terminal */
    check_relative("node b gains it", f[1], -3e-6, 0);
    it.type->drive(it.prepared, drive);
    check_relative("drive", drive[0], f[0], 0);
    check_relative("power", quantity(&it, "power", x), 12e-6, 1e-14);
    check_bias(&it, x, STRICT);
    assert_true(it.type->is_current_source);

    it = subject_of(device_find("voltage"));
    set_value(&it, "voltage", 1.25);
    prepare(&it);
    double y[3] = {5, 1, 2e-3};
    it.type->evaluate(it.prepared, y, f, jac);
    check_relative("into a", f[0], 2e-3, 0);
    check_relative("out of b", f[1], -2e-3, 0);
    check_relative("error", f[2], 4 - 1.25, 1e-15);
    double nothing[3] = {0, 0, 0}, g[3];
    it.type->evaluate(it.prepared, nothing, g, jac);
    it.type->drive(it.prepared, drive);
    for (int k = 0; k < 3; k++) {
        check_absolute("drive is all that stays at zero", drive[k], g[k], 0);
    }
    check_relative("delivers", quantity(&it, "power", (double[]){1.25, 0, -1e-3}), -1.25e-3, 1e-14);
    check_bias(&it, y, STRICT);
    assert_true(it.type->fixes_voltage);
}

enum { OUT, PLUS, MINUS, HIGH, LOW, BRANCH };

static void opamp_amplifies_and_saturates(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("opamp"));
    set_value(&it, "gain", 1e4);
    set_value(&it, "high", 3);
    set_value(&it, "low", 0);
    set_value(&it, "offset", 1e-3);
    prepare(&it);
    double f[6], jac[36];
    double x[6] = {0, 1, 1.00095, 0, 0, 1e-6};
    it.type->evaluate(it.prepared, x, f, jac);
    /* v(out) = mid + half tanh(gain (vp - vm + offset)/half) */
    check_relative("linear", -f[BRANCH], 1.5 + 1.5 * tanh(1e4 * 5e-5 / 1.5), 1e-9);
    check_relative("current", f[OUT], 1e-6, 0);
    x[PLUS] = 2;
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("high", -f[BRANCH], 3, 1e-15);
    x[PLUS] = 0;
    it.type->evaluate(it.prepared, x, f, jac);
    check_absolute("low", -f[BRANCH], 0, 1e-15);

    set_value(&it, "high", PARAMETER_NONE); /* a node */
    prepare(&it);
    double y[6] = {0.3, 1, 1.00095, 5, 9, 0};
    it.type->evaluate(it.prepared, y, f, jac);
    check_relative("node", 0.3 - f[BRANCH], 2.5 + 2.5 * tanh(1e4 * 5e-5 / 2.5), 1e-9);
    check_relative("v", quantity(&it, "v", y), 0.3, 0);
}

static void opamp_derivatives_are_exact(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("opamp"));
    set_value(&it, "gain", 300);
    for (int nodes = 0; nodes < 2; nodes++) {
        set_value(&it, "high", nodes ? PARAMETER_NONE : 2.5);
        set_value(&it, "low", nodes ? PARAMETER_NONE : -2.5);
        prepare(&it);
        for (double in = -0.03; in < 0.03; in += 0.0017) {
            double x[6] = {0.1, 1 + in, 1, 2, -1, 1e-3};
            check_bias(&it, x,
                       (struct strictness){.step = 1e-9, .derivative = 1e-7, .wide = 1e-12});
            double crossed[6] = {0.1, 1 + 1e-4 * in, 1, -1, 1, 1e-3};
            check_bias(&it, crossed,
                       (struct strictness){.step = 1e-9, .derivative = 1e-6, .wide = 1e-12});
        }
        check_far(&it);
    }
    set_value(&it, "high", -1);
    set_value(&it, "low", 1);
    assert_non_null(complaint(&it));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(resistor_follows_published_temperature_laws),
        cmocka_unit_test(resistor_takes_corner_and_deviate),
        cmocka_unit_test(series_describes_itself),
        cmocka_unit_test(sources_drive_along_their_arrow),
        cmocka_unit_test(opamp_amplifies_and_saturates),
        cmocka_unit_test(opamp_derivatives_are_exact),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
