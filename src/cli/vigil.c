/* vigil.c: --watch: runs again at every save, the last good page below the errors. */
#include "cli/vigil.h"

#include <stdbool.h>
#include <stdio.h>
#include <unistd.h>

#include "cli/cell.h"
#include "cli/live.h"
#include "cli/output.h"
#include "cli/terminal.h"
#include "cli/watch.h"

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
            wrong, terminal_color(options, STDOUT_FILENO) ? AMPSTEAD_COLOR : 0));
        output_text(vigil->good != NULL ? "\nas it was before:\n\n" : "");
    }
    if (vigil->good != NULL) {
        const char *text =
            ampstead_result_text(vigil->good, terminal_flags(options), terminal_columns());
        output_text(text != NULL ? text : "");
    }
    (void)fflush(stdout);
}

/* One run of a watch: results replace the last good ones, errors leave them. */
static void run_vigil(const struct options *options, const volatile sig_atomic_t *stop,
                      struct vigil *vigil, struct watcher *watcher)
{
    struct ampstead_result *result = NULL;
    int status = cell_request(options, stop, &result);
    if (status == AMPSTEAD_STOPPED) {
        ampstead_result_free(result);
        return;
    }
    vigil->status = status;
    for (int k = 0; ampstead_result_file(result, k) != NULL; k++) {
        watcher_add(watcher, ampstead_result_file(result, k));
    }
    if (cell_has_results(status)) {
        ampstead_result_free(vigil->good);
        vigil->good = result;
        vigil->version++;
        vigil->status = cell_deliver(options, result, vigil->version);
        show_vigil(options, vigil, NULL);
    } else {
        show_vigil(options, vigil, result);
        ampstead_result_free(result);
    }
}

int vigil_run(const struct options *options, const volatile sig_atomic_t *stop)
{
    struct vigil vigil = {NULL, AMPSTEAD_WELL, 0};
    struct watcher watcher;
    if (output_is_stdout(options->file)) {
        fputs("ampstead: '--watch' wants a file that can be saved again\n", stderr);
        return AMPSTEAD_INPUT;
    }
    if (!cell_check(options)) {
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
