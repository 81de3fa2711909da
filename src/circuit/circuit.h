/*
 * circuit.h: a checked cell: nodes, devices with their values, outputs, and what is asked of it.
 *
 * Built from a cell for one set of named values; immutable afterwards. Everything is owned by the
 * circuit's arena or borrowed from the cell.
 *
 * Unknowns: node voltages of all nodes but gnd (node k is unknown k - 1), then the branch currents
 * of devices that have any. An index of -1 stands for gnd.
 */
#ifndef CIRCUIT_CIRCUIT_H
#define CIRCUIT_CIRCUIT_H

#include "circuit/caution.h"
#include "circuit/cell.h"
#include "devices/device.h"

enum { CIRCUIT_GROUND = -1 };

/* Limits; each message that meets one prints it. A cell of a few lines can ask for any number of
 * parts by blocks that use blocks. */
enum {
    CIRCUIT_PART_LIMIT = 2000000, /* parts and uses of blocks */
    CIRCUIT_MEMORY_LIMIT = 2048,  /* MiB of all that is built from a cell, before it is solved */
    CIRCUIT_NAME_LIMIT = 1000,    /* pins, parameters and lets of one block */
    CIRCUIT_MODEL_LIMIT = 10000,
    CIRCUIT_POINT_STANDARD = 51,   /* points of a sweep that says nothing */
    CIRCUIT_POINT_LIMIT = 100000,  /* points of one sweep */
    CIRCUIT_SWEEP_LIMIT = 10000000 /* values of all sweeps: points, quantities and families */
};

struct node {
    const char *name;
    struct span where; /* first mention */
    bool is_hidden;    /* behind a series resistance of a device */
};

struct model {
    const char *name;
    const struct device_type *type; /* a type with this model kind */
    double *values;                 /* in the order of type->model_parameters */
    bool *given;                    /* written in the file, not a default */
    double measured_kelvin;
    double valid_kelvin[2]; /* from, to; NAN where not stated */
    double valid_length[2]; /* m, NAN where not stated */
    double valid_width[2];
    const char *process; /* name of the process file, NULL: the cell itself */
    struct span where;
};

struct instance {
    const char *name;
    const struct device_type *type;
    const struct model *model; /* NULL: none */
    double *own;               /* instance parameters, table order */
    bool *given;
    const double
        *model_values; /* those of the model, or the defaults of its kind; NULL: no model */
    const void *extra; /* law program or curve */
    int *outer;        /* [terminal_count] unknown at each terminal, CIRCUIT_GROUND for gnd */
    int *local;        /* [local_count] unknowns that evaluate sees */
    int local_count;
    int parent; /* hidden series resistor: the instance it belongs to; else -1 */
    struct span where;
    bool is_hidden; /* made by the program: rails, outputs, series resistors */
};

struct rail {
    const char *name;
    int unknown, instance;
    double volts;
    struct span where;
};

struct output {
    const char *name;
    int unknown, instance;
    double at, from, to; /* V; from <= to */
    double within;       /* share */
    struct span where;
};

struct let_value {
    const char *name;
    struct quantity value;
    bool is_set; /* by --set or a sweep */
    struct span where;
};

/* What a quantity name in a cell stands for. */
enum probe_kind { PROBE_NODE, PROBE_RAIL, PROBE_DEVICE, PROBE_OUTPUT, PROBE_ALL, PROBE_CELL };
enum node_quantity { NODE_V };
enum rail_quantity { RAIL_V, RAIL_CURRENT, RAIL_POWER };
enum output_quantity {
    OUTPUT_CURRENT,
    OUTPUT_RESISTANCE,
    OUTPUT_COMPLIANCE,
    OUTPUT_LOW,
    OUTPUT_HIGH,
    OUTPUT_FLATNESS,
    OUTPUT_LINE,
    OUTPUT_TEMPCO,
    OUTPUT_SIGMA,
    OUTPUT_QUANTITY_COUNT
};
extern const struct quantity_row node_quantities[1];
extern const struct quantity_row rail_quantities[3];
extern const struct quantity_row output_quantities[OUTPUT_QUANTITY_COUNT];

struct probe {
    enum probe_kind kind;
    int index;    /* unknown, rail, instance or output; -1 for all and cell */
    int quantity; /* within its table */
    struct dimension dimension;
    const char *text; /* "tail.current" */
};

/* Something that a sweep, a condition or a solver may turn. */
enum knob_kind { KNOB_TEMPERATURE, KNOB_VALUE, KNOB_LET, KNOB_PROCESS };
struct knob {
    enum knob_kind kind;
    int instance, parameter; /* KNOB_VALUE: own[parameter] of the instance (rail, source, resistor,
                                output, M1.W) */
    const char *name;        /* as written */
    struct dimension dimension;
};

struct sweep {
    struct knob knob;
    double from, to;
    int points; /* 0: the program chooses */
    struct probe *shown;
    int shown_count;
    bool has_family;
    struct knob family;
    double *family_values;
    int family_count;
    struct span where;
};

struct hand_line {
    struct probe probe;
    double value;
    struct span where;
};

struct requirement {
    struct probe probe;
    enum relation relation;
    double value;
    double tolerance;       /* absolute, in the quantity's unit; RELATION_WITHIN only */
    double tolerance_share; /* as written in %, NAN when it was written as a value */
    enum scope scope;
    double yield;     /* share, SCOPE_YIELD only */
    const char *text; /* the line as written, spaces folded */
    struct span where;
};

struct condition {
    struct knob knob;
    double from, to;
    struct span where;
};

struct choice {
    struct knob knob;
    double from, to;
    struct probe probe;
    double value;
    struct span where;
};

struct quiet_line {
    const char *code, *name; /* name NULL: everywhere */
};

struct corner_line {
    const char *name;
    struct span where;
};

/* Named values given from outside; each overrides a `let` of the same name. */
struct set_value {
    const char *name;
    const struct expression *expression; /* NULL: `value` holds */
    struct quantity value;
    struct span where;
};

struct circuit_settings {
    const struct set_value *sets;
    int set_count;
    double kelvin;      /* NAN: the cell's own */
    const char *corner; /* NULL: typical */
    int part_limit;     /* 0: CIRCUIT_PART_LIMIT */
};

struct circuit {
    struct arena *arena;
    struct cell *cell;
    const char *title; /* "" when there is none */
    double kelvin;
    double measured_kelvin; /* at which values written in the cell itself hold */
    double resistor_factor;
    const char *corner; /* NULL: typical */

    struct node *nodes; /* [node_count]; nodes[0] is gnd */
    int node_count, node_capacity;
    struct instance *instances;
    int instance_count, instance_capacity;
    int branch_count;
    int unknown_count;

    struct model *models;
    int model_count, model_capacity;
    struct let_value *lets;
    int let_count, let_capacity;
    struct rail *rails;
    int rail_count, rail_capacity;
    struct output *outputs;
    int output_count, output_capacity;
    struct sweep *sweeps;
    int sweep_count, sweep_capacity;
    struct hand_line *hands;
    int hand_count, hand_capacity;
    struct requirement *requirements;
    int requirement_count, requirement_capacity;
    struct condition *conditions;
    int condition_count, condition_capacity;
    struct choice *choices;
    int choice_count, choice_capacity;
    struct quiet_line *quiets;
    int quiet_count, quiet_capacity;
    struct corner_line *corners;
    int corner_count, corner_capacity;
    struct caution_list cautions;
    struct circuit_settings settings; /* what it was built for; the lists live in the arena */

    struct names *names; /* private: name to object */
};

/*
 * circuit_build: a circuit from a cell, checked in structure and values.
 *
 * cell         must outlive the circuit; only its list of sources grows (files of tables)
 * diagnostics  errors go here (the cell's own, or the caller's)
 * circuit      out: owned by the caller (circuit_free); NULL unless STATUS_OK
 */
enum status circuit_build(struct cell *cell, const struct circuit_settings *settings,
                          struct diagnostics *diagnostics, struct circuit **circuit);
void circuit_free(struct circuit *circuit);

/* Resolves "tail.current". False after an error that names the near ones. */
bool circuit_probe(const struct circuit *circuit, const char *text, struct span where,
                   struct diagnostics *diagnostics, struct probe *probe);

/* Resolves what a sweep may turn: temperature, a let, a rail, a source, a resistor, an output,
 * M1.W. */
bool circuit_knob(const struct circuit *circuit, const char *text, struct span where,
                  struct diagnostics *diagnostics, struct knob *knob);

/* A sweep from a statement that was read from elsewhere (an option). False after an error. */
bool circuit_sweep(const struct circuit *circuit, const struct statement *statement,
                   struct diagnostics *diagnostics, struct sweep *sweep);

/* Unit and dimension of what a probe gives, for reports. */
const struct quantity_row *probe_row(const struct circuit *circuit, const struct probe *probe);

/* Name of unknown k: the node's, or "current of R1". Into text[size]. */
void circuit_unknown_name(const struct circuit *circuit, int unknown, char *text, size_t size);

/* Instance by name, -1 when there is none; rail, output and node likewise (node: index, 0 is gnd).
 */
int circuit_find_instance(const struct circuit *circuit, const char *name);
int circuit_find_rail(const struct circuit *circuit, const char *name);
int circuit_find_output(const struct circuit *circuit, const char *name);
int circuit_find_node(const struct circuit *circuit, const char *name);

#endif
