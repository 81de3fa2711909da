/* cell.h: a cell: its request from the options, and its results to where they are wanted. */
#ifndef CLI_CELL_H
#define CLI_CELL_H

#include <signal.h>
#include <stdbool.h>

#include "cli/options.h"
#include "library/ampstead.h"

/* False after a message: the options contradict each other, or a number is none. */
bool cell_check(const struct options *options);

/* Runs the library with what the options say, which cell_check has passed; the status. The result
 * is the caller's. */
int cell_request(const struct options *options, const volatile sig_atomic_t *stop,
                 struct ampstead_result **result);

/* Whether a run with this status has something to deliver. */
bool cell_has_results(int status);

/* Writes what was asked for; the exit status. With a live version (not 0) the page reloads itself,
 * and the text is left to the watch. */
int cell_deliver(const struct options *options, struct ampstead_result *result, int live_version);

/* One run from the options to the results; the exit status. */
int cell_run(const struct options *options, const volatile sig_atomic_t *stop);

#endif
