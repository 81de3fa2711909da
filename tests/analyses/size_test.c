/*
 * size_test.c: chosen values against closed forms, bounds, wrong sets of lines, preferred values
 * and the rewritten cell.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/cells.h"
#include "analyses/size.h"
#include "analyses/solved_cell.h"

struct sized {
    struct solved_cell cell; /* read and built only */
    struct result *result;
    enum status status;
};

static void size_open(struct sized *it, const char *text, enum view view)
{
    const struct analysis_options options = {.view = view, .grid = 10e-9};
    *it = (struct sized){0};
    cell_open(&it->cell, text);
    it->status = analysis_size(it->cell.circuit, &options, &it->result);
}

static void size_close(struct sized *it)
{
    result_free(it->result);
    cell_close(&it->cell);
}

/* R = sqrt(2/(beta I)) (1 - 1/sqrt K), from M06; at 5 uA 10 kohm. */
static void beta_multiplier(void **state)
{
    (void)state;
    struct sized it;
    size_open(&it, BETA_MULTIPLIER "choose R from 1k to 100k so bias.current = 5 uA\n", VIEW_HAND);
    assert_int_equal(it.status, STATUS_OK);
    assert_true(it.result->size->solved);
    check_near(it.result->size->list[0].value, 10e3, 1e-9);
    check_near(it.result->size->list[0].reached, 5e-6, 1e-10);
    assert_int_equal(it.result->size->rounding_count, 2);
    check_near(it.result->size->roundings[0].values[0], 10e3, 1e-12);
    size_close(&it);
}

/* R2 = UT ln(IIN/IOUT)/IOUT: 27.551 kohm at UT = 26 mV (B03), here at 27 C. */
static void widlar(void **state)
{
    (void)state;
    struct sized it;
    const double ut = BOLTZMANN_OVER_CHARGE * 300.15;
    size_open(&it, WIDLAR("1k") "choose R2 from 1k to 1M so out.current = 5 uA\n", VIEW_FULL);
    assert_int_equal(it.status, STATUS_OK);
    check_near(it.result->size->list[0].value, ut * log(200) / 5e-6, 1e-6);
    /* rounded to E24 and E96: what the transcendental equation gives there */
    for (int r = 0; r < 2; r++) {
        const struct rounding *rounding = &it.result->size->roundings[r];
        check_near(rounding->values[0], r == 0 ? 27e3 : 27.4e3, 1e-12);
        const double i = rounding->reached[0];
        check_near(i * rounding->values[0], ut * log(1e-3 / i), 1e-6);
    }
    size_close(&it);
}

/* Two at once: 3 V over RA + RB with 1 mA and 2 V at the middle: 1k and 2k. */
static void two_unknowns(void **state)
{
    (void)state;
    struct sized it;
    size_open(&it,
              "rail vcc 3 V\nresistor RA vcc -> mid 70k\nresistor RB mid -> gnd 5k\n"
              "choose RA from 100 to 1M so mid.v = 2 V\n"
              "choose RB from 100 to 1M so vcc.current = 1 mA\n",
              VIEW_FULL);
    assert_int_equal(it.status, STATUS_OK);
    assert_true(it.result->size->solved);
    check_near(it.result->size->list[0].value, 1e3, 1e-9);
    check_near(it.result->size->list[1].value, 2e3, 1e-9);
    size_close(&it);
}

/* A let, a width on the grid and the number of devices can be chosen too. A square-law mirror: the
 * current is that of IREF times W2/W1. */
static void other_unknowns(void **state)
{
    (void)state;
    static const char text[] =
        "let IREF = 10 uA\nmodel n nmos\n  threshold = 0.5 V\n  kprime = 200 uA/V^2\nend\n"
        "rail vdd 3 V\ncurrent I1 vdd -> ref IREF*2\nnmos M1 d=ref g=ref s=gnd W=4u L=2u\n"
        "nmos M2 d=out g=ref s=gnd W=4u L=2u\noutput out at 1 V from 0 V to 3 V\n";
    char whole[sizeof text + 100];
    struct sized it;
    snprintf(whole, sizeof whole, "%schoose IREF from 1 uA to 1 mA so out.current = 50 uA\n", text);
    size_open(&it, whole, VIEW_HAND);
    check_near(it.result->size->list[0].value, 25e-6, 1e-8);
    assert_int_equal(it.result->size->rounding_count, 0);
    size_close(&it);
    snprintf(whole, sizeof whole, "%schoose M2.W from 1u to 100u so out.current = 33.333 uA\n",
             text);
    size_open(&it, whole, VIEW_HAND);
    check_near(it.result->size->list[0].value, 4e-6 * 33.333 / 20, 1e-8);
    assert_string_equal(it.result->size->roundings[0].name, "grid");
    check_near(it.result->size->roundings[0].values[0], 6.67e-6, 1e-12);
    check_near(it.result->size->roundings[0].reached[0], 20e-6 * 6.67 / 4, 1e-8);
    size_close(&it);
    snprintf(whole, sizeof whole, "%schoose M2.m from 1 to 10 so out.current = 58 uA\n", text);
    size_open(&it, whole, VIEW_HAND);
    check_near(it.result->size->list[0].value, 2.9, 1e-8);
    check_near(it.result->size->roundings[0].values[0], 3, 1e-12);
    check_near(it.result->size->roundings[0].reached[0], 60e-6, 1e-8);
    size_close(&it);
}

/* 3 V over 10k + RB with RB up to 20k: 2 V at most. */
static void bounds(void **state)
{
    (void)state;
    struct sized it;
    size_open(&it,
              "rail vcc 3 V\nresistor RA vcc -> mid 10k\nresistor RB mid -> gnd 5k\n"
              "choose RB from 1k to 20k so mid.v = 2.5 V\n",
              VIEW_FULL);
    assert_int_equal(it.status, STATUS_OK);
    assert_false(it.result->size->solved);
    assert_int_equal(it.result->verdict, VERDICT_NOT_MET);
    assert_int_equal(it.result->size->list[0].bound, BOUND_TO);
    check_near(it.result->size->list[0].value, 20e3, 1e-12);
    check_near(it.result->size->list[0].reached, 2, 1e-9);
    size_close(&it);
}

struct wrong_case {
    const char *lines;
    const char *message;
    int line;
};

static void wrong_sets(void **state)
{
    (void)state;
    static const char text[] = "rail vcc 3 V\nrail other 5 V\nresistor RA vcc -> mid 10k\n"
                               "resistor RB mid -> gnd 5k\nresistor RX other -> gnd 1k\n";
    static const struct wrong_case cases[] = {
        {"", "the cell has no `choose` line", 0},
        {"choose RB from 1k to 20k so mid.v = 1 V\nchoose RB from 1k to 20k so RA.i = 0.1 mA\n",
         "over-determined: RB is chosen by two lines", 7},
        {"choose RA from 1k to 20k so mid.v = 1 V\nchoose RB from 1k to 20k so mid.v = 1.2 V\n",
         "under-determined: RA and RB are both chosen so that mid.v meets its target", 7},
        {"choose RX from 1k to 20k so mid.v = 1.2 V\n",
         "under-determined: RX changes none of the targets", 6},
        {"choose RX from 1k to 20k so mid.v = 1.2 V\n",
         "over-determined: nothing that is chosen changes mid.v", 6},
        {"choose RA from 1k to 20k so RA.i = 0.2 mA\n"
         "choose RB from 1k to 20k so vcc.current = 0.25 mA\n",
         "over-determined: vcc.current follows from the targets before it, whatever is chosen", 7},
    };
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        char whole[sizeof text + 200];
        struct sized it;
        snprintf(whole, sizeof whole, "%s%s", text, cases[k].lines);
        size_open(&it, whole, VIEW_FULL);
        assert_int_equal(it.status, STATUS_INPUT);
        assert_null(it.result);
        const struct diagnostics *found = &it.cell.cell->diagnostics;
        bool told = false;
        for (int d = 0; d < found->count; d++) {
            told |= strcmp(found->list[d].text, cases[k].message) == 0 &&
                    source_line(&it.cell.cell->sources, found->list[d].where) == cases[k].line;
        }
        if (!told) {
            print_error("case %zu: %s\n", k, found->count > 0 ? found->list[0].text : "nothing");
            fail();
        }
        size_close(&it);
    }
}

/* IEC 60063 (D08): eight E24 values differ from the rounded power; E96 below 115: 100 102 105 107
 * 110 113 115. Nearest by ratio; ties up. */
static void preferred(void **state)
{
    (void)state;
    int differ = 0;
    double sum = 0;
    for (int k = 0; k < 24; k++) {
        const double plain = round(10 * pow(10, k / 24.0)) / 10;
        differ += fabs(preferred_e24(plain) - plain) > 1e-9;
    }
    assert_int_equal(differ, 8);
    static const double low[] = {100, 102, 105, 107, 110, 113, 115};
    for (int k = 0; k < 7; k++) {
        check_near(preferred_e96(low[k] * 1.001), low[k], 1e-12);
        sum += preferred_e96(low[k]);
    }
    check_near(sum, 752, 1e-12);
    check_near(preferred_e24(sqrt(10e3 * 11e3)), 11e3, 1e-12);         /* a tie by ratio */
    check_near(preferred_e24(sqrt(13e3 * 15e3) * 0.999), 13e3, 1e-12); /* 13.96k, not by distance */
    check_near(preferred_e24(9.6), 10, 1e-12);
    check_near(preferred_e96(9.9), 10, 1e-12);
    check_near(preferred_e24(47.1e-3), 47e-3, 1e-12);
    check_near(preferred_e96(3.3e9), 3.32e9, 1e-12);
}

/* The copy keeps comments and layout, and means the chosen values; a let without a unit stays so.
 */
static void rewrite(void **state)
{
    (void)state;
    static const char text[] = "# a divider\nlet RB = 5k   # lower arm\nrail  vcc   3 V\n"
                               "resistor RA  vcc -> mid   10 kohm  tempco=1 ppm/K # upper\n"
                               "resistor R2 mid -> gnd RB\n\n"
                               "choose RA from 1k to 90k so mid.v = 2 V\n"
                               "choose RB from 1k to 90k so vcc.current = 0.1 mA\n";
    static const char wanted[] = "# a divider\nlet RB = 20000   # lower arm\nrail  vcc   3 V\n"
                                 "resistor RA  vcc -> mid   10 kohm  tempco=1 ppm/K # upper\n"
                                 "resistor R2 mid -> gnd RB\n\n"
                                 "choose RA from 1k to 90k so mid.v = 2 V\n"
                                 "choose RB from 1k to 90k so vcc.current = 0.1 mA\n";
    struct sized it;
    size_open(&it, text, VIEW_FULL);
    assert_true(it.result->size->solved);
    const double values[] = {it.result->size->list[0].value, it.result->size->list[1].value};
    assert_string_equal(size_rewrite(it.cell.circuit, values, it.result->arena), wanted);
    size_close(&it);
}

/* A count that was left out, the temperature, a rail and a width; and a value inside a block. */
static void rewrite_places(void **state)
{
    (void)state;
    static const char text[] =
        "process \"n180.process\"\nrail vdd 1.8 V\nblock half a\n  resistor R a -> gnd 10k\nend\n"
        "use half X a=ref\ncurrent I vdd -> ref 100 uA\nnmos M d=ref g=ref s=gnd W=4u L=2u # m\n"
        "choose M.m from 1 to 9 so ref.v = 0.6 V\nchoose temperature from 0 C to 90 C so X.R.i = 1 "
        "uA\n"
        "choose vdd from 1 V to 3 V so vdd.power = 1 mW\nchoose M.W from 1u to 9u so M.id = 1 uA\n";
    struct solved_cell it;
    const double values[] = {3, 320.5, 2.25, 4.4e-6};
    struct arena *arena = arena_create();
    cell_open(&it, text);
    const char *written = size_rewrite(it.circuit, values, arena);
    assert_non_null(written);
    assert_non_null(strstr(written, "nmos M d=ref g=ref s=gnd W=4.4 um L=2u m=3 # m\n"));
    assert_non_null(strstr(written, "rail vdd 2.25 V\n"));
    assert_non_null(strstr(written, "\ntemperature 320.5 K\n"));
    cell_close(&it);
    cell_open(&it, written); /* and it reads again */
    cell_close(&it);
    cell_open(&it, "rail v 1 V\nblock half a\n  resistor R a -> gnd 10k\nend\nuse half X a=v\n"
                   "choose X.R from 1k to 9k so v.current = 1 mA\n");
    assert_null(size_rewrite(it.circuit, values, arena));
    assert_int_equal(it.cell->diagnostics.count, 1);
    cell_close(&it);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(beta_multiplier), cmocka_unit_test(widlar),
        cmocka_unit_test(two_unknowns),    cmocka_unit_test(other_unknowns),
        cmocka_unit_test(bounds),          cmocka_unit_test(wrong_sets),
        cmocka_unit_test(preferred),       cmocka_unit_test(rewrite),
        cmocka_unit_test(rewrite_places),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
