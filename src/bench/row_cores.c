/*
 * row_cores.c: mismatch samples and sweeps with one thread and with two.
 */
#include <math.h>
#include <unistd.h>

#include "analyses/analysis.h"
#include "analyses/spread_result.h"
#include "bench/problem.h"
#include "bench/stopwatch.h"

static const char sampled[] = "process \"n350.process\"\n"
                              "rail vdd 3.3 V\n"
                              "current IREF bias -> gnd 10 uA\n"
                              "pmos M1 d=top g=top s=vdd W=20u L=2u\n"
                              "pmos M2 d=bias g=bias s=top W=20u L=2u\n"
                              "pmos M3 d=mid g=top s=vdd W=20u L=2u\n"
                              "pmos M4 d=drive g=bias s=mid W=20u L=2u\n"
                              "output drive at 1 V from 0 V to 3.3 V\n";

/* Eight curves: a family has one piece of work a curve. */
static const char swept[] = "process \"n350.process\"\n"
                            "rail vdd 3.3 V\n"
                            "current IREF bias -> gnd 10 uA\n"
                            "pmos M1 d=top g=top s=vdd W=20u L=2u\n"
                            "pmos M2 d=bias g=bias s=top W=20u L=2u\n"
                            "pmos M3 d=mid g=top s=vdd W=20u L=2u\n"
                            "pmos M4 d=drive g=bias s=mid W=20u L=2u\n"
                            "output drive at 1 V from 0 V to 3.3 V\n"
                            "sweep drive from 0 V to 3.3 V points 400 show drive.current, M4.vgs "
                            "for vdd = 2.6 V, 2.8 V, 3 V, 3.1 V, 3.2 V, 3.3 V, 3.4 V, 3.6 V\n";

struct work {
    struct problem problem;
    enum status (*analyse)(struct circuit *circuit, const struct analysis_options *options,
                           struct result **result);
    struct analysis_options options;
    double answer; /* one number of the result */
};

static double sample_answer(const struct result *result)
{
    return result->mismatch->quantities[0].sampled.mean;
}

static double sweep_answer(const struct result *result)
{
    const struct sweep_table *table = &result->sweeps[result->sweep_count - 1];
    const struct sweep_series *last = &table->series[table->series_count - 1];
    return last->values[last->count - 1];
}

static bool run(struct work *work, int jobs)
{
    struct result *result = NULL;
    work->options.jobs = jobs;
    const bool good = work->analyse(work->problem.circuit, &work->options, &result) == STATUS_OK;
    if (good) {
        work->answer =
            work->analyse == analysis_spread ? sample_answer(result) : sweep_answer(result);
    }
    result_free(result);
    return good;
}

static bool run_one(void *self)
{
    return run(self, 1);
}

static bool run_two(void *self)
{
    return run(self, 2);
}

/* One thread over two; 0 after trouble. */
static double race(struct work *work, const char *text, size_t length,
                   const struct bench_options *options, struct bench_result *result)
{
    struct contender both[] = {{.run = run_one, .self = work}, {.run = run_two, .self = work}};
    double ratios[2] = {0, 0}, answers[2] = {0, 0};
    result->trouble = problem_open(&work->problem, text, length);
    if (result->trouble == NULL) {
        for (int k = 0; k < 2 && run(work, k + 1); k++) {
            answers[k] = work->answer;
        }
        if (!stopwatch_race(both, 2, options, CLOCK_WALL, ratios)) {
            result->trouble = "it was not solved";
        }
        bench_differs(result, answers[0], answers[1], 1e-300);
    }
    problem_close(&work->problem);
    const double ratio = result->trouble == NULL ? both[0].seconds / both[1].seconds : 0;
    if (!(ratio >= result->ratio) || result->ratio == 0) {
        result->ratio = ratio;
        result->least = ratios[0];
        result->most = ratios[1];
    }
    return ratio;
}

void bench_cores(const struct bench_options *options, struct bench_result *result)
{
    struct work samples = {.analyse = analysis_spread,
                           .options = {.samples = options->quick ? 100 : 20000, .seed = 1}};
    struct work sweeps = {.analyse = analysis_sweep};
    const double by_samples = race(&samples, sampled, sizeof sampled - 1, options, result);
    if (result->trouble == NULL) {
        const double by_sweeps = race(&sweeps, swept, sizeof swept - 1, options, result);
        bench_add(result, "samples", by_samples, "");
        bench_add(result, "sweeps", by_sweeps, "");
        bench_add(result, "processors", (double)sysconf(_SC_NPROCESSORS_ONLN), "");
    }
}
