/*
 * measured.h: measured curves as they were read, and the sweeps they fall into. Private to
 * calibrate/ but for its plain data, which reports read.
 */
#ifndef CALIBRATE_MEASURED_H
#define CALIBRATE_MEASURED_H

#include "base/diagnostic.h"
#include "base/quantity.h"
#include "base/status.h"

/* What a column of a file may hold. */
enum column {
    COLUMN_VGS,
    COLUMN_VDS,
    COLUMN_VSB,
    COLUMN_ID,
    COLUMN_V,
    COLUMN_I,
    COLUMN_VBE,
    COLUMN_VCE,
    COLUMN_IC,
    COLUMN_IB,
    COLUMN_TEMPERATURE,
    COLUMN_COUNT
};

struct column_row {
    const char *name;
    struct dimension dimension;
};
extern const struct column_row column_rows[COLUMN_COUNT];

struct measured_row {
    double value[COLUMN_COUNT]; /* SI; NAN where the file has no such column */
    uint32_t begin, end;        /* bytes of the line */
    int kelvin;                 /* index into the temperatures of its device */
    int sweep;                  /* index into the sweeps of its device */
    bool is_left_out;           /* not fitted */
};

/* A run of rows in which one voltage moves. */
struct measured_sweep {
    int first, count;  /* rows */
    enum column moved; /* the voltage that moves */
    double doubt;      /* A, how far it contradicts another sweep; 0: not at all */
};

enum {
    MEASURED_TEMPERATURE_LIMIT = 16,
    MEASURED_ROW_LIMIT = 100000,
    MEASURED_REPLACEMENT_LIMIT = 16
};

/* One device: one file. */
struct measured {
    const char *name;     /* the file as the user named it */
    uint32_t file;        /* index of its source */
    double width, length; /* m; NAN for devices without */
    double multiplicity;  /* equal devices in parallel, or area */
    struct measured_row *rows;
    int row_count;
    struct measured_sweep *sweeps;
    int sweep_count;
    double kelvins[MEASURED_TEMPERATURE_LIMIT];
    int kelvin_count;
    bool has_column[COLUMN_COUNT];
    const char *unused; /* name of a column that has no meaning here; NULL: none */
};

/* "vgs = -VG mV": where a column comes from. */
struct replacement {
    enum column column;
    const char *header; /* as in the file */
    double factor;      /* to SI, with the sign */
};

struct measured_context {
    struct arena *arena;
    struct source_set *sources;
    struct diagnostics *diagnostics;
    const struct replacement *replacements; /* [replacement_count] */
    int replacement_count;
};

/*
 * measured_replacements: reads "vgs=VG mV, id=-ID uA" (file: the source that holds it) into
 * list[MEASURED_REPLACEMENT_LIMIT]. Returns the number, or -1 after an error.
 */
int measured_replacements(struct measured_context *context, uint32_t file,
                          struct replacement *list);

/*
 * measured_read: the rows of a source as columns wanted[wanted_count] of a device.
 *
 * kelvin    temperature of rows without one of their own
 * optional  [optional_count] columns that may be missing (0 V, or the temperature)
 *
 * Every bad row is an error with its place. Returns STATUS_OK, STATUS_INPUT or STATUS_MEMORY.
 */
enum status measured_read(struct measured_context *context, struct measured *device, double kelvin,
                          const enum column *wanted, int wanted_count, const enum column *optional,
                          int optional_count);

/* Splits the rows into sweeps along the voltages[count]; false when memory is short. */
bool measured_find_sweeps(struct arena *arena, struct measured *device, const enum column *voltages,
                          int count);

#endif
