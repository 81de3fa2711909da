/*
 * explain_test.c: shares of effects: sums, a closed form, and what is left out.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/explain.h"
#include "analyses/solved_cell.h"

/* Explanations of a cell's text or, with text NULL, of a file of netlists/. */
static struct result *explained(struct cell **cell, struct circuit **circuit, const char *text,
                                const char *file)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const struct circuit_settings settings = {.kelvin = NAN};
    struct result *result = NULL;
    assert_int_equal(cell_read(text != NULL ? "test.cell" : file, text,
                               text != NULL ? strlen(text) : 0, folders, 1, cell),
                     STATUS_OK);
    assert_int_equal(circuit_build(*cell, &settings, &(*cell)->diagnostics, circuit), STATUS_OK);
    assert_int_equal(analysis_explain(*circuit, &plain_options, &result), STATUS_OK);
    return result;
}

static void close_all(struct cell *cell, struct circuit *circuit, struct result *result)
{
    result_free(result);
    circuit_free(circuit);
    cell_free(cell);
}

static double share_of(const struct explanation *e, const char *effect)
{
    for (int k = 0; k < e->share_count; k++) {
        if (strcmp(e->shares[k].effect, effect) == 0) {
            return e->shares[k].share;
        }
    }
    return NAN;
}

/*
 * Bipolar mirror with beta 100 and VA 50 V, output at 5 V. Alone or together, with e = 1 +
 * (VCE - VBE)/VA (Gummel and Poon) and b = 1/(1 + 2/beta) (references.md B07): the output is IIN
 * times nothing, e, b, or both; the Shapley value of each effect is the mean of what it adds first
 * and last. VBE = UT ln(IF/IS) in each case.
 */
static void two_effects(void **state)
{
    (void)state;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result =
        explained(&cell, &circuit,
                  "model q npn\n  saturation_current = 1 fA\n  beta = 100\n  early = 50 V\nend\n"
                  "rail vcc 5 V\ncurrent IIN vcc -> a 100 uA\nnpn Q1 c=a b=a e=gnd model=q\n"
                  "npn Q2 c=out b=a e=gnd model=q\noutput out at 5 V from 0 V to 5 V\n"
                  "hand out.current = 99 uA\n",
                  NULL);
    const double ut = BOLTZMANN_OVER_CHARGE * 300.15, in = 100e-6, b = 1 / 1.02;
    const double early = 1 + (5 - ut * log(in / 1e-15)) / 50;
    const double early_both = 1 + (5 - ut * log(in * b / 1e-15)) / 50;
    const double none = in, one = in * early, two = in * b, both = in * b * early_both;
    const struct explanation *e = &result->explanations[0];
    assert_null(e->trouble);
    assert_int_equal(e->share_count, 3); /* the two, and the paper; no other effect is there */
    check_near(e->hand_view, none, 1e-9);
    check_near(e->computed, both, 1e-9);
    check_near(share_of(e, "channel-length modulation or Early effect"),
               ((one - none) + (both - two)) / 2, 1e-7);
    check_near(share_of(e, "finite beta and series resistance"), ((two - none) + (both - one)) / 2,
               1e-7);
    check_near(share_of(e, "the paper beside the hand view"), 1e-6, 1e-7);
    close_all(cell, circuit, result);
}

/* A resistance that the square law has unlimited is attributed as a conductance: all of it is the
 * Early effect. Of Q2, VA/IC to the accuracy of the model: (VA + VCE - VBE)/IC. */
static void unlimited(void **state)
{
    (void)state;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result =
        explained(&cell, &circuit,
                  "model q npn\n  saturation_current = 1 fA\n  beta = 1e9\n  early = 50 V\nend\n"
                  "rail vcc 5 V\ncurrent IIN vcc -> a 100 uA\nnpn Q1 c=a b=a e=gnd model=q\n"
                  "npn Q2 c=out b=a e=gnd model=q\noutput out at 5 V from 0 V to 5 V\n"
                  "hand out.resistance = 500 kohm\n",
                  NULL);
    const struct explanation *e = &result->explanations[0];
    assert_null(e->trouble);
    assert_true(e->as_conductance);
    check_near(e->paper, 2e-6, 1e-12);
    assert_true(fabs(e->hand_view) < 1e-15);
    /* IC = IIN (1 + (VCE - VBE)/VA), so dIC/dVCE = IIN/VA = 2 uS */
    check_near(share_of(e, "channel-length modulation or Early effect"), 2e-6, 1e-6);
    close_all(cell, circuit, result);
}

#define FORCED_CELL(current)                                                                       \
    "model q npn\n  saturation_current = 1 fA\n  beta = 100\n  early = 50 V\nend\n"                \
    "rail vcc 5 V\nrail vb 0.7 V\nresistor RB vb -> b 1k\ncurrent I vcc -> c " current "\n"        \
    "npn Q c=c b=b e=gnd model=q\nhand c.v = 0.1 V\n"

static const char early_name[] = "channel-length modulation or Early effect";
static const char beta_name[] = "finite beta and series resistance";

/* Voltages of the collector of FORCED_CELL: with both effects, IF at VBE = 0.7 V - RB IF/beta, and
 * I = IF (1 + (V - VBE)/VA); with the Early effect alone the same at VBE = 0.7 V. */
static double forced_volts(double current, bool has_beta)
{
    const double ut = BOLTZMANN_OVER_CHARGE * 300.15;
    double vbe = 0.7;
    for (int k = 0; k < 200 && has_beta; k++) {
        vbe = 0.5 * vbe + 0.5 * (0.7 - 1e3 * 1e-15 * exp(vbe / ut) / 100);
    }
    return vbe + 50 * (current / (1e-15 * exp(vbe / ut)) - 1);
}

/* Finite beta without Early effect cannot carry 0.5 mA, all other subsets can: of the two orders
 * the one is left where the Early effect comes first. Without any, V = -UT ln(1 - I/IF). */
static void subset_without_state(void **state)
{
    (void)state;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result = explained(&cell, &circuit, FORCED_CELL("0.5 mA"), NULL);
    const struct explanation *e = &result->explanations[0];
    const double ut = BOLTZMANN_OVER_CHARGE * 300.15, full = 1e-15 * exp(0.7 / ut);
    const double none = -ut * log(1 - 0.5e-3 / full), both = forced_volts(0.5e-3, true);
    double early = none; /* saturated: I = IF (1 - exp(-V/UT)) (1 + (V - VBE)/VA) */
    for (int k = 0; k < 100; k++) {
        early = -ut * log(1 - 0.5e-3 / (full * (1 + (early - 0.7) / 50)));
    }
    assert_null(e->trouble);
    assert_null(e->first_with);
    assert_non_null(strstr(e->note, "no state without: channel-length modulation or Early effect"));
    assert_non_null(strstr(e->note, "1 of 2 orders"));
    check_near(e->hand_view, none, 1e-6);
    check_near(e->computed, both, 1e-6);
    check_near(share_of(e, early_name), early - none, 1e-5);
    check_near(share_of(e, beta_name), both - early, 1e-6);
    close_all(cell, circuit, result);
}

/* At 0.6 mA not even the square law has a state: it begins with the Early effect. */
static void square_law_without_state(void **state)
{
    (void)state;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result = explained(&cell, &circuit, FORCED_CELL("0.6 mA"), NULL);
    const struct explanation *e = &result->explanations[0];
    assert_null(e->trouble);
    assert_true(isnan(e->hand_view));
    assert_string_equal(e->first_with, early_name);
    assert_true(isnan(share_of(e, early_name)));
    check_near(share_of(e, beta_name), forced_volts(0.6e-3, true) - forced_volts(0.6e-3, false),
               1e-6);
    check_near(share_of(e,
                        "the paper beside the square law with channel-length modulation or Early "
                        "effect"),
               forced_volts(0.6e-3, false) - 0.1, 1e-6);
    close_all(cell, circuit, result);
}

/* The Widlar source in weak inversion: the sentence has the figures of the transistor itself. */
static void sentence(void **state)
{
    (void)state;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result =
        explained(&cell, &circuit, NULL, SOURCE_DIR "/netlists/widlar_mos_paper.cell");
    const struct explanation *e = &result->explanations[0];
    assert_string_equal(e->hand->probe.text, "out.current");
    assert_string_equal(e->shares[0].effect, "weak and moderate inversion");
    assert_non_null(e->shares[0].sentence);
    assert_non_null(strstr(e->shares[0].sentence, "M2 runs at inversion"));
    assert_non_null(strstr(e->shares[0].sentence, "mV below threshold"));
    close_all(cell, circuit, result);
}

/* Over cells of the library: the shares add up to the difference to 1e-9. */
static void sums(void **state)
{
    (void)state;
    static const char *const files[] = {
        "bandgap",      "beta_multiplier", "bias_tree",      "cascode_mirror",
        "jfet_source",  "led_source",      "mirror",         "mirror_bipolar",
        "ratio_mirror", "widlar_bipolar",  "wilson_bipolar", "wide_swing_cascode",
        "ptat_weak",    "brokaw",          "vbe_reference",  "threshold_reference"};
    int lines = 0;
    for (size_t f = 0; f < sizeof files / sizeof files[0]; f++) {
        struct cell *cell;
        struct circuit *circuit;
        char path[400];
        snprintf(path, sizeof path, SOURCE_DIR "/netlists/%s.cell", files[f]);
        struct result *result = explained(&cell, &circuit, NULL, path);
        for (int k = 0; k < result->explanation_count; k++) {
            const struct explanation *e = &result->explanations[k];
            double sum = 0;
            for (int s = 0; s < e->share_count; s++) {
                sum += e->shares[s].share;
            }
            if (e->trouble != NULL ||
                !(fabs(sum - (e->computed - e->paper)) <= 1e-9 * fabs(e->computed - e->paper))) {
                print_error("%s, %s: %s, shares %.12g of %.12g\n", files[f], e->hand->probe.text,
                            e->trouble == NULL ? "" : e->trouble, sum, e->computed - e->paper);
                fail();
            }
            lines++;
        }
        close_all(cell, circuit, result);
    }
    assert_true(lines > 40);
}

static unsigned effects_of(struct system *system)
{
    unsigned found = 0;
    assert_true(explain_effects(system, &found));
    return found;
}

/* An effect is there when switching it changes a device: none in a divider, and its measured
 * temperature apart from the cell's makes the temperature one. */
static void effects(void **state)
{
    (void)state;
    struct solved_cell it;
    cell_solve(&it, "rail v 3 V\nresistor R v -> gnd 1k\n");
    assert_int_equal(effects_of(it.system), 0);
    cell_close(&it);
    cell_solve(&it, "temperature 60 C\nrail v 3 V\nresistor R v -> gnd 1k tempco=100 ppm/K\n");
    assert_int_equal(effects_of(it.system), EFFECT_TEMPERATURE);
    cell_close(&it);
    cell_solve(&it,
               "rail v 3 V\nnmos M d=v g=v s=gnd conduction=1 mA/V^2 threshold=1 V early=9 V\n");
    assert_int_equal(effects_of(it.system), EFFECT_MODULATION | EFFECT_INVERSION);
    cell_close(&it);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(two_effects),
        cmocka_unit_test(unlimited),
        cmocka_unit_test(subset_without_state),
        cmocka_unit_test(square_law_without_state),
        cmocka_unit_test(sentence),
        cmocka_unit_test(sums),
        cmocka_unit_test(effects),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
