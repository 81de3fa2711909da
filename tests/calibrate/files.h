/*
 * files.h: files of curves for the tests, in a folder that goes with the test.
 */
#ifndef TESTS_CALIBRATE_FILES_H
#define TESTS_CALIBRATE_FILES_H

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

#include "calibrate/calibrate.h"

enum { PATH_SIZE = 512 };

struct curve_file {
    char path[PATH_SIZE];
    FILE *out;
};

/* Begins a file with its heading. */
static inline void begin_file(struct curve_file *file, const char *heading)
{
    const char *folder = getenv("TMPDIR");
    snprintf(file->path, sizeof file->path, "%s/ampstead-curves-XXXXXX",
             folder == NULL ? "/tmp" : folder);
    int handle = mkstemp(file->path);
    assert_true(handle >= 0);
    file->out = fdopen(handle, "w");
    assert_non_null(file->out);
    fprintf(file->out, "%s\n", heading);
}

static inline void end_file(struct curve_file *file)
{
    assert_int_equal(fclose(file->out), 0);
}

static inline void remove_file(struct curve_file *file)
{
    (void)unlink(file->path);
}

static inline const struct fitted_value *value_of(const struct fit *fit, const char *name)
{
    for (int k = 0; k < fit->value_count; k++) {
        if (strcmp(fit->values[k].parameter->name, name) == 0) {
            return &fit->values[k];
        }
    }
    fail_msg("no value %s", name);
    return NULL;
}

/* Runs, and shows the errors where it should have gone well. */
static inline struct calibration *calibrate(const struct calibration_request *request)
{
    struct calibration *c = NULL;
    enum status status = calibration_run(request, &c);
    if (status != STATUS_OK) {
        struct buffer out = BUFFER_EMPTY;
        diagnostics_print(&c->diagnostics, &c->sources, false, &out);
        print_error("%s", out.data == NULL ? "(no message)\n" : out.data);
        buffer_free(&out);
        fail_msg("status %d", (int)status);
    }
    return c;
}

#endif
