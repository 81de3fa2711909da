/* closed_form_test.c: operating points whose answer is a formula. Every wanted value is computed
 * here from the equations named beside it, never by the program's own functions. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include "run_fixture.h"

static void test_divider(void **state)
{
    (void)state;
    struct run run;
    run_review(&run, "rail vdd 5 V\nresistor R1 vdd -> m 1M\nresistor R2 m -> gnd 0.003\n",
               VIEW_FULL);
    check_near(value_of(&run, "m.v"), 5 * 0.003 / 1000000.003, 1e-15);
    check_near(value_of(&run, "vdd.current"), 5 / 1000000.003, 1e-15);
    check_near(value_of(&run, "R2.i"), 5 / 1000000.003, 1e-15);
    check_near(value_of(&run, "cell.power"), 25 / 1000000.003, 1e-15);
    run_close(&run);
}

/* Banwell and Jayakumar 2000: I = (n UT/R) W(...) - IS, here at three currents over nine decades.
 */
static void test_diode_resistor(void **state)
{
    (void)state;
    static const double ohms[] = {1e3, 1e7, 1e12};
    for (int k = 0; k < 3; k++) {
        char text[200];
        struct run run;
        (void)snprintf(text, sizeof text,
                       "model d diode\n emission = 1.7\n saturation_current = 3 fA\nend\n"
                       "rail vdd 5 V\nresistor R1 vdd -> a %g\ndiode D1 a -> gnd\n",
                       ohms[k]);
        run_review(&run, text, VIEW_FULL);
        const double is = 3e-15, u = 1.7 * thermal(300.15), r = ohms[k];
        const double w = lambert_of_exponent(log(is * r / u) + (5 + is * r) / u);
        check_near(value_of(&run, "D1.i"), u / r * w - is, 2e-12);
        run_close(&run);
    }
}

/* K (V - VT)^2 = (VDD - V)/R: a quadratic in V. */
static void test_square_law_diode(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model nch nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\n early = 5 V\nend\n"
               "rail vdd 3 V\nresistor R1 vdd -> a 20k\nnmos M1 d=a g=a s=gnd W=10u L=2u\n",
               VIEW_HAND);
    const double k = 200e-6 * 5 / 2, r = 20e3;
    const double overdrive = (-1 + sqrt(1 + 4 * k * r * 2.5)) / (2 * k * r);
    check_near(value_of(&run, "M1.vgs"), 0.5 + overdrive, 1e-13);
    check_near(value_of(&run, "M1.id"), k * overdrive * overdrive, 1e-12);
    check_near(value_of(&run, "M1.overdrive"), overdrive, 1e-12);
    check_near(value_of(&run, "M1.gm"), 2 * k * overdrive, 1e-12);
    check_near(value_of(&run, "M1.headroom"), 0.5, 1e-12);
    run_close(&run);
}

/* Enz and Vittoz: ID = 2 n beta UT^2 (q^2 + q), 2q + ln q = (VG - VT)/UT, saturated; here the bare
 * core of docs/devices.md (n = 1), from weak to strong inversion, n- and p-channel. */
static void test_charge_model(void **state)
{
    (void)state;
    static const double gate[] = {0.2, 0.45, 0.6, 1.5};
    for (int k = 0; k < 8; k++) {
        char text[400];
        struct run run;
        const double vg = gate[k / 2], u = thermal(300.15);
        (void)snprintf(text, sizeof text,
                       k % 2 == 0
                           ? "model n nmos\n threshold = 0.45 V\n kprime = 300 uA/V^2\nend\n"
                             "rail vdd 3 V\nrail vg %g V\nnmos M1 d=vdd g=vg s=gnd W=4u L=8u\n"
                           : "model p pmos\n threshold = 0.45 V\n kprime = 300 uA/V^2\nend\n"
                             "rail vee -3 V\nrail vg -%g V\n"
                             "pmos M1 d=vee g=vg s=gnd b=gnd W=4u L=8u\n",
                       vg);
        run_review(&run, text, VIEW_FULL);
        const double q = charge_of((vg - 0.45) / u), d = charge_of((vg - 0.45 - 3) / u);
        check_near(value_of(&run, "M1.id"), 2 * 150e-6 * u * u * (q * q + q - d * d - d), 1e-13);
        check_near(value_of(&run, "M1.vds"), 3, 1e-15);
        check_near(value_of(&run, "M1.inversion"), q * q + q, 1e-12);
        check_near(value_of(&run, "M1.vdsat"), u * (2 * q + 4), 1e-12);
        run_close(&run);
    }
}

/* IOUT/IIN = 1/(1 + 2/beta): no Early effect, both collectors far from saturation. */
static void test_bipolar_mirror(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model q npn\n saturation_current = 2 fA\n beta = 80\nend\nrail vcc 5 V\n"
               "current I1 vcc -> in 100 uA\nnpn Q1 c=in b=in e=gnd\nnpn Q2 c=out b=in e=gnd\n"
               "output out at 2 V from 0 V to 5 V\n",
               VIEW_FULL);
    check_near(value_of(&run, "out.current"), 100e-6 / (1 + 2.0 / 80), 1e-9);
    check_near(value_of(&run, "Q2.beta"), 80, 1e-8);
    run_close(&run);
    /* hand view: infinite beta */
    run_review(&run,
               "model q npn\n saturation_current = 2 fA\n beta = 80\nend\nrail vcc 5 V\n"
               "current I1 vcc -> in 100 uA\nnpn Q1 c=in b=in e=gnd\nnpn Q2 c=out b=in e=gnd\n"
               "output out at 2 V from 0 V to 5 V\n",
               VIEW_HAND);
    check_near(value_of(&run, "out.current"), 100e-6, 1e-9);
    run_close(&run);
}

/* Widlar 1965: UT ln(IIN/IOUT) = IOUT RE, by bisection. */
static void test_widlar(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model q npn\n saturation_current = 1 fA\nend\nrail vcc 30 V\n"
               "current I1 vcc -> in 1 mA\nnpn Q1 c=in b=in e=gnd\nnpn Q2 c=out b=in e=e2\n"
               "resistor RE e2 -> gnd 27.5k\noutput out at 5 V from 0 V to 30 V\n",
               VIEW_HAND);
    double low = 1e-9, high = 1e-3;
    for (int k = 0; k < 200; k++) {
        const double i = (low + high) / 2;
        *(thermal(300.15) * log(1e-3 / i) > i * 27.5e3 ? &low : &high) = i;
    }
    check_near(value_of(&run, "out.current"), low, 1e-9);
    run_close(&run);
}

/* An opamp follower of gain A: vout = mid + half tanh(A (vin - vout)/half), by bisection. */
static void test_opamp_follower(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "rail vdd 5 V\nrail vin 1.3 V\nresistor RL out -> gnd 1k\n"
               "opamp A1 out=out plus=vin minus=out gain=50 high=vdd low=1\n",
               VIEW_FULL);
    double low = 1, high = 5;
    for (int k = 0; k < 200; k++) {
        const double v = (low + high) / 2;
        *(3 + 2 * tanh(50 * (1.3 - v) / 2) > v ? &low : &high) = v;
    }
    check_near(value_of(&run, "out.v"), low, 1e-13);
    run_close(&run);
}

/* Shichman and Hodges with a source resistor: B (VP - I R)^2 = I, a quadratic. */
static void test_jfet_source(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model j njfet\n idss = 5 mA\n pinchoff = -2 V\nend\nrail vdd 20 V\n"
               "njfet J1 d=vdd g=gnd s=s\nresistor RS s -> gnd 2k\n",
               VIEW_FULL);
    const double b = 5e-3 / 4, r = 2000;
    const double y = (-1 + sqrt(1 + 4 * b * r * 2)) / (2 * b * r); /* VGS - VP */
    /* the gate junctions carry pA: 1e-9 of the current */
    check_near(value_of(&run, "J1.id"), b * y * y, 2e-8);
    run_close(&run);
}

/* Zener: IZ exp((V - VZ)/UT) + IS = (VDD - V)/R, by bisection. */
static void test_zener(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model z diode\n breakdown_voltage = 5.6 V\n breakdown_current = 1 mA\n"
               " breakdown_emission = 3\nend\n"
               "rail vdd 60 V\nresistor R1 vdd -> k 100k\ndiode D1 gnd -> k\n",
               VIEW_FULL);
    double low = 0, high = 10;
    for (int k = 0; k < 200; k++) {
        const double v = (low + high) / 2, u = thermal(300.15);
        const double i = 1e-3 * exp((v - 5.6) / (3 * u)) + 10e-15 * (1 - exp(-v / u));
        *(i < (60 - v) / 100e3 ? &low : &high) = v;
    }
    check_near(value_of(&run, "k.v"), low, 1e-13);
    run_close(&run);
}

/* Femtoamperes through teraohms beside amperes through milliohms. */
static void test_extremes(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "rail vdd 60 V\nresistor R1 vdd -> a 1e15\nresistor R2 a -> gnd 2e15\n"
               "resistor R3 vdd -> b 1e-3\nresistor R4 b -> gnd 10\n"
               "current I1 vdd -> c 3 fA\nresistor R5 c -> gnd 1e12\n",
               VIEW_FULL);
    check_near(value_of(&run, "a.v"), 40, 1e-14);
    check_near(value_of(&run, "R1.i"), 20e-15, 1e-14);
    check_near(value_of(&run, "R3.v"), 60e-3 / 10.001, 1e-12);
    check_near(value_of(&run, "c.v"), 3e-3, 1e-14);
    run_close(&run);
}

/* The start of a search: self-biased loops, switches that are off, opamp loops and wires beside
 * megohms are found from cold in a few steps, in the running state. */
static void test_cold_start(void **state)
{
    (void)state;
    static const struct {
        const char *text, *quantity;
        double least; /* of the running state */
    } rows[] = {
        {"process \"n180.process\"\nrail vdd 1.8 V\nnmos M1 d=nb g=nb s=gnd W=4u L=4u\n"
         "nmos M2 d=pb g=nb s=deg W=4u L=4u m=4\nresistor R deg -> gnd 15k\n"
         "pmos M3 d=nb g=pb s=vdd W=24u L=4u\npmos M4 d=pb g=pb s=vdd W=24u L=4u\n"
         "pmos MS1 d=st g=nb s=vdd W=0.5u L=20u\nnmos MS2 d=st g=nb s=gnd W=4u L=0.5u\n"
         "nmos MS3 d=pb g=st s=gnd W=1u L=0.5u\n",
         "M1.id", 8e-6},
        {"rail vcc 9 V\nrail set 0.5 V\nopamp A1 out=g plus=set minus=s gain=1e5 low=gnd high=vcc "
         "offset=1mV\nnmos M1 d=vcc g=g s=s b=s conduction=0.4 A/V^2 threshold=2 V slope=1.3\n"
         "resistor RS s -> gnd 5\n",
         "M1.id", 0.1},
        {"rail vcc 60 V\nresistor W1 vcc -> c 1m\nresistor RB c -> b 5.6M\n"
         "npn Q1 c=b b=b e=e\nresistor W2 e -> gnd 1m\n",
         "Q1.ic", 1e-6},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        struct run run;
        run_review(&run, rows[k].text, VIEW_FULL);
        assert_string_equal(run.result->point.solver.method, "direct");
        assert_true(run.result->point.solver.iterations <= 20);
        assert_true(value_of(&run, rows[k].quantity) > rows[k].least);
        run_close(&run);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_divider),
        cmocka_unit_test(test_diode_resistor),
        cmocka_unit_test(test_square_law_diode),
        cmocka_unit_test(test_charge_model),
        cmocka_unit_test(test_bipolar_mirror),
        cmocka_unit_test(test_widlar),
        cmocka_unit_test(test_opamp_follower),
        cmocka_unit_test(test_jfet_source),
        cmocka_unit_test(test_zener),
        cmocka_unit_test(test_extremes),
        cmocka_unit_test(test_cold_start),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
