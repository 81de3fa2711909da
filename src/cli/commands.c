/* commands.c: a request from the options, and its results to where they are wanted. */
#include "cli/commands.h"

#include <errno.h>
#include <langinfo.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <time.h>
#include <unistd.h>

#include "cli/output.h"
#include "library/ampstead.h"

/* What the callbacks of a run share. */
struct watch {
    const volatile sig_atomic_t *stop;
    struct timespec start;
    bool shows_progress; /* standard error is a terminal */
    bool has_line;       /* a progress line stands there */
    double shown;        /* s after the start, of the last line */
};

static int ask_stopped(void *self)
{
    const struct watch *watch = self;
    return *watch->stop != 0;
}

/* Progress is shown only once the work has taken half a second, and ten times a second. */
static void show_progress(void *self, const char *what, double share)
{
    static const char full[] = "########################################";
    enum { BAR = sizeof full - 1 };
    struct watch *watch = self;
    struct timespec now;
    if (!watch->shows_progress || clock_gettime(CLOCK_MONOTONIC, &now) != 0) {
        return;
    }
    double seconds = (double)(now.tv_sec - watch->start.tv_sec) +
                     1e-9 * (double)(now.tv_nsec - watch->start.tv_nsec);
    if (seconds >= 0.5 && seconds >= watch->shown + 0.1) {
        int done = share > 0 ? (int)(share * BAR) : 0;
        fprintf(stderr, "\r[%-*.*s] %3.0f %%  %-28.28s", BAR, done, full, 100.0 * share, what);
        watch->has_line = true;
        watch->shown = seconds;
    }
}

static void end_progress(struct watch *watch)
{
    if (watch->has_line) {
        fprintf(stderr, "\r%79s\r", "");
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
    return output_file(path, text);
}

/* No copy of the cell: there is no solution, this rounding rounds nothing here, or a message says
 * why. The status is that of the run, or that the wish was wrong. */
static int refuse_cell(const struct options *options, struct ampstead_result *result)
{
    const char *messages = ampstead_result_messages(result, 0);
    if (*messages != '\0') {
        fputs(messages, stderr);
    } else {
        const char *rounding = options->values[OPTION_ROUND];
        fprintf(stderr, "ampstead: '--write' has no %s values to write\n",
                rounding == NULL ? "chosen" : rounding);
    }
    const int status = (int)ampstead_result_status(result);
    return status == AMPSTEAD_WELL ? AMPSTEAD_INPUT : status;
}

/* Writes what was asked for; the exit status. */
static int deliver_all(const struct options *options, struct ampstead_result *result)
{
    int status = (int)ampstead_result_status(result);
    bool wants_text = true, is_written = true;
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
    if (options->given[OPTION_WRITE]) {
        const char *path = options->values[OPTION_WRITE];
        const char *text = ampstead_result_cell(result, options->values[OPTION_ROUND]);
        wants_text = wants_text && !(text != NULL && is_stdout(path));
        if (text == NULL) {
            status = refuse_cell(options, result);
        } else {
            is_written = deliver(path, text) && is_written;
        }
    }
    if (wants_text) {
        const char *text = ampstead_result_text(result, text_flags(options), text_columns());
        is_written = deliver(NULL, text) && is_written;
    }
    return is_written ? status : AMPSTEAD_MACHINE;
}

/* Two streams into one would be neither. */
static bool check_outputs(const struct options *options)
{
    static const enum option streams[] = {OPTION_JSON, OPTION_CSV, OPTION_WRITE};
    int taken = -1;
    for (size_t k = 0; k < sizeof streams / sizeof streams[0]; k++) {
        if (!options->given[streams[k]] || !is_stdout(options->values[streams[k]])) {
            continue;
        }
        if (taken >= 0) {
            fprintf(stderr, "ampstead: '--%s' and '--%s' cannot both go to standard output\n",
                    option_rows[taken].name, option_rows[streams[k]].name);
            return false;
        }
        taken = (int)streams[k];
    }
    return true;
}

/* A whole number of an option; `value` is kept when the option was not given. False after a
 * message.
 */
static bool read_number(const struct options *options, enum option option, unsigned long long most,
                        unsigned long long *value)
{
    const char *text = options->values[option];
    if (text == NULL) {
        return true;
    }
    unsigned long long found = 0;
    const char *at = text;
    for (; *at >= '0' && *at <= '9'; at++) {
        const unsigned digit = (unsigned)(*at - '0');
        if (found > (most - digit) / 10) {
            break;
        }
        found = 10 * found + digit;
    }
    if (*at != '\0') {
        fprintf(stderr, "ampstead: '%s' is no value of --%s: a whole number from 0 to %llu\n", text,
                option_rows[option].name, most);
        return false;
    }
    *value = found;
    return true;
}

/* The numbers of the request; false after a message. */
static bool read_numbers(const struct options *options, struct ampstead_request *request)
{
    enum { JOB_LIMIT = 256 };
    unsigned long long samples = AMPSTEAD_SAMPLES, jobs = 0, seed = request->seed;
    if (!read_number(options, OPTION_SAMPLES, AMPSTEAD_SAMPLE_LIMIT, &samples) ||
        !read_number(options, OPTION_SEED, INT64_MAX, &seed) ||
        !read_number(options, OPTION_JOBS, JOB_LIMIT, &jobs)) {
        return false;
    }
    request->samples = (int)samples;
    request->seed = seed;
    request->jobs = (int)jobs;
    return true;
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

static int run_cell(const struct options *options, const volatile sig_atomic_t *stop)
{
    struct watch watch = {.stop = stop, .shows_progress = isatty(STDERR_FILENO)};
    struct ampstead_request request = AMPSTEAD_REQUEST;
    struct ampstead_result *result = NULL;
    const char *view = options->values[OPTION_VIEW];
    if (!check_outputs(options) || !read_boxes(options, &request.boxes) ||
        !read_numbers(options, &request)) {
        return AMPSTEAD_INPUT;
    }
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
    request.of = options->values[OPTION_OF];
    request.grid = options->values[OPTION_GRID];
    request.stopped = ask_stopped;
    request.stopped_self = &watch;
    request.progress = show_progress;
    request.progress_self = &watch;
    int status = (int)ampstead_run(&request, &result);
    end_progress(&watch);
    fputs(
        ampstead_result_messages(result, wants_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
        stderr);
    if (status == AMPSTEAD_UNSOLVED) {
        fprintf(stderr, "ampstead: %s: no operating point was found\n", options->file);
    } else if (status == AMPSTEAD_STOPPED) {
        fputs("ampstead: stopped\n", stderr);
    }
    if (status != AMPSTEAD_INPUT && status != AMPSTEAD_MACHINE) {
        status = deliver_all(options, result);
    }
    ampstead_result_free(result);
    return status;
}

/* The words behind the verb, W= and L= with the file in front of them. Returns the number of files,
 * -1 after a message. */
static int read_curves(const char *const *words, int count, bool is_held,
                       struct ampstead_curves *files)
{
    int found = 0;
    for (int k = 0; k < count; k++) {
        bool is_size = strncmp(words[k], "W=", 2) == 0 || strncmp(words[k], "L=", 2) == 0;
        if (is_size && found == 0) {
            fprintf(stderr, "ampstead: '%s' stands in front of the file it belongs to\n", words[k]);
            return -1;
        }
        if (!is_size) {
            files[found++] = (struct ampstead_curves){words[k], NULL, NULL, is_held};
        } else if (words[k][0] == 'W') {
            files[found - 1].width = words[k] + 2;
        } else {
            files[found - 1].length = words[k] + 2;
        }
    }
    return found;
}

/* Never overwrites without --force. */
static bool check_target(const struct options *options)
{
    const char *path = options->values[OPTION_WRITE];
    if (path == NULL || is_stdout(path) || options->given[OPTION_FORCE] ||
        access(path, F_OK) != 0) {
        return true;
    }
    fprintf(stderr, "ampstead: '%s' exists; --force replaces it\n", path);
    return false;
}

static bool deliver_calibration(const struct options *options,
                                struct ampstead_calibration *calibration)
{
    bool wants_text = true, is_written = true;
    if (options->given[OPTION_WRITE]) {
        const char *path = options->values[OPTION_WRITE];
        wants_text = !is_stdout(path);
        is_written = deliver(path, ampstead_calibration_process(calibration));
    }
    if (options->given[OPTION_JSON]) {
        const char *path = options->values[OPTION_JSON];
        wants_text = wants_text && !is_stdout(path);
        is_written = deliver(path, ampstead_calibration_json(calibration)) && is_written;
    }
    if (wants_text) {
        const char *text =
            ampstead_calibration_text(calibration, text_flags(options), text_columns());
        is_written = deliver(NULL, text) && is_written;
    }
    return is_written;
}

static int run_calibration(const struct options *options, struct ampstead_curves *files,
                           const volatile sig_atomic_t *stop)
{
    struct watch watch = {.stop = stop, .shows_progress = isatty(STDERR_FILENO)};
    struct ampstead_calibration_request request = AMPSTEAD_CALIBRATION_REQUEST;
    struct ampstead_calibration *calibration = NULL;
    int fitted = read_curves(options->words + 1, options->word_count - 1, false, files);
    int held =
        fitted < 0 ? -1 : read_curves(options->held, options->held_count, true, files + fitted);
    if (held < 0 || !check_target(options)) {
        return AMPSTEAD_INPUT;
    }
    (void)clock_gettime(CLOCK_MONOTONIC, &watch.start);
    request.files = files;
    request.file_count = fitted + held;
    request.kind = options->values[OPTION_KIND];
    request.size_text = options->values[OPTION_LENGTHS];
    request.model = options->values[OPTION_MODEL];
    request.list = options->values[OPTION_LIST];
    request.columns = options->values[OPTION_COLUMNS];
    request.temperature = options->values[OPTION_TEMPERATURE];
    request.noise = options->values[OPTION_NOISE];
    request.accuracy = options->values[OPTION_ACCURACY];
    request.form = options->values[OPTION_FORM];
    request.robust = options->given[OPTION_ROBUST];
    request.target = options->values[OPTION_WRITE];
    request.stopped = ask_stopped;
    request.stopped_self = &watch;
    request.progress = show_progress;
    request.progress_self = &watch;
    request.command = options->command;
    int status = (int)ampstead_calibrate(&request, &calibration);
    end_progress(&watch);
    fputs(ampstead_calibration_messages(calibration,
                                        wants_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
          stderr);
    if (status == AMPSTEAD_STOPPED) {
        fputs("ampstead: stopped\n", stderr);
    }
    if (status == AMPSTEAD_WELL && !deliver_calibration(options, calibration)) {
        status = AMPSTEAD_MACHINE;
    }
    ampstead_calibration_free(calibration);
    return status;
}

static int run_curves(const struct options *options, const volatile sig_atomic_t *stop)
{
    size_t room = (size_t)(options->word_count + options->held_count) + 1;
    struct ampstead_curves *files = calloc(room, sizeof *files);
    if (files == NULL) {
        fputs("ampstead: memory is short\n", stderr);
        return AMPSTEAD_MACHINE;
    }
    int status = run_calibration(options, files, stop);
    free(files);
    return status;
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
        printf("ampstead %s\n", ampstead_version());
    } else if (options->given[OPTION_HELP] || options->verb == VERB_HELP) {
        show_help(options);
    } else if (verb_takes_curves(options->verb)) {
        status = run_curves(options, stop);
    } else {
        status = run_cell(options, stop);
    }
    return output_close() ? status : AMPSTEAD_MACHINE;
}
