/*
 * report_fixture.h: a result made by hand, so that the reports are tested without a solver. Its
 * figures are invented and only have to come out again as they went in.
 */
#ifndef TESTS_REPORT_FIXTURE_H
#define TESTS_REPORT_FIXTURE_H

#include <math.h>
#include <string.h>

#include "report/report.h"

enum { FIXTURE_POINTS = 61 };

static const struct quantity_row fixture_mos_rows[] = {
    {"id", {0, 12, 0, 0}, "drain current"},
    {"vgs", {12, 0, 0, 0}, "gate-source voltage"},
    {"vds", {12, 0, 0, 0}, "drain-source voltage"},
    {"inversion", {0, 0, 0, 0}, "inversion coefficient"},
    {"headroom", {12, 0, 0, 0}, "vds minus vdsat"},
    {"gm", {-12, 12, 0, 0}, "transconductance"},
};
static const struct quantity_row fixture_part_rows[] = {
    {"i", {0, 12, 0, 0}, "current"},
    {"v", {12, 0, 0, 0}, "voltage"},
    {"power", {12, 12, 0, 0}, "dissipated power"},
};
static const struct device_type fixture_nmos = {
    .word = "nmos",
    .is_transistor = true,
    .quantities = fixture_mos_rows,
    .quantity_count = 6,
    .quantity_current = 0,
    .quantity_headroom = 4,
    .quantity_power = -1,
};
static const struct device_type fixture_resistor = {
    .word = "resistor",
    .quantities = fixture_part_rows,
    .quantity_count = 3,
    .quantity_current = 0,
    .quantity_headroom = -1,
    .quantity_power = 2,
};

struct fixture {
    struct cell cell;
    struct source_file file;
    struct process_source process;
    struct circuit circuit;
    struct node nodes[4];
    struct instance instances[4];
    struct rail rails[1];
    struct output outputs[1];
    struct hand_line hands[2];
    struct requirement requirements[4];
    struct caution cautions[1];
    struct result result;
    double x[3];
    double q[4][6];
    struct device_result devices[4];
    struct rail_result rail_results[1];
    double line[1];
    double v[FIXTURE_POINTS], current[FIXTURE_POINTS];
    struct sweep_event events[1];
    struct output_result output_results[1];
    struct hand_result hand_results[2];
    struct requirement_result requirement_results[4];
    struct probe shown[2];
    struct sweep sweep;
    double knob[3], values[6];
    struct sweep_series series[1];
    struct sweep_table tables[1];
};

static const char fixture_text[] =
    "title \"soil logger\"\n\nrequire tail.current within 2% of ITAIL\n";

static void fixture_circuit(struct fixture *f)
{
    f->file = (struct source_file){"tail.cell", fixture_text, sizeof fixture_text - 1};
    f->process = (struct process_source){.name = "n180.process"};
    f->cell.path = "tail.cell";
    f->cell.sources = (struct source_set){&f->file, 1, 1};
    f->cell.processes = &f->process;
    f->cell.process_count = 1;
    f->nodes[0].name = "gnd";
    f->nodes[1].name = "vbat";
    f->nodes[2].name = "ref";
    f->nodes[3].name = "tail";
    f->instances[0] = (struct instance){.name = "RB", .type = &fixture_resistor};
    f->instances[1] = (struct instance){.name = "M1", .type = &fixture_nmos};
    f->instances[2] = (struct instance){.name = "M2", .type = &fixture_nmos};
    f->instances[3] = (struct instance){.name = "RE", .type = &fixture_resistor};
    f->rails[0] = (struct rail){.name = "vbat", .volts = 3.0};
    f->outputs[0] =
        (struct output){.name = "tail", .at = 1.2, .from = 0.0, .to = 3.0, .within = 0.01};
    f->hands[0] = (struct hand_line){
        .probe = {PROBE_OUTPUT, 0, OUTPUT_CURRENT, {0, 12, 0, 0}, "tail.current"}, .value = 800e-9};
    f->hands[1] =
        (struct hand_line){.probe = {PROBE_DEVICE, 1, 1, {12, 0, 0, 0}, "M1.vgs"}, .value = 0.62};
    f->circuit = (struct circuit){
        .cell = &f->cell,
        .title = "soil logger, input-pair tail",
        .kelvin = 300.15,
        .nodes = f->nodes,
        .node_count = 4,
        .instances = f->instances,
        .instance_count = 4,
        .rails = f->rails,
        .rail_count = 1,
        .outputs = f->outputs,
        .output_count = 1,
    };
}

static void fixture_requirements(struct fixture *f)
{
    static const struct dimension ampere = {0, 12, 0, 0}, volt = {12, 0, 0, 0},
                                  ohm = {12, -12, 0, 0};
    f->requirements[0] = (struct requirement){
        .probe = {PROBE_OUTPUT, 0, OUTPUT_CURRENT, ampere, "tail.current"},
        .relation = RELATION_WITHIN,
        .value = 800e-9,
        .text = "require tail.current within 2.5% of ITAIL",
        .where = {0, 21, 30},
    };
    f->requirements[1] = (struct requirement){
        .probe = {PROBE_OUTPUT, 0, OUTPUT_COMPLIANCE, volt, "tail.compliance"},
        .relation = RELATION_BELOW,
        .value = 0.15,
        .text = "require tail.compliance below 150 mV",
        .where = {0, 21, 30},
    };
    f->requirements[2] = (struct requirement){
        .probe = {PROBE_OUTPUT, 0, OUTPUT_RESISTANCE, ohm, "tail.resistance"},
        .relation = RELATION_ABOVE,
        .value = 50e6,
        .text = "require tail.resistance above 50 Mohm",
        .where = {0, 21, 30},
    };
    f->requirements[3] = (struct requirement){
        .probe = {PROBE_OUTPUT, 0, OUTPUT_CURRENT, ampere, "tail.current"},
        .relation = RELATION_WITHIN,
        .value = 800e-9,
        .scope = SCOPE_YIELD,
        .text = "require tail.current within 5% of ITAIL for 99.7%",
        .where = {0, 21, 30},
    };
    const struct requirement_result results[] = {
        {&f->requirements[0], 816.4e-9, JUDGED_MET, 3.6e-9, NULL, NULL, NULL},
        {&f->requirements[1], 0.1803, JUDGED_NOT_MET, -0.0303, NULL, NULL, NULL},
        {&f->requirements[2], 82.41e6, JUDGED_MET, 32.41e6, NULL, NULL, NULL},
        {&f->requirements[3], NAN, JUDGED_NOT, NAN, NULL, NULL, NULL},
    };
    memcpy(f->requirement_results, results, sizeof results);
}

static void fixture_point(struct fixture *f)
{
    static const double q[4][6] = {
        {714.2e-9, 2.357, 1.683e-6},
        {714.2e-9, 0.6431, 0.6431, 4.21, 0.4702, 9.81e-6},
        {816.4e-9, 0.6047, 1.162, 1.13, 1.018, 15.2e-6},
        {816.4e-9, 0.03837, 31.33e-9},
    };
    static const char *const regions[] = {"", "moderate, saturated", "moderate, saturated", ""};
    memcpy(f->q, q, sizeof q);
    for (int k = 0; k < 4; k++) {
        f->devices[k] = (struct device_result){&f->instances[k], 0, regions[k], f->q[k]};
    }
    f->x[0] = 3.0;
    f->x[1] = 0.6431;
    f->x[2] = 0.1 + 0.2; /* needs 17 digits */
    f->rail_results[0] = (struct rail_result){&f->rails[0], 3.0, 714.2e-9, 2.143e-6};
    f->result.point = (struct point_result){
        .solver = {true, "direct", 9, 3.1e-17, "deg", NULL, NULL, NULL},
        .x = f->x,
        .devices = f->devices,
        .device_count = 4,
        .rails = f->rail_results,
        .least_headroom = 0.4702,
        .least_headroom_device = "M1",
        .cell_power = 2.143e-6,
    };
}

static void fixture_output(struct fixture *f)
{
    for (int k = 0; k < FIXTURE_POINTS; k++) {
        f->v[k] = 3.0 * k / (FIXTURE_POINTS - 1);
        f->current[k] = 816.4e-9 * (1.0 - exp(-f->v[k] / 0.06)) * (0.99 + 0.01 * f->v[k]);
    }
    f->line[0] = 0.1234;
    f->events[0] = (struct sweep_event){0.02, "M2 turns around"};
    f->output_results[0] = (struct output_result){
        .output = &f->outputs[0],
        .is_sink = true,
        .current = 816.4e-9,
        .resistance = 82.41e6,
        .compliance = 0.1803,
        .compliance_device = "M2",
        .low = 0.2012,
        .high = NAN,
        .flatness = 0.0182,
        .line = f->line,
        .tempco = 320.1e-6,
        .sigma = NAN,
        .curve = {f->v, f->current, FIXTURE_POINTS},
    };
}

static void fixture_sweep(struct fixture *f)
{
    f->shown[0] = (struct probe){PROBE_OUTPUT, 0, OUTPUT_CURRENT, {0, 12, 0, 0}, "tail.current"};
    f->shown[1] = (struct probe){PROBE_DEVICE, 1, 3, {0, 0, 0, 0}, "M1.inversion"};
    f->sweep = (struct sweep){
        .knob = {KNOB_VALUE, 0, 0, "vbat", {12, 0, 0, 0}},
        .from = 2.0,
        .to = 3.0,
        .shown = f->shown,
        .shown_count = 2,
    };
    static const double knob[] = {2.0, 2.5, 3.0};
    static const double values[] = {1e-7, 0.5, 1.0 / 3.0 * 1e-6, NAN, 7e-7, 4.25};
    memcpy(f->knob, knob, sizeof knob);
    memcpy(f->values, values, sizeof values);
    f->series[0] = (struct sweep_series){NAN, 3, f->knob, f->values, f->events, 1, 0};
    f->tables[0] = (struct sweep_table){&f->sweep, f->series, 1};
}

/* A review that fails one of four requirements; its sweeps are not counted in. */
static void fixture_make(struct fixture *f)
{
    memset(f, 0, sizeof *f);
    fixture_circuit(f);
    fixture_requirements(f);
    fixture_point(f);
    fixture_output(f);
    fixture_sweep(f);
    f->hand_results[0] = (struct hand_result){&f->hands[0], 816.4e-9, 16.4e-9, 790.1e-9};
    f->hand_results[1] = (struct hand_result){&f->hands[1], 0.6431, 0.0231, NAN};
    f->cautions[0] = (struct caution){
        "weak-overdrive", "M2",
        "the square law was used at 41 mV of overdrive, below the 78 mV (2 n UT) where it starts "
        "to hold; it promises 790.1 nA here and the transistor gives 816.4 nA",
        "square law above an overdrive of 2 n UT only (Gray, Hurst, Lewis and Meyer 2009, 1.8)",
        12};
    f->result.circuit = &f->circuit;
    f->result.command = "review";
    f->result.view = VIEW_FULL;
    f->result.kelvin = 300.15;
    f->result.verdict = VERDICT_NOT_MET;
    f->result.outputs = f->output_results;
    f->result.output_count = 1;
    f->result.hands = f->hand_results;
    f->result.hand_count = 2;
    f->result.requirements = f->requirement_results;
    f->result.requirement_count = 4;
    f->result.cautions = (struct caution_list){.list = f->cautions, .count = 1, .capacity = 1};
    f->result.sweeps = f->tables;
}

#endif
