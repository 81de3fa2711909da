/* library_test.c: the public functions, from a cell in memory to its reports. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "library/ampstead.h"

/* A divider: 3 V over 10k and 20k; v = 2 V and i = 100 uA by Ohm's law. */
static const char divider[] = "title \"divider\"\n"
                              "let RLOW = 20k\n"
                              "rail vcc 3 V\n"
                              "resistor RA vcc -> mid 10k\n"
                              "resistor RB mid -> gnd RLOW\n"
                              "hand mid.v = 1.9 V\n"
                              "require mid.v within 1% of 2 V\n";

static struct ampstead_request request_of(const char *command, const char *text)
{
    struct ampstead_request request = AMPSTEAD_REQUEST;
    request.command = command;
    request.path = "divider.cell";
    request.text = text;
    request.text_length = strlen(text);
    return request;
}

static void assert_near(double value, double wanted)
{
    if (!(fabs(value - wanted) <= 1e-12 * fabs(wanted))) {
        print_error("%.17g where %.17g is wanted\n", value, wanted);
        fail();
    }
}

static double value_of(const struct ampstead_result *result, const char *name)
{
    double value = NAN;
    assert_int_equal(ampstead_result_value(result, name, &value), 1);
    return value;
}

static void values(void **state)
{
    (void)state;
    struct ampstead_request request = request_of(NULL, divider);
    struct ampstead_result *result = NULL;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_near(value_of(result, "mid.v"), 2.0);
    assert_near(value_of(result, "RB.i"), 100e-6);
    assert_near(value_of(result, "vcc.current"), 100e-6);
    assert_near(value_of(result, "cell.power"), 300e-6);
    double kept = 7.0;
    assert_int_equal(ampstead_result_value(result, "nothing.v", &kept), 0);
    assert_int_equal(ampstead_result_value(result, "all.headroom", &kept), 0);
    assert_int_equal(ampstead_result_value(result, NULL, &kept), 0);
    assert_true(kept == 7.0);
    assert_string_equal(ampstead_result_messages(result, 0), "");
    ampstead_result_free(result);
}

/* RLOW = 5k: v = 3 * 5/15 = 1 V, which misses the requirement. */
static void set_value(void **state)
{
    (void)state;
    static const char *const sets[] = {"RLOW = 2k + 3k"};
    struct ampstead_request request = request_of("review", divider);
    struct ampstead_result *result = NULL;
    request.sets = sets;
    request.set_count = 1;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_NOT_MET);
    assert_int_equal(ampstead_result_status(result), AMPSTEAD_NOT_MET);
    assert_near(value_of(result, "mid.v"), 1.0);
    assert_non_null(strstr(ampstead_result_text(result, 0, 0), "NOT MET"));
    assert_non_null(strstr(ampstead_result_json(result), "\"verdict\": \"not met\""));
    ampstead_result_free(result);
}

/* 3 V over 10k and RLOW: 1 V wants 5k. */
static void chosen_cell(void **state)
{
    (void)state;
    static const char lines[] = "let RLOW = 20k # low\nrail vcc 3 V\nresistor RA vcc -> mid 10k\n"
                                "resistor RB mid -> gnd RLOW\n"
                                "choose RLOW from 1k to 90k so mid.v = 1 V\n";
    struct ampstead_request request = request_of("size", lines);
    struct ampstead_result *result = NULL;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_non_null(strstr(ampstead_result_cell(result, NULL), "let RLOW = 5000 # low\n"));
    assert_null(ampstead_result_cell(result, "grid"));
    assert_non_null(strstr(ampstead_result_json(result), "\"choices\""));
    ampstead_result_free(result);
    request = request_of("point", lines);
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_null(ampstead_result_cell(result, NULL));
    ampstead_result_free(result);
    assert_null(ampstead_result_cell(NULL, NULL));
}

/* The keys of docs/data.md for why and what to change. */
static void remedies(void **state)
{
    (void)state;
    static const char *const sets[] = {"RLOW=5k"};
    static const char *const keys[][2] = {{"review", "\"repairs\": ["},
                                          {"explain", "\"shares\": ["},
                                          {"sensitivity", "\"relative\": "}};
    for (size_t k = 0; k < sizeof keys / sizeof keys[0]; k++) {
        struct ampstead_request request = request_of(keys[k][0], divider);
        struct ampstead_result *result = NULL;
        request.sets = sets;
        request.set_count = 1;
        request.of = k == 2 ? "mid.v" : NULL;
        assert_int_equal(ampstead_run(&request, &result),
                         k == 0 ? AMPSTEAD_NOT_MET : AMPSTEAD_WELL);
        assert_non_null(strstr(ampstead_result_json(result), keys[k][1]));
        assert_non_null(ampstead_result_text(result, 0, 72));
        ampstead_result_free(result);
    }
}

struct wrong_case {
    const char *sets, *temperature, *corner, *sweep;
    const char *message; /* how the messages begin */
    const char *hint;    /* and what stands in them */
};

static void wrong_requests(void **state)
{
    (void)state;
    static const struct wrong_case cases[] = {
        {"RLO=5k", NULL, NULL, NULL, "--set:1:1: ", "RLOW"},
        {"RLOW=5k 3", NULL, NULL, NULL, "--set RLOW:1:4: ", "5k 3"},
        {"RLOW=3 uA", NULL, NULL, NULL, "divider.cell:5:24: ", "current"}, /* where it is used */
        {"5k", NULL, NULL, NULL, "--set:1:1: NAME=expression is wanted", "RE=51k"},
        {NULL, "60", NULL, NULL, "--temperature:1:1: ", "60 C"},
        {NULL, "hot", NULL, NULL, "--temperature:1:1: ", "hot"},
        {NULL, NULL, "slow", NULL, "ampstead: ", "slow"},
        {NULL, NULL, NULL, "vc from 1 to 2 show mid.v", "--sweep:1:7: ", "vcc"},
        {NULL, NULL, NULL, "vcc from 1 V to 2 V show mit.v", "--sweep:1:", "mid"},
        {NULL, NULL, NULL, "vcc from 1 V to 2 V show mid.v\nrail x 3 V",
         "--sweep:1:1: ", "one sweep"},
    };
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        const char *const sets[] = {cases[k].sets};
        struct ampstead_request request =
            request_of(cases[k].sweep != NULL ? "sweep" : "point", divider);
        struct ampstead_result *result = NULL;
        request.sets = sets;
        request.set_count = cases[k].sets != NULL;
        request.temperature = cases[k].temperature;
        request.corner = cases[k].corner;
        request.sweep = cases[k].sweep;
        assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
        const char *messages = ampstead_result_messages(result, 0);
        if (strncmp(messages, cases[k].message, strlen(cases[k].message)) != 0 ||
            strstr(messages, cases[k].hint) == NULL) {
            print_error("case %zu: %s\n", k, messages);
            fail();
        }
        assert_null(ampstead_result_json(result));
        ampstead_result_free(result);
    }
}

static void wrong_use(void **state)
{
    (void)state;
    struct ampstead_result *result = NULL;
    struct ampstead_request request = request_of("ponder", divider);
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
    assert_string_equal(ampstead_result_messages(result, 0),
                        "ampstead: the request has an unknown command\n");
    ampstead_result_free(result);
    request = request_of("point", divider);
    request.size--;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
    ampstead_result_free(result);
    request = request_of("point", divider);
    request.path = NULL;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
    ampstead_result_free(result);
    ampstead_result_free(NULL);
    assert_int_equal(ampstead_result_status(NULL), AMPSTEAD_MACHINE);
    assert_non_null(ampstead_result_messages(NULL, 0));
    assert_null(ampstead_result_text(NULL, 0, 0));
    assert_int_equal(ampstead_result_value(NULL, "x.v", &(double){0.0}), 0);
}

static void cell_error(void **state)
{
    (void)state;
    struct ampstead_request request =
        request_of("point", "rail vcc 3 V\nresistor R vcc -> gnd 3 uA\n");
    struct ampstead_result *result = NULL;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
    const char *messages = ampstead_result_messages(result, 0);
    assert_memory_equal(messages, "divider.cell:2:23: ", 19);
    assert_null(ampstead_result_text(result, 0, 0));
    assert_null(ampstead_result_csv(result));
    ampstead_result_free(result);
}

/* vcc from 1 V to 2 V: mid = 2/3 of it, at every point. */
static void sweep_csv(void **state)
{
    (void)state;
    struct ampstead_request request = request_of("sweep", divider);
    struct ampstead_result *result = NULL;
    request.sweep = "vcc from 1.5 V to 3 V points 3 show mid.v, RA.i";
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    const char *csv = ampstead_result_csv(result);
    assert_non_null(csv);
    double at, mid, current;
    const char *header = "sweep,vcc [V],mid.v [V],RA.i [A]\r\n";
    assert_memory_equal(csv, header, strlen(header));
    csv += strlen(header);
    for (int k = 0; k < 3; k++) {
        assert_int_equal(sscanf(csv, "1,%lf,%lf,%lf", &at, &mid, &current), 3);
        assert_near(at, 1.5 + 0.75 * k);
        assert_near(mid, at * 2.0 / 3.0);
        assert_near(current, at / 30e3);
        csv = strstr(csv, "\r\n") + 2;
    }
    assert_int_equal(*csv, '\0');
    ampstead_result_free(result);
}

static int always(void *self)
{
    ++*(int *)self;
    return 1;
}

static void stopped(void **state)
{
    (void)state;
    int asked = 0;
    struct ampstead_request request = request_of("sweep", divider);
    struct ampstead_result *result = NULL;
    request.sweep = "vcc from 1.5 V to 3 V points 1000 show mid.v";
    request.stopped = always;
    request.stopped_self = &asked;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_STOPPED);
    assert_true(asked > 0);
    const char *text = ampstead_result_text(result, 0, 0);
    assert_non_null(text);
    assert_memory_equal(text, "STOPPED", 7);
    ampstead_result_free(result);
}

/* The same request gives the same bytes, and asking twice too. */
static void same_bytes(void **state)
{
    (void)state;
    struct ampstead_request request = request_of("review", divider);
    struct ampstead_result *first = NULL, *second = NULL;
    assert_int_equal(ampstead_run(&request, &first), AMPSTEAD_WELL);
    assert_int_equal(ampstead_run(&request, &second), AMPSTEAD_WELL);
    assert_string_equal(ampstead_result_json(first), ampstead_result_json(second));
    assert_string_equal(ampstead_result_text(first, AMPSTEAD_COLOR, 80),
                        ampstead_result_text(second, AMPSTEAD_COLOR, 80));
    ampstead_result_free(first);
    ampstead_result_free(second);
}

static void models(void **state)
{
    (void)state;
    struct ampstead_request request = AMPSTEAD_REQUEST;
    struct ampstead_result *result = NULL;
    request.command = "models";
    request.path = SOURCE_DIR "/models/n180.process";
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    /* n180.process gives threshold 0.45 V for its n device */
    assert_non_null(strstr(ampstead_result_text(result, 0, 0), "450 mV  given"));
    assert_non_null(strstr(ampstead_result_json(result), "\"command\": \"models\""));
    assert_null(ampstead_result_csv(result));
    ampstead_result_free(result);
}

/* Pictures and page of a review; a format and a check of a text given in memory. */
static void shows(void **state)
{
    (void)state;
    static const char cell[] = "rail vdd 2 V\nresistor R1 vdd->mid 1k\nresistor R2 mid->gnd 1k\n";
    struct ampstead_request request = AMPSTEAD_REQUEST;
    struct ampstead_result *result = NULL;
    request.path = SOURCE_DIR "/netlists/widlar_mos.cell";
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_non_null(strstr(ampstead_result_plot(result), "</svg>"));
    assert_non_null(strstr(ampstead_result_page(result), "</html>"));
    assert_string_equal(ampstead_result_file(result, 0), request.path);
    assert_non_null(strstr(ampstead_result_file(result, 1), "n180.process"));
    assert_null(ampstead_result_file(result, 2));
    assert_null(ampstead_result_file(result, -1));
    ampstead_result_free(result);
    request.path = "text.cell";
    request.text = cell;
    request.text_length = sizeof cell - 1;
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_null(ampstead_result_plot(result)); /* no output, no curve */
    ampstead_result_free(result);
    request.command = "format";
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_WELL);
    assert_string_equal(ampstead_result_text(result, 0, 0), "rail      vdd  2 V\n"
                                                            "resistor  R1   vdd -> mid  1k\n"
                                                            "resistor  R2   mid -> gnd  1k\n");
    assert_null(ampstead_result_json(result));
    ampstead_result_free(result);
    request.command = "check";
    request.text_length -= 4; /* without the last value */
    assert_int_equal(ampstead_run(&request, &result), AMPSTEAD_INPUT);
    const char *errors = ampstead_result_text(result, 0, 0);
    assert_int_equal(strncmp(errors, "text.cell:3:", 12), 0);
    assert_non_null(strstr(errors, ": error: "));
    assert_null(ampstead_result_page(result));
    ampstead_result_free(result);
}

static void version(void **state)
{
    (void)state;
    assert_string_equal(ampstead_version(), AMPSTEAD_VERSION);
    assert_int_equal(strncmp(ampstead_build(), "KLU ", 4), 0);
}

/* Parts of a run in memory, and what is no request for one. */
static void parts_of_a_run(void **state)
{
    (void)state;
    static const char matched[] = "rail vcc 3 V\nresistor RA vcc -> mid 10k match=1%\n"
                                  "resistor RB mid -> gnd 20k match=1%\n"
                                  "require mid.v within 1% of 2 V for 90%\n";
    struct ampstead_result *part[2], *whole, *joined;
    struct ampstead_part given[2];
    for (int k = 0; k < 2; k++) {
        struct ampstead_request request = request_of("spread", matched);
        request.samples = 101;
        request.part = k == 0 ? "1/2" : "2/2";
        assert_int_equal(ampstead_run(&request, &part[k]), AMPSTEAD_WELL);
        const char *text = ampstead_result_part(part[k]);
        assert_non_null(text);
        assert_null(ampstead_result_json(part[k])); /* a part is no report */
        given[k] = (struct ampstead_part){k == 0 ? "first" : "second", text, strlen(text)};
    }
    struct ampstead_request request = request_of("spread", matched);
    request.samples = 101;
    const enum ampstead_status status = ampstead_run(&request, &whole);
    assert_null(ampstead_result_part(whole));
    struct ampstead_request merge = request_of("merge", matched);
    merge.path = NULL;
    merge.parts = given;
    merge.part_count = 2;
    assert_int_equal(ampstead_run(&merge, &joined), status);
    assert_string_equal(ampstead_result_json(joined), ampstead_result_json(whole));
    assert_string_equal(ampstead_result_text(joined, 0, 100), ampstead_result_text(whole, 0, 100));
    ampstead_result_free(joined);
    merge.part_count = 1;
    assert_int_equal(ampstead_run(&merge, &joined), AMPSTEAD_INPUT);
    assert_string_equal(ampstead_result_messages(joined, 0),
                        "ampstead: 1 of 2 parts is missing: part 2/2\n");
    ampstead_result_free(joined);
    merge.parts = NULL;
    assert_int_equal(ampstead_run(&merge, &joined), AMPSTEAD_INPUT);
    ampstead_result_free(joined);
    request.part = "3/2";
    assert_int_equal(ampstead_run(&request, &joined), AMPSTEAD_INPUT);
    ampstead_result_free(joined);
    request.part = NULL;
    request.lanes = 9;
    assert_int_equal(ampstead_run(&request, &joined), AMPSTEAD_INPUT);
    ampstead_result_free(joined);
    ampstead_result_free(whole);
    ampstead_result_free(part[0]);
    ampstead_result_free(part[1]);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(values),         cmocka_unit_test(set_value),
        cmocka_unit_test(chosen_cell),    cmocka_unit_test(remedies),
        cmocka_unit_test(wrong_requests), cmocka_unit_test(wrong_use),
        cmocka_unit_test(cell_error),     cmocka_unit_test(sweep_csv),
        cmocka_unit_test(stopped),        cmocka_unit_test(same_bytes),
        cmocka_unit_test(models),         cmocka_unit_test(version),
        cmocka_unit_test(shows),          cmocka_unit_test(parts_of_a_run),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
