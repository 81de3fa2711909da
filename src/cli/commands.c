/* commands.c: a request from the options, and its results to where they are wanted. */
#include "cli/commands.h"

#include <errno.h>
#include <langinfo.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <time.h>
#include <unistd.h>

#include "cli/live.h"
#include "cli/output.h"
#include "cli/picture.h"
#include "cli/watch.h"
#include "library/ampstead.h"

/* What the callbacks of a run share. */
struct watch {
    const volatile sig_atomic_t *stop;
    struct timespec start;
    bool shows_progress; /* standard error is a terminal */
    bool has_line;       /* a progress line stands there */
};

static int ask_stopped(void *self)
{
    const struct watch *watch = self;
    return *watch->stop != 0;
}

/* Progress is shown only once the work has taken half a second. */
static void show_progress(void *self, const char *what, double share)
{
    struct watch *watch = self;
    struct timespec now;
    if (!watch->shows_progress || clock_gettime(CLOCK_MONOTONIC, &now) != 0) {
        return;
    }
    double seconds = (double)(now.tv_sec - watch->start.tv_sec) +
                     1e-9 * (double)(now.tv_nsec - watch->start.tv_nsec);
    if (seconds >= 0.5) {
        fprintf(stderr, "\r%3.0f %%  %-60.60s", 100.0 * share, what);
        watch->has_line = true;
    }
}

static void end_progress(struct watch *watch)
{
    if (watch->has_line) {
        fprintf(stderr, "\r%68s\r", "");
    }
}

static bool wants_color(const struct options *options, int file)
{
    const char *choice = options->values[OPTION_COLOR];
    if (choice != NULL && strcmp(choice, "auto") != 0) {
        return strcmp(choice, "always") == 0;
    }
    const char *none = getenv("NO_COLOR"), *terminal = getenv("TERM");
    return isatty(file) && (none == NULL || *none == '\0') &&
           !(terminal != NULL && strcmp(terminal, "dumb") == 0);
}

/* Only a terminal says by its locale that it shows no UTF-8; files and pipes always get it. */
static unsigned text_flags(const struct options *options)
{
    unsigned flags = wants_color(options, STDOUT_FILENO) ? AMPSTEAD_COLOR : 0;
    if (isatty(STDOUT_FILENO) && strcmp(nl_langinfo(CODESET), "UTF-8") != 0) {
        flags |= AMPSTEAD_ASCII;
    }
    return flags;
}

/* Width of the terminal; 0 when standard output is none. */
static int text_columns(void)
{
    struct winsize size;
    if (isatty(STDOUT_FILENO) && ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) == 0) {
        return size.ws_col;
    }
    return 0;
}

static bool is_stdout(const char *path)
{
    return path == NULL || *path == '\0' || strcmp(path, "-") == 0;
}

/* One text to its file or to standard output; NULL is a failure of memory. */
static bool deliver(const char *path, const char *text)
{
    if (text == NULL) {
        fputs("ampstead: memory is short\n", stderr);
        return false;
    }
    if (is_stdout(path)) {
        output_text(text);
        return true;
    }
    return output_file(path, text, strlen(text));
}

/* The picture in the form that the ending of the path asks for. */
static bool deliver_plot(const char *path, struct ampstead_result *result)
{
    const char *svg = ampstead_result_plot(result);
    if (svg == NULL && ampstead_result_status(result) != AMPSTEAD_MACHINE) {
        fprintf(stderr, "ampstead: %s: nothing to draw: no output and no sweep has a curve\n",
                path);
        return true;
    }
    if (svg == NULL || picture_form(path) == PICTURE_SVG) {
        return deliver(path, svg);
    }
    struct picture picture = {NULL, 0, 0};
    const char *trouble = picture_make(svg, picture_form(path), &picture);
    bool is_written = false;
    if (trouble != NULL) {
        fprintf(stderr, "ampstead: %s: %s\n", path, trouble);
    } else {
        is_written = output_file(path, picture.data, picture.length);
    }
    picture_free(&picture);
    return is_written;
}

/* Writes what was asked for; false when something could not be written. With a live version (not 0)
 * the page reloads itself, and the text is left to the watch. */
static bool deliver_all(const struct options *options, struct ampstead_result *result,
                        int live_version)
{
    bool wants_text = live_version == 0, is_written = true;
    if (options->given[OPTION_JSON]) {
        const char *path = options->values[OPTION_JSON];
        wants_text = wants_text && !is_stdout(path);
        is_written = deliver(path, ampstead_result_json(result)) && is_written;
    }
    if (options->given[OPTION_CSV] && ampstead_result_status(result) != AMPSTEAD_UNSOLVED) {
        const char *path = options->values[OPTION_CSV];
        wants_text = wants_text && !is_stdout(path);
        is_written = deliver(path, ampstead_result_csv(result)) && is_written;
    }
    if (options->given[OPTION_PLOT] && ampstead_result_status(result) != AMPSTEAD_UNSOLVED) {
        is_written = deliver_plot(options->values[OPTION_PLOT], result) && is_written;
    }
    if (options->given[OPTION_PAGE]) {
        const char *path = options->values[OPTION_PAGE], *page = ampstead_result_page(result);
        bool is_live = live_version != 0 && page != NULL;
        is_written =
            (is_live ? live_write(path, page, live_version) : deliver(path, page)) && is_written;
    }
    if (wants_text) {
        const char *text = ampstead_result_text(result, text_flags(options), text_columns());
        is_written = deliver(NULL, text) && is_written;
    }
    return is_written;
}

/* A whole number; kept when the option was not given. False after a message. */
static bool read_boxes(const struct options *options, long *boxes)
{
    const char *text = options->values[OPTION_BOXES];
    char *end = NULL;
    if (text == NULL) {
        return true;
    }
    errno = 0;
    const long found = strtol(text, &end, 10);
    if (end == text || *end != '\0' || errno != 0 || found < 0) {
        fprintf(stderr, "ampstead: '%s' is no value of --boxes: a whole number, 0 or more\n", text);
        return false;
    }
    *boxes = found;
    return true;
}

/* Two streams into one would be neither. */
static bool check_outputs(const struct options *options)
{
    long boxes = 0;
    if (!read_boxes(options, &boxes)) {
        return false;
    }
    if (options->given[OPTION_JSON] && options->given[OPTION_CSV] &&
        is_stdout(options->values[OPTION_JSON]) && is_stdout(options->values[OPTION_CSV])) {
        fputs("ampstead: '--json' and '--csv' cannot both go to standard output\n", stderr);
        return false;
    }
    if (options->given[OPTION_PLOT]) {
        const char *path = options->values[OPTION_PLOT], *trouble = picture_refused(path);
        if (trouble != NULL) {
            fprintf(stderr, "ampstead: '%s' %s\n", path, trouble);
            return false;
        }
    }
    return true;
}

/* Errors of `check` on standard output; nothing when all is well. */
static int deliver_check(struct ampstead_result *result, int status)
{
    const char *text = ampstead_result_text(result, 0, 0);
    if (text == NULL) {
        fputs(ampstead_result_messages(result, 0), stderr);
    } else {
        output_text(text);
    }
    return status;
}

/* The formatted text to where it came from, if it differs. */
static int deliver_format(const struct options *options, struct ampstead_result *result, int status)
{
    const char *text = ampstead_result_text(result, 0, 0);
    fputs(
        ampstead_result_messages(result, wants_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
        stderr);
    if (status != AMPSTEAD_WELL || text == NULL) {
        return status == AMPSTEAD_WELL ? AMPSTEAD_MACHINE : status;
    }
    if (is_stdout(options->file)) {
        output_text(text);
    } else if (!output_same(options->file, text) &&
               !output_file(options->file, text, strlen(text))) {
        return AMPSTEAD_MACHINE;
    }
    return status;
}

/* Runs the library with what the options say; the result is the caller's. */
static int run_request(const struct options *options, const volatile sig_atomic_t *stop,
                       struct ampstead_result **result)
{
    struct watch watch = {.stop = stop, .shows_progress = isatty(STDERR_FILENO)};
    struct ampstead_request request = AMPSTEAD_REQUEST;
    const char *view = options->values[OPTION_VIEW];
    (void)read_boxes(options, &request.boxes); /* was checked before */
    (void)clock_gettime(CLOCK_MONOTONIC, &watch.start);
    request.command = verb_rows[options->verb].word;
    request.path = options->file;
    request.view =
        view != NULL && strcmp(view, "hand") == 0 ? AMPSTEAD_VIEW_HAND : AMPSTEAD_VIEW_FULL;
    request.temperature = options->values[OPTION_TEMPERATURE];
    request.corner = options->values[OPTION_CORNER];
    request.sets = options->sets;
    request.set_count = options->set_count;
    request.sweep = options->values[OPTION_SWEEP];
    request.certify = options->given[OPTION_CERTIFY];
    request.leakage = options->values[OPTION_LEAKAGE];
    request.stopped = ask_stopped;
    request.stopped_self = &watch;
    request.progress = show_progress;
    request.progress_self = &watch;
    int status = (int)ampstead_run(&request, result);
    end_progress(&watch);
    return status;
}

static bool has_results(int status)
{
    return status != AMPSTEAD_INPUT && status != AMPSTEAD_MACHINE;
}

static int run_cell(const struct options *options, const volatile sig_atomic_t *stop)
{
    struct ampstead_result *result = NULL;
    if (!check_outputs(options)) {
        return AMPSTEAD_INPUT;
    }
    int status = run_request(options, stop, &result);
    if (options->verb == VERB_CHECK || options->verb == VERB_FORMAT) {
        status = options->verb == VERB_CHECK ? deliver_check(result, status)
                                             : deliver_format(options, result, status);
        ampstead_result_free(result);
        return status;
    }
    fputs(
        ampstead_result_messages(result, wants_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
        stderr);
    if (status == AMPSTEAD_UNSOLVED) {
        fprintf(stderr, "ampstead: %s: no operating point was found\n", options->file);
    } else if (status == AMPSTEAD_STOPPED) {
        fputs("ampstead: stopped\n", stderr);
    }
    if (has_results(status) && !deliver_all(options, result, 0)) {
        status = AMPSTEAD_MACHINE;
    }
    ampstead_result_free(result);
    return status;
}

/* What a watch keeps from run to run. */
struct vigil {
    struct ampstead_result *good; /* the last one with results; NULL: none yet */
    int status, version;
};

/* Errors, if any, above the last good page, on a cleared terminal. */
static void show_vigil(const struct options *options, const struct vigil *vigil,
                       struct ampstead_result *wrong)
{
    if (isatty(STDOUT_FILENO)) {
        output_text("\033[H\033[2J");
    }
    if (wrong != NULL) {
        output_text(ampstead_result_messages(
            wrong, wants_color(options, STDOUT_FILENO) ? AMPSTEAD_COLOR : 0));
        output_text(vigil->good != NULL ? "\nas it was before:\n\n" : "");
    }
    if (vigil->good != NULL) {
        const char *text = ampstead_result_text(vigil->good, text_flags(options), text_columns());
        output_text(text != NULL ? text : "");
    }
    (void)fflush(stdout);
}

/* One run of a watch: results replace the last good ones, errors leave them. */
static void run_vigil(const struct options *options, const volatile sig_atomic_t *stop,
                      struct vigil *vigil, struct watcher *watcher)
{
    struct ampstead_result *result = NULL;
    int status = run_request(options, stop, &result);
    if (status == AMPSTEAD_STOPPED) {
        ampstead_result_free(result);
        return;
    }
    vigil->status = status;
    for (int k = 0; ampstead_result_file(result, k) != NULL; k++) {
        watcher_add(watcher, ampstead_result_file(result, k));
    }
    if (has_results(status)) {
        ampstead_result_free(vigil->good);
        vigil->good = result;
        vigil->version++;
        (void)deliver_all(options, result, vigil->version);
        show_vigil(options, vigil, NULL);
    } else {
        show_vigil(options, vigil, result);
        ampstead_result_free(result);
    }
}

static int run_watch(const struct options *options, const volatile sig_atomic_t *stop)
{
    struct vigil vigil = {NULL, AMPSTEAD_WELL, 0};
    struct watcher watcher;
    if (is_stdout(options->file)) {
        fputs("ampstead: '--watch' wants a file that can be saved again\n", stderr);
        return AMPSTEAD_INPUT;
    }
    if (!check_outputs(options)) {
        return AMPSTEAD_INPUT;
    }
    watcher_open(&watcher);
    watcher_add(&watcher, options->file);
    do {
        run_vigil(options, stop, &vigil, &watcher);
    } while (watcher_wait(&watcher, stop));
    if (options->given[OPTION_PAGE] && vigil.good != NULL) {
        const char *page = ampstead_result_page(vigil.good);
        if (page == NULL || !live_end(options->values[OPTION_PAGE], page)) {
            vigil.status = AMPSTEAD_MACHINE;
        }
    }
    ampstead_result_free(vigil.good);
    watcher_close(&watcher);
    return vigil.status;
}

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
    } else {
        status = options->given[OPTION_WATCH] ? run_watch(options, stop) : run_cell(options, stop);
    }
    return output_close() ? status : AMPSTEAD_MACHINE;
}
