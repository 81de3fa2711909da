/* terminal.c: what the terminal can show, and the progress of a run on it. */
#include "cli/terminal.h"

#include <langinfo.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include "library/ampstead.h"

void terminal_begin(struct terminal_run *run, const volatile sig_atomic_t *stop)
{
    *run = (struct terminal_run){.stop = stop, .shows_progress = isatty(STDERR_FILENO)};
    (void)clock_gettime(CLOCK_MONOTONIC, &run->start);
}

int terminal_stopped(void *self)
{
    const struct terminal_run *run = self;
    return *run->stop != 0;
}

void terminal_progress(void *self, const char *what, double share)
{
    static const char full[] = "########################################";
    enum { BAR = sizeof full - 1 };
    struct terminal_run *run = self;
    struct timespec now;
    if (!run->shows_progress || clock_gettime(CLOCK_MONOTONIC, &now) != 0) {
        return;
    }
    double seconds = (double)(now.tv_sec - run->start.tv_sec) +
                     1e-9 * (double)(now.tv_nsec - run->start.tv_nsec);
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
