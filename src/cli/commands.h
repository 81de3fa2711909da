/* commands.h: what the verbs do. */
#ifndef CLI_COMMANDS_H
#define CLI_COMMANDS_H

#include <signal.h>

#include "cli/options.h"

/* Does what the options say. `stop` becomes not 0 when the user wants to stop. Returns the exit
 * status. */
int command_run(const struct options *options, const volatile sig_atomic_t *stop);

#endif
