/*
 * row_review.c: the whole process of a review, from its start to its end, beside a process that
 * does nothing.
 */
#include <fcntl.h>
#include <spawn.h>
#include <stddef.h>
#include <sys/wait.h>
#include <unistd.h>

#include "bench/stopwatch.h"

struct process {
    const char *const *arguments;
};

/* Starts it with its output thrown away, and waits for its end. */
static bool run_process(void *self)
{
    const struct process *process = self;
    char *arguments[4] = {NULL};
    for (int k = 0; k < 3 && process->arguments[k] != NULL; k++) {
        /* posix_spawn only reads them */
        arguments[k] =
            (char *)(size_t)process->arguments[k]; /* NOLINT(performance-no-int-to-ptr) */
    }
    if (arguments[0] == NULL) {
        return false;
    }
    posix_spawn_file_actions_t actions;
    if (posix_spawn_file_actions_init(&actions) != 0) {
        return false;
    }
    pid_t pid;
    char *const empty[] = {NULL};
    const bool started =
        posix_spawn_file_actions_addopen(&actions, STDOUT_FILENO, "/dev/null", O_WRONLY, 0) == 0 &&
        posix_spawn(&pid, arguments[0], &actions, NULL, arguments, empty) == 0;
    posix_spawn_file_actions_destroy(&actions);
    int status = 0;
    return started && waitpid(pid, &status, 0) == pid && WIFEXITED(status) &&
           WEXITSTATUS(status) == 0;
}

void bench_review(const struct bench_options *options, struct bench_result *result)
{
    static const char *const review[] = {AMPSTEAD_PROGRAM, AMPSTEAD_CELLS "/cascode_mirror.cell",
                                         NULL};
    static const char *const version[] = {AMPSTEAD_PROGRAM, "--version", NULL};
    static const char *const nothing[] = {BENCH_NOTHING, NULL};
    struct process processes[] = {{review}, {nothing}, {version}};
    struct contender all[] = {{.run = run_process, .self = &processes[0]},
                              {.run = run_process, .self = &processes[1]},
                              {.run = run_process, .self = &processes[2]}};
    double ratios[2];
    if (!stopwatch_race(all, 3, options, CLOCK_WALL, ratios)) {
        result->trouble = "a process did not end well";
        return;
    }
    result->ratio = all[0].seconds / all[1].seconds;
    result->least = ratios[0];
    result->most = ratios[1];
    bench_add(result, "review", all[0].seconds, "s");
    bench_add(result, "nothing", all[1].seconds, "s");
    bench_add(result, "program_start", all[2].seconds, "s");
    if (stopwatch_race(all, 2, options, CLOCK_CHILDREN, NULL)) {
        bench_add(result, "ratio_of_processor_time", all[0].seconds / all[1].seconds, "");
    }
}
