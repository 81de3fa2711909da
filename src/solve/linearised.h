/*
 * linearised.h: what small changes do at a polished point: exact derivatives from the linearised
 * equations, solved to extended precision.
 */
#ifndef SOLVE_LINEARISED_H
#define SOLVE_LINEARISED_H

#include "solve/operating_point.h"

/*
 * linearised_output: conductance seen into an output, dI/dV with I into the cell, S; relative error
 * near 1e-10 and better.
 */
long double linearised_conductance(struct operating_point *point, int branch);

/* Derivative of the branch current in the value of a voltage source whose branch is `driver`, S. */
long double linearised_transfer(struct operating_point *point, int branch, int driver);

/* Derivative of a branch current in temperature, A/K. False when memory is short. */
bool linearised_temperature(struct operating_point *point, int branch, long double *slope);

/*
 * linearised_sigma: standard deviation of a branch current from the mismatch of all devices, A, to
 * first order; NAN when no device has a mismatch coefficient.
 */
double linearised_sigma(struct operating_point *point, int branch);

#endif
