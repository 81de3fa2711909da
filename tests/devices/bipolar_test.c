/*
 * bipolar_test.c: the bipolar transistor against closed forms of Gummel and Poon's equations.
 */
#include "device_check.h"

enum { C, B, E };

static double UT_at(double kelvin)
{
    return 1.380649e-23 * kelvin / 1.602176634e-19;
}

/* The transistor with everything on. */
static struct subject full(const char *word)
{
    struct subject it = subject_of(device_find(word));
    set_value(&it, "early", 60);
    set_value(&it, "early_reverse", 8);
    set_value(&it, "knee", 5e-3);
    set_value(&it, "knee_reverse", 1e-3);
    set_value(&it, "emission_reverse", 1.02);
    set_value(&it, "leak_emitter", 1e-14);
    set_value(&it, "leak_collector", 2e-14);
    set_value(&it, "beta_exponent", 1.5);
    prepare(&it);
    return it;
}

static void hand_view_is_the_exponential(void **state)
{
    (void)state;
    struct subject it = full("npn");
    it.conditions.effects = EFFECTS_HAND;
    set_value(&it, "area", 2);
    set_value(&it, "m", 3);
    prepare(&it);
    double x[3] = {3, 0.65, 0};
    check_relative("ic", quantity(&it, "ic", x), 6e-15 * exp(0.65 / UT_at(300.15)), 1e-11);
    check_absolute("ib", quantity(&it, "ib", x), 0, 0);
    assert_true(isnan(quantity(&it, "beta", x)));
}

/* Each part of the equations by itself, far from the others. */
static void parts_follow_their_closed_form(void **state)
{
    (void)state;
    double UT = UT_at(300.15);
    double x[3] = {2, 0.7, 0};
    double IF = 1e-15 * (exp(0.7 / UT) - 1);
    struct subject it = subject_of(device_find("npn"));
    prepare(&it);
    check_relative("ic = beta ib", quantity(&it, "ic", x), IF, 1e-11);
    check_relative("beta", quantity(&it, "beta", x), 100, 1e-9);
    check_relative("gm = ic/UT", quantity(&it, "gm", x), IF / UT, 1e-11);

    set_value(&it, "early", 50); /* q1 = 1/(1 - vbc/V_A): IC = IF (1 + 1.3/50) */
    prepare(&it);
    check_relative("Early", quantity(&it, "ic", x), IF * (1 + 1.3 / 50), 1e-11);
    check_relative("ro", quantity(&it, "ro", x), 50 / IF, 1e-9);

    set_value(&it, "early", PARAMETER_NONE);
    set_value(&it, "knee", 1e-4); /* qb = (1 + sqrt(1 + 4 IF/I_K))/2 */
    prepare(&it);
    check_relative("knee", quantity(&it, "ic", x), 2 * IF / (1 + sqrt(1 + 4 * IF / 1e-4)), 1e-11);
    double high[3] = {2, 1.2, 0}; /* far above the knee: sqrt(I_K I_F), half the slope */
    check_relative("high injection", quantity(&it, "gm", high) / quantity(&it, "ic", high),
                   1 / (2 * UT), 1e-4);

    set_value(&it, "knee", PARAMETER_NONE);
    set_value(&it, "leak_emitter", 1e-13);
    prepare(&it);
    double low[3] = {2, 0.3, 0};
    check_relative("leakage", quantity(&it, "ib", low),
                   1e-17 * (exp(0.3 / UT) - 1) - 1e-15 + 1e-13 * (exp(0.3 / (1.5 * UT)) - 1), 1e-9);
    it.conditions.effects &= ~(unsigned)EFFECT_LEAKAGE;
    prepare(&it);
    check_relative("no leakage", quantity(&it, "ib", low), 1e-17 * (exp(0.3 / UT) - 1) - 1e-15,
                   1e-9);
}

/* Saturated with an open collector: vce = UT ln(1 + ...) by Ebers and Moll (1954):
 * IC = 0 where IF = IR (1 + 1/beta_R), so exp(vce/UT) = 1 + 1/beta_R nearly. */
static void open_collector_rests_at_its_saturation_voltage(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("npn"));
    set_value(&it, "beta_reverse", 4);
    prepare(&it);
    double UT = UT_at(300.15);
    double x[3] = {UT * log(1.25), 0.65, 0};
    check_absolute("ic", quantity(&it, "ic", x) / quantity(&it, "ib", x), 0, 1e-8);
    assert_int_equal(region(&it, x), REGION_ON | REGION_TRIODE);
}

/* docs/devices.md: betas go as (T/T0)^r, leakage as (T/T0)^(p/n_L - r) times the bandgap
 * term; spelled out for one temperature. */
static void gain_and_leakage_follow_temperature(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("npn"));
    set_value(&it, "beta", 80);
    set_value(&it, "beta_exponent", 1.5);
    it.conditions.kelvin = 350;
    prepare(&it);
    double x[3] = {2, 0.7, 0};
    double growth = pow(350 / 300.15, 1.5);
    check_relative("beta", quantity(&it, "beta", x), 80 * growth, 1e-6);
    set_value(&it, "leak_emitter", 1e-12);
    set_value(&it, "leak_collector", 1e-12);
    prepare(&it);
    double UT = UT_at(350), rise = 350 / 300.15 - 1;
    double emitter = 1e-12 * pow(350 / 300.15, 2 - 1.5) * exp(1.12 / (1.5 * UT) * rise);
    double collector = 1e-12 * pow(350 / 300.15, 1.5 - 1.5) * exp(1.12 / (2 * UT) * rise);
    double IS = 1e-15 * pow(350 / 300.15, 3) * exp(1.12 / UT * rise);
    double off[3] = {-3, -5, 0}; /* every junction reversed: the saturation currents alone */
    check_relative("ib", quantity(&it, "ib", off),
                   -IS / (80 * growth) - IS / growth - emitter - collector, 1e-10);
    check_relative("ic", quantity(&it, "ic", off), IS / growth + collector, 1e-10);
}

static double vbe_for(struct subject *it, double current)
{
    double low = 0, high = 1;
    for (int step = 0; step < 100; step++) {
        double x[3] = {2, (low + high) / 2, 0};
        if (quantity(it, "ic", x) < current) {
            low = x[B];
        } else {
            high = x[B];
        }
    }
    return low;
}

/* Horowitz and Hill, The Art of Electronics (from memory): dVBE = UT ln N: 59.526 mV for N = 10 at
 * 300 K; 0.179192 mV/K for N = 8. */
static void areas_give_a_voltage_proportional_to_temperature(void **state)
{
    (void)state;
    struct subject small = subject_of(device_find("npn"));
    struct subject large = subject_of(device_find("npn"));
    small.conditions.kelvin = large.conditions.kelvin = 300;
    set_value(&large, "area", 10);
    prepare(&small);
    prepare(&large);
    check_absolute("N = 10", vbe_for(&small, 1e-5) - vbe_for(&large, 1e-5), 0.05952642933, 1e-10);
    set_value(&large, "area", 8);
    for (double kelvin = 250; kelvin < 400; kelvin += 50) {
        small.conditions.kelvin = large.conditions.kelvin = kelvin;
        prepare(&small);
        prepare(&large);
        check_absolute("N = 8", (vbe_for(&small, 1e-5) - vbe_for(&large, 1e-5)) / kelvin,
                       0.000179192, 5e-10);
    }
}

/* Gray, Hurst, Lewis and Meyer, sec. 4.4.3 (from memory): dVBE/dT = -(VG0 - VBE + (gamma - alpha)
 * UT)/T; here VG0 = bandgap, gamma - alpha = saturation_exponent at constant current. About -2
 * mV/K. */
static void vbe_falls_with_temperature(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("pnp"));
    set_value(&it, "bandgap", 1.205);
    set_value(&it, "saturation_exponent", 2.2);
    double vbe[3];
    for (int k = 0; k < 3; k++) {
        it.conditions.kelvin = 300 + 0.05 * (k - 1);
        prepare(&it);
        double low = 0, high = 1;
        for (int step = 0; step < 100; step++) {
            double x[3] = {-2, -(low + high) / 2, 0};
            if (quantity(&it, "ic", x) < 1e-5) {
                low = -x[B];
            } else {
                high = -x[B];
            }
        }
        vbe[k] = low;
    }
    double slope = (vbe[2] - vbe[0]) / 0.1;
    check_absolute("dVBE/dT", slope, -(1.205 - vbe[1] + 2.2 * UT_at(300)) / 300, 1e-9);
    check_absolute("about -2 mV/K", slope, -2e-3, 0.0005);
}

static void derivatives_are_exact(void **state)
{
    (void)state;
    static const char *const words[] = {"npn", "pnp"};
    struct strictness strict = {
        .step = 1e-8, .derivative = 1e-8, .wide = 1e-12, .bend = 0, .noise = 1e-14};
    for (int which = 0; which < 2; which++) {
        struct subject it = full(words[which]);
        double p = it.type->polarity;
        for (unsigned effects = 0; effects <= EFFECTS_FULL; effects += 7) {
            it.conditions.effects = effects > EFFECTS_FULL - 7 ? EFFECTS_FULL : effects;
            prepare(&it);
            for (double vbe = -1.5; vbe < 0.9; vbe += 0.15) {
                for (double vbc = -2.5; vbc < 0.9; vbc += 0.2) {
                    double x[3] = {p * (0.2 + vbe - vbc), p * (0.2 + vbe), p * 0.2};
                    check_bias(&it, x, strict);
                }
            }
        }
    }
}

/* The floor under 1 - VBC/V_A - VBE/V_B: value and slope meet at 0.05. */
static void punch_through_is_smooth_and_finite(void **state)
{
    (void)state;
    struct subject it = full("npn");
    set_value(&it, "early_reverse", 0.7);
    prepare(&it);
    /* 1 - vbe/0.7 = 0.05 at vbe = 0.665 with vbc = 0 */
    for (double vbe = 0.66; vbe < 0.80; vbe += 0.005) {
        double x[3] = {vbe, vbe, 0};
        check_bias(&it, x, (struct strictness){.step = 1e-9, .derivative = 1e-6, .wide = 1e-12});
    }
    check_far(&it);
    set_value(&it, "knee", 1e-16); /* below the saturation current: the root stays real */
    prepare(&it);
    check_far(&it);
}

static void quantities_are_positive_for_both_polarities(void **state)
{
    (void)state;
    struct subject n = full("npn"), p = full("pnp");
    double x[3] = {1.5, 0.68, 0.01}, y[3] = {-1.5, -0.68, -0.01};
    for (int k = 0; k < n.type->quantity_count; k++) {
        const char *name = n.type->quantities[k].name;
        check_relative(name, quantity(&p, name, y), quantity(&n, name, x), 1e-14);
    }
    check_relative("ie", quantity(&n, "ie", x), quantity(&n, "ic", x) + quantity(&n, "ib", x),
                   1e-14);
    check_relative("headroom", quantity(&n, "headroom", x), 1.49 - 0.2, 1e-14);
    check_relative("power", quantity(&n, "power", x),
                   1.49 * quantity(&n, "ic", x) + 0.67 * quantity(&n, "ib", x), 1e-13);
    assert_int_equal(region(&n, x), REGION_ON | REGION_SATURATED);
    double off[3] = {1.5, 0.1, 0}, reversed[3] = {0, 0.7, 1.5};
    assert_int_equal(region(&n, off), REGION_OFF);
    assert_int_equal(region(&n, reversed), REGION_ON | REGION_REVERSED);
    int high, low;
    double volts;
    assert_true(p.type->typical(p.prepared, &high, &low, &volts));
    assert_int_equal(high, E);
    assert_true(volts > 0.5 && volts < 0.6);
}

static void mismatch_falls_with_the_area(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("npn"));
    set_value(&it, "match_saturation", 0.02);
    set_value(&it, "area", 2);
    set_value(&it, "m", 8);
    check_relative("sigma", it.type->deviates[0].sigma(values_of(&it)), 0.005, 1e-14);
    it.own[it.type->deviates[0].own_parameter] = 0.1;
    it.conditions.effects = EFFECTS_HAND;
    prepare(&it);
    double x[3] = {1, 0.6, 0};
    check_relative("shifted", quantity(&it, "ic", x), 1.1 * 16e-15 * exp(0.6 / UT_at(300.15)),
                   1e-9);
    assert_int_equal(it.type->series_count, 3);
}

static void steps_are_limited_at_both_junctions(void **state)
{
    (void)state;
    struct subject it = full("pnp");
    double x[3] = {-1, -0.7, 0}, up[3] = {0, -3, 0}, down[3] = {0, 3, 0}, c[3] = {4, 0, 0};
    assert_true(it.type->longest_step(it.prepared, x, up) < 0.1);
    check_relative("down", it.type->longest_step(it.prepared, x, down), 1, 0);
    assert_true(it.type->longest_step(it.prepared, x, c) < 0.5);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(hand_view_is_the_exponential),
        cmocka_unit_test(parts_follow_their_closed_form),
        cmocka_unit_test(open_collector_rests_at_its_saturation_voltage),
        cmocka_unit_test(gain_and_leakage_follow_temperature),
        cmocka_unit_test(areas_give_a_voltage_proportional_to_temperature),
        cmocka_unit_test(vbe_falls_with_temperature),
        cmocka_unit_test(derivatives_are_exact),
        cmocka_unit_test(punch_through_is_smooth_and_finite),
        cmocka_unit_test(quantities_are_positive_for_both_polarities),
        cmocka_unit_test(mismatch_falls_with_the_area),
        cmocka_unit_test(steps_are_limited_at_both_junctions),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
