/* commands.c: which verb does what. */
#include "cli/commands.h"

#include <stdio.h>
#include <string.h>

#include "cli/cell.h"
#include "cli/curves.h"
#include "cli/output.h"
#include "cli/vigil.h"
#include "library/ampstead.h"

static void show_help(const struct options *options)
{
    if (options->verb != VERB_HELP) {
        help_verb(stdout, options->verb);
    } else if (options->file == NULL) {
        help_general(stdout);
    } else {
        for (int k = 0; k < VERB_COUNT; k++) {
            if (strcmp(verb_rows[k].word, options->file) == 0) {
                help_verb(stdout, (enum verb)k);
            }
        }
    }
}

int command_run(const struct options *options, const volatile sig_atomic_t *stop)
{
    int status = AMPSTEAD_WELL;
    if (options->given[OPTION_VERSION]) {
        printf("ampstead %s\n%s\n", ampstead_version(), ampstead_build());
    } else if (options->given[OPTION_HELP] || options->verb == VERB_HELP) {
        show_help(options);
    } else if (verb_takes_curves(options->verb)) {
        status = curves_run(options, stop);
    } else {
        status = options->given[OPTION_WATCH] ? vigil_run(options, stop) : cell_run(options, stop);
    }
    return output_close() ? status : AMPSTEAD_MACHINE;
}
