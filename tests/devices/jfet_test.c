/*
 * jfet_test.c: the junction field-effect transistor against published points and its derivatives.
 */
#include "device_check.h"

enum { D, G, S };

static struct subject transistor(const char *word, double idss, double pinchoff)
{
    struct subject it = subject_of(device_find(word));
    set_value(&it, "idss", idss);
    set_value(&it, "pinchoff", pinchoff);
    prepare(&it);
    return it;
}

/* da Silva, High Frequency and Microwave Engineering, ch. 6; Boylestad and Nashelsky, example 7.1
 * (from memory): (a) 8 mA, -6 V, 2 mA at vgs = -3 V; (b) 10 mA, -8 V, 5.625 mA at -2 V. */
static void meets_the_published_points(void **state)
{
    (void)state;
    struct subject it = transistor("njfet", 8e-3, -6);
    it.conditions.effects = EFFECTS_HAND;
    prepare(&it);
    double a[3] = {12, -3, 0};
    check_relative("(a)", quantity(&it, "id", a), 2e-3, 1e-14);
    it = transistor("njfet", 10e-3, -8);
    double b[3] = {4.75, -2, 0}; /* below pinch-off: 4.75 V is in triode by this law */
    double saturated[3] = {16, -2, 0};
    check_absolute("(b)", quantity(&it, "id", saturated), 5.625e-3, 5e-7);
    /* triode, spelled out: B vds (2 (vgs - VP) - vds) */
    check_relative("triode", quantity(&it, "id", b), 10e-3 / 64 * 4.75 * (2 * 6 - 4.75), 1e-10);
    assert_int_equal(region(&it, b), REGION_ON | REGION_TRIODE);
    assert_int_equal(region(&it, saturated), REGION_ON | REGION_SATURATED);
}

static void early_temperature_and_polarity(void **state)
{
    (void)state;
    struct subject n = transistor("njfet", 4e-3, -2), p = transistor("pjfet", 4e-3, 2);
    struct subject *both[] = {&n, &p};
    for (int k = 0; k < 2; k++) {
        struct subject *it = both[k];
        double s = it->type->polarity;
        set_value(it, "early", 50);
        set_value(it, "idss_tempco", -3e-3);
        set_value(it, "pinchoff_tempco", s * 2e-3);
        set_value(it, "area", 3);
        it->conditions.kelvin = 310.15;
        prepare(it);
        double x[3] = {s * 5, s * -0.5, 0};
        double wanted = 12e-3 * 0.97 * pow(1 - 0.5 / 1.98, 2) * (1 + 5.0 / 50);
        check_relative("id", quantity(it, "id", x), wanted, 1e-9);
        check_relative("headroom", quantity(it, "headroom", x), 5 - (1.98 - 0.5), 1e-12);
        check_relative("gds", quantity(it, "gds", x), wanted / 1.1 / 50, 1e-7);
        double off[3] = {s * 5, s * -2.5, 0}, reversed[3] = {s * -1, s * -0.5, 0};
        assert_int_equal(region(it, off), REGION_OFF);
        assert_int_equal(region(it, reversed), REGION_ON | REGION_REVERSED);
        int high, low;
        double volts;
        assert_true(it->type->typical(it->prepared, &high, &low, &volts));
        assert_int_equal(high, s > 0 ? S : G);
        check_relative("start", volts, 0.4 * 1.98, 1e-12);
    }
}

/* Off, only the two gate junctions carry current: their saturation current each. */
static void gate_leaks_in_the_full_view(void **state)
{
    (void)state;
    struct subject it = transistor("njfet", 4e-3, -2);
    set_value(&it, "saturation_current", 5e-12);
    prepare(&it);
    double x[3] = {5, -5, 0}, f[3], jac[9];
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("gate", f[G], -10e-12, 1e-12);
    check_relative("drain", f[D], 5e-12, 1e-12);
    it.conditions.effects = EFFECTS_FULL & ~(unsigned)EFFECT_LEAKAGE;
    prepare(&it);
    it.type->evaluate(it.prepared, x, f, jac);
    check_absolute("no leakage", f[G], 0, 0);
}

static void derivatives_are_exact(void **state)
{
    (void)state;
    struct subject n = transistor("njfet", 4e-3, -2), p = transistor("pjfet", 4e-3, 2);
    struct subject *both[] = {&n, &p};
    for (int k = 0; k < 2; k++) {
        double s = both[k]->type->polarity;
        set_value(both[k], "early", 30);
        prepare(both[k]);
        for (double vgs = -2.5; vgs < 0.8; vgs += 0.17) {
            for (double vds = -3.03; vds < 4; vds += 0.21) {
                double x[3] = {s * (vds + 0.4), s * (vgs + 0.4), s * 0.4};
                check_bias(both[k], x,
                           (struct strictness){.step = 1e-9, .derivative = 1e-6, .wide = 1e-12});
            }
        }
        /* the seams: vds = 0, vgs = VP, vds = vgs - VP */
        static const double seams[][2] = {{0, -1}, {1, -2}, {1, -1}, {-1, -2}, {0, -2}};
        for (int j = 0; j < 5; j++) {
            double x[3] = {s * seams[j][0], s * seams[j][1], 0};
            check_bias(
                both[k], x,
                (struct strictness){.step = 1e-9, .derivative = 1e-6, .wide = 1e-12, .bend = 5e-3});
        }
        check_far(both[k]);
    }
}

static void drain_and_source_exchange(void **state)
{
    (void)state;
    struct subject it = transistor("njfet", 4e-3, -2);
    double x[3] = {1.3, -0.2, 0.4}, y[3] = {0.4, -0.2, 1.3}, f[3], h[3], jac[9];
    it.type->evaluate(it.prepared, x, f, jac);
    it.type->evaluate(it.prepared, y, h, jac);
    check_relative("exchanged", h[S], f[D], 0);
    double up[3] = {0, 3, 0}, forward[3] = {1, 0.7, 0};
    assert_true(it.type->longest_step(it.prepared, forward, up) < 0.2);
}

static void wrong_sign_of_pinchoff_is_told(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("njfet"));
    set_value(&it, "pinchoff", 2);
    assert_non_null(strstr(complaint(&it), "negative"));
    it = subject_of(device_find("pjfet"));
    set_value(&it, "pinchoff", -2);
    assert_non_null(strstr(complaint(&it), "positive"));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(meets_the_published_points),
        cmocka_unit_test(early_temperature_and_polarity),
        cmocka_unit_test(gate_leaks_in_the_full_view),
        cmocka_unit_test(derivatives_are_exact),
        cmocka_unit_test(drain_and_source_exchange),
        cmocka_unit_test(wrong_sign_of_pinchoff_is_told),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
