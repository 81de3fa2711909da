/*
 * memory_test.c: every allocation fails once: reading, solving, sweeping and all the texts. Each
 * time the run ends with the status of a failed machine and no block is left behind. One exception:
 * KLU asks to shrink its factors and keeps the larger block when that is refused; then all texts
 * are those of an undisturbed run.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "allocator.h"
#include "library/ampstead.h"

struct scenario {
    const char *name, *command, *cell;
    enum ampstead_view view;
    const char *temperature, *set, *sweep, *text;
};

/* A diode-connected stack on a source that the direct search cannot settle, so that the later
 * searches allocate too. */
static const char hard_cell[] = "rail vcc 1 V\n"
                                "current I vcc -> x 1 uA\n"
                                "law L x -> gnd i = 1 nA * (1 + sqrt((x.v / 1 V)^2)) / "
                                "(1 + sqrt((x.v / 1 V)^2))\n";

/* Three states, a loop, and a start-up verdict. */
static const char latch_cell[] =
    "model n npn\n early = 50 V\nend\nmodel p pnp\nend\nrail vcc 5 V\n"
    "resistor RL vcc -> e 1k\npnp Q2 c=b b=c e=e\nnpn Q1 c=c b=b e=gnd\n"
    "resistor R1 b -> gnd 10k\nresistor R2 e -> c 10k\nresistor R3 vcc -> b 1M\n"
    "npn Q3 c=o b=b e=gnd\noutput o at 1 V from 0 V to 5 V\n";

static const char wrong_cell[] = "rail vcc 1 V\nresistor R vcc -> x 3 uA\nnmos M1 d=x g=y W=1u\n"
                                 "hand M1.vgs = 1 A\nresistr Q a -> b 3\nlet X = Y + 1\n";

static const struct scenario scenarios[] = {
    {.name = "review", .cell = "netlists/mirror.cell"},
    {.name = "review with a process", .cell = "netlists/wide_swing_cascode.cell"},
    {.name = "bandgap", .cell = "netlists/bandgap.cell"},
    {.name = "many choices", .cell = "netlists/beta_multiplier.cell", .temperature = "60 C"},
    {.name = "point", .command = "point", .cell = "netlists/wilson_mos.cell"},
    {.name = "hand view", .command = "point", .cell = "netlists/mirror.cell", .view = 1},
    {.name = "sweep",
     .command = "sweep",
     .cell = "netlists/mirror.cell",
     .sweep = "vdd from 1 V to 3 V points 4 show tail.current, tail.resistance"},
    {.name = "sweep anew",
     .command = "sweep",
     .cell = "netlists/mirror.cell",
     .sweep = "temperature from 0 C to 60 C points 3 show tail.current",
     .set = "ITAIL=18 uA"},
    {.name = "states", .command = "states", .cell = "latch.cell", .text = latch_cell},
    {.name = "models", .command = "models", .cell = "netlists/mirror.cell"},
    {.name = "unsolved", .command = "point", .cell = "hard.cell", .text = hard_cell},
    {.name = "wrong", .cell = "wrong.cell", .text = wrong_cell},
};

/* All that a run gives. */
struct outcome {
    enum ampstead_status status;
    char *texts; /* messages, page, JSON, CSV, one behind the other; malloc of the test itself */
};

static char *joined(const char *const *parts, int count)
{
    size_t length = 1;
    for (int k = 0; k < count; k++) {
        length += parts[k] == NULL ? 1 : strlen(parts[k]);
    }
    char *all = test_malloc(length);
    all[0] = '\0';
    for (int k = 0; k < count; k++) {
        strcat(all, parts[k] == NULL ? "-" : parts[k]);
    }
    return all;
}

static struct outcome run(const struct scenario *s)
{
    char path[400];
    snprintf(path, sizeof path, "%s%s", s->text != NULL ? "" : SOURCE_DIR "/", s->cell);
    struct ampstead_request request = AMPSTEAD_REQUEST;
    struct ampstead_result *result = NULL;
    request.path = path;
    request.command = s->command;
    request.view = s->view;
    request.temperature = s->temperature;
    request.sweep = s->sweep;
    request.text = s->text;
    request.text_length = s->text != NULL ? strlen(s->text) : 0;
    request.sets = &s->set;
    request.set_count = s->set != NULL;
    (void)ampstead_run(&request, &result);
    const char *parts[4];
    parts[1] = ampstead_result_text(result, 0, 100);
    parts[2] = ampstead_result_json(result);
    parts[3] = ampstead_result_csv(result);
    parts[0] = ampstead_result_messages(result, 0);
    struct outcome outcome = {ampstead_result_status(result), joined(parts, 4)};
    ampstead_result_free(result);
    return outcome;
}

/* Fails request k, for k = 1, 2, 3 ... until a run has fewer requests than that. */
static void fail_each(const struct scenario *s, bool onward)
{
    allocator_fail(0, false);
    const long before = allocator_live();
    struct outcome whole = run(s);
    const long requests = allocator_requests();
    assert_int_equal(allocator_live(), before);
    assert_int_not_equal(whole.status, AMPSTEAD_MACHINE);
    long spared = 0;
    for (long k = 1; k <= requests; k++) {
        allocator_fail(k, onward);
        struct outcome outcome = run(s);
        const bool resize = allocator_failed_resize();
        allocator_fail(0, false);
        if (outcome.status != AMPSTEAD_MACHINE) {
            spared++;
            if (!resize || outcome.status != whole.status ||
                strcmp(outcome.texts, whole.texts) != 0) {
                fail_msg("%s: request %ld of %ld failed, status %d, other texts", s->name, k,
                         requests, outcome.status);
            }
        }
        if (allocator_live() != before) {
            fail_msg("%s: request %ld of %ld failed, %ld blocks left", s->name, k, requests,
                     allocator_live() - before);
        }
        test_free(outcome.texts);
    }
    print_message("    %s: %ld requests, %ld done without\n", s->name, requests, spared);
    test_free(whole.texts);
}

static void test_one(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof scenarios / sizeof scenarios[0]; k++) {
        fail_each(&scenarios[k], false);
    }
}

static void test_all_after(void **state)
{
    (void)state;
    for (size_t k = 0; k < sizeof scenarios / sizeof scenarios[0]; k++) {
        fail_each(&scenarios[k], true);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_one),
        cmocka_unit_test(test_all_after),
    };
    allocator_install();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
