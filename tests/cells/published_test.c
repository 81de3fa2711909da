/*
 * published_test.c: published circuits as cells, and the program's answers against the published
 * numbers.
 *
 * Every value stands with the tolerance to which it was published, or "closed form" values with
 * what the closed form leaves out. Where a source takes a round kT/q, `temperature` and
 * `measured_at` are set to it: 26 mV is 301.71747116030207 K, 25 mV is 290.11295303875204 K.
 * The square law is the hand view. Where a source adds an output conductance to the square law, the
 * full view is used with hand transistors of `slope` 1e-7, whose weak and moderate inversion has
 * shrunk to nothing.
 */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <cmocka.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "support/cell_run.h"

enum { ROW_LIMIT = 8, TEXT_LIMIT = 8000 };

/* The designer's accuracy of a compliance voltage: 10 uV (design, section 4). */
#define COMPLIANCE 1e-5

struct row {
    const char *quantity;
    double published, tolerance; /* absolute, in the quantity's unit */
};

struct published {
    const char *name;
    enum view view;
    const char *text;
    struct row rows[ROW_LIMIT]; /* quantity NULL ends */
};

#define UT_26MV "temperature 301.71747116030207 K\nmeasured_at 301.71747116030207 K\n"
#define UT_25MV "temperature 290.11295303875204 K\nmeasured_at 290.11295303875204 K\n"
#define AT_300K "temperature 300 K\nmeasured_at 300 K\n"

/* ---- group 2 of the reference values: MOS cells ---- */

static const struct published mos_cells[] = {
    /* Sedra and Smith, Microelectronic Circuits, 5th ed., example 6.4; R is printed as 20 kohm for
     * VGS rounded to 1 V, 19.84 kohm gives the 100 uA that it is designed for */
    {"M01 mirror, bias point",
     VIEW_HAND,
     "model nmos nmos\n threshold = 0.7 V\n kprime = 200 uA/V^2\nend\n"
     "rail vdd 3 V\n"
     "resistor RB vdd -> g 19837.72233983162\n"
     "nmos M1 d=g g=g s=gnd W=10u L=1u\n"
     "nmos M2 d=out g=g s=gnd W=10u L=1u\n"
     "output out at 1.5 V from 0 V to 3 V\n",
     {{"M1.id", 100e-6, 1e-12},
      {"M1.overdrive", 0.316, 0.0005},
      {"M1.vgs", 0.7 + 0.316227766, 1e-9},
      {"out.current", 100e-6, 1e-12},
      {"out.compliance", 0.316227766, COMPLIANCE}}},
    /* the same with the factor 1 + VDS/20 V; M1 at VDS1 = VGS = 1.0162 V, M2 at 2.0162 V */
    {"M01 mirror, output",
     VIEW_FULL,
     "rail vdd 3 V\n"
     "current IREF vdd -> g 105.0811388300842 uA\n"
     "nmos M1 d=g g=g s=gnd conduction=1 mA/V^2 threshold=0.7 early=20 slope=1e-7\n"
     "nmos M2 d=out g=g s=gnd conduction=1 mA/V^2 threshold=0.7 early=20 slope=1e-7\n"
     "output out at 2.016227766016838 V from 0.5 V to 3 V\n",
     {{"out.current", 105.0811388300842e-6 * 1.047582278, 1e-10},
      {"out.resistance", 200e3, 500},
      {"M2.gds", 5e-6, 5e-7}}},
    /* Gray, Hurst, Lewis and Meyer, 4th/5th ed., section 4.4.1.1 */
    {"M02 MOS Widlar",
     VIEW_HAND,
     "rail vdd 3 V\n"
     "current IIN vdd -> g 100 uA\n"
     "nmos M1 d=g g=g s=gnd conduction=2.5 mA/V^2 threshold=0.6\n"
     "nmos M2 d=out g=g s=deg conduction=2.5 mA/V^2 threshold=0.6\n"
     "resistor R2 deg -> gnd 4k\n"
     "output out at 1.5 V from 0 V to 3 V\n",
     {{"M1.overdrive", 0.2, 1e-9},
      {"out.current", 25e-6, 1e-13},
      {"M2.overdrive", 0.1, 1e-9},
      {"out.compliance", 0.2, COMPLIANCE}}},
    /* Neamen, Microelectronics, example 10.9: gm 0.5 mS and ro = 1/(lambda I) = 1 Mohm for both.
     * With VDS 1 V in each, early = 99 V makes (early + VDS)/I the 1 Mohm */
    {"M03 cascode output resistance",
     VIEW_FULL,
     "rail low 1.1 V\nrail high 2.1 V\n"
     "nmos M2 d=mid g=low s=gnd conduction=618.75 uA/V^2 threshold=0.7 early=99 slope=1e-7\n"
     "nmos M4 d=out g=high s=mid conduction=618.75 uA/V^2 threshold=0.7 early=99 slope=1e-7\n"
     "output out at 2 V from 1 V to 5 V\n",
     {{"out.current", 100e-6, 1e-9},
      {"M2.gm", 0.5e-3, 1e-8},
      {"M2.ro", 1e6, 1e3},
      {"M4.ro", 1e6, 1e3},
      {"out.resistance", 502e6, 5e5}}},
    /* Sooch, US patent 4,550,284 (1985), as treated in Gray, Hurst, Lewis and Meyer 4.2.5.2 */
    {"M04 plain cascode mirror",
     VIEW_HAND,
     "rail vdd 5 V\n"
     "current IIN vdd -> g2 100 uA\n"
     "nmos M3 d=g2 g=g2 s=g1 conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M1 d=g1 g=g1 s=gnd conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M4 d=out g=g2 s=mid conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M2 d=mid g=g1 s=gnd conduction=2.5 mA/V^2 threshold=0.7\n"
     "output out at 3 V from 0 V to 5 V\n",
     {{"out.current", 100e-6, 1e-13}, {"out.compliance", 1.1, COMPLIANCE}}},
    /* the quarter-size diode device is made a millionth narrower so that M2 is on the safe side */
    {"M04 high-swing cascode mirror",
     VIEW_HAND,
     "rail vdd 5 V\nrail edge 0.2 V\n"
     "current IIN vdd -> in 100 uA\n"
     "current IB vdd -> b 100 uA\n"
     "nmos M5 d=b g=b s=gnd conduction=0.624999 mA/V^2 threshold=0.7\n"
     "nmos M3 d=in g=b s=s1 conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M1 d=s1 g=in s=gnd conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M4 d=out g=b s=mid conduction=2.5 mA/V^2 threshold=0.7\n"
     "nmos M2 d=mid g=in s=gnd conduction=2.5 mA/V^2 threshold=0.7\n"
     /* in triode with VGS = Vt + 2 VOV and VDS = VOV: a third of the size */
     "nmos M6 d=edge g=b s=gnd conduction=2.5 mA/V^2/3 threshold=0.7\n"
     "output out at 3 V from 0 V to 5 V\n",
     {{"out.current", 100e-6, 1e-13},
      {"b.v", 1.1, 1e-6},
      {"out.compliance", 0.4, COMPLIANCE},
      {"M6.id", 100e-6, 2e-10}}},
    /* Sedra and Smith; Gray, Hurst, Lewis and Meyer: every gm 1 mS and ro 100 kohm (VOV 0.2 V;
     * early + VDS = 10 V in each) gives ro (1 + gm ro) + ro/(1 + gm ro) */
    {"M05 MOS Wilson output resistance",
     VIEW_FULL,
     "rail vdd 5 V\n"
     "current IIN vdd -> in 100 uA\n"
     "nmos M1 d=y g=y s=gnd conduction=2.25 mA/V^2 threshold=0.8 early=9 slope=1e-7\n"
     "nmos M2 d=in g=y s=gnd conduction=2 mA/V^2 threshold=0.8 early=8 slope=1e-7\n"
     "nmos M3 d=out g=in s=y conduction=2 mA/V^2 threshold=0.8 early=8 slope=1e-7\n"
     "output out at 3 V from 1 V to 5 V\n",
     {{"out.current", 100e-6, 1e-10},
      {"M3.gm", 1e-3, 1e-8},
      {"M2.ro", 100e3, 1},
      {"out.resistance", 10100990.1, 50}}},
    /* Razavi, Design of Analog CMOS ICs; Johns and Martin: I = 2/(beta R^2) (1 - 1/sqrt K)^2 */
    {"M06 beta multiplier, K 4",
     VIEW_HAND,
     "rail vdd 3 V\n"
     "nmos M1 d=n g=n s=gnd conduction=0.5 mA/V^2 threshold=0.7\n"
     "nmos M2 d=p g=n s=deg conduction=2 mA/V^2 threshold=0.7\n"
     "resistor R deg -> gnd 5k\n"
     "pmos M3 d=n g=p s=vdd conduction=0.5 mA/V^2 threshold=0.7\n"
     "pmos M4 d=p g=p s=vdd conduction=0.5 mA/V^2 threshold=0.7\n"
     "pmos M5 d=out g=p s=vdd conduction=0.5 mA/V^2 threshold=0.7\n"
     "output out at 1 V from 0 V to 3 V\n",
     {{"R.i", 20e-6, 1e-12},
      {"M1.id", 20e-6, 1e-12},
      {"out.current", 20e-6, 1e-12},
      {"M1.gm", 1 / 5e3, 1e-9 / 5e3}}},
    /* K = 9 constant-gm question: gm 2.5 mS at 100 uA wants 533.33 ohm */
    {"M06 beta multiplier, K 9",
     VIEW_HAND,
     "rail vdd 3 V\n"
     "nmos M1 d=n g=n s=gnd conduction=15.625 mA/V^2 threshold=0.7\n"
     "nmos M2 d=p g=n s=deg conduction=9*15.625 mA/V^2 threshold=0.7\n"
     "resistor R deg -> gnd 1600/3\n"
     "pmos M3 d=n g=p s=vdd conduction=5 mA/V^2 threshold=0.7\n"
     "pmos M4 d=p g=p s=vdd conduction=5 mA/V^2 threshold=0.7\n"
     "pmos M5 d=out g=p s=vdd conduction=5 mA/V^2 threshold=0.7\n"
     "output out at 1 V from 0 V to 3 V\n",
     {{"R.i", 100e-6, 2e-10}, {"M1.gm", 2.5e-3, 5e-9}}},
};

/* Vittoz and Fellrath, IEEE J. Solid-State Circuits SC-12 (1977) 224: UT ln K on R whatever the
 * slope is. The closed form is the limit of no inversion; these devices are at 1e-9 of it. */
#define VITTOZ(temperature)                                                                        \
    "temperature " temperature " K\nmeasured_at 300 K\n"                                           \
    "model nmos nmos\n threshold = 1.8 V\n kprime = 1000 A/V^2\n body_effect = 0.4 V^0.5\nend\n"   \
    "rail vdd 4 V\n"                                                                               \
    "nmos M1 d=n g=n s=gnd W=10m L=10u\n"                                                          \
    "nmos M2 d=p g=n s=deg W=10m L=10u m=4\n"                                                      \
    "resistor R deg -> gnd 100k\n"                                                                 \
    "pmos M3 d=n g=p s=vdd conduction=10 uA/V^2 threshold=1\n"                                     \
    "pmos M4 d=p g=p s=vdd conduction=10 uA/V^2 threshold=1\n"                                     \
    "pmos M5 d=out g=p s=vdd conduction=10 uA/V^2 threshold=1\n"                                   \
    "output out at 1 V from 0 V to 4 V\n"

static const struct published weak_cells[] = {
    {"M07 weak-inversion PTAT, 300 K",
     VIEW_FULL,
     VITTOZ("300"),
     {{"deg.v", 35.83848153e-3, 5e-8},
      {"R.i", 358.3848153e-9, 5e-13},
      {"out.current", 358.3848153e-9, 5e-13},
      {"out.tempco", 1.0 / 300, 1e-6 / 300}}},
    /* I(330 K)/I(300 K) = 1.1 */
    {"M07 weak-inversion PTAT, 330 K",
     VIEW_FULL,
     VITTOZ("330"),
     {{"R.i", 1.1 * 358.3848153e-9, 5e-13}}},
};

/* ---- group 3: bipolar cells ---- */

static const struct published mirror_cells[] = {
    /* Neamen, Microelectronics, exercise EX10.1: VBE 0.7 V, beta 75 */
    {"B01 mirror, 10 V",
     VIEW_FULL,
     "let IS = 603.8961038961 uA/(exp(0.7 V/thermal_voltage) - 1)\n"
     "model npn npn\n saturation_current = IS\n beta = 75\nend\n"
     "rail vcc 10 V\n"
     "resistor R vcc -> b 15k\n"
     "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=gnd\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"R.i", 0.62e-3, 1e-12}, {"out.current", 0.604e-3, 5e-7}, {"Q1.vbe", 0.7, 1e-9}}},
    /* exercise EX10.2: supplies of 5 V, and 2 % more current for 4 V more */
    {"B01 mirror, two supplies",
     VIEW_FULL,
     "let IS = 754.8701298701 uA/(exp(0.7 V/thermal_voltage) - 1)\n"
     "model npn npn\n saturation_current = IS\n beta = 75\n early = 200\nend\n"
     "rail vcc 5 V\nrail vee -5 V\n"
     "resistor R vcc -> b 12k\n"
     "npn Q1 c=b b=b e=vee\nnpn Q2 c=out b=b e=vee\n"
     "output out at -4.3 V from -5 V to 5 V\n",
     {{"R.i", 0.775e-3, 5e-12}, {"out.current", 0.7549e-3, 5e-8}, {"out.resistance", 265e3, 500}}},
    /* exercise 8.26 (probably Sedra and Smith): beta 100, ro 100 kohm */
    {"B06 simple mirror",
     VIEW_FULL,
     UT_25MV "model npn npn\n saturation_current = 1 fA\nend\n"
             "model npn_ro npn\n saturation_current = 1 fA\n early = 100\nend\n"
             "rail vcc 10 V\n"
             "current IIN vcc -> b 1.02 mA\n"
             "npn Q1 c=b b=b e=gnd model=npn\nnpn Q2 c=out b=b e=gnd model=npn_ro\n"
             "output out at 0.690776 V from 0.3 V to 5 V\n",
     {{"out.current", 1e-3, 1e-9}, {"out.resistance", 100e3, 500}}},
    {"B06 Wilson mirror, ratio",
     VIEW_FULL,
     "model npn npn\n saturation_current = 0.1 fA\nend\n"
     "rail vcc 10 V\n"
     "current IIN vcc -> in 1 mA\n"
     "npn Q1 c=y b=y e=gnd\nnpn Q2 c=in b=y e=gnd\nnpn Q3 c=out b=in e=y\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 0.99980396e-3, 5e-12}}},
    {"B06 Wilson mirror, resistance",
     VIEW_FULL,
     UT_25MV "model npn npn\n saturation_current = 1 fA\n early = 100\nend\n"
             "rail vcc 10 V\n"
             "current IIN vcc -> in 1 mA\n"
             "npn Q1 c=y b=y e=gnd\nnpn Q2 c=in b=y e=gnd\nnpn Q3 c=out b=in e=y\n"
             "output out at 2 V from 1 V to 10 V\n",
     {{"out.resistance", 5e6, 5e5}}},
    /* Sedra and Smith; Gray and Meyer: m/(1 + (1 + m)/beta) */
    {"B07 area ratio 4",
     VIEW_FULL,
     "model npn npn\n saturation_current = 0.1 fA\nend\n"
     "rail vcc 10 V\n"
     "current IIN vcc -> b 1 mA\n"
     "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=gnd area=4\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 3.8095238e-3, 5e-11}}},
    /* 1/(1 + (N + 1)/beta) for N = 9 outputs */
    {"B07 nine outputs",
     VIEW_FULL,
     "model npn npn\n saturation_current = 0.1 fA\nend\n"
     "rail vcc 10 V\n"
     "current IIN vcc -> b 1 mA\n"
     "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=gnd\nnpn Q3 c=vcc b=b e=gnd m=8\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 0.9090909e-3, 5e-11}}},
    /* 1/(1 + 2/(beta^2 + beta)) = 10100/10102 with a base-current helper */
    {"B07 helper",
     VIEW_FULL,
     "model npn npn\n saturation_current = 0.1 fA\nend\n"
     "rail vcc 10 V\n"
     "current IIN vcc -> in 1 mA\n"
     "npn Q1 c=in b=b e=gnd\nnpn Q2 c=out b=b e=gnd\nnpn Q3 c=vcc b=in e=b\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 1e-3 * 10100 / 10102, 1e-12}}},
};

static const struct published widlar_cells[] = {
    /* Neamen, exercise EX10.6: UT 26 mV, beta 150, VA 100 V; ro = VA/I with the collector at the
     * base's voltage */
    {"B02 Widlar, output resistance",
     VIEW_FULL,
     UT_26MV "let IO = 25 uA\nlet RE = 3465.492691 ohm\n"
             "let IS = IO/(exp(0.6 V/thermal_voltage) - 1)\n"
             "model npn npn\n saturation_current = IS\n beta = 150\n early = 100\nend\n"
             "let VB = 0.6 V + RE*IO*(1 + 1/150)\n"
             "rail b VB\n"
             "npn Q2 c=out b=b e=deg\nresistor RX deg -> gnd RE\n"
             "output out at VB from 0.3 V to 10 V\n",
     {{"out.current", 25e-6, 1e-13},
      {"Q2.gm", 0.9615e-3, 5e-7},
      {"Q2.ro", 4e6, 4e3},
      {"out.resistance", 17.04e6, 5e3}}},
    /* Gray and Meyer, section 4.4.1.1: R2 is printed cut to 27.5 kohm; sensitivity
     * 1/(1 + IOUT R2/UT) = 0.16 to IIN, and IIN follows VCC through 29.3 kohm + UT/IIN */
    {"B03 Widlar from 30 V",
     VIEW_HAND,
     UT_26MV "let IS = 1 mA/(exp(0.7 V/thermal_voltage) - 1)\n"
             "model npn npn\n saturation_current = IS\nend\n"
             "rail vcc 30 V\n"
             "resistor R1 vcc -> b 29.3k\nresistor R2 e -> gnd 27551.25031\n"
             "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=e\n"
             "output out at 10 V from 0 V to 30 V\n",
     {{"R1.i", 1e-3, 1e-12},
      {"out.current", 5e-6, 1e-14},
      {"out.line", 0.1587725765 / 29.326, 1e-9} /* 1/(1 + ln 200) */,
      {"out.line", 0.16 / 29.326, 0.005 / 29.326}}},
    /* Sedra and Smith, 5th ed., example 6.14: UT 25 mV; printed R1 942 kohm and R3 11.5 kohm are
     * these to three digits */
    {"B04 simple mirror, 10 uA",
     VIEW_HAND,
     UT_25MV "let IS = 1 mA/(exp(0.7 V/thermal_voltage) - 1)\n"
             "model npn npn\n saturation_current = IS\nend\n"
             "rail vcc 10 V\n"
             "resistor R1 vcc -> b 941512.9255\n"
             "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=gnd\n"
             "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 10e-6, 1e-14}, {"Q1.vbe", 0.58, 0.005}, {"Q1.vbe", 0.5848707454, 1e-8}}},
    {"B04 Widlar, 10 uA",
     VIEW_HAND,
     UT_25MV "let IS = 1 mA/(exp(0.7 V/thermal_voltage) - 1)\n"
             "model npn npn\n saturation_current = IS\nend\n"
             "rail vcc 10 V\n"
             "resistor R2 vcc -> b 9.3k\nresistor R3 e -> gnd 11512.92546\n"
             "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=e\n"
             "output out at 5 V from 0 V to 10 V\n",
     {{"R2.i", 1e-3, 1e-11}, {"out.current", 10e-6, 1e-14}}},
    /* Widlar problem P10.1: 3 mA to 5 uA at 300 K needs 33 kohm (33.07 by the closed form) */
    {"B05 Widlar at 300 K",
     VIEW_FULL,
     AT_300K "model npn npn\n saturation_current = 1 fA\n beta = 1e9\nend\n"
             "rail vcc 10 V\n"
             "current I1 vcc -> b 3 mA\nresistor R e -> gnd 33074.68482\n"
             "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=e\n"
             "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 5e-6, 5e-14}}},
    {"B05 Widlar at 350 K",
     VIEW_FULL,
     "temperature 350 K\nmeasured_at 300 K\n"
     "model npn npn\n saturation_current = 1e-18 A\n beta = 1e9\nend\n"
     "rail vcc 10 V\n"
     "current I1 vcc -> b 3 mA\nresistor R e -> gnd 33k\n"
     "npn Q1 c=b b=b e=gnd\nnpn Q2 c=out b=b e=e\n"
     "output out at 5 V from 0 V to 10 V\n",
     {{"out.current", 5.7e-6, 5e-8}, {"out.current", 5.723086377e-6, 1e-13}}},
};

/* Nagata source, Gray, Hurst, Lewis and Meyer section 4.4.1.3: IOUT = IIN exp(-IIN R/UT), greatest
 * where IIN R = UT. */
#define PEAKING(conditions, current, resistor)                                                     \
    conditions "model npn npn\n saturation_current = 1 fA\nend\n"                                  \
               "rail vcc 5 V\n"                                                                    \
               "current IIN vcc -> a " current "\n"                                                \
               "resistor R a -> b " resistor "\n"                                                  \
               "npn Q1 c=b b=a e=gnd\nnpn Q2 c=out b=b e=gnd\n"                                    \
               "output out at 2 V from 0 V to 5 V\n"

static const struct published resistance_cells[] = {
    /* Gray, Hurst, Lewis and Meyer 4.2.4.1: every ro 100 kohm, gm 40 mS, rpi 2.5 kohm at 1 mA.
     * Integral charge control has gm = I/UT - 1/ro, so UT is 1 mA/40.01 mS and beta 100.025 */
    {"B08 cascode output resistance",
     VIEW_FULL,
     "temperature 290.04044292802 K\nmeasured_at 290.04044292802 K\n"
     "let B = 100.025\nlet IS = 1 mA/(exp(0.7 V/thermal_voltage) - 1)\n"
     "model npn npn\n saturation_current = IS\n beta = B\n beta_reverse = 1e6\n early = 100\nend\n"
     "model npn_low npn\n saturation_current = IS*(1 + 1/B)\n beta = B\n beta_reverse = 1e6\n "
     "early = 100*(1 + 1/B)\n"
     "end\n"
     "rail b1 0.7 V\nrail b2 1.4 V\n"
     "npn Q1 c=mid b=b1 e=gnd model=npn_low\nnpn Q2 c=out b=b2 e=mid model=npn\n"
     "output out at 1.4 V from 0.5 V to 10 V\n",
     {{"out.current", 1e-3, 1e-11},
      {"Q2.gm", 40e-3, 1e-9},
      {"Q1.ro", 100e3, 0.01},
      {"Q2.ro", 100e3, 0.01},
      {"out.resistance", 10e6, 5e5},
      {"out.resistance", 9858536.585, 1}}},
    {"B08 degenerated output resistance",
     VIEW_FULL,
     "temperature 290.04044292802 K\nmeasured_at 290.04044292802 K\n"
     "let B = 100.025\nlet IS = 1 mA/(exp(0.7 V/thermal_voltage) - 1)\n"
     "model npn npn\n saturation_current = IS\n beta = B\n beta_reverse = 1e6\n early = 100\nend\n"
     "let VB = 0.7 V + 100 ohm*1 mA*(1 + 1/B)\n"
     "rail b VB\n"
     "npn Q1 c=out b=b e=e\nresistor RE e -> gnd 100\n"
     "output out at VB from 0.3 V to 10 V\n",
     {{"out.current", 1e-3, 1e-11},
      {"out.resistance", 0.5e6, 5e4},
      {"out.resistance", 484711.5385, 0.1}}},
    {"B09 peaking source at its peak",
     VIEW_HAND,
     PEAKING(UT_26MV, "26 uA", "1k"),
     {{"out.current", 26e-6 * 0.3678794412, 26e-6 * 1e-9}}},
    {"B09 peaking source below",
     VIEW_HAND,
     PEAKING(UT_26MV, "25 uA", "1k"),
     {{"out.current", 25e-6 * 0.3823042729, 25e-6 * 1e-8}}}, /* exp(-25/26) */
    {"B09 peaking source above",
     VIEW_HAND,
     PEAKING(UT_26MV, "27 uA", "1k"),
     {{"out.current", 27e-6 * 0.3539988769, 27e-6 * 1e-8}}}, /* exp(-27/26) */
    /* R 259 ohm for a peak at 100 uA, 300 K (milindsweb.amved.com); 258.52 exactly */
    {"B09 peaking source, 100 uA",
     VIEW_HAND,
     PEAKING(AT_300K, "100 uA", "258.5199979"),
     {{"R.v", 25.851999786e-3, 1e-9}, {"out.current", 36.78794412e-6, 1e-12}}},
};

/* Gray and Meyer, section 4.4.3: UT ln N on R; equal currents by an ideal mirror. */
#define PTAT(resistor)                                                                             \
    AT_300K "model npn npn\n saturation_current = 1 fA\n beta = 1e9\nend\n"                        \
            "model pnp pnp\n saturation_current = 1 fA\n beta = 1e9\nend\n"                        \
            "rail vcc 5 V\n"                                                                       \
            "npn Q1 c=n b=n e=gnd\nnpn Q2 c=p b=n e=e area=8\n"                                    \
            "resistor R e -> gnd " resistor "\n"                                                   \
            "pnp Q3 c=n b=p e=vcc\npnp Q4 c=p b=p e=vcc\npnp Q5 c=out b=p e=vcc\n"                 \
            "output out at 2 V from 0 V to 5 V\n"

/* Brokaw, IEEE J. Solid-State Circuits SC-9 (1974) 388: VREF = VBE + 2 (R1/R2) UT ln 8 */
#define BROKAW_CELL(ut, ratio)                                                                     \
    "let I = " ut "*ln(8)/1 kohm\n"                                                                \
    "let IS = I/(exp(0.65 V/(" ut ")) - 1)\n"                                                      \
    "model npn npn\n saturation_current = IS\n beta = 1e9\n bandgap = 1.205 V\n"                   \
    " saturation_exponent = 3.2\nend\n"                                                            \
    "rail vcc 5 V\n"                                                                               \
    "resistor RA vcc -> c1 20k\nresistor RB vcc -> c2 20k\n"                                       \
    "npn Q1 c=c1 b=ref e=e1 area=8\nnpn Q2 c=c2 b=ref e=e2\n"                                      \
    "resistor R2 e1 -> e2 1k\nresistor R1 e2 -> gnd 1k*" ratio "\n"                                \
    "opamp A1 out=ref plus=c2 minus=c1 gain=1e7 low=0 high=vcc\n"                                  \
    "resistor RL ref -> load 1Mohm\n"                                                              \
    "output load at 0 V from 0 V to 1 V\n"

static const struct published bandgap_cells[] = {
    {"B10 tempco of a PTAT current",
     VIEW_FULL,
     PTAT("1k"),
     {{"R.v", 25.85199979e-3 * 2.0794415417, 1e-8},
      {"out.tempco", 3300e-6, 5e-5},
      {"out.tempco", 1.0 / 300, 1e-8}}},
    {"B10 with a resistor of 1500 ppm/K",
     VIEW_FULL,
     PTAT("1k tempco=1500 ppm/K"),
     {{"out.tempco", 1833e-6, 5e-7}, {"out.tempco", 1.0 / 300 - 1500e-6, 1e-8}}},
    /* R1/R2 5.16205 for 1.205 V, VBE 0.65 V, 300 K */
    {"B11 Brokaw cell",
     VIEW_FULL,
     AT_300K BROKAW_CELL("25.85199978643 mV", "5.162049063"),
     {{"ref.v", 1.205, 5e-7}, {"Q2.vbe", 0.65, 2e-7}}},
    /* Gray and Meyer 4.4.3.2: no slope at VG0 + 2.2 UT = 1.262 V (UT 26 mV); R1/R2 makes the sum
     * with VBE 0.65 V, and a kelvin either way changes less than the curvature, 0.3 uV */
    {"B11 zero slope",
     VIEW_FULL,
     UT_26MV BROKAW_CELL("26 mV", "5.661653230976"),
     {{"ref.v", 1.262, 0.0005}, {"ref.v", 1.2622, 2e-7}}},
    {"B11 zero slope, a kelvin below",
     VIEW_FULL,
     "temperature 300.71747116030207 K\nmeasured_at 301.71747116030207 K\n" BROKAW_CELL(
         "26 mV", "5.661653230976"),
     {{"ref.v", 1.2622, 1e-6}}},
    {"B11 zero slope, a kelvin above",
     VIEW_FULL,
     "temperature 302.71747116030207 K\nmeasured_at 301.71747116030207 K\n" BROKAW_CELL(
         "26 mV", "5.661653230976"),
     {{"ref.v", 1.2622, 1e-6}}},
};

/* ---- group 4: diodes, Zener, JFET, resistors ---- */

#define ZENER(supply, load)                                                                        \
    "model zener diode\n breakdown_voltage = 6.7 V\n breakdown_current = 5 mA\n"                   \
    " breakdown_emission = 0.01\n series_resistance = 20\nend\n"                                   \
    "rail vcc " supply "\n"                                                                        \
    "resistor RS vcc -> o 500\n"                                                                   \
    "diode Z1 gnd -> o model=zener\n" load

#define BANWELL(volts)                                                                             \
    AT_300K "model diode diode\n saturation_current = 1e-14 A\nend\n"                              \
            "rail v " volts "\nresistor R v -> a 1k\ndiode D1 a -> gnd model=diode\n"

static const struct published part_cells[] = {
    /* Banwell and Jayakumar, Electronics Letters 36 (2000) 291 */
    {"D02 diode with resistor, 5 V",
     VIEW_FULL,
     BANWELL("5 V"),
     {{"D1.i", 4.30745637e-3, 5e-12}, {"D1.v", 0.69254363, 5e-9}}},
    {"D02 diode with resistor, 0.5 V",
     VIEW_FULL,
     BANWELL("0.5 V"),
     {{"D1.i", 2.2964240e-6, 5e-14}}},
    /* Sedra and Smith, example 3.4: 1 mA at 0.7 V, 0.1 V a decade; VD is printed cut to 0.762 */
    {"D03 diode iteration",
     VIEW_FULL,
     "let U = 0.1 V/ln(10)\n"
     "model diode diode\n saturation_current = 1 mA*exp(-0.7 V/U)\n"
     " emission = U/thermal_voltage\nend\n"
     "rail v 5 V\nresistor R v -> a 1k\ndiode D1 a -> gnd model=diode\n",
     {{"D1.i", 4.237e-3, 5e-7}, {"D1.v", 0.762, 0.001}, {"D1.v", 0.7627088308, 1e-6}}},
    /* Sedra and Smith, example 3.8: 6.8 V at 5 mA, rz 20 ohm */
    {"D04 Zener, no load",
     VIEW_FULL,
     ZENER("10 V", ""),
     {{"o.v", 6.83, 0.005}, {"o.v", 6.826923077, 1e-3}}},
    {"D04 Zener, one volt more",
     VIEW_FULL,
     ZENER("11 V", ""),
     {{"o.v", 6.826923077 + 0.0385, 1e-3}}},
    {"D04 Zener, 1 mA load",
     VIEW_FULL,
     ZENER("10 V", "current IL o -> gnd 1 mA\n"),
     {{"o.v", 6.826923077 - 0.020, 1e-3}, {"o.v", 6.826923077 - 0.01923076923, 1e-3}}},
    {"D04 Zener off, 500 ohm load",
     VIEW_FULL,
     ZENER("10 V", "resistor RL o -> gnd 500\n"),
     {{"o.v", 5, 0.05}}},
    /* common practice: 12 V, 2.0 V at 20 mA wants 500 ohm */
    {"D04 LED resistor",
     VIEW_FULL,
     "model led diode\n saturation_current = 20 mA*exp(-2 V/(2*thermal_voltage))\n emission = 2\n"
     "end\n"
     "rail v 12 V\nresistor R v -> a 500\ndiode D1 a -> gnd model=led\n",
     {{"R.i", 20e-3, 2e-5}, {"D1.v", 2.0, 0.001}}},
    /* da Silva, High Frequency and Microwave Engineering, ch. 6 problem 8 */
    {"D05 JFET self bias",
     VIEW_HAND,
     "model njfet njfet\n idss = 8 mA\n pinchoff = -6 V\nend\n"
     "rail vdd 24 V\n"
     "resistor RD vdd -> d 4500\nresistor RS s -> gnd 1500\nnjfet J1 d=d g=gnd s=s\n",
     {{"J1.id", 2e-3, 1e-12}, {"J1.vgs", -3, 1e-9}, {"J1.vds", 12, 1e-8}}},
    /* Boylestad and Nashelsky, fixed-bias example 7.1. With its 2 kohm the drain would stand at
     * 4.75 V, below VGS - VP = 6 V: the book's saturation formula does not apply there, so its
     * current is checked with 1 kohm (drain at 10.375 V) */
    {"D05 JFET fixed bias",
     VIEW_HAND,
     "model njfet njfet\n idss = 10 mA\n pinchoff = -8 V\nend\n"
     "rail vdd 16 V\nrail vgg -2 V\n"
     "resistor RD vdd -> d 1k\nnjfet J1 d=d g=vgg s=gnd\n",
     {{"J1.id", 5.625e-3, 5e-7}, {"J1.vds", 10.375, 5e-4}}},
    /* tempco by its definition; IEC 60028: annealed copper 3.93e-3/K at 20 C */
    {"D06 10 kohm of 100 ppm/K at 125 C",
     VIEW_FULL,
     "temperature 125 C\nmeasured_at 25 C\n"
     "rail v 1 V\nresistor R v -> gnd 10k tempco=100 ppm/K\n",
     {{"R.i", 1 / 10100.0, 1e-14}}},
    {"D06 copper at 100 C",
     VIEW_FULL,
     "temperature 100 C\nmeasured_at 20 C\n"
     "rail v 1 V\nresistor R v -> gnd 1k tempco=0.00393/K\n",
     {{"R.i", 1e-3 / 1.3144, 1e-12}}},
    /* IEC 60539: B25/85 3977 K; k/q is 86.17333262 uV/K */
    {"D06 NTC at 85 C",
     VIEW_FULL,
     "temperature 85 C\n"
     "let T = thermal_voltage/86.17333262145 uV\n"
     "let R85 = 10 kohm*exp(3977*(1/T - 1/298.15))\n"
     "rail v 1 V\nlaw R v -> gnd i = v.v/R85\n",
     {{"R.i", 1 / 1070.31, 0.005 / 1070.31 / 1070.31}}},
};

/* ---- the runner ---- */

static bool is_row(const struct published *cell, int row)
{
    return row < ROW_LIMIT && cell->rows[row].quantity != NULL;
}

/* Number of the `hand` line of a row: rows of one quantity (published rounded, and exact) share it.
 */
static int hand_of(const struct published *cell, int row, bool *is_first)
{
    int hand = 0;
    for (int k = 0; k < row; k++) {
        bool first = true;
        const int before = hand_of(cell, k, &first);
        if (strcmp(cell->rows[k].quantity, cell->rows[row].quantity) == 0) {
            *is_first = false;
            return before;
        }
        hand += first ? 1 : 0;
    }
    *is_first = true;
    return hand;
}

/* The cell's text with one `hand` line a quantity: the review computes them for us. */
static void compose(const struct published *cell, char *text, size_t size)
{
    int length = snprintf(text, size, "%s", cell->text);
    for (int k = 0; is_row(cell, k); k++) {
        bool is_first = true;
        (void)hand_of(cell, k, &is_first);
        if (!is_first) {
            continue;
        }
        length += snprintf(text + length, size - (size_t)length, "hand %s = %.17g\n",
                           cell->rows[k].quantity, cell->rows[k].published);
    }
    assert_true((size_t)length < size);
}

static void published_holds(void **state)
{
    const struct published *cell = *state;
    static char text[TEXT_LIMIT];
    compose(cell, text, sizeof text);
    struct cell_run run;
    int failures = 0;
    if (!cell_run_open(&run, cell->name, text, cell->view, NAN)) {
        failures++;
    } else {
        for (int k = 0; is_row(cell, k); k++) {
            bool is_first = true;
            const struct hand_result *hand = &run.result->hands[hand_of(cell, k, &is_first)];
            const struct row *row = &cell->rows[k];
            if (!(fabs(hand->computed - row->published) <= row->tolerance)) {
                fprintf(stderr, "    %s: %s is %.12g, published %.12g +- %.2g\n", cell->name,
                        row->quantity, hand->computed, row->published, row->tolerance);
                failures++;
            }
        }
    }
    cell_run_close(&run);
    assert_int_equal(failures, 0);
}

#define TABLE(list)                                                                                \
    {                                                                                              \
        list, sizeof(list) / sizeof((list)[0])                                                     \
    }

static const struct {
    const struct published *list;
    size_t count;
} tables[] = {TABLE(mos_cells),    TABLE(weak_cells),       TABLE(mirror_cells),
              TABLE(widlar_cells), TABLE(resistance_cells), TABLE(bandgap_cells),
              TABLE(part_cells)};

/* Every row with the program's answer, for docs/accuracy.md. */
static int print_table(void)
{
    int failures = 0;
    printf("%-38s %-15s %14s %10s %14s\n", "", "quantity", "published", "tolerance", "ours");
    for (size_t t = 0; t < sizeof tables / sizeof tables[0]; t++) {
        for (size_t c = 0; c < tables[t].count; c++) {
            const struct published *cell = &tables[t].list[c];
            static char text[TEXT_LIMIT];
            struct cell_run run;
            compose(cell, text, sizeof text);
            if (!cell_run_open(&run, cell->name, text, cell->view, NAN)) {
                failures++;
            }
            for (int k = 0; run.result != NULL && is_row(cell, k); k++) {
                const struct row *row = &cell->rows[k];
                bool is_first = true;
                const int hand = hand_of(cell, k, &is_first);
                printf("%-38s %-15s %14.7g %10.2g %14.7g\n", k == 0 ? cell->name : "",
                       row->quantity, row->published, row->tolerance,
                       run.result->hands[hand].computed);
            }
            cell_run_close(&run);
        }
    }
    return failures;
}

int main(int argc, char **argv)
{
    if (argc > 1 && strcmp(argv[1], "--table") == 0) {
        return print_table();
    }
    static struct CMUnitTest tests[100];
    static struct published cells[100];
    size_t count = 0;
    for (size_t t = 0; t < sizeof tables / sizeof tables[0]; t++) {
        for (size_t k = 0; k < tables[t].count; k++, count++) {
            cells[count] = tables[t].list[k];
            tests[count] = (struct CMUnitTest){.name = cells[count].name,
                                               .test_func = published_holds,
                                               .initial_state = &cells[count]};
        }
    }
    return _cmocka_run_group_tests("published cells", tests, count, NULL, NULL) == 0 ? 0 : 1;
}
