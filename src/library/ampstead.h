/*
 * ampstead.h: DC operating points of bias cells, as a library. The one public header; C and C++.
 *
 *     struct ampstead_request request = AMPSTEAD_REQUEST;
 *     struct ampstead_result *result = NULL;
 *     double current;
 *     request.path = "tail.cell";
 *     if (ampstead_run(&request, &result) <= AMPSTEAD_NOT_MET &&
 *         ampstead_result_value(result, "tail.current", &current)) {
 *         printf("%g A\n", current);
 *     } else {
 *         fputs(ampstead_result_messages(result, 0), stderr);
 *     }
 *     ampstead_result_free(result);
 *
 * Units are SI. Threads: the library keeps no state of its own, so that different results may be
 * made and used in different threads at the same time; one result belongs to one thread at a time.
 * Strings are UTF-8, end with NUL, and belong to the result that gave them. The library never
 * prints, never exits, and opens files only to read the cell, its process files and its tables.
 */
#ifndef AMPSTEAD_H
#define AMPSTEAD_H

#include <stddef.h>

#if defined(__GNUC__)
#define AMPSTEAD_API __attribute__((visibility("default")))
#else
#define AMPSTEAD_API
#endif

#ifdef __cplusplus
extern "C" {
#endif

/* How a run ended; the numbers are the exit statuses of the program. */
enum ampstead_status {
    AMPSTEAD_WELL = 0,     /* done; every requirement that was judged is met */
    AMPSTEAD_NOT_MET = 1,  /* done; a requirement is not met */
    AMPSTEAD_INPUT = 2,    /* the request, the cell or a file it names is wrong; see the messages */
    AMPSTEAD_UNSOLVED = 3, /* no operating point was found; the text says where the search ended */
    AMPSTEAD_MACHINE = 4,  /* memory was short */
    AMPSTEAD_STOPPED = 130 /* `stopped` said so; what was done until then can be read */
};

/* Whose assumptions are in force: design values of the paper, or the whole model. */
enum ampstead_view { AMPSTEAD_VIEW_FULL = 0, AMPSTEAD_VIEW_HAND = 1 };

/* What to do. Start from AMPSTEAD_REQUEST and fill in. Everything is read during ampstead_run only
 * and stays the caller's. */
struct ampstead_request {
    size_t size;             /* sizeof(struct ampstead_request): set by AMPSTEAD_REQUEST */
    const char *command;     /* "review", "point", "sweep", "explain", "size", "sensitivity",
                                "spread", "merge", "states", "models", "check" or "format"; NULL:
                                review */
    const char *path;        /* the cell file; "-": standard input. With text: its name. Required,
                                but for "merge", where the parts say it */
    const char *text;        /* the cell itself, instead of the file; NULL: read the file */
    size_t text_length;      /* bytes of text */
    enum ampstead_view view; /* which effects are in force */
    const char *temperature; /* "60 C", an expression; NULL: the cell's own */
    const char *corner;      /* a corner of the process; NULL: typical */
    const char *const *sets; /* [set_count] "NAME=expression": overrides a `let`; NULL: none */
    int set_count;
    const char *const *model_folders; /* [model_folder_count] searched for process files before the
                                         installed ones; at most 1 is used. NULL: none */
    int model_folder_count;
    const char *sweep; /* for command "sweep": "THING from A to B [points N] show Q, Q"; NULL: the
                          sweeps of the cell */
    const char *of; /* for command "sensitivity": "tail.resistance"; NULL: every output's current */
    const char *grid; /* for command "size": lengths are whole multiples of it; NULL: "10 nm" */
    int (*stopped)(void *self); /* asked often during long work; not 0 ends it. NULL: never */
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share); /* share: 0 to 1. NULL: none */
    void *progress_self;
    int certify;         /* for command "point": not 0 proves it unique in a small box */
    long boxes;          /* for command "states": boxes of the proof, then it gives up */
    const char *leakage; /* for command "states": "1 nA", a push below it is at risk; NULL: that */
    int samples;         /* for command "spread": mismatch samples, 0 to AMPSTEAD_SAMPLE_LIMIT */
    unsigned long long seed; /* the same seed gives the same samples, whatever `jobs` is */
    int jobs;  /* threads, for "spread", "sweep" and `everywhere`; 0: one a processor */
    int whole; /* for command "review": not 0 also finds what "spread" and "states" do,
                  for the page alone; takes as long as these */
    int lanes; /* for command "spread": most samples that are solved side by side, 8, 4 or 1; 0: as
                  many as the processor can. Results differ by rounding only */
    const char *part; /* for command "spread": "3/16": the third of 16 parts of the samples and
                         nothing else, for ampstead_result_part. NULL: all */
    const struct ampstead_part *parts; /* [part_count] for command "merge": texts of all parts */
    int part_count;
};

/* What ampstead_result_part gave, read from a file. */
struct ampstead_part {
    const char *name; /* of the file, for messages */
    const char *text; /* [length] */
    size_t length;
};

enum { AMPSTEAD_SAMPLES = 2000, AMPSTEAD_SAMPLE_LIMIT = 10000000 };

#define AMPSTEAD_REQUEST                                                                           \
    {                                                                                              \
        sizeof(struct ampstead_request), 0, 0, 0, 0, AMPSTEAD_VIEW_FULL, 0, 0, 0, 0, 0, 0, 0, 0,   \
            0, 0, 0, 0, 0, 0, 100000, 0, AMPSTEAD_SAMPLES, 1, 0, 0, 0, 0, 0, 0                     \
    }

struct ampstead_result;

/*
 * ampstead_run: reads the cell and does what is asked.
 *
 * request  not NULL
 * result   out, not NULL: owned by the caller (ampstead_result_free), also after errors, so that
 *          the messages can be read; NULL only when there was not even memory for that
 */
AMPSTEAD_API enum ampstead_status ampstead_run(const struct ampstead_request *request,
                                               struct ampstead_result **result);

/* Frees a result with all of its strings; NULL is allowed. */
AMPSTEAD_API void ampstead_result_free(struct ampstead_result *result);

/*
 * The status of the run again; AMPSTEAD_MACHINE for NULL, and once a text could not be made.
 */
AMPSTEAD_API enum ampstead_status ampstead_result_status(const struct ampstead_result *result);

/* Flags of ampstead_result_text and ampstead_result_messages. */
enum {
    AMPSTEAD_COLOR = 1, /* ANSI colour escapes */
    AMPSTEAD_ASCII = 2  /* no characters beyond ASCII (text only) */
};

/*
 * Each of the next functions makes a text, kept until the same function is called again for this
 * result or the result is freed. A NULL result gives "out of memory" as messages and NULL
 * elsewhere.
 */

/* What is wrong with the input, one or many messages with line ends; "" when nothing is. Never
 * NULL. */
AMPSTEAD_API const char *ampstead_result_messages(struct ampstead_result *result, unsigned flags);

/*
 * The report of the command for people (for "check" one line an error, "" when there is none; for
 * "format" the text in the house layout); `columns` is the widest line, 72 to 100 (0: 100). NULL
 * when there is no result (AMPSTEAD_INPUT) or memory is short.
 */
AMPSTEAD_API const char *ampstead_result_text(struct ampstead_result *result, unsigned flags,
                                              int columns);

/* The same as one JSON object. NULL as above. */
AMPSTEAD_API const char *ampstead_result_json(struct ampstead_result *result);

/* Curves (review), sweeps (sweep) or samples (spread) as CSV. NULL as above, and for the other
 * commands. */
AMPSTEAD_API const char *ampstead_result_csv(struct ampstead_result *result);

/* The part of the samples that a "spread" with request.part has solved, for "merge". NULL as above,
 * and without request.part. */
AMPSTEAD_API const char *ampstead_result_part(struct ampstead_result *result);

/* The curves and bars of the command as one SVG document, text as text. NULL as above, and when
 * there is nothing to draw. */
AMPSTEAD_API const char *ampstead_result_plot(struct ampstead_result *result);

/* Of review, spread, states or explain: one self-contained HTML file. NULL as above, and for the
 * other commands. */
AMPSTEAD_API const char *ampstead_result_page(struct ampstead_result *result);

/* The files that were read, from 0 on: the cell, then those it names; NULL after the last. */
AMPSTEAD_API const char *ampstead_result_file(const struct ampstead_result *result, int index);

/*
 * ampstead_result_cell: after "size", the text of the cell with the chosen values in place, its
 * comments and layout untouched.
 *
 * rounding  "exact" (also NULL), "E24", "E96" or "grid": which values
 *
 * NULL when there is no solution or no such rounding here, memory is short, or a value has no place
 * of its own in the text (the messages say so).
 */
AMPSTEAD_API const char *ampstead_result_cell(struct ampstead_result *result, const char *rounding);

/*
 * ampstead_result_value: one quantity by its name in the cell language: "tail.current", "M1.vgs",
 * "ref.v", "vbat.power", "all.headroom", "cell.power". For tail.line the value of greatest size
 * over the rails; an unlimited resistance is infinite.
 *
 * Returns 1 and sets *value, or 0 when there is no such name, the value does not apply, or there
 * is no operating point; *value is then kept.
 */
AMPSTEAD_API int ampstead_result_value(const struct ampstead_result *result, const char *name,
                                       double *value);

/* A file of measured curves. */
struct ampstead_curves {
    const char *path;
    const char *width, *length; /* "7u"; NULL: as request.size_text or the list says */
    int held;                   /* not 0: predicted and not fitted */
};

/* What to calibrate; docs/calibrate.md tells what each text may be. Start from
 * AMPSTEAD_CALIBRATION_REQUEST. Everything is read during ampstead_calibrate only. */
struct ampstead_calibration_request {
    size_t size;                         /* set by AMPSTEAD_CALIBRATION_REQUEST */
    const struct ampstead_curves *files; /* [file_count] */
    int file_count;
    const char *list; /* CSV file of files with kinds and sizes; NULL: none */
    const char *kind; /* "nmos", "pmos", "diode", "resistor", "npn", "pnp"; NULL: of the list */
    const char *size_text;   /* "7u/8u"; NULL: each file has its own */
    const char *model;       /* name of the model; NULL: the kind */
    const char *columns;     /* "vgs=VG, id=-ID uA"; NULL: the usual names */
    const char *temperature; /* "27 C"; NULL: 25 C, and a remark says so */
    const char *noise;       /* "2 nA"; NULL: the usual one */
    const char *accuracy;    /* "1%"; NULL: that */
    const char *form;        /* "cards", "set" or "both"; NULL: as the number of files asks */
    int robust;              /* not 0: doubtful readings are left out */
    const char *target;  /* the process file to be; names the process. A comment at the top of an
                            existing one is kept. NULL: none */
    const char *command; /* told in the process file; NULL: not told */
    int (*stopped)(void *self); /* as in ampstead_request */
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share);
    void *progress_self;
};

#define AMPSTEAD_CALIBRATION_REQUEST                                                               \
    {                                                                                              \
        sizeof(struct ampstead_calibration_request), 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0,  \
            0, 0, 0                                                                                \
    }

struct ampstead_calibration;

/* Reads curves and fits models. `calibration` is owned by the caller as a result of ampstead_run
 * is; the status is AMPSTEAD_WELL, _INPUT, _MACHINE or _STOPPED. */
AMPSTEAD_API enum ampstead_status
ampstead_calibrate(const struct ampstead_calibration_request *request,
                   struct ampstead_calibration **calibration);
AMPSTEAD_API void ampstead_calibration_free(struct ampstead_calibration *calibration);

/* Texts as for a result; those but the messages are NULL unless the status is AMPSTEAD_WELL. */
AMPSTEAD_API const char *ampstead_calibration_messages(struct ampstead_calibration *calibration,
                                                       unsigned flags);
AMPSTEAD_API const char *ampstead_calibration_text(struct ampstead_calibration *calibration,
                                                   unsigned flags, int columns);
AMPSTEAD_API const char *ampstead_calibration_json(struct ampstead_calibration *calibration);
/* The process file. */
AMPSTEAD_API const char *ampstead_calibration_plot(struct ampstead_calibration *calibration);
AMPSTEAD_API const char *ampstead_calibration_process(struct ampstead_calibration *calibration);

/* "1.0.0"; lives as long as the program. */
AMPSTEAD_API const char *ampstead_version(void);

/* What it was built with: "KLU 1.3.9, gcc 12.2.0, Release"; lives as long as the program. */
AMPSTEAD_API const char *ampstead_build(void);

#ifdef __cplusplus
}
#endif

#endif
