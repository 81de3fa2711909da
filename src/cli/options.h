/*
 * options.h: the command line. The two tables here are all there is to know about verbs and
 * options: parsing, messages and help read them.
 */
#ifndef CLI_OPTIONS_H
#define CLI_OPTIONS_H

#include <stdbool.h>
#include <stdio.h>

enum verb {
    VERB_REVIEW,
    VERB_POINT,
    VERB_SWEEP,
    VERB_EXPLAIN,
    VERB_SIZE,
    VERB_SENSITIVITY,
    VERB_SPREAD,
    VERB_MERGE,
    VERB_STATES,
    VERB_CALIBRATE,
    VERB_MODELS,
    VERB_CHECK,
    VERB_FORMAT,
    VERB_HELP,
    VERB_COUNT
};

struct verb_row {
    const char *word;
    const char *argument; /* "FILE.cell" */
    const char *summary;  /* one line */
    const char *text;     /* a few lines for `help VERB` */
};
extern const struct verb_row verb_rows[VERB_COUNT];

/* Takes any number of files of curves, or --list, instead of one cell. */
static inline bool verb_takes_curves(enum verb verb)
{
    return verb == VERB_CALIBRATE;
}

/* Takes any number of files. */
static inline bool verb_takes_many(enum verb verb)
{
    return verb == VERB_MERGE || verb_takes_curves(verb);
}

enum option {
    OPTION_SET,
    OPTION_TEMPERATURE,
    OPTION_CORNER,
    OPTION_VIEW,
    OPTION_SWEEP,
    OPTION_CERTIFY,
    OPTION_BOXES,
    OPTION_LEAKAGE,
    OPTION_SAMPLES,
    OPTION_SEED,
    OPTION_JOBS,
    OPTION_TIME_LIMIT,
    OPTION_LANES,
    OPTION_PART,
    OPTION_OF,
    OPTION_GRID,
    OPTION_WRITE,
    OPTION_ROUND,
    OPTION_KIND,
    OPTION_LENGTHS,
    OPTION_MODEL,
    OPTION_LIST,
    OPTION_HOLD,
    OPTION_COLUMNS,
    OPTION_NOISE,
    OPTION_ACCURACY,
    OPTION_FORM,
    OPTION_ROBUST,
    OPTION_FORCE,
    OPTION_JSON,
    OPTION_CSV,
    OPTION_PLOT,
    OPTION_PAGE,
    OPTION_WATCH,
    OPTION_COLOR,
    OPTION_HELP,
    OPTION_VERSION,
    OPTION_COUNT
};

/* ARGUMENT_MANY: all words up to the next option; they go to `held`. */
enum argument { ARGUMENT_NONE, ARGUMENT_NEEDED, ARGUMENT_OPTIONAL, ARGUMENT_MANY };

struct option_row {
    const char *name; /* without the dashes */
    char letter;      /* 0: none */
    enum argument argument;
    const char *argument_name;  /* "FILE" */
    const char *const *choices; /* allowed words, NULL-terminated; NULL: any */
    const char *standard;       /* what holds when the option is left out, in words */
    const char *text;           /* meaning and unit */
    unsigned verbs;             /* sum of 1 << verb */
};
extern const struct option_row option_rows[OPTION_COUNT];

struct status_row {
    int status;
    const char *text;
};
extern const struct status_row status_rows[]; /* ends with a NULL text */

/* The command line as read. Texts are borrowed from argv. */
struct options {
    enum verb verb;
    const char *file; /* the cell; for `help` the verb asked about, or NULL */
    bool given[OPTION_COUNT];
    const char *values[OPTION_COUNT]; /* last given; NULL: none */
    const char **sets;                /* [set_count], all --set; freed by options_free */
    int set_count;
    char *command;      /* the words of argv, quoted where needed; freed by options_free */
    const char **words; /* [word_count] what is no option, the verb included; as sets */
    int word_count;
    const char **held; /* [held_count] words of --hold; as sets */
    int held_count;
};

/*
 * options_parse: reads argv. False after a usage error, which was written to `errors`, or when
 * memory was short (*out_of_memory).
 */
bool options_parse(int argc, char **argv, FILE *errors, struct options *options,
                   bool *out_of_memory);
void options_free(struct options *options);

/* Help about everything, or about one verb. */
void help_general(FILE *out);
void help_verb(FILE *out, enum verb verb);

#endif
