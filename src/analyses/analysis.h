/*
 * analysis.h: the commands as functions from a circuit to a result.
 */
#ifndef ANALYSES_ANALYSIS_H
#define ANALYSES_ANALYSIS_H

#include "analyses/result.h"
#include "base/status.h"

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
void result_free(struct result *result);

#endif
