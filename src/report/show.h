/*
 * show.h: values in words: four significant digits in engineering units, shares in % or ppm.
 * The texts live in the layout's arena. A value that does not apply is "-".
 */
#ifndef REPORT_SHOW_H
#define REPORT_SHOW_H

#include "report/layout.h"

enum { SHOW_DIGITS = 4 };

/* "816.4 nA", "12.03", "25.10 1/V", "170.0 uA/V^2"; infinite is "unlimited". */
const char *show_value(struct layout *layout, double value, struct dimension dimension);
/* The same with a sign always; for differences. */
const char *show_signed(struct layout *layout, double value, struct dimension dimension);

/* Trailing zeros left out: "1.2 V" for what a user wrote. */
const char *show_round(struct layout *layout, double value, struct dimension dimension);

/* "2.050 %" or "3.100 ppm", with "/V" or "/K" behind it; `sign`: always with a sign. */
const char *show_share(struct layout *layout, double share, const char *per, bool sign);

/* "27 °C" */
const char *show_celsius(struct layout *layout, double kelvin);

/* A value as the quantity that a probe names wants it. */
const char *show_probe(struct layout *layout, const struct probe *probe, double value);
/* A difference between two such values. */
const char *show_probe_difference(struct layout *layout, const struct probe *probe, double value);

#endif
