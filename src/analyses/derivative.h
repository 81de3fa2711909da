/*
 * derivative.h: derivatives of a quantity in any number of parameters, by one adjoint solve.
 *
 * With F(x, p) = 0 and a quantity Q(x, p): dQ/dp = Q_p - a . F_p, where J^T a = Q_x. One solve with
 * the factors at hand serves all parameters.
 */
#ifndef ANALYSES_DERIVATIVE_H
#define ANALYSES_DERIVATIVE_H

#include "solve/operating_point.h"

enum parameter_sort {
    PARAMETER_OWN,   /* a value of a part: RE, M1.W, a rail, an output's voltage, a deviate */
    PARAMETER_MODEL, /* a value of a model, with all of its users */
    PARAMETER_KNOB   /* a let or the temperature: the cell is built anew at four values */
};

struct parameter_ref {
    enum parameter_sort sort;
    int instance;               /* OWN */
    const double *model_values; /* MODEL: as in the instances that use it */
    int index;                  /* OWN, MODEL: row of the parameter table */
    const struct parameter *row;
    struct knob knob; /* KNOB */
    const char *name; /* "RE", "M1.W", "n180.threshold", "temperature" */
    struct dimension dimension;
    double value; /* in force, SI */
};

struct parameter_list {
    struct parameter_ref *list;
    int count, capacity;
};

/*
 * derivative_parameters: every parameter of cell and models that has a value: parts, rails,
 * outputs, models in use, lets, the temperature. Left out: `none`, hidden ones, and a parameter at
 * zero that cannot be negative and was not written (an effect that the cell does not have).
 *
 * False when memory is short.
 */
bool derivative_parameters(const struct system *system, struct arena *arena,
                           struct parameter_list *parameters);

/* The reference of one own parameter (also a hidden deviate), and of a knob. */
struct parameter_ref derivative_own(const struct system *system, int instance, int index);
struct parameter_ref derivative_knob(const struct system *system, const struct knob *knob);

/*
 * derivative_probe: dQ/dp of a quantity of node, rail, device, all, cell, or of an output's
 * current.
 *
 * point   polished (refined, values and factors at hand); stays so
 * result  [count] out, SI; NAN where the cell cannot be built around a let's value
 *
 * STATUS_OK, STATUS_UNSOLVED (other quantities of outputs, see quantity.h) or STATUS_MEMORY.
 * Relative error near 1e-9.
 */
enum status derivative_probe(struct operating_point *point, const struct probe *probe,
                             const struct parameter_ref *parameters, int count, double *result);

/*
 * derivative_exchange: how much of a change comes through which device, to first order: the change
 * of Q when the equations of one instance are taken from `other`, a system of the same circuit
 * under other effects. [instance_count] out.
 */
enum status derivative_exchange(struct operating_point *point, const struct probe *probe,
                                const struct system *other, double *parts);

/*
 * derivative_transfer: the same for T = e_row^T J^-1 e_column, the small-signal transfer from
 * equation `column` to unknown `row`: by a second adjoint solve, since dT = -z^T dJ y with
 * J^T z = e_row, J y = e_column, and J follows x.
 */
enum status derivative_transfer(struct operating_point *point, int row, int column,
                                const struct parameter_ref *parameters, int count, double *result);

#endif
