/*
 * memory_test.c: every allocation fails once: reading, solving, sweeping and all the texts. Each
 * time no block is left behind, and the run ends with the status of a failed machine or with all
 * texts those of an undisturbed run: KLU keeps the larger block when shrinking its factors is
 * refused, and samples are solved one by one where there is no memory for lanes.
 */
#include <dirent.h>
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
    const char *temperature, *set, *sweep, *text, *part;
    bool is_whole;       /* short enough that each request is refused in every run */
    bool is_brief;       /* only one request refused: the same lines as another one for the rest */
    bool has_whole_page; /* a page of a review also with states and spread */
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
/* A mirror whose corners and let build the cell anew, with deviates to sample. */
#define SPREAD_MIRROR                                                                              \
    "model n nmos\n threshold = 0.5 V\n kprime = 100 uA/V^2\n match_threshold = 5 mV*um\nend\n"    \
    "corner hot\n n.threshold += -20 mV\nend\n"                                                    \
    "let R = 100k\nrail vdd 3 V\nresistor RB vdd -> g R tol=1%\n"                                  \
    "nmos M1 d=g g=g s=gnd W=10u L=2u\nnmos M2 d=out g=g s=gnd W=10u L=2u\n"                       \
    "output out at 1 V from 0.9 V to 1.1 V\n"

static const char range_cell[] =
    SPREAD_MIRROR "require out.current above 1 uA everywhere\nvary R from 90k to 110k\n";
static const char corner_cell[] =
    SPREAD_MIRROR "require out.resistance above 1 ohm for 50%\nvary process\n";

static const char wrong_cell[] = "rail vcc 1 V\nresistor R vcc -> x 3 uA\nnmos M1 d=x g=y W=1u\n"
                                 "hand M1.vgs = 1 A\nresistr Q a -> b 3\nlet X = Y + 1\n";

static const struct scenario scenarios[] = {
    {.name = "review", .cell = "netlists/mirror.cell"},
    {.name = "review with a process", .cell = "netlists/wide_swing_cascode.cell", .is_brief = true},
    {.name = "bandgap", .cell = "netlists/bandgap_sub1v.cell", .is_brief = true},
    {.name = "many choices",
     .cell = "netlists/beta_multiplier.cell",
     .temperature = "60 C",
     .is_brief = true},
    {.name = "point", .command = "point", .cell = "netlists/wilson_mos.cell", .is_brief = true},
    {.name = "hand view",
     .command = "point",
     .cell = "netlists/mirror.cell",
     .view = 1,
     .is_brief = true},
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
    {.name = "spread", .command = "spread", .cell = "range.cell", .text = range_cell},
    {.name = "whole page", .cell = "range.cell", .text = range_cell, .has_whole_page = true},
    {.name = "part", .command = "spread", .cell = "range.cell", .text = range_cell, .part = "2/2"},
    {.name = "corners", .command = "spread", .cell = "corner.cell", .text = corner_cell},
    {.name = "models", .command = "models", .cell = "netlists/mirror.cell"},
    {.name = "everything", .cell = "tests/faults/everything.cell"},
    {.name = "everything swept", .command = "sweep", .cell = "tests/faults/everything.cell"},
    {.name = "opamp", .cell = "netlists/opamp_sink.cell"},
    {.name = "unsolved", .command = "point", .cell = "hard.cell", .text = hard_cell},
    {.name = "format",
     .command = "format",
     .cell = "tests/faults/everything.cell",
     .is_whole = true},
    {.name = "check", .command = "check", .cell = "tests/faults/everything.cell", .is_whole = true},
    {.name = "wrong", .cell = "wrong.cell", .text = wrong_cell},
};

/* All that a run gives. */
struct outcome {
    enum ampstead_status status;
    char *texts; /* messages, text, JSON, CSV, picture, page, one behind the other; malloc of the
                    test itself */
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
    request.jobs = 1; /* request k is then the same one in each run */
    request.samples = 3;
    request.part = s->part;
    request.whole = s->has_whole_page;
    (void)ampstead_run(&request, &result);
    const char *parts[7];
    parts[1] = ampstead_result_text(result, 0, 100);
    parts[2] = ampstead_result_json(result);
    parts[3] = ampstead_result_csv(result);
    parts[4] = ampstead_result_plot(result);
    parts[5] = ampstead_result_page(result);
    parts[6] = ampstead_result_part(result);
    parts[0] = ampstead_result_messages(result, 0);
    struct outcome outcome = {ampstead_result_status(result), joined(parts, 7)};
    ampstead_result_free(result);
    return outcome;
}

/* What is refused: one request for memory, that and all later ones, one block of an arena. */
enum refusal { REFUSE_ONE, REFUSE_ONWARD, REFUSE_BLOCK };

static void refuse(enum refusal refusal, long at)
{
    allocator_fail(refusal == REFUSE_BLOCK ? 0 : at, refusal == REFUSE_ONWARD);
    allocator_fail_block(refusal == REFUSE_BLOCK ? at : 0);
}

/* Compares a disturbed run with the whole one; true when it did without the memory. */
static bool check(const struct scenario *s, long k, const struct outcome *outcome,
                  const struct outcome *whole)
{
    if (outcome->status == AMPSTEAD_MACHINE) {
        return false;
    }
    if (outcome->status != whole->status || strcmp(outcome->texts, whole->texts) != 0) {
        fail_msg("%s: request %ld failed, but the status is %d", s->name, k, outcome->status);
    }
    return true;
}

/* The ordinary run refuses a share of the requests of a long scenario, evenly spread; `memory_test
 * every` (ctest -C thousands) refuses each one. */
enum { ORDINARY_REQUESTS = 120 };
static bool is_every;

static long stride_of(long requests)
{
    return is_every ? 1 : (requests + ORDINARY_REQUESTS - 1) / ORDINARY_REQUESTS;
}

/* Refuses request k, for k = 1, 2, 3 ... to the last one of an undisturbed run. */
static void refuse_each(const struct scenario *s, enum refusal refusal)
{
    refuse(refusal, 0);
    const long before = allocator_live();
    struct outcome whole = run(s);
    const long requests = refusal == REFUSE_BLOCK ? allocator_blocks() : allocator_requests();
    assert_int_equal(allocator_live(), before);
    assert_int_not_equal(whole.status, AMPSTEAD_MACHINE);
    long spared = 0;
    const long stride = requests > 0 && !s->is_whole ? stride_of(requests) : 1;
    for (long k = 1; k <= requests; k += stride) {
        refuse(refusal, k);
        struct outcome outcome = run(s);
        spared += check(s, k, &outcome, &whole);
        refuse(refusal, 0);
        if (allocator_live() != before) {
            fail_msg("%s: request %ld failed, %ld blocks are left", s->name, k,
                     allocator_live() - before);
        }
        test_free(outcome.texts);
    }
    print_message("    %s: %ld requests, one in %ld refused, %ld done without\n", s->name, requests,
                  stride, spared);
    test_free(whole.texts);
}

static void refuse_all(enum refusal refusal)
{
    for (size_t k = 0; k < sizeof scenarios / sizeof scenarios[0]; k++) {
        if (refusal == REFUSE_ONE || !scenarios[k].is_brief) {
            refuse_each(&scenarios[k], refusal);
        }
    }
}

static void test_one(void **state)
{
    (void)state;
    refuse_all(REFUSE_ONE);
}

static void test_all_after(void **state)
{
    (void)state;
    refuse_all(REFUSE_ONWARD);
}

/* Wrong cells too: what is needed for the messages. */
static void test_blocks(void **state)
{
    (void)state;
    static const char *const folders[] = {"tests/language/reject", "tests/circuit/reject",
                                          "tests/language/accept"};
    refuse_all(REFUSE_BLOCK);
    for (size_t f = 0; f < sizeof folders / sizeof folders[0]; f++) {
        char path[400];
        snprintf(path, sizeof path, SOURCE_DIR "/%s", folders[f]);
        DIR *folder = opendir(path);
        assert_non_null(folder);
        for (struct dirent *entry; (entry = readdir(folder)) != NULL;) {
            const size_t length = strlen(entry->d_name);
            if (length > 5 && strcmp(entry->d_name + length - 5, ".cell") == 0) {
                snprintf(path, sizeof path, "%s/%s", folders[f], entry->d_name);
                refuse_each(&(struct scenario){.name = path, .cell = path, .command = "models"},
                            REFUSE_BLOCK);
            }
        }
        closedir(folder);
    }
}

int main(int argc, char **argv)
{
    is_every = argc > 1 && strcmp(argv[1], "every") == 0;
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_one),
        cmocka_unit_test(test_all_after),
        cmocka_unit_test(test_blocks),
    };
    allocator_install();
    return cmocka_run_group_tests(tests, NULL, NULL);
}
