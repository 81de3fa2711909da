/*
 * lost_state_test.c: a sweep whose state ends on the way.
 *
 * A Wilson mirror fed by an ideal current: once the load voltage is below the gate voltage of the
 * lower pair, M2 can carry the input current only at a drain voltage without bound. What happens
 * before that (compliance) must be found, and nothing may be claimed beyond it.
 */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <cmocka.h>

#include "support/cell_run.h"
#include "support/quad.h"

static const char cell_text[] =
    "model nmos nmos\n threshold = 0.55 V\n kprime = 280 uA/V^2\n body_effect = 0.5 V^0.5\n"
    " phi = 0.85 V\n early = 12 V\n early_onset = 0.1 V\nend\n"
    "rail vdd 3 V\n"
    "current I1 vdd -> in 17.6 nA\n"
    "nmos M1 d=y g=y s=gnd W=8.2u L=8u\n"
    "nmos M2 d=in g=y s=gnd W=8.2u L=8u\n"
    "nmos M3 d=out g=in s=y W=8.2u L=8u\n"
    "output out at 2.7 V from 0 V to 3 V\n";

/* Headroom of M3 by the independent reference with the load at v. */
static double headroom_at(const struct cell_run *run, double v)
{
    static struct quad_solution solution;
    struct quad_question question = {.circuit = run->circuit,
                                     .effects = EFFECTS_FULL,
                                     .kelvin = run->circuit->kelvin,
                                     .held = run->circuit->outputs[0].instance,
                                     .held_value = 2.7};
    assert_true(quad_solve(&question, run->result->point.x, NULL, &solution));
    for (int k = 1; k <= 40; k++) {
        question.held_value = 2.7 + (v - 2.7) * k / 40;
        assert_true(quad_solve(&question, NULL, &solution, &solution));
    }
    const int m3 = circuit_find_instance(run->circuit, "M3");
    return (double)quad_device(&question, &solution, m3).headroom;
}

static void what_happens_before_the_state_ends_is_found(void **state)
{
    (void)state;
    struct cell_run run;
    assert_true(cell_run_open(&run, "wilson.cell", cell_text, VIEW_FULL, NAN));
    const struct output_result *out = &run.result->outputs[0];
    const struct curve_points *curve = &out->curve;
    assert_string_equal(out->compliance_device, "M3");
    assert_false(out->compliance_beyond);
    assert_true(headroom_at(&run, out->compliance + 20e-6) > 0);
    assert_true(headroom_at(&run, out->compliance - 20e-6) < 0);
    /* the state ends below the gate voltage of the pair, above 0 V */
    const int y = circuit_find_node(run.circuit, "y");
    assert_true(curve->v[0] > 0.2 && curve->v[0] < run.result->point.x[y - 1]);
    assert_true(out->low >= curve->v[0] && out->low < out->compliance);
    assert_true(out->event_count > 0);
    cell_run_close(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(what_happens_before_the_state_ends_is_found),
    };
    return cmocka_run_group_tests(tests, NULL, NULL) == 0 ? 0 : 1;
}
