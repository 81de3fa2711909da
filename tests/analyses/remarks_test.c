/* remarks_test.c: each caution comes in a cell that has the fault, not in its repaired twin, and is
 * silenced by `quiet`; requirements and hand lines are judged. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include "run_fixture.h"

#define PROCESS "process \"n350.process\"\n"
#define MIRROR PROCESS "rail vdd 3.3 V\ncurrent I1 vdd -> ref 20 uA\n"
#define IN "nmos M1 d=ref g=ref s=gnd W=20u L=4u\n"
#define OUT "nmos M2 d=tail g=ref s=gnd W=20u L=4u\n"

static const struct row {
    const char *code, *thing; /* thing "": the whole cell */
    int line;                 /* of the faulty cell, 0: none */
    const char *faulty, *repaired;
} rows[] = {
    {"case-names", "REF", 3,
     "rail vdd 3 V\nresistor R1 vdd -> ref 1k\nresistor R2 ref -> REF 1k\nresistor R3 REF -> gnd "
     "1k\n",
     "rail vdd 3 V\nresistor R1 vdd -> ref 1k\nresistor R2 ref -> low 1k\nresistor R3 low -> gnd "
     "1k\n"},
    /* 2 n UT is 67 mV */
    {"square-law", "M1", 3,
     PROCESS "rail vdd 3.3 V\nnmos M1 d=ref g=ref s=gnd W=200u L=4u\ncurrent I1 vdd -> ref 1 uA\n"
             "hand M1.vgs = 0.6 V\n",
     PROCESS "rail vdd 3.3 V\nnmos M1 d=ref g=ref s=gnd W=2u L=4u\ncurrent I1 vdd -> ref 20 uA\n"
             "hand M1.vgs = 0.6 V\n"},
    {"triode", "M2", 5, MIRROR IN OUT "output tail at 50 mV from 0 V to 3 V\n",
     MIRROR IN OUT "output tail at 0.8 V from 0 V to 3 V\n"},
    {"headroom", "M2", 5, MIRROR IN OUT "output tail at 0.3 V from 0 V to 3 V\n",
     MIRROR IN OUT "output tail at 0.8 V from 0 V to 3 V\n"},
    {"mirror-length", "M2", 5,
     MIRROR IN "nmos M2 d=tail g=ref s=gnd W=20u L=5u\noutput tail at 0.8 V from 0 V to 3 V\n",
     MIRROR IN "nmos M2 d=tail g=ref s=gnd W=10u L=4u\noutput tail at 0.8 V from 0 V to 3 V\n"},
    {"mirror-voltage", "M2", 5, MIRROR IN OUT "output tail at 3 V from 0 V to 3 V\n",
     MIRROR IN OUT "output tail at 0.8 V from 0 V to 3 V\n"},
    {"mirror-voltage", "Q2", 4,
     "model q npn\n early = 50 V\nend\nnpn Q2 c=o b=b e=gnd\nrail vcc 9 V\ncurrent I1 vcc -> b 10 "
     "uA\n"
     "npn Q1 c=b b=b e=gnd\noutput o at 8 V from 0 V to 9 V\n",
     "model q npn\n early = 50 V\nend\nnpn Q2 c=o b=b e=gnd\nrail vcc 9 V\ncurrent I1 vcc -> b 10 "
     "uA\n"
     "npn Q1 c=b b=b e=gnd\noutput o at 0.8 V from 0 V to 9 V\n"},
    {"model-range", "M1", 4, MIRROR "nmos M1 d=ref g=ref s=gnd W=20u L=0.2u\n", MIRROR IN},
    {"model-range", "nmos", 0, "temperature 200 C\n" MIRROR IN, "temperature 80 C\n" MIRROR IN},
    {"leakage", "R1", 2,
     "rail vdd 3 V\nresistor R1 vdd -> gnd 20M\nnmos M1 d=vdd g=vdd s=gnd W=1u "
     "L=1u\nmodel n nmos\n threshold = 0.5 V\n kprime = 100 uA/V^2\nend\n",
     "rail vdd 3 V\nresistor R1 vdd -> gnd 2M\nnmos M1 d=vdd g=vdd s=gnd W=1u L=1u\n"
     "model n nmos\n threshold = 0.5 V\n kprime = 100 uA/V^2\nend\n"},
    {"leakage", "M1", 2,
     "rail vdd 3 V\nnmos M1 d=vdd g=gnd s=gnd W=1u L=1u\nmodel n nmos\n"
     " threshold = 0.8 V\n kprime = 100 uA/V^2\nend\n",
     "rail vdd 3 V\nnmos M1 d=vdd g=gnd s=gnd W=1u L=1u\nmodel n nmos\n"
     " threshold = 0.3 V\n kprime = 100 uA/V^2\nend\n"},
    {"hot", "", 0, "temperature 100 C\n" MIRROR IN, "temperature 84 C\n" MIRROR IN},
    {"touch-voltage", "hv", 1, "rail hv 61 V\nresistor R1 hv -> gnd 1M\n",
     "rail hv 59 V\nresistor R1 hv -> gnd 1M\n"},
    {"touch-voltage", "hv", 1, "rail hv -61 V\nresistor R1 hv -> gnd 1M\n",
     "rail hv -59 V\nresistor R1 hv -> gnd 1M\n"},
    {"dissipation", "R1", 2, "rail vdd 10 V\nresistor R1 vdd -> gnd 300\n",
     "rail vdd 10 V\nresistor R1 vdd -> gnd 500\n"}, /* 0.33 W and 0.2 W */
    {"dissipation", "Q1", 3,
     "rail vdd 10 V\ncurrent I1 vdd -> b 1 mA\nnpn Q1 c=vdd b=b e=gnd\n", /* 100 mA at 10 V */
     "rail vdd 10 V\ncurrent I1 vdd -> b 0.4 mA\nnpn Q1 c=vdd b=b e=gnd\n"},
    {"assumed-slope", "M1", 2,
     "rail vdd 3 V\nnmos M1 d=vdd g=vdd s=gnd conduction=1 mA/V^2 threshold=0.5 V\n",
     "rail vdd 3 V\nnmos M1 d=vdd g=vdd s=gnd conduction=1 mA/V^2 threshold=0.5 V slope=1.2\n"},
    {"off-state", "tail", 4,
     PROCESS "resistor R1 g -> gnd 1k\nnmos M2 d=tail g=g s=gnd W=1u L=20u\n"
             "output tail at 1 V from 0 V to 3 V\n",
     PROCESS "rail vdd 3.3 V\nresistor R1 g -> vdd 1k\nnmos M2 d=tail g=g s=gnd W=1u L=20u\n"
             "output tail at 1 V from 0 V to 3 V\n"},
    {"forward-junction", "M1", 3,
     PROCESS "rail vdd 3.3 V\nnmos M1 d=vdd g=vdd s=gnd b=vb W=1u L=1u\nrail vb 0.4 V\n",
     PROCESS "rail vdd 3.3 V\nnmos M1 d=vdd g=vdd s=gnd b=vb W=1u L=1u\nrail vb 0.2 V\n"},
    /* current falls as the voltage rises */
    {"output-direction", "o", 2,
     "law G1 o -> gnd i = 3 mA - o.v*1 mA/V\noutput o at 1 V from 0 V to 2 V\nrail v 1 V\n"
     "resistor R1 v -> gnd 1k\n",
     "law G1 o -> gnd i = 3 mA + o.v*1 mA/V\noutput o at 1 V from 0 V to 2 V\nrail v 1 V\n"
     "resistor R1 v -> gnd 1k\n"},
};

static const struct caution *find(const struct run *run, const struct row *row)
{
    for (int k = 0; k < run->result->cautions.count; k++) {
        const struct caution *c = &run->result->cautions.list[k];
        if (strcmp(c->code, row->code) == 0 && strcmp(c->thing, row->thing) == 0) {
            return c;
        }
    }
    return NULL;
}

static void test_each_caution(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        const struct row *row = &rows[k];
        char text[1000];
        struct run run;
        run_open(&run, row->faulty, VERB_REVIEW, VIEW_FULL, NAN);
        const struct caution *caution = find(&run, row);
        if (run.status != STATUS_OK || caution == NULL || caution->line != row->line) {
            print_error("%s %s: missing, or on line %d\n%s", row->code, row->thing,
                        caution == NULL ? -1 : caution->line, row->faulty);
            fail();
        }
        run_close(&run);
        run_open(&run, row->repaired, VERB_REVIEW, VIEW_FULL, NAN);
        if (run.status != STATUS_OK || find(&run, row) != NULL) {
            print_error("%s %s: still there\n%s", row->code, row->thing, row->repaired);
            fail();
        }
        run_close(&run);
        (void)snprintf(text, sizeof text, "%squiet %s %s\n", row->faulty, row->code, row->thing);
        run_open(&run, text, VERB_REVIEW, VIEW_FULL, NAN);
        assert_null(find(&run, row));
        run_close(&run);
    }
}

/* Three states at one load voltage: the sweep cannot follow, and says so. */
static void test_sweep_event(void **state)
{
    (void)state;
    struct run run;
    /* a lossy latch of two laws: x falls back through a fold when the load is lowered */
    run_open(&run,
             "rail vdd 3 V\nlaw G1 x -> gnd i = 1 mA/V*(x.v - 2.5V*(1 + exp(-8*(x.v + o.v - "
             "2V)/1V))^(-1))\n"
             "resistor R1 o -> x 100k\nresistor R2 vdd -> gnd 1k\n"
             "output o at 2 V from -1 V to 3 V\n",
             VERB_REVIEW, VIEW_FULL, NAN);
    assert_int_equal(run.status, STATUS_OK);
    bool said = false;
    for (int k = 0; k < run.result->cautions.count; k++) {
        said |= strcmp(run.result->cautions.list[k].code, "sweep") == 0;
    }
    assert_true(said);
    assert_true(run.result->outputs[0].event_count > 0);
    run_close(&run);
}

/* --- requirements -------------------------------------------------------------------------------
 */

static void test_requirements(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "rail vdd 4 V\nresistor R1 vdd -> m 1k\nresistor R2 m -> gnd 1k\n"
               "require m.v above 1.9 V\nrequire m.v above 2 V\nrequire m.v below 2 V\n"
               "require m.v within 0.5 V of 2.5 V\nrequire m.v within 25% of 1.6 V\n"
               "require m.v within 10% of 2.5 V\nrequire R1.i below 1.5 mA\n"
               "require all.headroom above 0 V\nrequire m.v above 3 V everywhere\n"
               "require m.v above 3 V for 99%\n",
               VIEW_FULL);
    static const enum judgement wanted[] = {
        JUDGED_MET,     JUDGED_NOT_MET,
        JUDGED_NOT_MET, /* at the bound itself: not above, not below */
        JUDGED_MET,     /* within: the bound belongs to it */
        JUDGED_MET,     JUDGED_NOT_MET,
        JUDGED_NOT_MET, JUDGED_UNKNOWN, /* a cell without transistors has no headroom */
        JUDGED_NOT_MET, /* everywhere, without a `vary` line: at the own conditions */
        JUDGED_NOT};
    assert_int_equal(run.result->requirement_count, 10);
    for (int k = 0; k < 10; k++) {
        if (run.result->requirements[k].judgement != wanted[k]) {
            print_error("%s\n", run.result->requirements[k].requirement->text);
            fail();
        }
    }
    check_near(run.result->requirements[0].margin, 0.1, 1e-12);
    check_near(run.result->requirements[5].margin, -0.25, 1e-12);
    assert_int_equal(run.result->verdict, VERDICT_NOT_MET);
    run_close(&run);
    run_review(&run, "rail vdd 4 V\nresistor R1 vdd -> gnd 1k\nrequire R1.i above 1 mA\n",
               VIEW_FULL);
    assert_int_equal(run.result->verdict, VERDICT_MET);
    run_close(&run);
    run_review(&run, "rail vdd 4 V\nresistor R1 vdd -> gnd 1k\n", VIEW_FULL);
    assert_int_equal(run.result->verdict, VERDICT_NO_REQUIREMENTS);
    run_close(&run);
    run_review(&run, "rail vdd 4 V\nresistor R1 vdd -> gnd 1k\nrequire R1.i above 1 A for 99%\n",
               VIEW_FULL);
    assert_int_equal(run.result->verdict, VERDICT_NO_REQUIREMENTS); /* not judged here */
    run_close(&run);
}

/* A negative temperature coefficient is judged by its size. */
static void test_signed_requirement(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "rail vdd 3 V\nresistor R1 vdd -> o 1k tempco=2000 ppm/K\n"
               "output o at 1 V from 0 V to 3 V\nrequire o.tempco below 1000 ppm/K\n"
               "require o.tempco below 3000 ppm/K\nrequire o.line below 0.6 / 1 V\n",
               VIEW_FULL);
    check_near(value_of(&run, "o.tempco"), -2000e-6, 1e-8);
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_NOT_MET);
    assert_int_equal(run.result->requirements[1].judgement, JUDGED_MET);
    assert_int_equal(run.result->requirements[2].judgement, JUDGED_MET);
    run_close(&run);
}

/* Hand lines: the difference, and the same quantity under the square law. */
static void test_hand(void **state)
{
    (void)state;
    struct run run;
    run_review(&run,
               "model n nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\nend\nrail vdd 3 V\n"
               "current I1 vdd -> a 100 uA\nnmos M1 d=a g=a s=gnd W=10u L=1u\n"
               "hand M1.vgs = 0.8 V\n",
               VIEW_FULL);
    const struct hand_result *hand = &run.result->hands[0];
    check_near(hand->in_hand_view, 0.5 + sqrt(0.1), 1e-12); /* I = K VOV^2, K 1 mA/V^2 */
    check_near(hand->computed, value_of(&run, "M1.vgs"), 0);
    check_near(hand->difference, hand->computed - 0.8, 0);
    run_close(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_each_caution), cmocka_unit_test(test_sweep_event),
        cmocka_unit_test(test_requirements), cmocka_unit_test(test_signed_requirement),
        cmocka_unit_test(test_hand),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
