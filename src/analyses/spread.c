/*
 * spread.c: the command: review, conditions, mismatch to first order and sampled, yield.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/analysis.h"
#include "analyses/conditions.h"
#include "analyses/judge.h"
#include "analyses/sampling.h"
#include "analyses/setup.h"

/* Two-sided 99 %: the normal quantile of 0.995. */
static const double confidence = 2.5758293035489;

/* --- mismatch to first order ------------------------------------------------------------------ */

static int by_share(const void *a, const void *b)
{
    const struct contributor *x = a, *y = b;
    return (x->share < y->share) - (x->share > y->share);
}

static enum status linear_part(struct setup *setup, const struct mismatch *m, struct arena *arena,
                               struct spread_of_probe *row)
{
    double *slopes = arena_new_array(arena, double, m->count);
    row->contributors = arena_new_array(arena, struct contributor, m->count);
    if (slopes == NULL || row->contributors == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = mismatch_slopes(&setup->point, m, row->probe, slopes);
    if (status != STATUS_OK) {
        return status == STATUS_UNSOLVED ? STATUS_OK : status;
    }
    double sum = 0;
    for (int k = 0; k < m->count; k++) {
        sum += slopes[k] * slopes[k];
    }
    row->linear_sigma = sqrt(sum);
    for (int k = 0; k < m->count && sum > 0; k++) {
        row->contributors[row->contributor_count++] =
            (struct contributor){&setup->circuit->instances[m->rows[k].instance],
                                 m->rows[k].deviate->cause, slopes[k] * slopes[k] / sum, slopes[k]};
    }
    if (row->contributor_count > 0) {
        qsort(row->contributors, (size_t)row->contributor_count, sizeof *row->contributors,
              by_share);
    }
    return STATUS_OK;
}

/* --- figures of the samples ------------------------------------------------------------------- */

static void count_states(struct mismatch_result *r)
{
    for (int k = 0; k < r->wanted; k++) {
        r->done += r->states[k] != SAMPLE_OPEN;
        r->failed += r->states[k] == SAMPLE_FAILED;
        r->searched += r->states[k] == SAMPLE_SEARCHED;
    }
}

static enum agreement compare(const struct spread_of_probe *row)
{
    const double linear = row->linear_sigma, sampled = row->sampled.sigma;
    if (!(isfinite(linear) && isfinite(sampled)) || row->sampled.count < 30) {
        return AGREEMENT_UNKNOWN;
    }
    /* a quantity that nothing moves has rounding alone */
    const double slack = confidence * row->sampled.sigma_error + 1e-9 * fabs(row->sampled.mean);
    return fabs(sampled - linear) <= slack ? AGREEMENT_HOLDS : AGREEMENT_FAILS;
}

static void sampled_part(const struct mismatch_result *r, int q, double *scratch,
                         struct spread_of_probe *row)
{
    int count = 0;
    for (int k = 0; k < r->wanted; k++) {
        const bool is_solved = r->states[k] == SAMPLE_SOLVED || r->states[k] == SAMPLE_SEARCHED;
        const double value = r->values[(size_t)k * (size_t)r->quantity_count + (size_t)q];
        if (is_solved && isfinite(value)) {
            scratch[count++] = value;
        } else {
            row->missing += is_solved;
        }
    }
    row->sampled = statistics_of(scratch, count);
    row->histogram = histogram_of(scratch, count, &row->sampled);
    row->agreement = compare(row);
}

static bool count_yields(struct mismatch_result *r, const struct circuit *c,
                         const unsigned char *met, struct arena *arena)
{
    struct yield_result *yields = arena_new_array(arena, struct yield_result, c->requirement_count);
    for (int q = 0; yields != NULL && q < c->requirement_count; q++) {
        struct yield_result *y = &yields[q];
        for (int k = 0; k < r->wanted; k++) {
            y->hits += met[(size_t)k * (size_t)c->requirement_count + (size_t)q];
        }
        y->count = r->done;
        y->share = r->done > 0 ? (double)y->hits / r->done : NAN;
        wilson_interval(y->hits, y->count, &y->low, &y->high);
    }
    r->yields = yields;
    return yields != NULL;
}

/* A `for` line holds when the share of samples that meet it does; its remark says how sure that is.
 */
static void judge_yields(struct result *result)
{
    const struct mismatch_result *r = result->mismatch;
    for (int k = 0; k < result->requirement_count; k++) {
        struct requirement_result *row = &result->requirements[k];
        const struct yield_result *y = &r->yields[k];
        row->yield = y;
        if (row->requirement->scope != SCOPE_YIELD || y->count == 0) {
            continue;
        }
        const double wanted = row->requirement->yield;
        row->judgement = y->share >= wanted ? JUDGED_MET : JUDGED_NOT_MET;
        row->remark = y->low < wanted && y->high > wanted
                          ? "so many samples cannot tell for sure: give more --samples"
                          : NULL;
    }
    judge_verdict(result);
}

/* Solves samples first to first + count - 1 into the result. */
static enum status solve_samples(struct circuit *circuit, const struct analysis_options *options,
                                 const struct mismatch *m, int first, int count,
                                 struct result *result)
{
    struct mismatch_result *r = result->mismatch;
    const size_t n = (size_t)count;
    struct sample_rows rows = {
        .values = arena_new_array(result->arena, double, n *(size_t)r->quantity_count),
        .met = arena_new_array(result->arena, unsigned char, n *(size_t)circuit->requirement_count),
        .states = arena_new_array(result->arena, unsigned char, n)};
    if (rows.values == NULL || rows.met == NULL || rows.states == NULL) {
        return STATUS_MEMORY;
    }
    const struct sampling_plan plan = {.circuit = circuit,
                                       .options = options,
                                       .mismatch = m,
                                       .home = result->point.x,
                                       .first = first,
                                       .count = count};
    const enum status status = sampling_run(&plan, &rows);
    r->wanted = count;
    r->values = rows.values;
    r->states = rows.states;
    r->met = rows.met;
    count_states(r);
    return status;
}

static enum status sample(struct circuit *circuit, const struct analysis_options *options,
                          const struct mismatch *m, struct result *result)
{
    struct mismatch_result *r = result->mismatch;
    double *scratch = arena_new_array(result->arena, double, options->samples);
    if (scratch == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    if (options->sampled != NULL) {
        r->wanted = options->samples;
        r->values = options->sampled->values;
        r->states = options->sampled->states;
        r->met = options->sampled->met;
        count_states(r);
    } else {
        status = solve_samples(circuit, options, m, 0, options->samples, result);
    }
    if (status != STATUS_OK && status != STATUS_STOPPED) {
        return status;
    }
    for (int q = 0; q < r->quantity_count; q++) {
        sampled_part(r, q, scratch, &r->quantities[q]);
    }
    if (!count_yields(r, circuit, r->met, result->arena)) {
        return STATUS_MEMORY;
    }
    judge_yields(result);
    return status;
}

static enum status mismatch_part(struct circuit *circuit, const struct analysis_options *options,
                                 struct result *result)
{
    struct setup setup;
    struct mismatch m = {0};
    struct mismatch_result *r = arena_new(result->arena, struct mismatch_result);
    enum status status = setup_open(&setup, circuit, NULL, 0, NULL, READING_ALL, options);
    if (r == NULL || (status == STATUS_OK && !mismatch_list(setup.system, result->arena, &m))) {
        status = STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        status = setup_solve(&setup, result->point.x, circuit->unknown_count, NULL);
    }
    if (status == STATUS_OK) {
        const struct conditions_result *conditions = result->conditions;
        r->deviate_count = m.count;
        r->seed = options->seed;
        r->quantity_count = conditions->probe_count;
        r->quantities = arena_new_array(result->arena, struct spread_of_probe, r->quantity_count);
        status = r->quantities == NULL ? STATUS_MEMORY : STATUS_OK;
    }
    for (int q = 0; status == STATUS_OK && q < r->quantity_count; q++) {
        const struct conditions_result *conditions = result->conditions;
        r->quantities[q] = (struct spread_of_probe){.probe = &conditions->probes[q],
                                                    .own = conditions->ranges[q].own,
                                                    .linear_sigma = NAN,
                                                    .sampled = statistics_of(NULL, 0)};
        status = linear_part(&setup, &m, result->arena, &r->quantities[q]);
    }
    setup_close(&setup);
    if (status == STATUS_OK) {
        result->mismatch = r;
        if (m.count > 0 && options->samples > 0) {
            status = sample(circuit, options, &m, result);
        }
    }
    return status;
}

/* The samples of the result of a point. */
static enum status samples_part(struct circuit *circuit, const struct analysis_options *options,
                                struct result *result)
{
    struct setup setup;
    struct mismatch m = {0};
    struct mismatch_result *r = arena_new(result->arena, struct mismatch_result);
    enum status status = setup_open(&setup, circuit, NULL, 0, NULL, READING_ALL, options);
    if (r == NULL || (status == STATUS_OK && !mismatch_list(setup.system, result->arena, &m))) {
        status = STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        r->deviate_count = m.count;
        r->seed = options->seed;
        r->quantity_count = setup.list.probe_count;
        result->mismatch = r;
        if (m.count > 0) {
            status = solve_samples(circuit, options, &m, options->first, options->count, result);
        }
    }
    setup_close(&setup);
    return status;
}

enum status analysis_samples(struct circuit *circuit, const struct analysis_options *options,
                             struct result **result)
{
    enum status status = analysis_point(circuit, options, result);
    if (*result != NULL && status == STATUS_OK) {
        (*result)->command = "spread";
        status = samples_part(circuit, options, *result);
    }
    if (*result != NULL && (status == STATUS_MEMORY || arena_failed((*result)->arena))) {
        result_free(*result);
        *result = NULL;
        return STATUS_MEMORY;
    }
    return status;
}

enum status analysis_spread(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result)
{
    struct analysis_options all = *options;
    all.all_conditions = true;
    enum status status = analysis_review(circuit, &all, result);
    if (*result == NULL) {
        return status;
    }
    struct result *r = *result;
    r->command = "spread";
    if (status == STATUS_OK && (!conditions_drift(r) || !conditions_sweeps(r))) {
        status = STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        status = conditions_supply(circuit, options, r);
    }
    if (status == STATUS_OK) {
        status = mismatch_part(circuit, options, r);
    }
    if (status == STATUS_MEMORY || arena_failed(r->arena)) {
        result_free(r);
        *result = NULL;
        return STATUS_MEMORY;
    }
    r->is_stopped = status == STATUS_STOPPED;
    return status;
}
