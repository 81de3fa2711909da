/* chart_test.c: the drawn curve, at its edges and where the ink must be; values in words. */
#include "report/text_check.h"

#include <math.h>

#include "report/chart.h"
#include "report/show.h"

static const struct report_style ascii = {false, true, false, 0};

static char *draw(const double *x, const double *y, int count, double edge, double point)
{
    struct buffer out = BUFFER_EMPTY;
    struct layout layout;
    const struct chart chart = {.x = x,
                                .y = y,
                                .count = count,
                                .x_dimension = DIMENSION_VOLTAGE,
                                .y_dimension = DIMENSION_CURRENT,
                                .x_name = "load voltage",
                                .edge = edge,
                                .edge_name = "compliance",
                                .point = point,
                                .point_name = "here, at"};
    assert_true(layout_begin(&layout, &ascii, &out));
    chart_draw(&layout, &chart);
    layout_end(&layout);
    assert_false(out.failed);
    return out.data;
}

/* The drawn field of line `row`, behind the axis. */
static const char *field(const char *text, int row)
{
    for (; row > 0; row--) {
        text = strchr(text, '\n') + 1;
    }
    return text + LAYOUT_MARGIN + 12;
}

/* y = x from 0 to 1: the ink stands on the diagonal. */
static void ramp(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0};
    char *text = draw(x, x, 2, NAN, NAN);
    for (int row = 0; row < CHART_ROWS; row++) {
        /* row r covers y from 1 - (r + 1)/10 to 1 - r/10: columns 54 - 6r .. 59 - 6r */
        const char *line = field(text, row);
        int first = CHART_COLUMNS - 6 * (row + 1);
        assert_int_equal(strspn(line, " "), first);
        assert_int_equal(strcspn(line, "\n"), first + 6);
    }
    assert_non_null(strstr(text, "  1 A |"));
    assert_non_null(strstr(text, "0 V"));
    assert_non_null(strstr(text, "1 V"));
    free(text);
}

static void marks(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0}, y[] = {1.0, 1.0};
    char *text = draw(x, y, 2, 0.25, 0.75);
    /* column = floor(60 * share) */
    assert_int_equal(field(text, 5)[15], '|');
    assert_int_equal(field(text, 0)[45], 'o');
    assert_non_null(strstr(text, "o here, at 750 mV   | compliance 250.0 mV"));
    free(text);
}

static void nothing_to_draw(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0}, zero[] = {0.0, 0.0}, same[] = {1.0, 1.0},
                 none[] = {NAN, INFINITY};
    char *text = draw(x, x, 1, NAN, NAN);
    assert_non_null(strstr(text, "fewer than two points"));
    free(text);
    text = draw(x, zero, 2, NAN, NAN);
    assert_non_null(strstr(text, "no curve"));
    free(text);
    text = draw(same, x, 2, NAN, NAN);
    assert_non_null(strstr(text, "no curve"));
    free(text);
    text = draw(x, none, 2, NAN, NAN);
    assert_non_null(strstr(text, "no curve"));
    free(text);
}

/* Extreme sizes and gaps stay inside the field. */
static void extremes(void **state)
{
    (void)state;
    static const double sizes[] = {5e-324, 1e-300, 1e-15, 1.0, 1e15, 1e307};
    for (size_t k = 0; k < sizeof sizes / sizeof sizes[0]; k++) {
        const double x[] = {-1.0, 0.0, 0.5, 1.0};
        const double y[] = {-sizes[k], NAN, sizes[k], sizes[k] * 0.5};
        char *text = draw(x, y, 4, -5.0, 5.0);
        assert_in_range(widest_line(text), 1, REPORT_COLUMNS);
        free(text);
    }
}

struct value_case {
    double value;
    struct dimension dimension;
    const char *text;
};

static void values_in_words(void **state)
{
    (void)state;
    static const struct value_case cases[] = {
        {816.4e-9, {0, 12, 0, 0}, "816.4 nA"},
        {1.2, {12, 0, 0, 0}, "1.200 V"},
        {82.41e6, {12, -12, 0, 0}, "82.41 Mohm"},
        {25.1, {-12, 0, 0, 0}, "25.10 1/V"},
        {4.21, {0, 0, 0, 0}, "4.210"},
        {-0.0303, {12, 0, 0, 0}, "-30.30 mV"},
        {NAN, {12, 0, 0, 0}, "-"},
        {INFINITY, {12, -12, 0, 0}, "unlimited"},
        {0.0, {12, 0, 0, 0}, "0 V"},
        {-5e-324, {12, 0, 0, 0}, "0 V"}, /* a zero that a proof rounded outwards */
        {0.99996, {12, 0, 0, 0}, "1.000 V"},
    };
    struct buffer out = BUFFER_EMPTY;
    struct layout layout;
    assert_true(layout_begin(&layout, &ascii, &out));
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        assert_string_equal(show_value(&layout, cases[k].value, cases[k].dimension), cases[k].text);
    }
    assert_string_equal(show_round(&layout, 1.2, DIMENSION_VOLTAGE), "1.2 V");
    assert_string_equal(show_round(&layout, 3.0, DIMENSION_VOLTAGE), "3 V");
    assert_string_equal(show_round(&layout, 100.0, DIMENSION_VOLTAGE), "100 V");
    assert_string_equal(show_share(&layout, 0.0205, "", true), "+2.050 %");
    assert_string_equal(show_share(&layout, 320.1e-6, "/K", true), "+320.1 ppm/K");
    assert_string_equal(show_share(&layout, -3.1e-6, "", false), "-3.100 ppm");
    assert_string_equal(show_celsius(&layout, 300.15), "27 C");
    assert_string_equal(show_celsius(&layout, 253.15), "-20 C");
    layout_end(&layout);
    buffer_free(&out);
}

/* Two curves of a family, by their letters: 1 A all along in the top row, 0.05 A in the lowest;
 * where both would stand in one place the first one does. */
static void family(void **state)
{
    (void)state;
    const double x[] = {0.0, 0.5, 1.0}, high[] = {1.0, 1.0, 1.0}, low[] = {1.0, 0.05, 0.05};
    const double *const curves[] = {high, low};
    const char *const names[] = {"R = 1 kohm", "R = 2 kohm"};
    struct buffer out = BUFFER_EMPTY;
    struct layout layout;
    const struct chart chart = {.x = x,
                                .count = 3,
                                .x_dimension = DIMENSION_VOLTAGE,
                                .y_dimension = DIMENSION_CURRENT,
                                .x_name = "load",
                                .edge = NAN,
                                .point = NAN,
                                .family = curves,
                                .family_names = names,
                                .family_count = 2};
    assert_true(layout_begin(&layout, &ascii, &out));
    chart_draw(&layout, &chart);
    layout_end(&layout);
    assert_int_equal(strspn(field(out.data, 0), "a"), CHART_COLUMNS);
    const char *lowest = field(out.data, CHART_ROWS - 1);
    assert_int_equal(strcspn(lowest, "\n"), CHART_COLUMNS);
    assert_int_equal(strspn(lowest + CHART_COLUMNS / 2, "b"), CHART_COLUMNS / 2);
    assert_non_null(strstr(out.data, "a R = 1 kohm   b R = 2 kohm"));
    buffer_free(&out);
}

/* Decades of both signs: from -1 mA to 1 nA with a straight part of 1 pA are 9 and 3 decades, so
 * that zero stands 3/12 below the top, in the third of ten rows; a state that can be held is an o
 * there, one that cannot an x. */
static void both_signs(void **state)
{
    (void)state;
    const double x[] = {0.0, 0.5, 1.0}, y[] = {1e-9, 0.0, -1e-3};
    const struct chart_mark dots[] = {{0.5, 0.0, true}, {0.75, 0.0, false}};
    struct buffer out = BUFFER_EMPTY;
    struct layout layout;
    const struct chart chart = {.x = x,
                                .y = y,
                                .count = 3,
                                .x_dimension = DIMENSION_VOLTAGE,
                                .y_dimension = DIMENSION_CURRENT,
                                .x_name = "probe",
                                .edge = NAN,
                                .point = NAN,
                                .linear = 1e-12,
                                .marks = dots,
                                .mark_count = 2};
    assert_true(layout_begin(&layout, &ascii, &out));
    chart_draw(&layout, &chart);
    layout_end(&layout);
    assert_non_null(strstr(out.data, " 1 nA |"));
    assert_non_null(strstr(out.data, "-1 mA |"));
    const char *zero = field(out.data, 2);
    assert_memory_equal(zero - 2, " |", 1);
    assert_int_equal(zero[CHART_COLUMNS / 2], 'o');
    assert_int_equal(zero[CHART_COLUMNS * 3 / 4], 'x');
    assert_int_equal(zero[CHART_COLUMNS * 3 / 4 + 1], '-');
    buffer_free(&out);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(ramp),
        cmocka_unit_test(marks),
        cmocka_unit_test(nothing_to_draw),
        cmocka_unit_test(extremes),
        cmocka_unit_test(values_in_words),
        cmocka_unit_test(family),
        cmocka_unit_test(both_signs),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
