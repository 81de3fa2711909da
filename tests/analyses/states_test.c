/*
 * states_test.c: all states of published circuits, with proof; loops; start-up.
 *
 * Published circuits: group 5 of the reference values. Where a source gives a transport model with
 * forward and reverse alpha, IF = (Is/af)(exp - 1), it is the npn here with beta = af/(1 - af),
 * beta_reverse = ar/(1 - ar) and the same Is; its kT/q is set by the emission coefficient.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>

#include <cmocka.h>

#include "analyses/states.h"
#include "run_fixture.h"

enum { LENGTH = 6000 };

static void run_states(struct run *run, const char *text, long boxes)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const struct circuit_settings settings = {.kelvin = NAN};
    const struct analysis_options options = {.boxes = boxes, .leakage = 1e-9};
    memset(run, 0, sizeof *run);
    assert_int_equal(cell_read("cell", text, strlen(text), folders, 1, &run->cell), STATUS_OK);
    assert_int_equal(circuit_build(run->cell, &settings, &run->cell->diagnostics, &run->circuit),
                     STATUS_OK);
    run->status = analysis_states(run->circuit, &options, &run->result);
    assert_non_null(run->result->states);
}

/* The state with these voltages at the nodes named (to 1e-6 V); it must be certified. */
static const struct state_result *find_state(const struct run *run, const char *const *nodes,
                                             const double *volts, int count)
{
    const struct states_result *found = run->result->states;
    for (int k = 0; k < found->state_count; k++) {
        bool same = true;
        for (int i = 0; i < count; i++) {
            const int node = circuit_find_node(run->circuit, nodes[i]);
            assert_true(node > 0);
            same = same && fabs(found->states[k].x[node - 1] - volts[i]) < 1e-6;
        }
        if (same) {
            assert_true(found->states[k].is_certified);
            assert_true(found->states[k].widest < 1e-9);
            return &found->states[k];
        }
    }
    print_error("no state with %s = %.7g\n", nodes[0], volts[0]);
    fail();
    return NULL;
}

static void check_count(const struct run *run, int count)
{
    assert_true(run->result->states->is_complete);
    assert_int_equal(run->result->states->state_count, count);
    assert_int_equal(run->result->states->undecided_boxes, 0);
}

/* N01: Khalil, Nonlinear Systems, example 2.1: a tunnel diode; three roots of a quintic. */
static void test_tunnel_diode(void **state)
{
    (void)state;
    static const char *const nodes[] = {"a"};
    static const double volts[] = {0.06263595921, 0.2853687241, 0.8844295889};
    struct run run;
    run_states(&run,
               "let SCALE = 1 mA\nrail vs 1.2 V\nresistor R vs -> a 1.5k\n"
               "law TD a -> gnd i = SCALE*(17.76*(a.v/1 V) - 103.79*(a.v/1 V)^2"
               " + 229.62*(a.v/1 V)^3 - 226.31*(a.v/1 V)^4 + 83.72*(a.v/1 V)^5)\n",
               10000);
    check_count(&run, 3);
    assert_false(run.result->states->is_assumed); /* it carries nothing against its voltage */
    for (int k = 0; k < 3; k++) {
        /* the middle one lies on the falling part, steeper than the load line */
        assert_int_equal(find_state(&run, nodes, &volts[k], 1)->can_hold, k != 1);
    }
    run_close(&run);
}

/* N02: two tunnel diodes in series (Chua and Ushida's pair): nine. */
static void test_tunnel_pair(void **state)
{
    (void)state;
    static const char *const nodes[] = {"b"};
    static const double v1[] = {0.199791, 0.219855, 0.228267, 1.666378, 1.702658,
                                1.775504, 2.224730, 2.277597, 2.305222};
    static const double v2[] = {3.754217, 1.672951, 0.828626, 0.739343, 1.809030,
                                3.707178, 3.693044, 1.857492, 0.705560};
    struct run run;
    run_states(&run,
               "let SCALE = 1 mA\nrail vs 30 V\nresistor R vs -> a 13.3k\n"
               "law T1 a -> b i = SCALE*(2.5*((a.v-b.v)/1 V)^3 - 10.5*((a.v-b.v)/1 V)^2"
               " + 11.8*((a.v-b.v)/1 V))\n"
               "law T2 b -> gnd i = SCALE*(0.43*(b.v/1 V)^3 - 2.69*(b.v/1 V)^2"
               " + 4.56*(b.v/1 V))\n",
               10000);
    check_count(&run, 9);
    assert_false(run.result->states->is_assumed);
    const int a = circuit_find_node(run.circuit, "a"), b = circuit_find_node(run.circuit, "b");
    for (int k = 0; k < 9; k++) {
        const struct state_result *found = find_state(&run, nodes, &v2[k], 1);
        assert_true(fabs(found->x[a - 1] - found->x[b - 1] - v1[k]) < 1e-6);
    }
    run_close(&run);
}

static const char five_states[] = "model hot npn\n saturation_current = 1 nA\n beta = 99\n"
                                  " beta_reverse = 1\n emission = 0.053 V/thermal_voltage\n"
                                  " emission_reverse = 0.053 V/thermal_voltage\nend\n"
                                  "rail vcc 5 V\n"
                                  "resistor RC1 vcc -> c1 5k\nresistor RC2 vcc -> c2 5k\n"
                                  "resistor RB1 c2 -> m1 10k\nresistor RB2 c1 -> m2 10k\n"
                                  "voltage V1 b1 -> m1 0.64 V\nvoltage V2 b2 -> m2 0.64 V\n"
                                  "npn Q1 c=c1 b=b1 e=gnd\nnpn Q2 c=c2 b=b2 e=gnd\n";

/* N03: Nakaya, Nishi, Oishi and Claus 2009, case (a): five. */
static void test_five_states(void **state)
{
    (void)state;
    static const char *const nodes[] = {"b1", "c1", "b2", "c2"};
    static const double volts[][4] = {{0.703590, 1.425397, 0.742316, 0.122429},
                                      {0.719902, 0.723238, 0.735513, 0.159960},
                                      {0.729290, 0.257834, 0.729290, 0.257834},
                                      {0.735513, 0.159960, 0.719902, 0.723238},
                                      {0.742316, 0.122429, 0.703590, 1.425397}};
    struct run run;
    run_states(&run, five_states, 10000);
    check_count(&run, 5);
    for (int k = 0; k < 5; k++) {
        /* states on one path follow each other with alternating sign */
        assert_int_equal(find_state(&run, nodes, volts[k], 4)->can_hold, k % 2 == 0);
    }
    assert_true(run.result->states->has_loop);
    assert_false(run.result->states->is_assumed);
    assert_int_equal(run.result->states->startup, STARTUP_AT_RISK);
    run_close(&run);
}

#define TRIGGER_MODEL                                                                              \
    "model t npn\n saturation_current = 1e-16 A\n beta = 99\n beta_reverse = 1\n"                  \
    " emission = 1 V/38.78/thermal_voltage\n emission_reverse = 1 V/38.78/thermal_voltage\nend\n"  \
    "rail vcc 10 V\n"
#define TRIGGER(k)                                                                                 \
    "resistor R1" k " vcc -> b1" k " 5k\nresistor R2" k " b1" k " -> gnd 1.25k\n"                  \
    "resistor RE" k " e" k " -> gnd 100\nresistor R3" k " vcc -> c1" k " 1.5k\n"                   \
    "resistor R4" k " c1" k " -> b2" k " 10k\nresistor R5" k " b2" k " -> gnd 1M\n"                \
    "resistor R6" k " vcc -> c2" k " 1k\n"                                                         \
    "npn Q1" k " c=c1" k " b=b1" k " e=e" k "\nnpn Q2" k " c=c2" k " b=b2" k " e=e" k "\n"

static const double trigger[3][5] = {{1.490465, 0.739851, 0.668223, 0.732526, 10.000000},
                                     {1.951022, 2.626495, 1.138429, 1.958266, 3.578400},
                                     {1.973169, 5.492563, 1.176096, 2.005310, 1.268826}};

/* N04: a Schmitt trigger (Trajkovic and co-workers): three. */
static void test_trigger(void **state)
{
    (void)state;
    static const char *const nodes[] = {"b1x", "c1x", "ex", "b2x", "c2x"};
    struct run run;
    run_states(&run, TRIGGER_MODEL TRIGGER("x"), 10000);
    check_count(&run, 3);
    for (int k = 0; k < 3; k++) {
        assert_int_equal(find_state(&run, nodes, trigger[k], 5)->can_hold, k != 1);
    }
    assert_true(run.result->states->has_loop);
    run_close(&run);
}

/* Two of them side by side: ten unknown nodes, four transistors, and every pair of states: nine. */
static void test_two_triggers(void **state)
{
    (void)state;
    static const char *const nodes[] = {"b1x", "c1x", "ex", "b2x", "c2x",
                                        "b1y", "c1y", "ey", "b2y", "c2y"};
    struct run run;
    run_states(&run, TRIGGER_MODEL TRIGGER("x") TRIGGER("y"), 100000);
    check_count(&run, 9);
    for (int i = 0; i < 3; i++) {
        for (int k = 0; k < 3; k++) {
            double volts[10];
            memcpy(volts, trigger[i], sizeof trigger[i]);
            memcpy(volts + 5, trigger[k], sizeof trigger[k]);
            /* a determinant of blocks is the product of theirs */
            assert_int_equal(find_state(&run, nodes, volts, 10)->can_hold, (i == 1) == (k == 1));
        }
    }
    run_close(&run);
}

#define FLIP_FLOP(k)                                                                               \
    "resistor RC1" k " vcc -> c1" k " 1k\nresistor RC2" k " vcc -> c2" k " 1.1k\n"                 \
    "resistor RB1" k " c2" k " -> b1" k " 10k\nresistor RB2" k " c1" k " -> b2" k " 10k\n"         \
    "npn Q1" k " c=c1" k " b=b1" k " e=e\nnpn Q2" k " c=c2" k " b=b2" k " e=e\n"

/* Circuits of our own of the size of published ones: two flip-flops on one emitter resistor (nine
 * unknown nodes), coupled by their collectors, and by their bases. Loose enough that each keeps its
 * three states beside each of the other: nine, of which those with one flip-flop on its edge have a
 * determinant of the wrong sign. */
static void test_coupled_flip_flops(void **state)
{
    (void)state;
    static const char *const couplings[] = {
        "resistor RE e -> gnd 100\n",
        "voltage VE e -> gnd 0 V\nresistor RX c1x -> c2y 47k\nresistor RY c1y -> c2x 47k\n",
        "voltage VE e -> gnd 0 V\nresistor RX b1x -> b2y 47k\nresistor RY b2x -> b1y 47k\n",
    };
    static const char *const models[] = {
        "model q npn\n saturation_current = 1e-15 A\n beta = 99\n beta_reverse = 1\nend\n",
        "model q npn\n saturation_current = 1e-15 A\n beta = 99\n beta_reverse = 1\n early = 60 V\n"
        " early_reverse = 12 V\n knee = 20 mA\nend\n",
    };
    for (size_t k = 0; k < 6; k++) {
        char text[LENGTH];
        struct run run;
        snprintf(text, sizeof text, "%srail vcc 5 V\n%s%s%s", models[k % 2], FLIP_FLOP("x"),
                 FLIP_FLOP("y"), couplings[k / 2]);
        run_states(&run, text, 100000);
        check_count(&run, 9);
        assert_false(run.result->states->is_assumed);
        int edges = 0;
        for (int i = 0; i < 9; i++) {
            edges += !run.result->states->states[i].can_hold;
        }
        assert_int_equal(edges, 4);
        run_close(&run);
    }
}

/* The square law of the hand view below threshold: the node between two transistors that are off is
 * set by nothing, all its voltages are states. Not complete, and the node is named with its range.
 */
static void test_hand_view_off(void **state)
{
    (void)state;
    struct run run;
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const struct circuit_settings settings = {.kelvin = NAN};
    const struct analysis_options options = {.boxes = 500, .leakage = 1e-9, .view = VIEW_HAND};
    static const char text[] = "process \"n180.process\"\nrail vdd 1.8 V\n"
                               "resistor RB vdd -> g 100k\nresistor RS g -> gnd 20k\n"
                               "nmos M1 d=x g=g s=gnd W=2u L=1u\nnmos M2 d=out g=g s=x W=2u L=1u\n"
                               "output out at 1 V from 0 V to 1.8 V\n";
    memset(&run, 0, sizeof run);
    assert_int_equal(cell_read("cell", text, strlen(text), folders, 1, &run.cell), STATUS_OK);
    assert_int_equal(circuit_build(run.cell, &settings, &run.cell->diagnostics, &run.circuit),
                     STATUS_OK);
    run.status = analysis_states(run.circuit, &options, &run.result);
    assert_int_equal(run.status, STATUS_UNSOLVED);
    const struct states_result *found = run.result->states;
    assert_false(found->is_complete);
    assert_true(found->undecided_boxes > 0);
    bool named = false;
    for (int k = 0; k < found->undecided_count; k++) {
        named |= strcmp(found->undecided[k].node, "x") == 0 && found->undecided[k].low <= 0 &&
                 found->undecided[k].high >= 1;
    }
    assert_true(named);
    assert_non_null(strstr(run.result->point.solver.trouble, "nothing sets the node x"));
    run_close(&run);
}

/* N05: two cross-coupled inverters, square law with triode region: 0 V, 1.5 V by symmetry, 3 V. */
static void test_latch(void **state)
{
    (void)state;
    static const char *const nodes[] = {"a", "b"};
    static const double volts[][2] = {{0, 3}, {1.5, 1.5}, {3, 0}};
    struct run run;
    run_states(&run,
               "let KP = 50 uA/V^2\nlet VT = 0.7 V\nrail vdd 3 V\n"
               "law N1 a -> gnd i = KP*(max(b.v-VT, 0 V)^2 - max(b.v-a.v-VT, 0 V)^2)"
               "*(1+0.05*abs(a.v)/1 V)\n"
               "law P1 vdd -> a i = KP*(max(vdd.v-b.v-VT, 0 V)^2 - max(a.v-b.v-VT, 0 V)^2)"
               "*(1+0.05*abs(vdd.v-a.v)/1 V)\n"
               "law N2 b -> gnd i = KP*(max(a.v-VT, 0 V)^2 - max(a.v-b.v-VT, 0 V)^2)"
               "*(1+0.05*abs(b.v)/1 V)\n"
               "law P2 vdd -> b i = KP*(max(vdd.v-a.v-VT, 0 V)^2 - max(b.v-a.v-VT, 0 V)^2)"
               "*(1+0.05*abs(vdd.v-b.v)/1 V)\n",
               10000);
    check_count(&run, 3);
    for (int k = 0; k < 3; k++) {
        assert_int_equal(find_state(&run, nodes, volts[k], 2)->can_hold, k != 1);
    }
    run_close(&run);
}

/* The same latch of this program's own transistors, in the full view: three, the middle one by
 * symmetry at equal voltages. */
static void test_transistor_latch(void **state)
{
    (void)state;
    struct run run;
    run_states(&run,
               "process \"n180.process\"\nrail vdd 1.8 V\n"
               "nmos N1 d=a g=b s=gnd W=2u L=0.5u\npmos P1 d=a g=b s=vdd W=6u L=0.5u\n"
               "nmos N2 d=b g=a s=gnd W=2u L=0.5u\npmos P2 d=b g=a s=vdd W=6u L=0.5u\n",
               10000);
    check_count(&run, 3);
    const struct states_result *found = run.result->states;
    const int a = circuit_find_node(run.circuit, "a"), b = circuit_find_node(run.circuit, "b");
    int middle = 0, ends = 0;
    for (int k = 0; k < 3; k++) {
        const double va = found->states[k].x[a - 1], vb = found->states[k].x[b - 1];
        if (fabs(va - vb) < 1e-9) {
            assert_false(found->states[k].can_hold);
            middle++;
        } else {
            assert_true(found->states[k].can_hold);
            assert_true(fabs(va + vb - 1.8) < 1e-3);
            ends++;
        }
    }
    assert_true(middle == 1 && ends == 2);
    run_close(&run);
}

static void check_scalable(int n, int count)
{
    char text[LENGTH];
    int length = 0;
    for (int i = 1; i <= n; i++) {
        length += snprintf(text + length, LENGTH - (size_t)length,
                           "law L%d x%d -> gnd i = 1 A*(2.5*(x%d.v/1 V)^3"
                           " - 10.5*(x%d.v/1 V)^2 + 11.8*(x%d.v/1 V) - %d + (0 V",
                           i, i, i, i, i, i);
        for (int k = 1; k <= n; k++) {
            length += snprintf(text + length, LENGTH - (size_t)length, "+x%d.v", k);
        }
        length += snprintf(text + length, LENGTH - (size_t)length, ")/1 V)\n");
    }
    struct run run;
    run_states(&run, text, 100000);
    assert_int_equal(run.status, STATUS_OK);
    check_count(&run, count);
    assert_false(run.result->states->is_assumed);
    run_close(&run);
}

/* N06: Yamamura, Kawata and Tokue 1998: five at n = 5, one at 3. */
static void test_scalable(void **state)
{
    (void)state;
    check_scalable(3, 1);
    check_scalable(5, 5);
}

/* The published nine at n = 10. Five seconds: only with "slow". */
static void test_scalable_ten(void **state)
{
    (void)state;
    check_scalable(10, 9);
}

/* At n = 6 the search for one point from cold fails; the search for all does not need it. */
static void test_no_point_from_cold(void **state)
{
    (void)state;
    struct run run;
    char text[LENGTH];
    int length = 0;
    for (int i = 1; i <= 6; i++) {
        length += snprintf(text + length, LENGTH - (size_t)length,
                           "law L%d x%d -> gnd i = 1 A*(2.5*(x%d.v/1 V)^3 - 10.5*(x%d.v/1 V)^2"
                           " + 11.8*(x%d.v/1 V) + (x1.v+x2.v+x3.v+x4.v+x5.v+x6.v)/1 V - %d)\n",
                           i, i, i, i, i, i);
    }
    run_states(&run, text, 20000);
    assert_int_equal(run.status, STATUS_OK);
    assert_true(run.result->states->is_complete && run.result->states->state_count % 2 == 1);
    assert_true(run.result->point.solver.converged);
    assert_true(run.result->states->states[run.result->states->wanted].can_hold);
    run_close(&run);
}

/* A source of 1 uA into a sink of 1 nA: no state at all, and that is proved. */
static void test_no_state(void **state)
{
    (void)state;
    struct run run;
    run_states(&run,
               "rail vcc 1 V\ncurrent I vcc -> x 1 uA\nlaw L x -> gnd i = 1 nA"
               " * (1 + sqrt((x.v / 1 V)^2)) / (1 + sqrt((x.v / 1 V)^2))\n",
               1000);
    assert_int_equal(run.status, STATUS_UNSOLVED);
    check_count(&run, 0);
    run_close(&run);
}

/* N07: Matsumoto, Chua and Komuro 1985: -1.5, 0, 1.5 V. */
static void test_piecewise(void **state)
{
    (void)state;
    static const char *const nodes[] = {"a"};
    struct run run;
    run_states(&run,
               "resistor R a -> gnd 1\nlaw NR a -> gnd i = (-5/7*(a.v/1 V)"
               " - 3/14*(abs(a.v/1 V+1) - abs(a.v/1 V-1)))*1 A\n",
               10000);
    check_count(&run, 3);
    /* |v|/7 R beyond the bend: (5/7 |v| + 3/7) 1 ohm pushes to 1.5 V and no further */
    assert_false(run.result->states->is_assumed);
    assert_true(run.result->states->high >= 1.5 && run.result->states->high < 1.51);
    for (int k = -1; k <= 1; k++) {
        const double volts = 1.5 * k;
        /* slope of the whole at the outer states 1 - 5/7, at the middle one 1 - 8/7 */
        assert_int_equal(find_state(&run, nodes, &volts, 1)->can_hold, k != 0);
    }
    run_close(&run);
}

/* --- no loop, and a budget ----------------------------------------------------------------------
 */

/* A mirror has one state, whose voltage is known in closed form elsewhere (closed_form_test). */
static void test_mirror(void **state)
{
    (void)state;
    struct run run;
    run_states(&run,
               "process \"n180.process\"\nrail vdd 1.8 V\nresistor RB vdd -> g 100k\n"
               "nmos M1 d=g g=g s=gnd W=4u L=4u\nnmos M2 d=out g=g s=gnd W=4u L=4u\n"
               "output out at 1 V from 0 V to 1.8 V\n",
               1000);
    check_count(&run, 1);
    assert_false(run.result->states->has_loop);
    assert_int_equal(run.result->states->startup, STARTUP_CERTAIN);
    assert_int_equal(run.result->states->ramp_state, 0);
    assert_true(run.result->states->states[0].widest < 1e-11);
    run_close(&run);
}

/* No box: nothing is proved, and the report names what is open. */
static void test_no_budget(void **state)
{
    (void)state;
    struct run run;
    run_states(&run, five_states, 0);
    const struct states_result *found = run.result->states;
    assert_false(found->is_complete);
    assert_true(found->undecided_boxes == 1 && found->undecided_count == 4);
    assert_true(found->undecided[0].low < -1 && found->undecided[0].high > 6);
    assert_int_equal(found->startup, STARTUP_AT_RISK);
    run_close(&run);
}

/* --- start-up ------------------------------------------------------------------------------------
 */

#define MULTIPLIER                                                                                 \
    "process \"n180.process\"\nrail vdd 1.8 V\n"                                                   \
    "nmos M1 d=nb g=nb s=gnd W=4u L=4u\nnmos M2 d=pb g=nb s=deg W=4u L=4u m=4\n"                   \
    "resistor R deg -> gnd 15k\npmos M3 d=nb g=pb s=vdd W=24u L=4u\n"                              \
    "pmos M4 d=pb g=pb s=vdd W=24u L=4u\npmos M5 d=bias g=pb s=vdd W=24u L=4u\n"                   \
    "output bias at 0.6 V from 0 V to 1.8 V\n"
#define STARTER                                                                                    \
    "pmos MS1 d=st g=nb s=vdd W=0.5u L=20u\nnmos MS2 d=st g=nb s=gnd W=4u L=0.5u\n"                \
    "nmos MS3 d=pb g=st s=gnd W=1u L=0.5u\n"

static const struct starter_result *starter(const struct states_result *found, const char *name)
{
    for (int k = 0; k < found->starter_count; k++) {
        if (strcmp(found->starters[k].instance->name, name) == 0) {
            return &found->starters[k];
        }
    }
    print_error("%s is not in the start-up branch\n", name);
    fail();
    return NULL;
}

/* The same beta multiplier without and with its start-up branch. */
static void test_multiplier(void **state)
{
    (void)state;
    struct run bare, whole;
    run_states(&bare, MULTIPLIER, 10000);
    run_states(&whole, MULTIPLIER STARTER, 10000);
    const struct states_result *without = bare.result->states, *with = whole.result->states;
    check_count(&bare, 1);
    check_count(&whole, 1);
    assert_string_equal(with->loop_path, "nb -> pb -> nb");
    assert_int_equal(without->startup, STARTUP_AT_RISK);
    assert_int_equal(without->starter_count, 0);
    /* M3 with its gate where M4 carries what M2 leaks at vgs = 0: picoamperes */
    assert_true(without->push > 1e-13 && without->push < 1e-10);
    assert_int_equal(with->startup, STARTUP_CERTAIN);
    assert_true(with->push > 1e-6);
    check_near(starter(with, "MS3")->push_without, without->push, 1e-2);
    assert_true(starter(with, "MS3")->run_current < 1e-9);
    assert_true(starter(with, "MS1")->run_current > 1e-8);
    /* the lowest supply: a point solved there has the current at the edge of the band */
    const double lowest = with->supplies[0].lowest;
    const double current = with->states[0].outputs[0];
    assert_int_equal(with->supply_count, 1);
    assert_true(lowest > 1 && lowest < 1.8);
    char text[2000];
    (void)snprintf(text, sizeof text, "%s", MULTIPLIER STARTER);
    char *at = strstr(text, "1.8 V");
    memcpy(at, "LOWER", 5);
    char lower[2100];
    (void)snprintf(lower, sizeof lower, "let LOWER = %.12f V\n%s", lowest, text);
    struct run edge;
    run_open(&edge, lower, VERB_POINT, VIEW_FULL, NAN);
    check_near(value_of(&edge, "M5.id"), current * 0.99, 1e-3);
    run_close(&edge);
    run_close(&bare);
    run_close(&whole);
}

/* The push of a latch at its probe by hand: held at 0 V, the p-channel device whose gate is at the
 * other node (driven to vdd by the other inverter) is off, so that the cell stays; the loop curve
 * has three zeros. */
static void test_loop_curve(void **state)
{
    (void)state;
    struct run run;
    run_states(&run,
               "process \"n180.process\"\nrail vdd 1.8 V\n"
               "nmos N1 d=a g=b s=gnd W=2u L=0.5u\npmos P1 d=a g=b s=vdd W=6u L=0.5u\n"
               "nmos N2 d=b g=a s=gnd W=2u L=0.5u\npmos P2 d=b g=a s=vdd W=6u L=0.5u\n",
               10000);
    const struct states_result *found = run.result->states;
    int zeros = 0;
    for (int k = 0; k + 1 < found->curve_count; k++) {
        assert_true(found->curve_v[k] < found->curve_v[k + 1]);
        zeros += (found->curve_push[k] > 0) != (found->curve_push[k + 1] > 0);
    }
    assert_true(found->curve_count > 100);
    assert_int_equal(zeros, 3);
    run_close(&run);
}

/* --- loops from the structure -------------------------------------------------------------------
 */

static bool has_loop(const char *text)
{
    struct run run;
    run_states(&run, text, 0);
    const bool found = run.result->states->has_loop;
    run_close(&run);
    return found;
}

static void test_loops(void **state)
{
    (void)state;
    /* Wilson: feedback of negative sign */
    assert_false(
        has_loop("process \"n180.process\"\nrail vdd 1.8 V\nresistor R vdd -> in 50k\n"
                 "nmos M1 d=in g=m s=gnd W=4u L=1u\nnmos M2 d=m g=m s=gnd W=4u L=1u\n"
                 "nmos M3 d=out g=in s=m W=4u L=1u\noutput out at 1.5 V from 0 V to 1.8 V\n"));
    /* one transistor alone, however it is connected */
    assert_false(has_loop("rail vcc 5 V\nnpn Q1 c=c b=b e=e\nresistor R1 vcc -> c 10k\n"
                          "resistor R2 c -> b 100k\nresistor R3 e -> gnd 1k\n"
                          "resistor R4 c -> e 50k\n"));
    /* amplifiers: a follower has negative feedback, a comparator with hysteresis positive */
    assert_false(has_loop("rail vcc 5 V\nopamp A1 out=o plus=vcc minus=o gain=1000 low=0V high=5V\n"
                          "resistor R1 o -> gnd 1k\n"));
    assert_true(has_loop("rail vcc 5 V\nopamp A1 out=o plus=p minus=vcc gain=1000 low=0V high=9V\n"
                         "resistor R1 o -> p 1k\nresistor R2 p -> gnd 3k\n"));
}

/* --- certificate of one point ----------------------------------------------------------------- */

/* A divider: the box holds the closed form. */
static void test_certificate(void **state)
{
    (void)state;
    struct run run;
    run_open(&run, "rail vdd 5 V\nresistor R1 vdd -> m 1M\nresistor R2 m -> gnd 3k\n", VERB_POINT,
             VIEW_FULL, NAN);
    result_free(run.result);
    const struct analysis_options options = {.certify = true};
    assert_int_equal(analysis_point(run.circuit, &options, &run.result), STATUS_OK);
    const struct states_result *found = run.result->states;
    assert_non_null(found);
    assert_int_equal(found->state_count, 1);
    assert_true(found->states[0].is_certified && found->states[0].can_hold);
    const int m = circuit_find_node(run.circuit, "m");
    const double error = fabs(found->states[0].x[m - 1] - 5 * 3e3 / 1.003e6);
    assert_true(error <= found->states[0].half_width[m - 1]);
    assert_true(found->states[0].half_width[m - 1] < 1e-16);
    assert_true(found->states[0].half_width[circuit_find_node(run.circuit, "vdd") - 1] <= 0);
    run_close(&run);
}

/* --- where to look ------------------------------------------------------------------------------
 */

struct range_case {
    const char *text;
    double low, high; /* V, closed forms */
};

/* What a source can push a node to: by Ohm's law, by the diode equation (Shockley), by a
 * diode-connected transistor. */
static void test_range(void **state)
{
    (void)state;
    const double thermal = BOLTZMANN_OVER_CHARGE * 300.15;
    const struct range_case cases[] = {
        {"rail v 1 V\nresistor R0 v -> gnd 1k\ncurrent I gnd -> a 1 mA\nresistor R a -> gnd 5k\n",
         0, 5},
        {"rail v 1 V\nresistor R0 v -> gnd 1k\ncurrent I gnd -> a 1 mA\nresistor R1 a -> b 1k\n"
         "resistor R2 b -> gnd 2k\n",
         0, 3},
        {"rail v 1 V\nresistor R0 v -> gnd 1k\ncurrent I a -> gnd 1 mA\nresistor R a -> v 5k\n", -4,
         1}, /* pulled down from the rail at 1 V: 1 V - 5 V */
        {"model d diode\n saturation_current = 1 fA\nend\ncurrent I gnd -> a 1 mA\n"
         "diode D a -> gnd model=d\n",
         0, thermal * log(1 + 1e-3 / 1e-15)},
        {"rail v 1 V\nresistor R0 v -> gnd 1k\ncurrent I v -> a 100 uA\n"
         "nmos M d=a g=a s=gnd conduction=100u threshold=0.7 V\n",
         0, NAN}, /* all of it flows through M: the state itself */
        /* a law within its limits: 1 mA into 3 kohm */
        {"rail v 1 V\nresistor R0 v -> gnd 1k\nresistor R a -> gnd 3k\n"
         "law L gnd -> a i = max(min(2 mA - v.v/2 kohm, v.v/1 kohm), -v.v/1 kohm)\n",
         0, 3},
    };
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        struct run run;
        run_states(&run, cases[k].text, 10000);
        const struct states_result *found = run.result->states;
        assert_false(found->is_assumed);
        const double high = isnan(cases[k].high)
                                ? found->states[0].x[circuit_find_node(run.circuit, "a") - 1]
                                : cases[k].high;
        if (!(fabs(found->low - cases[k].low) <= 1e-3 * (1 + fabs(cases[k].low))) ||
            !(fabs(found->high - high) <= 1e-3 * (1 + fabs(high)))) {
            print_error("case %zu: %g to %g\n", k, found->low, found->high);
            fail();
        }
        assert_true(found->low <= cases[k].low + 1e-6 && found->high >= high - 1e-6);
        assert_true(found->is_complete);
        run_close(&run);
    }
}

/* Nothing bounds two laws that drive each other with a gain of two: then the range is a choice, and
 * is said to be one; nor those of a transistor that carries current uphill
 * (other slopes forward and backward). */
static void test_range_unknown(void **state)
{
    (void)state;
    struct run run;
    run_states(&run,
               "rail v 1 V\nlaw L1 a -> gnd i = (a.v - 2*b.v)/1 kohm\n"
               "law L2 b -> gnd i = (b.v - 2*a.v + v.v)/1 kohm\n",
               10000);
    assert_true(run.result->states->is_assumed);
    run_close(&run);
    run_states(&run,
               "model q npn\n saturation_current = 1 fA\n beta = 100\n emission = 1.1\nend\n"
               "rail v 5 V\nresistor R v -> c 1k\nresistor RB v -> b 100k\n"
               "npn Q c=c b=b e=gnd model=q\n",
               10000);
    assert_true(run.result->states->is_assumed);
    run_close(&run);
}

/* --- in a review
 * ---------------------------------------------------------------------------------- */

static bool has_caution(const struct run *run, const char *code)
{
    for (int k = 0; k < run->result->cautions.count; k++) {
        if (strcmp(run->result->cautions.list[k].code, code) == 0) {
            return true;
        }
    }
    return false;
}

/* By itself where there is a loop: the five states of N03, proved. */
static void test_review_loop(void **state)
{
    (void)state;
    struct run run;
    run_review(&run, five_states, VIEW_FULL);
    assert_non_null(run.result->states);
    check_count(&run, 5);
    assert_true(run.result->states->is_brief);
    assert_int_equal(run.result->states->startup, STARTUP_AT_RISK);
    assert_true(has_caution(&run, "loop"));
    /* the page shows the state that it found before, and is that one marked */
    const struct state_result *wanted = &run.result->states->states[run.result->states->wanted];
    const int node = circuit_find_node(run.circuit, "c1");
    assert_true(fabs(wanted->x[node - 1] - run.result->point.x[node - 1]) < 1e-9);
    run_close(&run);
}

/* Without a loop nothing is looked for. */
static void test_review_no_loop(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "process \"n180.process\"\nrail vdd 1.8 V\nresistor R vdd -> a 50k\n"
               "nmos M1 d=a g=a s=gnd W=2u L=1u\nnmos M2 d=o g=a s=gnd W=2u L=1u\n"
               "output o at 1 V from 0 V to 1.8 V\n",
               VIEW_FULL);
    assert_null(run.result->states);
    assert_false(has_caution(&run, "loop"));
    run_close(&run);
}

/* The budget of a review is small: of the 81 states of four triggers it says that it did not
 * finish, and gives those that it has. */
static void test_review_budget(void **state)
{
    (void)state;
    struct run run;
    run_review(&run, TRIGGER_MODEL TRIGGER("x") TRIGGER("y") TRIGGER("z") TRIGGER("w"), VIEW_FULL);
    const struct states_result *found = run.result->states;
    assert_non_null(found);
    assert_false(found->is_complete);
    assert_true(found->boxes <= found->box_limit && found->state_count >= 1);
    assert_true(found->undecided_boxes > 0);
    assert_true(has_caution(&run, "loop"));
    run_close(&run);
}

int main(int count, char **words)
{
    const struct CMUnitTest slow[] = {cmocka_unit_test(test_scalable_ten)};
    if (count > 1 && strcmp(words[1], "slow") == 0) {
        return cmocka_run_group_tests(slow, NULL, NULL);
    }
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_tunnel_diode),     cmocka_unit_test(test_tunnel_pair),
        cmocka_unit_test(test_five_states),      cmocka_unit_test(test_trigger),
        cmocka_unit_test(test_two_triggers),     cmocka_unit_test(test_latch),
        cmocka_unit_test(test_transistor_latch), cmocka_unit_test(test_scalable),
        cmocka_unit_test(test_piecewise),        cmocka_unit_test(test_mirror),
        cmocka_unit_test(test_no_budget),        cmocka_unit_test(test_multiplier),
        cmocka_unit_test(test_loop_curve),       cmocka_unit_test(test_loops),
        cmocka_unit_test(test_certificate),      cmocka_unit_test(test_no_point_from_cold),
        cmocka_unit_test(test_no_state),         cmocka_unit_test(test_coupled_flip_flops),
        cmocka_unit_test(test_hand_view_off),    cmocka_unit_test(test_range),
        cmocka_unit_test(test_range_unknown),    cmocka_unit_test(test_review_loop),
        cmocka_unit_test(test_review_no_loop),   cmocka_unit_test(test_review_budget),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
