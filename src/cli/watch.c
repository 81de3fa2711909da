/*
 * watch.c: waits for saved files. inotify wakes it early; what decides is always a look at the
 * files, so that network folders, editors that rename, and systems without inotify work alike.
 */
#include "cli/watch.h"

#include <poll.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#ifdef __linux__
#include <sys/inotify.h>
#endif

enum { REST_MS = 60, LOOK_MS = 400 };

static struct watch_stamp stamp_of(const char *path)
{
    struct watch_stamp stamp = {.exists = false};
    struct stat found;
    if (stat(path, &found) == 0) {
        stamp.exists = true;
        stamp.changed = found.st_mtim;
        stamp.size = found.st_size;
        stamp.inode = found.st_ino;
    }
    return stamp;
}

static bool same_stamp(const struct watch_stamp *a, const struct watch_stamp *b)
{
    return a->exists == b->exists && a->size == b->size && a->inode == b->inode &&
           a->changed.tv_sec == b->changed.tv_sec && a->changed.tv_nsec == b->changed.tv_nsec;
}

void watcher_open(struct watcher *watcher)
{
    *watcher = (struct watcher){.notices = -1};
#ifdef __linux__
    watcher->notices = inotify_init1(IN_NONBLOCK | IN_CLOEXEC);
#endif
}

/* Folders are watched, not files: an editor that saves by renaming makes a new file. */
static void watch_folder(struct watcher *watcher, const char *path)
{
#ifdef __linux__
    const char *slash = strrchr(path, '/');
    char *folder = slash == NULL   ? strdup(".")
                   : slash == path ? strdup("/")
                                   : strndup(path, (size_t)(slash - path));
    if (folder != NULL && watcher->notices >= 0) {
        (void)inotify_add_watch(watcher->notices, folder,
                                IN_CLOSE_WRITE | IN_MOVED_TO | IN_CREATE | IN_DELETE);
    }
    free(folder);
#else
    (void)watcher;
    (void)path;
#endif
}

void watcher_add(struct watcher *watcher, const char *path)
{
    for (int k = 0; k < watcher->file_count; k++) {
        if (strcmp(watcher->files[k].path, path) == 0) {
            return;
        }
    }
    char *copy = watcher->file_count < WATCH_FILE_LIMIT ? strdup(path) : NULL;
    if (copy != NULL) {
        watcher->files[watcher->file_count++] = (struct watch_file){copy, stamp_of(path)};
        watch_folder(watcher, path);
    }
}

/* Sleeps until something happens in a watched folder, at most `milliseconds`. */
static void doze(const struct watcher *watcher, int milliseconds)
{
    struct pollfd wait = {.fd = watcher->notices, .events = POLLIN, .revents = 0};
    char notices[4096];
    (void)poll(&wait, watcher->notices >= 0 ? 1 : 0, milliseconds);
    while (watcher->notices >= 0 && read(watcher->notices, notices, sizeof notices) > 0) {
    }
}

/* Takes the state of the files; true when one has another than before. */
static bool look(struct watcher *watcher)
{
    bool has_changed = false;
    for (int k = 0; k < watcher->file_count; k++) {
        struct watch_stamp now = stamp_of(watcher->files[k].path);
        has_changed = has_changed || !same_stamp(&now, &watcher->files[k].stamp);
        watcher->files[k].stamp = now;
    }
    return has_changed;
}

static bool all_there(const struct watcher *watcher)
{
    for (int k = 0; k < watcher->file_count; k++) {
        if (!watcher->files[k].stamp.exists || watcher->files[k].stamp.size == 0) {
            return false;
        }
    }
    return true;
}

bool watcher_wait(struct watcher *watcher, const volatile sig_atomic_t *stop)
{
    bool has_changed = false;
    while (*stop == 0) {
        if (look(watcher)) {
            has_changed = true; /* and look again after a rest */
            doze(watcher, REST_MS);
        } else if (has_changed && all_there(watcher)) {
            return true;
        } else {
            doze(watcher, LOOK_MS);
        }
    }
    return false;
}

void watcher_close(struct watcher *watcher)
{
    for (int k = 0; k < watcher->file_count; k++) {
        free(watcher->files[k].path);
    }
    watcher->file_count = 0;
    if (watcher->notices >= 0) {
        (void)close(watcher->notices);
    }
}
