/* tables.c: every verb and every option, once. */
#include <stddef.h>

#include "cli/options.h"
#include "library/ampstead.h"

enum {
    RESULT_VERBS = 1 << VERB_REVIEW | 1 << VERB_POINT | 1 << VERB_SWEEP | 1 << VERB_SIZE |
                   1 << VERB_SENSITIVITY | 1 << VERB_SPREAD | 1 << VERB_STATES,
    CELL_VERBS = RESULT_VERBS | 1 << VERB_EXPLAIN | 1 << VERB_MODELS,
    CALIBRATE = 1 << VERB_CALIBRATE,
    ALL_VERBS = CELL_VERBS | CALIBRATE | 1 << VERB_MERGE | 1 << VERB_CHECK | 1 << VERB_FORMAT |
                1 << VERB_HELP
};

/* Also an option of `review`, for its --page. */
#define IN_PAGE(verb) (1 << (verb) | 1 << VERB_REVIEW)

const struct verb_row verb_rows[VERB_COUNT] = {
    [VERB_REVIEW] =
        {"review", "FILE.cell", "does the hand design hold? one page (also without a verb)",
         "Finds the operating point, moves the load of every output over its range, compares\n"
         "the `hand` lines with what was computed, and judges the `require` lines. --csv\n"
         "writes the curves: output, voltage and current, with SI units in the header."},
    [VERB_POINT] =
        {"point", "FILE.cell", "the operating point alone, with every quantity of every device",
         "Finds the operating point and shows all node voltages, rail currents and device\n"
         "quantities."},
    [VERB_SWEEP] =
        {"sweep", "FILE.cell", "the `sweep` lines of the cell, or one given by --sweep",
         "Moves a rail, let, source, resistor, output or the temperature, and shows what\n"
         "follows. Without a `sweep` line, the load voltage of every output. --csv writes one\n"
         "row a point: number of the sweep, the swept thing, the family, and each quantity,\n"
         "with SI units in the header."},
    [VERB_EXPLAIN] =
        {"explain", "FILE.cell", "why each `hand` line differs: shares of the effects",
         "Solves the cell under every subset of the effects that lie between the square law and\n"
         "the full model, and attributes the difference of each `hand` line to them (Shapley\n"
         "value). The shares add up to the difference."},
    [VERB_SIZE] =
        {"size", "FILE.cell", "the values that the `choose` lines ask for, exact and preferred",
         "Solves all `choose` lines together inside their ranges, then shows the nearest E24 and\n"
         "E96 values (IEC 60063), lengths on the grid, and what those give. Exit status 1 when\n"
         "there is no solution in the ranges; the nearest is shown then."},
    [VERB_SENSITIVITY] =
        {"sensitivity", "FILE.cell", "how a quantity follows every parameter, ranked",
         "Exact derivatives in every value of the cell, its rails, models, lets and the\n"
         "temperature, by an adjoint solve; relative and absolute."},
    [VERB_SPREAD] =
        {"spread", "FILE.cell", "the `vary` conditions, corners, mismatch and yield",
         "Solves all combinations of the `vary` ends, every corner and a fine sweep of each\n"
         "thing, and names the worst place of every quantity; then mismatch, to first order\n"
         "with its causes, and sampled with the yield of each `require` line. Judges\n"
         "`everywhere` and `for P%`. --csv writes one row a sample: number, state, and each\n"
         "quantity, with SI units in the header."},
    [VERB_MERGE] =
        {"merge", "PART...", "joins the parts of a sampled run, as if it had been one",
         "Takes all files that `spread --part K/N --write FILE` wrote of one run, reads the cell\n"
         "they name again, and shows what `spread` without --part would have shown, to the last\n"
         "digit. A part that is missing, there twice, or of another run, cell or version is\n"
         "refused."},
    [VERB_STATES] =
        {"states", "FILE.cell", "every resting state with proof, and whether the cell starts",
         "Finds all DC states and proves that none was missed; says which cannot be held, where\n"
         "slowly rising rails lead, how strongly the loop is pushed out of its off state, and the\n"
         "lowest supply. The proof may take seconds; Ctrl-C shows what was found until then."},
    [VERB_CALIBRATE] =
        {"calibrate", "FILE.csv...", "fits a model to measured curves, writes a process file",
         "Fits MOS transistors (columns vgs,vds,vsb,id), diodes and resistors (v,i) or bipolar\n"
         "transistors (vbe,vce,ic,ib), in V and A, positive for both polarities. The size of a\n"
         "transistor is given by --size, by W=7u L=8u behind its file, or in a list. One file\n"
         "gives one card; several give a card each and a scalable set. No start values are\n"
         "asked for. See docs/calibrate.md."},
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
static const char *const lanes_words[] = {"8", "4", "1", NULL};
static const char *const round_words[] = {"exact", "E24", "E96", "grid", NULL};
static const char *const kind_words[] = {"nmos", "pmos", "diode", "resistor", "npn", "pnp", NULL};
static const char *const form_words[] = {"cards", "set", "both", NULL};
static const char *const color_words[] = {"auto", "always", "never", NULL};

const struct option_row option_rows[OPTION_COUNT] = {
    [OPTION_SET] = {"set", 's', ARGUMENT_NEEDED, "NAME=EXPR", NULL, "the value in the cell",
                    "overrides a `let`; may be given often", CELL_VERBS | 1 << VERB_CHECK},
    [OPTION_TEMPERATURE] = {"temperature", 't', ARGUMENT_NEEDED, "T", NULL, "the cell's, else 27 C",
                            "such as \"60 C\" or \"333 K\"; calibrate: of the curves, else 25 C",
                            CELL_VERBS | CALIBRATE},
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
                      "boxes that the proof may look at before it gives up", IN_PAGE(VERB_STATES)},
    [OPTION_LEAKAGE] = {"leakage", 0, ARGUMENT_NEEDED, "I", NULL, "1 nA",
                        "a start-up push below this current is at risk", 1 << VERB_STATES},
    [OPTION_SAMPLES] = {"samples", 'n', ARGUMENT_NEEDED, "N", NULL, "2000",
                        "mismatch samples, each a full solve; 0 leaves them out",
                        IN_PAGE(VERB_SPREAD)},
    [OPTION_SEED] = {"seed", 0, ARGUMENT_NEEDED, "N", NULL, "1",
                     "the same seed gives the same samples, however many jobs",
                     IN_PAGE(VERB_SPREAD)},
    [OPTION_JOBS] = {"jobs", 'j', ARGUMENT_NEEDED, "N", NULL, "one a processor",
                     "threads for conditions, samples and sweeps",
                     1 << VERB_SPREAD | 1 << VERB_MERGE | 1 << VERB_REVIEW | 1 << VERB_SWEEP},
    [OPTION_TIME_LIMIT] = {"time-limit", 0, ARGUMENT_NEEDED, "SECONDS", NULL, "3600",
                           "the work stops there and shows what was done; 0: no limit",
                           RESULT_VERBS | 1 << VERB_MERGE | 1 << VERB_EXPLAIN},
    [OPTION_LANES] = {"lanes", 0, ARGUMENT_NEEDED, "8|4|1", lanes_words,
                      "as many as the processor can",
                      "most samples solved side by side; results differ by rounding only",
                      1 << VERB_SPREAD},
    [OPTION_PART] = {"part", 0, ARGUMENT_NEEDED, "K/N", NULL, "all samples",
                     "part K of N of the samples and nothing else, for `merge`", 1 << VERB_SPREAD},
    [OPTION_OF] = {"of", 0, ARGUMENT_NEEDED, "QUANTITY", NULL, "the current of every output",
                   "such as tail.resistance or M1.vgs", 1 << VERB_SENSITIVITY},
    [OPTION_GRID] = {"grid", 0, ARGUMENT_NEEDED, "LENGTH", NULL, "10 nm",
                     "lengths and widths are rounded to whole multiples of it", 1 << VERB_SIZE},
    [OPTION_WRITE] =
        {"write", 'w', ARGUMENT_NEEDED, "FILE", NULL, "off",
         "size: a copy of the cell with the chosen values in place (- is standard output "
         "instead of the text); calibrate: the process file, an existing one only with "
         "--force; spread: the part",
         1 << VERB_SIZE | 1 << VERB_SPREAD | CALIBRATE},
    [OPTION_ROUND] = {"round", 0, ARGUMENT_NEEDED, "exact|E24|E96|grid", round_words, "exact",
                      "which values --write puts in place", 1 << VERB_SIZE},
    [OPTION_KIND] = {"kind", 'k', ARGUMENT_NEEDED, "nmos|pmos|diode|resistor|npn|pnp", kind_words,
                     "as the list says", "what was measured", CALIBRATE},
    [OPTION_LENGTHS] = {"size", 0, ARGUMENT_NEEDED, "W/L", NULL, "of each file",
                        "such as 7u/8u, for files without their own", CALIBRATE},
    [OPTION_MODEL] = {"model", 0, ARGUMENT_NEEDED, "NAME", NULL, "the kind",
                      "name of the model in the process file", CALIBRATE},
    [OPTION_LIST] = {"list", 0, ARGUMENT_NEEDED, "INDEX.csv", NULL, "off",
                     "files with their kinds and sizes: columns file,kind,w_um,l_um,m,temperature",
                     CALIBRATE},
    [OPTION_HOLD] = {"hold", 0, ARGUMENT_MANY, "FILE.csv...", NULL, "none",
                     "files that are predicted and not fitted, up to the next option", CALIBRATE},
    [OPTION_COLUMNS] = {"columns", 0, ARGUMENT_NEEDED, "\"id=-ID uA, ...\"", NULL,
                        "the names above", "names, signs and units of the columns in the files",
                        CALIBRATE},
    [OPTION_NOISE] = {"noise", 0, ARGUMENT_NEEDED, "CURRENT", NULL,
                      "2 nA; diodes and bipolar transistors 1 pA", "noise floor of the readings",
                      CALIBRATE},
    [OPTION_ACCURACY] = {"accuracy", 0, ARGUMENT_NEEDED, "SHARE", NULL, "1%",
                         "relative error of a reading", CALIBRATE},
    [OPTION_FORM] = {"form", 0, ARGUMENT_NEEDED, "cards|set|both", form_words,
                     "cards for one file, both for several",
                     "a card a device, one scalable set, or both", CALIBRATE},
    [OPTION_ROBUST] = {"robust", 0, ARGUMENT_NONE, NULL, NULL, "off",
                       "leaves out readings that contradict their neighbours, and names them",
                       CALIBRATE},
    [OPTION_FORCE] = {"force", 0, ARGUMENT_NONE, NULL, NULL, "off",
                      "replaces an existing file, and keeps the comment at its top", CALIBRATE},
    [OPTION_JSON] = {"json", 0, ARGUMENT_OPTIONAL, "FILE", NULL, "off",
                     "writes JSON (SI units) to FILE, or without FILE to standard output instead "
                     "of the text; the next word is FILE only if it ends with .json, else "
                     "write --json=FILE",
                     CELL_VERBS | 1 << VERB_MERGE | CALIBRATE},
    [OPTION_CSV] = {"csv", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                    "writes CSV (SI units) to FILE; - is standard output instead of the text",
                    1 << VERB_REVIEW | 1 << VERB_SWEEP | 1 << VERB_SPREAD | 1 << VERB_MERGE},
    [OPTION_PLOT] = {"plot", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                     "draws curves and bars to FILE; its ending says how: .svg, .pdf or .png",
                     1 << VERB_REVIEW | 1 << VERB_SWEEP | 1 << VERB_STATES | 1 << VERB_SPREAD |
                         1 << VERB_EXPLAIN | 1 << VERB_SENSITIVITY | CALIBRATE},
    [OPTION_PAGE] = {"page", 0, ARGUMENT_NEEDED, "FILE", NULL, "off",
                     "writes the result as one HTML file that needs nothing else; of a review also "
                     "what spread and states find, unless --watch is given",
                     1 << VERB_REVIEW | 1 << VERB_SPREAD | 1 << VERB_STATES | 1 << VERB_EXPLAIN},
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
    {AMPSTEAD_STOPPED, "stopped by the user or by the time limit"},
    {0, NULL},
};
