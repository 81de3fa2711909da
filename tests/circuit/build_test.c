/* build_test.c: cells to circuits: values, names, blocks, models, corners, laws, tables. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

#include <cmocka.h>

#include "check.h"
#include "circuit_fixture.h"
#include "devices/curve.h"
#include "language/parser.h"
#include "language/source.h"

static const struct circuit *open_good(struct bench *bench, const char *text,
                                       const struct circuit_settings *settings)
{
    bench_open(bench, "cell", text, settings);
    if (bench->status != STATUS_OK) {
        print_error("%s", bench->out.data == NULL ? "no message\n" : bench->out.data);
        fail();
    }
    return bench->circuit;
}

static const struct instance *part(const struct circuit *c, const char *name)
{
    const int k = circuit_find_instance(c, name);
    if (k < 0) {
        print_error("no part %s\n", name);
        fail();
    }
    return &c->instances[k];
}

static double own(const struct circuit *c, const char *name, const char *parameter)
{
    const struct instance *instance = part(c, name);
    const int p =
        parameter_find(instance->type->parameters, instance->type->parameter_count, parameter);
    assert_true(p >= 0);
    return instance->own[p];
}

static double of_model(const struct circuit *c, const char *name, const char *parameter)
{
    const struct instance *instance = part(c, name);
    const int p = parameter_find(instance->type->model_parameters,
                                 instance->type->model_parameter_count, parameter);
    assert_true(p >= 0);
    return instance->model_values[p];
}

/* The node a terminal is joined to. */
static const char *at(const struct circuit *c, const char *name, int terminal)
{
    const int unknown = part(c, name)->outer[terminal];
    return c->nodes[unknown + 1].name;
}

#define MODELS                                                                                     \
    "model nch nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\nend\n"                              \
    "model pch pmos\n threshold = 0.6 V\n kprime = 60 uA/V^2\nend\n"

/* --- lets and settings ------------------------------------------------------------------------ */

static void test_lets(void **state)
{
    (void)state;
    static const char text[] = "resistor R1 vdd -> gnd VREF/IB   # used before it is defined\n"
                               "let VREF = 2*VHALF\n"
                               "let VHALF = 0.6 V\n"
                               "let IB = 12 uA\n"
                               "rail vdd 3 V\n"
                               "resistor R2 vdd -> gnd thermal_voltage/1uA*ln(8)\n"
                               "temperature 85 C\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    check_near(own(c, "R1", "resistance"), 1e5, 1e-15); /* 1.2 V / 12 uA */
    check_near(c->kelvin, 358.15, 1e-15);
    /* k T / q ln 8 with the exact constants of the SI */
    check_near(own(c, "R2", "resistance"),
               1.380649e-23 / 1.602176634e-19 * 358.15 * 3 * 0.69314718055994530942 / 1e-6, 1e-14);
    bench_close(&bench);
    const struct set_value sets[] = {
        {.name = "VHALF", .value = {.value = 0.3, .dimension = DIMENSION_VOLTAGE}},
        {.name = "IB", .value = {.value = 6e-6, .bare = true}}};
    const struct circuit_settings settings = {.sets = sets, .set_count = 2, .kelvin = 233.15};
    c = open_good(&bench, text, &settings);
    check_near(own(c, "R1", "resistance"), 1e5, 1e-15); /* 0.6 V / 6 uA */
    check_near(c->kelvin, 233.15, 1e-15);
    bench_close(&bench);
}

/* --- parts -------------------------------------------------------------------------------------
 */

static void test_terminals(void **state)
{
    (void)state;
    static const char text[] = MODELS "rail vdd 3 V\nrail vee -2 V\n"
                                      "nmos M1 s=x g=vdd W=2u L=1u d=y\n"
                                      "pmos M2 d=y g=x s=vdd L=1u W=3u m=4\n"
                                      "nmos M3 d=y g=x s=gnd b=vee W=1u L=1u\n"
                                      "pmos M4 d=x g=x s=vdd b=x W=1u L=1u\n"
                                      "nmos M5 d=y g=x s=gnd conduction=1 mA/V^2 threshold=0.4 V\n"
                                      "resistor R1 x -> gnd 4k7\nresistor R2 y -> gnd 1M5\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    assert_string_equal(at(c, "M1", 0), "y");
    assert_string_equal(at(c, "M1", 1), "vdd");
    assert_string_equal(at(c, "M1", 2), "x");
    assert_string_equal(at(c, "M1", 3), "gnd"); /* bulk of an nmos */
    assert_string_equal(at(c, "M2", 3), "vdd"); /* of a pmos: the one positive rail */
    assert_string_equal(at(c, "M3", 3), "vee");
    assert_string_equal(at(c, "M4", 3), "x");
    check_near(own(c, "M2", "W"), 3e-6, 1e-15);
    check_near(own(c, "M2", "m"), 4, 0);
    check_near(own(c, "M5", "conduction"), 1e-3, 1e-15);
    check_near(own(c, "M5", "slope"), 1.3, 0); /* docs/devices.md */
    check_near(own(c, "R1", "resistance"), 4700, 0);
    check_near(own(c, "R2", "resistance"), 1.5e6, 0);
    /* unknowns: x, y, vdd, vee and the branch currents of the two rails */
    assert_int_equal(c->node_count, 5);
    assert_int_equal(c->unknown_count, 6);
    bench_close(&bench);
}

/* Limits of an opamp are values or nodes; a let wins over a node of the same name. */
static void test_opamp(void **state)
{
    (void)state;
    static const char text[] = "let top = 2.5 V\nrail vdd 3 V\nrail vee -3 V\nrail top 4 V\n"
                               "opamp A1 out=a plus=vdd minus=a gain=1e5 high=vdd low=vee\n"
                               "opamp A2 out=b plus=vdd minus=b gain=1e5 high=top low=0\n"
                               "opamp A3 out=c plus=vdd minus=c gain=1e5 high=2*top low=vee\n"
                               "resistor R1 top -> gnd 1k\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    assert_string_equal(at(c, "A1", 3), "vdd");
    assert_string_equal(at(c, "A1", 4), "vee");
    assert_true(isnan(own(c, "A1", "high")));
    assert_string_equal(at(c, "A2", 3), "gnd");
    check_near(own(c, "A2", "high"), 2.5, 0);
    check_near(own(c, "A2", "low"), 0, 0);
    check_near(own(c, "A3", "high"), 5, 0);
    assert_string_equal(at(c, "A3", 4), "vee");
    bench_close(&bench);
}

/* Series resistances of a model make one hidden node and one hidden part each, divided by area*m.
 */
static void test_series(void **state)
{
    (void)state;
    static const char text[] = "model q npn\n base_resistance = 300\n emitter_resistance = 6\nend\n"
                               "rail vcc 5 V\nresistor R1 vcc -> b 100k\n"
                               "npn Q1 c=vcc b=b e=gnd area=2 m=3\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    const struct instance *base = part(c, "Q1"), *hidden = NULL;
    assert_true(base->local[1] != base->outer[1]);
    assert_true(base->local[2] != base->outer[2]);
    assert_int_equal(base->local[0], base->outer[0]);
    assert_true(c->nodes[base->local[1] + 1].is_hidden);
    int found = 0;
    for (int k = 0; k < c->instance_count; k++) {
        if (c->instances[k].parent >= 0) {
            assert_true(c->instances[k].is_hidden);
            hidden = &c->instances[k];
            check_near(hidden->own[0], found == 0 ? 50 : 1, 1e-15); /* 300/6, 6/6 */
            found++;
        }
    }
    assert_int_equal(found, 2);
    bench_close(&bench);
}

/* --- blocks ------------------------------------------------------------------------------------
 */

static void test_blocks(void **state)
{
    (void)state;
    static const char text[] = "let RU = 1k\n"
                               "block half top mid R=2*RU scale=1\n"
                               "  let RR = R*scale\n"
                               "  resistor R1 top -> mid RR\n"
                               "  resistor R2 mid -> inner RR/2\n"
                               "  resistor R3 inner -> gnd RU\n"
                               "end\n"
                               "block pair in out R=3k\n"
                               "  use half A top=in mid=joint R=R\n"
                               "  use half B top=joint mid=out scale=3\n"
                               "  resistor R1 joint -> out R\n"
                               "end\n"
                               "rail vdd 3 V\n"
                               "use pair X1 in=vdd out=o R=5k\n"
                               "use pair X2 out=o in=vdd\n"
                               "use half X3 top=gnd mid=o\n"
                               "resistor R1 o -> gnd 1k\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    check_near(own(c, "X1.A.R1", "resistance"), 5e3, 1e-15);
    check_near(own(c, "X1.A.R2", "resistance"), 2.5e3, 1e-15);
    check_near(own(c, "X1.B.R1", "resistance"), 6e3, 1e-15); /* its own default, three times */
    check_near(own(c, "X1.B.R3", "resistance"), 1e3, 1e-15);
    check_near(own(c, "X1.R1", "resistance"), 5e3, 1e-15);
    check_near(own(c, "X2.A.R1", "resistance"), 3e3, 1e-15);
    assert_string_equal(at(c, "X1.A.R1", 0), "vdd");
    assert_string_equal(at(c, "X1.A.R1", 1), "X1.joint");
    assert_string_equal(at(c, "X1.B.R1", 0), "X1.joint");
    assert_string_equal(at(c, "X1.B.R1", 1), "o");
    assert_string_equal(at(c, "X1.B.R2", 1), "X1.B.inner");
    assert_string_equal(at(c, "X3.R1", 0), "gnd");
    struct probe probe;
    assert_true(circuit_probe(c, "X1.A.R1.i", SPAN_NONE, &bench.cell->diagnostics, &probe));
    assert_true(circuit_probe(c, "X1.B.inner.v", SPAN_NONE, &bench.cell->diagnostics, &probe));
    struct knob knob;
    assert_true(circuit_knob(c, "X1.A.R1", SPAN_NONE, &bench.cell->diagnostics, &knob));
    assert_int_equal(knob.kind, KNOB_VALUE);
    bench_close(&bench);
}

/* --- models and corners ------------------------------------------------------------------------
 */

static void test_default_model(void **state)
{
    (void)state;
    /* of two models of a kind the one that is named like the kind is taken */
    static const char text[] = "model other nmos\n threshold = 0.3 V\n kprime = 100 uA/V^2\nend\n"
                               "model nmos nmos\n threshold = 0.4 V\n kprime = 100 uA/V^2\nend\n"
                               "rail vdd 3 V\n"
                               "nmos M1 d=vdd g=vdd s=gnd W=1u L=1u\n"
                               "nmos M2 d=vdd g=vdd s=gnd W=1u L=1u model=other\n"
                               "diode D1 vdd -> gnd\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    check_near(of_model(c, "M1", "threshold"), 0.4, 0);
    check_near(of_model(c, "M2", "threshold"), 0.3, 0);
    /* left out: the defaults of docs/devices.md */
    check_near(of_model(c, "M1", "phi"), 0.8, 0);
    check_near(of_model(c, "M1", "threshold_tempco"), -1e-3, 0);
    assert_true(isnan(of_model(c, "M1", "early")));
    check_near(of_model(c, "D1", "saturation_current"), 10e-15, 0);
    assert_null(part(c, "D1")->model);
    bench_close(&bench);
}

static void test_corners(void **state)
{
    (void)state;
    static const char text[] = MODELS "let SHIFT = 40 mV\n"
                                      "corner fast\n nch.threshold += -SHIFT\n nch.kprime *= 1.2\n"
                                      " pch.threshold += -0.1 V\n resistor.value *= 0.9\nend\n"
                                      "corner slow\n nch.kprime *= 80%\nend\n"
                                      "corner slow\n resistor.value *= 1.25\nend\n"
                                      "rail vdd 3 V\nresistor R1 vdd -> gnd 1k\n"
                                      "nmos M1 d=vdd g=vdd s=gnd W=1u L=1u\n"
                                      "pmos M2 d=gnd g=gnd s=vdd W=1u L=1u\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    check_near(of_model(c, "M1", "threshold"), 0.5, 0);
    check_near(c->resistor_factor, 1, 0);
    assert_int_equal(c->corner_count, 2); /* two files may both say something about one corner */
    bench_close(&bench);
    const struct circuit_settings fast = {.kelvin = NAN, .corner = "fast"};
    c = open_good(&bench, text, &fast);
    check_near(of_model(c, "M1", "threshold"), 0.46, 1e-15);
    check_near(of_model(c, "M1", "kprime"), 240e-6, 1e-15);
    check_near(of_model(c, "M2", "threshold"), 0.5, 1e-15);
    check_near(c->resistor_factor, 0.9, 0);
    bench_close(&bench);
    const struct circuit_settings slow = {.kelvin = NAN, .corner = "slow"};
    c = open_good(&bench, text, &slow);
    check_near(of_model(c, "M1", "kprime"), 160e-6, 1e-15);
    check_near(c->resistor_factor, 1.25, 0);
    bench_close(&bench);
}

static void test_valid_range(void **state)
{
    (void)state;
    static const char text[] = "measured_at 25 C\nvalid temperature from -40 C to 125 C\n"
                               "valid L from 180 nm to 20 um\n" MODELS "rail vdd 3 V\n"
                               "nmos M1 d=vdd g=vdd s=gnd W=1u L=1u\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    const struct model *model = part(c, "M1")->model;
    check_near(model->measured_kelvin, 298.15, 1e-15);
    check_near(model->valid_kelvin[0], 233.15, 1e-15);
    check_near(model->valid_kelvin[1], 398.15, 1e-15);
    check_near(model->valid_length[0], 180e-9, 1e-15);
    check_near(model->valid_length[1], 20e-6, 1e-15);
    assert_true(isnan(model->valid_width[0]));
    check_near(c->kelvin, 300.15, 1e-15); /* the cell's own, 27 C */
    bench_close(&bench);
}

/* --- laws --------------------------------------------------------------------------------------
 */

/* The current of a law between two nodes whose inputs are all at `volts`. */
static double law_current(const char *expression, double volts)
{
    char text[400];
    struct bench bench;
    (void)snprintf(text, sizeof text,
                   "let KA = 2 mA/V^2\nlet N = 3\nrail x 1 V\nlaw G1 x -> gnd i = %s\n",
                   expression);
    const struct circuit *c = open_good(&bench, text, NULL);
    const struct instance *law = part(c, "G1");
    const struct device_conditions conditions = {300.15, 300.15, EFFECTS_FULL};
    const struct device_values values = {law->own, NULL, law->extra, 1};
    long double prepared[64], x[8] = {0}, f[8], jac[64];
    assert_true(law->type->prepared_size <= sizeof prepared);
    law->type->prepare(&values, &conditions, prepared);
    for (int l = 0; l < law->local_count; l++) {
        x[l] = law->local[l] < 0 ? 0 : volts;
    }
    law->type->evaluate_extended(prepared, x, f, jac);
    bench_close(&bench);
    return (double)f[0];
}

/* Values worked by hand; the law expression is a postfix program inside. */
static void test_laws(void **state)
{
    (void)state;
    static const struct {
        const char *expression;
        double volts, amperes;
    } rows[] = {
        {"KA*x.v^2", 1.5, 4.5e-3},
        {"KA*(x.v - 0.5 V)^2/2", 1.5, 1e-3},
        {"-x.v/2 kohm", 3, -1.5e-3},
        {"1 uA*(exp(x.v/thermal_voltage) - 1)", 0, 0},
        {"1 uA*exp(ln(x.v/1V)*2)", 3, 9e-6},
        {"1 mA*log10(x.v/1mV)", 1, 3e-3},
        {"1 mA*sqrt(x.v*4V)/1V", 4, 4e-3},
        {"max(1 mA, x.v/1kohm, 2 mA)", 3, 3e-3},
        {"min(1 mA, x.v/1kohm)", 3, 1e-3},
        {"1 mA*abs(x.v - 2V)/1V", 0.5, 1.5e-3},
        {"1 mA*(x.v/1V)^N", 2, 8e-3},
        {"1 mA*2^(x.v/1V)", 3, 8e-3},
        {"1 mA*(x.v - gnd.v)/1V - 0.5mA", 2, 1.5e-3},
        {"1 mA + 2 mA", 7, 3e-3},
        {"x.v/1kohm - x.v/2kohm - x.v/4kohm", 4, 1e-3}, /* left to right */
        {"1 mA*2^3^(x.v/1V)", 2, 0.512},                /* right to left: 2^9 */
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        print_message("%s\n", rows[k].expression);
        check_near(law_current(rows[k].expression, rows[k].volts), rows[k].amperes, 2e-15);
    }
}

/* --- tables ------------------------------------------------------------------------------------
 */

static const struct curve *curve_of(const struct circuit *c, const char *name)
{
    return part(c, name)->extra;
}

/* Unsorted rows, a header, comments, CRLF, a missing last newline, exponents and signs. */
static void test_tables(void **state)
{
    (void)state;
    static const char csv[] = "# lamp, two readings\r\nvolts, amperes\r\n2.0, 3e-3\r\n\r\n"
                              " -1,-1E-3\r\n# note\r\n0,0\r\n+1 , 2e-3\r\n1.5,2.5e-3";
    char path[] = "/tmp/ampstead-table-XXXXXX", text[200];
    const int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    assert_true(write(descriptor, csv, sizeof csv - 1) == (ssize_t)(sizeof csv - 1));
    assert_int_equal(close(descriptor), 0);
    (void)snprintf(text, sizeof text,
                   "rail x 1 V\ntable T1 x -> gnd \"%s\"\ntable T2 gnd -> x \"%s\"\n", path, path);
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    const struct curve *curve = curve_of(c, "T1");
    static const double v[] = {-1, 0, 1, 1.5, 2}, i[] = {-1e-3, 0, 2e-3, 2.5e-3, 3e-3};
    assert_int_equal(curve->count, 5);
    for (int k = 0; k < 5; k++) {
        check_near(curve->v[k], v[k], 0);
        check_near(curve->i[k], i[k], 0);
    }
    assert_int_equal(c->cell->sources.count, 2); /* the cell, and the table once */
    bench_close(&bench);
    assert_int_equal(remove(path), 0);
}

/* --- probes and knobs --------------------------------------------------------------------------
 */

static void test_probes(void **state)
{
    (void)state;
    static const char text[] = MODELS "let IB = 1 uA\nrail vdd 3 V\ncurrent I1 vdd -> ref IB\n"
                                      "nmos M1 d=ref g=ref s=gnd W=1u L=1u\n"
                                      "nmos M2 d=tail g=ref s=gnd W=1u L=1u\n"
                                      "output tail at 1 V from 0 V to 3 V within 3%\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    static const struct {
        const char *name;
        enum probe_kind kind;
    } probes[] = {
        {"tail.current", PROBE_OUTPUT}, {"tail.v", PROBE_NODE},  {"vdd.current", PROBE_RAIL},
        {"vdd.v", PROBE_RAIL},          {"M1.id", PROBE_DEVICE}, {"all.headroom", PROBE_ALL},
        {"cell.power", PROBE_CELL},     {"ref.v", PROBE_NODE},   {"I1.v", PROBE_DEVICE}};
    for (size_t k = 0; k < sizeof probes / sizeof probes[0]; k++) {
        struct probe probe;
        assert_true(circuit_probe(c, probes[k].name, SPAN_NONE, &bench.cell->diagnostics, &probe));
        assert_int_equal(probe.kind, probes[k].kind);
        assert_string_equal(probe.text, probes[k].name);
    }
    static const struct {
        const char *name;
        enum knob_kind kind;
    } knobs[] = {{"temperature", KNOB_TEMPERATURE},
                 {"IB", KNOB_LET},
                 {"vdd", KNOB_VALUE},
                 {"tail", KNOB_VALUE},
                 {"I1", KNOB_VALUE},
                 {"M1.W", KNOB_VALUE},
                 {"M2.m", KNOB_VALUE}};
    for (size_t k = 0; k < sizeof knobs / sizeof knobs[0]; k++) {
        struct knob knob;
        assert_true(circuit_knob(c, knobs[k].name, SPAN_NONE, &bench.cell->diagnostics, &knob));
        assert_int_equal(knob.kind, knobs[k].kind);
    }
    check_near(c->outputs[0].within, 0.03, 1e-15);
    bench_close(&bench);
}

/* A let without a unit takes sweeps and conditions in the unit that its use wants. */
static void test_bare_let_range(void **state)
{
    (void)state;
    static const char text[] = "let R = 10k\nrail vdd 3 V\nresistor R1 vdd -> gnd R\n"
                               "vary R from 5 kohm to 20 kohm\n"
                               "sweep R from 5k to 20k show R1.i for vdd = 2 V 3 V\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    check_near(c->conditions[0].from, 5e3, 0);
    check_near(c->sweeps[0].to, 20e3, 0);
    assert_int_equal(c->sweeps[0].family_count, 2);
    bench_close(&bench);
}

static void test_requests(void **state)
{
    (void)state;
    static const char text[] = "title \"a divider\"\nrail vdd 3 V\nresistor R1 vdd -> m 1k\n"
                               "resistor R2 m -> gnd 1k\n"
                               "require  m.v   within 2%   of 1.5 V\n"
                               "require m.v within 10 mV of 1.5 V for 99%\n"
                               "require R1.i below \\\n  2 mA everywhere\n"
                               "quiet touch-voltage m\nchoose R1 from 500 to 2k so m.v = 1 V\n";
    struct bench bench;
    const struct circuit *c = open_good(&bench, text, NULL);
    assert_string_equal(c->title, "a divider");
    assert_string_equal(c->requirements[0].text, "require m.v within 2% of 1.5 V");
    check_near(c->requirements[0].tolerance, 0.03, 1e-15);
    check_near(c->requirements[1].tolerance, 0.01, 1e-15);
    assert_true(isnan(c->requirements[1].tolerance_share));
    assert_int_equal(c->requirements[1].scope, SCOPE_YIELD);
    check_near(c->requirements[1].yield, 0.99, 1e-15);
    assert_string_equal(c->requirements[2].text, "require R1.i below 2 mA everywhere");
    assert_int_equal(c->requirements[2].scope, SCOPE_EVERYWHERE);
    assert_int_equal(c->choice_count, 1);
    bench_close(&bench);
}

/* Names that differ in case only: a caution with both, silenced by its code. */
static void test_case_names(void **state)
{
    (void)state;
    struct bench bench;
    const struct circuit *c =
        open_good(&bench,
                  "rail vdd 3 V\nresistor R1 vdd -> Tail 1k\nresistor R2 Tail -> tail 1k\n"
                  "resistor R3 tail -> gnd 1k\n",
                  NULL);
    assert_int_equal(c->cautions.count, 1);
    assert_string_equal(c->cautions.list[0].code, "case-names");
    assert_string_equal(c->cautions.list[0].text, "'Tail' and 'tail' differ only in case");
    assert_int_equal(c->cautions.list[0].line, 3);
    bench_close(&bench);
    c = open_good(&bench,
                  "rail vdd 3 V\nresistor R1 vdd -> Tail 1k\nresistor R2 Tail -> tail 1k\n"
                  "resistor R3 tail -> gnd 1k\nquiet case-names\n",
                  NULL);
    assert_int_equal(c->cautions.count, 0);
    bench_close(&bench);
}

/* 1e4 parts and nodes: the checks stay linear. */
static void test_large(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "rail n0 3 V\n");
    for (int k = 0; k < 10000; k++) {
        buffer_format(&text, "resistor R%d n%d -> n%d 1k\n", k, k, k + 1);
    }
    buffer_text(&text, "resistor RZ n10000 -> gnd 1k\n");
    assert_false(text.failed);
    struct bench bench;
    const struct circuit *c = open_good(&bench, text.data, NULL);
    assert_int_equal(c->node_count, 10002);
    assert_int_equal(circuit_find_node(c, "n9999"), circuit_find_node(c, "n9998") + 1);
    char name[100];
    circuit_unknown_name(c, 0, name, sizeof name);
    assert_string_equal(name, "node n0");
    circuit_unknown_name(c, c->unknown_count - 1, name, sizeof name);
    assert_string_equal(name, "current of n0");
    bench_close(&bench);
    buffer_free(&text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_lets),     cmocka_unit_test(test_terminals),
        cmocka_unit_test(test_opamp),    cmocka_unit_test(test_series),
        cmocka_unit_test(test_blocks),   cmocka_unit_test(test_default_model),
        cmocka_unit_test(test_corners),  cmocka_unit_test(test_valid_range),
        cmocka_unit_test(test_laws),     cmocka_unit_test(test_tables),
        cmocka_unit_test(test_probes),   cmocka_unit_test(test_bare_let_range),
        cmocka_unit_test(test_requests), cmocka_unit_test(test_case_names),
        cmocka_unit_test(test_large),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
