/*
 * analysis.h: the commands as functions from a circuit to a result.
 */
#ifndef ANALYSES_ANALYSIS_H
#define ANALYSES_ANALYSIS_H

#include <stdint.h>

#include "analyses/result.h"
#include "base/status.h"

struct sample_rows;

struct analysis_options {
    enum view view;
    bool (*stopped)(
        void *self); /* asked often; true ends the work with STATUS_STOPPED. NULL: never */
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share); /* NULL: none */
    void *progress_self;
    struct sweep *extra_sweep; /* a sweep given by options, for analysis_sweep; NULL: the cell's */
    bool certify;              /* analysis_point: proves the point unique in a small box */
    long boxes;                /* analysis_states: boxes to look at, then it gives up */
    double leakage;            /* analysis_states: A, a start-up push below it is at risk */
    bool all_conditions; /* analysis_review: reads every quantity that the cell asks for over all
                            `vary` conditions, not only those of `everywhere` lines, and leaves
                            explanations and repairs out */
    int jobs;            /* threads; 0: one a processor */
    int samples;         /* analysis_spread: 0 leaves the sampled part out */
    int lanes;           /* most samples side by side; 0: as many as the processor takes, 1: one */
    uint64_t seed;
    int first, count;                  /* analysis_samples: which of them */
    const struct sample_rows *sampled; /* analysis_spread: [samples] solved elsewhere; NULL: none */
    const struct probe *wanted; /* for analysis_sensitivity; NULL: the currents of all outputs */
    double grid;                /* m, for analysis_size: lengths are whole multiples of it */
};

/*
 * Each makes one result, owned by the caller (result_free), which borrows the circuit.
 *
 * STATUS_UNSOLVED: no operating point; the result still tells the story (solver.trouble).
 * STATUS_STOPPED: the result holds what was done. STATUS_MEMORY: *result is NULL.
 */
enum status analysis_point(struct circuit *circuit, const struct analysis_options *options,
                           struct result **result);
enum status analysis_review(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result);
enum status analysis_sweep(struct circuit *circuit, const struct analysis_options *options,
                           struct result **result);
/* Every resting state with proof, and the start-up verdict: result->states. */
enum status analysis_states(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result);
/* Review, then conditions, mismatch and yield. */
enum status analysis_spread(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result);
/* The point, then the mismatch samples `first` to `first + count - 1` alone: result->mismatch, of
 * which the quantities stay empty. */
enum status analysis_samples(struct circuit *circuit, const struct analysis_options *options,
                             struct result **result);
/* Shares of the effects in what differs from the paper; docs/explain.md. */
enum status analysis_explain(struct circuit *circuit, const struct analysis_options *options,
                             struct result **result);
/* The `choose` lines solved; verdict "not met" when there is no solution in the ranges.
 * STATUS_INPUT and *result NULL after messages in the cell's diagnostics. */
enum status analysis_size(struct circuit *circuit, const struct analysis_options *options,
                          struct result **result);
/* Derivatives in every parameter; STATUS_INPUT as above. */
enum status analysis_sensitivity(struct circuit *circuit, const struct analysis_options *options,
                                 struct result **result);
void result_free(struct result *result);

#endif
