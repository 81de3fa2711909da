/* terminal.h: what the terminal can show, and the progress of a run on it. */
#ifndef CLI_TERMINAL_H
#define CLI_TERMINAL_H

#include <signal.h>
#include <stdbool.h>
#include <time.h>

#include "cli/options.h"

enum {
    TIME_LIMIT = 3600,             /* s of one run, unless the command line says otherwise */
    TIME_LIMIT_LONGEST = 10000000, /* s */
    TIME_GRACE = 10                /* s after the limit: work that does not ask ends there */
};

/* What the callbacks of a run share. */
struct terminal_run {
    const volatile sig_atomic_t *stop;
    struct timespec start;
    unsigned limit;      /* s; 0: none */
    bool is_over;        /* the limit was met */
    bool shows_progress; /* standard error is a terminal */
    bool has_line;       /* a progress line stands there */
    double shown;        /* s after the start, of the last line */
};

/*
 * The work is asked to stop after `limit` seconds (0: never). A step that does not ask in time,
 * such as the factoring of a huge matrix, is ended with the program TIME_GRACE later, with a
 * message.
 */
void terminal_begin(struct terminal_run *run, const volatile sig_atomic_t *stop, unsigned limit);

/* Callbacks of the library; self is the terminal_run. Progress is shown only once the work has
 * taken half a second, and ten times a second. */
int terminal_stopped(void *self);
void terminal_progress(void *self, const char *what, double share);

/* Takes the progress line away; says so when the limit was met. */
void terminal_end(struct terminal_run *run);

/* Whether the file descriptor gets color. */
bool terminal_color(const struct options *options, int file);

/* AMPSTEAD_COLOR and AMPSTEAD_ASCII for standard output. Only a terminal says by its locale that it
 * shows no UTF-8; files and pipes always get it. */
unsigned terminal_flags(const struct options *options);

/* Width of the terminal; 0 when standard output is none. */
int terminal_columns(void);

#endif
