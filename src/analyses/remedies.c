/*
 * remedies.c: the commands explain, size and sensitivity, and what they lend to review.
 */
#include "analyses/remedies.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#include "analyses/explain.h"
#include "analyses/quantity.h"
#include "analyses/repair.h"
#include "analyses/sensitivity.h"
#include "analyses/size.h"

/* A solved cell, at the state of a result where there is one. */
struct bench {
    struct system *system;
    struct operating_point point;
};

static enum status bench_open(struct bench *bench, struct circuit *circuit,
                              const struct analysis_options *options, const struct result *result)
{
    const unsigned effects = options->view == VIEW_HAND ? EFFECTS_HAND : EFFECTS_FULL;
    *bench = (struct bench){.system = system_create(circuit, circuit->kelvin, effects)};
    if (bench->system == NULL || !operating_point_create(&bench->point, bench->system,
                                                         options->stopped, options->stopped_self)) {
        return STATUS_MEMORY;
    }
    assert(result != NULL); /* what is solved has a result */
    if (result->point.x != NULL) {
        memcpy(bench->point.x, result->point.x, (size_t)bench->system->n * sizeof *bench->point.x);
        const enum newton_status status = operating_point_newton(&bench->point);
        if (status == NEWTON_CONVERGED) {
            return operating_point_polish(&bench->point);
        }
        if (status == NEWTON_MEMORY || status == NEWTON_STOPPED) {
            return status == NEWTON_MEMORY ? STATUS_MEMORY : STATUS_STOPPED;
        }
    }
    return operating_point_find(&bench->point);
}

static void bench_close(struct bench *bench)
{
    system_free(bench->system);
}

/* An operating point as the beginning of a command of its own. */
static enum status begin(struct circuit *circuit, const struct analysis_options *options,
                         const char *command, struct bench *bench, struct result **result)
{
    *bench = (struct bench){0};
    enum status status = analysis_point(circuit, options, result);
    if (*result != NULL) {
        (*result)->command = command;
    }
    return status == STATUS_OK ? bench_open(bench, circuit, options, *result) : status;
}

static enum status end(enum status status, struct bench *bench, struct result **result)
{
    const bool texts_failed = bench->system != NULL && arena_failed(bench->system->arena);
    bench_close(bench);
    if (*result != NULL && (status == STATUS_MEMORY || status == STATUS_INPUT || texts_failed ||
                            arena_failed((*result)->arena))) {
        status = status == STATUS_INPUT ? STATUS_INPUT : STATUS_MEMORY;
        result_free(*result);
        *result = NULL;
    }
    if (*result != NULL) {
        (*result)->is_stopped = status == STATUS_STOPPED;
    }
    return status;
}

/* --- the commands ----------------------------------------------------------------------------- */

enum status analysis_explain(struct circuit *circuit, const struct analysis_options *options,
                             struct result **result)
{
    struct bench bench;
    struct analysis_options full = *options;
    full.view = VIEW_FULL;
    enum status status = begin(circuit, &full, "explain", &bench, result);
    if (status == STATUS_OK && circuit->hand_count == 0) {
        diagnostics_add(&circuit->cell->diagnostics, SPAN_NONE,
                        "such as hand tail.current = 800 nA",
                        "the cell has no `hand` line to explain");
        status = STATUS_INPUT;
    }
    if (status == STATUS_OK) {
        status = explain_hands(&bench.point, options, *result);
    }
    return end(status, &bench, result);
}

enum status analysis_size(struct circuit *circuit, const struct analysis_options *options,
                          struct result **result)
{
    struct bench bench;
    enum status status = begin(circuit, options, "size", &bench, result);
    if (status == STATUS_OK) {
        status = size_find(&bench.point, options, options->grid, *result);
    }
    if (status == STATUS_OK) {
        (*result)->verdict = (*result)->size->solved ? VERDICT_MET : VERDICT_NOT_MET;
    }
    return end(status, &bench, result);
}

/* Without a wish: the current of every output, else every quantity that the cell asks about. */
static int wanted_probes(const struct circuit *c, const struct analysis_options *options,
                         struct probe *probes)
{
    int count = 0;
    if (options->wanted != NULL) {
        probes[count++] = *options->wanted;
        return count;
    }
    for (int k = 0; k < c->output_count; k++) {
        const char *text = arena_format(c->arena, "%s.current", c->outputs[k].name);
        probes[count++] = (struct probe){PROBE_OUTPUT, k, OUTPUT_CURRENT, DIMENSION_CURRENT, text};
    }
    for (int k = 0; k < c->hand_count && c->output_count == 0; k++) {
        probes[count++] = c->hands[k].probe;
    }
    for (int k = 0; k < c->requirement_count && c->output_count + c->hand_count == 0; k++) {
        probes[count++] = c->requirements[k].probe;
    }
    return count;
}

static enum status find_sensitivities(struct bench *bench, const struct analysis_options *options,
                                      struct result *result)
{
    const struct circuit *c = bench->system->circuit;
    const int most = 1 + c->output_count + c->hand_count + c->requirement_count;
    struct probe *probes = arena_new_array(result->arena, struct probe, most);
    result->sensitivities = arena_new_array(result->arena, struct sensitivity_table, most);
    if (probes == NULL || result->sensitivities == NULL) {
        return STATUS_MEMORY;
    }
    const int count = wanted_probes(c, options, probes);
    if (count == 0) {
        diagnostics_add(&c->cell->diagnostics, SPAN_NONE, "such as --of ref.v",
                        "the cell has no output, hand or require line: name a quantity");
        return STATUS_INPUT;
    }
    enum status status = STATUS_OK;
    for (int k = 0; k < count && status == STATUS_OK; k++) {
        if (probes[k].text == NULL) {
            return STATUS_MEMORY;
        }
        if (options->progress != NULL) {
            options->progress(options->progress_self, probes[k].text, (double)k / count);
        }
        status =
            sensitivity_find(&bench->point, &probes[k], result->arena, &result->sensitivities[k]);
        result->sensitivity_count += status == STATUS_OK;
    }
    return status;
}

enum status analysis_sensitivity(struct circuit *circuit, const struct analysis_options *options,
                                 struct result **result)
{
    struct bench bench;
    enum status status = begin(circuit, options, "sensitivity", &bench, result);
    if (status == STATUS_OK) {
        status = find_sensitivities(&bench, options, *result);
    }
    return end(status, &bench, result);
}

/* --- for review ------------------------------------------------------------------------------- */

static bool is_failed(const struct result *result)
{
    for (int k = 0; k < result->requirement_count; k++) {
        if (result->requirements[k].judgement == JUDGED_NOT_MET ||
            result->requirements[k].judgement == JUDGED_UNKNOWN) {
            return true;
        }
    }
    return false;
}

/* What the square law alone gives, as the quantity itself. */
static void fill_hand_view(struct result *result)
{
    for (int k = 0; k < result->hand_count && k < result->explanation_count; k++) {
        const struct explanation *e = &result->explanations[k];
        result->hands[k].in_hand_view = e->as_conductance ? 1 / e->hand_view : e->hand_view;
    }
}

enum status remedies_add(struct circuit *circuit, const struct analysis_options *options,
                         struct result *result)
{
    const bool explains = result->hand_count > 0 && options->view == VIEW_FULL;
    if (!explains && !is_failed(result)) {
        return STATUS_OK;
    }
    struct bench bench;
    enum status status = bench_open(&bench, circuit, options, result);
    if (status == STATUS_OK && explains) {
        status = explain_hands(&bench.point, options, result);
        fill_hand_view(result);
    }
    if (status == STATUS_OK && is_failed(result)) {
        status = repair_find(circuit, &bench.point, options, result);
    }
    bench_close(&bench);
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}
