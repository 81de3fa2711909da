/* vigil.h: --watch. */
#ifndef CLI_VIGIL_H
#define CLI_VIGIL_H

#include <signal.h>

#include "cli/options.h"

/* Runs at once and at every save, until *stop is not 0; the exit status of the last run. */
int vigil_run(const struct options *options, const volatile sig_atomic_t *stop);

#endif
