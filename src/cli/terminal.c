/* terminal.c: what the terminal can show, and the progress of a run on it. */
#include "cli/terminal.h"

#include <langinfo.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include "library/ampstead.h"

/* Only what a signal handler may call; files are replaced as a whole, so none is left half. */
static void end_now(int signal_number)
{
    static const char text[] = "\nampstead: the time limit is over, and a step that cannot be "
                               "interrupted goes on; --time-limit sets another\n";
    (void)signal_number;
    const ssize_t written = write(STDERR_FILENO, text, sizeof text - 1);
    (void)written;
    _exit(AMPSTEAD_STOPPED);
}

void terminal_begin(struct terminal_run *run, const volatile sig_atomic_t *stop, unsigned limit)
{
    *run = (struct terminal_run){
        .stop = stop, .shows_progress = isatty(STDERR_FILENO), .limit = limit};
    (void)clock_gettime(CLOCK_MONOTONIC, &run->start);
    if (limit > 0) {
        (void)signal(SIGALRM, end_now);
        (void)alarm(limit + TIME_GRACE);
    }
}

/* Seconds since the start; a clock that fails stands still. */
static double seconds_of(const struct terminal_run *run)
{
    struct timespec now;
    if (clock_gettime(CLOCK_MONOTONIC, &now) != 0) {
        return 0;
    }
    return (double)(now.tv_sec - run->start.tv_sec) +
           1e-9 * (double)(now.tv_nsec - run->start.tv_nsec);
}

int terminal_stopped(void *self)
{
    struct terminal_run *run = self;
    if (run->limit > 0 && !run->is_over) {
        run->is_over = seconds_of(run) >= (double)run->limit;
    }
    return *run->stop != 0 || run->is_over;
}

void terminal_progress(void *self, const char *what, double share)
{
    static const char full[] = "########################################";
    enum { BAR = sizeof full - 1 };
    struct terminal_run *run = self;
    if (!run->shows_progress) {
        return;
    }
    const double seconds = seconds_of(run);
    if (seconds >= 0.5 && seconds >= run->shown + 0.1) {
        int done = share > 0 ? (int)(share * BAR) : 0;
        fprintf(stderr, "\r[%-*.*s] %3.0f %%  %-28.28s", BAR, done, full, 100.0 * share, what);
        run->has_line = true;
        run->shown = seconds;
    }
}

void terminal_end(struct terminal_run *run)
{
    if (run->has_line) {
        fprintf(stderr, "\r%79s\r", "");
    }
    if (run->limit > 0) {
        (void)alarm(0);
    }
    if (run->is_over) {
        fprintf(stderr, "ampstead: the time limit of %u s is over; --time-limit sets another\n",
                run->limit);
    }
}

bool terminal_color(const struct options *options, int file)
{
    const char *choice = options->values[OPTION_COLOR];
    if (choice != NULL && strcmp(choice, "auto") != 0) {
        return strcmp(choice, "always") == 0;
    }
    const char *none = getenv("NO_COLOR"), *terminal = getenv("TERM");
    return isatty(file) && (none == NULL || *none == '\0') &&
           !(terminal != NULL && strcmp(terminal, "dumb") == 0);
}

unsigned terminal_flags(const struct options *options)
{
    unsigned flags = terminal_color(options, STDOUT_FILENO) ? AMPSTEAD_COLOR : 0;
    if (isatty(STDOUT_FILENO) && strcmp(nl_langinfo(CODESET), "UTF-8") != 0) {
        flags |= AMPSTEAD_ASCII;
    }
    return flags;
}

int terminal_columns(void)
{
    struct winsize size;
    if (isatty(STDOUT_FILENO) && ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) == 0) {
        return size.ws_col;
    }
    return 0;
}
