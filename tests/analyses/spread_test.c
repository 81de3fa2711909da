/*
 * spread_test.c: conditions against closed forms, mismatch against the published example, samples
 * that do not depend on threads.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <stdlib.h>

#include "analyses/solved_cell.h"
#include "analyses/conditions.h"
#include "analyses/sampling.h"
#include "analyses/setup.h"

struct run {
    struct solved_cell cell;
    struct result *result;
};

static struct analysis_options options_of(int samples, int jobs)
{
    return (struct analysis_options){
        .view = VIEW_FULL, .samples = samples, .jobs = jobs, .seed = 1};
}

static void run_spread(struct run *run, const char *text, const struct analysis_options *options)
{
    cell_open(&run->cell, text);
    assert_int_equal(analysis_spread(run->cell.circuit, options, &run->result), STATUS_OK);
}

static void end_run(struct run *run)
{
    result_free(run->result);
    cell_close(&run->cell);
}

static const struct condition_range *range_of(const struct result *result, const char *text)
{
    const struct conditions_result *r = result->conditions;
    for (int q = 0; q < r->probe_count; q++) {
        if (strcmp(r->probes[q].text, text) == 0) {
            return &r->ranges[q];
        }
    }
    fail();
    return NULL;
}

static double drift_of(const struct result *result, const char *text, const char *thing)
{
    const struct conditions_result *r = result->conditions;
    for (int k = 0; k < r->drift_count; k++) {
        if (strcmp(r->probes[r->drifts[k].probe].text, text) == 0 &&
            strcmp(r->axes[r->drifts[k].axis].knob->name, thing) == 0) {
            return r->drifts[k].share_per_unit;
        }
    }
    fail();
    return NAN;
}

static const struct spread_of_probe *spread_of(const struct result *result, const char *text)
{
    const struct mismatch_result *r = result->mismatch;
    for (int q = 0; q < r->quantity_count; q++) {
        if (strcmp(r->quantities[q].probe->text, text) == 0) {
            return &r->quantities[q];
        }
    }
    fail();
    return NULL;
}

/* --- conditions ------------------------------------------------------------------------------- */

/* mid.v = VCC RB/(RA + RB) with RB = R (1 + 0.01/K (T - 27 C)), all by Ohm's law. */
static const char divider[] = "let R = 10k\n"
                              "rail vcc 3 V\n"
                              "resistor RA vcc -> mid 10k\n"
                              "resistor RB mid -> gnd R tempco=0.01\n"
                              "require mid.v below 2.2 V everywhere\n"
                              "require mid.v above 1.2 V everywhere\n"
                              "require mid.v within 1% of 1.5 V\n"
                              "vary vcc from 2 V to 4 V\n"
                              "vary R from 8k to 11k\n"
                              "vary temperature from 27 C to 47 C\n";

static double divider_volts(double vcc, double r, double celsius)
{
    const double rb = r * (1 + 0.01 * (celsius - 27));
    return vcc * rb / (10e3 + rb);
}

static void worst_places(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(0, 0);
    run_spread(&run, divider, &options);
    const struct conditions_result *r = run.result->conditions;
    assert_int_equal(r->axis_count, 3);
    /* own 27 C is an end: 3 * 3 * 2 combinations, and 41 points along each of three */
    assert_int_equal(r->combination_count, 18);
    assert_int_equal(r->point_count, 18 + 3 * 41);
    assert_int_equal(r->unsolved_count, 0);
    const struct condition_range *range = range_of(run.result, "mid.v");
    check_near(range->own, 1.5, 1e-12);
    check_near(range->least, divider_volts(2, 8e3, 27), 1e-12);
    check_near(range->most, divider_volts(4, 11e3, 47), 1e-12);
    assert_true(range->most_at[0] == 4 && range->most_at[1] == 11e3);
    check_near(range->most_at[2], 320.15, 1e-15);
    const struct requirement_result *below = &run.result->requirements[0];
    assert_int_equal(below->judgement, JUDGED_NOT_MET);
    check_near(below->computed, divider_volts(4, 11e3, 47), 1e-12);
    check_near(below->margin, 2.2 - divider_volts(4, 11e3, 47), 1e-12);
    assert_true(below->worst_at[0] == 4 && below->worst_at[1] == 11e3);
    const struct requirement_result *above = &run.result->requirements[1];
    assert_int_equal(above->judgement, JUDGED_NOT_MET);
    check_near(above->computed, divider_volts(2, 8e3, 27), 1e-12);
    const struct requirement_result *within = &run.result->requirements[2];
    assert_int_equal(within->judgement, JUDGED_MET);
    assert_null(within->worst_at);
    assert_int_equal(run.result->verdict, VERDICT_NOT_MET);
    end_run(&run);
}

/* Box: of mid.v over vcc it is 1/VCC per volt, the divider being linear; over the temperature
 * (v(47 C) - v(27 C))/(1.5 V 20 K). */
static void box_drift(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(0, 0);
    run_spread(&run, divider, &options);
    check_near(drift_of(run.result, "mid.v", "vcc"), 1 / 3.0, 1e-12);
    check_near(drift_of(run.result, "mid.v", "temperature"),
               (divider_volts(3, 10e3, 47) - 1.5) / (1.5 * 20), 1e-9);
    /* the fine sweeps stand in the result as sweeps */
    assert_int_equal(run.result->sweep_count, 3);
    const struct sweep_series *series = &run.result->sweeps[1].series[0];
    assert_int_equal(series->count, 41);
    check_near(series->knob[0], 8e3, 1e-15);
    check_near(series->values[0], divider_volts(3, 8e3, 27), 1e-12);
    check_near(series->values[40], divider_volts(3, 11e3, 27), 1e-12);
    /* mid.v leaves 1 % of 1.5 V at 0.99 of the rail */
    assert_int_equal(run.result->conditions->supply_count, 1);
    const double least = run.result->conditions->supplies[0].least;
    assert_true(fabs(least - 0.99 * 3) < 2e-5);
    end_run(&run);
}

/* review judges the same, without being asked for the rest. */
static void judged_in_review(void **state)
{
    (void)state;
    struct solved_cell cell;
    struct result *result = NULL;
    cell_open(&cell, divider);
    assert_int_equal(analysis_review(cell.circuit, &plain_options, &result), STATUS_OK);
    assert_int_equal(result->requirements[0].judgement, JUDGED_NOT_MET);
    check_near(result->requirements[0].computed, divider_volts(4, 11e3, 47), 1e-12);
    assert_non_null(result->requirements[0].worst_at);
    assert_null(result->mismatch);
    result_free(result);
    cell_close(&cell);
}

/* UT ln 8 over a resistor: a current proportional to absolute temperature, so that the box gives
 * 1/T at the own temperature (thermal_voltage is one of the cell's own values: built anew). */
static void proportional_to_temperature(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(0, 0);
    run_spread(&run,
               "voltage V1 x -> gnd thermal_voltage*ln(8)\n"
               "resistor R1 x -> gnd 5.36k\n"
               "require R1.i within 1 nA of thermal_voltage*ln(8)/5.36 kohm everywhere\n"
               "vary temperature from -40 C to 125 C\n",
               &options);
    const double slope = log(8) / 5360 * 8.617333262145e-5; /* (k/q) ln N / R */
    check_near(range_of(run.result, "R1.i")->least, slope * 233.15, 1e-9);
    check_near(range_of(run.result, "R1.i")->most, slope * 398.15, 1e-9);
    check_near(drift_of(run.result, "R1.i", "temperature"), 1 / 300.15, 1e-9);
    /* the limit follows the temperature as well */
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_MET);
    check_near(run.result->requirements[0].margin, 1e-9, 1e-6);
    end_run(&run);
}

/* Corners scale the resistor; the worst place names one by its number. */
static void corners(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(0, 0);
    run_spread(&run,
               "corner high\n"
               "    resistor.value *= 1.25\n"
               "end\n"
               "corner low\n"
               "    resistor.value *= 0.8\n"
               "end\n"
               "rail vcc 1 V\n"
               "resistor R1 vcc -> gnd 1k\n"
               "require R1.i below 1.2 mA everywhere\n"
               "vary process\n"
               "vary vcc from 0.9 V to 1.1 V\n",
               &options);
    const struct condition_range *range = range_of(run.result, "R1.i");
    check_near(range->least, 0.9 / 1250, 1e-12);
    check_near(range->most, 1.1 / 800, 1e-12);
    assert_true(range->least_at[0] == 0 && range->most_at[0] == 1);
    assert_int_equal(run.result->conditions->combination_count, 9);
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_NOT_MET);
    assert_true(run.result->requirements[0].worst_at[0] == 1);
    end_run(&run);
}

/* Two current sources that face each other agree at 1 uA only: elsewhere there is no state, and an
 * `everywhere` line cannot hold. */
static void unsolved_place(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(0, 0);
    run_spread(&run,
               "let X = 1\n"
               "rail vcc 1 V\n"
               "law G1 vcc -> x i = sqrt(X) * (vcc.v - x.v) * 1 uS\n"
               "resistor R1 x -> gnd 1 Mohm\n"
               "require x.v above 0.1 V everywhere\n"
               "vary X from -1 to 4\n",
               &options);
    assert_true(run.result->conditions->unsolved_count > 0);
    assert_true(run.result->conditions->unsolved_at[0] < 0);
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_UNKNOWN);
    assert_true(run.result->requirements[0].worst_at[0] < 0);
    assert_int_equal(run.result->verdict, VERDICT_NOT_MET);
    /* x.v = sqrt X/(1 + sqrt X) where there is one */
    check_near(range_of(run.result, "x.v")->most, 2.0 / 3, 1e-9);
    end_run(&run);
}

static void too_many(void **state)
{
    (void)state;
    struct solved_cell cell;
    struct result *result = NULL;
    cell_open(&cell, "let AA = 1\nlet BB = 1\nlet CC = 1\nlet DD = 1\nlet EE = 1\nlet FF = 1\n"
                     "let GG = 1\nlet HH = 1\nlet II = 1\nlet JJ = 1\nlet LL = 1\n"
                     "rail vcc 1 V\nresistor R1 vcc -> gnd 1k\n"
                     "vary AA from 0 to 2\nvary BB from 0 to 2\nvary CC from 0 to 2\n"
                     "vary DD from 0 to 2\nvary EE from 0 to 2\nvary FF from 0 to 2\n"
                     "vary GG from 0 to 2\nvary HH from 0 to 2\nvary II from 0 to 2\n"
                     "vary JJ from 0 to 2\nvary LL from 0 to 2\n");
    const struct analysis_options options = options_of(0, 0);
    assert_int_equal(analysis_spread(cell.circuit, &options, &result), STATUS_INPUT);
    assert_int_equal(cell.cell->diagnostics.count, 1);
    result_free(result);
    cell_close(&cell);
}

/* --- mismatch --------------------------------------------------------------------------------- */

/* Pelgrom, Duinmaijer and Welbers (1989): 30 mV um and 2.3 % um, 20 um by 20 um, overdrive 0.5 V by
 * k' W/L VOV^2/2 = 5 uA with k' = 40 uA/V^2. Square law: hand view. */
static const char pelgrom[] = "model n nmos\n"
                              "    threshold = 0.7 V\n"
                              "    kprime = 40 uA/V^2\n"
                              "    match_threshold = 30 mV*um\n"
                              "    match_gain = 0.023 um\n"
                              "end\n"
                              "rail vdd 5 V\n"
                              "current I1 vdd -> ref 5 uA\n"
                              "nmos M1 d=ref g=ref s=gnd W=20u L=20u\n"
                              "nmos M2 d=out g=ref s=gnd W=20u L=20u\n"
                              "output out at 1.2 V from 0.6 V to 5 V\n"
                              "require out.current within 1% of 5 uA for 80%\n"
                              "require out.current within 1% of 5 uA for 95%\n"
                              "require M2.vgs below 10 V\n";

static void published_mirror(void **state)
{
    (void)state;
    struct run run;
    struct analysis_options options = options_of(20000, 0);
    options.view = VIEW_HAND;
    run_spread(&run, pelgrom, &options);
    const struct spread_of_probe *row = spread_of(run.result, "out.current");
    check_near(row->own, 5e-6, 1e-9);
    /* sigma_beta^2 + (2 sigma_VT/VOV)^2 with 0.115 % and 1.5 mV: 0.61092 % */
    const double wanted = sqrt(0.00115 * 0.00115 + 0.006 * 0.006);
    check_near(row->linear_sigma / row->own, wanted, 1e-6);
    check_near(wanted, 0.0061092, 1e-5);
    assert_int_equal(row->sampled.count, 20000);
    assert_true(fabs(row->sampled.sigma / row->own - wanted) <
                3.5 * row->sampled.sigma_error / row->own);
    assert_int_equal(row->agreement, AGREEMENT_HOLDS);
    /* each threshold has half of 0.006^2, each gain half of 0.00115^2 */
    assert_int_equal(row->contributor_count, 4);
    check_near(row->contributors[0].share, 0.5 * 0.006 * 0.006 / (wanted * wanted), 1e-5);
    assert_string_equal(row->contributors[1].cause, "threshold");
    assert_string_equal(row->contributors[2].cause, "gain");
    double sum = 0;
    for (int k = 0; k < 4; k++) {
        sum += row->contributors[k].share;
    }
    check_near(sum, 1, 1e-12);
    int binned = 0;
    for (int b = 0; b < row->histogram.bins; b++) {
        binned += row->histogram.counts[b];
    }
    assert_int_equal(binned, 20000);
    /* yield within 1 %: 2 Phi(1/0.61092) - 1 = 89.83 % */
    const struct yield_result *yield = run.result->requirements[0].yield;
    const double share = erf(0.01 / wanted / sqrt(2));
    assert_int_equal(yield->count, 20000);
    assert_true(fabs(yield->share - share) < 4 * sqrt(share * (1 - share) / 20000));
    assert_true(yield->low < yield->share && yield->share < yield->high);
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_MET);
    assert_int_equal(run.result->requirements[1].judgement, JUDGED_NOT_MET);
    assert_int_equal(run.result->requirements[2].yield->hits, 20000);
    end_run(&run);
}

/* Bit by bit the same from one thread or many, also where outputs are analysed in each sample. */
static void threads_do_not_matter(void **state)
{
    (void)state;
    static const char *const cells[] = {
        pelgrom,
        "process \"n350.process\"\n"
        "rail vdd 3.3 V\n"
        "resistor RB vdd -> ref 124k match=0.5%\n"
        "nmos M1 d=ref g=ref s=gnd W=20u L=4u\n"
        "nmos M2 d=tail g=ref s=gnd W=20u L=4u\n"
        "output tail at 1 V from 0 V to 3.3 V\n"
        "require tail.compliance below 250 mV for 50%\n",
    };
    for (int c = 0; c < 2; c++) {
        struct run one, many;
        const struct analysis_options single = options_of(c == 0 ? 1000 : 100, 1);
        struct analysis_options several = single;
        several.jobs = 5;
        run_spread(&one, cells[c], &single);
        run_spread(&many, cells[c], &several);
        const struct mismatch_result *a = one.result->mismatch, *b = many.result->mismatch;
        assert_int_equal(a->quantity_count, b->quantity_count);
        assert_memory_equal(a->values, b->values,
                            (size_t)a->wanted * (size_t)a->quantity_count * sizeof *a->values);
        assert_int_equal(one.result->requirements[0].yield->hits,
                         many.result->requirements[0].yield->hits);
        end_run(&one);
        end_run(&many);
    }
}

/* A run that begins in the middle makes the same samples: what a split over machines needs. */
static void samples_stand_alone(void **state)
{
    (void)state;
    enum { ALL = 100, FROM = 37, PROBES = 2, REQUIREMENTS = 3 };
    struct solved_cell cell;
    struct arena *arena = arena_create();
    struct mismatch mismatch;
    double all[ALL * PROBES], part[ALL * PROBES];
    unsigned char met[ALL * REQUIREMENTS], states[ALL] = {0};
    cell_solve(&cell, pelgrom);
    assert_true(mismatch_list(cell.system, arena, &mismatch));
    assert_int_equal(mismatch.count, 4);
    const struct analysis_options options = options_of(ALL, 2);
    struct sampling_plan plan = {.circuit = cell.circuit,
                                 .options = &options,
                                 .mismatch = &mismatch,
                                 .home = cell.point.x,
                                 .count = ALL};
    struct sample_rows rows = {all, met, states};
    assert_int_equal(sampling_run(&plan, &rows), STATUS_OK);
    plan.first = FROM;
    plan.count = ALL - FROM;
    rows.values = part;
    memset(states, 0, sizeof states);
    assert_int_equal(sampling_run(&plan, &rows), STATUS_OK);
    assert_memory_equal(part, all + FROM * PROBES, (ALL - FROM) * PROBES * sizeof part[0]);
    assert_int_equal(states[0], SAMPLE_SOLVED);
    assert_int_equal(states[ALL - FROM], SAMPLE_OPEN);
    arena_destroy(arena);
    cell_close(&cell);
}

/*
 * A gate at a fixed voltage in weak inversion: I = I0 exp(-dVT/(n UT)) is lognormal with s = the
 * linear share, so that sigma/mean = sqrt(exp(s^2) - 1). The two sigmas must be told apart.
 */
static void lognormal_is_not_linear(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(20000, 0);
    run_spread(&run,
               "model n nmos\n"
               "    threshold = 0.7 V\n"
               "    kprime = 100 uA/V^2\n"
               "    match_threshold = 60 mV*um\n"
               "end\n"
               "rail vg 0.25 V\n"
               "nmos M1 d=out g=vg s=gnd W=1u L=1u\n"
               "output out at 1 V from 0.2 V to 1.5 V\n",
               &options);
    const struct spread_of_probe *row = spread_of(run.result, "out.current");
    const double s = row->linear_sigma / row->own;
    assert_true(s > 0.5 && s < 2);
    check_near(row->sampled.mean / row->own, exp(s * s / 2), 0.05);
    check_near(row->sampled.sigma / row->sampled.mean, sqrt(exp(s * s) - 1), 0.15);
    assert_int_equal(row->agreement, AGREEMENT_FAILS);
    end_run(&run);
}

/*
 * With g = 1 kohm/R - 1 and u = x.v/1 V - 1 the currents balance where u^2 + g u - g - c = 0: two
 * states, or none when g^2 + 4 g + 4 c < 0. c = 0.0888430 puts that fold at R = 1.1 kohm, one sigma
 * away: 15.87 % of the samples have no state. They are counted, and meet nothing.
 */
static void failures_count(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(400, 0);
    run_spread(&run,
               "rail vcc 2 V\n"
               "resistor R1 vcc -> x 1k match=10%\n"
               "law G1 x -> gnd i = "
               "1 mA * (2 - x.v / 1 V + (x.v / 1 V - 1)^2 - 0.08884297520661157)\n"
               "require x.v above -9 V for 99.9%\n",
               &options);
    const struct mismatch_result *r = run.result->mismatch;
    const double share = 0.15865525393145707; /* Phi(-1) */
    assert_true(fabs(r->failed / 400.0 - share) < 4 * sqrt(share * (1 - share) / 400));
    assert_int_equal(r->done, 400);
    assert_int_equal(r->quantities[0].sampled.count, 400 - r->failed);
    assert_int_equal(run.result->requirements[0].yield->hits, 400 - r->failed);
    assert_int_equal(run.result->requirements[0].judgement, JUDGED_NOT_MET);
    end_run(&run);
}

/*
 * A tolerance is even: of mid.v = 1 V RB/(RA + RB) with one resistor of 4 %, d mid.v = 1/4 V a
 * relative change, sigma = 0.04/sqrt(3)/4 V, and no sample leaves the exact ends.
 */
static void tolerance_is_even(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(4000, 0);
    run_spread(&run,
               "rail vcc 1 V\n"
               "resistor RA vcc -> mid 1k\n"
               "resistor RB mid -> gnd 1k tol=4%\n"
               "require mid.v within 5 mV of 0.5 V for 40%\n",
               &options);
    const struct spread_of_probe *row = spread_of(run.result, "mid.v");
    check_near(row->linear_sigma, 0.04 / sqrt(3) / 4, 1e-8);
    assert_string_equal(row->contributors[0].cause, "tolerance");
    assert_true(row->sampled.least >= 0.96 / 1.96 && row->sampled.most <= 1.04 / 2.04);
    assert_true(fabs(row->sampled.sigma - row->linear_sigma) < 4 * row->sampled.sigma_error);
    /* 5 mV is half of the way to the ends, to first order: half of the samples */
    assert_true(fabs(run.result->requirements[0].yield->share - 0.5) < 4 * sqrt(0.25 / 4000));
    end_run(&run);
    /* with match= the two add: variances 0.04^2/3 and 0.03^2 */
    run_spread(&run,
               "rail vcc 1 V\n"
               "resistor RA vcc -> mid 1k\n"
               "resistor RB mid -> gnd 1k tol=4% match=3%\n"
               "require mid.v within 5 mV of 0.5 V for 10%\n",
               &options);
    row = spread_of(run.result, "mid.v");
    check_near(row->linear_sigma, sqrt(0.04 * 0.04 / 3 + 0.03 * 0.03) / 4, 1e-8);
    assert_true(fabs(row->sampled.sigma - row->linear_sigma) < 4 * row->sampled.sigma_error);
    end_run(&run);
}

static void no_coefficients(void **state)
{
    (void)state;
    struct run run;
    const struct analysis_options options = options_of(100, 0);
    run_spread(&run, "rail vcc 1 V\nresistor R1 vcc -> gnd 1k\nrequire R1.i below 2 mA for 99%\n",
               &options);
    assert_int_equal(run.result->mismatch->deviate_count, 0);
    assert_int_equal(run.result->mismatch->wanted, 0);
    end_run(&run);
}

/* --- stopping --------------------------------------------------------------------------------- */

struct patience {
    int asked, limit;
    bool in_samples;
};

static bool out_of_patience(void *self)
{
    struct patience *patience = self;
    patience->asked += patience->in_samples;
    return patience->asked > patience->limit;
}

static void watch(void *self, const char *what, double share)
{
    struct patience *patience = self;
    (void)share;
    patience->in_samples |= strcmp(what, "mismatch samples") == 0;
}

/* What was sampled until then stays, with its figures. */
static void stops_with_what_there_is(void **state)
{
    (void)state;
    struct solved_cell cell;
    struct result *result = NULL;
    struct patience patience = {.limit = 500};
    struct analysis_options options = options_of(100000, 1);
    options.stopped = out_of_patience;
    options.stopped_self = &patience;
    options.progress = watch;
    options.progress_self = &patience;
    cell_open(&cell, pelgrom);
    assert_int_equal(analysis_spread(cell.circuit, &options, &result), STATUS_STOPPED);
    const struct mismatch_result *r = result->mismatch;
    assert_true(r->done > 0 && r->done < 100000);
    assert_int_equal(r->quantities[0].sampled.count, r->done);
    assert_int_equal(r->yields[0].count, r->done);
    result_free(result);
    cell_close(&cell);
}

struct share_limit {
    double limit;
    bool reached;
};

static bool is_reached(void *self)
{
    return ((struct share_limit *)self)->reached;
}

static void watch_conditions(void *self, const char *what, double share)
{
    struct share_limit *it = self;
    it->reached |= strcmp(what, "conditions") == 0 && share >= it->limit;
}

/* Of 44 conditions (three supplies, 41 between) about a quarter: a failure among them stands, what
 * was met so far is no verdict, ranges are over those alone: I = V/R at 0.5, 1 and 2 V. */
static void stops_among_conditions(void **state)
{
    (void)state;
    struct solved_cell cell;
    struct result *result = NULL;
    struct share_limit limit = {.limit = 0.25};
    struct analysis_options options = options_of(100, 1);
    options.stopped = is_reached;
    options.stopped_self = &limit;
    options.progress = watch_conditions;
    options.progress_self = &limit;
    cell_open(&cell, "rail vcc 1 V\nresistor R1 vcc -> gnd 1k\nvary vcc from 2 V to 0.5 V\n"
                     "require R1.i below 10 mA everywhere\nrequire R1.i below 1.5 mA everywhere\n");
    assert_int_equal(analysis_spread(cell.circuit, &options, &result), STATUS_STOPPED);
    assert_true(result->is_stopped);
    const struct conditions_result *r = result->conditions;
    assert_non_null(r);
    assert_int_equal(r->point_count, 44);
    assert_true(r->done_count >= 3 && r->done_count < 44);
    assert_int_equal(r->unsolved_count, 0);
    check_near(r->ranges[0].most, 2e-3, 1e-12);
    check_near(r->ranges[0].least, 0.5e-3, 1e-12);
    assert_int_equal(result->requirements[0].judgement, JUDGED_NOT);
    assert_non_null(
        strstr(result->requirements[0].remark, "of 44 conditions done before the stop"));
    assert_int_equal(result->requirements[1].judgement, JUDGED_NOT_MET);
    check_near(result->requirements[1].computed, 2e-3, 1e-12);
    result_free(result);
    cell_close(&cell);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(worst_places),
        cmocka_unit_test(box_drift),
        cmocka_unit_test(judged_in_review),
        cmocka_unit_test(proportional_to_temperature),
        cmocka_unit_test(corners),
        cmocka_unit_test(unsolved_place),
        cmocka_unit_test(too_many),
        cmocka_unit_test(published_mirror),
        cmocka_unit_test(threads_do_not_matter),
        cmocka_unit_test(samples_stand_alone),
        cmocka_unit_test(lognormal_is_not_linear),
        cmocka_unit_test(failures_count),
        cmocka_unit_test(tolerance_is_even),
        cmocka_unit_test(no_coefficients),
        cmocka_unit_test(stops_with_what_there_is),
        cmocka_unit_test(stops_among_conditions),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
