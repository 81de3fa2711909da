/* trouble_test.c: cells without an operating point, and what is said about them in circuit words.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include "run_fixture.h"

static void check_trouble(const char *text, enum view view, const char *node, const char *device)
{
    struct run run;
    run_open(&run, text, VERB_REVIEW, view, NAN);
    const struct solver_result *solver = &run.result->point.solver;
    assert_int_equal(run.status, STATUS_UNSOLVED);
    assert_int_equal(run.result->verdict, VERDICT_UNSOLVED);
    assert_false(solver->converged);
    assert_non_null(solver->trouble);
    assert_non_null(solver->advice);
    if (strstr(solver->trouble, node) == NULL || strstr(solver->trouble, device) == NULL) {
        print_error("%s and %s are wanted in: %s\n", node, device, solver->trouble);
        fail();
    }
    run_close(&run);
}

static void test_unsolved(void **state)
{
    (void)state;
    /* two currents that cannot agree; the transistors give the node its DC path but no current */
    check_trouble("rail vdd 3 V\ncurrent I1 vdd -> x 2 uA\n"
                  "nmos M1 d=x g=gnd s=gnd conduction=1 mA/V^2 threshold=0.5 V\n",
                  VIEW_HAND, "node x", "I1");
    /* a square-law transistor that is off holds nothing */
    check_trouble("rail vdd 3 V\nnmos M1 d=vdd g=g s=x conduction=1 mA/V^2 threshold=0.5 V\n"
                  "nmos M2 d=x g=gnd s=gnd conduction=1 mA/V^2 threshold=0.5 V\n"
                  "resistor R1 g -> gnd 1k\n",
                  VIEW_HAND, "node x", "M1");
    /* a law that no voltage satisfies */
    check_trouble("rail vdd 3 V\nresistor R1 vdd -> gnd 1k\n"
                  "law G1 x -> gnd i = 1 mA*(1 + (x.v/1V)^2)\n",
                  VIEW_FULL, "node x", "G1");
}

/* The sentence shows the two currents that cannot agree. In the hand view M1 has no slope at all.
 */
static void test_currents_are_told(void **state)
{
    (void)state;
    static const char text[] = "rail vdd 3 V\nrail y 0.55 V\ncurrent I1 vdd -> x 10 uA\n"
                               "nmos M1 d=x g=y s=gnd conduction=1 mA/V^2 threshold=0.5 V\n";
    check_trouble(text, VIEW_FULL, "I1 brings 1e-05 A", "M1 takes ");
    check_trouble(text, VIEW_HAND, "nothing sets the node x", "M1");
}

/* A gate that only transistors without current hold: nothing sets it, and a NAN is no answer. */
static void test_floating_gate(void **state)
{
    (void)state;
    check_trouble("rail vdd 3 V\n"
                  "nmos M1 d=x g=gnd s=gnd conduction=1 mA/V^2 threshold=0.5 V\n"
                  "pmos M2 d=x g=vdd s=vdd conduction=1 mA/V^2 threshold=0.5 V\n"
                  "nmos M3 d=vdd g=x s=out conduction=1 mA/V^2 threshold=0.5 V\n"
                  "resistor R1 out -> gnd 10k\n",
                  VIEW_HAND, "node x", "M1, M2, M3");
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_unsolved),
                                       cmocka_unit_test(test_currents_are_told),
                                       cmocka_unit_test(test_floating_gate)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
