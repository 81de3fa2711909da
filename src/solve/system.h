/*
 * system.h: a circuit as a nonlinear system: prepared devices, sparse pattern, assembly.
 *
 * A system owns a copy of all instance values, so that a sweep or a sample can change them without
 * touching the circuit; each thread has its own system. Not safe to share.
 */
#ifndef SOLVE_SYSTEM_H
#define SOLVE_SYSTEM_H

#include "circuit/circuit.h"
#include "numerics/newton.h"

/* Which embedding the continuation parameter drives. */
enum embedding {
    EMBED_NONE,
    EMBED_SOURCES,     /* independent sources at lambda times their value */
    EMBED_CONDUCTANCE, /* a conductance from every node to its place in `anchor`, gone at lambda = 1
                        */
    EMBED_KNOB,        /* one value moves from knob_from to knob_to */
    EMBED_INVERSION    /* MOS transistors go from all-region to the square law */
};

struct system {
    struct arena *arena;
    const struct circuit *circuit;
    struct device_conditions conditions;
    int n, node_count; /* unknowns; the first node_count are node voltages */
    int nonzeros;
    double **own;    /* [instance] values in force */
    char *prepared;  /* blocks of all instances */
    size_t *block;   /* [instance] offset into prepared */
    int *slots;      /* entries of all instances in the value array, then the node diagonals */
    int *first_slot; /* [instance] */
    double *weight;  /* [n] */
    enum embedding embedding;
    double lambda;
    const double *anchor; /* [n] EMBED_CONDUCTANCE */
    int knob_instance, knob_parameter;
    double knob_from, knob_to;
    const double *swapped, *swapped_in; /* model values and those that stand in for them */
    struct nonlinear_system face;
    struct linear_solver *solver;
    double *work;               /* of the solvers */
    long double *extended_work; /* of the polish and of linear_refine */
    int evaluations;
    struct groups *groups; /* like devices side by side; NULL: none */
    bool groups_are_old;   /* blocks have changed since they were made */
};

/* A system for the conditions; owned by the caller (system_free). NULL when memory is short. */
struct system *system_create(const struct circuit *circuit, double kelvin, unsigned effects);
void system_free(struct system *system);

/* Prepares all devices anew, for other conditions. */
void system_conditions(struct system *system, double kelvin, unsigned effects);

/* Changes one value and prepares its device, with the resistances in its leads. */
void system_set(struct system *system, int instance, int parameter, double value);

/* The last instance of a device: itself, or the last resistance in one of its leads. */
int system_last_part(const struct circuit *circuit, int instance);

/*
 * system_swap_model: puts other values in the place of those of a model.
 *
 * values    as instance->model_values of its users
 * in_place  [model_parameter_count] used until the next call; NULL: the model's own again
 */
void system_swap_model(struct system *system, const double *values, const double *in_place);

/* The prepared block of an instance. */
const void *system_block(const struct system *system, int instance);

/* To be called after blocks were changed otherwise than by the functions above. */
void system_blocks_changed(struct system *system);

/* The branch unknown of an instance that has one. */
int system_branch(const struct instance *instance);

/*
 * system_slope: derivative of the residual in one instance value, at x, by central differences in
 * long double (relative error about 1e-10); [n] out, zero where the instance is not.
 */
void system_slope(struct system *system, int instance, int parameter, const long double *x,
                  long double *slope);

/*
 * The stencil behind it, for derivatives of anything else: fourth order, at value + offset[k] *
 * step with weight[k] / step (Abramowitz and Stegun 1964, table 25.2).
 */
enum { STENCIL_POINTS = 4 };
extern const double stencil_offset[STENCIL_POINTS], stencil_weight[STENCIL_POINTS];

/* A step that is small against what the value does and large against its rounding. */
double stencil_step(const struct parameter *parameter, double value);

/* The same as system_slope in the temperature, 1/K. */
void system_temperature_slope(struct system *system, const long double *x, long double *slope);

/* The measure of an equation, for whoever assembles on his own: see system.c. */
struct system_measure {
    double volts, amperes; /* floors of unknowns */
    double rounding;       /* share of what the unknowns are multiplied by */
};
struct system_measure system_measure(void);

/* Local unknowns of an instance from the whole vector; gnd is 0. */
void system_gather(const struct instance *instance, const double *x, double *local);

#endif
