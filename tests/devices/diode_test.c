/*
 * diode_test.c: the diode against published values, its temperature law and its own derivatives.
 */
#include "device_check.h"

static double current_at(struct subject *it, double v)
{
    double x[2] = {v, 0};
    return quantity(it, "i", x);
}

/* Banwell and Jayakumar (2000): 5 V, 1 kohm, IS 1e-14 A, 300 K. */
static void meets_the_lambert_form(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    it.conditions.kelvin = it.conditions.measured_kelvin = 300;
    prepare(&it);
    static const struct {
        double supply, current, tolerance;
    } published[] = {{5, 4.30745637e-3, 5e-12}, {0.5, 2.2964240e-6, 5e-14}};
    for (int k = 0; k < 2; k++) {
        double low = 0, high = 1; /* the loop equation, by bisection */
        for (int step = 0; step < 100; step++) {
            double v = (low + high) / 2;
            if (v + 1000 * current_at(&it, v) < published[k].supply) {
                low = v;
            } else {
                high = v;
            }
        }
        check_absolute("i", current_at(&it, low), published[k].current, published[k].tolerance);
        if (k == 0) {
            check_absolute("v", low, 0.69254363, 5e-9);
        }
    }
}

static void zener_carries_its_current_at_its_voltage(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    set_value(&it, "breakdown_voltage", 5.6);
    set_value(&it, "breakdown_current", 5e-3);
    set_value(&it, "breakdown_emission", 2);
    set_value(&it, "breakdown_tempco", 300e-6);
    set_value(&it, "area", 3);
    prepare(&it);
    check_relative("at the voltage", current_at(&it, -5.6), -15e-3, 1e-10);
    double x[2] = {-5.6, 0}, f[2], jac[4];
    it.type->evaluate(it.prepared, x, f, jac);
    double UT = BOLTZMANN_OVER_CHARGE * 300.15;
    check_relative("dynamic resistance", 1 / jac[0], 2 * UT / 15e-3, 1e-10);
    assert_int_equal(region(&it, x), REGION_BREAKDOWN);
    it.conditions.kelvin = 340.15;
    prepare(&it);
    check_relative("40 K up", current_at(&it, -5.6 * 1.012), -15e-3, 1e-8);
}

/* I_S(T) as docs/devices.md writes it, spelled out for one temperature. */
static void saturation_current_follows_temperature(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    set_value(&it, "emission", 1.7);
    set_value(&it, "saturation_current", 2e-12);
    it.conditions.kelvin = 350;
    prepare(&it);
    double UT = 1.380649e-23 * 350 / 1.602176634e-19;
    double IS = 2e-12 * pow(350 / 300.15, 3 / 1.7) * exp(1.12 / (1.7 * UT) * (350 / 300.15 - 1));
    check_relative("reverse", current_at(&it, -3), -IS, 1e-12);
    check_relative("forward", current_at(&it, 0.5), IS * (exp(0.5 / (1.7 * UT)) - 1), 1e-12);
    it.conditions.effects = EFFECTS_HAND; /* the temperature of the model values */
    prepare(&it);
    check_relative("hand view", current_at(&it, -3), -2e-12, 1e-12);
}

static void derivatives_are_exact(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    for (int breakdown = 0; breakdown < 2; breakdown++) {
        if (breakdown) {
            set_value(&it, "breakdown_voltage", 3);
        }
        prepare(&it);
        for (double v = -3.4; v < 1; v += 0.05) {
            double x[2] = {v + 0.3, 0.3};
            check_bias(&it, x,
                       (struct strictness){.step = 1e-8, .derivative = 1e-8, .wide = 1e-12});
        }
        /* the straight part above an exponent of 80, and the seam: 80 UT = 2.0692 V */
        double seam = 80 * BOLTZMANN_OVER_CHARGE * 300.15;
        for (double v = seam - 1e-9; v < 2.3; v += 0.0777) {
            double x[2] = {v, 0};
            check_bias(&it, x,
                       (struct strictness){.step = 1e-9, .derivative = 1e-7, .wide = 1e-12});
        }
        check_far(&it);
    }
}

static void steps_are_limited_where_the_exponential_is_steep(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    prepare(&it);
    double UT = BOLTZMANN_OVER_CHARGE * 300.15;
    double x[2] = {0.6, 0}, dx[2] = {5, 0};
    /* critical voltage 0.72 V (Nagel 1975): a start below may reach it, but not go beyond */
    double critical = UT * log(UT / (10e-15 * sqrt(2.0)));
    check_relative("below", 0.6 + 5 * it.type->longest_step(it.prepared, x, dx),
                   fmax(critical, 0.6 + UT * log1p(5 / UT)), 1e-12);
    x[0] = 0.75;
    check_relative("above", 0.75 + 5 * it.type->longest_step(it.prepared, x, dx),
                   0.75 + UT * log1p(5 / UT), 1e-12);
    dx[0] = -5;
    check_relative("down", it.type->longest_step(it.prepared, x, dx), 1, 0);
    set_value(&it, "breakdown_voltage", 3);
    prepare(&it);
    assert_true(it.type->longest_step(it.prepared, x, dx) < 0.9);
}

static void regions_and_start(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("diode"));
    prepare(&it);
    double on[2] = {0.6, 0}, off[2] = {-2, 0};
    assert_int_equal(region(&it, on), REGION_ON);
    assert_int_equal(region(&it, off), REGION_OFF);
    check_relative("power", quantity(&it, "power", on), 0.6 * current_at(&it, 0.6), 1e-14);
    int high, low;
    double volts;
    assert_true(it.type->typical(it.prepared, &high, &low, &volts));
    check_relative("1 uA", current_at(&it, volts), 1e-6, 1e-10);
    assert_string_equal(it.type->terminals[high].name, "a");
    set_value(&it, "breakdown_voltage", 3);
    prepare(&it);
    assert_true(it.type->typical(it.prepared, &high, &low, &volts)); /* there for its breakdown */
    assert_int_equal(high, 1);
    assert_int_equal(low, 0);
    assert_true(volts > 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(meets_the_lambert_form),
        cmocka_unit_test(zener_carries_its_current_at_its_voltage),
        cmocka_unit_test(saturation_current_follows_temperature),
        cmocka_unit_test(derivatives_are_exact),
        cmocka_unit_test(steps_are_limited_where_the_exponential_is_steep),
        cmocka_unit_test(regions_and_start),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
