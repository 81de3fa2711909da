/*
 * device.h: what a device is to the rest of the program: one const table.
 *
 * A device knows no node and no circuit. It is a pure function from the voltages of its terminals
 * (and its own branch currents) to the currents into its terminals (and the errors of its branch
 * equations), with exact derivatives. Everything a user sees of it (its word, terminals,
 * parameters, units, defaults, limits, quantities) stands in its table once; parsing, checks, help,
 * reports and docs/devices.md read it there.
 *
 * Sign rule: a current is positive INTO the terminal. P-channel and pnp devices are the n-channel
 * and npn ones reflected; their functions do it themselves, by the polarity in the prepared block.
 */
#ifndef DEVICES_DEVICE_H
#define DEVICES_DEVICE_H

#include <math.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/quantity.h"

/* Boltzmann constant over elementary charge, V/K: both exact in the SI of 2019. */
#define BOLTZMANN_OVER_CHARGE (1.380649e-23 / 1.602176634e-19)

/* The effects that lie between the hand view (none) and the full view (all). */
enum effect {
    EFFECT_MODULATION = 1 << 0,  /* channel-length modulation, Early effect */
    EFFECT_BODY = 1 << 1,        /* body effect */
    EFFECT_INVERSION = 1 << 2,   /* weak and moderate inversion */
    EFFECT_MOBILITY = 1 << 3,    /* mobility reduction and velocity saturation */
    EFFECT_BARRIER = 1 << 4,     /* drain-induced barrier lowering */
    EFFECT_GAIN = 1 << 5,        /* finite beta, knee, series resistance */
    EFFECT_LEAKAGE = 1 << 6,     /* junction leakage */
    EFFECT_GEOMETRY = 1 << 7,    /* length and width offsets, halo and narrow-channel terms */
    EFFECT_TEMPERATURE = 1 << 8, /* the cell's temperature instead of that of the model values */
    EFFECT_COUNT = 9,
    EFFECTS_HAND = 0,
    EFFECTS_FULL = (1 << 9) - 1
};

/* Name of an effect by bit number 0..EFFECT_COUNT-1: "channel-length modulation", ... */
const char *effect_name(int bit);

/* NAN as a parameter value means "none": the effect is off. */
#define PARAMETER_NONE NAN

enum parameter_default {
    DEFAULT_REQUIRED, /* must be given */
    DEFAULT_VALUE,    /* `standard` when left out */
    DEFAULT_NONE,     /* none when left out */
    DEFAULT_HIDDEN    /* cannot be written; `standard`; set by mismatch and sensitivity */
};

struct parameter {
    const char *name;
    struct dimension dimension;
    enum parameter_default when_absent;
    double standard;
    double least, most; /* allowed range; -INFINITY, INFINITY */
    bool above_least;   /* the value `least` itself is not allowed */
    const char *text;   /* meaning, for help */
};

/* A quantity that a report shows and a requirement may name. */
struct quantity_row {
    const char *name;
    struct dimension dimension;
    const char *text;
};

struct terminal {
    const char *name; /* "d"; for arrow forms "a", "b" */
    const char *text;
    bool optional;
    const char *joined_to; /* optional terminals: the terminal it takes the node of when left out,
                              "gnd", or NULL: the circuit layer decides (MOS bulk) */
};

enum device_form {
    FORM_PINS, /* nmos M1 d=a g=b s=c ... */
    FORM_ARROW /* resistor R1 a -> b 47k ... */
};

/* A resistance parameter of the model that puts a hidden node in front of a terminal. The circuit
 * layer makes the hidden node and its resistor; evaluate is the device behind it. The resistance
 * belongs to EFFECT_GAIN: without that effect the circuit layer takes it as 0. */
struct series_row {
    int terminal;
    const char *model_parameter; /* ohm, of area 1; divided by area*m */
};

/* Most unknowns that one device sees: a law of 16 node voltages. */
enum { DEVICE_LOCAL_LIMIT = 18 };

struct device_conditions {
    double kelvin;          /* of the analysis */
    double measured_kelvin; /* at which the model values hold */
    unsigned effects;       /* sum of enum effect */
    double inversion_cut;   /* of MOS: 0 all-region; towards 1 (excluded) the square law, for a
                               search that goes from one to the other */
};

/* Values in the order of the tables; PARAMETER_NONE for none. */
struct device_values {
    const double *own;      /* instance parameters */
    const double *model;    /* model parameters; NULL when the device has no model */
    const void *extra;      /* law program or curve; NULL otherwise */
    double resistor_factor; /* corner and tolerance scale of every resistor; 1 otherwise */
};

/* One region in words for a report, a bit set that analyses may test. */
enum region {
    REGION_NONE = 0, /* the device has none (resistor) */
    REGION_OFF = 1 << 0,
    REGION_WEAK = 1 << 1,
    REGION_MODERATE = 1 << 2,
    REGION_STRONG = 1 << 3,
    REGION_ON = 1 << 4,        /* a bipolar, JFET or diode that conducts */
    REGION_SATURATED = 1 << 5, /* holds its current: MOS/JFET saturated; bipolar above its
                                  saturation voltage */
    REGION_TRIODE = 1 << 6,    /* for a bipolar: "saturated" in its own jargon; said in words as
                                  "out of headroom" */
    REGION_REVERSED = 1 << 7,
    REGION_BREAKDOWN = 1 << 8
};

/* How a shift of a hidden parameter shows in the prepared block. */
enum deviate_rule {
    DEVIATE_ADDS,  /* value + shift */
    DEVIATE_SCALES /* value (1 + shift), and some floor where 1 + shift is below 1e-3 */
};

/* What a mismatch deviate does: adds sigma * normal to a hidden instance parameter. */
struct deviate {
    const char *cause; /* "threshold", "gain", "saturation current", "value" */
    int own_parameter; /* index of the hidden instance parameter */
    double (*sigma)(const struct device_values *values);
    /* The one double of the prepared block that follows it, so that many samples are prepared
     * without calling prepare; the equations read it through MOVED (real.h). */
    enum deviate_rule rule;
    size_t moved;
};

/* What `extra` points to. */
enum device_extra { EXTRA_NONE, EXTRA_LAW, EXTRA_CURVE };

struct device_type {
    const char *word;    /* "nmos" */
    const char *summary; /* one line */
    enum device_form form;
    bool is_resistor;
    int polarity;                          /* +1, -1; 0 where it has no meaning */
    const struct device_type *alternative; /* same word, another form; NULL: none */
    const char *alternative_key;           /* the parameter that selects it ("conduction") */
    enum device_extra extra_kind;
    bool is_transistor; /* counts for headroom and compliance */
    const struct terminal *terminals;
    int terminal_count;
    int branch_count;                   /* own unknown currents, A, after the terminals */
    const struct parameter *parameters; /* of the instance */
    int parameter_count;
    int value_parameter;    /* arrow forms: index of the positional value; -1 none */
    const char *model_kind; /* NULL: no model */
    const struct parameter *model_parameters;
    int model_parameter_count;
    bool model_optional; /* all defaults when no model is named and no process has one */
    const struct series_row *series;
    int series_count;
    const struct quantity_row *quantities;
    int quantity_count;
    int quantity_current;  /* index of the main current ("id", "ic", "i") */
    int quantity_headroom; /* -1 none */
    int quantity_power;    /* -1 none */
    const struct deviate *deviates;
    int deviate_count;
    const struct deviate *tolerance; /* the maker's: even between -sigma sqrt(3) and +sigma sqrt(3),
                                        added to a value that a deviate may move too; NULL: none */
    size_t prepared_size;

    /*
     * check: rules between parameters that a range cannot say (W at least the offset, ...).
     * Returns NULL, or a text what is wrong. NULL pointer: none.
     */
    const char *(*check)(const struct device_values *values);

    /* Fills the prepared block. Cannot fail on checked values. */
    void (*prepare)(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared);

    /*
     * evaluate: currents and derivatives.
     *
     * prepared  from prepare
     * x         [n] terminal voltages in V, then branch currents in A; n = local count
     * f         [n] out: currents into the terminals, A; then the errors of the branch equations, V
     * jac       [n*n] out, row-major: jac[n*r + c] = df[r]/dx[c]
     *
     * Finite for any finite x. No allocation, no state.
     */
    void (*evaluate)(const void *prepared, const double *x, double *f, double *jac);
    void (*evaluate_extended)(const void *prepared, const long double *x, long double *f,
                              long double *jac);

    /*
     * describe: quantities of the table for a report, positive for normal operation.
     *
     * outer    [terminal_count] voltages at the outer terminals
     * inner    [n] the unknowns that evaluate sees (behind series resistances)
     * q        [quantity_count] out; NAN where it does not apply
     *
     * Returns the region.
     */
    unsigned (*describe)(const void *prepared, const double *outer, const double *inner, double *q);

    /*
     * longest_step: the largest share t (0 < t <= 1) of the step dx that keeps a junction within
     * what its linearisation can bear. NULL: no limit.
     */
    double (*longest_step)(const void *prepared, const double *x, const double *dx);

    /*
     * typical: where to start a search: for this pair of terminals the voltage from `low` to `high`
     * in normal operation ("g" - "s" = 0.6 V). NULL: none, ARROW resistors carry potential.
     */
    bool (*typical)(const void *prepared, int *high, int *low, double *volts);

    /*
     * drive: the part of f that is the value of an independent source, at its full value, by itself
     * (a voltage source: -V in its branch equation; a current source: +I and -I). Source stepping
     * subtracts (1 - lambda) times it. NULL: the device drives nothing.
     */
    void (*drive)(const void *prepared, double *f);

    /* Number of unknowns that evaluate sees. NULL: terminal_count + branch_count. */
    int (*local_count)(const void *extra);

    /* Which entries of jac can be nonzero: pattern[n*r + c]. NULL: all. */
    const bool *pattern;

    /* Terminals joined by a DC path inside: bit set by terminal; two terminals with a common bit
     * conduct. Gates and opamp inputs have no bit. Opamp outputs conduct to ground (bit 31). */
    const uint32_t *paths;

    /* Voltage-defined between the first two terminals (source, opamp output to ground). */
    bool fixes_voltage;
    bool is_current_source; /* ideal: gives no DC path */
    bool uses_ground;       /* looks at voltages against gnd, not only at differences */
};

/* Every device, in the order of the documentation. */
extern const struct device_type *const device_types[];
extern const int device_type_count;

/* The type of a statement word, or NULL. */
const struct device_type *device_find(const char *word);

/* The first type with this model kind, or NULL. */
const struct device_type *device_find_model_kind(const char *kind);

/* Index of a parameter or quantity by name, -1 when there is none. */
int parameter_find(const struct parameter *parameters, int count, const char *name);
int quantity_find(const struct device_type *type, const char *name);

/* "moderate, saturated" and so on. Into text[size]. */
void region_describe(unsigned region, const struct device_type *type, char *text, size_t size);

#endif
