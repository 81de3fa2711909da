/* parts.c: parts of a sampled run: from files, and to one. */
#include "cli/parts.h"

#include <errno.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "cli/output.h"

static int read_file(const char *path, struct ampstead_part *part)
{
    char block[65536];
    struct buffer text = BUFFER_EMPTY;
    FILE *file = fopen(path, "rb");
    int error = file == NULL ? errno : 0;
    while (error == 0) {
        const size_t length = fread(block, 1, sizeof block, file);
        buffer_put(&text, block, length);
        if (length < sizeof block) {
            error = ferror(file) ? errno : 0;
            break;
        }
    }
    if (file != NULL) {
        (void)fclose(file);
    }
    if (error != 0) {
        fprintf(stderr, "ampstead: %s: cannot be read: %s\n", path, strerror(error));
        buffer_free(&text);
        return AMPSTEAD_INPUT;
    }
    if (text.failed) {
        fputs("ampstead: memory is short\n", stderr);
        buffer_free(&text);
        return AMPSTEAD_MACHINE;
    }
    *part = (struct ampstead_part){path, text.data == NULL ? calloc(1, 1) : text.data, text.length};
    return part->text == NULL ? AMPSTEAD_MACHINE : AMPSTEAD_WELL;
}

struct ampstead_part *part_files_read(const struct options *options, int *status)
{
    const int count = options->word_count - 1;
    struct ampstead_part *parts = calloc((size_t)count + 1, sizeof *parts);
    *status = AMPSTEAD_MACHINE;
    for (int k = 0; parts != NULL && k < count; k++) {
        *status = read_file(options->words[k + 1], &parts[k]);
        if (*status != AMPSTEAD_WELL) {
            part_files_free(parts, count);
            return NULL;
        }
    }
    return parts;
}

void part_files_free(struct ampstead_part *parts, int count)
{
    for (int k = 0; parts != NULL && k < count; k++) {
        free((void *)(uintptr_t)parts[k].text); /* NOLINT(performance-no-int-to-ptr) */
    }
    free(parts);
}

bool part_files_check(const struct options *options)
{
    static const enum option results[] = {OPTION_JSON, OPTION_CSV, OPTION_PLOT, OPTION_PAGE,
                                          OPTION_WATCH};
    if (options->verb != VERB_SPREAD) {
        return true;
    }
    if (options->given[OPTION_WRITE] && !options->given[OPTION_PART]) {
        fputs("ampstead: '--write' writes a part of a spread: it wants --part K/N\n", stderr);
        return false;
    }
    for (size_t k = 0; k < sizeof results / sizeof results[0]; k++) {
        if (options->given[OPTION_PART] && options->given[results[k]]) {
            fprintf(stderr, "ampstead: '--%s' does not go with --part: a part is for `merge`\n",
                    option_rows[results[k]].name);
            return false;
        }
    }
    return true;
}

int parts_deliver(const struct options *options, struct ampstead_result *result)
{
    const char *text = ampstead_result_part(result);
    return output_deliver(options->values[OPTION_WRITE], text) ? AMPSTEAD_WELL : AMPSTEAD_MACHINE;
}
