/*
 * curve_test.c: the monotone cubic of the `table` device.
 */
#include "device_check.h"

#include "devices/curve.h"

enum { LIMIT = 16 };

static struct subject table_of(struct curve *curve, const double *v, const double *i, double *slope,
                               int count)
{
    curve_slopes(v, i, slope, count);
    *curve = (struct curve){v, i, slope, count};
    struct subject it = subject_of(device_find("table"));
    it.values.extra = curve;
    prepare(&it);
    return it;
}

static double current_at(struct subject *it, double v)
{
    double x[2] = {v, 0}, f[2], jac[4];
    it->type->evaluate(it->prepared, x, f, jac);
    return f[0];
}

/* The radiochemical data on which Fritsch and Carlson (1980) show their method (from memory): a
 * plain spline overshoots 1 and undershoots 0 on them. */
static void published_data_stay_monotone(void **state)
{
    (void)state;
    static const double v[] = {7.99, 8.09, 8.19, 8.7, 9.2, 10, 12, 15, 20};
    static const double i[] = {0,        2.76429e-5, 4.37498e-2, 0.169183, 0.469428,
                               0.943740, 0.998636,   0.999919,   0.999994};
    double slope[LIMIT];
    struct curve curve;
    struct subject it = table_of(&curve, v, i, slope, 9);
    for (int k = 0; k < 9; k++) {
        check_absolute("through the points", current_at(&it, v[k]), i[k], 1e-15);
        assert_true(slope[k] >= 0);
    }
    double last = 0;
    for (double at = 7.99; at < 20; at += 0.001) {
        double now = current_at(&it, at);
        assert_true(now >= last - 1e-16);
        last = now;
    }
    assert_true(last <= 0.999994);
    /* outside: straight on */
    check_relative("above", current_at(&it, 25), i[8] + 5 * slope[8], 1e-14);
    check_relative("below", current_at(&it, 5) + 1, i[0] - 2.99 * slope[0] + 1, 1e-14);
}

/* Monotone pieces of any data stay monotone; extrema of the curve are points of the data. */
static void pieces_stay_between_their_points(void **state)
{
    (void)state;
    uint32_t seed = 12345;
    for (int trial = 0; trial < 300; trial++) {
        double v[LIMIT], i[LIMIT], slope[LIMIT];
        int count = 2 + trial % (LIMIT - 1);
        for (int k = 0; k < count; k++) {
            seed = seed * 1664525u + 1013904223u; /* Numerical Recipes' quick generator */
            double random = (double)(seed >> 8) / 16777216;
            v[k] = k == 0 ? -1 : v[k - 1] + 0.01 + random * random;
            seed = seed * 1664525u + 1013904223u;
            i[k] = seed >> 30 == 0 && k > 0 ? i[k - 1] : (double)(seed >> 8) / 16777216 - 0.5;
        }
        struct curve curve;
        struct subject it = table_of(&curve, v, i, slope, count);
        for (int k = 0; k + 1 < count; k++) {
            double last = i[k];
            double direction = i[k + 1] >= i[k] ? 1 : -1;
            for (int step = 1; step <= 50; step++) {
                double now = current_at(&it, v[k] + (v[k + 1] - v[k]) * step / 50);
                assert_true(direction * (now - last) >= -1e-14);
                last = now;
            }
            double x[2] = {v[k] + 1e-3, 0};
            check_bias(&it, x,
                       (struct strictness){.step = 1e-9, .derivative = 1e-5, .wide = 1e-11});
            x[0] = v[k]; /* C1 at the points */
            check_bias(
                &it, x,
                (struct strictness){.step = 1e-10, .derivative = 1e-4, .wide = 1e-11, .bend = 1e6});
        }
        check_far(&it);
    }
}

/* A straight line is kept, and so is the slope of a parabola inside (three-point slopes). */
static void smooth_data_are_followed(void **state)
{
    (void)state;
    static const double v[] = {0, 1, 3, 4, 6};
    double line[5], parabola[5], slope[LIMIT];
    for (int k = 0; k < 5; k++) {
        line[k] = 2 - 3 * v[k];
        parabola[k] = (v[k] + 5) * (v[k] + 5);
    }
    struct curve curve;
    struct subject it = table_of(&curve, v, line, slope, 5);
    check_relative("line", current_at(&it, 2.37), 2 - 3 * 2.37, 1e-14);
    it = table_of(&curve, v, parabola, slope, 5);
    check_relative("parabola", current_at(&it, 2.37), 7.37 * 7.37, 1e-14);
    it = table_of(&curve, v, parabola, slope, 2);
    check_relative("two points", current_at(&it, 0.5), 30.5, 1e-14);
    double x[2] = {0.75, 0.25};
    check_relative("power", quantity(&it, "power", x), 0.5 * 30.5, 1e-14);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(published_data_stay_monotone),
        cmocka_unit_test(pieces_stay_between_their_points),
        cmocka_unit_test(smooth_data_are_followed),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
