/*
 * search_test.c: networks built by hand, with solutions that are formulas.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <string.h>

#include <cmocka.h>

#include "check.h"
#include "devices/law.h"
#include "proof/certify.h"
#include "proof/contract.h"
#include "proof/search.h"

/* v/R - (U - ...) : U through R into a junction: (v - U)/R + IS (exp(v/UT) - 1) = 0. */
static struct network *diode_network(struct arena *arena, double volts, double ohms, double is,
                                     double thermal)
{
    struct network *n = network_create(arena, 1);
    assert_non_null(n);
    const struct interval g = interval_div(interval_point(1), interval_point(ohms));
    assert_true(network_add(n, 0, 0, g));
    network_add_constant(n, 0, interval_mul(g, interval_point(-volts)));
    struct element e;
    memset(&e, 0, sizeof e);
    e.kind = &element_junction;
    e.coefficient = is;
    e.thermal = thermal;
    e.forward = e.reverse = -1;
    e.argument_count = 1;
    e.arguments[0] = network_node(0, interval_point(0));
    e.terms[0] = (struct element_term){0, 1};
    e.term_count = 1;
    assert_true(network_element(n, &e, NULL));
    assert_true(network_finish(n));
    n->start[0] = (struct interval){-1, volts + 1};
    return n;
}

/* Newton in long double on the same scalar equation: the independent answer. */
static double diode_voltage(double volts, double ohms, double is, double thermal)
{
    long double v = 0.6L;
    for (int k = 0; k < 200; k++) {
        const long double grown = is * expl(v / thermal);
        v -= ((v - volts) / ohms + grown - is) / (1 / (long double)ohms + grown / thermal);
    }
    return (double)v;
}

struct guess {
    double volts, ohms, is, thermal;
};

static bool refine(void *self, double *nodes)
{
    const struct guess *g = self;
    nodes[0] = diode_voltage(g->volts, g->ohms, g->is, g->thermal);
    return true;
}

static void test_diode(void **state)
{
    (void)state;
    static const struct guess cases[] = {
        {5, 1e3, 1e-14, 0.02585}, {5, 1e9, 1e-15, 0.04}, {0.1, 10, 1e-12, 0.02585}};
    for (int k = 0; k < 3; k++) {
        struct guess g = cases[k];
        struct arena *arena = arena_create();
        struct network *n = diode_network(arena, g.volts, g.ohms, g.is, g.thermal);
        const struct search_options options = {
            .box_limit = 100, .refine = refine, .refine_self = &g};
        struct search *s = search_create(n, &options);
        assert_non_null(s);
        assert_int_equal(search_run(s), STATUS_OK);
        const struct search_result *found = search_found(s);
        assert_true(found->complete);
        assert_int_equal(found->state_count, 1);
        const double wanted = diode_voltage(g.volts, g.ohms, g.is, g.thermal);
        assert_true(interval_holds(found->states[0].box[0], wanted));
        assert_true(interval_width(found->states[0].box[0]) < 1e-11);
        assert_int_equal(found->states[0].determinant, 1);
        arena_destroy(arena);
    }
}

/* Contraction alone never loses the solution, from any box around it. */
static void test_contraction_keeps(void **state)
{
    (void)state;
    const struct guess g = {3, 47e3, 2e-15, 0.0259};
    const double root = diode_voltage(g.volts, g.ohms, g.is, g.thermal);
    struct arena *arena = arena_create();
    struct network *n = diode_network(arena, g.volts, g.ohms, g.is, g.thermal);
    struct contractor *c = contractor_create(n);
    assert_non_null(c);
    for (int k = 1; k < 400; k++) {
        struct interval box[2];
        n->start[0] = (struct interval){root - 0.013 * (k % 20), root + 0.0011 * k};
        contract_start(n, box);
        assert_true(contract_propagate(c, box));
        assert_true(contract_program(c, box, true));
        assert_true(interval_holds(box[0], root));
    }
    n->start[0] = (struct interval){root + 1e-9, root + 3}; /* the root is just outside */
    struct interval box[2];
    contract_start(n, box);
    bool empty = false;
    for (int k = 0; k < 20 && !empty; k++) {
        empty = !contract_propagate(c, box) || !contract_program(c, box, true);
    }
    assert_true(empty || interval_width(box[0]) < 1e-6);
    arena_destroy(arena);
}

/* x^3 - x = 0 through a law: -1, 0, 1; the middle one turns the sign of the determinant. */
static bool refine_cubic(void *self, double *nodes)
{
    (void)self;
    nodes[0] = nodes[0] < -0.5 ? -1 : nodes[0] > 0.5 ? 1 : 0;
    return true;
}

static struct network *cubic_network(struct arena *arena, const struct law_program *program)
{
    struct network *n = network_create(arena, 1);
    struct element e;
    memset(&e, 0, sizeof e);
    e.kind = &element_law;
    e.prepared = program;
    e.forward = e.reverse = -1;
    e.argument_count = 1;
    e.arguments[0] = network_node(0, interval_point(0));
    e.terms[0] = (struct element_term){0, 1};
    e.term_count = 1;
    assert_true(network_element(n, &e, NULL) && network_finish(n));
    n->start[0] = (struct interval){-7, 5};
    return n;
}

static const struct law_step cubic_steps[] = {{LAW_INPUT, 0, 0},
                                              {LAW_CONSTANT, 3, 0},
                                              {LAW_POWER, 0, 0},
                                              {LAW_INPUT, 0, 0},
                                              {LAW_SUBTRACT, 0, 0}};
static const struct law_program cubic = {cubic_steps, 5, 1};

static void test_cubic(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct network *n = cubic_network(arena, &cubic);
    const struct search_options options = {.box_limit = 1000, .refine = refine_cubic};
    struct search *s = search_create(n, &options);
    assert_int_equal(search_run(s), STATUS_OK);
    const struct search_result *found = search_found(s);
    assert_true(found->complete);
    assert_int_equal(found->state_count, 3);
    int sum = 0;
    for (int k = 0; k < 3; k++) {
        const double x = found->states[k].centre[0];
        sum += (int)x;
        assert_int_equal(found->states[k].determinant, fabs(x) > 0.5 ? 1 : -1);
    }
    assert_int_equal(sum, 0);
    arena_destroy(arena);
}

/* A budget of one box: nothing is claimed, and what is left holds all three solutions. */
static void test_budget(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct network *n = cubic_network(arena, &cubic);
    const struct search_options options = {.box_limit = 1};
    struct search *s = search_create(n, &options);
    assert_int_equal(search_run(s), STATUS_OK);
    const struct search_result *found = search_found(s);
    assert_false(found->complete);
    assert_true(found->undecided > 0);
    assert_true(found->rest[0].lo <= -1 && found->rest[0].hi >= 1);
    arena_destroy(arena);
}

/* Without Newton the solutions are never found: the boxes around them stay undecided. */
static void test_no_newton(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct network *n = cubic_network(arena, &cubic);
    const struct search_options options = {.box_limit = 300};
    struct search *s = search_create(n, &options);
    assert_int_equal(search_run(s), STATUS_OK);
    assert_false(search_found(s)->complete);
    arena_destroy(arena);
}

/* x^2 = 0: a double root has a singular Jacobian, so that it can neither be certified nor excluded.
 */
static const struct law_step square_steps[] = {
    {LAW_INPUT, 0, 0}, {LAW_CONSTANT, 2, 0}, {LAW_POWER, 0, 0}};
static const struct law_program square = {square_steps, 3, 1};

static void test_double_root(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct network *n = cubic_network(arena, &square);
    struct certifier *c = certifier_create(n);
    struct interval box[1];
    const double zero = 0;
    assert_false(certify_exactly(c, &zero, box));
    const struct search_options options = {.box_limit = 500};
    struct search *s = search_create(n, &options);
    assert_int_equal(search_run(s), STATUS_OK);
    assert_false(search_found(s)->complete);
    assert_true(interval_holds(search_found(s)->rest[0], 0));
    arena_destroy(arena);
}

static bool stop_now(void *self)
{
    (void)self;
    return true;
}

static void test_stop(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct network *n = cubic_network(arena, &cubic);
    const struct search_options options = {.box_limit = 1000, .stopped = stop_now};
    struct search *s = search_create(n, &options);
    assert_int_equal(search_run(s), STATUS_STOPPED);
    assert_false(search_found(s)->complete);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_diode),     cmocka_unit_test(test_contraction_keeps),
        cmocka_unit_test(test_cubic),     cmocka_unit_test(test_budget),
        cmocka_unit_test(test_no_newton), cmocka_unit_test(test_double_root),
        cmocka_unit_test(test_stop),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
