/*
 * workers.c: threads that take piece after piece from one counter.
 */
#include "base/workers.h"

#include <pthread.h>
#include <stdatomic.h>
#include <stddef.h>
#include <unistd.h>

struct workers {
    const struct workers_task *task;
    atomic_int next;   /* piece */
    atomic_int done;   /* pieces */
    atomic_int status; /* the first that was not STATUS_OK */
};

int workers_jobs(int wanted, int count)
{
    long jobs = wanted > 0 ? wanted : sysconf(_SC_NPROCESSORS_ONLN);
    jobs = jobs > count ? count : jobs;
    jobs = jobs > WORKERS_LIMIT ? WORKERS_LIMIT : jobs;
    return jobs < 1 ? 1 : (int)jobs;
}

static void end_with(struct workers *all, enum status status)
{
    int well = STATUS_OK;
    (void)atomic_compare_exchange_strong(&all->status, &well, (int)status);
}

bool worker_stopped(void *worker)
{
    const struct worker *me = worker;
    struct workers *all = me->all;
    const struct workers_task *task = all->task;
    if (me->number == 0 && task->stopped != NULL && task->stopped(task->stopped_self)) {
        end_with(all, STATUS_STOPPED);
    }
    return atomic_load(&all->status) != STATUS_OK;
}

static void *work(void *self)
{
    struct worker *me = self;
    struct workers *all = me->all;
    const struct workers_task *task = all->task;
    while (!worker_stopped(me)) {
        const int piece = atomic_fetch_add(&all->next, 1);
        if (piece >= task->count) {
            break;
        }
        const enum status status = task->piece(task->self, me, piece);
        if (status != STATUS_OK) {
            end_with(all, status);
            break;
        }
        const int done = atomic_fetch_add(&all->done, 1) + 1;
        if (me->number == 0 && task->progress != NULL) {
            task->progress(task->progress_self, task->what, (double)done / task->count);
        }
    }
    return NULL;
}

enum status workers_run(const struct workers_task *task)
{
    struct workers all = {.task = task};
    struct worker me[WORKERS_LIMIT];
    pthread_t threads[WORKERS_LIMIT];
    int started = 1;
    for (int k = 0; k < WORKERS_LIMIT; k++) {
        me[k] = (struct worker){k, &all};
    }
    while (started < task->jobs && started < WORKERS_LIMIT &&
           pthread_create(&threads[started], NULL, work, &me[started]) == 0) {
        started++;
    }
    (void)work(&me[0]);
    for (int k = 1; k < started; k++) {
        (void)pthread_join(threads[k], NULL);
    }
    return (enum status)atomic_load(&all.status);
}
