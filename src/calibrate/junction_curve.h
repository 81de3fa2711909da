/*
 * junction_curve.h: what a diode or bipolar model says to a row of readings, with the resistances
 * in its leads. Private to calibrate/.
 */
#ifndef CALIBRATE_JUNCTION_CURVE_H
#define CALIBRATE_JUNCTION_CURVE_H

#include "calibrate/calibrate.h"

enum { JUNCTION_TERMINALS = 3, JUNCTION_PREPARED = 64 };

struct junction {
    const struct device_type *type;
    double prepared[JUNCTION_PREPARED];
    long double resistance[JUNCTION_TERMINALS]; /* ohm; 0: none */
};

/* Prepares model values at a temperature. */
void junction_prepare(struct junction *junction, const struct device_type *type,
                      const double *model, double multiplicity, double kelvin, double measured);

/*
 * junction_currents: currents at a row's voltages, positive in normal operation.
 *
 * A diode: main = i at v. A bipolar transistor: main = ic and base = ib at vbe and vce; a row
 * without vbe but with ib has that base current forced.
 *
 * inner  [JUNCTION_TERMINALS] in: voltages behind the resistances to start from; out: the solved
 *        ones. Start new ones with junction_begin.
 */
void junction_currents(const struct junction *junction, const struct measured_row *row,
                       long double *inner, long double *main, long double *base);
void junction_begin(const struct junction *junction, const struct measured_row *row,
                    long double *inner);

#endif
