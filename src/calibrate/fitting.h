/*
 * fitting.h: the part that all fits share: which values are looked for, the search, and fixing what
 * the data do not tell. Private to calibrate/.
 */
#ifndef CALIBRATE_FITTING_H
#define CALIBRATE_FITTING_H

#include "calibrate/calibrate.h"
#include "calibrate/least_squares.h"

enum { MODEL_VALUE_LIMIT = 48, OWN_VALUE_LIMIT = 8, PREPARED_SIZE_LIMIT = 64 };

/* What a value needs from the data before it is looked for. */
enum need {
    NEED_BODY = 1 << 0,         /* more than one body voltage */
    NEED_DRAIN = 1 << 1,        /* drain sweeps in saturation */
    NEED_LENGTHS = 1 << 2,      /* devices of different length */
    NEED_WIDTHS = 1 << 3,       /* devices of different width */
    NEED_TEMPERATURES = 1 << 4, /* more than one temperature */
    NEED_SET = 1 << 5,          /* only a scalable set has it */
    NEED_SHORT = 1 << 6,        /* devices on both sides of 0.3 um */
    NEED_BREAKDOWN = 1 << 7,    /* reverse current far above the noise */
    NEED_COLLECTOR = 1 << 8,    /* more than one collector voltage in normal operation */
    NEED_BASE = 1 << 9,         /* readings of the base current, or with a forced one */
    NEED_SATURATION = 1 << 10,  /* collector voltages below 0.3 V */
    NEED_VBE = 1 << 11,         /* base voltages */
    NEED_SHAPE = 1 << 12        /* four lengths and more: they show the shape of a law in L */
};

/* A value that a fit may look for. */
struct sought {
    const char *name;
    struct bounded bound;
    double start;
    double held;   /* its value when the data cannot tell; NAN: that of the device table */
    double coarse; /* a standard error above this tells nothing; relative where logarithmic */
    unsigned needs;
};

/* How a sought value stands in a fit. */
struct standing {
    enum origin origin;
    const char *reason;
};

/* One search. The problem of a device family begins with it. */
struct fitting {
    const struct calibration_request *request;
    const struct device_type *type;
    const struct sought *sought; /* [sought_count] */
    int sought_count;
    struct standing *standings; /* [sought_count] */
    struct bounded *ranges;     /* [sought_count] the bounds in this search */
    double model[MODEL_VALUE_LIMIT];
    int free_rows[LEAST_SQUARES_LIMIT];   /* rows of sought */
    int free_values[LEAST_SQUARES_LIMIT]; /* their places in model */
    struct bounded bounds[LEAST_SQUARES_LIMIT];
    int free_count;
    int offset_count; /* threshold offsets, behind the free values */
    int residual_count;
    /* as in least_squares.h; self is the fitting, whose model was brought up to date */
    void (*evaluate)(struct fitting *fitting, const double *offsets, double *residuals,
                     double *jacobian);
};

/* Fills the devices and ranges of a fit, and the tables of a fitting, whose type, request, sought
 * and sought_count are set: defaults, ranges, and what `abilities` (sum of enum need) lack. Start
 * values are those of the table. False when memory is short. */
bool fitting_begin(struct calibration *calibration, struct fitting *fitting, struct fit *fit,
                   const int *list, int count, unsigned abilities);

/* Place of a model parameter; sets its start. */
int fitting_place(const struct device_type *type, const char *name);
void fitting_start(struct fitting *fitting, const char *name, double value);

/* Fits, fixes what the data do not tell, fits again, until all that is free is told; then fills the
 * fit. */
enum status fitting_solve(struct calibration *calibration, struct fitting *fitting,
                          struct fit *fit);

/* The model values of a fit, [model_parameter_count]. */
void fitting_values(const struct fit *fit, double *model);

/* Adds a relative error to a figure; makes it the root mean square at the end. */
void misfit_add(struct misfit *figure, double error);
void misfit_finish(struct misfit *figure);

#endif
