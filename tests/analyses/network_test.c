/*
 * network_test.c: the ranges that the proofs work with hold what the devices give. For random boxes
 * of node voltages, wide and narrow, and random points in them: every equation and every slope of
 * the system, evaluated by the devices in long double, lies in the range over the box.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdlib.h>

#include <cmocka.h>

#include "analyses/network_build.h"
#include "devices/opamp.h"
#include "run_fixture.h"

enum { BOXES = 300, POINTS = 4 };

static uint64_t seed;

static double any(void)
{
    seed = seed * 6364136223846793005u + 1442695040888963407u;
    return (double)(seed >> 11) / 9007199254740992.0;
}

struct bench {
    struct system *system;
    struct arena *arena;
    struct network_map map;
    struct interval *z, *row, *slope; /* variables; equations and slopes over the box */
    long double *x, *f, *scale, *values;
    double *at;
};

static void open_bench(struct bench *b, const struct circuit *circuit, unsigned effects)
{
    b->system = system_create(circuit, circuit->kelvin, effects);
    b->arena = arena_create();
    assert_true(b->system != NULL && b->arena != NULL);
    assert_true(network_build(b->arena, b->system, &b->map));
    const size_t n = (size_t)b->map.network->node_count, full = (size_t)b->system->n;
    b->z = arena_new_array(b->arena, struct interval, b->map.network->variable_count);
    b->row = arena_new_array(b->arena, struct interval, n);
    b->slope = arena_new_array(b->arena, struct interval, n * n);
    b->x = arena_new_array(b->arena, long double, full);
    b->f = arena_new_array(b->arena, long double, full);
    b->scale = arena_new_array(b->arena, long double, full);
    b->values = arena_new_array(b->arena, long double, b->system->nonzeros);
    b->at = arena_new_array(b->arena, double, full);
    assert_true(b->z != NULL && b->row != NULL && b->slope != NULL && b->values != NULL &&
                b->at != NULL);
}

static void close_bench(struct bench *b)
{
    arena_destroy(b->arena);
    system_free(b->system);
}

static void random_box(struct bench *b)
{
    const struct network *n = b->map.network;
    const double span = b->map.high - b->map.low;
    const double width = span * pow(10, -9 * any());
    for (int k = 0; k < n->node_count; k++) {
        const double lo = b->map.low + (span - width) * any();
        b->z[k] = (struct interval){lo, lo + width * (any() < 0.2 ? 0 : any())};
    }
    for (int k = n->node_count; k < n->variable_count; k++) {
        b->z[k] = interval_sub(b->z[n->pairs[k][0]], b->z[n->pairs[k][1]]);
    }
}

static void add_slope(struct bench *b, int row, int variable, struct interval s)
{
    const struct network *n = b->map.network;
    if (variable >= n->node_count) {
        add_slope(b, row, n->pairs[variable][0], s);
        add_slope(b, row, n->pairs[variable][1], interval_neg(s));
        return;
    }
    struct interval *entry = &b->slope[row * n->node_count + variable];
    *entry = interval_add(*entry, s);
}

/* Equations and slopes over the box z. */
static void find_ranges(struct bench *b)
{
    const struct network *n = b->map.network;
    memset(b->slope, 0, (size_t)(n->node_count * n->node_count) * sizeof *b->slope);
    for (int r = 0; r < n->node_count; r++) {
        b->row[r] = n->rows[r].constant;
        for (int k = 0; k < n->rows[r].term_count; k++) {
            const struct network_term *t = &n->rows[r].terms[k];
            if (t->index < n->variable_count) {
                b->row[r] = interval_add(b->row[r], interval_mul(t->coefficient, b->z[t->index]));
                add_slope(b, r, t->index, t->coefficient);
            }
        }
    }
    for (int i = 0; i < n->element_count; i++) {
        const struct element *e = &n->elements[i];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, b->z, arguments);
        element_range(e, arguments, &value, slopes);
        for (int t = 0; t < e->term_count; t++) {
            const int row = e->terms[t].row;
            b->row[row] = interval_add(b->row[row], interval_scale(e->terms[t].factor, value));
            for (int k = 0; k < e->argument_count; k++) {
                const struct argument *a = &e->arguments[k];
                if (a->variable >= 0) {
                    add_slope(b, row, a->variable,
                              interval_scale(e->terms[t].factor * a->sign, slopes[k]));
                }
            }
        }
    }
}

/* Which equation of the network an equation of the system counts in; -1: none. */
static int row_of(const struct bench *b, int equation)
{
    if (equation < b->system->node_count) {
        const int group = b->map.group[equation];
        return group >= 0 && !b->map.driven[group] ? group : -1;
    }
    const struct circuit *c = b->system->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        if (instance->type->evaluate == opamp_evaluate && system_branch(instance) == equation) {
            return b->map.group[instance->local[0]];
        }
    }
    return -1;
}

/* `slack` is the rounding of the devices' own evaluation. */
static void hold(const char *what, int row, struct interval range, long double value,
                 long double slack)
{
    if (!(value >= range.lo - slack && value <= range.hi + slack)) {
        print_error("%s of equation %d: %.12Lg is not in [%.12g, %.12g]\n", what, row, value,
                    range.lo, range.hi);
        fail();
    }
}

static void check_point(struct bench *b)
{
    const struct network *n = b->map.network;
    const struct system *s = b->system;
    long double row[64] = {0}, size[64] = {0}, *slope;
    assert_true(n->node_count <= 64);
    for (int k = 0; k < s->n; k++) {
        b->x[k] = 0;
    }
    for (int k = 0; k < n->node_count; k++) {
        b->at[k] = fmin(b->z[k].lo + interval_width(b->z[k]) * any(), b->z[k].hi);
    }
    for (int k = 0; k < s->node_count; k++) {
        const int g = b->map.group[k];
        b->x[k] = (g < 0 ? 0 : b->at[g]) + interval_middle(b->map.shift[k]);
    }
    assert_true(s->face.evaluate_extended(b->system, b->x, b->f, b->scale, b->values));
    slope = calloc((size_t)(n->node_count * n->node_count) + 1, sizeof *slope);
    assert_non_null(slope);
    for (int i = 0; i < s->n; i++) {
        const int r = row_of(b, i);
        if (r >= 0) {
            row[r] += b->f[i];
            size[r] += b->scale[i];
        }
    }
    for (int j = 0; j < s->node_count; j++) {
        for (int k = s->face.pattern->start[j]; k < s->face.pattern->start[j + 1]; k++) {
            const int r = row_of(b, s->face.pattern->row[k]), g = b->map.group[j];
            if (r >= 0 && g >= 0) {
                slope[r * n->node_count + g] += b->values[k];
            }
        }
    }
    for (int r = 0; r < n->node_count; r++) {
        hold("value", r, b->row[r], row[r], 1e-13L * size[r] + 1e-30L);
        for (int g = 0; g < n->node_count; g++) {
            const struct interval range = b->slope[r * n->node_count + g];
            hold("slope", r, range, slope[r * n->node_count + g],
                 1e-12L * fabsl(slope[r * n->node_count + g]) + 1e-13L * size[r] + 1e-30L);
        }
    }
    free(slope);
}

static void check_cell(const char *text, unsigned effects)
{
    struct run run;
    struct bench bench;
    run_open(&run, text, VERB_POINT, VIEW_FULL, NAN);
    open_bench(&bench, run.circuit, effects);
    seed = 42;
    for (int k = 0; k < BOXES; k++) {
        random_box(&bench);
        find_ranges(&bench);
        for (int p = 0; p < POINTS; p++) {
            check_point(&bench);
        }
    }
    close_bench(&bench);
    run_close(&run);
}

static const unsigned views[] = {EFFECTS_FULL,
                                 EFFECTS_HAND,
                                 EFFECTS_FULL & ~EFFECT_INVERSION,
                                 EFFECTS_FULL & ~EFFECT_MOBILITY,
                                 EFFECTS_FULL & ~EFFECT_BODY,
                                 EFFECTS_HAND | EFFECT_MODULATION};

static void check_views(const char *text)
{
    for (size_t k = 0; k < sizeof views / sizeof views[0]; k++) {
        check_cell(text, views[k]);
    }
}

/* Every MOS model of the three processes, with a bulk of its own and one that is the source. */
static void test_mos(void **state)
{
    (void)state;
    check_views("process \"open130.process\"\nrail vdd 1.8 V\n"
                "nmos M1 d=a g=b s=c b=d W=7u L=0.5u\nnmos M2 d=a g=c s=d b=d W=3u L=8u\n"
                "resistor R1 a -> vdd 1k\nresistor R2 b -> vdd 2k\nresistor R3 c -> gnd 1k\n"
                "resistor R4 d -> gnd 1k\n");
    check_views("process \"n180.process\"\nrail vdd 1.8 V\n"
                "nmos M1 d=a g=b s=c b=gnd W=4u L=0.3u\npmos M2 d=a g=c s=b W=3u L=2u\n"
                "resistor R1 a -> vdd 1k\nresistor R2 b -> vdd 2k\nresistor R3 c -> gnd 1k\n");
    check_views(
        "model q nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\n body_effect = 0.4 V^0.5\n"
        " early = 6 V\n early_onset = 0.2 V\n dibl = 0.01\n dibl_short = 0.03\n"
        " dibl_body = 0.3\n mobility_gate = 0.3\n mobility_bulk = 0.5\n"
        " critical_field = 5e6 V/m\n saturation_knee = 0.8\n junction_leak = 1e-9 A/m\nend\n"
        "rail vdd 2 V\nnmos M1 d=a g=b s=c b=d W=7u L=0.3u\n"
        "resistor R1 a -> vdd 1k\nresistor R2 b -> vdd 2k\nresistor R3 c -> gnd 1k\n"
        "resistor R4 d -> gnd 1k\n");
}

static void test_hand_transistor(void **state)
{
    (void)state;
    check_views("rail vdd 3 V\nnmos M1 d=a g=b s=c conduction=50uA/V^2 threshold=0.7V early=20V\n"
                "pmos M2 d=a g=c s=vdd conduction=20uA/V^2 threshold=0.8V\n"
                "resistor R1 a -> vdd 1k\nresistor R2 b -> vdd 2k\nresistor R3 c -> gnd 1k\n");
}

static void test_bipolar(void **state)
{
    (void)state;
    check_views("model n npn\n early = 60 V\n emission_reverse = 1.1\n leak_emitter = 2 pA\nend\n"
                "model p pnp\n beta = 40\n knee = 20 mA\nend\n"
                "rail vcc 5 V\nnpn Q1 c=a b=b e=c\n"
                "pnp Q2 c=gnd b=a e=b area=3\nresistor R1 a -> vcc 1k\n"
                "resistor R2 b -> vcc 20k\nresistor R3 c -> gnd 1k\n");
    check_views("model q npn\n early = 30 V\n early_reverse = 4 V\n knee = 5 mA\n"
                " knee_reverse = 1 mA\n leak_emitter = 1 pA\n leak_collector = 3 pA\nend\n"
                "rail vcc 3 V\nnpn Q1 c=a b=b e=c\nresistor R1 a -> vcc 1k\n"
                "resistor R2 b -> vcc 20k\nresistor R3 c -> gnd 1k\n");
}

static void test_others(void **state)
{
    (void)state;
    check_views("model j njfet\n idss = 5 mA\n pinchoff = -2 V\n early = 40 V\nend\n"
                "model z diode\n breakdown_voltage = 2 V\n breakdown_emission = 2\nend\n"
                "rail vcc 5 V\nnjfet J1 d=a g=b s=c\ndiode D1 b -> c\nresistor R1 a -> vcc 1k\n"
                "resistor R2 b -> gnd 20k\nresistor R3 c -> gnd 1k\nvoltage V1 a -> e 0.3 V\n"
                "resistor R4 e -> gnd 7k\ncurrent I1 vcc -> c 10 uA\n");
    check_views("rail vcc 5 V\nopamp A1 out=a plus=b minus=c gain=50 low=gnd high=vcc offset=2mV\n"
                "opamp A2 out=e plus=c minus=gnd gain=20 low=-1V high=d\n"
                "resistor R1 a -> b 10k\nresistor R2 b -> gnd 1k\nresistor R3 a -> c 1k\n"
                "resistor R4 c -> gnd 1k\nresistor R5 d -> vcc 1k\nresistor R6 d -> gnd 9k\n"
                "resistor R7 e -> d 5k\n");
}

static void test_laws(void **state)
{
    (void)state;
    check_views(
        "let G = 1 mA/V\nrail vcc 2 V\n"
        "law L1 a -> b i = 1 mA*(2.5*((a.v-b.v)/1 V)^3 - 10.5*((a.v-b.v)/1 V)^2) - G*(a.v - "
        "b.v)/3\n"
        "law L2 b -> gnd i = 1 uA*exp(b.v/0.3 V) + G*max(b.v - a.v, 0.2 V) - 2*G*(-b.v)\n"
        "law L3 c -> gnd i = 1 mA*sqrt(abs(c.v/1 V) + 1) + 1 mA*(c.v*b.v)/(1 V^2 + a.v^2)\n"
        "law L4 a -> c i = 1 mA*ln(2 + (a.v/4 V)^2) + 1 mA*min(a.v, b.v, c.v)/1 V + 0.1 mA\n"
        "law L5 c -> vcc i = 1 mA*log10(1 + exp(c.v/1 V)) - 1 mA*(2 + abs(b.v/2 V))^1.5\n"
        "resistor R1 a -> vcc 1k\nresistor R2 b -> gnd 1k\nresistor R3 c -> gnd 1k\n");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_mos),     cmocka_unit_test(test_hand_transistor),
        cmocka_unit_test(test_bipolar), cmocka_unit_test(test_others),
        cmocka_unit_test(test_laws),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
