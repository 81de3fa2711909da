/* figure_test.c: pictures: where points are drawn, what axes say, the close-up of a flat curve. */
#include "report/text_check.h"

#include <math.h>

#include "check.h"
#include "report/figures.h"
#include "report/markup.h"
#include "report/report.h"
#include "report/report_fixture.h"
#include "report/scale.h"

static const struct figure_axis volts = {"load voltage", "V", true};
static const struct figure_axis amperes = {"output current", "A", true};

/* Ticks by hand: 0 to 98 nA in about 6 steps is 0, 20, ..., 100 with factor 1e9. */
static void test_scale(void **state)
{
    (void)state;
    struct scale scale = scale_make(&amperes, 0.0, 98e-9, 6, true);
    check_near(scale.step, 20e-9, 1e-12);
    check_near(scale.high, 100e-9, 1e-12);
    check_near(scale.factor, 1e9, 1e-12);
    assert_string_equal(scale.unit, "nA");
    assert_int_equal(scale.decimals, 0);
    scale = scale_make(&volts, 0.0, 1.8, 7, false);
    check_near(scale.high, 1.8, 1e-12);
    check_near(scale.step, 0.5, 1e-12);
    assert_string_equal(scale.unit, "V");
    assert_int_equal(scale.decimals, 1);
    scale = scale_make_share(-2e-7, 3e-7, 4);
    assert_string_equal(scale.unit, "ppb");
    check_near(scale.factor, 1e9, 1e-12);
    scale = scale_make(&volts, 5.0, 5.0, 6, true); /* no width: some is made */
    assert_true(scale.high > scale.low);
}

static struct figure one_curve(struct figure_series *series)
{
    return (struct figure){.title = "A & <b>",
                           .x = volts,
                           .y = amperes,
                           .series = series,
                           .series_count = 1,
                           .band = {(double)NAN, (double)NAN, ""},
                           .keeps_zero = true};
}

static char *draw(struct figure *figure)
{
    struct buffer out = BUFFER_EMPTY;
    figure_choose_close_up(figure);
    figures_document(figure, 1, &out);
    assert_false(out.failed);
    return out.data;
}

/* The panel runs from x = 78 to 736 and, without notes, from y = 42 down to 312; a straight line
 * from (0 V, 0 A) to (2 V, 97 nA) on a scale to 100 nA ends at 312 - 0.97 * 270 = 50.1. */
static void test_places(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0, 2.0}, y[] = {0.0, 48.5e-9, 97e-9};
    struct figure_series series = {"", x, y, 3, (double)NAN, 0.0, 0.0};
    struct figure figure = one_curve(&series);
    char *text = draw(&figure);
    assert_non_null(strstr(text, "d=\"M78.00 312.00L407.00 181.05L736.00 50.10\""));
    assert_non_null(strstr(text, "A &amp; &lt;b&gt;"));
    assert_non_null(strstr(text, ">output current (nA)</text>"));
    assert_non_null(strstr(text, ">load voltage (V)</text>"));
    assert_null(strstr(text, "Close-up"));
    free(text);
}

/* A value that is not there leaves a gap: two pieces. */
static void test_gap(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0, 2.0, 3.0}, y[] = {1e-6, (double)NAN, 2e-6, 3e-6};
    struct figure_series series = {"", x, y, 4, (double)NAN, 0.0, 0.0};
    struct figure figure = one_curve(&series);
    char *text = draw(&figure);
    const char *path = strstr(text, "d=\"M");
    assert_non_null(path);
    const char *second = strchr(path + 4, 'M');
    assert_true(second != NULL && second < strchr(path + 4, '"'));
    free(text);
}

/* Flat to 1e-7: the whole from zero, and below it the slope in ppb. The curve runs from -50 to +50
 * ppb over the panel; with 15 % of room the scale is -100 to 100 and it must rise by half of it. */
static void test_flat(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0, 2.0}, y[] = {1e-6 * (1.0 - 5e-8), 1e-6, 1e-6 * (1.0 + 5e-8)};
    struct figure_series series = {"", x, y, 3, 1e-6, 0.0, 2.0};
    struct figure figure = one_curve(&series);
    char *text = draw(&figure);
    assert_non_null(strstr(text, "Close-up"));
    assert_non_null(strstr(text, ">deviation (ppb)</text>"));
    /* the second panel: y from 352 to 472; 412 is its middle */
    assert_non_null(strstr(text, "d=\"M78.00 442.00L407.00 412.00L736.00 382.00\""));
    free(text);
}

/* Names at the right end, in the order of the curves' ends and never closer than a line. */
static void test_labels(void **state)
{
    (void)state;
    const double x[] = {0.0, 1.0}, low[] = {0.0, 1.00e-6}, high[] = {0.0, 1.01e-6};
    struct figure_series series[] = {{"lower", x, low, 2, (double)NAN, 0.0, 0.0},
                                     {"upper", x, high, 2, (double)NAN, 0.0, 0.0}};
    struct figure figure = one_curve(series);
    figure.series_count = 2;
    char *text = draw(&figure);
    double places[2] = {0.0, 0.0};
    static const char *const names[] = {">upper</text>", ">lower</text>"};
    for (int k = 0; k < 2; k++) {
        const char *at = strstr(text, names[k]);
        assert_non_null(at);
        while (strncmp(at, " y=\"", 4) != 0) {
            at--;
        }
        places[k] = strtod(at + 4, NULL);
    }
    assert_true(places[1] - places[0] >= 15.0 - 1e-9);
    assert_non_null(strstr(text, "f-curve c0"));
    assert_non_null(strstr(text, "f-curve c1"));
    free(text);
}

/* Of a result: one picture for its output with edge, band and ring; one for each sweep quantity. */
static void test_result(void **state)
{
    (void)state;
    static struct fixture f;
    struct buffer out = BUFFER_EMPTY, again = BUFFER_EMPTY;
    fixture_make(&f);
    report_plot(&f.result, &out);
    report_plot(&f.result, &again);
    assert_false(out.failed);
    assert_string_equal(out.data, again.data);
    assert_non_null(strstr(out.data, "f-edge c0"));
    assert_non_null(strstr(out.data, "f-band"));
    assert_non_null(strstr(out.data, "f-mark c0"));
    assert_non_null(strstr(out.data, "current against load voltage"));
    buffer_free(&out);
    buffer_free(&again);
}

static void test_markup(void **state)
{
    (void)state;
    struct buffer out = BUFFER_EMPTY;
    markup_fixed(&out, -0.125, 2);
    buffer_text(&out, " ");
    markup_fixed(&out, 1e30, 2);
    buffer_text(&out, " ");
    markup_json(&out, "a\"</script>\n");
    buffer_text(&out, " ");
    markup_number(&out, (double)INFINITY);
    assert_string_equal(out.data, "-0.13 0 \"a\\u0022\\u003c/script\\u003e\\u000a\" null");
    buffer_free(&out);
    struct arena *arena = arena_create();
    assert_string_equal(markup_units(arena, "343.7 Mohm"), "343.7 M\xCE\xA9");
    assert_string_equal(markup_units(arena, "1.200 uA"), "1.200 \xC2\xB5"
                                                         "A");
    assert_string_equal(markup_units(arena, "up to 3 V"), "up to 3 V");
    arena_destroy(arena);
}

/* The whole page from a fixture: self-contained, and every text of the user escaped. */
static void test_page(void **state)
{
    (void)state;
    static struct fixture f;
    struct buffer out = BUFFER_EMPTY;
    const struct report_style style = {.columns = 0};
    fixture_make(&f);
    f.circuit.title = "a <script> & \"b\"";
    const struct web_results results = {&f.result, NULL, NULL};
    report_web(&results, &style, "9.9.9", &out);
    assert_false(out.failed);
    assert_non_null(strstr(out.data, "a &lt;script&gt; &amp; &quot;b&quot;"));
    assert_null(strstr(out.data, "a <script>"));
    assert_null(strstr(out.data, "src="));
    assert_null(strstr(out.data, "href=\"http"));
    assert_non_null(strstr(out.data, "content=\"ampstead 9.9.9\""));
    buffer_free(&out);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_scale),  cmocka_unit_test(test_places), cmocka_unit_test(test_gap),
        cmocka_unit_test(test_flat),   cmocka_unit_test(test_labels), cmocka_unit_test(test_result),
        cmocka_unit_test(test_markup), cmocka_unit_test(test_page),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
