/* bars_test.c: pictures with bars and of loops: heights and places against hand calculation,
 * limits, held and unheld states. */
#include "report/text_check.h"

#include <math.h>

#include "analyses/explain.h"
#include "analyses/sensitivity.h"
#include "analyses/spread_result.h"
#include "analyses/states.h"
#include "check.h"
#include "report/figures.h"
#include "report/report.h"
#include "report/report_fixture.h"
#include "report/scale.h"

static int count_of(const char *text, const char *wanted)
{
    int count = 0;
    for (const char *at = strstr(text, wanted); at != NULL; at = strstr(at + 1, wanted)) {
        count++;
    }
    return count;
}

static char *plot(const struct result *result)
{
    struct buffer out = BUFFER_EMPTY;
    report_plot(result, &out);
    assert_false(out.failed);
    assert_non_null(out.data);
    return out.data;
}

/* Both signs. Far from the straight part, which ends at 1 fA, decades are equally wide: from -10 uA
 * to 10 nA there are 10 + 7 of them. */
static void test_signed_scale(void **state)
{
    (void)state;
    const struct figure_axis amperes = {"push", "A", true};
    struct scale scale = scale_make_signed(&amperes, -2e-6, 3e-9, 1e-15);
    double ticks[SCALE_TICK_LIMIT];
    struct buffer out = BUFFER_EMPTY;
    check_near(scale.low, -1e-5, 1e-9);
    check_near(scale.high, 1e-8, 1e-9);
    scale.pixel_low = 1000.0;
    scale.pixel_high = 0.0;
    /* asinh(0.5e10) + asinh(0.5e7) = ln(1e10) + ln(1e7): zero lies 7 of 17 parts below the top */
    check_near(scale_pixel(&scale, 0.0), 1000.0 * 7.0 / 17.0, 1e-9);
    check_near(scale_pixel(&scale, 1e-9), 1000.0 * 1.0 / 17.0, 1e-9);
    check_near(scale_pixel(&scale, -1e-9), 1000.0 * 13.0 / 17.0, 1e-9);
    int count = scale_ticks(&scale, ticks);
    assert_true(count >= 5 && count <= SCALE_TICK_LIMIT);
    for (int k = 0; k + 1 < count; k++) {
        assert_true(ticks[k] < ticks[k + 1]);
        assert_true(scale_pixel(&scale, ticks[k]) - scale_pixel(&scale, ticks[k + 1]) > 50.0);
    }
    scale_put_tick(&scale, -1e-9, &out);
    assert_string_equal(out.data, "-1 nA");
    buffer_free(&out);
}

/* The panel runs from x = 78 to 736 and from y = 42 down to 312. Bars from 1 to 3 with 3 % of room
 * at each side: 1 is at 78 + 658 * 0.06 / 2.12 = 96.62, 2 at 407.00. A count of 40 on a scale to 50
 * is 270 * 0.8 = 216 px high. */
static void test_bars(void **state)
{
    (void)state;
    struct figure_bar bars[] = {{1.0, 2.0, 40.0}, {2.0, 3.0, 10.0}};
    struct figure figure = {.title = "samples",
                            .x = {"voltage", "V", true},
                            .y = {"samples", "", false},
                            .bars = bars,
                            .bar_count = 2,
                            .band = {1.5, (double)INFINITY, ""},
                            .keeps_zero = true};
    struct buffer out = BUFFER_EMPTY;
    figures_document(&figure, 1, &out);
    assert_false(out.failed);
    /* cut at the limit of 1.5 V, which is at 251.81 */
    assert_non_null(strstr(out.data, "<rect class=\"f-bar f-out\" x=\"96.62\" y=\"96.00\" "
                                     "width=\"155.19\" height=\"216.00\"/>"));
    assert_non_null(strstr(out.data, "<rect class=\"f-bar\" x=\"251.81\" y=\"96.00\""));
    assert_non_null(strstr(out.data, "<rect class=\"f-bar\" x=\"407.00\" y=\"258.00\""));
    assert_int_equal(count_of(out.data, "\"f-bar"), 3);
    buffer_free(&out);
}

/* Ranked bars have one zero, and lengths as their values: 30 to -10 is 3 to 1. */
static void test_rows(void **state)
{
    (void)state;
    struct figure_row rows[] = {{"first", "+30", "", 30.0, false},
                                {"second", "-10", "", -10.0, false},
                                {"together", "+20", "", 20.0, true}};
    struct figure figure = {.title = "why", .rows = rows, .row_count = 3};
    struct buffer out = BUFFER_EMPTY;
    figures_document(&figure, 1, &out);
    const char *up = strstr(out.data, "class=\"f-bar\""), *down = strstr(out.data, "f-minus\"");
    assert_true(up != NULL && down != NULL);
    double x = strtod(strstr(up, " x=\"") + 4, NULL);
    double width = strtod(strstr(up, "width=\"") + 7, NULL);
    double x_down = strtod(strstr(down, " x=\"") + 4, NULL);
    double width_down = strtod(strstr(down, "width=\"") + 7, NULL);
    check_near(width, 3.0 * width_down, 1e-3);
    check_near(x_down + width_down, x, 1e-4);
    assert_non_null(strstr(out.data, ">together</text>"));
    buffer_free(&out);
}

/* 100 samples in 4 bars between 780 and 820 nA; the requirement wants 800 nA within 2.5 %: the
 * limits are the ends of the picture. */
static void test_samples(void **state)
{
    (void)state;
    static struct fixture f;
    fixture_make(&f);
    f.requirements[0].tolerance = 10e-9; /* 790 to 810 nA: the outer bars are outside */
    f.circuit.requirements = f.requirements;
    f.circuit.requirement_count = 2;
    struct contributor causes[] = {{&f.instances[1], "threshold", 0.75, 8.7e-9},
                                   {&f.instances[2], "threshold", 0.2499, -5.0e-9},
                                   {&f.instances[3], "value", 0.0001, 1e-10}};
    struct spread_of_probe row = {
        .probe = &f.requirements[0].probe,
        .own = 801e-9,
        .linear_sigma = 1e-8,
        .contributors = causes,
        .contributor_count = 3,
        .sampled = {100, 800e-9, 8e-9, 1e-9, 780e-9, 820e-9},
        .histogram = {.bins = 4, .from = 780e-9, .to = 820e-9, .counts = {10, 40, 45, 5}}};
    struct mismatch_result mismatch = {
        .deviate_count = 3, .wanted = 100, .done = 100, .quantities = &row, .quantity_count = 1};
    f.result.command = "spread";
    f.result.mismatch = &mismatch;
    char *text = plot(&f.result);
    assert_int_equal(count_of(text, "class=\"f-bar f-out\""), 2);
    assert_non_null(strstr(text, ">at least 790.0 nA</text>"));
    assert_non_null(strstr(text, ">at most 810.0 nA</text>"));
    assert_non_null(strstr(text, "100 samples: mean 800.0 nA, sigma 8.000 nA"));
    assert_int_equal(count_of(text, "class=\"f-curve"), 1); /* the normal curve */
    assert_non_null(strstr(text, ">M1 threshold</text>"));
    assert_non_null(strstr(text, ">75.0 %</text>"));
    assert_non_null(strstr(text, ">-5.000 nA</text>"));
    assert_null(strstr(text, ">RE value</text>")); /* too small for a row of its own */
    assert_non_null(strstr(text, ">1 more</text>"));
    free(text);
}

/* The peak of a normal curve: n * bin / (sigma sqrt(2 pi)) = 100 * 10 / (8 * 2.5066) = 49.87. */
static void test_normal_curve(void **state)
{
    (void)state;
    static struct fixture f;
    fixture_make(&f);
    struct spread_of_probe row = {
        .probe = &f.requirements[0].probe,
        .own = NAN,
        .sampled = {100, 800e-9, 8e-9, 1e-9, 780e-9, 820e-9},
        .histogram = {.bins = 4, .from = 780e-9, .to = 820e-9, .counts = {10, 40, 45, 5}}};
    struct mismatch_result mismatch = {.done = 100, .quantities = &row, .quantity_count = 1};
    f.result.mismatch = &mismatch;
    struct buffer out = BUFFER_EMPTY;
    struct layout layout;
    const struct report_style style = {.columns = 0};
    assert_true(layout_begin(&layout, &style, &out));
    struct figure_list figures = figures_of_samples(&layout, &f.result);
    assert_int_equal(figures.count, 1);
    const struct figure_series *normal = &figures.list[0].series[0];
    assert_int_equal(normal->count, 17);
    check_near(normal->x[8], 800e-9, 1e-12);
    check_near(normal->y[8], 49.867785, 1e-6);
    check_near(figures.list[0].bars[2].y, 45.0, 0.0);
    layout_end(&layout);
    buffer_free(&out);
}

/* Three crossings: the outer can be held, the inner cannot. */
static void test_loop(void **state)
{
    (void)state;
    static struct fixture f;
    fixture_make(&f);
    const double v[] = {0.0, 0.2, 0.5, 1.0}, push[] = {1e-9, -1e-9, 1e-6, -1e-3};
    const double x[][3] = {{0.0, 0.1, 0.0}, {0.0, 0.3, 0.0}, {0.0, 0.7, 0.0}};
    struct state_result states[3];
    memset(states, 0, sizeof states);
    for (int k = 0; k < 3; k++) {
        states[k].x = x[k];
        states[k].can_hold = k != 1;
    }
    struct states_result found = {.states = states,
                                  .state_count = 3,
                                  .has_loop = true,
                                  .loop_path = "ref -> tail -> ref",
                                  .probe = "ref",
                                  .probe_unknown = 1,
                                  .curve_v = v,
                                  .curve_push = push,
                                  .curve_count = 4,
                                  .push = NAN,
                                  .push_bound = NAN};
    f.result.command = "states";
    f.result.states = &found;
    char *text = plot(&f.result);
    assert_int_equal(count_of(text, ": can be held</text>"), 2);
    assert_non_null(strstr(text, ">state 2 at 300.0 mV: cannot be held</text>"));
    assert_int_equal(count_of(text, "f-mark c4 f-full"), 2);
    assert_int_equal(count_of(text, "class=\"f-mark c4\""), 1);
    /* 0.7 V of 1 V, on the panel from 78 to 736 */
    assert_non_null(strstr(text, "cx=\"538.60\""));
    free(text);
}

/* Shares that add up, and derivatives in their order. */
static void test_ranked(void **state)
{
    (void)state;
    static struct fixture f;
    fixture_make(&f);
    struct effect_share shares[] = {{"body effect", 20e-9, NULL}, {"Early effect", -3.6e-9, NULL}};
    struct explanation why = {.hand = &f.hands[0],
                              .paper = 800e-9,
                              .hand_view = 800e-9,
                              .computed = 816.4e-9,
                              .shares = shares,
                              .share_count = 2};
    f.result.command = "explain";
    f.result.explanations = &why;
    f.result.explanation_count = 1;
    char *text = plot(&f.result);
    assert_int_equal(count_of(text, "<rect class=\"f-bar"), 3);
    assert_non_null(strstr(text, ">+20.00 nA</text>"));
    assert_non_null(strstr(text, ">+16.40 nA</text>"));
    free(text);
    struct sensitivity_row rows[] = {{"RE", 47e3, DIMENSION_RESISTANCE, -1e-11, -0.6, false},
                                     {"temperature", 300.0, {0, 0, 0, 0}, 8e-9, 0.3, true},
                                     {"RB", 1e6, DIMENSION_RESISTANCE, 0.0, 0.0, false}};
    struct sensitivity_table table = {
        .probe = f.hands[0].probe, .value = 800e-9, .rows = rows, .row_count = 3, .idle_count = 1};
    f.result.command = "sensitivity";
    f.result.sensitivities = &table;
    f.result.sensitivity_count = 1;
    text = plot(&f.result);
    const char *const order[] = {">RE</text>", ">-0.6000 %</text>", ">temperature</text>",
                                 ">+1.000 %/K</text>", NULL};
    assert_in_order(text, order);
    assert_null(strstr(text, ">RB</text>"));
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_signed_scale), cmocka_unit_test(test_bars),
        cmocka_unit_test(test_rows),         cmocka_unit_test(test_samples),
        cmocka_unit_test(test_normal_curve), cmocka_unit_test(test_loop),
        cmocka_unit_test(test_ranked),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
