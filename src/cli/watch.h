/* watch.h: waits until one of a few files was saved again. */
#ifndef CLI_WATCH_H
#define CLI_WATCH_H

#include <signal.h>
#include <stdbool.h>
#include <stddef.h>
#include <sys/types.h>
#include <time.h>

enum { WATCH_FILE_LIMIT = 32 };

/* What tells one state of a file from another. */
struct watch_stamp {
    bool exists;
    struct timespec changed;
    off_t size;
    ino_t inode;
};

struct watch_file {
    char *path; /* owned */
    struct watch_stamp stamp;
};

struct watcher {
    int notices; /* of inotify; -1: none, the files are looked at every so often */
    struct watch_file files[WATCH_FILE_LIMIT];
    int file_count;
};

/* Begins to watch; more than WATCH_FILE_LIMIT files are ignored. */
void watcher_open(struct watcher *watcher);

/* Adds a file with the state it is in now; one that is watched already is left alone. */
void watcher_add(struct watcher *watcher, const char *path);

/* Waits until a file has changed and has rested for a moment, so that a half-saved one is not read;
 * one that is missing or empty is waited for. False: *stop became not 0. */
bool watcher_wait(struct watcher *watcher, const volatile sig_atomic_t *stop);

void watcher_close(struct watcher *watcher);

#endif
