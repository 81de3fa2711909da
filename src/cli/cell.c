/* cell.c: a cell: its request from the options, and its results to where they are wanted. */
#include "cli/cell.h"

#include <limits.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "cli/live.h"
#include "cli/output.h"
#include "cli/parts.h"
#include "cli/picture.h"
#include "cli/terminal.h"

static bool deliver_plot(const char *path, struct ampstead_result *result)
{
    const char *svg = ampstead_result_plot(result);
    if (svg == NULL && ampstead_result_status(result) != AMPSTEAD_MACHINE) {
        fprintf(stderr, "ampstead: %s: nothing to draw: the result holds no curve and no bars\n",
                path);
        return true;
    }
    return picture_deliver(path, svg);
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

int cell_deliver(const struct options *options, struct ampstead_result *result, int live_version)
{
    int status = (int)ampstead_result_status(result);
    bool wants_text = live_version == 0, is_written = true;
    if (options->given[OPTION_JSON]) {
        const char *path = options->values[OPTION_JSON];
        wants_text = wants_text && !output_is_stdout(path);
        is_written = output_deliver(path, ampstead_result_json(result)) && is_written;
    }
    if (options->given[OPTION_CSV] && ampstead_result_status(result) != AMPSTEAD_UNSOLVED) {
        const char *path = options->values[OPTION_CSV];
        wants_text = wants_text && !output_is_stdout(path);
        is_written = output_deliver(path, ampstead_result_csv(result)) && is_written;
    }
    if (options->given[OPTION_PLOT] && ampstead_result_status(result) != AMPSTEAD_UNSOLVED) {
        is_written = deliver_plot(options->values[OPTION_PLOT], result) && is_written;
    }
    if (options->given[OPTION_PAGE]) {
        const char *path = options->values[OPTION_PAGE], *page = ampstead_result_page(result);
        bool is_live = live_version != 0 && page != NULL;
        is_written =
            (is_live ? live_write(path, page, live_version) : output_deliver(path, page)) &&
            is_written;
    }
    if (options->given[OPTION_WRITE]) {
        const char *path = options->values[OPTION_WRITE];
        const char *text = ampstead_result_cell(result, options->values[OPTION_ROUND]);
        wants_text = wants_text && !(text != NULL && output_is_stdout(path));
        if (text == NULL) {
            status = refuse_cell(options, result);
        } else {
            const bool stands = !output_is_stdout(path) && output_same(path, text);
            is_written = (stands || output_deliver(path, text)) && is_written;
        }
    }
    if (wants_text) {
        const char *text =
            ampstead_result_text(result, terminal_flags(options), terminal_columns());
        is_written = output_deliver(NULL, text) && is_written;
    }
    return is_written ? status : AMPSTEAD_MACHINE;
}

/* Two streams into one would be neither. */
static bool check_streams(const struct options *options)
{
    static const enum option streams[] = {OPTION_JSON, OPTION_CSV, OPTION_WRITE};
    int taken = -1;
    for (size_t k = 0; k < sizeof streams / sizeof streams[0]; k++) {
        if (!options->given[streams[k]] || !output_is_stdout(options->values[streams[k]])) {
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
    if (*at != '\0' || at == text) {
        fprintf(stderr, "ampstead: '%s' is no value of --%s: a whole number from 0 to %llu\n", text,
                option_rows[option].name, most);
        return false;
    }
    *value = found;
    return true;
}

/* The numbers of the request; false after a message. */
static bool read_numbers(const struct options *options, struct ampstead_request *request,
                         unsigned *limit)
{
    enum { JOB_LIMIT = 256 };
    unsigned long long seconds = TIME_LIMIT;
    unsigned long long boxes = (unsigned long long)request->boxes;
    unsigned long long samples = AMPSTEAD_SAMPLES, jobs = 0, seed = request->seed;
    if (!read_number(options, OPTION_BOXES, LONG_MAX, &boxes) ||
        !read_number(options, OPTION_SAMPLES, AMPSTEAD_SAMPLE_LIMIT, &samples) ||
        !read_number(options, OPTION_SEED, INT64_MAX, &seed) ||
        !read_number(options, OPTION_JOBS, JOB_LIMIT, &jobs) ||
        !read_number(options, OPTION_TIME_LIMIT, TIME_LIMIT_LONGEST, &seconds)) {
        return false;
    }
    request->boxes = (long)boxes;
    request->samples = (int)samples;
    request->seed = seed;
    request->jobs = (int)jobs;
    *limit = (unsigned)seconds;
    return true;
}

bool cell_check(const struct options *options)
{
    struct ampstead_request request = AMPSTEAD_REQUEST;
    unsigned limit = 0;
    if (!check_streams(options) || !part_files_check(options) ||
        !read_numbers(options, &request, &limit)) {
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
    fputs(ampstead_result_messages(result,
                                   terminal_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
          stderr);
    if (status != AMPSTEAD_WELL || text == NULL) {
        return status == AMPSTEAD_WELL ? AMPSTEAD_MACHINE : status;
    }
    if (output_is_stdout(options->file)) {
        output_text(text);
    } else if (!output_same(options->file, text) &&
               !output_file(options->file, text, strlen(text))) {
        return AMPSTEAD_MACHINE;
    }
    return status;
}

int cell_request(const struct options *options, const volatile sig_atomic_t *stop,
                 struct ampstead_result **result)
{
    struct terminal_run run;
    struct ampstead_request request = AMPSTEAD_REQUEST;
    const char *view = options->values[OPTION_VIEW];
    struct ampstead_part *parts = NULL;
    int status = AMPSTEAD_WELL;
    unsigned limit = 0;
    (void)read_numbers(options, &request, &limit); /* were checked before */
    if (options->verb == VERB_MERGE) {
        parts = part_files_read(options, &status);
        if (parts == NULL) {
            return status;
        }
    }
    terminal_begin(&run, stop, limit);
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
    request.whole = options->given[OPTION_PAGE] && !options->given[OPTION_WATCH];
    request.of = options->values[OPTION_OF];
    request.grid = options->values[OPTION_GRID];
    request.stopped = terminal_stopped;
    request.stopped_self = &run;
    request.progress = terminal_progress;
    request.progress_self = &run;
    request.part = options->values[OPTION_PART];
    request.lanes = options->given[OPTION_LANES] ? options->values[OPTION_LANES][0] - '0' : 0;
    request.parts = parts;
    request.part_count = options->word_count - 1;
    status = (int)ampstead_run(&request, result);
    terminal_end(&run);
    part_files_free(parts, request.part_count);
    return status;
}

bool cell_has_results(int status)
{
    return status != AMPSTEAD_INPUT && status != AMPSTEAD_MACHINE;
}

int cell_run(const struct options *options, const volatile sig_atomic_t *stop)
{
    struct ampstead_result *result = NULL;
    if (!cell_check(options)) {
        return AMPSTEAD_INPUT;
    }
    int status = cell_request(options, stop, &result);
    if (options->verb == VERB_CHECK || options->verb == VERB_FORMAT) {
        status = options->verb == VERB_CHECK ? deliver_check(result, status)
                                             : deliver_format(options, result, status);
        ampstead_result_free(result);
        return status;
    }
    if (result != NULL || status == AMPSTEAD_MACHINE) {
        fputs(ampstead_result_messages(result,
                                       terminal_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
              stderr);
    }
    if (status == AMPSTEAD_UNSOLVED) {
        fprintf(stderr, "ampstead: %s: no operating point was found\n", options->file);
    } else if (status == AMPSTEAD_STOPPED) {
        fputs("ampstead: stopped\n", stderr);
    }
    if (status == AMPSTEAD_WELL && options->given[OPTION_PART]) {
        status = parts_deliver(options, result);
    } else if (cell_has_results(status) && !options->given[OPTION_PART]) {
        status = cell_deliver(options, result, 0);
    }
    ampstead_result_free(result);
    return status;
}
