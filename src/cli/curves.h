/* curves.h: the verb that takes measured curves. */
#ifndef CLI_CURVES_H
#define CLI_CURVES_H

#include <signal.h>

#include "cli/options.h"

/* One run from the options to the results; the exit status. */
int curves_run(const struct options *options, const volatile sig_atomic_t *stop);

#endif
