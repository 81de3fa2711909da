/*
 * opamp.h: what opamp.c prepares and opamp_current.c evaluates. Private to devices/.
 */
#ifndef DEVICES_OPAMP_H
#define DEVICES_OPAMP_H

#include <stdbool.h>

enum {
    OPAMP_OUT,
    OPAMP_PLUS,
    OPAMP_MINUS,
    OPAMP_HIGH,
    OPAMP_LOW,
    OPAMP_TERMINALS,
    OPAMP_BRANCH = OPAMP_TERMINALS,
    OPAMP_UNKNOWNS
};

struct opamp_prepared {
    double gain, offset;      /* 1; V */
    double high, low;         /* V */
    bool high_node, low_node; /* the limit is the voltage of its terminal, not high or low */
};

void opamp_evaluate(const void *prepared, const double *x, double *f, double *jac);
void opamp_evaluate_extended(const void *prepared, const long double *x, long double *f,
                             long double *jac);

#endif
