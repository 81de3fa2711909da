/* sweep_test.c: sweeps of everything that can be turned, against formulas and against solving anew.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include "run_fixture.h"

static const struct sweep_table *run_sweep(struct run *run, const char *text)
{
    run_open(run, text, VERB_SWEEP, VIEW_FULL, NAN);
    assert_int_equal(run->status, STATUS_OK);
    assert_int_equal(run->result->sweep_count, 1);
    return &run->result->sweeps[0];
}

#define DIVIDER                                                                                    \
    "let RB = 3k\nlet VX = 2 V\nrail vdd 4 V\nresistor R1 vdd -> m 1k tempco=1000 ppm/K\n"         \
    "resistor R2 m -> gnd RB\ncurrent I1 gnd -> n 1 mA\nresistor R3 n -> gnd 2k\n"                 \
    "voltage V1 p -> gnd VX\nresistor R4 p -> gnd 1k\nresistor R5 p -> o 1k\n"                     \
    "output o at 1 V from 0 V to 3 V\n"

/* One formula a kind of thing; x is the swept value. */
static double by_rail(double x)
{
    return x * 0.75;
}
static double by_let(double x)
{
    return 4 * x / (1000 + x);
}
static double by_kelvin(double x)
{
    return 4 * 3 / (3 + 1 + 1e-3 * (x - 300.15));
}
static double by_resistor(double x)
{
    return 4 * 3000 / (3000 + x);
}
static double by_current(double x)
{
    return 2000 * x;
}
static double by_output(double x)
{
    return fabs(2 - x) / 1000;
}
static double by_let_volts(double x)
{
    return fabs(x - 1) / 1000;
}
static double by_band(double x)
{
    return x - 0.01 * fabs(2 - x);
}

static void test_everything(void **state)
{
    (void)state;
    static const struct {
        const char *line;
        double (*wanted)(double x);
        double from, to;
        int points;
    } rows[] = {
        {"sweep vdd from 1 V to 5 V points 9 show m.v\n", by_rail, 1, 5, 9},
        {"sweep RB from 10k to 1k points 4 show m.v\n", by_let, 1e4, 1e3, 4},
        {"sweep RB from 1 kohm to 10 kohm show m.v\n", by_let, 1e3, 1e4, 51},
        {"sweep temperature from -40 C to 85 C points 6 show m.v\n", by_kelvin, 233.15, 358.15, 6},
        {"sweep R1 from 1 to 1M points 2 show m.v\n", by_resistor, 1, 1e6, 2},
        {"sweep I1 from -2 mA to 2 mA points 5 show n.v\n", by_current, -2e-3, 2e-3, 5},
        {"sweep o from 0 V to 3 V points 7 show o.current\n", by_output, 0, 3, 7},
        {"sweep VX from 0 V to 3 V points 7 show o.current\n", by_let_volts, 0, 3, 7},
        /* an output quantity anew at each point: the band's edge moves with the load voltage */
        {"sweep o from 0.5 V to 1.5 V points 3 show o.low\n", by_band, 0.5, 1.5, 3},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        char text[1000];
        struct run run;
        (void)snprintf(text, sizeof text, DIVIDER "%s", rows[k].line);
        const struct sweep_table *table = run_sweep(&run, text);
        const struct sweep_series *series = &table->series[0];
        assert_int_equal(series->count, rows[k].points);
        check_near(series->knob[0], rows[k].from, 1e-15);
        check_near(series->knob[series->count - 1], rows[k].to, 0);
        for (int i = 0; i < series->count; i++) {
            const double wanted = rows[k].wanted(series->knob[i]);
            if (!(fabs(series->values[i] - wanted) <= 1e-9 * fabs(wanted) + 1e-18)) {
                print_error("%s at %g: %.15g, wanted %.15g\n", rows[k].line, series->knob[i],
                            series->values[i], wanted);
                fail();
            }
        }
        run_close(&run);
    }
}

#define MIRROR                                                                                     \
    "process \"n350.process\"\nlet W2 = %g um\nrail vdd 3.3 V\nresistor RB vdd -> ref 120k\n"      \
    "nmos M1 d=ref g=ref s=gnd W=20u L=4u\nnmos M2 d=tail g=ref s=gnd W=W2 L=4u\n"                 \
    "output tail at 1 V from 0 V to 3.3 V\n"

static double solved_anew(double width, const char *quantity)
{
    char text[600];
    struct run run;
    (void)snprintf(text, sizeof text, MIRROR, width);
    run_review(&run, text, VIEW_FULL);
    const double value = value_of(&run, quantity);
    run_close(&run);
    return value;
}

/* A width swept in place, with a family of temperatures and of lets, and quantities of an output.
 */
/* A cell without a `sweep` line: the load voltages, over the ranges of their outputs. */
static void test_loads(void **state)
{
    (void)state;
    struct run run;
    run_open(&run, DIVIDER "output m at 1 V from 0.5 V to 2 V\n", VERB_SWEEP, VIEW_FULL, NAN);
    assert_int_equal(run.status, STATUS_OK);
    assert_int_equal(run.result->sweep_count, 2);
    const struct sweep_table *o = &run.result->sweeps[0], *m = &run.result->sweeps[1];
    assert_string_equal(o->sweep->knob.name, "o");
    assert_int_equal(o->series[0].count, 51);
    for (int k = 0; k < o->series[0].count; k++) {
        check_near(o->series[0].knob[k], 3.0 * k / 50, 1e-15);
        assert_true(fabs(o->series[0].values[k] - by_output(o->series[0].knob[k])) <= 1e-12);
    }
    assert_string_equal(m->sweep->knob.name, "m");
    check_near(m->series[0].knob[0], 0.5, 0);
    check_near(m->series[0].knob[50], 2, 0);
    check_near(m->series[0].values[50], (4 - 2) / 1e3 - 2 / 3e3, 1e-12);
    run_close(&run);
}

static void test_families(void **state)
{
    (void)state;
    char text[700];
    struct run run;
    (void)snprintf(text, sizeof text,
                   MIRROR "sweep M2.W from 10u to 40u points 4 show tail.current tail.resistance "
                          "tail.compliance for temperature = 27 C 85 C\n",
                   20.0);
    const struct sweep_table *table = run_sweep(&run, text);
    assert_int_equal(table->series_count, 2);
    check_near(table->series[1].family_value, 358.15, 1e-15);
    for (int k = 0; k < 4; k++) {
        const double *row = &table->series[0].values[3 * k];
        check_near(row[0], solved_anew(10 + 10 * k, "tail.current"), 1e-12);
        check_near(row[1], solved_anew(10 + 10 * k, "tail.resistance"), 1e-9);
        assert_true(fabs(row[2] - solved_anew(10 + 10 * k, "tail.compliance")) < 1e-7);
    }
    assert_true(table->series[1].values[0] != table->series[0].values[0]);
    run_close(&run);

    (void)snprintf(
        text, sizeof text,
        MIRROR "sweep vdd from 3 V to 3.3 V points 2 show tail.current for W2 = 10u 30u\n", 20.0);
    table = run_sweep(&run, text);
    check_near(table->series[0].values[1], solved_anew(10, "tail.current"), 1e-12);
    check_near(table->series[1].values[1], solved_anew(30, "tail.current"), 1e-12);
    run_close(&run);
}

/* A let that makes a hidden node come and go: the parts are counted anew at each point. */
static void test_changing_structure(void **state)
{
    (void)state;
    struct run run;
    const struct sweep_table *table =
        run_sweep(&run, "let RS = 0\nmodel q npn\n emitter_resistance = RS\nend\nrail vcc 5 V\n"
                        "current I1 vcc -> b 1 mA\nnpn Q1 c=vcc b=b e=gnd\n"
                        "resistor R1 vcc -> gnd 1k\nresistor R2 vcc -> gnd 2k\n"
                        "sweep RS from 0 to 10 points 3 show R1.i R2.i b.v\n");
    for (int k = 0; k < 3; k++) {
        check_near(table->series[0].values[3 * k], 5e-3, 1e-14);
        check_near(table->series[0].values[3 * k + 1], 2.5e-3, 1e-14);
    }
    /* 101 mA (beta 100) in 5 ohm each time */
    check_near(table->series[0].values[5] - table->series[0].values[2], 0.505, 1e-9);
    run_close(&run);
}

/* What is swept stays the same part when the family changes how many parts there are. */
static void test_changing_family(void **state)
{
    (void)state;
    struct run run;
    const struct sweep_table *table =
        run_sweep(&run, "let RS = 0\nmodel q npn\n emitter_resistance = RS\nend\nrail vcc 5 V\n"
                        "current I1 vcc -> b 1 mA\nnpn Q1 c=vcc b=b e=gnd\n"
                        "resistor R1 vcc -> gnd 1k\nresistor R2 vcc -> gnd 2k\n"
                        "sweep R1 from 1k to 4k points 4 show R1.i R2.i for RS = 0 5 0\n");
    assert_int_equal(table->series_count, 3);
    for (int f = 0; f < 3; f++) {
        for (int k = 0; k < 4; k++) {
            check_near(table->series[f].values[2 * k], 5e-3 / (k + 1), 1e-14);
            check_near(table->series[f].values[2 * k + 1], 2.5e-3, 1e-14);
        }
    }
    run_close(&run);
}

/* Values that no part can have are points without a state, in their place in the table. */
static void test_lost_points(void **state)
{
    (void)state;
    struct run run;
    const struct sweep_table *table =
        run_sweep(&run, "let RX = 1k\nrail vdd 3 V\nresistor R1 vdd -> gnd RX\n"
                        "sweep RX from -1k to 2k points 4 show R1.i\n");
    const struct sweep_series *series = &table->series[0];
    assert_int_equal(series->count, 4);
    assert_true(isnan(series->values[0]) && isnan(series->values[1]));
    check_near(series->values[2], 3e-3, 1e-15);
    check_near(series->values[3], 1.5e-3, 1e-15);
    assert_int_equal(series->event_count, 2);
    assert_int_equal(series->lost, 2);
    check_near(series->events[0].at, -1000, 0);
    run_close(&run);
}

/* A bistable cell: the two branches of a hysteresis are told with the voltage of the jump. The fold
 * lies where the slope of G1's feedback reaches that of its load: x - 3/(1 + e^(-4(x + u - 1.5))) =
 * 0, turned by u. */
#define HYSTERESIS                                                                                 \
    "law G1 x -> gnd i = 1 mA/V*(x.v - 3V*(1 + exp(-4*(x.v + u.v - 1.5V)/1V))^(-1))\n"

/* 3*4*s(1-s) = 1 with the lower s, x = 3 s, u = 1.5 - x + ln(s/(1-s))/4 */
static double rising_fold(void)
{
    const double s = (1 - sqrt(1 - 4.0 / 12)) / 2;
    return 1.5 - 3 * s + log(s / (1 - s)) / 4;
}

static void check_hysteresis(const struct sweep_series *series, double tolerance)
{
    const double fold = rising_fold();
    assert_true(fold > 0 && fold < 1);
    assert_int_equal(series->event_count, 1);
    assert_true(fabs(series->events[0].at - fold) < tolerance);
    for (int k = 0; k < series->count; k++) {
        const double u = series->knob[k], x = series->values[k];
        assert_true(fabs(x - 3 / (1 + exp(-4 * (x + u - 1.5)))) < 1e-9);
        assert_true(u > fold ? x > 1.5 : x < 1.5); /* below the fold the lower branch is kept */
    }
}

/* In small steps, and in steps that leap over the fold to where Newton finds the other state. */
static void test_fold(void **state)
{
    (void)state;
    static const int points[] = {41, 3, 2};
    for (int k = 0; k < 3; k++) {
        char text[400];
        struct run run;
        (void)snprintf(text, sizeof text,
                       "rail u 0 V\nresistor R1 u -> gnd 1k\n" HYSTERESIS
                       "sweep u from -1 V to 1 V points %d show x.v\n",
                       points[k]);
        const struct sweep_table *table = run_sweep(&run, text);
        check_hysteresis(&table->series[0], 1e-5);
        assert_non_null(strstr(table->series[0].events[0].text, "folds back"));
        run_close(&run);
    }
}

/* The same by a let, where the circuit is built anew for each point. */
static void test_fold_of_let(void **state)
{
    (void)state;
    struct run run;
    const struct sweep_table *table =
        run_sweep(&run, "let U = 0 V\nrail u U\nresistor R1 u -> gnd 1k\n" HYSTERESIS
                        "sweep U from -1 V to 1 V points 5 show x.v\n");
    check_hysteresis(&table->series[0], 1e-4);
    run_close(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_everything),
        cmocka_unit_test(test_loads),
        cmocka_unit_test(test_families),
        cmocka_unit_test(test_changing_structure),
        cmocka_unit_test(test_changing_family),
        cmocka_unit_test(test_lost_points),
        cmocka_unit_test(test_fold),
        cmocka_unit_test(test_fold_of_let),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
