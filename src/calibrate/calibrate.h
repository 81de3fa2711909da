/*
 * calibrate.h: measured curves to a model: the request, and the result as plain data.
 *
 * Layer above devices and language; knows no circuit. Stages for transistors with a geometry: one
 * card for each device, then one set for all of them with a threshold offset a device.
 */
#ifndef CALIBRATE_CALIBRATE_H
#define CALIBRATE_CALIBRATE_H

#include "calibrate/measured.h"
#include "devices/device.h"

/* One file of the request. Texts of NULL: not given. */
struct calibration_file {
    const char *path;
    const char *width, *length; /* "7u" */
    bool is_held;               /* only predicted */
};

enum calibration_form {
    FORM_AUTOMATIC, /* one file: a card; several: cards and set */
    FORM_CARDS,
    FORM_SET,
    FORM_BOTH
};

/* Everything is borrowed and must outlive the result. */
struct calibration_request {
    const char
        *kind; /* "nmos", "pmos", "diode", "resistor", "npn", "pnp"; NULL: as the list says */
    const struct calibration_file *files; /* [file_count] */
    int file_count;
    const char *list;        /* CSV file of files; NULL: none */
    const char *size;        /* "7u/8u" for files without one of their own; NULL */
    const char *columns;     /* "vgs=VG, id=-ID uA"; NULL */
    const char *temperature; /* "27 C"; NULL: 25 C, said to be assumed */
    const char *model;       /* name of the model; NULL: the kind */
    const char *noise;       /* noise floor, "2 nA"; NULL: CALIBRATION_NOISE */
    const char *relative;    /* relative error of a reading, "1%"; NULL: CALIBRATION_RELATIVE */
    enum calibration_form form;
    bool is_robust;              /* doubtful readings are kept out */
    bool (*stopped)(void *self); /* NULL: never */
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share); /* NULL: none */
    void *progress_self;
};

#define CALIBRATION_NOISE 2e-9           /* A */
#define CALIBRATION_NOISE_JUNCTION 1e-12 /* A, where no device has a geometry */
#define CALIBRATION_RELATIVE 0.01        /* of the reading */
#define CALIBRATION_KELVIN 298.15

/* How a value came about. */
enum origin {
    ORIGIN_FITTED,
    ORIGIN_LIMIT,   /* fitted, and stopped at the end of its range */
    ORIGIN_HELD,    /* the data cannot tell it */
    ORIGIN_SHAPE,   /* fixed by the form of the model */
    ORIGIN_DEFAULT, /* not looked for */
    ORIGIN_COUNT
};

struct fitted_value {
    const struct parameter *parameter;
    double value;
    double standard; /* standard error; NAN unless fitted */
    enum origin origin;
    const char *reason; /* of ORIGIN_HELD and ORIGIN_SHAPE; NULL otherwise */
};

struct correlated {
    int a, b; /* indices of values; -1 - k: the threshold offset of device k */
    double value;
};

/* Error of the model on one device, relative; NAN where there is no such reading. */
enum region_of_figures { FIGURES_SATURATION, FIGURES_TRIODE, FIGURES_WEAK, FIGURES_REGIONS };

struct misfit {
    double rms, worst; /* worst: with its sign */
    int count;         /* readings or curves */
};

struct device_figures {
    struct misfit id[FIGURES_REGIONS];
    struct misfit gm, gds;
    struct misfit ib; /* bipolar base current */
};

/* One model over one or more devices. */
struct fit {
    const char *name;
    const struct device_type *type;
    bool is_set;
    bool is_written;             /* goes into the process file */
    const char *remark;          /* why not, or what it stands for; NULL */
    const char *alias_of;        /* the same values as this model; NULL */
    struct fitted_value *values; /* in the order of the type's table */
    int value_count;
    struct correlated *correlations; /* above 0.95 in size */
    int correlation_count;
    int free_count, rank, residual_count, evaluations;
    double reduced; /* sum of squares per degree of freedom */
    const char *ended;
    int *devices; /* [device_count] of the calibration, the fitted ones */
    int device_count;
    double *offsets, *offset_errors; /* [device_count] V, of a set; NULL otherwise */
    double length_range[2], width_range[2], kelvin_range[2];
};

/* Relative error of the current along one sweep, for a chart: the gate sweep of a transistor with
 * the most drain voltage. */
struct error_curve {
    double *x, *y; /* [count] V rising, relative */
    int count;
    const char *voltage; /* "vgs" */
};

/* One line of the table: a device under a fit. */
struct comparison {
    int device, fit;
    bool is_held;
    double offset; /* V, threshold offset in force */
    struct device_figures figures;
    struct error_curve curve;
};

enum { MOS_BODY_LIMIT = 16 };

/* What the data of a device say before any fit. */
struct mos_facts {
    double threshold;    /* V, constant-current, at the least body and drain voltage */
    double kprime;       /* A/V^2, from the steepest transconductance */
    double slope_factor; /* from the subthreshold part */
    double early;        /* V, of this length at onset 0.1 V; NAN without drain sweep */
    double body_threshold[MOS_BODY_LIMIT], body_voltage[MOS_BODY_LIMIT]; /* rising */
    int body_count;
    bool has_drain_sweep; /* beyond 0.6 V */
    double drain_most;    /* V */
};

struct calibrated_device {
    struct measured data;
    const struct device_type *type; /* NULL: resistor */
    bool is_held;
    bool is_out;            /* of the set; its current does not fit the others */
    struct mos_facts facts; /* of transistors with a geometry */
    const char *channel;    /* kind word */
    double unit_ratio;      /* its kprime over the median of the others; NAN */
};

/* A remark to the user; the list is in the order of the devices. */
struct calibration_remark {
    const char *code; /* "noise", "outlier", ... */
    int device;       /* -1: none */
    const char *text;
};

/* A fitted resistor is a line of a cell, not a model. */
struct fitted_resistor {
    int device;
    double ohm, tempco, tempco2;                   /* NAN: not looked for */
    double ohm_error, tempco_error, tempco2_error; /* standard errors */
    double kelvin;                                 /* at which ohm holds */
    double reduced;
};

struct calibration {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct calibrated_device *devices;
    int device_count;
    struct fit *fits;
    int fit_count;
    struct comparison *comparisons;
    int comparison_count;
    struct fitted_resistor *resistors;
    int resistor_count;
    struct calibration_remark *remarks;
    int remark_count, remark_capacity;
    double noise, relative; /* A, 1 */
    double measured_kelvin;
    bool is_temperature_assumed;
    bool is_robust;
};

/*
 * calibration_run: reads the curves and fits.
 *
 * result  out: owned by the caller (calibration_free), also after errors, whose texts are in its
 *         diagnostics; NULL only when there was not even memory for that
 *
 * Returns STATUS_OK, STATUS_INPUT, STATUS_MEMORY or STATUS_STOPPED.
 */
enum status calibration_run(const struct calibration_request *request, struct calibration **result);

/*
 * calibration_trace: what the model of a comparison says to each reading of its device, in the
 * column of its current (A).
 *
 * values  [rows of the device] out; NAN where the readings give no voltage
 */
void calibration_trace(const struct calibration *calibration, const struct comparison *comparison,
                       double *values);

/* The column of a device's current: id, ic or i. */
enum column calibration_current(const struct calibrated_device *device);

/* NULL is allowed. */
void calibration_free(struct calibration *calibration);

/* "saturation": names of the regions, for reports. */
extern const char *const figures_region_names[FIGURES_REGIONS];

#endif
