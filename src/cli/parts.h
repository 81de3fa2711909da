/* parts.h: parts of a sampled run: from files, and to one. */
#ifndef CLI_PARTS_H
#define CLI_PARTS_H

#include "cli/options.h"
#include "library/ampstead.h"

/* Reads all files of the command line. NULL after a message; *status is then the exit status. */
struct ampstead_part *part_files_read(const struct options *options, int *status);
void part_files_free(struct ampstead_part *parts, int count);

/* Whether --part, --write and where results go are of one mind; false after a message. */
bool part_files_check(const struct options *options);

/* The part to where --write says. Returns the exit status. */
int parts_deliver(const struct options *options, struct ampstead_result *result);

#endif
