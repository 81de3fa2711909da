/* tables.c: every verb and every option, once. */
#include <stddef.h>

#include "cli/options.h"
#include "library/ampstead.h"

enum {
    RESULT_VERBS = 1 << VERB_REVIEW | 1 << VERB_POINT | 1 << VERB_SWEEP | 1 << VERB_STATES,
    CELL_VERBS = RESULT_VERBS | 1 << VERB_MODELS,
    ALL_VERBS = CELL_VERBS | 1 << VERB_CHECK | 1 << VERB_FORMAT | 1 << VERB_HELP
};

const struct verb_row verb_rows[VERB_COUNT] = {
    [VERB_REVIEW] =
        {"review", "FILE.cell", "does the hand design hold? one page (also without a verb)",
         "Finds the operating point, moves the load of every output over its range, compares\n"
         "the `hand` lines with what was computed, and judges the `require` lines. --csv\n"
         "writes the curves: columns output,v,current in V and A."},
    [VERB_POINT] =
        {"point", "FILE.cell", "the operating point alone, with every quantity of every device",
         "Finds the operating point and shows all node voltages, rail currents and device\n"
         "quantities."},
    [VERB_SWEEP] =
        {"sweep", "FILE.cell", "the `sweep` lines of the cell, or one given by --sweep",
         "Moves a rail, let, source, resistor, output or the temperature, and shows what\n"
         "follows. --csv writes one row a point: number of the sweep, the swept thing, the\n"
         "family, and each quantity, with SI units in the header."},
    [VERB_STATES] =
        {"states", "FILE.cell", "every resting state with proof, and whether the cell starts",
         "Finds all DC states and proves that none was missed; says which cannot be held, where\n"
         "slowly rising rails lead, how strongly the loop is pushed out of its off state, and the\n"
         "lowest supply. The proof may take seconds; Ctrl-C shows what was found until then."},
    [VERB_MODELS] = {"models", "FILE", "every model value in force, given or default",
                     "FILE is a cell, or a process file by itself."},
    [VERB_CHECK] =
        {"check", "FILE", "errors only, one a line, as editors read them",
         "Reads and checks a cell or a process file and solves nothing. Each error is a\n"
         "line FILE:LINE:COLUMN: error: TEXT on standard output; the status is 2 then."},
    [VERB_FORMAT] = {"format", "FILE", "aligns a cell or process file; only blanks change",
                     "Rewrites FILE in the house layout, or with - standard input to standard\n"
                     "output. Comments and every number stay as written; a file with errors is\n"
                     "left alone. Formatting twice is the same as once."},
    [VERB_HELP] = {"help", "[VERB]", "this overview, or what one verb does and takes",
                   "ampstead VERB --help shows the same."},
};

static const char *const view_words[] = {"full", "hand", NULL};
static const char *const color_words[] = {"auto", "always", "never", NULL};

const struct option_row option_rows[OPTION_COUNT] = {
    [OPTION_SET] = {"set", 's', ARGUMENT_NEEDED, "NAME=EXPR", NULL, "the value in the cell",
                    "overrides a `let`; may be given often", CELL_VERBS | 1 << VERB_CHECK},
    [OPTION_TEMPERATURE] = {"temperature", 't', ARGUMENT_NEEDED, "T", NULL, "the cell's, else 27 C",
                            "such as \"60 C\" or \"333 K\"", CELL_VERBS},
    [OPTION_CORNER] = {"corner", 0, ARGUMENT_NEEDED, "NAME", NULL, "typical",
                       "a corner of the process", CELL_VERBS | 1 << VERB_CHECK},
    [OPTION_VIEW] = {"view", 0, ARGUMENT_NEEDED, "full|hand", view_words, "full",
                     "hand: the assumptions of a paper design (square law, no Early effect)",
                     RESULT_VERBS},
    [OPTION_SWEEP] = {"sweep", 0, ARGUMENT_NEEDED, "TEXT", NULL, "the cell's sweeps",
                      "\"THING from A to B points N show Q, Q\", as in a cell", 1 << VERB_SWEEP},
    [OPTION_CERTIFY] = {"certify", 0, ARGUMENT_NONE, NULL, NULL, "off",
                        "proves that the point is the only one in a box a few pV wide",
                        1 << VERB_POINT},
    [OPTION_BOXES] = {"boxes", 0, ARGUMENT_NEEDED, "N", NULL, "100000",
                      "boxes that the proof may look at before it gives up", 1 << VERB_STATES},
    [OPTION_LEAKAGE] = {"leakage", 0, ARGUMENT_NEEDED, "I", NULL, "1 nA",
                        "a start-up push below this current is at risk", 1 << VERB_STATES},
    [OPTION_JSON] = {"json", 0, ARGUMENT_OPTIONAL, "FILE", NULL, "off",
                     "writes JSON (SI units) to FILE, or without FILE to standard output instead "
                     "of the text; the next word is FILE only if it ends with .json, else "
                     "write --json=FILE",
                     CELL_VERBS},
    [OPTION_CSV] = {"csv", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                    "writes CSV (SI units) to FILE; - is standard output instead of the text",
                    1 << VERB_REVIEW | 1 << VERB_SWEEP},
    [OPTION_PLOT] = {"plot", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                     "draws the curves to FILE; its ending says how: .svg, .pdf or .png",
                     1 << VERB_REVIEW | 1 << VERB_SWEEP},
    [OPTION_PAGE] = {"page", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                     "writes the whole review as one HTML file that needs nothing else",
                     1 << VERB_REVIEW},
    [OPTION_WATCH] =
        {"watch", 0, ARGUMENT_NONE, NULL, NULL, "off",
         "runs again at every save, until Ctrl-C; errors are shown above the last good "
         "page, and an open --page reloads itself",
         RESULT_VERBS},
    [OPTION_COLOR] = {"color", 0, ARGUMENT_NEEDED, "auto|always|never", color_words, "auto",
                      "auto: on a terminal, unless NO_COLOR is set", ALL_VERBS},
    [OPTION_HELP] = {"help", 'h', ARGUMENT_NONE, NULL, NULL, "off", "what a verb does and takes",
                     ALL_VERBS},
    [OPTION_VERSION] = {"version", 0, ARGUMENT_NONE, NULL, NULL, "off", "the version", ALL_VERBS},
};

const struct status_row status_rows[] = {
    {AMPSTEAD_WELL, "all well"},
    {AMPSTEAD_NOT_MET, "a requirement is not met"},
    {AMPSTEAD_INPUT, "the input is wrong: language, options, files"},
    {AMPSTEAD_UNSOLVED, "no operating point was found"},
    {AMPSTEAD_MACHINE, "the machine failed: memory, disk"},
    {AMPSTEAD_STOPPED, "stopped by the user"},
    {0, NULL},
};
