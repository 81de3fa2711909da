/*
 * quad.h: an independent reference for whole cells in quadruple precision (113 bits).
 *
 * It shares nothing with src/ but the checked cell (struct circuit): its device equations are
 * written from the model description again, with derivatives by dual numbers; its equations are
 * assembled densely and solved by Gaussian elimination. What the program and this reference agree
 * on to nine digits, two separate calculations agree on.
 */
#ifndef SUPPORT_QUAD_H
#define SUPPORT_QUAD_H

#include "circuit/circuit.h"
#include "support/quad_number.h"

enum { QUAD_UNKNOWN_LIMIT = 256 };

/* What is to be solved. */
struct quad_question {
    const struct circuit *circuit;
    unsigned effects; /* EFFECTS_FULL, EFFECTS_HAND or a mixture */
    double kelvin;
    int held;          /* an instance (output, rail, source) whose value is replaced; -1: none */
    double held_value; /* by this one */
};

struct quad_solution {
    int n, iterations;
    quad x[QUAD_UNKNOWN_LIMIT];
    quad residual; /* largest |sum| / sum of magnitudes over the equations */
};

/* What one device does at a solution. Not a number where it has no meaning. */
struct quad_device_state {
    quad current;               /* main current, positive for normal operation */
    quad headroom;              /* of a transistor */
    quad gm, gds, gmb;          /* of a transistor: derivatives of the current at the terminal */
    quad vth, inversion, vdsat; /* of a MOS transistor */
};

/*
 * quad_solve: Newton with step halving until the relative residual is below 1e-28, or falls no more
 * and is below 1e-18.
 *
 * start     [unknown_count] where to begin; NULL: from zero, with conductances to
 *           ground that are taken away step by step
 * previous  a solution to begin at instead of `start`; may be NULL, may be `solution`
 *
 * False when it does not get there (also when the cell has too many unknowns).
 */
bool quad_solve(const struct quad_question *question, const double *start,
                const struct quad_solution *previous, struct quad_solution *solution);

/* Current out of the cell's output source into the cell at a solution (a sink is positive). */
quad quad_output_current(const struct quad_question *question, const struct quad_solution *solution,
                         int output);

/*
 * quad_output_slope: dI/dV of an output's current by the value of a voltage source, from one exact
 * linear solve.
 *
 * source  instance of the source: the output's own (its conductance), or a rail's
 *
 * False: singular.
 */
bool quad_output_slope(const struct quad_question *question, const struct quad_solution *solution,
                       int output, int source, quad *slope);

/* What instance k does at a solution. */
struct quad_device_state quad_device(const struct quad_question *question,
                                     const struct quad_solution *solution, int instance);

#endif
