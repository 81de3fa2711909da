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

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_unsolved)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
