/* stopped_test.c: told to stop at any moment, each command that searches ends as a stopped one. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <string.h>

#include "library/ampstead.h"

/* A self-biased pair, two mirrors and a junction: loops, states, conditions, mismatch, unknowns. */
static const char loop[] = "process \"n180.process\"\n"
                           "rail vdd 1.8 V\n"
                           "pmos M1 d=ref g=pg s=vdd W=8u L=4u\n"
                           "pmos M2 d=pg g=pg s=vdd W=8u L=4u\n"
                           "nmos M3 d=ref g=ref s=gnd W=4u L=8u\n"
                           "nmos M4 d=pg g=ref s=deg W=16u L=8u\n"
                           "resistor RE deg -> gnd 100k\n"
                           "nmos M5 d=tail g=ref s=gnd W=4u L=8u\n"
                           "output tail at 0.9 V from 0 V to 1.8 V\n"
                           "sweep vdd from 1 V to 1.8 V points 12 show tail.current\n"
                           "hand tail.current = 400 nA\n"
                           "require tail.current within 1% of 2 uA everywhere\n"
                           "vary vdd from 1.6 V to 2 V\n"
                           "choose RE from 5k to 900k so tail.current = 600 nA\n";

/* No operating point: the source asks for more than the mirror's transistor can carry. */
static const char none[] = "rail vdd 3 V\n"
                           "rail bias 1 V\n"
                           "nmos M1 d=far g=bias s=gnd conduction=20 uA/V^2 threshold=0.5 V\n"
                           "current I1 vdd -> far 1 mA\n"
                           "nmos M2 d=out g=far s=gnd conduction=20 uA/V^2 threshold=0.5 V\n"
                           "output out at 1 V from 0 V to 3 V\n"
                           "require out.current above 1 uA everywhere\n"
                           "vary bias from 0.9 V to 1.1 V\n";

struct moment {
    long asked, yes_from;
};

static int ask(void *self)
{
    struct moment *moment = self;
    return ++moment->asked >= moment->yes_from;
}

/* The answers of one command stopped at ever later asks, up to one that is not stopped. */
static void stop_everywhere(const char *command, const char *cell)
{
    int stops = 0;
    for (long from = 1;; from += 1 + from / 12) {
        struct moment moment = {0, from};
        struct ampstead_request request = AMPSTEAD_REQUEST;
        struct ampstead_result *result = NULL;
        request.command = command;
        request.path = "loop.cell";
        request.text = cell;
        request.text_length = strlen(cell);
        request.stopped = ask;
        request.stopped_self = &moment;
        request.samples = 20;
        request.boxes = 200;
        request.jobs = 1;
        const enum ampstead_status status = ampstead_run(&request, &result);
        const char *text = ampstead_result_text(result, 0, 0);
        const char *json = ampstead_result_json(result);
        const int was_told = moment.asked >= from;
        const int says = text != NULL && json != NULL && strncmp(text, "STOPPED", 7) == 0 &&
                         strstr(json, "\"verdict\": \"stopped\"") != NULL;
        if (was_told != (status == AMPSTEAD_STOPPED) || was_told != says) {
            fail_msg("%s stopped at ask %ld: status %d\n%s", command, from, (int)status,
                     text == NULL ? "" : text);
        }
        ampstead_result_free(result);
        if (!was_told) {
            break;
        }
        stops++;
    }
    print_message("%s: stopped at %d moments\n", command, stops);
    assert_true(stops > 3);
}

static void every_command(void **state)
{
    (void)state;
    static const char *const commands[] = {"point", "review",      "sweep",  "explain",
                                           "size",  "sensitivity", "spread", "states"};
    for (size_t k = 0; k < sizeof commands / sizeof commands[0]; k++) {
        stop_everywhere(commands[k], loop);
    }
    stop_everywhere("review", none);
    stop_everywhere("spread", none);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(every_command)};
    return cmocka_run_group_tests_name("stopped", tests, NULL, NULL);
}
