/* page_test.c: the text reports of a result made by hand. */
#include "report/text_check.h"

#include "analyses/states.h"
#include "report/report_fixture.h"

static const struct report_style plain = {false, false, false, 0};

static char *make(void (*report)(const struct result *, const struct report_style *,
                                 struct buffer *),
                  const struct fixture *fixture, struct report_style style)
{
    struct buffer out = BUFFER_EMPTY;
    report(&fixture->result, &style, &out);
    assert_false(out.failed);
    assert_non_null(out.data);
    return out.data;
}

static void golden_page(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    char *text = make(report_page, &fixture, plain);
    char *golden = read_whole(SOURCE_DIR "/tests/report/golden/page.txt");
    assert_same_tokens(text, golden);
    free(golden);
    free(text);
}

/* The verdict is the first word, and says no without colour. */
static void verdict_first(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    char *text = make(report_page, &fixture, plain);
    const char *const order[] = {"NOT MET",    "\noutput",       "\nsupply",   "\ntransistors",
                                 "\nparts",    "\nrequirements", "\npaper",    "\ncautions",
                                 "\nevidence", "\nsign-off",     "own models", NULL};
    assert_memory_equal(text, "NOT MET", 7);
    assert_in_order(text, order);
    assert_null(strchr(text, '\033'));
    free(text);
    fixture.result.verdict = VERDICT_MET;
    text = make(report_page, &fixture, plain);
    assert_memory_equal(text, "MET ", 4);
    free(text);
}

/* Values as the fixture has them, in four digits. */
static void figures(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    char *text = make(report_page, &fixture, plain);
    const char *const order[] = {"tail sinks 816.4 nA at 1.200 V",
                                 "82.41 Mohm",
                                 "180.3 mV",
                                 "M2 runs out of headroom",
                                 "+12.34 %/V  of vbat",
                                 "+320.1 ppm/K",
                                 "NOT MET     tail.compliance below 150 mV",
                                 "too far by 30.30 mV (20.20 %)",
                                 "+16.40 nA  +2.050 %   790.1 nA",
                                 "rule: square law above",
                                 "9 Newton iterations; worst residual 3.100e-17",
                                 NULL};
    assert_in_order(text, order);
    free(text);
}

/* A loop: its states, what was proved, and the verdict; a search that was not finished says so. */
static void states_of_a_loop(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    const double currents[] = {2e-9, 3e-6};
    struct state_result states[] = {
        {.is_certified = true, .can_hold = true, .outputs = &currents[0], .power = 4e-9},
        {.is_certified = true, .can_hold = false, .outputs = &currents[1], .power = 5e-6},
    };
    struct states_result found = {.states = states,
                                  .state_count = 2,
                                  .is_complete = true,
                                  .is_brief = true,
                                  .has_loop = true,
                                  .loop_path = "nb -> pb -> nb",
                                  .probe = "nb",
                                  .box_limit = 400,
                                  .push = 6e-12,
                                  .startup = STARTUP_AT_RISK,
                                  .reasons = {"the loop is pushed by little"},
                                  .reason_count = 1};
    fixture.result.states = &found;
    char *text = make(report_page, &fixture, plain);
    const char *const proved[] = {"states ",
                                  "2 states, and no other: proved",
                                  "the loop nb -> pb -> nb could hold more than one",
                                  "2.000 nA",
                                  "this page; can be held",
                                  "3.000 uA",
                                  "cannot be held",
                                  "start-up AT RISK",
                                  "- the loop is pushed by little",
                                  "start-up push 6.000 pA",
                                  NULL};
    assert_in_order(text, proved);
    free(text);
    found.is_complete = false;
    found.startup = STARTUP_CERTAIN;
    found.reason_count = 0;
    text = make(report_page, &fixture, plain);
    const char *const open[] = {"2 states found; the proof was not finished within the 400 boxes",
                                "start-up certain", NULL};
    assert_in_order(text, open);
    free(text);
}

static void parts_vanish(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.result.hand_count = 0;
    fixture.result.requirement_count = 0;
    fixture.result.cautions.count = 0;
    fixture.result.verdict = VERDICT_NO_REQUIREMENTS;
    char *text = make(report_page, &fixture, plain);
    assert_memory_equal(text, "NO VERDICT", 10);
    assert_null(strstr(text, "paper"));
    assert_null(strstr(text, "requirements  "));
    assert_null(strstr(text, "cautions"));
    assert_null(strstr(text, "sigma"));
    assert_null(strstr(text, "\n\n\n"));
    free(text);
}

/* No figure of a search that found nothing, but the labelled residual. */
static void unsolved(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.result.verdict = VERDICT_UNSOLVED;
    fixture.result.point.solver = (struct solver_result){false,
                                                         "source stepping",
                                                         812,
                                                         0.034,
                                                         "ref",
                                                         NULL,
                                                         "ref is held by nothing",
                                                         "give ref a path"};
    char *text = make(report_page, &fixture, plain);
    const char *const order[] = {"UNSOLVED", "ref is held by nothing", "give ref a path",
                                 "0.03400 of the currents that meet at ref", NULL};
    assert_memory_equal(text, "UNSOLVED", 8);
    assert_in_order(text, order);
    assert_null(strstr(text, "180.3 mV"));
    assert_null(strstr(text, "643.1 mV"));
    assert_null(strstr(text, "816.4 nA at"));
    free(text);
}

/* Colour adds escapes and nothing else. */
static void color_only_adds(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    struct report_style colored = plain;
    colored.color = true;
    char *without = make(report_page, &fixture, plain);
    char *with = make(report_page, &fixture, colored);
    size_t used = 0;
    assert_non_null(strchr(with, '\033'));
    for (const char *at = with; *at != '\0'; at++) {
        if (*at == '\033') {
            at += strcspn(at, "m");
        } else {
            with[used++] = *at;
        }
    }
    with[used] = '\0';
    assert_string_equal(with, without);
    free(with);
    free(without);
}

static void assert_ascii(const char *text)
{
    for (; *text != '\0'; text++) {
        assert_true((unsigned char)*text < 0x80 && (*text >= ' ' || *text == '\n'));
    }
}

/* Long and hostile texts keep every report within its columns, and without control characters. */
static void narrow_and_clean(void **state)
{
    (void)state;
    static const char name[] =
        "an_instance_of_a_block_within_a_block_within_a_block.with_another_name.M1234567890";
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.circuit.title =
        "wide \xE2\x82\xAC title \033[31m with escapes and \xC2\x9B more, which "
        "goes on and on until it would not fit on any line of any report";
    for (int k = 0; k < 4; k++) {
        fixture.instances[k].name = name;
    }
    fixture.outputs[0].name = name;
    fixture.rails[0].name = name;
    fixture.requirements[0].text = name;
    fixture.hands[0].probe.text = name;
    fixture.shown[0].text = name;
    fixture.result.sweep_count = 1;
    void (*const reports[])(const struct result *, const struct report_style *,
                            struct buffer *) = {report_page, report_point, report_sweep};
    for (int columns = 60; columns <= 120; columns += 20) {
        for (size_t k = 0; k < 3; k++) {
            struct report_style style = {false, columns == 80, false, columns};
            char *text = make(reports[k], &fixture, style);
            int limit = columns < 72 ? 72 : columns > 100 ? 100 : columns;
            assert_in_range(widest_line(text), 40, limit);
            assert_null(strchr(text, '\033'));
            assert_null(strstr(text, "\xC2\x9B"));
            if (style.ascii) {
                assert_ascii(text);
            }
            free(text);
        }
    }
}

/* Of very many devices those with the least headroom are shown, and that is said. */
static void many_devices(void **state)
{
    (void)state;
    enum { COUNT = 500 };
    static struct device_result devices[COUNT];
    static double q[COUNT][6];
    struct fixture fixture;
    fixture_make(&fixture);
    for (int k = 0; k < COUNT; k++) {
        q[k][4] = 1.0 + 0.001 * (COUNT - k); /* the last has the least */
        devices[k] = (struct device_result){&fixture.instances[1], 0, "strong, saturated", q[k]};
    }
    fixture.result.point.devices = devices;
    fixture.result.point.device_count = COUNT;
    char *text = make(report_page, &fixture, plain);
    assert_non_null(strstr(text, "60 of 500"));
    assert_non_null(strstr(text, "1.001 V"));
    assert_null(strstr(text, "1.500 V"));
    free(text);
}

static void point_shows_all(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    char *text = make(report_point, &fixture, plain);
    const char *const order[] = {"tail  300.0 mV", "RB  714.2 nA   2.357 V  1.683 uW",
                                 "gm         9.810 uS  15.20 uS  transconductance",
                                 "M1: moderate, saturated", NULL};
    assert_in_order(text, order);
    free(text);
}

static void sweep_tells_events(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.result.sweep_count = 1;
    char *text = make(report_sweep, &fixture, plain);
    const char *const order[] = {"vbat from 2.000 V to 3.000 V",
                                 "2.500 V      333.3 nA             -",
                                 "! at 20.00 mV: M2 turns around", NULL};
    assert_in_order(text, order);
    free(text);
}

static void models_list(void **state)
{
    (void)state;
    static const struct parameter parameters[] = {
        {"threshold", {12, 0, 0, 0}, DEFAULT_REQUIRED, 0, 0, 1, false, "threshold voltage"},
        {"early", {12, 0, 0, 0}, DEFAULT_NONE, 0, 0, 1, false, "Early voltage of 1 um"},
        {"kprime", {-24, 12, 0, 0}, DEFAULT_REQUIRED, 0, 0, 1, false, "gain"},
        {"match_threshold", {12, 0, 0, 12}, DEFAULT_VALUE, 0, 0, 1, false, "pairs"},
        {"critical_field", {12, 0, 0, -12}, DEFAULT_VALUE, 0, 0, 1, false, "saturation"},
    };
    static const struct device_type type = {.word = "nmos",
                                            .model_kind = "nmos",
                                            .model_parameters = parameters,
                                            .model_parameter_count = 5};
    double values[] = {0.45, NAN, 300e-6, 3.5e-9, 6e6};
    bool given[] = {true, false, true, true, true};
    struct model model = {.name = "core",
                          .type = &type,
                          .values = values,
                          .given = given,
                          .measured_kelvin = 298.15,
                          .valid_kelvin = {248.15, 398.15},
                          .valid_length = {NAN, NAN},
                          .valid_width = {NAN, NAN}};
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.circuit.models = &model;
    fixture.circuit.model_count = 1;
    struct buffer out = BUFFER_EMPTY;
    report_models(&fixture.circuit, &plain, &out);
    assert_false(out.failed);
    const char *const order[] = {"core, nmos",
                                 "measured at 25 \xC2\xB0"
                                 "C, valid temperature -25 \xC2\xB0"
                                 "C to 125",
                                 "threshold ",
                                 "450 mV  given",
                                 "none  default  Early voltage",
                                 "300 uA/V^2",
                                 "3.5 mV*um",
                                 "6 V/um",
                                 NULL};
    assert_in_order(out.data, order);
    buffer_free(&out);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(golden_page),      cmocka_unit_test(verdict_first),
        cmocka_unit_test(figures),          cmocka_unit_test(parts_vanish),
        cmocka_unit_test(unsolved),         cmocka_unit_test(color_only_adds),
        cmocka_unit_test(narrow_and_clean), cmocka_unit_test(many_devices),
        cmocka_unit_test(point_shows_all),  cmocka_unit_test(sweep_tells_events),
        cmocka_unit_test(models_list),      cmocka_unit_test(states_of_a_loop),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
