/*
 * workers.h: pieces of work over threads.
 */
#ifndef BASE_WORKERS_H
#define BASE_WORKERS_H

#include <stdbool.h>

#include "base/status.h"

enum { WORKERS_LIMIT = 256 };

/* One thread at work. */
struct worker {
    int number; /* 0 .. jobs - 1: each thread may keep its own tools; 0 is the caller's thread */
    struct workers *all;
};

struct workers_task {
    void *self;
    int count; /* pieces, numbered 0 .. count - 1 */
    int jobs;  /* from workers_jobs */

    /* Does one piece. A status other than STATUS_OK ends the work. */
    enum status (*piece)(void *self, struct worker *worker, int index);

    /* Both are asked on the caller's thread only; NULL: never. */
    bool (*stopped)(void *self);
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share);
    void *progress_self;
    const char *what; /* for progress */
};

/* Threads for `count` pieces: `wanted`, or one a processor when that is 0; 1 to WORKERS_LIMIT. */
int workers_jobs(int wanted, int count);

/*
 * workers_run: does all pieces, in no order that may be relied on. Threads that cannot be started
 * are done without.
 *
 * Returns STATUS_OK, the first status that a piece returned, or STATUS_STOPPED.
 */
enum status workers_run(const struct workers_task *task);

/* Whether the work is to end, for long pieces; `worker` is a struct worker. */
bool worker_stopped(void *worker);

#endif
