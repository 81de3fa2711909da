/*
 * quantity.h: value and derivative of any quantity of a solved cell, those of outputs included.
 */
#ifndef ANALYSES_QUANTITY_H
#define ANALYSES_QUANTITY_H

#include "analyses/derivative.h"

/*
 * quantity_values: what the probes read at a point.
 *
 * point   polished; stands there again on return
 * values  [count] out; NAN where a quantity does not apply, infinite for an unlimited resistance
 *
 * The curve of an output is swept only when a probe needs it. STATUS_OK, STATUS_UNSOLVED,
 * STATUS_STOPPED or STATUS_MEMORY.
 */
enum status quantity_values(struct operating_point *point, const struct probe *probes, int count,
                            double *values);

/* How a derivative was found. */
enum derivative_way {
    WAY_ADJOINT,  /* one adjoint solve */
    WAY_TRANSFER, /* the small-signal transfer: a second adjoint solve */
    WAY_EDGE,     /* the edge of a curve: adjoint solves there, by the implicit function theorem */
    WAY_SOLVED    /* the cell solved again at close values */
};

/*
 * quantity_derivative: dQ/dp for all parameters.
 *
 * value   out: the quantity; may be NULL
 * result  [count] out, SI; NAN where it does not apply
 * way     out; may be NULL
 */
enum status quantity_derivative(struct operating_point *point, const struct probe *probe,
                                const struct parameter_ref *parameters, int count, double *value,
                                double *result, enum derivative_way *way);

#endif
