/*
 * row_samples.c: mismatch samples of the mirror of row `point`, random numbers and reading
 * included, on one core: side by side in lanes against one at a time. Each sample is a converged
 * solve.
 */
#include <math.h>
#include <stdlib.h>

#include "analyses/lanes.h"
#include "analyses/sampling.h"
#include "analyses/setup.h"
#include "bench/problem.h"
#include "bench/stopwatch.h"

static const char text[] = "process \"n180.process\"\n"
                           "rail vdd 1.8 V\n"
                           "current IREF vdd -> ref 20 uA\n"
                           "nmos M1 d=ref g=ref s=s1 W=20u L=1u\n"
                           "nmos M2 d=out g=ref s=s2 W=20u L=1u\n"
                           "nmos M3 d=s1 g=vdd s=gnd W=2u L=2u\n"
                           "nmos M4 d=s2 g=vdd s=gnd W=2u L=2u\n"
                           "output out at 0.9 V from 0 V to 1.8 V\n"
                           "require out.current within 5% of 20 uA\n";

enum { SAMPLES = 20000, QUICK_SAMPLES = 500 };

struct way {
    struct analysis_options options;
    struct sampling_plan plan;
    struct sample_rows rows;
};

struct race {
    struct problem problem;
    struct setup setup;
    struct mismatch mismatch;
    struct arena *arena;
    struct way single, four, widest;
};

static bool run_way(void *self)
{
    struct way *way = self;
    way->plan.options = &way->options;
    return sampling_run(&way->plan, &way->rows) == STATUS_OK;
}

static bool open_way(struct race *r, struct way *way, int lanes, int count)
{
    const struct circuit *c = r->problem.circuit;
    const size_t n = (size_t)count, probes = (size_t)r->setup.list.probe_count;
    way->options =
        (struct analysis_options){.view = VIEW_FULL, .jobs = 1, .seed = 1, .lanes = lanes};
    way->plan = (struct sampling_plan){.circuit = r->problem.circuit,
                                       .mismatch = &r->mismatch,
                                       .home = r->setup.point.x,
                                       .count = count};
    way->rows = (struct sample_rows){
        arena_new_array(r->arena, double, n *probes),
        arena_new_array(r->arena, unsigned char, n *(size_t)c->requirement_count),
        arena_new_array(r->arena, unsigned char, n)};
    return way->rows.values != NULL && way->rows.met != NULL && way->rows.states != NULL;
}

static const char *prepare(struct race *r, int count)
{
    const char *trouble = problem_open(&r->problem, text, sizeof text - 1);
    if (trouble != NULL) {
        return trouble;
    }
    const struct analysis_options options = {.view = VIEW_FULL};
    r->arena = arena_create();
    if (r->arena == NULL ||
        setup_open(&r->setup, r->problem.circuit, NULL, 0, NULL, READING_ALL, &options) !=
            STATUS_OK ||
        setup_solve(&r->setup, NULL, 0, NULL) != STATUS_OK ||
        !mismatch_list(r->setup.system, r->arena, &r->mismatch) ||
        !open_way(r, &r->single, 1, count) || !open_way(r, &r->four, 4, count) ||
        !open_way(r, &r->widest, 0, count)) {
        return "the samples cannot be set up";
    }
    return lanes_find(0) == NULL ? "this processor or this build has no lanes" : NULL;
}

static void measure(struct race *r, int count, const struct bench_options *options,
                    struct bench_result *result)
{
    struct contender all[] = {{.run = run_way, .self = &r->single},
                              {.run = run_way, .self = &r->widest},
                              {.run = run_way, .self = &r->four}};
    double ratios[2];
    if (!stopwatch_race(all, sizeof all / sizeof all[0], options, CLOCK_WORK, ratios)) {
        result->trouble = "the samples fail";
        return;
    }
    int failed = 0, searched = 0;
    for (int k = 0; k < count; k++) {
        failed += r->widest.rows.states[k] == SAMPLE_FAILED;
        searched += r->widest.rows.states[k] == SAMPLE_SEARCHED;
    }
    for (int k = 0; k < count * r->setup.list.probe_count; k++) {
        bench_differs(result, r->widest.rows.values[k], r->single.rows.values[k], 0);
        bench_differs(result, r->four.rows.values[k], r->single.rows.values[k], 0);
    }
    result->ratio = all[0].seconds / all[1].seconds;
    result->least = ratios[0];
    result->most = ratios[1];
    bench_add(result, "lanes", lanes_find(0)->width, "");
    bench_add(result, "samples_a_second", count / all[1].seconds, "1/s");
    bench_add(result, "samples_a_second_4_lanes", count / all[2].seconds, "1/s");
    bench_add(result, "samples_a_second_singly", count / all[0].seconds, "1/s");
    bench_add(result, "ratio_4_lanes", all[0].seconds / all[2].seconds, "");
    bench_add(result, "failed", failed, "");
    bench_add(result, "searched", searched, "");
}

void bench_samples(const struct bench_options *options, struct bench_result *result)
{
    static struct race race;
    const int count = options->quick ? QUICK_SAMPLES : SAMPLES;
    result->allowed = 1e-12;
    result->trouble = prepare(&race, count);
    if (result->trouble == NULL) {
        measure(&race, count, options, result);
    }
    setup_close(&race.setup);
    arena_destroy(race.arena);
    problem_close(&race.problem);
}
