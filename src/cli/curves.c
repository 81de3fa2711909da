/* curves.c: the verb that takes measured curves: its request, and the card to where it is wanted.
 */
#include "cli/curves.h"

#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "cli/output.h"
#include "cli/picture.h"
#include "cli/terminal.h"
#include "library/ampstead.h"

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

/* A picture of a known form; nothing is overwritten without --force. */
static bool check_target(const struct options *options)
{
    const char *path = options->values[OPTION_WRITE];
    const char *plot = options->values[OPTION_PLOT];
    const char *trouble = plot == NULL ? NULL : picture_refused(plot);
    if (trouble != NULL) {
        fprintf(stderr, "ampstead: '%s' %s\n", plot, trouble);
        return false;
    }
    if (path == NULL || output_is_stdout(path) || options->given[OPTION_FORCE] ||
        access(path, F_OK) != 0) {
        return true;
    }
    fprintf(stderr, "ampstead: '%s' exists; --force replaces it\n", path);
    return false;
}

static bool deliver_plot(const char *path, struct ampstead_calibration *calibration)
{
    const char *svg = ampstead_calibration_plot(calibration);
    if (svg == NULL && ampstead_calibration_text(calibration, 0, 0) != NULL) {
        fprintf(stderr, "ampstead: %s: nothing to draw: resistors are told in words\n", path);
        return true;
    }
    return picture_deliver(path, svg);
}

static bool deliver_calibration(const struct options *options,
                                struct ampstead_calibration *calibration)
{
    bool wants_text = true, is_written = true;
    if (options->given[OPTION_WRITE]) {
        const char *path = options->values[OPTION_WRITE];
        wants_text = !output_is_stdout(path);
        is_written = output_deliver(path, ampstead_calibration_process(calibration));
    }
    if (options->given[OPTION_JSON]) {
        const char *path = options->values[OPTION_JSON];
        wants_text = wants_text && !output_is_stdout(path);
        is_written = output_deliver(path, ampstead_calibration_json(calibration)) && is_written;
    }
    if (options->given[OPTION_PLOT]) {
        is_written = deliver_plot(options->values[OPTION_PLOT], calibration) && is_written;
    }
    if (wants_text) {
        const char *text =
            ampstead_calibration_text(calibration, terminal_flags(options), terminal_columns());
        is_written = output_deliver(NULL, text) && is_written;
    }
    return is_written;
}

static int run_calibration(const struct options *options, struct ampstead_curves *files,
                           const volatile sig_atomic_t *stop)
{
    struct terminal_run run;
    struct ampstead_calibration_request request = AMPSTEAD_CALIBRATION_REQUEST;
    struct ampstead_calibration *calibration = NULL;
    int fitted = read_curves(options->words + 1, options->word_count - 1, false, files);
    int held =
        fitted < 0 ? -1 : read_curves(options->held, options->held_count, true, files + fitted);
    if (held < 0 || !check_target(options)) {
        return AMPSTEAD_INPUT;
    }
    terminal_begin(&run, stop, 0);
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
    request.stopped = terminal_stopped;
    request.stopped_self = &run;
    request.progress = terminal_progress;
    request.progress_self = &run;
    request.command = options->command;
    int status = (int)ampstead_calibrate(&request, &calibration);
    terminal_end(&run);
    fputs(ampstead_calibration_messages(
              calibration, terminal_color(options, STDERR_FILENO) ? AMPSTEAD_COLOR : 0),
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

int curves_run(const struct options *options, const volatile sig_atomic_t *stop)
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
