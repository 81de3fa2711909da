/* live.h: the page that reloads itself while the program watches. */
#ifndef CLI_LIVE_H
#define CLI_LIVE_H

#include <stdbool.h>

/*
 * live_write: writes the page with a script that asks a small file beside it, PATH.live.js, for the
 * number of the newest version, and reloads when that is another. A page opened from a disk may
 * load such a file, and nothing else that tells it of a change.
 *
 * False after a message to standard error.
 */
bool live_write(const char *path, const char *page, int version);

/* Writes the page as it is for good, and removes the small file. */
bool live_end(const char *path, const char *page);

#endif
